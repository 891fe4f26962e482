"""Competing products: ratios, their derivative and controls, and where Curtin-Hammett holds."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from click.testing import CliRunner
from exact_study import Line, Member, Plan
from scipy.optimize import brentq

from thermo_pp.cli import main
from thermo_pp.errors import StudyError
from thermo_pp.kinetics.product_ratio import ProductRatio, Selectivity, SelectivityQuestion
from thermo_pp.kinetics.results import EffectiveRate
from thermo_pp.kinetics.selectivity import selectivity

R = 8.31446261815324e-3  # kJ/mol/K
BOLTZMANN_OVER_PLANCK = 1.380649e-23 / 6.62607015e-34
GRID = (200.0, 250.0, 298.15, 400.0)
A, B = (0.0, 300.0), (6.0, 310.0)
TAB, TP, TQ = (70.0, 305.0), (90.0, 330.0), (75.0, 300.0)


def member(values: tuple[float, float]) -> Member:
    return Member("C4H8", *values)


TWO = Plan(
    {
        "A": member(A),
        "B": member(B),
        "P": member((-40.0, 300.0)),
        "Q": member((-50.0, 290.0)),
        "TAB": member(TAB),
        "TP": member(TP),
        "TQ": member(TQ),
    },
    (
        Line("A = B", "through", "TAB"),
        Line("A = P", "through", "TP"),
        Line("B = Q", "through", "TQ"),
    ),
    {"reactant": "A", "product": ("P", "Q")},
    temperatures=GRID,
)
HELD = {"A": "1.0 mol/L", "P": "2e5 mol/L", "Q": "1e-4 mol/L"}
"""So much of P that its way back counts, and P makes Q."""
CROSSED = replace(
    TWO,
    species={**TWO.species, "TBP": member((84.0, 315.0))},
    steps=(*TWO.steps, Line("B = P", "through", "TBP")),
    held={"A": "0.6 mol/L", "P": "5e6 bar", "Q": "2e7 bar"},
    temperatures=(300.0, 350.0, 400.0),
)
"""P makes Q by way of B, close to equilibrium at the highest temperature; amounts that change with it."""
CYCLE = Plan(
    {
        "cat": Member("CH4", 0.0, 200.0),
        "S": Member("CO", 0.0, 200.0),
        "R1": Member("CO", -60.0, 200.0),
        "R2": Member("CO", -60.0, 201.0),
        "X": Member("C2H4O", -20.0, 320.0),
        "Y": Member("C2H4O", -14.0, 325.0),
        "TX": Member("C2H4O", 20.0, 320.0),
        "T1": Member("C2H4O", 34.0, 318.0),
        "T2": Member("C2H4O", 30.0, 318.0),
    },
    (
        Line("cat + S = X", "rate", "1e8 L/mol/s"),
        Line("X = Y", "through", "TX"),
        Line("X = cat + R1", "through", "T1"),
        Line("Y = cat + R2", "through", "T2"),
    ),
    {"catalyst": "cat", "product": ("R1", "R2")},
    {"S": "0.1 mol/L"},
    temperatures=GRID,
)


def of(plan: Plan, folder: Path, effective: EffectiveRate | None = None) -> Selectivity:
    """Return the selectivity; numbers take nothing but the temperatures from `effective`."""
    study = plan.load(folder)
    found = selectivity(study, effective or study.effective())
    assert found is not None
    return found


def only(found: Selectivity) -> ProductRatio:
    [one] = found.ratios
    return one


def constant(start: tuple[float, float], saddle: tuple[float, float], t: float) -> float:
    barrier = (saddle[0] - start[0]) - t * (saddle[1] - start[1]) / 1000.0
    return float(BOLTZMANN_OVER_PLANCK * t * np.exp(-barrier / (R * t)))


def closed_form(t: float) -> float:
    """P over Q of P <- A = B -> Q: kP (k-1 + kQ)/(k1 kQ)."""
    k1, back = constant(A, TAB, t), constant(B, TAB, t)
    return constant(A, TP, t) * (back + constant(B, TQ, t)) / (k1 * constant(B, TQ, t))


def curtin_hammett(t: float) -> float:
    return float(np.exp(-(TP[0] - TQ[0] - t * (TP[1] - TQ[1]) / 1000.0) / (R * t)))


def test_ratio_against_the_closed_form(tmp_path: Path) -> None:
    one = only(of(TWO, tmp_path))
    expected = np.array([closed_form(t) for t in GRID])
    assert one.ratio == pytest.approx(expected, rel=1e-10)
    assert one.excess == pytest.approx((expected - 1.0) / (expected + 1.0), abs=1e-12)
    assert one.gibbs_kj_mol == pytest.approx(-R * np.array(GRID) * np.log(expected), abs=1e-9)
    found = one.curtin_hammett
    assert found is not None
    assert found.ratio == pytest.approx([curtin_hammett(t) for t in GRID], rel=1e-10)
    assert found.saddles_over == (("TP", "TQ"),) * len(GRID)
    assert found.over_exact == pytest.approx(found.ratio / one.ratio, rel=1e-12)


def test_curtin_hammett_ends_where_the_closed_form_has_it(tmp_path: Path) -> None:
    found = only(of(TWO, tmp_path)).curtin_hammett
    assert found is not None
    [window] = found.windows
    assert window.open_below
    edge = brentq(lambda t: curtin_hammett(t) / closed_form(t) - 0.95, 200.0, 400.0, xtol=1e-8)
    assert window.to_k == pytest.approx(edge, rel=0.0, abs=0.01)


@pytest.mark.parametrize(
    "plan",
    [
        TWO,
        replace(TWO, held=HELD),
        replace(TWO, held=HELD, driven=True),
        replace(TWO, held={"A": "1.0 mol/L", "P": "2e5 mol/L"}),
        CROSSED,
        replace(CROSSED, driven=True),
        replace(CROSSED, held={"A": "0.6 mol/L", "P": "5e6 bar"}),
        CYCLE,
        replace(CYCLE, held={**CYCLE.held, "R1": "1e-3 mol/L", "R2": "1e-4 mol/L"}, driven=True),
    ],
    ids=[
        "absent",
        "held",
        "driven",
        "one held",
        "crossed",
        "crossed, driven",
        "crossed, one held",
        "cycle",
        "driven cycle",
    ],
)
def test_derivative_controls_and_sums(plan: Plan, tmp_path: Path) -> None:
    """E, X of ln(r1/r2) by central differences of whole studies; rates sum to the whole rate."""
    study = plan.load(tmp_path)
    effective = study.effective()
    found = selectivity(study, effective)
    assert found is not None
    one = only(found)
    whole = effective.rates["cycle"] or effective.rates["free"]
    assert whole is not None
    total = np.sum(list(found.rates.values()), axis=0)
    assert total == pytest.approx(whole.rate_constant, rel=1e-9)
    if whole.branching is not None:
        for name, share in whole.branching.items():
            assert found.rates[name] / total == pytest.approx(share, rel=1e-8, abs=1e-12)
    step = 1e-3
    t = np.array(plan.temperatures)
    low, high = (
        np.log(np.abs(only(of(plan.at(*(t + by).tolist()), tmp_path)).ratio))
        for by in (-step, step)
    )
    slope = R * t**2 * (high - low) / (2.0 * step)
    assert one.enthalpy_kj_mol == pytest.approx(slope, rel=1e-6, abs=1e-6)
    for name in plan.species:
        move = 1e-3  # kJ/mol
        moved = []
        for sign in (-1.0, 1.0):
            old = plan.species[name]
            other = replace(old, enthalpy=old.enthalpy + sign * move)
            moved.append(
                np.log(
                    np.abs(
                        only(
                            of(
                                replace(plan, species={**plan.species, name: other}),
                                tmp_path,
                                effective,
                            )
                        ).ratio
                    )
                )
            )
        control = -R * t * (moved[1] - moved[0]) / (2.0 * move)
        found_control = one.control.get(name, np.zeros(len(t)))  # a product that is absent has none
        assert found_control == pytest.approx(control, rel=1e-4, abs=2e-6), name


def test_a_cycle_against_its_closed_form(tmp_path: Path) -> None:
    """R1 over R2: k1 (k-x + k2)/(kx k2), whatever the catalyst's other states do."""
    x, y, tx, t1, t2 = (
        (CYCLE.species[n].enthalpy, CYCLE.species[n].entropy) for n in ("X", "Y", "TX", "T1", "T2")
    )
    expected = [
        constant(x, t1, t)
        * (constant(y, tx, t) + constant(y, t2, t))
        / (constant(x, tx, t) * constant(y, t2, t))
        for t in GRID
    ]
    one = only(of(CYCLE, tmp_path))
    assert one.ratio == pytest.approx(expected, rel=1e-10)
    found = one.curtin_hammett
    assert found is not None
    limit = [np.exp(-4.0 / (R * t)) for t in GRID]
    assert found.ratio == pytest.approx(limit, rel=1e-10)


