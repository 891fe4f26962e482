"""Force constants of a Gaussian archive entry, turned into the frame of the modes.

They are the lower triangle in hartree/bohr^2, in the frame of the archive's own geometry, which is
not that of the printed modes. They are taken only where they have the sum and the sum of squares of
the eigenvalues behind the printed wavenumbers, resist no translation (which one wrong element would)
and hardly any rotation: checks that cost far less than a diagonalisation.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import NUMBERS
from thermo_pp.formulas.frames import kabsch
from thermo_pp.readers.gaussian.geometry import Geometry
from thermo_pp.readers.gaussian.steps import Archive
from thermo_pp.readers.joined_hessian import square
from thermo_pp.readers.number_table import decimal_list

FloatArray = NDArray[np.float64]

_APART = 1e-4
_CM_PER_ROOT = 5140.487
"""cm^-1 per root of 1 hartree/(bohr^2 u)."""
_SHARE = 2e-3
_TRANSLATION = 5e-7
"""hartree/bohr^2 and atom: elements are printed to 1e-8."""
_ROTATION = 2e-2


def hessian(
    archive: Archive, shape: Geometry, masses_u: FloatArray, wavenumbers_cm: FloatArray
) -> FloatArray | None:
    """Return the force constants (3n, 3n) in the frame of `shape`, None without any that fit.

    Parameters
    ----------
    archive : Archive
    shape : Geometry
        Of the modes.
    masses_u : shape (n,)
    wavenumbers_cm : shape (m,)
        Printed ones, ascending.
    """
    place = next((i for i, field in enumerate(archive.fields) if field.startswith("NImag=")), -1)
    if place < 0 or len(archive.fields) < place + 3:
        return None
    places = _places(archive, shape)
    if places is None:
        return None
    size = 3 * len(shape.numbers)
    triangle = decimal_list(archive.fields[place + 2], size * (size + 1) // 2)
    matrix = square(triangle, len(shape.numbers))
    if matrix is None or not _fits(matrix, masses_u, places, wavenumbers_cm):
        return None
    here = shape.positions_angstrom - shape.positions_angstrom.mean(axis=0)
    rotation = kabsch(here, places)
    if float(np.abs(places @ rotation.T - here).max()) > _APART:
        return None
    half = (matrix.reshape(-1, 3) @ rotation.T).reshape(size, size)
    turned: FloatArray = (half.T.reshape(-1, 3) @ rotation.T).reshape(size, size).T
    return turned


def _fits(
    matrix: FloatArray, masses_u: FloatArray, places: FloatArray, wavenumbers_cm: FloatArray
) -> bool:
    """Tell whether force constants are those of the wavenumbers, in the frame of `places`."""
    atoms = len(masses_u)
    root = np.repeat(np.sqrt(masses_u), 3)
    weighted = matrix / np.outer(root, root)
    values = np.sign(wavenumbers_cm) * (wavenumbers_cm / _CM_PER_ROOT) ** 2
    traces = float(np.trace(weighted)), float(np.sum(weighted**2))
    wanted = float(np.sum(values)), float(np.sum(values**2))
    size = float(np.sum(np.abs(values)))
    if abs(traces[0] - wanted[0]) > _SHARE * size or abs(traces[1] / wanted[1] - 1.0) > _SHARE:
        return False
    pushes = np.abs(matrix.reshape(3 * atoms, atoms, 3).sum(axis=1)).max()
    x, y, z = places.T
    none = np.zeros(atoms)
    turns = np.stack([none, -z, y, z, none, -x, -y, x, none], axis=1)
    turns = turns.reshape(atoms, 3, 3).transpose(1, 0, 2).reshape(3, 3 * atoms)
    resists = np.abs(matrix @ turns.T).max() / max(float(np.abs(places).max()), 1.0)
    return bool(pushes < _TRANSLATION * atoms and resists < _ROTATION)


def _places(archive: Archive, shape: Geometry) -> FloatArray | None:
    """Return the Cartesian geometry of the archive, centred; None where it has another form or other atoms."""
    try:
        start = next(i for i, field in enumerate(archive.fields) if i > 8 and _is_state(field))
    except StopIteration:
        return None
    rows: list[list[float]] = []
    for number, field in zip(shape.numbers, archive.fields[start + 1 :], strict=False):
        words = field.split(",")
        symbol = words[0].partition("(")[0]
        if len(words) not in (4, 5) or NUMBERS.get(symbol) != number:
            return None
        try:
            rows.append([float(word) for word in words[-3:]])
        except ValueError:
            return None
    if len(rows) != len(shape.numbers):
        return None
    places: FloatArray = np.array(rows)
    centred: FloatArray = places - places.mean(axis=0)
    return centred


def _is_state(field: str) -> bool:
    words = field.split(",")
    return len(words) == 2 and all(word.lstrip("-").isdigit() for word in words)
