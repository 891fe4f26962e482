"""Which keys of a species, or of a conformer, stand together: looked at before an output is opened."""

from __future__ import annotations

from collections.abc import Mapping

from msgspec import UNSET

from thermo_pp.errors import StudyError
from thermo_pp.species import parse_composition
from thermo_pp.study.check import place
from thermo_pp.study.ensembles import is_read
from thermo_pp.study.keys import ConformerKeys, SpeciesKeys, StructureKeys
from thermo_pp.study.values import given

_READ_ONLY = (
    "energy",
    "multiplicity",
    "levels",
    "symmetry_number",
    "isotopes",
    "rotational_constants",
    "nuclear_spins",
    "torsions",
    "seam",
    "imaginary",
    "entropy_correction",
)
_DECLARED_ONLY = (
    "enthalpy",
    "entropy",
    "heat_capacity",
    "temperature",
    "ground",
    "imaginary_mode",
    "relative_to",
)


def check_member(
    name: str, member: SpeciesKeys, species: Mapping[str, SpeciesKeys], file: str
) -> None:
    """Check which keys stand together; no output is opened yet."""
    where = place(file, "species", name)
    kinds = ("frequencies", "conformers", "composition")
    have = [key for key in kinds if given(getattr(member, key)) is not None]
    if len(have) != 1:
        has = (
            f"both {' and '.join(have)}"
            if have
            else "neither frequencies, conformers nor composition"
        )
        raise StudyError(
            f"{name} has {has}",
            where=where,
            mend='name its output (frequencies = "..."), several (conformers = [{ frequencies = "..." '
            '}, ...]) or declare it (composition = "...", enthalpy = "...", entropy = "...")',
        )
    if have == ["conformers"]:
        _check_conformers(name, member, species, file)
        return
    for key in ("thermal", "spin_states"):
        if getattr(member, key) != getattr(SpeciesKeys(), key):
            raise StudyError(
                f"{key} is for a species with several conformers",
                where=place(file, "species", name, key),
                mend="take the key out, or list conformers",
            )
    _check_structure(member, name, where)
    if have == ["frequencies"] or given(member.relative_to) is not None:
        return
    computed = _computed(species)
    # nuclei and electrons apart are the zero of every computed energy, so these two stand on it
    alone = parse_composition(str(member.composition), where=where) in (({"H": 1}, 1), ({}, -1))
    if computed and not alone:
        raise StudyError(
            f"{name} is declared beside species that are read ({computed[0]}): "
            "their enthalpies do not have one zero",
            where=where,
            mend="say what its values are differences from: "
            f"relative_to = {{ {computed[0]} = 1, ... }}",
        )


def _computed(species: Mapping[str, SpeciesKeys]) -> list[str]:
    """Return the names of the species that are read from outputs."""
    return [
        name
        for name, keys in species.items()
        if given(keys.frequencies) is not None or is_read(keys)
    ]


def _check_conformers(
    name: str, member: SpeciesKeys, species: Mapping[str, SpeciesKeys], file: str
) -> None:
    """Check the keys of a species with several conformers; those of each are checked with it."""
    for key in ("energy", *_DECLARED_ONLY):
        if given(getattr(member, key)) is not None:
            raise StudyError(
                f"{key} belongs to each conformer",
                where=place(file, "species", name, key),
                mend="write it in the tables of conformers",
            )
    computed = _computed(species)
    if computed and not is_read(member):
        raise StudyError(
            f"the conformers of {name} are declared beside species that are read ({computed[0]}): "
            "their enthalpies do not have one zero",
            where=place(file, "species", name, "conformers"),
            mend="read its conformers from outputs, or declare every species",
        )


def _check_structure(member: StructureKeys, name: str, where: str) -> None:
    """Check which keys of one structure stand together: it is read, or declared."""
    is_declared = given(member.composition) is not None
    for key in _READ_ONLY if is_declared else _DECLARED_ONLY:
        if given(getattr(member, key, UNSET)) is not None:
            kind = "declared" if is_declared else "read from an output"
            raise StudyError(
                f"{key} has no meaning for a species that is {kind}",
                where=f"{where} {key}",
                mend="take the key out",
            )
    for key in ("enthalpy", "entropy") if is_declared else ():
        if given(getattr(member, key)) is None:
            raise StudyError(
                f"the key {key!r} is missing",
                where=where,
                mend="a declared species has composition, enthalpy and entropy",
            )


def check_conformer(member: ConformerKeys, name: str, where: str) -> None:
    """Check the keys of one conformer."""
    read = [key for key in ("frequencies", "energy") if given(getattr(member, key)) is not None]
    declared = given(member.composition) is not None
    if not read and not declared:
        raise StudyError(
            f"{name} has neither frequencies, energy nor composition",
            where=where,
            mend='name its output: { frequencies = "..." }',
        )
    if declared and "frequencies" in read:
        raise StudyError(
            f"{name} has both frequencies and composition", where=where, mend="take one of them out"
        )
    _check_structure(member, name, where)
