"""Alike: members of an ensemble that are one structure, and those of which both hands are there."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from typing import NamedTuple

from thermo_pp.audit.duplicates import Shape, repeats
from thermo_pp.formulas.frames import atom_classes
from thermo_pp.species import SpeciesModel, Structure


class Alike(NamedTuple):
    """What one member repeats.

    Attributes
    ----------
    same_as : int or None
        The first member that is the same structure, the same hand of it where it is chiral.
    mirror_of : int or None
        The first member that is its mirror image and not itself.
    """

    same_as: int | None
    mirror_of: int | None


def alike(models: Sequence[SpeciesModel]) -> tuple[Alike, ...]:
    """Compare every structure with those before it; spin states are apart, declared members too.

    Parameters
    ----------
    models : sequence of SpeciesModel
        Members of one molecule.

    Returns
    -------
    tuple of Alike
        One a member. Of two mirror images each names the other.
    """
    by_spin: dict[int | None, list[int]] = defaultdict(list)
    for number, model in enumerate(models):
        if isinstance(model, Structure):
            by_spin[model.multiplicity].append(number)
    first: dict[tuple[int, bool], int] = {}  # root of a set, other hand than the root -> first one
    hand: dict[int, tuple[int, bool]] = {}
    for numbers in by_spin.values():
        found = repeats([_shape(models[number]) for number in numbers])
        for repeat in found:
            root = numbers[repeat.earlier]
            hand[numbers[repeat.later]] = (root, repeat.how == "mirror image")
            hand[root] = (root, False)
    for number in sorted(hand):
        first.setdefault(hand[number], number)
    answer = []
    for number in range(len(models)):
        root, turned = hand.get(number, (number, False))
        own = first.get((root, turned), number)
        answer.append(Alike(own if own != number else None, first.get((root, not turned))))
    return tuple(answer)


def _shape(model: SpeciesModel) -> Shape:
    assert isinstance(model, Structure)
    calc = model.calculation
    kinds = atom_classes(calc.numbers, model.masses_u)
    return Shape(kinds, calc.positions_angstrom, model.energy_hartree, calc.sha256)
