"""The tables and the JSON answer of ``conformers``."""

from __future__ import annotations

from typing import Any

from thermo_pp.ensemble import ComputedEnsemble, Ensembles, Member
from thermo_pp.names import EnergyUnit
from thermo_pp.output.json_text import answer
from thermo_pp.output.notes import ALL_DIGITS, kelvin, of_treatment, stamp, usual
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

MOST_SHOWN = 40
"""Members of one ensemble that a page for people shows, those that count most."""
CONVERGED_KJ_MOL = 0.1
"""The table says how many members bring G to within this of its last value."""


def tables(found: Ensembles, unit: EnergyUnit) -> list[Block]:
    """Return a table of the members of each ensemble, and one of all ensembles over temperature."""
    blocks = [*(_members(found, one, unit) for one in found.computed), _ensembles(found, unit)]
    return about_all(blocks, [of_treatment(found.treatment), stamp()])


def _members(found: Ensembles, one: ComputedEnsemble, unit: EnergyUnit) -> Table:
    """Return the members of one ensemble at the temperature nearest to 298.15 K."""
    at = usual(found.temperature_k)
    shares, members = one.distribution, one.model.members
    order = sorted(range(len(members)), key=lambda k: -shares.population[k, at])
    lowest = min(shares.gibbs_kj_mol[k, at] for k in order if members[k].degeneracy)
    columns = [
        Column("Conformer"),
        Column("g", latex="$g$"),
        energy_column("G above lowest", unit),
        Column("population", "%", decimals=2),
        energy_column("with those above", unit),
        Column("remark"),
    ]
    rows: list[list[Cell]] = []
    for place, k in enumerate(order[:MOST_SHOWN]):
        counts = members[k].degeneracy > 0
        by_number = shares.gibbs_by_number_kj_mol[place, at] - lowest if counts else None
        rows.append(
            [
                members[k].file,
                members[k].degeneracy,
                in_unit(shares.gibbs_kj_mol[k, at] - lowest, unit),
                100.0 * float(shares.population[k, at]),
                in_unit(by_number, unit),
                _remark(members[k], one),
            ]
        )
    notes = [
        "g: how often a conformer is there; G is that of one. with those above: G of the ensemble of "
        "this row and the rows above it, less G of the lowest conformer.",
    ]
    if len(order) > MOST_SHOWN:
        notes.append(f"{len(order) - MOST_SHOWN} more, which count less. {ALL_DIGITS}")
    title = f"{one.model.name} at {kelvin(float(found.temperature_k[at]))}"
    return Table(title, columns, rows, notes)


def _remark(member: Member, one: ComputedEnsemble) -> str:
    """Say what is special about a member."""
    words = []
    if member.same_as is not None:
        words.append(f"same as {one.model.members[member.same_as].file}")
    elif member.mirror_of is not None:
        words.append(f"mirror image of {one.model.members[member.mirror_of].file}")
    if member.thermal_from is not None:
        words.append(f"wavenumbers of {member.thermal_from}")
    return "; ".join(words)


def _ensembles(found: Ensembles, unit: EnergyUnit) -> Table:
    columns = [
        Column("Ensemble"),
        Column("T", "K", "$T$"),
        energy_column("H", unit, "$H$"),
        Column("S", ENTROPY_UNIT, "$S$", decimals=3),
        energy_column("G", unit, "$G$", whole=True),
        Column("Cp", ENTROPY_UNIT, "$C_p$", decimals=3),
        energy_column("gain", unit),
        Column("needed"),
        energy_column("missed", unit),
    ]
    rows: list[list[Cell]] = [
        [
            one.model.name,
            float(temperature),
            in_unit(one.result.enthalpy_kj_mol[k], unit),
            float(one.result.entropy_j_mol_k[k]),
            in_unit(one.result.gibbs_kj_mol[k], unit),
            float(one.result.heat_capacity_j_mol_k[k]),
            in_unit(
                one.result.gibbs_kj_mol[k] - one.distribution.lowest_only_gibbs_kj_mol[k], unit
            ),
            int(one.distribution.needed(CONVERGED_KJ_MOL)[k]),
            in_unit(one.distribution.missed_change_kj_mol[k], unit),
        ]
        for one in found.computed
        for k, temperature in enumerate(found.temperature_k)
    ]
    missed = found.computed[0].distribution.missed_kj_mol if found.computed else 0.0
    notes = [
        "H and G are absolute, electronic energy included. gain: G less that of the conformer that "
        "counts most, alone with its g. needed: conformers that bring G to within "
        f"{CONVERGED_KJ_MOL:g} kJ/mol of its value here. missed: what one more conformer, "
        f"{missed:g} kJ/mol above the lowest G, would change G by.",
        f"A conformer that is listed twice is counted {_COUNTED[found.duplicates]}.",
    ]
    return Table("Ensembles", columns, rows, notes)


