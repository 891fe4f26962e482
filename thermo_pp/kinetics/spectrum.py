"""All decay constants of a network in detailed balance, each to high relative accuracy.

In the basis scaled by the equilibrium populations pi the rate matrix is B B^T with B = pi^(-1/2) X
G^(1/2), X the incidence matrix of states and steps and G the one-way fluxes at equilibrium.
Gaussian elimination with complete pivoting of such a matrix needs no arithmetic at all: each pivot
joins one state to a neighbour. It gives B = L D U with L and U well conditioned, and from that the
singular values and vectors of B follow to high relative accuracy, however large their range
(Demmel, Gu, Eisenstat, Slapnicar, Veselic, Drmac, Linear Algebra Appl. 1999, 299, 21, from memory).
The squares of the singular values are the decay constants; the squares of the right vectors'
elements are the steps' control of them, those of the left vectors' the states'.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
OUTSIDE = -1
"""Number of the state that absorbs."""


@dataclass(frozen=True, eq=False)
class Spectrum:
    """Decays of one network at one temperature, the slowest first.

    Attributes
    ----------
    log_decay : shape (r,)
        ln of the decay constants.
    states : shape (n, r)
        Left singular vectors.
    steps : shape (m, r)
        Right singular vectors.
    """

    log_decay: FloatArray
    states: FloatArray
    steps: FloatArray


def spectrum(
    log_weight: FloatArray, log_flux: FloatArray, tails: Sequence[int], heads: Sequence[int]
) -> Spectrum:
    """Return all decays.

    Parameters
    ----------
    log_weight : shape (n,)
        ln pi of the states.
    log_flux : shape (m,)
        ln of the one-way flux of each step at equilibrium.
    tails, heads : m integers
        States that each step joins; `OUTSIDE` for one that absorbs.
    """
    shift = 0.5 * (np.max(log_flux) - np.min(log_weight))
    factors = _factors(-0.5 * log_weight, 0.5 * log_flux - shift, tails, heads)
    logs = np.sort(factors[1])
    r, done = len(logs), 0
    log_values = np.empty(r)
    states, steps = np.empty((len(log_weight), r)), np.empty((len(log_flux), r))
    while done < r:
        # the pivots of a range that ordinary numbers hold; those above are as good as the largest of
        # them, those below (done already) as good as 0
        middle = logs[done] + _WIDE
        found, left, right = _singular(*factors, middle)
        held = int(np.sum(found[done:] < 0.5 * _WIDE))
        more = r if logs[-1] - middle <= _WIDE else done + max(held, 1)
        log_values[done:more] = found[done:more] + middle
        states[:, done:more], steps[:, done:more] = left[:, done:more], right[:, done:more]
        done = more
    return Spectrum(2.0 * (log_values + shift), states, steps)


_WIDE = 200.0
"""ln of how far ordinary numbers are used to each side of 1; their squares must be numbers too."""


def _singular(
    lower: FloatArray, log_pivots: FloatArray, upper: FloatArray, middle: float
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return ln of the singular values of L D U over exp(middle), ascending, and the left and right vectors."""
    from scipy.linalg import qr
    from scipy.linalg.lapack import dgejsv

    pivots = np.exp(np.clip(log_pivots - middle, -3.0 * _WIDE, _WIDE))
    orthogonal, triangle, order = qr(lower * pivots, mode="economic", pivoting=True)
    product = triangle @ upper[order]
    # restricted range and no perturbation are off: small singular values are wanted to their last
    # digit
    values, right, left, work, _, info = dgejsv(product.T.copy(), joba=2, jobr=0, jobp=0)
    if info != 0:
        raise ArithmeticError(f"the singular values did not converge (info {info})")
    scale = work[0] / work[1]
    ascending = np.argsort(values)
    with np.errstate(divide="ignore"):
        logs = np.log(values[ascending] * scale)
    return logs, (orthogonal @ left)[:, ascending], right[:, : len(values)][:, ascending]


def _factors(
    log_row: FloatArray, log_column: FloatArray, tails: Sequence[int], heads: Sequence[int]
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return L (n, r), ln of the pivots (r,) and U (r, m) of diag(exp(log_row)) X diag(exp(log_column))."""
    n, m = len(log_row), len(log_column)
    ends = np.array([tails, heads])  # the row that each end of a step stands in by now
    signs = np.array([1.0, -1.0])
    lower, upper, pivots = [], [], []
    extended = np.append(log_row, -np.inf)  # OUTSIDE has no row
    for _ in range(n):
        open_steps = ends[0] != ends[1]
        entries = np.where(open_steps, extended[ends] + log_column, -np.inf)
        side, step = np.unravel_index(int(np.argmax(entries)), entries.shape)
        if entries[side, step] == -np.inf:
            break
        row, other = ends[side, step], ends[1 - side, step]
        column = np.zeros(n)
        column[row] = 1.0
        if other != OUTSIDE:
            column[other] = -np.exp(log_row[other] - log_row[row])
        at_row = ends == row
        relative = np.exp(np.where(open_steps, log_column - log_column[step], -np.inf))
        line = (at_row * signs[:, np.newaxis]).sum(axis=0) * relative
        lower.append(column)
        upper.append(line)
        pivots.append(entries[side, step])
        ends[at_row] = other
    return np.array(lower).T, np.array(pivots), np.array(upper).reshape(len(pivots), m)
