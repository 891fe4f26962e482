"""Stiff integration of mass action: Radau IIA of order 5 in extents, with responses.

Stages are solved by Newton's method with the analytic Jacobian of each stage; concentrations are
carried beside the extents, so that traces keep all their digits, and brought back onto the
conserved sums after each step. The responses dc/dp follow the same steps: they are the exact
derivatives of the numbers that the method gives.

Source: E. Hairer, G. Wanner, Solving Ordinary Differential Equations II, 1996, IV.5 and IV.8
(coefficients and error estimate; from memory, checked in the tests by the order of convergence).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.extents import Extents, conserved, extents, solve_scaled
from thermo_pp.kinetics.mass_action import System

FloatArray = NDArray[np.float64]
_S6 = 6.0**0.5
_A = np.array(
    [
        [(88 - 7 * _S6) / 360, (296 - 169 * _S6) / 1800, (-2 + 3 * _S6) / 225],
        [(296 + 169 * _S6) / 1800, (88 + 7 * _S6) / 360, (-2 - 3 * _S6) / 225],
        [(16 - _S6) / 36, (16 + _S6) / 36, 1 / 9],
    ]
)
_INVERSE = np.linalg.inv(_A)
_REAL = 3 + 3 ** (2 / 3) - 3 ** (1 / 3)
_ERROR = np.array([-13 - 7 * _S6, -13 + 7 * _S6, -1]) / 3
_MOST_NEWTON = 12
_MOST_STEPS = 100_000
RELATIVE = 1e-7
"""Relative error that a step may make."""
ABSOLUTE = 1e-20
"""Of the total: what counts as nothing; less where a start is smaller still."""
_OF_LEAST = 1e-8


class Unsolved(ArithmeticError):
    """The steps became too small to go on; holds the time reached."""

    def __init__(self, time_s: float) -> None:
        super().__init__(f"no step can be made from {time_s:g} s on")
        self.time_s = time_s


@dataclass(frozen=True, eq=False)
class Run:
    """A time course at t times, s species, p responses.

    Attributes
    ----------
    time_s : shape (t,)
    concentration : shape (t, s)
        mol/L.
    slope : shape (t, s)
        dc/dt, mol/(L s).
    response, slope_response : shape (t, s, p)
        Derivatives of both by the responses; p = 0 where none were asked for.
    steps : int
        How many steps were made.
    """

    time_s: FloatArray
    concentration: FloatArray
    slope: FloatArray
    response: FloatArray
    slope_response: FloatArray
    steps: int


def integrate(
    system: System,
    start: FloatArray,
    times_s: FloatArray,
    *,
    response: FloatArray | None = None,
    relative: float = RELATIVE,
) -> Run:
    """Integrate from 0 s and return what is there at each time.

    Parameters
    ----------
    system : System
        Of species that are all there sooner or later (`System.present`).
    start : shape (s,)
        Concentrations at 0 s, mol/L.
    times_s : shape (t,)
        Rising, not below 0.
    response : shape (s, p) or None
        Response of the start; None: no responses are followed.
    relative : float
        Relative error that a step may make.

    Raises
    ------
    Unsolved
        No step can be made.
    """
    mover = _Mover(system, start, response, relative)
    found = [mover.reach(float(time)) for time in times_s]
    columns = [np.stack(part) for part in zip(*found, strict=True)]
    return Run(times_s, columns[0], columns[1], columns[2], columns[3], mover.steps)


def fastest_rate(system: System, concentration: FloatArray) -> float:
    """Return the largest decay constant at a composition, 1/s."""
    matrix, _ = _jacobian(system, concentration)
    return float(np.abs(np.linalg.eigvals(matrix)).max(initial=0.0))


def slowest_lifetime(system: System, concentration: FloatArray) -> float:
    """Return the longest lifetime of a small deviation at a composition, s."""
    return float(np.abs(lifetimes(system, concentration)).max(initial=0.0))


def lifetimes(system: System, concentration: FloatArray) -> NDArray[np.complex128]:
    """Return -1/eigenvalue of the Jacobian in the extents, s; the long ones are exact."""
    matrix, _ = _jacobian(system, concentration)
    inverse = solve_scaled(-matrix, np.eye(len(matrix)))
    return np.linalg.eigvals(inverse).astype(np.complex128)


def _jacobian(system: System, concentration: FloatArray) -> tuple[FloatArray, Extents]:
    forward, reverse = system.fluxes(concentration)
    way = extents(system.stoichiometry, forward + reverse)
    return way.mix @ system.slopes(concentration) @ way.change, way


class _Mover:
    """Where an integration stands."""

    def __init__(
        self,
        system: System,
        start: FloatArray,
        response: FloatArray | None,
        relative: float,
    ) -> None:
        self.system = system
        self.time = 0.0
        self.now = np.array(start, dtype=np.float64)
        self.response = np.zeros((len(start), 0)) if response is None else np.array(response)
        self.slope = system.stoichiometry @ system.net(self.now)
        self.slope_response = np.zeros_like(self.response)
        if self.response.shape[1]:
            self.slope_response = system.stoichiometry @ (
                system.respond(self.now) + system.slopes(self.now) @ self.response
            )
        self.totals = conserved(system.stoichiometry, self.now)
        self.kept = self.totals @ self.now
        flow = list(system.flowing)
        feed = np.exp(system.log_forward[flow] - system.log_reverse[flow])
        amounts = np.concatenate([self.now, feed])
        least = amounts[amounts > 0.0].min(initial=np.inf)
        self.nothing = min(ABSOLUTE * max(self.now.sum(), feed.sum()), _OF_LEAST * least)
        self.tolerance = max(0.1 * relative ** (2 / 3), 10 * np.finfo(float).eps)
        forward, reverse = system.fluxes(self.now)
        self.way = extents(system.stoichiometry, forward + reverse)
        fastest = fastest_rate(system, self.now)
        self.width = 1e-6 / fastest if fastest > 0.0 else np.inf
        self.before: tuple[float, float] | None = None
        self.steps = 0

    def reach(self, time: float) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
        """Go on to a time and return concentrations, slopes and the responses of both."""
        while self.time < time:
            left = time - self.time
            self._step(left if self.width > 0.8 * left else self.width, time)
            self.steps += 1
            if self.steps > _MOST_STEPS:
                raise Unsolved(self.time)
        return self.now.copy(), self.slope.copy(), self.response.copy(), self.slope_response.copy()

    def _step(self, width: float, until: float) -> None:
        """Make one step of at most `width`; smaller where it fails."""
        system, left = self.system, until - self.time
        forward, reverse = system.fluxes(self.now)
        if not self.way.still_largest(forward + reverse):
            self.way = extents(system.stoichiometry, forward + reverse)
        way = self.way
        steepness = way.mix @ system.slopes(self.now) @ way.change
        pull = way.mix @ (forward - reverse)
        rejected = False
        while True:
            if width <= 1e-14 * self.time or width < 1e-300:
                raise Unsolved(self.time)
            solved = self._newton(way, width)
            if solved is None:
                width *= 0.25
                rejected = True
                continue
            gained, stages, rounds = solved
            new = self._kept(stages[2])
            size = self.nothing + self.tolerance * np.maximum(self.now, new)
            matrix = _REAL * np.eye(len(pull)) - width * steepness
            off = _ERROR @ gained
            error = solve_scaled(matrix, width * pull + off)
            norm = self._norm(way.change @ error, size)
            if norm > 1.0 and np.all(self.now + way.change @ error >= 0.0):
                again = way.mix @ system.net(self.now + way.change @ error)
                norm = self._norm(way.change @ solve_scaled(matrix, width * again + off), size)
            safety = 0.9 * (2 * _MOST_NEWTON + 1) / (2 * _MOST_NEWTON + rounds)
            if norm > 1.0 or np.any(new < 0.0):
                width *= max(0.1, safety * norm**-0.25) if norm > 1.0 else 0.2
                rejected = True
                continue
            break
        factor = safety * max(norm, 1e-10) ** -0.25
        if self.before is not None and norm > 0.0:
            factor *= min(1.0, width / self.before[0] * (self.before[1] / norm) ** 0.25)
        factor = min(1.0 if rejected else 8.0, max(0.2, factor))
        self.before = (width, max(norm, 1e-10))
        if self.response.shape[1]:
            self._respond(way, width, stages)
        self.slope = way.change @ (_INVERSE[2] @ gained) / width
        self.now = new
        self.time = self.time + width if width < left else until
        # a step cut short by a time that was asked for says nothing against the width before it
        self.width = width * factor if width < left else max(self.width, width * factor)

    def _newton(self, way: Extents, width: float) -> tuple[FloatArray, FloatArray, int] | None:
        """Return the extents gained at the stages (3, r), the concentrations there, and the rounds."""
        r = way.change.shape[1]
        gained = np.zeros((3, r))
        stages = np.repeat(self.now[np.newaxis], 3, axis=0)
        lacking = np.zeros_like(stages)  # what was held back so that nothing fell below zero
        least = 1e-3 * self.nothing
        for rounds in range(1, _MOST_NEWTON + 1):
            slopes = width * way.mix @ self.system.slopes(stages)
            left = width * self.system.net(stages) @ way.mix.T - _INVERSE @ gained
            left += np.einsum("irs,is->ir", slopes, lacking)
            try:
                step = solve_scaled(_system(slopes @ way.change), left.ravel()).reshape(3, r)
            except np.linalg.LinAlgError:
                return None
            gained += step
            change = step @ way.change.T + lacking
            aim = stages + change
            new = np.maximum(aim, 1e-2 * stages)
            lacking = aim - new
            size = least + self.tolerance * np.maximum(self.now, np.abs(new))
            norm = np.abs(change / size).max()
            stages = new
            if not np.isfinite(norm):
                return None
            if norm < 1e-3 and not lacking.any():
                return gained, stages, rounds
            if norm < 1e-3 and np.all(np.abs(lacking) <= size):
                return gained, stages, rounds
        return None

    def _respond(self, way: Extents, width: float, stages: FloatArray) -> None:
        """Take the responses along with the step."""
        slopes = width * way.mix @ self.system.slopes(stages)
        pull = width * (way.mix @ self.system.respond(stages)) + slopes @ self.response
        p = pull.shape[-1]
        gained = solve_scaled(_system(slopes @ way.change), pull.reshape(-1, p))
        gained = gained.reshape(3, -1, p)
        self.response = self.response + way.change @ gained[2]
        at_end = np.einsum("j,jrp->rp", _INVERSE[2], gained) / width
        self.slope_response = way.change @ at_end

    def _kept(self, concentration: FloatArray) -> FloatArray:
        """Return the concentrations brought back onto the conserved sums."""
        off = self.totals @ concentration - self.kept
        if not len(off):
            return concentration
        weighted = self.totals * concentration
        size = np.sqrt(np.maximum((weighted * self.totals).sum(axis=1), np.finfo(float).tiny))
        matrix = (weighted @ self.totals.T) / np.outer(size, size)
        share = np.linalg.lstsq(matrix, off / size, rcond=None)[0] / size
        return np.asarray(concentration - weighted.T @ share)

    def _norm(self, error: FloatArray, size: FloatArray) -> float:
        return float(np.abs(error / size).max(initial=0.0))


def _system(slopes: FloatArray) -> FloatArray:
    """Return the matrix of the three stages from h times the Jacobian at each, shape (3, r, r)."""
    r = slopes.shape[1]
    matrix = np.einsum("ij,kl->ikjl", _INVERSE, np.eye(r))
    for stage in range(3):
        matrix[stage, :, stage, :] -= slopes[stage]
    return np.asarray(matrix.reshape(3 * r, 3 * r))
