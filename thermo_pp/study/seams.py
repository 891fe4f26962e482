"""Seams of crossing points: the other spin state, its gradient and Hessian, each checked."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import StudyError
from thermo_pp.formulas.seam import (
    CrossingCoordinate,
    crossing_coordinate,
    seam_hessian,
    share_of_other,
)
from thermo_pp.formulas.superposition import superpose
from thermo_pp.pairing import SAME_GEOMETRY_ANGSTROM
from thermo_pp.records import Calculation
from thermo_pp.species import Seam, SeamPart
from thermo_pp.study.keys import Quantity, SeamKeys
from thermo_pp.study.outputs import Outputs
from thermo_pp.study.seam_findings import (
    State,
    modes_along,
    one_hessian,
    overall_motion,
    turns_along,
    where_it_lies,
)
from thermo_pp.study.values import given
from thermo_pp.units import HARTREE_KJ_MOL, quantity

FloatArray = NDArray[np.float64]

_GRADIENT, _DIFFERENCE = "gradient of {} state", "gradient difference, own state less other"
_SHARE = "share of the other state's Hessian"
_UNIT = "hartree/bohr"
_NOT_TURNED = 1e-6
MOST_OVERALL = 0.1
"""Beyond this the gradients are not those of this structure in this orientation."""


def make_seam(
    keys: SeamKeys,
    job: Calculation,
    multiplicity: int | None,
    outputs: Outputs,
    *,
    name: str,
    where: str,
) -> tuple[Seam, tuple[Calculation, ...]]:
    """Turn ``seam`` of a crossing point into a Seam, and return the outputs that it names.

    Parameters
    ----------
    keys : SeamKeys
    job : Calculation
        The crossing point's own frequency job.
    multiplicity : int or None
        Declared for the crossing point's own state.
    outputs : Outputs
    name, where : str
        Of the species; file and key, for messages.

    Raises
    ------
    StudyError
        Neither or both of `other` and `gradient_difference`, no Hessian or no gradient, another
        molecule or geometry, the same spin without a word about it, gradients that are equal or those of
        another orientation.
    """
    named, difference = given(keys.other), given(keys.gradient_difference)
    if (named is None) == (difference is None):
        raise StudyError(
            f"{name}: both other and gradient_difference"
            if named is not None
            else f"{name}: a seam without the other state",
            where=where,
            mend='name the output of the other state (other = "triplet.out"), or, where there is none, '
            "give gradient_difference",
        )
    if job.hessian_hartree_bohr2 is None:
        raise StudyError(
            f"{name}: {job.path} holds no Hessian, from which the modes along the seam could follow",
            where=where,
            mend="name an output with a Hessian, or one whose modes are those along the seam",
        )
    if named is None:
        return _declared(keys, job, name, where), ()
    other = outputs.calculation(named, f"{where}.other")
    spins = _spins(keys, job, other, multiplicity, name, where)
    one, two, read = _states(keys, job, other, spins, outputs, name, where)
    apart = one.slope - two.slope
    across = _across(apart, job, name, where)
    share = share_of_other(one.slope, two.slope)
    gap = None
    if job.energy_hartree is not None and other.energy_hartree is not None:
        gap = (job.energy_hartree - other.energy_hartree) * HARTREE_KJ_MOL
    notes = overall_motion(across, job, name)
    hessian, used = job.hessian_hartree_bohr2, None
    parts = (*one.parts, *two.parts)
    if two.hessian is None:
        notes.append(one_hessian(job, name, f"{two.label} holds no Hessian"))
    else:
        hessian, used = seam_hessian(hessian, two.hessian, share), share
        line = other.where.get("hessian_hartree_bohr2")
        parts = (*parts, SeamPart(_SHARE, share, "", "derived", other.path, line))
    level = (1.0 - share) * one.slope + share * two.slope if used is not None else one.slope
    notes += turns_along(hessian, level, across, job, name)
    notes += where_it_lies(one, two, share, gap, job, name)
    words = f"gradients of {one.label} less {two.label}"
    notes.append(modes_along(job, across, used, name, words))
    files = tuple(dict.fromkeys(calc.path for calc in (other, *read)))
    seam = Seam(apart, hessian, used, gap, parts, files, tuple(notes))
    return seam, (other, *read)


def _declared(keys: SeamKeys, job: Calculation, name: str, where: str) -> Seam:
    """Return the seam of a declared difference of the gradients; the Hessian is the one state's."""
    if given(keys.gradients) is not None or given(keys.multiplicity) is not None:
        raise StudyError(
            f"{name}: gradients and multiplicity are those of an output that is not named",
            where=where,
            mend='name the output of the other state: other = "triplet.out"',
        )
    at = f"{where}.gradient_difference"
    apart = _vectors(given(keys.gradient_difference) or (), job, at)
    across = _across(apart, job, name, at)
    unknown = "the other state's Hessian is not known, nor whether both states have one energy here"
    notes = (
        one_hessian(job, name, unknown),
        *overall_motion(across, job, name),
        modes_along(job, across, None, name, "the difference of the gradients is declared"),
    )
    parts = (SeamPart(_DIFFERENCE, apart, _UNIT, "declared", None, None),)
    assert job.hessian_hartree_bohr2 is not None
    return Seam(apart, job.hessian_hartree_bohr2, None, None, parts, (), notes)


