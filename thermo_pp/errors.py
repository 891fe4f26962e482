"""What went wrong, where, and how to mend it: errors that stop work and findings that do not."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

from thermo_pp.names import SEVERITIES, Severity


class ThermoError(Exception):
    """An error of the user's data: what is wrong, where it stands, how to mend it.

    Parameters
    ----------
    what : str
        What is wrong, with the offending value.
    where : str
        File and line (``runs/ts1.out:1847``) or file and key (``study.toml [steps.3] through``).
    mend : str
        What the user can do about it.
    """

    def __init__(self, what: str, *, where: str, mend: str) -> None:
        super().__init__(f"{where}: {what}\n  mend: {mend}")
        self.what = what
        self.where = where
        self.mend = mend

    def __reduce__(self) -> tuple[Any, ...]:
        return _rebuild, (type(self), self.what, self.where, self.mend)


class ReadError(ThermoError):
    """A file that cannot be read as what it claims to be; no number of it is handed on."""


class StudyError(ThermoError):
    """A study file, an option or a declared value that cannot be used as it stands."""


def _rebuild(kind: type[ThermoError], what: str, where: str, mend: str) -> ThermoError:
    """Make the error again in another process."""
    return kind(what, where=where, mend=mend)


@dataclass(frozen=True)
class Finding:
    """A doubt that does not stop work.

    Attributes
    ----------
    code : str
        Short fixed name, words joined by hyphens; documented in ``docs/findings.md``.
    severity : str
        ``error``, ``warning`` or ``note``.
    file : str or None
        The file that it concerns.
    line : int or None
        1-based line in that file.
    what, mend : str
        What is doubtful, and what to do about it.
    """

    code: str
    severity: Severity
    file: str | None
    line: int | None
    what: str
    mend: str

    def __post_init__(self) -> None:
        if self.severity not in SEVERITIES:
            raise ValueError(f"severity {self.severity!r} is none of {', '.join(SEVERITIES)}")

    @property
    def where(self) -> str:
        """File and line as one text, empty where neither is known."""
        if self.file is None:
            return ""
        return self.file if self.line is None else f"{self.file}:{self.line}"

    def as_dict(self) -> dict[str, Any]:
        """Return the fields as a plain dictionary, for JSON."""
        return dict(vars(self))


def each_once(findings: Iterable[Finding]) -> tuple[Finding, ...]:
    """Return findings without those that say of one place what a later one says too."""
    kept: dict[object, Finding] = {}
    for finding in findings:
        place = (finding.code, finding.file, finding.line)
        kept[place if finding.line is not None else finding] = finding
    return tuple(kept.values())
