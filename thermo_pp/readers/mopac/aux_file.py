"""The AUX file of MOPAC: keys with units and counts, values on the lines below."""

from __future__ import annotations

import math
import re
from collections import Counter

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import NUMBERS
from thermo_pp.errors import Finding
from thermo_pp.names import Origin
from thermo_pp.readers import joined_hessian
from thermo_pp.readers.mopac import job
from thermo_pp.readers.mopac.masses import average
from thermo_pp.readers.text import CUT_SHORT, Text
from thermo_pp.records import Calculation, Printed
from thermo_pp.sources import Source
from thermo_pp.units import HARTREE_KJ_MOL

FloatArray = NDArray[np.float64]

_START = re.compile(rb"^ START OF MOPAC (?:FILE|PROGRAM)\b", re.MULTILINE)
_JOB = b" START OF MOPAC FILE"
_END = re.compile(rb"^ END OF MOPAC (?:FILE|PROGRAM)\b", re.MULTILINE)
_NEXT = re.compile(rb"[ \t]*(?:#|\r?\n|END OF|START OF|[A-Za-z][^ \t\r\n]*[=:\[])")
_FORMULA = re.compile(rb'^ EMPIRICAL_FORMULA="([A-Za-z\d ]*?) *=', re.MULTILINE)
_ELEMENT = re.compile(r"([A-Z][a-z]?)(\d*)")
_ERROR = re.compile(rb'^ ERROR(?:_MESSAGE)?="([^"\n]*)', re.MULTILINE)


def sniff(head: bytes) -> bool:
    """Tell whether the file is an AUX file."""
    first = head[:4096]
    started = b" START OF MOPAC " in first and _START.search(first) is not None
    return started and b"MOPAC_VERSION=" in head


class _Aux:
    """The keys of one job: each taken where it last stands."""

    def __init__(self, text: Text) -> None:
        self.text = text

    def find(self, key: str) -> re.Match[bytes] | None:
        """Return the last line of the key: groups unit, count, what follows the equals sign."""
        pattern = re.compile(
            rb"^ "
            + re.escape(key.encode())
            + rb"(?=[:\[=])(?::([^=\[\n]*))?(?:\[0*(\d+)\])?=?([^\n]*)\n",
            re.MULTILINE,
        )
        found = list(pattern.finditer(self.text.data, self.text.start, self.text.end))
        return found[-1] if found else None

    def number(self, key: str) -> tuple[str, int] | None:
        """Return the digits and the place of a single number, None where the key is missing."""
        match = self.find(key)
        if match is None:
            return None
        at = match.start(3)
        digits = self.text.exact_text(at, key)
        if not math.isfinite(float(digits)):
            raise self.text.expected(at, f"a finite number, {key}")
        return digits, at

    def words(self, key: str, count: int) -> tuple[list[bytes], int] | None:
        """Return `count` words below the key; ReadError where there are others, None where it is missing."""
        match = self.find(key)
        if match is None:
            return None
        if match.group(2) is None or int(match.group(2)) != count:
            raise self.text.expected(match.start(), f"{count} values of {key}")
        words: list[bytes] = []
        at = match.start(3)
        while len(words) < count:
            line = self.text.rest(at)
            if not line.startswith(b" #"):
                words += line.split()
            if len(words) < count:
                at = self.text.next_line(at)
        if len(words) != count:
            raise self.text.expected(at, f"{count} values of {key}")
        if count:
            after = self.text.next_line(at)
            if _NEXT.match(self.text.data, after) is None:
                raise self.text.expected(after, f"the end of the {count} values of {key}")
        return words, match.start()

    def array(self, key: str, count: int) -> tuple[FloatArray, int] | None:
        """Return `count` numbers below the key, and where it stands; None where it is missing."""
        found = self.words(key, count)
        if found is None:
            return None
        values = joined_hessian.numbers(b" ".join(found[0]))
        if values is None:
            raise self.text.expected(found[1], f"{count} numbers of {key}")
        return values, found[1]

    def need(self, key: str, count: int) -> tuple[FloatArray, int]:
        """Return `count` numbers below the key; ReadError where it is missing."""
        found = self.array(key, count)
        if found is None:
            raise self.text.error(self.text.end, f"no {key} in this AUX file", mend=CUT_SHORT)
        return found

    def quoted(self, key: str) -> tuple[str, int]:
        """Return the text of a key; ReadError where it is missing."""
        match = self.find(key)
        if match is None:
            raise self.text.error(self.text.end, f"no {key} in this AUX file", mend=CUT_SHORT)
        value = match.group(3).decode("utf-8", "replace").strip().strip('"').strip()
        return value, match.start(3)


