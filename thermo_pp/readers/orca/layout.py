"""Layout of an ORCA output: its headings, its final energies, its jobs, its end."""

from __future__ import annotations

import re
from bisect import bisect_left
from dataclasses import dataclass
from itertools import pairwise

from thermo_pp.readers.line_index import LineIndex
from thermo_pp.readers.text import CUT_SHORT, Text

INPUT_BYTES = 1 << 20
"""How much of an echoed input is looked at."""
ENERGY = b"FINAL SINGLE POINT ENERGY"
COORDINATES = b"CARTESIAN COORDINATES (ANGSTROEM)"
FREQUENCIES = b"VIBRATIONAL FREQUENCIES"

_END = b"****ORCA TERMINATED NORMALLY****"
_FAILED = (
    b"ORCA finished by error termination",
    b"aborting the run",
    b"ABORTING THE RUN",
    b"ORCA TERMINATED ABNORMALLY",
)

_RULE = b"\n-----"
_HEADING = re.compile(rb"\n-----[- ]*\n[ |*]*([A-Za-z][A-Za-z -][^\n]*)")
_FINAL = re.compile(
    rb"[ :]*(\([^()\n]*\))? *(-?\d+\.\d+)? *(\([^()\n]*\))?[ \t]*(?:\n|$)", re.MULTILINE
)
_EXTERNAL = b"(From external program)"
_JOB = re.compile(rb"\n\$+ +JOB NUMBER +(\d+) +\$")


@dataclass(frozen=True)
class Final:
    """A final energy: its offset, its value, and where the evaluation before it ended.

    `converged` is false where the program says of the energy that its wavefunction is not.
    """

    at: int
    start: int
    value: float
    digits: str
    converged: bool


class Layout:
    """The headings under rules of dashes, in order of their offsets.

    `blocks` keeps what was made of the block under a heading, so that it is made once.
    """

    def __init__(self, text: Text) -> None:
        self.text = text
        self.blocks: dict[int, object] = {}
        self._by_title: dict[bytes, list[int]] = {}
        index = text.index or LineIndex(text.data)
        rules = index.above(_RULE, besides=b"\n-")
        matches = [match for at in rules if (match := _HEADING.match(text.data, at)) is not None]
        self.offsets = [match.start(1) for match in matches]
        self.titles = [match.group(1) for match in matches]
        self._in_order = sorted(zip(self.titles, self.offsets, strict=True))

    def between(self, start: int, end: int) -> list[bytes]:
        """Return the headings from `start` up to `end`."""
        return self.titles[bisect_left(self.offsets, start) : bisect_left(self.offsets, end)]

    def all(self, title: bytes) -> list[int]:
        """Return the offsets of the headings that begin with `title`."""
        found = self._by_title.get(title)
        if found is None:
            first = bisect_left(self._in_order, (title, -1))
            last = bisect_left(self._in_order, (title + b"\xff", -1), first)
            found = self._by_title[title] = sorted(at for _, at in self._in_order[first:last])
        return found

    def last(self, title: bytes, end: int | None = None) -> int:
        """Return the offset of the last heading before `end` that begins with `title`, -1 without one."""
        found = self.all(title)
        i = len(found) if end is None else bisect_left(found, end)
        return found[i - 1] if i else -1

    def next(self, title: bytes, start: int) -> int:
        """Return the offset of the first heading from `start` on that begins with `title`, -1 without one."""
        found = self.all(title)
        i = bisect_left(found, start)
        return found[i] if i < len(found) else -1


def check_end(text: Text) -> None:
    """Refuse an output that does not end with the program's words of a normal end."""
    at = text.last(_END)
    behind = text.part(max(at, 0))
    failed = max(behind.last(mark) for mark in _FAILED)
    if failed > at:
        raise text.error(
            failed,
            f"the job ended in an error ({text.line(failed).strip()[:80]!r})",
            mend="mend the job and rerun it",
        )
    if at < 0 or text.find(ENERGY, at) >= 0 or text.find(b"* O   R   C   A *", at) >= 0:
        raise text.error(
            len(text.data.rstrip()),
            f"the output does not end normally (looked for {_END.decode()!r})",
            mend=CUT_SHORT,
        )


def finals(text: Text) -> list[Final]:
    """Return the final energies in order; ReadError where one is damaged or of a kind not known here."""
    found: list[Final] = []
    start = 0
    for at in text.all(b"\n" + ENERGY):
        place = at + 1
        match = _FINAL.match(text.data, place + len(ENERGY))
        if match is None or match.group(2) is None:
            raise text.expected(place, "the final energy")
        before, digits, behind = match.groups()
        if before not in (None, _EXTERNAL):
            raise text.error(
                place,
                f"a final energy {before.decode('utf-8', 'replace')} is not known to this reader",
                mend="give the output of a calculation of the whole molecule at one level",
            )
        converged = behind is None or b"not fully converged" not in behind
        found.append(Final(place, start, float(digits), digits.decode(), converged))
        start = match.end()
    return found


def jobs(text: Text) -> list[tuple[int, int]]:
    """Return start and end of the jobs that one input file asks for; one of the whole text without any."""
    end = text.find(b"****END OF INPUT****")
    begin = max(end - INPUT_BYTES, 0)
    several = end < 0 or (
        text.data.find(b"$", begin, end) >= 0 and b"$new_job" in text.data[begin:end].lower()
    )
    marks = [match.start() for match in _JOB.finditer(text.data)] if several else []
    return list(pairwise([*marks, text.end])) if marks else [(0, text.end)]
