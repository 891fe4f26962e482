"""Species of several conformers: each is made as a species is, then they become an ensemble."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace

import msgspec

from thermo_pp.energies.recipe import CheckedEnergy
from thermo_pp.ensemble import Ensemble, Lent, check_energies, with_nearest_modes
from thermo_pp.errors import Finding, StudyError
from thermo_pp.names import Duplicates, Thermal
from thermo_pp.records import Calculation
from thermo_pp.species import SpeciesModel
from thermo_pp.study.keys import ConformerFileKeys, ConformerKeys, SpeciesKeys
from thermo_pp.study.values import given

INHERITED = ("charge", "multiplicity", "levels", "symmetry_number", "isotopes", "imaginary")
"""Keys that a species may say for all its conformers."""


@dataclass(frozen=True)
class Reading:
    """The outputs of one conformer.

    Attributes
    ----------
    frequencies : Calculation
        Its frequency job; a calculation without frequencies where they are lent.
    energy : CheckedEnergy
        Its electronic energy.
    lent : Lent or None
        The wavenumbers of another conformer, where it has none of its own.
    """

    frequencies: Calculation
    energy: CheckedEnergy
    lent: Lent | None = None


@dataclass(frozen=True)
class Making:
    """What is done for single species, and here for each conformer.

    Attributes
    ----------
    read, read_all : callable
        Of the name of a file and the place of its key: a Calculation, or every one in the file.
    check : callable
        Of the keys of a conformer, its name and place: StudyError where they do not go together.
    energy : callable
        Of name, keys, frequency job (or, without one, single point) and place: the energy.
    structure : callable
        Of name, keys, outputs and place: the species.
    declared : callable
        Of name, keys and place: the species.
    """

    read: Callable[[str, str], Calculation]
    read_all: Callable[[str, str], tuple[Calculation, ...]]
    check: Callable[[ConformerKeys, str, str], None]
    energy: Callable[[str, ConformerKeys, Calculation, str], CheckedEnergy]
    structure: Callable[[str, ConformerKeys, Reading, str], SpeciesModel]
    declared: Callable[[str, ConformerKeys, str], SpeciesModel]


@dataclass(frozen=True)
class _Entry:
    """One conformer on its way."""

    name: str
    where: str
    keys: ConformerKeys
    reading: Reading | None = field(default=None)


def make_ensemble(
    name: str,
    species: SpeciesKeys,
    duplicates: Duplicates,
    making: Making,
    where: str,
    *,
    lowest_only: bool = False,
) -> tuple[Ensemble, list[Finding]]:
    """Return the ensemble of a species, and the findings about frequencies that are lent.

    Parameters
    ----------
    name : str
    species : SpeciesKeys
        With ``conformers``.
    duplicates : {"count", "once"}
    making : Making
    where : str
        File and table, for messages.
    lowest_only : bool
        The conformer of least electronic and zero-point energy alone, as if no other were listed.

    Raises
    ------
    StudyError
        Conformers that are partly declared, without frequencies where they must have them, with
        energies of several levels, or that are no conformers of each other.
    """
    entries = _lend(_entries(name, species, making, where), species.thermal)
    _check_levels(name, entries, where)
    models = [
        making.declared(entry.name, entry.keys, entry.where)
        if entry.reading is None
        else making.structure(entry.name, entry.keys, entry.reading, entry.where)
        for entry in entries
    ]
    lent = [entry.reading.lent if entry.reading else None for entry in entries]

    def ensemble(rows: Sequence[int]) -> Ensemble:
        sources = [lent[row] for row in rows]
        return Ensemble.make(
            [models[row] for row in rows],
            name=name,
            duplicates=duplicates,
            spin_states=species.spin_states,
            degeneracies=[given(entries[row].keys.degeneracy) for row in rows],
            thermal_from=[one.source if one else None for one in sources],
            where=f"{where} conformers",
        )

    found = ensemble(range(len(models)))
    if lowest_only:
        found = ensemble([found.members.index(found.lowest)])
    return found, [one.finding for one in lent if one]


def is_read(species: SpeciesKeys) -> bool:
    """Tell whether a species with conformers is read from outputs."""
    listed = given(species.conformers)
    return isinstance(listed, ConformerFileKeys) or any(
        given(keys.composition) is None for keys in listed or ()
    )


def has_energies(species: SpeciesKeys) -> bool:
    """Tell whether a conformer has an energy of its own beside its frequency job."""
    listed = given(species.conformers)
    return isinstance(listed, list) and any(given(keys.energy) is not None for keys in listed)


def _entries(name: str, species: SpeciesKeys, making: Making, where: str) -> list[_Entry]:
    """Return the conformers with their outputs read."""
    common = {
        key: getattr(species, key) for key in INHERITED if given(getattr(species, key)) is not None
    }
    listed = given(species.conformers)
    if isinstance(listed, ConformerFileKeys):
        at = f"{where} conformers.ensemble"
        keys = ConformerKeys(**common)
        return [
            _Entry(label, at, keys, Reading(calc, making.energy(label, keys, calc, at)))
            for label, calc in (
                (f"{name}.{k + 1}", calc)
                for k, calc in enumerate(making.read_all(listed.ensemble, at))
            )
        ]
    entries = []
    for k, keys in enumerate(listed or ()):
        label, at = f"{name}.{k + 1}", f"{where} conformers.{k + 1}"
        making.check(keys, label, at)
        own = {key: value for key, value in common.items() if given(getattr(keys, key)) is None}
        declared = given(keys.composition) is not None
        keys = msgspec.structs.replace(keys, **({} if declared else own))
        entries.append(
            _Entry(label, at, keys, None if declared else _reading(keys, making, label, at))
        )
    kinds = {entry.reading is None for entry in entries}
    if len(kinds) > 1:
        raise StudyError(
            f"{name}: some conformers are read from outputs, others declared",
            where=f"{where} conformers",
            mend="read all of them, or declare all of them: their enthalpies need one zero",
        )
    return entries


def _reading(keys: ConformerKeys, making: Making, label: str, where: str) -> Reading:
    """Read the outputs of one conformer; one without a frequency job has one single point."""
    key = "energy" if given(keys.frequencies) is None else "frequencies"
    file = getattr(keys, key)
    if not isinstance(file, str):
        raise StudyError(
            f"{label} has an energy of several parts and no frequency job",
            where=f"{where} energy",
            mend="name its frequency job, or one single point whose geometry is taken",
        )
    calc = making.read(file, f"{where} {key}")
    return Reading(calc, making.energy(label, keys, calc, where))


def _lend(entries: Sequence[_Entry], thermal: Thermal) -> list[_Entry]:
    """Give conformers without frequencies those of the nearest; StudyError where that is not asked."""
    donors = [entry.reading.frequencies for entry in entries if entry.reading and _has(entry)]
    done = []
    for entry in entries:
        reading = entry.reading
        if reading is None or _has(entry):
            done.append(entry)
            continue
        if thermal == "own":
            raise StudyError(
                f"{entry.name}: {reading.frequencies.path} has no frequencies",
                where=entry.where,
                mend='give its frequency job, or write thermal = "nearest" for the species: then it '
                "takes the wavenumbers of the conformer nearest in shape",
            )
        lent = with_nearest_modes(reading.frequencies, donors, where=entry.where)
        done.append(replace(entry, reading=replace(reading, lent=lent)))
    return done


def _has(entry: _Entry) -> bool:
    """Tell whether a conformer has frequencies, or is an atom and needs none."""
    reading = entry.reading
    return reading is not None and (
        reading.frequencies.wavenumbers_cm is not None or len(reading.frequencies.numbers) == 1
    )


def _check_levels(name: str, entries: Sequence[_Entry], where: str) -> None:
    """Make sure that the energies are of one level and, part by part, put together in one way."""
    read = [(entry, entry.reading) for entry in entries if entry.reading is not None]
    for entry, reading in read[1:]:
        first = read[0][1]
        if reading.energy.recipe != first.energy.recipe:
            raise StudyError(
                f"{name}: the energies of its conformers are not put together in one way: "
                f"{first.energy.words} for {read[0][0].name}, {reading.energy.words} for {entry.name}",
                where=f"{where} conformers",
                mend="give every conformer the same parts with the same factors",
            )
    check_energies(
        [reading.energy.calculations for _, reading in read],
        [
            None if reading.lent is not None else given(entry.keys.energy) is None
            for entry, reading in read
        ],
        name=name,
        where=f"{where} conformers",
    )
