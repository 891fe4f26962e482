"""A 60-state network, free + pool + controls over 50 temperatures, against stiff SciPy integrations.

The reference is one integration of the same network per temperature by SciPy's stiff method BDF with the
analytic Jacobian, to ten lifetimes of the pool, measured on a few of the temperatures in the same run; it
gives the pool's constant alone. LSODA, a compiled integrator, is shown beside it. Exits 1 below the target.
"""

from __future__ import annotations

import sys
import time
from dataclasses import replace
from pathlib import Path

import numpy as np
from scipy.integrate import solve_ivp
from threadpoolctl import threadpool_limits

sys.path.insert(0, str(Path(__file__).parents[1]))

from machine import report
from reference_networks import Case, network_of, random_case

from thermo_pp.kinetics.drained import Drained
from thermo_pp.kinetics.free import per_free_reactant
from thermo_pp.kinetics.network import Network
from thermo_pp.kinetics.pool import per_pool

STATES, EXTRA, TEMPERATURES, MEASURED, TARGET = 60, 40, 50, 4, 100.0


def networks() -> tuple[Network, list[Network]]:
    """Return one network over all temperatures, and one of each temperature."""
    case = random_case(np.random.default_rng(69), STATES, EXTRA, np.log(1e-4), np.log(1e13))
    singles = []
    for temperature in np.linspace(280.0, 360.0, TEMPERATURES):
        scale = 298.15 / temperature
        singles.append(
            network_of(
                Case(
                    tuple(np.array(case.states) * scale),
                    case.edges,
                    tuple(np.array(case.saddles) * scale),
                    case.enthalpies,
                )
            )
        )
    stacked = {
        name: np.concatenate([getattr(single, name) for single in singles])
        for name in (
            "temperature_k",
            "log_forward",
            "log_reverse",
            "energy_forward",
            "energy_reverse",
            "potential",
            "slope_j_mol",
        )
    }
    return replace(singles[0], **stacked), singles


def integrate(network: Network, decay: float, method: str) -> float:
    """Return the pool's decay constant from one stiff integration."""
    n = len(network.states) - 1
    rates = np.zeros((n, n))
    for k, edge in enumerate(network.edges):
        for source, target, log in (
            (edge.tail, edge.head, network.log_forward[0, k]),
            (edge.head, edge.tail, network.log_reverse[0, k]),
        ):
            if source < n:
                rates[source, source] -= np.exp(float(log))
                if target < n:
                    rates[target, source] += np.exp(float(log))
    start = np.zeros(n)
    start[0] = 1.0
    end = 10.0 / decay
    solution = solve_ivp(
        lambda t, y: rates @ y,
        (0.0, end),
        start,
        method=method,
        jac=lambda t, y: rates,
        rtol=1e-8,
        atol=1e-14,
        t_eval=[0.9 * end, end],
    )
    totals = solution.y.sum(axis=0)
    return float(np.log(totals[0] / totals[1]) / (0.1 * end))


def main() -> int:
    """Measure, print and compare."""
    network, singles = networks()
    product = STATES - 1

    def ours() -> np.ndarray:
        drained = Drained.of(network, 0, [product])
        per_free_reactant(network, 0, [product], [None], drained)
        return np.exp(per_pool(network, 0, [product], drained).rate.log)

    with threadpool_limits(1):
        decays = ours()
        took = []
        for _ in range(3):
            begin = time.perf_counter()
            ours()
            took.append(time.perf_counter() - begin)
        chosen = np.linspace(0, TEMPERATURES - 1, MEASURED).astype(int)
        reference = {}
        for method in ("LSODA", "BDF"):
            begin = time.perf_counter()
            found = [integrate(singles[k], decays[k], method) for k in chosen]
            reference[method] = (time.perf_counter() - begin) / MEASURED * TEMPERATURES
            worst = max(
                abs(value / decays[k] - 1.0) for value, k in zip(found, chosen, strict=True)
            )
            if worst > 1e-3:
                print(f"{method} disagrees with the eigenvalue by {worst:.2e}")
                return 1
    what = f"{STATES}-state network over {TEMPERATURES} temperatures"
    print(f"LSODA: {reference['LSODA'] / min(took):.1f} times")
    return report(what, min(took), reference["BDF"], TARGET)


if __name__ == "__main__":
    sys.exit(main())
