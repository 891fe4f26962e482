"""Time courses: concentrations over the logarithm of time, at one or several temperatures."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, Protocol

import numpy as np
from numpy.typing import NDArray

from thermo_pp.output.figures.curves import draw_curves
from thermo_pp.output.figures.key import key, size_pt
from thermo_pp.output.figures.style import (
    COLOURS,
    DASHES,
    INK,
    MARKERS,
    TEXT_PT,
    heading,
    log_axis,
    power_of_ten,
    styled,
)
from thermo_pp.output.figures.words import elided
from thermo_pp.output.notes import kelvin

if TYPE_CHECKING:
    from matplotlib.artist import Artist
    from matplotlib.axes import Axes

FloatArray = NDArray[np.float64]
LEAST = 1e-12
"""Of the largest concentration; a logarithmic axis ends there."""


class Course(Protocol):
    """What is drawn of a time course."""

    @property
    def temperature_k(self) -> float: ...  # noqa: D102
    @property
    def time_s(self) -> FloatArray: ...  # noqa: D102
    @property
    def concentration_mol_l(self) -> Mapping[str, FloatArray]: ...  # noqa: D102


@styled
def draw(
    ax: Axes, course: Course, *, species: Sequence[str] | None = None, log: bool = False
) -> Axes:
    """Draw the concentrations of one course into an axes and return it.

    Parameters
    ----------
    ax : Axes
    course : time course
    species : names, or None
        None: all.
    log : bool
        Whether the axis of concentrations is logarithmic; zeros are not drawn then.
    """
    later = course.time_s > 0.0  # a logarithmic axis has no 0
    names = list(course.concentration_mol_l) if species is None else list(species)
    curves = {name: course.concentration_mol_l[name][later] for name in names}
    _frame(ax, max((float(values.max()) for values in curves.values()), default=0.0), log=log)
    ax.set_title(kelvin(course.temperature_k), fontsize=TEXT_PT, color=INK)
    if log:
        curves = {name: np.where(values > 0.0, values, np.nan) for name, values in curves.items()}
    draw_curves(ax, course.time_s[later], curves)
    return ax


@styled
def draw_temperatures(ax: Axes, courses: Sequence[Course], name: str) -> Axes:
    """Draw one species at several temperatures, up to seven, into an axes and return it."""
    if not 1 <= len(courses) <= len(COLOURS):
        raise ValueError(f"1 to {len(COLOURS)} temperatures can be drawn, not {len(courses)}")
    _frame(ax, max(float(course.concentration_mol_l[name].max()) for course in courses), log=False)
    ax.set_title(elided(name, size_pt(ax)[0]), fontsize=TEXT_PT, color=INK)
    handles: list[Artist] = []
    for k, course in enumerate(courses):
        later = course.time_s > 0.0
        handles += ax.plot(
            course.time_s[later], course.concentration_mol_l[name][later], color=COLOURS[k],
            linestyle=DASHES[k], linewidth=1.1, marker=MARKERS[k], markersize=3.0, markeredgewidth=0.0,
            markevery=max(1, int(later.sum()) // 6),
        )  # fmt: skip
    key(ax, handles, [kelvin(course.temperature_k) for course in courses])
    return ax


def _frame(ax: Axes, most: float, *, log: bool) -> None:
    """Set the scales; `most` is the largest concentration."""
    from matplotlib.ticker import FuncFormatter

    heading(ax, "x", "$t$", "s")
    log_axis(ax, "x")
    if log:
        heading(ax, "y", "$c$", "mol L⁻¹")
        log_axis(ax, "y")
        if most > 0.0:
            ax.set_ylim(most * LEAST, most * 3.0)
        return
    exponent = math.floor(math.log10(most)) if most > 0.0 else 0
    if -2 <= exponent <= 2:
        exponent = 0
    heading(ax, "y", "$c$", (f"{power_of_ten(exponent)} " if exponent else "") + "mol L⁻¹")
    shown = FuncFormatter(
        lambda value, _: f"{value / 10.0**exponent:.10g}".replace("-", "\N{MINUS SIGN}")
    )
    ax.yaxis.set_major_formatter(shown)
