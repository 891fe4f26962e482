"""The keys of rate constants without a located saddle point: declared, scanned, or of a crossing."""

from __future__ import annotations

from typing import Annotated

from msgspec import UNSET, Meta, UnsetType

from thermo_pp.names import Broadening
from thermo_pp.study.keys.base import Keys, Positive, Quantity


class ArrheniusKeys(Keys, frozen=True, kw_only=True):
    """A declared rate constant that depends on temperature: k = A (T/298.15 K)^n exp(-E/RT)."""

    A: Annotated[str, Meta(description="factor, in the unit of the rate constant")]
    n: Annotated[float, Meta(description="power of T/298.15 K")] = 0.0
    E: Annotated[Quantity, Meta(description="energy, may be negative / kJ/mol")]


class ScanKeys(Keys, frozen=True, kw_only=True):
    """The maximum of a scan as the height of a saddle that is not located."""

    scan: Annotated[
        str | Annotated[list[str], Meta(min_length=3)],
        Meta(
            description="outputs, the left side of the step first, or a table (CSV) with a column "
            '"energy / kJ mol^-1"'
        ),
    ]


class FalloffKeys(Keys, frozen=True, kw_only=True):
    """A declared forward rate constant between its limits of low and high pressure."""

    low: Annotated[
        ArrheniusKeys, Meta(description="limit at low pressure, of one order more, as `arrhenius`")
    ]
    high: Annotated[ArrheniusKeys, Meta(description="limit at high pressure, as `arrhenius`")]
    form: Annotated[
        Broadening,
        Meta(
            description='"lindemann" (no centre), "troe" (c = -0.4 - 0.67 log F), "iupac" '
            '(log F/(1 + (log P/N)^2)) or "jpl" (log F/(1 + (log P)^2))'
        ),
    ]
    centre: Annotated[
        float | list[Quantity] | UnsetType,
        Meta(
            description="F_cent, or `[a, T3, T1]` or `[a, T3, T1, T2]` of its dependence on "
            "temperature; required but for lindemann"
        ),
    ] = UNSET
    collider: Annotated[
        str | Annotated[dict[str, Positive], Meta(min_length=1)],
        Meta(
            description='"M" for the whole gas (`total_pressure`), a held species, or efficiencies, '
            "`{ N2 = 1, W = 6 }`"
        ),
    ]


class LandauZenerKeys(Keys, frozen=True, kw_only=True):
    """What the probability to change the spin state follows from."""

    spin_orbit: Annotated[Quantity, Meta(description="spin-orbit coupling at the crossing / cm^-1")]
    gradient_difference: Annotated[
        str | UnsetType,
        Meta(
            description='size of the difference of the gradients, "0.05 hartree/bohr"; that of the '
            "crossing point's `seam` unless given"
        ),
    ] = UNSET
    reduced_mass: Annotated[
        str | UnsetType,
        Meta(
            description='reduced mass along it, "12 u"; that of the crossing point\'s `seam` unless given'
        ),
    ] = UNSET


class CrossingKeys(Keys, frozen=True, kw_only=True):
    """How likely a step changes the spin state at its crossing point."""

    transmission: Annotated[
        Positive | UnsetType, Meta(description="declared probability, at most 1; this or the next")
    ] = UNSET
    landau_zener: Annotated[
        LandauZenerKeys | UnsetType,
        Meta(description="probability by Landau and Zener, averaged over thermal energies"),
    ] = UNSET
