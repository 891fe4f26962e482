"""What a comparison with measurements is: the result fields that tables, JSON and words are made from."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding
from thermo_pp.kinetics.results import freeze_arrays
from thermo_pp.measured.fits import Form
from thermo_pp.measured.rows import Expression, Measurements, Point
from thermo_pp.rich import shown

if TYPE_CHECKING:
    import pandas as pd

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class EnergyDoubt:
    """How sure the electronic energies of a study are, n of them.

    Attributes
    ----------
    origin : str
        ``"options"``, or the table of the study file.
    names : tuple of str
        Species, then saddle points.
    deviation_kj_mol : shape (n,)
        Standard deviations.
    correlation : shape (n, n)
    """

    origin: str
    names: tuple[str, ...]
    deviation_kj_mol: FloatArray
    correlation: FloatArray

    def __post_init__(self) -> None:
        freeze_arrays(self)

    @property
    def covariance(self) -> FloatArray:
        """Of the energies, (kJ/mol)^2, shape (n, n)."""
        return np.asarray(self.correlation * np.outer(self.deviation_kj_mol, self.deviation_kj_mol))

    @property
    def correlated(self) -> bool:
        """Whether any two go together."""
        return bool(np.any(self.correlation != np.eye(len(self.names))))


@dataclass(frozen=True, eq=False)
class PointBeside:
    """A measured point and the computed rate constant beside it.

    Attributes
    ----------
    point : Point
    computed : float
        In the unit of the point.
    log_ratio : float
        ln of measured over computed.
    log_deviation : float or None
        Standard deviation of ln k computed, from those of the energies; None where none is given.
    """

    point: Point
    computed: float
    log_ratio: float
    log_deviation: float | None


@dataclass(frozen=True, eq=False)
class FitBeside:
    """A fit of points over the study's temperatures, in the unit of the file.

    Attributes
    ----------
    form : {"arrhenius", "eyring", "power", "series", "parallel"}
        See `thermo_pp.measured.fits.Fit`.
    names : tuple of str
        Of the parameters, units in them; factors stand as ln A.
    values, deviations : shape (p,)
    covariance : shape (p, p)
    factors : mapping of str to (float, float)
        Pre-exponential factors in the unit of the file, with standard deviations to first order.
    weighted : bool
    chi_square : float
    degrees : int
    chance : float or None
        Of a larger chi_square, where the points have standard deviations.
    residuals : shape (n,)
        ln k measured less fitted, in the order of `CurveBeside.lines`.
    rate_constant, band_low, band_high : shape (t,)
        The fit and its 95 % confidence band.
    log_deviation : shape (t,)
    arrhenius_energy_kj_mol, energy_deviation_kj_mol : shape (t,)
    """

    form: Form
    names: tuple[str, ...]
    values: FloatArray
    deviations: FloatArray
    covariance: FloatArray
    factors: Mapping[str, tuple[float, float]]
    weighted: bool
    chi_square: float
    degrees: int
    chance: float | None
    residuals: FloatArray
    rate_constant: FloatArray
    band_low: FloatArray
    band_high: FloatArray
    log_deviation: FloatArray
    arrhenius_energy_kj_mol: FloatArray
    energy_deviation_kj_mol: FloatArray

    def __post_init__(self) -> None:
        freeze_arrays(self)


@dataclass(frozen=True, eq=False)
class CurveBeside:
    """A computed curve over temperature, and what was measured beside it.

    Attributes
    ----------
    name : str
        ``"expression, line 3"`` or ``"points, lines 2-14"``.
    lines : tuple of int
        Rows of the file.
    definition, unit : str
    unit_factor : float
        What 1 of the unit is in (mol/L)^(1-m) s^-1.
    range_k : (float, float)
        Temperatures of the rows; beyond them a fit is an extrapolation.
    amounts : mapping of str to str
        The held species at stated amounts, as they were written.
    temperature_k : shape (t,)
    computed, arrhenius_energy_kj_mol : shape (t,)
        In `unit`; E_a with the amounts as held, of a rate constant of this order.
    log_deviation : shape (t,) or None
        Standard deviation of ln k computed.
    orders : mapping of str to shape (t,)
        Computed, in the held species.
    expression : Expression or None
        nan outside the temperatures that it holds for.
    measured, measured_log_deviation : shape (t,) or None
        Of the expression, in `unit`; of ln k.
    measured_energy_kj_mol, measured_energy_deviation_kj_mol : shape (t,) or None
    fits : tuple of FitBeside
        Of the points.
    not_fitted : mapping of str to str
        Forms that were left out, and why.
    """

    name: str
    lines: tuple[int, ...]
    definition: str
    unit: str
    unit_factor: float
    range_k: tuple[float, float]
    amounts: Mapping[str, str]
    temperature_k: FloatArray
    computed: FloatArray
    arrhenius_energy_kj_mol: FloatArray
    log_deviation: FloatArray | None
    orders: Mapping[str, FloatArray]
    expression: Expression | None = None
    measured: FloatArray | None = None
    measured_log_deviation: FloatArray | None = None
    measured_energy_kj_mol: FloatArray | None = None
    measured_energy_deviation_kj_mol: FloatArray | None = None
    fits: tuple[FitBeside, ...] = ()
    not_fitted: Mapping[str, str] = field(default_factory=dict)

    def __post_init__(self) -> None:
        freeze_arrays(self)


@dataclass(frozen=True)
class StateShift:
    """What one controlling state alone would have to move.

    Attributes
    ----------
    name : str
    control : float
        d ln k/d(-E/RT) where it is largest in size.
    mean_kj_mol : float or None
        Shift that brings ln k together on average over the rows, all of equal weight; None where none below
        100 kJ/mol does.
    mean_rms : float or None
        Root mean square of what is left in ln k.
    shift_kj_mol, sigma_kj_mol, chi_square : float or None
        The same with the measurements' errors, the shift's standard deviation from them, and what is left; None
        without errors.
    deviation_kj_mol : float or None
        Standard deviation of this energy, where it is given.
    """

    name: str
    control: float
    mean_kj_mol: float | None
    mean_rms: float | None
    shift_kj_mol: float | None
    sigma_kj_mol: float | None
    chi_square: float | None
    deviation_kj_mol: float | None

    @property
    def within(self) -> bool | None:
        """Whether the shift on average lies within one standard deviation; None where that is not known."""
        if self.mean_kj_mol is None or self.deviation_kj_mol is None:
            return None
        return abs(self.mean_kj_mol) <= self.deviation_kj_mol


@dataclass(frozen=True, eq=False)
class JointShift:
    """The smallest shift of all energies, in units of their deviations, that reconciles as far as it can.

    Attributes
    ----------
    shift_kj_mol, multiple : mapping of str to float
        Of every energy that moves by more than 0.001 kJ/mol; over its standard deviation.
    length : float
        Standard deviations away from no shift at all.
    chi_square_before, chi_square : float
    observations : int
    chance : float
        Chance of a larger chi_square among so many observations.
    """

    shift_kj_mol: Mapping[str, float]
    multiple: Mapping[str, float]
    length: float
    chi_square_before: float
    chi_square: float
    observations: int
    chance: float

    @property
    def reconciled(self) -> bool:
        """Whether what is left may be the measurements' errors: a chance above 5 %."""
        return self.chance > 0.05

    @property
    def within(self) -> bool:
        """Whether every energy moves by at most one standard deviation."""
        return all(abs(multiple) <= 1.0 for multiple in self.multiple.values())


