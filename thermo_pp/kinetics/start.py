"""Where a time course or a flow starts: mass action with the study's amounts, at each temperature."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import Conditions, Held
from thermo_pp.errors import StudyError
from thermo_pp.kinetics.mass_action import System, log_held, mass_action
from thermo_pp.kinetics.network import CLOSED_WITHIN
from thermo_pp.kinetics.steps import ElementaryRates, Energetics, elementary_rates, energetics
from thermo_pp.loops import equilibrium_of, held_loops
from thermo_pp.mechanism import Mechanism
from thermo_pp.names import Constant
from thermo_pp.units import GAS_J_MOL_K

if TYPE_CHECKING:
    from thermo_pp.kinetics.asked import StudyLike

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Start:
    """What there is at the start, at one temperature; s species, p responses.

    Attributes
    ----------
    system : System
        With in- and outflow where there is a flow.
    concentration : shape (s,)
        mol/L; what flows in where a flow has no initial concentrations.
    response : shape (s, p)
        Of the start: an amount given as a pressure thins out on heating.
    feed : shape (s,) or None
        What flows in, mol/L.
    held_mol_l : mapping of str to float
    """

    system: System
    concentration: FloatArray
    response: FloatArray
    feed: FloatArray | None
    held_mol_l: Mapping[str, float]


def energies_of(study: StudyLike, temperature_k: FloatArray) -> Energetics:
    """Return the energies of all species and saddles of a study at b temperatures."""
    names = (*study.mechanism.species, *study.mechanism.saddles)
    return energetics({name: study.species[name] for name in names}, temperature_k)


def systems(
    study: StudyLike,
    energies: Energetics,
    *,
    flowing: bool = False,
    seen: Constant | None = None,
) -> tuple[Start, ...]:
    """Return the start at each temperature.

    Parameters
    ----------
    study : StudyLike
    energies : Energetics
        Of `energies_of`, at b temperatures.
    flowing : bool
        With the study's flow.
    seen : {"concentration", "pressure"} or None
        What of a gas counts as constant in derivatives by temperature, in place of what the study says.

    Raises
    ------
    StudyError
        The study says nothing of what there is, or holds species that are out of balance.
    """
    mechanism = study.mechanism
    conditions = study.conditions if seen is None else replace(study.conditions, seen=seen)
    rates = elementary_rates(mechanism, energies, study.treatment, conditions)
    return starts(mechanism, conditions, energies, rates, flowing=flowing)


def starts(
    mechanism: Mechanism,
    conditions: Conditions,
    energies: Energetics,
    rates: ElementaryRates,
    *,
    flowing: bool = False,
) -> tuple[Start, ...]:
    """Return the start at each of b temperatures, from energies that are known; else as `systems`."""
    given = {**conditions.initial, **conditions.total}
    temperature_k = energies.temperature_k
    if not given and not (flowing and conditions.flow):
        raise StudyError(
            "a time course needs to know what there is at the start",
            where=f"{mechanism.where} [conditions]",
            mend='add initial = { A = "0.1 mol/L" }, with every species that is there at the start',
        )
    equilibrium = equilibrium_of(mechanism, conditions.held, driven=conditions.driven)
    held = log_held(conditions.held, equilibrium, energies)
    if not conditions.driven:
        check_balance(mechanism, conditions, held, energies)
    found = []
    for k, system in enumerate(mass_action(mechanism, conditions, energies, rates, equilibrium)):
        t = float(temperature_k[k])
        amounts, response = _amounts(system, given, t, conditions.seen)
        feed = None
        if flowing and conditions.flow is not None:
            feed, thinning = _amounts(system, conditions.flow.feed, t, conditions.seen)
            with np.errstate(divide="ignore", invalid="ignore"):
                slope = np.where(feed > 0.0, thinning[:, -1] / feed, 0.0)
            system = system.with_flow(feed, conditions.flow.residence_s, slope)
            if not given:
                amounts, response = feed, thinning
        at = {name: float(np.exp(log[k])) for name, log in held.items()}
        found.append(Start(system, amounts, response, feed, at))
    return tuple(found)


def _amounts(
    system: System, given: Mapping[str, Held], temperature_k: float, seen: Constant | None
) -> tuple[FloatArray, FloatArray]:
    """Return concentrations, shape (s,), and their responses, shape (s, p)."""
    amounts = np.zeros(len(system.names))
    response = np.zeros((len(system.names), len(system.responses)))
    for name, how in given.items():
        column = system.names.index(name)
        amounts[column] = float(how.concentration_mol_l(temperature_k))
        slope = float(how.log_slope(np.array(temperature_k), seen))
        response[column, -1] = slope * GAS_J_MOL_K * temperature_k * amounts[column]
    return amounts, response


def check_balance(
    mechanism: Mechanism,
    conditions: Conditions,
    log_concentration: Mapping[str, NDArray[np.longdouble]],
    energies: Energetics,
) -> None:
    """Check that held species are in balance with each other.

    Parameters
    ----------
    mechanism : Mechanism
    conditions : Conditions
    log_concentration : mapping of str to shape (b,)
        Of every held species.
    energies : Energetics

    Raises
    ------
    StudyError
        The affinity of a loop is not zero within 0.01 RT at some temperature.
    """
    t = energies.temperature_k
    for loop in held_loops(mechanism, conditions.held):
        affinity = np.zeros(len(t), np.longdouble)
        for name, count in loop.net:
            potential = energies.reduced[:, energies.index(name)] + log_concentration[name]
            affinity = affinity - count * potential
        worst = int(np.argmax(np.abs(affinity)))
        if abs(affinity[worst]) > CLOSED_WITHIN:
            raise StudyError(
                f"held species are out of balance: {loop.net_reaction} has an affinity of "
                f"{float(affinity[worst]):.4g} RT at {t[worst]:g} K, not 0",
                where=f"{mechanism.where} [conditions] held",
                mend='hold one of them at "equilibrium", mend its amount, or say driven = true',
            )
