"""The text output of MOPAC; several jobs may stand in one file."""

from __future__ import annotations

import math
import re
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import NUMBERS
from thermo_pp.errors import Finding
from thermo_pp.readers.mopac import force, job
from thermo_pp.readers.mopac.masses import average
from thermo_pp.readers.text import CUT_SHORT, Text, holds
from thermo_pp.records import Calculation, Printed
from thermo_pp.sources import Source

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

_HEADING = re.compile(rb"^[ \t]{20,}(\S+) CALCULATION RESULTS[ \t]*\r?$", re.MULTILINE)
_BANNER = re.compile(
    rb"^ \*\*(?:[ \t]+MOPAC v(\d\S*)[ \t]+\*\*|[^\n]*?MOPAC\d*, Version: (\S+?),)", re.MULTILINE
)
_RULE = re.compile(rb"^ \*{79}\r?\n(?! \*)([^\n]*\n)", re.MULTILINE)
_EPS = re.compile(rb"^ \*[ \t]+EPS=", re.MULTILINE)
_SYSTEM_CHARGE = re.compile(rb"^ \*[ \t]+CHARGE ON SYSTEM", re.MULTILINE)
_ENDED = b"JOB ENDED NORMALLY"
_FAULTS = b"Error and normal termination messages reported in this calculation"
_TABLE = re.compile(
    rb"^[ \t]+ATOM[ \t]+CHEMICAL[ \t]+X[ \t]+Y[ \t]+Z[ \t]*\r?\n[^\n]*\(ANGSTROMS\)[^\n]*\n[ \t]*\r?\n",
    re.MULTILINE,
)
_ATOM = re.compile(
    rb"[ \t]*(\d+)[ \t]+([A-Z][a-z]?)(?:\S*)((?:[ \t]+-?\d+\.\d+[ \t]*(?:[*+]\d?)?){3})[ \t]*\r?\n"
)
_INPUT = re.compile(rb"^[ \t]+NUMBER[ \t]+SYMBOL[ \t]+\(ANGSTROMS\)", re.MULTILINE)
_HEADS = re.compile(
    rb"^[ \t]+ATOM[ \t]+CHEMICAL[ \t]+(?:X[ \t]+Y[ \t]+Z|BOND LENGTH)[^\n]*\n[^\n]*\(ANGSTROMS\)",
    re.MULTILINE,
)
_CARTESIAN = re.compile(rb"^[ \t]+CARTESIAN COORDINATES[ \t]*\r?\n", re.MULTILINE)
_PLAIN = re.compile(rb"[ \t]*(\d+)[ \t]+([A-Z][a-z]?)((?:[ \t]+-?\d+\.\d+){3})[ \t]*\r?\n")
_CHANGED = re.compile(
    rb"^[ \t]+Atom:[ \t]+(\d+)[ \t]+\S+[ \t]+Default mass[ \t]+\S+,[ \t]+mass used:[ \t]+(\d+\.\d+)",
    re.MULTILINE,
)
_WEIGHT = re.compile(rb"MOLECULAR WEIGHT[ \t]+=[ \t]+(\d+\.(\d+))")
_HEAT = re.compile(
    rb"^[ \t]+(?:FINAL )?HEAT OF FORMATION[ \t]*=[ \t]+(-?\d+\.\d+|\S+)", re.MULTILINE
)
_TOTAL = re.compile(
    rb"^[ \t]*(?:TOTAL ENERGY[ \t]*=|ETOT \(EONE \+ ETWO\))[ \t]+(\S+)[ \t]+EV", re.MULTILINE
)
_ONE_CENTRE = re.compile(rb"TOTAL OF ONE-CENTER TERMS[ \t]+(-?\d+\.\d{4})[ \t]+EV")
_TWO_CENTRE = re.compile(rb"GRAND TOTAL OF TWO-CENTER TERMS[ \t]+(-?\d+\.\d{4})[ \t]+EV")
_ALPHA = re.compile(rb"NO\. OF ALPHA ELECTRONS[ \t]*=[ \t]*(\d+)")
_BETA = re.compile(rb"NO\. OF BETA[ \t]+ELECTRONS[ \t]*=[ \t]*(\d+)")
_DOUBLY = re.compile(rb"RHF CALCULATION, NO\. OF DOUBLY OCCUPIED LEVELS[ \t]*=[ \t]*(\d+)")
_SINGLY = re.compile(rb"NO\. OF SINGLY OCCUPIED LEVELS[ \t]*=[ \t]*(\d+)")
_FIELD = re.compile(rb"^[ \t]+SCF FIELD WAS ACHIEVED", re.MULTILINE)
_DONE = (b"OPTIMISED USING", b"OPTIMIZED USING", b"WAS SATISFIED", b"TEST SATISFIED")
_SAME_ANGSTROM = 4e-4
"""Two prints of one distance: four decimals of each coordinate."""
_TRANSLATION = re.compile(rb"^[ \t]+\d+[ \t]+Tv[ \t]+-?\d+\.\d+", re.MULTILINE)
_COORDINATE = re.compile(rb"^[ \t]+(?:FOR )?REACTION COORDINATE[ \t]+=", re.MULTILINE)
_LARGE_GRADIENT = b"GRADIENT IS VERY LARGE"


