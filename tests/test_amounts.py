"""Amounts: every unit that a study may state them in, and what stays constant."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from declared_study import TEXT, edited, load

from thermo_pp.amounts import Surroundings
from thermo_pp.conditions import Held
from thermo_pp.errors import StudyError
from thermo_pp.kinetics.results import Rate

R, AVOGADRO, FARADAY = 8.31446261815324, 6.02214076e23, 96485.33212331001
GAS = Surroundings(total_pressure_pa=2e5)
HELD = 'held = { W = "1e-3 mol/L", W2 = "equilibrium" }'


@pytest.mark.parametrize(
    ("text", "form", "value"),
    [
        ("0.5 mol/L", "concentration", 0.5),
        ("2e14 cm^-3", "concentration", 2e14 * 1000.0 / AVOGADRO),
        ("2e14 molecule/cm3", "concentration", 2e14 * 1000.0 / AVOGADRO),
        ("2e14 molecules cm-3", "concentration", 2e14 * 1000.0 / AVOGADRO),
        ("20 mbar", "pressure", 2000.0),
        ("21 %", "pressure", 0.21 * 2e5),
        ("400 ppm", "pressure", 80.0),
        ("3 ppb", "pressure", 6e-4),
        ("0.21 mol/mol", "pressure", 42000.0),
        ("pH 7", "concentration", 1e-7),
        ("pH 3.5", "concentration", 10.0**-3.5),
        ("-0.4 V", "potential", -0.4),
        ("250 mV", "potential", 0.25),
    ],
)
def test_every_unit(text: str, form: str, value: float) -> None:
    found = GAS.amount(text, where="here")
    assert (found.form, found.text) == (form, text)
    assert found.value == pytest.approx(value, rel=1e-12)


@pytest.mark.parametrize(
    ("text", "sentence"),
    [
        ("0 ppm", "is not above 0 and at most 1"),
        ("120 %", "is not above 0 and at most 1"),
        ("21%%", "is neither a pressure nor a concentration|is not one number"),
        ("pH seven", "is not a number"),
        ("nan ppm", "is not a number"),
    ],
)
def test_no_amounts(text: str, sentence: str) -> None:
    with pytest.raises(StudyError, match=sentence):
        GAS.amount(text, where="here")


def test_mole_fraction_needs_a_pressure() -> None:
    with pytest.raises(StudyError, match="'400 ppm' is a mole fraction, and there is no total"):
        Surroundings().amount("400 ppm", where="here")


def test_electrons_at_a_potential() -> None:
    """Their activity is exp(-FE/RT), and its logarithm has the slope FE/RT."""
    held = Held("potential", -0.4, "-0.4 V")
    t = np.array([298.15, 350.0])
    assert held.concentration_mol_l(t) == pytest.approx(np.exp(0.4 * FARADAY / (R * t)), rel=1e-12)
    ahead, back = (
        np.log(held.concentration_mol_l(t + 0.01)),
        np.log(held.concentration_mol_l(t - 0.01)),
    )
    assert held.log_slope(t) == pytest.approx(t * (ahead - back) / 0.02, rel=1e-6)


def test_amounts_are_kept_in_the_form_that_stays() -> None:
    held = Surroundings(1e5, "concentration", 300.0).amount("400 ppm", where="here")
    assert held.form == "concentration"
    assert held.value == pytest.approx(40.0 / (1000.0 * R * 300.0), rel=1e-12)
    held = Surroundings(None, "pressure", 300.0).amount("0.01 mol/L", where="here")
    assert held.form == "pressure"
    assert held.value == pytest.approx(10.0 * R * 300.0, rel=1e-12)
    assert held.log_slope(np.array([300.0]))[0] == -1.0
    with pytest.raises(StudyError, match=r"'0.01 mol/L' is no pressure, which is what stays"):
        Surroundings(None, "pressure").amount("0.01 mol/L", where="here")


def free(folder: Path, *changes: tuple[str, str]) -> Rate:
    found = load(folder, edited(*changes)).effective().rates["free"]
    assert found is not None
    return found


def test_same_amount_in_every_unit(tmp_path: Path) -> None:
    """1e-3 mol/L at one temperature, as a number density, a pressure and a mole fraction."""
    one = ('temperatures = ["280 K", "25 degC"]', 'temperatures = ["25 degC"]')
    plain = free(tmp_path, one).rate_constant
    pascal = 1.0 * R * 298.15
    for amount, beside in (
        (f"{1e-6 * AVOGADRO!r} molecules/cm3", ""),
        (f"{pascal!r} Pa", ""),
        (f"{pascal / 1e5 * 100.0!r} %", 'total_pressure = "1 bar"'),
        (f"{pascal / 1e5 * 1e6!r} ppm", 'total_pressure = "1 bar"'),
    ):
        held = (HELD, f'held = {{ W = "{amount}", W2 = "equilibrium" }}\n{beside}')
        assert free(tmp_path, one, held).rate_constant == pytest.approx(plain, rel=1e-10)


@pytest.mark.parametrize("constant", ["concentration", "pressure"])
def test_arrhenius_energy_of_what_stays(constant: str, tmp_path: Path) -> None:
    """E_a is the slope of ln k over the grid on the chosen definition; the other stands beside it."""
    grid = ('temperatures = ["280 K", "25 degC"]', "temperatures = [297.15, 298.15, 299.15]")
    extra = f'constant = "{constant}"\nstated_at = "298.15 K"'
    for amount in ("1e-3 mol/L", "2479 Pa"):
        held = f'held = {{ W = "{amount}", W2 = "equilibrium" }}'
        rate = free(tmp_path, grid, (HELD, f"{held}\n{extra}"))
        both = rate.arrhenius_energy_constant_kj_mol
        assert rate.arrhenius_energy_kj_mol == pytest.approx(both[constant], abs=1e-9)
        log = np.log(rate.rate_constant)
        slope = -R * (log[2] - log[0]) / (1 / 299.15 - 1 / 297.15) / 1000.0
        assert rate.arrhenius_energy_kj_mol[1] == pytest.approx(slope, abs=2e-3)
        # between them stands the order times RT
        rt = R * 298.15 / 1000.0
        apart = both["concentration"][1] - both["pressure"][1]
        assert apart == pytest.approx(rate.orders["W"][1] * rt, abs=1e-9)
        assert rate.orders["W"][1] > 0.5


def test_form_decides_without_a_word(tmp_path: Path) -> None:
    """Without `constant` each amount stays in the form it is stated in."""
    stated = free(tmp_path)
    both = stated.arrhenius_energy_constant_kj_mol
    assert stated.arrhenius_energy_kj_mol == pytest.approx(both["concentration"], abs=1e-9)
    pressed = free(tmp_path, ("1e-3 mol/L", "24.79 mbar"))
    both = pressed.arrhenius_energy_constant_kj_mol
    assert pressed.arrhenius_energy_kj_mol == pytest.approx(both["pressure"], abs=1e-9)


@pytest.mark.parametrize(
    ("changes", "sentence"),
    [
        ([(HELD, f'{HELD}\nstated_at = "298 K"')], "stated_at says when amounts hold, but not"),
        ([(HELD, f'{HELD}\nconstant = "pressure"')], "'1e-3 mol/L' is no pressure"),
        (
            [(HELD, f'{HELD}\ntotal_pressure = "10 mbar"')],
            "W add up to .* times the total pressure",
        ),
        ([(HELD, f'{HELD}\ntotal_pressure = "0 bar"')], "is not above 0"),
        ([(HELD, f'{HELD}\nconstant = "volume"')], "volume"),
    ],
)
def test_what_is_refused(changes: list[tuple[str, str]], sentence: str, tmp_path: Path) -> None:
    with pytest.raises(StudyError, match=sentence):
        load(tmp_path, edited(*changes))


def test_nothing_of_it_in_solution(tmp_path: Path) -> None:
    text = TEXT.replace("[conditions]", '[treatment]\nphase = "solution"\n[conditions]')
    text = text.replace('barrier = "none"', 'barrier = "0 kJ/mol"')
    text = text.replace(HELD, f'{HELD}\nconstant = "pressure"')
    with pytest.raises(StudyError, match="constant has no meaning in a solution"):
        load(tmp_path, text)
