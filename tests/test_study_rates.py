"""Rates of declared studies, from the file to the result, against an independent reference with many digits.

The reference (exact_study.py) is written from docs/methods.md alone. What is compared is what a user
gets: rate constants, Arrhenius energies, controls, orders, populations, reversibilities.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path

import mpmath as mp
import numpy as np
import pytest
from exact_study import (
    BRANCHED,
    CATALYST,
    CYCLE,
    CYCLE_STEPS,
    HELD,
    MEMBERS,
    QUESTION,
    STEPS,
    Line,
    Member,
    Plan,
    Reference,
    arrhenius_energy,
    controls,
    without,
)

from thermo_pp.kinetics.results import EffectiveRate, Rate
from thermo_pp.study.load import Study

RATE_ERROR, ENERGY_ERROR_KJ_MOL, CONTROL_ERROR, SUM_RULE_ERROR = 1e-10, 1e-8, 1e-8, 1e-9


def numbers_of(plan: Plan, saddle: str) -> list[int]:
    """Which steps go by this name."""
    return [
        k
        for k, step in enumerate(plan.steps)
        if saddle == (step.value if step.key == "through" else step.equation)
    ]


def products_of(plan: Plan) -> tuple[str, ...]:
    product = plan.question["product"]
    return (product,) if isinstance(product, str) else tuple(product)


def check(
    plan: Plan,
    folder: Path,
    definitions: Sequence[str],
    *,
    with_controls: bool = True,
    digits: int = 200,
    rate_error: float = RATE_ERROR,
    relative: float = 0.0,
) -> EffectiveRate:
    """Compare one study with the reference.

    `relative` adds to the tolerances of controls and energies where these are large themselves.
    """
    result = plan.load(folder).effective()
    assert {name for name, rate in result.rates.items() if rate is not None} == {*definitions}
    for definition in definitions:
        rate = result.rates[definition]  # type: ignore[index]
        assert rate is not None
        for k, t in enumerate(plan.temperatures):
            reference = Reference(plan, mp.mpf(t), digits=digits)
            with mp.workdps(digits):
                exact = reference.rate(definition)
                assert abs(mp.mpf(float(rate.rate_constant[k])) / exact - 1) <= rate_error
            energy = float(arrhenius_energy(plan, t, definition, digits))
            assert rate.arrhenius_energy_kj_mol[k] == pytest.approx(
                energy, abs=ENERGY_ERROR_KJ_MOL, rel=relative
            )
            if with_controls and k == 0:
                whats = {
                    name: numbers_of(plan, name) if name in rate.saddles else [name]
                    for name in rate.control
                }
                wanted = controls(
                    reference, definition, [what for some in whats.values() for what in some]
                )
                for name, values in rate.control.items():
                    assert values[k] == pytest.approx(
                        sum(wanted[what] for what in whats[name]), abs=CONTROL_ERROR, rel=relative
                    ), name
        check_sum_rules(plan, rate, max(1.0, 1e3 * relative))
    return result


def check_sum_rules(plan: Plan, rate: Rate, scale: float = 1.0) -> None:
    t = len(rate.rate_constant)
    near = {"abs": SUM_RULE_ERROR * scale, "rel": 0.0}
    assert sum(rate.control[name] for name in rate.saddles) == pytest.approx(np.ones(t), **near)
    # an effective saddle has the composition of its step's reactants
    balance: dict[str, np.ndarray] = {}
    for name, values in rate.control.items():
        if name in rate.saddles:
            step = plan.steps[numbers_of(plan, name)[0]]
            counts = step.sides()[0]
        else:
            counts = {name: 1}
        for member, count in counts.items():
            for element, number in plan.species[member].atoms.items():
                balance[element] = balance.get(element, np.zeros(t)) + values * count * number
    for element, total in balance.items():
        assert total == pytest.approx(np.zeros(t), **near), element
    for name, order in rate.orders.items():
        assert np.array_equal(rate.control[name], 0.0 - order)
    for name, text in plan.held.items():
        if text == "equilibrium":
            assert np.all(rate.control[name] == 0.0)
            assert name not in rate.orders
    if rate.definition == "cycle":
        assert rate.populations is not None
        for name, share in rate.populations.items():
            assert rate.control[name] == pytest.approx(-share, **near)
        assert sum(rate.populations.values()) == pytest.approx(np.ones(t), **near)
    elif rate.definition == "free" and not any(p in plan.held for p in products_of(plan)):
        known = {plan.question["reactant"], *plan.held}
        assert rate.control[plan.question["reactant"]] == pytest.approx(-np.ones(t), **near)
        for name, values in rate.control.items():
            if name not in rate.saddles and name not in known:
                assert values == pytest.approx(np.zeros(t), **near), name


ALL = ("free", "pool", "relaxation")


@pytest.mark.parametrize("state", ["1 bar", "1 atm", "1 mol/L"])
def test_three_intermediates_with_branch_dead_end_and_loop(state: str, tmp_path: Path) -> None:
    plan = replace(BRANCHED.at(200.0, 500.0), standard_state=state)
    check(plan, tmp_path, ALL, with_controls=state == "1 bar")


def test_species_with_states_and_heat_capacities_of_their_own(tmp_path: Path) -> None:
    members = {
        **MEMBERS,
        "W": replace(MEMBERS["W"], standard_state="55.34 mol/L", heat_capacity=75.3),
        "C1": replace(MEMBERS["C1"], heat_capacity=60.0),
        "T1": replace(MEMBERS["T1"], heat_capacity=48.0, standard_state="2 bar"),
        "TP": replace(MEMBERS["TP"], heat_capacity=-10.0),
    }
    check(replace(BRANCHED, species=members), tmp_path, ALL)


@pytest.mark.parametrize("state", ["1 bar", "1 mol/L"])
def test_held_as_a_partial_pressure_and_equilibrium_by_way_of_equilibrium(
    state: str, tmp_path: Path
) -> None:
    """W3 follows from W2, and W2 from W, whatever their order in the file; W3 carries a channel."""
    members = {
        **MEMBERS,
        "W3": Member("(H2O)3", -40.0, 360.0),
        "T5": Member("CH6O4", -30.0, 380.0),
    }
    steps = (
        Line("W3 = W2 + W", "rate", "1e7 s^-1"),
        *STEPS,
        Line("A + W3 = P + 2 W", "through", "T5"),
    )
    held = {"W3": "equilibrium", "W2": "equilibrium", "W": "3000 Pa"}
    plan = replace(BRANCHED, species=members, steps=steps, held=held, standard_state=state)
    result = check(plan, tmp_path, ALL)
    for k, t in enumerate(plan.temperatures):
        exact = Reference(plan, mp.mpf(t)).held
        for name, values in result.held_mol_l.items():
            assert values[k] == pytest.approx(float(exact[name]), rel=1e-12), name


@pytest.mark.parametrize(
    ("state", "held", "shift"),
    [("1 bar", "0.02 mol/L", 1.0), ("1 bar", "50 Pa", 0.0), ("1 mol/L", "0.02 mol/L", 0.0), ("1 mol/L", "50 Pa", -1.0)],
)  # fmt: skip
def test_arrhenius_energy_from_controls_and_orders(
    state: str, held: str, shift: float, tmp_path: Path
) -> None:
    """E_a = RT + sum X H + RT sum n t, t = 1 for p-form at a concentration, -1 for c-form at a pressure.

    No step here has two molecules on a side, so that every saddle is its own.
    """
    members = {
        **without(MEMBERS, "W2", "C3", "T3", "T4"),
        "C4": Member("CH6O4", -75.0, 420.0),
        "T6": Member("CH6O4", -2.0, 400.0),
        "T7": Member("CH6O4", 3.0, 410.0),
        "T1": Member("CH4O3", 10.0, 400.0),
        "T2": Member("CH4O3", 25.0, 401.0),
        "C1": Member("CH4O3", -45.0, 380.0),
        "C2": Member("CH4O3", -30.0, 370.5),
        "D": Member("CH4O3", -60.0, 360.0),
        "TD": Member("CH4O3", 12.0, 340.0),
        "T12": Member("CH4O3", 20.0, 345.0),
        "P": Member("CH4O3", -110.0, 360.0),
        "TP": Member("CH4O3", 35.0, 395.0),
    }
    steps = (
        Line("A + 2 W = C1", "through", "T1"),
        Line("A + 2 W = C2", "through", "T2"),
        Line("C1 = C2", "through", "T12"),
        Line("A + 3 W = C4", "through", "T6"),
        Line("C4 + 2 W = P + 3 W", "through", "T7X"),
        Line("C1 = D", "through", "TD"),
        Line("C2 = P", "through", "TP"),
    )
    members["T7X"] = Member("CH10O6", -20.0, 790.0)
    del members["T7"]
    plan = Plan(members, steps, QUESTION, {"W": held}, (260.0, 330.0), standard_state=state)
    result = check(plan, tmp_path, ALL, with_controls=False)
    for rate in result.rates.values():
        if rate is None:
            continue
        rt = 8.31446261815324e-3 * np.array(plan.temperatures)
        energy = rt + rt * shift * rate.orders["W"]
        for name, values in rate.control.items():
            energy = energy + values * members[name].enthalpy
        assert rate.arrhenius_energy_kj_mol == pytest.approx(energy, abs=1e-8, rel=0.0)


def product_at(plan: Plan, t: float, affinity: float, digits: int = 900) -> Plan:
    """Hold the product so that S + W = P (or A + W = P) has this affinity over RT, as nearly as a double can."""
    start = "S" if "catalyst" in plan.question else "A"
    with mp.workdps(digits):
        bare = replace(plan, held={**plan.held, "P": "1.0 mol/L"})
        reference = Reference(bare, mp.mpf(t), digits=digits)
        log = reference.gibbs(start) + reference.gibbs("W") - reference.gibbs("P") - affinity
        log += mp.log(reference.held["W"]) + mp.log(reference.held.get("S", mp.mpf(1)))
        amount = float(mp.e**log)
    return replace(plan.at(t), held={**plan.held, "P": f"{amount!r} mol/L"})


@pytest.mark.parametrize("affinity", [1e-6, 1e-3, 1.0, 30.0, 600.0, -1e-6, -2.0, -40.0])
def test_product_held_near_equilibrium(affinity: float, tmp_path: Path) -> None:
    """The rate is no difference of fluxes.

    Near equilibrium controls are about 1/affinity: there they, and E_a, are compared relatively. The
    affinity itself is worked out in extended precision (about 3e-18 of RT), which is the limit.
    """
    plan = product_at(BRANCHED, 298.15, affinity)
    relative = 1e-10 if abs(affinity) < 0.1 else 0.0
    result = check(
        plan, tmp_path, ALL, relative=relative, with_controls=affinity in (1e-6, 1.0, -2.0)
    )
    free = result.rates["free"]
    assert free is not None
    assert np.sign(free.rate_constant[0]) == np.sign(affinity)
    codes = {finding.code for finding in result.findings}
    assert ("runs-backwards" in codes) == (affinity < 0)


def test_product_a_thousand_rt_uphill(tmp_path: Path) -> None:
    """So do the saddles that lead to it: the rate is negative and of ordinary size."""
    members = {
        name: replace(member, enthalpy=member.enthalpy + 2500.0)
        if name in ("P", "T4", "TP")
        else member
        for name, member in MEMBERS.items()
    }
    plan = replace(BRANCHED, species=members, held={**BRANCHED.held, "P": "1.0 mol/L"})
    free = plan.load(tmp_path).effective().rates["free"]
    assert free is not None
    with mp.workdps(1500):
        exact = Reference(plan, mp.mpf(300.0), digits=1500).free()
        assert abs(mp.mpf(float(free.rate_constant[0])) / exact - 1) <= RATE_ERROR
    assert free.rate_constant[0] < 0.0
    energy = float(arrhenius_energy(plan, 300.0, "free", 1500))
    assert free.arrhenius_energy_kj_mol[0] == pytest.approx(energy, abs=ENERGY_ERROR_KJ_MOL)


def test_product_in_equilibrium(tmp_path: Path) -> None:
    """A = P at the concentration of A itself, both with the same G: the rate is 0, not noise."""
    members = {
        "A": Member("CO", 0.0, 200.0),
        "P": Member("CO", 0.0, 200.0),
        "T": Member("CO", 50.0, 200.0),
    }
    plan = Plan(members, (Line("A = P", "through", "T"),), QUESTION, {"P": "1.0 mol/L"})
    result = plan.load(tmp_path).effective()
    free = result.rates["free"]
    assert free is not None
    assert free.rate_constant[0] == 0.0
    assert np.isnan(free.arrhenius_energy_kj_mol[0])


@pytest.mark.parametrize(
    "held", [{"P": "1e6 mol/L"}, {"P": "20 bar", "A": "1e-9 mol/L"}, {"P": "20 bar", "A": "3 Pa"}]
)
def test_reactant_and_product_held(held: dict[str, str], tmp_path: Path) -> None:
    """The rate is over the known concentration of the reactant, which may change with temperature."""
    check(replace(BRANCHED.at(350.0), held={**BRANCHED.held, **held}), tmp_path, ALL)


COMPETING = replace(
    BRANCHED,
    species={
        **MEMBERS,
        "Q": Member("CH2O2", -75.0, 260.0),
        "TQ": Member("CH2O2", 33.0, 250.0),
        "TPQ": Member("CH2O2", -20.0, 250.0),
    },
    steps=(*STEPS, Line("C1 = Q", "through", "TQ"), Line("P = Q", "through", "TPQ")),
    question={"reactant": "A", "product": ("P", "Q")},
)


def check_formation(plan: Plan, result: EffectiveRate) -> None:
    """Compare the net formation of each product with the reference."""
    free = result.rates["free"]
    assert free is not None
    assert free.branching is not None
    for k, t in enumerate(plan.temperatures):
        with mp.workdps(200):
            reference = Reference(plan, mp.mpf(t), digits=200)
            made = reference.products_made()
            total = sum(made.values())
        assert len(free.branching) == len(made)
        for node, flux in made.items():
            ours = free.branching[reference.nodes[node][0][0]][k]
            assert ours == pytest.approx(float(flux / total), rel=1e-9)


@pytest.mark.parametrize(
    "held", [{}, {"P": "1e9 mol/L"}, {"P": "1e9 mol/L", "Q": "1e-3 mol/L"}], ids=len
)
def test_competing_products(held: dict[str, str], tmp_path: Path) -> None:
    plan = replace(COMPETING, held={**COMPETING.held, **held})
    result = check(plan, tmp_path, ALL, with_controls=len(held) == 1)
    free, pool = result.rates["free"], result.rates["pool"]
    assert free is not None
    assert free.branching is not None
    assert pool is not None
    assert pool.branching is not None
    check_formation(plan, result)
    # the slowest decay feeds each product by its members' populations
    assert sum(pool.branching.values()) == pytest.approx(np.ones(1), abs=1e-12)
    assert pool.populations is not None
    share = pool.populations
    ways = {"P": {"C3": 5, "C2": 7}, "Q": {"C1": 8}}
    fluxes = {}
    for name, sources in ways.items():
        total = np.zeros(1)
        for source, step in sources.items():
            constants = result.steps[step].forward_rate_constant
            total = total + share[source] * constants
        fluxes[name] = total
    for name, flux in fluxes.items():
        assert pool.branching[name] == pytest.approx(flux / sum(fluxes.values()), rel=1e-9)
        assert flux.shape == (1,)
    assert sum(fluxes.values()) == pytest.approx(pool.rate_constant, rel=1e-9)


@pytest.mark.parametrize("turned", [False, True])
@pytest.mark.parametrize("held", [{}, {"Q": "1e-3 mol/L"}, {"Q": "1e-3 mol/L", "P": "1e5 mol/L"}])
def test_two_products_of_one_step(held: dict[str, str], turned: bool, tmp_path: Path) -> None:
    """C + W = P + Q; also written the other way round, and with both products there."""
    members = {
        **{name: MEMBERS[name] for name in ("A", "W", "C1", "P", "T1")},
        "Q": Member("H2O", -5.0, 190.0),
        "T3": Member("CH4O3", 20.0, 390.0),
    }
    last = "P + Q = C1 + W" if turned else "C1 + W = P + Q"
    steps = (Line("A + W = C1", "through", "T1"), Line(last, "through", "T3"))
    question = {"reactant": "A", "product": ("P", "Q")}
    plan = Plan(members, steps, question, {"W": "0.02 mol/L", **held}, (298.15,))
    result = check(plan, tmp_path, ("free", "pool"))
    assert result.net_reaction == "A + 2 W = P + Q"
    exact = Reference(plan, mp.mpf(298.15)).reversibility()
    for number, value in exact.items():
        ours = result.steps[number].reversibility[0]
        assert ours == pytest.approx(float(value), rel=1e-10, abs=1e-300)


def test_order_of_names_makes_no_other_product(tmp_path: Path) -> None:
    """ "C = P + Q" and "D = Q + P" lead to the same."""
    members = {
        "A": Member("CH2O2", 0.0, 250.0),
        "B": Member("CH2O2", -3.0, 250.0),
        "P": Member("CO", -5.0, 200.0),
        "Q": Member("H2O", -5.0, 190.0),
        "T": Member("CH2O2", 50.0, 250.0),
        "TA": Member("CH2O2", 90.0, 260.0),
        "TB": Member("CH2O2", 92.0, 260.0),
    }
    steps = (
        Line("A = B", "through", "T"),
        Line("A = P + Q", "through", "TA"),
        Line("B = Q + P", "through", "TB"),
    )
    plan = Plan(members, steps, {"reactant": "A", "product": ("P", "Q")})
    result = check(plan, tmp_path, ("free", "pool"))
    assert result.net_reaction == "A = P + Q"
    pool = result.rates["pool"]
    assert pool is not None
    assert pool.branching is None


# ---------------------------------------------------------------------------------------- cycles


@pytest.mark.parametrize("held", [{}, {"P": "0.01 mol/L"}], ids=["absent", "held"])
@pytest.mark.parametrize("loops", [1, 2])
def test_catalytic_cycle(loops: int, held: dict[str, str], tmp_path: Path) -> None:
    """One cycle with a dead end; a second way that takes the product in the opposite direction as written."""
    plan = replace(CYCLE, held={**HELD, **held})
    if loops == 2:
        members = {**CATALYST, "T5": Member("ArCH2O2", 12.0, 262.0)}
        plan = replace(
            plan, species=members, steps=(*CYCLE_STEPS, Line("K + P = KSW", "through", "T5"))
        )
    result = check(plan, tmp_path, ("cycle",))
    assert result.net_reaction == "S + W = P"
    cycle = result.rates["cycle"]
    assert cycle is not None
    assert cycle.populations is not None
    for k, t in enumerate(plan.temperatures):
        reference = Reference(plan, mp.mpf(t))
        for node, share in reference.cycle_shares().items():
            name = reference.nodes[node][0][0]
            assert cycle.populations[name][k] == pytest.approx(float(share), rel=1e-10)
        for number, value in reference.reversibility().items():
            ours = result.steps[number].reversibility[k]
            assert ours == pytest.approx(float(value), rel=1e-10, abs=1e-300)
    largest = np.argmax(np.stack([*cycle.populations.values()]), axis=0)
    assert cycle.resting_state == tuple([*cycle.populations][i] for i in largest)


@pytest.mark.parametrize("held", [{}, {"P": "0.01 mol/L"}], ids=["absent", "held"])
def test_cycle_that_gives_the_product_off_before_its_end(
    held: dict[str, str], tmp_path: Path
) -> None:
    """KP = X + P, X = K: without product there is a way from KP to X and none back."""
    members = {
        **CATALYST,
        "X": Member("Ar", 8.0, 160.0),
        "TX": Member("Ar", 45.0, 150.0),
    }
    steps = (
        *CYCLE_STEPS[:3],
        CYCLE_STEPS[4],
        Line("KP = X + P", "through", "T4"),
        Line("X = K", "through", "TX"),
    )
    check(replace(CYCLE, species=members, steps=steps, held={**HELD, **held}), tmp_path, ("cycle",))


@pytest.mark.parametrize("equation", ["K + S + W = K + P", "K + P = K + S + W"])
@pytest.mark.parametrize("held", [{}, {"P": "0.01 mol/L"}], ids=["absent", "held"])
def test_cycle_of_one_step(held: dict[str, str], equation: str, tmp_path: Path) -> None:
    """The catalyst is its only state: k (1 - exp(-A)), written either way round."""
    members = {name: CATALYST[name] for name in ("K", "S", "W", "P")}
    members["T"] = Member("ArCH2O2", 50.0, 300.0)
    plan = Plan(
        members,
        (Line(equation, "through", "T"),),
        {"catalyst": "K", "product": "P"},
        {**HELD, **held},
        (300.0,),
    )
    file = tmp_path / "study.toml"
    file.write_text(plan.text().split("[effective]")[0], encoding="utf-8")
    study = Study.load(file)  # the question is put to the mechanism itself
    study = replace(study, mechanism=replace(study.mechanism, catalyst="K", products=("P",)))
    result = study.effective()
    cycle = result.rates["cycle"]
    assert cycle is not None
    assert result.net_reaction == "S + W = P"
    reference = Reference(plan, mp.mpf(300.0))
    exact = float(reference.cycle())
    assert cycle.rate_constant[0] == pytest.approx(exact, rel=RATE_ERROR)
    energy = float(arrhenius_energy(plan, 300.0, "cycle"))
    assert cycle.arrhenius_energy_kj_mol[0] == pytest.approx(energy, abs=ENERGY_ERROR_KJ_MOL)
    check_sum_rules(plan, cycle)
    [span] = cycle.approximations
    assert span.ratio[0] == pytest.approx(1.0, rel=1e-6)
    assert span.determining_saddle == ("T",)


@pytest.mark.parametrize("affinity", [1e-6, 1e-3, 1.0, 600.0, -1e-6, -2.0])
def test_cycle_near_equilibrium(affinity: float, tmp_path: Path) -> None:
    plan = product_at(CYCLE, 298.15, affinity)
    relative = 1e-10 if abs(affinity) < 0.1 else 0.0
    result = check(plan, tmp_path, ("cycle",), relative=relative, digits=700)
    cycle = result.rates["cycle"]
    assert cycle is not None
    assert np.sign(cycle.rate_constant[0]) == np.sign(affinity)


@pytest.mark.parametrize("height", [-2500.0, 2500.0])
def test_cycle_of_large_affinity(height: float, tmp_path: Path) -> None:
    """A thousand RT downhill, and uphill: there the last saddles are the product's own."""
    members = {**CATALYST, "P": Member("CH2O2", -80.0 + height, 270.0)}
    if height > 0.0:
        members["T4"] = replace(CATALYST["T4"], enthalpy=-30.0 + height)
    check(replace(CYCLE, species=members).at(298.15), tmp_path, ("cycle",), digits=1500)


