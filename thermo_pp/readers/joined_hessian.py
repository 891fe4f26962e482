"""A Hessian from a file beside an output: taken only where its modes are those that were printed.

Program after program writes it under a name of its own choosing (``hessian``) that the next job in
the folder overwrites, so nothing but the wavenumbers says which job it is of.
"""

from __future__ import annotations

import re

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding
from thermo_pp.formulas.normal_modes import NormalModes, normal_modes
from thermo_pp.sources import Source

FloatArray = NDArray[np.float64]

ASYMMETRY = 1e-4
"""hartree/bohr^2; finite differences leave less than this."""
AGREE_CM = 0.3
AGREE_SHARE = 1e-4
"""A mode may differ by the larger of the two: rounding, older constants, another projection."""

_WORD = re.compile(rb"\S+")
_NUMBER = re.compile(rb"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eEdD][+-]?\d+)?")


def numbers(data: bytes) -> FloatArray | None:
    """Return the numbers of a text of nothing but numbers, None where it holds anything else."""
    words = data.split()
    if not all(_NUMBER.fullmatch(word) for word in words):
        return None
    values = np.array([float(word.lower().replace(b"d", b"e")) for word in words])
    return values if np.all(np.isfinite(values)) else None


def square(values: FloatArray | None, atoms: int) -> FloatArray | None:
    """Return all elements, or those of a lower triangle, as a matrix (3n, 3n); None for any other count."""
    size = 3 * atoms
    if values is None:
        return None
    if len(values) == size * size:
        return values.reshape(size, size)
    if len(values) == size * (size + 1) // 2:
        matrix = np.zeros((size, size))
        matrix[np.tril_indices(size)] = values
        return matrix + np.tril(matrix, -1).T
    return None


def modes_of(
    hessian: FloatArray | None,
    masses_u: FloatArray,
    positions_angstrom: FloatArray,
    wavenumbers_cm: FloatArray,
) -> NormalModes | None:
    """Return the modes of the Hessian, None where its wavenumbers are not those given.

    Parameters
    ----------
    hessian : shape (3n, 3n) or None
        hartree/bohr^2.
    masses_u : shape (n,)
    positions_angstrom : shape (n, 3)
    wavenumbers_cm : shape (m,)
        Ascending, as the output prints them.
    """
    if hessian is None or np.max(np.abs(hessian - hessian.T)) > ASYMMETRY:
        return None
    try:
        with np.errstate(all="ignore"):
            found = normal_modes(hessian, masses_u, positions_angstrom)
    except (ValueError, np.linalg.LinAlgError):
        return None
    if len(found.wavenumbers_cm) != len(wavenumbers_cm):
        return None
    slack = np.maximum(AGREE_CM, AGREE_SHARE * np.abs(wavenumbers_cm))
    if not np.all(np.abs(found.wavenumbers_cm - wavenumbers_cm) <= slack):
        return None
    return found


def not_joined(source: Source, beside: Source, line: int | None) -> Finding:
    """Return the finding that the Hessian of `beside` does not have the modes of `source`."""
    return Finding(
        "hessian-not-joined",
        "warning",
        source.name,
        line,
        f"the Hessian in {beside.name} does not have the wavenumbers printed here; it is left out",
        "put the Hessian of this very job beside its output, or take the file away",
    )
