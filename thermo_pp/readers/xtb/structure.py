"""The geometry of an xtb output: printed after an optimisation, else in a file beside the output.

xtb prints coordinates only after an optimisation (``final structure:``, in the format of the
input). The geometry of any other job stands in the input file that the output names, which must lie
beside it; its elements are checked against the table that the output prints.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import NUMBERS, SYMBOLS
from thermo_pp.formulas.rotor import rigid_rotor
from thermo_pp.readers.text import CUT_SHORT, Text
from thermo_pp.sources import Source
from thermo_pp.units import BOHR_ANGSTROM

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

FINAL = re.compile(rb"^ final structure:\r?\n=+\r?\n", re.MULTILINE)
_COORDINATE_FILE = b"          coordinate file            :"
_WRITTEN = b"optimized geometry written to:"
_TABLE = re.compile(rb"^   ID    Z sym\.   atoms\r?\n", re.MULTILINE)
_ROW = re.compile(rb"[ \t]*\d+[ \t]+(\d+)[ \t]+[A-Za-z]+[ \t]+([\d,\- \t]+)\r?\n")
_MORE = re.compile(rb"[ \t]+([\d,\- \t]+)\r?\n")
_ATOMS = re.compile(rb"^          number of atoms            :\s*(\d+)", re.MULTILINE)
_MOMENTS = b"  moments of inertia/u\xc2\xb7\xc3\x85\xc2\xb2 :"
_TURBOMOLE = re.compile(rb"\s*\$coord\b([^\r\n]*)\r?\n")
_MOLFILE = re.compile(rb"[^\n]*\n[^\n]*\n[^\n]*\n[ \t]*(\d{1,3})[ \d]{4,}.*V2000[ \t\r]*\n")
_SYMBOL = re.compile(rb"([A-Za-z]{1,2})\d*")
_MEND_FORMAT = "xyz, Turbomole $coord and molfiles (V2000) are read; write the geometry as xyz"
_SAME_MOMENTS = 1e-4


@dataclass(frozen=True, eq=False)
class Structure:
    """Atoms, positions, and where the output says so (None: in a file beside it)."""

    numbers: IntArray
    positions_angstrom: FloatArray
    at: int | None


def structure(text: Text, optimised: bool) -> Structure:
    """Return the geometry of the job: printed, else the file it wrote it to, else the one it read.

    Raises
    ------
    ReadError
        No geometry printed and none beside, one in a format not known, one of other atoms than the
        output lists.
    """
    finals = [match.end() for match in FINAL.finditer(text.data, text.start, text.end)]
    if finals:
        found = Structure(*_parse(text, finals[-1], text.end), finals[-1])
    elif optimised:
        raise text.error(
            text.end, "an optimisation, but no 'final structure:' after it", mend=CUT_SHORT
        )
    else:
        found = _beside(text)
    _check_atoms(text, found)
    return found


def _beside(text: Text) -> Structure:
    mark = _WRITTEN if text.find(_WRITTEN) >= 0 else _COORDINATE_FILE
    at = text.find(mark)
    mend = "put the coordinate file of the job beside the output"
    if at < 0:
        raise text.error(
            text.end, "no geometry is printed, and no coordinate file is named", mend=mend
        )
    path = text.rest(at + len(mark)).decode("utf-8", "replace").strip()
    name = re.split(r"[/\\]", path)[-1]
    source = text.source.sibling(name)
    if source is None:
        raise text.error(
            at,
            f"xtb prints no geometry in such a job, and the file {name} is not beside this output",
            mend=mend,
        )
    other = Text(source)
    return Structure(*_parse(other, 0, other.end), None)


def _parse(text: Text, start: int, end: int) -> tuple[IntArray, FloatArray]:
    """Return atomic numbers and positions, A, of an xyz, $coord or molfile block."""
    turbomole = _TURBOMOLE.match(text.data, start, end)
    if turbomole is not None:
        return _turbomole(text, turbomole)
    molfile = _MOLFILE.match(text.data, start, end)
    if molfile is not None:
        return _rows(text, molfile.end(), int(molfile.group(1)), symbol=3)
    count = text.rest(start).split()
    if len(count) != 1 or not count[0].isdigit() or int(count[0]) < 1:
        raise text.error(start, "a geometry in a format that is not read", mend=_MEND_FORMAT)
    return _rows(text, text.next_line(start, 2), int(count[0]), symbol=0)


def _turbomole(text: Text, head: re.Match[bytes]) -> tuple[IntArray, FloatArray]:
    unit = head.group(1).split()
    if unit not in ([], [b"angs"], [b"bohr"]):
        raise text.error(head.start(1), "coordinates in a unit not known", mend=_MEND_FORMAT)
    at, rows = head.end(), 0
    while not text.rest(at).lstrip().startswith(b"$"):
        rows, at = rows + 1, text.next_line(at)
    numbers, positions = _rows(text, head.end(), rows, symbol=3)
    return numbers, positions if unit == [b"angs"] else positions * BOHR_ANGSTROM


def _element(word: bytes) -> int | None:
    """Return the atomic number that a word of a coordinate file means to xtb, None where it means none.

    D and T are hydrogen, of hydrogen's mass.
    """
    if word.isdigit():
        return int(word) if len(word) < 4 and 0 < int(word) < len(SYMBOLS) else None
    match = _SYMBOL.fullmatch(word)
    symbol = "" if match is None else match.group(1).decode().capitalize()
    return NUMBERS.get({"D": "H", "T": "H"}.get(symbol, symbol))


def _rows(text: Text, at: int, count: int, symbol: int) -> tuple[IntArray, FloatArray]:
    """Return `count` atoms, a line each: three numbers and a symbol, which is word `symbol`."""
    numbers, positions = [], []
    for row in range(count):
        words = text.rest(at).split()
        element = _element(words[symbol]) if len(words) > 3 else None
        if element is None:
            raise text.expected(at, f"the element and position of atom {row + 1}")
        numbers.append(element)
        positions.append(text.floats(at, 3, "the position of an atom", skip=0 if symbol else 1))
        if row + 1 < count:
            at = text.next_line(at)
    if not numbers:
        raise text.error(at, "a geometry without atoms", mend=_MEND_FORMAT)
    return np.array(numbers, dtype=np.int64), np.array(positions)


def _check_atoms(text: Text, found: Structure) -> None:
    """Compare the elements with those the output lists, and moments of inertia where it has them."""
    listed = _listed(text)
    if listed is not None and not np.array_equal(listed[0], found.numbers):
        raise text.error(
            listed[1],
            f"this output is of {_formula(listed[0])}, but the geometry is of "
            f"{_formula(found.numbers)}, or of another order of atoms",
            mend="put the coordinate file of this very job beside the output",
        )
    count = _ATOMS.search(text.data, text.start, text.end)
    if count is not None and int(count.group(1)) != len(found.numbers):
        raise text.error(
            count.start(),
            f"{int(count.group(1))} atoms here, {len(found.numbers)} in the geometry",
            mend="put the coordinate file of this very job beside the output",
        )


def check_moments(text: Text, found: Structure, masses_u: FloatArray) -> None:
    """Refuse a geometry whose moments of inertia are not those that the output prints."""
    at = text.last(_MOMENTS)
    if at < 0 or len(masses_u) < 2:
        return
    printed = np.array(text.floats(at + len(_MOMENTS), 3, "three moments of inertia"))
    own = moments(masses_u, found.positions_angstrom)
    if np.any(np.abs(np.sort(printed) - own) > _SAME_MOMENTS * own[-1]):
        raise text.error(
            at,
            f"moments of inertia {printed[0]:.5g}, {printed[1]:.5g}, {printed[2]:.5g} u A^2, but "
            f"those of the geometry are {own[0]:.5g}, {own[1]:.5g}, {own[2]:.5g}",
            mend="put the coordinate file of this very job beside the output",
        )


def moments(masses_u: FloatArray, positions_angstrom: FloatArray) -> FloatArray:
    """Return the principal moments of inertia, u A^2, ascending."""
    x = positions_angstrom - masses_u @ positions_angstrom / masses_u.sum()
    tensor = np.einsum("i,ij,ik->jk", masses_u, x, x)
    return np.asarray(np.linalg.eigvalsh(np.trace(tensor) * np.eye(3) - tensor))


def is_linear(masses_u: FloatArray, positions_angstrom: FloatArray) -> bool:
    """Tell whether the atoms lie on one line."""
    return rigid_rotor(masses_u, positions_angstrom).kind == "linear"


def _listed(text: Text) -> tuple[IntArray, int] | None:
    """Return the elements by the table of the output, and where it stands; None where there is none."""
    head = _TABLE.search(text.data, text.start, text.end)
    if head is None:
        return None
    elements: dict[int, int] = {}
    at, element = head.end(), 0
    while True:
        row = _ROW.match(text.data, at, text.end)
        more = _MORE.match(text.data, at, text.end) if row is None and elements else None
        if row is not None:
            element = int(row.group(1))
        match = row or more
        if match is None:
            break
        for part in match.group(2 if row is not None else 1).replace(b" ", b"").split(b","):
            if not part.strip():  # after the comma at the end of a line
                continue
            first, _, last = part.partition(b"-")
            if not first.isdigit() or not (last or first).isdigit() or len(part) > 15:
                raise text.expected(at, "a list of atoms")
            atoms = range(int(first), int(last or first) + 1)
            if not elements.keys().isdisjoint(atoms[:100_000]):
                raise text.expected(at, "a table with each atom once")
            elements |= dict.fromkeys(atoms[:100_000], element)
        at = match.end()
    if sorted(elements) != list(range(1, len(elements) + 1)) or not all(
        0 < z < len(SYMBOLS) for z in elements.values()
    ):
        raise text.expected(head.end(), "a table with each atom once")
    return np.array([elements[i + 1] for i in range(len(elements))], dtype=np.int64), head.start()


def _formula(numbers: IntArray) -> str:
    from thermo_pp.records import hill_formula

    return hill_formula(numbers)


def sibling_name(text: Text, name: str) -> str:
    """Return `name` with the namespace of the job before it."""
    mark = b"          calculation namespace      :"
    at = text.find(mark)
    space = "" if at < 0 else text.rest(at + len(mark)).decode("utf-8", "replace").strip()
    return f"{space}.{name}" if space else name


def sibling(text: Text, name: str) -> Source | None:
    """Return the file `name` of the job beside the output, None where there is none."""
    return text.source.sibling(sibling_name(text, name))
