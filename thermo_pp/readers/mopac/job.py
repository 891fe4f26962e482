"""What MOPAC's keywords say: charge, multiplicity, solvent; and what both of its files need."""

from __future__ import annotations

import re

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding, ReadError
from thermo_pp.formulas.rotor import rotor_kind
from thermo_pp.formulas.superposition import superpose
from thermo_pp.readers.text import Text
from thermo_pp.units import BOHR_M, EV_KJ_MOL, HARTREE_J, HARTREE_KJ_MOL

FloatArray = NDArray[np.float64]

EV_HARTREE = EV_KJ_MOL / HARTREE_KJ_MOL
MILLIDYNE_ANGSTROM = 100.0 / (HARTREE_J / BOHR_M**2)
"""1 mdyn/A in hartree/bohr^2."""
KCAL_CM = 349.7551
"""1 kcal/mol in cm^-1, as far as a printed zero-point energy needs it."""
SPINS = {
    "SINGLET": 1, "DOUBLET": 2, "TRIPLET": 3, "QUARTET": 4, "QUINTET": 5, "SEXTET": 6, "SEPTET": 7,
    "OCTET": 8, "NONET": 9,
}  # fmt: skip
_STATES = re.compile(r"^(EXCITED|ROOT=|C\.I\.|CIS|MECI|OPEN\(|MICROS|BIRADICAL)")
_PATHS = re.compile(r"^(IRC|DRC|STEP|POINT|SADDLE|LOCATE-TS|PATH)")


def words(keywords: str) -> list[str]:
    """Return the keywords, upper case, one by one."""
    return keywords.upper().split()


def check(text: Text, at: int, keys: list[str]) -> None:
    """Refuse jobs whose last energy is not that of a ground state at one geometry."""
    for key in keys:
        if _STATES.match(key):
            raise text.error(
                at,
                f"{key}: a calculation with configuration interaction, whose state is not known here",
                mend="give a job of the ground state",
            )
        if _PATHS.match(key):
            raise text.error(
                at,
                f"{key}: a path, whose last energy is of no geometry that is read",
                mend="give a single point, an optimisation or a FORCE job of the geometry you want",
            )
        if key == "FORCETS":
            raise text.error(
                at,
                f"{key}: the vibrations of some of the atoms only",
                mend="give a FORCE job of the whole molecule",
            )


def periodic(text: Text, at: int) -> ReadError:
    """Return the error that the system is no molecule."""
    return text.error(
        at,
        "translation vectors (Tv): a polymer, a layer or a solid, which is no molecule",
        mend="give a calculation of a molecule",
    )


def path(text: Text, at: int) -> ReadError:
    """Return the error that the input drives a coordinate along a path."""
    return text.error(
        at,
        "a reaction coordinate: a path, whose last energy is of no geometry that is read",
        mend="give a single point, an optimisation or a FORCE job of the geometry you want",
    )


def charge(keys: list[str]) -> int:
    """Return the charge; MOPAC takes 0 unless a keyword says otherwise."""
    for key in keys:
        match = re.fullmatch(r"CHARGE=([+-]?\d{1,3})", key)
        if match is not None:
            return int(match.group(1))
    return 0


def spin(keys: list[str]) -> int | None:
    """Return the multiplicity that a keyword names, None where none does."""
    for key in keys:
        if key in SPINS:
            return SPINS[key]
        match = re.fullmatch(r"MS=(\d{1,2}(?:\.[05])?)", key)
        if match is not None:
            return round(2.0 * float(match.group(1))) + 1
    return None


def solvent(keys: list[str]) -> str:
    """Return the solvent model that the keywords name; MOPAC has none unless asked."""
    found = [key for key in keys if key.startswith(("EPS=", "RSOLV=", "N**2="))]
    return f"COSMO {' '.join(found).lower()}" if found else "none"


def genuine(masses_u: FloatArray, positions_angstrom: FloatArray) -> int:
    """Return how many of the 3N modes are vibrations; MOPAC lists them first."""
    kind = rotor_kind(masses_u, positions_angstrom)
    return 3 * len(masses_u) - {"atom": 3, "linear": 5, "nonlinear": 6}[kind]


def turned(
    vectors: FloatArray, frame_angstrom: FloatArray, positions_angstrom: FloatArray
) -> FloatArray | None:
    """Return vectors (..., n, 3) of the frame of a FORCE job in the frame of the geometry.

    None where the two are not the same structure, to the digits printed.
    """
    laid = superpose(frame_angstrom, positions_angstrom)
    if laid.rmsd_angstrom > 2e-3:
        return None
    return vectors @ np.asarray(laid.rotation).T


def heat_only(name: str, line: int | None, heat: str) -> Finding:
    """Return the finding that there is a heat of formation and no electronic energy."""
    return Finding(
        "no-energy",
        "warning",
        name,
        line,
        f"a heat of formation ({heat} kcal/mol), which has zero-point and thermal energy in it by "
        "parametrisation, but no total energy: no electronic energy is taken",
        "rerun with the keyword ENPART (text) or AUX with LARGE (MOPAC2016), which give the total energy",
    )


def nothing(name: str) -> Finding:
    """Return the finding that there is no energy of any kind."""
    return Finding(
        "no-energy",
        "warning",
        name,
        None,
        "neither a total energy nor a heat of formation in this file",
        "give the single point of this geometry",
    )


def zero_point_differs(
    name: str, line: int, wavenumbers_cm: FloatArray, printed_kcal: float, step: float
) -> tuple[Finding, ...]:
    """Return a finding where the printed zero-point energy is not that of the wavenumbers."""
    own = 0.5 * float(wavenumbers_cm[wavenumbers_cm > 0.0].sum()) / KCAL_CM
    slack = 2.0 * step + 0.05 * 0.5 * (len(wavenumbers_cm) + 1) / KCAL_CM + 3e-5 * own
    if abs(own - printed_kcal) <= slack:
        return ()
    return (
        Finding(
            "printed-differs",
            "error",
            name,
            line,
            f"the zero-point energy is {printed_kcal} kcal/mol, that of the wavenumbers {own:.3f} kcal/mol",
            "the file is damaged; compare its numbers",
        ),
    )
