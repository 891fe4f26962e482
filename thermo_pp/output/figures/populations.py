"""Populations over temperature: of the members of a pool or a catalyst, or of conformers."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.results import EffectiveRate
from thermo_pp.names import Definition
from thermo_pp.output.figures.curves import draw_curves, temperature_axis
from thermo_pp.output.figures.style import INK, TEXT_PT, heading, styled
from thermo_pp.output.notes import kelvin

if TYPE_CHECKING:
    from matplotlib.axes import Axes


@styled
def draw(
    ax: Axes, temperature_k: NDArray[np.float64], shares: Mapping[str, NDArray[np.float64]]
) -> Axes:
    """Draw shares of one into an axes and return it.

    Parameters
    ----------
    ax : Axes
    temperature_k : shape (t,)
    shares : mapping of str to shape (t,)
        Of the species of a pool, or of the conformers of an ensemble.
    """
    one = len(temperature_k) == 1
    heading(ax, "x" if one else "y", "share")
    if one:
        ax.set_title(kelvin(float(temperature_k[0])), fontsize=TEXT_PT, color=INK)
    else:
        heading(ax, "x", "$T$", "K")
        temperature_axis(ax, temperature_k)
    draw_curves(ax, temperature_k, shares)
    (ax.set_xlim if one else ax.set_ylim)(-0.03, 1.03)
    return ax


def of_rate(ax: Axes, effective: EffectiveRate, definition: Definition = "pool") -> Axes:
    """Draw what the reactant or the catalyst is bound in.

    Raises
    ------
    ValueError
        The rate is not there, or has no populations.
    """
    rate = effective.rates.get(definition)
    if rate is None or rate.populations is None:
        raise ValueError(f"no populations of the rate {definition!r}; take 'pool' or 'cycle'")
    return draw(ax, effective.temperature_k, rate.populations)
