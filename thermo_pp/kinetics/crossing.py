"""Crossing of spin states in a step: how likely it is, and its share in the Arrhenius energy."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import StudyError
from thermo_pp.formulas.crossing import landau_zener
from thermo_pp.kinetics.shares import weighted_mean
from thermo_pp.mechanism import Step
from thermo_pp.species import SaddleMember
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]


def transmission(
    step: Step, members: Sequence[SaddleMember], temperature_k: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Return ln of the probability to cross, and R T^2 times its temperature derivative, J/mol.

    Parameters
    ----------
    step : Step
        With a crossing.
    members : sequence of SaddleMember
        What the crossing point consists of. Where the probability follows from the gradients of each,
        that of the step is the mean over them.
    temperature_k : shape (t,)

    Raises
    ------
    StudyError
        A crossing point that the gradients are to be taken from, and has none.
    """
    crossing, t = step.crossing, temperature_k
    assert crossing is not None
    if crossing.transmission is not None:
        return np.full(t.shape, np.log(crossing.transmission)), np.zeros(t.shape)
    if crossing.across is not None:
        log, slope = landau_zener(t, crossing.coupling_j, *crossing.across)
        return log, GAS_J_MOL_K * t * slope
    found = []
    for member in members:
        if member.across is None:
            raise StudyError(
                f"the gradients of both states at {step.through} are not known",
                where=f"{step.where} crossing.landau_zener",
                mend='give its other state ([species.X] seam = { other = "..." }), or declare '
                "gradient_difference and reduced_mass",
            )
        log, slope = landau_zener(t, crossing.coupling_j, *member.across)
        found.append((log, GAS_J_MOL_K * t * slope))
    return weighted_mean(members, found, t)
