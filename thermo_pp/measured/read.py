"""Reading a measurement file (CSV): points and published expressions, each checked with its line."""

from __future__ import annotations

import os
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from thermo_pp.conditions import Held, held
from thermo_pp.errors import Finding, StudyError
from thermo_pp.measured.columns import AMOUNT, Cells, read_columns
from thermo_pp.measured.rows import Expression, Measurements, Point
from thermo_pp.measured.units import RateUnit, rate_unit
from thermo_pp.mechanism import parse_sum
from thermo_pp.names import ALL_DEFINITIONS
from thermo_pp.nearest import suggestion
from thermo_pp.units import GAS_J_MOL_K, convert

_KINDS = ("point", "expression")
_OF_POINTS = ("temperature", "k", "sigma")
_OF_EXPRESSIONS = (
    *("from", "to", "A", "sigma A", "n", "sigma n", "T0", "E", "sigma E", "correlation"),
)


def read_measurements(path: str | os.PathLike[str]) -> Measurements:
    """Read measured rate constants.

    Parameters
    ----------
    path : str or PathLike
        A CSV file; ``docs/cli.md`` (compare) describes its columns.

    Raises
    ------
    StudyError
        Whatever is wrong, with file and line.
    """
    file = os.fspath(path)
    points: list[Point] = []
    expressions: list[Expression] = []
    for cells in read_columns(Path(path), file):
        kind = cells.text("kind", f"write one of: {', '.join(_KINDS)}")
        if kind not in _KINDS:
            raise StudyError(
                f"unknown kind {kind!r}", where=cells.where, mend=suggestion(kind, _KINDS, "kinds")
            )
        strange = _OF_EXPRESSIONS if kind == "point" else _OF_POINTS
        for name in strange:
            if name in cells.values:
                raise StudyError(
                    f"a row of kind {kind!r} has {name!r}",
                    where=cells.where,
                    mend="leave the cell empty, or mend the kind: a published expression is not a set of points",
                )
        if kind == "point":
            points.append(_point(cells))
        else:
            expressions.append(_expression(cells))
    _all_or_none(points, file)
    return Measurements(file, tuple(points), tuple(expressions), _findings(points, expressions))


def _point(cells: Cells) -> Point:
    value = _positive(cells, "k", "a rate constant is above 0; leave out what was not measured")
    sigma = None
    if "sigma" in cells.values:
        sigma = _positive(
            cells, "sigma", "a standard deviation is above 0; leave it out if unknown"
        )
        sigma *= _ratio(cells, "sigma", "k")
    return Point(
        **_common(cells, "k"),
        temperature_k=_temperature(cells, "temperature"),
        rate_constant=value,
        sigma=sigma,
    )


def _expression(cells: Cells) -> Expression:
    low, high = _temperature(cells, "from"), _temperature(cells, "to")
    if not low < high:
        raise StudyError(
            f"the expression holds from {low:g} K to {high:g} K",
            where=cells.where,
            mend="give the temperatures that it was measured at: 'from' below 'to'",
        )
    power = cells.optional("n")
    if (power is None) != ("T0" not in cells.values):
        raise StudyError(
            "'n' and 'T0' go together: k = A (T/T0)^n exp(-E/RT)",
            where=cells.where,
            mend="give both or neither; T0 is 1 K where the source writes A T^n",
        )
    sigma_factor = None
    if "sigma A" in cells.values:
        sigma_factor = _positive(cells, "sigma A", "a standard deviation is above 0")
        sigma_factor *= _ratio(cells, "sigma A", "A")
    sigma_power = None
    if "sigma n" in cells.values:
        sigma_power = _positive(cells, "sigma n", "a standard deviation is above 0")
    sigma_theta = None
    if "sigma E" in cells.values:
        _positive(cells, "sigma E", "a standard deviation is above 0")
        sigma_theta = _theta(cells, "sigma E")
    if sigma_factor is None and (sigma_power is not None or sigma_theta is not None):
        raise StudyError(
            "the expression has an error of n or E but none of A",
            where=cells.where,
            mend="give 'sigma A' too: without it A would count as exactly known",
        )
    correlation = cells.optional("correlation")
    if correlation is not None and (sigma_theta is None or not -1.0 < correlation < 1.0):
        raise StudyError(
            f"correlation {correlation:g} of ln A and E",
            where=cells.where,
            mend="give a number between -1 and 1, beside 'sigma A' and 'sigma E'",
        )
    return Expression(
        **_common(cells, "A"),
        from_k=low,
        to_k=high,
        factor=_positive(cells, "A", "a pre-exponential factor is above 0"),
        sigma_factor=sigma_factor,
        power=0.0 if power is None else power,
        sigma_power=sigma_power,
        reference_k=1.0 if power is None else _temperature(cells, "T0"),
        theta_k=_theta(cells, "E"),
        sigma_theta_k=sigma_theta,
        correlation=correlation,
    )


