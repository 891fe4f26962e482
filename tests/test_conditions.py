"""Conditions: temperatures, standard states, held amounts."""

from __future__ import annotations

import math

import numpy as np
import pytest

from thermo_pp.conditions import (
    MOST_TEMPERATURES,
    Held,
    StandardState,
    held,
    standard_state,
    temperature,
    temperature_range,
    temperatures,
)
from thermo_pp.errors import StudyError
from thermo_pp.units import GAS_J_MOL_K

R = GAS_J_MOL_K


@pytest.mark.parametrize(
    ("text", "form", "value"),
    [
        ("1 bar", "pressure", 1e5),
        ("1 atm", "pressure", 101325.0),
        ("1 mol/L", "concentration", 1.0),
        ("55.34 mol/L", "concentration", 55.34),
    ],
)
def test_standard_state(text: str, form: str, value: float) -> None:
    state = standard_state(text, where="here")
    assert (state.form, state.text) == (form, text)
    assert state.value == pytest.approx(value, rel=1e-12, abs=0.0)


TABLE = [  # 1 bar -> 1 mol/L and 1 atm -> 1 bar, kJ/mol a species: the project's check values, section 3 (computed)
    (273.15, 7.09228, -0.029894),
    (298.15, 7.95850, -0.032630),
    (373.15, 10.65663, -0.040839),
    (500.0, 15.49581, -0.054722),
    (1000.0, 36.75476, -0.109443),
]


@pytest.mark.parametrize(("kelvin", "to_molar", "atm_to_bar"), TABLE)
def test_change_of_standard_state(kelvin: float, to_molar: float, atm_to_bar: float) -> None:
    molar = R * kelvin * standard_state("1 mol/L", where="here").log_ratio_to_bar(kelvin) / 1000.0
    atm = R * kelvin * standard_state("1 atm", where="here").log_ratio_to_bar(kelvin) / 1000.0
    assert float(molar) == pytest.approx(to_molar, abs=5e-6, rel=0.0)
    assert float(-atm) == pytest.approx(atm_to_bar, abs=5e-7, rel=0.0)


@pytest.mark.parametrize("text", ["1 bar", "3 atm", "1 mol/L", "0.1 mmol/L"])
def test_slope_of_the_standard_state_is_its_derivative(text: str) -> None:
    state = standard_state(text, where="here")
    t, step = 300.0, 0.01
    above, below = state.log_ratio_to_bar(t + step), state.log_ratio_to_bar(t - step)
    slope = t * float(above - below) / (2.0 * step)
    assert state.log_ratio_slope == pytest.approx(slope, abs=1e-8, rel=0.0)


def test_standard_state_takes_any_shape() -> None:
    t = np.array([[280.0, 300.0], [320.0, 340.0]])
    for text in ("1 bar", "1 mol/L"):
        assert standard_state(text, where="here").log_ratio_to_bar(t).shape == (2, 2)


@pytest.mark.parametrize(
    ("value", "what"),
    [
        ("1 bra", "'1 bra' is neither a pressure nor a concentration"),
        ("1 K", "'1 K' is neither a pressure nor a concentration"),
        ("0 bar", "standard state '0 bar' is not above 0"),
        ("-1 mol/L", "standard state '-1 mol/L' is not above 0"),
        ("1", "'1' has no unit"),
        (1.0, "expected a standard state, found 1.0"),
    ],
)
def test_no_standard_state(value: object, what: str) -> None:
    with pytest.raises(StudyError) as caught:
        standard_state(value, where="here")
    assert caught.value.what == what
    assert caught.value.mend == (
        'write a pressure or a concentration: "1 bar", "1 atm" or "1 mol/L"'
    )


def test_held_concentration() -> None:
    amount = held("2e-4 mol/L", where="here")
    assert amount == Held("concentration", 2e-4, "2e-4 mol/L")
    assert amount.concentration_mol_l([280.0, 360.0]) == pytest.approx(2e-4, rel=1e-15, abs=0.0)


def test_held_pressure_is_an_ideal_gas() -> None:
    amount = held("20 mbar", where="here")
    assert amount.form == "pressure"
    # c = p/RT by hand: 2000 Pa / (8.314462618 J/(mol K) 300 K) = 0.801818 mol/m^3
    assert float(amount.concentration_mol_l(300.0)) == pytest.approx(8.01818e-4, rel=1e-5, abs=0.0)


