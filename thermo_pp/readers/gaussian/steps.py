"""Steps of a Gaussian output: each ends with "Normal termination" and has a route and an archive entry.

Linked jobs and the steps that the program makes of one route (``opt freq``) look alike. The archive
entry at the end of a step has its method, its energies, its geometry and its force constants once
more, in lines of 70 characters; Windows writes ``|`` for its backslashes. Some jobs have none.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import cached_property

from thermo_pp.data.elements import SYMBOLS
from thermo_pp.readers.text import CUT_SHORT, Text

THERMOCHEMISTRY = b"\n - Thermochemistry -"
NORMAL = b"\n Normal termination of Gaussian"
_ERROR = b"\n Error termination"
_STEPS = b"-- Number of steps exceeded"
_STOPPED = b"Optimization stopped."
_DONE = b" SCF Done:"
_VIRIAL = b"-V/T"
_BEHIND_DONE = 600
"""Within so many bytes behind its energy an SCF prints its virial ratio."""
_GOES_ON = (
    b"\n Link1:  Proceeding to internal job step",
    b"\n Entering Link 1 =",
    b"\n Initial command:",
)
_ROUTE = re.compile(rb"\n (-{3,})\n( *#[^\n]*(?:\n(?! ---)[^\n]*)*)\n (-{3,})\n")
_GEOMETRY = re.compile(rb"\n +(Standard|Input|Z-Matrix|Principal axis) orientation: *\n -{20,}\n")
_LIKE_A_HEADING = re.compile(rb"rientation|Standard|Input|orient")
_ATOMS = re.compile(rb"\n NAtoms= *(\d+) ")
_STOICHIOMETRY = re.compile(rb"\n Stoichiometry +(\S+)")
_ELEMENT = re.compile(r"([A-Z][a-z]?)(\d*)")
_CHARGE = re.compile(rb"\n Charge = *(-?\d+) +Multiplicity = *(\d+)")
_ARCHIVES = (b"\n 1\\1\\", b"\n 1|1|")
_OPT = re.compile(r"(?<![\w=(-])(?:f?opt|popt)\b", re.IGNORECASE)  # not stable=opt
_FREQ = re.compile(r"(?<![\w-])freq\b", re.IGNORECASE)
_PROJECTED = re.compile(r"(?<![\w-])freq\w* *=? *\(?[^ )]*projected", re.IGNORECASE)
_BOTH = re.compile(r"(?<![\w/-])(?:g[1-4](?:mp2)?\w*|cbs-\w+|w1\w*)\b", re.IGNORECASE)
_PATH = re.compile(r"(?<![\w-])(?:bomd|admp|trajectory)\b", re.IGNORECASE)
_SEVERAL = re.compile(r"(?<![\w-])(?:irc\w*|scan)\b", re.IGNORECASE)


@dataclass(frozen=True)
class Archive:
    """An archive entry: its fields between backslashes, and where it stands."""

    fields: tuple[str, ...]
    at: int

    @property
    def job(self) -> str:
        """``SP``, ``FOpt``, ``Freq`` ..."""
        return self.fields[3]

    @property
    def method(self) -> str:
        """``RB3LYP``, ``RCCSD(T)-FC`` ..."""
        return self.fields[4]

    @property
    def basis(self) -> str:
        """``6-31G(d)``, ``GenECP`` ..."""
        return self.fields[5]

    def value(self, name: str) -> float | None:
        """Return the number behind ``name=``, None where there is none."""
        for field in self.fields[6:]:
            if field.startswith(f"{name}="):
                try:
                    return float(field[len(name) + 1 :].split(",")[0])
                except ValueError:
                    return None
        return None


@dataclass(frozen=True)
class Step:
    """One step: from the end of the step before to its own end.

    `finished` is false for an optimisation that ran out of steps, after which the program stops in an error.
    """

    text: Text
    start: int
    end: int
    finished: bool

    @cached_property
    def part(self) -> Text:
        """The text of the step."""
        return self.text.part(self.start, self.end)

    @cached_property
    def _route(self) -> re.Match[bytes] | None:
        return self.part.line_match(_ROUTE, b"\n ---")

    @cached_property
    def route_at(self) -> int:
        """Where the route stands, the start of the step where there is none."""
        return self.start if self._route is None else self._route.start(2)

    @cached_property
    def route(self) -> str:
        """The route, its lines joined, empty where there is none."""
        if self._route is None:
            return ""
        lines = self._route.group(2).decode("utf-8", "replace").split("\n")
        return "".join(line[1:] for line in lines)

    @cached_property
    def archive(self) -> Archive | None:
        """The last archive entry, None where there is none."""
        at = self.part.last(_ARCHIVES[0])
        at = self.part.last(_ARCHIVES[1]) if at < 0 else at
        if at < 0:
            return None
        stop = self.text.data.find(b"@", at, self.end)
        if stop < 0:
            return None
        joined = self.text.data[at + 1 : stop].replace(b"\n ", b"").replace(b"\n", b"")
        fields = (
            joined.decode("utf-8", "replace").strip().split("\\" if b"\\" in joined[:4] else "|")
        )
        return Archive(tuple(fields), at + 1) if len(fields) > 8 else None

    @cached_property
    def optimises(self) -> bool:
        """Whether the step is an optimisation."""
        if self.archive is not None and self.archive.job in ("Freq", "SP", "Force"):
            return False
        if not self.route:
            return self.part.has(_STOPPED)
        return _OPT.search(self.route) is not None

    @property
    def asks_projection(self) -> bool:
        """Whether the route asks for modes without the direction of the gradient."""
        return _PROJECTED.search(self.route) is not None

    @cached_property
    def asks_frequencies(self) -> bool:
        """Whether the step's route asks for frequencies, of this step or of the next."""
        return _FREQ.search(self.route) is not None

    @cached_property
    def thermochemistry_at(self) -> int:
        """Where the last thermochemistry stands, -1 without any."""
        single = self.archive is not None and self.archive.job in ("SP", "Force")
        at = -1 if single and not self.asks_frequencies else self.part.last(THERMOCHEMISTRY)
        return at + 1 if at >= 0 else -1

    @cached_property
    def blocks(self) -> list[int]:
        """Where the headings of the geometry blocks stand, in order; ReadError where one is damaged."""
        data = self.text.data
        found = []
        for at in self.part.all(b" orientation:"):
            line = data.rfind(b"\n", 0, at)
            if _GEOMETRY.match(data, line) is not None:
                found.append(line + 1)
        known = set(found)
        for at in self.part.all(b"Coordinates (Angstroms)"):
            line = at
            for _ in range(3):
                line = data.rfind(b"\n", 0, max(line, 0))
            heading = data[line + 1 : data.find(b"\n", line + 1)].rstrip()
            damaged = not heading.endswith(b":") or _LIKE_A_HEADING.search(heading) is not None
            if line + 1 not in known and damaged:
                raise self.text.expected(
                    line + 1, "'Standard orientation:' or 'Input orientation:'"
                )
        return found

    @cached_property
    def energies_at(self) -> list[int]:
        """Where the SCFs are done, in order; ReadError where one has lost its energy."""
        found = [at + 1 for at in self.part.all(b"\n" + _DONE)]
        for at in self.part.all(_VIRIAL):  # printed with each of them
            if self.text.data.rfind(_DONE, max(at - _BEHIND_DONE, self.start), at) < 0:
                raise self.text.error(
                    at,
                    f"an SCF without its energy before this line (looked for {_DONE.decode()!r})",
                    mend=CUT_SHORT,
                )
        return found

    @cached_property
    def atoms(self) -> int | None:
        """How many atoms the program says that there are, None where it does not."""
        match = self.part.line_match(_ATOMS, b"\n NAtoms=")
        return None if match is None else int(match.group(1))

    @cached_property
    def formula(self) -> tuple[dict[str, int], int] | None:
        """The elements that the program counts and where; None where it does not, or counts ghosts and dummies too."""
        match = self.part.line_match(_STOICHIOMETRY, b"\n Stoichiometry ")
        if match is not None:
            words, at = match.group(1).decode("utf-8", "replace"), match.start(1)
        elif self.archive is not None:
            words, at = self.archive.fields[6], self.archive.at
        else:
            return None
        bare = words.partition("(")[0]
        counted = {name: int(count or 1) for name, count in _ELEMENT.findall(bare)}
        whole = "".join(f"{name}{count}" for name, count in _ELEMENT.findall(bare)) == bare
        return (counted, at) if whole and counted and not set(counted) - set(SYMBOLS) else None

    @property
    def of_several(self) -> bool:
        """Whether the step goes through several structures: a scan, a path."""
        return _SEVERAL.search(self.route) is not None

    @cached_property
    def state(self) -> tuple[int, int, int] | None:
        """Charge, multiplicity and where they stand."""
        match = self.part.line_match(_CHARGE, b"\n Charge =")
        return (
            None if match is None else (int(match.group(1)), int(match.group(2)), match.start() + 1)
        )


