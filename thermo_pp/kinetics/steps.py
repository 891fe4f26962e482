"""From thermochemistry over temperature to the rate constants of the elementary steps.

Everything is in the state of 1 mol/L here, so that rate constants come out in L and mol; they do
not depend on the standard state that results are shown in. Reduced free energies G/RT are kept in
extended precision where the platform has it, because the affinity of a reaction close to
equilibrium is a small difference of large ones.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import MOLAR, Held, Treatment
from thermo_pp.errors import Finding, StudyError
from thermo_pp.formulas.rates import collision_rate, diffusion_rate, log_frequency_factor
from thermo_pp.kinetics.tunnelling import tunnelling
from thermo_pp.mechanism import Mechanism, Step
from thermo_pp.species import SaddleMember, SpeciesModel
from thermo_pp.units import BAR_PA, GAS_J_MOL_K

FloatArray = NDArray[np.float64]
ExtendedArray = NDArray[np.longdouble]
REFERENCE_K = 298.15
"""Temperature of the pre-exponential factor's power law."""


@dataclass(frozen=True, eq=False)
class Energetics:
    """Free energies and their slopes, of species at 1 mol/L, over temperature.

    Attributes
    ----------
    names : tuple of str
    temperature_k : shape (b,)
    reduced : shape (b, s), extended precision
        G/RT.
    slope_j_mol : shape (b, s)
        -T^2 d(G/T)/dT.
    grounds_kj_mol : mapping of str to float or None
        Electronic and zero-point energy of each.
    saddle_members : mapping of str to tuple of SaddleMember
        What every saddle point consists of.
    """

    names: tuple[str, ...]
    temperature_k: FloatArray
    reduced: ExtendedArray
    slope_j_mol: FloatArray
    grounds_kj_mol: Mapping[str, float | None]
    saddle_members: Mapping[str, tuple[SaddleMember, ...]]

    def index(self, name: str) -> int:
        """Return the column of a species."""
        return self.names.index(name)


def energetics(models: Mapping[str, SpeciesModel], temperature_k: FloatArray) -> Energetics:
    """Return the free energies of all `models` at the given temperatures, shape (b,)."""
    t = np.asarray(temperature_k, dtype=np.float64)
    extended = t.astype(np.longdouble)
    rt = extended * np.longdouble(GAS_J_MOL_K)
    reduced = np.empty((len(t), len(models)), np.longdouble)
    slope = np.empty((len(t), len(models)))
    for column, model in enumerate(models.values()):
        thermo = model.at(t)
        own = thermo.standard_state
        enthalpy = np.asarray(thermo.enthalpy_kj_mol, np.longdouble) * 1000
        entropy = np.asarray(thermo.entropy_j_mol_k, np.longdouble)
        if own.form == "pressure":
            to_molar = np.log(np.longdouble(MOLAR.value) * 1000 / np.longdouble(own.value) * rt)
        else:
            to_molar = np.log(np.longdouble(MOLAR.value) / np.longdouble(own.value)) + 0 * rt
        reduced[:, column] = (enthalpy - extended * entropy) / rt + to_molar
        change = MOLAR.log_ratio_slope - own.log_ratio_slope
        slope[:, column] = thermo.slope_enthalpy_kj_mol * 1000.0 - GAS_J_MOL_K * t * change
    grounds = {name: model.ground_kj_mol for name, model in models.items()}
    members = {
        name: model.saddle_members(t) for name, model in models.items() if model.kind == "saddle"
    }
    return Energetics(tuple(models), t, reduced, slope, grounds, members)


@dataclass(frozen=True, eq=False)
class ElementaryRates:
    """Rate constants of the steps and their effective saddles.

    Attributes
    ----------
    names : tuple of str
        What controls are listed under: the saddle point, or the equation of a step without one.
    saddle_reduced : shape (b, n), extended precision
        Effective G of the saddle over RT, at 1 mol/L.
    saddle_slope_j_mol : shape (b, n)
        Its -T^2 d(G/T)/dT.
    log_forward, log_reverse : shape (b, n)
        ln of the rate constants in (mol/L)^(1-m) s^-1.
    limited : shape (b, n), bool
    log_kappa, kappa_energy_j_mol : shape (b, n)
        ln of the tunnelling factor of the saddle point and R T^2 times its temperature derivative,
        both in the effective saddle already; 0 where nothing tunnels.
    findings : tuple of Finding
    """

    names: tuple[str, ...]
    saddle_reduced: ExtendedArray
    saddle_slope_j_mol: FloatArray
    log_forward: FloatArray
    log_reverse: FloatArray
    limited: NDArray[np.bool_]
    log_kappa: FloatArray
    kappa_energy_j_mol: FloatArray
    findings: tuple[Finding, ...]


