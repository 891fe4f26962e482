"""Nearest: frequencies for a structure that has none, from the one most like it that has."""

from __future__ import annotations

import dataclasses
import math
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding, StudyError
from thermo_pp.formulas.superposition import match
from thermo_pp.records import Calculation

FloatArray = NDArray[np.float64]


class Lent(NamedTuple):
    """A calculation whose wavenumbers are those of another.

    Attributes
    ----------
    calculation : Calculation
    source : str
        The file that the wavenumbers are from.
    finding : Finding
        ``thermal-from-nearest``: whose they are, and how far away.
    """

    calculation: Calculation
    source: str
    finding: Finding


def with_nearest_modes(
    calculation: Calculation, donors: Sequence[Calculation], *, where: str
) -> Lent:
    """Return the calculation with the wavenumbers of the donor that is nearest in shape.

    Rotation, symmetry and handedness stay those of its own geometry; the Hessian is not lent, so
    that isotopes and average masses are refused. Nearest is the least root mean square distance
    after superposition, atoms of one element in any order, the mirror image allowed: its
    wavenumbers are the same.

    Parameters
    ----------
    calculation : Calculation
        Without frequencies.
    donors : sequence of Calculation
        Members that have frequencies.
    where : str
        For messages.

    Returns
    -------
    Lent

    Raises
    ------
    StudyError
        No donor of the same atoms.
    """
    like = [donor for donor in donors if donor.formula == calculation.formula]
    if not like:
        raise StudyError(
            f"{calculation.path} has no frequencies, and no other member has any",
            where=where,
            mend="give the frequency job of one conformer at least",
        )
    distances = _distances(calculation)
    n = len(calculation.numbers)
    # a root mean square distance of r moves the sorted distances by r sqrt(2 n (n - 1)) at most
    floors = [
        float(np.linalg.norm(distances - _distances(donor))) / math.sqrt(2.0 * n * (n - 1) or 1.0)
        for donor in like
    ]
    best, nearest = math.inf, like[0]
    for k in np.argsort(floors, kind="stable"):
        if floors[k] >= best:
            break
        rmsd = _apart(calculation, like[k])
        if rmsd < best:
            best, nearest = rmsd, like[k]
    finding = Finding(
        "thermal-from-nearest",
        "warning",
        calculation.path,
        None,
        f"{calculation.path} has no frequencies: its wavenumbers are those of {nearest.path}, "
        f"{best:.2f} Å away (root mean square)",
        "run its frequency job where it counts",
    )
    lent = dataclasses.replace(calculation, wavenumbers_cm=nearest.wavenumbers_cm)
    return Lent(lent, nearest.path, finding)


def _apart(one: Calculation, other: Calculation) -> float:
    """Return the root mean square distance, of the mirror image where that is nearer, A."""
    a, b = (one.numbers, one.positions_angstrom), (other.numbers, other.positions_angstrom)
    return min(match(*a, *b), match(*a, *b, mirror=True))


def _distances(calculation: Calculation) -> FloatArray:
    """Return all distances between atoms, sorted."""
    x = calculation.positions_angstrom
    first, second = np.triu_indices(len(x), k=1)
    return np.sort(np.linalg.norm(x[first] - x[second], axis=-1))
