"""Energies of a Q-Chem job: one evaluation at one geometry, and the energy of the method that was asked for.

Which energy is wanted is told by the input, never by what stands in the output: excited states, spin-component-scaled
and partly summed energies are printed in the same words. Where the method that was asked for is not known here, that
is an error, never the energy of its reference.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from thermo_pp.readers.line_marks import first_match, last_match, matches
from thermo_pp.readers.qchem import geometry
from thermo_pp.readers.qchem.geometry import Geometry
from thermo_pp.readers.qchem.jobs import Job, job_type
from thermo_pp.readers.text import CUT_SHORT, Text

RANKS: dict[str, int] = {
    "HF": 0,
    "DFT": 0,
    "MP2": 1,
    "MP3": 2,
    "MP4(SDQ)": 3,
    "MP4": 4,
    "CCD": 5,
    "CCSD": 6,
    "CCSD(T)": 7,
}
"""The energies that are read, and which is the better one of one geometry."""

_METHODS: dict[str, str] = {
    "hf": "HF",
    "hartree-fock": "HF",
    "cis": "HF",
    "rpa": "HF",
    "cis(d)": "HF",
    "mp2": "MP2",
    "rimp2": "MP2",
    "ri-mp2": "MP2",
    "mp3": "MP3",
    "mp4sdq": "MP4(SDQ)",
    "mp4": "MP4",
    "ccd": "CCD",
    "ccsd": "CCSD",
    "ccsd(t)": "CCSD(T)",
    "eom-ccsd": "CCSD",
}
"""What an input calls a method that is no functional -> the energy of the ground state that it gives."""
_UNKNOWN = re.compile(
    r"adc|scs|sos|mos|mp2\[|lmp2|cis\(|qcis|cisd|ccsd\(|ccsdt|cc2|cc3|eom-|(?:od|od\(2\)|omp2)$|rpa|rdm|casscf|ras|sf-|vod|vqccd|"
    r"pp2|ccvb|drpa|cepa|scan-?d?rpa"
)
_WANTED: dict[str, re.Pattern[bytes]] = {
    "MP2": re.compile(
        rb"^[ \t]*(?:(?:Total[ \t]+)?(?:RI-?)?MP2[ \t]+(?:total )?energy[ \t]*=|EMP2[ \t]*=)",
        re.MULTILINE,
    ),
    "MP3": re.compile(rb"^[ \t]*(?:MP3 energy[ \t]*=|EMP3[ \t]*=)", re.MULTILINE),
    "MP4(SDQ)": re.compile(rb"^[ \t]*EMP4SDQ[ \t]*=", re.MULTILINE),
    "MP4": re.compile(rb"^[ \t]*EMP4[ \t]*=", re.MULTILINE),
    "CCD": re.compile(rb"^[ \t]*CCD total energy[ \t]*=", re.MULTILINE),
    "CCSD": re.compile(rb"^[ \t]*CCSD total energy[ \t]*=", re.MULTILINE),
    "CCSD(T)": re.compile(rb"^[ \t]*CCSD\(T\) total energy[ \t]*=", re.MULTILINE),
}
_MARKS = {"MP2": b"MP2", "MP3": b"MP3", "MP4(SDQ)": b"EMP4", "MP4": b"EMP4"}
_SUMMARY = re.compile(rb"^[ \t]*(?:SCF energy|EHF)[ \t]*=", re.MULTILINE)
_CCSD_SUM = (b"CCSD correlation energy", b"CCSD(T) correlation energy", b"CCD correlation energy")
_TOTAL = re.compile(
    rb"^[ \t]*Total energy(?: in the final basis set)?[ \t]*=(?=[ \t])", re.MULTILINE
)
_SCF = re.compile(rb"^[ \t]*SCF[ \t]+energy(?: in the final basis set)?[ \t]*=(?=[ \t])", re.M)
_ITERATIONS = b"Convergence criterion met"
_FAILED = (b"SCF failed to converge", b"\n Convergence failure")
_PERTURBED = re.compile(
    rb"[^\n]*(?:MP2|PT2|CCSD(?:\(T\))?)[ \t][^\n]{0,40}\b(?:total|correlation) energy\b", re.I
)
_DOUBLE_HYBRID = re.compile(
    r"b2\w*-?plyp|xyg|wb97x-2|wb97m\(2\)|dsd|dod|2-?plyp|-dh|qidh|pbe0-2|pwpb95|ptpss|1dh"
)
_NAMED = re.compile(rb"^[ \t]*(method|exchange|correlation)[ \t=]", re.M | re.I)
_DENSITY = re.compile(rb"^[ \t]*(?:Exchange|Correlation|XC)[^:\n]{0,20}:[ \t]", re.MULTILINE)
_HARTREE_FOCK = re.compile(rb"^[ \t]*Hartree-Fock[ \t]*\r?$", re.MULTILINE)
_FREE = (
    (b"G-S(liq)", re.compile(rb"[^\n]*G-S\(liq\)\s+free energy of system\s")),
    (
        b"Total Free Energy (",
        re.compile(rb"[^\n]*Total Free Energy \(H0 \+ V/2 \+ non-elec[a-z ]*\)[ \t]*="),
    ),
)
_CDS = re.compile(rb"^[ \t]*G_CDS\b[^=\n]*=[ \t]*(-?\d+\.\d+)[ \t]+kcal/mol", re.MULTILINE)
_KCAL_MOL = 627.50947
_STEP = 2.1e-8
"""Two units of the last digit of the shortest energies, hartree."""


@dataclass(frozen=True)
class Energy:
    """An energy in hartree; `at` is the offset of its digits' line, `scf_at` that of the SCF it stands on."""

    label: str
    value: float
    at: int
    scf_at: int
    shape: Geometry
    job: Job

    @property
    def rank(self) -> int:
        """Place of the label in `RANKS`."""
        return RANKS[self.label]


