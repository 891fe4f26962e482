"""FORCE jobs in MOPAC's text output: frequencies, normal coordinates, thermochemistry."""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.readers.mopac import job
from thermo_pp.readers.text import CUT_SHORT, Text
from thermo_pp.records import Printed

FloatArray = NDArray[np.float64]

_MATRIX = b"FORCE MATRIX IN MILLIDYNES/ANGSTROM"
_ORIENTATION = b"ORIENTATION OF MOLECULE IN FORCE CALCULATION"
_COORDINATES = b"MASS-WEIGHTED COORDINATE ANALYSIS"
_ROOTS = re.compile(rb"^[ \t]+Root No\.((?:[ \t]+\d+)+)[ \t]*\r?\n", re.MULTILINE)
_LIST = re.compile(rb"^[ \t]*FREQ\(I\)([^\n]*)\n", re.MULTILINE)
_DESCRIBED = re.compile(
    rb"^ VIBRATION[ \t]+(\d+)[ \t][^\n]*\n FREQ(?:UENCY|\.)[ \t]+(-?\d+\.\d+)", re.MULTILINE
)
_VIBRATION = re.compile(rb"^ VIBRATION\b", re.MULTILINE)
_DEGENERATE_CM = 2.0
_AGREE_CM = 0.16
"""One and two decimals of one number, and what MOPAC2016 prints before and after refining it."""
_ZERO_POINT = re.compile(rb"^[ \t]+ZERO POINT ENERGY[ \t]+(-?\d+\.\d+)[ \t]+KCAL/MOL", re.MULTILINE)
_SYMMETRY = re.compile(rb"SYMMETRY NUMBER FOR POINT-GROUP[^=\n]*=[ \t]*(\d+)")
_THERMO = re.compile(
    rb"^[ \t]*(\d+\.\d+)[ \t]+VIB\.[^\n]*?[ \t](-?\d+\.\d+)[ \t]*\r?\n"
    rb"[ \t]+ROT\.[^\n]*?[ \t](-?\d+\.\d+)[ \t]*\r?\n"
    rb"[ \t]+INT\.[^\n]*\n"
    rb"[ \t]+TRA\.[^\n]*?[ \t](-?\d+\.\d+)[ \t]*\r?\n"
    rb"[ \t]+TOT\.[^\n]*?[ \t](-?\d+\.\d+)[ \t]*\r?\n",
    re.MULTILINE,
)


@dataclass(frozen=True, eq=False)
class Vibrations:
    """Wavenumbers (m,), ascending, displacements (m, n, 3) or None, and where the former stand."""

    wavenumbers_cm: FloatArray
    modes: FloatArray | None
    at: int


def is_force(part: Text) -> bool:
    """Tell whether the job computed a force matrix, or the thermochemistry of an atom."""
    return part.find(_MATRIX) >= 0 or (
        part.find(b"CALCULATED THERMODYNAMIC PROPERTIES") >= 0 and part.find(_ORIENTATION) < 0
    )


def vibrations(part: Text, masses_u: FloatArray, positions_angstrom: FloatArray) -> Vibrations:
    """Return the vibrations, ReadError where they are missing, damaged, or printed twice and differ."""
    count = job.genuine(masses_u, positions_angstrom)
    atoms = len(masses_u)
    if count == 0:
        at = max(part.find(b"CALCULATED THERMODYNAMIC PROPERTIES"), part.start)
        return Vibrations(np.zeros(0), np.zeros((0, atoms, 3)), at)
    heads, vectors, at = _table(part, atoms)
    if len(heads) != count:
        raise part.error(
            at,
            f"{len(heads)} vibrations of {atoms} atoms, expected {count}",
            mend="give the FORCE job of a whole molecule; see whether it is meant to be linear",
        )
    found, found_at = _listed(part, heads, at)
    refined = _described(part, heads if found is None else found)
    wavenumbers = refined if found is None else found
    frame = _frame(part, atoms)
    lengths = np.sqrt(np.sum(vectors**2, axis=(1, 2)))
    if np.any(np.abs(lengths - 1.0) > 0.05):
        raise part.error(at, "normal coordinates that are not of unit length", mend=CUT_SHORT)
    modes = vectors / np.sqrt(masses_u)[:, np.newaxis]
    modes /= np.sqrt(np.sum(modes**2, axis=(1, 2)))[:, np.newaxis, np.newaxis]
    turned = job.turned(modes, frame, positions_angstrom)
    order = np.argsort(wavenumbers, kind="stable")
    return Vibrations(
        wavenumbers[order],
        None if turned is None else turned[order],
        at if found is None else found_at,
    )


def _table(part: Text, atoms: int) -> tuple[FloatArray, FloatArray, int]:
    """Return the heads (m,) and columns (m, n, 3) of the mass-weighted normal coordinates."""
    start = part.find(_COORDINATES)
    if start < 0:
        raise part.error(part.end, "no normal coordinates in a FORCE job", mend=CUT_SHORT)
    end = part.find(b"DESCRIPTION OF VIBRATIONS", start)
    section = part.part(start, end if end >= 0 else None)
    heads: list[float] = []
    columns = []
    at = start
    for roots in _ROOTS.finditer(section.data, section.start, section.end):
        numbers = [int(word) for word in roots.group(1).split()]
        if numbers != list(range(len(heads) + 1, len(heads) + 1 + len(numbers))):
            raise section.expected(roots.start(), f"root {len(heads) + 1}")
        line = section.next_line(roots.start(), 2)
        if not _are_numbers(section.rest(line)):  # the symmetry labels
            line = section.next_line(line, 2)
        at = line if not heads else at
        heads += section.floats(line, len(numbers), "frequencies of normal coordinates")
        line = section.next_line(line, 2)
        rows = []
        for row in range(3 * atoms):
            words = section.floats(line, len(numbers) + 1, "a row of normal coordinates")
            if words[0] != row + 1:
                raise section.expected(line, f"row {row + 1}")
            rows.append(words[1:])
            line = section.next_line(line)
        columns.append(np.array(rows).T.reshape(len(numbers), atoms, 3))
    if not heads:
        raise part.error(start, "no normal coordinates after this line", mend=CUT_SHORT)
    return np.array(heads), np.concatenate(columns), at


