"""Grouping: what belongs together among the calculations of a folder.

A frequency job with the single points at its geometry, the same structure twice, conformers of one
molecule, and which minima together have the atoms and the charge of another structure.
"""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from thermo_pp.audit.duplicates import SAME_ANGSTROM, SAME_ENERGY_HARTREE
from thermo_pp.audit.levels import stated_level
from thermo_pp.errors import StudyError
from thermo_pp.formulas.bonds import LABEL, Fragments, usual_fragments
from thermo_pp.formulas.superposition import match
from thermo_pp.names import Kind
from thermo_pp.pairing import SAME_GEOMETRY_ANGSTROM, pair
from thermo_pp.records import Calculation

MOST_MOLECULES = 3
"""How many molecules may stand on one side of a step."""
GRID = "grid"
"""The one field of the level of theory that does not keep calculations apart here."""

FloatArray = NDArray[np.float64]
Level = Mapping[str, str]


@dataclass(frozen=True, eq=False)
class Grouped:
    """One structure with everything in the folder that belongs to it.

    Attributes
    ----------
    frequencies : Calculation
        Its frequency job; of an atom any job.
    singles : tuple of Calculation
        Single points at its geometry, in the order of the files.
    copies : tuple of Calculation
        Further frequency jobs of the same structure at the same level, mirror images included.
    fragments : Fragments
        The molecules that it consists of by its bonds.
    """

    frequencies: Calculation
    singles: tuple[Calculation, ...]
    copies: tuple[Calculation, ...]
    fragments: Fragments = field(repr=False)

    @property
    def role(self) -> Kind | None:
        """Minimum or saddle point; None with two imaginary modes or more."""
        imaginary = self.frequencies.imaginary_modes or 0
        return ("minimum", "saddle")[imaginary] if imaginary < 2 else None

    @property
    def content(self) -> Counter[int]:
        """How many atoms of each kind it has; isotopes of hydrogen are kinds of their own."""
        return Counter(atom_kinds(self.frequencies).tolist())


@dataclass(frozen=True, eq=False)
class Grouping:
    """The calculations of a folder, grouped.

    Attributes
    ----------
    structures : tuple of Grouped
        In the order of the files.
    alone : tuple of Calculation
        Calculations without frequencies that are at the geometry of no frequency job.
    """

    structures: tuple[Grouped, ...]
    alone: tuple[Calculation, ...]


def atom_kinds(calculation: Calculation) -> NDArray[np.int64]:
    """Return the kind of each atom, shape (n,): its number, with a label where it is D or T."""
    z = calculation.numbers
    heavier = np.rint(calculation.masses_u).astype(np.int64) - 1
    return np.where((z == 1) & (heavier > 0), z + LABEL * heavier, z)


def same_level(one: Level, other: Level) -> bool:
    """Tell whether nothing that both levels state differs; grids may."""
    return all(
        value == other[name] for name, value in one.items() if name in other and name != GRID
    )


def levels_of(calculations: Sequence[Calculation]) -> list[list[Calculation]]:
    """Sort calculations by level of theory, the most frequent first.

    What a file does not state joins the first level that it does not contradict.
    """
    stated = sorted(calculations, key=lambda calc: -len(stated_level(calc)))
    groups: list[tuple[dict[str, str], list[Calculation]]] = []
    for calc in stated:
        level = stated_level(calc)
        for known, members in groups:
            if same_level(level, known):
                members.append(calc)
                known.update({name: level[name] for name in level if name not in known})
                break
        else:
            groups.append((dict(level), [calc]))
    order = {id(calc): k for k, calc in enumerate(calculations)}
    for _, members in groups:
        members.sort(key=lambda calc: order[id(calc)])
    groups.sort(key=lambda group: (-len(group[1]), order[id(group[1][0])]))
    return [members for _, members in groups]


