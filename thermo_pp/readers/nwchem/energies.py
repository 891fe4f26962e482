"""Energies of one NWChem task: its SCF or DFT solutions, and the best energy printed on top of each.

Every total is taken from the line of its own method; spin-component-scaled totals, and the MP2 energy that the
coupled-cluster module starts from, stand beside and are left there. Totals are checked against their parts.
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterator
from dataclasses import dataclass

from thermo_pp.readers.line_marks import matches
from thermo_pp.readers.nwchem.tasks import ANALYTIC, DFT, MP2, RIMP2, SCF, TCE, TOTALS, Task
from thermo_pp.readers.text import CUT_SHORT, Text

RANKS: dict[str, int] = {
    "HF": 0,
    "DFT": 1,
    "SCS-MP2": 2,
    "SCS-RI-MP2": 2,
    "RI-MP2": 2,
    "MP2": 2,
    "MP3": 3,
    "CISD": 3,
    "MP4": 4,
    "CC2": 4,
    "LCCD": 4,
    "CCD": 4,
    "LCCSD": 4,
    "QCISD": 4,
    "CCSD": 5,
    "CCSD+T(CCSD)": 6,
    "CCSD(T)": 7,
    "CR-CCSD(T)": 7,
    "LR-CCSD(T)": 7,
    "CCSDT": 8,
    "CCSDTQ": 9,
}
"""The energies that are read, and which is the better one of one geometry."""
CORRELATED = RANKS["SCS-MP2"]

_PARTS = frozenset(
    (
        *(b"One electron energy", b"Two electron energy", b"One-electron energy"),
        *(b"Two-electron energy", b"Coulomb energy", b"Exchange-Corr. energy", b"Exchange energy"),
        *(b"Correlation energy", b"Nuclear repulsion energy", b"COSMO energy"),
        b"Dispersion correction",
    )
)
_REPULSION = b"Nuclear repulsion energy"
_PARTS_BYTES = 520
_UNCONVERGED = b"Calculation failed to converge"
_DOUBLE_HYBRID = (b"Total DFT+SCS-MP2 energy", b"Total DFT+MP2 energy")
_ORBITALS_END = b"Multipole analysis of the density"
_RESOLVED = b"RI-MP2 Calculation Information"
_MP2_TOTAL = b"Total MP2 energy  "
_SCS_TOTAL = b"Total SCS-MP2 energy"
_SCS_ONLY = b"SCS Correlation energy"
"""Stands where the scaled energy is the module's only one."""
_SCS_TAKEN = b"SCS-MP2               = T"
"""Stands where the input asks for scaled energies and gradients; the scaled total itself is always printed."""
_USUAL = (1.0 / 3.0, 6.0 / 5.0)
_SCS_PARTS = re.compile(
    rb"Same spin pairs +(\S+)\s+Same spin scaling factor +(\S+)\s+"
    rb"Opposite spin pairs +(\S+)\s+Opposite spin scaling fact\. +(\S+)\s+SCS-MP2 correlation energy"
)
_CONFIGURATIONS = b"Configuration Driven CI Program"
_CC_PROGRAM = b"the segmented parallel ccsd program"
_CC_LEVEL = b"level of theory "
_CC_TOTALS = {
    "ccsd": ("CCSD", (b"CCSD corr. energy:",)),
    "ccsd+t(ccsd)": ("CCSD+T(CCSD)", (b"CCSD corr. energy:", b"T(CCSD) corr. energy:")),
    "ccsd(t)": ("CCSD(T)", (b"CCSD corr. energy:", b" (T) corr. energy:")),
}
_TCE_MARK = b" total energy / hartree"
_TCE_TOTAL = re.compile(rb"\n (\S+) total energy / hartree +=")
_TCE_PARTS = re.compile(rb" (\S+) correlation energy / hartree +=")
_TCE_CORRECTION = re.compile(rb"Perturbative correction : (\S+)")
_TCE_NAMES = {"MBPT(2)": "MP2", "MBPT(3)": "MP3", "MBPT(4)": "MP4"}
_STEP = 1e-11
"""Parts and total agree to this and a few units of double precision, hartree; twelve decimals are printed."""


@dataclass(frozen=True)
class Solution:
    """One SCF or DFT solution.

    Attributes
    ----------
    at : int
        Offset of its total energy.
    full : int
        The same, or that of the earlier solution that it repeats ("is already converged").
    value_hartree : float
    repulsion_hartree : float or None
        Nuclear repulsion printed with it.
    label : str
        ``"HF"`` or ``"DFT"``.
    end : int
        Offset of the next solution, or of the end of the task; -1 where it is not looked for yet.
    """

    at: int
    full: int
    value_hartree: float
    repulsion_hartree: float | None
    label: str
    end: int


