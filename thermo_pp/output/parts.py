"""Parts: a table that is too wide for a page, cut into several that repeat the first column."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from thermo_pp.output.plain import table_cells
from thermo_pp.output.tables import Table


def in_parts(table: Table, across: float, *, gap: float, most_text: int) -> list[Table]:
    """Return the table as it is, or in as many parts as its width asks for.

    Every part has the first column and the title with its number; the notes stand below the last.

    Parameters
    ----------
    table : Table
    across : float
        Characters that a line holds.
    gap : float
        Characters that lie between two columns.
    most_text : int
        Characters that a column takes at most; longer text is broken.
    """
    widths = [width + gap for width in _widths(table, most_text)]
    groups = _groups(widths, across)
    if len(groups) < 2:
        return [table]
    for share in range(99, 0, -1):  # as narrow as this number of parts can be
        narrower = _groups(widths, across * share / 100)
        if len(narrower) > len(groups):
            break
        groups = narrower
    parts = []
    for number, group in enumerate(groups, start=1):
        last = number == len(groups)
        parts.append(
            replace(
                table,
                title=f"{table.title} ({number} of {len(groups)})",
                columns=[table.columns[k] for k in group],
                rows=[[row[k] for k in group] for row in table.rows],
                notes=table.notes if last else (),
                about=table.about if last else (),
            )
        )
    return parts


def _groups(widths: Sequence[float], across: float) -> list[list[int]]:
    """Return which columns stand together, the first one in every group."""
    groups: list[list[int]] = [[0]] if widths else []
    room = across - sum(widths[:1])
    for k, width in enumerate(widths[1:], start=1):
        if width > room and len(groups[-1]) > 1:
            groups.append([0])
            room = across - widths[0]
        groups[-1].append(k)
        room -= width
    return groups


def _extent(text: str) -> float:
    """Return the width of a text in digits; capitals are wider."""
    return len(text) + 0.4 * sum(sign.isupper() for sign in text)


def _widths(table: Table, most_text: int) -> Sequence[float]:
    """Return the characters of each column, its heading broken before the unit."""
    cells = table_cells(table)
    found = []
    for k, column in enumerate(table.columns):
        inner = max((_extent(row[k]) for row in cells), default=0.0)
        broken = max(_extent(column.quantity) + 2 * bool(column.unit), _extent(column.unit))
        found.append(min(max(inner, broken), most_text))
    return found
