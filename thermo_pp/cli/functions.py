"""``thermo-pp functions``: thermodynamic functions, polynomials, enthalpies of formation."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, NamedTuple

import click

from thermo_pp.cli.answers import names, say, show
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
from thermo_pp.names import DEFAULT_TEMPERATURE_K, POLYNOMIAL_FORMS, PolynomialForm

if TYPE_CHECKING:
    from thermo_pp.conditions import Treatment
    from thermo_pp.errors import Finding
    from thermo_pp.functions.formation import Formations
    from thermo_pp.species import SpeciesModel


@click.command(short_help="Thermodynamic functions, polynomials, enthalpies of formation.")
@click.argument("paths", nargs=-1, required=True, type=OUTPUTS)
@temperature_options
@treatment_options
@click.option("--fit", "form", type=click.Choice(POLYNOMIAL_FORMS), help="Fit polynomials.")
@click.option(
    "--fit-range",
    "bounds",
    nargs=3,
    type=float,
    metavar="LOW MIDDLE HIGH",
    help="Temperatures of the two ranges of a fit, K.  [default: 200 1000 3000]",
)
@click.option(
    "--cantera",
    "cantera",
    type=click.Path(dir_okay=False, path_type=Path),
    metavar="FILE",
    help="Write the minima to this file too, as a phase for Cantera (nasa7 unless --fit is given).",
)
@collecting_options
@output_options
def functions(
    paths: tuple[Path, ...],
    temperature_k: tuple[float, ...] | None,
    treating: Treating,
    form: PolynomialForm | None,
    bounds: tuple[float, float, float] | None,
    cantera: Path | None,
    collecting: Collecting,
    showing: Showing,
) -> None:
    """Give H(T)-H(0), H(T)-H(298.15 K), S, Cp and G of every structure in PATHS.

    PATHS are folders and files with outputs, or one study file (TOML), whose species are taken,
    declared ones too; with its [formation], enthalpies of formation are derived. Temperatures are
    the study's, else 298.15 K, unless given.

    \b
    Example:
        thermo-pp functions outputs/ --temperature-range 300 1000 100
        thermo-pp functions water.out --fit nasa7 --fit-range 200 1000 3000
        thermo-pp functions study.toml --cantera gas.yaml
    """
    from thermo_pp.functions.curves import functions as curves_of
    from thermo_pp.functions.fits import DEFAULT_BOUNDS_K, fit
    from thermo_pp.output import functions as output

    if bounds is not None and form is None and cantera is None:
        raise click.UsageError("--fit-range needs --fit or --cantera")
    range_k = bounds or DEFAULT_BOUNDS_K
    asked = _members(paths, temperature_k, treating, collecting, showing)
    models = asked.models.values()
    curves = [curves_of(model, asked.temperature_k) for model in models]
    fits = (
        [] if form is None else [fit(model, form, range_k, where="--fit-range") for model in models]
    )
    findings = list(asked.findings)
    findings += [finding for curve in curves for finding in curve.findings]
    findings += [finding for one in fits for finding in one.findings]
    if cantera is not None:
        findings += _write_phase(cantera, asked, form or "nasa7", range_k)
    told = tuple(dict.fromkeys(findings))
    make = output.wide if showing.wide else output.tables
    formation, treatment = asked.formation, asked.treatment
    show(
        showing,
        told,
        lambda: make(curves, fits, formation, treatment, showing.energy_unit),
        lambda: output.keys(curves, fits, formation, treatment, told),
    )


class _Asked(NamedTuple):
    """The species of a study or of outputs, and what belongs to them."""

    title: str
    models: Mapping[str, SpeciesModel]
    temperature_k: tuple[float, ...]
    treatment: Treatment
    formation: Formations | None
    findings: tuple[Finding, ...]


def _members(
    paths: tuple[Path, ...],
    temperature_k: tuple[float, ...] | None,
    treating: Treating,
    collecting: Collecting,
    showing: Showing,
) -> _Asked:
    """Load the study, or collect the outputs."""
    if any(path.suffix == ".toml" for path in paths):
        if len(paths) > 1:
            raise click.UsageError("give one study file, or outputs")
        from thermo_pp.study.load import Study

        study = Study.load(paths[0], temperatures=temperature_k, treatment=treating.keys())
        formation = study.formation()
        return _Asked(
            study.title,
            study.species,
            study.conditions.temperature_k,
            study.treatment,
            formation,
            (*study.findings, *(() if formation is None else formation.findings)),
        )
    from thermo_pp.audit.structures import structures

    t = temperature_k or (DEFAULT_TEMPERATURE_K,)
    found = structures(collecting.collect(paths, showing), t, treating.treatment())
    if not found.computed:
        say(showing, found.findings)
        raise click.ClickException(f"no structure in {names(paths)} can be computed")
    models: dict[str, SpeciesModel] = {one.name: one.model for one in found.computed}
    title = paths[0].resolve().stem
    return _Asked(title, models, t, found.treatment, None, found.findings)


def _write_phase(
    target: Path,
    asked: _Asked,
    form: PolynomialForm,
    bounds_k: tuple[float, float, float],
) -> tuple[Finding, ...]:
    """Write the minima as a phase; return what is doubtful about it."""
    from thermo_pp.functions.phase import gas_phase
    from thermo_pp.output.cantera_phase import cantera_text
    from thermo_pp.output.files import write_file

    phase = gas_phase(
        asked.models,
        form,
        bounds_k,
        title=asked.title,
        phase=asked.treatment.phase,
        formation_kj_mol=None if asked.formation is None else asked.formation.room_kj_mol,
        where="--cantera",
    )
    write_file(target, cantera_text(phase))
    return phase.findings