def _spins(
    keys: SeamKeys,
    job: Calculation,
    other: Calculation,
    multiplicity: int | None,
    name: str,
    where: str,
) -> tuple[int | None, int | None]:
    """Return the multiplicities of both states; StudyError where they are the same unsaid."""
    said = given(keys.multiplicity)
    one = job.multiplicity if multiplicity is None else multiplicity
    two = other.multiplicity if said is None else said
    if said is not None and other.multiplicity not in (None, said):
        raise StudyError(
            f"{other.path} has multiplicity {other.multiplicity}, not {said}",
            where=f"{where}.multiplicity",
            mend="take the key out, or name the output of the other state",
        )
    if two is None:
        raise StudyError(
            f"{name}: {other.path} does not say its multiplicity",
            where=where,
            mend="declare it: seam = { other = ..., multiplicity = 3 }",
        )
    if one == two and said is None:
        raise StudyError(
            f"{name}: both states, {job.path} and {other.path}, have multiplicity {one}",
            where=f"{where}.other",
            mend="name the output of the other spin state; where two states of one spin are meant, "
            f"write multiplicity = {one} beside it",
        )
    return one, two


def _states(
    keys: SeamKeys,
    job: Calculation,
    other: Calculation,
    spins: tuple[int | None, int | None],
    outputs: Outputs,
    name: str,
    where: str,
) -> tuple[State, State, tuple[Calculation, ...]]:
    """Return both states in the orientation of the job, and the outputs read for their gradients."""
    rotations = np.eye(3), _rotation(other, job, spins[1], f"{where}.other")
    said: Sequence[str | list[tuple[Quantity, Quantity, Quantity]] | None]
    said = given(keys.gradients) or (None, None)
    states, read = [], []
    for calc, rotation, spin, gradient, number in zip(
        (job, other), rotations, spins, said, (1, 2), strict=True
    ):
        at, whose = f"{where}.gradients.{number}", ("its own", "the other")[number - 1]
        if isinstance(gradient, str):
            source = outputs.calculation(gradient, at)
            read.append(source)
            part = _gradient(source, _rotation(source, job, spin, at), whose, at)
        elif gradient is not None:
            declared = _vectors(gradient, job, at)
            part = SeamPart(_GRADIENT.format(whose), declared, _UNIT, "declared", None, None)
        else:
            part = _gradient(calc, rotation, whose, where)
        hessian, energy = calc.hessian_hartree_bohr2, calc.energy_hartree
        turn = np.kron(np.eye(len(job.numbers)), rotation)
        states.append(
            State(
                calc.path,
                part,
                np.asarray(part.value),
                None if hessian is None else turn @ hessian @ turn.T,
                None
                if energy is None
                else SeamPart(
                    f"electronic energy of {whose} state",
                    energy,
                    "hartree",
                    "printed",
                    calc.path,
                    calc.where.get("energy_hartree"),
                ),
            )
        )
    return states[0], states[1], tuple(read)


