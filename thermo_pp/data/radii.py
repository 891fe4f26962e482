"""Covalent radii, for telling which atoms are bonded.

B. Cordero and others, "Covalent radii revisited", Dalton Trans. 2008, 2832, doi 10.1039/B801115J, as tabulated in ASE
3.29 (`ase.data.covalent_radii`): carbon as sp3, manganese, iron and cobalt in low spin.
"""

from __future__ import annotations

from typing import Final

COVALENT_ANGSTROM: Final[tuple[float, ...]] = (
    0.0,  # no element 0
    0.31, 0.28, 1.28, 0.96, 0.84, 0.76, 0.71, 0.66, 0.57, 0.58, 1.66, 1.41, 1.21, 1.11, 1.07,
    1.05, 1.02, 1.06, 2.03, 1.76, 1.7, 1.6, 1.53, 1.39, 1.39, 1.32, 1.26, 1.24, 1.32, 1.22, 1.22,
    1.2, 1.19, 1.2, 1.2, 1.16, 2.2, 1.95, 1.9, 1.75, 1.64, 1.54, 1.47, 1.46, 1.42, 1.39, 1.45,
    1.44, 1.42, 1.39, 1.39, 1.38, 1.39, 1.4, 2.44, 2.15, 2.07, 2.04, 2.03, 2.01, 1.99, 1.98, 1.98,
    1.96, 1.94, 1.92, 1.92, 1.89, 1.9, 1.87, 1.87, 1.75, 1.7, 1.62, 1.51, 1.44, 1.41, 1.36, 1.36,
    1.32, 1.45, 1.46, 1.48, 1.4, 1.5, 1.5, 2.6, 2.21, 2.15, 2.06, 2, 1.96, 1.9, 1.87, 1.8, 1.69,
)  # fmt: skip
"""Radius, A, by atomic number, hydrogen to curium."""

FARTHEST_ANGSTROM: Final = 2.0
"""Taken for heavier elements, which the source leaves out."""
