"""Tasks of an NWChem output: where each begins and ends, what it is, and whether the program came to its end.

The program reads its input up to the next ``task`` line under the heading "NWChem Input Module", then runs that task;
the headings of the modules tell what it was.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, replace

from thermo_pp.errors import ReadError
from thermo_pp.readers.text import CUT_SHORT, Text

END = b"Total times  cpu:"
_HEADING = re.compile(rb"NWChem ([A-Z][^\r\n]*\S)[ \t]*\r?\n( +---)?")
_STOPPED = re.compile(rb"\n -{72}\r?\n ([^\r\n]*?) *\d*\r?\n -{72}")
_FAILED = re.compile(rb"!! warning: ([^\r\n]* failed)")
_INPUT = b"Input Module"
_FREQUENCIES = b"Nuclear Hessian and Frequency Analysis"
_OPTIMISATION = b"Geometry Optimization"
SCF = b"SCF Module"
DFT = b"DFT Module"
MP2 = b"MP2 Semi-direct Energy/Gradient Module"
RIMP2 = b"RI-MP2 Module"
TCE = b"Extensible Many-Electron Theory Module"
ANALYTIC = b"Analytic Hessian"
_NUMERICAL = b"Numerical Gradients Module"
CORRELATED = frozenset((MP2, RIMP2, TCE, _NUMERICAL))
"""Coupled clusters without a heading of their own are optimised by numerical gradients."""
_CHARGES_FIT = b"Electrostatic Potential Fit Module"
"""A task of its own, which computes no energy."""
_GRADIENTS = (b"DFT Gradient Module", b"Gradients Module", _NUMERICAL)
TOTALS = {SCF: b"Total SCF energy =", DFT: b"Total DFT energy ="}
"""How the energy of each module is printed."""
LEVEL = CORRELATED | {SCF, DFT}
_READ = {
    *(_FREQUENCIES, _OPTIMISATION, *_GRADIENTS, SCF, DFT, MP2, RIMP2, TCE, ANALYTIC),
    *(b"Finite-difference Hessian", b"CPHF Module", b"Property Module"),
    _CHARGES_FIT,
}
_GROUND_STATE_STANDS = b"TDDFT Module"
"""The energy that this module's tasks print first is that of the ground state; of gradients that is not so."""


@dataclass(frozen=True)
class Task:
    """One task of the input.

    Attributes
    ----------
    kind : str
        ``"energy"``, ``"gradient"``, ``"optimisation"`` or ``"frequencies"``.
    start, end : int
        Byte offsets: the heading of the input module before it, and the end of what it printed.
    headings : tuple of (int, bytes)
        Offset and name of the module headings in it.
    names : frozenset of bytes
        The names alone.
    failed : str or None
        What the program says about its failure, where the input told it to go on.
    failed_at : int
        Offset of that, -1 where there is none.
    """

    kind: str
    start: int
    end: int
    headings: tuple[tuple[int, bytes], ...]
    names: frozenset[bytes]
    failed: str | None = None
    failed_at: int = -1


def tasks(text: Text) -> list[Task]:
    """Return the tasks of the file in order.

    Raises
    ------
    ReadError
        No normal end of the program, or no task before it.
    """
    ended = text.last(END)
    unconverged = None
    if ended < 0:
        unconverged = _unconverged(text)
        if unconverged is None:
            raise _stopped(text)
        ended = unconverged.start(1)
    # one pass over the bytes, the dearest of all; a title of the same words has fewer blanks before it
    headings = []
    for match in _HEADING.finditer(text.data):
        if text.data[match.start() - 10 : match.start()] != b"          ":
            continue
        name = match.group(1)
        if match.group(2) is not None:
            headings.append((match.start(), name))
        elif name in _READ or name.endswith(b" Module"):
            raise text.error(
                match.start(), "a heading of a module without the rule below it", mend=CUT_SHORT
            )
    inputs = [index for index, (_, name) in enumerate(headings) if name == _INPUT]
    if not inputs or headings[inputs[-1]][0] > ended:
        raise _stopped(text)
    found = []
    for first, last in zip(inputs, [*inputs[1:], len(headings)], strict=True):
        stop = headings[last][0] if last < len(headings) else len(text.data)
        own = tuple(headings[first + 1 : last])
        names = {name for _, name in own}
        for module, mark in TOTALS.items() if names <= _READ - {*TOTALS} else ():
            at = text.data.find(mark, headings[first][0], stop)
            if at >= 0:
                raise text.error(
                    at,
                    f"an energy, but no heading of its module (looked for 'NWChem {module.decode()}')",
                    mend=CUT_SHORT,
                )
        if own:
            found.append(_task(text, headings[first][0], stop, own))
    if found and unconverged is not None:
        words = unconverged.group(1).decode("utf-8", "replace").strip()
        found[-1] = replace(found[-1], end=ended, failed=words, failed_at=ended)
    if not found:
        raise text.error(
            ended,
            "the program ended, but no task was run before",
            mend="check the input file: the program may have stopped reading it",
        )
    return [task for task in found if task.names != {_CHARGES_FIT}] or found


