"""Level of theory of an evaluation in an ORCA output: what the input asked for, checked by the output."""

from __future__ import annotations

import re
from dataclasses import dataclass

from thermo_pp.readers.level import Level
from thermo_pp.readers.line_marks import matches
from thermo_pp.readers.orca.energies import Energy, is_without_scf
from thermo_pp.readers.orca.layout import Layout
from thermo_pp.readers.text import CUT_SHORT, Text

_NAMES = (
    "HFS LDA LSD VWN VWN5 VWN3 PWLDA XALPHA BP86 BP BLYP OLYP GLYP XLYP PW91 MPWPW MPWLYP PBE RPBE "
    "REVPBE RPW86PBE PWP B97-D B97-D3 B97-D4 B97 M06L M06-L TPSS REVTPSS SCANFUNC SCAN RSCAN R2SCAN "
    "B97M-V B97M-D3BJ B97M-D4 MN15L B1LYP B3LYP B3LYP/G B3LYP_G B3LYP_TM B3LYP/TM O3LYP X3LYP B1P "
    "B3P B3P86 B3PW B3PW91 PW1PW MPW1PW MPW1LYP PBE0 PBE1PBE REVPBE0 REVPBE38 PW6B95 BHANDHLYP M06 "
    "M062X M06-2X M05 M052X MN15 TPSSH TPSS0 R2SCANH R2SCAN0 R2SCAN50 SCAN0 WB97 WB97X WB97X-D3 "
    "WB97X-D3BJ WB97X-D4 WB97X-D4REV WB97X-V WB97M-V WB97M-D3BJ WB97M-D4 WB97M-D4REV CAM-B3LYP "
    "LC-BLYP LC-PBE WR2SCAN B2PLYP MPW2PLYP B2GP-PLYP B2K-PLYP B2T-PLYP B2NC-PLYP PWPB95 PBE-QIDH "
    "PBE0-DH PBE0-2 DSD-BLYP DSD-BLYP/2013 DSD-PBEP86 DSD-PBEP86/2013 DSD-PBEB95 WB2PLYP "
    "WB2GP-PLYP RSX-QIDH RSX-0DH WB88PP86 WPBEPP86 WB97X-2 REVDSD-PBEP86-D4/2021 "
    "REVDSD-PBEP86/2021 REVDOD-PBEP86/2021 REVDOD-PBEP86-D4/2021 PR2SCAN50 KPR2SCAN50 WPR2SCAN50 "
    "PR2SCAN69 SCS/SOS-WB2PLYP SCS-WB2GP-PLYP SOS-WB2GP-PLYP HF-3C B97-3C PBEH-3C B3LYP-3C "
    "R2SCAN-3C WB97X-3C"
)
FUNCTIONALS: frozenset[str] = frozenset(_NAMES.split())
"""Names of functionals and composite methods on an input line, upper case."""
_CORRELATED = re.compile(
    r"(?:AUTOCI-|AUTO-)?((?:DLPNO-|LPNO-|RI-|OO-|F12-|SCS-|SOS-|CIM-)*"
    r"(?:MP2|MP3|MP4|MP4\(SDQ\)|CCSD|CCSD\(T\)|CCSD\(T1\)|QCISD|QCISD\(T\)|CISD|CEPA/?\d|CPF/?\d?|ACPF|NCPF/?\d?|"
    r"LCCSD|BD|BD\(T\)|CCSDT|CC2|CC3|CCD|DCSD|DCD|CCSDT-1)(?:-F12(?:D)?(?:/RI)?)?)"
)
_CORRELATED_BLOCK = re.compile(rb"% *(?:mp2|method|compound|mdci)\b", re.IGNORECASE)
_MULTICONFIGURATION = re.compile(r"(?:DLPNO-|FIC-|SC-|RI-|PC-)*(?:CASSCF|NEVPT2|MRCI|CASPT2)")
_HEADING = b"                INPUT FILE"
_FIRST_LINE = b"\n|  1> "
END_OF_INPUT = b"****END OF INPUT****"
_LINE = re.compile(rb"\n\| *(\d+)>")
_BANG = re.compile(rb"\|\s*\d+>\s*(?:[^\n]*?\W)?!([^\n]*)")
_FUNCTIONAL = re.compile(
    rb"^\|\s*\d+>[^\n#]*\bfunctional\s+([^\s#]+)", re.MULTILINE | re.IGNORECASE
)
_BASIS = b"Your calculation utilizes the basis:"
_OWN_BASIS = re.compile(rb"^\|\s*\d+>[^\n#]*\b(?:newgto|addgto)\b", re.MULTILINE | re.IGNORECASE)
_FROZEN_MARKS = (b"\nFrozen core treatment", b"\nFreezing NCore=")
_FROZEN = re.compile(rb"\nFrozen core treatment +\.\.\. ([^\n]*)|\nFreezing NCore=(\d+)[^\n]*")
_DISPERSION = re.compile(rb"\b(DFTD2|DFTD3|DFTD4|DFT-D2)\b")
_WITH_DISPERSION = re.compile(
    r"^D[234](?:BJ|ZERO|TZ|2|M)?$|-D[234]?(?:BJ|REV)?(?:/\d+)?$|-3C$|^(?:NL|SCNL|VV10)$"
)
_STATES = re.compile(r"EOM|^ADC|^CIS|^TD-?DFT|^S?TDA$|ROCIS|^S?TDDFT|^ESD|STEOM|^IP-|^EA-")
_STATES_BLOCK = re.compile(rb"% *(?:tddft|cis|rocis|casresp)\b", re.IGNORECASE)
_WITH_SOLVENT = re.compile(r"^(?:C-?PCM|SMD|COSMO|ALPB|DDCOSMO|GBSA|DRACO)")
_IN_SOLVENT = re.compile(r"(?:C-?PCM|SMD)\(([^()]+)\)")
_GRID = re.compile(
    rb"IntAcc +\.\.\. (\d+\.\d+)(?:[^\n]*\n){1,3}?Angular Grid[^\n]*?\.\.\. [^\n]*?(Lebedev-\d+)"
)
_SOLVENT = re.compile(rb"\n *Solvent: +\.\.\. +(\S[^\n]*)|\n *Epsilon +\.\.\. +(\d+\.\d+)")
_CHARGE = re.compile(rb"Total Charge +Charge +\.\.\.\. +(-?\d+)")
_MULTIPLICITY = re.compile(rb"Multiplicity +Mult +\.\.\.\. +(\d+)")
_XYZ = re.compile(
    rb"^\|\s*\d+> *\* *(?:xyzfile|xyz|int|internal|gzmt|gzmtfile|pdbfile) +(-?\d+) +(\d+)",
    re.MULTILINE | re.IGNORECASE,
)


