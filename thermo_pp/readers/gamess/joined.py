"""The Hessian that GAMESS punches as ``$HESS`` into the ``.dat`` file beside its log: hartree/bohr^2.

Lines of five numbers in fixed columns, the row (of two digits) and the line within it before them. The last group is
that of the run's end; it is taken where its wavenumbers are those printed.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from thermo_pp.readers import joined_hessian
from thermo_pp.readers.text import Text
from thermo_pp.sources import Source

FloatArray = NDArray[np.float64]

_START, _END = b" $HESS", b" $END"
_COLUMNS, _WIDTH, _LEFT = 5, 15, 5


def beside(text: Text) -> Source | None:
    """Return the punched file beside the log if it has a Hessian, None where there is none."""
    stem = text.source.file_name.rpartition(".")[0]
    source = text.source.sibling(f"{stem}.dat") if stem else None
    return source if source is not None and _START in source.data else None


def hessian(
    source: Source, masses_u: FloatArray, positions_angstrom: FloatArray, wavenumbers_cm: FloatArray
) -> FloatArray | None:
    """Return the Hessian, None where the last group is not whole or one of other wavenumbers."""
    matrix = _matrix(source.data.replace(b"\r\n", b"\n"), 3 * len(masses_u))
    found = joined_hessian.modes_of(matrix, masses_u, positions_angstrom, wavenumbers_cm)
    return None if found is None else matrix


def _matrix(data: bytes, size: int) -> FloatArray | None:
    start = data.rfind(_START)
    stop = data.find(_END, start)
    per_row = -(-size // _COLUMNS)
    lines = [line for line in data[start:stop].split(b"\n")[1:] if line.strip()]
    if lines and lines[0].lstrip().startswith(b"ENERGY"):
        lines = lines[1:]
    if stop < 0 or len(lines) != size * per_row:
        return None
    values: list[float] = []
    for number, line in enumerate(lines):
        row, place = divmod(number, per_row)
        count = min(_COLUMNS, size - place * _COLUMNS)
        ends = range(_LEFT, _LEFT + count * _WIDTH, _WIDTH)
        try:
            if (int(line[:2]), int(line[2:_LEFT])) != ((row + 1) % 100, (place + 1) % 1000):
                return None
            values += [float(line[end : end + _WIDTH]) for end in ends]
        except ValueError:
            return None
    matrix = np.array(values).reshape(size, size)
    return matrix if bool(np.isfinite(matrix).all()) else None
