"""The audit: what is doubtful about the calculations of a folder."""

from __future__ import annotations

from pathlib import Path

from thermo_pp.audit.duplicates import duplicate_findings
from thermo_pp.audit.levels import folder_level_findings
from thermo_pp.audit.modes import mode_findings
from thermo_pp.audit.printed import printed_findings
from thermo_pp.audit.state import state_findings
from thermo_pp.audit.symmetry import symmetry_findings
from thermo_pp.collect import Collection, Outcome, Paths, Progress, gather
from thermo_pp.errors import Finding, ReadError
from thermo_pp.readers import claims, read_source
from thermo_pp.records import Calculation
from thermo_pp.sources import HEAD_BYTES, open_source

__all__ = ["audit_alone", "audit_together", "collect", "read_and_audit"]

BINARY = "binary"
EMPTY = "empty"
UNCLAIMED = "no reader claims it"


def collect(paths: Paths, *, progress: Progress | None = None) -> Collection:
    """Read and audit every output in folders and files.

    Parameters
    ----------
    paths : path or iterable of paths
        Folders and files.
    progress : callable or None
        Called with the number of files done.

    Returns
    -------
    Collection
        Calculations, findings, what was left out and what failed. A file that cannot be read ends
        nothing.

    Raises
    ------
    StudyError
        A path that is not there.
    """
    return gather(paths, read_and_audit, audit_together, progress)


def read_and_audit(path: Path) -> Outcome:
    """Read one file and audit it alone."""
    name = str(path)
    try:
        with path.open("rb") as file:
            head = file.read(HEAD_BYTES)
    except OSError as error:
        return Outcome(name, skipped=f"cannot be opened: {error.strerror or error}")
    readers = claims(head)
    if not readers:
        return Outcome(name, skipped=_reason(head))
    reader = " and ".join(each.NAME for each in readers)
    try:
        calculation = read_source(open_source(path))
    except ReadError as error:
        return Outcome(name, reader=reader, error=error)
    findings = (*calculation.findings, *audit_alone(calculation))
    return Outcome(name, reader=reader, calculation=calculation, findings=findings)


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
