"""The profile: identities that hold for any study, working concentrations, references, filled-up paths."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path

import mpmath as mp
import numpy as np
import pytest
from exact_study import (
    BRANCHED,
    CYCLE,
    CYCLE_STEPS,
    HELD,
    MEMBERS,
    STEPS,
    Line,
    Member,
    Plan,
    Reference,
    without,
)

from thermo_pp.errors import StudyError
from thermo_pp.names import LOW_MODES
from thermo_pp.profile import Profile, State
from thermo_pp.study.load import Study

R = 8.31446261815324e-3  # kJ/mol/K
GRID = (250.0, 298.15, 400.0)
PLUME = Path(__file__).parent.parent / "fixtures" / "stack-plume" / "study.toml"
TWO_MORE = replace(
    BRANCHED.at(*GRID),
    species={**MEMBERS, "W3": Member("(H2O)3", -40.0, 360.0), "T5": Member("CH6O4", -30.0, 380.0)},
    steps=(
        Line("W2 + W = W3", "rate", "1e7 L/mol/s"),
        *STEPS,
        Line("A + W3 = P + 2 W", "through", "T5"),
    ),
    held={"W": "3000 Pa", "W2": "equilibrium", "W3": "equilibrium"},
)


@pytest.fixture(scope="module")
def plume() -> Study:
    return Study.load(PLUME, temperatures=[280.0, 320.0, 360.0])


def profile_of(plan: Plan, folder: Path, **options: object) -> Profile:
    return plan.load(folder).profile(**options)


def by_name(profile: Profile, name: str) -> State:
    """Return the first state of this name."""
    return next(state for state in profile.states if state.state == name)


def content(plan: Plan, counts: Mapping[str, int]) -> dict[str, int]:
    total: dict[str, int] = {}
    for name, count in counts.items():
        for element, number in plan.species[name].atoms.items():
            total[element] = total.get(element, 0) + count * number
    return total


# ---------------------------------------------------------------------------------- identities


@pytest.mark.parametrize("at_conditions", [False, True])
def test_free_energy_is_enthalpy_less_entropy(at_conditions: bool, tmp_path: Path) -> None:
    profile = profile_of(TWO_MORE, tmp_path, at_conditions=at_conditions)
    assert profile.at == ("conditions" if at_conditions else "standard state")
    for state in profile.states:
        expected = state.enthalpy_kj_mol - profile.temperature_k * state.entropy_j_mol_k / 1000.0
        assert state.gibbs_kj_mol == pytest.approx(expected, abs=1e-11, rel=0.0)


@pytest.mark.parametrize("at_conditions", [False, True])
def test_free_energy_of_outputs(at_conditions: bool, plume: Study) -> None:
    profile = plume.profile(at_conditions=at_conditions)
    for state in profile.states:
        expected = state.enthalpy_kj_mol - profile.temperature_k * state.entropy_j_mol_k / 1000.0
        assert state.gibbs_kj_mol == pytest.approx(expected, abs=1e-9, rel=0.0)
        assert state.electronic_kj_mol is not None
        assert state.zero_point_kj_mol is not None


@pytest.mark.parametrize("reference", [None, "C1 + 2 W", "T5"])
@pytest.mark.parametrize("at_conditions", [False, True])
def test_reference_is_zero(at_conditions: bool, reference: str | None, tmp_path: Path) -> None:
    profile = profile_of(TWO_MORE, tmp_path, reference=reference, at_conditions=at_conditions)
    assert profile.reference == (reference or profile.states[0].state)
    found = [state for state in profile.states if state.state == profile.reference]
    assert found
    for state in found:
        for values in (state.enthalpy_kj_mol, state.entropy_j_mol_k, state.gibbs_kj_mol):
            assert np.all(values == 0.0)
        assert np.all(state.low_mode_spread_kj_mol == 0.0)


def test_reference_shifts_every_state_alike(tmp_path: Path) -> None:
    first, other = (profile_of(TWO_MORE, tmp_path, reference=name) for name in (None, "C1 + 2 W"))
    shift = by_name(first, "C1 + 2 W")
    for one, two in zip(first.states, other.states, strict=True):
        assert one.state == two.state
        for field in ("enthalpy_kj_mol", "entropy_j_mol_k", "gibbs_kj_mol"):
            moved = getattr(one, field) - getattr(shift, field)
            assert getattr(two, field) == pytest.approx(moved, abs=1e-11, rel=0.0)


@pytest.mark.parametrize("at_conditions", [False, True])
def test_same_state_by_every_path(at_conditions: bool, tmp_path: Path) -> None:
    """A state is a sum of species: its values do not depend on the way to it."""
    profile = profile_of(TWO_MORE, tmp_path, at_conditions=at_conditions)
    assert len({state.path for state in profile.states}) > 3
    seen: dict[tuple[tuple[str, int], ...], State] = {}
    repeated = 0
    for state in profile.states:
        key = tuple(sorted(state.species))
        if key in seen:
            repeated += 1
            for field in ("enthalpy_kj_mol", "entropy_j_mol_k", "gibbs_kj_mol"):
                assert np.array_equal(getattr(state, field), getattr(seen[key], field))
        seen.setdefault(key, state)
    assert repeated > 5


def test_states_by_hand(tmp_path: Path) -> None:
    """Declared enthalpies and entropies summed up, against A + 3 W."""
    profile = profile_of(TWO_MORE, tmp_path, reference="A + 3 W")
    for state in profile.states:
        counts = dict(state.species)
        enthalpy = sum(n * TWO_MORE.species[s].enthalpy for s, n in counts.items())
        entropy = sum(n * TWO_MORE.species[s].entropy for s, n in counts.items())
        entropy -= 200.0 + 3 * 188.5
        assert state.enthalpy_kj_mol == pytest.approx(np.full(3, enthalpy), abs=1e-11, rel=0.0)
        assert state.entropy_j_mol_k == pytest.approx(np.full(3, entropy), abs=1e-10, rel=0.0)
        assert state.electronic_kj_mol is None
        assert state.zero_point_kj_mol is None
        assert np.all(state.low_mode_spread_kj_mol == 0.0)
        saddles = {step.value for step in TWO_MORE.steps if step.key == "through"}
        assert (state.kind == "saddle") == bool(saddles & {*counts})


# ---------------------------------------------------------------------------- working conditions


@pytest.mark.parametrize("state", ["1 bar", "1 mol/L"])
def test_working_concentrations_add_their_logarithm(state: str, tmp_path: Path) -> None:
    """G + RT ln a for every held species, its own standard state; what is not held stays as it is."""
    plan = replace(TWO_MORE, standard_state=state)
    standard, working = (profile_of(plan, tmp_path, at_conditions=x) for x in (False, True))
    rt = R * np.array(GRID)
    reference = [Reference(plan, mp.mpf(t)) for t in GRID]
    per_state = np.array([1.0 if state == "1 mol/L" else 1.0 / (10.0 * R * t) for t in GRID])
    logs = {
        name: np.array([float(mp.log(one.held[name])) for one in reference]) - np.log(per_state)
        for name in plan.held
    }
    start = dict(working.states[0].species)
    for before, after in zip(standard.states, working.states, strict=True):
        gain = np.zeros(3)
        for name, log in logs.items():
            gain += (dict(after.species).get(name, 0) - start.get(name, 0)) * log
        assert after.gibbs_kj_mol == pytest.approx(before.gibbs_kj_mol + rt * gain, abs=1e-10)
        assert after.entropy_j_mol_k == pytest.approx(
            before.entropy_j_mol_k - 1000.0 * R * gain, abs=1e-9
        )
        assert np.array_equal(after.enthalpy_kj_mol, before.enthalpy_kj_mol)


def test_equilibrium_species_are_in_balance(tmp_path: Path) -> None:
    """At working concentrations 3 W, W + W2 and W3 beside A have the same free energy."""
    paths = "[[paths]]\nname = 'through water'\nsteps = [2, 1, 10]\n"
    file = tmp_path / "study.toml"
    file.write_text(TWO_MORE.text() + paths, encoding="utf-8")
    profile = Study.load(file).profile(at_conditions=True)
    names = [state.state for state in profile.states]
    assert names[0] == "A + 3 W"
    held = [state for state in profile.states if dict(state.species).get("A") == 1]
    assert len(held) == 3
    for state in held:
        assert state.gibbs_kj_mol == pytest.approx(np.zeros(3), abs=1e-10, rel=0.0)
    away = Study.load(file).profile()
    assert np.all(np.abs(by_name(away, names[1]).gibbs_kj_mol) > 0.1)


def test_barriers_are_those_of_the_rates(tmp_path: Path) -> None:
    """At working concentrations the height of a saddle over A gives its pseudo-first-order constant."""
    plan = replace(BRANCHED.at(*GRID), phase="solution", standard_state="1 mol/L")
    steps = (Line("W + W = W2", "rate", "1e9 L/mol/s"), *STEPS[1:])
    study = replace(plan, steps=steps).load(tmp_path)
    profile, result = study.profile(at_conditions=True), study.effective()
    t = np.array(GRID)
    frequency = 1.380649e-23 * t / 6.62607015e-34
    height = by_name(profile, "T1 + W").gibbs_kj_mol
    assert frequency * np.exp(-height / (R * t)) == pytest.approx(
        result.steps[1].forward_rate_constant * 0.02, rel=1e-10
    )


# ----------------------------------------------------------------------------------- soft modes


def test_spread_is_that_of_relative_free_energies(plume: Study) -> None:
    """Largest less smallest relative G over the treatments, each from a study of its own."""
    profile = plume.profile()
    alone = [
        Study.load(
            PLUME, temperatures=[280.0, 320.0, 360.0], treatment={"low_modes": low}
        ).profile()
        for low in LOW_MODES
    ]
    for number, state in enumerate(profile.states):
        values = np.stack([one.states[number].gibbs_kj_mol for one in alone])
        spread = values.max(axis=0) - values.min(axis=0)
        assert state.low_mode_spread_kj_mol == pytest.approx(spread, abs=1e-9, rel=0.0)
        if state.state == profile.reference:
            assert np.all(state.low_mode_spread_kj_mol == 0.0)
    assert max(state.low_mode_spread_kj_mol.max() for state in profile.states) > 0.5
    # a spread of sums would be larger: species' own spreads do not add up
    own = LOW_MODES.index("rotor-entropy")
    for state, same in zip(profile.states, alone[own].states, strict=True):
        assert np.array_equal(state.gibbs_kj_mol, same.gibbs_kj_mol)


def test_electronic_energies_by_hand(plume: Study) -> None:
    """Relative electronic and zero-point energies are sums over the members'."""
    profile = plume.profile()
    thermo = {name: model.at(298.15) for name, model in plume.species.items()}
    start = dict(profile.states[0].species)
    for state in profile.states:
        for field in ("electronic_kj_mol", "zero_point_kj_mol"):
            total = sum(n * getattr(thermo[s], field) for s, n in state.species)
            total -= sum(n * getattr(thermo[s], field) for s, n in start.items())
            assert getattr(state, field) == pytest.approx(total, abs=1e-9, rel=0.0)


