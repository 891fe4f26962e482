"""Tunnelling: Wigner and Eckart corrections against published forms, quadrature and limits."""

from __future__ import annotations

import math

import mpmath as mp
import numpy as np
import pytest

from thermo_pp.formulas.tunnelling import eckart, eckart_log_transmission, wigner
from thermo_pp.units import GAS_J_MOL_K, KELVIN_PER_CM

NU = 1000.0  # cm^-1; the tables are in reduced quantities
U_TABLE = (2.0, 3.0, 4.0, 5.0, 6.0, 8.0, 10.0, 12.0, 16.0)
# kappa of the asymmetric Eckart barrier by adaptive quadrature of the formula of Johnston and
# Heicklen (J. Phys. Chem. 1962, 66, 532), computed outside this program; four digits
ECKART = [
    (0.5, 0.5, (1.150, 1.235, 1.328, 1.428, 1.536, 1.779, 2.062, 2.392, 3.223)),
    (0.5, 20.0, (0.9291, 0.9312, 0.9456, 0.9689, 0.9996, 1.079, 1.182, 1.307, 1.630)),
    (2.0, 2.0, (1.321, 1.575, 1.906, 2.337, 2.895, 4.550, 7.336, 12.06, 34.01)),
    (4.0, 4.0, (1.290, 1.582, 2.024, 2.688, 3.692, 7.603, 17.26, 42.40, 303.9)),
    (8.0, 8.0, (1.241, 1.539, 2.049, 2.935, 4.540, 13.78, 57.00, 307.4, 1.548e4)),
]
# the same in kJ/mol, cm^-1 and K, six digits
PHYSICAL = [
    (40.0, 60.0, 1500.0, 600.0, 1.80725),
    (40.0, 60.0, 1500.0, 298.15, 15.1185),
    (40.0, 60.0, 1500.0, 200.0, 1398.16),
    (60.0, 60.0, 1000.0, 298.15, 3.17355),
    (20.0, 100.0, 1000.0, 298.15, 2.73404),
]


def barrier(alpha: float) -> float:
    """J/mol of a reduced height 2 pi V/(h nu)."""
    return alpha * GAS_J_MOL_K * KELVIN_PER_CM * NU / (2.0 * math.pi)


def reference(t: float, nu: float, v1: float, v2: float) -> tuple[float, float]:
    """ln kappa and R T^2 d ln kappa/dT by mpmath, the formula as published; v in J/mol."""
    with mp.workdps(20):
        rt = mp.mpf(GAS_J_MOL_K) * t
        a1, a2 = (2 * mp.pi * v / (mp.mpf(GAS_J_MOL_K) * KELVIN_PER_CM * nu) for v in (v1, v2))
        over = 1 / mp.sqrt(a1) + 1 / mp.sqrt(a2)
        cosh_d = mp.re(mp.cosh(2 * mp.sqrt(mp.mpc(a1 * a2 - mp.pi**2 / 4))))

        def weight(root: mp.mpf) -> mp.mpf:  # by the root of the energy above the threshold
            xi = max(mp.mpf(0), 1 - a2 / a1) + root**2
            a = 2 * mp.sqrt(a1 * xi) / over
            b = 2 * mp.sqrt(max(mp.mpf(0), a1 * xi - a1 + a2)) / over
            p = 1 - (mp.cosh(a - b) + cosh_d) / (mp.cosh(a + b) + cosh_d)
            return p * mp.exp((1 - xi) * v1 / rt) * 2 * root

        top = mp.sqrt(1 - max(mp.mpf(0), 1 - a2 / a1))
        far = mp.sqrt(top**2 + 60 * rt / v1)
        step = 1 / (a1 * top)  # h nu/2 pi, by the root
        near = [top + k * step for k in (-20, -8, -3, 0, 3, 8, 20) if 0 < top + k * step < far]
        grid = sorted({far * k / 6 for k in range(7)} | set(near))
        norm = mp.quad(weight, grid)
        mean = mp.quad(lambda r: weight(r) * (r**2 - top**2) * v1, grid) / norm
        return float(mp.log(norm * v1 / rt)), float(mean - rt)


@pytest.mark.parametrize(("alpha1", "alpha2", "kappas"), ECKART)
def test_eckart_table(alpha1: float, alpha2: float, kappas: tuple[float, ...]) -> None:
    t = KELVIN_PER_CM * NU / np.array(U_TABLE)
    for forward, reverse in ((alpha1, alpha2), (alpha2, alpha1)):
        found = eckart(t, NU, barrier(forward), barrier(reverse))
        assert np.exp(found.log_kappa) == pytest.approx(kappas, rel=5e-4)  # the digits printed


@pytest.mark.parametrize(("v1", "v2", "nu", "t", "kappa"), PHYSICAL)
def test_eckart_of_real_barriers(v1: float, v2: float, nu: float, t: float, kappa: float) -> None:
    found = eckart(t, nu, 1000.0 * v1, 1000.0 * v2)
    assert math.exp(found.log_kappa) == pytest.approx(kappa, rel=4e-6)
    turned = eckart(t, nu, 1000.0 * v2, 1000.0 * v1)
    assert turned.log_kappa == pytest.approx(found.log_kappa, rel=1e-12)


