"""The keys of what is asked of a study: effective rates, doubt, isotopes, paths, formation, regimes."""

from __future__ import annotations

from typing import Annotated

from msgspec import UNSET, Meta, UnsetType

from thermo_pp.names import SelectivityKind
from thermo_pp.study.keys.base import Correlation, Keys, Quantity


class CorrelationKeys(Keys, frozen=True, kw_only=True):
    """Correlation of the errors of the energies, from -1 to 1."""

    same_kind: Annotated[
        Correlation,
        Meta(description="of minima with each other, and of saddle points with each other"),
    ] = 0.0
    across: Annotated[Correlation, Meta(description="of minima with saddle points")] = 0.0


class DoubtKeys(Keys, frozen=True, kw_only=True):
    """How sure the energies are; with this table `barrier` shows the doubt about every answer."""

    deviation: Annotated[
        Quantity, Meta(description="standard deviation of the energies of minima / kJ/mol")
    ]
    saddle_deviation: Annotated[
        Quantity | UnsetType,
        Meta(description="of those of saddle points; the same unless given / kJ/mol"),
    ] = UNSET
    correlation: Annotated[
        CorrelationKeys,
        Meta(description="`{ same_kind = 0.5, across = 0.3 }`; 0 unless given"),
    ] = CorrelationKeys()
    pairs: Annotated[
        list[tuple[str, str, Correlation]],
        Meta(
            description='correlation of two energies in place of that of their kinds: `[["A", "TS1", '
            "0.9], ...]`; a step with a height in `barrier` goes under its equation"
        ),
    ] = []
    samples: Annotated[
        Annotated[int, Meta(ge=100, le=1_000_000)],
        Meta(description="how many sets of energies are drawn, 100 to 1000000"),
    ] = 10_000
    seed: Annotated[
        Annotated[int, Meta(ge=0)],
        Meta(description="of the random numbers: the same seed gives the same answer"),
    ] = 1
    alternatives: Annotated[
        bool,
        Meta(
            description="whether every named level of theory and every other choice of treatment is "
            "shown beside"
        ),
    ] = True


class EffectiveKeys(Keys, frozen=True, kw_only=True):
    """The question: from which species to which."""

    reactant: Annotated[
        str | UnsetType, Meta(description="whose loss is asked for; this or `catalyst`")
    ] = UNSET
    catalyst: Annotated[
        str | UnsetType, Meta(description="whose turnover frequency is asked for")
    ] = UNSET
    product: Annotated[
        str | Annotated[list[str], Meta(min_length=1)],
        Meta(description="what is made: one species, or a list"),
    ]
    at: Annotated[
        str | UnsetType,
        Meta(
            description="where the rate of a network that is not linear is asked for: `start`, a conversion "
            "of the reactant (`10 %`), or `steady state` (of the flow)"
        ),
    ] = UNSET
    rate_law: Annotated[
        dict[str, Annotated[int, Meta(ge=1)]],
        Meta(
            description="what that rate is divided by, so that it is a constant of this order: "
            "`{ A = 1, B = 1 }`; without it the rate is in mol/(L s)"
        ),
    ] = {}


class IsotopologueKeys(Keys, frozen=True, kw_only=True):
    """Isotopes that are put into the species of the study, for isotope effects."""

    all: Annotated[
        dict[str, str],
        Meta(description='element -> isotope, in every species that has it: `{ H = "D" }`'),
    ] = {}
    species: Annotated[
        dict[str, dict[str, str]],
        Meta(
            description="species -> atom (counted from 1) or element -> isotope: "
            '`species.W = { 2 = "D" }`; both sides and the saddle point of a step must hold the same'
        ),
    ] = {}


class PathKeys(Keys, frozen=True, kw_only=True):
    """A path of the profile; without any, paths are found from the steps."""

    name: Annotated[str, Meta(min_length=1, description="name of the path")]
    steps: Annotated[
        list[int],
        Meta(
            min_length=1,
            description="its steps, counted from 1, in their order; each is run in the direction "
            "that goes on, a negative number backward",
        ),
    ]


class ReferenceKeys(Keys, frozen=True, kw_only=True):
    """An enthalpy of formation that others are derived from."""

    enthalpy: Annotated[Quantity, Meta(description="enthalpy of formation / kJ/mol")]
    uncertainty: Annotated[
        Quantity | UnsetType, Meta(description="its standard uncertainty / kJ/mol")
    ] = UNSET
    temperature: Annotated[
        Quantity, Meta(description='where it holds: "0 K" or "298.15 K" / K')
    ] = "298.15 K"
    source: Annotated[str, Meta(description="where it is from; stands below the table")] = ""


class FormationKeys(Keys, frozen=True, kw_only=True):
    """Enthalpies of formation; the species named here need no step."""

    atoms: Annotated[
        list[str],
        Meta(
            description="species of this file that are atoms; their values come from the built-in "
            "table unless `reference` has them"
        ),
    ] = []
    atomization: Annotated[
        list[str] | UnsetType,
        Meta(
            description="species whose enthalpy of formation is derived from `atoms`; unless given, "
            "every neutral minimum that is read and made of them"
        ),
    ] = UNSET
    reactions: Annotated[
        list[str],
        Meta(
            description='balanced reactions, `"CH4 + H2O = CH3OH + H2"`, each with exactly one species '
            "without a reference value, which it gives"
        ),
    ] = []
    reference: Annotated[
        dict[str, ReferenceKeys],
        Meta(description="species -> known enthalpy of formation, `{ enthalpy, uncertainty }`"),
    ] = {}
    reaction_uncertainty: Annotated[
        Quantity | UnsetType,
        Meta(description="standard uncertainty of a computed reaction enthalpy / kJ/mol"),
    ] = UNSET
    spin_orbit: Annotated[
        bool,
        Meta(
            description="true: computed energies of `atoms` are means over their ground term, and the "
            "built-in levels bring them to the lowest level"
        ),
    ] = False


class RegimesKeys(Keys, frozen=True, kw_only=True, rename={"from_": "from"}):
    """The map of regimes over temperature and one held amount, for `barrier`."""

    over: Annotated[str, Meta(description="the held species whose amount varies")]
    from_: Annotated[
        Quantity,
        Meta(description="lower end; a number is in mol/L, of a species held at a pressure in Pa"),
    ]
    to: Annotated[Quantity, Meta(description="upper end")]
    points: Annotated[
        int, Meta(ge=2, description="points of the map along the amount, even in its logarithm")
    ] = 25


class SelectivityKeys(Keys, frozen=True, kw_only=True):
    """How products compete, for `barrier`."""

    products: Annotated[
        list[str],
        Meta(
            min_length=2,
            description="the products to compare, the first one over each other; unless given, all of "
            "`[effective] product`",
        ),
    ]
    kind: Annotated[
        SelectivityKind,
        Meta(
            description="what tells them apart; mirror images (`enantiomeric`) are looked at for being "
            "counted twice"
        ),
    ] = "products"
