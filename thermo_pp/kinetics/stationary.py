"""Steady states of mass action that is not linear, and their exact derivatives.

The derivatives come from the implicit-function theorem on the balance of independent extents, with
the analytic Jacobian. A rate is written over the slowest steps that it can be written over, so that
it is no difference of the large one-way fluxes of steps in equilibrium.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.extents import extents, solve_scaled
from thermo_pp.kinetics.mass_action import System
from thermo_pp.kinetics.radau import Unsolved, fastest_rate, integrate, lifetimes

FloatArray = NDArray[np.float64]
_NEAR = 0.05
"""How far (in ln c) a steady state may be from where the time course has come to."""
_LATEST_S = 1e60
_LOOSE = 1e-4
_TRACE = 1e-15
_MOST_NEWTON = 200
_SAME, _NEARLY_SAME = 1e-13, 1e-9


class NoSteadyState(ArithmeticError):
    """The time course does not come to rest."""


@dataclass(frozen=True, eq=False)
class Steady:
    """A steady state, s species, p responses.

    Attributes
    ----------
    concentration : shape (s,)
        mol/L.
    rate : float
        The rate that was asked for.
    response : shape (p,)
        Derivatives of the rate by the responses.
    pushed : shape (k,)
        Derivatives of the rate by what else was asked for.
    lifetimes_s : shape (r,), complex
        Of small deviations; the real parts of a stable state are positive.
    moved : shape (s, p)
        Derivatives of the concentrations by the responses.
    """

    concentration: FloatArray
    rate: float
    response: FloatArray
    pushed: FloatArray
    lifetimes_s: NDArray[np.complex128]
    moved: FloatArray


def settle(system: System, start: FloatArray) -> FloatArray:
    """Return the steady state that the time course from a start comes to, mol/L.

    Parameters
    ----------
    system : System
        Of species that are all there sooner or later.
    start : shape (s,)

    Raises
    ------
    NoSteadyState
        It does not come to rest, or its concentrations grow without end.
    """
    fastest = fastest_rate(system, start)
    if fastest == 0.0:
        return start
    here, passed, width = start, 0.0, 10.0 / fastest
    while passed < _LATEST_S:
        try:
            here = integrate(system, here, np.array([width]), relative=_LOOSE).concentration[0]
        except Unsolved:
            break
        found = rest(system, here)
        counts = _counts(here)
        if found is not None and np.all(np.abs(np.log(found / here))[counts] < _NEAR):
            lives = lifetimes(system, found)
            if np.all(lives.real > 0.0) and passed + width > np.abs(lives).max(initial=0.0):
                return found
        passed += width
        width *= 10.0
    raise NoSteadyState("the time course does not come to rest")


def rest(system: System, start: FloatArray) -> FloatArray | None:
    """Return the steady state near a composition with its conserved sums, None where Newton's steps lose it."""
    here = start
    for _ in range(_MOST_NEWTON):
        forward, reverse = system.fluxes(here)
        way = extents(system.stoichiometry, forward + reverse)
        matrix = way.mix @ system.slopes(here) @ way.change
        try:
            step = way.change @ solve_scaled(matrix, -(way.mix @ (forward - reverse)))
        except np.linalg.LinAlgError:
            return None
        new = np.maximum(here + step, 0.01 * here)
        with np.errstate(divide="ignore", invalid="ignore"):
            moved = np.abs(new - here) / here
        if not np.all(np.isfinite(moved)) or np.any(moved[_counts(here)] > 0.5):
            return None
        here = new
        if moved.max(initial=0.0) < _SAME:
            return here
    return here if moved.max(initial=0.0) < _NEARLY_SAME else None


def _counts(concentration: FloatArray) -> NDArray[np.bool_]:
    """Return which species are no mere traces."""
    return np.asarray(concentration > _TRACE * concentration.sum())


def at_rest(
    system: System,
    concentration: FloatArray,
    counted: FloatArray,
    pushes: FloatArray | None = None,
) -> Steady:
    """Return the rate of a steady state and its derivatives.

    Parameters
    ----------
    system : System
    concentration : shape (s,)
        The steady state.
    counted : shape (n,)
        How much each step adds to the rate.
    pushes : shape (n, k) or None
        Further derivatives of the net fluxes; for a change of conserved sums that of the composition
        times `System.slopes`.
    """
    forward, reverse = system.fluxes(concentration)
    way = extents(system.stoichiometry, forward + reverse)
    slopes = system.slopes(concentration)
    matrix = way.mix @ slopes @ way.change
    over = counted - counted[way.pivots] @ way.mix
    over[way.pivots] = 0.0
    respond = system.respond(concentration)
    moved = way.change @ solve_scaled(matrix, -(way.mix @ respond))
    response = over @ respond + (over @ slopes) @ moved
    pushed = np.zeros(0)
    if pushes is not None:
        moved_by = way.change @ solve_scaled(matrix, -(way.mix @ pushes))
        pushed = over @ pushes + (over @ slopes) @ moved_by
    rate = float(over @ (forward - reverse))
    lives = lifetimes(system, concentration)
    return Steady(concentration, rate, response, pushed, lives, moved)
