"""Sweeps: each row is the study with that value, failures are rows, wrong keys are errors."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from click.testing import CliRunner
from declared_study import TEXT, edited, load

from thermo_pp.cli import main
from thermo_pp.errors import StudyError
from thermo_pp.study.changes import changed_data, parse_value
from thermo_pp.study.load import Study
from thermo_pp.study.sweep import Sweep, read_values, sweep

PLUME = Path(__file__).parents[1] / "fixtures" / "stack-plume" / "study.toml"
AMOUNTS = ("1e-4 mol/L", "1e-3 mol/L", "2 mbar")


def same(found: Sweep, other: Sweep) -> bool:
    return found.keys == other.keys and all(
        a.values == b.values
        and a.error == b.error
        and [x.definition for x in a.rates] == [x.definition for x in b.rates]
        and all(
            np.array_equal(x.rate_constant, y.rate_constant)
            for x, y in zip(a.rates, b.rates, strict=True)
        )
        for a, b in zip(found.rows, other.rows, strict=True)
    )


def test_each_row_is_the_study_with_that_value(tmp_path: Path) -> None:
    found = sweep(load(tmp_path, TEXT), ["conditions.held.W"], [[x] for x in AMOUNTS], jobs=1)
    assert [row.values for row in found.rows] == [(x,) for x in AMOUNTS]
    for row in found.rows:
        text = edited(('W = "1e-3 mol/L"', f'W = "{row.values[0]}"'))
        alone = load(tmp_path, text).effective()
        assert [rate.definition for rate in row.rates] == [n for n, r in alone.rates.items() if r]
        for rate in row.rates:
            whole = alone.rates[rate.definition]
            assert whole is not None
            assert np.array_equal(rate.rate_constant, whole.rate_constant)
            assert np.array_equal(rate.arrhenius_energy_kj_mol, whole.arrhenius_energy_kj_mol)
            assert np.array_equal(rate.activation_gibbs_kj_mol, whole.activation.gibbs_kj_mol)
            assert rate.resting == whole.resting_state
            for k, name in enumerate(rate.controlling):
                assert rate.control[k] == whole.control[name][k]
                assert abs(rate.control[k]) == max(abs(whole.control[s][k]) for s in whole.saddles)


def test_processes_make_no_difference(tmp_path: Path) -> None:
    study = load(tmp_path, TEXT)
    values = [[x] for x in (*AMOUNTS, "0 mol/L", "5e-3 mol/L")]
    here = sweep(study, ["conditions.held.W"], values, jobs=1)
    there = sweep(study, ["conditions.held.W"], values, jobs=2)
    assert same(here, there)
    assert [row.error is None for row in here.rows] == [True, True, True, False, True]
    assert not same(here, sweep(study, ["conditions.held.W"], values[::-1], jobs=1))


def test_no_output_is_read_again(monkeypatch: pytest.MonkeyPatch) -> None:
    study = Study.load(PLUME, temperatures=[300.0])

    def refuse(*_: Any) -> None:
        raise AssertionError("an output was read again")

    monkeypatch.setattr("thermo_pp.study.outputs.read_source", refuse)
    found = sweep(study, ["treatment.low_modes"], [["harmonic"], ["raised"]], jobs=1)
    assert [row.error for row in found.rows] == [None, None]
    first, second = (row.rates[0].rate_constant[0] for row in found.rows)
    assert first != second


def test_several_keys_from_a_file(tmp_path: Path) -> None:
    table = tmp_path / "values.csv"
    table.write_text(
        "conditions.held.W,species.TS1.enthalpy,steps.5.rate\n"
        "1e-4 mol/L,75 kJ/mol,1e7 L/mol/s\n1e-3 mol/L,80 kJ/mol,2e7 L/mol/s\n"
    )
    keys, values = read_values(table)
    found = sweep(load(tmp_path, TEXT), keys, values, jobs=1)
    own = load(tmp_path, TEXT).effective().rates["pool"]
    assert own is not None
    rates = [next(r for r in row.rates if r.definition == "pool") for row in found.rows]
    assert np.array_equal(rates[1].rate_constant, own.rate_constant)
    assert np.all(rates[0].rate_constant != own.rate_constant)


def test_a_star_stands_for_every_species_that_has_the_key() -> None:
    data = {
        "species": {
            "A": {"frequencies": "a.out"},
            "B": {"frequencies": "b.out", "energy": "b_mp2.out"},
            "C": {"composition": "H2O"},
        }
    }
    changed = changed_data(data, {"species.*.frequencies": "F/{name}.out"}, "study.toml")
    assert changed["species"]["A"] == {"frequencies": "F/A.out"}
    assert changed["species"]["B"] == {"frequencies": "F/B.out", "energy": "b_mp2.out"}
    assert changed["species"]["C"] == {"composition": "H2O"}
    assert data["species"]["A"] == {"frequencies": "a.out"}
    quoted = {"species": {"C-1.b": {"energy": "x"}}}
    changed = changed_data(quoted, {'species."C-1.b".energy': "y"}, "study.toml")
    assert changed["species"]["C-1.b"]["energy"] == "y"


@pytest.mark.parametrize(
    ("key", "what", "mend"),
    [
        ("conditons.held.W", "unknown key", "conditions.held"),
        ("treatment.onsett", "unknown key", "treatment.onset"),
        ("species.TS3.enthalpy", "there is no 'TS3'", "did you mean 'TS1'?"),
        ("species.TS1.entalpy", "unknown key", "species.NAME.enthalpy"),
        ("steps.9.rate", "there is no entry '9'", "from 1 to 5"),
        ("species.*.frequencies", "no species of the file has", "some of them have"),
        ("a b", "is no key", "with points"),
        ("", "is no key", "with points"),
    ],
)
def test_wrong_keys_are_errors_before_any_row(
    tmp_path: Path, key: str, what: str, mend: str
) -> None:
    study = load(tmp_path, TEXT)
    with pytest.raises(StudyError) as caught:
        sweep(study, [key], [["1"]], jobs=1)
    assert what in caught.value.what
    assert mend in caught.value.mend


def test_temperatures_cannot_be_given_twice(tmp_path: Path) -> None:
    study = load(tmp_path, TEXT, temperatures=[300.0])
    with pytest.raises(StudyError, match="given twice"):
        sweep(study, ["conditions.temperatures"], [[[280.0]]], jobs=1)
    found = sweep(load(tmp_path, TEXT), ["conditions.temperatures"], [[[280.0, 290.0]]], jobs=1)
    assert found.rows[0].rates[0].temperature_k.tolist() == [280.0, 290.0]


def test_values_of_the_command_line() -> None:
    assert parse_value("1e-3") == 1e-3
    assert parse_value("true") is True
    assert parse_value("[280, 300]") == [280, 300]
    assert parse_value("2e-4 mol/L") == "2e-4 mol/L"
    assert parse_value("C:\\a.out") == "C:\\a.out"


@pytest.mark.parametrize(
    ("text", "what"),
    [
        ("", "holds no values"),
        ("conditions.held.W\n", "holds no values"),
        ("a,a\n1,2\n", "a key twice"),
        ("a,b\n1\n", "1 values for 2 keys"),
    ],
)
def test_wrong_files_of_values(tmp_path: Path, text: str, what: str) -> None:
    file = tmp_path / "values.csv"
    file.write_text(text)
    with pytest.raises(StudyError, match=what):
        read_values(file)


# ------------------------------------------------------------------------------------- the command


def run(tmp_path: Path, *arguments: str) -> Any:
    load(tmp_path, TEXT)
    return CliRunner().invoke(main, ["sweep", str(tmp_path / "study.toml"), *arguments])


OVER = ("--over", "conditions.held.W")


def test_command_in_every_format(tmp_path: Path) -> None:
    answer = run(tmp_path, *OVER, *AMOUNTS, "--format", "json", "--quiet")
    assert answer.exit_code == 0, answer.output
    found = json.loads(answer.stdout)
    assert found["format"] == "thermo-pp/sweep/1"
    assert found["keys"] == ["conditions.held.W"]
    assert [row["values"] for row in found["rows"]] == [[x] for x in AMOUNTS]
    rate = found["rows"][1]["rates"]["per_pool"]
    own = load(tmp_path, TEXT).effective().rates["pool"]
    assert own is not None
    assert rate["rate_constant"] == own.rate_constant.tolist()
    for form in ("table", "csv", "markdown", "latex"):
        answer = run(tmp_path, *OVER, *AMOUNTS, "--format", form, "--quiet")
        assert answer.exit_code == 0, answer.output
        assert "1e-4 mol/L" in answer.stdout


def test_a_value_that_fails_is_a_row(tmp_path: Path) -> None:
    mixed = (*OVER, "1e-3 mol/L", "1e-3 mol", "--quiet")
    answer = run(tmp_path, *mixed)
    assert answer.exit_code == 0, answer.output
    assert "neither a pressure nor a concentration" in answer.stdout
    assert run(tmp_path, *mixed, "--strict").exit_code == 1
    alone = run(tmp_path, *OVER, "1e-3 mol", "--quiet")
    assert alone.exit_code == 1
    assert "1 of 1 values failed" in alone.output


@pytest.mark.parametrize(
    "arguments",
    [(), OVER, ("1e-3 mol/L",), (*OVER, "1 mbar", "--values", __file__)],
    ids=["nothing", "no values", "no key", "both"],
)
def test_wrong_usage(tmp_path: Path, arguments: tuple[str, ...]) -> None:
    assert run(tmp_path, *arguments).exit_code == 2
