"""The keys of ``[conditions]``."""

from __future__ import annotations

from typing import Annotated

from msgspec import UNSET, Meta, UnsetType

from thermo_pp.names import Constant
from thermo_pp.study.keys.base import Keys, Quantity


class RangeKeys(Keys, frozen=True, kw_only=True, rename={"from_": "from"}):
    """A range of temperatures."""

    from_: Annotated[Quantity, Meta(description="first temperature / K")]
    to: Annotated[Quantity, Meta(description="last temperature, included / K")]
    step: Annotated[
        Quantity, Meta(description="width, which must divide the range; kelvin only / K")
    ]


Temperatures = Annotated[list[Quantity], Meta(min_length=1)] | RangeKeys


class FlowKeys(Keys, frozen=True, kw_only=True):
    """A stirred tank that flows."""

    residence_time: Annotated[Quantity, Meta(description="residence time / s")]
    feed: Annotated[
        dict[str, str],
        Meta(
            min_length=1, description="species -> concentration or partial pressure that flows in"
        ),
    ]


class ConditionsKeys(Keys, frozen=True, kw_only=True):
    """Temperatures, and what is held constant."""

    temperatures: Annotated[
        Temperatures | UnsetType,
        Meta(
            description="a list, its order kept, each once, or a range `{ from, to, step }`; "
            "required unless the command line gives temperatures / K"
        ),
    ] = UNSET
    held: Annotated[
        dict[str, str],
        Meta(
            description="species -> free concentration that stays constant: a concentration, "
            'a partial pressure or a mole fraction ("400 ppm", "21 %", "0.21 mol/mol"; gas only), '
            '"pH 7", electrons at a potential ("-0.4 V"), or "equilibrium" with those held at '
            "stated values"
        ),
    ] = {}
    total_pressure: Annotated[
        Quantity | UnsetType,
        Meta(description="of the whole gas; mole fractions and the collider M need it / Pa"),
    ] = UNSET
    constant: Annotated[
        Constant | UnsetType,
        Meta(
            description='"concentration" or "pressure": what of a gas stays when the temperature '
            "changes; the form in which each amount is stated unless given"
        ),
    ] = UNSET
    stated_at: Annotated[
        Quantity | UnsetType,
        Meta(
            description="the temperature at which amounts hold that are stated in the other form "
            "than `constant` / K"
        ),
    ] = UNSET
    driven: Annotated[
        bool, Meta(description="true: held species may be out of balance with each other")
    ] = False
    initial: Annotated[
        dict[str, str],
        Meta(
            description="species -> concentration or partial pressure at the start of a time course "
            "(`barrier --time`); what is not named is not there"
        ),
    ] = {}
    total: Annotated[
        dict[str, str],
        Meta(
            description="catalyst -> concentration of all its forms together, needed where some hold "
            "it twice (dimers) or meet each other"
        ),
    ] = {}
    flow: Annotated[
        FlowKeys | UnsetType,
        Meta(description="a stirred tank that flows: its steady state is worked out"),
    ] = UNSET
    quasi_steady: Annotated[
        list[str],
        Meta(description="species whose quasi-steady state is set beside the time course"),
    ] = []
