"""Key lines: where each key of a study file stands."""

from __future__ import annotations

import tomllib
from pathlib import Path

import pytest

from thermo_pp.study.key_lines import declared_numbers, key_lines

ROOT = Path(__file__).parents[1]
TEXT = '''\
title = """
[not.a.heading]
x = 1
"""                                   # a comment [with] = signs
[conditions]
temperatures = [
  "280 K",  # [not this]
  300,
]
held = { W = "1e-3 mol/L", "odd # name" = 2 }
[species."a.b"]
"heat = capacity" = 'no'
enthalpy = "-3 kJ/mol"
[[steps]]
equation = "A = B"
rate = "2e7 L/mol/s"
[[steps]]
[steps.arrhenius]
A = 5
[effective]
product.name = 1.5
flag = true
'''


def test_lines() -> None:
    lines = {".".join(map(str, key)): line for key, line in key_lines(TEXT).items()}
    assert lines == {
        "title": 1, "conditions": 5, "conditions.temperatures": 6, "conditions.held": 10,
        "species.a.b": 11, "species.a.b.heat = capacity": 12, "species.a.b.enthalpy": 13,
        "steps.0": 14, "steps.0.equation": 15, "steps.0.rate": 16, "steps.1": 17, "steps.1.arrhenius": 18,
        "steps.1.arrhenius.A": 19, "effective": 20, "effective.product.name": 21, "effective.flag": 22,
    }  # fmt: skip


def test_numbers() -> None:
    found = [(one.place, one.value, one.line) for one in declared_numbers(TEXT)]
    assert found == [
        ("conditions.temperatures.1", "280 K", 6),
        ("conditions.temperatures.2", 300, 6),
        ("conditions.held.W", "1e-3 mol/L", 10),
        ("conditions.held.odd # name", 2, 10),
        ("species.a.b.enthalpy", "-3 kJ/mol", 13),
        ("steps.1.rate", "2e7 L/mol/s", 16),
        ("steps.2.arrhenius.A", 5, 19),
        ("effective.product.name", 1.5, 21),
    ]


@pytest.mark.parametrize(
    "path", sorted(ROOT.glob("fixtures/**/study*.toml")), ids=lambda path: path.name
)
def test_every_key_of_a_real_file_is_there(path: Path) -> None:
    text = path.read_text(encoding="utf-8")
    data, rows = tomllib.loads(text), text.splitlines()
    for key, line in key_lines(text).items():
        value = data
        for part in key:
            value = value[part]
        last = next(part for part in reversed(key) if isinstance(part, str))
        assert last in rows[line - 1]
    assert all(one.line is not None for one in declared_numbers(text))
