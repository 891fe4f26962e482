"""Mass action for tests, from equations, free energies drawn at random and reduced barriers."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass

import numpy as np
from mechanisms import mechanism

from thermo_pp.conditions import Conditions
from thermo_pp.formulas.rates import log_frequency_factor
from thermo_pp.kinetics.mass_action import System, mass_action
from thermo_pp.kinetics.steps import ElementaryRates, Energetics

T = 300.0


@dataclass(frozen=True)
class Case:
    """A mechanism with numbers: letters give compositions, `size` the spread of G/RT and barriers."""

    name: str
    equations: tuple[str, ...]
    letters: dict[str, str]
    initial: dict[str, float]
    seed: int = 1
    rates: tuple[float, float] = (1e-2, 1e4)
    spread: float = 6.0

    def reduced(self) -> dict[str, float]:
        """G/RT of every species at 1 mol/L."""
        draw = np.random.default_rng(self.seed)
        return {name: float(draw.uniform(-self.spread, 0.0)) for name in self.letters}

    def system(self) -> System:
        """The mass action, forward constants drawn evenly over their logarithm."""
        made = mechanism(*self.equations, letters=self.letters)
        g = self.reduced()
        names = tuple(g)
        draw = np.random.default_rng(self.seed + 1000)
        log_k = draw.uniform(*np.log(self.rates), len(made.steps))
        frequency = float(log_frequency_factor(T))
        left = np.array([sum(n * g[s] for s, n in step.reactants.items()) for step in made.steps])
        right = np.array([sum(n * g[s] for s, n in step.products.items()) for step in made.steps])
        # the constant is that of the downhill way, so that no way is faster than asked for
        saddle = frequency + np.maximum(left, right) - log_k
        energies = Energetics(
            names,
            np.array([T]),
            np.array([list(g.values())], dtype=np.longdouble),
            np.zeros((1, len(names))),
            grounds_kj_mol={},
            saddle_members={},
        )
        n = len(made.steps)
        rates = ElementaryRates(
            names=self.equations,
            saddle_reduced=saddle[np.newaxis].astype(np.longdouble),
            saddle_slope_j_mol=np.zeros((1, n)),
            log_forward=(frequency + left - saddle)[np.newaxis],
            log_reverse=(frequency + right - saddle)[np.newaxis],
            limited=np.zeros((1, n), np.bool_),
            log_kappa=np.zeros((1, n)),
            kappa_energy_j_mol=np.zeros((1, n)),
            log_limit=np.zeros((1, n)),
            limit_energy_j_mol=np.zeros((1, n)),
            log_transmission=np.zeros((1, n)),
            transmission_energy_j_mol=np.zeros((1, n)),
            collider_orders={},
            findings=(),
        )
        return mass_action(made, Conditions((T,)), energies, rates, {})[0]

    def start(self, system: System) -> np.ndarray:
        """Initial concentrations in the order of the system."""
        return np.array([self.initial.get(name, 0.0) for name in system.names])

    def elements(self, system: System) -> np.ndarray:
        """Atoms of every element in every species, shape (e, s)."""
        atoms = sorted({letter for text in self.letters.values() for letter in text})
        counts = [Counter(self.letters[name]) for name in system.names]
        return np.array([[c[a] for c in counts] for a in atoms], dtype=float)


def _oligomers(most: int, pairs: int, seed: int) -> Case:
    """Chains of one monomer that join: every step has two reactants."""
    draw = np.random.default_rng(seed)
    steps = {(1, k) for k in range(1, most)}
    while len(steps) < pairs:
        i, j = sorted(int(x) for x in draw.integers(1, most, 2))
        if i + j <= most:
            steps.add((i, j))
    return Case(
        f"{most} oligomers",
        tuple(f"A{i} + A{j} = A{i + j}" for i, j in sorted(steps)),
        {f"A{k}": "a" * k for k in range(1, most + 1)},
        {"A1": 1.0, "A2": 0.2},
        seed,
    )


def _exchange(width: int, seed: int) -> Case:
    """Blocks of two monomers on a grid: join, isomerise, swap."""
    grid = [(i, j) for i in range(width) for j in range(width) if i + j]
    letters = {f"B{i}{j}": "a" * i + "b" * j for i, j in grid}
    steps = []
    for i, j in grid:
        for k, m in ((1, 0), (0, 1), (1, 1)):
            if (i + k, j + m) in grid and (i, j) >= (k, m):
                steps.append(f"B{i}{j} + B{k}{m} = B{i + k}{j + m}")
    steps += [f"B{i}{j} + B{j}{i} = B{i}{i} + B{j}{j}" for i, j in grid if 0 < i < j]
    return Case(
        f"{len(grid)} blocks", tuple(steps), letters, {"B10": 1.0, "B01": 0.6, "B11": 0.1}, seed
    )


CASES = (
    Case("association", ("A + B = C", "C = P"), {"A": "a", "B": "b", "C": "ab", "P": "ab"},
         {"A": 1.0, "B": 0.5}),
    Case("dimer", ("A + A = D", "D = P"), {"A": "a", "D": "aa", "P": "aa"}, {"A": 0.3}, 2),
    Case("autocatalysis", ("A = B", "A + B = B + B"), {"A": "a", "B": "a"}, {"A": 1.0}, 3,
         (1e-5, 1e2), 20.0),
    Case("cross paths", ("A + B = C", "A + C = D", "B + D = E", "C + C = F", "F = D + B", "C = G"),
         {"A": "a", "B": "b", "C": "ab", "D": "aab", "E": "aabb", "F": "aabb", "G": "ab"},
         {"A": 1.0, "B": 1.0}, 4),
    Case("chain", ("I = R + R", "R + A = X + P", "X + B = R + Q", "R + R = M", "X + X = N", "R + X = O"),
         {"I": "rr", "R": "r", "A": "xp", "X": "x", "P": "rp", "B": "rq", "Q": "xq", "M": "rr",
          "N": "xx", "O": "rx"}, {"I": 1e-3, "A": 1.0, "B": 1.0}, 5, (1e-6, 1e8)),
    Case("enzyme", ("E + S = ES", "ES = EP", "EP = E + P", "E + P = EI", "ES + S = ESS"),
         {"E": "e", "S": "s", "ES": "es", "EP": "es", "P": "s", "EI": "es", "ESS": "ess"},
         {"E": 1e-4, "S": 1.0}, 6, (1e-1, 1e7)),
    Case("dimeric catalyst", ("C + C = C2", "C + S = CS", "CS = C + P", "CS + C = D"),
         {"C": "c", "C2": "cc", "S": "s", "CS": "cs", "P": "s", "D": "ccs"},
         {"C": 1e-3, "S": 1.0}, 7, (1e0, 1e6)),
    Case("three at once", ("A + A + B = C", "C + B = D + A", "D = E"),
         {"A": "a", "B": "b", "C": "aab", "D": "abb", "E": "abb"}, {"A": 1.0, "B": 1.5}, 8),
    _exchange(5, 9),
    _oligomers(30, 60, 10),
)  # fmt: skip
