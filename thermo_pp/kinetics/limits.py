"""Limits of encounter of a step, and how one joins a saddle."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import Treatment
from thermo_pp.errors import Finding, StudyError
from thermo_pp.formulas.rates import (
    collision_rate,
    diffusion_rate,
    ion_factor,
    sphere_radius_angstrom,
)
from thermo_pp.mechanism import Mechanism, Step
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]
ExtendedArray = NDArray[np.longdouble]
Side = tuple[ExtendedArray, FloatArray]
"""Sum of G/RT, and of the slopes, of one side of a step; shape (b,) each."""


@dataclass(frozen=True, eq=False)
class Limit:
    """The limit of encounter of a step.

    Attributes
    ----------
    log_rate : shape (b,)
        ln of the rate constant, L mol^-1 s^-1.
    energy_j_mol : shape (b,)
        R T^2 times its temperature derivative.
    start : Side
        The side with two molecules that it holds for, at each temperature.
    """

    log_rate: FloatArray
    energy_j_mol: FloatArray
    start: Side


def limit_of(
    step: Step,
    mechanism: Mechanism,
    left: Side,
    right: Side,
    t: FloatArray,
    treatment: Treatment,
    findings: list[Finding],
) -> Limit | None:
    """Return the collision or diffusion limit of a step, None where it has none.

    Raises
    ------
    StudyError
        No viscosity, no radius, a table that does not cover the temperatures.
    """
    if step.is_declared:
        return None
    limits = []
    for pair, side in ((_pair(step.reactants), left), (_pair(step.products), right)):
        if pair is None:
            continue
        found = (
            _collision(step, mechanism, pair, t)
            if treatment.phase == "gas"
            else _diffusion(step, mechanism, pair, t, findings)
        )
        if found is None:
            return None
        limits.append(Limit(*found, side))
    if len(limits) < 2:
        return limits[0] if limits else None
    # both ways have a limit: it is set on the downhill one
    forth, back = limits
    downhill = np.asarray(right[0] <= left[0])
    return Limit(
        np.where(downhill, forth.log_rate, back.log_rate),
        np.where(downhill, forth.energy_j_mol, back.energy_j_mol),
        (np.where(downhill, left[0], right[0]), np.where(downhill, left[1], right[1])),
    )


def join(
    saddle: ExtendedArray,
    saddle_slope: FloatArray,
    limit: Limit,
    frequency: FloatArray,
    rt: FloatArray,
) -> tuple[ExtendedArray, FloatArray, NDArray[np.bool_]]:
    """Join a saddle with a limit: 1/k = 1/k_saddle + 1/k_limit in the direction that the limit holds for."""
    start = limit.start
    own = np.asarray(frequency + start[0] - saddle, dtype=np.float64)
    # the share of the limit in the resistance; written so that neither exponential can overflow
    share = 1.0 / (1.0 + np.exp(np.clip(limit.log_rate - own, -700.0, 700.0)))
    added = np.logaddexp(0.0, own - limit.log_rate)  # ln(k_saddle/k)
    own_energy = rt + saddle_slope - start[1]
    energy = (1.0 - share) * own_energy + share * limit.energy_j_mol
    return saddle + added, energy - rt + start[1], share > 0.5


def _pair(counts: Mapping[str, int]) -> tuple[str, str] | None:
    """Return the two partners of one side, None where it does not have two."""
    members = [name for name, count in counts.items() for _ in range(count)]
    return (members[0], members[1]) if len(members) == 2 else None


def _collision(
    step: Step, mechanism: Mechanism, pair: tuple[str, str], t: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Return ln of the collision limit and its R T^2 d ln k/dT."""
    first, second = (mechanism.composition[name] for name in pair)
    _check_radii(step, mechanism, pair, "collision limit")
    rate = collision_rate(t, first, second, like=pair[0] == pair[1])
    return np.log(rate), 0.5 * GAS_J_MOL_K * t


def _check_radii(step: Step, mechanism: Mechanism, pair: tuple[str, str], what: str) -> None:
    for name in pair:
        try:
            if sphere_radius_angstrom(mechanism.composition[name]) > 0.0:
                continue
            lacks = name
        except KeyError as error:
            lacks = error.args[0]
        raise StudyError(
            f"no van der Waals radius of {lacks} for the {what}",
            where=step.where,
            mend="declare the rate constant of this step ([[steps]] rate)",
        )


