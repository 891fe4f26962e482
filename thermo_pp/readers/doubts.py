"""Findings of a reader on their way: with a byte offset, whose line is counted together with all others."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import NamedTuple

from thermo_pp.errors import Finding
from thermo_pp.names import Severity


class Doubt(NamedTuple):
    """A finding whose line is not counted yet: code, severity, offset, what, mend."""

    code: str
    severity: Severity
    at: int
    what: str
    mend: str


def doubt_places(doubts: Sequence[Doubt]) -> dict[str, int]:
    """Return a name of its own for each doubt, and its offset, to count the lines of."""
    return {f"doubt {i}": doubt.at for i, doubt in enumerate(doubts)}


def as_findings(
    doubts: Sequence[Doubt], name: str, lines: Mapping[str, int]
) -> tuple[Finding, ...]:
    """Return the findings of the file `name`; `lines` has the line of each of `doubt_places`."""
    return tuple(
        Finding(doubt.code, doubt.severity, name, lines[f"doubt {i}"], doubt.what, doubt.mend)
        for i, doubt in enumerate(doubts)
    )