def test_held_at_equilibrium_has_no_value_of_its_own() -> None:
    amount = held("equilibrium", where="here")
    assert amount == Held("equilibrium", None, "equilibrium")
    with pytest.raises(ValueError, match="follows from the mechanism"):
        amount.concentration_mol_l(300.0)


@pytest.mark.parametrize(
    ("value", "what"),
    [
        ("-1e-3 mol/L", "concentration '-1e-3 mol/L' is not above 0"),
        ("0 mol/L", "concentration '0 mol/L' is not above 0"),
        ("equilibrum", "'equilibrum' is not a number"),
        ("1 kJ/mol", "'1 kJ/mol' is neither a pressure nor a concentration"),
        (1e-3, "expected a concentration, found 0.001"),
    ],
)
def test_no_held_amount(value: object, what: str) -> None:
    with pytest.raises(StudyError) as caught:
        held(value, where="here")
    assert caught.value.what == what
    assert caught.value.mend == (
        'write a concentration ("2e-4 mol/L"), a partial pressure ("20 mbar") or "equilibrium"'
    )


def test_a_range_includes_its_end() -> None:
    kelvin = temperature_range("280 K", "360 K", "5 K", where="here")
    assert kelvin == tuple(float(t) for t in range(280, 361, 5))
    assert temperature_range("25 degC", "35 degC", "5 K", where="here") == (298.15, 303.15, 308.15)
    assert temperature_range(280, 280, 5, where="here") == (280.0,)
    tenths = temperature_range("280 K", "281 K", "0.1 K", where="here")
    assert len(tenths) == 11
    assert tenths[3] == 280.3


@pytest.mark.parametrize(
    ("args", "what"),
    [
        (("280 K", "360 K", "0 K"), "no temperatures from 280 K to 360 K in steps of 0 K"),
        (("280 K", "360 K", "-5 K"), "no temperatures from 280 K to 360 K in steps of -5 K"),
        (("360 K", "280 K", "5 K"), "no temperatures from 360 K to 280 K in steps of 5 K"),
        (("280 K", "360 K", "7 K"), "no whole number of steps of 7 K leads from 280 K to 360 K"),
        (("280 K", "360 K", "5 degC"), "step '5 degC' is not in K"),
        (("0 K", "360 K", "5 K"), "temperature '0 K' is not above 0 K"),
        (("280 K", "1280 K", "0.001 K"), "1000001 temperatures from 280 K to 1280 K"),
    ],
)
def test_no_range(args: tuple[str, str, str], what: str) -> None:
    with pytest.raises(StudyError) as caught:
        temperature_range(*args, where="here")
    assert caught.value.what == what


def test_a_list_keeps_its_order() -> None:
    assert temperatures(["350 K", 298.15, "10 degC"], where="here") == (350.0, 298.15, 283.15)


@pytest.mark.parametrize(
    ("values", "what"),
    [
        ([], "the list of temperatures is empty"),
        (["0 K"], "temperature '0 K' is not above 0 K"),
        (["-300 degC"], "temperature '-300 degC' is not above 0 K"),
        ([300, 300], "300 stands twice in the list of temperatures"),
        (
            ["25 degC", "298.15 K"],
            "'25 degC' and '298.15 K' are the same in the list of temperatures",
        ),
        (range(1, MOST_TEMPERATURES + 2), f"{MOST_TEMPERATURES + 1} temperatures"),
    ],
)
def test_no_list(values: list[object], what: str) -> None:
    with pytest.raises(StudyError) as caught:
        temperatures(values, where="here")
    assert caught.value.what == what
    assert caught.value.where == "here"


def test_one_temperature() -> None:
    assert temperature("25 degC", where="here") == 298.15
    assert temperature(298.15, where="here") == 298.15
    with pytest.raises(StudyError, match="'10\\*\\*10\\*\\*10 K' is not one number and a unit"):
        temperature("10**10**10 K", where="here")


def test_pressure_and_concentration_meet() -> None:
    t = 298.15
    at_bar = 1e5 / (1000.0 * R * t)  # mol/L of an ideal gas at 1 bar
    state = StandardState("concentration", at_bar, "")
    assert float(state.log_ratio_to_bar(t)) == pytest.approx(0.0, abs=1e-14, rel=0.0)
    assert math.isclose(at_bar, 0.04033955, rel_tol=2e-7)  # check values, section 3
