"""Figures: nothing overlaps or is cut off, text stays text, the same bytes in every run."""

from __future__ import annotations

import hashlib
import os
import re
import subprocess
import sys
import zlib
from dataclasses import replace
from functools import cache
from html import unescape
from itertools import combinations
from pathlib import Path
from tempfile import TemporaryDirectory
from types import SimpleNamespace
from typing import Any

import matplotlib as mpl
import numpy as np
import pytest
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.text import Text

import thermo_pp as tp
from thermo_pp import figures
from thermo_pp.kinetics.results import Activation, Approximation, EffectiveRate, Rate, Window
from thermo_pp.measured.results import Comparison
from thermo_pp.output.figures.key import size_pt
from thermo_pp.output.figures.labels import Labels
from thermo_pp.output.figures.network import network
from thermo_pp.output.figures.placement import Request, placed
from thermo_pp.output.figures.style import COLOURS, INK, TEXT_PT
from thermo_pp.output.figures.words import elided, shown, width_pt, wrapped
from thermo_pp.profile import Profile, State

BUNDLED = Path(__file__).parents[1] / "fixtures" / "stack-plume" / "study.toml"
ODD = '<b>&_%$"x$y$\n=1+1 \\alpha$'
"""A name with everything that mathematics, XML and LaTeX take for their own."""
LONG = "a-very-long-name-of-a-species-that-somebody-took-from-a-file-name-and-never-shortened"
MINUS = "\N{MINUS SIGN}"
DRAWN_WITH = "3.11.2"
"""The matplotlib that docs/figures was made with."""
TWO_K = np.array([280.0, 360.0])


@pytest.fixture(scope="module")
def study() -> tp.Study:
    return tp.Study.load(BUNDLED)


@pytest.fixture(scope="module")
def bundled(study: tp.Study) -> Profile:
    return study.profile()


@pytest.fixture(scope="module")
def effective(study: tp.Study) -> EffectiveRate:
    return study.effective()


def state(path: str, name: str, h: float, s: float, *, saddle: bool = False) -> State:
    """A state whose entropy, J/(mol K), does not change with temperature."""
    return State(
        path=path, state=name, kind="saddle" if saddle else "minimum", species=((name, 1),),
        enthalpy_kj_mol=np.array([h, h]), entropy_j_mol_k=np.array([s, s]),
        gibbs_kj_mol=h - TWO_K * s / 1000.0, electronic_kj_mol=None, zero_point_kj_mol=None,
        low_mode_spread_kj_mol=np.zeros(2),
    )  # fmt: skip


def made_up(states: list[State], reference: str = "A") -> Profile:
    nets = {one.path: "A = B" for one in states}
    return Profile(TWO_K.copy(), reference, "standard state", "1 bar", nets, tuple(states))


def thirty_paths() -> Profile:
    states = []
    for n in range(30):
        path = f"A → I{n} → B"
        states += [
            state(path, "A + 2 W", 0.0, 0.0),
            state(path, f"I{n} + W", -20.0 + 0.3 * n, -90.0),
            state(path, f"TS{n} + W", 40.0 + 2.0 * n, -120.0, saddle=True),
            state(path, "B + W", -70.0, -30.0),
        ]
    return made_up(states, "A + 2 W")


def near_equal() -> Profile:
    states = [
        state("one", f"M{n}", 0.02 * (-1) ** n * n, -0.1, saddle=n % 2 == 1) for n in range(12)
    ]
    return made_up(states, "M0")


def near_equal_side_by_side() -> Profile:
    states = []
    for n in range(6):
        path = f"path {n}"
        states += [
            state(path, "A", 0.0, 0.0),
            state(path, f"T{n}", 30.0 + 0.1 * n, -80.0, saddle=True),
        ]
        states += [state(path, f"M{n}", -5.0 + 0.1 * n, 3.0), state(path, "B", -60.0, 0.0)]
    return made_up(states)


def long_names() -> Profile:
    states = [
        state(
            f"{LONG} → {LONG}",
            f"{LONG}-{n} + 2 {LONG} + {LONG}",
            20.0 * (n % 3),
            -50.0,
            saddle=n == 1,
        )
        for n in range(4)
    ]
    return made_up(states, f"{LONG}-0 + 2 {LONG} + {LONG}")