@dataclass(frozen=True)
class Energy:
    """One energy: its label in `RANKS`, its value, the offset of its line, and the solution under it.

    What was printed on top of the solution ends before the offset `end`.
    """

    label: str
    value_hartree: float
    at: int
    solution: Solution
    end: int

    @property
    def rank(self) -> int:
        """Place of the label in `RANKS`."""
        return RANKS[self.label]

    @property
    def by_method(self) -> list[tuple[str, float, int]]:
        """Label, value and offset of the energy, that of the solution under it first."""
        own = (self.label, self.value_hartree, self.at)
        under = self.solution
        if self.label == under.label:
            return [own]
        return [(under.label, under.value_hartree, under.at), own]


def solutions(text: Text, task: Task, *, backwards: bool = False) -> Iterator[Solution]:
    """Yield the SCF or DFT solutions of a task in order, or in reverse order."""
    mark = _mark(text, task)
    find = text.data.rfind if backwards else text.data.find
    end = task.end if backwards else -1
    at = find(mark, task.start, task.end)
    while at >= 0:
        yield _solution(text, mark, at, end)
        end = at if backwards else -1
        at = find(mark, task.start, at) if backwards else find(mark, at + 1, task.end)


def first(text: Text, task: Task) -> int:
    """Return where the first solution of a task is printed, with its parts."""
    return text.data.find(_mark(text, task), task.start, task.end)


def _mark(text: Text, task: Task) -> bytes:
    mine = [name for name in TOTALS if name in task.names]
    if len(mine) != 1:
        what = "no SCF and no DFT module" if not mine else "both the SCF and the DFT module"
        raise text.error(
            task.headings[0][0],
            f"a task with {what}, whose energy is not read",
            mend="give a file with the energy, optimisation or frequency task alone",
        )
    return TOTALS[mine[0]]


def _solution(text: Text, mark: bytes, at: int, end: int) -> Solution:
    value = _value(text, at, mark, "the total energy")
    label = "DFT" if mark == TOTALS[DFT] else "HF"
    full, repulsion = at, _repulsion(text, at, mark, value)
    if repulsion is None:
        # "already converged": the same digits stand with their parts in an earlier solution
        digits = text.rest(at + len(mark)).strip()
        earlier = text.data.rfind(digits, 0, at)
        while earlier >= 0 and repulsion is None:
            start = text.data.rfind(b"\n", 0, earlier) + 1
            place = text.data.find(mark, start, earlier)
            if place >= 0:
                full, repulsion = place, _repulsion(text, place, mark, value)
            earlier = text.data.rfind(digits, 0, start)
    return Solution(at, full, value, repulsion, label, end)


def _repulsion(text: Text, at: int, mark: bytes, value: float) -> float | None:
    """Return the nuclear repulsion printed with a total energy, which must be the sum of its parts."""
    parts: dict[bytes, float] = {}
    for line in text.data[at : at + _PARTS_BYTES].split(b"\n")[1:-1]:
        name, _, number = line.partition(b"=")
        name = name.strip()
        if name in _PARTS:
            parts[name] = _float(number)
        elif mark in line:
            break
    if not parts:
        return None
    total = math.fsum(parts.values())
    if _REPULSION not in parts or not abs(total - value) <= _rounding(value, total):
        raise text.error(
            at,
            f"the total energy {value:.9f} is not the sum of its parts below, {total:.9f}",
            mend=CUT_SHORT,
        )
    return parts[_REPULSION]


def _float(digits: bytes) -> float:
    """Return a number, NaN where it is damaged."""
    try:
        return float(digits)
    except ValueError:
        return math.nan


def _value(text: Text, at: int, mark: bytes, what: str) -> float:
    return float(text.exact_text(at + len(mark), what))


def unconverged(text: Text, solution: Solution) -> int:
    """Return where the program says that this solution did not converge, -1 where it does not."""
    return text.data.rfind(_UNCONVERGED, max(0, solution.full - 400), solution.full)


