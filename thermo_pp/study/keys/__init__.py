"""The keys of the study file: one model, from which schema, docs and every check follow."""

from __future__ import annotations

from typing import Annotated, Any

import msgspec
from msgspec import UNSET, Meta, UnsetType

from thermo_pp.study.keys.base import Keys, Quantity
from thermo_pp.study.keys.conditions import ConditionsKeys
from thermo_pp.study.keys.energies import (
    EnergyKeys,
    ExtrapolateKeys,
    FragmentKeys,
    LevelKeys,
    SolvationKeys,
)
from thermo_pp.study.keys.questions import (
    DoubtKeys,
    EffectiveKeys,
    FormationKeys,
    IsotopologueKeys,
    PathKeys,
    ReferenceKeys,
    RegimesKeys,
    SelectivityKeys,
)
from thermo_pp.study.keys.rate_laws import (
    ArrheniusKeys,
    CrossingKeys,
    FalloffKeys,
    LandauZenerKeys,
    ScanKeys,
)
from thermo_pp.study.keys.species import ConformerFileKeys, ConformerKeys, SpeciesKeys
from thermo_pp.study.keys.steps import ReactionKeys, StepKeys
from thermo_pp.study.keys.structure import SeamKeys, StructureKeys, TorsionKeys
from thermo_pp.study.keys.treatment import RealBelowKeys, TreatmentKeys

__all__ = [
    "ArrheniusKeys",
    "ConditionsKeys",
    "ConformerFileKeys",
    "ConformerKeys",
    "CrossingKeys",
    "DoubtKeys",
    "EnergyKeys",
    "ExtrapolateKeys",
    "FalloffKeys",
    "FormationKeys",
    "FragmentKeys",
    "IsotopologueKeys",
    "Keys",
    "LandauZenerKeys",
    "LevelKeys",
    "Quantity",
    "ReactionKeys",
    "RealBelowKeys",
    "ReferenceKeys",
    "ScanKeys",
    "SeamKeys",
    "SolvationKeys",
    "SpeciesKeys",
    "StepKeys",
    "StructureKeys",
    "StudyKeys",
    "TorsionKeys",
    "TreatmentKeys",
    "json_schema",
]


def _one_of(*names: str) -> dict[str, Any]:
    """Return the schema of "exactly one of these keys"."""
    return {"oneOf": [{"required": [name]} for name in names]}


_SpeciesTable = Annotated[
    SpeciesKeys,
    Meta(
        extra_json_schema={
            "oneOf": [
                {"required": ["frequencies"]},
                {"required": ["conformers"]},
                {"required": ["composition", "enthalpy", "entropy"]},
            ]
        }
    ),
]
_StepTable = Annotated[
    StepKeys,
    Meta(extra_json_schema=_one_of("through", "barrier", "rate", "arrhenius", "falloff")),
]
_EffectiveTable = Annotated[EffectiveKeys, Meta(extra_json_schema=_one_of("reactant", "catalyst"))]


class StudyKeys(Keys, frozen=True, kw_only=True):
    """The whole file."""

    title: Annotated[
        str | UnsetType, Meta(description="stands over every table; the file's name unless given")
    ] = UNSET
    outputs: Annotated[
        str,
        Meta(description="folder of the outputs, from the study's own; files are named from it"),
    ] = "."
    treatment: TreatmentKeys = TreatmentKeys()
    conditions: ConditionsKeys = ConditionsKeys()
    species: Annotated[
        dict[str, _SpeciesTable], Meta(description="a table `[species.NAME]` for every species")
    ]
    levels: Annotated[
        dict[str, LevelKeys],
        Meta(description="a table `[levels.NAME]` for every named level of theory: alternatives"),
    ] = {}
    level: Annotated[
        str | UnsetType,
        Meta(
            description="the named level that is used; species have no `energy` of their own then"
        ),
    ] = UNSET
    steps: Annotated[
        list[_StepTable],
        Meta(
            min_length=1,
            description="a table `[[steps]]` for every step; required unless there is a `[formation]`",
        ),
    ] = []
    effective: _EffectiveTable | UnsetType = UNSET
    doubt: DoubtKeys | UnsetType = UNSET
    isotopologues: Annotated[
        dict[str, IsotopologueKeys],
        Meta(
            description="a table `[isotopologues.NAME]` for every set of isotopes to compare with"
        ),
    ] = {}
    paths: Annotated[
        list[PathKeys], Meta(description="a table `[[paths]]` for every declared path")
    ] = []
    formation: Annotated[
        FormationKeys | UnsetType, Meta(description="enthalpies of formation, for `functions`")
    ] = UNSET
    regimes: Annotated[
        RegimesKeys | UnsetType,
        Meta(description="a map over temperature and one held amount, for `barrier`"),
    ] = UNSET
    selectivity: Annotated[
        SelectivityKeys | UnsetType, Meta(description="which products to compare, for `barrier`")
    ] = UNSET


def json_schema() -> dict[str, Any]:
    """Return the JSON Schema of the study file, for editors."""
    schema = msgspec.json.schema(StudyKeys)
    schema["$defs"]["StudyKeys"]["anyOf"] = [{"required": ["steps"]}, {"required": ["formation"]}]
    return {
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        "title": "thermo_pp study file",
        **schema,
    }
