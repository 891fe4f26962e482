"""Geometries of a GAMESS run: the one it was given, in bohr, and those of a geometry search, in angstrom."""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import SYMBOLS
from thermo_pp.readers import repulsion
from thermo_pp.readers.gamess.options import Run
from thermo_pp.readers.line_marks import first_match
from thermo_pp.readers.text import CUT_SHORT, Text
from thermo_pp.units import BOHR_ANGSTROM

FloatArray = NDArray[np.float64]

GIVEN = re.compile(rb"^ ATOM +ATOMIC +COORDINATES \((BOHR|ANGS)\)", re.MULTILINE)
SEARCHED = re.compile(rb"^ COORDINATES OF ALL ATOMS ARE \((ANGS|BOHR)\)", re.MULTILINE)
SEARCHED_MARK = b"COORDINATES OF ALL ATOMS ARE"
MOST_ANGSTROM = 1e6
_REPULSION = b"THE NUCLEAR REPULSION ENERGY IS"
_ELECTRONS = re.compile(rb"^ NUMBER OF ELECTRONS +(KEPT IN THE CALCULATION IS +)?=? +(\d+)", re.M)
_CHARGE = re.compile(rb"^ CHARGE OF MOLECULE +(?:AND PROPERTIES )?= +(-?\d+)", re.MULTILINE)
_SPIN = re.compile(rb"^ (?:SPIN|STATE) MULTIPLICITY +(?:IS +)?= +(\d+)", re.MULTILINE)
_ATOMS = re.compile(rb"^ TOTAL NUMBER OF ATOMS +(?:IS +)?= +(\d+)", re.MULTILINE)


@dataclass(frozen=True, eq=False)
class Geometry:
    """Atoms, shape (n,) and (n, 3), ghost atoms left out; `real` is the row of each, of `rows` centres."""

    at: int
    end: int
    numbers: NDArray[np.int64]
    positions_angstrom: FloatArray
    real: NDArray[np.int64]
    rows: int

    @property
    def ghosts(self) -> int:
        """How many centres are ghost atoms."""
        return self.rows - len(self.real)

    def differs(self, other: Geometry) -> float:
        """Return the largest difference of a coordinate, angstrom; infinity for other atoms."""
        if not np.array_equal(self.numbers, other.numbers):
            return float("inf")
        return float(np.max(np.abs(self.positions_angstrom - other.positions_angstrom)))


@dataclass(frozen=True)
class State:
    """Charge and multiplicity and the offsets of their lines."""

    charge: int
    multiplicity: int
    charge_at: int
    multiplicity_at: int


def table(text: Text, heading: re.Match[bytes]) -> Geometry:
    """Return the geometry of the table with this heading."""
    scale = BOHR_ANGSTROM if heading.group(1) == b"BOHR" else 1.0
    line = first = text.next_line(heading.start(), 2 if heading.re is GIVEN else 3)
    numbers: list[int] = []
    rows: list[list[float]] = []
    while len(words := text.rest(line).split()) == 5:
        charge, *position = text.floats(line, 4, "a charge and three coordinates", skip=1)
        if charge != round(charge) or not 0 <= charge < len(SYMBOLS):
            raise text.error(
                line,
                f"the centre {words[0].decode('utf-8', 'replace')!r} of charge {charge:g} is no atom",
                mend="point charges are not read; give a calculation of the molecule alone",
            )
        numbers.append(round(charge))
        rows.append(position)
        line = text.next_line(line)
    positions = np.array(rows).reshape(-1, 3) * scale
    real = np.flatnonzero(np.array(numbers, dtype=np.int64))
    if text.rest(line).strip() or not len(real) or np.abs(positions).max() > MOST_ANGSTROM:
        raise text.expected(line, "an atom: its name, charge and three coordinates")
    return Geometry(first, line, np.array(numbers)[real], positions[real], real, len(numbers))


def given(text: Text, run: Run) -> Geometry:
    """Return the geometry that the run was given, checked against the printed nuclear repulsion."""
    heading = first_match(GIVEN, b" COORDINATES (", text, run.start, run.end)
    if heading is None:
        raise text.error(run.end, "no geometry (looked for 'COORDINATES (BOHR)')", mend=CUT_SHORT)
    shape = table(text, heading)
    count = first_match(_ATOMS, b"TOTAL NUMBER OF ATOMS", text, shape.end, run.end)
    if count is not None and int(count.group(1)) != shape.rows:
        raise text.error(
            count.start(),
            f"{count.group(1).decode()} atoms here, {shape.rows} in the geometry",
            mend=CUT_SHORT,
        )
    at = text.part(shape.end, run.end).find(_REPULSION)
    if at >= 0 and run.options.get("PP", "NONE") == "NONE":
        printed = text.exact_text(at + len(_REPULSION), "the nuclear repulsion energy")
        why = repulsion.differs(printed, shape.numbers, shape.positions_angstrom, 5.1e-11)
        if why is not None:
            raise text.error(at, why, mend=CUT_SHORT)
    return shape


def state(text: Text, run: Run, shape: Geometry) -> State:
    """Return charge and multiplicity, checked against the options and the number of electrons."""
    charge = first_match(_CHARGE, b" CHARGE OF MOLECULE", text, run.start, run.end)
    spin = first_match(_SPIN, b" MULTIPLICITY ", text, run.start, run.end)
    if charge is None or spin is None:
        raise text.error(run.options_at, "no charge or multiplicity in this run", mend=CUT_SHORT)
    found = State(int(charge.group(1)), int(spin.group(1)), charge.start(), spin.start())
    for name, value in (("ICHARG", found.charge), ("MULT", found.multiplicity)):
        if run.options[name] != str(value):
            raise text.error(
                run.options_at,
                f"{name}={run.options[name]} here, but {value} elsewhere",
                mend=CUT_SHORT,
            )
    electrons = first_match(_ELECTRONS, b"NUMBER OF ELECTRONS", text, run.start, run.end)
    if electrons is None or run.options.get("PP", "NONE") != "NONE":
        return found
    missing = int(shape.numbers.sum()) - found.charge - int(electrons.group(2))
    semiempirical = re.search(
        rb"GBASIS=(?:AM1|PM3|MNDO|RM1) ", text.data[run.start : run.options_at]
    )
    if missing and not (semiempirical and missing > 0):
        raise text.error(
            electrons.start(),
            f"{electrons.group(2).decode()} electrons do not fit the nuclei and charge {found.charge}",
            mend=CUT_SHORT,
        )
    return found
