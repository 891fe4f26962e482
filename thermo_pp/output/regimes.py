"""The map of regimes in the answers of ``barrier``: JSON, CSV and the tables for people."""

from __future__ import annotations

from typing import Any

import numpy as np

from thermo_pp.kinetics.regime_map import AmountWindow, RegimeMap, Regimes
from thermo_pp.names import EnergyUnit
from thermo_pp.output.definitions import KEYS, TITLES
from thermo_pp.output.notes import kelvin, some, usual
from thermo_pp.output.tables import (
    Block,
    Cell,
    Column,
    Table,
    defined,
    energy_column,
    in_unit,
    unit_heading,
)

TEMPERATURES, AMOUNTS = 3, 5
"""How many of the map a page for people shows at most."""
CONTOUR = 9
"""At how many amounts the sign of E_a is shown at most."""


def keys(regimes: Regimes) -> dict[str, Any]:
    """Return what the JSON answer has under ``regimes``."""
    return {
        "over": regimes.species,
        "unit": regimes.unit,
        "amount": regimes.amount,
        "temperature_k": regimes.temperature_k,
        "maps": {KEYS[name]: _map(one) for name, one in regimes.maps.items()},
    }


def _map(one: RegimeMap) -> dict[str, Any]:
    rows, columns = one.rate_constant.shape
    return {
        "rate_constant": one.rate_constant,
        "arrhenius_energy_kj_mol": one.arrhenius_energy_kj_mol,
        "order": one.order,
        "approximation": [[one.holding_name(i, j) for j in range(columns)] for i in range(rows)],
        "ratios": dict(zip(one.approximations, one.ratio, strict=True)),
        "windows": {
            name: [[[w.from_amount, w.to_amount] for w in at] for at in windows]
            for name, windows in one.windows.items()
        },
        "windows_open": {
            name: [[[w.open_below, w.open_above] for w in at] for at in windows]
            for name, windows in one.windows.items()
        },
        "controlling": [[one.controlling_name(i, j) for j in range(columns)] for i in range(rows)],
        "control": one.control,
        "resting": [[one.resting_name(i, j) for j in range(columns)] for i in range(rows)]
        if one.resting is not None
        else None,
        "population": one.population,
        "sign_changes": [
            [{"temperature_k": c.temperature_k, "kind": c.kind} for c in changes]
            for changes in one.sign_changes
        ],
    }


def wide(regimes: Regimes, unit: EnergyUnit) -> list[Block]:
    """Return the tables for CSV: the map, the windows over the amount, the contour; full digits."""
    windows: list[list[Cell]] = [
        [*_place(regimes, name, i), approximation, *_bounds(window)]
        for name, one in regimes.maps.items()
        for approximation, rows in one.windows.items()
        for i, found in enumerate(rows)
        for window in found
    ]
    contour: list[list[Cell]] = [
        [name, float(amount), change.temperature_k, change.kind]
        for name, one in regimes.maps.items()
        for amount, changes in zip(regimes.amount, one.sign_changes, strict=True)
        for change in changes
    ]
    t, c = len(regimes.temperature_k), len(regimes.amount)
    amount, constants = unit_heading(regimes.unit), [("over", regimes.species)]
    head = [Column("definition"), Column("T", "K")]
    return [
        Table(
            "regimes",
            [*head, *_map_columns(regimes, unit)],
            [
                [*_place(regimes, name, i), *_point(regimes, one, i, j, unit)]
                for name, one in regimes.maps.items()
                for i in range(t)
                for j in range(c)
            ],
            constants=constants,
        ),
        Table(
            "windows over the amount",
            [
                *(*head, Column("approximation"), Column("from", amount), Column("to", amount)),
                *(Column("open below"), Column("open above")),
            ],
            windows,
            constants=constants,
        ),
        Table(
            "sign of Ea",
            [Column("definition"), Column("amount", amount), Column("T", "K"), Column("extremum")],
            contour,
            constants=constants,
        ),
    ]


def _place(regimes: Regimes, name: str, row: int) -> list[Cell]:
    return [name, float(regimes.temperature_k[row])]


def _bounds(window: AmountWindow) -> list[Cell]:
    return [
        *(window.from_amount, window.to_amount),
        *("yes" if way else "no" for way in (window.open_below, window.open_above)),
    ]


