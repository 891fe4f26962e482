"""How products compete: their ratios over temperature, what controls them, and where Curtin-Hammett holds.

A ratio of rates is a difference of logarithms, and so are its temperature derivative and its
controls: R T^2 d ln(r1/r2)/dT = E_1 - E_2, X_s(r1/r2) = X_s(r1) - X_s(r2).

Curtin-Hammett: every state before the products stands in equilibrium with the others, and the ratio
is that of the saddle points that the products come off from, exp(-(G1 - G2)/RT), all of one product
taken together (Seeman, Chem. Rev. 1983, 83, 83, doi 10.1021/cr00054a001; cited from memory).
"""

from __future__ import annotations

from collections import deque
from collections.abc import Sequence
from dataclasses import replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding, StudyError
from thermo_pp.kinetics.asked import StudyLike
from thermo_pp.kinetics.controls import sensitivity
from thermo_pp.kinetics.cycle import Turn, per_cycle
from thermo_pp.kinetics.edges import LogRate
from thermo_pp.kinetics.model import Model, Rates
from thermo_pp.kinetics.net_reaction import write_side
from thermo_pp.kinetics.network import NotLinear
from thermo_pp.kinetics.product_ratio import (
    CurtinHammett,
    ProductRatio,
    Selectivity,
    SelectivityQuestion,
)
from thermo_pp.kinetics.products import product_rates
from thermo_pp.kinetics.results import EffectiveRate, Window
from thermo_pp.kinetics.selectivity_words import words
from thermo_pp.kinetics.windows import scan_temperatures, windows
from thermo_pp.nearest import suggestion
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]
CONTROLS_RATIO = 0.05
"""Smallest control of a ratio by a saddle that is looked at for being counted twice."""


def selectivity(
    study: StudyLike, effective: EffectiveRate, question: SelectivityQuestion | None = None
) -> Selectivity | None:
    """Return how the products compete; None where there is one, or no linear network, and nothing was asked.

    Parameters
    ----------
    study : StudyLike
    effective : EffectiveRate
        Of this study: how far its steps are from equilibrium.
    question : SelectivityQuestion or None
        None: all products, in the study's order.

    Raises
    ------
    StudyError
        A product that was asked for is none of the mechanism, or nothing leads to it alone.
    """
    from threadpoolctl import threadpool_limits

    mechanism = study.mechanism
    if question is None and len(mechanism.products) < 2:
        return None
    model = Model(mechanism, study.conditions, study.treatment, study.species)
    with threadpool_limits(1), np.errstate(over="ignore"):
        return _selectivity(model, effective, question)


def _selectivity(
    model: Model, effective: EffectiveRate, question: SelectivityQuestion | None
) -> Selectivity | None:
    grid = effective.temperature_k
    rates = model.at(grid)
    try:
        _ = rates.network
    except NotLinear:
        if question is None:
            return None
        raise
    scan = scan_temperatures(float(grid.min()), float(grid.max()))
    here, wide = _Competition(rates), _Competition(model.at(scan))
    chosen = here.chosen(question)
    if len(chosen) < 2:
        return None
    first, *others = chosen
    ratios = []
    for other in others:

        def curve(temperature_k: FloatArray, b: int = other) -> FloatArray:
            return _Competition(model.at(temperature_k)).over_exact(first, b)[:, np.newaxis]

        found = None
        if not model.conditions.driven:
            [where] = windows(curve, scan, wide.over_exact(first, other)[:, np.newaxis])
            found = here.curtin_hammett(first, other, where)
        ratios.append(here.ratio(first, other, found))
    logs = [here.rates[k] for k in chosen]
    answer = Selectivity(
        temperature_k=grid,
        kind="products" if question is None else question.kind,
        rates={
            here.names[k]: log.sign * np.exp(log.log) for k, log in zip(chosen, logs, strict=True)
        },
        ratios=tuple(ratios),
        findings=_findings(model, ratios, question),
    )
    return replace(answer, words=words(answer, effective))


