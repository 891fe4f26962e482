"""Enthalpies of formation of gaseous atoms at 0 K, and H(298.15 K) - H(0) of the elements.

H, C, N, O, F, Cl, Br and I: Active Thermochemical Tables, version 1.112, as tabulated in the package
chemicals 1.5.2 (`ATcT 1.112 (g).tsv`), with its uncertainties (95 %). The other atoms: JANAF tables
(Chase 1998), from the package janaf 1.4; their uncertainties are from memory of the printed JANAF and
CODATA tables and are taken as 95 % too. Elements: JANAF, H - H(Tr) at 0 K of the reference state.
The inert gases are their own reference states.
Levels of the ground term: those of `data.levels`; a test compares the H(298.15 K) - H(0) that they give
with JANAF's.
"""

from __future__ import annotations

from typing import Final, NamedTuple

from thermo_pp.data.levels import KNOWN_LEVELS


class Atom(NamedTuple):
    """One element.

    Attributes
    ----------
    formation_kj_mol : float
        Enthalpy of formation of the atom at 0 K.
    uncertainty_kj_mol : float
        95 %, about two standard uncertainties.
    element_kj_mol : float
        H(298.15 K) - H(0) of one atom's share of the reference state.
    levels : tuple of (int, float)
        Degeneracy and cm^-1 of the levels of the ground term.
    source : str
    """

    formation_kj_mol: float
    uncertainty_kj_mol: float
    element_kj_mol: float
    levels: tuple[tuple[int, float], ...]
    source: str

    @property
    def spin_orbit_cm(self) -> float:
        """How far the lowest level lies below the mean of its term, cm^-1, weighted by degeneracy."""
        weight = sum(degeneracy for degeneracy, _ in self.levels)
        return sum(degeneracy * energy for degeneracy, energy in self.levels) / weight


_ATCT: Final = "ATcT 1.112"
_JANAF: Final = "JANAF 1998"

ATOMS: Final[dict[str, Atom]] = {
    "H": Atom(216.034, 0.0, 8.467 / 2, ((2, 0.0),), _ATCT),
    "He": Atom(0.0, 0.0, 6.197, ((1, 0.0),), _ATCT),
    "Li": Atom(157.725, 1.0, 4.622, ((2, 0.0),), _JANAF),
    "Be": Atom(319.735, 5.0, 1.932, ((1, 0.0),), _JANAF),
    "B": Atom(554.898, 12.0, 1.214, KNOWN_LEVELS["B", 0, 2][:2], _JANAF),
    "C": Atom(711.388, 0.057, 1.051, KNOWN_LEVELS["C", 0, 3][:3], _ATCT),
    "N": Atom(470.573, 0.024, 8.670 / 2, ((4, 0.0),), _ATCT),
    "O": Atom(246.844, 0.002, 8.683 / 2, KNOWN_LEVELS["O", 0, 3][:3], _ATCT),
    "F": Atom(77.268, 0.057, 8.825 / 2, KNOWN_LEVELS["F", 0, 2][:2], _ATCT),
    "Ne": Atom(0.0, 0.0, 6.197, ((1, 0.0),), _ATCT),
    "Na": Atom(107.549, 0.7, 6.447, ((2, 0.0),), _JANAF),
    "Mg": Atom(145.901, 0.8, 4.998, ((1, 0.0),), _JANAF),
    "Al": Atom(327.320, 4.2, 4.539, KNOWN_LEVELS["Al", 0, 2][:2], _JANAF),
    "Si": Atom(445.668, 8.0, 3.218, KNOWN_LEVELS["Si", 0, 3][:3], _JANAF),
    "P": Atom(315.553, 1.0, 5.360, ((4, 0.0),), _JANAF),
    "S": Atom(274.735, 0.25, 4.412, KNOWN_LEVELS["S", 0, 3][:3], _JANAF),
    "Cl": Atom(119.621, 0.002, 9.181 / 2, KNOWN_LEVELS["Cl", 0, 2][:2], _ATCT),
    "Ar": Atom(0.0, 0.0, 6.197, ((1, 0.0),), _ATCT),
    "K": Atom(89.885, 0.4, 7.082, ((2, 0.0),), _JANAF),
    "Ca": Atom(177.339, 0.8, 5.736, ((1, 0.0),), _JANAF),
    "Br": Atom(117.914, 0.056, 24.509 / 2, KNOWN_LEVELS["Br", 0, 2][:2], _ATCT),
    "Kr": Atom(0.0, 0.0, 6.197, ((1, 0.0),), _ATCT),
    "I": Atom(107.157, 0.002, 13.198 / 2, KNOWN_LEVELS["I", 0, 2][:2], _ATCT),
    "Xe": Atom(0.0, 0.0, 6.197, ((1, 0.0),), _ATCT),
}
"""By element symbol."""
