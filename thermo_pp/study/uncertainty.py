"""From ``[doubt]`` to the standard deviations of the energies and their correlation."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from msgspec import UNSET

from thermo_pp.errors import StudyError
from thermo_pp.kinetics.doubt.uncertain import Uncertainty
from thermo_pp.mechanism import Step
from thermo_pp.nearest import suggestion
from thermo_pp.study.check import place
from thermo_pp.study.keys import DoubtKeys, SpeciesKeys
from thermo_pp.units import quantity


def make_uncertainty(
    keys: DoubtKeys,
    species: Mapping[str, SpeciesKeys],
    steps: Sequence[Step],
    file: str,
) -> Uncertainty:
    """Turn ``[doubt]`` and every ``deviation`` into an Uncertainty.

    Parameters
    ----------
    keys : DoubtKeys
    species : mapping of str to SpeciesKeys
    steps : sequence of Step
    file : str

    Raises
    ------
    StudyError
        A deviation below zero, an unknown name, correlations that contradict each other.
    """
    usual = _deviation(keys.deviation, place(file, "doubt", "deviation"))
    at_saddles = usual
    if keys.saddle_deviation is not UNSET:
        at_saddles = _deviation(keys.saddle_deviation, place(file, "doubt", "saddle_deviation"))
    saddles = {step.through for step in steps if step.through is not None}
    used = {name for step in steps for name in step.species} | saddles
    names = [name for name in species if name in used]
    deviations = [at_saddles if name in saddles else usual for name in names]
    for number, name in enumerate(names):
        own = species[name].deviation
        if own is not UNSET:
            deviations[number] = _deviation(own, place(file, "species", name, "deviation"))
    barriers = [name in saddles for name in names]
    for step in steps:
        if step.height is not None:
            names.append(step.equation)
            own_height = step.height.deviation_kj_mol
            deviations.append(at_saddles if own_height is None else own_height)
            barriers.append(True)
    kind = np.array(barriers)
    correlation = np.where(
        kind[:, np.newaxis] == kind, keys.correlation.same_kind, keys.correlation.across
    )
    where = place(file, "doubt", "pairs")
    for first, second, value in keys.pairs:
        for name in (first, second):
            if name not in names:
                raise StudyError(
                    f"{name!r} has no energy that is in doubt",
                    where=where,
                    mend=suggestion(name, names, "species"),
                )
        if first == second:
            raise StudyError(
                f"a pair of {first!r} with itself", where=where, mend="name two energies"
            )
        one, other = names.index(first), names.index(second)
        correlation[one, other] = correlation[other, one] = value
    np.fill_diagonal(correlation, 1.0)
    return Uncertainty(
        names=tuple(names),
        deviation_kj_mol=np.array(deviations),
        correlation=correlation,
        samples=keys.samples,
        seed=keys.seed,
        where=place(file, "doubt"),
    )


def check_unused(species: Mapping[str, SpeciesKeys], file: str) -> None:
    """Refuse a species' deviation in a study without ``[doubt]``, where nothing would come of it."""
    for name, own in species.items():
        if own.deviation is not UNSET:
            raise StudyError(
                "a deviation has no use without [doubt]",
                where=place(file, "species", name, "deviation"),
                mend='write [doubt] and the deviation of all others: deviation = "4 kJ/mol"',
            )


def _deviation(value: object, where: str) -> float:
    number = quantity(value, "kJ/mol", where=where)
    if number < 0.0:
        raise StudyError(
            f"{value!r} is below 0", where=where, mend="a standard deviation is 0 or more"
        )
    return number
