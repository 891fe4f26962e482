"""Workers: the same function called for every file, answers in the order of the files.

The function and what it answers are handed in, so this module knows no format and no audit.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path

from thermo_pp.collect.walk import Skipped
from thermo_pp.errors import Finding, ReadError
from thermo_pp.records import Calculation


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


PerFile = Callable[[Path], Outcome]
Progress = Callable[[int], None]
"""Called after each file with the number of files done."""


def outcomes(
    entries: Iterable[Path | Skipped], per_file: PerFile, progress: Progress | None = None
) -> Iterator[Outcome]:
    """Yield an Outcome for every entry, in their order; `per_file` is called for the files.

    Parameters
    ----------
    entries : iterable of Path or Skipped
        What `walk` yields.
    per_file : callable
        A function of a module's own level, so that other processes can call it too.
    progress : callable or None
    """
    done = 0
    for entry in entries:
        if isinstance(entry, Skipped):
            yield Outcome(entry.path, skipped=entry.reason)
            continue
        yield per_file(entry)
        done += 1
        if progress is not None:
            progress(done)
