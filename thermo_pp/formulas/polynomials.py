"""Polynomials of heat capacity, enthalpy and entropy over temperature, in two ranges.

Forms, with R the gas constant and t = T / 1000 K:

- ``nasa7``: Cp/R = a1 + a2 T + a3 T^2 + a4 T^3 + a5 T^4, H/R = integral + a6, S/R = integral + a7.
- ``nasa9``: Cp/R = a1 T^-2 + a2 T^-1 + a3 + a4 T + a5 T^2 + a6 T^3 + a7 T^4, b1 and b2 likewise.
- ``shomate``: Cp = A + B t + C t^2 + D t^3 + E t^-2 in J/(mol K), H = integral + F in kJ/mol,
  S = integral + G in J/(mol K).

Source of the forms: documentation of Cantera 3.2, "Thermodynamic property models" (as its YAML
files take the coefficients); the tests load them there. H = integral of Cp and S = integral of Cp/T
hold by construction, so only functions for which they hold can be fitted.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.names import PolynomialForm
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]

SCALE_K = 1000.0
"""Temperatures are divided by this where equations are solved."""
_LOG_SCALE = float(np.log(SCALE_K))
_POWERS: dict[PolynomialForm, tuple[int, ...]] = {
    "nasa7": (0, 1, 2, 3, 4),
    "nasa9": (-2, -1, 0, 1, 2, 3, 4),
    "shomate": (0, 1, 2, 3, -2),
}
"""Powers of temperature in the heat capacity, in the order of the coefficients."""


class Values(NamedTuple):
    """Heat capacity and entropy, J/(mol K), and enthalpy, J/mol; shape of the temperatures."""

    heat_capacity_j_mol_k: FloatArray
    enthalpy_j_mol: FloatArray
    entropy_j_mol_k: FloatArray


@dataclass(frozen=True, eq=False)
class Polynomial:
    """Coefficients of one form in two ranges that meet.

    Attributes
    ----------
    form : {"nasa7", "nasa9", "shomate"}
    bounds_k : (float, float, float)
        Lowest, middle and highest temperature, K.
    coefficients : shape (2, k)
        Of the lower and the upper range, in the units of the form (module docstring).
    """

    form: PolynomialForm
    bounds_k: tuple[float, float, float]
    coefficients: FloatArray

    def __post_init__(self) -> None:
        array = np.array(self.coefficients, dtype=np.float64)
        array.flags.writeable = False
        object.__setattr__(self, "coefficients", array)

    def at(self, temperature_k: ArrayLike) -> Values:
        """Return Cp, H and S; below the middle temperature from the lower range.

        Parameters
        ----------
        temperature_k : shape (...)
            K; ValueError outside the bounds.
        """
        t = np.asarray(temperature_k, dtype=np.float64)
        low, middle, high = self.bounds_k
        if np.any(t < low) or np.any(t > high):
            raise ValueError(f"temperatures must be from {low:g} to {high:g} K")
        x = t / SCALE_K
        scaled = _scaled(self.form, self.coefficients)
        chosen = scaled[np.where(t <= middle, 0, 1)]
        cp, h, s = (
            GAS_J_MOL_K * np.einsum("...k,...k->...", rows, chosen)
            for rows in _design(self.form, x)
        )
        return Values(cp, h * SCALE_K, s)

    def raised(self, enthalpy_j_mol: float) -> Polynomial:
        """Return the polynomial with an enthalpy, J/mol, added to H."""
        step = enthalpy_j_mol / (1000.0 if self.form == "shomate" else GAS_J_MOL_K)
        coefficients = np.array(self.coefficients)
        coefficients[:, -2] += step
        return Polynomial(self.form, self.bounds_k, coefficients)


def fitted(
    form: PolynomialForm,
    temperature_k: FloatArray,
    values: Values,
    bounds_k: tuple[float, float, float],
    anchor_k: float,
) -> Polynomial:
    """Fit one polynomial in two ranges to Cp, H and S by linear least squares.

    Cp/R, H/RT and S/R have equal weight. H and S at the anchor are met exactly, and Cp, H and S are
    continuous at the middle temperature: the constraints are solved for, the rest is fitted in their
    null space, in scaled temperatures.

    Parameters
    ----------
    form : {"nasa7", "nasa9", "shomate"}
    temperature_k : shape (t,)
        K, inside the bounds; the anchor must be one of them, and each range needs as many as the
        form has coefficients.
    values : Values
        Arrays of shape (t,).
    bounds_k : (float, float, float)
        Lowest, middle and highest temperature.
    anchor_k : float

    Raises
    ------
    ValueError
        Too few temperatures in a range, the anchor not among them, or bounds that do not rise.
    """
    low, middle, high = bounds_k
    t = np.asarray(temperature_k, dtype=np.float64)
    at = np.flatnonzero(t == anchor_k)
    if not 0.0 < low < middle < high or np.any(t < low) or np.any(t > high):
        raise ValueError("bounds must rise from above 0 and hold all temperatures")
    upper = t > middle
    width = len(_POWERS[form]) + 2
    if at.size == 0 or min(upper.sum(), (~upper).sum()) < width:
        raise ValueError("the anchor is missing, or too few temperatures in a range")
    anchor = int(at[0])
    start = float(values.enthalpy_j_mol[anchor])
    if not np.any(values.heat_capacity_j_mol_k):  # constants, free of rounding
        constant = np.zeros((2, width))
        constant[:, -1] = values.entropy_j_mol_k[anchor] / GAS_J_MOL_K
        return Polynomial(form, bounds_k, constant / _factors(form)).raised(start)
    x = t / SCALE_K
    rows = np.concatenate([_two_ranges(row, upper) for row in _weighted(form, x)])
    targets = np.concatenate(
        [
            values.heat_capacity_j_mol_k,
            (values.enthalpy_j_mol - start) / t,
            values.entropy_j_mol_k,
        ]
    )
    meeting = _design(form, np.array([middle / SCALE_K]))
    exact = np.concatenate(
        [
            *(np.concatenate([row, -row], axis=-1) for row in meeting),
            rows[[t.size + anchor, 2 * t.size + anchor]],
        ]
    )
    wanted = np.array([0.0, 0.0, 0.0, 0.0, targets[2 * t.size + anchor]]) / GAS_J_MOL_K
    # z = particular + free y: the rows of `exact` hold for every y
    basis, corner = np.linalg.qr(exact.T, mode="complete")
    count = len(wanted)
    particular = basis[:, :count] @ np.linalg.solve(corner[:count].T, wanted)
    free = basis[:, count:]
    rest = targets / GAS_J_MOL_K - rows @ particular
    z = particular + free @ np.linalg.lstsq(rows @ free, rest, rcond=None)[0]
    own = _unscaled(form, z.reshape(2, width))
    return Polynomial(form, bounds_k, own).raised(start)


def _design(form: PolynomialForm, x: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return the rows of Cp/R, H/(1000 R) and S/R over scaled temperatures, shape (..., k)."""
    cp, h, s = [], [], []
    none, one = np.zeros_like(x), np.ones_like(x)
    log = np.log(x)
    for n in _POWERS[form]:
        cp.append(x**n if n else one)
        h.append(log if n == -1 else x ** (n + 1) / (n + 1))
        s.append(log if n == 0 else x**n / n)
    return (
        np.stack([*cp, none, none], axis=-1),
        np.stack([*h, one, none], axis=-1),
        np.stack([*s, none, one], axis=-1),
    )


