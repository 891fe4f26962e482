"""First-order propagation: how ln k and E_a follow each energy, and what one energy computed better would do."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.doubt.answers import find
from thermo_pp.kinetics.doubt.moved import moved
from thermo_pp.kinetics.doubt.results import Narrowing
from thermo_pp.kinetics.doubt.uncertain import Uncertainty
from thermo_pp.kinetics.model import Rates
from thermo_pp.kinetics.point import controls_of
from thermo_pp.names import Definition
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]
STEP_KJ_MOL = 0.01
"""Half the interval over which effective saddles and Arrhenius energies, both exact, are differenced."""


def both_ways(base: Rates, uncertainty: Uncertainty) -> Rates:
    """Return the rates with each energy moved up by `STEP_KJ_MOL`, then with each moved down."""
    one = STEP_KJ_MOL * np.eye(len(uncertainty.names))
    return moved(base, uncertainty, np.concatenate([one, -one]))


def slopes(
    base: Rates, around: Rates, uncertainty: Uncertainty, definition: Definition
) -> tuple[FloatArray, FloatArray]:
    """Return d ln k/dE (mol/kJ) and dE_a/dE of every energy, shape (t, v) each.

    That of ln k is exact: the controls, times how effective saddles follow the energies. That of E_a
    is a central difference of the exact Arrhenius energy.

    Parameters
    ----------
    base : Rates
        At t temperatures.
    around : Rates
        From `both_ways`.
    uncertainty : Uncertainty
    definition : str
    """
    t, v = len(base.energies.temperature_k), len(uncertainty.names)
    _, by_step, species = controls_of(base, definition)
    saddles = around.steps.saddle_reduced.reshape(2, v, t, -1)
    follows = np.asarray((saddles[0] - saddles[1]) / (2.0 * STEP_KJ_MOL), dtype=np.float64)
    by_log = -(follows * by_step).sum(axis=2).T
    per_rt = 1000.0 / (GAS_J_MOL_K * base.energies.temperature_k)
    for column, name in enumerate(uncertainty.names):
        if name in species:
            by_log[:, column] -= species[name] * per_rt
    energies = find(around, definition).rate.energy_j_mol.reshape(2, v, t) / 1000.0
    return by_log, ((energies[0] - energies[1]) / (2.0 * STEP_KJ_MOL)).T


def deviation(slope: FloatArray, uncertainty: Uncertainty) -> FloatArray:
    """Return the first-order standard deviation of what has this slope (t, v), shape (t,)."""
    variance = np.einsum("tv,vw,tw->t", slope, uncertainty.covariance, slope)
    return np.asarray(np.sqrt(np.maximum(variance, 0.0)))


def narrowing(by_log: FloatArray, by_energy: FloatArray, uncertainty: Uncertainty) -> Narrowing:
    """Return what each energy, computed better, would leave of the doubt."""
    log, energy = (_left(slope, uncertainty) for slope in (by_log, by_energy))
    return Narrowing(
        names=uncertainty.names,
        log_slope=by_log.T,
        energy_slope=by_energy.T,
        log_share=log[0],
        energy_share=energy[0],
        log_deviation_exact=log[1],
        log_deviation_half=log[2],
        energy_deviation_exact_kj_mol=energy[1],
        energy_deviation_half_kj_mol=energy[2],
    )


def _left(slope: FloatArray, uncertainty: Uncertainty) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return shares in the variance, and the deviations left with each one exact or halved; (v, t) each."""
    scaled = slope * uncertainty.deviation_kj_mol
    with_others = scaled @ uncertainty.correlation
    total = (scaled * with_others).sum(axis=1, keepdims=True)
    with np.errstate(divide="ignore", invalid="ignore"):
        shares = np.where(total > 0.0, scaled * with_others / total, 0.0)
    left = []
    for kept in (0.0, 0.5):
        # var(x - (1 - kept) x_v) with x_v this energy's part
        less = total - 2.0 * (1.0 - kept) * scaled * with_others + ((1.0 - kept) * scaled) ** 2
        left.append(np.sqrt(np.maximum(less, 0.0)).T)
    return shares.T, left[0], left[1]
