"""The questions of ``[regimes]`` and ``[selectivity]``, from the file or from options."""

from __future__ import annotations

from typing import TYPE_CHECKING

from msgspec import UnsetType

from thermo_pp.conditions import Conditions, held
from thermo_pp.errors import StudyError
from thermo_pp.mechanism import Mechanism
from thermo_pp.nearest import suggestion
from thermo_pp.study.check import place
from thermo_pp.study.keys import Quantity, StudyKeys

if TYPE_CHECKING:
    from thermo_pp.kinetics.product_ratio import SelectivityQuestion
    from thermo_pp.kinetics.regime_map import RegimeQuestion


def make_regimes(keys: StudyKeys, conditions: Conditions, file: str) -> RegimeQuestion | None:
    """Turn ``[regimes]`` into what is asked, None where the file has no such table."""
    asked = keys.regimes
    if isinstance(asked, UnsetType):
        return None
    where = place(file, "regimes")
    return regime_question(conditions, asked.over, asked.from_, asked.to, asked.points, where)


def regime_question(
    conditions: Conditions, over: str, low: Quantity, high: Quantity, points: int, where: str
) -> RegimeQuestion:
    """Return the question for a map over one held amount.

    Parameters
    ----------
    conditions : Conditions
    over : str
        A species held at a stated amount.
    low, high : str or float
        A concentration or a pressure; a number is in mol/L, of a species held at a pressure in Pa.
    points : int
    where : str
        Who asks, for messages.

    Raises
    ------
    StudyError
        The species is not held at a stated amount, or an end is no amount above 0 of the same form.
    """
    from thermo_pp.kinetics.regime_map import RegimeQuestion

    at = conditions.held.get(over)
    stated = [name for name, one in conditions.held.items() if one.form in _UNITS]
    if at is None or at.form not in _UNITS:
        raise StudyError(
            f"{over!r} is not held at a concentration or pressure",
            where=f"{where} over",
            mend=suggestion(over, stated, "held species"),
        )
    ends = []
    for name, value in (("from", low), ("to", high)):
        text = value if isinstance(value, str) else f"{value!r} {_UNITS[at.form]}"
        end = held(text, where=f"{where} {name}")
        if end.form != at.form or not isinstance(end.value, float):
            raise StudyError(
                f"{text!r} is no {at.form}, and {over} is held at {at.text!r}",
                where=f"{where} {name}",
                mend="write the range as the species is held, or hold it so: E_a differs",
            )
        ends.append(end.value)
    form = "pressure" if at.form == "pressure" else "concentration"
    return RegimeQuestion(over, form, ends[0], ends[1], points, where)  # type: ignore[arg-type]


_UNITS = {"concentration": "mol/L", "pressure": "Pa"}


def make_selectivity(
    keys: StudyKeys, mechanism: Mechanism, file: str
) -> SelectivityQuestion | None:
    """Turn ``[selectivity]`` into what is asked, None where the file has no such table."""
    from thermo_pp.kinetics.product_ratio import SelectivityQuestion

    asked = keys.selectivity
    if isinstance(asked, UnsetType):
        return None
    where = place(file, "selectivity", "products")
    for name in asked.products:
        if name not in mechanism.products or asked.products.count(name) > 1:
            what = "is listed twice" if name in mechanism.products else "is no product"
            raise StudyError(
                f"{name!r} {what}",
                where=where,
                mend=suggestion(name, mechanism.products, "products of [effective]"),
            )
    return SelectivityQuestion(tuple(asked.products), asked.kind, where)
