"""The audit: what is doubtful about the calculations of a folder."""

from __future__ import annotations

from functools import partial
from pathlib import Path

from thermo_pp.audit import limit
from thermo_pp.audit.duplicates import duplicate_findings
from thermo_pp.audit.levels import folder_level_findings
from thermo_pp.audit.limit import LONGEST_S
from thermo_pp.audit.modes import mode_findings
from thermo_pp.audit.printed import printed_findings
from thermo_pp.audit.state import state_findings
from thermo_pp.audit.symmetry import symmetry_findings
from thermo_pp.collect import Cache, Collection, Outcome, Paths, Progress, gather
from thermo_pp.errors import Finding, ReadError, StudyError
from thermo_pp.readers import claims, read_claimed
from thermo_pp.records import Calculation
from thermo_pp.sources import LeftOut, Looked, Oversize, Piece, pieces

__all__ = ["audit_alone", "audit_together", "collect", "read_and_audit", "read_and_audit_file"]

BINARY = "binary"
EMPTY = "empty"
UNCLAIMED = "no reader claims it"


def collect(
    paths: Paths,
    *,
    progress: Progress | None = None,
    jobs: int | None = None,
    cache: Cache = True,
    scheduler: str | None = None,
    time_limit: float | None = LONGEST_S,
) -> Collection:
    """Read and audit every output in folders and files, compressed ones and those in archives too.

    Parameters
    ----------
    paths : path or iterable of paths
        Folders and files.
    progress : callable or None
        Called with the number of files done.
    jobs : int or None
        How many processes read; all cores unless given.
    cache : bool or path
        Whether the answer of each file is remembered for the next time, in the user's cache folder
        or in this one.
    scheduler : str or None
        Address of a running Dask scheduler whose workers read the files (``tcp://host:8786``); needs
        the extra ``thermo-pp[cluster]`` and a file system that they share.
    time_limit : float or None
        Seconds after which an output is given up and listed as failed, not remembered; None for no
        limit. There is none on Windows and where a thread reads (workers of a cluster).

    Returns
    -------
    Collection
        Calculations, findings, what was left out and what failed. A file that cannot be read ends
        nothing. It does not depend on how many read, nor on what is remembered.

    Raises
    ------
    StudyError
        A path that is not there, fewer than one process, a cluster that does not answer, a time
        limit that is not above 0.
    """
    if time_limit is not None and not time_limit > 0.0:
        raise StudyError(
            f"a time limit of {time_limit} s", where="time_limit", mend="give one above 0, or none"
        )
    return gather(
        paths,
        partial(read_and_audit_file, most_s=time_limit),
        audit_together,
        progress=progress,
        jobs=jobs,
        cache=cache,
        scheduler=scheduler,
    )


def read_and_audit_file(
    path: Path, name: str, looked: Looked, *, most_s: float | None = LONGEST_S
) -> tuple[Outcome, ...]:
    """Read what a file holds, one output or the members of an archive, and audit each alone.

    An output that takes longer than `most_s` seconds is an error, and the answer is not remembered.
    """
    outcomes: list[Outcome] = []
    given_up = False
    try:
        for piece in pieces(path, name, looked):
            if isinstance(piece, LeftOut):
                outcomes.append(Outcome(piece.name, skipped=piece.reason))
            else:
                try:
                    with limit.time_limit(most_s):
                        outcomes.append(_outcome(piece))
                except limit.TookTooLong:
                    outcomes.append(_given_up(piece, most_s))
                    given_up = True
    except ReadError as error:  # the file cannot be opened, or the archive is damaged
        outcomes.append(Outcome(name, skipped=error.what))
    if given_up:
        looked.at_whole(None)
    return tuple(outcomes)


def read_and_audit(path: Path) -> Outcome:
    """Read one file that is no archive and audit it alone."""
    (outcome,) = read_and_audit_file(path, str(path), Looked())
    return outcome


def _outcome(piece: Piece) -> Outcome:
    """Return what one output gives."""
    readers = claims(piece.head)
    if not readers:
        return Outcome(piece.name, skipped=_reason(piece.head))
    reader = " and ".join(each.NAME for each in readers)
    try:
        source = piece.source()
        if source.head != piece.head:  # of UTF-16 the piece shows half as much text
            readers = claims(source.head)
        calculation = read_claimed(source, readers)
    except Oversize as error:
        return Outcome(piece.name, skipped=error.what)
    except ReadError as error:
        return Outcome(piece.name, reader=reader, error=error)
    findings = (*calculation.findings, *audit_alone(calculation))
    return Outcome(piece.name, reader=reader, calculation=calculation, findings=findings)


def _given_up(piece: Piece, most_s: float | None) -> Outcome:
    """Return that an output took too long."""
    reader = " and ".join(each.NAME for each in claims(piece.head))
    error = ReadError(
        f"reading it took too long, more than {most_s:g} s",
        where=f"{piece.name}:1",
        mend="look whether the file is damaged; else give more time (--time-limit), or leave it out",
    )
    return Outcome(piece.name, reader=reader, error=error)


def audit_alone(calculation: Calculation) -> tuple[Finding, ...]:
    """Return what is doubtful about one calculation, beside what its reader found."""
    return (
        *state_findings(calculation),
        *mode_findings(calculation),
        *symmetry_findings(calculation),
        *printed_findings(calculation),
    )


def audit_together(calculations: tuple[Calculation, ...]) -> tuple[Finding, ...]:
    """Return what is doubtful about calculations side by side."""
    return (*folder_level_findings(calculations), *duplicate_findings(calculations))


def _reason(head: bytes) -> str:
    """Return why no reader claims a file that begins so."""
    if not head:
        return EMPTY
    return BINARY if b"\0" in head else UNCLAIMED
