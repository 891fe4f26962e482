"""The species of a study: read from the outputs it names, or declared."""

from __future__ import annotations

from collections.abc import Collection, Mapping
from dataclasses import dataclass, field, replace

from thermo_pp import conditions as made
from thermo_pp.audit import audit_alone
from thermo_pp.audit.levels import level_findings, level_words
from thermo_pp.audit.scaling import scale_findings, scale_words
from thermo_pp.conditions import Treatment
from thermo_pp.energies.recipe import CheckedEnergy, recipe_findings
from thermo_pp.errors import Finding, StudyError, each_once
from thermo_pp.names import Kind, UsedAs
from thermo_pp.nearest import suggestion
from thermo_pp.records import Calculation
from thermo_pp.species import ElectronicEnergy, SpeciesModel, solution_finding
from thermo_pp.study.check import place
from thermo_pp.study.declared_species import declare
from thermo_pp.study.energies import solution_findings
from thermo_pp.study.ensembles import Making, Reading, make_ensemble
from thermo_pp.study.keys import ConformerKeys, SpeciesKeys, StudyKeys
from thermo_pp.study.member_checks import check_conformer, check_member
from thermo_pp.study.outputs import Outputs
from thermo_pp.study.structures import (
    Structures,
    conformer_energy,
    make_structure,
    species_structure,
)
from thermo_pp.study.values import given


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
    """Makes the species of one study."""

    structures: Structures
    saddles: Collection[str]
    crossings: Collection[str]
    lowest_only: bool
    done: dict[str, SpeciesModel] = field(default_factory=dict)


def make_species(
    keys: StudyKeys,
    treatment: Treatment,
    saddles: Collection[str],
    file: str,
    *,
    crossings: Collection[str] = (),
    level: str | None = None,
    read: dict[str, Calculation] | None = None,
    lowest_only: bool = False,
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
    crossings : collection of str
        Those of the saddle points at which spin states cross.
    level : str or None
        The named level of theory whose energies are taken; None: the species' own.
    read : dict or None
        Outputs that were read before, by path; those read now are added.
    lowest_only : bool
        Of several conformers, the one of least electronic and zero-point energy alone.

    Raises
    ------
    StudyError
        A species that is neither read nor declared or both, a missing file or one outside the
        study's folder, a single point that does not belong to its frequency job, scales that are
        mixed.
    """
    outputs = Outputs.of(keys.outputs, file, {} if read is None else read)
    structures = Structures(keys, treatment, file, outputs, level)
    maker = _Maker(structures, saddles, crossings, lowest_only)
    for name, member in keys.species.items():
        check_member(name, member, keys.species, file)
    for name in keys.species:
        _make(maker, name, ())
    found: list[Finding] = []
    meant = {path for one in structures.energies.values() for path in one.ghosts}
    for calc in outputs.opened.values():
        found += [
            one for one in calc.findings if one.code != "ghost-atoms" or calc.path not in meant
        ]
        not_here = structures.not_plain.get(calc.path, ())
        found += [one for one in audit_alone(calc) if one.code not in not_here]
    found += structures.findings
    found += [finding for model in maker.done.values() for finding in model.findings]
    found += level_findings([*structures.frequencies.values(), *structures.seams], "frequencies")
    found += recipe_findings(structures.energies, file)
    found += scale_findings(treatment, [*structures.frequencies.values()], file)
    found += _same_file(structures.frequencies, file)
    if treatment.phase == "solution" and structures.frequencies:
        solvation = solution_findings(structures.energies, treatment.standard_state.form, file)
        found += [replace(solution_finding(), file=file)] if solvation is None else solvation
    species = {name: maker.done[name] for name in keys.species}
    energies = {name: one.energy for name, one in structures.energies.items()}
    return Members(species, each_once(found), _levels(structures), energies)


def _levels(structures: Structures) -> tuple[str, ...]:
    """Write the levels of theory of the energies and of the frequencies."""
    sentences = []
    frequencies = [*structures.frequencies.values()]
    for what, levels in (
        ("Energies", [energy.words for energy in structures.energies.values()]),
        (
            "Geometries and frequencies",
            [level_words(calc) or "not stated" for calc in frequencies],
        ),
    ):
        if levels:
            sentences.append(f"{what}: {'; '.join(dict.fromkeys(levels))}.")
    scaled = scale_words(structures.treatment, frequencies)
    return tuple(sentences if scaled is None else [*sentences, scaled])


def _make(maker: _Maker, name: str, on_the_way: tuple[str, ...]) -> SpeciesModel:
    """Return a species, made where it is not yet; those it is relative to come first."""
    if name in maker.done:
        return maker.done[name]
    member = maker.structures.keys.species[name]
    where = place(maker.structures.file, "species", name)
    state = given(member.standard_state)
    standard_state = (
        maker.structures.treatment.standard_state
        if state is None
        else made.standard_state(state, where=f"{where} standard_state")
    )
    kind: Kind = "saddle" if name in maker.saddles else "minimum"
    used_as: UsedAs = "crossing" if name in maker.crossings else kind
    model: SpeciesModel
    if given(member.conformers) is not None:
        model = _ensemble(maker, name, member, used_as, standard_state)
    elif given(member.composition) is not None:
        model = declare(
            name,
            member,
            kind,
            standard_state,
            where,
            _reference(maker, name, member, where, on_the_way),
        )
    else:
        model = species_structure(maker.structures, name, member, used_as, standard_state)
    maker.done[name] = model
    return model


def _ensemble(
    maker: _Maker,
    name: str,
    member: SpeciesKeys,
    used_as: UsedAs,
    standard_state: made.StandardState,
) -> SpeciesModel:
    """Make the conformers of a species as single species are made, and their ensemble."""

    def structure(label: str, keys: ConformerKeys, reading: Reading, at: str) -> SpeciesModel:
        correction = given(member.entropy_correction)
        return make_structure(
            maker.structures, label, keys, reading, used_as, standard_state, at, correction
        )

    def energy(label: str, keys: ConformerKeys, calc: Calculation, at: str) -> CheckedEnergy:
        return conformer_energy(maker.structures, name, label, keys, calc, at)

    def declared(label: str, keys: ConformerKeys, at: str) -> SpeciesModel:
        kind: Kind = "minimum" if used_as == "minimum" else "saddle"
        return declare(label, keys, kind, standard_state, at)

    making = Making(
        maker.structures.outputs.calculation,
        maker.structures.outputs.calculations,
        check_conformer,
        energy,
        structure,
        declared,
    )
    where = place(maker.structures.file, "species", name)
    duplicates = maker.structures.keys.treatment.duplicates
    found, findings = make_ensemble(
        name, member, duplicates, making, where, lowest_only=maker.lowest_only
    )
    maker.structures.findings.extend(findings)
    return found


def _reference(
    maker: _Maker, name: str, member: SpeciesKeys, where: str, on_the_way: tuple[str, ...]
) -> tuple[tuple[SpeciesModel, int], ...]:
    """Return what the values of a declared species are differences from."""
    reference = []
    for other, count in (given(member.relative_to) or {}).items():
        at = f"{where} relative_to.{other}"
        if other not in maker.structures.keys.species:
            raise StudyError(
                f"unknown species {other!r}",
                where=at,
                mend=suggestion(other, maker.structures.keys.species, "species"),
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
    return tuple(reference)


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
