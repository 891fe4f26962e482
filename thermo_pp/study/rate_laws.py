"""Rate laws of the study file: barriers of a stated height, scans, and fall-off."""

from __future__ import annotations

import csv
import math
import re
from pathlib import Path

from thermo_pp.audit.levels import level_words
from thermo_pp.errors import StudyError
from thermo_pp.rate_laws import Arrhenius, Falloff, Height
from thermo_pp.readers import read_source
from thermo_pp.sources import open_source
from thermo_pp.study.files import inside
from thermo_pp.study.keys import (
    ArrheniusKeys,
    FalloffKeys,
    Quantity,
    ScanKeys,
    StepKeys,
)
from thermo_pp.units import HARTREE_KJ_MOL, convert, quantity

_HEADING = re.compile(r"\s*energy\s*/\s*(.+?)\s*")
_HEAD_MEND = 'name the column and its unit in the first line: "energy / kJ mol^-1"'


def rate_unit(molecules: int) -> str:
    """Return the unit of a rate constant of a step with so many molecules on its left side.

    >>> rate_unit(1), rate_unit(2), rate_unit(3)
    ('1/s', 'L/mol/s', 'L^2/mol^2/s')
    """
    if molecules == 1:
        return "1/s"
    power = "" if molecules == 2 else f"^{molecules - 1}"
    return f"L{power}/mol{power}/s"


def make_arrhenius(keys: ArrheniusKeys, molecules: int, where: str) -> Arrhenius:
    """Return A, n and E of a declared rate constant of so many molecules."""
    unit = rate_unit(molecules)
    factor = quantity(keys.A, unit, where=f"{where}.A")
    if factor <= 0.0:
        raise StudyError(
            f"{keys.A!r} is not above 0", where=f"{where}.A", mend="write a value above 0"
        )
    return factor, keys.n, quantity(keys.E, "kJ/mol", where=f"{where}.E")


def make_falloff(keys: FalloffKeys, molecules: int, where: str) -> Falloff:
    """Turn ``falloff`` into a Falloff.

    Raises
    ------
    StudyError
        A centre where there is none, or none where there must be one; an efficiency that is not
        above 0; a rate constant of another order.
    """
    at = f"{where} falloff"
    centre: tuple[float, ...] = ()
    if isinstance(keys.centre, float | int):
        centre = (float(keys.centre),)
    elif isinstance(keys.centre, list):
        further = tuple(quantity(one, "K", where=f"{at}.centre") for one in keys.centre[1:])
        first = keys.centre[0] if keys.centre else ""
        centre = (0.0 if isinstance(first, str) else first, *further)
        if isinstance(first, str) or len(centre) not in (3, 4) or min(further[:2]) <= 0.0:
            raise StudyError(
                f"{keys.centre!r} is no centre of a fall-off",
                where=f"{at}.centre",
                mend='write one number, or [a, "T3", "T1"] or [a, "T3", "T1", "T2"]',
            )
    if (keys.form == "lindemann") == bool(centre):
        raise StudyError(
            "a Lindemann fall-off has no centre" if centre else f"{keys.form} needs a centre",
            where=f"{at}.centre",
            mend='take it out, or write form = "troe", "iupac" or "jpl"'
            if centre
            else 'write centre = 0.6 (or what the source gives), or form = "lindemann"',
        )
    if len(centre) == 1 and not 0.0 < centre[0] <= 1.0:
        raise StudyError(
            f"the centre {centre[0]:g} is not above 0 and at most 1",
            where=f"{at}.centre",
            mend="write what the source gives as F_cent or F_c",
        )
    collider = {keys.collider: 1.0} if isinstance(keys.collider, str) else keys.collider
    return Falloff(
        make_arrhenius(keys.low, molecules + 1, f"{at}.low"),
        make_arrhenius(keys.high, molecules, f"{at}.high"),
        keys.form,
        centre,
        collider,
    )


