"""The linear network: states that are not held, the steps between them, and the surroundings they exchange with."""

from __future__ import annotations

from collections import deque
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from fractions import Fraction
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import Conditions, Held
from thermo_pp.errors import StudyError
from thermo_pp.formulas.rates import log_frequency_factor
from thermo_pp.kinetics.elimination import fill_saving_order
from thermo_pp.kinetics.scaled import Scaled
from thermo_pp.kinetics.steps import ElementaryRates, Energetics, log_concentration
from thermo_pp.loops import Loop
from thermo_pp.mechanism import Mechanism, Step
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]
ExtendedArray = NDArray[np.longdouble]
CLOSED_WITHIN = 0.01
"""Largest affinity over RT of a closed loop of held species that still counts as balanced."""
End = tuple[tuple[str, int], ...]
"""What a step ends in: species that are not held, with their counts."""


class NotLinear(StudyError):
    """The network is not linear: no constant alone describes it."""


@dataclass(frozen=True)
class Edge:
    """One step between two states of the network.

    Attributes
    ----------
    step : int
        0-based number of the mechanism's step.
    tail, head : int
        Numbers of the states.
    """

    step: int
    tail: int
    head: int


@dataclass(frozen=True, eq=False)
class Network:
    """A linear network over temperature, b temperatures, m edges, s = states and held species.

    Attributes
    ----------
    temperature_k : shape (b,)
    states : tuple of End
        A single species with count 1, but for ends that several molecules leave to.
    species : tuple of str
        The columns of the count matrices: species of single states, then species held at a stated
        amount.
    held : tuple of str
        The held ones among them.
    edges : tuple of Edge
    log_forward, log_reverse : shape (b, m), extended precision
        ln of the pseudo-first-order constants; -inf where there is no way.
    energy_forward, energy_reverse : shape (b, m)
        R T^2 d/dT of them, J/mol.
    counts_forward, counts_reverse : shape (m, s)
        d ln k/d(mu/RT) of each species.
    potential : shape (b, s), extended precision
        mu/RT: of held species at their concentration, of states at 1 mol/L.
    slope_j_mol : shape (b, s)
        -R T^2 d(mu/RT)/dT.
    exchange : shape (m, h)
        Held species taken up (negative) or given off (positive) along each edge.
    product_change : shape (m,)
        Product given off along each edge by species that are no state (catalytic cycles), all
        products together.
    equilibrium : mapping of str to mapping of str to Fraction
        Species held at equilibrium, as sums of species held at stated amounts.
    absent : tuple of str
        Products of a catalytic cycle that are not held: there is none of them.
    absent_change : shape (m, a)
        How much of each is given off along each edge.
    numbers : type
        What rates are worked out in: `Scaled`, or `Ordinary` where speed counts.
    """

    temperature_k: FloatArray
    states: tuple[End, ...]
    species: tuple[str, ...]
    held: tuple[str, ...]
    edges: tuple[Edge, ...]
    log_forward: ExtendedArray
    log_reverse: ExtendedArray
    energy_forward: FloatArray
    energy_reverse: FloatArray
    counts_forward: FloatArray
    counts_reverse: FloatArray
    potential: ExtendedArray
    slope_j_mol: FloatArray
    exchange: FloatArray
    product_change: FloatArray
    equilibrium: Mapping[str, Mapping[str, Fraction]]
    absent: tuple[str, ...] = ()
    absent_change: FloatArray = field(default_factory=lambda: np.zeros((0, 0)))
    numbers: type[Scaled] = Scaled

    def state(self, name: str) -> int:
        """Return the number of the state that is one molecule of `name`."""
        return self.states.index(((name, 1),))

    @cached_property
    def scaled(self) -> tuple[Scaled, Scaled]:
        """The constants of all edges, forward and reverse, shape (b, m)."""
        kind = self.numbers
        return kind.from_log(self.log_forward), kind.from_log(self.log_reverse)

    @cached_property
    def exists(self) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
        """Whether there is a way along each edge, forward and reverse, shape (m,)."""
        forward = np.all(np.isfinite(self.log_forward), axis=0)
        return np.asarray(forward), np.asarray(np.all(np.isfinite(self.log_reverse), axis=0))

    @cached_property
    def neighbours(self) -> dict[int, list[int]]:
        """State -> states that it leads to."""
        near: dict[int, list[int]] = {k: [] for k in range(len(self.states))}
        forward, reverse = self.exists
        for number, edge in enumerate(self.edges):
            if forward[number]:
                near[edge.tail].append(edge.head)
            if reverse[number]:
                near[edge.head].append(edge.tail)
        return near

    def reached(self, start: int, absorbing: frozenset[int] = frozenset()) -> list[int]:
        """Return the states that `start` reaches, itself first, without passing through `absorbing` ones."""
        near = self.neighbours
        order, seen, queue = [], {start}, deque([start])
        while queue:
            here = queue.popleft()
            order.append(here)
            if here in absorbing:
                continue
            for there in near[here]:
                if there not in seen:
                    seen.add(there)
                    queue.append(there)
        return order

    def members(self, start: int, absorbing: Sequence[int]) -> list[int]:
        """Return the states that `start` reaches, `absorbing` ones left out, in an order that eliminates cheaply."""
        inside = [k for k in self.reached(start, frozenset(absorbing)) if k not in absorbing]
        among = {k: set(self.neighbours[k]).intersection(inside) for k in inside}
        return fill_saving_order(among, start)

    @cached_property
    def off(self) -> FloatArray:
        """What each edge gives off: held species, then products that are absent, then all products; (m, h + a + 1)."""
        absent = self.absent_change if self.absent else np.zeros((len(self.edges), 0))
        return np.column_stack([self.exchange, absent, self.product_change])

    def given_off_from(self, start: int) -> dict[int, FloatArray]:
        """Return for each state that `start` reaches what was given off on the way, in the columns of `off`."""
        found = {start: np.zeros(self.off.shape[1])}
        queue = deque([start])
        both: dict[int, list[tuple[int, FloatArray]]] = {k: [] for k in self.reached(start)}
        for edge, off in zip(self.edges, self.off, strict=True):
            if edge.tail in both and edge.head in both:
                both[edge.tail].append((edge.head, off))
                both[edge.head].append((edge.tail, -off))
        while queue:
            here = queue.popleft()
            for there, off in both[here]:
                if there not in found:
                    found[there] = found[here] + off
                    queue.append(there)
        return found

    def exchanged_from(self, start: int) -> dict[int, FloatArray]:
        """Return for each state how much of the held species was given off on a way from `start` to it."""
        h = len(self.held)
        return {state: off[:h] for state, off in self.given_off_from(start).items()}

    def affinity(self, given: FloatArray) -> ExtendedArray:
        """Return the affinity over RT of giving off `given` held species, shape (b,)."""
        columns = [self.species.index(name) for name in self.held]
        return np.asarray(-(self.potential[:, columns] * given.astype(np.longdouble)).sum(axis=1))


