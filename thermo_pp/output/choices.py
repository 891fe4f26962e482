"""The tables and the JSON answer of ``choices``."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from thermo_pp.conditions import Treatment
from thermo_pp.names import EnergyUnit
from thermo_pp.output.json_text import answer
from thermo_pp.output.notes import ALL_DIGITS, kelvin, of_treatment, stamp, usual
from thermo_pp.output.tables import (
    Block,
    Cell,
    Column,
    Table,
    about_all,
    defined,
    energy_column,
    in_unit,
)
from thermo_pp.study.choices import Alternative, Choices, Worth

_TITLES = {
    "species": "Change of G of each species",
    "barrier": "Change of each barrier G‡",
    "rate": "Change of the effective rate",
}
_WORDS = {
    "free": "per free reactant",
    "pool": "per pool",
    "relaxation": "relaxation",
    "cycle": "per catalyst",
}


def tables(choices: Choices, treatment: Treatment, unit: EnergyUnit) -> list[Block]:
    """Return a table a kind of quantity, a row an alternative, at the temperature nearest 298.15 K."""
    k = usual(choices.temperature_k)
    blocks: list[Table] = []
    for kind, title in _TITLES.items():
        rows = [row for row in choices.rows if row.kind == kind]
        if rows:
            blocks.append(
                _table(f"{title}, {kelvin(choices.temperature_k[k])}", rows, choices, k, unit)
            )
    notes = [
        "Each choice is made otherwise by itself; the other ones stay. A dash: not defined.",
        *(f"{f.what}." for f in choices.findings if f.code == "choice-not-made"),
        of_treatment(treatment),
        stamp(),
        *([ALL_DIGITS] if len(choices.temperature_k) > 1 else []),
    ]
    return about_all(blocks, notes)


def wide(choices: Choices, treatment: Treatment, unit: EnergyUnit) -> list[Block]:
    """Return the one table for CSV: a row a quantity, alternative and temperature."""
    columns = [
        *map(Column, ("kind", "name", "quantity", "unit")),
        Column("T", "K"),
        Column("value"),
        *map(Column, ("choice", "taken", "instead", "change")),
    ]
    rows: list[list[Cell]] = [
        [
            row.kind,
            row.name,
            row.quantity,
            unit if row.unit else "",
            float(temperature),
            _shown(row, row.value[k], unit),
            *(alternative.choice, alternative.taken, alternative.instead),
            _shown(row, row.change[a, k], unit),
        ]
        for row in choices.rows
        for a, alternative in enumerate(choices.alternatives)
        for k, temperature in enumerate(choices.temperature_k)
    ]
    constants = [("standard state", treatment.standard_state.text)]
    notes = [of_treatment(treatment), stamp()]
    return [Table("choices", columns, rows, constants=constants, about=notes)]


def keys(choices: Choices, treatment: Treatment, findings: Sequence[Any]) -> dict[str, Any]:
    """Return the JSON answer."""
    return answer(
        "choices",
        findings,
        treatment,
        temperature_k=choices.temperature_k,
        alternatives=[
            {"choice": one.choice, "taken": one.taken, "instead": one.instead}
            for one in choices.alternatives
        ],
        quantities=[
            {
                "kind": row.kind,
                "name": row.name,
                "quantity": row.quantity,
                "unit": row.unit,
                "value": row.value,
                "change": row.change,
            }
            for row in choices.rows
        ],
    )


def _table(title: str, rows: Sequence[Worth], choices: Choices, k: int, unit: EnergyUnit) -> Table:
    columns = [Column("Choice"), Column("instead of"), *(_column(row, unit) for row in rows)]
    cells: list[list[Cell]] = [
        [_words(one), one.taken, *(_shown(row, row.change[a, k], unit) for row in rows)]
        for a, one in enumerate(choices.alternatives)
    ]
    return Table(title, columns, cells)


def _words(one: Alternative) -> str:
    return f"{one.choice}: {one.instead}"


def _column(row: Worth, unit: EnergyUnit) -> Column:
    if row.kind == "rate":
        heading = f"{row.quantity} {_WORDS[row.name]}"
        return energy_column(heading, unit) if row.unit else Column(heading, decimals=3)
    return energy_column(row.name, unit)


def _shown(row: Worth, value: float, unit: EnergyUnit) -> float | None:
    return in_unit(value, unit) if row.unit else defined(value)
