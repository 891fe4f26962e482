"""Vibrations and thermochemistry of a Gaussian output.

Translations and rotations are projected out and left out. With ``freq=hpmodes`` every mode is printed
twice: five columns with five digits, then three columns with two; anharmonic jobs print the harmonic
modes again. Displacements are Cartesian and of unit length, imaginary wavenumbers negative.
"""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import groupby

import numpy as np
from numpy.typing import NDArray

from thermo_pp.readers.gaussian.steps import THERMOCHEMISTRY, Step
from thermo_pp.readers.number_table import decimal_table, number_table
from thermo_pp.readers.text import CUT_SHORT, Text

FloatArray = NDArray[np.float64]

PRINTED_CONSTANTS: dict[str, float] = {
    "BOLTZMANN_J_K": 1.3806488e-23,
    "PLANCK_J_S": 6.62606957e-34,
    "AVOGADRO_MOL": 6.02214129e23,
    "LIGHT_M_S": 299792458.0,
    "GAS_J_MOL_K": 8.3144621,
    "ATOMIC_MASS_KG": 1.660538921e-27,
    "HARTREE_J": 4.35974434e-18,
    "BOHR_M": 0.52917721092e-10,
}
"""CODATA 2010 under the names of `units`: Gaussian 16 prints thermochemistry with these."""
PRINTED_STEPS = 2.0
"""Older versions have older constants, and sums are printed of rounded parts."""

_SETS = b" and normal coordinates:"
_LINE = b"\n Frequencies -- "
_FINE_LINE = b" Frequencies ---"
_TABLE = re.compile(rb" Atom +AN +X +Y +Z[^\n]*\n")
_FINE_TABLE = b"\n Coord Atom Element:"
_MOST_OFF = 0.3
_EH = rb" *= *(-?\d+\.\d+)"
_VALUES: dict[str, re.Pattern[bytes]] = {
    "zero_point": re.compile(rb"\n Zero-point correction" + _EH),
    "thermal_energy": re.compile(rb"\n Thermal correction to Energy" + _EH),
    "thermal_enthalpy": re.compile(rb"\n Thermal correction to Enthalpy" + _EH),
    "enthalpy": re.compile(rb"\n Sum of electronic and thermal Enthalpies" + _EH),
    "gibbs": re.compile(rb"\n Sum of electronic and thermal Free Energies" + _EH),
}
_GIBBS_CORRECTION = re.compile(rb"\n Thermal correction to Gibbs Free Energy" + _EH)
_SUM = re.compile(rb"\n Sum of electronic and zero-point Energies" + _EH)
_TEMPERATURE = re.compile(rb"\n Temperature +(\d+\.\d+) Kelvin\. +Pressure +(\d+\.\d+) Atm")
_TEMPERATURES = re.compile(rb"\n Vibrational temperatures?:([^:=]*?)\n *\n")
_SYMMETRY = re.compile(rb"\n Rotational symmetry number +(\d+)\.")
_ROW = rb"\n %b +(-?\d+\.\d+) +(-?\d+\.\d+) +(-?\d+\.\d+)"
_SHARES = {
    "": re.compile(_ROW % b"Total"),
    "translational_": re.compile(_ROW % b"Translational"),
    "rotational_": re.compile(_ROW % b"Rotational"),
    "vibrational_": re.compile(_ROW % b"Vibrational"),
}
_SCALE = re.compile(r"scale *= *(\d*\.\d+)", re.IGNORECASE)


@dataclass(frozen=True, eq=False)
class Vibrations:
    """One set of modes and the thermochemistry below it.

    Attributes
    ----------
    at : int
        Where its first line of wavenumbers stands.
    wavenumbers_cm : shape (m,)
    modes : shape (m, n, 3)
    """

    at: int
    wavenumbers_cm: FloatArray
    modes: FloatArray


@dataclass(frozen=True)
class Thermochemistry:
    """The printed thermochemistry: key -> (text, unit, offset), and the electronic energy it starts from."""

    at: int
    printed: dict[str, tuple[str, str, int]]
    electronic: float
    electronic_at: int


def sets(step: Step) -> list[int]:
    """Return where the sets of modes before the thermochemistry begin; a heading is printed for each."""
    thermo = step.thermochemistry_at
    if thermo >= 0:
        return step.text.part(step.start, thermo).all(_SETS)
    asked = step.asks_frequencies or (step.archive is not None and step.archive.job == "Freq")
    return step.part.all(_SETS) if asked else []


