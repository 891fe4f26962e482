"""Superposition: how closely one structure can be laid on another."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import product

import numpy as np
from numpy.typing import ArrayLike

from thermo_pp.formulas.frames import (
    FloatArray,
    IntArray,
    atom_classes,
    frame_rotations,
    is_permutation,
    kabsch,
    nearest,
)

SLACK_ANGSTROM = 0.5
"""Within this the best match is found; beyond, the answer is an upper bound."""
_MOST_FRAMES = 4000
_REFINED = 12
_ROUNDS = 20


@dataclass(frozen=True, eq=False)
class Superposition:
    """One structure laid on another.

    Attributes
    ----------
    rotation : shape (3, 3)
        ``(a - mean(a)) @ rotation.T`` lies on ``b - mean(b)``; for a mirror image the determinant
        is -1.
    rmsd_angstrom : float
        Root mean square distance over all atoms, none weighted.
    partners : shape (n,), int
        The atom of `b` that each atom of `a` lies on.
    """

    rotation: FloatArray
    rmsd_angstrom: float
    partners: IntArray


def superpose(a: ArrayLike, b: ArrayLike) -> Superposition:
    """Lay structure `a` on structure `b`, the atoms in the same order (Kabsch).

    Parameters
    ----------
    a, b : shape (n, 3)
        A.

    Returns
    -------
    Superposition
        The proper rotation of least root mean square distance, centroids in one place.

    Raises
    ------
    ValueError
        Different shapes.
    """
    one, two = _centred(a), _centred(b)
    if one.shape != two.shape:
        raise ValueError(f"cannot superpose shapes {one.shape} and {two.shape}")
    return _laid(one, two, np.arange(len(one)))


def match(
    numbers_a: ArrayLike,
    positions_a: ArrayLike,
    numbers_b: ArrayLike,
    positions_b: ArrayLike,
    mirror: bool = False,
    enough_angstrom: float = 0.0,
) -> float:
    """Return the least root mean square distance, A, with atoms of one element in any order.

    See `best_superposition`; infinite where the structures have not the same atoms.
    """
    found = best_superposition(
        numbers_a, positions_a, numbers_b, positions_b, mirror, enough_angstrom
    )
    return math.inf if found is None else found.rmsd_angstrom


def best_superposition(
    numbers_a: ArrayLike,
    positions_a: ArrayLike,
    numbers_b: ArrayLike,
    positions_b: ArrayLike,
    mirror: bool = False,
    enough_angstrom: float = 0.0,
) -> Superposition | None:
    """Lay structure `a`, or its mirror image, on `b`, atoms of one element matched in any order.

    Starts are the order as given, every pair of atoms laid on a like pair and the principal axes
    on each other; assignment and rotation are then improved by turns. For structures that agree
    to within `SLACK_ANGSTROM` the best match is found, for others the answer is an upper bound.

    Parameters
    ----------
    numbers_a, numbers_b : shape (n,)
    positions_a, positions_b : shape (n, 3)
        A.
    mirror : bool
        Lay the mirror image of `a` on `b`.
    enough_angstrom : float
        A match that is closer than this is not improved upon by further starts.

    Returns
    -------
    Superposition or None
        None where the structures have not the same atoms.
    """
    kind_a, kind_b = atom_classes(numbers_a), atom_classes(numbers_b)
    a, b = _centred(positions_a), _centred(positions_b)
    if not np.array_equal(np.sort(kind_a), np.sort(kind_b)):
        return None
    image = a * np.array([-1.0, 1.0, 1.0]) if mirror else a
    best: Superposition | None = None
    for start in _starts(kind_a, image, kind_b, b):
        found = _improved(start, kind_a, image, kind_b, b)
        if best is None or found.rmsd_angstrom < best.rmsd_angstrom:
            best = found
        if best.rmsd_angstrom < enough_angstrom:
            break
    assert best is not None
    if not mirror:
        return best
    turned = best.rotation * np.array([-1.0, 1.0, 1.0])
    return Superposition(turned, best.rmsd_angstrom, best.partners)


def _starts(
    kind_a: IntArray, a: FloatArray, kind_b: IntArray, b: FloatArray
) -> Iterator[FloatArray]:
    """Yield the rotations to start from, those that cost little first."""
    if np.array_equal(kind_a, kind_b):
        yield _laid(a, b, np.arange(len(a))).rotation
    yield from _principal(a, b)
    yield from _frames(kind_a, a, kind_b, b)


def _centred(positions: ArrayLike) -> FloatArray:
    x = np.asarray(positions, dtype=np.float64)
    return np.asarray(x - x.mean(axis=0))


def _laid(a: FloatArray, b: FloatArray, partners: IntArray) -> Superposition:
    """Return the superposition for a given match of atoms."""
    rotation = kabsch(b[partners], a)
    squared = ((a @ rotation.T - b[partners]) ** 2).sum() / len(a)
    return Superposition(rotation, math.sqrt(squared), partners)


def _frames(kind_a: IntArray, a: FloatArray, kind_b: IntArray, b: FloatArray) -> list[FloatArray]:
    """Return the most promising rotations that lay a pair of atoms on a like pair."""
    if len(a) < 3 or np.linalg.svd(a, compute_uv=False)[1] < 1e-3:
        return []
    rotations, _ = frame_rotations(kind_a, a, kind_b, b, SLACK_ANGSTROM, _MOST_FRAMES)
    partners, distances = nearest(rotations, kind_a, a, kind_b, b)
    # a match that sends two atoms to one place comes last: its distance is too good
    cost = (distances**2).sum(axis=-1) + np.where(is_permutation(partners), 0.0, 1.0) * len(a)
    return list(rotations[np.argsort(cost, kind="stable")[:_REFINED]])


def _principal(a: FloatArray, b: FloatArray) -> list[FloatArray]:
    """Return the four rotations that lay the principal axes of `a` on those of `b`."""
    axes_a, axes_b = (np.linalg.svd(x.T @ x)[0] for x in (a, b))
    found = []
    for one, two in product((1.0, -1.0), repeat=2):
        signs = np.array([one, two, 1.0])
        rotation = (axes_b * signs) @ axes_a.T
        if np.linalg.det(rotation) < 0.0:
            rotation = (axes_b * (signs * np.array([1.0, 1.0, -1.0]))) @ axes_a.T
        found.append(rotation)
    return found


def _improved(
    rotation: FloatArray, kind_a: IntArray, a: FloatArray, kind_b: IntArray, b: FloatArray
) -> Superposition:
    """Improve match and rotation by turns until neither changes."""
    partners = _assigned(a @ rotation.T, kind_a, b, kind_b)
    best = _laid(a, b, partners)
    for _ in range(_ROUNDS):
        partners = _assigned(a @ best.rotation.T, kind_a, b, kind_b)
        if np.array_equal(partners, best.partners):
            break
        found = _laid(a, b, partners)
        if found.rmsd_angstrom >= best.rmsd_angstrom:
            break
        best = found
    return best


def _assigned(a: FloatArray, kind_a: IntArray, b: FloatArray, kind_b: IntArray) -> IntArray:
    """Match atoms of one kind so that the sum of squared distances is least."""
    from scipy.optimize import linear_sum_assignment  # slow to load, and seldom needed

    partners = np.empty(len(a), dtype=np.int64)
    for kind in np.unique(kind_a):
        mine, theirs = np.flatnonzero(kind_a == kind), np.flatnonzero(kind_b == kind)
        table = ((a[mine, np.newaxis] - b[theirs]) ** 2).sum(axis=-1)
        rows, columns = linear_sum_assignment(table)
        partners[mine[rows]] = theirs[columns]
    return partners
