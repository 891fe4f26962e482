"""Units: the constants, and the one way from a text to a number."""

from __future__ import annotations

import math

import pint
import pytest
from hypothesis import given
from hypothesis import strategies as st

from thermo_pp import units
from thermo_pp.errors import StudyError
from thermo_pp.units import convert, quantity, split_quantity

CODATA_2022 = {  # SciPy 1.17 `scipy.constants`, CODATA 2022, as listed in the project's check values, section 0
    "BOLTZMANN_J_K": 1.380649e-23,
    "PLANCK_J_S": 6.62607015e-34,
    "AVOGADRO_MOL": 6.02214076e23,
    "LIGHT_M_S": 299792458.0,
    "GAS_J_MOL_K": 8.31446261815324,
    "ATOMIC_MASS_KG": 1.66053906892e-27,
    "HARTREE_J": 4.3597447222060e-18,
    "BOHR_M": 5.29177210544e-11,
    "ELECTRON_MASS_KG": 9.1093837139e-31,
}
DERIVED = {  # the same list: value and half a unit of its last digit (a whole one where it is cut off there)
    "HARTREE_KJ_MOL": (2625.4996395, 5e-8),
    "EV_KJ_MOL": (96.48533212, 5e-9),
    "WAVENUMBER_KJ_MOL": (0.01196265656, 5e-12),
    "KELVIN_PER_CM": (1.438776877, 1e-9),
    "HARTREE_CM": (219474.63136, 5e-6),
}


@pytest.mark.parametrize("name", CODATA_2022)
def test_constants_are_codata_2022(name: str) -> None:
    assert getattr(units, name) == pytest.approx(CODATA_2022[name], rel=1e-14, abs=0.0)


@pytest.mark.parametrize("name", DERIVED)
def test_derived_constants(name: str) -> None:
    value, half_digit = DERIVED[name]
    assert getattr(units, name) == pytest.approx(value, abs=half_digit, rel=0.0)


def test_the_gas_constant_is_the_product() -> None:
    product = units.BOLTZMANN_J_K * units.AVOGADRO_MOL
    assert product == pytest.approx(units.GAS_J_MOL_K, rel=1e-15, abs=0.0)


ACCEPTED = [  # text, unit, value: by hand from the definitions
    ("25 degC", "K", 298.15),
    ("298.15 K", "K", 298.15),
    (" +2.9815e2  K ", "K", 298.15),
    ("77 degF", "K", 298.15),
    ("1 atm", "Pa", 101325.0),
    ("20 mbar", "Pa", 2000.0),
    ("100 kPa", "Pa", 1e5),
    ("0.5 mol/L", "mol/L", 0.5),
    ("1 mM", "mol/L", 1e-3),
    ("6.02214076e20 molecules/cm^3", "mol/L", 1.0),
    ("6.02214076e20 cm^-3", "mol/L", 1.0),
    ("1 kcal/mol", "kJ/mol", 4.184),
    ("1 Eh", "kJ/mol", units.HARTREE_KJ_MOL),
    ("1 hartree", "kJ/mol", units.HARTREE_KJ_MOL),
    ("1 eV", "kJ/mol", units.EV_KJ_MOL),
    ("100 cm^-1", "kJ/mol", 100.0 * units.WAVENUMBER_KJ_MOL),
    ("100 cm^-1", "1/cm", 100.0),
    ("45 cal/mol/K", "J/mol/K", 188.28),
    ("188.8 J/(mol K)", "J/mol/K", 188.8),
    ("5 s^-1", "1/s", 5.0),
    ("1e9 L/mol/s", "L/mol/s", 1e9),
    ("1e9 M^-1 s^-1", "L/mol/s", 1e9),
    ("1e-11 cm^3/s", "L/mol/s", 6.02214076e9),
    ("1e-11 cm^3 molecule^-1 s^-1", "L/mol/s", 6.02214076e9),
    ("1e12 cm^3/mol/s", "L/mol/s", 1e9),
    ("1e-31 cm^6/s", "L^2/mol^2/s", 1e-31 * 6.02214076e23**2 * 1e-6),
    ("0.89 mPa s", "Pa*s", 8.9e-4),
    ("0.89 cP", "Pa*s", 8.9e-4),
]


@pytest.mark.parametrize(("text", "unit", "value"), ACCEPTED)
def test_accepted(text: str, unit: str, value: float) -> None:
    assert quantity(text, unit, where="here") == pytest.approx(value, rel=1e-12, abs=0.0)


K = 'write one number and its unit, for instance "298.15 K" or "25 degC"'


