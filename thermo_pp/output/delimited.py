"""CSV: full digits, a row of headings; what holds for every row stands in further columns."""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence

from thermo_pp.output.tables import Block, Cell, Table


def csv_text(blocks: Sequence[Block]) -> str:
    """Return the tables as CSV, an empty line between two of them; paragraphs are left out."""
    return "\n".join(_table(block) for block in blocks if isinstance(block, Table)).removesuffix(
        "\n"
    )


def _table(table: Table) -> str:
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\n")
    writer.writerow(
        [column.heading for column in table.columns] + [name for name, _ in table.constants]
    )
    constants = [value for _, value in table.constants]
    for row in table.rows:
        writer.writerow([_cell(cell) for cell in row] + constants)
    return stream.getvalue()


def _cell(cell: Cell) -> str:
    if cell is None:
        return ""
    return cell if isinstance(cell, str) else repr(cell.item() if hasattr(cell, "item") else cell)
