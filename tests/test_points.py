"""Rates at a declared point of networks that are not linear: answers, doubt, comparison, refusals."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from test_transient import SECOND, SECOND_STEPS, study

from thermo_pp.errors import StudyError
from thermo_pp.kinetics.doubt.assess import assess
from thermo_pp.kinetics.model import Model
from thermo_pp.kinetics.point import NotReached, point_rate, rate_of
from thermo_pp.kinetics.point_rate import PointRate
from thermo_pp.study.load import Study
from thermo_pp.units import GAS_J_MOL_K

INITIAL = 'initial = { A = "0.1 mol/L", B = "0.3 mol/L" }'
FLOW = 'flow = { residence_time = "1e4 s", feed = { A = "0.1 mol/L", B = "0.3 mol/L" } }'
PLACES = {"start": INITIAL, "20 %": INITIAL, "steady state": FLOW}
LAW = "rate_law = { A = 1, B = 1 }\n"
DOUBT = '[doubt]\ndeviation = "0.3 kJ/mol"\nsaddle_deviation = "0.5 kJ/mol"\nalternatives = false\n'
T = 300.0


def asked(
    folder: Path,
    at: str = "start",
    *,
    kelvin: float = T,
    law: str = LAW,
    more: str = "",
    moved: tuple[str, float] = ("", 0.0),
    conditions: str | None = None,
) -> Study:
    members = [(n, f, h + (moved[1] if n == moved[0] else 0.0), s) for n, f, h, s in SECOND]
    question = f'reactant = "A"\nproduct = "P"\nat = "{at}"\n{law}{more}'
    given = PLACES[at] if conditions is None else conditions
    return study(folder, f"temperatures = [{kelvin}]\n{given}", members, SECOND_STEPS, question)


def at_point(one: Study) -> PointRate:
    model = Model(one.mechanism, one.conditions, one.treatment, one.species)
    return point_rate(model.at(np.array(one.conditions.temperature_k)))


@pytest.mark.parametrize("at", PLACES)
def test_controls_and_energy_are_derivatives(at: str, tmp_path: Path) -> None:
    """Against differences between whole studies: one energy moved, another temperature."""
    found = at_point(asked(tmp_path, at))
    step = 0.02
    for name in ("A", "C", "T1", "T2"):
        up, down = (at_point(asked(tmp_path, at, moved=(name, s))).log[0] for s in (step, -step))
        slope = -(up - down) / (2.0 * step) * GAS_J_MOL_K * T / 1000.0
        assert found.control[name][0] == pytest.approx(slope, abs=2e-5), name
    hot, cold = (at_point(asked(tmp_path, at, kelvin=T + s)).log[0] for s in (step, -step))
    energy = GAS_J_MOL_K * T**2 * (hot - cold) / (2.0 * step)
    assert found.energy_j_mol[0] == pytest.approx(energy, abs=2.0)


def test_the_start_is_the_first_step(tmp_path: Path) -> None:
    """At the start nothing comes back: the rate over [A][B] is the constant of A + B = C."""
    one = asked(tmp_path)
    model = Model(one.mechanism, one.conditions, one.treatment, one.species)
    rates = model.at(np.array([T]))
    found = point_rate(rates)
    assert found.unit == "L mol^-1 s^-1"
    assert found.log == pytest.approx(rates.steps.log_forward[:, 0], rel=1e-13)
    assert found.control["T1"][0] == pytest.approx(1.0, abs=1e-13)
    bare = at_point(asked(tmp_path, law=""))
    assert bare.unit == "mol L^-1 s^-1"
    assert bare.log[0] == pytest.approx(found.log[0] + np.log(0.1 * 0.3), abs=1e-12)


def test_a_conversion_lies_on_the_time_course(tmp_path: Path) -> None:
    """Rate and controls of the point against the time course, between whose times it lies."""
    found = at_point(asked(tmp_path, "20 %", law=""))
    [course] = asked(tmp_path, "20 %").transient().courses
    a = course.concentration_mol_l["A"]
    assert course.rate_mol_l_s is not None
    k = int(np.argmin(np.abs(a - 0.08)))
    [near] = asked(tmp_path, "20 %").transient(times_s=[course.time_s[k]]).courses
    share = f"{100.0 * (1.0 - near.concentration_mol_l['A'][0] / 0.1):.15g} %"
    there = at_point(asked(tmp_path, share, law="", conditions=INITIAL))
    assert near.rate_mol_l_s is not None
    assert np.exp(there.log[0]) == pytest.approx(near.rate_mol_l_s[0], rel=1e-5)
    assert there.control["T1"][0] == pytest.approx(near.control["T1"][0], rel=1e-4)
    assert found.sign[0] == 1.0


@pytest.mark.parametrize(("at", "samples"), [("start", 2000), ("steady state", 300), ("20 %", 50)])
def test_spread_is_that_of_first_order(at: str, samples: int, tmp_path: Path) -> None:
    """For small deviations, within three sampling errors and what is beyond first order."""
    one = asked(tmp_path, at, more=DOUBT)
    assert one.uncertainty is not None
    result = assess(one, replace(one.uncertainty, samples=samples))
    rate = result.rates["point"]
    assert rate.unit == "L mol^-1 s^-1"
    assert rate.spread is not None
    assert result.samples == samples
    within = 3.0 / np.sqrt(2.0 * samples) + 0.03
    assert rate.spread.log_deviation == pytest.approx(rate.first_order_log_deviation, rel=within)
    assert rate.spread.energy_deviation_kj_mol == pytest.approx(
        rate.first_order_energy_deviation_kj_mol, rel=within + 0.05
    )
    assert rate.spread.negative_energy.value[0] == 0.0
    assert rate.spread.same_answer.value[0] == 1.0


def test_fewer_samples_are_said(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("thermo_pp.kinetics.point.STARTS", 150)
    monkeypatch.setattr("thermo_pp.kinetics.point.FEWEST_SAMPLES", 100)
    result = asked(tmp_path, more=f"{DOUBT}samples = 400\n").doubt()
    assert result.samples == 150
    [finding] = [one for one in result.findings if one.code == "doubt-fewer-samples"]
    assert finding.what.startswith("150 samples of the energies instead of 400: each takes a start")
    assert result.words[0].startswith("Doubt: 150 samples")


def test_samples_that_do_not_come_to_the_point(tmp_path: Path) -> None:
    """P is hardly below A + B: some samples stop short of the conversion, and are left out and counted."""
    more = DOUBT.replace("0.3 kJ", "6 kJ")
    one = asked(tmp_path, "98 %", more=more, conditions=INITIAL, moved=("P", 20.0))
    assert one.uncertainty is not None
    result = assess(one, replace(one.uncertainty, samples=20))
    spread = result.rates["point"].spread
    assert spread is not None
    assert 0 < spread.not_reached < 20
    assert "doubt-not-reached" in [finding.code for finding in result.findings]
    assert np.isfinite(spread.log_bands).all()
    with pytest.raises(NotReached, match=r"does not come to a conversion of 99\.99 %"):
        at_point(asked(tmp_path, "99.99 %", conditions=INITIAL, moved=("P", 60.0)))


def test_the_turnover_of_a_catalyst_that_meets_itself(tmp_path: Path) -> None:
    """Doubt about a cycle with a dimer: half order in the catalyst, first order and samples."""
    members = [
        ("K", "H", 0.0, 100.0), ("K2", "H2", -80.0, 110.0), ("S", "CO", 0.0, 150.0),
        ("KP", "CHO", -20.0, 140.0), ("P", "CO", -30.0, 150.0), ("T1", "CHO", 50.0, 150.0),
        ("T2", "CHO", 40.0, 140.0),
    ]  # fmt: skip
    steps = [
        ("K + K = K2", 'rate = "1e9 L/mol/s"'),
        ("K + S = KP", 'through = "T1"'),
        ("KP = K + P", 'through = "T2"'),
    ]
    conditions = (
        f'temperatures = [{T}]\nheld = {{ S = "0.1 mol/L" }}\ntotal = {{ K = "1e-3 mol/L" }}'
    )
    question = f'catalyst = "K"\nproduct = "P"\n{DOUBT}samples = 300\n'
    result = study(tmp_path, conditions, members, steps, question).doubt()
    rate = result.rates["cycle"]
    assert rate.answer.resting_state == ("K2",)
    assert rate.spread is not None
    assert rate.spread.log_deviation == pytest.approx(rate.first_order_log_deviation, rel=0.16)
    slope = dict(zip(rate.narrowing.names, rate.narrowing.log_slope[:, 0], strict=True))
    per_rt = 1000.0 / (GAS_J_MOL_K * T)
    assert slope["K2"] == pytest.approx(0.5 * per_rt, rel=0.01)  # all of it rests as the dimer


def measured(folder: Path, factor: float, **columns: str) -> Path:
    file = folder / "k.csv"
    unit = columns.pop("unit", "L mol^-1 s^-1")
    cells = {"kind": "point", "definition": "point", "orders": "B", "source": "made up"} | columns
    k = np.exp(at_point(asked(folder)).log[0]) * factor
    heading = ",".join(cells) + f",temperature / K,k / {unit},sigma / {unit}"
    row = ",".join(cells.values()) + f",{T},{k:.17g},{0.1 * k:.17g}"
    file.write_text(f"{heading}\n{row}\n")
    return file


def test_compare_with_a_constant_of_the_law(tmp_path: Path) -> None:
    file = measured(tmp_path, 2.0)
    found = asked(tmp_path, more=DOUBT).compare(file)
    [point] = found.points
    assert point.log_ratio == pytest.approx(np.log(2.0), abs=1e-12)
    assert point.log_deviation == pytest.approx(
        np.hypot(0.5, 0.3 * np.sqrt(2.0)) * 1000.0 / (GAS_J_MOL_K * T), rel=1e-6
    )
    t1 = next(state for state in found.states if state.name == "T1")
    assert t1.control == pytest.approx(1.0, abs=1e-9)
    assert t1.shift_kj_mol == pytest.approx(-GAS_J_MOL_K * T / 1000.0 * np.log(2.0), rel=1e-6)


@pytest.mark.parametrize(
    ("options", "columns", "what"),
    [
        ({"law": ""}, {}, "cannot be set against that"),
        ({}, {"orders": "", "unit": "s^-1"}, "over A is of another order than the study's rate law"),
        ({"law": "rate_law = { A = 2 }\n"}, {}, "over A + B is of another order"),
        ({}, {"definition": "pool", "orders": "", "unit": "s^-1"}, "no rate of the definition 'pool'"),
    ],
)  # fmt: skip
def test_what_cannot_be_compared(
    options: dict[str, str], columns: dict[str, str], what: str, tmp_path: Path
) -> None:
    file = measured(tmp_path, 1.0, **columns)
    with pytest.raises(StudyError, match=what.replace("+", r"\+")) as error:
        asked(tmp_path, **options).compare(file)  # type: ignore[arg-type]
    assert error.value.where == f"{file}:2"


@pytest.mark.parametrize(
    ("change", "what"),
    [
        (('at = "start"', 'at = "soon"'), "'soon' is no point of a time course or flow"),
        (('at = "start"', 'at = "100 %"'), "a conversion of 100 % is not between 0 and 100 %"),
        (('at = "start"\n', ""), "a rate law has no use without a point"),
        (("A = 1, B = 1", "A = 1, Q = 1"), "'Q' is not made or used by any step"),
        (("A = 1, B = 1", "A = 1, P = 1"), "there is no P at the start to divide the rate by"),
        (('at = "start"', 'at = "steady state"'), "a steady state needs a flow"),
        ((INITIAL, 'initial = { B = "0.1 mol/L" }'), "how much of A there is at the start"),
    ],
)
def test_points_that_cannot_be_asked_for(
    change: tuple[str, str], what: str, tmp_path: Path
) -> None:
    asked(tmp_path)
    file = tmp_path / "study.toml"
    text = file.read_text()
    assert change[0] in text
    file.write_text(text.replace(*change))
    with pytest.raises(StudyError, match=what):
        at_point(Study.load(file))


def test_barrier_says_it(tmp_path: Path) -> None:
    said = asked(tmp_path, "steady state").effective().words[1]
    assert said.startswith(
        "At the steady state of the flow and 300 K the loss of A over [A] [B] is"
    )
    assert "L mol^-1 s^-1, E_a" in said
    model = Model(
        *(getattr(asked(tmp_path), n) for n in ("mechanism", "conditions", "treatment", "species"))
    )
    assert rate_of(model.at(np.array([T])), "point").saddles == ("T1", "T2")


def as_gas(one: Study, amounts: str, instead: str) -> Study:
    """Return a study in the gas phase, with other amounts in place of its own."""
    file = Path(one.mechanism.where)
    text = file.read_text()
    assert amounts in text
    gas = text.replace(amounts, instead).replace('phase = "solution"', 'phase = "gas"')
    file.write_text(gas)
    return Study.load(file)


@pytest.mark.parametrize(
    ("fractions", "pressures", "at"),
    [
        (
            'initial = { A = "1 %", B = "30000 ppm" }',
            'initial = { A = "0.02 bar", B = "0.06 bar" }',
            "20 %",
        ),
        (
            'flow = { residence_time = "1e6 s", feed = { A = "1 %", B = "0.03 mol/mol" } }',
            'flow = { residence_time = "1e6 s", feed = { A = "0.02 bar", B = "0.06 bar" } }',
            "steady state",
        ),
    ],
)
def test_mole_fractions_of_a_total_pressure(
    fractions: str, pressures: str, at: str, tmp_path: Path
) -> None:
    """Of 2 bar: the same rate and the same E_a, which thins out on heating in both."""

    def of(instead: str, kelvin: float = T) -> PointRate:
        one = asked(tmp_path, at, law="", kelvin=kelvin)
        return at_point(as_gas(one, PLACES[at], instead))

    whole = f'total_pressure = "2 bar"\n{fractions}'
    ours, same = of(whole), of(pressures)
    assert ours.log == pytest.approx(same.log, abs=1e-12)
    assert ours.energy_j_mol == pytest.approx(same.energy_j_mol, rel=1e-10)
    energy = GAS_J_MOL_K * T**2 * (of(whole, T + 0.02).log[0] - of(whole, T - 0.02).log[0]) / 0.04
    assert ours.energy_j_mol[0] == pytest.approx(energy, abs=3.0)
    with pytest.raises(StudyError, match="is a mole fraction, and there is no total pressure"):
        of(fractions)


def test_a_total_is_no_mole_fraction(tmp_path: Path) -> None:
    """How much catalyst there is must not change with temperature: refused as a share of a pressure."""
    members = [("K", "H", 0.0, 100.0), ("K2", "H2", -80.0, 110.0), ("S", "CO", 0.0, 150.0),
               ("P", "CO", -30.0, 150.0), ("T1", "CHO", 50.0, 150.0)]  # fmt: skip
    steps = [("K + K = K2", 'rate = "1e9 L/mol/s"'), ("K + S = K + P", 'through = "T1"')]
    total = 'total = { K = "1e-4 mol/L" }'
    conditions = f'temperatures = [{T}]\nheld = {{ S = "0.1 mol/L" }}\n{total}'
    one = study(tmp_path, conditions, members, steps, 'catalyst = "K"\nproduct = "P"')
    with pytest.raises(StudyError, match="'50 ppm' is not a concentration"):
        as_gas(one, total, 'total_pressure = "2 bar"\ntotal = { K = "50 ppm" }')


def test_a_turnover_has_both_energies_and_what_its_limits_do(tmp_path: Path) -> None:
    """In a gas: E_a at constant concentration and pressure differ by n RT; limits slow it as its steps."""
    members = [("K", "H", 0.0, 100.0), ("K2", "H2", -80.0, 110.0), ("S", "CO", 0.0, 150.0),
               ("P", "CO", -30.0, 150.0), ("T1", "CHO", 0.0, 210.0)]  # fmt: skip
    steps = [("K + K = K2", 'rate = "1e9 L/mol/s"'), ("K + S = K + P", 'through = "T1"')]
    total = 'total = { K = "1e-4 mol/L" }'
    conditions = f'temperatures = [{T}]\nheld = {{ S = "1e-3 mol/L" }}\n{total}'
    one = study(tmp_path, conditions, members, steps, 'catalyst = "K"\nproduct = "P"')
    cycle = as_gas(one, total, total).effective().rates["cycle"]
    assert cycle is not None
    both = cycle.arrhenius_energy_constant_kj_mol
    assert both is not None
    assert cycle.orders["S"][0] == pytest.approx(1.0, abs=1e-9)
    assert both["concentration"] == pytest.approx(cycle.arrhenius_energy_kj_mol, rel=1e-12)
    assert both["concentration"] - both["pressure"] == pytest.approx(
        GAS_J_MOL_K * T / 1000.0, rel=1e-9
    )
    assert cycle.log_limit is not None
    assert cycle.log_limit[0] < -1e-3


def test_a_point_of_a_linear_network_is_said_to_change_nothing(tmp_path: Path) -> None:
    held = 'held = { B = "0.3 mol/L" }'
    found = asked(tmp_path, conditions=held, law="").effective()
    assert [one.code for one in found.findings].count("point-not-used") == 1
    assert found.rates["free"] is not None
