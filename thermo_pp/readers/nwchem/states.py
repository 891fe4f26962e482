"""States of an NWChem output: one geometry with the energy that one task has there, and the best of several."""

from __future__ import annotations

from dataclasses import dataclass

from thermo_pp.readers.nwchem import energies, levels, tasks
from thermo_pp.readers.nwchem.energies import CORRELATED, Energy, Solution
from thermo_pp.readers.nwchem.geometry import Blocks, Geometry, belongs
from thermo_pp.readers.nwchem.levels import LevelOfTask
from thermo_pp.readers.nwchem.tasks import Task
from thermo_pp.readers.text import CUT_SHORT, Text

_SUMMARY = b"\n@ "


@dataclass(frozen=True, eq=False)
class State:
    """One geometry with the energy that one task has there, its level of theory, charge and multiplicity."""

    task: Task
    geometry: Geometry
    energy: Energy
    level: LevelOfTask

    def same(self, other: State) -> bool:
        """Tell whether both are one molecule in one geometry, charge and multiplicity."""
        mine, its = self.level, other.level
        return (
            self.geometry.same(other.geometry)
            and mine.charge == its.charge
            and mine.multiplicity == its.multiplicity
        )


def reference(text: Text, task: Task, geometry: Geometry) -> State | None:
    """Return the state of a frequency task at its own geometry, displaced ones left out.

    None where the task computed no energy, its Hessian being that of an earlier one.
    """
    if not task.names & {tasks.SCF, tasks.DFT}:
        return None
    for solution in energies.solutions(text, task):
        if _at(text, geometry, solution):
            return _state(text, task, geometry, solution)
    raise text.error(
        task.headings[0][0],
        "no energy of this frequency task belongs to the geometry of its modes",
        mend=CUT_SHORT,
    )


def final(text: Text, blocks: Blocks, task: Task) -> State:
    """Return the state that a task ended with: of an optimisation its last geometry.

    Raises
    ------
    ReadError
        No energy, one that did not converge, or one whose geometry is not in the file.
    """
    if task.failed is not None and task.kind != "optimisation":
        raise text.error(
            task.failed_at, f"the program says: {task.failed}", mend="mend the input and rerun it"
        )
    last = next(energies.solutions(text, task, backwards=True), None)
    if last is None:
        raise text.error(task.headings[0][0], "no energy in this task", mend=CUT_SHORT)
    if task.kind == "optimisation":
        geometry = next(blocks.before(task.end))
        for solution in energies.solutions(text, task, backwards=True):
            if _at(text, geometry, solution):
                state = _state(text, task, geometry, solution)
                _check_summary(text, state)
                return state
    else:
        for geometry in blocks.before(last.at):
            if _at(text, geometry, last):
                return _state(text, task, geometry, last)
    raise text.error(
        last.at,
        "no geometry before this energy has the nuclear repulsion printed with it"
        if task.kind != "optimisation"
        else "no energy of this optimisation belongs to its last geometry",
        mend=CUT_SHORT,
    )


def _at(text: Text, geometry: Geometry, solution: Solution) -> bool:
    if solution.repulsion_hartree is None:
        return True
    return belongs(text, geometry, solution.repulsion_hartree)


def _state(text: Text, task: Task, geometry: Geometry, solution: Solution) -> State:
    energy = energies.energy(text, task, solution)
    return State(task, geometry, energy, levels.level(text, task, energy, geometry))


def _check_summary(text: Text, state: State) -> None:
    """Compare the energy with that of the optimisation's own last line of summary, eight decimals."""
    place = text.data.rfind(_SUMMARY, state.task.start, state.task.end)
    if place < 0:
        return
    printed = text.floats(place + len(_SUMMARY), 1, "the energy of the last step", skip=1)[0]
    if abs(printed - state.energy.value_hartree) > 1.1e-8:
        raise text.error(
            place + 1,
            f"the last step has the energy {printed:.8f}, but the last geometry "
            f"{state.energy.value_hartree:.8f} (line {text.line_number(state.energy.at)})",
            mend=CUT_SHORT,
        )


def best(
    text: Text,
    blocks: Blocks,
    all_tasks: list[Task],
    main: Task,
    own: State | None,
    geometry: Geometry,
) -> tuple[State | None, list[tuple[int, str]]]:
    """Return the state whose energy is taken, and offset and reason of later tasks that have no usable one.

    See the docstring of the reader for the rule.
    """
    found = own
    passed_over: list[tuple[int, str]] = []
    for task in all_tasks:
        later = task.start > main.start or own is None
        if task is main or not (later or _may_be_better(text, task, own)):
            continue
        reason = unusable(text, task)
        if reason is not None:
            passed_over.append(reason)
            continue
        state = reference(text, task, geometry) if task.kind == "frequencies" else None
        state = state or final(text, blocks, task)
        if found is None:
            if state.geometry.same(geometry):
                found = state
        elif state.same(found):
            found = state if _better(state, found, later) else found
        elif state.geometry.same(found.geometry) and _half_known(state, found):
            raise text.error(
                state.energy.at,
                f"this {state.energy.label} energy is of the same geometry, but its charge or its "
                "multiplicity is not printed",
                mend=CUT_SHORT,
            )
    return found, passed_over


def _half_known(one: State, other: State) -> bool:
    """Tell whether charge or multiplicity is known of one state only."""
    pairs = (
        (one.level.charge, other.level.charge),
        (one.level.multiplicity, other.level.multiplicity),
    )
    return any((mine is None) != (theirs is None) for mine, theirs in pairs)


def unusable(text: Text, task: Task) -> tuple[int, str] | None:
    """Return where and why a task has no energy to be used although the file is whole, None where it has one."""
    module = tasks.unknown(task)
    if module is not None:
        return module[0], f"the {module[1]!r} is not known to the NWChem reader"
    if task.failed is not None and task.kind != "optimisation":
        return task.failed_at, f"the program says: {task.failed}"
    last = next(energies.solutions(text, task, backwards=True), None)
    at = -1 if last is None else energies.unconverged(text, last)
    return (at, "its SCF did not converge") if at >= 0 else None


def _better(state: State, found: State, later: bool) -> bool:
    if later:
        return state.energy.rank >= found.energy.rank
    return state.energy.rank > found.energy.rank and state.energy.rank >= CORRELATED


def _may_be_better(text: Text, task: Task, own: State | None) -> bool:
    """Tell whether an earlier task may have a correlated energy above `own`; of an optimisation the headings tell."""
    correlated = task.names & tasks.CORRELATED
    if correlated:
        second_order = correlated <= {tasks.MP2, tasks.RIMP2}
        return not (second_order and own is not None and own.energy.rank >= CORRELATED)
    if task.kind == "optimisation" or tasks.SCF not in task.names or tasks.DFT in task.names:
        return False
    last = next(energies.solutions(text, task, backwards=True), None)
    if last is None or energies.unconverged(text, last) >= 0:
        return False
    return energies.energy(text, task, last).rank >= CORRELATED
