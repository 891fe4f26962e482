"""Masses as MOPAC has them: average ones of its own table, to four decimals as its AUX file prints them.

Read off MOPAC 22.0.6: the molecular weight of every element's dihydride, less two hydrogen atoms.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import NUMBERS

# fmt: off
_TABLE = {
    "H": 1.0079, "He": 4.0026, "Li": 6.94, "Be": 9.0122, "B": 10.81, "C": 12.011, "N": 14.0067,
    "O": 15.9994, "F": 18.9984, "Ne": 20.179, "Na": 22.9898, "Mg": 24.305, "Al": 26.9815,
    "Si": 28.0855, "P": 30.9738, "S": 32.06, "Cl": 35.453, "Ar": 39.948, "K": 39.0983, "Ca": 40.08,
    "Sc": 44.9559, "Ti": 47.9, "V": 50.9415, "Cr": 51.996, "Mn": 54.938, "Fe": 55.847,
    "Co": 58.9332, "Ni": 58.71, "Cu": 63.546, "Zn": 65.38, "Ga": 69.735, "Ge": 72.59,
    "As": 74.9216, "Se": 78.96, "Br": 79.904, "Kr": 83.8, "Rb": 85.4678, "Sr": 87.62,
    "Y": 88.9059, "Zr": 91.22, "Nb": 92.9064, "Mo": 95.94, "I": 126.904,
}
# fmt: on
MASSES_U: dict[int, float] = {NUMBERS[symbol]: mass for symbol, mass in _TABLE.items()}
"""Average mass by atomic number, u; no element that the table does not hold to four decimals but iodine."""


def average(numbers: NDArray[np.int64]) -> NDArray[np.float64] | None:
    """Return the masses of the atoms, None where one of them is not in the table."""
    if any(int(z) not in MASSES_U for z in numbers):
        return None
    return np.array([MASSES_U[int(z)] for z in numbers])
