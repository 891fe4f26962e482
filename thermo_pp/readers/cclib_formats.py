"""Outputs of programs without a reader here, through cclib (extra ``thermo-pp[formats]``), checked against the file.

cclib's answer is not trusted. The job must have ended normally; the energy must stand in the file in hartree, be the
one of the highest method that the file speaks of, and belong to the last geometry; there must be 3N-6 or 3N-5
modes, their zero-point energy must be the printed one, or a Hessian must have them; whatever does not add up is a
`ReadError`. No thermochemistry is taken. Nothing is executed or fetched: cclib sees the text only.

A formatted checkpoint has no mark of its end; its arrays must be whole, and its ``Total Energy`` is taken.
"""

from __future__ import annotations

import contextlib
import importlib.util
import io
import logging
import re
import warnings
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import AVERAGE_MASSES, ISOTOPES, MOST_ABUNDANT, SYMBOLS
from thermo_pp.errors import Finding, ReadError
from thermo_pp.names import Origin
from thermo_pp.readers import cclib_checks as checks
from thermo_pp.readers import checkpoint
from thermo_pp.readers.text import CUT_SHORT, Text
from thermo_pp.records import Calculation
from thermo_pp.sources import Source

FloatArray = NDArray[np.float64]

NAME = "cclib"
LOOKS_FOR = (
    "with the extra thermo-pp[formats] also the headings of ADF, DALTON, Firefly, GAMESS-UK, Jaguar, Molcas, "
    "Molpro, Turbomole and of formatted checkpoints"
)


class Format(NamedTuple):
    """A program: its name, cclib's parser, its heading, its mark of a normal end (None: cclib says), its masses.

    `electrons` are the lines of which cclib makes charge and multiplicity, where they are known.
    """

    program: str
    parser: str
    heading: re.Pattern[bytes]
    end: bytes | None = None
    average_masses: bool = False
    electrons: tuple[bytes, bytes] | None = None


_CHECKPOINT = "formatted checkpoint"
FORMATS: tuple[Format, ...] = (
    Format("ADF", "ADF", re.compile(rb"Amsterdam Density Functional +\(ADF\)")),
    Format("DALTON", "DALTON", re.compile(rb"Dalton - An Electronic Structure Program")),
    Format("Firefly", "GAMESS", re.compile(rb"^ +\* +(?:PC GAMESS|Firefly) [Vv]ersion", re.M)),
    Format("GAMESS-UK", "GAMESSUK", re.compile(rb"G A M E S S - U K")),
    Format("Jaguar", "Jaguar", re.compile(rb"^ *\|? *Jaguar version \d", re.MULTILINE)),
    Format("Molcas", "Molcas", re.compile(rb"^ *This run of MOLCAS", re.M), b"Happy landing"),
    Format(
        "Molpro",
        "Molpro",
        re.compile(rb"\*\*\* +PROGRAM SYSTEM MOLPRO +\*\*\*"),
        electrons=(b"\n NUMBER OF ELECTRONS:", b"\n NUMBER OF ELECTRONS:"),
    ),
    Format(
        "Turbomole",
        "Turbomole",
        re.compile(rb": TURBOMOLE (?:V|rev)|Copyright \(C\) \d{4} TURBOMOLE GmbH"),
        None,
        True,
    ),
    Format(
        _CHECKPOINT,
        "FChk",
        re.compile(
            rb"\A[^\n]*\n(?:SP|FOpt|Freq|POpt|FTS|Force|Mixed|Scan)\b[^\n]*\nNumber of atoms +I +\d+\r?\n"
        ),
        electrons=(b"\nCharge  ", b"\nMultiplicity  "),
    ),
)


def sniff(head: bytes) -> bool:
    """Tell whether `head`, the first 64 KiB of a file, is of one of `FORMATS`, and cclib is there to read it."""
    return _format(head) is not None and importlib.util.find_spec("cclib") is not None


def _format(head: bytes) -> Format | None:
    return next((one for one in FORMATS if one.heading.search(head)), None)


def read(source: Source) -> Calculation:
    """Read one output through cclib.

    Raises
    ------
    ReadError
        Whatever cclib raises, a job that did not end normally, an answer of cclib that the file does not bear out.
    """
    text = Text(source)
    form = _format(source.head)
    if form is None:
        raise text.error(0, "none of the formats that are read through cclib", mend=CUT_SHORT)
    if form.program == _CHECKPOINT:
        checkpoint.check_arrays(text)
    data = _parse(text, form)
    metadata: dict[str, Any] = getattr(data, "metadata", {})
    if form.program != _CHECKPOINT and not (
        metadata.get("success") is True if form.end is None else text.find(form.end) >= 0
    ):
        raise text.error(
            text.end, "the job did not end normally, as cclib reads it", mend=CUT_SHORT
        )
    try:
        return _calculation(text, form, data, metadata)
    except ReadError:
        raise
    except Exception as error:  # an answer of another form than the checks expect
        raise _strange(text, error) from error