def linear_network(
    mechanism: Mechanism,
    conditions: Conditions,
    energies: Energetics,
    rates: ElementaryRates,
    equilibrium: Mapping[str, Mapping[str, Fraction]],
) -> Network:
    """Return the linear network of a mechanism under its conditions.

    Parameters
    ----------
    mechanism : Mechanism
    conditions : Conditions
    energies : Energetics
    rates : ElementaryRates
    equilibrium : mapping
        Species held at equilibrium, as sums of species held at stated amounts.

    Raises
    ------
    StudyError
        The network is not linear.
    """
    held_at = conditions.held
    questioned = {mechanism.reactant, *mechanism.products} if not mechanism.catalyst else set()
    stated = tuple(
        name for name in held_at if held_at[name].form != "equilibrium" and name not in questioned
    )
    sides = []
    for step in mechanism.steps:
        ends = tuple(
            _end(step, side, where, mechanism, held_at, questioned)
            for side, where in ((step.reactants, "left"), (step.products, "right"))
        )
        sides.append(ends)
    states: dict[End, int] = {}
    edges: list[Edge] = []
    for number, (left, right) in enumerate(sides):
        if not left and not right:
            continue
        step = mechanism.steps[number]
        if not left or not right:
            side = "left" if not left else "right"
            raise NotLinear(
                f"the network is not linear: every species on the {side} of {step.equation!r} is held, "
                "but not on the other side",
                where=step.where,
                mend=f'hold {_written(left or right)} too, at a concentration or at "equilibrium"',
            )
        for end in (left, right):
            states.setdefault(end, len(states))
        edges.append(Edge(number, states[left], states[right]))
    names = tuple(dict.fromkeys(name for end in states for name, _ in end))
    species = (*names, *(name for name in stated if name not in names))
    return _with_numbers(
        mechanism, conditions, energies, rates, tuple(states), species, stated, edges, equilibrium
    )


def _end(
    step: Step,
    side: Mapping[str, int],
    where: str,
    mechanism: Mechanism,
    held_at: Mapping[str, Held],
    questioned: set[str | None],
) -> End:
    """Return what stands on one side and is not held; StudyError where that makes the network non-linear."""
    order = mechanism.species
    loose = [
        (name, side[name])
        for name in sorted(side, key=order.index)
        if name not in held_at or name in questioned
    ]
    if mechanism.catalyst:
        loose = [(name, count) for name, count in loose if name not in mechanism.products]
    if not loose or (len(loose) == 1 and loose[0][1] == 1):
        return tuple(loose)
    if not mechanism.catalyst and all(name in mechanism.products for name, _ in loose):
        return tuple(loose)
    raise NotLinear(
        f"the network is not linear: {_written(tuple(loose))} stand on the {where} of "
        f"{step.equation!r} and none of them is held",
        where=step.where,
        mend='hold all but one of them ([conditions] held), at a concentration or at "equilibrium"',
    )


