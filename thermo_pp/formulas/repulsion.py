"""Repulsion of the nuclei: one printed number that every coordinate and every nuclear charge has a share in."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from thermo_pp.units import BOHR_ANGSTROM


class Repulsion(NamedTuple):
    """Energy, hartree, and by how much it may change where each coordinate is off by one unit, hartree/angstrom."""

    energy_hartree: float
    slope_hartree_angstrom: float


def nuclear_repulsion(charges: ArrayLike, positions_angstrom: ArrayLike) -> Repulsion:
    """Return the Coulomb repulsion of point charges and how far rounded coordinates let it stray.

    V = sum_{a<b} Z_a Z_b / r_ab;  |dV| <= delta sum_a sum_x |dV/dx_a| for coordinates that are off by delta at most

    Parameters
    ----------
    charges : shape (n,)
        Nuclear charges, less the electrons that an effective core potential replaces; 0 for ghost atoms.
    positions_angstrom : shape (n, 3)

    Returns
    -------
    Repulsion
        The energy is infinite where two charges are at one place.

    Source: definition (Coulomb's law in atomic units).
    """
    z = np.asarray(charges, dtype=np.float64)
    x = np.asarray(positions_angstrom, dtype=np.float64) / BOHR_ANGSTROM
    apart = x[:, np.newaxis, :] - x
    squares = np.einsum("abx,abx->ab", apart, apart)
    np.fill_diagonal(squares, np.inf)
    products = z[:, np.newaxis] * z
    with np.errstate(divide="ignore", invalid="ignore"):
        inverse = np.where(products != 0.0, 1.0 / np.sqrt(squares), 0.0)
        energy = 0.5 * float(np.sum(products * inverse))
        slopes = np.einsum("ab,abx->ax", products * inverse**3, apart)
        slope = float(np.sum(np.abs(slopes))) / BOHR_ANGSTROM
    return Repulsion(energy, slope)
