"""Terms of an electronic energy: what one is, single points, and what every output is checked for."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace

from thermo_pp.audit.levels import FIELDS, stated_level
from thermo_pp.errors import Finding, StudyError
from thermo_pp.nearest import suggestion
from thermo_pp.pairing import pair
from thermo_pp.records import Calculation
from thermo_pp.species.energy import EnergyPart, printed_part

FACTORS_WITHIN = 1e-9
"""How near to 1 the factors of a sum must add up."""


@dataclass(frozen=True, eq=False)
class Term:
    """One or several parts of an energy, and the outputs that they stand on.

    Attributes
    ----------
    parts : tuple of EnergyPart
    calculations : mapping of str to tuple of Calculation
        What must be of one level for all species -> the outputs, each as the method that is used.
    findings : tuple of Finding
    ghosts : tuple of str
        Outputs whose ghost atoms are meant.
    """

    parts: tuple[EnergyPart, ...]
    calculations: Mapping[str, tuple[Calculation, ...]]
    findings: tuple[Finding, ...] = ()
    ghosts: tuple[str, ...] = field(default=())


def of_method(calculation: Calculation, method: str | None, where: str) -> Calculation:
    """Return the record of a file with the energy of one of its methods, its own where None.

    Raises
    ------
    StudyError
        The file does not have the energy of that method, or its reader does not tell them apart.
    """
    if method is None:
        return calculation
    wanted = method.strip().upper()
    if wanted in (calculation.energy_label, (calculation.method or "").upper()):
        return calculation
    found = calculation.method_energies.get(wanted)
    if found is None:
        known = list(calculation.method_energies)
        raise StudyError(
            f"{calculation.path} has no {method} energy beside its own "
            f"({calculation.method or 'method not stated'})",
            where=where,
            mend=suggestion(method, known, "methods")
            if known
            else f"the reader of {calculation.program} tells no methods apart; name a single point "
            "of that method",
        )
    return replace(
        calculation,
        method=wanted,
        energy_label=wanted,
        energy_hartree=found.value_hartree,
        where={**calculation.where, "energy_hartree": found.line, "method": found.line},
    )


def single(
    frequencies: Calculation,
    calculation: Calculation,
    *,
    slot: str,
    where: str,
    method: str | None = None,
    factor: float = 1.0,
) -> Term:
    """Return the energy of one output times a factor.

    Parameters
    ----------
    frequencies : Calculation
        Whose molecule and geometry the output must have.
    calculation : Calculation
    slot : str
        Place in the recipe.
    where : str
        File and key, for messages.
    method : str or None
        Which of the energies in the file; its best one where None.
    factor : float

    Raises
    ------
    StudyError
        Another molecule, another geometry, no energy (of that method).
    """
    used = of_method(calculation, method, where)
    findings = () if calculation is frequencies else pair(frequencies, used, where=where).findings
    return Term((printed_part(used, slot, factor),), {slot: (used,)}, findings)


def check_factors(factors: Sequence[float], where: str) -> None:
    """Check that the factors of total energies add up to 1: else the sum is no total energy."""
    total = sum(factors)
    if abs(total - 1.0) > FACTORS_WITHIN:
        raise StudyError(
            f"the factors of the parts add up to {total:g}, not to 1",
            where=where,
            mend="give each part that is taken off factor = -1: a large basis set, plus a better "
            "method in a small one, less the first method in the small one",
        )


def check_same_level(one: Calculation, other: Calculation, but: str, where: str, mend: str) -> None:
    """Check that two outputs are of one level of theory in all that both state, but in one field.

    Raises
    ------
    StudyError
        A field that differs.
    """
    mine, its = stated_level(one), stated_level(other)
    for name, called in FIELDS:
        if name != but and name in mine and name in its and mine[name] != its[name]:
            raise StudyError(
                f"{one.path} and {other.path} differ in {called}: "
                f"{getattr(one, name)} and {getattr(other, name)}",
                where=where,
                mend=mend,
            )