def odd_names() -> Profile:
    states = [state(ODD, ODD, 0.0, 0.0), state(ODD, f"{ODD}2", -30.0, -150.0, saddle=True)]
    return made_up([*states, state(ODD, "=1+1", -60.0, -20.0)], ODD)


def all_equal() -> Profile:
    return made_up([state("p", name, 0.0, 0.0) for name in "ABC"])


def below_everything() -> Profile:
    states = [state("p", "A", 0.0, 0.0), state("p", "C", -60.0, -110.0)]
    return made_up(
        [*states, state("p", "TS", -40.0, -130.0, saddle=True), state("p", "B", -80.0, -5.0)]
    )


class Seen:
    """Every text that a drawing draws, with its box in pixels."""

    def __init__(self) -> None:
        self.boxes: list[tuple[str, Any]] = []

    def problems(self, figure: Figure) -> list[str]:
        found = []
        for (one, a), (two, b) in combinations(self.boxes, 2):
            across = min(a.x1, b.x1) - max(a.x0, b.x0)
            up = min(a.y1, b.y1) - max(a.y0, b.y0)
            if across > 0.5 and up > 0.5:
                found.append(f"{one!r} and {two!r} overlap by {across:.1f} x {up:.1f}")
        area = figure.bbox
        for text, box in self.boxes:
            if min(box.x0, box.y0, area.x1 - box.x1, area.y1 - box.y1) < -0.5:
                found.append(f"{text!r} is cut off")
        return found


@pytest.fixture
def seen(monkeypatch: pytest.MonkeyPatch) -> Seen:
    record = Seen()
    draw = Text.draw

    def recording(self: Text, renderer: Any, *args: Any, **kwargs: Any) -> None:
        if self.get_visible() and self.get_text().strip():
            box = self.get_window_extent(renderer)
            lines = self.get_text().count("\n") + 1
            # the box of a line has room for letters that are not there; lines may share that
            inset = 0.08 * box.height / lines
            record.boxes.append((self.get_text(), box.padded(0.0, -inset)))
        draw(self, renderer, *args, **kwargs)

    monkeypatch.setattr(Text, "draw", recording)
    return record


def rendered(figure: Figure, seen: Seen) -> None:
    """Draw once, as saving does: what is not settled by then is a fault."""
    seen.boxes.clear()
    figure.canvas.draw()
    assert seen.boxes


def labels_of(ax: Axes) -> Labels:
    return next(child for child in ax.get_children() if isinstance(child, Labels))


def texts(ax: Axes) -> list[str]:
    return [text.get_text() for text in labels_of(ax).texts]


STRESS = {
    "thirty paths": thirty_paths,
    "near-equal energies": near_equal,
    "near-equal energies side by side": near_equal_side_by_side,
    "long names": long_names,
    "odd names": odd_names,
    "all equal": all_equal,
    "below everything": below_everything,
}


@pytest.mark.parametrize("case", ["bundled", "bundled, one temperature", *STRESS])
def test_nothing_overlaps_in_a_profile(case: str, bundled: Profile, seen: Seen) -> None:
    profile = bundled if case.startswith("bundled") else STRESS[case]()
    temperatures = None if case in ("bundled, one temperature", "thirty paths") else TWO_K
    figure, (ax,) = figures.new_figure(height_mm=95.0)
    assert figures.profile.draw(ax, profile, temperatures_k=temperatures) is ax
    rendered(figure, seen)
    assert seen.problems(figure) == []
    labels = labels_of(ax)
    assert labels.left_out == 0 or case == "thirty paths"
    for text in labels.texts:
        box = text.get_window_extent()
        for left, right, height in labels.levels:
            x, y = ax.transData.transform([(left, height), (right, height)]).T
            assert box.y0 > y[0] or box.y1 < y[0] or box.x0 > x[1] or box.x1 < x[0], text.get_text()


def test_nothing_overlaps_in_h_and_g_side_by_side(bundled: Profile, seen: Seen) -> None:
    figure, axes = figures.new_figure(width_mm=figures.PAGE_MM, height_mm=95.0, columns=2)
    figures.profile.draw_both(axes, bundled)
    rendered(figure, seen)
    assert seen.problems(figure) == []
    assert axes[0].get_ylim() == axes[1].get_ylim()
    assert [ax.get_ylabel() for ax in axes] == [
        r"$\Delta H$ / kJ mol⁻¹",
        r"$\Delta G$ / kJ mol⁻¹",
    ]
    # the reader sees why: the saddle is below the reactants in H and above them in G
    assert any(text.startswith(f"TS2 ‡\n{MINUS}54.6") for text in texts(axes[0]))
    assert any(text.startswith("TS2 ‡\n51.5") for text in texts(axes[1]))
    assert r"$-T\,\Delta S$" in texts(axes[1])


