"""Modes: how many there are, how many imaginary, how soft; and how straight the structure is."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding
from thermo_pp.formulas.rotor import LINEAR_ANGSTROM, distance_from_axis, rotor_kind
from thermo_pp.names import Severity
from thermo_pp.records import Calculation

NEARLY_LINEAR_ANGSTROM = 0.15
"""A bent structure whose atoms all lie this close to one axis is called nearly linear."""
SMALL_IMAGINARY_CM = 50.0
"""One imaginary mode below this is more often a minimum not quite reached than a saddle point."""
SOFT_CM = 50.0
VERY_SOFT_CM = 15.0
"""Below the first, S depends on the treatment; below the second it is hardly a vibration."""
MOST_NAMED = 6


def mode_findings(calculation: Calculation) -> tuple[Finding, ...]:
    """Return what is doubtful about the modes of one calculation; nothing where it has none."""
    wavenumbers = calculation.wavenumbers_cm
    if wavenumbers is None:
        return ()
    return (
        *_count(calculation, len(wavenumbers)),
        *_imaginary(calculation, wavenumbers[wavenumbers < 0.0]),
        *_soft(calculation, wavenumbers[wavenumbers > 0.0]),
    )


def _count(calculation: Calculation, found: int) -> tuple[Finding, ...]:
    """Compare the number of modes with 3N-6 or 3N-5, whichever the geometry calls for."""
    atoms = len(calculation.numbers)
    kind = rotor_kind(calculation.masses_u, calculation.positions_angstrom)
    expected = {"atom": 0, "linear": 3 * atoms - 5, "nonlinear": 3 * atoms - 6}[kind]
    width = (
        0.0
        if kind == "atom"
        else distance_from_axis(calculation.masses_u, calculation.positions_angstrom)
    )
    if found != expected:
        shape = {"atom": "an atom", "linear": "a linear", "nonlinear": "a nonlinear"}[kind]
        structure = shape if kind == "atom" else f"{shape} structure of {atoms} atoms"
        what = f"{found} modes where {structure} has {expected}"
        if kind != "atom" and found == 6 * atoms - 11 - expected:
            what += f" (the atoms lie up to {width:.3f} Å from the axis)"
        mend = "use a frequency job of the whole molecule; check whether it is meant to be linear"
        return (_finding(calculation, "mode-count", "error", what, mend),)
    if kind == "nonlinear" and width < NEARLY_LINEAR_ANGSTROM:
        what = (
            f"nearly linear: no atom lies farther than {width:.3f} Å from the axis "
            f"(linear below {LINEAR_ANGSTROM} Å), and the modes are those of a bent structure"
        )
        mend = (
            "optimise it more tightly, or make it linear; its rotation is very uncertain as it is"
        )
        return (_finding(calculation, "nearly-linear", "warning", what, mend),)
    return ()


def _imaginary(calculation: Calculation, modes: NDArray[np.float64]) -> tuple[Finding, ...]:
    if len(modes) > 1:
        what = (
            f"{len(modes)} imaginary modes ({_named(modes)}): neither a minimum nor a saddle point"
        )
        mend = "displace the structure along the extra modes and optimise again"
        return (_finding(calculation, "imaginary-modes", "warning", what, mend),)
    if len(modes) == 1 and -modes[0] < SMALL_IMAGINARY_CM:
        what = (
            f"its one imaginary mode is small ({_named(modes)}): "
            "a saddle point, or a minimum not quite reached"
        )
        mend = "look at the mode; if a minimum is meant, optimise more tightly or with a finer grid"
        return (_finding(calculation, "small-imaginary-mode", "warning", what, mend),)
    return ()


def _soft(calculation: Calculation, modes: NDArray[np.float64]) -> tuple[Finding, ...]:
    soft = modes[modes < SOFT_CM]
    if not len(soft):
        return ()
    very = bool(np.any(soft < VERY_SOFT_CM))
    count = "1 mode" if len(soft) == 1 else f"{len(soft)} modes"
    what = (
        f"{count} below {SOFT_CM:g} cm^-1 ({_named(soft)}): "
        "S and G depend on how soft modes are treated"
    )
    mend = "compare the treatments (--low-modes); look at the spread that the tables show"
    severity: Severity = "warning" if very else "note"
    return (_finding(calculation, "soft-modes", severity, what, mend),)


def _named(modes: NDArray[np.float64]) -> str:
    """Return the wavenumbers as text, imaginary ones with an i."""
    shown = [f"{-mode:.1f}i" if mode < 0.0 else f"{mode:.1f}" for mode in modes[:MOST_NAMED]]
    more = ["..."] if len(modes) > MOST_NAMED else []
    return ", ".join(shown + more) + " cm^-1"


def _finding(
    calculation: Calculation, code: str, severity: Severity, what: str, mend: str
) -> Finding:
    line = calculation.where.get("wavenumbers_cm")
    return Finding(code, severity, calculation.path, line, what, mend)