def test_a_driven_network_has_no_curtin_hammett(tmp_path: Path) -> None:
    assert only(of(replace(TWO, held=HELD, driven=True), tmp_path)).curtin_hammett is None


def test_one_product_has_no_selectivity(tmp_path: Path) -> None:
    study = replace(TWO, question={"reactant": "A", "product": "P"}, steps=TWO.steps[:2])
    plan = replace(study, species={n: m for n, m in TWO.species.items() if n not in ("Q", "TQ")})
    loaded = plan.load(tmp_path)
    assert selectivity(loaded, loaded.effective()) is None
    assert loaded.selectivity() is None


def test_words_say_why_curtin_hammett_fails(tmp_path: Path) -> None:
    words = " ".join(of(TWO, tmp_path).words)
    assert "At 298.15 K P is made 0.09" in words
    assert "Curtin-Hammett (P through TP, Q through TQ) holds up to 256.6" in words
    assert "because the interconversion is not fast there: reversibility of A = B (0.89)" in words
    cold = " ".join(of(TWO.at(200.0, 210.0), tmp_path).words)
    assert "Curtin-Hammett (P through TP, Q through TQ) holds at every temperature" in cold


# ------------------------------------------------------------------------------- study and command

ENANTIOMERS = '\n[selectivity]\nproducts = ["Q", "P"]\nkind = "enantiomeric"\n'