def _parse(text: Text, form: Format) -> Any:
    """Return what cclib reads; ReadError with the reason where it raises anything, or says nothing."""
    quiet = io.StringIO()
    logger: logging.Logger | None = None
    try:
        with (
            warnings.catch_warnings(),
            np.errstate(all="ignore"),
            contextlib.redirect_stdout(quiet),
            contextlib.redirect_stderr(quiet),
        ):
            warnings.simplefilter("ignore")
            from cclib import parser
            from cclib.parser.logfilewrapper import FileWrapper

            stream = io.StringIO(text.data.decode("utf-8", "replace").replace("\r\n", "\n"))
            reader = getattr(parser, form.parser)(
                FileWrapper(stream), loglevel=logging.CRITICAL + 1, logstream=quiet
            )
            logger = reader.logger
            return reader.parse()
    except Exception as error:
        raise _strange(text, error) from error
    finally:
        for handler in list(logger.handlers) if logger is not None else []:
            assert logger is not None
            logger.removeHandler(handler)


def _strange(text: Text, error: Exception) -> ReadError:
    reason = f"{type(error).__name__}: {error}".strip()
    return text.error(
        0,
        f"cclib does not read this file: {reason[:200]}",
        mend="the output is damaged, or of a kind that cclib does not know",
    )


def _calculation(text: Text, form: Format, data: Any, metadata: dict[str, Any]) -> Calculation:
    numbers, geometries = _geometries(text, data)
    positions = geometries[-1]
    charge, multiplicity = _state(text, data, numbers)
    if form.program == _CHECKPOINT:
        checkpoint.check_answer(text, data)
    energy, label, energy_at = _energy(text, form, data, metadata, geometries)
    masses, origin = _masses(text, form, data, numbers)
    at = {} if energy_at is None else {"energy_hartree": energy_at}
    for name, mark in zip(("charge", "multiplicity"), form.electrons or (), strict=False):
        if (place := text.last(mark)) >= 0:
            at[name] = place + 1
    placed = checks.positions_at(text, positions)
    if placed is not None:
        at["positions_angstrom"] = placed
    findings: list[Finding] = []
    if energy is None:
        if not hasattr(data, "vibfreqs"):
            raise text.error(text.end, "no energy in what cclib reads", mend=CUT_SHORT)
        findings.append(_no_energy(text.source.name))
    wavenumbers = modes = hessian = None
    if hasattr(data, "vibfreqs"):
        wavenumbers, modes, hessian = _modes(text, data, masses, positions, at)
        if origin == "derived" and hessian is None:
            findings.append(_masses_assumed(text.source.name))
    excited = hasattr(data, "etenergies")
    optimised = bool(data.optdone) if hasattr(data, "optdone") else None
    if excited and (optimised is not None or wavenumbers is not None):
        raise text.error(
            0,
            "excited states in an optimisation or frequency job, whose surface cclib does not tell",
            mend="give a job on the ground state",
        )
    if optimised is False:
        findings.append(_not_converged(text.source.name))
    kinds = [] if optimised is None else ["optimisation"]
    kinds += [] if wavenumbers is None else ["frequencies"]
    if not kinds:
        kinds = ["energy"] if energy is not None else []
    lines = text.line_numbers(at)
    return Calculation(
        path=text.source.name,
        sha256=text.source.sha256,
        program=form.program,
        program_version=_words(metadata.get("package_version")),
        method=checkpoint.method(text) if form.program == _CHECKPOINT else _method(label, metadata),
        basis=checkpoint.basis(text)
        if form.program == _CHECKPOINT
        else _words(metadata.get("basis_set")),
        solvent=_words(metadata.get("solvent_model")),
        numbers=numbers,
        positions_angstrom=positions,
        masses_u=masses,
        masses_origin=origin,
        charge=charge,
        multiplicity=multiplicity,
        energy_hartree=energy,
        energy_label=label,
        wavenumbers_cm=wavenumbers,
        modes=modes,
        hessian_hartree_bohr2=hessian,
        optimised=optimised,
        kind_of_job=tuple(kinds),
        where={field: lines[field] for field in at},
        findings=tuple(findings),
    )


