"""Vibrations and thermochemistry that xtb prints.

Traps
- The wavenumbers are printed twice, the null modes first (``-0.00``), imaginary ones after them.
- Linear molecules are not projected (``vibrational frequencies`` without ``projected``); their null
  modes are 0.00 all the same.
- With atoms fixed by ``$fix`` or constraints the modes look like those of a free molecule.
- The printed entropy is interpolated between oscillator and free rotor below 50 cm^-1 (``rotor
  cutoff``), and imaginary modes above -20 cm^-1 (``imag. cutoff``) are counted as real ones; the
  translational entropy is that of 1 atm, which is not printed.  So nothing of it is recomputed
  but the zero-point energy.
- The printed heat capacity is Cp, not Cv.
- With several temperatures the totals are those of the row marked ``(used)``.
"""

from __future__ import annotations

import re

import numpy as np
from numpy.typing import NDArray

from thermo_pp.readers.text import CUT_SHORT, Text
from thermo_pp.records import Printed
from thermo_pp.units import CALORIE_J, HARTREE_CM

FloatArray = NDArray[np.float64]

_TABLE = re.compile(
    rb"^ (projected )?vibrational frequencies \(cm[^)\n]*\)[ \t]*\r?\n((?:eigval :[^\n]*\n)+)",
    re.MULTILINE,
)
HESSIAN = re.compile(rb"^[ \t]+\|[ \t]+(?:Biased )?(?:Numerical|Analytical) Hessian", re.MULTILINE)
BIASED = b"Biased Numerical Hessian"
NOT_STATIONARY = b"!! INCOMPLETELY OPTIMIZED GEOMETRY !!"
_CONSTRAINT = re.compile(rb"^[ \t]*constraining (?!FC)", re.MULTILINE)
_FROZEN = re.compile(rb"^frozen atoms in %[ \t]+:[ \t]+[\d.]+[ \t]+(\d+)", re.MULTILINE)
_ASYMMETRIC = re.compile(
    rb"Hessian element +\d+ +\d+ +is not symmetric:[ \t]+(\S+)[ \t]+(\S+)", re.MULTILINE
)
_MEND_CONSTRAINT = "rerun the frequency job without constraints and fixed atoms"
_NULL_CM = 0.5
_HALF_STEP_CM = 0.005
_CONSTANTS = 1e-5
"""How far the constants of the program may be off, relative."""

_SETUP = b"          :  # frequencies"
_BLOCK = re.compile(
    rb"^[ \t]*(\d+\.\d+)[ \t]+VIB[^\n]*?[ \t](\d+\.\d+)[ \t]*\r?\n"
    rb"[ \t]+ROT[^\n]*?[ \t](\d+\.\d+)[ \t]*\r?\n"
    rb"[ \t]+INT[^\n]*\n"
    rb"[ \t]+TR [^\n]*?[ \t](\d+\.\d+)[ \t]*\r?\n"
    rb"[ \t]+TOT[ \t]+\S+[ \t]+\S+[ \t]+(\d+\.\d+)[ \t]+(\d+\.\d+)[ \t]*\r?\n",
    re.MULTILINE,
)
_ROWS = re.compile(
    rb"^[ \t]+T/K[ \t]+H\(0\)-H\(T\)\+PV[^\n]*\n[ \t]*-+\r?\n((?:[ \t]+\d[^\n]*\n)+)[ \t]*-+",
    re.MULTILINE,
)
_TOTAL_STEP = 3e-12
"""Totals are printed to 1e-12 hartree."""


def check_free(text: Text) -> None:
    """Refuse modes of a molecule that was held: fixed atoms and constraints are in its Hessian."""
    frozen = _FROZEN.search(text.data, text.start, text.end)
    if frozen is not None and int(frozen.group(1)) > 0:
        raise text.error(frozen.start(), "a Hessian with frozen atoms", mend=_MEND_CONSTRAINT)
    held = _CONSTRAINT.search(text.data, text.start, text.end)
    if held is not None:
        raise text.error(held.start(), "frequencies under a constraint", mend=_MEND_CONSTRAINT)
    for match in _ASYMMETRIC.finditer(text.data, text.start, text.end):
        if b"0.000000E+00" in match.groups():
            raise text.error(
                match.start(),
                "the Hessian is zero on one side of its diagonal: atoms were fixed",
                mend=_MEND_CONSTRAINT,
            )


