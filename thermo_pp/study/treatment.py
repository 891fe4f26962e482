"""``[treatment]``: how outputs are turned into H, S and G."""

from __future__ import annotations

from msgspec import UnsetType

from thermo_pp import conditions as made
from thermo_pp.conditions import Treatment
from thermo_pp.errors import StudyError
from thermo_pp.names import Phase
from thermo_pp.study.check import place
from thermo_pp.study.keys import (
    Quantity,
    RealBelowKeys,
    TreatmentKeys,
)
from thermo_pp.study.values import above_zero
from thermo_pp.units import quantity


def make_treatment(keys: TreatmentKeys, file: str) -> Treatment:
    """Turn ``[treatment]`` into a Treatment."""
    scale = keys.frequency_scale
    zero_point_scale = keys.zero_point_scale
    tunnelling_scale = keys.tunnelling_scale
    return Treatment(
        standard_state=made.standard_state(
            keys.standard_state, where=place(file, "treatment", "standard_state")
        ),
        phase=keys.phase,
        low_modes=keys.low_modes,
        onset_cm=above_zero(keys.onset, "1/cm", place(file, "treatment", "onset")),
        rotor=keys.rotor,
        masses=keys.masses,
        real_below_cm=real_below(keys.imaginary, place(file, "treatment", "imaginary.real_below")),
        frequency_scale=scale,
        zero_point_scale=scale if isinstance(zero_point_scale, UnsetType) else zero_point_scale,
        tunnelling_scale=scale if isinstance(tunnelling_scale, UnsetType) else tunnelling_scale,
        enantiopure=keys.enantiopure,
        entropy_correction_j_mol_k=entropy_correction(
            keys.entropy_correction, keys.phase, place(file, "treatment", "entropy_correction")
        ),
    )


def entropy_correction(value: Quantity | UnsetType, phase: Phase, where: str) -> float:
    """Turn a declared entropy correction into J/(mol K), 0 where none is declared."""
    if isinstance(value, UnsetType):
        return 0.0
    if phase != "solution":
        raise StudyError(
            "an entropy correction in the gas phase",
            where=where,
            mend='take it out, or write phase = "solution" under [treatment]',
        )
    return quantity(value, "J/mol/K", where=where)


def real_below(value: str | RealBelowKeys, where: str) -> float | None:
    """Turn the word on imaginary modes into cm^-1, None where all are refused."""
    return above_zero(value.real_below, "1/cm", where) if isinstance(value, RealBelowKeys) else None
