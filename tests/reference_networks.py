"""Random linear networks, and their rates in 500-digit arithmetic (mpmath), to test the elimination against.

The reference uses ordinary Gaussian elimination and power iteration with 500 digits, nothing of the
package, and derivatives by a difference of 1e-120.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import mpmath as mp
import numpy as np

from thermo_pp.kinetics.network import Edge, Network

T = 298.15
RT = 8.31446261815324 * T
FREQUENCY = float(np.log(1.380649e-23 * T / 6.62607015e-34))
mp.mp.dps = 500


@dataclass(frozen=True)
class Case:
    """States and saddles as G/RT;

    state 0 is the reactant (or catalyst), the last one the product.
    """

    states: tuple[float, ...]
    edges: tuple[tuple[int, int], ...]
    saddles: tuple[float, ...]
    enthalpies: tuple[float, ...]  # of states, then saddles, in RT
    affinity: float = 0.0  # of the cycle: lies on the edges of `crossing`
    crossing: tuple[int, ...] = ()  # product given off along each edge


def random_case(rng: np.random.Generator, n: int, extra: int, low: float, high: float) -> Case:
    """Draw a tree over n states and `extra` edges;

    constants lie between exp(low) and exp(high) s^-1.
    """
    span = high - low
    states = rng.uniform(0.0, span / 2, n)
    edges = [(int(rng.integers(max(0, k - 3), k)), k) for k in range(1, n)]
    while len(edges) < n - 1 + extra:
        a, b = sorted(int(x) for x in rng.choice(n, 2, replace=False))
        edges.append((a, b))
    # ln k = FREQUENCY - saddle + state
    low_saddle, high_saddle = states.max() + FREQUENCY - high, states.min() + FREQUENCY - low
    saddles = rng.uniform(low_saddle, high_saddle, len(edges))
    enthalpies = rng.uniform(-40.0, 40.0, n + len(edges))
    return Case(tuple(states), tuple(edges), tuple(saddles), tuple(enthalpies))


def network_of(case: Case) -> Network:
    """Build the package's network:

    state names S0, S1, ...; the cycle's surroundings are one held species H.
    """
    n, m = len(case.states), len(case.edges)
    cycle = any(case.crossing)
    species = tuple(f"S{k}" for k in range(n)) + (("H",) if cycle else ())
    potential = np.array([[*case.states, *([-case.affinity] if cycle else [])]], np.longdouble)
    slope = np.array([[*case.enthalpies[:n], *([0.0] if cycle else [])]]) * RT
    forward, reverse = np.zeros((m, len(species))), np.zeros((m, len(species)))
    for k, (a, b) in enumerate(case.edges):
        forward[k, a] = 1.0
        reverse[k, b] = 1.0
        if cycle and case.crossing[k]:
            # the product H stands on the right of a forward crossing
            (reverse if case.crossing[k] > 0 else forward)[k, n] += abs(case.crossing[k])
    saddles = np.array(case.saddles, np.longdouble)
    logs = [FREQUENCY + potential @ c.T.astype(np.longdouble) - saddles for c in (forward, reverse)]
    heights = np.array(case.enthalpies[n:]) * RT
    energies = [RT + heights - slope @ c.T for c in (forward, reverse)]
    product = np.array([float(x) for x in case.crossing] if cycle else [0.0] * m)
    return Network(
        temperature_k=np.array([T]),
        states=tuple(((f"S{k}", 1),) for k in range(n)),
        species=species,
        held=("H",) if cycle else (),
        edges=tuple(Edge(k, a, b) for k, (a, b) in enumerate(case.edges)),
        log_forward=logs[0],
        log_reverse=logs[1],
        energy_forward=energies[0],
        energy_reverse=energies[1],
        counts_forward=forward,
        counts_reverse=reverse,
        potential=potential,
        slope_j_mol=slope,
        exchange=product[:, np.newaxis] if cycle else np.zeros((m, 0)),
        product_change=product,
        equilibrium={},
    )


class Exact:
    """The same network with 500 digits; energies may be shifted before a rate is asked for."""

    def __init__(self, case: Case) -> None:
        self.case = case
        self.states = [mp.mpf(x) for x in case.states]
        self.saddles = [mp.mpf(x) for x in case.saddles]
        self.affinity = mp.mpf(case.affinity)

    def constants(self) -> list[tuple[mp.mpf, mp.mpf]]:
        """Return forward and reverse constants of every edge."""
        found = []
        crossing = self.case.crossing or (0,) * len(self.saddles)
        for (a, b), saddle, cross in zip(self.case.edges, self.saddles, crossing, strict=True):
            base = mp.mpf(FREQUENCY) - saddle
            back = -cross * self.affinity if cross > 0 else 0
            forth = cross * self.affinity if cross < 0 else 0
            found.append(
                (mp.e ** (base + self.states[a] + forth), mp.e ** (base + self.states[b] + back))
            )
        return found

    def matrix(self) -> mp.matrix:
        """Return M with M[i, i] the sum of all ways out of i, M[i, j] minus the ways to j."""
        n = len(self.states)
        m = mp.zeros(n, n)
        for (a, b), (forth, back) in zip(self.case.edges, self.constants(), strict=True):
            m[a, a] += forth
            m[a, b] -= forth
            m[b, b] += back
            m[b, a] -= back
        return m

    def free(self, ratio: mp.mpf | None = None) -> mp.mpf:
        """Net flux to the last state over the first, the last at `ratio` times the first (0 if None)."""
        m, n = self.matrix(), len(self.states)
        product = mp.mpf(0) if ratio is None else ratio
        inner = m[1 : n - 1, 1 : n - 1]
        right = mp.matrix([-(m[0, k] + product * m[n - 1, k]) for k in range(1, n - 1)])
        levels = mp.lu_solve(inner.T, right) if n > 2 else []
        into = -m[0, n - 1] - product * m[n - 1, n - 1]
        return into + sum(-levels[k] * m[k + 1, n - 1] for k in range(n - 2))

    def pool(self) -> mp.mpf:
        """Slowest decay with the last state absorbing."""
        n = len(self.states)
        return 1 / _largest(mp.inverse(self.matrix()[: n - 1, : n - 1]))

    def relaxation(self) -> mp.mpf:
        """Slowest decay but the zero one, states of equal weight in a symmetric form."""
        n = len(self.states)
        m = self.matrix()
        weights = [mp.e ** (self.states[0] - g) for g in self.states]
        root = [mp.sqrt(w) for w in weights]
        symmetric = mp.matrix(n, n)
        for i in range(n):
            for j in range(n):
                symmetric[i, j] = m[i, j] * root[i] / root[j]
        total = sum(weights)
        # put the zero decay far away, then take the inverse
        top = max(abs(symmetric[i, i]) for i in range(n)) * 10
        for i in range(n):
            for j in range(n):
                symmetric[i, j] += top * root[i] * root[j] / total
        return 1 / _largest(mp.inverse(symmetric))

    def cycle(self) -> tuple[mp.mpf, list[mp.mpf]]:
        """Return the net product per total catalyst, and the populations."""
        m, n = self.matrix(), len(self.states)
        left = m.T
        for k in range(n):
            left[n - 1, k] = 1
        share = mp.lu_solve(left, mp.matrix([0] * (n - 1) + [1]))
        flux = mp.mpf(0)
        for (a, b), (forth, back), cross in zip(
            self.case.edges, self.constants(), self.case.crossing, strict=True
        ):
            flux += cross * (share[a] * forth - share[b] * back)
        return flux, list(share)

    def shifted(self, kind: str, number: int, by: mp.mpf) -> Exact:
        """Return the network with one energy moved."""
        other = Exact(replace(self.case))
        other.states, other.saddles = list(self.states), list(self.saddles)
        (other.states if kind == "state" else other.saddles)[number] += by
        return other


def _largest(matrix: mp.matrix) -> mp.mpf:
    """Return the largest eigenvalue of a matrix whose powers become dominated by it."""
    power = matrix.copy()
    scale = mp.mpf(0)
    for k in range(1, 2000):
        top = max(abs(power[i, j]) for i in range(power.rows) for j in range(power.cols))
        power = power / top
        scale = 2 * scale + mp.log(top) if k > 1 else mp.log(top)
        power = power * power
        trace = sum(power[i, i] for i in range(power.rows))
        size = range(power.rows)
        square = sum(power[i, j] * power[j, i] for i in size for j in size)
        if abs(square / trace**2 - 1) < mp.mpf(10) ** -60:
            break
    vector = mp.matrix([sum(power[i, j] for j in range(power.cols)) for i in range(power.rows)])
    for _ in range(3):
        vector = matrix * vector
        vector = vector / max(abs(x) for x in vector)
    image = matrix * vector
    best = max(range(len(vector)), key=lambda k: abs(vector[k]))
    return image[best] / vector[best]


STEP = mp.mpf(10) ** -120


def exact_controls(exact: Exact, name: str) -> dict[tuple[str, int], float]:
    """Return d ln r/d(-G/RT) of every state and saddle."""

    def log(network: Exact) -> mp.mpf:
        value = getattr(network, name)()
        return mp.log(abs(value[0] if isinstance(value, tuple) else value))

    here = log(exact)
    numbers = [("state", k) for k in range(len(exact.states))]
    numbers += [("saddle", k) for k in range(len(exact.saddles))]
    return {
        (kind, k): float((here - log(exact.shifted(kind, k, STEP))) / STEP) for kind, k in numbers
    }
