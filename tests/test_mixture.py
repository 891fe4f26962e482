"""Mixture: numbers of n-butane and of three made-up conformers, identities, blocks."""

from __future__ import annotations

import numpy as np
import pytest

from thermo_pp.formulas.mixture import (
    gibbs_by_number,
    joined,
    missed_change,
    mixed,
    part,
    populations,
)
from thermo_pp.units import CALORIE_J
from thermo_pp.units import GAS_J_MOL_K as R

T = np.array([200.0, 273.15, 287.15, 298.15, 400.0, 600.0])

# n-butane, one trans and two gauche: enthalpy differences of the gas of 660 +- 22 cal/mol (Raman;
# Balabin, J. Phys. Chem. A 2009, 113, 1012) and 669 +- 96 cal/mol (infrared; Herrebout et al., J.
# Phys. Chem. 1995, 99, 578), as their abstracts have them. The table below is the two-state closed
# form of these, worked out apart from this program to the digits shown: x = 2 exp(-d/RT) and so on.
# T, gauche share (660), gauche share (669), then for 660: S, Cp / J/(mol K), G, H / J/mol
BUTANE = [
    (200.0, 0.27538, 0.27089, 6.4805, 4.5753, -535.64, 760.46),
    (273.15, 0.37221, 0.36834, 7.6336, 2.8723, -1057.30, 1027.83),
    (287.15, 0.38616, 0.38243, 7.7712, 2.6366, -1165.15, 1066.36),
    (298.15, 0.39632, 0.39270, 7.8672, 2.4684, -1251.17, 1094.43),
    (400.0, 0.46576, 0.46295, 8.4279, 1.4263, -2084.98, 1286.17),
    (600.0, 0.53484, 0.53297, 8.8253, 0.6338, -3818.26, 1476.94),
]


def rows(*values: float) -> np.ndarray:
    return np.repeat(np.array(values)[:, np.newaxis], len(T), axis=1)


def test_n_butane() -> None:
    h, zero = rows(0.0, 660.0 * CALORIE_J), rows(0.0, 0.0)
    found = mixed(T, part(T, [1, 2], h, zero, zero, h))
    share = populations(T, [1, 2], h)[1]
    other = populations(T, [1, 2], rows(0.0, 669.0 * CALORIE_J))[1]
    for k, (_, x660, x669, s, cp, g, enthalpy) in enumerate(BUTANE):
        # the last digit of each column is 5e-6 to 5e-3: that is the tolerance
        assert share[k] == pytest.approx(x660, abs=6e-6)
        assert other[k] == pytest.approx(x669, abs=6e-6)
        assert found.entropy_j_mol_k[k] == pytest.approx(s, abs=6e-5)
        assert found.heat_capacity_j_mol_k[k] == pytest.approx(cp, abs=6e-5)
        assert found.gibbs_j_mol[k] == pytest.approx(g, abs=6e-3)
        assert found.enthalpy_j_mol[k] == pytest.approx(enthalpy, abs=6e-3)
    # electron diffraction: 60 +- 15 % trans near 14 degC (Bonham and Bartell, J. Am. Chem. Soc. 1959,
    # 81, 3491, abstract)
    assert 1.0 - share[2] == pytest.approx(0.60, abs=0.15)


@pytest.mark.parametrize(
    ("t", "shares", "g", "h", "s", "cp"),
    [  # three conformers that are made up; closed forms worked out apart from this program
        (298.15, (0.493673, 0.440640, 0.065687), -1749.852, 1584.261, 11.18267, 3.56365),
        (400.0, (0.413690, 0.497092, 0.089218), -2935.467, 1858.299, 11.98442, 2.01732),
    ],
)
def test_three_conformers(
    t: float, shares: tuple[float, ...], g: float, h: float, s: float, cp: float
) -> None:
    entropy = np.array([[0.0], [3.0], [-1.0]])
    enthalpy = np.array([[0.0], [2000.0], [5000.0]]) + 298.15 * entropy
    found = mixed([t], part([t], [1, 2, 1], enthalpy, entropy, 0.0 * entropy, enthalpy))
    assert populations([t], [1, 2, 1], enthalpy - t * entropy)[:, 0] == pytest.approx(
        shares, abs=6e-7
    )
    assert found.gibbs_j_mol[0] == pytest.approx(g, abs=6e-4)
    assert found.enthalpy_j_mol[0] == pytest.approx(h, abs=6e-4)
    assert found.entropy_j_mol_k[0] == pytest.approx(s, abs=6e-6)
    assert found.heat_capacity_j_mol_k[0] == pytest.approx(cp, abs=6e-6)


