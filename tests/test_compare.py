"""A study against measurements: curves on the same definition, shifts, likelihoods, and what is refused."""

from __future__ import annotations

import csv
import io
import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from click.testing import CliRunner

from thermo_pp.cli import main
from thermo_pp.errors import StudyError
from thermo_pp.kinetics.model import Model
from thermo_pp.kinetics.shifts import shifted, slope
from thermo_pp.measured.deviations import Deviations
from thermo_pp.measured.observed import observe
from thermo_pp.measured.read import read_measurements
from thermo_pp.measured.reconcile import alone, together
from thermo_pp.measured.results import Comparison
from thermo_pp.names import Definition
from thermo_pp.study.load import Study
from thermo_pp.units import AVOGADRO_MOL, GAS_J_MOL_K

PLUME = Path(__file__).parents[1] / "fixtures" / "stack-plume"
STUDY = """
title = "loss of A by way of C"
[conditions]
temperatures = { from = "260 K", to = "380 K", step = "20 K" }
held = { W = "1e-3 mol/L" }
[species]
A = { composition = "SO3", enthalpy = "0 kJ/mol", entropy = "256 J/mol/K" }
W = { composition = "H2O", enthalpy = "0 kJ/mol", entropy = "188 J/mol/K" }
C = { composition = "H2O4S", enthalpy = "-50 kJ/mol", entropy = "320 J/mol/K" }
P = { composition = "H2O4S", enthalpy = "-150 kJ/mol", entropy = "295 J/mol/K" }
TS = { composition = "H2O4S", enthalpy = "0 kJ/mol", entropy = "290 J/mol/K" }
[[steps]]
equation = "A + W = C"
barrier = "none"
[[steps]]
equation = "C = P"
through = "TS"
[effective]
reactant = "A"
product = "P"
"""
HEAD = "kind,definition,temperature / K,k / s^-1,sigma / s^-1,[W] / mol/L,source\n"
TEMPERATURES = (260.0, 290.0, 320.0, 350.0, 380.0)


def load(folder: Path, name: str = "study.toml", text: str = STUDY) -> Study:
    (folder / name).write_text(text)
    return Study.load(folder / name)


def model(study: Study) -> Model:
    return Model(study.mechanism, study.conditions, study.treatment, study.species)


def rate(study: Study, t: Any, definition: Definition = "pool", **shifts: float) -> np.ndarray:
    """Rate constants, s^-1, with shifts of energies in kJ/mol."""
    rates = model(study).at(np.atleast_1d(np.asarray(t, dtype=float)))
    shift = np.array([shifts.get(name, 0.0) for name in rates.energies.names])
    return np.exp(shifted(rates, shift).rate(definition).log)


def points(
    folder: Path, k: Any, relative: float | None = 0.05, w: str = "", unit: str = "s^-1"
) -> Path:
    """Write a file of points at TEMPERATURES."""
    rows = [
        f"point,pool,{t},{value!r},{'' if relative is None else repr(relative * value)},{w},made up"
        for t, value in zip(TEMPERATURES, map(float, k), strict=True)
    ]
    (folder / "measured.csv").write_text(HEAD.replace("s^-1", unit) + "\n".join(rows) + "\n")
    return folder / "measured.csv"


@pytest.fixture
def study(tmp_path: Path) -> Study:
    return load(tmp_path)


@pytest.mark.parametrize("definition", ["free", "pool", "relaxation"])
def test_slopes_by_energies(study: Study, definition: Definition) -> None:
    """Analytic d ln k/dE against differences of the exact rate, where the pool saturates."""
    t = np.array([260.0, 300.0, 340.0, 380.0])
    rates = model(study).at(t)
    found = slope(rates, definition)
    for column, name in enumerate(rates.energies.names):
        up, down = (np.log(rate(study, t, definition, **{name: d})) for d in (1e-3, -1e-3))
        assert found.by_energy[:, column] == pytest.approx((up - down) / 2e-3, abs=2e-7), name
    # a shift of everything that the reactant side has changes no rate
    both = [found.by_energy[:, rates.energies.names.index(n)] for n in ("A", "C", "P", "TS")]
    assert sum(both) == pytest.approx(0.0, abs=1e-9)


