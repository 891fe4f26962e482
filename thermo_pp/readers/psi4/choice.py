"""What is taken of a Psi4 output of several tasks: which geometry, which energy, which modes."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from thermo_pp.readers.psi4 import energies, jobs, vibrations
from thermo_pp.readers.psi4.energies import Energy
from thermo_pp.readers.psi4.jobs import Asked, Evaluation, Geometry, Optimisation
from thermo_pp.readers.psi4.vibrations import ANALYSIS
from thermo_pp.readers.text import Text

_PATH = b"IRC data object created"
_FRAGMENTS = (b"N-Body Interaction Abacus", b"==> N-Body")
_ENERGY_STEP = 1.1e-8
"""The last digit of the energy that the thermochemistry prints, hartree."""


@dataclass(frozen=True)
class Tasks:
    """The evaluations at undisplaced geometries, their geometries, and the optimisations."""

    real: list[Evaluation]
    shapes: dict[Evaluation, Geometry]
    runs: list[Optimisation]


@dataclass(frozen=True)
class Chosen:
    """What is taken.

    Attributes
    ----------
    tasks : Tasks
    analysis : Text or None
        The part with the modes.
    base : Evaluation
        The one whose geometry is taken, that of the modes where there are modes.
    shape : Geometry
    part : Text
        The evaluation whose energy is taken.
    energy : Energy
    run : Optimisation or None
        The optimisation that led to the geometry, or an unfinished one of the same molecule.
    """

    tasks: Tasks
    analysis: Text | None
    base: Evaluation
    shape: Geometry
    part: Text
    energy: Energy
    run: Optimisation | None


def check_asked(text: Text, asked: tuple[Asked, ...]) -> None:
    """Refuse what is no energy of the molecule alone, methods not known here, and what is not there."""
    for mark in _FRAGMENTS:
        at = text.find(mark)
        if at >= 0:
            raise text.error(
                at,
                "a job over fragments of the molecule, whose energies are not read",
                mend="give single calculations, one of each molecule",
            )
    for one in asked:
        lacking = _lacking(text, one)
        if lacking is not None:
            raise text.error(
                one.at,
                f"the input asks for {one.task}({one.method!r}), but {lacking}",
                mend="check that the job ran as asked; another Psi4 version may print otherwise",
            )


def _lacking(text: Text, one: Asked) -> str | None:
    """Return what the output lacks of what was asked for, in words."""
    if one.task.startswith("freq") and text.find(ANALYSIS) < 0:
        return f"no vibrations are in the output (looked for {ANALYSIS.decode()!r})"
    method = one.method.partition("/")[0].removeprefix("df-").removeprefix("cd-")
    if energies.is_functional(text, method):
        return None
    if method not in energies.CALLED:
        return f"only {', '.join(energies.CALLED)} and density functionals are known to this reader"
    label = energies.CALLED[method]
    if label is not None and not energies.is_printed(text, label):
        return f"no {label} energy is in the output"
    if "[" in one.method and not energies.is_extrapolated(text):
        return "no extrapolated energy is in the output"
    return None


def tasks(text: Text, echoes: list[tuple[int, int]]) -> Tasks:
    """Return what the file holds; ReadError where that is nothing."""
    real = [one for one in jobs.evaluations(text, echoes) if not one.displaced]
    if not real:
        raise text.error(
            text.end,
            "no SCF in this output (looked for 'Running in ... symmetry')",
            mend="give the output of an energy, optimisation or frequency job",
        )
    shapes = {one: jobs.geometry(text, one.start) for one in real}
    return Tasks(real, shapes, jobs.optimisations(text, real))


def choose(text: Text, tasks: Tasks) -> Chosen:
    """Return what is taken of the tasks; ReadError where that is not of the molecule alone, or a path."""
    _check_path(text, tasks)
    analysis, base = _last_analysis(text, tasks)
    if analysis is not None:
        _check_bottom(analysis, energies.best_energy(text.part(base.start, base.end)))
    shape = tasks.shapes[base]
    part, energy = _best_energy(text, tasks, base)
    charges = energies.charged(part)
    if charges is not None:
        raise text.error(
            charges,
            "charges or fields around the molecule, which are in its energy",
            mend="they are not read; give a calculation of the molecule alone",
        )
    return Chosen(tasks, analysis, base, shape, part, energy, _own_run(tasks, shape))


def _check_path(text: Text, tasks: Tasks) -> None:
    """Refuse a reaction path, which its optimiser announces after the first evaluation."""
    first = tasks.real[0]
    for one in {first, *(run.last for run in tasks.runs)}:
        path = text.data.find(_PATH, one.start, one.end)
        if path >= 0:
            raise text.error(
                path,
                "a reaction path (IRC), whose last energy is of no stationary point",
                mend="give a single point, an optimisation or frequencies of the geometry you want",
            )


def _last_analysis(text: Text, tasks: Tasks) -> tuple[Text | None, Evaluation]:
    """Return the last frequency analysis, None where there is none, and the evaluation it is of.

    An analysis that an optimisation made for its own steps counts only at the geometry at which the
    optimisation ended. Without an analysis the last evaluation is returned.
    """
    finals = [tasks.shapes[run.last] for run in tasks.runs]
    starts = [at for at in text.all(ANALYSIS) if at > tasks.real[0].start]
    for start, end in reversed(list(pairwise([*starts, text.end]))):
        before = [one for one in tasks.real if one.start < start]
        following = tasks.real[len(before)].start if len(before) < len(tasks.real) else text.end
        shape = tasks.shapes[before[-1]]
        if not jobs.steps_on(text, start, following) or any(shape.same(final) for final in finals):
            return text.part(start, end), before[-1]
    return None, tasks.real[-1]


def _best_energy(text: Text, tasks: Tasks, base: Evaluation) -> tuple[Text, Energy]:
    """Return the best energy at the geometry of `base` and the evaluation it is of.

    Of equally good energies the last one counts. An evaluation beside `base` whose SCF did not
    converge is passed over; if `base` is one, that is the error. One that holds its occupations to
    those of a start (MOM) is most often an excited state: an error where there is no other.
    """
    shape = tasks.shapes[base]
    found: list[tuple[Text, Energy]] = []
    for one in tasks.real:
        part = text.part(one.start, one.end)
        if one is base or (shape.same(tasks.shapes[one]) and energies.unconverged(part) is None):
            found.append((part, energies.best_energy(part)))
    free = [pair for pair in found if energies.held(pair[0]) is None]
    if not free:
        raise text.error(
            energies.held(found[-1][0]) or found[-1][0].start,
            "an SCF with occupations held to those of a start (MOM), most often an excited state",
            mend="give a calculation of the ground state, without mom_start",
        )
    return max(free, key=lambda pair: (pair[1].rank, pair[1].at))


def _check_bottom(analysis: Text, lowest: Energy) -> None:
    """Refuse an analysis whose electronic energy is not that of the geometry it should be of."""
    bottom = vibrations.bottom_energy(analysis)
    if bottom is None or abs(bottom[0].value - lowest.value) <= _ENERGY_STEP:
        return
    raise analysis.error(
        bottom[1],
        f"the thermochemistry starts from {bottom[0].text} hartree, but the energy of its geometry "
        f"is {lowest.value:.8f} (line {analysis.line_number(lowest.at)})",
        mend="rerun the frequency job by itself",
    )


def _own_run(tasks: Tasks, shape: Geometry) -> Optimisation | None:
    """Return the optimisation that led to `shape`, or an unfinished one of the same molecule."""
    for run in reversed(tasks.runs):
        final = tasks.shapes[run.last]
        if shape.same(final):
            return run
        if not run.converged and np.array_equal(final.numbers, shape.numbers):
            return run
    return None
