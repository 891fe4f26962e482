"""What is said of competing products: the question, and the fields of its answer."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding
from thermo_pp.kinetics.results import Window, freeze_arrays
from thermo_pp.names import SelectivityKind
from thermo_pp.rich import shown

if TYPE_CHECKING:
    import pandas as pd

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class SelectivityQuestion:
    """Which products to compare.

    Attributes
    ----------
    products : tuple of str
        The first one is compared with each other.
    kind : {"products", "enantiomeric", "diastereomeric", "isotopic"}
    where : str
        For messages.
    """

    products: tuple[str, ...]
    kind: SelectivityKind = "products"
    where: str = "selectivity"


@dataclass(frozen=True, eq=False)
class CurtinHammett:
    """The ratio that the saddle points before the two products would give alone.

    Attributes
    ----------
    saddles_over : tuple of pairs of str
        The lowest saddle before each of the two products, over temperature.
    ratio : shape (t,)
    over_exact : shape (t,)
        To the exact ratio.
    windows : tuple of Window
        Of temperature, in which it is within 5 %.
    """

    saddles_over: tuple[tuple[str, str], ...]
    ratio: FloatArray
    over_exact: FloatArray
    windows: tuple[Window, ...]

    def __post_init__(self) -> None:
        freeze_arrays(self)


@dataclass(frozen=True, eq=False)
class ProductRatio:
    """One product over another.

    Attributes
    ----------
    product, other : str
    ratio : shape (t,)
        Of their net rates of formation; negative where one of them is used up.
    excess : shape (t,)
        (r1 - r2)/(r1 + r2).
    enthalpy_kj_mol : shape (t,)
        Difference of the two Arrhenius energies, R T^2 d ln(r1/r2)/dT.
    entropy_j_mol_k, gibbs_kj_mol : shape (t,)
        R ln(r1/r2) + H/T, and -R T ln(r1/r2).
    control : mapping of str to shape (t,)
        d ln(r1/r2)/d(-G/RT) of every saddle point and species.
    saddles : tuple of str
        The keys of `control` that are saddle points.
    curtin_hammett : CurtinHammett or None
        None in a driven network.
    """

    product: str
    other: str
    ratio: FloatArray
    excess: FloatArray
    enthalpy_kj_mol: FloatArray
    entropy_j_mol_k: FloatArray
    gibbs_kj_mol: FloatArray
    control: Mapping[str, FloatArray]
    saddles: tuple[str, ...]
    curtin_hammett: CurtinHammett | None

    def __post_init__(self) -> None:
        freeze_arrays(self)


@dataclass(frozen=True, eq=False)
class Selectivity:
    """How the products of a mechanism compete.

    Attributes
    ----------
    temperature_k : shape (t,)
    kind : {"products", "enantiomeric", "diastereomeric", "isotopic"}
    rates : mapping of str to shape (t,)
        Net formation of each product, s^-1: per free reactant, or per catalyst.
    ratios : tuple of ProductRatio
        The first product over each other.
    words : tuple of str
        A sentence each.
    findings : tuple of Finding
    """

    temperature_k: FloatArray
    kind: SelectivityKind
    rates: Mapping[str, FloatArray]
    ratios: tuple[ProductRatio, ...]
    words: tuple[str, ...] = ()
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        object.__setattr__(self, "rates", MappingProxyType(dict(self.rates)))
        freeze_arrays(self)

    def table(self) -> pd.DataFrame:
        """Return one row a ratio and temperature, as plain numbers."""
        import pandas as pd

        rows: list[dict[str, Any]] = []
        for one in self.ratios:
            for k, temperature in enumerate(self.temperature_k):
                rows.append(
                    {
                        "product": one.product,
                        "other": one.other,
                        "temperature_k": temperature,
                        "ratio": one.ratio[k],
                        "excess": one.excess[k],
                        "enthalpy_kj_mol": one.enthalpy_kj_mol[k],
                        "entropy_j_mol_k": one.entropy_j_mol_k[k],
                        "gibbs_kj_mol": one.gibbs_kj_mol[k],
                        "curtin_hammett": None
                        if one.curtin_hammett is None
                        else one.curtin_hammett.ratio[k],
                    }
                )
        return pd.DataFrame(rows)

    def _repr_html_(self) -> str:
        return shown(self.table())