def vibrations(part: Text, first: int, atoms: int, *, projected: bool = False) -> Vibrations:
    """Return the modes that are printed from `first` on; one less may be there where `projected`.

    Raises
    ------
    ReadError
        A damaged table, another number of modes than 3N-6 or 3N-5, displacements that are not of
        unit length, wavenumbers printed twice that do not agree.
    """
    following = part.find(_SETS, first + len(_SETS))
    thermo = part.find(THERMOCHEMISTRY, first)
    end = min(place for place in (following, thermo, part.end) if place >= 0)
    own = part.part(first, end)
    fine = own.has(_FINE_TABLE)
    found = _fine_set(own, atoms) if fine else _set(own, atoms)
    _check(part, found, atoms, projected)
    if fine and following >= 0:
        second = _numbers(part.part(following, thermo if thermo >= 0 else None), fine=False)[0]
        if len(second) == 0 or not np.array_equal(np.sort(second), found.wavenumbers_cm):
            raise part.error(
                found.at,
                "the wavenumbers printed with many digits are not those printed with few",
                mend="the output is damaged; rerun or re-copy it",
            )
    return found


def _check(part: Text, found: Vibrations, atoms: int, projected: bool) -> None:
    listed = part.part(found.at).line_match(_TEMPERATURES, b"\n Vibrational temperature")
    if listed is not None:
        count = len(re.findall(rb"\d+\.\d+", listed.group(1)))
        if count != int(np.sum(found.wavenumbers_cm > 0.0)):
            raise part.error(
                listed.start() + 1,
                f"{count} vibrational temperatures, but {int(np.sum(found.wavenumbers_cm > 0.0))} real modes",
                mend="the output is damaged; rerun or re-copy it",
            )
    expected = {1: (0,), 2: (1,)}.get(atoms, (3 * atoms - 6, 3 * atoms - 5))
    if projected:
        expected = (*(count - 1 for count in expected if count), *expected)
    if len(found.wavenumbers_cm) not in expected:
        raise part.error(
            found.at,
            f"{len(found.wavenumbers_cm)} modes of {atoms} atoms, expected "
            f"{' or '.join(map(str, expected))}",
            mend="give a frequency job of the whole molecule, without frozen atoms",
        )


def _numbers(own: Text, fine: bool) -> tuple[FloatArray, list[tuple[int, int]]]:
    """Return the wavenumbers of a set and, for each line of them, where it begins and its columns."""
    values: list[float] = []
    lines: list[tuple[int, int]] = []
    mark = _FINE_LINE if fine else _LINE
    for place in own.all(mark):
        at = place + (not fine)
        try:
            row = [float(word) for word in own.rest(place + len(mark)).split()]
        except ValueError:
            row = []
        if not row or not math.isfinite(sum(row)):
            raise own.expected(at, "wavenumbers")
        values += row
        lines.append((at, len(row)))
    return np.array(values), lines


def _set(own: Text, atoms: int) -> Vibrations:
    values, lines = _numbers(own, fine=False)
    tables: list[tuple[int, int]] = []
    for line, width in lines:
        table = _TABLE.search(own.data, line, own.end)
        if table is None:
            raise own.expected(line, "displacements below this line")
        tables.append((table.end(), 3 * width))
    order = [list(range(1, atoms + 1))]
    columns = [
        rows.reshape(atoms, -1, 3).transpose(1, 0, 2) for rows in _tables(own, tables, order, 2)
    ]
    return _made(own, values, columns, lines, atoms)


def _fine_set(own: Text, atoms: int) -> Vibrations:
    values, lines = _numbers(own, fine=True)
    tables = [
        (own.next_line(own.need(_FINE_TABLE, line, lacking="no displacements") + 1), width)
        for line, width in lines
    ]
    order = [atoms * [1, 2, 3], [atom for atom in range(1, atoms + 1) for _ in range(3)]]
    columns = [
        rows.reshape(atoms, 3, -1).transpose(2, 0, 1) for rows in _tables(own, tables, order, 3)
    ]
    return _made(own, values, columns, lines, atoms)


def _tables(
    own: Text, tables: list[tuple[int, int]], order: Sequence[list[int]], before: int
) -> list[FloatArray]:
    """Return the displacements of tables, (rows, columns) each.

    Parameters
    ----------
    own : Text
    tables : list of (int, int)
        Where the lines of each begin and its columns.
    order : sequence of lists of int
        The first words of the lines, a list for each of their columns.
    before : int
        How many words stand before the displacements.

    Raises
    ------
    ReadError
        Any other form of a line; names it.
    """
    rows = len(order[0])
    words = [[b"%d" % number for number in column] for column in order]
    found: list[FloatArray] = []
    for width, alike in groupby(tables, key=lambda table: table[1]):
        starts = [start for start, _ in alike]
        whole = _at_once(own, starts, words, before)
        if whole is not None and whole.shape[2] == width:
            found += list(whole)
            continue
        for start in starts:
            table = _array(own, start, own.lines_on(start, rows), rows, before + width)
            if not np.array_equal(table[:, : len(order)].T, order):
                raise own.expected(start, "displacements of all atoms")
            found.append(table[:, before:])
    return found


