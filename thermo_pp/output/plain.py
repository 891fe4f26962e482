"""Plain text: tables for the terminal and for Markdown."""

from __future__ import annotations

import re
import textwrap
from collections.abc import Sequence

from tabulate import tabulate

from thermo_pp.output.tables import Block, Table, printable

GAP = 2
"""Spaces between two columns."""
WIDTH = 100
"""Characters a line of notes or words takes at most."""


def terminal(blocks: Sequence[Block]) -> str:
    """Return tables and paragraphs for a terminal."""
    last = {tuple(block.about): block for block in blocks if isinstance(block, Table)}
    return "\n\n".join(
        _wrapped(block)
        if isinstance(block, str)
        else _terminal_table(block, last[tuple(block.about)] is block)
        for block in blocks
    )


def markdown(blocks: Sequence[Block]) -> str:
    """Return tables and paragraphs as Markdown (pipe tables)."""
    return "\n\n".join(
        markdown_text(block) if isinstance(block, str) else _markdown_table(block)
        for block in blocks
    )


def _terminal_table(table: Table, last: bool) -> str:
    cells = table_cells(table)
    headings = _fitted(table, cells)
    lines = _grid(table, "plain", [headings, *cells]).splitlines()
    rule = "─" * max(map(len, lines))
    high = 1 + max(heading.count("\n") for heading in headings)
    grid = [rule, *lines[:high], rule, *lines[high:], rule]
    notes = table.all_notes if last else table.notes
    return "\n".join([printable(table.title), *grid, *(_wrapped(note) for note in notes)])


def _fitted(table: Table, cells: Sequence[Sequence[str]]) -> list[str]:
    """Return the headings, as many of them broken before the unit as the width asks for.

    Those that gain most are broken first, that of the free energy last.
    """
    headings = [column.heading for column in table.columns]
    inner = [max((len(row[k]) for row in cells), default=0) for k in range(len(headings))]

    def gain(k: int) -> int:
        broken = max(map(len, headings[k].replace(" / ", " /\n").split("\n")))
        return max(inner[k], len(headings[k])) - max(inner[k], broken)

    width = sum(map(max, inner, map(len, headings))) + GAP * (len(headings) - 1)
    for k in sorted(range(len(headings)), key=lambda k: (table.columns[k].whole, -gain(k))):
        if width > WIDTH and gain(k) > 0:
            width -= gain(k)
            headings[k] = headings[k].replace(" / ", " /\n")
    high = max(heading.count("\n") for heading in headings)
    return ["\n" * (high - heading.count("\n")) + heading for heading in headings]


def _markdown_table(table: Table) -> str:
    cells = [[markdown_inline(cell) for cell in row] for row in table_cells(table)]
    headings = [markdown_inline(column.heading) for column in table.columns]
    grid = _grid(table, "pipe", cells, headings)
    parts = [f"**{markdown_inline(table.title)}**", "", grid]
    if table.all_notes:
        parts += ["", *(f"- {markdown_text(note)}" for note in table.all_notes)]
    return "\n".join(parts)


def table_cells(table: Table) -> list[list[str]]:
    """Return every cell as text."""
    return [
        [column.text(cell) for column, cell in zip(table.columns, row, strict=True)]
        for row in table.rows
    ]


def _grid(table: Table, style: str, cells: list[list[str]], headings: Sequence[str] = ()) -> str:
    sides = ["right" if table.right(k) else "left" for k in range(len(table.columns))]
    text: str = tabulate(
        cells,
        headers=headings,
        tablefmt=style,
        colalign=sides if cells else None,
        disable_numparse=True,
        preserve_whitespace=True,
    )
    return "\n".join(line.rstrip() for line in text.splitlines())


def _wrapped(text: str) -> str:
    return textwrap.fill(printable(text), WIDTH, break_long_words=False, break_on_hyphens=False)


def markdown_inline(text: str) -> str:
    """Return plain text for the inside of a line of Markdown, where it is shown as it is."""
    return re.sub(r"[\\|*_<`&\[\]~$]", r"\\\g<0>", printable(text))


def markdown_text(text: str) -> str:
    """Return plain text as a line of Markdown; nothing in it makes a heading, a list or a quotation."""
    return re.sub(r"^(\s*)([#>+=-]|\d+(?=[.)]))", _at_the_start, markdown_inline(text))


def _at_the_start(found: re.Match[str]) -> str:
    space, sign = found.groups()
    return f"{space}{sign}\\" if sign.isdigit() else f"{space}\\{sign}"
