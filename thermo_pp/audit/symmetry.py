"""Symmetry: the number that a program used against the one that the geometry has."""

from __future__ import annotations

from thermo_pp.errors import Finding
from thermo_pp.formulas.symmetry import rotational_symmetry
from thermo_pp.records import Calculation


def symmetry_findings(calculation: Calculation) -> tuple[Finding, ...]:
    """Compare the printed symmetry number, 1 where symmetry was off, with that of the geometry."""
    printed = calculation.printed.get("symmetry_number")
    if printed is None:
        return ()
    found = rotational_symmetry(
        calculation.numbers, calculation.positions_angstrom, calculation.masses_u
    )
    if round(printed.value) == found.order:
        return ()
    off = round(printed.value) == 1
    return (
        Finding(
            "symmetry-differs",
            "note" if off else "warning",
            calculation.path,
            printed.line,
            f"the program used symmetry number {printed.text}, the geometry has {found.order}",
            "nothing, where symmetry was off in the program"
            if off
            else "check the geometry; declare symmetry_number where the program is right",
        ),
    )
