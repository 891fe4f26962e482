"""What a map of regimes holds: which approximation, resting state and controlling state go with which conditions."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.results import WITHIN, SignChange, freeze_arrays
from thermo_pp.names import Definition
from thermo_pp.rich import shown

if TYPE_CHECKING:
    import pandas as pd

FloatArray = NDArray[np.float64]
IndexArray = NDArray[np.intp]
NOTHING = -1
"""In `RegimeMap.holding`: no approximation holds."""


@dataclass(frozen=True)
class RegimeQuestion:
    """Over which amount of which held species to look.

    Attributes
    ----------
    species : str
    form : {"concentration", "pressure"}
        As the species is held.
    low, high : float
        Ends of the range, mol/L or Pa; both above 0.
    points : int
        Of the map along the amount, even in its logarithm; at least 2.
    where : str
        Who asks, for messages.
    """

    species: str
    form: Literal["concentration", "pressure"]
    low: float
    high: float
    points: int
    where: str = "regimes"

    @property
    def unit(self) -> str:
        """Unit of the amounts."""
        return "mol/L" if self.form == "concentration" else "Pa"


@dataclass(frozen=True)
class AmountWindow:
    """A range of a held amount in which an approximation is within 5 % of the exact rate.

    Attributes
    ----------
    from_amount, to_amount : float
        Located to 0.1 %, or the end of the range looked at.
    open_below, open_above : bool
        The approximation still holds at that end of the range looked at.
    """

    from_amount: float
    to_amount: float
    open_below: bool
    open_above: bool


@dataclass(frozen=True, eq=False)
class RegimeMap:
    """One definition of the rate over t temperatures and c amounts.

    Attributes
    ----------
    definition : {"free", "pool", "cycle"}
    rate_constant : shape (t, c)
        s^-1.
    arrhenius_energy_kj_mol : shape (t, c)
    order : shape (t, c)
        In the species whose amount varies.
    approximations : tuple of str
        a of them, the one that is named first where several hold first.
    ratio : shape (a, t, c)
        To the exact rate constant.
    holding : shape (t, c), int
        The first of `approximations` within 5 %; `NOTHING` where none is.
    windows : mapping of str to tuple, over temperature, of tuple of AmountWindow
    saddles : tuple of str
    controlling : shape (t, c), int
        The one of `saddles` with the largest control in size.
    control : shape (t, c)
        Its control; nan where nothing controls the rate.
    states : tuple of str
        Of the pool or the catalyst; empty per free reactant.
    resting : shape (t, c), int, or None
        The most populated one of `states`.
    population : shape (t, c) or None
        Its share.
    sign_changes : tuple, over the amounts, of tuple of SignChange
        The contour on which the Arrhenius energy is 0.
    """

    definition: Definition
    rate_constant: FloatArray
    arrhenius_energy_kj_mol: FloatArray
    order: FloatArray
    approximations: tuple[str, ...]
    ratio: FloatArray
    holding: IndexArray
    windows: Mapping[str, tuple[tuple[AmountWindow, ...], ...]]
    saddles: tuple[str, ...]
    controlling: IndexArray
    control: FloatArray
    states: tuple[str, ...]
    resting: IndexArray | None
    population: FloatArray | None
    sign_changes: tuple[tuple[SignChange, ...], ...]

    def __post_init__(self) -> None:
        object.__setattr__(self, "windows", MappingProxyType(dict(self.windows)))
        freeze_arrays(self)

    def holds(self, name: str) -> NDArray[np.bool_]:
        """Whether an approximation is within 5 %, shape (t, c)."""
        ratio = self.ratio[self.approximations.index(name)]
        return np.asarray(np.abs(ratio - 1.0) <= WITHIN)

    def holding_name(self, row: int, column: int) -> str | None:
        """Return the approximation that is named at one point of the map, None where none holds."""
        k = int(self.holding[row, column])
        return None if k == NOTHING else self.approximations[k]

    def resting_name(self, row: int, column: int) -> str | None:
        """Return the resting state at one point of the map."""
        return None if self.resting is None else self.states[int(self.resting[row, column])]

    def controlling_name(self, row: int, column: int) -> str | None:
        """Return the controlling saddle at one point of the map, None where nothing controls the rate."""
        if np.isnan(self.control[row, column]):
            return None
        return self.saddles[int(self.controlling[row, column])]


@dataclass(frozen=True, eq=False)
class Regimes:
    """The regimes of a mechanism over temperature and one held amount.

    Attributes
    ----------
    temperature_k : shape (t,)
    species : str
        Whose amount varies.
    amount : shape (c,)
        In `unit`.
    unit : {"mol/L", "Pa"}
    maps : mapping of {"free", "pool", "cycle"} to RegimeMap
        Those that apply.
    words : tuple of str
        A sentence each.
    """

    temperature_k: FloatArray
    species: str
    amount: FloatArray
    unit: str
    maps: Mapping[Definition, RegimeMap]
    words: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        object.__setattr__(self, "maps", MappingProxyType(dict(self.maps)))
        freeze_arrays(self)

    def table(self) -> pd.DataFrame:
        """Return one row a definition, temperature and amount, as plain numbers and names."""
        import pandas as pd

        rows: list[dict[str, Any]] = []
        for definition, one in self.maps.items():
            for i, temperature in enumerate(self.temperature_k):
                for j, amount in enumerate(self.amount):
                    rows.append(
                        {
                            "definition": definition,
                            "temperature_k": temperature,
                            "species": self.species,
                            "amount": amount,
                            "unit": self.unit,
                            "rate_constant": one.rate_constant[i, j],
                            "arrhenius_energy_kj_mol": one.arrhenius_energy_kj_mol[i, j],
                            "order": one.order[i, j],
                            "approximation": one.holding_name(i, j),
                            "controlling": one.controlling_name(i, j),
                            "control": one.control[i, j],
                            "resting": one.resting_name(i, j),
                            "population": np.nan
                            if one.population is None
                            else one.population[i, j],
                        }
                    )
        return pd.DataFrame(rows)

    def _repr_html_(self) -> str:
        return shown(self.table())
