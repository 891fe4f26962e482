"""Level of theory of one NWChem energy, charge and multiplicity: what the module printed before it and after it."""

from __future__ import annotations

import re
from dataclasses import dataclass

from thermo_pp.data.elements import SYMBOLS
from thermo_pp.readers.level import Level
from thermo_pp.readers.nwchem.energies import CORRELATED, Energy, scaling, usual
from thermo_pp.readers.nwchem.geometry import Geometry, element, replaced_cores
from thermo_pp.readers.nwchem.tasks import DFT, SCF, Task
from thermo_pp.readers.text import CUT_SHORT, Text

_NAMED = re.compile(r"(\S.*\S) +Method XC (?:Potential|Functional)")
_PART = re.compile(r"(\S.*\S) +(\d+\.\d+)(?: (?:local|non-local))?")
_RANGE = re.compile(r"(Alpha|Beta|Gamma|Short-Range HF) *: *(\S+)")
_EXACT = "Hartree-Fock (Exact) Exchange"
_PBE_X = "PerdewBurkeErnzerhof Exchange Functional"
_PBE_C = {"Perdew 1991 LDA Correlation Functional": 1.0}
_PBE_C |= {"PerdewBurkeErnz. Correlation Functional": 1.0}
_BECKE, _LYP = "Becke 1988 Exchange Functional", "Lee-Yang-Parr Correlation Functional"
_FUNCTIONALS: tuple[tuple[str, dict[str, float]], ...] = (
    ("HF", {_EXACT: 1.0}),
    (
        "SVWN5",
        {"Slater Exchange Functional": 1.0, "VWN V Correlation Functional": 1.0},
    ),
    ("BLYP", {_BECKE: 1.0, _LYP: 1.0}),
    (
        "BP86",
        {
            _BECKE: 1.0,
            "Perdew 1981 Correlation Functional": 1.0,
            "Perdew 1986 Correlation Functional": 1.0,
        },
    ),
    (
        "B3LYP",
        {
            _EXACT: 0.2,
            "Slater Exchange Functional": 0.8,
            _BECKE: 0.72,
            _LYP: 0.81,
            "VWN I RPA Correlation Functional": 0.19,
        },
    ),
    ("PBE", {_PBE_X: 1.0, **_PBE_C}),
    ("PBE0", {_EXACT: 0.25, _PBE_X: 0.75, **_PBE_C}),
)
"""Functionals that the program prints by their parts, too."""
_SAME = {"PBE96": "PBE"}
_BASIS_ROW = re.compile(r" ?(\S+) +(\S.*?) +(?:\d+ +\d+ +(\S+)|on all atoms) *")
_CONTINUUM = b"COSMO energy ="
"""Stands beside every energy in a continuum."""
_SUMMARY = b'Summary of "ao basis"'
_SCF_STATE = re.compile(
    rb"(closed|alpha) (?:shells  |electrons) = +(\d+)\s+(open|beta) +(?:shells  |electrons) +?= *(\d+)"
)
_DFT_STATE = re.compile(
    rb"No\. of electrons : +(\d+)\s+Alpha electrons : +(\d+)\s+Beta electrons : +(\d+)\s+"
    rb"Charge +: +(-?\d+)\s+Spin multiplicity: +(\d+)"
)
_FROZEN = (
    re.compile(rb"Frozen core +=\s*(\d+)"),
    re.compile(rb"number of core +(\d+)"),
    re.compile(rb"Alpha frozen cores :\s*(\d+)"),
)
_FROZEN_VIRTUALS = re.compile(
    rb"(?:Frozen virtuals +=|frozen virtuals :|number of deleted )\s*(\d+)"
)
_DIRECT = re.compile(rb"Active occupied range: +(\d+) -")
_RESOLVED = re.compile(rb"Nr\. of occupied MOs correlated: +(\d+)")
_CONSTRAINED = b"CDFT multipliers:"
_CORES = ((2, 0), (10, 1), (18, 5), (36, 9), (54, 18), (86, 27), (118, 43))
"""Up to which atomic number an atom has how many core orbitals."""


@dataclass(frozen=True)
class LevelOfTask(Level):
    """Level of theory of one energy of a task, with its charge and multiplicity."""

    charge: int | None
    multiplicity: int | None


