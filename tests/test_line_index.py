"""The index of lines finds what a search of the bytes finds."""

from __future__ import annotations

import numpy as np
import pytest

from thermo_pp.readers.line_index import LineIndex
from thermo_pp.readers.text import Text
from thermo_pp.sources import Source

MARKS = (b"\na", b"\nab", b"\n-----", b"\nabcdefgh", b"\nabcdefghij", b"\n", b"ab", b"-")


def texts() -> list[bytes]:
    rng = np.random.default_rng(7)
    words = [b"ab", b"abcdefgh", b"abcdefghij", b"-----", b"\n", b"\n", b"\n\n", b" ", b"a", b"x"]
    made = [
        b"".join(rng.choice(words, size=size)) for size in (1, 3, 10, 40, 200) for _ in range(10)
    ]
    return [b"", b"\n", b"\nabcdefgh", b"\nabcdefg", b"x\na\n", *made]


@pytest.mark.parametrize("mark", MARKS)
def test_same_as_a_search(mark: bytes) -> None:
    rng = np.random.default_rng(8)
    for data in texts():
        plain = Text(Source("x", data))
        for _ in range(4):
            start, end = sorted(rng.integers(0, len(data) + 1, size=2).tolist())
            part, indexed = plain.part(start, end), plain.indexed().part(start, end)
            at = int(rng.integers(start, end + 1))
            assert indexed.find(mark) == part.find(mark)
            assert indexed.find(mark, at) == part.find(mark, at)
            assert indexed.last(mark) == part.last(mark)
            assert indexed.last(mark, at) == part.last(mark, at)
            assert indexed.has(mark) == part.has(mark)
            assert indexed.all(mark) == part.all(mark)


def test_same_line_numbers() -> None:
    for data in texts():
        plain = Text(Source("x", data))
        places = {str(at): at for at in range(len(data) + 1)}
        numbers = plain.indexed().line_numbers(places)
        assert numbers == plain.line_numbers(places)
        assert numbers == {name: plain.indexed().line_number(at) for name, at in places.items()}


def test_rules_above_titles() -> None:
    data = b"\n-----\nTitle of one\n-----\n\n------\n------\n | Two\n-----x\n--\n-----\nend of the text\n"
    found = LineIndex(data).above(b"\n-----", besides=b"\n-")
    below = [data[data.index(b"\n", at + 1) + 1 :].split(b"\n")[0] for at in found]
    assert below == [b"Title of one", b" | Two", b"end of the text"]
    assert LineIndex(b"").above(b"\n-----", besides=b"\n-") == []
