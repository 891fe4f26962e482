"""Coordinate blocks of an ORCA output: atoms, places in angstrom, masses as printed.

The block in bohr below each block in angstrom has the masses that the program uses: average ones
unless the input gives others. Ghost atoms have a colon behind their symbol; point charges (``Q``)
and dummy atoms (``DA``) are no atoms.
"""

from __future__ import annotations

import re
from contextlib import suppress
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import AVERAGE_MASSES, NUMBERS
from thermo_pp.names import Origin
from thermo_pp.readers.orca.layout import COORDINATES, Layout
from thermo_pp.readers.text import Text
from thermo_pp.units import BOHR_ANGSTROM

FloatArray = NDArray[np.float64]

IN_BOHR = b"CARTESIAN COORDINATES (A.U.)"
_LABEL = re.compile(r"([A-Z][a-z]?)(?:\(\s*\d+\))?(:?)(?:\(\s*\d+\))?>?")
_DUMMY = ("DA", "X", "XX", "Xx", "Da")
_PRINTED_TWICE = 3e-6
"""Six decimals of both blocks."""
_SAME = 2e-5


@dataclass(frozen=True, eq=False)
class Geometry:
    """A block of coordinates.

    Attributes
    ----------
    at : int
        Offset of the first atom's line.
    numbers : shape (n,)
        Without ghost and dummy atoms.
    positions_angstrom : shape (n, 3)
    rows : tuple of int
        Which lines of the block these are.
    ghosts : int
        How many ghost atoms the block has.
    """

    at: int
    numbers: NDArray[np.int64]
    positions_angstrom: FloatArray
    rows: tuple[int, ...]
    ghosts: int
    dummies: int

    def same(self, other: Geometry) -> bool:
        """Tell whether two blocks show the same atoms at the same places."""
        return (
            np.array_equal(self.numbers, other.numbers)
            and float(np.abs(self.positions_angstrom - other.positions_angstrom).max()) < _SAME
        )


def before(layout: Layout, at: int) -> Geometry:
    """Return the last block of coordinates before `at`; ReadError where there is none or it is damaged."""
    text = layout.text
    heading = layout.last(COORDINATES, at)
    if heading < 0:
        raise text.error(
            at,
            "no coordinates above this line (looked for 'CARTESIAN COORDINATES (ANGSTROEM)')",
            mend="give the program's whole output; do not switch off the printing of coordinates",
        )
    in_bohr = layout.next(IN_BOHR, heading)
    if 0 <= in_bohr < at and layout.last(IN_BOHR, at) != in_bohr:
        raise text.error(
            layout.last(IN_BOHR, at),
            "coordinates in bohr without those in angstrom above",
            mend="the output is damaged here; rerun or re-copy it",
        )
    return block(layout, heading)


def block(layout: Layout, heading: int) -> Geometry:
    """Return the block of coordinates under a heading."""
    known = layout.blocks.get(heading)
    if not isinstance(known, Geometry):
        known = layout.blocks[heading] = _block(layout.text, heading)
    return known


def _block(text: Text, heading: int) -> Geometry:
    first = text.next_line(heading, 2)
    end = text.blank_line(first)
    words = text.data[first:end].split()
    lines = text.data.count(b"\n", first, end)
    with suppress(KeyError, ValueError):
        if len(words) == 4 * lines:
            table = np.array([list(map(float, words[i::4])) for i in (1, 2, 3)]).T
            atoms = [NUMBERS[word.decode("ascii", "replace")] for word in words[::4]]
            if atoms and np.all(np.isfinite(table)):
                return Geometry(first, np.array(atoms), table, tuple(range(lines)), 0, 0)
    return _block_by_line(text, first, end)


def _block_by_line(text: Text, first: int, end: int) -> Geometry:
    """Return a block with ghost or dummy atoms, or the error at its damaged line."""
    numbers: list[int] = []
    places: list[list[float]] = []
    rows: list[int] = []
    ghosts = dummies = 0
    line = first
    row = 0
    while line < end:
        words = text.rest(line).split()
        label = "".join(word.decode("utf-8", "replace") for word in words[:-3])
        match = _LABEL.fullmatch(label)
        if label.rstrip(">") in _DUMMY:
            dummies += 1
        elif match is None or match.group(1) not in NUMBERS:
            raise text.expected(line, "an atom and its coordinates")
        elif match.group(2):
            ghosts += 1
        else:
            numbers.append(NUMBERS[match.group(1)])
            places.append(
                text.floats(line, 3, "coordinates of an atom", skip=len(words) - 3),
            )
            rows.append(row)
        row += 1
        line = text.next_line(line)
    if not numbers:
        raise text.expected(first, "atoms and their coordinates")
    return Geometry(
        first, np.array(numbers, dtype=np.int64), np.array(places), tuple(rows), ghosts, dummies
    )


def masses(layout: Layout, geometry: Geometry) -> tuple[FloatArray, Origin, int | None]:
    """Return the masses of the atoms, where they come from, and the offset at which they stand.

    Raises
    ------
    ReadError
        The block in bohr is damaged, or does not agree with the one in angstrom.
    """
    text = layout.text
    heading = layout.next(IN_BOHR, geometry.at)
    following = layout.next(COORDINATES, geometry.at)
    if heading < 0 or 0 <= following < heading:
        return np.array([AVERAGE_MASSES[z] for z in geometry.numbers]), "derived", None
    first = text.next_line(heading, 3)
    listed = text.data.count(b"\n", first, text.blank_line(first))
    if not geometry.dummies and listed != len(geometry.rows) + geometry.ghosts:
        raise text.error(
            first,
            f"{listed} atoms in bohr, but {len(geometry.rows) + geometry.ghosts} in angstrom above",
            mend="the output is damaged here; rerun or re-copy it",
        )
    words = text.data[first : text.blank_line(first)].split()
    if geometry.rows == tuple(range(listed)) and len(words) == 8 * listed:
        with suppress(ValueError):
            table = np.array([list(map(float, words[i::8])) for i in (4, 5, 6, 7)])
            apart = np.abs(table[1:].T * BOHR_ANGSTROM - geometry.positions_angstrom)
            if np.all(apart <= _PRINTED_TWICE * _scale(geometry)) and table[0].min() > 0.0:
                return table[0], "printed", first
    found: list[float] = []
    line, row = first, 0
    for atom, wanted in enumerate(geometry.rows):
        line = text.next_line(line, wanted - row)
        row = wanted
        words = text.rest(line).split()
        values = text.floats(line, 4, "mass and coordinates of an atom", skip=len(words) - 4)
        apart = np.array(values[1:]) * BOHR_ANGSTROM - geometry.positions_angstrom[atom]
        if not np.all(np.abs(apart) <= _PRINTED_TWICE * _scale(geometry)) or values[0] <= 0.0:
            raise text.error(
                line,
                "this atom's coordinates in bohr do not agree with those in angstrom above",
                mend="the output is damaged here; rerun or re-copy it",
            )
        found.append(values[0])
    return np.array(found), "printed", first


def _scale(geometry: Geometry) -> float:
    """Return by what the rounding of the conversion grows with the size of the structure."""
    return 1.0 + 0.1 * float(np.abs(geometry.positions_angstrom).max())
