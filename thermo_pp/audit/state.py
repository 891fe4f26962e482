"""State: whether the structure is what the job was to reach, and whether its electrons add up."""

from __future__ import annotations

from thermo_pp.errors import Finding
from thermo_pp.records import Calculation


def state_findings(calculation: Calculation) -> tuple[Finding, ...]:
    """Return what is doubtful about convergence, energy, charge and multiplicity."""
    return (
        *_optimisation(calculation),
        *_energy(calculation),
        *_electrons(calculation),
    )


def _optimisation(calculation: Calculation) -> tuple[Finding, ...]:
    if calculation.optimised is not False or _said(calculation, "optimisation-not-converged"):
        return ()
    return (
        Finding(
            "optimisation-not-converged",
            "warning",
            calculation.path,
            calculation.where.get("optimised"),
            "the optimisation did not reach its own thresholds",
            "go on optimising from the last geometry",
        ),
    )


def _energy(calculation: Calculation) -> tuple[Finding, ...]:
    if calculation.energy_hartree is not None or _said(calculation, "no-energy"):
        return ()
    if any(finding.severity == "error" for finding in calculation.findings):
        return ()  # the reader has said why
    return (
        Finding(
            "no-energy",
            "error",
            calculation.path,
            calculation.where.get("energy_hartree"),
            "there is no final energy",
            "check that the SCF and whatever follows it converged",
        ),
    )


def _electrons(calculation: Calculation) -> tuple[Finding, ...]:
    """Compare multiplicity and electron count.

    Core potentials replace whole shells, so the parity is that of all electrons.
    """
    charge, multiplicity = calculation.charge, calculation.multiplicity
    if charge is None:
        return ()
    electrons = int(calculation.numbers.sum()) - charge
    line = calculation.where.get("multiplicity", calculation.where.get("charge"))
    mend = "check charge and multiplicity in the input"
    if electrons < 0:
        what = f"charge {charge} takes more electrons than {calculation.formula} has"
        return (Finding("impossible-charge", "error", calculation.path, line, what, mend),)
    if multiplicity is None:
        return ()
    if multiplicity < 1 or multiplicity - 1 > electrons or (electrons - multiplicity) % 2 == 0:
        what = (
            f"multiplicity {multiplicity} is impossible for the {electrons} electrons of "
            f"{calculation.formula}"
        )
        if charge:
            what += f" with charge {charge:+d}"
        return (Finding("impossible-multiplicity", "error", calculation.path, line, what, mend),)
    return ()


def _said(calculation: Calculation, code: str) -> bool:
    """Whether the reader has given this finding already."""
    return any(finding.code == code for finding in calculation.findings)
