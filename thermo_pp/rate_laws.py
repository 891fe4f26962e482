"""Rate laws: what a step may say of its rate beside a saddle point, as names and numbers."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Literal

from thermo_pp.names import Broadening

Arrhenius = tuple[float, float, float]
"""(A, n, E): k = A (T/298.15 K)^n exp(-E/RT), A in L, mol and s, E in kJ/mol."""


@dataclass(frozen=True)
class Height:
    """How high the saddle of a step stands whose saddle point is not located.

    Attributes
    ----------
    kj_mol : float
        Free energy above the side that it counts from, at 1 mol/L, the same at every temperature.
    above : {"higher", "left"}
        Counted from the side that is higher in free energy at each temperature, or from the left.
    deviation_kj_mol : float or None
        Standard deviation of the height.
    scan : str or None
        Where the maximum of a scan stands: its file, or file and line.
    """

    kj_mol: float
    above: Literal["higher", "left"] = "higher"
    deviation_kj_mol: float | None = None
    scan: str | None = None


@dataclass(frozen=True)
class Falloff:
    """A declared rate constant between its limits of low and high pressure.

    Attributes
    ----------
    low : tuple
        (A, n, E) of the limit at low pressure, which is of one order more.
    high : tuple
        (A, n, E) of the limit at high pressure.
    broadening : one of `names.BROADENINGS`
    centre : tuple of float
        F_cent, or (a, T3, T1) or (a, T3, T1, T2) of its dependence on temperature; empty for
        Lindemann.
    collider : mapping of str to float
        Species and their efficiencies; ``"M"`` is the whole gas.
    """

    low: Arrhenius
    high: Arrhenius
    broadening: Broadening
    centre: tuple[float, ...]
    collider: Mapping[str, float]

    def __post_init__(self) -> None:
        object.__setattr__(self, "collider", MappingProxyType(dict(self.collider)))


@dataclass(frozen=True)
class Crossing:
    """How likely the spin state changes at a crossing point.

    Attributes
    ----------
    transmission : float or None
        Declared probability, the same at every temperature; None: by Landau and Zener.
    coupling_j : float
        Spin-orbit coupling of one molecule.
    across : tuple of float or None
        Declared size of the difference of the gradients, N, and reduced mass along it, kg; None: those
        of the crossing point.
    """

    transmission: float | None
    coupling_j: float = 0.0
    across: tuple[float, float] | None = None
