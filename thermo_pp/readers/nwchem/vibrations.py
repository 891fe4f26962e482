"""Frequency analysis of an NWChem task: atom table, Hessian, projected modes, printed thermochemistry.

The modes are those with translations and rotations projected out (``P.Frequency``). The program prints their
eigenvectors as Cartesian displacements of unit mass-weighted length (sum of m x^2 = 1 u, centre of mass at rest), so
dividing by the length makes them the displacements of the record. The null modes, six, five or three, stand among
them, an imaginary mode before.

The Hessian is the projected one, printed mass-weighted (hartree/bohr^2/kilo-u) with six significant digits; with the
printed masses it is put back to hartree/bohr^2. The program projects before it weights with masses, by P H P with P
free of unweighted translations and rotations, so this Hessian belongs to any isotopes and has the printed
wavenumbers, within 0.02 cm^-1 (seen on all fixtures, down to a mode of 21 cm^-1). Of the unprojected one that is true
only at an exact stationary point: 1 to 10 cm^-1 elsewhere.
"""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import SYMBOLS
from thermo_pp.readers.nwchem.constants import HARTREE_KCAL_MOL, zero_point_kcal_mol
from thermo_pp.readers.nwchem.geometry import BOHR_PER_ANGSTROM, Geometry, atom_rows
from thermo_pp.readers.nwchem.tasks import Task
from thermo_pp.readers.text import CUT_SHORT, Text
from thermo_pp.records import Printed

FloatArray = NDArray[np.float64]

_ATOMS = b"- Atom information -"
_HESSIAN = b"MASS-WEIGHTED PROJECTED HESSIAN (Hartree/Bohr/Bohr/Kamu)"
_DEPENDENT = b"Dependent rotation vector no."
_EIGENVECTORS = b"NORMAL MODE EIGENVECTORS"
_FREQUENCY = b" P.Frequency "
_INFRARED = b"Projected Infra Red Intensities"
_NULL_CM = 0.1
"""The program itself counts no mode below this in its thermochemistry."""
_THERMOCHEMISTRY: tuple[tuple[str, bytes, str], ...] = (
    ("temperature", b" Temperature                      =", "K"),
    ("frequency_scale", b" frequency scaling parameter      =", ""),
    ("zero_point", b" Zero-Point correction to Energy  =", "kcal/mol"),
    ("thermal_energy", b" Thermal correction to Energy     =", "kcal/mol"),
    ("thermal_enthalpy", b" Thermal correction to Enthalpy   =", "kcal/mol"),
    ("entropy", b" Total Entropy                    =", "cal/(mol K)"),
    ("translational_entropy", b"   - Translational                =", "cal/(mol K)"),
    ("molecular_weight", b"(mol. weight =", "u"),
    ("rotational_entropy", b"   - Rotational                   =", "cal/(mol K)"),
    ("symmetry_number", b"(symmetry #  =", ""),
    ("vibrational_entropy", b"   - Vibrational                  =", "cal/(mol K)"),
    ("heat_capacity_v", b" Cv (constant volume heat capacity) =", "cal/(mol K)"),
)
"""Key, the mark before the number, and the unit, in the order in which they are printed."""
_VALUES = re.compile(
    rb".*?".join(
        re.escape(mark) + rb" *(-?\d+\.?\d*)" + (rb"K *\r?\n" if unit == "K" else rb"[ )\r\n]")
        for _, mark, unit in _THERMOCHEMISTRY
    ),
    re.DOTALL,
)


@dataclass(frozen=True, eq=False)
class Atoms:
    """The atom table of the analysis: elements (not the names that the input gave), places and masses."""

    at: int
    symbols: tuple[str, ...]
    positions_angstrom: FloatArray
    masses_u: FloatArray

    def same(self, geometry: Geometry) -> bool:
        """Tell whether a geometry block shows the same atoms, up to the rounding of both."""
        symbols = [SYMBOLS[z] for z in geometry.numbers]
        if len(symbols) != len(self.symbols) or any(
            theirs not in ("", mine) for mine, theirs in zip(self.symbols, symbols, strict=True)
        ):
            return False
        apart = np.abs(self.positions_angstrom - geometry.positions_angstrom)
        rounding = 1e-8 + 5e-8 * np.maximum(1.0, np.abs(self.positions_angstrom))
        return bool(np.all(apart <= rounding))


@dataclass(frozen=True, eq=False)
class Vibrations:
    """What the analysis holds.

    Attributes
    ----------
    wavenumbers_cm : shape (m,)
    modes : shape (m, n, 3)
    hessian_hartree_bohr2 : shape (3n, 3n)
    thermochemistry : mapping of str to (text, unit, offset)
        The first temperature's.
    at : dict of str to int
        Field -> offset.
    """

    wavenumbers_cm: FloatArray
    modes: FloatArray
    hessian_hartree_bohr2: FloatArray
    thermochemistry: Mapping[str, tuple[str, str, int]]
    at: dict[str, int]

    def printed(self, lines: Mapping[str, int]) -> dict[str, Printed]:
        """Return the thermochemistry with its line numbers, `lines` under the same keys."""
        return {
            key: Printed(digits, unit, lines[key])
            for key, (digits, unit, _) in self.thermochemistry.items()
        }


