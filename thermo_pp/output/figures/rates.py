"""Eyring and Arrhenius plots: the rate constant, its approximations with their windows, and measurements."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.results import Approximation, EffectiveRate, Rate
from thermo_pp.names import Definition
from thermo_pp.output.figures.key import key, size_pt
from thermo_pp.output.figures.style import (
    COLOURS,
    DASHES,
    INK,
    MARKERS,
    PALE,
    TEXT_PT,
    heading,
    log_axis,
    styled,
)
from thermo_pp.output.figures.words import elided
from thermo_pp.output.tables import unit_heading

if TYPE_CHECKING:
    from matplotlib.artist import Artist
    from matplotlib.axes import Axes
    from matplotlib.backend_bases import RendererBase
    from matplotlib.container import Container
    from matplotlib.transforms import Bbox

FloatArray = NDArray[np.float64]
Form = Literal["arrhenius", "eyring"]
MOST_APPROXIMATIONS = len(COLOURS)
_STRIP_PT = 1.45 * TEXT_PT


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


@styled
def draw(
    ax: Axes,
    effective: EffectiveRate,
    definition: Definition = "pool",
    *,
    form: Form = "arrhenius",
    points: Sequence[Points] = (),
    lines: Sequence[Line] = (),
    approximations: Sequence[str] | None = None,
) -> Axes:
    """Draw a rate constant over 1/T into an axes and return it.

    The windows in which each approximation holds are strips above the axes, shaded in its colour,
    within the temperatures looked at; an end that is not one of these has a bar.

    Parameters
    ----------
    ax : Axes
    effective : EffectiveRate
    definition : {"free", "pool", "relaxation", "cycle"}
    form : {"arrhenius", "eyring"}
        k or k/T on the logarithmic axis.
    points : sequence of Points
    lines : sequence of Line
    approximations : names, or None
        None: all, the first seven of them.

    Raises
    ------
    ValueError
        The rate or an approximation is not there.
    """
    rate = effective.rates.get(definition)
    if rate is None:
        raise ValueError(f"there is no rate {definition!r}")
    chosen = _chosen(rate, approximations)
    order = np.argsort(effective.temperature_k, kind="stable")
    t = effective.temperature_k[order]
    _frame(ax, effective, rate, form, points, lines)
    handles: list[Artist | Container] = []
    names: list[str] = []
    handles += ax.plot(
        1000.0 / t, _height(t, rate.rate_constant[order], form), color=INK, linewidth=1.6, marker="o",
        markersize=3.2 if len(t) == 1 else 0.0, zorder=2.0,
    )  # fmt: skip
    names.append("computed, exact")
    for k, line in enumerate(lines):
        handle, name = _line(ax, line, form, k)
        handles.append(handle)
        names.append(name)
    for k, some in enumerate(points):
        sigma = None if some.sigma is None else _height(some.temperature_k, some.sigma, form)
        handles.append(
            ax.errorbar(
                1000.0 / some.temperature_k, _height(some.temperature_k, some.rate_constant, form), sigma,
                linestyle="none", marker=MARKERS[(k + 1) % len(MARKERS)], markersize=3.6, color=INK,
                markerfacecolor="white", markeredgewidth=0.8, elinewidth=0.7, zorder=4.0,
            )
        )  # fmt: skip
        names.append(some.label)
    for k, approximation in enumerate(chosen):
        ax.plot(
            1000.0 / t, _height(t, approximation.rate_constant[order], form), color=COLOURS[k], linestyle=DASHES[k],
            linewidth=0.8, zorder=3.0,
        )  # fmt: skip
    key(ax, handles, names)
    _temperatures(_strips(ax, chosen))
    return ax


def _chosen(rate: Rate, wanted: Sequence[str] | None) -> list[Approximation]:
    known = {approximation.name: approximation for approximation in rate.approximations}
    for name in wanted or ():
        if name not in known:
            raise ValueError(f"{name!r} is not an approximation of the rate: {', '.join(known)}")
    return [known[name] for name in (known if wanted is None else wanted)][:MOST_APPROXIMATIONS]


def _height(temperature_k: FloatArray, values: FloatArray, form: Form) -> FloatArray:
    """Return what stands on the axis; nan for what a logarithmic axis cannot show."""
    height = values / temperature_k if form == "eyring" else values
    return np.where(height > 0.0, height, np.nan)


def _temperatures(strips: Axes) -> None:
    """Write round temperatures at the upper side."""
    from matplotlib.ticker import MaxNLocator

    left, right = strips.get_xlim()
    round_k = MaxNLocator(6, steps=[1, 2, 5, 10]).tick_values(1000.0 / right, 1000.0 / left)
    inside = [t for t in round_k if left <= 1000.0 / t <= right]
    strips.xaxis.tick_top()
    strips.set_xticks([1000.0 / t for t in inside], [f"{t:.10g} K" for t in inside])
    strips.tick_params(axis="x", length=2.5)
    strips.spines["top"].set_visible(True)


def _frame(
    ax: Axes,
    effective: EffectiveRate,
    rate: Rate,
    form: Form,
    points: Sequence[Points],
    lines: Sequence[Line],
) -> None:
    """Set the scales by what is exact or measured; an approximation may be far off."""
    heading(ax, "x", "10³ K / $T$")
    unit = unit_heading(rate.unit)
    heading(ax, "y", *(("$k/T$", f"{unit} K⁻¹") if form == "eyring" else ("$k$", unit)))
    log_axis(ax, "y")
    rows = [(effective.temperature_k, rate.rate_constant)]
    rows += [(some.temperature_k, some.rate_constant) for some in points]
    rows += [(line.temperature_k, line.rate_constant) for line in lines]
    for line in lines:
        rows += [
            (line.temperature_k, edge) for edge in (line.lower, line.upper) if edge is not None
        ]
    for some in points:
        if some.sigma is not None:
            rows += [(some.temperature_k, some.rate_constant + s * some.sigma) for s in (-1.0, 1.0)]
    heights = np.concatenate([_height(t, k, form) for t, k in rows])
    inverse = np.concatenate([1000.0 / t[np.isfinite(k)] for t, k in rows])
    heights = heights[np.isfinite(heights)]
    margin = 0.03 * (inverse.max() - inverse.min()) or 0.1
    ax.set_xlim(inverse.min() - margin, inverse.max() + margin)
    if len(heights):
        factor = max((heights.max() / heights.min()) ** 0.06, 1.2)
        ax.set_ylim(heights.min() / factor, heights.max() * factor)
    backwards = int(np.sum(rate.rate_constant <= 0.0))
    if backwards:
        said = f"not drawn: k below or at zero at {backwards} of {len(rate.rate_constant)} temperatures"
        ax.text(
            0.02, 0.02, said, transform=ax.transAxes, fontsize=TEXT_PT, color=INK, va="bottom",
            wrap=True,
        )  # fmt: skip


def _line(ax: Axes, line: Line, form: Form, number: int) -> tuple[Artist, str]:
    x = 1000.0 / line.temperature_k
    colour = COLOURS[(number + 1) % len(COLOURS)]
    if line.lower is not None and line.upper is not None:
        low, high = (_height(line.temperature_k, e, form) for e in (line.lower, line.upper))
        ax.fill_between(x, low, high, color=colour, alpha=0.22, linewidth=0.0, zorder=1.0)
    (handle,) = ax.plot(
        x, _height(line.temperature_k, line.rate_constant, form), color=colour, linewidth=1.2,
        linestyle=DASHES[(number + 1) % len(DASHES)], marker=MARKERS[number % len(MARKERS)],
        markevery=max(1, len(x) // 5), markersize=2.6, zorder=2.5,
    )  # fmt: skip
    return handle, line.label


def _above(ax: Axes, height_pt: float) -> Callable[[Any, RendererBase], Bbox]:
    """Return a locator of axes of that height above `ax`; a share of its height would never settle."""
    from matplotlib.transforms import Bbox

    def place(_: Any, __: RendererBase) -> Bbox:
        figure = ax.get_figure(root=True)
        assert figure is not None
        area, point = ax.get_position(), 1.0 / (72.0 * figure.get_figheight())
        return Bbox.from_bounds(area.x0, area.y1 + 2.0 * point, area.width, height_pt * point)

    return place


def _strips(ax: Axes, chosen: Sequence[Approximation]) -> Axes:
    """Draw one strip an approximation above the axes, shaded where it is within 5 %; return their axes."""
    width, _ = size_pt(ax)
    strips = ax.inset_axes((0.0, 1.0, 1.0, 0.1))
    strips.set_axes_locator(_above(ax, max(len(chosen) * _STRIP_PT, 0.1)))
    strips.set_xlim(ax.get_xlim())
    strips.set_ylim(max(len(chosen), 1), 0.0)
    strips.set_yticks([])
    strips.spines[:].set_visible(False)
    left, right = ax.get_xlim()
    sample = 14.0 / width * (right - left)
    pad = 3.0 / width * (right - left)
    for k, approximation in enumerate(chosen):
        strips.axhspan(k + 0.06, k + 0.94, facecolor="none", edgecolor=PALE, linewidth=0.4)
        for window in approximation.windows:
            hot, cold = 1000.0 / window.to_k, 1000.0 / window.from_k
            strips.fill_between(
                (hot, cold), k + 0.06, k + 0.94, color=COLOURS[k], alpha=0.25, linewidth=0.0
            )
            for x, is_open in ((hot, window.open_above), (cold, window.open_below)):
                if not is_open:
                    strips.plot((x, x), (k + 0.06, k + 0.94), color=COLOURS[k], linewidth=1.5)
        strips.plot(
            (left + pad, left + pad + sample), (k + 0.5, k + 0.5), color=COLOURS[k], linestyle=DASHES[k],
            linewidth=1.2,
        )  # fmt: skip
        name = elided(approximation.name, width - 26.0)
        if not approximation.windows:
            name = elided(f"{approximation.name}: nowhere", width - 26.0)
        strips.text(
            left + 2.0 * pad + sample, k + 0.5, name, fontsize=TEXT_PT, va="center_baseline",
            parse_math=False,
        )  # fmt: skip
    return strips