def test_limits_follow_the_energies(tmp_path: Path) -> None:
    """A step at its limit starts from A + W: its effective saddle moves with them, the rate does not."""
    low = STUDY.replace(
        'TS = { composition = "H2O4S", enthalpy = "0',
        'TS = { composition = "H2O4S", enthalpy = "-140',
    )
    study = load(tmp_path, text=low)
    t = np.array([300.0])
    found = slope(model(study).at(t), "free")
    names = model(study).at(t).energies.names
    assert study.effective().steps[0].limited.all()
    assert found.by_energy[0] == pytest.approx(np.zeros(len(names)), abs=1e-6)


def test_slopes_with_tunnelling() -> None:
    study = Study.load(
        PLUME / "study.toml", temperatures=[300.0], treatment={"tunnelling": "eckart"}
    )
    rates = model(study).at(np.array([300.0]))
    found = slope(rates, "pool")
    for name in ("TS2", "C2", "W"):
        column = rates.energies.names.index(name)
        up, down = (np.log(rate(study, 300.0, **{name: d}))[0] for d in (1e-2, -1e-2))
        assert found.by_energy[0, column] == pytest.approx((up - down) / 2e-2, abs=1e-6), name


def test_same_numbers_same_ratio(study: Study, tmp_path: Path) -> None:
    """Measured = twice the computed constants: every ratio is 2, at the amounts of the row."""
    for text, amount in (("", 1e-3), ("5e-3", 5e-3)):
        own = STUDY.replace("1e-3 mol/L", f"{amount} mol/L")
        k = 2.0 * rate(load(tmp_path, "own.toml", own), TEMPERATURES)
        found = study.compare(points(tmp_path, k, w=text))
        assert [one.log_ratio for one in found.points] == pytest.approx([np.log(2.0)] * 5, abs=1e-9)
        (curve,) = found.curves
        grid = rate(load(tmp_path, "own.toml", own), study.conditions.temperature_k)
        assert curve.computed == pytest.approx(grid, rel=1e-9)


def test_higher_order_at_an_order_that_is_not_whole(tmp_path: Path) -> None:
    """A second-order constant beside a rate of order 0.76 in W: compared at the amount held."""
    study = load(tmp_path, text=STUDY.replace('enthalpy = "-50', 'enthalpy = "-38'))
    pool = study.effective().rates["pool"]
    assert pool is not None
    assert pool.orders["W"][0] == pytest.approx(0.763, abs=0.001)
    factor = 1e-3 * AVOGADRO_MOL / 1000.0  # mol/L to molecules/cm3
    k = rate(study, TEMPERATURES) / factor
    file = points(tmp_path, k, unit="cm^3 molecule^-1 s^-1")
    file.write_text(
        file.read_text().replace("[W] / mol/L", "orders").replace(",,made up", ",W,made up")
    )
    found = study.compare(file)
    assert [one.log_ratio for one in found.points] == pytest.approx([0.0] * 5, abs=1e-9)
    # and against the cubic centimetres of an expression's own unit
    assert found.curves[0].computed[0] == pytest.approx(rate(study, 260.0)[0] / factor, rel=1e-9)


def test_energy_at_held_pressure(tmp_path: Path) -> None:
    """With W held by pressure E_a of the second-order constant has no share of dc/dT."""
    text = STUDY.replace("1e-3 mol/L", "20 mbar").replace('enthalpy = "-50', 'enthalpy = "-30')
    study = load(tmp_path, text=text)
    t = np.array(study.conditions.temperature_k)
    file = points(tmp_path, np.ones(5), unit="cm^3 molecule^-1 s^-1")
    file.write_text(
        file.read_text().replace("[W] / mol/L", "orders").replace(",,made up", ",W,made up")
    )
    (curve,) = study.compare(file).curves
    h = 0.01
    log = [np.log(rate(study, t + d) * GAS_J_MOL_K * (t + d)) for d in (h, -h)]
    energy = GAS_J_MOL_K * t**2 * (log[0] - log[1]) / (2 * h) / 1000.0
    assert curve.arrhenius_energy_kj_mol == pytest.approx(energy, abs=1e-5)


