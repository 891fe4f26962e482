"""The tables of a study's species: what each is, and H, S, G and Cp, saddle points included."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from thermo_pp.conditions import Treatment
from thermo_pp.ensemble import Ensemble
from thermo_pp.names import EnergyUnit
from thermo_pp.output.notes import kelvin, of_treatment, stamp, usual
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
from thermo_pp.records import hill_text
from thermo_pp.species import SpeciesModel, Structure
from thermo_pp.study.answers import SpeciesAnswer
from thermo_pp.units import HARTREE_KJ_MOL

_WHAT = "\N{GREEK SMALL LETTER SIGMA}"


def tables(
    models: Mapping[str, SpeciesModel],
    answers: Mapping[str, SpeciesAnswer],
    treatment: Treatment,
    unit: EnergyUnit,
    levels: Sequence[str] = (),
) -> list[Block]:
    """Return a table of what each species is, and one of its numbers nearest to 298.15 K."""
    what = Table(
        "Species",
        [
            Column("Species"),
            *map(Column, ("kind", "from", "formula")),
            Column("q", latex="$q$"),
            Column("2S+1", latex="$2S+1$"),
            Column(_WHAT),
            Column("hands"),
            Column("E", "Eₕ", "$E$", decimals=6),
            energy_column("ZPE", unit),
        ],
        [[name, *_what(models[name], one, unit)] for name, one in answers.items()],
    )
    blocks: list[Block] = [what]
    first = next(iter(answers.values()), None)
    if first is not None:
        k = usual(first.result.temperature_k)
        columns = [
            Column("Species"),
            energy_column("H", unit, "$H$"),
            Column("S", ENTROPY_UNIT, "$S$", decimals=2),
            energy_column("G", unit, "$G$", whole=True),
            Column("Cp", ENTROPY_UNIT, "$C_p$", decimals=2),
            energy_column("soft", unit),
        ]
        rows = [[name, *_numbers(one, k, unit)] for name, one in answers.items()]
        notes = [
            "H and G are absolute, electronic energy included; of declared species on the zero that "
            "the study chose. soft: largest less smallest G over the four soft-mode treatments.",
        ]
        title = f"H, S and G of each species, {kelvin(float(first.result.temperature_k[k]))}"
        blocks.append(Table(title, columns, rows, notes))
    return about_all(blocks, [of_treatment(treatment), *levels, stamp()])


def wide(
    models: Mapping[str, SpeciesModel],
    answers: Mapping[str, SpeciesAnswer],
    treatment: Treatment,
    unit: EnergyUnit,
    levels: Sequence[str] = (),
) -> list[Block]:
    """Return the one table for CSV and xlsx: a row a species and temperature, full digits."""
    columns = [
        *map(Column, ("species", "kind", "from", "formula", "charge", "multiplicity")),
        *map(Column, ("symmetry number", "degeneracy")),
        Column("E", "hartree", decimals=6),
        energy_column("zero-point energy", unit),
        Column("T", "K"),
        energy_column("H", unit),
        Column("S", ENTROPY_UNIT, decimals=2),
        energy_column("G", unit),
        Column("Cp", ENTROPY_UNIT, decimals=2),
        energy_column("spread of G over soft-mode treatments", unit),
    ]
    rows: list[list[Cell]] = [
        [
            *(name, *_what(models[name], one, unit)),
            *(float(temperature), *_numbers(one, k, unit)),
        ]
        for name, one in answers.items()
        for k, temperature in enumerate(one.result.temperature_k)
    ]
    constants = [
        ("standard state", treatment.standard_state.text),
        ("soft modes", treatment.low_modes),
    ]
    notes = [of_treatment(treatment), *levels, stamp()]
    return [Table("species", columns, rows, constants=constants, about=notes)]


def _what(model: SpeciesModel, one: SpeciesAnswer, unit: EnergyUnit) -> list[Cell]:
    """Return kind, origin, formula, charge, multiplicity, symmetry, hands, E and zero-point energy."""
    result, known = one.result, isinstance(model, Structure)
    energy = result.electronic_kj_mol
    return [
        model.kind,
        _origin(model),
        hill_text(model.composition),
        model.charge,
        model.multiplicity if isinstance(model, Structure) else None,
        result.symmetry_number,
        result.degeneracy if known else None,
        None if energy is None else energy / HARTREE_KJ_MOL,
        in_unit(result.zero_point_kj_mol, unit),
    ]


def _origin(model: SpeciesModel) -> str:
    if isinstance(model, Ensemble):
        return f"{len(model.members)} conformers"
    return "outputs" if isinstance(model, Structure) else "declared"


def _numbers(one: SpeciesAnswer, k: int, unit: EnergyUnit) -> list[Cell]:
    """Return H, S, G, Cp and the spread at temperature `k`."""
    result = one.result
    return [
        in_unit(result.enthalpy_kj_mol[k], unit),
        float(result.entropy_j_mol_k[k]),
        in_unit(result.gibbs_kj_mol[k], unit),
        float(result.heat_capacity_j_mol_k[k]),
        in_unit(one.low_mode_spread_kj_mol[k], unit),
    ]
