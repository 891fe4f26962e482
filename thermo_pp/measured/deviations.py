"""Standard deviations of the electronic energies, as options give them or the study's ``[doubt]`` has them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import StudyError
from thermo_pp.measured.results import EnergyDoubt
from thermo_pp.units import quantity

if TYPE_CHECKING:
    from thermo_pp.kinetics.doubt.uncertain import Uncertainty
    from thermo_pp.measured.observed import StudyLike

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class Deviations:
    """Standard deviations of electronic energies, independent of each other.

    Attributes
    ----------
    minimum_kj_mol : float
        Of every species that is no saddle point; 0 where it is taken as exact.
    saddle_kj_mol : float
        Of every saddle point.
    """

    minimum_kj_mol: float
    saddle_kj_mol: float

    def of(self, names: Sequence[str], saddles: Sequence[str]) -> EnergyDoubt:
        """Return the deviations of the energies `names`, independent of each other."""
        spread = [self.saddle_kj_mol if name in saddles else self.minimum_kj_mol for name in names]
        return EnergyDoubt("options", tuple(names), np.array(spread), np.eye(len(names)))


def energy_doubt(study: StudyLike, deviations: Deviations | None) -> EnergyDoubt | None:
    """Return how sure the energies of a study are.

    Parameters
    ----------
    study : StudyLike
    deviations : Deviations or None
        As options give them: they stand in place of the study's ``[doubt]``.

    Returns
    -------
    EnergyDoubt or None
        In the order of the energies of the rates; None where nothing says how sure they are.
    """
    names = (*study.mechanism.species, *study.mechanism.saddles)
    if deviations is not None:
        return deviations.of(names, study.mechanism.saddles)
    return None if study.uncertainty is None else _of_study(study.uncertainty, names)


def _of_study(uncertainty: Uncertainty, names: Sequence[str]) -> EnergyDoubt:
    places = [uncertainty.names.index(name) for name in names]
    return EnergyDoubt(
        uncertainty.where,
        tuple(names),
        uncertainty.deviation_kj_mol[places],
        uncertainty.correlation[np.ix_(places, places)],
    )


def make_deviations(deviation: Any, saddle_deviation: Any) -> Deviations | None:
    """Return standard deviations from kJ/mol or texts with a unit; None where neither is given.

    With `deviation` alone it counts for saddle points too; with `saddle_deviation` alone everything
    else is exactly known.

    Raises
    ------
    StudyError
        No energy, or not above 0.
    """
    if deviation is None and saddle_deviation is None:
        return None
    minimum = 0.0 if deviation is None else _positive(deviation, "--deviation")
    if saddle_deviation is None:
        return Deviations(minimum, minimum)
    return Deviations(minimum, _positive(saddle_deviation, "--saddle-deviation"))


def _positive(value: Any, where: str) -> float:
    number = quantity(value, "kJ/mol", where=where)
    if number <= 0.0:
        raise StudyError(
            f"standard deviation {value!r} is not above 0",
            where=where,
            mend='write for instance "4 kJ/mol", or leave it out',
        )
    return number
