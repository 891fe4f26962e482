"""Rotors: which rotor a structure is treated with, from its geometry or from given constants."""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding, StudyError
from thermo_pp.formulas.partition import SPIN_WEIGHTS, quantum_rotor_changes
from thermo_pp.formulas.rotor import NO_SPIN_WEIGHTS, RigidRotor, rigid_rotor
from thermo_pp.names import NUCLEAR_SPINS, NuclearSpins, Rotor
from thermo_pp.nearest import suggestion
from thermo_pp.records import Calculation
from thermo_pp.units import KELVIN_PER_CM, quantity

FloatArray = NDArray[np.float64]

CONSTANT_DIFFERS = 0.05
"""A given rotational constant that is farther from the geometry's, relatively, is a finding."""
_MEND = 'write rotational_constants = { B = "59.3219 cm^-1", D = "0.04599 cm^-1" }'
_ORTHO_ODD = {1: True, 2: False, 3: True}
"""Whether ortho, the kind with the larger weight, has the odd levels, by mass number."""


def settled_rotor(
    calculation: Calculation,
    masses: FloatArray,
    symmetry_number: int,
    rotor: Rotor,
    constants: Mapping[str, Any] | None,
    spins: NuclearSpins | None,
    name: str,
    where: str,
) -> tuple[RigidRotor, tuple[Finding, ...]]:
    """Return the rotor and what is doubtful about it.

    Parameters
    ----------
    calculation : Calculation
    masses : shape (n,)
    symmetry_number : int
    rotor : {"auto", "classical"}
    constants : mapping or None
        ``B`` and, if need be, ``D`` of a linear molecule, cm^-1 or a text with a unit; then its
        levels are summed.
    spins : one of `names.NUCLEAR_SPINS` or None
        Of H2, D2 and T2; None is equilibrium.
    name, where : str
        For messages.

    Raises
    ------
    StudyError
        Constants of what is not linear or beside ``rotor = "classical"``, a distortion that is not
        small, nuclear spins of another molecule than H2, D2 or T2.
    """
    found = rigid_rotor(masses, calculation.positions_angstrom, symmetry_number)
    notes: tuple[Finding, ...] = ()
    weights = _spin_weights(calculation, masses)
    if rotor == "classical":
        for key, value in (("rotational_constants", constants), ("nuclear_spins", spins)):
            if value is not None:
                raise StudyError(
                    f'{name}: {key} is for a sum over levels, and rotor is "classical"',
                    where=f"{where} {key}",
                    mend='take one of the two out, or write rotor = "auto"',
                )
        return found, notes
    found = dataclasses.replace(found, spin_weights=weights)
    if constants is not None:
        found, notes = _with_constants(found, constants, calculation, name, where)
    else:
        found = dataclasses.replace(found, quantum=quantum_rotor_changes(found))
    if spins is not None:
        found = _with_spins(found, spins, masses, name, f"{where} nuclear_spins")
    return found, notes


def _with_constants(
    rotor: RigidRotor, constants: Mapping[str, Any], calculation: Calculation, name: str, where: str
) -> tuple[RigidRotor, tuple[Finding, ...]]:
    """Return the rotor with given B and D, summed over its levels."""
    where = f"{where} rotational_constants"
    if rotor.kind != "linear":
        kind = "an atom" if rotor.kind == "atom" else "not linear"
        raise StudyError(
            f"{name}: rotational constants are given, and it is {kind}",
            where=where,
            mend="take them out: they are for linear molecules",
        )
    unknown = [key for key in constants if key not in ("B", "D")]
    if unknown or "B" not in constants:
        what = f"unknown constant {unknown[0]!r}" if unknown else "B is missing"
        raise StudyError(f"{name}: {what}", where=where, mend=_MEND)
    b = quantity(constants["B"], "1/cm", where=f"{where}.B")
    d = quantity(constants.get("D", 0.0), "1/cm", where=f"{where}.D")
    if b <= 0.0 or not 0.0 <= d < b / 100.0:
        raise StudyError(
            f"{name}: B = {b:g} cm^-1 and D = {d:g} cm^-1 are no constants of a molecule",
            where=where,
            mend="B is above 0, D much smaller and not below 0",
        )
    notes = []
    own = rotor.theta_k[0] / KELVIN_PER_CM
    if abs(b / own - 1.0) > CONSTANT_DIFFERS:
        notes.append(
            Finding(
                "rotational-constant-differs",
                "warning",
                calculation.path,
                calculation.where.get("positions_angstrom"),
                f"{name}: B = {b:g} cm^-1 is given, its geometry and masses have {own:.5g} cm^-1",
                "check the constant, its unit and the isotopes it belongs to",
            )
        )
    changed = dataclasses.replace(
        rotor, theta_k=(b * KELVIN_PER_CM,), distortion_k=d * KELVIN_PER_CM, quantum=True
    )
    return changed, tuple(notes)


def _with_spins(
    rotor: RigidRotor, spins: NuclearSpins, masses: FloatArray, name: str, where: str
) -> RigidRotor:
    """Return the rotor with its even and odd levels at equilibrium or apart."""
    if spins not in NUCLEAR_SPINS:
        raise StudyError(
            f"unknown choice {spins!r}",
            where=where,
            mend=suggestion(str(spins), NUCLEAR_SPINS, "choices"),
        )
    if rotor.spin_weights == NO_SPIN_WEIGHTS:
        raise StudyError(
            f"{name}: nuclear spins are told apart for H2, D2 and T2 only",
            where=where,
            mend="take the key out",
        )
    even, odd = rotor.spin_weights
    ortho = (0.0, 1.0) if _ORTHO_ODD[round(masses[0])] else (1.0, 0.0)
    shares = {
        "equilibrium": None,
        "normal": (even / 2.0, odd / 2.0),
        "ortho": ortho,
        "para": (ortho[1], ortho[0]),
    }[spins]
    return dataclasses.replace(rotor, spin_shares=shares, quantum=True)


def _spin_weights(calculation: Calculation, masses: FloatArray) -> tuple[float, float]:
    """Return the weights of even and odd rotational levels: of H2, D2 and T2 not the same."""
    like = list(calculation.numbers) == [1, 1] and round(masses[0]) == round(masses[1])
    return SPIN_WEIGHTS.get(round(masses[0]), NO_SPIN_WEIGHTS) if like else NO_SPIN_WEIGHTS
