"""Mixture: H, S, G and Cp of an ensemble of conformers in equilibrium, and their populations.

With G_i of one conformer of degeneracy g_i (one hand of a chiral one) and its own H_i, S_i, Cp_i:

- G = -R T ln sum_i g_i exp(-G_i/RT), p_i = g_i exp(-G_i/RT) / sum_j g_j exp(-G_j/RT);
- H = sum_i p_i H_i and S = sum_i p_i S_i - R sum_i p_i ln(p_i/g_i), so that G = H - T S exactly;
- the slope enthalpy -T^2 d(G/T)/dT = sum_i p_i h_i with h_i that of each member;
- Cp = dH/dT = sum_i p_i Cp_i + [sum_i p_i h_i H_i - sum_i p_i h_i sum_i p_i H_i] / (R T^2).

The populations change with the slope of G, d ln p_i/dT = (h_i - h)/(R T^2), whence the covariance of
h and H: the variance of H where every member has S_i = -dG_i/dT.

Source: statistical mechanics of independent wells; the entropy of mixing has the Gibbs-Shannon form
(Pracht and Grimme, Chem. Sci. 2021, 12, 6551).

Everything is summed block by block: `part` makes the sums of one block, `joined` adds two, `mixed`
makes the mixture, so that no array of members x temperatures need exist.
"""

from __future__ import annotations

from functools import reduce
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]


class Sums(NamedTuple):
    """Sums over some of the members, shape (t,) each.

    Attributes
    ----------
    log_top : largest ln g_i - G_i/RT among them
    weight : sum of the weights exp(ln g_i - G_i/RT - log_top)
    enthalpy, entropy, heat_capacity, slope, slope_enthalpy_product
        Sums of the quantity times the weight; the last of slope enthalpy times enthalpy.
    """

    log_top: FloatArray
    weight: FloatArray
    enthalpy: FloatArray
    entropy: FloatArray
    heat_capacity: FloatArray
    slope: FloatArray
    slope_enthalpy_product: FloatArray


class Mixture(NamedTuple):
    """An ensemble, J/mol and J/(mol K), shape (t,) each.

    Attributes
    ----------
    enthalpy_j_mol, entropy_j_mol_k, gibbs_j_mol, heat_capacity_j_mol_k, slope_enthalpy_j_mol
        Of the ensemble.
    mixing_entropy_j_mol_k : -R sum p ln(p/g)
    mixing_heat_capacity_j_mol_k : the covariance term of the heat capacity
    """

    enthalpy_j_mol: FloatArray
    entropy_j_mol_k: FloatArray
    gibbs_j_mol: FloatArray
    heat_capacity_j_mol_k: FloatArray
    slope_enthalpy_j_mol: FloatArray
    mixing_entropy_j_mol_k: FloatArray
    mixing_heat_capacity_j_mol_k: FloatArray


def log_weights(
    temperature_k: ArrayLike, degeneracy: ArrayLike, gibbs_j_mol: ArrayLike
) -> FloatArray:
    """Return ln g_i - G_i/RT.

    Parameters
    ----------
    temperature_k : shape (t,)
        K, above 0.
    degeneracy : shape (n,)
        Above 0.
    gibbs_j_mol : shape (n, t)

    Returns
    -------
    shape (n, t)

    Raises
    ------
    ValueError
        A temperature or a degeneracy at or below 0.
    """
    t = np.asarray(temperature_k, dtype=np.float64)
    g = np.asarray(degeneracy, dtype=np.float64)
    if not (np.all(t > 0.0) and np.all(g > 0.0)):
        raise ValueError("temperatures and degeneracies must be above 0")
    return np.asarray(
        np.log(g)[:, np.newaxis] - np.asarray(gibbs_j_mol, dtype=np.float64) / (GAS_J_MOL_K * t)
    )


