"""Hands: how often each member of an ensemble counts, handedness and duplicates counted once."""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

from thermo_pp.ensemble.alike import alike
from thermo_pp.names import Duplicates
from thermo_pp.species import SpeciesModel, Structure


class Counted(NamedTuple):
    """How often a member counts, and why; the fields of `model.Member` of these names."""

    degeneracy: int
    same_as: int | None
    mirror_of: int | None


def counted(
    models: Sequence[SpeciesModel], declared: Sequence[int | None] | None, duplicates: Duplicates
) -> tuple[Counted, ...]:
    """Return how often each member counts.

    A chiral structure counts twice unless its mirror image is a member too, or its own numbers do
    not count both hands (enantiopure, or both in its torsion already). A declared degeneracy
    stands as it is. A duplicate counts like the first unless duplicates count once.

    Parameters
    ----------
    models : sequence of SpeciesModel
    declared : sequence of int or None, or None
    duplicates : {"count", "once"}
    """
    answer = []
    given = declared or [None] * len(models)
    for model, own, found in zip(models, given, alike(models), strict=True):
        hands = model.degeneracy if isinstance(model, Structure) else 1
        g = hands if found.mirror_of is None else 1
        if own is not None:
            g = own
        if duplicates == "once" and found.same_as is not None:
            g = 0
        answer.append(Counted(g, found.same_as, found.mirror_of))
    return tuple(answer)
