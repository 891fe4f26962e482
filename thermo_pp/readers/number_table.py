"""Many numbers at once: the text of a table to an array, where it holds nothing but numbers."""

from __future__ import annotations

import warnings

import numpy as np
from numpy.typing import NDArray


def number_table(data: bytes, count: int) -> NDArray[np.float64] | None:
    """Return the `count` numbers of a text, separated by blanks and line ends.

    None where there is anything else in it, another count, or a number that is not finite. This
    takes about half as long as making a list of floats of its words.
    """
    with warnings.catch_warnings():
        warnings.simplefilter("error")  # for what is no number
        try:
            found = np.fromstring(data.decode("ascii"), dtype=np.float64, sep=" ")
        except (DeprecationWarning, ValueError):
            return None
    return found if len(found) == count and bool(np.isfinite(found).all()) else None