def _written(end: End) -> str:
    return " and ".join(name if count == 1 else f"{count} {name}" for name, count in end)


def _with_numbers(
    mechanism: Mechanism,
    conditions: Conditions,
    energies: Energetics,
    rates: ElementaryRates,
    states: tuple[End, ...],
    species: tuple[str, ...],
    stated: tuple[str, ...],
    edges: list[Edge],
    equilibrium: Mapping[str, Mapping[str, Fraction]],
) -> Network:
    t = energies.temperature_k
    rt = GAS_J_MOL_K * t
    potential = np.empty((len(t), len(species)), np.longdouble, order="F")
    slope = np.empty((len(t), len(species)), order="F")
    for column, name in enumerate(species):
        potential[:, column] = energies.reduced[:, energies.index(name)]
        slope[:, column] = energies.slope_j_mol[:, energies.index(name)]
        if name in stated:
            at = conditions.held[name]
            potential[:, column] += log_concentration(at, t)
            slope[:, column] -= rt * at.log_slope(t, conditions.seen)
    m = len(edges)
    counts = np.zeros((2, m, len(species)))
    exchange, product_change = np.zeros((m, len(stated))), np.zeros(m)
    absent = tuple(name for name in mechanism.products if mechanism.catalyst and name not in stated)
    absent_change = np.zeros((m, len(absent)))
    missing = np.zeros((2, m), np.bool_)
    for number, edge in enumerate(edges):
        step = mechanism.steps[edge.step]
        for sign, (way, side) in zip(
            (-1, 1), enumerate((step.reactants, step.products)), strict=True
        ):
            for name, count in side.items():
                for member, share in _stated_members(name, count, equilibrium):
                    if member in species:
                        counts[way, number, species.index(member)] += share
                    else:  # a product of a cycle that is not held: there is none of it
                        missing[way, number] = True
                    if member in stated:
                        exchange[number, stated.index(member)] += sign * share
                if mechanism.catalyst and name in mechanism.products:
                    product_change[number] += sign * count
                if name in absent:
                    absent_change[number, absent.index(name)] += sign * count
    steps = [edge.step for edge in edges]
    frequency = log_frequency_factor(t)[:, np.newaxis]
    saddle = rates.saddle_reduced[:, steps]
    saddle_slope = rates.saddle_slope_j_mol[:, steps]
    logs, slopes = [], []
    for way in (0, 1):
        log, energy = frequency - saddle, rt[:, np.newaxis] + saddle_slope
        for number, column in np.argwhere(counts[way]):  # a step has few of the species
            log[:, number] += counts[way, number, column] * potential[:, column]
            energy[:, number] -= counts[way, number, column] * slope[:, column]
        log[:, missing[way]] = -np.inf
        logs.append(log)
        slopes.append(energy)
    return Network(
        temperature_k=t,
        states=states,
        species=species,
        held=stated,
        edges=tuple(edges),
        log_forward=logs[0],
        log_reverse=logs[1],
        energy_forward=slopes[0],
        energy_reverse=slopes[1],
        counts_forward=counts[0],
        counts_reverse=counts[1],
        potential=potential,
        slope_j_mol=slope,
        exchange=exchange,
        product_change=product_change,
        equilibrium=equilibrium,
        absent=absent,
        absent_change=absent_change,
    )


def _stated_members(
    name: str, count: int, equilibrium: Mapping[str, Mapping[str, Fraction]]
) -> list[tuple[str, float]]:
    if name not in equilibrium:
        return [(name, float(count))]
    return [(member, float(share * count)) for member, share in equilibrium[name].items()]


def check_loops(network: Network, mechanism: Mechanism, loops: Sequence[Loop]) -> None:
    """Check that held species are in balance with each other.

    Parameters
    ----------
    network : Network
    mechanism : Mechanism
    loops : sequence of Loop
        Closed loops whose net reaction has held species only.

    Raises
    ------
    StudyError
        The affinity of a loop is not zero within 0.01 RT at some temperature.
    """
    for loop in loops:
        given = np.zeros(len(network.held))
        for name, count in loop.net:
            for member, share in _stated_members(name, count, network.equilibrium):
                given[network.held.index(member)] += share
        affinity = np.asarray(network.affinity(given), dtype=np.float64)
        worst = int(np.argmax(np.abs(affinity)))
        if abs(affinity[worst]) > CLOSED_WITHIN:
            steps = ", ".join(repr(mechanism.steps[k].equation) for k, _ in loop.steps)
            raise StudyError(
                f"held species are out of balance: {loop.net_reaction} (by the loop of {steps}) has "
                f"an affinity of {affinity[worst]:.4g} RT at {network.temperature_k[worst]:g} K, not 0",
                where=f"{mechanism.where} [conditions] held",
                mend='hold one of them at "equilibrium", mend its amount, or say driven = true',
            )
