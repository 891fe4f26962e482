"""The rate at a declared point of any network: at the start, at a conversion, at rest in a flow.

A network that is not linear has no rate constant of its own. A rate at a declared composition it has;
divided by the concentrations of a declared rate law it is an effective constant of that order. Its
derivatives are those of the point as a whole: at a conversion between runs from the same start,
compared where the same share of the reactant is lost; at rest the composition follows.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import StudyError
from thermo_pp.kinetics.controls import sensitivity
from thermo_pp.kinetics.courses import course_temperatures
from thermo_pp.kinetics.edges import LogRate
from thermo_pp.kinetics.equilibrium import balanced, equilibrium
from thermo_pp.kinetics.mass_action import TEMPERATURE, System
from thermo_pp.kinetics.network import NotLinear
from thermo_pp.kinetics.point_rate import PointRate
from thermo_pp.kinetics.radau import Unsolved, fastest_rate, integrate
from thermo_pp.kinetics.start import Start, starts
from thermo_pp.kinetics.stationary import NoSteadyState, at_rest, rest, settle
from thermo_pp.kinetics.steps import rate_unit
from thermo_pp.kinetics.transient import with_clock
from thermo_pp.kinetics.turnover import rests, turned
from thermo_pp.units import GAS_J_MOL_K

if TYPE_CHECKING:
    from thermo_pp.kinetics.model import Rates
    from thermo_pp.mechanism import Mechanism, RatePoint
    from thermo_pp.names import Definition

FloatArray = NDArray[np.float64]
FEWEST_SAMPLES = 200
STARTS, STEADY_STATES, COURSES = 200_000, 10_000, 600
"""How many starts, steady states and time courses one answer's samples may take: about a minute."""
_AT = 1e-12
"""Relative distance from the concentration that a conversion means."""
_WIDENINGS, _WIDER, _ROUNDS = 70, 8.0, 20
_Found = tuple[float, FloatArray, FloatArray, FloatArray]
"""Rate and its responses (p,), concentrations of the start's species (s,), their responses (s, p)."""


def is_linear(rates: Rates) -> bool:
    """Whether the network is linear, so that it has constants of its own."""
    try:
        _ = rates.network
    except NotLinear:
        return False
    return True


def definitions(rates: Rates) -> tuple[Definition, ...]:
    """Return the definitions of the rate that apply; a network that is not linear has a point at most."""
    if is_linear(rates):
        return rates.definitions()
    mechanism, conditions = rates.model.mechanism, rates.model.conditions
    if mechanism.catalyst is not None and conditions.total:
        return ("cycle",)
    return () if mechanism.point is None else ("point",)