_COUNTED = {"count": "twice", "once": "once"}


def wide(found: Ensembles, unit: EnergyUnit) -> list[Block]:
    """Return the one table for CSV: a row a member and temperature, full digits."""
    columns = [
        *map(Column, ("ensemble", "kind", "file", "degeneracy", "same as", "mirror image of")),
        Column("wavenumbers of"),
        Column("T", "K"),
        energy_column("G of one conformer", unit),
        Column("population"),
        energy_column("H of the ensemble", unit),
        Column("S of the ensemble", ENTROPY_UNIT),
        energy_column("G of the ensemble", unit),
        Column("Cp of the ensemble", ENTROPY_UNIT),
        energy_column("G of the lowest alone", unit),
    ]
    rows: list[list[Cell]] = [
        [
            one.model.name,
            one.model.kind,
            member.file,
            member.degeneracy,
            _named(one, member.same_as),
            _named(one, member.mirror_of),
            member.thermal_from,
            float(temperature),
            in_unit(one.distribution.gibbs_kj_mol[k, at], unit),
            float(one.distribution.population[k, at]),
            in_unit(one.result.enthalpy_kj_mol[at], unit),
            float(one.result.entropy_j_mol_k[at]),
            in_unit(one.result.gibbs_kj_mol[at], unit),
            float(one.result.heat_capacity_j_mol_k[at]),
            in_unit(one.distribution.lowest_only_gibbs_kj_mol[at], unit),
        ]
        for one in found.computed
        for k, member in enumerate(one.model.members)
        for at, temperature in enumerate(found.temperature_k)
    ]
    constants = [
        ("standard state", found.treatment.standard_state.text),
        ("soft modes", found.treatment.low_modes),
        ("onset / cm⁻¹", f"{found.treatment.onset_cm:.10g}"),
        ("duplicates", found.duplicates),
    ]
    notes = [of_treatment(found.treatment), stamp()]
    return [Table("conformers", columns, rows, constants=constants, about=notes)]


def _named(one: ComputedEnsemble, number: int | None) -> str | None:
    return None if number is None else one.model.members[number].file


def keys(found: Ensembles) -> dict[str, Any]:
    """Return the JSON answer."""
    return answer(
        "conformers",
        found.findings,
        found.treatment,
        duplicates_counted=found.duplicates,
        temperature_k=found.temperature_k,
        ensembles=[_keys(one) for one in found.computed],
    )


def _keys(one: ComputedEnsemble) -> dict[str, Any]:
    shares, members = one.distribution, one.model.members
    return {
        "name": one.model.name,
        "kind": one.model.kind,
        "members": [
            {
                "file": member.file,
                "files": list(member.model.files),
                "degeneracy": member.degeneracy,
                "gibbs_kj_mol": shares.gibbs_kj_mol[k],
                "population": shares.population[k],
                "thermal_from": member.thermal_from,
            }
            for k, member in enumerate(members)
        ],
        "enthalpy_kj_mol": one.result.enthalpy_kj_mol,
        "entropy_j_mol_k": one.result.entropy_j_mol_k,
        "gibbs_kj_mol": one.result.gibbs_kj_mol,
        "heat_capacity_j_mol_k": one.result.heat_capacity_j_mol_k,
        "slope_enthalpy_kj_mol": one.result.slope_enthalpy_kj_mol,
        "low_mode_spread_kj_mol": one.low_mode_spread_kj_mol,
        "lowest_only_gibbs_kj_mol": shares.lowest_only_gibbs_kj_mol,
        "gibbs_by_number_kj_mol": shares.gibbs_by_number_kj_mol,
        "missed_kj_mol": shares.missed_kj_mol,
        "missed_change_kj_mol": shares.missed_change_kj_mol,
        "duplicates": [
            {"file": member.file, "same_as": members[member.same_as].file}
            for member in members
            if member.same_as is not None
        ],
        "mirror_images": [
            {"file": member.file, "mirror_of": members[member.mirror_of].file}
            for k, member in enumerate(members)
            if member.mirror_of is not None and member.mirror_of < k
        ],
    }
