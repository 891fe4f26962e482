"""Results: H, S and G of one species over temperature, and what every kind of species offers."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, fields
from typing import TYPE_CHECKING, Any, Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.conditions import StandardState
from thermo_pp.errors import Finding
from thermo_pp.names import LOW_MODES, Kind, LowModes, Origin, RotorKind
from thermo_pp.rich import shown
from thermo_pp.species.ideal_gas import seal

if TYPE_CHECKING:
    from pandas import DataFrame

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Part:
    """What one kind of motion adds.

    Attributes
    ----------
    name : str
        ``translation``, ``rotation``, ``vibration``, ``torsion`` (``torsion 1`` and so on where there
        are several), ``electronic`` or ``handedness``.
    treated_as : str
        How it was computed, in words.
    enthalpy_kj_mol, entropy_j_mol_k, gibbs_kj_mol, heat_capacity_j_mol_k : shape (t,)
        Of vibration and torsions with the zero-point energy in it; of the electronic states without the
        electronic energy itself; of translation in the standard state of the result.
    """

    name: str
    treated_as: str
    enthalpy_kj_mol: FloatArray
    entropy_j_mol_k: FloatArray
    gibbs_kj_mol: FloatArray
    heat_capacity_j_mol_k: FloatArray

    def __post_init__(self) -> None:
        seal(self)


@dataclass(frozen=True, eq=False)
class ModeTable:
    """What the soft-mode treatment did to each mode.

    Attributes
    ----------
    wavenumber_cm : shape (m,)
        As read (or from the Hessian with the masses used), imaginary ones negative.
    used_cm : shape (m,)
        Of the thermal terms: scaled, raised where the treatment raises it; nan for the reaction
        coordinate, which enters nothing, and for a mode that a torsion replaces.
    treated_as : tuple of str
    weight : shape (m,)
        Share of the oscillator; nan where the mode does not enter as a vibration.
    zero_point_kj_mol : shape (m,)
    enthalpy_kj_mol, entropy_j_mol_k, heat_capacity_j_mol_k : shape (t, m)
        The enthalpy above the zero-point energy.
    """

    wavenumber_cm: FloatArray
    used_cm: FloatArray
    treated_as: tuple[str, ...]
    weight: FloatArray
    zero_point_kj_mol: FloatArray
    enthalpy_kj_mol: FloatArray
    entropy_j_mol_k: FloatArray
    heat_capacity_j_mol_k: FloatArray

    def __post_init__(self) -> None:
        seal(self)


@dataclass(frozen=True, eq=False)
class Thermochemistry:
    """H, S and G of one species over temperature.

    Attributes
    ----------
    name : str
    temperature_k : shape (t,)
    electronic_kj_mol : float or None
        None for a declared species.
    zero_point_kj_mol : float or None
        As the soft-mode treatment counts it.
    enthalpy_kj_mol : shape (t,)
        Absolute, the electronic energy included.
    entropy_j_mol_k, gibbs_kj_mol, heat_capacity_j_mol_k : shape (t,)
        In the standard state; the heat capacity is that at constant pressure, dH/dT.
    slope_enthalpy_kj_mol : shape (t,)
        -T^2 d(G/T)/dT of the very G above: less by R T in a concentration form, and not H where
        the soft-mode treatment breaks S = -dG/dT.
    low_modes : str
    standard_state : StandardState
    symmetry_number : int or None
    symmetry_origin : {"derived", "declared"} or None
    rotor : {"atom", "linear", "nonlinear"} or None
    degeneracy : int
        2 where both hands of a chiral structure are present, else 1.
    findings : tuple of Finding
    rows : tuple of Part
        The shares; with the electronic energy they add up to H, S, G and Cp. Empty for a declared
        species.
    mode_table : ModeTable or None
    """

    name: str
    temperature_k: FloatArray
    electronic_kj_mol: float | None
    zero_point_kj_mol: float | None
    enthalpy_kj_mol: FloatArray
    entropy_j_mol_k: FloatArray
    gibbs_kj_mol: FloatArray
    heat_capacity_j_mol_k: FloatArray
    slope_enthalpy_kj_mol: FloatArray
    low_modes: LowModes
    standard_state: StandardState
    symmetry_number: int | None = None
    symmetry_origin: Origin | None = None
    rotor: RotorKind | None = None
    degeneracy: int = 1
    findings: tuple[Finding, ...] = ()
    rows: tuple[Part, ...] = ()
    mode_table: ModeTable | None = None

    def __post_init__(self) -> None:
        for name in (
            "temperature_k",
            "enthalpy_kj_mol",
            "entropy_j_mol_k",
            "gibbs_kj_mol",
            "heat_capacity_j_mol_k",
            "slope_enthalpy_kj_mol",
        ):
            array = np.array(getattr(self, name), dtype=np.float64)
            if name != "temperature_k":
                array = np.array(np.broadcast_to(array, self.temperature_k.shape))
            array.flags.writeable = False
            object.__setattr__(self, name, array)

    def parts(self) -> DataFrame:
        """Return the shares of translation, rotation and so on, a row a share and temperature.

        Columns: ``part, treated_as, temperature_k, enthalpy_kj_mol, entropy_j_mol_k, gibbs_kj_mol,
        heat_capacity_j_mol_k``. The rows of one temperature and the electronic energy add up to
        the totals.
        """
        import pandas as pd

        t, rows = self.temperature_k.ravel(), self.rows
        columns: dict[str, Any] = {
            "part": [row.name for row in rows] * t.size,
            "treated_as": [row.treated_as for row in rows] * t.size,
            "temperature_k": np.repeat(t, len(rows)),
        }
        for name in _PART_COLUMNS:
            values = [getattr(row, name).ravel() for row in rows]
            columns[name] = np.stack(values, axis=-1).ravel() if rows else np.empty(0)
        return pd.DataFrame(columns)

    def modes(self) -> DataFrame:
        """Return what the soft-mode treatment did to each mode, a row a mode and temperature.

        Columns: ``mode`` (from 1), ``temperature_k, wavenumber_cm, used_cm, treated_as, weight,
        zero_point_kj_mol, enthalpy_kj_mol`` (above the zero-point energy), ``entropy_j_mol_k,
        heat_capacity_j_mol_k``. A declared species has no rows.
        """
        import pandas as pd

        table = self.mode_table or _NO_MODES
        t, m = self.temperature_k.ravel(), len(table.wavenumber_cm)
        columns: dict[str, Any] = {
            "mode": np.tile(np.arange(1, m + 1), t.size),
            "temperature_k": np.repeat(t, m),
        }
        for item in fields(table):
            value = getattr(table, item.name)
            if item.name == "treated_as":
                columns[item.name] = list(value) * t.size
            else:
                columns[item.name] = np.broadcast_to(value, (t.size, m)).ravel()
        return pd.DataFrame(columns)

    def _repr_html_(self) -> str:
        return shown(self.parts())


_PART_COLUMNS = ("enthalpy_kj_mol", "entropy_j_mol_k", "gibbs_kj_mol", "heat_capacity_j_mol_k")
_NONE = np.empty(0)
_NO_MODES = ModeTable(_NONE, _NONE, (), _NONE, _NONE, _NONE, _NONE, _NONE)


@dataclass(frozen=True, eq=False)
class SaddleMember:
    """One structure that a saddle point consists of, as tunnelling and crossing need it.

    Attributes
    ----------
    gibbs_kj_mol, slope_enthalpy_kj_mol : shape (t,)
        G and -T^2 d(G/T)/dT, in one standard state for all members of a saddle point.
    imaginary_cm : float or None
        Size of the imaginary wavenumber, above 0, not scaled; None where it is not known.
    ground_kj_mol : float or None
        Electronic and zero-point energy; None where it is not known.
    across : tuple of float or None
        Of a crossing point whose other state is known: size of the difference of the gradients, N,
        and reduced mass along it, kg.
    """

    gibbs_kj_mol: FloatArray
    slope_enthalpy_kj_mol: FloatArray
    imaginary_cm: float | None
    ground_kj_mol: float | None
    across: tuple[float, float] | None = None


class SpeciesModel(Protocol):
    """What every kind of species offers, whether read from outputs or declared."""

    @property
    def name(self) -> str:
        """The name that the study gives it."""

    @property
    def kind(self) -> Kind:
        """``minimum`` or ``saddle``."""

    @property
    def composition(self) -> Mapping[str, int]:
        """Atoms by element symbol."""

    @property
    def charge(self) -> int:
        """Charge number."""

    @property
    def findings(self) -> tuple[Finding, ...]:
        """Doubts that do not depend on temperature."""

    @property
    def files(self) -> tuple[str, ...]:
        """The outputs it stands on."""

    @property
    def ground_kj_mol(self) -> float | None:
        """Electronic and zero-point energy, of the lowest member; None where it is not known."""

    def saddle_members(self, temperature_k: ArrayLike) -> tuple[SaddleMember, ...]:
        """Return the structures of a saddle point, none for a minimum."""

    def at(
        self,
        temperature_k: ArrayLike,
        *,
        low_modes: LowModes | None = None,
        standard_state: StandardState | None = None,
    ) -> Thermochemistry:
        """Return H, S and G at any temperatures, K; the treatment's own choices unless given."""


def low_mode_spread_kj_mol(
    model: SpeciesModel, temperature_k: ArrayLike, standard_state: StandardState | None = None
) -> FloatArray:
    """Return the largest less the smallest G of the four soft-mode treatments, kJ/mol.

    Parameters
    ----------
    model : SpeciesModel
    temperature_k : shape (t,)
    standard_state : StandardState or None
        No difference to the answer; it may save a conversion.

    Returns
    -------
    shape (t,)
    """
    gibbs = [
        model.at(temperature_k, low_modes=name, standard_state=standard_state).gibbs_kj_mol
        for name in LOW_MODES
    ]
    return np.asarray(np.max(gibbs, axis=0) - np.min(gibbs, axis=0))
