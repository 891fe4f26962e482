"""Doubt: the distribution of the Arrhenius energy, and the share of it that is below zero."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from thermo_pp.names import EnergyUnit
from thermo_pp.output.figures.key import key
from thermo_pp.output.figures.style import ABOVE, BELOW, INK, heading, styled
from thermo_pp.output.tables import UNITS
from thermo_pp.units import ENERGY_PER_KJ_MOL

if TYPE_CHECKING:
    from matplotlib.artist import Artist
    from matplotlib.axes import Axes

_BINS = 40


@styled
def draw(
    ax: Axes,
    energies_kj_mol: NDArray[np.float64],
    share_below_zero: float,
    *,
    nominal_kj_mol: float | None = None,
    unit: EnergyUnit = "kJ/mol",
) -> Axes:
    """Draw a histogram of Arrhenius energies, split at zero, into an axes and return it.

    Parameters
    ----------
    ax : Axes
    energies_kj_mol : shape (n,)
        One a sample; those that are not finite are counted in the key and not drawn.
    share_below_zero : float
        Of the samples, as the result has it.
    nominal_kj_mol : float or None
        Of the study as it stands: a line.
    unit : str
    """
    from matplotlib.patches import Patch

    scale = ENERGY_PER_KJ_MOL[unit]
    finite = np.isfinite(energies_kj_mol)
    values = energies_kj_mol[finite] * scale
    heading(ax, "x", r"$E_\mathrm{a}$", UNITS[unit])
    heading(ax, "y", "samples")
    handles: list[Artist] = []
    names: list[str] = []
    if len(values):
        low, high = float(values.min()), float(values.max())
        step = (high - low) / _BINS or 1.0
        edges = step * np.arange(np.floor(low / step), np.floor(high / step) + 2.0)  # 0 is an edge
        for side, colour, hatch in ((values < 0.0, BELOW, ""), (values >= 0.0, ABOVE, "////")):
            if side.any():
                ax.hist(
                    values[side], bins=edges.tolist(), color=colour, hatch=hatch, edgecolor="white",
                    linewidth=0.3,
                )  # fmt: skip
    ax.axvline(0.0, color=INK, linewidth=0.7)
    below, above = _percent(share_below_zero), _percent(1.0 - share_below_zero)
    for colour, hatch, name in (
        (BELOW, "", f"below zero: {below}"),
        (ABOVE, "////", f"zero and above: {above}"),
    ):
        handles.append(Patch(facecolor=colour, hatch=hatch, edgecolor="white", linewidth=0.3))
        names.append(name)
    if nominal_kj_mol is not None:
        line = ax.axvline(
            nominal_kj_mol * scale, color=INK, linewidth=1.0, linestyle=(0, (4.0, 1.5))
        )
        handles.append(line)
        names.append("as the study stands")
    if not finite.all():
        handles.append(Patch(facecolor="none", edgecolor="none"))
        lost = int((~finite).sum())
        names.append(f"{lost} sample{'s' if lost > 1 else ''} without a value")
    key(ax, handles, names)
    return ax


def _percent(share: float) -> str:
    """Return a share in percent that never rounds to all or nothing where it is not."""
    shown = f"{100.0 * share:.1f} %"
    if shown == "100.0 %" and share < 1.0:
        return "> 99.9 %"
    if shown == "0.0 %" and share > 0.0:
        return "< 0.1 %"
    return shown
