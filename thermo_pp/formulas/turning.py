"""Turning: a rigid top of a molecule about the bond that joins it to the frame.

The reduced moment is that of the kinetic energy: the mass-weighted displacement of a unit turn of the
top about the bond, with overall translation and rotation projected out, has the reduced moment as
its square. For a top that is symmetric about the bond this is Pitzer's

    I = I_top [1 - I_top sum_i cos^2(a_i)/I_i]   (a_i: bond and principal axis i of the molecule)

and for any one top on a rigid frame that of Pitzer (J. Chem. Phys. 1946, 14, 239; both from memory
and checked against the kinetic energy in the tests). Limits: top and frame are rigid, the moment is that of
one geometry, and several tops do not feel each other.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from itertools import pairwise
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.formulas.bonds import USUAL_FACTOR, close_pairs
from thermo_pp.formulas.frames import atom_classes
from thermo_pp.formulas.normal_modes import internal_space
from thermo_pp.formulas.superposition import best_superposition

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

STRAIGHT_DEG = 175.0
"""A chain of three atoms straighter than this has no dihedral angle."""
SAME_ANGSTROM = 0.3
"""A turned structure is the structure itself where no atom lies farther from a like one ..."""
SAME_DEG = 10.0
"""... and no dihedral angle is farther from that of the atoms in whose place its atoms come."""


def dihedral(positions_angstrom: ArrayLike, atoms: Sequence[int]) -> float:
    """Return the dihedral angle of four atoms, degrees from -180 to 180, clockwise positive (IUPAC).

    Parameters
    ----------
    positions_angstrom : shape (n, 3)
    atoms : four of int
        From 0.

    Raises
    ------
    ValueError
        Three of them lie on a line.
    """
    x = np.asarray(positions_angstrom, dtype=np.float64)[list(atoms)]
    one, axis, two = x[1] - x[0], x[2] - x[1], x[3] - x[2]
    for first, second in ((one, axis), (axis, two)):
        size = np.linalg.norm(first) * np.linalg.norm(second)
        if abs(math.degrees(math.acos(min(1.0, abs(first @ second) / size)))) < 180 - STRAIGHT_DEG:
            raise ValueError("three of the atoms lie on a line, which has no dihedral angle")
    normal, other = np.cross(one, axis), np.cross(axis, two)
    along = np.cross(normal, other) @ axis / np.linalg.norm(axis)
    return math.degrees(math.atan2(float(along), float(normal @ other)))


def top_of(kinds: ArrayLike, positions_angstrom: ArrayLike, atoms: Sequence[int]) -> BoolArray:
    """Return which atoms turn: those on the side of the third atom when the middle bond is cut.

    Parameters
    ----------
    kinds : shape (n,)
        Atomic numbers.
    positions_angstrom : shape (n, 3)
    atoms : four of int
        From 0, a chain of bonded atoms.

    Raises
    ------
    ValueError
        Not a chain of bonded atoms, or a middle bond that is part of a ring.
    """
    pairs, _ = close_pairs(kinds, positions_angstrom, USUAL_FACTOR)
    bonds = {frozenset(pair) for pair in pairs.tolist()}
    x = np.asarray(positions_angstrom, dtype=np.float64)
    for one, other in pairwise(atoms):
        if frozenset((one, other)) not in bonds:
            apart = float(np.linalg.norm(x[one] - x[other]))
            raise ValueError(
                f"atoms {one + 1} and {other + 1} are not bonded ({apart:.2f} Å apart)"
            )
    cut = frozenset(atoms[1:3])
    near: dict[int, list[int]] = {}
    for bond in bonds - {cut}:
        one, other = sorted(bond)
        near.setdefault(one, []).append(other)
        near.setdefault(other, []).append(one)
    reached, edge = {atoms[2]}, [atoms[2]]
    while edge:
        for atom in near.get(edge.pop(), ()):
            if atom not in reached:
                reached.add(atom)
                edge.append(atom)
    if atoms[1] in reached:
        raise ValueError(f"the bond of atoms {atoms[1] + 1} and {atoms[2] + 1} is part of a ring")
    return np.isin(np.arange(len(x)), sorted(reached))


class Turn(NamedTuple):
    """The motion of a torsion.

    Attributes
    ----------
    moment_u_a2 : float
        Reduced moment of inertia, u A^2.
    motion : shape (3n,)
        Mass-weighted displacement without overall motion, of length 1.
    """

    moment_u_a2: float
    motion: FloatArray


def turn(
    masses_u: ArrayLike, positions_angstrom: ArrayLike, top: BoolArray, axis: tuple[int, int]
) -> Turn:
    """Return the reduced moment and the motion of a top turning about the bond of two atoms.

    Parameters
    ----------
    masses_u : shape (n,)
    positions_angstrom : shape (n, 3)
    top : shape (n,), bool
    axis : two of int
        The atoms of the bond, from 0.

    Raises
    ------
    ValueError
        Nothing turns: all atoms of the top or of the frame lie on the axis.
    """
    m = np.asarray(masses_u, dtype=np.float64)
    x = np.asarray(positions_angstrom, dtype=np.float64)
    along = x[axis[1]] - x[axis[0]]
    along = along / np.linalg.norm(along)
    moved = np.where(top[:, np.newaxis], np.cross(along, x - x[axis[0]]), 0.0)
    weighted = (moved * np.sqrt(m)[:, np.newaxis]).ravel()
    inner = internal_space(m, x)
    inside = inner @ (inner.T @ weighted)
    moment = float(inside @ inside)
    if moment < 1e-3:
        raise ValueError("nothing turns about this bond: one side of it lies on its axis")
    return Turn(moment, inside / math.sqrt(moment))


def turned(
    positions_angstrom: ArrayLike, top: BoolArray, axis: tuple[int, int], angle_deg: float
) -> FloatArray:
    """Return the positions with the top turned: the dihedral angle grows by `angle_deg`."""
    x = np.array(positions_angstrom, dtype=np.float64)
    origin = x[axis[0]].copy()
    u = (x[axis[1]] - origin) / np.linalg.norm(x[axis[1]] - origin)
    angle = math.radians(angle_deg)
    arm = x[top] - origin
    x[top] = (
        origin
        + arm * math.cos(angle)
        + np.cross(u, arm) * math.sin(angle)
        + np.outer(arm @ u, u) * (1.0 - math.cos(angle))
    )
    return x


def same_structure(
    numbers: ArrayLike,
    masses_u: ArrayLike,
    one: FloatArray,
    other: FloatArray,
    chains: Sequence[Sequence[int]],
    mirror: bool,
) -> bool:
    """Tell whether a turned structure is the structure again, or its mirror image, like atoms permuted.

    Light tops move few atoms, so the dihedral angles of the chains are compared too: that of the atoms
    in one structure with that of the atoms in whose place they come in the other.

    Parameters
    ----------
    numbers, masses_u : shape (n,)
    one, other : shape (n, 3)
        Turned and as it was.
    chains : sequence of four atoms
        From 0: those of every torsion that was turned.
    mirror : bool
    """
    kinds = atom_classes(numbers, masses_u)
    found = best_superposition(kinds, one, kinds, other, mirror)
    if found is None:
        return False
    laid = (one - one.mean(axis=0)) @ found.rotation.T
    goal = (other - other.mean(axis=0))[found.partners]
    if float(np.linalg.norm(laid - goal, axis=1).max()) > SAME_ANGSTROM:
        return False
    for chain in chains:
        try:
            is_now = dihedral(one, chain)
            was = dihedral(other, found.partners[list(chain)].tolist())
        except ValueError:
            return False
        off = is_now + was if mirror else is_now - was
        if abs((off + 180.0) % 360.0 - 180.0) > SAME_DEG:
            return False
    return True