def _common(cells: Cells, value: str) -> dict[str, Any]:
    """Return what points and expressions have in common; the unit is that of the column `value`."""
    definition = cells.text("definition", f"write one of: {', '.join(ALL_DEFINITIONS)}")
    if definition not in ALL_DEFINITIONS:
        mend = suggestion(definition, ALL_DEFINITIONS, "definitions")
        raise StudyError(f"unknown definition {definition!r}", where=cells.where, mend=mend)
    unit = rate_unit(cells.units[value], where=cells.where)
    return {
        "file": cells.file,
        "line": cells.line,
        "unit": unit,
        "definition": definition,
        "orders": _orders(cells, unit),
        "held": _held(cells),
        "source": cells.text("source", "say where the number comes from"),
    }


def _orders(cells: Cells, unit: RateUnit) -> dict[str, int]:
    """Return which held species the rate constant is multiplied with."""
    if "orders" not in cells.values:
        if unit.order == 1:
            return {}
        raise StudyError(
            f"a rate constant in {unit.text} is of order {unit.order - 1} in what is held, and the row does not "
            "say in what",
            where=cells.where,
            mend='name it in the column "orders": "W", "2 W" or "O2 + M"',
        )
    orders = parse_sum(cells.values["orders"], where=cells.where)
    if sum(orders.values()) != unit.order - 1:
        raise StudyError(
            f"orders {cells.values['orders']!r} add up to {sum(orders.values())}, but a rate constant in "
            f"{unit.text} is of order {unit.order - 1} in what is held (and 1 in the reactant)",
            where=cells.where,
            mend="mend the unit in the heading or the orders",
        )
    return orders


def _held(cells: Cells) -> dict[str, Held]:
    found = {}
    for name, cell in cells.values.items():
        match = AMOUNT.fullmatch(name)
        if match is not None:
            cells.number(name)
            found[match.group(1)] = held(
                f"{cell} {cells.units[name]}", where=f"{cells.where} {name}"
            )
    return found


def _positive(cells: Cells, name: str, mend: str) -> float:
    value = cells.number(name, f"a row of this kind needs it: {mend}")
    if value <= 0.0:
        raise StudyError(f"{name} is {value:g}, not above 0", where=cells.where, mend=mend)
    return value


def _temperature(cells: Cells, name: str) -> float:
    value = cells.number(name, "a row of this kind needs it")
    kelvin = convert(value, cells.units[name], "K", where=cells.where)
    if kelvin <= 0.0:
        what = f"{name} is {value:g} {cells.units[name]}, not above 0 K"
        raise StudyError(what, where=cells.where, mend="mend the temperature or its unit")
    return kelvin


def _theta(cells: Cells, name: str) -> float:
    """Return an energy over R, K; the heading's unit is K or one of energy."""
    value, unit = cells.number(name, "0 where the expression has no exponential"), cells.units[name]
    if unit == "K":
        return value
    return convert(value, unit, "kJ/mol", where=cells.where) * 1000.0 / GAS_J_MOL_K


def _ratio(cells: Cells, name: str, to: str) -> float:
    """Return the factor from the unit of one column of rate constants to that of another."""
    units: Mapping[str, str] = cells.units
    if units[name] == units[to]:
        return 1.0
    one, other = (rate_unit(units[key], where=cells.where) for key in (name, to))
    if one.order != other.order:
        raise StudyError(
            f"{name} is in {one.text}, {to} in {other.text}: these are of different orders",
            where=cells.where,
            mend="give both in units of the same dimension",
        )
    return one.factor / other.factor


def _all_or_none(points: list[Point], file: str) -> None:
    without = [point for point in points if point.sigma is None]
    if without and len(without) < len(points):
        raise StudyError(
            f"{len(without)} of {len(points)} points have no standard deviation",
            where=without[0].where,
            mend="give it for every point or for none: weights cannot be made up",
        )


def _findings(points: list[Point], expressions: list[Expression]) -> tuple[Finding, ...]:
    findings = []
    if points and points[0].sigma is None:
        findings.append(
            Finding(
                "no-uncertainty",
                "warning",
                points[0].file,
                None,
                "the points have no standard deviations: fits are not weighted, their errors come from the "
                "scatter, and no likelihood can be made of them",
                "give the column sigma",
            )
        )
    for one in expressions:
        if not one.uncertain:
            findings.append(
                Finding(
                    "no-uncertainty",
                    "warning",
                    one.file,
                    one.line,
                    "the expression has no errors of its parameters: it is drawn, but no likelihood can be made "
                    "of it",
                    "give 'sigma A' and 'sigma E'",
                )
            )
        elif len(one.uncertain) > 1 and one.correlation is None:
            findings.append(
                Finding(
                    "correlation-unknown",
                    "note",
                    one.file,
                    one.line,
                    "the errors of ln A and E are taken as independent, because no correlation is given; the "
                    "published rate constant itself is probably known better than they say",
                    "give the column correlation where the source has it",
                )
            )
    return tuple(findings)
