"""Shifts of electronic energies: the exact rates with them, and how ln k follows each.

A shift moves a species or a saddle point wherever its energy counts: in its own free energy, in the
effective saddles of steps that start from it, in the barriers of tunnelling. `Rates.moved`
differs: it moves one free energy with every effective saddle kept, which is what a control is.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.model import Rates
from thermo_pp.kinetics.point import controls_of
from thermo_pp.names import Definition
from thermo_pp.species import SaddleMember
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]
_STEP_KJ_MOL = 0.01
"""Half the interval over which effective saddles are differenced; they follow almost linearly."""


def shifted(rates: Rates, shift_kj_mol: FloatArray) -> Rates:
    """Return the rates with every electronic energy shifted.

    Parameters
    ----------
    rates : Rates
    shift_kj_mol : shape (s,)
        In the order of ``rates.energies.names``.
    """
    energies = rates.energies
    shift = np.asarray(shift_kj_mol, dtype=np.float64)
    by = 1000.0 * shift / (GAS_J_MOL_K * energies.temperature_k[:, np.newaxis])
    own = dict(zip(energies.names, shift, strict=True))
    moved = replace(
        energies,
        reduced=energies.reduced + by,
        slope_j_mol=energies.slope_j_mol + 1000.0 * shift,
        grounds_kj_mol={
            name: None if ground is None else ground + own[name]
            for name, ground in energies.grounds_kj_mol.items()
        },
        saddle_members={
            name: tuple(_member(member, own[name]) for member in members)
            for name, members in energies.saddle_members.items()
        },
    )
    return rates.model.of(moved)


@dataclass(frozen=True, eq=False)
class Slope:
    """A rate and how it follows the electronic energies; b temperatures, s species.

    Attributes
    ----------
    log : shape (b,)
        ln of its size.
    sign : shape (b,)
    by_energy : shape (b, s)
        d ln k/dE, mol/kJ, in the order of ``rates.energies.names``.
    energy_kj_mol : shape (b,)
        The Arrhenius energy.
    """

    log: FloatArray
    sign: FloatArray
    by_energy: FloatArray
    energy_kj_mol: FloatArray


def kappa_slopes(rates: Rates) -> dict[int, tuple[FloatArray, FloatArray]]:
    """Return how tunnelling factors follow the energies: species column -> d ln kappa/dE and its part of dE_a/dE.

    Per kJ/mol, shape (b, n) each; empty where no barrier is an Eckart one.
    """
    found: dict[int, tuple[FloatArray, FloatArray]] = {}
    through: set[str] = set()
    for step in rates.model.mechanism.steps:
        if step.tunnelling == "eckart":
            through |= {*step.species, str(step.through)}
    for column, name in enumerate(rates.energies.names):
        if name not in through:
            continue
        direction = np.zeros(len(rates.energies.names))
        direction[column] = _STEP_KJ_MOL
        up, down = (shifted(rates, sign * direction).steps for sign in (1.0, -1.0))
        found[column] = (
            (up.log_kappa - down.log_kappa) / (2.0 * _STEP_KJ_MOL),
            (up.kappa_energy_j_mol - down.kappa_energy_j_mol) / (2.0 * _STEP_KJ_MOL),
        )
    return found


def slope(rates: Rates, definition: Definition) -> Slope:
    """Return the rate in one definition with its slope by every electronic energy.

    The network's part is exact (the controls); that of the effective saddles by the energies, where
    limits join and tunnelling changes, is differenced step by step, outside the network.
    """
    log_rate, by_step, species = controls_of(rates, definition)
    energies = rates.energies
    per_rt = 1000.0 / (GAS_J_MOL_K * energies.temperature_k)
    found = np.zeros((len(log_rate.log), len(energies.names)))
    for column, name in enumerate(energies.names):
        direction = np.zeros(len(energies.names))
        direction[column] = _STEP_KJ_MOL
        up = shifted(rates, direction).steps.saddle_reduced
        down = shifted(rates, -direction).steps.saddle_reduced
        follows = ((up - down) / (2.0 * _STEP_KJ_MOL)).astype(np.float64)
        found[:, column] = -(by_step * follows).sum(axis=1)
        if name in species:
            found[:, column] -= species[name] * per_rt
    return Slope(log_rate.log, log_rate.sign, found, log_rate.energy_j_mol / 1000.0)


def _member(member: SaddleMember, by_kj_mol: float) -> SaddleMember:
    """Return a structure of a saddle point with its energy shifted."""
    ground = member.ground_kj_mol
    return replace(
        member,
        gibbs_kj_mol=member.gibbs_kj_mol + by_kj_mol,
        slope_enthalpy_kj_mol=member.slope_enthalpy_kj_mol + by_kj_mol,
        ground_kj_mol=None if ground is None else ground + by_kj_mol,
    )
