"""Time courses, flows and catalysts that meet themselves: from the study file to the answer."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from click.testing import CliRunner
from declared_study import edited, load

from thermo_pp.cli import main
from thermo_pp.errors import StudyError
from thermo_pp.kinetics.courses import TimeCourse
from thermo_pp.output.courses import time_course_tables
from thermo_pp.output.tables import Table
from thermo_pp.study.load import Study
from thermo_pp.units import GAS_J_MOL_K

T = 298.15


def species(name: str, formula: str, enthalpy: float, entropy: float) -> str:
    return (
        f'[species.{name}]\ncomposition = "{formula}"\n'
        f'enthalpy = "{enthalpy} kJ/mol"\nentropy = "{entropy} J/mol/K"\n'
    )


def study(
    folder: Path,
    conditions: str,
    members: list[tuple[str, str, float, float]],
    steps: list[tuple[str, str]],
    question: str,
    **options: object,
) -> Study:
    """Write a study in solution, at 1 mol/L, and load it."""
    text = '[treatment]\nphase = "solution"\nstandard_state = "1 mol/L"\n[conditions]\n'
    text += conditions + "\n"
    text += "".join(species(*member) for member in members)
    for equation, how in steps:
        text += f'[[steps]]\nequation = "{equation}"\n{how}\n'
    return load(folder, f"{text}[effective]\n{question}\n", **options)


SECOND = [("A", "CO", 0.0, 100.0), ("B", "H2", 0.0, 90.0), ("C", "CH2O", -30.0, 110.0),
          ("P", "CH2O", -70.0, 110.0), ("T1", "CH2O", 30.0, 120.0), ("T2", "CH2O", 45.0, 115.0)]  # fmt: skip
SECOND_STEPS = [("A + B = C", 'through = "T1"'), ("C = P", 'through = "T2"')]
AP = 'reactant = "A"\nproduct = "P"'


def second(
    folder: Path, *kelvin: float, moved: tuple[str, float] = ("", 0.0), more: str = ""
) -> Study:
    members = [
        (name, formula, h + (moved[1] if name == moved[0] else 0.0), s)
        for name, formula, h, s in SECOND
    ]
    conditions = f"temperatures = {list(kelvin) or [T]}\n"
    conditions += more or 'initial = { A = "0.1 mol/L", B = "0.3 mol/L" }'
    return study(folder, conditions, members, SECOND_STEPS, AP)


def at_conversion(course: TimeCourse, level: float) -> float:
    """ln of the rate where [A] has come to `level`, between the times of a course."""
    a = np.log(course.concentration_mol_l["A"])
    assert course.rate_mol_l_s is not None
    return float(np.interp(-np.log(level), -a, np.log(course.rate_mol_l_s)))


def test_a_course_conserves_and_ends_in_equilibrium(tmp_path: Path) -> None:
    [course] = second(tmp_path).transient().courses
    there = course.concentration_mol_l
    carbon = there["A"] + there["C"] + there["P"]
    assert carbon == pytest.approx(np.full(len(carbon), 0.1), rel=1e-12)
    assert there["B"] - there["A"] == pytest.approx(np.full(len(carbon), 0.2), rel=1e-12)
    assert course.at_equilibrium
    assert course.end_mol_l is not None
    for name, values in there.items():
        assert values[-1] == pytest.approx(course.end_mol_l[name], rel=1e-8), name
    # the equilibrium by hand: K of A + B = P
    k = np.exp((70_000.0 / T + 110.0 - 190.0) / GAS_J_MOL_K)
    end = course.end_mol_l
    assert end["P"] / (end["A"] * end["B"]) == pytest.approx(k, rel=1e-9)
    times = np.diff(np.log(course.time_s))
    assert times == pytest.approx(np.full(len(times), times[0]))
    assert course.time_s[0] == pytest.approx(course.fastest_lifetime_s)
    assert course.time_s[-1] >= 23.0 * course.slowest_lifetime_s


def test_derivatives_at_the_same_conversion(tmp_path: Path) -> None:
    level = 0.05
    [course] = second(tmp_path).transient().courses
    middle = np.interp(-level, -course.concentration_mol_l["A"], course.time_s)
    fine = middle * 2.0 ** np.linspace(-1.5, 2.5, 60)  # around the time of this conversion
    [course] = second(tmp_path).transient(times_s=[*fine]).courses
    k = int(np.argmin(np.abs(course.concentration_mol_l["A"] - level)))
    level = float(course.concentration_mol_l["A"][k])
    assert 0.03 < level < 0.08
    h = 0.05
    rates = []
    for kelvin in (T - h, T + h):
        times = fine * np.exp(20.0 * (1 - kelvin / T))
        [one] = second(tmp_path, kelvin).transient(times_s=[*times]).courses
        rates.append(at_conversion(one, level))
    energy = GAS_J_MOL_K * T**2 * (rates[1] - rates[0]) / (2 * h) / 1000.0
    assert course.arrhenius_energy_kj_mol is not None
    assert course.arrhenius_energy_kj_mol[k] == pytest.approx(energy, abs=0.1)
    for name in ("T1", "T2", "C", "B"):
        moved = [
            at_conversion(
                second(tmp_path, moved=(name, by)).transient(times_s=[*fine]).courses[0], level
            )
            for by in (0.02, -0.02)
        ]
        wanted = (moved[1] - moved[0]) * GAS_J_MOL_K * T / 40.0
        assert course.control[name][k] == pytest.approx(wanted, abs=0.02), name
    total = sum(course.control[name] for name in course.saddles)
    assert total == pytest.approx(np.ones(len(fine)), abs=1e-9)
    # d ln(rate)/d ln[A] along the course
    assert course.rate_mol_l_s is not None
    assert course.order is not None
    slope = np.gradient(np.log(course.rate_mol_l_s), np.log(course.concentration_mol_l["A"]))
    assert course.order[k] == pytest.approx(slope[k], abs=0.01)


def test_at_the_start_the_order_sum_is_that_of_the_initial_rate(tmp_path: Path) -> None:
    [course] = second(tmp_path).transient(times_s=[0.0]).courses
    k = GAS_J_MOL_K * T
    assert course.rate_mol_l_s is not None
    forward = np.exp(np.log(1.380649e-23 / 6.62607015e-34 * T) - (30e3 - T * (120 - 190)) / k)
    assert course.rate_mol_l_s[0] == pytest.approx(forward * 0.03, rel=1e-12)
    assert course.arrhenius_energy_kj_mol is not None
    assert course.arrhenius_energy_kj_mol[0] == pytest.approx((30e3 + k) / 1000.0, rel=1e-12)


def test_a_course_agrees_with_the_linear_network(tmp_path: Path) -> None:
    """Product away, pool at rest: the decay along the course is that of the pool, and so is its E_a."""
    text = edited(('W2 = "equilibrium" }', 'W2 = "equilibrium" }\ninitial = { A = "1e-9 mol/L" }'))
    made = load(tmp_path, text)
    pool = made.effective().rates["pool"]
    assert pool is not None
    result = made.transient(times_s=[0.1 / pool.rate_constant[0]])
    course = result.courses[0]
    assert course.rate_mol_l_s is not None
    assert course.arrhenius_energy_kj_mol is not None
    decay = course.rate_mol_l_s[0] / course.concentration_mol_l["A"][0]
    assert decay == pytest.approx(pool.rate_constant[0], rel=1e-4)
    assert course.order is not None
    assert course.order[0] == pytest.approx(1.0, abs=1e-4)


def test_held_species_that_run_out(tmp_path: Path) -> None:
    made = second(tmp_path, more='held = { B = "0.01 mol/L" }\ninitial = { A = "0.1 mol/L" }')
    result = made.transient()
    [finding] = [one for one in result.findings if one.code == "held-runs-out"]
    assert "B is held, but the course takes up 10 times the amount held" in finding.what
    few = second(tmp_path, more='held = { B = "0.01 mol/L" }\ninitial = { A = "1e-5 mol/L" }')
    assert not few.transient().findings


def test_a_product_more_stable_than_held_amounts_allow(tmp_path: Path) -> None:
    more = 'held = { A = "0.1 mol/L", B = "1 mol/L" }\ninitial = { C = "1e-3 mol/L" }'
    made = study(tmp_path, f"temperatures = [{T}]\n{more}", SECOND, SECOND_STEPS,
                 'reactant = "C"\nproduct = "P"')  # fmt: skip
    with pytest.raises(StudyError, match=r"P would come to 1\.22e\+07 mol/L with the held amounts"):
        made.transient()
    result = made.transient(times_s=[1.0])
    assert {one.code for one in result.findings} == {"beyond-held", "held-runs-out"}


def test_two_slow_modes(tmp_path: Path) -> None:
    members = [(n, "CO", h, 100.0) for n, h in
               (("A", 0.0), ("B", -0.1), ("C", 0.1), ("T1", 60.0), ("T2", 60.0))]  # fmt: skip
    made = study(tmp_path, f'temperatures = [{T}]\ninitial = {{ A = "1 mol/L" }}', members,
                 [("A = B", 'through = "T1"'), ("B = C", 'through = "T2"')],
                 'reactant = "A"\nproduct = "C"')  # fmt: skip
    result = made.transient()
    assert [one.code for one in result.findings] == ["two-slow-modes"]
    [course] = result.courses
    assert course.slowest_lifetime_s / course.next_lifetime_s == pytest.approx(3.0, rel=0.1)


def test_not_linear_without_amounts_says_which_key_to_add(tmp_path: Path) -> None:
    made = second(tmp_path, more="held = {}")
    with pytest.raises(StudyError, match=r"the network is not linear.*\n.*\[conditions\] initial"):
        made.effective()
    with pytest.raises(StudyError, match="what there is at the start"):
        made.transient()
    with pytest.raises(StudyError, match="the study has no flow"):
        made.flow()


@pytest.mark.parametrize(
    ("more", "what"),
    [
        ('initial = { X = "1 mol/L" }', "unknown species 'X'"),
        ('held = { B = "1 mol/L" }\ninitial = { B = "1 mol/L" }', "'B' is held too"),
        ('initial = { A = "1 bar" }', "'1 bar' is not a concentration"),
        ('initial = { A = "equilibrium" }', "'equilibrium' is not a concentration"),
        ('flow = { residence_time = "-1 s", feed = { A = "1 mol/L" } }', "'-1 s' is not above 0"),
    ],
)
def test_amounts_that_cannot_be(more: str, what: str, tmp_path: Path) -> None:
    with pytest.raises(StudyError, match=what):
        second(tmp_path, more=more)


def test_quasi_steady_state_beside_the_course(tmp_path: Path) -> None:
    """C of A + B = C, C = P: k1 a b/(k-1 + k2) where P is far from coming back; E_a by hand."""
    more = 'initial = { A = "0.1 mol/L", B = "0.3 mol/L" }\nquasi_steady = ["C"]'
    flat = [
        (n, f, 40.0 if n == "C" else 50.0 if n in ("T1", "T2") else h, s) for n, f, h, s in SECOND
    ]
    made = study(tmp_path, f"temperatures = [{T}]\n{more}", flat, SECOND_STEPS, AP)
    result = made.transient()
    [course] = result.courses
    steps = made.effective().steps
    k1, k2 = (float(step.forward_rate_constant[0]) for step in steps)
    back = float(steps[0].reverse_rate_constant[0])
    there = course.concentration_mol_l
    half = int(np.argmin(np.abs(there["A"] - 0.05)))
    wanted = k1 * there["A"][half] * there["B"][half] / (back + k2)
    ratio = course.quasi_steady_ratio["C"]
    assert ratio[half] == pytest.approx(wanted / there["C"][half], rel=1e-6)
    assert ratio[half] == pytest.approx(1.0, abs=1e-3)
    assert not abs(ratio[0] - 1.0) < 0.05  # at first there is next to none of C
    assert course.quasi_steady_rate_ratio is not None
    assert course.quasi_steady_rate_ratio[half] == pytest.approx(1.0, abs=1e-3)
    rt = GAS_J_MOL_K * T / 1000.0
    by_hand = 50.0 + rt  # both saddles have the same enthalpy
    assert course.quasi_steady_energy_kj_mol is not None
    assert course.quasi_steady_energy_kj_mol[half] == pytest.approx(by_hand, abs=1e-4)
    assert any("The quasi-steady state of C holds (5 %) from" in text for text in result.words)
    with pytest.raises(StudyError, match="unknown species 'X'"):
        second(tmp_path, more='quasi_steady = ["X"]')


# flows


def test_flow_of_one_irreversible_step(tmp_path: Path) -> None:
    """A + A = P in a stirred tank: 2 k a^2 = (a0 - a)/tau."""
    members = [("A", "CO", 0.0, 100.0), ("P", "C2O2", -300.0, 100.0)]
    flow = 'flow = { residence_time = "5 s", feed = { A = "0.4 mol/L" } }'
    made = study(tmp_path, f"temperatures = [{T}]\n{flow}", members,
                 [("A + A = P", 'arrhenius = { A = "1e4 L/mol/s", E = "20 kJ/mol" }')], AP)  # fmt: skip
    result = made.flow()
    assert "A mol/L" in result._repr_html_()
    k = 1e4 * np.exp(-20e3 / (GAS_J_MOL_K * T))
    a = (np.sqrt(1.0 + 8.0 * k * 5.0 * 0.4) - 1.0) / (4.0 * k * 5.0)
    assert result.concentration_mol_l["A"][0] == pytest.approx(a, rel=1e-12)
    assert result.rate_mol_l_s is not None
    assert result.rate_mol_l_s[0] == pytest.approx((0.4 - a) / 5.0, rel=1e-12)
    # implicit derivative of the same formula
    share = 1.0 / (1.0 + 4.0 * k * a * 5.0)
    assert result.arrhenius_energy_kj_mol is not None
    assert result.arrhenius_energy_kj_mol[0] == pytest.approx(20.0 * share, rel=1e-9)
    assert result.control["A + A = P"][0] == pytest.approx(share, rel=1e-9)
    order = 2.0 * k * 2.0 * a * share / (2.0 * k * a * a) * 0.4  # d ln r/d ln a0
    assert result.orders["A"][0] == pytest.approx(order, rel=1e-9)
    assert result.findings == ()


def gas(folder: Path, amounts: str, **options: object) -> Study:
    """Write A + B = C = P in the gas phase."""
    text = f'[treatment]\nphase = "gas"\nstandard_state = "1 bar"\n[conditions]\n{amounts}\n'
    text += "".join(species(*member) for member in SECOND)
    text += "".join(f'[[steps]]\nequation = "{one}"\n{how}\n' for one, how in SECOND_STEPS)
    return load(folder, f"{text}[effective]\n{AP}\n", **options)


def test_a_gas_has_its_energy_at_constant_concentration_and_at_constant_pressure(
    tmp_path: Path,
) -> None:
    """Against studies that state the same amounts in the other way; at the start, rate ~ c_A c_B."""
    pressure = 0.01 * 1000.0 * GAS_J_MOL_K * T  # Pa
    by_concentration = gas(
        tmp_path, f'temperatures = [{T}]\ninitial = {{ A = "0.01 mol/L", B = "0.01 mol/L" }}'
    )
    by_pressure = gas(
        tmp_path,
        f'temperatures = [{T}]\ninitial = {{ A = "{pressure!r} Pa", B = "{pressure!r} Pa" }}',
    )
    times = (0.0, 1.0, 1e3)
    (first,), (second_one,) = (
        each.transient(times_s=times).courses for each in (by_concentration, by_pressure)
    )
    for name, course in (("concentration", first), ("pressure", second_one)):
        own = course.arrhenius_energy_kj_mol
        assert own is not None
        assert course.arrhenius_energy_constant_kj_mol[name] == pytest.approx(own, abs=1e-9)
        for other in ("concentration", "pressure"):
            assert first.arrhenius_energy_constant_kj_mol[other] == pytest.approx(
                second_one.arrhenius_energy_constant_kj_mol[other], abs=1e-6
            )
    both = first.arrhenius_energy_constant_kj_mol
    apart = both["concentration"][0] - both["pressure"][0]
    assert apart == pytest.approx(2.0 * GAS_J_MOL_K * T / 1000.0, abs=1e-9)
    shown = time_course_tables(by_pressure.transient(times_s=times), "kJ/mol")
    assert isinstance(shown[0], Table)
    assert any("constant pressure" in column.quantity for column in shown[0].columns)


def test_several_steady_states_say_which_one(tmp_path: Path) -> None:
    """A + 2 B = 3 B with outflow: washed out, or burning."""
    members = [("A", "CO", 0.0, 100.0), ("B", "CO", -80.0, 100.0)]
    steps = [("A + B + B = B + B + B", 'rate = "100 L^2/mol^2/s"'), ("A = B", 'rate = "1e-7 s^-1"')]
    flow = 'flow = { residence_time = "1 s", feed = { A = "1 mol/L" } }'
    question = 'reactant = "A"\nproduct = "B"'
    cold = study(tmp_path, f"temperatures = [{T}]\n{flow}", members, steps, question).flow()
    assert [one.code for one in cold.findings] == ["several-steady-states"]
    assert cold.concentration_mol_l["A"][0] > 0.99
    # 100 a b^2 = b (to 1e-5): b (1 - b) = 0.01
    assert cold.other_mol_l["B"][0] == pytest.approx(0.98990, abs=1e-4)
    filled = f'{flow}\ninitial = {{ B = "1 mol/L" }}'
    hot = study(tmp_path, f"temperatures = [{T}]\n{filled}", members, steps, question).flow()
    assert hot.concentration_mol_l["B"][0] == pytest.approx(0.98990, abs=1e-4)
    assert hot.other_mol_l["A"][0] > 0.99
    assert "reached from the initial concentrations" in hot.findings[0].what


# catalysts

CATALYST = [("K", "Pd", 0.0, 100.0), ("K2", "Pd2", -80.0, 150.0), ("S", "CO", 0.0, 100.0),
            ("P", "CO", -60.0, 100.0), ("I", "PdCO", -30.0, 120.0), ("T1", "PdCO", 10.0, 130.0),
            ("T2", "PdCO", 30.0, 130.0)]  # fmt: skip
CYCLE = [("K + S = I", 'through = "T1"'), ("I = K + P", 'through = "T2"')]
DIMER = ("K + K = K2", 'rate = "1e9 L/mol/s"')
KP = 'catalyst = "K"\nproduct = "P"'


def catalyst(
    folder: Path,
    total: str,
    *kelvin: float,
    steps: object = (*CYCLE, DIMER),
    moved: tuple[str, float] = ("", 0.0),
) -> Study:
    used = {name for equation, how in steps for name in (*equation.split(), how.split('"')[1])}  # type: ignore[attr-defined]
    members = [
        (name, formula, h + (moved[1] if name == moved[0] else 0.0), s)
        for name, formula, h, s in CATALYST
        if name in used
    ]
    conditions = f'temperatures = {list(kelvin) or [T]}\nheld = {{ S = "0.1 mol/L" }}\n'
    conditions += f'total = {{ K = "{total}" }}' if total else ""
    return study(folder, conditions, members, list(steps), KP)  # type: ignore[call-overload]


def test_a_dimer_off_the_cycle_gives_half_order(tmp_path: Path) -> None:
    made = catalyst(tmp_path, "1e-3 mol/L")
    rate = made.effective().rates["cycle"]
    assert rate is not None
    # by hand: the cycle's two states per free K, and 2 [K2] + [K] + [I] = total
    k1, k2 = (float(step.forward_rate_constant[0]) for step in made.effective().steps[:2])
    back = float(made.effective().steps[0].reverse_rate_constant[0])
    per_k = 0.1 * k1 / (back + k2)
    dimer = np.exp((80e3 - T * 50.0) / (GAS_J_MOL_K * T))
    b = 1.0 + per_k
    free = (np.sqrt(b * b + 8.0 * dimer * 1e-3) - b) / (4.0 * dimer)
    turnover = k2 * per_k * free / 1e-3
    assert rate.rate_constant[0] == pytest.approx(turnover, rel=1e-10)
    assert rate.populations is not None
    assert rate.populations["K2"][0] == pytest.approx(2.0 * dimer * free**2 / 1e-3, rel=1e-10)
    assert sum(rate.populations.values())[0] == pytest.approx(1.0, rel=1e-12)
    assert rate.resting_state == ("K2",)
    order = 1e-3 / (free * (b + 4.0 * dimer * free))
    assert rate.catalyst_order is not None
    assert rate.catalyst_order[0] == pytest.approx(order, rel=1e-9)
    assert order == pytest.approx(0.5, abs=1e-3)


def test_turnover_sum_rules_and_derivatives(tmp_path: Path) -> None:
    rate = catalyst(tmp_path, "1e-6 mol/L").effective().rates["cycle"]
    assert rate is not None
    assert sum(rate.control[name] for name in rate.saddles)[0] == pytest.approx(1.0, abs=1e-10)
    made_of = {"K": "K", "K2": "KK", "S": "S", "I": "KS", "T1": "KS", "T2": "KS", DIMER[0]: "KK"}
    for part in "KS":
        total = sum(rate.control[name] * text.count(part) for name, text in made_of.items())
        assert total[0] == pytest.approx(0.0, abs=1e-10)
    h = 0.01
    pair = catalyst(tmp_path, "1e-6 mol/L", T - h, T + h).effective().rates["cycle"]
    assert pair is not None
    slope = float(np.diff(np.log(pair.rate_constant))[0]) / (2 * h)
    energy = GAS_J_MOL_K * T**2 * slope / 1000.0
    assert rate.arrhenius_energy_kj_mol[0] == pytest.approx(energy, abs=1e-5)
    for name in ("K2", "I", "T2", "S"):
        found = [
            catalyst(tmp_path, "1e-6 mol/L", moved=(name, by)).effective().rates["cycle"]
            for by in (-0.01, 0.01)
        ]
        logs = [np.log(one.rate_constant[0]) for one in found if one is not None]
        wanted = (logs[0] - logs[1]) * GAS_J_MOL_K * T / 20.0
        assert rate.control[name][0] == pytest.approx(wanted, abs=1e-6), name


def test_without_dimers_the_balance_is_that_of_the_linear_cycle(tmp_path: Path) -> None:
    """The dimer made so weak that it does not count: the exact linear cycle comes out."""
    weak = catalyst(tmp_path, "1e-6 mol/L", moved=("K2", 400.0)).effective().rates["cycle"]
    line = catalyst(tmp_path, "", steps=CYCLE).effective().rates["cycle"]
    assert weak is not None
    assert line is not None
    assert weak.rate_constant[0] == pytest.approx(line.rate_constant[0], rel=1e-9)
    assert weak.arrhenius_energy_kj_mol[0] == pytest.approx(
        line.arrhenius_energy_kj_mol[0], rel=1e-9
    )
    for name in ("T1", "T2", "K", "I", "S"):
        assert weak.control[name][0] == pytest.approx(line.control[name][0], abs=1e-9)
    assert weak.catalyst_order is not None
    assert weak.catalyst_order[0] == pytest.approx(1.0, abs=1e-9)


def test_a_dimer_without_a_total_says_which_key_to_add(tmp_path: Path) -> None:
    with pytest.raises(StudyError, match=r"not linear: 2 K .*\n.*total = \{ K = "):
        catalyst(tmp_path, "").effective()


# the command line


def test_barrier_follows_in_time(tmp_path: Path) -> None:
    second(tmp_path)
    file = str(tmp_path / "study.toml")
    run = CliRunner().invoke(
        main, ["barrier", file, "--format", "json", "--time", "1 min", "--time", "5"]
    )
    assert run.exit_code == 0, run.output
    answer = json.loads(run.stdout)
    [course] = answer["time_course"]["courses"]
    assert course["time_s"] == [5.0, 60.0]
    assert answer["time_course"]["followed"] == "A"
    assert answer["flow"] is None
    assert answer["net_reaction"] is None
    table = CliRunner().invoke(main, ["barrier", file])
    assert table.exit_code == 0, table.output
    assert "Time course at 298.15 K" in table.stdout
    assert "Control over time" in table.stdout
    wrong = CliRunner().invoke(main, ["barrier", file, "--time", "1 m"])
    assert wrong.exit_code == 2
    assert "--time" in wrong.output
    with pytest.raises(ValueError, match="before the start"):
        second(tmp_path).transient(times_s=[-1.0])


def test_barrier_shows_flow_and_order_in_catalyst(tmp_path: Path) -> None:
    second(
        tmp_path,
        more='flow = { residence_time = "5 s", feed = { A = "0.4 mol/L", B = "1 mol/L" } }',
    )
    file = str(tmp_path / "study.toml")
    shown = CliRunner().invoke(main, ["barrier", file])
    assert shown.exit_code == 0, shown.output
    assert "Steady state of the flow" in shown.stdout
    wide = CliRunner().invoke(main, ["barrier", file, "--format", "csv"])
    assert wide.exit_code == 0, wide.output
    answer = json.loads(CliRunner().invoke(main, ["barrier", file, "--format", "json"]).stdout)
    assert answer["flow"]["followed"] == "A"
    assert answer["flow"]["residence_s"] == 5.0
    catalyst(tmp_path, "1e-3 mol/L")
    assert "order in all K" in CliRunner().invoke(main, ["barrier", file]).stdout


def test_replace_keeps_results_frozen(tmp_path: Path) -> None:
    [course] = second(tmp_path).transient(times_s=[1.0]).courses
    with pytest.raises(ValueError, match="read-only"):
        replace(course).concentration_mol_l["A"][0] = 1.0  # type: ignore[index]


def test_products_share_by_rates_first_and_by_stability_last(tmp_path: Path) -> None:
    """B is formed three times as fast as C, which is the more stable one: closed forms at both ends."""
    members = [("A", "CO", 0.0, 100.0), ("B", "CO", -20.0, 100.0), ("C", "CO", -23.0, 100.0)]
    steps = [("A = B", 'rate = "3 s^-1"'), ("A = C", 'rate = "1 s^-1"')]
    conditions = f'temperatures = [{T}]\ninitial = {{ A = "1 mol/L" }}'
    question = 'reactant = "A"\nproduct = ["B", "C"]'
    made = study(tmp_path, conditions, members, steps, question)
    [early] = made.transient(times_s=[1e-4]).courses
    assert early.product_share["B"] == pytest.approx([0.75], rel=1e-6)
    [course] = made.transient().courses
    b, c = course.product_share["B"], course.product_share["C"]
    assert b[1:] + c[1:] == pytest.approx(1.0, abs=1e-12)
    ratio = np.exp(3000.0 / (GAS_J_MOL_K * T))
    assert c[-1] == pytest.approx(ratio / (1.0 + ratio), rel=1e-6)
    table = next(b for b in time_course_tables(made.transient(), "kJ/mol")
                 if isinstance(b, Table) and b.title.startswith("Products"))  # fmt: skip
    assert table.rows[-1][1:] == pytest.approx([b[-1], c[-1], b[-1] - c[-1]])
    only = study(tmp_path, conditions, members, steps, 'reactant = "A"\nproduct = "B"')
    assert only.transient().courses[0].product_share == {}