def asymmetry(text: Text) -> int:
    """Return where the program warns that its Hessian is not symmetric, -1 where it does not."""
    match = _ASYMMETRIC.search(text.data, text.start, text.end)
    return -1 if match is None else match.start()


def wavenumbers(text: Text, atoms: int, linear: bool) -> tuple[FloatArray, int]:
    """Return the wavenumbers, ascending and without null modes, and where they stand.

    Raises
    ------
    ReadError
        No table, two that differ, not 3N numbers, null modes that are not null.
    """
    tables = list(_TABLE.finditer(text.data, text.start, text.end))
    if not tables:
        raise text.error(text.end, "no vibrational frequencies in a Hessian job", mend=CUT_SHORT)
    values = [_values(text, table, 3 * atoms) for table in tables]
    for table, numbers in zip(tables, values, strict=True):
        if not np.array_equal(numbers, values[-1]):
            raise text.error(
                table.start(),
                "the frequencies are printed twice and differ",
                mend="the output is damaged, or two jobs were written into it; rerun or re-copy it",
            )
    at = tables[-1].start()
    if atoms == 1:
        return np.zeros(0), at
    if tables[-1].group(1) is None and not linear:
        raise text.error(
            at,
            "frequencies without translations and rotations projected out",
            mend="give a frequency job of a free molecule",
        )
    found = values[-1]
    overall = 5 if linear else 6
    by_size = np.argsort(np.abs(found), kind="stable")
    null, real = found[by_size[:overall]], found[by_size[overall:]]
    if np.any(np.abs(null) > _NULL_CM) or np.any(np.abs(real) <= _NULL_CM):
        raise text.error(
            at,
            f"there are not {overall} null modes, as a {'linear' if linear else 'bent'} molecule has",
            mend="see whether the geometry beside the output is that of the job, and whether it is "
            "meant to be linear",
        )
    return np.sort(real), at


def _values(text: Text, table: re.Match[bytes], count: int) -> FloatArray:
    numbers: list[float] = []
    at = table.start(2)
    while at < table.end(2):
        words = len(text.rest(at).split()) - 2
        numbers += text.floats(at, words, "frequencies", skip=2)
        at += len(text.rest(at)) + 1
    if len(numbers) != count:
        raise text.error(
            table.start(),
            f"{len(numbers)} frequencies, expected {count}",
            mend="see whether the geometry is that of the job; the output may be cut short",
        )
    return np.array(numbers)


def thermochemistry(text: Text) -> dict[str, Printed]:
    """Return what xtb printed of its thermochemistry, empty where it printed none.

    Raises
    ------
    ReadError
        Values printed twice that differ, a part that is missing or damaged.
    """
    setup = text.last(_SETUP)
    if setup < 0:
        return {}
    section = text.part(setup)
    printed = {
        "symmetry_number": _after(section, b":  rotational number", ""),
        "frequency_scale": _after(section, b":  scaling factor", ""),
        "rotor_cutoff": _after(section, b":  rotor cutoff", "cm^-1"),
        "imaginary_cutoff": _after(section, b":  imag. cutoff", "cm^-1"),
    }
    printed |= _at_temperature(section)
    at = section.need(b"THERMODYNAMIC", lacking="no totals of the thermochemistry")
    totals = section.part(at)
    printed["zero_point"] = _after(totals, b":: zero point energy", "Eh")
    contribution = _after(totals, b":: G(RRHO) contrib.", "Eh")
    energy = _after(totals, b":: total energy", "Eh")
    printed["gibbs"] = _after(totals, b"| TOTAL FREE ENERGY", "Eh")
    printed["enthalpy"] = _after(totals, b"| TOTAL ENTHALPY", "Eh")
    for name, value in (
        ("| TOTAL ENERGY", energy.value),
        (":: total free energy", energy.value + contribution.value),
        ("| TOTAL FREE ENERGY", energy.value + contribution.value),
    ):
        _compare(totals, name, _after(totals, name.encode(), "Eh"), value, _TOTAL_STEP)
    slack = printed["thermal_enthalpy"].step
    _compare(
        totals,
        "| TOTAL ENTHALPY",
        printed["enthalpy"],
        energy.value + printed["thermal_enthalpy"].value,
        slack,
    )
    free = printed["free_energy"]
    _compare(totals, "G(RRHO) contrib.", contribution, free.value, free.step)
    del printed["free_energy"]
    return printed


