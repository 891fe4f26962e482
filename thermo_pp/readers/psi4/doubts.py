"""What is doubtful about a Psi4 output that is read all the same."""

from __future__ import annotations

import numpy as np

from thermo_pp.errors import Finding
from thermo_pp.names import Severity
from thermo_pp.readers.psi4 import energies, jobs, levels
from thermo_pp.readers.psi4.choice import Chosen
from thermo_pp.readers.psi4.jobs import Evaluation
from thermo_pp.readers.text import Text

_OTHER_ANGSTROM = 0.2
"""Distances that differ by more are not those of one structure at two levels of theory."""
_HELD = (b"Fixed value    =", b"to adjust frozen coordinates")
_ROTATIONS = b"un-projected rotation-like modes"


def findings(text: Text, chosen: Chosen) -> tuple[Finding, ...]:
    """Return the findings about what was chosen of the file."""
    found = [
        *_ghosts(text, chosen),
        *_unconverged(text, chosen),
        *_held(text, chosen),
        *_left_out(text, chosen),
    ]
    if chosen.analysis is not None:
        found += [*_rotations(text, chosen.analysis), *_levels(text, chosen)]
    return tuple(found)


def _finding(text: Text, severity: Severity, code: str, at: int, what: str, mend: str) -> Finding:
    return Finding(code, severity, text.source.name, text.line_number(at), what, mend)


def _ghosts(text: Text, chosen: Chosen) -> list[Finding]:
    count = chosen.shape.ghosts
    if not count:
        return []
    atoms = "ghost atom is" if count == 1 else "ghost atoms are"
    what = f"{count} {atoms} left out: the energy has their basis functions too"
    mend = "set it against energies of the same basis functions only"
    return [_finding(text, "warning", "ghost-atoms", chosen.shape.table_at, what, mend)]


def _unconverged(text: Text, chosen: Chosen) -> list[Finding]:
    if chosen.run is None or chosen.run.converged:
        return []
    what = "the optimisation did not reach its thresholds"
    mend = "optimise on from the last geometry, with more steps"
    return [_finding(text, "warning", "optimisation-not-converged", chosen.run.at, what, mend)]


def _held(text: Text, chosen: Chosen) -> list[Finding]:
    """Return a finding where the optimiser held coordinates at its last steps."""
    if chosen.run is None or not chosen.run.converged:
        return []
    before = [one for one in chosen.tasks.real if one.start < chosen.run.last.start]
    part = text.part((before or [chosen.run.last])[-1].start, chosen.run.at)
    places = [at for mark in _HELD if (at := part.find(mark)) >= 0]
    if not places:
        return []
    what = "the geometry was optimised with coordinates held: no stationary point"
    mend = "nothing, for a point of a scan; else optimise without constraints"
    return [_finding(text, "warning", "not-stationary", min(places), what, mend)]


def _left_out(text: Text, chosen: Chosen) -> list[Finding]:
    for one in chosen.tasks.real:
        if not np.array_equal(chosen.tasks.shapes[one].numbers, chosen.shape.numbers):
            what = "a task of another molecule stands in this file; it is left out"
            mend = "give each molecule a file of its own"
            return [_finding(text, "note", "other-molecule-left-out", one.start, what, mend)]
    if energies.held(chosen.part) is None:
        for one in chosen.tasks.real:
            at = energies.held(text.part(one.start, one.end))
            if at is not None and chosen.tasks.shapes[one].same(chosen.shape):
                what = "an SCF with occupations held to those of a start (MOM) is left out"
                mend = "nothing, if the ground state is meant"
                return [_finding(text, "note", "excited-state-left-out", at, what, mend)]
    if chosen.tasks.runs or chosen.analysis is not None:
        return _conformers(text, chosen)
    others = [one for one in chosen.tasks.real if not chosen.tasks.shapes[one].same(chosen.shape)]
    if not others:
        return []
    what = f"{len(others)} other geometries or charges of these atoms stand in this file; the last is taken"
    mend = "give a file with one geometry where another one is meant"
    code = "last-of-several-structures"
    return [_finding(text, "note", code, others[0].start, what, mend)]


def _conformers(text: Text, chosen: Chosen) -> list[Finding]:
    """Return a finding where an optimisation led to another structure of the same atoms."""
    for run in chosen.tasks.runs:
        other = chosen.tasks.shapes[run.last]
        if run.converged and jobs.furthest_apart(other, chosen.shape) > _OTHER_ANGSTROM:
            what = "an optimisation of another structure of these atoms stands in this file"
            mend = "give each structure a file of its own"
            code = "last-of-several-structures"
            return [_finding(text, "note", code, run.at, what, mend)]
    return []


def _rotations(text: Text, analysis: Text) -> list[Finding]:
    at = analysis.find(_ROTATIONS)
    if at < 0:
        return []
    what = (
        "the program did not take rotations out of its vibrations: too far from a stationary point"
    )
    mend = "optimise at the level of the frequencies first"
    return [_finding(text, "warning", "not-stationary", at, what, mend)]


def _levels(text: Text, chosen: Chosen) -> list[Finding]:
    """Compare the level of the modes with that of the energy and that of the optimisation."""
    found: list[Finding] = []
    modes = _words(text, chosen, chosen.base)
    energy = levels.level(chosen.part, chosen.energy, chosen.shape.numbers)
    mine = f"{energy.method}/{energy.basis}"
    if mine != modes:
        what = f"the modes are of {modes}, the energy of the same geometry is of {mine}"
        mend = "nothing, if this is meant"
        at = chosen.energy.at
        found.append(_finding(text, "note", "modes-of-another-level", at, what, mend))
    if chosen.run is not None and chosen.run.converged:
        ended = _words(text, chosen, chosen.run.last)
        if ended != modes:
            what = f"the geometry was optimised with {ended}, the frequencies are of {modes}: "
            what += "no stationary point of theirs"
            mend = "optimise with the level of the frequencies"
            code = "frequencies-of-another-level"
            found.append(_finding(text, "warning", code, chosen.base.start, what, mend))
    return found


def _words(text: Text, chosen: Chosen, one: Evaluation) -> str:
    part = text.part(one.start, one.end)
    level = levels.level(part, energies.best_energy(part), chosen.shape.numbers)
    return f"{level.method}/{level.basis}"