def level(text: Text, task: Task, energy: Energy, geometry: Geometry) -> LevelOfTask:
    """Return the level of theory of an energy of a task."""
    at: dict[str, int] = {"method": energy.at}
    before = text.part(task.start, energy.solution.at)
    grid: str | None = None
    dispersion: str | None = "none"
    frozen: str | None = "none"
    charge, multiplicity, electrons = _state(before, energy.solution.label, at)
    alpha = None
    if electrons is not None and multiplicity is not None:
        alpha = (electrons + multiplicity - 1) // 2
    if energy.solution.label == "DFT":
        method = _functional(before, at)
        if before.data.find(_CONSTRAINED, at["method"], energy.solution.at) >= 0:
            method += " (CDFT)"  # held to a constraint: no ground state
        grid = _grid(before, at)
        dispersion = _dispersion(before, energy, at)
        if energy.at != energy.solution.at:
            method += " + MP2"
            frozen = _frozen(text, energy, geometry, alpha, at)
    else:
        method = energy.label + _factors(text, energy)
        if energy.rank >= CORRELATED:
            frozen = _frozen(text, energy, geometry, alpha, at)
    method = _relativistic(text, task, energy) + method
    _check_electrons(text, geometry, charge, electrons, at)
    return LevelOfTask(
        method=method,
        basis=_basis(before, geometry, at),
        dispersion=dispersion,
        solvent=_solvent(before, energy, at),
        grid=grid,
        frozen_core=frozen,
        charge=charge,
        multiplicity=multiplicity,
        at=at,
    )


def printed_level(text: Text, task: Task, before: int) -> bytes:
    """Return what a task printed last of its functional and basis set before an offset, to be compared."""
    blocks = [(_SUMMARY, b"\n\n")]
    if DFT in task.names:
        blocks.append((b"XC Information", b"Grid Information"))
    found = b""
    for mark, closing in blocks:
        place = text.data.rfind(mark, task.start, before)
        if place >= 0:
            found += text.data[place : text.data.find(closing, place, place + 8192)]
    return found.replace(b"\r", b"")


def _functional(before: Text, at: dict[str, int]) -> str:
    """Return the name of the functional, or its parts where they have no name here."""
    place = before.need_last(b"XC Information", lacking="no functional of the DFT module")
    at["method"] = line = before.next_line(place, 2)
    named = _NAMED.fullmatch(before.line(line).strip())
    if named is not None:
        name = named.group(1).upper()
        return _SAME.get(name, name)
    parts: dict[str, float] = {}
    while match := _PART.fullmatch(before.line(line).strip()):
        parts[match.group(1)] = float(match.group(2))
        line = before.next_line(line)
    if not parts:
        raise before.expected(line, "a functional or its parts")
    for name, known in _FUNCTIONALS:
        if parts == known:
            return name
    firsts = {part.split()[0] for part in parts}
    if len(parts) == 2 and len(firsts) == 1 and set(parts.values()) == {1.0}:
        return firsts.pop().upper()  # exchange and correlation of one name
    for name, known in _FUNCTIONALS:
        if parts.items() < known.items():
            raise before.error(
                at["method"],
                f"a part of the functional {name}, without the rest of it",
                mend="the output is damaged here; rerun or re-copy it, or name the functional whole",
            )
    text = " + ".join(f"{share:g} {part}" for part, share in parts.items())
    following = before.find(b"Grid Information", line)
    rest = before.data[line:following].decode("utf-8", "replace") if following >= 0 else ""
    ranges = ", ".join(f"{name} {value}" for name, value in _RANGE.findall(rest))
    return f"{text}; {ranges}" if ranges else text


def _factors(text: Text, energy: Energy) -> str:
    """Return what a scaled second-order energy is scaled by, empty where it is as usual or not scaled."""
    factors = scaling(text, energy)
    if factors is None or usual(factors):
        return ""
    return f" (same spin {factors[0]:g}, opposite spin {factors[1]:g})"