def written(tmp_path: Path, more: str) -> Path:
    file = tmp_path / "asked.toml"
    file.write_text(TWO.text() + more)
    return file


def test_key_chooses_order_and_kind(tmp_path: Path) -> None:
    run = CliRunner().invoke(
        main, ["barrier", str(written(tmp_path, ENANTIOMERS)), "--format", "json", "--quiet"]
    )
    assert run.exit_code == 0, run.output
    found = json.loads(run.stdout)
    [ratio] = found["selectivity"]["ratios"]
    assert (ratio["product"], ratio["other"]) == ("Q", "P")
    assert ratio["ratio"] == pytest.approx([1.0 / closed_form(t) for t in GRID], rel=1e-10)
    assert ratio["excess"][0] > 0.99
    assert "enantiomeric excess" in found["words"]
    for form in ("table", "csv", "markdown", "latex"):
        run = CliRunner().invoke(
            main, ["barrier", str(written(tmp_path, ENANTIOMERS)), "--format", form, "--quiet"]
        )
        assert run.exit_code == 0, run.output


@pytest.mark.parametrize(
    ("products", "what"),
    [('["P", "R"]', "'R' is no product"), ('["P", "P"]', "'P' is listed twice")],
)
def test_wrong_products(tmp_path: Path, products: str, what: str) -> None:
    from thermo_pp.study.load import Study

    with pytest.raises(StudyError, match=what):
        Study.load(written(tmp_path, f"\n[selectivity]\nproducts = {products}\n"))


def test_mirror_images_that_count_both_hands_are_told(tmp_path: Path) -> None:
    """A declared species has degeneracy 1; one that is read and chiral has 2."""
    study = TWO.load(tmp_path)
    asked = SelectivityQuestion(("P", "Q"), "enantiomeric", "study.toml [selectivity] products")
    found = selectivity(study, study.effective(), asked)
    assert found is not None
    assert found.findings == ()

    class Chiral:
        def __init__(self, model: object) -> None:
            self.model = model

        def __getattr__(self, name: str) -> object:
            return getattr(self.model, name)

        def at(self, *arguments: object, **options: object) -> object:
            return replace(self.model.at(*arguments, **options), degeneracy=2)  # type: ignore[attr-defined]

    both = replace(study, species={**study.species, "TP": Chiral(study.species["TP"])})
    found = selectivity(both, study.effective(), asked)
    assert found is not None
    [finding] = found.findings
    assert finding.code == "enantiomers-counted-twice"
    assert finding.what.startswith("TP: mirror images")
    plain = selectivity(both, study.effective(), replace(asked, kind="diastereomeric"))
    assert plain is not None
    assert plain.findings == ()