def test_shift_of_one_state_comes_back(study: Study, tmp_path: Path) -> None:
    """Constants computed with a saddle moved by -7 kJ/mol: that move, and nothing left."""
    found = study.compare(points(tmp_path, rate(study, TEMPERATURES, TS=-7.0)), deviation=8.0)
    (saddle,) = [one for one in found.states if one.name == "TS"]
    for shift in (saddle.mean_kj_mol, saddle.shift_kj_mol):
        assert shift == pytest.approx(-7.0, abs=1e-5)
    assert saddle.mean_rms == pytest.approx(0.0, abs=1e-6)
    assert saddle.chi_square == pytest.approx(0.0, abs=1e-6)
    assert saddle.within is True
    rt = GAS_J_MOL_K * np.array(TEMPERATURES) / 1000.0
    by_saddle = slope(model(study).at(np.array(TEMPERATURES)), "pool").by_energy[:, -1]
    assert saddle.sigma_kj_mol == pytest.approx(0.05 / np.linalg.norm(by_saddle), rel=1e-3)
    assert np.abs(by_saddle * rt).max() > 0.9
    narrow = study.compare(points(tmp_path, rate(study, TEMPERATURES, TS=-7.0)), deviation=5.0)
    assert [one.within for one in narrow.states if one.name == "TS"] == [False]


def test_no_shift_is_near(study: Study, tmp_path: Path) -> None:
    found = study.compare(points(tmp_path, rate(study, TEMPERATURES) * 1e30))
    assert all(one.mean_kj_mol is None for one in found.states)
    assert "No shift of TS alone below 100 kJ/mol brings the two together." in found.words


def test_joint_shift_of_a_linear_model(study: Study, tmp_path: Path) -> None:
    """Small errors: the most probable shift is S J^T (C + J S J^T)^-1 r, and the likelihood Gaussian."""
    k = rate(study, TEMPERATURES) * np.exp(1e-4 * np.array([1.0, -2.0, 3.0, 0.5, 1.0]))
    file = points(tmp_path, k, relative=2e-4)
    rows = read_measurements(file)
    observed = observe(study, rows.points, (), weighted=True)
    covariance = Deviations(1e-3, 2e-3).of(observed.names, ("TS",)).covariance
    found = together(observed, covariance)
    values, slopes = observed.computed(np.zeros(len(observed.names)))
    residual = observed.measured - values
    whole = observed.covariance + slopes @ covariance @ slopes.T
    expected = covariance @ slopes.T @ np.linalg.solve(whole, residual)
    assert found.shift_kj_mol == pytest.approx(expected, abs=1e-9)
    log = -0.5 * (
        residual @ np.linalg.solve(whole, residual) + np.linalg.slogdet(2 * np.pi * whole)[1]
    )
    assert found.log_evidence == pytest.approx(log, abs=1e-4)


def test_likelihood_against_sampling(study: Study, tmp_path: Path) -> None:
    """The likelihood with energies integrated out against importance sampling of the exact rates."""
    k = rate(study, TEMPERATURES, TS=-3.0, C=2.0)
    rows = read_measurements(points(tmp_path, k, relative=0.2))
    observed = observe(study, rows.points, (), weighted=True)
    spread = np.array([2.0 if name != "TS" else 3.0 for name in observed.names])
    found = together(observed, np.diag(spread**2))
    random = np.random.default_rng(3)
    factor = np.linalg.cholesky(observed.covariance)
    _, slopes = observed.computed(found.shift_kj_mol)
    along = np.linalg.solve(factor, slopes * spread)
    posterior = np.linalg.inv(np.eye(len(spread)) + along.T @ along)
    draw, widening = np.linalg.cholesky(posterior), 1.3
    z0 = found.shift_kj_mol / spread
    normal = len(spread) * np.log(2 * np.pi)
    rates = observed.blocks[0].curve.rates
    logs = []
    for _ in range(400):
        u = random.standard_normal(len(spread))
        z = z0 + widening * draw @ u
        log_k = shifted(rates, z * spread).rate("pool").log
        residual = np.linalg.solve(factor, observed.measured - log_k)
        likelihood = (
            -0.5 * (residual @ residual + 5 * np.log(2 * np.pi)) - np.log(np.diag(factor)).sum()
        )
        prior = -0.5 * (z @ z + normal)
        proposal = -0.5 * (u @ u + normal) - np.log(widening * np.diag(draw)).sum()
        logs.append(likelihood + prior - proposal)
    weights = np.exp(np.array(logs) - max(logs))
    estimate = np.log(weights.mean()) + max(logs)
    error = weights.std() / weights.mean() / np.sqrt(len(weights))
    assert error < 0.05
    # the rates are not linear in the energies over 2-3 kJ/mol: 0.1 is left for that
    assert found.log_evidence == pytest.approx(estimate, abs=4 * error + 0.1)


