"""GAMESS (US) text outputs: HF, DFT, MP2, CCD, CCSD, CCSD(T), AM1 and its kin; searches, Hessians; one run a file.

Traps: a numerical Hessian prints an energy of every displaced geometry (the first is meant, which the run also states
as ``IVIB= 0 ... E=``), a search one of every step; translations and rotations stand among the modes and imaginary ones
are marked only in one of two tables (see `vibrations`); a Hessian computed for a search is at its first geometry;
``-ABNORMALLY-`` ends a search that ran out of steps too; Firefly and GAMESS-UK are other programs.

Taken is the geometry of the modes, else that of a search's end, else the given one, with the energy of the method that
the options name at that geometry. Formats were checked on GAMESS of 30 SEP 2018 (R3).
"""

from __future__ import annotations

import re
from typing import NamedTuple

import numpy as np

from thermo_pp.data.elements import ISOTOPES, MOST_ABUNDANT, SYMBOLS
from thermo_pp.readers import joined_hessian
from thermo_pp.readers.doubts import Doubt, as_findings, doubt_places
from thermo_pp.readers.gamess import energies, geometry, joined, options, vibrations
from thermo_pp.readers.gamess.energies import Energy
from thermo_pp.readers.gamess.geometry import Geometry
from thermo_pp.readers.gamess.options import Run
from thermo_pp.readers.gamess.vibrations import PRINTED_CONSTANTS
from thermo_pp.readers.line_marks import first_match, last_match, matches
from thermo_pp.readers.text import CUT_SHORT, Text, holds
from thermo_pp.records import Calculation, Printed
from thermo_pp.sources import Source

__all__ = ["LOOKS_FOR", "NAME", "PRINTED_CONSTANTS", "read", "sniff"]

NAME = "gamess"
LOOKS_FOR = "'GAMESS VERSION =' with 'FROM IOWA STATE UNIVERSITY'"

_BANNER = re.compile(
    rb"^ +\* +GAMESS VERSION = ([^*\r\n]+?) *\*\r?\n +\* +FROM IOWA STATE UNIVERSITY", re.MULTILINE
)
_LOCATED = re.compile(rb"[^\n]*(?:EQUILIBRIUM GEOMETRY|SADDLE POINT) LOCATED")
_STEP = re.compile(rb"^ *NSERCH[:=] *(\d+) +E(?:NERGY)?= *(-?\d+\.\d+)", re.MULTILINE)
_REFERENCE = re.compile(rb"[^\n]*IVIB= *0 IATOM= *0 ICOORD= *0 E= *(-?\d+\.\d+)")
_DISPLACED = re.compile(rb"^ +COORD +(\d+) +NUCLEAR COORDINATES", re.MULTILINE)
_SAME_ANGSTROM = 1e-6


class Taken(NamedTuple):
    """Geometry and energy (None where the run has none there), how a search ended, and where."""

    shape: Geometry
    energy: Energy | None
    optimised: bool | None
    optimised_at: int


def sniff(head: bytes) -> bool:
    """Tell whether `head`, the first 64 KiB of a file, is this program's."""
    return holds(head, b"GAMESS VERSION = ") and _BANNER.search(head) is not None


