"""The electronic energies of a study: a column a part, and every part with where it is from."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from thermo_pp.output.tables import Cell, Column, Table
from thermo_pp.species import ElectronicEnergy


def tables(energies: Mapping[str, ElectronicEnergy]) -> list[Table]:
    """Return the table of parts, what each adds; none where every energy is of one part.

    Parameters
    ----------
    energies : mapping of str to ElectronicEnergy
        By species.
    """
    if all(len(energy.parts) < 2 for energy in energies.values()):
        return []
    headings: dict[str, str] = {}
    for energy in energies.values():
        for part in energy.parts:
            headings.setdefault(part.slot, part.heading)
    columns = [
        Column("Species"),
        *(Column(heading, "Eₕ", decimals=6) for heading in headings.values()),
        Column("E", "Eₕ", "$E$", decimals=6),
    ]
    rows: list[list[Cell]] = []
    for name, energy in energies.items():
        shares = {part.slot: part.share_hartree for part in energy.parts}
        rows.append([name, *(shares.get(slot) for slot in headings), energy.value_hartree])
    note = "Each column is what the part adds, sign and factor in it."
    slopes = [
        f"{name} {energy.solvation_slope_j_mol_k:.6g} at {energy.solvation_at_k:g} K"
        for name, energy in energies.items()
        if energy.solvation_slope_j_mol_k is not None
    ]
    if slopes:
        note += f" Slope of the solvation term / J mol⁻¹ K⁻¹: {', '.join(slopes)}."
    return [Table("Electronic energies", columns, rows, [note])]


def keys(energies: Mapping[str, ElectronicEnergy]) -> list[dict[str, Any]]:
    """Return the energies for a JSON answer, every part with its origin."""
    return [
        {
            "species": name,
            "energy_hartree": energy.value_hartree,
            "solvation_slope_j_mol_k": energy.solvation_slope_j_mol_k,
            "solvation_at_k": energy.solvation_at_k,
            "parts": [
                {
                    "part": part.name,
                    "slot": part.slot,
                    "value_hartree": part.value_hartree,
                    "factor": part.factor,
                    "origin": part.origin,
                    "where": [
                        {"file": file, "line": line}
                        for file, line in zip(part.files, part.lines, strict=True)
                    ],
                }
                for part in energy.parts
            ],
        }
        for name, energy in energies.items()
    ]
