"""Damaged copies of the fixtures, and what may come of reading them.

Each variant must end in the original values, or in an error that names file and line. A value that differs must be what
a damaged line now says, under the same energy label; anything else is a failure.
"""

from __future__ import annotations

import re
import time
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from thermo_pp.errors import ReadError
from thermo_pp.readers import READERS, read_source
from thermo_pp.records import Calculation
from thermo_pp.sources import Source
from thermo_pp.units import BOHR_ANGSTROM

FIXTURES = Path(__file__).parents[1] / "fixtures"
MOST_SECONDS = 2.0
NUMBER = re.compile(rb"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eEdD][+-]?\d+)?")
BIG_LINE = 100_000_000
NUMERIC = (
    "energy_hartree",
    "positions_angstrom",
    "masses_u",
    "wavenumbers_cm",
    "charge",
    "multiplicity",
    "numbers",
)
TEXTS = (
    "program",
    "program_version",
    "method",
    "basis",
    "dispersion",
    "solvent",
    "grid",
    "frozen_core",
)
ASE_HARTREE_EV = 27.211386024367243  # ASE's own, of CODATA 2014
UNITS = (1.0, BOHR_ANGSTROM, 1.0 / BOHR_ANGSTROM, 1.0 / ASE_HARTREE_EV)


@dataclass(frozen=True)
class Variant:
    """One damaged copy."""

    fixture: Path
    kind: str
    data: bytes

    @property
    def name(self) -> str:
        return f"{self.fixture.parent.parent.name}/{self.fixture.name} [{self.kind}]"


def fixtures() -> list[Path]:
    """Return every good fixture that is a text; in a binary file no line can say anything."""
    return [
        path
        for path in sorted(FIXTURES.glob("*/good/*"))
        if path.suffix not in (".toml", ".traj")
        and path.is_file()
        and path.parent.parent.name in {reader.NAME for reader in READERS}
    ]


def variants(rng: np.random.Generator, paths: list[Path], count: int) -> Iterator[Variant]:
    """Draw damaged copies, spread evenly over fixtures and kinds of damage."""
    kinds = list(DAMAGE)
    for k in range(count):
        path = paths[k % len(paths)]
        kind = kinds[int(rng.integers(len(kinds)))]
        data = path.read_bytes()
        if data:
            yield Variant(path, kind, DAMAGE[kind](data, rng))