def test_the_right_rival_wins(study: Study, tmp_path: Path) -> None:
    """Measured with a looser complex; a study that has it, and one without any, and the first."""
    looser = STUDY.replace('enthalpy = "-50', 'enthalpy = "-30')
    right = load(tmp_path, "right.toml", looser)
    file = points(tmp_path, rate(right, TEMPERATURES), relative=0.03)
    found = study.compare(file, deviation="2 kJ/mol", rivals=[right])
    assert [Path(one.file).name for one in found.rivals] == ["right.toml", "study.toml"]
    best, other = found.rivals
    assert best.behind == 0.0
    assert other.behind > 3.0
    assert best.share + other.share == pytest.approx(1.0, abs=1e-12)
    assert other.share == pytest.approx(
        np.exp(-other.behind) / (1 + np.exp(-other.behind)), rel=1e-9
    )
    assert found.words[-1].startswith(
        f"The measurements favour {best.file} over {other.file} by odds of"
    )


def test_rivals_of_other_amounts_are_told(study: Study, tmp_path: Path) -> None:
    rival = load(tmp_path, "rival.toml", STUDY.replace("1e-3 mol/L", "2e-3 mol/L"))
    found = study.compare(
        points(tmp_path, rate(study, TEMPERATURES)), deviation=2.0, rivals=[rival]
    )
    assert "rival-held" in [one.code for one in found.findings]


def expression(folder: Path, *columns: str) -> Path:
    errors = "sigma A / s^-1,sigma E / K,correlation," if columns else ""
    file = folder / "expression.csv"
    file.write_text(
        f"kind,definition,from / K,to / K,A / s^-1,E / K,{errors}source\n"
        f"expression,pool,300,340,1e3,1500,{','.join(columns)}{',' if columns else ''}made up\n"
    )
    return file


def test_an_expression_enters_once(study: Study, tmp_path: Path) -> None:
    """Two observations, ln A and theta, whatever the number of temperatures, with their covariance."""
    rows = read_measurements(expression(tmp_path, "100", "60", "0.9"))
    observed = observe(study, (), rows.expressions, weighted=True)
    assert observed.measured == pytest.approx([np.log(1e3), 1500.0])
    assert observed.covariance == pytest.approx(np.array([[0.01, 0.9 * 6], [0.9 * 6, 3600.0]]))
    values, _ = observed.computed(np.zeros(len(observed.names)))
    t = 1.0 / np.linspace(1 / 300, 1 / 340, 15)
    line = np.polyfit(1.0 / t, np.log(rate(study, t)), 1)
    assert values == pytest.approx([line[1], -line[0]], rel=1e-8)
    # no points, and nothing outside the temperatures that it holds for
    found = study.compare(expression(tmp_path, "100", "60", "0.9"))
    assert not found.points
    (curve,) = found.curves
    assert curve.measured is not None
    assert np.isnan(curve.measured[curve.temperature_k > 340]).all()
    assert not curve.fits
    assert "beyond-measured" in [one.code for one in found.findings]