# --------------------------------------------------------------------------------------- paths


def test_paths_are_filled_up_to_one_composition(tmp_path: Path) -> None:
    profile = profile_of(TWO_MORE, tmp_path)
    whole = content(TWO_MORE, {"A": 1, "W": 3})
    for state in profile.states:
        assert content(TWO_MORE, dict(state.species)) == whole, state.state
    starts = {state.path: state for state in reversed(profile.states)}
    # the same reactants, whichever form of water the path uses
    assert {start.state for start in starts.values()} == {"A + 3 W", "A + W3"}
    assert set(profile.net_reactions) == {state.path for state in profile.states}


def test_cycle_ends_below_its_start_by_the_net_reaction(tmp_path: Path) -> None:
    plan = CYCLE.at(*GRID)
    for at_conditions in (False, True):
        profile = profile_of(plan, tmp_path, at_conditions=at_conditions)
        [(path, net)] = profile.net_reactions.items()
        assert net == "S + W = P"
        first, *_, last = [state for state in profile.states if state.path == path]
        assert first.state == "K + S + W"
        assert last.state == "K + P"
        t = np.array(GRID)
        gibbs = -80.0 - t * (270.0 - 200.0 - 188.5) / 1000.0
        if at_conditions:
            to_bar = 10.0 * R * t
            gibbs += R * t * (np.log(0.01) - np.log(0.1) - np.log(0.2) - np.log(to_bar))
        assert last.gibbs_kj_mol == pytest.approx(gibbs, abs=1e-10, rel=0.0)


