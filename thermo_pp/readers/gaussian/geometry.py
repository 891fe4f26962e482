"""Geometry blocks of a Gaussian output, in the standard orientation or that of the input, and masses.

Modes are printed in the standard orientation, or in the input's where symmetry is off; so the last
block before an energy is the frame of what follows. Dummy atoms have the atomic number -1.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import ISOTOPES, MOST_ABUNDANT, SYMBOLS
from thermo_pp.names import Origin
from thermo_pp.readers.gaussian.steps import Step
from thermo_pp.readers.text import CUT_SHORT, Text

FloatArray = NDArray[np.float64]

_WEIGHTS = re.compile(rb"\n AtmWgt=([^\n]*)")
_MASS = re.compile(rb"\n Atom +(\d+) has atomic number +(\d+) and mass +(\d+\.\d+)")
_SAME = 2e-4


@dataclass(frozen=True, eq=False)
class Geometry:
    """A geometry block: offset of its first atom, numbers (n,), places (n, 3) in angstrom, dummies."""

    at: int
    numbers: NDArray[np.int64]
    positions_angstrom: FloatArray
    dummies: int

    def same(self, other: Geometry) -> bool:
        """Tell whether two blocks show the same atoms at the same distances, in whatever frame."""
        if not np.array_equal(self.numbers, other.numbers):
            return False
        one, two = (_distances(each.positions_angstrom) for each in (self, other))
        return bool(np.all(np.abs(one - two) < _SAME))


def _distances(places: FloatArray) -> FloatArray:
    found: FloatArray = np.linalg.norm(places[:, None, :] - places[None, :, :], axis=2)
    return found


def block(text: Text, heading: int) -> Geometry:
    """Return the block under a heading; ReadError where it is damaged."""
    first = text.next_line(heading, 5)
    end = text.need(b"\n ---", first, lacking="no end of the geometry") + 1
    lines = text.data.count(b"\n", first, end)
    words = text.data[first:end].split()
    try:
        table = np.array(list(map(float, words))).reshape(lines, 6)
        whole = bool(np.all(np.isfinite(table)))
    except ValueError:
        whole = False
    if not whole or not np.array_equal(table[:, 0], np.arange(1, lines + 1)):
        line = first
        for number in range(1, lines + 1):
            if text.floats(line, 6, "an atom of the geometry")[0] != number:
                break
            line = text.next_line(line)
        raise text.expected(line, "an atom of the geometry")
    atoms = table[:, 1].astype(np.int64)
    real = atoms > 0
    if not real.any() or atoms.max() >= len(SYMBOLS) or np.any(atoms != table[:, 1]):
        raise text.expected(first, "atomic numbers")
    return Geometry(first, atoms[real], table[real, 3:], int(np.sum(~real)))


def thermochemical_masses(part: Text, numbers: NDArray[np.int64]) -> tuple[FloatArray, int]:
    """Return the masses that a thermochemistry lists, and where."""
    found = list(_MASS.finditer(part.data, part.start, part.end))
    if not found:
        raise part.error(part.start, "thermochemistry without masses of the atoms", mend=CUT_SHORT)
    listed = [(int(match.group(1)), int(match.group(2))) for match in found]
    if listed != list(enumerate(numbers.tolist(), start=1)):
        raise part.error(
            found[0].start() + 1,
            "the atoms of the thermochemistry are not those of the geometry",
            mend="the output is damaged here; rerun or re-copy it",
        )
    return np.array([float(match.group(3)) for match in found]), found[0].start() + 1


def masses(step: Step, geometry: Geometry) -> tuple[FloatArray, Origin, int | None]:
    """Return masses, where they come from, and where they stand: as printed, else the program's default.

    Without ``#p`` the program does not print them; it takes the most abundant isotopes unless told
    otherwise.
    """
    weights: list[float] = []
    at = None
    for match in _WEIGHTS.finditer(step.text.data, step.start, step.end):
        at = match.start() + 1 if at is None else at
        try:
            weights += [float(word) for word in match.group(1).split()]
        except ValueError:
            raise step.text.expected(match.start() + 1, "masses") from None
        if len(weights) >= len(geometry.numbers) + geometry.dummies:
            break
    if len(weights) == len(geometry.numbers) and min(weights) > 0.0:
        return np.array(weights), "printed", at
    isotopes = [ISOTOPES[SYMBOLS[z]][MOST_ABUNDANT[z]] for z in geometry.numbers]
    return np.array(isotopes), "derived", None
