"""Torsions of a structure: which mode each stands for, and what is checked before it may."""

from __future__ import annotations

import dataclasses
import math
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import product
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding, StudyError
from thermo_pp.formulas.torsion import HinderedRotor
from thermo_pp.formulas.turning import dihedral, same_structure, top_of, turn, turned
from thermo_pp.records import Calculation
from thermo_pp.species.modes import SortedModes
from thermo_pp.species.potentials import (
    ELSEWHERE_J_MOL,
    TorsionChoice,
    check_fold,
    check_scan,
    fitted,
    torsion_note,
)
from thermo_pp.species.torsion_modes import Top, mode_findings, modes_of

FloatArray = NDArray[np.float64]

FOLDS = (6, 5, 4, 3, 2)
"""Symmetry numbers of a torsion that are looked for."""
_LIKE_WELL_DEG = 10.0
_MOST_TURNS = 400


@dataclass(frozen=True, eq=False)
class Torsion:
    """A torsion as it enters H, S and G.

    Attributes
    ----------
    choice : TorsionChoice
        What was asked; another isotopologue is settled from it again.
    rotor : HinderedRotor
    mode : int
        From 0: the mode it stands for.
    overlap : float or None
        Share of that mode's motion that is this torsion (or the torsions together); None where the
        output has no displacements.
    holds_both_hands : bool
        The circle, with those of the other torsions, holds the mirror image of a chiral structure.
    """

    choice: TorsionChoice
    rotor: HinderedRotor
    mode: int
    overlap: float | None
    holds_both_hands: bool

    @property
    def words(self) -> str:
        """How it was computed."""
        rotor = self.rotor
        barrier = rotor.barrier_j_mol / 1000.0
        words = (
            f"hindered rotor in place of mode {self.mode + 1}, I {rotor.moment_u_a2:.3f} u Å², highest "
            f"barrier {barrier:.2f} kJ/mol, symmetry number {rotor.symmetry_number}"
        )
        return words + (", both hands" if self.holds_both_hands else "")


class SettledTorsions(NamedTuple):
    """Torsions of a structure, its modes without those replaced, and the findings."""

    torsions: tuple[Torsion, ...]
    modes: SortedModes
    findings: tuple[Finding, ...]


def settle_torsions(
    choices: Sequence[TorsionChoice],
    calculation: Calculation,
    masses_u: FloatArray,
    modes: SortedModes,
    chiral: bool,
    *,
    name: str,
) -> SettledTorsions:
    """Check the torsions of a structure and find the modes that they stand for.

    Parameters
    ----------
    choices : sequence of TorsionChoice
    calculation : Calculation
    masses_u : shape (n,)
    modes : SortedModes
        Without torsions.
    chiral : bool
        Whether the structure is not superposable on its mirror image.
    name : str

    Raises
    ------
    StudyError
        Atoms that are no torsion, a scan that does not close or does not cover its period, a wrong
        symmetry number, a structure that is not at the scan's minimum, a mode that is not clear.
    """
    if not choices:
        return SettledTorsions((), modes, ())
    notes: list[Finding] = []
    own = [_one(choice, calculation, masses_u, notes, name) for choice in choices]
    like, both = _joint(own, calculation, masses_u, chiral)
    _check_joint(own, like, calculation, notes, name)
    places, overlaps = modes_of(own, calculation, masses_u, modes, name)
    replaced = modes.replaced.copy()
    found = []
    for number, (one, place, overlap) in enumerate(
        zip(own, places, overlaps, strict=True), start=1
    ):
        replaced[place] = number
        found.append(Torsion(one.choice, one.rotor, place, overlap, chiral and both))
        notes += mode_findings(one, modes, place, overlap, calculation, name)
    if len(own) > 1:
        what = f"{name}: {len(own)} torsions are treated as independent of each other"
        mend = "a set of conformers, where turning one changes the potential of another"
        notes.append(torsion_note("torsions-separable", "note", calculation, what, mend))
    return SettledTorsions(
        tuple(found), dataclasses.replace(modes, replaced=replaced), tuple(notes)
    )


