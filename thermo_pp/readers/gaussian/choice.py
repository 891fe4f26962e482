"""What is taken of a Gaussian output of several steps: which geometry, which energy, which modes.

Taken are the modes of the last step that has them at a geometry it does not leave, their geometry
and the best energy of it. Which of a step's energies belongs to the modes (there are displaced ones
where derivatives are numerical) is told by the sums of the thermochemistry. Without modes it is the
last energy and its geometry. "Optimization completed" in a frequency step means nothing.
"""

from __future__ import annotations

import re
from collections import Counter
from dataclasses import dataclass

from thermo_pp.data.elements import SYMBOLS
from thermo_pp.readers import repulsion
from thermo_pp.readers.gaussian import energies, geometry, vibrations
from thermo_pp.readers.gaussian.energies import Energy
from thermo_pp.readers.gaussian.geometry import Geometry
from thermo_pp.readers.gaussian.steps import Step
from thermo_pp.readers.gaussian.vibrations import Thermochemistry, Vibrations
from thermo_pp.readers.text import CUT_SHORT, Text

_COMPLETED = b"Optimization completed"
_STOPPED = b"Optimization stopped"
_SUMS = 2.1e-6
_REPULSION = b"    nuclear repulsion energy"
_ELECTRONS = re.compile(rb"\n *(\d+) alpha electrons +(\d+) beta electrons")
_CHARGES = re.compile(r"(?<![\w-])(?:charge|oniom|massage|field)(?![\w-])", re.IGNORECASE)


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
    base : Step
        The step of geometry and modes.
    shape : Geometry
    step : Step
        That of the energy.
    energy : Energy or None
        The best one of that geometry; None where the modes are not of a ground state.
    own : Energy or None
        That of the modes.
    modes : Vibrations or None
        Also those of an atom, which has none.
    thermo : Thermochemistry or None
    run : Run or None
    other : int or None
        Where a geometry of other atoms stands.
    """

    base: Step
    shape: Geometry
    step: Step
    energy: Energy | None
    own: Energy | None
    modes: Vibrations | None
    thermo: Thermochemistry | None
    run: Run | None
    other: int | None


def choose(text: Text, found: list[Step]) -> Chosen:
    """Return what is taken; ReadError where it is not there or damaged."""
    _check_asked(text, found)
    base, first_mode, thermo_at = _last_analysis(found)
    places = base.energies_at
    if not places:
        raise text.error(
            base.end,
            "no energy in this step (looked for 'SCF Done:')",
            mend="give the output of an energy, optimisation or frequency job of HF, DFT or above",
        )
    blocks = base.blocks
    modes: Vibrations | None = None
    thermo: Thermochemistry | None = None
    own: Energy | None
    if thermo_at >= 0 or first_mode >= 0:
        thermo = vibrations.thermochemistry(base)
        index, own = _of_modes(base, places, thermo)
        shape = _shape_before(base, blocks, places[index])
        if shape.dummies:
            raise text.error(
                shape.at,
                "frequencies of a molecule with dummy atoms in its geometry are not read",
                mend="rerun the frequency job without them",
            )
        if first_mode >= 0:
            count = len(shape.numbers)
            modes = vibrations.vibrations(
                base.part, first_mode, count, projected=base.asks_projection
            )
    else:
        own = energies.energy(base, len(places) - 1, places)
        shape = _shape_before(base, blocks, places[-1])
    step, energy = base, own
    if own is not None:
        for one in found:
            if one is base or len(found) > 20:
                continue
            theirs = _beside(one, shape)
            if theirs is not None and theirs.rank > (energy.rank if energy else 0):
                step, energy = one, theirs
    return Chosen(
        base,
        shape,
        step,
        energy,
        own,
        modes,
        thermo,
        _run(found, base, shape),
        _other(found, shape),
    )


def _check_asked(text: Text, found: list[Step]) -> None:
    """Refuse a job whose route asks for frequencies that are not there."""
    asked = [step for step in found if step.asks_frequencies]
    if not asked or not found[-1].finished:
        return
    if max(step.thermochemistry_at for step in found) < asked[-1].start:
        raise text.error(
            text.end,
            f"the route asks for frequencies ({asked[-1].route.strip()[:60]!r}), but none are here",
            mend="check that the job ran to its end",
        )


def _last_analysis(found: list[Step]) -> tuple[Step, int, int]:
    """Return the last step with modes, where its modes and its thermochemistry begin; -1 without any."""
    for step in reversed(found):
        thermo = step.thermochemistry_at
        before = vibrations.sets(step)
        if thermo < 0 and not before:
            continue
        if step.optimises and step.energies_at[-1:] > [thermo if thermo >= 0 else before[-1]]:
            continue  # of a geometry that the optimisation left
        if before:
            return step, _first_of_last(step, before), thermo
        if thermo >= 0:
            return step, -1, thermo
    return found[-1], -1, -1


def _first_of_last(step: Step, before: list[int]) -> int:
    """Return the first of the sets of modes that belong to one geometry, the last one."""
    blocks = step.blocks
    last_block = max((at for at in blocks if at < before[-1]), default=step.start)
    return next(at for at in before if at > last_block)


def _of_modes(
    step: Step, places: list[int], thermo: Thermochemistry | None
) -> tuple[int, Energy | None]:
    """Return which evaluation the modes are of, and its energy; none where no energy fits the sums."""
    if thermo is None:
        return len(places) - 1, energies.energy(step, len(places) - 1, places)
    before = [i for i, at in enumerate(places) if at < thermo.at] or [0]
    order = [before[-1], *before[:-1]]
    for index in order:
        found = energies.energy(step, index, places)
        if abs(found.value - thermo.electronic) < _SUMS:
            return index, found
    return (before[-1] if len(before) == 1 else before[0]), None


def _shape_before(step: Step, blocks: list[int], at: int) -> Geometry:
    """Return the geometry of an evaluation: the last block before it, that of the step's start without one."""
    before = [block for block in blocks if block < at]
    if not before:
        raise step.text.error(
            at,
            "no geometry before this line (looked for 'Standard orientation:' and 'Input orientation:')",
            mend="give the program's whole output",
        )
    shape = geometry.block(step.text, before[-1])
    said = step.atoms
    if said is not None and said != len(shape.numbers):
        raise step.text.error(
            shape.at,
            f"{len(shape.numbers)} atoms in this geometry, but the program says NAtoms= {said}",
            mend="the output is damaged here; rerun or re-copy it",
        )
    counted = step.formula
    if counted is not None and not shape.dummies:
        own = Counter(SYMBOLS[z] for z in shape.numbers.tolist())
        if own != counted[0]:
            raise step.text.error(
                shape.at,
                "not the elements of this geometry that the program counts on line "
                f"{step.text.line_number(counted[1])}",
                mend="the output is damaged here; rerun or re-copy it",
            )
    _check_repulsion(step, shape, at)
    return shape


