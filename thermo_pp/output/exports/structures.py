"""Structures: every computed structure of a study, conformers each by itself."""

from __future__ import annotations

import re
from collections.abc import Iterator

from thermo_pp.ensemble import Ensemble
from thermo_pp.species import SpeciesModel, Structure
from thermo_pp.study.answers import Answers

_ODD = re.compile(r"[^A-Za-z0-9]+")


def structures(answers: Answers) -> Iterator[tuple[str, int | None, Structure]]:
    """Yield name of the species, number of the conformer from 1 (None: no ensemble), structure."""
    for name, model in answers.study.species.items():
        if isinstance(model, Ensemble):
            for number, member in enumerate(model.members, start=1):
                yield from _one(name, number, member.model)
        else:
            yield from _one(name, None, model)


def _one(
    name: str, number: int | None, model: SpeciesModel
) -> Iterator[tuple[str, int | None, Structure]]:
    if isinstance(model, Structure):
        yield name, number, model


def file_stem(place: int, name: str, number: int | None) -> str:
    """Return a file name without ending that any system takes: ``"003-TS1"``, ``"004-C2-1"``.

    Parameters
    ----------
    place : int
        Number of the species, which keeps names apart that differ in odd characters only.
    name : str
    number : int or None
        Of the conformer.
    """
    plain = _ODD.sub("-", name).strip("-")[:60]
    parts = [f"{place:03}", plain, "" if number is None else str(number)]
    return "-".join(part for part in parts if part)
