"""Solvation: the free energy from gas to solution at one geometry, 1 mol/L to 1 mol/L."""

from __future__ import annotations

from thermo_pp.conditions import MOLAR, StandardState
from thermo_pp.energies.terms import Term, check_same_level
from thermo_pp.errors import Finding, StudyError
from thermo_pp.pairing import pair
from thermo_pp.records import Calculation
from thermo_pp.species.energy import EnergyPart
from thermo_pp.units import GAS_J_MOL_K, HARTREE_KJ_MOL

SLOT = "solvation"


def solvent_less_gas(
    frequencies: Calculation, solvent: Calculation, gas: Calculation, *, where: str
) -> Term:
    """Return the energy in the solvent less that in the gas: from 1 mol/L to 1 mol/L.

    Raises
    ------
    StudyError
        Another molecule or geometry, an output in the solvent that has none, one in the gas that
        has one, levels of theory that differ in anything else.
    """
    if solvent.solvent == "none":
        raise StudyError(
            f"{solvent.path} has no solvent model",
            where=f"{where}.solvent",
            mend="name the output with the solvent model",
        )
    if gas.solvent not in (None, "none"):
        raise StudyError(
            f"{gas.path} has the solvent model {gas.solvent}",
            where=f"{where}.gas",
            mend="name the output without a solvent model",
        )
    findings = [
        finding
        for calc, key in ((solvent, "solvent"), (gas, "gas"))
        for finding in pair(frequencies, calc, where=f"{where}.{key}").findings
    ]
    mend = "run both with one method and one basis set; only the solvent may differ"
    check_same_level(solvent, gas, "solvent", where, mend)
    part = EnergyPart(
        slot=SLOT,
        name=f"solvation ({solvent.solvent or 'model not stated'})",
        value_hartree=float(solvent.energy_hartree or 0.0) - float(gas.energy_hartree or 0.0),
        factor=1.0,
        origin="derived",
        files=(solvent.path, gas.path),
        lines=(solvent.where.get("energy_hartree"), gas.where.get("energy_hartree")),
    )
    calculations = {f"{SLOT}.solvent": (solvent,), f"{SLOT}.gas": (gas,)}
    return Term((part,), calculations, tuple(findings))


def declared_solvation(value_kj_mol: float) -> Term:
    """Return a declared free energy of solvation, from 1 mol/L to 1 mol/L, as a part."""
    part = EnergyPart(
        slot=SLOT,
        name="solvation",
        value_hartree=value_kj_mol / HARTREE_KJ_MOL,
        factor=1.0,
        origin="declared",
        files=(),
        lines=(),
    )
    return Term((part,), {})


def to_molar(
    value_kj_mol: float,
    slope_j_mol_k: float | None,
    gas_state: StandardState,
    temperature_k: float,
) -> tuple[float, float | None]:
    """Turn a free energy of solvation from `gas_state` to 1 mol/L into one from 1 mol/L to 1 mol/L.

    Parameters
    ----------
    value_kj_mol : float
        At `temperature_k`.
    slope_j_mol_k : float or None
        Its temperature derivative.
    gas_state : StandardState
    temperature_k : float
        K.

    Returns
    -------
    (float, float or None)
        Value and derivative: less by R T ln(p(1 mol/L)/p(gas_state)) and by its derivative.
        From 1 bar at 298.15 K less by 7.96 kJ/mol.
    """
    log_ratio = float(
        MOLAR.log_ratio_to_bar(temperature_k) - gas_state.log_ratio_to_bar(temperature_k)
    )
    grows = MOLAR.log_ratio_slope - gas_state.log_ratio_slope
    value = value_kj_mol - GAS_J_MOL_K * temperature_k * log_ratio / 1000.0
    if slope_j_mol_k is None:
        return value, None
    return value, slope_j_mol_k - GAS_J_MOL_K * (log_ratio + grows)


def no_slope(file: str, names: list[str]) -> Finding:
    """Return what is said where a solvation term has no temperature derivative."""
    return Finding(
        "solvation-derivative",
        "warning",
        file,
        None,
        f"the solvation terms of {', '.join(names)} have no temperature derivative: it is missing "
        "in H, S and the Arrhenius energies",
        'give solvation its slope = "... J/mol/K", from values at several temperatures',
    )
