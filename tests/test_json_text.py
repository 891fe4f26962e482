"""JSON answers: the text is what the standard library writes of the same values, nan and infinity as null."""

from __future__ import annotations

import json
import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from thermo_pp.output.json_text import json_text

VALUES = st.recursive(
    st.none()
    | st.booleans()
    | st.integers()
    | st.floats(allow_nan=False, allow_infinity=False)
    | st.text(),
    lambda inner: st.lists(inner) | st.dictionaries(st.text(), inner),
    max_leaves=20,
)


@settings(max_examples=50, deadline=None)
@given(st.dictionaries(st.text(), VALUES))
def test_as_the_standard_library_writes_it(values: dict[str, object]) -> None:
    assert json_text(values) == json.dumps(values, indent=1, ensure_ascii=False)


@pytest.mark.parametrize("name", ["a\udcff.out", "µ\u2028.out", 'quoted "x"\\'])
def test_strange_names(name: str) -> None:
    values = {name: [name, {}, []]}
    assert json_text(values) == json.dumps(values, indent=1, ensure_ascii=False)


def test_numbers_keep_their_digits() -> None:
    values = {"a": np.array([0.1 + 0.2, math.nan]), "b": np.float64(1e-300), "c": math.inf}
    assert json_text(values) == (
        '{\n "a": [\n  0.30000000000000004,\n  null\n ],\n "b": 1e-300,\n "c": null\n}'
    )