def steps(text: Text) -> list[Step]:
    """Return the steps of the output in order.

    Raises
    ------
    ReadError
        An error termination (other than that of an optimisation that ran out of steps), no normal
        end, a step that was announced and is not there, a composite method, a trajectory.
    """
    ends = [_line_behind(text, at + 1) for at in text.all(NORMAL)]
    begin = ends[-1] - 1 if len(ends) == 1 else 0  # in one step an error would be its end
    failed = text.part(begin).last(_ERROR)
    found = (
        [Step(text, start, end, True) for start, end in zip([0, *ends[:-1]], ends, strict=True)]
        if ends
        else []
    )
    last = ends[-1] if ends else 0
    if failed >= 0:
        ran_out = failed + 1 >= last and text.find(_STEPS, last) >= 0
        first = text.find(_ERROR) + 1
        if not ran_out or first < last:
            raise text.error(
                first,
                f"the job ended in an error ({text.line(first).strip()[:80]!r})",
                mend="mend the job and rerun it",
            )
        found.append(Step(text, last, text.end, False))
    elif not ends or any(text.find(mark, last - 1) >= 0 for mark in _GOES_ON):
        raise text.error(
            len(text.data.rstrip()),
            f"the output does not end normally (looked for {NORMAL.decode().strip()!r})",
            mend=CUT_SHORT,
        )
    for step in found:
        _check_whole(step)
        if _BOTH.search(step.route) is not None or _PATH.search(step.route) is not None:
            raise text.error(
                step.route_at,
                f"a composite method or a trajectory, whose energies are not read ({step.route.strip()[:60]!r})",
                mend="give the outputs of its parts, or a job of one structure at one level",
            )
    return found


def _line_behind(text: Text, at: int) -> int:
    """Return where the line behind that of `at` begins; the end of the text where there is none."""
    return text.data.find(b"\n", at) + 1 or text.end


def _check_whole(step: Step) -> None:
    """Refuse a step in which another one begins: the end of the one before is lost."""
    done = step.part.find(b"\n" + _DONE)
    begins = [step.part.find(mark, done) for mark in _GOES_ON] if done >= 0 else []
    at = min((at for at in begins if at >= 0), default=-1)
    if at >= 0:
        raise step.text.error(
            at + 1,
            "a step begins here, but the one before has no end "
            f"(looked for {NORMAL.decode().strip()!r})",
            mend="the output is damaged, or the step before did not end; give the steps apart",
        )
