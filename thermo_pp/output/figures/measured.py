"""Measured against computed rate constants over 1/T, in the unit of the measurement."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from thermo_pp.measured.results import Comparison, CurveBeside
from thermo_pp.output.figures.inverse import (
    Form,
    Line,
    Points,
    axes_above,
    draw_exact,
    draw_line,
    draw_points,
    frame,
)
from thermo_pp.output.figures.key import key
from thermo_pp.output.figures.style import styled

if TYPE_CHECKING:
    from matplotlib.artist import Artist
    from matplotlib.axes import Axes
    from matplotlib.container import Container

FloatArray = NDArray[np.float64]
WITHIN = ", ± 1 sd"
"""After the name of what has a band or bars: all of them one standard deviation."""


@styled
def draw(ax: Axes, comparison: Comparison, number: int = 1, *, form: Form = "arrhenius") -> Axes:
    """Draw one curve of a comparison and what was measured beside it into an axes and return it.

    The computed curve, the points with their error bars and the fit of them that is straight on these
    axes, or the published expression where it holds. Bands and bars are one standard deviation:
    of the computed curve that which the energies' deviations make, of an expression and of a fit
    that of their parameters.

    Parameters
    ----------
    ax : Axes
    comparison : Comparison
    number : int
        Which of ``comparison.curves``, counted from 1.
    form : {"arrhenius", "eyring"}
        k or k/T on the logarithmic axis.

    Raises
    ------
    ValueError
        There is no such curve.
    """
    if not 1 <= number <= len(comparison.curves):
        raise ValueError(f"there is no curve {number}: the comparison has {len(comparison.curves)}")
    curve = comparison.curves[number - 1]
    exact = _line(
        f"computed ({curve.definition})", curve.temperature_k, curve.computed, curve.log_deviation
    )
    lines = _lines(curve, form)
    points = _points(comparison, curve)
    frame(ax, curve.unit, form, points, [exact, *lines])
    handles: list[Artist | Container] = [
        draw_exact(ax, exact, form),
        *(draw_line(ax, line, form, k, markers=False) for k, line in enumerate(lines)),
        *(draw_points(ax, some, form, k) for k, some in enumerate(points)),
    ]
    labels = [exact.label, *(one.label for one in lines), *(one.label for one in points)]
    key(ax, handles, labels)
    axes_above(ax, 0.0)
    return ax


def _line(
    label: str, temperature_k: FloatArray, k: FloatArray, log_deviation: FloatArray | None
) -> Line:
    if log_deviation is None:
        return Line(label, temperature_k, k)
    with np.errstate(over="ignore"):
        lower, upper = (k * np.exp(sign * log_deviation) for sign in (-1.0, 1.0))
    return Line(label + WITHIN, temperature_k, k, lower, upper)


def _lines(curve: CurveBeside, form: Form) -> list[Line]:
    """Return the published expression, or the fit of the points that is straight on these axes."""
    t = curve.temperature_k
    if curve.expression is not None and curve.measured is not None:
        source = curve.expression.source
        return [_line(source, t, curve.measured, curve.measured_log_deviation)]
    return [
        _line(f"{form.capitalize()} fit", t, fit.rate_constant, fit.log_deviation)
        for fit in curve.fits
        if fit.form == form
    ]


def _points(comparison: Comparison, curve: CurveBeside) -> list[Points]:
    """Return the measured points of a curve, those of each source together."""
    lines = set(curve.lines)
    own = [one.point for one in comparison.points if one.point.line in lines]
    found = []
    for source in dict.fromkeys(point.source for point in own):
        some = [point for point in own if point.source == source]
        sigma = [point.sigma for point in some if point.sigma is not None]
        known = len(sigma) == len(some)
        found.append(
            Points(
                source + (WITHIN if known else ""),
                np.array([point.temperature_k for point in some]),
                np.array([point.rate_constant for point in some]),
                np.array(sigma) if known else None,
            )
        )
    return found