def test_the_checks_see_an_overlap_and_a_text_cut_off(seen: Seen) -> None:
    figure, (ax,) = figures.new_figure()
    for x in (0.5, 0.52, 1.4):
        ax.text(x, 0.5, "name").set_in_layout(False)
    rendered(figure, seen)
    problems = seen.problems(figure)
    assert len([text for text in problems if "overlap" in text]) == 1
    assert len([text for text in problems if "cut off" in text]) == 1


def test_text_can_be_read_at_the_width_of_a_column(bundled: Profile) -> None:
    figure, (ax,) = figures.new_figure()
    figures.profile.draw(ax, bundled)
    figure.canvas.draw()
    assert figure.get_figwidth() * 25.4 == pytest.approx(85.0, abs=1e-9)
    sizes = [text.get_fontsize() for text in figure.findobj(Text)]
    assert min(sizes) >= 7.0
    assert size_pt(ax)[0] > 150.0


def test_values_are_those_of_the_profile(bundled: Profile) -> None:
    figure, (ax,) = figures.new_figure(height_mm=85.0)
    figures.profile.draw(ax, bundled, temperatures_k=[300.0])
    figure.canvas.draw()
    drawn = {text.rpartition("\n")[2] for text in texts(ax)}
    k = list(bundled.temperature_k).index(300.0)
    assert drawn == {f"{one.gibbs_kj_mol[k]:.1f}".replace("-", MINUS) for one in bundled.states}


def test_a_temperature_or_path_that_is_not_there_is_refused(bundled: Profile) -> None:
    _, (ax,) = figures.new_figure()
    with pytest.raises(ValueError, match=r"298\.15 K is not one of the profile's: 280 K"):
        figures.profile.draw(ax, bundled, temperatures_k=[298.15])
    with pytest.raises(ValueError, match="one or two temperatures"):
        figures.profile.draw(ax, bundled, temperatures_k=[280.0, 300.0, 320.0])
    with pytest.raises(ValueError, match="is not a path"):
        figures.profile.draw(ax, bundled, paths=["SO3"])


def test_states_that_paths_share_are_drawn_once(bundled: Profile) -> None:
    picture = network(bundled.states)
    names = [level.state.state for level in picture.levels]
    assert set(names) == {one.state for one in bundled.states}
    # C1 + W stands before C2 on one path and behind it on another
    assert {name for name in names if names.count(name) > 1} == {"C1 + W"}
    assert names.count("C1 + W") == 2
    for (start, end), users in picture.connections.items():
        assert picture.levels[start].column < picture.levels[end].column
        assert users


def rates_over(count: int, *, approximations: int = 6) -> EffectiveRate:
    t = np.linspace(280.0, 360.0, count) if count > 1 else np.array([298.15])
    k = 1e3 * np.exp(2000.0 * (1.0 / t - 1.0 / 300.0))
    nothing = np.zeros(count)
    activation = Activation(nothing, nothing, nothing)
    windows = [(), (Window(300.0, 320.0, False, False),), (Window(t[0], t[-1], True, True),)]
    near = tuple(
        Approximation(f"{LONG} {n}", k * (1.0 + n), nothing + 1.0 + n, windows[n % 3])
        for n in range(approximations)
    )
    names = [*(f"X{n}" for n in range(12)), ODD, LONG]
    rate = Rate(
        "pool", k, "s^-1", nothing, activation, None, (), {n: nothing + 1.0 / (2 + len(n)) for n in names},
        ("X0",), {}, near, populations={n: nothing + 1.0 / len(names) for n in names},
    )  # fmt: skip
    return EffectiveRate(t, "A", "A = B", 1, "1 bar", {"pool": rate}, (), {})


def measured() -> figures.rates.Points:
    t = np.array([270.0, 300.0, 330.0])
    return figures.rates.Points(ODD, t, np.array([2e3, 1e3, 5e2]), np.array([3e3, 1e2, 50.0]))


def published() -> figures.rates.Line:
    t = np.linspace(250.0, 350.0, 9)
    k = 2e3 * np.exp(2000.0 * (1.0 / t - 1.0 / 300.0))
    return figures.rates.Line(LONG, t, k, 0.7 * k, 1.4 * k)