def group(calculations: Iterable[Calculation]) -> Grouping:
    """Group the calculations of a folder.

    Parameters
    ----------
    calculations : iterable of Calculation
        In the order of the files; the answer keeps it.
    """
    jobs, others = _frequency_jobs(list(calculations))
    by_content: dict[object, list[Calculation]] = defaultdict(list)
    for job in jobs:
        by_content[_content(job)].append(job)
    distances = _Distances()
    singles: dict[int, list[Calculation]] = defaultdict(list)
    alone: list[Calculation] = []
    for other in others:
        owners = [
            job for job in by_content[_content(other)] if _same_geometry(job, other, distances)
        ]
        for job in owners:
            singles[id(job)].append(other)
        if not owners:
            alone.append(other)
    structures: dict[int, Grouped] = {}
    for members in _alike(by_content.values(), distances):
        job = max(members, key=lambda calc: len(singles[id(calc)]))
        structures[id(job)] = Grouped(
            job,
            tuple(singles[id(job)]),
            tuple(calc for calc in members if calc is not job),
            usual_fragments(atom_kinds(job), job.positions_angstrom),
        )
    return Grouping(
        tuple(structures[id(job)] for job in jobs if id(job) in structures), tuple(alone)
    )


def _alike(
    groups: Iterable[Sequence[Calculation]], distances: _Distances
) -> Iterator[list[Calculation]]:
    """Yield frequency jobs together with those that are the same structure at the same level."""
    for jobs in groups:
        found: list[list[Calculation]] = []
        for job in jobs:
            for members in found:
                if _same_structure(job, members[0], distances):
                    members.append(job)
                    break
            else:
                found.append([job])
        yield from found


def _frequency_jobs(
    calculations: list[Calculation],
) -> tuple[list[Calculation], list[Calculation]]:
    """Part the jobs with frequencies from all others; each atom without one gets its best stand-in.

    That is the job at the level that most frequency jobs have, the first of several.
    """
    jobs = [calc for calc in calculations if calc.wavenumbers_cm is not None]
    levels = levels_of([calc for calc in jobs if len(calc.numbers) > 1] or jobs)
    usual = stated_level(levels[0][0]) if levels else {}
    have = {_content(job) for job in jobs}
    atoms: dict[tuple[tuple[int, ...], int | None], list[Calculation]] = defaultdict(list)
    for calc in calculations:
        if len(calc.numbers) == 1 and calc.energy_hartree is not None:
            atoms[_content(calc), calc.multiplicity].append(calc)
    chosen: set[int] = set()
    for (content, _), candidates in atoms.items():
        if content not in have:
            best = [calc for calc in candidates if same_level(stated_level(calc), usual)]
            chosen.add(id((best or candidates)[0]))
    is_job = [calc.wavenumbers_cm is not None or id(calc) in chosen for calc in calculations]
    return (
        [calc for calc, yes in zip(calculations, is_job, strict=True) if yes],
        [calc for calc, yes in zip(calculations, is_job, strict=True) if not yes],
    )


class _Distances:
    """All distances between the atoms of a calculation, sorted; each worked out once."""

    def __init__(self) -> None:
        self.known: dict[int, FloatArray] = {}

    def of(self, calc: Calculation) -> FloatArray:
        if id(calc) not in self.known:
            x = calc.positions_angstrom
            first, second = np.triu_indices(len(x), k=1)
            self.known[id(calc)] = np.sort(np.linalg.norm(x[first] - x[second], axis=-1))
        return self.known[id(calc)]

    def agree(self, one: Calculation, other: Calculation, rmsd_angstrom: float) -> bool:
        """Tell whether the two can be as close as `rmsd_angstrom`."""
        # one atom alone may be off by this much, and a distance by twice that
        most = 2.0 * rmsd_angstrom * np.sqrt(len(one.numbers))
        return bool(np.all(np.abs(self.of(one) - self.of(other)) <= most))


def _content(calc: Calculation) -> tuple[int, ...]:
    return tuple(sorted(calc.numbers.tolist()))


def _same_state(one: Calculation, other: Calculation) -> bool:
    return all(
        None in pair_ or pair_[0] == pair_[1]
        for pair_ in ((one.charge, other.charge), (one.multiplicity, other.multiplicity))
    )


