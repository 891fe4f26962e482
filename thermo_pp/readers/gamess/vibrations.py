"""Normal modes and thermochemistry that GAMESS prints.

All 3N modes are printed, translations and rotations among them (up to 70 cm^-1, as nothing is projected out unless
PURIFY or PROJCT say so) and not always first: which ones they are stands in ``MODES n TO m ARE TAKEN AS ROTATIONS AND
TRANSLATIONS``, and is checked here against the displacements. An imaginary mode has an ``I`` behind it in the tables of
modes, and nothing in the summary with three decimals. Displacements are orthonormal with the masses as weights.
"""

from __future__ import annotations

import math
import re

import numpy as np
from numpy.typing import NDArray

from thermo_pp.readers.gamess.geometry import Geometry
from thermo_pp.readers.line_marks import first_match, matches
from thermo_pp.readers.text import CUT_SHORT, Text

FloatArray = NDArray[np.float64]

_KCAL_PER_CM = 627.51 / 219474.6
_GAS = 8.31441
_BOLTZMANN = 1.380662e-23
_LIGHT = 299792458.0
PRINTED_CONSTANTS: dict[str, float] = {
    "BOLTZMANN_J_K": _BOLTZMANN,
    "PLANCK_J_S": _KCAL_PER_CM * 4184.0 / _GAS * _BOLTZMANN / (100.0 * _LIGHT),
    "AVOGADRO_MOL": 6.022045e23,
    "LIGHT_M_S": _LIGHT,
    "GAS_J_MOL_K": _GAS,
    "ATOMIC_MASS_KG": 1.6605655e-27,
    "HARTREE_J": 4.359814e-18,
    "BOHR_M": 0.52917706e-10,
    "CALORIE_J": 4.184,
}
"""CODATA 1973 under the names of `units`: R as printed entropies have it (GAMESS 2018), and h such that zero-point
energies have 627.51/219474.6 kcal/mol per cm^-1 (found from two that were printed in 2017 and 2018)."""
ANALYSIS = b"NORMAL COORDINATE ANALYSIS IN THE HARMONIC APPROXIMATION"
THERMO = b"THERMOCHEMISTRY AT T="
_MASSES = b"ATOMIC WEIGHTS (AMU)"
_TAKEN = re.compile(
    rb"^ MODES +(\d+) +TO *(\d+) +ARE TAKEN AS ROTATIONS AND TRANSLATIONS", re.MULTILINE
)
_FREQUENCY = re.compile(rb"^ +FREQUENCY:", re.MULTILINE)
_ONE = re.compile(rb"(\d+\.\d+)( ?I\b)?")
_SUMMARY = re.compile(rb"^ +MODE +FREQ\(CM\*\*-1\)[^\n]*\n", re.MULTILINE)
_ROW = re.compile(rb" *\d* *\S* +([XYZ])[ ]?((?: *-?\d+\.\d+)+)[ \t]*\r?$", re.MULTILINE)
_ZERO_POINT = re.compile(
    rb"^ +(\d+\.\d+) HARTREE/MOLECULE +(\d+\.\d+) CM\*\*-1/MOLECULE *\r?\n"
    rb" +(\d+\.\d+) KCAL/MOL +(\d+\.\d+) KJ/MOL",
    re.MULTILINE,
)
_TABLE = re.compile(rb"^ +KJ/MOL +KJ/MOL +KJ/MOL +J/MOL-K +J/MOL-K +J/MOL-K", re.MULTILINE)
_NUMBERS = {
    "temperature": (THERMO, "K"),
    "pressure": (b"\n P=", "Pa"),
    "frequency_scale": (b"ALL FREQUENCIES ARE SCALED BY", ""),
    "symmetry_number": (b"THE ROTATIONAL SYMMETRY NUMBER IS", ""),
}
Found = dict[str, tuple[str, str, int]]
"""Key of `printed` -> digits, unit, offset."""


def masses(part: Text, shape: Geometry) -> tuple[FloatArray, int]:
    """Return the masses of the analysis that begins at `part`, shape (n,), and where they stand."""
    at = part.need(_MASSES, lacking="no atomic weights")
    line = first = part.next_line(at, 2)
    values = []
    for index in range(shape.rows):
        words = part.rest(line).split()
        if len(words) != 3 or words[0] != b"%d" % (index + 1):
            raise part.expected(line, f"the mass of atom {index + 1}")
        values.append(part.floats(line, 1, "a mass", skip=2)[0])
        line = part.next_line(line)
    found = np.array(values)[shape.real]
    if np.any(found < 0.4 * shape.numbers) or np.any(found > 4.0 * shape.numbers + 4.0):
        raise part.expected(first, "masses of these atoms")
    return found, first


