"""Oscillators and soft-mode treatments against tabulated single modes, limits and identities."""

from __future__ import annotations

import numpy as np
import pytest

from thermo_pp.formulas.vibration import Vibration, oscillator, vibration
from thermo_pp.names import LOW_MODES
from thermo_pp.units import ATOMIC_MASS_KG
from thermo_pp.units import GAS_J_MOL_K as R

# checks.md 1, single harmonic oscillator "[V: computed]":
# wavenumber, S / U_th / Cv at 298.15 K and at 600 K, zero-point energy; J/(mol K), kJ/mol
OSCILLATORS = [
    (10, 33.51822, 2.41962, 8.31285, 39.33219, 4.92910, 8.31406, 0.05981),
    (20, 27.75749, 2.36125, 8.30801, 33.56964, 4.87001, 8.31287, 0.11963),
    (50, 20.15594, 2.19191, 8.27424, 25.95536, 4.69559, 8.30451, 0.29907),
    (100, 14.45286, 1.92875, 8.15497, 20.20713, 4.41443, 8.27474, 0.59813),
    (200, 8.92488, 1.47220, 7.69804, 14.50331, 3.88767, 8.15691, 1.19627),
    (500, 2.75359, 0.58839, 5.23005, 7.28640, 2.58179, 7.38613, 2.99066),
    (1000, 0.39139, 0.09673, 1.57826, 2.78603, 1.19618, 5.25868, 5.98133),
    (3000, 0.00007, 0.00002, 0.00090, 0.05121, 0.02698, 0.32371, 17.94398),
]

# checks.md 2, per mode, ASE 3.29 HarmonicMode/RRHOMode (hence CODATA 2014: differences near 1e-6)
# and our own raised column; S in J/(mol K), U with zero-point energy in kJ/mol:
# T, wavenumber, S_HO, U_HO, S raised100, U raised100, w(100), S w0=100, S w0=50, S w0=35,
# U int w0=100, U int w0=50, U int w0=35
SOFT = [
    (298.15, 20, 27.7575, 2.4809, 14.4529, 2.5269, 0.001597, 18.6448, 18.8580, 19.5096,
     1.2415, 1.2705, 1.3591),
    (298.15, 50, 20.1559, 2.4910, 14.4529, 2.5269, 0.058824, 15.1381, 17.4902, 19.1237,
     1.3131, 1.8652, 2.2487),
    (298.15, 100, 14.4529, 2.5269, 14.4529, 2.5269, 0.500000, 13.1985, 14.3053, 14.4158,
     1.8832, 2.4511, 2.5078),
    (298.15, 200, 8.9249, 2.6685, 8.9249, 2.6685, 0.941176, 8.9330, 8.9254, 8.9250,
     2.5844, 2.6629, 2.6671),
    (600.0, 20, 33.5696, 4.9896, 20.2071, 5.0126, 0.001597, 21.5567, 21.8378, 22.6968,
     2.4983, 2.5566, 2.7348),
    (600.0, 50, 25.9553, 4.9947, 20.2071, 5.0126, 0.058824, 18.2155, 21.8436, 24.3632,
     2.6414, 3.7445, 4.5106),
    (600.0, 100, 20.2071, 5.0126, 20.2071, 5.0126, 0.500000, 17.5292, 19.8921, 20.1279,
     3.7534, 4.8644, 4.9753),
    (600.0, 200, 14.5033, 5.0839, 14.5033, 5.0839, 0.941176, 14.3543, 14.4935, 14.5009,
     4.9316, 5.0739, 5.0815),
]  # fmt: skip

T = np.array([40.0, 150.0, 298.15, 900.0])
MODES = np.array([0.5, 12.0, 60.0, 99.0, 250.0, 1700.0, 3600.0])


def energy(found: Vibration) -> np.ndarray:
    return found.enthalpy_j_mol + found.zero_point_j_mol


@pytest.mark.parametrize("row", OSCILLATORS, ids=lambda row: f"{row[0]} cm^-1")
def test_oscillator_table(row: tuple[float, ...]) -> None:
    nu, *values, zero_point = row
    found = vibration([298.15, 600.0], [float(nu)])
    for k in range(2):
        s, u, c = values[3 * k : 3 * k + 3]
        assert found.entropy_j_mol_k[k, 0] == pytest.approx(s, abs=6e-6, rel=0.0)
        assert found.enthalpy_j_mol[k, 0] / 1000 == pytest.approx(u, abs=6e-6, rel=0.0)
        assert found.heat_capacity_j_mol_k[k, 0] == pytest.approx(c, abs=6e-6, rel=0.0)
    assert found.zero_point_j_mol[0] / 1000 == pytest.approx(zero_point, abs=6e-6, rel=0.0)