def method_name(job: Job) -> str:
    """Return the method as the input has it, lower case: ``method``, else the exchange and the correlation."""
    rem = job.rem
    exchange, correlation = rem.get("exchange"), rem.get("correlation", "none")
    if "method" in rem:
        return rem["method"]
    if exchange is None:
        return "hf" if correlation in ("none", "0") else correlation
    if correlation in ("none", "0"):
        return exchange
    return correlation if exchange == "hf" else f"{exchange}-{correlation}"


def method_at(text: Text, job: Job) -> int:
    """Return the offset of the line of the input that names the method, of the input where none does."""
    match = _NAMED.search(text.data, job.echo, min(job.echo + 20000, job.end))
    return job.echo if match is None else match.start(1)


def label_of(text: Text, job: Job) -> str:
    """Return which energy the job must have, a key of `RANKS`; ReadError where it is one not known here."""
    name = method_name(job)
    label = _METHODS.get(name)
    correlation = job.rem.get("correlation", "none")
    if label == "HF" and correlation not in ("none", "0"):
        name, label = correlation, _METHODS.get(correlation)
    if label is not None:
        return label
    if _UNKNOWN.match(name) or re.match(r"scs|sos|mos|adc|cvs", name):
        raise text.error(
            job.echo,
            f"a job with the method {name!r}, which is not known to this reader",
            mend=f"density functionals and {', '.join(RANKS)} are read",
        )
    return "DFT"