def read(source: Source) -> Calculation:
    """Read one output.

    Raises
    ------
    ReadError
        Names file and line: no normal end, an SCF that did not converge, a method or a kind of run that is not read,
        values printed twice that do not agree, anything damaged.
    """
    text = Text(source)
    run = options.run(text)
    taken = _searched(text, run) if run.kind == "optimisation" else _single(text, run)
    shape, energy = taken.shape, taken.energy
    state = geometry.state(text, run, geometry.given(text, run))
    at = {"positions_angstrom": shape.at, "charge": state.charge_at}
    at["multiplicity"] = state.multiplicity_at
    doubts: list[Doubt] = []
    if taken.optimised is not None:
        at["optimised"] = taken.optimised_at
        if not taken.optimised:
            doubts.append(_not_located(taken.optimised_at))
    analysis = _analysis(text, run, taken)
    isotopes = [ISOTOPES[SYMBOLS[z]][MOST_ABUNDANT[z]] for z in shape.numbers]
    masses, wavenumbers, vectors, hessian = np.array(isotopes), None, None, None
    left_out = None
    found: vibrations.Found = {}
    if shape.ghosts:
        doubts.append(_ghosts(text, shape, analysis))
    if analysis is not None:
        masses, at["masses_u"] = vibrations.masses(analysis, shape)
        wavenumbers, vectors, at["wavenumbers_cm"] = vibrations.modes(analysis, shape, masses)
        at["modes"] = at["wavenumbers_cm"]
        punched = joined.beside(text) if len(shape.numbers) > 1 else None
        if punched is not None:
            hessian = joined.hessian(punched, masses, shape.positions_angstrom, wavenumbers)
            left_out = punched if hessian is None else None
        found = vibrations.thermochemistry(analysis)
        if found:
            vibrations.check(analysis, found, wavenumbers)
        if energy is None:
            doubts.append(_no_energy(at["modes"]))
    level = None
    if energy is not None:
        level = energies.level(text, run, energy, shape)
        at |= level.at | {"energy_hartree": energy.at}
    banner = _BANNER.search(text.data)
    if banner is not None:
        at["program_version"] = banner.start(1)
    lines = text.line_numbers(
        at | {f"printed {key}": value[2] for key, value in found.items()} | doubt_places(doubts)
    )
    findings = as_findings(doubts, source.name, lines)
    if left_out is not None:
        line = lines["wavenumbers_cm"]
        findings = (*findings, joined_hessian.not_joined(source, left_out, line))
    kinds = [run.kind] + (["frequencies"] if analysis is not None else [])
    return Calculation(
        path=source.name,
        sha256=source.sha256,
        program=NAME,
        program_version=None if banner is None else banner.group(1).decode("utf-8", "replace"),
        method=None if level is None else level.method,
        basis=None if level is None else level.basis,
        dispersion=None if level is None else level.dispersion,
        solvent=None if level is None else level.solvent,
        grid=None if level is None else level.grid,
        frozen_core=None if level is None else level.frozen_core,
        numbers=shape.numbers,
        positions_angstrom=shape.positions_angstrom,
        masses_u=masses,
        masses_origin="derived" if analysis is None else "printed",
        charge=state.charge,
        multiplicity=state.multiplicity,
        energy_hartree=None if energy is None else energy.value,
        energy_label=None if energy is None else energy.label,
        wavenumbers_cm=wavenumbers,
        modes=vectors,
        hessian_hartree_bohr2=hessian,
        optimised=taken.optimised,
        kind_of_job=tuple(dict.fromkeys(kinds)),
        printed={
            key: Printed(digits, unit, lines[f"printed {key}"])
            for key, (digits, unit, _) in found.items()
        },
        where={field: lines[field] for field in at},
        findings=findings,
    )


def _finals(text: Text, run: Run) -> list[re.Match[bytes]]:
    return matches(energies.FINAL, b"ENERGY IS", text, run.start, run.end)


def _single(text: Text, run: Run) -> Taken:
    """Return the given geometry and the first energy, which is the one of that geometry."""
    shape = geometry.given(text, run)
    finals = _finals(text, run)
    if not finals:
        solved = text.part(run.start, run.end).find(b"DENSITY CONVERGED")
        if run.kind == "frequencies" and solved < 0:
            return Taken(shape, None, None, -1)
        raise text.error(
            run.end, "no final energy (looked for 'FINAL ... ENERGY IS')", mend=CUT_SHORT
        )
    displaced = last_match(_DISPLACED, b"NUCLEAR COORDINATES", text, run.start, finals[0].start())
    if displaced is not None and displaced.group(1) != b"0":  # a restart: the reference is not here
        return Taken(shape, None, None, -1)
    stop = finals[1].start() if len(finals) > 1 else run.end
    found = energies.energy(text, run, finals[0], stop, shape)
    reference = first_match(_REFERENCE, b"IVIB=   0", text, finals[0].end(), run.end)
    if reference is not None and abs(float(reference.group(1)) - found.value) > 1e-6:
        raise text.error(
            reference.start(1),
            f"the reference of the displaced geometries has {reference.group(1).decode()} hartree, "
            f"the energy is {found.value!r}",
            mend="the output is damaged, or the derivatives are not those of this energy",
        )
    return Taken(shape, found, None, -1)


