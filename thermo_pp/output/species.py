"""The tables and the JSON answer of ``species``."""

from __future__ import annotations

from typing import Any

from thermo_pp.audit.structures import ComputedStructure, Structures
from thermo_pp.names import EnergyUnit
from thermo_pp.output.json_text import answer
from thermo_pp.output.notes import of_treatment, stamp
from thermo_pp.output.tables import (
    ENTROPY_UNIT,
    Block,
    Cell,
    Column,
    Table,
    about_all,
    energy_column,
    in_unit,
)


def tables(found: Structures, unit: EnergyUnit) -> list[Block]:
    """Return one table of what each structure is, and one of H, S and G at every temperature."""
    levels: dict[str, int] = {}
    for structure in found.computed:
        levels.setdefault(structure.level, len(levels) + 1)
    what = Table(
        "Structures",
        [
            Column("Structure"),
            Column("Level"),
            Column("Formula"),
            Column("q", latex="$q$"),
            Column("2S+1", latex="$2S+1$"),
            Column("kind"),
            Column("rotor"),
            Column("\N{GREEK SMALL LETTER SIGMA}"),
            Column("hands"),
            Column("E", "Eₕ", "$E$", decimals=6),
            energy_column("ZPE", unit),
        ],
        [
            [
                structure.name,
                levels[structure.level],
                structure.model.calculation.formula,
                structure.model.charge,
                structure.model.multiplicity,
                structure.model.kind,
                structure.result.rotor,
                structure.result.symmetry_number,
                structure.result.degeneracy,
                structure.model.energy_hartree,
                in_unit(structure.result.zero_point_kj_mol, unit),
            ]
            for structure in found.computed
        ],
        [f"Level {number}: {words}." for words, number in levels.items()],
    )
    columns = [
        Column("Structure"),
        Column("T", "K", "$T$"),
        energy_column("H", unit, "$H$"),
        Column("S", ENTROPY_UNIT, "$S$", decimals=3),
        energy_column("G", unit, "$G$", whole=True),
        Column("Cp", ENTROPY_UNIT, "$C_p$", decimals=3),
        energy_column("soft", unit),
    ]
    rows: list[list[Cell]] = [
        [structure.name, float(temperature), *_numbers(structure, k, unit)]
        for structure in found.computed
        for k, temperature in enumerate(found.temperature_k)
    ]
    notes = [
        "H and G are absolute, electronic energy included. soft: largest less smallest G over the "
        "four soft-mode treatments.",
    ]
    about = [of_treatment(found.treatment), stamp()]
    return about_all([what, Table("H, S and G", columns, rows, notes)], about)


def wide(found: Structures, unit: EnergyUnit) -> list[Block]:
    """Return the one table for CSV: a row a structure and temperature, full digits."""
    columns = [
        *map(Column, ("name", "file", "level", "formula", "charge", "multiplicity", "kind")),
        *map(Column, ("rotor", "symmetry number", "degeneracy")),
        Column("E", "hartree"),
        energy_column("zero-point energy", unit),
        Column("T", "K"),
        energy_column("H", unit),
        Column("S", ENTROPY_UNIT),
        energy_column("G", unit),
        Column("Cp", ENTROPY_UNIT),
        energy_column("spread of G over soft-mode treatments", unit),
    ]
    rows: list[list[Cell]] = [
        [
            structure.name,
            structure.model.files[0],
            structure.level,
            structure.model.calculation.formula,
            structure.model.charge,
            structure.model.multiplicity,
            structure.model.kind,
            structure.result.rotor,
            structure.result.symmetry_number,
            structure.result.degeneracy,
            structure.model.energy_hartree,
            in_unit(structure.result.zero_point_kj_mol, unit),
            float(temperature),
            *_numbers(structure, k, unit),
        ]
        for structure in found.computed
        for k, temperature in enumerate(found.temperature_k)
    ]
    constants = [
        ("standard state", found.treatment.standard_state.text),
        ("soft modes", found.treatment.low_modes),
        ("onset / cm⁻¹", f"{found.treatment.onset_cm:.10g}"),
    ]
    notes = [of_treatment(found.treatment), stamp()]
    return [Table("species", columns, rows, constants=constants, about=notes)]


def keys(found: Structures) -> dict[str, Any]:
    """Return the JSON answer."""
    return answer(
        "species",
        found.findings,
        found.treatment,
        species=[
            {
                "name": structure.name,
                "files": list(structure.model.files),
                "formula": structure.model.calculation.formula,
                "charge": structure.model.charge,
                "multiplicity": structure.model.multiplicity,
                "kind": structure.model.kind,
                "rotor": structure.result.rotor,
                "symmetry_number": structure.result.symmetry_number,
                "degeneracy": structure.result.degeneracy,
                "electronic_energy_hartree": structure.model.energy_hartree,
                "zero_point_kj_mol": structure.result.zero_point_kj_mol,
                "temperature_k": structure.result.temperature_k,
                "enthalpy_kj_mol": structure.result.enthalpy_kj_mol,
                "entropy_j_mol_k": structure.result.entropy_j_mol_k,
                "gibbs_kj_mol": structure.result.gibbs_kj_mol,
                "heat_capacity_j_mol_k": structure.result.heat_capacity_j_mol_k,
                "low_mode_spread_kj_mol": structure.low_mode_spread_kj_mol,
            }
            for structure in found.computed
        ],
    )


def _numbers(structure: ComputedStructure, k: int, unit: EnergyUnit) -> list[Cell]:
    """Return H, S, G, Cp and the spread at temperature `k`."""
    result = structure.result
    return [
        in_unit(result.enthalpy_kj_mol[k], unit),
        float(result.entropy_j_mol_k[k]),
        in_unit(result.gibbs_kj_mol[k], unit),
        float(result.heat_capacity_j_mol_k[k]),
        in_unit(structure.low_mode_spread_kj_mol[k], unit),
    ]