def read(source: Source) -> Calculation:
    """Read one AUX file of one job."""
    text = Text(source)
    failed = _ERROR.search(text.data)
    if failed is not None:
        reason = failed.group(1).decode("utf-8", "replace").strip()
        raise text.error(
            failed.start(), f"the job failed: {reason[:120]}", mend="mend the job and rerun it"
        )
    if _END.search(text.data) is None:
        raise text.error(text.end, "no 'END OF MOPAC FILE': the job did not end", mend=CUT_SHORT)
    jobs = text.all(_JOB)
    if len(jobs) > 1:
        raise text.error(
            jobs[1], "several jobs in one AUX file", mend="give each job an input of its own"
        )
    aux = _Aux(text)
    keywords, keywords_at = aux.quoted("KEYWORDS")
    keys = job.words(keywords)
    job.check(text, keywords_at, keys)
    translation = aux.find("INITIAL_TRANS_VECTS")
    if translation is not None:
        raise job.periodic(text, translation.start())
    ends = text.all(b" ATOM_X_OPT:")
    if len(ends) > 1:
        raise job.path(text, ends[1])
    method, method_at = aux.quoted("METHOD")
    version, version_at = aux.quoted("MOPAC_VERSION")
    numbers = _elements(aux)
    n = len(numbers)
    shape = aux.need("ATOM_X" if n == 1 else "ATOM_X_OPT", 3 * n)
    positions = shape[0].reshape(n, 3)
    masses, origin, masses_at = _masses(aux, numbers)
    energy = aux.number("TOTAL_ENERGY")
    charge, charge_at = _charge(aux, n, keys, keywords_at)
    multiplicity, multiplicity_at = _multiplicity(aux, keys, keywords_at)
    at = {
        "method": method_at,
        "program_version": version_at,
        "positions_angstrom": shape[1],
        "charge": charge_at,
    }
    if multiplicity is not None:
        at["multiplicity"] = multiplicity_at
    if origin == "printed":
        at["masses_u"] = masses_at
    if energy is not None:
        at["energy_hartree"] = energy[1]
    printed: dict[str, Printed] = {}
    findings: list[Finding] = []
    heat = aux.number("HEAT_OF_FORMATION")
    if heat is not None:
        printed["heat_of_formation"] = Printed(heat[0], "kcal/mol", text.line_number(heat[1]))
        if energy is None:
            shown = f"{float(heat[0]):.10g}"
            findings.append(job.heat_only(source.name, text.line_number(heat[1]), shown))
    elif energy is None:
        findings.append(job.nothing(source.name))
    if energy is not None:
        findings += _coarse(source.name, Printed(energy[0], "eV", text.line_number(energy[1])))
    vibrations = _vibrations(aux, masses, positions)
    wavenumbers = modes = hessian = None
    if vibrations is not None:
        wavenumbers, modes, hessian, at["wavenumbers_cm"] = vibrations
        printed |= _thermochemistry(aux)
        if "zero_point" in printed:
            value = printed["zero_point"]
            findings += job.zero_point_differs(
                source.name, value.line, wavenumbers, value.value, value.step
            )
    kinds = ("optimisation",) if aux.find("ATOM_X_UPDATED") is not None else ()
    if wavenumbers is not None:
        kinds = (*kinds, "frequencies")
    return Calculation(
        path=source.name,
        sha256=source.sha256,
        program="mopac",
        program_version=version,
        method=method.upper(),
        dispersion="none",
        solvent=job.solvent(keys),
        grid="none",
        frozen_core="none",
        numbers=numbers,
        positions_angstrom=positions,
        masses_u=masses,
        masses_origin=origin,
        charge=charge,
        multiplicity=multiplicity,
        energy_hartree=None if energy is None else float(energy[0]) * job.EV_HARTREE,
        energy_label=None if energy is None else "semiempirical",
        wavenumbers_cm=wavenumbers,
        modes=modes,
        hessian_hartree_bohr2=hessian,
        kind_of_job=kinds or ("energy",),
        printed=printed,
        where=text.line_numbers(at),
        findings=tuple(findings),
    )


