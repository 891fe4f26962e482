"""What the effective rate says beside its numbers: signs, conventions, decays, findings, errors, robustness."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import fields, is_dataclass, replace
from itertools import pairwise
from pathlib import Path
from typing import Any

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
    without,
)
from scipy.optimize import brentq

from thermo_pp.errors import StudyError
from thermo_pp.kinetics.results import EffectiveRate, Rate
from thermo_pp.study.load import Study

R = 8.31446261815324e-3  # kJ/mol/K
LOCATED_K = 0.01
PLUME = Path(__file__).parent.parent / "fixtures" / "stack-plume" / "study.toml"


def rate_of(result: EffectiveRate, definition: str) -> Rate:
    rate = result.rates[definition]  # type: ignore[index]
    assert rate is not None
    return rate


def codes(result: EffectiveRate) -> set[str]:
    return {finding.code for finding in result.findings}


def chain(
    waters: int, complex_: tuple[float, float], second: tuple[float, float], state: str
) -> Plan:
    """A + n W = C -> P in solution; (H, S) of C and of the second saddle; the first step is fast."""
    oxygen = f"CO(H2O){waters}"
    members = {
        "A": Member("CO", 0.0, 200.0),
        "W": Member("H2O", 0.0, 150.0),
        "C": Member(oxygen, *complex_),
        "P": Member(oxygen, -400.0, 200.0),
        "T1": Member(oxygen, complex_[0] - 60.0, complex_[1]),
        "T2": Member(oxygen, *second),
    }
    left = "A + W" if waters == 1 else f"A + {waters} W"
    steps = (Line(f"{left} = C", "through", "T1"), Line("C = P", "through", "T2"))
    return Plan(members, steps, QUESTION, {"W": "1e-3 mol/L"}, (250.0, 600.0), state, "solution")


# ------------------------------------------------------------------------------- where E_a turns


@pytest.mark.parametrize("waters", [1, 2])
def test_sign_of_pre_equilibrium(waters: int, tmp_path: Path) -> None:
    """E_a = dH + mRT is 0 at T0 = -dH/(mR): negative below, so the rate has a minimum there."""
    wanted = 400.0
    molecules = waters + 1
    height = -molecules * R * wanted
    plan = chain(waters, (-10.0, 60.0), (height, 0.0), "1 bar")
    [change] = rate_of(plan.load(tmp_path).effective(), "free").sign_changes
    assert change.temperature_k == pytest.approx(wanted, abs=LOCATED_K)
    assert change.kind == "minimum"


def test_sign_of_the_saturated_pool(tmp_path: Path) -> None:
    """K1(T*) = -dH1/(dH2 + RT*) - 1: the pool's rate has a maximum there, that over free A has none."""
    bound, entropy, barrier = -60.0, -150.0, 30.0
    plan = chain(1, (bound, 350.0 + entropy), (bound + barrier, 350.0 + entropy - 110.0), "1 mol/L")

    def saturation(t: float) -> float:
        balance = np.exp(-(bound - t * entropy / 1000.0) / (R * t)) * 1e-3
        return float(balance + bound / (barrier + R * t) + 1.0)

    at = brentq(saturation, 250.0, 600.0)
    result = plan.load(tmp_path).effective()
    [change] = rate_of(result, "pool").sign_changes
    assert change.temperature_k == pytest.approx(at, abs=LOCATED_K)
    assert change.kind == "maximum"
    assert rate_of(result, "free").sign_changes == ()
    energies = rate_of(result, "pool").arrhenius_energy_kj_mol
    assert energies[0] > 0.0 > energies[1]


def test_signs_of_every_definition(tmp_path: Path) -> None:
    """Each located where the reference's own E_a changes its sign, also between the temperatures asked for."""
    saturated = chain(1, (-60.0, 200.0), (-30.0, 90.0), "1 mol/L")
    seen = set()
    for plan in (BRANCHED.at(60.0, 3000.0), saturated):
        result = plan.load(tmp_path).effective()
        for definition in ("free", "pool", "relaxation"):
            changes = rate_of(result, definition).sign_changes
            for change in changes:
                below, above = (
                    float(arrhenius_energy(plan, change.temperature_k + by, definition, 150))
                    for by in (-LOCATED_K, LOCATED_K)
                )
                assert below * above < 0.0
                assert change.kind == ("maximum" if below > 0.0 else "minimum")
                seen.add((definition, change.kind))
            temperatures = [change.temperature_k for change in changes]
            assert temperatures == sorted(temperatures)
            assert all(a.kind != b.kind for a, b in pairwise(changes))
    assert {("free", "maximum"), ("free", "minimum"), ("pool", "maximum")} <= seen
    assert ("relaxation", "maximum") in seen


