"""The jobs of a Q-Chem output: what each was asked to do, and whether it ended normally.

Each job echoes its own input below ``User input:``, which is where one is told from the next; what stands before the
echo (banner, remarks on the input) belongs to the job that follows. A later job may say ``$molecule read``: charge and
multiplicity are then those of the job before.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from thermo_pp.readers.line_marks import matches
from thermo_pp.readers.text import CUT_SHORT, Text

THANKS = b"Thank you very much for using Q-Chem"
OPTIMISATIONS = ("opt", "optimization", "ts")
FREQUENCIES = ("freq", "frequency")
SINGLE = ("sp", "energy", "single_point")
OTHERS = ("force", "gradient", "nmr", "polarizability", "issc", "dyn_polar")
_ECHO = re.compile(rb"^User input:([^\n]*)\n-{50,}\r?\n(.*?)^-{50,}\r?$", re.MULTILINE | re.DOTALL)
_COUNTED = re.compile(rb"(\d+) of (\d+)")
_FATAL = b"Q-Chem fatal error occurred in module"
_CYCLES = b"MAXIMUM OPTIMIZATION CYCLES REACHED"
_SECTION = re.compile(rb"^[ \t]*\$(\w+)[ \t]*\r?\n(.*?)^[ \t]*\$end\b", re.M | re.S | re.I)
_STATE = re.compile(rb"\s*(-?\d{1,3})[ \t]+(\d{1,3})[ \t]*(?:!.*)?\r?$", re.MULTILINE)
_REFUSED_SECTIONS = {
    "external_charges": "point charges around the molecule",
    "efp_fragments": "effective fragments around the molecule",
    "multipole_field": "an external field",
    "cdft": "a constrained density",
}
_REFUSED_KEYS = ("qm_mm_interface", "eda", "eda2", "frgm_method", "basis2", "xpol", "noci", "efp")
_STATE_KEYS = ("cis_state_deriv", "cc_state_to_opt", "eom_state_to_opt", "adc_state_to_opt")
_OFF = ("0", "false", "none", "off")


@dataclass(frozen=True)
class Job:
    """One job.

    Attributes
    ----------
    start, echo, end : int
        Offsets of its first line, of the echo of its input and behind its last line.
    rem : dict of str to str
        Its ``$rem``, lower case.
    sections : dict of str to bytes
        The other sections of its input by name, lower case.
    charge, multiplicity : int
    state_at : int
        Offset of the line with both.
    stopped_at : int or None
        Where an optimisation says that it ran out of cycles.
    """

    start: int
    echo: int
    end: int
    rem: dict[str, str]
    sections: dict[str, bytes]
    charge: int
    multiplicity: int
    state_at: int
    stopped_at: int | None

    @property
    def kind(self) -> str:
        """What the job is, of ``energy``, ``gradient``, ``optimisation``, ``frequencies``."""
        name = job_type(self.rem)
        if name in OPTIMISATIONS:
            return "optimisation"
        if name in FREQUENCIES:
            return "frequencies"
        return "gradient" if name in ("force", "gradient") else "energy"


def job_type(rem: dict[str, str]) -> str:
    """Return the job type that a ``$rem`` asks for."""
    return rem.get("jobtype") or rem.get("job_type") or "sp"


def jobs(text: Text) -> list[Job]:
    """Return the jobs of a file, each of which ended normally or ran out of optimisation cycles.

    Raises
    ------
    ReadError
        No job, one that did not end, one of a kind that is not read.
    """
    echoes = matches(_ECHO, b"User input:", text, 0, text.end)
    if not echoes:
        _refuse_failure(text, 0, text.end)
        raise text.error(text.end, "no echo of an input (looked for 'User input:')", mend=CUT_SHORT)
    found: list[Job] = []
    start = 0
    for number, echo in enumerate(echoes):
        following = echoes[number + 1].start() if number + 1 < len(echoes) else text.end
        thanks = text.data.find(THANKS, echo.end(), following)
        again = -1 if thanks < 0 else text.data.find(THANKS, thanks + 1, following)
        if again >= 0:
            raise text.error(again, "the end of a job without its beginning", mend=CUT_SHORT)
        stopped = text.data.find(_CYCLES, echo.end(), following)
        end = following if thanks < 0 else thanks
        if stopped < 0:
            _refuse_failure(text, echo.end(), following)
            if thanks < 0:
                raise text.error(
                    following,
                    f"no normal end of the job (looked for {THANKS.decode()!r})",
                    mend=CUT_SHORT,
                )
        found.append(_job(text, start, echo, end, found[-1] if found else None, stopped))
        start = end
    tail = text.data.find(b"Welcome to Q-Chem", start)
    if tail >= 0:
        _refuse_failure(text, tail, text.end)
        raise text.error(text.end, "the last job of this file has no end", mend=CUT_SHORT)
    _check_count(text, echoes)
    return found


def _check_count(text: Text, echoes: list[re.Match[bytes]]) -> None:
    """Refuse a file in which some of the jobs that its inputs count are missing."""
    counted = [_COUNTED.fullmatch(echo.group(1).strip()) for echo in echoes]
    whole, expected = len(echoes), 1
    for echo, match in zip(echoes, counted, strict=True):
        if match is None and not any(counted):
            return
        number, total = (0, 0) if match is None else (int(match.group(1)), int(match.group(2)))
        if number not in (1, expected):
            raise text.error(echo.start(), "a job before this one is missing", mend=CUT_SHORT)
        expected, whole = number + 1, total
    if expected <= whole:
        raise text.error(
            text.end, f"job {expected - 1} of {whole} is the last one here", mend=CUT_SHORT
        )


def _refuse_failure(text: Text, start: int, end: int) -> None:
    """Refuse a job that the program ended in an error."""
    at = text.data.find(_FATAL, start, end)
    if at < 0:
        return
    reason = [
        line.strip() for line in text.data[at : at + 600].decode("utf-8", "replace").split("\n")
    ]
    words = next((line for line in reason[1:] if line), reason[0])
    raise text.error(
        at, f"the job ended in an error: {words[:120]}", mend="mend the job and rerun it"
    )


def _job(
    text: Text, start: int, echo: re.Match[bytes], end: int, before: Job | None, stopped: int
) -> Job:
    sections: dict[str, bytes] = {}
    state_at, charge, multiplicity = -1, 0, 0
    for match in _SECTION.finditer(text.data, echo.start(2), echo.end(2)):
        name = match.group(1).decode("utf-8", "replace").lower()
        sections[name] = match.group(2)
        if name == "molecule":
            state = _STATE.match(text.data, match.start(2), match.end(2))
            if state is not None:
                charge, multiplicity = int(state.group(1)), int(state.group(2))
                state_at = state.start(1)
    rem = _rem(sections.pop("rem", b""))
    if not any(key in rem for key in ("method", "exchange", "correlation")):
        raise text.error(
            echo.start(), "no method in the echo of the input (looked in $rem)", mend=CUT_SHORT
        )
    if state_at < 0:
        if before is None or sections.get("molecule", b"").strip().lower() != b"read":
            raise text.error(
                echo.start(),
                "no charge and multiplicity in the echo of the input (looked in $molecule)",
                mend="give the molecule in the input itself, or the file from its first job on",
            )
        charge, multiplicity, state_at = before.charge, before.multiplicity, before.state_at
    job = Job(
        start,
        echo.start(),
        end,
        rem,
        sections,
        charge,
        multiplicity,
        state_at,
        None if stopped < 0 else stopped,
    )
    _check(text, job)
    return job


def _rem(section: bytes) -> dict[str, str]:
    rem: dict[str, str] = {}
    for line in section.decode("utf-8", "replace").lower().splitlines():
        words = line.partition("!")[0].replace("=", " ").split()
        if len(words) >= 2:
            rem[words[0]] = words[1]
    return rem


def _check(text: Text, job: Job) -> None:
    """Refuse kinds of jobs whose numbers are not those of a molecule in its ground state."""
    kind = job_type(job.rem)
    if kind not in (*OPTIMISATIONS, *FREQUENCIES, *SINGLE, *OTHERS):
        raise text.error(
            job.echo,
            f"a job of the type {kind!r}, which is not read",
            mend="give an energy, gradient, optimisation or frequency job",
        )
    for name, what in _REFUSED_SECTIONS.items():
        if name in job.sections:
            raise text.error(
                job.echo,
                f"a job with {what} (${name}), whose energy is not that of the molecule",
                mend="give a calculation of the molecule alone",
            )
    for key in _REFUSED_KEYS:
        if job.rem.get(key, "0") not in _OFF:
            raise text.error(
                job.echo,
                f"a job with {key} {job.rem[key]}, which is not read",
                mend="give a calculation of the molecule alone, without it",
            )
    for key in _STATE_KEYS:
        value = job.rem.get(key, "0")
        if value.strip("[]0, ") and value not in _OFF and job.kind != "energy":
            raise text.error(
                job.echo,
                f"a job on an excited state ({key} {value}), which is not read",
                mend="give a job on the ground state",
            )
