"""The report: complete, the same bytes each time, whole or not at all, and traceable."""

from __future__ import annotations

import hashlib
import json
import math
import os
import shutil
import signal
import subprocess
import sys
import time
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner
from declared_study import TEXT

from thermo_pp.cli import main
from thermo_pp.output import report
from thermo_pp.study.load import Study

ROOT = Path(__file__).parents[1]
BUNDLED = ROOT / "fixtures" / "stack-plume"
ODD = '<b>&_%$"x'


def run(*arguments: object) -> Any:
    return CliRunner().invoke(main, ["report", *map(str, arguments)])


def files(folder: Path) -> dict[str, bytes]:
    return {
        path.relative_to(folder).as_posix(): path.read_bytes()
        for path in sorted(folder.rglob("*"))
        if path.is_file()
    }


def declared(folder: Path, text: str = TEXT) -> Path:
    folder.mkdir(parents=True, exist_ok=True)
    path = folder / "study.toml"
    path.write_text(text, encoding="utf-8")
    return path


@pytest.fixture(scope="module")
def bundled(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("bundled") / "report"
    measured = ("--measured", BUNDLED / "measured.csv", "--deviation", "4 kJ/mol")
    done = run(BUNDLED / "study.toml", "-o", folder, "-T", "280", "-T", "298.15", *measured)
    assert done.exit_code == 0, done.output
    assert done.stdout == ""
    return folder


@pytest.fixture(scope="module")
def results(bundled: Path) -> dict[str, Any]:
    found: dict[str, Any] = json.loads((bundled / "results.json").read_text(encoding="utf-8"))
    return found


@pytest.fixture(autouse=True)
def without_figures(monkeypatch: pytest.MonkeyPatch) -> None:
    """Figures take most of the time; `bundled`, made before this, has them."""
    monkeypatch.setattr(report, "PARTS", tuple(p for p in report.PARTS if p[0] != "figures"))


def test_every_figure_is_there_in_three_formats(bundled: Path) -> None:
    found = {path.name for path in (bundled / "figures").iterdir()}
    stems = {name.rpartition(".")[0] for name in found}
    assert found == {f"{stem}.{form}" for stem in stems for form in ("svg", "pdf", "png")}
    kinds = {f"{kind}-{name}" for kind in ("arrhenius", "eyring", "controls")
             for name in ("free", "pool", "relaxation")}  # fmt: skip
    maps = {f"regimes-{layer}-{name}" for layer in ("holding", "controlling", "resting")
            for name in ("free", "pool")} - {"regimes-resting-free"}  # fmt: skip
    doubts = {"doubt-free", "doubt-pool"}
    assert stems == {
        *kinds,
        *maps,
        *doubts,
        "populations-pool",
        "profile",
        "profile-enthalpy-gibbs",
        "measured-1",
    }


def test_the_manifest_lists_every_file_with_its_hash(bundled: Path) -> None:
    manifest = json.loads((bundled / "manifest.json").read_text(encoding="utf-8"))
    assert manifest["format"] == "thermo-pp/manifest/1"
    found = files(bundled)
    assert [one["path"] for one in manifest["files"]] == sorted({*found} - {"manifest.json"})
    for one in manifest["files"]:
        assert one["sha256"] == hashlib.sha256(found[one["path"]]).hexdigest()
        assert one["bytes"] == len(found[one["path"]])
    for one in manifest["inputs"]:
        assert one["sha256"] == hashlib.sha256((BUNDLED / one["path"]).read_bytes()).hexdigest()
    assert manifest["options"]["temperature_k"] == [280.0, 298.15]
    assert manifest["options"]["measured"] == manifest["inputs"][1]["path"] == "measured.csv"
    assert manifest["libraries"]["numpy"]


def test_nothing_in_it_names_a_place_a_machine_or_a_person(bundled: Path) -> None:
    words = [str(ROOT), str(bundled.parent), os.uname().nodename, os.environ.get("USER") or "\0"]
    for name, data in files(bundled).items():
        for word in words:
            if len(word) > 3:
                assert word.encode() not in data, f"{name} has {word}"


def test_results_are_those_of_the_commands(results: dict[str, Any]) -> None:
    study = Study.load(BUNDLED / "study.toml", temperatures=[280.0, 298.15])
    effective = study.effective()
    own = next(one for one in results["barriers"] if one["low_modes"] == "rotor-entropy")
    pool = effective.rates["pool"]
    assert pool is not None
    assert own["rates"]["per_pool"]["rate_constant"] == pool.rate_constant.tolist()
    assert own["words"] == " ".join(effective.words)
    profile = study.profile()
    shown = next(
        one
        for one in results["profiles"]
        if (one["low_modes"], one["standard_state"]) == ("rotor-entropy", "1 bar")
    )
    assert [state["gibbs_kj_mol"] for state in shown["states"]] == [
        state.gibbs_kj_mol.tolist() for state in profile.states
    ]
    assert len(results["profiles"]) == 8
    assert {one["code"] for one in results["findings"]} >= {f.code for f in study.findings}


def test_null_stands_where_the_study_asks_for_nothing(results: dict[str, Any]) -> None:
    for name in ("time_course", "flow", "isotopes", "conformers", "formation"):
        assert results[name] is None
    assert results["left_out"]["isotopes"] == "the study has no [isotopologues]"


def test_every_printed_number_stands_where_the_provenance_says(results: dict[str, Any]) -> None:
    rows = results["provenance"]
    assert {row["origin"] for row in rows} == {"printed", "derived", "declared"}
    energies = [row for row in rows if row["quantity"].startswith("electronic energy")]
    assert len(energies) == len(results["species"])
    for row in energies:
        line = (BUNDLED / row["file"]).read_text(encoding="utf-8").splitlines()[row["line"] - 1]
        assert any(
            math.isclose(float(word), row["value"], rel_tol=0.0, abs_tol=1e-9)
            for word in line.replace("=", " ").split()
            if word.lstrip("-").replace(".", "", 1).isdigit()
        ), (row, line)
    held = next(row for row in rows if row["of"] == "conditions.held.W")
    line = (BUNDLED / "study.toml").read_text(encoding="utf-8").splitlines()[held["line"] - 1]
    assert held["value"] in line
    for name in ("wavenumbers", "positions", "masses", "symmetry number", "charge"):
        assert sum(row["quantity"] == name for row in rows) == len(results["species"])
    assert all(row["file"] for row in rows if row["origin"] == "printed")


def test_declared_numbers_have_their_lines(tmp_path: Path) -> None:
    study = declared(tmp_path / "s")
    assert run(study, "-o", tmp_path / "r").exit_code == 0
    rows = json.loads((tmp_path / "r" / "results.json").read_text(encoding="utf-8"))["provenance"]
    lines = TEXT.splitlines()
    found = {row["of"]: row for row in rows}
    row = found["species.C.enthalpy"]
    assert row["origin"] == "declared"
    assert row["value"] == "-35 kJ/mol"
    assert lines[row["line"] - 1] == 'enthalpy = "-35 kJ/mol"'
    assert '[species.C]' in lines[row["line"] - 3]  # fmt: skip


def test_same_input_same_bytes(bundled: Path, tmp_path: Path) -> None:
    """Another hash seed, another folder, another place to ask from, other times of the files."""
    place = tmp_path / "two" / "deep"
    shutil.copytree(BUNDLED / "outputs", place / "outputs", copy_function=shutil.copy)
    for name in ("study.toml", "measured.csv"):
        shutil.copy(BUNDLED / name, place / name)
    subprocess.run(
        [sys.executable, "-m", "thermo_pp", "report", "two/deep/study.toml", "-o", "report",
         "-T", "280", "-T", "298.15", "--quiet", "--measured", "two/deep/measured.csv", "--deviation", "4 kJ/mol"],
        cwd=tmp_path, check=True, timeout=120,
        env={**os.environ, "PYTHONPATH": str(ROOT), "PYTHONHASHSEED": "4242"},
    )  # fmt: skip
    first, second = files(bundled), files(tmp_path / "report")
    assert list(first) == list(second)
    for name, data in first.items():
        assert data == second[name], name


def test_a_newer_report_takes_the_place_of_the_older(tmp_path: Path) -> None:
    study, folder = declared(tmp_path / "s"), tmp_path / "r"
    assert run(study, "-o", folder).exit_code == 0
    first = files(folder)
    assert run(study, "-o", folder, "-T", "300").exit_code == 0
    assert files(folder)["results.json"] != first["results.json"]
    assert run(study, "-o", folder).exit_code == 0
    assert files(folder) == first
    assert sorted(entry.name for entry in tmp_path.iterdir()) == ["r", "s"]


@pytest.mark.parametrize(
    ("name", "words"),
    [
        ("notes.txt", "holds files that are not of the report, so it is not replaced: notes.txt"),
        ("exports/README.md", "holds files that were changed since, so it is not replaced"),
    ],
)
def test_what_a_person_put_into_a_report_is_not_lost(tmp_path: Path, name: str, words: str) -> None:
    study, folder = declared(tmp_path / "s"), tmp_path / "r"
    assert run(study, "-o", folder).exit_code == 0
    (folder / name).write_text("mine", encoding="utf-8")
    before = files(folder)
    done = run(study, "-o", folder)
    assert done.exit_code == 1
    assert words in done.output
    assert "mend: move them elsewhere" in done.output
    assert files(folder) == before


@pytest.mark.parametrize(
    "text", ["", "{}", "[1]", '{"format": "other"}', '{"format": "thermo-pp/manifest/1"}']
)
def test_a_folder_that_is_no_report_is_not_replaced(tmp_path: Path, text: str) -> None:
    folder = tmp_path / "thesis"
    folder.mkdir()
    (folder / ("manifest.json" if text else "chapter1.tex")).write_text(text, encoding="utf-8")
    before = files(folder)
    done = run(declared(tmp_path / "s"), "-o", folder)
    assert done.exit_code == 1
    assert "thesis: the folder is no report of this program, so it is not replaced" in done.output
    assert files(folder) == before


def test_columns_are_chosen_and_one_that_no_table_has_ends_it(tmp_path: Path) -> None:
    study = declared(tmp_path)
    chosen = run(study, "-o", tmp_path / "chosen", "--columns", "G,State", "-T", "298.15")
    assert chosen.exit_code == 0, chosen.output
    heading = (tmp_path / "chosen" / "tables" / "profile.md").read_text(encoding="utf-8")
    assert "| ΔG / kJ mol⁻¹ | State |" in " ".join(heading.split())
    wrong = run(study, "-o", tmp_path / "wrong", "--columns", "Gibs", "-T", "298.15")
    assert wrong.exit_code == 1
    assert "there is no column 'Gibs'" in wrong.output
    assert not (tmp_path / "wrong").exists()


def test_a_study_that_cannot_be_computed_leaves_nothing(tmp_path: Path) -> None:
    text = TEXT.replace('equation = "C = P"', 'equation = "C = Q"')
    study = declared(tmp_path / "s", text)
    done = run(study, "-o", tmp_path / "r")
    assert done.exit_code == 1
    assert f"Error: {study} [steps.3] equation: " in done.output
    assert [entry.name for entry in tmp_path.iterdir()] == ["s"]


def test_an_old_report_outlives_a_study_that_broke(tmp_path: Path) -> None:
    study, folder = declared(tmp_path / "s"), tmp_path / "r"
    assert run(study, "-o", folder).exit_code == 0
    before = files(folder)
    study.write_text(TEXT.replace("[[steps]]", "[[steps", 1), encoding="utf-8")
    assert run(study, "-o", folder).exit_code == 1
    assert files(folder) == before


def test_strict_writes_nothing_where_there_is_an_error(tmp_path: Path) -> None:
    """The single point of SO3 stands at another geometry: an error of the pairing."""
    shutil.copytree(BUNDLED / "outputs", tmp_path / "s" / "outputs", copy_function=shutil.copy)
    text = (BUNDLED / "study.toml").read_text(encoding="utf-8")
    odd = text.replace('energy = "so3-water_mp2.out"', 'energy = "ts-unassisted_mp2.out"', 1)
    assert odd != text
    study = declared(tmp_path / "s", odd)
    done = run(study, "-o", tmp_path / "r", "-T", "298.15", "--strict")
    assert done.exit_code == 1
    assert not (tmp_path / "r").exists()


def test_wrong_places(tmp_path: Path) -> None:
    study = declared(tmp_path / "s")
    (tmp_path / "taken").write_text("mine", encoding="utf-8")
    assert "taken: is a file, not a folder" in run(study, "-o", tmp_path / "taken").output
    done = run(study, "-o", tmp_path / "missing" / "r")
    assert done.exit_code == 1
    assert "cannot be written: No such file or directory" in done.output
    assert run(study).exit_code == 2
    assert run(study, "-o", tmp_path / "r", "--deviation", "4 kJ/mol").exit_code == 2


def test_odd_names_are_text_and_no_path(tmp_path: Path) -> None:
    (tmp_path / "s").mkdir()
    shutil.copytree(BUNDLED / "outputs", tmp_path / "s" / "outputs", copy_function=shutil.copy)
    text = (BUNDLED / "study.toml").read_text(encoding="utf-8").split("[levels")[0]
    quoted = json.dumps(ODD)
    text = text.replace("[species.TS1]", f"[species.{quoted}]").replace(
        'through = "TS1"', f"through = {quoted}"
    )
    text = text.replace(
        'title = "SO3 hydration in a humid stack plume"', 'title = "=1+1\\nsecond line"'
    )
    study = declared(tmp_path / "s", text)
    done = run(study, "-o", tmp_path / "r", "-T", "298.15")
    assert done.exit_code == 0, done.output
    results = json.loads((tmp_path / "r" / "results.json").read_text(encoding="utf-8"))
    assert results["title"] == "=1+1\nsecond line"
    assert ODD in [one["name"] for one in results["species"]]
    assert (tmp_path / "r" / "exports" / "qcschema" / "007-b-x-job1.json").is_file()


@pytest.mark.skipif(not hasattr(os, "fork"), reason="no fork")
def test_killed_while_it_runs(tmp_path: Path) -> None:
    """Whenever the program itself is killed, there is the old report, to the byte, or the new one."""
    study, folder = declared(tmp_path / "s"), tmp_path / "r"
    assert run(study, "-o", folder).exit_code == 0
    old = files(folder)
    assert run(study, "-o", tmp_path / "other", "-T", "300").exit_code == 0
    new = files(tmp_path / "other")
    code = (
        "import sys\nfrom thermo_pp.cli import main\nimport thermo_pp.output.report as report\n"
        "report.PARTS = tuple(p for p in report.PARTS if p[0] != 'figures')\nprint('on', flush=True)\n"
        "main(['report', *sys.argv[1:]])"
    )
    for wait in (0.0, 0.15, 0.4, 0.8):
        process = subprocess.Popen(
            [sys.executable, "-c", code, str(study), "-o", str(folder), "-T", "300", "--quiet"],
            stdout=subprocess.PIPE, env={**os.environ, "PYTHONPATH": str(ROOT)},
        )  # fmt: skip
        assert process.stdout is not None
        process.stdout.readline()
        time.sleep(wait)
        process.send_signal(signal.SIGKILL)
        process.wait(timeout=60)
        process.stdout.close()
        assert files(folder) in (old, new)
    assert run(study, "-o", folder, "-T", "300").exit_code == 0
    assert files(folder) == new
    assert sorted(entry.name for entry in tmp_path.iterdir()) == ["other", "r", "s"]
