"""Provenance: every number that the answers stand on, with its origin, file and line."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np
from numpy.typing import NDArray

from thermo_pp.ensemble import Ensemble
from thermo_pp.names import Origin
from thermo_pp.records import Calculation
from thermo_pp.species import ElectronicEnergy, SpeciesModel, Structure
from thermo_pp.study.answers import Answers


def provenance(answers: Answers) -> list[dict[str, Any]]:
    """Return a row a number (or a list of numbers that stand together).

    Each has ``of`` (a species, or the key of the study file), ``quantity``, ``value``, ``unit`` (None
    where the value is a text with its unit), ``origin`` (``printed`` by a program, ``derived`` from
    printed ones, ``declared`` in the study), ``file`` and ``line`` (None where it has none).
    """
    rows = [row for name, model in answers.study.species.items() for row in _of_model(name, model)]
    file = str(answers.study.path)
    rows += [_row(one.place, "declared", one.value, None, "declared", file, one.line)
             for one in answers.declared]  # fmt: skip
    return rows


def _of_model(name: str, model: SpeciesModel) -> Iterator[dict[str, Any]]:
    """Yield the rows of a species; those of a declared one are among the keys of the study file."""
    if isinstance(model, Structure):
        yield from _of_structure(name, model)
    elif isinstance(model, Ensemble):
        for number, member in enumerate(model.members, start=1):
            label = f"{name}, conformer {number}"
            origin: Origin = "derived"
            yield _row(label, "degeneracy", member.degeneracy, "", origin, None, None)
            yield from _of_model(label, member.model)


def _of_structure(name: str, model: Structure) -> Iterator[dict[str, Any]]:
    job = model.calculation
    yield from _of_energy(name, model.energy)
    read = job.wavenumbers_cm
    own = model.modes.wavenumbers_cm
    same = read is not None and np.array_equal(read, own)
    key = "wavenumbers_cm" if same else "hessian_hartree_bohr2"
    yield _taken(name, "wavenumbers", own, "cm^-1", "printed" if same else "derived", job, key)
    yield _taken(
        name, "positions", job.positions_angstrom, "angstrom", "printed", job, "positions_angstrom"
    )
    masses: Origin = "declared"
    if np.array_equal(job.masses_u, model.masses_u):
        masses = job.masses_origin
    yield _taken(name, "masses", model.masses_u, "u", masses, job, "masses_u")
    yield _settled(name, "charge", model.charge, job.charge, job)
    if model.multiplicity is not None:
        yield _settled(name, "multiplicity", model.multiplicity, job.multiplicity, job)
    geometry = "positions_angstrom"
    yield _taken(
        name, "symmetry number", model.symmetry_number, "", model.symmetry_origin, job, geometry
    )
    yield _taken(name, "degeneracy", model.degeneracy, "", "derived", job, geometry)
    yield from _of_seam(name, model)
    for number, torsion in enumerate(model.torsions, start=1):
        rotor = torsion.rotor
        for quantity, value, unit in (
            ("moment of inertia", rotor.moment_u_a2, "u angstrom^2"),
            ("highest barrier", rotor.barrier_j_mol, "J/mol"),
        ):
            yield _taken(
                name, f"torsion {number}, {quantity}", value, unit, "derived", job, geometry
            )


def _of_seam(name: str, model: Structure) -> Iterator[dict[str, Any]]:
    """Yield what the modes of a crossing point were worked out from."""
    seam, across = model.seam, model.crossing_coordinate
    if seam is None or across is None:
        return
    for part in seam.parts:
        yield _row(name, part.quantity, part.value, part.unit, part.origin, part.file, part.line)
    for quantity, value, unit in (
        ("energy of its own state less the other", seam.gap_kj_mol, "kJ/mol"),
        ("slope across the seam", across.slope, "hartree/bohr"),
        ("reduced mass across the seam", across.reduced_mass_u, "u"),
    ):
        if value is not None:
            yield _row(name, quantity, value, unit, "derived", None, None)


def _of_energy(name: str, energy: ElectronicEnergy) -> Iterator[dict[str, Any]]:
    for part in energy.parts:
        quantity = f"electronic energy, {part.slot}: {part.name}"
        first, *others = (*zip(part.files, part.lines, strict=True), (None, None))
        row = _row(name, quantity, part.value_hartree, "hartree", part.origin, *first)
        row["factor"] = part.factor
        if len(part.files) > 1:
            row["further"] = [{"file": file, "line": line} for file, line in others[:-1]]
        yield row


def _settled(
    name: str, quantity: str, value: int, printed: int | None, job: Calculation
) -> dict[str, Any]:
    """Return a number that the output says, or that the study says in its place."""
    if value == printed:
        return _taken(name, quantity, value, "", "printed", job, quantity)
    return _row(name, quantity, value, "", "declared", None, None)


def _taken(
    name: str,
    quantity: str,
    value: float | NDArray[np.float64],
    unit: str,
    origin: Origin,
    job: Calculation,
    key: str,
) -> dict[str, Any]:
    """Return a number that comes out of an output, or rests on what stands there."""
    if origin == "declared":
        return _row(name, quantity, value, unit, origin, None, None)
    return _row(name, quantity, value, unit, origin, job.path, job.where.get(key))


def _row(
    of: str,
    quantity: str,
    value: Any,
    unit: str | None,
    origin: Origin,
    file: str | None,
    line: int | None,
) -> dict[str, Any]:
    return {
        "of": of,
        "quantity": quantity,
        "value": value,
        "unit": unit,
        "origin": origin,
        "file": file,
        "line": line,
    }
