"""What a GAMESS run was asked to do, and whether it ended normally.

GAMESS prints every option with its value, defaults included, so nothing here is taken from the echo of the input.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from thermo_pp.readers.text import CUT_SHORT, Text

NORMAL = b"EXECUTION OF GAMESS TERMINATED NORMALLY"
ABNORMAL = b"EXECUTION OF GAMESS TERMINATED -ABNORMALLY-"
BANNER = b"GAMESS VERSION ="
_CONTROL = b"$CONTRL OPTIONS"
_PAIR = re.compile(r"(\w+) *= *([^\s=]*)(?=\s|$)")
_NOT_LOCATED = (b"FAILURE TO LOCATE STATIONARY POINT", b"GEOMETRY SEARCH IS NOT CONVERGED")
_REASON = re.compile(
    rb"^[ \t*]*(?:ERROR|\*\*\* ?ERROR|[^\n]*\bERROR\b|[^\n]*NOT CONVERGED)[^\n]*", re.MULTILINE
)
_REFUSED = (
    (b"FRAGMENT MOLECULAR ORBITAL", "over fragments"),
    (b"INPUT CARD> $FMO", "over fragments"),
    (b"EFFECTIVE FRAGMENT POTENTIAL", "with effective fragments"),
    (b"INPUT CARD> $EFRAG", "with effective fragments"),
)
_ALONE = {
    "SCFTYP": ("RHF", "UHF", "ROHF"),
    "CITYP": ("NONE", "CIS", ""),
    "VBTYP": ("NONE", ""),
    "RUNTYP": ("ENERGY", "GRADIENT", "HESSIAN", "OPTIMIZE", "SADPOINT", "RAMAN", "PROP", "TDHF"),
    "TDDFT": ("NONE", "EXCITE", ""),
    "RELWFN": ("NONE", "", "DK", "IOTC", "LUT-IOTC", "RESC", "NESC"),
}
"""The values of options that are read."""
KINDS = {
    "GRADIENT": "gradient",
    "HESSIAN": "frequencies",
    "RAMAN": "frequencies",
    "OPTIMIZE": "optimisation",
    "SADPOINT": "optimisation",
}
"""What a run is called in the record; all others are energies."""


@dataclass(frozen=True)
class Run:
    """One run.

    Attributes
    ----------
    start, end : int
        Offsets of its banner and of the line that says how it ended.
    options : dict of str to str
        The options of ``$CONTRL``.
    options_at : int
        Where they stand.
    lost_at : int or None
        Where a geometry search says that it did not end.
    """

    start: int
    end: int
    options: dict[str, str]
    options_at: int
    lost_at: int | None

    @property
    def kind(self) -> str:
        """What the run is, of ``energy``, ``gradient``, ``optimisation``, ``frequencies``."""
        return KINDS.get(self.options["RUNTYP"], "energy")


def run(text: Text) -> Run:
    """Return the one run of a file.

    Raises
    ------
    ReadError
        No run, several, one that did not end normally, one of a kind that is not read.
    """
    start = text.need(BANNER, lacking="no heading of the program")
    second = text.find(BANNER, start + 1)
    lost = max(text.data.find(mark, start) for mark in _NOT_LOCATED)
    normal, abnormal = text.last(NORMAL), text.last(ABNORMAL)
    if abnormal >= 0 and lost < 0:
        reason = _REASON.search(text.data, max(start, abnormal - 3000), abnormal)
        words = (
            "" if reason is None else f": {reason.group().decode('utf-8', 'replace').strip()[:120]}"
        )
        raise text.error(
            abnormal if reason is None else reason.start(),
            f"the run ended in an error{words}",
            mend="mend the run and repeat it",
        )
    end = max(normal, abnormal)
    if end < start:
        raise text.error(
            text.end, f"no normal end of the run (looked for {NORMAL.decode()!r})", mend=CUT_SHORT
        )
    if second >= 0:
        raise text.error(
            second, "a second run of GAMESS in this file", mend="give each run a file of its own"
        )
    options, at = _options(text, start, end)
    found = Run(start, end, options, at, None if lost < 0 else lost)
    _check(text, found)
    return found


def _options(text: Text, start: int, end: int) -> tuple[dict[str, str], int]:
    at = text.part(start, end).need(_CONTROL, lacking="no options of the run")
    begin = text.next_line(at, 2)
    block = text.data[begin : text.blank_line(begin)].decode("utf-8", "replace")
    options: dict[str, str] = {}
    for line in block.splitlines():
        options |= {name: value for name, value in _PAIR.findall(line) if name not in options}
    for name in ("SCFTYP", "RUNTYP", "MPLEVL", "CITYP", "CCTYP", "MULT", "ICHARG"):
        if name not in options:
            raise text.error(at, f"no {name} in these options", mend=CUT_SHORT)
    return options, begin


def _check(text: Text, found: Run) -> None:
    """Refuse runs whose numbers are not those of a molecule in its ground state."""
    options = found.options
    for name, values in _ALONE.items():
        if options.get(name, "") not in values and name in options:
            raise text.error(
                found.options_at,
                f"a run with {name}={options[name]}, which is not read",
                mend=f"give a run with {name}=" + " or ".join(value for value in values if value),
            )
    if options.get("EXETYP", "RUN") != "RUN":
        raise text.error(
            found.options_at,
            f"a run with EXETYP={options['EXETYP']}, which computes nothing",
            mend="give the output of the run itself",
        )
    excited = options.get("TDDFT") == "EXCITE" or options.get("CITYP") == "CIS"
    if excited and found.kind != "energy":
        raise text.error(
            found.options_at,
            "an optimisation or frequency run on an excited state, which is not read",
            mend="give a run on the ground state",
        )
    for mark, what in _REFUSED:
        begin = found.start if mark.startswith(b"INPUT") else found.options_at
        at = text.data.find(mark, begin, found.end)
        if at >= 0:
            raise text.error(
                at,
                f"a calculation {what}, whose energies are not read",
                mend="give a calculation of the molecule alone",
            )
