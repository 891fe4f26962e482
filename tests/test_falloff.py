"""Fall-off: against Cantera, limits, derivatives, and as a step of a study."""

from __future__ import annotations

from pathlib import Path

import cantera as ct
import numpy as np
import pytest
from declared_study import TEXT, edited, load

from thermo_pp.errors import StudyError
from thermo_pp.formulas.falloff import centre_of_falloff, falloff
from thermo_pp.kinetics.results import EffectiveRate, Rate
from thermo_pp.names import Broadening

R = 8.31446261815324
FORMS: tuple[Broadening, ...] = ("lindemann", "troe", "iupac", "jpl")
LOW, HIGH = (1.2e10, -2.3, 4.0), (4.1e9, 0.6, 11.0)  # at 298.15 K; L, mol, s; kJ/mol
CENTRES: dict[Broadening, tuple[float, ...]] = {
    "lindemann": (),
    "troe": (0.6, 150.0, 1800.0, 900.0),
}


def gas(form: Broadening) -> ct.Solution:
    """A <=> B (+ M) with the two limits, in Cantera's units: kmol, m, s, J."""
    low, high = (
        f"{{A: {a * scale!r} {unit}, b: {n}, Ea: {e * 1000.0} J/mol}}"
        for (a, n, e), scale, unit in (
            (LOW, 298.15 ** -LOW[1] / 1000.0, "m^3/mol/s"),
            (HIGH, 298.15 ** -HIGH[1], "1/s"),
        )
    )
    troe = ""
    if form == "troe":
        a, t3, t1, t2 = CENTRES["troe"]
        troe = f", Troe: {{A: {a}, T3: {t3}, T1: {t1}, T2: {t2}}}"
    data = "{model: constant-cp, h0: %d J/mol, s0: 200 J/mol/K}"
    species = ", ".join(
        f"{{name: {name}, composition: {{N: 2}}, thermo: {data % h}}}"
        for name, h in (("A", 0), ("B", -20000), ("N2", 0))
    )
    return ct.Solution(
        yaml="phases: [{name: gas, thermo: ideal-gas, kinetics: gas, species: [A, B, N2]}]\n"
        f"species: [{species}]\n"
        f"reactions: [{{equation: A (+M) <=> B (+M), type: falloff, low-P-rate-constant: {low}, "
        f"high-P-rate-constant: {high}{troe}}}]\n"
    )


@pytest.mark.parametrize("form", ["lindemann", "troe"])
def test_against_cantera(form: Broadening) -> None:
    solution = gas(form)
    for t in (220.0, 298.15, 900.0):
        for pressure in (10.0, 1e4, 1e5, 1e8):
            solution.TPX = t, pressure, "N2:1"
            logs = [
                np.log(a) + n * np.log(t / 298.15) - 1000.0 * e / (R * t) for a, n, e in (LOW, HIGH)
            ]
            total = pressure / (1000.0 * R * t)
            centre = centre_of_falloff(t, CENTRES[form])[0] if form == "troe" else 0.0
            found = falloff(logs[0] + np.log(total) - logs[1], centre, form)
            k = float(np.exp(logs[1] + found.log_share))
            assert k == pytest.approx(solution.forward_rate_constants[0], rel=1e-8)


@pytest.mark.parametrize("form", FORMS)
def test_limits(form: Broadening) -> None:
    """Far below the fall-off k is k_low [M], far above k_high; the order goes from 1 to 0."""
    far = falloff(np.array([-2e4, 2e4]), np.log(0.6), form)
    # Troe's form keeps log F = log F_cent/(1 + 1/0.14^2) for ever
    left = np.log(0.6) / (1.0 + 0.14**-2) if form == "troe" else 0.0
    assert far.log_share == pytest.approx([-2e4 + left, left], abs=1e-4)
    assert far.by_reduced == pytest.approx([1.0, 0.0], abs=1e-6)


def test_in_the_middle() -> None:
    """At P_r = 1, k = k_high/2 times F: F_cent for IUPAC and JPL (log P_r = 0)."""
    for form in ("iupac", "jpl"):
        share = np.exp(falloff(0.0, np.log(0.6), form).log_share)
        assert share == pytest.approx(0.3, rel=1e-14)