def course(temperature_k: float) -> SimpleNamespace:
    t = np.concatenate([[0.0], np.logspace(-9, 3, 40)])
    left = 1e-9 * np.exp(-t)
    return SimpleNamespace(
        temperature_k=temperature_k, time_s=t, concentration_mol_l={ODD: left, LONG: 1e-9 - left}
    )


def draw_rates(ax: Axes, count: int, form: Any) -> Axes:
    return figures.rates.draw(
        ax, rates_over(count), form=form, points=[measured()], lines=[published()]
    )


def draw_regimes(ax: Axes) -> Axes:
    t, c = np.linspace(250.0, 400.0, 16), np.logspace(-9, -2, 15)
    energy = t - 300.0 + 10.0 * np.log10(c)[:, np.newaxis] + 50.0
    codes = np.digitize(energy, [-30.0, 0.0, 40.0])
    names = {0: ODD, 1: LONG, 2: "TS2", 3: "mixed"}
    return figures.regimes.draw(ax, t, c, codes, names, species=ODD, energies_kj_mol=energy)


def draw_doubt(ax: Axes) -> Axes:
    samples = np.random.default_rng(0).normal(-6.0, 5.0, 2000)
    return figures.doubt.draw(ax, samples, float((samples < 0).mean()), nominal_kj_mol=-6.0)


_A = "A / cm^6 molecule^-2 s^-1"
_POINT = "temperature / K,k / s^-1,sigma / s^-1,source"
MEASURED = f"""kind,definition,orders,from / K,to / K,{_A},sigma {_A},n,T0 / K,E / K,{_POINT}
expression,pool,2 W,250,330,2.26e-43,0.85e-43,1,1,-6544,,,,"{LONG}"
point,pool,,,,,,,,,290,4000,400,"{LONG}"
point,pool,,,,,,,,,310,1500,1200,"$x$"
point,pool,,,,,,,,,330,500,600,"$x$"
"""


@cache
def comparison(count: int) -> Comparison:
    """The bundled study against an expression and against points of two sources."""
    with TemporaryDirectory() as folder:
        file = Path(folder) / "measured.csv"
        file.write_text(MEASURED)
        t = list(np.linspace(360.0, 280.0, count)) if count > 1 else [300.0]
        study = tp.Study.load(BUNDLED, temperatures=t)
        return study.compare(file, deviation="4 kJ/mol")


OTHERS = {
    "arrhenius": lambda ax: draw_rates(ax, 17, "arrhenius"),
    "eyring": lambda ax: draw_rates(ax, 17, "eyring"),
    "rate at one temperature": lambda ax: draw_rates(ax, 1, "arrhenius"),
    "populations": lambda ax: figures.populations.of_rate(ax, rates_over(17)),
    "populations at one temperature": lambda ax: figures.populations.of_rate(ax, rates_over(1)),
    "controls": lambda ax: figures.controls.draw(ax, rates_over(17)),
    "controls at one temperature": lambda ax: figures.controls.draw(ax, rates_over(1)),
    "regimes": draw_regimes,
    "course": lambda ax: figures.courses.draw(ax, course(300.0)),
    "course, log": lambda ax: figures.courses.draw(ax, course(300.0), log=True),
    "courses": lambda ax: figures.courses.draw_temperatures(
        ax, [course(280.0), course(360.0)], LONG
    ),
    "doubt": draw_doubt,
    "measured, points": lambda ax: figures.measured.draw(ax, comparison(17)),
    "measured, expression": lambda ax: figures.measured.draw(ax, comparison(17), 2, form="eyring"),
    "measured, one temperature": lambda ax: figures.measured.draw(ax, comparison(1)),
}


@pytest.mark.parametrize("name", OTHERS)
def test_nothing_overlaps_in_the_other_figures(name: str, seen: Seen) -> None:
    figure, (ax,) = figures.new_figure(height_mm=100.0)
    assert OTHERS[name](ax) is ax
    rendered(figure, seen)
    assert seen.problems(figure) == []


def test_the_bundled_rates_can_be_drawn(effective: EffectiveRate, seen: Seen) -> None:
    for draw in (figures.rates.draw, figures.populations.of_rate, figures.controls.draw):
        figure, (ax,) = figures.new_figure(height_mm=90.0)
        draw(ax, effective)
        rendered(figure, seen)
        assert seen.problems(figure) == []


