"""The tables and the JSON answer of ``functions``."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import asdict
from typing import Any

from thermo_pp.conditions import Treatment
from thermo_pp.functions.curves import Functions
from thermo_pp.functions.fits import Fit
from thermo_pp.functions.formation import Formations
from thermo_pp.names import EnergyUnit
from thermo_pp.output.json_text import answer
from thermo_pp.output.notes import of_treatment, stamp
from thermo_pp.output.tables import (
    ENERGY_DECIMALS,
    ENTROPY_UNIT,
    UNITS,
    Block,
    Cell,
    Column,
    Table,
    about_all,
    energy_column,
    in_unit,
)

_COEFFICIENTS = {
    "nasa7": ("a1", "a2", "a3", "a4", "a5", "a6", "a7"),
    "nasa9": ("a1", "a2", "a3", "a4", "a5", "a6", "a7", "b1", "b2"),
    "shomate": ("A", "B", "C", "D", "E", "F", "G"),
}


def tables(
    curves: Sequence[Functions],
    fits: Sequence[Fit],
    formation: Formations | None,
    treatment: Treatment,
    unit: EnergyUnit,
) -> list[Block]:
    """Return a table of functions a species, then fits and enthalpies of formation, if asked."""
    blocks: list[Block] = [
        Table(curve.name, _columns(unit), [_row(curve, k, unit) for k in range(_size(curve))])
        for curve in curves
    ]
    if fits:
        blocks += [_coefficients(fits), _residuals(fits, unit)]
    if formation is not None:
        blocks.append(_formation(formation, unit))
    notes = ["G is absolute, the electronic energy included.", of_treatment(treatment), stamp()]
    return about_all(blocks, notes)


def wide(
    curves: Sequence[Functions],
    fits: Sequence[Fit],
    formation: Formations | None,
    treatment: Treatment,
    unit: EnergyUnit,
) -> list[Block]:
    """Return the tables for CSV: a row a species and temperature, full digits."""
    rows: list[list[Cell]] = [
        [curve.name, *_row(curve, k, unit)] for curve in curves for k in range(_size(curve))
    ]
    constants = [
        ("standard state", treatment.standard_state.text),
        ("soft modes", treatment.low_modes),
    ]
    blocks: list[Block] = [
        Table("functions", [Column("species"), *_columns(unit)], rows, constants=constants)
    ]
    if fits:
        blocks += [_coefficients(fits), _residuals(fits, unit)]
    if formation is not None:
        blocks.append(_formation(formation, unit))
    return about_all(blocks, [of_treatment(treatment), stamp()])


def keys(
    curves: Sequence[Functions],
    fits: Sequence[Fit],
    formation: Formations | None,
    treatment: Treatment,
    findings: Sequence[Any],
) -> dict[str, Any]:
    """Return the JSON answer."""
    by_name = {fit.name: fit for fit in fits}
    return answer(
        "functions",
        findings,
        treatment,
        species=[curve_keys(curve, by_name.get(curve.name)) for curve in curves],
        formation=None if formation is None else formation_keys(formation),
    )


def curve_keys(curve: Functions, fit: Fit | None) -> dict[str, Any]:
    """Return the functions of one species, and its fit if there is one."""
    return {
        "name": curve.name,
        "kind": curve.kind,
        "temperature_k": curve.temperature_k,
        "heat_capacity_j_mol_k": curve.heat_capacity_j_mol_k,
        "entropy_j_mol_k": curve.entropy_j_mol_k,
        "gibbs_function_j_mol_k": curve.gibbs_function_j_mol_k,
        "enthalpy_from_298_kj_mol": curve.from_room_kj_mol,
        "enthalpy_from_0_kj_mol": curve.from_zero_kj_mol,
        "gibbs_kj_mol": curve.gibbs_kj_mol,
        "enthalpy_298_kj_mol": curve.room_enthalpy_kj_mol,
        "enthalpy_0_kj_mol": curve.zero_enthalpy_kj_mol,
        "fit": None if fit is None else fit_keys(fit),
    }


def formation_keys(formation: Formations) -> dict[str, Any]:
    """Return enthalpies of formation and what they rest on."""
    return {
        "references": {name: asdict(known) for name, known in formation.references.items()},
        "derived": [asdict(row) for row in formation.rows],
    }


def fit_keys(fit: Fit) -> dict[str, Any]:
    """Return the coefficients of a fit and its largest residuals."""
    polynomial = fit.polynomial
    return {
        "form": polynomial.form,
        "bounds_k": polynomial.bounds_k,
        "coefficients": polynomial.coefficients,
        "of_slope": fit.of_slope,
        "largest_residuals": {
            "heat_capacity_j_mol_k": asdict(fit.heat_capacity_j_mol_k),
            "enthalpy_kj_mol": asdict(fit.enthalpy_kj_mol),
            "entropy_j_mol_k": asdict(fit.entropy_j_mol_k),
            "gibbs_kj_mol": asdict(fit.gibbs_kj_mol),
        },
    }


def _size(curve: Functions) -> int:
    return len(curve.temperature_k)


def _columns(unit: EnergyUnit) -> list[Column]:
    return [
        Column("T", "K", "$T$"),
        Column("Cp", ENTROPY_UNIT, "$C_p$", decimals=3),
        Column("S", ENTROPY_UNIT, "$S$", decimals=3),
        Column("-(G-H298)/T", ENTROPY_UNIT, "$-(G-H_{298})/T$", decimals=3),
        energy_column("H-H298", unit, "$H-H_{298}$"),
        energy_column("H-H0", unit, "$H-H_0$"),
        energy_column("G", unit, "$G$", whole=True),
    ]


def _row(curve: Functions, k: int, unit: EnergyUnit) -> list[Cell]:
    zero = curve.from_zero_kj_mol
    return [
        float(curve.temperature_k[k]),
        float(curve.heat_capacity_j_mol_k[k]),
        float(curve.entropy_j_mol_k[k]),
        float(curve.gibbs_function_j_mol_k[k]),
        in_unit(curve.from_room_kj_mol[k], unit),
        None if zero is None else in_unit(zero[k], unit),
        in_unit(curve.gibbs_kj_mol[k], unit),
    ]


def _coefficients(fits: Sequence[Fit]) -> Table:
    form = fits[0].polynomial.form
    columns = [Column("Species"), Column("from", "K"), Column("to", "K")]
    columns += [Column(name, digits=10) for name in _COEFFICIENTS[form]]
    rows: list[list[Cell]] = [
        [
            fit.name,
            fit.polynomial.bounds_k[k],
            fit.polynomial.bounds_k[k + 1],
            *fit.polynomial.coefficients[k].tolist(),
        ]
        for fit in fits
        for k in (0, 1)
    ]
    return Table(f"Coefficients of the {form} fits, 1 bar, H absolute", columns, rows)


def _residuals(fits: Sequence[Fit], unit: EnergyUnit) -> Table:
    columns = [
        Column("Species"),
        Column("Cp", ENTROPY_UNIT, "$C_p$", decimals=4),
        Column("at T", "K", decimals=1),
        Column("H", UNITS[unit], "$H$", decimals=4),
        Column("at T", "K", decimals=1),
        Column("S", ENTROPY_UNIT, "$S$", decimals=4),
        Column("at T", "K", decimals=1),
        Column("G", UNITS[unit], "$G$", decimals=4),
        Column("at T", "K", decimals=1),
    ]
    rows: list[list[Cell]] = []
    for fit in fits:
        cp, h, s, g = (
            fit.heat_capacity_j_mol_k,
            fit.enthalpy_kj_mol,
            fit.entropy_j_mol_k,
            fit.gibbs_kj_mol,
        )
        rows.append(
            [
                fit.name,
                *(cp.value, cp.temperature_k),
                *(in_unit(h.value, unit), h.temperature_k),
                *(s.value, s.temperature_k),
                *(in_unit(g.value, unit), g.temperature_k),
            ]
        )
    return Table("Largest residuals of the fits", columns, rows)


def _formation(formation: Formations, unit: EnergyUnit) -> Table:
    columns = [
        Column("Species"),
        Column("from"),
        energy_column("reaction H", unit),
        Column("at T", "K"),
        energy_column("formation H(0)", unit),
        energy_column("formation H(298.15 K)", unit),
        Column("u", UNITS[unit], "$u$", decimals=ENERGY_DECIMALS[unit] + 1),
    ]
    rows: list[list[Cell]] = [
        [
            row.name,
            row.reaction,
            in_unit(row.reaction_kj_mol, unit),
            row.reaction_temperature_k,
            in_unit(row.zero_kj_mol, unit),
            in_unit(row.room_kj_mol, unit),
            in_unit(row.uncertainty_kj_mol, unit),
        ]
        for row in formation.rows
    ]
    words = "; ".join(
        f"{name} {known.enthalpy_kj_mol:.10g} kJ/mol at {known.temperature_k:g} K ({known.source})"
        for name, known in formation.references.items()
    )
    notes = ["u: combined standard uncertainty.", f"References: {words}."]
    return Table("Enthalpies of formation", columns, rows, notes)
