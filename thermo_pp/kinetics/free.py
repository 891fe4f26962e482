"""The rate per free reactant: the reactant at unit free concentration, the intermediates at steady state."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.drained import Drained
from thermo_pp.kinetics.edges import EdgeMatrix, LogRate, count_end, from_edges, log_drive
from thermo_pp.kinetics.elimination import Reduction
from thermo_pp.kinetics.network import Network

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Amount:
    """How much there is of a product.

    Attributes
    ----------
    log_over_reactant : shape (b,), extended precision
        ln of its amount, to the power of its counts, over the free reactant's.
    slope_j_mol : shape (b,)
        R T^2 d/dT of that.
    """

    log_over_reactant: NDArray[np.longdouble]
    slope_j_mol: FloatArray


def per_free_reactant(
    network: Network,
    reactant: int,
    products: Sequence[int],
    amounts: Sequence[Amount | None],
    drained: Drained | None = None,
) -> tuple[LogRate, FloatArray]:
    """Rate over the free reactant, the intermediates at steady state, the network in balance.

    Parameters
    ----------
    network : Network
    reactant : int
        State.
    products : sequence of int
        States.
    amounts : sequence of Amount or None
        Of each product; None where there is none of it.
    drained : Drained, optional
        The network eliminated to the reactant, where that is known already.

    Returns
    -------
    LogRate
    shape (b, k)
        What goes from the reactant to each product, over the rate.
    """
    drained = drained or Drained.of(network, reactant, products)
    edges, reduced, k = drained.edges, drained.reduced, len(products)
    partial = reduced.ends[:, 0, :]
    b = len(network.temperature_k)
    net, driving = [], []
    for product, amount in zip(products, amounts, strict=True):
        if amount is None:
            net.append((np.zeros(b), np.ones(b), np.zeros(b), np.zeros(len(network.species))))
            continue
        extended, counts = affinity_to(network, reactant, product, amount)
        affinity = np.asarray(extended, dtype=np.float64)
        with np.errstate(over="ignore", divide="ignore"):
            growth = 1.0 / np.expm1(affinity)  # d ln(1 - exp(-A))/dA
        net.append((log_drive(affinity), np.sign(affinity), growth, counts))
    logs = np.stack([partial[:, c].log() + net[c][0] for c in range(k)], axis=1)
    signs = np.stack([net[c][1] for c in range(k)], axis=1)
    top = np.maximum(logs.max(axis=1, keepdims=True), np.finfo(np.float64).min)
    total = (signs * np.exp(logs - top)).sum(axis=1)
    # at equilibrium the rate is 0, and E_a is not defined
    with np.errstate(divide="ignore", invalid="ignore"):
        shares = signs * np.exp(logs - top) / total[:, np.newaxis]
        log = np.log(np.abs(total)) + top[:, 0]
    holding = np.zeros(b)
    for c, amount in enumerate(amounts):
        if amount is not None:
            driving.append((shares[:, c] * net[c][2], net[c][3]))
            holding -= shares[:, c] * net[c][2] * amount.slope_j_mol
    seed = np.zeros((b, 1, k))
    seed[:, 0, :] = shares
    gradient = reduced.gradient({}, seed)
    forward, reverse = edges.back({(): gradient.ways[()]}, gradient.ends)
    rate = from_edges(network, log, forward, reverse, np.sign(total), driving)
    return replace(rate, energy_j_mol=rate.energy_j_mol + holding), shares


def affinity_to(
    network: Network, reactant: int, product: int, amount: Amount
) -> tuple[NDArray[np.longdouble], FloatArray]:
    """Return the affinity over RT from reactant to product, and what it counts of each species."""
    counts = np.zeros(len(network.species))
    count_end(counts, network, network.states[reactant], 1.0)
    count_end(counts, network, network.states[product], -1.0)
    away = network.exchanged_from(reactant)
    for name, given in zip(network.held, away[product], strict=True):
        counts[network.species.index(name)] -= given
    reaction = (network.potential * counts.astype(np.longdouble)).sum(axis=1)
    return reaction - amount.log_over_reactant, counts


def steady_state(
    network: Network, reactant: int, products: Sequence[int], amounts: Sequence[Amount | None]
) -> dict[int, FloatArray]:
    """Return ln of the amount of every state that the reactant reaches, over the reactant's, shape (b,) each."""
    inside = network.members(reactant, products)
    edges = EdgeMatrix(network, inside, products)
    b, n, k = edges.ends.shape
    ways = network.numbers.zeros((b, n + 1, n))
    ways[:, 1:, :] = edges.ways[()]
    levels: dict[int, FloatArray] = {reactant: np.zeros(b)}
    for product, amount in zip(products, amounts, strict=True):
        if amount is None:
            levels[product] = np.full(b, -np.inf)
            continue
        levels[product] = np.asarray(amount.log_over_reactant, dtype=np.float64)
        for number, edge in enumerate(network.edges):
            for source, target, logs in (
                (edge.tail, edge.head, network.log_forward),
                (edge.head, edge.tail, network.log_reverse),
            ):
                if source == product and target in inside:
                    feed = network.numbers.from_log(logs[:, number] + amount.log_over_reactant)
                    column = inside.index(target)
                    ways[:, 0, column] = ways[:, 0, column] + feed
    ends = network.numbers.zeros((b, n + 1, k))
    ends[:, 1:, :] = edges.ends
    reduced = Reduction({(): ways}, ends, np.ones(k), sources=1)
    passages = reduced.eliminate_to(1, tape=False)
    amount_of = network.numbers.zeros((b, n + 1))
    amount_of[:, :2] = network.numbers.from_float(np.ones((b, 2)))
    for row, passage in enumerate(passages, start=2):
        arriving = (amount_of[:, passage.rows] * passage.into).sum(axis=1)
        amount_of[:, row] = arriving / passage.leaving
    for row, state in enumerate(inside[1:], start=2):
        levels[state] = amount_of[:, row].log()
    return levels
