"""Counterpoise: what the fragments of a complex gain from each other's basis functions, taken out."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import NamedTuple

import numpy as np

from thermo_pp.energies.terms import Term, check_same_level
from thermo_pp.errors import Finding, StudyError
from thermo_pp.pairing import pair
from thermo_pp.records import Calculation
from thermo_pp.species.energy import EnergyPart
from thermo_pp.units import HARTREE_KJ_MOL

SLOT = "counterpoise"
_NEGATIVE_HARTREE = -1e-6


class Fragment(NamedTuple):
    """One fragment: its atoms in the complex (from 1), alone, and among the others' functions."""

    atoms: tuple[int, ...]
    own: Calculation
    ghosts: Calculation


def counterpoise(frequencies: Calculation, fragments: Sequence[Fragment], *, where: str) -> Term:
    """Return the sum over fragments of energy in the own basis less energy in that of the complex.

    Both at the geometry that the fragment has in the complex; added to the energy of the complex.

    Raises
    ------
    StudyError
        Fragments that are not together the complex, another geometry, an output that has no ghost
        atoms where it should, or has them where it should not, levels that differ.

    Source: S. F. Boys, F. Bernardi, Mol. Phys. 1970, 19, 553 (from memory).
    """
    counts = np.zeros(len(frequencies.numbers) + 1, dtype=int)
    for number, fragment in enumerate(fragments, start=1):
        outside = [atom for atom in fragment.atoms if atom >= len(counts)]
        if outside:
            raise StudyError(
                f"there is no atom {outside[0]} in {frequencies.path}",
                where=f"{where}.{number}.atoms",
                mend=f"atoms count from 1 to {len(counts) - 1}, in the order of that output",
            )
        np.add.at(counts, list(fragment.atoms), 1)
    wrong = np.flatnonzero(counts[1:] != 1) + 1
    if wrong.size:
        how = "in no fragment" if counts[wrong[0]] == 0 else "in a fragment more than once"
        raise StudyError(
            f"atom {wrong[0]} of {frequencies.path} is {how}",
            where=where,
            mend="let the fragments have every atom of the complex once",
        )
    _check_charges(frequencies, fragments, where)
    findings: list[Finding] = []
    value = 0.0
    for number, fragment in enumerate(fragments, start=1):
        found = _checked(frequencies, fragment, f"{where}.{number}")
        findings += found
        value += float(fragment.own.energy_hartree or 0.0)
        value -= float(fragment.ghosts.energy_hartree or 0.0)
    outputs = [calc for one in fragments for calc in (one.own, one.ghosts)]
    if value < _NEGATIVE_HARTREE:
        findings.append(
            Finding(
                "counterpoise-negative",
                "warning",
                outputs[0].path,
                outputs[0].where.get("energy_hartree"),
                f"the counterpoise term of {frequencies.path} is {value * HARTREE_KJ_MOL:.2f} "
                "kJ/mol: more basis functions raise the energy of the fragments",
                "check that own and ghosts are not exchanged",
            )
        )
    part = EnergyPart(
        slot=SLOT,
        name="counterpoise",
        value_hartree=value,
        factor=1.0,
        origin="derived",
        files=tuple(calc.path for calc in outputs),
        lines=tuple(calc.where.get("energy_hartree") for calc in outputs),
    )
    ghosts = tuple(one.ghosts.path for one in fragments)
    return Term((part,), {SLOT: tuple(outputs)}, tuple(findings), ghosts)


def declared_counterpoise(value_kj_mol: float) -> Term:
    """Return a declared counterpoise term, added to the energy of the complex, as a part."""
    part = EnergyPart(
        slot=SLOT,
        name="counterpoise",
        value_hartree=value_kj_mol / HARTREE_KJ_MOL,
        factor=1.0,
        origin="declared",
        files=(),
        lines=(),
    )
    return Term((part,), {})


def _check_charges(frequencies: Calculation, fragments: Sequence[Fragment], where: str) -> None:
    charges = [fragment.own.charge for fragment in fragments]
    known = [charge for charge in charges if charge is not None]
    if frequencies.charge is None or len(known) < len(charges) or sum(known) == frequencies.charge:
        return
    raise StudyError(
        f"the charges of the fragments add up to {sum(known)}, that of {frequencies.path} is "
        f"{frequencies.charge}",
        where=where,
        mend="name fragments that are together the complex",
    )


def _checked(frequencies: Calculation, fragment: Fragment, where: str) -> tuple[Finding, ...]:
    """Check one fragment: ghost atoms, level, and the geometry that it has in the complex."""
    own, ghosts = fragment.own, fragment.ghosts
    for calc, key, meant in ((own, "own", False), (ghosts, "ghosts", True)):
        there = any(finding.code == "ghost-atoms" for finding in calc.findings)
        if there != meant:
            raise StudyError(
                f"{calc.path} has {'no ' if meant else ''}ghost atoms",
                where=f"{where}.{key}",
                mend="own: the fragment alone; ghosts: the fragment with the basis functions of "
                "the whole complex",
            )
    mend = "run both with one method and one basis set"
    check_same_level(own, ghosts, "", where, mend)
    rows = [atom - 1 for atom in fragment.atoms]
    part = replace(
        frequencies,
        numbers=frequencies.numbers[rows],
        positions_angstrom=frequencies.positions_angstrom[rows],
        masses_u=frequencies.masses_u[rows],
        charge=own.charge,
        multiplicity=own.multiplicity,
        wavenumbers_cm=None,
        modes=None,
        hessian_hartree_bohr2=None,
    )
    return (
        *pair(part, own, where=f"{where}.own").findings,
        *pair(own, ghosts, where=f"{where}.ghosts").findings,
    )