def _relativistic(text: Text, task: Task, energy: Energy) -> str:
    """Return the prefix of a relativistic Hamiltonian, which is switched on before the task's first solution."""
    module = next(at for at, name in task.headings if name in (SCF, DFT))
    if text.data.find(b"Douglas-Kroll integrals", task.start, module) >= 0:
        return "DKH-"
    first = text.data.find(b" energy =", module, energy.solution.at)
    if first >= 0 and text.data.find(b"Performing ZORA calculations", module, first) >= 0:
        return "ZORA-"
    return ""


def _grid(before: Text, at: dict[str, int]) -> str | None:
    mark = b"Grid used for XC integration:"
    place = before.last(mark)
    words = before.rest(place + len(mark)).split() if place >= 0 else []
    if not words:
        return None
    at["grid"] = place
    return words[0].decode("utf-8", "replace")


def _dispersion(before: Text, energy: Energy, at: dict[str, int]) -> str | None:
    """Return the name of the correction; the program prints its part beside every energy that has one."""
    full = energy.solution.full
    data = before.data
    place = data.find(b"Dispersion correction =", full, full + 700)
    if place < 0:
        return "none"
    at["dispersion"] = place
    block = data.rfind(b"Dispersion Parameters", before.start, full)
    models = ((b"DFT-D3BJ Model", "D3(BJ)"), (b"DFT-D3 Model", "D3"), (b"s6 scale factor :", "D2"))
    for mark, name in models if block >= 0 else ():
        if data.find(mark, block, block + 300) >= 0:
            at["dispersion"] = block
            return name
    exchange_hole = data.find(b"XDM dispersion energy", max(before.start, full - 1000), full)
    return "XDM" if exchange_hole >= 0 else None


def dissolved(text: Text, full: int) -> bool:
    """Tell whether the solution that is printed with its parts at an offset is one in a continuum."""
    return text.data.find(_CONTINUUM, full, full + 700) >= 0


def _solvent(before: Text, energy: Energy, at: dict[str, int]) -> str:
    full = energy.solution.full
    if before.data.find(_CONTINUUM, full, full + 700) < 0:
        return "none"
    at["solvent"] = before.data.find(_CONTINUUM, full)
    near = before.data[max(0, full - 1500) : full + 1500]
    model = "SMD" if b"COSMO-SMD solvation results" in near else "COSMO"
    mark = b"dielectric constant -eps-     ="
    place = before.last(mark)
    if place < 0:
        return model
    at["solvent"] = place
    dielectric = float(before.exact_text(place + len(mark), "the dielectric constant"))
    name = before.data.rfind(b"solvname_short:", before.start, place)
    words = before.rest(name).split() if name >= 0 else []
    solvent = f"{words[1].decode('utf-8', 'replace')}, " if len(words) == 2 else ""
    return f"{model}({solvent}dielectric {dielectric:g})"


