"""What products that are there do: the net formation of each, and the rate of a driven network with them.

In a driven network the affinity does not say how the ways there and back compare, so that the two
are worked out on their own and subtracted: close to where they balance digits are lost.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.edges import EdgeMatrix, LogRate, from_edges, log_drive
from thermo_pp.kinetics.elimination import Reduction
from thermo_pp.kinetics.free import Amount, affinity_to
from thermo_pp.kinetics.network import Network

FloatArray = NDArray[np.float64]


def _between(
    network: Network, reactant: int, products: Sequence[int]
) -> tuple[EdgeMatrix, Reduction]:
    """Return the network with every intermediate eliminated: rows are the products, then the reactant.

    Ends are the products, the one state left is the reactant.
    """
    inside = network.members(reactant, products)
    edges = EdgeMatrix(network, [*products, *inside], [])
    k = len(products)
    every = edges.ways[()]
    reduced = Reduction({(): every[:, :, k:]}, every[:, :, :k], np.ones(k), sources=k)
    reduced.eliminate_to(1)
    return edges, reduced


def _levels(amounts: Sequence[Amount | None], b: int) -> list[FloatArray]:
    return [
        np.full(b, -np.inf)
        if amount is None
        else np.asarray(amount.log_over_reactant, dtype=np.float64)
        for amount in amounts
    ]


def per_free_reactant_driven(
    network: Network, reactant: int, products: Sequence[int], amounts: Sequence[Amount | None]
) -> LogRate:
    """Rate over the free reactant, the intermediates at steady state, in a driven network.

    Parameters as for `per_free_reactant`.
    """
    b, k = len(network.temperature_k), len(products)
    edges, reduced = _between(network, reactant, products)
    log_out = reduced.ends[:, k, :].log()
    log_back = reduced.ways[()][:, :k, 0].log() + np.stack(_levels(amounts, b), axis=1)
    top = np.maximum(log_out, log_back).max(axis=1, keepdims=True)
    out, back = np.exp(log_out - top), np.exp(log_back - top)
    total = (out.sum(axis=1) - back.sum(axis=1))[:, np.newaxis]
    with np.errstate(divide="ignore", invalid="ignore"):
        by_out, by_back = out / total, -back / total
        log = np.log(np.abs(total))[:, 0] + top[:, 0]
    by_ends = np.zeros((b, k + 1, k))
    by_ends[:, k, :] = by_out
    by_ways = np.zeros((b, k + 1, 1))
    by_ways[:, :k, 0] = by_back
    gradient = reduced.gradient({(): by_ways}, by_ends)
    whole = np.concatenate([gradient.ends, gradient.ways[()]], axis=2)
    forward, reverse = edges.back({(): whole}, np.zeros((b, whole.shape[1], 0)))
    rate = from_edges(network, log, forward, reverse, np.sign(total[:, 0]))
    holding = sum(
        (
            by_back[:, c] * amount.slope_j_mol
            for c, amount in enumerate(amounts)
            if amount is not None
        ),
        np.zeros(b),
    )
    return LogRate(rate.log, rate.sign, rate.saddles, rate.species, rate.energy_j_mol + holding)


@dataclass(frozen=True, eq=False)
class _Flux:
    """One contribution to what is made of a product: a way and, in balance, its driving force."""

    entry: tuple[int, int]  # source, and product that it leads to; TO_REACTANT for the reactant
    log: FloatArray
    sign: FloatArray
    slope_j_mol: (
        FloatArray  # R T^2 d ln/dT of the amount it starts from and of those it is driven by
    )
    growth: FloatArray  # d ln/d(affinity over RT)
    counts: FloatArray  # of the affinity, over the species


TO_REACTANT = -1


def product_rates(
    network: Network,
    reactant: int,
    products: Sequence[int],
    amounts: Sequence[Amount | None],
    driven: bool,
) -> list[LogRate]:
    """Return the net formation of each product over the free reactant, the intermediates at steady state.

    Together they are the rate per free reactant. What one product that is there makes of another
    counts too. Without products these are also the final yields of a pulse of the reactant.
    """
    b, k = len(network.temperature_k), len(products)
    edges, reduced = _between(network, reactant, products)
    answers = []
    for c in range(k):
        terms = _fluxes(network, reduced, reactant, products, amounts, c, driven)
        top = np.maximum.reduce([term.log for term in terms])
        with np.errstate(invalid="ignore", divide="ignore"):
            parts = [term.sign * np.exp(term.log - top) for term in terms]
            total = np.sum(parts, axis=0)
            shares = [part / total for part in parts]
            log = np.log(np.abs(total)) + top
        by_ends, by_ways = np.zeros((b, k + 1, k)), np.zeros((b, k + 1, 1))
        driving, holding = [], np.zeros(b)
        for term, share in zip(terms, shares, strict=True):
            source, target = term.entry
            if target == TO_REACTANT:
                by_ways[:, source, 0] += share
            else:
                by_ends[:, source, target] += share
            driving.append((share * term.growth, term.counts))
            holding += share * term.slope_j_mol
        gradient = reduced.gradient({(): by_ways}, by_ends)
        whole = np.concatenate([gradient.ends, gradient.ways[()]], axis=2)
        forward, reverse = edges.back({(): whole}, np.zeros((b, whole.shape[1], 0)))
        rate = from_edges(network, log, forward, reverse, np.sign(total), driving)
        answers.append(replace(rate, energy_j_mol=rate.energy_j_mol + holding))
    return answers


def _fluxes(
    network: Network,
    reduced: Reduction,
    reactant: int,
    products: Sequence[int],
    amounts: Sequence[Amount | None],
    c: int,
    driven: bool,
) -> list[_Flux]:
    """Return what makes and uses up product number `c`; source number k is the reactant."""
    b, k = len(network.temperature_k), len(products)
    ends, ways = reduced.ends.log(), reduced.ways[()].log()
    levels = [*_levels(amounts, b), np.zeros(b)]
    none = np.zeros(len(network.species))
    zeros = np.zeros(b)

    def slope(place: int) -> FloatArray:
        amount = amounts[place] if place < k else None
        return zeros if amount is None else amount.slope_j_mol

    def one_way(source: int, target: int, sign: float) -> _Flux:
        log = ways[:, source, 0] if target == k else ends[:, source, target]
        entry = source, TO_REACTANT if target == k else target
        signs = np.full(b, sign)
        return _Flux(entry, log + levels[source], signs, slope(source), zeros, none)

    def affinity(place: int) -> tuple[FloatArray, FloatArray]:
        amount = amounts[place] if place < k else None
        if amount is None:
            return zeros, none
        extended, counts = affinity_to(network, reactant, products[place], amount)
        return np.asarray(extended, dtype=np.float64), counts

    terms = []
    for source in (k, *(o for o in range(k) if o != c)):
        there = source == k or amounts[source] is not None
        if amounts[c] is None:
            terms += [one_way(source, c, 1.0)] if there else []
        elif driven or not there:
            terms += [one_way(source, c, 1.0)] if there else []
            terms.append(one_way(c, source, -1.0))
        else:
            (to_c, counts_c), (to_source, counts_source) = affinity(c), affinity(source)
            difference = to_c - to_source
            with np.errstate(over="ignore", divide="ignore"):
                growth = 1.0 / np.expm1(difference)  # d ln(1 - exp(-A))/dA
            forth = one_way(source, c, 1.0)
            terms.append(
                _Flux(
                    forth.entry,
                    forth.log + log_drive(difference),
                    np.sign(difference),
                    forth.slope_j_mol + growth * (slope(source) - slope(c)),
                    growth,
                    counts_c - counts_source,
                )
            )
    return terms


def formation(
    network: Network,
    reactant: int,
    products: Sequence[int],
    amounts: Sequence[Amount | None],
    driven: bool,
) -> FloatArray:
    """Return the net formation of each product over the rate per free reactant, shape (b, k).

    What one product that is there makes of another counts too.
    """
    b, k = len(network.temperature_k), len(products)
    _, reduced = _between(network, reactant, products)
    levels = [*_levels(amounts, b), np.zeros(b)]
    ends, ways = reduced.ends.log(), reduced.ways[()].log()
    top = ends[:, k, :].max(axis=1)
    affinities = [
        np.full(b, np.inf) if amount is None else affinity_to(network, reactant, product, amount)[0]
        for product, amount in zip(products, amounts, strict=True)
    ]

    def one_way(source: int, c: int) -> FloatArray:
        log = ends[:, source, c] if c < k else ways[:, source, 0]
        return np.asarray(np.exp(log + levels[source] - top))

    def net(source: int, c: int) -> FloatArray:
        """Return the net flux from one product, or the reactant (k), to another product."""
        if driven or (source < k and amounts[source] is None):
            return one_way(source, c) - one_way(c, source)
        affinity = affinities[c] - (affinities[source] if source < k else 0.0)
        return np.asarray(-one_way(source, c) * np.expm1(-np.asarray(affinity, dtype=np.float64)))

    made = np.stack([net(k, c) for c in range(k)], axis=1)
    rate = made.sum(axis=1)
    for c in range(k):
        for other in range(c):
            across = net(other, c)
            made[:, c] += across
            made[:, other] -= across
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.asarray(made / rate[:, np.newaxis])
