"""Outcome: what became of one file, and what the function that reads one offers."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Protocol

from thermo_pp.errors import Finding, ReadError
from thermo_pp.records import Calculation
from thermo_pp.sources import Looked


@dataclass(frozen=True)
class Outcome:
    """What became of one file: exactly one of `calculation`, `error` and `skipped` is there.

    Attributes
    ----------
    path : str
    reader : str or None
        The format whose reader claimed the file.
    calculation : Calculation or None
    error : ReadError or None
        Why a file that a reader claimed could not be read.
    skipped : str or None
        Why the file was left out.
    findings : tuple of Finding
        Of this file alone.
    """

    path: str
    reader: str | None = None
    calculation: Calculation | None = None
    error: ReadError | None = None
    skipped: str | None = None
    findings: tuple[Finding, ...] = ()


class PerFile(Protocol):
    """Reads one file and audits it alone; a function of a module's own level, so that other processes have it."""

    def __call__(self, path: Path, name: str, looked: Looked, /) -> Sequence[Outcome]:
        """Return one Outcome, or one for each member of an archive.

        Parameters
        ----------
        path : Path
            Where the file is.
        name : str
            How the user calls it.
        looked : Looked
            What is looked at is written down there.
        """