def _at_once(
    own: Text, starts: list[int], order: list[list[bytes]], before: int
) -> FloatArray | None:
    """Return tables of one layout (tables, rows, columns), None where a line has another."""
    rows = len(order[0])
    length = own.data.find(b"\n", starts[0], own.end) + 1 - starts[0]
    if length < 1 or max(starts) + rows * length > own.end:
        return None
    parts = [np.frombuffer(own.data, np.uint8, rows * length, start) for start in starts]
    table = decimal_table(np.concatenate(parts).reshape(-1, length))
    if table is None:
        return None
    words = table[0].split()
    if len(words) != before * rows * len(starts):
        return None
    if any(words[i::before] != column * len(starts) for i, column in enumerate(order)):
        return None
    return table[1].reshape(len(starts), rows, -1)


def _made(
    own: Text,
    values: FloatArray,
    columns: list[FloatArray],
    lines: list[tuple[int, int]],
    atoms: int,
) -> Vibrations:
    if not lines:
        raise own.error(own.start, "no wavenumbers after this line", mend=CUT_SHORT)
    displacements = np.concatenate(columns)
    lengths = np.sqrt(np.sum(displacements**2, axis=(1, 2)))
    if np.any(np.abs(lengths - 1.0) > _MOST_OFF):
        raise own.error(lines[0][0], "displacements that are not of unit length", mend=CUT_SHORT)
    order = np.argsort(values, kind="stable")
    unit = displacements / lengths[:, None, None]
    return Vibrations(lines[0][0], values[order], unit[order].reshape(-1, atoms, 3))


def _array(own: Text, start: int, end: int, rows: int, words: int) -> FloatArray:
    """Return a table of `rows` lines of `words` numbers; ReadError at the line that is not one."""
    values = number_table(own.data[start:end], rows * words)
    if values is not None:
        return values.reshape(rows, words)
    line = start
    for _ in range(rows):
        if len(own.rest(line).split()) != words:
            raise own.expected(line, f"displacements, {words} words")
        own.floats(line, words, "displacements of an atom")
        line = own.next_line(line)
    raise own.expected(start, "displacements of all atoms")


def thermochemistry(step: Step) -> Thermochemistry | None:
    """Return the last thermochemistry of a step, None where there is none."""
    start = step.thermochemistry_at
    if start < 0:
        return None
    section = step.part.part(start)
    printed: dict[str, tuple[str, str, int]] = {}

    def take(name: str, pattern: re.Pattern[bytes], unit: str, group: int = 1) -> bool:
        match = pattern.search(section.data, section.start, section.end)
        if match is None:
            return False
        printed[name] = (match.group(group).decode(), unit, match.start(group))
        return True

    for name, pattern in _VALUES.items():
        if not take(name, pattern, "Eh"):
            raise section.error(
                start, f"thermochemistry without its {name.replace('_', ' ')}", mend=CUT_SHORT
            )
    total = _SUM.search(section.data, section.start, section.end)
    correction = _GIBBS_CORRECTION.search(section.data, section.start, section.end)
    if total is None or correction is None or not take("temperature", _TEMPERATURE, "K"):
        raise section.error(start, "thermochemistry that is not whole", mend=CUT_SHORT)
    take("pressure", _TEMPERATURE, "atm", 2)
    take("symmetry_number", _SYMMETRY, "")
    for name, pattern in _SHARES.items():
        take(f"{name}entropy", pattern, "cal/(mol K)", 3)
    take("heat_capacity_v", _SHARES[""], "cal/(mol K)", 2)
    electronic = float(total.group(1)) - float(printed["zero_point"][0])
    others = (
        float(printed["enthalpy"][0]) - float(printed["thermal_enthalpy"][0]),
        float(printed["gibbs"][0]) - float(correction.group(1)),
    )
    if max(abs(electronic - other) for other in others) > 3.1e-6:
        raise section.error(
            total.start() + 1,
            "the sums of this thermochemistry do not start from one electronic energy",
            mend="the output is damaged here; rerun or re-copy it",
        )
    scale = _SCALE.search(step.route)
    if scale is not None:
        printed["frequency_scale"] = (scale.group(1), "", start)
    return Thermochemistry(start, printed, electronic, total.start() + 1)
