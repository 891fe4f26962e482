"""Fits of ln k over temperature: Arrhenius, Eyring, a power of T, and two Arrhenius constants joined.

All but the last are linear in their parameters and solved by weighted least squares (QR) in
coordinates centred on the data, x = 1/T - <1/T> and ln(T/Tm) less its line in x: there the columns
are orthogonal and the covariance is well conditioned. Parameters as they are published (ln A, n,
E) follow by a linear map, with its covariance. Weights are (k/sigma)^2, the first-order error of
ln k. Source: weighted linear least squares with its covariance as in any textbook of data analysis
(common practice, no source).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import partial
from typing import Literal, get_args

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import StandardState
from thermo_pp.formulas.rates import log_frequency_factor
from thermo_pp.kinetics.results import freeze_arrays
from thermo_pp.units import BAR_PA, GAS_J_MOL_K

FloatArray = NDArray[np.float64]
Form = Literal["arrhenius", "eyring", "power", "series", "parallel"]
FORMS: tuple[Form, ...] = get_args(Form)
R_KJ = GAS_J_MOL_K / 1000.0
POWER_REFERENCE_K = 298.15
"""T0 of k = A (T/T0)^n exp(-E/RT)."""
LEAST_CONDITION = 1e-9
"""Smallest share of a column that must stay when the others are taken out of it."""
MOST_DEVIATION = 10.0
"""Standard deviation of a branch's ln k beyond which the data do not show that branch."""


