"""``thermo-pp compare``: computed against measured rate constants."""

from __future__ import annotations

from pathlib import Path

import click

from thermo_pp.cli.answers import show
from thermo_pp.cli.options import (
    DEVIATION,
    LEVEL,
    SADDLE_DEVIATION,
    STUDY,
    Showing,
    Treating,
    output_options,
    temperature_options,
    treatment_options,
)


@click.command(short_help="Computed against measured rate constants, and rival mechanisms.")
@click.argument("study", type=STUDY)
@click.argument("measured", type=STUDY)
@DEVIATION
@SADDLE_DEVIATION
@click.option(
    "--rival",
    "rivals",
    type=STUDY,
    multiple=True,
    help="Another study file, ranked with STUDY by the likelihood of the measurements. Repeatable.",
)
@temperature_options
@treatment_options
@LEVEL
@output_options
def compare(
    study: Path,
    measured: Path,
    deviation: str | None,
    saddle_deviation: str | None,
    rivals: tuple[Path, ...],
    temperature_k: tuple[float, ...] | None,
    treating: Treating,
    level: str | None,
    showing: Showing,
) -> None:
    """Set the rates of STUDY (a TOML file) against MEASURED rate constants (a CSV file).

    Fits of the measured points, the computed curve beside them on the same definition and at the
    measured amounts, the shifts of energies that bring the two together, and rival studies ranked.

    \b
    Example:
        thermo-pp compare study.toml measured.csv
        thermo-pp compare study.toml measured.csv --deviation "4 kJ/mol" --saddle-deviation "8 kJ/mol"
        thermo-pp compare study.toml measured.csv --deviation "4 kJ/mol" --rival other.toml --format json
    """
    from thermo_pp.output import compare as output
    from thermo_pp.study.load import Study

    options = {"temperatures": temperature_k, "treatment": treating.keys()}
    loaded = Study.load(study, level=level, **options)  # type: ignore[arg-type]
    others = [Study.load(path, **options) for path in rivals]  # type: ignore[arg-type]
    result = loaded.compare(
        measured, deviation=deviation, saddle_deviation=saddle_deviation, rivals=others
    )
    treatment, unit = loaded.treatment, showing.energy_unit
    show(
        showing,
        result.findings,
        lambda: (
            output.wide(result, treatment, unit)
            if showing.wide
            else output.tables(result, treatment, unit, loaded.levels)
        ),
        lambda: output.keys(result, treatment),
    )