def _diffusion(
    step: Step,
    mechanism: Mechanism,
    partners: tuple[str, str],
    t: FloatArray,
    findings: list[Finding],
) -> tuple[FloatArray, FloatArray] | None:
    """Return ln of the diffusion limit and its R T^2 d ln k/dT; None where no viscosity is given."""
    file = step.where.split(" ")[0] or None
    if step.viscosity is None:
        if not step.barrierless:
            findings.append(
                Finding(
                    "no-diffusion-limit",
                    "note",
                    file,
                    None,
                    f"step {step.equation}: no viscosity is given, so no diffusion limit is set",
                    'give the step a viscosity, for instance viscosity = "0.89 mPa s"',
                )
            )
            return None
        mend = 'give the step a viscosity ("0.89 mPa s" or a table) or a rate constant'
        what = "a barrierless step in solution needs the viscosity for its diffusion limit"
        raise StudyError(what, where=f"{step.where} viscosity", mend=mend)
    viscosity, slope = over_temperature(step.viscosity, t, "viscosities", step.where, "viscosity")
    if len(step.viscosity) == 1:
        findings.append(
            Finding(
                "viscosity-constant",
                "warning",
                file,
                None,
                f"step {step.equation}: one viscosity for all temperatures, so where this step counts "
                "its share of the Arrhenius energy is not meant",
                "give the viscosity as a table over temperature",
            )
        )
    log_rate = np.log(diffusion_rate(t, viscosity, like=partners[0] == partners[1]))
    energy = GAS_J_MOL_K * t * (1.0 - slope)
    charges = [mechanism.charge.get(name, 0) for name in partners]
    if not all(charges):
        return log_rate, energy
    if step.permittivity is None:
        findings.append(
            Finding(
                "diffusion-of-ions",
                "warning",
                file,
                None,
                f"step {step.equation}: both partners are ions, and their attraction or repulsion is "
                "not in the diffusion limit",
                "give the step the relative permittivity (permittivity = 78.4, or a table over temperature)",
            )
        )
        return log_rate, energy
    _check_radii(step, mechanism, partners, "encounter distance of ions")
    permittivity, bend = over_temperature(
        step.permittivity, t, "permittivities", step.where, "permittivity"
    )
    distance = sum(sphere_radius_angstrom(mechanism.composition[name]) for name in partners)
    log_factor, by_log = ion_factor(t, charges[0] * charges[1], permittivity, distance)
    if len(step.permittivity) == 1:
        findings.append(
            Finding(
                "permittivity-constant",
                "warning",
                file,
                None,
                f"step {step.equation}: one permittivity for all temperatures, so where this step "
                "counts its share of the Arrhenius energy is not meant",
                "give the permittivity as a table over temperature",
            )
        )
    return log_rate + log_factor, energy - GAS_J_MOL_K * t * by_log * (1.0 + bend)


def over_temperature(
    pairs: tuple[tuple[float, float], ...], t: FloatArray, what: str, where: str, key: str
) -> tuple[FloatArray, FloatArray]:
    """Return a property of the solvent and T d ln(property)/dT; its ln is linear in 1/T between the points."""
    points = sorted(pairs)
    temperatures = np.array([point[0] for point in points])
    logs = np.log([point[1] for point in points])
    if len(points) == 1:
        return np.full(t.shape, points[0][1]), np.zeros(t.shape)
    if t.min() < temperatures[0] or t.max() > temperatures[-1]:
        says = (
            f"the {what} from {temperatures[0]:g} K to {temperatures[-1]:g} K do not cover "
            f"the temperatures from {t.min():g} K to {t.max():g} K"
        )
        raise StudyError(says, where=f"{where} {key}", mend="widen the table")
    inverse = 1.0 / temperatures
    interval = np.clip(np.searchsorted(temperatures, t, side="right") - 1, 0, len(points) - 2)
    gradient = (logs[1:] - logs[:-1]) / (inverse[1:] - inverse[:-1])
    value = logs[interval] + gradient[interval] * (1.0 / t - inverse[interval])
    return np.exp(value), -gradient[interval] / t