def test_an_exact_expression_meets_itself(study: Study, tmp_path: Path) -> None:
    found = study.compare(expression(tmp_path), deviation=4.0)
    assert found.joint is None  # no errors, no likelihood
    assert "no-uncertainty" in [one.code for one in found.findings]
    (saddle,) = [one for one in found.states if one.name == "TS"]
    assert saddle.mean_kj_mol is not None
    assert saddle.shift_kj_mol is None
    t = 1.0 / np.linspace(1 / 300, 1 / 340, 15)
    left = np.log(1e3) - 1500.0 / t - np.log(rate(study, t, TS=saddle.mean_kj_mol))
    assert np.sqrt(np.mean(left**2)) == pytest.approx(saddle.mean_rms, rel=1e-6)
    # a least-squares minimum: moving it either way leaves more
    for d in (-0.01, 0.01):
        other = np.log(1e3) - 1500.0 / t - np.log(rate(study, t, TS=saddle.mean_kj_mol + d))
        assert (other**2).sum() > (left**2).sum()


@pytest.mark.parametrize(
    ("change", "what"),
    [
        (("pool", "cycle"), "the study has no rate of the definition 'cycle'"),
        (("[W]", "[X]"), "'X' is not held at a stated amount by the study"),
        (("[W]", "[A]"), "'A' is not held at a stated amount by the study"),
    ],
)
def test_rows_that_the_study_has_not(
    study: Study, tmp_path: Path, change: tuple[str, str], what: str
) -> None:
    file = points(tmp_path, np.ones(5), w="1e-3")
    file.write_text(file.read_text().replace(*change))
    with pytest.raises(StudyError) as error:
        study.compare(file)
    assert error.value.what == what
    assert error.value.where == f"{file}:2"


def test_a_rate_constant_of_the_wrong_order(tmp_path: Path) -> None:
    """The bundled study's rate is second order in water: a second-order constant has another dimension."""
    study = Study.load(PLUME / "study.toml", temperatures=[300.0])
    file = tmp_path / "wrong.csv"
    file.write_text(
        "kind,definition,orders,temperature / K,k / cm^3 molecule^-1 s^-1,source\npoint,pool,W,300,1e-15,x\n"
    )
    with pytest.raises(StudyError) as error:
        study.compare(file)
    assert "is of order 1 in W, the computed rate of order 2" in error.value.what
    assert "their dimensions differ" in error.value.what


def test_a_network_that_is_not_linear_is_refused(tmp_path: Path) -> None:
    text = STUDY.replace('equation = "C = P"', 'equation = "C + A = P + A"')
    text = text.replace('TS = { composition = "H2O4S"', 'TS = { composition = "S2O7H2"')
    study = load(tmp_path, text=text)
    file = points(tmp_path, np.ones(5))
    with pytest.raises(StudyError, match="no rate constant alone describes the study") as error:
        study.compare(file)
    assert error.value.where == f"{file}:2"


def test_backwards_is_refused(tmp_path: Path) -> None:
    """At these amounts the net reaction runs backwards: there is no constant to compare."""
    text = STUDY.replace('W = "1e-3 mol/L"', 'W = "1e-3 mol/L", P = "1 bar", A = "1e-30 bar"')
    study = load(tmp_path, text=text.replace('enthalpy = "-150', 'enthalpy = "-10'))
    file = points(tmp_path, np.ones(5))
    file.write_text(file.read_text().replace("pool", "free"))
    with pytest.raises(StudyError, match="does not run forwards at"):
        study.compare(file)


def test_options_are_checked(study: Study, tmp_path: Path) -> None:
    file = points(tmp_path, np.ones(5), relative=None)
    for value in ("-2 kJ/mol", "0 kJ/mol"):
        with pytest.raises(StudyError, match="is not above 0"):
            study.compare(file, deviation=value)
    rival = load(tmp_path, "rival.toml")
    with pytest.raises(StudyError, match="and none is given"):
        study.compare(file, rivals=[rival])
    with pytest.raises(StudyError, match="which have no errors"):
        study.compare(file, deviation=4.0, rivals=[rival])
    with pytest.raises(StudyError, match="is the study itself or stands twice"):
        study.compare(file, deviation=4.0, rivals=[study])


def test_without_deviations_it_says_so(study: Study, tmp_path: Path) -> None:
    found = study.compare(points(tmp_path, rate(study, TEMPERATURES)))
    assert found.joint is None
    assert found.words[-1].startswith("No standard deviations of the energies are given")


