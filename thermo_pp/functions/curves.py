"""Thermodynamic functions of one species over temperature, as tables of them have it."""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.conditions import StandardState
from thermo_pp.errors import Finding
from thermo_pp.names import DEFAULT_TEMPERATURE_K, Kind, LowModes
from thermo_pp.rich import shown
from thermo_pp.species import SpeciesModel

if TYPE_CHECKING:
    import pandas as pd

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Functions:
    """Thermodynamic functions of one species.

    Attributes
    ----------
    name : str
    kind : {"minimum", "saddle"}
    temperature_k : shape (t,)
    zero_enthalpy_kj_mol : float or None
        H(0), electronic and zero-point energy; None for a declared species.
    room_enthalpy_kj_mol : float
        H(298.15 K), absolute.
    from_zero_kj_mol : shape (t,) or None
        H(T) - H(0).
    from_room_kj_mol : shape (t,)
        H(T) - H(298.15 K).
    entropy_j_mol_k, heat_capacity_j_mol_k : shape (t,)
    gibbs_kj_mol : shape (t,)
        Absolute.
    gibbs_function_j_mol_k : shape (t,)
        -(G(T) - H(298.15 K))/T.
    low_modes : str
    standard_state : StandardState
    findings : tuple of Finding
    """

    name: str
    kind: Kind
    temperature_k: FloatArray
    zero_enthalpy_kj_mol: float | None
    room_enthalpy_kj_mol: float
    from_zero_kj_mol: FloatArray | None
    from_room_kj_mol: FloatArray
    entropy_j_mol_k: FloatArray
    heat_capacity_j_mol_k: FloatArray
    gibbs_kj_mol: FloatArray
    gibbs_function_j_mol_k: FloatArray
    low_modes: LowModes
    standard_state: StandardState
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        for item in fields(self):
            value = getattr(self, item.name)
            if isinstance(value, np.ndarray):
                value.flags.writeable = False

    def table(self) -> pd.DataFrame:
        """Return one row a temperature; H(T) - H(0) is nan where it is not known."""
        import pandas as pd

        zero = self.from_zero_kj_mol
        return pd.DataFrame(
            {
                "species": self.name,
                "temperature_k": self.temperature_k,
                "heat_capacity_j_mol_k": self.heat_capacity_j_mol_k,
                "entropy_j_mol_k": self.entropy_j_mol_k,
                "gibbs_function_j_mol_k": self.gibbs_function_j_mol_k,
                "from_room_kj_mol": self.from_room_kj_mol,
                "from_zero_kj_mol": np.nan if zero is None else zero,
                "gibbs_kj_mol": self.gibbs_kj_mol,
            }
        )

    def _repr_html_(self) -> str:
        return shown(self.table())


def functions(
    model: SpeciesModel,
    temperature_k: ArrayLike,
    *,
    low_modes: LowModes | None = None,
    standard_state: StandardState | None = None,
) -> Functions:
    """Return the thermodynamic functions of a species.

    Parameters
    ----------
    model : SpeciesModel
        Read, declared, or an ensemble.
    temperature_k : shape (t,) or ()
        K, above 0.
    low_modes, standard_state
        In place of the treatment's own.
    """
    t = np.atleast_1d(np.asarray(temperature_k, dtype=np.float64))
    here = model.at(t, low_modes=low_modes, standard_state=standard_state)
    room = model.at(DEFAULT_TEMPERATURE_K, low_modes=low_modes, standard_state=standard_state)
    start = float(room.enthalpy_kj_mol[0])
    zero = None
    if here.electronic_kj_mol is not None and here.zero_point_kj_mol is not None:
        zero = here.electronic_kj_mol + here.zero_point_kj_mol
    return Functions(
        name=model.name,
        kind=model.kind,
        temperature_k=t,
        zero_enthalpy_kj_mol=zero,
        room_enthalpy_kj_mol=start,
        from_zero_kj_mol=None if zero is None else here.enthalpy_kj_mol - zero,
        from_room_kj_mol=here.enthalpy_kj_mol - start,
        entropy_j_mol_k=here.entropy_j_mol_k,
        heat_capacity_j_mol_k=here.heat_capacity_j_mol_k,
        gibbs_kj_mol=here.gibbs_kj_mol,
        gibbs_function_j_mol_k=-1000.0 * (here.gibbs_kj_mol - start) / t,
        low_modes=here.low_modes,
        standard_state=here.standard_state,
        findings=here.findings,
    )