def _searched(text: Text, run: Run) -> Taken:
    """Return the last geometry of a search and its energy."""
    located = first_match(_LOCATED, b" LOCATED", text, run.start, run.end)
    if located is None and run.lost_at is None:
        raise text.error(run.end, "this geometry search does not say how it ended", mend=CUT_SHORT)
    said = run.lost_at if located is None else located.start()
    finals = [one for one in _finals(text, run) if one.start() < (said or run.end)]
    if not finals:
        raise text.error(run.end, "no final energy of this geometry search", mend=CUT_SHORT)
    tables = matches(geometry.SEARCHED, geometry.SEARCHED_MARK, text, run.start, finals[-1].start())
    first = geometry.given(text, run)
    shape = geometry.table(text, tables[-1]) if tables else first
    ended = first_match(
        _STEP,
        b"NSERCH",
        text,
        tables[-1].end() if tables else finals[-1].start(),
        finals[-1].start(),
    )
    if ended is not None:
        raise text.error(ended.end(), "no geometry of the step after this one", mend=CUT_SHORT)
    later_table = first_match(
        geometry.SEARCHED, geometry.SEARCHED_MARK, text, finals[-1].end(), said or run.end
    )
    if later_table is not None:
        raise text.error(
            later_table.start(), "no final energy of the last step of this search", mend=CUT_SHORT
        )
    if not np.array_equal(shape.numbers, first.numbers):
        raise text.error(shape.at, "not the atoms that the run was given", mend=CUT_SHORT)
    again = None
    if located is not None:
        again = first_match(
            geometry.SEARCHED, geometry.SEARCHED_MARK, text, located.start(), run.end
        )
    if again is not None and geometry.table(text, again).differs(shape) > _SAME_ANGSTROM:
        raise text.error(
            again.start(), "the located geometry is not that of the last energy", mend=CUT_SHORT
        )
    later = [one for one in _finals(text, run) if one.start() > finals[-1].start()]
    stop = later[0].start() if later else run.end
    found = energies.energy(text, run, finals[-1], stop, shape)
    steps = matches(_STEP, b"NSERCH", text, finals[-1].end(), stop)
    scf = float(text.exact_text(found.scf_at, "the SCF energy"))
    if steps and min(abs(float(steps[0].group(2)) - one) for one in (scf, found.value)) > 1e-6:
        raise text.error(
            steps[0].start(2),
            f"the step of the search has {steps[0].group(2).decode()} hartree, the energy is {found.value!r}",
            mend=CUT_SHORT,
        )
    return Taken(shape, found, located is not None, said or 0)


def _analysis(text: Text, run: Run, taken: Taken) -> Text | None:
    """Return the part with the modes of the geometry that is taken, None where there is none."""
    begin = taken.optimised_at if taken.optimised else run.start
    if taken.optimised is False:
        return None
    start = text.data.find(vibrations.ANALYSIS, begin, run.end)
    if start < 0:
        lost = text.data.find(b"ARE TAKEN AS ROTATIONS", begin, run.end)
        if lost >= 0:
            raise text.error(lost, "modes without their heading", mend=CUT_SHORT)
        if run.kind == "frequencies" and run.options["RUNTYP"] == "HESSIAN":
            raise text.error(
                run.end,
                f"no vibrations in this run (looked for {vibrations.ANALYSIS.decode()!r})",
                mend="rerun it with VIBANL=.TRUE., or give the whole output",
            )
        return None
    return text.part(start, text.data.find(vibrations.ANALYSIS, start + 1, run.end) % (run.end + 1))


def _not_located(at: int) -> Doubt:
    return Doubt(
        "optimisation-not-converged",
        "warning",
        at,
        "the geometry search did not reach its thresholds",
        "search on from the last geometry, with more steps",
    )


def _no_energy(at: int) -> Doubt:
    return Doubt(
        "no-energy",
        "warning",
        at,
        "no energy at the geometry of the modes in this file",
        "name an output with the energy of this geometry",
    )


def _ghosts(text: Text, shape: Geometry, analysis: Text | None) -> Doubt:
    if analysis is not None:
        raise text.error(
            shape.at,
            "frequencies of a molecule with ghost atoms are not read",
            mend="rerun without ghost atoms",
        )
    return Doubt(
        "ghost-atoms",
        "warning",
        shape.at,
        f"{shape.ghosts} ghost atoms are left out: the energy has their basis functions too",
        "set it against energies of the same basis functions only",
    )
