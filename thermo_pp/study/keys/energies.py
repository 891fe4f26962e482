"""The keys of an electronic energy, and of a named level of theory."""

from __future__ import annotations

from typing import Annotated, Literal

from msgspec import UNSET, Meta, UnsetType

from thermo_pp.names import Reference
from thermo_pp.study.keys.base import Keys, Positive, Quantity, Whole


class SumKeys(Keys, frozen=True, kw_only=True):
    """One single point of a sum."""

    file: Annotated[str, Meta(description="output at the geometry of the frequency job")]
    method: Annotated[
        str | UnsetType,
        Meta(
            description='which energy of the file: "HF", "MP2", "CCSD(T)"; its best one unless '
            "given"
        ),
    ] = UNSET
    factor: Annotated[float, Meta(description="sign and factor; those of a sum add up to 1")] = 1.0


class ExtrapolateKeys(Keys, frozen=True, kw_only=True):
    """Reference and correlation energy at the limit of the basis set, from two outputs."""

    files: Annotated[
        tuple[str, str],
        Meta(description="outputs of one correlated method, that in the smaller basis set first"),
    ]
    method: Annotated[
        str | UnsetType, Meta(description="which energy of the files; their best one unless given")
    ] = UNSET
    correlation: Annotated[
        Literal["X^-3"] | Positive,
        Meta(
            description='how the correlation energy falls off with the cardinal number: "X^-3", or '
            "another power as a number: 2.4 is X^-2.4"
        ),
    ]
    reference: Annotated[
        Reference,
        Meta(
            description='how the Hartree-Fock energy falls off: "exp(-1.63 X)" or '
            '"(X+1) exp(-9 sqrt X)"; "largest": that of the larger basis set is taken'
        ),
    ]
    cardinals: Annotated[
        tuple[Whole, Whole] | UnsetType,
        Meta(
            description="cardinal numbers of the files, needed unless the basis sets are "
            "correlation-consistent and named"
        ),
    ] = UNSET


class SolvationKeys(Keys, frozen=True, kw_only=True):
    """Free energy from gas to solution: from two outputs at one geometry, or declared."""

    solvent: Annotated[
        str | UnsetType,
        Meta(description="output with the solvent model; this and `gas`, or `value`"),
    ] = UNSET
    gas: Annotated[str | UnsetType, Meta(description="output without it, else alike")] = UNSET
    value: Annotated[
        Quantity | UnsetType, Meta(description="a declared free energy of solvation / kJ/mol")
    ] = UNSET
    gas_state: Annotated[
        str | UnsetType,
        Meta(
            description='standard state of the gas that `value` starts from, "1 bar" or "1 mol/L"; '
            "it ends at 1 mol/L; required with `value`"
        ),
    ] = UNSET
    slope: Annotated[
        Quantity | UnsetType,
        Meta(description="temperature derivative of the term; a finding without it / J/mol/K"),
    ] = UNSET
    temperature: Annotated[
        Quantity | UnsetType,
        Meta(description="where the term holds, 298.15 K unless given / K"),
    ] = UNSET


class FragmentKeys(Keys, frozen=True, kw_only=True):
    """One fragment of a complex, for its counterpoise term."""

    atoms: Annotated[
        list[Whole],
        Meta(
            min_length=1,
            description="atoms of the complex (from 1, in the order of its frequency job)",
        ),
    ]
    own: Annotated[str, Meta(description="output of the fragment alone, as it is in the complex")]
    ghosts: Annotated[
        str, Meta(description="the same with the basis functions of the whole complex")
    ]


class EnergyKeys(Keys, frozen=True, kw_only=True):
    """An electronic energy of several parts."""

    sum: Annotated[
        Annotated[list[SumKeys], Meta(min_length=1)] | UnsetType,
        Meta(
            description='single points with their factors, `[{ file = "a.out" }, '
            '{ file = "b.out", factor = -1 }, ...]`',
        ),
    ] = UNSET
    extrapolate: Annotated[
        ExtrapolateKeys | UnsetType,
        Meta(description="limit of the basis set from two outputs; it counts as factor 1"),
    ] = UNSET
    solvation: Annotated[
        SolvationKeys | UnsetType,
        Meta(description="free energy of solvation, 1 mol/L to 1 mol/L; in solution only"),
    ] = UNSET
    counterpoise: Annotated[
        Quantity | list[FragmentKeys] | UnsetType,
        Meta(
            description="of a complex: its fragments, or a declared value, which is added / kJ/mol"
        ),
    ] = UNSET


class LevelKeys(Keys, frozen=True, kw_only=True):
    """A named level of theory: an energy for every species that is read."""

    energy: Annotated[
        str | EnergyKeys | UnsetType,
        Meta(
            description="as in `[species.NAME]`, for every species: `{frequencies}` in a file name "
            "stands for the species' frequency job without its ending, `{species}` for its name"
        ),
    ] = UNSET
    energies: Annotated[
        dict[str, str | EnergyKeys],
        Meta(description="as in `[species.NAME]`, by species; before `energy`"),
    ] = {}