@pytest.mark.parametrize("held", [{}, {"P": "0.3 mol/L"}], ids=["absent", "held"])
def test_cycle_of_two_states_that_makes_two_of_the_product(
    held: dict[str, str], tmp_path: Path
) -> None:
    """S2 = 2 P: a turnover is one extent of the net reaction, not one molecule of product."""
    members = {
        "K": CATALYST["K"],
        "S2": Member("C2O2", 0.0, 250.0),
        "X": Member("ArC2O2", -30.0, 300.0),
        "P": Member("CO", -10.0, 200.0),
        "TA": Member("ArC2O2", 20.0, 310.0),
        "TB": Member("ArC2O2", 40.0, 310.0),
    }
    steps = (Line("K + S2 = X", "through", "TA"), Line("X = K + 2 P", "through", "TB"))
    plan = Plan(
        members,
        steps,
        {"catalyst": "K", "product": "P"},
        {"S2": "0.1 mol/L", **held},
        (298.15, 350.0),
        product_of_one_turn=2,
    )
    result = check(plan, tmp_path, ("cycle",))
    assert result.net_reaction == "S2 = 2 P"


@pytest.mark.parametrize("held", [("P", "Q"), ("P",), ()], ids=len)
def test_cycle_with_two_products_of_one_turn(held: tuple[str, ...], tmp_path: Path) -> None:
    members = {
        "K": CATALYST["K"],
        "S2": Member("C2O3", 0.0, 250.0),
        "X": Member("ArC2O3", -30.0, 300.0),
        "P": Member("CO2", -10.0, 200.0),
        "Q": Member("CO", -10.0, 200.0),
        "TA": Member("ArC2O3", 20.0, 310.0),
        "TB": Member("ArC2O3", 40.0, 310.0),
    }
    steps = (Line("K + S2 = X", "through", "TA"), Line("X = K + P + Q", "through", "TB"))
    plan = Plan(
        members,
        steps,
        {"catalyst": "K", "product": ("P", "Q")},
        {"S2": "0.1 mol/L", **dict.fromkeys(held, "30 mol/L")},
        product_of_one_turn=2,
    )
    assert check(plan, tmp_path, ("cycle",)).net_reaction == "S2 = P + Q"


