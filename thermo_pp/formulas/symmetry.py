"""Symmetry: order of a structure's rotation group, isotopes included, and its handedness."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.formulas.frames import (
    FloatArray,
    IntArray,
    atom_classes,
    frame_rotations,
    is_permutation,
    kabsch,
    nearest,
)
from thermo_pp.formulas.rotor import rotor_kind

TOLERANCE_ANGSTROM = 0.05
"""Default: how far a turned atom may come to lie from the atom whose place it takes."""
HORIZON = 6.0
"""Operations that miss are looked for up to this many tolerances."""
_ROUNDS = 3


@dataclass(frozen=True)
class Symmetry:
    """Rotational symmetry of a structure.

    Attributes
    ----------
    order : int
        Order of the group of proper rotations: the symmetry number.
    chiral : bool
        Not superposable on its mirror image.
    tolerance_angstrom : float
        Largest distance between a turned atom and the atom whose place it takes that was allowed.
    changes_at_angstrom : float or None
        The next larger tolerance at which the order would be higher; None where it stays up to
        `HORIZON` tolerances.
    linear : bool
    holds_from_angstrom : float
        The largest such distance among the operations found: below it the order would be lower.
    mirror_at_angstrom : float or None
        The distance of the best improper operation, at which the handedness changes; None where
        there is none up to `HORIZON` tolerances.
    """

    order: int
    chiral: bool
    tolerance_angstrom: float
    changes_at_angstrom: float | None
    linear: bool
    holds_from_angstrom: float = 0.0
    mirror_at_angstrom: float | None = 0.0


def rotational_symmetry(
    numbers: ArrayLike,
    positions: ArrayLike,
    masses: ArrayLike,
    tolerance: float = TOLERANCE_ANGSTROM,
) -> Symmetry:
    """Find the proper rotations that map a structure on itself.

    Candidates come from pairs of atoms and like pairs; each is refined by least squares over the
    permutation of atoms it makes, and accepted where no atom misses by more than the tolerance.
    The permutations accepted are completed to a group (a product may miss by twice the tolerance,
    so that noise cannot break a group). Improper operations are found in the same way: one within
    the tolerance means not chiral.

    Parameters
    ----------
    numbers : shape (n,)
        Atomic numbers.
    positions : shape (n, 3)
        A.
    masses : shape (n,)
        u; atoms of one element with different masses are different.
    tolerance : float
        A, above 0.

    Returns
    -------
    Symmetry
        An atom has order 1; a linear structure 2 where it is the same from both ends, else 1.

    Raises
    ------
    ValueError
        A tolerance at or below 0.
    """
    if not tolerance > 0.0:
        raise ValueError(f"tolerance must be above 0, got {tolerance}")
    x = np.asarray(positions, dtype=np.float64)
    x = x - x.mean(axis=0)
    classes = atom_classes(numbers, masses)
    kind = rotor_kind(masses, x)
    if kind == "atom":
        return Symmetry(1, False, tolerance, None, False)
    if kind == "linear":
        return _linear(classes, x, tolerance)
    horizon = HORIZON * tolerance
    proper, improper = frame_rotations(classes, x, classes, x, horizon)
    turns, misses = _operations(proper, classes, x, 1, horizon)
    _, mirror_misses = _operations(improper, classes, x, -1, horizon)
    mirror = float(mirror_misses.min()) if len(mirror_misses) else None
    group, holds_from = _group(turns[misses <= tolerance], x, tolerance)
    members = {turn.tobytes() for turn in group}
    beyond = [
        float(miss)
        for turn, miss in zip(turns, misses, strict=True)
        if miss > tolerance and turn.tobytes() not in members
    ]
    return Symmetry(
        order=len(group),
        chiral=mirror is None or mirror > tolerance,
        tolerance_angstrom=tolerance,
        changes_at_angstrom=min(beyond, default=None),
        linear=False,
        holds_from_angstrom=holds_from,
        mirror_at_angstrom=mirror,
    )


def _linear(classes: IntArray, x: FloatArray, tolerance: float) -> Symmetry:
    """Compare a linear structure with itself end over end."""
    along = x @ np.linalg.svd(x, full_matrices=False)[2][0]
    order = np.lexsort((along, classes))
    reverse = np.lexsort((-along, classes))
    miss = float(np.abs(along[order] + along[reverse]).max())
    if miss <= tolerance:
        return Symmetry(2, False, tolerance, None, True, holds_from_angstrom=miss)
    return Symmetry(1, False, tolerance, miss if miss <= HORIZON * tolerance else None, True)


def _operations(
    rotations: FloatArray, classes: IntArray, x: FloatArray, determinant: int, horizon: float
) -> tuple[IntArray, FloatArray]:
    """Return the permutations that `rotations` lead to, and by how much the worst atom misses."""
    partners, _ = nearest(rotations, classes, x, classes, x)
    partners = _unique(partners[is_permutation(partners)])
    for _ in range(_ROUNDS):
        refined = kabsch(x[partners], x, determinant)
        again, _ = nearest(refined, classes, x, classes, x)
        again = np.where(is_permutation(again)[:, np.newaxis], again, partners)
        if np.array_equal(again, partners):
            break
        partners = _unique(again)
    misses = _misses(partners, x, determinant)
    kept = misses <= horizon
    return partners[kept], misses[kept]


def _misses(partners: IntArray, x: FloatArray, determinant: int) -> FloatArray:
    """Return for each permutation the largest distance of a turned atom from its partner."""
    rotations = kabsch(x[partners], x, determinant)
    turned = x @ np.swapaxes(rotations, -1, -2)
    return np.asarray(np.sqrt(((turned - x[partners]) ** 2).sum(axis=-1)).max(axis=-1, initial=0.0))


def _group(turns: IntArray, x: FloatArray, tolerance: float) -> tuple[IntArray, float]:
    """Complete permutations to a group; where a product would be too bad, leave out the worst."""
    identity = np.arange(len(x))[np.newaxis]
    misses = _misses(turns, x, 1)
    turns = turns[np.argsort(misses, kind="stable")]
    while True:
        group = _unique(np.concatenate([identity, turns]))
        worst = 0.0
        while worst <= 2.0 * tolerance:
            products = _unique(group[:, group].reshape(-1, len(x)))
            if len(products) == len(group):
                return group, float(_misses(group, x, 1).max())
            group = products
            worst = float(_misses(group, x, 1).max())
        turns = turns[:-1]


def _unique(rows: IntArray) -> IntArray:
    """Return each row once, in the order of first occurrence."""
    seen: dict[bytes, int] = {}
    for k, row in enumerate(rows):
        seen.setdefault(row.tobytes(), k)
    kept: NDArray[np.int64] = np.fromiter(seen.values(), dtype=np.int64, count=len(seen))
    return rows[kept]
