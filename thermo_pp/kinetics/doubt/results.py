"""What doubt there is about the answers: the result fields that tables, JSON and words are made from."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding
from thermo_pp.kinetics.results import freeze_arrays
from thermo_pp.names import Definition
from thermo_pp.rich import shown

if TYPE_CHECKING:
    import pandas as pd

FloatArray = NDArray[np.float64]
QUANTILES = (0.025, 0.16, 0.5, 0.84, 0.975)
"""Of every band: its first axis runs over them."""


@dataclass(frozen=True, eq=False)
class Answer:
    """The answer in one definition, over temperature.

    Attributes
    ----------
    log_rate : shape (t,)
        ln of the size of k / s^-1; of a rate at a point in the unit of that.
    arrhenius_energy_kj_mol : shape (t,)
    controlling_saddle : tuple of str
        The one with the largest control.
    resting_state : tuple of str or None
        The largest population; None per free reactant and for the relaxation.
    preferred_product : tuple of str or None
        The largest branching fraction; None with a single product.
    """

    log_rate: FloatArray
    arrhenius_energy_kj_mol: FloatArray
    controlling_saddle: tuple[str, ...]
    resting_state: tuple[str, ...] | None = None
    preferred_product: tuple[str, ...] | None = None

    def __post_init__(self) -> None:
        freeze_arrays(self)


@dataclass(frozen=True, eq=False)
class Probability:
    """How often something is so among the samples.

    Attributes
    ----------
    value : shape (t,)
    error : shape (t,)
        Its binomial standard error; 0 where all samples agree.
    """

    value: FloatArray
    error: FloatArray

    def __post_init__(self) -> None:
        freeze_arrays(self)


@dataclass(frozen=True, eq=False)
class Narrowing:
    """What one energy, computed better, would do; n energies in the order of `names`.

    Attributes
    ----------
    names : tuple of str
    log_slope : shape (n, t)
        d ln k/dE, mol/kJ: minus the control over RT, but for limits and declared constants that
        follow the energy.
    energy_slope : shape (n, t)
        dE_a/dE.
    log_share, energy_share : shape (n, t)
        Share in the first-order variance of ln k and of E_a, what is correlated counted half to each;
        they add up to 1, and one may be negative.
    log_deviation_exact, log_deviation_half : shape (n, t)
        Standard deviation of ln k that would be left with this deviation zero, or halved.
    energy_deviation_exact_kj_mol, energy_deviation_half_kj_mol : shape (n, t)
        The same of E_a.
    """

    names: tuple[str, ...]
    log_slope: FloatArray
    energy_slope: FloatArray
    log_share: FloatArray
    energy_share: FloatArray
    log_deviation_exact: FloatArray
    log_deviation_half: FloatArray
    energy_deviation_exact_kj_mol: FloatArray
    energy_deviation_half_kj_mol: FloatArray

    def __post_init__(self) -> None:
        freeze_arrays(self)

    def best_for_log(self) -> tuple[str, ...]:
        """Return at each temperature the energy that, exact, leaves the least doubt about ln k."""
        return tuple(self.names[k] for k in np.argmin(self.log_deviation_exact, axis=0))

    def best_for_energy(self) -> tuple[str, ...]:
        """Return at each temperature the energy that, exact, leaves the least doubt about E_a."""
        return tuple(self.names[k] for k in np.argmin(self.energy_deviation_exact_kj_mol, axis=0))


@dataclass(frozen=True, eq=False)
class Spread:
    """What the samples say about one definition.

    Attributes
    ----------
    log_bands, energy_bands_kj_mol : shape (q, t)
        Quantiles of ln k and of E_a; see `QUANTILES`.
    log_deviation, energy_deviation_kj_mol : shape (t,)
        Standard deviations.
    negative_energy : Probability
        That E_a is below zero.
    backwards : Probability
        That the net reaction runs backwards.
    control_mean, control_deviation : mapping of str to shape (t,)
        Of the control of every saddle point and species.
    controlling : mapping of str to shape (t,)
        How often each saddle point has the largest control.
    same_saddle : Probability
        That the controlling saddle is the one without shifts.
    same_resting, same_product : Probability or None
        The same of the resting state and the preferred product.
    same_answer : Probability
        That all of these stay.
    energies_kj_mol : shape (samples,)
        E_a of every sample at the temperature nearest to 298.15 K, for a figure.
    branching_bands : mapping of str to shape (q, t), or None
        Quantiles of each product's share.
    samples : int
        How many there are.
    not_reached : int
        Samples in which the point asked for is not reached at some temperature; all of the above is
        of the others.
    """

    log_bands: FloatArray
    energy_bands_kj_mol: FloatArray
    log_deviation: FloatArray
    energy_deviation_kj_mol: FloatArray
    negative_energy: Probability
    backwards: Probability
    control_mean: Mapping[str, FloatArray]
    control_deviation: Mapping[str, FloatArray]
    controlling: Mapping[str, FloatArray]
    same_saddle: Probability
    same_resting: Probability | None
    same_product: Probability | None
    same_answer: Probability
    energies_kj_mol: FloatArray
    samples: int
    branching_bands: Mapping[str, FloatArray] | None = None
    not_reached: int = 0

    def __post_init__(self) -> None:
        freeze_arrays(self)

    def rate_bands(self) -> FloatArray:
        """Return the quantiles of k / s^-1, shape (q, t)."""
        return np.asarray(np.exp(self.log_bands))


@dataclass(frozen=True, eq=False)
class RateDoubt:
    """The doubt about one definition of the rate.

    Attributes
    ----------
    answer : Answer
        With no energy shifted.
    first_order_log_deviation, first_order_energy_deviation_kj_mol : shape (t,)
        Standard deviations of ln k and E_a by first-order propagation.
    gibbs_deviation_kj_mol : shape (t,)
        The former times RT: the doubt about the effective barrier.
    narrowing : Narrowing
    spread : Spread
        The relaxation's from fewer samples: its decays are found one network at a time.
    unit : str
        Of the rate.
    """

    answer: Answer
    first_order_log_deviation: FloatArray
    first_order_energy_deviation_kj_mol: FloatArray
    gibbs_deviation_kj_mol: FloatArray
    narrowing: Narrowing
    spread: Spread
    unit: str = "s^-1"

    def __post_init__(self) -> None:
        freeze_arrays(self)


@dataclass(frozen=True, eq=False)
class AlternativeAnswer:
    """The answers with one choice made otherwise: an alternative, not a sample.

    Attributes
    ----------
    choice, taken, instead : str
        ``"level of theory"``, what the study has and what stands in its place.
    answers : mapping of definition to Answer
    """

    choice: str
    taken: str
    instead: str
    answers: Mapping[Definition, Answer]


@dataclass(frozen=True, eq=False)
class Doubt:
    """How sure the answers are.

    Attributes
    ----------
    temperature_k : shape (t,)
        A few of the study's only where each answer takes a time course.
    names : tuple of str
        The energies that are in doubt.
    deviation_kj_mol : shape (v,)
    correlation : shape (v, v)
    samples, seed : int
        Fewer samples than the study asks for where each takes a steady state or a time course.
    rates : mapping of definition to RateDoubt
        Empty where the network is not linear and the study names no point of it.
    alternatives : tuple of AlternativeAnswer
    words : tuple of str
        A sentence each, made from the fields above.
    findings : tuple of Finding
    """

    temperature_k: FloatArray
    names: tuple[str, ...]
    deviation_kj_mol: FloatArray
    correlation: FloatArray
    samples: int
    seed: int
    rates: Mapping[Definition, RateDoubt]
    alternatives: tuple[AlternativeAnswer, ...] = ()
    words: tuple[str, ...] = ()
    findings: tuple[Finding, ...] = field(default=())

    def __post_init__(self) -> None:
        freeze_arrays(self)

    def table(self) -> pd.DataFrame:
        """Return one row a definition and temperature, as plain numbers."""
        import pandas as pd

        rows: list[dict[str, Any]] = []
        for definition, rate in self.rates.items():
            for k, temperature in enumerate(self.temperature_k):
                row: dict[str, Any] = {
                    "definition": definition,
                    "temperature_k": temperature,
                    "log_rate": rate.answer.log_rate[k],
                    "arrhenius_energy_kj_mol": rate.answer.arrhenius_energy_kj_mol[k],
                    "first_order_log_deviation": rate.first_order_log_deviation[k],
                    "first_order_energy_deviation_kj_mol": (
                        rate.first_order_energy_deviation_kj_mol[k]
                    ),
                }
                row["log_deviation"] = rate.spread.log_deviation[k]
                row["energy_deviation_kj_mol"] = rate.spread.energy_deviation_kj_mol[k]
                row["negative_energy"] = rate.spread.negative_energy.value[k]
                row["same_answer"] = rate.spread.same_answer.value[k]
                rows.append(row)
        return pd.DataFrame(rows)

    def _repr_html_(self) -> str:
        return shown(self.table())
