"""Printed thermochemistry: a program's own H, S and G against ours, with its own constants.

What a program prints follows from the modes, the geometry and the masses of the same file, its own
temperature, pressure and symmetry number, and the constants built into it. So a difference beyond
rounding means that the file is damaged or was read wrongly, and not that constants differ.
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterator, Mapping
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from thermo_pp import units
from thermo_pp.errors import Finding
from thermo_pp.formulas.partition import linear_rotation, nonlinear_rotation, translation
from thermo_pp.formulas.rotor import rigid_rotor
from thermo_pp.formulas.vibration import oscillator
from thermo_pp.readers import READERS
from thermo_pp.records import Calculation, Printed

MOST_DECIMALS = 6
"""Of printed wavenumbers; what has more was not printed but computed."""
STEPS = 1.0
"""How many units of its last digit a printed value may be off, unless the reader has PRINTED_STEPS."""
_OF_ENTROPY = ("entropy", "vibrational_entropy", "gibbs")
_OF_MODES = (*_OF_ENTROPY, "zero_point", "thermal_energy", "thermal_enthalpy", "heat_capacity_v")
_WITH_TEMPERATURE = re.compile(r"Eh/\((\d+\.?\d*) K\)")
MOST_NAMED = 4
_WORDS = {"zero_point": "zero-point energy", "heat_capacity_v": "Cv", "enthalpy": "H", "gibbs": "G"}


class Ours(NamedTuple):
    """One of our values, J/mol or J/(mol K), and what rounded wavenumbers are worth in it."""

    value: float
    doubt: float


def printed_findings(calculation: Calculation) -> tuple[Finding, ...]:
    """Return a finding where the program's own thermochemistry is not ours."""
    constants = _of_reader(calculation.program, "PRINTED_CONSTANTS")
    if constants is None or calculation.wavenumbers_cm is None:
        return ()
    steps = _of_reader(calculation.program, "PRINTED_STEPS") or STEPS
    passed_over = _not_ours(calculation)
    wrong: list[tuple[str, Printed, float]] = []
    for name, candidates in own_values(calculation, constants).items():
        printed = calculation.printed.get(name)
        if printed is None or name in passed_over:
            continue
        scale = _per_unit(printed.unit, constants)
        off = [
            abs(ours.value * scale - printed.value) - steps * printed.step - ours.doubt * scale
            for ours in candidates
        ]
        if min(off) > 0.0:
            wrong.append((name, printed, candidates[int(np.argmin(off))].value * scale))
    if not wrong:
        return ()
    told = [
        f"{_WORDS.get(name, name.replace('_', ' '))} {printed.text} {printed.unit}, "
        f"ours {value:.{_decimals(printed)}f}"
        for name, printed, value in wrong[:MOST_NAMED]
    ]
    more = f" and {len(wrong) - MOST_NAMED} more" if len(wrong) > MOST_NAMED else ""
    return (
        Finding(
            "printed-differs",
            "error",
            calculation.path,
            wrong[0][1].line,
            "the program's own thermochemistry does not follow from its modes and geometry: "
            + "; ".join(told)
            + more,
            "the file is damaged, or the program scaled or treated its modes; compare its numbers",
        ),
    )


