"""Molden files with ``[FREQ]``: geometry, wavenumbers and displacements; no energy, charge or level.

Traps
- ``[Atoms]`` says its unit, AU or Angs; ``[FR-COORD]`` has none and is in bohr. Some writers put
  angstrom there: where both stand they must be one geometry, and alone a geometry that would be too
  dense in bohr is refused.
- Translations and rotations may stand among the modes, as values near zero.
- Imaginary wavenumbers are negative; a trailing i is taken too.
- Which masses the modes are of is not said.
- A title, and ``[GEOCONV]`` with energies of an optimisation, are of no certain geometry or level:
  no energy is taken.
- Files without ``[FREQ]`` (orbitals) are not claimed.
"""

from __future__ import annotations

import math
import re

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import NUMBERS, SYMBOLS
from thermo_pp.readers import mode_lists
from thermo_pp.readers.text import CUT_SHORT, Text
from thermo_pp.records import Calculation
from thermo_pp.sources import Source
from thermo_pp.units import BOHR_ANGSTROM

NAME = "molden"
LOOKS_FOR = "'[Molden Format]' with '[FREQ]'"

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

_START = re.compile(rb"\s*\[molden format\]", re.IGNORECASE)
_FREQ = re.compile(rb"^[ \t]*\[freq\]", re.IGNORECASE | re.MULTILINE)
_SECTION = re.compile(rb"^[ \t]*\[([^\]\n]+)\][ \t]*([^\n]*)\n", re.MULTILINE)
_WAVENUMBER = re.compile(rb"([+-]?\d+\.?\d*(?:[eEdD][+-]?\d+)?)([iI]?)")
_SYMBOL = re.compile(rb"([A-Za-z]{1,2})[\d_]*")
_SAME_ANGSTROM = 2e-3
_CLOSEST_ANGSTROM = (0.6, 0.9)
"""No two nuclei are closer, with hydrogen (H2 has 0.74) and without (N2 has 1.10)."""
_MEND = "write the file again, or give the output of the program itself"


def sniff(head: bytes) -> bool:
    """Tell whether `head`, the first 64 KiB of a file, is a Molden file with vibrations."""
    return _START.match(head) is not None and _FREQ.search(head) is not None


def read(source: Source) -> Calculation:
    """Read one file; ReadError where a section is missing, damaged or in doubt."""
    text = Text(source)
    sections = _sections(text)
    at = _need(text, sections, "FREQ")
    wavenumbers = _wavenumbers(text, at)
    numbers, positions, shape_at = _geometry(text, sections)
    masses = mode_lists.most_abundant(numbers)
    try:
        keep = mode_lists.vibrations(wavenumbers, masses, positions)
    except ValueError as error:
        raise text.error(at.start, str(error), mend=_MEND) from None
    vectors = _displacements(text, sections, len(wavenumbers), len(numbers))
    modes = None
    if vectors is not None:
        try:
            modes = mode_lists.displacements(vectors[keep], masses)
        except ValueError as error:
            place = sections["FR-NORM-COORD"].start
            raise text.error(place, str(error), mend=_MEND) from None
    line = text.line_number(at.start)
    return Calculation(
        path=source.name,
        sha256=source.sha256,
        program="Molden format",
        numbers=numbers,
        positions_angstrom=positions,
        masses_u=masses,
        masses_origin="derived",
        wavenumbers_cm=wavenumbers[keep],
        modes=modes,
        kind_of_job=("frequencies",),
        where=text.line_numbers({"wavenumbers_cm": at.start, "positions_angstrom": shape_at}),
        findings=(
            mode_lists.masses_assumed(source.name, line),
            mode_lists.no_energy(source.name, None, "Molden files hold no energy that is sure"),
        ),
    )


def _sections(text: Text) -> dict[str, Text]:
    """Return the part of each section by its name in capitals; ReadError where one stands twice."""
    heads = list(_SECTION.finditer(text.data))
    found: dict[str, Text] = {}
    if heads and not text.data.endswith(b"\n") and b"NORM" not in heads[-1].group(1).upper():
        raise text.error(text.end, "the last line has no end", mend=CUT_SHORT)
    for head, after in zip(heads, [*heads[1:], None], strict=False):
        name = head.group(1).decode("utf-8", "replace").strip().upper()
        if name in found and name in ("FREQ", "ATOMS", "FR-COORD", "FR-NORM-COORD"):
            raise text.error(head.start(), f"a second section [{name}]", mend=_MEND)
        found[name] = text.part(head.start(), text.end if after is None else after.start())
    return found


def _need(text: Text, sections: dict[str, Text], name: str) -> Text:
    if name not in sections:
        raise text.error(text.end, f"no section [{name}] in this file", mend=CUT_SHORT)
    return sections[name]


def _lines(part: Text) -> list[tuple[int, list[bytes]]]:
    """Return offset and words of each line that is not empty, the heading left out."""
    found, at = [], part.start + len(part.rest(part.start)) + 1
    while at < part.end:
        line = part.rest(at)
        words = line.split()
        if words:
            found.append((at, words))
        at += len(line) + 1
    return found


