"""Structures and energies that ASE reads: trajectories, JSON data bases, extended XYZ.

Modes are taken where the file has them under these keys, in `info` of extended XYZ and trajectories
(so on the comment line) or in `data` of a row of a data base; ASE itself has no place for them:

- ``frequencies``: cm^-1, imaginary ones negative, 3N-6 (3N-5) of them or 3N with null modes;
- ``seam_frequencies``, in their place: those along the seam of a crossing point, one less, as a
  program projected them;
- ``hessian``: eV/A^2, 3N x 3N numbers, flat or nested; translations and rotations are projected out.

With both, the frequencies must be those of the Hessian. They are of the masses in the file, else of
the most abundant isotopes. Forces, eV/A, are taken as the gradient.

Only formats with a mark of their own are read, through ASE's reader of exactly that format; none of
them executes or unpickles anything. ASE's energies come in eV of CODATA 2014; ASE's own number
undoes that.
"""

from __future__ import annotations

import dataclasses
import io
import math
import re
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import ISOTOPES, MOST_ABUNDANT, SYMBOLS
from thermo_pp.errors import Finding, ReadError
from thermo_pp.formulas.normal_modes import normal_modes
from thermo_pp.readers import joined_hessian, mode_lists
from thermo_pp.readers.text import CUT_SHORT, Text
from thermo_pp.records import Calculation
from thermo_pp.sources import Source

NAME = "ase"
LOOKS_FOR = "an ASE trajectory, an ASE data base in JSON, extended XYZ with 'Properties='"

FloatArray = NDArray[np.float64]
Atoms = Any  # ase.Atoms, which is not imported for its type: its methods carry none


@dataclass(frozen=True)
class Images:
    """The structures of a file.

    Attributes
    ----------
    count : int
        How many there are.
    atoms : callable
        Gives one of them by its number from 0.
    lines : callable
        Gives the lines, from 1, at which the fields of one of them stand, where that is known.
    """

    count: int
    atoms: Callable[[int], Atoms]
    lines: Callable[[int], dict[str, int]]


_MEND_MODES = (
    "write frequencies in cm^-1 (3N-6, or 3N with null modes) and the hessian in eV/A^2 (3N x 3N)"
)
_MODE_KEYS = ("frequencies", "seam_frequencies", "hessian")
_ASYMMETRY = 0.05
"""eV/A^2."""
_TRAJECTORY = b"- of UlmASE-Trajectory"
_EXTENDED_XYZ = re.compile(rb"\s*\d+[ \t]*\r?\n[^\r\n]*\bProperties=\"?species:S:1:pos:R:3")
_DATA_BASE = re.compile(rb'\s*\{\s*"\d+"\s*:\s*\{')
_DATA_BASE_KEYS = (b'"unique_id"', b'"positions"', b'"numbers"', b'"ctime"')


def sniff(head: bytes) -> bool:
    """Tell whether `head`, the first 64 KiB of a file, is one of the formats read here."""
    return _format(head) is not None


def _format(head: bytes) -> Callable[[Text], Images] | None:
    if head.startswith(_TRAJECTORY):
        return _trajectory
    if _EXTENDED_XYZ.match(head):
        return _extended_xyz
    if _DATA_BASE.match(head) and all(key in head for key in _DATA_BASE_KEYS):
        return _data_base
    return None


def _trajectory(text: Text) -> Images:
    from ase.io import trajectory

    open_trajectory: Any = trajectory.TrajectoryReader
    reader = open_trajectory(io.BytesIO(text.data))
    return Images(len(reader), reader.__getitem__, lambda _: {})


def _extended_xyz(text: Text) -> Images:
    from ase.io.extxyz import read_extxyz

    lines = _lines(text.data)
    frames = _frames(lines)

    def atoms(number: int) -> Atoms:
        begin = frames[number]
        own = "\n".join(lines[begin : begin + int(lines[begin]) + 2])
        return next(read_extxyz(io.StringIO(own), index=slice(None)))

    def places(number: int) -> dict[str, int]:
        comment = frames[number] + 2
        return {
            "positions_angstrom": comment + 1,
            "energy_hartree": comment,
            "gradient_hartree_bohr": comment + 1,
            "wavenumbers_cm": comment,
        }

    return Images(len(frames), atoms, places)


def _lines(data: bytes) -> list[str]:
    return [line.rstrip("\r") for line in data.decode("utf-8").split("\n")]


def _frames(lines: list[str]) -> list[int]:
    """Return at which of the lines, from 0, the structures of an extended XYZ file begin.

    Raises
    ------
    ValueError
        A line that is no number of atoms, or one that promises more lines than there are.
    """
    frames, at = [], 0
    while at < len(lines):
        if lines[at].strip():
            frames.append(at)
            at += int(lines[at]) + 1
            if at >= len(lines) or at <= frames[-1]:
                raise ValueError(f"line {frames[-1] + 1} promises more atoms than there are")
        at += 1
    return frames


