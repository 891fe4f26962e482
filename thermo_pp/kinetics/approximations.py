"""What the usual approximations say of a linear network in balance: pre-equilibrium, steady state, energetic span.

Each works on the one-way fluxes at equilibrium G of the steps and on the equilibrium populations pi
of the states, both over those of the reactant.

Pre-equilibrium: the states before the slow steps stand in equilibrium with the reactant, nothing
comes back across the slow steps. The slow steps are those that cut the reactant and every state it
goes to first off from the products with the smallest sum of G. For A = C -> P that is k2 K1; over
all that stands before the cut it is the saturated form, k2 K1/(1 + K1).

Steady state: one intermediate (or all) at steady state, the pool counted without it.

Energetic span: the one saddle and the one state that lie farthest apart on the easiest way (Kozuch,
Shaik, Acc. Chem. Res. 2011, 44, 101, doi 10.1021/ar1000956).
"""

from __future__ import annotations

from collections import deque
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.network import Network

FloatArray = NDArray[np.float64]
TARGET = -1
"""The products, taken together."""


@dataclass(frozen=True, eq=False)
class Landscape:
    """Fluxes and populations of a network in balance, over those of the reactant.

    Attributes
    ----------
    inside : tuple of int
        States, the reactant first.
    edges : tuple of (edge, place, place)
        Number of the edge, and where in `inside` it leads, `TARGET` for a product.
    log_flux : shape (b, e)
    log_weight : shape (b, n)
    from_head : tuple of bool
        Whether the flux of an edge was taken from its head, the way from its tail being missing.
    """

    inside: tuple[int, ...]
    edges: tuple[tuple[int, int, int], ...]
    log_flux: FloatArray
    log_weight: FloatArray
    from_head: tuple[bool, ...]


def landscape(
    network: Network, inside: Sequence[int], products: Sequence[int], log_weight: FloatArray
) -> Landscape:
    """Return the landscape of the states `inside`."""
    place = {state: k for k, state in enumerate(inside)}
    place |= dict.fromkeys(products, TARGET)
    edges, logs, from_head = [], [], []
    for number, edge in enumerate(network.edges):
        tail, head = place.get(edge.tail), place.get(edge.head)
        if tail is None or head is None:
            continue
        if tail == head and not network.product_change[number]:
            continue
        edges.append((number, tail, head))
        from_head.append(tail == TARGET or not network.exists[0][number])
        if from_head[-1]:
            log = network.log_reverse[:, number].astype(np.float64) + log_weight[:, head]
        else:
            log = network.log_forward[:, number].astype(np.float64) + log_weight[:, tail]
        logs.append(log)
    return Landscape(
        tuple(inside), tuple(edges), np.stack(logs, axis=1), log_weight, tuple(from_head)
    )


def pre_equilibrium(scene: Landscape) -> tuple[FloatArray, FloatArray] | None:
    """Return ln of the rate per free reactant and per all that stands before the cut, None without intermediates."""
    if len(scene.inside) < 2:
        return None
    free, saturated = [], []
    for log_flux, log_weight in zip(scene.log_flux, scene.log_weight, strict=True):
        before = _smallest_cut(scene.edges, log_flux, len(scene.inside))
        crossing = [
            log_flux[k] for k, (_, a, b) in enumerate(scene.edges) if (a in before) != (b in before)
        ]
        free.append(np.logaddexp.reduce(crossing))
        saturated.append(free[-1] - np.logaddexp.reduce([log_weight[k] for k in before]))
    return np.array(free), np.array(saturated)


def _smallest_cut(
    edges: Sequence[tuple[int, int, int]], log_flux: FloatArray, n: int
) -> frozenset[int]:
    """Return the states before the cut of least flux; ways from the reactant to states are never cut."""
    widest = _bottleneck([(a, b) for _, a, b in edges], log_flux, 0, TARGET, uncut=True)
    # what is far wider than the whole cut can be is as good as infinitely wide
    limit = np.log(len(edges) + 1.0) + 5.0
    room: dict[int, dict[int, float]] = {k: {} for k in (*range(n), TARGET)}
    for k, (_, a, b) in enumerate(edges):
        bound = 0 in (a, b) and TARGET not in (a, b)
        width = np.exp(limit if bound else min(log_flux[k] - widest, limit))
        room[a][b] = room[a].get(b, 0.0) + width
        room[b][a] = room[b].get(a, 0.0) + width
    while True:
        came_from = {0: 0}
        queue = deque([0])
        while queue and TARGET not in came_from:
            here = queue.popleft()
            for there, width in room[here].items():
                if width > 0.0 and there not in came_from:
                    came_from[there] = here
                    queue.append(there)
        if TARGET not in came_from:
            return frozenset(came_from)
        way = [TARGET]
        while way[-1] != 0:
            way.append(came_from[way[-1]])
        steps = list(zip(way[1:], way[:-1], strict=True))
        narrowest = min(room[a][b] for a, b in steps)
        for a, b in steps:
            room[a][b] -= narrowest
            room[b][a] += narrowest