def _words(value: object) -> str | None:
    return str(value) if value else None


def _geometries(text: Text, data: Any) -> tuple[NDArray[np.int64], FloatArray]:
    numbers = np.asarray(getattr(data, "atomnos", []), dtype=np.int64)
    geometries = np.asarray(getattr(data, "atomcoords", []), dtype=np.float64)
    if geometries.ndim != 3 or geometries.shape[1:] != (len(numbers), 3) or not len(numbers):
        raise text.error(0, "no geometry in what cclib reads", mend=CUT_SHORT)
    if np.any(numbers < 1) or np.any(numbers >= len(SYMBOLS)):
        raise text.error(0, "an atom of no element in what cclib reads", mend="remove ghost atoms")
    if not np.all(np.isfinite(geometries)) or np.abs(geometries).max() > 1e6:
        raise text.error(0, "a position that is none in what cclib reads", mend=CUT_SHORT)
    if checks.closest(geometries[-1]) < 0.3:
        raise text.error(0, "two atoms at one place in what cclib reads", mend=CUT_SHORT)
    checks.check_repulsion(text, numbers, geometries[-1])
    if hasattr(data, "scanparm") or hasattr(data, "scancoords"):
        raise text.error(0, "a scan, which is not read through cclib", mend="give one structure")
    return numbers, geometries


def _state(text: Text, data: Any, numbers: NDArray[np.int64]) -> tuple[int | None, int | None]:
    charge, multiplicity = getattr(data, "charge", None), getattr(data, "mult", None)
    if charge is not None and multiplicity is not None:
        electrons = int(numbers.sum()) - int(charge)
        unpaired = int(multiplicity) - 1
        if not 0 <= unpaired <= electrons or (electrons - unpaired) % 2:
            raise text.error(
                0,
                f"charge {charge} and multiplicity {multiplicity} that cclib reads do not fit the atoms",
                mend=CUT_SHORT,
            )
    return (
        None if charge is None else int(charge),
        None if multiplicity is None else int(multiplicity),
    )


def _energy(
    text: Text, form: Format, data: Any, metadata: dict[str, Any], geometries: FloatArray
) -> tuple[float | None, str | None, int | None]:
    """Return the energy as printed, its label and where it stands; None where there is none."""
    if form.program == _CHECKPOINT:
        return checkpoint.energy(text)
    from cclib.parser.utils import convertor

    per_hartree = float(convertor(1.0, "hartree", "eV"))
    scf = [float(one) / per_hartree for one in getattr(data, "scfenergies", [])]
    if not scf:
        if hasattr(data, "ccenergies") or hasattr(data, "mpenergies"):
            raise text.error(0, "a correlated energy without that of its SCF", mend=CUT_SHORT)
        return None, None, None
    steps = len(geometries)
    same = np.allclose(geometries, geometries[-1], rtol=0.0, atol=1e-5)
    twice = steps > 1 and np.allclose(geometries[-1], geometries[-2], rtol=0.0, atol=1e-5)
    alike = max(scf) - min(scf) < 1e-8
    fits = (len(scf) == steps and hasattr(data, "optdone")) or (len(scf) == steps - 1 and twice)
    if not (alike and same) and not fits:
        raise text.error(
            0,
            f"{len(scf)} energies and {steps} geometries in what cclib reads, which do not tell what belongs together",
            mend="give a single calculation",
        )
    value, label = scf[-1], None
    series: list[tuple[Any, str | None]]
    series = [(one, None) for one in getattr(data, "ccenergies", [])]
    if not series:
        series = [(one[-1], f"MP{len(one) + 1}") for one in getattr(data, "mpenergies", [])]
    if series:
        if len(series) not in (1, len(scf)):
            raise text.error(0, "correlated energies of some geometries only", mend=CUT_SHORT)
        value, label = float(series[-1][0]) / per_hartree, series[-1][1]
    printed, at = checks.energy_line(text, value)
    label = _label(text.line(at).upper(), label, bool(series), metadata)
    if series and label is None:
        raise text.error(at, "a correlated energy without the name of its method", mend=CUT_SHORT)
    if series and not -0.05 * abs(scf[-1]) - 0.5 < printed - scf[-1] < 1e-6:
        raise text.error(at, "a correlated energy far from that of its SCF", mend=CUT_SHORT)
    checks.check_highest(text, label)
    return printed, label, at