def atoms(text: Text, task: Task) -> Atoms:
    """Return the atom table of the last analysis of a task."""
    part = text.part(task.start, task.end)
    at = part.need_last(_ATOMS, lacking="no atom table of the vibrational analysis")
    first = part.next_line(at, 3)
    end = part.need(b"\n ---", first, lacking="no end of the atom table")
    names, table = atom_rows(part, first, end, name=0)
    symbols = tuple(name.capitalize() for name in names)
    return Atoms(first, symbols, table[:, :3] / BOHR_PER_ANGSTROM, table[:, 3])


def vibrations(text: Text, task: Task, table: Atoms) -> Vibrations:
    """Return what follows the atom table of an analysis.

    Raises
    ------
    ReadError
        A part is missing or damaged, or what is printed twice does not agree.
    """
    part = text.part(table.at, task.end)
    at: dict[str, int] = {}
    at["hessian_hartree_bohr2"] = place = part.need(_HESSIAN, lacking="no projected Hessian")
    hessian = _hessian(part, place, table.masses_u)
    dependent = part.data.count(_DEPENDENT, part.start, place)
    thermochemistry = _thermochemistry(part, place)
    at["modes"] = part.need(_FREQUENCY, place, lacking="no projected wavenumbers (P.Frequency)")
    rounded, vectors, end = _modes(part, at["modes"], 3 * len(table.symbols))
    exact, at["wavenumbers_cm"] = _infrared(part, rounded, at["modes"], end)
    keep = _without_null(part, at["modes"], exact, len(table.symbols), dependent)
    _check_zero_point(part, thermochemistry, exact[keep])
    return Vibrations(
        exact[keep], _unit(part, at["modes"], vectors[keep], table), hessian, thermochemistry, at
    )


def _hessian(part: Text, place: int, masses_u: FloatArray) -> FloatArray:
    """Return the Hessian from its lower triangle, printed in blocks of ten columns."""
    size = 3 * len(masses_u)
    matrix = np.zeros((size, size))
    line = part.next_line(place, 4)
    for first in range(0, size, 10):
        columns = [b"%d" % (column + 1) for column in range(first, min(first + 10, size))]
        if part.rest(line).split() != columns:
            raise part.expected(line, f"columns from {first + 1} on of the Hessian")
        counts = [min(row + 1, first + 10) - first for row in range(first, size)]
        begin = part.next_line(line, 2)
        values, line = part.rows(begin, [count + 1 for count in counts], "a row of the Hessian")
        start = 0
        for row, count in enumerate(counts, start=first):
            if values[start] != row + 1:
                raise part.expected(part.next_line(begin, row - first), f"row {row + 1}")
            matrix[row, first : first + count] = values[start + 1 : start + 1 + count]
            start += count + 1
        if first + 10 < size:
            line = part.next_line(line, 2)  # two blank lines between the blocks
    matrix += np.tril(matrix, -1).T
    roots = np.sqrt(np.repeat(masses_u, 3))
    return np.asarray(matrix * np.outer(roots, roots) / 1000.0)


def _modes(part: Text, place: int, size: int) -> tuple[FloatArray, FloatArray, int]:
    """Return wavenumbers (two decimals) and eigenvectors, shape (size, size), and where the table ends."""
    wavenumbers: list[float] = []
    blocks: list[FloatArray] = []
    numbers = np.arange(1.0, size + 1.0)
    for first in range(0, size, 6):
        count = min(6, size - first)
        line = place if first == 0 else part.need(_FREQUENCY, place, lacking="no further modes")
        wavenumbers += part.floats(line, count, f"{count} wavenumbers", skip=1)
        begin = part.next_line(line, 2)
        if max(map(abs, wavenumbers[first:])) <= _NULL_CM:  # null modes only, left out afterwards
            blocks.append(np.zeros((count, size)))
            place = part.next_line(begin, size)
            continue
        values, place = part.rows(begin, [count + 1] * size, "the displacements of an atom")
        rows = np.array(values).reshape(size, count + 1)
        if not np.array_equal(rows[:, 0], numbers):
            raise part.expected(begin, f"lines 1 to {size} of these modes")
        blocks.append(rows[:, 1:].T)
    return np.array(wavenumbers), np.concatenate(blocks), place


def _infrared(part: Text, rounded: FloatArray, modes: int, end: int) -> tuple[FloatArray, int]:
    """Return the wavenumbers with the three decimals of the infrared table, and where they stand.

    Without that table (no dipole derivatives) they are those of the table of modes.
    """
    place = part.find(_INFRARED, end)
    if place < 0:
        return rounded, modes
    line = first = part.next_line(place, 3)
    exact: list[float] = []
    for number, theirs in enumerate(rounded.tolist(), start=1):
        index, _, rest = part.rest(line).lstrip().partition(b" ")
        if index != b"%d" % number:
            raise part.expected(line, f"mode {number} of the infrared table")
        try:
            exact.append(float(rest.split(None, 1)[0]))
        except (ValueError, IndexError):
            raise part.expected(line, f"the wavenumber of mode {number}") from None
        if not abs(exact[-1] - theirs) < 0.0052:
            raise part.error(
                line,
                f"wavenumber {exact[-1]:.3f} here, but {theirs:.2f} in the table of modes "
                f"(line {part.line_number(modes)})",
                mend=CUT_SHORT,
            )
        line = part.next_line(line)
    if part.rest(line).lstrip()[:1].isdigit():
        raise part.expected(line, f"the end of the infrared table after {len(exact)} modes")
    return np.array(exact), first


