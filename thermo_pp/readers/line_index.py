"""Where the lines of a text begin: found once, then the lines that begin with a mark cost no further search.

A search of a whole file for a mark that is not there reads all of it. Here the first eight bytes of every line are
compared with those of the mark at once, which reads as many numbers as there are lines.
"""

from __future__ import annotations

from bisect import bisect_left

import numpy as np
from numpy.typing import NDArray

_LINE_END = ord("\n")
_KEY = 8


class LineIndex:
    """The line ends of a text, and the beginnings of its lines.

    Attributes
    ----------
    ends : shape (l,), int
        Offsets of the line ends, ascending.
    """

    def __init__(self, data: bytes) -> None:
        self._data = data
        self.ends: NDArray[np.intp] = (np.frombuffer(data, np.uint8) == _LINE_END).nonzero()[0]
        whole = int(self.ends.searchsorted(len(data) - _KEY))  # those with a whole key behind
        keys = np.ndarray((max(len(data) - _KEY + 1, 0),), "<u8", data, 0, (1,))
        self._keys = keys[self.ends[:whole] + 1]
        self._last_ends: list[int] = self.ends[whole:].tolist()
        self._known: dict[bytes, list[int]] = {}

    def line_number(self, at: int) -> int:
        """Return the 1-based line number of a byte offset."""
        return int(self.ends.searchsorted(at)) + 1

    def places(self, mark: bytes) -> list[int]:
        """Return every offset of `mark`, in the whole text; one that begins with a line end costs no search."""
        known = self._known.get(mark)
        if known is None:
            known = self._known[mark] = self._places(mark)
        return known

    def find(self, mark: bytes, start: int, end: int) -> int:
        """Return where `mark` first stands between two offsets, -1 where it does not."""
        known = self.places(mark)
        i = bisect_left(known, start)
        return known[i] if i < len(known) and known[i] + len(mark) <= end else -1

    def last(self, mark: bytes, start: int, end: int) -> int:
        """Return where `mark` last stands between two offsets, -1 where it does not."""
        known = self.places(mark)
        i = bisect_left(known, end - len(mark) + 1)
        return known[i - 1] if i and known[i - 1] >= start else -1

    def all(self, mark: bytes, start: int, end: int) -> list[int]:
        """Return every offset of `mark` between two offsets."""
        known = self.places(mark)
        return known[bisect_left(known, start) : bisect_left(known, end - len(mark) + 1)]

    def above(self, mark: bytes, besides: bytes) -> list[int]:
        """Return the offsets of `mark` above lines that begin with none of the bytes `besides`.

        Lines in the last eight bytes of the text are left out.
        """
        lines = self._begin_with(mark)[:-1].nonzero()[0]
        below = self._keys[lines + 1].astype(np.uint8)
        for byte in besides:
            lines, below = lines[below != byte], below[below != byte]
        starts = self._data.startswith
        return [at for at in self.ends[lines].tolist() if starts(mark, at)]

    def _places(self, mark: bytes) -> list[int]:
        if mark[0] != _LINE_END:
            return _everywhere(self._data, mark)
        found: list[int] = self.ends[self._begin_with(mark).nonzero()[0]].tolist()
        found += self._last_ends
        starts = self._data.startswith
        return [at for at in found if starts(mark, at)]

    def _begin_with(self, mark: bytes) -> NDArray[np.bool_]:
        """Tell of every line but the last ones whether it begins with the first bytes of `mark`."""
        begin = mark[1 : _KEY + 1]
        key = np.uint64(int.from_bytes(begin, "little"))
        if len(begin) == _KEY:
            return np.asarray(self._keys == key)
        return np.asarray((self._keys & np.uint64((1 << 8 * len(begin)) - 1)) == key)


def _everywhere(data: bytes, mark: bytes) -> list[int]:
    found, at = [], data.rfind(mark)
    while at >= 0:
        found.append(at)
        at = data.rfind(mark, 0, at)
    return found[::-1]
