"""Structure: one computed structure, checked once, and its H, S and G at any temperature."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.conditions import StandardState, Treatment
from thermo_pp.data.elements import SYMBOLS
from thermo_pp.errors import Finding, StudyError
from thermo_pp.formulas.rotor import RigidRotor
from thermo_pp.formulas.seam import CrossingCoordinate
from thermo_pp.formulas.symmetry import Symmetry, rotational_symmetry
from thermo_pp.names import Kind, LowModes, NuclearSpins, Origin, UsedAs
from thermo_pp.records import Calculation
from thermo_pp.species.electronic import electronic_energy, electronic_levels, settled_charge
from thermo_pp.species.energy import Added, ElectronicEnergy, added_shares
from thermo_pp.species.ideal_gas import IdealGas, seal, shares, totals
from thermo_pp.species.masses import chosen_masses, mass_findings
from thermo_pp.species.modes import SortedModes, sort_modes, wavenumbers
from thermo_pp.species.potentials import TorsionChoice, torsion_note
from thermo_pp.species.result import SaddleMember, Thermochemistry
from thermo_pp.species.rotors import settled_rotor
from thermo_pp.species.rows import mode_table, part_rows
from thermo_pp.species.seam import NEWTON, Seam, along_seam
from thermo_pp.species.torsions import Torsion, settle_torsions
from thermo_pp.units import ATOMIC_MASS_KG, GAS_J_MOL_K, HARTREE_KJ_MOL

FloatArray = NDArray[np.float64]

SLOPE_DIFFERS_KJ_MOL = 0.5
"""A soft-mode part of the slope enthalpy beyond this is a finding."""


@dataclass(frozen=True, eq=False)
class Structure:
    """One structure of an output, with everything that does not depend on temperature settled.

    Attributes
    ----------
    name : str
    kind : {"minimum", "saddle"}
    composition : mapping of str to int
    charge, multiplicity : int
        The multiplicity is None only where electronic levels are declared.
    treatment : Treatment
    calculation : Calculation
        The frequency job.
    masses_u : shape (n,)
        Of the atoms, isotopes included.
    energy : ElectronicEnergy
        Of the frequency job, of the single point given, or of several parts.
    gas : IdealGas
        The numbers that H, S and G are computed from.
    modes : SortedModes
    rotor : RigidRotor
    symmetry : Symmetry
        As found from the geometry, whatever is declared.
    symmetry_number : int
    symmetry_origin : {"derived", "declared"}
    degeneracy : int
        2 where both hands of a chiral structure are present, but not within its torsions.
    files : tuple of str
    findings : tuple of Finding
    torsions : tuple of Torsion
    seam : Seam or None
        Of a crossing point whose other state is known.
    """

    name: str
    kind: Kind
    composition: Mapping[str, int]
    charge: int
    multiplicity: int | None
    treatment: Treatment
    calculation: Calculation
    masses_u: FloatArray
    energy: ElectronicEnergy
    gas: IdealGas
    modes: SortedModes
    rotor: RigidRotor
    symmetry: Symmetry
    symmetry_number: int
    symmetry_origin: Origin
    degeneracy: int
    files: tuple[str, ...]
    findings: tuple[Finding, ...] = field(default=())
    torsions: tuple[Torsion, ...] = ()
    seam: Seam | None = None

    def __post_init__(self) -> None:
        seal(self)

    @property
    def energy_hartree(self) -> float:
        """The electronic energy, a solvation term in it."""
        return self.energy.value_hartree

    @property
    def added(self) -> tuple[Added, ...]:
        """Shares of H and S beside those of the ideal gas."""
        return added_shares(self.energy, self.treatment.entropy_correction_j_mol_k)

    @property
    def imaginary_cm(self) -> float | None:
        """Wavenumber of a saddle point's reaction coordinate, negative; None where no mode is one."""
        return self.modes.imaginary_cm

    @property
    def ground_kj_mol(self) -> float:
        """Electronic and zero-point energy, as the soft-mode treatment counts it."""
        part = shares(np.ones(1), self.gas, self.treatment, self.treatment.low_modes)
        zero_point = float(totals(part).zero_point_j_mol)
        return self.energy_hartree * HARTREE_KJ_MOL + zero_point / 1000.0

    def saddle_members(self, temperature_k: ArrayLike) -> tuple[SaddleMember, ...]:
        """Return what tunnelling and crossing need of a saddle point; nothing for a minimum."""
        if self.kind != "saddle":
            return ()
        found, imaginary_cm = self.at(temperature_k), self.modes.imaginary_cm
        across = self.crossing_coordinate
        return (
            SaddleMember(
                found.gibbs_kj_mol,
                found.slope_enthalpy_kj_mol,
                None if imaginary_cm is None else -imaginary_cm,
                self.ground_kj_mol,
                None
                if across is None
                else (across.slope * NEWTON, across.reduced_mass_u * ATOMIC_MASS_KG),
            ),
        )

    @property
    def crossing_coordinate(self) -> CrossingCoordinate | None:
        """The motion across the seam of a crossing point whose other state is known, hartree/bohr."""
        if self.seam is None:
            return None
        return self.seam.coordinate(self.masses_u, self.calculation.positions_angstrom)

    @classmethod
    def make(
        cls,
        calculation: Calculation,
        treatment: Treatment,
        *,
        name: str,
        kind: UsedAs | None = None,
        energy: Calculation | ElectronicEnergy | None = None,
        charge: int | None = None,
        multiplicity: int | None = None,
        levels: Sequence[Sequence[Any]] | str | None = None,
        symmetry_number: int | None = None,
        isotopes: Mapping[Any, str] | None = None,
        rotational_constants: Mapping[str, Any] | None = None,
        nuclear_spins: NuclearSpins | None = None,
        torsions: Sequence[TorsionChoice] = (),
        seam: Seam | None = None,
        where: str = "",
    ) -> Structure:
        """Check one calculation and settle its masses, modes, rotor, symmetry and levels.

        Parameters
        ----------
        calculation : Calculation
            A frequency job; of a single atom any job.
        treatment : Treatment
        name : str
        kind : {"minimum", "saddle", "crossing"} or None
            None: one imaginary mode means saddle, with a note. A crossing point becomes a saddle point.
        energy : Calculation, ElectronicEnergy or None
            A single point whose energy is taken, or an energy of parts; that it is the same
            structure is checked by the pairing, here only that a single point has the same atoms.
        charge, multiplicity : int or None
            Where the output does not say.
        levels : sequence of (degeneracy, energy), "table" or None
            Electronic levels, cm^-1 or a text with a unit, the lowest at 0; they replace the
            multiplicity. "table": those of `data.levels`.
        symmetry_number : int or None
            In place of the one found.
        isotopes : mapping or None
            Atom number (from 1) or element -> isotope.
        rotational_constants : mapping or None
            ``B`` and, if need be, ``D`` of a linear molecule: its levels are summed.
        nuclear_spins : one of `names.NUCLEAR_SPINS` or None
            Of H2, D2 and T2: at equilibrium unless given.
        torsions : sequence of TorsionChoice
            Hindered rotors, each in place of a mode.
        seam : Seam or None
            Of a crossing point: its modes are those along it.
        where : str
            File and key of the study, or option, for messages.

        Returns
        -------
        Structure

        Raises
        ------
        StudyError
            No energy, no modes or a wrong number of them, imaginary modes that must not be there,
            charge or multiplicity unknown or impossible, isotopes without a Hessian.
        """
        where = where or calculation.path
        own_charge = settled_charge(calculation, charge, name, where)
        own_levels, spin, notes = electronic_levels(
            calculation, own_charge, multiplicity, levels, name, where
        )
        masses = chosen_masses(calculation, treatment.masses, isotopes, where=where)
        notes += mass_findings(calculation, masses, isotopes, name, where)
        along = along_seam(calculation, seam, masses)
        found = wavenumbers(along, masses, kind, name=name)
        modes = sort_modes(along, found, kind, treatment.real_below_cm, name=name)
        symmetry = rotational_symmetry(calculation.numbers, calculation.positions_angstrom, masses)
        sigma = symmetry.order
        if symmetry_number is not None:
            if symmetry_number < 1:
                raise StudyError(
                    f"{name}: symmetry number {symmetry_number} is below 1",
                    where=where,
                    mend="give the order of the rotation group, 1 or more",
                )
            sigma = symmetry_number
        rotor, doubts = settled_rotor(
            calculation,
            masses,
            sigma,
            treatment.rotor,
            rotational_constants,
            nuclear_spins,
            name,
            where,
        )
        notes += doubts
        electronic = electronic_energy(calculation, energy, name)
        turning = settle_torsions(torsions, along, masses, modes, symmetry.chiral, name=name)
        modes, inside = turning.modes, any(one.holds_both_hands for one in turning.torsions)
        hands = 2 if symmetry.chiral and not (treatment.enantiopure or inside) else 1
        if inside and treatment.enantiopure:
            what = (
                f"{name}: the study is enantiopure, but turning its torsions makes the other hand"
            )
            mend = "take enantiopure out, or the torsion: the sum over its circle counts both hands"
            notes += (torsion_note("torsion-both-hands", "warning", calculation, what, mend),)
        if isotopes is None:
            notes += _symmetry_findings(calculation, symmetry, sigma, name)
        return cls(
            name=name,
            kind=modes.kind,
            composition=dict(Counter(SYMBOLS[z] for z in calculation.numbers)),
            charge=own_charge,
            multiplicity=spin,
            treatment=treatment,
            calculation=calculation,
            masses_u=masses,
            energy=electronic,
            gas=IdealGas(
                mass_u=float(masses.sum()),
                rotor=rotor.kind,
                theta_k=np.array(rotor.theta_k),
                symmetry_number=sigma,
                quantum_rotor=rotor.quantum,
                wavenumbers_cm=modes.real_cm,
                degeneracies=np.array([level[0] for level in own_levels], dtype=np.float64),
                levels_cm=np.array([level[1] for level in own_levels]),
                hands=hands,
                spin_weights=rotor.spin_weights,
                distortion_k=rotor.distortion_k,
                spin_shares=rotor.spin_shares,
                torsions=tuple(one.rotor for one in turning.torsions),
            ),
            modes=modes,
            rotor=rotor,
            symmetry=symmetry,
            symmetry_number=sigma,
            symmetry_origin="derived" if symmetry_number is None else "declared",
            degeneracy=hands,
            files=tuple(
                dict.fromkeys(
                    (
                        calculation.path,
                        *electronic.files,
                        *(file for choice in torsions for file in choice.files),
                        *(() if seam is None else seam.files),
                    )
                )
            ),
            findings=(
                *notes,
                *modes.findings,
                *turning.findings,
                *(() if seam is None else seam.findings),
            ),
            torsions=turning.torsions,
            seam=seam,
        )

    def at(
        self,
        temperature_k: ArrayLike,
        *,
        low_modes: LowModes | None = None,
        standard_state: StandardState | None = None,
    ) -> Thermochemistry:
        """Return H, S and G at the temperatures.

        Parameters
        ----------
        temperature_k : shape (t,) or ()
            K, above 0.
        low_modes, standard_state
            In place of the treatment's own.

        Returns
        -------
        Thermochemistry
            Arrays of shape (t,); of shape (1,) for one temperature.
        """
        t = np.atleast_1d(np.asarray(temperature_k, dtype=np.float64))
        used = low_modes or self.treatment.low_modes
        state = standard_state or self.treatment.standard_state
        part = shares(t, self.gas, self.treatment, used)
        total = totals(part)
        electronic_j_mol = 1000.0 * self.energy_hartree * HARTREE_KJ_MOL
        log_ratio = state.log_ratio_to_bar(t)
        added = self.added
        enthalpy = electronic_j_mol + total.enthalpy_j_mol
        enthalpy = enthalpy + sum(share.enthalpy_j_mol for share in added)
        entropy = total.entropy_j_mol_k - GAS_J_MOL_K * log_ratio
        entropy = entropy + sum(share.entropy_j_mol_k for share in added)
        slope = enthalpy + total.slope_excess_j_mol - GAS_J_MOL_K * t * state.log_ratio_slope
        return Thermochemistry(
            name=self.name,
            temperature_k=t,
            electronic_kj_mol=electronic_j_mol / 1000.0,
            zero_point_kj_mol=float(total.zero_point_j_mol) / 1000.0,
            enthalpy_kj_mol=enthalpy / 1000.0,
            entropy_j_mol_k=entropy,
            gibbs_kj_mol=(enthalpy - t * entropy) / 1000.0,
            heat_capacity_j_mol_k=total.heat_capacity_j_mol_k,
            slope_enthalpy_kj_mol=slope / 1000.0,
            low_modes=used,
            standard_state=state,
            symmetry_number=self.symmetry_number,
            symmetry_origin=self.symmetry_origin,
            rotor=self.rotor.kind,
            degeneracy=self.degeneracy,
            findings=(*self.findings, *self._findings_at(t, total.slope_excess_j_mol, used)),
            rows=part_rows(
                t,
                part,
                self.gas,
                self.treatment,
                used,
                state,
                added,
                [one.words for one in self.torsions],
            ),
            mode_table=mode_table(part, self.modes, self.treatment, used),
        )

    def _findings_at(
        self, t: FloatArray, slope_excess_j_mol: FloatArray, low_modes: LowModes
    ) -> tuple[Finding, ...]:
        """Return the findings that depend on temperature."""
        found = []
        worst = int(np.argmax(np.abs(slope_excess_j_mol))) if t.size else 0
        if t.size and abs(slope_excess_j_mol.flat[worst]) > 1000.0 * SLOPE_DIFFERS_KJ_MOL:
            found.append(
                Finding(
                    code="slope-differs",
                    severity="note",
                    file=self.calculation.path,
                    line=None,
                    what=f"{self.name}: -T² d(G/T)/dT differs from H by "
                    f"{slope_excess_j_mol.flat[worst] / 1000.0:.2f} kJ/mol at {t.flat[worst]:g} K, "
                    f"because {low_modes} takes S of soft modes from rotors, H from oscillators",
                    mend='low_modes = "rotor-enthalpy" treats both alike; apparent quantities take '
                    "the slope of G in any case",
                )
            )
        hottest = max(self.rotor.theta_k, default=0.0)
        if (
            t.size
            and t.min() < hottest
            and not (self.rotor.kind == "linear" and self.rotor.quantum)
        ):
            found.append(
                Finding(
                    code="rotor-too-cold",
                    severity="warning",
                    file=self.calculation.path,
                    line=None,
                    what=f"{self.name}: {t.min():g} K is below its rotational temperature of "
                    f"{hottest:.1f} K, where a classical rotor is a poor one",
                    mend="leave out the lowest temperatures",
                )
            )
        return tuple(found)


