"""Symmetry numbers and handedness, whatever the orientation, the order of atoms and a little noise.

Expected orders: order of the proper rotation subgroup of the point group the structure was built
from (`checks.md` 4); the pure groups are built as orbits of points in general position.
"""

from __future__ import annotations

import time

import numpy as np
import pytest
from ase.build import molecule
from hypothesis import given, settings
from hypothesis import strategies as st
from structures import built, masses, turn

from thermo_pp.formulas.symmetry import rotational_symmetry

X, Y, Z, XYZ = [1, 0, 0], [0, 1, 0], [0, 0, 1], [1, 1, 1]
GOLDEN = (1.0 + 5.0**0.5) / 2.0


def ase(name: str):
    atoms = molecule(name)
    return atoms.numbers, atoms.positions


def ethane(twist: float):
    ring = [turn(Z, 120.0 * k) @ [1.02, 0.0, 1.16] for k in range(3)]
    other = [turn(Z, twist + 120.0 * k) @ [1.02, 0.0, -1.16] for k in range(3)]
    positions = np.array([[0, 0, 0.765], [0, 0, -0.765], *ring, *other])
    return np.array([6, 6, 1, 1, 1, 1, 1, 1]), positions


def ferrocene(twist: float):
    rings = []
    for height, start in ((1.65, 0.0), (-1.65, twist)):
        for radius in (1.2, 2.28):
            rings += [turn(Z, start + 72.0 * k) @ [radius, 0.0, height] for k in range(5)]
    numbers = [26, *([6] * 5 + [1] * 5) * 2]
    return np.array(numbers), np.array([[0.0, 0.0, 0.0], *rings])


def line(symbols: list[int], places: list[float]):
    return np.array(symbols), np.outer(places, np.array([1.0, 2.0, -1.0]) / 6.0**0.5)


C60_ATOM = np.array([0.0, 1.0, 3.0 * GOLDEN]) * 0.7
I_GROUP = [turn([0.0, 1.0, GOLDEN], 72.0), turn(XYZ, 120.0)]
GENERAL, OTHER = [0.6, 1.1, 1.7], [2.1, 0.9, 0.5]
SNAIL = {"C": GENERAL, "F": OTHER, "Cl": [1.4, 2.4, 2.9]}

