"""Names and titles that a format could take for something of its own: shown as text in every output."""

from __future__ import annotations

import csv
import html as html_module
import io
import zipfile
from html.parser import HTMLParser
from pathlib import Path

import docx
import openpyxl
import pytest
from hostile_study import FORMULA, NAME, TITLE, hostile

from thermo_pp.output.delimited import csv_text
from thermo_pp.output.document import write_document
from thermo_pp.output.html import html, html_document
from thermo_pp.output.latex import escaped
from thermo_pp.output.plain import markdown, terminal
from thermo_pp.output.report_tables import write_tables
from thermo_pp.output.tables import Column, Table, printable
from thermo_pp.output.workbook import workbook
from thermo_pp.study.run import answer

TEXTS = (NAME, FORMULA, TITLE, "=1+1", "+1", "-1", "@x", "'quoted", "http://a.b", "12", "\ttab")
TABLE = Table(
    TITLE, [Column("=2+2"), Column("G", "kJ mol⁻¹", decimals=2)], [[t, 1.25] for t in TEXTS]
)


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    where = tmp_path_factory.mktemp("hostile")
    answers = answer(hostile(where))
    write_tables(answers, where / "tables")
    write_document(answers, where / "document")
    return where


def test_csv_goes_there_and_back() -> None:
    rows = list(csv.reader(io.StringIO(csv_text([TABLE]))))
    assert rows[0][0] == "'=2+2"
    assert not [row[0] for row in rows if row[0].startswith(("=", "+", "-", "@", "\t", "\r"))]
    assert tuple(row[0].removeprefix("'") for row in rows[1:]) == TEXTS
    assert {row[1] for row in rows[1:]} == {"1.25"}


def test_csv_leaves_negative_numbers_alone() -> None:
    assert csv_text([Table("t", [Column("a")], [[-1.5]])]).splitlines() == ["a", "-1.5"]


def test_xlsx_has_texts_and_numbers() -> None:
    sheet = openpyxl.load_workbook(io.BytesIO(workbook([TABLE]))).worksheets[0]
    assert sheet["A1"].value == printable(TITLE)
    cells = [row[0] for row in sheet.iter_rows(min_row=3, max_row=2 + len(TEXTS))]
    assert [cell.value for cell in cells] == [printable(text) for text in TEXTS]
    assert {cell.data_type for cell in cells} == {"s"}
    assert not any(cell.hyperlink for cell in cells)
    assert {sheet.cell(row, 2).data_type for row in range(3, 3 + len(TEXTS))} == {"n"}


class _Reader(HTMLParser):
    def __init__(self) -> None:
        super().__init__()
        self.tags: list[str] = []
        self.cells: list[str] = []

    def handle_starttag(self, tag: str, attrs: object) -> None:
        self.tags.append(tag)
        if tag in ("th", "td", "caption"):
            self.cells.append("")

    def handle_data(self, data: str) -> None:
        if self.cells:
            self.cells[-1] += data


def test_html_shows_text() -> None:
    reader = _Reader()
    reader.feed(html([TABLE]))
    assert not {"b", "script"} & set(reader.tags)
    shown = [cell.strip() for cell in reader.cells]
    assert shown[0] == printable(TITLE)
    assert shown[3::2] == [printable(text) for text in TEXTS]
    assert html_module.escape(printable(TITLE)) in html_document([], TITLE).split("</title>")[0]


def test_terminal_and_markdown_stay_on_their_lines() -> None:
    assert terminal([TABLE]).splitlines()[0] == printable(TITLE)
    lines = markdown([TABLE]).splitlines()
    assert len(lines) == 4 + len(TEXTS)
    assert r"\<b>\&\_%\$" in lines[4]
    assert "<script" not in "".join(lines).replace(r"\<script", "")
    assert markdown(["# a", "1. b", "- c"]).split("\n\n") == [r"\# a", r"1\. b", r"\- c"]


def test_latex_shows_text() -> None:
    assert escaped(NAME) == r"\textless{}b\textgreater{}\&\_\%\$\textquotedbl{}x"
    assert escaped("a--b ''c'' é ő") == r"a-{}-b '{}'c'{}' é ő"
    assert escaped("Ǎ\N{CJK UNIFIED IDEOGRAPH-4E2D}") == "U+01CDU+4E2D"
    assert escaped("ẽ") == r"\~{e}"


def test_files_of_a_study(folder: Path) -> None:
    markdown_text = (folder / "document/supporting-information.md").read_text(encoding="utf-8")
    assert "<script" not in markdown_text.replace(r"\<script", "")
    assert markdown_text.splitlines()[0].endswith(markdown_text.splitlines()[0].split("\\n")[-1])
    tex = (folder / "document/supporting-information.tex").read_text(encoding="utf-8")
    assert tex.count(r"\end{document}") == 1
    assert escaped(NAME) in tex
    for path in (folder / "tables").glob("*.html"):
        text = path.read_text(encoding="utf-8")
        assert "<b>" not in text
        assert html_module.escape(NAME) in text
    rows = list(csv.reader(io.StringIO((folder / "tables/species.csv").read_text("utf-8"))))
    assert {NAME, f"'{FORMULA}"} <= {row[0] for row in rows if row}
    book = openpyxl.load_workbook(folder / "tables/tables.xlsx")
    cells = [cell for sheet in book for row in sheet.iter_rows() for cell in row]
    assert {NAME, FORMULA} <= {cell.value for cell in cells}
    assert "f" not in {cell.data_type for cell in cells}
    word = docx.Document(str(folder / "document/supporting-information.docx"))
    assert word.paragraphs[0].text == f"Supporting information: {printable(TITLE)}"
    shown = {cell.text for table in word.tables for cell in table.rows[1].cells}
    assert NAME in shown
    with zipfile.ZipFile(folder / "document/supporting-information.docx") as archive:
        assert archive.testzip() is None