def sniff(head: bytes) -> bool:
    """Tell whether the file is a text output of MOPAC."""
    found = holds(head, b" CALCULATION RESULTS") and _HEADING.search(head) is not None
    return found and (_BANNER.search(head) is not None or b"MOPAC" in head[:4096])


def read(source: Source) -> Calculation:
    """Read one output: the last FORCE job in it, else the last job."""
    whole = Text(source)
    _check_end(whole)
    heads = list(_HEADING.finditer(whole.data))
    ends = [head.start() for head in heads[1:]] + [whole.end]
    parts = [whole.part(head.start(), end) for head, end in zip(heads, ends, strict=True)]
    analysed = [i for i, part in enumerate(parts) if force.is_force(part)]
    taken = analysed[-1] if analysed else len(parts) - 1
    return _calculation(source, whole, parts[taken], heads[taken])


def _calculation(source: Source, whole: Text, part: Text, head: re.Match[bytes]) -> Calculation:
    keys, keys_at = _keywords(part)
    job.check(part, keys_at, keys)
    for mark, refusal in ((_TRANSLATION, job.periodic), (_COORDINATE, job.path)):
        found_at = mark.search(part.data, part.start, part.end)
        if found_at is not None:
            raise refusal(part, found_at.start())
    optimised, optimised_at = _outcome(part)
    numbers, positions, shape_at = _geometry(part)
    masses, masses_at = _masses(part, numbers)
    energy, energy_at = _energy(part)
    heat = _heat(part)
    multiplicity, multiplicity_at = _multiplicity(part, keys)
    banner = _BANNER.search(whole.data)
    at = {"method": head.start(1), "positions_angstrom": shape_at, "charge": keys_at}
    if multiplicity is not None:
        at["multiplicity"] = multiplicity_at
    if banner is not None:
        at["program_version"] = banner.start()
    if masses_at >= 0:
        at["masses_u"] = masses_at
    if energy is not None:
        at["energy_hartree"] = energy_at
    if optimised is not None:
        at["optimised"] = optimised_at
    findings: list[Finding] = []
    printed: dict[str, Printed] = {}
    wavenumbers = modes = None
    if heat is not None:
        printed["heat_of_formation"] = heat
        if energy is None:
            findings.append(job.heat_only(source.name, heat.line, heat.text))
    elif energy is None:
        findings.append(job.nothing(source.name))
    if optimised is False:
        findings.append(
            Finding(
                "optimisation-not-converged",
                "warning",
                source.name,
                part.line_number(optimised_at),
                "the optimisation did not reach its thresholds",
                "optimise on from the last geometry",
            )
        )
    if force.is_force(part):
        found = force.vibrations(part, masses, positions)
        wavenumbers, modes, at["wavenumbers_cm"] = found.wavenumbers_cm, found.modes, found.at
        printed |= force.thermochemistry(part)
        if "zero_point" in printed:
            zero_point = printed["zero_point"]
            findings += job.zero_point_differs(
                source.name, zero_point.line, wavenumbers, zero_point.value, zero_point.step
            )
        large = part.find(_LARGE_GRADIENT)
        if large >= 0:
            findings.append(
                Finding(
                    "not-stationary",
                    "warning",
                    source.name,
                    part.line_number(large),
                    "the frequencies are at a geometry whose gradient the program calls very large",
                    "optimise at this level first",
                )
            )
    kinds = ("optimisation",) if optimised is not None else ()
    if wavenumbers is not None:
        kinds = (*kinds, "frequencies")
    version = None if banner is None else (banner.group(1) or banner.group(2))
    return Calculation(
        path=source.name,
        sha256=source.sha256,
        program="mopac",
        program_version=None if version is None else version.decode("utf-8", "replace"),
        method=head.group(1).decode("utf-8", "replace").upper(),
        dispersion="none",
        solvent=job.solvent(keys),
        grid="none",
        frozen_core="none",
        numbers=numbers,
        positions_angstrom=positions,
        masses_u=masses,
        masses_origin="derived" if masses_at < 0 else "printed",
        charge=job.charge(keys),
        multiplicity=multiplicity,
        energy_hartree=energy,
        energy_label="semiempirical" if energy is not None else None,
        wavenumbers_cm=wavenumbers,
        modes=modes,
        optimised=optimised,
        kind_of_job=kinds or ("energy",),
        printed=printed,
        where=part.line_numbers(at),
        findings=tuple(findings),
    )


