"""The axes of Arrhenius and Eyring plots: rate constants over 1/T, points and lines on them."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from numpy.typing import NDArray

from thermo_pp.output.figures.style import COLOURS, DASHES, INK, MARKERS, heading, log_axis
from thermo_pp.output.tables import unit_heading

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.backend_bases import RendererBase
    from matplotlib.container import ErrorbarContainer
    from matplotlib.lines import Line2D
    from matplotlib.transforms import Bbox

FloatArray = NDArray[np.float64]
Form = Literal["arrhenius", "eyring"]


@dataclass(frozen=True, eq=False)
class Points:
    """Measured rate constants, in the unit of the rate that they are drawn beside.

    Attributes
    ----------
    label : str
    temperature_k, rate_constant : shape (n,)
    sigma : shape (n,) or None
        Standard deviations.
    """

    label: str
    temperature_k: FloatArray
    rate_constant: FloatArray
    sigma: FloatArray | None = None


@dataclass(frozen=True, eq=False)
class Line:
    """A published expression or another computed rate constant, with a band where it has one.

    Attributes
    ----------
    label : str
    temperature_k, rate_constant : shape (n,)
        nan outside the temperatures that it holds for.
    lower, upper : shape (n,) or None
    """

    label: str
    temperature_k: FloatArray
    rate_constant: FloatArray
    lower: FloatArray | None = None
    upper: FloatArray | None = None


def height(temperature_k: FloatArray, values: FloatArray, form: Form) -> FloatArray:
    """Return what stands on the axis; nan for what a logarithmic axis cannot show."""
    high = values / temperature_k if form == "eyring" else values
    return np.where(high > 0.0, high, np.nan)


def frame(ax: Axes, unit: str, form: Form, points: Sequence[Points], lines: Sequence[Line]) -> None:
    """Write the headings and set the scales so that these points and lines are inside."""
    heading(ax, "x", "10³ K / $T$")
    shown = unit_heading(unit)
    heading(ax, "y", *(("$k/T$", f"{shown} K⁻¹") if form == "eyring" else ("$k$", shown)))
    log_axis(ax, "y")
    rows = [(some.temperature_k, some.rate_constant) for some in points]
    for line in lines:
        rows += [
            (line.temperature_k, edge)
            for edge in (line.rate_constant, line.lower, line.upper)
            if edge is not None
        ]
    for some in points:
        if some.sigma is not None:
            rows += [(some.temperature_k, some.rate_constant + s * some.sigma) for s in (-1.0, 1.0)]
    heights = np.concatenate([height(t, k, form) for t, k in rows])
    inverse = np.concatenate([1000.0 / t[np.isfinite(k)] for t, k in rows])
    heights = heights[np.isfinite(heights)]
    margin = 0.03 * (inverse.max() - inverse.min()) or 0.1
    ax.set_xlim(inverse.min() - margin, inverse.max() + margin)
    if len(heights):
        factor = max((heights.max() / heights.min()) ** 0.06, 1.2)
        ax.set_ylim(heights.min() / factor, heights.max() * factor)


def draw_exact(ax: Axes, line: Line, form: Form) -> Line2D:
    """Draw the computed rate constant itself, its band in grey; return the line, for the key."""
    order = np.argsort(line.temperature_k, kind="stable")
    t = line.temperature_k[order]
    _band(ax, line, form, {"color": INK, "alpha": 0.12, "zorder": 0.9})
    (handle,) = ax.plot(
        1000.0 / t, height(t, line.rate_constant[order], form), color=INK, linewidth=1.6, marker="o",
        markersize=3.2 if len(t) == 1 else 0.0, zorder=2.0,
    )  # fmt: skip
    return handle


def draw_line(ax: Axes, line: Line, form: Form, number: int, *, markers: bool = True) -> Line2D:
    """Draw the line that is the `number`-th, counted from 0, in its colour; return it, for the key.

    Without `markers` nobody takes it for a set of points; at a single temperature it has one anyway.
    """
    order = np.argsort(line.temperature_k, kind="stable")
    t = line.temperature_k[order]
    colour = COLOURS[(number + 1) % len(COLOURS)]
    lone = np.isfinite(line.rate_constant).sum() == 1
    _band(ax, line, form, {"color": colour, "alpha": 0.22, "zorder": 1.0})
    (handle,) = ax.plot(
        1000.0 / t, height(t, line.rate_constant[order], form), color=colour, linewidth=1.2,
        linestyle=DASHES[(number + 1) % len(DASHES)], marker=MARKERS[number % len(MARKERS)],
        markevery=max(1, len(t) // 5), markersize=2.6 if markers or lone else 0.0, zorder=2.5,
    )  # fmt: skip
    return handle


def _band(ax: Axes, line: Line, form: Form, look: dict[str, Any]) -> None:
    """Fill what is between the edges of a line; at a single temperature that is a bar."""
    if line.lower is None or line.upper is None:
        return
    order = np.argsort(line.temperature_k, kind="stable")
    t = line.temperature_k[order]
    low, high = (height(t, edge[order], form) for edge in (line.lower, line.upper))
    ax.fill_between(1000.0 / t, low, high, linewidth=0.0, **look)
    if np.isfinite(low).sum() == 1:  # a filled area has no width there
        ax.vlines(1000.0 / t, low, high, linewidth=5.0, **look)


def draw_points(ax: Axes, points: Points, form: Form, number: int) -> ErrorbarContainer:
    """Draw the points that are the `number`-th with their error bars; return them, for the key."""
    t, sigma = points.temperature_k, points.sigma
    return ax.errorbar(
        1000.0 / t, height(t, points.rate_constant, form), None if sigma is None else height(t, sigma, form),
        linestyle="none", marker=MARKERS[(number + 1) % len(MARKERS)], markersize=3.6, color=INK,
        markerfacecolor="white", markeredgewidth=0.8, elinewidth=0.7, zorder=4.0,
    )  # fmt: skip


def axes_above(ax: Axes, height_pt: float) -> Axes:
    """Return bare axes of that height above `ax`, over the same 1/T, with round temperatures on top.

    A share of the height of `ax` would never settle.
    """
    from matplotlib.ticker import MaxNLocator

    strips = ax.inset_axes((0.0, 1.0, 1.0, 0.1))
    strips.set_axes_locator(_above(ax, max(height_pt, 0.1)))
    strips.set_xlim(ax.get_xlim())
    strips.set_yticks([])
    strips.spines[:].set_visible(False)
    left, right = strips.get_xlim()
    round_k = MaxNLocator(6, steps=[1, 2, 5, 10]).tick_values(1000.0 / right, 1000.0 / left)
    inside = [t for t in round_k if left <= 1000.0 / t <= right]
    strips.xaxis.tick_top()
    strips.set_xticks([1000.0 / t for t in inside], [f"{t:.10g} K" for t in inside])
    strips.tick_params(axis="x", length=2.5)
    strips.spines["top"].set_visible(True)
    return strips


def _above(ax: Axes, height_pt: float) -> Callable[[Any, RendererBase], Bbox]:
    from matplotlib.transforms import Bbox

    def place(_: Any, __: RendererBase) -> Bbox:
        figure = ax.get_figure(root=True)
        assert figure is not None
        area, point = ax.get_position(), 1.0 / (72.0 * figure.get_figheight())
        return Bbox.from_bounds(area.x0, area.y1 + 2.0 * point, area.width, height_pt * point)

    return place
