"""Modes: how many a structure must have, which of them is a reaction coordinate, which are real."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding, StudyError
from thermo_pp.formulas.normal_modes import normal_modes
from thermo_pp.formulas.rotor import LINEAR_ANGSTROM, distance_from_axis, rotor_kind
from thermo_pp.names import Kind, UsedAs
from thermo_pp.records import Calculation
from thermo_pp.species.ideal_gas import seal

FloatArray = NDArray[np.float64]

NOISE_CM = 100.0
"""Only smaller imaginary modes are called noise in a message."""


@dataclass(frozen=True, eq=False)
class SortedModes:
    """The modes of a structure, each with its part.

    Attributes
    ----------
    kind : {"minimum", "saddle"}
    wavenumbers_cm : shape (m,)
        All of them, ascending, imaginary ones negative.
    reaction_coordinate : shape (m,), bool
        The one mode of a saddle point that enters nothing; none where the modes are those along a
        seam.
    made_real : shape (m,), bool
        Imaginary modes taken as real.
    replaced : shape (m,), int
        Number of the torsion, from 1, that stands for the mode; 0 where none does.
    findings : tuple of Finding
    """

    kind: Kind
    wavenumbers_cm: FloatArray
    reaction_coordinate: NDArray[np.bool_]
    made_real: NDArray[np.bool_]
    replaced: NDArray[np.int64]
    findings: tuple[Finding, ...]

    def __post_init__(self) -> None:
        seal(self)

    @property
    def entered(self) -> NDArray[np.bool_]:
        """The modes that enter H, S and G as vibrations."""
        return np.asarray(~self.reaction_coordinate & (self.replaced == 0))

    @property
    def real_cm(self) -> FloatArray:
        """The wavenumbers that enter H, S and G, all above 0."""
        return np.abs(self.wavenumbers_cm[self.entered])

    @property
    def oscillators_cm(self) -> FloatArray:
        """The same with those that torsions replace: all but the reaction coordinate."""
        return np.abs(self.wavenumbers_cm[~self.reaction_coordinate])

    @property
    def imaginary_cm(self) -> float | None:
        """The wavenumber of the reaction coordinate, negative; None where no mode is one."""
        found = self.wavenumbers_cm[self.reaction_coordinate]
        return float(found[0]) if len(found) else None


def place(calculation: Calculation, key: str) -> str:
    """Return file and line of a field, the file alone where the line is not known."""
    line = calculation.where.get(key)
    return calculation.path if line is None else f"{calculation.path}:{line}"


def mode_count(masses_u: FloatArray, positions_angstrom: FloatArray) -> int:
    """Return how many modes a structure has: 3N-6, of a linear one 3N-5, of an atom none."""
    n = len(masses_u)
    return {"atom": 0, "linear": 3 * n - 5, "nonlinear": 3 * n - 6}[
        rotor_kind(masses_u, positions_angstrom)
    ]


def wavenumbers(
    calculation: Calculation, masses_u: FloatArray, used_as: UsedAs | None = None, *, name: str
) -> FloatArray:
    """Return all wavenumbers with the given masses, ascending, imaginary ones negative.

    Those of the output where the masses are the output's or there is no Hessian; the caller makes
    sure that this is what the user wants. Of a crossing point there may be one less: those along the
    seam.

    Raises
    ------
    StudyError
        No modes, or not 3N-6 (3N-5, 0) of them; modes along a seam that cannot follow other masses.
    """
    n, positions = len(calculation.numbers), calculation.positions_angstrom
    found = calculation.wavenumbers_cm
    hessian = calculation.hessian_hartree_bohr2
    expected = mode_count(masses_u, positions)
    allowed = (expected, expected - 1) if used_as == "crossing" and n > 1 else (expected,)
    along = found is not None and len(found) == expected - 1 and len(found) in allowed
    if hessian is not None and not (
        found is not None and np.array_equal(masses_u, calculation.masses_u)
    ):
        if along:
            raise StudyError(
                f"{name}: the output has the modes along the seam for its own masses only",
                where=place(calculation, "wavenumbers_cm"),
                mend="give the other state, from which they are worked out for any masses: "
                'seam = { other = "..." }; or leave the masses as they are',
            )
        found = normal_modes(hessian, masses_u, positions).wavenumbers_cm
    if found is None:
        if n == 1:
            return np.empty(0)
        raise StudyError(
            f"{name}: the output has no vibrational modes",
            where=calculation.path,
            mend="name the output of a frequency job; a single point can stand beside it as energy",
        )
    if len(found) not in allowed:
        raise _wrong_count(calculation, masses_u, len(found), allowed, name)
    if np.any(found == 0.0):
        raise StudyError(
            f"{name}: a mode of 0 cm^-1, which has no finite entropy",
            where=place(calculation, "wavenumbers_cm"),
            mend="optimise more tightly and run the frequency job again",
        )
    return np.sort(found)


def _wrong_count(
    calculation: Calculation,
    masses_u: FloatArray,
    count: int,
    allowed: tuple[int, ...],
    name: str,
) -> StudyError:
    """Return the error of another number of modes than a structure has."""
    n, positions = len(masses_u), calculation.positions_angstrom
    kind = rotor_kind(masses_u, positions)
    what = f"{name}: {count} modes where {_shape(kind, n)} has {allowed[0]}"
    if len(allowed) > 1:
        what += f", along the seam at a crossing point {allowed[1]}"
    mend = "use a frequency job of the whole molecule"
    if kind != "atom" and count == 6 * n - 11 - allowed[0]:
        width = distance_from_axis(masses_u, positions)
        what += f"; its atoms lie up to {width:.3f} Å from the axis"
        mend = (
            f"optimise it more tightly: below {LINEAR_ANGSTROM} Å it counts as linear, and "
            "modes and geometry must agree"
        )
    return StudyError(what, where=place(calculation, "wavenumbers_cm"), mend=mend)


def sort_modes(
    calculation: Calculation,
    wavenumbers_cm: FloatArray,
    used_as: UsedAs | None,
    real_below_cm: float | None,
    *,
    name: str,
) -> SortedModes:
    """Decide which imaginary mode is the reaction coordinate and which are taken as real.

    A minimum has no imaginary mode, a saddle point one: the largest. Any other stops the work,
    unless it is smaller than `real_below_cm`. Where `used_as` is None, one imaginary mode (not smaller
    than that) means a saddle point, with a note. At a crossing point the modes along the seam are one
    less, none of them imaginary; where all are there, the imaginary one is taken for the motion across
    the seam, with a finding.

    Raises
    ------
    StudyError
        Too many imaginary modes, or none at a saddle point; it names file, line and modes.
    """
    imaginary = wavenumbers_cm < 0.0
    sizes = np.abs(wavenumbers_cm)
    small = imaginary & (sizes < (real_below_cm or 0.0))
    findings: list[Finding] = []
    line = calculation.where.get("wavenumbers_cm")
    kind: Kind = "minimum" if used_as == "minimum" else "saddle"
    if used_as is None:
        large = wavenumbers_cm[imaginary & ~small]
        kind = "saddle" if len(large) == 1 else "minimum"
        if kind == "saddle":
            findings.append(
                Finding(
                    code="taken-as-saddle",
                    severity="note",
                    file=calculation.path,
                    line=line,
                    what=f"{name}: one imaginary mode ({_listed(large)} cm^-1), taken as a saddle "
                    "point",
                    mend='say kind="minimum" or kind="saddle"; a minimum must have none',
                )
            )
    coordinate = np.zeros_like(imaginary)
    along = used_as == "crossing" and len(wavenumbers_cm) < mode_count(
        calculation.masses_u, calculation.positions_angstrom
    )
    if kind == "saddle" and not along:
        if not np.any(imaginary):
            raise _no_coordinate(calculation, used_as, name)
        coordinate[int(np.argmin(wavenumbers_cm))] = True
        if used_as == "crossing":
            findings.append(_coordinate_assumed(calculation, wavenumbers_cm[coordinate], name))
    extra = imaginary & ~coordinate
    refused = extra & ~small
    if np.any(refused):
        role = "seam" if along else used_as
        raise _refusal(calculation, wavenumbers_cm, imaginary, refused, role, real_below_cm, name)
    if np.any(extra):
        findings.append(
            Finding(
                code="imaginary-taken-as-real",
                severity="warning",
                file=calculation.path,
                line=line,
                what=f"{name}: imaginary modes of {_listed(wavenumbers_cm[extra])} cm^-1 taken as "
                f"real (below {real_below_cm:g} cm^-1)",
                mend="optimise more tightly, or with a finer grid, until they are gone",
            )
        )
    replaced = np.zeros(len(wavenumbers_cm), dtype=np.int64)
    return SortedModes(kind, wavenumbers_cm, coordinate, extra, replaced, tuple(findings))


def _refusal(
    calculation: Calculation,
    wavenumbers_cm: FloatArray,
    imaginary: NDArray[np.bool_],
    refused: NDArray[np.bool_],
    role: UsedAs | Literal["seam"] | None,
    real_below_cm: float | None,
    name: str,
) -> StudyError:
    """Return the error of imaginary modes that must not be there; "seam": of modes along it."""
    count = int(np.sum(imaginary))
    listed = _listed(wavenumbers_cm[imaginary])
    modes = f"{count} imaginary mode{'' if count == 1 else 's'} ({listed} cm^-1)"
    if role == "saddle":
        what = f"{name} is a saddle point with {modes}; it must have exactly one"
        mend = "optimise it again along the smaller ones"
    elif role == "seam":
        what = f"{name} is a crossing point with {modes} along the seam; it must have none there"
        mend = "displace it along them and look for the lowest crossing again"
    elif role == "crossing":
        what = f"{name} is a crossing point with {modes}, of which one can be the motion across the seam"
        mend = 'give the other state, from which that motion follows: seam = { other = "..." }'
    elif role == "minimum":
        what = f"{name} is a minimum with {modes}; it must have none"
        mend = (
            "displace it along them and optimise again; a saddle point stands in a step's through"
        )
    else:
        what = f"{name} has {modes}; a minimum has none, a saddle point exactly one"
        mend = "displace it along those that do not belong and optimise again"
    if real_below_cm is not None:
        what += f"; only those below {real_below_cm:g} cm^-1 may be taken as real"
    largest = float(np.abs(wavenumbers_cm[refused]).max())
    if largest < NOISE_CM:
        real = f'imaginary = {{ real_below = "{int(largest) + 1} cm^-1" }}'
        mend += f"; if they are numerical noise, take them as real: {real}"
    return StudyError(what, where=place(calculation, "wavenumbers_cm"), mend=mend)


def _no_coordinate(calculation: Calculation, used_as: UsedAs | None, name: str) -> StudyError:
    """Return the error of a saddle or crossing point without an imaginary mode."""
    where = place(calculation, "wavenumbers_cm")
    if used_as != "crossing":
        return StudyError(
            f"{name} is used as a saddle point, but has no imaginary mode",
            where=where,
            mend="name the output of a saddle point, or use it as a minimum",
        )
    return StudyError(
        f"{name} is used as a crossing point, but no mode shows which motion leads across the seam",
        where=where,
        mend='give the other state, from which it follows: seam = { other = "..." }, or an output '
        "whose modes are those along the seam, one less",
    )


def _coordinate_assumed(calculation: Calculation, imaginary_cm: FloatArray, name: str) -> Finding:
    """Return the finding that an imaginary mode stands for the motion across the seam."""
    return Finding(
        code="crossing-coordinate-assumed",
        severity="warning",
        file=calculation.path,
        line=calculation.where.get("wavenumbers_cm"),
        what=f"{name}: its imaginary mode ({_listed(imaginary_cm)} cm^-1) is taken for the motion across "
        "the seam, and its other modes for those along it, from the Hessian of one state",
        mend='give the other state: seam = { other = "..." }; then both follow from the gradients',
    )


def _listed(wavenumbers_cm: FloatArray) -> str:
    return ", ".join(f"{value:.1f}" for value in wavenumbers_cm)


def _shape(kind: str, n: int) -> str:
    return "an atom" if kind == "atom" else f"a {kind} structure of {n} atoms"
