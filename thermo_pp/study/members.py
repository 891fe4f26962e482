"""The species of a study: read from the outputs it names, or declared."""

from __future__ import annotations

import os
from collections.abc import Collection, Mapping
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

from msgspec import UNSET

from thermo_pp import conditions as made
from thermo_pp.audit import audit_alone
from thermo_pp.audit.levels import level_findings, level_words
from thermo_pp.audit.scaling import scale_findings, scale_words
from thermo_pp.conditions import Treatment
from thermo_pp.energies.recipe import CheckedEnergy, recipe_findings
from thermo_pp.errors import Finding, StudyError, each_once
from thermo_pp.names import DEFAULT_TEMPERATURE_K, Kind
from thermo_pp.nearest import suggestion
from thermo_pp.readers import read_all, read_source
from thermo_pp.records import Calculation
from thermo_pp.sources import open_source
from thermo_pp.species import (
    Declared,
    ElectronicEnergy,
    SpeciesModel,
    Structure,
    parse_composition,
    solution_finding,
)
from thermo_pp.study.check import place
from thermo_pp.study.energies import energy_keys, make_energy, solution_findings
from thermo_pp.study.ensembles import Making, Reading, is_read, make_ensemble
from thermo_pp.study.files import inside
from thermo_pp.study.keys import (
    ConformerKeys,
    EnergyKeys,
    Quantity,
    SpeciesKeys,
    StructureKeys,
    StudyKeys,
)
from thermo_pp.study.parts import above_zero, entropy_correction, given, real_below
from thermo_pp.study.torsions import make_torsions
from thermo_pp.units import quantity

