"""Style: colours, line styles, sizes and headings that all figures share.

Colours: Okabe and Ito, "Color Universal Design", 2008 (jfly.uni-koeln.de/color; values from memory).
Whatever a colour tells apart, a line style, marker or hatch tells apart too. Text is at least 7 pt,
and the figures are drawn for a column of 85 mm.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from functools import cache, wraps
from typing import TYPE_CHECKING, Any, Literal, ParamSpec, TypeVar

from thermo_pp.output.tables import unit_heading

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

COLUMN_MM = 85.0
"""One column of a journal."""
PAGE_MM = 178.0
"""Two columns."""
TEXT_PT = 7.0
FONT = "DejaVu Sans"
"""It comes with matplotlib, so that a figure is the same everywhere."""

INK = "#1b1b1f"
PALE = "#a3a3ad"
COLOURS = ("#0072B2", "#D55E00", "#009E73", "#CC79A7", "#E69F00", "#56B4E9", "#000000")
"""Of lines and markers, in the order of use."""
BELOW, ABOVE = "#0072B2", "#E69F00"
"""Of what is below and above zero."""
TINTS = ("#A2D6F3", "#F1CA73", "#73CAB2", "#F7F097", "#E3B5CF", "#73B1D5", "#E8A673", "#CCCCD2")
"""Of areas: the same, 55 % of them in white."""
HATCHES = ("", "////", "||||", "\\\\\\\\", "xxxx", "----", "++++", "//")
Dashes = Literal["-"] | tuple[float, tuple[float, ...]]
DASHES: tuple[Dashes, ...] = (
    "-",
    (0, (5.0, 1.6)),
    (0, (1.1, 1.1)),
    (0, (6.0, 1.5, 1.1, 1.5)),
    (0, (2.6, 1.3)),
    (0, (7.0, 1.3, 1.1, 1.3, 1.1, 1.3)),
    (0, (10.0, 2.5)),
)
"""Of lines, one for each of `COLOURS`."""
MARKERS = ("o", "s", "^", "D", "v", "P", "X")

_SETTINGS: dict[str, Any] = {
    "font.family": [FONT],
    "font.size": TEXT_PT,
    "text.color": INK,
    "text.parse_math": False,  # a name is text, whatever is in it
    "mathtext.fontset": "dejavusans",
    "axes.labelsize": TEXT_PT + 1,
    "axes.titlesize": TEXT_PT,
    "axes.titlelocation": "left",
    "axes.labelcolor": INK,
    "axes.edgecolor": INK,
    "axes.linewidth": 0.7,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.unicode_minus": True,
    "xtick.labelsize": TEXT_PT,
    "ytick.labelsize": TEXT_PT,
    "xtick.color": INK,
    "ytick.color": INK,
    "xtick.major.width": 0.7,
    "ytick.major.width": 0.7,
    "legend.fontsize": TEXT_PT,
    "legend.frameon": False,
    "hatch.linewidth": 0.5,
    "errorbar.capsize": 1.8,
    "svg.fonttype": "none",
    "svg.hashsalt": "thermo_pp",
    "pdf.fonttype": 42,
    "pdf.compression": 6,
    "path.simplify": False,
}
"""On top of matplotlib's own defaults, never of the user's settings: a figure is the same for everybody."""

P = ParamSpec("P")
T = TypeVar("T")


def styled(draw: Callable[P, T]) -> Callable[P, T]:
    """Run a function that draws or saves under the settings of the figures, and leave no trace of them."""

    @wraps(draw)
    def inside(*args: P.args, **kwargs: P.kwargs) -> T:
        import matplotlib as mpl

        settings: Any = _defaults() | _SETTINGS
        with mpl.rc_context(settings):
            return draw(*args, **kwargs)

    return inside


@cache
def _defaults() -> dict[str, Any]:
    import matplotlib as mpl

    kinds = ("font.", "text.", "mathtext.", "axes.", "xtick.", "ytick.", "legend.", "lines.", "patch.",
             "hatch.", "errorbar.", "svg.", "pdf.", "path.", "figure.", "savefig.", "hist.", "contour.")  # fmt: skip
    return {key: value for key, value in mpl.rcParamsDefault.items() if key.startswith(kinds)}


@styled
def new_figure(
    *, width_mm: float = COLUMN_MM, height_mm: float = 70.0, rows: int = 1, columns: int = 1
) -> tuple[Figure, list[Axes]]:
    """Return a figure of that size and its axes, row by row; no window and no global state.

    Examples
    --------
    >>> figure, (ax,) = new_figure()
    >>> bool(abs(figure.get_figwidth() * 25.4 - 85.0) < 1e-9)
    True
    """
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    size = (width_mm / 25.4, height_mm / 25.4)
    figure = Figure(figsize=size, dpi=200, facecolor="white", layout="constrained")
    FigureCanvasAgg(figure)
    axes = figure.subplots(rows, columns, squeeze=False)
    return figure, list(axes.flat)


def log_axis(ax: Axes, axis: Literal["x", "y"]) -> None:
    """Make an axis logarithmic, its numbers written 10⁻³."""
    from matplotlib.ticker import FuncFormatter, LogLocator, NullFormatter

    scaled = ax.xaxis if axis == "x" else ax.yaxis
    (ax.set_xscale if axis == "x" else ax.set_yscale)("log")
    scaled.set_major_locator(LogLocator(numticks=7))
    scaled.set_major_formatter(
        FuncFormatter(lambda value, _: power_of_ten(round(math.log10(value))))
    )
    scaled.set_minor_formatter(NullFormatter())


def power_of_ten(exponent: int) -> str:
    """Return a power of ten as a text.

    >>> power_of_ten(-3)
    '10⁻³'
    """
    return unit_heading(f"10^{exponent}")


def heading(
    ax: Axes, axis: Literal["x", "y"], quantity: str, unit: str = "", after: str = ""
) -> None:
    """Write quantity / unit beside an axis, the symbol of the quantity in italics.

    Parameters
    ----------
    ax : Axes
    axis : {"x", "y"}
    quantity : str
        Ours, with mathematics between dollars: ``"$E$"``.
    unit : str
    after : str
        A name, any characters, in brackets after the quantity.
    """
    escaped = after.replace("$", r"\$")
    text = quantity + (f"({escaped})" if after else "") + (f" / {unit}" if unit else "")
    (ax.set_xlabel if axis == "x" else ax.set_ylabel)(text, parse_math=True)