DOUBT = '[doubt]\ndeviation = "3 kJ/mol"\nsaddle_deviation = "5 kJ/mol"\n'
SAME = "correlation = { same_kind = 0.9, across = 0.9 }\n"


def test_deviations_are_those_of_the_study(study: Study, tmp_path: Path) -> None:
    """[doubt] without correlations is what equal options are; every number is the same."""
    file = points(tmp_path, rate(study, TEMPERATURES, TS=-3.0))
    doubting = load(tmp_path, "doubt.toml", STUDY + DOUBT)
    found = doubting.compare(file)
    same = study.compare(file, deviation=3.0, saddle_deviation=5.0)
    assert found.joint is not None
    assert same.joint is not None
    assert found.joint.shift_kj_mol == pytest.approx(same.joint.shift_kj_mol, rel=1e-9)
    assert found.joint.length == pytest.approx(same.joint.length, rel=1e-9)
    assert found.curves[0].log_deviation == pytest.approx(same.curves[0].log_deviation, rel=1e-12)
    assert [one.deviation_kj_mol for one in found.states] == [
        one.deviation_kj_mol for one in same.states
    ]
    assert (
        "The standard deviations of the energies, 3 to 5 kJ/mol, independent of each other, are those of "
        f"{tmp_path / 'doubt.toml'} [doubt]." in found.words
    )
    assert same.overridden is None
    assert study.compare(file).energy_doubt is None


def test_correlations_of_the_study_count(study: Study, tmp_path: Path) -> None:
    """Var ln k = g^T S g with the study's covariance, written out here; errors in common cancel."""
    file = points(tmp_path, rate(study, TEMPERATURES, TS=-3.0))
    found = load(tmp_path, "doubt.toml", STUDY + DOUBT + SAME).compare(file)
    grid = np.array(study.conditions.temperature_k)
    slopes = slope(model(study).at(grid), "pool").by_energy
    spread = np.array([3.0, 3.0, 3.0, 3.0, 5.0])  # A, W, C, P, TS
    covariance = np.outer(spread, spread) * (0.9 + 0.1 * np.eye(5))
    expected = np.sqrt(np.einsum("ti,ij,tj->t", slopes, covariance, slopes))
    assert found.curves[0].log_deviation == pytest.approx(expected, rel=1e-9)
    apart = study.compare(file, deviation=3.0, saddle_deviation=5.0)
    assert apart.curves[0].log_deviation is not None
    assert (expected < 0.8 * apart.curves[0].log_deviation).all()
    assert found.joint is not None
    assert apart.joint is not None
    assert found.joint.length > 1.1 * apart.joint.length


def test_options_stand_in_place_of_the_study(study: Study, tmp_path: Path) -> None:
    file = points(tmp_path, rate(study, TEMPERATURES, TS=-3.0))
    doubting = load(tmp_path, "doubt.toml", STUDY + DOUBT + SAME)
    found, plain = (one.compare(file, deviation=4.0) for one in (doubting, study))
    assert found.joint is not None
    assert plain.joint is not None
    assert found.joint.shift_kj_mol == pytest.approx(plain.joint.shift_kj_mol, rel=1e-12)
    assert found.overridden == f"{tmp_path / 'doubt.toml'} [doubt]"
    said = "The standard deviations of the energies, 4 kJ/mol, independent of each other, are those of the options"
    assert f"{said}, not those of {found.overridden}." in found.words
    assert f"{said}." in plain.words


def test_each_rival_has_its_own_doubt(study: Study, tmp_path: Path) -> None:
    file = points(tmp_path, rate(study, TEMPERATURES, TS=-3.0))
    one = load(tmp_path, "one.toml", STUDY + DOUBT)
    surer = load(
        tmp_path, "surer.toml", STUDY + DOUBT.replace("3 kJ", "1 kJ").replace("5 kJ", "1 kJ")
    )
    length = {Path(r.file).name: r.length for r in one.compare(file, rivals=[surer]).rivals}
    assert length["surer.toml"] > 1.5 * length["one.toml"]
    with pytest.raises(StudyError, match=r"the rival has no \[doubt\]") as caught:
        one.compare(file, rivals=[study])
    assert caught.value.where == str(tmp_path / "study.toml")


