"""ORCA text outputs: single points, optimisations and frequency jobs, several jobs in one file.

Traps
-----
- The final energy is an excited state's in TD-DFT, CIS and EOM jobs: the ground state's is put
  together from the SCF or coupled-cluster energy and the corrections printed. For modes of an excited
  state there is no energy.
- The final energy of an SCF that did not converge says so behind its digits; of several roots of a
  multiconfigurational job it is an average and is not taken.
- All 3N wavenumbers are printed; the factor they were scaled with is applied already.
- A Hessian that an optimisation computes for its steps prints vibrations of a geometry that is left.
- The printed entropy is interpolated between a harmonic mode and a free rotor unless the input says
  otherwise; masses are average ones.
- "ORCA TERMINATED NORMALLY" also closes an optimisation that ran out of cycles.

The formats were checked on ORCA 5.0; those of 4 and 6 are written from knowledge of them.
"""

from __future__ import annotations

import re

from thermo_pp.readers import joined_hessian
from thermo_pp.readers.doubts import Doubt, as_findings, doubt_places
from thermo_pp.readers.orca import choice, geometry, joined, layout, levels
from thermo_pp.readers.orca.choice import Chosen
from thermo_pp.readers.orca.vibrations import PRINTED_CONSTANTS, PRINTED_STEPS
from thermo_pp.readers.text import Text, holds, plain_lines
from thermo_pp.records import Calculation, Printed
from thermo_pp.sources import Source

__all__ = ["LOOKS_FOR", "NAME", "PRINTED_CONSTANTS", "PRINTED_STEPS", "read", "sniff"]

NAME = "orca"
LOOKS_FOR = "'* O   R   C   A *'"

_BANNER = b"* O   R   C   A *"
_VERSION = re.compile(rb"Program Version +(\d\S*)")
_GRADIENT = b"CARTESIAN GRADIENT"


def sniff(head: bytes) -> bool:
    """Tell whether `head`, the first 64 KiB of a file, is this program's."""
    return holds(head, _BANNER)


def read(source: Source) -> Calculation:
    """Read one output.

    Raises
    ------
    ReadError
        No normal end, an SCF that did not converge, no energy, values printed twice that do not
        agree, anything damaged; names file and line.
    """
    text = Text(plain_lines(source)).indexed()
    layout.check_end(text)
    marks = layout.Layout(text)
    chosen = choice.choose(text, marks)
    shape, energy, modes = chosen.shape, chosen.energy, chosen.modes
    level = levels.level(marks, energy, chosen.inputs)
    charge, multiplicity, state_at = levels.charge_and_multiplicity(text, energy.final.at)
    masses, origin, masses_at = geometry.masses(marks, shape)
    at = {"positions_angstrom": shape.at, **state_at, **level.at}
    if masses_at is not None:
        at["masses_u"] = masses_at
    value = None if _excited_modes(chosen) else energy.value
    if value is not None:
        at["energy_hartree"] = energy.at
    version = _VERSION.search(text.data)
    if version is not None:
        at["program_version"] = version.start()
    if modes is not None:
        at |= modes.at
    if chosen.run is not None:
        at["optimised"] = chosen.run.at
    doubts = _doubts(text, chosen, value)
    printed = {} if modes is None else modes.printed
    written = joined.beside(text) if modes is not None and len(shape.numbers) > 1 else None
    hessian = None
    if written is not None and modes is not None:
        hessian = joined.hessian(written, shape, masses, modes)
    lines = text.line_numbers(
        at
        | {f"printed {key}": place for key, (_, _, place) in printed.items()}
        | doubt_places(doubts)
    )
    findings = as_findings(doubts, source.name, lines)
    if written is not None and hessian is None:
        line = lines["wavenumbers_cm"]
        findings = (*findings, joined_hessian.not_joined(source, written, line))
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
        charge=charge,
        multiplicity=multiplicity,
        energy_hartree=value,
        energy_label=None if value is None else energy.label,
        wavenumbers_cm=None if modes is None else modes.wavenumbers_cm,
        modes=None if modes is None else modes.modes,
        hessian_hartree_bohr2=hessian,
        optimised=None if chosen.run is None else chosen.run.converged,
        kind_of_job=_kinds(text, marks, chosen),
        printed={
            key: Printed(digits, unit, lines[f"printed {key}"])
            for key, (digits, unit, _) in printed.items()
        },
        where={field: lines[field] for field in at},
        findings=findings,
    )


