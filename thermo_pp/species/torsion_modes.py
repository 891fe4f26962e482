"""Torsion modes: which normal mode each torsion of a structure stands for."""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding, StudyError
from thermo_pp.formulas.normal_modes import normal_modes
from thermo_pp.formulas.torsion import HinderedRotor
from thermo_pp.formulas.turning import Turn, turn
from thermo_pp.records import Calculation
from thermo_pp.species.modes import SortedModes
from thermo_pp.species.potentials import TorsionChoice, torsion_note

FloatArray = NDArray[np.float64]

LEAST_OVERLAP = 0.6
"""A mode may be replaced without its being named where this share of it is the torsion."""
MODE_WITHIN_CM = 2.0
"""A mode named by its wavenumber is the one as near as this."""
CURVATURE_RATIO = 1.5
"""Small swings in the potential and the mode they stand for may differ by this factor."""


class Top(NamedTuple):
    """A torsion that was checked for itself.

    Attributes
    ----------
    choice : TorsionChoice
    top : shape (n,), bool
        The atoms that turn.
    axis : (int, int)
    angle_deg : float
        Where the structure stands.
    turn : Turn
    rotor : HinderedRotor
    label : str
        For messages.
    """

    choice: TorsionChoice
    top: NDArray[np.bool_]
    axis: tuple[int, int]
    angle_deg: float
    turn: Turn
    rotor: HinderedRotor
    label: str


def modes_of(
    own: Sequence[Top],
    calculation: Calculation,
    masses_u: FloatArray,
    modes: SortedModes,
    name: str,
) -> tuple[list[int], list[float | None]]:
    """Return the mode of each torsion and its overlap: the named ones, the rest by overlap.

    Raises
    ------
    StudyError
        No such mode, no displacements to find one by, none that is clearly the torsion, one taken twice.
    """
    from scipy.optimize import linear_sum_assignment

    shares, joint = _overlaps(own, calculation, masses_u)
    count = len(modes.wavenumbers_cm)
    places = [_named(one, modes, name) for one in own]
    open_ = [k for k, mode in enumerate(places) if mode is None]
    if open_ and joint is None:
        raise StudyError(
            f"{name}, {own[open_[0]].label}: the output has no displacements of the modes",
            where=own[open_[0]].choice.where,
            mend='name the mode that it stands for by number or wavenumber: mode = 1, mode = "210 cm^-1"',
        )
    if open_:
        assert joint is not None
        assert shares is not None
        free = np.where(
            np.isin(np.arange(count), [k for k in places if k is not None]), -1.0, joint
        )
        best = np.argsort(-free, kind="stable")[: len(open_)]
        for column in best:
            if free[column] < LEAST_OVERLAP:
                raise _unclear([own[k] for k in open_], modes, joint, name)
        rows, columns = linear_sum_assignment(-shares[open_][:, best])
        for row, column in zip(rows.tolist(), columns.tolist(), strict=True):
            places[open_[row]] = int(best[column])
    settled = [int(k) for k in places if k is not None]
    for one, mode in zip(own, settled, strict=True):
        if settled.count(mode) > 1 or modes.reaction_coordinate[mode]:
            again = settled.count(mode) > 1
            raise StudyError(
                f"{name}, {one.label}: mode {mode + 1} ({modes.wavenumbers_cm[mode]:.1f} cm^-1) "
                + ("stands for another torsion too" if again else "is the reaction coordinate"),
                where=one.choice.where,
                mend="name a mode for every torsion: mode = 1",
            )
    return settled, [None if joint is None else float(joint[k]) for k in settled]


