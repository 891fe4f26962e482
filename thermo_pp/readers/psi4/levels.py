"""Level of theory of an energy of one Psi4 evaluation."""

from __future__ import annotations

import re

import numpy as np
from numpy.typing import NDArray

from thermo_pp.readers.level import Level
from thermo_pp.readers.psi4.energies import EXTRAPOLATED, FUNCTIONAL, Energy
from thermo_pp.readers.psi4.jobs import REPLACED
from thermo_pp.readers.text import CUT_SHORT, Text

_INVENTED = "ANONYMOUS"
_FITTING = "AUX)"
_BASIS_BYTES = 120
"""A heading and the name of the basis set below it."""
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
        at["basis"] = at["method"] = part.find(EXTRAPOLATED)
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
    line = part.need(b"Stage ", part.find(EXTRAPOLATED), lacking="no table of the stages")
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
    match = FUNCTIONAL.search(part.data, part.start, part.end)
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