def energy(text: Text, job: Job) -> Energy:
    """Return a job's energy at its own geometry: the first of displaced ones, the last of an optimisation.

    Raises
    ------
    ReadError
        No energy, one that is damaged, or one that does not agree with what else is printed of it.
    """
    label = label_of(text, job)
    failed = max(text.data.find(mark, job.echo, job.end) for mark in _FAILED)
    if failed >= 0:
        raise text.error(
            failed,
            "the SCF did not converge, so there is no energy",
            mend="rerun with more iterations or another algorithm",
        )
    blocks = [(job.echo, -1), *geometry.blocks(text, job)]
    blocks[0] = (job.echo, blocks[1][0])
    found = []
    for start, end in blocks:
        totals = [m.end() for m in matches(_TOTAL, b"Total energy", text, start, end)]
        iterations = text.data.find(_ITERATIONS, start, end)
        if (iterations >= 0 and not totals) or (totals and start == job.echo):
            place = totals[0] if totals else iterations
            raise text.error(
                place, "an SCF without its geometry or its total energy", mend=CUT_SHORT
            )
        if totals:
            found.append((start, end, totals))
    if not found:
        raise text.error(
            job.end, "no energy in this job (looked for 'Total energy')", mend=CUT_SHORT
        )
    displaced = job.kind == "frequencies" or job_type(job.rem) in ("polarizability", "dyn_polar")
    start, end, totals = found[0] if displaced else found[-1]
    shape = geometry.geometry(text, job, start, end)
    total_at, stop = _solution(text, job, totals, end, displaced)
    scf = _total(text, job, start, total_at, stop, label)
    if label not in _WANTED:
        value, at = scf
        return Energy(label, value, at, total_at, shape, job)
    return _correlated(text, job, label, total_at, stop, scf[0], shape)


def _solution(
    text: Text, job: Job, totals: list[int], end: int, displaced: bool
) -> tuple[int, int]:
    """Return where the SCF energy that counts stands, and where what belongs to it ends."""
    stable = job.rem.get("internal_stability", job.rem.get("stability_analysis", "false"))
    if len(totals) == 1 or stable not in ("0", "false"):
        return totals[-1], end
    if displaced:
        return totals[0], totals[1]
    values = [float(text.exact_text(at, "the total energy")) for at in totals]
    if max(values) - min(values) > 1e-6:
        raise text.error(
            totals[1],
            f"{len(totals)} SCF energies at one geometry, from {min(values)!r} to {max(values)!r} hartree",
            mend="give a calculation with one SCF solution",
        )
    return totals[-1], end


def _total(text: Text, job: Job, start: int, at: int, stop: int, label: str) -> tuple[float, int]:
    """Return the SCF's total energy, with dispersion and what a solvent adds, and where it stands."""
    total = float(text.exact_text(at, "the total energy"))
    scf = last_match(_SCF, b"SCF ", text, start, at)
    part = 0.0
    if scf is not None:
        part = total - float(text.exact_text(scf.end(), "the SCF energy"))
    smd = any(job.rem.get(key, "").startswith("sm") for key in ("solvent_method", "smx_solvation"))
    smd = smd or "smx" in job.sections
    words = text.data[start:at]
    dispersion = b"dispersion" in words
    solvent = smd or b"olvent model" in words or b"PCM" in words
    if abs(part) > 1e-9 and not (dispersion or solvent):
        raise text.error(
            at,
            f"the total energy {total!r} is not the SCF energy on the line above it",
            mend=CUT_SHORT,
        )
    for mark, pattern in _FREE:
        free = last_match(pattern, mark, text, start, stop)
        if free is None:
            continue
        value = float(text.exact_text(free.end(), "the free energy in solution"))
        if abs(value - total) > 2e-6:
            if label not in ("HF", "DFT"):
                raise text.error(
                    free.start(),
                    "a correlated energy with terms of the solvent beside it, which are not added up",
                    mend="give the SCF in solution, or the correlated energy in the gas phase",
                )
            return value, free.end()
        smd = False
    if smd:
        cds = first_match(_CDS, b"G_CDS", text, start, stop)
        if cds is None or abs(float(cds.group(1)) / _KCAL_MOL - part) > 2e-5:
            raise text.error(
                at,
                "the non-electrostatic part of the solvation is not known to be in this energy",
                mend="give an output with the free energy of the system in solution",
            )
    return total, at


