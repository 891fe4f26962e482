"""Holding: the Arrhenius energy of a gas at constant concentration and at constant pressure."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

from thermo_pp.kinetics.model import Rates
from thermo_pp.kinetics.point import sensed
from thermo_pp.kinetics.results import Rate
from thermo_pp.names import CONSTANTS, Definition


def with_holding(
    found: Mapping[Definition, Rate | None], rates: Rates
) -> dict[Definition, Rate | None]:
    """Return the rates with their Arrhenius energy at constant concentration and at constant pressure.

    Both are of the amounts that are there at each temperature; only what stays when it changes
    differs. Nothing is added in solution and where nothing is held in a gas.

    Parameters
    ----------
    found : mapping of definition to Rate or None
    rates : Rates
        That they were made from.
    """
    model = rates.model
    amounts = [*model.conditions.held.values(), model.conditions.total_gas]
    if model.treatment.phase != "gas" or not any(
        one is not None and one.value is not None for one in amounts
    ):
        return dict(found)
    t = rates.energies.temperature_k
    seen = {
        name: replace(model, conditions=replace(model.conditions, seen=name)).at(t)
        for name in CONSTANTS
    }
    return {
        definition: rate
        and replace(
            rate,
            arrhenius_energy_constant_kj_mol={
                name: sensed(other, definition)[0].energy_j_mol / 1000.0
                for name, other in seen.items()
            },
        )
        for definition, rate in found.items()
    }
