"""QCSchema: one calculation as a result of version 1, with the Hessian where there is one."""

from __future__ import annotations

from typing import Any

import numpy as np

from thermo_pp import __version__
from thermo_pp.data.elements import SYMBOLS
from thermo_pp.output.json_text import json_text
from thermo_pp.records import Calculation
from thermo_pp.units import BOHR_ANGSTROM


def lacking(calculation: Calculation) -> str | None:
    """Return what the schema asks for and the output does not say, None where nothing is lacking."""
    needed = ("method", "charge", "multiplicity", "energy_hartree")
    missing = [name for name in needed if getattr(calculation, name) is None]
    return ", ".join(name.removesuffix("_hartree") for name in missing) or None


def qcschema_text(calculation: Calculation) -> str:
    """Return the document; the calculation must lack nothing (`lacking`).

    Lengths are in bohr, energies in hartree. The geometry is as the output has it: neither moved nor
    turned.
    """
    hessian = calculation.hessian_hartree_bohr2
    energy = calculation.energy_hartree
    model: dict[str, Any] = {"method": calculation.method}
    if calculation.basis is not None:
        model["basis"] = calculation.basis
    provenance = {"creator": calculation.program, "routine": f"thermo_pp {__version__}"}
    if calculation.program_version is not None:
        provenance["version"] = calculation.program_version
    return json_text(
        {
            "schema_name": "qcschema_output",
            "schema_version": 1,
            "molecule": {
                "schema_name": "qcschema_molecule",
                "schema_version": 2,
                "symbols": [SYMBOLS[int(z)] for z in calculation.numbers],
                "geometry": np.ravel(calculation.positions_angstrom / BOHR_ANGSTROM),
                "masses": calculation.masses_u,
                "molecular_charge": calculation.charge,
                "molecular_multiplicity": calculation.multiplicity,
                "fix_com": True,
                "fix_orientation": True,
                "provenance": {
                    "creator": "thermo_pp",
                    "version": __version__,
                    "routine": "qcschema",
                },
            },
            "driver": "energy" if hessian is None else "hessian",
            "model": model,
            "keywords": {},
            "properties": {"return_energy": energy},
            "return_result": energy if hessian is None else np.ravel(hessian),
            "success": True,
            "provenance": provenance,
            "extras": {"source": calculation.path, "sha256": calculation.sha256},
        }
    )
