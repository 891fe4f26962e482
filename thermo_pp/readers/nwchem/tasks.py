"""Tasks of an NWChem output: where each begins and ends, what it is, and whether the program came to its end.

The program reads its input up to the next ``task`` line under the heading "NWChem Input Module", then runs that task;
the headings of the modules tell what it was.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from thermo_pp.errors import ReadError
from thermo_pp.readers.text import Text

END = b"Total times  cpu:"
_HEADING = re.compile(rb"NWChem ([A-Z][\w/ -]*?) *\r?\n +---")
_STOPPED = re.compile(rb"\n -{72}\r?\n ([^\r\n]*?) *\d*\r?\n -{72}")
_FAILED = re.compile(rb"!! warning: ([^\r\n]* failed)")
_INPUT = "Input Module"
_FREQUENCIES = "Nuclear Hessian and Frequency Analysis"
_OPTIMISATION = "Geometry Optimization"
_GRADIENTS = ("DFT Gradient Module", "Gradients Module", "Numerical Gradients Module")
SCF = "SCF Module"
DFT = "DFT Module"
MP2 = "MP2 Semi-direct Energy/Gradient Module"
RIMP2 = "RI-MP2 Module"
TCE = "Extensible Many-Electron Theory Module"
ANALYTIC = "Analytic Hessian"
_READ = {
    *(_FREQUENCIES, _OPTIMISATION, *_GRADIENTS, SCF, DFT, MP2, RIMP2, TCE, ANALYTIC),
    *("Finite-difference Hessian", "CPHF Module", "Property Module"),
    "Electrostatic Potential Fit Module",
}
_GROUND_STATE_STANDS = "TDDFT Module"
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
    headings : tuple of (int, str)
        Offset and name of every module heading in it.
    names : frozenset of str
        The names alone.
    failed : str or None
        What the program says about its failure, where the input told it to go on.
    failed_at : int
        Offset of that, -1 where there is none.
    """

    kind: str
    start: int
    end: int
    headings: tuple[tuple[int, str], ...]
    names: frozenset[str]
    failed: str | None = None
    failed_at: int = -1

    def heading(self, name: str, start: int, end: int) -> bool:
        """Tell whether the module heading `name` stands between two offsets."""
        return any(start <= at < end and name == found for at, found in self.headings)


def tasks(text: Text) -> list[Task]:
    """Return the tasks of the file in order.

    Raises
    ------
    ReadError
        No normal end of the program, or no task before it.
    """
    ended = text.last(END)
    if ended < 0:
        raise _stopped(text)
    headings = [
        (match.start(), match.group(1).decode())
        for match in _HEADING.finditer(text.data)
        if not text.data[text.data.rfind(b"\n", 0, match.start()) + 1 : match.start()].strip()
    ]
    inputs = [at for at, name in headings if name == _INPUT]
    if not inputs or inputs[-1] > ended:
        raise _stopped(text)
    found = []
    for start, stop in zip(inputs, [*inputs[1:], len(text.data)], strict=True):
        mine = tuple((at, name) for at, name in headings if start < at < stop)
        if mine:
            found.append(_task(text, start, stop, mine))
    if not found:
        raise text.error(
            ended,
            "the program ended, but no task was run before",
            mend="check the input file: the program may have stopped reading it",
        )
    return found


def _task(text: Text, start: int, stop: int, headings: tuple[tuple[int, str], ...]) -> Task:
    end = text.data.rfind(b"Task  times  cpu:", start, stop)
    end = stop if end < 0 else end
    names = frozenset(name for _, name in headings)
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


def check_known(text: Text, task: Task) -> None:
    """Refuse a task with a module whose energies or geometries this reader does not know."""
    for at, name in task.headings:
        if name in _READ or (name == _GROUND_STATE_STANDS and task.kind == "energy"):
            continue
        raise text.error(
            at,
            f"a task of the {name!r}, which the NWChem reader does not know",
            mend="energies, gradients, optimisations and frequencies of HF, DFT, MP2 and coupled "
            "cluster are read; give a file with one of them",
        )


def _stopped(text: Text) -> ReadError:
    """Return the error that the program did not come to its end, with its own words where it said why."""
    tail = max(0, len(text.data) - 16384)
    said = [
        (match.start(1), match.group(1).decode("utf-8", "replace").strip())
        for match in _STOPPED.finditer(text.data, tail)
    ]
    for at, words in said:
        mend = "mend the input and rerun it"
        if words.endswith("optimize failed"):
            mend = (
                "optimise on from the last geometry, with more steps; "
                "'task ... optimize ignore' makes the program end normally"
            )
        return text.error(at, f"the program ended in an error: {words}", mend=mend)
    return text.error(
        len(text.data.rstrip()),
        f"no normal end of the program (looked for {END.decode()!r})",
        mend="the output is cut short here, or the job still runs; rerun or re-copy it",
    )
