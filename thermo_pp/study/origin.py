"""What a study is made of."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from thermo_pp.records import Calculation


@dataclass(frozen=True, eq=False)
class Origin:
    """What a study is made of: the file's tables with the options, and the outputs read so far.

    With `lowest_only`, of several conformers the lowest counts alone.
    """

    data: Mapping[str, Any]
    file: str
    temperatures: tuple[Any, ...] | None
    read: dict[str, Calculation]
    lowest_only: bool = False


def is_read(keys: Mapping[str, Any]) -> bool:
    """Tell whether the table of a species that was checked names outputs."""
    listed = keys.get("conformers", [])
    return (
        "frequencies" in keys
        or isinstance(listed, Mapping)
        or any("composition" not in one for one in listed)
    )


def with_keys(table: Mapping[str, Any], keys: Mapping[str, Any]) -> dict[str, Any]:
    """Return a table with other keys; None takes one out."""
    return {key: value for key, value in {**table, **keys}.items() if value is not None}