def _check_end(text: Text) -> None:
    faults = text.find(_FAULTS)
    if faults >= 0:
        lines = text.data[faults : faults + 4000].decode("utf-8", "replace").splitlines()[1:]
        told = [line.strip(" *") for line in lines if line.startswith(" * ")]
        real = [line for line in told if line and line != _ENDED.decode()]
        if real:
            raise text.error(
                faults, f"the job failed: {real[0][:120]}", mend="mend the job and rerun it"
            )
    if text.last(_ENDED) < 0:
        raise text.error(text.end, "no 'JOB ENDED NORMALLY': the job did not end", mend=CUT_SHORT)


def _keywords(part: Text) -> tuple[list[str], int]:
    """Return the keywords and where they stand: behind the list of what they mean."""
    rule = _RULE.search(part.data, part.start, part.end)
    if rule is None:
        raise part.error(part.start, "no line of keywords after this one", mend=CUT_SHORT)
    keys = job.words(rule.group(1).decode("utf-8", "replace"))
    at = rule.start(1)
    if keys and keys[-1] in ("+", "&"):
        keys += job.words(part.line(part.next_line(at)))
    for mark, key in ((_EPS, "EPS="), (_SYSTEM_CHARGE, "CHARGE=")):
        told = mark.search(part.data, part.start, at)
        if (told is not None) != any(each.startswith(key) for each in keys):
            raise part.error(
                at if told is None else told.start(),
                f"{key} stands either in the keywords or in the list of what they mean, not in both",
                mend=CUT_SHORT,
            )
    return keys, at


def _outcome(part: Text) -> tuple[bool | None, int]:
    """Return whether the optimisation converged, None where there was none, and where it says so."""
    fields = list(_FIELD.finditer(part.data, part.start, part.end))
    if not fields:
        return None, 0
    at = fields[-1].start()
    before = part.data[part.data.rfind(b"\n", 0, max(at - 1, 0)) + 1 : at]
    begin = at - len(before)
    if b"1SCF" in before or not before.strip():
        return None, 0
    return any(mark in before for mark in _DONE), begin


