"""Partition functions against published constants, tabulated values and identities."""

from __future__ import annotations

import numpy as np
import pytest
from structures import masses, turn

from thermo_pp.formulas.partition import (
    SPIN_WEIGHTS,
    Share,
    electronic,
    linear_rotation,
    linear_rotation_levels,
    nonlinear_correction,
    nonlinear_rotation,
    quantum_rotor_changes,
    rotation,
    translation,
)
from thermo_pp.formulas.rotor import (
    RigidRotor,
    distance_from_axis,
    principal_moments,
    rigid_rotor,
    rotational_temperatures,
    rotor_kind,
)
from thermo_pp.units import GAS_J_MOL_K as R
from thermo_pp.units import KELVIN_PER_CM

ROOM = 298.15
# checks.md 1: rotational constants, cm^-1, computed there from general-purpose libraries
WATER_K = KELVIN_PER_CM * np.array([27.8806, 14.5218, 9.2777])
CO2_K = KELVIN_PER_CM * 0.390219


def test_sackur_tetrode_constant() -> None:
    """CODATA 2022: S0/R at 1 K, 100 kPa and 1 u is -1.15170753496(47)."""
    assert float(translation(1.0, 1.0).entropy_j_mol_k) / R == pytest.approx(
        -1.15170753496, abs=5e-10, rel=0.0
    )


@pytest.mark.parametrize(
    ("mass", "entropy"),
    [  # CODATA Key Values (from memory), 0.0005: half a unit of their last digit
        (4.002602, 126.153),
        (20.1797, 146.328),
        (39.948, 154.846),
        (83.798, 164.085),
        (131.293, 169.685),
    ],
)
def test_noble_gases(mass: float, entropy: float) -> None:
    found = float(translation(ROOM, mass).entropy_j_mol_k)
    assert found == pytest.approx(entropy, abs=0.001, rel=0.0)


@pytest.mark.parametrize(
    ("temperature", "mass", "theta", "entropies", "enthalpies"),
    [  # checks.md 1, "[V: computed]": S_tr, S_rot; H_tr, H_rot; digits as printed there
        (ROOM, 18.015, WATER_K, (144.9135, 43.7700), (6197.39, 3718.44)),
        (1000.0, 18.015, WATER_K, (170.0681, 58.8628), (20786.16, 12471.69)),
    ],
)
def test_water(
    temperature: float,
    mass: float,
    theta: np.ndarray,
    entropies: tuple[float, float],
    enthalpies: tuple[float, float],
) -> None:
    shares = translation(temperature, mass), rotation(temperature, "nonlinear", theta, 2, False)
    for share, entropy, enthalpy in zip(shares, entropies, enthalpies, strict=True):
        assert float(share.entropy_j_mol_k) == pytest.approx(entropy, abs=6e-5, rel=0.0)
        assert float(share.enthalpy_j_mol) == pytest.approx(enthalpy, abs=6e-3, rel=0.0)


def test_carbon_dioxide() -> None:
    """checks.md 1: S_tr 156.0531, S_rot 54.7233, q_rot = 265.5235, q_tr = 1.1627406e7."""
    moves, turns = translation(ROOM, 44.009), linear_rotation(ROOM, CO2_K, 2)
    assert float(moves.entropy_j_mol_k) == pytest.approx(156.0531, abs=6e-5, rel=0.0)
    assert float(turns.entropy_j_mol_k) == pytest.approx(54.7233, abs=6e-5, rel=0.0)
    # G = H - TS = -RT ln q
    for share, q in ((moves, 1.1627406e7), (turns, 265.5235)):
        gibbs = share.enthalpy_j_mol - ROOM * share.entropy_j_mol_k
        assert np.exp(-gibbs / (R * ROOM)) == pytest.approx(q, rel=3e-7)


