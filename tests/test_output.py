"""Output: cells, headings, one renderer a format, JSON and files."""

from __future__ import annotations

import csv
import io
import json
import os
import stat
from pathlib import Path

import numpy as np
import pytest

from thermo_pp.conditions import Treatment
from thermo_pp.errors import Finding, StudyError
from thermo_pp.output.delimited import csv_text
from thermo_pp.output.files import write_file
from thermo_pp.output.json_text import answer, json_text
from thermo_pp.output.latex import escaped, latex
from thermo_pp.output.notes import of_treatment, some, usual
from thermo_pp.output.plain import WIDTH, markdown, terminal
from thermo_pp.output.tables import (
    Column,
    Table,
    energy_column,
    in_unit,
    printable,
    unit_heading,
)
from thermo_pp.units import CALORIE_J

SAMPLE = Table(
    "A & B_1",
    [
        Column("Name"),
        energy_column("ΔG", "kJ/mol", r"$\Delta G$"),
        Column("k", "s⁻¹", "$k$", digits=4),
        Column("n"),
    ],
    [
        ["TS|1_a", -1.23456, 2.2948e-31, 3],
        ["50 % *x*", 12.0, None, None],
    ],
    ["Standard state 1 bar; 100 cm⁻¹."],
    [("standard state", "1 bar")],
)


def test_heading_is_quantity_over_unit() -> None:
    assert energy_column("G", "kJ/mol").heading == "G / kJ mol⁻¹"
    assert Column("File").heading == "File"
    assert unit_heading("L mol^-1 s^-1") == "L mol⁻¹ s⁻¹"


@pytest.mark.parametrize(
    ("column", "value", "text"),
    [
        (Column("x", decimals=2), -0.001, "0.00"),
        (Column("x", decimals=2), -1.005e2, "-100.50"),
        (Column("x", digits=3), 1.23456e-60, "1.23e-60"),
        (Column("x"), 298.15, "298.15"),
        (Column("x"), 280.0, "280"),
        (Column("x"), 7, "7"),
        (Column("x"), None, "\N{EN DASH}"),
        (Column("x"), "a\nb\x1b[31m", "a\\nb\\x1b[31m"),
    ],
)
def test_cell(column: Column, value: object, text: str) -> None:
    assert column.text(value) == text  # type: ignore[arg-type]


def test_undecodable_file_name_is_written_out() -> None:
    assert printable(os.fsdecode(b"a\xff.out")) == "a\\udcff.out"


def test_terminal() -> None:
    text = terminal([SAMPLE, "Words."])
    rule = "─" * 37
    assert text.splitlines() == [
        "A & B_1",
        rule,
        "Name      ΔG / kJ mol⁻¹    k / s⁻¹  n",
        rule,
        "TS|1_a            -1.23  2.295e-31  3",
        "50 % *x*          12.00          \N{EN DASH}  \N{EN DASH}",
        rule,
        "Standard state 1 bar; 100 cm⁻¹.",
        "",
        "Words.",
    ]


def test_wide_table_breaks_as_many_headings_as_it_must() -> None:
    columns = [
        Column("State"),
        *(energy_column(f"quantity {k}", "kJ/mol", whole=k == 0) for k in range(5)),
    ]
    table = Table("t", columns, [["name", *[1.0] * 5]])
    lines = terminal([table]).splitlines()
    assert max(map(len, lines)) <= WIDTH
    assert "quantity 0 / kJ mol⁻¹" in lines[3]  # the last line of headings
    assert lines[3].count("/ kJ mol⁻¹") == 2
    assert lines[2].count(" /") == 3


def test_markdown() -> None:
    lines = markdown([SAMPLE]).splitlines()
    assert lines[0] == "**A \\& B\\_1**"
    assert [cell.strip() for cell in lines[2].strip("|").split("|")] == [
        "Name", "ΔG / kJ mol⁻¹", "k / s⁻¹", "n",
    ]  # fmt: skip
    assert "TS\\|1\\_a" in lines[4]
    assert "\\*x\\*" in lines[5]
    assert lines[-1] == "- Standard state 1 bar; 100 cm⁻¹."


def test_csv_has_all_digits_and_the_constants() -> None:
    rows = list(csv.reader(io.StringIO(csv_text([SAMPLE, "words are left out"]))))
    assert rows[0] == ["Name", "ΔG / kJ mol⁻¹", "k / s⁻¹", "n", "standard state"]
    assert rows[1] == ["TS|1_a", "-1.23456", "2.2948e-31", "3", "1 bar"]
    assert rows[2] == ["50 % *x*", "12.0", "", "", "1 bar"]
    assert len(rows) == 3


def test_csv_of_two_tables_has_an_empty_line_between() -> None:
    text = csv_text([SAMPLE, SAMPLE])
    assert text.count("\n\n") == 1
    assert not text.endswith("\n")


def test_csv_writes_numpy_numbers_plainly() -> None:
    table = Table("t", [Column("a"), Column("b")], [[np.float64(0.1), np.int64(3)]])  # type: ignore[list-item]
    assert csv_text([table]).splitlines()[1] == "0.1,3"


def test_latex() -> None:
    text = latex([SAMPLE, "a_b → c"])
    assert r"\caption{A \& B\_1}" in text
    head = r"Name & {\shortstack[c]{$\Delta G$ /\\kJ\,mol$^{-1}$}} & {$k$ / s$^{-1}$} & {n} \\"
    assert text.count(head) == 2
    assert r"TS\textbar{}1\_a & -1.23 & 2.295e-31 & 3 \\" in text
    assert r"50 \% *x* & 12.00 & {\textendash{}} & {\textendash{}} \\" in text
    columns = r"lS[table-format=-2.2]S[table-format=1.3e-2]S[table-format=1]"
    assert rf"\begin{{longtable}}{{{columns}}}" in text
    assert (text.count(r"\toprule"), text.count(r"\midrule"), text.count(r"\bottomrule")) == (
        2,
        2,
        1,
    )
    assert r"100 cm$^{-1}$." in text
    assert text.endswith(r"a\_b $\rightarrow$ c")


