"""Fits: a polynomial for one species, and how far it is from what it was fitted to."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import StandardState
from thermo_pp.errors import Finding, StudyError
from thermo_pp.formulas.polynomials import Polynomial, Values, fitted
from thermo_pp.names import DEFAULT_STANDARD_STATE, DEFAULT_TEMPERATURE_K, PolynomialForm
from thermo_pp.species import SpeciesModel, Thermochemistry
from thermo_pp.units import BAR_PA

FloatArray = NDArray[np.float64]

BAR = StandardState("pressure", BAR_PA, DEFAULT_STANDARD_STATE)
"""The state of every fit: polynomials of ideal gases are for a reference pressure."""
DEFAULT_BOUNDS_K = (200.0, 1000.0, 3000.0)
POOR_GIBBS_KJ_MOL = 0.05
"""A largest residual of G beyond this is a finding."""
TEMPERATURES = 201
"""In each fit, evenly spaced in ln T, beside the bounds and 298.15 K."""
_STEP = 1.0e-3
"""Of the central difference, times T."""
_SAME_KJ_MOL = 1.0e-6
"""Within this the slope enthalpy and H are one, and Cp needs no difference quotient."""
OF_SLOPE_KJ_MOL = 0.05
"""A larger difference of the two is a finding."""


@dataclass(frozen=True)
class Residual:
    """The largest absolute difference of fit and species, and the temperature where it is."""

    value: float
    temperature_k: float


@dataclass(frozen=True, eq=False)
class Fit:
    """A polynomial of one species at 1 bar.

    Attributes
    ----------
    name : str
    polynomial : Polynomial
        H absolute, electronic energy included.
    room_enthalpy_kj_mol : float
        H(298.15 K) of the polynomial.
    heat_capacity_j_mol_k, enthalpy_kj_mol, entropy_j_mol_k, gibbs_kj_mol : Residual
    of_slope : bool
        H and S of the polynomial are those of G's own slope and differ from the species' own,
        because the soft-mode treatment breaks S = -dG/dT; G is the species' own in any case.
    findings : tuple of Finding
    """

    name: str
    polynomial: Polynomial
    room_enthalpy_kj_mol: float
    heat_capacity_j_mol_k: Residual
    enthalpy_kj_mol: Residual
    entropy_j_mol_k: Residual
    gibbs_kj_mol: Residual
    of_slope: bool
    findings: tuple[Finding, ...] = ()


def check_bounds(bounds_k: tuple[float, float, float], *, where: str) -> None:
    """Make sure that a fit's bounds rise and hold 298.15 K; StudyError where they do not."""
    low, middle, high = bounds_k
    if not 0.0 < low < middle < high:
        raise StudyError(
            f"the range {low:g}, {middle:g}, {high:g} K of the fit does not rise",
            where=where,
            mend="give the lowest, the middle and the highest temperature: 200 1000 3000",
        )
    if not low <= DEFAULT_TEMPERATURE_K <= high:
        raise StudyError(
            f"the range of the fit, {low:g} to {high:g} K, does not hold 298.15 K, "
            "where H and S are met exactly",
            where=where,
            mend="let the range hold 298.15 K",
        )


def fit(
    model: SpeciesModel,
    form: PolynomialForm,
    bounds_k: tuple[float, float, float] = DEFAULT_BOUNDS_K,
    *,
    where: str = "options fit",
) -> Fit:
    """Fit a polynomial to a species.

    A polynomial has dH/dT = Cp and dS/dT = Cp/T. Where the soft-mode treatment breaks them, G is what
    is kept: H is taken as -T^2 d(G/T)/dT, S and Cp follow from it, and a finding says so.

    Parameters
    ----------
    model : SpeciesModel
    form : {"nasa7", "nasa9", "shomate"}
    bounds_k : (float, float, float)
        Lowest, middle and highest temperature, K.
    where : str
        For messages.

    Raises
    ------
    StudyError
        Bounds that do not rise or do not hold 298.15 K.
    """
    check_bounds(bounds_k, where=where)
    low, middle, high = bounds_k
    t = np.unique([*np.geomspace(low, high, TEMPERATURES), *bounds_k, DEFAULT_TEMPERATURE_K])
    t = t[(t >= low) & (t <= high)]
    # each range has enough of them, however narrow it is
    t = np.unique([*t, *np.linspace(low, middle, 21), *np.linspace(middle, high, 21)])
    here = model.at(t, standard_state=BAR)
    values = _consistent(model, here)
    beside = np.abs(here.slope_enthalpy_kj_mol - here.enthalpy_kj_mol)
    of_slope = bool(beside.max() > OF_SLOPE_KJ_MOL)
    polynomial = fitted(form, t, values, bounds_k, DEFAULT_TEMPERATURE_K)
    got = polynomial.at(t)
    enthalpy = got.enthalpy_j_mol - values.enthalpy_j_mol
    entropy = got.entropy_j_mol_k - values.entropy_j_mol_k
    gibbs = _residual((enthalpy - t * entropy) / 1000.0, t)
    findings = list(here.findings)
    file = model.files[0] if model.files else None
    if of_slope:
        findings.append(
            Finding(
                "fit-of-slope",
                "note",
                file,
                None,
                f"{model.name}: {here.low_modes} breaks S = -dG/dT, so the polynomial keeps G, and its "
                "H, S and Cp are those of G's slope",
                'low_modes = "harmonic", "raised" or "rotor-enthalpy" lets the polynomial keep H and '
                "S too",
            )
        )
    if gibbs.value > POOR_GIBBS_KJ_MOL:
        findings.append(
            Finding(
                "fit-poor",
                "warning",
                file,
                None,
                f"{model.name}: the {form} fit misses G by {gibbs.value:.3f} kJ/mol at "
                f"{gibbs.temperature_k:g} K",
                "choose a narrower range or the form nasa9",
            )
        )
    room = int(np.flatnonzero(t == DEFAULT_TEMPERATURE_K)[0])
    return Fit(
        name=model.name,
        polynomial=polynomial,
        room_enthalpy_kj_mol=float(values.enthalpy_j_mol[room]) / 1000.0,
        heat_capacity_j_mol_k=_residual(
            got.heat_capacity_j_mol_k - values.heat_capacity_j_mol_k, t
        ),
        enthalpy_kj_mol=_residual(enthalpy / 1000.0, t),
        entropy_j_mol_k=_residual(entropy, t),
        gibbs_kj_mol=gibbs,
        of_slope=of_slope,
        findings=tuple(findings),
    )


def _consistent(model: SpeciesModel, here: Thermochemistry) -> Values:
    """Return Cp, H and S that belong to one G: that of the species."""
    t = here.temperature_k
    slope = here.slope_enthalpy_kj_mol
    if np.all(np.abs(slope - here.enthalpy_kj_mol) < _SAME_KJ_MOL):
        return Values(
            here.heat_capacity_j_mol_k, 1000.0 * here.enthalpy_kj_mol, here.entropy_j_mol_k
        )
    step = _STEP * t
    above, below = (model.at(side, standard_state=BAR) for side in (t + step, t - step))
    rise = above.slope_enthalpy_kj_mol - below.slope_enthalpy_kj_mol
    entropy = 1000.0 * (slope - here.gibbs_kj_mol) / t
    return Values(1000.0 * rise / (2.0 * step), 1000.0 * slope, entropy)


def _residual(difference: FloatArray, temperature_k: FloatArray) -> Residual:
    worst = int(np.argmax(np.abs(difference)))
    return Residual(float(abs(difference[worst])), float(temperature_k[worst]))