@pytest.mark.parametrize(
    "held",
    [
        {},
        {"P": "0.01 mol/L"},
        {"P": "0.01 mol/L", "Q": "50 mol/L"},
        {"P": "1e7 mol/L", "Q": "2e4 mol/L"},  # one forward, one backward
    ],
    ids=["none", "one", "both", "opposed"],
)
def test_cycle_with_competing_products(held: dict[str, str], tmp_path: Path) -> None:
    """Two net reactions of different affinity: each closed way has its own."""
    members = {
        **CATALYST,
        "Q": Member("CH2O2", -60.0, 265.0),
        "T6": Member("ArCH2O2", -20.0, 280.0),
    }
    plan = replace(
        CYCLE.at(298.15),
        species=members,
        steps=(*CYCLE_STEPS, Line("KSW = K + Q", "through", "T6")),
        question={"catalyst": "K", "product": ("P", "Q")},
        held={**HELD, **held},
    )
    result = check(plan, tmp_path, ("cycle",))
    assert {*result.net_reaction.split("; ")} == {"S + W = P", "S + W = Q"}


@pytest.mark.parametrize("product", [{}, {"P": "0.01 mol/L"}])
def test_driven_cycle(product: dict[str, str], tmp_path: Path) -> None:
    """W and V, two forms of the same, out of balance with each other: allowed where the study says so."""
    members = {
        **CATALYST,
        "V": Member("H2O", -3.0, 180.0),
        "T7": Member("ArCH2O2", 3.0, 270.0),
    }
    plan = replace(
        CYCLE,
        species=members,
        steps=(*CYCLE_STEPS, Line("KS + V = KSW", "through", "T7")),
        held={**HELD, "V": "0.3 mol/L", **product},
        driven=True,
    )
    check(plan, tmp_path, ("cycle",))


