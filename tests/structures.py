"""Structures for the tests: geometries built from their point groups, and calculations made by hand."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import ISOTOPES, MOST_ABUNDANT, NUMBERS, SYMBOLS
from thermo_pp.records import Calculation

FloatArray = NDArray[np.float64]


def masses(numbers: Any) -> FloatArray:
    """Masses of the most abundant isotopes."""
    return np.array([ISOTOPES[SYMBOLS[z]][MOST_ABUNDANT[z]] for z in numbers])


def turn(axis: Any, degrees: float, improper: bool = False) -> FloatArray:
    """Rotation about an axis, times the reflection across it where improper."""
    n = np.asarray(axis, dtype=float) / np.linalg.norm(axis)
    angle = np.radians(degrees)
    k = np.array([[0, -n[2], n[1]], [n[2], 0, -n[0]], [-n[1], n[0], 0]])
    rotation = np.eye(3) + np.sin(angle) * k + (1.0 - np.cos(angle)) * k @ k
    return rotation @ (np.eye(3) - 2.0 * np.outer(n, n)) if improper else rotation


def orbit(point: Any, generators: list[FloatArray]) -> FloatArray:
    """All images of a point under the group that the generators make."""
    points = [np.asarray(point, dtype=float)]
    for one in points:  # grows while it runs
        for generator in generators:
            image = generator @ one
            if min(np.linalg.norm(image - other) for other in points) > 1e-6:
                points.append(image)
    return np.array(points)


def built(
    atoms: dict[str, Any], generators: list[FloatArray]
) -> tuple[NDArray[np.int64], FloatArray]:
    """Numbers and positions of the orbits of one point an element."""
    symbols: list[str] = []
    positions = []
    for symbol, point in atoms.items():
        images = orbit(point, generators)
        symbols += [symbol.rstrip("'")] * len(images)
        positions.append(images)
    return np.array([NUMBERS[symbol] for symbol in symbols]), np.concatenate(positions)


def water(**changes: Any) -> Calculation:
    """Water with wavenumbers near the measured ones."""
    numbers = np.array([8, 1, 1])
    positions = np.array([[0.0, 0.0, 0.1173], [0.0, 0.7572, -0.4692], [0.0, -0.7572, -0.4692]])
    wavenumbers = changes.pop("wavenumbers_cm", [1594.75, 3657.05, 3755.93])
    return made("water", numbers, positions, wavenumbers, **changes)


def made(
    name: str, numbers: Any, positions: Any, wavenumbers_cm: Any = None, **changes: Any
) -> Calculation:
    """A calculation made by hand; the wavenumbers are on line 77 of its file."""
    fields: dict[str, Any] = {
        "path": f"runs/{name}.out",
        "sha256": "",
        "program": "made",
        "numbers": numbers,
        "positions_angstrom": positions,
        "masses_u": masses(numbers),
        "masses_origin": "derived",
        "charge": 0,
        "multiplicity": 1,
        "energy_hartree": -76.4,
        "wavenumbers_cm": wavenumbers_cm,
        "where": {"wavenumbers_cm": 77},
    }
    return Calculation(**{**fields, **changes})
