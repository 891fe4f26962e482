"""Where over temperature something changes: sign changes, and the windows in which an approximation holds.

The range is looked at in steps that do not depend on the temperatures the user asked for, so that a
finer grid moves nothing; each change is then located to better than 0.01 K.
"""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.results import WITHIN, SignChange, Window

FloatArray = NDArray[np.float64]
Curves = Callable[[FloatArray], FloatArray]
"""Temperatures (b,) -> values (b, c) of several curves."""
Root = tuple[float, float]
"""A temperature at which a curve passes through 0, and the sign that it has below."""
SCAN_POINTS = 129
_WIDEST_RATIO = 1.03
_REFINE_POINTS = 24
LOCATED_K = 0.001
"""How far apart the temperatures are between which a change is located at last."""


def scan_temperatures(low_k: float, high_k: float) -> FloatArray:
    """Return the temperatures to look at, both ends included: even in 1/T, and no more than 3 % apart."""
    if low_k == high_k:
        return np.array([low_k])
    grid = 1.0 / np.linspace(1.0 / low_k, 1.0 / high_k, SCAN_POINTS)
    grid[0], grid[-1] = low_k, high_k
    parts = [
        np.geomspace(a, b, 1 + int(np.ceil(np.log(b / a) / np.log(_WIDEST_RATIO))))[:-1]
        for a, b in pairwise(grid)
    ]
    return np.concatenate([*parts, grid[-1:]])


def crossings(curves: Curves, scan_k: FloatArray, values: FloatArray) -> list[list[Root]]:
    """Return for each curve where it passes through 0, ascending.

    Parameters
    ----------
    curves : callable
    scan_k : shape (n,)
    values : shape (n, c)
        The curves at `scan_k`.
    """
    return [
        _roots(curves, column, scan_k, values[:, column], dips=True)
        for column in range(values.shape[1])
    ]


def _roots(
    curves: Curves, column: int, grid: FloatArray, values: FloatArray, dips: bool
) -> list[Root]:
    """Return where one curve passes through 0; between three points too, where it may dip there."""
    signs = np.where(values < 0.0, -1.0, 1.0)
    found = [
        (_locate(curves, column, grid[k], grid[k + 1], float(signs[k])), float(signs[k]))
        for k in np.flatnonzero(signs[1:] != signs[:-1])
    ]
    if dips:
        for k in _dips(signs * values, signs):
            finer = np.linspace(grid[k - 1], grid[k + 1], 2 * _REFINE_POINTS)
            found += _roots(curves, column, finer, curves(finer)[:, column], dips=False)
    return sorted(found)


def _dips(heights: FloatArray, signs: FloatArray) -> NDArray[np.intp]:
    """Return the inner points lower than both neighbours between which the curve may reach 0 and come back."""
    left, here, right = heights[:-2], heights[1:-1], heights[2:]
    same = (signs[:-2] == signs[1:-1]) & (signs[1:-1] == signs[2:])
    with np.errstate(over="ignore", invalid="ignore", divide="ignore"):
        drop = np.minimum(left, right) - here
        bend = 0.5 * (left + right) - here
        lowest = here - (0.5 * (right - left)) ** 2 / (
            4.0 * bend
        )  # of the parabola through the three
    dip = same & np.isfinite(here) & (drop >= 0.0) & (bend > 0.0)
    return np.flatnonzero(dip & ((here < drop) | (lowest < 0.3 * here))) + 1


def _locate(curves: Curves, column: int, low: float, high: float, sign_low: float) -> float:
    while high - low > LOCATED_K:
        grid = np.linspace(low, high, _REFINE_POINTS)
        signs = np.where(curves(grid)[:, column] < 0.0, -1.0, 1.0)
        after = np.flatnonzero(signs != sign_low)
        k = int(after[0]) if len(after) and after[0] > 0 else len(grid) - 1
        low, high = float(grid[k - 1]), float(grid[k])
    return 0.5 * (low + high)


Lines = Callable[[NDArray[np.intp], FloatArray], FloatArray]
"""Numbers of lines and places along them, (n,) each -> values (n,)."""
_BATCH_POINTS = 12


