"""The Hessian that NWChem writes to ``<prefix>.hess``: its lower triangle, one number a line, hartree/bohr^2.

It has eleven digits where the output prints six, but is not projected. It is projected here the way the program does
it (P H P, with P free of unweighted translations and rotations), and taken in place of the printed one where its
wavenumbers are those printed. ``<prefix>.fd_ddipole`` beside it holds dipole derivatives, of which nothing is taken.
"""

from __future__ import annotations

import re

import numpy as np
from numpy.typing import NDArray

from thermo_pp.readers import joined_hessian
from thermo_pp.readers.line_marks import first_match
from thermo_pp.readers.text import Text
from thermo_pp.sources import Source

FloatArray = NDArray[np.float64]

_PREFIX = re.compile(rb"[ \t]+prefix[ \t]+=[ \t]+(\S+?)\.?[ \t]*\r?$", re.MULTILINE)


def beside(text: Text) -> Source | None:
    """Return the file with the Hessian beside the output, None where there is none."""
    match = first_match(_PREFIX, b"prefix", text, text.start, text.end)
    if match is None:
        return None
    name = re.split(r"[/\\]", match.group(1).decode("utf-8", "replace"))[-1]
    return text.source.sibling(f"{name}.hess") if name else None


def hessian(
    source: Source, masses_u: FloatArray, positions_angstrom: FloatArray, wavenumbers_cm: FloatArray
) -> FloatArray | None:
    """Return the projected Hessian, None where the file is no Hessian or one of other wavenumbers."""
    matrix = joined_hessian.square(joined_hessian.numbers(source.data), len(masses_u))
    if matrix is None:
        return None
    inner = _inner(positions_angstrom)
    projected = inner @ (inner.T @ matrix @ inner) @ inner.T
    found = joined_hessian.modes_of(projected, masses_u, positions_angstrom, wavenumbers_cm)
    return None if found is None else projected


def _inner(x: FloatArray) -> FloatArray:
    """Return an orthonormal basis (3n, m) of the displacements without unweighted overall motions."""
    x = x - x.mean(axis=0)
    moves = np.stack([np.broadcast_to(axis, x.shape) for axis in np.eye(3)])
    turns = np.stack([np.cross(axis, x) for axis in np.eye(3)])
    outer = np.concatenate([moves, turns]).reshape(6, -1)
    outer /= np.maximum(np.linalg.norm(outer, axis=1, keepdims=True), 1e-300)
    _, sizes, rows = np.linalg.svd(outer)
    return np.asarray(rows[int(np.sum(sizes > 1e-3)) :].T)
