"""``thermo-pp sweep``: a study with other values of its keys, as one table."""

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


@click.command(short_help="A study over a list of values of any of its keys.")
@click.argument("study", type=STUDY)
@click.argument("values", nargs=-1)
@click.option("--over", "key", metavar="KEY", help="The key that takes VALUES: conditions.held.W.")
@click.option(
    "--values",
    "table",
    type=click.Path(exists=True, dir_okay=False, path_type=Path),
    help="Instead a CSV: keys in the first line, a set of values in each other one.",
)
@click.option(
    "--jobs",
    type=click.IntRange(min=1),
    metavar="N",
    help="How many processes.  [default: all cores, at most a fourth of the rows]",
)
@temperature_options
@treatment_options
@LEVEL
@output_options
def sweep(
    study: Path,
    values: tuple[str, ...],
    key: str | None,
    table: Path | None,
    jobs: int | None,
    temperature_k: tuple[float, ...] | None,
    treating: Treating,
    level: str | None,
    showing: Showing,
) -> None:
    """Work out the rates of STUDY (a TOML file) with each of VALUES in place of its own.

    Any key of the study file, with points between its parts: a concentration, an energy, a file;
    entries of lists count from 1. In species.*.KEY the star stands for every species that has the
    KEY, and {name} in a value for its name. A value that fails is a row with its error; the status
    is 1 where all fail, or with --strict any.

    \b
    Example:
        thermo-pp sweep study.toml --over conditions.held.W "1e-4 mol/L" "1e-3 mol/L"
        thermo-pp sweep study.toml --over species.TS1.energy ts_a.out ts_b.out -T 298.15
        thermo-pp sweep study.toml --over "species.*.frequencies" "H/{name}.out" "F/{name}.out"
        thermo-pp sweep study.toml --values values.csv --jobs 4 --format csv -o sweep.csv
    """
    from thermo_pp.output import sweep as output
    from thermo_pp.study.changes import parse_value
    from thermo_pp.study.load import Study
    from thermo_pp.study.sweep import read_values
    from thermo_pp.study.sweep import sweep as work

    if (table is None) == (key is None) or (table is not None) == bool(values):
        raise click.UsageError("give either --over KEY and VALUES, or --values FILE")
    loaded = Study.load(study, temperatures=temperature_k, treatment=treating.keys(), level=level)
    if table is not None:
        names, sets = read_values(table)
    else:
        names, sets = (str(key),), [(parse_value(text),) for text in values]
    result = work(loaded, names, sets, jobs=jobs)
    treatment, unit = loaded.treatment, showing.energy_unit
    people = not showing.wide and showing.format != "json"
    show(
        showing,
        loaded.findings,
        lambda: output.tables(result, treatment, unit, people=people),
        lambda: output.keys(result, treatment, loaded.findings),
    )
    failed = sum(row.error is not None for row in result.rows)
    if failed and (showing.strict or failed == len(result.rows)):
        raise click.ClickException(f"{failed} of {len(result.rows)} values failed")
