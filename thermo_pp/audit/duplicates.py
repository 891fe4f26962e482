"""Duplicates: the same structure twice at one level of theory; mirror images are told apart.

Structures are compared only within groups that have the same atoms, charge, multiplicity, level and
kind of job, and there only with those whose energy, distances from the centre and distances between
atoms agree, so that a folder of ten thousand stays quick. Two structures that lie on each other with
a root mean square distance of r over n atoms have sorted distances from the centre that differ by at
most r sqrt(n), and sorted distances between atoms that differ by at most r sqrt(2 n (n - 1)), as
lengths of the vectors of differences: what differs by more need not be superposed.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding
from thermo_pp.formulas.superposition import match
from thermo_pp.records import Calculation

SAME_ANGSTROM = 0.05
"""Structures are the same below this root mean square distance after superposition."""
SAME_ENERGY_HARTREE = 2e-4
"""Energies of one structure at one level agree this well, loosely optimised ones too."""

_REMEMBERED_BYTES = 64 * 2**20

FloatArray = NDArray[np.float64]


def duplicate_findings(calculations: Sequence[Calculation]) -> tuple[Finding, ...]:
    """Return a finding for every calculation whose structure, or mirror image, came before."""
    groups: dict[tuple[object, ...], list[Calculation]] = defaultdict(list)
    for calculation in calculations:
        groups[_group(calculation)].append(calculation)
    found: dict[str, Finding] = {}
    for group in groups.values():
        for later, earlier, how in _pairs(group):
            found.setdefault(later.path, _finding(later, earlier, how))
    return tuple(found[each.path] for each in calculations if each.path in found)


def _group(calculation: Calculation) -> tuple[object, ...]:
    return (
        calculation.numbers.tobytes() if len(calculation.numbers) == 1 else calculation.formula,
        calculation.charge,
        calculation.multiplicity,
        calculation.method,
        calculation.basis,
        calculation.dispersion,
        calculation.solvent,
        calculation.grid,
        calculation.frozen_core,
        calculation.wavenumbers_cm is None,
        tuple(np.round(np.sort(calculation.masses_u), 1)),
    )


def _pairs(group: Sequence[Calculation]) -> list[tuple[Calculation, Calculation, str]]:
    """Return (later, earlier, how) for every calculation that repeats an earlier one."""
    pairs: list[tuple[Calculation, Calculation, str]] = []
    kept = _Kept(len(group), len(group[0].numbers))
    for calculation in group:
        energy, radii = _energy(calculation), _radii(calculation)
        for earlier in kept.alike(energy, radii):
            how = _same(calculation, earlier, kept)
            if how:
                pairs.append((calculation, earlier, how))
                break
        else:
            kept.add(calculation, energy, radii)
    return pairs


class _Kept:
    """Structures of one group that differ from each other, with what does not depend on place and numbering."""

    def __init__(self, most: int, atoms: int) -> None:
        self._calculations: list[Calculation] = []
        self._energy = np.empty(most)
        self._radii = np.empty((most, atoms))
        self._size = np.empty(most)
        self._distances: dict[int, FloatArray] = {}
        self._bytes = 0

    def add(self, calculation: Calculation, energy: float, radii: FloatArray) -> None:
        """Keep a structure."""
        count = len(self._calculations)
        self._calculations.append(calculation)
        self._energy[count] = energy
        self._radii[count] = radii
        self._size[count] = np.linalg.norm(radii)

    def alike(self, energy: float, radii: FloatArray) -> list[Calculation]:
        """Return the structures that may be the same, in the order in which they came."""
        count = len(self._calculations)
        most = SAME_ANGSTROM * np.sqrt(len(radii))
        differs = np.abs(self._energy[:count] - energy) > SAME_ENERGY_HARTREE  # unknown: no
        differs |= np.abs(self._size[:count] - np.linalg.norm(radii)) > most
        near = np.flatnonzero(~differs)
        apart = np.linalg.norm(self._radii[near] - radii, axis=-1)
        return [self._calculations[place] for place in near[apart <= most]]

    def distances(self, calculation: Calculation) -> FloatArray:
        """Return all distances of a structure, remembered while there is room."""
        known = self._distances.get(id(calculation))
        if known is None:
            known = _distances(calculation)
            if self._bytes < _REMEMBERED_BYTES:
                self._distances[id(calculation)] = known
                self._bytes += known.nbytes
        return known


def _same(one: Calculation, other: Calculation, kept: _Kept) -> str:
    """Return in what way two calculations are of one structure, empty where they are not."""
    if one.sha256 == other.sha256:
        return "bytes"
    if _same_as_they_stand(one, other):
        return "structure"
    n = len(one.numbers)
    apart = np.linalg.norm(kept.distances(one) - kept.distances(other))
    if apart > SAME_ANGSTROM * np.sqrt(2.0 * n * (n - 1)):
        return ""
    a, b = (one.numbers, one.positions_angstrom), (other.numbers, other.positions_angstrom)
    if match(*a, *b, enough_angstrom=SAME_ANGSTROM) < SAME_ANGSTROM:
        return "structure"
    mirrored = match(*a, *b, mirror=True, enough_angstrom=SAME_ANGSTROM)
    return "mirror image" if mirrored < SAME_ANGSTROM else ""


def _same_as_they_stand(one: Calculation, other: Calculation) -> bool:
    """Tell whether two structures lie on each other without being turned, the atoms in the same order."""
    if not np.array_equal(one.numbers, other.numbers):
        return False
    apart = one.positions_angstrom - other.positions_angstrom
    apart = apart - apart.mean(axis=0)
    return bool(np.sum(apart**2) < SAME_ANGSTROM**2 * len(apart))


def _energy(calculation: Calculation) -> float:
    return np.nan if calculation.energy_hartree is None else calculation.energy_hartree


def _radii(calculation: Calculation) -> FloatArray:
    """Return the distances of the atoms from their centre, sorted within each element."""
    x = calculation.positions_angstrom
    radii = np.linalg.norm(x - x.mean(axis=0), axis=-1)
    return np.asarray(radii[np.lexsort((radii, calculation.numbers))])


def _distances(calculation: Calculation) -> FloatArray:
    """Return all distances between atoms, sorted within each pair of elements."""
    order = np.argsort(calculation.numbers, kind="stable")
    z, x = calculation.numbers[order], calculation.positions_angstrom[order]
    first, second = np.triu_indices(len(x), k=1)
    distances = np.linalg.norm(x[first] - x[second], axis=-1)
    return np.asarray(distances[np.lexsort((distances, z[second], z[first]))])


def _finding(later: Calculation, earlier: Calculation, how: str) -> Finding:
    line = later.where.get("positions_angstrom")
    if how == "mirror image":
        return Finding(
            "mirror-image",
            "note",
            later.path,
            line,
            f"the mirror image of {earlier.path}",
            "both hands are counted for each of the two; keep one, or list them as conformers",
        )
    if how == "bytes":
        what = f"the same file as {earlier.path}, byte for byte"
    else:
        what = f"the same structure as {earlier.path} at the same level of theory"
    return Finding(
        "duplicate-structure",
        "warning",
        later.path,
        line,
        what,
        "count it once: leave one of the two out of a set of conformers",
    )