def test_a_stated_height_is_kept_and_said_to_be(study: Study, tmp_path: Path) -> None:
    text = STUDY.replace('through = "TS"', 'barrier = "60 kJ/mol"').replace("TS = {", "# TS = {")
    high = load(tmp_path, "height.toml", text + DOUBT)
    found = high.compare(points(tmp_path, rate(high, TEMPERATURES)))
    assert [one.file for one in found.findings if one.code == "heights-kept"] == [
        str(tmp_path / "height.toml")
    ]
    assert "heights-kept" not in [
        one.code for one in study.compare(tmp_path / "measured.csv").findings
    ]


def test_points_that_scatter_more(study: Study, tmp_path: Path) -> None:
    k = rate(study, TEMPERATURES) * np.array([1.3, 0.7, 1.3, 0.7, 1.3])
    codes = [one.code for one in study.compare(points(tmp_path, k, relative=0.01)).findings]
    assert "points-scatter" in codes


# the bundled study


@pytest.fixture(scope="module")
def plume() -> Comparison:
    study = Study.load(PLUME / "study.toml", temperatures=[280.0, 298.15, 320.0, 340.0, 360.0])
    rival = Study.load(PLUME / "study-composite.toml", temperatures=[298.15])
    return study.compare(PLUME / "measured.csv", deviation="4 kJ/mol", rivals=[rival])


def test_bundled_expression_is_that_of_the_paper(plume: Comparison) -> None:
    (curve,) = plume.curves
    t = curve.temperature_k
    assert curve.measured == pytest.approx(2.26e-43 * t * np.exp(6544.0 / t), rel=1e-9)
    water = 2e-4 * AVOGADRO_MOL / 1000.0
    pool = Study.load(PLUME / "study.toml", temperatures=list(t)).effective().rates["pool"]
    assert pool is not None
    assert curve.computed == pytest.approx(pool.rate_constant / water**2, rel=1e-9)
    assert curve.orders["W"] == pytest.approx(1.99, abs=0.02)


def test_bundled_shift(plume: Comparison) -> None:
    """Six kJ/mol, as docs/stack-plume.md has it: RT ln of the ratio, averaged."""
    (saddle,) = [one for one in plume.states if one.name == "TS2"]
    assert saddle.mean_kj_mol == pytest.approx(-6.4, abs=0.2)
    assert saddle.within is False
    assert plume.joint is not None
    assert plume.joint.reconciled
    assert plume.joint.within


def test_docs_have_the_numbers(plume: Comparison) -> None:
    text = (PLUME.parents[1] / "docs" / "stack-plume.md").read_text(encoding="utf-8")
    shown = {one.name: f"{one.mean_kj_mol:+.1f}" for one in plume.states}
    sentence = f"TS2 alone by {shown['TS2']} kJ/mol, SO3 alone by {shown['SO3']} or W alone by {shown['W']}"
    assert sentence in " ".join(text.split())
    lefts = sorted(np.exp(one.mean_rms) for one in plume.states if one.mean_rms is not None)
    assert f"a factor of {lefts[0]:.2f} to {lefts[-1]:.2f} (root mean square)" in " ".join(
        text.split()
    )
    assert [one.name for one in plume.states if one.within] == ["W"]
    assert plume.joint is not None
    assert f"more than {max(map(abs, plume.joint.multiple.values())):.1f} of its deviation" in text


# the command


def run(*arguments: str, status: int = 0) -> str:
    result = CliRunner().invoke(main, ["compare", *arguments, "--quiet"], prog_name="thermo-pp")
    assert result.exit_code == status, (result.stdout, result.stderr, result.exception)
    return result.stdout if status == 0 else result.stderr


