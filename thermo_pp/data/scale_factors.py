"""Published frequency scale factors whose source was seen; there are few, and none is used unasked."""

from __future__ import annotations

from typing import NamedTuple


class ScaleFactor(NamedTuple):
    """One published factor: of which wavenumbers, its standard uncertainty, and its source."""

    use: str
    value: float
    uncertainty: float
    source: str


PUBLISHED: dict[tuple[str, str], ScaleFactor] = {
    # read in the paper's abstract, which says that only two digits are significant
    ("hf", "6-31g(d)"): ScaleFactor(
        "fundamentals",
        0.8982,
        0.0230,
        "K. K. Irikura, R. D. Johnson III, R. N. Kacker, J. Phys. Chem. A 2005, 109, 8430",
    ),
}
"""Method and basis set in lower case -> factor."""
