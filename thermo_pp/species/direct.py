"""Direct: H, S and G of a calculation without a study, the keys of ``[treatment]`` as keywords."""

from __future__ import annotations

import dataclasses
import os
from collections.abc import Iterable, Mapping, Sequence
from pathlib import Path, PurePath
from typing import Any

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import Treatment, standard_state, temperature
from thermo_pp.errors import Finding, StudyError
from thermo_pp.names import (
    DEFAULT_LOW_MODES,
    DEFAULT_ONSET_CM,
    DEFAULT_STANDARD_STATE,
    DEFAULT_TEMPERATURE_K,
    LOW_MODES,
    MASSES,
    PHASES,
    ROTORS,
    USED_AS,
    LowModes,
    Masses,
    NuclearSpins,
    Phase,
    Rotor,
    UsedAs,
)
from thermo_pp.nearest import suggestion
from thermo_pp.records import Calculation
from thermo_pp.sources import Source, open_source
from thermo_pp.species.result import Thermochemistry
from thermo_pp.species.structure import Structure
from thermo_pp.species.torsion_keys import parse_torsions
from thermo_pp.units import quantity


def thermochemistry(
    calculation: Calculation,
    temperature_k: Any = DEFAULT_TEMPERATURE_K,
    *,
    standard_state: Any = DEFAULT_STANDARD_STATE,
    phase: Phase = "gas",
    low_modes: LowModes = DEFAULT_LOW_MODES,
    onset_cm: Any = DEFAULT_ONSET_CM,
    rotor: Rotor = "auto",
    masses: Masses = "program",
    imaginary: Any = "refuse",
    frequency_scale: float = 1.0,
    zero_point_scale: float | None = None,
    enantiopure: bool = False,
    entropy_correction: Any = 0.0,
    kind: UsedAs | None = None,
    energy: Calculation | None = None,
    charge: int | None = None,
    multiplicity: int | None = None,
    levels: Sequence[Sequence[Any]] | str | None = None,
    symmetry_number: int | None = None,
    isotopes: Mapping[Any, str] | None = None,
    rotational_constants: Mapping[str, Any] | None = None,
    nuclear_spins: NuclearSpins | None = None,
    torsions: Sequence[Mapping[str, Any]] = (),
    name: str | None = None,
) -> Thermochemistry:
    """Compute H, S and G of one calculation.

    Parameters
    ----------
    calculation : Calculation
        A frequency job; of a single atom any job.
    temperature_k : float, text, quantity or a list of them
        K unless a unit is given: ``298.15``, ``"25 degC"``, ``[298.15, 350]``.
    standard_state : str
        ``"1 bar"``, ``"1 atm"``, ``"1 mol/L"``.
    phase : {"gas", "solution"}
    low_modes : {"harmonic", "raised", "rotor-entropy", "rotor-enthalpy"}
    onset_cm : float, text or quantity
        Onset of the soft-mode treatment, cm^-1.
    rotor : {"auto", "classical"}
    masses : {"program", "average"}
    imaginary : "refuse" or mapping
        ``{"real_below": "30 cm^-1"}``: smaller ones are taken as real.
    frequency_scale, zero_point_scale : float
        Of thermal terms and of the zero-point energy; the second is the first unless given.
    enantiopure : bool
    entropy_correction : float, text or quantity
        Added to the entropy in solution, J/(mol K).
    kind : {"minimum", "saddle", "crossing"} or None
        None: exactly one imaginary mode means saddle, with a note. "crossing": a point where two spin
        states cross, whose modes may be those along the seam, one less.
    energy : Calculation or None
        A single point of the same structure whose energy is taken.
    charge, multiplicity, levels, symmetry_number, isotopes, rotational_constants, nuclear_spins
        See `Structure.make`.
    torsions : sequence of mapping
        Hindered rotors, the keys of ``[species.NAME] torsions``: ``{"atoms": [1, 2, 3, 4], "scan":
        "scan.csv"}``. A scan may be a list of paths or of Calculations too.
    name : str or None
        For messages; the file's name unless given.

    Returns
    -------
    Thermochemistry
        Arrays over temperature, one entry for a single temperature too.

    Raises
    ------
    StudyError
        An unknown choice, a value that is no quantity, a structure that cannot be treated.
    """
    call = "thermochemistry"
    treatment = Treatment(
        standard_state=_state(standard_state),
        phase=choice(phase, PHASES, where=f"{call} phase"),
        low_modes=choice(low_modes, LOW_MODES, where=f"{call} low_modes"),
        onset_cm=_above_zero(quantity(onset_cm, "1/cm", where=f"{call} onset_cm"), "onset_cm"),
        rotor=choice(rotor, ROTORS, where=f"{call} rotor"),
        masses=choice(masses, MASSES, where=f"{call} masses"),
        real_below_cm=parse_imaginary(imaginary, where=f"{call} imaginary"),
        frequency_scale=_above_zero(frequency_scale, "frequency_scale"),
        zero_point_scale=_above_zero(
            frequency_scale if zero_point_scale is None else zero_point_scale, "zero_point_scale"
        ),
        enantiopure=enantiopure,
        entropy_correction_j_mol_k=_entropy_correction(entropy_correction, phase),
    )
    if kind is not None:
        choice(kind, USED_AS, where=f"{call} kind")
    structure = Structure.make(
        calculation,
        treatment,
        name=name or PurePath(calculation.path).stem,
        kind=kind,
        energy=energy,
        charge=charge,
        multiplicity=multiplicity,
        levels=levels,
        symmetry_number=symmetry_number,
        isotopes=isotopes,
        rotational_constants=rotational_constants,
        nuclear_spins=nuclear_spins,
        torsions=parse_torsions(torsions, calculation, _open, where=f"{call} torsions"),
        where=call,
    )
    found = structure.at(_temperatures(temperature_k, where=f"{call} temperature_k"))
    if phase == "gas":
        return found
    return dataclasses.replace(found, findings=(*found.findings, solution_finding()))


