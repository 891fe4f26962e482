"""From thermochemistry over temperature to the rate constants of the elementary steps.

Everything is in the state of 1 mol/L here, so that rate constants come out in L and mol; they do
not depend on the standard state that results are shown in. Reduced free energies G/RT are kept in
extended precision where the platform has it, because the affinity of a reaction close to
equilibrium is a small difference of large ones.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import MOLAR, Conditions, Held, Treatment
from thermo_pp.errors import Finding
from thermo_pp.formulas.rates import log_frequency_factor
from thermo_pp.kinetics.crossing import transmission
from thermo_pp.kinetics.given import given_rate, height_saddle
from thermo_pp.kinetics.limits import Side, join, limit_of
from thermo_pp.kinetics.tunnelling import tunnelling
from thermo_pp.mechanism import Mechanism
from thermo_pp.species import SaddleMember, SpeciesModel
from thermo_pp.units import BAR_PA, FARADAY_C_MOL, GAS_J_MOL_K

FloatArray = NDArray[np.float64]
ExtendedArray = NDArray[np.longdouble]
Factors = tuple[tuple[FloatArray, FloatArray], ...]
"""ln of a factor and R T^2 times its temperature derivative, shape (b, n): of tunnelling and of crossing."""


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
    log_limit, limit_energy_j_mol : shape (b, n)
        What a limit of encounter adds to ln k of a step that has a saddle as well, and to R T^2
        times its temperature derivative, both in the effective saddle already; 0 elsewhere.
    log_transmission, transmission_energy_j_mol : shape (b, n)
        ln of the probability to change the spin state and R T^2 times its temperature derivative, both
        in the effective saddle already; 0 where nothing crosses.
    collider_orders : mapping of str to shape (b, n)
        d ln k/d ln c of the colliders of fall-off steps.
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
    log_limit: FloatArray
    limit_energy_j_mol: FloatArray
    log_transmission: FloatArray
    transmission_energy_j_mol: FloatArray
    collider_orders: Mapping[str, FloatArray]
    findings: tuple[Finding, ...]

    def repeated_factors(self, times: int) -> Factors:
        """Return tunnelling and crossing as they are here, for so many batches of these temperatures."""
        return tuple(
            (np.tile(log, (times, 1)), np.tile(energy, (times, 1)))
            for log, energy in (
                (self.log_kappa, self.kappa_energy_j_mol),
                (self.log_transmission, self.transmission_energy_j_mol),
            )
        )

    def without_limits(self) -> ElementaryRates:
        """Return the steps that have a saddle as they are without their limit of encounter.

        Only the effective saddles are those without; the rest of the record stays.
        """
        return replace(
            self,
            saddle_reduced=self.saddle_reduced + self.log_limit,
            saddle_slope_j_mol=self.saddle_slope_j_mol - self.limit_energy_j_mol,
        )


def elementary_rates(
    mechanism: Mechanism,
    energies: Energetics,
    treatment: Treatment,
    conditions: Conditions,
    factors: Factors | None = None,
) -> ElementaryRates:
    """Return the rate constants of every step; each gets an effective saddle whatever it came from.

    Parameters
    ----------
    mechanism : Mechanism
    energies : Energetics
        Of every species and saddle point of the mechanism.
    treatment : Treatment
        The phase decides which limit fits.
    conditions : Conditions
        How much there is of the colliders of fall-off steps.
    factors : Factors or None
        In place of what tunnelling and crossing give.

    Raises
    ------
    StudyError
        A limit that cannot be worked out: no viscosity, no radius, a viscosity table that does not
        cover the temperatures; a tunnelling correction that has no meaning; a collider that is not
        held.
    """
    t = energies.temperature_k
    b, n = len(t), len(mechanism.steps)
    reduced = np.empty((b, n), np.longdouble, order="F")
    slope = np.empty((b, n), order="F")
    forward, reverse = np.empty((b, n)), np.empty((b, n))
    limited = np.zeros((b, n), np.bool_)
    log_kappa, kappa_energy = np.zeros((b, n)), np.zeros((b, n))
    log_transmission, crossing_energy = np.zeros((b, n)), np.zeros((b, n))
    log_limit, limit_energy = np.zeros((b, n)), np.zeros((b, n))
    orders: dict[str, FloatArray] = {}
    findings: list[Finding] = []
    frequency = log_frequency_factor(t)
    rt = GAS_J_MOL_K * t
    for k, step in enumerate(mechanism.steps):
        left = _side(step.reactants, energies)
        right = _side(step.products, energies)
        limit = limit_of(step, mechanism, left, right, t, treatment, findings)
        if step.is_declared:
            given = given_rate(step, t, conditions)
            saddle, saddle_slope = given.saddle(left, frequency, rt)
            for name, order in given.orders.items():
                orders.setdefault(name, np.zeros((b, n)))[:, k] = order
        elif step.barrierless:
            assert limit is not None
            saddle = np.asarray(frequency + limit.start[0] - limit.log_rate, np.longdouble)
            saddle_slope = limit.energy_j_mol - rt + limit.start[1]
            limited[:, k] = True
        else:
            if step.height is not None:
                saddle, saddle_slope = height_saddle(step, left, right, t, findings)
            else:
                assert step.through is not None
                column = energies.index(step.through)
                saddle = energies.reduced[:, column]
                saddle_slope = energies.slope_j_mol[:, column]
            if step.crossing is not None:
                log_transmission[:, k], crossing_energy[:, k] = (
                    (factors[1][0][:, k], factors[1][1][:, k])
                    if factors is not None
                    else transmission(step, energies.saddle_members[str(step.through)], t)
                )
                saddle = saddle - log_transmission[:, k]
                saddle_slope = saddle_slope + crossing_energy[:, k]
            if step.tunnelling != "none":
                log_kappa[:, k], kappa_energy[:, k] = (
                    (factors[0][0][:, k], factors[0][1][:, k])
                    if factors is not None
                    else tunnelling(
                        step,
                        energies.saddle_members[str(step.through)],
                        energies.grounds_kj_mol,
                        t,
                        treatment.tunnelling_scale,
                    )
                )
                saddle, saddle_slope = saddle - log_kappa[:, k], saddle_slope + kappa_energy[:, k]
            if limit is not None:
                bare, bare_slope = saddle, saddle_slope
                saddle, saddle_slope, limited[:, k] = join(bare, bare_slope, limit, frequency, rt)
                log_limit[:, k], limit_energy[:, k] = bare - saddle, saddle_slope - bare_slope
        reduced[:, k], slope[:, k] = saddle, saddle_slope
        forward[:, k] = frequency + left[0] - saddle
        reverse[:, k] = frequency + right[0] - saddle
    names = tuple(step.through or step.equation for step in mechanism.steps)
    return ElementaryRates(
        names,
        reduced,
        slope,
        forward,
        reverse,
        limited,
        log_kappa,
        kappa_energy,
        log_limit,
        limit_energy,
        log_transmission,
        crossing_energy,
        orders,
        tuple(findings),
    )


def _side(counts: Mapping[str, int], energies: Energetics) -> Side:
    reduced = np.zeros(len(energies.temperature_k), np.longdouble)
    slope = np.zeros(len(energies.temperature_k))
    for name, count in counts.items():
        reduced += count * energies.reduced[:, energies.index(name)]
        slope += count * energies.slope_j_mol[:, energies.index(name)]
    return reduced, slope


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
    if held.form == "potential":
        return -value * np.longdouble(FARADAY_C_MOL) / (np.longdouble(GAS_J_MOL_K) * temperature_k)
    if held.form == "pressure":
        value /= np.longdouble(1000.0) * np.longdouble(GAS_J_MOL_K) * temperature_k
    return np.asarray(np.log(value))


def names_of(mechanism: Mechanism) -> Sequence[str]:
    """Return every species and saddle point of the mechanism."""
    return (*mechanism.species, *mechanism.saddles)
