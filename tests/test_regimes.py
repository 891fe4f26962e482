"""Regimes over temperature and a held amount: against closed forms and against the study at each point."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from click.testing import CliRunner
from exact_study import BRANCHED, CYCLE, HELD, Line, Member, Plan
from scipy.optimize import brentq

from thermo_pp.cli import main
from thermo_pp.errors import StudyError
from thermo_pp.kinetics.regime_map import NOTHING, RegimeQuestion, Regimes
from thermo_pp.kinetics.regimes import BLOCK, regimes
from thermo_pp.kinetics.results import WITHIN
from thermo_pp.study.load import Study

R = 8.31446261815324e-3  # kJ/mol/K
MOLAR_PER_BAR = 1e5 / (1000.0 * R * 1000.0)  # times 1/T: mol/L of 1 bar
SATURATING = Plan(
    {
        "A": Member("CO", 0.0, 200.0),
        "W": Member("H2O", 0.0, 190.0),
        "C": Member("CH2O2", -45.0, 290.0),
        "P": Member("CH2O2", -150.0, 260.0),
        "TA": Member("CH2O2", -35.0, 280.0),
        "TP": Member("CH2O2", -8.0, 230.0),
    },
    (Line("A + W = C", "through", "TA"), Line("C = P", "through", "TP")),
    {"reactant": "A", "product": "P"},
    {"W": "1e-3 mol/L"},
)
ASKED = RegimeQuestion("W", "concentration", 1e-8, 1e-2, 7)
GRID = (260.0, 300.0, 340.0)


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("studies")


@pytest.fixture(scope="module")
def saturating(folder: Path) -> Study:
    return SATURATING.at(*GRID).load(folder)


@pytest.fixture(scope="module")
def found(saturating: Study) -> Regimes:
    return regimes(saturating, ASKED)


def equilibrium(t: float) -> float:
    """K of A + W = C against 1 mol/L, from the plan's own H and S."""
    gibbs = -45.0 - t * (290.0 - 200.0 - 190.0) / 1000.0
    return float(np.exp(-gibbs / (R * t)) / (MOLAR_PER_BAR / t))


def test_every_point_is_the_study_at_that_point(found: Regimes, folder: Path) -> None:
    for j, amount in enumerate(found.amount):
        plan = replace(SATURATING.at(*GRID), held={"W": f"{float(amount)!r} mol/L"})
        alone = plan.load(folder).effective()
        for definition, one in found.maps.items():
            rate = alone.rates[definition]
            assert rate is not None
            assert one.rate_constant[:, j] == pytest.approx(rate.rate_constant, rel=1e-12)
            assert one.arrhenius_energy_kj_mol[:, j] == pytest.approx(
                rate.arrhenius_energy_kj_mol, rel=0.0, abs=1e-9
            )
            assert one.order[:, j] == pytest.approx(rate.orders["W"], rel=0.0, abs=1e-12)
            ratios = {a.name: a.ratio for a in rate.approximations}
            for k, name in enumerate(one.approximations):
                assert one.ratio[k, :, j] == pytest.approx(ratios[name], rel=1e-11)
            for i in range(len(GRID)):
                saddle = one.controlling_name(i, j)
                assert saddle == max(rate.saddles, key=lambda s: abs(rate.control[s][i]))
                assert one.control[i, j] == pytest.approx(rate.control[saddle][i], abs=1e-12)
                assert one.resting_name(i, j) == (rate.resting_state or [None] * 3)[i]


def test_what_is_named_holds_and_nothing_before_it_does(found: Regimes) -> None:
    for one in found.maps.values():
        near = np.abs(one.ratio - 1.0) <= WITHIN
        for i, j in np.ndindex(one.holding.shape):
            k = one.holding[i, j]
            assert not near[: len(near) if k == NOTHING else k, i, j].any()
            assert k == NOTHING or near[k, i, j]


def test_edges_over_the_amount_are_where_the_closed_form_has_them(found: Regimes) -> None:
    """Steady state of C: per pool it leaves out C itself, k(steady)/k(exact) = 1 + K [W] TA being far below TP."""
    one = found.maps["pool"]
    for i, t in enumerate(GRID):
        [window] = one.windows["steady state of all intermediates"][i]
        assert window.open_below
        assert not window.open_above
        # TP is 40 kJ/mol above TA: the return is fast, and 1 + K c is the ratio to 1e-4
        assert window.to_amount == pytest.approx(WITHIN / equilibrium(t), rel=2e-3)


