"""The command line as a user meets it: what goes where, exit statuses, and errors that say the mend."""

from __future__ import annotations

import csv
import io
import json
import re
import shutil
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner, Result
from openpyxl import load_workbook

import thermo_pp as tp
from thermo_pp.cli import main
from thermo_pp.names import DEFAULT_LOW_MODES, ENERGY_UNITS, FORMATS, LOW_MODES
from thermo_pp.output.plain import WIDTH
from thermo_pp.units import ENERGY_PER_KJ_MOL, HARTREE_KJ_MOL

ROOT = Path(__file__).parents[1]
PSI4 = ROOT / "fixtures" / "psi4" / "good"
WATER = str(PSI4 / "water_hf_opt_freq.out")
COMMANDS = (
    "survey",
    "species",
    "conformers",
    "functions",
    "draft",
    "profile",
    "choices",
    "barrier",
    "compare",
    "isotopes",
    "report",
    "sweep",
)
SURVEY_KEYS = (
    "path reader program program_version method basis formula charge multiplicity energy_hartree "
    "modes imaginary_modes lowest_mode_cm optimised ended_normally verdict"
)
SPECIES_KEYS = (
    "name files formula charge multiplicity kind rotor symmetry_number electronic_energy_hartree "
    "zero_point_kj_mol temperature_k enthalpy_kj_mol entropy_j_mol_k gibbs_kj_mol "
    "heat_capacity_j_mol_k low_mode_spread_kj_mol"
)


def run(*arguments: str, status: int = 0) -> Result:
    result = CliRunner().invoke(main, list(arguments), prog_name="thermo-pp")
    assert result.exit_code == status, (result.stdout, result.stderr, result.exception)
    assert result.exception is None or isinstance(result.exception, SystemExit)
    return result


