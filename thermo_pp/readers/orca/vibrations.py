"""Vibrations and thermochemistry of an ORCA output.

All 3N wavenumbers are printed, translations and rotations first as 0.00, then imaginary ones with
a minus sign and ``***imaginary mode***``. The modes are Cartesian displacements of unit length, the
columns of translations and rotations zero. The thermochemistry leaves imaginary modes out and by
default takes the vibrational entropy between a harmonic mode and a free rotor (Grimme 2012, around
100 cm^-1), so its S and G are not those of harmonic modes; entropies are printed as T S in hartree.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.readers.number_table import decimal_table
from thermo_pp.readers.orca.layout import Layout
from thermo_pp.readers.text import CUT_SHORT, Text

FloatArray = NDArray[np.float64]

PRINTED_CONSTANTS: dict[str, float] = {
    "BOLTZMANN_J_K": 1.3806440e-23,
    "PLANCK_J_S": 6.62607015e-34,
    "AVOGADRO_MOL": 6.02214076e23,
    "LIGHT_M_S": 299792458.0,
    "GAS_J_MOL_K": 8.3144327,
    "ATOMIC_MASS_KG": 1.66053906660e-27,
    "HARTREE_J": 4.3597447222071e-18,
    "BOHR_M": 5.29177210903e-11,
}
"""Under the names of `units`. ORCA does not print its own: k and R are fitted to the translational and
rotational entropies and energies that ORCA 5.0 prints, 3.6e-6 (relative) below the CODATA value."""
PRINTED_STEPS = 6.0
"""Units of the last digit by which the rest differs: its k T in H is 3e-8 hartree too large."""

_FIRST = re.compile(rb"\n +0: ")
_ROW = re.compile(rb" *(\d+): +(-?\d+\.\d+) cm\*\*-1([^\n]*)\n")
_DECIMALS = re.compile(rb"(?:\d+\.\d+(?: |$))*")
_IMAGINARY = b"imaginary mode"
_SCALE = re.compile(rb"Scaling factor for frequencies = +(\d+\.\d+)")
_USED = re.compile(rb"\nfreq\. +(\d+\.\d+) +E\(vib\)")
_LENGTH = 2e-3
_EH = rb" +(?:\.\.\. *)? *(-?\d+\.\d+) Eh"
_VALUES: dict[str, re.Pattern[bytes]] = {
    "zero_point": re.compile(rb"\nZero point energy" + _EH),
    "thermal_energy": re.compile(rb"\nTotal correction" + _EH),
    "enthalpy": re.compile(rb"\nTotal Enthalpy" + _EH, re.IGNORECASE),
    "gibbs": re.compile(rb"\nFinal Gibbs free en\w+" + _EH),
}
_ENTROPIES: dict[str, re.Pattern[bytes]] = {
    "vibrational_entropy": re.compile(rb"\nVibrational entropy" + _EH),
    "rotational_entropy": re.compile(rb"\nRotational entropy" + _EH),
    "translational_entropy": re.compile(rb"\nTranslational entropy" + _EH),
    "entropy": re.compile(rb"\nFinal entropy term" + _EH),
}
_ELECTRONIC = re.compile(rb"\nElectronic energy" + _EH)
_TEMPERATURE = re.compile(rb"\nTemperature +\.\.\. +(\d+\.\d+) K")
_PRESSURE = re.compile(rb"\nPressure +\.\.\. +(\d+\.\d+) atm")
_SYMMETRY = re.compile(rb"Symmetry Number: +(\d+)")
_MODEL = re.compile(rb"Vibrational entropy computed according to the (QRRHO of S\. Grimme)")


@dataclass(frozen=True, eq=False)
class Vibrations:
    """What stands under one heading of vibrational frequencies.

    Attributes
    ----------
    start, end : int
        From the heading to the next analysis or the end of the text.
    wavenumbers_cm : shape (m,)
    modes : shape (m, n, 3) or None
    scale : float
        The factor that the program has multiplied its wavenumbers with.
    printed : dict of str to (text, unit, offset)
    electronic : (value in hartree, offset) or None
        The electronic energy that the thermochemistry starts from.
    at : dict of str to int
    """

    start: int
    wavenumbers_cm: FloatArray
    modes: FloatArray | None
    scale: float
    printed: dict[str, tuple[str, str, int]]
    electronic: tuple[float, int] | None
    at: dict[str, int]


def vibrations(layout: Layout, heading: int, end: int, atoms: int) -> Vibrations:
    """Return the analysis under `heading`, which is over at `end`.

    Raises
    ------
    ReadError
        A damaged table, another number of wavenumbers than 3N, of null modes than 6 or 5 (3 of an
        atom), modes that are not of unit length, wavenumbers printed twice that do not agree.
    """
    text = layout.text
    part = text.part(heading, end)
    first, values = _wavenumbers(part, heading, 3 * atoms)
    null = values == 0.0
    expected = {1: (3,), 2: (5,)}.get(atoms, (5, 6))
    if int(null.sum()) not in expected:
        raise part.error(
            first,
            f"{int(null.sum())} of {3 * atoms} wavenumbers are zero, expected "
            f"{' or '.join(map(str, expected))} (translations and rotations)",
            mend="give a frequency job of all atoms, with translations and rotations projected out",
        )
    at = {"wavenumbers_cm": first}
    order = np.flatnonzero(~null)[np.argsort(values[~null], kind="stable")]
    modes = None
    table = layout.next(b"NORMAL MODES", heading)
    if 0 <= table < end:
        columns, at["modes"] = _modes(part, table, 3 * atoms)
        lengths = np.sqrt(np.sum(columns**2, axis=1))
        if np.any(np.abs(lengths[order] - 1.0) > _LENGTH) or np.any(lengths[null] > _LENGTH):
            raise part.error(
                at["modes"], "normal modes that are not of unit length", mend=CUT_SHORT
            )
        unit = columns[order] / lengths[order, np.newaxis]
        modes = unit.reshape(-1, atoms, 3)
    scale = _SCALE.search(part.data, heading, first)
    printed: dict[str, tuple[str, str, int]] = {}
    electronic = None
    thermo = layout.next(b"THERMOCHEMISTRY AT", heading)
    if 0 <= thermo < end:
        second = layout.next(b"THERMOCHEMISTRY AT", thermo + 1)
        section = text.part(thermo, second if 0 <= second < end else end)
        _check_used(section, values[order], printed)
        electronic = _thermochemistry(section, printed)
    return Vibrations(
        heading,
        values[order],
        modes,
        1.0 if scale is None else float(scale.group(1)),
        printed,
        electronic,
        at,
    )


def _wavenumbers(part: Text, heading: int, count: int) -> tuple[int, FloatArray]:
    begin = _FIRST.search(part.data, heading, part.end)
    if begin is None:
        raise part.error(heading, "no wavenumbers after this line", mend=CUT_SHORT)
    at = first = begin.start() + 1
    plain = _plain_wavenumbers(part.data[first : part.blank_line(first)], count)
    if plain is not None:
        return first, plain
    values: list[float] = []
    while (match := _ROW.match(part.data, at, part.end)) is not None:
        value = float(match.group(2))
        if int(match.group(1)) != len(values) or (value < 0.0) != (_IMAGINARY in match.group(3)):
            raise part.expected(at, f"wavenumber {len(values)}")
        values.append(value)
        at = match.end()
    if len(values) != count:
        raise part.expected(at, f"wavenumber {len(values)} of {count}")
    return first, np.array(values)


def _plain_wavenumbers(lines: bytes, count: int) -> FloatArray | None:
    """Return the wavenumbers of a table in which none is imaginary; None where any line is of another form."""
    words = lines.split()
    if lines.count(b"\n") != count:
        return None
    if words[::3] != [b"%d:" % i for i in range(count)] or words[2::3] != count * [b"cm**-1"]:
        return None
    digits = words[1::3]
    if len(words) != 3 * count or _DECIMALS.fullmatch(b" ".join(digits)) is None:
        return None
    return np.array(list(map(float, digits)))


def _modes(part: Text, heading: int, count: int) -> tuple[FloatArray, int]:
    """Return the columns (count, count) of the table under `heading` and where it begins."""
    match = re.compile(rb"\n +0(?: +\d+)* *\n").search(part.data, heading, part.end)
    if match is None:
        raise part.expected(heading, "a table of normal modes below this line")
    first = line = match.start() + 1
    whole = _whole_table(part, first, count)
    if whole is not None:
        return whole, first
    columns: list[FloatArray] = []
    done = 0
    while done < count:
        header = part.rest(line).split()
        width = len(header)
        if not width or header != [b"%d" % i for i in range(done, done + width)]:
            raise part.expected(line, f"numbers of the modes from {done} on")
        line = part.next_line(line)
        end = part.lines_on(line, count)
        try:
            table = np.array(part.data[line:end].split(), dtype=np.float64)
        except ValueError:
            table = np.zeros(0)
        if table.size != count * (width + 1) or not np.all(np.isfinite(table)):
            for row in range(count):
                part.floats(line, width + 1, "displacements of all atoms")
                if part.rest(line).split()[0] != b"%d" % row:
                    break
                line = part.next_line(line)
            raise part.expected(line, "displacements of all atoms")
        table = table.reshape(count, width + 1)
        if not np.array_equal(table[:, 0], np.arange(count)):
            raise part.expected(line, "displacements of all atoms in order")
        columns.append(table[:, 1:].T)
        done += width
        line = end
    return np.concatenate(columns), first


def _whole_table(part: Text, first: int, count: int) -> FloatArray | None:
    """Return the columns of the table of modes in one go; None where a line of it is not as expected."""
    columns = np.empty((count, count))
    rows = [b"%d" % row for row in range(count)]
    at, done, end = first, 0, part.end
    while done < count:
        width = min(6, count - done)
        blocks = (count - done) // width  # all those of six columns at once
        head = part.data.find(b"\n", at, end) + 1 - at
        row = part.data.find(b"\n", at + head, end) + 1 - at - head
        size = blocks * (head + count * row)
        if head < 1 or row < 1 or at + size > end:
            return None
        lines = np.frombuffer(part.data, np.uint8, size, at).reshape(blocks, -1)
        table = decimal_table(lines[:, head:].reshape(-1, row))
        numbers = [b"%d" % mode for mode in range(done, done + blocks * width)]
        if table is None or table[1].shape[1] != width:
            return None
        if lines[:, :head].tobytes().split() != numbers or table[0].split() != blocks * rows:
            return None
        across = table[1].reshape(blocks, count, width).transpose(0, 2, 1)
        columns[done : done + len(numbers)] = across.reshape(-1, count)
        at, done = at + size, done + len(numbers)
    return columns


def _check_used(
    section: Text, wavenumbers: FloatArray, printed: dict[str, tuple[str, str, int]]
) -> None:
    """Compare the wavenumbers that the thermochemistry lists with the real ones among the modes."""
    first = _USED.search(section.data, section.start, section.end)
    if first is None:
        return
    listed = _USED.findall(section.data, first.start(), section.end)
    printed["modes_used"] = (str(len(listed)), "", first.start() + 1)
    real = wavenumbers[wavenumbers > 0.0]
    used = np.sort(list(map(float, listed)))
    if len(used) > len(real) or bool((abs(used - real[len(real) - len(used) :]) > 0.011).any()):
        raise section.error(
            first.start() + 1,
            "the wavenumbers of the thermochemistry are not those of the modes",
            mend="the output is damaged; rerun or re-copy it",
        )


def _thermochemistry(
    section: Text, printed: dict[str, tuple[str, str, int]]
) -> tuple[float, int] | None:
    """Put what the thermochemistry prints into `printed`; return its electronic energy."""

    def take(name: str, pattern: re.Pattern[bytes], unit: str) -> bool:
        match = pattern.search(section.data, section.start, section.end)
        if match is not None:
            printed[name] = (match.group(1).decode(), unit, match.start(1))
        return match is not None

    take("temperature", _TEMPERATURE, "K")
    for name, pattern in _VALUES.items():
        take(name, pattern, "Eh")
    for name in ("temperature", "zero_point", "enthalpy", "gibbs"):
        if name not in printed:
            raise section.error(
                section.start,
                f"thermochemistry without its {name.replace('_', '-')}",
                mend=CUT_SHORT,
            )
    unit = f"Eh/({printed['temperature'][0]} K)"
    for name, pattern in _ENTROPIES.items():
        take(name, pattern, unit)
    take("pressure", _PRESSURE, "atm")
    take("symmetry_number", _SYMMETRY, "")
    take("entropy_model", _MODEL, "")
    match = _ELECTRONIC.search(section.data, section.start, section.end)
    return None if match is None else (float(match.group(1)), match.start(1))
