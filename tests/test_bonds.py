"""Bonds and fragments: radii against ASE, graphs that must and must not be told apart."""

from __future__ import annotations

import ase.data
import numpy as np
import pytest

from thermo_pp.data.radii import COVALENT_ANGSTROM
from thermo_pp.formulas.bonds import (
    FACTORS,
    LABEL,
    USUAL_FACTOR,
    close_pairs,
    family,
    fragments,
    usual_fragments,
)

WATER = np.array([[0, 0, 0.117], [0, 0.757, -0.469], [0, -0.757, -0.469]])


def test_radii_are_those_of_the_source() -> None:
    assert len(COVALENT_ANGSTROM) == 97
    assert COVALENT_ANGSTROM[1:] == pytest.approx(ase.data.covalent_radii[1:97], abs=1e-9)


def test_water_and_two_waters() -> None:
    z = [8, 1, 1]
    assert [part.numbers for part in usual_fragments(z, WATER)] == [(1, 1, 8)]
    two = np.vstack([WATER, WATER + np.array([3.0, 0.0, 0.0])])
    assert usual_fragments(z * 2, two) == usual_fragments(z, WATER) * 2


def test_lengths_are_in_units_of_the_sum_of_radii() -> None:
    pairs, lengths = close_pairs([6, 6], [[0, 0, 0], [0, 0, 1.52]])
    assert pairs.tolist() == [[0, 1]]
    assert lengths == pytest.approx([1.52 / (0.76 + 0.76)], abs=1e-12)
    limit = FACTORS[1] * 1.52
    assert len(close_pairs([6, 6], [[0, 0, 0], [0, 0, limit + 1e-6]])[0]) == 0
    assert len(close_pairs([6, 6], [[0, 0, 0], [0, 0, limit - 1e-6]])[0]) == 1


def test_order_of_atoms_does_not_matter() -> None:
    rng = np.random.default_rng(7)
    bonds = np.array([[0, 1], [1, 2], [2, 3], [3, 0], [3, 4], [4, 5], [6, 7]])
    kinds = np.array([6, 6, 7, 6, 8, 1, 1, 1])
    want = fragments(kinds, bonds)
    for _ in range(20):
        order = rng.permutation(8)
        place = np.argsort(order)
        assert fragments(kinds[order], place[bonds]) == want


@pytest.mark.parametrize(
    ("one", "other"),
    [
        # a ring of six and two rings of three: every atom has two neighbours
        ([(0, 1), (1, 2), (2, 3), (3, 4), (4, 5), (5, 0)],
         [(0, 1), (1, 2), (2, 0), (3, 4), (4, 5), (5, 3)]),
        # decalin and two rings of five side by side: neighbours alone do not tell them apart
        ([(0, 1), (1, 2), (2, 3), (3, 4), (4, 5), (5, 0), (5, 6), (6, 7), (7, 8), (8, 9), (9, 0)],
         [(0, 1), (1, 2), (2, 3), (3, 4), (4, 0), (5, 6), (6, 7), (7, 8), (8, 9), (9, 5), (0, 5)]),
        # a chain and its branch
        ([(0, 1), (1, 2), (2, 3)], [(0, 1), (0, 2), (0, 3)]),
    ],
)  # fmt: skip
def test_other_graphs_of_the_same_atoms(
    one: list[tuple[int, int]], other: list[tuple[int, int]]
) -> None:
    n = 1 + max(max(pair) for pair in (*one, *other))
    assert fragments([6] * n, one) != fragments([6] * n, other)


def test_isotopes_are_kinds_of_their_own() -> None:
    bonds = [(0, 1), (0, 2)]
    plain, heavy = fragments([8, 1, 1], bonds), fragments([8, 1, 1 + LABEL], bonds)
    assert plain != heavy
    assert plain[0].numbers == heavy[0].numbers == (1, 1, 8)


def test_a_family_has_every_factor_of_the_window_once() -> None:
    x = np.array([[0, 0, 0], [0, 0, 1.3 * 1.52]])
    found = family([6, 6], x)
    assert {len(made) for made in found} == {1, 2}
    assert sum(reach.width for reach in found.values()) == pytest.approx(
        FACTORS[1] - FACTORS[0], abs=1e-12
    )
    apart = next(reach for made, reach in found.items() if len(made) == 2)
    bonded = next(reach for made, reach in found.items() if len(made) == 1)
    assert apart.off == 0.0
    assert bonded.off == pytest.approx(1.3 - USUAL_FACTOR, abs=1e-12)
    assert bonded.width == pytest.approx(FACTORS[1] - 1.3, abs=1e-12)


def test_an_atom() -> None:
    assert [part.numbers for part in usual_fragments([18], [[0, 0, 0]])] == [(18,)]
    assert len(family([18], [[0, 0, 0]])) == 1
