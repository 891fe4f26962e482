"""Geometries of an NWChem output, and the nuclear repulsion that ties each to its energy.

A task does not repeat its geometry. Whether a geometry block printed before belongs to an energy is told by the
nuclear repulsion: the one printed with the energy must follow from the block's coordinates and charges. That finds
displaced geometries, geometries of another name, and damaged digits.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import chain, combinations
from math import dist

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import SYMBOLS
from thermo_pp.readers.text import CUT_SHORT, Text

FloatArray = NDArray[np.float64]

BOHR_PER_ANGSTROM = 1.889725989
"""The program's own factor, as it prints it beside its coordinates."""
BLOCK = b" Output coordinates in "
_SCALE = re.compile(rb"(angstroms|a\.u\.) \(scale by +(\d+\.\d+) to convert to a\.u\.\)")
_REPLACES = re.compile(rb"\n  (\S+) \([^)\n]*\) Replaces +(\d+) electrons")


@dataclass(frozen=True, eq=False)
class Geometry:
    """One geometry: a block of its own, or the atom table of a vibrational analysis.

    Attributes
    ----------
    at : int
        Offset of its first atom.
    tags : tuple of str
        The input's names of the centres; of an atom table the elements.
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
        """Tell whether both are the same atoms at the same places, up to rounding of eight digits of either."""
        if not np.array_equal(self.numbers, other.numbers):
            return False
        mine, its = (
            self.positions_angstrom.ravel().tolist(),
            other.positions_angstrom.ravel().tolist(),
        )
        return all(
            abs(x - y) <= 1e-8 + 5e-8 * max(1.0, abs(x)) for x, y in zip(mine, its, strict=True)
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
    charges = geometry.numbers.tolist()
    if _follows(charges, geometry.positions_angstrom, repulsion_hartree):
        return True
    cores = replaced_cores(text, geometry)
    left = [z - core for z, core in zip(charges, cores, strict=True)]
    return any(cores) and _follows(left, geometry.positions_angstrom, repulsion_hartree)


def replaced_cores(text: Text, geometry: Geometry) -> list[int]:
    """Return how many electrons of each centre an effective core potential replaces."""
    replaced = {
        match.group(1).decode("utf-8", "replace").lower(): int(match.group(2))
        for match in _REPLACES.finditer(text.data)
    }
    by_element = {element(tag, geometry): count for tag, count in replaced.items()}
    symbols = [SYMBOLS[z].lower() for z in geometry.numbers]
    return [
        replaced.get(tag.lower(), by_element.get(symbol, 0))
        for tag, symbol in zip(geometry.tags, symbols, strict=True)
    ]


def element(tag: str, geometry: Geometry) -> str:
    """Return the symbol of the geometry's element that a name of the input begins with, the name where none fits."""
    symbols = {SYMBOLS[z] for z in geometry.numbers if z}
    fitting = [symbol for symbol in symbols if tag.lower().startswith(symbol.lower())]
    return max(fitting, key=len, default=tag).lower()


def _follows(charges: list[int], positions_angstrom: FloatArray, repulsion: float) -> bool:
    """Compare within what the rounding of coordinates, eight decimals or digits, makes at most."""
    rows = (positions_angstrom * BOHR_PER_ANGSTROM).tolist()
    computed = slope = 0.0
    for (z, here), (other, there) in combinations(zip(charges, rows, strict=True), 2):
        if z and other:
            distance = dist(here, there)
            computed += z * other / distance
            slope += z * other / (distance * distance)
    largest = max(map(abs, chain.from_iterable(rows)))
    rounding = 3.5 * slope * (1e-8 if largest < 1.0 else 5e-8 if largest < 10.0 else 5e-7)
    return abs(computed - repulsion) <= rounding + 1e-9 * abs(computed) + 1e-9


def element_masses(text: Text, geometry: Geometry) -> tuple[FloatArray, int]:
    """Return the mass of each centre as the list of the geometry block has it (by name), and where the list stands."""
    at = text.need(b"Atomic Mass", geometry.at, lacking="no list of atomic masses")
    first = text.next_line(at, 3)
    words = text.data[first : text.blank_line(first)].split()
    try:
        masses = {
            name.decode("utf-8", "replace"): float(mass)
            for name, mass in zip(words[::2], words[1::2], strict=True)
        }
    except ValueError:
        raise text.expected(first, "names and masses in the lines from here on") from None
    missing = [tag for tag in geometry.tags if tag not in masses and tag[:2].lower() != "bq"]
    if missing or not all(0.0 < mass < 1000.0 for mass in masses.values()):
        raise text.error(
            first,
            f"no mass of {missing[0]!r} in this list" if missing else "a mass that is none",
            mend=CUT_SHORT,
        )
    return np.array([masses.get(tag, 0.0) for tag in geometry.tags]), first
