"""Energies of a GAMESS run and what belongs to their level of theory.

An evaluation is one SCF (``FINAL RHF ENERGY IS``) with what follows it up to the next one. Which energy is wanted is
told by the options (MPLEVL, CCTYP, DFTTYP), never by what is printed: spin-component-scaled, CCSD[T] and excited-state
energies stand beside it.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from thermo_pp.formulas.repulsion import nuclear_repulsion
from thermo_pp.readers.gamess.geometry import Geometry
from thermo_pp.readers.gamess.options import Run
from thermo_pp.readers.level import Level
from thermo_pp.readers.line_marks import first_match, last_match
from thermo_pp.readers.text import CUT_SHORT, Text

FINAL = re.compile(rb"^ FINAL ([\w+*/()\- ]*?) ?ENERGY IS(?=[ \t])", re.MULTILINE)
SEMIEMPIRICAL = ("AM1", "PM3", "MNDO", "RM1")
_WANTED: dict[str, re.Pattern[bytes]] = {
    "MP2": re.compile(rb"^ +E\(MP2\)=", re.MULTILINE),
    "CCD": re.compile(rb"^ +CCD +ENERGY:", re.MULTILINE),
    "CCSD": re.compile(rb"^ +CCSD +ENERGY:", re.MULTILINE),
    "CCSD(T)": re.compile(rb"^ +CCSD\(T\) ENERGY:", re.MULTILINE),
}
_COUPLED = {
    "CCD": "CCD",
    "CCSD": "CCSD",
    "CCSD(T)": "CCSD(T)",
    "EOM-CCSD": "CCSD",
    "R-CC": "CCSD(T)",
}
_REFERENCE = re.compile(rb"^ +(?:REFERENCE ENERGY:|E\((?:SCF|0)\)=)", re.MULTILINE)
_CORRELATION = re.compile(rb"CORR\.E= *(-?\d+\.\d+)")
_UNCONVERGED = (
    b"SCF IS UNCONVERGED",
    b"SCF DOES NOT CONVERGE",
    b"CC ITERATIONS DID NOT CONVERGE",
    b"CCSD DID NOT CONVERGE",
    b"CCSD HAS NOT CONVERGED",
)
_DISPERSION = re.compile(rb"^ GRIMME'S DISPERSION ENERGY[ =]+(-?\d+\.\d+)", re.MULTILINE)
_PARTS = (b"ONE ELECTRON ENERGY =", b"TWO ELECTRON ENERGY =", b"NUCLEAR REPULSION ENERGY =")
_SOLVENT = (b"INPUT FOR PCM", b"POLARIZABLE CONTINUUM", b"$PCM ", b"PCM SOLVATION", b"COSMO")
_IN_SOLVENT = re.compile(rb"[^\n]*TOTAL FREE ENERGY IN SOLVENT[^=\n]*=")
_SOLVNT = re.compile(rb"[^\n]*SOLVNT *= *(\w+)")
_VERSION = re.compile(rb"[^\n]*IDCVER *= *(\d)")
_DOUBLE_HYBRID = re.compile(r"PLYP|XYG|DSD|-DH|\bDH")
_BASIS = re.compile(rb"^ +GBASIS=(\S*) +IGAUSS= +(\d+) +POLAR=(\S*)", re.MULTILINE)
_POPLE = {"STO": "STO-{}G", "N21": "{}-21G", "N31": "{}-31G", "N311": "{}-311G"}
_GRID = re.compile(rb"[^\n]*NRAD *= +(\d+) +(?:NLEB *= +(\d+)|NTHE *= +(\d+) +NPHI *= +(\d+))")
_CORE = re.compile(
    rb"NACORE *= +(\d+)|NUMBER OF CORE(?: ORBITALS| MO'?S)? *=? +(\d+)|NCORE +=? *(\d+)|"
    rb"FROZEN CORE ORBITALS *=? +(\d+)"
)
_CORES = ((2, 0), (10, 1), (18, 5), (36, 9), (54, 18), (86, 27), (118, 43))
"""Up to which atomic number an atom has how many core orbitals."""


@dataclass(frozen=True)
class Energy:
    """An energy in hartree; `at` is the offset behind its label, `scf_at` the same of the SCF it stands on."""

    label: str
    value: float
    at: int
    scf_at: int


def label_of(text: Text, run: Run) -> str:
    """Return which energy the run must have; ReadError where it is one not known here."""
    options = run.options
    coupled, level = options.get("CCTYP", "NONE"), options.get("MPLEVL", "0")
    functional = options.get("DFTTYP", "NONE")
    unknown = None
    if coupled not in ("NONE", ""):
        if coupled in _COUPLED:
            return _COUPLED[coupled]
        unknown = f"CCTYP={coupled}"
    elif level not in ("0", "2"):
        unknown = f"MPLEVL={level}"
    elif functional not in ("NONE", ""):
        if level == "2" or _DOUBLE_HYBRID.search(functional):
            unknown = f"the double hybrid DFTTYP={functional}"
    elif level == "2":
        return "MP2"
    if unknown is not None:
        raise text.error(
            run.options_at,
            f"a run with {unknown}, whose energy is not read",
            mend="HF, density functionals, MP2, CCD, CCSD and CCSD(T) are read",
        )
    return "HF" if functional in ("NONE", "") else "DFT"


def energy(text: Text, run: Run, final: re.Match[bytes], stop: int, shape: Geometry) -> Energy:
    """Return the energy of the evaluation whose SCF ends at `final`; `stop` is where the next one ends.

    Raises
    ------
    ReadError
        An SCF that did not converge, an energy that is damaged, missing, or does not agree with what else is printed.
    """
    label = label_of(text, run)
    name = final.group(1).decode("utf-8", "replace").strip()
    scf = float(text.exact_text(final.end(), "the final SCF energy"))
    begin = max(run.start, final.start() - 2000)
    failed = max(text.data.find(mark, begin, stop) for mark in _UNCONVERGED)
    if failed >= 0 or scf == 0.0:
        raise text.error(
            failed if failed >= 0 else final.start(),
            "the SCF or the coupled-cluster iterations did not converge, so there is no energy",
            mend="rerun with more iterations or another starting guess",
        )
    kind = name.rpartition("-")[2] if name.startswith(("R-", "U-", "RO-")) else name
    if kind in SEMIEMPIRICAL:
        if label != "HF":
            raise text.expected(final.start(), f"the final energy of {label}")
        return Energy("semiempirical", scf, final.end(), final.end())
    density = name.startswith(("R-", "U-", "RO-"))
    if density != (label == "DFT") or (not density and name not in ("RHF", "UHF", "ROHF", "")):
        raise text.error(
            final.start(),
            f"the final energy is called {name!r}, the options ask for {label}",
            mend="HF, density functionals, MP2, CCD, CCSD and CCSD(T) are read",
        )
    _check_dispersion(text, final, stop, scf, shape)
    solvated = _in_solvent(text, run, final, stop, scf)
    if label not in _WANTED:
        _check_uncorrelated(text, final, stop)
        return solvated or Energy(label, scf, final.end(), final.end())
    if solvated is not None:
        raise text.error(
            solvated.at,
            "a correlated energy with terms of the solvent beside it, which are not added up",
            mend="give the SCF in solution, or the correlated energy in the gas phase",
        )
    return _correlated(text, label, final, stop, scf)


def _check_uncorrelated(text: Text, final: re.Match[bytes], stop: int) -> None:
    """Refuse a correlated energy behind an SCF that the options say nothing follows."""
    for label, pattern in _WANTED.items():
        mark = b"E(MP2)=" if label == "MP2" else b" ENERGY:"
        match = first_match(pattern, mark, text, final.end(), stop)
        if match is not None:
            raise text.error(
                match.start(),
                f"an energy of {label}, which the options do not ask for",
                mend=CUT_SHORT,
            )


def _correlated(text: Text, label: str, final: re.Match[bytes], stop: int, scf: float) -> Energy:
    mark = b"E(MP2)=" if label == "MP2" else b" ENERGY:"
    match = last_match(_WANTED[label], mark, text, final.end(), stop)
    if match is None:
        raise text.error(
            final.start(),
            f"the options ask for {label}, but no {label} energy follows this SCF",
            mend="check that the run did what it was asked to",
        )
    at = match.end()
    value = float(text.exact_text(at, f"the {label} energy"))
    references = list(_REFERENCE.finditer(text.data, final.end(), at))
    if references:
        reference = float(text.exact_text(references[-1].end(), "the reference energy"))
        if abs(reference - scf) > 2e-6:
            raise text.error(
                references[-1].start(),
                f"the reference energy {reference!r} here is not that of the SCF, {scf!r}",
                mend=CUT_SHORT,
            )
    correlation = _CORRELATION.search(text.rest(at))
    if not -0.05 * abs(scf) - 0.5 < value - scf < 1e-6 or (
        correlation is not None and abs(scf + float(correlation.group(1)) - value) > 2e-6
    ):
        raise text.error(
            at,
            f"the {label} energy {value!r} is not the SCF energy {scf!r} and its correlation energy",
            mend=CUT_SHORT,
        )
    second = text.data.find(b"E(2)=", final.end(), at)
    if label == "MP2" and second >= 0:
        part = float(text.exact_text(second + 5, "the second-order energy"))
        first = text.data.find(b"E(1)=", final.end(), at)
        single = float(text.exact_text(first + 5, "the first-order energy")) if first >= 0 else 0.0
        if abs(scf + single + part - value) > 2e-6:
            raise text.error(
                at, f"{value!r} is not the sum of the energies above it", mend=CUT_SHORT
            )
    return Energy(label, value, at, final.end())


def _check_dispersion(
    text: Text, final: re.Match[bytes], stop: int, scf: float, shape: Geometry
) -> None:
    """Refuse a dispersion energy that is not known to be in the final energy."""
    match = first_match(
        _DISPERSION, b"GRIMME'S DISPERSION", text, max(0, final.start() - 20000), stop
    )
    if match is None:
        return
    places = [text.data.find(mark, final.end(), stop) for mark in _PARTS]
    if min(places) >= 0:
        parts = [
            float(text.exact_text(place + len(mark), "an energy"))
            for place, mark in zip(places, _PARTS, strict=True)
        ]
        extra = (
            scf - parts[0] - parts[1] - nuclear_repulsion(shape.numbers, shape.positions_angstrom)
        )
        if abs(extra - float(match.group(1))) < 2e-5:
            return
    raise text.error(
        match.start(),
        "a dispersion energy that is not known to be in the final energy",
        mend="give an output with its energy components (ENERGY COMPONENTS)",
    )


def _in_solvent(
    text: Text, run: Run, final: re.Match[bytes], stop: int, scf: float
) -> Energy | None:
    """Return the free energy in solution where it is not the SCF's own energy."""
    if _solvent_at(text, run, final.start()) < 0:
        return None
    match = last_match(_IN_SOLVENT, b"TOTAL FREE ENERGY IN", text, final.end(), stop)
    if match is None:
        raise text.error(
            final.start(),
            "an SCF in solution without its total free energy",
            mend="give an output that prints 'TOTAL FREE ENERGY IN SOLVENT'",
        )
    at = match.end()
    value = float(text.exact_text(at, "the total free energy in solution"))
    if abs(value - scf) < 1e-6:
        return None
    return Energy(label_of(text, run), value, at, final.end())


