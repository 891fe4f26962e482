"""Torsion keys: the entries of ``torsions`` as a user writes them, turned into choices."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import Any

import numpy as np

from thermo_pp.errors import StudyError
from thermo_pp.formulas.torsion import Potential
from thermo_pp.nearest import suggestion
from thermo_pp.readers import read_source
from thermo_pp.records import Calculation
from thermo_pp.scans import Scan, scan_from_outputs, scan_from_table
from thermo_pp.sources import Source
from thermo_pp.species.potentials import TorsionChoice
from thermo_pp.units import quantity

KEYS = ("atoms", "scan", "fourier", "symmetry_number", "reduced_moment", "mode", "mirror")
MOST_FOURIER = 60


def parse_torsions(
    entries: Sequence[Mapping[str, Any]],
    calculation: Calculation,
    open_file: Callable[[str, str], Source],
    *,
    where: str,
) -> tuple[TorsionChoice, ...]:
    """Read the entries of ``torsions``.

    Parameters
    ----------
    entries : sequence of mapping
        With `atoms` and one of `scan` and `fourier`; see ``docs/torsions.md``.
    calculation : Calculation
        Of the structure that has the torsions.
    open_file : callable
        Name and place of the key -> Source.
    where : str
        Place of the list; entries are counted from 1.

    Raises
    ------
    StudyError
        An unknown or missing key, a value that is none, a scan that cannot be read.
    """
    return tuple(
        _choice(entry, calculation, open_file, f"{where}.{number}")
        for number, entry in enumerate(entries, start=1)
    )


def _choice(
    entry: Mapping[str, Any],
    calculation: Calculation,
    open_file: Callable[[str, str], Source],
    where: str,
) -> TorsionChoice:
    for key in entry:
        if key not in KEYS:
            mend = suggestion(str(key), KEYS, "keys")
            raise StudyError(f"unknown key {key!r}", where=f"{where}.{key}", mend=mend)
    atoms = _atoms(entry.get("atoms"), len(calculation.numbers), f"{where}.atoms")
    if ("scan" in entry) == ("fourier" in entry):
        both = "both scan and fourier" if "scan" in entry else "neither scan nor fourier"
        raise StudyError(
            f"the torsion has {both}",
            where=where,
            mend='give scan = "scan.csv", scan = ["out1", "out2", ...] or '
            'fourier = [[3, "6 kJ/mol", 0]]',
        )
    moment, mirror = entry.get("reduced_moment"), entry.get("mirror")
    scan = series = None
    if "scan" in entry:
        scan = _scan(entry["scan"], atoms, calculation, open_file, f"{where}.scan")
    else:
        series = _series(entry["fourier"], f"{where}.fourier")
        if mirror is not None:
            raise StudyError(
                "mirror has no meaning beside fourier", where=f"{where}.mirror", mend="take it out"
            )
    return TorsionChoice(
        atoms,
        scan,
        series,
        _whole(entry.get("symmetry_number"), f"{where}.symmetry_number"),
        None if moment is None else _moment(moment, f"{where}.reduced_moment"),
        *_mode(entry.get("mode"), f"{where}.mode"),
        None if mirror is None else quantity(mirror, "deg", where=f"{where}.mirror"),
        where,
    )


def _atoms(value: Any, count: int, where: str) -> tuple[int, int, int, int]:
    given = [] if value is None or isinstance(value, str) else list(value)
    whole = all(isinstance(atom, int | np.integer) and not isinstance(atom, bool) for atom in given)
    if (
        len(given) != 4
        or not whole
        or len(set(given)) != 4
        or not 1 <= min(given) <= max(given) <= count
    ):
        raise StudyError(
            f"{value!r} are no four different atoms among {count}",
            where=where,
            mend="name the atoms of the dihedral angle, counted from 1: atoms = [1, 2, 3, 4]",
        )
    one, two, three, four = (int(atom) - 1 for atom in given)
    return one, two, three, four


def _scan(
    value: Any,
    atoms: tuple[int, int, int, int],
    calculation: Calculation,
    open_file: Callable[[str, str], Source],
    where: str,
) -> Scan:
    """Read a table, or outputs; a Calculation that is read already is taken as it is."""
    if not isinstance(value, list | tuple):
        return scan_from_table(open_file(value, where))
    points = [
        point if isinstance(point, Calculation) else read_source(open_file(point, where))
        for point in value
    ]
    return scan_from_outputs(points, calculation, atoms, where)


def _series(value: Any, where: str) -> Potential:
    """Read [k, cosine, sine] of each term, kJ/mol."""
    mend = 'write k, cosine and sine of each term: fourier = [[3, "6 kJ/mol", 0]]'
    terms: dict[int, tuple[float, float]] = {}
    for term in value:
        if len(term) != 3 or not isinstance(term[0], int) or not 1 <= term[0] <= MOST_FOURIER:
            raise StudyError(f"{term!r} is no term k, cosine, sine", where=where, mend=mend)
        if term[0] in terms:
            raise StudyError(f"two terms have k = {term[0]}", where=where, mend=mend)
        cosine, sine = (1000.0 * quantity(part, "kJ/mol", where=where) for part in term[1:])
        terms[term[0]] = (cosine, sine)
    if not terms:
        raise StudyError("the series has no term", where=where, mend=mend)
    pairs = [terms.get(k, (0.0, 0.0)) for k in range(max(terms) + 1)]
    return Potential(tuple(one for one, _ in pairs), tuple(two for _, two in pairs))


def _whole(value: Any, where: str) -> int | None:
    if value is None:
        return None
    if isinstance(value, bool) or not isinstance(value, int) or value < 1:
        raise StudyError(
            f"symmetry number {value!r} is no whole number from 1 on",
            where=where,
            mend="give how many wells of the circle like atoms make the same: 3 for a methyl group",
        )
    return value


def _moment(value: Any, where: str) -> float:
    moment = quantity(value, "u*angstrom**2", where=where)
    if not moment > 0.0:
        raise StudyError(
            f"a reduced moment of {moment:g} u Å² is not above 0",
            where=where,
            mend='give it with its unit: reduced_moment = "1.6 u*angstrom^2"',
        )
    return moment


def _mode(value: Any, where: str) -> tuple[int | None, float | None]:
    """Return the number, from 0, or the wavenumber, cm^-1, that names a mode."""
    if value is None:
        return None, None
    if isinstance(value, int) and not isinstance(value, bool):
        return value - 1, None
    return None, quantity(value, "1/cm", where=where)