CASES = {  # structure, order, chiral
    "CH4": (ase("CH4"), 12, False),
    "ethane staggered": (ethane(60.0), 6, False),
    "ethane eclipsed": (ethane(0.0), 6, False),
    "ethane twisted": (ethane(25.0), 6, True),
    "SF6": (built({"S": [0, 0, 0], "F": [1.56, 0, 0]}, [turn(Z, 90), turn(X, 90)]), 24, False),
    "benzene": (ase("C6H6"), 12, False),
    "allene": (ase("C3H4_D2d"), 4, False),
    "ferrocene D5h": (ferrocene(0.0), 10, False),
    "ferrocene D5d": (ferrocene(36.0), 10, False),
    "ferrocene D5": (ferrocene(15.0), 10, True),
    "S4": (built(SNAIL, [turn(Z, 90, improper=True)]), 2, False),
    "S6": (built(SNAIL, [turn(Z, 60, improper=True)]), 3, False),
    "S8": (built(SNAIL, [turn(Z, 45, improper=True)]), 4, False),
    "T": (built({"C": GENERAL, "F": OTHER}, [turn(XYZ, 120), turn(Z, 180)]), 12, True),
    "Th": (
        built({"C": GENERAL, "F": OTHER}, [turn(XYZ, 120), turn(Z, 180), -np.eye(3)]),
        12,
        False,
    ),
    "O": (built({"C": GENERAL}, [turn(Z, 90), turn(XYZ, 120)]), 24, True),
    "I": (built({"C": np.multiply(GENERAL, 2.0)}, I_GROUP), 60, True),
    "C60 (Ih)": (built({"C": C60_ATOM}, I_GROUP), 60, False),
    "C60 of ASE": (ase("C60"), 60, False),
    "H2O2 (C2)": (ase("H2O2"), 2, True),
    "D2": (built(SNAIL, [turn(Z, 180), turn(X, 180)]), 4, True),
    "D3": (built(SNAIL, [turn(Z, 120), turn(X, 180)]), 6, True),
    "C3": (built(SNAIL, [turn(Z, 120)]), 3, True),
    "C1": ((np.array([6, 1, 9, 17, 35]), ase("CH4")[1]), 1, True),
    "Ci": (built(SNAIL, [-np.eye(3)]), 1, False),
    "Cs": ((np.array([6, 1, 1, 17, 35]), ase("CH4")[1]), 1, False),
    "water": (ase("H2O"), 2, False),
    "ammonia": (ase("NH3"), 3, False),
    "ethylene": (ase("C2H4"), 4, False),
    "trans-butane (C2h)": (ase("trans-butane"), 2, False),
    "cyclobutane (D2d)": (ase("cyclobutane"), 4, False),
    "CO2": (line([6, 8, 8], [0.0, 1.16, -1.16]), 2, False),
    "HCN": (line([1, 6, 7], [-1.06, 0.0, 1.15]), 1, False),
    "C2H2": (line([6, 6, 1, 1], [0.6, -0.6, 1.66, -1.66]), 2, False),
    "N2O": (line([7, 7, 8], [-1.13, 0.0, 1.19]), 1, False),
    "H H H saddle": (line([1, 1, 1], [0.93, 0.0, -0.93]), 2, False),
    "F H H saddle": (line([9, 1, 1], [-1.5, 0.0, 0.77]), 1, False),
    "F H F": (line([9, 1, 9], [-1.14, 0.0, 1.14]), 2, False),
    "H2": (line([1, 1], [0.37, -0.37]), 2, False),
    "argon": ((np.array([18]), np.zeros((1, 3))), 1, False),
}


def shaken(numbers, positions, weights, seed: int, noise: float = 0.005):
    """Turn, shift, reorder and shake: a Gaussian of `noise` A in each coordinate."""
    rng = np.random.default_rng(seed)
    q, _ = np.linalg.qr(rng.normal(size=(3, 3)))
    q *= np.sign(np.linalg.det(q))
    order = rng.permutation(len(numbers))
    moved = positions @ q.T + rng.normal(scale=5.0, size=3)
    moved = moved + rng.normal(scale=noise, size=moved.shape)
    return numbers[order], moved[order], weights[order]


@pytest.mark.parametrize("name", CASES)
@pytest.mark.parametrize("seed", range(4))
def test_order_and_hand(name: str, seed: int) -> None:
    (numbers, positions), order, chiral = CASES[name]
    moved = shaken(numbers, positions, masses(numbers), seed, 0.0 if seed == 0 else 0.005)
    found = rotational_symmetry(*moved)
    assert (found.order, found.chiral) == (order, chiral)
    assert found.holds_from_angstrom <= 2.0 * found.tolerance_angstrom
    assert found.linear == (len(numbers) > 1 and np.linalg.matrix_rank(positions, tol=0.1) == 1)


@settings(max_examples=25, deadline=None)
@given(
    name=st.sampled_from(["CH4", "S4", "H2O2 (C2)", "benzene", "ferrocene D5d", "SF6"]),
    seed=st.integers(min_value=100, max_value=10_000),
)
def test_any_orientation(name: str, seed: int) -> None:
    (numbers, positions), order, chiral = CASES[name]
    found = rotational_symmetry(*shaken(numbers, positions, masses(numbers), seed))
    assert (found.order, found.chiral) == (order, chiral)


HYDROGEN, DEUTERIUM, TRITIUM = 1.00782503223, 2.01410177812, 3.0160492779


