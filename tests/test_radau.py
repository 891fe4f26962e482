"""Time courses against a general reactor library, closed forms, conservation and equilibrium."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from mass_systems import CASES, Case, T
from threadpoolctl import threadpool_limits

from thermo_pp.kinetics.equilibrium import balanced, equilibrium
from thermo_pp.kinetics.mass_action import System
from thermo_pp.kinetics.radau import Run, fastest_rate, integrate, slowest_lifetime

TRACE = 1e-12


@pytest.fixture(autouse=True)
def _one_thread():
    with threadpool_limits(1):
        yield


def cantera_course(case: Case, system: System, times: np.ndarray) -> np.ndarray:
    """The same mechanism and constants in a closed, isothermal reactor of constant volume."""
    ct = pytest.importorskip("cantera")
    letters = sorted({letter for text in case.letters.values() for letter in text})
    lines = ["units: {length: m, quantity: kmol, time: s, activation-energy: J/kmol}", "elements:"]
    lines += [f"- {{symbol: X{a}, atomic-weight: 10.0}}" for a in letters]
    lines += ["phases:", "- name: gas", "  thermo: ideal-gas", "  kinetics: gas",
              f"  elements: [{', '.join('X' + a for a in letters)}]",
              f"  species: [{', '.join(system.names)}]", "species:"]  # fmt: skip
    for name in system.names:
        atoms = ", ".join(
            f"X{a}: {case.letters[name].count(a)}" for a in letters if a in case.letters[name]
        )
        lines += [f"- name: {name}", f"  composition: {{{atoms}}}",
                  "  thermo: {model: constant-cp, cp0: 29000.0}"]  # fmt: skip
    lines.append("reactions:")
    for number, equation in enumerate(case.equations):
        left, right = equation.split(" = ")
        for one, other, log in (
            (left, right, system.log_forward[number]),
            (right, left, system.log_reverse[number]),
        ):
            k = float(np.exp(log))
            lines += [f"- equation: {one} => {other}", "  duplicate: true",
                      f"  rate-constant: {{A: {k!r}, b: 0, Ea: 0}}"]  # fmt: skip
    gas = ct.Solution(yaml="\n".join(lines))
    start = case.start(system)
    gas.TPX = T, 1e3 * start.sum() * ct.gas_constant / 1e3 * T, start / start.sum()
    reactor = ct.IdealGasReactor(gas, energy="off", clone=False)
    net = ct.ReactorNet([reactor])
    net.rtol, net.atol = 1e-10, 1e-24
    net.max_steps = 10**6
    found = []
    for time in times:
        net.advance(time)
        found.append(reactor.phase.concentrations.copy())
    return np.array(found)


@pytest.mark.parametrize("case", CASES, ids=lambda case: case.name)
def test_against_cantera_and_to_the_equilibrium(case: Case) -> None:
    system = case.system()
    start = case.start(system)
    assert np.all(system.present(start))
    assert balanced(system)
    end = equilibrium(system, start)
    check_equilibrium(case, system, start, end)
    last = 10.0 * np.log(10.0) * slowest_lifetime(system, end)
    times = np.append(np.geomspace(0.1 / fastest_rate(system, start), 0.05 * last, 6), 4.0 * last)
    run = integrate(system, start, times)
    wanted = cantera_course(case, system, times[:-1])
    counts = wanted > TRACE * start.sum()
    assert counts.sum() > 0.3 * counts.size
    assert np.abs(run.concentration[:-1] / wanted - 1.0)[counts].max() < 1e-6
    check_conserved(case, system, start, run)
    # after the slowest lifetimes: the equilibrium from free energies alone
    big = end > TRACE * end.sum()
    assert np.abs(run.concentration[-1] / end - 1.0)[big].max() < 1e-8


def check_equilibrium(case: Case, system: System, start: np.ndarray, end: np.ndarray) -> None:
    """Every step has affinity 0 by G, and the elements are those of the start."""
    g = case.reduced()
    mu = np.log(end) + np.array([g[name] for name in system.names])
    assert np.abs(system.stoichiometry.T @ mu).max() < 1e-10
    atoms = case.elements(system)
    assert atoms @ end == pytest.approx(atoms @ start, rel=1e-12)


def check_conserved(case: Case, system: System, start: np.ndarray, run: Run) -> None:
    assert np.all(run.concentration >= 0.0)
    atoms = case.elements(system)
    kept = run.concentration @ atoms.T
    assert np.abs(kept / (atoms @ start) - 1.0).max() < 1e-12


def irreversible(*steps: tuple[str, float], reverse: float = 0.0) -> System:
    """Mass action of single steps with given constants, all reverse ones the same."""
    names = {name: "a" for equation, _ in steps for name in equation.split() if name.isalpha()}
    system = Case("", tuple(equation for equation, _ in steps), names, {}).system()
    with np.errstate(divide="ignore"):
        back = np.full(len(steps), np.log(reverse))
    return replace(system, log_forward=np.log([k for _, k in steps]), log_reverse=back)


def test_two_first_order_steps_have_their_closed_form() -> None:
    # checks.md 7.1: k1, k-1, k2 = 2, 5, 1 (computed, equal to scipy's expm)
    system = irreversible(("A = C", 2.0), ("C = P", 1.0))
    system = replace(system, log_reverse=np.array([np.log(5.0), -np.inf]))
    run = integrate(system, np.array([1.0, 0.0, 0.0]), np.array([1.0, 5.0]))
    wanted = [[0.592680407, 0.206297944, 0.201021649], [0.210843105, 0.073443290, 0.715713605]]
    assert run.concentration == pytest.approx(np.array(wanted), abs=6e-9)
    system = replace(system, log_reverse=np.log([5.0, 0.5]))
    run = integrate(system, np.array([1.0, 0.0, 0.0]), np.array([2.0, 100.0]))
    assert run.concentration[0] == pytest.approx([0.531989625, 0.201866281, 0.266144094], abs=2e-9)
    assert run.concentration[1] == pytest.approx([5 / 11, 2 / 11, 4 / 11], rel=1e-9)


def test_second_order_rate_laws() -> None:
    times = np.geomspace(1e-3, 1e9, 5)
    run = integrate(irreversible(("A + A = P", 3.0)), np.array([1.0, 0.0]), times)
    assert run.concentration[:, 0] == pytest.approx(1.0 / (1.0 + 6.0 * times), rel=1e-8)
    times = np.array([0.01, 0.1, 1.0, 5.0])
    run = integrate(irreversible(("A + B = P", 3.0)), np.array([1.0, 2.0, 0.0]), times)
    ratio = np.exp(3.0 * times)  # B/A = 2 exp((B0 - A0) k t)
    assert run.concentration[:, 0] == pytest.approx(1.0 / (2.0 * ratio - 1.0), rel=1e-7)


@pytest.mark.parametrize("seed", [1e-3, 1e-10, 1e-15])
def test_autocatalysis_is_the_logistic_curve(seed: float) -> None:
    run = integrate(
        irreversible(("A + B = B + B", 3.0)), np.array([1.0, seed]), np.array([4.0, 8.0, 12.0])
    )
    total = 1.0 + seed
    wanted = total / (1.0 + np.exp(-3.0 * total * run.time_s) / seed)
    assert run.concentration[:, 1] == pytest.approx(wanted, rel=5e-7)


def test_slow_steps_behind_a_fast_equilibrium_thirty_orders_apart() -> None:
    # A = C at 1e18 /s, C = P at 1e-12 /s: P grows with k2 K/(1 + K)
    system = irreversible(("A = C", 2e18), ("C = P", 1e-12))
    system = replace(system, log_reverse=np.log([5e18, 0.5e-12]))
    forth, back = 1e-12 * 2.0 / 7.0, 0.5e-12
    times = np.array([1e6, 1e10, 1e12, 1e14])
    run = integrate(system, np.array([1.0, 0.0, 0.0]), times)
    grown = forth / (forth + back) * -np.expm1(-(forth + back) * times)
    assert run.concentration[:, 2] == pytest.approx(grown, rel=1e-7)
    assert slowest_lifetime(system, run.concentration[-1]) == pytest.approx(
        1.0 / (forth + back), rel=1e-6
    )
    assert fastest_rate(system, run.concentration[-1]) == pytest.approx(7e18, rel=1e-6)
    assert run.slope[:2, 2] == pytest.approx(forth * np.exp(-(forth + back) * times[:2]), rel=1e-5)


def test_a_closed_loop_of_fast_steps_keeps_the_slow_way_out() -> None:
    # A, B, C in a loop of fast steps, and C = P: the loop carries nothing, P follows the pool
    system = irreversible(("A = B", 1e15), ("B = C", 1e15), ("C = A", 1e15), ("C = P", 1.0))
    system = replace(system, log_reverse=np.array([*np.log([1e15, 1e15, 1e15]), -np.inf]))
    run = integrate(system, np.array([1.0, 0.0, 0.0, 0.0]), np.array([0.3, 3.0]))
    assert run.concentration[:, 3] == pytest.approx(-np.expm1(-run.time_s / 3.0), rel=1e-7)


def test_two_slow_ways_out_of_a_fast_pair() -> None:
    """What flows along A = B must not stand in the rows of both slow steps: their sum would be lost."""
    system = irreversible(("A = P", 1e-3), ("B = P", 3e-3), ("A = B", 1e18))
    system = replace(system, log_reverse=np.array([-np.inf, -np.inf, np.log(1e18)]))
    start = np.array([1.0 if name == "A" else 0.0 for name in system.names])
    run = integrate(system, start, np.array([100.0, 1000.0]))
    grown = run.concentration[:, system.names.index("P")]
    assert grown == pytest.approx(-np.expm1(-2e-3 * run.time_s), rel=1e-7)


def test_a_trace_of_catalyst_is_conserved_while_it_turns_over_ten_billion_times() -> None:
    case = Case("", ("K + S = I", "I = K + P"), {"K": "k", "S": "s", "I": "ks", "P": "s"},
                {"K": 1e-10, "S": 1.0}, 1, (1e5, 1e6))  # fmt: skip
    system = case.system()
    start = case.start(system)
    end = equilibrium(system, start)
    run = integrate(system, start, np.geomspace(1.0, 30.0 * slowest_lifetime(system, end), 5))
    check_conserved(case, system, start, run)
    assert run.concentration[-1] == pytest.approx(end, rel=1e-8)


def test_responses_are_the_derivatives_of_the_course() -> None:
    case = CASES[4]
    system, h = case.system(), 1e-5
    start = case.start(system)
    times = np.array([1e-3, 1.0, 1e3])
    p = len(system.responses)
    run = integrate(system, start, times, response=np.zeros((len(start), p)))
    for column, name in enumerate(system.responses[:-1]):
        found = []
        for sign in (1.0, -1.0):
            moved = replace(
                system,
                log_forward=system.log_forward + sign * h * system.respond_forward[:, column],
                log_reverse=system.log_reverse + sign * h * system.respond_reverse[:, column],
            )
            found.append(integrate(moved, start, times))
        near = {"rel": 1e-3, "abs": 1e-7}
        for values, ups, downs in (
            (run.response, found[0].concentration, found[1].concentration),
            (run.slope_response, found[0].slope, found[1].slope),
        ):
            assert values[:, :, column] == pytest.approx((ups - downs) / (2 * h), **near), name


def test_the_order_of_the_method() -> None:
    """Errors fall as those of a method of order 5 with an estimate of order 3: the coefficients are right."""
    system = irreversible(("A + B = P", 3.0))
    exact = 1.0 / (2.0 * np.exp(1.5) - 1.0)
    errors = []
    for relative in (1e-3, 1e-6, 1e-9):
        run = integrate(system, np.array([1.0, 2.0, 0.0]), np.array([0.5]), relative=relative)
        errors.append(abs(run.concentration[0, 0] / exact - 1.0))
    assert errors[0] < 1e-3
    assert errors[1] < 1e-7
    assert errors[2] < 1e-10
