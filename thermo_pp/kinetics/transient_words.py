"""What a time course says in words, and what should be doubted of it."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from thermo_pp.errors import Finding
from thermo_pp.kinetics.courses import TimeCourse, Transient
from thermo_pp.kinetics.results import WITHIN
from thermo_pp.names import Severity

USED_UP = 0.05
"""Share of a held amount whose use is worth a finding."""
IMPOSSIBLE_MOL_L = 100.0
"""A concentration that no mixture has (pure water: 55 mol/L)."""
TWO_SLOW = 20.0
"""Ratio of the two longest lifetimes below which no single constant describes the end."""


def findings(result: Transient, file: str) -> tuple[Finding, ...]:
    """Return the doubts, each once, with the temperatures at which it holds."""
    found: dict[tuple[str, str], tuple[list[TimeCourse], Severity, str, str]] = {}

    def add(
        code: str, severity: Severity, what: str, mend: str, course: TimeCourse, about: str = ""
    ) -> None:
        found.setdefault((code, about), ([], severity, what, mend))[0].append(course)

    for course in result.courses:
        for name, share in course.used.items():
            if share > USED_UP:
                add(
                    "held-runs-out",
                    "warning",
                    f"{name} is held, but the course takes up {share:.3g} times the amount held",
                    f"give {name} in [conditions] initial instead of held",
                    course,
                    name,
                )
        end = course.end_mol_l or {}
        for name, value in end.items():
            if value > IMPOSSIBLE_MOL_L:
                add(
                    "beyond-held",
                    "warning",
                    f"{name} would come to {value:.3g} mol/L: it is more stable than the held "
                    "amounts allow, and they run out long before",
                    "give the species that it is made of in [conditions] initial instead of held",
                    course,
                    name,
                )
        if course.next_lifetime_s * TWO_SLOW > course.slowest_lifetime_s:
            add(
                "two-slow-modes",
                "note",
                f"two deviations die away about as slowly: lifetimes {course.slowest_lifetime_s:.3g} s "
                f"and {course.next_lifetime_s:.3g} s, so no single constant describes the end",
                "compare with a measurement by the whole curve, not by one constant",
                course,
            )
    return tuple(
        Finding(code, severity, file, None, f"{what} (at {_kelvin(courses)})", mend)
        for (code, _), (courses, severity, what, mend) in found.items()
    )


def words(result: Transient) -> tuple[str, ...]:
    """Return a paragraph, a sentence each, from the fields of the result."""
    return tuple(sentence for course in result.courses for sentence in _sentences(result, course))


def _sentences(result: Transient, course: TimeCourse) -> Iterator[str]:
    at = f"At {course.temperature_k:g} K"
    if course.end_mol_l is None or not np.isfinite(course.slowest_lifetime_s):
        yield f"{at} the course does not come to rest under these conditions."
    else:
        most = max(course.end_mol_l, key=lambda name: course.end_mol_l[name])  # type: ignore[index]
        kind = "equilibrium" if course.at_equilibrium else "a steady state"
        yield (
            f"{at} the course ends in {kind} with {most} at {course.end_mol_l[most]:.4g} mol/L; the "
            f"slowest deviation has a lifetime of {course.slowest_lifetime_s:.3g} s."
        )
    if course.rate_mol_l_s is None:
        return
    what = "formation" if result.forming else "loss"
    fastest = int(np.argmax(np.abs(course.rate_mol_l_s)))
    yield (
        f"The {what} of {result.followed} is fastest at {course.time_s[fastest]:.3g} s with "
        f"{course.rate_mol_l_s[fastest]:.4g} mol/(L s)."
    )
    yield from _quasi_steady(course)
    half = _half(result, course)
    if half is None:
        return
    assert course.arrhenius_energy_kj_mol is not None
    assert course.order is not None
    energy, order = course.arrhenius_energy_kj_mol[half], course.order[half]
    if np.isfinite(energy):
        saddle = max(course.saddles, key=lambda name: abs(course.control[name][half]))
        yield (
            f"Half way, near {course.time_s[half]:.3g} s, E_a at the same conversion is {energy:.4g} "
            f"kJ/mol, the order along the course {order:.3g}, and {saddle} controls the rate most "
            f"({course.control[saddle][half]:.3g})."
        )


def _quasi_steady(course: TimeCourse) -> Iterator[str]:
    if not course.quasi_steady_ratio:
        return
    names = " and ".join(course.quasi_steady_ratio)
    ratios = np.stack([*course.quasi_steady_ratio.values()])
    if course.quasi_steady_rate_ratio is not None:
        ratios = np.vstack([ratios, course.quasi_steady_rate_ratio])
    holds = np.all(np.abs(ratios - 1.0) <= WITHIN, axis=0)
    if not holds.any():
        yield f"The quasi-steady state of {names} does not hold at any of these times (5 %)."
        return
    first, last = np.flatnonzero(holds)[[0, -1]]
    gaps = " with gaps" if not holds[first : last + 1].all() else ""
    yield (
        f"The quasi-steady state of {names} holds (5 %) from {course.time_s[first]:.3g} s to "
        f"{course.time_s[last]:.3g} s{gaps}."
    )


def _half(result: Transient, course: TimeCourse) -> int | None:
    """Return the time at which the followed species is nearest half way to its end."""
    values = course.concentration_mol_l[result.followed]
    if len(values) < 3 or values[0] == values[-1]:
        return None
    return int(np.argmin(np.abs(values - 0.5 * (values[0] + values[-1]))))


def _kelvin(courses: list[TimeCourse]) -> str:
    values = [course.temperature_k for course in courses]
    if len(values) == 1:
        return f"{values[0]:g} K"
    return f"{len(values)} temperatures from {min(values):g} K to {max(values):g} K"
