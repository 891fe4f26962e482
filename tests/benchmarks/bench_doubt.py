"""Monte Carlo over 10,000 samples and 50 temperatures of a 10-state network, against stiff integrations.

Ours: rates per free reactant and per pool, their Arrhenius energies, all controls, bands and
probabilities, in one batched run through the exact elimination. The reference, on a slice in the
same run: one integration by SciPy's LSODA (`solve_ivp`, analytic Jacobian, rtol 1e-8 and atol 1e-14
as in `bench_network.py`, and again with the looser rtol 1e-6 and atol 1e-12) to ten lifetimes of the
pool, which gives the pool's constant alone. Both in processor seconds of one thread, so that other
work on the machine does not count. Exits 1 below the target with either, where a constant differs,
or above 1 GiB.
"""

from __future__ import annotations

import resource
import sys
import tempfile
import time
from pathlib import Path

import numpy as np
from scipy.integrate import solve_ivp
from threadpoolctl import threadpool_limits

sys.path.insert(0, str(Path(__file__).parents[1]))

from chain_study import chain_text
from machine import report

from thermo_pp.kinetics.doubt.moved import moved
from thermo_pp.kinetics.doubt.sampling import sample
from thermo_pp.kinetics.model import Model, Rates
from thermo_pp.study.load import Study

STATES, EXTRA, TEMPERATURES, SAMPLES, MEASURED, TARGET = 10, 5, 50, 10_000, 12, 200.0
TOLERANCES = ((1e-8, 1e-14, 2e-3), (1e-6, 1e-12, 2e-2))  # rtol, atol, largest error of the constant
MOST_MIB = 1024.0
DOUBT = f"""
[doubt]
deviation = "4 kJ/mol"
saddle_deviation = "6 kJ/mol"
correlation = {{ same_kind = 0.5, across = 0.3 }}
samples = {SAMPLES}
alternatives = false
"""


def base_of(folder: Path) -> tuple[Study, Rates]:
    """Return the study and its rates without shifts."""
    file = folder / "study.toml"
    file.write_text(chain_text(STATES, EXTRA, TEMPERATURES, 5, DOUBT), encoding="utf-8")
    study = Study.load(file)
    model = Model(study.mechanism, study.conditions, study.treatment, study.species)
    return study, model.at(np.array(study.conditions.temperature_k))


def integrate(rates: Rates, row: int, decay: float, rtol: float, atol: float) -> float:
    """Return the pool's decay constant from one stiff integration."""
    network, product = rates.network, rates.products[0]
    n = len(network.states)
    matrix = np.zeros((n, n))
    for k, edge in enumerate(network.edges):
        for source, target, log in (
            (edge.tail, edge.head, network.log_forward[row, k]),
            (edge.head, edge.tail, network.log_reverse[row, k]),
        ):
            matrix[source, source] -= np.exp(float(log))
            matrix[target, source] += np.exp(float(log))
    pool = [k for k in range(n) if k != product]
    matrix = matrix[np.ix_(pool, pool)]
    start = np.zeros(n - 1)
    start[pool.index(rates.start)] = 1.0
    end = 10.0 / decay
    solution = solve_ivp(
        lambda t, y: matrix @ y,
        (0.0, end),
        start,
        method="LSODA",
        jac=lambda t, y: matrix,
        rtol=rtol,
        atol=atol,
        t_eval=[0.9 * end, end],
    )
    totals = solution.y.sum(axis=0)
    return float(np.log(totals[0] / totals[1]) / (0.1 * end))


def main() -> int:
    """Measure, print and compare."""
    with tempfile.TemporaryDirectory() as folder, threadpool_limits(1):
        study, base = base_of(Path(folder))
        uncertainty = study.uncertainty
        assert uncertainty is not None
        before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024.0
        few = uncertainty.drawn()[:MEASURED]
        chosen = moved(base, uncertainty, few)
        rows = [k * TEMPERATURES + (7 * k) % TEMPERATURES for k in range(MEASURED)]
        decays = np.exp(chosen.pool.rate.log)
        took = [0.0 for _ in TOLERANCES]
        worst = [0.0 for _ in TOLERANCES]
        ours = 0.0
        for half in (rows[: MEASURED // 2], None, rows[MEASURED // 2 :]):  # before and after ours
            begin = time.process_time()
            if half is None:
                sample(base, uncertainty, ("free", "pool"))
                ours = time.process_time() - begin
                continue
            for number, (rtol, atol, _) in enumerate(TOLERANCES):
                begin = time.process_time()
                found = [integrate(chosen, row, decays[row], rtol, atol) for row in half]
                took[number] += time.process_time() - begin
                for row, value in zip(half, found, strict=True):
                    if chosen.pool.slow_share[row] >= 0.5:  # else other decays are not over by then
                        worst[number] = max(worst[number], abs(value / decays[row] - 1.0))
    items = SAMPLES * TEMPERATURES
    memory = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024.0
    print(
        f"{items} items in {ours:.1f} s of one core; memory {memory:.0f} MiB (before: {before:.0f} MiB)"
    )
    status = 0
    for (rtol, atol, most), reference, error in zip(TOLERANCES, took, worst, strict=True):
        if error > most:
            print(f"LSODA at rtol {rtol:g} disagrees with the eigenvalue by {error:.2e}")
            return 1
        what = (
            f"{STATES}-state network, {SAMPLES} samples x {TEMPERATURES} temperatures, per item, LSODA "
            f"at rtol {rtol:g} and atol {atol:g}"
        )
        status = max(status, report(what, ours / items, reference / MEASURED, TARGET))
    return status if memory <= MOST_MIB else 1


if __name__ == "__main__":
    sys.exit(main())
