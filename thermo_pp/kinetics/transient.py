"""Time courses of a study: concentrations, rates and apparent quantities at each time.

Beside each rate stand its derivatives in one definition: **at the same conversion**, that is between
runs from the same start under slightly different energies or temperatures, compared where the free
concentration of the followed species is the same. They are exact derivatives of the numbers of the
time course (`radau`), and the sum over the saddles is 1.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import StudyError
from thermo_pp.kinetics.courses import TimeCourse, Transient
from thermo_pp.kinetics.equilibrium import balanced, equilibrium
from thermo_pp.kinetics.mass_action import TEMPERATURE, System
from thermo_pp.kinetics.quasi_steady import quasi_steady
from thermo_pp.kinetics.radau import Run, Unsolved, fastest_rate, integrate, lifetimes
from thermo_pp.kinetics.start import Start, energies_of, systems
from thermo_pp.kinetics.stationary import NoSteadyState, settle
from thermo_pp.kinetics.transient_words import IMPOSSIBLE_MOL_L, findings, words
from thermo_pp.names import CONSTANTS, Constant

if TYPE_CHECKING:
    from thermo_pp.kinetics.asked import StudyLike

FloatArray = NDArray[np.float64]
PER_DECADE = 4
FEWEST, MOST = 13, 121
LONG_ENOUGH = 10.0 * np.log(10.0)
"""Slowest lifetimes that a course goes on for: ten times the time in which the slowest deviation falls to a tenth."""
ARRIVED = 1e-9
"""Relative distance from the end that still counts as on the way."""
TRACE = 1e-12
"""Of the total: species below are traces."""
_AT_REST = 1e-6
"""Share of the followed species that is still to change below which its rate is that of rest."""
_ROUNDS = 12


def transient(
    study: StudyLike,
    *,
    times_s: Sequence[float] = (),
    temperature_k: Sequence[float] | None = None,
    products: Sequence[str] = (),
) -> Transient:
    """Return the time courses of a study from its initial concentrations.

    Parameters
    ----------
    study : StudyLike
    times_s : sequence of float
        Times in s; without any they are spread evenly over ln t, from the fastest to the slowest
        time scale.
    temperature_k : sequence of float or None
        The study's unless given.
    products : sequence of str
        Whose shares are followed; those of the mechanism unless given.

    Raises
    ------
    StudyError
        No initial concentrations, or a course without an end and no times.
    """
    from threadpoolctl import threadpool_limits

    mechanism = study.mechanism
    kelvin = study.conditions.temperature_k if temperature_k is None else tuple(temperature_k)
    forming = mechanism.catalyst is not None
    followed = (mechanism.products[0] if forming else mechanism.reactant) or ""
    if followed in study.conditions.held:
        followed = ""
    with threadpool_limits(1), np.errstate(all="ignore"):
        energies = energies_of(study, np.array(kelvin))
        starts = systems(study, energies)
        seen: dict[Constant, tuple[Start, ...]] = {}
        if study.treatment.phase == "gas":
            seen = {name: systems(study, energies, seen=name) for name in CONSTANTS}
        courses = tuple(
            _course(
                study,
                start,
                {name: others[k] for name, others in seen.items()},
                t,
                followed,
                forming,
                times_s,
                products or mechanism.products,
            )
            for k, (start, t) in enumerate(zip(starts, kelvin, strict=True))
        )
    result = Transient(followed, forming, courses)
    result = replace(result, findings=findings(result, study.mechanism.where))
    return replace(result, words=words(result))


def _course(
    study: StudyLike,
    start: Start,
    seen: Mapping[Constant, Start],
    temperature_k: float,
    followed: str,
    forming: bool,
    times_s: Sequence[float],
    products: Sequence[str],
) -> TimeCourse:
    whole, where = start.system, f"{study.mechanism.where} [conditions] initial"
    there = whole.present(start.concentration)
    system, now = whole.only(there), start.concentration[there]
    others = [one.response[there][:, -1] for one in seen.values()]
    response = np.column_stack([start.response[there], *others, np.zeros(len(now))])
    clocked = with_clock(_with_seen(system, {k: v.system.only(there) for k, v in seen.items()}))
    end, even = _end(system, now)
    fastest = fastest_rate(system, now)
    reason = _no_end(system, end)
    lives = np.zeros(0)
    if end is not None and not reason:
        lives = np.sort(np.abs(lifetimes(system, end)))[::-1]
        fastest = max(fastest, fastest_rate(system, end))
    times = np.unique(np.array(times_s, dtype=np.float64))
    if np.any(times < 0.0):
        raise ValueError(f"{times[0]:g} s is before the start")
    try:
        if not len(times):
            if reason or end is None:
                raise StudyError(
                    f"the time course at {temperature_k:g} K has no end to go to{reason}",
                    where=where,
                    mend='say at which times: --time "10 s"',
                )
            times = _times(fastest, lives, lambda t: _arrived(system, now, end, t))
        run = integrate(clocked, now, times, response=response)
    except Unsolved as error:
        raise StudyError(
            f"the time course at {temperature_k:g} K cannot be followed beyond {error.time_s:.3g} s",
            where=where,
            mend="ask for earlier times, or mend the energies of the steps",
        ) from None
    names = system.names
    course = TimeCourse(
        temperature_k=temperature_k,
        time_s=times,
        concentration_mol_l={name: run.concentration[:, k] for k, name in enumerate(names)},
        rate_mol_l_s=None,
        arrhenius_energy_kj_mol=None,
        order=None,
        control={},
        saddles=(),
        orders={},
        end_mol_l=None if end is None else dict(zip(names, map(float, end), strict=True)),
        at_equilibrium=even,
        fastest_lifetime_s=1.0 / fastest if fastest > 0.0 else np.nan,
        slowest_lifetime_s=float(lives[0]) if len(lives) else np.nan,
        next_lifetime_s=float(lives[1]) if len(lives) > 1 else np.nan,
        used=_used(system, start, now, run),
        steps=run.steps,
        product_share=_product_share(names, run.concentration - now, products),
    )
    sign = 1.0 if forming else -1.0
    if followed in names:
        course = _with_rate(course, clocked, run, names.index(followed), sign)
    resting = [name for name in study.conditions.quasi_steady if name in names]
    return _with_quasi_steady(course, system, run, resting, followed, sign) if resting else course


def _product_share(
    names: Sequence[str], formed: FloatArray, products: Sequence[str]
) -> dict[str, FloatArray]:
    """Return the share of each product in what has been formed of all of them, (t, names)."""
    competing = [name for name in products if name in names]
    if len(competing) < 2:
        return {}
    columns = formed[:, [names.index(name) for name in competing]]
    total = columns.sum(axis=1)
    shares = np.where(total > 0.0, columns.T / np.where(total > 0.0, total, 1.0), np.nan)
    return dict(zip(competing, shares, strict=True))


def _with_seen(system: System, seen: Mapping[Constant, System]) -> System:
    """Return the system with a response to temperature for everything that may count as constant."""
    return replace(
        system,
        responses=(*system.responses, *(f"{TEMPERATURE} at constant {name}" for name in seen)),
        respond_forward=np.hstack(
            [system.respond_forward, *(one.respond_forward[:, -1:] for one in seen.values())]
        ),
        respond_reverse=np.hstack(
            [system.respond_reverse, *(one.respond_reverse[:, -1:] for one in seen.values())]
        ),
    )


def with_clock(system: System) -> System:
    """Return the system with one more response: all steps faster at once, as if time ran faster."""
    ones = np.ones((len(system.left), 1))
    return replace(
        system,
        responses=(*system.responses, "clock"),
        respond_forward=np.hstack([system.respond_forward, ones]),
        respond_reverse=np.hstack([system.respond_reverse, ones]),
    )


def _end(system: System, start: FloatArray) -> tuple[FloatArray | None, bool]:
    """Return where the course ends, and whether that is an equilibrium."""
    try:
        if balanced(system):
            return equilibrium(system, start), True
        return settle(system, start), False
    except (ArithmeticError, NoSteadyState, np.linalg.LinAlgError):
        return None, False


def _no_end(system: System, end: FloatArray | None) -> str:
    """Return why no course goes on until its end, empty where one does."""
    if end is None:
        return ": it does not come to rest"
    most = int(np.argmax(end))
    if end[most] > IMPOSSIBLE_MOL_L:
        return (
            f": {system.names[most]} would come to {end[most]:.3g} mol/L with the held amounts as "
            "they are"
        )
    return ""


def _arrived(system: System, start: FloatArray, end: FloatArray, time_s: float) -> bool:
    there = integrate(system, start, np.array([time_s]), relative=1e-4).concentration[0]
    counts = end > TRACE * end.sum()
    return bool(np.all(np.abs(there - end)[counts] <= ARRIVED * end[counts]))


def _times(fastest: float, lives: FloatArray, arrived: Callable[[float], bool]) -> FloatArray:
    """Return times from the fastest time scale until the end is reached."""
    last = LONG_ENOUGH * lives[0] if len(lives) and lives[0] > 0.0 else 1.0
    for _ in range(_ROUNDS):
        if arrived(last):
            break
        last *= 2.0
    first = min(1.0 / fastest if fastest > 0.0 else last, last)
    count = int(np.clip(np.ceil(PER_DECADE * np.log10(last / first)) + 1, FEWEST, MOST))
    return np.asarray(np.geomspace(first, last, count))


def _used(system: System, start: Start, now: FloatArray, run: Run) -> dict[str, float]:
    """Return the largest share of every held amount that is taken up, where the composition tells it."""
    found = {}
    for column, name in enumerate(system.held):
        per_step = system.exchanged[:, column]
        if not per_step.any():
            continue
        counts = np.linalg.lstsq(system.stoichiometry.T, per_step, rcond=None)[0]
        if np.abs(system.stoichiometry.T @ counts - per_step).max() > 1e-9:
            continue  # a loop turns it over: what is used does not follow from what is there
        taken = -(run.concentration - now) @ counts
        found[name] = max(0.0, float(taken.max())) / start.held_mol_l[name]
    return found


def _with_quasi_steady(
    course: TimeCourse,
    system: System,
    run: Run,
    resting: Sequence[str],
    followed: str,
    sign: float,
) -> TimeCourse:
    """Set the quasi-steady state of some species beside the course."""
    counted = np.zeros(len(system.left))
    if followed in system.names:
        counted = sign * system.stoichiometry[system.names.index(followed)]
    at = quasi_steady(system, resting, run.concentration, counted)
    full = {name: course.concentration_mol_l[name] for name in resting}
    course = replace(
        course,
        quasi_steady_ratio={
            name: at.concentration[:, k] / full[name] for k, name in enumerate(resting)
        },
    )
    if course.rate_mol_l_s is None:
        return course
    return replace(
        course,
        quasi_steady_rate_ratio=at.rate / course.rate_mol_l_s,
        quasi_steady_energy_kj_mol=at.energy_j_mol / 1000.0,
    )


def _with_rate(
    course: TimeCourse, system: System, run: Run, species: int, sign: float
) -> TimeCourse:
    """Add the rate and its derivatives at the same conversion."""
    rate = sign * run.slope[:, species]
    relative = sign * run.slope_response[:, species] / rate[:, np.newaxis]
    moved = run.response[:, species]
    clock = moved[:, -1:]
    slope = (relative[:, -1:] - 1.0) / clock  # d ln(rate)/dc along the course
    same = np.where(run.time_s[:, np.newaxis] > 0.0, relative - slope * moved, relative)
    left = np.abs(rate) * course.slowest_lifetime_s
    same[left <= _AT_REST * run.concentration[:, species]] = np.nan
    heated = system.responses.index(TEMPERATURE)
    named = {name: same[:, k] for k, name in enumerate(system.responses[:heated])}
    seen = system.responses[heated + 1 : -1]
    order = np.where(np.isfinite(same[:, 0]), slope[:, 0] * run.concentration[:, species], np.nan)
    return replace(
        course,
        rate_mol_l_s=rate,
        arrhenius_energy_kj_mol=same[:, heated] / 1000.0,
        arrhenius_energy_constant_kj_mol={
            name.removeprefix(f"{TEMPERATURE} at constant "): same[:, heated + 1 + k] / 1000.0
            for k, name in enumerate(seen)
        },
        order=order,
        control=named,
        saddles=system.saddles,
        orders={name: 0.0 - named[name] for name in system.held},
    )
