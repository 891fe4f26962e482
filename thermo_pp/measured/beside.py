"""What stands beside what: points and their computed rate constants, curves, expressions and fits."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import Held, StandardState
from thermo_pp.measured.fits import FORMS, Fit, NoFitError, fit
from thermo_pp.measured.observed import StudyLike, by_amounts, curve
from thermo_pp.measured.results import CurveBeside, EnergyDoubt, FitBeside, PointBeside
from thermo_pp.measured.rows import Expression, Point, Row

FloatArray = NDArray[np.float64]


def points_beside(
    study: StudyLike, points: Sequence[Point], doubt: EnergyDoubt | None
) -> list[PointBeside]:
    """Return every point with the computed rate constant beside it, in the order of the file."""
    found: dict[Point, PointBeside] = {}
    for group in by_amounts(points):
        t = np.array([point.temperature_k for point in group])
        beside = curve(study, group[0], group[0].held, t)
        slope = beside.at()
        spread = _spread(slope.by_energy, doubt)
        for k, point in enumerate(group):
            found[point] = PointBeside(
                point,
                float(np.exp(slope.log[k]) / point.unit.factor),
                point.log - float(slope.log[k]),
                None if spread is None else float(spread[k]),
            )
    return [found[point] for point in points]


def _spread(by_energy: FloatArray, doubt: EnergyDoubt | None) -> FloatArray | None:
    """Return the first-order standard deviation of ln k computed."""
    if doubt is None:
        return None
    return np.asarray(np.sqrt(np.einsum("ti,ij,tj->t", by_energy, doubt.covariance, by_energy)))


def point_curves(
    study: StudyLike, points: Sequence[Point], doubt: EnergyDoubt | None
) -> list[CurveBeside]:
    """Return a curve, with fits, for every set of points of one definition and order.

    Pseudo-first-order constants at different amounts are different sets; those of a higher order
    are one, because the amounts are divided out.
    """
    groups: dict[object, list[Point]] = {}
    for number, group in enumerate(by_amounts(points)):
        first = group[0]
        apart = number if first.unit.order == 1 else None
        key = (first.definition, first.unit, frozenset(first.orders.items()), apart)
        groups.setdefault(key, []).extend(group)
    return [curve_beside(study, group, doubt) for group in groups.values()]


def curve_beside(study: StudyLike, rows: Sequence[Row], doubt: EnergyDoubt | None) -> CurveBeside:
    """Return the computed curve over the study's temperatures beside rows that belong together."""
    first = rows[0]
    amounts = [dict(row.held) for row in rows]
    held: Mapping[str, Held] = amounts[0] if all(one == amounts[0] for one in amounts) else {}
    grid = np.array(study.conditions.temperature_k)
    beside = curve(study, first, held, grid)
    slope = beside.at()
    conditions = beside.rates.model.conditions
    common = CurveBeside(
        name="",
        lines=tuple(row.line for row in rows),
        definition=first.definition,
        unit=first.unit.text,
        unit_factor=first.unit.factor,
        range_k=(0.0, 0.0),
        amounts={n: one.text for n, one in conditions.held.items() if one.form != "equilibrium"},
        temperature_k=grid,
        computed=np.exp(slope.log - np.log(first.unit.factor)),
        arrhenius_energy_kj_mol=slope.energy_kj_mol,
        log_deviation=_spread(slope.by_energy, doubt),
        orders=beside.orders(),
    )
    if isinstance(first, Expression):
        return replace(
            common,
            name=f"expression, line {first.line}",
            range_k=(first.from_k, first.to_k),
            expression=first,
            measured=np.exp(first.log(grid) - np.log(first.unit.factor)),
            measured_log_deviation=first.log_deviation(grid),
            measured_energy_kj_mol=first.energy_kj_mol(grid),
            measured_energy_deviation_kj_mol=first.energy_deviation_kj_mol(grid),
        )
    points = [row for row in rows if isinstance(row, Point)]
    fits, left_out = _fits(points, study.treatment.standard_state, grid)
    t = [point.temperature_k for point in points]
    lines = common.lines
    name = (
        f"point, line {lines[0]}" if len(lines) == 1 else f"points, lines {min(lines)}-{max(lines)}"
    )
    return replace(common, name=name, range_k=(min(t), max(t)), fits=fits, not_fitted=left_out)


def _fits(
    points: Sequence[Point], state: StandardState, grid: FloatArray
) -> tuple[tuple[FitBeside, ...], dict[str, str]]:
    """Return the fits of points, and why forms were left out."""
    t = np.array([point.temperature_k for point in points])
    logs = np.array([point.log for point in points])
    unit = points[0].unit
    sigma = None
    if points[0].sigma is not None:
        sigma = np.array([(point.sigma or 0.0) / point.rate_constant for point in points])
    fits: list[FitBeside] = []
    left_out: dict[str, str] = {}
    for form in FORMS:
        try:
            found = fit(form, t, logs, sigma, unit.order, state)
        except NoFitError as error:
            left_out[form] = str(error)
        else:
            fits.append(_fit_beside(found, grid, np.log(unit.factor)))
    return tuple(fits), left_out


def _fit_beside(found: Fit, grid: FloatArray, log_unit: float) -> FitBeside:
    """Return a fit over the study's temperatures, in the unit of the file."""
    log, spread = found.log(grid)
    energy, energy_spread = found.energy_kj_mol(grid)
    factors = np.array([name.startswith("ln A") for name in found.names])
    values = found.values - np.where(factors, log_unit, 0.0)
    wide = found.band_factor() * spread
    return FitBeside(
        form=found.form,
        names=found.names,
        values=values,
        deviations=found.deviations,
        covariance=found.covariance,
        factors={
            name.removeprefix("ln "): (float(np.exp(value)), float(np.exp(value) * deviation))
            for name, value, deviation in zip(found.names, values, found.deviations, strict=True)
            if name.startswith("ln A")
        },
        weighted=found.weighted,
        chi_square=found.chi_square,
        degrees=found.degrees,
        chance=found.chance,
        residuals=found.residuals,
        rate_constant=np.exp(log - log_unit),
        band_low=np.exp(log - wide - log_unit),
        band_high=np.exp(log + wide - log_unit),
        log_deviation=spread,
        arrhenius_energy_kj_mol=energy,
        energy_deviation_kj_mol=energy_spread,
    )
