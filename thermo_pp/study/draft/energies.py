"""Energies: at which level the structures of a draft have single points, and which level to use."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from thermo_pp.audit.levels import level_words, stated_level
from thermo_pp.grouping import Grouped, levels_of, same_level
from thermo_pp.records import Calculation

CORRELATED = 4
"""Class from which on a method is a correlated one, which needs more than a double-zeta basis."""
_CLASSES: tuple[tuple[int, str], ...] = (
    (8, r"CCSDT|CCSD\(T|CCSD-T|QCISD\(T|CR-CC|CBS-|G[34]\b|W1"),
    (6, r"CCSD|QCISD|CEPA|MP4"),
    (5, r"MP3|B2|DSD|PWPB95|REVDSD|MP2\.5"),
    (4, r"MP2|CC2|CASPT2|NEVPT2"),
    (0, r"GFN|XTB|PM[367]|AM1|MNDO|DFTB"),
    (1, r"HF|SCF|HF-3C"),
)
_OF_DFT = 3
_LETTERS = {"D": 2, "T": 3, "Q": 4, "5": 5, "6": 6}


@dataclass(frozen=True)
class SinglePoints:
    """One level of theory at which some structures have single points.

    Attributes
    ----------
    words : str
        The level.
    of : mapping of str to Calculation
        Species -> its single point at this level, the first of several.
    rank : tuple of float
        The better level has the larger one.
    """

    words: str
    of: Mapping[str, Calculation]
    rank: tuple[float, float]


def single_points(members: Mapping[str, Grouped]) -> tuple[SinglePoints, ...]:
    """Return every level of single points that is not that of the frequencies, the best first."""
    found: dict[int, Calculation] = {}
    for member in members.values():
        own = stated_level(member.frequencies)
        for single in member.singles:
            if not same_level(stated_level(single), own):
                found[id(single)] = single
    answer = []
    for calculations in levels_of(list(found.values())):
        at_level = {id(calc) for calc in calculations}
        of = {
            name: next(single for single in member.singles if id(single) in at_level)
            for name, member in members.items()
            if any(id(single) in at_level for single in member.singles)
        }
        words = level_words(calculations[0]) or "a level that is not stated"
        answer.append(SinglePoints(words, of, rank(calculations[0])))
    return tuple(sorted(answer, key=lambda level: (level.rank, len(level.of)), reverse=True))


def best_level(
    levels: Sequence[SinglePoints], needed: Mapping[str, Grouped]
) -> SinglePoints | None:
    """Return the best level that covers every species; None where the frequency jobs' own is to be used.

    That is where no level covers all, or where all that do are of a lower class of method.
    """
    own = min((method_class(member.frequencies) for member in needed.values()), default=0)
    for level in levels:
        calc = next(iter(level.of.values()))
        if set(needed) <= set(level.of) and method_class(calc) >= own:
            return level
    return None


def method_class(calc: Calculation) -> int:
    """Return the class of a method, from semiempirical (0) to coupled cluster with triples (8)."""
    text = (calc.method or "").upper()
    for number, pattern in _CLASSES:
        if re.search(rf"(?<![A-Z]){pattern}" if number < 2 else pattern, text):
            return number
    return _OF_DFT


def rank(calc: Calculation) -> tuple[float, float]:
    """Return how good a level is: class of the method, then size of the basis.

    A rule of thumb to propose one of several: a correlated method in a double-zeta basis ranks just
    above the density functionals, because its energies have not converged with the basis.
    """
    size = basis_size(calc.basis)
    number = float(method_class(calc))
    if number >= CORRELATED and size < 3:
        number = _OF_DFT + number / 100.0
    return number, size


def basis_size(basis: str | None) -> float:
    """Return the zeta of a basis set, a quarter more with diffuse functions; 0 where it is not known.

    >>> [basis_size(name) for name in ("aug-cc-pV(T+d)Z", "def2-SVP", "6-311+G(d,p)", "sto-3g")]
    [3.25, 2.0, 3.25, 1.0]
    """
    text = (basis or "").upper()
    zeta = 0.0
    if found := re.search(r"\[([DTQ56]+)\]", text):  # extrapolated
        zeta = max(_LETTERS[each] for each in found.group(1)) + 0.5
    elif found := re.search(r"([DTQ56])(?:\+D\)|\))?Z", text):
        zeta = _LETTERS[found.group(1)]
    elif found := re.search(r"([STQ])ZV?P|([STQ])VP", text):
        zeta = {"S": 2, "T": 3, "Q": 4}[found.group(1) or found.group(2)]
    elif found := re.search(r"(?:DEF2?-|MA-)?([STQ])V", text):
        zeta = {"S": 2, "T": 3, "Q": 4}[found.group(1)]
    elif re.search(r"6-311", text):
        zeta = 3
    elif re.search(r"[346]-[23]1|LANL2DZ", text):
        zeta = 2
    elif re.search(r"STO|MINI", text):
        zeta = 1
    diffuse = zeta and re.search(r"AUG|\+G|\+\+|MA-|[TQ]ZV?PP?D\b|SVPD", text)
    return float(zeta) + (0.25 if diffuse else 0.0)
