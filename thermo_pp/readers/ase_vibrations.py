"""``VibrationsData`` of ASE, written with its `write`: geometry and Hessian; the modes are computed here.

The Hessian is in eV/A^2 with ASE's own constants (CODATA 2014), undone with ASE's own numbers.
Masses are those set in the file, else ASE's averages, which its modes are of. Translations and
rotations are projected out, which ASE does not do. A Hessian of some of the atoms is refused.
Nothing is unpickled: the file is decoded as plain JSON.
"""

from __future__ import annotations

import re
from typing import Any

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import AVERAGE_MASSES, SYMBOLS
from thermo_pp.formulas.normal_modes import NormalModes, normal_modes
from thermo_pp.readers import mode_lists
from thermo_pp.readers.json_document import Document, decode
from thermo_pp.readers.text import Text
from thermo_pp.records import Calculation
from thermo_pp.sources import Source

NAME = "ase_vibrations"
LOOKS_FOR = 'VibrationsData of ASE ("__ase_objtype__": "vibrationsdata")'

FloatArray = NDArray[np.float64]

_HESSIAN = re.compile(rb'"hessian"\s*:\s*\{\s*"__ndarray__"')
_ATOMS = re.compile(rb'\s*\{\s*"atoms"\s*:\s*\{')
_TYPE = "vibrationsdata"
_MEND = "write it again with VibrationsData.write of ASE"
_ASYMMETRY = 0.05
"""eV/A^2; finite differences leave less than this."""


def sniff(head: bytes) -> bool:
    """Tell whether `head`, the first 64 KiB of a file, is such a file; its type stands at its end."""
    return _ATOMS.match(head) is not None and b'"__ase_objtype__"' in head


def read(source: Source) -> Calculation:
    """Read one file; ReadError where it is damaged, periodic, or a Hessian of some of its atoms."""
    from ase.units import Bohr, Hartree

    document = decode(Text(source), mend=_MEND)
    kind = document.word("__ase_objtype__")
    if kind != _TYPE:
        raise document.error(("__ase_objtype__",), f"an object {kind[:40]!r} of ASE", mend=_MEND)
    numbers = _numbers(document)
    n = len(numbers)
    positions = _array(document, (n, 3), "atoms", "positions")
    if np.any(_array(document, (3,), "atoms", "pbc")):
        raise document.error(("atoms", "pbc"), "a periodic structure", mend="give a molecule")
    given = document.get("atoms", "masses") is not None
    masses = np.array([AVERAGE_MASSES[z] for z in numbers])
    if given:
        masses = _array(document, (n,), "atoms", "masses")
    if np.any(masses <= 0.0):
        raise document.error(("atoms", "masses"), "a mass that is not above 0")
    _check_whole(document, n)
    hessian = _array(document, (n, 3, n, 3), "hessian").reshape(3 * n, 3 * n)
    if np.max(np.abs(hessian - hessian.T)) > _ASYMMETRY:
        raise document.error(("hessian",), "the Hessian is not symmetric")
    hessian = hessian / (Hartree / Bohr**2)
    modes = _modes(document, hessian, masses, positions)
    places = {"positions_angstrom": ("atoms", "positions"), "wavenumbers_cm": ("hessian",)}
    if given:
        places["masses_u"] = ("atoms", "masses")
    return Calculation(
        path=source.name,
        sha256=source.sha256,
        program="ASE",
        numbers=numbers,
        positions_angstrom=positions,
        masses_u=masses,
        masses_origin="printed" if given else "derived",
        wavenumbers_cm=modes.wavenumbers_cm,
        modes=modes.modes,
        hessian_hartree_bohr2=hessian,
        kind_of_job=("frequencies",),
        where={name: document.line(*keys) for name, keys in places.items()},
        findings=(
            mode_lists.no_energy(source.name, None, "VibrationsData of ASE holds no energy"),
        ),
    )


def _numbers(document: Document) -> NDArray[np.int64]:
    keys = ("atoms", "numbers", "__ndarray__")
    values: Any = document.items(*keys)
    values = values[2] if len(values) == 3 else None
    if (
        not isinstance(values, list)
        or not values
        or not all(type(z) is int and 0 < z < len(SYMBOLS) for z in values)
    ):
        raise document.error(keys, "no atoms, or an atom of no element")
    return np.array(values, dtype=np.int64)


def _array(document: Document, shape: tuple[int, ...], *keys: str) -> FloatArray:
    """Return an array as ASE encodes it: shape, type and numbers in a row."""
    parts = document.items(*keys, "__ndarray__")
    if len(parts) != 3 or parts[0] != list(shape) or not isinstance(parts[2], list):
        raise document.error(keys, f"{'.'.join(keys)} is not an array of shape {shape}")
    values = parts[2]
    if keys[-1] == "pbc":
        return np.array([value is not False for value in values], dtype=np.float64)
    numeric = all(isinstance(v, int | float) and not isinstance(v, bool) for v in values)
    if not numeric or len(values) != int(np.prod(shape)):
        raise document.error(keys, f"{'.'.join(keys)} does not hold {int(np.prod(shape))} numbers")
    return np.array(values, dtype=np.float64).reshape(shape)


def _check_whole(document: Document, atoms: int) -> None:
    """Refuse a Hessian of some of the atoms."""
    indices: Any = document.get("indices")
    if isinstance(indices, dict) and isinstance(indices.get("__ndarray__"), list):
        indices = indices["__ndarray__"][-1]
    if indices is not None and indices != list(range(atoms)):
        raise document.error(
            ("indices",),
            "a Hessian of some of the atoms, which has no translations and rotations to take out",
            mend="compute the Hessian of the whole molecule",
        )


def _modes(
    document: Document, hessian: FloatArray, masses: FloatArray, positions: FloatArray
) -> NormalModes:
    try:
        with np.errstate(all="ignore"):
            found = normal_modes(hessian, masses, positions)
    except (ValueError, np.linalg.LinAlgError) as error:
        raise document.error(("hessian",), f"the Hessian: {error}") from None
    if not (np.all(np.isfinite(found.wavenumbers_cm)) and np.all(np.isfinite(found.modes))):
        raise document.error(("hessian",), "the Hessian has wavenumbers that are not finite")
    return found
