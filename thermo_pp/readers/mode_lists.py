"""Lists of modes of a file that may hold translations and rotations: which of them are vibrations."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import ISOTOPES, MOST_ABUNDANT, SYMBOLS
from thermo_pp.errors import Finding
from thermo_pp.formulas.rotor import rotor_kind

FloatArray = NDArray[np.float64]

NULL_CM = 1.0
"""Null modes are smaller than this, vibrations larger, or the two cannot be told apart."""

_AT_REST = 0.1
"""Of the momentum of all atoms, so much may be left by two printed decimals and other masses."""


def most_abundant(numbers: NDArray[np.int64]) -> FloatArray:
    """Return the masses of the most abundant isotopes, u."""
    return np.array([ISOTOPES[SYMBOLS[z]][MOST_ABUNDANT[z]] for z in numbers])


def masses_assumed(name: str, line: int | None) -> Finding:
    """Return the finding that a file with modes does not say which masses they are of."""
    return Finding(
        "masses-assumed",
        "note",
        name,
        line,
        "the file does not say which masses its modes are of; those of the most abundant isotopes are taken",
        "name the program's own output where it used others (average masses, isotopes)",
    )


def no_energy(name: str, line: int | None, what: str) -> Finding:
    """Return the finding that a file with modes or a geometry has no energy, which is no fault of the job."""
    return Finding(
        "no-energy",
        "warning",
        name,
        line,
        what,
        "name an output with the energy of this geometry beside it",
    )


def count(masses_u: FloatArray, positions_angstrom: FloatArray) -> int:
    """Return how many vibrations a structure has: 3N-6, of a linear one 3N-5, of an atom none."""
    kind = rotor_kind(masses_u, positions_angstrom)
    return 3 * len(masses_u) - {"atom": 3, "linear": 5, "nonlinear": 6}[kind]


def vibrations(
    wavenumbers_cm: FloatArray, masses_u: FloatArray, positions_angstrom: FloatArray
) -> NDArray[np.int64]:
    """Return which of the modes are vibrations, by ascending wavenumber.

    Parameters
    ----------
    wavenumbers_cm : shape (m,)
        3N numbers, null modes among them, or the vibrations alone.
    masses_u : shape (n,)
    positions_angstrom : shape (n, 3)

    Raises
    ------
    ValueError
        Another number of modes, or null modes that are not told from the others by their size; in
        words that fit a ReadError.
    """
    n = len(masses_u)
    overall = 3 * n - count(masses_u, positions_angstrom)
    order = np.argsort(wavenumbers_cm, kind="stable")
    if len(order) == 3 * n - overall:
        return order
    if len(order) != 3 * n:
        raise ValueError(
            f"{len(order)} modes of {n} atoms, expected {3 * n - overall}, or {3 * n} with null modes"
        )
    size = np.abs(wavenumbers_cm)
    by_size = np.argsort(size, kind="stable")
    null, real = by_size[:overall], by_size[overall:]
    if np.any(size[null] > NULL_CM) or np.any(size[real] <= NULL_CM):
        raise ValueError(
            f"{3 * n} modes, of which {overall} must be translations and rotations, but their "
            f"size does not tell which (null modes up to {np.max(size[null]):.2f} cm^-1)"
        )
    keep = set(real.tolist())
    return np.array([i for i in order.tolist() if i in keep], dtype=np.int64)


def displacements(vectors: FloatArray, masses_u: FloatArray) -> FloatArray | None:
    """Return Cartesian displacements (m, n, 3) of length 1 from vectors that may be mass-weighted.

    Files do not say which they hold, but in a vibration the centre of mass is at rest, which tells;
    None where it is in neither.

    Raises
    ------
    ValueError
        A mode without displacements.
    """
    lengths = np.sqrt(np.sum(vectors**2, axis=(1, 2)))
    if np.any(lengths < 1e-6) or not np.all(np.isfinite(lengths)):
        raise ValueError("a mode without displacements")
    vectors = vectors / lengths[:, np.newaxis, np.newaxis]
    root = np.sqrt(masses_u)[:, np.newaxis]
    plain, weighted = _momentum(vectors, root**2), _momentum(vectors, root)
    if min(plain, weighted) > _AT_REST:
        return None
    if weighted < plain:
        vectors = vectors / root
        lengths = np.sqrt(np.sum(vectors**2, axis=(1, 2)))
        vectors = vectors / lengths[:, np.newaxis, np.newaxis]
    return np.asarray(vectors)


def _momentum(vectors: FloatArray, weights: FloatArray) -> float:
    """Return how much of the momentum of all atoms the centre of mass has, in the worst mode."""
    moved = np.abs(np.sum(weights * vectors, axis=1)).max(axis=1)
    whole = np.sum(weights * np.abs(vectors), axis=(1, 2))
    return float(np.max(moved / np.maximum(whole, 1e-300), initial=0.0))
