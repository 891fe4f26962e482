"""What the effective rate of a mechanism is: the result fields that tables, JSON and words are made from."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, fields
from types import MappingProxyType
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding
from thermo_pp.names import Constant, Definition, Tunnelling

if TYPE_CHECKING:
    import pandas as pd

FloatArray = NDArray[np.float64]


def freeze_arrays(record: Any) -> None:
    """Replace every array of a frozen record, and of its mappings, by a read-only copy."""
    for one in fields(record):
        value = getattr(record, one.name)
        if isinstance(value, np.ndarray):
            object.__setattr__(record, one.name, _frozen(value))
        elif isinstance(value, Mapping) and any(isinstance(v, np.ndarray) for v in value.values()):
            frozen = {name: _frozen(array) for name, array in value.items()}
            object.__setattr__(record, one.name, MappingProxyType(frozen))


def _frozen(array: NDArray[Any]) -> NDArray[Any]:
    array = array.copy()
    array.flags.writeable = False
    return array


@dataclass(frozen=True)
class SignChange:
    """A temperature at which the Arrhenius energy changes its sign.

    Attributes
    ----------
    temperature_k : float
        Located to 0.01 K.
    kind : {"maximum", "minimum"}
        Of the rate: positive below and negative above is a maximum.
    """

    temperature_k: float
    kind: Literal["maximum", "minimum"]


@dataclass(frozen=True)
class Window:
    """A range of temperature in which an approximation is within 5 % of the exact rate.

    Attributes
    ----------
    from_k, to_k : float
        Located to 0.01 K, or the end of the range looked at.
    open_below, open_above : bool
        The approximation still holds at that end of the range looked at.
    """

    from_k: float
    to_k: float
    open_below: bool
    open_above: bool


@dataclass(frozen=True, eq=False)
class Approximation:
    """One approximation of a rate.

    Attributes
    ----------
    name : str
    rate_constant : shape (t,)
        In the unit of the rate it stands for.
    ratio : shape (t,)
        To the exact rate constant.
    windows : tuple of Window
    determining_saddle, determining_state : tuple of str or None
        Over temperature, where the approximation names them.
    """

    name: str
    rate_constant: FloatArray
    ratio: FloatArray
    windows: tuple[Window, ...]
    determining_saddle: tuple[str, ...] | None = None
    determining_state: tuple[str, ...] | None = None

    def __post_init__(self) -> None:
        freeze_arrays(self)

    def holds(self) -> NDArray[np.bool_]:
        """Whether the ratio is within 5 % at each temperature."""
        return np.asarray(np.abs(self.ratio - 1.0) <= WITHIN)


WITHIN = 0.05
"""How far the ratio of an approximation may be from 1."""
SLOW_SHARE_BELOW = 0.95
"""Share of the slowest decay below which the pool does not decay with one constant."""
NEXT_DECAY_BELOW = 20.0
"""The same for the ratio of the next decay constant to the slowest."""
NOTABLE = 0.05
"""Relative difference of two definitions that is worth a finding and a sentence."""


@dataclass(frozen=True, eq=False)
class Activation:
    """Activation quantities in one convention.

    Attributes
    ----------
    enthalpy_kj_mol, entropy_j_mol_k, gibbs_kj_mol : shape (t,)
        nan where they are not defined.
    """

    enthalpy_kj_mol: FloatArray
    entropy_j_mol_k: FloatArray
    gibbs_kj_mol: FloatArray

    def __post_init__(self) -> None:
        freeze_arrays(self)


@dataclass(frozen=True, eq=False)
class Rate:
    """One definition of the effective rate over temperature.

    Attributes
    ----------
    definition : {"free", "pool", "relaxation", "cycle"}
    rate_constant : shape (t,)
        Negative where the net reaction runs backwards.
    unit : str
        s^-1, pseudo-first order at the held concentrations.
    arrhenius_energy_kj_mol : shape (t,)
        R T^2 d ln k/dT under the conditions as held.
    activation : Activation
        Of the pseudo-first-order constant.
    standard_activation : Activation or None
        Against the standard state, where every order is within 0.02 of a whole number; None where
        that is nowhere so.
    sign_changes : tuple of SignChange
    control : mapping of str to shape (t,)
        d ln k/d(-G/RT) of every saddle point (a step without one under its equation) and species.
    saddles : tuple of str
        The keys of `control` that are saddle points.
    orders : mapping of str to shape (t,)
        In the species held at a stated amount.
    approximations : tuple of Approximation
    sign_shift_kj_mol : mapping of str to shape (t,)
        By how much the energy of a controlling state would have to move to bring the Arrhenius
        energy to zero; nan where no move of less than 100 kJ/mol does.
    populations : mapping of str to shape (t,), or None
        Pool: share of each member while it decays. Cycle: share of the catalyst.
    resting_state : tuple of str or None
        The largest of `populations` at each temperature.
    slow_share, next_decay_ratio, inverse_mean_time, headline : shape (t,) or None
        Pool only; see docs/methods.md. `next_decay_ratio` is nan in a pool of one.
    branching : mapping of str to shape (t,), or None
        Where several products compete: per pool the share of each in the decay, per free reactant
        its net formation over the rate.
    log_tunnelling : shape (t,) or None
        ln of the rate constant over the one without tunnelling; None where no step tunnels.
    tunnelling_energy_kj_mol : shape (t,) or None
        Tunnelling's share in the Arrhenius energy.
    catalyst_order : shape (t,) or None
        Where the balance of the catalyst is not linear: d ln(rate)/d ln(total catalyst), the rate
        being turnover frequency times total.
    arrhenius_energy_constant_kj_mol : mapping of {"concentration", "pressure"} to shape (t,)
        The Arrhenius energy at constant concentrations and at constant pressures of a gas, at the
        amounts of each temperature; empty in solution and where nothing is held.
    collider_orders : mapping of str to shape (t,)
        d ln k/d ln c of the colliders of fall-off steps, as far as they act as such.
    log_limit, limit_energy_kj_mol : shape (t,) or None
        What the limits of encounter that are joined with a saddle add to ln k and to the Arrhenius
        energy; None where none does.
    control_without_limit : mapping of str to shape (t,) or None
        `control` of the same rate without these limits.
    """

    definition: Definition
    rate_constant: FloatArray
    unit: str
    arrhenius_energy_kj_mol: FloatArray
    activation: Activation
    standard_activation: Activation | None
    sign_changes: tuple[SignChange, ...]
    control: Mapping[str, FloatArray]
    saddles: tuple[str, ...]
    orders: Mapping[str, FloatArray]
    approximations: tuple[Approximation, ...] = ()
    sign_shift_kj_mol: Mapping[str, FloatArray] = field(default_factory=dict)
    populations: Mapping[str, FloatArray] | None = None
    resting_state: tuple[str, ...] | None = None
    slow_share: FloatArray | None = None
    next_decay_ratio: FloatArray | None = None
    inverse_mean_time: FloatArray | None = None
    headline: FloatArray | None = None
    branching: Mapping[str, FloatArray] | None = None
    log_tunnelling: FloatArray | None = None
    tunnelling_energy_kj_mol: FloatArray | None = None
    catalyst_order: FloatArray | None = None
    arrhenius_energy_constant_kj_mol: Mapping[str, FloatArray] = field(default_factory=dict)
    collider_orders: Mapping[str, FloatArray] = field(default_factory=dict)
    log_limit: FloatArray | None = None
    limit_energy_kj_mol: FloatArray | None = None
    control_without_limit: Mapping[str, FloatArray] | None = None

    def __post_init__(self) -> None:
        freeze_arrays(self)


@dataclass(frozen=True, eq=False)
class StepRate:
    """One step's own rate constants.

    Attributes
    ----------
    equation : str
    forward_rate_constant, reverse_rate_constant : shape (t,)
        (mol/L)^(1-m) s^-1, m species on the side that it starts from.
    forward_unit, reverse_unit : str
    reversibility : shape (t,)
        The smaller over the larger one-way flux in the steady state; nan where the step carries
        none.
    limited : shape (t,), bool
        Whether the collision or diffusion limit has more than half a share.
    tunnelling : {"none", "wigner", "eckart"}
    log_transmission : shape (t,)
        ln of the probability to change the spin state at a crossing; 0 elsewhere.
    log_tunnelling : shape (t,)
        ln of the factor of the saddle point's rate constant, before a limit is joined.
    tunnelling_energy_kj_mol : shape (t,)
        Its share in the Arrhenius energy.
    """

    equation: str
    forward_rate_constant: FloatArray
    reverse_rate_constant: FloatArray
    forward_unit: str
    reverse_unit: str
    reversibility: FloatArray
    limited: NDArray[np.bool_]
    tunnelling: Tunnelling
    log_transmission: FloatArray
    log_tunnelling: FloatArray
    tunnelling_energy_kj_mol: FloatArray

    def __post_init__(self) -> None:
        freeze_arrays(self)


@dataclass(frozen=True, eq=False)
class EffectiveRate:
    """The effective rate of a mechanism, exact and approximate, over temperature.

    Attributes
    ----------
    temperature_k : shape (t,)
    subject : str
        The reactant or the catalyst.
    net_reaction : str
        ``"SO3 + W = acid"``; empty where no constant describes the network.
    reactant_coefficient : int
        Loss of the reactant over the rate.
    standard_state : str
    rates : mapping of {"free", "pool", "relaxation", "cycle"} to Rate or None
        None where the definition does not apply.
    steps : tuple of StepRate
    held_mol_l : mapping of str to shape (t,)
        Free concentrations of the held species, equilibrium ones included.
    constant : {"concentration", "pressure"} or None
        What of a gas the study says stays when the temperature changes.
    words : tuple of str
        The closing paragraph, a sentence each.
    findings : tuple of Finding
    """

    temperature_k: FloatArray
    subject: str
    net_reaction: str
    reactant_coefficient: int
    standard_state: str
    rates: Mapping[Definition, Rate | None]
    steps: tuple[StepRate, ...]
    held_mol_l: Mapping[str, FloatArray]
    constant: Constant | None = None
    words: tuple[str, ...] = ()
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        freeze_arrays(self)

    def table(self) -> pd.DataFrame:
        """Return one row a definition and temperature, as plain numbers."""
        import pandas as pd

        rows: list[dict[str, Any]] = []
        for definition, rate in self.rates.items():
            if rate is None:
                continue
            for k, temperature in enumerate(self.temperature_k):
                rows.append(
                    {
                        "definition": definition,
                        "temperature_k": temperature,
                        "rate_constant": rate.rate_constant[k],
                        "unit": rate.unit,
                        "arrhenius_energy_kj_mol": rate.arrhenius_energy_kj_mol[k],
                        "activation_enthalpy_kj_mol": rate.activation.enthalpy_kj_mol[k],
                        "activation_entropy_j_mol_k": rate.activation.entropy_j_mol_k[k],
                        "activation_gibbs_kj_mol": rate.activation.gibbs_kj_mol[k],
                    }
                )
        return pd.DataFrame(rows)

    def _repr_html_(self) -> str:
        return str(self.table().to_html(index=False))