def _data_base(text: Text) -> Images:
    from ase.db import jsondb

    open_data_base: Any = jsondb.JSONDatabase
    rows = list(open_data_base(io.StringIO(text.data.decode("utf-8"))).select())

    def atoms(number: int) -> Atoms:
        found, data = rows[number].toatoms(), rows[number].data
        found.info |= {key: data[key] for key in _MODE_KEYS if key in data}
        return found

    def places(number: int) -> dict[str, int]:
        if number + 1 < len(rows):
            return {}
        marks = {"positions_angstrom": b'"positions"', "energy_hartree": b'"energy"'}
        marks["gradient_hartree_bohr"] = b'"forces"'
        key = next((key for key in _MODE_KEYS if key in rows[number].data), None)
        if key is not None:
            marks["wavenumbers_cm"] = f'"{key}"'.encode()
        return {name: text.line_number(max(text.last(mark), 0)) for name, mark in marks.items()}

    return Images(len(rows), atoms, places)


def read(source: Source) -> Calculation:
    """Read the last structure of one file, and its energy.

    Raises
    ------
    ReadError
        Whatever ASE raises, a file without a structure, a periodic cell, an atom of no element, an
        energy, a mass or a position that cannot be.
    """
    text = Text(source)
    images = _images(text)
    found = _calculation(text, images, images.count - 1, source.name, source.sha256)
    return dataclasses.replace(found, findings=_findings(source.name, images.count))


def read_all(source: Source) -> tuple[Calculation, ...]:
    """Read every structure of one file; the third of ``many.xyz`` has the path ``many.xyz#3``.

    Raises
    ------
    ReadError
        As `read`, of any of them; a file of another format.
    """
    text = Text(source)
    images = _images(text)
    return tuple(
        _calculation(text, images, k, f"{source.name}#{k + 1}", f"{source.sha256}#{k + 1}")
        for k in range(images.count)
    )


def _images(text: Text) -> Images:
    opened = _format(text.source.head)
    if opened is None:
        raise text.error(0, "none of the formats that are read through ASE", mend=CUT_SHORT)
    try:
        images = opened(text)
        if images.count < 1:
            raise ValueError("no structure")
    except Exception as error:  # whatever it is, the file is not what it claims to be
        raise _refused(text, error) from error
    return images


def _refused(text: Text, error: Exception) -> ReadError:
    reason = f"{type(error).__name__}: {error}".strip()
    return text.error(0, f"ASE cannot read this file: {reason[:200]}", mend=CUT_SHORT)


def _calculation(text: Text, images: Images, number: int, path: str, sha256: str) -> Calculation:
    """Return one structure, the one of this number from 0."""
    try:
        atoms = images.atoms(number)
    except Exception as error:  # as above
        raise _refused(text, error) from error
    numbers = _numbers(text, atoms)
    printed = atoms.has("masses")
    masses = atoms.get_masses() if printed else _most_abundant(numbers)
    if not np.all(np.isfinite(atoms.positions)) or not np.all(masses > 0.0):
        raise text.error(0, "a position that is not finite, or a mass not above 0", mend=CUT_SHORT)
    energy = _energy(text, atoms)
    wavenumbers, modes, hessian = _vibrations(text, atoms, masses)
    gradient = _gradient(text, atoms)
    lines = images.lines(number)
    for name, value in (
        ("energy_hartree", energy),
        ("wavenumbers_cm", wavenumbers),
        ("gradient_hartree_bohr", gradient),
    ):
        if value is None:
            lines.pop(name, None)
    return Calculation(
        path=path,
        sha256=sha256,
        program="ASE",
        numbers=numbers,
        positions_angstrom=atoms.positions,
        masses_u=masses,
        masses_origin="printed" if printed else "derived",
        charge=_whole(text, atoms, "charge"),
        multiplicity=_whole(text, atoms, "multiplicity"),
        energy_hartree=energy,
        wavenumbers_cm=wavenumbers,
        modes=modes,
        hessian_hartree_bohr2=hessian,
        gradient_hartree_bohr=gradient,
        kind_of_job=_kinds(energy, wavenumbers),
        where=lines,
    )


def _numbers(text: Text, atoms: Atoms) -> NDArray[np.int64]:
    numbers = np.asarray(atoms.numbers, dtype=np.int64)
    if not len(numbers) or np.any(numbers < 1) or np.any(numbers >= len(SYMBOLS)):
        raise text.error(0, "an atom of no element, or no atom at all", mend="remove dummy atoms")
    if np.any(atoms.pbc):
        raise text.error(
            0, "a periodic structure", mend="give a molecule without a periodic cell (pbc = F F F)"
        )
    return numbers


def _most_abundant(numbers: NDArray[np.int64]) -> NDArray[np.float64]:
    return np.array([ISOTOPES[SYMBOLS[z]][MOST_ABUNDANT[z]] for z in numbers])