def modes(part: Text, shape: Geometry, masses_u: FloatArray) -> tuple[FloatArray, FloatArray, int]:
    """Return wavenumbers (m,), displacements (m, n, 3) of unit length, and where the wavenumbers stand.

    Raises
    ------
    ReadError
        A damaged table, one that is not of 3N modes, translations and rotations that are none.
    """
    taken = first_match(_TAKEN, b" ARE TAKEN AS ROTATIONS", part, part.start, part.end)
    atoms = len(shape.numbers)
    if taken is None:
        raise part.error(
            part.start,
            "the program does not say which modes are translations and rotations",
            mend=CUT_SHORT,
        )
    first, last = int(taken.group(1)), int(taken.group(2))
    lines = [
        match.end() for match in matches(_FREQUENCY, b" FREQUENCY:", part, taken.end(), part.end)
    ]
    signed: list[float] = []
    columns: list[FloatArray] = []
    for at in lines:
        row = _wavenumbers(part, at)
        signed += row
        columns.append(_displacements(part, at, len(row), atoms))
    if len(signed) != 3 * atoms or not columns:
        raise part.error(
            lines[0] if lines else taken.start(),
            f"{len(signed)} modes of {atoms} atoms, expected {3 * atoms}",
            mend="give the run of a whole molecule",
        )
    null = last - first + 1
    if null not in {1: (3,), 2: (5,)}.get(atoms, (5, 6)) or not 1 <= first <= last <= len(signed):
        raise part.error(
            taken.start(), f"{null} translations and rotations of {atoms} atoms", mend=CUT_SHORT
        )
    wavenumbers, where = _summary(part, np.array(signed), lines)
    vectors = np.concatenate(columns)
    _check_vectors(part, lines[0], vectors, masses_u)
    keep = np.ones(len(signed), dtype=bool)
    keep[first - 1 : last] = False
    _check_null(part, taken.start(), vectors[~keep], vectors[keep], shape, masses_u)
    order = np.flatnonzero(keep)[np.argsort(wavenumbers[keep], kind="stable")]
    unit = vectors[order] / np.sqrt((vectors[order] ** 2).sum(axis=(1, 2)))[:, None, None]
    return wavenumbers[order], unit, where


def _wavenumbers(part: Text, at: int) -> list[float]:
    rest = part.rest(at)
    row = [
        -float(match.group(1)) if match.group(2) else float(match.group(1))
        for match in _ONE.finditer(rest)
    ]
    if not 1 <= len(row) <= 10 or _ONE.sub(b"", rest).strip():
        raise part.expected(at, "wavenumbers, imaginary ones with an I")
    return row


def _displacements(part: Text, at: int, count: int, atoms: int) -> FloatArray:
    """Return the displacements of the modes whose wavenumbers stand at `at`, shape (count, n, 3)."""
    line = part.next_line(part.blank_line(at))
    end = part.next_line(line, 3 * atoms)
    rows = part.data[line:end].splitlines()
    values: list[list[float]] = []
    for index, row in enumerate(rows):
        if row[19:20] != b"XYZ"[index % 3 : index % 3 + 1]:
            match = _ROW.fullmatch(row)
            axis, numbers = (b"", b"") if match is None else (match.group(1), match.group(2))
        else:
            axis, numbers = row[19:20], row[20:]
        try:
            found = list(map(float, numbers.split()))
        except ValueError:
            found = []
        if (
            axis != b"XYZ"[index % 3 : index % 3 + 1]
            or len(found) != count
            or not math.isfinite(sum(found))
        ):
            raise part.expected(
                part.next_line(line, index), f"{count} displacements along {'XYZ'[index % 3]}"
            )
        values.append(found)
    return np.array(values).reshape(atoms, 3, count).transpose(2, 0, 1)


def _summary(part: Text, signed: FloatArray, lines: list[int]) -> tuple[FloatArray, int]:
    """Return the wavenumbers with the three decimals of the summary, where there is one, and where they stand."""
    heading = first_match(_SUMMARY, b" FREQ(CM**-1)", part, lines[-1], part.end)
    if heading is None:
        return signed, lines[0]
    line = heading.end()
    exact = []
    for index, rounded in enumerate(signed, start=1):
        words = part.rest(line).split(None, 2)
        if len(words) < 2 or words[0] != b"%d" % index:
            raise part.expected(line, f"mode {index} of the summary")
        value = part.floats(line, 1, "a wavenumber", skip=1)[0]
        if abs(abs(rounded) - value) > 0.0052:
            raise part.error(
                line,
                f"mode {index} has {value} here, but {abs(rounded)} in the table of modes",
                mend=CUT_SHORT,
            )
        exact.append(math.copysign(value, rounded))
        line = part.next_line(line)
    return np.array(exact), heading.end()


def _check_vectors(part: Text, at: int, vectors: FloatArray, masses_u: FloatArray) -> None:
    """Check that the modes are orthonormal with the masses as weights, to the digits that are printed."""
    weighted = (vectors * np.sqrt(masses_u)[None, :, None]).reshape(len(vectors), -1)
    off = np.abs(weighted @ weighted.T - np.eye(len(vectors)))
    if off.max() > 2e-3:
        worst = int(np.argmax(off.max(axis=1)))
        raise part.error(
            at,
            f"mode {worst + 1} is not orthonormal to the others (off by {off.max():.1e})",
            mend=CUT_SHORT,
        )


