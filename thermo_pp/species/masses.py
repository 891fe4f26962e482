"""Masses: which ones a structure is treated with, the program's, average ones or isotopes."""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import AVERAGE_MASSES, ISOTOPES, SYMBOLS
from thermo_pp.errors import Finding, StudyError
from thermo_pp.names import Masses
from thermo_pp.records import Calculation

FloatArray = NDArray[np.float64]

_LABEL = re.compile(r"(\d+)([A-Z][a-z]?)")
_NICKNAMES = {"D": "2H", "T": "3H"}
_MEND = 'write for instance isotopes = { "3" = "D", "C" = "13C" }: atom numbers count from 1'


def chosen_masses(
    calculation: Calculation, masses: Masses, isotopes: Mapping[Any, str] | None, *, where: str
) -> FloatArray:
    """Return the masses that the treatment asks for.

    Parameters
    ----------
    calculation : Calculation
    masses : {"program", "average"}
    isotopes : mapping or None
        Atom number (from 1) or element symbol -> isotope; an atom's own entry comes before its
        element's.
    where : str
        For messages.

    Returns
    -------
    shape (n,)
        u.

    Raises
    ------
    StudyError
        An isotope of another element or not known, an atom or element that is not there.
    """
    chosen = calculation.masses_u
    if masses == "average":
        chosen = np.array([AVERAGE_MASSES[z] for z in calculation.numbers])
    return substituted(chosen, calculation.numbers, isotopes, where=where)


def substituted(
    masses_u: FloatArray,
    numbers: NDArray[np.int64],
    isotopes: Mapping[Any, str] | None,
    *,
    where: str,
) -> FloatArray:
    """Return the masses with isotopes in the place of some; errors as `chosen_masses`.

    Parameters
    ----------
    masses_u : shape (n,)
    numbers : shape (n,)
        Atomic numbers.
    isotopes : mapping or None
    where : str

    Returns
    -------
    shape (n,)
    """
    chosen = np.array(masses_u)
    entries = [(_atoms(key, numbers, where), str(value)) for key, value in (isotopes or {}).items()]
    for (atoms, of_element), label in sorted(entries, key=lambda entry: not entry[0][1]):
        element, mass = isotope_mass(label, where=where)
        for atom in atoms:
            symbol = SYMBOLS[numbers[atom]]
            if symbol != element:
                which = f"all atoms {symbol}" if of_element else f"atom {atom + 1} ({symbol})"
                raise StudyError(f"{label!r} is no isotope of {which}", where=where, mend=_MEND)
            chosen[atom] = mass
    return chosen


def mass_findings(
    calculation: Calculation,
    masses: FloatArray,
    isotopes: Mapping[Any, str] | None,
    name: str,
    where: str,
) -> tuple[Finding, ...]:
    """Refuse isotopes that the modes cannot follow; say where average masses do not reach them."""
    changed = not np.array_equal(masses, calculation.masses_u)
    if not changed or len(masses) == 1 or calculation.hessian_hartree_bohr2 is not None:
        return ()
    if isotopes:
        raise StudyError(
            f"{name}: isotopes change the modes, and {calculation.path} holds no Hessian",
            where=where,
            mend="name an output with a Hessian, or run the frequency job with those masses",
        )
    return (
        Finding(
            code="average-masses-mixed",
            severity="warning",
            file=calculation.path,
            line=None,
            what=f"{name}: average masses in translation and rotation only; the modes stay those "
            "of the program's masses, as the output holds no Hessian",
            mend="name an output with a Hessian, or leave masses at program",
        ),
    )


def isotope_mass(label: str, *, where: str) -> tuple[str, float]:
    """Turn ``"D"``, ``"T"`` or ``"13C"`` into the element symbol and the mass, u."""
    match = _LABEL.fullmatch(_NICKNAMES.get(label, label))
    if match is None or match.group(2) not in ISOTOPES:
        raise StudyError(f"{label!r} is not an isotope", where=where, mend=_MEND)
    element, number = match.group(2), int(match.group(1))
    known = ISOTOPES[element]
    if number not in known:
        listed = ", ".join(f"{n}{element}" for n in known)
        raise StudyError(f"{label!r} is not known", where=where, mend=f"known are {listed}")
    return element, known[number]


def _atoms(key: Any, numbers: NDArray[np.int64], where: str) -> tuple[list[int], bool]:
    """Return the atoms (from 0) that a key names, and whether it names an element."""
    text = str(key)
    if text in SYMBOLS[1:]:
        atoms = np.flatnonzero(numbers == SYMBOLS.index(text)).tolist()
        if not atoms:
            raise StudyError(f"no atom {text} to give an isotope", where=where, mend=_MEND)
        return atoms, True
    if re.fullmatch(r"\d+", text) is None or not 1 <= int(text) <= len(numbers):
        what = f"{text!r} is neither an element nor an atom number from 1 to {len(numbers)}"
        raise StudyError(what, where=where, mend=_MEND)
    return [int(text) - 1], False
