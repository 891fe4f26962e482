"""A square matrix printed in blocks of columns: their numbers above each block, that of the row before each line."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

_MOST_COLUMNS = 12


def printed_matrix(data: bytes, at: int, size: int, first: int) -> NDArray[np.float64] | None:
    """Return the matrix whose first line of column numbers is the first one with words from the offset `at` on.

    Parameters
    ----------
    data : bytes
    at : int
    size : int
        Numbers of rows and of columns.
    first : int
        Number of the first row and column.

    Returns
    -------
    shape (size, size), or None
        None where a number of a row or column is not the expected one, or an element is missing or no finite number.
    """
    matrix = np.empty((size, size))
    done = 0
    while done < size:
        at, words = _line(data, at)
        width = len(words)
        wanted = [b"%d" % number for number in range(first + done, first + done + width)]
        if not 0 < width <= min(_MOST_COLUMNS, size - done) or words != wanted:
            return None
        for row in range(size):
            at, words = _line(data, at)
            if len(words) != width + 1 or words[0] != b"%d" % (first + row):
                return None
            try:
                matrix[row, done : done + width] = [float(word) for word in words[1:]]
            except ValueError:
                return None
        done += width
    return matrix if bool(np.isfinite(matrix).all()) else None


def _line(data: bytes, at: int) -> tuple[int, list[bytes]]:
    """Return the words of the next line that has any, and where the one after it begins; none at the end."""
    while at < len(data):
        stop = data.find(b"\n", at)
        stop = len(data) if stop < 0 else stop
        words = data[at:stop].split()
        at = stop + 1
        if words:
            return at, words
    return at, []
