"""Found: the ensembles of a folder, molecules told apart by their bonds, levels kept apart."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Mapping, Sequence
from pathlib import PurePath

from thermo_pp.conditions import Treatment
from thermo_pp.ensemble.levels import check_energies
from thermo_pp.ensemble.model import Ensemble
from thermo_pp.ensemble.nearest import with_nearest_modes
from thermo_pp.errors import Finding, StudyError
from thermo_pp.formulas.bonds import usual_fragments
from thermo_pp.grouping import Grouping, atom_kinds, conformers, group, levels_of
from thermo_pp.names import Duplicates, Thermal
from thermo_pp.records import Calculation
from thermo_pp.species import Structure

MOST_NAMED = 6


def ensemble_of(
    calculations: Sequence[Calculation],
    treatment: Treatment,
    *,
    name: str,
    duplicates: Duplicates,
    thermal: Thermal,
    where: str,
) -> tuple[Ensemble, list[Finding]]:
    """Return the ensemble of calculations with their own energies, and what was lent to whom.

    Parameters
    ----------
    calculations : sequence of Calculation
    treatment : Treatment
    name : str
    duplicates : {"count", "once"}
    thermal : {"own", "nearest"}
        What is done with one that has no frequencies.
    where : str
        For messages.

    Raises
    ------
    StudyError
        One without frequencies where none are lent, energies of several levels, and whatever
        `Structure.make` and `Ensemble.make` raise.
    """
    donors = [calc for calc in calculations if calc.wavenumbers_cm is not None]
    check_energies(
        [{"energy": [calc]} for calc in calculations],
        [True] * len(calculations),
        name=name,
        where=where,
    )
    models, sources, findings = [], [], []
    for calc in calculations:
        source = None
        used = calc
        if calc.wavenumbers_cm is None and len(calc.numbers) > 1 and thermal == "nearest":
            used, source, finding = with_nearest_modes(calc, donors, where=where)
            findings.append(finding)
        models.append(Structure.make(used, treatment, name=PurePath(calc.path).stem))
        sources.append(source)
    ensemble = Ensemble.make(
        models, name=name, duplicates=duplicates, thermal_from=sources, where=where
    )
    return ensemble, findings


def ensembles_in(
    calculations: Iterable[Calculation],
    files: Mapping[str, Sequence[Calculation]],
    treatment: Treatment,
    *,
    duplicates: Duplicates,
    thermal: Thermal,
) -> tuple[list[Ensemble], list[Finding]]:
    """Return an ensemble for every molecule at every level of theory, in the order of the files.

    Parameters
    ----------
    calculations : iterable of Calculation
        Of a folder: minima are grouped by their bonds, charge, multiplicity and level. Energies are
        those of the frequency jobs.
    files : mapping of str to sequence of Calculation
        Name of a file of several structures -> its structures: one ensemble each.
    treatment, duplicates, thermal
        See `ensemble_of`.

    Returns
    -------
    list of Ensemble
    list of Finding
        An ensemble that cannot be computed is a finding of severity error.
    """
    given = list(calculations)
    grouping = group(given)
    order = {id(calc): number for number, calc in enumerate(given)}
    sets = sorted(_sets(grouping, thermal, order), key=lambda members: order[id(members[0])])
    findings = _left_out(grouping, thermal)
    often = Counter(members[0].formula for members in sets)
    named = [(_name(members[0], often), members) for members in sets]
    named += [(PurePath(file).stem, list(members)) for file, members in files.items()]
    ensembles = []
    for name, members in named:
        where = members[0].path
        try:
            found, lent = ensemble_of(
                members,
                treatment,
                name=name,
                duplicates=duplicates,
                thermal=thermal,
                where=where,
            )
        except StudyError as error:
            findings.append(Finding("not-computed", "error", where, None, error.what, error.mend))
            continue
        ensembles.append(found)
        findings += lent
    return ensembles, findings


def _name(first: Calculation, often: Mapping[str, int]) -> str:
    """Return the formula, with the first file's name where there are two of this formula."""
    alone = often[first.formula] == 1
    return first.formula if alone else f"{first.formula} {PurePath(first.path).stem}"


def _sets(
    grouping: Grouping, thermal: Thermal, order: Mapping[int, int]
) -> Iterable[list[Calculation]]:
    """Yield the calculations of each molecule at each level."""
    for numbers in conformers(grouping.structures):
        structures = [grouping.structures[number] for number in numbers]
        members = [calc for one in structures for calc in (one.frequencies, *one.copies)]
        if thermal == "nearest":
            first = structures[0]
            members += [
                calc
                for calc in grouping.alone
                if calc.energy_hartree is not None
                and (calc.charge, calc.multiplicity)
                == (first.frequencies.charge, first.frequencies.multiplicity)
                and usual_fragments(atom_kinds(calc), calc.positions_angstrom) == first.fragments
            ]
        for level in levels_of(members):
            if any(calc.wavenumbers_cm is not None or len(calc.numbers) == 1 for calc in level):
                yield sorted(level, key=lambda calc: order[id(calc)])


def _left_out(grouping: Grouping, thermal: Thermal) -> list[Finding]:
    """Say what of a folder is in no ensemble."""
    singles = [calc.path for one in grouping.structures for calc in one.singles]
    saddles = [one.frequencies.path for one in grouping.structures if one.role != "minimum"]
    alone = [calc.path for calc in grouping.alone] if thermal == "own" else []
    found = []
    if singles:
        found.append(
            Finding(
                "single-points-not-used",
                "note",
                None,
                None,
                "single points at the geometry of a conformer, not used: energies are those of the "
                f"frequency jobs: {_files(singles)}",
                "name them as the energy of each conformer in a study file",
            )
        )
    if saddles:
        found.append(
            Finding(
                "saddle-points-left-out",
                "note",
                None,
                None,
                f"not minima, so in no ensemble: {_files(saddles)}",
                "list the conformers of a saddle point in a study file",
            )
        )
    if alone:
        found.append(
            Finding(
                "no-frequencies",
                "note",
                None,
                None,
                f"no frequencies, so in no ensemble: {_files(alone)}",
                "give the frequency job, or --thermal nearest to lend it those of the nearest "
                "conformer",
            )
        )
    return found


def _files(files: Sequence[str]) -> str:
    more = f" and {len(files) - MOST_NAMED} more" if len(files) > MOST_NAMED else ""
    return ", ".join(files[:MOST_NAMED]) + more
