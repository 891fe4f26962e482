"""Amounts: how much of a species is held, in every unit a study may state it in."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, replace

from thermo_pp.conditions import Held, held
from thermo_pp.errors import StudyError
from thermo_pp.names import Constant
from thermo_pp.units import GAS_J_MOL_K, quantity, split_quantity

_FRACTIONS = {"%": 1e-2, "ppm": 1e-6, "ppb": 1e-9, "ppt": 1e-12, "mol/mol": 1.0}
_FRACTION = re.compile(r"\s*(\S+?)\s*(%|ppm|ppb|ppt|mol/mol)\s*")
_ACIDITY = re.compile(r"\s*pH\s+(\S+)\s*")
_POTENTIAL = re.compile(r".*[^A-Za-z](?:m|k|µ|μ)?V\s*")
_OVER = 1e-6
"""Relative excess over the total pressure that is rounding."""


@dataclass(frozen=True)
class Surroundings:
    """What amounts in a gas are stated against.

    Attributes
    ----------
    total_pressure_pa : float or None
    constant : {"concentration", "pressure"} or None
        What stays when the temperature changes; None: the form in which each amount is stated.
    stated_at_k : float or None
        Where an amount stated in the other form holds.
    """

    total_pressure_pa: float | None = None
    constant: Constant | None = None
    stated_at_k: float | None = None

    def amount(self, value: str, *, where: str) -> Held:
        """Turn a text into an amount: also mole fractions, ``"pH 7"`` and electrode potentials.

        Raises
        ------
        StudyError
            Not an amount; a mole fraction without a total pressure; an amount in the other form
            than stays constant, without the temperature it is stated at.
        """
        return self.kept(self.stated(value, where=where), where)

    def stated(self, value: str, *, where: str) -> Held:
        """Return an amount in the form it is stated in."""
        match = _FRACTION.fullmatch(value) if isinstance(value, str) else None
        if match is not None:
            return self._fraction(value, *match.groups(), where=where)
        match = _ACIDITY.fullmatch(value) if isinstance(value, str) else None
        if match is not None:
            exponent, _ = split_quantity(f"{match.group(1)} m", "m", where=where)
            return Held("concentration", 10.0**-exponent, value)
        if isinstance(value, str) and _POTENTIAL.fullmatch(value):
            return Held("potential", quantity(value, "V", where=where), value)
        return held(value, where=where)

    def _fraction(self, value: str, number: str, unit: str, *, where: str) -> Held:
        share, _ = split_quantity(f"{number} m", "m", where=where)
        share *= _FRACTIONS[unit]
        if not 0.0 < share <= 1.0:
            raise StudyError(
                f"the mole fraction {value!r} is not above 0 and at most 1",
                where=where,
                mend='write for instance "21 %", "400 ppm" or "0.21 mol/mol"',
            )
        if self.total_pressure_pa is None:
            raise StudyError(
                f"{value!r} is a mole fraction, and there is no total pressure",
                where=where,
                mend='write total_pressure = "1 bar" under [conditions]',
            )
        return Held("pressure", share * self.total_pressure_pa, value)

    def kept(self, stated: Held, where: str) -> Held:
        """Return an amount in the form that stays constant."""
        if self.constant is None or stated.form in (self.constant, "equilibrium", "potential"):
            return stated
        assert stated.value is not None
        if self.stated_at_k is None:
            raise StudyError(
                f"{stated.text!r} is no {self.constant}, which is what stays constant",
                where=where,
                mend='say at which temperature it is meant: [conditions] stated_at = "298.15 K"',
            )
        molar = 1000.0 * GAS_J_MOL_K * self.stated_at_k  # Pa of 1 mol/L
        value = stated.value * molar if self.constant == "pressure" else stated.value / molar
        return replace(stated, form=self.constant, value=value)

    def total(self, where: str) -> Held | None:
        """Return the whole gas as an amount, None without a total pressure."""
        if self.total_pressure_pa is None:
            return None
        whole = Held("pressure", self.total_pressure_pa, f"{self.total_pressure_pa:g} Pa")
        return self.kept(whole, where)


def check_total(
    amounts: Mapping[str, Held], total: Held | None, temperature_k: tuple[float, ...], where: str
) -> None:
    """Check that what is held is not more than the whole gas, at every temperature.

    Raises
    ------
    StudyError
        The amounts at stated values add up to more than the total pressure.
    """
    if total is None:
        return
    stated = {
        name: one for name, one in amounts.items() if one.form in ("concentration", "pressure")
    }
    for t in temperature_k:
        whole = float(total.concentration_mol_l(t))
        share = sum(float(one.concentration_mol_l(t)) for one in stated.values()) / whole
        if share > 1.0 + _OVER:
            raise StudyError(
                f"{', '.join(stated)} add up to {share:.6g} times the total pressure at {t:g} K",
                where=where,
                mend="mend the amounts, or the total pressure",
            )
