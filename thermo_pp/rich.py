"""Rich display: how the frame of a result looks in a notebook."""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import pandas as pd

MOST_ROWS = 60
"""Of longer frames the first and last rows are shown, and their size."""

NO_MATHEMATICS = ["tex2jax_ignore", "mathjax_ignore"]
"""Classes by which notebooks leave a text with dollar signs as it is."""


def shown(frame: pd.DataFrame) -> str:
    """Return a frame as an HTML table; names are escaped and never taken as mathematics."""
    sized = len(frame) > MOST_ROWS
    return frame.to_html(
        index=False, max_rows=MOST_ROWS, show_dimensions=sized, classes=NO_MATHEMATICS
    )