@dataclass(frozen=True)
class Asked:
    """The input: its keywords, upper case, the functionals among them, where it stands, its text.

    `only` tells whether it is that of the only job, `own_basis` whether it changes the basis set.
    """

    words: tuple[str, ...]
    functionals: tuple[str, ...]
    at: int
    text: Text
    only: bool = True
    own_basis: bool = False

    @property
    def method(self) -> str | None:
        """The one method that is asked for, None without one or with several."""
        correlated = [m.group(1) for word in self.words if (m := _CORRELATED.fullmatch(word))]
        correlated += [word for word in self.words if _MULTICONFIGURATION.match(word)]
        names = set(correlated or self.functionals)
        if not names:
            names = {
                w for w in self.words if w in ("HF", "RHF", "UHF", "ROHF") or is_without_scf(w)
            }
        return names.pop() if len(names) == 1 else None

    @property
    def correlated(self) -> bool:
        """Whether a correlated method may be asked for: by a known keyword, or in a block."""
        if any(_CORRELATED.fullmatch(word) for word in self.words):
            return True
        return _CORRELATED_BLOCK.search(self.text.data, self.text.start, self.text.end) is not None

    @property
    def states(self) -> bool:
        """Whether excited states are asked for."""
        block = _STATES_BLOCK.search(self.text.data, self.text.start, self.text.end)
        return block is not None or any(_STATES.search(word) for word in self.words)


def asked(text: Text, before: int, job: int, jobs: int) -> Asked:
    """Return what the last input before an offset asks for, in its `job`-th of `jobs` parts."""
    echo = _echo(text, before)
    if echo is None:
        return Asked((), (), 0, text.part(0, 0))
    start, end = echo
    part = text.part(start, end)
    if jobs > 1:
        cuts = [start, *(m.start() for m in re.finditer(rb"(?i)\$new_job", part.data[:end])), end]
        cuts = [cut for cut in cuts if cut >= start]
        if len(cuts) == jobs + 1:
            part = text.part(cuts[job], cuts[job + 1])
    words: list[str] = []
    for line in matches(_BANG, b"!", part, part.start, part.end):
        if line.start() < part.start:  # the line with which this job of several begins
            continue
        bare = line.group(1).partition(b"#")[0].decode("utf-8", "replace")
        words += bare.upper().replace("!", " ").split()
    functionals = [name for word in words if (name := _functional(word))]
    lower = part.data[part.start : part.end].lower()
    in_block = b"functional" in lower
    for named in _FUNCTIONAL.finditer(part.data, part.start, part.end) if in_block else ():
        functionals.append(named.group(1).decode("utf-8", "replace").upper().strip("\"'"))
    own_basis = _OWN_BASIS.search(lower) is not None if b"gto" in lower else False
    return Asked(tuple(words), tuple(functionals), part.start, part, jobs == 1, own_basis)


