"""The regime map: what controls the rate over temperature and concentration, and where E_a is zero."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from thermo_pp.output.figures.key import key
from thermo_pp.output.figures.style import HATCHES, INK, PALE, TINTS, heading, log_axis, styled
from thermo_pp.output.figures.words import shown

if TYPE_CHECKING:
    from matplotlib.artist import Artist
    from matplotlib.axes import Axes

FloatArray = NDArray[np.float64]


@styled
def draw(
    ax: Axes,
    temperature_k: FloatArray,
    concentration_mol_l: FloatArray,
    codes: NDArray[np.int64],
    names: Mapping[int, str],
    *,
    species: str,
    energies_kj_mol: FloatArray | None = None,
) -> Axes:
    """Draw the map into an axes and return it; every grid point fills the area next to it.

    Parameters
    ----------
    ax : Axes
    temperature_k : shape (t,), rising
    concentration_mol_l : shape (c,), rising, above 0
    codes : shape (c, t)
        The regime at each point; a code that has no name is left white.
    names : mapping of int to str
        Up to eight regimes.
    species : str
        Whose concentration it is.
    energies_kj_mol : shape (c, t) or None
        Arrhenius energy; its zero is drawn as a line.
    """
    from matplotlib.collections import PolyCollection
    from matplotlib.lines import Line2D
    from matplotlib.patches import Patch

    present = [code for code in names if (codes == code).any()]
    if len(present) > len(TINTS):
        raise ValueError(f"{len(present)} regimes; at most {len(TINTS)} can be told apart")
    heading(ax, "x", "$T$", "K")
    heading(ax, "y", "$c$", "mol L⁻¹", after=shown(species))
    across = _edges(temperature_k)
    up = np.exp(_edges(np.log(concentration_mol_l)))
    handles: list[Artist] = []
    for k, code in enumerate(present):
        area = PolyCollection(
            _rectangles(codes == code, across, up), facecolors=TINTS[k], edgecolors=TINTS[k],
            linewidths=0.15, zorder=0.5,
        )  # fmt: skip
        ax.add_collection(area)
        if HATCHES[k]:
            cover = PolyCollection(
                _rectangles(codes == code, across, up), facecolors="none", edgecolors=INK,
                linewidths=0.0, hatch=HATCHES[k], zorder=0.6,
            )  # fmt: skip
            ax.add_collection(cover)
        handles.append(Patch(facecolor=TINTS[k], hatch=HATCHES[k], edgecolor=INK, linewidth=0.3))
    labels = [names[code] for code in present]
    log_axis(ax, "y")
    ax.set_xlim(across[0], across[-1])
    ax.set_ylim(up[0], up[-1])
    if energies_kj_mol is not None and min(energies_kj_mol.shape) > 1:
        if np.nanmin(energies_kj_mol) < 0.0 < np.nanmax(energies_kj_mol):
            for colour, width in (("white", 3.0), (INK, 1.3)):
                ax.contour(
                    temperature_k, concentration_mol_l, energies_kj_mol, levels=[0.0], colors=[colour],
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
