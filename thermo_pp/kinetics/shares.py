"""Shares of the structures of a saddle point in a factor that each has for itself."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from thermo_pp.species import SaddleMember
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]


def weighted_mean(
    members: Sequence[SaddleMember],
    factors: Sequence[tuple[FloatArray, FloatArray]],
    temperature_k: FloatArray,
) -> tuple[FloatArray, FloatArray]:
    """Return ln sum_i f_i exp(-G_i/RT) less the same without f, and R T^2 times its derivative, J/mol.

    Parameters
    ----------
    members : sequence of SaddleMember
    factors : sequence of pairs of shape (t,)
        ln f of each member, and R T^2 d ln f/dT, J/mol.
    temperature_k : shape (t,)
    """
    if len(members) == 1:
        return factors[0]
    rt = GAS_J_MOL_K * temperature_k
    slopes = np.stack([1000.0 * member.slope_enthalpy_kj_mol for member in members])
    bare = np.stack([-1000.0 * member.gibbs_kj_mol / rt for member in members])
    whole = bare + np.stack([log for log, _ in factors])
    moved = slopes + np.stack([energy for _, energy in factors])
    log_mean = np.logaddexp.reduce(whole) - np.logaddexp.reduce(bare)
    energy = (_shares(whole) * moved).sum(axis=0) - (_shares(bare) * slopes).sum(axis=0)
    return np.asarray(log_mean), np.asarray(energy)


def _shares(logs: FloatArray) -> FloatArray:
    """Return exp(logs) over their sum along the first axis."""
    return np.asarray(np.exp(logs - np.logaddexp.reduce(logs)))