def _one(
    choice: TorsionChoice,
    calculation: Calculation,
    masses_u: FloatArray,
    notes: list[Finding],
    name: str,
) -> Top:
    """Check one torsion for itself."""
    x, numbers = calculation.positions_angstrom, calculation.numbers
    label = f"torsion {'-'.join(str(atom + 1) for atom in choice.atoms)}"
    axis = (choice.atoms[1], choice.atoms[2])
    try:
        top = top_of(numbers, x, choice.atoms)
        angle = dihedral(x, choice.atoms)
        motion = turn(masses_u, x, top, axis)
    except ValueError as error:
        raise StudyError(
            f"{name}, {label}: {error}",
            where=choice.where,
            mend="name four atoms, each bonded to the next, whose middle bond is in no ring",
        ) from None
    sigma = choice.symmetry_number or _fold(calculation, masses_u, top, choice.atoms)
    # isotopes leave the potential as it is
    elements = calculation.numbers.astype(np.float64)
    fold = choice.symmetry_number or _fold(calculation, elements, top, choice.atoms)
    if choice.series is not None:
        potential = choice.series
        check_fold(potential, fold, label, choice.where)
    else:
        assert choice.scan is not None
        potential = fitted(choice, choice.scan, fold, calculation, notes, f"{name}, {label}")
        check_scan(
            choice, choice.scan, top, motion, calculation, masses_u, notes, f"{name}, {label}"
        )
    above = float(potential.at(angle)) - potential.lowest_j_mol()
    if above > ELSEWHERE_J_MOL:
        angles, values = potential.minima()
        best = (float(angles[int(values.argmin())]) + 180.0) % 360.0 - 180.0
        raise StudyError(
            f"{name}, {label}: the structure stands at {angle:.1f} degrees, where the potential is "
            f"{above / 1000.0:.2f} kJ/mol above its minimum at {best:.1f} degrees",
            where=choice.where,
            mend="take the structure of the lowest minimum of the torsion (frequencies and energy of "
            "that conformer), or check the order of the atoms",
        )
    moment = choice.moment_u_a2 or motion.moment_u_a2
    return Top(choice, top, axis, angle, motion, HinderedRotor(potential, moment, sigma), label)


def _fold(
    calculation: Calculation, masses_u: FloatArray, top: NDArray[np.bool_], atoms: Sequence[int]
) -> int:
    """Return the symmetry number of a torsion: into how many turns the circle can be divided."""
    x, axis = calculation.positions_angstrom, (atoms[1], atoms[2])
    for fold in FOLDS:
        if _same(calculation, masses_u, turned(x, top, axis, 360.0 / fold), [atoms]):
            return fold
    return 1


def _same(
    calculation: Calculation,
    masses_u: FloatArray,
    x: FloatArray,
    chains: Sequence[Sequence[int]],
    mirror: bool = False,
) -> bool:
    return same_structure(
        calculation.numbers, masses_u, x, calculation.positions_angstrom, chains, mirror
    )


def _joint(
    own: Sequence[Top], calculation: Calculation, masses_u: FloatArray, chiral: bool
) -> tuple[int | None, bool]:
    """Count how often turning all torsions from well to well makes the structure, or its image.

    Returns
    -------
    like : int or None
        None where there are too many wells to count.
    both : bool
        The mirror image was met.
    """
    wells = [_wells(one) for one in own]
    if math.prod(map(len, wells)) > _MOST_TURNS:
        wells = [[k * 360.0 / one.rotor.symmetry_number for k in range(one.rotor.symmetry_number)]
                 for one in own]  # fmt: skip
        if math.prod(map(len, wells)) > _MOST_TURNS:
            return None, False
    like, both, chains = 0, False, [one.choice.atoms for one in own]
    for turns in product(*wells):
        x = calculation.positions_angstrom
        for one, angle in zip(own, turns, strict=True):
            x = turned(x, one.top, one.axis, angle)
        like += _same(calculation, masses_u, x, chains)
        both = both or (chiral and _same(calculation, masses_u, x, chains, mirror=True))
    return like, both


def _wells(one: Top) -> list[float]:
    """Return the turns that lead from the structure to every well as deep as its own, degrees."""
    fold = one.rotor.symmetry_number
    kept = [k * 360.0 / fold for k in range(fold)]
    angles, values = one.rotor.potential.minima()
    deep = angles[values - one.rotor.potential.lowest_j_mol() <= ELSEWHERE_J_MOL]
    for angle in (deep - one.angle_deg).tolist():
        if all(abs((angle - other + 180.0) % 360.0 - 180.0) > _LIKE_WELL_DEG for other in kept):
            kept.append(angle)
    return kept


def _check_joint(
    own: Sequence[Top],
    like: int | None,
    calculation: Calculation,
    notes: list[Finding],
    name: str,
) -> None:
    """Set the symmetry numbers against how often the structure is met on the way round."""
    counted = math.prod(one.rotor.symmetry_number for one in own)
    if like == counted:
        return
    if like is None:
        what = (
            f"{name}: its torsions have too many wells together to see how often they meet the structure "
            f"or its mirror image; symmetry numbers count {counted}, no second hand lies within them"
        )
        mend = "compare with fewer torsions at a time; declare symmetry_number where they depend on each other"
        notes.append(torsion_note("torsion-symmetry", "warning", calculation, what, mend))
        return
    which = own[0].label if len(own) == 1 else "its torsions together"
    what = (
        f"{name}: turning {which} from well to well meets the structure {like} times, the symmetry "
        f"number{'' if len(own) == 1 else 's'} count{'s' if len(own) == 1 else ''} {counted}"
    )
    if any(one.choice.symmetry_number is None for one in own):
        raise StudyError(
            what,
            where=own[0].choice.where,
            mend=f"declare the symmetry_number of every torsion, their product {like}, or count the rest "
            "in the external symmetry_number",
        )
    mend = "nothing, where the external symmetry_number counts the rest; else mend them"
    notes.append(torsion_note("torsion-symmetry", "warning", calculation, what, mend))