def make_height(
    value: Quantity | ScanKeys, keys: StepKeys, where: str, folder: Path, outputs: Path
) -> Height:
    """Turn ``barrier``, where it is not "none", into a Height.

    Raises
    ------
    StudyError
        A height or deviation below 0; a scan that cannot be read, or whose maximum is at its end.
    """
    deviation = None
    if isinstance(keys.deviation, str | float | int):
        deviation = quantity(keys.deviation, "kJ/mol", where=f"{where} deviation")
        if deviation < 0.0:
            raise StudyError(
                f"the deviation {keys.deviation!r} is below 0",
                where=f"{where} deviation",
                mend="write a standard deviation",
            )
    at = f"{where} barrier"
    if isinstance(value, ScanKeys):
        kj_mol, place = _maximum(_points(value.scan, f"{at}.scan", folder, outputs), f"{at}.scan")
        return Height(kj_mol, "left", deviation, place)
    kj_mol = quantity(value, "kJ/mol", where=at)
    if kj_mol < 0.0:
        raise StudyError(
            f"the barrier {value!r} is below 0",
            where=at,
            mend='it counts from the higher side; write barrier = "none" for a step without one',
        )
    return Height(kj_mol, "higher", deviation)


def _points(
    scan: str | list[str], where: str, folder: Path, outputs: Path
) -> list[tuple[float, str]]:
    """Return the energies of a scan in kJ/mol, and where each stands."""
    if isinstance(scan, str):
        return _table(outputs, folder, scan, where)
    points: list[tuple[float, str]] = []
    levels: dict[str | None, str] = {}
    for name in scan:
        calc = read_source(open_source(inside(outputs, folder, name, where)))
        if calc.energy_hartree is None:
            raise StudyError(
                f"{name} has no energy", where=where, mend="rerun this point, or leave it out"
            )
        levels.setdefault(level_words(calc), name)
        points.append((calc.energy_hartree * HARTREE_KJ_MOL, name))
    known = {words: name for words, name in levels.items() if words is not None}
    if len(known) > 1:
        says = "; ".join(f"{words} ({name})" for words, name in known.items())
        raise StudyError(
            f"the points of the scan are not at one level of theory: {says}",
            where=where,
            mend="compute all points of a scan alike",
        )
    return points


def _table(outputs: Path, folder: Path, name: str, where: str) -> list[tuple[float, str]]:
    path = inside(outputs, folder, name, where)
    try:
        lines = path.read_text(encoding="utf-8-sig").splitlines()
    except (OSError, UnicodeDecodeError):
        raise StudyError(
            f"{str(path)!r} is not UTF-8 text", where=where, mend="save it as CSV in UTF-8"
        ) from None
    column: tuple[int, str] | None = None
    points = []
    for number, line in enumerate(lines, start=1):
        if not line.strip() or line.lstrip().startswith("#"):
            continue
        cells, at = next(csv.reader([line])), f"{path}:{number}"
        if column is None:
            found = [(k, _HEADING.fullmatch(cell)) for k, cell in enumerate(cells)]
            named = [(k, match.group(1)) for k, match in found if match is not None]
            if len(named) != 1:
                raise StudyError(
                    f"{len(named)} columns are called energy", where=at, mend=_HEAD_MEND
                )
            column = named[0]
            continue
        text = cells[column[0]].strip() if column[0] < len(cells) else ""
        try:
            energy = float(text)
        except ValueError:
            energy = math.nan
        if not math.isfinite(energy):
            raise StudyError(
                f"expected a number as energy, found {text!r}",
                where=at,
                mend="mend the line, or take it out of the scan",
            )
        points.append((convert(energy, column[1], "kJ/mol", where=at), at))
    return points


def _maximum(points: list[tuple[float, str]], where: str) -> tuple[float, str]:
    """Return the height of the maximum above the first point, kJ/mol, and where it stands."""
    if len(points) < 3:
        raise StudyError(
            f"{len(points)} points are no scan over a maximum",
            where=where,
            mend="begin with the left side of the step and go on beyond the maximum",
        )
    best = max(range(len(points)), key=lambda k: points[k][0])
    if best in (0, len(points) - 1):
        end = "first" if best == 0 else "last"
        raise StudyError(
            f"the {end} point of the scan ({points[best][1]}) is its highest",
            where=where,
            mend='write barrier = "none" if there is none on the way'
            if best == 0
            else "go on with the scan until the energy falls",
        )
    return points[best][0] - points[0][0], points[best][1]
