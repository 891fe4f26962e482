"""What the limits of encounter change: the rate and its controls against the same without them."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import numpy as np

from thermo_pp.kinetics.model import Rates
from thermo_pp.kinetics.point import sensed
from thermo_pp.kinetics.results import Rate
from thermo_pp.names import Definition

_NOTHING = 1e-6
"""Change of ln k of a step that counts as none."""


def with_limits(
    found: Mapping[Definition, Rate | None], rates: Rates
) -> dict[Definition, Rate | None]:
    """Return the rates with what the limits add to ln k and E_a, and the controls without them.

    Only limits that are joined with a saddle count: a step that has no barrier has no rate without
    its limit.

    Parameters
    ----------
    found : mapping of definition to Rate or None
    rates : Rates
        That they were made from.
    """
    if not np.any(np.abs(rates.steps.log_limit) > _NOTHING):
        return dict(found)
    bare = Rates(rates.model, rates.energies, rates.steps.without_limits())
    with_shares: dict[Definition, Rate | None] = {}
    for name, rate in found.items():
        if rate is None:
            with_shares[name] = None
            continue
        (own, _), (other, control) = sensed(rates, name), sensed(bare, name)
        with_shares[name] = replace(
            rate,
            log_limit=own.log - other.log,
            limit_energy_kj_mol=(own.energy_j_mol - other.energy_j_mol) / 1000.0,
            control_without_limit=control,
        )
    return with_shares
