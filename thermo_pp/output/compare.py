"""The tables, CSV and JSON answer of ``compare``."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from thermo_pp.conditions import Treatment
from thermo_pp.measured.results import Comparison, CurveBeside, FitBeside
from thermo_pp.mechanism import write_sum
from thermo_pp.names import EnergyUnit
from thermo_pp.output.barrier_tables import SAFETY
from thermo_pp.output.json_text import answer
from thermo_pp.output.notes import ALL_DIGITS, kelvin, of_treatment, some, stamp, usual
from thermo_pp.output.tables import (
    Block,
    Cell,
    Column,
    Table,
    about_all,
    defined,
    energy_column,
    in_unit,
    unit_heading,
)

MOST_ROWS = 25
"""How many rows a table for people has at most."""


def keys(result: Comparison, treatment: Treatment) -> dict[str, Any]:
    """Return the JSON answer."""
    return answer(
        "compare",
        result.findings,
        treatment,
        measured=result.measurements.file,
        deviations=None
        if result.energy_doubt is None
        else {**vars(result.energy_doubt), "overridden": result.overridden},
        fits=[
            {
                "name": curve.name,
                "unit": curve.unit,
                "temperature_k": curve.temperature_k,
                **_fit(fit),
            }
            for curve in result.curves
            for fit in curve.fits
        ],
        points=[_point(one) for one in result.points],
        expressions=[_expression(one) for one in result.measurements.expressions],
        computed=[_curve(one) for one in result.curves],
        shifts={
            "states": [{**vars(one), "within": one.within} for one in result.states],
            "joint": None
            if result.joint is None
            else {
                **vars(result.joint),
                "reconciled": result.joint.reconciled,
                "within": result.joint.within,
            },
        },
        rivals=[vars(one) for one in result.rivals],
        words=" ".join(result.words),
    )


def _fit(fit: FitBeside) -> dict[str, Any]:
    found = dict(vars(fit))
    found["factors"] = {
        name: {"value": value, "deviation": deviation}
        for name, (value, deviation) in fit.factors.items()
    }
    return found


def _row(row: Any) -> dict[str, Any]:
    return {
        "line": row.line,
        "unit": row.unit.text,
        "definition": row.definition,
        "orders": row.orders,
        "amounts": {name: held.text for name, held in row.held.items()},
        "source": row.source,
    }


def _point(one: Any) -> dict[str, Any]:
    point = one.point
    return {
        **_row(point),
        "temperature_k": point.temperature_k,
        "rate_constant": point.rate_constant,
        "sigma": point.sigma,
        "computed": one.computed,
        "log_ratio": one.log_ratio,
        "computed_log_deviation": one.log_deviation,
    }


def _expression(row: Any) -> dict[str, Any]:
    names = (
        *("from_k", "to_k", "factor", "sigma_factor", "power", "sigma_power", "reference_k"),
        *("theta_k", "sigma_theta_k", "correlation"),
    )
    return {**_row(row), **{name: getattr(row, name) for name in names}}


def _curve(curve: CurveBeside) -> dict[str, Any]:
    left_out = ("fits", "expression", "unit_factor")
    return {name: value for name, value in vars(curve).items() if name not in left_out}


def wide(result: Comparison, treatment: Treatment, unit: EnergyUnit) -> list[Block]:
    """Return the tables for CSV: points, curves, fits over temperature, parameters, shifts, rivals."""
    constants = [
        ("standard state", treatment.standard_state.text),
        ("soft modes", treatment.low_modes),
    ]
    curves: list[list[Cell]] = [
        [curve.name, curve.definition, float(t), curve.unit, *_curve_cells(curve, k, unit)]
        for curve in result.curves
        for k, t in enumerate(curve.temperature_k)
    ]
    fits: list[list[Cell]] = [
        [curve.name, fit.form, float(t), curve.unit, *_fit_cells(fit, k, unit)]
        for curve in result.curves
        for fit in curve.fits
        for k, t in enumerate(curve.temperature_k)
    ]
    head = [Column("rows"), Column("definition"), Column("T", "K"), Column("unit")]
    fit_head = [Column("rows"), Column("form"), Column("T", "K"), Column("unit")]
    return [
        Table("points", _point_columns(people=False), _point_rows(result), constants=constants),
        Table("computed", [*head, *_curve_columns("k", unit)], curves),
        Table("fits", [*fit_head, *_fit_columns("k", unit)], fits),
        _parameters(result),
        _states(result, unit),
        _joint(result, unit),
        _rivals(result),
    ]


def tables(
    result: Comparison, treatment: Treatment, unit: EnergyUnit, levels: Sequence[str] = ()
) -> list[Block]:
    """Return the tables for people and the closing paragraph.

    Parameters
    ----------
    result : Comparison
    treatment : Treatment
    unit : str
        Of energies.
    levels : sequence of str
        The levels of theory in words.
    """
    blocks: list[Block] = []
    if result.points:
        rows = _point_rows(result)
        shown = some(len(rows), MOST_ROWS)
        notes = ["ratio: measured over computed, at the amounts of the row."]
        if len(shown) < len(rows):
            notes.append(f"{len(shown)} of {len(rows)} points.")
        blocks.append(
            Table("Measured points", _point_columns(people=True), [rows[k] for k in shown], notes)
        )
    for curve in result.curves:
        if curve.expression is not None:
            blocks.append(_beside(curve, unit))
    if any(curve.fits for curve in result.curves):
        blocks += [_parameters(result), _fits_at(result, treatment, unit)]
    if result.states:
        blocks.append(_states(result, unit))
    if result.joint is not None:
        blocks.append(_joint(result, unit))
    if result.rivals:
        blocks.append(_rivals(result))
    sources = dict.fromkeys(
        row.source for row in (*result.measurements.points, *result.measurements.expressions)
    )
    notes = [
        f"Measured: {'; '.join(sources)} ({result.measurements.file}).",
        *(of_treatment(treatment), *levels, stamp(), ALL_DIGITS),
    ]
    return [*about_all(blocks, notes), " ".join(result.words), SAFETY]


def _point_columns(*, people: bool) -> list[Column]:
    digits, few = (4, 2) if people else (None, None)
    return [
        *(Column("line"), Column("definition"), Column("T", "K"), Column("unit")),
        *(Column("k measured", digits=digits), Column("sd", digits=few)),
        *(Column("k computed", digits=digits), Column("ratio", general=4)),
        *(Column("sd of ln k computed", general=3), Column("source")),
    ]


def _point_rows(result: Comparison) -> list[list[Cell]]:
    rows: list[list[Cell]] = []
    for one in result.points:
        point = one.point
        rows.append(
            [
                *(point.line, point.definition, point.temperature_k, point.unit.text),
                *(point.rate_constant, point.sigma, one.computed),
                point.rate_constant / one.computed,
                *(one.log_deviation, point.source),
            ]
        )
    return rows


def _curve_columns(k: str, unit: EnergyUnit, heading: str = "") -> list[Column]:
    return [
        Column(f"{k} computed", heading, digits=4),
        Column("sd of ln k computed", general=3),
        Column(f"{k} measured", heading, digits=4),
        Column("sd of ln k measured", general=3),
        Column("ratio", general=4),
        energy_column("Eₐ computed", unit),
        energy_column("Eₐ measured", unit),
        energy_column("sd of Eₐ measured", unit),
    ]


def _curve_cells(curve: CurveBeside, k: int, unit: EnergyUnit) -> list[Cell]:
    measured = _at(curve.measured, k)
    return [
        *(defined(curve.computed[k]), _at(curve.log_deviation, k)),
        *(measured, _at(curve.measured_log_deviation, k)),
        None if measured is None else measured / float(curve.computed[k]),
        in_unit(curve.arrhenius_energy_kj_mol[k], unit),
        in_unit(_at(curve.measured_energy_kj_mol, k), unit),
        in_unit(_at(curve.measured_energy_deviation_kj_mol, k), unit),
    ]


def _beside(curve: CurveBeside, unit: EnergyUnit) -> Table:
    """Return an expression and the computed curve, over the study's temperatures."""
    columns = [Column("T", "K"), *_curve_columns("k", unit, unit_heading(curve.unit))]
    rows: list[list[Cell]] = [
        [float(curve.temperature_k[k]), *_curve_cells(curve, k, unit)]
        for k in some(len(curve.temperature_k), MOST_ROWS)
    ]
    notes = [f"Amounts: {_amounts(curve.amounts)}." if curve.amounts else "Nothing is held."]
    assert curve.expression is not None
    if curve.expression.orders:
        notes.append(f"The rate constant is multiplied with {write_sum(curve.expression.orders)}.")
    return Table(f"Computed ({curve.definition}) and measured: {curve.name}", columns, rows, notes)