def own_values(
    calculation: Calculation, constants: Mapping[str, float]
) -> dict[str, tuple[Ours, ...]]:
    """Return what a program with these constants prints, as far as its settings are known.

    Parameters
    ----------
    calculation : Calculation
        With wavenumbers; temperature, pressure and symmetry number are those it printed.
    constants : mapping
        Values under the names of `units`; PRESSURE_PA where the program does not print it.

    Returns
    -------
    dict
        Key of `Calculation.printed` -> the values that would be right (total entropies with and
        without electronic states), in J/mol and J/(mol K); a key that depends on a setting not
        printed is left out.
    """
    gas = constants["GAS_J_MOL_K"]
    ratio = gas / units.GAS_J_MOL_K
    stretch = _second_radiation(constants) / units.KELVIN_PER_CM
    assert calculation.wavenumbers_cm is not None
    real = calculation.wavenumbers_cm[calculation.wavenumbers_cm > 0.0]
    half = 0.5 * _step(real)
    real = real * (_setting(calculation, "frequency_scale", "") or 1.0)
    zero_point = 0.5 * gas * _second_radiation(constants) * float(real.sum())
    doubt = 0.5 * gas * units.KELVIN_PER_CM * half * len(real)
    found: dict[str, tuple[Ours, ...]] = {"zero_point": (Ours(zero_point, doubt),)}
    temperature = _setting(calculation, "temperature", "K")
    if temperature is None:
        return found
    vibration = oscillator(np.array(temperature), real * stretch)
    energy, entropy, heat_capacity = (ratio * float(np.sum(share)) for share in vibration)
    soft = gas * float(np.sum(half / real))  # what half a step of a wavenumber is in S at most
    moves = 1.5 * gas * temperature, 1.5 * gas
    rotor = rigid_rotor(calculation.masses_u, calculation.positions_angstrom)
    turns = {"atom": 0.0, "linear": 1.0, "nonlinear": 1.5}[rotor.kind] * gas
    thermal = zero_point + energy + moves[0] + turns * temperature
    enthalpy = thermal + gas * temperature
    found["thermal_energy"] = (Ours(thermal, doubt),)
    found["thermal_enthalpy"] = (Ours(enthalpy, doubt),)
    found["heat_capacity_v"] = (Ours(heat_capacity + moves[1] + turns, soft),)
    found["vibrational_entropy"] = (Ours(entropy, soft),)
    return found | dict(
        _with_entropy(
            calculation, constants, temperature, Ours(enthalpy, doubt), Ours(entropy, soft)
        )
    )


def _with_entropy(
    calculation: Calculation,
    constants: Mapping[str, float],
    temperature: float,
    enthalpy: Ours,
    vibrational: Ours,
) -> Iterator[tuple[str, tuple[Ours, ...]]]:
    """Yield what depends on pressure, symmetry number or electronic energy."""
    moving = _translational(calculation, constants, temperature)
    turning = _rotational(calculation, constants, temperature)
    if moving is not None:
        yield "translational_entropy", (Ours(moving, 0.0),)
    if turning is not None:
        yield "rotational_entropy", (Ours(turning, 0.0),)
    entropies: tuple[Ours, ...] = ()
    if moving is not None and turning is not None:
        total = moving + turning + vibrational.value
        states = constants["GAS_J_MOL_K"] * math.log(calculation.multiplicity or 1)
        entropies = tuple(Ours(total + extra, vibrational.doubt) for extra in (0.0, states))
        yield "entropy", entropies
    yield from _totals(calculation, constants, temperature, enthalpy, entropies)


def _totals(
    calculation: Calculation,
    constants: Mapping[str, float],
    temperature: float,
    enthalpy: Ours,
    entropies: tuple[Ours, ...],
) -> Iterator[tuple[str, tuple[Ours, ...]]]:
    """Yield H and G with the electronic energy in them.

    It is that of the record, or the one behind the other of the two: a file may hold the
    frequencies of one level and a better energy of another.
    """
    h_less_e = (enthalpy,)
    g_less_e = tuple(
        Ours(enthalpy.value - temperature * s.value, enthalpy.doubt + temperature * s.doubt)
        for s in entropies
    )
    for name, mine, other, others in (
        ("enthalpy", h_less_e, "gibbs", g_less_e),
        ("gibbs", g_less_e, "enthalpy", h_less_e),
    ):
        energies = []
        if calculation.energy_hartree is not None:
            energies.append(calculation.energy_hartree * _hartree_j_mol(constants))
        printed = calculation.printed.get(other)
        if printed is not None:
            value = printed.value / _per_unit(printed.unit, constants)
            energies += [value - each.value for each in others]
        if energies and mine:
            yield name, tuple(Ours(e + each.value, each.doubt) for e in energies for each in mine)


def _translational(
    calculation: Calculation, constants: Mapping[str, float], temperature: float
) -> float | None:
    pressure = _setting(calculation, "pressure", "Pa") or constants.get("PRESSURE_PA")
    if pressure is None:
        return None
    gas = constants["GAS_J_MOL_K"]
    at_bar = translation(temperature, float(calculation.masses_u.sum())).entropy_j_mol_k
    log_mass = math.log(_theta_scale(constants))  # h^2/(k u), theirs over ours
    log_volume = math.log(constants["BOLTZMANN_J_K"] / units.BOLTZMANN_J_K)
    changes = -1.5 * log_mass + log_volume - math.log(pressure / units.BAR_PA)
    return gas * (float(at_bar) / units.GAS_J_MOL_K + changes)