@dataclass(frozen=True, eq=False)
class Fit:
    """One fit of ln k.

    Attributes
    ----------
    form : {"arrhenius", "eyring", "power", "series", "parallel"}
        ln A - E/RT; dS/R - dH/RT against the standard state; ln A + n ln(T/298.15 K) - E/RT;
        1/k = 1/k1 + 1/k2 and k = k1 + k2 of two Arrhenius constants.
    names : tuple of str
        Of the parameters, units in them.
    values : shape (p,)
        Factors as ln A, in (mol/L)^(1-m) s^-1; energies in kJ/mol, entropies in J/(mol K).
    covariance : shape (p, p)
    weighted : bool
        Whether the points' standard deviations were used; if not, the covariance is scaled by the
        scatter.
    chi_square : float
        Weighted sum of squares of the residuals of ln k; unweighted where `weighted` is false.
    degrees : int
        Points less parameters.
    residuals : shape (n,)
        ln k measured less fitted.
    """

    form: Form
    names: tuple[str, ...]
    values: FloatArray
    covariance: FloatArray
    weighted: bool
    chi_square: float
    degrees: int
    residuals: FloatArray
    _log: Callable[[FloatArray], tuple[FloatArray, FloatArray]]
    _energy: Callable[[FloatArray], tuple[FloatArray, FloatArray]]
    _centred: FloatArray

    def __post_init__(self) -> None:
        freeze_arrays(self)

    @property
    def deviations(self) -> FloatArray:
        """Standard deviations of the parameters."""
        return np.sqrt(np.diag(self.covariance))

    def log(self, temperature_k: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return ln k in (mol/L)^(1-m) s^-1 and its standard deviation, shape (t,) each."""
        return self._with_deviation(self._log(np.asarray(temperature_k, dtype=np.float64)))

    def energy_kj_mol(self, temperature_k: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return E_a = R T^2 d ln k/dT and its standard deviation."""
        return self._with_deviation(self._energy(np.asarray(temperature_k, dtype=np.float64)))

    def _with_deviation(
        self, found: tuple[FloatArray, FloatArray]
    ) -> tuple[FloatArray, FloatArray]:
        value, gradient = found
        return value, np.sqrt(np.einsum("ti,ij,tj->t", gradient, self._centred, gradient))

    def band_factor(self, share: float = 0.95) -> float:
        """Return how many standard deviations wide a confidence band is to each side.

        Student's t where the standard deviations come from the scatter, else the normal's.
        """
        from scipy.special import ndtri, stdtrit

        upper = 0.5 + 0.5 * share
        return float(ndtri(upper) if self.weighted else stdtrit(self.degrees, upper))

    @property
    def chance(self) -> float | None:
        """Chance of a larger `chi_square` were the fit and the standard deviations right."""
        from scipy.special import chdtrc

        if not self.weighted or self.degrees == 0:
            return None
        return float(chdtrc(self.degrees, self.chi_square))


class NoFitError(ValueError):
    """A form that the points do not determine; the text says why."""


def fit(
    form: Form,
    temperature_k: FloatArray,
    log_k: FloatArray,
    sigma_log: FloatArray | None,
    order: int,
    state: StandardState,
) -> Fit:
    """Fit one form.

    Parameters
    ----------
    form : str
    temperature_k, log_k : shape (n,)
        K, and ln k in (mol/L)^(1-m) s^-1.
    sigma_log : shape (n,) or None
        Standard deviations of ln k; None fits without weights.
    order : int
        Overall order m, which the standard state of "eyring" needs.
    state : StandardState

    Raises
    ------
    NoFitError
        Too few points or temperatures, or parameters that the points do not tell apart.
    """
    t = np.asarray(temperature_k, dtype=np.float64)
    y = np.asarray(log_k, dtype=np.float64)
    weights = np.ones_like(t) if sigma_log is None else 1.0 / np.asarray(sigma_log)
    parameters = {"arrhenius": 2, "eyring": 2, "power": 3}.get(form, 4)
    needed = parameters + (sigma_log is None)
    if len(np.unique(t)) < parameters or len(t) < needed:
        raise NoFitError(
            f"{parameters} parameters need {parameters} temperatures and, with{'out' if sigma_log is None else ''} "
            f"standard deviations, {needed} points; there are {len(np.unique(t))} and {len(t)}"
        )
    if form in ("series", "parallel"):
        return _two(form, t, y, weights, sigma_log is not None)
    return _linear(form, t, y, weights, sigma_log is not None, order, state)


def _linear(
    form: Form,
    t: FloatArray,
    y: FloatArray,
    weights: FloatArray,
    weighted: bool,
    order: int,
    state: StandardState,
) -> Fit:
    middle = np.average(1.0 / t, weights=weights**2)
    log_middle = np.average(np.log(t), weights=weights**2)
    x, z = 1.0 / t - middle, np.log(t) - log_middle
    tilt = (weights**2 * x * z).sum() / (weights**2 * x**2).sum()
    bend = z - tilt * x - np.average(z - tilt * x, weights=weights**2)
    level = np.average(z - tilt * x, weights=weights**2)
    if form == "power" and np.linalg.norm(weights * bend) < LEAST_CONDITION * np.linalg.norm(
        weights * z
    ):
        raise NoFitError("the temperatures are too close to tell n from E")

    def offset(at: FloatArray) -> FloatArray:
        """Return what ln k holds beside the fitted part."""
        if form != "eyring":
            return np.zeros_like(at)
        return log_frequency_factor(at) + (1 - order) * _log_molar(state, at)

    def basis(at: FloatArray) -> FloatArray:
        columns = [np.ones_like(at), 1.0 / at - middle]
        if form == "power":
            columns.append(np.log(at) - log_middle - tilt * columns[1] - level)
        return np.stack(columns, axis=1)

    def energy_basis(at: FloatArray) -> FloatArray:
        # R T^2 d/dT of the columns: 0, -1/T^2 and 1/T + tilt/T^2
        columns = [np.zeros_like(at), np.full_like(at, -R_KJ)]
        if form == "power":
            columns.append(R_KJ * (at + tilt))
        return np.stack(columns, axis=1)

    q, r = np.linalg.qr(basis(t) * weights[:, np.newaxis])
    inverse = np.linalg.inv(r)
    centred = inverse @ (q.T @ (weights * (y - offset(t))))
    residuals = y - offset(t) - basis(t) @ centred
    chi_square = float(((weights * residuals) ** 2).sum())
    degrees = len(t) - len(centred)
    covariance = inverse @ inverse.T
    if not weighted:
        covariance = covariance * (chi_square / degrees)
    names: tuple[str, ...]
    if form == "arrhenius":
        names = ("ln A", "E / kJ mol^-1")
        to = np.array([[1.0, -middle], [0.0, -R_KJ]])
    elif form == "eyring":
        names = ("dH / kJ mol^-1", "dS / J mol^-1 K^-1")
        to = np.array([[0.0, -R_KJ], [GAS_J_MOL_K, -GAS_J_MOL_K * middle]])
    else:
        names = ("ln A", "n", "E / kJ mol^-1")
        reference = np.log(POWER_REFERENCE_K)
        to = np.array(
            [
                [1.0, -middle, reference - log_middle + tilt * middle - level],
                [0.0, 0.0, 1.0],
                [0.0, -R_KJ, R_KJ * tilt],
            ]
        )

    def energy_offset(at: FloatArray) -> FloatArray:
        if form != "eyring":
            return np.zeros_like(at)
        # R T^2 d/dT of ln(kT/h) and of (1-m) ln c0, whose T d/dT is -1 in p-form
        return R_KJ * at * (1.0 + (order - 1) * (1.0 - state.log_ratio_slope))

    def log(at: FloatArray) -> tuple[FloatArray, FloatArray]:
        return offset(at) + basis(at) @ centred, basis(at)

    def energy(at: FloatArray) -> tuple[FloatArray, FloatArray]:
        return energy_offset(at) + energy_basis(at) @ centred, energy_basis(at)

    return Fit(
        form,
        names,
        to @ centred,
        to @ covariance @ to.T,
        weighted,
        chi_square,
        degrees,
        residuals,
        log,
        energy,
        covariance,
    )


def _log_molar(state: StandardState, t: FloatArray) -> FloatArray:
    """Return ln of the concentration, mol/L, of an ideal gas or solute in its standard state."""
    return state.log_ratio_to_bar(t) + np.log(BAR_PA / (1000.0 * GAS_J_MOL_K * t))


def _two(form: Form, t: FloatArray, y: FloatArray, weights: FloatArray, weighted: bool) -> Fit:
    """Fit two Arrhenius constants: 1/k = 1/k1 + 1/k2 (series) or k = k1 + k2 (parallel)."""
    from scipy.optimize import least_squares

    sign = -1.0 if form == "series" else 1.0
    middle, width = (1.0 / t).mean(), np.ptp(1.0 / t)

    def branches(at: FloatArray, p: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Return ln k, the share of each branch (t, 2), and x."""
        x = (1.0 / at - middle) / width
        logs = sign * np.stack([p[0] + p[1] * x, p[2] + p[3] * x], axis=1)
        whole = np.logaddexp(logs[:, 0], logs[:, 1])
        return sign * whole, np.exp(logs - whole[:, np.newaxis]), x

    def log(at: FloatArray, p: FloatArray) -> tuple[FloatArray, FloatArray]:
        value, share, x = branches(at, p)
        one, other = share[:, 0], share[:, 1]
        return value, np.stack([one, one * x, other, other * x], axis=1)

    def energy(at: FloatArray, p: FloatArray) -> tuple[FloatArray, FloatArray]:
        _, share, x = branches(at, p)
        one, other = share[:, 0], share[:, 1]
        scale = -R_KJ / width
        turn = sign * one * other * (p[1] - p[3])  # how the mean slope follows the levels
        gradient = np.stack([turn, one + turn * x, -turn, other - turn * x], axis=1)
        return scale * (one * p[1] + other * p[3]), scale * gradient

    def off(p: FloatArray) -> FloatArray:
        return np.asarray(weights * (log(t, p)[0] - y))

    def slopes(p: FloatArray) -> FloatArray:
        return np.asarray(weights[:, np.newaxis] * log(t, p)[1])

    third = max(2, len(t) // 3)
    order = np.argsort(t, kind="stable")
    ends = [np.polyfit((1.0 / t[part] - middle) / width, y[part], 1)
            for part in (order[:third], order[-third:])]  # fmt: skip
    start = np.array([ends[0][1], ends[0][0], ends[1][1], ends[1][0]])
    if abs(start[1] - start[3]) < 1e-6:
        raise NoFitError("ln k is straight over 1/T: one Arrhenius constant says it all")
    done = least_squares(
        off,
        start,
        jac=slopes,
        method="lm",
        xtol=1e-15,
        ftol=1e-15,
        gtol=1e-15,
        max_nfev=2000,
    )
    p = done.x if done.x[1] >= done.x[3] else done.x[[2, 3, 0, 1]]
    _, r = np.linalg.qr(slopes(p))
    if np.abs(np.diag(r)).min() < LEAST_CONDITION * np.abs(np.diag(r)).max():
        raise NoFitError("the points do not tell two constants apart")
    inverse = np.linalg.inv(r)
    residuals = y - log(t, p)[0]
    chi_square = float(((weights * residuals) ** 2).sum())
    degrees = len(t) - 4
    covariance = inverse @ inverse.T
    if not weighted:
        covariance = covariance * (chi_square / degrees)
    if np.sqrt(np.diag(covariance)[[0, 2]]).max() > MOST_DEVIATION:
        raise NoFitError("the points do not tell two constants apart")
    one = np.array([[1.0, -middle / width], [0.0, -R_KJ / width]])
    to = np.zeros((4, 4))
    to[:2, :2] = to[2:, 2:] = one
    return Fit(
        form,
        ("ln A1", "E1 / kJ mol^-1", "ln A2", "E2 / kJ mol^-1"),
        to @ p,
        to @ covariance @ to.T,
        weighted,
        chi_square,
        degrees,
        residuals,
        partial(log, p=p),
        partial(energy, p=p),
        covariance,
    )
