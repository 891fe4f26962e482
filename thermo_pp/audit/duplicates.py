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
from dataclasses import dataclass
from typing import Literal, NamedTuple

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
How = Literal["bytes", "structure", "mirror image"]


@dataclass(frozen=True, eq=False)
class Shape:
    """What is compared of one structure.

    Attributes
    ----------
    kinds : shape (n,), int
        Atoms of one kind may take each other's place: atomic numbers, or classes with isotopes.
    positions_angstrom : shape (n, 3)
    energy_hartree : float or None
    sha256 : str
        Of the file, or of the part of it that holds the structure.
    """

    kinds: NDArray[np.int64]
    positions_angstrom: FloatArray
    energy_hartree: float | None
    sha256: str


class Repeat(NamedTuple):
    """A structure, by its number among those compared, that repeats an earlier one."""

    later: int
    earlier: int
    how: How


def duplicate_findings(calculations: Sequence[Calculation]) -> tuple[Finding, ...]:
    """Return a finding for every calculation whose structure, or mirror image, came before."""
    groups: dict[tuple[object, ...], list[Calculation]] = defaultdict(list)
    for calculation in calculations:
        groups[_group(calculation)].append(calculation)
    found: dict[str, Finding] = {}
    for group in groups.values():
        for later, earlier, how in repeats([_shape(calculation) for calculation in group]):
            found.setdefault(group[later].path, _finding(group[later], group[earlier], how))
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


def _shape(calculation: Calculation) -> Shape:
    return Shape(
        calculation.numbers,
        calculation.positions_angstrom,
        calculation.energy_hartree,
        calculation.sha256,
    )


def repeats(shapes: Sequence[Shape]) -> list[Repeat]:
    """Return every structure that repeats an earlier one, or the mirror image of an earlier one.

    Parameters
    ----------
    shapes : sequence of Shape
        With the same kinds of atoms. The earlier one repeats none itself.
    """
    found: list[Repeat] = []
    kept = _Kept(len(shapes), len(shapes[0].kinds)) if shapes else None
    for number, shape in enumerate(shapes):
        assert kept is not None
        energy, radii = _energy(shape), _radii(shape)
        for earlier in kept.alike(energy, radii):
            how = _same(shape, shapes[earlier], kept)
            if how is not None:
                found.append(Repeat(number, earlier, how))
                break
        else:
            kept.add(number, shape, energy, radii)
    return found


class _Kept:
    """Structures of one group that differ from each other, with what does not depend on place and numbering."""

    def __init__(self, most: int, atoms: int) -> None:
        self._numbers: list[int] = []
        self._energy = np.empty(most)
        self._radii = np.empty((most, atoms))
        self._size = np.empty(most)
        self._distances: dict[int, FloatArray] = {}
        self._bytes = 0

    def add(self, number: int, shape: Shape, energy: float, radii: FloatArray) -> None:
        """Keep a structure."""
        count = len(self._numbers)
        self._numbers.append(number)
        self._energy[count] = energy
        self._radii[count] = radii
        self._size[count] = np.linalg.norm(radii)

    def alike(self, energy: float, radii: FloatArray) -> list[int]:
        """Return the structures that may be the same, in the order in which they came."""
        count = len(self._numbers)
        most = SAME_ANGSTROM * np.sqrt(len(radii))
        differs = np.abs(self._energy[:count] - energy) > SAME_ENERGY_HARTREE  # unknown: no
        differs |= np.abs(self._size[:count] - np.linalg.norm(radii)) > most
        near = np.flatnonzero(~differs)
        apart = np.linalg.norm(self._radii[near] - radii, axis=-1)
        return [self._numbers[place] for place in near[apart <= most]]

    def distances(self, shape: Shape) -> FloatArray:
        """Return all distances of a structure, remembered while there is room."""
        known = self._distances.get(id(shape))
        if known is None:
            known = _distances(shape)
            if self._bytes < _REMEMBERED_BYTES:
                self._distances[id(shape)] = known
                self._bytes += known.nbytes
        return known


def _same(one: Shape, other: Shape, kept: _Kept) -> How | None:
    """Return in what way two are one structure, None where they are not."""
    if one.sha256 == other.sha256:
        return "bytes"
    if _same_as_they_stand(one, other):
        return "structure"
    n = len(one.kinds)
    apart = np.linalg.norm(kept.distances(one) - kept.distances(other))
    if apart > SAME_ANGSTROM * np.sqrt(2.0 * n * (n - 1)):
        return None
    a, b = (one.kinds, one.positions_angstrom), (other.kinds, other.positions_angstrom)
    if match(*a, *b, enough_angstrom=SAME_ANGSTROM) < SAME_ANGSTROM:
        return "structure"
    mirrored = match(*a, *b, mirror=True, enough_angstrom=SAME_ANGSTROM)
    return "mirror image" if mirrored < SAME_ANGSTROM else None


def _same_as_they_stand(one: Shape, other: Shape) -> bool:
    """Tell whether two structures lie on each other without being turned, the atoms in the same order."""
    if not np.array_equal(one.kinds, other.kinds):
        return False
    apart = one.positions_angstrom - other.positions_angstrom
    apart = apart - apart.mean(axis=0)
    return bool(np.sum(apart**2) < SAME_ANGSTROM**2 * len(apart))


def _energy(shape: Shape) -> float:
    return np.nan if shape.energy_hartree is None else shape.energy_hartree


def _radii(shape: Shape) -> FloatArray:
    """Return the distances of the atoms from their centre, sorted within each kind."""
    x = shape.positions_angstrom
    radii = np.linalg.norm(x - x.mean(axis=0), axis=-1)
    return np.asarray(radii[np.lexsort((radii, shape.kinds))])


def _distances(shape: Shape) -> FloatArray:
    """Return all distances between atoms, sorted within each pair of kinds."""
    order = np.argsort(shape.kinds, kind="stable")
    z, x = shape.kinds[order], shape.positions_angstrom[order]
    first, second = np.triu_indices(len(x), k=1)
    distances = np.linalg.norm(x[first] - x[second], axis=-1)
    return np.asarray(distances[np.lexsort((distances, z[second], z[first]))])


def _finding(later: Calculation, earlier: Calculation, how: How) -> Finding:
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