@pytest.mark.parametrize(
    "there", [{}, {"P": "1e8 bar"}, {"P": "1e9 mol/L", "Q": "1e8 mol/L"}], ids=len
)
def test_driven_network(there: dict[str, str], tmp_path: Path) -> None:
    """Without detailed balance there is no relaxation, and the way back is no image of the way there."""
    members = {
        **COMPETING.species,
        "V": Member("H2O", -3.0, 180.0),
        "T8": Member("CH2O2", 12.0, 255.0),
    }
    plan = replace(
        COMPETING,
        species=members,
        steps=(*COMPETING.steps, Line("A + V = C2", "through", "T8")),
        held={**BRANCHED.held, "V": "0.3 mol/L", **there},
        driven=True,
    )
    result = check(plan, tmp_path, ("free", "pool"))
    check_formation(plan, result)
    pool = result.rates["pool"]
    assert pool is not None
    assert pool.next_decay_ratio is not None
    # general eigenvalues, so the steady state is not in balance: roots of the polynomial as well
    decays = Reference(plan, mp.mpf(300.0)).pool_decays()
    assert pool.next_decay_ratio[0] == pytest.approx(float(decays[1][0] / decays[0][0]), rel=1e-6)


# --------------------------------------------------------------------------- where rates come from


def test_declared_rates(tmp_path: Path) -> None:
    """A constant and an Arrhenius law in place of saddle points, reverse from detailed balance."""
    steps = (
        STEPS[0],
        Line("A + W = C1", "rate", "3.5e4 L/mol/s"),
        Line("C2 = A + W", "arrhenius", ("2e11 1/s", 1.5, 42.0)),
        Line("C1 = C2", "arrhenius", ("1e9 1/s", 0.0, -3.0)),
        *STEPS[4:],
    )
    members = without(MEMBERS, "T1", "T2", "T12")
    check(replace(BRANCHED, species=members, steps=steps), tmp_path, ALL)