def _gradient(calc: Calculation, rotation: FloatArray, whose: str, where: str) -> SeamPart:
    """Return the gradient of an output, turned."""
    if calc.gradient_hartree_bohr is None:
        raise StudyError(
            f"no gradient is read from {calc.path}",
            where=where,
            mend='give both: gradients = ["one.xyz", "other.xyz"], extended XYZ with forces, QCSchema or '
            "gradient tasks of NWChem, or three numbers an atom",
        )
    line = calc.where.get("gradient_hartree_bohr")
    turned = bool(np.abs(rotation - np.eye(3)).max() > _NOT_TURNED)
    return SeamPart(
        _GRADIENT.format(whose),
        calc.gradient_hartree_bohr @ rotation.T,
        _UNIT,
        "derived" if turned else "printed",
        calc.path,
        line,
    )


def _rotation(
    calc: Calculation, job: Calculation, multiplicity: int | None, where: str
) -> FloatArray:
    """Return the rotation that lays an output on the job; StudyError where it is another molecule."""
    if not np.array_equal(calc.numbers, job.numbers):
        raise StudyError(
            f"{calc.path} has not the atoms of {job.path} in their order",
            where=where,
            mend="compute both states of one molecule, with the atoms in one order",
        )
    for field, here in (("charge", job.charge), ("multiplicity", multiplicity)):
        value = getattr(calc, field)
        if None not in (value, here) and value != here:
            raise StudyError(
                f"{calc.path} has {field} {value}, expected {here}",
                where=where,
                mend="name the outputs of the same two states, those of `frequencies` first",
            )
    laid = superpose(calc.positions_angstrom, job.positions_angstrom)
    if not laid.rmsd_angstrom <= SAME_GEOMETRY_ANGSTROM:
        raise StudyError(
            f"{calc.path} and {job.path} have different geometries: {laid.rmsd_angstrom:.4f} A apart "
            f"(root mean square), more than {SAME_GEOMETRY_ANGSTROM} A",
            where=where,
            mend="compute both states at the crossing point",
        )
    return laid.rotation


def _vectors(
    rows: Sequence[tuple[Quantity, Quantity, Quantity]], job: Calculation, where: str
) -> FloatArray:
    """Return declared vectors, one an atom, in hartree/bohr."""
    if len(rows) != len(job.numbers):
        raise StudyError(
            f"{len(rows)} vectors for {len(job.numbers)} atoms",
            where=where,
            mend="give three numbers an atom, in the order of `frequencies`",
        )
    return np.array(
        [[quantity(value, "hartree/bohr", where=where) for value in row] for row in rows]
    )


def _across(difference: FloatArray, job: Calculation, name: str, where: str) -> CrossingCoordinate:
    """Return the motion across the seam; StudyError where there is none, or one of the whole structure."""
    if not np.any(difference):
        raise StudyError(
            f"{name}: the gradients of both states are the same, so no motion leads across the seam",
            where=where,
            mend="name the outputs of two states",
        )
    across = crossing_coordinate(difference, job.masses_u, job.positions_angstrom)
    if across.overall > MOST_OVERALL:
        raise StudyError(
            f"{name}: {across.overall:.0%} of the difference of the gradients moves or turns the whole "
            "structure",
            where=where,
            mend="give gradients of this geometry, atoms and axes as in `frequencies`",
        )
    return across