def _amounts(amounts: Mapping[str, str]) -> str:
    return ", ".join(f"{name} {text}" for name, text in amounts.items())


def _parameters(result: Comparison) -> Table:
    columns = [
        *(Column("rows"), Column("form"), Column("parameter")),
        *(Column("value", general=7), Column("sd", general=3), Column("χ²", general=4)),
        *(Column("degrees of freedom"), Column("weighted")),
    ]
    rows: list[list[Cell]] = []
    for curve in result.curves:
        for fit in curve.fits:
            end: list[Cell] = [fit.chi_square, fit.degrees, "yes" if fit.weighted else "no"]
            start: list[Cell] = [curve.name, fit.form]
            for name, (value, deviation) in fit.factors.items():
                rows.append([*start, f"{name} / {curve.unit}", value, deviation, *end])
            for name, value, deviation in zip(fit.names, fit.values, fit.deviations, strict=True):
                if name not in {f"ln {factor}" for factor in fit.factors}:
                    rows.append([*start, name, float(value), float(deviation), *end])
    left_out = [
        f"{curve.name}: no {form} fit, {why}."
        for curve in result.curves
        for form, why in curve.not_fitted.items()
    ]
    notes = [
        "power: A (T/298.15 K)^n exp(-E/RT); series: 1/k = 1/k₁ + 1/k₂; parallel: k = k₁ + k₂.",
        *left_out,
    ]
    return Table("Fits", columns, rows, notes)


