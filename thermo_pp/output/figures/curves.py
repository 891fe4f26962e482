"""Curves: several named quantities over one axis, and bars where there is a single point of it."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from thermo_pp.output.figures.key import key
from thermo_pp.output.figures.style import COLOURS, DASHES, HATCHES, INK, MARKERS, PALE, TEXT_PT
from thermo_pp.output.figures.words import elided

if TYPE_CHECKING:
    from matplotlib.artist import Artist
    from matplotlib.axes import Axes

FloatArray = NDArray[np.float64]
MOST_CURVES = len(COLOURS)
"""So many are in colour."""


def draw_curves(
    ax: Axes, x: FloatArray, curves: Mapping[str, FloatArray], *, marks: int = 6
) -> list[str]:
    """Draw each quantity in its own colour, dashes and marker, with a key; return their names.

    With more than seven of them the seven that become largest, by absolute value, are in colour and
    the others pale; at a single x they stand as bars, all of the same seven.

    Parameters
    ----------
    ax : Axes
    x : shape (n,)
    curves : mapping of str to shape (n,)
        nan where there is nothing to draw.
    marks : int
        Markers a curve, at most.
    """
    chosen = _largest(curves)
    if len(x) == 1:
        _bars(ax, {name: float(curves[name][0]) for name in chosen})
        return chosen
    order = np.argsort(x, kind="stable")  # a study keeps temperatures in the order given
    x, curves = x[order], {name: values[order] for name, values in curves.items()}
    every = max(1, -(-len(x) // marks))
    handles: list[Artist] = []
    for name in curves:
        if name not in chosen:
            ax.plot(x, curves[name], color=PALE, linewidth=0.5, zorder=1.5)
    for k, name in enumerate(chosen):
        start = k * every // len(chosen)  # markers of one curve do not hide those of another
        handles += ax.plot(
            x, curves[name], color=COLOURS[k], linestyle=DASHES[k], linewidth=1.1, marker=MARKERS[k],
            markevery=(start, every), markersize=3.0, markeredgewidth=0.0, zorder=2.5 - 0.01 * k,
        )  # fmt: skip
    names = list(chosen)
    if len(curves) > len(chosen):
        from matplotlib.lines import Line2D

        handles.append(Line2D([], [], color=PALE, linewidth=0.5))
        names.append(f"{len(curves) - len(chosen)} smaller ones")
    key(ax, handles, names)
    return chosen


def _largest(curves: Mapping[str, FloatArray]) -> list[str]:
    """Return which curves are in colour, in their own order."""

    def size(name: str) -> float:
        return float(np.max(np.abs(curves[name]), initial=0.0, where=np.isfinite(curves[name])))

    most = sorted(curves, key=lambda name: -size(name))[:MOST_CURVES]
    return [name for name in curves if name in most]


def _bars(ax: Axes, values: Mapping[str, float]) -> None:
    places = np.arange(len(values))
    for k, value in enumerate(values.values()):
        ax.barh(
            k,
            value,
            height=0.6,
            color=COLOURS[k],
            edgecolor="white",
            linewidth=0.0,
            hatch=HATCHES[k],
        )
    ax.axvline(0.0, color=INK, linewidth=0.5)
    ax.set_yticks(places, [elided(name, 80.0) for name in values], parse_math=False)
    ax.tick_params(axis="y", length=0.0, labelsize=TEXT_PT)
    ax.set_ylim(len(values) - 0.5, -0.5)


def temperature_axis(ax: Axes, temperature_k: FloatArray) -> None:
    """Fit the axis of temperatures to those that there are."""
    low, high = float(temperature_k.min()), float(temperature_k.max())
    margin = 0.02 * (high - low) or 5.0
    ax.set_xlim(low - margin, high + margin)
