"""A JSON file whose values are taken by their path of keys, with the line of each in every error."""

from __future__ import annotations

import json
import math
import re
import reprlib
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import ReadError
from thermo_pp.readers.text import Text

FloatArray = NDArray[np.float64]

MOST_DIGITS = 30
"""A whole number with more digits is none that a calculation has."""

_TOKEN = re.compile(rb'"(?:[^"\\]|\\.)*"|[{}\[\]:]', re.DOTALL)


class _BadJson(ValueError):
    """What is wrong with the JSON text, and the text to look for where the place is asked for."""

    def __init__(self, what: str, mark: str) -> None:
        super().__init__(what)
        self.mark = mark


@dataclass(frozen=True)
class Document:
    """A decoded JSON object and its text.

    Attributes
    ----------
    text : Text
    root : dict
    mend : str
        How to mend a document that lacks something, for the errors.
    """

    text: Text
    root: dict[str, Any]
    mend: str

    @cached_property
    def _places(self) -> dict[tuple[str | None, ...], int]:
        """Offset of every key by its path; None stands for a list, so that no path asked for has it."""
        places: dict[tuple[str | None, ...], int] = {}
        path: list[str | None] = []
        string, at = b"", 0
        for token in _TOKEN.finditer(self.text.data):
            mark = token.group()
            if mark == b":":
                path[-1] = json.loads(string)
                places[tuple(path)] = at
            elif mark in b"{[":
                path.append("" if mark == b"{" else None)
            elif mark in b"}]":
                path.pop()
            else:
                string, at = mark, token.start()
        return places

    def at(self, *keys: str) -> int:
        """Return where the last key of the path `keys` stands, or the innermost one there is."""
        for depth in range(len(keys), 0, -1):
            if keys[:depth] in self._places:
                return self._places[keys[:depth]]
        return 0

    def line(self, *keys: str) -> int:
        """Return the 1-based line of the path `keys`."""
        return self.text.line_number(self.at(*keys))

    def get(self, *keys: str) -> Any:
        """Return the value at the path `keys`, None where a part of it is missing."""
        value: Any = self.root
        for key in keys:
            value = value.get(key) if isinstance(value, dict) else None
        return value

    def need(self, *keys: str) -> Any:
        """Return the value at the path `keys`; ReadError naming it where it is missing or null."""
        value = self.get(*keys)
        if value is None:
            raise self.error(keys, f"the key {'.'.join(keys)} is missing")
        return value

    def error(self, keys: tuple[str, ...], what: str, mend: str | None = None) -> ReadError:
        """Return the error `what` at the line of the path `keys`."""
        return self.text.error(self.at(*keys), what, mend=self.mend if mend is None else mend)

    def expected(self, keys: tuple[str, ...], value: Any, what: str) -> ReadError:
        """Return the error that `what` was expected instead of `value`."""
        return self.error(keys, f"{'.'.join(keys)} is {reprlib.repr(value)}, expected {what}")

    def number(self, *keys: str) -> float:
        """Return the number at the path `keys`; ReadError where it is missing or none."""
        value = self.need(*keys)
        if isinstance(value, bool) or not isinstance(value, int | float):
            raise self.expected(keys, value, "a number")
        return float(value)

    def whole(self, *keys: str) -> int | None:
        """Return the small whole number at the path `keys`, None where it is missing."""
        if self.get(*keys) is None:
            return None
        value = self.number(*keys)
        if abs(value) > 999.0 or value != round(value):
            raise self.expected(keys, value, "a small whole number")
        return round(value)

    def word(self, *keys: str) -> str:
        """Return the text at the path `keys`; ReadError where it is missing or none."""
        value = self.need(*keys)
        if not isinstance(value, str):
            raise self.expected(keys, value, "a text")
        return value

    def items(self, *keys: str) -> list[Any]:
        """Return the list at the path `keys`; ReadError where it is missing or none."""
        value = self.need(*keys)
        if not isinstance(value, list):
            raise self.expected(keys, value, "a list")
        return value

    def array(self, count: int, *keys: str) -> FloatArray:
        """Return the `count` numbers at the path `keys`, which may be nested lists."""
        numbers: list[float] = []
        open_lists = [iter(self.items(*keys))]
        while open_lists:
            for item in open_lists[-1]:
                if isinstance(item, list):
                    open_lists.append(iter(item))
                    break
                if isinstance(item, bool) or not isinstance(item, int | float):
                    raise self.expected(keys, [item], "a list of numbers")
                numbers.append(float(item))
            else:
                open_lists.pop()
        if len(numbers) != count:
            raise self.error(keys, f"{len(numbers)} numbers in {'.'.join(keys)}, expected {count}")
        return np.array(numbers)


def decode(text: Text, *, mend: str) -> Document:
    """Decode one JSON object; nothing but finite numbers, no key twice.

    Raises
    ------
    ReadError
        Anything else, at its line.
    """
    try:
        root = json.loads(
            text.data.decode("utf-8-sig"),
            parse_constant=_no_constant,
            parse_float=_finite,
            parse_int=_whole,
            object_pairs_hook=_no_key_twice,
        )
    except UnicodeDecodeError as error:
        raise text.error(error.start, "not a text in UTF-8", mend=mend) from None
    except json.JSONDecodeError as error:
        where = f"{text.source.name}:{error.lineno}"
        raise ReadError(f"broken JSON: {error.msg}", where=where, mend=mend) from None
    except _BadJson as error:
        raise text.error(max(text.last(error.mark.encode()), 0), str(error), mend=mend) from None
    except RecursionError:
        raise text.error(0, "JSON that is nested too deep", mend=mend) from None
    if not isinstance(root, dict):
        raise text.error(0, "the file holds no JSON object", mend=mend)
    return Document(text, root, mend)


def _no_constant(word: str) -> None:
    raise _BadJson(f"{word} is not a finite number", word)


def _finite(digits: str) -> float:
    number = float(digits)
    if not math.isfinite(number):
        raise _BadJson(f"{digits[:MOST_DIGITS]} is not a finite number", digits)
    return number


def _whole(digits: str) -> int:
    if len(digits) > MOST_DIGITS:
        raise _BadJson(f"{digits[:MOST_DIGITS]}... is too large a number", digits)
    return int(digits)


def _no_key_twice(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    values: dict[str, Any] = {}
    for key, value in pairs:
        if key in values:
            raise _BadJson(f"the key {key[:80]!r} stands twice in one object", json.dumps(key))
        values[key] = value
    return values
