"""``[conditions]``: temperatures, what is held and fed, and what the gas is like as a whole."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from typing import Any

from msgspec import UnsetType

from thermo_pp import conditions as made
from thermo_pp.amounts import Surroundings, check_total
from thermo_pp.conditions import Conditions
from thermo_pp.errors import StudyError
from thermo_pp.mechanism import Step
from thermo_pp.names import Phase
from thermo_pp.nearest import suggestion
from thermo_pp.study.check import place
from thermo_pp.study.keys import ConditionsKeys
from thermo_pp.study.values import above_zero, given


def make_conditions(
    keys: ConditionsKeys,
    steps: Sequence[Step],
    phase: Phase,
    temperatures: Iterable[Any] | None,
    file: str,
) -> Conditions:
    """Turn ``[conditions]`` into Conditions; `temperatures` stand in place of the file's."""
    kelvin = make_temperatures(keys, temperatures, file)
    known = list(dict.fromkeys(name for step in steps for name in step.species))
    around = make_surroundings(keys, phase, file)
    held = {}
    for name, value in keys.held.items():
        where = place(file, "conditions", "held", name)
        if name not in known:
            raise StudyError(
                f"unknown species {name!r}", where=where, mend=suggestion(name, known, "species")
            )
        held[name] = around.amount(value, where=where)
        if phase == "solution" and held[name].form == "pressure":
            raise StudyError(
                f"{value!r} is a partial pressure, and the phase is a solution",
                where=where,
                mend='write a concentration, for instance "0.5 mol/L"',
            )
    initial, total = (
        _amounts(getattr(keys, key), known, held, around, phase, place(file, "conditions", key))
        for key in ("initial", "total")
    )
    flow = None
    if not isinstance(keys.flow, UnsetType):
        where = place(file, "conditions", "flow")
        residence = above_zero(keys.flow.residence_time, "s", f"{where}.residence_time")
        feed = _amounts(keys.flow.feed, known, held, around, phase, f"{where}.feed")
        flow = made.Flow(residence, feed)
    for name in keys.quasi_steady:
        where = place(file, "conditions", "quasi_steady")
        if name not in known or name in held:
            what = f"{name!r} is held" if name in held else f"unknown species {name!r}"
            raise StudyError(what, where=where, mend=suggestion(name, known, "species"))
    resting = tuple(dict.fromkeys(keys.quasi_steady))
    where = place(file, "conditions")
    whole = around.total(f"{where} total_pressure")
    check_total(held, whole, kelvin, f"{where} held")
    return Conditions(
        kelvin,
        held,
        keys.driven,
        initial,
        total,
        flow,
        resting,
        constant=around.constant,
        total_gas=whole,
    )


def _amounts(
    given: Mapping[str, str],
    known: Sequence[str],
    held: Mapping[str, made.Held],
    around: Surroundings,
    phase: Phase,
    where: str,
) -> dict[str, made.Held]:
    """Turn a table of amounts that are not held into concentrations and pressures."""
    found = {}
    for name, value in given.items():
        here = f"{where}.{name}"
        if name not in known:
            mend = suggestion(name, known, "species")
            raise StudyError(f"unknown species {name!r}", where=here, mend=mend)
        if name in held:
            raise StudyError(
                f"{name!r} is held too", where=here, mend="name it here or under held, not in both"
            )
        amount = around.stated(value, where=here)
        only = phase == "solution" or where.endswith("total")
        if amount.form in ("equilibrium", "potential") or (only and amount.form == "pressure"):
            raise StudyError(
                f"{value!r} is not a concentration",
                where=here,
                mend='write for instance "0.1 mol/L"',
            )
        found[name] = amount
    return found


def make_temperatures(
    keys: ConditionsKeys, temperatures: Iterable[Any] | None, file: str
) -> tuple[float, ...]:
    """Return the temperatures, K; `temperatures` stand in place of the file's."""
    where = place(file, "conditions", "temperatures")
    wanted = keys.temperatures
    if temperatures is not None:
        return made.temperatures(temperatures, where="options temperatures")
    if isinstance(wanted, UnsetType):
        raise StudyError(
            "the key 'temperatures' is missing",
            where=place(file, "conditions"),
            mend='write temperatures = { from = "280 K", to = "360 K", step = "5 K" }, or a list',
        )
    if isinstance(wanted, list):
        return made.temperatures(wanted, where=where)
    return made.temperature_range(wanted.from_, wanted.to, wanted.step, where=where)


def make_surroundings(keys: ConditionsKeys, phase: Phase, file: str) -> Surroundings:
    """Turn what the gas is like as a whole into Surroundings."""
    for key in ("total_pressure", "constant", "stated_at"):
        if phase == "solution" and given(getattr(keys, key)) is not None:
            raise StudyError(
                f"{key} has no meaning in a solution",
                where=place(file, "conditions", key),
                mend="take the key out; amounts in solution are concentrations",
            )
    constant, pressure, stated = (
        given(keys.constant),
        given(keys.total_pressure),
        given(keys.stated_at),
    )
    if stated is not None and constant is None:
        raise StudyError(
            "stated_at says when amounts hold, but not what stays constant",
            where=place(file, "conditions", "stated_at"),
            mend='write constant = "concentration" or constant = "pressure" as well',
        )
    return Surroundings(
        None
        if pressure is None
        else above_zero(pressure, "Pa", place(file, "conditions", "total_pressure")),
        constant,
        None
        if stated is None
        else made.temperature(stated, where=place(file, "conditions", "stated_at")),
    )
