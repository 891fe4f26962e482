"""Checks of a mechanism with its conditions that need no energies."""

from __future__ import annotations

from thermo_pp.conditions import Conditions
from thermo_pp.errors import Finding, StudyError
from thermo_pp.graph import check_reach
from thermo_pp.loops import equilibrium_of
from thermo_pp.mechanism import Mechanism
from thermo_pp.paths import find_paths


def check_electrons(conditions: Conditions, mechanism: Mechanism) -> None:
    """Check that nothing but electrons is held at a potential."""
    for name, held in conditions.held.items():
        is_electron = not mechanism.composition[name] and mechanism.charge.get(name) == -1
        if held.form == "potential" and not is_electron:
            raise StudyError(
                f"{held.text!r} is a potential, and {name} is no electron",
                where=f"{mechanism.where} [conditions] held.{name}",
                mend='write a concentration; electrons have composition = "e-"',
            )


def check_network(mechanism: Mechanism, conditions: Conditions) -> tuple[Finding, ...]:
    """Check what needs no energies: equilibrium species, declared paths, the way to the product."""
    equilibrium_of(mechanism, conditions.held, driven=conditions.driven)
    catalyst = mechanism.catalyst
    if catalyst in conditions.held:
        raise StudyError(
            f"the catalyst {catalyst!r} is held",
            where=f"{mechanism.where} [conditions] held.{catalyst}",
            mend="take it out of held: a turnover frequency is per total catalyst",
        )
    if mechanism.paths or catalyst is not None:
        find_paths(mechanism, conditions.held, most=1)
    return check_reach(mechanism, conditions.held)
