"""``thermo-pp conformers``: populations of conformers and H, S and G of their ensemble."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from thermo_pp.cli.answers import hint, names, say, show
from thermo_pp.cli.options import (
    LEVEL,
    OUTPUTS,
    Collecting,
    Showing,
    Treating,
    collecting_options,
    energy_option,
    output_options,
    temperature_options,
    treatment_options,
)
from thermo_pp.names import DEFAULT_TEMPERATURE_K, DUPLICATES, THERMAL, Duplicates, Thermal

if TYPE_CHECKING:
    from thermo_pp.ensemble import Ensembles


@click.command(short_help="Populations of conformers and H, S and G of their ensemble.")
@click.argument("paths", nargs=-1, required=True, type=OUTPUTS)
@temperature_options
@treatment_options
@click.option(
    "--duplicates",
    type=click.Choice(DUPLICATES),
    help="How a conformer counts that is there twice.  [default: the study's, else count]",
)
@click.option(
    "--thermal",
    type=click.Choice(THERMAL),
    help="nearest: a calculation without frequencies takes the wavenumbers of the conformer nearest "
    "in shape; a study says this for each species.  [default: own]",
)
@click.option(
    "--missed",
    "missed_kj_mol",
    metavar="ENERGY",
    default="4 kJ/mol",
    show_default=True,
    callback=energy_option,
    help="Also say what a conformer that the set does not have would change, so far above the lowest "
    "G.",
)
@LEVEL
@collecting_options
@output_options
def conformers(
    paths: tuple[Path, ...],
    temperature_k: tuple[float, ...] | None,
    treating: Treating,
    duplicates: Duplicates | None,
    thermal: Thermal | None,
    missed_kj_mol: float,
    level: str | None,
    collecting: Collecting,
    showing: Showing,
) -> None:
    """Give populations and H, S, G and Cp of the conformers in PATHS: folders, files or one study.

    In folders, minima of the same bonds, charge, multiplicity and level of theory are conformers of
    each other; energies are those of the frequency jobs. A file of several structures (extended
    XYZ) named here is an ensemble of its own. Of a study (a TOML file, which needs no steps) every
    species with conformers is shown, with the energies that it names.

    \b
    Example:
        thermo-pp conformers outputs/ -T 298.15 -T 350
        thermo-pp conformers study.toml --format json
        thermo-pp conformers many.xyz --duplicates once --missed "6 kJ/mol"
    """
    from thermo_pp.output import conformers as output

    studies = [path for path in paths if path.suffix == ".toml"]
    if studies and (len(paths) > 1 or thermal is not None):
        raise click.UsageError("give one study alone; it says itself what --thermal would")
    if level is not None and not studies:
        raise click.UsageError("--level is for a study, which names levels of theory")
    found = (
        _of_study(studies[0], temperature_k, treating, duplicates, missed_kj_mol, level)
        if studies
        else _of_outputs(
            paths,
            temperature_k or (DEFAULT_TEMPERATURE_K,),
            treating,
            duplicates or "count",
            thermal or "own",
            missed_kj_mol,
            collecting,
            showing,
        )
    )
    unit = showing.energy_unit
    if not found.computed:
        say(showing, found.findings)
        hint(showing, "thermo-pp survey says what each file is")
        raise click.ClickException(f"no conformer in {names(paths)} can be computed")
    show(
        showing,
        found.findings,
        lambda: output.wide(found, unit) if showing.wide else output.tables(found, unit),
        lambda: output.keys(found),
    )


def _of_study(
    path: Path,
    temperature_k: tuple[float, ...] | None,
    treating: Treating,
    duplicates: Duplicates | None,
    missed_kj_mol: float,
    level: str | None,
) -> Ensembles:
    from thermo_pp.ensemble import results
    from thermo_pp.study.conformers import conformers_of

    own = treating.keys()
    if duplicates is not None:
        own["duplicates"] = duplicates
    study = conformers_of(path, temperatures=temperature_k, treatment=own, level=level)
    return results(
        study.ensembles,
        study.temperature_k,
        study.treatment,
        study.findings,
        duplicates=study.duplicates,
        missed_kj_mol=missed_kj_mol,
    )


def _of_outputs(
    paths: tuple[Path, ...],
    temperature_k: tuple[float, ...],
    treating: Treating,
    duplicates: Duplicates,
    thermal: Thermal,
    missed_kj_mol: float,
    collecting: Collecting,
    showing: Showing,
) -> Ensembles:
    from thermo_pp.ensemble import ensembles_in, results
    from thermo_pp.readers import several

    files = {str(path): found for path in paths if (found := several(path))}
    others = tuple(path for path in paths if str(path) not in files)
    collection = collecting.collect(others, showing) if others else None
    treatment = treating.treatment()
    ensembles, findings = ensembles_in(
        collection.calculations if collection else (),
        files,
        treatment,
        duplicates=duplicates,
        thermal=thermal,
    )
    return results(
        ensembles,
        temperature_k,
        treatment,
        (*(collection.findings if collection else ()), *findings),
        duplicates=duplicates,
        missed_kj_mol=missed_kj_mol,
    )
