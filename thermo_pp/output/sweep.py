"""A sweep as JSON and as one table."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from thermo_pp.conditions import Treatment
from thermo_pp.errors import Finding
from thermo_pp.names import EnergyUnit
from thermo_pp.output.definitions import KEYS
from thermo_pp.output.json_text import answer
from thermo_pp.output.notes import ALL_DIGITS, of_treatment, stamp, usual
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
from thermo_pp.study.sweep import Sweep, SweptRate, SweptRow


def keys(sweep: Sweep, treatment: Treatment, findings: Sequence[Finding]) -> dict[str, Any]:
    """Return the JSON answer."""
    return answer("sweep", findings, treatment, keys=sweep.keys, rows=[_row(r) for r in sweep.rows])


def _row(row: SweptRow) -> dict[str, Any]:
    return {
        "values": row.values,
        "error": row.error,
        "rates": {
            KEYS[rate.definition]: {
                name: value for name, value in vars(rate).items() if name != "definition"
            }
            for rate in row.rates
        },
    }


def tables(sweep: Sweep, treatment: Treatment, unit: EnergyUnit, *, people: bool) -> list[Block]:
    """Return the table; for people one temperature a row, that which comes nearest to 298.15 K."""
    rows: list[list[Cell]] = []
    for row in sweep.rows:
        values: list[Cell] = [_shown(value) for value in row.values]
        if row.error is not None:
            rows.append([*values, *([None] * _COLUMNS), " ".join(row.error.split())])
        for rate in row.rates:
            every = range(len(rate.temperature_k))
            for k in [usual(rate.temperature_k)] if people else every:
                rows.append([*values, *_cells(rate, k, unit), None])
    columns = [
        *(Column(key) for key in sweep.keys),
        *(Column("definition"), Column("T", "K", "$T$"), Column("k", "s⁻¹", "$k$", digits=4)),
        energy_column("Eₐ" if people else "Ea", unit, r"$E_\mathrm{a}$"),
        energy_column("G‡", unit, r"$G^\ddagger$"),
        *(Column("rests"), Column("controls"), Column("control", decimals=3)),
        Column("error"),
    ]
    if not any(row.error for row in sweep.rows) and people:
        columns, rows = columns[:-1], [row[:-1] for row in rows]
    table = Table(f"{', '.join(sweep.keys)}: rates", columns, rows)
    notes = [of_treatment(treatment), stamp(), *([ALL_DIGITS] if people else [])]
    return about_all([table], notes)


_COLUMNS = 8


def _cells(rate: SweptRate, k: int, unit: EnergyUnit) -> list[Cell]:
    return [
        *(rate.definition, float(rate.temperature_k[k]), defined(rate.rate_constant[k])),
        in_unit(rate.arrhenius_energy_kj_mol[k], unit),
        in_unit(rate.activation_gibbs_kj_mol[k], unit),
        None if rate.resting is None else rate.resting[k],
        rate.controlling[k],
        defined(rate.control[k]),
    ]


def _shown(value: Any) -> Cell:
    return value if isinstance(value, (str, int, float)) else str(value)
