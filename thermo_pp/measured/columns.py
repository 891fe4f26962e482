"""Columns of a measurement file: headings written quantity / unit, and cells with their place."""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path

from thermo_pp.errors import StudyError
from thermo_pp.nearest import suggestion
from thermo_pp.text_file import read_text
from thermo_pp.units import split_quantity

NAMES = (
    *("temperature", "k", "sigma", "definition", "kind", "source", "orders"),
    *("from", "to", "A", "sigma A", "n", "sigma n", "T0", "E", "sigma E", "correlation"),
)
"""Quantities of the headings; [NAME] is the amount of a held species."""
WITH_UNIT = ("temperature", "k", "sigma", "from", "to", "A", "sigma A", "T0", "E", "sigma E")
AMOUNT = re.compile(r"\[(\S+)\]")


@dataclass(frozen=True)
class Cells:
    """One row of the file.

    Attributes
    ----------
    file, line : str and int
    values : mapping of str to str
        Quantity to cell, empty cells left out.
    units : mapping of str to str
        Quantity to unit, of the headings.
    """

    file: str
    line: int
    values: Mapping[str, str]
    units: Mapping[str, str]

    @property
    def where(self) -> str:
        """File and line."""
        return f"{self.file}:{self.line}"

    def text(self, name: str, mend: str) -> str:
        """Return a cell that must not be empty."""
        if name not in self.values:
            raise StudyError(f"no {name!r} in this row", where=self.where, mend=mend)
        return self.values[name]

    def number(self, name: str, mend: str = "write one finite number") -> float:
        """Return a cell that must be one finite number."""
        text = self.text(name, mend)
        try:
            number, unit = split_quantity(f"{text} K", "K", where=self.where)
        except StudyError:
            unit = ""
        if unit != "K":
            raise StudyError(
                f"{text!r} in column {name!r} is not a finite number",
                where=self.where,
                mend="write one number, as in 3.3e-39; units stand in the heading",
            )
        return number

    def optional(self, name: str) -> float | None:
        """Return a number, None where the cell is empty or the column is not there."""
        return self.number(name) if name in self.values else None


def read_columns(path: Path, file: str) -> list[Cells]:
    """Read a CSV file; empty lines and lines that start with # are left out.

    Raises
    ------
    StudyError
        Not readable, no heading, an unknown or double heading, a heading without its unit, a row
        with more or fewer cells than headings.
    """
    lines = read_text(
        path,
        file,
        "the measurements",
        "name a CSV file; docs/cli.md (compare) says what it holds",
    )
    rows = list(_rows(lines, file))
    if not rows:
        raise StudyError("the file is empty", where=file, mend="write a row of headings and data")
    number, headings = rows[0]
    names, units = _headings(headings, f"{file}:{number}")
    found = []
    for line, cells in rows[1:]:
        if len(cells) != len(names):
            raise StudyError(
                f"{len(cells)} cells under {len(names)} headings",
                where=f"{file}:{line}",
                mend='write one cell a heading; a text with a comma stands in quotes "..."',
            )
        filled = {
            name: cell.strip() for name, cell in zip(names, cells, strict=True) if cell.strip()
        }
        found.append(Cells(file, line, filled, units))
    if not found:
        raise StudyError("there is no row below the headings", where=file, mend="add the data")
    return found


def _rows(text: str, file: str) -> Iterator[tuple[int, list[str]]]:
    """Yield each row with the line that it ends on."""
    reader = csv.reader(io.StringIO(text), strict=True)
    try:
        for cells in reader:
            if any(cell.strip() for cell in cells) and not cells[0].lstrip().startswith("#"):
                yield reader.line_num, cells
    except csv.Error as error:
        raise StudyError(
            f"not CSV: {error}",
            where=f"{file}:{reader.line_num}",
            mend='part cells by commas; quotes stand in pairs, as in "a, b"',
        ) from None


def _headings(cells: list[str], where: str) -> tuple[list[str], dict[str, str]]:
    names: list[str] = []
    units: dict[str, str] = {}
    for cell in cells:
        name, _, unit = (part.strip() for part in cell.partition("/"))
        amount = AMOUNT.fullmatch(name) is not None
        if name not in NAMES and not amount:
            raise StudyError(
                f"unknown heading {cell.strip()!r}",
                where=where,
                mend=suggestion(name, NAMES, "headings"),
            )
        if name in names:
            raise StudyError(f"{name!r} has two columns", where=where, mend="leave one of them out")
        needs = amount or name in WITH_UNIT
        if needs != bool(unit):
            what = "has no unit" if needs else "takes no unit"
            example = {"k": "k / cm^3 molecule^-1 s^-1", "E": "E / K"}.get(name, f"{name} / K")
            mend = f"write it as in {example!r}" if needs else f"write {name!r}"
            raise StudyError(f"the heading {cell.strip()!r} {what}", where=where, mend=mend)
        names.append(name)
        if unit:
            units[name] = unit
    return names, units
