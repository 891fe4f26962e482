"""Species: what stands in a mechanism, computed from outputs or declared, and its H, S and G.

From left to right: ``ideal_gas`` has the numbers; ``masses``, ``modes``, ``energy`` and
``electronic`` settle one structure, ``seam`` a crossing point, ``potentials``, ``torsion_modes``, ``torsions`` and
``torsion_keys`` its hindered rotors; ``result`` is what is handed on, ``rows`` its tables;
``structure``, ``declared`` and ``direct`` are the ways in, ``many`` the one for thousands of
structures at once.
"""

from thermo_pp.species.anchored import Anchored
from thermo_pp.species.declared import Declared, parse_composition
from thermo_pp.species.direct import (
    choice,
    parse_imaginary,
    solution_finding,
    thermochemistry,
)
from thermo_pp.species.electronic import parse_levels
from thermo_pp.species.energy import ElectronicEnergy, EnergyPart
from thermo_pp.species.result import (
    SaddleMember,
    SpeciesModel,
    Thermochemistry,
    low_mode_spread_kj_mol,
)
from thermo_pp.species.seam import Seam, SeamPart
from thermo_pp.species.structure import Structure
from thermo_pp.species.torsion_keys import parse_torsions

__all__ = [
    "Anchored",
    "Declared",
    "ElectronicEnergy",
    "EnergyPart",
    "SaddleMember",
    "Seam",
    "SeamPart",
    "SpeciesModel",
    "Structure",
    "Thermochemistry",
    "choice",
    "low_mode_spread_kj_mol",
    "parse_composition",
    "parse_imaginary",
    "parse_levels",
    "parse_torsions",
    "solution_finding",
    "thermochemistry",
]