def answer(*arguments: str, status: int = 0) -> dict[str, Any]:
    read = json.loads(run(*arguments, "--format", "json", status=status).stdout)
    assert isinstance(read, dict)
    return read


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """Two outputs, a truncated one, a note called .out, a hidden and a binary file."""
    top = tmp_path / "outputs"
    top.mkdir()
    shutil.copy(WATER, top)
    shutil.copy(PSI4 / "ammonia_planar_hf_ts_freq.out", top / "ammonia_ts.out")
    data = Path(WATER).read_bytes()
    (top / "cut.out").write_bytes(data[: len(data) // 3])
    (top / "note.out").write_text("do not forget the milk\n")
    (top / ".hidden.out").write_bytes(data)
    (top / "orbitals.bin").write_bytes(b"\0\1\2\3")
    return top


# -- survey


def test_survey_table(folder: Path) -> None:
    result = run("survey", str(folder))
    assert "3 outputs in" in result.stdout.splitlines()[0]
    assert re.search(r"^water_hf_opt_freq\.out +1 +H2O +0 +1 +-76\.010747 +3 +0 +1826\.5 +(note|ok)$",
                     result.stdout, re.MULTILINE)  # fmt: skip
    assert "E / Eₕ" in result.stdout
    assert "lowest / cm⁻¹" in result.stdout
    assert "Level 1: HF/6-31G*" in result.stdout
    assert "Left out, hidden: 1." in result.stdout
    assert "Left out, no reader claims it: 1" in result.stdout
    assert "note.out" in result.stdout
    assert max(map(len, result.stdout.splitlines())) <= WIDTH


def test_survey_tells_findings_on_standard_error_only(folder: Path) -> None:
    result = run("survey", str(folder))
    assert re.search(
        r"^error: \S*cut\.out:\d+: .* \[unreadable\]\n  mend: ", result.stderr, re.MULTILINE
    )
    assert "mend:" not in result.stdout
    assert run("survey", str(folder), "--quiet").stderr == ""


def test_survey_json(folder: Path) -> None:
    read = answer("survey", str(folder))
    assert read["format"] == "thermo-pp/survey/1"
    assert {"treatment", "standard_state", "findings", "files", "skipped"} <= set(read)
    files = {Path(file["path"]).name: file for file in read["files"]}
    assert list(files) == ["ammonia_ts.out", "cut.out", "water_hf_opt_freq.out"]
    for file in files.values():
        assert list(file) == SURVEY_KEYS.split()
    water, cut = files["water_hf_opt_freq.out"], files["cut.out"]
    calc = tp.read(folder / "water_hf_opt_freq.out")
    assert water["energy_hartree"] == calc.energy_hartree
    assert water["lowest_mode_cm"] == calc.wavenumbers_cm[0]
    assert (water["reader"], water["formula"], water["modes"]) == ("psi4", "H2O", 3)
    assert files["ammonia_ts.out"]["imaginary_modes"] == 1
    assert cut["verdict"] == "error"
    assert cut["reader"] == "psi4"
    assert {cut[key] for key in SURVEY_KEYS.split()} == {cut["path"], "psi4", None, "error"}
    assert {Path(each["path"]).name: each["reason"] for each in read["skipped"]} == {
        ".hidden.out": "hidden", "note.out": "no reader claims it", "orbitals.bin": "binary",
    }  # fmt: skip
    for finding in read["findings"]:
        assert list(finding) == ["code", "severity", "file", "line", "what", "mend"]


def test_survey_csv_has_the_keys_of_json(folder: Path) -> None:
    rows = list(csv.DictReader(io.StringIO(run("survey", str(folder), "--format", "csv").stdout)))
    assert len(rows) == 3
    assert float(rows[2]["energy / hartree"]) == tp.read(WATER).energy_hartree
    assert rows[2]["ended normally"] == "yes"
    assert rows[1]["energy / hartree"] == ""


def test_survey_strict_shows_the_table_and_ends_with_1(folder: Path) -> None:
    result = run("survey", str(folder), "--strict", status=1)
    assert "3 outputs in" in result.stdout
    assert re.search(r"Error: \d+ findings? of severity error \(--strict\)", result.stderr)


@pytest.mark.parametrize("content", [None, "a text note"])
def test_survey_of_nothing_readable(tmp_path: Path, content: str | None) -> None:
    if content is not None:
        (tmp_path / "note.out").write_text(content)
    result = run("survey", str(tmp_path), status=1)
    assert f"Error: no file in {tmp_path} could be read" in result.stderr
    assert "hint: " in result.stderr


def test_survey_of_a_truncated_file_alone(folder: Path) -> None:
    result = run("survey", str(folder / "cut.out"), status=1)
    assert "could be read" in result.stderr
    assert "cut.out" in result.stdout


# -- species


def test_species_json_is_what_the_library_says(folder: Path) -> None:
    read = answer("species", str(folder), "-T", "298.15", "-T", "350", "--standard-state", "1 atm",
                  "--low-modes", "raised", "--onset", "50 cm^-1")  # fmt: skip
    assert read["format"] == "thermo-pp/species/1"
    assert read["standard_state"] == "1 atm"
    assert read["treatment"]["low_modes"] == "raised"
    assert read["treatment"]["onset_cm"] == 50.0
    by_name = {each["name"]: each for each in read["species"]}
    assert list(by_name) == ["ammonia_ts", "water_hf_opt_freq"]
    water = by_name["water_hf_opt_freq"]
    assert set(SPECIES_KEYS.split()) <= set(water)
    same = tp.thermochemistry(
        tp.read(WATER), [298.15, 350.0], standard_state="1 atm", low_modes="raised", onset_cm=50.0
    )
    for key in ("temperature_k", "enthalpy_kj_mol", "entropy_j_mol_k", "gibbs_kj_mol",
                "heat_capacity_j_mol_k"):  # fmt: skip
        assert water[key] == list(getattr(same, key)), key
    assert water["zero_point_kj_mol"] == same.zero_point_kj_mol
    assert (water["symmetry_number"], water["rotor"], water["kind"]) == (2, "nonlinear", "minimum")
    assert by_name["ammonia_ts"]["kind"] == "saddle"


def test_species_defaults() -> None:
    read = answer("species", WATER)
    assert read["species"][0]["temperature_k"] == [298.15]
    assert read["standard_state"] == "1 bar"
    assert read["treatment"]["low_modes"] == DEFAULT_LOW_MODES
    assert read["treatment"]["onset_cm"] == 100.0


def test_frequency_scale_is_that_of_the_zero_point_energy_too() -> None:
    whole, scaled = (
        answer("species", WATER, "--frequency-scale", factor)["species"][0]["zero_point_kj_mol"]
        for factor in ("1", "0.95")
    )
    assert scaled == pytest.approx(0.95 * whole, rel=1e-12)


def test_temperature_range_includes_its_end_and_quantities_are_taken() -> None:
    read = answer("species", WATER, "--temperature-range", "280", "360", "5")
    assert read["species"][0]["temperature_k"] == [280.0 + 5.0 * k for k in range(17)]
    assert answer("species", WATER, "-T", "25 degC")["species"][0]["temperature_k"] == [
        pytest.approx(298.15, abs=1e-9)
    ]


@pytest.mark.parametrize("unit", ENERGY_UNITS)
def test_energy_unit_of_the_csv(unit: str) -> None:
    text = run("species", WATER, "--energy-unit", unit, "--format", "csv").stdout
    (row,) = csv.DictReader(io.StringIO(text))
    same = tp.thermochemistry(tp.read(WATER))
    (heading,) = [name for name in row if name.startswith("G / ")]
    assert float(row[heading]) == pytest.approx(
        same.gibbs_kj_mol[0] * ENERGY_PER_KJ_MOL[unit], rel=1e-14
    )
    assert row["standard state"] == "1 bar"


def test_species_table_has_iupac_headings_and_notes() -> None:
    text = run("species", WATER).stdout
    for heading in ("T / K", "H / kJ mol⁻¹", "G / kJ mol⁻¹"):
        assert heading in text
    for note in ("Standard state 1 bar", "rotor-entropy", "HF/6-31G*", "thermo_pp 0.1.0"):
        assert note in text
    assert max(map(len, text.splitlines())) <= WIDTH
    assert f"{tp.thermochemistry(tp.read(WATER)).gibbs_kj_mol[0]:.2f}" in text


@pytest.mark.parametrize("format_name", FORMATS)
def test_every_format_of_species_and_survey(format_name: str, folder: Path, tmp_path: Path) -> None:
    for command in ("survey", "species"):
        words = [command, str(folder), "--format", format_name]
        if format_name == "xlsx":
            book = tmp_path / "book.xlsx"
            run(*words, "-o", str(book))
            cells = [cell.value for row in load_workbook(book).worksheets[0] for cell in row]
            assert any("water_hf_opt_freq" in str(value) for value in cells)
            continue
        text = run(*words).stdout
        assert "water_hf_opt_freq" in text.replace("\\", "")
        marks = {
            "latex": r"\toprule",
            "json": '"format"',
            "markdown": "|--",
            "csv": ",",
            "html": '<th scope="col">',
            "table": "──",
        }
        assert marks[format_name] in text.replace("|:-", "|--")


def test_species_of_nothing_with_frequencies() -> None:
    result = run("species", str(PSI4 / "water_hf_energy.out"), status=1)
    assert "can be computed" in result.stderr
    assert "[no-frequencies]" in result.stderr
    assert result.stdout == ""


def test_strict_species_gives_no_result(folder: Path) -> None:
    (folder / "two.out").write_bytes(two_imaginary_modes())
    assert "water_hf_opt_freq" in run("species", str(folder)).stdout
    result = run("species", str(folder), "--strict", status=1)
    assert result.stdout == ""
    assert "[not-computed]" in result.stderr


def two_imaginary_modes() -> bytes:
    """Return the fixture of planar ammonia with a second mode made imaginary in its table."""
    text = (PSI4 / "ammonia_planar_hf_ts_freq.out").read_text()
    line = next(each for each in text.splitlines() if each.startswith("  Freq [cm^-1]"))
    words = line.split()
    other = words[3]
    changed = line.replace(other, f"{other}i", 1)
    return text.replace(line, changed, 1).encode()


# -- where answers go


def test_output_file_and_nothing_on_standard_output(tmp_path: Path) -> None:
    path = tmp_path / "out.json"
    result = run("species", WATER, "--format", "json", "-o", str(path))
    assert result.stdout == ""
    assert json.loads(path.read_text())["format"] == "thermo-pp/species/1"
    assert [each.name for each in tmp_path.iterdir()] == ["out.json"]


def test_output_into_a_missing_folder(tmp_path: Path) -> None:
    result = run("species", WATER, "-o", str(tmp_path / "absent" / "x.csv"), status=1)
    assert "cannot be written" in result.stderr
    assert "  mend: " in result.stderr


def test_a_run_that_ends_in_an_error_writes_no_file(tmp_path: Path) -> None:
    path = tmp_path / "out.csv"
    run("species", str(PSI4 / "water_hf_energy.out"), "-o", str(path), status=1)
    assert not path.exists()


# -- wrong usage: status 2, and the way out


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["--low-modes", "rotor-entrpy"], LOW_MODES),
        (["--format", "tabel"], FORMATS),
        (["--energy-unit", "kJ"], ENERGY_UNITS),
    ],
)
def test_misspelt_choices_are_listed(arguments: list[str], said: tuple[str, ...]) -> None:
    result = run("species", WATER, *arguments, status=2)
    for choice in said:
        assert f"'{choice}'" in result.stderr
    assert f"'{arguments[1]}' is not one of" in result.stderr


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["-T", "0"], "temperature 0.0 is not above 0 K"),
        (["-T", "0 K"], "temperature '0 K' is not above 0 K"),
        (["-T", "nan"], "is not a finite number"),
        (["-T", "hot"], "'hot' is not a number"),
        (["-T", "10**10**10 K"], "'10**10**10 K' is not one number and a unit"),
        (["-T", "1 kg"], "'1 kg' is not a quantity in K"),
        (["--temperature-range", "300", "280", "5"], "no temperatures from 300"),
        (["--temperature-range", "280", "300", "7"], "no whole number of steps"),
        (["-T", "300", "--temperature-range", "280", "300", "5"], "give either --temperature or"),
        (["--standard-state", "1 bra"], "'1 bra' is neither a pressure nor a concentration"),
        (["--standard-state", "5 K"], "'5 K' is neither a pressure nor a concentration"),
        (["--onset", "0"], "'0' is not above 0"),
        (["--onset", "100 parsec"], "'100 parsec' is not a quantity in 1/cm"),
        (["--frequency-scale", "-1"], "'-1' is not above 0"),
        (["--frequency-scale", "nan"], "'nan' is not a number"),
        (["--frequency-scale", "one"], "'one' is not a number"),
    ],
)
def test_wrong_values(arguments: list[str], said: str) -> None:
    result = run("species", WATER, *arguments, status=2)
    assert said in result.stderr
    assert result.stdout == ""


