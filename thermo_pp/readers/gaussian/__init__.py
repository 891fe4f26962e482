"""Gaussian text outputs: single points, optimisations and frequency jobs, several steps in one file.

Traps
-----
- "Optimization completed" and "-- Stationary point found" also stand in frequency jobs, where they mean
  nothing; an optimisation that runs out of steps ends in an error termination and is read all the same.
- With ``freq=hpmodes`` every mode is printed twice, in anharmonic jobs too; "Low frequencies" are none.
- Modes stand in the standard orientation, the archive entry in that of the input.
- A CCSD(T) job prints a dozen other energies; a double hybrid's SCF energy is not its energy; excited
  states have total energies of their own, and modes of one have no energy here.
- Numerical derivatives print energies of displaced geometries: the sums of the thermochemistry tell
  which is that of the modes.
- A file can be cut between two steps, right after "Normal termination": the route tells.
- Windows writes ``|`` for the backslashes of the archive entry.

The formats were checked on Gaussian 16; those of 09 and 03 are written from knowledge of them.
"""

from __future__ import annotations

import re

import numpy as np

from thermo_pp.names import Origin
from thermo_pp.readers.doubts import Doubt, as_findings, doubt_places
from thermo_pp.readers.gaussian import choice, energies, geometry, levels, steps
from thermo_pp.readers.gaussian import hessian as hessians
from thermo_pp.readers.gaussian.choice import Chosen
from thermo_pp.readers.gaussian.vibrations import PRINTED_CONSTANTS, PRINTED_STEPS
from thermo_pp.readers.text import Text, holds, plain_lines
from thermo_pp.records import Calculation, Printed
from thermo_pp.sources import Source

__all__ = ["LOOKS_FOR", "NAME", "PRINTED_CONSTANTS", "PRINTED_STEPS", "read", "sniff"]

NAME = "gaussian"
LOOKS_FOR = "'Gaussian, Inc.' and 'Gaussian 16:'"

_BANNER = re.compile(rb"\n Gaussian (\d\d|DV): +\S")
_VERSION = re.compile(rb"\n Gaussian (\d\d|DV), (Revision [^\s,]+)")
_FORCE = re.compile(r"(?<![\w-])force\b", re.IGNORECASE)
_AGREE = 2e-7


def sniff(head: bytes) -> bool:
    """Tell whether `head`, the first 64 KiB of a file, is this program's."""
    return holds(head, b"Gaussian, Inc.") and _BANNER.search(head) is not None


def read(source: Source) -> Calculation:
    """Read one output.

    Raises
    ------
    ReadError
        An error termination, no normal end, an SCF that did not converge, an energy that is missing
        or not known to this reader, values printed twice that do not agree, anything damaged.
    """
    text = Text(plain_lines(source)).indexed()
    found = steps.steps(text)
    chosen = choice.choose(text, found)
    shape, energy, modes = chosen.shape, chosen.energy, chosen.modes
    level = None if energy is None else levels.level(chosen.step, energy)
    at = {"positions_angstrom": shape.at}
    listed = None
    origin: Origin = "printed"
    if chosen.thermo is not None:
        listed = geometry.thermochemical_masses(
            chosen.base.part.part(chosen.thermo.at), shape.numbers
        )
    if listed is not None:
        masses, at["masses_u"] = listed
    else:
        masses, origin, place = geometry.masses(chosen.base, shape)
        if place is not None:
            at["masses_u"] = place
    state = chosen.base.state
    if state is not None:
        at["charge"] = at["multiplicity"] = state[2]
    if energy is not None and level is not None:
        at |= {"energy_hartree": energy.at, **level.at}
    wavenumbers = displacements = matrix = None
    if modes is not None:
        at["wavenumbers_cm"] = at["modes"] = modes.at
        wavenumbers, displacements = modes.wavenumbers_cm, modes.modes
        archive = chosen.base.archive
        if archive is not None:
            matrix = hessians.hessian(archive, shape, masses, wavenumbers)
        if matrix is not None and archive is not None:
            at["hessian_hartree_bohr2"] = archive.at
    elif chosen.thermo is not None and len(shape.numbers) == 1:
        wavenumbers, displacements = np.zeros(0), np.zeros((0, 1, 3))
        at["wavenumbers_cm"] = chosen.thermo.at
    elif chosen.thermo is not None:
        raise text.error(
            chosen.thermo.at, "thermochemistry without modes before it", mend="rerun it"
        )
    if chosen.run is not None:
        at["optimised"] = chosen.run.at
    version = text.line_match(_VERSION, b"\n Gaussian ")
    if version is not None:
        at["program_version"] = version.start() + 1
    doubts = _doubts(chosen)
    printed = {} if chosen.thermo is None else chosen.thermo.printed
    lines = text.line_numbers(
        at
        | {f"printed {key}": place for key, (_, _, place) in printed.items()}
        | doubt_places(doubts)
    )
    return Calculation(
        path=source.name,
        sha256=source.sha256,
        program=NAME,
        program_version=None
        if version is None
        else b" ".join(version.groups()).decode("utf-8", "replace"),
        method=None if level is None else level.method,
        basis=None if level is None else level.basis,
        dispersion=None if level is None else level.dispersion,
        solvent=None if level is None else level.solvent,
        grid=None if level is None else level.grid,
        frozen_core=None if level is None else level.frozen_core,
        numbers=shape.numbers,
        positions_angstrom=shape.positions_angstrom,
        masses_u=masses,
        masses_origin=origin,
        charge=None if state is None else state[0],
        multiplicity=None if state is None else state[1],
        energy_hartree=None if energy is None else energy.value,
        energy_label=None if energy is None else energy.label,
        wavenumbers_cm=wavenumbers,
        modes=displacements,
        hessian_hartree_bohr2=matrix,
        optimised=None if chosen.run is None else chosen.run.converged,
        ended_normally=found[-1].finished,
        kind_of_job=_kinds(chosen),
        printed={
            key: Printed(digits, unit, lines[f"printed {key}"])
            for key, (digits, unit, _) in printed.items()
        },
        where={field: lines[field] for field in at},
        findings=as_findings(doubts, source.name, lines),
    )


