"""Frames: rotations that may carry one set of atoms onto another, found from pairs of atoms.

Shared by `symmetry` (a structure onto itself) and `superposition` (one structure onto another).
All searches run on stacks of rotations at once; stacks are cut so that a distance table stays in
the cache.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

SAME_MASS_U = 0.05
"""Atoms of one element whose masses differ by more than this are different isotopes."""
_BLOCK = 400_000
"""Entries of one distance table."""


def atom_classes(numbers: ArrayLike, masses_u: ArrayLike | None = None) -> IntArray:
    """Return a class for each atom: same element, and same isotope where masses are given.

    Parameters
    ----------
    numbers : shape (n,)
    masses_u : shape (n,) or None

    Returns
    -------
    shape (n,), int
        The atomic number times 1000 plus the rank of the mass within the element, so that classes
        of two structures without masses can be compared.
    """
    z = np.asarray(numbers, dtype=np.int64)
    classes: IntArray = z * 1000
    if masses_u is not None:
        m = np.asarray(masses_u, dtype=np.float64)
        for element in np.unique(z):
            where = np.flatnonzero(z == element)
            order = where[np.argsort(m[where], kind="stable")]
            classes[order[1:]] += np.cumsum(np.diff(m[order]) > SAME_MASS_U)
    return classes


def kabsch(fixed: FloatArray, moving: FloatArray, determinant: int = 1) -> FloatArray:
    """Return the rotations that bring `moving` closest to `fixed`, atom by atom, least squares.

    Parameters
    ----------
    fixed, moving : shape (..., n, 3)
        Both with the same centre already taken out.
    determinant : {1, -1}
        Proper or improper rotations.

    Returns
    -------
    shape (..., 3, 3)
        To be applied as ``moving @ R.T``.
    """
    covariance = np.swapaxes(moving, -1, -2) @ fixed
    u, _, vt = np.linalg.svd(covariance)
    handed = np.sign(np.linalg.det(u) * np.linalg.det(vt))
    vt = vt.copy()
    vt[..., 2, :] *= (determinant * handed)[..., np.newaxis]
    return np.asarray(np.swapaxes(u @ vt, -1, -2))


def frame_rotations(
    classes_a: IntArray,
    a: FloatArray,
    classes_b: IntArray,
    b: FloatArray,
    slack_angstrom: float,
    most: int = 200_000,
) -> tuple[FloatArray, FloatArray]:
    """Return each rotation that carries one well-chosen pair of atoms of `a` to a like one of `b`.

    A rotation that carries all atoms of `a` within `slack_angstrom` of atoms of `b` is close to
    one of them. The pair spans, with the centre, a plane; it is chosen so that few pairs of `b`
    are like it.

    Parameters
    ----------
    classes_a, classes_b : shape (n,), int
    a, b : shape (n, 3)
        Centres taken out; not all atoms on one line through the centre.
    slack_angstrom : float
        How far lengths may differ.
    most : int
        At most so many pairs are kept, those whose lengths fit best.

    Returns
    -------
    proper, improper : shape (k, 3, 3)
        In the order of how well the lengths fit; improper ones map the pair likewise and the rest
        to its mirror image.
    """
    first, second = _defining_pair(classes_a, a, classes_b, b, slack_angstrom)
    length_b = np.sqrt((b**2).sum(axis=1))
    to_first, to_second = (
        np.flatnonzero(
            (classes_b == classes_a[atom])
            & (np.abs(length_b - np.linalg.norm(a[atom])) <= slack_angstrom)
        )
        for atom in (first, second)
    )
    apart = np.sqrt(((b[to_first, np.newaxis] - b[to_second]) ** 2).sum(axis=-1))
    wrong = np.abs(apart - np.linalg.norm(a[first] - a[second]))
    i, j = np.nonzero((wrong <= 2.0 * slack_angstrom) & (to_first[:, np.newaxis] != to_second))
    order = np.argsort(wrong[i, j], kind="stable")[:most]
    one, two = b[to_first[i[order]]], b[to_second[j[order]]]
    source = _axes(a[first][np.newaxis], a[second][np.newaxis])
    target = _axes(one, two)
    proper = np.swapaxes(target, -1, -2) @ source
    target[:, 2] *= -1.0
    return proper, np.swapaxes(target, -1, -2) @ source


def nearest(
    rotations: FloatArray, classes_a: IntArray, a: FloatArray, classes_b: IntArray, b: FloatArray
) -> tuple[IntArray, FloatArray]:
    """Return for each rotation which atom of `b` each atom of `a` comes closest to, and how close.

    Parameters
    ----------
    rotations : shape (k, 3, 3)
    classes_a, classes_b : shape (n,)
        Every class of `a` occurs in `b`.
    a, b : shape (n, 3)

    Returns
    -------
    partners : shape (k, n), int
    distances : shape (k, n)
        A.
    """
    k, n = len(rotations), len(a)
    partners = np.empty((k, n), dtype=np.int64)
    squared = np.empty((k, n))
    for kind in np.unique(classes_a):
        mine, theirs = np.flatnonzero(classes_a == kind), np.flatnonzero(classes_b == kind)
        norm_a, norm_b = (a[mine] ** 2).sum(axis=1), (b[theirs] ** 2).sum(axis=1)
        step = max(1, _BLOCK // (len(mine) * len(theirs)))
        for begin in range(0, k, step):
            part = slice(begin, begin + step)
            turned = a[mine] @ np.swapaxes(rotations[part], -1, -2)
            table = norm_b - 2.0 * (turned @ b[theirs].T)
            best = table.argmin(axis=-1)
            partners[part, mine] = theirs[best]
            squared[part, mine] = np.take_along_axis(table, best[..., np.newaxis], -1)[..., 0]
            squared[part, mine] += norm_a
    return partners, np.sqrt(np.maximum(squared, 0.0))


def is_permutation(partners: IntArray) -> NDArray[np.bool_]:
    """Tell for each row of `partners` whether no atom occurs twice."""
    return np.asarray((np.sort(partners, axis=-1) == np.arange(partners.shape[-1])).all(axis=-1))


def _defining_pair(
    classes_a: IntArray, a: FloatArray, classes_b: IntArray, b: FloatArray, slack: float
) -> tuple[int, int]:
    """Choose the pair of atoms with the fewest like pairs among those that fix a rotation well."""
    length = np.sqrt((a**2).sum(axis=1))
    length_b = np.sqrt((b**2).sum(axis=1))
    like = (
        (classes_a[:, np.newaxis] == classes_b)
        & (np.abs(length[:, np.newaxis] - length_b) <= slack)
    ).sum(axis=1)
    # the arms that hold the frame: length of each vector, and height of the second above the first
    area = np.sqrt((np.cross(a[:, np.newaxis], a[np.newaxis]) ** 2).sum(axis=-1))
    height = area / np.maximum(np.maximum(length[:, np.newaxis], length), 1e-12)
    good = height >= 0.5 * height.max()
    cost = np.where(good, like[:, np.newaxis] * like - 0.5 * height / height.max(), np.inf)
    first, second = np.unravel_index(int(cost.argmin()), cost.shape)
    return int(first), int(second)


def _axes(one: FloatArray, two: FloatArray) -> FloatArray:
    """Return right-handed axes (rows), the first along `one`, the third across `two`: (k, 3, 3)."""
    first = one / np.linalg.norm(one, axis=-1, keepdims=True)
    third = np.cross(one, two)
    size = np.linalg.norm(third, axis=-1, keepdims=True)
    third = third / np.where(size > 0.0, size, 1.0)
    return np.stack([first, np.cross(third, first), third], axis=-2)
