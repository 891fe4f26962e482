"""NWChem text outputs: HF, DFT, MP2 and coupled-cluster energies, optimisations, frequencies; several tasks in a file.

What is taken of a file with several tasks

- With a frequency task: the geometry, masses and modes of the last one. The energy is the one that task computed at
  its reference geometry (never at a displaced one), unless a later task has one of the same molecule at the same
  geometry, charge and multiplicity whose method is not lower (HF < DFT < MP2 < CCSD < CCSD(T)), or an earlier one has
  a correlated one that is higher. Method, basis and the rest of the level are those of that energy; where they are not
  those of the modes a finding says so.
- Without one: the geometry of the last task, its energy, or a higher correlated one of an earlier task at the same
  geometry, charge and multiplicity.

The gradient is that of a gradient task at the same geometry and with the same energy.

Formats were checked on NWChem 7.0.2.
"""

from __future__ import annotations

import re

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding
from thermo_pp.readers import joined_hessian
from thermo_pp.readers.doubts import Doubt, as_findings, doubt_places
from thermo_pp.readers.nwchem import (
    energies,
    geometry,
    gradients,
    joined,
    levels,
    states,
    tasks,
    vibrations,
)
from thermo_pp.readers.nwchem.constants import PRINTED_CONSTANTS
from thermo_pp.readers.nwchem.geometry import Blocks, Geometry
from thermo_pp.readers.nwchem.states import State
from thermo_pp.readers.nwchem.tasks import Task
from thermo_pp.readers.nwchem.vibrations import Vibrations
from thermo_pp.readers.text import CUT_SHORT, Text
from thermo_pp.records import Calculation, MethodEnergy
from thermo_pp.sources import Source

__all__ = ["LOOKS_FOR", "NAME", "PRINTED_CONSTANTS", "read", "sniff"]

NAME = "nwchem"
LOOKS_FOR = "'Northwest Computational Chemistry Package (NWChem)'"

_TITLE = b"Northwest Computational Chemistry Package (NWChem)"
_BANNER = re.compile(rb"[ \t]+" + re.escape(_TITLE) + rb" (\S+)\r?\n[ \t]+-{20}")
_CONVERGED = b"Optimization converged"
_UNCONVERGED = b"Failed to converge in maximum number"
_FIRST_STEP = b"Step   0"
_FROZEN = re.compile(rb"Number of frozen variables = +[1-9]")
_SINGLE = ("energy", "gradient")
_COUNTERPOISE = b"BSSE Module - Counter Poise Approach"
_POINT_CHARGE = re.compile(rb"\n *\d+ +Bq( +-?\d+\.\d+){3} +charge +-?\d*\.?0*[1-9]")


def sniff(head: bytes) -> bool:
    """Tell whether `head`, the first 64 KiB of a file, is this program's."""
    return _banner(head) is not None


def _banner(data: bytes) -> re.Match[bytes] | None:
    """Return the first heading of the program."""
    at = data.find(_TITLE)
    while at >= 0:
        match = _BANNER.match(data, data.rfind(b"\n", 0, at) + 1)
        if match is not None:
            return match
        at = data.find(_TITLE, at + 1)
    return None