def _weighted(form: PolynomialForm, x: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return the rows of Cp/R, H/RT and S/R."""
    cp, h, s = _design(form, x)
    return cp, h / x[..., np.newaxis], s


def _two_ranges(rows: FloatArray, upper: NDArray[np.bool_]) -> FloatArray:
    """Put rows (t, k) under the lower or the upper range's columns, shape (t, 2 k)."""
    lower = ~upper[:, np.newaxis]
    return np.concatenate([rows * lower, rows * ~lower], axis=-1)


def _factors(form: PolynomialForm) -> FloatArray:
    """Return scaled coefficients over own ones, but for the shifts that logarithms bring."""
    if form == "shomate":
        return np.full(len(_POWERS[form]) + 2, 1.0 / GAS_J_MOL_K)
    powers = [SCALE_K**n for n in _POWERS[form]]
    return np.array([*powers, 1.0 / SCALE_K, 1.0])


def _unscaled(form: PolynomialForm, scaled: FloatArray) -> FloatArray:
    """Turn coefficients over T / 1000 K into those of the form."""
    own = scaled / _factors(form)
    own[:, -2:] -= _log_shifts(form, own)
    return np.asarray(own)


def _scaled(form: PolynomialForm, own: FloatArray) -> FloatArray:
    """Turn coefficients of the form into those over T / 1000 K."""
    whole = np.array(own)
    whole[:, -2:] += _log_shifts(form, own)
    return np.asarray(whole * _factors(form))


def _log_shifts(form: PolynomialForm, own: FloatArray) -> FloatArray:
    """Return what ln 1000 adds to the constants of H and S: ln T = ln x + ln 1000."""
    shifts = np.zeros((2, 2))
    if form != "shomate":
        powers = _POWERS[form]
        if -1 in powers:
            shifts[:, 0] = own[:, powers.index(-1)] * _LOG_SCALE
        shifts[:, 1] = own[:, powers.index(0)] * _LOG_SCALE
    return shifts
