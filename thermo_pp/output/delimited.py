"""CSV: full digits, a row of headings; what holds for every row stands in further columns.

A spreadsheet would take text that starts with one of `FORMULA_SIGNS` for a formula. Such text is
written with an apostrophe before it, and so is text that starts with an apostrophe: a reader who
takes one apostrophe off the front of every text has what was there.
"""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence

from thermo_pp.output.tables import Block, Cell, Table

FORMULA_SIGNS = ("=", "+", "-", "@", "\t", "\r")


def csv_text(blocks: Sequence[Block]) -> str:
    """Return the tables as CSV, an empty line between two of them; paragraphs are left out."""
    return "\n".join(_table(block) for block in blocks if isinstance(block, Table)).removesuffix(
        "\n"
    )


def _table(table: Table) -> str:
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\n")
    headings = [column.heading for column in table.columns]
    writer.writerow([_cell(text) for text in (*headings, *(name for name, _ in table.constants))])
    constants = [_cell(value) for _, value in table.constants]
    for row in table.rows:
        writer.writerow([_cell(cell) for cell in row] + constants)
    return stream.getvalue()


def _cell(cell: Cell) -> str:
    if cell is None:
        return ""
    if isinstance(cell, str):
        return f"'{cell}" if cell.startswith((*FORMULA_SIGNS, "'")) else cell
    return repr(cell.item() if hasattr(cell, "item") else cell)