def _are_numbers(line: bytes) -> bool:
    words = line.split()
    return bool(words) and all(re.fullmatch(rb"-?\d+\.\d+", word) for word in words)


def _listed(part: Text, heads: FloatArray, at: int) -> tuple[FloatArray | None, int]:
    """Return the frequencies of ``FREQ(I)``, four decimals, vibrations first; None where they are not printed."""
    lines = list(_LIST.finditer(part.data, part.start, part.end))
    if not lines:
        return None, 0
    values: list[float] = []
    for line in lines:
        values += part.floats(line.start(1), len(line.group(1).split()), "frequencies")
    found = np.array(values[: len(heads)])
    if len(found) != len(heads) or np.any(np.abs(found - heads) > _AGREE_CM):
        raise part.error(
            lines[0].start(),
            "the frequencies of FREQ(I) are not those of the normal coordinates",
            mend=CUT_SHORT,
        )
    return found, lines[0].start()


def _described(part: Text, known: FloatArray) -> FloatArray:
    """Return the frequencies with the two decimals of the description, where it has them.

    It names the last of each degenerate set only: the others have its value.
    """
    refined = known.copy()
    open_from = 0
    told = part.find(b"DESCRIPTION OF VIBRATIONS")
    blocks = _VIBRATION.findall(part.data, max(told, part.start), part.end)
    if len(blocks) != len(_DESCRIBED.findall(part.data, part.start, part.end)):
        raise part.error(told, "a vibration without its frequency after this line", mend=CUT_SHORT)
    for match in _DESCRIBED.finditer(part.data, part.start, part.end):
        number, value = int(match.group(1)), float(match.group(2))
        if not 1 <= number <= len(known) or abs(known[number - 1] - value) > _AGREE_CM:
            raise part.error(
                match.start(),
                f"vibration {number} is {value} cm^-1 here, and another one among the normal coordinates",
                mend=CUT_SHORT,
            )
        for each in range(open_from, number):
            if abs(known[each] - value) <= _AGREE_CM:
                refined[each] = value
            elif abs(known[each] - value) > _DEGENERATE_CM:
                raise part.error(
                    match.start(),
                    f"vibration {each + 1} is not described before it",
                    mend=CUT_SHORT,
                )
        open_from = number
    if told >= 0 and open_from != len(known):
        raise part.error(told, f"vibration {len(known)} is not described", mend=CUT_SHORT)
    return refined


def _frame(part: Text, atoms: int) -> FloatArray:
    """Return the geometry in the frame of the normal coordinates."""
    at = part.need(_ORIENTATION, lacking="no orientation in the force calculation")
    line = part.next_line(at, 4)
    rows = []
    for atom in range(atoms):
        words = part.rest(line).split()
        if len(words) < 5 or words[0] != str(atom + 1).encode():
            raise part.expected(line, f"the position of atom {atom + 1}")
        rows.append(part.floats(line, 3, "the position of an atom", skip=2))
        line = part.next_line(line)
    return np.array(rows)


def thermochemistry(part: Text) -> dict[str, Printed]:
    """Return what MOPAC printed of its thermochemistry, the first temperature where there are several."""
    printed: dict[str, Printed] = {}

    def keep(name: str, match: re.Match[bytes], group: int, unit: str) -> None:
        line = part.line_number(match.start(group))
        printed[name] = Printed(match.group(group).decode(), unit, line)

    zero_point = _ZERO_POINT.search(part.data, part.start, part.end)
    if zero_point is not None:
        keep("zero_point", zero_point, 1, "kcal/mol")
    symmetry = _SYMMETRY.search(part.data, part.start, part.end)
    if symmetry is not None:
        keep("symmetry_number", symmetry, 1, "")
    thermo = _THERMO.search(part.data, part.start, part.end)
    if thermo is None:
        if part.find(b"CALCULATED THERMODYNAMIC PROPERTIES") >= 0:
            raise part.error(
                part.find(b"CALCULATED THERMODYNAMIC PROPERTIES"),
                "no thermodynamic properties that can be read after this line",
                mend=CUT_SHORT,
            )
        return printed
    keep("temperature", thermo, 1, "K")
    for group, share in enumerate(("vibrational_", "rotational_", "translational_", ""), start=2):
        keep(f"{share}entropy", thermo, group, "cal/(mol K)")
    parts = sum(printed[f"{share}_entropy"].value for share in ("vibrational", "rotational"))
    if abs(parts + printed["translational_entropy"].value - printed["entropy"].value) > 2e-4:
        raise part.error(
            thermo.start(5), "the total entropy is not the sum of its shares", mend=CUT_SHORT
        )
    return printed
