"""Eyring and Arrhenius plots: the rate constant, its approximations with their windows, and measurements."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

from thermo_pp.kinetics.results import Approximation, EffectiveRate, Rate
from thermo_pp.names import Definition
from thermo_pp.output.figures.inverse import (
    Form,
    Line,
    Points,
    axes_above,
    draw_exact,
    draw_line,
    draw_points,
    frame,
    height,
)
from thermo_pp.output.figures.key import key, size_pt
from thermo_pp.output.figures.style import COLOURS, DASHES, INK, PALE, TEXT_PT, styled
from thermo_pp.output.figures.words import elided

if TYPE_CHECKING:
    from matplotlib.artist import Artist
    from matplotlib.axes import Axes
    from matplotlib.container import Container

__all__ = ["Form", "Line", "Points", "draw"]

MOST_APPROXIMATIONS = len(COLOURS)
_STRIP_PT = 1.45 * TEXT_PT


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
    t = effective.temperature_k
    exact = Line("computed, exact", t, rate.rate_constant)
    # the scales are set by what is exact or measured; an approximation may be far off
    frame(ax, rate.unit, form, points, [exact, *lines])
    _backwards(ax, rate)
    handles: list[Artist | Container] = [
        draw_exact(ax, exact, form),
        *(draw_line(ax, line, form, k) for k, line in enumerate(lines)),
        *(draw_points(ax, some, form, k) for k, some in enumerate(points)),
    ]
    order = np.argsort(t, kind="stable")
    for k, approximation in enumerate(chosen):
        near = height(t, approximation.rate_constant, form)
        ax.plot(
            1000.0 / t[order], near[order], color=COLOURS[k], linestyle=DASHES[k], linewidth=0.8,
            zorder=3.0,
        )  # fmt: skip
    labels = [exact.label, *(one.label for one in lines), *(one.label for one in points)]
    key(ax, handles, labels)
    _strips(ax, chosen)
    return ax


def _backwards(ax: Axes, rate: Rate) -> None:
    """Say what a logarithmic axis leaves out."""
    backwards = int(np.sum(rate.rate_constant <= 0.0))
    if backwards:
        said = f"not drawn: k below or at zero at {backwards} of {len(rate.rate_constant)} temperatures"
        ax.text(
            0.02, 0.02, said, transform=ax.transAxes, fontsize=TEXT_PT, color=INK, va="bottom",
            wrap=True,
        )  # fmt: skip


def _chosen(rate: Rate, wanted: Sequence[str] | None) -> list[Approximation]:
    known = {approximation.name: approximation for approximation in rate.approximations}
    for name in wanted or ():
        if name not in known:
            raise ValueError(f"{name!r} is not an approximation of the rate: {', '.join(known)}")
    return [known[name] for name in (known if wanted is None else wanted)][:MOST_APPROXIMATIONS]


def _strips(ax: Axes, chosen: Sequence[Approximation]) -> None:
    """Draw one strip an approximation above the axes, shaded where it is within 5 %."""
    width, _ = size_pt(ax)
    strips = axes_above(ax, len(chosen) * _STRIP_PT)
    strips.set_ylim(max(len(chosen), 1), 0.0)
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
