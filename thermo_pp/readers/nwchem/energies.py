"""Energies of one NWChem task: its SCF or DFT solutions, and the best energy printed on top of each.

Every total is taken from the line of its own method; spin-component-scaled totals, and the MP2 energy that the
coupled-cluster module starts from, stand beside and are left there. Totals are checked against their parts.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass

from thermo_pp.readers.nwchem.tasks import ANALYTIC, DFT, MP2, RIMP2, SCF, TCE, Task
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

_TOTALS = {SCF: b"Total SCF energy =", DFT: b"Total DFT energy ="}
_REPULSION = re.compile(rb"Nuclear repulsion energy =")
_UNCONVERGED = b"Calculation failed to converge"
_DOUBLE_HYBRID = (b"Total DFT+SCS-MP2 energy", b"Total DFT+MP2 energy")
_MP2_TOTAL = b"Total MP2 energy  "
_SCS_TOTAL = b"Total SCS-MP2 energy"
_SCS_ONLY = b"SCS Correlation energy"
"""Stands where the scaled energy is the module's only one."""
_CC_PROGRAM = b"the segmented parallel ccsd program"
_CC_LEVEL = b"level of theory "
_CC_TOTALS = {
    "ccsd": ("CCSD", (b"CCSD corr. energy:",)),
    "ccsd+t(ccsd)": ("CCSD+T(CCSD)", (b"CCSD corr. energy:", b"T(CCSD) corr. energy:")),
    "ccsd(t)": ("CCSD(T)", (b"CCSD corr. energy:", b" (T) corr. energy:")),
}
_TCE_TOTAL = re.compile(rb"\n (\S+) total energy / hartree +=")
_TCE_CORRECTION = re.compile(rb"Perturbative correction : (\S+)")
_TCE_NAMES = {"MBPT(2)": "MP2", "MBPT(3)": "MP3", "MBPT(4)": "MP4"}
_STEP = 3e-9
"""Parts and total agree to this, hartree; twelve decimals are printed at least."""


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
    """

    at: int
    full: int
    value_hartree: float
    repulsion_hartree: float | None
    label: str


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


def solutions(text: Text, task: Task, *, backwards: bool = False) -> Iterator[Solution]:
    """Yield the SCF or DFT solutions of a task in order, or in reverse order."""
    mark = _mark(text, task)
    find = text.data.rfind if backwards else text.data.find
    at = find(mark, task.start, task.end)
    while at >= 0:
        yield _solution(text, task, mark, at)
        at = find(mark, task.start, at) if backwards else find(mark, at + 1, task.end)


def _mark(text: Text, task: Task) -> bytes:
    mine = [name for name in _TOTALS if name in task.names]
    if len(mine) != 1:
        what = "no SCF and no DFT module" if not mine else "both the SCF and the DFT module"
        raise text.error(
            task.headings[0][0],
            f"a task with {what}, whose energy is not read",
            mend="give a file with the energy, optimisation or frequency task alone",
        )
    return _TOTALS[mine[0]]


def _solution(text: Text, task: Task, mark: bytes, at: int) -> Solution:
    value = _value(text, at, mark, "the total energy")
    label = "DFT" if mark == _TOTALS[DFT] else "HF"
    full, repulsion = at, _repulsion(text, at)
    if repulsion is None:
        # "already converged": the same number stands with its parts in an earlier solution
        earlier = text.data.rfind(mark, task.start, at)
        while earlier >= 0 and repulsion is None:
            if _value(text, earlier, mark, "the total energy") != value:
                break
            full, repulsion = earlier, _repulsion(text, earlier)
            earlier = text.data.rfind(mark, task.start, earlier)
    return Solution(at, full, value, repulsion, label)


def _repulsion(text: Text, at: int) -> float | None:
    match = _REPULSION.search(text.data, at, at + 500)
    if match is None:
        return None
    return float(text.exact_text(match.end(), "the nuclear repulsion energy"))


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
    own = Energy(solution.label, solution.value_hartree, solution.at, solution, end)
    if ANALYTIC in task.names or (solution.label == "DFT" and MP2 not in task.names):
        return own
    following = text.data.find(_TOTALS[DFT if solution.label == "DFT" else SCF], start + 1, end)
    end = end if following < 0 else following
    if solution.label == "DFT":
        return _double_hybrid(text, solution, end)
    if task.heading(TCE, start, end):
        return _contracted(text, solution, end)
    coupled = text.data.find(_CC_PROGRAM, start, end)
    if coupled >= 0:
        return _coupled(text, solution, coupled, end)
    if task.heading(RIMP2, start, end):
        return _second_order(text, solution, "RI-MP2", end)
    if task.heading(MP2, start, end) or text.data.find(b" Direct MP2", start, end) >= 0:
        return _second_order(text, solution, "MP2", end)
    return own


def _double_hybrid(text: Text, solution: Solution, end: int) -> Energy:
    for mark in _DOUBLE_HYBRID:
        at = text.data.find(mark, solution.at, end)
        if at >= 0:
            return Energy("DFT", _value(text, at, mark, "the DFT+MP2 energy"), at, solution, end)
    raise _missing(text, solution, "DFT+MP2")


def _second_order(text: Text, solution: Solution, label: str, end: int) -> Energy:
    at = text.data.find(_MP2_TOTAL, solution.at, end)
    mark = _MP2_TOTAL
    if at < 0 and text.data.find(_SCS_ONLY, solution.at, end) >= 0:
        at = text.data.find(_SCS_TOTAL, solution.at, end)
        mark, label = _SCS_TOTAL, f"SCS-{label}"
    if at < 0:
        raise _missing(text, solution, label)
    value = _value(text, at, mark, f"the {label} energy")
    part = text.data.rfind(b"orrelation energy", solution.at, at)
    parts = [_value(text, part, b"orrelation energy", "the correlation energy")]
    _check(text, at, value, solution, parts)
    return Energy(label, value, at, solution, end)


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
            _check(text, match.start(1), value, solution, [correlation])
        found.append(Energy(label, value, match.start(1), solution, end))
    correction = _TCE_CORRECTION.search(text.data, solution.at, end)
    if not found or (correction and b"(T)" in correction.group(1) and "(T)" not in found[-1].label):
        raise _missing(text, solution, "tensor contraction engine's")
    return found[-1]


def _check(text: Text, at: int, value: float, solution: Solution, parts: list[float]) -> None:
    total = solution.value_hartree + sum(parts)
    if abs(total - value) > _STEP:
        raise text.error(
            at,
            f"the total energy {value:.9f} is not the sum of its parts, {total:.9f}",
            mend=CUT_SHORT,
        )


def _missing(text: Text, solution: Solution, label: str) -> Exception:
    return text.error(
        solution.at,
        f"no {label} energy after this SCF, although its module ran",
        mend="check that the job ran to its end; rerun it",
    )


def _unknown(text: Text, at: int, name: str) -> Exception:
    return text.error(
        at,
        f"an energy of the method {name!r}, which the NWChem reader does not know",
        mend=f"energies of {', '.join(RANKS)} are read; give a file with one of them",
    )
