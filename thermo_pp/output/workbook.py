"""Workbook: tables as xlsx, a sheet each; numbers are numbers with all their digits, text is text.

The first row of a sheet is the title, the second has the headings and stays in view with the first
column; the notes stand below the rows. Nothing is turned into a formula or a link, and the same
tables give the same bytes.
"""

from __future__ import annotations

import datetime
import io
import re
from collections.abc import Sequence

from thermo_pp.errors import StudyError
from thermo_pp.output.tables import Block, Column, Table, printable

MOST_ROWS = 1_048_000
"""What a sheet holds, title and notes left some room."""
WIDEST = 40
_LONGEST_NAME = 31
_NEVER_IN_A_NAME = re.compile(r"[\[\]:*?/\\]")


def workbook(blocks: Sequence[Block]) -> bytes:
    """Return the tables as a workbook; paragraphs have a sheet of their own at the end.

    Raises
    ------
    StudyError
        A table has more rows than a sheet holds.
    """
    import xlsxwriter

    stream = io.BytesIO()
    options = {
        "in_memory": True,
        "strings_to_formulas": False,
        "strings_to_urls": False,
        "strings_to_numbers": False,
    }
    book = xlsxwriter.Workbook(stream, options)
    book.set_properties({"created": datetime.datetime(2000, 1, 1)})
    formats = _Formats(book)
    used: set[str] = set()
    for table in (block for block in blocks if isinstance(block, Table)):
        sheet = book.add_worksheet(_sheet_name(table.title, used))
        _fill(sheet, table, formats)
    words = [block for block in blocks if isinstance(block, str)]
    if words or not used:
        sheet = book.add_worksheet(_sheet_name("words", used))
        sheet.set_column(0, 0, 100)
        for row, text in enumerate(words):
            sheet.write_string(row, 0, printable(text), formats.wrapped)
    book.close()
    return stream.getvalue()


class _Formats:
    """The formats of cells, each made once."""

    def __init__(self, book: object) -> None:
        self.book = book
        self.made: dict[str, object] = {}
        self.title = self._of(bold=True)
        self.heading = self._of(bold=True, bottom=1, text_wrap=True, valign="top")
        self.wrapped = self._of(text_wrap=True, valign="top")

    def _of(self, **properties: object) -> object:
        return self.book.add_format(properties)  # type: ignore[attr-defined]

    def number(self, column: Column) -> object:
        """Return the format of a column's numbers: the digits that people are shown."""
        text = "General"
        if column.decimals is not None:
            text = "0." + "0" * column.decimals if column.decimals else "0"
        elif column.digits is not None:
            text = "0." + "0" * (column.digits - 1) + "E+00"
        if text not in self.made:
            self.made[text] = self._of(num_format=text)
        return self.made[text]


def _fill(sheet: object, table: Table, formats: _Formats) -> None:
    write_text, write_number = sheet.write_string, sheet.write_number  # type: ignore[attr-defined]
    if len(table.rows) > MOST_ROWS:
        raise StudyError(
            f"{len(table.rows)} rows of the table {table.title!r} are too many for a sheet",
            where="xlsx",
            mend="take fewer temperatures, or --format csv",
        )
    write_text(0, 0, printable(table.title), formats.title)
    constants = [printable(value) for _, value in table.constants]
    headings = [column.heading for column in table.columns]
    headings += [name for name, _ in table.constants]
    for k, heading in enumerate(headings):
        write_text(1, k, printable(heading), formats.heading)
    numbers = [formats.number(column) for column in table.columns]
    widths = [min(len(heading), 14) for heading in headings]
    for at, row in enumerate(table.rows, start=2):
        for k, cell in enumerate([*row, *constants]):
            if cell is None:
                continue
            if isinstance(cell, str):
                write_text(at, k, printable(cell))
                widths[k] = max(widths[k], min(len(cell), WIDEST))
            else:
                write_number(at, k, cell, numbers[k])
                widths[k] = max(widths[k], 12)
    for k, width in enumerate(widths):
        sheet.set_column(k, k, width + 2)  # type: ignore[attr-defined]
    for at, note in enumerate(table.all_notes, start=len(table.rows) + 3):
        write_text(at, 0, printable(note))
    sheet.freeze_panes(2, 1)  # type: ignore[attr-defined]


def _sheet_name(title: str, used: set[str]) -> str:
    """Return a name that a sheet may have, and that no other has."""
    plain = _NEVER_IN_A_NAME.sub(" ", printable(title)).strip().strip("'")
    plain = plain[:_LONGEST_NAME].strip().strip("'") or "table"
    name, number = plain, 1
    while name.casefold() in used or name.casefold() == "history":
        number += 1
        tail = f" ({number})"
        name = plain[: _LONGEST_NAME - len(tail)] + tail
    used.add(name.casefold())
    return name
