"""Ensemble: conformers (or spin states) in equilibrium, one species like any other."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.conditions import StandardState
from thermo_pp.ensemble.block import blocks, ground_energies
from thermo_pp.ensemble.checks import check_members, member_findings
from thermo_pp.ensemble.distribution import MISSED_KJ_MOL, Distribution, distribution
from thermo_pp.ensemble.hands import counted
from thermo_pp.errors import Finding, each_once
from thermo_pp.formulas.mixture import Mixture, Sums, mixed, part
from thermo_pp.names import Duplicates, Kind, LowModes
from thermo_pp.rich import shown
from thermo_pp.species import SaddleMember, SpeciesModel, Structure, Thermochemistry
from thermo_pp.species.result import Part
from thermo_pp.units import GAS_J_MOL_K

if TYPE_CHECKING:
    import pandas as pd

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Member:
    """One conformer of an ensemble.

    Attributes
    ----------
    model : SpeciesModel
        With both hands of a chiral structure in its own numbers; the ensemble takes one hand and
        counts it by `degeneracy`.
    degeneracy : int
        How often it counts: 2 for a chiral structure whose mirror image is not a member, or what is
        declared; 0 where it is left out as a duplicate.
    same_as : int or None
        The member that it is a duplicate of, numbered from 0.
    mirror_of : int or None
        The member that is its mirror image.
    thermal_from : str or None
        The file that its wavenumbers are from, where it has none of its own.
    """

    model: SpeciesModel
    degeneracy: int
    same_as: int | None = None
    mirror_of: int | None = None
    thermal_from: str | None = None

    @property
    def file(self) -> str:
        """Its first output; its name where it is declared."""
        return self.model.files[0] if self.model.files else self.model.name


@dataclass(frozen=True, eq=False)
class Ensemble:
    """Conformers in equilibrium, as one species.

    H, S, G, Cp and the slope enthalpy are those of the mixture, the entropy of mixing included; see
    `formulas.mixture`.

    Attributes
    ----------
    name : str
    kind : {"minimum", "saddle"}
        Of all members.
    composition : mapping of str to int
    charge : int
    members : tuple of Member
        At least one of them counts.
    files : tuple of str
    findings : tuple of Finding
    """

    name: str
    kind: Kind
    composition: Mapping[str, int]
    charge: int
    members: tuple[Member, ...]
    files: tuple[str, ...]
    findings: tuple[Finding, ...] = field(default=())

    @classmethod
    def make(
        cls,
        models: Sequence[SpeciesModel],
        *,
        name: str,
        duplicates: Duplicates = "count",
        spin_states: bool = False,
        degeneracies: Sequence[int | None] | None = None,
        thermal_from: Sequence[str | None] | None = None,
        where: str = "",
    ) -> Ensemble:
        """Make sure that the members are one molecule, and count each as often as it is there.

        Parameters
        ----------
        models : sequence of SpeciesModel
            At least one; structures as they would stand alone, both hands counted where chiral.
        name : str
        duplicates : {"count", "once"}
            What is done with a structure that is there twice.
        spin_states : bool
            Members may differ in multiplicity.
        degeneracies : sequence of int or None, or None
            Declared: in place of handedness, for one conformer of each kind.
        thermal_from : sequence of str or None, or None
            Whose wavenumbers members have that have none of their own.
        where : str
            For messages.

        Raises
        ------
        StudyError
            No member; members that differ in formula, charge, isotopes or kind, or in multiplicity
            where no spin states are meant.
        """
        where = where or name
        check_members(models, name=name, spin_states=spin_states, where=where)
        count = counted(models, degeneracies, duplicates)
        lent = thermal_from or [None] * len(models)
        members = tuple(
            Member(model, one.degeneracy, one.same_as, one.mirror_of, source)
            for model, one, source in zip(models, count, lent, strict=True)
        )
        found = [finding for model in models for finding in model.findings]
        found += member_findings(name, models, count)
        return cls(
            name=name,
            kind=models[0].kind,
            composition=models[0].composition,
            charge=models[0].charge,
            members=members,
            files=tuple(dict.fromkeys(file for model in models for file in model.files)),
            findings=each_once(found),
        )

    @cached_property
    def lowest(self) -> Member:
        """The member that counts and has the least electronic and zero-point energy.

        Of members whose energy at 0 K is not known, the first.
        """
        there = [member for member in self.members if member.degeneracy]
        grounds = ground_energies([member.model for member in there])
        return there[0] if np.all(np.isnan(grounds)) else there[int(np.nanargmin(grounds))]

    @property
    def ground_kj_mol(self) -> float | None:
        """Electronic and zero-point energy of the lowest member; None where it is not known."""
        return self.lowest.model.ground_kj_mol

    def at(
        self,
        temperature_k: ArrayLike,
        *,
        low_modes: LowModes | None = None,
        standard_state: StandardState | None = None,
    ) -> Thermochemistry:
        """Return H, S and G of the mixture at the temperatures.

        Parameters
        ----------
        temperature_k : shape (t,) or ()
            K, above 0.
        low_modes, standard_state
            In place of the members' own.

        Returns
        -------
        Thermochemistry
            Arrays of shape (t,). Electronic and zero-point energy, symmetry number, rotor, modes and
            the first shares are those of the member of least electronic and zero-point energy; the
            share ``conformers`` is what the others change on average, ``mixing`` their mixing.
        """
        t = np.atleast_1d(np.asarray(temperature_k, dtype=np.float64))
        return self._once(t, low_modes, standard_state, None)

    def saddle_members(self, temperature_k: ArrayLike) -> tuple[SaddleMember, ...]:
        """Return what tunnelling needs of every member of a saddle point; nothing for a minimum.

        G of each has its degeneracy in it, so that sum exp(-G/RT) is that of the ensemble.
        """
        t = np.atleast_1d(np.asarray(temperature_k, dtype=np.float64))
        found = []
        for member in self.members:
            if not member.degeneracy:
                continue
            hands = member.model.degeneracy if isinstance(member.model, Structure) else 1
            more = -GAS_J_MOL_K * t * np.log(member.degeneracy / hands) / 1000.0
            found += [
                replace(one, gibbs_kj_mol=one.gibbs_kj_mol + more)
                for one in member.model.saddle_members(t)
            ]
        return tuple(found)

    def computed(
        self,
        temperature_k: ArrayLike,
        *,
        missed_kj_mol: float = MISSED_KJ_MOL,
        low_modes: LowModes | None = None,
        standard_state: StandardState | None = None,
    ) -> tuple[Thermochemistry, Distribution]:
        """Return what `at` returns, and what each member is and counts.

        Parameters
        ----------
        temperature_k : shape (t,) or ()
            K, above 0.
        missed_kj_mol : float
            How far above the lowest G a conformer is imagined that the set does not have.
        low_modes, standard_state
            In place of the members' own.
        """
        t = np.atleast_1d(np.asarray(temperature_k, dtype=np.float64))
        gibbs = np.empty((len(self.members), t.size))
        result = self._once(t, low_modes, standard_state, gibbs)
        g = np.array([member.degeneracy for member in self.members])
        return result, distribution(t, g, gibbs, missed_kj_mol)

    def table(self) -> pd.DataFrame:
        """Return one row a member, as plain values; members are numbered from 1.

        Columns: ``member, file, degeneracy, ground_kj_mol`` (electronic and zero-point energy, nan
        where it is not known), ``same_as, mirror_of`` (members), ``thermal_from``.
        """
        import pandas as pd

        grounds = ground_energies([member.model for member in self.members])
        return pd.DataFrame(
            {
                "member": number,
                "file": member.file,
                "degeneracy": member.degeneracy,
                "ground_kj_mol": ground,
                "same_as": None if member.same_as is None else member.same_as + 1,
                "mirror_of": None if member.mirror_of is None else member.mirror_of + 1,
                "thermal_from": member.thermal_from,
            }
            for number, (member, ground) in enumerate(zip(self.members, grounds, strict=True), 1)
        )

    def _repr_html_(self) -> str:
        return shown(self.table())

    def _once(
        self,
        t: FloatArray,
        low_modes: LowModes | None,
        standard_state: StandardState | None,
        gibbs_kj_mol: FloatArray | None,
    ) -> Thermochemistry:
        """Go through the members once; G of every one is written where an array (n, t) is given."""
        lowest = self.lowest.model.at(t, low_modes=low_modes, standard_state=standard_state)
        zero = float(lowest.enthalpy_kj_mol.flat[0]) if t.size else 0.0
        mixture = mixed(t, *self._sums(t, low_modes, standard_state, zero, gibbs_kj_mol))
        enthalpy = zero + mixture.enthalpy_j_mol / 1000.0
        number = sum(member.degeneracy for member in self.members)
        return Thermochemistry(
            name=self.name,
            temperature_k=t,
            electronic_kj_mol=lowest.electronic_kj_mol,
            zero_point_kj_mol=lowest.zero_point_kj_mol,
            enthalpy_kj_mol=enthalpy,
            entropy_j_mol_k=mixture.entropy_j_mol_k,
            gibbs_kj_mol=enthalpy - t * mixture.entropy_j_mol_k / 1000.0,
            heat_capacity_j_mol_k=mixture.heat_capacity_j_mol_k,
            slope_enthalpy_kj_mol=zero + mixture.slope_enthalpy_j_mol / 1000.0,
            low_modes=lowest.low_modes,
            standard_state=lowest.standard_state,
            symmetry_number=lowest.symmetry_number,
            symmetry_origin=lowest.symmetry_origin,
            rotor=lowest.rotor,
            findings=each_once([*self.findings, *lowest.findings]),
            rows=_rows(t, lowest, mixture, enthalpy, number),
            mode_table=lowest.mode_table,
        )

    def _sums(
        self,
        t: FloatArray,
        low_modes: LowModes | None,
        standard_state: StandardState | None,
        zero_kj_mol: float,
        gibbs_kj_mol: FloatArray | None,
    ) -> Iterator[Sums]:
        """Yield the sums over one block of members after the other, enthalpies less `zero_kj_mol`."""
        g = np.array([member.degeneracy for member in self.members])
        models = [member.model for member in self.members]
        for rows, values in blocks(models, t, low_modes, standard_state):
            if gibbs_kj_mol is not None:
                gibbs_kj_mol[rows] = values.gibbs_kj_mol
            there = g[rows] > 0
            if there.any():
                yield part(
                    t,
                    g[rows][there],
                    1000.0 * (values.enthalpy_kj_mol[there] - zero_kj_mol),
                    values.entropy_j_mol_k[there],
                    values.heat_capacity_j_mol_k[there],
                    1000.0 * (values.slope_enthalpy_kj_mol[there] - zero_kj_mol),
                )


def _rows(
    t: FloatArray,
    lowest: Thermochemistry,
    mixture: Mixture,
    enthalpy_kj_mol: FloatArray,
    number: int,
) -> tuple[Part, ...]:
    """Return the shares of the lowest member, what the others change on average, and mixing."""
    if not lowest.rows:
        return ()
    alone = lowest.entropy_j_mol_k - GAS_J_MOL_K * np.log(lowest.degeneracy)
    mixing, spread = mixture.mixing_entropy_j_mol_k, mixture.mixing_heat_capacity_j_mol_k

    def share(name: str, words: str, h: FloatArray, s: FloatArray, cp: FloatArray) -> Part:
        return Part(name, words, h, s, h - t * s / 1000.0, cp)

    return (
        *(row for row in lowest.rows if row.name != "handedness"),
        share(
            "conformers",
            f"mean of {number} less the lowest",
            enthalpy_kj_mol - lowest.enthalpy_kj_mol,
            mixture.entropy_j_mol_k - mixing - alone,
            mixture.heat_capacity_j_mol_k - spread - lowest.heat_capacity_j_mol_k,
        ),
        share("mixing", f"{number} conformers in equilibrium", np.zeros(t.shape), mixing, spread),
    )
