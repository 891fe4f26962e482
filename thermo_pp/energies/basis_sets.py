"""Basis sets: family and cardinal number of a correlation-consistent one, from its name."""

from __future__ import annotations

import re

_LETTERS = {"d": 2, "t": 3, "q": 4, "5": 5, "6": 6, "7": 7, "8": 8}
_NAME = re.compile(
    r"(?P<before>(?:[a-z]+-)*cc-p(?:wc|c)?v)(?:(?P<plain>[dtq5-8])|\((?P<tight>[dtq5-8])\+d\))"
    r"z(?P<after>(?:-[a-z0-9]+)*)"
)


def family_and_cardinal(basis: str | None) -> tuple[str, int] | None:
    """Return the family with X in place of the letter, and the number of that letter.

    None where the name is not that of a correlation-consistent set.

    >>> family_and_cardinal("aug-cc-pV(T+d)Z"), family_and_cardinal("def2-TZVP")
    (('aug-cc-pv(x+d)z', 3), None)
    """
    match = _NAME.fullmatch("" if basis is None else basis.strip().casefold())
    if match is None:
        return None
    letter = match["plain"] or match["tight"]
    middle = "x" if match["plain"] else "(x+d)"
    return f"{match['before']}{middle}z{match['after']}", _LETTERS[letter]
