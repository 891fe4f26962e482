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

from thermo_pp.data.elements import NUMBERS
from thermo_pp.readers.nwchem.constants import GAS_CAL_MOL_K, HARTREE_KCAL_MOL, zero_point_kcal_mol
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
_UNITS_STEP = 0.0005 + 5e-7 * HARTREE_KCAL_MOL + 1e-6
"""A value in kcal/mol (three decimals) and the same in hartree (six) agree to this."""
_CM_PER_ROOT = 5140.487
"""cm^-1 per root of 1 hartree/(bohr^2 u)."""
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
_AFTER = {"K": rb"K *\r?\n", "kcal/mol": rb" kcal/mol  \( *(-?\d+\.\d+) au\)"}
_VALUES = re.compile(
    rb".*?".join(
        re.escape(mark) + rb" *(-?\d+\.?\d*)" + _AFTER.get(unit, rb"[ )\r\n]")
        for _, mark, unit in _THERMOCHEMISTRY
    ),
    re.DOTALL,
)


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


def atoms(text: Text, task: Task) -> tuple[Geometry, FloatArray]:
    """Return geometry and masses of the atom table of the last analysis of a task."""
    part = text.part(task.start, task.end)
    at = part.need_last(_ATOMS, lacking="no atom table of the vibrational analysis")
    first = part.next_line(at, 3)
    end = part.need(b"\n ---", first, lacking="no end of the atom table")
    names, table = atom_rows(part, first, end, name=0)
    numbers = [NUMBERS.get(name.capitalize(), 0) for name in names]
    if 0 in numbers:
        raise part.error(
            part.next_line(first, numbers.index(0)),
            f"{names[numbers.index(0)]!r} is no element",
            mend="frequencies of a molecule with ghost atoms are not read; rerun without them",
        )
    positions = table[:, :3] / BOHR_PER_ANGSTROM
    return Geometry(first, names, np.array(numbers), positions, ghosts=False), table[:, 3]


def vibrations(text: Text, task: Task, geometry: Geometry, masses_u: FloatArray) -> Vibrations:
    """Return what follows the atom table of an analysis.

    Raises
    ------
    ReadError
        A part is missing or damaged, or what is printed twice does not agree.
    """
    part = text.part(geometry.at, task.end)
    at: dict[str, int] = {}
    at["hessian_hartree_bohr2"] = place = part.need(_HESSIAN, lacking="no projected Hessian")
    hessian, square = _hessian(part, place, masses_u)
    dependent = part.data.count(_DEPENDENT, part.start, place)
    thermochemistry = _thermochemistry(part, place)
    at["modes"] = part.need(_FREQUENCY, place, lacking="no projected wavenumbers (P.Frequency)")
    rounded, vectors, end = _modes(part, at["modes"], 3 * len(masses_u))
    exact, at["wavenumbers_cm"] = _infrared(part, rounded, at["modes"], end)
    keep = _without_null(part, at["modes"], exact, len(masses_u), dependent)
    wavenumbers = [exact[mode] for mode in keep]
    _check_zero_point(part, thermochemistry, wavenumbers)
    _check_hessian(part, place, square, wavenumbers)
    modes = _unit(part, at["modes"], vectors[keep], masses_u)
    return Vibrations(np.array(wavenumbers), modes, hessian, thermochemistry, at)


def _hessian(part: Text, place: int, masses_u: FloatArray) -> tuple[FloatArray, float]:
    """Return the Hessian from its lower triangle, printed in blocks of ten columns.

    Besides the squared norm of the mass-weighted one.
    """
    size = 3 * len(masses_u)
    triangle = [[0.0] * size for _ in range(size)]
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
            triangle[row][first : first + count] = values[start + 1 : start + 1 + count]
            start += count + 1
        if first + 10 < size:
            line = part.next_line(line, 2)  # two blank lines between the blocks
    matrix = np.array(triangle)
    matrix = matrix + matrix.T
    matrix.flat[:: size + 1] *= 0.5
    matrix /= 1000.0
    roots = np.sqrt(np.repeat(masses_u, 3))
    return matrix * np.outer(roots, roots), float(np.vdot(matrix, matrix))


def _modes(part: Text, place: int, size: int) -> tuple[list[float], FloatArray, int]:
    """Return wavenumbers (two decimals) and eigenvectors, shape (size, size), and where the table ends."""
    wavenumbers: list[float] = []
    blocks: list[FloatArray] = []
    numbers = list(range(1, size + 1))
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
        if values[:: count + 1] != numbers:
            raise part.expected(begin, f"lines 1 to {size} of these modes")
        blocks.append(np.array(values).reshape(size, count + 1)[:, 1:].T)
    return wavenumbers, np.concatenate(blocks), place


