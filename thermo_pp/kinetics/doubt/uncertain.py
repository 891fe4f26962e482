"""Standard deviations of the energies and their correlation, and samples drawn from them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import StudyError
from thermo_pp.kinetics.results import freeze_arrays

FloatArray = NDArray[np.float64]
ROUNDING = 1e-10
"""How far below 0 an eigenvalue of a valid correlation matrix may come out."""


@dataclass(frozen=True, eq=False)
class Uncertainty:
    """How sure the energies are; v energies.

    Attributes
    ----------
    names : tuple of str
        Species and saddle points; a step whose barrier is a height under its equation.
    deviation_kj_mol : shape (v,)
        Standard deviations.
    correlation : shape (v, v)
    samples : int
    seed : int
        Of the random numbers: the same seed gives the same samples.
    where : str
        The table of the study file.
    """

    names: tuple[str, ...]
    deviation_kj_mol: FloatArray
    correlation: FloatArray
    samples: int
    seed: int
    where: str

    def __post_init__(self) -> None:
        freeze_arrays(self)
        check_correlation(self.correlation, self.where)

    @property
    def covariance(self) -> FloatArray:
        """Of the energies, (kJ/mol)^2, shape (v, v)."""
        return np.asarray(self.correlation * np.outer(self.deviation_kj_mol, self.deviation_kj_mol))

    def drawn(self) -> FloatArray:
        """Return the shifts of all samples, kJ/mol, shape (samples, v): normal, always the same."""
        values, vectors = np.linalg.eigh(self.correlation)
        root = vectors * np.sqrt(np.maximum(values, 0.0))  # a singular matrix has a root too
        normal = np.random.default_rng(self.seed).standard_normal((self.samples, len(self.names)))
        return np.asarray((normal @ root.T) * self.deviation_kj_mol)


def check_correlation(correlation: FloatArray, where: str) -> None:
    """Check that a symmetric matrix with ones on its diagonal is a correlation matrix.

    Raises
    ------
    StudyError
        Its smallest eigenvalue is below zero: no set of energies can be correlated like that.
    """
    smallest = float(np.linalg.eigvalsh(correlation)[0])
    if smallest < -ROUNDING:
        raise StudyError(
            f"the correlations contradict each other: the smallest eigenvalue of their matrix is "
            f"{smallest:.4g}, and none may be below 0",
            where=where,
            mend="bring the correlations closer to 0, or those of energies that go with a common third "
            "closer to each other: two that go with it by 0.9 go with each other by 0.62 at least",
        )
