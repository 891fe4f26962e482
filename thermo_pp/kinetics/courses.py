"""Result fields of time courses."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding
from thermo_pp.kinetics.results import freeze_arrays
from thermo_pp.rich import shown

if TYPE_CHECKING:
    import pandas as pd

FloatArray = NDArray[np.float64]


USUAL_K = 298.15


def course_temperatures(temperature_k: Sequence[float]) -> tuple[float, ...]:
    """Return where time courses are followed: both ends and the one nearest to 298.15 K."""
    usual = min(temperature_k, key=lambda t: abs(t - USUAL_K))
    return tuple(sorted({min(temperature_k), usual, max(temperature_k)}))


@dataclass(frozen=True, eq=False)
class TimeCourse:
    """The time course at one temperature, t times.

    Attributes
    ----------
    temperature_k : float
    time_s : shape (t,)
    concentration_mol_l : mapping of str to shape (t,)
        Every species that is not held and ever there.
    rate_mol_l_s : shape (t,) or None
        Net loss of the reactant, or formation of the first product where a catalyst is asked about;
        None where the study asks about neither.
    arrhenius_energy_kj_mol : shape (t,) or None
        R T^2 d ln(rate)/dT at the same conversion; nan where what is still to change is less
        than a millionth of what is there.
    arrhenius_energy_constant_kj_mol : mapping of {"concentration", "pressure"} to shape (t,)
        The same with every amount of a gas (at the start or held) constant in that sense; empty in solution.
    order : shape (t,) or None
        d ln(rate)/d ln(free concentration of the followed species) along the course.
    control : mapping of str to shape (t,)
        d ln(rate)/d(-G/RT) at the same conversion, saddles first.
    saddles : tuple of str
    orders : mapping of str to shape (t,)
        In the species held at a stated amount, at the same conversion.
    end_mol_l : mapping of str to float, or None
        The equilibrium from free energies alone, or the steady state; None where there is none.
    at_equilibrium : bool
        Whether `end_mol_l` is an equilibrium.
    fastest_lifetime_s, slowest_lifetime_s : float
        At the start and at the end; nan where there is no end that can be reached.
    next_lifetime_s : float
        The second slowest, nan where there is one only.
    used : mapping of str to float
        Largest share of each held amount that the course takes up, where that is known.
    steps : int
        Steps of the integration.
    quasi_steady_ratio : mapping of str to shape (t,)
        For the species asked for: their concentration in the quasi-steady state, all others as they
        are, over that of the course; nan where there is no such state nearby.
    quasi_steady_rate_ratio : shape (t,) or None
        The same for the rate.
    quasi_steady_energy_kj_mol : shape (t,) or None
        E_a of that rate at the composition of the other species.
    product_share : mapping of str to shape (t,)
        Of what has been formed of all products since the start, the share of each; nan before any
        is there, empty where fewer than two compete.
    """

    temperature_k: float
    time_s: FloatArray
    concentration_mol_l: Mapping[str, FloatArray]
    rate_mol_l_s: FloatArray | None
    arrhenius_energy_kj_mol: FloatArray | None
    order: FloatArray | None
    control: Mapping[str, FloatArray]
    saddles: tuple[str, ...]
    orders: Mapping[str, FloatArray]
    end_mol_l: Mapping[str, float] | None
    at_equilibrium: bool
    fastest_lifetime_s: float
    slowest_lifetime_s: float
    next_lifetime_s: float
    used: Mapping[str, float]
    steps: int
    quasi_steady_ratio: Mapping[str, FloatArray] = field(default_factory=dict)
    quasi_steady_rate_ratio: FloatArray | None = None
    quasi_steady_energy_kj_mol: FloatArray | None = None
    product_share: Mapping[str, FloatArray] = field(default_factory=dict)
    arrhenius_energy_constant_kj_mol: Mapping[str, FloatArray] = field(default_factory=dict)

    def __post_init__(self) -> None:
        freeze_arrays(self)


@dataclass(frozen=True, eq=False)
class Transient:
    """The time courses of a study.

    Attributes
    ----------
    followed : str
        The species whose loss (or formation) the rate is; empty where none is asked about.
    forming : bool
        Whether it is formed.
    courses : tuple of TimeCourse
        One a temperature.
    words : tuple of str
    findings : tuple of Finding
    """

    followed: str
    forming: bool
    courses: tuple[TimeCourse, ...]
    words: tuple[str, ...] = ()
    findings: tuple[Finding, ...] = field(default=())

    def table(self) -> pd.DataFrame:
        """Return one row a temperature and time, as plain numbers."""
        import pandas as pd

        rows = []
        for course in self.courses:
            for k, time in enumerate(course.time_s):
                row = {"temperature_k": course.temperature_k, "time_s": time}
                for name, values in course.concentration_mol_l.items():
                    row[f"{name} mol/L"] = values[k]
                if course.rate_mol_l_s is not None:
                    row["rate_mol_l_s"] = course.rate_mol_l_s[k]
                rows.append(row)
        return pd.DataFrame(rows)

    def _repr_html_(self) -> str:
        return shown(self.table())
