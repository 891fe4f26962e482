"""``thermo-pp choices``: what each choice of treatment is worth."""

from __future__ import annotations

from pathlib import Path

import click

from thermo_pp.cli.answers import show
from thermo_pp.cli.options import (
    STUDY,
    Showing,
    Treating,
    output_options,
    temperature_options,
    treatment_options,
)


@click.command(short_help="What each choice of treatment changes in G, barriers and rate.")
@click.argument("study", type=STUDY)
@temperature_options
@treatment_options
@output_options
def choices(
    study: Path, temperature_k: tuple[float, ...] | None, treating: Treating, showing: Showing
) -> None:
    """Make every choice of STUDY (a TOML file) otherwise, one at a time, and give what changes.

    Soft modes and their onset, symmetry numbers, masses, rotor, scale factors and handedness; the
    change in G of every species, in every barrier, and in the effective rate where there is one.

    \b
    Example:
        thermo-pp choices study.toml
        thermo-pp choices study.toml -T 298.15 --format markdown
        thermo-pp choices study.toml --low-modes harmonic --format csv -o choices.csv
    """
    from thermo_pp.output import choices as output
    from thermo_pp.study.load import Study

    loaded = Study.load(study, temperatures=temperature_k, treatment=treating.keys())
    result = loaded.choices()
    findings = tuple(dict.fromkeys((*loaded.findings, *result.findings)))
    treatment, unit = loaded.treatment, showing.energy_unit
    show(
        showing,
        findings,
        lambda: (
            output.wide(result, treatment, unit)
            if showing.wide
            else output.tables(result, treatment, unit)
        ),
        lambda: output.keys(result, treatment, findings),
    )
