"""Q-Chem text outputs: HF, DFT, MP2 to MP4, CCD, CCSD, CCSD(T), optimisations, frequencies; several jobs in a file.

Traps: a finite-difference job prints an energy of every displaced geometry, of which the first is meant, an
optimisation the last; excited states stand in the same words as the ground state; ``Total Enthalpy`` is a correction;
thermochemistry comes twice in newer versions (rigid rotors and quasi-rigid ones); a double hybrid's SCF energy is not
its energy (refused); charge and multiplicity stand in the echo of the input only.

What is taken of several jobs: geometry, masses and modes of the last frequency job, else the geometry of the last job.
The energy is that job's own, unless a later job at the same geometry has one of a level not lower, or an earlier one a
better one (HF, DFT < MP2 < MP3 < MP4 < CCD < CCSD < CCSD(T)); where it is another job's a finding says so.

Formats were checked on Q-Chem 5.4.1; those of Q-Chem 6 (``Total energy =``) are read from knowledge of the format.
"""

from __future__ import annotations

import re
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import ISOTOPES, MOST_ABUNDANT, SYMBOLS
from thermo_pp.names import Origin
from thermo_pp.readers.doubts import Doubt, as_findings, doubt_places
from thermo_pp.readers.line_marks import first_match, last_match, matches
from thermo_pp.readers.qchem import energies, jobs, levels, vibrations
from thermo_pp.readers.qchem.energies import Energy
from thermo_pp.readers.qchem.jobs import Job
from thermo_pp.readers.qchem.vibrations import PRINTED_CONSTANTS
from thermo_pp.readers.text import CUT_SHORT, Text, holds
from thermo_pp.records import Calculation
from thermo_pp.sources import Source

__all__ = ["LOOKS_FOR", "NAME", "PRINTED_CONSTANTS", "read", "sniff"]

NAME = "qchem"
LOOKS_FOR = "'A Quantum Leap Into The Future Of Chemistry'"

_MARK = b"A Quantum Leap Into The Future Of Chemistry"
_VERSION = re.compile(rb"^ Q-Chem (\d[\w.]*) for |^ Q-Chem,? (?:Version )?(\d[\w.]*)", re.MULTILINE)
_CONVERGED = re.compile(
    rb"[ \t]*\*\*[ \t]+(?:OPTIMIZATION|TRANSITION STATE|TS|SADDLE POINT) CONVERGED"
)
_FINAL = re.compile(rb"^[ \t]*Final energy is[ \t]+", re.MULTILINE)


class Modes(NamedTuple):
    """What a frequency job adds to a record.

    `at` has offsets by field, `others_at` that of a second analysis (of other isotopes), -1 for none, `left_out_at`
    that of a Hessian with other wavenumbers.
    """

    wavenumbers_cm: NDArray[np.float64]
    modes: NDArray[np.float64]
    masses_u: NDArray[np.float64] | None
    found: vibrations.Found
    at: dict[str, int]
    others_at: int
    hessian: NDArray[np.float64] | None
    left_out_at: int


def sniff(head: bytes) -> bool:
    """Tell whether `head`, the first 64 KiB of a file, is this program's."""
    return holds(head, _MARK)


def read(source: Source) -> Calculation:
    """Read one output.

    Raises
    ------
    ReadError
        Names file and line: no normal end, an SCF that did not converge, a method or a kind of job that is not read,
        values printed twice that do not agree, anything damaged.
    """
    text = Text(source)
    all_jobs = jobs.jobs(text)
    analysed = [job for job in all_jobs if job.kind == "frequencies"]
    _check_no_modes(text, all_jobs)
    main = analysed[-1] if analysed else all_jobs[-1]
    own, doubts = _energy(text, main), []
    energy = _best(text, all_jobs, main, own)
    if energy is not own:
        doubts.append(_other_job(text, energy, own, bool(analysed)))
    modes = _modes(text, main, own) if analysed else None
    if modes is not None and modes.others_at >= 0:
        doubts.append(_other_isotopes(modes.others_at))
    if modes is not None and modes.left_out_at >= 0:
        doubts.append(_hessian_left_out(modes.left_out_at))
    run = _own_run(text, all_jobs, main, own)
    optimised, at = None, {}
    if run is not None:
        optimised, at["optimised"] = _outcome(text, run)
        if not optimised:
            doubts.append(_not_converged(at["optimised"]))
    level = levels.level(text, energy)
    doubts += _level_doubts(text, main, own, run if optimised else None)
    doubts += _left_out(text, all_jobs, main, own)
    shape = own.shape
    if shape.ghosts:
        doubts.append(_ghosts(own))
    at |= level.at | {"energy_hartree": energy.at, "positions_angstrom": shape.at}
    at |= {"charge": main.state_at, "multiplicity": main.state_at}
    masses, origin = _masses(own, modes)
    if modes is not None:
        at |= modes.at
    named = _version(text)
    if named is not None:
        at["program_version"] = named.start()
    found = {} if modes is None else modes.found
    lines = text.line_numbers(
        at | {f"printed {key}": value[2] for key, value in found.items()} | doubt_places(doubts)
    )
    return Calculation(
        path=source.name,
        sha256=source.sha256,
        program=NAME,
        program_version=None
        if named is None
        else next(one for one in named.groups() if one).decode("utf-8", "replace"),
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
        charge=main.charge,
        multiplicity=main.multiplicity,
        energy_hartree=energy.value,
        energy_label=energy.label,
        wavenumbers_cm=None if modes is None else modes.wavenumbers_cm,
        modes=None if modes is None else modes.modes,
        hessian_hartree_bohr2=None if modes is None else modes.hessian,
        optimised=optimised,
        kind_of_job=_kinds(all_jobs),
        printed=vibrations.as_printed(found, {key: lines[f"printed {key}"] for key in found}),
        where={field: lines[field] for field in at},
        findings=as_findings(doubts, source.name, lines),
    )