def test_latex_escapes_every_special_sign() -> None:
    assert escaped(r"\&%$#_{}~^") == (
        r"\textbackslash{}\&\%\$\#\_\{\}\textasciitilde{}\textasciicircum{}"
    )
    assert escaped("SO₃ ‡") == r"SO$_{3}$ $^{\ddagger}$"


def test_latex_leaves_no_sign_of_ours_outside_its_table() -> None:
    """Whatever the tables write themselves must be known to LaTeX; a user's text may be any."""
    sources = Path(__file__).parents[1] / "thermo_pp" / "output"
    signs = {
        sign
        for path in sources.rglob("*.py")
        if path.stem not in ("latex", "plain") and path.parent.name != "figures"
        for sign in path.read_text(encoding="utf-8")
        if ord(sign) > 126
    }
    left = {sign for sign in signs if any(ord(char) > 126 for char in escaped(sign))}
    assert left <= set("áñø")  # letters of names, which the encoding has
    assert not {sign for sign in signs if escaped(sign).startswith("U+")}


def test_a_row_of_the_wrong_length_is_a_bug() -> None:
    with pytest.raises(ValueError, match="1 cells for 2 columns"):
        Table("t", [Column("a"), Column("b")], [["x"]])


def test_energy_units() -> None:
    assert in_unit(CALORIE_J, "kcal/mol") == pytest.approx(1.0, rel=1e-15)
    assert in_unit(2625.4996395, "hartree") == pytest.approx(1.0, rel=1e-9)  # checks.md 0
    assert in_unit(float("nan"), "kJ/mol") is None
    assert in_unit(None, "eV") is None


def test_json_is_never_rounded_and_nan_is_null() -> None:
    finding = Finding("code", "note", "a.out", 3, "what", "mend")
    keys = answer(
        "test",
        [finding],
        Treatment(),
        values=np.array([0.1 + 0.2, np.nan]),
        one=np.float64(1e-300),
        nested={"a": (np.int64(2), [None, True])},
    )
    read = json.loads(json_text(keys))
    assert read["format"] == "thermo-pp/test/1"
    assert read["values"] == [0.1 + 0.2, None]
    assert read["one"] == 1e-300
    assert read["nested"] == {"a": [2, [None, True]]}
    assert read["standard_state"] == "1 bar"
    assert read["treatment"]["low_modes"] == "rotor-entropy"
    assert read["findings"] == [finding.as_dict()]


def test_notes_name_what_differs_from_the_defaults() -> None:
    plain = of_treatment(Treatment())
    assert plain == (
        "Standard state 1 bar; soft modes: entropy towards a free rotor's below 100 cm⁻¹ "
        "(rotor-entropy)."
    )
    other = Treatment(
        phase="solution", low_modes="raised", onset_cm=50.0, rotor="classical", masses="average",
        real_below_cm=20.0, frequency_scale=0.96, zero_point_scale=0.98, enantiopure=True,
    )  # fmt: skip
    said = of_treatment(other)
    for part in (
        "below 50 cm⁻¹ raised", "in solution", "classical rotors", "average masses", "times 0.96",
        "times 0.98", "below 20 cm⁻¹ taken as real", "one hand",
    ):  # fmt: skip
        assert part in said


def test_some_has_both_ends() -> None:
    assert some(3, 7) == [0, 1, 2]
    assert some(17, 7) == [0, 3, 5, 8, 11, 13, 16]
    assert some(100, 3) == [0, 50, 99]
    assert usual(np.array([280.0, 300.0, 320.0])) == 1


def test_write_file_replaces_whole_files(tmp_path: Path) -> None:
    path = tmp_path / "answer.csv"
    path.write_text("old")
    write_file(path, "new⁻¹")
    assert path.read_text(encoding="utf-8") == "new⁻¹\n"
    assert [each.name for each in tmp_path.iterdir()] == ["answer.csv"]


def test_write_file_never_writes_into_the_old_file(tmp_path: Path) -> None:
    path, other = tmp_path / "answer.csv", tmp_path / "other"
    path.write_text("old")
    other.hardlink_to(path)
    write_file(path, "new")
    assert other.read_text() == "old"


def test_write_file_leaves_the_old_answer_where_writing_fails(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = tmp_path / "answer.csv"
    path.write_text("old")

    def full(self: Path, data: bytes) -> int:
        with self.open("wb") as file:
            file.write(data[:2])
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(Path, "write_bytes", full)
    with pytest.raises(StudyError, match="cannot be written: No space left on device"):
        write_file(path, "new")
    assert path.read_text() == "old"
    assert [each.name for each in tmp_path.iterdir()] == ["answer.csv"]


def test_write_file_follows_a_link_and_keeps_devices(tmp_path: Path) -> None:
    target, link = tmp_path / "target", tmp_path / "link"
    target.write_text("old")
    link.symlink_to(target)
    write_file(link, "new")
    assert link.is_symlink()
    assert target.read_text() == "new\n"
    write_file(Path("/dev/null"), "x")
    assert stat.S_ISCHR(Path("/dev/null").stat().st_mode)


def test_write_file_into_a_missing_folder(tmp_path: Path) -> None:
    with pytest.raises(StudyError, match="cannot be written: No such file or directory"):
        write_file(tmp_path / "absent" / "x.csv", "text")
