"""Level of theory and energies of one Psi4 evaluation, and which of its energies is the best one.

An evaluation is one SCF with whatever followed it at the same geometry. Energies that are no
method's own result (spin-component-scaled ones beside MP2, for instance) are left aside; an energy
of a method that is not listed here is an error where that evaluation is wanted, never passed over
for a lower one.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.readers.level import Level
from thermo_pp.readers.line_marks import matches
from thermo_pp.readers.psi4.jobs import REPLACED
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

_SCF = re.compile(rb"[ \t]*@(?:DF-|CD-)?(?:R|U|RO|CU)(HF|KS) Final Energy:")
_FUNCTIONAL = re.compile(
    rb"=> (?:Composite Functional: ([^\r\n]+?)|([^\r\n]+?) Composite Functional) <="
)
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
_INVENTED = "ANONYMOUS"
_FITTING = "AUX)"
_BASIS_BYTES = 120
"""A heading and the name of the basis set below it."""
_MP2_TABLE = 800
_EXTRAPOLATED = b"==> CBS <=="
_DOUBLE_HYBRID = b"@Final double-hybrid DFT total energy"
_DISPERSION = re.compile(rb": Empirical Dispersion <=\s+([^\r\n]*)")
_DISPERSION_ENERGY = re.compile(rb"Empirical Dispersion Energy =[ ]+-?[\d.]*[1-9]")
_GRIMME = re.compile(r"Grimme's -(\w+)(?: \((.*)\))? Dispersion Correction")
_CITATION = re.compile(r"\((?:19|20)\d\d\)")
_DAMPING = {
    None: "",
    "zero-damping": "",
    "BJ-damping": "(BJ)",
    "zero-damping, short-range refitted": "M",
    "BJ-damping, short-range refitted": "M(BJ)",
}
_PCM_SOLVENT = re.compile(rb"^[ \t]*Solvent name\s*[:.=]+\s*([^\r\n]+)", re.MULTILINE)
_CORES = ((2, 0), (10, 1), (18, 5), (36, 9), (54, 18), (86, 27), (118, 43))
"""Up to which atomic number an atom has how many core orbitals."""
_LEBEDEV = frozenset(
    (
        *(6, 14, 26, 38, 50, 74, 86, 110, 146, 170, 194, 230, 266, 302, 350, 434, 590, 770, 974),
        *(1202, 1454, 1730, 2030, 2354, 2702, 3074, 3470, 3890, 4334, 4802, 5294, 5810),
    )
)
"""Sizes of the angular grids that exist (Lebedev and Laikov, Doklady Mathematics 59 (1999) 477), from memory."""
_OCCUPIED = ("FC", "OCC", "AOCC", "#FZDC", "#DOCC", "#SOCC")
_FROZEN_UNOCCUPIED = ("FV", "#FZVR")
_FROZEN_VIRTUALS = re.compile(rb"Number of frozen virtual orbitals:\s*(\d+)")
_ALPHA = re.compile(rb"\n[ \t]+Nalpha[ \t]+=[ \t]+(\d+)")
_FROZEN_COUNT = re.compile(rb"Number of frozen core orbitals:\s*(\d+)")
_FROZEN_TABLE = re.compile(
    rb"^[ \t]*(?:IRREP[ \t]+)?(?:# MOs[ \t]+)?(# FZDC|FC)[ \t]", re.MULTILINE
)


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
    extrapolated = part.find(_EXTRAPOLATED)
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
    return text.has(_EXTRAPOLATED)


def is_functional(text: Text, method: str) -> bool:
    """Tell whether `method`, as an input names it, is a density functional that was used."""
    asked = re.sub(r"\W", "", method.upper())
    for match in _FUNCTIONAL.finditer(text.data, text.start, text.end):
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


def level(part: Text, energy: Energy, numbers: NDArray[np.int64]) -> Level:
    """Return the level of theory of `energy`, one of the energies of the evaluation `part`."""
    at = {"method": energy.at}
    method, grid = energy.label, None
    frozen: str | None = "none"
    if energy.label == "DFT":
        method, at["method"] = functional(part)
        grid = _grid(part, at)
    elif energy.label != "HF":
        frozen = _frozen_core(part, numbers, at)
    basis = None
    primary = part.find(b"==> Primary Basis <==")
    if energy.label == "CBS":
        method, basis = _extrapolation(part)
        at["basis"] = at["method"] = part.find(_EXTRAPOLATED)
    elif primary >= 0:
        basis = _basis(part, primary, at)
    return Level(method, basis, _dispersion(part, at), _solvent(part, at), grid, frozen, at)


def _basis(part: Text, primary: int, at: dict[str, int]) -> str | None:
    """Return the name of the basis set below its heading, a longer table where much is printed."""
    detailed = b"-AO BASIS SET INFORMATION:" in part.data[primary : primary + _BASIS_BYTES]
    separator = "=" if detailed else ":"
    name, blend = (b"    Name  ", b"    Blend  ") if detailed else (b"Basis Set:", b"Blend:")
    at["basis"] = part.need(name, primary, lacking="no name of the basis set")
    if at["basis"] - primary > _BASIS_BYTES:
        raise part.expected(part.next_line(primary, 2), "the name of the basis set")
    basis = part.line(at["basis"]).partition(separator)[2].strip() or None
    if basis is not None and basis.endswith(_FITTING):
        raise part.expected(at["basis"], "the name of the basis set")
    if basis is not None and basis.startswith(_INVENTED):
        below = part.need(blend, primary, lacking="no names of the basis sets")
        if below - primary > _BASIS_BYTES:  # those of another, auxiliary set
            raise part.expected(part.next_line(at["basis"]), "the names of the basis sets")
        at["basis"] = below
        basis = part.line(at["basis"]).partition(separator)[2].strip() or None
    return basis


def _extrapolation(part: Text) -> tuple[str, str]:
    """Return methods and basis sets of an extrapolation's stages, without the reference's own."""
    line = part.need(b"Stage ", part.find(_EXTRAPOLATED), lacking="no table of the stages")
    line = part.next_line(line, 2)
    stages: list[tuple[str, str]] = []
    while b" / " in part.rest(line):
        left, _, right = part.line(line).partition(" / ")
        stages.append((" ".join(left.split()[1:]).upper(), right.split()[0]))
        line = part.next_line(line)
    if not stages:
        raise part.expected(line, "stages of an extrapolation")
    stages = stages[1:] or stages
    method = " + ".join(method for method, _ in stages)
    return f"{method}/CBS", " + ".join(basis for _, basis in stages)


def functional(part: Text) -> tuple[str, int]:
    """Return the name of the functional of the evaluation `part` and where it stands."""
    match = _FUNCTIONAL.search(part.data, part.start, part.end)
    if match is None:
        raise part.error(
            part.start,
            "a DFT energy without the name of its functional (looked for 'Composite Functional')",
            mend="check that this is a whole Psi4 output",
        )
    name = match.group(1) or match.group(2)
    return name.decode("utf-8", "replace").upper(), match.start()


def _dispersion(part: Text, at: dict[str, int]) -> str | None:
    """Return the name of the dispersion correction; Psi4 prints a block wherever it uses one.

    None where its energy is printed without that block.
    """
    match = _DISPERSION.search(part.data, part.start, part.end)
    if match is not None:
        at["dispersion"] = match.start(1)
        text = match.group(1).decode("utf-8", "replace").strip()
        if text.startswith("=>") or _CITATION.search(text) is not None:
            raise part.expected(at["dispersion"], "the name of the dispersion correction")
        known = _GRIMME.fullmatch(text)
        if known is None or known.group(2) not in _DAMPING:
            return text
        return known.group(1) + _DAMPING[known.group(2)]
    nonlocal_part = part.find(b"=> VV10 Non-Local Parameters <=")
    if nonlocal_part >= 0:
        at["dispersion"] = nonlocal_part
        return "VV10"
    return None if _DISPERSION_ENERGY.search(part.data, part.start, part.end) else "none"


def _solvent(part: Text, at: dict[str, int]) -> str:
    """Return the solvent model; Psi4 prints the energy of a continuum wherever it uses one."""
    place = part.find(b"PCM Polarization Energy")
    if place < 0:
        return "none"
    at["solvent"] = place
    name = _PCM_SOLVENT.search(part.data, part.start, part.end)
    return "PCM" if name is None else f"PCM({name.group(1).decode('utf-8', 'replace').strip()})"


def _grid(part: Text, at: dict[str, int]) -> str | None:
    start = part.find(b"=> Molecular Quadrature <=")
    if start < 0:
        return None
    at["grid"] = start
    words = []
    for mark in (b"Radial Points", b"Spherical Points"):
        place = part.need(mark, start, lacking=f"no {mark.decode().lower()} of the grid")
        word = part.rest(place).partition(b"=")[2].strip()
        if not word.isdigit():
            raise part.expected(place, "the number of grid points")
        words.append(word.decode())
    if int(words[1]) not in _LEBEDEV:
        raise part.expected(place, "the number of points of a Lebedev grid")
    place = part.find(b"Pruning Scheme", start)
    pruning = part.line(place).partition("=")[2].strip().lower() if place >= 0 else ""
    return f"({words[0]},{words[1]})" + (f" pruning {pruning}" if pruning else "")


def _frozen_core(part: Text, numbers: NDArray[np.int64], at: dict[str, int]) -> str | None:
    """Return "none", "frozen", or how many orbitals are frozen where that is not the usual core.

    None where the file does not say. The usual core is the noble gas before each atom.
    """
    found = _frozen_orbitals(part, at)
    if found is None:
        return None
    count, virtual = found
    extra = f", {virtual} virtual orbitals too" if virtual else ""
    if count == 0:
        return "none" + extra
    usual = sum(next(core for last, core in _CORES if z <= last) for z in numbers)
    replaced = REPLACED.search(part.data, part.start, part.end)
    if replaced is not None:
        usual = max(0, usual - int(replaced.group(1)) // 2)
    elif part.find(b"ECP") >= 0:
        return None
    return ("frozen" if count == usual else f"frozen: {count} orbitals") + extra


def _frozen_orbitals(part: Text, at: dict[str, int]) -> tuple[int, int] | None:
    """Return how many occupied and virtual orbitals are frozen; each module has its own table."""
    counted = _FROZEN_COUNT.search(part.data, part.start, part.end)
    if counted is not None:
        at["frozen_core"] = counted.start()
        unused = _FROZEN_VIRTUALS.search(part.data, counted.end(), part.end)
        return int(counted.group(1)), 0 if unused is None else int(unused.group(1))
    place = part.find(b"CLASS    FOCC")
    if place >= 0:
        at["frozen_core"] = place
        row = part.next_line(place)
        counts = part.floats(row, 6, "numbers of orbitals", skip=1)
        frozen, occupied, active, virtual_active, virtual, virtual_frozen = counts
        if frozen + active != occupied or virtual_active + virtual_frozen != virtual:
            raise part.expected(row, "frozen and active orbitals that add up to all of them")
        return int(frozen), int(virtual_frozen)
    table = _FROZEN_TABLE.search(part.data, part.start, part.end)
    if table is None:
        return None
    at["frozen_core"] = table.start(1)
    columns = part.line(table.start(1)).replace("# ", "#").split()
    column = columns.index("FC" if table.group(1) == b"FC" else "#FZDC")
    rule = part.next_line(table.start(1))
    if part.rest(rule).strip(b"-= \t\r"):
        raise part.expected(rule, "a rule below the headings of the orbitals")
    filling = [i for i, name in enumerate(columns) if name in _OCCUPIED]
    total = filled = virtuals = 0
    unoccupied = [i for i, name in enumerate(columns) if name in _FROZEN_UNOCCUPIED]
    line = first = part.next_line(rule)
    while len(words := part.rest(line).split()) == len(columns) and words[-1].isdigit():
        total += int(part.floats(line, 1, "a number of frozen orbitals", skip=column)[0])
        filled += sum(int(part.floats(line, 1, "a number of orbitals", skip=i)[0]) for i in filling)
        for i in unoccupied:
            virtuals += int(part.floats(line, 1, "a number of orbitals", skip=i)[0])
        line = part.next_line(line)
    if line == first:
        raise part.expected(line, "a row of numbers of orbitals")
    alpha = _ALPHA.search(part.data, part.start, part.end)
    if len(filling) > 1 and alpha is not None and int(alpha.group(1)) != filled:
        raise part.error(
            line,
            f"{filled} occupied orbitals in the table above, {alpha.group(1).decode()} alpha "
            f"electrons on line {part.line_number(alpha.start(1))}",
            mend=CUT_SHORT,
        )
    return total, virtuals
