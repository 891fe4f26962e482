"""What is doubtful about effective rates, in findings."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding
from thermo_pp.kinetics.model import Rates
from thermo_pp.kinetics.results import (
    NEXT_DECAY_BELOW,
    NOTABLE,
    SLOW_SHARE_BELOW,
    Rate,
)
from thermo_pp.mechanism import Mechanism
from thermo_pp.names import Definition, Severity

if TYPE_CHECKING:
    from collections.abc import Mapping

FloatArray = NDArray[np.float64]

HIGH_PRESSURE_CONTROL = 0.1


def rate_findings(
    found: Mapping[Definition, Rate | None], rates: Rates, file: str
) -> tuple[Finding, ...]:
    """Return what the reader of the numbers should doubt."""
    findings: list[Finding] = []
    t = rates.energies.temperature_k

    def add(code: str, severity: Severity, what: str, mend: str) -> None:
        findings.append(Finding(code, severity, file, None, what, mend))

    pool, relaxing = found["pool"], found["relaxation"]
    if pool is not None and pool.slow_share is not None and pool.next_decay_ratio is not None:
        mixed = (pool.next_decay_ratio < NEXT_DECAY_BELOW) | (pool.slow_share < SLOW_SHARE_BELOW)
        if mixed.any():
            add(
                "several-decays",
                "warning",
                f"the pool does not decay with one constant at {_temperatures(t[mixed])}: the share of the "
                f"slowest decay is {pool.slow_share[mixed].min():.3g} at the least, and the next one is "
                f"{pool.next_decay_ratio[mixed].min():.3g} times faster at the least",
                "compare with a measurement that resolves the decays, or with the headline constant",
            )
    if pool is not None and relaxing is not None:
        differ = np.abs(np.expm1(rates.relaxation.log - rates.pool.rate.log)) > NOTABLE
        if differ.any():
            add(
                "product-returns",
                "warning",
                "with the product staying, the relaxation differs from the pool's decay by more than "
                f"5 % at {_temperatures(t[differ])}",
                "compare with the relaxation constant where the product is not taken away",
            )
    for definition, rate in found.items():
        if rate is not None and np.any(rate.rate_constant < 0.0):
            backwards = rate.rate_constant < 0.0
            add(
                "runs-backwards",
                "warning",
                f"{definition}: the net reaction runs backwards at {_temperatures(t[backwards])}",
                "check the held amounts of reactants and products",
            )
    if rates.model.treatment.phase == "gas":
        for number, step in enumerate(rates.model.mechanism.steps):
            name = rates.steps.names[number]
            one_side = 1 in (sum(step.reactants.values()), sum(step.products.values()))
            if (
                one_side
                and step.falloff is None
                and any(
                    rate is not None and np.any(np.abs(rate.control[name]) > HIGH_PRESSURE_CONTROL)
                    for rate in found.values()
                )
            ):
                add(
                    "high-pressure-limit",
                    "note",
                    f"high-pressure limit assumed for step {step.equation!r}, which controls the rate",
                    "at low pressure declare a fall-off rate constant for it",
                )
    return tuple(findings)


def unused_point(mechanism: Mechanism) -> tuple[Finding, ...]:
    """Say of a linear network that the point which the study asks for changes nothing."""
    if mechanism.point is None:
        return ()
    return (
        Finding(
            code="point-not-used",
            severity="note",
            file=mechanism.where,
            line=None,
            what=f"the network is linear: its rate constants are the same at {mechanism.point.text!r} "
            "as at any other point",
            mend="take at (and rate_law) out of [effective]",
        ),
    )


def _temperatures(values: FloatArray) -> str:
    if len(values) == 1:
        return f"{values[0]:g} K"
    return f"{len(values)} temperatures from {values.min():g} K to {values.max():g} K"
