"""Level, energy, charge and multiplicity of an xtb output."""

from __future__ import annotations

import json
import math
import re
from dataclasses import dataclass
from typing import Any

from thermo_pp.readers.text import CUT_SHORT, Text
from thermo_pp.sources import Source

_HAMILTONIAN = re.compile(rb"^[ \t]+:[ \t]+Hamiltonian[ \t]+(\S+)[ \t]+:", re.MULTILINE)
_FORCE_FIELD = re.compile(rb"^[ \t]+\|[ \t]+G F N - F F[ \t]+\|", re.MULTILINE)
_GFN0 = re.compile(rb"^[ \t]+\|[ \t]+G F N 0 - x T B[ \t]+\|", re.MULTILINE)
_SOLVATION = re.compile(
    rb"^[ \t]+\* Solvation model:[ \t]+(\S+)[^\n]*\n[ \t]+Solvent[ \t]+(\S[^\n]*?)[ \t\r]*\n",
    re.MULTILINE,
)
_SOLVENT_ON = re.compile(rb"^[ \t]+:[ \t]+GBSA solvation[ \t]+(true|false)[ \t]+:", re.MULTILINE)
_SHIFT = re.compile(rb"^[ \t]+Reference state[ \t]+(\S[^\n]*?)[ \t\r]*\n", re.MULTILINE)
_SUMMARY = re.compile(rb"^[ \t]+::[ \t]+SUMMARY[ \t]+::", re.MULTILINE)
_TOTAL = b"| TOTAL ENERGY"
_BIASED = b"Biased Numerical Hessian"
_RESTRAINT_HARTREE = 1e-9
_AGREE_HARTREE = 1e-6
"""A Hessian job repeats the SCF, whose total differs in the tenth digit."""
_OCCUPATIONS = re.compile(
    rb"^[ \t]+#[ \t]+Occupation[ \t]+Energy/Eh[^\n]*\n[ \t]+-+\r?\n((?:[^\n]*\n)+?)[ \t]+-{20}",
    re.MULTILINE,
)
_ORBITAL = re.compile(rb"[ \t]+(\d+)[ \t]+(\d\.\d{4})[ \t]")
_ELECTRONS = re.compile(rb"^[ \t]+:[ \t]+# electrons[ \t]+(\d+)[ \t]+:", re.MULTILINE)
_SPIN = re.compile(rb"^[ \t]+spin[ \t]+:[ \t]+(\d+\.\d)", re.MULTILINE)
_CALL = b"          program call               :"
_UHF = re.compile(rb"(?:^|\s)(?:--uhf|-u)[ =]+(\d+)(?=\s|$)")


@dataclass(frozen=True)
class Level:
    """Method, solvent and label of the energy, and where they stand."""

    method: str
    solvent: str | None
    label: str
    at: dict[str, int]


def level(text: Text) -> Level:
    """Return the level of theory; ReadError where no Hamiltonian is named, or two."""
    named = list(_HAMILTONIAN.finditer(text.data, text.start, text.end))
    box = _FORCE_FIELD.search(text.data, text.start, text.end)
    gfn0 = _GFN0.search(text.data, text.start, text.end)
    if named:
        methods = {match.group(1) for match in named}
        if len(methods) > 1:
            raise text.error(
                named[-1].start(), "two Hamiltonians in one output", mend="give one job a file"
            )
        method, at, label = named[-1].group(1).decode().upper(), named[-1].start(1), "semiempirical"
    elif gfn0 is not None:
        method, at, label = "GFN0-XTB", gfn0.start(), "semiempirical"
    elif box is not None:
        method, at, label = "GFN-FF", box.start(), "force field"
    else:
        raise text.error(text.end, "no Hamiltonian is named in this output", mend=CUT_SHORT)
    places = {"method": at}
    solvent: str | None = None
    model = _SOLVATION.search(text.data, text.start, text.end)
    on = _SOLVENT_ON.search(text.data, text.start, text.end)
    if model is not None:
        kind, name = (model.group(i).decode("utf-8", "replace") for i in (1, 2))
        shift = _SHIFT.search(text.data, model.end(), model.end() + 1000)
        if shift is None and text.find(b"Free energy shift", model.end()) >= 0:
            raise text.error(
                model.start(), "no reference state of the solvation model", mend=CUT_SHORT
            )
        state = "" if shift is None else f", {shift.group(1).decode('utf-8', 'replace')}"
        solvent, places["solvent"] = f"{kind} {name}{state}", model.start(1)
    elif on is not None and on.group(1) == b"false":
        solvent, places["solvent"] = "none", on.start(1)
    return Level(method, solvent, label, places)


