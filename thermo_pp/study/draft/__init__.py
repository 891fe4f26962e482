"""Draft: a first study file from a folder of outputs, with every guess named."""

from __future__ import annotations

import os
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

from thermo_pp.collect import Collection
from thermo_pp.errors import Finding, StudyError
from thermo_pp.grouping import Grouped
from thermo_pp.names import Phase
from thermo_pp.records import Calculation
from thermo_pp.study.draft.doubts import doubts
from thermo_pp.study.draft.energies import SinglePoints, best_level, single_points
from thermo_pp.study.draft.members import Member, Members, members
from thermo_pp.study.draft.naming import can_be_written
from thermo_pp.study.draft.question import question
from thermo_pp.study.draft.steps import (
    NoStep,
    ProposedStep,
    associations,
    equals,
    saddle_step,
    written,
)
from thermo_pp.study.draft.text import Parts, study_text

__all__ = ["Draft", "draft"]

_TELLS_NOTHING = frozenset({"outputs", "output", "out", "logs", "results", "calculations"})


@dataclass(frozen=True, eq=False)
class Draft:
    """A drafted study.

    Attributes
    ----------
    text : str
        The study file, TOML with comments; it loads as it is.
    steps : tuple of ProposedStep
    without : tuple of NoStep
        Saddle points that no step goes through, and why.
    reactant : str or None
    products, held : tuple of str
    findings : tuple of Finding
        Every guess, and what was left out.
    """

    text: str
    steps: tuple[ProposedStep, ...]
    without: tuple[NoStep, ...]
    reactant: str | None
    products: tuple[str, ...]
    held: tuple[str, ...]
    findings: tuple[Finding, ...]


def draft(
    collection: Collection, folder: str | os.PathLike[str], *, beside: str | os.PathLike[str] = "."
) -> Draft:
    """Draft a study from what a folder holds.

    Parameters
    ----------
    collection : Collection
        Of that folder.
    folder : path
    beside : path
        The folder that the study file will stand in; the study names `folder` from there.

    Returns
    -------
    Draft
        The same for the same files.

    Raises
    ------
    StudyError
        Nothing can be read, nothing has frequencies, or no step joins what is there: a study needs
        one.
    """
    top = Path(folder)
    found, lowest, steps, without = _first_that_joins(collection, top)
    needed = _used(steps, found)
    level = best_level(single_points(_grouped(needed)), _grouped(needed))
    if level is not None:
        energies = _energies_at(level, found)
        lowest = found.lowest(energies)
        steps, without = _steps(found, lowest)
        needed = _used(steps, found)
    levels = single_points(_grouped(needed))
    level = best_level(levels, _grouped(needed))
    energies = {} if level is None else _energies_at(level, found)
    gibbs = {name: member.gibbs_with(energies.get(name)) for name, member in needed.items()}
    steps = [_downhill(step, gibbs) for step in steps]
    phase: Phase = "gas"
    if next(iter(needed.values())).calculation.solvent not in (None, "none"):
        phase = "solution"
    asked = question(steps, needed, gibbs)
    parts = Parts(
        title=_title(top.resolve()),
        outputs=_outputs(top, Path(beside)),
        files=_files(collection, top),
        found=found,
        used=tuple(needed),
        lowest=tuple(lowest),
        levels=levels,
        level=level,
        phase=phase,
        steps=tuple(steps),
        without=tuple(without),
        asked=asked,
        above=_above(found, lowest, needed, energies),
        equals={name: equals(name, lowest) for name in lowest if name not in needed},
    )
    return Draft(
        study_text(parts),
        parts.steps,
        parts.without,
        None if asked is None else asked.reactant,
        () if asked is None else asked.products,
        () if asked is None else (*asked.stated, *asked.equilibrium),
        doubts(parts, str(top)),
    )


def _first_that_joins(
    collection: Collection, folder: Path
) -> tuple[Members, dict[str, Member], list[ProposedStep], list[NoStep]]:
    """Return what there is at the first level of the frequencies at which a step joins anything."""
    first: StudyError | None = None
    for found in members(collection, folder):
        lowest = found.lowest({})
        steps, without = _steps(found, lowest)
        if steps:
            return found, lowest, steps, without
        first = first or _no_step(found, lowest, without, folder)
    assert first is not None  # there is one level at least
    raise first


