"""The profile: states of paths as levels, H or G, at one or two temperatures."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, Literal, get_args

import numpy as np

from thermo_pp.names import EnergyUnit
from thermo_pp.output.figures.key import key, size_pt
from thermo_pp.output.figures.network import Level, Network, network
from thermo_pp.output.figures.style import COLOURS, DASHES, INK, PALE, TEXT_PT, heading, styled
from thermo_pp.output.figures.words import shown, width_pt, wrapped
from thermo_pp.output.notes import kelvin, usual
from thermo_pp.output.tables import ENERGY_DECIMALS, UNITS, Column
from thermo_pp.profile import Profile, State
from thermo_pp.units import ENERGY_PER_KJ_MOL

if TYPE_CHECKING:
    from matplotlib.artist import Artist
    from matplotlib.axes import Axes

    from thermo_pp.output.figures.labels import Label

Quantity = Literal["enthalpy", "gibbs"]
QUANTITIES: tuple[Quantity, ...] = get_args(Quantity)
_SYMBOL: dict[Quantity, str] = {"enthalpy": r"$\Delta H$", "gibbs": r"$\Delta G$"}
MOST_PATHS = len(COLOURS)
"""So many paths are in colour."""
_HALF = 0.27
"""Half the width of a level, in columns."""
FEWER_DECIMALS = 1
"""Decimals fewer than in a table."""


@styled
def draw(
    ax: Axes,
    profile: Profile,
    *,
    quantity: Quantity = "gibbs",
    temperatures_k: Sequence[float] | None = None,
    paths: Sequence[str] | None = None,
    unit: EnergyUnit = "kJ/mol",
    values: bool = True,
    entropy: bool = False,
    explained: bool = True,
) -> Axes:
    """Draw the levels of paths into an axes and return it.

    A state that several paths go through is drawn once. With more than seven paths those seven
    whose highest state is lowest are in colour and have names, the others are pale.

    Parameters
    ----------
    ax : Axes
    profile : Profile
    quantity : {"gibbs", "enthalpy"}
    temperatures_k : one or two of the profile's temperatures, or None
        None: the one nearest to 298.15 K. Levels are filled at the first and open at the second.
    paths : names of paths, or None
        None: all.
    unit : str
    values : bool
        Numbers at the levels.
    entropy : bool
        In a figure of G, arrows from the enthalpy of each saddle point to its free energy.
    explained : bool
        Whether there is a key and a title.

    Raises
    ------
    ValueError
        A temperature or path that is not the profile's, or more than two temperatures.
    """
    from thermo_pp.output.figures.labels import Labels

    where = _temperatures(profile, temperatures_k)
    chosen = _chosen(profile, paths)
    coloured = _coloured(profile, chosen, where, "gibbs")
    heading(ax, "y", _SYMBOL[quantity], UNITS[unit])
    ax.set_xticks([])
    ax.spines["bottom"].set_visible(False)
    if explained:
        _explain(ax, profile, where, chosen, coloured)
    picture = network([state for state in profile.states if state.path in chosen])
    heights = _heights(picture, where, quantity, unit)
    slots = _slots(picture, heights)
    feet = _feet(picture, where, unit) if entropy and quantity == "gibbs" else {}
    lines = _draw_levels(ax, picture, heights, slots, coloured)
    names, numbers = _labels(ax, picture, heights, slots, coloured, unit, values, feet)
    arrow, shafts = _draw_entropy(ax, heights, slots, feet)
    levels = [(*slot, height) for row, slot in zip(heights, slots, strict=True) for height in row]
    Labels(ax, [*names, *numbers, *arrow], np.array(levels), np.array([*lines, *shafts]))
    return ax


@styled
def draw_both(
    axes: Sequence[Axes],
    profile: Profile,
    *,
    temperatures_k: Sequence[float] | None = None,
    paths: Sequence[str] | None = None,
    unit: EnergyUnit = "kJ/mol",
    values: bool = True,
) -> Sequence[Axes]:
    """Draw H into the first of two axes and G into the second, on one scale, and return them.

    Arrows in the second show what entropy does to the saddle points. Without `temperatures_k` the
    first and the last of the profile's are drawn.
    """
    if temperatures_k is None:
        ends = profile.temperature_k[[0, -1]]
        temperatures_k = sorted({float(t) for t in ends})
    left, right = axes
    chosen = _chosen(profile, paths)
    where = _temperatures(profile, temperatures_k)
    for ax in axes:  # all that takes room first, so that names are broken for the final width
        heading(ax, "y", _SYMBOL["gibbs"], UNITS[unit])
        ax.set_xticks([])
    _explain(left, profile, where, chosen, _coloured(profile, chosen, where, "gibbs"), width=2.0)
    for ax, quantity in zip(axes, QUANTITIES, strict=True):
        draw(
            ax, profile, quantity=quantity, temperatures_k=temperatures_k, paths=paths, unit=unit,
            values=values, entropy=True, explained=False,
        )  # fmt: skip
    limits = np.array([left.get_ylim(), right.get_ylim()])
    for ax in axes:
        ax.set_ylim(limits[:, 0].min(), limits[:, 1].max())
    return axes


def _temperatures(profile: Profile, wanted: Sequence[float] | None) -> list[int]:
    if wanted is None:
        return [usual(profile.temperature_k)]
    if not 1 <= len(wanted) <= 2:
        raise ValueError(f"one or two temperatures can be drawn, not {len(wanted)}")
    found = []
    for temperature in wanted:
        near = np.flatnonzero(np.isclose(profile.temperature_k, temperature, rtol=0.0, atol=1e-6))
        if not len(near):
            known = ", ".join(kelvin(t) for t in profile.temperature_k)
            raise ValueError(f"{kelvin(temperature)} is not one of the profile's: {known}")
        found.append(int(near[0]))
    return found


def _chosen(profile: Profile, wanted: Sequence[str] | None) -> list[str]:
    known = list(dict.fromkeys(state.path for state in profile.states))
    for name in wanted or ():
        if name not in known:
            raise ValueError(f"{name!r} is not a path of the profile: {', '.join(known)}")
    return known if wanted is None else [name for name in known if name in wanted]


def _energy(state: State, quantity: Quantity, k: int) -> float:
    return float((state.gibbs_kj_mol if quantity == "gibbs" else state.enthalpy_kj_mol)[k])


def _coloured(
    profile: Profile, chosen: Sequence[str], where: Sequence[int], quantity: Quantity
) -> list[str]:
    """Return the paths that are drawn in colour, in the order of the profile."""

    def highest(path: str) -> float:
        states = [state for state in profile.states if state.path == path]
        return max(_energy(state, quantity, where[0]) for state in states)

    lowest = sorted(chosen, key=highest)[:MOST_PATHS]
    return [name for name in chosen if name in lowest]


def _heights(
    picture: Network, where: Sequence[int], quantity: Quantity, unit: EnergyUnit
) -> list[list[float]]:
    """Return the height of each level at each temperature, in the display unit."""
    return [
        [_energy(level.state, quantity, k) * ENERGY_PER_KJ_MOL[unit] for k in where]
        for level in picture.levels
    ]


def _slots(picture: Network, heights: Sequence[Sequence[float]]) -> list[tuple[float, float]]:
    """Return left and right of each level: levels of a column that nearly coincide share its width."""
    flat = [height for row in heights for height in row]
    near = 0.025 * max(max(flat) - min(flat), 1e-9)
    slots = [(level.column - _HALF, level.column + _HALF) for level in picture.levels]
    for column in range(picture.columns):
        here = [k for k, level in enumerate(picture.levels) if level.column == column]
        here.sort(key=lambda k: (heights[k][0], k))
        groups: list[list[int]] = []
        for k in here:
            if groups and any(
                abs(a - b) < near
                for other in groups[-1]
                for a in heights[k]
                for b in heights[other]
            ):
                groups[-1].append(k)
            else:
                groups.append([k])
        for group in groups:
            wide = 2.0 * _HALF if len(group) == 1 else 0.9
            edges = column - 0.5 * wide + wide * np.arange(len(group) + 1) / len(group)
            for place, k in enumerate(sorted(group)):
                inset = 0.0 if len(group) == 1 else 0.08 * wide / len(group)
                slots[k] = (float(edges[place]) + inset, float(edges[place + 1]) - inset)
    return slots


def _draw_levels(
    ax: Axes,
    picture: Network,
    heights: Sequence[Sequence[float]],
    slots: Sequence[tuple[float, float]],
    coloured: Sequence[str],
) -> list[tuple[float, float, float, float]]:
    """Draw levels and connectors; return the ends of the connectors."""
    ax.set_xlim(-0.62, picture.columns - 0.38)
    ax.set_autoscale_on(False)
    ax.axhline(0.0, color=PALE, linewidth=0.5, linestyle=(0, (1.0, 2.0)), zorder=0.5)
    ends = []
    for (start, end), users in picture.connections.items():
        seen = [name for name in users if name in coloured]
        for k in range(len(heights[start])):
            x = (slots[start][1], slots[end][0])
            y = (heights[start][k], heights[end][k])
            ends.append((x[0], y[0], x[1], y[1]))
            for order, name in enumerate(seen or ("",)):
                style = coloured.index(name) if seen else None
                # paths that go the same way take turns along it
                turn = DASHES[style or 0] if len(seen) < 2 else _turn(order, len(seen))
                ax.plot(
                    x, y, color=PALE if style is None else COLOURS[style], linestyle=turn,
                    linewidth=0.45 if style is None else (0.9, 0.6)[k], zorder=1.0 if style is None else 2.0,
                )  # fmt: skip
    for level, row, (left, right) in zip(picture.levels, heights, slots, strict=True):
        colour = _colour(level, coloured)
        top = 3.0 if colour != PALE else 1.5
        for k, height in enumerate(row):
            width = 2.2 if colour != PALE else 1.2
            ax.plot(
                (left, right), (height, height), color=colour, linewidth=width, solid_capstyle="butt",
                zorder=top,
            )  # fmt: skip
            if k == 1:
                ax.plot(
                    (left, right), (height, height), color="white", linewidth=0.45 * width,
                    solid_capstyle="butt", zorder=top + 0.1,
                )  # fmt: skip
    return ends


def _turn(order: int, count: int) -> tuple[float, tuple[float, float]]:
    dash = 5.0
    return (-order * dash, (dash, (count - 1) * dash))


def _colour(level: Level, coloured: Sequence[str]) -> str:
    seen = [name for name in level.paths if name in coloured]
    if not seen:
        return PALE
    return INK if len(level.paths) > 1 else COLOURS[coloured.index(seen[0])]


def _feet(picture: Network, where: Sequence[int], unit: EnergyUnit) -> dict[int, list[float]]:
    """Return the enthalpies of the saddle points, by the number of the level."""
    return {
        number: [_energy(level.state, "enthalpy", k) * ENERGY_PER_KJ_MOL[unit] for k in where]
        for number, level in enumerate(picture.levels)
        if level.state.kind == "saddle"
    }


def _draw_entropy(
    ax: Axes,
    heights: Sequence[Sequence[float]],
    slots: Sequence[tuple[float, float]],
    feet: Mapping[int, Sequence[float]],
) -> tuple[list[Label], list[tuple[float, float, float, float]]]:
    """Draw the arrows from H to G of the saddle points; return the label of the longest, and all."""
    from thermo_pp.output.figures.labels import Label

    shafts = []
    for number, row in feet.items():
        left, right = slots[number]
        for k, foot in enumerate(row):
            x = left + (right - left) * (0.5 if len(row) == 1 else (0.06, 0.94)[k])
            ax.annotate(
                "", (x, heights[number][k]), (x, foot),
                arrowprops={
                    "arrowstyle": "-|>,head_width=0.12,head_length=0.3", "color": PALE, "shrinkA": 0.0,
                    "shrinkB": 1.5, "linewidth": 0.7, "linestyle": (0, (2.0, 1.0)) if k else "-",
                },
                zorder=1.2,
            )  # fmt: skip
            shafts.append((x, foot, x, heights[number][k]))
    if not shafts:
        return [], []
    x, foot, _, head = max(shafts, key=lambda shaft: abs(shaft[3] - shaft[1]))
    said = [r"$-T\,\Delta S$"]
    return [
        Label(x, x, *(0.5 * (foot + head),) * 2, said, aside=True, math=True, name=False)
    ], shafts


def _labels(
    ax: Axes,
    picture: Network,
    heights: Sequence[Sequence[float]],
    slots: Sequence[tuple[float, float]],
    coloured: Sequence[str],
    unit: EnergyUnit,
    values: bool,
    feet: Mapping[int, Sequence[float]],
) -> tuple[list[Label], list[Label]]:
    """Return names (with values) and further values of the levels in colour; leave room for them."""
    from thermo_pp.output.figures.labels import Label

    width, height = size_pt(ax)
    room = min(90.0, max(36.0, 1.15 * width / picture.columns))
    texts = [
        wrapped(level.state.state + (" ‡" if level.state.kind == "saddle" else ""), room)
        for level in picture.levels
    ]
    flat = [*(y for row in heights for y in row), *(y for row in feet.values() for y in row)]
    low, high = min(flat), max(flat)
    lines = 1 + max(text.count("\n") for text in texts) + (len(heights[0]) if values else 0)
    margin = min(0.3, (1.25 * lines * TEXT_PT + 5.0) / height)
    span = (high - low) / (1.0 - 2.0 * margin) or 2.0
    ax.set_ylim(0.5 * (low + high - span), 0.5 * (low + high + span))
    number = Column("", decimals=max(0, ENERGY_DECIMALS[unit] - FEWER_DECIMALS))
    names: list[Label] = []
    others: list[Label] = []
    for level, text, row, (left, right) in zip(picture.levels, texts, heights, slots, strict=True):
        colour = _colour(level, coloured)
        if colour == PALE:
            continue
        saddle = level.state.kind == "saddle"
        rows = sorted(row, reverse=True)
        written = [number.text(y).replace("-", "\N{MINUS SIGN}") for y in rows]
        together = (rows[0] - rows[-1]) / span * height < 2.4 * TEXT_PT
        own = list(dict.fromkeys(written)) if together else written[:1] if saddle else written[-1:]
        full = "\n".join([text, *own])
        low, high = (rows[-1], rows[0]) if together else (rows[0 if saddle else -1],) * 2
        said = [full, text] if values else [text]
        names.append(Label(left, right, low, high, said, colour, up=saddle))
        if values and not together:
            rest, value = (rows[-1], written[-1]) if saddle else (rows[0], written[0])
            others.append(
                Label(left, right, rest, rest, [value], colour, up=not saddle, name=False)
            )
    return names, others


def _explain(
    ax: Axes,
    profile: Profile,
    where: Sequence[int],
    chosen: Sequence[str],
    coloured: Sequence[str],
    width: float = 1.0,
) -> None:
    """Write the key and, as the title, what the energies refer to."""
    from matplotlib.lines import Line2D
    from matplotlib.patches import Patch

    handles: list[Artist] = [
        Line2D([], [], color=COLOURS[k], linestyle=DASHES[k], linewidth=1.0)
        for k in range(len(coloured))
    ]
    names = list(coloured)
    if len(chosen) > len(coloured):
        handles.append(Line2D([], [], color=PALE, linewidth=0.5))
        names.append(f"{len(chosen) - len(coloured)} paths with higher states")
    temperatures = [kelvin(profile.temperature_k[k]) for k in where]
    if len(where) > 1:
        handles += [Patch(facecolor=face, edgecolor=INK, linewidth=0.6) for face in (INK, "white")]
        names += temperatures
    if len(chosen) == 1 and len(where) == 1:
        handles, names = [], []
    key(ax, handles, names, width)
    at = (
        f"standard state {profile.standard_state}"
        if profile.at == "standard state"
        else "at the concentrations held"
    )
    said = [f"relative to {profile.reference}", at]
    said[:0] = temperatures if len(where) == 1 else []
    if len(chosen) == 1:
        said.insert(0, chosen[0])
    title = shown("; ".join(said))
    room = width * size_pt(ax)[0]
    lines = title if width_pt(title) <= room else "\n".join(wrapped(one, room, 1) for one in said)
    ax.set_title(lines, fontsize=TEXT_PT, color=INK)
