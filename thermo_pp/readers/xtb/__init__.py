"""xtb text outputs: single points, gradients, optimisations and Hessians of GFN1-xTB, GFN2-xTB, GFN0-xTB and GFN-FF.

Traps
- ``total energy`` stands in every SUMMARY, of the Hessian's displaced geometries' start too; the
  energy is that of the final ``| TOTAL ENERGY``, which is the electronic energy (with the solvation
  free energy, where there is a solvent). ``TOTAL FREE ENERGY`` is not.
- Only an optimisation prints a geometry: see `structure`.
- Masses are averages, and not the usual ones: see `masses`.
- Molecular dynamics, scans and paths end in a TOTAL ENERGY of some other geometry: refused.
- Constraints are in the total energy (``add. restraining``) and in the Hessian: refused.
- ``hessian``, ``vibspectrum`` and ``xtbout.json`` have fixed names that the next job overwrites: the
  Hessian is taken only where its modes are those printed, the others only where they agree.
- The multiplicity is not printed: it is derived from the occupations, or read from ``--uhf``.

The dispersion correction and the core belong to the method, so they are "none" beyond it; a basis
set is not named.

``g98.out``, which xtb writes in the form of Gaussian 98, is read as what it is: see `companion`.

Formats were checked on xtb 6.5.1, and looked at for 6.6.1.
"""

from __future__ import annotations

import re

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding
from thermo_pp.formulas.normal_modes import NormalModes
from thermo_pp.readers import joined_hessian
from thermo_pp.readers.text import CUT_SHORT, Text
from thermo_pp.readers.xtb import companion, states, structure, vibrations
from thermo_pp.readers.xtb.masses import masses
from thermo_pp.records import Calculation, Printed
from thermo_pp.sources import Source

__all__ = ["LOOKS_FOR", "NAME", "read", "sniff"]

NAME = "xtb"
LOOKS_FOR = "'x T B' in a box and '* xtb version', or xtb's g98.out"

_BOX = re.compile(rb"^[ \t]+\|[ \t]+x T B[ \t]+\|", re.MULTILINE)
_VERSION = re.compile(rb"^[ \t]+\* xtb version (\S+)", re.MULTILINE)
_STARTED = b" * started run on"
_FINISHED = b" * finished run on"
_FATAL = b"[ERROR] Program stopped due to fatal error"
_NOT_ONE_GEOMETRY = (
    (re.compile(rb"^[ \t]*RELAXED SCAN", re.MULTILINE), "a relaxed scan"),
    (re.compile(rb"\|[ \t]+Molecular Dynamics[ \t]+\|"), "molecular dynamics"),
    (re.compile(rb"\|[ \t]+(?:Meta ?[Dd]ynamics?|META DYNAMICS)[ \t]+\|"), "metadynamics"),
    (re.compile(rb"\|[ \t]+(?:[Rr]eaction )?[Pp]ath ?[Ff]inder[ \t]+\|"), "a path search"),
    (re.compile(rb"\|[ \t]+(?:Mode Following|M O D E F|Conformational search)", re.I), "a search"),
    (re.compile(rb"\|[ \t]+Automated Docking|\baISS\b.*started", re.I), "a docking run"),
)
_NOT_ONE_LEVEL = (
    (re.compile(rb"^Initializing high level method", re.MULTILINE), "ONIOM, of two levels"),
    (re.compile(rb"^Fukui index Calculation", re.MULTILINE), "Fukui indices, of three charges"),
)
_CONVERGED = re.compile(rb"^[ \t]*\*\*\* GEOMETRY OPTIMIZATION CONVERGED", re.MULTILINE)
_UNCONVERGED = re.compile(rb"^[ \t]*\*\*\* FAILED TO CONVERGE GEOMETRY OPTIMIZATION", re.MULTILINE)


def sniff(head: bytes) -> bool:
    """Tell whether `head`, the first 64 KiB of a file, is this program's."""
    first = head[:4096]
    boxed = b"x T B" in first and _BOX.search(first) is not None
    return boxed or companion.sniff(head)


