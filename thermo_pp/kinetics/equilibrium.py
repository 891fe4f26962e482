"""The equilibrium of a closed mixture from free energies and conserved sums alone.

ln c = ln c* + L^T x, with c* any composition in which every step is balanced and L the conserved
sums: x is the minimum of the convex function sum(c) - x L c0, found by damped Newton steps.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.extents import conserved
from thermo_pp.kinetics.mass_action import System

FloatArray = NDArray[np.float64]
BALANCED_WITHIN = 1e-6
"""Largest affinity over RT left over a loop of steps that still counts as none."""
_LONGEST = 3.0
"""How many e-folds a concentration moves in one step at most."""


def balanced(system: System) -> bool:
    """Whether there is a composition in which every step is in equilibrium."""
    if not np.all(np.isfinite(system.log_forward) & np.isfinite(system.log_reverse)):
        return False
    log = _balance(system)
    left = system.stoichiometry.T @ log - (system.log_forward - system.log_reverse)
    return bool(np.all(np.abs(left) <= BALANCED_WITHIN))


def _balance(system: System) -> FloatArray:
    constants = system.log_forward - system.log_reverse
    return np.asarray(np.linalg.lstsq(system.stoichiometry.T, constants, rcond=None)[0])


def equilibrium(system: System, start: FloatArray) -> FloatArray:
    """Return the equilibrium composition that a start goes to, mol/L.

    Parameters
    ----------
    system : System
        In balance (`balanced`), of species that are all there sooner or later.
    start : shape (s,)
        mol/L.

    Raises ArithmeticError where it is not found.
    """
    log = _balance(system)
    laws = conserved(system.stoichiometry, np.ones(len(start)))
    if not len(laws):
        return np.asarray(np.exp(log))
    wanted = np.log(max(start.sum(), np.finfo(float).tiny))
    shift = np.linalg.lstsq(laws.T, wanted - log, rcond=None)[0]
    log = log + laws.T @ shift
    for _ in range(5000):
        log = np.clip(log, -690.0, 690.0) if np.abs(log).max() > 690.0 else log
        there = np.exp(log)
        laws = conserved(system.stoichiometry, there)
        kept = laws @ start
        weighted = laws * there
        size = np.sqrt((weighted * laws).sum(axis=1))
        matrix = (weighted @ laws.T) / np.outer(size, size)
        off = (kept - laws @ there) / size
        move = laws.T @ (np.linalg.lstsq(matrix, off, rcond=1e-15)[0] / size)
        longest = np.abs(move).max()
        log = log + move * min(1.0, _LONGEST / max(longest, 1e-300))
        if longest < 1e-13:
            return np.asarray(np.exp(log))
        if longest < 1e-8:
            closest = np.abs(laws @ np.exp(log) - kept) / (np.abs(laws) @ np.exp(log))
            if closest.max() < 1e-14:
                return np.asarray(np.exp(log))
    raise ArithmeticError("no equilibrium composition was found")
