"""The rate per pool: the slowest decay of the reactant and its intermediates, the products absorbing."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.drained import Drained
from thermo_pp.kinetics.edges import EdgeMatrix, LogRate, from_edges
from thermo_pp.kinetics.elimination import Reduction
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
            start, similar, scale = _similar(self.times[row : row + 1])
            values, vectors = np.linalg.eig(similar[0])
            order = np.argsort(-np.abs(values))
            left = np.linalg.inv(vectors)[order]
            vectors, values = vectors[:, order], values[order]
            weights = fraction(start[0, :1], start[0])  # what the similarity does to 1
            shares = vectors[0] * (left @ weights)
            with np.errstate(divide="ignore"):
                log = -np.log(np.abs(values)) - scale[0] * np.log(2.0)
            answers.append((log, shares.real))
        return answers


_WORST_CONDITION = 1e8


def per_pool(
    network: Network, reactant: int, products: Sequence[int], drained: Drained | None = None
) -> Pool:
    """Slowest decay of the pool, from the positive inverse of its rate matrix.

    `drained` is the network eliminated to the reactant, where that is known already.
    """
    drained = drained or Drained.of(network, reactant, products)
    edges = drained.edges
    times = mean_times(drained.reduced)
    right, left, log_longest = _longest(times)
    # 1/lambda = left . times . right with both vectors fixed: the elimination gives its derivative
    between = drained.reduced.between(left, right)
    gradient = between.gradient(-1.0)
    forward, reverse = edges.back(gradient.ways, gradient.ends, offset=1)
    total = left.sum(axis=1)
    weight = (left * right).sum(axis=1)
    return Pool(
        rate=from_edges(network, -log_longest, forward, reverse),
        members=drained.inside,
        slow_share=fraction(right[:, 0] * total, weight),
        populations=fraction(left, total[:, np.newaxis]),
        log_inverse_mean_time=-times[:, 0, :].sum(axis=1).log(),
        branching=fraction(between.out, between.out.sum(axis=1)[:, np.newaxis]),
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
    others = Reduction(
        {(): reduced.ways[()][:, :left, :left]}, reduced.ends[:, :left], reduced.exits
    )
    others.eliminate_to(1, tape=False)
    return -_longest(mean_times(others))[2]


def mean_times(reduced: Reduction) -> Scaled:
    """Return the mean time spent in state j after a start in i, shape (b, n, n): the inverse, all positive.

    From an elimination to the first state, without sources.
    """
    passages = reduced.passages
    b, _, n = reduced.ways[()].shape
    kind = type(reduced.ends)
    times = kind.zeros((b, n, n))
    square = np.arange(n)
    times[:, square, square] = kind.from_float(np.ones((b, n)))
    # forth: a unit reward for each state; rewards of states beyond those that lead to it stay nothing
    worth = [np.array([state]) for state in range(n)]
    for row in range(n - 1, 0, -1):
        passage, columns = passages[row - 1], worth[row]
        own = times[:, row, columns] / passage.leaving[:, np.newaxis]
        times[:, row, columns] = own
        block = (slice(None), passage.rows[:, np.newaxis], columns[np.newaxis, :])
        times[block] = times[block] + passage.into[:, :, np.newaxis] * own[:, np.newaxis, :]
        for other in passage.rows:
            worth[other] = np.union1d(worth[other], columns)
    leaving = reduced.ends[:, 0, np.flatnonzero(reduced.exits)].sum(axis=1)
    times[:, 0, :] = times[:, 0, :] / leaving[:, np.newaxis]
    for row, passage in enumerate(passages, start=1):
        for place, column in enumerate(passage.columns):
            onward = passage.out[:, place][:, np.newaxis] * times[:, column, :]
            times[:, row, :] = times[:, row, :] + onward
    return times


def _longest(times: Scaled) -> tuple[Scaled, Scaled, FloatArray]:
    """Return the right and left vectors of the largest eigenvalue of a positive matrix, and its logarithm."""
    start, similar, top = _similar(times)
    plain = np.ascontiguousarray(
        similar
    )  # products of small matrices want each matrix in one piece
    right, left = _rank_one(plain)
    onward = (plain @ right[:, :, np.newaxis])[:, :, 0]
    left = (left[:, np.newaxis, :] @ plain)[:, 0, :]
    value = np.einsum("bi,bi->b", left, onward) / np.einsum("bi,bi->b", left, right)
    log = np.log(value) + top * np.log(2.0)
    right, left = (
        np.asfortranarray(vector / vector.max(axis=1, keepdims=True)) for vector in (onward, left)
    )
    kind = type(times)
    return kind.from_float(right) * start, kind.from_float(left) / start, log


MOST_SQUARINGS = 60
"""Squarings of the matrix of mean times; 60 tell apart decays whose ratio is 1 + 1e-16."""
SETTLED = 1e-12
"""Change of the vectors by a squaring at which the next is exact: it squares what is left of the others."""


def _rank_one(plain: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return the right and left vectors by squaring each matrix until it has rank 1, shape (b, n) each."""
    power = plain @ plain
    power = power @ power  # row sums are close to each other, so that nothing leaves the range yet
    margins = _margins(power)
    rows, last = np.arange(len(plain)), margins.copy()
    for _ in range(MOST_SQUARINGS):
        power = power @ power
        power /= power.max(axis=(1, 2), keepdims=True)
        new = _margins(power)
        margins[rows] = new
        unsettled = np.flatnonzero(np.abs(new - last).max(axis=1) > SETTLED)
        if not len(unsettled):
            break
        if len(unsettled) < 0.9 * len(rows):
            rows, power, new = rows[unsettled], power[unsettled], new[unsettled]
        last = new
    n = plain.shape[1]
    return margins[:, :n], margins[:, n:]


def _margins(matrix: FloatArray) -> FloatArray:
    """Return the sums of the rows, then those of the columns, the largest of each 1; shape (b, 2 n)."""
    b, n, _ = matrix.shape
    if n < _SHORT:  # NumPy's sum is slow over an axis that is short, one product of matrices is not
        unit = np.eye(n)
        add_up = np.hstack([np.repeat(unit, n, axis=0), np.tile(unit, (n, 1))])
        sums = (matrix.reshape(b, n * n) @ add_up).reshape(b, 2, n)
    else:
        sums = np.stack([matrix.sum(axis=2), matrix.sum(axis=1)], axis=1)
    return np.asarray((sums / sums.max(axis=2, keepdims=True)).reshape(b, 2 * n))


_SHORT = 16


def _similar(times: Scaled) -> tuple[Scaled, FloatArray, NDArray[np.int32]]:
    """Scale a positive matrix by its row sums, which are close to the right vector, into ordinary numbers.

    Returns the row sums D, D^-1 A D / 2**exponent, and the exponent.
    """
    start = times.sum(axis=2)
    similar = times * start[:, np.newaxis, :] / start[:, :, np.newaxis]
    return start, *similar.levelled()