def read(source: Source) -> Calculation:
    """Read one output.

    Raises
    ------
    ReadError
        Names file and line: no normal end, an SCF that did not converge, an energy that is missing or not known to
        this reader, values printed twice that do not agree, anything damaged.
    """
    text = Text(source)
    all_tasks = tasks.tasks(text)
    analysed = [task for task in all_tasks if task.kind == "frequencies"]
    main = analysed[-1] if analysed else all_tasks[-1]
    tasks.check_known(text, main)
    _check_alone(text, all_tasks)
    blocks = Blocks(text)
    _check_no_modes(text, main.end if analysed else 0)
    modes: Vibrations | None = None
    own: State | None
    if analysed:
        shape, masses = vibrations.atoms(text, main)
        masses_at = shape.at
        modes = vibrations.vibrations(text, main, shape, masses)
        own = states.reference(text, main, shape)
    else:
        own = states.final(text, blocks, main)
        shape = own.geometry
        masses, masses_at = geometry.element_masses(text, shape)
    taken, passed_over = states.best(text, blocks, all_tasks, main, own, shape)
    at = {"positions_angstrom": shape.at, "masses_u": masses_at}
    doubts = [_passed_over(*reason) for reason in passed_over]
    if taken is not None:
        at |= taken.level.at | {"energy_hartree": taken.energy.at}
    slope = None if taken is None else gradients.gradient(text, blocks, all_tasks, taken)
    if slope is not None:
        at["gradient_hartree_bohr"] = slope[1]
    run = _own_run(blocks, all_tasks, main, shape)
    optimised = None
    if run is not None:
        optimised, at["optimised"] = _outcome(text, run)
        doubts += _held(text, run) if optimised else [_not_converged(at["optimised"])]
    hessian = None if modes is None else modes.hessian_hartree_bohr2
    extra: tuple[Finding, ...] = ()
    beside = None if modes is None else joined.beside(text)
    if modes is not None and beside is not None:
        exact = joined.hessian(beside, masses, shape.positions_angstrom, modes.wavenumbers_cm)
        if exact is None:
            line = text.line_number(modes.at["hessian_hartree_bohr2"])
            extra = (joined_hessian.not_joined(source, beside, line),)
        else:
            hessian = exact
    if modes is not None:
        at |= modes.at
        doubts += _modes_doubts(text, blocks, modes, masses, taken, own, run if optimised else None)
    doubts += _ghosts(shape)
    doubts += _left_out(
        blocks, main, [task for task in all_tasks if task not in (main, run)], shape
    )
    banner = _banner(text.data)
    if banner is not None:
        at["program_version"] = banner.start(1)
    thermochemistry = {} if modes is None else modes.thermochemistry
    energies_by_method = [] if taken is None else taken.energy.by_method
    places = at | {f"{label} energy": place for label, _, place in energies_by_method}
    places |= {f"printed {key}": value[2] for key, value in thermochemistry.items()}
    lines = text.line_numbers(places | doubt_places(doubts))
    level = None if taken is None else taken.level
    real = shape.real if shape.ghosts else slice(None)
    return Calculation(
        path=source.name,
        sha256=source.sha256,
        program=NAME,
        program_version=None if banner is None else banner.group(1).decode("utf-8", "replace"),
        method=None if level is None else level.method,
        basis=None if level is None else level.basis,
        dispersion=None if level is None else level.dispersion,
        solvent=None if level is None else level.solvent,
        grid=None if level is None else level.grid,
        frozen_core=None if level is None else level.frozen_core,
        numbers=shape.numbers[real],
        positions_angstrom=shape.positions_angstrom[real],
        masses_u=masses[real],
        masses_origin="printed",
        charge=None if level is None else level.charge,
        multiplicity=None if level is None else level.multiplicity,
        energy_hartree=None if taken is None else taken.energy.value_hartree,
        energy_label=None if taken is None else taken.energy.label,
        method_energies={
            label: MethodEnergy(value, lines[f"{label} energy"])
            for label, value, _ in energies_by_method
        },
        wavenumbers_cm=None if modes is None else modes.wavenumbers_cm,
        modes=None if modes is None else modes.modes,
        hessian_hartree_bohr2=hessian,
        gradient_hartree_bohr=None if slope is None else slope[0][real],
        optimised=optimised,
        ended_normally=text.last(tasks.END) >= 0,
        kind_of_job=_kinds(all_tasks),
        printed={}
        if modes is None
        else modes.printed({k: lines[f"printed {k}"] for k in thermochemistry}),
        where={field: lines[field] for field in at},
        findings=as_findings(doubts, source.name, lines) + extra,
    )


def _check_alone(text: Text, all_tasks: list[Task]) -> None:
    """Refuse energies that are not those of the one molecule of the geometry.

    What tells it stands before the heading of a task's first module.
    """
    for task in all_tasks:
        first = task.headings[0][0]
        at = text.data.find(_COUNTERPOISE, task.start, first)
        if at >= 0:
            raise text.error(
                at,
                "a counterpoise task over fragments of the molecule, whose energies are not read",
                mend="give single calculations, one of each fragment, with ghost atoms",
            )
        centres = text.data.find(b" Bq ", task.start, first)
        charge = None if centres < 0 else _POINT_CHARGE.search(text.data, task.start, first)
        if charge is not None:
            raise text.error(
                charge.start() + 1,
                "point charges around the molecule, which are in its energy",
                mend="point charges are not read; give a calculation of the molecule alone",
            )


def _check_no_modes(text: Text, start: int) -> None:
    """Refuse modes from `start` on, outside any frequency task: its heading is lost."""
    at = text.find(b"NORMAL MODE EIGENVECTORS IN CARTESIAN COORDINATES", start)
    if at >= 0:
        raise text.error(at, "modes, but no heading of a frequency task before", mend=CUT_SHORT)


def _kinds(all_tasks: list[Task]) -> tuple[str, ...]:
    kinds = {task.kind for task in all_tasks}
    return tuple(k for k in ("energy", "gradient", "optimisation", "frequencies") if k in kinds)


def _own_run(blocks: Blocks, all_tasks: list[Task], main: Task, shape: Geometry) -> Task | None:
    """Return the optimisation whose last geometry is that of the record, None where there is none."""
    if main.kind == "optimisation":
        return main
    runs = [task for task in all_tasks if task.kind == "optimisation" and task.end < main.start]
    if not runs:
        return None
    block = next(blocks.before(main.headings[0][0]))
    runs = [task for task in runs if task.start < block.at < task.end]
    return runs[0] if runs and block.same(shape) else None


