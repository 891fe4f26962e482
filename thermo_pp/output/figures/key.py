"""Key: what colours, lines and markers mean, below the axes in as many columns as fit."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from thermo_pp.output.figures.style import TEXT_PT
from thermo_pp.output.figures.words import elided, width_pt

if TYPE_CHECKING:
    from matplotlib.artist import Artist
    from matplotlib.axes import Axes
    from matplotlib.container import Container
    from matplotlib.transforms import Transform

_HANDLE_EM, _PAD_EM, _BETWEEN_EM = 2.8, 0.6, 1.4


def key(
    ax: Axes, handles: Sequence[Artist | Container], names: Sequence[str], width: float = 1.0
) -> None:
    """Write a key below an axes and its heading, as wide as `width` axes; long names are elided."""
    if not handles:
        return
    from matplotlib.legend import Legend

    room = width * size_pt(ax)[0]
    beside = (_HANDLE_EM + _PAD_EM) * TEXT_PT
    texts = [elided(name, room - beside) for name in names]
    widest = max(width_pt(text) for text in texts) + beside
    between = _BETWEEN_EM * TEXT_PT
    columns = max(1, min(len(texts), int((room + between) // (widest + between))))
    legend = Legend(
        ax, list(handles), texts, loc="upper left", ncols=columns, borderaxespad=0.0, borderpad=0.0,
        handlelength=_HANDLE_EM, handletextpad=_PAD_EM, columnspacing=_BETWEEN_EM, labelspacing=0.35,
        bbox_to_anchor=(0.0, 0.0), bbox_transform=_below(ax),
    )  # fmt: skip
    for text in legend.get_texts():
        text.set_parse_math(False)
    ax.add_artist(legend)
    legend.set_clip_on(False)


def _below(ax: Axes) -> Transform:
    """Return the axes' own coordinates, moved down past the ticks and the heading."""
    from matplotlib.transforms import ScaledTranslation

    figure = ax.get_figure(root=True)
    assert figure is not None
    down = 4.0 if not ax.get_xlabel() else 15.0 + TEXT_PT + 1.4 * (TEXT_PT + 1.0)
    return ax.transAxes + ScaledTranslation(0.0, -down / 72.0, figure.dpi_scale_trans)


def size_pt(ax: Axes) -> tuple[float, float]:
    """Return width and height of an axes in points, after the figure has found its layout."""
    figure = ax.get_figure(root=True)
    assert figure is not None
    engine = figure.get_layout_engine()
    if engine is not None:
        engine.execute(figure)
    area = ax.get_window_extent()
    return float(area.width / figure.dpi * 72.0), float(area.height / figure.dpi * 72.0)