@pytest.mark.parametrize(
    ("levels", "temperature", "q", "entropy", "enthalpy", "heat_capacity"),
    [  # checks.md 1, "[V: computed]"
        (
            [(5, 0.0), (3, 158.265), (1, 226.977), (5, 15867.862)],
            ROOM,
            6.732200,
            17.62569,
            527.973,
            1.12530,
        ),
        ([(4, 0.0), (2, 882.3515)], ROOM, 4.028303, 11.83365, None, 1.05167),
        ([(4, 0.0), (2, 882.3515)], 1000.0, 4.561940, 13.91946, None, 1.44729),
        ([(2, 0.0), (2, 119.82)], ROOM, 3.121799, 11.19282, 515.071, 0.63995),
        ([(2, 0.0)], ROOM, 2.0, 5.763146, 0.0, 0.0),
        ([(3, 0.0)], 77.0, 3.0, 9.134371, 0.0, 0.0),
    ],
    ids=["O", "Cl", "Cl 1000 K", "NO", "doublet", "triplet"],
)
def test_electronic_levels(
    levels: list[tuple[int, float]],
    temperature: float,
    q: float,
    entropy: float,
    enthalpy: float | None,
    heat_capacity: float,
) -> None:
    share = electronic(temperature, *zip(*levels, strict=True))
    gibbs = share.enthalpy_j_mol - temperature * share.entropy_j_mol_k
    assert np.exp(-gibbs / (R * temperature)) == pytest.approx(q, abs=6e-7, rel=0.0)
    assert float(share.entropy_j_mol_k) == pytest.approx(entropy, abs=6e-6, rel=0.0)
    assert float(share.heat_capacity_j_mol_k) == pytest.approx(heat_capacity, abs=6e-6, rel=0.0)
    if enthalpy is not None:
        assert float(share.enthalpy_j_mol) == pytest.approx(enthalpy, abs=6e-4, rel=0.0)


def test_levels_of_a_heavy_linear_rotor_are_classical() -> None:
    """Euler-Maclaurin: q = q_cl (1 + a + 3 a^2/5 + ...), a = Theta/(3 T)."""
    t = np.array([250.0, 700.0])
    exact, classical = linear_rotation_levels(t, CO2_K, 2), linear_rotation(t, CO2_K, 2)
    a = CO2_K / (3.0 * t)
    assert exact.enthalpy_j_mol == pytest.approx(classical.enthalpy_j_mol - R * t * a, rel=1e-6)
    assert exact.entropy_j_mol_k == pytest.approx(classical.entropy_j_mol_k, rel=1e-6)
    assert exact.heat_capacity_j_mol_k == pytest.approx(classical.heat_capacity_j_mol_k, rel=1e-6)


def test_levels_at_the_bottom() -> None:
    """Far below Theta only J = 0 and 1 count: Cv = R 3 (2 Theta/T)^2 exp(-2 Theta/T)."""
    share = linear_rotation_levels(10.0, 85.0, 1)
    x = 2.0 * 85.0 / 10.0
    assert float(share.heat_capacity_j_mol_k) == pytest.approx(
        R * 3.0 * x**2 * np.exp(-x), rel=3e-7
    )
    assert float(share.entropy_j_mol_k) == pytest.approx(3.0 * (1.0 + x) * R * np.exp(-x), rel=3e-7)


def test_nuclear_spins_of_hydrogen() -> None:
    """checks.md 9 (v): sum with 1:3 weights gives H(H2) 8.4677 kJ/mol and S 130.6855; that sum has
    centrifugal distortion (D = 0.04599 cm^-1), which adds 0.015 kJ/mol and 0.09 J/(mol K)."""
    d, b = 0.04599, 59.3219
    j = np.arange(40.0)
    energies = KELVIN_PER_CM * (b * j * (j + 1) - d * (j * (j + 1)) ** 2)[:12]
    weights = (2 * j + 1)[:12] * np.where(j[:12] % 2 == 0, 1.0, 3.0) / 4.0
    terms = weights * np.exp(-energies / ROOM)
    with_distortion = R * (terms * energies).sum() / terms.sum()
    rigid = linear_rotation_levels(ROOM, KELVIN_PER_CM * b, 2, SPIN_WEIGHTS[1])
    assert with_distortion + 3.5 * R * ROOM - R * ROOM == pytest.approx(8467.7, abs=0.1)
    assert float(rigid.enthalpy_j_mol) == pytest.approx(with_distortion, abs=16.0)
    # without the weights it would be 33 J/mol lower than with them and distortion
    plain = linear_rotation_levels(ROOM, KELVIN_PER_CM * b, 2)
    assert with_distortion - float(plain.enthalpy_j_mol) > 30.0