def test_jpl_of_a_known_reaction() -> None:
    """OH + NO2 at 300 K: low 1.8e-30, high 2.8e-11 (JPL 2006, from memory), 2.45e19 cm^-3: by hand."""
    reduced = 1.8e-30 * 2.45e19 / 2.8e-11
    by_hand = 2.8e-11 * reduced / (1 + reduced) * 0.6 ** (1 / (1 + np.log10(reduced) ** 2))
    found = 2.8e-11 * np.exp(falloff(np.log(reduced), np.log(0.6), "jpl").log_share)
    assert found == pytest.approx(by_hand, rel=1e-12)
    assert found == pytest.approx(1.06e-11, rel=0.02)


@pytest.mark.parametrize("form", FORMS)
def test_derivatives(form: Broadening) -> None:
    at, centre, h = np.linspace(-9.0, 9.0, 7), np.log(0.45), 1e-5
    found = falloff(at, centre, form)
    by_reduced = falloff(at + h, centre, form).log_share - falloff(at - h, centre, form).log_share
    assert found.by_reduced == pytest.approx(by_reduced / (2 * h), abs=1e-8)
    by_centre = falloff(at, centre + h, form).log_share - falloff(at, centre - h, form).log_share
    assert found.by_centre == pytest.approx(by_centre / (2 * h), abs=1e-8)


@pytest.mark.parametrize("parameters", [(0.6,), (0.6, 150.0, 1800.0), (0.6, 150.0, 1800.0, 900.0)])
def test_slope_of_the_centre(parameters: tuple[float, ...]) -> None:
    t, h = np.array([200.0, 298.15, 800.0]), 1e-3
    _, slope = centre_of_falloff(t, parameters)
    logs = [centre_of_falloff(t + by, parameters)[0] for by in (h, -h)]
    assert slope == pytest.approx(t * (logs[0] - logs[1]) / (2 * h), abs=1e-7)


# ---------------------------------------------------------------------------------- in a study

STEP = 'equation = "A + W = C"\nbarrier = "none"'
LIMITS = """low = { A = "3e7 L^2/mol^2/s", n = -2.3, E = "4 kJ/mol" }, \
high = { A = "4e5 L/mol/s", n = 0.6, E = "11 kJ/mol" }"""
HELD = 'held = { W = "1e-3 mol/L", W2 = "equilibrium" }'
TWO = """[[steps]]
equation = "W + W = W2"
barrier = "none"
[[steps]]
"""


def result(
    folder: Path,
    *,
    form: str = 'form = "troe", centre = [0.6, "150 K", "1800 K"]',
    collider: str = '"M"',
    conditions: str = 'total_pressure = "1 bar"',
    temperatures: str = "[298.15]",
) -> EffectiveRate:
    law = f"falloff = {{ {LIMITS}, {form}, collider = {collider} }}"
    text = edited(
        (STEP, f'equation = "A + W = C"\n{law}'),
        ('temperatures = ["280 K", "25 degC"]', f"temperatures = {temperatures}"),
        (HELD, f"{HELD}\n{conditions}"),
        ('[[steps]]\nequation = "A + W2 = P + W"\nrate = "2e7 L/mol/s"\n', ""),
    )
    return load(folder, text).effective()


def free(answer: EffectiveRate) -> Rate:
    found = answer.rates["free"]
    assert found is not None
    return found


def test_step_by_hand(tmp_path: Path) -> None:
    step = result(tmp_path, form='form = "lindemann"').steps[1]
    low, high = 3e7 * np.exp(-4000.0 / (R * 298.15)), 4e5 * np.exp(-11000.0 / (R * 298.15))
    total = 100.0 / (R * 298.15)
    expected = low * total / (1.0 + low * total / high)
    assert step.forward_rate_constant[0] == pytest.approx(expected, rel=1e-11)
    # the reverse from the equilibrium constant: H -35 kJ/mol, S 320 - 256 - 188 J/mol/K at 1 bar
    ratio = np.exp(35000.0 / (R * 298.15) - 124.0 / R) * 0.01 * R * 298.15
    assert step.forward_rate_constant[0] / step.reverse_rate_constant[0] == pytest.approx(
        ratio, rel=1e-9
    )
    assert not step.limited[0]


