"""The answers of one set of energies: rate, Arrhenius energy, what controls, what rests, what is made."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.controls import sensitivity
from thermo_pp.kinetics.doubt.results import Answer
from thermo_pp.kinetics.edges import LogRate
from thermo_pp.kinetics.model import Rates
from thermo_pp.kinetics.net_reaction import write_side
from thermo_pp.kinetics.point import is_linear, rate_of
from thermo_pp.kinetics.products import formation
from thermo_pp.names import Definition

FloatArray = NDArray[np.float64]
Numbers = NDArray[np.intp]


@dataclass(frozen=True, eq=False)
class Found:
    """What one definition says of a batch of b; names stand once, numbers point at them.

    Attributes
    ----------
    rate : LogRate
    control : dict of str to shape (b,)
        Saddles first, then species.
    saddles : tuple of str
    controlling : shape (b,)
        Number of the saddle with the largest control.
    states : tuple of str or None
    resting : shape (b,) or None
        Number of the state with the largest population.
    products : tuple of str or None
        Where several compete.
    branching : shape (b, k) or None
    unit : str
        Of the rate.
    """

    rate: LogRate
    control: dict[str, FloatArray]
    saddles: tuple[str, ...]
    controlling: Numbers
    states: tuple[str, ...] | None
    resting: Numbers | None
    products: tuple[str, ...] | None
    branching: FloatArray | None
    unit: str = "s^-1"


def find(rates: Rates, definition: Definition, *, each: bool = True) -> Found:
    """Return what one definition says; nan where a point is not reached, unless `each` has to."""
    if definition == "point" or not is_linear(rates):
        return _find_at_point(rates, definition, each)
    rate = rates.rate(definition)
    sensed = sensitivity(rate, rates.network, rates.steps.names)
    by_saddle = np.stack([sensed.control[name] for name in sensed.saddles])
    states = resting = products = branching = None
    if definition == "pool":
        states, resting = _resting(rates, rates.pool.members, rates.pool.populations)
    elif definition == "cycle":
        _, members, shares = rates.cycle
        states, resting = _resting(rates, members, shares)
    if definition in ("free", "pool") and len(rates.products) > 1:
        ends = [rates.network.states[k] for k in rates.products]
        products = tuple(write_side([(name, float(count)) for name, count in end]) for end in ends)
        if definition == "pool":
            branching = rates.pool.branching
        else:
            driven = rates.model.conditions.driven
            branching = formation(
                rates.network, rates.start, rates.products, rates.amounts(), driven
            )
    return Found(
        rate=rate,
        control=sensed.control,
        saddles=sensed.saddles,
        controlling=np.argmax(by_saddle, axis=0),
        states=states,
        resting=resting,
        products=products,
        branching=branching,
    )


def _find_at_point(rates: Rates, definition: Definition, each: bool) -> Found:
    """Return what a network that need not be linear says."""
    at = rate_of(rates, definition, each=each)
    none = np.zeros((len(at.log), 0))
    return Found(
        rate=LogRate(at.log, at.sign, none, none, at.energy_j_mol),
        control=dict(at.control),
        saddles=at.saddles,
        controlling=np.argmax(np.stack([at.control[name] for name in at.saddles]), axis=0),
        states=at.states or None,
        resting=at.resting if at.populations else None,
        products=None,
        branching=None,
        unit=at.unit,
    )


def answer(rates: Rates, definition: Definition) -> Answer:
    """Return the answer in one definition over the temperatures of `rates`."""
    return answer_of(find(rates, definition))


def answer_of(found: Found) -> Answer:
    """Return the answer from what a definition says."""
    preferred = None if found.branching is None else np.argmax(found.branching, axis=1)
    return Answer(
        log_rate=found.rate.log,
        arrhenius_energy_kj_mol=found.rate.energy_j_mol / 1000.0,
        controlling_saddle=tuple(found.saddles[int(k)] for k in found.controlling),
        resting_state=_named(found.states, found.resting),
        preferred_product=_named(found.products, preferred),
    )


def _resting(
    rates: Rates, members: Sequence[int], populations: FloatArray
) -> tuple[tuple[str, ...], Numbers]:
    names = tuple(rates.network.states[k][0][0] for k in members)
    return names, np.argmax(populations, axis=1)


def _named(names: tuple[str, ...] | None, numbers: Numbers | None) -> tuple[str, ...] | None:
    return None if names is None or numbers is None else tuple(names[int(k)] for k in numbers)
