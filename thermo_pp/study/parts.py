"""Parts of a study that need no output: its treatment, conditions, steps and question."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from itertools import pairwise
from pathlib import Path
from typing import Any, TypedDict

from msgspec import UNSET, UnsetType

from thermo_pp import conditions as made
from thermo_pp.amounts import Surroundings, check_total
from thermo_pp.conditions import Conditions, Treatment
from thermo_pp.errors import StudyError
from thermo_pp.mechanism import RatePoint, Step, parse_equation
from thermo_pp.names import DEFAULT_TEMPERATURE_K, Phase, Tunnelling
from thermo_pp.nearest import suggestion
from thermo_pp.rate_laws import Arrhenius
from thermo_pp.study.check import place
from thermo_pp.study.crossings import make_crossing
from thermo_pp.study.keys import (
    ConditionsKeys,
    Quantity,
    RealBelowKeys,
    StepKeys,
    StudyKeys,
    TreatmentKeys,
)
from thermo_pp.study.points import make_point
from thermo_pp.study.rate_laws import (
    make_arrhenius,
    make_falloff,
    make_height,
    rate_unit,
)
from thermo_pp.units import quantity


class Question(TypedDict):
    """What is asked of the mechanism: the fields of a Mechanism of these names."""

    reactant: str | None
    products: tuple[str, ...]
    catalyst: str | None
    paths: tuple[tuple[int, ...], ...]
    path_names: tuple[str, ...]
    point: RatePoint | None


def make_treatment(keys: TreatmentKeys, file: str) -> Treatment:
    """Turn ``[treatment]`` into a Treatment."""
    scale = keys.frequency_scale
    zero_point_scale = keys.zero_point_scale
    tunnelling_scale = keys.tunnelling_scale
    return Treatment(
        standard_state=made.standard_state(
            keys.standard_state, where=place(file, "treatment", "standard_state")
        ),
        phase=keys.phase,
        low_modes=keys.low_modes,
        onset_cm=above_zero(keys.onset, "1/cm", place(file, "treatment", "onset")),
        rotor=keys.rotor,
        masses=keys.masses,
        real_below_cm=real_below(keys.imaginary, place(file, "treatment", "imaginary.real_below")),
        frequency_scale=scale,
        zero_point_scale=scale if isinstance(zero_point_scale, UnsetType) else zero_point_scale,
        tunnelling_scale=scale if isinstance(tunnelling_scale, UnsetType) else tunnelling_scale,
        enantiopure=keys.enantiopure,
        entropy_correction_j_mol_k=entropy_correction(
            keys.entropy_correction, keys.phase, place(file, "treatment", "entropy_correction")
        ),
    )


def entropy_correction(value: Quantity | UnsetType, phase: Phase, where: str) -> float:
    """Turn a declared entropy correction into J/(mol K), 0 where none is declared."""
    if isinstance(value, UnsetType):
        return 0.0
    if phase != "solution":
        raise StudyError(
            "an entropy correction in the gas phase",
            where=where,
            mend='take it out, or write phase = "solution" under [treatment]',
        )
    return quantity(value, "J/mol/K", where=where)


def real_below(value: str | RealBelowKeys, where: str) -> float | None:
    """Turn the word on imaginary modes into cm^-1, None where all are refused."""
    return above_zero(value.real_below, "1/cm", where) if isinstance(value, RealBelowKeys) else None


def above_zero(value: Any, unit: str, where: str) -> float:
    """Turn a value into a number above 0 in `unit`."""
    number = quantity(value, unit, where=where)
    if number <= 0.0:
        raise StudyError(f"{value!r} is not above 0", where=where, mend="write a value above 0")
    return number


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


def make_steps(
    keys: Sequence[StepKeys], treatment: TreatmentKeys, file: str, outputs: str = "."
) -> tuple[Step, ...]:
    """Turn ``[[steps]]`` into Steps; phase and tunnelling are those of ``[treatment]``."""
    folder = Path(file).parent / outputs
    return tuple(_step(step, number, treatment, file, folder) for number, step in enumerate(keys))


def _step(keys: StepKeys, number: int, treatment: TreatmentKeys, file: str, outputs: Path) -> Step:
    where = place(file, "steps", number)
    reactants, products = parse_equation(
        keys.equation, where=place(file, "steps", number, "equation")
    )
    said = [
        name
        for name in ("through", "barrier", "rate", "arrhenius", "falloff")
        if not isinstance(getattr(keys, name), UnsetType)
    ]
    if len(said) != 1:
        has = f"has {' and '.join(said)}" if said else "says nothing of its rate"
        raise StudyError(
            f"the step {keys.equation!r} {has}",
            where=where,
            mend='give exactly one of through = "TS", barrier = "none", rate = "...", '
            'arrhenius = { A = "...", E = "..." } and falloff = { ... }',
        )
    barrier = given(keys.barrier)
    height = None
    if barrier is not None and barrier != "none":
        height = make_height(barrier, keys, where, Path(file).parent, outputs)
    elif given(keys.deviation) is not None:
        raise StudyError(
            "a deviation without the height that it is of",
            where=f"{where} deviation",
            mend='write barrier = "35 kJ/mol" beside it, or take it out',
        )
    molecules = sum(reactants.values())
    step = Step(
        keys.equation,
        reactants,
        products,
        through=keys.through if isinstance(keys.through, str) else None,
        barrierless=barrier == "none",
        rate=_rate(keys, molecules, where),
        height=height,
        falloff=None
        if isinstance(keys.falloff, UnsetType)
        else make_falloff(keys.falloff, molecules, where),
        viscosity=_viscosity(keys.viscosity, place(file, "steps", number, "viscosity")),
        crossing=make_crossing(keys, where),
        permittivity=_permittivity(keys.permittivity, f"{where} permittivity"),
        tunnelling=_tunnelling(keys, treatment.tunnelling, where),
        where=where,
    )
    _check_viscosity(step, treatment.phase)
    _check_broadened(step, treatment.phase)
    return step


def _tunnelling(keys: StepKeys, usual: Tunnelling, where: str) -> Tunnelling:
    """Return the step's own word on tunnelling, else that of ``[treatment]``; a saddle point tunnels."""
    has_saddle = not isinstance(keys.through, UnsetType)
    if isinstance(keys.tunnelling, UnsetType):
        return usual if has_saddle and isinstance(keys.kind, UnsetType) else "none"
    if keys.tunnelling != "none" and not has_saddle:
        raise StudyError(
            f"the step {keys.equation!r} has no saddle point, so nothing tunnels",
            where=f"{where} tunnelling",
            mend='name the saddle point (through = "TS"), or take the key out',
        )
    return keys.tunnelling