def _at_temperature(section: Text) -> dict[str, Printed]:
    """Return the shares at the temperature of the totals."""
    rows = _ROWS.search(section.data, section.start, section.end)
    if rows is None:
        raise section.error(
            section.start, "no table of H(T) and G(T) after this line", mend=CUT_SHORT
        )
    lines = rows.group(1).splitlines(keepends=True)
    used = [i for i, line in enumerate(lines) if b"(used)" in line]
    if len(used) != (len(lines) > 1):
        raise section.error(rows.start(1), "no row, or several, marked '(used)'", mend=CUT_SHORT)
    at = rows.start(1) + sum(len(line) for line in lines[: used[0] if used else 0])
    temperature, _, enthalpy, _, free = section.floats(at, 5, "T, H(T), T*S and G(T)")
    words = section.rest(at).split()
    line = section.line_number(at)
    for block in _BLOCK.finditer(section.data, section.start, section.end):
        if abs(float(block.group(1)) - temperature) < 0.005:
            break
    else:
        raise section.error(at, f"no shares of {temperature} K before this line", mend=CUT_SHORT)
    printed = {
        "temperature": Printed(words[0].decode(), "K", line),
        "thermal_enthalpy": Printed(words[2].decode(), "Eh", line),
        "free_energy": Printed(words[4].decode(), "Eh", line),
        "vibrational_entropy": _group(section, block, 2, "cal/(mol K)"),
        "rotational_entropy": _group(section, block, 3, "cal/(mol K)"),
        "translational_entropy": _group(section, block, 4, "cal/(mol K)"),
        "entropy": _group(section, block, 6, "J/(mol K)"),
    }
    total = _group(section, block, 5, "cal/(mol K)")
    entropy = printed["entropy"]
    if abs(total.value * CALORIE_J - entropy.value) > CALORIE_J * total.step + entropy.step:
        raise section.error(
            block.start(5), "the total entropy is printed in two units that differ", mend=CUT_SHORT
        )
    parts = sum(printed[f"{name}_entropy"].value for name in ("vibrational", "rotational"))
    parts += printed["translational_entropy"].value
    if abs(parts - total.value) > 2e-3:
        raise section.error(
            block.start(5), "the total entropy is not the sum of its shares", mend=CUT_SHORT
        )
    if abs(enthalpy - free - temperature * entropy.value / 2625499.6) > 2e-6:
        raise section.error(at, "H(T) - G(T) is not T times the entropy", mend=CUT_SHORT)
    return printed


def _group(section: Text, match: re.Match[bytes], group: int, unit: str) -> Printed:
    return Printed(match.group(group).decode(), unit, section.line_number(match.start(group)))


def _after(section: Text, mark: bytes, unit: str) -> Printed:
    at = section.need(mark, lacking=f"no {mark.decode().strip(':| ')}")
    text = section.exact_text(at + len(mark), mark.decode().strip(":| "))
    return Printed(text, unit, section.line_number(at))


def _compare(section: Text, name: str, printed: Printed, value: float, slack: float) -> None:
    if abs(printed.value - value) > slack:
        at = section.need(name.encode(), lacking=f"no {name}")
        raise section.error(
            at,
            f"{name.strip('|: ')} is {printed.text} {printed.unit}, but its parts add up to {value:.12f}",
            mend=CUT_SHORT,
        )


def zero_point_differs(modes_cm: FloatArray, printed: dict[str, Printed]) -> str | None:
    """Return in words how the printed zero-point energy differs from that of the modes, else None."""
    cutoff = abs(printed["imaginary_cutoff"].value)
    counted = np.abs(modes_cm[modes_cm > -cutoff])
    scale = printed["frequency_scale"].value
    own = 0.5 * scale * float(counted.sum()) / HARTREE_CM
    slack = 0.5 * _HALF_STEP_CM * (len(counted) + 1) / HARTREE_CM + _CONSTANTS * own
    value = printed["zero_point"].value
    if abs(own - value) <= slack:
        return None
    return f"the zero-point energy is {value} Eh, that of the wavenumbers {own:.9f} Eh"
