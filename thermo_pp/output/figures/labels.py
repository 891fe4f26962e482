"""Labels: an artist that finds places for its texts whenever it is drawn, at whatever size.

The only module here that imports matplotlib at its head; import it inside functions.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.lines import Line2D
from matplotlib.text import Text
from matplotlib.transforms import IdentityTransform
from numpy.typing import NDArray

from thermo_pp.output.figures.placement import Place, Request, placed
from thermo_pp.output.figures.style import INK, PALE, TEXT_PT, styled

FloatArray = NDArray[np.float64]
_LEADER_PT = 9.0
"""A label further away from its level than this gets a line to it."""


@dataclass(frozen=True)
class Label:
    """One label, in data coordinates.

    Attributes
    ----------
    left, right, low, high : float
        What is labelled.
    variants : sequence of str
        Its text, the fullest first; a shorter one is taken where that has no room.
    colour : str
    up, aside : bool
        See `placement.Request`.
    math : bool
        Mathematics of ours between dollars.
    name : bool
        Whether anything is lost to the reader where there is no room even for the last.
    """

    left: float
    right: float
    low: float
    high: float
    variants: Sequence[str]
    colour: str = INK
    up: bool = True
    aside: bool = False
    math: bool = False
    name: bool = True


class Labels(Artist):
    """Labels of levels in an axes; `texts` holds what the last drawing showed.

    Parameters
    ----------
    ax : Axes
    labels : sequence of Label
        In the order in which they choose their places.
    levels : shape (n, 3)
        Left, right and height of what no label may cover, in data coordinates.
    lines : shape (m, 4)
        Lines that labels had better not cross, x and y of both ends.
    """

    def __init__(
        self, ax: Axes, labels: Sequence[Label], levels: FloatArray, lines: FloatArray
    ) -> None:
        super().__init__()
        self.labels = tuple(labels)
        self.levels = np.asarray(levels, dtype=np.float64).reshape(-1, 3)
        self.lines = np.asarray(lines, dtype=np.float64).reshape(-1, 4)
        self.texts: list[Text] = []
        self.left_out = 0
        self.set_in_layout(False)
        self.set_zorder(5.0)
        ax.add_artist(self)

    def draw(self, renderer: Any, *args: Any, **kwargs: Any) -> None:
        """Find the places at this size and draw."""
        styled(self._draw)(renderer)

    def _draw(self, renderer: Any) -> None:
        if not self.get_visible():
            return
        ax = self.axes
        assert isinstance(ax, Axes)
        figure = ax.get_figure(root=True)
        assert figure is not None
        point = figure.dpi / 72.0
        self.texts = []
        places = self._places(ax, renderer, point, corner=0.0)
        self.left_out = _lost(self.labels, places)
        if self.left_out:
            places = self._places(ax, renderer, point, corner=1.4 * TEXT_PT * point)
            self.left_out = _lost(self.labels, places)
        for label, place in zip(self.labels, places, strict=True):
            if place is not None:
                self._draw_one(renderer, label, place, point)
        if self.left_out:
            states = "state" if self.left_out == 1 else "states"
            said = f"no room for the names of {self.left_out} {states}"
            note = self._text(said, Label(0.0, 0.0, 0.0, 0.0, [said], PALE))
            box = ax.bbox
            note.set(x=box.x1, y=box.y0 + 0.2 * TEXT_PT * point, ha="right", va="bottom")
            note.draw(renderer)
            self.texts.append(note)

    def _places(self, ax: Axes, renderer: Any, point: float, corner: float) -> list[Place | None]:
        to_pixels = ax.transData.transform
        requests = []
        for label in self.labels:
            corners = [(label.left, label.low), (label.right, label.high)]
            (left, low), (right, high) = to_pixels(corners)
            middle, reach = (0.5 * (left + right), 0.5 * (low + high)), 0.5 * (right - left)
            sizes = []
            for variant in label.variants:
                box = self._text(variant, label).get_window_extent(renderer)
                sizes.append((box.width, box.height))
            requests.append(
                Request(*middle, sizes, reach, 0.5 * (high - low), label.up, label.aside)
            )
        starts = to_pixels(self.levels[:, (0, 2)])
        stops = to_pixels(self.levels[:, (1, 2)])
        thick = 1.2 * point
        boxes = np.column_stack(
            [starts[:, 0], starts[:, 1] - thick, stops[:, 0], stops[:, 1] + thick]
        )
        ends = [to_pixels(self.lines[:, :2]), to_pixels(self.lines[:, 2:])]
        area = ax.bbox
        bounds = (area.x0, area.y0 + corner, area.x1, area.y1)
        return placed(requests, boxes=boxes, lines=np.hstack(ends), bounds=bounds, gap=1.4 * point)

    def _draw_one(self, renderer: Any, label: Label, place: Place, point: float) -> None:
        text = self._text(label.variants[place.variant], label)
        text.set(x=place.x, y=place.y, ha="center", va="center")
        x, y, to_x, to_y = place.leader
        if np.hypot(to_x - x, to_y - y) > _LEADER_PT * point and not label.aside:
            line = Line2D([x, to_x], [y, to_y], color=PALE, linewidth=0.4)
            self._own(line)
            line.draw(renderer)
        text.draw(renderer)
        self.texts.append(text)

    def _text(self, text: str, label: Label) -> Text:
        made = Text(
            0.0, 0.0, text, color=label.colour, fontsize=TEXT_PT, linespacing=1.0,
            multialignment="center", parse_math=label.math,
            bbox={"facecolor": "white", "edgecolor": "none", "pad": 0.3},
        )  # fmt: skip
        self._own(made)
        return made

    def _own(self, artist: Artist) -> None:
        figure = self.get_figure()
        assert figure is not None
        artist.set_figure(figure)
        artist.set_transform(IdentityTransform())


def _lost(labels: Sequence[Label], places: Sequence[Place | None]) -> int:
    return sum(label.name and place is None for label, place in zip(labels, places, strict=True))