def handle_data(ax: Axes) -> dict[str, Any]:
    """Of the first line in each colour: x and y."""
    return {line.get_color(): line.get_xydata() for line in reversed(ax.get_lines())}


@pytest.mark.parametrize("form", ["arrhenius", "eyring"])
def test_measured_and_computed_are_those_of_the_comparison(form: Any) -> None:
    found = comparison(17)
    second, first = found.curves  # points, then expressions
    order = np.argsort(first.temperature_k)
    t = first.temperature_k[order]
    over = t if form == "eyring" else np.ones_like(t)
    _, (ax,) = figures.new_figure()
    assert figures.measured.draw(ax, found, 2, form=form) is ax
    drawn = handle_data(ax)
    assert drawn[INK][:, 0] == pytest.approx(1000.0 / t, rel=1e-12)
    assert drawn[INK][:, 1] == pytest.approx(first.computed[order] / over, rel=1e-12)
    assert first.measured is not None
    assert first.log_deviation is not None
    line = drawn[COLOURS[1]][:, 1]
    assert line == pytest.approx(first.measured[order] / over, rel=1e-12, nan_ok=True)
    assert np.isnan(line[t > 330.0]).all()
    # the band is one standard deviation: its corners are edges of the computed curve
    corners = ax.collections[0].get_paths()[0].vertices[:, 1]
    high = (first.computed * np.exp(first.log_deviation))[order] / over
    assert corners.max() == pytest.approx(high.max(), rel=1e-12)

    _, (ax,) = figures.new_figure()
    figures.measured.draw(ax, found, 1, form=form)
    (fit,) = (one for one in second.fits if one.form == form)
    line = handle_data(ax)[COLOURS[1]][:, 1]
    assert line == pytest.approx(fit.rate_constant[order] / over, rel=1e-12)
    groups = [bars.lines[0].get_xydata() for bars in ax.containers]
    at = np.array([one.point.temperature_k for one in found.points])
    k = np.array([one.point.rate_constant for one in found.points])
    expected = np.column_stack([1000.0 / at, k / at if form == "eyring" else k])
    assert [len(group) for group in groups] == [1, 2]  # one marker a source
    assert np.concatenate(groups) == pytest.approx(expected, rel=1e-12)
    bar = ax.containers[0].lines[2][0].get_segments()[0]
    assert bar[1, 1] - bar[0, 1] == pytest.approx(800.0 / (290.0 if form == "eyring" else 1.0))
    with pytest.raises(ValueError, match="no curve 3: the comparison has 2"):
        figures.measured.draw(ax, found, 3)


def test_windows_are_where_the_result_has_them() -> None:
    figure, (ax,) = figures.new_figure(height_mm=90.0)
    figures.rates.draw(ax, rates_over(17, approximations=2))
    figure.canvas.draw()
    (strips,) = [child for child in ax.child_axes if child.texts]
    assert [text.get_text().endswith(": nowhere") for text in strips.texts] == [True, False]
    shaded = [area.get_datalim(strips.transData) for area in strips.collections]
    assert len(shaded) == 1
    assert (shaded[0].x0, shaded[0].x1) == pytest.approx((1000.0 / 320.0, 1000.0 / 300.0), abs=1e-9)


def test_a_rate_that_runs_backwards_is_said_to_be_left_out() -> None:
    forwards = rates_over(5, approximations=0)
    rate = forwards.rates["pool"]
    assert rate is not None
    k = rate.rate_constant * np.array([1.0, 1.0, 1.0, -1.0, -1.0])
    backwards = Rate("pool", k, "s^-1", k, rate.activation, None, (), {}, (), {})
    _, (ax,) = figures.new_figure()
    figures.rates.draw(
        ax,
        EffectiveRate(
            forwards.temperature_k, "A", "A = B", 1, "1 bar", {"pool": backwards}, (), {}
        ),
    )
    assert "not drawn: k below or at zero at 2 of 5 temperatures" in [
        t.get_text() for t in ax.texts
    ]
    with pytest.raises(ValueError, match="no rate 'cycle'"):
        figures.rates.draw(ax, forwards, "cycle")


