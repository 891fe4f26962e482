"""The tables of what stands beside a rate: limits of encounter, what stays constant, colliders."""

from __future__ import annotations

import numpy as np

from thermo_pp.kinetics.results import EffectiveRate, Rate
from thermo_pp.names import EnergyUnit
from thermo_pp.output.notes import kelvin, some
from thermo_pp.output.tables import Cell, Column, Table, defined, energy_column, in_unit

_SHOWN = 0.001
"""A control that the limits change by less has no row."""


def constant_table(
    rate: Rate, effective: EffectiveRate, title: str, unit: EnergyUnit
) -> Table | None:
    """Return the Arrhenius energy at constant concentration and at constant pressure.

    None in solution, and where the two are the same everywhere.
    """
    both = rate.arrhenius_energy_constant_kj_mol
    if not both:
        return None
    concentration, pressure = both["concentration"], both["pressure"]
    if np.allclose(concentration, pressure, rtol=0.0, atol=1e-6, equal_nan=True):
        return None
    columns = [
        Column("T", "K", "$T$"),
        energy_column("Eₐ at constant concentration", unit),
        energy_column("Eₐ at constant pressure", unit),
    ]
    rows: list[list[Cell]] = [
        [
            float(effective.temperature_k[k]),
            in_unit(concentration[k], unit),
            in_unit(pressure[k], unit),
        ]
        for k in some(len(effective.temperature_k), 5)
    ]
    notes = ["Of the amounts at each temperature; what stays on heating differs."]
    if effective.constant is not None:
        notes.append(f"Eₐ above is at constant {effective.constant}, as the study says.")
    return Table(title, columns, rows, notes)


def limits_table(rate: Rate, effective: EffectiveRate, title: str) -> Table | None:
    """Return the controls with and without the limits of encounter; None where nothing changes."""
    other = rate.control_without_limit
    if other is None or rate.log_limit is None or rate.limit_energy_kj_mol is None:
        return None
    shown = some(len(effective.temperature_k), 3)
    changed = [
        name
        for name, values in rate.control.items()
        if np.any(np.abs(values[shown] - other[name][shown]) >= _SHOWN)
    ]
    if not changed:
        return None
    columns = [Column("Species")]
    for k in shown:
        at = kelvin(effective.temperature_k[k])
        columns += [Column(at, decimals=3), Column(f"{at} without", decimals=3)]
    rows: list[list[Cell]] = []
    for name in changed:
        cells: list[Cell] = [f"{name} ‡" if name in rate.saddles else name]
        for k in shown:
            cells += [defined(rate.control[name][k]), defined(other[name][k])]
        rows.append(cells)
    notes = [
        f"At {kelvin(effective.temperature_k[k])} the limits change ln k by {rate.log_limit[k]:.4f}."
        for k in shown
    ]
    return Table(title, columns, rows, notes)
