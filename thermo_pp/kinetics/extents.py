"""Linear algebra in extents of steps, in which stiffness is nothing but the scale of a row.

Concentrations are c0 + N x, x the net extents of the steps. Written for concentrations, a fast step
in equilibrium adds its large one-way fluxes to the same rows as the slow steps, which are lost in
the rounding once they are 16 orders slower. Written for extents each step has a row of its own; a
fast row is, divided by its size, the condition of equilibrium of that step. Where steps close a
loop their extents are not independent: then the fastest steps are kept (a largest-weight basis), so
that no row is left with a slow step through which alone something happens.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
_NO_NUMBER = 1e-9
"""What is left of an entry of small whole numbers that cancel."""
_MUCH = 100.0


def echelon(matrix: FloatArray, order: NDArray[np.intp]) -> tuple[FloatArray, NDArray[np.intp]]:
    """Return the reduced echelon form whose pivots are the first independent columns in `order`.

    Parameters
    ----------
    matrix : shape (p, q)
        Small whole numbers.
    order : shape (q,)
        Columns, the most wanted first.

    Returns
    -------
    rows : shape (r, q)
        Of rank r; the pivot columns hold the identity.
    pivots : shape (r,)
    """
    work = np.array(matrix, dtype=np.float64)
    rank, pivots = 0, []
    for column in order:
        if rank == len(work):
            break
        row = rank + int(np.argmax(np.abs(work[rank:, column])))
        if abs(work[row, column]) < _NO_NUMBER:
            continue
        work[[rank, row]] = work[[row, rank]]
        work[rank] /= work[rank, column]
        factors = work[:, column].copy()
        factors[rank] = 0.0
        work -= np.outer(factors, work[rank])
        work[np.abs(work) < _NO_NUMBER] = 0.0
        pivots.append(column)
        rank += 1
    return work[:rank], np.array(pivots, dtype=np.intp)


@dataclass(frozen=True, eq=False)
class Extents:
    """Independent extents: N = `change` @ `mix`.

    Attributes
    ----------
    change : shape (s, r)
        What one mole of each extent makes and uses.
    mix : shape (r, n)
        How each extent is made of the net extents of the n steps.
    pivots : shape (r,)
        The step that each extent is called by.
    """

    change: FloatArray
    mix: FloatArray
    pivots: NDArray[np.intp]

    def still_largest(self, weights: FloatArray) -> bool:
        """Whether no step left out is much faster than one that stands for it."""
        others = np.where(self.mix != 0.0, weights, 0.0).max(axis=1, initial=0.0)
        return bool(np.all(others <= _MUCH * weights[self.pivots]))


def extents(stoichiometry: FloatArray, weights: FloatArray) -> Extents:
    """Return independent extents of the steps with the largest weights.

    Parameters
    ----------
    stoichiometry : shape (s, n)
    weights : shape (n,)
        One-way fluxes.
    """
    mix, pivots = echelon(stoichiometry, np.argsort(-weights, kind="stable"))
    return Extents(stoichiometry[:, pivots], mix, pivots)


def conserved(stoichiometry: FloatArray, amounts: FloatArray) -> FloatArray:
    """Return independent conserved sums as rows, each led by an abundant species of its own.

    Parameters
    ----------
    stoichiometry : shape (s, n)
    amounts : shape (s,)
        The larger ones lead.

    Returns
    -------
    shape (q, s)
        rows @ stoichiometry = 0.
    """
    s = len(stoichiometry)
    rows, pivots = echelon(stoichiometry.T, np.argsort(amounts, kind="stable"))
    free = np.setdiff1d(np.arange(s), pivots)
    laws = np.zeros((len(free), s))
    laws[np.arange(len(free)), free] = 1.0
    laws[:, pivots] = -rows[:, free].T
    return echelon(laws, np.argsort(-amounts, kind="stable"))[0]


def solve_scaled(matrix: FloatArray, right: FloatArray) -> FloatArray:
    """Solve matrix @ x = right after each row is divided by its largest entry.

    Where the rows do not tell all of x in the digits there are (a mixture at rest), the smallest x
    is taken.

    Raises numpy.linalg.LinAlgError where an entry is not finite or a row is empty.
    """
    size = np.abs(matrix).max(axis=1)
    if not np.all(np.isfinite(size)) or np.any(size == 0.0):
        raise np.linalg.LinAlgError("a row that is empty or not finite")
    scaled = right / (size if right.ndim == 1 else size[:, np.newaxis])
    rows = matrix / size[:, np.newaxis]
    try:
        return np.asarray(np.linalg.solve(rows, scaled))
    except np.linalg.LinAlgError:
        return np.asarray(np.linalg.lstsq(rows, scaled, rcond=None)[0])
