"""Vibrations and thermochemistry that Psi4 prints: wavenumbers, displacements, its H, S and G."""

from __future__ import annotations

import re

import numpy as np
from numpy.typing import NDArray

from thermo_pp.readers.text import Text
from thermo_pp.records import Printed

FloatArray = NDArray[np.float64]

ANALYSIS = b"==> Harmonic Vibrational Analysis <=="
PRINTED_CONSTANTS: dict[str, float] = {
    "BOLTZMANN_J_K": 1.38064852e-23,
    "PLANCK_J_S": 6.626070040e-34,
    "AVOGADRO_MOL": 6.022140857e23,
    "LIGHT_M_S": 299792458.0,
    "GAS_J_MOL_K": 8.3144598,
    "ATOMIC_MASS_KG": 1.660539040e-27,
    "HARTREE_J": 4.359744650e-18,
    "BOHR_M": 0.52917721067e-10,
}
"""CODATA 2014 under the names of `units`: Psi4 (1.3.2 to 1.7) prints thermochemistry with these."""

_WAVENUMBER = re.compile(rb"^  Freq \[cm\^-1\]", re.MULTILINE)
_ENERGIES = {
    "zero_point": (b"Zero-point energy, ZPE_vib", b"  Correction ZPE "),
    "thermal_energy": (b"Thermal Energy, E (includes ZPE)", b"  Correction E "),
    "thermal_enthalpy": (b"Enthalpy, H_trans", b"  Correction H "),
}
_TOTALS = {
    "enthalpy": b"  Total H, Enthalpy at",
    "gibbs": b"  Total G, Free enthalpy at",
}
_ENTROPIES = {
    "entropy": b"  Total S ",
    "translational_entropy": b"    Translational S ",
    "rotational_entropy": b"    Rotational S ",
    "vibrational_entropy": b"    Vibrational S ",
    "heat_capacity_v": b"  Total Cv ",
}
_REMOVED = re.compile(rb"removed ([356]) degrees of freedom")
_UNNAMED = re.compile(rb"post-proj low-frequency mode:[^\n]*\(-\)")
_JOULE = re.compile(rb"(-?\d+\.\d+) \[J/\(mol K\)\]")
_HARTREE = re.compile(rb"(-?\d+\.\d+) \[Eh\]")
_TEMPERATURE = re.compile(rb"at\s+(\d+\.\d+) \[K\]")
_PRESSURE = re.compile(rb"P = (\d+\.\d+) \[Pa\]")
_SYMMETRY = re.compile(rb"\(symmetry no\. = (\d+)\)")


def modes(part: Text, atoms: int) -> tuple[FloatArray, FloatArray, int]:
    """Return wavenumbers (m,), displacements (m, atoms, 3), and where the wavenumbers stand.

    Wavenumbers are ascending, imaginary ones negative. Psi4 prints displacements to two decimals,
    not mass-weighted and of unit length, so that only their rounding is undone here. Translations
    and rotations are in its lists, but not in the table that is read.

    Parameters
    ----------
    part : Text
        From the heading of the analysis to the next one or to the end of the file.
    atoms : int

    Raises
    ------
    ReadError
        A table that is damaged, or modes that are not 3N less the overall motions it removed.
    """
    wavenumbers: list[float] = []
    columns: list[FloatArray] = []
    lines = [match.start() for match in _WAVENUMBER.finditer(part.data, part.start, part.end)]
    for line in lines:
        words = part.line(line).split()[2:]
        wavenumbers.extend(_wavenumber(part, line, word) for word in words)
        rule = part.need(b"  ------------", line, lacking="no table of displacements")
        rows, row = [], part.next_line(rule)
        for _ in range(atoms):
            rows.append(part.floats(row, 3 * len(words), "displacements of an atom", skip=2))
            row = part.next_line(row)
        columns.append(np.array(rows).reshape(atoms, len(words), 3).transpose(1, 0, 2))
    removed = _REMOVED.search(part.data, part.start, part.end)
    overall = {int(removed.group(1))} if removed else {1: {3}, 2: {5}}.get(atoms, {5, 6})
    if _UNNAMED.search(part.data, part.start, part.end):
        overall |= {
            5,
            6,
        }  # null modes that it did not take out are left out of the table all the same
    if 3 * atoms - len(wavenumbers) not in overall:
        expected = " or ".join(str(3 * atoms - count) for count in sorted(overall))
        raise part.error(
            part.start,
            f"{len(wavenumbers)} vibrations of {atoms} atoms, expected {expected}",
            mend="give a full frequency job, not one of some irreducible representations",
        )
    if not wavenumbers:
        return np.zeros(0), np.zeros((0, atoms, 3)), part.start
    displacements = np.concatenate(columns)
    lengths = np.sqrt(np.sum(displacements**2, axis=(1, 2)))
    if np.any(np.abs(lengths - 1.0) > 0.3):
        raise part.error(
            lines[0], "displacements that are not of unit length", mend="re-copy the output"
        )
    order = np.argsort(wavenumbers, kind="stable")
    unit = displacements / lengths[:, None, None]
    return np.array(wavenumbers)[order], unit[order], lines[0]


def _wavenumber(part: Text, line: int, word: str) -> float:
    number = re.fullmatch(r"(\d+\.\d+)(i?)", word)
    if number is None:
        raise part.expected(line, "wavenumbers")
    return -float(number.group(1)) if number.group(2) else float(number.group(1))


def thermochemistry(part: Text) -> dict[str, Printed]:
    """Return what Psi4 printed of its thermochemistry in `part`, empty where it printed none."""
    start = part.find(b"==> Thermochemistry Components <==")
    if start < 0:
        return {}
    second = part.find(b"==> Thermochemistry Components <==", start + 1)
    section = part.part(start, second if second >= 0 else None)
    printed: dict[str, Printed] = {}
    for name, mark in _ENTROPIES.items():
        at = section.need(mark, lacking=f"no {name.replace('_', ' ')}")
        printed[name] = _printed(section, at, _JOULE, "J/(mol K)")
    for name, (heading, mark) in _ENERGIES.items():
        at = section.need(heading, lacking=f"no {name.replace('_', ' ')}")
        at = section.need(mark, at, lacking=f"no {name.replace('_', ' ')}")
        printed[name] = _printed(section, at, _HARTREE, "Eh")
    for name, mark in _TOTALS.items():
        at = section.need(mark, lacking=f"no {name}")
        printed[name] = _printed(section, at, _HARTREE, "Eh")
    at = section.need(_TOTALS["enthalpy"], lacking="no enthalpy")
    printed["temperature"] = _printed(section, at, _TEMPERATURE, "K")
    at = section.need(_ENTROPIES["translational_entropy"], lacking="no pressure")
    printed["pressure"] = _printed(section, at, _PRESSURE, "Pa")
    at = section.need(_ENTROPIES["rotational_entropy"], lacking="no symmetry number")
    printed["symmetry_number"] = _printed(section, at, _SYMMETRY, "")
    return printed


def bottom_energy(part: Text) -> tuple[Printed, int] | None:
    """Return the electronic energy that the thermochemistry starts from, and its offset."""
    at = part.find(b"  Total E0, Electronic energy at well bottom")
    return None if at < 0 else (_printed(part, at, _HARTREE, "Eh"), at)


def _printed(part: Text, at: int, pattern: re.Pattern[bytes], unit: str) -> Printed:
    match = pattern.search(part.rest(at))
    if match is None:
        raise part.expected(at, f"a number in {unit or 'whole units'}")
    return Printed(match.group(1).decode(), unit, part.line_number(at))
