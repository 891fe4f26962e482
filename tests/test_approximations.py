"""Pre-equilibrium, steady state and energetic span: values against closed forms, by hand."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from exact_study import CYCLE, HELD, Line, Member, Plan

from thermo_pp.kinetics.results import Approximation, Rate

R, BOLTZMANN, PLANCK = 8.31446261815324, 1.380649e-23, 6.62607015e-34
T = 298.15
RT = R * T / 1000.0  # kJ/mol
FREQUENCY = BOLTZMANN * T / PLANCK
ENTROPY = 200.0


def network(
    minima: Mapping[str, float],
    saddles: Mapping[str, tuple[str, str, float]],
    products: tuple[str, ...] = ("P",),
) -> Plan:
    """A network of isomers: G of minima and saddles in kJ/mol (equal entropies)."""
    members = {name: Member("CO", g, ENTROPY) for name, g in minima.items()}
    members |= {name: Member("CO", g, ENTROPY) for name, (_, _, g) in saddles.items()}
    steps = tuple(Line(f"{a} = {b}", "through", name) for name, (a, b, _) in saddles.items())
    return Plan(members, steps, {"reactant": "A", "product": products})


def k(start: float, saddle: float) -> float:
    """Eyring's constant over a barrier."""
    return float(FREQUENCY * np.exp((start - saddle) / RT))


def rates(plan: Plan, folder: Path) -> tuple[Rate, Rate]:
    result = plan.load(folder).effective()
    free, pool = result.rates["free"], result.rates["pool"]
    assert free is not None
    assert pool is not None
    return free, pool


def values(rate: Rate) -> dict[str, float]:
    return {one.name: float(one.rate_constant[0]) for one in rate.approximations}


def smallest(matrix: np.ndarray) -> float:
    """Slower root of a 2 x 2 decay matrix [[a, -b], [-c, d]], without cancellation."""
    (a, b), (c, d) = matrix
    total, product = a + d, a * d - b * c
    return float(2.0 * product / (total + np.sqrt(total**2 - 4.0 * product)))


def test_two_steps(tmp_path: Path) -> None:
    """A = C -> P: k2 K1, k2 K1/(1 + K1), k1 k2/(k-1 + k2), and the span."""
    g, t1, t2 = -4.0, 50.0, 53.0
    plan = network({"A": 0.0, "C": g, "P": -60.0}, {"T1": ("A", "C", t1), "T2": ("C", "P", t2)})
    free, pool = rates(plan, tmp_path)
    k1, back, k2 = k(0.0, t1), k(g, t1), k(g, t2)
    balance = k1 / back
    assert values(free) == pytest.approx(
        {"pre-equilibrium": k2 * balance, "energetic span": min(k1, k2 * balance)}, rel=1e-11
    )
    assert values(pool) == pytest.approx(
        {
            "pre-equilibrium, saturated": k2 * balance / (1.0 + balance),
            "steady state of all intermediates": k1 * k2 / (back + k2),
            "energetic span": min(k1, k2 * balance, k2),
        },
        rel=1e-11,
    )
    assert free.rate_constant[0] == pytest.approx(k1 * k2 / (back + k2), rel=1e-11)
    exact = smallest(np.array([[k1, -k1], [-back, back + k2]]))
    assert pool.rate_constant[0] == pytest.approx(exact, rel=1e-11)
    for rate in (free, pool):
        for one in rate.approximations:
            ratio = one.rate_constant[0] / rate.rate_constant[0]
            assert one.ratio[0] == pytest.approx(ratio, rel=1e-12)
            assert bool(one.windows) == (abs(ratio - 1.0) <= 0.05) == one.holds()[0]


def test_direct_step_has_no_pre_equilibrium(tmp_path: Path) -> None:
    plan = network({"A": 0.0, "P": -60.0}, {"T": ("A", "P", 70.0)})
    free, pool = rates(plan, tmp_path)
    assert values(free) == pytest.approx({"energetic span": k(0.0, 70.0)}, rel=1e-12)
    assert values(pool) == pytest.approx({"energetic span": k(0.0, 70.0)}, rel=1e-12)