def _geometry(part: Text) -> tuple[IntArray, FloatArray, int]:
    """Return the geometry with the most decimals: Cartesian tables first, the last of each kind."""
    tables = [(match, _ATOM) for match in _TABLE.finditer(part.data, part.start, part.end)]
    tables += [(match, _PLAIN) for match in _CARTESIAN.finditer(part.data, part.start, part.end)]
    inputs = len(_INPUT.findall(part.data, part.start, part.end))
    if not tables or not inputs or inputs != len(_HEADS.findall(part.data, part.start, part.end)):
        raise part.error(part.start, "no geometry of the input after this line", mend=CUT_SHORT)
    found: list[tuple[int, int, IntArray, FloatArray]] = []
    for match, pattern in tables:
        read = _rows(part, match.end(), pattern)
        if read is not None:
            decimals, numbers, positions, end = read
            found.append((min(decimals, 8), match.end(), numbers, positions))
            behind = _rows(part, end, _PLAIN) if pattern is _ATOM else None
            if behind is not None and _CARTESIAN.search(part.data, end, behind[3]) is None:
                # the same once more, its heading damaged
                found.append((min(behind[0], 8), end, behind[1], behind[2]))
        elif pattern is _ATOM:
            raise part.expected(match.end(), "the position of atom 1")
    if any(len(one[2]) != len(found[0][2]) for one in found):
        raise part.error(found[-1][1], "two geometries of different atoms", mend=CUT_SHORT)
    if not found:
        raise part.error(part.start, "no Cartesian geometry after this line", mend=CUT_SHORT)
    _check_pairs(part, found)
    last = max(at for _, at, _, _ in found)
    results = part.last(b"FINAL HEAT OF FORMATION")
    if last < results:
        raise part.error(results, "no final geometry after this line", mend=CUT_SHORT)
    final = next(one for one in found if one[1] == last)
    same = [
        one
        for one in found
        if np.array_equal(one[2], final[2])
        and np.max(np.abs(_distances(one[3]) - _distances(final[3]))) < _SAME_ANGSTROM
    ]
    _, at, numbers, positions = max(same, key=lambda one: (one[0], one[1]))
    return numbers, positions, at


def _check_pairs(part: Text, found: list[tuple[int, int, IntArray, FloatArray]]) -> None:
    """Refuse a table of input or final coordinates that is not the one in Cartesian coordinates behind it."""
    tables = {match.end() for match in _TABLE.finditer(part.data, part.start, part.end)}
    ordered = sorted(found, key=lambda one: one[1])
    for one, after in pairwise(ordered):
        if one[1] not in tables or after[1] in tables:
            continue
        off = np.max(np.abs(_distances(one[3]) - _distances(after[3])))
        if off > _SAME_ANGSTROM or not np.array_equal(one[2], after[2]):
            raise part.error(
                after[1], "the same geometry is printed twice and differs", mend=CUT_SHORT
            )


def _distances(positions: FloatArray) -> FloatArray:
    return np.asarray(np.linalg.norm(positions[:, np.newaxis] - positions, axis=-1))


def _rows(
    part: Text, at: int, pattern: re.Pattern[bytes]
) -> tuple[int, IntArray, FloatArray, int] | None:
    """Return decimals, atomic numbers and positions of a table and its end, None where no atom follows."""
    for _ in range(4):  # headings and empty lines
        if pattern.match(part.data, at, part.end) is not None:
            break
        stop = part.data.find(b"\n", at, part.end)
        if stop < 0:
            return None
        at = stop + 1
    numbers: list[int] = []
    positions: list[list[float]] = []
    decimals = 99
    while (row := pattern.match(part.data, at, part.end)) is not None:
        symbol = row.group(2).decode()
        element = {"D": 1, "T": 1}.get(symbol, NUMBERS.get(symbol, 0))
        if int(row.group(1)) != len(numbers) + 1 or not element:
            raise part.expected(at, f"atom {len(numbers) + 1} of an element")
        texts = re.findall(rb"-?\d+\.\d+", row.group(3))
        decimals = min(decimals, *(len(each.partition(b".")[2]) for each in texts))
        numbers.append(element)
        positions.append([float(each) for each in texts])
        at = row.end()
    if not numbers:
        return None
    rest = part.rest(at).split()
    if len(rest) >= 4 and rest[0].isdigit() and int(rest[0]) == len(numbers) + 1:
        raise part.expected(at, f"the position of atom {len(numbers) + 1}")
    return decimals, np.array(numbers, dtype=np.int64), np.array(positions), at


