"""The keys of ``[[steps]]``, a measured free energy among them."""

from __future__ import annotations

from typing import Annotated, Literal

from msgspec import UNSET, Meta, UnsetType

from thermo_pp.names import Tunnelling
from thermo_pp.study.keys.base import Keys, Pairs, Positive, Quantity
from thermo_pp.study.keys.rate_laws import ArrheniusKeys, CrossingKeys, FalloffKeys, ScanKeys


class ReactionKeys(Keys, frozen=True, kw_only=True):
    """A measured free energy of one step, in place of the computed one."""

    anchor: Annotated[
        str, Meta(description="the species of the step that is moved until the value is met")
    ]
    free_energy: Annotated[
        Quantity | UnsetType,
        Meta(description="free energy of the step; one of these four / kJ/mol"),
    ] = UNSET
    equilibrium_constant: Annotated[
        str | float | UnsetType,
        Meta(description='"1.7e-5 mol/L", "40 L/mol"; a number where both sides have as many'),
    ] = UNSET
    pKa: Annotated[float | UnsetType, Meta(description="of a step HA = A + H+, in solution")] = (
        UNSET
    )
    potential: Annotated[
        Quantity | UnsetType,
        Meta(
            description="redox potential of a step with electrons on its left side, in solution / V"
        ),
    ] = UNSET
    standard_state: Annotated[
        str | UnsetType,
        Meta(
            description='of `free_energy`, "1 bar" or "1 mol/L"; required where molecules are made'
        ),
    ] = UNSET
    temperature: Annotated[
        Quantity | UnsetType, Meta(description="where the value holds, 298.15 K unless given / K")
    ] = UNSET
    enthalpy: Annotated[
        Quantity | UnsetType,
        Meta(
            description="measured enthalpy of the step; without it the computed entropy stays / kJ/mol"
        ),
    ] = UNSET


class StepKeys(Keys, frozen=True, kw_only=True):
    """One reversible step: exactly one of `through`, `barrier`, `rate`, `arrhenius`, `falloff`."""

    equation: Annotated[
        str, Meta(description='what becomes what, `"SO3 + 2 W = C2"`, spaces around + and counts')
    ]
    through: Annotated[
        str | UnsetType, Meta(description="the saddle point, a species of this file")
    ] = UNSET
    barrier: Annotated[
        Quantity | ScanKeys | UnsetType,
        Meta(
            description='"none": the rate is the collision or diffusion limit of two molecules; or '
            "the height of a saddle that is not located, in free energy above the higher side at "
            '1 mol/L; or `{ scan = "scan.csv" }` / kJ/mol'
        ),
    ] = UNSET
    deviation: Annotated[
        Quantity | UnsetType,
        Meta(
            description="standard deviation of the height in `barrier`; in `[doubt]` that of saddle points "
            "unless given / kJ/mol"
        ),
    ] = UNSET
    rate: Annotated[
        str | UnsetType,
        Meta(
            description="forward rate constant, the same at all temperatures, in the unit that the "
            'left side asks for: "1e9 L/mol/s", "1e-11 cm^3/s", "5 s^-1"'
        ),
    ] = UNSET
    arrhenius: Annotated[
        ArrheniusKeys | UnsetType,
        Meta(
            description="forward rate constant A (T/298.15 K)^n exp(-E/RT): "
            '`{ A = "1e11 L/mol/s", n = 0.5, E = "-2 kJ/mol" }`'
        ),
    ] = UNSET
    falloff: Annotated[
        FalloffKeys | UnsetType,
        Meta(description="forward rate constant between two limits of pressure"),
    ] = UNSET
    viscosity: Annotated[
        Quantity | Pairs | UnsetType,
        Meta(
            description='viscosity for the diffusion limit in solution: "0.89 mPa s", or pairs of '
            "temperature and viscosity / Pa s",
        ),
    ] = UNSET
    permittivity: Annotated[
        Positive | Annotated[list[tuple[Quantity, Positive]], Meta(min_length=1)] | UnsetType,
        Meta(
            description="relative permittivity of the solvent, for two ions that meet: 78.4, or "
            "pairs of temperature and permittivity"
        ),
    ] = UNSET
    kind: Annotated[
        Literal["crossing"] | UnsetType,
        Meta(
            description='"crossing": the step changes the spin state at a minimum-energy crossing '
            "point, which `through` names; needs `crossing`"
        ),
    ] = UNSET
    crossing: Annotated[
        CrossingKeys | UnsetType,
        Meta(
            description='of a step of kind "crossing": `{ transmission = 0.01 }` or `landau_zener`'
        ),
    ] = UNSET
    reaction: Annotated[
        ReactionKeys | UnsetType,
        Meta(
            description="measured free energy of the step, `{ equilibrium_constant = 40, "
            'anchor = "C" }`'
        ),
    ] = UNSET
    tunnelling: Annotated[
        Tunnelling | UnsetType,
        Meta(
            description='"none", "wigner", or "eckart" with the heights from both sides of this '
            "step, zero-point energies included; as in `[treatment]` unless given"
        ),
    ] = UNSET
