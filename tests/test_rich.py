"""What results show of themselves in a notebook, and the notebook of the docs, run."""

from __future__ import annotations

import re
import runpy
import shutil
from pathlib import Path
from typing import Any

import pandas as pd
import pytest
from declared_study import TEXT, load

from thermo_pp.rich import MOST_ROWS, shown
from thermo_pp.study.conformers import conformers_of
from thermo_pp.study.load import Study

ROOT = Path(__file__).parents[1]
HOSTILE = "<b>&$x$"
AS_TEXT = "&lt;b&gt;&amp;$x$"
MEASURED = f"""\
kind,definition,temperature / K,k / s^-1,source
point,free,280,1e-3,"{HOSTILE}"
"""


@pytest.fixture(scope="module")
def hostile(tmp_path_factory: pytest.TempPathFactory) -> Study:
    text = re.sub(r"\bP\b", HOSTILE, TEXT)
    text = text.replace(f"[species.{HOSTILE}]", f'[species."{HOSTILE}"]')
    text = text.replace("[species.A]", '[conditions.initial]\nA = "1 mol/L"\n[species.A]', 1)
    return load(tmp_path_factory.mktemp("hostile"), text)


def check(result: Any) -> str:
    """Return the HTML of a result that has the hostile name; it must show it as text."""
    html = result._repr_html_()
    assert isinstance(html, str)
    assert re.search(r'<table [^>]*class="[^"]*tex2jax_ignore', html)
    assert "<b>" not in html
    assert AS_TEXT in html
    return html


def test_names_are_shown_as_text(hostile: Study, tmp_path: Path) -> None:
    check(hostile)
    check(hostile.profile())
    check(hostile.transient())
    (tmp_path / "measured.csv").write_text(MEASURED, encoding="utf-8")
    comparison = hostile.compare(tmp_path / "measured.csv")
    check(comparison)
    assert "<table" in hostile.effective()._repr_html_()


def test_the_table_of_a_study(hostile: Study) -> None:
    frame = hostile.table()
    assert list(frame.species) == list(hostile.species)
    assert frame.set_index("species").kind["TS1"] == "saddle"
    assert frame.energy_hartree.isna().all()
    bundled = Study.load(ROOT / "fixtures/stack-plume/study.toml", temperatures=[298.15])
    frame = bundled.table().set_index("species")
    assert frame.energy_hartree["W"] == bundled.energies["W"].value_hartree
    assert frame.composition["SO3"] in ("S1 O3", "O3 S1")
    assert "water_mp2.out" in frame.files["W"]


def test_the_table_of_an_ensemble(tmp_path: Path) -> None:
    outputs = ROOT / "fixtures/n-pentane/outputs"
    shutil.copy(outputs / "tt.out", tmp_path / f"{HOSTILE}.out")
    shutil.copy(outputs / "gg.out", tmp_path / "gg.out")
    (tmp_path / "study.toml").write_text(
        'conditions.temperatures = ["298.15 K"]\n[species.X]\n'
        f'conformers = [{{ frequencies = "{HOSTILE}.out" }}, {{ frequencies = "gg.out" }}]\n'
    )
    [ensemble] = conformers_of(tmp_path / "study.toml").ensembles
    frame = ensemble.table()
    assert list(frame.member) == [1, 2]
    assert list(frame.degeneracy) == [1, 2]
    assert (
        frame.ground_kj_mol[0] == ensemble.members[0].model.ground_kj_mol == ensemble.ground_kj_mol
    )
    assert frame.ground_kj_mol[1] > frame.ground_kj_mol[0]
    assert "<b>" not in ensemble._repr_html_()


def test_points_and_curves_of_a_comparison(hostile: Study, tmp_path: Path) -> None:
    (tmp_path / "measured.csv").write_text(MEASURED, encoding="utf-8")
    found = hostile.compare(tmp_path / "measured.csv")
    frame = found.table()
    [point] = frame[frame.kind == "point"].to_dict("records")
    assert point["measured"] == 1e-3
    assert point["computed"] == found.points[0].computed
    assert point["log_ratio"] == found.points[0].log_ratio
    curves = frame[frame.kind == "curve"]
    assert len(curves) == sum(len(curve.temperature_k) for curve in found.curves) > 0
    assert list(curves.computed) == [k for curve in found.curves for k in curve.computed]
    assert curves.log_ratio.isna().all()


def test_long_frames_are_cut_and_say_so() -> None:
    html = shown(pd.DataFrame({"n": range(10_000)}))
    assert html.count("<tr") <= MOST_ROWS + 2
    assert "10000 rows" in html
    assert "rows" not in shown(pd.DataFrame({"n": range(MOST_ROWS)}))


def test_the_notebook_of_the_docs() -> None:
    """Run it in a kernel of its own: no cell fails or warns, and what is stored is what it prints."""
    for name in ("nbformat", "nbclient", "ipykernel"):
        pytest.importorskip(name, reason=f"{name} is not installed: the extra test has it")
    made = runpy.run_path(str(ROOT / "docs" / "remake_notebook.py"))
    stored = (ROOT / "docs" / "notebook.ipynb").read_text(encoding="utf-8")
    book = made["executed"]()
    code = [cell for cell in book.cells if cell.cell_type == "code"]
    assert not [one for cell in code for one in cell.outputs if one.get("name") == "stderr"]
    kinds = [kind for cell in code for one in cell.outputs for kind in one.get("data", {})]
    assert kinds.count("image/svg+xml") == 3
    assert kinds.count("text/html") == 5
    assert made["text"](book) == stored, "run python docs/remake_notebook.py"