def test_reversal_is_no_extremum(tmp_path: Path) -> None:
    """Where the net reaction turns round E_a has a pole: no maximum or minimum of the rate."""
    plan = replace(CYCLE.at(600.0, 1400.0), held={**HELD, "P": "0.01 mol/L"})
    rate = rate_of(plan.load(tmp_path).effective(), "cycle")
    assert rate.rate_constant[0] > 0.0 > rate.rate_constant[1]
    assert [change.kind for change in rate.sign_changes] == ["maximum"]
    # the rate does turn there, well before it reverses
    at = rate.sign_changes[0].temperature_k
    around = plan.at(at - 5.0, at, at + 5.0).load(tmp_path).effective()
    low, top, high = rate_of(around, "cycle").rate_constant
    assert top > low
    assert top > high > 0.0


def test_signs_do_not_depend_on_the_grid(tmp_path: Path) -> None:
    plan = chain(1, (-60.0, 200.0), (-30.0, 90.0), "1 mol/L")
    one = plan.load(tmp_path).effective()
    other = plan.at(600.0, 300.0, 250.0).load(tmp_path).effective()
    for definition in ("free", "pool", "relaxation"):
        changes = rate_of(one, definition).sign_changes
        assert rate_of(other, definition).sign_changes == changes
    assert len(rate_of(one, "pool").sign_changes) == 1


def test_shift_that_brings_the_energy_to_zero(tmp_path: Path) -> None:
    """Each controlling state moved by the stated amount, alone, makes E_a vanish; others have none stated."""
    bound = -60.0
    plan = chain(1, (bound, 200.0), (bound + 30.0, 90.0), "1 mol/L").at(330.0, 420.0)
    result = plan.load(tmp_path).effective()
    moved = 0
    for definition in ("free", "pool"):
        rate = rate_of(result, definition)
        for name, shifts in rate.sign_shift_kj_mol.items():
            for k, t in enumerate(plan.temperatures):
                if not np.isfinite(shifts[k]):
                    continue
                assert abs(shifts[k]) <= 100.0
                members = dict(plan.species)
                member = members[name]
                members[name] = replace(member, enthalpy=float(member.enthalpy + shifts[k]))
                shifted = replace(plan.at(t), species=members).load(tmp_path).effective()
                energy = rate_of(shifted, definition).arrhenius_energy_kj_mol[0]
                assert energy == pytest.approx(0.0, abs=1e-5), (definition, name)
                moved += 1
        for name, values in rate.control.items():
            controlling = bool(np.any(np.abs(values) > 0.1))
            assert (name in rate.sign_shift_kj_mol) == controlling, name
    assert moved >= 6


@pytest.mark.parametrize(("height", "stated"), [(90.0, True), (110.0, False), (160.0, False)])
def test_shift_of_more_than_a_hundred_is_not_stated(
    height: float, stated: bool, tmp_path: Path
) -> None:
    plan = Plan(
        {
            "A": Member("CO", 0.0, 200.0),
            "P": Member("CO", -9.0, 200.0),
            "T": Member("CO", height, 200.0),
        },
        (Line("A = P", "through", "T"),),
        QUESTION,
    )
    shifts = rate_of(plan.load(tmp_path).effective(), "free").sign_shift_kj_mol
    energy = height + R * 298.15
    for name, wanted in (("T", -energy), ("A", energy)):
        assert np.isfinite(shifts[name][0]) == stated
        if stated:
            assert shifts[name][0] == pytest.approx(wanted, abs=1e-5)


# -------------------------------------------------------------------------------- conventions


