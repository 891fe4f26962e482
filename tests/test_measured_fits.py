"""Fits of measured rate constants: published expressions come back from points; covariance against numpy and scipy.

Expressions (k in cm, molecule, s):
2 NO + O2: 3.3e-39 exp(530/T), 273-600 K, IUPAC evaluation (Atkinson et al., Atmos. Chem. Phys. 2004, 4, 1461).
SO3 + 2 H2O: 2.26e-43 T exp(6544/T), 250-360 K, Lovejoy, Hanson, Huey, J. Phys. Chem. 1996, 100, 19911.
OH + dimethyl sulfide, addition: 9.5e-39 [O2] exp(5270/T)/(1 + 7.5e-29 [O2] exp(5610/T)), 240-360 K, IUPAC evaluation,
parameters as public atmospheric mechanisms have them.
OH + acetone: 8.8e-12 exp(-1320/T) + 1.7e-14 exp(423/T), 202-395 K, Wollenhaupt et al., JPCA 2000, 104, 2695.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.optimize import curve_fit

from thermo_pp.conditions import StandardState, standard_state
from thermo_pp.measured.fits import FORMS, R_KJ, Fit, NoFitError, fit
from thermo_pp.measured.units import rate_unit

BAR = standard_state("1 bar", where="test")
MOLAR = standard_state("1 mol/L", where="test")
CM3 = rate_unit("cm^3 molecule^-1 s^-1", where="test")
CM6 = rate_unit("cm^6 molecule^-2 s^-1", where="test")
ROOM = np.array([298.15])
OXYGEN = 5.2e18  # molecules/cm3, 0.21 bar at about 298 K


def nitric_oxide(t: np.ndarray) -> np.ndarray:
    return 3.3e-39 * np.exp(530.0 / t)


def sulfur_trioxide(t: np.ndarray) -> np.ndarray:
    return 2.26e-43 * t * np.exp(6544.0 / t)


def sulfide(t: np.ndarray) -> np.ndarray:
    bound = OXYGEN * np.exp(5610.0 / t) * 7.5e-29
    return 9.5e-39 * OXYGEN * np.exp(5270.0 / t) / (1.0 + bound)


def acetone(t: np.ndarray) -> np.ndarray:
    return 8.8e-12 * np.exp(-1320.0 / t) + 1.7e-14 * np.exp(423.0 / t)


def fitted(
    form: str, k: np.ndarray, t: np.ndarray, unit: object, state: StandardState = BAR
) -> Fit:
    own = unit
    assert isinstance(own, type(CM3))
    sigma = np.full(len(t), 0.05)
    return fit(form, t, np.log(k * own.factor), sigma, own.order, state)  # type: ignore[arg-type]


def test_nitric_oxide_comes_back() -> None:
    t = np.linspace(273.0, 600.0, 12)
    found = fitted("arrhenius", nitric_oxide(t), t, CM6)
    log_factor, energy = found.values
    assert np.exp(log_factor) / CM6.factor == pytest.approx(3.3e-39, rel=1e-9)
    assert energy / R_KJ == pytest.approx(-530.0, abs=1e-7, rel=0.0)
    # checks: -4.407 kJ/mol at 298.15 K
    assert found.energy_kj_mol(ROOM)[0][0] == pytest.approx(-4.407, abs=5e-4, rel=0.0)


def test_eyring_of_nitric_oxide() -> None:
    """H -11.844, G 66.965 kJ/mol, S -264.33 J/(mol K) at 298.15 K, 1 bar, of the expression (E_a - 3RT)."""
    t = np.array([298.05, 298.15, 298.25])
    found = fitted("eyring", nitric_oxide(t), t, CM6)
    enthalpy, entropy = found.values
    assert enthalpy == pytest.approx(-11.844, abs=5e-4, rel=0.0)
    assert entropy == pytest.approx(-264.33, abs=5e-3, rel=0.0)
    assert enthalpy - 0.29815 * entropy == pytest.approx(66.965, abs=5e-4, rel=0.0)
    assert found.energy_kj_mol(ROOM)[0][0] == pytest.approx(enthalpy + 3 * R_KJ * 298.15, abs=1e-9)
    # against 1 mol/L: E_a - RT whatever the order
    molar = fitted("eyring", nitric_oxide(t), t, CM6, MOLAR)
    assert molar.values[0] == pytest.approx(-4.40666 - R_KJ * 298.15, abs=5e-4, rel=0.0)


def test_sulfur_trioxide_comes_back() -> None:
    t = np.linspace(250.0, 360.0, 12)
    found = fitted("power", sulfur_trioxide(t), t, CM6)
    log_factor, power, energy = found.values
    assert power == pytest.approx(1.0, abs=1e-8, rel=0.0)
    assert energy / R_KJ == pytest.approx(-6544.0, abs=1e-5, rel=0.0)
    assert np.exp(log_factor) / CM6.factor / 298.15 == pytest.approx(2.26e-43, rel=1e-8)
    assert found.energy_kj_mol(ROOM)[0][0] == pytest.approx(-51.93, abs=5e-3, rel=0.0)


def test_dimethyl_sulfide_comes_back() -> None:
    """Saturated pre-equilibrium: 1/k = 1/k1 + 1/k2, k2 = (9.5e-39/7.5e-29) exp(-340/T)."""
    t = np.linspace(240.0, 360.0, 13)
    found = fitted("series", sulfide(t), t, CM3)
    low, low_energy, high, high_energy = found.values
    assert np.exp(low) / CM3.factor == pytest.approx(9.5e-39 * OXYGEN, rel=1e-6)
    assert np.exp(high) / CM3.factor == pytest.approx(9.5e-39 / 7.5e-29, rel=1e-6)
    assert low_energy / R_KJ == pytest.approx(-5270.0, abs=1e-3, rel=0.0)
    assert high_energy / R_KJ == pytest.approx(340.0, abs=1e-3, rel=0.0)
    # checks: -41.26 at 298.15 K, E_a = 0 at 229.86 K
    assert found.energy_kj_mol(ROOM)[0][0] == pytest.approx(-41.26, abs=5e-3, rel=0.0)
    assert found.energy_kj_mol(np.array([229.86]))[0][0] == pytest.approx(0.0, abs=5e-3)


def test_acetone_comes_back() -> None:
    t = np.linspace(202.0, 395.0, 13)
    found = fitted("parallel", acetone(t), t, CM3)
    assert np.exp(found.values[[0, 2]]) / CM3.factor == pytest.approx([1.7e-14, 8.8e-12], rel=1e-6)
    # checks: +5.17 at 298.15 K, E_a = 0 at 235.95 K
    assert found.energy_kj_mol(ROOM)[0][0] == pytest.approx(5.17, abs=5e-3, rel=0.0)
    assert found.energy_kj_mol(np.array([235.95]))[0][0] == pytest.approx(0.0, abs=2e-3)


@pytest.fixture(scope="module")
def noisy() -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    random = np.random.default_rng(5)
    t = np.linspace(250.0, 400.0, 16)
    sigma = random.uniform(0.02, 0.1, len(t))
    return t, np.log(1e8 * acetone(t)) + sigma * random.standard_normal(len(t)), sigma


def test_covariance_of_numpy(noisy: tuple[np.ndarray, np.ndarray, np.ndarray]) -> None:
    """A straight line against numpy.polyfit, weighted (unscaled) and not (scaled by the scatter)."""
    t, y, sigma = noisy
    for weights, scaled, given in ((1.0 / sigma, "unscaled", sigma), (None, True, None)):
        line, covariance = np.polyfit(1.0 / t, y, 1, w=weights, cov=scaled)
        found = fit("arrhenius", t, y, given, 2, BAR)
        to = np.array([[0.0, 1.0], [-R_KJ, 0.0]])
        assert found.values == pytest.approx(to @ line, rel=1e-9)
        assert found.covariance == pytest.approx(to @ covariance @ to.T, rel=1e-8)
        assert found.weighted is (given is not None)


@pytest.mark.parametrize("form", ["power", "parallel"])
def test_covariance_of_scipy(noisy: tuple[np.ndarray, np.ndarray, np.ndarray], form: str) -> None:
    t, y, sigma = noisy

    def power(at: np.ndarray, a: float, n: float, e: float) -> np.ndarray:
        return a + n * np.log(at / 298.15) - e / (R_KJ * at)

    def parallel(at: np.ndarray, a: float, e: float, b: float, f: float) -> np.ndarray:
        return np.logaddexp(a - e / (R_KJ * at), b - f / (R_KJ * at))

    function = power if form == "power" else parallel
    for given in (sigma, None):
        found = fit(form, t, y, given, 2, BAR)  # type: ignore[arg-type]
        start = found.values * 1.001
        values, covariance = curve_fit(
            function,
            t,
            y,
            start,
            sigma=given,
            absolute_sigma=given is not None,
            xtol=1e-14,
            ftol=1e-14,
        )
        assert found.values == pytest.approx(values, rel=1e-5)
        assert found.deviations == pytest.approx(np.sqrt(np.diag(covariance)), rel=1e-3)


@pytest.mark.parametrize("form", FORMS)
def test_energy_is_the_slope_of_the_fit(form: str) -> None:
    """E_a and its deviation against differences of ln k and of its parameters' samples."""
    t = np.linspace(230.0, 380.0, 14)
    k = sulfide(t) if form == "series" else acetone(t)
    found = fitted(form, k, t, CM3)
    at, h = np.array([260.0, 310.0]), 0.01
    slope = (found.log(at + h)[0] - found.log(at - h)[0]) / (2.0 * h)
    assert found.energy_kj_mol(at)[0] == pytest.approx(R_KJ * at**2 * slope, abs=1e-5, rel=1e-6)
    up, down = (fit(form, t, np.log(k * CM3.factor) + d * (t == t[4]), np.full(14, 0.05), 2, BAR)
                for d in (1e-4, -1e-4))  # type: ignore[arg-type]  # fmt: skip
    # one of 14 independent points moved: its share of the variance is below the whole
    for which in ("log", "energy_kj_mol"):
        moved = (getattr(up, which)(at)[0] - getattr(down, which)(at)[0]) / 2e-4 * 0.05
        assert np.all(np.abs(moved) < getattr(found, which)(at)[1])