def _check_no_modes(text: Text, all_jobs: list[Job]) -> None:
    """Refuse modes in a job that was not asked for them: its input is damaged."""
    for job in all_jobs:
        at = -1
        if job.kind != "frequencies":
            at = text.data.find(vibrations.ANALYSIS, job.echo, job.end)
        if at >= 0:
            raise text.error(at, "modes in a job whose input asks for none", mend=CUT_SHORT)


def _version(text: Text) -> re.Match[bytes] | None:
    """Return where the version of the first job stands: below its authors, else above them."""
    found = matches(_VERSION, b" Q-Chem", text, 0, min(text.end, 65536))
    return next((one for one in found if one.group(1)), found[0] if found else None)


def _kinds(all_jobs: list[Job]) -> tuple[str, ...]:
    kinds = {job.kind for job in all_jobs}
    return tuple(k for k in ("energy", "gradient", "optimisation", "frequencies") if k in kinds)


def _energy(text: Text, job: Job) -> Energy:
    """Return a job's own energy, checked against what was asked for."""
    found = energies.energy(text, job)
    energies.check_functional(text, found)
    return found


def _best(text: Text, all_jobs: list[Job], main: Job, own: Energy) -> Energy:
    """Return the energy that is taken: the best one at the geometry of the main job."""
    best = own
    for job in all_jobs:
        if job is main:
            continue
        if (job.charge, job.multiplicity) != (main.charge, main.multiplicity):
            continue
        other = _energy(text, job)
        later = job.start > main.start
        if other.shape.same(own.shape) and (
            other.rank > best.rank or (later and other.rank == best.rank)
        ):
            best = other
    return best


def _other_job(text: Text, energy: Energy, own: Energy, analysed: bool) -> Doubt:
    what = "modes" if analysed else "last job's own energy"
    theirs, mine = levels.level(text, energy).words, levels.level(text, own).words
    return Doubt(
        "energy-of-another-task",
        "note",
        energy.at,
        f"the energy is {theirs}, the {what} {mine}: two jobs of this file",
        "nothing, where that is meant; else give the jobs as files of their own",
    )


def _modes(text: Text, job: Job, own: Energy) -> Modes:
    """Return the modes of a frequency job: of its first analysis, that of the isotopes it was given first."""
    part = text.part(own.scf_at, job.end)
    start, thermo = part.find(vibrations.ANALYSIS), part.find(vibrations.THERMO)
    if start < 0 and (len(own.shape.numbers) > 1 or thermo < 0):
        raise text.error(
            job.end,
            f"no vibrations in this frequency job (looked for {vibrations.ANALYSIS.decode()!r})",
            mend=CUT_SHORT,
        )
    if own.shape.ghosts:
        raise text.error(
            own.shape.at,
            "frequencies of a molecule with ghost atoms are not read",
            mend="rerun the frequency job without ghost atoms",
        )
    stop = thermo if thermo >= 0 else job.end
    first = start if 0 <= start < stop else stop
    second = part.find(vibrations.ANALYSIS, first + 1)
    if 0 <= second < stop:
        stop = second
    wavenumbers, vectors, modes_at = vibrations.modes(text.part(first, stop), own.shape)
    at = {"wavenumbers_cm": modes_at, "modes": modes_at}
    found: vibrations.Found = {}
    masses = None
    if thermo >= 0:
        found = vibrations.thermochemistry(part, thermo)
        vibrations.check(part, thermo, found, wavenumbers)
        printed = vibrations.masses(part, thermo, own.shape)
        if printed is not None:
            masses, at["masses_u"] = printed
    elif (lost := part.find(b"Has Mass", first)) >= 0:
        raise part.error(lost, "masses, but no heading of the thermochemistry", mend=CUT_SHORT)
    others = part.find(vibrations.ANALYSIS, first + 1)
    weights = _isotopes(own) if masses is None else masses
    place = vibrations.hessian_at(text, job.echo, first)
    hessian = None
    if place >= 0 and len(weights) > 1:
        hessian = vibrations.hessian(text, place, weights, own.shape, wavenumbers)
    if hessian is not None:
        at["hessian_hartree_bohr2"], place = place, -1
    return Modes(wavenumbers, vectors, masses, found, at, others, hessian, place)