def _check_repulsion(step: Step, shape: Geometry, at: int) -> None:
    """Check the geometry of an evaluation against the nuclear repulsion printed before it.

    Not done where the electrons do not make up for the nuclei (effective core potentials, valence methods, a part of
    the molecule) or point charges count too.
    """
    text, state = step.text, step.state
    place = text.data.rfind(_REPULSION, shape.at, at)
    counted = None if place < 0 else _ELECTRONS.search(text.data, max(place - 300, shape.at), place)
    if counted is None or state is None or _CHARGES.search(step.route) is not None:
        return
    if int(counted.group(1)) + int(counted.group(2)) != int(shape.numbers.sum()) - state[0]:
        return
    printed = text.exact_text(place + len(_REPULSION), "the nuclear repulsion energy")
    why = repulsion.differs(printed, shape.numbers, shape.positions_angstrom, 5.1e-7)
    if why is not None:
        raise text.error(place, why, mend=CUT_SHORT)


def _beside(step: Step, shape: Geometry) -> Energy | None:
    """Return the last energy of another step if it is of the same geometry."""
    places = step.energies_at
    blocks = step.blocks
    if not places or not any(block < places[-1] for block in blocks):
        return None
    if not _shape_before(step, blocks, places[-1]).same(shape):
        return None
    return energies.energy(step, len(places) - 1, places)


def _run(found: list[Step], base: Step, shape: Geometry) -> Run | None:
    """Return the last optimisation, of the base step or before it, if it led to `shape`."""
    for step in reversed(found[: found.index(base) + 1]):
        if not step.optimises:
            continue
        places, blocks = step.energies_at, step.blocks
        if not places or not any(block < places[-1] for block in blocks):
            continue
        if not _shape_before(step, blocks, places[-1]).same(shape):
            return None
        done, stopped = step.part.last(_COMPLETED), step.part.last(_STOPPED)
        if done > stopped:
            return Run(True, done)
        return Run(False, stopped) if stopped >= 0 else None
    return None


def _other(found: list[Step], shape: Geometry) -> int | None:
    """Return where a step has a geometry of other atoms."""
    for step in found[:20]:
        blocks = step.blocks
        if blocks:
            block = geometry.block(step.text, blocks[0])
            if sorted(block.numbers) != sorted(shape.numbers):
                return block.at
    return None
