"""``thermo-pp profile``: relative H, S and G of every state along the mechanism."""

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


@click.command(short_help="Relative H, S and G of every state along a mechanism.")
@click.argument("study", type=STUDY)
@temperature_options
@treatment_options
@LEVEL
@click.option("--reference", metavar="STATE", help="The state that the others are relative to.")
@click.option(
    "--at-conditions",
    is_flag=True,
    help="G at the concentrations held instead of at the standard state.",
)
@output_options
def profile(
    study: Path,
    temperature_k: tuple[float, ...] | None,
    treating: Treating,
    level: str | None,
    reference: str | None,
    at_conditions: bool,
    showing: Showing,
) -> None:
    """Give H, S and G of every state along the paths of STUDY (a TOML file), relative to one state.

    Temperatures and treatment are the study's unless given here. The reference is the first state
    of the first path unless given: --reference "SO3 + 2 W".

    \b
    Example:
        thermo-pp profile study.toml
        thermo-pp profile study.toml -T 298.15 --format markdown
        thermo-pp profile study.toml --level "MP2/aug-cc-pV(Q+d)Z"
        thermo-pp profile study.toml --reference "C1 + W" --at-conditions --energy-unit kcal/mol
    """
    from thermo_pp.output import energies
    from thermo_pp.output import profile as output
    from thermo_pp.study.load import Study

    loaded = Study.load(study, temperatures=temperature_k, treatment=treating.keys(), level=level)
    result = loaded.profile(reference=reference, at_conditions=at_conditions)
    findings = tuple(dict.fromkeys((*loaded.findings, *result.findings)))
    treatment, unit = loaded.treatment, showing.energy_unit
    show(
        showing,
        findings,
        lambda: (
            output.wide(result, treatment, unit, loaded.levels)
            if showing.wide
            else [
                *energies.tables(loaded.energies),
                *output.tables(result, treatment, unit, loaded.levels),
            ]
        ),
        lambda: output.keys(result, treatment, findings, loaded.energies),
    )