@pytest.mark.parametrize(
    ("t1", "t2", "t3"),
    [(45.0, 40.0, 62.0), (45.0, 62.0, 40.0), (45.0, 55.0, 56.0), (70.0, 40.0, 62.0)],
)
def test_three_steps(t1: float, t2: float, t3: float, tmp_path: Path) -> None:
    """A = C = D -> P: the slow step is the one of smaller flux at equilibrium, never the first."""
    c, d = -3.0, -5.0
    plan = network(
        {"A": 0.0, "C": c, "D": d, "P": -60.0},
        {"T1": ("A", "C", t1), "T2": ("C", "D", t2), "T3": ("D", "P", t3)},
    )
    free, pool = rates(plan, tmp_path)
    k1, b1, k2, b2, k3 = k(0.0, t1), k(c, t1), k(c, t2), k(d, t2), k(d, t3)
    to_c, to_d = np.exp(-c / RT), np.exp(-d / RT)
    flux2, flux3 = to_c * k2, to_d * k3
    before = 1.0 + to_c if flux2 < flux3 else 1.0 + to_c + to_d
    assert values(free) == pytest.approx(
        {"pre-equilibrium": min(flux2, flux3), "energetic span": min(k1, flux2, flux3)}, rel=1e-10
    )
    exact = 1.0 / (1.0 / k1 + 1.0 / flux2 + 1.0 / flux3)
    assert free.rate_constant[0] == pytest.approx(exact, rel=1e-10)
    # one at steady state: the ways through it are shared out among its neighbours
    through_c = k1 * k2 / (b1 + k2), b2 * b1 / (b1 + k2)
    through_d = k2 * k3 / (b2 + k3)
    assert values(pool) == pytest.approx(
        {
            "pre-equilibrium, saturated": min(flux2, flux3) / before,
            "steady state of C": smallest(
                np.array([[through_c[0], -through_c[0]], [-through_c[1], through_c[1] + k3]])
            ),
            "steady state of D": smallest(np.array([[k1, -k1], [-b1, b1 + through_d]])),
            "steady state of all intermediates": exact,
            "energetic span": min(k1, flux2, flux3, flux2 / to_c, min(flux2, flux3) / to_c, k3),
        },
        rel=1e-10,
    )


def test_span_starts_at_the_deepest_member_of_the_pool(tmp_path: Path) -> None:
    """From the state and over the saddle that lie farthest apart, each named."""
    plan = network(
        {"A": 0.0, "C": -30.0, "D": -10.0, "P": -90.0},
        {"T1": ("A", "C", 20.0), "T2": ("C", "D", 33.0), "T3": ("D", "P", 31.0)},
    )
    free, pool = rates(plan, tmp_path)
    [of_pool] = [one for one in pool.approximations if one.name == "energetic span"]
    assert of_pool.rate_constant[0] == pytest.approx(k(-30.0, 33.0), rel=1e-11)
    assert of_pool.determining_state == ("C",)
    assert of_pool.determining_saddle == ("T2",)
    [of_free] = [one for one in free.approximations if one.name == "energetic span"]
    assert of_free.rate_constant[0] == pytest.approx(k(0.0, 33.0), rel=1e-11)
    assert of_free.determining_state == ("A",)
    assert of_free.determining_saddle == ("T2",)


def test_span_takes_the_easiest_way(tmp_path: Path) -> None:
    """Two ways, one with a lower highest saddle: that one is the way, its highest saddle the one."""
    plan = network(
        {"A": 0.0, "C": -5.0, "D": -6.0, "P": -60.0},
        {
            "T1": ("A", "C", 40.0),
            "T2": ("C", "P", 58.0),
            "T3": ("A", "D", 51.0),
            "T4": ("D", "P", 30.0),
        },
    )
    free, _ = rates(plan, tmp_path)
    [one] = [one for one in free.approximations if one.name == "energetic span"]
    assert one.rate_constant[0] == pytest.approx(k(0.0, 51.0), rel=1e-11)
    assert one.determining_saddle == ("T3",)


