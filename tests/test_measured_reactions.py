"""Measured free energies of steps, protons and electrons: anchors, loops, potentials."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from declared_study import edited, load

from thermo_pp.errors import StudyError
from thermo_pp.species import parse_composition
from thermo_pp.study.load import Study

R, FARADAY = 8.31446261815324, 96485.33212331001
STEP = 'equation = "A + W = C"\nbarrier = "none"'
HELD = 'held = { W = "1e-3 mol/L", W2 = "equilibrium" }'
MOLAR = R * 298.15 * np.log(0.01 * R * 298.15) / 1000.0  # 1 bar to 1 mol/L, kJ/mol


def measured(folder: Path, reaction: str, *more: tuple[str, str]) -> Study:
    return load(folder, edited((STEP, f"{STEP}\nreaction = {{ {reaction} }}"), *more))


def log_k(study: Study, step: int) -> np.ndarray:
    rate = study.effective().steps[step]
    return np.asarray(np.log(rate.forward_rate_constant / rate.reverse_rate_constant))


@pytest.mark.parametrize(
    ("reaction", "expected"),
    [
        ('free_energy = "-12 kJ/mol", standard_state = "1 mol/L"', 12000.0 / (R * 298.15)),
        (
            'free_energy = "-12 kJ/mol", standard_state = "1 bar"',
            (12.0 + MOLAR) * 1000.0 / (R * 298.15),
        ),
        ('equilibrium_constant = "40 L/mol"', np.log(40.0)),
        ('equilibrium_constant = "4e4 cm^3/mol"', np.log(40.0)),
    ],
)
@pytest.mark.parametrize("anchor", ["A", "W", "C"])
def test_measured_value_is_met(reaction: str, expected: float, anchor: str, tmp_path: Path) -> None:
    study = measured(tmp_path, f'{reaction}, anchor = "{anchor}"')
    found = log_k(study, 1)[list(study.conditions.temperature_k).index(298.15)]
    assert found == pytest.approx(expected, abs=1e-9)


def test_loops_close_whatever_is_moved(tmp_path: Path) -> None:
    """K of every other step is that of the plain study times what the anchor moves it by."""
    plain = load(tmp_path, edited())
    shift = log_k(measured(tmp_path, 'equilibrium_constant = "40 L/mol", anchor = "C"'), 1)
    before = [log_k(plain, k) for k in range(5)]
    study = measured(tmp_path, 'equilibrium_constant = "40 L/mol", anchor = "C"')
    after = [log_k(study, k) for k in range(5)]
    moved = after[1] - before[1]
    assert after[1] == pytest.approx(shift, abs=1e-12)
    assert np.all(np.abs(moved) > 1.0)
    assert after[2] - before[2] == pytest.approx(-moved, abs=1e-9)  # C = P
    assert after[0] == pytest.approx(before[0], abs=1e-12)  # W + W = W2
    # A + W = C = P against A + W2 = P + W and W + W = W2
    assert after[1] + after[2] == pytest.approx(after[4] + after[0], abs=1e-9)
    [what] = [f.what for f in study.findings if f.code == "reaction-measured"]
    assert "G of C is moved by" in what
    assert "'C = P' by" in what
    assert "in place of" in what


def test_entropy_stays_unless_an_enthalpy_is_given(tmp_path: Path) -> None:
    """With the computed entropy -124 J/mol/K at 1 bar; or with -50 kJ/mol by van 't Hoff."""
    base = 'equilibrium_constant = "40 L/mol", anchor = "C"'
    for more, enthalpy in (("", None), (', enthalpy = "-50 kJ/mol"', -50.0)):
        study = measured(tmp_path, base + more)
        t = np.array([280.0, 298.15])
        if enthalpy is None:
            # G = H - TS + RT ln(p of 1 mol/L) at both temperatures, H from the value at 298.15 K
            entropy = -124.0
            h = -R * 298.15 * np.log(40.0) + 298.15 * entropy + 1000.0 * MOLAR
            molar = -(h - t * entropy - R * t * np.log(0.01 * R * t)) / (R * t)
        else:
            h = 1000.0 * enthalpy
            s = (h + R * 298.15 * np.log(40.0) - 1000.0 * MOLAR) / 298.15  # at 1 bar
            molar = -(h - t * s - R * t * np.log(0.01 * R * t)) / (R * t)
        assert log_k(study, 1) == pytest.approx(molar, abs=1e-9)