def test_collision_limits(tmp_path: Path) -> None:
    """Barrierless steps of unlike and like partners, uphill as written, and with two molecules on each side."""
    members = {**without(MEMBERS, "T1", "T3"), "A2": Member("C2O2", -21.0, 300.0)}
    steps = (
        STEPS[0],
        Line("A + W = C1", "barrier", "none"),
        Line("C3 = C1 + W", "barrier", "none"),
        Line("A + W2 = C1 + W", "barrier", "none"),  # downhill
        Line("C2 + W = A + W2", "barrier", "none"),  # uphill
        *STEPS[2:4],
        *STEPS[5:],
    )
    del members["A2"]
    result = check(replace(BRANCHED, species=members, steps=steps), tmp_path, ALL)
    assert all(result.steps[k].limited.all() for k in range(5))
    assert not any(step.limited.any() for step in result.steps[7:])


@pytest.mark.parametrize("height", [-40.0, -12.0, 10.0])
def test_saddle_joined_with_a_collision_limit(height: float, tmp_path: Path) -> None:
    """Far below, about as fast as, and far slower than the collisions."""
    members = {**MEMBERS, "T1": Member("CH2O2", height, 290.0)}
    result = check(replace(BRANCHED, species=members), tmp_path, ALL)
    assert result.steps[1].limited[0] == (height == -40.0)


