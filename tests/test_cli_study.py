"""The commands that take a study: their answers are the library's, in every format."""

from __future__ import annotations

import csv
import io
import json
import math
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from click.testing import CliRunner, Result

import thermo_pp as tp
from thermo_pp.cli import main
from thermo_pp.conditions import Treatment
from thermo_pp.kinetics.results import EffectiveRate
from thermo_pp.output import barrier, barrier_tables
from thermo_pp.output.json_text import json_text
from thermo_pp.output.plain import WIDTH, terminal
from thermo_pp.profile import Profile

PLUME = Path(__file__).parents[1] / "fixtures" / "stack-plume"
STUDY = """
title = "declared"
[conditions]
temperatures = { from = "280 K", to = "360 K", step = "10 K" }
held = { W = "2e-4 mol/L" }
[species]
A = { composition = "SO3", enthalpy = "0 kJ/mol", entropy = "256 J/mol/K" }
W = { composition = "H2O", enthalpy = "0 kJ/mol", entropy = "188 J/mol/K" }
C = { composition = "H2O4S", enthalpy = "-30 kJ/mol", entropy = "320 J/mol/K" }
P = { composition = "H2O4S", enthalpy = "-95 kJ/mol", entropy = "295 J/mol/K" }
TS = { composition = "H2O4S", enthalpy = "15 kJ/mol", entropy = "290 J/mol/K" }
[[steps]]
equation = "A + W = C"
barrier = "none"
[[steps]]
equation = "C = P"
through = "TS"
[effective]
reactant = "A"
product = "P"
"""
RATE_KEYS = (
    "rate_constant unit arrhenius_energy_kj_mol activation_enthalpy_kj_mol "
    "activation_entropy_j_mol_k activation_gibbs_kj_mol standard_activation sign_changes control "
    "orders approximations"
)


@pytest.fixture(scope="module")
def study(tmp_path_factory: pytest.TempPathFactory) -> str:
    path = tmp_path_factory.mktemp("study") / "study.toml"
    path.write_text(STUDY)
    return str(path)


@pytest.fixture(scope="module")
def profile(study: str) -> Profile:
    return tp.Study.load(study).profile()


@pytest.fixture(scope="module")
def effective(study: str) -> EffectiveRate:
    return tp.Study.load(study).effective()


def run(*arguments: str, status: int = 0) -> Result:
    result = CliRunner().invoke(main, list(arguments), prog_name="thermo-pp")
    assert result.exit_code == status, (result.stdout, result.stderr, result.exception)
    return result


def answer(*arguments: str) -> dict[str, Any]:
    read = json.loads(run(*arguments, "--format", "json").stdout)
    assert isinstance(read, dict)
    return read


# -- profile


def test_profile_json(study: str, profile: Profile) -> None:
    read = answer("profile", study)
    assert read["format"] == "thermo-pp/profile/1"
    assert {"treatment", "standard_state", "findings"} <= set(read)
    assert read["reference"] == "A + W"
    assert read["at"] == "standard state"
    assert read["temperature_k"] == [280.0 + 10.0 * k for k in range(9)]
    for state, same in zip(read["states"], profile.states, strict=True):
        assert (state["path"], state["state"], state["kind"]) == (same.path, same.state, same.kind)
        assert state["species"] == dict(same.species)
        for key in ("enthalpy_kj_mol", "entropy_j_mol_k", "gibbs_kj_mol", "low_mode_spread_kj_mol"):
            assert state[key] == list(getattr(same, key)), key
        assert state["electronic_kj_mol"] is None
        assert state["zero_point_kj_mol"] is None


def test_profile_options_reach_the_study(study: str) -> None:
    read = answer("profile", study, "-T", "300", "--standard-state", "1 mol/L", "--low-modes",
                  "harmonic", "--reference", "C", "--at-conditions", "--onset", "50",
                  "--frequency-scale", "0.97")  # fmt: skip
    assert read["temperature_k"] == [300.0]
    assert read["standard_state"] == "1 mol/L"
    assert read["at"] == "conditions"
    assert read["reference"] == "C"
    assert {state["state"]: state["gibbs_kj_mol"] for state in read["states"]}["C"] == [0.0]
    treatment = read["treatment"]
    assert (treatment["low_modes"], treatment["onset_cm"]) == ("harmonic", 50.0)
    assert (treatment["frequency_scale"], treatment["zero_point_scale"]) == (0.97, 0.97)