def test_path_that_cannot_be_filled_up(tmp_path: Path) -> None:
    """Helped by water or by hydrogen peroxide: no sum of these makes up for one O; a note says so."""
    members = {
        "A": Member("CO", 0.0, 200.0),
        "P": Member("CO", -9.0, 205.0),
        "W": Member("H2O", 0.0, 188.5),
        "V": Member("H2O2", 0.0, 230.0),
        "TW": Member("CH2O2", 30.0, 255.0),
        "TV": Member("CH2O3", 20.0, 265.0),
    }
    steps = (
        Line("A + W = P + W", "through", "TW"),
        Line("A + V = P + V", "through", "TV"),
    )
    held = {"W": "0.1 mol/L", "V": "0.1 mol/L"}
    plan = Plan(members, steps, {"reactant": "A", "product": "P"}, held, GRID)
    profile = profile_of(plan, tmp_path)
    [note] = profile.findings
    assert (note.code, note.severity) == ("other-composition", "note")
    starts = {state.path: state for state in reversed(profile.states)}
    assert {start.state for start in starts.values()} == {"A + W", "A + V"}
    for start in starts.values():
        assert np.all(start.gibbs_kj_mol == 0.0)
    assert by_name(profile, "TV").enthalpy_kj_mol == pytest.approx(np.full(3, 20.0))
    assert by_name(profile, "TW").enthalpy_kj_mol == pytest.approx(np.full(3, 30.0))