def _rate(keys: StepKeys, molecules: int, where: str) -> Arrhenius | None:
    """Return A, n and E of a declared rate constant, None where the step has none."""
    if not isinstance(keys.rate, UnsetType):
        return above_zero(keys.rate, rate_unit(molecules), f"{where} rate"), 0.0, 0.0
    if isinstance(keys.arrhenius, UnsetType):
        return None
    return make_arrhenius(keys.arrhenius, molecules, f"{where} arrhenius")


def _viscosity(
    value: Quantity | list[tuple[Quantity, Quantity]] | UnsetType, where: str
) -> tuple[tuple[float, float], ...] | None:
    """Return pairs of temperature / K and viscosity / Pa s; one pair where it is constant."""
    if isinstance(value, UnsetType):
        return None
    if not isinstance(value, list):
        return ((DEFAULT_TEMPERATURE_K, above_zero(value, "Pa*s", where)),)
    pairs = tuple(
        (made.temperature(kelvin, where=where), above_zero(eta, "Pa*s", where))
        for kelvin, eta in value
    )
    _check_rising(pairs, "viscosity", where)
    return pairs


def _permittivity(
    value: float | list[tuple[Quantity, float]] | UnsetType, where: str
) -> tuple[tuple[float, float], ...] | None:
    """Return pairs of temperature / K and relative permittivity; one pair where it is constant."""
    if isinstance(value, UnsetType):
        return None
    if not isinstance(value, list):
        return ((DEFAULT_TEMPERATURE_K, value),)
    pairs = tuple((made.temperature(kelvin, where=where), number) for kelvin, number in value)
    _check_rising(pairs, "permittivity", where)
    return pairs


