"""The measurements as observations of a model: which computed numbers they are to be set against.

An observation is linear in ln k of the computed curve: a point is ln k at its temperature; an
expression, which is no set of points, is what the curve has for those of its parameters that have
errors (the least-squares image of the curve, over the temperatures that it holds for, on the
expression's own form), and enters once, with the covariance of these parameters.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import Held
from thermo_pp.errors import StudyError
from thermo_pp.kinetics.asked import StudyLike as RatesOf
from thermo_pp.kinetics.controls import sensitivity
from thermo_pp.kinetics.doubt.uncertain import Uncertainty
from thermo_pp.kinetics.model import Model, Rates
from thermo_pp.kinetics.network import NotLinear
from thermo_pp.kinetics.point import definitions, is_linear, rate_of
from thermo_pp.kinetics.shifts import Slope, shifted, slope
from thermo_pp.measured.rows import Expression, Point, Row
from thermo_pp.mechanism import write_sum
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]
GRID = 15
"""At how many temperatures an expression is set against the computed curve."""


class StudyLike(RatesOf, Protocol):
    """What a comparison needs of a study."""

    @property
    def title(self) -> str: ...  # noqa: D102
    @property
    def uncertainty(self) -> Uncertainty | None: ...  # noqa: D102


@dataclass(frozen=True, eq=False)
class Curve:
    """A computed rate constant in the order of a measured one, b temperatures, s energies.

    Attributes
    ----------
    rates : Rates
    row : Row
        One that it stands beside: definition and orders.
    """

    rates: Rates
    row: Row

    def at(self, shift_kj_mol: FloatArray | None = None) -> Slope:
        """Return ln k in (mol/L)^(1-m) s^-1, its slopes, and E_a at constant amounts of that order.

        Raises
        ------
        StudyError
            The net reaction runs backwards, so no ln k is there.
        """
        rates = self.rates if shift_kj_mol is None else shifted(self.rates, shift_kj_mol)
        found = slope(rates, self.row.definition)
        t = rates.energies.temperature_k
        if np.any(found.sign < 0.0) or not np.isfinite(found.log).all():
            wrong = t[(found.sign < 0.0) | ~np.isfinite(found.log)]
            raise StudyError(
                f"the computed net reaction does not run forwards at {wrong[0]:g} K and the amounts of this row",
                where=self.row.where,
                mend="check the amounts held: a measured rate constant is above 0",
            )
        log, energy = found.log, found.energy_kj_mol
        if self.row.definition == "point":  # a constant of its own order by its law
            return replace(found, log=log, energy_kj_mol=energy)
        for name, order in self.row.orders.items():
            held = rates.model.conditions.held[name]
            log = log - order * np.log(held.concentration_mol_l(t))
            energy = energy - order * _amount_energy(held, t)
        return replace(found, log=log, energy_kj_mol=energy)

    def orders(self) -> dict[str, FloatArray]:
        """Return the computed orders in the held species."""
        rates = self.rates
        if not is_linear(rates):
            control = rate_of(rates, self.row.definition).control
            held = rates.model.conditions.held
            return {n: 0.0 - control[n] for n in held if held[n].form != "equilibrium"}
        rate = rates.rate(self.row.definition)
        return sensitivity(rate, rates.network, rates.steps.names).orders


def _amount_energy(held: Held, temperature_k: FloatArray) -> FloatArray:
    """Return R T^2 d ln c/dT of a held amount, kJ/mol."""
    return held.log_slope(temperature_k) * GAS_J_MOL_K * temperature_k / 1000.0


def curve(study: StudyLike, row: Row, held: Mapping[str, Held], temperature_k: FloatArray) -> Curve:
    """Return the computed curve for a row, with amounts in place of the study's.

    Raises
    ------
    StudyError
        A definition that does not apply, an amount or an order of something that the study does not
        hold at a stated amount, an order that the computed rate does not have, a network that is
        not linear.
    """
    stated = [name for name, one in study.conditions.held.items() if one.form != "equilibrium"]
    at_point = row.definition == "point"
    for name in held if at_point else (*held, *row.orders):
        if name not in stated:
            raise StudyError(
                f"{name!r} is not held at a stated amount by the study",
                where=row.where,
                mend=f"held at stated amounts are: {', '.join(stated) or 'none'} ([conditions] held)",
            )
    conditions = replace(study.conditions, held={**study.conditions.held, **held})
    model = Model(study.mechanism, conditions, study.treatment, study.species)
    rates = model.at(np.asarray(temperature_k, dtype=np.float64))
    known = definitions(rates)
    if is_linear(rates):
        rates.check()
    elif not known:
        raise StudyError(
            f"{_why(rates)}: no rate constant alone describes the study, so none can be set against this one",
            where=row.where,
            mend='say where its rate is asked for and over what: [effective] at = "start" and rate_law = '
            '{ A = 1, B = 1 }; the definition of the measured constant is "point" then',
        )
    if row.definition not in known:
        raise StudyError(
            f"the study has no rate of the definition {row.definition!r}",
            where=row.where,
            mend=f"use one of: {', '.join(known)}",
        )
    found = Curve(rates, row)
    if at_point:
        _check_law(study, row)
        return found
    computed = found.orders()
    for name, order in row.orders.items():
        worst = computed[name][np.argmax(np.abs(computed[name] - order))]
        if abs(worst - order) >= 0.5:
            raise StudyError(
                f"a rate constant in {row.unit.text} ({write_sum(row.orders)}) is of order {order} in {name}, the "
                f"computed rate of order {worst:.3g}: their dimensions differ",
                where=row.where,
                mend="give the pseudo-first-order constant (s^-1) with the amounts in columns [NAME] / UNIT, "
                "or mend the unit and the orders",
            )
    return found


def _why(rates: Rates) -> str:
    """Say why a network is not linear."""
    try:
        _ = rates.network
    except NotLinear as error:
        return error.what
    raise ValueError("the network is linear")


def _check_law(study: StudyLike, row: Row) -> None:
    """Refuse a constant that is not of the rate law that the study has for its point."""
    mechanism = study.mechanism
    assert mechanism.point is not None
    assert mechanism.reactant is not None
    law = dict(mechanism.point.law)
    measured = Counter({mechanism.reactant: 1}) + Counter(row.orders)
    if not law:
        raise StudyError(
            f"the study asks for the rate itself at its point, in mol/(L s), and a rate constant in "
            f"{row.unit.text} cannot be set against that",
            where=row.where,
            mend=f"say what the rate is over: [effective] rate_law = {_as_table(measured)}",
        )
    if law != dict(measured):
        raise StudyError(
            f"a rate constant in {row.unit.text} over {write_sum(measured)} is of another order than the "
            f"study's rate law, which is over {write_sum(law)}: their dimensions or meanings differ",
            where=row.where,
            mend='mend the unit, the column "orders" (what stands beside the reactant), or [effective] rate_law',
        )


def _as_table(counts: Mapping[str, int]) -> str:
    return f"{{ {', '.join(f'{name} = {count}' for name, count in counts.items())} }}"


@dataclass(frozen=True, eq=False)
class Block:
    """Rows that one curve stands beside, p observations of b temperatures.

    Attributes
    ----------
    curve : Curve
    image : shape (p, b)
        What the observations are of ln k.
    measured : shape (p,)
    covariance : shape (p, p)
    """

    curve: Curve
    image: FloatArray
    measured: FloatArray
    covariance: FloatArray


@dataclass(frozen=True, eq=False)
class Observed:
    """All observations of a study, p in all; s energies.

    Attributes
    ----------
    names : tuple of str
        Of the energies, species and saddle points.
    blocks : tuple of Block
    measured : shape (p,)
    covariance : shape (p, p)
        Of the measurements; blocks are independent of each other.
    """

    names: tuple[str, ...]
    blocks: tuple[Block, ...]
    measured: FloatArray
    covariance: FloatArray

    def computed(self, shift_kj_mol: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return the computed observations and their slopes by the energies, shapes (p,) and (p, s)."""
        values, slopes = [], []
        for block in self.blocks:
            found = block.curve.at(shift_kj_mol)
            values.append(block.image @ found.log)
            slopes.append(block.image @ found.by_energy)
        return np.concatenate(values), np.concatenate(slopes)


