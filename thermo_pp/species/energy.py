"""Energy: the electronic energy of a structure as the sum of its parts, each with its origin."""

from __future__ import annotations

import math
from dataclasses import dataclass

from thermo_pp.errors import StudyError
from thermo_pp.names import Origin
from thermo_pp.records import Calculation


@dataclass(frozen=True)
class EnergyPart:
    """One term of an electronic energy.

    Attributes
    ----------
    slot : str
        Its place in the recipe, the same for every species: ``"energy"``, ``"sum.2"``,
        ``"solvation"``.
    name : str
        What it is: ``"MP2/cc-pVTZ"``, ``"CCSD(T)/CBS correlation"``.
    value_hartree : float
        Before the factor.
    factor : float
    origin : {"printed", "derived", "declared"}
        Printed by a program, derived from printed values, declared in the study.
    files : tuple of str
        Empty where declared.
    lines : tuple of (int or None)
        1-based, one a file.
    """

    slot: str
    name: str
    value_hartree: float
    factor: float
    origin: Origin
    files: tuple[str, ...]
    lines: tuple[int | None, ...]

    @property
    def share_hartree(self) -> float:
        """What it adds: the value times the factor."""
        return self.factor * self.value_hartree

    @property
    def heading(self) -> str:
        """The name, with a factor that is not 1: ``"- MP2/cc-pVTZ"``, ``"0.5 x MP2/cc-pVTZ"``."""
        if self.factor == 1.0:
            return self.name
        sign = "\N{MINUS SIGN} " if self.factor < 0.0 else ""
        size = "" if abs(self.factor) == 1.0 else f"{abs(self.factor):g} \N{MULTIPLICATION SIGN} "
        return f"{sign}{size}{self.name}"


@dataclass(frozen=True)
class ElectronicEnergy:
    """The electronic energy of one structure.

    Attributes
    ----------
    parts : tuple of EnergyPart
    solvation_slope_j_mol_k : float or None
        Temperature derivative of the solvation term; None where there is none or it is not given.
    solvation_at_k : float or None
        Temperature at which the solvation term of the parts holds, with the slope.
    """

    parts: tuple[EnergyPart, ...]
    solvation_slope_j_mol_k: float | None = None
    solvation_at_k: float | None = None

    @property
    def value_hartree(self) -> float:
        """The sum of the shares."""
        return math.fsum(part.share_hartree for part in self.parts)

    @property
    def files(self) -> tuple[str, ...]:
        """Every file that it stands on, once."""
        return tuple(dict.fromkeys(file for part in self.parts for file in part.files))


@dataclass(frozen=True)
class Added:
    """A share of H and S that does not depend on temperature.

    Attributes
    ----------
    name, treated_as : str
    enthalpy_j_mol, entropy_j_mol_k : float
    """

    name: str
    treated_as: str
    enthalpy_j_mol: float
    entropy_j_mol_k: float


def added_shares(
    energy: ElectronicEnergy, entropy_correction_j_mol_k: float = 0.0
) -> tuple[Added, ...]:
    """Return what the slope of a solvation term and a declared entropy correction add to H and S.

    A solvation term that is linear in temperature, G(T) = G(T0) + s (T - T0), has H = G(T0) - s T0
    and S = -s; G(T0) itself is in the electronic energy.
    """
    found = []
    slope, at = energy.solvation_slope_j_mol_k, energy.solvation_at_k
    if slope is not None and at is not None:
        words = f"dG/dT = {slope:.6g} J/(mol K), value at {at:g} K"
        found.append(Added("solvation over temperature", words, -slope * at, -slope))
    if entropy_correction_j_mol_k != 0.0:
        found.append(Added("entropy correction", "declared", 0.0, entropy_correction_j_mol_k))
    return tuple(found)


def short_level(calculation: Calculation) -> str:
    """Return method and basis set, ``"MP2/cc-pVTZ"``; ``"energy"`` where neither is stated."""
    return "/".join(part for part in (calculation.method, calculation.basis) if part) or "energy"


def printed_part(calculation: Calculation, slot: str, factor: float = 1.0) -> EnergyPart:
    """Return the energy of a calculation as a part; StudyError where it has none."""
    if calculation.energy_hartree is None:
        raise StudyError(
            f"{calculation.path} has no electronic energy",
            where=calculation.path,
            mend="name an output whose SCF converged",
        )
    return EnergyPart(
        slot=slot,
        name=short_level(calculation),
        value_hartree=calculation.energy_hartree,
        factor=factor,
        origin="printed",
        files=(calculation.path,),
        lines=(calculation.where.get("energy_hartree"),),
    )


def single_energy(calculation: Calculation) -> ElectronicEnergy:
    """Return the energy of one calculation as the whole electronic energy."""
    return ElectronicEnergy((printed_part(calculation, "energy"),))
