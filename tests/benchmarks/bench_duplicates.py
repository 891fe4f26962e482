"""Duplicates among 10,000 structures of one molecule, against superposing pairs without looking at invariants first.

Conformers of a chain of 30 atoms are made from random torsions; a fifth of them repeat an earlier one, turned,
shaken by 0.005 A and with like atoms renumbered, half of those as mirror images. Once with energies, once without. All
planted repeats must be found, and nothing else. The reference is the time of one superposition times the number of
pairs. Run from the repository: ``PYTHONPATH=. python tests/benchmarks/bench_duplicates.py [COUNT]``.
"""

from __future__ import annotations

import sys
import time

import numpy as np
from machine import report

from thermo_pp.audit.duplicates import duplicate_findings
from thermo_pp.formulas.superposition import match
from thermo_pp.records import Calculation

COUNT = 10_000
ATOMS = 30
TARGET = 1000.0
MOST_S = 60.0
NUMBERS = np.array(([6, 6, 7, 6, 8] * ATOMS)[:ATOMS])


def chain(rng: np.random.Generator) -> np.ndarray:
    """Return a chain with bonds of 1.5 A, angles of 112 degrees and random torsions."""
    points = [np.zeros(3), np.array([1.5, 0.0, 0.0]), np.array([2.06, 1.39, 0.0])]
    angle = np.radians(112.0)
    while len(points) < ATOMS:
        torsion = rng.uniform(-np.pi, np.pi)
        a, b, c = points[-3:]
        along = (c - b) / np.linalg.norm(c - b)
        normal = np.cross(b - a, along)
        normal /= np.linalg.norm(normal)
        frame = np.array([along, np.cross(normal, along), normal])
        step = [
            -np.cos(angle),
            np.sin(angle) * np.cos(torsion),
            np.sin(angle) * np.sin(torsion),
        ]
        points.append(c + 1.5 * np.array(step) @ frame)
    return np.array(points)


def repeated(x: np.ndarray, rng: np.random.Generator, mirror: bool) -> np.ndarray:
    """Return a structure turned, shaken and renumbered, or the mirror image of that."""
    turn = np.linalg.qr(rng.normal(size=(3, 3)))[0]
    if (np.linalg.det(turn) < 0.0) != mirror:
        turn = -turn
    moved = x @ turn.T + rng.normal(size=3) + rng.normal(scale=0.005, size=x.shape)
    order = np.arange(ATOMS)
    for element in np.unique(NUMBERS):
        like = np.flatnonzero(np.equal(NUMBERS, element))
        order[like] = rng.permutation(order[like])
    return moved[order]


def calculation(place: int, x: np.ndarray, energy: float | None) -> Calculation:
    """Return a calculation of a structure."""
    return Calculation(
        path=f"{place}.out",
        sha256=f"{place:064x}",
        program="made",
        numbers=NUMBERS,
        positions_angstrom=x,
        masses_u=np.full(ATOMS, 12.0),
        masses_origin="derived",
        energy_hartree=energy,
    )


def made(count: int, with_energy: bool) -> tuple[list[Calculation], dict[str, str]]:
    """Return structures, and the code of the finding that each repeat must get."""
    rng = np.random.default_rng(20250101)
    found, wanted, plain = [], {}, []
    for place in range(count):
        if plain and rng.random() < 0.2:
            earlier = plain[rng.integers(len(plain))]
            mirror = bool(rng.random() < 0.5)
            x = repeated(earlier.positions_angstrom, rng, mirror)
            energy = earlier.energy_hartree
            wanted[f"{place}.out"] = "mirror-image" if mirror else "duplicate-structure"
            found.append(calculation(place, x, None if energy is None else energy + 1e-6))
        else:
            energy = float(rng.normal(scale=0.01)) if with_energy else None
            found.append(calculation(place, chain(rng), energy))
            plain.append(found[-1])
    return found, wanted


def main() -> int:
    """Print the ratios; 1 where one is below the target or a repeat is missed."""
    count = int(sys.argv[1]) if len(sys.argv) > 1 else COUNT
    status = 0
    for with_energy in (True, False):
        structures, wanted = made(count, with_energy)
        start = time.perf_counter()
        one, two = structures[:2]
        for _ in range(5):
            match(NUMBERS, one.positions_angstrom, NUMBERS, two.positions_angstrom)
        reference = (time.perf_counter() - start) / 5 * count * (count - 1) / 2
        start = time.perf_counter()
        codes = {str(each.file): each.code for each in duplicate_findings(structures)}
        ours = time.perf_counter() - start
        what = (
            f"duplicates among {count} structures {'with' if with_energy else 'without'} energies"
        )
        status |= report(what, ours, reference, TARGET)
        wrong = {path for path in codes | wanted if codes.get(path) != wanted.get(path)}
        print(
            f"  {len(wanted)} repeats planted, {len(wrong)} missed, mistaken or too many: {sorted(wrong)[:5]}"
        )
        status |= bool(wrong) or ours > MOST_S
    return status


if __name__ == "__main__":
    sys.exit(main())
