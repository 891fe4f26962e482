"""Duplicates: the same structure twice at one level of theory; mirror images are told apart.

Structures are compared only within groups that have the same atoms, charge, multiplicity, level and
kind of job, and there only with those whose energy and distances between atoms agree, so that a
large folder stays quick.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding
from thermo_pp.formulas.superposition import match
from thermo_pp.records import Calculation

SAME_ANGSTROM = 0.05
"""Structures are the same below this root mean square distance after superposition."""
SAME_ENERGY_HARTREE = 2e-4
"""Energies of one structure at one level agree this well, loosely optimised ones too."""

FloatArray = NDArray[np.float64]


def duplicate_findings(calculations: Sequence[Calculation]) -> tuple[Finding, ...]:
    """Return a finding for every calculation whose structure, or mirror image, came before."""
    groups: dict[tuple[object, ...], list[Calculation]] = defaultdict(list)
    for calculation in calculations:
        groups[_group(calculation)].append(calculation)
    found: dict[str, Finding] = {}
    for group in groups.values():
        for later, earlier, how in _pairs(group):
            found.setdefault(later.path, _finding(later, earlier, how))
    return tuple(found[each.path] for each in calculations if each.path in found)


def _group(calculation: Calculation) -> tuple[object, ...]:
    return (
        calculation.numbers.tobytes() if len(calculation.numbers) == 1 else calculation.formula,
        calculation.charge,
        calculation.multiplicity,
        calculation.method,
        calculation.basis,
        calculation.dispersion,
        calculation.solvent,
        calculation.grid,
        calculation.frozen_core,
        calculation.wavenumbers_cm is None,
        tuple(np.round(np.sort(calculation.masses_u), 1)),
    )


def _pairs(group: Sequence[Calculation]) -> list[tuple[Calculation, Calculation, str]]:
    """Return (later, earlier, how) for every calculation that repeats an earlier one."""
    pairs: list[tuple[Calculation, Calculation, str]] = []
    kept: list[tuple[Calculation, FloatArray]] = []
    for calculation in group:
        distances = _distances(calculation)
        for earlier, others in kept:
            how = _same(calculation, distances, earlier, others)
            if how:
                pairs.append((calculation, earlier, how))
                break
        else:
            kept.append((calculation, distances))
    return pairs


def _same(one: Calculation, mine: FloatArray, other: Calculation, theirs: FloatArray) -> str:
    """Return in what way two calculations are of one structure, empty where they are not."""
    if one.sha256 == other.sha256:
        return "bytes"
    e, f = one.energy_hartree, other.energy_hartree
    if e is not None and f is not None and abs(e - f) > SAME_ENERGY_HARTREE:
        return ""
    if np.any(np.abs(mine - theirs) > 2.0 * SAME_ANGSTROM * np.sqrt(len(one.numbers))):
        return ""
    a, b = (one.numbers, one.positions_angstrom), (other.numbers, other.positions_angstrom)
    if match(*a, *b) < SAME_ANGSTROM:
        return "structure"
    return "mirror image" if match(*a, *b, mirror=True) < SAME_ANGSTROM else ""


def _distances(calculation: Calculation) -> FloatArray:
    """Return all distances between atoms, sorted: they do not depend on place and numbering."""
    x = calculation.positions_angstrom
    first, second = np.triu_indices(len(x), k=1)
    return np.asarray(np.sort(np.linalg.norm(x[first] - x[second], axis=-1)))


def _finding(later: Calculation, earlier: Calculation, how: str) -> Finding:
    line = later.where.get("positions_angstrom")
    if how == "mirror image":
        return Finding(
            "mirror-image",
            "note",
            later.path,
            line,
            f"the mirror image of {earlier.path}",
            "both hands are counted for each of the two; keep one, or list them as conformers",
        )
    if how == "bytes":
        what = f"the same file as {earlier.path}, byte for byte"
    else:
        what = f"the same structure as {earlier.path} at the same level of theory"
    return Finding(
        "duplicate-structure",
        "warning",
        later.path,
        line,
        what,
        "count it once: leave one of the two out of a set of conformers",
    )
