"""The keys of ``[treatment]``."""

from __future__ import annotations

from typing import Annotated, Literal

from msgspec import UNSET, Meta, UnsetType

from thermo_pp.names import (
    DEFAULT_LOW_MODES,
    DEFAULT_ONSET_CM,
    DEFAULT_STANDARD_STATE,
    Duplicates,
    LowModes,
    Masses,
    Phase,
    Rotor,
    Tunnelling,
)
from thermo_pp.study.keys.base import Keys, Positive, Quantity


class RealBelowKeys(Keys, frozen=True, kw_only=True):
    """What is done with a small imaginary mode."""

    real_below: Annotated[
        Quantity, Meta(description="imaginary modes smaller than this are taken as real / cm^-1")
    ]


Imaginary = Literal["refuse"] | RealBelowKeys


class TreatmentKeys(Keys, frozen=True, kw_only=True):
    """How a structure becomes H, S and G."""

    standard_state: Annotated[
        str, Meta(description='a pressure or a concentration: "1 bar", "1 atm", "1 mol/L"')
    ] = DEFAULT_STANDARD_STATE
    phase: Annotated[Phase, Meta(description='"gas" or "solution"')] = "gas"
    low_modes: Annotated[
        LowModes,
        Meta(
            description='soft modes: "harmonic", "raised", "rotor-entropy" or "rotor-enthalpy"',
        ),
    ] = DEFAULT_LOW_MODES
    onset: Annotated[
        Quantity, Meta(description="where the treatment of soft modes sets in / cm^-1")
    ] = f"{DEFAULT_ONSET_CM:g} cm^-1"
    rotor: Annotated[
        Rotor,
        Meta(
            description='"auto": quantum rotor where that changes G by more than 0.01 kJ/mol; '
            '"classical": never'
        ),
    ] = "auto"
    masses: Annotated[
        Masses, Meta(description='"program": those the calculation used; "average": of the element')
    ] = "program"
    imaginary: Annotated[
        Imaginary,
        Meta(
            description="imaginary modes that should not be there: refused, or "
            '`{ real_below = "30 cm^-1" }` takes smaller ones as real'
        ),
    ] = "refuse"
    frequency_scale: Annotated[
        Positive, Meta(description="factor of the wavenumbers in thermal terms")
    ] = 1.0
    zero_point_scale: Annotated[
        Positive | UnsetType,
        Meta(
            description="factor of the wavenumbers in the zero-point energy; "
            "the same as `frequency_scale` unless given",
        ),
    ] = UNSET
    tunnelling: Annotated[
        Tunnelling,
        Meta(description="of every step with a saddle point that does not say it itself"),
    ] = "none"
    tunnelling_scale: Annotated[
        Positive | UnsetType,
        Meta(
            description="factor of the imaginary wavenumber in tunnelling; "
            "the same as `frequency_scale` unless given",
        ),
    ] = UNSET
    enantiopure: Annotated[
        bool, Meta(description="true: only one hand of every chiral structure is present")
    ] = False
    entropy_correction: Annotated[
        Quantity | UnsetType,
        Meta(
            description="in solution only: added to the entropy of every species that is read; "
            "none unless given / J/mol/K"
        ),
    ] = UNSET
    duplicates: Annotated[
        Duplicates,
        Meta(
            description='a conformer that is listed twice: "count" it twice, with a finding, or "once"'
        ),
    ] = "count"