def _task(text: Text, start: int, stop: int, headings: tuple[tuple[int, bytes], ...]) -> Task:
    end = text.data.rfind(b"Task  times  cpu:", start, stop)
    end = stop if end < 0 else end
    names = frozenset(name for _, name in headings)
    if names >= {_FREQUENCIES, _OPTIMISATION}:
        raise text.error(
            start, "two tasks without the heading of the input module between them", mend=CUT_SHORT
        )
    if _FREQUENCIES in names:
        kind = "frequencies"
    elif _OPTIMISATION in names:
        kind = "optimisation"
    elif not names.isdisjoint(_GRADIENTS) or (
        MP2 in names and text.data.find(b" ENERGY GRADIENTS", start, end) >= 0
    ):
        kind = "gradient"
    else:
        kind = "energy"
    failed = _FAILED.search(text.data, max(start, end - 400), end)
    if failed is None:
        return Task(kind, start, end, headings, names)
    words = failed.group(1).decode("utf-8", "replace")
    return Task(kind, start, end, headings, names, words, failed.start())


def unknown(task: Task) -> tuple[int, str] | None:
    """Return offset and name of a module whose energies this reader does not know, None where there is none."""
    for at, name in task.headings:
        if name not in _READ and not (name == _GROUND_STATE_STANDS and task.kind == "energy"):
            return at, name.decode("utf-8", "replace")
    return None


def check_known(text: Text, task: Task) -> None:
    """Refuse a task with a module that this reader does not know."""
    found = unknown(task)
    if found is not None:
        raise text.error(
            found[0],
            f"a task of the {found[1]!r}, which the NWChem reader does not know",
            mend="energies, gradients, optimisations and frequencies of HF, DFT, MP2 and coupled "
            "cluster are read; give a file with one of them",
        )


def _unconverged(text: Text) -> re.Match[bytes] | None:
    """Return where the program stopped because an optimisation ran out of steps; None where it did not.

    That end is complete, up to the program's last words, and the steps before it are as good as any.
    """
    stopped = _STOPPED.search(text.data, max(0, len(text.data) - 16384))
    if stopped is None or not stopped.group(1).strip().endswith(b"optimize failed"):
        return None
    out_of_steps = text.last(b"Failed to converge in maximum number of steps", stopped.start())
    complete = text.find(b"For further details see manual section:", stopped.end())
    return stopped if out_of_steps >= 0 and complete >= 0 else None


def _stopped(text: Text) -> ReadError:
    """Return the error that the program did not come to its end, with its own words where it said why."""
    tail = max(0, len(text.data) - 16384)
    said = [
        (match.start(1), match.group(1).decode("utf-8", "replace").strip())
        for match in _STOPPED.finditer(text.data, tail)
    ]
    for at, words in said:
        what = f"the program ended in an error: {words}"
        return text.error(at, what, mend="mend the input and rerun it")
    return text.error(
        len(text.data.rstrip()),
        f"no normal end of the program (looked for {END.decode()!r})",
        mend="the output is cut short here, or the job still runs; rerun or re-copy it",
    )