@pytest.mark.parametrize(
    "conditions",
    [
        'total_pressure = "1 bar"',
        'total_pressure = "1 bar"\nconstant = "concentration"\nstated_at = "298.15 K"',
        'total_pressure = "1 bar"\nconstant = "pressure"\nstated_at = "298.15 K"',
    ],
)
def test_arrhenius_energy_by_differences(conditions: str, tmp_path: Path) -> None:
    rate = free(result(tmp_path, conditions=conditions, temperatures="[298.05, 298.15, 298.25]"))
    log = np.log(rate.rate_constant)
    slope = -R * (log[2] - log[0]) / (1 / 298.25 - 1 / 298.05) / 1000.0
    assert rate.arrhenius_energy_kj_mol[1] == pytest.approx(slope, abs=2e-5)


@pytest.mark.parametrize("form", ['form = "iupac", centre = 0.5', 'form = "jpl", centre = 0.6'])
def test_order_in_the_collider(form: str, tmp_path: Path) -> None:
    logs = [
        np.log(
            free(
                result(tmp_path, form=form, conditions=f'total_pressure = "{p} bar"')
            ).rate_constant
        )
        for p in (0.999, 1.001)
    ]
    order = (logs[1] - logs[0])[0] / np.log(1.001 / 0.999)
    found = free(result(tmp_path, form=form)).collider_orders["M"][0]
    assert found == pytest.approx(order, abs=1e-8)
    assert 0.001 < found < 0.99


def test_efficiencies_and_the_sum_rule(tmp_path: Path) -> None:
    """Colliders with efficiencies are a sum; what their shares add up to is the order in M."""
    rate = free(result(tmp_path, collider="{ M = 1.0, W = 5.0 }"))
    alone = free(result(tmp_path))
    total = 100.0 / (R * 298.15)
    shares = rate.collider_orders["W"] / rate.collider_orders["M"]
    assert shares == pytest.approx([5.0 * 1e-3 / total], rel=1e-9)
    assert rate.rate_constant[0] > alone.rate_constant[0]
    assert sum(rate.control[name] for name in rate.saddles) == pytest.approx([1.0], abs=1e-10)


def test_no_word_of_a_high_pressure_limit(tmp_path: Path) -> None:
    said = [f.what for f in result(tmp_path).findings if f.code == "high-pressure-limit"]
    assert not any("'A + W = C'" in what for what in said)


@pytest.mark.parametrize(
    ("options", "sentence"),
    [
        ({"conditions": ""}, "the collider M is the whole gas, and there is no total pressure"),
        ({"collider": '"W2"'}, "the collider 'W2' is not held at a stated amount"),
        ({"form": 'form = "troe"'}, "troe needs a centre"),
        ({"form": 'form = "lindemann", centre = 0.6'}, "a Lindemann fall-off has no centre"),
        ({"form": 'form = "jpl", centre = 1.6'}, "is not above 0 and at most 1"),
        ({"form": 'form = "troe", centre = [0.5, "3 K"]'}, "is no centre of a fall-off"),
        ({"form": 'form = "tore", centre = 0.6'}, "tore"),
        ({"collider": "{ M = 0.0 }"}, "collider"),
    ],
)
def test_what_is_refused(options: dict[str, str], sentence: str, tmp_path: Path) -> None:
    with pytest.raises(StudyError, match=sentence):
        result(tmp_path, **options)


def test_limits_of_the_wrong_order(tmp_path: Path) -> None:
    text = edited(
        (
            STEP,
            'equation = "A + W = C"\nfalloff = { '
            + LIMITS.replace("L^2/mol^2/s", "L/mol/s")
            + ', form = "lindemann", collider = "W" }',
        )
    )
    with pytest.raises(StudyError, match="'3e7 L/mol/s' is not a quantity in L"):
        load(tmp_path, text)
    assert STEP in TEXT
