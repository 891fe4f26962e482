"""``thermo-pp report``: everything about a study in one folder, written whole or not at all."""

from __future__ import annotations

import os
import re
import sys
from collections.abc import Callable, Iterator
from contextlib import chdir, contextmanager
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from thermo_pp.cli.answers import end_if_strict, say
from thermo_pp.cli.options import (
    COLUMNS,
    DEVIATION,
    LEVEL,
    SADDLE_DEVIATION,
    STUDY,
    TIMES,
    Showing,
    Treating,
    temperature_options,
    treatment_options,
)
from thermo_pp.errors import ThermoError

if TYPE_CHECKING:
    from thermo_pp.errors import Finding

Progress = Callable[[int, int, str], None]


@click.command(short_help="Everything about a study in one folder: numbers, files, provenance.")
@click.argument("study", type=STUDY)
@click.option(
    "-o",
    "--output",
    "folder",
    required=True,
    type=click.Path(path_type=Path),
    help="The folder to write. An older report there is replaced, anything else is not.",
)
@click.option(
    "--measured",
    type=STUDY,
    help="Measured rate constants (a CSV file, as for compare) to set beside the computed ones.",
)
@DEVIATION
@SADDLE_DEVIATION
@TIMES
@temperature_options
@treatment_options
@LEVEL
@COLUMNS
@click.option("--strict", is_flag=True, help="Let findings of severity error end the run.")
@click.option("--quiet", is_flag=True, help="Write no findings and no progress to standard error.")
def report(
    study: Path,
    folder: Path,
    measured: Path | None,
    deviation: str | None,
    saddle_deviation: str | None,
    times: tuple[float, ...] | None,
    temperature_k: tuple[float, ...] | None,
    treating: Treating,
    level: str | None,
    columns: tuple[str, ...],
    strict: bool,
    quiet: bool,
) -> None:
    """Write everything about STUDY (a TOML file) into one folder.

    The folder appears whole or not at all, and the same input gives the same bytes. Paths in it are
    relative to the folder of the study. Temperatures and treatment are the study's unless given
    here.

    \b
    Example:
        thermo-pp report study.toml -o report
        thermo-pp report study.toml -o report --temperature-range 250 400 10
        thermo-pp report study.toml -o report --low-modes rotor-enthalpy --quiet
        thermo-pp report study.toml -o report --columns "State,G,H,S"
        thermo-pp report study.toml -o report --measured measured.csv --deviation "4 kJ/mol"
    """
    if measured is None and (deviation or saddle_deviation):
        raise click.UsageError("a deviation is for the comparison: give --measured too")
    from thermo_pp.output.folders import whole_folder
    from thermo_pp.output.manifest import check_report
    from thermo_pp.output.report import write_report
    from thermo_pp.study.load import Study
    from thermo_pp.study.run import Measured, answer

    showing = Showing("table", "kJ/mol", None, strict, quiet)
    beside = None
    if measured is not None:  # as the study would name it
        name = os.path.relpath(measured.resolve(), study.parent.resolve())
        beside = Measured(Path(Path(name).as_posix()), deviation, saddle_deviation)
    options = {
        "measured": None if beside is None else str(beside.file),
        "deviation": deviation,
        "saddle_deviation": saddle_deviation,
        "temperature_k": temperature_k,
        "treatment": treating.keys(),
        "level": level,
        "times_s": times,
        "columns": columns,
    }
    with whole_folder(folder, check_report) as part:
        with _progress(showing) as (computing, writing), _inside(study.parent):
            loaded = Study.load(
                study.name, temperatures=temperature_k, treatment=treating.keys(), level=level
            )
            answers = answer(loaded, times_s=times or (), measured=beside, progress=computing)
            write_report(answers, part, options, writing, columns=columns)
        findings = _from_here(answers.findings, study.parent)
        say(showing, findings, all_in="results.json")
        end_if_strict(showing, findings)


@contextmanager
def _inside(folder: Path) -> Iterator[None]:
    """Work in the study's folder, so that no path in the report depends on where it was asked for."""
    with chdir(folder):
        try:
            yield
        except ThermoError as error:
            where = str(folder / error.where) if _is_file(error.where) else error.where
            raise type(error)(error.what, where=where, mend=error.mend) from error


def _is_file(where: str) -> bool:
    """Whether a place of an error is in a file, here in the study's folder."""
    name = re.sub(r"(:\d+|!/.*)*$", "", where.split(" [")[0])
    return Path(name).exists()


def _from_here(findings: tuple[Finding, ...], folder: Path) -> tuple[Finding, ...]:
    """Return findings with the files as they are called where the command was given."""
    return tuple(
        finding if finding.file is None else replace(finding, file=str(folder / finding.file))
        for finding in findings
    )


@contextmanager
def _progress(showing: Showing) -> Iterator[tuple[Progress, Progress]]:
    """Give what is called while computing (most of the time) and while writing."""
    if showing.quiet or not sys.stderr.isatty():
        yield _silent, _silent
        return
    shown: dict[str, Any] = {"label": "report", "file": sys.stderr, "show_eta": False}
    with click.progressbar(length=100, item_show_func=str, **shown) as bar:

        def called(start: int, share: int) -> Progress:
            def update(done: int, of: int, what: str) -> None:
                bar.update(start + share * done // of - bar.pos, what)

            return update

        yield called(0, 80), called(80, 20)


def _silent(done: int, of: int, what: str) -> None:
    """Show nothing."""