def test_water_and_carbon_dioxide() -> None:
    """checks.md 1: sums over the modes, "[V]"; S_vib, U_vib, Cv_vib and the zero-point energy."""
    water = vibration([298.15, 1000.0], [1594.75, 3657.05, 3755.93])
    assert water.entropy_j_mol_k.sum(-1) == pytest.approx([0.0329, 3.5343], abs=6e-5, rel=0.0)
    assert water.enthalpy_j_mol.sum(-1) == pytest.approx([8.68, 2570.01], abs=6e-3, rel=0.0)
    assert water.zero_point_j_mol.sum() == pytest.approx(53878.2, abs=0.06, rel=0.0)
    dioxide = vibration(298.15, [667.38, 667.38, 1333.0, 2349.14])
    assert dioxide.entropy_j_mol_k.sum() == pytest.approx(3.0059, abs=6e-5, rel=0.0)
    assert dioxide.enthalpy_j_mol.sum() == pytest.approx(690.156, abs=6e-4, rel=0.0)
    assert dioxide.heat_capacity_j_mol_k.sum() == pytest.approx(8.04008, abs=6e-6, rel=0.0)


@pytest.mark.parametrize("row", SOFT, ids=lambda row: f"{row[1]} cm^-1 {row[0]} K")
def test_soft_mode_table(row: tuple[float, ...]) -> None:
    """To 1e-4 J/(mol K) and 1e-4 kJ/mol: what the table is printed to."""
    t, nu, s_ho, u_ho, s_raised, u_raised, w = row[:7]
    harmonic, raised = (vibration(t, [nu], name) for name in ("harmonic", "raised"))
    assert harmonic.entropy_j_mol_k[0] == pytest.approx(s_ho, abs=1e-4, rel=0.0)
    assert energy(harmonic)[0] / 1000 == pytest.approx(u_ho, abs=1e-4, rel=0.0)
    assert raised.entropy_j_mol_k[0] == pytest.approx(s_raised, abs=1e-4, rel=0.0)
    assert energy(raised)[0] / 1000 == pytest.approx(u_raised, abs=1e-4, rel=0.0)
    for onset, s, u in zip((100.0, 50.0, 35.0), row[7:10], row[10:13], strict=True):
        one, both = (
            vibration(t, [nu], name, onset_cm=onset) for name in ("rotor-entropy", "rotor-enthalpy")
        )
        assert one.entropy_j_mol_k[0] == pytest.approx(s, abs=1e-4, rel=0.0)
        assert both.entropy_j_mol_k[0] == one.entropy_j_mol_k[0]
        assert energy(one)[0] == energy(harmonic)[0]
        assert energy(both)[0] / 1000 == pytest.approx(u, abs=1e-4, rel=0.0)
        if onset == 100.0:
            assert one.weight[0] == pytest.approx(w, abs=6e-7, rel=0.0)


@pytest.mark.parametrize(
    ("nu", "entropy"), [(20, 18.5812), (50, 15.1140), (100, 13.1920), (200, 8.9326)]
)
def test_other_mean_inertia(nu: float, entropy: float) -> None:
    """checks.md 2: B_av = 50 u A^2, onset 100 cm^-1, 298.15 K."""
    moment = 50.0 * ATOMIC_MASS_KG * 1e-20
    found = vibration(298.15, [nu], "rotor-entropy", mean_inertia_kg_m2=moment)
    assert found.entropy_j_mol_k[0] == pytest.approx(entropy, abs=1e-4, rel=0.0)


@pytest.mark.parametrize(
    ("nu", "slope_entropy", "excess"),
    [(20, 14.5007, -1235.6), (50, 11.2633, -1155.3), (100, 11.1996, -596.0)],
)
def test_slope_of_the_entropy_only_treatment(
    nu: float, slope_entropy: float, excess: float
) -> None:
    """checks.md 2, "[V: derived and computed]": -dG/dT is not S, and H' is not H."""
    found = vibration(298.15, [nu], "rotor-entropy")
    assert found.slope_excess_j_mol[0] == pytest.approx(excess, abs=0.06, rel=0.0)
    # -dG/dT = S + (H' - H)/T
    bent = found.entropy_j_mol_k[0] + found.slope_excess_j_mol[0] / 298.15
    assert bent == pytest.approx(slope_entropy, abs=6e-5, rel=0.0)


@pytest.mark.parametrize("low_modes", LOW_MODES)
def test_slope_enthalpy_is_the_derivative(low_modes: str) -> None:
    """-T^2 d(G/T)/dT by central differences; equal to H where S = -dG/dT, not elsewhere."""
    h = 1e-3

    def gibbs_over_t(t: np.ndarray) -> np.ndarray:
        found = vibration(t, MODES, low_modes)
        return energy(found) / t[:, np.newaxis] - found.entropy_j_mol_k

    found = vibration(T, MODES, low_modes)
    slope = -(T**2)[:, np.newaxis] * (gibbs_over_t(T + h) - gibbs_over_t(T - h)) / (2 * h)
    assert energy(found) + found.slope_excess_j_mol == pytest.approx(slope, rel=1e-6, abs=0.02)
    broken = np.abs(found.slope_excess_j_mol).max()
    assert (broken > 100.0) == (low_modes == "rotor-entropy")
    if low_modes != "rotor-entropy":
        assert broken == 0.0