def _frozen(
    text: Text, energy: Energy, geometry: Geometry, alpha: int | None, at: dict[str, int]
) -> str | None:
    """Return "none" or "frozen", with what is unusual about it; None where the file does not say.

    `alpha` is how many electrons of spin up there are, None where the file does not say.
    """
    start, end = energy.solution.at, energy.end
    count: int | None = None
    for pattern in _FROZEN:
        if match := pattern.search(text.data, start, end):
            count, at["frozen_core"] = int(match.group(1)), match.start()
            break
    else:
        if match := _DIRECT.search(text.data, start, end):
            count, at["frozen_core"] = int(match.group(1)) - 1, match.start()
        elif alpha is not None and (match := _RESOLVED.search(text.data, start, end)):
            count, at["frozen_core"] = alpha - int(match.group(1)), match.start()
            if count < 0:
                raise text.error(
                    match.start(),
                    f"{match.group(1).decode()} orbitals are correlated, of {alpha} occupied ones",
                    mend=CUT_SHORT,
                )
    if count is None:
        return None
    virtuals = _FROZEN_VIRTUALS.search(text.data, start, end)
    extra = ""
    if virtuals is not None and int(virtuals.group(1)):
        extra = f", {int(virtuals.group(1))} virtual orbitals too"
    if count == 0:
        return "none" + extra
    cores = sum(
        max(0, next(n for last, n in _CORES if z <= last) - replaced // 2)
        for z, replaced in zip(geometry.numbers, replaced_cores(text, geometry), strict=True)
    )
    return ("frozen" if count == cores else f"frozen: {count} orbitals") + extra


def _state(
    before: Text, label: str, at: dict[str, int]
) -> tuple[int | None, int | None, int | None]:
    """Return charge, multiplicity and number of electrons, None where they are not printed."""
    if label == "DFT":
        place = before.last(b"Charge           :")
        match = place >= 0 and _DFT_STATE.search(
            before.data, max(before.start, place - 200), place + 100
        )
        if not match:
            return None, None, None
        at["charge"], at["multiplicity"] = match.start(4), match.start(5)
        total, alpha, beta, charge, multiplicity = (int(group) for group in match.groups())
        if alpha + beta != total or multiplicity != abs(alpha - beta) + 1:
            raise before.error(
                match.start(), "these numbers of electrons do not fit together", mend=CUT_SHORT
            )
        return charge, multiplicity, total
    place = before.last(b" charge          =")
    if place < 0:
        return None, None, None
    at["charge"] = place
    charge = _whole(before, place, "the charge")
    match = _SCF_STATE.search(before.data, max(before.start, place - 400), place + 1)
    if match is None:
        return charge, None, None
    at["multiplicity"] = match.start(2)
    first, second = int(match.group(2)), int(match.group(4))
    if match.group(1) == b"closed":
        return charge, second + 1, 2 * first + second
    return charge, first - second + 1, first + second


def _check_electrons(
    text: Text, geometry: Geometry, charge: int | None, electrons: int | None, at: dict[str, int]
) -> None:
    """Compare nuclear charges, charge and number of electrons, those of core potentials left out."""
    if charge is None or electrons is None:
        return
    cores = int(geometry.numbers.sum()) - charge - electrons
    if cores and cores != sum(replaced_cores(text, geometry)):
        raise text.error(
            at["charge"],
            f"charge {charge} and {electrons} electrons do not fit the nuclei of the geometry",
            mend=CUT_SHORT,
        )


def _whole(before: Text, place: int, what: str) -> int:
    """Return the whole number that follows the `:` or `=` of a line."""
    line = before.rest(place)
    value = float(before.exact_text(place + max(line.find(b":"), line.find(b"=")) + 1, what))
    if value != int(value):
        raise before.expected(place, f"{what}, a whole number")
    return int(value)


def _covered(tags: set[str], geometry: Geometry) -> bool:
    """Tell whether a table of basis sets by name of centre has a row for every atom."""
    if "*" in tags:
        return True
    rows = {tag.lower() for tag in tags}
    real = zip(geometry.tags, geometry.numbers.tolist(), strict=True)
    missing = {(tag.lower(), SYMBOLS[z].lower()) for tag, z in real if z}
    missing = {names for names in missing if rows.isdisjoint(names)}
    elements = {element(tag, geometry) for tag in tags} if missing else set()
    return all(symbol in elements or tag in elements for tag, symbol in missing)


def _basis(before: Text, geometry: Geometry, at: dict[str, int]) -> str | None:
    """Return the library's name of the basis set, or the name by element; None where one has no name."""
    place = before.last(_SUMMARY)
    if place < 0:
        place = before.data.rfind(_SUMMARY, 0, before.end)
    if place < 0:
        return None
    heading = before.rest(place)
    line = before.next_line(place, 4)
    names: dict[str, str] = {}
    polarised = False
    table = before.data[line : before.blank_line(line)].decode("utf-8", "replace")
    for text_line in table.splitlines():
        row = _BASIS_ROW.fullmatch(text_line)
        if row is None:
            return None
        polarised = polarised or row.group(3) is None or not set("dfghi").isdisjoint(row.group(3))
        names[row.group(1)] = row.group(2)
    if not names or "user specified" in names.values() or not _covered(set(names), geometry):
        return None
    at["basis"] = before.next_line(place, 4)
    real = {tag: name for tag, name in names.items() if tag[:2].lower() != "bq"}
    if len(set(real.values())) == 1:
        text = next(iter(real.values()))
    else:
        by_element = {(element(tag, geometry).capitalize(), name) for tag, name in real.items()}
        text = ", ".join(f"{symbol}: {name}" for symbol, name in sorted(by_element))
    return f"{text} (cartesian)" if polarised and b"(cartesian)" in heading else text
