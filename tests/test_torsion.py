"""Hindered rotors: levels, sums over them and their limits, fits of scans."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.special import mathieu_a, mathieu_b

from thermo_pp.formulas.torsion import (
    HinderedRotor,
    Potential,
    fit,
    levels,
    torsion,
    widest_gap,
)
from thermo_pp.formulas.vibration import oscillator
from thermo_pp.units import (
    ATOMIC_MASS_KG,
    BOLTZMANN_J_K,
    GAS_J_MOL_K,
    KELVIN_PER_CM,
    PLANCK_J_S,
    WAVENUMBER_KJ_MOL,
)

J_PER_CM = 1000.0 * WAVENUMBER_KJ_MOL
T = np.array([50.0, 298.15, 1000.0, 3000.0])


def threefold(barrier_j_mol: float) -> Potential:
    """V = (V3/2)(1 + cos 3 phi), as in ethane."""
    half = 0.5 * barrier_j_mol
    return Potential((half, 0.0, 0.0, half), (0.0,) * 4)


ETHANE = HinderedRotor(threefold(12250.0), 1.566, 3)
SKEW = HinderedRotor(Potential((0.0, 3000.0, -2000.0, 9000.0), (0.0, 800.0, 0.0, -500.0)), 2.4, 1)


@pytest.mark.parametrize("sigma", [1, 3])
def test_without_a_barrier_it_is_the_free_rotor(sigma: int) -> None:
    # q = (8 pi^3 I k T)^(1/2)/(sigma h); the sum over levels agrees exponentially well
    share = torsion(T, HinderedRotor(Potential((0.0,), (0.0,)), 3.0, sigma))
    moment = 3.0e-20 * ATOMIC_MASS_KG
    q = np.sqrt(8.0 * np.pi**3 * moment * BOLTZMANN_J_K * T) / (sigma * PLANCK_J_S)
    assert share.entropy_j_mol_k == pytest.approx(GAS_J_MOL_K * (np.log(q) + 0.5), abs=1e-6)
    assert share.heat_capacity_j_mol_k == pytest.approx(np.full(4, GAS_J_MOL_K / 2), abs=1e-6)
    assert share.zero_point_j_mol == pytest.approx(0.0, abs=1e-9)


def test_between_high_barriers_it_is_the_oscillator() -> None:
    # the three wells divided by the symmetry number 3; what is left of S is R/(4u), u = V3/(2RT),
    # the next term of the classical exp(-u) I0(u)
    for barrier in (2.0e5, 8.0e5):
        rotor = HinderedRotor(threefold(barrier), 500.0, 3)
        nu = rotor.harmonic_cm()
        assert nu == pytest.approx(3.0 * np.sqrt(rotor.constant_cm * barrier / J_PER_CM), rel=1e-9)
        t = np.array([300.0])
        share, harmonic = torsion(t, rotor), oscillator(t, np.array(nu))
        left = GAS_J_MOL_K**2 * 300.0 / (2.0 * barrier)
        assert share.entropy_j_mol_k[0] - harmonic[1][0] == pytest.approx(left, rel=0.1)
        assert share.zero_point_j_mol == pytest.approx(
            0.5 * GAS_J_MOL_K * KELVIN_PER_CM * nu, rel=1e-3
        )
        assert share.enthalpy_j_mol == pytest.approx(harmonic[0], rel=0.01)
        assert share.heat_capacity_j_mol_k == pytest.approx(harmonic[2], rel=0.01)


def test_levels_are_mathieu_s_characteristic_values() -> None:
    # y'' + (a - 2 q cos 2x) y = 0 with 2x = 3 phi: E = (9/4) B a + V3/2, q = V3/(9 B); states of
    # period 120 degrees (A) only, those of species E lie between
    found = ETHANE.levels_cm(500.0)
    b, v3 = ETHANE.constant_cm, 12250.0 / J_PER_CM
    q = v3 / (9.0 * b)
    exact = [mathieu_a(0, q), mathieu_b(2, q), mathieu_a(2, q), mathieu_b(4, q), mathieu_a(4, q)]
    for value in np.array(exact) * 2.25 * b + 0.5 * v3:
        assert np.abs(found - value).min() < 1e-6


def test_levels_of_hydrogen_peroxide() -> None:
    # Hunt, Leacock, Peters, Hecht, J. Chem. Phys. 1965, 42, 1931: potential, constant and observed
    # levels, all from memory. 1.5 %: their rotational constant also varies with the angle
    v = tuple(J_PER_CM * value for value in (0.0, 993.0, 636.0, 44.0))
    found = levels(Potential(v, (0.0,) * 4), 40.28, 64)
    observed = [11.43, 254.2, 370.7, 569.3, 775.9]
    assert found[1] - found[0] == pytest.approx(
        observed[0], rel=0.03
    )  # the splitting by tunnelling
    assert found[2:6] - found[0] == pytest.approx(observed[1:], rel=0.015)


@pytest.mark.parametrize("rotor", [ETHANE, SKEW], ids=["ethane", "skew"])
def test_derivatives_and_basis(rotor: HinderedRotor) -> None:
    step = 1e-4 * T
    up, down, here = (torsion(t, rotor) for t in (T + step, T - step, T))
    slope = (up.enthalpy_j_mol - down.enthalpy_j_mol) / (2.0 * step)
    assert here.heat_capacity_j_mol_k == pytest.approx(slope, rel=1e-6, abs=1e-9)
    gibbs = [share.enthalpy_j_mol - t * share.entropy_j_mol_k for share, t in
             ((up, T + step), (down, T - step))]  # fmt: skip
    assert here.entropy_j_mol_k == pytest.approx((gibbs[1] - gibbs[0]) / (2.0 * step), rel=1e-6)
    # a basis twice as large changes no sum
    wide = levels(rotor.potential, rotor.constant_cm, 600)
    x = KELVIN_PER_CM * (wide - wide[0]) / T[:, np.newaxis]
    q = np.exp(-x).sum(axis=1) / rotor.symmetry_number
    log_q = here.entropy_j_mol_k / GAS_J_MOL_K - here.enthalpy_j_mol / (GAS_J_MOL_K * T)
    assert log_q == pytest.approx(np.log(q), abs=1e-9)
    assert here.zero_point_j_mol == pytest.approx(GAS_J_MOL_K * KELVIN_PER_CM * wide[0], abs=1e-6)


def test_temperatures_of_any_shape_and_a_shift_of_the_zero() -> None:
    grid = T.reshape(2, 2)
    assert torsion(grid, ETHANE).entropy_j_mol_k.shape == (2, 2)
    shifted = HinderedRotor(Potential((9e5, 0.0, 0.0, 6125.0), (0.0,) * 4), 1.566, 3)
    assert torsion(T, shifted).zero_point_j_mol == pytest.approx(
        torsion(T, ETHANE).zero_point_j_mol, abs=1e-5
    )


def test_extrema() -> None:
    angles, values = SKEW.potential.minima()
    assert np.abs(SKEW.potential.at(angles, 1)).max() < 1e-6
    assert np.all(SKEW.potential.at(angles, 2) > 0.0)
    grid = SKEW.potential.at(np.linspace(0.0, 360.0, 7201))
    assert values.min() == pytest.approx(grid.min(), abs=0.1)
    assert SKEW.barrier_j_mol == pytest.approx(np.ptp(grid), abs=0.2)
    assert len(Potential((5.0,), (0.0,)).minima()[0]) == 0


@pytest.mark.parametrize("shift", [0.0, 7.0])
def test_a_fit_gives_back_the_series(shift: float) -> None:
    angle = np.arange(0.0, 360.0, 30.0) + shift
    found = fit(angle, SKEW.potential.at(angle))
    grid = np.linspace(0.0, 360.0, 91)
    assert found.potential.at(grid) == pytest.approx(SKEW.potential.at(grid), abs=1e-6)
    assert np.abs(found.residual_j_mol).max() < 1e-6


def test_a_fit_of_one_period_and_of_half_a_period() -> None:
    v = threefold(12250.0)
    grid = np.linspace(0.0, 360.0, 91)
    part = np.array([60.0, 80.0, 100.0, 120.0, 140.0, 160.0])
    assert fit(part, v.at(part), 120.0).potential.at(grid) == pytest.approx(v.at(grid), abs=1e-6)
    half = np.array([60.0, 75.0, 90.0, 105.0, 120.0])
    found = fit(half, v.at(half), 120.0, 60.0).potential
    assert found.at(grid) == pytest.approx(v.at(grid), abs=1e-6)
    # a mirror off zero: cos(phi - 40) is symmetric about 40 and 220
    tilted = np.arange(40.0, 221.0, 20.0)
    wave = 5000.0 * np.cos(np.radians(tilted - 40.0))
    found = fit(tilted, wave, 360.0, 40.0).potential
    assert found.at(grid) == pytest.approx(5000.0 * np.cos(np.radians(grid - 40.0)), abs=1e-6)


def test_points_that_do_not_cover_the_period() -> None:
    angle = np.array([0.0, 30.0, 60.0, 90.0, 120.0, 150.0, 180.0])
    assert widest_gap(angle, 360.0, None) == pytest.approx((180.0, 180.0))
    assert widest_gap(angle, 360.0, 0.0)[0] == pytest.approx(30.0)
    with pytest.raises(
        ValueError, match="no point in the 180 degrees from 180 on, where at most 60"
    ):
        fit(angle, np.zeros(7))
    with pytest.raises(ValueError, match="at most 30 may lie"):
        fit([0.0, 60.0, 120.0], [0.0, 1.0, 0.0], 120.0)
