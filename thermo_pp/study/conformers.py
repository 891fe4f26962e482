"""The species of a study that have conformers; the study needs no mechanism for them."""

from __future__ import annotations

import os
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Any

from thermo_pp.conditions import Treatment
from thermo_pp.ensemble import Ensemble
from thermo_pp.errors import Finding, StudyError
from thermo_pp.names import Duplicates
from thermo_pp.study.check import check_keys
from thermo_pp.study.crossings import crossing_points
from thermo_pp.study.energies import check_levels, known_level
from thermo_pp.study.members import make_species
from thermo_pp.study.reading import read_data
from thermo_pp.study.surroundings import make_temperatures
from thermo_pp.study.treatment import make_treatment
from thermo_pp.study.values import given


@dataclass(frozen=True, eq=False)
class StudyConformers:
    """What a study says of conformers.

    Attributes
    ----------
    temperature_k : tuple of float
    treatment : Treatment
    duplicates : {"count", "once"}
    ensembles : tuple of Ensemble
        In the order of the file.
    findings : tuple of Finding
    """

    temperature_k: tuple[float, ...]
    treatment: Treatment
    duplicates: Duplicates
    ensembles: tuple[Ensemble, ...]
    findings: tuple[Finding, ...]


def conformers_of(
    path: str | os.PathLike[str],
    *,
    temperatures: Iterable[Any] | None = None,
    treatment: Mapping[str, Any] | None = None,
    level: str | None = None,
) -> StudyConformers:
    """Read the species of a study file that have conformers.

    Parameters
    ----------
    path : str or PathLike
        The file may be without steps; with them, what they go through are saddle points.
    temperatures, treatment, level
        In place of the file's, as `Study.load` takes them.

    Raises
    ------
    StudyError
        No species with conformers, and whatever is wrong with the file or its species.
    ReadError
        An output that cannot be read as what it claims to be.
    """
    file = os.fspath(path)
    keys = check_keys(read_data(file, treatment), file)
    own = make_treatment(keys.treatment, file)
    kelvin = make_temperatures(keys.conditions, temperatures, file)
    saddles = {str(step.through) for step in keys.steps if given(step.through) is not None}
    check_levels(keys, file)
    if level is None:
        level = given(keys.level)
    else:
        known_level(keys, level, file)
    crossings = crossing_points(keys.steps, file)
    members = make_species(keys, own, saddles, file, crossings=crossings, level=level)
    ensembles = [model for model in members.species.values() if isinstance(model, Ensemble)]
    if not ensembles:
        raise StudyError(
            "no species of this study has conformers",
            where=file,
            mend='list them: [species.X] conformers = [{ frequencies = "..." }, ...]',
        )
    return StudyConformers(
        tuple(kelvin), own, keys.treatment.duplicates, tuple(ensembles), members.findings
    )
