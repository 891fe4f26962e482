"""Controls over temperature: which energies the rate follows, and by how much."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from thermo_pp.kinetics.results import EffectiveRate
from thermo_pp.names import Definition
from thermo_pp.output.figures.curves import draw_curves, temperature_axis
from thermo_pp.output.figures.style import INK, PALE, TEXT_PT, heading, styled
from thermo_pp.output.notes import kelvin

if TYPE_CHECKING:
    from matplotlib.axes import Axes

NOTABLE = 0.02
"""A control that is nowhere further from 0 than this is not drawn."""


@styled
def draw(ax: Axes, effective: EffectiveRate, definition: Definition = "pool") -> Axes:
    """Draw d ln k/d(-G/RT) of saddle points (marked with a double dagger) and species; return the axes.

    Raises
    ------
    ValueError
        The rate is not there.
    """
    rate = effective.rates.get(definition)
    if rate is None:
        raise ValueError(f"there is no rate {definition!r}")
    shown = {
        f"{name} ‡" if name in rate.saddles else name: values
        for name, values in rate.control.items()
        if np.nanmax(np.abs(values), initial=0.0) > NOTABLE
    }
    one = len(effective.temperature_k) == 1
    heading(ax, "x" if one else "y", r"control  $\partial\,\ln\,k\,/\,\partial(-G/RT)$")
    if one:
        ax.set_title(kelvin(float(effective.temperature_k[0])), fontsize=TEXT_PT, color=INK)
    else:
        heading(ax, "x", "$T$", "K")
        temperature_axis(ax, effective.temperature_k)
        ax.axhline(0.0, color=PALE, linewidth=0.5, linestyle=(0, (1.0, 2.0)), zorder=0.5)
    draw_curves(ax, effective.temperature_k, shown)
    return ax
