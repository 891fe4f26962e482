"""``[[steps]]``: equations, and what says how fast each is."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise
from pathlib import Path

from msgspec import UnsetType

from thermo_pp import conditions as made
from thermo_pp.errors import StudyError
from thermo_pp.mechanism import Step, parse_equation
from thermo_pp.names import DEFAULT_TEMPERATURE_K, Phase, Tunnelling
from thermo_pp.rate_laws import Arrhenius
from thermo_pp.study.check import place
from thermo_pp.study.crossings import make_crossing
from thermo_pp.study.keys import (
    Quantity,
    StepKeys,
    TreatmentKeys,
)
from thermo_pp.study.rate_laws import (
    make_arrhenius,
    make_falloff,
    make_height,
    rate_unit,
)
from thermo_pp.study.values import above_zero, given


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