def spherical_levels(t: float, theta: float) -> Share:
    """Quantum spherical top, q = sum (2J+1)^2 exp(-J(J+1) Theta/T), by plain summation."""
    j = np.arange(400.0)
    energy, terms = theta * j * (j + 1), (2 * j + 1) ** 2 * np.exp(-theta * j * (j + 1) / t)
    q, mean = terms.sum(), (terms * energy).sum() / terms.sum()
    square = (terms * energy**2).sum() / terms.sum()
    return Share(R * mean, R * (np.log(q) + mean / t), R * (square - mean**2) / t**2)


def test_nonlinear_correction_against_a_level_sum() -> None:
    """A spherical top has exact levels; the next term of the series is of order (Theta/T)^2."""
    t, theta = 298.15, 7.5408  # CH4: B = 5.24104 cm^-1
    exact = spherical_levels(t, theta)
    classical = nonlinear_rotation(t, [theta] * 3, 1)
    better = [
        float(one + two)
        for one, two in zip(classical, nonlinear_correction(t, [theta] * 3), strict=True)
    ]
    assert float(classical.enthalpy_j_mol) - exact.enthalpy_j_mol > 10.0
    assert better[0] == pytest.approx(exact.enthalpy_j_mol, abs=0.1, rel=0.0)
    assert better[1] == pytest.approx(exact.entropy_j_mol_k, abs=3e-4, rel=0.0)
    assert better[2] == pytest.approx(exact.heat_capacity_j_mol_k, abs=6e-4, rel=0.0)


def test_auto_rule() -> None:
    """methods.md: H2O at 298 K -0.037 kJ/mol; replaced beyond 0.01 kJ/mol."""
    change = nonlinear_correction(ROOM, WATER_K)
    gibbs = float(change.enthalpy_j_mol - ROOM * change.entropy_j_mol_k)
    assert gibbs == pytest.approx(-37.0, abs=0.5)
    assert quantum_rotor_changes(RigidRotor("nonlinear", tuple(WATER_K), 2))
    assert not quantum_rotor_changes(RigidRotor("linear", (CO2_K,), 2))
    # -R Theta/3 = 10 J/mol at Theta = 3.608 K
    assert quantum_rotor_changes(RigidRotor("linear", (3.65,)))
    assert not quantum_rotor_changes(RigidRotor("linear", (3.57,)))
    assert not quantum_rotor_changes(RigidRotor("atom", ()))


SHARES = {
    "translation": lambda t: translation(t, 30.0),
    "linear": lambda t: linear_rotation(t, 2.0, 2),
    "levels": lambda t: linear_rotation_levels(t, 60.0, 1),
    "hydrogen": lambda t: linear_rotation_levels(t, 85.0, 2, SPIN_WEIGHTS[1]),
    "nonlinear": lambda t: nonlinear_rotation(t, WATER_K, 2),
    "corrected": lambda t: rotation(t, "nonlinear", WATER_K, 2, True),
    "electronic": lambda t: electronic(t, [2, 2, 4], [0.0, 120.0, 600.0]),
}


