"""The edges of a network as matrices of rates, and the sensitivity of a rate by its edges."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.network import End, Network
from thermo_pp.kinetics.scaled import Scaled, fraction
from thermo_pp.kinetics.tape import Label

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class LogRate:
    """A rate and its sensitivity, b temperatures, m edges, s species.

    Attributes
    ----------
    log : shape (b,)
        ln of its size.
    sign : shape (b,)
        1, or -1 where the net reaction runs backwards.
    saddles : shape (b, m)
        d ln r/d(-G/RT) of the effective saddle of each edge.
    species : shape (b, s)
        d ln r/d(mu/RT) of each species.
    energy_j_mol : shape (b,)
        R T^2 d ln r/dT.
    """

    log: FloatArray
    sign: FloatArray
    saddles: FloatArray
    species: FloatArray
    energy_j_mol: FloatArray


def from_edges(
    network: Network,
    log: FloatArray,
    forward: FloatArray,
    reverse: FloatArray,
    sign: FloatArray | None = None,
    driving: Sequence[tuple[FloatArray, FloatArray]] = (),
) -> LogRate:
    """Make a LogRate from the derivative by ln of the edges' constants.

    `driving` holds pairs of (weight (b,), counts (s,)): the rate changes by weight per unit of the
    affinity over RT that is counts @ mu/RT.
    """
    species = forward @ network.counts_forward + reverse @ network.counts_reverse
    energy = (forward * _finite(network.energy_forward, network.log_forward)).sum(axis=1) + (
        reverse * _finite(network.energy_reverse, network.log_reverse)
    ).sum(axis=1)
    for weight, counts in driving:
        species = species + weight[:, np.newaxis] * counts
        energy = energy - weight * (network.slope_j_mol @ counts)
    if sign is None:
        sign = np.ones(len(log))
    return LogRate(log, sign, forward + reverse, species, energy)


def _finite(values: FloatArray, logs: NDArray[np.longdouble]) -> FloatArray:
    return np.where(np.isfinite(logs), values, 0.0)


class EdgeMatrix:
    """The edges among an ordered choice of states, as matrices of scaled rates by label, and back."""

    def __init__(
        self,
        network: Network,
        chosen: Sequence[int],
        ends: Sequence[int],
        labels: Sequence[Label] | None = None,
    ) -> None:
        place = {state: k for k, state in enumerate(chosen)}
        end = {state: k for k, state in enumerate(ends)}
        b, n = len(network.temperature_k), len(chosen)
        self.shape = b, len(network.edges)
        self.ways: dict[Label, Scaled] = {}
        self.ends = network.numbers.zeros((b, n, len(ends)))
        self.one_way: list[tuple[int, int, Label | None, int, int, Scaled]] = []
        for number, edge in enumerate(network.edges):
            label = labels[number] if labels is not None else ()
            back = tuple(-part for part in label)
            ways = ((edge.tail, edge.head, label), (edge.head, edge.tail, back))
            for way, (source, target, mark) in enumerate(ways):
                if source == target or not network.exists[way][number]:
                    continue
                if source not in place or (target not in place and target not in end):
                    continue
                rate = network.scaled[way][:, number]
                row = place[source]
                if target in place:
                    if mark not in self.ways:
                        self.ways[mark] = network.numbers.zeros((b, n, n))
                    matrix, column = self.ways[mark], place[target]
                else:
                    matrix, column = self.ends, end[target]
                matrix[:, row, column] = matrix[:, row, column] + rate
                kind = mark if target in place else None
                self.one_way.append((number, way, kind, row, column, rate))
        if not self.ways:
            self.ways[labels[0] if labels else ()] = network.numbers.zeros((b, n, n))

    def back(
        self, ways: Mapping[Label, FloatArray], ends: FloatArray, offset: int = 0
    ) -> tuple[FloatArray, FloatArray]:
        """Share a derivative by the matrices' entries out over the edges, shape (b, m) forward and reverse."""
        out = np.zeros((2, *self.shape))
        for number, way, label, row, column, rate in self.one_way:
            if label is None:
                whole, weight = self.ends[:, row, column], ends[:, offset + row, column]
            else:
                whole = self.ways[label][:, row, column]
                weight = ways[label][:, offset + row, column]
            out[way, :, number] += weight * fraction(rate, whole)
        return out[0], out[1]


def log_drive(affinity: FloatArray) -> FloatArray:
    """Return ln |1 - exp(-A)| of an affinity A over RT of either sign; -inf at equilibrium."""
    with np.errstate(divide="ignore"):
        return np.asarray(np.log(-np.expm1(-np.abs(affinity))) + np.maximum(-affinity, 0.0))


def count_end(counts: FloatArray, network: Network, end: End, sign: float) -> None:
    """Add what a state is made of, times `sign`, to counts over the network's species."""
    for name, count in end:
        counts[network.species.index(name)] += sign * count
