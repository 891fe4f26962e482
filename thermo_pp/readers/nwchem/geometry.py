"""Geometries of an NWChem output, and the nuclear repulsion that ties each to its energy.

A task does not repeat its geometry. Whether a geometry block printed before belongs to an energy is told by the
nuclear repulsion: the one printed with the energy must follow from the block's coordinates and charges. That finds
displaced geometries, geometries of another name, and damaged digits.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import SYMBOLS
from thermo_pp.readers.text import Text

FloatArray = NDArray[np.float64]

BOHR_PER_ANGSTROM = 1.889725989
"""The program's own factor, as it prints it beside its coordinates."""
BLOCK = b" Output coordinates in "
_SCALE = re.compile(rb"(angstroms|a\.u\.) \(scale by +(\d+\.\d+) to convert to a\.u\.\)")
_REPLACES = re.compile(rb"\n  (\S+) \([^)\n]*\) Replaces +(\d+) electrons")


@dataclass(frozen=True, eq=False)
class Geometry:
    """One geometry block.

    Attributes
    ----------
    at : int
        Offset of its first atom.
    tags : tuple of str
        The program's names of the centres.
    numbers : shape (n,), int
        Atomic numbers, 0 of a ghost atom.
    positions_angstrom : shape (n, 3)
    ghosts : bool
        Whether any centre is a ghost atom.
    """

    at: int
    tags: tuple[str, ...]
    numbers: NDArray[np.int64]
    positions_angstrom: FloatArray
    ghosts: bool

    @property
    def real(self) -> NDArray[np.bool_]:
        """Which centres are atoms, shape (n,)."""
        return self.numbers > 0

    def same(self, other: Geometry) -> bool:
        """Tell whether both are the same atoms at the same places, up to rounding of the last digit."""
        return (
            np.array_equal(self.numbers, other.numbers)
            and float(np.max(np.abs(self.positions_angstrom - other.positions_angstrom))) < 3e-8
        )

    def same_atoms(self, other: Geometry) -> bool:
        """Tell whether both have the same kinds and numbers of atoms, in any order."""
        return np.array_equal(np.sort(self.numbers[self.real]), np.sort(other.numbers[other.real]))


class Blocks:
    """The geometry blocks of a file, each parsed once."""

    def __init__(self, text: Text) -> None:
        self.text = text
        self._parsed: dict[int, Geometry] = {}

    def before(self, at: int) -> Iterator[Geometry]:
        """Yield the blocks that stand before an offset, the nearest first."""
        at = self.text.data.rfind(BLOCK, 0, at)
        while at >= 0:
            if at not in self._parsed:
                self._parsed[at] = _block(self.text, at)
            yield self._parsed[at]
            at = self.text.data.rfind(BLOCK, 0, at)


def _block(text: Text, at: int) -> Geometry:
    scale = _SCALE.match(text.data, at + len(BLOCK))
    if scale is None:
        raise text.expected(at, "the unit of the coordinates (angstroms or a.u.)")
    per_angstrom = 1.0 if scale.group(1) == b"angstroms" else BOHR_PER_ANGSTROM
    first = text.next_line(at, 4)
    tags, table = atom_rows(text, first, text.blank_line(first), name=1)
    charges = table[:, 0].tolist()
    numbers = [round(charge) for charge in charges]
    for index, (tag, charge, number) in enumerate(zip(tags, charges, numbers, strict=True)):
        ghost = tag[:2].lower() == "bq"
        if charge != number or ghost != (number == 0) or not 0 <= number < len(SYMBOLS):
            raise text.error(
                text.next_line(first, index),
                f"the centre {tag!r} of charge {charge:g} is no atom",
                mend="point charges are not read; give a calculation of the molecule alone",
            )
    positions = table[:, 1:] / per_angstrom
    return Geometry(first, tags, np.array(numbers), positions, 0 in numbers)


def atom_rows(text: Text, start: int, end: int, *, name: int) -> tuple[tuple[str, ...], FloatArray]:
    """Return names and numbers, shape (n, 4), of lines of six words: an atom's number, name and four numbers.

    The atoms are numbered from 1 on; `name` is the place of the name, 0 or 1, the other word is the number.
    """
    words = text.data[start:end].replace(b"D", b"e").split()
    count = len(words) // 6
    expected = [b"%d" % (index + 1) for index in range(count)]
    if words and len(words) == 6 * count and words[1 - name :: 6] == expected:
        columns = [words[place::6] for place in range(2, 6)]
        try:
            table = np.array([list(map(float, column)) for column in columns]).T
        except ValueError:
            table = np.full((count, 4), np.nan)
        if np.isfinite(table.sum()):
            names = text.data[start:end].split()[name::6]
            return tuple(word.decode("utf-8", "replace") for word in names), table
    line = start
    for index in range(max(count, 1)):
        line_words = text.rest(line).split()
        if len(line_words) != 6 or line_words[1 - name] != b"%d" % (index + 1):
            break
        text.floats(line, 4, "four numbers of an atom", skip=2)
        line = text.next_line(line)
    raise text.expected(line, "an atom: its number and name, and four numbers")


def belongs(text: Text, geometry: Geometry, repulsion_hartree: float) -> bool:
    """Tell whether a printed nuclear repulsion follows from a geometry, cores replaced by potentials left out."""
    charges = geometry.numbers.astype(np.float64)
    if _follows(charges, geometry.positions_angstrom, repulsion_hartree):
        return True
    replaced = {
        match.group(1).decode("utf-8", "replace").lower(): int(match.group(2))
        for match in _REPLACES.finditer(text.data)
    }
    cores = [replaced.get(tag.lower(), 0) for tag in geometry.tags]
    return any(cores) and _follows(charges - cores, geometry.positions_angstrom, repulsion_hartree)


def _follows(charges: FloatArray, positions_angstrom: FloatArray, repulsion: float) -> bool:
    """Compare within what the rounding of coordinates to eight decimals makes at most."""
    positions = positions_angstrom * BOHR_PER_ANGSTROM
    between = positions[:, np.newaxis] - positions
    squares = (between * between).sum(axis=2)
    squares.flat[:: len(charges) + 1] = np.inf  # no repulsion of itself
    products = 0.5 * np.outer(charges, charges)
    computed = float((products / np.sqrt(squares)).sum())
    rounding = 3.5 * 1e-8 * float((products / squares).sum())
    return abs(computed - repulsion) <= rounding + 1e-9 * abs(computed) + 1e-9


def element_masses(text: Text, geometry: Geometry) -> tuple[FloatArray, int]:
    """Return the mass of each centre as the list of the geometry block has it (by name), and where the list stands."""
    at = text.need(b"Atomic Mass", geometry.at, lacking="no list of atomic masses")
    line = first = text.next_line(at, 3)
    masses: dict[str, float] = {}
    while words := text.rest(line).split():
        masses[words[0].decode("utf-8", "replace")] = text.floats(line, 1, "a mass", skip=1)[0]
        line = text.next_line(line)
    missing = [tag for tag, real in zip(geometry.tags, geometry.real, strict=True) if real]
    missing = [tag for tag in missing if tag not in masses]
    if missing:
        raise text.error(
            first, f"no mass of {missing[0]!r} in this list", mend="re-copy the output"
        )
    return np.array([masses.get(tag, 0.0) for tag in geometry.tags]), first