def _fit_columns(k: str, unit: EnergyUnit) -> list[Column]:
    return [
        *(Column(k, digits=4), Column("from", digits=4), Column("to", digits=4)),
        *(energy_column("Eₐ", unit), energy_column("sd of Eₐ", unit)),
    ]


def _fit_cells(fit: FitBeside, k: int, unit: EnergyUnit) -> list[Cell]:
    return [
        *(defined(fit.rate_constant[k]), defined(fit.band_low[k]), defined(fit.band_high[k])),
        in_unit(fit.arrhenius_energy_kj_mol[k], unit),
        in_unit(fit.energy_deviation_kj_mol[k], unit),
    ]


def _fits_at(result: Comparison, treatment: Treatment, unit: EnergyUnit) -> Table:
    """Return what the fits give at one temperature, with the computed curve beside them."""
    k = usual(result.curves[0].temperature_k)
    columns = [
        *(Column("rows"), Column("form"), Column("unit"), *_fit_columns("k", unit)),
        *(Column("k computed", digits=4), energy_column("Eₐ computed", unit)),
    ]
    rows: list[list[Cell]] = [
        [
            *(curve.name, fit.form, curve.unit, *_fit_cells(fit, k, unit)),
            *(
                defined(curve.computed[k]),
                in_unit(curve.arrhenius_energy_kj_mol[k], unit),
            ),
        ]
        for curve in result.curves
        for fit in curve.fits
    ]
    notes = [
        "from, to: 95 % confidence band of the fit.",
        f"dH and dS of the Eyring fit are against the standard state {treatment.standard_state.text}.",
    ]
    title = f"Fits at {kelvin(result.curves[0].temperature_k[k])}"
    return Table(title, columns, rows, notes)


def _states(result: Comparison, unit: EnergyUnit) -> Table:
    columns = [
        *(Column("State"), Column("control", decimals=3)),
        *(energy_column("shift on average", unit), Column("rms of ln k left", general=3)),
        *(energy_column("shift by errors", unit), energy_column("sd", unit)),
        *(Column("χ² left", general=4), energy_column("deviation", unit), Column("within")),
    ]
    rows: list[list[Cell]] = [
        [
            *(one.name, one.control, in_unit(one.mean_kj_mol, unit), one.mean_rms),
            *(in_unit(one.shift_kj_mol, unit), in_unit(one.sigma_kj_mol, unit), one.chi_square),
            in_unit(one.deviation_kj_mol, unit),
            None if one.within is None else ("yes" if one.within else "no"),
        ]
        for one in result.states
    ]
    notes = [
        "Each state moved alone. On average: every row counts by its ln k alone; by errors: with the "
        "measurements' errors. deviation: of this energy, as given; within: whether the shift on average is.",
    ]
    return Table("Shift that brings computed and measured together", columns, rows, notes)


def _joint(result: Comparison, unit: EnergyUnit) -> Table:
    columns = [Column("State"), energy_column("shift", unit), Column("over its sd", decimals=3)]
    joint = result.joint
    rows: list[list[Cell]] = []
    notes = []
    if joint is not None:
        rows = [
            [name, in_unit(shift, unit), joint.multiple[name]]
            for name, shift in joint.shift_kj_mol.items()
        ]
        notes = [
            f"χ² {joint.chi_square_before:.4g} before, {joint.chi_square:.4g} after, "
            f"{joint.observations} observations; {joint.length:.3g} standard deviations from no shift."
        ]
    return Table("Most probable shift of all energies together", columns, rows, notes)


def _rivals(result: Comparison) -> Table:
    columns = [
        *(Column("Study"), Column("title"), Column("ln likelihood", decimals=3)),
        *(Column("behind", decimals=3), Column("probability", decimals=4)),
        *(Column("χ² before", general=4), Column("χ² after", general=4)),
        Column("shift over its sd", general=3),
    ]
    rows: list[list[Cell]] = [
        [
            *(one.file, one.title, one.log_evidence, one.behind, one.share),
            *(one.chi_square_before, one.chi_square, one.length),
        ]
        for one in result.rivals
    ]
    notes = [
        "ln likelihood of the measurements, the energies' uncertainty integrated out; probability: among these "
        "studies, all equally likely before."
    ]
    return Table("Rival studies", columns, rows, notes)


def _at(values: Any, k: int) -> float | None:
    return None if values is None else defined(values[k])
