"""Figures: each module draws one from a result into an axes and returns it; nothing is computed.

>>> from thermo_pp import figures
>>> figure, (ax,) = figures.new_figure()

``profile`` levels of paths, ``rates`` Arrhenius and Eyring plots, ``measured`` against computed,
``populations`` and ``controls`` over temperature, ``regimes`` the map, ``courses`` over time, ``doubt``
the distribution of E_a. `save` writes SVG, PDF or PNG, the same bytes in every run. matplotlib is
imported when something is drawn.
"""

from thermo_pp.output.figures import (
    controls,
    courses,
    doubt,
    measured,
    populations,
    profile,
    rates,
    regimes,
)
from thermo_pp.output.figures.saving import content, save
from thermo_pp.output.figures.style import COLUMN_MM, PAGE_MM, new_figure

__all__ = [
    "COLUMN_MM",
    "PAGE_MM",
    "content",
    "controls",
    "courses",
    "doubt",
    "measured",
    "new_figure",
    "populations",
    "profile",
    "rates",
    "regimes",
    "save",
]