@pytest.mark.parametrize("state", ["1 bar", "1 atm", "1 mol/L", "20 Pa"])
@pytest.mark.parametrize("held", ["1e-3 mol/L", "2000 Pa"])
@pytest.mark.parametrize("waters", [1, 2])
def test_standard_activation(waters: int, held: str, state: str, tmp_path: Path) -> None:
    """Whole orders: H = E_a - mRT in p-form, E_a - RT in c-form, at a concentration; G gives k back."""
    plan = chain(waters, (-10.0, 60.0), (20.0, 100.0), state)
    plan = replace(plan, held={"W": held}, phase="gas", temperatures=(298.15, 400.0))
    # no two molecules meet on one side in the gas: A + 2 W, and one more for A + W
    if waters == 1:
        plan = replace(plan, phase="solution") if "mol" in held else plan
    rate = rate_of(plan.load(tmp_path).effective(), "free")
    t = np.array(plan.temperatures)
    rt = R * t
    order = rate.orders["W"]
    assert order == pytest.approx(np.full(2, float(waters)), abs=0.01)
    pseudo, standard = rate.activation, rate.standard_activation
    assert standard is not None
    energy = rate.arrhenius_energy_kj_mol
    frequency = 1.380649e-23 * t / 6.62607015e-34
    assert pseudo.enthalpy_kj_mol == pytest.approx(energy - rt, abs=1e-11)
    assert frequency * np.exp(-pseudo.gibbs_kj_mol / rt) == pytest.approx(
        rate.rate_constant, rel=1e-11
    )
    at_concentration, pressure_state = "mol" in held, "mol" not in state
    shift = (1.0 if at_concentration else 0.0) - (0.0 if pressure_state else 1.0)
    assert standard.enthalpy_kj_mol == pytest.approx(energy - rt - shift * order * rt, abs=1e-11)
    # k = (kT/h) a^n exp(-G/RT)
    number, unit = held.split()
    concentration = float(number) if unit == "mol/L" else float(number) / (1e6 * R * t)
    number, unit = state.split()
    scale = {"bar": 1e5, "atm": 101325.0, "Pa": 1.0, "mol/L": 1.0}[unit] * float(number)
    unit_state = scale / (1e6 * R * t) if pressure_state else scale
    activity = concentration / unit_state
    assert frequency * activity**order * np.exp(-standard.gibbs_kj_mol / rt) == pytest.approx(
        rate.rate_constant, rel=1e-10
    )
    for one in (pseudo, standard):
        entropy = (one.enthalpy_kj_mol - one.gibbs_kj_mol) / t * 1000.0
        assert one.entropy_j_mol_k == pytest.approx(entropy, abs=1e-9)


def test_standard_activation_needs_whole_orders(tmp_path: Path) -> None:
    """Between two channels of orders 1 and 2 there is none; where one channel carries all, there is."""
    result = BRANCHED.at(280.0, 300.0).load(tmp_path).effective()
    order = rate_of(result, "free").orders["W"]
    assert np.all(np.abs(order - np.round(order)) > 0.02)
    assert rate_of(result, "free").standard_activation is None
    both = BRANCHED.at(60.0, 300.0).load(tmp_path).effective()
    order = rate_of(both, "free").orders["W"]
    assert abs(order[0] - round(order[0])) <= 0.02
    standard = rate_of(both, "free").standard_activation
    assert standard is not None
    for values in (standard.enthalpy_kj_mol, standard.entropy_j_mol_k, standard.gibbs_kj_mol):
        assert np.isfinite(values).tolist() == [True, False]


def test_rates_of_outputs_do_not_depend_on_the_standard_state() -> None:
    """The bundled study at 1 bar, 1 atm and 1 mol/L."""
    results = [
        Study.load(PLUME, temperatures=[280.0, 330.0], treatment={"standard_state": state})
        .effective()
        for state in ("1 bar", "1 atm", "1 mol/L")
    ]  # fmt: skip
    for definition in ("free", "pool", "relaxation"):
        one, *others = [rate_of(result, definition) for result in results]
        for other in others:
            assert other.rate_constant == pytest.approx(one.rate_constant, rel=1e-10)
            assert other.arrhenius_energy_kj_mol == pytest.approx(
                one.arrhenius_energy_kj_mol, abs=1e-9, rel=0.0
            )
            for name, values in one.control.items():
                assert other.control[name] == pytest.approx(values, abs=1e-10, rel=0.0)
    for one_step, *other_steps in zip(*[result.steps for result in results], strict=True):
        for step in other_steps:
            assert step.forward_rate_constant == pytest.approx(
                one_step.forward_rate_constant, rel=1e-10
            )


@pytest.mark.parametrize("low_modes", ["harmonic", "raised", "rotor-entropy", "rotor-enthalpy"])
def test_energy_is_the_slope_of_the_rates_themselves(low_modes: str) -> None:
    """R T^2 of the difference of ln k over 0.02 K, whatever the treatment of soft modes."""
    t, h = 310.0, 0.02
    grid = [t - h, t, t + h]
    study = Study.load(PLUME, temperatures=grid, treatment={"low_modes": low_modes})
    result = study.effective()
    for definition in ("free", "pool", "relaxation"):
        rate = rate_of(result, definition)
        low, _, high = np.log(rate.rate_constant)
        slope = R * t**2 * (high - low) / (2.0 * h)
        assert rate.arrhenius_energy_kj_mol[1] == pytest.approx(slope, abs=1e-5, rel=0.0)


