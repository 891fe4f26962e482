"""The run: what a report shows, the same numbers as each command gives, and why parts are not there."""

from __future__ import annotations

import hashlib
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from declared_study import TEXT

from thermo_pp.conditions import standard_state
from thermo_pp.errors import StudyError
from thermo_pp.kinetics.courses import course_temperatures
from thermo_pp.names import LOW_MODES
from thermo_pp.study.answers import Answers
from thermo_pp.study.load import Study
from thermo_pp.study.run import Measured, answer, standard_states

ROOT = Path(__file__).parents[1]
BUNDLED = ROOT / "fixtures" / "stack-plume" / "study.toml"


@pytest.fixture(scope="module")
def bundled(bundled_answers: Answers) -> Answers:
    return bundled_answers


def written(tmp_path: Path, text: str = TEXT) -> Study:
    path = tmp_path / "study.toml"
    path.write_text(text, encoding="utf-8")
    return Study.load(path)


def test_the_own_profile_is_that_of_the_command(bundled: Answers) -> None:
    assert bundled.own == ("rotor-entropy", "1 bar")
    own = bundled.study.profile()
    assert bundled.profile is not None
    for one, other in zip(bundled.profile.states, own.states, strict=True):
        assert one.state == other.state
        assert np.array_equal(one.gibbs_kj_mol, other.gibbs_kj_mol)


def test_every_choice_is_what_the_options_of_a_command_give(bundled: Answers) -> None:
    """All species of the bundled study are read, so an option and a choice mean the same there."""
    assert list(bundled.profiles) == [(low, s) for s in ("1 bar", "1 mol/L") for low in LOW_MODES]
    for (low, state), found in bundled.profiles.items():
        keys = {"low_modes": low, "standard_state": state}
        other = bundled.study.altered(keys, {}).profile()
        assert found.standard_state == other.standard_state == state
        for one, two in zip(found.states, other.states, strict=True):
            assert one.gibbs_kj_mol == pytest.approx(two.gibbs_kj_mol, abs=1e-9, rel=0.0)
            assert one.entropy_j_mol_k == pytest.approx(two.entropy_j_mol_k, abs=1e-9, rel=0.0)
            assert one.zero_point_kj_mol == two.zero_point_kj_mol


def test_rates_with_every_treatment(bundled: Answers) -> None:
    assert list(bundled.effective_by_treatment) == list(LOW_MODES)
    assert bundled.effective_by_treatment["rotor-entropy"] is bundled.effective
    harmonic = bundled.study.altered({"low_modes": "harmonic"}, {}).effective()
    mine = bundled.effective_by_treatment["harmonic"].rates["pool"]
    theirs = harmonic.rates["pool"]
    assert mine is not None
    assert theirs is not None
    assert np.array_equal(mine.rate_constant, theirs.rate_constant)
    own = bundled.effective_by_treatment["rotor-entropy"].rates["pool"]
    assert own is not None
    assert not np.allclose(own.rate_constant, mine.rate_constant, rtol=1e-3)


def test_species_and_findings(bundled: Answers) -> None:
    assert list(bundled.species) == list(bundled.study.species)
    for name, one in bundled.species.items():
        direct = bundled.study.species[name].at(np.array([280.0, 298.15]))
        assert np.array_equal(one.result.gibbs_kj_mol, direct.gibbs_kj_mol)
    assert set(bundled.study.findings) <= set(bundled.findings)
    assert len(set(bundled.findings)) == len(bundled.findings)


def test_inputs_are_the_study_and_its_outputs(bundled: Answers) -> None:
    assert bundled.inputs[0].path == str(BUNDLED)
    assert len(bundled.inputs) == 1 + 2 * len(bundled.study.species)
    for one in bundled.inputs:
        assert one.sha256 == hashlib.sha256(Path(one.path).read_bytes()).hexdigest()
    assert {one.program for one in bundled.inputs} == {None, "nwchem", "psi4"}


def test_what_is_not_asked_is_left_out_with_a_reason(bundled: Answers) -> None:
    assert set(bundled.left_out) == {
        *("transient", "flow", "isotopes", "ensembles", "formation", "selectivity", "comparison"),
    }
    assert bundled.left_out["flow"] == "the study has no [conditions] flow"
    assert bundled.transient is None
    assert bundled.isotopes == ()