def _excited_modes(chosen: Chosen) -> bool:
    """Tell whether the modes are those of an excited state."""
    modes, own = chosen.modes, chosen.own
    if modes is None or own.excited is None or own.value is None:
        return False
    return modes.electronic is None or abs(modes.electronic[0] - own.value) > 1e-7


def _kinds(text: Text, marks: layout.Layout, chosen: Chosen) -> tuple[str, ...]:
    kinds = ["optimisation"] if chosen.run is not None else []
    if chosen.modes is not None:
        kinds.append("frequencies")
    if not kinds:
        gradient = marks.last(_GRADIENT) >= 0
        kinds.append("gradient" if gradient else "energy")
    return tuple(kinds)


def _doubts(text: Text, chosen: Chosen, value: float | None) -> list[Doubt]:
    """Return what is doubtful about what was taken."""
    found: list[Doubt] = []
    energy, modes, run = chosen.energy, chosen.modes, chosen.run
    if run is not None and not run.converged:
        found.append(
            Doubt(
                "optimisation-not-converged",
                "warning",
                run.at,
                "the optimisation did not reach its thresholds",
                "optimise on from the last geometry, with more cycles",
            )
        )
    if value is None:
        why = "the modes are those of an excited state"
        if energy.value is None:
            why = "the final energy is not that of one electronic ground state"
        found.append(
            Doubt(
                "no-energy",
                "error",
                energy.final.at,
                f"no energy is taken: {why}",
                "name an output with the energy of this geometry and state",
            )
        )
    elif energy.excited is not None and value != energy.final.value:
        found.append(
            Doubt(
                "excited-state-left-out",
                "note",
                energy.final.at,
                f"the final energy {energy.final.digits} is that of an excited state; "
                f"the ground state's, {value:.8f}, is taken",
                "nothing, if the ground state is meant",
            )
        )
    if energy.doubt is not None:
        what, place = energy.doubt
        found.append(
            Doubt(
                "energy-not-confirmed",
                "warning",
                place,
                what,
                "look at the line; the output is damaged, or has a contribution not known here",
            )
        )
    if modes is not None:
        found += _modes_doubts(chosen, value)
    if chosen.shape.ghosts or chosen.shape.dummies:
        found.append(
            Doubt(
                "ghost-atoms",
                "warning",
                chosen.shape.at,
                "ghost or dummy atoms were left out of the structure; basis functions of theirs count "
                "in the energy",
                "use it for counterpoise corrections only",
            )
        )
    if chosen.other is not None:
        found.append(
            Doubt(
                "other-molecule-left-out",
                "note",
                chosen.other,
                "a job of another molecule stands in this file; it is left out",
                "give each molecule a file of its own",
            )
        )
    scan = text.find(b"RELAXED SURFACE SCAN STEP") if run is not None else -1
    if scan >= 0:
        found.append(
            Doubt(
                "last-of-several-structures",
                "note",
                scan,
                "a relaxed scan: the last of its structures is taken",
                "give an output of the structure that is meant",
            )
        )
    return found


def _modes_doubts(chosen: Chosen, value: float | None) -> list[Doubt]:
    """Return what is doubtful about the frequencies and what the thermochemistry starts from."""
    found: list[Doubt] = []
    modes, own, energy = chosen.modes, chosen.own, chosen.energy
    assert modes is not None
    if modes.scale != 1.0:
        found.append(
            Doubt(
                "wavenumbers-scaled",
                "warning",
                modes.at["wavenumbers_cm"],
                f"the program has multiplied its wavenumbers by {modes.scale:g}",
                "do not scale them a second time",
            )
        )
    if energy is not own:
        found.append(
            Doubt(
                "energy-of-another-task",
                "note",
                energy.at,
                f"the energy is {energy.label}, the modes are {own.label}: two jobs of this file",
                "nothing, where that is meant; else give the jobs as files of their own",
            )
        )
    elif value is not None and modes.electronic is not None:
        printed, place = modes.electronic
        if abs(printed - value) > 1e-7:
            found.append(
                Doubt(
                    "energy-not-confirmed",
                    "warning",
                    place,
                    f"the thermochemistry starts from {printed:.8f} hartree, the final energy is "
                    f"{value:.8f}",
                    "look at both lines: one is damaged, or the modes are of another level",
                )
            )
    return found