# -------------------------------------------------------------------------------------- decays

# A = C -> P with 2 s^-1, 5 s^-1 back, and 1 s^-1: C lies RT ln(5/2) above A
SLOWLY = Plan(
    {
        "A": Member("CO", 0.0, 200.0),
        "C": Member("CO", float(R * 298.15 * np.log(2.5)), 200.0),
        "P": Member("CO", float(R * 298.15 * np.log(2.5 * 0.5)), 200.0),
    },
    (Line("A = C", "rate", "2.0 1/s"), Line("C = P", "rate", "1.0 1/s")),
    QUESTION,
)


def test_two_decays(tmp_path: Path) -> None:
    """2, 5, 1 and, back from the product, 0.5 s^-1: numbers by matrix exponentials (an independent computation)."""
    result = SLOWLY.load(tmp_path).effective()
    pool, free = rate_of(result, "pool"), rate_of(result, "free")
    assert free.rate_constant[0] == pytest.approx(1.0 / 3.0, rel=1e-12)
    assert pool.rate_constant[0] == pytest.approx(0.258342613226, abs=1e-12, rel=0.0)
    assert pool.slow_share is not None
    assert pool.next_decay_ratio is not None
    assert pool.inverse_mean_time is not None
    assert pool.headline is not None
    assert pool.slow_share[0] == pytest.approx(1.034522, abs=5e-7, rel=0.0)
    assert pool.next_decay_ratio[0] == pytest.approx(7.741657386774 / 0.258342613226, rel=1e-11)
    assert pool.inverse_mean_time[0] == pytest.approx(0.25, rel=1e-12)
    assert pool.headline[0] == pool.rate_constant[0]
    relaxation = rate_of(result, "relaxation").rate_constant[0]
    assert relaxation == pytest.approx(0.705638280311, abs=1e-12, rel=0.0)
    assert "product-returns" in codes(result)
    assert "several-decays" not in codes(result)
    # one step from A to C, then from C: as checks.md has the controls
    names = ["A = C", "C = P"]
    assert [free.control[name][0] for name in names] == pytest.approx([1 / 6, 5 / 6], abs=1e-12)


@pytest.mark.parametrize(
    ("back", "second", "share_is_low", "ratio_is_low"),
    [
        (0.02, 3e-4, False, False),  # C rests; A goes there fast
        (5.0, 1.0, False, False),
        (1.0, 1.5, False, True),  # decays close together
        (3.5, 1.0, False, True),  # 19 times
        (3.7, 1.0, False, False),  # 20.4 times
        (1e-3, 1e-6, False, False),
    ],
)
def test_decays_against_the_reference(
    back: float, second: float, share_is_low: bool, ratio_is_low: bool, tmp_path: Path
) -> None:
    plan = replace(
        SLOWLY,
        species={
            **SLOWLY.species,
            "C": Member("CO", float(R * 298.15 * np.log(back / 2.0)), 200.0),
            "P": Member("CO", -90.0, 200.0),
        },
        steps=(SLOWLY.steps[0], Line("C = P", "rate", f"{second!r} 1/s")),
    )
    check_decays(plan, tmp_path, share_is_low, ratio_is_low)


def check_decays(plan: Plan, folder: Path, share_is_low: bool, ratio_is_low: bool) -> Rate:
    result = plan.load(folder).effective()
    pool = rate_of(result, "pool")
    [t] = plan.temperatures
    reference = Reference(plan, mp.mpf(t), digits=600 if t > 90.0 else 4000)
    decays = reference.pool_decays()
    assert pool.slow_share is not None
    assert pool.next_decay_ratio is not None
    assert pool.inverse_mean_time is not None
    assert pool.headline is not None
    assert pool.slow_share[0] == pytest.approx(float(decays[0][1]), rel=1e-9, abs=1e-300)
    assert pool.next_decay_ratio[0] == pytest.approx(float(decays[1][0] / decays[0][0]), rel=1e-9)
    assert pool.inverse_mean_time[0] == pytest.approx(
        float(reference.inverse_mean_time()), rel=1e-10
    )
    assert (decays[0][1] < 0.95) == share_is_low
    assert (decays[1][0] / decays[0][0] < 20) == ratio_is_low
    mixed = share_is_low or ratio_is_low
    assert ("several-decays" in codes(result)) == mixed
    largest = max(decays, key=lambda decay: decay[1])[0] if mixed else decays[0][0]
    assert pool.headline[0] == pytest.approx(float(largest), rel=1e-9)
    return pool


