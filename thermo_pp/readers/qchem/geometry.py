"""Geometries of a Q-Chem job, each tied to its nuclear repulsion and its numbers of electrons."""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import NUMBERS
from thermo_pp.readers import repulsion
from thermo_pp.readers.qchem.jobs import Job
from thermo_pp.readers.text import CUT_SHORT, Text
from thermo_pp.units import BOHR_ANGSTROM

FloatArray = NDArray[np.float64]

BLOCK = b"Standard Nuclear Orientation ("
MOST_ANGSTROM = 1e6
_REPULSION = b"Nuclear Repulsion Energy ="
_ELECTRONS = re.compile(rb"There are\s+(\d+) alpha and\s+(\d+) beta electrons")
_ECP = b"effective core potentials will be applied"


@dataclass(frozen=True, eq=False)
class Geometry:
    """One block: atoms, shape (n,) and (n, 3), ghost atoms left out and counted.

    `at` is the offset of its first row, `heading` that of its heading, `end` where the next block begins.
    """

    heading: int
    at: int
    end: int
    numbers: NDArray[np.int64]
    positions_angstrom: FloatArray
    ghosts: int

    def same(self, other: Geometry) -> bool:
        """Tell whether both are the same atoms in the same arrangement, to 1e-5 A."""
        if not np.array_equal(self.numbers, other.numbers):
            return False
        return bool(np.allclose(_distances(self), _distances(other), rtol=0.0, atol=1e-5))

    def same_atoms(self, other: Geometry) -> bool:
        """Tell whether both have the same kinds and numbers of atoms."""
        return np.array_equal(np.sort(self.numbers), np.sort(other.numbers))


def _distances(geometry: Geometry) -> FloatArray:
    x = geometry.positions_angstrom
    return np.asarray(np.linalg.norm(x[:, None, :] - x[None, :, :], axis=-1))


def blocks(text: Text, job: Job) -> list[tuple[int, int]]:
    """Return where each geometry block of a job begins, and where the next one does."""
    starts = text.part(job.echo, job.end).all(BLOCK)
    if not starts:
        raise text.error(
            job.end, f"no geometry in this job (looked for {BLOCK.decode()!r})", mend=CUT_SHORT
        )
    return list(zip(starts, [*starts[1:], job.end], strict=True))


def geometry(text: Text, job: Job, start: int, end: int) -> Geometry:
    """Return the geometry of the block at `start`.

    Raises
    ------
    ReadError
        A damaged row; coordinates that do not give the printed nuclear repulsion; charge, multiplicity and numbers of
        electrons that do not fit together.
    """
    unit = text.rest(start + len(BLOCK))
    if unit.startswith(b"Angstroms"):
        scale = 1.0
    elif unit.startswith(b"Bohr"):
        scale = BOHR_ANGSTROM
    else:
        raise text.expected(start, "the unit of the coordinates (Angstroms or Bohr)")
    line = first = text.next_line(start, 3)
    symbols: list[str] = []
    rows: list[list[float]] = []
    while not (words := text.rest(line).split())[:1] or not words[0].startswith(b"---"):
        if len(words) != 5 or words[0] != b"%d" % (len(rows) + 1):
            raise text.expected(line, f"atom {len(rows) + 1}: its number, symbol and coordinates")
        symbols.append(words[1].decode("utf-8", "replace").capitalize())
        rows.append(text.floats(line, 3, "three coordinates", skip=2))
        line = text.next_line(line)
    numbers = []
    for index, symbol in enumerate(symbols):
        if symbol != "Gh" and symbol not in NUMBERS:
            raise text.expected(text.next_line(first, index), "an atom of a known element")
        numbers.append(NUMBERS.get(symbol, 0))
    real = np.array(numbers) > 0
    positions = np.array(rows).reshape(-1, 3) * scale
    if not real.any() or np.abs(positions).max() > MOST_ANGSTROM:
        raise text.expected(first, "the coordinates of a molecule")
    shape = Geometry(
        start, first, end, np.array(numbers)[real], positions[real], int(np.sum(~real))
    )
    _check(text, job, shape)
    return shape


def _check(text: Text, job: Job, shape: Geometry) -> None:
    at = text.find(_REPULSION, shape.heading)
    if not 0 <= at < shape.end:
        raise text.error(
            shape.heading, "no nuclear repulsion energy of this geometry", mend=CUT_SHORT
        )
    printed = text.exact_text(at + len(_REPULSION), "the nuclear repulsion energy")
    match = _ELECTRONS.search(text.data, at, min(at + 400, shape.end))
    if match is None:
        raise text.error(at, "no numbers of electrons of this geometry", mend=CUT_SHORT)
    alpha, beta = int(match.group(1)), int(match.group(2))
    missing = int(shape.numbers.sum()) - job.charge - alpha - beta
    cores = missing > 0 and text.data.find(_ECP, job.start, job.end) >= 0
    if (missing and not cores) or alpha - beta != job.multiplicity - 1:
        raise text.error(
            match.start(),
            f"{alpha} alpha and {beta} beta electrons do not fit charge {job.charge}, multiplicity {job.multiplicity} "
            "and the atoms of this geometry",
            mend=CUT_SHORT,
        )
    why = None
    if not cores:
        why = repulsion.differs(printed, shape.numbers, shape.positions_angstrom, 5.1e-11)
    if why is not None:
        raise text.error(at, why, mend=CUT_SHORT)