def _coarse(name: str, energy: Printed) -> tuple[Finding, ...]:
    """Return a finding where the energy has too few digits for a barrier."""
    half = 0.5 * energy.step * job.EV_HARTREE * HARTREE_KJ_MOL
    if half < 0.02:
        return ()
    return (
        Finding(
            "energy-of-few-digits",
            "warning",
            name,
            energy.line,
            f"the total energy is printed to {half:.2g} kJ/mol only",
            "write the file with AUX(PRECISION=9)",
        ),
    )


def _elements(aux: _Aux) -> NDArray[np.int64]:
    match = aux.find("ATOM_EL")
    if match is None or match.group(2) is None or not 0 < int(match.group(2)) < 1_000_000:
        raise aux.text.error(aux.text.end, "no ATOM_EL in this AUX file", mend=CUT_SHORT)
    found = aux.words("ATOM_EL", int(match.group(2)))
    assert found is not None
    symbols = [word.decode("utf-8", "replace").capitalize() for word in found[0]]
    unknown = [symbol for symbol in symbols if symbol not in NUMBERS]
    if unknown:
        raise aux.text.error(found[1], f"{unknown[0][:20]!r} is no element", mend=CUT_SHORT)
    formula = _FORMULA.search(aux.text.data, aux.text.start, aux.text.end)
    if formula is not None:
        words = [_ELEMENT.fullmatch(word) for word in formula.group(1).decode().split()]
        told = {word.group(1): int(word.group(2) or 1) for word in words if word is not None}
        if None not in words and not set(symbols) & {"D", "T"} and told != Counter(symbols):
            raise aux.text.error(
                found[1],
                f"not the elements of the formula on line {aux.text.line_number(formula.start())}",
                mend=CUT_SHORT,
            )
    return np.array([NUMBERS[symbol] for symbol in symbols], dtype=np.int64)


def _masses(aux: _Aux, numbers: NDArray[np.int64]) -> tuple[FloatArray, Origin, int]:
    """Return the masses listed, else the averages; the molecular weight must be their sum."""
    listed = aux.array("ISOTOPIC_MASSES", len(numbers))
    masses = average(numbers) if listed is None else listed[0]
    if masses is None:
        raise aux.text.error(
            0, "no ISOTOPIC_MASSES in this AUX file, and elements whose masses are not known here",
            mend="give the AUX file of a FORCE job, which lists them",
        )  # fmt: skip
    weight = aux.number("MOLECULAR_WEIGHT")
    if weight is not None:
        digits = max(5e-6 * float(weight[0]), 1e-4 * len(numbers))
        if abs(float(weight[0]) - float(masses.sum())) > digits:
            raise aux.text.error(
                weight[1],
                f"the molecular weight is {float(weight[0])}, the masses add up to {masses.sum():.4f}",
                mend="the file is damaged, or masses were changed in a job that does not list them",
            )
    if np.any(masses <= 0.0):
        raise aux.text.error(0, "a mass that is not above 0", mend=CUT_SHORT)
    return masses, ("derived" if listed is None else "printed"), 0 if listed is None else listed[1]


def _charge(aux: _Aux, atoms: int, keys: list[str], keys_at: int) -> tuple[int, int]:
    """Return the charge by the keywords; the electrons, where they are counted, must agree."""
    named = job.charge(keys)
    electrons, cores = aux.number("NUM_ELECTRONS"), aux.array("ATOM_CORE", atoms)
    if electrons is not None and cores is not None:
        counted = round(float(cores[0].sum())) - round(float(electrons[0]))
        if counted != named:
            raise aux.text.error(
                electrons[1],
                f"the electrons make a charge of {counted}, the keywords one of {named}",
                mend=CUT_SHORT,
            )
    return named, keys_at