def _label(line: str, label: str | None, correlated: bool, metadata: dict[str, Any]) -> str | None:
    """Return which energy stands on a line."""
    methods = [str(one).upper() for one in metadata.get("methods", [])]
    if correlated:
        named = [one for one in ("CCSD(T)", "CCSD", "CCD", "MP4", "MP3", "MP2") if one in line]
        if named:
            return named[0]
        return (
            label
            if label in checks.RANKS
            else next(
                (
                    one
                    for one in reversed(methods)
                    if one in checks.RANKS and one not in ("HF", "DFT")
                ),
                None,
            )
        )
    if metadata.get("functional") or "DFT" in methods or re.search(r"[RU]KS|DFT|KOHN", line):
        return "DFT"
    return "HF" if "HF" in methods or re.search(r"[RU]HF|HARTREE-FOCK", line) else None


def _method(label: str | None, metadata: dict[str, Any]) -> str | None:
    if label == "DFT":
        functional = metadata.get("functional")
        return str(functional).upper() if functional else None
    return label


def _masses(
    text: Text, form: Format, data: Any, numbers: NDArray[np.int64]
) -> tuple[FloatArray, Origin]:
    """Return the masses that cclib reads, else those that the program is known to take."""
    if form.program == _CHECKPOINT and (analysed := checkpoint.masses(text, len(numbers))):
        return np.array(analysed), "printed"
    found = np.asarray(getattr(data, "atommasses", []), dtype=np.float64)
    if found.shape == numbers.shape:
        low, high = 0.4 * numbers, 4.0 * numbers + 4.0
        if np.all((low < found) & (found < high)):
            return found, "printed"
    if form.average_masses:
        return np.array([AVERAGE_MASSES[z] for z in numbers]), "derived"
    return np.array([ISOTOPES[SYMBOLS[z]][MOST_ABUNDANT[z]] for z in numbers]), "derived"


def _modes(
    text: Text, data: Any, masses: FloatArray, positions: FloatArray, at: dict[str, int]
) -> tuple[FloatArray, FloatArray | None, FloatArray | None]:
    """Return wavenumbers, displacements and Hessian (None where there is none); ReadError where they do not add up."""
    all_modes = np.asarray(data.vibfreqs, dtype=np.float64)
    keep = checks.vibrations(text, all_modes, masses, positions)
    wavenumbers = all_modes[keep]
    checks.check_signs(text, wavenumbers)
    places = [checks.printed_at(text, float(one)) for one in wavenumbers]
    missing = [one for one, found in zip(wavenumbers, places, strict=True) if not found]
    if missing:
        raise text.error(
            0,
            f"the wavenumber {missing[0]} that cclib reads is not printed in this file",
            mend=CUT_SHORT,
        )
    if places:
        at["wavenumbers_cm"] = at["modes"] = places[0][-1]
    zero_point = getattr(data, "zpve", None)
    printed = checks.check_zero_point(
        text, wavenumbers, None if zero_point is None else float(zero_point)
    )
    size = 3 * len(masses)
    hessian = np.asarray(getattr(data, "hessian", []), dtype=np.float64)
    known = hessian.shape == (size, size) and bool(np.any(hessian))
    if known:
        checks.check_hessian(text, hessian, masses, positions, wavenumbers)
    elif printed is None and len(wavenumbers):
        raise text.error(
            0,
            "neither a zero-point energy nor a Hessian to check the unit of the modes that cclib reads",
            mend="give a format with a reader of its own (docs/readers.md)",
        )
    displacements = np.asarray(getattr(data, "vibdisps", []), dtype=np.float64)
    modes = None
    if displacements.shape == (len(all_modes), len(masses), 3):
        modes = checks.unit_modes(displacements[keep], masses)
    if modes is None:
        at.pop("modes", None)
    return wavenumbers, modes, hessian if known else None


def _no_energy(name: str) -> Finding:
    return Finding(
        "no-energy",
        "warning",
        name,
        None,
        "no energy in what cclib reads",
        "name an output with the energy of this geometry",
    )


def _masses_assumed(name: str) -> Finding:
    return Finding(
        "masses-assumed",
        "note",
        name,
        None,
        "no masses in what cclib reads; those that the program is known to take are used",
        "check them where isotopes were given",
    )


def _not_converged(name: str) -> Finding:
    return Finding(
        "optimisation-not-converged",
        "warning",
        name,
        None,
        "the optimisation did not reach its thresholds",
        "optimise on from the last geometry, with more steps",
    )
