"""Where the rate of a network that is not linear is asked for: ``[effective] at`` and ``rate_law``."""

from __future__ import annotations

import re
from collections.abc import Sequence

from msgspec import UnsetType

from thermo_pp.errors import StudyError
from thermo_pp.mechanism import RatePoint
from thermo_pp.nearest import suggestion
from thermo_pp.study.check import place
from thermo_pp.study.keys.questions import EffectiveKeys

_PERCENT = re.compile(r"\s*(\d+(?:\.\d*)?|\.\d+)\s*%\s*")
START, STEADY = "start", "steady state"


def make_point(effective: EffectiveKeys, known: Sequence[str], file: str) -> RatePoint | None:
    """Return the point, None where the study names none.

    Raises
    ------
    StudyError
        No such point, a conversion that is none, a catalyst, a law of unknown species or without a
        point.
    """
    where = place(file, "effective", "at")
    law_at = place(file, "effective", "rate_law")
    if isinstance(effective.at, UnsetType):
        if effective.rate_law:
            raise StudyError(
                "a rate law has no use without a point at which the rate is asked for",
                where=law_at,
                mend='add at = "start", a conversion as "10 %", or "steady state"',
            )
        return None
    if not isinstance(effective.catalyst, UnsetType):
        raise StudyError(
            "the turnover of a catalyst is that at its steady state",
            where=where,
            mend="take at out, or name a reactant in place of the catalyst",
        )
    for name in effective.rate_law:
        if name not in known:
            raise StudyError(
                f"{name!r} is not made or used by any step",
                where=law_at,
                mend=suggestion(name, known, "species"),
            )
    text = effective.at.strip()
    percent = _PERCENT.fullmatch(text)
    conversion: float | None
    if percent is not None:
        conversion = float(percent.group(1)) / 100.0
        if not 0.0 < conversion < 1.0:
            raise StudyError(
                f"a conversion of {text} is not between 0 and 100 %",
                where=where,
                mend='write for instance "10 %"; the start is at = "start"',
            )
    elif text in (START, STEADY):
        conversion = 0.0 if text == START else None
    else:
        raise StudyError(
            f"{text!r} is no point of a time course or flow",
            where=where,
            mend='write "start", a conversion of the reactant as "10 %", or "steady state"',
        )
    return RatePoint(text, conversion, dict(effective.rate_law))