def test_diffusion_limits(tmp_path: Path) -> None:
    """In solution, the viscosity given over temperature; a second order step without one has no limit."""
    water = ((273.15, 1.79e-3), (298.15, 0.89e-3), (348.15, 0.378e-3))
    steps = (
        Line("W + W = W2", "barrier", "none", viscosity=water),
        Line("A + W = C1", "barrier", "none", viscosity=water),
        Line("A + W = C2", "through", "T2", viscosity=water),
        *STEPS[3:],
    )
    plan = replace(
        BRANCHED,
        species={**without(MEMBERS, "T1"), "T2": Member("CH2O2", -25.0, 251.0)},
        steps=steps,
        standard_state="1 mol/L",
        phase="solution",
    )
    result = check(plan, tmp_path, ALL)
    assert "no-diffusion-limit" in {f.code for f in result.findings}
    assert "viscosity-constant" not in {f.code for f in result.findings}


# ------------------------------------------------------------------------------- odd but legal ones


def test_one_saddle_for_two_steps(tmp_path: Path) -> None:
    """Its control is that of both together."""
    members = without(MEMBERS, "TP")
    steps = (*STEPS[:7], Line("C2 = P", "through", "T12"))
    check(replace(BRANCHED, species=members, steps=steps), tmp_path, ALL)


