"""The exact rates of linear networks against 500-digit arithmetic and against closed forms."""

from __future__ import annotations

from dataclasses import replace

import mpmath as mp
import numpy as np
import pytest
from reference_networks import (
    FREQUENCY,
    RT,
    Case,
    Exact,
    exact_controls,
    network_of,
    random_case,
)

from thermo_pp.kinetics.closed import decay_shares, decays, relaxation
from thermo_pp.kinetics.cycle import per_cycle
from thermo_pp.kinetics.drained import Drained
from thermo_pp.kinetics.edges import LogRate
from thermo_pp.kinetics.elimination import Reduction
from thermo_pp.kinetics.free import Amount, per_free_reactant, steady_state
from thermo_pp.kinetics.pool import mean_times, per_pool
from thermo_pp.kinetics.scaled import Ordinary, Scaled

LOW, HIGH = float(np.log(1e-60)), float(np.log(1e13))
RATE_ERROR, CONTROL_ERROR, ENERGY_ERROR_KJ_MOL = 1e-10, 1e-8, 1e-8
SIZES = [(3, 0), (3, 2), (4, 1), (5, 3), (8, 2), (8, 8), (12, 3), (12, 12)]
ONE_TURN = (np.array([1.0]), 1.0)


def relative_error(rate: LogRate, exact: mp.mpf) -> float:
    return float(abs(mp.mpf(rate.sign[0]) * mp.e ** mp.mpf(rate.log[0]) / exact - 1))


def check_against(rate: LogRate, exact: Exact, name: str) -> None:
    value = getattr(exact, name)()
    value = value[0] if isinstance(value, tuple) else value
    assert relative_error(rate, value) <= RATE_ERROR
    case = exact.case
    n = len(case.states)
    energy = 1.0  # E_a/RT = 1 + sum of X H/RT
    for (kind, k), x in exact_controls(exact, name).items():
        ours = rate.saddles[0, k] if kind == "saddle" else -rate.species[0, k]
        assert ours == pytest.approx(x, abs=CONTROL_ERROR, rel=0.0)
        energy += x * case.enthalpies[k + (n if kind == "saddle" else 0)]
    assert rate.saddles.sum() == pytest.approx(1.0, abs=CONTROL_ERROR, rel=0.0)
    assert rate.energy_j_mol[0] / 1000.0 == pytest.approx(
        energy * RT / 1000.0, abs=ENERGY_ERROR_KJ_MOL, rel=0.0
    )


@pytest.mark.parametrize(("n", "extra"), SIZES)
@pytest.mark.parametrize("seed", [0, 1])
def test_random_network(n: int, extra: int, seed: int) -> None:
    case = random_case(np.random.default_rng([seed, n, extra]), n, extra, LOW, HIGH)
    network, exact = network_of(case), Exact(case)
    check_against(per_free_reactant(network, 0, [n - 1], [None])[0], exact, "free")
    check_against(per_pool(network, 0, [n - 1]).rate, exact, "pool")
    check_against(relaxation(network, 0)[0], exact, "relaxation")


@pytest.mark.parametrize("seed", [0, 1])
def test_network_with_rates_close_together(seed: int) -> None:
    """Where decays are close to each other, squaring the matrix must still tell them apart."""
    case = random_case(np.random.default_rng([seed, 77]), 8, 8, 0.0, 4.0)
    network, exact = network_of(case), Exact(case)
    check_against(per_pool(network, 0, [7]).rate, exact, "pool")
    check_against(relaxation(network, 0)[0], exact, "relaxation")