def _named(one: Top, modes: SortedModes, name: str) -> int | None:
    """Return the mode that the user names, from 0; None where none is named."""
    mode, wanted, count = one.choice.mode, one.choice.mode_cm, len(modes.wavenumbers_cm)
    if mode is not None and not 0 <= mode < count:
        raise StudyError(
            f"{name}, {one.label}: there is no mode {mode + 1} among {count}",
            where=one.choice.where,
            mend="count the modes from 1 in the order of their wavenumbers, imaginary ones first",
        )
    if wanted is None:
        return mode
    near = np.flatnonzero(np.abs(modes.wavenumbers_cm - wanted) <= MODE_WITHIN_CM)
    if len(near) != 1:
        raise StudyError(
            f"{name}, {one.label}: {len(near) or 'no'} modes within {MODE_WITHIN_CM:g} cm^-1 of "
            f"{wanted:g} cm^-1",
            where=one.choice.where,
            mend="name the mode by its number, counted from 1: mode = 1",
        )
    return int(near[0])


def _overlaps(
    own: Sequence[Top], calculation: Calculation, masses_u: FloatArray
) -> tuple[FloatArray | None, FloatArray | None]:
    """Return the squared overlap of torsions and modes, (k, m), and of the torsions together, (m,)."""
    modes, m = calculation.modes, calculation.masses_u
    hessian = calculation.hessian_hartree_bohr2
    if hessian is not None and (modes is None or not np.array_equal(m, masses_u)):
        modes = normal_modes(hessian, masses_u, calculation.positions_angstrom).modes
        m = masses_u
    if modes is None:
        return None, None
    weighted = (modes * np.sqrt(m)[:, np.newaxis]).reshape(len(modes), -1)
    weighted = weighted / np.linalg.norm(weighted, axis=1, keepdims=True)
    x = calculation.positions_angstrom
    motions = np.array([turn(m, x, one.top, one.axis).motion for one in own])
    space = np.linalg.qr(motions.T)[0]
    return (motions @ weighted.T) ** 2, ((weighted @ space) ** 2).sum(axis=1)


def _unclear(open_: Sequence[Top], modes: SortedModes, joint: FloatArray, name: str) -> StudyError:
    best = np.argsort(-joint, kind="stable")[:3]
    listed = ", ".join(
        f"mode {k + 1} ({modes.wavenumbers_cm[k]:.1f} cm^-1): {joint[k]:.2f}" for k in best
    )
    return StudyError(
        f"{name}, {' and '.join(one.label for one in open_)}: no mode is the torsion by "
        f"{LEAST_OVERLAP:g} or more; its overlaps are {listed}",
        where=open_[0].choice.where,
        mend=f"name the mode that it stands for: mode = {best[0] + 1}",
    )


def mode_findings(
    one: Top,
    modes: SortedModes,
    mode: int,
    overlap: float | None,
    calculation: Calculation,
    name: str,
) -> list[Finding]:
    """Say which mode is replaced, and doubt what does not look like it."""
    own_cm = float(modes.wavenumbers_cm[mode])
    harmonic = one.rotor.harmonic_cm()
    known = "no displacements to compare" if overlap is None else f"overlap {overlap:.2f}"
    what = f"{name}: {one.label} in place of mode {mode + 1} ({own_cm:.1f} cm^-1; {known})"
    found = [
        torsion_note("torsion-treated", "note", calculation, what, "nothing, if this is meant")
    ]
    if overlap is not None and overlap < LEAST_OVERLAP:
        what = (
            f"{name}: mode {mode + 1}, named for {one.label}, is that torsion by {overlap:.2f} only"
        )
        mend = "look at the modes; the torsion may be spread over several"
        found.append(torsion_note("torsion-overlap", "warning", calculation, what, mend))
    if harmonic is not None and own_cm > 0.0:
        ratio = harmonic / own_cm
        if max(ratio, 1.0 / max(ratio, 1e-9)) > CURVATURE_RATIO:
            what = (
                f"{name}: the potential of {one.label} has small swings of {harmonic:.1f} cm^-1, mode "
                f"{mode + 1} is {own_cm:.1f} cm^-1"
            )
            mend = "check the unit of the energies, the reduced moment and the mode"
            found.append(torsion_note("torsion-curvature", "warning", calculation, what, mend))
    return found