def cut(data: bytes, rng: np.random.Generator) -> bytes:
    return data[: len(data) * int(rng.integers(1, 100)) // 100]


def flip(data: bytes, rng: np.random.Generator) -> bytes:
    damaged = bytearray(data)
    for at in rng.integers(0, len(data), int(rng.integers(1, 6))):
        damaged[int(at)] = int(rng.integers(256))
    return bytes(damaged)


def _lines(data: bytes, rng: np.random.Generator) -> tuple[list[bytes], int]:
    lines = data.split(b"\n")
    return lines, int(rng.integers(len(lines)))


def double_line(data: bytes, rng: np.random.Generator) -> bytes:
    lines, at = _lines(data, rng)
    return b"\n".join([*lines[: at + 1], *lines[at:]])


def drop_line(data: bytes, rng: np.random.Generator) -> bytes:
    lines, at = _lines(data, rng)
    return b"\n".join([*lines[:at], *lines[at + 1 :]])


def _number(data: bytes, rng: np.random.Generator, text: bytes) -> bytes:
    places = list(NUMBER.finditer(data))
    if not places:
        return data
    match = places[int(rng.integers(len(places)))]
    size = match.end() - match.start()
    return data[: match.start()] + (text * size)[:size].rjust(size) + data[match.end() :]


def stars(data: bytes, rng: np.random.Generator) -> bytes:
    return _number(data, rng, b"*")


def not_a_number(data: bytes, rng: np.random.Generator) -> bytes:
    places = list(NUMBER.finditer(data))
    if not places:
        return data
    match = places[int(rng.integers(len(places)))]
    word = b"nan".rjust(match.end() - match.start())
    return data[: match.start()] + word + data[match.end() :]


def other_digit(data: bytes, rng: np.random.Generator) -> bytes:
    digits = [m.start() for m in re.finditer(rb"\d", data)]
    if not digits:
        return data
    at = digits[int(rng.integers(len(digits)))]
    return data[:at] + b"%d" % rng.integers(10) + data[at + 1 :]


def carriage_returns(data: bytes, rng: np.random.Generator) -> bytes:
    return data.replace(b"\r\n", b"\n").replace(b"\n", b"\r\n")


def utf16(data: bytes, rng: np.random.Generator) -> bytes:
    return data.decode("utf-8", "replace").encode("utf-16")


def zeros(data: bytes, rng: np.random.Generator) -> bytes:
    at = int(rng.integers(len(data)))
    return data[:at] + bytes(1 << 20) + data[at:]


DAMAGE = {
    "cut": cut,
    "flipped bytes": flip,
    "line doubled": double_line,
    "line dropped": drop_line,
    "stars": stars,
    "nan": not_a_number,
    "another digit": other_digit,
    "CRLF": carriage_returns,
    "UTF-16": utf16,
    "zeros": zeros,
}


def line_by_line(path: Path, rng: np.random.Generator, most: int) -> Iterator[Variant]:
    """Yield copies in which one line is lost, doubled or has one byte changed, for up to `most` lines of a file."""
    lines = path.read_bytes().split(b"\n")
    filled = np.array([i for i, line in enumerate(lines) if line.strip()])
    chosen = filled if len(filled) <= most else np.sort(rng.choice(filled, most, replace=False))
    for i in (int(index) for index in chosen):
        before, line, after = lines[:i], lines[i], lines[i + 1 :]
        yield Variant(path, f"line {i + 1} dropped", b"\n".join([*before, *after]))
        yield Variant(path, f"line {i + 1} doubled", b"\n".join([*before, line, line, *after]))
        for _ in range(2):
            flipped = bytearray(line)
            places = [k for k, byte in enumerate(line) if byte != 32]
            flipped[places[int(rng.integers(len(places)))]] = int(rng.integers(256))
            changed = b"\n".join([*before, bytes(flipped), *after])
            yield Variant(path, f"a byte of line {i + 1} flipped", changed)


def long_line(data: bytes) -> bytes:
    """Put one line of 100 MB in the middle."""
    at = data.find(b"\n", len(data) // 2) + 1
    return data[:at] + b"x" * BIG_LINE + b"\n" + data[at:]


def failure(variant: Variant, original: Calculation) -> str | None:
    """Read a variant; return what is wrong with what came of it, None where nothing is."""
    begin = time.process_time()  # other jobs of the machine do not count
    source = Source(name=variant.fixture.name, data=variant.data, folder=variant.fixture.parent)
    try:
        calc = read_source(source)
    except ReadError as error:
        place = re.fullmatch(re.escape(variant.fixture.name) + r":\d+(?::.*)?", error.where)
        return None if place else f"the error names no line: {error}"
    except Exception as error:  # anything else is a traceback for the user
        return f"{type(error).__name__}: {error}"
    finally:
        took = time.process_time() - begin
    if took > MOST_SECONDS:
        return f"took {took:.1f} s"
    return _differs(variant, original, calc)


def _differs(variant: Variant, original: Calculation, calc: Calculation) -> str | None:
    if calc.energy_label != original.energy_label and calc.energy_hartree is not None:
        return f"the energy is {calc.energy_label}, not {original.energy_label}"
    changed = _changed_lines(variant)
    for name in NUMERIC:
        before, after = getattr(original, name), getattr(calc, name)
        if after is None or (name == "wavenumbers_cm" and _other_hessian(original, calc)):
            continue
        if before is None:
            return f"{name} came out of nowhere: {after}"
        now, then = (
            np.atleast_1d(np.asarray(after, float)),
            np.atleast_1d(np.asarray(before, float)),
        )
        if now.shape != then.shape:
            return f"{name} has shape {now.shape}, not {then.shape}"
        said = _numbers(changed)
        if not now.size:
            continue
        # wavenumbers are sorted, and some programs print them a second time with two decimals
        room = 0.006 if name == "wavenumbers_cm" else 0.0
        known = np.abs(now.ravel()[:, None] - then.ravel()[None, :]).min(axis=1) <= room
        for value in now.ravel()[(now != then).ravel() & ~known]:
            if not _is_said(float(value), said):
                return f"{name}: {value!r} is not what a damaged line says"
    for name in TEXTS:
        before, after = getattr(original, name), getattr(calc, name)
        if after in (None, before) or set(str(after).split()) <= set(str(before).split()):
            continue  # what is not printed any more is unknown
        if name == "program_version" and str(before).startswith(str(after)):
            continue
        if not _text_is_said(str(after), changed):
            return f"{name}: {after!r} instead of {before!r} is not what a damaged line says"
    return None


def _other_hessian(original: Calculation, calc: Calculation) -> bool:
    """Tell whether modes were worked out from numbers that a damaged line changed (and that are checked themselves)."""
    if calc.hessian_hartree_bohr2 is None or original.hessian_hartree_bohr2 is None:
        return False
    return not all(
        np.array_equal(getattr(original, name), getattr(calc, name))
        for name in ("hessian_hartree_bohr2", "positions_angstrom", "masses_u")
    )


def _changed_lines(variant: Variant) -> list[bytes]:
    old = set(variant.fixture.read_bytes().split(b"\n"))
    return [line for line in variant.data.replace(b"\r", b"").split(b"\n") if line not in old]


def _numbers(lines: list[bytes]) -> np.ndarray:
    found = []
    for line in lines:
        for match in NUMBER.finditer(line[:1_000_000]):
            text = match.group().lower().replace(b"d", b"e")
            found.append(float(text))
    return np.array(found)


def _is_said(value: float, said: np.ndarray) -> bool:
    if not len(said):
        return False
    room = 1e-6 * max(1.0, abs(value))
    return any(bool(np.any(np.abs(np.abs(said) * unit - abs(value)) <= room)) for unit in UNITS)


def _text_is_said(text: str, changed: list[bytes]) -> bool:
    words = [word for word in re.split(r"[^\w*()+-]+", text.lower()) if word]
    inside = re.search(r"\(([^()]{3,})\)$", text.lower())  # the name of a solvent
    words += [] if inside is None else [inside.group(1)]
    whole = b"\n".join(changed).decode("utf-8", "replace").lower()
    return any(word in whole for word in words) if changed else False
