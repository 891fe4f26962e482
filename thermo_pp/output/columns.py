"""Columns: which ones of a table are shown, and in which order."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from thermo_pp.errors import StudyError
from thermo_pp.nearest import suggestion
from thermo_pp.output.tables import Block, Column, Table


def check_columns(blocks: Sequence[Block], names: Sequence[str], *, where: str) -> None:
    """Make sure that every name is that of a column of some table.

    Parameters
    ----------
    blocks, names
        See `select`.
    where : str
        For messages.

    Raises
    ------
    StudyError
        No table has a column of that name.
    """
    columns = [column for block in blocks if isinstance(block, Table) for column in block.columns]
    known = list(dict.fromkeys(column.quantity for column in columns))
    for name in names:
        if not any(_is(column, name) for column in columns):
            raise StudyError(
                f"there is no column {name!r}", where=where, mend=suggestion(name, known, "columns")
            )


def select(blocks: Sequence[Block], names: Sequence[str]) -> list[Block]:
    """Return the blocks with the named columns only, in the order named.

    The first column of a table, which says what a row is, stays first unless it is named itself.
    Tables with none of the columns are left out, paragraphs stay.

    Parameters
    ----------
    blocks : sequence of Table or str
    names : sequence of str
        Quantities or whole headings, ``"G"`` or ``"ΔG / kJ mol⁻¹"``; Δ, capitals and spaces make no
        difference.
    """
    chosen = [_chosen(block, names) if isinstance(block, Table) else block for block in blocks]
    return [block for block in chosen if block is not None]


def _chosen(table: Table, names: Sequence[str]) -> Table | None:
    kept = [k for name in names for k, column in enumerate(table.columns) if _is(column, name)]
    if not kept:
        return None
    order = list(dict.fromkeys(kept if 0 in kept else [0, *kept]))
    return replace(
        table,
        columns=[table.columns[k] for k in order],
        rows=[[row[k] for k in order] for row in table.rows],
    )


def _is(column: Column, name: str) -> bool:
    return _plain(name) in (_plain(column.quantity), _plain(column.heading))


def _plain(name: str) -> str:
    return "".join(name.split()).removeprefix("Δ").casefold()
