"""Many: H, S, G and Cp of thousands of structures at once, in blocks that stay in the cache."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.conditions import StandardState
from thermo_pp.names import LowModes
from thermo_pp.species.ideal_gas import IdealGas, shares, totals
from thermo_pp.species.structure import Structure
from thermo_pp.units import GAS_J_MOL_K, HARTREE_KJ_MOL

FloatArray = NDArray[np.float64]

BLOCK = 8
"""Structures computed together: with 54 modes and 100 temperatures one array of them is 350 kB."""


class Many(NamedTuple):
    """Results of several structures, the units and meanings of `Thermochemistry`.

    Attributes
    ----------
    enthalpy_kj_mol, entropy_j_mol_k, gibbs_kj_mol, heat_capacity_j_mol_k : shape (n, t)
    slope_enthalpy_kj_mol : shape (n, t)
    """

    enthalpy_kj_mol: FloatArray
    entropy_j_mol_k: FloatArray
    gibbs_kj_mol: FloatArray
    heat_capacity_j_mol_k: FloatArray
    slope_enthalpy_kj_mol: FloatArray


def many(
    structures: Sequence[Structure],
    temperature_k: ArrayLike,
    *,
    low_modes: LowModes | None = None,
    standard_state: StandardState | None = None,
) -> Many:
    """Return what `Structure.at` returns of many structures at once, many times faster.

    Structures that are alike in kind of rotor, numbers of modes and levels, torsions and treatment
    share a block.

    Parameters
    ----------
    structures : sequence of Structure
    temperature_k : shape (t,)
        K, above 0.
    low_modes, standard_state
        In place of each treatment's own.

    Returns
    -------
    Many
    """
    t = np.atleast_1d(np.asarray(temperature_k, dtype=np.float64))
    result = Many(*(np.empty((len(structures), t.size)) for _ in Many._fields))
    for rows in _blocks(structures):
        first = structures[rows[0]]
        used = low_modes or first.treatment.low_modes
        state = standard_state or first.treatment.standard_state
        gas = _stacked([structures[row].gas for row in rows])
        total = totals(shares(t, gas, first.treatment, used))
        energies = [structures[row].energy_hartree for row in rows]
        electronic = np.array(energies)[:, np.newaxis] * HARTREE_KJ_MOL
        added = [structures[row].added for row in rows]
        heats = [sum(share.enthalpy_j_mol for share in shared) for shared in added]
        electronic += np.array(heats)[:, np.newaxis] / 1000.0
        enthalpy = electronic + total.enthalpy_j_mol / 1000.0
        entropy = total.entropy_j_mol_k - GAS_J_MOL_K * state.log_ratio_to_bar(t)
        disorder = [sum(share.entropy_j_mol_k for share in shared) for shared in added]
        entropy = entropy + np.array(disorder)[:, np.newaxis]
        result.enthalpy_kj_mol[rows] = enthalpy
        result.entropy_j_mol_k[rows] = entropy
        result.gibbs_kj_mol[rows] = enthalpy - t * entropy / 1000.0
        result.heat_capacity_j_mol_k[rows] = total.heat_capacity_j_mol_k
        bend = GAS_J_MOL_K * t * state.log_ratio_slope
        result.slope_enthalpy_kj_mol[rows] = enthalpy + (total.slope_excess_j_mol - bend) / 1000.0
    return result


def grounds(structures: Sequence[Structure]) -> FloatArray:
    """Return what `Structure.ground_kj_mol` is of many structures, shape (n,)."""
    found = np.empty(len(structures))
    for rows in _blocks(structures):
        first = structures[rows[0]]
        gas = _stacked([structures[row].gas for row in rows])
        total = totals(shares(np.ones(1), gas, first.treatment, first.treatment.low_modes))
        energies = np.array([structures[row].energy_hartree for row in rows])
        found[rows] = energies * HARTREE_KJ_MOL + total.zero_point_j_mol.ravel() / 1000.0
    return found


def _blocks(structures: Sequence[Structure]) -> Iterable[list[int]]:
    """Return rows of like structures, at most `BLOCK` together."""
    alike: dict[object, list[int]] = {}
    for row, structure in enumerate(structures):
        gas = structure.gas
        key = (
            gas.rotor,
            gas.quantum_rotor,
            gas.spin_weights,
            gas.distortion_k,
            gas.spin_shares,
            gas.wavenumbers_cm.size,
            gas.levels_cm.size,
            gas.torsions,
            structure.treatment,
        )
        alike.setdefault(key, []).append(row)
    for rows in alike.values():
        for begin in range(0, len(rows), BLOCK):
            yield rows[begin : begin + BLOCK]


def _stacked(gases: Sequence[IdealGas]) -> IdealGas:
    """Return one IdealGas with axes (b, 1, ...)."""

    def stack(name: str) -> FloatArray:
        values = np.array([getattr(gas, name) for gas in gases], dtype=np.float64)
        return np.expand_dims(values, 1)

    return IdealGas(
        mass_u=stack("mass_u"),
        rotor=gases[0].rotor,
        theta_k=stack("theta_k"),
        symmetry_number=stack("symmetry_number"),
        quantum_rotor=gases[0].quantum_rotor,
        wavenumbers_cm=stack("wavenumbers_cm"),
        degeneracies=stack("degeneracies"),
        levels_cm=stack("levels_cm"),
        hands=stack("hands"),
        spin_weights=gases[0].spin_weights,
        distortion_k=gases[0].distortion_k,
        spin_shares=gases[0].spin_shares,
        torsions=gases[0].torsions,
    )
