"""Scans: energies along a torsion, from a table or from one output a point."""

from __future__ import annotations

import csv
import re
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import StudyError
from thermo_pp.formulas.turning import dihedral
from thermo_pp.records import Calculation, freeze
from thermo_pp.sources.source import Source
from thermo_pp.units import HARTREE_KJ_MOL, convert

FloatArray = NDArray[np.float64]

_HEADING = re.compile(r"\s*(angle|energy)\s*/\s*(.+?)\s*")
_UNITS = {"angle": "deg", "energy": "kJ/mol"}
_LEVEL = ("method", "basis", "dispersion", "solvent", "grid", "frozen_core")
_HEAD_MEND = 'the first line names two columns with their units: "angle / deg,energy / kJ mol^-1"'


@dataclass(frozen=True, eq=False)
class Scan:
    """A scan of one dihedral angle.

    Attributes
    ----------
    angles_deg : shape (n,)
    energies_j_mol : shape (n,)
        J/mol above the lowest point.
    places : tuple of str
        File, or file and line, of each point.
    files : tuple of str
    calculations : tuple of Calculation
        Those of the points; empty for a table.
    """

    angles_deg: FloatArray
    energies_j_mol: FloatArray
    places: tuple[str, ...]
    files: tuple[str, ...]
    calculations: tuple[Calculation, ...] = ()

    def __post_init__(self) -> None:
        freeze(self, "angles_deg", np.float64, (-1,))
        freeze(self, "energies_j_mol", np.float64, (len(self.angles_deg),))

    @property
    def lowest(self) -> Calculation | None:
        """The calculation of the lowest point; None for a table."""
        return self.calculations[int(self.energies_j_mol.argmin())] if self.calculations else None


def scan_from_table(source: Source) -> Scan:
    """Read a scan from a table (CSV): a line of headings with units, then a point a line.

    Lines that begin with ``#`` and empty lines are passed over; the columns stand in any order, others
    beside them are not looked at.

    Raises
    ------
    StudyError
        A heading that is missing or not understood, an entry that is no number; names file and line.
    """
    try:
        text = source.data.decode("utf-8-sig")
    except UnicodeDecodeError:
        raise StudyError(
            "the table is not UTF-8 text", where=source.name, mend="save it as CSV in UTF-8"
        ) from None
    columns: dict[str, tuple[int, str]] = {}
    rows: list[tuple[float, float]] = []
    places: list[str] = []
    for number, line in enumerate(text.splitlines(), start=1):
        if not line.strip() or line.lstrip().startswith("#"):
            continue
        where = f"{source.name}:{number}"
        cells = next(csv.reader([line]))
        if not columns:
            columns = _headings(cells, where)
            continue
        angle, energy = (_number(cells, columns[name], name, where) for name in ("angle", "energy"))
        rows.append((angle, energy))
        places.append(where)
    if len(rows) < 2:
        raise StudyError(
            f"{len(rows)} points are no scan",
            where=source.name,
            mend=f"{_HEAD_MEND}; a line a point",
        )
    angles, energies = np.array(rows).T
    return Scan(angles, 1000.0 * (energies - energies.min()), tuple(places), (source.name,))


def _headings(cells: Sequence[str], where: str) -> dict[str, tuple[int, str]]:
    """Return column and unit of angle and energy."""
    found: dict[str, tuple[int, str]] = {}
    for column, cell in enumerate(cells):
        match = _HEADING.fullmatch(cell)
        if match is None:
            continue
        name, unit = match.groups()
        if name in found:
            raise StudyError(f"two columns are called {name}", where=where, mend=_HEAD_MEND)
        convert(1.0, unit, _UNITS[name], where=where, shown=cell.strip())
        found[name] = (column, unit)
    for name in _UNITS:
        if name not in found:
            what = f"no column {name!r} with its unit among {', '.join(map(repr, cells))}"
            raise StudyError(what, where=where, mend=_HEAD_MEND)
    return found


def _number(cells: Sequence[str], column: tuple[int, str], name: str, where: str) -> float:
    """Return one entry in the unit of `_UNITS`."""
    position, unit = column
    text = cells[position].strip() if position < len(cells) else ""
    try:
        number = float(text)
        if not np.isfinite(number):
            raise ValueError
    except ValueError:
        raise StudyError(
            f"expected a number as {name}, found {text!r}",
            where=where,
            mend="mend the line, or take it out of the scan",
        ) from None
    return convert(number, unit, _UNITS[name], where=where)


def scan_from_outputs(
    calculations: Sequence[Calculation], like: Calculation, atoms: Sequence[int], where: str
) -> Scan:
    """Make a scan of outputs, one a point, the dihedral angle measured in each geometry.

    Parameters
    ----------
    calculations : sequence of Calculation
    like : Calculation
        Of the structure that has the torsion; the order of the atoms must be the same.
    atoms : four of int
        From 0.
    where : str
        For messages.

    Raises
    ------
    StudyError
        No energy, an optimisation that did not converge, another molecule or order of atoms, levels
        of theory that differ within the scan.
    """
    if len(calculations) < 2:
        raise StudyError(
            f"{len(calculations)} points are no scan",
            where=where,
            mend="name an output for every point",
        )
    for calc in calculations:
        _check_point(calc, like, where)
    first = calculations[0]
    for calc in calculations[1:]:
        differs = level_difference(first, calc)
        if differs is not None:
            raise StudyError(
                f"the {differs} of the scan differs: {getattr(first, differs)} in {first.path}, "
                f"{getattr(calc, differs)} in {calc.path}",
                where=where,
                mend="compute all points of a scan at one level of theory",
            )
    energies = np.array([calc.energy_hartree for calc in calculations], dtype=np.float64)
    return Scan(
        np.array([dihedral(calc.positions_angstrom, atoms) for calc in calculations]),
        1000.0 * HARTREE_KJ_MOL * (energies - energies.min()),
        tuple(calc.path for calc in calculations),
        tuple(calc.path for calc in calculations),
        tuple(calculations),
    )


def level_difference(one: Calculation, other: Calculation) -> str | None:
    """Return the first field of the level of theory that both state and that differs."""
    for name in _LEVEL:
        values = [getattr(calc, name) for calc in (one, other)]
        if None not in values and len({" ".join(value.casefold().split()) for value in values}) > 1:
            return name
    return None


def _check_point(calc: Calculation, like: Calculation, where: str) -> None:
    if not np.array_equal(calc.numbers, like.numbers):
        same = calc.formula == like.formula
        raise StudyError(
            f"{calc.path} has its atoms in another order than {like.path}"
            if same
            else f"{calc.path} is {calc.formula}, but {like.path} is {like.formula}",
            where=where,
            mend="name outputs of this very molecule, its atoms in the same order",
        )
    for name in ("charge", "multiplicity"):
        own, its = getattr(calc, name), getattr(like, name)
        if own is not None and its is not None and own != its:
            raise StudyError(
                f"{calc.path} has {name} {own}, but {like.path} has {name} {its}",
                where=where,
                mend="name outputs of this very molecule in this very state",
            )
    if calc.energy_hartree is None or calc.optimised is False:
        lacks = (
            "no energy" if calc.energy_hartree is None else "an optimisation that did not converge"
        )
        raise StudyError(
            f"{calc.path} has {lacks}",
            where=where,
            mend="rerun this point, or leave it out of the scan",
        )
