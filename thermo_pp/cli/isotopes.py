"""``thermo-pp isotopes``: equilibrium and kinetic isotope effects."""

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


@click.command(short_help="Equilibrium and kinetic isotope effects.")
@click.argument("study", type=STUDY)
@temperature_options
@treatment_options
@output_options
def isotopes(
    study: Path,
    temperature_k: tuple[float, ...] | None,
    treating: Treating,
    showing: Showing,
) -> None:
    """Give the isotope effects of STUDY (a TOML file) for every set in its [isotopologues].

    Light over heavy: of each step and of the whole effective rate, per free reactant (a
    competition) and per pool (runs side by side), with tunnelling where the study asks for it, and
    the product rule as an audit of every Hessian.

    \b
    Example:
        thermo-pp isotopes study.toml
        thermo-pp isotopes study.toml --low-modes harmonic --temperature-range 250 350 25
        thermo-pp isotopes study.toml --format json -o isotopes.json
    """
    from thermo_pp.output import isotopes as output
    from thermo_pp.study.load import Study

    loaded = Study.load(study, temperatures=temperature_k, treatment=treating.keys())
    effects = loaded.isotope_effects()
    found = [finding for one in effects for finding in one.findings]
    findings = tuple(dict.fromkeys((*loaded.findings, *found)))
    treatment, unit = loaded.treatment, showing.energy_unit
    show(
        showing,
        findings,
        lambda: (
            output.wide(effects, unit)
            if showing.wide
            else output.tables(effects, treatment, unit, loaded.levels)
        ),
        lambda: output.keys(effects, treatment, findings),
    )