@pytest.mark.parametrize("low_modes", LOW_MODES)
def test_heat_capacity_is_the_derivative(low_modes: str) -> None:
    h = 1e-3
    rise = (
        vibration(T + h, MODES, low_modes).enthalpy_j_mol
        - vibration(T - h, MODES, low_modes).enthalpy_j_mol
    ) / (2 * h)
    found = vibration(T, MODES, low_modes).heat_capacity_j_mol_k
    assert found == pytest.approx(rise, rel=1e-6, abs=1e-6)


@pytest.mark.parametrize("low_modes", LOW_MODES)
def test_any_shape(low_modes: str) -> None:
    """A grid of temperatures and a block of structures give what each pair gives alone."""
    grid = T.reshape(2, 2)
    whole = vibration(grid, MODES, low_modes)
    assert whole.entropy_j_mol_k.shape == (2, 2, len(MODES))
    block = np.stack([MODES, 2.0 * MODES])[:, np.newaxis]
    blocks = vibration(T, block, low_modes)
    assert blocks.entropy_j_mol_k.shape == (2, 4, len(MODES))
    for name in (
        "enthalpy_j_mol",
        "entropy_j_mol_k",
        "heat_capacity_j_mol_k",
        "slope_excess_j_mol",
    ):
        one = np.array([getattr(vibration(t, MODES, low_modes), name) for t in T])
        assert getattr(whole, name).reshape(4, -1) == pytest.approx(one, rel=1e-13, abs=0.0)
        assert getattr(blocks, name)[0] == pytest.approx(one, rel=1e-13, abs=0.0)
        single = float(getattr(vibration(298.15, MODES[:1], low_modes), name)[0])
        assert single == pytest.approx(one[2, 0], rel=1e-13, abs=0.0)


def test_limits() -> None:
    """Soft: U + zero-point -> RT + (h nu)^2/12 RT; stiff and cold: S -> R x e^-x, exact to the end."""
    soft = vibration(300.0, [1e-3])
    assert energy(soft)[0] == pytest.approx(R * 300.0, rel=1e-9)
    assert soft.heat_capacity_j_mol_k[0] == pytest.approx(R, rel=1e-9)
    t, nu = np.array([[100.0]]), np.array([3500.0])
    _, entropy, _ = oscillator(t, nu)
    x = 1.438776877 * 3500.0 / 100.0
    assert entropy[0, 0] == pytest.approx(R * (x + 1.0) * np.exp(-x), rel=1e-9)
    cold = vibration(1.0, [3500.0])  # e^x overflows
    assert (cold.enthalpy_j_mol[0], cold.entropy_j_mol_k[0]) == (0.0, 0.0)


def test_rotor_enthalpy_of_a_vanishing_mode() -> None:
    """checks.md 2c: as v -> 0 the mode gives RT/2 from the potential minimum, no zero-point energy."""
    found = vibration(298.15, [0.01], "rotor-enthalpy")
    assert energy(found)[0] == pytest.approx(0.5 * R * 298.15, rel=1e-6)
    assert found.zero_point_j_mol[0] == pytest.approx(0.0, abs=1e-9)


def test_scale_factors() -> None:
    """Thermal terms of the scaled wavenumber, zero-point energy of its own scale; the onset is
    compared with the scaled ones."""
    found = vibration(298.15, [1000.0], frequency_scale=0.95, zero_point_scale=0.98)
    plain = vibration(298.15, [950.0])
    assert found.entropy_j_mol_k[0] == pytest.approx(plain.entropy_j_mol_k[0], rel=1e-14)
    assert found.zero_point_j_mol[0] == pytest.approx(0.98 * 5981.33, abs=0.006)
    raised = vibration(298.15, [101.0], "raised", frequency_scale=0.95, zero_point_scale=1.0)
    assert raised.wavenumbers_cm[0] == 100.0
    assert raised.zero_point_j_mol[0] == pytest.approx(1.01 * 598.133, abs=1e-3)


def test_refuses_what_makes_no_sense() -> None:
    with pytest.raises(ValueError, match="temperatures and wavenumbers must be above 0"):
        vibration(298.15, [100.0, -30.0])
    with pytest.raises(ValueError, match="temperatures and wavenumbers must be above 0"):
        vibration(0.0, [100.0])
    with pytest.raises(ValueError, match="low_modes 'quasi' is none of harmonic, raised"):
        vibration(298.15, [100.0], "quasi")  # type: ignore[arg-type]
    with pytest.raises(ValueError, match="onset, mean inertia and scale factors must be above 0"):
        vibration(298.15, [100.0], onset_cm=0.0)


def test_no_modes() -> None:
    found = vibration(T, np.empty(0), "rotor-entropy")
    assert found.entropy_j_mol_k.shape == (4, 0)
    assert found.entropy_j_mol_k.sum(axis=-1) == pytest.approx([0.0] * 4, abs=0.0)
