"""Formatted checkpoints of Gaussian, as far as cclib's answer is checked against them, or lacks something.

They have no mark of their end: their arrays must be whole. The masses are those that the modes were computed with.
"""

from __future__ import annotations

import difflib
import re
from typing import Any

from thermo_pp.readers import cclib_checks as checks
from thermo_pp.readers.text import CUT_SHORT, Text

_HEADING = re.compile(
    rb"^[A-Za-z/][^\n]{39}   ([IRCLH])(?:   N=[ ]*(\d+)|     [^\n]*)[ ]*\r?\n", re.MULTILINE
)
"""Name, type and number of elements of an array; name, type and value of a number."""
_PER_LINE = {b"I": 6, b"R": 5}
_NAMES = ("Real atomic weights", "Vib-AtMass", "Total Energy", "SCF Energy")
_NEAR = 0.85
"""Names that are as much alike are one name, one of them damaged; "Integer atomic weights" has 0.78."""


def check_answer(text: Text, data: Any) -> None:
    """Refuse a checkpoint without charge or multiplicity, or one that announces modes and has none."""
    for name in ("charge", "mult"):
        if not hasattr(data, name):
            raise text.error(0, f"no {name} in this formatted checkpoint", mend=CUT_SHORT)
    for mark in (b"\nNumber of Normal Modes", b"\nVib-Modes ", b"\nVib-E2 "):
        at = text.find(mark)
        if at >= 0 and not hasattr(data, "vibfreqs"):
            raise text.error(at + 1, "modes without their wavenumbers", mend=CUT_SHORT)


def method(text: Text) -> str:
    """Return the method of the second line, without the kind of its SCF."""
    at = text.next_line(0)
    words = text.line(at).split()
    method = words[1].upper() if len(words) > 2 else ""
    if re.fullmatch(r"[A-Z0-9][A-Z0-9()+\-,*]*", method) is None:
        raise text.expected(at, "the kind of job, the method and the basis set")
    return re.sub(r"^(?:RO|R|U)(?=[A-Z])", "", method)


def basis(text: Text) -> str | None:
    """Return the basis set: the last 30 columns of the second line."""
    return text.line(text.next_line(0))[40:].strip() or None


def energy(text: Text) -> tuple[float | None, str | None, int | None]:
    """Return the total energy in hartree, its label, and the offset at which it stands; None thrice without one.

    Raises
    ------
    ReadError
        A total energy that is neither the SCF's nor that of the method.
    """
    at = text.find(b"\nTotal Energy  ")
    scf_at = text.find(b"\nSCF Energy  ")
    if at < 0 or scf_at < 0:
        return None, None, None
    value = float(text.rest(at + 1).split()[-1])
    scf = float(text.rest(scf_at + 1).split()[-1])
    named = method(text)
    place = at + 1
    if abs(value - scf) < 1e-9:
        if named in checks.RANKS and named not in ("HF", "DFT"):
            raise text.error(place, f"no {named} energy beside that of the SCF", mend=CUT_SHORT)
        return value, "HF" if named == "HF" else "DFT", place
    name = "MP4" if named.startswith("MP4") else named
    if name not in checks.RANKS or name in ("HF", "DFT"):
        raise text.error(
            place,
            f"a total energy that is not the SCF's with the method {named!r}: an excited state or a double hybrid",
            mend="give the program's own output",
        )
    return value, name, place


def check_arrays(text: Text) -> None:
    """Refuse a formatted checkpoint that ends within an array, or in which an array has another length than it says."""
    headings = list(_HEADING.finditer(text.data))
    arrays = [i for i, one in enumerate(headings) if one.group(2) is not None]
    if not arrays:
        raise text.error(text.end, "no arrays in this formatted checkpoint", mend=CUT_SHORT)
    for i in arrays:
        kind, wanted = headings[i].group(1), int(headings[i].group(2))
        if kind not in _PER_LINE:
            continue
        begin, last = headings[i].end(), i + 1 == len(headings)
        stop = len(text.data) if last else headings[i + 1].start()
        lines = text.data.count(b"\n", begin, stop)
        if lines != -(-wanted // _PER_LINE[kind]):
            raise text.error(
                headings[i].start(),
                f"this array should have {wanted} numbers on {-(-wanted // _PER_LINE[kind])} lines, "
                f"there are {lines}",
                mend=CUT_SHORT,
            )
    names = [one.group()[:40].decode("utf-8", "replace").strip() for one in headings]
    for needed in _NAMES:
        near = [] if needed in names else difflib.get_close_matches(needed, names, 1, _NEAR)
        if near:
            raise text.expected(headings[names.index(near[0])].start(), f"the name {needed!r}")
    kind, wanted = headings[arrays[-1]].group(1), int(headings[arrays[-1]].group(2))
    if kind == b"C" and headings[arrays[-1]] is headings[-1]:
        lines = text.data.count(b"\n", headings[-1].end())
        if lines < -(-wanted // 5):
            raise text.error(text.end, "the last array of this file is not whole", mend=CUT_SHORT)
    if not text.data.endswith(b"\n"):
        raise text.error(text.end, "the last line of this file is not whole", mend=CUT_SHORT)


def masses(text: Text, count: int) -> list[float]:
    """Return the masses that a checkpoint's modes were computed with (cclib reads those of the molecule)."""
    at = text.find(b"\nVib-AtMass ")
    if at < 0:
        return []
    lines = [5] * (count // 5) + ([count % 5] if count % 5 else [])
    return text.rows(text.next_line(at + 1), lines, "the masses of the modes")[0]
