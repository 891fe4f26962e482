"""Energies of one Psi4 evaluation, and which of them is the best one.

An evaluation is one SCF with whatever followed it at the same geometry. Energies that are no
method's own result (spin-component-scaled ones beside MP2, for instance) are left aside; an energy
of a method that is not listed here is an error where that evaluation is wanted, never passed over
for a lower one.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from thermo_pp.readers.line_marks import matches
from thermo_pp.readers.text import CUT_SHORT, Text

RANKS: dict[str, int] = {
    "HF": 0,
    "DFT": 0,
    "MP2": 1,
    "OMP2": 2,
    "CC2": 2,
    "MP2.5": 2,
    "MP3": 3,
    "CISD": 3,
    "MP4(SDQ)": 4,
    "MP4(SDTQ)": 5,
    "QCISD": 6,
    "CCSD": 6,
    "QCISD(T)": 7,
    "CC3": 7,
    "CCSD(T)": 7,
    "CBS": 8,
}
"""The energies that are read, and which is the better one of one geometry."""
CALLED: dict[str, str | None] = {
    "scf": None,
    "hf": None,
    "dft": None,
    "mp2": "MP2",
    "omp2": "OMP2",
    "cc2": "CC2",
    "mp2.5": "MP2.5",
    "mp3": "MP3",
    "cisd": "CISD",
    "mp4(sdq)": "MP4(SDQ)",
    "mp4": "MP4(SDTQ)",
    "qcisd": "QCISD",
    "qcisd(t)": "QCISD(T)",
    "ccsd": "CCSD",
    "cc3": "CC3",
    "ccsd(t)": "CCSD(T)",
}
"""What an input calls a method, and which energy must then be in the output; functionals beside."""

FUNCTIONAL = re.compile(
    rb"=> (?:Composite Functional: ([^\r\n]+?)|([^\r\n]+?) Composite Functional) <="
)
EXTRAPOLATED = b"==> CBS <=="
_SCF = re.compile(rb"[ \t]*@(?:DF-|CD-)?(?:R|U|RO|CU)(HF|KS) Final Energy:")
_TOTALS = (
    (re.compile(rb"[ \t]*\* (\S+) total energy\b"), b" total energy"),
    (re.compile(rb"[ \t]*(?:DF-|CD-)?(\S+) Total Energy \(a\.u\.\)"), b" Total Energy (a.u.)"),
)
"""The lines of correlated energies, starred or in a table, and the mark of each."""
_ASIDE = ("SCS", "SOS", "SCSN", "HF", "SCF", "REF")
"""First part of the labels of energies that are printed beside the wanted one."""
_UNCONVERGED = (b"did not converge, but proceeding anyway", b"Failed to converge.")
_ALGORITHM = b"==> Algorithm <=="
_CHARGES = b"=> External Potential Field:"
_HELD = (b"MOM enabled.", b" DIIS/MOM", b" MOM\n")
_FREE = b"MOM disabled."
_FRACTIONAL = b"Fractional occupation enabled."
_SETTINGS_BYTES = 1000
"""The settings of an SCF below their heading."""
_MP2_TABLE = 800
_DOUBLE_HYBRID = b"@Final double-hybrid DFT total energy"


@dataclass(frozen=True)
class Energy:
    """One energy that a method printed: its label, its value in hartree, the offset of its line."""

    label: str
    value: float
    at: int

    @property
    def rank(self) -> int:
        """Place of the label in `RANKS`."""
        return RANKS[self.label]


def best_energy(part: Text) -> Energy:
    """Return the best energy of the evaluation `part`.

    Raises
    ------
    ReadError
        No energy, or one of a method that is not known here.
    """
    return max(energies(part), key=lambda energy: (energy.rank, energy.at))


def energies(part: Text) -> list[Energy]:
    """Return the energies of the evaluation `part`, the SCF's first."""
    found = [_scf_energy(part)]
    extrapolated = part.find(EXTRAPOLATED)
    if extrapolated >= 0:
        at = part.need(b"  total ", extrapolated, lacking="no extrapolated energy")
        return [Energy("CBS", part.number(at, "the extrapolated energy"), at)]
    if found[0].label == "DFT":
        return [_double_hybrid(part) or found[0]]
    for pattern, mark in _TOTALS:
        for match in matches(pattern, mark, part, part.start, part.end):
            label = match.group(1).decode("utf-8", "replace")
            if label.split("-")[0] in _ASIDE:
                continue
            if label not in RANKS:
                raise part.error(
                    match.end(),
                    f"an energy of the method {label!r}, which the Psi4 reader does not know",
                    mend=f"energies of {', '.join(RANKS)} are read; give a file with one of them",
                )
            value = part.number(match.end(), f"the {label} energy")
            found.append(Energy(label, value, match.end()))
    for start in part.all(b"==> DF-MP2 Energies <=="):
        found.append(_density_fitted(part, start))
    if any(one.label == "OMP2" for one in found):
        # MP2 is printed once more with the optimised orbitals, which is no MP2 energy
        first = next((one for one in found if one.label == "MP2"), None)
        found = [one for one in found if one.label != "MP2" or one is first]
    return found