def test_temperatures_out_of_order_give_the_same_figure() -> None:
    drawn = []
    for order in (np.arange(5), np.array([3, 0, 4, 2, 1])):
        rates = rates_over(5, approximations=0)
        rate = rates.rates["pool"]
        assert rate is not None
        rate = replace(
            rate,
            rate_constant=rate.rate_constant[order],
            populations={"A": np.arange(5.0)[order] / 9},
        )
        mixed = replace(rates, temperature_k=rates.temperature_k[order], rates={"pool": rate})
        figure, axes = figures.new_figure(rows=2)
        figures.rates.draw(axes[0], mixed)
        figures.populations.of_rate(axes[1], mixed)
        drawn.append(figures.content(figure, "svg"))
    assert drawn[0] == drawn[1]


def test_a_map_of_a_study_and_more_regimes_than_colours(seen: Seen) -> None:
    t, c = np.array([300.0, 280.0, 320.0]), np.logspace(-8, -4, 5)
    codes = np.arange(15).reshape(3, 5) % 10
    energy = np.linspace(-1.0, 1.0, 15).reshape(3, 5)
    one = SimpleNamespace(
        holding=codes - 1, approximations=tuple("abcdefghi"), controlling=codes, saddles=tuple("ABCDEFGHIJ"),
        resting=None, states=(), arrhenius_energy_kj_mol=energy,
    )  # fmt: skip
    regimes: Any = SimpleNamespace(
        temperature_k=t, amount=c, species=LONG, unit="Pa", maps={"pool": one}
    )
    figure, (ax,) = figures.new_figure(height_mm=100.0)
    figures.regimes.of_map(ax, regimes)
    rendered(figure, seen)
    assert seen.problems(figure) == []
    said = [text for text, _ in seen.boxes]
    assert "3 others" in said
    assert any(text.startswith("$p$(") for text in said)
    figure, (ax,) = figures.new_figure()
    regimes.maps["pool"].holding = np.full((3, 5), -1)
    figures.regimes.of_map(ax, regimes, layer="holding")
    assert "no approximation holds" in [text.get_text() for text in figure.findobj(Text)]
    with pytest.raises(ValueError, match="no layer 'resting'"):
        figures.regimes.of_map(ax, regimes, layer="resting")


def test_doubt_never_rounds_to_certainty() -> None:
    figure, (ax,) = figures.new_figure()
    figures.doubt.draw(ax, np.array([-5.0, -4.0, 1.0]), 0.99999)
    said = [text.get_text() for text in figure.findobj(Text)]
    assert "below zero: > 99.9 %" in said
    assert "zero and above: < 0.1 %" in said


def svg_texts(data: bytes) -> list[str]:
    return [unescape(found) for found in re.findall(r"<t(?:ext|span)[^>]*>([^<]*)<", data.decode())]


def test_text_in_svg_is_text_and_its_font_is_inside() -> None:
    figure, (ax,) = figures.new_figure()
    figures.profile.draw(ax, odd_names())
    data = figures.content(figure, "svg")
    drawn = svg_texts(data)
    assert any(text.startswith('<b>&_%$"x') for text in drawn)
    assert any("=1+1" in text for text in drawn)
    assert b"<b>" not in data  # never markup of its own
    assert data.count(b"@font-face") == 2  # upright, and italic for the quantities
    assert b"font-family: 'DejaVu Sans', Verdana, sans-serif" in data


def test_text_in_pdf_is_text_and_its_font_is_inside(bundled: Profile) -> None:
    figure, (ax,) = figures.new_figure()
    figures.profile.draw(ax, bundled)
    data = figures.content(figure, "pdf")
    streams = [
        zlib.decompress(found)
        for found in re.findall(rb"/FlateDecode.*?stream\r?\n(.*?)\r?\nendstream", data, re.S)
        if found[:1] == b"x"
    ]
    shown_in = b"\n".join(streams)
    assert b"TJ" in shown_in or b"Tj" in shown_in
    assert b"/FontFile2" in data
    assert b"/Type3" not in data


@pytest.mark.parametrize("form", ["svg", "pdf", "png"])
def test_no_dates_and_no_versions(form: Any) -> None:
    figure, (ax,) = figures.new_figure()
    figures.profile.draw(ax, below_everything())
    data = figures.content(figure, form)
    for word in (b"CreationDate", b"/Producer", b"Software", b"dc:date", mpl.__version__.encode()):
        assert word not in data
    with pytest.raises(ValueError, match="unknown format 'gif'"):
        figures.save(figure, "x.gif")