def affordable(rates: Rates, samples: int) -> int:
    """Return how many of the samples a network is worked out for, at least `FEWEST_SAMPLES` of them."""
    if is_linear(rates):
        return samples
    point = rates.model.mechanism.point
    if point is None or point.conversion is None:
        most = STEADY_STATES
    else:
        most = STARTS if point.conversion == 0.0 else COURSES
    each = len(rates.energies.temperature_k)
    return min(samples, max(FEWEST_SAMPLES, most // each))


def temperatures(mechanism: Mechanism, temperature_k: Sequence[float]) -> FloatArray:
    """Return the temperatures at which many energies are tried: a few where each takes a time course."""
    point = mechanism.point
    if point is None or not point.conversion:
        return np.array(temperature_k)
    return np.array(course_temperatures(temperature_k))


def sensed(rates: Rates, definition: Definition) -> tuple[LogRate, Mapping[str, FloatArray]]:
    """Return a rate, linear or not, and its controls by name."""
    if definition == "point" or not is_linear(rates):
        at = rate_of(rates, definition)
        none = np.zeros((len(at.log), 0))
        return LogRate(at.log, at.sign, none, none, at.energy_j_mol), at.control
    rate = rates.rate(definition)
    return rate, sensitivity(rate, rates.network, rates.steps.names).control


def controls_of(
    rates: Rates, definition: Definition
) -> tuple[LogRate, FloatArray, dict[str, FloatArray]]:
    """Return a rate, linear or not, with the control of every step (b, n) and of every species."""
    names = rates.steps.names
    by_step = np.zeros((len(rates.energies.temperature_k), len(names)))
    if definition == "point" or not is_linear(rates):
        log_rate, control = sensed(rates, definition)
        for name in dict.fromkeys(names):  # a saddle of several steps counts once
            by_step[:, names.index(name)] = control[name]
        return log_rate, by_step, {n: x for n, x in control.items() if n not in names}
    rate, network = rates.rate(definition), rates.network
    for number, edge in enumerate(network.edges):
        by_step[:, edge.step] += rate.saddles[:, number]
    species = {name: 0.0 - rate.species[:, k] for k, name in enumerate(network.species)}
    return rate, by_step, species


class NotReached(StudyError):
    """The time course does not come to the point, or the flow not to rest."""


def rate_of(rates: Rates, definition: Definition, *, each: bool = True) -> PointRate:
    """Return the turnover of a catalyst that meets itself, or the rate at the declared point."""
    if definition == "cycle":
        return turned(rates.model, rests(rates.model, rates))
    return point_rate(rates, each=each)


def point_rate(rates: Rates, *, each: bool = True) -> PointRate:
    """Return the rate at the study's point, in mol/(L s), or over its rate law.

    Parameters
    ----------
    rates : Rates
    each : bool
        Whether each has to reach the point; if not, one that does not has nan for everything.

    Raises
    ------
    StudyError
        The study has not what the point needs, its law names what is not there, or the point is
        not reached.
    """
    mechanism, conditions = rates.model.mechanism, rates.model.conditions
    point, where = mechanism.point, f"{mechanism.where} [effective] at"
    assert point is not None
    assert mechanism.reactant is not None
    _check(rates, point, where)
    at_rest_of_flow = point.conversion is None
    begun = starts(mechanism, conditions, rates.energies, rates.steps, flowing=at_rest_of_flow)
    names, responses = begun[0].system.names, begun[0].system.responses
    logs, signs, relative = [], [], []
    last: dict[float, tuple[System, FloatArray]] = {}  # by temperature
    for start, t in zip(begun, rates.energies.temperature_k, strict=True):
        try:
            if point.conversion is None:
                found = _at_rest(start, mechanism.reactant, last, float(t), where)
            elif point.conversion == 0.0:
                found = _at_start(start, mechanism.reactant)
            else:
                found = _at_conversion(start, mechanism.reactant, point.conversion, float(t), where)
        except NotReached:
            if each:
                raise
            logs.append(np.nan)
            signs.append(1.0)
            relative.append(np.full(len(responses), np.nan))
            continue
        rate, response, there, moved = found
        if rate == 0.0:
            raise StudyError(
                f"nothing happens to {mechanism.reactant} at this point ({point.text}, {t:g} K)",
                where=where,
                mend="say what is there at the start, or ask for another point",
            )
        log, own = np.log(abs(rate)), response / rate
        for name, power in point.law.items():
            if name in names:
                k = names.index(name)
                log, own = log - power * np.log(there[k]), own - power * moved[k] / there[k]
            else:
                log = log - power * np.log(start.held_mol_l[name])
                own = own.copy()
                slope = float(conditions.held[name].log_slope(np.array([t]), conditions.seen)[0])
                own[-1] -= power * GAS_J_MOL_K * t * slope
        logs.append(log)
        signs.append(np.sign(rate))
        relative.append(own)
    by_response = np.array(relative)
    assert responses[-1] == TEMPERATURE
    control = {name: by_response[:, k] for k, name in enumerate(responses[:-1])}
    for name in rates.equilibrium:
        control.setdefault(name, np.zeros(len(logs)))
    return PointRate(
        log=np.array(logs),
        sign=np.array(signs),
        energy_j_mol=by_response[:, -1],
        control=control,
        saddles=begun[0].system.saddles,
        unit=rate_unit(point.law) if point.law else "mol L^-1 s^-1",
    )


def _check(rates: Rates, point: RatePoint, where: str) -> None:
    """Refuse a point that the conditions say nothing of."""
    mechanism, conditions = rates.model.mechanism, rates.model.conditions
    if mechanism.reactant in conditions.held:
        raise StudyError(
            f"{mechanism.reactant} is held, so that there is no loss of it at a point",
            where=where,
            mend="name a reactant that is not held",
        )
    if point.conversion is None and conditions.flow is None:
        raise StudyError(
            "a steady state needs a flow",
            where=where,
            mend='add [conditions] flow = { residence_time = "10 s", feed = { A = "0.1 mol/L" } }',
        )
    if point.conversion is not None and mechanism.reactant not in conditions.initial:
        raise StudyError(
            f"nothing says how much of {mechanism.reactant} there is at the start",
            where=where,
            mend=f'add [conditions] initial = {{ {mechanism.reactant} = "0.1 mol/L" }}',
        )
    for name in point.law:
        if name in conditions.held and conditions.held[name].form == "equilibrium":
            raise StudyError(
                f'{name} is held at "equilibrium": what there is of it follows the energies',
                where=f"{mechanism.where} [effective] rate_law",
                mend="write the law with the species that it is in equilibrium with",
            )
        if (
            point.conversion == 0.0
            and name not in conditions.held
            and name not in conditions.initial
        ):
            raise StudyError(
                f"there is no {name} at the start to divide the rate by",
                where=f"{mechanism.where} [effective] rate_law",
                mend="take it out of the law, give it in [conditions] initial, or ask at a conversion",
            )


def _loss(system: System, reactant: str) -> FloatArray:
    """Return how much each step takes of the reactant; in- and outflow count for nothing."""
    counted = -system.stoichiometry[system.names.index(reactant)]
    counted[list(system.flowing)] = 0.0
    return np.asarray(counted)


def _at_start(start: Start, reactant: str) -> _Found:
    system, now = start.system, start.concentration
    counted = _loss(system, reactant)
    response = counted @ (system.respond(now) + system.slopes(now) @ start.response)
    return float(counted @ system.net(now)), response, now, start.response


def _at_rest(
    start: Start,
    reactant: str,
    last: dict[float, tuple[System, FloatArray]],
    temperature_k: float,
    where: str,
) -> _Found:
    """Return the steady state of the flow, by way of the last one at this temperature."""
    there = start.system.present(start.concentration)
    system, now = start.system.only(there), start.concentration[there]
    found = None
    if temperature_k in last and last[temperature_k][0].names == system.names:
        found = _followed(*last[temperature_k], system)
    if found is None:
        try:
            found = settle(system, now)
        except NoSteadyState:
            raise NotReached(
                f"the flow does not come to rest at {temperature_k:g} K",
                where=where,
                mend="ask for a conversion of the time course instead",
            ) from None
    last[temperature_k] = system, found
    steady = at_rest(system, found, _loss(system, reactant))
    whole = np.zeros(len(there))
    moved = np.zeros((len(there), len(system.responses)))
    whole[there], moved[there] = found, steady.moved
    return steady.rate, steady.response, whole, moved


def _followed(before: System, at: FloatArray, system: System) -> FloatArray | None:
    """Return the steady state that one of other constants becomes, None where the way to it is lost."""
    done, width = 0.0, 1.0
    while width >= _LEAST_WAY:
        part = min(1.0, done + width)
        between = replace(
            system,
            log_forward=_mixed(before.log_forward, system.log_forward, part),
            log_reverse=_mixed(before.log_reverse, system.log_reverse, part),
        )
        found = rest(between, at)
        if found is None or np.any(found <= 0.0):
            width *= 0.5
            continue
        if part == 1.0:
            return found
        at, done = found, part
    return None


def _mixed(one: FloatArray, other: FloatArray, part: float) -> FloatArray:
    """Return a mean of logarithms; what is nothing in both is nothing."""
    mixed = other.copy()
    there = np.isfinite(other)
    mixed[there] = (1.0 - part) * one[there] + part * other[there]
    return mixed


_LEAST_WAY = 1.0 / 64.0


def _at_conversion(
    start: Start, reactant: str, conversion: float, temperature_k: float, where: str
) -> _Found:
    """Return the point of the time course at which this share of the reactant is lost."""
    there = start.system.present(start.concentration)
    plain, now = start.system.only(there), start.concentration[there]
    system, column = with_clock(plain), plain.names.index(reactant)
    response = np.column_stack([start.response[there], np.zeros(len(now))])
    aim = (1.0 - conversion) * now[column]
    aim_response = (1.0 - conversion) * response[column]
    not_reached = NotReached(
        f"the time course at {temperature_k:g} K does not come to a conversion of {100.0 * conversion:g} %",
        where=where,
        mend="ask for a smaller one",
    )
    if balanced(plain) and equilibrium(plain, now)[column] >= aim:
        raise not_reached
    width = 1.0 / max(fastest_rate(plain, now), 1e-300)
    passed = 0.0
    try:
        for _ in range(_WIDENINGS):
            run = integrate(system, now, np.array([width]), response=response)
            if run.concentration[0, column] <= aim:
                break
            # responses at the new start: the clock's too, which goes on from here
            now, response = run.concentration[0], run.response[0]
            passed += width
            width *= _WIDER
        else:
            raise not_reached
        low, high = 0.0, width
        for _ in range(_ROUNDS):
            off = run.concentration[0, column] - aim
            if abs(off) <= _AT * aim:
                break
            low, high = (run.time_s[0], high) if off > 0.0 else (low, run.time_s[0])
            guess = run.time_s[0] - off / run.slope[0, column]
            if not low < guess < high:
                guess = 0.5 * (low + high)
            run = integrate(system, now, np.array([guess]), response=response)
    except Unsolved as error:
        raise NotReached(
            f"the time course at {temperature_k:g} K cannot be followed beyond "
            f"{passed + error.time_s:.3g} s",
            where=where,
            mend="ask for a smaller conversion, or mend the energies of the steps",
        ) from None
    moved, slope, bent = run.response[0], run.slope[0], run.slope_response[0]
    clock = moved[column, -1]
    # between runs compared where the same share is lost, and not at the same time
    late = (aim_response - moved[column]) / clock
    same = moved + np.outer(moved[:, -1], late)
    speed = bent + np.outer(bent[:, -1] - slope, late)
    whole = np.zeros(len(there))
    same_whole = np.zeros((len(there), same.shape[1] - 1))
    whole[there], same_whole[there] = run.concentration[0], same[:, :-1]
    return -float(slope[column]), -speed[column, :-1], whole, same_whole
