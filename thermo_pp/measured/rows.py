"""What a measurement file holds: measured points and published expressions, as they were given."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import Held
from thermo_pp.errors import Finding
from thermo_pp.measured.units import RateUnit
from thermo_pp.names import Definition
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Row:
    """What points and expressions have in common.

    Attributes
    ----------
    file, line : str and int
        Where it stands.
    unit : RateUnit
        Of the rate constant.
    definition : {"free", "pool", "relaxation", "cycle"}
        The computed rate that it is to be set against.
    orders : mapping of str to int
        The held species that the rate constant has to be multiplied with, empty for pseudo-first
        order.
    held : mapping of str to Held
        Amounts at which it was measured; the study's hold for the species that it leaves out.
    source : str
    """

    file: str
    line: int
    unit: RateUnit
    definition: Definition
    orders: Mapping[str, int]
    held: Mapping[str, Held]
    source: str

    @property
    def where(self) -> str:
        """File and line."""
        return f"{self.file}:{self.line}"


@dataclass(frozen=True, eq=False)
class Point(Row):
    """One measured rate constant.

    Attributes
    ----------
    temperature_k : float
    rate_constant : float
        In `unit`, above 0.
    sigma : float or None
        Its standard deviation in `unit`; None where the file gives none.
    """

    temperature_k: float
    rate_constant: float
    sigma: float | None

    @property
    def log(self) -> float:
        """Ln of the rate constant in (mol/L)^(1-m) s^-1."""
        return float(np.log(self.rate_constant) + np.log(self.unit.factor))


@dataclass(frozen=True, eq=False)
class Expression(Row):
    """A published expression k = A (T/T0)^n exp(-theta/T).

    Attributes
    ----------
    from_k, to_k : float
        Temperatures that it holds for.
    factor, sigma_factor : float, and float or None
        A in `unit`.
    power, sigma_power : float, and float or None
        n.
    reference_k : float
        T0.
    theta_k, sigma_theta_k : float, and float or None
        E_a/R of the exponential, K.
    correlation : float or None
        Of ln A and theta; None where the source gives none.
    """

    from_k: float
    to_k: float
    factor: float
    sigma_factor: float | None
    power: float
    sigma_power: float | None
    reference_k: float
    theta_k: float
    sigma_theta_k: float | None
    correlation: float | None
    uncertain: tuple[int, ...] = field(init=False)
    covariance: FloatArray = field(init=False)

    def __post_init__(self) -> None:
        relative = None if self.sigma_factor is None else self.sigma_factor / self.factor
        sigmas = (relative, self.sigma_power, self.sigma_theta_k)
        uncertain = tuple(k for k, sigma in enumerate(sigmas) if sigma is not None)
        spread = np.array([sigma for sigma in sigmas if sigma is not None], dtype=np.float64)
        matrix = np.diag(spread**2)
        if self.correlation is not None and {0, 2} <= set(uncertain):
            last = uncertain.index(2)
            matrix[0, last] = matrix[last, 0] = self.correlation * spread[0] * spread[last]
        matrix.flags.writeable = False
        object.__setattr__(self, "uncertain", uncertain)
        object.__setattr__(self, "covariance", matrix)

    def basis(self, temperature_k: FloatArray) -> FloatArray:
        """Return d ln k/d(ln A, n, theta), shape (t, 3)."""
        t = np.asarray(temperature_k, dtype=np.float64)
        return np.stack([np.ones_like(t), np.log(t / self.reference_k), -1.0 / t], axis=1)

    @property
    def parameters(self) -> FloatArray:
        """Ln A, in (mol/L)^(1-m) s^-1, n and theta."""
        log_factor = np.log(self.factor) + np.log(self.unit.factor)
        return np.array([log_factor, self.power, self.theta_k])

    def log(self, temperature_k: FloatArray) -> FloatArray:
        """Ln of the rate constant in (mol/L)^(1-m) s^-1; nan outside the temperatures it holds for."""
        t = np.asarray(temperature_k, dtype=np.float64)
        return np.where(self.covers(t), self.basis(t) @ self.parameters, np.nan)

    def log_deviation(self, temperature_k: FloatArray) -> FloatArray | None:
        """Return the standard deviation of ln k from the parameters' errors; None where none is given."""
        if not self.uncertain:
            return None
        basis = self.basis(temperature_k)[:, self.uncertain]
        spread = np.sqrt(np.einsum("ti,ij,tj->t", basis, self.covariance, basis))
        return np.where(self.covers(temperature_k), spread, np.nan)

    def energy_kj_mol(self, temperature_k: FloatArray) -> FloatArray:
        """Return R T^2 d ln k/dT of the expression as it stands: its amounts held constant."""
        t = np.asarray(temperature_k, dtype=np.float64)
        energy = GAS_J_MOL_K * (self.theta_k + self.power * t) / 1000.0
        return np.where(self.covers(t), energy, np.nan)

    def energy_deviation_kj_mol(self, temperature_k: FloatArray) -> FloatArray | None:
        """Return the standard deviation of that; None where no error of n or theta is given."""
        if not {1, 2} & set(self.uncertain):
            return None
        t = np.asarray(temperature_k, dtype=np.float64)
        gradient = np.stack([np.zeros_like(t), t, np.ones_like(t)], axis=1)[:, self.uncertain]
        spread = np.sqrt(np.einsum("ti,ij,tj->t", gradient, self.covariance, gradient))
        return np.where(self.covers(t), GAS_J_MOL_K * spread / 1000.0, np.nan)

    def covers(self, temperature_k: FloatArray) -> NDArray[np.bool_]:
        """Whether it holds at each temperature."""
        t = np.asarray(temperature_k, dtype=np.float64)
        return np.asarray((t >= self.from_k) & (t <= self.to_k))


@dataclass(frozen=True, eq=False)
class Measurements:
    """A measurement file.

    Attributes
    ----------
    file : str
    points : tuple of Point
    expressions : tuple of Expression
    findings : tuple of Finding
    """

    file: str
    points: tuple[Point, ...]
    expressions: tuple[Expression, ...]
    findings: tuple[Finding, ...] = ()
