"""Placement: where labels go so that none covers another, a level or the edge. Always the same answer."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
_CROSSING, _OTHER_SIDE = 20.0, 5.0
"""What a label on a line and one on the side not preferred cost, in gaps of distance."""
_STEPS = 14


@dataclass(frozen=True)
class Request:
    """One label that wants a place; all lengths in one unit, points or pixels.

    Attributes
    ----------
    x, y : float
        Middle of what it labels.
    sizes : sequence of (float, float)
        Width and height of each variant of its text, the fullest first.
    reach, rise : float
        Half the width and half the height of what it labels.
    up : bool
        Whether above is preferred.
    aside : bool
        Right and left instead of above and below.
    """

    x: float
    y: float
    sizes: Sequence[tuple[float, float]]
    reach: float = 0.0
    rise: float = 0.0
    up: bool = True
    aside: bool = False


@dataclass(frozen=True)
class Place:
    """Where a label went: which variant, the middle of its box, and the line from what it labels to it."""

    variant: int
    x: float
    y: float
    leader: tuple[float, float, float, float]


def placed(
    requests: Sequence[Request],
    *,
    boxes: FloatArray,
    lines: FloatArray,
    bounds: tuple[float, float, float, float],
    gap: float,
) -> list[Place | None]:
    """Return a place for each label in the order of the requests, None where there is none.

    Parameters
    ----------
    requests : sequence of Request
        The first gets the best place.
    boxes : shape (b, 4)
        What no label may touch: left, bottom, right, top.
    lines : shape (l, 4)
        What a label had better not cross: x and y of both ends.
    bounds : left, bottom, right, top
    gap : float
        Between a label and anything else.
    """
    taken = np.asarray(boxes, dtype=np.float64).reshape(-1, 4)
    known = len(taken)
    lines = np.asarray(lines, dtype=np.float64).reshape(-1, 4)
    answer: list[Place | None] = []
    for request in requests:
        found = None
        for variant, (width, height) in enumerate(request.sizes):
            middle = _candidates(request, width, height, gap)
            half = np.array([0.5 * width, 0.5 * height])
            ways = np.concatenate([middle - half, middle + half], axis=1)
            leaders = _leaders(request, ways)
            free = _inside(ways, bounds) & ~_touching(ways, taken, gap).any(axis=1)
            free &= ~_crossing(taken[known:], leaders).any(axis=0)  # no other label between
            if not free.any():
                continue
            away = np.abs(middle - [request.x, request.y])
            far = 0.7 * away[:, 0] + np.maximum(away[:, 1] - 0.5 * height - request.rise, 0.0)
            crossing = _CROSSING if not request.aside else 0.2 * _CROSSING
            cost = far + gap * (
                crossing * _crossing(ways, lines).sum(axis=1)
                + (
                    0.0
                    if request.aside
                    else _OTHER_SIDE * ((middle[:, 1] > request.y) != request.up)
                )
            )
            best = int(np.argmin(np.where(free, cost, np.inf)))
            x, y = map(float, middle[best])
            found = Place(variant, x, y, _four(leaders[best]))
            taken = np.concatenate([taken, ways[best : best + 1]])
            lines = np.concatenate([lines, leaders[best : best + 1]])
            break
        answer.append(found)
    return answer


def _candidates(request: Request, width: float, height: float, gap: float) -> FloatArray:
    """Return the middles of the boxes to try, shape (w, 2); the first is best where the cost is equal."""
    if request.aside:
        across = gap + 0.5 * width + 0.3 * width * np.arange(4)
        tried = [(s * x, y) for x in across for y in (0.0, height, -height) for s in (1.0, -1.0)]
    else:
        rows = request.rise + gap + 0.5 * height + 0.45 * min(height, 8.0 * gap) * np.arange(_STEPS)
        columns = np.array([0.0, 0.25, -0.25, 0.5, -0.5, 0.8, -0.8, 1.2, -1.2]) * width
        tried = [(x, s * y) for s in (1.0, -1.0) for y in rows for x in columns]
    return np.add(tried, (request.x, request.y))


def _leaders(request: Request, ways: FloatArray) -> FloatArray:
    """Return the shortest lines from what is labelled to each box, shape (w, 4)."""
    middle = 0.5 * (ways[:, 0] + ways[:, 2])
    x = np.clip(middle, request.x - request.reach, request.x + request.reach)
    y = np.clip(0.5 * (ways[:, 1] + ways[:, 3]), request.y - request.rise, request.y + request.rise)
    ends = [np.clip(x, ways[:, 0], ways[:, 2]), np.clip(y, ways[:, 1], ways[:, 3])]
    return np.stack([x, y, *ends], axis=1)


def _inside(ways: FloatArray, bounds: tuple[float, float, float, float]) -> NDArray[np.bool_]:
    left, bottom, right, top = bounds
    return np.asarray(
        (ways[:, 0] >= left) & (ways[:, 1] >= bottom) & (ways[:, 2] <= right) & (ways[:, 3] <= top)
    )


def _touching(ways: FloatArray, boxes: FloatArray, gap: float) -> NDArray[np.bool_]:
    """Return whether each of `ways` comes closer than `gap` to each box, shape (w, b)."""
    a, b = ways[:, np.newaxis], boxes[np.newaxis]
    across = (a[..., 0] < b[..., 2] + gap) & (a[..., 2] > b[..., 0] - gap)
    up = (a[..., 1] < b[..., 3] + 0.5 * gap) & (a[..., 3] > b[..., 1] - 0.5 * gap)
    return np.asarray(across & up)


def _crossing(ways: FloatArray, lines: FloatArray) -> NDArray[np.bool_]:
    """Return whether each box is met by each line, shape (w, l); by clipping the line to the box."""
    start, run = lines[np.newaxis, :, :2], lines[np.newaxis, :, 2:] - lines[np.newaxis, :, :2]
    low, high = ways[:, np.newaxis, :2] - start, ways[:, np.newaxis, 2:] - start
    with np.errstate(divide="ignore", invalid="ignore"):
        one, two = low / run, high / run
    first, last = np.fmin(one, two), np.fmax(one, two)
    still = run == 0.0
    beside = still & ((low > 0.0) | (high < 0.0))
    first = np.where(still, np.where(beside, np.inf, -np.inf), first)
    last = np.where(still, np.where(beside, -np.inf, np.inf), last)
    enter, leave = first.max(axis=2), last.min(axis=2)
    return np.asarray((enter <= leave) & (leave >= 0.0) & (enter <= 1.0))


def _four(row: FloatArray) -> tuple[float, float, float, float]:
    a, b, c, d = map(float, row)
    return a, b, c, d
