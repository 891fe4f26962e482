"""Values of keys: whether they are there, and what they are in a unit."""

from __future__ import annotations

from typing import Any

from msgspec import UNSET

from thermo_pp.errors import StudyError
from thermo_pp.units import quantity


def given(value: Any) -> Any:
    """Return the value of a key, None where the file does not have it."""
    return None if value is UNSET else value


def above_zero(value: Any, unit: str, where: str) -> float:
    """Turn a value into a number above 0 in `unit`."""
    number = quantity(value, unit, where=where)
    if number <= 0.0:
        raise StudyError(f"{value!r} is not above 0", where=where, mend="write a value above 0")
    return number
