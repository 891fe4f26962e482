"""Tables and supporting information of the bundled study: they open, hold the numbers, repeat."""

from __future__ import annotations

import io
import re
import shutil
import subprocess
from pathlib import Path

import ase.io
import docx
import numpy as np
import openpyxl
import pytest
from ase.units import Hartree
from click.testing import CliRunner
from hostile_study import hostile

from thermo_pp.cli import main
from thermo_pp.errors import StudyError
from thermo_pp.output.columns import check_columns, select
from thermo_pp.output.document import write_document
from thermo_pp.output.document.references import REFERENCES, bibtex
from thermo_pp.output.latex import latex_document
from thermo_pp.output.parts import in_parts
from thermo_pp.output.report_tables import shown, write_tables
from thermo_pp.output.tables import Column, Table
from thermo_pp.output.workbook import workbook
from thermo_pp.study.answers import Answers
from thermo_pp.study.load import Study
from thermo_pp.study.run import answer

ROOT = Path(__file__).parents[1]
STUDY = ROOT / "fixtures/stack-plume/study.toml"
KELVIN = [280.0, 298.15]
LATEX = shutil.which("pdflatex")


@pytest.fixture(scope="module")
def answers() -> Answers:
    return answer(Study.load(STUDY, temperatures=KELVIN, treatment={"tunnelling": "eckart"}))


@pytest.fixture(scope="module")
def folder(answers: Answers, tmp_path_factory: pytest.TempPathFactory) -> Path:
    where = tmp_path_factory.mktemp("report")
    write(answers, where)
    return where


def write(answers: Answers, where: Path) -> None:
    write_tables(answers, where / "tables")
    write_document(answers, where / "document")


def contents(where: Path) -> dict[str, bytes]:
    return {str(p.relative_to(where)): p.read_bytes() for p in where.rglob("*") if p.is_file()}