def test_profile_table(study: str, profile: Profile) -> None:
    text = run("profile", study).stdout
    assert "ΔG / kJ mol⁻¹" in text
    assert "TS ‡" in text
    assert "Relative to A + W, G at the standard state" in text
    assert "Standard state 1 bar" in text
    assert max(map(len, text.splitlines())) <= WIDTH
    saddle = next(state for state in profile.states if state.kind == "saddle")
    for k in (0, 2, len(profile.temperature_k) - 1):
        assert f"{saddle.gibbs_kj_mol[k]:.2f}" in text


def test_profile_of_few_temperatures_shows_each_in_full(study: str) -> None:
    text = run("profile", study, "-T", "300", "-T", "310").stdout
    assert ", 300 K\n" in text
    assert ", 310 K\n" in text
    assert "csv" not in text


def test_profile_csv(study: str, profile: Profile) -> None:
    text = run("profile", study, "--format", "csv", "--energy-unit", "kcal/mol").stdout
    rows = list(csv.DictReader(io.StringIO(text)))
    assert len(rows) == len(profile.states) * 9
    first = next(row for row in rows if row["state"] == "C")
    state = next(state for state in profile.states if state.state == "C")
    assert float(first["G / kcal mol⁻¹"]) == pytest.approx(state.gibbs_kj_mol[0] / 4.184, rel=1e-14)
    assert first["relative to"] == "A + W"
    assert first["standard state"] == "1 bar"


def test_unknown_reference(study: str) -> None:
    result = run("profile", study, "--reference", "A + X", status=1)
    assert "A + X" in result.stderr
    assert "  mend: " in result.stderr


def test_notes_alike_are_told_a_few_times_and_counted(study: str) -> None:
    result = run("profile", study)
    assert result.stderr.count("[declared-constant]\n  mend: ") == 3
    assert "note: 2 more like this; --format json has them all [declared-constant]" in result.stderr
    assert len(answer("profile", study)["findings"]) >= 5


# -- barrier


def test_barrier_json(study: str, effective: EffectiveRate) -> None:
    read = answer("barrier", study)
    assert read["format"] == "thermo-pp/barrier/1"
    assert {"treatment", "standard_state", "findings", "temperature_k", "net_reaction"} <= set(read)
    assert list(read["rates"]) == ["per_free_reactant", "per_pool", "relaxation", "cycle"]
    assert read["rates"]["cycle"] is None
    for key, name in (("per_free_reactant", "free"), ("per_pool", "pool")):
        rate, same = read["rates"][key], effective.rates[name]  # type: ignore[index]
        assert same is not None
        assert set(RATE_KEYS.split()) <= set(rate)
        assert rate["rate_constant"] == list(same.rate_constant)
        assert rate["arrhenius_energy_kj_mol"] == list(same.arrhenius_energy_kj_mol)
        assert rate["activation_gibbs_kj_mol"] == list(same.activation.gibbs_kj_mol)
        assert set(rate["control"]) == set(same.control)
        assert rate["control"]["TS"] == list(same.control["TS"])
        assert list(rate["orders"]) == ["W"]
        for one in rate["approximations"]:
            assert {"name", "rate_constant", "ratio", "windows_k"} <= set(one)
            assert len(one["windows_k"]) == len(one["windows_open"])
            for (low, high), ends in zip(one["windows_k"], one["windows_open"], strict=True):
                assert low <= high
                assert all(isinstance(end, bool) for end in ends)
    pool = read["rates"]["per_pool"]
    for key in ("slow_share", "next_decay_ratio", "inverse_mean_time", "headline"):
        assert len(pool[key]) == 9
    assert [step["equation"] for step in read["steps"]] == ["A + W = C", "C = P"]
    assert {"forward_rate_constant", "reverse_rate_constant", "reversibility", "limited"} <= set(
        read["steps"][0]
    )
    assert read["words"] == " ".join(effective.words)


