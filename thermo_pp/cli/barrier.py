"""``thermo-pp barrier``: the effective rate and barrier, exact and approximate."""

from __future__ import annotations

from pathlib import Path

import click

from thermo_pp.cli.answers import show
from thermo_pp.cli.options import (
    LEVEL,
    STUDY,
    Showing,
    Treating,
    output_options,
    temperature_options,
    treatment_options,
)


@click.command(short_help="The effective rate and barrier, and what controls them.")
@click.argument("study", type=STUDY)
@temperature_options
@treatment_options
@LEVEL
@output_options
def barrier(
    study: Path,
    temperature_k: tuple[float, ...] | None,
    treating: Treating,
    level: str | None,
    showing: Showing,
) -> None:
    """Give the effective rate and barrier of STUDY (a TOML file), and what controls them.

    The rate per free reactant, per pool, of relaxation or of the catalytic cycle, whichever apply:
    exact, beside the usual approximations and where these hold. Temperatures and treatment are the
    study's unless given here.

    \b
    Example:
        thermo-pp barrier study.toml
        thermo-pp barrier study.toml --temperature-range 250 400 10 --format csv -o barrier.csv
        thermo-pp barrier study.toml --low-modes rotor-enthalpy --format json
    """
    from thermo_pp.output import barrier as output
    from thermo_pp.output import barrier_tables
    from thermo_pp.study.load import Study

    loaded = Study.load(study, temperatures=temperature_k, treatment=treating.keys(), level=level)
    result = loaded.effective()
    findings = tuple(dict.fromkeys((*loaded.findings, *result.findings)))
    treatment, unit = loaded.treatment, showing.energy_unit
    show(
        showing,
        findings,
        lambda: (
            output.wide(result, treatment, unit)
            if showing.format == "csv"
            else barrier_tables.tables(result, treatment, unit, loaded.levels)
        ),
        lambda: output.keys(result, treatment, findings),
    )
