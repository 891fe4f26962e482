"""Shifts of energies that bring computed and measured rates together, and the likelihood of a mechanism.

All follow from one sum of squares: the observations' residuals in units of their errors and, where
the energies have standard deviations, the shifts in units of those. Shifts are d = L z with L L^T
the covariance of the energies and z of unit variance, so that correlated and exactly known energies
need nothing special. Gauss-Newton on the exact rates.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import StudyError
from thermo_pp.measured.observed import Observed

FloatArray = NDArray[np.float64]
FARTHEST_KJ_MOL = 100.0
"""No state is moved farther than this."""


@dataclass(frozen=True, eq=False)
class Single:
    """The shift of one state alone.

    Attributes
    ----------
    shift_kj_mol, sigma_kj_mol : float
        Best shift, and its standard deviation from the observations' errors.
    chi_square : float
        What is left of the residuals.
    """

    shift_kj_mol: float
    sigma_kj_mol: float
    chi_square: float


@dataclass(frozen=True, eq=False)
class Joint:
    """The most probable shift of all energies together.

    Attributes
    ----------
    shift_kj_mol : shape (s,)
    chi_square_before, chi_square : float
        Of the residuals without any shift and with this one.
    length : float
        Square root of d^T S^-1 d: how many standard deviations the shift is away from none.
    log_evidence : float
        ln of the likelihood of the observations, shifts integrated out.
    """

    shift_kj_mol: FloatArray
    chi_square_before: float
    chi_square: float
    length: float
    log_evidence: float


class _Residuals:
    """Residuals over their errors, and their slopes, as functions of z: d = directions @ z."""

    def __init__(self, observed: Observed, directions: FloatArray, prior: bool) -> None:
        self.observed, self.directions, self.prior = observed, directions, prior
        self.factor = np.linalg.cholesky(observed.covariance)
        self._last: tuple[FloatArray, FloatArray, FloatArray] | None = None

    def both(self, z: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return residuals (p,) and slopes (p, k), of the observations alone."""
        from scipy.linalg import solve_triangular

        if self._last is None or not np.array_equal(self._last[0], z):
            values, slopes = self.observed.computed(self.directions @ z)
            residuals = solve_triangular(self.factor, self.observed.measured - values, lower=True)
            along = solve_triangular(self.factor, -slopes @ self.directions, lower=True)
            self._last = (z.copy(), residuals, along)
        return self._last[1], self._last[2]

    def squares(self, z: FloatArray) -> float:
        """Return the sum of squares, the shifts' own included where they have one."""
        own = self.both(z)[0]
        return float(own @ own + (z @ z if self.prior else 0.0))

    def gradient(self, z: FloatArray) -> FloatArray:
        """Return half the gradient of the sum of squares."""
        residuals, slopes = self.both(z)
        return slopes.T @ residuals + (z if self.prior else 0.0)

    def least(self) -> FloatArray | None:
        """Return z of the least sum of squares: Gauss-Newton, each step's length by the secant rule.

        The length matters where much is left of the residuals and the rates bend: steps of length 1
        would swing to and fro. None where the least lies farther away than is looked, or is not found.
        """
        z = np.zeros(self.directions.shape[1])
        now = self.squares(z)
        for _ in range(_MOST_STEPS):
            slopes = self.both(z)[1]
            downhill = -self.gradient(z)
            normal = slopes.T @ slopes + (np.eye(len(z)) if self.prior else 0.0)
            step = np.linalg.lstsq(normal, downhill, rcond=None)[0]
            longest = np.abs(self.directions @ step).max(initial=0.0)
            if longest < _NO_STEP_KJ_MOL:
                return z
            step *= min(1.0, _LONGEST_STEP_KJ_MOL / longest)
            start, end = downhill @ step, -self.gradient(z + step) @ step
            if start > end:
                step *= np.clip(start / (start - end), *_LENGTHS)
            while (after := self.squares(z + step)) > now:
                step = 0.5 * step
                if np.abs(self.directions @ step).max() < _NO_STEP_KJ_MOL:
                    return z
            z, now = z + step, after
            if np.abs(self.directions @ z).max() > FARTHEST_KJ_MOL:
                return None
        return None


_MOST_STEPS = 50
_LONGEST_STEP_KJ_MOL = 20.0
_NO_STEP_KJ_MOL = 1e-6
_LENGTHS = (0.1, 2.0)


def alone(observed: Observed, name: str) -> Single | None:
    """Return the shift of one energy that brings computed and measured closest; None where there is none."""
    direction = np.zeros((len(observed.names), 1))
    direction[observed.names.index(name)] = 1.0
    sums = _Residuals(observed, direction, prior=False)
    z = sums.least()
    if z is None:
        return None
    residuals, slopes = sums.both(z)
    steep = float(np.linalg.norm(slopes))
    if steep == 0.0:
        return None
    return Single(float(z[0]), 1.0 / steep, float(residuals @ residuals))


def together(observed: Observed, covariance: FloatArray) -> Joint:
    """Return the most probable shift of all energies, and the likelihood with the shifts integrated out.

    Parameters
    ----------
    observed : Observed
    covariance : shape (s, s)
        Of the energies, (kJ/mol)^2.

    Raises
    ------
    StudyError
        Nothing within reach brings computed and measured together.

    Notes
    -----
    The integral over the shifts is that of the rates linearised at the most probable shift (Laplace's method; common
    practice, no source): ln p = -1/2 [chi^2 + z^T z + ln det(2 pi C) + ln det(1 + J^T J)].
    """
    values, vectors = np.linalg.eigh(covariance)
    kept = values > 1e-12 * max(values.max(), 1e-300)
    directions = vectors[:, kept] * np.sqrt(values[kept])
    sums = _Residuals(observed, directions, prior=True)
    zero = np.zeros(directions.shape[1])
    before = sums.both(zero)[0]
    z = sums.least()
    if z is None:
        raise StudyError(
            f"no shift of the energies below {FARTHEST_KJ_MOL:g} kJ/mol brings computed and measured together",
            where=observed.blocks[0].curve.row.where,
            mend="check the units, the definition and the amounts of the measurements, or the standard deviations",
        )
    residuals, slopes = sums.both(z)
    log_determinant = 2.0 * np.log(np.diag(sums.factor)).sum() + len(residuals) * np.log(2 * np.pi)
    narrowing = np.linalg.slogdet(np.eye(len(z)) + slopes.T @ slopes)[1]
    chi_square = float(residuals @ residuals)
    return Joint(
        directions @ z,
        float(before @ before),
        chi_square,
        float(np.linalg.norm(z)),
        -0.5 * float(chi_square + z @ z + log_determinant + narrowing),
    )