def unconverged(part: Text) -> int | None:
    """Return where the evaluation `part` says that its SCF did not converge, None if nowhere."""
    places = [part.find(mark) for mark in _UNCONVERGED]
    return max(places) if max(places) >= 0 else None


def held(part: Text) -> int | None:
    """Return where the evaluation `part` holds its occupations to those of a start, None if nowhere."""
    end = part.last(b" Final Energy:")
    settings = max(part.last(_ALGORITHM, end if end >= 0 else None), part.start)
    if part.data.find(_FREE, settings, settings + _SETTINGS_BYTES) >= 0:
        return None
    end = end if end >= 0 else part.end
    places = [at for mark in _HELD if (at := part.data.find(mark, settings, end)) >= 0]
    return min(places, default=None)


def charged(part: Text) -> int | None:
    """Return where the evaluation `part` lists charges or fields around the molecule, None if nowhere."""
    start = max(part.find(_ALGORITHM), part.start)
    end = part.find(b" Final Energy:", start)
    at = part.data.find(_CHARGES, start, end if end >= 0 else part.end)
    return at if at >= 0 else None


def is_printed(text: Text, label: str) -> bool:
    """Tell whether an energy of the correlated method `label` stands anywhere in `text`."""
    if label == "MP2" and text.has(b"==> DF-MP2 Energies <=="):
        return True
    wanted = label.encode()
    return any(
        match.group(1) == wanted
        for pattern, mark in _TOTALS
        for match in matches(pattern, mark, text, text.start, text.end)
    )


def is_extrapolated(text: Text) -> bool:
    """Tell whether an energy extrapolated to the basis-set limit stands anywhere in `text`."""
    return text.has(EXTRAPOLATED)


def is_functional(text: Text, method: str) -> bool:
    """Tell whether `method`, as an input names it, is a density functional that was used."""
    asked = re.sub(r"\W", "", method.upper())
    for match in FUNCTIONAL.finditer(text.data, text.start, text.end):
        used = (match.group(1) or match.group(2)).decode("utf-8", "replace")
        used = re.sub(r"\W", "", used.upper())
        if used and (asked.startswith(used) or used.startswith(asked)):
            return True
    return False


def _density_fitted(part: Text, start: int) -> Energy:
    """Return the energy of the DF-MP2 table at `start`, which must be the sum of its parts."""
    values: dict[bytes, float] = {}
    at = start
    for mark in (b"Reference Energy", b"Correlation Energy", b"Total Energy"):
        match = re.compile(rb"\n[ \t]+" + mark + rb"[ \t]+=").search(part.data, start, part.end)
        if match is None or match.start() - start > _MP2_TABLE:
            raise part.error(start, f"no {mark.decode()} in this DF-MP2 table", mend=CUT_SHORT)
        at = match.end()
        values[mark] = float(part.exact_text(at, f"the DF-MP2 {mark.decode().lower()}"))
    reference, correlation, total = values.values()
    if abs(reference + correlation - total) > 1e-9:
        raise part.error(
            at,
            f"the DF-MP2 total energy {total!r} is not the sum of its parts above",
            mend=CUT_SHORT,
        )
    return Energy("MP2", total, at)


def _scf_energy(part: Text) -> Energy:
    at = unconverged(part)
    if at is not None:
        raise part.error(
            at,
            "the SCF did not converge, so there is no energy",
            mend="rerun with more iterations or another starting guess",
        )
    settings = max(part.find(_ALGORITHM), part.start)
    fractional = part.data.find(_FRACTIONAL, settings, settings + _SETTINGS_BYTES)
    if fractional >= 0:
        raise part.error(
            fractional,
            "an SCF with fractional occupations, which is no state of the molecule",
            mend="give a calculation with whole occupations",
        )
    finals = matches(_SCF, b" Final Energy:", part, part.start, part.end)
    if not finals:
        raise part.error(
            part.start,
            "no final SCF energy for this geometry (looked for 'Final Energy:')",
            mend="check in the output that the SCF ran to its end",
        )
    label = "DFT" if finals[-1].group(1) == b"KS" else "HF"
    final = part.number(finals[-1].end(), "the final SCF energy")
    at = part.find(b"    Total Energy =", finals[-1].end())
    if at >= 0:
        total = part.number(part.data.index(b"=", at), "the total SCF energy")
        if abs(total - final) > 1e-8:
            raise part.error(
                at,
                f"total energy {total!r} differs from the final energy {final!r} printed above it",
                mend="the output is damaged here; rerun or re-copy it",
            )
    return Energy(label, final, finals[-1].end())


def _double_hybrid(part: Text) -> Energy | None:
    at = part.last(_DOUBLE_HYBRID)
    if at >= 0:
        value = part.number(at + len(_DOUBLE_HYBRID), "the double-hybrid energy")
        return Energy("DFT", value, at)
    hybrid = re.compile(rb"MP2 Hybrid\s*=\s*TRUE").search(part.data, part.start, part.end)
    if hybrid is not None:
        raise part.error(
            hybrid.start(),
            "a double-hybrid functional without its final energy "
            f"(looked for {_DOUBLE_HYBRID.decode()!r})",
            mend="check in the output that the MP2 part ran to its end",
        )
    return None