def _solvent_at(text: Text, run: Run, end: int) -> int:
    """Return where a solvent is spoken of before `end`, -1 for nowhere."""
    return max(text.data.find(mark, run.options_at, end) for mark in _SOLVENT)


def level(text: Text, run: Run, found: Energy, shape: Geometry) -> Level:
    """Return the level of theory of an energy; frozen is the usual core, that of the noble gas before each atom."""
    at = {"method": run.options_at}
    basis = _basis(text, run, at)
    method, dispersion = found.label, "none"
    if found.label == "semiempirical":
        method, basis = basis or found.label, None
        at.pop("basis", None)
    elif found.label == "DFT":
        method = run.options["DFTTYP"]
        match = first_match(_DISPERSION, b"GRIMME'S DISPERSION", text, run.start, run.end)
        if match is not None:
            dispersion, at["dispersion"] = _dispersion_name(text, run), match.start()
    relativistic = run.options.get("RELWFN", "NONE")
    if relativistic not in ("NONE", ""):
        method = f"{relativistic}-{method}"
    grid = None
    if (
        found.label == "DFT"
        and (match := first_match(_GRID, b"NRAD", text, run.start, run.end)) is not None
    ):
        at["grid"] = match.start()
        grid = "(" + ",".join(one.decode() for one in match.groups() if one) + ")"
    frozen: str | None = "none"
    if found.label in _WANTED:
        core = _CORE.search(text.data, run.options_at, found.at)
        frozen = None
        if core is not None:
            at["frozen_core"] = core.start()
            count = next(int(one) for one in core.groups() if one)
            usual = sum(next(core for last, core in _CORES if z <= last) for z in shape.numbers)
            frozen = (
                "none" if not count else "frozen" if count == usual else f"frozen: {count} orbitals"
            )
    solvent = _solvent_at(text, run, found.scf_at)
    words: str | None = "none"
    if solvent >= 0:
        at["solvent"] = solvent
        name = first_match(_SOLVNT, b"SOLVNT", text, run.start, found.scf_at)
        model = "SMD" if text.part(run.options_at, found.scf_at).find(b"SMD") >= 0 else "PCM"
        words = (
            model
            if name is None
            else f"{model}({name.group(1).decode('utf-8', 'replace').lower()})"
        )
    return Level(method, basis, dispersion, words, grid, frozen, at)