@pytest.mark.parametrize("t", [40.0, 200.0])
@pytest.mark.parametrize("depth", [-45.0, -150.0])
def test_headline_where_the_slowest_decay_is_a_trickle(
    depth: float, t: float, tmp_path: Path
) -> None:
    """A deep dead end, filled rarely, empties last: the headline is what an experiment would see."""
    members = {
        **MEMBERS,
        "D": Member("CH2O2", depth, 250.0),
        "TD": Member("CH2O2", 24.0, 240.0),
    }
    plan = replace(BRANCHED.at(t), species=members)
    pool = check_decays(plan, tmp_path, share_is_low=True, ratio_is_low=False)
    assert pool.headline is not None
    assert pool.headline[0] > 10.0 * pool.rate_constant[0]


def test_headline_where_weights_are_far_apart(tmp_path: Path) -> None:
    """A is 1e-60 of the pool in equilibrium: what eigenvectors say of it is noise."""
    heights = {
        **{"C1": -92.6, "C2": -65.1, "C3": -2.1, "D": -85.8},
        **{"T1": 33.7, "T2": 3.3, "T12": 35.0, "T3": 37.7, "T4": 10.5, "TD": 0.5, "TP": 19.3},
    }
    members = {
        name: replace(member, enthalpy=heights.get(name, member.enthalpy))
        for name, member in MEMBERS.items()
    }
    plan = replace(BRANCHED.at(80.0), species=members)
    check_decays(plan, tmp_path, share_is_low=True, ratio_is_low=False)


def test_pool_of_one(tmp_path: Path) -> None:
    plan = Plan(
        {"A": Member("CO", 0.0, 200.0), "P": Member("CO", -9.0, 200.0)},
        (Line("A = P", "rate", "2.0 1/s"),),
        QUESTION,
    )
    pool = rate_of(plan.load(tmp_path).effective(), "pool")
    assert pool.next_decay_ratio is not None
    assert pool.slow_share is not None
    assert pool.headline is not None
    assert np.isnan(pool.next_decay_ratio[0])
    assert pool.slow_share[0] == 1.0
    assert pool.headline[0] == pool.rate_constant[0] == pytest.approx(2.0, rel=1e-14)


@pytest.mark.parametrize(("g", "returns"), [(-6.0, True), (-9.0, False)])
def test_relaxation_finding_above_five_percent(g: float, returns: bool, tmp_path: Path) -> None:
    """A = P relaxes with k (1 + 1/K): 5 % more at K = 20, where P lies 7.43 kJ/mol below A."""
    plan = Plan(
        {"A": Member("CO", 0.0, 200.0), "P": Member("CO", g, 200.0)},
        (Line("A = P", "rate", "2.0 1/s"),),
        QUESTION,
    )
    result = plan.load(tmp_path).effective()
    excess = rate_of(result, "relaxation").rate_constant[0] / 2.0 - 1.0
    assert excess == pytest.approx(np.exp(g / (R * 298.15)), rel=1e-10)
    assert (excess > 0.05) == returns
    assert ("product-returns" in codes(result)) == returns


@pytest.mark.parametrize("phase", ["gas", "solution"])
def test_high_pressure_limit_is_assumed_where_it_counts(phase: str, tmp_path: Path) -> None:
    """For the unimolecular steps that control the rate, in the gas phase."""
    result = replace(BRANCHED, phase="gas").load(tmp_path).effective()
    said = [f.what for f in result.findings if f.code == "high-pressure-limit"]
    for step, line in zip(result.steps, BRANCHED.steps, strict=True):
        name = line.value if line.key == "through" else line.equation
        counts = any(
            np.any(np.abs(rate.control[name]) > 0.1)
            for rate in result.rates.values()
            if rate is not None
        )
        assert any(repr(step.equation) in what for what in said) == counts
    assert said
    if phase == "solution":
        plan = chain(1, (-10.0, 60.0), (20.0, 100.0), "1 mol/L")
        assert "high-pressure-limit" not in codes(plan.load(tmp_path).effective())


# -------------------------------------------------------------------------------------- errors


def fails(plan: Plan, folder: Path, sentence: str, where: str) -> None:
    with pytest.raises(StudyError, match=re.escape(sentence)) as caught:
        plan.load(folder).effective()
    assert caught.value.what == sentence
    assert caught.value.where == f"{folder / 'study.toml'} {where}"
    assert caught.value.mend


UNBALANCED = replace(
    BRANCHED.at(298.15),
    species={**MEMBERS, "V": Member("H2O", 1.0, 186.0)},
    steps=(*STEPS, Line("W = V", "rate", "3.0 1/s")),
    held={**BRANCHED.held, "V": "0.02 mol/L"},
)


