"""Lines of a text that hold a fixed mark and fit a pattern: found by the mark, which is many times faster."""

from __future__ import annotations

import re

from thermo_pp.readers.text import Text


def matches(
    pattern: re.Pattern[bytes], mark: bytes, text: Text, start: int, end: int
) -> list[re.Match[bytes]]:
    """Return the lines between two offsets that hold `mark` and match from their beginning on."""
    found = []
    at = text.data.find(mark, start, end)
    while at >= 0:
        match = pattern.match(text.data, text.data.rfind(b"\n", 0, at) + 1, end)
        behind = at + len(mark)
        if match is not None:
            found.append(match)
            behind = max(behind, match.end())
        at = text.data.find(mark, behind, end)
    return found


def last_match(
    pattern: re.Pattern[bytes], mark: bytes, text: Text, start: int, end: int
) -> re.Match[bytes] | None:
    """Return the last of `matches`."""
    found = matches(pattern, mark, text, start, end)
    return found[-1] if found else None


def first_match(
    pattern: re.Pattern[bytes], mark: bytes, text: Text, start: int, end: int
) -> re.Match[bytes] | None:
    """Return the first of `matches`."""
    at = text.data.find(mark, start, end)
    while at >= 0:
        match = pattern.match(text.data, text.data.rfind(b"\n", 0, at) + 1, end)
        if match is not None:
            return match
        at = text.data.find(mark, at + len(mark), end)
    return None