def _echo(text: Text, before: int) -> tuple[int, int] | None:
    """Return where the last echo of an input before an offset begins and ends; None where there is none.

    Raises
    ------
    ReadError
        An echo without its beginning or its end, or with a line missing: its lines are numbered.
    """
    ends = [at for at in text.all(END_OF_INPUT) if at + len(END_OF_INPUT) <= before]
    end = ends[-1] if ends else -1
    start = max(text.last(_FIRST_LINE, before), text.last(_HEADING, before))
    if start < 0 and end < 0:
        return None
    if start > end or start < (ends[-2] if len(ends) > 1 else -1):
        raise text.error(
            max(start, end), "an echo of the input without beginning or end", mend=CUT_SHORT
        )
    numbers = _LINE.findall(text.data, start, end)
    if numbers != [b"%d" % count for count in range(1, len(numbers) + 1)]:
        lines = enumerate(_LINE.finditer(text.data, start, end), start=1)
        count, match = next((i, m) for i, m in lines if m.group(1) != b"%d" % i)
        raise text.error(
            match.start(1), f"line {count} of the input is not in its echo", mend=CUT_SHORT
        )
    return start, end


def _functional(word: str) -> str | None:
    bare = re.sub(r"^(?:RI-|DLPNO-|D-)", "", word)
    if bare in FUNCTIONALS:
        return bare
    return None


def level(layout: Layout, energy: Energy, inputs: Asked) -> Level:
    """Return the level of theory of `energy`."""
    final = energy.final
    part = layout.text.part(final.start, final.at)
    at: dict[str, int] = {"method": inputs.at if inputs.words else final.at}
    method = _method(energy, inputs)
    titles = b"\n".join(layout.between(final.start, final.at))
    grid = _grid(layout, part, at) if energy.label == "DFT" else None
    return Level(
        method,
        _basis(layout.text, final.at, inputs.only, inputs, at),
        _dispersion(part, titles, method, inputs, at),
        _solvent(part, titles, energy, inputs, at),
        grid,
        _frozen_core(part, energy, at),
        at,
    )


def _method(energy: Energy, inputs: Asked) -> str | None:
    bare = energy.label.removesuffix("/CBS")
    if bare == "DFT":
        names = set(inputs.functionals)
        if len(names) == 1:
            return _plain(names.pop())
        return None  # B88 with LYP may be any of several functionals
    if bare == "HF":
        return "HF-3C" if "HF-3C" in inputs.functionals else "HF"
    wanted = [m.group(1) for word in inputs.words if (m := _CORRELATED.fullmatch(word))]
    if is_without_scf(bare):
        return inputs.method
    named = next((word for word in wanted if bare in word.replace("(T1)", "(T)")), None)
    return (named or bare) + ("/CBS" if energy.label.endswith("/CBS") else "")


def _plain(name: str) -> str:
    """Return one spelling of functionals that have several."""
    same = {"M062X": "M06-2X", "M052X": "M05-2X", "M06L": "M06-L", "BP": "BP86", "B3P": "B3P86"}
    same |= {"B3LYP_G": "B3LYP/G", "B3PW": "B3PW91", "PBE1PBE": "PBE0"}
    return same.get(name, name)


def _basis(text: Text, end: int, first: bool, inputs: Asked, at: dict[str, int]) -> str | None:
    place = text.find(_BASIS) if first else text.last(_BASIS, end)
    if place < 0:
        return None
    name = text.rest(place + len(_BASIS)).decode("utf-8", "replace").strip()
    if not name:
        return None
    at["basis"] = place
    return f"{name} with changes of the input" if inputs.own_basis else name