class _Competition:
    """The rates of a model's products, at b temperatures."""

    def __init__(self, rates: Rates) -> None:
        self.model, self.network, self.steps = rates.model, rates.network, rates.steps
        network, mechanism = rates.network, rates.model.mechanism
        self.start = rates.start
        if mechanism.catalyst is not None:
            changes = {name: _made(rates, name) for name in mechanism.products}
            made = {name: change for name, change in changes.items() if change is not None}
            self.names, self.made = tuple(made), list(made.values())
            self.inside = tuple(network.reached(rates.start))
            self.rates = [_of_cycle(rates, change) for change in self.made]
            return
        self.names = tuple(
            write_side([(name, float(count)) for name, count in network.states[k]])
            for k in rates.products
        )
        self.made = [
            np.array([float(e.head == k) - float(e.tail == k) for e in network.edges])
            for k in rates.products
        ]
        away = frozenset(rates.products)
        self.inside = tuple(k for k in network.reached(rates.start, away) if k not in away)
        driven = rates.model.conditions.driven
        self.rates = product_rates(network, rates.start, rates.products, rates.amounts(), driven)

    def chosen(self, question: SelectivityQuestion | None) -> list[int]:
        """Return the numbers of the products to compare."""
        if question is None:
            return list(range(len(self.names)))
        found = []
        for name in question.products:
            if name not in self.names:
                raise StudyError(
                    f"nothing leads to {name!r} alone as a product",
                    where=question.where,
                    mend=suggestion(name, self.names, "products"),
                )
            found.append(self.names.index(name))
        return found

    def ratio(self, a: int, b: int, found: CurtinHammett | None) -> ProductRatio:
        """Return the ratio of two products and what controls it."""
        one, other = self.rates[a], self.rates[b]
        t = self.network.temperature_k
        sensed = [sensitivity(log, self.network, self.steps.names) for log in (one, other)]
        log_ratio = one.log - other.log
        backwards = one.sign * other.sign < 0.0
        enthalpy = one.energy_j_mol - other.energy_j_mol
        gibbs = np.where(backwards, np.nan, -GAS_J_MOL_K * t * log_ratio)
        top = np.maximum(one.log, other.log)
        with np.errstate(divide="ignore", invalid="ignore"):
            first, second = (x.sign * np.exp(x.log - top) for x in (one, other))
            excess = (first - second) / (first + second)
        return ProductRatio(
            product=self.names[a],
            other=self.names[b],
            ratio=one.sign * other.sign * np.exp(log_ratio),
            excess=excess,
            enthalpy_kj_mol=enthalpy / 1000.0,
            entropy_j_mol_k=(enthalpy - gibbs) / t,
            gibbs_kj_mol=gibbs / 1000.0,
            control={
                name: values - sensed[1].control[name] for name, values in sensed[0].control.items()
            },
            saddles=sensed[0].saddles,
            curtin_hammett=found,
        )

    def over_exact(self, a: int, b: int) -> FloatArray:
        """Return the ratio that Curtin-Hammett gives, over the exact one, shape (b,)."""
        one, other = self.rates[a], self.rates[b]
        log = self._barrier(a)[0] - self._barrier(b)[0] - (one.log - other.log)
        return np.asarray(one.sign * other.sign * np.exp(log))

    def curtin_hammett(self, a: int, b: int, where: tuple[Window, ...]) -> CurtinHammett:
        """Return what the saddle points before two products would give alone."""
        (one, first), (other, second) = self._barrier(a), self._barrier(b)
        return CurtinHammett(
            saddles_over=tuple(zip(first, second, strict=True)),
            ratio=np.exp(one - other),
            over_exact=self.over_exact(a, b),
            windows=where,
        )

    def _barrier(self, product: int) -> tuple[FloatArray, tuple[str, ...]]:
        """Return ln of the sum of exp(-G/RT) of the saddles before a product, and the lowest of them."""
        network = self.network
        weights = self._weights()
        logs, names = [], []
        for number, change in enumerate(self.made[product]):
            edge = network.edges[number]
            source, constants = edge.tail, network.log_forward
            if change < 0.0:
                source, constants = edge.head, network.log_reverse
            if change == 0.0 or source not in weights:
                continue
            logs.append(np.asarray(constants[:, number], dtype=np.float64) + weights[source])
            names.append(self.steps.names[edge.step])
        stacked = np.stack(logs)
        lowest = np.argmax(stacked, axis=0)
        return np.logaddexp.reduce(stacked), tuple(names[int(k)] for k in lowest)

    def _weights(self) -> dict[int, FloatArray]:
        """Return ln of the amount of each state in equilibrium with the start, along ways without products."""
        network = self.network
        held = [network.species.index(name) for name in network.held]
        anything = np.any(self.made, axis=0)
        near: dict[int, list[tuple[int, FloatArray]]] = {k: [] for k in self.inside}
        for number, edge in enumerate(network.edges):
            if not anything[number] and edge.tail in near and edge.head in near:
                near[edge.tail].append((edge.head, network.exchange[number]))
                near[edge.head].append((edge.tail, -network.exchange[number]))
        given = {self.start: np.zeros(len(held))}
        queue = deque([self.start])
        while queue:
            here = queue.popleft()
            for there, off in near[here]:
                if there not in given:
                    given[there] = given[here] + off
                    queue.append(there)

        def potential(state: int) -> Any:
            return network.potential[:, network.species.index(network.states[state][0][0])]

        return {
            state: np.asarray(
                potential(self.start)
                - potential(state)
                - network.potential[:, held] @ off.astype(np.longdouble),
                dtype=np.float64,
            )
            for state, off in given.items()
        }


def _made(rates: Rates, name: str) -> FloatArray | None:
    """Return how much of one product of a catalyst each edge gives off; None of one held at "equilibrium"."""
    network = rates.network
    if name in network.held:
        return network.exchange[:, network.held.index(name)]
    if name in network.absent:
        return network.absent_change[:, network.absent.index(name)]
    return None


def _of_cycle(rates: Rates, made: FloatArray) -> LogRate:
    """Return the net formation of one product over all of the catalyst."""
    turn = Turn(rates.turns[0].given, 1.0, rates.turns[0].absent)
    network = replace(rates.network, product_change=made)
    return per_cycle(network, rates.start, turn, endless=False, driven=True)[0]


def _findings(
    model: Model, ratios: Sequence[ProductRatio], question: SelectivityQuestion | None
) -> tuple[Finding, ...]:
    """Return mirror images that are species of their own and still count both hands."""
    if question is None or question.kind != "enantiomeric":
        return ()
    looked_at = dict.fromkeys(question.products)
    for one in ratios:
        for name in one.saddles:
            if np.any(np.abs(one.control[name]) > CONTROLS_RATIO) and name in model.species:
                looked_at[name] = None
    t = np.array(model.conditions.temperature_k[:1])
    twice = [name for name in looked_at if model.species[name].at(t).degeneracy == 2]
    if not twice:
        return ()
    return (
        Finding(
            "enantiomers-counted-twice",
            "warning",
            question.where.split(" ")[0],
            None,
            f"{', '.join(twice)}: mirror images are species of their own here, and each of these still "
            "counts both hands",
            "say enantiopure = true ([treatment]), so that every hand counts once; ratios "
            "stay as long as both sides are counted alike, rates do not",
        ),
    )
