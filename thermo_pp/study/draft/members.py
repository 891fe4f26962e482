"""Members: the structures of a folder that a draft can use, each checked and named."""

from __future__ import annotations

import os
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from thermo_pp.audit.levels import level_words, stated_level
from thermo_pp.collect import Collection
from thermo_pp.conditions import Treatment
from thermo_pp.data.elements import SYMBOLS
from thermo_pp.errors import StudyError
from thermo_pp.grouping import Grouped, atom_kinds, conformers, group, levels_of, same_level
from thermo_pp.names import DEFAULT_TEMPERATURE_K
from thermo_pp.records import Calculation, hill_formula
from thermo_pp.species import Structure
from thermo_pp.study.draft.energies import rank
from thermo_pp.study.draft.naming import can_be_written, species_names
from thermo_pp.units import HARTREE_KJ_MOL


@dataclass(frozen=True, eq=False)
class Member:
    """One structure that loads.

    Attributes
    ----------
    name : str
    grouped : Grouped
    gibbs_kj_mol : float
        At 298.15 K and 1 bar in the gas phase with the frequency job's own energy; only to tell
        which of several is lower.
    declared : mapping of str to int
        Charge and multiplicity where the output does not say them: a guess.
    """

    name: str
    grouped: Grouped
    gibbs_kj_mol: float
    declared: Mapping[str, int] = field(default_factory=dict)

    @property
    def calculation(self) -> Calculation:
        """The frequency job."""
        return self.grouped.frequencies

    @property
    def charge(self) -> int:
        """The charge, read or guessed."""
        found = self.calculation.charge
        return self.declared["charge"] if found is None else found

    def gibbs_with(self, energy: Calculation | None) -> float:
        """Return G, kJ/mol, with the energy of a single point in place of the own one."""
        own = self.calculation.energy_hartree
        if energy is None or energy.energy_hartree is None or own is None:
            return self.gibbs_kj_mol
        return self.gibbs_kj_mol + (energy.energy_hartree - own) * HARTREE_KJ_MOL


@dataclass(frozen=True, eq=False)
class Members:
    """What a draft is made from.

    Attributes
    ----------
    minima, saddles : mapping of str to Member
        In the order of the files.
    conformers : mapping of str to tuple of str
        Of every molecule the names of its minima, by each of those names.
    levels : tuple of (str, int)
        Levels of the frequencies in words, with the number of structures; the first is used.
    left_out : tuple of (str, str)
        Path and reason of every file that is not used.
    """

    minima: Mapping[str, Member]
    saddles: Mapping[str, Member]
    conformers: Mapping[str, tuple[str, ...]]
    levels: tuple[tuple[str, int], ...]
    left_out: tuple[tuple[str, str], ...]

    def lowest(self, energies: Mapping[str, Calculation]) -> dict[str, Member]:
        """Return of every molecule the conformer of least G, with `energies` where all have one."""
        found: dict[str, Member] = {}
        for name, group_ in self.conformers.items():
            own = energies if all(each in energies for each in group_) else {}
            best = min(group_, key=lambda each: self.minima[each].gibbs_with(own.get(each)))
            if best == name:
                found[name] = self.minima[name]
        return found


def members(collection: Collection, folder: Path) -> Iterator[Members]:
    """Group what a folder holds and yield, for each level of the frequencies, what a study can load.

    The level that most structures have comes first, the better of two as frequent.

    Raises
    ------
    StudyError
        Nothing was read, or nothing has frequencies.
    """
    unread = [(path, f"cannot be read: {error.what}") for path, error in collection.failed]
    usable = []
    for calc in collection.calculations:
        why = _why_not_nameable(calc.path)
        if why:
            unread.append((calc.path, why))
        else:
            usable.append(calc)
    if not usable:
        raise StudyError(
            "no file in this folder can be read"
            + (f"; the first of {len(unread)}: {unread[0][1]}" if unread else ""),
            where=str(folder),
            mend="name the folder of the outputs; thermo-pp survey says what each file is",
        )
    grouping = group(usable)
    if not any(each.frequencies.wavenumbers_cm is not None for each in grouping.structures):
        raise StudyError(
            f"none of the {len(usable)} outputs has frequencies, so there is no H, S and G",
            where=str(folder),
            mend="add the frequency job of every minimum and saddle point to the folder",
        )
    alone = [(calc.path, "at the geometry of no frequency job") for calc in grouping.alone]
    levels = _by_level(grouping.structures)
    for k, kept in enumerate(levels):
        order = [kept, *levels[:k], *levels[k + 1 :]]
        left_out = [*unread, *alone, *_at_other_levels(grouping.structures, kept)]
        yield _members(kept, [(_words(each), len(each)) for each in order], left_out)