def _rotational(
    calculation: Calculation, constants: Mapping[str, float], temperature: float
) -> float | None:
    rotor = rigid_rotor(calculation.masses_u, calculation.positions_angstrom)
    if rotor.kind == "atom":
        return 0.0
    printed = calculation.printed.get("symmetry_number")
    if printed is None:
        return None
    theta = np.array(rotor.theta_k) * _theta_scale(constants)
    if rotor.kind == "linear":
        share = linear_rotation(temperature, theta[0], printed.value)
    else:
        share = nonlinear_rotation(temperature, theta, printed.value)
    return constants["GAS_J_MOL_K"] / units.GAS_J_MOL_K * float(share.entropy_j_mol_k)


def _not_ours(calculation: Calculation) -> tuple[str, ...]:
    """Return the keys that the program computes in another way, as the file says.

    ``entropy_model`` names another treatment of soft modes than harmonic ones; ``modes_used`` says
    how many modes the thermochemistry has, where that is not all real ones.
    """
    assert calculation.wavenumbers_cm is not None
    used = calculation.printed.get("modes_used")
    if used is not None and used.value != int(np.sum(calculation.wavenumbers_cm > 0.0)):
        return (*_OF_MODES, "enthalpy")
    return _OF_ENTROPY if "entropy_model" in calculation.printed else ()


def _of_reader(program: str, name: str) -> Any:
    """Return what the program's reader says of how its printed values come about, None without."""
    for reader in READERS:
        if program == reader.NAME:
            return getattr(reader, name, None)
    return None


def _setting(calculation: Calculation, name: str, unit: str) -> float | None:
    printed = calculation.printed.get(name)
    if printed is None:
        return None
    if printed.unit == unit:
        return printed.value
    return units.convert(printed.value, printed.unit, unit, where=calculation.path)


def _step(wavenumbers_cm: NDArray[np.float64]) -> float:
    """Return one unit of the last decimal that the wavenumbers were printed with."""
    for decimals in range(MOST_DECIMALS):
        if np.allclose(wavenumbers_cm, np.round(wavenumbers_cm, decimals), rtol=0.0, atol=1e-9):
            return float(10.0**-decimals)
    return 0.0


def _second_radiation(constants: Mapping[str, float]) -> float:
    """Return h c / k, K cm."""
    return constants["PLANCK_J_S"] * constants["LIGHT_M_S"] * 100.0 / constants["BOLTZMANN_J_K"]


def _theta_scale(constants: Mapping[str, float]) -> float:
    """Return h^2/(k u), theirs over ours."""
    theirs = constants["PLANCK_J_S"] ** 2 / (
        constants["BOLTZMANN_J_K"] * constants["ATOMIC_MASS_KG"]
    )
    return theirs / (units.PLANCK_J_S**2 / (units.BOLTZMANN_J_K * units.ATOMIC_MASS_KG))


def _hartree_j_mol(constants: Mapping[str, float]) -> float:
    return constants["HARTREE_J"] * constants["AVOGADRO_MOL"]


def _per_unit(unit: str, constants: Mapping[str, float]) -> float:
    """Return 1 J/mol, or 1 J/(mol K), in a printed unit."""
    calorie = constants.get("CALORIE_J", units.CALORIE_J)
    product = _WITH_TEMPERATURE.fullmatch(unit)
    if product is not None:  # printed as T S
        return float(product.group(1)) / _hartree_j_mol(constants)
    return {
        "Eh": 1.0 / _hartree_j_mol(constants),
        "kJ/mol": 1e-3,
        "kcal/mol": 1e-3 / calorie,
        "J/(mol K)": 1.0,
        "cal/(mol K)": 1.0 / calorie,
    }[unit]


def _decimals(printed: Printed) -> int:
    return max(0, round(-math.log10(printed.step)))
