"""Tunnelling's share in the effective rate: the rate against the same without tunnelling."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

from thermo_pp.kinetics.model import Rates
from thermo_pp.kinetics.point import sensed
from thermo_pp.kinetics.results import Rate
from thermo_pp.names import Definition


def with_tunnelling(
    found: Mapping[Definition, Rate | None], rates: Rates
) -> dict[Definition, Rate | None]:
    """Return the rates with what tunnelling adds to ln k and to the Arrhenius energy.

    Parameters
    ----------
    found : mapping of definition to Rate or None
    rates : Rates
        That they were made from.
    """
    mechanism = rates.model.mechanism
    if all(step.tunnelling == "none" for step in mechanism.steps):
        return dict(found)
    steps = tuple(replace(step, tunnelling="none") for step in mechanism.steps)
    model = replace(rates.model, mechanism=replace(mechanism, steps=steps))
    bare = model.at(rates.energies.temperature_k)
    with_shares: dict[Definition, Rate | None] = {}
    for name, rate in found.items():
        if rate is None:
            with_shares[name] = None
            continue
        own, other = sensed(rates, name)[0], sensed(bare, name)[0]
        with_shares[name] = replace(
            rate,
            log_tunnelling=own.log - other.log,
            tunnelling_energy_kj_mol=(own.energy_j_mol - other.energy_j_mol) / 1000.0,
        )
    return with_shares