@pytest.mark.parametrize("name", SHARES)
def test_identities(name: str) -> None:
    """S = -dG/dT and Cp = dH/dT by central differences, error of order h^2."""
    share, t, h = SHARES[name], np.array([150.0, 298.15, 900.0]), 0.01
    below, here, above = share(t - h), share(t), share(t + h)

    def gibbs(at: Share, temperature: np.ndarray) -> np.ndarray:
        return at.enthalpy_j_mol - temperature * at.entropy_j_mol_k

    slope = (gibbs(above, t + h) - gibbs(below, t - h)) / (2 * h)
    assert here.entropy_j_mol_k == pytest.approx(-slope, rel=1e-7, abs=1e-6)
    rise = (above.enthalpy_j_mol - below.enthalpy_j_mol) / (2 * h)
    assert here.heat_capacity_j_mol_k == pytest.approx(rise, rel=1e-6, abs=1e-6)


@pytest.mark.parametrize("name", SHARES)
def test_any_shape(name: str) -> None:
    grid = np.linspace(200.0, 900.0, 6).reshape(2, 3)
    whole = SHARES[name](grid)
    for field, values in zip(Share._fields, whole, strict=True):
        assert values.shape == (2, 3)
        single = [float(getattr(SHARES[name](t), field)) for t in grid.ravel()]
        assert values.ravel() == pytest.approx(single, rel=1e-13)


def test_blocks() -> None:
    """Structures on a first axis give what each gives alone."""
    t, theta = np.array([200.0, 300.0, 400.0]), np.array([[40.0, 21.0, 13.0], [5.0, 0.4, 0.3]])
    both = rotation(t, "nonlinear", theta[:, np.newaxis], np.array([[2], [1]]), True)
    for row, sigma in enumerate((2, 1)):
        alone = rotation(t, "nonlinear", theta[row], sigma, True)
        for one, two in zip(both, alone, strict=True):
            assert np.broadcast_to(one, (2, 3))[row] == pytest.approx(two, rel=1e-14)


def test_rotor_from_a_geometry() -> None:
    """B / cm^-1 = 16.8576292 / (I / u A^2) (checks.md 0); CO2 with r = 1.1621 A has B near 0.3902."""
    z = [6, 8, 8]
    x = np.outer([0.0, 1.1621, -1.1621], [0.6, 0.0, 0.8])
    moments = principal_moments(masses(z), x)
    assert moments[0] == pytest.approx(0.0, abs=1e-12)
    assert 16.8576292 / moments[1] == pytest.approx(0.3902, abs=2e-4)
    assert rotational_temperatures(moments[1]) == pytest.approx(
        KELVIN_PER_CM * 16.8576292 / moments[1], rel=1e-8
    )
    rotor = rigid_rotor(masses(z), x, 2)
    assert rotor.kind == "linear"
    assert rotor.theta_k[0] == pytest.approx(float(rotational_temperatures(moments[1])), rel=1e-12)


@pytest.mark.parametrize(
    ("bend", "kind"), [(0.0, "linear"), (0.025, "linear"), (0.05, "nonlinear")]
)
def test_nearly_linear(bend: float, kind: str) -> None:
    """The O atoms of CO2 bent away from the axis: the limit is 0.03 A from the axis."""
    x = np.array([[bend, 0, 0], [0, 0, 1.16], [0, 0, -1.16]]) @ turn([1, 2, 3], 40).T
    assert distance_from_axis(masses([6, 8, 8]), x) <= bend + 1e-12
    assert distance_from_axis(masses([6, 8, 8]), x) >= 0.7 * bend
    assert rotor_kind(masses([6, 8, 8]), x) == kind


def test_refuses_what_makes_no_sense() -> None:
    with pytest.raises(ValueError, match=r"temperature must be above 0, got 0\.0"):
        translation([300.0, 0.0], 18.0)
    with pytest.raises(ValueError, match=r"mass must be above 0, got -1\.0"):
        translation(300.0, -1.0)
    with pytest.raises(ValueError, match="temperature must be above 0, got nan"):
        translation(np.nan, 18.0)
    with pytest.raises(ValueError, match="1 rotational temperatures for rotor 'nonlinear'"):
        RigidRotor("nonlinear", (1.0,))
