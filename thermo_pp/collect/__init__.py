"""Collecting: from folders and files to one answer a file."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Iterator, Mapping
from dataclasses import dataclass, field, replace
from types import MappingProxyType
from typing import TYPE_CHECKING

from thermo_pp.collect.walk import Skipped, walk
from thermo_pp.collect.workers import Outcome, PerFile, Progress, outcomes
from thermo_pp.errors import Finding, ReadError
from thermo_pp.records import Calculation

__all__ = ["Collection", "Outcome", "Paths", "Progress", "Skipped", "gather"]

if TYPE_CHECKING:
    import pandas as pd

COLUMNS = (
    "path", "program", "program_version", "method", "basis", "formula", "charge", "multiplicity",
    "energy_hartree", "imaginary_modes", "optimised", "ended_normally",
)  # fmt: skip
"""What the table of a collection has of each calculation."""
Paths = str | os.PathLike[str] | Iterable[str | os.PathLike[str]]
Together = Callable[[tuple[Calculation, ...]], tuple[Finding, ...]]
"""The audit of all calculations side by side."""


@dataclass(frozen=True, eq=False)
class Collection:
    """What folders and files hold.

    Attributes
    ----------
    calculations : tuple of Calculation
        In the order of the files; without Hessians, which are read again where they are needed.
    findings : tuple of Finding
        Of each file in turn, then of the calculations side by side.
    skipped : tuple of Skipped
        What was left out, with the reason.
    failed : tuple of (str, ReadError)
        Files that a reader claimed and could not read.
    readers : mapping of str to str
        Path -> format, of every file that a reader claimed.
    """

    calculations: tuple[Calculation, ...]
    findings: tuple[Finding, ...]
    skipped: tuple[Skipped, ...] = ()
    failed: tuple[tuple[str, ReadError], ...] = ()
    readers: Mapping[str, str] = field(default_factory=dict)

    def __post_init__(self) -> None:
        object.__setattr__(self, "readers", MappingProxyType(dict(self.readers)))

    def __len__(self) -> int:
        return len(self.calculations)

    def __iter__(self) -> Iterator[Calculation]:
        return iter(self.calculations)

    def __getitem__(self, index: int) -> Calculation:
        return self.calculations[index]

    def table(self) -> pd.DataFrame:
        """Return one row a calculation, as plain values."""
        import pandas as pd

        rows = [
            {name: getattr(calculation, name) for name in COLUMNS}
            for calculation in self.calculations
        ]
        return pd.DataFrame(rows, columns=list(COLUMNS))

    def _repr_html_(self) -> str:
        return str(self.table().to_html(index=False))


def gather(
    paths: Paths, per_file: PerFile, together: Together, progress: Progress | None = None
) -> Collection:
    """Walk `paths`, call `per_file` for every file and `together` for all calculations.

    Parameters
    ----------
    paths : path or iterable of paths
        Folders and files.
    per_file : callable
        Path -> Outcome: reads one file and audits it alone.
    together : callable
        Calculations -> findings: what only shows side by side.
    progress : callable or None
        Called with the number of files done.

    Raises
    ------
    StudyError
        A path that is not there.
    """
    given = [paths] if isinstance(paths, (str, os.PathLike)) else list(paths)
    calculations: list[Calculation] = []
    findings: list[Finding] = []
    skipped: list[Skipped] = []
    failed: list[tuple[str, ReadError]] = []
    readers: dict[str, str] = {}
    for outcome in outcomes(walk(given), per_file, progress):
        findings += outcome.findings
        if outcome.reader is not None:
            readers[outcome.path] = outcome.reader
        if outcome.calculation is not None:
            calculations.append(replace(outcome.calculation, hessian_hartree_bohr2=None))
        elif outcome.error is not None:
            failed.append((outcome.path, outcome.error))
        else:
            skipped.append(Skipped(outcome.path, outcome.skipped or ""))
    findings += together(tuple(calculations))
    return Collection(tuple(calculations), tuple(findings), tuple(skipped), tuple(failed), readers)
