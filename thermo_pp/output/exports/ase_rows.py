"""Rows for ASE: the structures as a JSON database that `ase.db` opens."""

from __future__ import annotations

import hashlib
from typing import Any

from thermo_pp import __version__
from thermo_pp.output.exports.structures import structures
from thermo_pp.species import Structure
from thermo_pp.study.answers import Answers


def ase_text(answers: Answers) -> str:
    """Return the database: a row a structure, times and identifiers the same in every run.

    ``energy`` is the electronic energy in eV by ASE's own factor; ``data`` holds what the study makes
    of the structure, units in the names.
    """
    from ase.io.jsonio import encode

    rows = {
        str(number): _row(answers, *found)
        for number, found in enumerate(structures(answers), start=1)
    }
    known = {
        **rows,
        "metadata": {"title": answers.study.title, "description": f"thermo_pp {__version__}"},
        "ids": list(range(1, len(rows) + 1)),
        "nextid": len(rows) + 1,
    }
    return "{" + ",\n".join(f'"{key}": {encode(value)}' for key, value in known.items()) + "}"


def _row(answers: Answers, name: str, number: int | None, model: Structure) -> dict[str, Any]:
    from ase.db.row import atoms2dict
    from ase.units import Hartree

    job = model.calculation
    atoms = job.atoms
    atoms.set_masses(model.masses_u)  # type: ignore[no-untyped-call]
    label = name if number is None else f"{name}, conformer {number}"
    t = answers.study.conditions.temperature_k
    result = model.at(t)
    row = dict(atoms2dict(atoms))  # type: ignore[no-untyped-call]
    row["unique_id"] = hashlib.sha256(f"{label}\n{job.sha256}".encode()).hexdigest()[:32]
    row |= {
        "ctime": 0.0,
        "mtime": 0.0,
        "user": "",
        "calculator": "unknown",
        "calculator_parameters": {},
        "energy": model.energy_hartree * Hartree,
    }
    row["key_value_pairs"] = {
        "species": name,
        "conformer": number or 0,
        "kind": model.kind,
        "total_charge": model.charge,
        "multiplicity": model.multiplicity or 0,
        "symmetry_number": model.symmetry_number,
        "electronic_energy_hartree": model.energy_hartree,
        "zero_point_kj_mol": result.zero_point_kj_mol,
        "file": job.path,
    }
    row["data"] = {
        "wavenumbers_cm": model.modes.wavenumbers_cm,
        "temperature_k": result.temperature_k,
        "enthalpy_kj_mol": result.enthalpy_kj_mol,
        "entropy_j_mol_k": result.entropy_j_mol_k,
        "gibbs_kj_mol": result.gibbs_kj_mol,
        "heat_capacity_j_mol_k": result.heat_capacity_j_mol_k,
        "low_modes": result.low_modes,
        "standard_state": result.standard_state.text,
    }
    return row