def test_deviations_are_those_of_repeated_measurements() -> None:
    """Standard deviations of ln k and E_a against the spread of 400 fits of noisy points."""
    random = np.random.default_rng(11)
    t = np.linspace(240.0, 360.0, 13)
    for form in ("arrhenius", "eyring", "power", "series"):
        clean = np.log(sulfide(t) * CM3.factor)
        logs, energies = [], []
        for _ in range(400):
            try:
                one = fit(
                    form, t, clean + 0.01 * random.standard_normal(13), np.full(13, 0.01), 2, BAR
                )
            except NoFitError:
                continue
            logs.append(one.log(ROOM)[0][0])
            energies.append(one.energy_kj_mol(ROOM)[0][0])
        known = fit(form, t, clean, np.full(13, 0.01), 2, BAR)
        # 400 samples: a standard deviation is known to 3.5 %, four times that are allowed
        assert np.std(logs) == pytest.approx(known.log(ROOM)[1][0], rel=0.15), form
        assert np.std(energies) == pytest.approx(known.energy_kj_mol(ROOM)[1][0], rel=0.15), form


def test_band_and_chance() -> None:
    t = np.linspace(250.0, 400.0, 6)
    y = 5.0 - 1000.0 / t + np.array([0.1, -0.1, 0.05, -0.05, 0.1, -0.1])
    weighted = fit("arrhenius", t, y, np.full(6, 0.1), 1, BAR)
    scatter = fit("arrhenius", t, y, None, 1, BAR)
    assert weighted.band_factor() == pytest.approx(1.959964, abs=1e-6)  # normal, 95 %
    assert scatter.band_factor() == pytest.approx(2.776445, abs=1e-6)  # Student, 4 degrees, 95 %
    assert scatter.chance is None
    assert weighted.chance is not None
    assert weighted.chance == pytest.approx(
        np.exp(-weighted.chi_square / 2) * (1 + weighted.chi_square / 2)
    )


