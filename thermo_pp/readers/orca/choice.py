"""What is taken of an ORCA output with several energies: which geometry, which energy, which modes.

Taken are the modes of the last frequency analysis, their geometry and the best energy of it. An
analysis that an optimisation made for its own steps (``Calc_Hess``) counts only at the geometry at
which that optimisation ended. Without modes it is the last energy and its geometry.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from thermo_pp.readers import repulsion
from thermo_pp.readers.orca import energies, geometry, levels, vibrations
from thermo_pp.readers.orca import layout as layouts
from thermo_pp.readers.orca.energies import Energy
from thermo_pp.readers.orca.geometry import Geometry
from thermo_pp.readers.orca.layout import FREQUENCIES, Final, Layout
from thermo_pp.readers.orca.levels import Asked
from thermo_pp.readers.orca.vibrations import Vibrations
from thermo_pp.readers.text import CUT_SHORT, Text

CYCLE = b"GEOMETRY OPTIMIZATION CYCLE"
CONVERGED = b"THE OPTIMIZATION HAS CONVERGED"
_STEPS = (CYCLE, CONVERGED, b"FINAL ENERGY EVALUATION AT THE STATIONARY POINT")
_ANALYSED = (FREQUENCIES, b"NORMAL MODES", b"THERMOCHEMISTRY AT")
_REPULSION = b"\nNuclear Repulsion  :"
_ELECTRONS = re.compile(rb"\n *Number of Electrons +NEL +\.\.\.\. +(\d+)")
_PATHS = (b"Molecular Dynamics", b"MOLECULAR DYNAMICS", b"ORCA-MD", b"Nudged Elastic Band")
_OTHER_CHARGES = (b"core charge reduced", b"ointcharge", b"oint charge", b"POINT CHARGE", b"QMMM")
_THERMO_STEP = 2.1e-8


@dataclass(frozen=True)
class Run:
    """An optimisation: whether it reached its thresholds, and the offset at which that is said."""

    converged: bool
    at: int


@dataclass(frozen=True)
class Chosen:
    """What is taken.

    Attributes
    ----------
    shape : Geometry
    energy : Energy
        The best one of that geometry.
    own : Energy
        That of the modes, or of the last evaluation; `energy` unless another task has a better one.
    inputs : Asked
        What the input asks of the job of `energy`.
    modes : Vibrations or None
    run : Run or None
        The optimisation that led to `shape`.
    other : int or None
        Where coordinates of another molecule stand.
    """

    shape: Geometry
    energy: Energy
    own: Energy
    inputs: Asked
    modes: Vibrations | None
    run: Run | None
    other: int | None


def choose(text: Text, layout: Layout) -> Chosen:
    """Return what is taken; ReadError where that is not there or damaged."""
    finals = layouts.finals(text)
    if not finals:
        raise text.error(
            text.end,
            "no final energy in this output (looked for 'FINAL SINGLE POINT ENERGY')",
            mend="give the output of an energy, optimisation or frequency job",
        )
    _refuse_paths(text, layout)
    unfinished = layout.last(b"TOTAL SCF ENERGY")
    if layout.last(layouts.COORDINATES) > finals[-1].at and unfinished > finals[-1].at:
        raise text.error(
            unfinished, "an SCF without a final energy after it", mend="rerun or re-copy the output"
        )
    _check_headings(text, layout)
    jobs = layouts.jobs(text)
    optimises = text.has(CYCLE)
    base, modes = _last_analysis(text, layout, finals, optimises)
    shape = geometry.before(layout, base.at)
    _check_repulsion(text, base, shape)

    def energy_of(final: Final) -> tuple[Energy, Asked]:
        job = next(i for i, (start, end) in enumerate(jobs) if final.at < end or i == len(jobs) - 1)
        inputs = levels.asked(text, final.at, job, len(jobs))
        functional = bool(inputs.functionals)
        found = energies.energy(layout, final, inputs.method, functional, inputs.states)
        if found.label == "MP2" and inputs.words and not inputs.correlated:
            raise text.error(
                inputs.at,
                "an MP2 energy, but no keyword that is known says of which kind, scaled or not",
                mend="look at the keywords of the input: one is damaged, or not known to this reader",
            )
        return found, inputs

    own, inputs = energy_of(base)
    best = own
    for final in _beside(layout, finals, base, shape, jobs, modes is not None):
        if not final.converged:
            continue
        other, theirs = energy_of(final)
        if other.rank > best.rank:
            best, inputs = other, theirs
    if any("EXTRAPOL" in word for word in inputs.words):
        limit = energies.extrapolated(layout, best.final, best.label)
        if limit is None:
            raise text.error(
                text.end,
                "the input asks for an extrapolation to the basis-set limit, but its energy is not here",
                mend="check that the job ran to its end",
            )
        best = own = limit
    run = _run(text, layout, shape) if optimises else None
    return Chosen(shape, best, own, inputs, modes, run, _other(layout, shape))


def _refuse_paths(text: Text, layout: Layout) -> None:
    joined = b"\n".join(layout.titles)
    mark = next((mark for mark in _PATHS if mark in joined), None)
    if mark is not None:
        raise text.error(
            text.find(mark),
            "a job along a path or a trajectory, whose last structure is none of its own",
            mend="give a single point, an optimisation or a frequency job of one structure",
        )


def _check_headings(text: Text, layout: Layout) -> None:
    """Refuse a heading of an analysis whose rules are lost: it would not be seen."""
    for mark in _ANALYSED:
        for at in text.all(b"\n" + mark):
            if layout.next(mark, at) != at + 1:
                raise text.error(
                    at + 1, "a heading without the lines of dashes around it", mend=CUT_SHORT
                )
    modes = layout.all(b"NORMAL MODES")
    if len(modes) > len(layout.all(FREQUENCIES)):
        raise text.error(
            modes[-1],
            f"normal modes without their wavenumbers (looked for {FREQUENCIES.decode()!r})",
            mend=CUT_SHORT,
        )


def _check_repulsion(text: Text, final: Final, shape: Geometry) -> None:
    """Check the geometry of an evaluation against the nuclear repulsion printed with its energy.

    Not done where effective core potentials, ghost or dummy atoms or point charges are in the file.
    """
    at = text.part(final.start, final.at).last(_REPULSION)
    if at < 0 or shape.dummies:
        return
    printed = text.exact_text(at + len(_REPULSION), "the nuclear repulsion energy")
    why = repulsion.differs(printed, shape.numbers, shape.positions_angstrom, 5.1e-7)
    if why is None:
        return
    counted = _ELECTRONS.search(text.data, final.start, final.at)
    charge = levels.charge_and_multiplicity(text, final.at)[0]
    nuclei = int(shape.numbers.sum())
    whole = counted is None or charge is None or int(counted.group(1)) == nuclei - charge
    begin = max(text.last(b"INPUT FILE", final.at), 0)
    if whole and not any(text.find(mark, begin) >= 0 for mark in _OTHER_CHARGES):
        raise text.error(at + 1, why, mend=CUT_SHORT)


def _last_analysis(
    text: Text, layout: Layout, finals: list[Final], optimises: bool
) -> tuple[Final, Vibrations | None]:
    """Return the last analysis that counts, and the evaluation that it is of."""
    end = text.end
    last = None
    for heading in reversed(layout.all(FREQUENCIES)):
        before = [final for final in finals if final.at < heading]
        if not before:
            raise text.error(
                heading,
                "vibrations without an energy before them",
                mend="give the program's whole output",
            )
        shape = geometry.before(layout, heading)
        steps_on = optimises and any(0 <= text.find(mark, heading) < end for mark in _STEPS)
        if steps_on and last is None:
            last = geometry.before(layout, finals[-1].at)
        if not steps_on or (last is not None and shape.same(last)):
            if shape.ghosts or shape.dummies:
                raise text.error(
                    shape.at,
                    "frequencies of a molecule with ghost or dummy atoms are not read",
                    mend="rerun the frequency job without them",
                )
            modes = vibrations.vibrations(layout, heading, end, len(shape.numbers))
            return _evaluation_of(layout, before, modes, shape), modes
        end = heading
    return finals[-1], None


def _evaluation_of(
    layout: Layout, before: list[Final], modes: Vibrations, shape: Geometry
) -> Final:
    """Return the evaluation of the modes: the last one before them, or the one that they name."""
    if modes.electronic is None:
        return before[-1]
    for final in reversed(before):
        if abs(final.value - modes.electronic[0]) < _THERMO_STEP:
            return final if geometry.before(layout, final.at).same(shape) else before[-1]
    return before[-1]


def _beside(
    layout: Layout,
    finals: list[Final],
    base: Final,
    shape: Geometry,
    jobs: list[tuple[int, int]],
    analysed: bool,
) -> list[Final]:
    """Return other evaluations at the geometry of `base`, where a file may hold tasks of its own.

    Without modes and without several jobs, the last evaluation is what the job was for.
    """
    several = len(jobs) > 1 or len(layout.text.all(b"****END OF INPUT****")) > 1
    if not several and not analysed:
        return []
    found = []
    for final in finals if several else finals[-3:]:
        if final is base or not (several or final.at > base.at):
            continue
        other = geometry.before(layout, final.at)
        if other.same(shape):
            found.append(final)
        elif final is finals[-1]:
            geometry.masses(layout, other)  # not another geometry because of a damaged line
    return found


def _run(text: Text, layout: Layout, shape: Geometry) -> Run | None:
    """Return the last optimisation if it led to `shape`: it ended there, or took its steps to it."""
    cycle = text.last(CYCLE)
    start = text.data.rfind(b"\n", 0, cycle) + 1
    at = text.find(CONVERGED, cycle)
    if at < 0:
        same = geometry.before(layout, text.end).same(shape)
        failed = text.find(b"did not converge", cycle)
        return Run(False, start if failed < 0 else failed) if same else None
    following = layout.next(layouts.COORDINATES, at)
    after = geometry.block(layout, following) if following >= 0 else None
    before = geometry.before(layout, at)
    if before.same(shape) or (after is not None and after.same(shape)):
        return Run(True, at)
    return None


def _other(layout: Layout, shape: Geometry) -> int | None:
    """Return where another molecule's coordinates stand."""
    first = layout.next(layouts.COORDINATES, 0)
    block = geometry.block(layout, first)
    same = len(block.numbers) == len(shape.numbers) and bool((block.numbers == shape.numbers).all())
    return None if same else first
