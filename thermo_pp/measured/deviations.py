"""Standard deviations of the electronic energies, as options give them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import StudyError
from thermo_pp.units import quantity

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

    def covariance(self, names: Sequence[str], saddles: Sequence[str]) -> FloatArray:
        """Return the covariance of the energies `names`, (kJ/mol)^2."""
        spread = [self.saddle_kj_mol if name in saddles else self.minimum_kj_mol for name in names]
        return np.diag(np.square(np.array(spread, dtype=np.float64)))


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
