"""Turnovers of a catalyst: the extent of the net reaction over all of the catalyst, at steady state."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.edges import EdgeMatrix, LogRate, from_edges, log_drive
from thermo_pp.kinetics.elimination import Reduction
from thermo_pp.kinetics.network import Network
from thermo_pp.kinetics.scaled import Scaled, fraction
from thermo_pp.kinetics.tape import Label

FloatArray = NDArray[np.float64]


class Turn(NamedTuple):
    """One run of a closed way.

    Attributes
    ----------
    given : shape (h,)
        Held species given off.
    product : float
        Product given off, all products together; not negative.
    absent : shape (a,)
        Products given off that are not held.
    """

    given: FloatArray
    product: float
    absent: FloatArray


def turns(network: Network, catalyst: int) -> list[Turn]:
    """Return independent closed ways of the catalyst that change anything, those with least product first.

    Ways without product come last.
    """
    found = network.given_off_from(catalyst)
    h = len(network.held)
    closed = []
    for edge, off in zip(network.edges, network.off, strict=True):
        if edge.tail in found and edge.head in found:
            change = found[edge.tail] + off - found[edge.head]
            if change.any():
                closed.append(-change if change[-1] < 0.0 else change)
    closed.sort(key=lambda change: float(change[-1]) or np.inf)
    return [Turn(change[:h], float(change[-1]), change[h:-1]) for change in closed]


def alike(found: Sequence[Turn]) -> bool:
    """Whether every closed way does the same, for the product that it makes."""
    first = found[0]
    return all(
        np.array_equal(turn.given * first.product, first.given * turn.product)
        and np.array_equal(turn.absent * first.product, first.absent * turn.product)
        for turn in found
    )


def per_cycle(
    network: Network, catalyst: int, turn: Turn, endless: bool, driven: bool
) -> tuple[LogRate, list[int], FloatArray]:
    """Turnovers of a catalyst: extent of the net reaction over all of it, at steady state.

    Parameters
    ----------
    network : Network
    catalyst : int
        State; every state that it reaches leads back to it.
    turn : Turn
        One run of the cycle: what it makes is one extent.
    endless : bool
        There is none of the product, so that nothing runs backwards.
    driven : bool
        Closed ways differ in what they exchange: each has an affinity of its own.

    Returns
    -------
    LogRate
    list of int
        The states of the catalyst.
    shape (b, n)
        Their shares.
    """
    inside = network.members(catalyst, ())
    b, n = len(network.temperature_k), len(inside)
    held = len(network.held)
    if driven:
        labels: list[Label] = [
            (int(off[-1]), *(Fraction(x).limit_denominator(1000) for x in off[:-1]))
            for off in network.off
        ]
    else:
        labels = [(int(product),) for product in network.product_change]
    edges = EdgeMatrix(network, inside, [], labels)

    def given_by(label: Label) -> FloatArray:
        if driven:
            return np.array([float(part) for part in label[1 : 1 + held]])
        return np.asarray(turn[0] * (label[0] / turn[1]))

    def affinity(label: Label) -> FloatArray:
        if any(label[1 + held :]) if driven else endless:
            return np.full(b, np.inf)
        return np.asarray(network.affinity(given_by(label)), dtype=np.float64)

    def run(label: Label) -> Scaled | None:
        if label[0] <= 0:  # no product, or counted the other way round
            return None
        driving = affinity(label)  # 1 - exp(-A), which may be far below zero
        worth = network.numbers.from_log(log_drive(driving)) * network.numbers.from_float(
            np.full(b, label[0] / turn[1])
        )
        return worth.signed(np.sign(driving))

    ends = network.numbers.zeros((b, n, 2))
    ends[:, :, 1] = network.numbers.from_float(np.ones((b, n)))
    at_once: list[tuple[int, int, int, Label, Scaled]] = []
    for number, edge in enumerate(network.edges):
        if edge.tail != edge.head or edge.tail not in inside or not labels[number][0]:
            continue
        way = 0 if labels[number][0] > 0 else 1
        label: Label = labels[number] if way == 0 else tuple(-part for part in labels[number])
        worth = run(label)
        assert worth is not None
        log = (network.log_forward, network.log_reverse)[way][:, number]
        row = inside.index(edge.tail)
        gain = network.numbers.from_log(log) * worth
        ends[:, row, 0] = ends[:, row, 0] + gain
        at_once.append((number, way, row, label, gain))
    reduced = Reduction(edges.ways, ends, np.zeros(2), run=run, reward=0)
    passages = reduced.eliminate_to(1)
    share = network.numbers.zeros((b, n))
    share[:, 0] = network.numbers.from_float(np.ones(b))
    for row, passage in enumerate(passages, start=1):
        share[:, row] = (share[:, passage.rows] * passage.into).sum(axis=1) / passage.leaving
    reward, mass = reduced.ends[:, 0, 0], reduced.ends[:, 0, 1]
    sign = np.sign(reward.mantissa)
    seed = np.zeros((b, 1, 2))
    seed[:, 0, 0], seed[:, 0, 1] = 1.0, -1.0
    gradient = reduced.gradient({}, seed)
    forward, reverse = edges.back(gradient.ways, gradient.ends)
    worths = dict(gradient.worths)
    for number, way, row, label, gain in at_once:
        weight = gradient.ends[:, row, 0] * fraction(gain, ends[:, row, 0])
        (forward, reverse)[way][:, number] += weight
        worths[label] = worths.get(label, np.zeros(b)) + weight
    driving = []
    for label, weight in worths.items():
        counts = np.zeros(len(network.species))
        for name, given in zip(network.held, given_by(label), strict=True):
            counts[network.species.index(name)] -= given
        with np.errstate(over="ignore", divide="ignore", invalid="ignore"):
            driving.append((weight / np.expm1(affinity(label)), counts))
    defined = np.where(sign == 0.0, np.nan, 1.0)[
        :, np.newaxis
    ]  # in equilibrium nothing controls the rate
    forward, reverse = forward * defined, reverse * defined
    size = reward.signed(sign)
    rate = from_edges(network, size.log() - mass.log(), forward, reverse, sign, driving)
    return rate, inside, fraction(share, share.sum(axis=1)[:, np.newaxis])