def _by_level(structures: Sequence[Grouped]) -> list[list[Grouped]]:
    """Sort structures by the level of their frequencies; an atom belongs to every level that it fits."""
    jobs = [s.frequencies for s in structures if len(s.frequencies.numbers) > 1]
    groups = levels_of(jobs or [s.frequencies for s in structures])
    groups.sort(key=lambda calcs: (-len(calcs), *(-number for number in rank(calcs[0]))))
    answer = []
    for calcs in groups:
        stated: dict[str, str] = {}
        for calc in calcs:
            stated |= stated_level(calc)
        inside = {id(calc) for calc in calcs}
        answer.append(
            [
                s
                for s in structures
                if id(s.frequencies) in inside
                or (len(s.frequencies.numbers) == 1 and _fits(s.frequencies, stated))
            ]
        )
    return answer


def _fits(calc: Calculation, stated: Mapping[str, str]) -> bool:
    return same_level(stated_level(calc), stated)


def _at_other_levels(
    structures: Sequence[Grouped], kept: Sequence[Grouped]
) -> list[tuple[str, str]]:
    inside = {id(each) for each in kept}
    return [
        (each.frequencies.path, f"its frequencies are at another level, {_words([each])}")
        for each in structures
        if id(each) not in inside
    ]


def _words(structures: Sequence[Grouped]) -> str:
    return level_words(structures[0].frequencies) or "a level that is not stated"


def _members(
    kept: Sequence[Grouped],
    levels: Sequence[tuple[str, int]],
    left_out: Sequence[tuple[str, str]],
) -> Members:
    """Name and check the structures of one level."""
    left_out = list(left_out)
    names = species_names([structure.frequencies for structure in kept])
    found: dict[str, Member] = {}
    for name, structure in zip(names, kept, strict=True):
        made = _checked(name, structure)
        if isinstance(made, Member):
            found[name] = made
        else:
            left_out.append((structure.frequencies.path, made))
    for member in found.values():
        for copy in member.grouped.copies:
            left_out.append((copy.path, f"the same structure as {member.calculation.path}"))
    minima = {name: m for name, m in found.items() if m.grouped.role == "minimum"}
    ordered = list(minima)
    alike: dict[str, tuple[str, ...]] = {}
    for numbers in conformers([minima[name].grouped for name in ordered]):
        group_ = tuple(ordered[k] for k in numbers)
        alike.update(dict.fromkeys(group_, group_))
    return Members(
        minima,
        {name: m for name, m in found.items() if m.grouped.role == "saddle"},
        {name: alike[name] for name in ordered},
        tuple(levels),
        tuple(left_out),
    )


def _why_not_nameable(path: str) -> str:
    """Return why a study file cannot name this output; empty where it can."""
    if not can_be_written(path):
        return "its name is not UTF-8, which a study file is written in"
    if not os.path.isfile(path):  # noqa: PTH113 (a name too long is no file, not an OSError)
        return "it stands inside an archive: unpack it"
    return ""


def _checked(name: str, structure: Grouped) -> Member | str:
    """Return the member that a structure makes, or why it makes none."""
    calc = structure.frequencies
    if structure.role is None:
        return f"{calc.imaginary_modes} imaginary modes: neither a minimum nor a saddle point"
    declared: dict[str, int] = {}
    if calc.charge is None:
        declared["charge"] = 0
    charge = calc.charge or 0
    if calc.multiplicity is None:
        declared["multiplicity"] = 1 + (int(calc.numbers.sum()) - charge) % 2
    try:
        model = Structure.make(
            calc,
            Treatment(),
            name=name,
            kind=structure.role,
            charge=declared.get("charge"),
            multiplicity=declared.get("multiplicity"),
            where=calc.path,
        )
        result = model.at(np.array([DEFAULT_TEMPERATURE_K]))
    except StudyError as error:
        return f"cannot be computed: {error.what}"
    return Member(name, structure, float(result.gibbs_kj_mol[0]), declared)


def hill(numbers: Sequence[int]) -> str:
    """Return the formula of atomic numbers in Hill order."""
    return hill_formula(np.array(numbers, dtype=np.int64))


def described(member: Member) -> str:
    """Say what a member is: formula, charge, multiplicity and imaginary mode."""
    calc = member.calculation
    words = calc.formula
    parts = member.grouped.fragments
    if member.grouped.role == "minimum" and len(parts) > 1:
        words += f", a complex of {' and '.join(hill(part.numbers) for part in parts)}"
    if member.charge:
        words += f", charge {member.charge:+d}"
    spin = calc.multiplicity or member.declared["multiplicity"]
    if spin != 1:
        words += f", multiplicity {spin}"
    if member.grouped.role == "saddle" and calc.wavenumbers_cm is not None:
        words += f", saddle point, {-calc.wavenumbers_cm[0]:.0f}i cm^-1"
    labels = sorted({int(kind) for kind in atom_kinds(calc) if kind >= len(SYMBOLS)})
    if labels:
        words += ", heavy isotopes of hydrogen"
    return words
