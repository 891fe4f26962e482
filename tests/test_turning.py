"""Tops: dihedral angles, which atoms turn, and the reduced moment against Pitzer's formulas."""

from __future__ import annotations

import numpy as np
import pytest
from structures import masses

from thermo_pp.formulas.turning import dihedral, same_structure, top_of, turn, turned

FloatArray = np.ndarray


def methyl(centre: FloatArray, along: float, phase: float, tilt: float = 0.0) -> list[FloatArray]:
    """Three hydrogens of a methyl group on the z axis."""
    angle = np.radians(111.0)
    out = []
    for k in range(3):
        a = np.radians(phase + 120.0 * k)
        h = 1.09 * np.array([np.sin(angle) * np.cos(a), np.sin(angle) * np.sin(a), -np.cos(angle)])
        h[2] *= along
        h[0] += tilt * h[2]
        out.append(centre + h)
    return out


C = [np.zeros(3), np.array([0.0, 0.0, 1.53])]
ETHANE = np.array([*C, *methyl(C[0], -1.0, 0.0), *methyl(C[1], 1.0, 60.0)])
ETHANE_Z = np.array([6, 6, 1, 1, 1, 1, 1, 1])
PEROXIDE_Z = np.array([1, 8, 8, 1])


def peroxide(angle: float) -> FloatArray:
    a = np.radians(angle)
    return np.array([[0.93, 0, -0.24], [0, 0, 0], [0, 0, 1.45],
                     [0.93 * np.cos(a), 0.93 * np.sin(a), 1.69]])  # fmt: skip


def pitzer(m: FloatArray, x: FloatArray, top: FloatArray, axis: tuple[int, int]) -> float:
    """Pitzer, J. Chem. Phys. 1946, 14, 239, eq. for one top on a rigid frame (from memory)."""
    z = x[axis[1]] - x[axis[0]]
    z = z / np.linalg.norm(z)
    origin = x[axis[1]]
    rho = x[top] - origin
    off = (m[top] @ rho) / m[top].sum()
    off = off - (off @ z) * z
    e_x = off / np.linalg.norm(off) if np.linalg.norm(off) > 1e-9 else np.cross(z, [0.3, 0.5, 0.8])
    e_x = e_x / np.linalg.norm(e_x)
    e_y = np.cross(z, e_x)
    px, py, pz = rho @ e_x, rho @ e_y, rho @ z
    a, b, c = m[top] @ (px**2 + py**2), m[top] @ (px * pz), m[top] @ (py * pz)
    u = m[top] @ px
    centre = (m @ x) / m.sum()
    y = x - centre
    inertia = np.einsum(
        "n,nij->ij", m, (y**2).sum(1)[:, None, None] * np.eye(3) - y[:, :, None] * y[:, None]
    )
    principal, axes = np.linalg.eigh(inertia)
    if np.linalg.det(axes) < 0.0:
        axes = axes * np.array([1.0, 1.0, -1.0])
    cos = axes.T @ np.stack([e_x, e_y, z], axis=1)  # (i, xyz)
    r = axes.T @ (origin - centre)
    moment = a
    for i in range(3):
        before, after = (i - 1) % 3, (i + 1) % 3
        beta = cos[i, 2] * a - cos[i, 0] * b - cos[i, 1] * c
        beta += u * (cos[before, 1] * r[after] - cos[after, 1] * r[before])
        moment -= (cos[i, 1] * u) ** 2 / m.sum() + beta**2 / principal[i]
    return float(moment)


def test_the_sign_of_a_dihedral_angle() -> None:
    # IUPAC: looking along the middle bond, the far bond clockwise of the near one is positive
    assert dihedral([[1, 0, 0], [0, 0, 0], [0, 0, 1], [0, 1, 1]], [0, 1, 2, 3]) == pytest.approx(
        90.0
    )
    x = peroxide(-112.0)
    assert dihedral(x, [0, 1, 2, 3]) == pytest.approx(-112.0)
    assert dihedral(x, [3, 2, 1, 0]) == pytest.approx(-112.0)
    assert dihedral(
        turned(x, np.array([False, False, True, True]), (1, 2), 50.0), [0, 1, 2, 3]
    ) == (pytest.approx(-62.0))
    with pytest.raises(ValueError, match="lie on a line"):
        dihedral([[0, 0, -1], [0, 0, 0], [0, 0, 1], [0, 1, 1]], [0, 1, 2, 3])


