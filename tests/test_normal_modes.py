"""Normal modes of spring models, whose wavenumbers are known, and projection of overall motion."""

from __future__ import annotations

import numpy as np
import pytest
from ase.build import molecule
from structures import masses, turn

from thermo_pp.formulas.normal_modes import normal_modes
from thermo_pp.formulas.superposition import superpose
from thermo_pp.units import ATOMIC_MASS_KG, BOHR_M, HARTREE_J, LIGHT_M_S

# a force constant of k hartree/bohr^2 on a mass of m u: 1/(2 pi c) sqrt(k/m)
CM = np.sqrt(HARTREE_J / BOHR_M**2 / ATOMIC_MASS_KG) / (2 * np.pi * LIGHT_M_S * 100.0)


def springs(positions: np.ndarray, bonds: list[tuple[int, int, float]]) -> np.ndarray:
    """Hessian of springs at rest, hartree/bohr^2: invariant to translation and rotation."""
    n = len(positions)
    hessian = np.zeros((n, 3, n, 3))
    for i, j, k in bonds:
        e = positions[i] - positions[j]
        block = k * np.outer(e, e) / (e @ e)
        hessian[i, :, i, :] += block
        hessian[j, :, j, :] += block
        hessian[i, :, j, :] -= block
        hessian[j, :, i, :] -= block
    return hessian.reshape(3 * n, 3 * n)


def all_bonds(n: int, k: float = 0.2) -> list[tuple[int, int, float]]:
    return [(i, j, k * (1 + i + j) / (2 * n)) for i in range(n) for j in range(i)]


def overall(positions: np.ndarray, m: np.ndarray) -> np.ndarray:
    """Six mass-weighted vectors of translation and rotation about the centre of mass."""
    x = positions - (m @ positions) / m.sum()
    vectors = [np.tile(axis, (len(m), 1)) for axis in np.eye(3)]
    vectors += [np.cross(axis, x) for axis in np.eye(3)]
    return np.array([(v * np.sqrt(m)[:, None]).ravel() for v in vectors])


def test_diatomic() -> None:
    x = np.outer([0.0, 2.1], turn([1, 1, 0], 30)[0])
    found = normal_modes(springs(x, [(0, 1, 0.3)]), [12.0, 16.0], x)
    reduced = 12.0 * 16.0 / 28.0
    assert found.wavenumbers_cm == pytest.approx([CM * np.sqrt(0.3 / reduced)], rel=1e-12)
    assert found.modes.shape == (1, 2, 3)
    # momentum balances: 12 d1 + 16 d2 = 0
    assert 12.0 * found.modes[0, 0] + 16.0 * found.modes[0, 1] == pytest.approx(
        [0.0] * 3, abs=1e-12
    )
    assert (found.modes[0] ** 2).sum() == pytest.approx(1.0, abs=1e-12)


def test_constant() -> None:
    """1 hartree/bohr^2 on 1 u is 5140.4870 cm^-1: with CODATA 2022 sqrt(4.3597447222060e-18 J
    / (5.29177210544e-11 m)^2 / 1.66053906892e-27 kg)/(2 pi c), by hand."""
    x = np.array([[0.0, 0, 0], [1.0, 0, 0]])
    found = normal_modes(springs(x, [(0, 1, 1.0)]), [2.0, 2.0], x)
    assert found.wavenumbers_cm[0] == pytest.approx(5140.487, abs=0.001)


def test_linear_triatomic() -> None:
    """Herzberg II: symmetric stretch k/mO, antisymmetric k (1 + 2 mO/mC)/mO, and a bend twice."""
    x = np.outer([0.0, 1.16, -1.16], turn([1, 2, 3], 77)[1])
    k, bend = 0.9, 0.05
    hessian = springs(x, [(0, 1, k), (0, 2, k)])
    across = np.eye(3) - np.outer(x[1], x[1]) / (x[1] @ x[1])
    pattern = np.array([-2.0, 1.0, 1.0])  # displacement that bends
    hessian += bend * np.kron(np.outer(pattern, pattern), across)
    m = np.array([12.0, 16.0, 16.0])
    found = normal_modes(hessian, m, x)
    expected = [
        *[CM * np.sqrt(bend * (4.0 / 12.0 + 2.0 / 16.0))] * 2,
        CM * np.sqrt(k / 16.0),
        CM * np.sqrt(k * (1 + 2 * 16.0 / 12.0) / 16.0),
    ]
    assert found.wavenumbers_cm == pytest.approx(expected, rel=1e-10)


