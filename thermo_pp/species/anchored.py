"""Anchored: a species whose free energy is moved so that a reaction has its measured value."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike

from thermo_pp.conditions import StandardState
from thermo_pp.errors import Finding
from thermo_pp.names import Kind, LowModes
from thermo_pp.species.result import Part, SaddleMember, SpeciesModel, Thermochemistry


@dataclass(frozen=True, eq=False)
class Anchored:
    """A species moved by a constant enthalpy and entropy; everything else is the species' own.

    Attributes
    ----------
    inner : SpeciesModel
        As it was computed or declared.
    enthalpy_shift_kj_mol, entropy_shift_j_mol_k : float
        What is added, the same at every temperature and in every standard state.
    """

    inner: SpeciesModel
    enthalpy_shift_kj_mol: float
    entropy_shift_j_mol_k: float

    @property
    def name(self) -> str:
        """The name that the study gives it."""
        return self.inner.name

    @property
    def kind(self) -> Kind:
        """``minimum`` or ``saddle``."""
        return self.inner.kind

    @property
    def composition(self) -> Mapping[str, int]:
        """Atoms by element symbol."""
        return self.inner.composition

    @property
    def charge(self) -> int:
        """Charge number."""
        return self.inner.charge

    @property
    def findings(self) -> tuple[Finding, ...]:
        """Doubts that do not depend on temperature."""
        return self.inner.findings

    @property
    def files(self) -> tuple[str, ...]:
        """The outputs it stands on."""
        return self.inner.files

    @property
    def ground_kj_mol(self) -> float | None:
        """Electronic and zero-point energy, moved as the enthalpy is."""
        own = self.inner.ground_kj_mol
        return None if own is None else own + self.enthalpy_shift_kj_mol

    def saddle_members(self, temperature_k: ArrayLike) -> tuple[SaddleMember, ...]:
        """Return nothing: only minima are anchors."""
        return self.inner.saddle_members(temperature_k)

    def at(
        self,
        temperature_k: ArrayLike,
        *,
        low_modes: LowModes | None = None,
        standard_state: StandardState | None = None,
    ) -> Thermochemistry:
        """Return H, S and G at any temperatures, K, the shift as a share of its own."""
        own = self.inner.at(temperature_k, low_modes=low_modes, standard_state=standard_state)
        enthalpy = np.full(own.temperature_k.shape, self.enthalpy_shift_kj_mol)
        entropy = np.full(own.temperature_k.shape, self.entropy_shift_j_mol_k)
        gibbs = enthalpy - own.temperature_k * entropy / 1000.0
        row = Part("anchor", "measured reaction", enthalpy, entropy, gibbs, np.zeros_like(gibbs))
        return replace(
            own,
            enthalpy_kj_mol=own.enthalpy_kj_mol + enthalpy,
            entropy_j_mol_k=own.entropy_j_mol_k + entropy,
            gibbs_kj_mol=own.gibbs_kj_mol + gibbs,
            slope_enthalpy_kj_mol=own.slope_enthalpy_kj_mol + enthalpy,
            rows=(*own.rows, row) if own.rows else (),
        )
