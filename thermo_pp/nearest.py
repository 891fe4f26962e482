"""The nearest known name: what a misspelt key, species or file was probably meant to be."""

from __future__ import annotations

from collections.abc import Iterable
from difflib import SequenceMatcher

MOST_LISTED = 24
"""How many known names a message lists."""
LEAST_LIKENESS = 0.5
"""Share of letters in common below which no name is near."""


def nearest(name: str, known: Iterable[str]) -> str | None:
    """Return the known name that `name` was probably meant to be, the first of equals; None where none is near.

    >>> nearest("frequencys", ["energy", "frequencies"])
    'frequencies'
    """
    best, likeness = None, LEAST_LIKENESS
    for other in known:
        ratio = SequenceMatcher(None, name.casefold(), other.casefold()).ratio()
        if ratio > likeness or (best is None and ratio == likeness):
            best, likeness = other, ratio
    return best


def suggestion(name: str, known: Iterable[str], kind: str) -> str:
    """Return the way out of a misspelt name: the nearest one, and all of them while they are few.

    >>> suggestion("W3", ["SO3", "W2"], "species")
    "did you mean 'W2'? known species: SO3, W2"
    """
    names = list(known)
    if not names:
        return f"there are no {kind} here"
    listed = ", ".join(names[:MOST_LISTED]) + (", ..." if len(names) > MOST_LISTED else "")
    close = nearest(name, names)
    return (
        f"known {kind}: {listed}"
        if close is None
        else f"did you mean {close!r}? known {kind}: {listed}"
    )
