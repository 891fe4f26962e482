"""All decays of a network in balance, and the relaxation of the closed one."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.edges import LogRate, count_end
from thermo_pp.kinetics.network import Network
from thermo_pp.kinetics.spectrum import OUTSIDE, Spectrum, spectrum

FloatArray = NDArray[np.float64]


def decays(network: Network, start: int, inside: Sequence[int], absorbing: bool) -> list[Spectrum]:
    """Return all decays at each temperature of the states `inside`; steps out of them absorb, or are left out."""
    place = {state: k for k, state in enumerate(inside)}
    numbers, tails, heads = [], [], []
    for number, edge in enumerate(network.edges):
        ends = place.get(edge.tail, OUTSIDE), place.get(edge.head, OUTSIDE)
        if (
            ends == (OUTSIDE, OUTSIDE)
            or edge.tail == edge.head
            or (OUTSIDE in ends and not absorbing)
        ):
            continue
        numbers.append(number)
        tails.append(ends[0])
        heads.append(ends[1])
    log_weight = log_weights(network, start, inside)
    found = []
    for k in range(len(network.temperature_k)):
        log_flux = [
            float(network.log_forward[k, number]) + log_weight[k, tail]
            if tail != OUTSIDE
            else float(network.log_reverse[k, number]) + log_weight[k, head]
            for number, tail, head in zip(numbers, tails, heads, strict=True)
        ]
        result = spectrum(log_weight[k], np.array(log_flux), tails, heads)
        steps = np.zeros((len(network.edges), result.steps.shape[1]))
        steps[numbers] = result.steps
        found.append(Spectrum(result.log_decay, result.states, steps))
    return found


def log_weights(network: Network, start: int, inside: Sequence[int]) -> FloatArray:
    """Return ln of the equilibrium populations of states over that of `start`, shape (b, n)."""
    counts = _dressing(network, start, inside)
    return np.asarray(network.potential @ counts.T.astype(np.longdouble), dtype=np.float64)


def _dressing(network: Network, start: int, inside: Sequence[int]) -> FloatArray:
    """Return what of each species makes ln pi of each state, shape (n, s)."""
    away = network.exchanged_from(start)
    counts = np.zeros((len(inside), len(network.species)))
    for row, state in enumerate(inside):
        count_end(counts[row], network, network.states[start], 1.0)
        count_end(counts[row], network, network.states[state], -1.0)
        for name, given in zip(network.held, away[state], strict=True):
            counts[row, network.species.index(name)] -= given
    return counts


def decay_shares(
    network: Network, start: int, inside: Sequence[int], found: Sequence[Spectrum]
) -> list[tuple[FloatArray, FloatArray]]:
    """Return at each temperature ln of the decay constants and their coefficients after a pulse of `start`."""
    half = 0.5 * log_weights(network, start, inside)
    place = list(inside).index(start)
    answers = []
    for row, one in enumerate(found):
        roots = np.exp(half[row] - half[row].max())
        at_start = one.states[place] / roots[place] if roots[place] else 0.0 * one.states[place]
        answers.append((one.log_decay, at_start * (roots @ one.states)))
    return answers


def relaxation(network: Network, start: int) -> tuple[LogRate, list[Spectrum]]:
    """Slowest decay but the zero one of the closed network that `start` belongs to."""
    inside = network.reached(start)
    found = decays(network, start, inside, absorbing=False)
    steps = np.array([one.steps[:, 0] ** 2 for one in found])
    states = np.array([one.states[:, 0] ** 2 for one in found])
    dressing = _dressing(network, start, inside)
    place = {state: k for k, state in enumerate(inside)}
    rows = [place.get(edge.tail, 0) for edge in network.edges]
    # ln of the flux at equilibrium is ln of the forward constant and ln pi of its tail
    species = steps @ (network.counts_forward + dressing[rows]) - states @ dressing
    dressed_slope = -network.slope_j_mol @ dressing.T  # R T^2 d ln pi/dT
    energy = (steps * (network.energy_forward + dressed_slope[:, rows])).sum(axis=1)
    energy -= (states * dressed_slope).sum(axis=1)
    b = len(network.temperature_k)
    log = np.array([one.log_decay[0] for one in found])
    return LogRate(log, np.ones(b), steps, species, energy), found