@pytest.mark.parametrize(
    ("name", "what"),
    [
        ("C1", "C1 is no state of the profile"),
        ("A + W", "A + W is no state of the profile"),
        ("B + 3 W", "B + 3 W is no state of the profile"),
        ("A = C1", "'A = C1' is no sum of species"),
        ("", "'' is no sum of species"),
        ("A + 3W", "A + 3W is no state of the profile"),
    ],
)
def test_wrong_reference(name: str, what: str, tmp_path: Path) -> None:
    study = TWO_MORE.load(tmp_path)
    with pytest.raises(StudyError, match=re.escape(what)) as caught:
        study.profile(reference=name)
    assert caught.value.what == what
    assert repr(name) in caught.value.where
    assert caught.value.mend.startswith("choose one of: ")
    assert {"A + 3 W", "T5", "C1 + 2 W"} <= {*caught.value.mend[15:].split(", ")}


@pytest.mark.parametrize("name", ["2 W + C1", "C1 + W + W", " C1  +  2 W "])
def test_reference_in_any_order(name: str, tmp_path: Path) -> None:
    assert profile_of(TWO_MORE, tmp_path, reference=name).reference == "C1 + 2 W"


def test_one_temperature_and_falling_ones(tmp_path: Path) -> None:
    """The order is kept, and each temperature has the values that it has alone."""
    falling = profile_of(TWO_MORE.at(400.0, 250.0), tmp_path)
    assert falling.temperature_k.tolist() == [400.0, 250.0]
    for k, t in enumerate((400.0, 250.0)):
        alone = profile_of(TWO_MORE.at(t), tmp_path)
        for one, other in zip(falling.states, alone.states, strict=True):
            assert one.gibbs_kj_mol[k] == other.gibbs_kj_mol[0]


def test_table_has_a_row_for_each_state_and_temperature(tmp_path: Path) -> None:
    profile = profile_of(TWO_MORE, tmp_path)
    table = profile.table()
    assert len(table) == 3 * len(profile.states)
    first = table[table.state == "C1 + 2 W"].iloc[0]
    assert first.gibbs_kj_mol == by_name(profile, "C1 + 2 W").gibbs_kj_mol[0]
    assert "<table" in profile._repr_html_()


def test_states_cannot_be_changed(tmp_path: Path) -> None:
    profile = profile_of(TWO_MORE, tmp_path)
    state = profile.states[1]
    arrays = (state.enthalpy_kj_mol, state.entropy_j_mol_k, state.gibbs_kj_mol)
    for values in (profile.temperature_k, *arrays):
        with pytest.raises(ValueError, match="read-only"):
            values[0] = 0.0


def test_no_question_and_no_paths(tmp_path: Path) -> None:
    file = tmp_path / "study.toml"
    file.write_text(BRANCHED.text().split("[effective]")[0], encoding="utf-8")
    with pytest.raises(StudyError, match="nothing says where a path begins and ends"):
        Study.load(file).profile()


def test_unheld_water_is_no_obstacle(tmp_path: Path) -> None:
    """A profile needs no concentrations."""
    members = without(MEMBERS, "W2")
    plan = replace(BRANCHED, species=members, steps=STEPS[1:], held={})
    held = replace(plan, held={"W": "1.0 mol/L"})
    for one, other in zip(
        profile_of(plan, tmp_path).states, profile_of(held, tmp_path).states, strict=True
    ):
        assert one.state == other.state
        assert np.array_equal(one.gibbs_kj_mol, other.gibbs_kj_mol)


def test_catalyst_of_which_the_product_is_absent(tmp_path: Path) -> None:
    """At working conditions what is not held stays in its standard state."""
    plan = replace(CYCLE.at(*GRID), held=HELD, steps=CYCLE_STEPS)
    profile = profile_of(plan, tmp_path, at_conditions=True)
    last = [state for state in profile.states if "P" in dict(state.species)][-1]
    t = np.array(GRID)
    gibbs = -80.0 - t * (270.0 - 388.5) / 1000.0
    gibbs += R * t * (-np.log(0.1) - np.log(0.2) - 2.0 * np.log(10.0 * R * t))
    assert last.gibbs_kj_mol == pytest.approx(gibbs, abs=1e-10, rel=0.0)