def test_parallel_ways_add_up(tmp_path: Path) -> None:
    """A = C -> P and A = D -> P, first steps fast: the cut goes through both second steps."""
    c, d = -4.0, 2.0
    plan = network(
        {"A": 0.0, "C": c, "D": d, "P": -60.0},
        {
            "T1": ("A", "C", 20.0),
            "T2": ("C", "P", 60.0),
            "T3": ("A", "D", 25.0),
            "T4": ("D", "P", 61.0),
        },
    )
    free, pool = rates(plan, tmp_path)
    flux = k(0.0, 60.0) + k(0.0, 61.0)
    weights = 1.0 + np.exp(-c / RT) + np.exp(-d / RT)
    assert values(free)["pre-equilibrium"] == pytest.approx(flux, rel=1e-10)
    assert values(pool)["pre-equilibrium, saturated"] == pytest.approx(flux / weights, rel=1e-10)
    # over single saddles the span sees the faster way only
    assert values(free)["energetic span"] == pytest.approx(k(0.0, 60.0), rel=1e-10)


def test_direct_way_beside_an_intermediate(tmp_path: Path) -> None:
    """A -> P beside A = C -> P: the cut takes both last steps."""
    plan = network(
        {"A": 0.0, "C": -4.0, "P": -60.0},
        {"T1": ("A", "C", 20.0), "T2": ("C", "P", 60.0), "T3": ("A", "P", 59.0)},
    )
    free, _ = rates(plan, tmp_path)
    assert values(free)["pre-equilibrium"] == pytest.approx(k(0.0, 60.0) + k(0.0, 59.0), rel=1e-10)


def test_dead_ends_count_in_the_saturated_form_alone(tmp_path: Path) -> None:
    """k2 K1/(1 + K1 + KD): the dead end holds some of the pool and lets nothing through."""
    c, d = -4.0, -7.0
    minima = {"A": 0.0, "C": c, "P": -60.0}
    saddles = {"T1": ("A", "C", 20.0), "T2": ("C", "P", 60.0)}
    without, _ = rates(network(minima, saddles), tmp_path)
    for start in ("A", "C"):
        plan = network({**minima, "D": d}, {**saddles, "T3": (start, "D", 30.0)})
        free, pool = rates(plan, tmp_path)
        assert values(free) == pytest.approx(values(without), rel=1e-11)
        weights = 1.0 + np.exp(-c / RT) + np.exp(-d / RT)
        ours = values(pool)["pre-equilibrium, saturated"]
        assert ours == pytest.approx(k(0.0, 60.0) / weights, rel=1e-10)


def test_slow_dead_end_still_counts_as_equilibrated(tmp_path: Path) -> None:
    """No way out of it crosses the cut, however slow it is."""
    plan = network(
        {"A": 0.0, "C": -4.0, "D": -7.0, "P": -60.0},
        {"T1": ("A", "C", 20.0), "T2": ("C", "P", 60.0), "T3": ("C", "D", 95.0)},
    )
    free, _ = rates(plan, tmp_path)
    assert values(free)["pre-equilibrium"] == pytest.approx(k(0.0, 60.0), rel=1e-10)


def test_competing_products_share_the_cut(tmp_path: Path) -> None:
    plan = network(
        {"A": 0.0, "C": -4.0, "P": -60.0, "Q": -55.0},
        {"T1": ("A", "C", 20.0), "T2": ("C", "P", 60.0), "T3": ("C", "Q", 61.0)},
        ("P", "Q"),
    )
    free, pool = rates(plan, tmp_path)
    assert values(free)["pre-equilibrium"] == pytest.approx(k(0.0, 60.0) + k(0.0, 61.0), rel=1e-10)
    assert free.branching is not None
    share = k(0.0, 60.0) / (k(0.0, 60.0) + k(0.0, 61.0))
    assert free.branching["P"][0] == pytest.approx(share, rel=1e-10)
    assert pool.branching is not None
    assert pool.branching["P"][0] == pytest.approx(share, rel=1e-10)