def test_steps_listed_in_reverse_change_nothing(tmp_path: Path) -> None:
    """The reactant stands on right sides only, the product on left ones."""
    turned = tuple(
        replace(step, equation=" = ".join(step.equation.split(" = ")[::-1])) for step in STEPS
    )
    straight = BRANCHED.load(tmp_path).effective()
    reverse = replace(BRANCHED, steps=turned).load(tmp_path).effective()
    assert reverse.net_reaction == straight.net_reaction == "A + W = P"
    for name in ALL:
        one, other = straight.rates[name], reverse.rates[name]
        assert one is not None
        assert other is not None
        assert other.rate_constant == pytest.approx(one.rate_constant, rel=1e-12)
        assert other.arrhenius_energy_kj_mol == pytest.approx(
            one.arrhenius_energy_kj_mol, abs=1e-10, rel=0.0
        )
    for one_step, other_step in zip(straight.steps, reverse.steps, strict=True):
        assert other_step.forward_rate_constant == pytest.approx(
            one_step.reverse_rate_constant, rel=1e-12
        )
        assert other_step.reversibility == pytest.approx(one_step.reversibility, rel=1e-10)


def test_names_with_plus_and_ions(tmp_path: Path) -> None:
    members = {
        **{name: MEMBERS[name] for name in ("A", "W", "C1", "P", "T1", "TP")},
        "H3O+": Member("H3O+", 0.0, 190.0),
        "CH+": Member("CH3O2+", -20.0, 280.0),
        "TS+": Member("CH3O2+", 15.0, 250.0),
    }
    steps = (
        Line("A + W = C1", "through", "T1"),
        Line("C1 = P", "through", "TP"),
        Line("A + H3O+ = CH+", "through", "TS+"),
        Line("CH+ + W = P + H3O+", "rate", "1e5 L/mol/s"),
    )
    held = {"W": "0.02 mol/L", "H3O+": "1e-4 mol/L"}
    check(Plan(members, steps, QUESTION, held), tmp_path, ALL)


def test_parts_that_the_reactant_never_reaches(tmp_path: Path) -> None:
    members = {**MEMBERS, "X": Member("CH4", 1.0, 200.0), "Y": Member("CH4", 2.0, 200.0)}
    plan = replace(BRANCHED, species=members, steps=(*STEPS, Line("X = Y", "rate", "1.0 1/s")))
    result = check(plan, tmp_path, ALL)
    straight = BRANCHED.load(tmp_path).effective()
    for name in ALL:
        one, other = straight.rates[name], result.rates[name]
        assert one is not None
        assert other is not None
        assert np.array_equal(one.rate_constant, other.rate_constant)
        assert np.all(other.control["X"] == 0.0)
    assert "not-reached" in {finding.code for finding in result.findings}
    assert np.all(np.isnan(result.steps[-1].reversibility))


