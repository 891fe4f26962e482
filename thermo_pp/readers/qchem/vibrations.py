"""Vibrations and thermochemistry that Q-Chem prints.

Translations and rotations are projected out before they are printed. Imaginary wavenumbers have a minus sign.
Displacements are of unit length, not mass-weighted, to three decimals. ``Total Enthalpy`` is the correction to the
electronic energy (zero-point energy, thermal energy and RT); no G is printed. Newer versions print the same once more
with quasi-rigid rotors (``QRRHO-...``), which is left aside.
"""

from __future__ import annotations

import math
import re

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import SYMBOLS
from thermo_pp.readers import joined_hessian
from thermo_pp.readers.line_marks import matches
from thermo_pp.readers.printed_matrix import printed_matrix
from thermo_pp.readers.qchem.geometry import Geometry
from thermo_pp.readers.text import CUT_SHORT, Text
from thermo_pp.records import Printed

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
    "CALORIE_J": 4.184,
}
"""CODATA 2010 under the names of `units`; what Q-Chem 5.4 prints does not tell it from its neighbours."""
ANALYSIS = b"VIBRATIONAL ANALYSIS"
THERMO = b"STANDARD THERMODYNAMIC QUANTITIES AT"
_HESSIANS = (b"\n Hessian of the SCF Energy", b"\n Final Hessian.")
_FREQUENCY = b"\n Frequency:"
_HEADING = re.compile(rb"AT\s+(\d+\.\d+) K\s+AND\s+(\d+\.\d+) ATM")
_IMAGINARY = re.compile(rb"This Molecule has\s+(\d+) Imaginary Frequenc")
_MASS = re.compile(rb"^ +Atom +(\d+) Element +(\w+) +Has Mass", re.MULTILINE)
_FORCE_TO_CM = 1302.79
"""cm^-1 per root of 1 mdyn/(angstrom u)."""
_KCAL_PER_CM = 1.1962656e-2 / 4.184
_VALUES = (
    ("zero_point", b"   Zero point vibrational energy:", "kcal/mol"),
    ("thermal_enthalpy", b"   Total Enthalpy:", "kcal/mol"),
    ("entropy", b"   Total Entropy:", "cal/(mol K)"),
    ("translational_entropy", b"   Translational Entropy:", "cal/(mol K)"),
    ("rotational_entropy", b"   Rotational Entropy:", "cal/(mol K)"),
    ("vibrational_entropy", b"   Vibrational Entropy:", "cal/(mol K)"),
    ("symmetry_number", b"   Rotational Symmetry Number is", ""),
)
Found = dict[str, tuple[str, str, int]]
"""Key of `printed` -> digits, unit, offset."""