@pytest.mark.parametrize("unit", ["bar", "atm"])
@pytest.mark.parametrize("number", [1.0, 0.986923266716, 3.7e-5])
def test_pressures_without_the_unit_library_are_what_it_gives(unit: str, number: float) -> None:
    theirs = pint.UnitRegistry().Quantity(number, unit).to("Pa").magnitude
    assert convert(number, unit, "Pa", where="x") == theirs


PA = 'write one number and its unit, for instance "1 bar", "1 atm" or "100 Pa"'
REFUSED = [
    ("10**10**10 K", "K", "'10**10**10 K' is not one number and a unit", K),
    ("2 3 K", "K", "'2 3 K' is not one number and a unit", K),
    ("1e K", "K", "'1e K' is not a quantity in K", K),
    ("1,5 K", "K", "'1,5 K' is not one number and a unit", K),
    ("0x10 K", "K", "'0x10 K' is not one number and a unit", K),
    ("1 K; import os", "K", "'1 K; import os' is not one number and a unit", K),
    ("1 __class__", "K", "'1 __class__' is not one number and a unit", K),
    ("5 K^99", "K", "'5 K^99' is not one number and a unit", K),
    ("nan K", "K", "'nan K' is not a number", K),
    ("inf K", "K", "'inf K' is not a number", K),
    ("1e999 K", "K", "'1e999 K' is not a finite number", K),
    ("", "K", "'' is not a number", K),
    ("298.15", "K", "'298.15' has no unit", K),
    ("1 bra", "Pa", "'1 bra' is not a quantity in Pa", PA),
    ("1 bar", "K", "'1 bar' is not a quantity in K", K),
    ("1 mol/L", "Pa", "'1 mol/L' is not a quantity in Pa", PA),
    (True, "K", "expected a quantity, found True", K),
    (None, "K", "expected a quantity, found None", K),
    ([1.0], "K", "expected a quantity, found [1.0]", K),
    (math.nan, "K", "nan is not a finite number", K),
    (-math.inf, "K", "-inf is not a finite number", K),
    (
        "5 s^-1",
        "L/mol/s",
        "'5 s^-1' is not a quantity in L/mol/s",
        "write one number and its unit, for instance 1.0 L/mol/s",
    ),
]


@pytest.mark.parametrize(("value", "unit", "what", "mend"), REFUSED)
def test_refused(value: object, unit: str, what: str, mend: str) -> None:
    with pytest.raises(StudyError) as caught:
        quantity(value, unit, where="study.toml [treatment] x")
    assert caught.value.what == what
    assert caught.value.mend == mend
    assert caught.value.where == "study.toml [treatment] x"


@pytest.mark.parametrize("text", ["-50 kJ", "1 J"])
def test_an_energy_without_an_amount_is_refused(text: str) -> None:
    with pytest.raises(StudyError):
        quantity(text, "kJ/mol", where="here")


def test_torr() -> None:
    value = quantity("760 Torr", "Pa", where="here")
    assert value == pytest.approx(101325.0, rel=1e-12, abs=0.0)


def test_a_huge_whole_number_is_refused() -> None:
    with pytest.raises(StudyError):
        quantity(10**400, "K", where="here")


def test_a_bare_number_is_in_the_unit() -> None:
    assert quantity(350, "K", where="here") == 350.0
    assert quantity(0.5, "mol/L", where="here") == 0.5


def test_a_pint_quantity() -> None:
    import pint

    registry = pint.UnitRegistry()
    given_quantity = registry.Quantity(25.0, "degC")
    assert quantity(given_quantity, "K", where="here") == pytest.approx(298.15, abs=1e-10, rel=0.0)
    with pytest.raises(StudyError):
        quantity(registry.Quantity(25.0, "meter"), "K", where="here")


def test_split() -> None:
    assert split_quantity("1.5e-3 mol/L", "mol/L", where="here") == (1.5e-3, "mol/L")
    with pytest.raises(StudyError, match=r"'5' has no unit"):
        split_quantity("5", "K", where="here")


@given(st.floats(min_value=-1e6, max_value=1e6))
def test_units_of_energy_lead_back(number: float) -> None:
    for unit, per_kj in units.ENERGY_PER_KJ_MOL.items():
        assert convert(number * per_kj, unit, "kJ/mol", where="here") == pytest.approx(
            number, rel=1e-12, abs=1e-300
        )


@given(st.text(max_size=12))
def test_no_text_does_anything_but_be_read_or_refused(text: str) -> None:
    try:
        value = quantity(text, "K", where="here")
    except StudyError:
        return
    assert math.isfinite(value)