def _hessian_left_out(at: int) -> Doubt:
    return Doubt(
        "hessian-not-joined",
        "warning",
        at,
        "the Hessian printed here is damaged or does not have the wavenumbers printed below; it is left out",
        "look whether the output is damaged, or the Hessian one of another step",
    )


def _other_isotopes(at: int) -> Doubt:
    return Doubt(
        "other-isotopes-left-out",
        "note",
        at,
        "frequencies of other isotopes stand in this file too; the first ones are taken",
        "give the isotopes you mean a job of their own",
    )


def _masses(own: Energy, modes: Modes | None) -> tuple[NDArray[np.float64], Origin]:
    """Return the masses that the modes were printed with, else those of the most abundant isotopes."""
    if modes is not None and modes.masses_u is not None:
        return modes.masses_u, "printed"
    return _isotopes(own), "derived"


def _isotopes(own: Energy) -> NDArray[np.float64]:
    return np.array([ISOTOPES[SYMBOLS[z]][MOST_ABUNDANT[z]] for z in own.shape.numbers])


def _own_run(text: Text, all_jobs: list[Job], main: Job, own: Energy) -> Job | None:
    """Return the optimisation that ended at the geometry that is taken, or one that did not end, of the same atoms."""
    for job in reversed(all_jobs):
        if job.kind != "optimisation" or job.start > main.start:
            continue
        if job is main:
            return job
        shape = _energy(text, job).shape
        if shape.same(own.shape) or (job.stopped_at is not None and shape.same_atoms(own.shape)):
            return job
    return None


def _outcome(text: Text, job: Job) -> tuple[bool, int]:
    """Return whether an optimisation converged, and where the program says so."""
    if job.stopped_at is not None:
        return False, job.stopped_at
    final = last_match(_FINAL, b"Final energy is", text, job.echo, job.end)
    if final is not None:
        printed = float(text.exact_text(final.end(), "the final energy"))
        own = _energy(text, job)
        if abs(printed - own.value) > 1e-6:
            raise text.error(
                final.start(),
                f"the final energy {printed!r} is not that of the last geometry, {own.value!r}",
                mend=CUT_SHORT,
            )
    said = first_match(_CONVERGED, b" CONVERGED", text, job.echo, job.end) or final
    if said is None:
        raise text.error(job.end, "this optimisation does not say how it ended", mend=CUT_SHORT)
    return True, said.start()


def _not_converged(at: int) -> Doubt:
    return Doubt(
        "optimisation-not-converged",
        "warning",
        at,
        "the optimisation did not reach its thresholds",
        "optimise on from the last geometry, with more cycles",
    )


def _level_doubts(text: Text, main: Job, own: Energy, run: Job | None) -> list[Doubt]:
    if run is None or run is main or main.kind != "frequencies":
        return []
    ended, mine = levels.level(text, _energy(text, run)), levels.level(text, own)
    if ended.words == mine.words:
        return []
    return [
        Doubt(
            "frequencies-of-another-level",
            "warning",
            own.at,
            f"the geometry was optimised with {ended.words}, the frequencies are {mine.words}: "
            "no stationary point of theirs",
            "optimise with the level of the frequencies",
        )
    ]


def _ghosts(own: Energy) -> Doubt:
    return Doubt(
        "ghost-atoms",
        "warning",
        own.shape.at,
        f"{own.shape.ghosts} ghost atoms are left out: the energy has their basis functions too",
        "set it against energies of the same basis functions only",
    )


def _left_out(text: Text, all_jobs: list[Job], main: Job, own: Energy) -> list[Doubt]:
    for job in all_jobs:
        if job is not main and not _energy(text, job).shape.same_atoms(own.shape):
            return [
                Doubt(
                    "other-molecule-left-out",
                    "note",
                    job.echo,
                    "a job of another molecule stands in this file; it is left out",
                    "give each molecule a file of its own",
                )
            ]
    return []
