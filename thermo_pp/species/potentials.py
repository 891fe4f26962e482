"""Potentials of torsions: what is asked of one, and a scan that is checked and fitted."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding, StudyError
from thermo_pp.formulas.torsion import Potential, fit
from thermo_pp.formulas.turning import Turn, turn
from thermo_pp.names import Severity
from thermo_pp.records import Calculation
from thermo_pp.scans import Scan, level_difference
from thermo_pp.units import HARTREE_KJ_MOL

FloatArray = NDArray[np.float64]

ELSEWHERE_J_MOL = 500.0
"""A structure may lie so far above the lowest point of its own torsion's potential."""
CLOSE_J_MOL = 500.0
"""Points of a scan that must be the same may differ by this."""
OFF_CURVE_J_MOL = 1000.0
"""No point of a scan may lie so far off the fitted curve."""
MOMENT_VARIES = 0.2
"""A reduced moment that varies by more than this share along the scan is a finding."""
_SAME_DEG = 0.5


@dataclass(frozen=True, eq=False)
class TorsionChoice:
    """What is asked of one torsion.

    Attributes
    ----------
    atoms : (int, int, int, int)
        From 0; the top turns about the bond of the middle two.
    scan : Scan or None
    series : Potential or None
        Exactly one of both is given.
    symmetry_number : int or None
        None: found by turning the top.
    moment_u_a2 : float or None
        None: that of the structure.
    mode : int or None
        From 0.
    mode_cm : float or None
        Wavenumber of the mode; where both are None it is found by overlap.
    mirror_deg : float or None
        The potential is symmetric about this angle.
    where : str
        For messages.
    """

    atoms: tuple[int, int, int, int]
    scan: Scan | None
    series: Potential | None
    symmetry_number: int | None
    moment_u_a2: float | None
    mode: int | None
    mode_cm: float | None
    mirror_deg: float | None
    where: str

    @property
    def files(self) -> tuple[str, ...]:
        """The files of the scan."""
        return () if self.scan is None else self.scan.files


def fitted(
    choice: TorsionChoice,
    scan: Scan,
    fold: int,
    calculation: Calculation,
    notes: list[Finding],
    called: str,
) -> Potential:
    """Fit the potential of a scan that closes and covers its period."""
    period = 360.0 / fold
    _check_closed(scan, period, choice.mirror_deg, called, choice.where)
    try:
        found = fit(scan.angles_deg, scan.energies_j_mol, period, choice.mirror_deg)
    except ValueError as error:
        half = choice.mirror_deg is None
        raise StudyError(
            f"{called}: the scan does not cover its period of {period:g} degrees: {error}",
            where=choice.where,
            mend="go on with the scan"
            + (
                "; where the potential is the same to both sides of an angle, say which "
                '(mirror = "180 deg"), then half of it is enough'
                if half
                else ""
            ),
        ) from None
    worst = int(np.abs(found.residual_j_mol).argmax())
    off = abs(float(found.residual_j_mol[worst])) / 1000.0
    what = (
        f"{called}: the point at {scan.angles_deg[worst]:.1f} degrees ({scan.places[worst]}) is "
        f"{off:.2f} kJ/mol off a curve that repeats after {period:g} degrees"
    )
    if off > OFF_CURVE_J_MOL / 1000.0:
        raise StudyError(
            what,
            where=choice.where,
            mend="check the symmetry number (and mirror), and that no other part of the molecule "
            "turned over on the way",
        )
    if off > 0.3 * OFF_CURVE_J_MOL / 1000.0:
        notes.append(
            torsion_note("torsion-fit", "warning", calculation, what, "look at that point")
        )
    return found.potential