def test_the_atoms_that_turn() -> None:
    assert np.flatnonzero(top_of(ETHANE_Z, ETHANE, [2, 0, 1, 5])).tolist() == [1, 5, 6, 7]
    assert np.flatnonzero(top_of(ETHANE_Z, ETHANE, [5, 1, 0, 2])).tolist() == [0, 2, 3, 4]
    with pytest.raises(ValueError, match=r"atoms 3 and 4 are not bonded \(1\.7\d Å apart\)"):
        top_of(ETHANE_Z, ETHANE, [2, 3, 1, 5])


def test_a_bond_of_a_ring() -> None:
    angle = np.radians(np.arange(6) * 60.0)
    ring = np.stack([1.4 * np.cos(angle), 1.4 * np.sin(angle), np.zeros(6)], axis=1)
    with pytest.raises(ValueError, match="the bond of atoms 2 and 3 is part of a ring"):
        top_of(np.full(6, 6), ring, [0, 1, 2, 3])


def test_two_equal_tops() -> None:
    # ethane: I_top/2 exactly, I_top = 3 m r^2
    m = masses(ETHANE_Z)
    radius = 1.09 * np.sin(np.radians(111.0))
    found = turn(m, ETHANE, top_of(ETHANE_Z, ETHANE, [2, 0, 1, 5]), (0, 1))
    assert found.moment_u_a2 == pytest.approx(1.5 * m[2] * radius**2, rel=1e-9)


def test_pitzer_s_symmetric_top() -> None:
    # 1-fluoroethane-like: a methyl group on a frame without symmetry
    z, x = ETHANE_Z.copy(), ETHANE.copy()
    z[2] = 9
    x[2] *= 1.3
    m = masses(z)
    top = top_of(z, x, [2, 0, 1, 5])
    i_top = 3.0 * m[5] * (1.09 * np.sin(np.radians(111.0))) ** 2
    y = x - (m @ x) / m.sum()
    inertia = np.einsum(
        "n,nij->ij", m, (y**2).sum(1)[:, None, None] * np.eye(3) - y[:, :, None] * y[:, None]
    )
    principal, axes = np.linalg.eigh(inertia)
    closed = i_top * (1.0 - i_top * float((axes[2] ** 2 / principal).sum()))  # the bond is z
    assert turn(m, x, top, (0, 1)).moment_u_a2 == pytest.approx(closed, rel=1e-9)
    assert pitzer(m, x, top, (0, 1)) == pytest.approx(closed, rel=1e-9)


@pytest.mark.parametrize("angle", [0.0, 35.0, 112.0, 180.0])
def test_pitzer_s_unsymmetrical_top(angle: float) -> None:
    for z in (PEROXIDE_Z, np.array([17, 8, 8, 1])):
        m, x = masses(z), peroxide(angle)
        top = np.array([False, False, True, True])
        found = turn(m, x, top, (1, 2)).moment_u_a2
        assert found == pytest.approx(pitzer(m, x, top, (1, 2)), rel=1e-9)
        # which side is called the top makes no difference
        assert found == pytest.approx(turn(m, x, ~top, (2, 1)).moment_u_a2, rel=1e-9)


def test_nothing_turns() -> None:
    x = np.array([[0.0, 0, 0], [0, 0, 1.2], [0, 0, 2.4], [0, 0.9, 2.9]])
    with pytest.raises(ValueError, match="nothing turns about this bond"):
        turn(np.full(4, 12.0), x, np.array([False, False, True, True]), (1, 2))


def test_the_same_structure_again() -> None:
    m = masses(ETHANE_Z)
    top = top_of(ETHANE_Z, ETHANE, [2, 0, 1, 5])
    for angle, same in ((120.0, True), (240.0, True), (60.0, False), (180.0, False)):
        x = turned(ETHANE, top, (0, 1), angle)
        assert same_structure(ETHANE_Z, m, x, ETHANE, [[2, 0, 1, 5]], False) is same
    m = masses(PEROXIDE_Z)
    x, top = peroxide(112.0), np.array([False, False, True, True])
    image = turned(x, top, (1, 2), -224.0)
    assert same_structure(PEROXIDE_Z, m, image, x, [[0, 1, 2, 3]], True)
    assert not same_structure(PEROXIDE_Z, m, image, x, [[0, 1, 2, 3]], False)
    # 60 degrees move two light atoms little after superposition; the dihedral angle tells
    assert not same_structure(PEROXIDE_Z, m, turned(x, top, (1, 2), 60.0), x, [[0, 1, 2, 3]], False)