@pytest.mark.parametrize("command", COMMANDS)
def test_missing_file_and_missing_argument(command: str) -> None:
    assert "does not exist" in run(command, "absent.out", status=2).stderr
    assert "Missing argument" in run(command, status=2).stderr


def test_unknown_command_names_the_nearest() -> None:
    result = run("specis", WATER, status=2)
    assert "No such command 'specis'" in result.stderr
    assert "species" in result.stderr


# -- errors of the data in a study


def study(tmp_path: Path, text: str) -> str:
    path = tmp_path / "study.toml"
    path.write_text(text)
    return str(path)


@pytest.mark.parametrize("command", ["profile", "barrier"])
@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("title = ", "not TOML"),
        ("titel = 'x'\n", "titel"),
        ("title = 'x'\n", "species"),
    ],
)
def test_a_wrong_study_says_what_where_and_the_mend(
    tmp_path: Path, command: str, text: str, said: str
) -> None:
    result = run(command, study(tmp_path, text), status=1)
    assert result.stdout == ""
    assert result.stderr.startswith(f"Error: {tmp_path}/study.toml")
    assert said in result.stderr
    assert "\n  mend: " in result.stderr


# -- the docs


def test_every_command_has_help_an_example_and_its_chapter() -> None:
    text = (ROOT / "docs" / "cli.md").read_text(encoding="utf-8")
    chapters = dict(re.findall(r"^## (\w+)\n(.*?)(?=^## |\Z)", text, re.MULTILINE | re.DOTALL))
    assert set(main.commands) == set(COMMANDS)
    for name, command in main.commands.items():
        assert command.help is not None
        assert command.short_help
        for where in (command.help, chapters[name]):
            assert "Example:" in where
            assert f"thermo-pp {name} " in where
        for parameter in command.params:
            for option in parameter.opts:
                if option.startswith("--"):
                    assert f"`{option}" in text, f"{name} {option}"


def test_examples_of_the_docs_parse() -> None:
    """Every example line of docs and help is a usage that the program takes (files aside)."""
    text = (ROOT / "docs" / "cli.md").read_text(encoding="utf-8")
    helps = "\n".join(command.help or "" for command in main.commands.values())
    lines = re.findall(r"^ *thermo-pp (\w+ .*)$", text + helps, re.MULTILINE)
    assert len(lines) > 10
    for line in lines:
        words = [word.strip('"') for word in re.findall(r'"[^"]*"|\S+', line)]
        words = [
            WATER
            if word.endswith((".toml", ".out", ".xyz", "measured.csv", "values.csv"))
            else word
            for word in words
        ]
        words = [str(PSI4) if word.endswith("outputs/") else word for word in words]
        command = main.commands[words[0]]
        command.make_context(words[0], words[1:])


def test_hartree_in_the_answers_is_codata_2022() -> None:
    read = answer("species", WATER)["species"][0]
    kj = read["electronic_energy_hartree"] * HARTREE_KJ_MOL
    assert read["enthalpy_kj_mol"][0] - kj == pytest.approx(70.25, abs=0.05)  # Psi4 prints 70.246