def read(source: Source) -> Calculation:
    """Read one output.

    Raises
    ------
    ReadError
        No end of the run, an error of the program, a job that has no one geometry, a geometry that
        is neither printed nor beside the output, values printed twice that differ, constraints in
        the energy or the Hessian.
    """
    if companion.sniff(source.head):
        return companion.read(source)
    text = Text(source)
    version = _check_run(text)
    optimised, optimised_at = _outcome(text)
    shape = structure.structure(text, optimised is not None)
    masses_u, changed_at = masses(text, shape.numbers)
    structure.check_moments(text, shape, masses_u)
    level = states.level(text)
    energy, energy_at = states.energy(text)
    charge, charge_at = states.charge(text)
    at = {"energy_hartree": energy_at, "charge": charge_at, **level.at}
    if version is not None:
        at["program_version"] = version.start(1)
    if shape.at is not None:
        at["positions_angstrom"] = shape.at
    if changed_at is not None:
        at["masses_u"] = changed_at
    if optimised is not None:
        at["optimised"] = optimised_at
    found = _Vibrations(text, shape, masses_u, at)
    multiplicity = states.multiplicity(text, structure.sibling(text, "xtbout.json"), energy)
    if multiplicity is not None and multiplicity[1] >= 0:
        at["multiplicity"] = multiplicity[1]
    findings = [*found.findings]
    if optimised is False:
        findings.insert(0, _not_converged(text, optimised_at))
    kinds = ("optimisation",) if optimised is not None else ()
    if found.wavenumbers_cm is not None:
        kinds = (*kinds, "frequencies")
    lines = text.line_numbers(at)
    return Calculation(
        path=source.name,
        sha256=source.sha256,
        program=NAME,
        program_version=None if version is None else version.group(1).decode("utf-8", "replace"),
        method=level.method,
        dispersion="none",
        solvent=level.solvent,
        grid="none",
        frozen_core="none",
        numbers=shape.numbers,
        positions_angstrom=shape.positions_angstrom,
        masses_u=masses_u,
        masses_origin="derived" if changed_at is None else "printed",
        charge=charge,
        multiplicity=None if multiplicity is None else multiplicity[0],
        energy_hartree=energy,
        energy_label=level.label,
        wavenumbers_cm=found.wavenumbers_cm,
        modes=None if found.modes is None else found.modes.modes,
        hessian_hartree_bohr2=found.hessian,
        optimised=optimised,
        kind_of_job=kinds or ("energy",),
        printed=found.printed,
        where={field: lines[field] for field in at},
        findings=tuple(findings),
    )


class _Vibrations:
    """What a Hessian job adds; None and empty where the job is none."""

    wavenumbers_cm: NDArray[np.float64] | None = None
    modes: NormalModes | None = None
    hessian: NDArray[np.float64] | None = None

    def __init__(
        self,
        text: Text,
        shape: structure.Structure,
        masses_u: NDArray[np.float64],
        at: dict[str, int],
    ) -> None:
        self.printed: dict[str, Printed] = {}
        self.findings: list[Finding] = []
        if vibrations.HESSIAN.search(text.data) is None:
            return
        vibrations.check_free(text)
        linear = structure.is_linear(masses_u, shape.positions_angstrom)
        self.wavenumbers_cm, at["wavenumbers_cm"] = vibrations.wavenumbers(
            text, len(shape.numbers), linear
        )
        self.printed = vibrations.thermochemistry(text)
        self._doubts(text)
        beside = structure.sibling(text, "hessian")
        if beside is None or len(shape.numbers) == 1:
            return
        hessian = joined_hessian.square(_numbers(beside), len(shape.numbers))
        self.modes = joined_hessian.modes_of(
            hessian, masses_u, shape.positions_angstrom, self.wavenumbers_cm
        )
        if self.modes is None:
            line = text.line_number(at["wavenumbers_cm"])
            self.findings.append(joined_hessian.not_joined(text.source, beside, line))
        else:
            self.hessian = hessian

    def _doubts(self, text: Text) -> None:
        name = text.source.name
        if self.printed and self.wavenumbers_cm is not None:
            differs = vibrations.zero_point_differs(self.wavenumbers_cm, self.printed)
            if differs is not None:
                self.findings.append(
                    Finding(
                        "printed-differs",
                        "error",
                        name,
                        self.printed["zero_point"].line,
                        differs,
                        "the file is damaged, or the program scaled its modes; compare its numbers",
                    )
                )
        at = text.find(vibrations.NOT_STATIONARY)
        if at >= 0:
            self.findings.append(
                Finding(
                    "not-stationary",
                    "warning",
                    name,
                    text.line_number(at),
                    "the frequencies are at a geometry that the program calls incompletely optimised",
                    "optimise at this level first (--ohess)",
                )
            )
        at = text.find(vibrations.BIASED)
        if at >= 0:
            self.findings.append(
                Finding(
                    "biased-hessian",
                    "warning",
                    name,
                    text.line_number(at),
                    "a Hessian under a biasing potential: no stationary point of this method",
                    "use it only where that is meant (single-point Hessians); else run --ohess",
                )
            )
        at = vibrations.asymmetry(text)
        if at >= 0:
            self.findings.append(
                Finding(
                    "hessian-not-symmetric",
                    "warning",
                    name,
                    text.line_number(at),
                    "the program warns that its Hessian is not symmetric",
                    "rerun the Hessian with a higher accuracy (--acc 0.1)",
                )
            )