def test_what_is_relative_to_the_anchor_follows(tmp_path: Path) -> None:
    """TS1 declared relative to C: the barrier from C stays, the saddle moves with it."""
    old = 'composition = "H2SO4"\nenthalpy = "80 kJ/mol"\nentropy = "310 J/mol/K"'
    new = (
        'composition = "H2SO4"\nenthalpy = "115 kJ/mol"\nentropy = "-10 J/mol/K"\n'
        "relative_to = { C = 1 }"
    )
    plain = load(tmp_path, edited((old, new))).effective().steps[2].forward_rate_constant
    study = measured(tmp_path, 'equilibrium_constant = "40 L/mol", anchor = "C"', (old, new))
    assert study.effective().steps[2].forward_rate_constant == pytest.approx(plain, rel=1e-9)
    alone = measured(tmp_path, 'equilibrium_constant = "40 L/mol", anchor = "C"')
    assert abs(np.log(alone.effective().steps[2].forward_rate_constant / plain)).max() > 1.0


def test_two_measured_reactions_at_once(tmp_path: Path) -> None:
    """Their anchors are moved together: each value is met."""
    second = (
        'equation = "C = P"\n',
        'equation = "C = P"\nreaction = { equilibrium_constant = 1e6, anchor = "P" }\n',
    )
    study = measured(tmp_path, 'equilibrium_constant = "40 L/mol", anchor = "C"', second)
    at = list(study.conditions.temperature_k).index(298.15)
    assert log_k(study, 1)[at] == pytest.approx(np.log(40.0), abs=1e-9)
    assert log_k(study, 2)[at] == pytest.approx(np.log(1e6), abs=1e-9)


@pytest.mark.parametrize(
    ("reaction", "sentence"),
    [
        ('anchor = "C"', "the reaction has no measured quantity"),
        (
            'anchor = "C", pKa = 3, equilibrium_constant = "4 L/mol"',
            "has equilibrium_constant and pKa",
        ),
        (
            'anchor = "P", equilibrium_constant = "4 L/mol"',
            "the anchor 'P' is neither used nor made",
        ),
        (
            'anchor = "C", free_energy = "-3 kJ/mol"',
            "the standard state of the free energy is not said",
        ),
        ('anchor = "C", equilibrium_constant = "4 mol/L"', "'4 mol/L' is not a quantity in L/mol"),
        ('anchor = "C", equilibrium_constant = 4.0', "4.0 does not fit the step, which makes -1"),
        ('anchor = "C", equilibrium_constant = "-4 L/mol"', "is not above 0"),
        ('anchor = "C", pKa = 3', "pKa has no meaning in a gas"),
        ('anchor = "C", potential = "1 V"', "potential has no meaning in a gas"),
    ],
)
def test_what_is_refused(reaction: str, sentence: str, tmp_path: Path) -> None:
    with pytest.raises(StudyError, match=sentence):
        measured(tmp_path, reaction)


# ------------------------------------------------------------------------ protons and electrons


def test_compositions() -> None:
    assert parse_composition("e-", where="here") == ({}, -1)
    assert parse_composition("H+", where="here") == ({"H": 1}, 1)


ACID = """[treatment]
phase = "solution"
standard_state = "1 mol/L"
[conditions]
temperatures = [298.15]
[conditions.held]
"H+" = "{acidity}"
"e-" = "{potential}"
[species.HA]
composition = "CH2O2"
enthalpy = "0 kJ/mol"
entropy = "200 J/mol/K"
[species.A]
composition = "CHO2-"
enthalpy = "10 kJ/mol"
entropy = "150 J/mol/K"
[species."H+"]
composition = "H+"
enthalpy = "0 kJ/mol"
entropy = "0 J/mol/K"
[species."e-"]
composition = "e-"
enthalpy = "0 kJ/mol"
entropy = "0 J/mol/K"
[species.R]
composition = "CHO2^2-"
enthalpy = "100 kJ/mol"
entropy = "150 J/mol/K"
[[steps]]
equation = "HA = A + H+"
rate = "1e6 s^-1"
reaction = {{ pKa = 3.75, anchor = "A" }}
[[steps]]
equation = "A + e- = R"
rate = "1e3 L/mol/s"
reaction = {{ potential = "-0.5 V", anchor = "R" }}
[effective]
reactant = "HA"
product = "R"
"""


