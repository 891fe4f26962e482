"""A mechanism that can be asked for its exact rates at any temperature, with any energy moved."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from fractions import Fraction
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import Conditions, Held, Treatment
from thermo_pp.errors import StudyError
from thermo_pp.kinetics.closed import decays, relaxation
from thermo_pp.kinetics.cycle import Turn, alike, per_cycle, turns
from thermo_pp.kinetics.drained import Drained
from thermo_pp.kinetics.edges import LogRate
from thermo_pp.kinetics.free import Amount, per_free_reactant
from thermo_pp.kinetics.network import Network, check_loops, linear_network
from thermo_pp.kinetics.pool import Pool, per_pool
from thermo_pp.kinetics.products import per_free_reactant_driven
from thermo_pp.kinetics.scaled import Scaled
from thermo_pp.kinetics.spectrum import Spectrum
from thermo_pp.kinetics.steps import (
    ElementaryRates,
    Energetics,
    elementary_rates,
    energetics,
    log_concentration,
)
from thermo_pp.loops import equilibrium_of, held_loops
from thermo_pp.mechanism import Mechanism
from thermo_pp.names import Definition
from thermo_pp.species import SpeciesModel
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Model:
    """What the effective rate is worked out from.

    Attributes
    ----------
    mechanism : Mechanism
    conditions : Conditions
    treatment : Treatment
    species : mapping of str to SpeciesModel
    """

    mechanism: Mechanism
    conditions: Conditions
    treatment: Treatment
    species: Mapping[str, SpeciesModel]

    def at(self, temperature_k: FloatArray) -> Rates:
        """Return the rates at temperatures of shape (b,)."""
        names = (*self.mechanism.species, *self.mechanism.saddles)
        energies = energetics({name: self.species[name] for name in names}, temperature_k)
        return self.of(energies)

    def of(self, energies: Energetics) -> Rates:
        """Return the rates that free energies lead to."""
        steps = elementary_rates(self.mechanism, energies, self.treatment, self.conditions)
        return Rates(self, energies, steps)


@dataclass(frozen=True, eq=False)
class Rates:
    """The rates of a model at b temperatures, worked out where they are asked for.

    Attributes
    ----------
    model : Model
    energies : Energetics
    steps : ElementaryRates
    numbers : type
        What rates are worked out in: `Scaled`, or `Ordinary` where speed counts.
    """

    model: Model
    energies: Energetics
    steps: ElementaryRates
    numbers: type[Scaled] = Scaled

    @cached_property
    def network(self) -> Network:
        """The linear network."""
        model = self.model
        network = linear_network(
            model.mechanism, model.conditions, self.energies, self.steps, self.equilibrium
        )
        return replace(network, numbers=self.numbers)

    @cached_property
    def equilibrium(self) -> dict[str, dict[str, Fraction]]:
        """What every species held at equilibrium is in equilibrium with."""
        conditions = self.model.conditions
        return equilibrium_of(self.model.mechanism, conditions.held, driven=conditions.driven)

    @cached_property
    def turns(self) -> list[Turn]:
        """Closed ways of the catalyst, the least one that makes a product first."""
        name = self.model.mechanism.catalyst
        network = self.network
        where = f"{self.model.mechanism.where} [effective]"
        lost = [k for k in network.reached(self.start) if self.start not in network.reached(k)]
        if lost:
            names = ", ".join(network.states[k][0][0] for k in lost)
            raise StudyError(
                f"no way leads back to the catalyst {name} from {names}: all of it ends up there",
                where=f"{where} catalyst",
                mend="name a state of the cycle itself, hold the product that the way back needs, or take "
                "the step out",
            )
        found = turns(network, self.start)
        if not found or not found[0].product:
            raise StudyError(
                "no closed way of the catalyst's states gives off the product",
                where=f"{where} product",
                mend="check the product's name and that the last step gives the catalyst back",
            )
        return found

    @cached_property
    def turn(self) -> Turn | None:
        """One run of the catalyst's cycle; None where the question is not about a catalyst."""
        return None if self.model.mechanism.catalyst is None else self.turns[0]

    @cached_property
    def one_reaction(self) -> bool:
        """Whether every closed way of the catalyst has the same net reaction."""
        return not self.model.conditions.driven and alike(self.turns)

    def check(self) -> None:
        """Check that held species are in balance with each other, unless the study says otherwise."""
        model = self.model
        if not model.conditions.driven:
            check_loops(
                self.network, model.mechanism, held_loops(model.mechanism, model.conditions.held)
            )

    @cached_property
    def start(self) -> int:
        """The reactant's, or the catalyst's, state."""
        mechanism = self.model.mechanism
        name = mechanism.catalyst or mechanism.reactant
        key = "catalyst" if mechanism.catalyst else "reactant"
        where = f"{self.model.mechanism.where} [effective] {key}"
        if name is None:
            mend = 'name it: [effective] reactant = "..." and product = "...", or catalyst = "..."'
            raise StudyError("the study does not say what the rate is of", where=where, mend=mend)
        if ((name, 1),) not in self.network.states:
            mend = "name a species that a step uses and that is not held"
            raise StudyError(f"{name} is no state of the network", where=where, mend=mend)
        return self.network.state(name)

    @cached_property
    def products(self) -> tuple[int, ...]:
        """The states that are made of products only, where the reactant can lead to them."""
        wanted = set(self.model.mechanism.products)
        found = [
            number
            for number, end in enumerate(self.network.states)
            if all(name in wanted for name, _ in end)
        ]
        reached = set(self.network.reached(self.start, frozenset(found)))
        found = [number for number in found if number in reached]
        if not found:
            names = ", ".join(self.model.mechanism.products) or "a product"
            there = ", ".join(self.network.states[k][0][0] for k in reached)
            raise StudyError(
                f"no way leads from {self.model.mechanism.reactant} to {names}; it leads to {there} only",
                where=f"{self.model.mechanism.where} [effective] product",
                mend="add the missing step, or mend the name of the product",
            )
        return tuple(found)

    def amounts(self) -> tuple[Amount | None, ...]:
        """Return how much of each product is held, over the reactant."""
        held = self.model.conditions.held
        t = self.network.temperature_k
        name = self.model.mechanism.reactant
        reactant = np.zeros(len(t), np.longdouble)
        reactant_slope = np.zeros(len(t))
        if name in held and held[name].value is not None:
            reactant = log_concentration(held[name], t)
            reactant_slope = self._holding(held[name], t)
        found: list[Amount | None] = []
        for number in self.products:
            end = self.network.states[number]
            if any(name not in held for name, _ in end):
                found.append(None)
                continue
            log = -reactant
            slope = -reactant_slope
            for member, count in end:
                log = log + count * log_concentration(held[member], t)
                slope = slope + count * self._holding(held[member], t)
            found.append(Amount(log, slope))
        return tuple(found)

    def _holding(self, held: Held, temperature_k: FloatArray) -> FloatArray:
        """Return R T^2 d ln c/dT of a held species."""
        seen = self.model.conditions.seen
        return GAS_J_MOL_K * temperature_k * held.log_slope(temperature_k, seen)

    @cached_property
    def free(self) -> LogRate:
        """Rate per free reactant."""
        asked = self.network, self.start, self.products, self.amounts()
        if self.model.conditions.driven:
            return per_free_reactant_driven(*asked)
        return per_free_reactant(*asked, self._drained)[0]

    @cached_property
    def _drained(self) -> Drained:
        return Drained.of(self.network, self.start, self.products)

    @cached_property
    def pool(self) -> Pool:
        """Slowest decay of the pool."""
        return per_pool(self.network, self.start, self.products, self._drained)

    @cached_property
    def pool_decays(self) -> list[Spectrum]:
        """All decays of the pool, where the network is in balance."""
        return decays(self.network, self.start, self.pool.members, absorbing=True)

    @cached_property
    def relaxation(self) -> LogRate:
        """Slowest decay of the closed network."""
        return relaxation(self.network, self.start)[0]

    @cached_property
    def cycle(self) -> tuple[LogRate, list[int], FloatArray]:
        """Turnovers of the catalyst, its states, and their shares."""
        turn = self.turns[0]
        endless = bool(turn.absent.any())
        return per_cycle(self.network, self.start, turn, endless, not self.one_reaction)

    def definitions(self) -> tuple[Definition, ...]:
        """Return the definitions that apply."""
        if self.model.mechanism.catalyst is not None:
            return ("cycle",)
        closed = all(len(end) == 1 and end[0][1] == 1 for end in self.network.states)
        if closed and not self.model.conditions.driven:
            return ("free", "pool", "relaxation")
        return ("free", "pool")

    def rate(self, definition: Definition) -> LogRate:
        """Return the rate in one definition."""
        if definition == "free":
            return self.free
        if definition == "pool":
            return self.pool.rate
        if definition == "relaxation":
            return self.relaxation
        return self.cycle[0]

    def moved(self, name: str, by_j_mol: FloatArray) -> Rates:
        """Return the rates with the free energy of a species or an effective saddle moved by (b,) J/mol."""
        shift = by_j_mol / (GAS_J_MOL_K * self.energies.temperature_k)
        if name in self.steps.names:
            columns = [k for k, other in enumerate(self.steps.names) if other == name]
            reduced, slope = self.steps.saddle_reduced.copy(), self.steps.saddle_slope_j_mol.copy()
            reduced[:, columns] += shift[:, np.newaxis]
            slope[:, columns] += by_j_mol[:, np.newaxis]
            steps = replace(self.steps, saddle_reduced=reduced, saddle_slope_j_mol=slope)
            return replace(self, steps=steps)
        column = self.energies.index(name)
        reduced, slope = self.energies.reduced.copy(), self.energies.slope_j_mol.copy()
        reduced[:, column] += shift
        slope[:, column] += by_j_mol
        return replace(self, energies=replace(self.energies, reduced=reduced, slope_j_mol=slope))