def observe(
    study: StudyLike,
    points: Sequence[Point],
    expressions: Sequence[Expression],
    *,
    weighted: bool,
) -> Observed:
    """Return the observations.

    Parameters
    ----------
    study : StudyLike
    points, expressions : sequences of rows
    weighted : bool
        With their errors: those without any are left out. If not, every row counts by ln k alone,
        an expression at `GRID` temperatures as one point each of weight 1/`GRID`.
    """
    from scipy.linalg import block_diag

    blocks: list[Block] = []
    for group in by_amounts(points):
        used = [point for point in group if point.sigma is not None or not weighted]
        if not used:
            continue
        t = np.array([point.temperature_k for point in used])
        relative = np.array([(point.sigma or 0.0) / point.rate_constant for point in used])
        covariance = np.diag(relative**2) if weighted else np.eye(len(used))
        logs = np.array([point.log for point in used])
        found = curve(study, used[0], used[0].held, t)
        blocks.append(Block(found, np.eye(len(used)), logs, covariance))
    for row in expressions:
        if weighted and not row.uncertain:
            continue
        t = 1.0 / np.linspace(1.0 / row.from_k, 1.0 / row.to_k, GRID)
        found = curve(study, row, row.held, t)
        if not weighted:
            blocks.append(Block(found, np.eye(GRID), row.log(t), GRID * np.eye(GRID)))
            continue
        basis, known = row.basis(t), [k for k in range(3) if k not in row.uncertain]
        image = np.asarray(np.linalg.pinv(basis[:, row.uncertain]), dtype=np.float64)
        exact = image @ (basis[:, known] @ row.parameters[known])
        measured = row.parameters[list(row.uncertain)] + exact
        blocks.append(Block(found, image, measured, row.covariance))
    return Observed(
        blocks[0].curve.rates.energies.names,
        tuple(blocks),
        np.concatenate([block.measured for block in blocks]),
        np.asarray(block_diag(*(block.covariance for block in blocks))),
    )


def by_amounts(points: Sequence[Point]) -> list[list[Point]]:
    """Return points in groups of one definition, unit, orders and amounts."""
    groups: dict[object, list[Point]] = {}
    for point in points:
        amounts = frozenset((name, one.form, one.value) for name, one in point.held.items())
        key = (point.definition, point.unit, frozenset(point.orders.items()), amounts)
        groups.setdefault(key, []).append(point)
    return list(groups.values())