def test_more_points_move_no_edge(saturating: Study, found: Regimes) -> None:
    finer = regimes(saturating, replace(ASKED, points=31))
    for definition, one in found.maps.items():
        assert finer.maps[definition].windows == one.windows
        for k in (0, 6):
            assert finer.maps[definition].sign_changes[5 * k] == one.sign_changes[k]


def test_edges_are_located_to_a_thousandth(saturating: Study, folder: Path) -> None:
    one = regimes(saturating, ASKED).maps["pool"]
    checked = 0
    for name, rows in one.windows.items():
        for i, windows in enumerate(rows):
            for window in windows:
                for edge, is_open in (
                    (window.from_amount, window.open_below),
                    (window.to_amount, window.open_above),
                ):
                    if is_open:
                        continue
                    sides = []
                    for factor in (0.999, 1.001):
                        plan = replace(
                            SATURATING.at(GRID[i]), held={"W": f"{float(edge * factor)!r} mol/L"}
                        )
                        rate = plan.load(folder).effective().rates["pool"]
                        assert rate is not None
                        [ratio] = [a.ratio[0] for a in rate.approximations if a.name == name]
                        sides.append(abs(ratio - 1.0) <= WITHIN)
                    assert sides[0] != sides[1], (name, edge)
                    checked += 1
    assert checked >= 3


def test_contour_is_where_the_arrhenius_energy_is_zero(saturating: Study, folder: Path) -> None:
    """Each point of the contour against a bisection of E_a itself, at the amount of its column."""
    one = regimes(saturating, ASKED).maps["pool"]
    located = [(j, c) for j, changes in enumerate(one.sign_changes) for c in changes]
    assert located
    amounts = regimes(saturating, ASKED).amount

    for j, change in located:

        def energy(t: float, j: int = j) -> float:
            plan = replace(SATURATING.at(t), held={"W": f"{float(amounts[j])!r} mol/L"})
            rate = plan.load(folder).effective().rates["pool"]
            assert rate is not None
            return float(rate.arrhenius_energy_kj_mol[0])

        t = change.temperature_k
        root = brentq(energy, t - 1.0, t + 1.0, xtol=1e-6)
        assert t == pytest.approx(root, rel=0.0, abs=0.01)
        assert change.kind == ("maximum" if energy(t - 0.5) > 0.0 else "minimum")


def test_a_pressure_is_taken_as_held(folder: Path) -> None:
    """E_a at a constant partial pressure is that of the study held so."""
    plan = replace(SATURATING.at(300.0), held={"W": "1 mbar"})
    asked = RegimeQuestion("W", "pressure", 10.0, 1000.0, 3)
    found = regimes(plan.load(folder), asked)
    assert found.unit == "Pa"
    rate = plan.load(folder).effective().rates["pool"]
    assert rate is not None
    middle = found.maps["pool"]
    assert found.amount[1] == pytest.approx(100.0, rel=1e-14)
    assert middle.arrhenius_energy_kj_mol[0, 1] == pytest.approx(
        rate.arrhenius_energy_kj_mol[0], abs=1e-10
    )


def test_equilibrium_species_follow(folder: Path) -> None:
    study = BRANCHED.at(260.0, 400.0).load(folder)
    found = regimes(study, RegimeQuestion("W", "concentration", 1e-3, 1.0, 3))
    plan = replace(BRANCHED.at(260.0, 400.0), held={**BRANCHED.held, "W": "1.0 mol/L"})
    rate = plan.load(folder).effective().rates["pool"]
    assert rate is not None
    assert found.maps["pool"].rate_constant[:, -1] == pytest.approx(rate.rate_constant, rel=1e-12)


def test_a_catalyst_has_a_map_of_its_own(folder: Path) -> None:
    held = dict(HELD)
    name = next(name for name, amount in held.items() if amount.endswith("mol/L"))
    study = CYCLE.at(280.0, 320.0).load(folder)
    found = regimes(study, RegimeQuestion(name, "concentration", 1e-4, 1e-2, 3))
    assert list(found.maps) == ["cycle"]
    one = found.maps["cycle"]
    assert one.population is not None
    assert np.all((one.population > 0.0) & (one.population <= 1.0))
    assert {one.states[k] for k in np.unique(one.resting)} <= set(one.states)


