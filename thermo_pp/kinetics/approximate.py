"""The approximations of a study's rates: values, ratios to the exact rate, and the windows in which they hold."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.approximations import (
    landscape,
    pre_equilibrium,
    span,
    span_of_cycle,
)
from thermo_pp.kinetics.closed import log_weights
from thermo_pp.kinetics.edges import LogRate
from thermo_pp.kinetics.free import per_free_reactant
from thermo_pp.kinetics.model import Rates
from thermo_pp.kinetics.pool import log_slowest
from thermo_pp.kinetics.results import Approximation
from thermo_pp.kinetics.windows import windows
from thermo_pp.names import Definition

FloatArray = NDArray[np.float64]
MOST_SINGLE = 12
"""Largest number of intermediates for which each is tried at steady state alone."""
_NO_PRODUCT = 1.0e6
"""Affinity over RT that stands for no product at all."""


def approximate(
    rates: Rates, wide: Rates, definitions: Sequence[Definition], scan_k: FloatArray
) -> dict[Definition, tuple[Approximation, ...]]:
    """Return the approximations of each definition.

    Parameters
    ----------
    rates, wide : Rates
        At the temperatures asked for, and at those of the scan.
    definitions : sequence of names
    scan_k : shape (n,)
    """
    answers: dict[Definition, tuple[Approximation, ...]] = {}
    for definition in definitions:
        here = _logs(rates, definition)
        if not here:
            answers[definition] = ()
            continue
        names = list(here)

        def curves(temperature_k: FloatArray, of: Definition = definition) -> FloatArray:
            return _ratios(rates.model.at(temperature_k), of)

        found = windows(curves, scan_k, _ratios(wide, definition))
        exact = rates.rate(definition)
        approximations = []
        for k, name in enumerate(names):
            log, saddle, state = here[name]
            approximations.append(
                Approximation(
                    name=name,
                    rate_constant=np.exp(log),
                    ratio=_ratio(log, exact),
                    windows=found[k],
                    determining_saddle=saddle,
                    determining_state=state,
                )
            )
        answers[definition] = tuple(approximations)
    return answers


_Logs = dict[str, tuple[FloatArray, tuple[str, ...] | None, tuple[str, ...] | None]]


def ratios(rates: Rates, definition: Definition) -> dict[str, FloatArray]:
    """Return the ratio of each approximation of one definition to the exact rate, shape (b,) each."""
    exact = rates.rate(definition)
    return {name: _ratio(entry[0], exact) for name, entry in _logs(rates, definition).items()}


def _ratios(rates: Rates, definition: Definition) -> FloatArray:
    return np.stack(list(ratios(rates, definition).values()), axis=1)


def _ratio(log: FloatArray, exact: LogRate) -> FloatArray:
    """Return the ratio to the exact rate, nan where that is 0."""
    with np.errstate(over="ignore", invalid="ignore"):
        return np.asarray(exact.sign * np.exp(log - exact.log))


def _logs(rates: Rates, definition: Definition) -> _Logs:
    """Return name -> ln of the approximate rate, its determining saddles and states."""
    if rates.model.conditions.driven or definition == "relaxation":
        return {}
    if definition == "cycle":
        return _cycle(rates)
    network = rates.network
    inside = rates.pool.members
    scene = landscape(network, inside, rates.products, log_weights(network, rates.start, inside))
    found: _Logs = {}
    before = pre_equilibrium(scene)
    whole_pool = definition == "pool"
    if before is not None:
        name = "pre-equilibrium, saturated" if whole_pool else "pre-equilibrium"
        found[name] = (before[1 if whole_pool else 0], None, None)
    if whole_pool and len(inside) > 1:
        if 2 < len(inside) <= MOST_SINGLE + 1:
            for state in inside[1:]:
                log = log_slowest(network, inside, rates.products, state)
                found[f"steady state of {network.states[state][0][0]}"] = (log, None, None)
        absent = [None] * len(rates.products)
        free, _ = per_free_reactant(network, rates.start, rates.products, absent)
        found["steady state of all intermediates"] = (free.log, None, None)
    reach = span(scene, whole_pool)
    found["energetic span"] = (
        reach.log_rate,
        tuple(rates.steps.names[network.edges[k].step] for k in reach.edges),
        tuple(network.states[k][0][0] for k in reach.states),
    )
    return found


def _cycle(rates: Rates) -> _Logs:
    if not rates.one_reaction:
        return {}
    network = rates.network
    _, inside, _ = rates.cycle
    turn = rates.turns[0]
    h = len(network.held)
    # what turns are counted by: the product, or what of it is absent
    counted = slice(h, -1) if turn.absent.any() else slice(-1, None)
    made = network.off[:, counted].sum(axis=1)
    away = network.given_off_from(rates.start)
    before = np.array([away[state][counted].sum() for state in inside])
    one_turn = turn.absent.sum() or turn.product
    log_weight = log_weights(network, rates.start, inside)
    affinity = np.asarray(network.affinity(turn.given), dtype=np.float64)
    if turn.absent.any():
        # none of the product stands for so little of it that the affinity is large; the weights of
        # states are on the same footing
        little = (affinity - _NO_PRODUCT) / one_turn
        log_weight = log_weight - little[:, np.newaxis] * before
        affinity = np.full(affinity.shape, _NO_PRODUCT)
    scene = landscape(network, inside, (), log_weight)
    reach = span_of_cycle(scene, before, made, affinity, one_turn)
    names = tuple(rates.steps.names[network.edges[k].step] for k in reach.edges)
    states = tuple(network.states[k][0][0] for k in reach.states)
    return {"energetic span": (reach.log_rate, names, states)}
