"""Text of an output with its line numbers: every search has a miss, every error a place.

Searches run on the bytes of the file (fast), line numbers are counted only where they are asked
for.
"""

from __future__ import annotations

import math
import re
from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np

from thermo_pp.errors import ReadError
from thermo_pp.readers.line_index import LineIndex
from thermo_pp.sources import Source

LONGEST_LINE = 1 << 20
"""A line of twice this many bytes is refused."""
CUT_SHORT = "the output is cut short or damaged here; rerun or re-copy it"
_LINE_END = ord("\n")
_NUMBER = re.compile(rb"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eEdD][+-]?\d+)?")
_FIRST_WORD = re.compile(rb"[ \t]*(" + _NUMBER.pattern + rb")(\S*)")
_BLANK_LINE = re.compile(rb"\n[ \t]*\r?\n")


class Text:
    """The bytes of one output, searched by marks; positions are byte offsets.

    Parameters
    ----------
    source : Source
    start, end : int
        The part of the file that is searched, the whole unless given.
    index : LineIndex or None
        With it, marks that begin with a line end are not searched for but looked up; see `indexed`.
    """

    def __init__(
        self,
        source: Source,
        start: int = 0,
        end: int | None = None,
        index: LineIndex | None = None,
    ) -> None:
        self.source = source
        self.data = source.data
        self.start = start
        self.end = len(source.data) if end is None else end
        self.index = index
        if start == 0 and end is None:
            self._check_lines()

    def _check_lines(self) -> None:
        """Refuse a file with a line that no program writes, which every later search would pay for."""
        for begin in range(0, len(self.data) - LONGEST_LINE, LONGEST_LINE):
            if self.data.find(b"\n", begin, begin + LONGEST_LINE) < 0:
                raise self.error(
                    begin, f"the line is longer than {LONGEST_LINE} bytes", mend=CUT_SHORT
                )

    def part(self, start: int, end: int | None = None) -> Text:
        """Return the same text, searched from `start` to `end` only."""
        return Text(self.source, start, self.end if end is None else end, self.index)

    def indexed(self) -> Text:
        """Return the same text with an index of its lines, for a reader that looks for many marks."""
        return Text(self.source, self.start, self.end, LineIndex(self.data))

    def find(self, mark: bytes, start: int | None = None) -> int:
        """Return where `mark` first stands at or after `start`, -1 where it does not."""
        if self.index is not None and mark[0] == _LINE_END:
            return self.index.find(mark, self.start if start is None else start, self.end)
        return self.data.find(mark, self.start if start is None else start, self.end)

    def last(self, mark: bytes, end: int | None = None) -> int:
        """Return where `mark` last stands before `end`, -1 where it does not."""
        if self.index is not None and mark[0] == _LINE_END:
            return self.index.last(mark, self.start, self.end if end is None else end)
        return self.data.rfind(mark, self.start, self.end if end is None else end)

    def all(self, mark: bytes) -> list[int]:
        """Return every place at which `mark` stands."""
        if self.index is not None:
            return self.index.all(mark, self.start, self.end)
        places, at = [], self.last(mark)
        while at >= 0:
            places.append(at)
            at = self.last(mark, at)
        places.reverse()
        return places

    def has(self, mark: bytes) -> bool:
        """Tell whether `mark` stands anywhere; see `holds`."""
        return self.last(mark) >= 0

    def line_match(self, pattern: re.Pattern[bytes], mark: bytes) -> re.Match[bytes] | None:
        """Return the first match of `pattern` where `mark` stands, with which all its matches begin; None without one.

        A line that begins with the part counts as in it.
        """
        at = self.find(mark, max(self.start - 1, 0))
        while at >= 0:
            match = pattern.match(self.data, at, self.end)
            if match is not None:
                return match
            at = self.find(mark, at + 1)
        return None

    def need(
        self, mark: bytes, start: int | None = None, *, lacking: str, mend: str = CUT_SHORT
    ) -> int:
        """Return where `mark` first stands at or after `start`; ReadError `lacking` where it does not."""
        at = self.find(mark, start)
        if at < 0:
            begin = self.start if start is None else start
            raise self.error(
                begin, f"{lacking} after this line (looked for {mark.decode()!r})", mend=mend
            )
        return at

    def need_last(self, mark: bytes, *, lacking: str, mend: str = CUT_SHORT) -> int:
        """Return where `mark` last stands; ReadError `lacking` where it does not."""
        at = self.last(mark)
        if at < 0:
            raise self.error(self.end, f"{lacking} (looked for {mark.decode()!r})", mend=mend)
        return at

    def line_number(self, at: int) -> int:
        """Return the 1-based line number of the byte offset `at`."""
        if self.index is not None:
            return self.index.line_number(at)
        return _line_ends(self.data, 0, at) + 1

    def line_numbers(self, places: Mapping[str, int]) -> dict[str, int]:
        """Return the 1-based line number of each byte offset, the line ends counted once for all of them."""
        if self.index is not None:
            found = np.searchsorted(self.index.ends, list(places.values())) + 1
            return dict(zip(places, found.tolist(), strict=True))
        numbers: dict[str, int] = {}
        line, counted = 1, 0
        for name, at in sorted(places.items(), key=lambda item: item[1]):
            line += _line_ends(self.data, counted, at)
            counted = at
            numbers[name] = line
        return numbers

    def line(self, at: int) -> str:
        """Return the whole line in which the byte offset `at` lies, without its end."""
        begin = self.data.rfind(b"\n", 0, at) + 1
        stop = self.data.find(b"\n", at)
        return (
            self.data[begin : len(self.data) if stop < 0 else stop]
            .decode("utf-8", "replace")
            .rstrip("\r")
        )

    def next_line(self, at: int, skip: int = 1) -> int:
        """Return the offset at which the line `skip` lines further begins; ReadError at the end of the file."""
        for _ in range(skip):
            stop = self.data.find(b"\n", at, self.end)
            if stop < 0:
                raise self.error(at, "the text ends here, more lines were expected", mend=CUT_SHORT)
            at = stop + 1
        return at

    def lines_on(self, line: int, count: int) -> int:
        """Return where the line `count` lines on begins; the end of the part where there are fewer.

        Most often all of them are of one length, which is tried first.
        """
        guess = line + count * (self.data.find(b"\n", line, self.end) + 1 - line)
        whole = line < guess <= self.end and self.data[guess - 1 : guess] == b"\n"
        if whole and self.data.count(b"\n", line, guess) == count:
            return guess
        for _ in range(count):
            stop = self.data.find(b"\n", line, self.end)
            if stop < 0:
                return self.end
            line = stop + 1
        return line

    def blank_line(self, at: int) -> int:
        """Return where the first empty line after `at` begins; the end of the part where there is none."""
        match = _BLANK_LINE.search(self.data, at, self.end)
        return self.end if match is None else match.start() + 1

    def rest(self, at: int) -> bytes:
        """Return the line's bytes from `at` on."""
        stop = self.data.find(b"\n", at)
        return self.data[at : len(self.data) if stop < 0 else stop]

    def number(self, at: int, what: str) -> float:
        """Return the first number on the line at or after `at`; ReadError where there is none."""
        return float(self.number_text(at, what))

    def number_text(self, at: int, what: str) -> str:
        """Return the digits of the first number on the line at or after `at`, with `e` for the exponent."""
        match = _NUMBER.search(self.rest(at))
        digits = "" if match is None else match.group().decode().lower().replace("d", "e")
        if not digits or not math.isfinite(float(digits)):
            raise self.expected(at, what)
        return digits

    def exact_text(self, at: int, what: str, suffix: bytes = b"") -> str:
        """Return the first word of the line from `at` on, which must be a number; ReadError where it is not.

        Unlike `number_text` this takes no later number for one that is damaged (stars, NaN). A `suffix` that sticks
        to the number (a unit, a parenthesis) is left out.
        """
        match = _FIRST_WORD.match(self.data, at)
        if match is None or match.group(2) not in (b"", suffix):
            raise self.expected(at, what)
        digits = match.group(1).decode().lower().replace("d", "e")
        if not math.isfinite(float(digits)):
            raise self.expected(at, what)
        return digits

    def floats(self, at: int, count: int, what: str, skip: int = 0) -> list[float]:
        """Return `count` numbers of the line from `at` on after `skip` words; ReadError where they are not numbers."""
        words = self.rest(at).split()[skip : skip + count]
        try:
            values = [float(word.replace(b"D", b"e").replace(b"d", b"e")) for word in words]
        except ValueError:
            raise self.expected(at, what) from None
        if len(values) != count or not math.isfinite(sum(values)):
            raise self.expected(at, what)
        return values

    def rows(self, at: int, counts: Sequence[int], what: str) -> tuple[list[float], int]:
        """Return the numbers of the lines from `at` on, one after the other, and where the next begins.

        Line i has `counts[i]` words; ReadError at the first line that has not, or not all of them numbers.
        """
        end, wanted = self.blank_line(at), sum(counts)
        words = self.data[at:end].replace(b"D", b"e").split()
        if len(words) != wanted:  # no blank line behind them
            end = self.next_line(at, len(counts))
            words = self.data[at:end].replace(b"D", b"e").split()
        try:
            values = list(map(float, words))
        except ValueError:
            values = [math.nan]
        if len(words) == wanted and math.isfinite(sum(values)):
            return values, end
        for count in counts:
            if len(self.rest(at).split()) != count:
                raise self.expected(at, f"{what}, {count} words")
            self.floats(at, count, what)
            at = self.next_line(at)
        raise self.expected(at, what)

    def expected(self, at: int, what: str) -> ReadError:
        """Return the error that `what` was expected on this line."""
        return self.error(
            at, f"expected {what}, found {self.line(at).strip()[:80]!r}", mend=CUT_SHORT
        )

    def error(self, at: int, what: str, *, mend: str) -> ReadError:
        """Return the error `what` at the line of `at`."""
        return ReadError(
            what, where=f"{self.source.name}:{self.line_number(min(at, len(self.data)))}", mend=mend
        )


def _line_ends(data: bytes, start: int, stop: int) -> int:
    """Return how many line ends stand between two offsets: of many bytes four times as fast as `bytes.count`."""
    count = 0
    while stop - start > 6144:
        upto = min(stop, start + 65536)  # a part that fits the cache
        part = np.frombuffer(data, np.uint8, upto - start, start)
        count += int(np.count_nonzero(part == 10))
        start = upto
    return count + data.count(b"\n", start, stop)


def holds(head: bytes, mark: bytes) -> bool:
    """Tell whether `mark` stands in `head`, where it most often does not.

    A search from the end takes a third of the time of `in` for marks that end in blanks, dots or digits.
    """
    return head.rfind(mark) >= 0


def plain_lines(source: Source) -> Source:
    """Return the source with plain line ends; line numbers stay what they are."""
    head = source.head
    if b"\r" not in head or b"\r\n" not in head:  # a single byte is found faster
        return source
    return replace(source, data=source.data.replace(b"\r\n", b"\n"), digest=source.sha256)