def modes(part: Text, shape: Geometry) -> tuple[FloatArray, FloatArray, int]:
    """Return wavenumbers (m,), displacements (m, n, 3) of unit length, and where the wavenumbers stand.

    Raises
    ------
    ReadError
        A damaged table, a number of modes that is not 3N-6 or 3N-5, wavenumbers that their force constants and
        reduced masses do not have.
    """
    atoms = len(shape.numbers)
    wavenumbers: list[float] = []
    columns: list[FloatArray] = []
    lines = [at + len(_FREQUENCY) for at in part.all(_FREQUENCY)]
    for at in lines:
        count = len(part.rest(at).split())
        row = part.floats(at, count, "wavenumbers")
        if not 1 <= count <= 3:
            raise part.expected(at, "one to three wavenumbers")
        _check_force_constants(part, at, row)
        wavenumbers += row
        columns.append(_displacements(part, at, count, shape))
    expected = {1: {0}, 2: {1}}.get(atoms, {3 * atoms - 6, 3 * atoms - 5})
    if len(wavenumbers) not in expected:
        words = " or ".join(str(one) for one in sorted(expected))
        raise part.error(
            lines[0] if lines else part.start,
            f"{len(wavenumbers)} vibrations of {atoms} atoms, expected {words}",
            mend="give a full frequency job, not one of a part of the molecule",
        )
    if not wavenumbers:
        return np.zeros(0), np.zeros((0, atoms, 3)), part.start
    vectors = np.concatenate(columns)
    lengths = np.sqrt((vectors**2).sum(axis=(1, 2)))
    if np.any(np.abs(lengths - 1.0) > 0.05):
        worst = int(np.argmax(np.abs(lengths - 1.0)))
        raise part.error(
            lines[worst // 3],
            f"mode {worst + 1} is not of unit length: {lengths[worst]:.3f}",
            mend=CUT_SHORT,
        )
    order = np.argsort(wavenumbers, kind="stable")
    unit = vectors / lengths[:, None, None]
    return np.array(wavenumbers)[order], unit[order], lines[0]


def hessian_at(text: Text, start: int, end: int) -> int:
    """Return the offset of the last heading of a Hessian that is not mass-weighted, -1 where none is printed."""
    found = max(text.data.rfind(mark, start, end) for mark in _HESSIANS)
    return found if found < 0 else found + 1


def hessian(
    text: Text, at: int, masses_u: FloatArray, shape: Geometry, wavenumbers_cm: FloatArray
) -> FloatArray | None:
    """Return the Hessian below a heading, None where it is damaged or has other wavenumbers."""
    matrix = printed_matrix(text.data, text.next_line(at), 3 * len(masses_u), 1)
    found = joined_hessian.modes_of(matrix, masses_u, shape.positions_angstrom, wavenumbers_cm)
    return None if found is None else matrix


def _check_force_constants(part: Text, at: int, wavenumbers: list[float]) -> None:
    """Compare wavenumbers with the force constants and reduced masses on the lines below them."""
    rows: list[list[float]] = []
    for mark in (b" Force Cnst:", b" Red. Mass:"):
        at = part.next_line(at)
        if not part.rest(at).startswith(mark):
            return
        rows.append(part.floats(at + len(mark), len(wavenumbers), "a number of each mode"))
    for wavenumber, force, mass in zip(wavenumbers, *rows, strict=True):
        if mass <= 0.0:
            raise part.expected(at, "reduced masses")
        low, high = max(abs(force) - 6e-5, 0.0), abs(force) + 6e-5
        least = _FORCE_TO_CM * math.sqrt(low / (mass + 6e-5)) * (1 - 1e-4) - 0.01
        most = _FORCE_TO_CM * math.sqrt(high / (mass - 5e-5)) * (1 + 1e-4) + 0.01
        if not least <= abs(wavenumber) <= most:
            raise part.error(
                at,
                f"the wavenumber {wavenumber} does not follow from force constant {force} and reduced mass {mass}",
                mend=CUT_SHORT,
            )


def _displacements(part: Text, at: int, count: int, shape: Geometry) -> FloatArray:
    """Return the displacements of the modes whose wavenumbers stand at `at`, shape (count, n, 3)."""
    heading = part.find(b" X      Y      Z", at)
    if not 0 <= heading < part.blank_line(at):
        raise part.error(at, "no displacements of these modes", mend=CUT_SHORT)
    line = part.next_line(heading)
    width, names = 3 * count + 1, [SYMBOLS[number].encode() for number in shape.numbers]
    words = part.data[line : part.next_line(line, len(names))].split()
    if words[::width] == names and len(words) == width * len(names):
        del words[::width]
        try:
            values = list(map(float, words))
        except ValueError:
            values = [math.nan]
        if math.isfinite(sum(values)):
            return np.array(values).reshape(len(names), count, 3).transpose(1, 0, 2)
    for name in names:  # something is damaged: find it
        row = part.rest(line).split()
        if len(row) != width or row[0] != name:
            raise part.expected(line, f"the displacements of an atom {name.decode()}")
        part.floats(line, 3 * count, "displacements", skip=1)
        line = part.next_line(line)
    raise part.expected(heading, "displacements")


def thermochemistry(part: Text, start: int) -> Found:
    """Return what is printed from the heading at `start` on."""
    heading = _HEADING.search(part.rest(start))
    if heading is None:
        raise part.expected(start, "the temperature and pressure")
    found: Found = {"temperature": (heading.group(1).decode(), "K", start)}
    if float(heading.group(2)) > 0.0:  # two decimals: a low pressure is printed as nothing
        found["pressure"] = (heading.group(2).decode(), "atm", start)
    section = part.part(start, part.data.find(THERMO, start + 1, part.end) % (part.end + 1))
    for name, mark, unit in _VALUES:
        at = section.find(mark)
        if at >= 0:
            digits = section.exact_text(at + len(mark), f"the {name.replace('_', ' ')}")
            found[name] = (digits, unit, at)
    for name in ("thermal_enthalpy", "entropy", "translational_entropy"):
        if name not in found:
            raise part.error(start, f"no {name.replace('_', ' ')} in this table", mend=CUT_SHORT)
    return found


def masses(part: Text, start: int, shape: Geometry) -> tuple[FloatArray, int] | None:
    """Return the masses that are printed with the thermochemistry, and where; None where they are not."""
    section = part.part(start, part.data.find(THERMO, start + 1, part.end) % (part.end + 1))
    rows = matches(_MASS, b"Has Mass", section, section.start, section.end)
    if not rows:
        return None
    if len(rows) != len(shape.numbers):
        raise part.error(
            rows[0].start(),
            f"masses of {len(rows)} atoms, expected {len(shape.numbers)}",
            mend=CUT_SHORT,
        )
    values = []
    for index, (row, number) in enumerate(zip(rows, shape.numbers, strict=True), start=1):
        symbol = row.group(2).decode("utf-8", "replace")
        if int(row.group(1)) != index or symbol.capitalize() != SYMBOLS[number]:
            raise part.expected(row.start(), f"the mass of atom {index}, {SYMBOLS[number]}")
        value = float(section.exact_text(row.end(), "a mass"))
        if not 0.4 * number < value < 4.0 * number + 4.0:
            raise part.expected(row.start(), "the mass of an atom")
        values.append(value)
    at = section.find(b"   Molecular Mass:")
    if at >= 0:
        total = float(section.exact_text(at + 18, "the molecular mass"))
        if abs(total - sum(values)) > 1e-5 * len(values) + 1e-6:
            raise part.error(
                at,
                f"the molecular mass {total!r} is not the sum of the masses above it",
                mend=CUT_SHORT,
            )
    return np.array(values), rows[0].start()


def check(part: Text, start: int, found: Found, wavenumbers: FloatArray) -> None:
    """Compare the printed zero-point energy and number of imaginary modes with the modes."""
    imaginary = _IMAGINARY.search(part.data, start, part.end)
    if imaginary is not None and int(imaginary.group(1)) != int(np.sum(wavenumbers < 0.0)):
        raise part.error(
            imaginary.start(),
            f"{imaginary.group(1).decode()} imaginary modes here, {int(np.sum(wavenumbers < 0.0))} above",
            mend=CUT_SHORT,
        )
    if "zero_point" not in found:
        return
    digits, _, at = found["zero_point"]
    real = wavenumbers[wavenumbers > 0.0]
    own = 0.5 * _KCAL_PER_CM * float(real.sum())
    rounding = 0.00051 + 0.5 * _KCAL_PER_CM * 0.005 * len(real) + 2e-6 * own
    if abs(own - float(digits)) > rounding:
        raise part.error(
            at,
            f"the zero-point energy {digits} kcal/mol is not that of the modes, {own:.3f}",
            mend=CUT_SHORT,
        )


def as_printed(found: Found, lines: dict[str, int]) -> dict[str, Printed]:
    """Return what was found with line numbers."""
    return {name: Printed(digits, unit, lines[name]) for name, (digits, unit, _) in found.items()}