def energy(text: Text) -> tuple[float, int]:
    """Return the total energy, hartree, and where it stands.

    Raises
    ------
    ReadError
        None, one that the last summary contradicts, one that holds the energy of a restraint.
    """
    at = text.need_last(_TOTAL, lacking="no total energy")
    value = float(text.exact_text(at + len(_TOTAL), "the total energy"))
    if not math.isfinite(value):
        raise text.expected(at, "the total energy")
    summaries = list(_SUMMARY.finditer(text.data, text.start, at))
    if not summaries:
        raise text.error(at, "no SUMMARY before this line", mend=CUT_SHORT)
    last = text.part(summaries[-1].start(), at)
    mark = b":: total energy"
    total_at = last.need(mark, lacking="no total energy in the summary")
    total = float(last.exact_text(total_at + len(mark), "the total energy"))
    moved = text.find(_BIASED) >= 0  # by a biased optimisation, which prints no summary
    if abs(total - value) > _AGREE_HARTREE and not moved:
        raise text.error(
            at, f"TOTAL ENERGY is {value} Eh, the summary has {total} Eh", mend=CUT_SHORT
        )
    restraint = _summand(last, b":: add. restraining")
    if restraint is not None and abs(restraint) > _RESTRAINT_HARTREE:
        raise text.error(
            last.need(b":: add. restraining", lacking="no restraint"),
            f"{restraint} Eh of the total energy are those of a restraint",
            mend="take a single point of this geometry without constraints or walls",
        )
    return value, at


def _summand(summary: Text, mark: bytes) -> float | None:
    at = summary.find(mark)
    return None if at < 0 else float(summary.exact_text(at + len(mark), mark.decode().strip(": ")))


def charge(text: Text) -> tuple[int, int]:
    """Return the charge and where it stands; ReadError where it is missing or not whole."""
    mark = b":: total charge"
    at = text.need_last(mark, lacking="no total charge")
    value = float(text.exact_text(at + len(mark), "the total charge"))
    if abs(value - round(value)) > 1e-4 or abs(value) > 1000.0:
        raise text.expected(at, "a whole charge")
    return round(value), at


def multiplicity(text: Text, beside: Source | None, energy: float) -> tuple[int, int] | None:
    """Return the multiplicity and where it stands (-1: beside), None where nothing says it.

    Whole occupations say it, else the option ``--uhf`` of the call, else ``xtbout.json`` beside the
    output where its energy is that of the output.
    """
    spin = _SPIN.search(text.data, text.start, text.end)
    if spin is not None:
        return round(2.0 * float(spin.group(1))) + 1, spin.start(1)
    electrons = _ELECTRONS.search(text.data, text.start, text.end)
    tables = list(_OCCUPATIONS.finditer(text.data, text.start, text.end))
    found = _occupied(tables[-1]) if tables and electrons is not None else None
    if found is not None and electrons is not None:
        singly, count = found
        if count == int(electrons.group(1)):
            return singly + 1, tables[-1].start(1)
    call = text.find(_CALL)
    option = None if call < 0 else _UHF.search(text.rest(call))
    unpaired = None if option is None else int(option.group(1))
    at = call
    if unpaired is None:
        unpaired, at = _unpaired(beside, energy), -1
    if unpaired is None or unpaired > 100:
        return None
    if electrons is not None and (int(electrons.group(1)) - unpaired) % 2:
        return None
    return unpaired + 1, at


def _occupied(table: re.Match[bytes]) -> tuple[int, int] | None:
    """Return how many orbitals are singly occupied and how many electrons there are.

    None where an occupation is not whole. Orbitals that the table leaves out (``...``) below one
    that is doubly occupied are so too.
    """
    doubly = singly = 0
    for line in table.group(1).splitlines():
        match = _ORBITAL.match(line)
        if match is None:
            continue
        number, occupation = int(match.group(1)), float(match.group(2))
        if occupation == 2.0 and not singly:
            doubly = number
        elif occupation == 1.0 and number == doubly + singly + 1:
            singly += 1
        elif occupation != 0.0:
            return None
    return singly, 2 * doubly + singly


def _unpaired(beside: Source | None, energy: float) -> int | None:
    """Return the unpaired electrons that ``xtbout.json`` names, None where it is of another job."""
    if beside is None or len(beside.data) > 100_000_000:
        return None
    try:
        values: Any = json.loads(beside.data)
        same = abs(float(values["total energy"]) - energy) < 2e-8
        unpaired = values["number of unpaired electrons"]
    except (ValueError, KeyError, TypeError, RecursionError):
        return None
    return unpaired if same and type(unpaired) is int and unpaired >= 0 else None