def test_held_species_out_of_balance(tmp_path: Path) -> None:
    affinity = -(1.0 - 298.15 * (186.0 - 188.5) / 1000.0) / (R * 298.15)
    fails(
        UNBALANCED,
        tmp_path,
        f"held species are out of balance: W = V (by the loop of 'W = V') has an affinity of "
        f"{affinity:.4g} RT at 298.15 K, not 0",
        "[conditions] held",
    )


def test_out_of_balance_by_way_of_intermediates(tmp_path: Path) -> None:
    """No step joins W and V, but two ways through C1 and C2 do."""
    members = {**UNBALANCED.species, "T8": Member("CH2O2", 12.0, 255.0)}
    plan = replace(UNBALANCED, species=members, steps=(*STEPS, Line("A + V = C2", "through", "T8")))
    with pytest.raises(StudyError, match="held species are out of balance: ") as caught:
        plan.load(tmp_path).effective()
    assert "'A + V = C2'" in caught.value.what


def test_out_of_balance_at_the_other_end_of_the_range(tmp_path: Path) -> None:
    """Every temperature is looked at, not only the first."""
    balance = float(0.02 * np.exp(-(1.0 - 298.15 * -2.5 / 1000.0) / (R * 298.15)))
    held = {**BRANCHED.held, "V": f"{balance!r} mol/L"}
    good = replace(UNBALANCED, held=held)
    assert good.load(tmp_path).effective().rates["free"] is not None
    with pytest.raises(StudyError, match="RT at 400 K, not 0"):
        good.at(298.15, 400.0).load(tmp_path).effective()


@pytest.mark.parametrize(("excess", "closes"), [(0.0098, True), (0.0102, False)])
def test_balance_within_a_hundredth(excess: float, closes: bool, tmp_path: Path) -> None:
    balance = 0.02 * np.exp(-(1.0 - 298.15 * -2.5 / 1000.0) / (R * 298.15) + excess)
    plan = replace(UNBALANCED, held={**BRANCHED.held, "V": f"{float(balance)!r} mol/L"})
    if closes:
        plan.load(tmp_path).effective()
    else:
        with pytest.raises(StudyError, match="out of balance"):
            plan.load(tmp_path).effective()


def test_driven_studies_may_be_out_of_balance(tmp_path: Path) -> None:
    result = replace(UNBALANCED, driven=True).load(tmp_path).effective()
    assert result.rates["relaxation"] is None  # there is no equilibrium to relax to
    assert rate_of(result, "free").rate_constant[0] > 0.0


EXTRA = {
    "Q": Member("H2O", -5.0, 190.0),
    "A2": Member("C2O2", -10.0, 300.0),
    "K2": Member("Ar2", -20.0, 200.0),
    "X": Member("ArH2O", -5.0, 190.0),
}
AND_NONE_HELD = "and none of them is held"
NONLINEAR = {
    "two of the reactant": (
        Line("A + A = A2", "rate", "1.0 L/mol/s"),
        f"2 A stand on the left of 'A + A = A2' {AND_NONE_HELD}",
    ),
    "a by-product": (
        Line("C3 = C1 + Q", "rate", "1.0 1/s"),
        f"C1 and Q stand on the right of 'C3 = C1 + Q' {AND_NONE_HELD}",
    ),
    "reactant and product": (
        Line("A2 = A + P", "rate", "1.0 1/s"),
        f"A and P stand on the right of 'A2 = A + P' {AND_NONE_HELD}",
    ),
    "nothing on one side": (
        Line("Q = W", "rate", "1.0 1/s"),
        "every species on the right of 'Q = W' is held, but not on the other side",
    ),
    "nothing on the other": (
        Line("W = Q", "rate", "1.0 1/s"),
        "every species on the left of 'W = Q' is held, but not on the other side",
    ),
}


@pytest.mark.parametrize("case", NONLINEAR)
def test_networks_that_are_not_linear(case: str, tmp_path: Path) -> None:
    line, sentence = NONLINEAR[case]
    used = {name for side in line.sides() for name in side}
    members = {**MEMBERS, **{name: EXTRA[name] for name in used & {*EXTRA}}}
    if case == "reactant and product":
        members["A2"] = Member("C2H2O3", -10.0, 300.0)
    plan = replace(BRANCHED, species=members, steps=(*STEPS, line))
    fails(plan, tmp_path, f"the network is not linear: {sentence}", "[steps.9]")