def test_product_that_is_there_is_no_part_of_an_approximation(tmp_path: Path) -> None:
    """They stand for the forward rate; the ratio to the exact net rate says what that costs."""
    plan = network(
        {"A": 0.0, "C": -4.0, "P": -10.0}, {"T1": ("A", "C", 20.0), "T2": ("C", "P", 60.0)}
    )
    without, _ = rates(plan, tmp_path)
    level = 0.5 * np.exp(10.0 / RT)  # half of what equilibrium with 1 mol/L of A would have
    held, _ = rates(replace(plan, held={"P": f"{float(level)!r} mol/L"}), tmp_path)
    assert values(held) == pytest.approx(values(without), rel=1e-11)
    assert held.rate_constant[0] == pytest.approx(0.5 * without.rate_constant[0], rel=1e-10)
    for one, other in zip(held.approximations, without.approximations, strict=True):
        assert one.ratio[0] == pytest.approx(2.0 * other.ratio[0], rel=1e-10)


# ---------------------------------------------------------------------------- catalytic cycles


def cycle(minima: list[float], saddles: list[float], reaction: float, t: float = T) -> Plan:
    """I1 + S -> I2 -> ... -> IN -> I1 + P, S and P at 1 mol/L with G such that each state has the given G."""
    n = len(minima)
    members = {"S": Member("CO", 0.0, 0.0), "P": Member("CO", reaction, 0.0)}
    steps = []
    for j, (low, high) in enumerate(zip(minima, saddles, strict=True)):
        members[f"I{j + 1}"] = Member("Ar" if j == 0 else "ArCO", low, 0.0)
        members[f"T{j + 1}"] = Member("ArCO", high, 0.0)
        here = "I1 + S" if j == 0 else f"I{j + 1}"
        there = "I1 + P" if j == n - 1 else f"I{j + 2}"
        steps.append(Line(f"{here} = {there}", "through", f"T{j + 1}"))
    question = {"catalyst": "I1", "product": "P"}
    held = {"S": "1.0 mol/L", "P": "1.0 mol/L"}
    return Plan(members, tuple(steps), question, held, (t,), "1 mol/L", "solution")


def turnover(
    minima: list[float], saddles: list[float], reaction: float, t: float
) -> tuple[float, float, str, str]:
    """Formula of Kozuch and Shaik: turnover frequency, span, and the saddle and state that determine it."""
    rt = R * t / 1000.0
    spans = {
        (i, j): saddles[i] - minima[j] - (reaction if i >= j else 0.0)
        for i in range(len(saddles))
        for j in range(len(minima))
    }
    total = sum(np.exp(span / rt) for span in spans.values())
    frequency = BOLTZMANN * t / PLANCK
    # measured from the state to the saddle in front of it
    ahead = {
        (i, j): saddles[i] - minima[j] + (0.0 if i >= j else reaction)
        for i in range(len(saddles))
        for j in range(len(minima))
    }
    (i, j), span = max(ahead.items(), key=lambda item: item[1])
    tof = frequency * np.expm1(-reaction / rt) / total
    return float(tof), float(span), f"T{i + 1}", f"I{j + 1}"


@pytest.mark.parametrize(
    ("t", "tof", "digits"), [(298.15, 0.05876336813, 1e-9), (400.0, 280.293934, 1e-8)]
)
def test_cycle_of_three_states(t: float, tof: float, digits: float, tmp_path: Path) -> None:
    """I = 0, -20, -35; T = 60, 50, 45; reaction -60 kJ/mol.

    Numbers by a numerical steady state with general-purpose libraries (an independent computation),
    the formula from S. Kozuch, S. Shaik, Acc. Chem. Res. 2011, 44, 101 (from memory).
    """
    minima, saddles, reaction = [0.0, -20.0, -35.0], [60.0, 50.0, 45.0], -60.0
    rate = cycle_rate(cycle(minima, saddles, reaction, t), tmp_path)
    formula, span, saddle, state = turnover(minima, saddles, reaction, t)
    assert rate.rate_constant[0] == pytest.approx(tof, rel=digits)
    assert formula == pytest.approx(tof, rel=digits)
    if t == T:
        control = [rate.control[name][0] for name in ("T1", "T2", "T3")]
        assert control == pytest.approx([3.07191e-4, 0.01735602, 0.98233679], abs=5e-9, rel=0.0)
        assert rate.populations is not None
        shares = [rate.populations[name][0] for name in ("I1", "I2", "I3")]
        assert shares == pytest.approx([3.13340e-4, 0.01965920, 0.98002746], abs=5e-9, rel=0.0)
        assert span == pytest.approx(80.0)
        [one] = rate.approximations
        assert one.rate_constant[0] == pytest.approx(0.0599609, abs=6e-8, rel=0.0)
        assert one.determining_saddle == (saddle,) == ("T3",)
        assert one.determining_state == (state,) == ("I3",)
        assert rate.resting_state == ("I3",)