_READ_ONLY = (
    "energy",
    "multiplicity",
    "levels",
    "symmetry_number",
    "isotopes",
    "rotational_constants",
    "nuclear_spins",
    "torsions",
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


@dataclass(frozen=True, eq=False)
class Members:
    """What the species of a study came to.

    Attributes
    ----------
    species : dict of str to SpeciesModel
        In the order of the file.
    findings : tuple of Finding
        Of the outputs, the pairs, the species and the levels of theory.
    levels : tuple of str
        The levels of theory in words, a sentence each; empty where all species are declared.
    energies : dict of str to ElectronicEnergy
        Part by part, of every structure that is read.
    """

    species: dict[str, SpeciesModel]
    findings: tuple[Finding, ...]
    levels: tuple[str, ...]
    energies: dict[str, ElectronicEnergy]


@dataclass(eq=False)
class _Maker:
    """Makes the species of one study; every output is read once."""

    keys: StudyKeys
    treatment: Treatment
    saddles: Collection[str]
    file: str
    folder: Path
    outputs: Path
    level: str | None = None
    read: dict[str, Calculation] = field(default_factory=dict)
    done: dict[str, SpeciesModel] = field(default_factory=dict)
    findings: list[Finding] = field(default_factory=list)
    frequencies: dict[str, Calculation] = field(default_factory=dict)
    energies: dict[str, CheckedEnergy] = field(default_factory=dict)
    opened: dict[str, Calculation] = field(default_factory=dict)


def make_species(
    keys: StudyKeys,
    treatment: Treatment,
    saddles: Collection[str],
    file: str,
    *,
    level: str | None = None,
    read: dict[str, Calculation] | None = None,
) -> Members:
    """Read or make every species of a study.

    Parameters
    ----------
    keys : StudyKeys
    treatment : Treatment
        The study's; a species may have its own standard state and its own word on imaginary modes.
    saddles : collection of str
        Names of the saddle points.
    file : str
        The study file.
    level : str or None
        The named level of theory whose energies are taken; None: the species' own.
    read : dict or None
        Outputs that were read before, by path; those read now are added.

    Raises
    ------
    StudyError
        A species that is neither read nor declared or both, a missing file or one outside the
        study's folder, a single point that does not belong to its frequency job, scales that are
        mixed.
    """
    folder = Path(file).parent
    outputs = folder / keys.outputs
    if not os.path.isdir(outputs):  # noqa: PTH112 (nor is it a folder)
        raise StudyError(
            f"there is no folder {str(outputs)!r}",
            where=place(file, "outputs"),
            mend="name the folder of the outputs, from the folder of the study file",
        )
    known = {} if read is None else read
    maker = _Maker(keys, treatment, saddles, file, folder, outputs, level, known)
    for name, member in keys.species.items():
        _check_member(name, member, keys.species, file)
    for name in keys.species:
        _make(maker, name, ())
    found: list[Finding] = []
    meant = {path for one in maker.energies.values() for path in one.ghosts}
    for calc in maker.opened.values():
        found += [
            one for one in calc.findings if one.code != "ghost-atoms" or calc.path not in meant
        ]
        found += audit_alone(calc)
    found += maker.findings
    found += [finding for model in maker.done.values() for finding in model.findings]
    found += level_findings([*maker.frequencies.values()], "frequencies")
    found += recipe_findings(maker.energies, file)
    found += scale_findings(treatment, [*maker.frequencies.values()], file)
    found += _same_file(maker.frequencies, file)
    if treatment.phase == "solution" and maker.frequencies:
        solvation = solution_findings(maker.energies, treatment.standard_state.form, file)
        found += [replace(solution_finding(), file=file)] if solvation is None else solvation
    species = {name: maker.done[name] for name in keys.species}
    energies = {name: one.energy for name, one in maker.energies.items()}
    return Members(species, each_once(found), _levels(maker), energies)


def _levels(maker: _Maker) -> tuple[str, ...]:
    """Write the levels of theory of the energies and of the frequencies."""
    sentences = []
    frequencies = [*maker.frequencies.values()]
    for what, levels in (
        ("Energies", [energy.words for energy in maker.energies.values()]),
        (
            "Geometries and frequencies",
            [level_words(calc) or "not stated" for calc in frequencies],
        ),
    ):
        if levels:
            sentences.append(f"{what}: {'; '.join(dict.fromkeys(levels))}.")
    scaled = scale_words(maker.treatment, frequencies)
    return tuple(sentences if scaled is None else [*sentences, scaled])


def _check_member(
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


def _check_conformer(member: ConformerKeys, name: str, where: str) -> None:
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


def _make(maker: _Maker, name: str, on_the_way: tuple[str, ...]) -> SpeciesModel:
    """Return a species, made where it is not yet; those it is relative to come first."""
    if name in maker.done:
        return maker.done[name]
    member = maker.keys.species[name]
    where = place(maker.file, "species", name)
    state = given(member.standard_state)
    standard_state = (
        maker.treatment.standard_state
        if state is None
        else made.standard_state(state, where=f"{where} standard_state")
    )
    kind: Kind = "saddle" if name in maker.saddles else "minimum"
    model: SpeciesModel
    if given(member.conformers) is not None:
        model = _ensemble(maker, name, member, kind, standard_state)
    elif given(member.composition) is not None:
        model = _declared(maker, name, member, kind, standard_state, where, on_the_way)
    else:
        model = _structure(maker, name, member, kind, standard_state)
    maker.done[name] = model
    return model


def _ensemble(
    maker: _Maker,
    name: str,
    member: SpeciesKeys,
    kind: Kind,
    standard_state: made.StandardState,
) -> SpeciesModel:
    """Make the conformers of a species as single species are made, and their ensemble."""

    def structure(label: str, keys: ConformerKeys, reading: Reading, at: str) -> SpeciesModel:
        correction = given(member.entropy_correction)
        return _settled(maker, label, keys, reading, kind, standard_state, at, correction)

    def energy(label: str, keys: ConformerKeys, calc: Calculation, at: str) -> CheckedEnergy:
        return _conformer_energy(maker, name, label, keys, calc, at)

    def declared(label: str, keys: ConformerKeys, at: str) -> SpeciesModel:
        return _declared(maker, label, keys, kind, standard_state, at, ())

    making = Making(
        lambda file, at: _calculation(maker, file, at),
        lambda file, at: _calculations(maker, file, at),
        _check_conformer,
        energy,
        structure,
        declared,
    )
    where = place(maker.file, "species", name)
    found, findings = make_ensemble(name, member, maker.keys.treatment.duplicates, making, where)
    maker.findings += findings
    return found


def _structure(
    maker: _Maker,
    name: str,
    member: SpeciesKeys,
    kind: Kind,
    standard_state: made.StandardState,
) -> SpeciesModel:
    where = place(maker.file, "species", name)
    calc = _calculation(maker, str(member.frequencies), f"{where} frequencies")
    parts, at = energy_keys(maker.keys, maker.level, name, member, maker.file)
    energy = _energy(maker, parts, calc, at)
    correction = given(member.entropy_correction)
    return _settled(
        maker, name, member, Reading(calc, energy), kind, standard_state, where, correction
    )


def _energy(
    maker: _Maker, parts: str | EnergyKeys | None, calc: Calculation, where: str
) -> CheckedEnergy:
    """Make the energy of one structure of its parts."""
    return make_energy(
        parts,
        calc,
        maker.treatment.phase,
        lambda file, place_of_it: _calculation(maker, file, place_of_it),
        where,
    )


def _conformer_energy(
    maker: _Maker, name: str, label: str, keys: ConformerKeys, calc: Calculation, where: str
) -> CheckedEnergy:
    """Make the energy of one conformer, its own or that of the level in use."""
    if maker.level is None:
        own = given(keys.energy) if given(keys.frequencies) is not None else None
        return _energy(maker, own, calc, f"{where} energy")
    if given(keys.frequencies) is None:
        raise StudyError(
            f"{label} names no frequency job, so the level {maker.level!r} has no energy for it",
            where=where,
            mend="name its frequency job",
        )
    parts, at = energy_keys(maker.keys, maker.level, name, keys, maker.file)
    return _energy(maker, parts, calc, at)


def _settled(
    maker: _Maker,
    name: str,
    member: StructureKeys,
    reading: Reading,
    kind: Kind,
    standard_state: made.StandardState,
    where: str,
    correction: Quantity | None,
) -> SpeciesModel:
    """Make one structure of its outputs."""
    calc, energy = reading.frequencies, reading.energy
    maker.findings += energy.findings
    imaginary = given(member.imaginary)
    treatment = replace(maker.treatment, standard_state=standard_state)
    if correction is not None:
        added = entropy_correction(correction, treatment.phase, f"{where} entropy_correction")
        treatment = replace(treatment, entropy_correction_j_mol_k=added)
    if imaginary is not None:
        below = real_below(imaginary, f"{where} imaginary.real_below")
        treatment = replace(treatment, real_below_cm=below)
    if reading.lent is None:
        maker.frequencies[name] = calc
    maker.energies[name] = energy
    return Structure.make(
        calc if reading.lent is None else reading.lent.calculation,
        treatment,
        name=name,
        kind=kind,
        energy=energy.energy,
        charge=given(member.charge),
        multiplicity=given(member.multiplicity),
        levels=given(member.levels),
        symmetry_number=given(member.symmetry_number),
        isotopes=given(member.isotopes),
        rotational_constants=_rotational_constants(member),
        nuclear_spins=given(member.nuclear_spins),
        torsions=make_torsions(
            given(member.torsions) or [],
            calc,
            lambda output, at: open_source(inside(maker.outputs, maker.folder, output, at)),
            f"{where} torsions".strip(),
        ),
        where=where,
    )


def _rotational_constants(member: StructureKeys) -> dict[str, Any] | None:
    constants = given(member.rotational_constants)
    return None if constants is None else {"B": constants.B, "D": constants.D}


def _declared(
    maker: _Maker,
    name: str,
    member: SpeciesKeys | ConformerKeys,
    kind: Kind,
    standard_state: made.StandardState,
    where: str,
    on_the_way: tuple[str, ...],
) -> SpeciesModel:

    def number(key: str, unit: str) -> float:
        return quantity(getattr(member, key), unit, where=f"{where} {key}")

    reference = []
    relative_to = given(member.relative_to) if isinstance(member, SpeciesKeys) else None
    for other, count in (relative_to or {}).items():
        at = f"{where} relative_to.{other}"
        if other not in maker.keys.species:
            raise StudyError(
                f"unknown species {other!r}",
                where=at,
                mend=suggestion(other, maker.keys.species, "species"),
            )
        if count == 0:
            raise StudyError("0 of a species", where=at, mend="leave it out, or state how many")
        if other == name or other in on_the_way:
            raise StudyError(
                f"{name} is relative to itself" + ("" if other == name else f", by way of {other}"),
                where=at,
                mend="let relative_to lead to species that are read, or that have no relative_to",
            )
        reference.append((_make(maker, other, (*on_the_way, name)), count))
    atoms, _ = parse_composition(str(member.composition), where=where)
    if not atoms and (standard_state.form, standard_state.value) != ("concentration", 1.0):
        raise StudyError(
            f"{name} are electrons, whose activity counts against 1 mol/L",
            where=f"{where} standard_state",
            mend='write standard_state = "1 mol/L"',
        )
    temperature = given(member.temperature)
    return Declared.make(
        str(member.composition),
        name=name,
        kind=kind,
        enthalpy_kj_mol=number("enthalpy", "kJ/mol"),
        entropy_j_mol_k=number("entropy", "J/mol/K"),
        standard_state=standard_state,
        heat_capacity_j_mol_k=(
            None if given(member.heat_capacity) is None else number("heat_capacity", "J/mol/K")
        ),
        temperature_k=(
            DEFAULT_TEMPERATURE_K
            if temperature is None
            else made.temperature(temperature, where=f"{where} temperature")
        ),
        ground_kj_mol=None if given(member.ground) is None else number("ground", "kJ/mol"),
        imaginary_cm=_imaginary_mode(member, kind, where),
        charge=given(member.charge),
        reference=tuple(reference),
        where=where,
    )


def _imaginary_mode(member: StructureKeys, kind: Kind, where: str) -> float | None:
    """Return the size of a declared saddle point's imaginary wavenumber, cm^-1."""
    value = given(member.imaginary_mode)
    if value is None:
        return None
    if kind != "saddle":
        raise StudyError(
            "a minimum has no imaginary mode",
            where=f"{where} imaginary_mode",
            mend="take the key out, or let a step go through this species",
        )
    return above_zero(value, "1/cm", f"{where} imaginary_mode")


def _calculation(maker: _Maker, name: str, where: str) -> Calculation:
    """Read the output `name` once."""
    path = inside(maker.outputs, maker.folder, name, where)
    if str(path) not in maker.read:
        maker.read[str(path)] = read_source(open_source(path))
    maker.opened[str(path)] = maker.read[str(path)]
    return maker.read[str(path)]


def _calculations(maker: _Maker, name: str, where: str) -> tuple[Calculation, ...]:
    """Read every structure of the file `name`."""
    found = read_all(open_source(inside(maker.outputs, maker.folder, name, where)))
    maker.read |= {calc.path: calc for calc in found}
    return found


def _same_file(frequencies: Mapping[str, Calculation], file: str) -> list[Finding]:
    """Find species that are read from one and the same frequency job."""
    users: dict[str, list[str]] = {}
    for name, calc in frequencies.items():
        users.setdefault(calc.sha256, []).append(name)
    return [
        Finding(
            "same-file-twice",
            "warning",
            file,
            None,
            f"{' and '.join(names)} are read from the same frequency job",
            "name the output of each species",
        )
        for names in users.values()
        if len(names) > 1
    ]
