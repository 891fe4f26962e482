"""The survey: what every file of some folders is, in one row a file."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

from thermo_pp.audit.levels import level_words
from thermo_pp.collect import Collection, Skipped
from thermo_pp.errors import Finding, ReadError
from thermo_pp.names import SEVERITIES, Severity
from thermo_pp.records import Calculation

Verdict = Literal["ok"] | Severity


@dataclass(frozen=True)
class SurveyedFile:
    """One file that a reader claimed; what was not read is None.

    Attributes
    ----------
    path, reader : str
    program, program_version, method, basis, formula : str or None
    charge, multiplicity : int or None
    energy_hartree : float or None
    modes, imaginary_modes : int or None
        How many.
    lowest_mode_cm : float or None
        The lowest wavenumber; negative where imaginary.
    optimised : bool or None
    ended_normally : bool or None
    verdict : str
        The worst severity among its findings, or "ok"; "error" where it could not be read.
    level : str or None
        The whole level of theory in words.
    """

    path: str
    reader: str
    program: str | None
    program_version: str | None
    method: str | None
    basis: str | None
    formula: str | None
    charge: int | None
    multiplicity: int | None
    energy_hartree: float | None
    modes: int | None
    imaginary_modes: int | None
    lowest_mode_cm: float | None
    optimised: bool | None
    ended_normally: bool | None
    verdict: Verdict
    level: str | None = None


@dataclass(frozen=True, eq=False)
class Survey:
    """What some folders and files hold.

    Attributes
    ----------
    files : tuple of SurveyedFile
        In the order of the paths.
    skipped : tuple of Skipped
    findings : tuple of Finding
        Files that could not be read among them, as ``unreadable``.
    """

    files: tuple[SurveyedFile, ...]
    skipped: tuple[Skipped, ...]
    findings: tuple[Finding, ...]

    @property
    def readable(self) -> int:
        """How many files were read."""
        return sum(file.program is not None for file in self.files)


def survey(collection: Collection) -> Survey:
    """Return one row a file of a collection."""
    unreadable = tuple(_unreadable(path, error) for path, error in collection.failed)
    findings = (*unreadable, *collection.findings)
    by_file: dict[str, list[Finding]] = defaultdict(list)
    for finding in findings:
        if finding.file is not None:
            by_file[finding.file].append(finding)
    read = {calculation.path: calculation for calculation in collection.calculations}
    rows = []
    for path, reader in collection.readers.items():
        calculation = read.get(path)
        verdict = worst(by_file[path])
        rows.append(
            _failed(path, reader)
            if calculation is None
            else _read(calculation, path, reader, verdict)
        )
    return Survey(tuple(rows), collection.skipped, findings)


def worst(findings: Sequence[Finding]) -> Verdict:
    """Return the worst severity, or "ok"."""
    ranks = [SEVERITIES.index(finding.severity) for finding in findings]
    return SEVERITIES[max(ranks)] if ranks else "ok"


def _read(calculation: Calculation, path: str, reader: str, verdict: Verdict) -> SurveyedFile:
    wavenumbers = calculation.wavenumbers_cm
    lowest = None if wavenumbers is None or not len(wavenumbers) else float(wavenumbers[0])
    return SurveyedFile(
        path=path,
        reader=reader,
        program=calculation.program,
        program_version=calculation.program_version,
        method=calculation.method,
        basis=calculation.basis,
        formula=calculation.formula,
        charge=calculation.charge,
        multiplicity=calculation.multiplicity,
        energy_hartree=calculation.energy_hartree,
        modes=None if wavenumbers is None else len(wavenumbers),
        imaginary_modes=calculation.imaginary_modes,
        lowest_mode_cm=lowest,
        optimised=calculation.optimised,
        ended_normally=calculation.ended_normally,
        verdict=verdict,
        level=level_words(calculation),
    )


def _failed(path: str, reader: str) -> SurveyedFile:
    return SurveyedFile(path, reader, *(None,) * 13, verdict="error")


def _unreadable(path: str, error: ReadError) -> Finding:
    place, _, line = error.where.rpartition(":")
    known = place == path and line.isdigit()
    number = int(line) if known else None
    return Finding("unreadable", "error", path, number, error.what, error.mend)
