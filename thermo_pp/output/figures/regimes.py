"""The regime map: what controls the rate over temperature and concentration, and where E_a is zero."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Literal

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.regime_map import NOTHING, Regimes
from thermo_pp.names import Definition
from thermo_pp.output.figures.key import key
from thermo_pp.output.figures.style import HATCHES, INK, PALE, TINTS, heading, log_axis, styled
from thermo_pp.output.figures.words import elided

if TYPE_CHECKING:
    from matplotlib.artist import Artist
    from matplotlib.axes import Axes

FloatArray = NDArray[np.float64]


@styled
def draw(
    ax: Axes,
    temperature_k: FloatArray,
    amount: FloatArray,
    codes: NDArray[np.int64],
    names: Mapping[int, str],
    *,
    species: str,
    unit: Literal["mol/L", "Pa"] = "mol/L",
    energies_kj_mol: FloatArray | None = None,
) -> Axes:
    """Draw the map into an axes and return it; every grid point fills the area next to it.

    Parameters
    ----------
    ax : Axes
    temperature_k : shape (t,), rising
    amount : shape (c,), rising, above 0
    codes : shape (c, t)
        The regime at each point; a code that has no name is left white.
    names : mapping of int to str
        With more than eight regimes the seven most common have an area of their own.
    species : str
        Whose amount it is.
    unit : {"mol/L", "Pa"}
    energies_kj_mol : shape (c, t) or None
        Arrhenius energy; its zero is drawn as a line.
    """
    from matplotlib.collections import PolyCollection
    from matplotlib.lines import Line2D
    from matplotlib.patches import Patch

    present = [code for code in names if (codes == code).any()]
    areas = [(names[code], codes == code) for code in present]
    if len(present) > len(TINTS):
        common = sorted(present, key=lambda code: -int((codes == code).sum()))[: len(TINTS) - 1]
        rest = [code for code in present if code not in common]
        areas = [(names[code], codes == code) for code in present if code in common]
        areas.append((f"{len(rest)} others", np.isin(codes, rest)))
    heading(ax, "x", "$T$", "K")
    symbol, written = ("$c$", "mol L⁻¹") if unit == "mol/L" else ("$p$", "Pa")
    heading(ax, "y", symbol, written, after=elided(species, 90.0))
    across = _edges(temperature_k)
    up = np.exp(_edges(np.log(amount)))
    handles: list[Artist] = []
    for k, (_, inside) in enumerate(areas):
        area = PolyCollection(
            _rectangles(inside, across, up), facecolors=TINTS[k], edgecolors=TINTS[k],
            linewidths=0.15, zorder=0.5,
        )  # fmt: skip
        ax.add_collection(area)
        if HATCHES[k]:
            cover = PolyCollection(
                _rectangles(inside, across, up), facecolors="none", edgecolors=INK,
                linewidths=0.0, hatch=HATCHES[k], zorder=0.6,
            )  # fmt: skip
            ax.add_collection(cover)
        handles.append(Patch(facecolor=TINTS[k], hatch=HATCHES[k], edgecolor=INK, linewidth=0.3))
    labels = [name for name, _ in areas]
    log_axis(ax, "y")
    ax.set_xlim(across[0], across[-1])
    ax.set_ylim(up[0], up[-1])
    if energies_kj_mol is not None and min(energies_kj_mol.shape) > 1:
        if np.nanmin(energies_kj_mol) < 0.0 < np.nanmax(energies_kj_mol):
            for colour, width in (("white", 3.0), (INK, 1.3)):
                ax.contour(
                    temperature_k, amount, energies_kj_mol, levels=[0.0], colors=[colour],
                    linewidths=[width], linestyles=["solid"], zorder=2.0,
                )  # fmt: skip
            handles.append(Line2D([], [], color=INK, linewidth=1.3))
            labels.append("Eₐ = 0")
        else:
            sign = "below" if np.nanmax(energies_kj_mol) < 0.0 else "above"
            handles.append(Line2D([], [], color=PALE, linewidth=0.0))
            labels.append(f"Eₐ {sign} zero everywhere")
    key(ax, handles, labels)
    return ax


def of_map(
    ax: Axes,
    regimes: Regimes,
    definition: Definition = "pool",
    layer: Literal["holding", "controlling", "resting"] = "controlling",
) -> Axes:
    """Draw a map of a study: which approximation holds, which saddle point controls, what is at rest.

    Raises
    ------
    ValueError
        The map or the layer is not there.
    """
    one = regimes.maps.get(definition)
    if one is None:
        raise ValueError(f"there is no map of the rate {definition!r}")
    layers: dict[str, tuple[NDArray[np.intp] | None, tuple[str, ...]]] = {
        "holding": (one.holding, one.approximations),
        "controlling": (one.controlling, one.saddles),
        "resting": (one.resting, one.states),
    }
    codes, said = layers[layer]
    if codes is None:
        raise ValueError(f"the map of the rate {definition!r} has no layer {layer!r}")
    names = dict(enumerate(said))
    if layer == "holding":
        names[NOTHING] = "no approximation holds"
    order = np.argsort(regimes.temperature_k, kind="stable")
    return draw(
        ax, regimes.temperature_k[order], regimes.amount, codes[order].T.astype(np.int64), names,
        species=regimes.species, unit="mol/L" if regimes.unit == "mol/L" else "Pa",
        energies_kj_mol=one.arrhenius_energy_kj_mol[order].T,
    )  # fmt: skip


def _edges(points: FloatArray) -> FloatArray:
    """Return the bounds of the cells round points, halfway between neighbours."""
    if len(points) == 1:
        return np.array([points[0] - 0.5, points[0] + 0.5])
    middle = 0.5 * (points[1:] + points[:-1])
    return np.concatenate([[points[0]], middle, [points[-1]]])


def _rectangles(
    inside: NDArray[np.bool_], across: FloatArray, up: FloatArray
) -> list[list[tuple[float, float]]]:
    """Return one rectangle for each run of cells in a row."""
    found = []
    for row, cells in enumerate(inside):
        change = np.flatnonzero(np.diff(np.concatenate([[False], cells, [False]])))
        for start, stop in zip(change[::2], change[1::2], strict=True):
            left, right = float(across[start]), float(across[stop])
            low, high = float(up[row]), float(up[row + 1])
            found.append([(left, low), (right, low), (right, high), (left, high)])
    return found