def _multiplicity(aux: _Aux, keys: list[str], keys_at: int) -> tuple[int | None, int]:
    """Return the multiplicity by a keyword, else by the electrons of each spin."""
    alpha, beta = aux.number("NUM_ALPHA_ELECTRONS"), aux.number("NUM_BETA_ELECTRONS")
    named = job.spin(keys)
    if alpha is not None and beta is not None and float(alpha[0]) > 0.0:
        count = round(float(alpha[0]) - float(beta[0])) + 1
        return (count, alpha[1]) if named in (None, count) and count >= 1 else (named, keys_at)
    if named is not None:
        return named, keys_at
    electrons, spin = aux.number("NUM_ELECTRONS"), aux.number("TOTAL_SPIN")
    if electrons is not None and spin is not None and float(spin[0]) == 0.0:
        return (1, electrons[1]) if round(float(electrons[0])) % 2 == 0 else (None, 0)
    return None, 0


def _vibrations(
    aux: _Aux, masses: FloatArray, positions: FloatArray
) -> tuple[FloatArray, FloatArray | None, FloatArray | None, int] | None:
    """Return wavenumbers, displacements, Hessian and where the first stand; None without a FORCE job."""
    n = len(masses)
    if n == 1:
        return None
    listed = aux.array("VIB._FREQ", 3 * n)
    if listed is None:
        return None
    count = job.genuine(masses, positions)
    wavenumbers = listed[0][:count]
    order = np.argsort(wavenumbers, kind="stable")
    wavenumbers = wavenumbers[order]
    frame = aux.array("ORIENTATION_ATOM_X", 3 * n)
    modes = hessian = None
    vectors = aux.array("NORMAL_MODES", 9 * n * n)
    root = np.sqrt(masses)
    if frame is not None and vectors is not None:
        moved = vectors[0].reshape(3 * n, n, 3)[:count][order] / root[:, np.newaxis]
        lengths = np.sqrt(np.sum(moved**2, axis=(1, 2)))
        if np.any(lengths < 1e-3):
            raise aux.text.error(vectors[1], "a normal mode without displacements", mend=CUT_SHORT)
        modes = job.turned(
            moved / lengths[:, np.newaxis, np.newaxis], frame[0].reshape(n, 3), positions
        )
    weighted = aux.array("HESSIAN_MATRIX", 3 * n * (3 * n + 1) // 2)
    matrix = None if weighted is None else joined_hessian.square(weighted[0], n)
    if frame is not None and matrix is not None:
        each = np.repeat(root, 3)
        matrix = matrix * np.outer(each, each) * job.MILLIDYNE_ANGSTROM
        rows = job.turned(matrix.reshape(3 * n, n, 3), frame[0].reshape(n, 3), positions)
        if rows is not None:
            columns = job.turned(
                rows.reshape(3 * n, 3 * n).T.reshape(3 * n, n, 3), frame[0].reshape(n, 3), positions
            )
            assert columns is not None
            matrix = columns.reshape(3 * n, 3 * n)
            if joined_hessian.modes_of(matrix, masses, positions, wavenumbers) is not None:
                hessian = matrix  # else its four decimals are too few
    return wavenumbers, modes, hessian, listed[1]


def _thermochemistry(aux: _Aux) -> dict[str, Printed]:
    """Return the zero-point energy, and temperature and entropy of the first temperature."""
    printed: dict[str, Printed] = {}
    zero_point = aux.number("ZERO_POINT_ENERGY")
    if zero_point is not None:
        line = aux.text.line_number(zero_point[1])
        printed["zero_point"] = Printed(zero_point[0], "kcal/mol", line)
    for name, key, unit in (
        ("temperature", "THERMODYNAMIC_PROPERTIES_TEMPS", "K"),
        ("entropy", "ENTROPY_TOT", "cal/(mol K)"),
    ):
        match = aux.find(key)
        if match is None or match.group(2) is None or not 0 < int(match.group(2)) < 100_000:
            continue
        words = aux.words(key, int(match.group(2)))
        assert words is not None
        at = aux.text.next_line(words[1])
        aux.text.exact_text(at, name)
        printed[name] = Printed(words[0][0].decode(), unit, aux.text.line_number(at))
    return printed