def _outcome(text: Text, run: Task) -> tuple[bool, int]:
    """Return whether an optimisation reached its thresholds, and the offset at which the program says so."""
    at = text.data.rfind(_CONVERGED, run.start, run.end)
    if at >= 0 and run.failed is None:
        return True, at
    at = text.data.rfind(_UNCONVERGED, run.start, run.end)
    if at < 0 and run.failed is None:
        raise text.error(run.end, "this optimisation does not say how it ended", mend=CUT_SHORT)
    return False, run.failed_at if at < 0 else at


def _held(text: Text, run: Task) -> list[Doubt]:
    first = text.data.find(_FIRST_STEP, run.start, run.end)
    held = _FROZEN.search(text.data, run.start, first if first >= 0 else run.end)
    if held is None:
        return []
    return [
        Doubt(
            "not-stationary",
            "warning",
            held.start(),
            "the geometry was optimised with coordinates held: no stationary point",
            "nothing, for a point of a scan; else optimise without constraints",
        )
    ]


def _not_converged(at: int) -> Doubt:
    return Doubt(
        "optimisation-not-converged",
        "warning",
        at,
        "the optimisation did not reach its thresholds",
        "optimise on from the last geometry, with more steps",
    )


def _passed_over(at: int, why: str) -> Doubt:
    return Doubt(
        "task-not-read",
        "warning",
        at,
        f"this task is passed over: {why}",
        "rerun that task, or give a file without it",
    )


def _modes_doubts(
    text: Text,
    blocks: Blocks,
    modes: Vibrations,
    masses: NDArray[np.float64],
    taken: State | None,
    own: State | None,
    run: Task | None,
) -> list[Doubt]:
    """Return what is doubtful about the frequencies: their level, their geometry, their printed masses."""
    found: list[Doubt] = []
    if taken is None:
        found.append(
            Doubt(
                "no-energy",
                "warning",
                modes.at["modes"],
                "no energy at the geometry of the modes in this file",
                "name an output with the energy of this geometry, or rerun the frequency task alone",
            )
        )
    if own is not None and taken is not None and taken is not own:
        found.append(
            Doubt(
                "energy-of-another-task",
                "note",
                taken.energy.at,
                f"the energy is {_words(taken)}, the modes are {_words(own)}: two tasks of this file",
                "nothing, where that is meant; else give the tasks as files of their own",
            )
        )
    if own is not None and run is not None and not _same_printed_level(text, run, own):
        ended = states.final(text, blocks, run)
        if _words(ended) != _words(own):
            found.append(
                Doubt(
                    "frequencies-of-another-level",
                    "warning",
                    modes.at["modes"],
                    f"the geometry was optimised with {_words(ended)}, the frequencies are {_words(own)}: "
                    "no stationary point of theirs",
                    "optimise with the level of the frequencies",
                )
            )
    weight = float(modes.thermochemistry["molecular_weight"][0])
    if abs(weight - float(masses.sum())) > 2e-4:
        found.append(
            Doubt(
                "printed-masses-differ",
                "warning",
                modes.thermochemistry["molecular_weight"][2],
                f"the printed thermochemistry is for a mass of {weight} u, the modes are for {masses.sum():.4f} u",
                "do not use the printed thermochemistry; isotopes were given to the frequency task only",
            )
        )
    return found


def _same_printed_level(text: Text, run: Task, own: State) -> bool:
    """Tell whether two tasks ran the same modules with the same printed functional and basis set."""
    if run.names & tasks.LEVEL != own.task.names & tasks.LEVEL:
        return False
    if levels.dissolved(text, energies.first(text, run)) != (own.level.solvent != "none"):
        return False
    mine = levels.printed_level(text, own.task, own.energy.at)
    return mine == levels.printed_level(text, run, run.end)


def _words(state: State) -> str:
    """Return method, basis and what is unusual about the level, for a finding."""
    level = state.level
    more = [part for part in (level.dispersion, level.solvent) if part not in (None, "none")]
    return ", ".join(["/".join(part for part in (level.method, level.basis) if part), *more])


def _ghosts(shape: Geometry) -> list[Doubt]:
    if not shape.ghosts:
        return []
    return [
        Doubt(
            "ghost-atoms",
            "warning",
            shape.at,
            "ghost atoms carry basis functions here: the energy is not that of the molecule's own basis",
            "use it for counterpoise corrections only",
        )
    ]


def _left_out(blocks: Blocks, main: Task, others: list[Task], shape: Geometry) -> list[Doubt]:
    """Return a finding where another task is of other atoms, or a single point of another geometry."""
    for task in others:
        block = next(blocks.before(task.end), None)
        if block is not None and not block.same_atoms(shape):
            return [
                Doubt(
                    "other-molecule-left-out",
                    "note",
                    block.at,
                    "a task of another molecule stands in this file; it is left out",
                    "give each molecule a file of its own",
                )
            ]
        single = task.kind in _SINGLE and main.kind in _SINGLE
        if single and block is not None and not block.same(shape):
            return [
                Doubt(
                    "last-of-several-structures",
                    "note",
                    block.at,
                    "another geometry of the same atoms stands in this file; the last one is taken",
                    "give a file with one geometry where another one is meant",
                )
            ]
    return []