def _numbers(beside: Source) -> NDArray[np.float64] | None:
    """Return the numbers of a file ``hessian``: all that stands between the head and the next ``$``."""
    head, _, rest = beside.data.partition(b"$hessian")
    if head.strip() or not rest:
        return None
    return joined_hessian.numbers(rest.partition(b"$")[0])


def _check_run(text: Text) -> re.Match[bytes] | None:
    """Refuse runs that failed, did not end, or are of no one geometry; return the version's match."""
    at = text.find(_FATAL)
    if at >= 0:
        reasons = text.data[at : at + 2000].decode("utf-8", "replace").splitlines()[1:]
        last = [line.strip() for line in reasons if re.match(r"-\d+-", line.strip())]
        raise text.error(
            at,
            f"the program stopped with an error: {(last or ['no reason given'])[-1][:120]}",
            mend="mend the job and rerun it",
        )
    if text.last(_FINISHED) < 0:
        raise text.error(text.end, "no '* finished run on': the run did not end", mend=CUT_SHORT)
    starts = text.all(_STARTED)
    if len(starts) > 1 or len(text.all(_FINISHED)) > 1:
        raise text.error(
            (starts or [0])[-1], "two runs in one file", mend="give each run a file of its own"
        )
    for mark, what in _NOT_ONE_GEOMETRY:
        match = mark.search(text.data)
        if match is not None:
            raise text.error(
                match.start(),
                f"{what}, whose last energy is of no geometry in this file",
                mend="give a single point, an optimisation or a Hessian of the geometry you want",
            )
    for mark, what in _NOT_ONE_LEVEL:
        match = mark.search(text.data)
        if match is not None:
            raise text.error(
                match.start(),
                f"{what}: several energies that this reader does not tell apart",
                mend="give a job of one method and one charge",
            )
    return _VERSION.search(text.data)


def _outcome(text: Text) -> tuple[bool | None, int]:
    """Return whether the last optimisation converged, None where there was none, and where it says so."""
    good = [match.start() for match in _CONVERGED.finditer(text.data)]
    bad = [match.start() for match in _UNCONVERGED.finditer(text.data)]
    if not good and not bad:
        if structure.FINAL.search(text.data) is not None:
            raise text.error(
                text.end, "a final structure, but no word of how its optimisation ended",
                mend=CUT_SHORT,
            )  # fmt: skip
        return None, 0
    last = max(good + bad)
    return last in good, last


def _not_converged(text: Text, at: int) -> Finding:
    return Finding(
        "optimisation-not-converged",
        "warning",
        text.source.name,
        text.line_number(at),
        "the optimisation did not reach its thresholds",
        "optimise on from the last geometry, with more cycles",
    )