def acid(folder: Path, acidity: str = "pH 3.75", potential: str = "-0.5 V") -> Study:
    return load(folder, ACID.format(acidity=acidity, potential=potential))


def test_half_way_at_the_pka_and_at_the_potential(tmp_path: Path) -> None:
    """At pH = pKa acid and base are level, at E = E° oxidised and reduced form are."""
    study = acid(tmp_path)
    steps = study.effective().steps
    acidity, electrons = 10.0**-3.75, np.exp(0.5 * FARADAY / (R * 298.15))
    forth, back = steps[0].forward_rate_constant[0], steps[0].reverse_rate_constant[0]
    assert forth == pytest.approx(back * acidity, rel=1e-9)
    forth, back = steps[1].forward_rate_constant[0], steps[1].reverse_rate_constant[0]
    assert forth * electrons == pytest.approx(back, rel=1e-9)


def test_ten_times_an_activity_by_59_millivolts(tmp_path: Path) -> None:
    """One pH and 59.16 mV (textbooks, from memory) move a proton and an electron alike."""
    one, other = acid(tmp_path).effective(), acid(tmp_path, potential="-0.55916 V").effective()
    ratio = other.held_mol_l["e-"][0] / one.held_mol_l["e-"][0]
    assert ratio == pytest.approx(10.0, rel=1e-4)
    free = [result.rates["free"] for result in (one, other)]
    assert free[0] is not None
    assert free[1] is not None
    assert free[0].orders["e-"][0] == pytest.approx(
        np.log(free[1].rate_constant[0] / free[0].rate_constant[0]) / np.log(10.0), abs=0.4
    )


def test_arrhenius_energy_at_a_potential(tmp_path: Path) -> None:
    """The activity of electrons at a potential changes with temperature."""
    text = ACID.format(acidity="pH 3.75", potential="-0.5 V")
    text = text.replace("[298.15]", "[298.05, 298.15, 298.25]")
    rate = load(tmp_path, text).effective().rates["free"]
    assert rate is not None
    log = np.log(rate.rate_constant)
    slope = -R * (log[2] - log[0]) / (1 / 298.25 - 1 / 298.05) / 1000.0
    assert rate.arrhenius_energy_kj_mol[1] == pytest.approx(slope, abs=1e-4)


@pytest.mark.parametrize(
    ("old", "new", "sentence"),
    [
        ('"H+" = "pH 3.75"', '"H+" = "0.2 V"', "'0.2 V' is a potential, and H. is no electron"),
        (
            'composition = "e-"\nenthalpy = "0 kJ/mol"',
            'composition = "e-"\nstandard_state = "1 bar"\nenthalpy = "0 kJ/mol"',
            "e- are electrons, whose activity counts against 1 mol/L",
        ),
        ("pKa = 3.75", 'potential = "1 V"', "no electrons stand in 'HA = A . H.'"),
        ('potential = "-0.5 V"', "pKa = 3", "does not give off one proton"),
        ('"A + e- = R"', '"A = R"', "does not balance"),
    ],
)
def test_errors(old: str, new: str, sentence: str, tmp_path: Path) -> None:
    text = ACID.format(acidity="pH 3.75", potential="-0.5 V")
    assert text.count(old) == 1
    text = text.replace(old, new)
    if "A = R" in new:
        text = text.replace('"e-" = "-0.5 V"\n', "").replace('[species."e-"]', '[species."e-"]')
        start = text.index('[species."e-"]')
        text = text[:start] + text[text.index("[species.R]") :]
        text = text.replace('reaction = { potential = "-0.5 V", anchor = "R" }\n', "")
        text = text.replace('rate = "1e3 L/mol/s"', 'rate = "1e3 s^-1"')
    with pytest.raises(StudyError, match=sentence):
        load(tmp_path, text)
