"""The electronic energies of a study: from the keys of a species, or of a named level, to checked parts."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping
from itertools import chain
from typing import Any

import msgspec
from msgspec import UnsetType

from thermo_pp import conditions as made
from thermo_pp.energies.counterpoise import Fragment, counterpoise, declared_counterpoise
from thermo_pp.energies.limits import extrapolated
from thermo_pp.energies.recipe import CheckedEnergy
from thermo_pp.energies.solvation import (
    SLOT,
    declared_solvation,
    no_slope,
    solvent_less_gas,
    to_molar,
)
from thermo_pp.energies.terms import Term, check_factors, single
from thermo_pp.errors import Finding, StudyError
from thermo_pp.names import DEFAULT_TEMPERATURE_K, Phase
from thermo_pp.nearest import suggestion
from thermo_pp.records import Calculation
from thermo_pp.species.energy import ElectronicEnergy
from thermo_pp.study.check import place
from thermo_pp.study.ensembles import has_energies, is_read
from thermo_pp.study.keys import (
    EnergyKeys,
    ExtrapolateKeys,
    FragmentKeys,
    LevelKeys,
    SolvationKeys,
    StructureKeys,
    StudyKeys,
)
from thermo_pp.study.values import given
from thermo_pp.units import quantity

Read = Callable[[str, str], Calculation]
"""Name of an output, file and key that name it -> its record; each output is read once."""

_PLACEHOLDER = re.compile(r"\{([^{}]*)\}")
_PACKED = (".gz", ".bz2", ".xz", ".zst", ".lzma", ".Z")


def make_energy(
    keys: str | EnergyKeys | None,
    frequencies: Calculation,
    phase: Phase,
    read: Read,
    where: str,
) -> CheckedEnergy:
    """Turn what a species or a member has under ``energy`` into its checked electronic energy.

    Parameters
    ----------
    keys : str, EnergyKeys or None
        None: the energy of the frequency job.
    frequencies : Calculation
        Whose molecule and geometry every part must have.
    phase : {"gas", "solution"}
    read : callable
    where : str
        File and key, ``study.toml [species.SO3] energy``, for messages.

    Raises
    ------
    StudyError
        A part of another molecule or geometry, factors that do not add up, an extrapolation
        between basis sets that do not belong together, a solvation term in the gas phase.
    """
    if keys is None:
        return _joined([single(frequencies, frequencies, slot="energy", where=where)])
    if isinstance(keys, str):
        return _joined([single(frequencies, read(keys, where), slot="energy", where=where)])
    terms: list[Term] = []
    parts = given(keys.sum) or []
    for number, part in enumerate(parts, start=1):
        at = f"{where}.sum.{number}"
        calc = read(part.file, f"{at}.file")
        method = given(part.method)
        slot = f"sum.{number}"
        terms.append(
            single(frequencies, calc, slot=slot, where=at, method=method, factor=part.factor)
        )
    extrapolate = given(keys.extrapolate)
    if extrapolate is not None:
        terms.append(_extrapolated(extrapolate, frequencies, read, f"{where}.extrapolate"))
    if terms:
        whole = 0.0 if extrapolate is None else 1.0
        check_factors([*(part.factor for part in parts), whole], where)
    else:
        terms.append(single(frequencies, frequencies, slot="energy", where=where))
    solvation = given(keys.solvation)
    slope = at_k = None
    if solvation is not None:
        _check_solution(terms, phase, f"{where}.solvation")
        term, slope, at_k = _solvation(solvation, frequencies, read, f"{where}.solvation")
        terms.append(term)
    fragments = given(keys.counterpoise)
    if fragments is not None:
        terms.append(_counterpoise(fragments, frequencies, read, f"{where}.counterpoise"))
    return _joined(terms, slope, at_k)


def _joined(
    terms: list[Term], slope_j_mol_k: float | None = None, at_k: float | None = None
) -> CheckedEnergy:
    parts = tuple(part for term in terms for part in term.parts)
    return CheckedEnergy(
        ElectronicEnergy(parts, slope_j_mol_k, at_k),
        {slot: calcs for term in terms for slot, calcs in term.calculations.items()},
        tuple(finding for term in terms for finding in term.findings),
        tuple(ghost for term in terms for ghost in term.ghosts),
    )


def _extrapolated(keys: ExtrapolateKeys, frequencies: Calculation, read: Read, where: str) -> Term:
    small, large = (read(name, f"{where}.files") for name in keys.files)
    return extrapolated(
        frequencies,
        small,
        large,
        power=3.0 if isinstance(keys.correlation, str) else keys.correlation,
        reference=keys.reference,
        where=where,
        method=given(keys.method),
        cardinals=given(keys.cardinals),
    )


def _check_solution(terms: list[Term], phase: Phase, where: str) -> None:
    """Check that a solvation term has a place: in solution, and not in the energy already."""
    if phase != "solution":
        raise StudyError(
            "a solvation term in the gas phase",
            where=where,
            mend='write phase = "solution" under [treatment], or take the term out',
        )
    for calc in chain.from_iterable(chain(*(term.calculations.values() for term in terms))):
        if calc.solvent not in (None, "none"):
            raise StudyError(
                f"{calc.path} has the solvent model {calc.solvent} already: solvation would count "
                "twice",
                where=where,
                mend="take the other parts from outputs without a solvent model, or leave out the "
                "solvation term",
            )


def _solvation(
    keys: SolvationKeys, frequencies: Calculation, read: Read, where: str
) -> tuple[Term, float | None, float]:
    """Return the term, its temperature derivative and where it holds."""
    temperature = given(keys.temperature)
    at_k = (
        DEFAULT_TEMPERATURE_K
        if temperature is None
        else made.temperature(temperature, where=f"{where}.temperature")
    )
    slope = given(keys.slope)
    if slope is not None:
        slope = quantity(slope, "J/mol/K", where=f"{where}.slope")
    has = [key for key in ("solvent", "gas", "value") if given(getattr(keys, key)) is not None]
    if has == ["value"]:
        state = given(keys.gas_state)
        if state is None:
            raise StudyError(
                "the key 'gas_state' is missing",
                where=where,
                mend='say from which state of the gas the value starts: gas_state = "1 mol/L", or '
                '"1 bar" or "1 atm" for many tables',
            )
        value, slope = to_molar(
            quantity(keys.value, "kJ/mol", where=f"{where}.value"),
            slope,
            made.standard_state(state, where=f"{where}.gas_state"),
            at_k,
        )
        return declared_solvation(value), slope, at_k
    if has != ["solvent", "gas"] or given(keys.gas_state) is not None:
        raise StudyError(
            f"solvation has {', '.join([*has, *(['gas_state'] if keys.gas_state else [])]) or 'nothing'}",
            where=where,
            mend='name two outputs (solvent = "...", gas = "..."), or declare it (value = "...", '
            'gas_state = "...")',
        )
    solvent = read(str(keys.solvent), f"{where}.solvent")
    gas = read(str(keys.gas), f"{where}.gas")
    return solvent_less_gas(frequencies, solvent, gas, where=where), slope, at_k


def _counterpoise(
    keys: str | float | list[FragmentKeys], frequencies: Calculation, read: Read, where: str
) -> Term:
    if not isinstance(keys, list):
        return declared_counterpoise(quantity(keys, "kJ/mol", where=where))
    if len(keys) < 2:
        raise StudyError(
            "a counterpoise term of fewer than two fragments",
            where=where,
            mend="name every fragment of the complex, or declare the term in kJ/mol",
        )
    fragments = [
        Fragment(
            tuple(one.atoms),
            read(one.own, f"{where}.{number}.own"),
            read(one.ghosts, f"{where}.{number}.ghosts"),
        )
        for number, one in enumerate(keys, start=1)
    ]
    return counterpoise(frequencies, fragments, where=where)


def solution_findings(
    energies: Mapping[str, CheckedEnergy], standard_form: str, file: str
) -> list[Finding] | None:
    """Return what the solvation terms of a study leave open; None where no species has one."""
    with_term = {
        name: one.energy
        for name, one in energies.items()
        if any(part.slot == SLOT for part in one.energy.parts)
    }
    if not with_term:
        return None
    found = []
    open_ones = [
        name for name, energy in with_term.items() if energy.solvation_slope_j_mol_k is None
    ]
    if open_ones:
        found.append(no_slope(file, open_ones))
    if standard_form != "concentration":
        found.append(
            Finding(
                "solvation-state",
                "note",
                file,
                None,
                "solvation terms are from 1 mol/L to 1 mol/L, but the standard state is a "
                "pressure: G is that of the solute at the concentration p/RT",
                'write standard_state = "1 mol/L" under [treatment]',
            )
        )
    return found


# --- named levels of theory


def check_levels(keys: StudyKeys, file: str) -> None:
    """Check that every named level has an energy for every species that is read, and no other.

    Raises
    ------
    StudyError
        A species without an energy, one that is declared or unknown, a level in use that is not
        there or beside energies of the species' own.
    """
    read = [name for name, member in keys.species.items() if given(member.frequencies) is not None]
    several = [name for name, member in keys.species.items() if is_read(member)]
    for level, one in keys.levels.items():
        where = place(file, "levels", level)
        for name in one.energies:
            if name in several:
                raise StudyError(
                    f"{name!r} has several conformers, which one energy cannot be of",
                    where=f"{where} energies.{name}",
                    mend="give the level an energy for all; {frequencies} in a file name stands for "
                    "each conformer's frequency job without its ending",
                )
            if name not in read:
                declared = name in keys.species
                raise StudyError(
                    f"{name!r} is declared: it has no energy"
                    if declared
                    else f"unknown species {name!r}",
                    where=f"{where} energies.{name}",
                    mend="take it out" if declared else suggestion(name, read, "species"),
                )
        missing = [*(name for name in read if name not in one.energies), *several]
        if given(one.energy) is None and missing:
            raise StudyError(
                f"the level {level!r} has no energy for {', '.join(missing)}",
                where=where,
                mend="give energies.NAME for each of them, or energy for all; {frequencies} in a "
                "file name stands for the species' frequency job without its ending",
            )
    used = given(keys.level)
    if used is None:
        return
    known_level(keys, used, file)
    own = [
        name
        for name, one in keys.species.items()
        if given(one.energy) is not None or has_energies(one)
    ]
    if own:
        raise StudyError(
            f"{own[0]} has an energy of its own beside level = {used!r}",
            where=place(file, "species", own[0], "energy"),
            mend="take one of the two out",
        )


def known_level(keys: StudyKeys, level: str, file: str) -> None:
    """Check that there is a level of this name."""
    if level not in keys.levels:
        raise StudyError(
            f"there is no level {level!r}",
            where=place(file, "level"),
            mend=suggestion(level, keys.levels, "levels")
            if keys.levels
            else f'add a table [levels."{level}"] with an energy for every species',
        )


def energy_keys(
    keys: StudyKeys, level: str | None, name: str, member: StructureKeys, file: str
) -> tuple[str | EnergyKeys | None, str]:
    """Return the energy of a species at a level (None: its own), and file and key of it."""
    if level is None:
        return given(member.energy), place(file, "species", name, "energy")
    one: LevelKeys = keys.levels[level]
    if name in one.energies:
        where = place(file, "levels", level, "energies", name)
        return _filled(one.energies[name], name, str(member.frequencies), where), where
    where = place(file, "levels", level, "energy")
    pattern = one.energy
    if isinstance(pattern, UnsetType):
        raise TypeError("check_levels comes first")
    return _filled(pattern, name, str(member.frequencies), where), where


def _filled(pattern: str | EnergyKeys, name: str, frequencies: str, where: str) -> str | EnergyKeys:
    """Put a species into the placeholders of a pattern."""
    values = {"species": name, "frequencies": _without_ending(frequencies)}

    def value(match: re.Match[str]) -> str:
        if match[1] not in values:
            raise StudyError(
                f"unknown placeholder {match[0]!r}",
                where=where,
                mend="write {frequencies} or {species}",
            )
        return values[match[1]]

    def fill(inside: Any) -> Any:
        if isinstance(inside, str):
            return _PLACEHOLDER.sub(value, inside)
        if isinstance(inside, dict):
            return {key: fill(item) for key, item in inside.items()}
        return [fill(item) for item in inside] if isinstance(inside, (list, tuple)) else inside

    if isinstance(pattern, str):
        return str(fill(pattern))
    return msgspec.convert(fill(msgspec.to_builtins(pattern)), EnergyKeys)


def _without_ending(name: str) -> str:
    """Return the name of an output without its ending, packed or not: ``a/so3.out.gz`` -> ``a/so3``."""
    for packed in _PACKED:
        name = name.removesuffix(packed)
    folder, slash, file = name.rpartition("/")
    stem, dot, _ = file.rpartition(".")
    return f"{folder}{slash}{stem if dot and stem else file}"
