"""Checks: the members of an ensemble are one molecule; what is doubtful about them."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence

import numpy as np

from thermo_pp.ensemble.hands import Counted
from thermo_pp.errors import Finding, StudyError
from thermo_pp.formulas.bonds import usual_fragments
from thermo_pp.species import SpeciesModel, Structure

MOST_NAMED = 6


def check_members(
    models: Sequence[SpeciesModel], *, name: str, spin_states: bool, where: str
) -> None:
    """Make sure that members have one formula, charge, kind and isotopes, and one multiplicity.

    Raises
    ------
    StudyError
        Names the two members that differ.
    """
    if not models:
        raise StudyError(
            f"{name} has no conformer", where=where, mend="name the outputs of one at least"
        )
    _alike(
        name,
        [(model, _formula(model)) for model in models],
        where,
        "conformers of one species have the same atoms",
    )
    _alike(
        name,
        [(model, f"of charge {model.charge}") for model in models],
        where,
        "conformers of one species have the same charge",
    )
    _alike(
        name,
        [(model, f"a {model.kind}") for model in models],
        where,
        "conformers of one species are all minima, or all saddle points",
    )
    structures = [model for model in models if isinstance(model, Structure)]
    _alike(
        name,
        [(model, f"of mass {round(_mass_u(model), 1)} u") for model in structures],
        where,
        "give all conformers the same isotopes",
    )
    if not spin_states:
        _alike(
            name,
            [
                (model, f"of multiplicity {model.multiplicity}")
                for model in structures
                if model.multiplicity is not None
            ],
            where,
            "write spin_states = true where the spin states are one species in equilibrium",
        )


def _alike(name: str, words: Sequence[tuple[SpeciesModel, str]], where: str, mend: str) -> None:
    """StudyError that names the first two members of which not the same is said."""
    for model, word in words[1:]:
        first, usual = words[0]
        if word != usual:
            raise StudyError(
                f"{name}: {_file(first)} is {usual}, but {_file(model)} is {word}",
                where=where,
                mend=mend,
            )


def _mass_u(structure: Structure) -> float:
    return float(np.max(structure.gas.mass_u))


def _formula(model: SpeciesModel) -> str:
    return "".join(f"{symbol}{count}" for symbol, count in sorted(model.composition.items()))


def _file(model: SpeciesModel) -> str:
    return model.files[0] if model.files else model.name


def member_findings(
    name: str, models: Sequence[SpeciesModel], count: Sequence[Counted]
) -> list[Finding]:
    """Return the findings about members that repeat each other, and about one hand or other bonds."""
    found = []
    for number, one in enumerate(count):
        model = models[number]
        if one.same_as is not None:
            left_out = one.degeneracy == 0
            found.append(
                Finding(
                    "duplicate-conformer",
                    "note" if left_out else "warning",
                    _file(model),
                    None,
                    f"{name}: the same structure as {_file(models[one.same_as])}, "
                    + ("left out" if left_out else "and counted beside it"),
                    "nothing; duplicates count once"
                    if left_out
                    else 'take it out, or write [treatment] duplicates = "once"',
                )
            )
        elif one.mirror_of is not None and one.mirror_of < number:
            found.append(
                Finding(
                    "both-hands",
                    "note",
                    _file(model),
                    None,
                    f"{name}: the mirror image of {_file(models[one.mirror_of])}: "
                    "each of the two counts for one hand",
                    "nothing; a chiral conformer without its mirror image counts for both",
                )
            )
    return found + _of_one_hand(name, models, count) + _of_bonds(name, models)


def _of_one_hand(
    name: str, models: Sequence[SpeciesModel], count: Sequence[Counted]
) -> list[Finding]:
    """Doubt that one hand is meant where an achiral conformer joins both."""
    structures = [model for model in models if isinstance(model, Structure)]
    achiral = [model for model in structures if not model.symmetry.chiral]
    alone = [
        model
        for model, one in zip(models, count, strict=True)
        if isinstance(model, Structure)
        and model.symmetry.chiral
        and model.treatment.enantiopure
        and one.mirror_of is None
    ]
    if not (achiral and alone):
        return []
    return [
        Finding(
            "one-hand-counted",
            "warning",
            _file(alone[0]),
            None,
            f"{name}: enantiopure counts one hand of {_file(alone[0])}, yet {_file(achiral[0])} is "
            "achiral: the two hands turn into each other",
            "take enantiopure out, or list both hands",
        )
    ]


def _of_bonds(name: str, models: Sequence[SpeciesModel]) -> list[Finding]:
    """Doubt that structures with other bonds are conformers; saddle points have no usual bonds."""
    minima = [model for model in models if isinstance(model, Structure) and model.kind == "minimum"]
    bonds = [
        usual_fragments(model.calculation.numbers, model.calculation.positions_angstrom)
        for model in minima
    ]
    usual = Counter(bonds).most_common(1)[0][0] if bonds else None
    others = [_file(model) for model, own in zip(minima, bonds, strict=True) if own != usual]
    if not others:
        return []
    more = f" and {len(others) - MOST_NAMED} more" if len(others) > MOST_NAMED else ""
    return [
        Finding(
            "conformers-differ-in-bonds",
            "warning",
            others[0],
            None,
            f"{name}: other bonds than the other conformers have: "
            f"{', '.join(others[:MOST_NAMED])}{more}",
            "check that these are one species: isomers that do not turn into each other are not",
        )
    ]