def tables(regimes: Regimes, unit: EnergyUnit) -> list[Block]:
    """Return the tables for people."""
    blocks: list[Block] = []
    shown = some(len(regimes.temperature_k), TEMPERATURES)
    amounts = some(len(regimes.amount), AMOUNTS)
    for name, one in regimes.maps.items():
        rows: list[list[Cell]] = [
            [float(regimes.temperature_k[i]), *_point(regimes, one, i, j, unit)]
            for i in shown
            for j in amounts
        ]
        notes = [
            "approximation: the first that is within 5 %, pre-equilibrium before steady state before span."
        ]
        title = f"Regimes over {regimes.species}: {TITLES[name].lower()}"
        columns = [Column("T", "K", "$T$"), *_map_columns(regimes, unit)]
        left_out = {"order"} if one.resting is not None else {"order", "rests", "share"}
        shown_columns = [k for k, c in enumerate(columns) if c.quantity not in left_out]
        blocks.append(
            Table(
                title,
                [columns[k] for k in shown_columns],
                [[row[k] for k in shown_columns] for row in rows],
                notes,
            )
        )
    blocks += _windows(regimes)
    blocks += _contour(regimes)
    return blocks


def _map_columns(regimes: Regimes, unit: EnergyUnit) -> list[Column]:
    return [
        Column(regimes.species, unit_heading(regimes.unit), digits=3),
        Column("k", "s⁻¹", "$k$", digits=3),
        energy_column("Eₐ", unit, r"$E_\mathrm{a}$"),
        Column("order", decimals=3),
        Column("approximation"),
        Column("controls"),
        Column("control", decimals=3),
        Column("rests"),
        Column("share", decimals=4),
    ]


def _point(regimes: Regimes, one: RegimeMap, i: int, j: int, unit: EnergyUnit) -> list[Cell]:
    return [
        float(regimes.amount[j]),
        defined(one.rate_constant[i, j]),
        in_unit(one.arrhenius_energy_kj_mol[i, j], unit),
        defined(one.order[i, j]),
        one.holding_name(i, j) or "none",
        one.controlling_name(i, j),
        defined(one.control[i, j]),
        one.resting_name(i, j),
        None if one.population is None else defined(one.population[i, j]),
    ]


def _windows(regimes: Regimes) -> list[Block]:
    row = usual(regimes.temperature_k)
    rows: list[list[Cell]] = [
        [approximation, name, ", ".join(map(_window, found[row])) or "nowhere"]
        for name, one in regimes.maps.items()
        for approximation, found in one.windows.items()
    ]
    within = Column("within 5 %", f"{unit_heading(regimes.unit)} of {regimes.species}")
    title = f"Approximations over {regimes.species} at {kelvin(regimes.temperature_k[row])}"
    return [Table(title, [Column("Approximation"), Column("of"), within], rows)] if rows else []


def _window(window: AmountWindow) -> str:
    low, high = f"{window.from_amount:.4g}", f"{window.to_amount:.4g}"
    if window.open_below and window.open_above:
        return f"throughout {low}-{high}"
    if window.open_below:
        return f"up to {high}"
    return f"from {low}" if window.open_above else f"{low}-{high}"


def _contour(regimes: Regimes) -> list[Block]:
    """Return where E_a is 0, as a row an amount."""
    if not any(changes for one in regimes.maps.values() for changes in one.sign_changes):
        return []
    rows: list[list[Cell]] = [
        [
            float(regimes.amount[j]),
            *(
                ", ".join(f"{c.temperature_k:.2f} ({c.kind})" for c in one.sign_changes[j])
                or "nowhere"
                for one in regimes.maps.values()
            ),
        ]
        for j in some(len(regimes.amount), CONTOUR)
    ]
    columns = [
        Column(regimes.species, unit_heading(regimes.unit), digits=3),
        *(Column(f"T {name}", "K") for name in regimes.maps),
    ]
    low, high = np.min(regimes.temperature_k), np.max(regimes.temperature_k)
    notes = [f"Between {kelvin(low)} and {kelvin(high)}; maximum or minimum of the rate."]
    return [Table("Where Eₐ is 0", columns, rows, notes)]
