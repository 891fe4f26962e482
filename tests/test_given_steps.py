"""Steps without a located saddle, encounters of ions, and what limits change."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from declared_study import edited, load

from thermo_pp.errors import StudyError
from thermo_pp.formulas.rates import ion_factor
from thermo_pp.kinetics.results import EffectiveRate, Rate
from thermo_pp.study.load import Study

R, KT_H = 8.31446261815324, 1.380649e-23 / 6.62607015e-34

ISOMERS = """[treatment]
standard_state = "1 mol/L"
[conditions]
temperatures = {temperatures}
[species.A]
composition = "CO"
enthalpy = "0 kJ/mol"
entropy = "200 J/mol/K"
[species.B]
composition = "CO"
enthalpy = "30 kJ/mol"
entropy = "300 J/mol/K"
[species.P]
composition = "CO"
enthalpy = "-60 kJ/mol"
entropy = "300 J/mol/K"
[[steps]]
equation = "{equation}"
barrier = {barrier}
{more}
[[steps]]
equation = "B = P"
barrier = "20 kJ/mol"
[effective]
reactant = "A"
product = "P"
"""  # B is level with A in G at 300 K, higher below


def isomers(
    folder: Path,
    barrier: str = '"50 kJ/mol"',
    equation: str = "A = B",
    temperatures: str = "[290.0]",
    more: str = "",
) -> EffectiveRate:
    text = ISOMERS.format(barrier=barrier, equation=equation, temperatures=temperatures, more=more)
    return load(folder, text).effective()


def said(result: EffectiveRate, code: str) -> list[str]:
    return [f.what for f in result.findings if f.code == code]


def free(result: EffectiveRate) -> Rate:
    rate = result.rates["free"]
    assert rate is not None
    return rate


# -------------------------------------------------------------------------- height of a saddle


@pytest.mark.parametrize("equation", ["A = B", "B = A"])
@pytest.mark.parametrize(("t", "from_a"), [(290.0, False), (310.0, True)])
def test_height_counts_from_the_higher_side(
    equation: str, t: float, from_a: bool, tmp_path: Path
) -> None:
    result = isomers(tmp_path, equation=equation, temperatures=f"[{t}]")
    step = result.steps[0]
    forth, back = step.forward_rate_constant[0], step.reverse_rate_constant[0]
    a, b = (forth, back) if equation == "A = B" else (back, forth)
    gibbs_b = 30000.0 - t * 100.0
    k = KT_H * t * np.exp(-50000.0 / (R * t))
    assert a == pytest.approx(k if from_a else k * np.exp(-gibbs_b / (R * t)), rel=1e-10)
    assert b == pytest.approx(k * np.exp(gibbs_b / (R * t)) if from_a else k, rel=1e-10)
    [what, _] = said(result, "barrier-declared")
    assert f"50 kJ/mol above {'A' if from_a else 'B'}, in free energy" in what
    assert not said(result, "barrier-changes-side")


def test_kink_is_said(tmp_path: Path) -> None:
    result = isomers(tmp_path, temperatures="[290.0, 310.0]")
    [what] = said(result, "barrier-changes-side")
    assert "counts from A at some of the temperatures and from B at others" in what
    assert "above the side that is higher in G" in said(result, "barrier-declared")[0]


@pytest.mark.parametrize("t", [290.0, 310.0])
def test_slope_by_differences(t: float, tmp_path: Path) -> None:
    """On either side of the kink; the controls of the saddles add up to 1."""
    rate = free(isomers(tmp_path, temperatures=f"[{t - 0.1}, {t}, {t + 0.1}]"))
    log = np.log(rate.rate_constant)
    slope = -R * (log[2] - log[0]) / (1 / (t + 0.1) - 1 / (t - 0.1)) / 1000.0
    assert rate.arrhenius_energy_kj_mol[1] == pytest.approx(slope, abs=1e-5)
    assert sum(rate.control[name] for name in rate.saddles) == pytest.approx([1.0] * 3, abs=1e-12)


def test_two_molecules_meet_their_limit(tmp_path: Path) -> None:
    """A height joins the collision limit as a saddle does."""
    old = 'equation = "A + W = C"\nbarrier = "none"'
    plain = load(tmp_path, edited()).effective().steps[1].forward_rate_constant
    found = {}
    for height in ("0 kJ/mol", "80 kJ/mol"):
        new = f'equation = "A + W = C"\nbarrier = "{height}"\ndeviation = "5 kJ/mol"'
        study = load(tmp_path, edited((old, new)))
        assert study.mechanism.steps[1].height is not None
        assert study.mechanism.steps[1].height.deviation_kj_mol == 5.0
        found[height] = study.effective().steps[1].forward_rate_constant
    assert np.all(found["0 kJ/mol"] < plain)
    assert np.all(found["80 kJ/mol"] < 1e-3 * plain)
    t = np.array([280.0, 298.15])
    above = np.maximum(0.0, -35000.0 + t * 124.0 - R * t * np.log(0.01 * R * t))
    alone = KT_H * t * np.exp(-(above) / (R * t))
    joined = 1.0 / (1.0 / plain + 1.0 / alone)
    assert found["0 kJ/mol"] == pytest.approx(joined, rel=1e-6)


def test_maximum_of_a_scan(tmp_path: Path) -> None:
    """In a table, in its unit; counted from the left side whichever is higher."""
    (tmp_path / "scan.csv").write_text(
        "# torsion\nangle / deg,energy / kcal mol^-1\n0,1.0\n30,6.5\n60,13.0\n90,4.0\n"
    )
    result = isomers(tmp_path, '{ scan = "scan.csv" }')
    k = KT_H * 290.0 * np.exp(-12.0 * 4184.0 / (R * 290.0))
    assert result.steps[0].forward_rate_constant[0] == pytest.approx(k, rel=1e-10)
    what = said(result, "barrier-declared")[0]
    assert "scan.csv:5), 50.208 kJ/mol above its first point, is added to G of A" in what
    assert "no change of the zero-point energy" in what


@pytest.mark.parametrize(
    ("lines", "sentence"),
    [
        ("energy / kJ mol^-1\n3\n2\n1\n", "the first point of the scan .* is its highest"),
        ("energy / kJ mol^-1\n1\n2\n3\n", "the last point of the scan .* is its highest"),
        ("energy / kJ mol^-1\n1\n2\n", "2 points are no scan"),
        ("energy / kJ mol^-1\n1\nx\n2\n", "scan.csv:3: expected a number as energy, found 'x'"),
        ("height\n1\n2\n1\n", "0 columns are called energy"),
        ("energy / m\n1\n2\n1\n", "is not a quantity in kJ/mol"),
    ],
)
def test_no_scan(lines: str, sentence: str, tmp_path: Path) -> None:
    (tmp_path / "scan.csv").write_text(lines)
    with pytest.raises(StudyError, match=sentence):
        isomers(tmp_path, '{ scan = "scan.csv" }')


@pytest.mark.parametrize(
    ("barrier", "more", "sentence"),
    [
        ('"-3 kJ/mol"', "", "the barrier '-3 kJ/mol' is below 0"),
        ('"35"', "", "has no unit"),
        ('"nnoe"', "", "'nnoe' is not a number"),
        ('{ scan = "gone.csv" }', "", "there is no file"),
        ('{ scan = "../study.csv" }', "", "is outside the folder"),
        ('"35 kJ/mol"', 'deviation = "-1 kJ/mol"', "the deviation '-1 kJ/mol' is below 0"),
        ('"35 kJ/mol"', 'tunnelling = "wigner"', "has no saddle point, so nothing tunnels"),
        ('"35 kJ/mol"', "permittivity = 78.4", "a permittivity has no use here"),
    ],
)
def test_what_is_refused(barrier: str, more: str, sentence: str, tmp_path: Path) -> None:
    with pytest.raises(StudyError, match=sentence):
        isomers(tmp_path, barrier, more=more)


def test_deviation_without_a_height(tmp_path: Path) -> None:
    old = 'equation = "A + W = C"\nbarrier = "none"'
    with pytest.raises(StudyError, match="a deviation without the height that it is of"):
        load(tmp_path, edited((old, f'{old}\ndeviation = "2 kJ/mol"')))


# --------------------------------------------------------------------------------------- ions


def test_ions_at_the_distance_of_their_attraction() -> None:
    """e^2/(4 pi eps0 eps kT) is 7.15 Angstrom in water at 298.15 K (textbooks, from memory)."""
    for charges, by_hand in ((-1, 1.0 / (1.0 - np.exp(-1.0))), (1, 1.0 / (np.e - 1.0))):
        log, _ = ion_factor(298.15, charges, 78.36, 7.15)
        assert np.exp(log) == pytest.approx(by_hand, rel=2e-3)
    # far apart nothing is left, close by the attraction is |d| itself and the repulsion exp(-d) |d|
    assert ion_factor(298.15, -1, 78.36, 1e9)[0] == pytest.approx(0.0, abs=1e-7)
    size = 7.1513 / 0.05
    assert ion_factor(298.15, -1, 78.36, 0.05)[0] == pytest.approx(np.log(size), abs=1e-3)
    assert ion_factor(298.15, 1, 78.36, 0.05)[0] == pytest.approx(np.log(size) - size, abs=0.05)


@pytest.mark.parametrize("charges", [-4, -1, 1, 2])
def test_slope_of_the_factor_of_ions(charges: int) -> None:
    t, h = np.array([250.0, 298.15, 400.0]), 1e-3
    _, by_log = ion_factor(t, charges, 78.4, 5.0)
    ahead, back = (ion_factor(t + by, charges, 78.4, 5.0)[0] for by in (h, -h))
    assert -by_log == pytest.approx(t * (ahead - back) / (2 * h), abs=1e-6)


IONS = """[treatment]
phase = "solution"
standard_state = "1 mol/L"
[conditions]
temperatures = {temperatures}
held = {{ W = "1 mol/L" }}
[species.A]
composition = "CO+"
enthalpy = "0 kJ/mol"
entropy = "200 J/mol/K"
[species.W]
composition = "H2O{sign}"
enthalpy = "0 kJ/mol"
entropy = "150 J/mol/K"
[species.P]
composition = "CO(H2O){both}"
enthalpy = "-150 kJ/mol"
entropy = "180 J/mol/K"
[[steps]]
equation = "A + W = P"
barrier = "none"
viscosity = [["273.15 K", "1.79 mPa s"], ["298.15 K", "0.89 mPa s"], ["348.15 K", "0.378 mPa s"]]
{more}
[effective]
reactant = "A"
product = "P"
"""
WATER = 'permittivity = [["273.15 K", 87.9], ["348.15 K", 62.4]]'  # handbook, from memory


def ions(
    folder: Path, sign: str, more: str, temperatures: str = "[298.15]"
) -> tuple[Study, EffectiveRate]:
    both = {"-": "", "+": "^2+", "": "+"}[sign]
    study = load(folder, IONS.format(sign=sign, both=both, more=more, temperatures=temperatures))
    return study, study.effective()


def test_ions_meet_as_the_factor_says(tmp_path: Path) -> None:
    _, neutral = ions(tmp_path, "", WATER)
    plain = neutral.steps[0].forward_rate_constant[0]
    # radii of the spheres as large as the atoms' (Alvarez: C 1.77, O 1.50, H 1.20 Angstrom)
    distance = (1.77**3 + 1.5**3) ** (1 / 3) + (2 * 1.2**3 + 1.5**3) ** (1 / 3)
    inverse = (1 / 298.15 - 1 / 273.15) / (1 / 348.15 - 1 / 273.15)
    permittivity = np.exp(np.log(87.9) + inverse * np.log(62.4 / 87.9))
    onsager = 1.6710e-5 / (permittivity * 298.15) * 1e10  # e^2/(4 pi eps0 k) = 1.6710e-5 m K
    for sign, d in (("-", -onsager / distance), ("+", onsager / distance)):
        _, result = ions(tmp_path, sign, WATER)
        ratio = result.steps[0].forward_rate_constant[0] / plain
        assert ratio == pytest.approx(d / np.expm1(d), rel=1e-4)
        assert not said(result, "diffusion-of-ions")
        assert not said(result, "permittivity-constant")


@pytest.mark.parametrize("sign", ["-", "+"])
def test_arrhenius_energy_of_ions(sign: str, tmp_path: Path) -> None:
    _, result = ions(tmp_path, sign, WATER, "[309.9, 310.0, 310.1]")
    rate = free(result)
    log = np.log(rate.rate_constant)
    slope = -R * (log[2] - log[0]) / (1 / 310.1 - 1 / 309.9) / 1000.0
    assert rate.arrhenius_energy_kj_mol[1] == pytest.approx(slope, abs=1e-5)


def test_permittivity_findings(tmp_path: Path) -> None:
    _, without = ions(tmp_path, "-", "")
    assert said(without, "diffusion-of-ions")
    _, constant = ions(tmp_path, "-", "permittivity = 78.4")
    assert said(constant, "permittivity-constant")
    _, neutral = ions(tmp_path, "", "permittivity = 78.4")
    assert not said(neutral, "permittivity-constant")


def test_permittivity_table_must_rise_and_reach(tmp_path: Path) -> None:
    with pytest.raises(StudyError, match="the temperatures of the permittivity do not rise"):
        ions(tmp_path, "-", 'permittivity = [["300 K", 78.0], ["290 K", 80.0]]')
    with pytest.raises(StudyError, match="the permittivities from 290 K to 297 K do not cover"):
        ions(tmp_path, "-", 'permittivity = [["290 K", 81.0], ["297 K", 78.0]]')


# ----------------------------------------------------------------------- what a limit changes

ADDITION = """[conditions]
temperatures = [{t}]
held = {{ W = "1e-3 mol/L" }}
[species.A]
composition = "CO"
enthalpy = "0 kJ/mol"
entropy = "200 J/mol/K"
[species.W]
composition = "H2O"
enthalpy = "0 kJ/mol"
entropy = "190 J/mol/K"
[species.C]
composition = "CH2O2"
enthalpy = "-60 kJ/mol"
entropy = "290 J/mol/K"
[species.P]
composition = "CH2O2"
enthalpy = "-160 kJ/mol"
entropy = "290 J/mol/K"
[species.T1]
composition = "CH2O2"
enthalpy = "-25 kJ/mol"
entropy = "285 J/mol/K"
[species.T2]
composition = "CH2O2"
enthalpy = "-26 kJ/mol"
entropy = "270 J/mol/K"
[[steps]]
equation = "A + W = C"
through = "T1"
[[steps]]
equation = "C = P"
through = "T2"
[effective]
reactant = "A"
product = "P"
"""


def test_control_with_and_without_the_limit(tmp_path: Path) -> None:
    """Against two steps in a row by hand: the rates and the shares of the resistance."""
    t = 300.0
    rate = free(load(tmp_path, ADDITION.format(t=t)).effective())
    result = load(tmp_path, ADDITION.format(t=t)).effective()
    molar = R * t * np.log(0.01 * R * t)  # 1 bar to 1 mol/L

    def g(h: float, s: float) -> float:
        return 1000.0 * h - t * s + molar

    start = g(0, 200) + g(0, 190)
    first = KT_H * t * np.exp(-(g(-25, 285) - start) / (R * t))
    second = KT_H * t * np.exp(-(g(-26, 270) - start) / (R * t))
    joined = result.steps[0].forward_rate_constant[0]
    assert joined < 0.7 * first
    with_limit, without = (1 / (1 / k + 1 / second) for k in (joined, first))
    assert rate.rate_constant[0] == pytest.approx(1e-3 * with_limit, rel=1e-6)
    assert rate.log_limit is not None
    assert rate.log_limit[0] == pytest.approx(np.log(with_limit / without), abs=1e-6)
    assert rate.control["T1"][0] == pytest.approx(with_limit / joined, rel=1e-6)
    assert rate.control_without_limit is not None
    assert rate.control_without_limit["T1"][0] == pytest.approx(without / first, rel=1e-6)


def test_energy_that_the_limit_adds(tmp_path: Path) -> None:
    logs = [
        free(load(tmp_path, ADDITION.format(t=t)).effective()).log_limit for t in (299.9, 300.1)
    ]
    assert logs[0] is not None
    assert logs[1] is not None
    slope = -R * (logs[1] - logs[0])[0] / (1 / 300.1 - 1 / 299.9) / 1000.0
    rate = free(load(tmp_path, ADDITION.format(t=300.0)).effective())
    assert rate.limit_energy_kj_mol is not None
    assert rate.limit_energy_kj_mol[0] == pytest.approx(slope, abs=1e-5)


def test_nothing_where_no_saddle_is_joined(tmp_path: Path) -> None:
    text = ADDITION.format(t=300.0).replace('through = "T1"', 'barrier = "none"')
    text = text.replace(text[text.index("[species.T1]") : text.index("[species.T2]")], "")
    assert free(load(tmp_path, text).effective()).log_limit is None
