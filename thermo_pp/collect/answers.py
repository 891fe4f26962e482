"""Answers: one file's outcomes with what they rest on, so that they can be remembered."""

from __future__ import annotations

import time
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from thermo_pp.collect.codec import CodecError, decode, encode, pack, text, unpack
from thermo_pp.collect.outcome import Outcome, PerFile
from thermo_pp.errors import ReadError
from thermo_pp.sources import Looked, Stamp, file_digest, is_own_file, stamp_of

SETTLED_NS = 2_000_000_000
"""A file that was changed less than this before it was read may change again within one tick of the clock."""
UNKNOWN = "unknown"
"""The reader of a file of which nothing is known but that reading it failed."""


@dataclass(frozen=True)
class Sibling:
    """A sibling that was looked for.

    Attributes
    ----------
    name : str
    digest : str or None
        Hash of its bytes; None where there was none.
    stamp : Stamp or None
    """

    name: str
    digest: str | None
    stamp: Stamp | None


@dataclass(frozen=True)
class Answer:
    """What reading one file gave.

    Attributes
    ----------
    outcomes : bytes
        As `codec` writes them; none in a task, and none where the task's answer still holds.
    seen_ns : int
        When the file was looked at.
    stamp : Stamp or None
        Size and times of the file, from before it was read.
    digest : str or None
        Hash of the file's bytes, or of its head; None where the answer is not to be remembered.
    whole : bool
        Whether the digest is of the whole file.
    siblings : tuple of Sibling
    """

    outcomes: bytes
    seen_ns: int = 0
    stamp: Stamp | None = None
    digest: str | None = None
    whole: bool = False
    siblings: tuple[Sibling, ...] = ()

    def to_bytes(self) -> bytes:
        """Return the answer as bytes."""
        siblings = [[text(each.name), each.digest, each.stamp] for each in self.siblings]
        return pack([self.seen_ns, self.stamp, self.digest, self.whole, siblings, self.outcomes])

    @classmethod
    def from_bytes(cls, data: bytes) -> Answer:
        """Return the answer that `to_bytes` wrote; CodecError where it is none."""
        try:
            seen_ns, stamp, digest, whole, siblings, outcomes = unpack(data)
            known = tuple(
                Sibling(name.decode("utf-8", "surrogatepass"), hashed, _stamp(each))
                for name, hashed, each in siblings
            )
            return cls(outcomes, seen_ns, _stamp(stamp), digest, whole, known)
        except (ValueError, TypeError, AttributeError) as error:
            raise CodecError(str(error)) from error

    def holds_at_a_glance(self, path: Path) -> bool:
        """Tell whether the file and its siblings have the size and the times that they had."""
        if self.stamp is None or stamp_of(path) != self.stamp or not self._settled(self.stamp):
            return False
        return all(self._same_sibling(path.parent / each.name, each) for each in self.siblings)

    def holds(self, path: Path) -> bool:
        """Tell whether the bytes of the file and its siblings are what they were."""
        stamp = stamp_of(path)
        if self.digest is None or self.stamp is None or stamp is None or stamp[0] != self.stamp[0]:
            return False
        return file_digest(path, whole=self.whole) == self.digest and all(
            self._same_bytes(path.parent / each.name, each) for each in self.siblings
        )

    def _same_sibling(self, path: Path, known: Sibling) -> bool:
        if known.stamp is None:
            return not is_own_file(path)
        return stamp_of(path) == known.stamp and self._settled(known.stamp) and is_own_file(path)

    def _same_bytes(self, path: Path, known: Sibling) -> bool:
        if not is_own_file(path):
            return known.digest is None
        return known.digest is not None and file_digest(path) == known.digest

    def _settled(self, stamp: Stamp) -> bool:
        return self.seen_ns - max(stamp[1], stamp[2]) > SETTLED_NS


@dataclass(frozen=True)
class Task:
    """A file to be read.

    Attributes
    ----------
    location : str
        Its absolute path.
    name : str
        How the user calls it.
    known : bytes or None
        A remembered answer, without outcomes, that holds if the bytes are what they were.
    """

    location: str
    name: str
    known: bytes | None = None


def answer(per_file: PerFile, task: Task) -> Answer:
    """Read one file, or find that its remembered answer still holds: then there are no outcomes.

    Whatever goes wrong with one file becomes the error of that file: a survey of thousands goes on.
    """
    path = Path(task.location)
    seen_ns = time.time_ns()
    stamp = stamp_of(path)
    if task.known is not None:
        known = Answer.from_bytes(task.known)
        if known.holds(path):
            siblings = tuple(
                Sibling(
                    each.name,
                    each.digest,
                    None if each.digest is None else stamp_of(path.parent / each.name),
                )
                for each in known.siblings
            )
            return Answer(b"", seen_ns, stamp, known.digest, known.whole, siblings)
    looked = Looked()
    try:
        outcomes = encode(per_file(path, task.name, looked))
    except Exception as error:
        what = f"the reader failed on it ({type(error).__name__}: {error})"
        return failure(task, what, "it is an error of this program: report it with the file")
    same = stamp is not None and stamp_of(path) == stamp
    siblings = tuple(
        Sibling(name, digest, looked.stamps.get(name)) for name, digest in looked.siblings.items()
    )
    return Answer(outcomes, seen_ns, stamp, looked.digest if same else None, looked.whole, siblings)


def failure(task: Task, what: str, mend: str) -> Answer:
    """Return the answer, not to be remembered, that a file could not be read at all."""
    error = ReadError(what, where=task.name, mend=mend)
    return Answer(encode([Outcome(task.name, reader=UNKNOWN, error=error)]))


def outcomes_of(data: bytes) -> Sequence[Outcome]:
    """Return the outcomes of an answer in bytes."""
    return decode(Answer.from_bytes(data).outcomes)


def _stamp(value: Any) -> Stamp | None:
    if value is None:
        return None
    size, changed, entry = value
    return int(size), int(changed), int(entry)