def hashes() -> list[str]:
    figure, (ax,) = figures.new_figure()
    figures.profile.draw(ax, odd_names(), temperatures_k=TWO_K)
    other, (ax,) = figures.new_figure()
    draw_regimes(ax)
    third, (ax,) = figures.new_figure()
    figures.measured.draw(ax, comparison(17))
    forms: tuple[Any, ...] = ("svg", "pdf", "png")
    return [
        hashlib.sha256(
            b"".join(figures.content(one, f) for one in (figure, other, third))
        ).hexdigest()
        for f in forms
    ]


def test_two_runs_give_the_same_bytes_whatever_the_users_settings(tmp_path: Path) -> None:
    (tmp_path / "matplotlibrc").write_text("font.size: 20\nlines.linewidth: 9\naxes.grid: True\n")
    folders = [str(Path(tp.__file__).parents[1]), str(Path(__file__).parent)]
    env = {
        "PYTHONPATH": os.pathsep.join(folders),
        "PYTHONHASHSEED": "1",
        "MATPLOTLIBRC": str(tmp_path),
        "MPLCONFIGDIR": mpl.get_configdir(),
    }
    code = (
        "import matplotlib, test_figures as t\nprint(matplotlib.rcParams['font.size'], *t.hashes())"
    )
    run = subprocess.run(
        [sys.executable, "-c", code],
        capture_output=True,
        text=True,
        check=True,
        timeout=240,
        env=env,
    )
    assert run.stdout.split() == ["20.0", *hashes()]


def test_a_figure_leaves_no_settings_behind(bundled: Profile) -> None:
    before = dict(mpl.rcParams)
    figure, (ax,) = figures.new_figure()
    figures.profile.draw(ax, bundled)
    figures.content(figure, "svg")
    assert dict(mpl.rcParams) == before


def test_names_are_elided_and_wrapped_to_a_width() -> None:
    for width in (30.0, 60.0, 120.0):
        assert width_pt(elided(LONG, width)) <= width
        assert all(width_pt(line) <= width for line in wrapped(f"{LONG} + 2 W", width).split("\n"))
    assert elided("TS2", 60.0) == "TS2"
    assert elided(f"{LONG}-1", 60.0)[-2:] == "-1"
    assert width_pt("TS2") == pytest.approx(width_pt("TS2", 14.0) / 2.0, rel=0.05)  # hinting
    assert shown("水\n$") == "\\u6c34\\n$"
    assert TEXT_PT == 7.0


def test_labels_go_to_the_preferred_side_and_yield_to_others() -> None:
    bounds = (0.0, 0.0, 100.0, 100.0)
    none = np.zeros((0, 4))
    one = Request(50.0, 50.0, [(20.0, 10.0)])
    first, second = placed([one, one], boxes=none, lines=none, bounds=bounds, gap=1.0)
    assert first is not None
    assert second is not None
    assert (first.x, first.y) == pytest.approx((50.0, 56.0))
    assert second.y == pytest.approx(44.0)
    wall = np.array([[0.0, 51.0, 100.0, 100.0]])
    (below,) = placed([one], boxes=wall, lines=none, bounds=bounds, gap=1.0)
    assert below is not None
    assert below.y < 50.0
    across = np.array([[0.0, 56.0, 100.0, 56.0]])
    (aside,) = placed([one], boxes=none, lines=across, bounds=bounds, gap=1.0)
    assert aside is not None
    assert aside.y < 50.0
    shorter = Request(50.0, 50.0, [(200.0, 10.0), (20.0, 10.0)])
    assert [
        place and place.variant
        for place in placed([shorter], boxes=none, lines=none, bounds=bounds, gap=1.0)
    ] == [1]
    full = np.array([[0.0, 0.0, 100.0, 100.0]])
    assert placed([one], boxes=full, lines=none, bounds=bounds, gap=1.0) == [None]


def test_the_committed_figure_is_what_its_script_makes() -> None:
    folder = Path(__file__).parents[1] / "docs" / "figures"
    committed = (folder / "stack-plume.svg").read_bytes()
    assert len(committed) < 60_000
    space: dict[str, Any] = {"__name__": "make", "__file__": str(folder / "make.py")}
    exec((folder / "make.py").read_text(encoding="utf-8"), space)
    made = space["stack_plume"]()
    assert svg_texts(made) == svg_texts(committed)
    if mpl.__version__ != DRAWN_WITH:
        pytest.skip(f"drawn with matplotlib {DRAWN_WITH}, here is {mpl.__version__}")
    assert made == committed
