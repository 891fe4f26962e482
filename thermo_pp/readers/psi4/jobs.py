"""How a Psi4 output is divided: its end, its input, the geometries it evaluated, its optimisations.

A geometry that finite differences displaced is marked as such and never chosen; of a series of
finite differences only the first geometry, the undisplaced reference, counts.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import NUMBERS
from thermo_pp.errors import ReadError
from thermo_pp.readers import repulsion
from thermo_pp.readers.line_marks import matches
from thermo_pp.readers.text import CUT_SHORT, Text
from thermo_pp.units import BOHR_ANGSTROM

FloatArray = NDArray[np.float64]

BANNER = b"An Open-Source Ab Initio Electronic Structure Package"

MOST_ANGSTROM = 1e6
"""No coordinate of a molecule is larger."""

ROUNDING_ANGSTROM = 5.1e-9
"""Coordinates have eight decimals, or more."""

_END = re.compile(rb"\*\*\* P[Ss][Ii]4 (exiting successfully|encountered an error)")
_REPULSION = b"Nuclear repulsion ="
_SAME_REPULSION = 1e-8
_EXCEPTION = re.compile(
    rb"^(?:PsiException|[\w.]*(?:Error|Exception)|[\w.]*exceptions\.\w+): *(\S[^\r\n]*)"
    rb"|^Fatal Error: *(\S[^\r\n]*)",
    re.MULTILINE,
)
_OUT_OF_STEPS = b"Could not converge geometry optimization in"
_INPUT = re.compile(rb"==> Input (?:File|QCSchema) <==\s+(-{40,})\r?\n")
_CALL = re.compile(
    r"\b(energy|optimi[sz]e|opt|gradient|hessian|frequenc(?:y|ies)|freq|propert(?:y|ies)|prop)"
    r"\s*\(\s*(?:name\s*=\s*)?(['\"])(.+?)\2"
)
_MODEL = re.compile(r"'model': \{[^}]*'method': '([^']+)'")
_GEOMETRY = re.compile(
    rb"Geometry \(in (Angstrom|Bohr)\), charge = (-?\d{1,3}), multiplicity = (\d{1,3}):"
)
_RUNNING = re.compile(rb"  Running in \S+ symmetry")
REPLACED = re.compile(rb"Number of ECP core electrons:\s*(\d+)")
"""How many electrons effective core potentials replace."""
_ELECTRONS = re.compile(rb"\n[ \t]+Electrons[ \t]+=[ \t]+(\d+)")
_SYMBOL = re.compile(r"([A-Za-z]{1,2})(?:[\d_]\w*)?")
_GHOST = re.compile(r"Gh\(|\(Gh\)")
_DIFFERENCES = b"\n  Using finite-differences of"
_SERIES = (_DIFFERENCES, b"\n  Computing gradient from", b"\n  Computing second-derivative from")
_OPTIMISER = re.compile(rb"OPTKING \d")
_NEXT_STEP = b"Structure for next step:"
_CONVERGED = b"Final optimized geometry and variables:"
_FAILED = b"Could not converge geometry optimization"


@dataclass(frozen=True)
class Asked:
    """What an input asks for: task and method as it writes them, lower case, and their line."""

    task: str
    method: str
    at: int


@dataclass(frozen=True)
class Evaluation:
    """One SCF and what followed it: a part of the file, and whether its geometry is displaced."""

    start: int
    end: int
    displaced: bool


@dataclass(frozen=True, eq=False)
class Geometry:
    """A printed geometry, in angstrom; `masses_u` is None where the table has no masses.

    Ghost atoms are left out and counted in `ghosts`.
    """

    numbers: NDArray[np.int64]
    positions_angstrom: FloatArray
    masses_u: FloatArray | None
    charge: int
    multiplicity: int
    ghosts: int
    at: int
    table_at: int

    def same(self, other: Geometry) -> bool:
        """Tell whether `other` is the same molecule in the same state, in shape to 1e-5 A, with as many ghosts."""
        mine = (self.charge, self.multiplicity, self.ghosts)
        if mine != (other.charge, other.multiplicity, other.ghosts):
            return False
        if not np.array_equal(self.numbers, other.numbers):
            return False
        return bool(np.allclose(_distances(self), _distances(other), rtol=0.0, atol=1e-5))


@dataclass(frozen=True)
class Optimisation:
    """One optimisation: whether it converged, its last evaluation, where its end is told."""

    converged: bool
    last: Evaluation
    at: int


def _distances(geometry: Geometry) -> FloatArray:
    x = geometry.positions_angstrom
    return np.asarray(np.linalg.norm(x[:, None, :] - x[None, :, :], axis=-1))


def furthest_apart(one: Geometry, other: Geometry) -> float:
    """Return by how much a distance differs at most between two geometries of the same atoms, in angstrom."""
    return float(np.max(np.abs(_distances(one) - _distances(other))))


def check_repulsion(part: Text, geometry: Geometry) -> None:
    """Check the geometry against the nuclear repulsion energy that is printed with it.

    Effective core potentials change the nuclear charges: there the electrons are counted.
    """
    at = part.find(_REPULSION)
    if at < 0:
        return
    if part.find(b"ECP") >= 0:
        _check_electrons(part, geometry)
        return
    printed = part.number_text(at, "the nuclear repulsion energy")
    why = repulsion.differs(
        printed, geometry.numbers, geometry.positions_angstrom, ROUNDING_ANGSTROM
    )
    if why is not None:
        raise part.error(geometry.at, why, mend=CUT_SHORT)
    for again in part.all(_REPULSION):  # an SCF whose beginning is lost has another one
        other = part.number(again, "the nuclear repulsion energy")
        if abs(other - float(printed)) > _SAME_REPULSION * abs(other):
            raise part.error(
                again,
                f"another geometry here than on line {part.line_number(geometry.at)}, but no SCF "
                "of it (looked for 'Running in ... symmetry')",
                mend=CUT_SHORT,
            )


def _check_electrons(part: Text, geometry: Geometry) -> None:
    """Check the atoms against the electrons, those in effective core potentials left out."""
    replaced = REPLACED.search(part.data, part.start, part.end)
    electrons = _ELECTRONS.search(part.data, part.start, part.end)
    if replaced is None or electrons is None:
        return
    count = int(geometry.numbers.sum()) - geometry.charge - int(replaced.group(1))
    if count != int(electrons.group(1)):
        raise part.error(
            geometry.at,
            f"{count} electrons by the atoms and the charge, {electrons.group(1).decode()} on line "
            f"{part.line_number(electrons.start(1))}",
            mend=CUT_SHORT,
        )


def check_end(text: Text) -> bool:
    """Check that every run in the file ended normally.

    Raises
    ------
    ReadError
        No end, an end before the text's own end, or a job that ended in an error.
    """
    ends = matches(_END, b"*** P", text, text.start, text.end)
    if not ends or ends[-1].start() < text.last(BANNER):
        raise text.error(
            len(text.data.rstrip()),
            "no normal end of the job (looked for '*** Psi4 exiting successfully')",
            mend="the output is cut short here, or the job still runs; rerun or re-copy it",
        )
    before = text.start
    normally = True
    for end in ends:
        if end.group(1) == b"encountered an error":
            run = text.part(before, end.start())
            if end is not ends[-1] or run.find(_OUT_OF_STEPS) < 0:
                raise _failure(run)
            normally = False
        before = end.end()
    return normally


def _failure(run: Text) -> ReadError:
    """Return the error in which the run ended: the first reason that it printed."""
    unfinished = run.find(b"** Wave function not converged to")
    if unfinished >= 0:
        what = "the coupled-cluster iterations did not converge"
        return run.error(unfinished, what, mend="rerun with more iterations")
    reason = _EXCEPTION.search(run.data, run.start, run.end)
    if reason is None:
        return run.error(run.end, "the job ended in an error", mend="mend the job and rerun it")
    said = (reason.group(1) or reason.group(2)).decode("utf-8", "replace").strip()
    what = f"the job ended in an error: {said[:200]}"
    return run.error(reason.start(), what, mend="mend the job and rerun it")


def inputs(text: Text) -> tuple[list[tuple[int, int]], tuple[Asked, ...]]:
    """Return the parts of the file that repeat an input, and what these inputs ask for."""
    parts: list[tuple[int, int]] = []
    asked: list[Asked] = []
    for match in _INPUT.finditer(text.data, text.start, text.end):
        stop = text.data.find(b"\n" + match.group(1), match.end())
        stop = text.end if stop < 0 else stop
        parts.append((match.start(), stop))
        at = match.end()
        for line in text.data[match.end() : stop].split(b"\n"):
            code = line.decode("utf-8", "replace").partition("#")[0].lower()
            asked.extend(Asked(call.group(1), call.group(3), at) for call in _CALL.finditer(code))
            asked.extend(Asked("energy", call.group(1), at) for call in _MODEL.finditer(code))
            at += len(line) + 1
    return parts, tuple(asked)


def evaluations(text: Text, echoes: list[tuple[int, int]]) -> list[Evaluation]:
    """Return every geometry at which an SCF was started, in the order of the file."""
    starts = []
    for running in matches(_RUNNING, b"  Running in ", text, text.start, text.end):
        at = text.last(b"Geometry (in ", running.start())
        if at >= 0 and not any(a <= running.start() < b for a, b in echoes):
            starts.append(at)
    marks = sorted((at + 1, mark) for mark in _SERIES for at in text.all(mark))
    found, within, number, mark = [], False, 0, 0
    for start, end in pairwise([*starts, text.end]):
        while mark < len(marks) and marks[mark][0] < start:
            within, number = marks[mark][1] == _DIFFERENCES, 0
            mark += 1
        found.append(Evaluation(start, end, displaced=within and number > 0))
        number += 1
    return found


def geometry(text: Text, start: int) -> Geometry:
    """Return the geometry whose heading stands at `start`."""
    heading = _GEOMETRY.match(text.data, start)
    if heading is None:
        raise text.expected(
            start, "a heading 'Geometry (in Angstrom), charge = 0, multiplicity = 1:'"
        )
    factor = BOHR_ANGSTROM if heading.group(1) == b"Bohr" else 1.0
    rule = text.need(b"------------", start, lacking="no table of the geometry")
    line = table = text.next_line(rule)
    numbers, rows, ghosts = [], [], 0
    while text.rest(line).strip():
        if _GHOST.search(text.line(line)):
            ghosts += 1
        else:
            words = text.line(line).split()
            symbol = _SYMBOL.fullmatch(words[0])
            number = None if symbol is None else NUMBERS.get(symbol.group(1).capitalize())
            if number is None or len(words) not in (4, 5):
                raise text.expected(line, "an element, three coordinates and a mass")
            numbers.append(number)
            rows.append(text.floats(line, len(words) - 1, "coordinates and a mass", skip=1))
        line = text.next_line(line)
    if not rows or len({len(row) for row in rows}) != 1:
        raise text.expected(line, "a table of the geometry")
    table_array = np.array(rows)
    if np.max(np.abs(table_array)) > MOST_ANGSTROM or np.any(table_array[:, 3:] <= 0.0):
        raise text.error(table, "coordinates or masses out of all bounds", mend=CUT_SHORT)
    return Geometry(
        numbers=np.array(numbers, dtype=np.int64),
        positions_angstrom=table_array[:, :3] * factor,
        masses_u=table_array[:, 3] if table_array.shape[1] == 4 else None,
        charge=int(heading.group(2)),
        multiplicity=int(heading.group(3)),
        ghosts=ghosts,
        at=start,
        table_at=table,
    )


def optimisations(text: Text, real: list[Evaluation]) -> list[Optimisation]:
    """Return the optimisations of the file; `real` are its evaluations of its own geometries."""
    found: list[Optimisation] = []
    unfinished: int | None = None
    marks = (_NEXT_STEP, _CONVERGED, _FAILED)
    places = [(at, mark) for mark in marks for at in text.all(mark)]
    places += [(match.start(), _NEXT_STEP) for match in _OPTIMISER.finditer(text.data)]
    for at, mark in sorted(places):
        if mark == _NEXT_STEP:
            unfinished = at
        elif mark == _CONVERGED or unfinished is not None:
            found.append(_optimisation(text, real, mark == _CONVERGED, at))
            unfinished = None
    if unfinished is not None:
        found.append(_optimisation(text, real, False, unfinished))
    return found


def _optimisation(text: Text, real: list[Evaluation], converged: bool, at: int) -> Optimisation:
    before = [one for one in real if one.start < at]
    if not before:
        raise text.error(at, "an optimisation without a geometry before it", mend=CUT_SHORT)
    return Optimisation(converged, before[-1], at)


def steps_on(text: Text, start: int, end: int) -> bool:
    """Tell whether an optimiser takes a step between `start` and `end`."""
    part = text.part(start, end)
    marks = (_NEXT_STEP, _CONVERGED, _FAILED)
    return (
        any(part.has(mark) for mark in marks)
        or _OPTIMISER.search(text.data, start, end) is not None
    )