def crossings_of_lines(
    curve: Lines, scan: FloatArray, values: FloatArray, located: float
) -> list[list[Root]]:
    """Return where each of many lines passes through 0, ascending; all are located together.

    Parameters
    ----------
    curve : callable
    scan : shape (n,)
        Where all lines were looked at: temperatures, or logarithms of an amount.
    values : shape (l, n)
        The lines there.
    located : float
        How far apart the places are between which a root is located at last.
    """
    signs = np.where(values < 0.0, -1.0, 1.0)
    line, at = np.nonzero(signs[:, 1:] != signs[:, :-1])
    brackets = [(line, scan[at], scan[at + 1], signs[line, at])]
    dips = [(k, int(d)) for k in range(len(values)) for d in _dips(signs[k] * values[k], signs[k])]
    if dips:
        own, place = np.array(dips).T
        finer = np.linspace(scan[place - 1], scan[place + 1], 2 * _REFINE_POINTS, axis=1)
        looked = curve(np.repeat(own, finer.shape[1]), finer.ravel()).reshape(finer.shape)
        side = np.where(looked < 0.0, -1.0, 1.0)
        row, at = np.nonzero(side[:, 1:] != side[:, :-1])
        brackets.append((own[row], finer[row, at], finer[row, at + 1], side[row, at]))
    line, low, high, below = (np.concatenate(parts) for parts in zip(*brackets, strict=True))
    while len(line) and np.max(high - low) > located:
        grid = np.linspace(low, high, _BATCH_POINTS, axis=1)
        found = curve(np.repeat(line, _BATCH_POINTS), grid.ravel()).reshape(grid.shape)
        other = np.where(found < 0.0, -1.0, 1.0) != below[:, np.newaxis]
        other[:, 0], other[:, -1] = False, True
        first = np.argmax(other, axis=1)
        rows = np.arange(len(line))
        low, high = grid[rows, first - 1], grid[rows, first]
    roots: list[list[Root]] = [[] for _ in range(len(values))]
    for k, root, sign in zip(line, 0.5 * (low + high), below, strict=True):
        roots[int(k)].append((float(root), float(sign)))
    return [sorted(one) for one in roots]


def sign_changes(roots: list[Root]) -> tuple[SignChange, ...]:
    """Name each root of the Arrhenius energy: positive below and negative above is a maximum of the rate."""
    return tuple(SignChange(root, "maximum" if below > 0 else "minimum") for root, below in roots)


def windows(curves: Curves, scan_k: FloatArray, ratios: FloatArray) -> list[tuple[Window, ...]]:
    """Return for each curve of ratios the windows in which it is within 5 % of 1.

    Parameters
    ----------
    curves : callable
        Ratios over temperature.
    scan_k : shape (n,)
    ratios : shape (n, c)
    """

    def bounds(ratio: FloatArray) -> FloatArray:
        # both bounds on their own, so that a ratio that runs through 1 between two points is seen
        return np.concatenate([ratio - (1.0 + WITHIN), ratio - (1.0 - WITHIN)], axis=1)

    roots = crossings(lambda t: bounds(curves(t)), scan_k, bounds(ratios))
    count = ratios.shape[1]
    return [
        _windows(
            bool(abs(ratios[0, k] - 1.0) <= WITHIN),
            sorted(root for root, _ in (*roots[k], *roots[count + k])),
            float(scan_k[0]),
            float(scan_k[-1]),
        )
        for k in range(count)
    ]


def _windows(inside: bool, edges: list[float], low_k: float, high_k: float) -> tuple[Window, ...]:
    """Return the windows between edges, `inside` one at `low_k` already."""
    bounds = [low_k, *edges] if inside else list(edges)
    open_above = len(bounds) % 2 == 1
    if open_above:
        bounds.append(high_k)
    pairs = list(zip(bounds[::2], bounds[1::2], strict=True))
    found = [
        Window(a, b, inside and k == 0, open_above and k == len(pairs) - 1)
        for k, (a, b) in enumerate(pairs)
    ]
    # a ratio that jumps from one side to the other leaves nothing between
    return tuple(w for w in found if w.to_k - w.from_k > LOCATED_K or low_k == high_k)
