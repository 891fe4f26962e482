"""Start-up: what --help and a bare import bring in."""

from __future__ import annotations

import subprocess
import sys
import tomllib
from pathlib import Path

import pytest

import thermo_pp

HEAVY = ("numpy", "ase", "scipy", "pandas", "pint", "matplotlib", "tabulate", "msgspec")


def loaded(code: str) -> set[str]:
    """Run Python code in a process of its own and return which heavy modules it loaded."""
    report = f"import sys\nprint('loaded:', *(set(sys.modules) & set({HEAVY!r})))"
    guarded = (
        f"try:\n    {code}\nexcept SystemExit as end:\n    assert end.code == 0, end.code\n{report}"
    )
    run = subprocess.run(
        [sys.executable, "-c", guarded], capture_output=True, text=True, check=False, timeout=60
    )
    assert run.returncode == 0, run.stderr
    return set(run.stdout.rpartition("loaded:")[2].split())


@pytest.mark.parametrize(
    "command",
    [
        [],
        ["survey"],
        ["species"],
        ["draft"],
        ["profile"],
        ["barrier"],
        ["compare"],
        ["isotopes"],
        ["report"],
    ],
)
def test_help_loads_nothing_heavy(command: list[str]) -> None:
    arguments = [*command, "--help"]
    assert loaded(f"from thermo_pp.cli import main; main({arguments!r})") == set()


def test_import_loads_nothing_heavy() -> None:
    assert loaded("import thermo_pp") == set()


def test_the_report_sees_what_is_loaded() -> None:
    assert "numpy" in loaded("import thermo_pp; thermo_pp.Calculation")


def test_version_is_that_of_the_project() -> None:
    project = tomllib.loads((Path(thermo_pp.__file__).parents[1] / "pyproject.toml").read_text())
    assert thermo_pp.__version__ == project["project"]["version"]


def test_public_names_are_there() -> None:
    for name in thermo_pp.__all__:
        assert getattr(thermo_pp, name) is not None
    assert set(thermo_pp.__all__) <= set(dir(thermo_pp))
    with pytest.raises(AttributeError, match="has no attribute 'colect'"):
        thermo_pp.colect  # noqa: B018


def test_collect_stays_the_function_after_the_folder_is_imported() -> None:
    code = (
        "import thermo_pp.collect.walk, thermo_pp\n"
        "assert callable(thermo_pp.collect), thermo_pp.collect\n"
        "from thermo_pp import collect\nassert callable(collect)"
    )
    run = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=False, timeout=60
    )
    assert run.returncode == 0, run.stderr


def test_module_is_the_same_program() -> None:
    run = subprocess.run(
        [sys.executable, "-m", "thermo_pp", "--version"],
        capture_output=True,
        text=True,
        check=False,
        timeout=60,
    )
    assert run.stdout == f"thermo-pp {thermo_pp.__version__}\n"
