"""Measurement files: what is read, and what each wrong row says with its line."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from thermo_pp.errors import StudyError
from thermo_pp.measured.read import read_measurements
from thermo_pp.measured.rows import Expression, Measurements
from thermo_pp.measured.units import rate_unit
from thermo_pp.units import GAS_J_MOL_K

POINTS = "kind,definition,temperature / K,k / s^-1,sigma / s^-1,[W] / mol/L,source\n"
EXPRESSION = (
    "kind,definition,orders,from / K,to / K,A / cm^6 molecule^-2 s^-1,sigma A / cm^6 molecule^-2 s^-1,n,T0 / K,"
    "E / K,sigma E / K,correlation,source\n"
)
ROW = "expression,pool,2 W,250,360,2.26e-43,0.85e-43,1,1,-6544,106,,somebody"


def read(folder: Path, text: str) -> Measurements:
    file = folder / "measured.csv"
    file.write_text(text, encoding="utf-8")
    return read_measurements(file)


def test_points(tmp_path: Path) -> None:
    text = POINTS + '# a comment\n\npoint,pool,25,3,0.1,2e-4,"Doe, J."\n'.replace(
        ",25,", ",298.15,"
    )
    (point,) = read(tmp_path, text).points
    assert (point.line, point.temperature_k, point.rate_constant, point.sigma) == (
        4,
        298.15,
        3.0,
        0.1,
    )
    assert point.source == "Doe, J."
    assert point.held["W"].value == 2e-4
    assert point.log == pytest.approx(np.log(3.0), abs=1e-15)


def test_units_of_columns(tmp_path: Path) -> None:
    """Temperature in degC, sigma in another unit of the same dimension, an amount by pressure."""
    text = (
        "kind,definition,orders,temperature / degC,k / cm3 molecule-1 s-1,sigma / L mol^-1 s^-1,[W] / mbar,source\n"
        "point,free,W,25,1e-15,1e4,20,x\n"
    )
    (point,) = read(tmp_path, text).points
    assert point.temperature_k == pytest.approx(298.15, abs=1e-9)
    assert point.sigma == pytest.approx(1e4 / 6.02214076e20, rel=1e-12)
    assert (point.held["W"].form, point.held["W"].value) == ("pressure", pytest.approx(2000.0))


@pytest.mark.parametrize(
    ("text", "order", "factor"),
    [
        ("s^-1", 1, 1.0),
        ("min^-1", 1, 1.0 / 60.0),
        ("cm^3 molecule^-1 s^-1", 2, 6.02214076e20),
        ("cm3/s", 2, 6.02214076e20),
        ("L/mol/s", 2, 1.0),
        ("M^-1 s^-1", 2, 1.0),
        ("m^3/mol/s", 2, 1000.0),
        ("cm^6 molecule^-2 s^-1", 3, 6.02214076e20**2),
        ("cm6 s-1", 3, 6.02214076e20**2),
        ("L^2/mol^2/s", 3, 1.0),
        ("L2 mol-2 s-1", 3, 1.0),
    ],
)  # fmt: skip
def test_rate_units(text: str, order: int, factor: float) -> None:
    unit = rate_unit(text, where="test")
    assert unit.order == order
    assert unit.factor == pytest.approx(factor, rel=1e-12)


@pytest.mark.parametrize("text", ["K", "1/bar/s", "cm^2/s", "kJ/mol", "furlong"])
def test_no_rate_units(text: str) -> None:
    with pytest.raises(StudyError, match="is no unit of a rate constant"):
        rate_unit(text, where="test")


def test_expression(tmp_path: Path) -> None:
    (row,) = read(tmp_path, EXPRESSION + ROW + "\n").expressions
    t = np.array([249.0, 298.15, 361.0])
    k = np.exp(row.log(t)) / row.unit.factor
    assert np.isnan(k[[0, 2]]).all()
    assert k[1] == pytest.approx(2.2948e-31, rel=1e-4)  # checks: 2.2948e-31
    assert row.energy_kj_mol(t)[1] == pytest.approx(-51.93, abs=5e-3)
    deviation, energy = row.log_deviation(t), row.energy_deviation_kj_mol(t)
    assert deviation is not None
    assert energy is not None
    # independent errors: (0.85/2.26)^2 + (106/T)^2; R 106 K
    assert deviation[1] == pytest.approx(np.hypot(0.85 / 2.26, 106.0 / 298.15), rel=1e-12)
    assert energy[1] == pytest.approx(GAS_J_MOL_K * 0.106, rel=1e-12)


def test_correlation_narrows_the_expression(tmp_path: Path) -> None:
    text = EXPRESSION + ROW.replace("106,,", "106,0.98,") + "\n"
    found = read(tmp_path, text)
    (row,) = found.expressions
    assert not found.findings
    deviation = row.log_deviation(np.array([300.0]))
    assert deviation is not None
    a, b = 0.85 / 2.26, 106.0 / 300.0
    assert deviation[0] == pytest.approx(np.sqrt(a * a + b * b - 2 * 0.98 * a * b), rel=1e-12)


def test_energy_in_other_units(tmp_path: Path) -> None:
    text = EXPRESSION.replace("E / K,sigma E / K", "E / kcal/mol,sigma E / kJ/mol")
    (row,) = read(tmp_path, text + ROW.replace("-6544,106", "-13,1") + "\n").expressions
    assert row.theta_k == pytest.approx(-13.0 * 4184.0 / GAS_J_MOL_K, rel=1e-12)
    assert row.sigma_theta_k == pytest.approx(1000.0 / GAS_J_MOL_K, rel=1e-12)


def test_findings(tmp_path: Path) -> None:
    without = read(tmp_path, POINTS + "point,pool,300,3,,2e-4,x\npoint,pool,310,2,,2e-4,x\n")
    assert [one.code for one in without.findings] == ["no-uncertainty"]
    assert [one.code for one in read(tmp_path, EXPRESSION + ROW).findings] == [
        "correlation-unknown"
    ]
    bare = ROW.replace("0.85e-43", "").replace("106", "")
    (finding,) = read(tmp_path, EXPRESSION + bare).findings
    assert (finding.code, finding.line) == ("no-uncertainty", 2)


GOOD = "point,pool,300,3,0.1,2e-4,x"


@pytest.mark.parametrize(
    ("text", "line", "what"),
    [
        ("", "", "the file is empty"),
        (POINTS, "", "there is no row below the headings"),
        (POINTS.replace("source", "sauce"), ":1", "unknown heading 'sauce'"),
        (POINTS.replace("k / s^-1", "k"), ":1", "the heading 'k' has no unit"),
        (POINTS.replace("source", "source / K"), ":1", "the heading 'source / K' takes no unit"),
        (POINTS.replace("sigma / s^-1", "k / s^-1"), ":1", "'k' has two columns"),
        (POINTS + GOOD + ",more", ":2", "8 cells under 7 headings"),
        (POINTS + '"point,pool', ":2", "not CSV: unexpected end of data"),
        (POINTS + GOOD.replace("point", "pint"), ":2", "unknown kind 'pint'"),
        (POINTS + GOOD.replace("point", ""), ":2", "no 'kind' in this row"),
        (POINTS + GOOD.replace("pool", "pol"), ":2", "unknown definition 'pol'"),
        (POINTS + GOOD.replace(",x", ","), ":2", "no 'source' in this row"),
        (POINTS + GOOD.replace(",3,", ",-3,"), ":2", "k is -3, not above 0"),
        (POINTS + GOOD.replace(",3,", ",0,"), ":2", "k is 0, not above 0"),
        (POINTS + GOOD.replace(",3,", ",nan,"), ":2", "'nan' in column 'k' is not a finite number"),
        (POINTS + GOOD.replace(",3,", ",1e400,"), ":2", "'1e400' in column 'k' is not a finite number"),
        (POINTS + GOOD.replace(",3,", ",3 s,"), ":2", "'3 s' in column 'k' is not a finite number"),
        (POINTS + GOOD.replace(",0.1,", ",-0.1,"), ":2", "sigma is -0.1, not above 0"),
        (POINTS + GOOD.replace(",300,", ",-5,"), ":2", "temperature is -5 K, not above 0 K"),
        (POINTS + GOOD.replace("2e-4", "-2e-4"), ":2 [W]", "concentration '-2e-4 mol/L' is not above 0"),
        (POINTS + GOOD + "\n" + GOOD.replace("0.1", ""), ":3", "1 of 2 points have no standard deviation"),
        (POINTS.replace("k / s^-1", "k / K") + GOOD, ":2", "'K' is no unit of a rate constant"),
        (POINTS.replace("k / s^-1", "k / L/mol/s") + GOOD, ":2",
         "sigma is in s^-1, k in L/mol/s: these are of different orders"),
        (POINTS.replace("k / s^-1,sigma / s^-1", "k / cm3/s,sigma / cm3/s") + GOOD, ":2",
         "a rate constant in cm3/s is of order 1 in what is held, and the row does not say in what"),
        (EXPRESSION + ROW.replace("2 W", "W"), ":2", "orders 'W' add up to 1, but a rate constant in"),
        (EXPRESSION + ROW.replace("2 W", "0 W"), ":2", "'0 W' in '0 W' is not a species"),
        (EXPRESSION + ROW.replace("250,360", "360,250"), ":2", "the expression holds from 360 K to 250 K"),
        (EXPRESSION + ROW.replace("1,1,-6544", "1,,-6544"), ":2", "'n' and 'T0' go together"),
        (EXPRESSION + ROW.replace("0.85e-43", ""), ":2", "an error of n or E but none of A"),
        (EXPRESSION + ROW.replace("106,,", "106,1,"), ":2", "correlation 1 of ln A and E"),
        (EXPRESSION + ROW.replace("2.26e-43", "-2e-43"), ":2", "A is -2e-43, not above 0"),
        (EXPRESSION + ROW.replace("expression", "point"), ":2", "a row of kind 'point' has 'from'"),
        (EXPRESSION + ROW.replace("-6544", ""), ":2", "no 'E' in this row"),
    ],
)  # fmt: skip
def test_wrong_rows(tmp_path: Path, text: str, line: str, what: str) -> None:
    with pytest.raises(StudyError) as error:
        read(tmp_path, text)
    assert error.value.what.startswith(what) or what in error.value.what
    assert error.value.where == f"{tmp_path / 'measured.csv'}{line}"
    assert error.value.mend


def test_unreadable(tmp_path: Path) -> None:
    with pytest.raises(StudyError, match="the measurements cannot be read: No such file"):
        read_measurements(tmp_path / "none.csv")
    (tmp_path / "latin.csv").write_bytes(POINTS.encode() + b"point,pool,300,3,0.1,2e-4,M\xfcller\n")
    with pytest.raises(StudyError, match=r"latin.csv:2: byte 0xfc is not UTF-8"):
        read_measurements(tmp_path / "latin.csv")


def test_an_expression_is_no_set_of_points(tmp_path: Path) -> None:
    found = read(tmp_path, EXPRESSION + ROW)
    assert not found.points
    assert isinstance(found.expressions[0], Expression)
    assert found.expressions[0].covariance.shape == (2, 2)
    assert found.expressions[0].uncertain == (0, 2)