@pytest.fixture(scope="module")
def files(tmp_path_factory: pytest.TempPathFactory) -> tuple[str, str, str]:
    folder = tmp_path_factory.mktemp("compare")
    study = load(folder)
    load(folder, "rival.toml", STUDY.replace('enthalpy = "-50', 'enthalpy = "-40'))
    file = points(folder, rate(study, TEMPERATURES, TS=-2.0))
    with file.open("a") as stream:
        stream.write("point,free,300,5.0,0.5,2e-3,another\n")
    return str(folder / "study.toml"), str(file), str(folder / "rival.toml")


def test_json(files: tuple[str, str, str]) -> None:
    study, file, rival = files
    found = json.loads(
        run(study, file, "--deviation", "3 kJ/mol", "--rival", rival, "--format", "json")
    )
    assert found["format"] == "thermo-pp/compare/1"
    for key in (
        "fits",
        "points",
        "computed",
        "shifts",
        "rivals",
        "treatment",
        "standard_state",
        "findings",
    ):
        assert key in found
    assert len(found["points"]) == 6
    assert [one["form"] for one in found["fits"]][:3] == ["arrhenius", "eyring", "power"]
    assert found["fits"][0]["factors"]["A"]["deviation"] > 0.0
    assert len(found["fits"][0]["covariance"]) == 2
    assert len(found["computed"]) == 2
    assert found["computed"][0]["not_fitted"].keys() <= {"series", "parallel"}
    assert found["computed"][1]["not_fitted"].keys() >= {"arrhenius"}
    assert {one["name"] for one in found["shifts"]["states"]} >= {"TS"}
    assert found["shifts"]["joint"]["shift_kj_mol"]["TS"] < 0.0
    assert len(found["rivals"]) == 2
    k = rate(Study.load(study), 260.0)[0]
    assert found["points"][0]["computed"] == pytest.approx(k, rel=1e-9)


@pytest.mark.parametrize("form", ["table", "markdown", "latex"])
def test_tables(files: tuple[str, str, str], form: str) -> None:
    study, file, rival = files
    text = run(study, file, "--deviation", "3 kJ/mol", "--rival", rival, "--format", form)
    for part in (
        "Measured points",
        "Fits",
        "Rival studies",
        "Most probable shift",
        "no basis for safety",
        "made up",
    ):
        assert part in text.replace("\n", " "), part


def test_csv(files: tuple[str, str, str]) -> None:
    study, file, rival = files
    text = run(study, file, "--deviation", "3 kJ/mol", "--rival", rival, "--format", "csv")
    parts = [list(csv.DictReader(io.StringIO(part))) for part in text.split("\n\n")]
    assert len(parts) == 7
    assert len(parts[0]) == 6
    assert float(parts[0][0]["ratio"]) == pytest.approx(
        float(parts[0][0]["k measured"]) / float(parts[0][0]["k computed"]), rel=1e-12
    )
    assert len(parts[1]) == 2 * 7  # curves times temperatures


def test_energy_unit(files: tuple[str, str, str]) -> None:
    study, file, _ = files
    kj, kcal = (
        list(
            csv.DictReader(
                io.StringIO(
                    run(study, file, "--format", "csv", "--energy-unit", unit).split("\n\n")[1]
                )
            )
        )
        for unit in ("kJ/mol", "kcal/mol")
    )
    assert float(kj[0]["Eₐ computed / kJ mol⁻¹"]) == pytest.approx(
        4.184 * float(kcal[0]["Eₐ computed / kcal mol⁻¹"]), rel=1e-12
    )


def test_errors_of_the_command(files: tuple[str, str, str]) -> None:
    study, file, rival = files
    assert "measured.csv" not in run(study, file, "--rival", rival, status=1)
    assert "mend:" in run(study, file, "--rival", rival, status=1)
    run(study, "none.csv", status=2)


def test_alone_keeps_to_its_state(study: Study, tmp_path: Path) -> None:
    rows = read_measurements(points(tmp_path, rate(study, TEMPERATURES, C=3.0)))
    observed = observe(study, rows.points, (), weighted=True)
    found = alone(observed, "C")
    assert found is not None
    assert found.shift_kj_mol == pytest.approx(3.0, abs=1e-5)
    assert alone(observed, "P") is None or abs(alone(observed, "P").shift_kj_mol) < 200  # type: ignore[union-attr]