def _wavenumbers(text: Text, part: Text) -> FloatArray:
    values = []
    for at, words in _lines(part):
        match = _WAVENUMBER.fullmatch(words[0])
        if match is None or len(words) > 1:
            raise text.expected(at, "one wavenumber")
        value = float(match.group(1).lower().replace(b"d", b"e"))
        if not math.isfinite(value):
            raise text.expected(at, "one wavenumber")
        values.append(-abs(value) if match.group(2) else value)
    return np.array(values)


def _geometry(text: Text, sections: dict[str, Text]) -> tuple[IntArray, FloatArray, int]:
    """Return the geometry of the modes, [FR-COORD], and where it stands; [Atoms] where that is missing."""
    atoms = _atoms(text, sections["ATOMS"]) if "ATOMS" in sections else None
    if "FR-COORD" not in sections:
        if atoms is None:
            raise text.error(
                text.end, "neither [FR-COORD] nor [Atoms] in this file", mend=CUT_SHORT
            )
        return *atoms, sections["ATOMS"].start
    part = sections["FR-COORD"]
    numbers, positions = [], []
    for at, words in _lines(part):
        numbers.append(_element(text, at, words[0]))
        positions.append(text.floats(at, 3, "the position of an atom", skip=1))
    z, x = np.array(numbers, dtype=np.int64), np.array(positions).reshape(-1, 3) * BOHR_ANGSTROM
    if not len(z):
        raise text.error(part.start, "no atoms in [FR-COORD]", mend=CUT_SHORT)
    if atoms is not None:
        if not np.array_equal(atoms[0], z):
            raise text.error(part.start, "[FR-COORD] has other atoms than [Atoms]", mend=_MEND)
        if np.max(np.abs(_distances(atoms[1]) - _distances(x))) > _SAME_ANGSTROM:
            raise text.error(
                part.start,
                "[FR-COORD], which is in bohr, is another geometry than [Atoms]",
                mend="one of the two is in another unit than it says; " + _MEND,
            )
    elif _too_close(z, x):
        raise text.error(
            part.start,
            "two atoms are impossibly close: [FR-COORD] must be in bohr, and seems to be in angstrom",
            mend=_MEND,
        )
    return z, x, part.start


def _too_close(numbers: IntArray, positions: FloatArray) -> bool:
    """Tell whether two nuclei are closer than any two are in a molecule."""
    i, j = np.triu_indices(len(numbers), 1)
    with_hydrogen, without = _CLOSEST_ANGSTROM
    least = np.where((numbers[i] == 1) | (numbers[j] == 1), with_hydrogen, without)
    return bool(np.any(_distances(positions)[i, j] < least))


def _atoms(text: Text, part: Text) -> tuple[IntArray, FloatArray]:
    head = text.rest(part.start).partition(b"]")[2].strip().strip(b"()").upper()
    if not (head.startswith(b"AU") or head.startswith(b"ANGS")):
        raise text.expected(part.start, "AU or Angs after [Atoms]")
    factor = 1.0 if head.startswith(b"ANGS") else BOHR_ANGSTROM
    numbers, positions = [], []
    for at, words in _lines(part):
        row = text.floats(at, 5, "number, atomic number and position of an atom", skip=1)
        number = row[1]
        if number % 1.0 or not 0 < number < len(SYMBOLS):
            raise text.error(at, "an atom of no element", mend="remove ghost and dummy atoms")
        if _element(text, at, words[0]) != number:
            raise text.expected(at, "the atomic number of the element")
        numbers.append(int(number))
        positions.append(row[2:])
    if not numbers:
        raise text.error(part.start, "no atoms in [Atoms]", mend=CUT_SHORT)
    return np.array(numbers, dtype=np.int64), np.array(positions) * factor


def _element(text: Text, at: int, word: bytes) -> int:
    match = _SYMBOL.fullmatch(word)
    number = 0 if match is None else NUMBERS.get(match.group(1).decode().capitalize(), 0)
    if not number:
        raise text.expected(at, "an element")
    return number


def _distances(positions: FloatArray) -> FloatArray:
    return np.asarray(np.linalg.norm(positions[:, np.newaxis] - positions, axis=-1))


def _displacements(
    text: Text, sections: dict[str, Text], modes: int, atoms: int
) -> FloatArray | None:
    """Return the displacements (m, n, 3), None where the file has none."""
    if "FR-NORM-COORD" not in sections:
        return None
    part = sections["FR-NORM-COORD"]
    lines = _lines(part)
    if len(lines) != modes * (atoms + 1):
        raise text.error(
            part.start,
            f"{len(lines)} lines in [FR-NORM-COORD], expected {modes * (atoms + 1)} for {modes} modes",
            mend=CUT_SHORT,
        )
    rows = []
    for i, (at, words) in enumerate(lines):
        mode, atom = divmod(i, atoms + 1)
        if atom == 0:
            if words[0].lower() != b"vibration" or words[1:2] != [b"%d" % (mode + 1)]:
                raise text.expected(at, f"'vibration {mode + 1}'")
        elif len(words) != 3:
            raise text.expected(at, "three displacements of an atom")
        else:
            rows.append(text.floats(at, 3, "three displacements of an atom"))
    return np.array(rows).reshape(modes, atoms, 3)