def members(rng: np.random.Generator, t: np.ndarray) -> tuple[np.ndarray, ...]:
    """H, S, Cp and slope of members whose entropy is not the slope of their G."""
    h0, s0, cp, extra = rng.normal(0.0, (4000.0, 6.0, 3.0, 800.0), (9, 4)).T[:, :, np.newaxis]
    h = h0 + cp * t
    s = s0 + cp * np.log(t) + extra / t * 0.3  # G = H - T S has the slope h - extra' beside H
    slope = h - 0.3 * extra  # -T^2 d(G/T)/dT with -S' = 0.3 extra / T
    return h, s, np.broadcast_to(cp, h.shape), slope


def test_slope_and_heat_capacity_are_the_derivatives() -> None:
    g = np.arange(1, 10)

    def at(t: np.ndarray):  # type: ignore[no-untyped-def]
        h, s, cp, slope = members(np.random.default_rng(4), t)
        return mixed(t, part(t, g, h, s, cp, slope))

    t, step = np.array([250.0, 400.0]), 0.01
    here, up, down = at(t), at(t + step), at(t - step)
    slope = -(t**2) * (up.gibbs_j_mol / (t + step) - down.gibbs_j_mol / (t - step)) / (2 * step)
    # central differences: about 1e-6 of truncation at this step
    assert here.slope_enthalpy_j_mol == pytest.approx(slope, rel=1e-6)
    cp = (up.enthalpy_j_mol - down.enthalpy_j_mol) / (2 * step)
    assert here.heat_capacity_j_mol_k == pytest.approx(cp, rel=1e-6)
    assert here.gibbs_j_mol == pytest.approx(
        here.enthalpy_j_mol - t * here.entropy_j_mol_k, rel=1e-13
    )
    assert np.all(np.abs(here.slope_enthalpy_j_mol - here.enthalpy_j_mol) > 1.0)


def test_blocks_in_any_order_and_far_apart() -> None:
    h, s, cp, slope = members(np.random.default_rng(1), T)
    h[3] += 4e6  # its weight underflows
    slope[3] += 4e6
    g = np.full(9, 2)
    whole = mixed(T, part(T, g, h, s, cp, slope))
    pieces = [part(T, g[k], h[k], s[k], cp[k], slope[k]) for k in np.split(np.arange(9), 3)[::-1]]
    for one, other in zip(whole, mixed(T, *pieces), strict=True):
        assert other == pytest.approx(one, rel=1e-11, abs=1e-9)
    assert joined(*pieces[:2]).weight.shape == T.shape


def test_one_member_is_itself() -> None:
    h, s, cp, slope = (values[:1] for values in members(np.random.default_rng(2), T))
    found = mixed(T, part(T, [1], h, s, cp, slope))
    assert found.enthalpy_j_mol == pytest.approx(h[0], rel=1e-14)
    assert found.entropy_j_mol_k == pytest.approx(s[0], rel=1e-12)
    assert found.heat_capacity_j_mol_k == pytest.approx(cp[0], abs=1e-9)
    assert found.mixing_entropy_j_mol_k == pytest.approx(0.0, abs=1e-10)
    twice = mixed(T, part(T, [2], h, s, cp, slope))
    assert twice.mixing_entropy_j_mol_k == pytest.approx(R * np.log(2.0), abs=1e-10)


def test_convergence_and_a_missed_member() -> None:
    gibbs = rows(5000.0, 0.0, 2000.0)
    by_number = gibbs_by_number(T, [1, 1, 2], gibbs)
    assert by_number[0, :4] == pytest.approx(0.0, abs=1e-12)
    # where it is hot, the one of degeneracy 2 counts more than the lowest
    assert by_number[0, -1] == pytest.approx(2000.0 - R * 600.0 * np.log(2.0), rel=1e-12)
    whole = -R * T * np.log(1.0 + 2.0 * np.exp(-2000.0 / (R * T)) + np.exp(-5000.0 / (R * T)))
    assert by_number[2] == pytest.approx(whole, rel=1e-12)
    without = -R * T * np.log(1.0 + 2.0 * np.exp(-2000.0 / (R * T)))
    assert missed_change(T, 5000.0 - without) == pytest.approx(whole - without, rel=1e-10)


def test_no_degeneracy_of_zero() -> None:
    with pytest.raises(ValueError, match="above 0"):
        populations(T, [0, 1], rows(0.0, 0.0))
