"""The Hessian that ORCA writes to ``<name>.hess`` beside its output: blocks of columns, hartree/bohr^2.

The file has its atoms, masses and places (bohr) too, which must be those of the modes. Its name is the input's, or
``%base``; a later job in the folder overwrites it, so it is taken only where its wavenumbers are those printed, before
the factor that the output says they were scaled with.
"""

from __future__ import annotations

import re

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import NUMBERS
from thermo_pp.readers import joined_hessian
from thermo_pp.readers.line_marks import matches
from thermo_pp.readers.orca.geometry import Geometry
from thermo_pp.readers.orca.levels import END_OF_INPUT
from thermo_pp.readers.orca.vibrations import Vibrations
from thermo_pp.readers.printed_matrix import printed_matrix
from thermo_pp.readers.text import Text
from thermo_pp.sources import Source
from thermo_pp.units import BOHR_ANGSTROM

FloatArray = NDArray[np.float64]

_NAME = b"\nNAME = "
_BASE = re.compile(rb"\| *\d+> *%base +\"([^\"\n]+)\"", re.IGNORECASE)
_MARK = b"$orca_hessian_file"
_HESSIAN = re.compile(rb"\n\$hessian *\n *(\d+) *\n")
_ATOMS = re.compile(rb"\n\$atoms *\n *(\d+) *\n")
_SAME_ANGSTROM = 2e-5
_SAME_MASS = 2e-3
"""Masses are printed with three decimals in the output."""


def beside(text: Text) -> Source | None:
    """Return the file with the Hessian beside the output, None where there is none."""
    start = text.part(0, min(text.end, 1 << 20))
    echoed = start.all(END_OF_INPUT)
    names = [m.group(1) for m in matches(_BASE, b"%", text, 0, echoed[-1] if echoed else 0)]
    names += [text.rest(at + len(_NAME)).strip() for at in start.all(_NAME)]
    stems = [re.split(r"[/\\]", name.decode("utf-8", "replace"))[-1] for name in names[:4]]
    stems = [stem.removesuffix(".inp") for stem in stems]
    for stem in dict.fromkeys([*stems, text.source.file_name.rpartition(".")[0]]):
        source = text.source.sibling(f"{stem}.hess") if stem else None
        if source is not None:
            return source
    return None


def hessian(
    source: Source, shape: Geometry, masses_u: FloatArray, modes: Vibrations
) -> FloatArray | None:
    """Return the Hessian, None where the file is none or one of other atoms, places or wavenumbers."""
    data = source.data.replace(b"\r\n", b"\n")
    found, atoms = _HESSIAN.search(data), _ATOMS.search(data)
    n = len(shape.numbers)
    if _MARK not in data[:4096] or found is None or atoms is None:
        return None
    if int(found.group(1)) != 3 * n or int(atoms.group(1)) != n:
        return None
    if not _same_atoms(data[atoms.end() :], shape, masses_u):
        return None
    matrix = printed_matrix(data, found.end(), 3 * n, 0)
    unscaled = modes.wavenumbers_cm / modes.scale
    same = joined_hessian.modes_of(matrix, masses_u, shape.positions_angstrom, unscaled)
    return None if same is None else matrix


def _same_atoms(lines: bytes, shape: Geometry, masses_u: FloatArray) -> bool:
    """Tell whether the lines, each of symbol, mass and place, have the atoms of the modes."""
    rows = [line.split() for line in lines.split(b"\n")[: len(shape.numbers)]]
    if any(len(row) != 5 for row in rows):
        return False
    numbers = [NUMBERS.get(row[0].decode("utf-8", "replace"), 0) for row in rows]
    try:
        table = np.array([[float(word) for word in row[1:]] for row in rows])
    except ValueError:
        return False
    return (
        numbers == shape.numbers.tolist()
        and bool(np.all(np.abs(table[:, 0] - masses_u) <= _SAME_MASS))
        and bool(
            np.all(
                np.abs(table[:, 1:] * BOHR_ANGSTROM - shape.positions_angstrom) <= _SAME_ANGSTROM
            )
        )
    )