def _steps(found: Members, lowest: Mapping[str, Member]) -> tuple[list[ProposedStep], list[NoStep]]:
    """Propose steps: those that build complexes, then those through saddle points."""
    steps = associations(lowest)
    without: list[NoStep] = []
    for name in found.saddles:
        step = saddle_step(name, found, lowest)
        if isinstance(step, NoStep):
            without.append(step)
        else:
            steps.append(step)
    return steps, without


def _used(steps: list[ProposedStep], found: Members) -> dict[str, Member]:
    """Return the species of the steps in the order of the files, saddle points last."""
    names = {name for step in steps for name in step.species}
    through = {step.through for step in steps}
    return {
        **{name: member for name, member in found.minima.items() if name in names},
        **{name: member for name, member in found.saddles.items() if name in through},
    }


def _grouped(found: Mapping[str, Member]) -> dict[str, Grouped]:
    return {name: member.grouped for name, member in found.items()}


def _energies_at(level: SinglePoints, found: Members) -> Mapping[str, Calculation]:
    """Return the single points at a level of all structures, those in no step too."""
    one = next(iter(level.of.values()))
    every = single_points(_grouped({**found.minima, **found.saddles}))
    return next(each.of for each in every if any(calc is one for calc in each.of.values()))


def _above(
    found: Members,
    lowest: Mapping[str, Member],
    used: Mapping[str, Member],
    energies: Mapping[str, Calculation],
) -> dict[str, tuple[tuple[str, float], ...]]:
    """Return for every species its conformers that no step uses, and how much higher they are."""
    above: dict[str, tuple[tuple[str, float], ...]] = {}
    for name in lowest:
        alike = found.conformers[name]
        own = energies if all(each in energies for each in alike) else {}
        gibbs = {each: found.minima[each].gibbs_with(own.get(each)) for each in alike}
        others = [(each, gibbs[each] - gibbs[name]) for each in alike if each not in used]
        if name in used and others:
            above[name] = tuple(sorted(others, key=lambda other: (other[1], other[0])))
    return above


def _downhill(step: ProposedStep, gibbs: Mapping[str, float]) -> ProposedStep:
    """Write a step through a saddle point downhill in G; one that builds a complex stays."""
    if step.through is None:
        return step
    left, right = (sum(gibbs[name] for name in side) for side in (step.left, step.right))
    return step if right <= left else step.reversed()


def _title(folder: Path) -> str:
    """Return the folder's name, that of the folder around it where it says nothing."""
    names = [name for name in (folder.name, folder.parent.name) if name]
    telling = [name for name in names if name.casefold() not in _TELLS_NOTHING]
    title = (telling or names or ["study"])[0]
    return title if can_be_written(title) else "study"


def _outputs(folder: Path, beside: Path) -> str:
    """Return the folder of the outputs as a study in the folder `beside` names it."""
    try:
        return Path(os.path.relpath(folder, beside)).as_posix()
    except ValueError:  # another drive
        return folder.resolve().as_posix()


def _files(collection: Collection, folder: Path) -> dict[str, str]:
    """Return path -> name from the folder of the outputs."""
    paths = [calc.path for calc in collection.calculations]
    paths += [path for path, _ in collection.failed]
    return {path: Path(os.path.relpath(path, folder)).as_posix() for path in paths}


def _no_step(
    found: Members, lowest: Mapping[str, Member], without: list[NoStep], folder: Path
) -> StudyError:
    """Say why there is no step, and what is there."""
    reasons = [f"{each.saddle}: {' '.join(each.words)}" for each in without]
    if not found.saddles:
        reasons = ["no saddle point, and no minimum that falls apart into two others"]
        alike = {name: equals(name, lowest) for name in lowest}
        reasons += [f"{name} has the atoms of {sets}" for name, sets in alike.items() if sets][:3]
    reasons.append(
        f"minima: {written(list(lowest)).replace(' + ', ', ')}" if lowest else "no minima"
    )
    reasons += [f"{path}: {why}" for path, why in found.left_out[:3]]
    return StudyError(
        "no step joins what is in this folder; " + "; ".join(reasons),
        where=str(folder),
        mend="add the saddle point, and the minima on both of its sides, with their frequencies",
    )
