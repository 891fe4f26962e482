"""HTML: plain tables that a screen reader can read, with captions and scopes; everything escaped."""

from __future__ import annotations

from collections.abc import Sequence
from html import escape

from thermo_pp.output.plain import table_cells
from thermo_pp.output.tables import Block, Table, printable

_STYLE = """\
:root { color-scheme: light dark; }
body { font: 1rem/1.5 system-ui, sans-serif; margin: 1rem auto; max-width: 70rem; padding: 0 1rem; }
.wide { overflow-x: auto; }
table { border-collapse: collapse; border-block: 2px solid; margin-block: 1rem .5rem; }
caption { font-weight: bold; text-align: start; }
thead { border-bottom: 1px solid; }
th, td { padding: .15rem .6rem; text-align: start; vertical-align: baseline; font-weight: normal; }
.number { text-align: end; font-variant-numeric: tabular-nums; white-space: nowrap; }
ul { font-size: .9rem; margin-top: 0; }"""


def html_document(blocks: Sequence[Block], title: str) -> str:
    """Return tables and paragraphs as one page that needs nothing else."""
    return "\n".join(
        [
            "<!DOCTYPE html>",
            '<html lang="en">',
            "<head>",
            '<meta charset="utf-8">',
            '<meta name="viewport" content="width=device-width, initial-scale=1">',
            f"<title>{_text(title)}</title>",
            f"<style>\n{_STYLE}\n</style>",
            "</head>",
            "<body>",
            f"<h1>{_text(title)}</h1>",
            html(blocks),
            "</body>",
            "</html>",
        ]
    )


def html(blocks: Sequence[Block]) -> str:
    """Return tables and paragraphs as the inside of a page."""
    return "\n".join(
        f"<p>{_text(block)}</p>" if isinstance(block, str) else _table(block) for block in blocks
    )


def _table(table: Table) -> str:
    """Return a table; the first column heads the rows."""
    sides = [' class="number"' if table.right(k) else "" for k in range(len(table.columns))]
    lines = ['<div class="wide" tabindex="0" role="region" aria-label="table">', "<table>"]
    lines.append(f"<caption>{_text(table.title)}</caption>")
    headings = (
        f'<th scope="col"{side}>{_text(column.heading)}</th>'
        for column, side in zip(table.columns, sides, strict=True)
    )
    lines += ["<thead>", f"<tr>{''.join(headings)}</tr>", "</thead>", "<tbody>"]
    for first, *others in table_cells(table):
        cells = "".join(
            f"<td{side}>{_text(cell)}</td>" for cell, side in zip(others, sides[1:], strict=True)
        )
        lines.append(f'<tr><th scope="row"{sides[0]}>{_text(first)}</th>{cells}</tr>')
    lines += ["</tbody>", "</table>", "</div>"]
    if table.all_notes:
        notes = "".join(f"<li>{_text(note)}</li>" for note in table.all_notes)
        lines.append(f"<ul>{notes}</ul>")
    return "\n".join(lines)


def _text(text: str) -> str:
    return escape(printable(text))