def test_blocks_make_no_difference(saturating: Study, monkeypatch: pytest.MonkeyPatch) -> None:
    assert BLOCK > 97
    whole = regimes(saturating, ASKED)
    monkeypatch.setattr("thermo_pp.kinetics.regimes.BLOCK", 97)
    parts = regimes(saturating, ASKED)
    for definition, one in whole.maps.items():
        assert np.array_equal(parts.maps[definition].rate_constant, one.rate_constant)
        assert parts.maps[definition].windows == one.windows


@pytest.mark.parametrize(
    ("asked", "what"),
    [
        (RegimeQuestion("V", "concentration", 1e-6, 1e-1, 5), "'V' is not held"),
        (RegimeQuestion("W", "pressure", 1.0, 10.0, 5), "is no pressure"),
        (RegimeQuestion("W", "concentration", 1e-1, 1e-6, 5), "no range from 0.1 to 1e-06 mol/L"),
        (RegimeQuestion("W", "concentration", 0.0, 1e-6, 5), "no range from 0"),
        (RegimeQuestion("W", "concentration", 1e-6, 1e-1, 1), "1 points at 3 temperatures"),
        (RegimeQuestion("W", "concentration", 1e-6, 1e-1, 100_000), "100000 points at 3"),
    ],
    ids=lambda value: value if isinstance(value, str) else "",
)
def test_refused(saturating: Study, asked: RegimeQuestion, what: str) -> None:
    with pytest.raises(StudyError, match=what):
        regimes(saturating, asked)


def test_words_follow_the_fields(found: Regimes) -> None:
    from thermo_pp.kinetics.regime_words import words

    assert any("(per pool) holds below" in sentence for sentence in found.words)
    assert any(sentence.startswith("E_a per pool changes its sign") for sentence in found.words)
    one = found.maps["pool"]
    nowhere = replace(one, windows=dict.fromkeys(one.windows, ((), (), ())))
    changed = words(replace(found, maps={**found.maps, "pool": nowhere}))
    assert any("(per pool) holds at no W of the range" in sentence for sentence in changed)
    below = replace(
        one,
        sign_changes=((),) * len(found.amount),
        arrhenius_energy_kj_mol=-np.ones_like(one.arrhenius_energy_kj_mol),
    )
    changed = words(replace(found, maps={**found.maps, "pool": below}))
    assert "E_a per pool is below zero all over the map." in changed


# ------------------------------------------------------------------------------- study and command


def test_command_and_key_ask_the_same(tmp_path: Path) -> None:
    folder = tmp_path
    plan = SATURATING.at(*GRID)
    plan.load(folder)
    [file] = folder.glob("*.toml")
    asked = ["barrier", str(file), "--format", "json", "--quiet"]
    run = CliRunner().invoke(
        main, [*asked, "--regimes", "W", "1e-8", "0.01", "--regime-points", "7"]
    )
    assert run.exit_code == 0, run.output
    by_option = json.loads(run.stdout)
    keyed = folder / "keyed.toml"
    keyed.write_text(
        file.read_text() + '\n[regimes]\nover = "W"\nfrom = "1e-8 mol/L"\nto = 0.01\npoints = 7\n'
    )
    run = CliRunner().invoke(main, ["barrier", str(keyed), "--format", "json", "--quiet"])
    assert run.exit_code == 0, run.output
    by_key = json.loads(run.stdout)
    assert by_key["regimes"] == by_option["regimes"]
    whole = by_key["regimes"]["maps"]["per_pool"]
    assert np.array(whole["rate_constant"]).shape == (3, 7)
    assert "(per pool) holds below" in by_key["words"]
    for form, text in (
        ("table", "Where Eₐ is 0"),
        ("csv", "windows"),
        ("markdown", "Regimes over W"),
    ):
        run = CliRunner().invoke(main, ["barrier", str(keyed), "--format", form, "--quiet"])
        assert run.exit_code == 0, run.output
        assert form == "csv" or text in run.stdout


def test_a_wrong_amount_names_option_and_mend(tmp_path: Path) -> None:
    folder = tmp_path
    SATURATING.at(*GRID).load(folder)
    [file] = folder.glob("*.toml")
    for ends, what in (
        (("W", "1 mbar", "2 mbar"), "is no concentration"),
        (("WW", "1", "2"), "did you mean 'W'?"),
        (("W", "0", "2"), "is not above 0"),
    ):
        run = CliRunner().invoke(main, ["barrier", str(file), "--regimes", *ends])
        assert run.exit_code == 1
        assert what in run.output
        assert "--regimes" in run.output