def test_ill_conditioned_temperatures() -> None:
    """A narrow range far from 0: the centred columns keep the digits."""
    t = np.linspace(298.0, 298.3, 7)
    found = fitted("power", sulfur_trioxide(t), t, CM6)
    assert found.energy_kj_mol(ROOM)[0][0] == pytest.approx(-51.93089, abs=1e-4, rel=0.0)
    assert found.log(ROOM)[0][0] == pytest.approx(
        np.log(sulfur_trioxide(298.15) * CM6.factor), abs=1e-10
    )


def test_too_little_is_refused() -> None:
    t, y = np.array([280.0, 300.0, 300.0]), np.array([1.0, 2.0, 2.1])
    with pytest.raises(
        NoFitError, match="3 parameters need 3 temperatures and, with standard deviations, 3 points"
    ):
        fit("power", t, y, np.full(3, 0.1), 1, BAR)
    with pytest.raises(
        NoFitError, match=r"without standard deviations, 4 points; there are 3 and 3"
    ):
        fit("power", np.array([280.0, 290.0, 300.0]), y, None, 1, BAR)
    straight = np.linspace(250.0, 400.0, 9)
    for form in ("series", "parallel"):
        with pytest.raises(NoFitError, match=r"straight over 1/T|do not tell two constants apart"):
            fit(form, straight, 5.0 - 1000.0 / straight, np.full(9, 0.05), 1, BAR)  # type: ignore[arg-type]
