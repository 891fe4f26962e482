"""Pairing a single point with its frequency job: the same molecule in the same geometry."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass

import numpy as np

from thermo_pp.errors import Finding, StudyError
from thermo_pp.formulas.superposition import match, superpose
from thermo_pp.records import Calculation, hill_formula

SAME_GEOMETRY_ANGSTROM = 0.001
"""Root mean square distance after superposition up to which two geometries are the same.

Coordinates rounded to three decimals differ by 0.0005 A at most. At 0.001 A a stretched O-H bond (8
mdyn/A) is off by 2.4 J/mol.
"""


@dataclass(frozen=True)
class Pair:
    """A single point that belongs to a frequency job.

    Attributes
    ----------
    rmsd_angstrom : float
        Root mean square distance of the two geometries after superposition.
    findings : tuple of Finding
        ``charge-unknown`` (note) where one of the files does not state charge or multiplicity.
    """

    rmsd_angstrom: float
    findings: tuple[Finding, ...] = ()


def pair(frequencies: Calculation, energy: Calculation, *, where: str) -> Pair:
    """Check that `energy` is a single point of the molecule and the geometry of `frequencies`.

    Parameters
    ----------
    frequencies, energy : Calculation
        The order of the atoms may differ.
    where : str
        File and key that name the single point, for messages.

    Raises
    ------
    StudyError
        Other atoms, another charge or multiplicity, another geometry, or no energy in the file.
    """
    if energy.energy_hartree is None:
        raise StudyError(
            f"{energy.path} has no energy",
            where=where,
            mend="name a single point whose SCF converged",
        )
    _same_molecule(frequencies, energy, where)
    rmsd = _distance(frequencies, energy)
    if not rmsd <= SAME_GEOMETRY_ANGSTROM:
        raise StudyError(
            f"{energy.path} and {frequencies.path} have different geometries: "
            f"{rmsd:.4f} A apart (root mean square), more than {SAME_GEOMETRY_ANGSTROM} A",
            where=where,
            mend="run the single point at the geometry of the frequency job, "
            "or name the frequency job of this geometry",
        )
    return Pair(rmsd, _unstated(frequencies, energy))


def _same_molecule(frequencies: Calculation, energy: Calculation, where: str) -> None:
    mend = "name a single point of the same molecule"
    counts = [Counter(calc.numbers.tolist()) for calc in (frequencies, energy)]
    if counts[0] != counts[1]:
        formulas = [hill_formula(calc.numbers) for calc in (energy, frequencies)]
        raise StudyError(
            f"{energy.path} is {formulas[0]}, but {frequencies.path} is {formulas[1]}",
            where=where,
            mend=mend,
        )
    for field in ("charge", "multiplicity"):
        one, other = getattr(energy, field), getattr(frequencies, field)
        if one is not None and other is not None and one != other:
            raise StudyError(
                f"{energy.path} has {field} {one}, but {frequencies.path} has {field} {other}",
                where=where,
                mend=mend,
            )


def _distance(frequencies: Calculation, energy: Calculation) -> float:
    """Return the root mean square distance: atoms in the order given, else matched."""
    if np.array_equal(frequencies.numbers, energy.numbers):
        a, b = energy.positions_angstrom, frequencies.positions_angstrom
        rmsd = superpose(a, b).rmsd_angstrom
        if rmsd <= SAME_GEOMETRY_ANGSTROM:
            return rmsd
    return match(
        energy.numbers,
        energy.positions_angstrom,
        frequencies.numbers,
        frequencies.positions_angstrom,
    )


def _unstated(frequencies: Calculation, energy: Calculation) -> tuple[Finding, ...]:
    findings = []
    for field in ("charge", "multiplicity"):
        for calc, other in ((energy, frequencies), (frequencies, energy)):
            if getattr(calc, field) is None and getattr(other, field) is not None:
                findings.append(
                    Finding(
                        "charge-unknown",
                        "note",
                        calc.path,
                        None,
                        f"{calc.path} does not state its {field}: not compared with {other.path}",
                        f"check in its input that the {field} is {getattr(other, field)}",
                    )
                )
    return tuple(findings)
