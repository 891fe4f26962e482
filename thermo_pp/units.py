"""Units: CODATA 2022 constants, and the one way from a text to a number in our units and back.

Constants are literals of one CODATA year (2022, https://physics.nist.gov/constants), because the
year of a library's constants moves with its version.
"""

from __future__ import annotations

import math
import re
from functools import lru_cache
from typing import TYPE_CHECKING, Any

from thermo_pp.errors import StudyError

if TYPE_CHECKING:
    import pint

# exact by definition of the SI (2019)
BOLTZMANN_J_K = 1.380649e-23
PLANCK_J_S = 6.62607015e-34
AVOGADRO_MOL = 6.02214076e23
LIGHT_M_S = 299792458.0
ELEMENTARY_CHARGE_C = 1.602176634e-19
GAS_J_MOL_K = 8.31446261815324  # k N_A
FARADAY_C_MOL = 96485.33212331001  # e N_A
BAR_PA = 1.0e5
ATM_PA = 101325.0
CALORIE_J = 4.184  # thermochemical calorie
# measured, CODATA 2022
ATOMIC_MASS_KG = 1.66053906892e-27
HARTREE_J = 4.3597447222060e-18
BOHR_M = 5.29177210544e-11
VACUUM_PERMITTIVITY_F_M = 8.8541878188e-12
ELECTRON_MASS_KG = 9.1093837139e-31
ELECTRON_MASS_U = ELECTRON_MASS_KG / ATOMIC_MASS_KG

BOHR_ANGSTROM = BOHR_M * 1e10
HARTREE_KJ_MOL = HARTREE_J * AVOGADRO_MOL / 1000.0
EV_KJ_MOL = ELEMENTARY_CHARGE_C * AVOGADRO_MOL / 1000.0
WAVENUMBER_KJ_MOL = PLANCK_J_S * LIGHT_M_S * 100.0 * AVOGADRO_MOL / 1000.0
KELVIN_PER_CM = PLANCK_J_S * LIGHT_M_S * 100.0 / BOLTZMANN_J_K
"""Second radiation constant h c / k, K cm."""
HARTREE_CM = HARTREE_J / (PLANCK_J_S * LIGHT_M_S * 100.0)

ENERGY_PER_KJ_MOL: dict[str, float] = {
    "kJ/mol": 1.0,
    "kcal/mol": 1.0 / CALORIE_J,
    "eV": 1.0 / EV_KJ_MOL,
    "hartree": 1.0 / HARTREE_KJ_MOL,
}
"""What 1 kJ/mol is in each display unit."""

# A unit of energy of one molecule, and what one is per mole: ours, not the unit library's
# constants.
_MOLECULAR_ENERGY_KJ_MOL: dict[str, float] = {
    "hartree": HARTREE_KJ_MOL,
    "Eh": HARTREE_KJ_MOL,
    "E_h": HARTREE_KJ_MOL,
    "eV": EV_KJ_MOL,
    "meV": EV_KJ_MOL / 1000.0,
    "cm^-1": WAVENUMBER_KJ_MOL,
    "1/cm": WAVENUMBER_KJ_MOL,
}
_PRESSURE_PA = {"bar": BAR_PA, "atm": ATM_PA}
_NUMBER = re.compile(r"\s*([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*(.*?)\s*", re.DOTALL)
_UNIT = re.compile(
    r"(?:1/)?[A-Za-zµμ°Å(](?:[A-Za-zµμ°Å_/().\s]|\*(?!\*)|\^[+-]?\d\b|[+-]?\d\b){0,60}"
)
_POWER = re.compile(r"(?<![A-Za-z])([cdmµμ]?m|s|mol|L|K)(-?[1-4])(?![0-9])")
"""A power without its ``^``: ``cm3``, ``mol-1``."""
_PER_MOLECULE = re.compile(r"\b(?:molecules|molecule)\b")


@lru_cache(maxsize=1)
def _registry() -> pint.UnitRegistry[Any]:
    """Return the unit library's registry, made on first use."""
    import pint

    registry: pint.UnitRegistry[Any] = pint.UnitRegistry()
    registry.define("@alias torr = Torr")
    return registry


