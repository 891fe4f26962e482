"""``thermo-pp survey``: what each output is, and every finding of the audit."""

from __future__ import annotations

from pathlib import Path

import click

from thermo_pp.cli.answers import hint, names, show
from thermo_pp.cli.options import (
    OUTPUTS,
    Collecting,
    Showing,
    collecting_options,
    output_options,
)


@click.command(short_help="What each output is, and every finding of the audit.")
@click.argument("paths", nargs=-1, required=True, type=OUTPUTS)
@collecting_options
@output_options
def survey(paths: tuple[Path, ...], collecting: Collecting, showing: Showing) -> None:
    """Say of every file in PATHS (folders and files) what it is and what is doubtful about it.

    Compressed files and the members of archives are read as they stand. What is found of a file is
    remembered and used again while the file is the same.

    The table has a row a file; findings go to standard error. The exit status is 1 where no file
    could be read, and with --strict where there is a finding of severity error.

    \b
    Example:
        thermo-pp survey outputs/
        thermo-pp survey outputs/ --format json -o survey.json
    """
    from thermo_pp.audit.survey import survey as make_survey
    from thermo_pp.output import survey as output

    result = make_survey(collecting.collect(paths, showing))
    show(
        showing,
        result.findings,
        lambda: output.wide(result) if showing.wide else output.tables(result),
        lambda: output.keys(result),
        always=True,
    )
    if not result.readable:
        hint(
            showing,
            "an output is told by its content, not by its name; docs/readers.md lists the formats",
        )
        raise click.ClickException(f"no file in {names(paths)} could be read")
