"""The quasi-steady state of chosen species along a time course, to set beside the course itself."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.mass_action import System
from thermo_pp.kinetics.stationary import at_rest, rest

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class QuasiSteady:
    """Chosen species at rest while all others are as the time course has them, t times.

    Attributes
    ----------
    concentration : shape (t, q)
        mol/L, in the order asked for; nan where there is no such state near the course.
    rate : shape (t,)
        The rate at this composition, mol/(L s).
    energy_j_mol : shape (t,)
        R T^2 d ln(rate)/dT, the other species staying as they are and the chosen ones following.
    """

    concentration: FloatArray
    rate: FloatArray
    energy_j_mol: FloatArray


def quasi_steady(
    system: System, chosen: Sequence[str], concentration: FloatArray, counted: FloatArray
) -> QuasiSteady:
    """Return the quasi-steady state at each composition of a time course.

    Parameters
    ----------
    system : System
    chosen : sequence of str
        Species of the system that rest.
    concentration : shape (t, s)
    counted : shape (n,)
        How much each step adds to the rate.
    """
    resting = [system.names.index(name) for name in chosen]
    others = np.setdiff1d(np.arange(len(system.names)), resting)
    found = np.full((len(concentration), len(resting)), np.nan)
    rate, energy = np.full((2, len(concentration)), np.nan)
    for k, there in enumerate(concentration):
        log = np.log(there[others])
        part = replace(
            system,
            names=tuple(chosen),
            left=system.left[:, resting],
            right=system.right[:, resting],
            log_forward=system.log_forward + _weighted(system.left[:, others], log),
            log_reverse=system.log_reverse + _weighted(system.right[:, others], log),
        )
        at = rest(part, there[resting])
        if at is None or not np.all(at > 0.0):
            continue
        state = at_rest(part, at, counted)
        found[k], rate[k] = at, state.rate
        energy[k] = state.response[-1] / state.rate if state.rate else np.nan
    return QuasiSteady(found, rate, energy)


def _weighted(counts: FloatArray, log: FloatArray) -> FloatArray:
    """Return counts @ log, in which none of a species that is not there is 0."""
    return np.asarray(np.where(counts != 0.0, counts * log, 0.0).sum(axis=1))
