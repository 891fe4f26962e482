"""Given rates: effective saddles of steps whose rate is declared, or whose height is."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import Conditions, Held
from thermo_pp.errors import Finding, StudyError
from thermo_pp.formulas.falloff import centre_of_falloff, falloff
from thermo_pp.kinetics.limits import Side
from thermo_pp.mechanism import Step, write_sum
from thermo_pp.rate_laws import Arrhenius, Falloff
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]
REFERENCE_K = 298.15
"""Temperature of the pre-exponential factor's power law."""


@dataclass(frozen=True, eq=False)
class GivenRate:
    """A declared forward rate constant.

    Attributes
    ----------
    log_rate : shape (b,)
    energy_j_mol : shape (b,)
        R T^2 d ln k/dT, the collider as it is held.
    orders : mapping of str to shape (b,)
        d ln k/d ln c of each collider.
    """

    log_rate: FloatArray
    energy_j_mol: FloatArray
    orders: Mapping[str, FloatArray]

    def saddle(self, left: Side, frequency: FloatArray, rt: FloatArray) -> Side:
        """Return the effective saddle of a step from its left side."""
        saddle = np.asarray(frequency + left[0] - self.log_rate, np.longdouble)
        return saddle, self.energy_j_mol - rt + left[1]


def given_rate(step: Step, t: FloatArray, conditions: Conditions) -> GivenRate:
    """Return the declared rate constant of a step, which has one.

    Raises
    ------
    StudyError
        A collider whose amount is not known.
    """
    if step.rate is not None:
        return GivenRate(*_arrhenius(step.rate, t), {})
    assert step.falloff is not None
    return _falloff(step, step.falloff, t, conditions)


def height_saddle(
    step: Step, left: Side, right: Side, t: FloatArray, findings: list[Finding]
) -> Side:
    """Return the saddle of a step of a stated height, and say from which side it counts.

    Where the side changes with temperature the saddle has a kink; its slope is that of the side
    that is the higher one at each temperature.
    """
    height = step.height
    assert height is not None
    file = step.where.split(" ")[0] or None
    from_left = np.ones(len(t), np.bool_)
    if height.above == "higher":
        from_left = np.asarray(left[0] >= right[0])
    if from_left.any() and not from_left.all():
        findings.append(
            Finding(
                "barrier-changes-side",
                "warning",
                file,
                None,
                f"step {step.equation}: the height counts from {write_sum(step.reactants)} at some of the "
                f"temperatures and from {write_sum(step.products)} at others, so the rate has a kink between",
                "locate the saddle point, or keep to temperatures on one side of the kink",
            )
        )
    if height.scan is not None:
        what = (
            f"step {step.equation}: the maximum of the scan ({height.scan}), {height.kj_mol:.6g} kJ/mol above "
            f"its first point, is added to G of {write_sum(step.reactants)} at 1 mol/L; no change of the "
            "zero-point energy, heat content or entropy on the way up is in it"
        )
    else:
        side = "the side that is higher in G"
        if from_left.all() or not from_left.any():
            side = write_sum(step.reactants if from_left.all() else step.products)
        what = (
            f"step {step.equation}: the saddle is put {height.kj_mol:g} kJ/mol above {side}, in free energy "
            "at 1 mol/L and the same at every temperature"
        )
    findings.append(
        Finding(
            "barrier-declared",
            "note",
            file,
            None,
            what,
            'locate the saddle point and name it (through = "TS")',
        )
    )
    joule = height.kj_mol * 1000.0
    base = np.where(from_left, left[0], right[0]) + joule / (GAS_J_MOL_K * t)
    return np.asarray(base, np.longdouble), np.where(from_left, left[1], right[1]) + joule


def _arrhenius(law: Arrhenius, t: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return ln k and R T^2 d ln k/dT of A (T/298.15 K)^n exp(-E/RT)."""
    factor, power, energy_kj_mol = law
    rt = GAS_J_MOL_K * t
    log_rate = np.log(factor) + power * np.log(t / REFERENCE_K) - energy_kj_mol * 1000.0 / rt
    return log_rate, power * rt + energy_kj_mol * 1000.0


def _falloff(step: Step, law: Falloff, t: FloatArray, conditions: Conditions) -> GivenRate:
    rt = GAS_J_MOL_K * t
    low, low_energy = _arrhenius(law.low, t)
    high, high_energy = _arrhenius(law.high, t)
    amounts = {name: _collider(name, step, conditions) for name in law.collider}
    parts = {
        name: law.collider[name] * held.concentration_mol_l(t) for name, held in amounts.items()
    }
    total = np.asarray(sum(parts.values()))
    shares = {name: part / total for name, part in parts.items()}
    thinning = sum(
        shares[name] * held.log_slope(t, conditions.seen) for name, held in amounts.items()
    )
    centre, centre_slope = np.zeros(t.shape), np.zeros(t.shape)
    if law.broadening != "lindemann":
        centre, centre_slope = centre_of_falloff(t, law.centre)
        if not np.isfinite(centre).all() or np.any(centre > 0.0):
            raise StudyError(
                f"the centre of the fall-off is not between 0 and 1 from {t.min():g} K to {t.max():g} K",
                where=f"{step.where} falloff.centre",
                mend="check its parameters",
            )
    found = falloff(low + np.log(total) - high, centre, law.broadening)
    energy = (
        high_energy
        + found.by_reduced * (low_energy + rt * thinning - high_energy)
        + found.by_centre * rt * centre_slope
    )
    orders = {name: share * found.by_reduced for name, share in shares.items()}
    return GivenRate(high + found.log_share, energy, orders)


def _collider(name: str, step: Step, conditions: Conditions) -> Held:
    where = f"{step.where} falloff.collider"
    if name in conditions.held and conditions.held[name].value is not None:
        return conditions.held[name]
    if name == "M" and name not in conditions.held:
        if conditions.total_gas is not None:
            return conditions.total_gas
        raise StudyError(
            "the collider M is the whole gas, and there is no total pressure",
            where=where,
            mend='write total_pressure = "1 bar" under [conditions], or name a held species',
        )
    raise StudyError(
        f"the collider {name!r} is not held at a stated amount",
        where=where,
        mend='hold it ([conditions] held), or write collider = "M" for the whole gas',
    )