def energy(text: Text, task: Task, solution: Solution) -> Energy:
    """Return the best energy that a task printed on top of one of its solutions.

    Raises
    ------
    ReadError
        The solution did not converge, a correlated module ran and its total is missing, damaged, or of a method that
        is not in `RANKS`.
    """
    failed = unconverged(text, solution)
    if failed >= 0:
        raise text.error(
            failed,
            f"the {'SCF' if solution.label == 'HF' else 'DFT'} iterations did not converge",
            mend="rerun with more iterations, another guess or a level shift",
        )
    start, end = solution.at, task.end
    if solution.label == "DFT" and TCE in task.names:
        at = next(at for at, name in task.headings if name == TCE)
        raise text.error(
            at,
            "a correlated energy on orbitals of a density functional, which is not read",
            mend="give a calculation on Hartree-Fock orbitals, or one of the functional alone",
        )
    own = Energy(solution.label, solution.value_hartree, solution.at, solution, end)
    if ANALYTIC in task.names or (solution.label == "DFT" and MP2 not in task.names):
        return own
    if solution.end >= 0:
        end = solution.end
    else:
        following = text.data.find(TOTALS[DFT if solution.label == "DFT" else SCF], start + 1, end)
        end = end if following < 0 else following
    if solution.label == "DFT":
        return _double_hybrid(text, solution, end)
    # what correlated modules print comes after the orbitals, which are long
    behind = text.data.find(_ORBITALS_END, start, end)
    behind = start if behind < 0 else behind
    if TCE in task.names or text.data.find(_TCE_MARK, behind, end) >= 0:
        return _contracted(text, solution, end)
    coupled = text.data.find(_CC_PROGRAM, behind, end)
    if coupled >= 0:
        return _coupled(text, solution, coupled, end)
    if text.data.find(b"Total CCSD", behind, end) >= 0:
        raise _missing(text, solution, "coupled-cluster program's")
    if RIMP2 in task.names or text.data.find(_RESOLVED, behind, end) >= 0:
        return _second_order(text, solution, "RI-MP2", end)
    if MP2 in task.names or text.data.find(_MP2_TOTAL, behind, end) >= 0:
        return _second_order(text, solution, "MP2", end)
    if text.data.find(b" Direct MP2", behind, end) >= 0:
        raise _missing(text, solution, "MP2")
    selected = text.data.find(_CONFIGURATIONS, behind, end)
    if selected >= 0:
        raise _unknown(text, selected, "selected CI")
    return own


def _double_hybrid(text: Text, solution: Solution, end: int) -> Energy:
    for mark in _DOUBLE_HYBRID:
        at = text.data.find(mark, solution.at, end)
        if at >= 0:
            return Energy("DFT", _value(text, at, mark, "the DFT+MP2 energy"), at, solution, end)
    raise _missing(text, solution, "DFT+MP2")


def _second_order(text: Text, solution: Solution, label: str, end: int) -> Energy:
    if text.data.find(_SCS_TAKEN, solution.at, end) >= 0:
        return _scaled(text, solution, f"SCS-{label}", end)
    at = text.data.find(_MP2_TOTAL, solution.at, end)
    mark = _MP2_TOTAL
    if at < 0 and text.data.find(_SCS_ONLY, solution.at, end) >= 0:
        at = text.data.find(_SCS_TOTAL, solution.at, end)
        mark, label = _SCS_TOTAL, f"SCS-{label}"
    if at < 0:
        raise _missing(text, solution, label)
    factors = _factors(_SCS_PARTS.search(text.data, solution.at, end))
    if factors is not None and not usual(factors):
        raise text.error(
            at,
            f"factors of {factors[0]:g} and {factors[1]:g} for a scaled energy, but no word that it is "
            f"the one asked for (looked for {_SCS_TAKEN.decode()!r})",
            mend=CUT_SHORT,
        )
    value = _value(text, at, mark, f"the {label} energy")
    part = text.data.rfind(b"orrelation energy", solution.at, at)
    parts = [_value(text, part, b"orrelation energy", "the correlation energy")]
    _check(text, at, value, solution, parts)
    return Energy(label, value, at, solution, end)


def _scaled(text: Text, solution: Solution, label: str, end: int) -> Energy:
    """Return the spin-component-scaled energy of a task that uses it, gradients and Hessians included."""
    at = text.data.find(_SCS_TOTAL, solution.at, end)
    if at < 0:
        raise _missing(text, solution, label)
    value = _value(text, at, _SCS_TOTAL, f"the {label} energy")
    parts = _SCS_PARTS.search(text.data, solution.at, at)
    if parts is None:
        raise text.error(at, "no pairs and scaling factors before this energy", mend=CUT_SHORT)
    same, same_factor, opposite, opposite_factor = map(_float, parts.groups())
    total = solution.value_hartree + same * same_factor + opposite * opposite_factor
    if not abs(total - value) <= _rounding(value, total):
        raise text.error(
            at,
            f"the total energy {value:.9f} is not the sum of its scaled parts, {total:.9f}",
            mend=CUT_SHORT,
        )
    return Energy(label, value, at, solution, end)