def test_dimer_of_a_catalyst_is_not_linear(tmp_path: Path) -> None:
    plan = replace(
        CYCLE,
        species={**CATALYST, "K2": EXTRA["K2"]},
        steps=(*CYCLE_STEPS, Line("K + K = K2", "barrier", "none")),
    )
    sentence = f"the network is not linear: 2 K stand on the left of 'K + K = K2' {AND_NONE_HELD}"
    fails(plan, tmp_path, sentence, "[steps.6]")


def test_catalyst_that_does_not_come_back(tmp_path: Path) -> None:
    """Without the product nothing leads out of X: all of the catalyst would end up there."""
    plan = replace(
        CYCLE,
        species={**CATALYST, "X": Member("Ar", -50.0, 150.0), "TX": Member("ArCH2O2", 20.0, 260.0)},
        steps=(*CYCLE_STEPS, Line("KSW = X + P", "through", "TX")),
        held=HELD,
    )
    fails(
        plan,
        tmp_path,
        "no way leads back to the catalyst K from X: all of it ends up there",
        "[effective] catalyst",
    )
    result = replace(plan, held={**HELD, "P": "1e-9 mol/L"}).load(tmp_path).effective()
    assert rate_of(result, "cycle").rate_constant[0] > 0.0


def test_precatalyst_is_no_state_of_the_cycle(tmp_path: Path) -> None:
    members = {
        **CATALYST,
        "X": Member("ArCH2O2", -5.0, 250.0),
        "TX": Member("ArCH2O2", 20.0, 260.0),
    }
    plan = replace(
        CYCLE,
        species=members,
        steps=(*CYCLE_STEPS, Line("X = K + P", "through", "TX")),
        held=HELD,
        question={"catalyst": "X", "product": "P"},
    )
    with pytest.raises(StudyError, match="no way leads back to the catalyst X from K, KS, "):
        plan.load(tmp_path).effective()
    # named as it should be, the precatalyst has no share
    named = replace(plan, question=CYCLE.question)
    assert "X" not in (rate_of(named.load(tmp_path).effective(), "cycle").populations or {})


def test_no_way_to_the_product(tmp_path: Path) -> None:
    """The step that is missing is the one into the product; what is reached is named."""
    members = {**without(MEMBERS, "T4", "TP"), "X": Member("CH2O2", -9.0, 250.0)}
    members["TX"] = Member("CH2O2", 9.0, 250.0)
    steps = (*STEPS[:5], STEPS[6], Line("X = P", "through", "TX"))
    fails(
        replace(BRANCHED, species=members, steps=steps),
        tmp_path,
        "no way from A to P: A leads to C1, C2, C3, D and no further",
        "[effective] product",
    )


def test_no_question(tmp_path: Path) -> None:
    text = BRANCHED.text().split("[effective]")[0]
    (tmp_path / "study.toml").write_text(text, encoding="utf-8")
    with pytest.raises(StudyError, match="the study does not say what the rate is of"):
        Study.load(tmp_path / "study.toml").effective()


# -------------------------------------------------------------------------------- robustness


def plain(value: Any) -> Any:
    """Turn a result into lists and numbers that can be compared."""
    if is_dataclass(value) and not isinstance(value, type):
        return {field.name: plain(getattr(value, field.name)) for field in fields(value)}
    if isinstance(value, Mapping):
        return {key: plain(entry) for key, entry in value.items()}
    if isinstance(value, np.ndarray):
        return [repr(entry) for entry in value.tolist()]
    if isinstance(value, (tuple, list)):
        return [plain(entry) for entry in value]
    return value


@pytest.mark.parametrize("plan", [BRANCHED, CYCLE], ids=["network", "cycle"])
def test_same_call_same_answer(plan: Plan, tmp_path: Path) -> None:
    study = plan.at(280.0, 350.0).load(tmp_path)
    before = study.path.read_bytes()
    assert plain(study.effective()) == plain(study.effective())
    assert study.path.read_bytes() == before


def test_order_of_temperatures_is_kept(tmp_path: Path) -> None:
    """As listed: rising, falling, mixed; each temperature has the values that it has alone."""
    plan = chain(1, (-60.0, 200.0), (-30.0, 90.0), "1 mol/L")
    grid = [280.0, 420.0, 300.0]
    listed = plan.at(*grid).load(tmp_path).effective()
    assert listed.temperature_k.tolist() == grid
    for k, t in enumerate(grid):
        alone = plan.at(t).load(tmp_path).effective()
        for definition in ("free", "pool", "relaxation"):
            one, other = rate_of(listed, definition), rate_of(alone, definition)
            assert one.rate_constant[k] == pytest.approx(other.rate_constant[0], rel=1e-13)
            assert one.arrhenius_energy_kj_mol[k] == pytest.approx(
                other.arrhenius_energy_kj_mol[0], abs=1e-11, rel=0.0
            )
        for name, values in listed.held_mol_l.items():
            assert values[k] == pytest.approx(alone.held_mol_l[name][0], rel=1e-13)
        assert rate_of(listed, "pool").resting_state is not None
    falling = plan.at(*sorted(grid, reverse=True)).load(tmp_path).effective()
    rising = plan.at(*sorted(grid)).load(tmp_path).effective()
    for definition in ("free", "pool", "relaxation"):
        one, other = rate_of(falling, definition), rate_of(rising, definition)
        assert one.rate_constant[::-1] == pytest.approx(other.rate_constant, rel=1e-13)


