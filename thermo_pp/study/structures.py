"""The structures of a study that are read: their outputs, their energy, their treatment."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from typing import Any

from thermo_pp.conditions import StandardState, Treatment
from thermo_pp.energies.recipe import CheckedEnergy
from thermo_pp.errors import Finding, StudyError
from thermo_pp.names import UsedAs
from thermo_pp.records import Calculation
from thermo_pp.species import Structure
from thermo_pp.study.check import place
from thermo_pp.study.energies import energy_keys, make_energy
from thermo_pp.study.ensembles import Reading
from thermo_pp.study.keys import (
    ConformerKeys,
    EnergyKeys,
    Quantity,
    SpeciesKeys,
    StructureKeys,
    StudyKeys,
)
from thermo_pp.study.outputs import Outputs
from thermo_pp.study.seams import make_seam
from thermo_pp.study.torsions import make_torsions
from thermo_pp.study.treatment import entropy_correction, real_below
from thermo_pp.study.values import given

SEAM_DOUBTS = {"mode-count", "imaginary-modes", "small-imaginary-mode"}
"""What the audit says of modes, where the modes of one state do not count."""


@dataclass(frozen=True, eq=False)
class Structures:
    """What the structures of one study are made with, and what is kept of them.

    Attributes
    ----------
    keys : StudyKeys
    treatment : Treatment
        The study's.
    file : str
        The study file.
    outputs : Outputs
    level : str or None
        The named level of theory whose energies are taken; None: the species' own.
    findings : list of Finding
        About their energies, and about ensembles of them.
    frequencies : dict of str to Calculation
        By structure; those that are lent from another conformer left out.
    energies : dict of str to CheckedEnergy
        By structure.
    seams : list of Calculation
        Outputs that the seams of crossing points stand on beside their frequency jobs.
    not_plain : dict of str to set of str
        By path of an output at a crossing point: the doubts of the audit that do not hold there.
    """

    keys: StudyKeys
    treatment: Treatment
    file: str
    outputs: Outputs
    level: str | None = None
    findings: list[Finding] = field(default_factory=list)
    frequencies: dict[str, Calculation] = field(default_factory=dict)
    energies: dict[str, CheckedEnergy] = field(default_factory=dict)
    seams: list[Calculation] = field(default_factory=list)
    not_plain: dict[str, set[str]] = field(default_factory=dict)


def species_structure(
    structures: Structures,
    name: str,
    member: SpeciesKeys,
    kind: UsedAs,
    standard_state: StandardState,
) -> Structure:
    """Make a species of one structure of the outputs that it names."""
    where = place(structures.file, "species", name)
    calc = structures.outputs.calculation(str(member.frequencies), f"{where} frequencies")
    parts, at = energy_keys(structures.keys, structures.level, name, member, structures.file)
    energy = _energy(structures, parts, calc, at)
    correction = given(member.entropy_correction)
    return make_structure(
        structures, name, member, Reading(calc, energy), kind, standard_state, where, correction
    )


def _energy(
    structures: Structures, parts: str | EnergyKeys | None, calc: Calculation, where: str
) -> CheckedEnergy:
    """Make the energy of one structure of its parts."""
    return make_energy(
        parts, calc, structures.treatment.phase, structures.outputs.calculation, where
    )


def conformer_energy(
    structures: Structures,
    name: str,
    label: str,
    keys: ConformerKeys,
    calc: Calculation,
    where: str,
) -> CheckedEnergy:
    """Make the energy of one conformer, its own or that of the level in use."""
    if structures.level is None:
        own = given(keys.energy) if given(keys.frequencies) is not None else None
        return _energy(structures, own, calc, f"{where} energy")
    if given(keys.frequencies) is None:
        raise StudyError(
            f"{label} names no frequency job, so the level {structures.level!r} has no energy for it",
            where=where,
            mend="name its frequency job",
        )
    parts, at = energy_keys(structures.keys, structures.level, name, keys, structures.file)
    return _energy(structures, parts, calc, at)


def make_structure(
    structures: Structures,
    name: str,
    member: StructureKeys,
    reading: Reading,
    kind: UsedAs,
    standard_state: StandardState,
    where: str,
    correction: Quantity | None,
) -> Structure:
    """Make one structure of its outputs."""
    calc, energy = reading.frequencies, reading.energy
    structures.findings.extend(energy.findings)
    imaginary = given(member.imaginary)
    treatment = replace(structures.treatment, standard_state=standard_state)
    if correction is not None:
        added = entropy_correction(correction, treatment.phase, f"{where} entropy_correction")
        treatment = replace(treatment, entropy_correction_j_mol_k=added)
    if imaginary is not None:
        below = real_below(imaginary, f"{where} imaginary.real_below")
        treatment = replace(treatment, real_below_cm=below)
    if reading.lent is None:
        structures.frequencies[name] = calc
    structures.energies[name] = energy
    seam_keys, seam = given(member.seam), None
    if kind == "crossing":
        structures.not_plain[calc.path] = {"mode-count"}
    if seam_keys is not None:
        at = f"{where} seam"
        if kind != "crossing":
            raise StudyError(
                f"{name} has a seam, but no step crosses between spin states there",
                where=at,
                mend='write kind = "crossing" in the step that goes through it, or take the key out',
            )
        seam, others = make_seam(
            seam_keys, calc, given(member.multiplicity), structures.outputs, name=name, where=at
        )
        structures.seams.extend(others)
        for one in (calc, *others):
            structures.not_plain[one.path] = SEAM_DOUBTS
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
            structures.outputs.source,
            f"{where} torsions".strip(),
        ),
        seam=seam,
        where=where,
    )


def _rotational_constants(member: StructureKeys) -> dict[str, Any] | None:
    constants = given(member.rotational_constants)
    return None if constants is None else {"B": constants.B, "D": constants.D}
