"""Collecting: from folders and files to one answer a file."""

from __future__ import annotations

import contextlib
import hashlib
import os
from collections.abc import Callable, Iterable, Iterator, Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import TYPE_CHECKING

from thermo_pp.collect.codec import CodecError, decode, encode
from thermo_pp.collect.outcome import Outcome, PerFile
from thermo_pp.collect.store import Store
from thermo_pp.collect.stream import Cache, Progress, opened_store, outcomes
from thermo_pp.collect.walk import Skipped, walk
from thermo_pp.collect.workers import one_thread
from thermo_pp.errors import Finding, ReadError
from thermo_pp.records import Calculation
from thermo_pp.rich import shown

__all__ = ["Cache", "Collection", "Outcome", "Paths", "PerFile", "Progress", "Skipped", "gather"]

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
TOGETHER = "all files together"
"""What its answer is remembered as."""


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
        return shown(self.table())


def gather(
    paths: Paths,
    per_file: PerFile,
    together: Together,
    *,
    progress: Progress | None = None,
    jobs: int | None = None,
    cache: Cache = True,
    scheduler: str | None = None,
) -> Collection:
    """Walk `paths`, call `per_file` for every file and `together` for all calculations.

    Parameters
    ----------
    paths : path or iterable of paths
        Folders and files.
    per_file : callable
        Reads one file and audits it alone.
    together : callable
        Calculations -> findings: what only shows side by side.
    progress : callable or None
        Called with the number of files done.
    jobs : int or None
        How many processes; all cores unless given.
    cache : bool or path
        Whether answers are remembered, or the folder where.
    scheduler : str or None
        Address of a Dask scheduler whose workers read the files.

    Raises
    ------
    StudyError
        A path that is not there, fewer than one process, a cluster that does not answer.
    """
    given = [paths] if isinstance(paths, (str, os.PathLike)) else list(paths)
    calculations: list[Calculation] = []
    findings: list[Finding] = []
    skipped: list[Skipped] = []
    failed: list[tuple[str, ReadError]] = []
    readers: dict[str, str] = {}
    with opened_store(cache) as store:
        content = hashlib.sha256()
        found = outcomes(
            walk(given),
            per_file,
            store,
            progress=progress,
            jobs=jobs,
            scheduler=scheduler,
            seen=content.update,
        )
        for outcome in found:
            findings += outcome.findings
            if outcome.reader is not None:
                readers[outcome.path] = outcome.reader
            if outcome.calculation is not None:
                calculations.append(outcome.calculation)
            elif outcome.error is not None:
                failed.append((outcome.path, outcome.error))
            else:
                skipped.append(Skipped(outcome.path, outcome.skipped or ""))
        findings += _side_by_side(tuple(calculations), together, store, content.hexdigest())
    if store is not None and store.trouble:
        findings.append(_not_remembered(store.trouble))
    return Collection(tuple(calculations), tuple(findings), tuple(skipped), tuple(failed), readers)


def _side_by_side(
    calculations: tuple[Calculation, ...], together: Together, store: Store | None, content: str
) -> tuple[Finding, ...]:
    """Return what `together` finds, remembered for the same outcomes of all files."""
    known = None if store is None else store.get(TOGETHER, content)
    if known is not None:
        with contextlib.suppress(CodecError):
            return decode(known)[0].findings
    with one_thread():
        found = together(calculations)
    if store is not None:
        store.put(TOGETHER, content, encode([Outcome(TOGETHER, findings=found)]))
    return found


def _not_remembered(trouble: str) -> Finding:
    return Finding(
        "not-remembered",
        "note",
        None,
        None,
        f"the answers are not remembered for the next run: {trouble}",
        "give the cache folder room and rights, or switch it off (--no-cache)",
    )