def _check_null(
    part: Text,
    at: int,
    null: FloatArray,
    vibrations: FloatArray,
    shape: Geometry,
    masses_u: FloatArray,
) -> None:
    """Check that no vibration is more of a translation or rotation than one that is taken as such."""
    roots = np.sqrt(masses_u)
    x = shape.positions_angstrom - masses_u @ shape.positions_angstrom / masses_u.sum()
    motions = [np.tile(axis, (len(x), 1)) for axis in np.eye(3)]
    motions += [np.cross(axis, x) for axis in np.eye(3)]
    overall = np.array([(roots[:, None] * one).ravel() for one in motions])
    _, sizes, directions = np.linalg.svd(overall, full_matrices=False)
    directions = directions[sizes > 1e-4 * sizes[0]]

    def share(vectors: FloatArray) -> FloatArray:
        weighted = (vectors * roots[None, :, None]).reshape(len(vectors), -1)
        return np.asarray(((weighted @ directions.T) ** 2).sum(axis=1))

    if not len(null) or not len(vibrations):
        return
    least, most = float(share(null).min()), float(share(vibrations).max())
    if most > least + 0.1 or least < 0.5:
        raise part.error(
            at,
            f"a mode taken as a translation or rotation is one by {least:.0%} only, a vibration by {most:.0%}",
            mend="project them out (PROJCT=.TRUE. or PURIFY=.TRUE. in $FORCE) and rerun",
        )


def thermochemistry(part: Text) -> Found:
    """Return what is printed at the first temperature, empty where nothing is."""
    start = part.find(THERMO)
    if start < 0:
        return {}
    section = part.part(start, part.data.find(THERMO, start + 1, part.end) % (part.end + 1))
    found: Found = {}
    for name, (mark, unit) in _NUMBERS.items():
        at = section.need(mark, lacking=f"no {name.replace('_', ' ')} in the thermochemistry")
        section.exact_text(at + len(mark), f"the {name.replace('_', ' ')}")
        found[name] = (section.rest(at + len(mark)).split()[0].decode(), unit, at + 1)
    zero = _ZERO_POINT.search(section.data, section.start, section.end)
    if zero is None:
        raise section.error(start, "no zero-point energy in the thermochemistry", mend=CUT_SHORT)
    found["zero_point"] = (zero.group(4).decode(), "kJ/mol", zero.start(4))
    if abs(float(zero.group(3)) * 4.184 - float(zero.group(4))) > 1e-5 + 1e-6 * float(
        zero.group(4)
    ):
        raise section.error(
            zero.start(3), "the zero-point energies in kcal/mol and kJ/mol differ", mend=CUT_SHORT
        )
    heading = _TABLE.search(section.data, section.start, section.end)
    if heading is None:
        raise section.error(start, "no table of E, H and G in kJ/mol", mend=CUT_SHORT)
    rows = {}
    line = section.next_line(heading.start())
    for mark in (b"ELEC.", b"TRANS.", b"ROT.", b"VIB.", b"TOTAL"):
        if section.rest(line).split(None, 1)[:1] != [mark]:
            raise section.expected(line, f"the line {mark.decode()!r} of the thermochemistry")
        section.floats(line, 6, "E, H, G, CV, CP and S", skip=1)
        rows[mark] = (line, section.rest(line).decode().split()[1:])
        line = section.next_line(line)
    total, unit = rows[b"TOTAL"], "J/(mol K)"
    for name, column in (("thermal_energy", 0), ("thermal_enthalpy", 1)):
        found[name] = (total[1][column], "kJ/mol", total[0])
    found["heat_capacity_v"] = (total[1][3], unit, total[0])
    found["entropy"] = (total[1][5], unit, total[0])
    for name, mark in (
        ("translational", b"TRANS."),
        ("rotational", b"ROT."),
        ("vibrational", b"VIB."),
    ):
        found[f"{name}_entropy"] = (rows[mark][1][5], unit, rows[mark][0])
    return found


def check(part: Text, found: Found, wavenumbers_cm: FloatArray) -> None:
    """Compare the printed zero-point energy with that of the modes."""
    digits, _, at = found["zero_point"]
    scale = float(found["frequency_scale"][0])
    real = wavenumbers_cm[wavenumbers_cm > 0.0]
    own = 0.5 * 4.184 * _KCAL_PER_CM * float(real.sum()) * scale
    rounding = 0.5 * 4.184 * _KCAL_PER_CM * 0.0051 * len(real) + 1e-5 + 2e-5 * own
    if abs(own - float(digits)) > rounding:
        raise part.error(
            at,
            f"the zero-point energy {digits} kJ/mol is not that of the modes, {own:.4f}",
            mend=CUT_SHORT,
        )
