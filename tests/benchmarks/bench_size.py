"""Cost over size: rate per free reactant and per pool, E_a and controls, networks of 5 to 200 states.

Recorded, not judged: prints the processor time of one temperature and the slope of its logarithm over that of the
number of states, for sparse networks (a tree and half as many edges again) and for dense ones.
"""

from __future__ import annotations

import sys
import time
from dataclasses import replace
from pathlib import Path

import numpy as np
from threadpoolctl import threadpool_limits

sys.path.insert(0, str(Path(__file__).parents[1]))

from reference_networks import network_of, random_case

from thermo_pp.kinetics.drained import Drained
from thermo_pp.kinetics.free import per_free_reactant
from thermo_pp.kinetics.network import Network
from thermo_pp.kinetics.pool import per_pool

SIZES = (5, 10, 20, 50, 100, 200)
TEMPERATURES = 20


def network(states: int, extra: int) -> Network:
    """Return a random network, the same at every temperature."""
    one = network_of(
        random_case(np.random.default_rng(states), states, extra, np.log(1e-4), np.log(1e13))
    )
    names = ("temperature_k", "log_forward", "log_reverse", "energy_forward", "energy_reverse")
    tiled = {
        name: np.repeat(getattr(one, name), TEMPERATURES, axis=0)
        for name in (*names, "potential", "slope_j_mol")
    }
    return replace(one, **tiled)


def main() -> int:
    """Measure and print."""
    for kind in ("sparse", "dense"):
        costs = []
        for states in SIZES:
            extra = states // 2 if kind == "sparse" else min(states * (states - 1) // 4, 4000)
            asked = network(states, extra)
            product = states - 1
            took = []
            with threadpool_limits(1):
                for _ in range(3 if states <= 50 else 1):
                    begin = time.process_time()
                    drained = Drained.of(asked, 0, [product])
                    per_free_reactant(asked, 0, [product], [None], drained)
                    per_pool(asked, 0, [product], drained)
                    took.append(time.process_time() - begin)
            costs.append(min(took) / TEMPERATURES)
            print(
                f"{kind} {states:4d} states, {len(asked.edges):5d} edges: {costs[-1] * 1e3:.3f} ms"
            )
        logs, sizes = np.log(costs), np.log(SIZES)
        slope = np.polyfit(sizes[-4:], logs[-4:], 1)[0]
        print(f"{kind}: slope of ln(time) over ln(states), 20 to 200 states: {slope:.2f}")
    return 0


if __name__ == "__main__":
    sys.exit(main())
