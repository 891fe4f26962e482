"""Notes: the sentences below a table, and which temperatures a page for people shows."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from thermo_pp import __version__
from thermo_pp.conditions import Treatment
from thermo_pp.output.tables import Block

USUAL_K = 298.15
ALL_DIGITS = "Every temperature and all digits: --format csv or json."

_LOW_MODES = {
    "harmonic": "harmonic throughout",
    "raised": "wavenumbers below {onset} raised to it",
    "rotor-entropy": "entropy towards a free rotor's below {onset} (rotor-entropy)",
    "rotor-enthalpy": "entropy and enthalpy towards a free rotor's below {onset} (rotor-enthalpy)",
}


def of_treatment(treatment: Treatment) -> str:
    """Return standard state, soft modes and whatever differs from the defaults, as one sentence."""
    onset = f"{treatment.onset_cm:g} cm⁻¹"
    parts = [
        f"Standard state {treatment.standard_state.text}",
        f"soft modes: {_LOW_MODES[treatment.low_modes].format(onset=onset)}",
    ]
    if treatment.rotor != "auto":
        parts.append("classical rotors")
    if treatment.phase != "gas":
        parts.append("in solution")
    if treatment.masses != "program":
        parts.append("average masses")
    if treatment.frequency_scale != 1.0:
        parts.append(f"wavenumbers times {treatment.frequency_scale:g}")
    if treatment.zero_point_scale != 1.0:
        parts.append(f"zero-point energies times {treatment.zero_point_scale:g}")
    if treatment.tunnelling_scale != 1.0:
        parts.append(f"imaginary wavenumbers in tunnelling times {treatment.tunnelling_scale:g}")
    if treatment.real_below_cm is not None:
        parts.append(f"imaginary modes below {treatment.real_below_cm:g} cm⁻¹ taken as real")
    if treatment.enantiopure:
        parts.append("one hand of chiral structures")
    if treatment.entropy_correction_j_mol_k != 0.0:
        parts.append(
            f"{treatment.entropy_correction_j_mol_k:g} J mol⁻¹ K⁻¹ added to every entropy, as declared"
        )
    return "; ".join(parts) + "."


def stamp() -> str:
    """Return what made the table."""
    return f"thermo_pp {__version__}; constants: CODATA 2022."


def for_a_report(blocks: Sequence[Block]) -> list[Block]:
    """Return blocks without the hint that a command has more digits: a report has them beside."""
    return [
        block
        if isinstance(block, str)
        else replace(block, about=[note for note in block.about if note != ALL_DIGITS])
        for block in blocks
    ]


def usual(temperature_k: NDArray[np.float64]) -> int:
    """Return which temperature comes nearest to 298.15 K."""
    return int(np.argmin(np.abs(temperature_k - USUAL_K)))


def some(count: int, at_most: int) -> list[int]:
    """Return up to `at_most` of the numbers below `count`, evenly spread, both ends included."""
    if count <= at_most:
        return list(range(count))
    return sorted({round(k * (count - 1) / (at_most - 1)) for k in range(at_most)})


def kelvin(value: float) -> str:
    """Return a temperature as it stands in a title."""
    return f"{value:.10g} K"
