"""What every table of the study file is made of: strict tables, quantities and bounds."""

from __future__ import annotations

from typing import Annotated

import msgspec
from msgspec import Meta

Quantity = str | float
"""A text of one number and its unit; a bare number is in the unit that the docs name."""


Positive = Annotated[float, Meta(gt=0.0)]
Whole = Annotated[int, Meta(ge=1)]
Correlation = Annotated[float, Meta(ge=-1.0, le=1.0)]
Pairs = Annotated[list[tuple[Quantity, Quantity]], Meta(min_length=1)]


class Keys(msgspec.Struct, frozen=True, forbid_unknown_fields=True):
    """A table of the file: unknown keys are refused."""