def _correlated(
    text: Text, job: Job, label: str, start: int, stop: int, scf: float, shape: Geometry
) -> Energy:
    pattern, mark = _WANTED[label], _MARKS.get(label, b"otal energy")
    match = last_match(pattern, mark, text, start, stop)
    if match is None:
        raise text.error(
            stop,
            f"the input asks for {method_name(job)}, but no {label} energy is in the output",
            mend="check that the job ran as asked; another Q-Chem version may print otherwise",
        )
    value = float(text.exact_text(match.end(), f"the {label} energy"))
    summaries = [
        one
        for mark in (b"SCF energy", b"EHF")
        for one in matches(_SUMMARY, mark, text, start, match.start())
    ]
    summary = max(summaries, key=lambda one: one.start(), default=None)
    reference = scf
    if summary is not None:
        reference = float(text.exact_text(summary.end(), "the SCF energy"))
        if abs(reference - scf) > 2e-7:
            raise text.error(
                summary.start(),
                f"the SCF energy {reference!r} here is not the one of the SCF, {scf!r}",
                mend=CUT_SHORT,
            )
    if not -0.05 * abs(scf) - 0.5 < value - reference < 1e-6:
        raise text.error(
            match.start(),
            f"the {label} energy {value!r} does not lie a little below the SCF energy {reference!r}",
            mend=CUT_SHORT,
        )
    if summary is not None and label.startswith("CC"):
        _check_sum(text, summary.start(), match.end(), reference, value)
    return Energy(label, value, match.end(), start, shape, job)


def _check_sum(text: Text, start: int, end: int, reference: float, value: float) -> None:
    """Compare a coupled-cluster energy with the sum of its printed parts."""
    total, parts = reference, 0
    for mark in _CCSD_SUM:
        at = text.data.find(mark, start, end)
        if at >= 0:
            equals = at + text.rest(at).find(b"=") + 1
            total += float(text.exact_text(equals, "a correlation energy"))
            parts += 1
    if parts and abs(total - value) > _STEP * (1 + parts):
        raise text.error(
            end,
            f"{value!r} is not the sum of the SCF energy and its parts, {total:.8f}",
            mend=CUT_SHORT,
        )


def check_functional(text: Text, found: Energy) -> None:
    """Refuse a double hybrid, whose energy is not its SCF's, and an SCF of another kind than was asked for."""
    job, name = found.job, method_name(found.job)
    start, end = job.echo, found.scf_at
    marks = (b"Exchange", b"Correlation", b"XC")
    densities = [first_match(_DENSITY, mark, text, start, end) for mark in marks]
    density = next((one for one in densities if one is not None), None)
    plain = first_match(_HARTREE_FOCK, b"Hartree-Fock", text, start, end)
    second = [
        first_match(_PERTURBED, mark, text, found.scf_at, job.end)
        for mark in (b"MP2", b"PT2", b"CCSD")
    ]
    match = next((one for one in second if one is not None), None)
    if found.label != "DFT":
        if density is not None and plain is None:
            raise text.error(
                density.start(),
                f"the SCF of this job is one of a density functional, the input asks for {name!r}",
                mend="give a job whose reference is Hartree-Fock",
            )
        if found.label == "HF" and match is not None and name == "hf":
            raise text.error(
                match.start(),
                "a correlated energy, but the input asks for Hartree-Fock",
                mend=CUT_SHORT,
            )
        return
    if plain is not None and density is None:
        raise text.error(
            plain.start(),
            f"the SCF of this job is Hartree-Fock, and {name!r} is not known to this reader",
            mend=f"density functionals and {', '.join(RANKS)} are read",
        )
    if match is not None or _DOUBLE_HYBRID.search(name):
        raise text.error(
            job.echo if match is None else match.start(),
            f"the functional {name!r} is a double hybrid, whose energy is not read",
            mend="give a job of a functional without perturbation theory, or of a wavefunction method",
        )