WIDE = (10.0, 100.0, 1000.0, 5000.0)


@pytest.mark.parametrize(
    ("kind", "grid"),
    [
        ("network", WIDE),
        ("network", (10.0,)),
        ("network", (5000.0,)),
        ("far apart", WIDE[::-1]),
        ("product held", WIDE[1:]),
        ("cycle", WIDE),
        ("absent", WIDE),
    ],
    ids=str,
)
def test_from_10_to_5000_kelvin(kind: str, grid: tuple[float, ...], tmp_path: Path) -> None:
    """No warning (they are errors here), whatever over- or underflows; E_a is finite throughout."""
    deep = {
        name: replace(member, enthalpy=member.enthalpy - 250.0) if name.startswith("T") else member
        for name, member in MEMBERS.items()
    }
    plan = {
        "network": BRANCHED,
        "far apart": replace(BRANCHED, species=deep),
        "product held": replace(BRANCHED, held={**BRANCHED.held, "P": "1e-3 mol/L"}),
        "cycle": CYCLE,
        "absent": replace(CYCLE, held=HELD),
    }[kind]
    study = plan.at(*grid).load(tmp_path)
    result = study.effective()
    for rate in result.rates.values():
        if rate is not None:
            assert np.all(np.isfinite(rate.arrhenius_energy_kj_mol))
            total = sum(rate.control[name] for name in rate.saddles)
            assert total == pytest.approx(np.ones(len(grid)), abs=1e-9)
            assert not np.any(np.isnan(rate.rate_constant))
    assert "nan" not in " ".join(result.words)


def test_rates_a_thousand_orders_of_magnitude_apart(tmp_path: Path) -> None:
    """Where singular values leave the range of ordinary numbers: ln k against the reference.

    E_a of the relaxation shows that the vectors are right too.
    """
    deep = {
        name: replace(member, enthalpy=member.enthalpy - 250.0) if name.startswith("T") else member
        for name, member in MEMBERS.items()
    }
    t, digits = 40.0, 4000
    plan = replace(BRANCHED.at(t), species=deep)
    result = plan.load(tmp_path).effective()
    for definition in ("free", "pool", "relaxation"):
        rate = rate_of(result, definition)
        with mp.workdps(digits):
            exact = mp.log(Reference(plan, mp.mpf(t), digits=digits).rate(definition))
        frequency = np.log(1.380649e-23 * t / 6.62607015e-34)
        log = frequency - rate.activation.gibbs_kj_mol[0] / (R * t)
        assert log == pytest.approx(float(exact), abs=1e-9, rel=1e-12)
        energy = float(arrhenius_energy(plan, t, definition, digits))
        assert rate.arrhenius_energy_kj_mol[0] == pytest.approx(energy, abs=1e-8, rel=0.0)


def test_results_cannot_be_changed(tmp_path: Path) -> None:
    result = BRANCHED.load(tmp_path).effective()
    pool = rate_of(result, "pool")
    arrays = [
        result.temperature_k,
        result.held_mol_l["W"],
        pool.rate_constant,
        pool.control["T1"],
        pool.activation.gibbs_kj_mol,
        pool.approximations[0].ratio,
        result.steps[0].reversibility,
    ]
    for array in arrays:
        with pytest.raises(ValueError, match="read-only"):
            array[0] = 1.0
    with pytest.raises(TypeError):
        pool.control["T1"] = pool.rate_constant  # type: ignore[index]


def test_table_of_plain_numbers(tmp_path: Path) -> None:
    result = BRANCHED.at(280.0, 350.0).load(tmp_path).effective()
    table = result.table()
    assert len(table) == 6
    rows = table[table.definition == "pool"]
    assert rows.rate_constant.tolist() == rate_of(result, "pool").rate_constant.tolist()
    assert rows.temperature_k.tolist() == [280.0, 350.0]
    assert set(rows.unit) == {"s^-1"}
    assert "<table" in result._repr_html_()