def _energy(text: Text, atoms: Atoms) -> float | None:
    """Return the energy in hartree, None where the file has none."""
    from ase.units import Hartree

    value = None if atoms.calc is None else atoms.calc.results.get("energy")
    if value is None:
        return None
    try:
        energy = float(value) / Hartree
    except (TypeError, ValueError):
        energy = math.nan
    if not math.isfinite(energy):
        raise text.error(0, f"energy {str(value)[:80]} is not a finite number", mend=CUT_SHORT)
    return energy


def _gradient(text: Text, atoms: Atoms) -> FloatArray | None:
    """Return the gradient in hartree/bohr, None where the file has no forces."""
    from ase.units import Bohr, Hartree

    forces = None if atoms.calc is None else atoms.calc.results.get("forces")
    if forces is None:
        return None
    try:
        gradient = -np.asarray(forces, dtype=np.float64) / (Hartree / Bohr)
    except (TypeError, ValueError):
        gradient = np.full(1, math.nan)
    if gradient.shape != (len(atoms), 3) or not np.all(np.isfinite(gradient)):
        raise text.error(0, "forces: not three finite numbers an atom", mend=CUT_SHORT)
    return gradient


def _kinds(energy: float | None, wavenumbers: FloatArray | None) -> tuple[str, ...]:
    if wavenumbers is not None:
        return ("frequencies",)
    return () if energy is None else ("energy",)


def _vibrations(
    text: Text, atoms: Atoms, masses: FloatArray
) -> tuple[FloatArray | None, FloatArray | None, FloatArray | None]:
    """Return wavenumbers, modes and Hessian of the keys that the file has; None for what it has not."""
    from ase.units import Bohr, Hartree

    n = len(masses)
    listed = _floats(text, atoms, "frequencies")
    flat = _floats(text, atoms, "hessian")
    along = _floats(text, atoms, "seam_frequencies")
    if along is not None:
        if (
            listed is not None
            or flat is not None
            or len(along) != mode_lists.count(masses, atoms.positions) - 1
        ):
            raise text.error(
                0, "seam_frequencies must be one less than the modes of the structure, and stand alone",
                mend=_MEND_MODES,
            )  # fmt: skip
        return np.sort(along), None, None
    wavenumbers = None
    if listed is not None:
        try:
            keep = mode_lists.vibrations(listed, masses, atoms.positions)
        except ValueError as error:
            raise text.error(0, f"frequencies: {error}", mend=_MEND_MODES) from None
        wavenumbers = listed[keep]
    if flat is None:
        return wavenumbers, None, None
    if len(flat) != 9 * n * n:
        what = f"hessian: {len(flat)} numbers, expected {9 * n * n} for {n} atoms"
        raise text.error(0, what, mend=_MEND_MODES)
    matrix = flat.reshape(3 * n, 3 * n)
    if np.max(np.abs(matrix - matrix.T)) > _ASYMMETRY:
        raise text.error(0, "hessian: it is not symmetric", mend=_MEND_MODES)
    matrix = matrix / (Hartree / Bohr**2)
    if wavenumbers is None:
        found = normal_modes(matrix, masses, atoms.positions)
        return found.wavenumbers_cm, found.modes, matrix
    joined = joined_hessian.modes_of(matrix, masses, atoms.positions, wavenumbers)
    if joined is None:
        raise text.error(
            0, "the frequencies are not those of the hessian (eV/A^2) and the masses of this file",
            mend=_MEND_MODES,
        )  # fmt: skip
    return wavenumbers, joined.modes, matrix


def _floats(text: Text, atoms: Atoms, key: str) -> FloatArray | None:
    value = atoms.info.get(key)
    if value is None:
        return None
    try:
        array = np.asarray(value, dtype=np.float64).ravel()
    except (TypeError, ValueError):
        array = np.array([math.nan])
    if not np.all(np.isfinite(array)) or np.max(np.abs(array), initial=0.0) > 1e6:
        raise text.error(0, f"{key} does not hold finite numbers", mend=_MEND_MODES)
    return array


def _whole(text: Text, atoms: Atoms, key: str) -> int | None:
    """Return the whole number that the file states as `key`, None where it states none."""
    value = atoms.info.get(key)
    if value is None:
        return None
    try:
        number = float(value)
    except (TypeError, ValueError):
        number = math.nan
    if not abs(number) < 1000.0 or number != round(number):
        raise text.error(0, f"{key} {str(value)[:80]} is not a small whole number", mend=CUT_SHORT)
    return round(number)


def _findings(name: str, count: int) -> tuple[Finding, ...]:
    if count == 1:
        return ()
    return (
        Finding(
            "last-of-several-structures",
            "note",
            name,
            None,
            f"{count} structures in this file; the last one is taken",
            "give a file with one structure where another one is meant",
        ),
    )