@pytest.mark.parametrize(
    ("hydrogens", "order", "chiral"),
    [
        ([HYDROGEN] * 3 + [DEUTERIUM], 3, False),  # CH3D, C3v
        ([HYDROGEN] * 2 + [DEUTERIUM] * 2, 2, False),  # CH2D2, C2v
        ([HYDROGEN] + [DEUTERIUM] * 3, 3, False),
        ([HYDROGEN] * 2 + [DEUTERIUM, TRITIUM], 1, False),  # Cs
        ([DEUTERIUM] * 4, 12, False),
    ],
)
@pytest.mark.parametrize("seed", range(3))
def test_isotopes(hydrogens: list[float], order: int, chiral: bool, seed: int) -> None:
    numbers, positions = CASES["CH4"][0]
    carbon_first = np.concatenate([[12.0], hydrogens])
    found = rotational_symmetry(*shaken(numbers, positions, carbon_first, seed))
    assert (found.order, found.chiral) == (order, chiral)


def test_isotopes_of_a_linear_molecule() -> None:
    numbers, positions = CASES["CO2"][0]
    assert rotational_symmetry(numbers, positions, [12.0, 15.995, 17.999]).order == 1


def test_says_where_the_tolerance_decides() -> None:
    """A square of unequal arms: D2h (4) below, D4h (8) above a tolerance that is the difference."""
    arms = np.array([[1.0, 0, 0], [-1.0, 0, 0], [0, 1.08, 0], [0, -1.08, 0]])
    strict = rotational_symmetry([9] * 4, arms, [19.0] * 4, tolerance=0.05)
    assert strict.order == 4
    # a quarter turn carries an arm of 1.00 to one of 1.08
    assert strict.changes_at_angstrom == pytest.approx(0.08, abs=1e-9)
    loose = rotational_symmetry([9] * 4, arms, [19.0] * 4, tolerance=0.081)
    assert loose.order == 8
    assert loose.holds_from_angstrom == pytest.approx(0.08, abs=1e-9)
    assert loose.changes_at_angstrom is None


@pytest.mark.parametrize(("step", "order"), [(0.03, 16), (0.045, 2)])
def test_a_group_is_completed_or_not_begun(step: float, order: int) -> None:
    """An octagon whose radii grow by a step from atom to atom, half way round: an eighth of a turn
    misses by one step, half a turn by 2.3. Products may miss by twice the tolerance of 0.05 A;
    where they would miss by more the eighth (0.044 A) goes with them, and one axis stays."""
    radii = 1.9 + step * np.array([0.0, 1.0, 2.0, 3.0, 4.0, 3.0, 2.0, 1.0])
    ring = np.array([turn(Z, 45.0 * k) @ [radii[k], 0.0, 0.0] for k in range(8)])
    found = rotational_symmetry([6] * 8, ring, [12.0] * 8)
    assert found.order == order
    assert (found.holds_from_angstrom > 0.05) == (order == 16)


def test_says_where_the_hand_decides() -> None:
    """Hydrogen peroxide almost planar: each H lies 0.03 A from the plane, its image 0.06 A away."""
    flat = np.array([[0.7, 0, 0], [-0.7, 0, 0], [1.0, 0.95, 0.03], [-1.0, -0.95, 0.03]])
    found = rotational_symmetry([8, 8, 1, 1], flat, [16.0, 16.0, 1.0, 1.0], tolerance=0.02)
    assert found.chiral
    assert found.mirror_at_angstrom is not None
    assert 0.02 < found.mirror_at_angstrom < 0.06
    again = rotational_symmetry([8, 8, 1, 1], flat, [16.0, 16.0, 1.0, 1.0], tolerance=0.06)
    assert not again.chiral


def test_tolerance_must_be_positive() -> None:
    with pytest.raises(ValueError, match="tolerance must be above 0, got 0"):
        rotational_symmetry([1], [[0.0, 0.0, 0.0]], [1.0], tolerance=0.0)


def test_large_structures_are_quick() -> None:
    """No benchmark: a guard against a search that grows with a high power of the size."""
    rng = np.random.default_rng(3)
    numbers = rng.choice([1, 6, 8], 150)
    positions = rng.uniform(-6.0, 6.0, (150, 3))
    begin = time.process_time()
    found = rotational_symmetry(numbers, positions, masses(numbers))
    assert found.order == 1
    assert found.chiral
    assert time.process_time() - begin < 2.0
