"""Units of rate constants: the overall order that a unit means, and its factor to L, mol and s."""

from __future__ import annotations

import re
from dataclasses import dataclass

from thermo_pp.errors import StudyError
from thermo_pp.units import convert

_BY_ORDER = ("1/s", "L/mol/s", "L^2/mol^2/s", "L^3/mol^3/s")
_BARE_POWER = re.compile(r"(?<=[A-Za-z])(-?\d+)")


@dataclass(frozen=True)
class RateUnit:
    """A unit of rate constants.

    Attributes
    ----------
    text : str
        As the heading has it.
    order : int
        Overall order m of a rate constant in it.
    factor : float
        What 1 of it is in (mol/L)^(1-m) s^-1.
    """

    text: str
    order: int
    factor: float


def rate_unit(text: str, *, where: str) -> RateUnit:
    """Return what a unit of rate constants means: ``"s^-1"``, ``"cm3/s"``, ``"L^2 mol^-2 s^-1"``.

    Raises
    ------
    StudyError
        No unit of a rate constant of the first to the fourth order.
    """
    spelled = _BARE_POWER.sub(r"^\1", text)
    for order, unit in enumerate(_BY_ORDER, start=1):
        try:
            factor = convert(1.0, spelled, unit, where=where)
        except StudyError:
            continue
        return RateUnit(text, order, factor)
    raise StudyError(
        f"{text!r} is no unit of a rate constant",
        where=where,
        mend='write for instance "s^-1", "cm^3 molecule^-1 s^-1", "cm^6 s^-1" or "L^2 mol^-2 s^-1"; rate '
        "constants by pressure are not taken",
    )
