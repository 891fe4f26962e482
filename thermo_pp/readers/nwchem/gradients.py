"""Gradients of an NWChem output: the table of a gradient task, with the coordinates that it belongs to."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from thermo_pp.readers.nwchem import states
from thermo_pp.readers.nwchem.geometry import BOHR_PER_ANGSTROM, Blocks
from thermo_pp.readers.nwchem.states import State
from thermo_pp.readers.nwchem.tasks import Task
from thermo_pp.readers.text import CUT_SHORT, Text

FloatArray = NDArray[np.float64]

_TABLE = b" ENERGY GRADIENTS"
_SAME_ENERGY_HARTREE = 1e-6
"""Of two tasks of one state: what an SCF leaves."""
_ROUNDING_BOHR = 1.1e-6
"""Six decimals, and the program's own factor on eight decimals of an angstrom."""


def gradient(
    text: Text, blocks: Blocks, all_tasks: list[Task], taken: State
) -> tuple[FloatArray, int] | None:
    """Return the gradient of the state whose energy is taken, shape (n, 3), and its offset.

    Only gradient tasks are looked at, ghost atoms included in their tables: one of the same geometry, charge
    and multiplicity, and of the same energy. None where there is none.

    Raises
    ------
    ReadError
        A damaged table, or one whose coordinates are not those of the task.
    """
    for task in reversed(all_tasks):
        if task.kind != "gradient":
            continue
        at = text.data.rfind(_TABLE, task.start, task.end)
        if at < 0 or (task is not taken.task and states.unusable(text, task) is not None):
            continue
        state = taken if task is taken.task else states.final(text, blocks, task)
        apart = state.energy.value_hartree - taken.energy.value_hartree
        if state.same(taken) and abs(apart) <= _SAME_ENERGY_HARTREE:
            return _table(text, at, taken)
    return None


def _table(text: Text, at: int, state: State) -> tuple[FloatArray, int]:
    first = line = text.next_line(at, 4)
    rows = []
    for number, tag in enumerate(state.geometry.tags, start=1):
        if text.rest(line).split()[:2] != [b"%d" % number, tag.encode()]:
            raise text.expected(line, f"the gradient of atom {number} ({tag})")
        rows.append(text.floats(line, 6, "coordinates and gradient of an atom", skip=2))
        line = text.next_line(line)
    table = np.array(rows)
    places = state.geometry.positions_angstrom * BOHR_PER_ANGSTROM
    if np.abs(table[:, :3] - places).max() > _ROUNDING_BOHR:
        raise text.error(first, "a gradient at other coordinates than the energy", mend=CUT_SHORT)
    return table[:, 3:], first
