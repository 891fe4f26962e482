"""The rate per pool: the slowest decay of the reactant and its intermediates, the products absorbing."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.edges import EdgeMatrix, LogRate, from_edges
from thermo_pp.kinetics.elimination import Indices, Reduction
from thermo_pp.kinetics.network import Network
from thermo_pp.kinetics.scaled import Scaled, fraction

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Pool:
    """The decay of the reactant and its intermediates into absorbing products.

    Attributes
    ----------
    rate : LogRate
        Of the slowest decay.
    members : tuple of int
        States, the reactant first.
    slow_share : shape (b,)
    populations : shape (b, n)
        Of the members while the slowest decay is all that is left.
    log_inverse_mean_time : shape (b,)
    branching : shape (b, k)
        Share of each product in the slowest decay.
    times : Scaled, shape (b, n, n)
        Mean time spent in each member after a start in each.
    ways, ends : Scaled, shape (b, n, n) and (b, n, k)
        Rates between members, and into the products.
    """

    rate: LogRate
    members: tuple[int, ...]
    slow_share: FloatArray
    populations: FloatArray
    log_inverse_mean_time: FloatArray
    branching: FloatArray
    times: Scaled
    ways: Scaled
    ends: Scaled

    def coefficients(self, row: int, log_decay: FloatArray) -> FloatArray | None:
        """Return the coefficients of all decays at one temperature; None where they are too close together.

        A clock that strikes at rate s does so before the pool is gone with the probability sum_j c_j
        s/(s + lambda_j), which elimination gives to full accuracy: one equation for each s.
        """
        n = len(log_decay)
        with np.errstate(over="ignore"):
            faster = np.exp(log_decay[np.newaxis, :] - log_decay[:, np.newaxis])
        system = 1.0 / (1.0 + faster)
        if np.linalg.cond(system) > _WORST_CONDITION:
            return None
        kind = type(self.ways)
        ways = kind.zeros((n, *self.ways.shape[1:])) + self.ways[row : row + 1]
        ends = kind.zeros((n, self.ends.shape[1], 2))
        ends[:, :, 0] = ends[:, :, 0] + self.ends[row : row + 1].sum(axis=2)
        ends[:, :, 1] = ends[:, :, 1] + kind.from_log(log_decay)[:, np.newaxis]
        reduced = Reduction({(): ways}, ends, np.ones(2))
        reduced.eliminate_to(1, tape=False)
        out = reduced.ends[:, 0, :]
        return np.asarray(np.linalg.solve(system, fraction(out[:, 1], out.sum(axis=1))))

    def decay_shares(self) -> list[tuple[FloatArray, FloatArray]]:
        """Return at each temperature ln of the decay constants and their coefficients, in any network.

        By an ordinary eigenvalue routine: constants more than about 1e12 times the slowest are not
        resolved.
        """
        answers = []
        for row in range(len(self.slow_share)):
            times = self.times[row : row + 1]
            similar, scale = _similar(times)
            values, vectors = np.linalg.eig(similar[0])
            order = np.argsort(-np.abs(values))
            left = np.linalg.inv(vectors)[order]
            vectors, values = vectors[:, order], values[order]
            start = times.sum(axis=2)
            weights = fraction(start[0, :1], start[0])  # what the similarity does to 1
            shares = vectors[0] * (left @ weights)
            with np.errstate(divide="ignore"):
                log = -np.log(np.abs(values)) - scale[0] * np.log(2.0)
            answers.append((log, shares.real))
        return answers


_WORST_CONDITION = 1e8


def per_pool(network: Network, reactant: int, products: Sequence[int]) -> Pool:
    """Slowest decay of the pool, from the positive inverse of its rate matrix."""
    inside = network.members(reactant, products)
    edges = EdgeMatrix(network, inside, products)
    times = mean_times(edges.ways[()], edges.ends)
    right, left, log_longest = _longest(times)
    b, n, k = edges.ends.shape
    # 1/lambda = left . times . right with both vectors fixed: one elimination gives its derivative
    source = network.numbers.zeros((b, n + 1, n))
    source[:, 1:, :] = edges.ways[()]
    source[:, 0, :] = left
    ends = network.numbers.zeros((b, n + 1, k + 1))
    ends[:, 1:, :k] = edges.ends
    ends[:, 1:, k] = right
    exits = np.append(np.ones(k), 0.0)
    reduced = Reduction({(): source}, ends, exits, sources=1)
    reduced.eliminate_to(0)
    seed = np.zeros((b, 1, k + 1))
    seed[:, 0, k] = -1.0
    gradient = reduced.gradient({}, seed)
    forward, reverse = edges.back(gradient.ways, gradient.ends, offset=1)
    total = left.sum(axis=1)
    weight = (left * right).sum(axis=1)
    out = reduced.ends[:, 0, :k]
    return Pool(
        rate=from_edges(network, -log_longest, forward, reverse),
        members=tuple(inside),
        slow_share=fraction(right[:, 0] * total, weight),
        populations=fraction(left, total[:, np.newaxis]),
        log_inverse_mean_time=-times[:, 0, :].sum(axis=1).log(),
        branching=fraction(out, out.sum(axis=1)[:, np.newaxis]),
        times=times,
        ways=edges.ways[()],
        ends=edges.ends,
    )


def log_slowest(
    network: Network, inside: Sequence[int], products: Sequence[int], skip: int
) -> FloatArray:
    """Return ln of the slowest decay when the state `skip` is at steady state, shape (b,)."""
    order = [s for s in inside if s != skip] + [skip]
    edges = EdgeMatrix(network, order, products)
    reduced = Reduction(edges.ways, edges.ends, np.ones(len(products)))
    reduced.eliminate_to(len(order) - 1, tape=False)
    left = reduced.left
    times = mean_times(reduced.ways[()][:, :left, :left], reduced.ends[:, :left])
    return -_longest(times)[2]


def mean_times(ways: Scaled, ends: Scaled) -> Scaled:
    """Return the mean time spent in state j after a start in i, shape (b, n, n): the inverse, all positive."""
    b, n, k = ends.shape
    kind = type(ends)
    rewards = kind.zeros((b, n, k + n))
    rewards[:, :, :k] = ends
    square = np.arange(n)
    rewards[:, square, k + square] = kind.from_float(np.ones((b, n)))
    reduced = Reduction({(): ways}, rewards, np.append(np.ones(k), np.zeros(n)))
    passages = reduced.eliminate_to(1, tape=False)
    first = reduced.ends[:, 0, :]
    times = kind.zeros((b, n, n))
    times[:, 0, :] = first[:, k:] / first[:, :k].sum(axis=1)[:, np.newaxis]
    for row, passage in enumerate(passages, start=1):
        own = passage.end_columns >= k
        times[:, row, passage.end_columns[own] - k] = passage.ends[:, np.flatnonzero(own)]
        if len(passage.columns):
            onward = passage.out[:, :, np.newaxis] * times[:, passage.columns, :]
            times[:, row, :] = times[:, row, :] + onward.sum(axis=1)
    return times


def _longest(times: Scaled) -> tuple[Scaled, Scaled, FloatArray]:
    """Return the right and left vectors of the largest eigenvalue of a positive matrix, and its logarithm."""
    start = times.sum(axis=2)
    plain, top = _similar(times)
    right, left, unsettled = _iterate(plain)
    if len(unsettled):
        right[unsettled], left[unsettled] = _square(plain[unsettled])
    value = np.einsum("bi,bij,bj->b", left, plain, right) / np.einsum("bi,bi->b", left, right)
    log = np.log(value) + top * np.log(2.0)
    kind = type(times)
    return kind.from_float(right) * start, kind.from_float(left) / start, log


MOST_ITERATIONS = 64
"""Plain iterations before the matrix is squared: enough for decays whose ratio is above 2."""


def _iterate(plain: FloatArray) -> tuple[FloatArray, FloatArray, Indices]:
    """Return right and left vectors by iteration, and the rows that have not settled to the last digit."""
    b, n, _ = plain.shape
    all_right, all_left = np.ones((b, n)), np.ones((b, n))
    rows = np.arange(b)
    right, left = np.ones((b, n)), np.ones((b, n))
    power = plain @ plain
    power = power @ power  # four steps at once
    for _ in range(MOST_ITERATIONS // 8):
        right, left = _step(power, right, left)
        before = right, left
        right, left = _step(power, right, left)
        change = np.maximum(np.abs(right - before[0]), np.abs(left - before[1])).max(axis=1)
        all_right[rows], all_left[rows] = right, left
        unsettled = change > 1e-15
        rows, right, left = rows[unsettled], right[unsettled], left[unsettled]
        if not len(rows):
            break
        power = power[unsettled]
    return *_step(plain, all_right, all_left), rows


def _step(matrix: FloatArray, right: FloatArray, left: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return the vectors times the matrix, the largest entry 1."""
    right = np.einsum("bij,bj->bi", matrix, right)
    left = np.einsum("bi,bij->bj", left, matrix)
    right /= right.max(axis=1, keepdims=True)
    left /= left.max(axis=1, keepdims=True)
    return right, left


def _square(plain: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return right and left vectors by squaring the matrix until it has rank 1."""
    power = plain
    for _ in range(MOST_SQUARINGS):
        power = power @ power
        power /= power.max(axis=(1, 2), keepdims=True)
        spread = power.sum(axis=1, keepdims=True) * power.sum(axis=2, keepdims=True)
        spread /= power.sum(axis=(1, 2))[:, np.newaxis, np.newaxis]
        if np.all(np.abs(power - spread) <= 1e-15 * spread.max(axis=(1, 2), keepdims=True)):
            break
    return _step(plain, power.sum(axis=2), power.sum(axis=1))


def _similar(times: Scaled) -> tuple[FloatArray, NDArray[np.int32]]:
    """Scale a positive matrix by its row sums, which are close to the right vector, into ordinary numbers.

    Returns D^-1 A D / 2**exponent, D the row sums, and the exponent.
    """
    start = times.sum(axis=2)
    similar = times * start[:, np.newaxis, :] / start[:, :, np.newaxis]
    return similar.levelled()


MOST_SQUARINGS = 60
"""Squarings of the matrix of mean times; 60 tell apart decays whose ratio is 1 + 1e-16."""