def _same_structure(one: Calculation, other: Calculation, distances: _Distances) -> bool:
    """Tell whether two frequency jobs are of one structure, or of its mirror image, at one level."""
    if one.sha256 == other.sha256:
        return True
    kinds = [atom_kinds(calc) for calc in (one, other)]
    if (
        not _same_state(one, other)
        or sorted(kinds[0].tolist()) != sorted(kinds[1].tolist())
        or one.imaginary_modes != other.imaginary_modes
        or not same_level(stated_level(one), stated_level(other))
    ):
        return False
    if None not in (one.energy_hartree, other.energy_hartree) and (
        abs(float(one.energy_hartree or 0.0) - float(other.energy_hartree or 0.0))
        > SAME_ENERGY_HARTREE
    ):
        return False
    if not distances.agree(one, other, SAME_ANGSTROM):
        return False
    a, b = (kinds[0], one.positions_angstrom), (kinds[1], other.positions_angstrom)
    return any(
        match(*a, *b, mirror=mirror, enough_angstrom=SAME_ANGSTROM) < SAME_ANGSTROM
        for mirror in (False, True)
    )


def _same_geometry(job: Calculation, single: Calculation, distances: _Distances) -> bool:
    """Tell whether a single point belongs to a frequency job."""
    if not distances.agree(job, single, SAME_GEOMETRY_ANGSTROM):
        return False
    try:
        pair(job, single, where=single.path)
    except StudyError:
        return False
    return True


def conformers(structures: Sequence[Grouped]) -> tuple[tuple[int, ...], ...]:
    """Return the numbers of those minima that are one molecule, or one set of molecules.

    The same bonds, charge and multiplicity; in the order of the structures, saddle points left out.
    """
    groups: dict[object, list[int]] = defaultdict(list)
    for number, structure in enumerate(structures):
        if structure.role == "minimum":
            calc = structure.frequencies
            groups[structure.fragments, calc.charge, calc.multiplicity].append(number)
    return tuple(tuple(members) for members in groups.values())


def balances(
    target: Grouped, minima: Mapping[str, Grouped], most: int = MOST_MOLECULES
) -> tuple[tuple[str, ...], ...]:
    """Return every set of minima that has the atoms, the charge and a possible spin of `target`.

    Parameters
    ----------
    target : Grouped
    minima : mapping of str to Grouped
    most : int
        How many molecules a set may have.

    Returns
    -------
    tuple of tuple of str
        Names, a molecule that is there twice named twice; small sets first, then in the order of
        `minima`.
    """
    found: list[tuple[str, ...]] = []
    content = {name: structure.content for name, structure in minima.items()}
    names = [name for name in minima if content[name] <= target.content]
    with_content: dict[object, list[int]] = defaultdict(list)
    for k, name in enumerate(names):
        with_content[frozenset(content[name].items())].append(k)

    def search(chosen: tuple[str, ...], left: Counter[int], start: int) -> None:
        for k in with_content[frozenset(left.items())]:
            members = (*chosen, names[k])
            if k >= start and _charge_and_spin_fit([minima[name] for name in members], target):
                found.append(members)
        if len(chosen) + 1 < most:
            for k in range(start, len(names)):
                if content[names[k]] < left:
                    search((*chosen, names[k]), left - content[names[k]], k)

    search((), target.content, 0)
    return tuple(sorted(found, key=len))


def _charge_and_spin_fit(members: Sequence[Grouped], target: Grouped) -> bool:
    """Tell whether charges add up and spins can couple to that of the target; unknown ones may."""
    charges = [member.frequencies.charge for member in members]
    spins = [member.frequencies.multiplicity for member in members]
    want, spin = target.frequencies.charge, target.frequencies.multiplicity
    if want is not None and None not in charges and sum(q or 0 for q in charges) != want:
        return False
    if spin is None or None in spins:
        return True
    possible = {0}
    for twice in ((m or 1) - 1 for m in spins):
        possible = {total for s in possible for total in range(abs(s - twice), s + twice + 1, 2)}
    return spin - 1 in possible
