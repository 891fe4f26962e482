"""Electronic state: charge, multiplicity, levels and the electronic energy of a structure."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from thermo_pp.data.levels import KNOWN_LEVELS
from thermo_pp.errors import Finding, StudyError
from thermo_pp.records import Calculation
from thermo_pp.species.energy import ElectronicEnergy, single_energy
from thermo_pp.species.modes import place
from thermo_pp.units import quantity

Levels = tuple[tuple[int, float], ...]
"""(degeneracy, cm^-1 above the lowest) of each level."""

TABLE = "table"
"""The user's word that the levels of `data.levels` are taken."""
_LEVELS_MEND = (
    'write levels = [[5, "0 cm^-1"], [3, "158.265 cm^-1"]]: degeneracy, energy above the lowest'
)


def parse_levels(value: Any, *, where: str) -> Levels:
    """Turn ``[[5, "0 cm^-1"], [3, "158.265 cm^-1"]]`` into (degeneracy, cm^-1) pairs.

    Raises
    ------
    StudyError
        Not pairs, a degeneracy that is not a whole number above 0, a negative energy, none at 0.
    """
    mend = _LEVELS_MEND
    levels = []
    for pair in value if isinstance(value, Sequence) and not isinstance(value, str) else [None]:
        if not isinstance(pair, Sequence) or isinstance(pair, str) or len(pair) != 2:
            raise StudyError(f"{pair!r} is not an electronic level", where=where, mend=mend)
        if isinstance(pair[0], bool) or not isinstance(pair[0], int) or pair[0] < 1:
            raise StudyError(f"degeneracy {pair[0]!r} is not above 0", where=where, mend=mend)
        levels.append((pair[0], quantity(pair[1], "1/cm", where=where)))
    if not levels or min(energy for _, energy in levels) != 0.0:
        raise StudyError("the lowest electronic level is not at 0", where=where, mend=mend)
    return tuple(levels)


def settled_charge(calculation: Calculation, declared: int | None, name: str, where: str) -> int:
    """Return the charge, declared or read; StudyError where it is neither or they differ."""
    found = calculation.charge
    if declared is None and found is None:
        raise StudyError(
            f"{name}: {calculation.path} does not say the charge",
            where=where,
            mend="declare charge",
        )
    if declared is not None and found is not None and declared != found:
        raise StudyError(
            f"{name}: charge {declared} is declared, the output has {found}",
            where=place(calculation, "charge"),
            mend="name the right output or leave the charge out",
        )
    return int(found if declared is None else declared)  # type: ignore[arg-type]


def electronic_levels(
    calculation: Calculation,
    charge: int,
    declared: int | None,
    levels: Sequence[Sequence[Any]] | str | None,
    name: str,
    where: str,
) -> tuple[Levels, int | None, tuple[Finding, ...]]:
    """Return the electronic levels, the multiplicity and what is doubtful about them."""
    spin = calculation.multiplicity if declared is None else declared
    if levels is not None and levels != TABLE:
        return parse_levels(levels, where=where), spin, ()
    if spin is None:
        raise StudyError(
            f"{name}: {calculation.path} does not say the multiplicity",
            where=where,
            mend="declare multiplicity (1 for a closed shell)",
        )
    electrons = int(calculation.numbers.sum()) - charge
    if spin < 1 or (electrons + spin) % 2 == 0:
        raise StudyError(
            f"{name}: multiplicity {spin} is impossible with {electrons} electrons",
            where=where if declared is not None else place(calculation, "multiplicity"),
            mend="declare the multiplicity that the calculation had, and check the charge",
        )
    notes = []
    if declared is not None and calculation.multiplicity not in (None, declared):
        notes.append(
            Finding(
                code="multiplicity-differs",
                severity="warning",
                file=calculation.path,
                line=calculation.where.get("multiplicity"),
                what=f"{name}: multiplicity {declared} is declared, the output has "
                f"{calculation.multiplicity}",
                mend="leave it out unless the output's is not the real one",
            )
        )
    known = KNOWN_LEVELS.get((calculation.formula, charge, spin))
    if levels == TABLE:
        if known is None:
            there = ", ".join(f"{formula} ({spin})" for formula, _, spin in KNOWN_LEVELS)
            raise StudyError(
                f"{name}: the table has no electronic levels of {calculation.formula}, charge "
                f"{charge}, multiplicity {spin}",
                where=where,
                mend=f"state them, {_LEVELS_MEND}; the table has {there}",
            )
        return known, spin, tuple(notes)
    if known is not None:
        text = ", ".join(f'[{g}, "{energy:g} cm^-1"]' for g, energy in known)
        notes.append(
            Finding(
                code="levels-offered",
                severity="note",
                file=calculation.path,
                line=None,
                what=f"{name}: electronic degeneracy {spin}, but low electronic levels are known",
                mend=f'to use them write levels = "table", or levels = [{text}]',
            )
        )
    return ((spin, 0.0),), spin, tuple(notes)


def electronic_energy(
    calculation: Calculation, energy: Calculation | ElectronicEnergy | None, name: str
) -> ElectronicEnergy:
    """Return the energy as it is given, else that of the frequency job."""
    if isinstance(energy, ElectronicEnergy):
        return energy
    if energy is not None and sorted(energy.numbers) != sorted(calculation.numbers):
        raise StudyError(
            f"{name}: the energy is of {energy.formula}, the modes are of {calculation.formula}",
            where=energy.path,
            mend="name the single point of the same structure",
        )
    source = calculation if energy is None else energy
    if source.energy_hartree is None:
        raise StudyError(
            f"{name}: the output has no electronic energy",
            where=source.path,
            mend="name an output whose SCF converged",
        )
    return single_energy(source)