def elementary_rates(
    mechanism: Mechanism,
    energies: Energetics,
    treatment: Treatment,
) -> ElementaryRates:
    """Return the rate constants of every step; each gets an effective saddle whatever it came from.

    Parameters
    ----------
    mechanism : Mechanism
    energies : Energetics
        Of every species and saddle point of the mechanism.
    treatment : Treatment
        The phase decides which limit fits.

    Raises
    ------
    StudyError
        A limit that cannot be worked out: no viscosity, no radius, a viscosity table that does not
        cover the temperatures; a tunnelling correction that has no meaning.
    """
    t = energies.temperature_k
    b, n = len(t), len(mechanism.steps)
    reduced = np.empty((b, n), np.longdouble)
    slope = np.empty((b, n))
    forward, reverse = np.empty((b, n)), np.empty((b, n))
    limited = np.zeros((b, n), np.bool_)
    log_kappa, kappa_energy = np.zeros((b, n)), np.zeros((b, n))
    findings: list[Finding] = []
    frequency = log_frequency_factor(t)
    rt = GAS_J_MOL_K * t
    for k, step in enumerate(mechanism.steps):
        left = _side(step.reactants, energies)
        right = _side(step.products, energies)
        limit = _limit(step, mechanism, left, right, t, treatment, findings)
        if step.through is not None:
            column = energies.index(step.through)
            saddle = energies.reduced[:, column]
            saddle_slope = energies.slope_j_mol[:, column]
            if step.tunnelling != "none":
                log_kappa[:, k], kappa_energy[:, k] = tunnelling(
                    step,
                    energies.saddle_members[step.through],
                    energies.grounds_kj_mol,
                    t,
                    treatment.tunnelling_scale,
                )
                saddle, saddle_slope = saddle - log_kappa[:, k], saddle_slope + kappa_energy[:, k]
            if limit is not None:
                saddle, saddle_slope, limited[:, k] = _join(
                    saddle, saddle_slope, limit, frequency, rt
                )
        elif step.rate is not None:
            saddle, saddle_slope = _declared(step.rate, left, t, frequency, rt)
        else:
            assert limit is not None
            saddle = np.asarray(frequency + limit.start[0] - limit.log_rate, np.longdouble)
            saddle_slope = limit.energy_j_mol - rt + limit.start[1]
            limited[:, k] = True
        reduced[:, k], slope[:, k] = saddle, saddle_slope
        forward[:, k] = frequency + left[0] - saddle
        reverse[:, k] = frequency + right[0] - saddle
    names = tuple(step.through or step.equation for step in mechanism.steps)
    return ElementaryRates(
        names, reduced, slope, forward, reverse, limited, log_kappa, kappa_energy, tuple(findings)
    )


Side = tuple[ExtendedArray, FloatArray]
"""Sum of G/RT, and of the slopes, of one side of a step; shape (b,) each."""


def _side(counts: Mapping[str, int], energies: Energetics) -> Side:
    columns = [energies.index(name) for name in counts]
    weights = np.array(list(counts.values()), dtype=np.float64)
    return energies.reduced[:, columns] @ weights, energies.slope_j_mol[:, columns] @ weights


@dataclass(frozen=True, eq=False)
class _Limit:
    log_rate: FloatArray
    energy_j_mol: FloatArray
    start: Side  # the side with two species that the limit holds for, at each temperature


def _limit(
    step: Step,
    mechanism: Mechanism,
    left: Side,
    right: Side,
    t: FloatArray,
    treatment: Treatment,
    findings: list[Finding],
) -> _Limit | None:
    """Return the collision or diffusion limit of a step, None where it has none."""
    if step.rate is not None:
        return None
    limits = []
    for pair, side in ((_pair(step.reactants), left), (_pair(step.products), right)):
        if pair is None:
            continue
        found = (
            _collision(step, mechanism, pair, t)
            if treatment.phase == "gas"
            else _diffusion(step, pair, t, mechanism.charge, findings)
        )
        if found is None:
            return None
        limits.append(_Limit(*found, side))
    if len(limits) < 2:
        return limits[0] if limits else None
    # both ways have a limit: it is set on the downhill one
    forth, back = limits
    downhill = np.asarray(right[0] <= left[0])
    return _Limit(
        np.where(downhill, forth.log_rate, back.log_rate),
        np.where(downhill, forth.energy_j_mol, back.energy_j_mol),
        (np.where(downhill, left[0], right[0]), np.where(downhill, left[1], right[1])),
    )


