"""Tables of numbers: what they hold is what `float` makes of their words, and damage is seen."""

from __future__ import annotations

import numpy as np
import pytest

from thermo_pp.readers.number_table import decimal_list, decimal_table, number_table

ROWS = 40


def table(decimals: int, width: int, columns: int) -> bytes:
    values = np.random.default_rng(7).normal(0.0, 0.3, (ROWS, columns))
    values[0, 0] = -0.0
    return b"".join(
        b"%7d    " % row + b"".join(b"%*.*f" % (width, decimals, value) for value in line) + b"\n"
        for row, line in enumerate(values)
    )


def lines_of(text: bytes) -> np.ndarray:
    return np.frombuffer(text, np.uint8).reshape(ROWS, -1)


def words(text: bytes, columns: int) -> np.ndarray:
    """Return the numbers as `float` has them, line by line."""
    return np.array(
        [[float(word) for word in line.split()[-columns:]] for line in text.splitlines()]
    )


@pytest.mark.parametrize(("decimals", "width", "columns"), [(6, 11, 6), (2, 8, 3), (10, 15, 4)])
def test_decimals_are_those_of_float_to_the_last_bit(
    decimals: int, width: int, columns: int
) -> None:
    text = table(decimals, width, columns)
    found = decimal_table(lines_of(text))
    assert found is not None
    assert found[0].split() == [b"%d" % row for row in range(ROWS)]
    expected = words(text, columns)
    assert np.array_equal(found[1], expected)
    assert np.array_equal(np.signbit(found[1]), np.signbit(expected))


@pytest.mark.parametrize("wrong", list(b" -.*xe+\n\t,0"))
def test_a_changed_byte_is_seen_or_read(wrong: int) -> None:
    text = table(6, 11, 3)
    length = text.index(b"\n") + 1
    for at in range(3 * length + 11, 4 * length):  # the numbers of one line
        damaged = text[:at] + bytes([wrong]) + text[at + 1 :]
        found = decimal_table(lines_of(damaged))
        if found is not None:
            assert damaged.count(b"\n") == ROWS
            assert np.array_equal(found[1], words(damaged, 3)), damaged[3 * length : 4 * length]


def test_a_table_of_one_column_or_of_no_decimals_is_left_to_others() -> None:
    assert decimal_table(lines_of(table(6, 11, 1))) is None
    assert decimal_table(lines_of(b"      1      2\n" * ROWS)) is None


def test_number_table() -> None:
    assert np.array_equal(number_table(b" 1 2.5\n -3e2 ", 3), [1.0, 2.5, -300.0])
    assert number_table(b"1 2", 3) is None
    assert number_table(b"1 nan 2", 3) is None
    assert number_table(b"1 *** 2", 3) is None


@pytest.mark.parametrize("decimals", [1, 8])
def test_a_list_of_decimals_is_what_float_makes_of_its_words(decimals: int) -> None:
    values = np.random.default_rng(8).normal(0.0, 3.0, 50)
    words = [f"{value:.{decimals}f}" for value in values]
    words[3], words[4], words[17] = "0.", "-12.", "0."
    found = decimal_list(",".join(words), 50)
    assert found is not None
    assert np.array_equal(found, [float(word) for word in words])
    assert decimal_list(",".join(words), 49) is None


@pytest.mark.parametrize("wrong", " -.*xe+\n\t,0\x00\xff")
def test_a_changed_character_of_a_list_is_seen_or_read(wrong: str) -> None:
    text = ",".join(f"{value:.5f}" for value in (-0.25, 0.75, 13.5, -0.00001, 2.0))
    for at in range(len(text)):
        damaged = text[:at] + wrong + text[at + 1 :]
        found = decimal_list(damaged, 5)
        if found is not None:
            assert np.array_equal(found, [float(word) for word in damaged.split(",")]), damaged


@pytest.mark.parametrize("text", ["", "1,2", "nan,0.5", "0.5,1e3", "0.12345678901234567890,0.1"])
def test_another_list_is_left_to_others(text: str) -> None:
    assert decimal_list(text, text.count(",") + 1) is None