def scaling(text: Text, found: Energy) -> tuple[float, float] | None:
    """Return the factors of pairs of the same and of opposite spin of a scaled energy, None of any other."""
    if not found.label.startswith("SCS-"):
        return None
    return _factors(_SCS_PARTS.search(text.data, found.solution.at, found.at))


def _factors(parts: re.Match[bytes] | None) -> tuple[float, float] | None:
    return None if parts is None else (_float(parts.group(2)), _float(parts.group(4)))


def usual(factors: tuple[float, float]) -> bool:
    """Tell whether these are the factors that the program takes unless the input says otherwise."""
    return all(abs(one - known) < 1e-6 for one, known in zip(factors, _USUAL, strict=True))


def _coupled(text: Text, solution: Solution, start: int, end: int) -> Energy:
    whole = text.part(start, end)
    at = whole.need(_CC_LEVEL, lacking="no level of theory of the coupled-cluster program")
    asked = b" ".join(whole.rest(at + len(_CC_LEVEL)).split()).decode("utf-8", "replace")
    if asked not in _CC_TOTALS:
        raise _unknown(text, at, asked)
    label, marks = _CC_TOTALS[asked]
    total = b"Total " + label.encode() + b" energy:"
    at = whole.find(total)
    if at < 0:
        raise _missing(text, solution, label)
    value = _value(text, at, total, f"the {label} energy")
    parts = []
    for mark in marks:
        part = text.data.rfind(mark, start, at)
        if part < 0:
            raise _missing(text, solution, mark.decode().strip())
        parts.append(_value(text, part, mark, "a correlation energy"))
    _check(text, at, value, solution, parts)
    return Energy(label, value, at, solution, end)


def _contracted(text: Text, solution: Solution, end: int) -> Energy:
    """Return the energy of the tensor contraction engine: the last method, its (T) over its [T]."""
    found: list[Energy] = []
    orders: list[float] = []
    for match in _TCE_TOTAL.finditer(text.data, solution.at, end):
        name = match.group(1).decode("utf-8", "replace")
        if name.endswith("[T]"):
            continue
        label = _TCE_NAMES.get(name, name)
        if label not in RANKS:
            raise _unknown(text, match.start(1), name)
        value = _value(text, match.end(), b"", f"the {label} energy")
        mark = b" " + match.group(1) + b" correlation energy / hartree ="
        part = text.data.rfind(mark, solution.at, match.start())
        if part >= 0:
            correlation = _value(text, part, mark, "the correlation energy")
            if name.startswith("MBPT("):  # that of the order alone
                orders.append(correlation)
                _check(text, match.start(1), value, solution, orders)
            else:
                _check(text, match.start(1), value, solution, [correlation])
        found.append(Energy(label, value, match.start(1), solution, end))
    parts = matches(_TCE_PARTS, b" correlation energy / hartree", text, solution.at, end)
    printed = [part.group(1) for part in parts if b"[T]" not in part.group(1)]
    if found and printed and text.data.rfind(printed[-1] + _TCE_MARK, solution.at, end) < 0:
        raise _missing(text, solution, printed[-1].decode("utf-8", "replace"))
    correction = _TCE_CORRECTION.search(text.data, solution.at, end)
    if not found or (correction and b"(T)" in correction.group(1) and "(T)" not in found[-1].label):
        raise _missing(text, solution, "tensor contraction engine's")
    return found[-1]


def _check(text: Text, at: int, value: float, solution: Solution, parts: list[float]) -> None:
    total = math.fsum([solution.value_hartree, *parts])
    if abs(total - value) > _rounding(value, total):
        raise text.error(
            at,
            f"the total energy {value:.9f} is not the sum of its parts, {total:.9f}",
            mend=CUT_SHORT,
        )


def _rounding(*values: float) -> float:
    return _STEP + 4e-16 * max(map(abs, values))


def _missing(text: Text, solution: Solution, label: str) -> Exception:
    return text.error(
        solution.at,
        f"no {label} energy after this SCF, although its module ran, or its heading is missing",
        mend="check that the job ran to its end; rerun it",
    )


def _unknown(text: Text, at: int, name: str) -> Exception:
    return text.error(
        at,
        f"an energy of the method {name!r}, which the NWChem reader does not know",
        mend=f"energies of {', '.join(RANKS)} are read; give a file with one of them",
    )
