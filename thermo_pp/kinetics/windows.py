"""Where over temperature something changes: sign changes, and the windows in which an approximation holds.

The range is looked at in steps that do not depend on the temperatures the user asked for, so that a
finer grid moves nothing; each change is then located to better than 0.01 K.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.results import WITHIN, SignChange, Window

FloatArray = NDArray[np.float64]
Curves = Callable[[FloatArray], FloatArray]
"""Temperatures (b,) -> values (b, c) of several curves."""
SCAN_POINTS = 129
_REFINE_POINTS = 24
_LOCATED_K = 0.001


def scan_temperatures(low_k: float, high_k: float) -> FloatArray:
    """Return the temperatures to look at, even in 1/T, both ends included."""
    if low_k == high_k:
        return np.array([low_k])
    inverse = np.linspace(1.0 / low_k, 1.0 / high_k, SCAN_POINTS)
    grid = 1.0 / inverse
    grid[0], grid[-1] = low_k, high_k
    return grid


def crossings(curves: Curves, scan_k: FloatArray, values: FloatArray) -> list[list[float]]:
    """Return for each curve the temperatures at which it passes through 0, ascending.

    Parameters
    ----------
    curves : callable
    scan_k : shape (n,)
    values : shape (n, c)
        The curves at `scan_k`.
    """
    found: list[list[float]] = []
    for column in range(values.shape[1]):
        signs = np.sign(values[:, column])
        at = np.flatnonzero(signs[1:] * signs[:-1] < 0)
        roots = [_locate(curves, column, scan_k[k], scan_k[k + 1], float(signs[k])) for k in at]
        roots += [float(scan_k[k]) for k in np.flatnonzero(signs[1:-1] == 0.0) + 1]
        found.append(sorted(roots))
    return found


def _locate(curves: Curves, column: int, low: float, high: float, sign_low: float) -> float:
    while high - low > _LOCATED_K:
        grid = np.linspace(low, high, _REFINE_POINTS)
        after = np.flatnonzero(np.sign(curves(grid)[:, column]) * sign_low <= 0)
        k = int(after[0]) if len(after) and after[0] > 0 else len(grid) - 1
        low, high = float(grid[k - 1]), float(grid[k])
    return 0.5 * (low + high)


def sign_changes(
    roots: list[float], scan_k: FloatArray, values: FloatArray
) -> tuple[SignChange, ...]:
    """Name each root of the Arrhenius energy: positive below and negative above is a maximum of the rate."""
    changes: list[SignChange] = []
    for root in roots:
        below = values[scan_k < root][-1]
        changes.append(SignChange(root, "maximum" if below > 0 else "minimum"))
    return tuple(changes)


def windows(curves: Curves, scan_k: FloatArray, ratios: FloatArray) -> list[tuple[Window, ...]]:
    """Return for each curve of ratios the windows in which it is within 5 % of 1.

    Parameters
    ----------
    curves : callable
        Ratios over temperature.
    scan_k : shape (n,)
    ratios : shape (n, c)
    """

    def distance(temperature_k: FloatArray) -> FloatArray:
        return np.abs(curves(temperature_k) - 1.0) - WITHIN

    gaps = np.abs(ratios - 1.0) - WITHIN
    found: list[tuple[Window, ...]] = []
    for column, edges in enumerate(crossings(distance, scan_k, gaps)):
        inside = bool(gaps[0, column] <= 0.0)
        bounds = [float(scan_k[0])] if inside else []
        for edge in edges:
            bounds.append(edge)
            inside = not inside
        open_above = len(bounds) % 2 == 1
        if open_above:
            bounds.append(float(scan_k[-1]))
        pairs = list(zip(bounds[::2], bounds[1::2], strict=True))
        starts_open = bool(gaps[0, column] <= 0.0)
        found.append(
            tuple(
                Window(a, b, starts_open and k == 0, open_above and k == len(pairs) - 1)
                for k, (a, b) in enumerate(pairs)
            )
        )
    return found
