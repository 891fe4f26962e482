"""Text of an output: searches from the end, and line numbers."""

from __future__ import annotations

import numpy as np
import pytest

from thermo_pp.readers.text import Text, holds
from thermo_pp.sources import Source


def test_all_places_of_a_mark_in_order_within_the_part() -> None:
    text = Text(Source("x", b"-- a -- a -- a"))
    assert text.all(b" a") == [2, 7, 12]
    assert text.part(3, 13).all(b" a") == [7]
    assert text.all(b"b") == []


def test_has_looks_within_the_part() -> None:
    text = Text(Source("x", b"one two three"))
    assert text.has(b"three")
    assert not text.part(0, 12).has(b"three")
    assert not text.part(1).has(b"one")
    assert holds(b"one two", b"two")
    assert not holds(b"one two", b"three")


@pytest.mark.parametrize("longest", [3, 5000])
def test_line_numbers_are_counts_of_line_ends(longest: int) -> None:
    rng = np.random.default_rng(3)
    data = b"\n".join(b"x" * int(n) for n in rng.integers(0, longest, 300_000 // longest))
    text = Text(Source("x", data))
    places = {str(at): int(at) for at in rng.integers(0, len(data), 50)}
    expected = {name: data.count(b"\n", 0, at) + 1 for name, at in places.items()}
    assert text.line_numbers(places) == expected
    assert {name: text.line_number(at) for name, at in places.items()} == expected
