"""The net reaction whose extent the rates count, as a text."""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction

import numpy as np

from thermo_pp.kinetics.model import Rates


def net_reaction(rates: Rates) -> tuple[str, int]:
    """Return the net reaction as text, and the reactant's coefficient in it."""
    network = rates.network
    if rates.model.mechanism.catalyst is not None:
        return _turnovers(rates), 1
    away = network.exchanged_from(rates.start)
    reactions = []
    for state in rates.products:
        changes = dict.fromkeys(
            (name for name, _ in (*network.states[rates.start], *network.states[state])), 0.0
        )
        for name, count in network.states[rates.start]:
            changes[name] -= count
        for name, given in zip(network.held, away[state], strict=True):
            changes[name] = changes.get(name, 0.0) + given
        for name, count in network.states[state]:
            changes[name] += count
        reactions.append(_reaction(changes))
    return "; ".join(reactions), 1


def _turnovers(rates: Rates) -> str:
    """Return the net reactions of the catalyst's closed ways, one for each product."""
    network, products = rates.network, rates.model.mechanism.products
    reactions: list[str] = []
    shown: set[str] = set()
    runs = [np.concatenate([turn.given, turn.absent]) for turn in rates.turns]
    first = runs[0]
    # a way that only turns one product into another is shown after a run that makes it
    ways = [run for run, turn in zip(runs, rates.turns, strict=True) if turn.product]
    ways += [
        first + sign * run
        for run, turn in zip(runs, rates.turns, strict=True)
        for sign in (1, -1)
        if not turn.product
    ]
    for way in ways:
        changes = dict(zip((*network.held, *network.absent), way, strict=True))
        made = {name for name in products if changes[name] > 0}
        if made - shown:
            shown |= made
            reactions.append(_reaction(changes))
    return "; ".join(reactions)


def _reaction(changes: Mapping[str, float]) -> str:
    left = [(name, -count) for name, count in changes.items() if count < 0]
    right = [(name, count) for name, count in changes.items() if count > 0]
    return f"{write_side(left)} = {write_side(right)}"


def write_side(members: list[tuple[str, float]]) -> str:
    """Write one side of a reaction; counts that are no whole numbers as fractions."""
    texts = []
    for name, count in members:
        share = Fraction(count).limit_denominator(1000)
        texts.append(name if share == 1 else f"{share} {name}")
    return " + ".join(texts) or "nothing"