def populations(
    temperature_k: ArrayLike, degeneracy: ArrayLike, gibbs_j_mol: ArrayLike
) -> FloatArray:
    """Return the share of each member, all its degeneracy together, shape (n, t); see `log_weights`."""
    logs = log_weights(temperature_k, degeneracy, gibbs_j_mol)
    shares = np.exp(logs - logs.max(axis=0))
    return np.asarray(shares / shares.sum(axis=0))


def part(
    temperature_k: ArrayLike,
    degeneracy: ArrayLike,
    enthalpy_j_mol: ArrayLike,
    entropy_j_mol_k: ArrayLike,
    heat_capacity_j_mol_k: ArrayLike,
    slope_enthalpy_j_mol: ArrayLike,
) -> Sums:
    """Return the sums over a block of members.

    Parameters
    ----------
    temperature_k : shape (t,)
        K, above 0.
    degeneracy : shape (n,)
        Above 0; n at least 1.
    enthalpy_j_mol, slope_enthalpy_j_mol : shape (n, t)
        From a zero near them: the covariance is a difference of products.
    entropy_j_mol_k, heat_capacity_j_mol_k : shape (n, t)
        The entropy of one conformer, without its degeneracy.

    Returns
    -------
    Sums
    """
    t = np.asarray(temperature_k, dtype=np.float64)
    h, s, cp, slope = (
        np.asarray(values, dtype=np.float64)
        for values in (enthalpy_j_mol, entropy_j_mol_k, heat_capacity_j_mol_k, slope_enthalpy_j_mol)
    )
    logs = log_weights(t, degeneracy, h - t * s)
    top = logs.max(axis=0)
    weight = np.exp(logs - top)
    weighted = weight * h

    def total(values: FloatArray) -> FloatArray:
        return np.asarray((weight * values).sum(axis=0))

    return Sums(
        top,
        weight.sum(axis=0),
        weighted.sum(axis=0),
        total(s),
        total(cp),
        total(slope),
        (weighted * slope).sum(axis=0),
    )


def joined(one: Sums, other: Sums) -> Sums:
    """Return the sums over the members of both."""
    top = np.maximum(one.log_top, other.log_top)
    first, second = np.exp(one.log_top - top), np.exp(other.log_top - top)
    return Sums(top, *(first * a + second * b for a, b in zip(one[1:], other[1:], strict=True)))


def mixed(temperature_k: ArrayLike, *blocks: Sums) -> Mixture:
    """Return the mixture of the members of all blocks."""
    t = np.asarray(temperature_k, dtype=np.float64)
    sums = reduce(joined, blocks)
    h, s, cp, slope, product = (values / sums.weight for values in sums[2:])
    gibbs = -GAS_J_MOL_K * t * (sums.log_top + np.log(sums.weight))
    mixing = (h - t * s - gibbs) / t
    spread = (product - slope * h) / (GAS_J_MOL_K * t * t)
    return Mixture(h, s + mixing, gibbs, cp + spread, slope, mixing, spread)


def gibbs_by_number(
    temperature_k: ArrayLike, degeneracy: ArrayLike, gibbs_j_mol: ArrayLike
) -> FloatArray:
    """Return G of the 1, 2, ... n members that count most at each temperature, shape (n, t)."""
    t = np.asarray(temperature_k, dtype=np.float64)
    logs = -np.sort(-log_weights(t, degeneracy, gibbs_j_mol), axis=0)
    return np.asarray(
        -GAS_J_MOL_K * t * (logs[0] + np.log(np.cumsum(np.exp(logs - logs[0]), axis=0)))
    )


def missed_change(temperature_k: ArrayLike, above_j_mol: ArrayLike) -> FloatArray:
    """Return by how much one more conformer, of a G above that of the ensemble, changes G, J/mol.

    -R T ln(1 + exp(-above/RT)), never above 0.
    """
    rt = GAS_J_MOL_K * np.asarray(temperature_k, dtype=np.float64)
    return np.asarray(-rt * np.logaddexp(0.0, -np.asarray(above_j_mol, dtype=np.float64) / rt))
