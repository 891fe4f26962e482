"""How products compete, in the answers of ``barrier``: JSON, CSV and the tables for people."""

from __future__ import annotations

from typing import Any

import numpy as np

from thermo_pp.kinetics.product_ratio import CurtinHammett, ProductRatio, Selectivity
from thermo_pp.names import EnergyUnit
from thermo_pp.output.notes import kelvin, some
from thermo_pp.output.tables import (
    ENTROPY_UNIT,
    Block,
    Cell,
    Column,
    Table,
    defined,
    energy_column,
    in_unit,
)

SIDE_BY_SIDE = 3
SHOWN_CONTROL = 0.001
"""States whose control stays below this at the temperatures shown have no row."""


def keys(selectivity: Selectivity) -> dict[str, Any]:
    """Return what the JSON answer has under ``selectivity``."""
    return {
        "kind": selectivity.kind,
        "temperature_k": selectivity.temperature_k,
        "rates": selectivity.rates,
        "ratios": [
            {
                "product": one.product,
                "other": one.other,
                "ratio": one.ratio,
                "excess": one.excess,
                "enthalpy_kj_mol": one.enthalpy_kj_mol,
                "entropy_j_mol_k": one.entropy_j_mol_k,
                "gibbs_kj_mol": one.gibbs_kj_mol,
                "control": one.control,
                "curtin_hammett": _curtin_hammett(one.curtin_hammett),
            }
            for one in selectivity.ratios
        ],
    }


def _curtin_hammett(found: CurtinHammett | None) -> dict[str, Any] | None:
    if found is None:
        return None
    return {
        "saddles": found.saddles_over,
        "ratio": found.ratio,
        "over_exact": found.over_exact,
        "windows_k": [[window.from_k, window.to_k] for window in found.windows],
        "windows_open": [[window.open_below, window.open_above] for window in found.windows],
    }


def wide(selectivity: Selectivity, unit: EnergyUnit) -> list[Block]:
    """Return the tables for CSV: ratios and their controls; full digits."""
    every = range(len(selectivity.temperature_k))
    head = [Column("product"), Column("other"), Column("T", "K")]
    ratios: list[list[Cell]] = [
        [one.product, one.other, *_ratio(selectivity, one, k, unit)]
        for one in selectivity.ratios
        for k in every
    ]
    controls: list[list[Cell]] = [
        [one.product, one.other, float(selectivity.temperature_k[k]), name, defined(values[k])]
        for one in selectivity.ratios
        for name, values in one.control.items()
        for k in every
    ]
    return [
        Table("selectivity", [*head[:2], *_columns(unit)], ratios),
        Table("control of selectivity", [*head, Column("species"), Column("value")], controls),
    ]


def tables(selectivity: Selectivity, unit: EnergyUnit) -> list[Block]:
    """Return the tables for people."""
    blocks: list[Block] = []
    shown = some(len(selectivity.temperature_k), SIDE_BY_SIDE)
    for one in selectivity.ratios:
        rows = [_ratio(selectivity, one, k, unit) for k in range(len(selectivity.temperature_k))]
        blocks.append(
            Table(f"Selectivity: {one.product} over {one.other}", _columns(unit), rows, _notes(one))
        )
        counting = {
            name: values
            for name, values in one.control.items()
            if np.any(np.abs(values[shown]) >= SHOWN_CONTROL)
        }
        columns = [
            Column("Species"),
            *(Column(kelvin(selectivity.temperature_k[k]), decimals=3) for k in shown),
        ]
        controls: list[list[Cell]] = [
            [f"{name} ‡" if name in one.saddles else name, *(defined(values[k]) for k in shown)]
            for name, values in counting.items()
        ]
        title = f"Control of {one.product} over {one.other}"
        notes = [
            "Control: d ln(ratio)/d(-G/RT) of each state; ‡: saddle points, or steps without one."
        ]
        blocks.append(Table(title, columns, controls, notes))
    return blocks


def _notes(one: ProductRatio) -> list[str]:
    notes = ["H and S: of the ratio, ln(ratio) = -H/RT + S/R at each temperature."]
    found = one.curtin_hammett
    if found is not None:
        within = ", ".join(
            "throughout" if w.open_below and w.open_above else f"{w.from_k:.2f} K to {w.to_k:.2f} K"
            for w in found.windows
        )
        notes.append(f"C-H: Curtin-Hammett, within 5 % of the exact ratio {within or 'nowhere'}.")
    return notes


def _columns(unit: EnergyUnit) -> list[Column]:
    return [
        Column("T", "K", "$T$"),
        Column("ratio", digits=4),
        Column("excess", decimals=4),
        energy_column("H", unit, "$H$"),
        Column("S", ENTROPY_UNIT, "$S$", decimals=1),
        energy_column("G", unit, "$G$"),
        Column("C-H", digits=4),
    ]


def _ratio(selectivity: Selectivity, one: ProductRatio, k: int, unit: EnergyUnit) -> list[Cell]:
    found = one.curtin_hammett
    return [
        float(selectivity.temperature_k[k]),
        defined(one.ratio[k]),
        defined(one.excess[k]),
        in_unit(one.enthalpy_kj_mol[k], unit),
        defined(one.entropy_j_mol_k[k]),
        in_unit(one.gibbs_kj_mol[k], unit),
        None if found is None else defined(found.ratio[k]),
    ]
