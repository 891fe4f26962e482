"""``thermo-pp species``: H, S and G of each structure at the chosen temperatures."""

from __future__ import annotations

from pathlib import Path

import click

from thermo_pp.cli.answers import hint, names, say, show
from thermo_pp.cli.options import (
    OUTPUTS,
    Collecting,
    Showing,
    Treating,
    collecting_options,
    output_options,
    temperature_options,
    treatment_options,
)
from thermo_pp.names import DEFAULT_TEMPERATURE_K


@click.command(short_help="H, S and G of each structure.")
@click.argument("paths", nargs=-1, required=True, type=OUTPUTS)
@temperature_options
@treatment_options
@collecting_options
@output_options
def species(
    paths: tuple[Path, ...],
    temperature_k: tuple[float, ...] | None,
    treating: Treating,
    collecting: Collecting,
    showing: Showing,
) -> None:
    """Give H, S, G and Cp of every structure in PATHS (folders and files) that has frequencies.

    The temperature is 298.15 K unless given. A structure with exactly one imaginary mode is taken
    as a saddle point. The exit status is 1 where no structure can be computed.

    \b
    Example:
        thermo-pp species outputs/ -T 298.15 -T 350
        thermo-pp species water.out --temperature-range 280 360 5 --format csv
        thermo-pp species outputs/ --standard-state "1 mol/L" --low-modes rotor-enthalpy
    """
    from thermo_pp.audit.structures import structures
    from thermo_pp.output import species as output

    found = structures(
        collecting.collect(paths, showing),
        temperature_k or (DEFAULT_TEMPERATURE_K,),
        treating.treatment(),
    )
    unit = showing.energy_unit
    if not found.computed:
        say(showing, found.findings)
        hint(showing, "thermo-pp survey says what each file is")
        raise click.ClickException(f"no structure in {names(paths)} can be computed")
    show(
        showing,
        found.findings,
        lambda: output.wide(found, unit) if showing.wide else output.tables(found, unit),
        lambda: output.keys(found),
    )
