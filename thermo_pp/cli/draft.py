"""``thermo-pp draft``: a first study file from what a folder holds."""

from __future__ import annotations

from pathlib import Path

import click

from thermo_pp.cli.answers import hint, show_text
from thermo_pp.cli.options import Collecting, Showing, collecting_options

FOLDER = click.Path(exists=True, file_okay=False, path_type=Path)


@click.command(short_help="A first study file from what a folder holds.")
@click.argument("folder", type=FOLDER)
@collecting_options
@click.option(
    "-o",
    "--output",
    "path",
    type=click.Path(dir_okay=False, path_type=Path),
    help="Write the study to this file instead of standard output.",
)
@click.option("--force", is_flag=True, help="Write over a file that is there.")
@click.option("--strict", is_flag=True, help="Let findings of severity error end the run.")
@click.option("--quiet", is_flag=True, help="Write no findings and hints to standard error.")
def draft(
    folder: Path, collecting: Collecting, path: Path | None, force: bool, strict: bool, quiet: bool
) -> None:
    """Write a first study file from the outputs in FOLDER.

    Frequency jobs are grouped with the single points at their geometry, conformers with each
    other; each saddle point is followed along its imaginary mode to the minima on either side. The
    file loads as it is; what was guessed is marked GUESS in its comments.

    \b
    Example:
        thermo-pp draft outputs/
        thermo-pp draft outputs/ -o study.toml
    """
    from thermo_pp.study.draft import draft as make_draft

    if path is not None and path.exists() and not force:
        raise click.ClickException(
            f"{path}: the file is there already\n  mend: choose another name, or give --force"
        )
    beside = Path() if path is None else path.parent
    showing = Showing("table", "kJ/mol", path, strict, quiet)
    result = make_draft(collecting.collect([folder], showing), folder, beside=beside)
    show_text(showing, result.findings, lambda: result.text)
    if path is not None:
        hint(showing, f"thermo-pp barrier {path} computes it; look at every GUESS in it first")