@pytest.mark.parametrize(
    ("nu", "v1", "v2", "t"),
    [
        (1500.0, 40e3, 60e3, 298.15),
        (1200.0, 25e3, 25.001e3, 150.0),  # nearly symmetric: the two roots all but meet
        (300.0, 5e3, 80e3, 400.0),
        (2000.0, 0.3e3, 1.0e3, 250.0),  # a low barrier: reflection above it
        (900.0, 60e3, 40e3, 60.0),  # deep tunnelling
        (50.0, 90e3, 70e3, 1500.0),
    ],
)
def test_eckart_against_quadrature(nu: float, v1: float, v2: float, t: float) -> None:
    log_kappa, energy = reference(t, nu, v1, v2)
    found = eckart(t, nu, v1, v2)
    assert found.log_kappa == pytest.approx(log_kappa, abs=1e-8)
    assert found.energy_j_mol == pytest.approx(energy, abs=1e-3, rel=1e-7)


def test_transmission_from_the_schroedinger_equation() -> None:
    """hbar = m = 1, V1 = 3, V2 = 5, L = 0.6: direct integration, computed outside this program."""
    v1, v2, length = 3.0, 5.0, 0.6
    # alpha = 2 pi V/(h nu), from V(x) = A y/(1+y) + B y/(1+y)^2, y = exp(x/L)
    a, b = v1 - v2, (math.sqrt(v1) + math.sqrt(v2)) ** 2
    curvature = (a**2 - b**2) ** 2 / (8.0 * b**3) / length**2
    quantum = math.sqrt(curvature) / GAS_J_MOL_K / KELVIN_PER_CM  # hbar omega as a wavenumber
    for energy, p in ((1.8, 0.0330708), (3.0, 0.5583725), (4.2, 0.9637420)):
        found = eckart_log_transmission(energy - v1, quantum, v1, v2)
        assert math.exp(found) == pytest.approx(p, abs=1e-7)


def test_eckart_is_vectorised() -> None:
    t = np.array([[900.0, 40.0], [300.0, 150.0]])
    found = eckart(t, 1100.0, 50e3, 70e3)
    assert found.log_kappa.shape == found.energy_j_mol.shape == t.shape
    for index in np.ndindex(t.shape):
        alone = eckart(t[index], 1100.0, 50e3, 70e3)
        assert found.log_kappa[index] == pytest.approx(alone.log_kappa, rel=1e-9)
        assert found.energy_j_mol[index] == pytest.approx(alone.energy_j_mol, rel=1e-8)


@pytest.mark.parametrize("method", ["wigner", "eckart"])
def test_energy_is_the_slope(method: str) -> None:
    t = np.array([120.0, 298.15, 1000.0])

    def log_kappa(at: np.ndarray) -> np.ndarray:
        if method == "wigner":
            return wigner(at, 1400.0).log_kappa
        return eckart(at, 1400.0, 45e3, 60e3).log_kappa

    step = 1e-4 * t
    slope = (log_kappa(t + step) - log_kappa(t - step)) / (2.0 * step) * GAS_J_MOL_K * t**2
    found = (
        wigner(t, 1400.0) if method == "wigner" else eckart(t, 1400.0, 45e3, 60e3)
    ).energy_j_mol
    assert found == pytest.approx(slope, rel=1e-6)
    assert np.all(found < 0.0)


def test_wigner_table() -> None:
    u = np.array([1.0, 2.0, 3.0, 4.0, 5.0])
    kappa = np.exp(wigner(KELVIN_PER_CM * NU / u, NU).log_kappa)
    assert kappa == pytest.approx([1 + v**2 / 24 for v in u], rel=1e-12)
    physical = np.exp(wigner([600.0, 298.15, 200.0], 1500.0).log_kappa)
    assert physical == pytest.approx([1.53908, 3.18317, 5.85175], rel=3e-6)


def test_limits() -> None:
    """kappa -> 1 where kT is large; high barriers approach (u/2)/sin(u/2); small u is Wigner's."""
    hot = eckart(1e5, 100.0, 400e3, 900e3)
    assert hot.log_kappa == pytest.approx(wigner(1e5, 100.0).log_kappa, abs=2e-6)
    assert hot.log_kappa == pytest.approx(0.0, abs=1e-6)
    parabola = 1.0 / math.sin(1.0)
    t = KELVIN_PER_CM * NU / 2.0
    errors = [
        math.exp(eckart(t, NU, barrier(a), barrier(a)).log_kappa) - parabola for a in (200.0, 2e4)
    ]
    assert parabola == pytest.approx(1.18840, abs=5e-6)
    assert math.exp(eckart(t, NU, barrier(200.0), barrier(200.0)).log_kappa) == pytest.approx(
        1.19054, abs=5e-6
    )
    assert abs(errors[1]) < abs(errors[0]) / 50.0


@pytest.mark.parametrize("bad", [(0.0, 1e3, 1e3), (100.0, -1.0, 1e3), (100.0, 1e3, math.nan)])
def test_what_is_not_positive_is_refused(bad: tuple[float, float, float]) -> None:
    with pytest.raises(ValueError, match="must be above 0, got"):
        eckart(300.0, *bad)
    with pytest.raises(ValueError, match="temperatures must be above 0"):
        wigner(0.0, 100.0)