def cycle_rate(plan: Plan, folder: Path) -> Rate:
    rate = plan.load(folder).effective().rates["cycle"]
    assert rate is not None
    return rate


@pytest.mark.parametrize("n", [2, 3, 4])
@pytest.mark.parametrize("seed", range(3))
def test_random_cycles(seed: int, n: int, tmp_path: Path) -> None:
    """The turnover frequency, and kT/h exp(-span/RT), by the formulas; also started at another state."""
    rng = np.random.default_rng([seed, n])
    minima = [0.0, *np.round(rng.uniform(-60.0, 10.0, n - 1), 2).tolist()]
    saddles = np.round(rng.uniform(30.0, 70.0, n), 2).tolist()
    reaction = round(float(rng.uniform(-120.0, -1.0)), 2)
    plan = cycle(minima, saddles, reaction)
    tof, span, saddle, state = turnover(minima, saddles, reaction, T)
    for catalyst in ("I1", f"I{n}"):
        named = replace(plan, question={"catalyst": catalyst, "product": "P"})
        rate = cycle_rate(named, tmp_path)
        assert rate.rate_constant[0] == pytest.approx(tof, rel=1e-10)
        [one] = rate.approximations
        assert one.rate_constant[0] == pytest.approx(FREQUENCY * np.exp(-span / RT), rel=1e-9)
        assert one.determining_saddle == (saddle,)
        assert one.determining_state == (state,)


@pytest.mark.parametrize("turned", [False, True])
def test_cycle_without_product_is_one_far_downhill(turned: bool, tmp_path: Path) -> None:
    """None of the product: the same span as with very little of it, however steps are written."""
    steps = CYCLE.steps
    if turned:
        steps = tuple(
            replace(step, equation=" = ".join(step.equation.split(" = ")[::-1])) for step in steps
        )
    for t in (280.0, 900.0):
        absent = cycle_rate(replace(CYCLE.at(t), steps=steps, held=HELD), tmp_path)
        little = cycle_rate(
            replace(CYCLE.at(t), steps=steps, held={**HELD, "P": "1e-60 mol/L"}), tmp_path
        )
        assert absent.rate_constant == pytest.approx(little.rate_constant, rel=1e-12)
        [one], [other] = absent.approximations, little.approximations
        assert one.rate_constant == pytest.approx(other.rate_constant, rel=1e-7)
        assert one.determining_saddle == other.determining_saddle
        assert one.determining_state == other.determining_state
        assert 1.0 <= one.ratio[0] < 4.0


def test_span_is_given_where_there_is_one_net_reaction(tmp_path: Path) -> None:
    """Two products of different affinity, or a driven cycle, have no common span."""
    members = {
        **CYCLE.species,
        "Q": Member("CH2O2", -60.0, 265.0),
        "T6": Member("ArCH2O2", -20.0, 280.0),
    }
    steps = (*CYCLE.steps, Line("KSW = K + Q", "through", "T6"))
    question = {"catalyst": "K", "product": ("P", "Q")}
    two = replace(CYCLE, species=members, steps=steps, question=question, held=HELD)
    assert cycle_rate(two, tmp_path).approximations == ()
    assert cycle_rate(replace(CYCLE, driven=True), tmp_path).approximations == ()
    [one] = cycle_rate(CYCLE, tmp_path).approximations
    assert isinstance(one, Approximation)


def test_driven_network_has_no_approximations(tmp_path: Path) -> None:
    """They start from equilibrium populations, which a driven network does not have."""
    plan = network(
        {"A": 0.0, "C": -4.0, "P": -60.0}, {"T1": ("A", "C", 20.0), "T2": ("C", "P", 60.0)}
    )
    for rate in rates(replace(plan, driven=True), tmp_path):
        assert rate.approximations == ()
