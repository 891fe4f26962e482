"""Fall-off: a rate constant between its limits of low and high pressure."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.names import Broadening

FloatArray = NDArray[np.float64]
_LN10 = float(np.log(10.0))


@dataclass(frozen=True, eq=False)
class FalloffRate:
    """A rate constant in the fall-off range, and its derivatives; every shape that of the inputs.

    Attributes
    ----------
    log_share : shape (...)
        ln(k/k_high).
    by_reduced : shape (...)
        d ln(k/k_high)/d ln P_r; the order in the collider.
    by_centre : shape (...)
        d ln k/d ln F_cent.
    """

    log_share: FloatArray
    by_reduced: FloatArray
    by_centre: FloatArray


def falloff(log_reduced: ArrayLike, log_centre: ArrayLike, broadening: Broadening) -> FalloffRate:
    """Return k/k_high = P_r/(1 + P_r) F and its derivatives.

    Parameters
    ----------
    log_reduced : shape (...)
        ln P_r, P_r = k_low [M]/k_high.
    log_centre : shape (...)
        ln F_cent; not looked at for "lindemann".
    broadening : {"lindemann", "troe", "iupac", "jpl"}
        F = 1; or log F = log F_cent/(1 + x^2), L = log P_r, N = 0.75 - 1.27 log F_cent:
        "troe" x = (L + c)/(N - 0.14 (L + c)), c = -0.4 - 0.67 log F_cent; "iupac" x = L/N;
        "jpl" x = L.

    Source: R. G. Gilbert, K. Luther, J. Troe, Ber. Bunsenges. Phys. Chem. 1983, 87, 169; the forms of
    the IUPAC and JPL data evaluations (from memory).
    """
    ln_p = np.asarray(log_reduced, dtype=np.float64)
    log_share = -np.logaddexp(0.0, -ln_p)
    away = np.exp(log_share - ln_p)  # 1/(1 + P_r)
    zero = np.zeros(ln_p.shape)
    if broadening == "lindemann":
        return FalloffRate(log_share, away, zero)
    ln_f = np.asarray(log_centre, dtype=np.float64)
    reduced, centre = ln_p / _LN10, ln_f / _LN10
    width = 0.75 - 1.27 * centre
    if broadening == "jpl":
        x, x_reduced, x_centre = reduced, np.ones(ln_p.shape), zero
    elif broadening == "iupac":
        x = reduced / width
        x_reduced, x_centre = 1.0 / width, 1.27 * reduced / width**2
    else:
        moved = reduced - 0.4 - 0.67 * centre
        below = width - 0.14 * moved
        x = moved / below
        x_reduced = width / below**2
        x_centre = (-0.67 * below - moved * (-1.27 + 0.14 * 0.67)) / below**2
    g = 1.0 / (1.0 + x**2)
    bend = -2.0 * x * g**2  # dg/dx
    return FalloffRate(
        log_share + ln_f * g,
        away + centre * bend * x_reduced,
        g + centre * bend * x_centre,
    )


def centre_of_falloff(
    temperature_k: ArrayLike, parameters: tuple[float, ...]
) -> tuple[FloatArray, FloatArray]:
    """Return ln F_cent and T d ln F_cent/dT.

    Parameters
    ----------
    temperature_k : shape (...)
    parameters : tuple of float
        F_cent alone, or (a, T3, T1) or (a, T3, T1, T2) of (1 - a) exp(-T/T3) + a exp(-T/T1) +
        exp(-T2/T).

    Source: as `falloff`.
    """
    t = np.asarray(temperature_k, dtype=np.float64)
    if len(parameters) == 1:
        return np.full(t.shape, np.log(parameters[0])), np.zeros(t.shape)
    a, third, first = parameters[:3]
    parts = [(1.0 - a) * np.exp(-t / third), a * np.exp(-t / first)]
    slopes = [-t / third, -t / first]
    if len(parameters) == 4:
        parts.append(np.exp(-parameters[3] / t))
        slopes.append(parameters[3] / t)
    total = np.asarray(sum(parts))
    with np.errstate(divide="ignore", invalid="ignore"):
        slope = sum(p * s for p, s in zip(parts, slopes, strict=True)) / total
        return np.log(total), np.asarray(slope)
