"""Crossings between spin states: the mean Landau-Zener probability, and steps that have one."""

from __future__ import annotations

from pathlib import Path

import mpmath as mp
import numpy as np
import pytest
from declared_study import edited, load
from scipy.integrate import solve_ivp

from thermo_pp.errors import StudyError
from thermo_pp.formulas.crossing import landau_zener
from thermo_pp.kinetics.results import EffectiveRate

R, K, HBAR = 8.31446261815324, 1.380649e-23, 6.62607015e-34 / (2 * np.pi)
JOULE_PER_CM = 1.986445857e-23
GRADIENT, MASS = 0.05 * 8.2387235e-8, 12.0 * 1.66053906892e-27  # hartree/bohr is 8.2387e-8 N


def strength(t: float, cm: float) -> float:
    """2 pi H^2/(hbar F v) at E = kT."""
    speed = np.sqrt(2 * K * t / MASS)
    return float(2 * np.pi * (cm * JOULE_PER_CM) ** 2 / (HBAR * GRADIENT * speed))


@pytest.mark.parametrize("cm", [0.5, 20.0, 200.0, 2000.0])
def test_mean_against_quadrature(cm: float) -> None:
    log, _ = landau_zener(300.0, cm * JOULE_PER_CM, GRADIENT, MASS)
    c = mp.mpf(strength(300.0, cm))
    mean = mp.quad(
        lambda x: -mp.expm1(-2 * c / mp.sqrt(x)) * mp.exp(-x), [0, 1e-6, 1e-3, 0.1, 1, 5, 20, 60]
    )
    assert float(np.exp(log)) == pytest.approx(float(mean), rel=1e-7)


@pytest.mark.parametrize("coupling", [0.2, 0.45])
def test_single_passage_against_the_equations_of_motion(coupling: float) -> None:
    """i c' = [[r t/2, H], [H, -r t/2]] c with hbar = 1 and r = F v: what stays is exp(-2 pi H^2/r).

    The formula's p is of the same exponent; 1 - p^2 is two passages of it.
    """
    rate, far = 1.0, 60.0

    def motion(t: float, c: np.ndarray) -> np.ndarray:
        half = 0.5 * rate * t
        return np.array(
            [-1j * (half * c[0] + coupling * c[1]), -1j * (coupling * c[0] - half * c[1])]
        )

    start = np.array([1.0 + 0j, 0.0])
    found = solve_ivp(motion, (-far, far), start, method="DOP853", rtol=1e-8, atol=1e-10)
    stays = abs(found.y[0, -1]) ** 2
    assert stays == pytest.approx(np.exp(-2 * np.pi * coupling**2 / rate), abs=2 * coupling / far)


def test_limits() -> None:
    """Weak coupling: 2 c sqrt(pi), which goes with T^-1/2; strong coupling: 1."""
    log, slope = landau_zener(300.0, 0.01 * JOULE_PER_CM, GRADIENT, MASS)
    assert np.exp(log) == pytest.approx(2 * strength(300.0, 0.01) * np.sqrt(np.pi), rel=1e-4)
    assert slope == pytest.approx(-0.5, abs=1e-3)
    log, slope = landau_zener(300.0, 1e5 * JOULE_PER_CM, GRADIENT, MASS)
    assert log == pytest.approx(0.0, abs=1e-10)
    assert slope == pytest.approx(0.0, abs=1e-10)


@pytest.mark.parametrize("cm", [1.0, 100.0, 600.0])
def test_slope(cm: float) -> None:
    t, h = np.array([200.0, 300.0, 800.0]), 1e-2
    _, slope = landau_zener(t, cm * JOULE_PER_CM, GRADIENT, MASS)
    ahead, back = (landau_zener(t + by, cm * JOULE_PER_CM, GRADIENT, MASS)[0] for by in (h, -h))
    assert slope == pytest.approx(t * (ahead - back) / (2 * h), abs=1e-8)


LAW = (
    'landau_zener = { spin_orbit = "100 cm^-1", gradient_difference = "0.05 hartree/bohr", '
    'reduced_mass = "12 u" }'
)


def crossed(
    folder: Path, law: str, temperatures: str = "[298.15]", more: str = ""
) -> EffectiveRate:
    text = edited(
        ('through = "TS1"', f'through = "TS1"\nkind = "crossing"\ncrossing = {{ {law} }}\n{more}'),
        ('temperatures = ["280 K", "25 degC"]', f"temperatures = {temperatures}"),
    )
    return load(folder, text).effective()


def test_step_is_that_much_slower(tmp_path: Path) -> None:
    plain = load(tmp_path, edited()).effective().steps[2]
    declared = crossed(tmp_path, "transmission = 0.01").steps[2]
    for name in ("forward_rate_constant", "reverse_rate_constant"):
        ratio = getattr(declared, name)[0] / getattr(plain, name)[1]
        assert ratio == pytest.approx(0.01, rel=1e-10)
    step = crossed(tmp_path, LAW).steps[2]
    expected, _ = landau_zener(298.15, 100.0 * JOULE_PER_CM, GRADIENT, MASS)
    assert step.log_transmission[0] == pytest.approx(float(expected), abs=1e-6)
    ratio = step.forward_rate_constant[0] / plain.forward_rate_constant[1]
    assert np.log(ratio) == pytest.approx(float(expected), abs=1e-6)


def test_arrhenius_energy(tmp_path: Path) -> None:
    rate = crossed(tmp_path, LAW, "[298.05, 298.15, 298.25]").rates["free"]
    assert rate is not None
    log = np.log(rate.rate_constant)
    slope = -R * (log[2] - log[0]) / (1 / 298.25 - 1 / 298.05) / 1000.0
    assert rate.arrhenius_energy_kj_mol[1] == pytest.approx(slope, abs=1e-5)
    assert sum(rate.control[name] for name in rate.saddles) == pytest.approx([1.0] * 3, abs=1e-10)


@pytest.mark.parametrize(
    ("law", "more", "sentence"),
    [
        ("", "", "neither transmission nor landau_zener"),
        (f"transmission = 0.1, {LAW}", "", "both transmission and landau_zener"),
        ("transmission = 1.1", "", "the transmission 1.1 is above 1"),
        ("transmission = 0.1", 'tunnelling = "wigner"', "nothing tunnels at a crossing point"),
        (LAW.replace("100 cm^-1", "0 cm^-1"), "", "spin_orbit is 0"),
        (LAW.replace("12 u", "12 kJ"), "", "'12 kJ' is not a quantity in kg"),
    ],
)
def test_what_is_refused(law: str, more: str, sentence: str, tmp_path: Path) -> None:
    with pytest.raises(StudyError, match=sentence):
        crossed(tmp_path, law, more=more)


@pytest.mark.parametrize(
    ("old", "new", "sentence"),
    [
        ('through = "TS1"', 'through = "TS1"\nkind = "crossing"', "a crossing without its"),
        ('through = "TS1"', 'through = "TS1"\ncrossing = { transmission = 1 }', "is no crossing"),
        (
            'rate = "2e7 L/mol/s"',
            'rate = "2e7 L/mol/s"\nkind = "crossing"\ncrossing = { transmission = 1 }',
            "a crossing goes through no point",
        ),
    ],
)
def test_one_without_the_other(old: str, new: str, sentence: str, tmp_path: Path) -> None:
    with pytest.raises(StudyError, match=sentence):
        load(tmp_path, edited((old, new)))
