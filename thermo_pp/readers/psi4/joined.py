"""The Hessian that Psi4 writes with ``hessian_write``: a line of two counts, then 3N x 3N numbers, three a line.

The file is called ``<output>.<molecule>.<process>.hess``, or shorter in some versions; the output names the molecule in
the copy of its input and the process in its heading. Its frame is that of the printed geometry.
"""

from __future__ import annotations

import re

import numpy as np
from numpy.typing import NDArray

from thermo_pp.readers import joined_hessian
from thermo_pp.readers.text import Text
from thermo_pp.sources import Source

FloatArray = NDArray[np.float64]

_PROCESS = re.compile(rb"^[ \t]+Process ID:[ \t]+(\d+)", re.MULTILINE)
_MOLECULE = re.compile(rb"^[ \t]*molecule[ \t]+(\w+)[ \t]*\{", re.MULTILINE)
_WRITE = b"hessian_write"
_MOST_NAMES = 8


def beside(text: Text) -> Source | None:
    """Return the file with the Hessian beside the output, None where there is none or none was asked for."""
    if _WRITE not in text.data.lower():
        return None
    stem = text.source.file_name.rpartition(".")[0]
    process = _PROCESS.search(text.data)
    molecules = [match.group(1).decode() for match in _MOLECULE.finditer(text.data)]
    names = [f".{name}" for name in dict.fromkeys([*molecules[:_MOST_NAMES], "default"])]
    numbers = [] if process is None else [f".{process.group(1).decode()}"]
    for name in [*names, ""]:
        for number in [*numbers, ""]:
            source = text.source.sibling(f"{stem}{name}{number}.hess")
            if source is not None:
                return source
    return None


def hessian(
    source: Source, masses_u: FloatArray, positions_angstrom: FloatArray, wavenumbers_cm: FloatArray
) -> FloatArray | None:
    """Return the Hessian, None where the file is none or one of other wavenumbers."""
    head, _, rest = source.data.partition(b"\n")
    n = len(masses_u)
    if head.split() not in ([b"%d" % n, b"%d" % (3 * n)], [b"%d" % n, b"%d" % (6 * n)]):
        return None
    matrix = joined_hessian.square(joined_hessian.numbers(rest), n)
    found = joined_hessian.modes_of(matrix, masses_u, positions_angstrom, wavenumbers_cm)
    return None if found is None else matrix