def _check_rising(pairs: Sequence[tuple[float, float]], what: str, where: str) -> None:
    if any(later[0] <= sooner[0] for sooner, later in pairwise(pairs)):
        raise StudyError(
            f"the temperatures of the {what} do not rise",
            where=where,
            mend="list the pairs by temperature, each temperature once",
        )


def _check_broadened(step: Step, phase: Phase) -> None:
    """Refuse a permittivity without a diffusion limit, and a fall-off in solution."""
    if step.permittivity is not None and step.viscosity is None:
        raise StudyError(
            "a permittivity has no use here: the step has no diffusion limit",
            where=f"{step.where} permittivity",
            mend="give the step its viscosity too, or take the permittivity out",
        )
    if step.falloff is not None and phase == "solution":
        raise StudyError(
            "a fall-off in solution",
            where=f"{step.where} falloff",
            mend="declare the rate constant itself: arrhenius or rate",
        )


def _check_viscosity(step: Step, phase: Phase) -> None:
    """Refuse a viscosity that would be left unused, and a diffusion limit without one."""
    where = f"{step.where} viscosity"
    if step.viscosity is None:
        if step.barrierless and phase == "solution":
            raise StudyError(
                f"the step {step.equation!r} has no viscosity",
                where=where,
                mend='the diffusion limit needs one: viscosity = "0.89 mPa s", '
                "or pairs over temperature",
            )
        return
    unused = ""
    if phase == "gas":
        unused = "the phase is a gas"
    elif step.is_declared:
        unused = "the step has a declared rate constant"
    elif max(step.molecules) < 2:
        unused = "no two molecules meet in the step"
    if unused:
        raise StudyError(
            f"a viscosity has no use here: {unused}", where=where, mend="take the viscosity out"
        )


def make_question(keys: StudyKeys, steps: Sequence[Step], file: str) -> Question:
    """Turn ``[effective]`` and ``[[paths]]`` into what is asked of the mechanism."""
    question = Question(
        reactant=None, products=(), catalyst=None, paths=(), path_names=(), point=None
    )
    effective = keys.effective
    known = list(dict.fromkeys(name for step in steps for name in step.species))
    if not isinstance(effective, UnsetType):
        given = [
            name
            for name in ("reactant", "catalyst")
            if not isinstance(getattr(effective, name), UnsetType)
        ]
        if len(given) != 1:
            raise StudyError(
                "both a reactant and a catalyst" if given else "neither a reactant nor a catalyst",
                where=place(file, "effective"),
                mend="give exactly one of reactant and catalyst",
            )
        start = _known(getattr(effective, given[0]), known, place(file, "effective", given[0]))
        products = [effective.product] if isinstance(effective.product, str) else effective.product
        where = place(file, "effective", "product")
        for name in products:
            _known(name, known, where)
            if name == start or products.count(name) > 1:
                twice = f"is the {given[0]} too" if name == start else "is listed twice"
                raise StudyError(
                    f"the product {name!r} {twice}", where=where, mend="name what is made, once"
                )
        question["reactant"] = start if given[0] == "reactant" else None
        question["catalyst"] = start if given[0] == "catalyst" else None
        question["products"] = tuple(products)
        question["point"] = make_point(effective, known, file)
    for number, path in enumerate(keys.paths):
        where = place(file, "paths", number, "steps")
        for entry in path.steps:
            if not 1 <= abs(entry) <= len(steps):
                raise StudyError(
                    f"there is no step {entry}",
                    where=where,
                    mend=f"steps count from 1 to {len(steps)}; a negative number runs one backward",
                )
        if path.name in question["path_names"]:
            raise StudyError(
                f"two paths are called {path.name!r}",
                where=place(file, "paths", number, "name"),
                mend="give each path a name of its own",
            )
        question["path_names"] += (path.name,)
        # 0-based; the complement of a number stands for the step run backward
        question["paths"] += (tuple(n - 1 if n > 0 else n for n in path.steps),)
    return question


def _known(name: str, known: Sequence[str], where: str) -> str:
    if name not in known:
        raise StudyError(
            f"{name!r} is not made or used by any step",
            where=where,
            mend=suggestion(name, known, "species"),
        )
    return name


def given(value: Any) -> Any:
    """Return the value of a key, None where the file does not have it."""
    return None if value is UNSET else value
