"""Random networks of 3 to 60 states against 500-digit arithmetic: the largest relative error of each rate.

Recorded, not timed; exits 1 where a rate is off by more than 1e-10. Takes minutes.
"""

from __future__ import annotations

import sys
from pathlib import Path

import mpmath as mp
import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1]))

from reference_networks import Exact, network_of, random_case

from thermo_pp.kinetics.closed import relaxation
from thermo_pp.kinetics.free import per_free_reactant
from thermo_pp.kinetics.pool import per_pool

LOW, HIGH, LIMIT = float(np.log(1e-60)), float(np.log(1e13)), 1e-10
SIZES = (3, 4, 6, 10, 15, 20, 30, 40, 50, 60)
REPEATS = 5


def main() -> int:
    """Print the largest error at each size."""
    worst = 0.0
    for n in SIZES:
        errors = {"free": 0.0, "pool": 0.0, "relaxation": 0.0}
        for repeat in range(REPEATS):
            rng = np.random.default_rng([n, repeat])
            case = random_case(rng, n, int(rng.integers(0, n)), LOW, HIGH)
            network, exact = network_of(case), Exact(case)
            rates = {
                "free": per_free_reactant(network, 0, [n - 1], [None])[0],
                "pool": per_pool(network, 0, [n - 1]).rate,
                "relaxation": relaxation(network, 0)[0],
            }
            for name, rate in rates.items():
                error = abs(mp.e ** mp.mpf(rate.log[0]) / getattr(exact, name)() - 1)
                errors[name] = max(errors[name], float(error))
        print(
            f"{n:3d} states: " + ", ".join(f"{name} {value:.1e}" for name, value in errors.items())
        )
        worst = max(worst, *errors.values())
    print(f"largest relative error {worst:.1e} (limit {LIMIT:g})")
    return 0 if worst <= LIMIT else 1


if __name__ == "__main__":
    sys.exit(main())
