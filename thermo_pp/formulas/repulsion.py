"""Repulsion of the nuclei: one printed number that every coordinate and every nuclear charge has a share in."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.units import BOHR_ANGSTROM

FloatArray = NDArray[np.float64]


def nuclear_repulsion(charges: ArrayLike, positions_angstrom: ArrayLike) -> float:
    """Return the Coulomb repulsion of point charges, hartree.

    V = sum_{a<b} Z_a Z_b / r_ab

    Parameters
    ----------
    charges : shape (n,)
        Nuclear charges, less the electrons that an effective core potential replaces; 0 for ghost atoms.
    positions_angstrom : shape (n, 3)

    Returns
    -------
    float
        Infinite where two charges are at one place.

    Source: definition (Coulomb's law in atomic units).
    """
    products, inverse, _ = _pairs(charges, positions_angstrom)
    return 0.5 * float(np.vdot(products, inverse))


def repulsion_slope(charges: ArrayLike, positions_angstrom: ArrayLike) -> float:
    """Return how far rounded coordinates let the repulsion stray, hartree/angstrom: sum_a sum_x |dV/dx_a|.

    Times the largest error of a coordinate it is a bound of the error of V, to first order. Parameters as in
    `nuclear_repulsion`.
    """
    products, inverse, apart = _pairs(charges, positions_angstrom)
    slopes = np.einsum("ab,abx->ax", products * inverse * inverse * inverse, apart)
    return float(np.sum(np.abs(slopes))) / BOHR_ANGSTROM


def _pairs(
    charges: ArrayLike, positions_angstrom: ArrayLike
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return products of charges, inverse distances (0 where no charge is) and differences of places, bohr."""
    z = np.asarray(charges, dtype=np.float64)
    x = np.asarray(positions_angstrom, dtype=np.float64) / BOHR_ANGSTROM
    apart = x[:, np.newaxis, :] - x
    squares = np.einsum("abx,abx->ab", apart, apart)
    products = z[:, np.newaxis] * z
    squares[products == 0.0] = np.inf
    squares.flat[:: len(z) + 1] = np.inf
    with np.errstate(divide="ignore"):
        return products, 1.0 / np.sqrt(squares), apart