def _dispersion_name(text: Text, run: Run) -> str:
    match = first_match(_VERSION, b"IDCVER", text, run.start, run.end)
    versions = {b"1": "D1", b"2": "D2", b"3": "D3", b"4": "D3(BJ)"}
    return "Grimme" if match is None else versions.get(match.group(1), "Grimme")


def _basis(text: Text, run: Run, at: dict[str, int]) -> str | None:
    """Return the usual name of the basis set that the options describe, None where they name none."""
    match = first_match(_BASIS, b"GBASIS=", text, run.start, run.end)
    lost = text.data.find(b"     BASIS OPTIONS", run.start, run.options_at)
    if match is None and lost >= 0:
        raise text.error(lost, "no basis set among these options", mend=CUT_SHORT)
    if match is None or not match.group(1):
        return None
    at["basis"] = match.start(1)
    name, gauss = match.group(1).decode("utf-8", "replace"), int(match.group(2))
    if name not in _POPLE:
        return name
    block = text.data[match.start() : match.start() + 400].decode("utf-8", "replace")
    number = dict(re.findall(r"(ND|NF|NP)FUNC= +(\d+)", block))
    diffuse = "+" * sum(bool(re.search(rf"{key}= +T", block)) for key in ("DIFFSP", " DIFFS"))
    heavy = [f"{number.get(key, '0')}{letter}" for key, letter in (("ND", "d"), ("NF", "f"))]
    heavy = [one.removeprefix("1") for one in heavy if not one.startswith("0")]
    light = number.get("NP", "0")
    text_of = (
        _POPLE[name].format(gauss).replace("G", diffuse + "G")
        if diffuse
        else _POPLE[name].format(gauss)
    )
    if heavy or light != "0":
        light_words = "" if light == "0" else "," + f"{light}p".removeprefix("1")
        text_of += f"({''.join(heavy)}{light_words})"
    return text_of
