"""Labels: which isotopes are put into which species of a study, from ``[isotopologues]``."""

from __future__ import annotations

from collections.abc import Mapping

from thermo_pp.errors import StudyError
from thermo_pp.isotopes import Isotopologues, isotopologues
from thermo_pp.nearest import suggestion
from thermo_pp.species import SpeciesModel, Structure
from thermo_pp.study.check import place
from thermo_pp.study.keys import IsotopologueKeys

Labels = Mapping[str, Mapping[str, str]]
"""Species -> atom number or element -> isotope."""


def make_labels(
    keys: Mapping[str, IsotopologueKeys], species: Mapping[str, SpeciesModel], file: str
) -> dict[str, Labels]:
    """Turn ``[isotopologues.NAME]`` into the isotopes of every species; ``all`` goes where it fits.

    Raises
    ------
    StudyError
        A species that is not there, or nothing to put isotopes into.
    """
    found: dict[str, Labels] = {}
    for label, entry in keys.items():
        where = place(file, "isotopologues", label)
        for name in entry.species:
            if name not in species:
                raise StudyError(
                    f"unknown species {name!r}",
                    where=f"{where} species.{name}",
                    mend=suggestion(name, species, "species"),
                )
        isotopes: dict[str, Mapping[str, str]] = {}
        for name, model in species.items():
            general = {key: value for key, value in entry.all.items() if key in model.composition}
            own = {**general, **entry.species.get(name, {})}
            if own:
                isotopes[name] = own
        if not isotopes:
            raise StudyError(
                f"no species has isotopes put in by {label!r}",
                where=where,
                mend='write all = { H = "D" }, or species.W = { 2 = "D" } for single atoms',
            )
        found[label] = isotopes
    return found


def labelled(
    label: str, labels: Labels, species: Mapping[str, SpeciesModel], file: str
) -> dict[str, Isotopologues]:
    """Put the isotopes of one label into the species.

    Raises
    ------
    StudyError
        A species without a Hessian or without an output, or an isotope that does not fit.
    """
    made = {}
    where = place(file, "isotopologues", label)
    for name, isotopes in labels.items():
        model = species[name]
        at = f"{where} species.{name}"
        if not isinstance(model, Structure):
            raise StudyError(
                f"{name} is no single structure with a Hessian, so isotopes cannot be put into it",
                where=at,
                mend="name the output of a frequency job for it, or leave it out of the isotopes",
            )
        made[name] = isotopologues(model, isotopes, where=at)
    return made
