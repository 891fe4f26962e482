"""What is doubtful about a crossing point: its states' energies, gradients and Hessians."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding
from thermo_pp.formulas.seam import CrossingCoordinate, turning_residual
from thermo_pp.names import Severity
from thermo_pp.records import Calculation
from thermo_pp.species import SeamPart
from thermo_pp.units import BOHR_ANGSTROM

FloatArray = NDArray[np.float64]

DEGENERATE_KJ_MOL = 0.25
"""States whose energies differ by more do not cross there; about 1e-4 hartree (no source)."""
STATIONARY_HARTREE_BOHR = 5e-4
"""Largest component of a gradient along the seam at its minimum; about what optimisations stop at
(common practice, no source)."""
TURNS = 0.01
"""So much of the slope across the seam may a Hessian miss what its gradient asks of it: grids, digits."""
OVERALL = 0.01
"""So much of the motion across the seam may move the whole structure: grids, printed digits."""


@dataclass(frozen=True, eq=False)
class State:
    """What is known of one state, in the orientation of the frequency job.

    Attributes
    ----------
    label : str
        The output that stands for it.
    gradient : SeamPart
    slope : shape (n, 3)
        The same gradient, hartree/bohr.
    hessian : shape (3n, 3n) or None
    energy : SeamPart or None
    """

    label: str
    gradient: SeamPart
    slope: FloatArray
    hessian: FloatArray | None
    energy: SeamPart | None

    @property
    def parts(self) -> tuple[SeamPart, ...]:
        """What of it a seam is worked out from."""
        return (self.gradient,) if self.energy is None else (self.gradient, self.energy)


def overall_motion(across: CrossingCoordinate, job: Calculation, name: str) -> list[Finding]:
    """Doubt gradients of which more than noise moves the whole structure; that part is left out."""
    if across.overall <= OVERALL:
        return []
    return [
        _finding(
            "seam-overall-motion",
            "warning",
            job,
            f"{name}: {across.overall:.1%} of the difference of the gradients moves or turns the whole "
            "structure; that part is left out of the modes",
            "use a finer grid; check that the gradients are in the orientation of the frequency job",
        )
    ]


def one_hessian(job: Calculation, name: str, why: str) -> Finding:
    """Doubt modes along a seam that one state's Hessian alone gives."""
    return _finding(
        "seam-one-hessian",
        "warning",
        job,
        f"{name}: the modes along the seam are those of the Hessian of {job.path} alone, since {why}",
        "give the frequency job of the other state at this geometry",
    )


def turns_along(
    hessian: FloatArray,
    gradient: FloatArray,
    across: CrossingCoordinate,
    job: Calculation,
    name: str,
) -> list[Finding]:
    """Doubt a Hessian along the seam that does not turn with its gradient."""
    positions = job.positions_angstrom / BOHR_ANGSTROM
    off = turning_residual(hessian, gradient, positions) / across.slope
    if off <= TURNS:
        return []
    return [
        _finding(
            "seam-hessian-turns",
            "warning",
            job,
            f"{name}: the Hessian along the seam does not turn with its gradient (off by {off:.1%} of the "
            "slope across it)",
            "check that gradients and Hessians belong together, state by state; take both Hessians from one "
            "program, since some project overall motion out of it and others do not",
        )
    ]


def where_it_lies(
    one: State, other: State, share: float, gap_kj_mol: float | None, job: Calculation, name: str
) -> list[Finding]:
    """Doubt a point where the states have two energies, or the seam is not level."""
    notes = []
    if gap_kj_mol is None:
        silent = one.label if one.energy is None else other.label
        notes.append(
            _finding(
                "seam-gap-unknown",
                "note",
                job,
                f"{name}: {silent} has no energy, so it is not known whether the states cross here",
                "give outputs with the energies of both states",
            )
        )
    elif abs(gap_kj_mol) > DEGENERATE_KJ_MOL:
        notes.append(
            _finding(
                "seam-not-degenerate",
                "warning",
                job,
                f"{name}: {one.label} lies {abs(gap_kj_mol):.2f} kJ/mol {'above' if gap_kj_mol > 0.0 else 'below'} "
                f"{other.label}, more than {DEGENERATE_KJ_MOL:g}; its energy is the one that counts",
                "optimise the crossing point further; both outputs must be of one level of theory",
            )
        )
    left = float(np.abs((1.0 - share) * one.slope + share * other.slope).max())
    if left > STATIONARY_HARTREE_BOHR:
        notes.append(
            _finding(
                "seam-not-stationary",
                "warning",
                job,
                f"{name}: a gradient of {left:.2e} hartree/bohr (largest component) is left along the "
                f"seam, more than {STATIONARY_HARTREE_BOHR:g}: it is not the lowest crossing point",
                "optimise the crossing point further",
            )
        )
    return notes


def modes_along(
    job: Calculation, across: CrossingCoordinate, share: float | None, name: str, words: str
) -> Finding:
    """Return the note that says what the modes along the seam were worked out from."""
    if share is None:
        hessian = "Hessian of the one state"
    else:
        hessian = f"Hessian {1.0 - share:.4f} of its own, {share:.4f} of the other state"
    return _finding(
        "modes-along-seam",
        "note",
        job,
        f"{name}: modes along the seam ({words}); slope across it {across.slope:.5f} hartree/bohr, reduced "
        f"mass {across.reduced_mass_u:.4f} u; {hessian}",
        "nothing, if this is meant",
    )


def _finding(code: str, severity: Severity, job: Calculation, what: str, mend: str) -> Finding:
    return Finding(
        code=code,
        severity=severity,
        file=job.path,
        line=job.where.get("hessian_hartree_bohr2", job.where.get("wavenumbers_cm")),
        what=what,
        mend=mend,
    )