@pytest.mark.parametrize("name", ["H2O", "CH4", "CH3CHO"])
def test_plain_diagonalisation_agrees(name: str) -> None:
    """A Hessian without overall motion in it has six zeros and the same other eigenvalues."""
    atoms = molecule(name)
    m, x = masses(atoms.numbers), atoms.positions
    hessian = springs(x, all_bonds(len(m)))
    found = normal_modes(hessian, m, x)
    root = np.repeat(np.sqrt(m), 3)
    plain = np.linalg.eigvalsh(hessian / np.outer(root, root))
    assert plain[:6] == pytest.approx([0.0] * 6, abs=1e-12)
    assert found.wavenumbers_cm == pytest.approx(CM * np.sqrt(plain[6:]), rel=1e-9)
    assert (found.modes**2).sum(axis=(1, 2)) == pytest.approx([1.0] * len(plain[6:]), abs=1e-12)


def test_overall_motion_is_projected_out() -> None:
    """A residual that acts on translations and rotations only, as of a loose geometry, changes nothing."""
    atoms = molecule("CH3CHO")
    m, x = masses(atoms.numbers), atoms.positions
    hessian = springs(x, all_bonds(len(m)))
    clean = normal_modes(hessian, m, x)
    vectors = overall(x, m) * np.repeat(np.sqrt(m), 3)
    dirty = hessian + 1e-4 * vectors.T @ np.diag([1.0, -2.0, 3.0, -1.0, 2.0, 1.0]) @ vectors
    assert np.linalg.eigvalsh(dirty)[0] < -1e-4
    found = normal_modes(dirty, m, x)
    assert found.wavenumbers_cm == pytest.approx(clean.wavenumbers_cm, rel=1e-8)
    moved = found.modes.reshape(len(found.modes), -1) * np.sqrt(np.repeat(m, 3))
    assert moved @ overall(x, m).T == pytest.approx(np.zeros((len(moved), 6)), abs=1e-9)


def test_imaginary_and_soft_modes_stay() -> None:
    """Nothing is left out by its size: an imaginary mode and one of a few cm^-1 are both there."""
    atoms = molecule("H2O2")
    m, x = masses(atoms.numbers), atoms.positions
    hessian = springs(x, all_bonds(4))
    root = np.repeat(np.sqrt(m), 3)
    first = normal_modes(hessian, m, x)
    for k, wanted in ((0, -300.0), (1, 2.0)):
        vector = (first.modes[k].ravel() * root) / np.linalg.norm(first.modes[k].ravel() * root)
        change = np.sign(wanted) * wanted**2 - first.wavenumbers_cm[k] ** 2
        hessian = hessian + change / CM**2 * np.outer(vector * root, vector * root)
    found = normal_modes(hessian, m, x)
    assert found.wavenumbers_cm[:2] == pytest.approx([-300.0, 2.0], rel=1e-6)
    assert found.wavenumbers_cm[2:] == pytest.approx(first.wavenumbers_cm[2:], rel=1e-9)


def test_orientation_does_not_matter() -> None:
    atoms = molecule("CH4")
    m = masses(atoms.numbers)
    rotation = turn([2, 1, -1], 51.0)
    turned = atoms.positions @ rotation.T
    one = normal_modes(springs(atoms.positions, all_bonds(5)), m, atoms.positions)
    two = normal_modes(springs(turned, all_bonds(5)), m, turned + 3.0)
    assert two.wavenumbers_cm == pytest.approx(one.wavenumbers_cm, rel=1e-9)
    assert superpose(atoms.positions, turned).rmsd_angstrom < 1e-9


def test_isotope_ratio() -> None:
    """Teller-Redlich product rule for CH4 and CD4: the ratio of the products of all wavenumbers."""
    atoms = molecule("CH4")
    x = atoms.positions
    light, heavy = masses(atoms.numbers), np.array([12.0] + [2.01410177812] * 4)
    hessian = springs(x, all_bonds(5))
    one, two = (normal_modes(hessian, m, x).wavenumbers_cm for m in (light, heavy))
    inertia = (heavy[1] / light[1]) ** 1.5  # three moments, each to the power 1/2
    expected = (light[1] / heavy[1]) ** 6 * (heavy.sum() / light.sum()) ** 1.5 * inertia
    assert (two / one).prod() == pytest.approx(expected, rel=1e-9)


def test_atom() -> None:
    found = normal_modes(np.zeros((3, 3)), [39.948], np.zeros((1, 3)))
    assert found.wavenumbers_cm.shape == (0,)
    assert found.modes.shape == (0, 1, 3)


def test_refuses_what_makes_no_sense() -> None:
    with pytest.raises(ValueError, match=r"the Hessian has shape \(3, 3\), expected \(6, 6\)"):
        normal_modes(np.eye(3), [1.0, 1.0], np.eye(3)[:2])
    with pytest.raises(ValueError, match="the Hessian holds a number that is not finite"):
        normal_modes(np.full((6, 6), np.nan), [1.0, 1.0], np.eye(3)[:2])