def test_the_same_answers_give_the_same_bytes(
    answers: Answers, folder: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("time.time", lambda: 2e9)
    monkeypatch.setattr("time.localtime", lambda *_: (2033, 5, 18, 3, 33, 20, 2, 138, 0))
    write(answers, tmp_path)
    assert contents(tmp_path) == contents(folder)


def test_workbook_holds_the_numbers(answers: Answers, folder: Path) -> None:
    book = openpyxl.load_workbook(folder / "tables/tables.xlsx")
    sheet = book["species"]
    assert sheet.freeze_panes == "B3"
    headings = {cell.value: k for k, cell in enumerate(sheet[2])}
    rows = [[cell.value for cell in row] for row in sheet.iter_rows(min_row=3)]
    found = {(row[0], row[headings["T / K"]]): row for row in rows if row[0] in answers.species}
    for name, one in answers.species.items():
        for k, kelvin in enumerate(KELVIN):
            value = found[name, kelvin][headings["G / kJ mol⁻¹"]]
            assert value == pytest.approx(one.result.gibbs_kj_mol[k], rel=2e-15)  # 16 digits
    assert sheet.cell(3, headings["G / kJ mol⁻¹"] + 1).number_format == "0.00"
    notes = [row[0] for row in rows[-6:]]
    assert any("Standard state 1 bar" in str(note) for note in notes)
    assert any("MP2" in str(note) for note in notes)
    assert any("thermo_pp" in str(note) for note in notes)
    assert answers.profile is not None
    states = book["profile"]
    heading = [cell.value for cell in states[2]].index("G / kJ mol⁻¹") + 1
    values = [
        states.cell(row, heading).value for row in range(3, 3 + 2 * len(answers.profile.states))
    ]
    expected = [value for state in answers.profile.states for value in state.gibbs_kj_mol]
    assert values == pytest.approx(expected, rel=2e-15)


def test_sheets_have_names_that_a_spreadsheet_takes() -> None:
    titles = ["a/b: c?", "A/B: C?", "x" * 60, "x" * 50, "'", "History"]
    tables = [Table(title, [Column("n")], [[1]]) for title in titles]
    names = openpyxl.load_workbook(io.BytesIO(workbook(tables))).sheetnames
    assert len({name.casefold() for name in names}) == len(titles)
    assert all(len(name) <= 31 and not re.search(r"[\[\]:*?/\\]", name) for name in names)
    assert "history" not in {name.casefold() for name in names}


def test_docx_holds_the_numbers(answers: Answers, folder: Path) -> None:
    word = docx.Document(str(folder / "document/supporting-information.docx"))
    cells = {cell.text for table in word.tables for row in table.rows for cell in row.cells}
    for one in answers.species.values():
        assert f"{one.result.gibbs_kj_mol[1]:.2f}" in cells
    assert answers.effective is not None
    rate = answers.effective.rates["pool"]
    assert rate is not None
    assert f"{rate.rate_constant[1]:.3e}" in cells
    text = "\n".join(paragraph.text for paragraph in word.paragraphs)
    assert " ".join(answers.effective.words) in text
    assert "no basis for safety" in text
    assert "SO3 hydration in a humid stack plume" in text
    for finding in answers.findings:
        assert finding.what in text


@pytest.mark.skipif(LATEX is None, reason="pdflatex is not installed")
@pytest.mark.parametrize("which", ["bundled", "hostile"])
def test_latex_compiles_as_it_stands(folder: Path, tmp_path: Path, which: str) -> None:
    if which == "hostile":
        write(answer(hostile(tmp_path)), tmp_path)
    else:
        shutil.copytree(folder, tmp_path, dirs_exist_ok=True)
    for path in [*(tmp_path / "tables").glob("*.tex"), *(tmp_path / "document").glob("*.tex")]:
        if path.stem.endswith("-body"):
            continue
        assert LATEX is not None
        words = [LATEX, "-interaction=nonstopmode", "-halt-on-error", path.name]
        done = subprocess.run(words, cwd=path.parent, capture_output=True, check=False)
        said = done.stdout.decode("utf-8", "replace")
        assert done.returncode == 0, said[-2000:]
        wide = [float(size) for size in re.findall(r"Overfull \\hbox \(([\d.]+)pt", said)]
        assert max(wide, default=0.0) < 2.0, path.name


def test_structures_are_read_back(answers: Answers, folder: Path) -> None:
    frames = ase.io.read(folder / "document/structures.xyz", index=":", format="extxyz")
    assert [frame.info["name"] for frame in frames] == list(answers.species)
    for frame, model in zip(frames, answers.study.species.values(), strict=True):
        calculation = model.calculation  # type: ignore[attr-defined]
        np.testing.assert_allclose(frame.positions, calculation.positions_angstrom, atol=1e-7)
        assert frame.info["energy_hartree"] == model.energy_hartree  # type: ignore[attr-defined]
        energy = frame.get_potential_energy() / Hartree
        assert energy == pytest.approx(model.energy_hartree, abs=1e-9)  # type: ignore[attr-defined]


def test_references_are_those_of_the_methods_used(folder: Path) -> None:
    book = (folder / "document/references.bib").read_text(encoding="utf-8")
    keys = set(re.findall(r"@\w+\{(\w+),", book))
    assert {"Grimme2012", "Eckart1930", "Johnston1962", "Kozuch2011", "Alvarez2013"} <= keys
    assert not {"Li2015", "Ribeiro2011", "Wigner1932", "Pracht2021", "Pitzer1942"} & keys
    tex = (folder / "document/supporting-information.tex").read_text(encoding="utf-8")
    assert set(re.findall(r"\\bibitem\{(\w+)\}", tex)) == keys
    cited = {key for group in re.findall(r"\\cite\{([\w,]+)\}", tex) for key in group.split(",")}
    assert cited == keys


def test_other_treatments_cite_others(tmp_path: Path) -> None:
    from thermo_pp.output.document.contents import contents as document_of

    study = Study.load(STUDY, temperatures=[300.0], treatment={"low_modes": "rotor-enthalpy"})
    assert {"Grimme2012", "Li2015"} <= {one.key for one in document_of(answer(study)).references}


def test_bibtex() -> None:
    text = bibtex([REFERENCES["FernandezRamos2007"], REFERENCES["McQuarrie1976"]])
    assert r"author = {A. Fern{\'a}ndez-Ramos and B. A. Ellingson and R. Meana-Pa{\~n}eda" in text
    assert "doi = {10.1007/s00214-007-0328-0}" in text
    assert r"publisher = {Harper \& Row}" in text


def test_only_dois_that_were_seen() -> None:
    """Those that the project's list of checked values has as verified."""
    assert {one.doi for one in REFERENCES.values() if one.doi} == {
        "10.1002/chem.201200497",
        "10.1021/jp509921r",
        "10.1039/D1SC00621E",
        "10.1007/s00214-007-0328-0",
        "10.1021/ar1000956",
        "10.1021/acscatal.7b00115",
    }


def test_every_number_has_its_file_and_line(answers: Answers, folder: Path) -> None:
    text = (folder / "document/supporting-information.md").read_text(encoding="utf-8")
    for name, energy in answers.study.energies.items():
        (part,) = energy.parts
        line = next(
            row for row in text.splitlines() if f"{part.value_hartree:.8f}" in row and "|" in row
        )
        assert name in line
        assert Path(part.files[0]).name.replace("_", "\\_") in line
        assert f" {part.lines[0]} |" in line


COLUMNS = Table("t", [Column("State"), Column("ΔH", "x"), Column("ΔG", "x")], [["a", 1.0, 2.0]])


def test_columns_are_chosen_in_order() -> None:
    other = Table("u", [Column("T")], [[1.0]])
    (table, words) = select([COLUMNS, "words", other], ["g", "ΔH / x"])
    assert isinstance(table, Table)
    assert [column.quantity for column in table.columns] == ["State", "ΔG", "ΔH"]
    assert table.rows == [["a", 2.0, 1.0]]
    assert words == "words"
    (named,) = select([COLUMNS], ["G", "state"])
    assert isinstance(named, Table)
    assert named.rows == [[2.0, "a"]]


def test_an_unknown_column_names_the_nearest() -> None:
    with pytest.raises(StudyError, match="did you mean 'State'"):
        check_columns([COLUMNS], ["Stat"], where="--columns")


def test_a_report_with_columns(answers: Answers) -> None:
    found = {one.name: one for one in shown(answers, columns=["G", "H"])}
    (table, *_) = found["profile"].people
    assert isinstance(table, Table)
    assert [column.quantity for column in table.columns] == ["State", "ΔG", "ΔH"]
    with pytest.raises(StudyError, match="no column 'Gibs'"):
        shown(answers, columns=["Gibs"])


def test_a_wide_table_is_cut_into_parts_that_fit() -> None:
    columns = [Column("name"), *(Column(f"q{k}", decimals=2) for k in range(30))]
    table = Table("t", columns, [["x", *map(float, range(30))]], ["note"])
    parts = in_parts(table, 60.0, gap=2.0, most_text=30)
    assert len(parts) > 1
    assert all(part.columns[0].quantity == "name" for part in parts)
    assert [c.quantity for part in parts for c in part.columns[1:]] == [f"q{k}" for k in range(30)]
    sizes = [len(part.columns) for part in parts]
    assert max(sizes) - min(sizes) <= 2
    assert [part.notes for part in parts][-1] == ["note"]
    assert not any(part.notes for part in parts[:-1])
    assert in_parts(table, 1000.0, gap=2.0, most_text=30) == [table]


def test_commands_write_html_and_xlsx(tmp_path: Path) -> None:
    runner = CliRunner()
    words = ["profile", str(STUDY), "-T", "298.15", "--quiet"]
    page = runner.invoke(main, [*words, "--format", "html", "--columns", "G,H"])
    assert page.exit_code == 0, page.output
    assert page.stdout.startswith("<!DOCTYPE html>")
    assert "ΔG / kJ mol⁻¹" in page.stdout
    assert "ΔS" not in page.stdout
    book = tmp_path / "a.xlsx"
    done = runner.invoke(main, [*words, "--format", "xlsx", "-o", str(book)])
    assert done.exit_code == 0, done.output
    assert openpyxl.load_workbook(book).sheetnames == ["profile"]


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (["--format", "xlsx"], "needs -o"),
        (["--columns", "G", "--format", "json"], "--columns is for tables"),
        (["--columns", "Gibs"], "there is no column 'Gibs'"),
    ],
)
def test_wrong_usage_of_formats(words: list[str], said: str) -> None:
    done = CliRunner().invoke(main, ["profile", str(STUDY), "-T", "300", "--quiet", *words])
    assert done.exit_code == 2
    assert said in done.stderr


def test_the_document_of_latex_has_what_its_tables_need() -> None:
    text = latex_document("x")
    assert text.index("siunitx") < text.index(r"\begin{document}") < text.index(r"\end{document}")