def _symmetry_findings(
    calculation: Calculation, symmetry: Symmetry, sigma: int, name: str
) -> tuple[Finding, ...]:
    """Compare with the printed symmetry number; say where the tolerance decides."""
    notes = []
    printed = calculation.printed.get("symmetry_number")
    if printed is not None and round(printed.value) != sigma:
        off = round(printed.value) == 1
        notes.append(
            Finding(
                code="symmetry-differs",
                severity="note" if off else "warning",
                file=calculation.path,
                line=printed.line,
                what=f"{name}: the program used symmetry number {printed.text}, here it is {sigma}",
                mend="nothing, where symmetry was off in the program"
                if off
                else "check the geometry; declare symmetry_number where the program is right",
            )
        )
    tolerance = symmetry.tolerance_angstrom
    near = [
        at
        for at in (symmetry.changes_at_angstrom, symmetry.mirror_at_angstrom)
        if at is not None and tolerance < at <= 2.0 * tolerance
    ]
    if near:
        notes.append(
            Finding(
                code="symmetry-borderline",
                severity="note",
                file=calculation.path,
                line=calculation.where.get("positions_angstrom"),
                what=f"{name}: symmetry number {symmetry.order}"
                f"{', chiral' if symmetry.chiral else ''} within {tolerance:g} Å, another one from "
                f"{min(near):.3f} Å",
                mend="optimise more tightly, or declare symmetry_number",
            )
        )
    return tuple(notes)