def _check_closed(
    scan: Scan, period: float, mirror_deg: float | None, called: str, where: str
) -> None:
    """Compare points that must be the same."""
    ways: list[tuple[float, float | None, str, str]] = [
        (
            360.0,
            None,
            "does not close",
            "another part of the molecule turned over on the way: scan "
            "back from the last point, or start from a lower conformer",
        )
    ]
    ways += [
        (
            period,
            None,
            f"does not repeat after {period:g} degrees",
            "check symmetry_number: wells of the circle that like atoms make the same",
        )
    ]
    if mirror_deg is not None:
        ways += [(period, mirror_deg, f"is not symmetric about {mirror_deg:g} degrees",
                  "check mirror, or scan the whole period")]  # fmt: skip
    angle, energy = scan.angles_deg, scan.energies_j_mol
    for repeat, mirror, what, mend in ways:
        other = angle if mirror is None else 2.0 * mirror - angle
        apart = (angle[:, np.newaxis] - other + 0.5 * repeat) % repeat - 0.5 * repeat
        off = np.where(np.abs(apart) <= _SAME_DEG, np.abs(energy[:, np.newaxis] - energy), 0.0)
        one, two = np.unravel_index(int(off.argmax()), off.shape)
        if off[one, two] > CLOSE_J_MOL:
            raise StudyError(
                f"{called}: the scan {what}: {angle[one]:.1f} degrees ({scan.places[one]}) and "
                f"{angle[two]:.1f} degrees ({scan.places[two]}) differ by "
                f"{off[one, two] / 1000.0:.2f} kJ/mol",
                where=where,
                mend=mend,
            )


def check_fold(potential: Potential, fold: int, label: str, where: str) -> None:
    """Refuse a series that does not repeat as often as the symmetry number says."""
    for k, pair in enumerate(zip(potential.cosines_j_mol, potential.sines_j_mol, strict=True)):
        if k % fold and math.hypot(*pair) > 0.1 * CLOSE_J_MOL:
            raise StudyError(
                f"{label}: its term k = {k} does not repeat after {360 / fold:g} degrees, as the "
                f"symmetry number {fold} has it",
                where=where,
                mend="check symmetry_number: wells of the circle that like atoms make the same",
            )


def check_scan(
    choice: TorsionChoice,
    scan: Scan,
    top: NDArray[np.bool_],
    motion: Turn,
    calculation: Calculation,
    masses_u: FloatArray,
    notes: list[Finding],
    called: str,
) -> None:
    """Set the outputs of a scan against the structure: energy, level of theory, reduced moment."""
    lowest = scan.lowest
    if lowest is None:
        return
    differs = level_difference(lowest, calculation)
    if differs is not None:
        notes.append(
            torsion_note(
                "torsion-level",
                "note",
                calculation,
                f"{called}: the {differs} of the scan is {getattr(lowest, differs)}, that of the "
                f"frequency job {getattr(calculation, differs)}",
                "nothing, if this is meant",
            )
        )
    elif calculation.energy_hartree is not None and lowest.energy_hartree is not None:
        below = 1000.0 * HARTREE_KJ_MOL * (calculation.energy_hartree - lowest.energy_hartree)
        if below > ELSEWHERE_J_MOL:
            raise StudyError(
                f"{called}: the scan goes {below / 1000.0:.2f} kJ/mol below the structure, at "
                f"{lowest.path}",
                where=choice.where,
                mend="optimise the structure again from that point",
            )
    axis = (choice.atoms[1], choice.atoms[2])
    moments = [
        turn(masses_u, calc.positions_angstrom, top, axis).moment_u_a2 for calc in scan.calculations
    ]
    if choice.moment_u_a2 is None and (
        np.ptp([*moments, motion.moment_u_a2]) > MOMENT_VARIES * motion.moment_u_a2
    ):
        notes.append(
            torsion_note(
                "torsion-moment-varies",
                "warning",
                calculation,
                f"{called}: the reduced moment is {motion.moment_u_a2:.3f} u Å² in the structure and "
                f"{min(moments):.3f} to {max(moments):.3f} along the scan; that of the structure is "
                "taken throughout",
                "declare reduced_moment to see what it is worth",
            )
        )


def torsion_note(
    code: str, severity: Severity, calculation: Calculation, what: str, mend: str
) -> Finding:
    """Return a finding about a structure's torsion."""
    return Finding(
        code,
        severity,
        calculation.path,
        None,
        what,
        mend,
    )
