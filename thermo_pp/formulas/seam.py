"""The seam of two spin states: its Hessian at a crossing point, and the motion across it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.formulas.normal_modes import internal_space

FloatArray = NDArray[np.float64]


def share_of_other(g_one: ArrayLike, g_other: ArrayLike) -> float:
    """Return how much of the other state's surface makes the seam level at a crossing point.

    The x at which (1-x) g1 + x g2 is least: x = g1.d/d.d, d = g1 - g2. At a point of least energy on
    the seam the two gradients are parallel, and (1-x) g1 + x g2 is 0.

    Parameters
    ----------
    g_one, g_other : shape (n, 3)
        Gradients, in one unit.

    Returns
    -------
    float
        Between 0 and 1 where the gradients point in opposite ways, else outside.

    Raises
    ------
    ValueError
        The gradients are the same.
    """
    one, other = (np.asarray(g, dtype=np.float64) for g in (g_one, g_other))
    apart = one - other
    if not np.any(apart):
        raise ValueError("the two gradients are the same")
    return float((one * apart).sum() / (apart * apart).sum())


def seam_hessian(hessian_one: ArrayLike, hessian_other: ArrayLike, share: float) -> FloatArray:
    """Return the Hessian of the seam at a crossing point, to be used along the seam only.

    H = (1-x) H1 + x H2: the second derivative of the energy of either state while both stay equal. It
    is (|g1| H2 + |g2| H1)/|g1 - g2| where the gradients point in opposite ways, and
    (|g1| H2 - |g2| H1)/(|g1| - |g2|) where they point the same way.

    Parameters
    ----------
    hessian_one, hessian_other : shape (3n, 3n)
    share : float
        x, of `share_of_other`.

    Source: J. N. Harvey, M. Aschi, Phys. Chem. Chem. Phys. 1999, 1, 5555 (from memory); the same as the
    Hessian of the Lagrangian function of a minimum with one condition.
    """
    one, other = (np.asarray(h, dtype=np.float64) for h in (hessian_one, hessian_other))
    return np.asarray((1.0 - share) * one + share * other)


def turning_residual(hessian: ArrayLike, gradient: ArrayLike, positions_bohr: ArrayLike) -> float:
    """Return by how much a Hessian does not turn with its gradient, in the unit of the gradient.

    The gradient turns with the structure, so H (a x r) = a x g for every axis a. At a point that is not
    stationary a Hessian out of which rotations were projected misses that by the gradient itself.

    Parameters
    ----------
    hessian : shape (3n, 3n)
    gradient : shape (n, 3)
    positions_bohr : shape (n, 3)
        In the unit of length of the Hessian.

    Returns
    -------
    float
        Norm of the difference for the axis for which it is largest; 0 is perfect.
    """
    g = np.asarray(gradient, dtype=np.float64)
    x = np.asarray(positions_bohr, dtype=np.float64)
    x = x - x.mean(axis=0)
    axes = np.eye(3)[:, np.newaxis]
    turned = np.cross(axes, x).reshape(3, -1) @ np.asarray(hessian, dtype=np.float64)
    apart = turned - np.cross(axes, g).reshape(3, -1)
    return float(np.linalg.svd(apart, compute_uv=False)[0])


@dataclass(frozen=True)
class CrossingCoordinate:
    """The motion across a seam.

    Attributes
    ----------
    slope : float
        Size of the difference of the two gradients, in their unit.
    reduced_mass_u : float
        Mass with which the structure moves along it.
    overall : float
        Share of its mass-weighted length that moves or turns the structure as a whole, 0 to 1.
    """

    slope: float
    reduced_mass_u: float
    overall: float


def crossing_coordinate(
    difference: ArrayLike, masses_u: ArrayLike, positions_angstrom: ArrayLike
) -> CrossingCoordinate:
    """Return size and reduced mass of a difference of gradients d: |d| and d.d/sum(d_i^2/m_i).

    The energies of the two states part at the rate |d| v of a motion straight across the seam in
    mass-weighted coordinates, whose energy is m v^2/2 with this m.

    Parameters
    ----------
    difference : shape (n, 3)
        Not 0.
    masses_u : shape (n,)
    positions_angstrom : shape (n, 3)
    """
    d = np.asarray(difference, dtype=np.float64)
    m = np.asarray(masses_u, dtype=np.float64)
    weighted = (d / np.sqrt(m)[:, np.newaxis]).ravel()
    size, whole = float((d * d).sum()), float(weighted @ weighted)
    inside = weighted @ internal_space(m, np.asarray(positions_angstrom, dtype=np.float64))
    left = max(0.0, 1.0 - float(inside @ inside) / whole)
    return CrossingCoordinate(float(np.sqrt(size)), size / whole, float(np.sqrt(left)))
