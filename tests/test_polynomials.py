"""Polynomials: forms against Cantera, constraints, identities, and limits of what they can follow."""

from __future__ import annotations

import cantera
import numpy as np
import pytest

from thermo_pp.formulas.polynomials import Polynomial, Values, fitted
from thermo_pp.names import POLYNOMIAL_FORMS, PolynomialForm
from thermo_pp.units import GAS_J_MOL_K

BOUNDS = (200.0, 1000.0, 3000.0)
ROOM = 298.15
T = np.unique([*np.geomspace(200.0, 3000.0, 90), ROOM, 1000.0])
METHANE = [1306.0] * 3 + [1533.3] * 2 + [2916.5] + [3019.5] * 3


def oscillators(t: np.ndarray, start: float = -1.0e6) -> Values:
    """Nine oscillators on a constant heat capacity of 4 R."""
    x = 1.438776877 * np.array(METHANE) / t[:, np.newaxis]
    n = 1.0 / np.expm1(x)
    r = GAS_J_MOL_K
    return Values(
        r * (4.0 + (x**2 * n * (n + 1.0)).sum(-1)),
        r * (4.0 * t + t * (x * n).sum(-1)) + start,
        r * (4.0 * np.log(t) + (x * n - np.log(-np.expm1(-x))).sum(-1)),
    )


@pytest.fixture(scope="module", params=POLYNOMIAL_FORMS)
def polynomial(request: pytest.FixtureRequest) -> Polynomial:
    return fitted(request.param, T, oscillators(T), BOUNDS, ROOM)


def test_cantera_reads_the_coefficients_the_same_way(polynomial: Polynomial) -> None:
    """1e-9 relative: the two evaluate the same sums in another order."""
    low, middle, high = polynomial.bounds_k
    own = polynomial.coefficients
    if polynomial.form == "nasa7":
        thermo = cantera.NasaPoly2(low, high, 1e5, [middle, *own[1], *own[0]])
    elif polynomial.form == "nasa9":
        flat = [2, low, middle, *own[0], middle, high, *own[1]]
        thermo = cantera.Nasa9PolyMultiTempRegion(low, high, 1e5, flat)
    else:
        thermo = cantera.ShomatePoly2(low, high, 1e5, [middle, *own[0], *own[1]])
    for t in (200.0, ROOM, 700.0, 1300.0, 3000.0):
        got = polynomial.at(t)
        assert got.heat_capacity_j_mol_k == pytest.approx(thermo.cp(t) / 1000.0, rel=1e-9)
        assert got.enthalpy_j_mol == pytest.approx(thermo.h(t) / 1000.0, rel=1e-9)
        assert got.entropy_j_mol_k == pytest.approx(thermo.s(t) / 1000.0, rel=1e-9)


def test_room_temperature_is_met_exactly(polynomial: Polynomial) -> None:
    wanted, got = oscillators(np.array([ROOM])), polynomial.at([ROOM])
    assert got.enthalpy_j_mol == pytest.approx(wanted.enthalpy_j_mol, abs=1e-6, rel=0.0)
    assert got.entropy_j_mol_k == pytest.approx(wanted.entropy_j_mol_k, abs=1e-9, rel=0.0)


def test_the_ranges_meet(polynomial: Polynomial) -> None:
    """Cp, H and S at 1000 K from either side, by the upper coefficients put below."""
    upper = Polynomial(polynomial.form, BOUNDS, polynomial.coefficients[[1, 1]])
    for below, above in zip(polynomial.at(1000.0), upper.at(1000.0), strict=True):
        assert below == pytest.approx(above, abs=1e-6, rel=1e-12)


def test_it_is_one_function(polynomial: Polynomial) -> None:
    """Cp = dH/dT = T dS/dT by central differences; 1e-4 J/(mol K) is their own error."""
    t, step = np.array([250.0, 500.0, 1500.0, 2900.0]), 0.05
    up, down, here = polynomial.at(t + step), polynomial.at(t - step), polynomial.at(t)
    of_h = (up.enthalpy_j_mol - down.enthalpy_j_mol) / (2 * step)
    of_s = t * (up.entropy_j_mol_k - down.entropy_j_mol_k) / (2 * step)
    assert here.heat_capacity_j_mol_k == pytest.approx(of_h, abs=1e-4, rel=0.0)
    assert here.heat_capacity_j_mol_k == pytest.approx(of_s, abs=1e-4, rel=0.0)


@pytest.mark.parametrize(("form", "most"), [("nasa7", 2.0), ("nasa9", 1.0), ("shomate", 25.0)])
def test_it_follows_oscillators(form: PolynomialForm, most: float) -> None:
    """G within so many J/mol: regression, a third above what was found; more terms follow better."""
    wanted, got = oscillators(T), fitted(form, T, oscillators(T), BOUNDS, ROOM).at(T)
    gibbs = (got.enthalpy_j_mol - wanted.enthalpy_j_mol) - T * (
        got.entropy_j_mol_k - wanted.entropy_j_mol_k
    )
    assert np.abs(gibbs).max() < most


def test_what_a_form_can_say_is_found_exactly() -> None:
    """A nasa7 polynomial fitted by nasa7 comes back: the equations are well conditioned."""
    own = np.array([3.5, 1e-3, -4e-7, 1e-10, -1e-14, -1.2e4, 5.0])
    truth = Polynomial("nasa7", BOUNDS, np.array([own, own]))
    back = fitted("nasa7", T, truth.at(T), BOUNDS, ROOM)
    assert back.coefficients == pytest.approx(truth.coefficients, rel=1e-6)


@pytest.mark.parametrize("form", POLYNOMIAL_FORMS)
def test_constants_stay_constants(form: PolynomialForm) -> None:
    """No heat capacity: exact zeros, or Cantera calls the rounding a discontinuity."""
    flat = Values(np.zeros_like(T), np.full_like(T, -5.0e4), np.full_like(T, 250.0))
    got = fitted(form, T, flat, BOUNDS, ROOM)
    assert not got.coefficients[:, :-2].any()
    assert got.at(T).enthalpy_j_mol == pytest.approx(-5.0e4, rel=1e-14)
    assert got.at(T).entropy_j_mol_k == pytest.approx(250.0, rel=1e-14)


def test_raised_adds_to_the_enthalpy_alone(polynomial: Polynomial) -> None:
    up, here = polynomial.raised(5.0e4).at(T), polynomial.at(T)
    assert up.enthalpy_j_mol - here.enthalpy_j_mol == pytest.approx(5.0e4, rel=1e-9)
    assert np.array_equal(up.entropy_j_mol_k, here.entropy_j_mol_k)


def test_a_callers_mistakes_are_refused(polynomial: Polynomial) -> None:
    with pytest.raises(ValueError, match="from 200 to 3000 K"):
        polynomial.at(3000.1)
    with pytest.raises(ValueError, match="anchor"):
        fitted("nasa7", T[T != ROOM], oscillators(T[T != ROOM]), BOUNDS, ROOM)
    few = T[(T < 1000.0) | (T > 2900.0)]
    with pytest.raises(ValueError, match="too few"):
        fitted("nasa7", few, oscillators(few), BOUNDS, ROOM)
    with pytest.raises(ValueError, match="rise"):
        fitted("nasa7", T, oscillators(T), (200.0, 3000.0, 1000.0), ROOM)
