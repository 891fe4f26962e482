"""From the sensitivity of a rate to controls, orders and activation quantities.

E_a = R T^2 d ln k/dT under the conditions as held; with X_s = d ln k/d(-G_s/RT) it is RT + sum_s
X_s H_slope,s + RT sum_h n_h t_h, t_h = 1 for a species with a p-form standard state held at a
concentration, -1 for one with a c-form held at a pressure.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import Conditions, StandardState
from thermo_pp.formulas.rates import log_frequency_factor
from thermo_pp.kinetics.edges import LogRate
from thermo_pp.kinetics.network import Network
from thermo_pp.kinetics.results import Activation
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]
WHOLE_WITHIN = 0.02
"""How far an order may be from a whole number for a standard activation energy to have a meaning."""


@dataclass(frozen=True, eq=False)
class Sensitivity:
    """Controls and orders of one rate.

    Attributes
    ----------
    control : mapping of str to shape (t,)
        Saddles first, then species.
    saddles : tuple of str
    orders : mapping of str to shape (t,)
    """

    control: dict[str, FloatArray]
    saddles: tuple[str, ...]
    orders: dict[str, FloatArray]


def sensitivity(rate: LogRate, network: Network, step_names: tuple[str, ...]) -> Sensitivity:
    """Return controls and orders under their names.

    Parameters
    ----------
    rate : LogRate
    network : Network
    step_names : tuple of str
        Name of every step's saddle.
    """
    t = len(network.temperature_k)
    control: dict[str, FloatArray] = {name: np.zeros(t) for name in step_names}
    for number, edge in enumerate(network.edges):
        control[step_names[edge.step]] = control[step_names[edge.step]] + rate.saddles[:, number]
    saddles = tuple(control)
    for column, name in enumerate(network.species):
        control[name] = 0.0 - rate.species[:, column]
    for name in network.equilibrium:
        control.setdefault(name, np.zeros(t))
    orders = {name: rate.species[:, network.species.index(name)] for name in network.held}
    return Sensitivity(control, saddles, orders)


def collider_orders(
    rate: LogRate, network: Network, by_step: Mapping[str, FloatArray]
) -> dict[str, FloatArray]:
    """Return the order of a rate in the colliders of its steps, which act on both directions alike.

    Parameters
    ----------
    rate : LogRate
    network : Network
    by_step : mapping of str to shape (t, n)
        Order of every step's constants in each collider.
    """
    steps = [edge.step for edge in network.edges]
    return {name: (rate.saddles * orders[:, steps]).sum(axis=1) for name, orders in by_step.items()}


def activation(rate: LogRate, temperature_k: FloatArray) -> Activation:
    """Return the activation quantities of the pseudo-first-order constant: H = E_a - RT, G by the Eyring equation."""
    rt = GAS_J_MOL_K * temperature_k
    enthalpy = rate.energy_j_mol - rt
    gibbs = rt * (log_frequency_factor(temperature_k) - rate.log)
    return _activation(enthalpy, gibbs, temperature_k)


def standard_activation(
    rate: LogRate,
    orders: Mapping[str, FloatArray],
    temperature_k: FloatArray,
    conditions: Conditions,
    states: Mapping[str, StandardState],
) -> Activation | None:
    """Return the activation quantities against the standard states of the held species.

    Given where every order is within 0.02 of a whole number, nan elsewhere; None where that is
    nowhere so.
    """
    rt = GAS_J_MOL_K * temperature_k
    enthalpy = rate.energy_j_mol - rt
    gibbs = rt * (log_frequency_factor(temperature_k) - rate.log)
    whole = np.ones(len(temperature_k), np.bool_)
    for name, order in orders.items():
        whole &= np.abs(order - np.round(order)) <= WHOLE_WITHIN
        state, held = states[name], conditions.held[name]
        concentration = held.concentration_mol_l(temperature_k)
        in_bar = np.log(concentration * 1000.0 * GAS_J_MOL_K * temperature_k / 1.0e5)
        log_activity = in_bar - state.log_ratio_to_bar(temperature_k)
        slope = 1.0 + held.log_slope(temperature_k) - state.log_ratio_slope
        enthalpy = enthalpy - rt * order * slope
        gibbs = gibbs + rt * order * log_activity
    if not whole.any():
        return None
    enthalpy, gibbs = (np.where(whole, values, np.nan) for values in (enthalpy, gibbs))
    return _activation(enthalpy, gibbs, temperature_k)


def _activation(
    enthalpy_j_mol: FloatArray, gibbs_j_mol: FloatArray, temperature_k: FloatArray
) -> Activation:
    entropy = (enthalpy_j_mol - gibbs_j_mol) / temperature_k
    return Activation(enthalpy_j_mol / 1000.0, entropy, gibbs_j_mol / 1000.0)