def solution_finding() -> Finding:
    """Return what a user must know about every result in solution; a study says it once."""
    return Finding(
        code="solvation-derivative",
        severity="warning",
        file=None,
        line=None,
        what="the phase is a solution, and how solvation depends on temperature is not in H, S and "
        "the Arrhenius energies",
        mend="declare the species whose solvation was computed at several temperatures",
    )


def choice(value: Any, known: tuple[Any, ...], *, where: str) -> Any:
    """Return `value` if it is among `known`; StudyError that lists them where it is not."""
    if value in known:
        return value
    mend = suggestion(str(value), known, "choices")
    raise StudyError(f"unknown choice {value!r}", where=where, mend=mend)


def parse_imaginary(value: Any, *, where: str) -> float | None:
    """Turn ``"refuse"`` or ``{"real_below": "30 cm^-1"}`` into a wavenumber, None for refuse."""
    if value == "refuse":
        return None
    if isinstance(value, Mapping) and set(value) == {"real_below"}:
        below = quantity(value["real_below"], "1/cm", where=f"{where}.real_below")
        if below > 0.0:
            return below
    raise StudyError(
        f"{value!r} is no way to treat imaginary modes",
        where=where,
        mend='write "refuse" or { real_below = "30 cm^-1" }',
    )


def _open(path: Any, where: str) -> Source:
    """Open a file of a torsion; StudyError where there is none."""
    if not isinstance(path, str | os.PathLike) or not Path(path).is_file():
        raise StudyError(
            f"there is no file {str(path)!r}",
            where=where,
            mend="name a table (CSV) of the scan, or a list of outputs, one a point",
        )
    return open_source(Path(path), os.fspath(path))


def _state(value: Any) -> Any:
    return standard_state(value, where="thermochemistry standard_state")


def _entropy_correction(value: Any, phase: Phase) -> float:
    where = "thermochemistry entropy_correction"
    number = quantity(value, "J/mol/K", where=where)
    if number != 0.0 and phase != "solution":
        raise StudyError(
            "an entropy correction in the gas phase",
            where=where,
            mend='leave it out, or give phase="solution"',
        )
    return number


def _above_zero(value: float, key: str) -> float:
    if isinstance(value, bool) or not value > 0.0:
        raise StudyError(
            f"{key} is {value!r}",
            where=f"thermochemistry {key}",
            mend="give a number above 0",
        )
    return float(value)


def _temperatures(value: Any, *, where: str) -> NDArray[np.float64]:
    """Return one or several temperatures in K, each checked."""
    units = getattr(value, "units", None)
    if units is not None:
        value = [type(value)(magnitude, units) for magnitude in np.ravel(value.magnitude)]
    elif isinstance(value, str) or not isinstance(value, Iterable):
        value = [value]
    return np.array([temperature(_plain(one), where=where) for one in value])


def _plain(value: Any) -> Any:
    """Return a Python number for a numpy one, anything else as it is."""
    return value.item() if isinstance(value, np.generic) else value