def test_barrier_table(study: str, effective: EffectiveRate) -> None:
    text = run("barrier", study).stdout
    for part in ("k / s⁻¹", "Eₐ / kJ mol⁻¹", "Rate per free reactant: A + W = P", "Steps at 300 K",
                 "Approximations", "order in W", "Held, at 300 K: W 0.0002 mol/L",
                 "Standard state 1 bar", "no basis for safety"):  # fmt: skip
        assert part in text, part
    assert max(map(len, text.splitlines())) <= WIDTH
    free = effective.rates["free"]
    assert free is not None
    for value in free.rate_constant:
        assert f"{value:.3e}" in text
    assert effective.words[0].split(";")[0] in " ".join(text.split())


@pytest.mark.parametrize("format_name", ["markdown", "latex"])
def test_barrier_for_papers(study: str, format_name: str) -> None:
    text = run("barrier", study, "--format", format_name).stdout
    assert "no basis for safety" in text
    heading = (
        "Eₐ / kJ mol⁻¹"
        if format_name == "markdown"
        else r"\shortstack[c]{$E_\mathrm{a}$ /\\kJ\,mol$^{-1}$}"
    )
    assert heading in text


def test_barrier_csv_has_every_temperature(study: str, effective: EffectiveRate) -> None:
    text = run("barrier", study, "--format", "csv").stdout
    rates, controls, approximations, steps = (
        list(csv.DictReader(io.StringIO(block))) for block in text.split("\n\n")
    )
    free = effective.rates["free"]
    assert free is not None
    assert [float(row["k"]) for row in rates if row["definition"] == "free"] == list(
        free.rate_constant
    )
    assert {row["species"] for row in controls if row["what"] == "control"} == set(free.control)
    assert {row["approximation"] for row in approximations} >= {
        one.name for one in free.approximations
    }
    assert len(steps) == 2 * 9


def test_undefined_numbers_are_null_and_a_dash(effective: EffectiveRate) -> None:
    pool = effective.rates["pool"]
    assert pool is not None
    pool = replace(pool, next_decay_ratio=np.full(9, np.nan))
    effective = replace(effective, rates={**effective.rates, "pool": pool})
    read = json.loads(json_text(barrier.keys(effective, Treatment(), ())))
    assert read["rates"]["per_pool"]["next_decay_ratio"] == [None] * 9
    text = terminal(barrier_tables.tables(effective, Treatment(), "kJ/mol"))
    assert "\N{EN DASH}" in text
    assert "nan" not in text
    assert math.isfinite(read["rates"]["per_pool"]["rate_constant"][0])


# -- the bundled study, from its real outputs


def test_survey_of_the_bundled_outputs() -> None:
    """The table of fixtures/stack-plume/README.md: imaginary modes, and no finding above a note."""
    read = answer("survey", str(PLUME / "outputs"))
    files = {Path(file["path"]).stem: file for file in read["files"]}
    assert len(files) == 32
    assert {file["verdict"] for file in files.values()} <= {"ok", "note"}
    saddles = {name for name, file in files.items() if file["imaginary_modes"] == 1}
    assert saddles == {"ts-unassisted", "ts-assisted"}
    assert files["so3-water2"]["lowest_mode_cm"] == pytest.approx(21.1, abs=0.1)
    told = {finding["code"] for finding in read["findings"]}
    assert told == {"symmetry-differs", "soft-modes", "several-levels"}


def test_species_of_the_bundled_outputs() -> None:
    """Rotation groups as fixtures/stack-plume/README.md has them."""
    read = answer("species", str(PLUME / "outputs"))
    groups = {each["name"]: each["symmetry_number"] for each in read["species"]}
    assert groups == {
        "water": 2, "so3": 6, "h2so4": 2, "water-dimer": 1, "so3-water": 1, "so3-water2": 1,
        "ts-unassisted": 1, "ts-assisted": 1,
    }  # fmt: skip


@pytest.mark.parametrize("command", ["profile", "barrier"])
def test_bundled_study_fits_the_terminal(command: str) -> None:
    text = run(command, str(PLUME / "study.toml")).stdout
    assert "SO3" in text
    assert max(map(len, text.splitlines())) <= WIDTH
