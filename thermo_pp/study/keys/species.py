"""The keys of ``[species.NAME]``, its conformers among them."""

from __future__ import annotations

from typing import Annotated

from msgspec import UNSET, Meta, UnsetType

from thermo_pp.names import Thermal
from thermo_pp.study.keys.base import Keys, Quantity, Whole
from thermo_pp.study.keys.structure import StructureKeys


class ConformerKeys(StructureKeys, frozen=True, kw_only=True):
    """One conformer of a species."""

    degeneracy: Annotated[
        Whole | UnsetType,
        Meta(
            description="how often this conformer is there; 2 for a chiral one whose mirror image is "
            "not listed, else 1, unless given"
        ),
    ] = UNSET


class ConformerFileKeys(Keys, frozen=True, kw_only=True):
    """Conformers that stand in one file."""

    ensemble: Annotated[
        str,
        Meta(
            description="file of several structures with their energies: extended XYZ, a trajectory "
            "or a data base of ASE; every structure is a conformer"
        ),
    ]


_ConformerTable = Annotated[
    ConformerKeys,
    Meta(
        extra_json_schema={
            "anyOf": [
                {"required": ["frequencies"]},
                {"required": ["energy"]},
                {"required": ["composition", "enthalpy", "entropy"]},
            ]
        }
    ),
]
Conformers = Annotated[list[_ConformerTable], Meta(min_length=1)] | ConformerFileKeys


class SpeciesKeys(StructureKeys, frozen=True, kw_only=True):
    """One species, saddle points included: read from outputs, or declared."""

    conformers: Annotated[
        Conformers | UnsetType,
        Meta(
            description="a table for every conformer, "
            '`[{ frequencies = "a.out" }, { frequencies = "b.out" }]`, or `{ ensemble = "many.xyz" }`; '
            "what the species says of charge, multiplicity, levels, symmetry number, isotopes and "
            "imaginary modes holds for each that does not say it itself"
        ),
    ] = UNSET
    thermal: Annotated[
        Thermal,
        Meta(
            description='"own": every conformer has frequencies; "nearest": one without takes the '
            "wavenumbers of the conformer nearest in shape"
        ),
    ] = "own"
    spin_states: Annotated[
        bool, Meta(description="true: the conformers may be different spin states in equilibrium")
    ] = False
    standard_state: Annotated[
        str | UnsetType, Meta(description="as in `[treatment]`, for this species alone")
    ] = UNSET
    entropy_correction: Annotated[
        Quantity | UnsetType, Meta(description="as in `[treatment]`, for this species alone")
    ] = UNSET
    deviation: Annotated[
        Quantity | UnsetType,
        Meta(description="standard deviation of the energy in place of that of `[doubt]` / kJ/mol"),
    ] = UNSET
    relative_to: Annotated[
        dict[str, int] | UnsetType,
        Meta(
            description="`{ A = 1, W = 1 }`: enthalpy, entropy and heat capacity of a declared "
            "species are differences from this sum; required beside species that are read"
        ),
    ] = UNSET
