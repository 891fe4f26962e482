"""Superposition of equal, reordered, mirrored and different structures."""

from __future__ import annotations

import math

import numpy as np
import pytest
from ase.build import molecule
from hypothesis import given, settings
from hypothesis import strategies as st
from structures import built, turn

from thermo_pp.formulas.superposition import best_superposition, match, superpose

NAMES = ["CH4", "C6H6", "H2O2", "CO2", "HCN", "H2", "trans-butane", "isobutane", "C2H6", "SiH4"]


def shaken(name: str, seed: int, noise: float):
    """Numbers and positions, turned, shifted, reordered and shaken; and the order used."""
    rng = np.random.default_rng(seed)
    atoms = molecule(name)
    order = rng.permutation(len(atoms))
    rotation = turn(rng.normal(size=3), rng.uniform(0.0, 360.0))
    positions = atoms.positions @ rotation.T + rng.normal(scale=4.0, size=3)
    positions = positions + rng.normal(scale=noise, size=positions.shape)
    return atoms.numbers, atoms.positions, atoms.numbers[order], positions[order]


def test_superpose_undoes_a_rotation() -> None:
    positions = molecule("CH3CH2OH").positions
    rotation = turn([1.0, -2.0, 0.5], 73.0)
    found = superpose(positions, positions @ rotation.T + [1.0, 2.0, 3.0])
    assert found.rmsd_angstrom == pytest.approx(0.0, abs=1e-12)
    assert found.rotation == pytest.approx(rotation, abs=1e-12)


def test_superpose_does_not_mirror() -> None:
    positions = molecule("H2O2").positions
    assert superpose(positions, positions * [1.0, 1.0, -1.0]).rmsd_angstrom > 0.3


def test_superpose_by_hand() -> None:
    """Two atoms 1.0 A apart on two 1.2 A apart: each misses by 0.1 A."""
    found = superpose([[0, 0, 0], [1, 0, 0]], [[5, 0, 0], [5, 1.2, 0]])
    assert found.rmsd_angstrom == pytest.approx(0.1, abs=1e-12)


@pytest.mark.parametrize("name", NAMES)
@settings(max_examples=6, deadline=None)
@given(seed=st.integers(min_value=0, max_value=10_000))
def test_match_finds_the_order(name: str, seed: int) -> None:
    """Noise of 0.01 A in each coordinate gives at most sqrt(3) 0.01 A and a statistical tail."""
    assert match(*shaken(name, seed, 0.01)) < 0.035
    assert match(*shaken(name, seed, 0.0)) == pytest.approx(0.0, abs=1e-7)


def test_match_of_a_cage() -> None:
    assert match(*shaken("C60", 5, 0.005)) < 0.015


def test_match_of_a_cage_without_principal_axes() -> None:
    """Sixty atoms in general position under the rotations of an icosahedron: all moments are equal,
    the mirror image is another molecule."""
    golden = (1.0 + 5.0**0.5) / 2.0
    generators = [turn([0.0, 1.0, golden], 72.0), turn([1, 1, 1], 120.0)]
    numbers, positions = built({"C": [1.2, 2.2, 3.4]}, generators)
    for seed in range(5):
        rng = np.random.default_rng(seed)
        order = rng.permutation(60)
        other = (positions @ turn(rng.normal(size=3), 77.0 * seed).T)[order]
        assert match(numbers, positions, numbers, other) == pytest.approx(0.0, abs=1e-6)
        assert match(numbers, positions, numbers, other, mirror=True) > 0.1


def test_mirror_images_are_told_apart() -> None:
    numbers, positions = molecule("H2O2").numbers, molecule("H2O2").positions
    image = positions * [1.0, 1.0, -1.0]
    assert match(numbers, positions, numbers, image) > 0.3
    assert match(numbers, positions, numbers, image, mirror=True) == pytest.approx(0.0, abs=1e-7)
    found = best_superposition(numbers, positions, numbers, image, mirror=True)
    assert found is not None
    assert np.linalg.det(found.rotation) == pytest.approx(-1.0, abs=1e-12)


def test_the_result_holds_what_it_says() -> None:
    numbers, positions, other_numbers, other = shaken("isobutane", 8, 0.02)
    found = best_superposition(numbers, positions, other_numbers, other)
    assert found is not None
    assert np.array_equal(numbers, other_numbers[found.partners])
    assert sorted(found.partners) == list(range(len(numbers)))
    laid = (positions - positions.mean(axis=0)) @ found.rotation.T
    missed = laid - (other - other.mean(axis=0))[found.partners]
    assert found.rmsd_angstrom == pytest.approx(
        math.sqrt((missed**2).sum() / len(numbers)), rel=1e-9
    )


def test_different_conformers_do_not_match() -> None:
    """Rotating one methyl of ethane from staggered to eclipsed moves three H by 1.1 A sin(30)..."""
    staggered = molecule("C2H6")
    eclipsed = staggered.positions.copy()
    top = np.flatnonzero(staggered.positions[:, 2] > 0.1)
    eclipsed[top] = eclipsed[top] @ turn([0, 0, 1], 60.0).T
    assert 0.2 < match(staggered.numbers, staggered.positions, staggered.numbers, eclipsed) < 0.6


def test_other_atoms_never_match() -> None:
    water, ammonia = molecule("H2O"), molecule("NH3")
    assert match(water.numbers, water.positions, ammonia.numbers, ammonia.positions) == math.inf
    assert match(water.numbers, water.positions, [16, 1, 1], water.positions) == math.inf


def test_shapes_must_agree() -> None:
    with pytest.raises(ValueError, match=r"cannot superpose shapes \(2, 3\) and \(3, 3\)"):
        superpose(np.zeros((2, 3)), np.zeros((3, 3)))