def cycle_case(seed: int, n: int, affinity: float) -> Case:
    rng = np.random.default_rng([seed, n])
    case = random_case(rng, n, int(rng.integers(1, n + 1)), LOW, HIGH)
    m = len(case.edges)
    crossing = [0] * m
    for k in rng.choice(m, max(1, m // 4), replace=False):
        crossing[k] = int(rng.choice([1, -1]))
    crossing[-1] = 1  # the last edge closes a loop, so that there is a cycle
    return replace(case, affinity=affinity, crossing=tuple(crossing))


@pytest.mark.parametrize("affinity", [1e-6, 1e-3, 1.0, 30.0, 1000.0, -1e-6, -2.0])
@pytest.mark.parametrize("n", [2, 3, 6])
def test_random_cycle(n: int, affinity: float) -> None:
    check_cycle(cycle_case(3, n, affinity))


@pytest.mark.parametrize("affinity", [1e-6, 1000.0])
def test_random_cycle_of_twelve(affinity: float) -> None:
    check_cycle(cycle_case(3, 12, affinity))


def check_cycle(case: Case) -> None:
    network = network_of(case)
    rate, states, shares = per_cycle(network, 0, ONE_TURN, endless=False, driven=False)
    with mp.workdps(1500):  # the reference's flux is a difference of fluxes: up to 10^450 is lost
        exact = Exact(case)
        check_against(rate, exact, "cycle")
        _, populations = exact.cycle()
    for column, state in enumerate(states):
        assert shares[0, column] == pytest.approx(float(populations[state]), rel=1e-10, abs=1e-300)
        # the control of a state of the catalyst is minus its population
        assert rate.species[0, state] == pytest.approx(
            shares[0, column], abs=CONTROL_ERROR, rel=0.0
        )


def test_sixty_states() -> None:
    case = random_case(np.random.default_rng(60), 60, 40, LOW, HIGH)
    network, exact = network_of(case), Exact(case)
    free = per_free_reactant(network, 0, [59], [None])[0]
    pool = per_pool(network, 0, [59]).rate
    assert relative_error(free, exact.free()) <= RATE_ERROR
    assert relative_error(pool, exact.pool()) <= RATE_ERROR
    for rate in (free, pool):
        assert rate.saddles.sum() == pytest.approx(1.0, abs=CONTROL_ERROR, rel=0.0)


@pytest.mark.parametrize("affinity", [1e-6, 1e-2, 5.0, -1e-6])
def test_product_that_is_there(affinity: float) -> None:
    """The net flux to a product close to equilibrium is no difference of fluxes."""
    case = random_case(np.random.default_rng(8), 6, 4, LOW, HIGH)
    network, exact = network_of(case), Exact(case)
    log_ratio = (
        np.longdouble(case.states[0]) - np.longdouble(case.states[-1]) - np.longdouble(affinity)
    )
    amount = Amount(np.array([log_ratio]), np.zeros(1))
    rate, _ = per_free_reactant(network, 0, [5], [amount])
    ratio = mp.e ** (mp.mpf(case.states[0]) - mp.mpf(case.states[-1]) - mp.mpf(affinity))
    assert relative_error(rate, exact.free(ratio)) <= RATE_ERROR


def constants(values: dict[tuple[int, int], float], n: int) -> Case:
    """A network of given constants, s^-1, by (from, to); every pair both ways."""
    states = [0.0] * n
    edges, saddles = [], []
    for (a, b), forth in values.items():
        if b < a:
            continue
        back = values[b, a]
        states[b] = states[a] - float(np.log(forth / back))
        edges.append((a, b))
        saddles.append(FREQUENCY + states[a] - float(np.log(forth)))
    return Case(tuple(states), tuple(edges), tuple(saddles), (0.0,) * (n + len(edges)))


# A = C -> P with k1 = 2, k-1 = 5, k2 = 1 s^-1: closed form of the two decays, by hand
IRREVERSIBLE = constants({(0, 1): 2.0, (1, 0): 5.0, (1, 2): 1.0, (2, 1): 0.5}, 3)
FAST, SLOW = 4.0 + np.sqrt(14.0), 4.0 - np.sqrt(14.0)  # (8 +- sqrt(64 - 8))/2


def test_two_steps() -> None:
    network = network_of(IRREVERSIBLE)
    free = per_free_reactant(network, 0, [2], [None])[0]
    assert np.exp(free.log[0]) == pytest.approx(1.0 / 3.0, rel=1e-14)
    assert free.saddles[0] == pytest.approx([1.0 / 6.0, 5.0 / 6.0], abs=1e-14)
    pool = per_pool(network, 0, [2])
    assert np.exp(pool.rate.log[0]) == pytest.approx(SLOW, rel=1e-13)
    assert pool.slow_share[0] == pytest.approx(1.034522, abs=5e-7, rel=0.0)
    assert pool.slow_share[0] == pytest.approx(FAST / (FAST - SLOW), rel=1e-13)
    assert np.exp(pool.log_inverse_mean_time[0]) == pytest.approx(0.25, rel=1e-14)
    found = decays(network, 0, pool.members, absorbing=True)
    assert np.exp(found[0].log_decay) == pytest.approx([SLOW, FAST], rel=1e-13)
    [(_, shares)] = decay_shares(network, 0, pool.members, found)
    assert shares == pytest.approx([FAST / (FAST - SLOW), -SLOW / (FAST - SLOW)], rel=1e-12)
    [(log_decay, again)] = pool.decay_shares()  # the way without detailed balance
    assert np.exp(log_decay) == pytest.approx([SLOW, FAST], rel=1e-12)
    assert again == pytest.approx(shares, rel=1e-12)


def test_two_steps_with_the_product_coming_back() -> None:
    """A = C = P with 2, 5, 1, 0.5 s^-1: both decays from the quadratic, by hand."""
    network = network_of(IRREVERSIBLE)
    rate, [found] = relaxation(network, 0)
    total, product = 8.5, 2 * 1 + 2 * 0.5 + 5 * 0.5
    slow = (total - np.sqrt(total**2 - 4 * product)) / 2
    assert np.exp(rate.log[0]) == pytest.approx(slow, rel=1e-13)
    assert np.exp(rate.log[0]) == pytest.approx(0.705638280311, abs=1e-12, rel=0.0)
    assert np.exp(found.log_decay[1]) == pytest.approx(7.794361719689, abs=1e-11, rel=0.0)


def test_steady_state_levels() -> None:
    levels = steady_state(network_of(IRREVERSIBLE), 0, [2], [None])
    assert np.exp(levels[1][0]) == pytest.approx(2.0 / 6.0, rel=1e-14)  # k1/(k-1 + k2)
    assert levels[2][0] == -np.inf


def span_case(temperature_k: float) -> tuple[Case, float]:
    """I = 0, -20, -35; T = 60, 50, 45; reaction -60 kJ/mol: a cycle of three states."""
    rt = 8.31446261815324e-3 * temperature_k
    states = [x / rt for x in (0.0, -20.0, -35.0)]
    saddles = [x / rt for x in (60.0, 50.0, 45.0)]
    case = Case(tuple(states), ((0, 1), (1, 2), (2, 0)), tuple(saddles), (0.0,) * 6)
    # the third step gives the product off: its reverse starts 60 kJ/mol lower
    return replace(case, affinity=60.0 / rt, crossing=(0, 0, 1)), rt


@pytest.mark.parametrize(
    ("temperature_k", "turnover", "digits"),
    [(298.15, 0.05876336813, 1e-9), (400.0, 280.293934, 1e-8)],
    # numerical steady state of the cycle by general-purpose libraries (an independent computation)
)
def test_energetic_span_cycle(temperature_k: float, turnover: float, digits: float) -> None:
    case, _ = span_case(temperature_k)
    rate, states, shares = per_cycle(network_of(case), 0, ONE_TURN, endless=False, driven=False)
    shares = shares[:, np.argsort(states)]
    scale = temperature_k / 298.15  # the networks here have the frequency factor of 298.15 K
    assert scale * np.exp(rate.log[0]) == pytest.approx(turnover, rel=digits)
    if temperature_k == 298.15:
        assert rate.saddles[0] == pytest.approx([3.07191e-4, 0.01735602, 0.98233679], abs=5e-9)
        assert shares[0] == pytest.approx([3.13340e-4, 0.01965920, 0.98002746], abs=5e-9)


def test_tree_weights() -> None:
    """Populations of three states with every pair joined, by the spanning trees: 197, 87, 50 of 334."""
    q = {(0, 1): 2.0, (0, 2): 3.0, (1, 0): 5.0, (1, 2): 7.0, (2, 0): 11.0, (2, 1): 13.0}
    # one loop is out of balance: its affinity goes into the surroundings of the edge 2 -> 0
    states = [0.0, -np.log(2.0 / 5.0), -np.log(2.0 / 5.0) - np.log(7.0 / 13.0)]
    edges = ((0, 1), (1, 2), (2, 0))
    saddles = tuple(FREQUENCY + states[a] - np.log(q[a, b]) for a, b in edges)
    affinity = float(np.log(q[2, 0]) - (states[2] + np.log(q[0, 2]) - states[0]))
    case = Case(tuple(states), edges, saddles, (0.0,) * 6, affinity, (0, 0, 1))
    _, states, shares = per_cycle(network_of(case), 0, ONE_TURN, endless=False, driven=False)
    assert shares[0, np.argsort(states)] == pytest.approx(
        [197 / 334, 87 / 334, 50 / 334], rel=1e-13
    )


@pytest.mark.parametrize("numbers", [Scaled, Ordinary])
def test_between_is_the_elimination_with_a_source_and_a_reward(numbers: type[Scaled]) -> None:
    """One elimination, and what passes along it afterwards, give what one with both from the start gives."""
    case = random_case(np.random.default_rng(31), 9, 6, 0.0, 9.0)
    network = replace(network_of(case), numbers=numbers)
    drained = Drained.of(network, 0, [8])
    n = len(drained.inside)
    source, reward = (numbers.from_float(np.linspace(a, 3.0, n)[np.newaxis]) for a in (1.0, 9.0))
    ways, ends = numbers.zeros((1, n + 1, n)), numbers.zeros((1, n + 1, 2))
    ways[:, 1:], ways[:, 0] = drained.edges.ways[()], source
    ends[:, 1:, :1], ends[:, 1:, 1] = drained.edges.ends, reward
    whole = Reduction({(): ways}, ends, np.array([1.0, 0.0]), sources=1)
    whole.eliminate_to(0)
    seed = np.zeros((1, 1, 2))
    seed[:, 0, 1] = -1.0
    expected = whole.gradient({}, seed)
    between = drained.reduced.between(source, reward)
    found = between.gradient(-1.0)
    assert between.out.to_float() == pytest.approx(whole.ends[:, 0, :1].to_float(), rel=1e-13)
    assert found.ways[()] == pytest.approx(expected.ways[()], rel=1e-12, abs=1e-15)
    assert found.ends == pytest.approx(expected.ends, rel=1e-12, abs=1e-15)


def test_mean_times_are_the_inverse() -> None:
    case = random_case(np.random.default_rng(32), 12, 9, 0.0, 9.0)
    drained = Drained.of(network_of(case), 0, [11])
    ways, ends = drained.edges.ways[()].to_float()[0], drained.edges.ends.to_float()[0]
    matrix = np.diag(ways.sum(axis=1) + ends.sum(axis=1)) - ways
    times = mean_times(drained.reduced).to_float()[0]
    assert times == pytest.approx(np.linalg.inv(matrix), rel=1e-8)


def test_pool_whose_slowest_step_is_its_first() -> None:
    """A -> B -> C -> P, no way back: what comes after the slowest step has no share in its right vector."""
    there_and_back = {(0, 1): 1e-3, (1, 0): 1.0, (1, 2): 5.0, (2, 1): 1.0, (2, 3): 2.0, (3, 2): 1.0}
    network = network_of(constants(there_and_back, 4))
    dead = np.full_like(network.log_reverse, -np.inf)
    pool = per_pool(replace(network, log_reverse=dead), 0, [3])
    assert np.exp(pool.rate.log[0]) == pytest.approx(1e-3, rel=1e-14)
    assert pool.rate.saddles[0] == pytest.approx([1.0, 0.0, 0.0], abs=1e-14)
    slow = [1.0, 1e-3 / 4.999, 1e-3 * 5.0 / (4.999 * 1.999)]  # of the slowest mode, by hand
    assert pool.populations[0] == pytest.approx(np.array(slow) / sum(slow), rel=1e-12)
