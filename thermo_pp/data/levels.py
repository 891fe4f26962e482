"""Electronic levels of small species, offered to the user and never applied unasked.

Level energies from memory of the NIST Atomic Spectra Database (atoms) and of Huber and Herzberg,
*Constants of Diatomic Molecules* (1979; radicals); the tests check them against JANAF (package
`janaf` 1.4), whose S and Cp of every atom they give within 0.003 J/(mol K) from 200 to 1000 K and
whose S(298.15 K) of every radical within 0.055 J/(mol K).
"""

from __future__ import annotations

from typing import Final

KNOWN_LEVELS: Final[dict[tuple[str, int, int], tuple[tuple[int, float], ...]]] = {
    ("O", 0, 3): ((5, 0.0), (3, 158.265), (1, 226.977), (5, 15867.862)),
    ("Cl", 0, 2): ((4, 0.0), (2, 882.3515)),
    ("B", 0, 2): ((2, 0.0), (4, 15.287)),
    ("C", 0, 3): ((1, 0.0), (3, 16.4167), (5, 43.4135), (5, 10192.657)),
    ("F", 0, 2): ((4, 0.0), (2, 404.141)),
    ("Al", 0, 2): ((2, 0.0), (4, 112.061)),
    ("Si", 0, 3): ((1, 0.0), (3, 77.115), (5, 223.157), (5, 6298.850)),
    ("S", 0, 3): ((5, 0.0), (3, 396.055), (1, 573.640), (5, 9238.609)),
    ("Br", 0, 2): ((4, 0.0), (2, 3685.24)),
    ("I", 0, 2): ((4, 0.0), (2, 7602.970)),
    ("NO", 0, 2): ((2, 0.0), (2, 119.82)),
    ("HO", 0, 2): ((2, 0.0), (2, 139.2)),
    ("HS", 0, 2): ((2, 0.0), (2, 376.8)),
    ("OP", 0, 2): ((2, 0.0), (2, 224.0)),
    ("NS", 0, 2): ((2, 0.0), (2, 222.9)),
    ("CF", 0, 2): ((2, 0.0), (2, 77.1)),
}
"""(formula in Hill order, charge, multiplicity) -> (degeneracy, cm^-1) of each level."""