def quantity(value: Any, unit: str, *, where: str) -> float:
    """Turn a number, a text with a unit or a pint quantity into a number in `unit`.

    Parameters
    ----------
    value : float, int, str or pint.Quantity
        A bare number is taken to be in `unit` already; a text must be one finite number and a unit.
    unit : str
        Unit of the answer, as pint spells it: ``"K"``, ``"Pa"``, ``"mol/L"``, ``"kJ/mol"``,
        ``"J/mol/K"``, ``"1/cm"``.
    where : str
        File and key (or option) that the value stands at, for the message.

    Returns
    -------
    float
        Finite.

    Raises
    ------
    StudyError
        Not a number and a unit, not finite, or of another dimension.
    """
    if isinstance(value, bool):
        raise StudyError(f"expected a quantity, found {value!r}", where=where, mend=_example(unit))
    if isinstance(value, (int, float)):
        try:
            return _finite(float(value), value, unit, where)
        except OverflowError:
            return _finite(math.inf, "a number of hundreds of digits", unit, where)
    if isinstance(value, str):
        number, unit_text = split_quantity(value, unit, where=where)
        return convert(number, unit_text, unit, where=where, shown=value)
    magnitude, units = getattr(value, "magnitude", None), getattr(value, "units", None)
    if magnitude is None or units is None:
        raise StudyError(f"expected a quantity, found {value!r}", where=where, mend=_example(unit))
    return convert(
        _finite(float(magnitude), value, unit, where),
        f"{units:~C}",
        unit,
        where=where,
        shown=str(value),
    )


def split_quantity(text: str, unit: str, *, where: str) -> tuple[float, str]:
    """Split a text into its number and its unit; StudyError where it is not one finite number and a unit."""
    match = _NUMBER.fullmatch(text)
    if match is None or not match.group(2):
        what = f"{text!r} is not a number" if match is None else f"{text!r} has no unit"
        raise StudyError(what, where=where, mend=_example(unit))
    unit_text = match.group(2)
    if _UNIT.fullmatch(unit_text) is None:
        raise StudyError(f"{text!r} is not one number and a unit", where=where, mend=_example(unit))
    return _finite(float(match.group(1)), text, unit, where), unit_text


def convert(number: float, unit_text: str, unit: str, *, where: str, shown: str = "") -> float:
    """Convert `number` from the unit spelled `unit_text` to `unit`; StudyError where that cannot be."""
    shown = shown or f"{number} {unit_text}"
    if unit_text == unit:
        return number
    compact = unit_text.replace(" ", "")
    if unit == "kJ/mol" and compact in _MOLECULAR_ENERGY_KJ_MOL:
        return number * _MOLECULAR_ENERGY_KJ_MOL[compact]
    if unit == "1/cm" and compact in _MOLECULAR_ENERGY_KJ_MOL:
        return number * _MOLECULAR_ENERGY_KJ_MOL[compact] / WAVENUMBER_KJ_MOL
    if unit == "Pa" and compact in _PRESSURE_PA:  # outputs print them: no unit library for these
        return _finite(number * _PRESSURE_PA[compact], shown, unit, where)
    per_mole = "mol" in unit and "J" not in unit  # "-50 kJ" lacks its amount
    spelled = _POWER.sub(r"\1^\2", _PER_MOLECULE.sub("particle", unit_text))
    registry = _registry()
    try:
        source = registry.parse_units(spelled)
        target = registry.parse_units(unit)
        answer = registry.Quantity(number, source)
        try:
            return _finite(float(answer.to(target).magnitude), shown, unit, where)
        except Exception:
            if not per_mole:
                raise
            # a number density ("1/cm^3") for an amount, the one other meaning that is not in doubt
            powers = [registry.mole, 1 / registry.mole, registry.mole**2, registry.mole**-2]
            for power in powers:
                scaled = answer * (power / _power_value(power, registry))
                if scaled.dimensionality == registry.Quantity(1.0, target).dimensionality:
                    return _finite(float(scaled.to(target).magnitude), shown, unit, where)
            raise
    except StudyError:
        raise
    except Exception:
        mend = _example(unit)
        raise StudyError(f"{shown!r} is not a quantity in {unit}", where=where, mend=mend) from None


def _power_value(power: Any, registry: Any) -> float:
    """Return the number of particles that `power` (of moles) stands for."""
    exponent = dict(registry.Quantity(1.0, power).unit_items()).get("mole", 0)
    return float(AVOGADRO_MOL ** float(exponent))


def _finite(number: float, shown: Any, unit: str, where: str) -> float:
    if not math.isfinite(number):
        raise StudyError(f"{shown!r} is not a finite number", where=where, mend=_example(unit))
    return number


_EXAMPLES = {
    "K": '"298.15 K" or "25 degC"',
    "Pa": '"1 bar", "1 atm" or "100 Pa"',
    "mol/L": '"0.5 mol/L" or "1e15 molecules/cm^3"',
    "kJ/mol": '"12.5 kJ/mol", "3 kcal/mol" or "0.01 hartree"',
    "J/mol/K": '"188.8 J/mol/K"',
    "1/cm": '"100 cm^-1"',
}


def _example(unit: str) -> str:
    return f"write one number and its unit, for instance {_EXAMPLES.get(unit, f'1.0 {unit}')}"