def _masses(part: Text, numbers: IntArray) -> tuple[FloatArray, int]:
    """Return the masses and where the file says that they were changed, -1 where it does not."""
    masses = average(numbers)
    weights = list(_WEIGHT.finditer(part.data, part.start, part.end))
    weight = weights[-1] if weights else None
    if masses is None:
        raise part.error(
            part.start if weight is None else weight.start(),
            "the masses that MOPAC takes for these elements are not known here",
            mend="give the AUX file of the job (keyword AUX), which lists them",
        )
    at = -1
    for change in _CHANGED.finditer(part.data, part.start, part.end):
        atom = int(change.group(1))
        if not 1 <= atom <= len(masses):
            raise part.expected(change.start(), f"one of {len(masses)} atoms")
        masses[atom - 1], at = float(change.group(2)), change.start(2)
    if weight is not None:
        total, decimals = float(weight.group(1)), len(weight.group(2))
        if abs(total - float(masses.sum())) > 0.6 * 10.0**-decimals + 1e-4 * len(masses):
            raise part.error(
                weight.start(),
                f"the molecular weight is {total}, but the masses taken here add up to {masses.sum():.4f}",
                mend="give the AUX file of the job (keyword AUX), which lists the masses",
            )
    return masses, at


def _energy(part: Text) -> tuple[float | None, int]:
    matches = list(_TOTAL.finditer(part.data, part.start, part.end))
    if not matches:
        return None, 0
    at = matches[-1].start(1)
    value = float(part.exact_text(at, "the total energy in eV"))
    if not math.isfinite(value):
        raise part.expected(at, "the total energy in eV")
    shares = [mark.search(part.data, part.start, part.end) for mark in (_ONE_CENTRE, _TWO_CENTRE)]
    if shares[0] is not None and shares[1] is not None:
        total = sum(float(share.group(1)) for share in shares if share is not None)
        if abs(total - value) > 2.1e-4:
            raise part.error(
                at,
                f"the total energy is {value} eV, its parts add up to {total:.4f} eV",
                mend=CUT_SHORT,
            )
    return value * job.EV_HARTREE, at


def _heat(part: Text) -> Printed | None:
    """Return the heat of formation; ReadError where it is damaged or there is none."""
    matches = list(_HEAT.finditer(part.data, part.start, part.end))
    if not matches:
        return None
    at = matches[-1].start(1)
    return Printed(part.exact_text(at, "a heat of formation"), "kcal/mol", part.line_number(at))


def _multiplicity(part: Text, keys: list[str]) -> tuple[int | None, int]:
    """Return the multiplicity by a keyword, else by the electrons, and where it stands."""
    alpha = _ALPHA.search(part.data, part.start, part.end)
    beta = _BETA.search(part.data, part.start, part.end)
    doubly = _DOUBLY.search(part.data, part.start, part.end)
    singly = _SINGLY.search(part.data, part.start, part.end)
    named = job.spin(keys)
    if alpha is not None and beta is not None:
        count = int(alpha.group(1)) - int(beta.group(1)) + 1
        if named is not None and named != count:
            raise part.error(
                alpha.start(),
                f"a keyword asks for multiplicity {named}, the electrons have {count}",
                mend="check charge and spin in the input",
            )
        return (count if count >= 1 else None), alpha.start(1)
    if named is not None:
        return named, _keywords(part)[1]
    if doubly is not None:
        return (1 if singly is None else int(singly.group(1)) + 1), doubly.start(1)
    return None, 0