def _collision(
    step: Step, mechanism: Mechanism, pair: tuple[str, str], t: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Return ln of the collision limit and its R T^2 d ln k/dT."""
    first, second = (mechanism.composition[name] for name in pair)
    try:
        rate = collision_rate(t, first, second, like=pair[0] == pair[1])
    except KeyError as error:
        mend = "declare the rate constant of this step ([[steps]] rate)"
        what = f"no van der Waals radius of {error.args[0]} for the collision limit"
        raise StudyError(what, where=step.where, mend=mend) from None
    return np.log(rate), 0.5 * GAS_J_MOL_K * t


def _pair(counts: Mapping[str, int]) -> tuple[str, str] | None:
    """Return the two partners of one side, None where it does not have two."""
    members = [name for name, count in counts.items() for _ in range(count)]
    return (members[0], members[1]) if len(members) == 2 else None


def _diffusion(
    step: Step,
    partners: tuple[str, str],
    t: FloatArray,
    charges: Mapping[str, int],
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
    if all(charges.get(name, 0) for name in partners):
        findings.append(
            Finding(
                "diffusion-of-ions",
                "warning",
                file,
                None,
                f"step {step.equation}: both partners are ions, and their attraction or repulsion is "
                "not in the diffusion limit",
                "declare the rate constant of this step",
            )
        )
    viscosity, slope = _viscosity(step, t)
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
    rate = diffusion_rate(t, viscosity, like=partners[0] == partners[1])
    return np.log(rate), GAS_J_MOL_K * t * (1.0 - slope)


def _viscosity(step: Step, t: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return the viscosity and T d ln(viscosity)/dT; ln(viscosity) is linear in 1/T between the points."""
    assert step.viscosity is not None
    points = sorted(step.viscosity)
    temperatures = np.array([point[0] for point in points])
    logs = np.log([point[1] for point in points])
    if len(points) == 1:
        return np.full(t.shape, points[0][1]), np.zeros(t.shape)
    if t.min() < temperatures[0] or t.max() > temperatures[-1]:
        what = (
            f"the viscosities from {temperatures[0]:g} K to {temperatures[-1]:g} K do not cover "
            f"the temperatures from {t.min():g} K to {t.max():g} K"
        )
        raise StudyError(what, where=f"{step.where} viscosity", mend="widen the table")
    inverse = 1.0 / temperatures
    interval = np.clip(np.searchsorted(temperatures, t, side="right") - 1, 0, len(points) - 2)
    gradient = (logs[1:] - logs[:-1]) / (inverse[1:] - inverse[:-1])
    value = logs[interval] + gradient[interval] * (1.0 / t - inverse[interval])
    return np.exp(value), -gradient[interval] / t


def _join(
    saddle: ExtendedArray,
    saddle_slope: FloatArray,
    limit: _Limit,
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


def _declared(
    rate: tuple[float, float, float], left: Side, t: FloatArray, frequency: FloatArray, rt: Any
) -> Side:
    """Return the effective saddle of a declared forward rate constant A (T/298.15 K)^n exp(-E/RT)."""
    factor, power, energy_kj_mol = rate
    log_rate = np.log(factor) + power * np.log(t / REFERENCE_K) - energy_kj_mol * 1000.0 / rt
    energy = power * rt + energy_kj_mol * 1000.0
    return frequency + left[0] - log_rate, energy - rt + left[1]


def rate_unit(counts: Mapping[str, int]) -> str:
    """Return the unit of the rate constant that starts from this side."""
    order = sum(counts.values())
    if order == 1:
        return "s^-1"
    if order == 2:
        return "L mol^-1 s^-1"
    return f"L^{order - 1} mol^-{order - 1} s^-1"


def standard_log_activity(
    concentration_mol_l: FloatArray, form: str, value: float, temperature_k: FloatArray
) -> FloatArray:
    """Return ln a of a concentration against a p-form (Pa) or c-form (mol/L) standard state."""
    if form == "concentration":
        return np.asarray(np.log(concentration_mol_l / value))
    pressure_bar = concentration_mol_l * 1000.0 * GAS_J_MOL_K * temperature_k / BAR_PA
    return np.asarray(np.log(pressure_bar * BAR_PA / value))


def log_concentration(held: Held, temperature_k: FloatArray) -> ExtendedArray:
    """Return ln of the free concentration of a species held at a stated amount, mol/L."""
    if held.value is None:
        raise ValueError("an equilibrium concentration follows from the mechanism")
    value = np.full(len(temperature_k), held.value, np.longdouble)
    if held.form == "pressure":
        value /= np.longdouble(1000.0) * np.longdouble(GAS_J_MOL_K) * temperature_k
    return np.asarray(np.log(value))


def names_of(mechanism: Mechanism) -> Sequence[str]:
    """Return every species and saddle point of the mechanism."""
    return (*mechanism.species, *mechanism.saddles)
