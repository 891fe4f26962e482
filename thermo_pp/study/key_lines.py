"""Key lines: at which line of a study file each key stands, and every number that the file declares."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any

Key = tuple[str | int, ...]
"""``("species", "A", "enthalpy")``, ``("steps", 0, "rate")``; entries of a list count from 0."""

_PART = r"""(?:"(?:[^"\\]|\\.)*"|'[^']*'|[A-Za-z0-9_-]+)"""
_NAME = rf"{_PART}(?:\s*\.\s*{_PART})*"
_HEADER = re.compile(rf"\s*(\[\[?)\s*({_NAME})\s*\]\]?\s*(?:#.*)?")
_KEY = re.compile(rf"\s*({_NAME})\s*=")
_NUMBER = re.compile(r"\s*[+-]?(?:\d|\.\d)")


@dataclass(frozen=True)
class DeclaredNumber:
    """A number, or a quantity as a text, that the study file says.

    Attributes
    ----------
    key : Key
    value : int, float or str
        As it was written.
    line : int or None
        1-based line of the key.
    """

    key: Key
    value: int | float | str
    line: int | None

    @property
    def place(self) -> str:
        """The key as messages write it: ``"species.A.enthalpy"``, ``"steps.1.rate"``, from 1."""
        return ".".join(str(part + 1) if isinstance(part, int) else part for part in self.key)


def declared_numbers(text: str) -> tuple[DeclaredNumber, ...]:
    """Return every number of a study file, in the order of the file.

    Parameters
    ----------
    text : str
        Valid TOML.
    """
    lines = key_lines(text)
    return tuple(
        DeclaredNumber(key, value, _line(key, lines))
        for key, value in _leaves((), tomllib.loads(text))
        if _is_number(value)
    )


def key_lines(text: str) -> dict[Key, int]:
    """Return the 1-based line of every key and heading of a TOML text.

    Keys inside a value (an inline table, a list) have none of their own.
    """
    found: dict[Key, int] = {}
    table: Key = ()
    counts: dict[Key, int] = {}
    inside = _Inside()
    for number, line in enumerate(text.splitlines(), start=1):
        if inside.something:
            inside.read(line)
            continue
        if header := _HEADER.fullmatch(line):
            table = _indexed(_parts(header[2]), counts, counting=header[1] == "[[")
            found[table] = number
        elif key := _KEY.match(line):
            found[(*table, *_parts(key[1]))] = number
            inside.read(line[key.end() :])
    return found


class _Inside:
    """Whether a line begins inside a value that began before."""

    def __init__(self) -> None:
        self.depth = 0
        self.quote = ""

    @property
    def something(self) -> bool:
        return self.depth > 0 or bool(self.quote)

    def read(self, line: str) -> None:
        """Go through what belongs to a value."""
        at = 0
        while at < len(line):
            if self.quote:
                at = self._text(line, at)
                continue
            char = line[at]
            if char == "#":
                return
            if char in "\"'":
                self.quote = char * 3 if line.startswith(char * 3, at) else char
                at += len(self.quote)
                continue
            self.depth += (char in "[{") - (char in "]}")
            at += 1
        if len(self.quote) == 1:
            self.quote = ""

    def _text(self, line: str, at: int) -> int:
        """Return where a text that began goes on after a character or ends."""
        if line[at] == "\\" and self.quote[0] == '"':
            return at + 2
        if line.startswith(self.quote, at):
            at += len(self.quote)
            self.quote = ""
            return at
        return at + 1


def _parts(name: str) -> tuple[str, ...]:
    return tuple(
        tomllib.loads(f"x = {part}")["x"] if part[0] in "\"'" else part
        for part in re.findall(_PART, name)
    )


def _indexed(parts: tuple[str, ...], counts: dict[Key, int], *, counting: bool) -> Key:
    """Return a heading with the number of the entry that it stands for wherever there is a list."""
    found: Key = ()
    for place, part in enumerate(parts, start=1):
        found = (*found, part)
        if counting and place == len(parts):
            counts[found] = counts.get(found, -1) + 1
        if found in counts:
            found = (*found, counts[found])
    return found


def _leaves(key: Key, value: Any) -> Iterator[tuple[Key, Any]]:
    if isinstance(value, Mapping):
        for name, item in value.items():
            yield from _leaves((*key, name), item)
    elif isinstance(value, list):
        for number, item in enumerate(value):
            yield from _leaves((*key, number), item)
    else:
        yield key, value


def _is_number(value: Any) -> bool:
    if isinstance(value, bool):
        return False
    return isinstance(value, (int, float)) or (
        isinstance(value, str) and _NUMBER.match(value) is not None
    )


def _line(key: Key, lines: Mapping[Key, int]) -> int | None:
    """Return the line of a key, or of the value that it is inside of."""
    for end in range(len(key), 0, -1):
        if key[:end] in lines:
            return lines[key[:end]]
    return None
