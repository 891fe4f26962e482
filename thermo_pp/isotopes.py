"""Isotopologues: a structure with other masses, from its Hessian, and its partition function ratio."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.errors import Finding, StudyError
from thermo_pp.formulas.isotope_ratios import log_product_residual, log_reduced_ratio
from thermo_pp.formulas.normal_modes import normal_modes
from thermo_pp.formulas.rotor import NO_SPIN_WEIGHTS, rigid_rotor
from thermo_pp.formulas.symmetry import rotational_symmetry
from thermo_pp.names import Rotor
from thermo_pp.records import Calculation
from thermo_pp.species import Structure
from thermo_pp.species.ideal_gas import IdealGas, shares, totals
from thermo_pp.species.masses import substituted
from thermo_pp.species.modes import SortedModes, sort_modes
from thermo_pp.species.rotors import settled_rotor
from thermo_pp.species.seam import along_seam
from thermo_pp.species.torsions import settle_torsions
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]

PRODUCT_RULE_OFF = 0.005
"""A Hessian that misses the product rule by more than this, as a logarithm, is a finding."""


@dataclass(frozen=True, eq=False)
class Isotopologues:
    """A light and a heavy isotopologue of one structure, both with modes from the same Hessian.

    Attributes
    ----------
    name : str
    isotopes : mapping of str to str
        What was put in: atom number or element -> isotope.
    light, heavy : Structure
    plain : Structure
        The heavy one with the light one's symmetry number and handedness, so that symmetry cancels.
    product_residual : float
        By how much the wavenumbers miss the product rule, as a logarithm; 0 is perfect.
    findings : tuple of Finding
    """

    name: str
    isotopes: Mapping[str, str]
    light: Structure
    heavy: Structure
    plain: Structure
    product_residual: float
    findings: tuple[Finding, ...]

    def log_reduced_ratio(self, temperature_k: ArrayLike) -> FloatArray:
        """Return ln (s/s')f, heavy over light, of harmonic oscillators: Bigeleisen and Mayer."""
        treatment = self.light.treatment
        return log_reduced_ratio(
            temperature_k,
            self.light.modes.oscillators_cm,
            self.heavy.modes.oscillators_cm,
            frequency_scale=treatment.frequency_scale,
            zero_point_scale=treatment.zero_point_scale,
        )

    def log_full_ratio(self, temperature_k: ArrayLike) -> FloatArray:
        """Return the same by translation, classical rotation and oscillators, without symmetry.

        ln Q_heavy/Q_light less 3/2 ln(m_heavy/m_light) of every atom; of a saddle point also less ln
        of the ratio of the imaginary wavenumbers, which the product rule holds (of a crossing point,
        of the roots of the inverse reduced masses across the seam).
        """
        t = np.atleast_1d(np.asarray(temperature_k, dtype=np.float64))
        logs = []
        for structure in (self.light, self.heavy):
            rotor = rigid_rotor(structure.masses_u, structure.calculation.positions_angstrom)
            gas = replace(
                structure.gas,
                theta_k=np.array(rotor.theta_k),
                symmetry_number=1,
                quantum_rotor=False,
                hands=1,
                wavenumbers_cm=structure.modes.oscillators_cm,
                torsions=(),
            )
            total = totals(shares(t, gas, structure.treatment, "harmonic"))
            gibbs = total.enthalpy_j_mol - t * total.entropy_j_mol_k
            logs.append(-gibbs / (GAS_J_MOL_K * t))
        found = logs[1] - logs[0]
        found = found - 1.5 * float(np.log(self.heavy.masses_u / self.light.masses_u).sum())
        return np.asarray(found + self.log_coordinate_ratio)

    @property
    def log_coordinate_ratio(self) -> float:
        """Logarithm of light over heavy of the imaginary wavenumbers; 0 for a minimum.

        Of a crossing point of spin states, of the roots of the inverse reduced masses across the seam.
        """
        return float(np.log(_across(self.light)).sum() - np.log(_across(self.heavy)).sum())


def isotopologues(
    structure: Structure, isotopes: Mapping[str, str], *, where: str
) -> Isotopologues:
    """Put isotopes into a structure.

    Parameters
    ----------
    structure : Structure
        The light one; the isotopes that it has already stay.
    isotopes : mapping
        Atom number (from 1) or element -> isotope.
    where : str
        For messages.

    Raises
    ------
    StudyError
        No Hessian, an isotope, atom or element that is not there, a reaction coordinate that the
        heavy isotopologue does not have, or nuclear spins that are said of the light one alone.
    """
    calc = structure.calculation
    heavy_u = substituted(structure.masses_u, calc.numbers, isotopes, where=where)
    if calc.hessian_hartree_bohr2 is None and len(heavy_u) > 1:
        raise StudyError(
            f"{structure.name}: isotopes change the modes, and {calc.path} holds no Hessian",
            where=where,
            mend="name an output with a Hessian",
        )
    if structure.gas.spin_shares is not None:
        raise StudyError(
            f"{structure.name}: nuclear_spins are those of one isotopologue",
            where=where,
            mend="take nuclear_spins out, or compare two species with isotopes of their own",
        )
    light = _with_masses(structure, structure.masses_u, where)
    heavy = _with_masses(structure, heavy_u, where)
    plain = replace(
        heavy,
        symmetry_number=light.symmetry_number,
        degeneracy=light.degeneracy,
        gas=replace(
            heavy.gas,
            symmetry_number=light.symmetry_number,
            hands=light.degeneracy,
            torsions=tuple(
                replace(one, symmetry_number=other.symmetry_number)
                for one, other in zip(heavy.gas.torsions, light.gas.torsions, strict=True)
            ),
        ),
    )
    residual = log_product_residual(
        calc.positions_angstrom,
        light.masses_u,
        heavy.masses_u,
        *(np.append(one.modes.oscillators_cm, _across(one)) for one in (light, heavy)),
    )
    notes = []
    if structure.symmetry_origin == "declared":
        notes.append(
            Finding(
                "declared-symmetry-kept",
                "note",
                calc.path,
                None,
                f"{structure.name}: symmetry number {structure.symmetry_number} is declared, and taken "
                "for every isotopologue",
                "look at the isotope effects without symmetry where isotopes lower it",
            )
        )
    if abs(residual) > PRODUCT_RULE_OFF:
        notes.append(
            Finding(
                "product-rule",
                "warning",
                calc.path,
                calc.where.get("hessian_hartree_bohr2"),
                f"{structure.name}: its Hessian misses the product rule by {np.expm1(residual):.2%}, "
                "and so do isotope effects",
                "optimise more tightly before the frequency job, with a finer grid; overall motion "
                "must not stretch the structure",
            )
        )
    return Isotopologues(
        structure.name, dict(isotopes), light, heavy, plain, residual, tuple(notes)
    )


def _across(structure: Structure) -> FloatArray:
    """Return what stands for the reaction coordinate in ratios of isotopologues, one number or none."""
    coordinate = structure.crossing_coordinate
    if coordinate is not None:
        return np.array([coordinate.reduced_mass_u**-0.5])
    imaginary_cm = structure.imaginary_cm
    return np.array([] if imaginary_cm is None else [-imaginary_cm])


def _with_masses(structure: Structure, masses_u: FloatArray, where: str) -> Structure:
    """Return a structure with other masses, its modes from the Hessian."""
    calc, treatment = structure.calculation, structure.treatment
    modes = structure.modes
    along = along_seam(calc, structure.seam, masses_u)
    if structure.seam is not None:
        modes = _modes(structure, along)
    elif calc.hessian_hartree_bohr2 is not None:
        found = normal_modes(calc.hessian_hartree_bohr2, masses_u, calc.positions_angstrom)
        modes = _modes(structure, replace(calc, wavenumbers_cm=found.wavenumbers_cm))
    symmetry = rotational_symmetry(calc.numbers, calc.positions_angstrom, masses_u)
    declared = structure.symmetry_origin == "declared"
    sigma = structure.symmetry_number if declared else symmetry.order
    turning = settle_torsions(
        [one.choice for one in structure.torsions],
        along,
        masses_u,
        modes,
        symmetry.chiral,
        name=structure.name,
    )
    modes, inside = turning.modes, any(one.holds_both_hands for one in turning.torsions)
    hands = 2 if symmetry.chiral and not (treatment.enantiopure or inside) else 1
    kind: Rotor = treatment.rotor
    rotor, _ = settled_rotor(calc, masses_u, sigma, kind, None, None, structure.name, where)
    before = rigid_rotor(structure.masses_u, calc.positions_angstrom)
    now = np.array(rotor.theta_k)
    # given constants go with the moments of inertia, distortion with their square
    ratio = now / np.array(before.theta_k)
    gas = structure.gas
    return replace(
        structure,
        masses_u=np.array(masses_u),
        modes=modes,
        rotor=replace(rotor, quantum=gas.quantum_rotor),
        symmetry=symmetry,
        symmetry_number=sigma,
        degeneracy=hands,
        torsions=turning.torsions,
        gas=IdealGas(
            mass_u=float(masses_u.sum()),
            rotor=rotor.kind,
            theta_k=gas.theta_k * ratio,
            symmetry_number=sigma,
            # the same for all isotopologues: a change of formula is no isotope effect
            quantum_rotor=gas.quantum_rotor,
            wavenumbers_cm=modes.real_cm,
            degeneracies=gas.degeneracies,
            levels_cm=gas.levels_cm,
            hands=hands,
            spin_weights=rotor.spin_weights if gas.quantum_rotor else NO_SPIN_WEIGHTS,
            distortion_k=gas.distortion_k * float(ratio[0]) ** 2 if gas.distortion_k else 0.0,
            torsions=tuple(one.rotor for one in turning.torsions),
        ),
    )


def _modes(structure: Structure, calculation: Calculation) -> SortedModes:
    """Return the modes of an isotopologue, which has the parts of the structure's own."""
    assert calculation.wavenumbers_cm is not None
    return sort_modes(
        calculation,
        np.sort(calculation.wavenumbers_cm),
        structure.kind if structure.seam is None else "crossing",
        structure.treatment.real_below_cm,
        name=structure.name,
    )
