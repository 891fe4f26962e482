"""Turnover of a catalyst whose states meet each other: dimers, ligands that come and go.

The balance of the catalyst is not linear then. It is solved from the total amount; the turnover
frequency is the net formation of the products per total catalyst, each state weighted by how much
catalyst it holds, and the order in the total catalyst is a result.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import StudyError
from thermo_pp.kinetics.controls import activation, standard_activation
from thermo_pp.kinetics.edges import LogRate
from thermo_pp.kinetics.extents import conserved
from thermo_pp.kinetics.mass_action import System, mass_action
from thermo_pp.kinetics.net_reaction import write_side
from thermo_pp.kinetics.point_rate import PointRate
from thermo_pp.kinetics.results import Rate, SignChange
from thermo_pp.kinetics.stationary import NoSteadyState, Steady, at_rest, rest, settle
from thermo_pp.kinetics.windows import crossings, sign_changes

if TYPE_CHECKING:
    from thermo_pp.kinetics.model import Model, Rates

FloatArray = NDArray[np.float64]
_SCAN = 17


@dataclass(frozen=True, eq=False)
class Turnover:
    """The catalyst at rest, b temperatures.

    Attributes
    ----------
    rate : Rate
    net_reaction : str
    reversibility : mapping of int to shape (b,)
        Of each step; nan where it carries nothing.
    """

    rate: Rate
    net_reaction: str
    reversibility: Mapping[int, FloatArray]


@dataclass(frozen=True, eq=False)
class Rested:
    """The catalyst at rest at one temperature."""

    system: System
    steady: Steady
    weights: FloatArray
    total: float
    steps: NDArray[np.intp]  # numbers of the mechanism's steps that are left in the system


def turnover(model: Model, rates: Rates) -> Turnover:
    """Return the turnover of the catalyst at the temperatures of `rates`.

    Raises
    ------
    StudyError
        No total is given, the product does not follow from the total, or nothing comes to rest.
    """
    t = rates.energies.temperature_k
    rested = rests(model, rates)
    found = turned(model, rested)
    log, sign, energy = found.log, found.sign, found.energy_j_mol
    control, orders = (
        found.control,
        {name: 0.0 - found.control[name] for name in rested[0].system.held},
    )
    log_rate = LogRate(log, sign, np.zeros((len(t), 0)), np.zeros((len(t), 0)), energy)
    states = {name: model.species[name].at(t[:1]).standard_state for name in orders}
    rate = Rate(
        definition="cycle",
        rate_constant=sign * np.exp(log),
        unit="s^-1",
        arrhenius_energy_kj_mol=energy / 1000.0,
        activation=activation(log_rate, t),
        standard_activation=standard_activation(log_rate, orders, t, model.conditions, states),
        sign_changes=_sign_changes(model, t),
        control=control,
        saddles=found.saddles,
        orders=orders,
        populations=found.populations,
        resting_state=tuple(found.states[int(k)] for k in found.resting),
        catalyst_order=np.array([one.steady.pushed[0] / one.steady.rate for one in rested]),
    )
    reversibility = _reversibility(rested, len(model.mechanism.steps))
    return Turnover(rate, _net(model, rested[-1]), reversibility)


def turned(model: Model, rested: Sequence[Rested]) -> PointRate:
    """Return the turnover of a catalyst at rest, its controls, and where the catalyst is."""
    relative = np.array([one.steady.response / one.steady.rate for one in rested])
    first = rested[0].system
    control = {name: relative[:, k] for k, name in enumerate(first.responses[:-1])}
    for name, how in model.conditions.held.items():
        if how.form == "equilibrium":
            control.setdefault(name, np.zeros(len(rested)))
    populations = {
        name: np.array([one.weights[k] * one.steady.concentration[k] / one.total for one in rested])
        for k, name in enumerate(first.names)
        if rested[0].weights[k] > 0.0
    }
    return PointRate(
        log=np.array([np.log(abs(one.steady.rate) / one.total) for one in rested]),
        sign=np.array([np.sign(one.steady.rate) for one in rested]),
        energy_j_mol=relative[:, -1],
        control=control,
        saddles=first.saddles,
        unit="s^-1",
        populations=populations,
    )


def rests(model: Model, rates: Rates) -> list[Rested]:
    """Return the catalyst at rest at each temperature."""
    mechanism, conditions = model.mechanism, model.conditions
    where = f"{mechanism.where} [conditions] total"
    catalyst = mechanism.catalyst
    if catalyst is None or catalyst not in conditions.total:
        raise StudyError(
            f"the states of the catalyst {catalyst} meet each other, so its turnover depends on how "
            "much of it there is",
            where=where,
            mend=f'give its total: total = {{ {catalyst} = "1e-3 mol/L" }}',
        )
    absent = tuple(name for name in mechanism.products if name not in conditions.held)
    found: list[Rested] = []
    at_each = mass_action(
        mechanism, conditions, rates.energies, rates.steps, rates.equilibrium, absent
    )
    for t, whole in zip(rates.energies.temperature_k, at_each, strict=True):
        start = np.zeros(len(whole.names))
        for name, how in conditions.total.items():
            start[whole.names.index(name)] = float(how.concentration_mol_l(t))
        there = whole.present(start)
        system, now = whole.only(there), start[there]
        own = np.where(np.array(system.names) == catalyst, now, 0.0)
        weights = _weights(system, now, own, where)
        at = _settled(system, now, found[-1] if found else None)
        if at is None:
            raise StudyError(
                f"the catalyst does not come to rest at {t:g} K",
                where=where,
                mend="hold what the cycle uses and makes, or follow it in time: [conditions] initial",
            )
        counted = np.array(
            [
                sum(step.change().get(name, 0) for name in mechanism.products)
                for step in mechanism.steps
            ],
            dtype=np.float64,
        )
        kept = ~np.any((whole.left + whole.right)[:, ~there] > 0.0, axis=1)
        pushes = (system.slopes(at) @ own)[:, np.newaxis]
        steady = at_rest(system, at, counted[kept], pushes)
        if steady.rate == 0.0:
            raise StudyError(
                "no way from the catalyst to the product: nothing turns over",
                where=f"{mechanism.where} [effective] product",
                mend="add the step that makes it, or hold what the cycle uses",
            )
        found.append(Rested(system, steady, weights, float(own.sum()), np.flatnonzero(kept)))
    return found


def _weights(system: System, now: FloatArray, own: FloatArray, where: str) -> FloatArray:
    """Return how much catalyst each species holds; none of what the other totals give."""
    laws = conserved(system.stoichiometry, now)
    given = np.flatnonzero(now > 0.0)
    # the combination of conserved sums that is 1 for the catalyst and 0 for the other totals
    share, _, rank, _ = np.linalg.lstsq(laws[:, given].T, (own[given] > 0.0) * 1.0, rcond=None)
    weights = np.asarray(share @ laws)
    missed = np.abs(weights[given] - (own[given] > 0.0)).max() > 1e-9
    if missed or rank < len(laws) or np.any(weights < -1e-9):
        raise StudyError(
            "how much catalyst each species holds does not follow from the steps",
            where=where,
            mend="give the total of everything that is bound to the catalyst and not held",
        )
    return np.where(np.abs(weights) < 1e-9, 0.0, weights)


def _settled(system: System, now: FloatArray, before: Rested | None) -> FloatArray | None:
    """Return the state at rest: near that of the temperature before, or by following it in time."""
    if before is not None and before.system.names == system.names:
        here = np.maximum(before.steady.concentration, 0.0)
        found = rest(system, here)
        if found is not None and np.all(found > 0.0):
            return found
    try:
        return settle(system, now)
    except NoSteadyState:
        return None


def _sign_changes(model: Model, temperature_k: FloatArray) -> tuple[SignChange, ...]:
    """Return where E_a changes its sign."""
    low, high = float(temperature_k.min()), float(temperature_k.max())
    if low == high:
        return ()

    def energies(t: FloatArray) -> FloatArray:
        rested = rests(model, model.at(t))
        return np.array([[one.steady.response[-1] / one.steady.rate] for one in rested])

    scan = 1.0 / np.linspace(1.0 / low, 1.0 / high, _SCAN)
    return sign_changes(crossings(energies, scan, energies(scan))[0])


def _reversibility(rested: list[Rested], steps: int) -> dict[int, FloatArray]:
    """Return the smaller over the larger one-way flux of each step."""
    found = {step: np.full(len(rested), np.nan) for step in range(steps)}
    for k, one in enumerate(rested):
        forward, reverse = one.system.fluxes(one.steady.concentration)
        for step, forth, back in zip(one.steps, forward, reverse, strict=True):
            found[int(step)][k] = min(forth, back) / max(forth, back)
    return found


def _net(model: Model, one: Rested) -> str:
    """Return what one turnover uses and makes, as it runs at the last temperature."""
    mechanism, system = model.mechanism, one.system
    changes = {}
    columns = {name: system.exchanged[:, k] for k, name in enumerate(system.held)}
    for name in mechanism.products:
        if name not in columns:
            made = [mechanism.steps[k].change().get(name, 0) for k in one.steps]
            columns[name] = np.array(made, dtype=np.float64)
    for name, counted in columns.items():
        share = at_rest(system, one.steady.concentration, counted).rate / one.steady.rate
        near = Fraction(share).limit_denominator(_WHOLE)
        changes[name] = float(near) if abs(share - near) < 1e-6 else share
    left = [(name, -count) for name, count in changes.items() if count < 0]
    right = [(name, count) for name, count in changes.items() if count > 0]
    return f"{write_side(left)} = {write_side(right)}"


_WHOLE = 12
