"""Electronic levels of small species, offered to the user and never applied unasked.

Level energies from memory of the NIST Atomic Spectra Database (O, Cl) and of Huber and Herzberg,
*Constants of Diatomic Molecules* (1979; NO, OH); checked against JANAF (package `janaf` 1.4): with
them S(298.15 K) of O, Cl, NO and OH is 161.059, 165.191, 210.748 and 183.658 J/(mol K), JANAF's
161.058, 165.189, 210.758 and 183.708.
"""

from __future__ import annotations

from typing import Final

KNOWN_LEVELS: Final[dict[tuple[str, int, int], tuple[tuple[int, float], ...]]] = {
    ("O", 0, 3): ((5, 0.0), (3, 158.265), (1, 226.977), (5, 15867.862)),
    ("Cl", 0, 2): ((4, 0.0), (2, 882.3515)),
    ("NO", 0, 2): ((2, 0.0), (2, 119.82)),
    ("HO", 0, 2): ((2, 0.0), (2, 139.2)),
}
"""(formula in Hill order, charge, multiplicity) -> (degeneracy, cm^-1) of each level."""