def _kinds(chosen: Chosen) -> tuple[str, ...]:
    kinds = ["optimisation"] if chosen.run is not None else []
    if chosen.thermo is not None or chosen.modes is not None:
        kinds.append("frequencies")
    if not kinds:
        forces = _FORCE.search(chosen.base.route) is not None
        kinds.append("gradient" if forces else "energy")
    return tuple(kinds)


def _doubts(chosen: Chosen) -> list[Doubt]:
    """Return what is doubtful about what was taken."""
    found: list[Doubt] = []
    energy, run, step = chosen.energy, chosen.run, chosen.step
    if run is not None and not run.converged:
        found.append(
            Doubt(
                "optimisation-not-converged",
                "warning",
                run.at,
                "the optimisation did not reach its thresholds",
                "optimise on from the last geometry, with more steps",
            )
        )
    if energy is None:
        assert chosen.thermo is not None
        found.append(
            Doubt(
                "no-energy",
                "error",
                chosen.thermo.electronic_at,
                f"no energy in this step is that of the thermochemistry, {chosen.thermo.electronic:.6f} "
                "hartree: the modes are those of an excited state, or a line is damaged",
                "name an output with the energy of this geometry and state",
            )
        )
        return found
    if energy is not chosen.own:
        found.append(
            Doubt(
                "energy-of-another-task",
                "note",
                energy.at,
                f"the energy is {energy.label}, another step of this file has the geometry",
                "nothing, where that is meant; else give the steps as files of their own",
            )
        )
    if energies.is_excited(step):
        found.append(
            Doubt(
                "excited-state-left-out",
                "note",
                energy.at,
                "the step computes excited states; the energy of the ground state is taken",
                "nothing, if the ground state is meant",
            )
        )
    found += _archived(chosen, energy)
    if chosen.base.of_several:
        found.append(
            Doubt(
                "last-of-several-structures",
                "note",
                chosen.base.route_at,
                "a scan or a path: the last of its structures is taken",
                "give an output of the structure that is meant",
            )
        )
    if chosen.other is not None:
        found.append(
            Doubt(
                "other-molecule-left-out",
                "note",
                chosen.other,
                "a step of another molecule stands in this file; it is left out",
                "give each molecule a file of its own",
            )
        )
    return found


def _archived(chosen: Chosen, energy: energies.Energy) -> list[Doubt]:
    """Return a doubt where the archive entry has another value of the energy."""
    archive, name = chosen.step.archive, energies.ARCHIVED.get(energy.label)
    if archive is None or name is None or "(" in energy.scf_name:
        return []
    if energy.at != energy.scf_at and energy.label == "DFT":
        name = "MP2"  # of a double hybrid
    value = archive.value(name)
    if value is None or abs(value - energy.value) < _AGREE or chosen.base.of_several:
        return []
    return [
        Doubt(
            "energy-not-confirmed",
            "warning",
            energy.at,
            f"the energy is {energy.value:.8f} here and {value} in the archive entry",
            "look at both lines; one is damaged, or of another state",
        )
    ]