def _without_null(
    part: Text, place: int, wavenumbers: FloatArray, atom_count: int, dependent: int
) -> NDArray[np.int64]:
    """Return the places of the vibrations in ascending order, the null modes left out.

    A rotation about the axis of a linear structure is "dependent" in the program's projection.
    """
    null = 3 if atom_count == 1 else 6 - dependent
    order = np.argsort(np.abs(wavenumbers), kind="stable")
    if null not in (3, 5, 6) or float(np.max(np.abs(wavenumbers[order[:null]]))) > _NULL_CM:
        raise part.error(
            place,
            f"expected {null} null modes, translations and rotations, among these {len(order)} modes",
            mend="the projection failed, or the output is damaged; rerun the frequency task",
        )
    keep = order[null:]
    return np.array(keep[np.argsort(wavenumbers[keep], kind="stable")])


def _unit(part: Text, place: int, vectors: FloatArray, table: Atoms) -> FloatArray:
    """Return modes of length 1; those that the printed masses do not make 1 u are damaged."""
    masses = np.repeat(table.masses_u, 3)
    squares = vectors * vectors
    off = np.abs(squares @ masses - 1.0)
    # five decimals: 2 sum(m |x|) 5e-6, and sum(m |x|) is at most the root of the total mass
    if off.max(initial=0.0) > 1e-5 * (1.0 + math.sqrt(masses.sum())):
        worst = int(np.argmax(off))
        raise part.error(
            place,
            f"vibration {worst + 1} of these modes has a mass-weighted length that is off by {off[worst]:.1e}",
            mend=CUT_SHORT,
        )
    unit = vectors / np.sqrt(squares.sum(axis=1))[:, np.newaxis]
    return np.asarray(unit.reshape(len(vectors), len(table.symbols), 3))


def _thermochemistry(part: Text, start: int) -> dict[str, tuple[str, str, int]]:
    """Return text, unit and offset of the first temperature's values."""
    first = _THERMOCHEMISTRY[0][1]
    place = part.need(first, start, lacking="no printed thermochemistry")
    end = min(
        part.need(_EIGENVECTORS, place, lacking="no projected modes"),
        part.data.find(first, place + 1, place + 4096) % (part.end + 1),
    )
    part = part.part(place, end)
    whole = _VALUES.match(part.data, place, end)
    found: dict[str, tuple[str, str, int]] = {}
    for index, (key, mark, unit) in enumerate(_THERMOCHEMISTRY, start=1):
        if whole is None:  # something is missing or damaged: find it
            what = key.replace("_", " ")
            place = part.need(mark, place, lacking=f"no {what} in the printed thermochemistry")
            suffix = b"K" if unit == "K" else b")"
            digits = part.exact_text(place + len(mark), f"the {what}", suffix)
        else:
            place, digits = whole.start(index), whole.group(index).decode()
        if unit == "kcal/mol":
            _check_hartree(part, place, float(digits))
        found[key] = (digits, unit, place + 1)
    return found


def _check_hartree(part: Text, place: int, kcal_mol: float) -> None:
    """Compare a value with the same in hartree on its line."""
    mark = b"kcal/mol  ("
    unit = part.rest(place).find(mark)
    hartree = float(part.exact_text(place + unit + len(mark), "the value in hartree"))
    if (
        unit < 0
        or abs(kcal_mol - hartree * HARTREE_KCAL_MOL) > 0.0005 + 5e-7 * HARTREE_KCAL_MOL + 1e-6
    ):
        raise part.error(
            place + 1, "the values in kcal/mol and in hartree differ on this line", mend=CUT_SHORT
        )


def _check_zero_point(
    part: Text, thermochemistry: Mapping[str, tuple[str, str, int]], wavenumbers_cm: FloatArray
) -> None:
    """Compare the printed zero-point energy with that of the modes, by the program's own constants."""
    real = wavenumbers_cm[wavenumbers_cm > _NULL_CM]
    scale = float(thermochemistry["frequency_scale"][0])
    own = zero_point_kcal_mol(real) * scale
    digits, _, place = thermochemistry["zero_point"]
    rounding = 0.00051 + zero_point_kcal_mol(np.array([0.005])) * len(real)
    if not math.isclose(
        own, float(digits), rel_tol=6e-5 if scale != 1.0 else 0.0, abs_tol=rounding
    ):
        raise part.error(
            place,
            f"the zero-point energy {digits} kcal/mol is not that of the modes, {own:.3f}",
            mend=CUT_SHORT,
        )