def _infrared(part: Text, rounded: list[float], modes: int, end: int) -> tuple[list[float], int]:
    """Return the wavenumbers with the three decimals of the infrared table, and where they stand.

    Without that table (no dipole derivatives) they are those of the table of modes.
    """
    place = part.find(_INFRARED, end)
    if place < 0:
        return rounded, modes
    first = part.next_line(place, 3)
    stop = part.need(b"\n ---", first, lacking="no end of the infrared table")
    lines = part.data[first:stop].split(b"\n")
    exact: list[float] = []
    for number, (line, theirs) in enumerate(zip(lines, rounded, strict=False), start=1):
        words = line.partition(b"||")[0].split()
        try:
            exact.append(float(words[1]))
        except (ValueError, IndexError):
            exact.append(math.nan)
        if words[:1] != [b"%d" % number] or not abs(exact[-1] - theirs) < 0.0052:
            what = f"mode {number} of {theirs:.2f} cm^-1 as in the table of modes"
            raise part.expected(part.next_line(first, number - 1), what)
    if len(lines) != len(rounded):
        at = part.next_line(first, min(len(lines), len(rounded)))
        raise part.expected(at, f"the end of {len(rounded)} modes")
    return exact, first


def _without_null(
    part: Text, place: int, wavenumbers: list[float], atom_count: int, dependent: int
) -> list[int]:
    """Return the places of the vibrations in ascending order, the null modes left out.

    A rotation about the axis of a linear structure is "dependent" in the program's projection.
    """
    null = 3 if atom_count == 1 else 6 - dependent
    order = sorted(range(len(wavenumbers)), key=lambda mode: abs(wavenumbers[mode]))
    if null not in (3, 5, 6) or abs(wavenumbers[order[null - 1]]) > _NULL_CM:
        raise part.error(
            place,
            f"expected {null} null modes, translations and rotations, among these {len(order)} modes",
            mend="the projection failed, or the output is damaged; rerun the frequency task",
        )
    return sorted(order[null:], key=wavenumbers.__getitem__)


def _unit(part: Text, place: int, vectors: FloatArray, masses_u: FloatArray) -> FloatArray:
    """Return modes of length 1; those that the printed masses do not make 1 u are damaged."""
    masses = np.repeat(masses_u, 3)
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
    return np.asarray(unit.reshape(len(vectors), len(masses_u), 3))


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
    group = 0
    for key, mark, unit in _THERMOCHEMISTRY:
        group += 1
        if whole is None:  # something is missing or damaged: find it
            what = key.replace("_", " ")
            place = part.need(mark, place, lacking=f"no {what} in the printed thermochemistry")
            suffix = b"K" if unit == "K" else b")"
            part.exact_text(place + len(mark), f"the {what}", suffix)
            continue
        place, digits = whole.start(group), whole.group(group).decode()
        if unit == "kcal/mol":
            group += 1
            if abs(float(digits) - float(whole.group(group)) * HARTREE_KCAL_MOL) > _UNITS_STEP:
                what = "the values in kcal/mol and in hartree differ on this line"
                raise part.error(place, what, mend=CUT_SHORT)
        found[key] = (digits, unit, place)
    if whole is None:
        raise part.error(place, "a damaged line in the printed thermochemistry", mend=CUT_SHORT)
    _check_sums(part, found)
    return found


def _check_sums(part: Text, found: Mapping[str, tuple[str, str, int]]) -> None:
    """Compare the entropy with its parts, and the enthalpy with the energy: they differ by R T."""
    value = {key: float(digits) for key, (digits, _, _) in found.items()}
    parts = sum(
        value[f"{share}_entropy"] for share in ("translational", "rotational", "vibrational")
    )
    if abs(parts - value["entropy"]) > 0.0021:
        place = found["entropy"][2]
        raise part.error(
            place, f"the entropy is not the sum of its parts, {parts:.3f}", mend=CUT_SHORT
        )
    between = value["thermal_enthalpy"] - value["thermal_energy"]
    rt = GAS_CAL_MOL_K * value["temperature"] / 1000.0
    if abs(between - rt) > 0.00101 + 0.000005 * GAS_CAL_MOL_K:
        raise part.error(
            found["thermal_enthalpy"][2],
            f"the enthalpy is {between:.3f} kcal/mol above the energy, not R T = {rt:.3f}",
            mend=CUT_SHORT,
        )


def _check_hessian(part: Text, place: int, square: float, wavenumbers_cm: list[float]) -> None:
    """Compare the squared norm of the mass-weighted Hessian with that of its eigenvalues: all entries at once."""
    own = sum((wavenumber / _CM_PER_ROOT) ** 4 for wavenumber in wavenumbers_cm)
    if abs(square - own) > 1e-4 * own + 1e-12:
        what = "this Hessian does not have the wavenumbers of the modes"
        raise part.error(place, what, mend=CUT_SHORT)


def _check_zero_point(
    part: Text, thermochemistry: Mapping[str, tuple[str, str, int]], wavenumbers_cm: list[float]
) -> None:
    """Compare the printed zero-point energy with that of the modes, by the program's own constants."""
    real = [wavenumber for wavenumber in wavenumbers_cm if wavenumber > _NULL_CM]
    scale = float(thermochemistry["frequency_scale"][0])
    own = zero_point_kcal_mol(sum(real)) * scale
    digits, _, place = thermochemistry["zero_point"]
    rounding = 0.00051 + zero_point_kcal_mol(0.005 * len(real))
    if scale != 1.0:  # printed with four decimals
        rounding += 6e-5 * own
    if abs(own - float(digits)) > rounding:
        raise part.error(
            place,
            f"the zero-point energy {digits} kcal/mol is not that of the modes, {own:.3f}",
            mend=CUT_SHORT,
        )
