"""Seam: what is known of the other spin state at a crossing point, and the modes along the seam."""

from __future__ import annotations

import dataclasses
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding
from thermo_pp.formulas.normal_modes import normal_modes
from thermo_pp.formulas.seam import CrossingCoordinate, crossing_coordinate
from thermo_pp.names import Origin
from thermo_pp.records import Calculation
from thermo_pp.species.ideal_gas import seal
from thermo_pp.units import BOHR_M, HARTREE_J

FloatArray = NDArray[np.float64]

NEWTON = HARTREE_J / BOHR_M
"""N of 1 hartree/bohr."""


@dataclass(frozen=True, eq=False)
class SeamPart:
    """A value that a seam was worked out from, and where it stands.

    Attributes
    ----------
    quantity : str
    value : float or shape (n, 3)
        Gradients in hartree/bohr in the orientation of the frequency job, energies in hartree.
    unit : str
    origin : {"printed", "derived", "declared"}
        A gradient that was turned into that orientation is derived.
    file : str or None
    line : int or None
    """

    quantity: str
    value: float | FloatArray
    unit: str
    origin: Origin
    file: str | None
    line: int | None

    def __post_init__(self) -> None:
        seal(self)


@dataclass(frozen=True, eq=False)
class Seam:
    """The seam through a crossing point, in the orientation of its frequency job.

    Attributes
    ----------
    difference_hartree_bohr : shape (n, 3)
        Gradient of the crossing point's own state less that of the other.
    hessian_hartree_bohr2 : shape (3n, 3n)
        Of the energy along the seam; no use across it.
    other_share : float or None
        Share of the other state's Hessian in it; None where it is the own state's alone.
    gap_kj_mol : float or None
        Energy of the own state less that of the other; None where one of them is not known.
    parts : tuple of SeamPart
        What it was worked out from.
    files : tuple of str
        The outputs it stands on, beside the frequency job.
    findings : tuple of Finding
    """

    difference_hartree_bohr: FloatArray
    hessian_hartree_bohr2: FloatArray
    other_share: float | None
    gap_kj_mol: float | None
    parts: tuple[SeamPart, ...]
    files: tuple[str, ...]
    findings: tuple[Finding, ...]

    def __post_init__(self) -> None:
        seal(self)

    def coordinate(
        self, masses_u: FloatArray, positions_angstrom: FloatArray
    ) -> CrossingCoordinate:
        """Return the motion across the seam with the given masses, its slope in hartree/bohr."""
        return crossing_coordinate(self.difference_hartree_bohr, masses_u, positions_angstrom)


def along_seam(calculation: Calculation, seam: Seam | None, masses_u: FloatArray) -> Calculation:
    """Return the calculation with the modes along the seam, of the given masses; as it is without one."""
    if seam is None:
        return calculation
    found = normal_modes(
        seam.hessian_hartree_bohr2,
        masses_u,
        calculation.positions_angstrom,
        seam.difference_hartree_bohr,
    )
    return dataclasses.replace(
        calculation,
        masses_u=masses_u,
        hessian_hartree_bohr2=seam.hessian_hartree_bohr2,
        wavenumbers_cm=found.wavenumbers_cm,
        modes=found.modes,
    )
