"""A geometry against the nuclear repulsion energy printed with it: a strong check of every atom and every place.

A lost, doubled or altered atom does not agree with it, nor does the geometry of another step. The reader says which
charges count (ghost atoms have none) and leaves the check out where something else counts: effective core potentials,
point charges.
"""

from __future__ import annotations

import math

from numpy.typing import ArrayLike

from thermo_pp.formulas.repulsion import nuclear_repulsion, repulsion_slope
from thermo_pp.records import Printed

BOHR_DOUBT = 1e-6
"""By how much (relative) a program's bohr may be another than ours: their constants are of several decades."""


def differs(
    printed: str, charges: ArrayLike, positions_angstrom: ArrayLike, rounding_angstrom: float
) -> str | None:
    """Return why the printed nuclear repulsion (hartree) is not that of the geometry, None where it is.

    Parameters
    ----------
    printed : str
        The digits.
    charges : shape (n,)
        Nuclear charges, 0 for ghost atoms.
    positions_angstrom : shape (n, 3)
    rounding_angstrom : float
        By how much each coordinate may be off: half a unit of its last digit.
    """
    value = Printed(printed, "hartree", 0)
    own = nuclear_repulsion(charges, positions_angstrom)
    if not math.isfinite(own):
        return "two atoms of the geometry are at one place"
    off = abs(own - value.value) - BOHR_DOUBT * own - 0.51 * value.step - 1e-8
    if off <= 0.0 or off <= rounding_angstrom * repulsion_slope(charges, positions_angstrom):
        return None
    return f"the nuclear repulsion {printed} is not that of the geometry above it, {own:.8f}"