@dataclass(frozen=True)
class Rival:
    """One study in the order of its likelihood.

    Attributes
    ----------
    file, title : str
    log_evidence : float
        ln of the likelihood of the measurements, energies integrated out.
    behind : float
        By how much that is below the best.
    share : float
        Probability among the studies, all equally likely before.
    chi_square_before, chi_square, length : float
        As of `JointShift`.
    """

    file: str
    title: str
    log_evidence: float
    behind: float
    share: float
    chi_square_before: float
    chi_square: float
    length: float


@dataclass(frozen=True, eq=False)
class Comparison:
    """A study against measurements.

    Attributes
    ----------
    measurements : Measurements
    energy_doubt : EnergyDoubt or None
        What the deviations of everything computed come from; None where none are given.
    overridden : str or None
        The table of the study that options stand in place of.
    points : tuple of PointBeside
    curves : tuple of CurveBeside
    states : tuple of StateShift
        Controlling states, the largest control first.
    joint : JointShift or None
        None where the energies have no standard deviations or the measurements no errors.
    rivals : tuple of Rival
        Best first, the study itself among them; empty where no rival was named.
    words : tuple of str
        The closing paragraph, a sentence each.
    findings : tuple of Finding
    """

    measurements: Measurements
    energy_doubt: EnergyDoubt | None
    overridden: str | None
    points: tuple[PointBeside, ...]
    curves: tuple[CurveBeside, ...]
    states: tuple[StateShift, ...]
    joint: JointShift | None
    rivals: tuple[Rival, ...]
    words: tuple[str, ...] = ()
    findings: tuple[Finding, ...] = ()

    def table(self) -> pd.DataFrame:
        """Return one row a measured point, then one a computed curve and temperature, plain numbers.

        Columns: ``kind`` (point, curve), ``name, lines`` (of the file), ``definition, unit,
        temperature_k, computed, measured`` (both in `unit`), ``log_ratio`` (ln of measured over computed,
        of points), ``computed_energy_kj_mol, measured_energy_kj_mol``; nan where there is none.
        """
        import pandas as pd

        rows: list[dict[str, object]] = [
            {
                "kind": "point",
                "name": beside.point.source,
                "lines": str(beside.point.line),
                "definition": beside.point.definition,
                "unit": beside.point.unit.text,
                "temperature_k": beside.point.temperature_k,
                "computed": beside.computed,
                "measured": beside.point.rate_constant,
                "log_ratio": beside.log_ratio,
                "computed_energy_kj_mol": np.nan,
                "measured_energy_kj_mol": np.nan,
            }
            for beside in self.points
        ]
        for curve in self.curves:
            none = np.full(curve.temperature_k.shape, np.nan)
            measured, energy = curve.measured, curve.measured_energy_kj_mol
            rows += [
                {
                    "kind": "curve",
                    "name": curve.name,
                    "lines": ", ".join(map(str, curve.lines)),
                    "definition": curve.definition,
                    "unit": curve.unit,
                    "temperature_k": temperature,
                    "computed": curve.computed[k],
                    "measured": (none if measured is None else measured)[k],
                    "log_ratio": np.nan,
                    "computed_energy_kj_mol": curve.arrhenius_energy_kj_mol[k],
                    "measured_energy_kj_mol": (none if energy is None else energy)[k],
                }
                for k, temperature in enumerate(curve.temperature_k)
            ]
        return pd.DataFrame(rows)

    def _repr_html_(self) -> str:
        return shown(self.table())
