"""Many sets of shifted energies at once: samples times temperatures as one batch."""

from __future__ import annotations

from dataclasses import replace
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.doubt.uncertain import Uncertainty
from thermo_pp.kinetics.model import Rates
from thermo_pp.kinetics.shifts import kappa_slopes
from thermo_pp.kinetics.steps import Energetics, elementary_rates
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]
_Number = TypeVar("_Number", np.float64, np.longdouble)


def moved(base: Rates, uncertainty: Uncertainty, shift_kj_mol: FloatArray) -> Rates:
    """Return the rates of n sets of shifted energies at t temperatures, as a batch of n t.

    An energy is shifted wherever it counts: in its own free energy, and in the effective saddle of a
    limit or a declared rate constant that starts from it. Tunnelling factors follow to first order,
    crossing factors stay as they are.

    Parameters
    ----------
    base : Rates
        At t temperatures, no energy shifted.
    uncertainty : Uncertainty
        Its names say what the columns of the shifts are.
    shift_kj_mol : shape (n, v)
    """
    energies, model = base.energies, base.model
    n, t = len(shift_kj_mol), len(energies.temperature_k)
    own = np.zeros((n, len(energies.names)))
    by_step = np.zeros((n, len(base.steps.names)))
    for column, name in enumerate(uncertainty.names):
        if name in energies.names:
            own[:, energies.index(name)] = shift_kj_mol[:, column]
        for number, other in enumerate(base.steps.names):
            if other == name and name not in energies.names:
                by_step[:, number] = shift_kj_mol[:, column]
    batch = Energetics(
        energies.names,
        np.tile(energies.temperature_k, n),
        _batch(energies.reduced, _over_rt(own, energies.temperature_k)),
        _batch(energies.slope_j_mol, 1000.0 * own[:, np.newaxis, :]),
        energies.grounds_kj_mol,
        {},
    )
    _, crossing = base.steps.repeated_factors(n)
    factors = _tunnelling(base, own), crossing
    steps = elementary_rates(model.mechanism, batch, model.treatment, model.conditions, factors)
    if by_step.any():
        over_rt = np.broadcast_to(
            _over_rt(by_step, energies.temperature_k), (n, t, by_step.shape[1])
        ).reshape(n * t, -1)
        steps = replace(
            steps,
            saddle_reduced=steps.saddle_reduced + over_rt,
            saddle_slope_j_mol=steps.saddle_slope_j_mol + 1000.0 * np.repeat(by_step, t, axis=0),
        )
    return Rates(model, batch, steps)


def _tunnelling(base: Rates, own: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return ln of the tunnelling factors and what they add to E_a with energies shifted, (n t, steps) each.

    To first order in the shifts (n, s) of the species; a Wigner factor does not depend on them.
    """
    n, steps = len(own), base.steps
    log, energy = (
        np.repeat(values[np.newaxis], n, axis=0)
        for values in (steps.log_kappa, steps.kappa_energy_j_mol)
    )
    for column, (by_log, by_energy) in kappa_slopes(base).items():
        shift = own[:, column, np.newaxis, np.newaxis]
        log += shift * by_log
        energy += shift * by_energy
    flat = -1, log.shape[2]
    return log.reshape(flat), energy.reshape(flat)


def _over_rt(shift_kj_mol: FloatArray, temperature_k: FloatArray) -> FloatArray:
    """Return shifts (n, v) over RT, shape (n, t, v)."""
    rt = GAS_J_MOL_K * temperature_k
    return np.asarray(1000.0 * shift_kj_mol[:, np.newaxis, :] / rt[np.newaxis, :, np.newaxis])


def _batch(values: NDArray[_Number], shift: FloatArray) -> NDArray[_Number]:
    """Return values (t, s) plus shifts (n, t or 1, s) as (n t, s), as exact as the values are."""
    total = values[np.newaxis] + shift.astype(values.dtype)
    return total.reshape(-1, values.shape[1])