def _dispersion(
    part: Text, titles: bytes, method: str | None, inputs: Asked, at: dict[str, int]
) -> str | None:
    place = part.find(b"DFT DISPERSION CORRECTION") if b"DISPERSION CORRECTION" in titles else -1
    if place < 0:
        name = (method or "").upper()
        if name.endswith(("-V", "-VV10")) or b"NON-LOCAL" in titles.upper():
            return "VV10"
        asked_for = any(_WITH_DISPERSION.search(word) for word in (*inputs.words, name))
        return None if method is None or asked_for else "none"
    at["dispersion"] = place
    near = part.data[place : min(place + 1500, part.end)]
    match = _DISPERSION.search(near)
    if match is None:
        return None
    name = match.group(1).decode().replace("DFT", "").replace("-", "")
    if name != "D3":
        return name
    if b"zero damping" in near:
        return "D3"
    return "D3(BJ)" if b"Johnson" in near or "D3BJ" in inputs.words else None


def _solvent(
    part: Text, titles: bytes, energy: Energy, inputs: Asked, at: dict[str, int]
) -> str | None:
    model = next((m for m in (b"CPCM SOLVATION MODEL", b"COSMO") if m in titles), None)
    if model is None:
        named = [word for word in inputs.words if _WITH_SOLVENT.match(word)]
        if named and is_without_scf(energy.label) and len(named) == 1:
            return named[0]
        block = inputs.text.find(b"%cpcm") >= 0 or inputs.text.find(b"%CPCM") >= 0
        return None if named or block or not inputs.words else "none"
    place = part.find(model)
    at["solvent"] = place
    smd = part.find(b"SMD", place) >= 0 and part.find(b"CDS", place) >= 0
    name = "SMD" if smd else model.split()[0].decode()
    found = {
        i: m.group(i)
        for m in _SOLVENT.finditer(part.data, place, part.end)
        for i in (1, 2)
        if m.group(i)
    }
    if 1 in found:
        called = found[1].decode("utf-8", "replace").strip().lower()
        if not called.isprintable() or "\ufffd" in called:
            raise part.expected(place, "the name of the solvent")
        return f"{name}({called})"
    solvents = {m.group(1).lower() for word in inputs.words if (m := _IN_SOLVENT.fullmatch(word))}
    if len(solvents) == 1:
        return f"{name}({solvents.pop()})"
    return f"{name}(dielectric {float(found[2]):g})" if 2 in found else name


def _grid(layout: Layout, part: Text, at: dict[str, int]) -> str | None:
    """Return the grid of the functional: the final one where there are two, none of those for exchange."""
    start = layout.last(b"SETTING UP THE FINAL GRID", part.end)
    start = start if start >= part.start else part.start
    start = part.find(b"IntAcc", start)
    match = None if start < 0 else _GRID.search(part.data, start, part.end)
    if match is None:
        return None
    at["grid"] = match.start()
    return f"{match.group(2).decode()}, accuracy {float(match.group(1)):g}"


def _frozen_core(part: Text, energy: Energy, at: dict[str, int]) -> str | None:
    if energy.label in ("HF", "DFT"):
        return "none" if energy.label == "HF" else None
    places = sorted(at for mark in _FROZEN_MARKS for at in part.all(mark))
    lines = (_FROZEN.match(part.data, at, part.end) for at in reversed(places))
    found = next((line for line in lines if line is not None), None)
    if found is None:
        return None
    at["frozen_core"] = found.start() + 1
    if found.group(2) is not None:
        return "none" if int(found.group(2)) == 0 else "frozen"
    words = found.group(1).decode("utf-8", "replace")
    return "none" if "NO" in words.split() else "frozen"


def charge_and_multiplicity(text: Text, end: int) -> tuple[int | None, int | None, dict[str, int]]:
    """Return charge and multiplicity of the last settings before `end`, else of the input."""
    at: dict[str, int] = {}
    values: list[int | None] = []
    for name, mark, pattern in (
        ("charge", b" Total Charge           Charge", _CHARGE),
        ("multiplicity", b" Multiplicity           Mult", _MULTIPLICITY),
    ):
        place = text.last(mark, end)
        match = None if place < 0 else pattern.search(text.rest(place))
        if place >= 0 and match is None:
            raise text.expected(place, f"the {name}")
        values.append(None if match is None else int(match.group(1)))
        if match is not None:
            at[name] = place
    if None not in values:
        return values[0], values[1], at
    given = {m.groups(): m.start() for m in _XYZ.finditer(text.data, 0, end)}
    if len(given) == 1:
        (pair, place) = given.popitem()
        return int(pair[0]), int(pair[1]), {"charge": place, "multiplicity": place}
    return None, None, {}
