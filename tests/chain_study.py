"""Declared studies of any size, drawn at random: minima and saddle points of one composition."""

from __future__ import annotations

import numpy as np


def chain_text(states: int, extra: int, temperatures: int, seed: int, doubt: str = "") -> str:
    """Return a study of states S0 (reactant) to S{states-1} (product), a tree and `extra` edges.

    Enthalpies of minima within 40 kJ/mol, of saddle points 20 to 90 kJ/mol above the higher end: rate
    constants over twelve orders of magnitude at room temperature, a stiff network.
    """
    rng = np.random.default_rng(seed)
    heights = rng.uniform(0.0, 40.0, states)
    edges = [(int(rng.integers(max(0, k - 3), k)), k) for k in range(1, states)]
    while len(edges) < states - 1 + extra:
        a, b = sorted(int(x) for x in rng.choice(states, 2, replace=False))
        edges.append((a, b))
    lines = ["[conditions]"]
    step = 80.0 / max(temperatures - 1, 1)
    listed = ", ".join(f'"{280.0 + k * step:.6f} K"' for k in range(temperatures))
    lines.append(f"temperatures = [{listed}]")
    for k, height in enumerate(heights):
        entropy = 300.0 + rng.uniform(-20.0, 20.0)
        lines += _species(f"S{k}", height, entropy)
    for k, (a, b) in enumerate(edges):
        top = max(heights[a], heights[b]) + rng.uniform(20.0, 90.0)
        lines += _species(f"T{k}", top, 300.0 + rng.uniform(-30.0, 10.0))
    for k, (a, b) in enumerate(edges):
        lines += ["[[steps]]", f'equation = "S{a} = S{b}"', f'through = "T{k}"']
    lines += ["[effective]", 'reactant = "S0"', f'product = "S{states - 1}"', doubt]
    return "\n".join(lines)


def _species(name: str, enthalpy: float, entropy: float) -> list[str]:
    return [
        f"[species.{name}]",
        'composition = "C6H12"',
        f'enthalpy = "{enthalpy:.6f} kJ/mol"',
        f'entropy = "{entropy:.6f} J/mol/K"',
    ]
