"""Where over temperature something changes: the search itself, and windows of a study against closed forms."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from exact_study import BRANCHED, Line, Member, Plan
from scipy.optimize import brentq

from thermo_pp.kinetics.results import Approximation, Window
from thermo_pp.kinetics.windows import SCAN_POINTS, crossings, scan_temperatures, windows

FloatArray = np.ndarray
R = 8.31446261815324e-3  # kJ/mol/K
LOCATED_K = 0.01
"""What methods.md promises."""


def search(curve: Callable[[FloatArray], FloatArray], low: float, high: float) -> list[float]:
    scan = scan_temperatures(low, high)
    values = curve(scan)[:, np.newaxis]
    [roots] = crossings(lambda t: curve(t)[:, np.newaxis], scan, values)
    return [root for root, _ in roots]


def windows_of(curve: Callable[[FloatArray], FloatArray], low: float, high: float) -> list[Window]:
    scan = scan_temperatures(low, high)
    [found] = windows(lambda t: curve(t)[:, np.newaxis], scan, curve(scan)[:, np.newaxis])
    return list(found)


# ----------------------------------------------------------------------------------- the search


def test_scan_has_both_ends_and_no_wide_steps() -> None:
    for low, high in ((280.0, 360.0), (10.0, 5000.0)):
        scan = scan_temperatures(low, high)
        assert scan[0] == low
        assert scan[-1] == high
        assert len(scan) >= SCAN_POINTS
        ratio = scan[1:] / scan[:-1]
        assert np.all(ratio > 1.0)
        assert np.all(ratio <= 1.03 + 1e-12)
        assert np.all(-np.diff(1.0 / scan) <= (1.0 / low - 1.0 / high) / (SCAN_POINTS - 1) * 1.001)
    assert np.array_equal(scan_temperatures(300.0, 300.0), [300.0])


@pytest.mark.parametrize("root", [300.0001, 333.333, 359.99, 280.003])
def test_root(root: float) -> None:
    [found] = search(lambda t: t - root, 280.0, 360.0)
    assert found == pytest.approx(root, abs=LOCATED_K)


def test_root_on_a_point_of_the_scan() -> None:
    scan = scan_temperatures(280.0, 360.0)
    [found] = search(lambda t: scan[40] - t, 280.0, 360.0)
    assert found == pytest.approx(scan[40], abs=LOCATED_K)


def test_two_roots_between_neighbouring_points() -> None:
    """A curve that dips below 0 and comes back within less than a step of the scan."""
    scan = scan_temperatures(280.0, 360.0)
    middle = 0.5 * (scan[60] + scan[61])
    half = 0.2 * (scan[61] - scan[60])
    assert half < 0.15
    found = search(lambda t: (t - middle) ** 2 - half**2, 280.0, 360.0)
    assert found == pytest.approx([middle - half, middle + half], abs=LOCATED_K)


def test_signs_of_roots_alternate() -> None:
    scan = scan_temperatures(280.0, 360.0)
    middle = 0.5 * (scan[60] + scan[61])
    half = 0.2 * (scan[61] - scan[60])

    def curve(t: FloatArray) -> FloatArray:
        return ((t - middle) ** 2 - half**2)[:, np.newaxis]

    [roots] = crossings(curve, scan, curve(scan))
    assert [sign for _, sign in roots] == [1.0, -1.0]


def test_no_root_where_the_curve_touches_nothing() -> None:
    assert search(lambda t: (t - 320.0) ** 2 + 1e-3, 280.0, 360.0) == []
    assert search(lambda t: np.full(len(t), np.inf), 280.0, 360.0) == []


def test_infinite_values_are_above_everything() -> None:
    def curve(t: FloatArray) -> FloatArray:
        with np.errstate(over="ignore"):
            return np.exp(np.exp(0.5 * (t - 300.0)))

    [window] = windows_of(curve, 280.0, 360.0)
    edge = 300.0 + 2.0 * np.log(np.log(1.05))
    assert window.to_k == pytest.approx(edge, abs=LOCATED_K)
    assert window.open_below
    assert not window.open_above


def test_window_narrower_than_a_step() -> None:
    """A ratio that runs from 0.5 to 2 between two points of the scan is within 5 % in between."""
    scan = scan_temperatures(280.0, 360.0)
    step = scan[71] - scan[70]
    middle = 0.5 * (scan[70] + scan[71])
    steep = np.log(2.0) / (0.5 * step)
    [window] = windows_of(lambda t: np.exp(steep * (t - middle)), 280.0, 360.0)
    edges = middle + np.log([0.95, 1.05]) / steep
    assert window.to_k - window.from_k < 0.1 * step
    assert [window.from_k, window.to_k] == pytest.approx(edges, abs=LOCATED_K)
    assert not window.open_below
    assert not window.open_above


def test_ratio_that_jumps_over_one_has_no_window() -> None:
    assert windows_of(lambda t: np.where(t < 311.17, 0.5, 2.0), 280.0, 360.0) == []


def test_ratio_that_touches_from_above() -> None:
    """Above 1.05 at every point of the scan, below it for a fifth of a step."""
    scan = scan_temperatures(280.0, 360.0)
    middle, half = 0.5 * (scan[50] + scan[51]), 0.1 * (scan[51] - scan[50])
    [window] = windows_of(lambda t: 1.05 + 0.01 * ((t - middle) ** 2 - half**2), 280.0, 360.0)
    assert [window.from_k, window.to_k] == pytest.approx(
        [middle - half, middle + half], abs=LOCATED_K
    )


def test_negative_ratios_are_never_within() -> None:
    """Where the net reaction runs backwards."""
    assert windows_of(lambda t: np.full(len(t), -1.0), 280.0, 360.0) == []


@pytest.mark.parametrize(
    ("value", "holds"), [(1.0, True), (1.049, True), (0.951, True), (1.06, False)]
)
def test_one_temperature(value: float, holds: bool) -> None:
    found = windows_of(lambda t: np.full(len(t), value), 300.0, 300.0)
    assert found == ([Window(300.0, 300.0, True, True)] if holds else [])


# ------------------------------------------------------------------------------------- a study

LOW, HIGH = 200.0, 420.0
CHAIN = Plan(
    {
        "A": Member("CO", 0.0, 200.0),
        "W": Member("H2O", 0.0, 150.0),
        "C": Member("CH2O2", -50.0, 230.0),
        "P": Member("CH2O2", -150.0, 240.0),
        "T1": Member("CH2O2", 15.0, 240.0),
        "T2": Member("CH2O2", 45.0, 340.0),
    },
    (Line("A + W = C", "through", "T1"), Line("C = P", "through", "T2")),
    {"reactant": "A", "product": "P"},
    {"W": "1e-3 mol/L"},
    (LOW, HIGH),
    "1 mol/L",
    "solution",
)


def constants(plan: Plan, t: float) -> tuple[float, float, float]:
    """k1 [W], k-1 and k2 of a chain at 1 mol/L, by the Eyring equation."""

    def gibbs(*names: str) -> float:
        members = [plan.species[name] for name in names]
        return sum(m.enthalpy for m in members) - t * sum(m.entropy for m in members) / 1000.0

    frequency = 1.380649e-23 * t / 6.62607015e-34
    water = float(plan.held["W"].split()[0])

    def k(saddle: str, *start: str) -> float:
        return float(frequency * np.exp(-(gibbs(saddle) - gibbs(*start)) / (R * t)))

    return k("T1", "A", "W") * water, k("T1", "C"), k("T2", "C")


def slow(k1: float, back: float, k2: float) -> float:
    total = k1 + back + k2
    return 2.0 * k1 * k2 / (total + np.sqrt(total**2 - 4.0 * k1 * k2))


def approximation(plan: Plan, folder: Path, definition: str, name: str) -> Approximation:
    rate = plan.load(folder).effective().rates[definition]  # type: ignore[index]
    assert rate is not None
    [found] = [one for one in rate.approximations if one.name == name]
    return found


RATIOS: dict[tuple[str, str], Callable[[float, float, float], float]] = {
    ("free", "pre-equilibrium"): lambda k1, back, k2: 1.0 + k2 / back,
    ("free", "energetic span"): lambda k1, back, k2: (
        min(k1, k2 * k1 / back) / (k1 * k2 / (back + k2))
    ),
    ("pool", "pre-equilibrium, saturated"): lambda k1, back, k2: (
        k2 * k1 / back / (1.0 + k1 / back) / slow(k1, back, k2)
    ),
    ("pool", "steady state of all intermediates"): lambda k1, back, k2: (
        k1 * k2 / (back + k2) / slow(k1, back, k2)
    ),
    ("pool", "energetic span"): lambda k1, back, k2: (
        min(k1, k2, k2 * k1 / back) / slow(k1, back, k2)
    ),
}
"""Approximate over exact rate of A = C -> P, from the closed forms."""


def edges_of(ratio: Callable[[float], float], low: float, high: float) -> list[float]:
    """Return where a ratio passes 0.95 or 1.05, by looking closely and a root finder."""
    grid = np.linspace(low, high, 4001)
    found = []
    for level in (0.95, 1.05):
        gaps = np.array([ratio(t) - level for t in grid])
        for k in np.flatnonzero(np.sign(gaps[1:]) != np.sign(gaps[:-1])):
            found.append(brentq(lambda t, at=level: ratio(t) - at, grid[k], grid[k + 1]))
    return sorted(found)


@pytest.mark.parametrize(("definition", "name"), RATIOS, ids=lambda x: x.replace(" ", "-"))
def test_edges_against_closed_forms(definition: str, name: str, tmp_path: Path) -> None:
    found = approximation(CHAIN, tmp_path, definition, name)

    def ratio(t: float) -> float:
        return RATIOS[definition, name](*constants(CHAIN, t))

    edges = edges_of(ratio, LOW, HIGH)
    assert edges  # the example has some of each
    ends = [end for w in found.windows for end in (w.from_k, w.to_k)]
    inner = [end for end in ends if end not in (LOW, HIGH)]
    assert inner == pytest.approx(edges, abs=LOCATED_K)
    for window in found.windows:
        assert window.open_below == (window.from_k == LOW)
        assert window.open_above == (window.to_k == HIGH)
        middle = 0.5 * (window.from_k + window.to_k)
        assert abs(ratio(middle) - 1.0) <= 0.05
    assert [abs(ratio(t) - 1.0) <= 0.05 for t in (LOW, HIGH)] == [
        any(w.open_below for w in found.windows),
        any(w.open_above for w in found.windows),
    ]
    assert found.ratio == pytest.approx([ratio(LOW), ratio(HIGH)], rel=1e-9)


def test_finer_grid_moves_no_edge(tmp_path: Path) -> None:
    coarse = CHAIN.load(tmp_path).effective()
    fine = CHAIN.at(*np.linspace(LOW, HIGH, 23).tolist()).load(tmp_path).effective()
    turned = CHAIN.at(HIGH, 231.7, LOW).load(tmp_path).effective()
    for definition in ("free", "pool"):
        rates = [result.rates[definition] for result in (coarse, fine, turned)]  # type: ignore[index]
        one, *others = [rate.approximations for rate in rates if rate is not None]
        for other in others:
            assert [a.windows for a in other] == [a.windows for a in one]
            assert any(a.windows for a in one)


def test_wider_range_moves_no_inner_edge(tmp_path: Path) -> None:
    narrow = approximation(CHAIN, tmp_path, "free", "pre-equilibrium").windows
    wide = approximation(CHAIN.at(150.0, 500.0), tmp_path, "free", "pre-equilibrium").windows
    assert [w.to_k for w in narrow if not w.open_above] == pytest.approx(
        [w.to_k for w in wide if not w.open_above], abs=LOCATED_K
    )


def test_window_between_the_temperatures_asked_for(tmp_path: Path) -> None:
    """A window of 4 K that holds at none of the four temperatures, in a range of 10 K to 5000 K."""
    name = "energetic span"
    found = approximation(BRANCHED.at(10.0, 100.0, 1000.0, 5000.0), tmp_path, "pool", name)
    [narrow] = [w for w in found.windows if w.from_k > 250.0]
    assert 0.0 < narrow.to_k - narrow.from_k < 5.0
    for edge, inside in ((narrow.from_k, (False, True)), (narrow.to_k, (True, False))):
        for by, holds in zip((-0.02, 0.02), inside, strict=True):
            there = approximation(BRANCHED.at(edge + by), tmp_path, "pool", name)
            assert there.holds()[0] == holds


def test_open_windows_are_called_so(tmp_path: Path) -> None:
    """Cold, the return of the complex is far faster than step 2; over a high saddle it never is."""
    found = approximation(CHAIN.at(200.0, 210.0), tmp_path, "free", "pre-equilibrium")
    assert found.windows == (Window(200.0, 210.0, True, True),)
    none = replace(CHAIN, species={**CHAIN.species, "T1": Member("CH2O2", 90.0, 240.0)})
    assert approximation(none, tmp_path, "free", "pre-equilibrium").windows == ()