def test_a_declared_study_keeps_what_was_declared(tmp_path: Path) -> None:
    """A declared entropy is meant for the study's standard state; showing another one converts it."""
    study = written(tmp_path)
    found = answer(study)
    bar, molar = (found.profiles["harmonic", state] for state in ("1 bar", "1 mol/L"))
    where = [k for k, state in enumerate(bar.states) if state.state.startswith("C")]
    t = np.array([280.0, 298.15])
    bars = 0.01 * 8.31446261815324 * t  # of 1 mol/L, in bar
    for k in where:  # C + W from A + 2 W: one molecule less
        change = molar.states[k].gibbs_kj_mol - bar.states[k].gibbs_kj_mol
        lost = sum(n for _, n in bar.states[0].species) - sum(n for _, n in bar.states[k].species)
        expected = -lost * 8.31446261815324e-3 * t * np.log(bars)
        assert change == pytest.approx(expected, abs=1e-9, rel=0.0)
    assert where
    rates = [one.rates["free"] for one in found.effective_by_treatment.values()]
    for one in rates:
        assert one is not None
        assert rates[0] is not None
        assert np.array_equal(one.rate_constant, rates[0].rate_constant)


def test_no_question_no_profile_no_rate(tmp_path: Path) -> None:
    found = answer(written(tmp_path, TEXT.split("[effective]")[0]))
    assert found.profile is None
    assert not found.profiles
    assert found.effective is None
    assert not found.effective_by_treatment
    assert "[effective]" in found.left_out["profiles"]
    assert "[effective]" in found.left_out["effective"]
    assert found.species


def test_what_is_asked_and_cannot_be_computed_is_an_error(tmp_path: Path) -> None:
    held = 'held = { W = "1e-3 mol/L", W2 = "1e-3 mol/L" }'
    text = TEXT.replace('held = { W = "1e-3 mol/L", W2 = "equilibrium" }', held)
    assert text != TEXT
    study = written(tmp_path, text)
    with pytest.raises(StudyError, match="held species are out of balance"):
        answer(study)


def test_time_courses_are_at_the_ends_and_near_room_temperature(tmp_path: Path) -> None:
    text = TEXT.replace("[species.A]", 'initial = { A = "1e-6 mol/L" }\n\n[species.A]', 1)
    found = answer(written(tmp_path, text), times_s=(0.1, 1.0))
    assert found.transient is not None
    assert [course.temperature_k for course in found.transient.courses] == [280.0, 298.15]
    assert found.transient.courses[0].time_s.tolist() == [0.1, 1.0]
    assert course_temperatures((360.0, 300.0, 280.0, 290.0)) == (280.0, 300.0, 360.0)
    assert course_temperatures((400.0,)) == (400.0,)


def test_regimes_over_what_is_held(bundled: Answers, tmp_path: Path) -> None:
    assert bundled.regimes is not None
    assert bundled.regimes.species == "W"
    assert bundled.regimes.amount[[0, -1]] == pytest.approx([2e-6, 2e-2], rel=1e-12)
    asked = TEXT + '\n[regimes]\nover = "W"\nfrom = "1e-4 mol/L"\nto = "1e-3 mol/L"\npoints = 3\n'
    found = answer(written(tmp_path, asked))
    assert found.regimes is not None
    assert found.regimes.amount[[0, -1]].tolist() == [1e-4, 1e-3]


def test_measurements(tmp_path: Path) -> None:
    study = Study.load(BUNDLED, temperatures=["298.15 K"])
    file = BUNDLED.with_name("measured.csv")
    found = answer(study, measured=Measured(file))
    assert found.comparison is not None
    assert found.comparison.words == study.compare(file).words
    assert found.inputs[1].path == str(file)
    with pytest.raises(StudyError, match=r"none\.csv"):
        answer(written(tmp_path), measured=Measured(tmp_path / "none.csv"))


def test_standard_states_once_each() -> None:
    own = standard_state("1000 mbar", where="")
    assert [state.text for state in standard_states(own)] == ["1000 mbar", "1 mol/L"]
    own = standard_state("1 atm", where="")
    assert [state.text for state in standard_states(own)] == ["1 atm", "1 bar", "1 mol/L"]


def test_progress_tells_every_stage_once(tmp_path: Path) -> None:
    told: list[tuple[int, int, str]] = []
    answer(written(tmp_path), progress=lambda done, of, what: told.append((done, of, what)))
    assert [done for done, _, _ in told] == list(range(len(told)))
    assert {of for _, of, _ in told} == {len(told) - 1}
    assert told[-1][2] == ""


def test_answers_are_frozen(bundled: Answers) -> None:
    with pytest.raises(TypeError):
        bundled.left_out["x"] = "y"  # type: ignore[index]
    assert replace(bundled, left_out={}).left_out == {}