def _bottleneck(
    pairs: Sequence[tuple[int, int]],
    log_flux: FloatArray,
    start: int,
    target: int,
    uncut: bool = False,
) -> float:
    """Return the largest flux that every step of some way from start to target has at least."""
    group: dict[int, int] = {}

    def root(k: int) -> int:
        while group.setdefault(k, k) != k:
            k = group[k]
        return k

    if uncut:
        for a, b in pairs:
            if start in (a, b) and target not in (a, b):
                group[root(a)] = root(b)
    for k in np.argsort(log_flux)[::-1]:
        a, b = pairs[int(k)]
        group[root(a)] = root(b)
        if root(start) == root(target):
            return float(log_flux[k])
    return -np.inf


@dataclass(frozen=True, eq=False)
class Span:
    """The energetic span over temperature.

    Attributes
    ----------
    log_rate : shape (b,)
    edges : tuple of int
        Edge of the determining saddle at each temperature.
    states : tuple of int
        Number of the determining state.
    """

    log_rate: FloatArray
    edges: tuple[int, ...]
    states: tuple[int, ...]


def span(scene: Landscape, whole_pool: bool) -> Span:
    """Return the energetic span from the reactant, or from whichever member of the pool it is largest."""
    pairs = [(a, b) for _, a, b in scene.edges]
    starts = range(len(scene.inside)) if whole_pool else (0,)
    rates, edges, states = [], [], []
    for log_flux, log_weight in zip(scene.log_flux, scene.log_weight, strict=True):
        best = min((_bottleneck(pairs, log_flux, k, TARGET) - log_weight[k], k) for k in starts)
        passed = best[0] + log_weight[best[1]]
        edges.append(scene.edges[int(np.argmin(np.abs(log_flux - passed)))][0])
        rates.append(best[0])
        states.append(scene.inside[best[1]])
    return Span(np.array(rates), tuple(edges), tuple(states))


_LEVELS = (-1, 0, 1, 2)
"""Turns of the cycle that a way from one turn to the next may wander over."""


def span_of_cycle(
    scene: Landscape,
    product_before: FloatArray,
    product_change: FloatArray,
    affinity: FloatArray,
    turn: float,
) -> Span:
    """Return the energetic span of a catalytic cycle.

    Parameters
    ----------
    scene : Landscape
        Without products.
    product_before : shape (n,)
        Product given off on the way to each state that its weight was worked out along.
    product_change : shape (m,)
        Product given off along each edge of the network.
    affinity : shape (b,)
        Of one run of the cycle, over RT; large where there is no product.
    turn : float
        Product of one run of the cycle.
    """
    n = len(scene.inside)
    pairs: list[tuple[int, int]] = []
    lifts: list[float] = []
    origin: list[int] = []
    for k, (edge, a, b) in enumerate(scene.edges):
        shift = (product_before[a] + product_change[edge] - product_before[b]) / turn
        for level in _LEVELS:
            there = round(level + shift)
            if there in _LEVELS:
                pairs.append((a + n * level, b + n * there))
                lifts.append(level + shift if scene.from_head[k] else float(level))
                origin.append(k)
    rates, edges, states = [], [], []
    for row in range(len(affinity)):
        flux = scene.log_flux[row, origin] + np.array(lifts) * affinity[row]
        best = min(
            (_bottleneck(pairs, flux, k, k + n) - scene.log_weight[row, k], k) for k in range(n)
        )
        passed = best[0] + scene.log_weight[row, best[1]]
        edges.append(scene.edges[origin[int(np.argmin(np.abs(flux - passed)))]][0])
        rates.append(best[0])
        states.append(scene.inside[best[1]])
    return Span(np.array(rates), tuple(edges), tuple(states))