def test_what_lies_behind_the_product(tmp_path: Path) -> None:
    """Counts for the relaxation alone, where the product stays."""
    members = {**MEMBERS, "E": Member("CH2O2", -70.0, 280.0), "TE": Member("CH2O2", 20.0, 260.0)}
    plan = replace(BRANCHED, species=members, steps=(*STEPS, Line("P = E", "through", "TE")))
    check(plan, tmp_path, ALL)


def test_step_among_held_species_only(tmp_path: Path) -> None:
    """It is left out of the network; its reversibility is the ratio of its one-way rates."""
    members = {**MEMBERS, "V": Member("H2O", 1.0, 186.0)}
    steps = (*STEPS, Line("W = V", "rate", "3.0 1/s"))
    held = {**BRANCHED.held, "V": "equilibrium"}
    result = check(replace(BRANCHED, species=members, steps=steps, held=held), tmp_path, ALL)
    assert result.steps[-1].reversibility == pytest.approx(np.ones(1), rel=1e-12)
    assert result.steps[0].reversibility == pytest.approx(np.ones(1), rel=1e-12)


def test_driven_step_among_held_species(tmp_path: Path) -> None:
    members = {**MEMBERS, "V": Member("H2O", 1.0, 186.0)}
    plan = replace(
        BRANCHED,
        species=members,
        steps=(*STEPS, Line("W = V", "rate", "3.0 1/s")),
        held={**BRANCHED.held, "V": "0.01 mol/L"},
        driven=True,
    )
    result = check(plan, tmp_path, ("free", "pool"), with_controls=False)
    reference = Reference(plan, mp.mpf(300.0))
    forth, back = reference.constants[-1]
    ratio = float(forth * reference.held["W"] / (back * reference.held["V"]))
    assert result.steps[-1].reversibility[0] == pytest.approx(min(ratio, 1.0 / ratio), rel=1e-12)


def test_step_that_gives_its_state_back(tmp_path: Path) -> None:
    """C1 + W = C1 + V changes held species only: no part in any rate, and it must be in balance."""
    members = {**MEMBERS, "V": Member("H2O", 1.0, 186.0), "T9": Member("CH4O3", -5.0, 320.0)}
    steps = (*STEPS, Line("W = V", "rate", "3.0 1/s"), Line("C1 + W = C1 + V", "through", "T9"))
    held = {**BRANCHED.held, "V": "equilibrium"}
    result = check(replace(BRANCHED, species=members, steps=steps, held=held), tmp_path, ALL)
    pool = result.rates["pool"]
    assert pool is not None
    assert np.all(pool.control["T9"] == 0.0)


def random_plan(seed: int, n: int, extra: int) -> Plan:
    """A study of n intermediates, joined at random, every second step by a held species."""
    rng = np.random.default_rng(seed)
    members = {"A": Member("CO", 0.0, 200.0), "W": Member("H2O", 0.0, 188.5)}
    steps = []
    waters = [0]
    for k in range(1, n + 1):
        waters.append(int(rng.integers(0, 3)))
        enthalpy, entropy = rng.uniform(-60.0, 20.0), 200.0 + 80.0 * waters[k]
        members[f"I{k}"] = Member(f"CO(H2O){waters[k] or ''}" if waters[k] else "CO", *(
            round(float(x), 3) for x in (enthalpy, entropy)
        ))  # fmt: skip
    members["P"] = Member("CO", -90.0, 205.0)
    waters.append(0)
    names = ["A", *(f"I{k}" for k in range(1, n + 1)), "P"]
    pairs = [(int(rng.integers(max(0, k - 3), k)), k) for k in range(1, n + 2)]
    pairs += [tuple(sorted(rng.choice(n + 2, 2, replace=False))) for _ in range(extra)]
    for number, (a, b) in enumerate(pairs):
        more = max(waters[a], waters[b])
        sides = []
        for k in (a, b):
            lacking = more - waters[k]
            sides.append(names[k] + (f" + {lacking} W" if lacking else ""))
        formula = f"CO(H2O){more}" if more > 1 else "CH2O2" if more else "CO"
        members[f"T{number}"] = Member(
            formula, round(float(rng.uniform(20.0, 90.0)), 3), 200.0 + 75.0 * more
        )
        steps.append(Line(" = ".join(sides), "through", f"T{number}"))
    return Plan(members, tuple(steps), QUESTION, {"W": "0.02 mol/L"}, (300.0,))


def test_twenty_intermediates(tmp_path: Path) -> None:
    plan = random_plan(5, 20, 6)
    check(plan, tmp_path, ALL, with_controls=False, digits=700)


@pytest.mark.parametrize("seed", range(4))
def test_random_studies(seed: int, tmp_path: Path) -> None:
    check(random_plan(seed, 5, 3), tmp_path, ALL, digits=400)
