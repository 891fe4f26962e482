"""Psi4 text outputs: single points, optimisations and frequency jobs, several tasks in one file.

Taken is the geometry of the last frequency analysis, else the last geometry, with the best energy
that the file has of that geometry. The formats were checked on Psi4 1.3.2 and 1.7.
"""

from __future__ import annotations

import re

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import ISOTOPES, MOST_ABUNDANT, SYMBOLS
from thermo_pp.names import Origin
from thermo_pp.readers import joined_hessian
from thermo_pp.readers.psi4 import choice, doubts, energies, jobs, joined, levels, vibrations
from thermo_pp.readers.psi4.choice import Chosen
from thermo_pp.readers.psi4.jobs import BANNER, Geometry
from thermo_pp.readers.psi4.vibrations import PRINTED_CONSTANTS
from thermo_pp.readers.text import Text
from thermo_pp.records import Calculation, MethodEnergy
from thermo_pp.sources import Source

__all__ = ["LOOKS_FOR", "NAME", "PRINTED_CONSTANTS", "read", "sniff"]

NAME = "psi4"
LOOKS_FOR = "'Psi4: An Open-Source Ab Initio Electronic Structure Package'"

_SNIFF = re.compile(rb"P[Ss][Ii]4: " + BANNER)
_VERSION = re.compile(rb"P[Ss][Ii]4 (\d\S*)")


def sniff(head: bytes) -> bool:
    """Tell whether `head`, the first 64 KiB of a file, is this program's."""
    return BANNER in head and _SNIFF.search(head) is not None


def read(source: Source) -> Calculation:
    """Read one output.

    Raises
    ------
    ReadError
        No normal end, an SCF that did not converge, an energy that is not known to this reader or
        missing although the input asks for it, anything damaged; names file and line.
    """
    text = Text(source)
    normally = jobs.check_end(text)
    echoes, asked = jobs.inputs(text)
    choice.check_asked(text, asked)
    chosen = choice.choose(text, choice.tasks(text, echoes))
    shape, energy, analysis = chosen.shape, chosen.energy, chosen.analysis
    jobs.check_repulsion(chosen.part, shape)
    level = levels.level(chosen.part, energy, shape.numbers)
    masses, origin = _masses(shape)
    version = _VERSION.search(text.data, text.need(BANNER, lacking="no heading of the program"))
    at = {"energy_hartree": energy.at, **level.at}
    at |= {"positions_angstrom": shape.table_at, "charge": shape.at, "multiplicity": shape.at}
    if origin == "printed":
        at["masses_u"] = shape.table_at
    if version is not None:
        at["program_version"] = version.start()
    wavenumbers = modes = hessian = None
    findings = doubts.findings(text, chosen)
    if analysis is not None:
        wavenumbers, modes, at["wavenumbers_cm"] = vibrations.modes(analysis, len(shape.numbers))
        beside = joined.beside(text) if len(shape.numbers) > 1 else None
        if beside is not None:
            hessian = joined.hessian(beside, masses, shape.positions_angstrom, wavenumbers)
            if hessian is None:
                line = text.line_number(at["wavenumbers_cm"])
                findings = (*findings, joined_hessian.not_joined(source, beside, line))
    if chosen.run is not None:
        at["optimised"] = chosen.run.at
    lines = text.line_numbers(at)
    return Calculation(
        path=source.name,
        sha256=source.sha256,
        program=NAME,
        program_version=None if version is None else version.group(1).decode("utf-8", "replace"),
        method=level.method,
        basis=level.basis,
        dispersion=level.dispersion,
        solvent=level.solvent,
        grid=level.grid,
        frozen_core=level.frozen_core,
        numbers=shape.numbers,
        positions_angstrom=shape.positions_angstrom,
        masses_u=masses,
        masses_origin=origin,
        charge=shape.charge,
        multiplicity=shape.multiplicity,
        energy_hartree=energy.value,
        energy_label=energy.label,
        method_energies={
            one.label: MethodEnergy(one.value, text.line_number(one.at))
            for one in energies.energies(chosen.part)
            if one.rank <= energy.rank
        },
        wavenumbers_cm=wavenumbers,
        modes=modes,
        hessian_hartree_bohr2=hessian,
        optimised=None if chosen.run is None else chosen.run.converged,
        ended_normally=normally,
        kind_of_job=_kinds(chosen),
        printed={} if analysis is None else vibrations.thermochemistry(analysis),
        where={field: lines[field] for field in at},
        findings=findings,
    )


def _masses(shape: Geometry) -> tuple[NDArray[np.float64], Origin]:
    """Return the masses of the geometry's table, else those of the most abundant isotopes.

    Psi4 takes the most abundant isotopes unless the input says otherwise.
    """
    if shape.masses_u is not None:
        return shape.masses_u, "printed"
    isotopes = [ISOTOPES[SYMBOLS[z]][MOST_ABUNDANT[z]] for z in shape.numbers]
    return np.array(isotopes), "derived"


def _kinds(chosen: Chosen) -> tuple[str, ...]:
    """Return what the file holds: the larger tasks, else what the chosen evaluation is."""
    kinds = ["optimisation"] if chosen.tasks.runs else []
    if chosen.analysis is not None:
        kinds.append("frequencies")
    if not kinds:
        gradient = any(chosen.part.has(mark) for mark in (b"-Total Gradient:", b"-Total gradient:"))
        kinds.append("gradient" if gradient else "energy")
    return tuple(kinds)
