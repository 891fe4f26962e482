"""The floors of the package: imports go to floors below, on the same floor to the left.

The table is that of the architecture: lowest floor first, on a floor from left to right. A module
or folder that is not in it fails; imports inside functions count, and those for type checking too.
"""

from __future__ import annotations

import ast
from pathlib import Path

import pytest

import thermo_pp

PACKAGE = Path(thermo_pp.__file__).parent

FLOORS: tuple[tuple[str, ...], ...] = (
    ("names", "errors", "nearest", "units", "rich"),  # 1
    (
        "data",
        "formulas",
        "records",
        "sources",
        "rate_laws",
        "mechanism",
        "conditions",
        "amounts",
        "text_file",
    ),  # 2
    ("readers",),  # 3
    ("collect", "scans", "species", "isotopes"),  # 4
    ("pairing", "audit", "grouping", "energies", "ensemble"),  # 5
    ("graph", "loops", "paths", "profile", "functions", "kinetics"),  # 6
    ("measured",),  # 7
    ("study",),  # 8
    ("output",),  # 9
    ("cli",),  # 10
)
INSIDE: dict[str, tuple[str, ...]] = {
    # a folder whose files import each other: from left to right; __init__ comes last
    "formulas": (
        "rotor", "partition", "frames", "bonds", "vibration", "torsion", "symmetry", "superposition", "normal_modes",
        "seam", "turning", "rates", "falloff", "crossing", "tunnelling", "isotope_ratios", "extrapolation", "repulsion",
        "polynomials", "mixture",
    ),
    "sources": ("limits", "compressed", "archives", "source", "disk"),
    "collect": (
        "walk", "outcome", "codec", "answers", "store", "workers", "cluster", "stream",
    ),
    "audit": (
        "limit", "levels", "scaling", "state", "modes", "symmetry", "duplicates", "printed", "survey", "structures",
    ),
    "energies": ("basis_sets", "terms", "limits", "solvation", "counterpoise", "recipe"),
    "ensemble": (
        "alike", "hands", "checks", "block", "nearest", "levels", "distribution", "model",
        "found", "results",
    ),
    "study/keys": (
        "base", "treatment", "conditions", "energies", "structure", "species", "rate_laws", "steps", "questions",
    ),
    "output": (
        "tables", "columns", "definitions", "notes", "plain", "delimited", "parts", "latex", "html", "workbook",
        "json_text", "files",
        "survey", "species", "conformers", "energies", "profile", "courses", "limits", "regimes", "selectivity",
        "doubt",
        "barrier", "barrier_tables", "isotopes",
        "functions",
        "cantera_phase", "choices", "compare", "folders", "provenance", "results_file", "page", "exports", "manifest",
        "figures", "figures_folder", "study_species", "report_tables", "document", "report", "sweep",
    ),
    "cli": (
        "options", "answers", "survey", "species", "conformers", "functions", "draft", "profile", "choices", "barrier",
        "isotopes", "compare", "report", "sweep",
    ),
}  # fmt: skip
PURE = ("names", "errors", "units")
"""Modules that --help may import: without numpy at module level."""


def place(top: str) -> tuple[int, int]:
    """Floor and place on it of a module or folder of the package's own level."""
    for floor, members in enumerate(FLOORS, start=1):
        if top in members:
            return floor, members.index(top)
    raise AssertionError(f"thermo_pp/{top} is not in the table of floors")


def modules() -> list[Path]:
    return sorted(
        path for path in PACKAGE.rglob("*.py") if path.parent != PACKAGE or path.stem[:2] != "__"
    )


def imported(path: Path) -> set[tuple[str, ...]]:
    """Every module of the package that a file imports, as its parts below the package."""
    found: set[tuple[str, ...]] = set()
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        names: list[str] = []
        if isinstance(node, ast.Import):
            names = [alias.name for alias in node.names]
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{path}: a relative import"
            if node.module == "thermo_pp":
                names = [
                    f"thermo_pp.{alias.name}" for alias in node.names if alias.name != "__version__"
                ]
            else:
                names = [str(node.module), *(f"{node.module}.{alias.name}" for alias in node.names)]
        for name in names:
            parts = name.split(".")
            if parts[0] == "thermo_pp" and is_module(parts):
                found.add(tuple(parts[1:]))
    return found


def is_module(parts: list[str]) -> bool:
    path = PACKAGE.joinpath(*parts[1:])
    return len(parts) > 1 and (path.is_dir() or path.with_suffix(".py").is_file())


def own(path: Path) -> tuple[str, ...]:
    return path.relative_to(PACKAGE).with_suffix("").parts


@pytest.mark.parametrize("path", modules(), ids=lambda path: "/".join(own(path)))
def test_imports_only_from_below_or_from_the_left(path: Path) -> None:
    mine = own(path)
    for other in imported(path):
        if other[0] != mine[0]:
            assert place(other[0]) < place(mine[0]), (
                f"{mine} imports {other}: that is above or to the right"
            )


@pytest.mark.parametrize("folder", sorted(INSIDE))
def test_order_inside_a_folder(folder: str) -> None:
    order = (*INSIDE[folder], "__init__")
    files = sorted((PACKAGE / folder).glob("*.py"))
    unknown = {path.stem for path in files} - set(order)
    assert not unknown, f"not in the table of {folder}/: {unknown}"
    inside = tuple(folder.split("/"))
    depth = len(inside)
    for path in files:
        for other in imported(path):
            if other[:depth] == inside and len(other) > depth:
                assert order.index(other[depth]) < order.index(path.stem), f"{path} imports {other}"


def test_no_circle_inside_any_folder() -> None:
    graph = {
        own(path): {other for other in imported(path) if other[0] == own(path)[0]}
        for path in modules()
    }
    graph = {
        key: {(*other, "__init__") if (*other, "__init__") in graph else other for other in others}
        for key, others in graph.items()
    }
    done: set[tuple[str, ...]] = set()
    while left := set(graph) - done:
        free = {key for key in left if not (graph[key] & left) - _parents(key)}
        assert free, f"a circle among {sorted(left)}"
        done |= free


def _parents(key: tuple[str, ...]) -> set[tuple[str, ...]]:
    return {(*key[:depth], "__init__") for depth in range(1, len(key))}


def test_every_floor_member_exists_or_is_known_to_come() -> None:
    to_come = {"pairing"}
    for members in FLOORS:
        for member in members:
            there = (PACKAGE / member).is_dir() or (PACKAGE / f"{member}.py").is_file()
            assert there or member in to_come, member


@pytest.mark.parametrize("name", PURE)
def test_ground_floor_imports_nothing_heavy(name: str) -> None:
    tree = ast.parse((PACKAGE / f"{name}.py").read_text(encoding="utf-8"))
    tops = {
        alias.name.split(".")[0]
        for node in tree.body
        if isinstance(node, (ast.Import, ast.ImportFrom))
        for alias in (
            [ast.alias(node.module or "")] if isinstance(node, ast.ImportFrom) else node.names
        )
    }
    assert not tops & {"numpy", "ase", "pandas", "pint", "scipy", "msgspec"}


def test_the_table_would_catch_a_wrong_import(tmp_path: Path) -> None:
    wrong = tmp_path / "wrong.py"
    wrong.write_text("def f():\n    from thermo_pp.output import tables\n    return tables\n")
    assert ("output", "tables") in imported(wrong)
    assert not place("output") < place("records")
