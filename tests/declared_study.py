"""A study in which every species is declared, for tests that need no outputs."""

from __future__ import annotations

from pathlib import Path

from thermo_pp.study.load import Study

TEXT = """\
title = "Loss of A with the help of W"

[conditions]
temperatures = ["280 K", "25 degC"]
held = { W = "1e-3 mol/L", W2 = "equilibrium" }

[species.A]
composition = "SO3"
enthalpy = "0 kJ/mol"
entropy = "256 J/mol/K"
[species.W]
composition = "H2O"
enthalpy = "0 kJ/mol"
entropy = "188 J/mol/K"
[species.W2]
composition = "(H2O)2"
enthalpy = "-15 kJ/mol"
entropy = "290 J/mol/K"
[species.C]
composition = "H2SO4"
enthalpy = "-35 kJ/mol"
entropy = "320 J/mol/K"
[species.P]
composition = "H2SO4"
enthalpy = "-90 kJ/mol"
entropy = "300 J/mol/K"
[species.TS1]
composition = "H2SO4"
enthalpy = "80 kJ/mol"
entropy = "310 J/mol/K"
[species.TS2]
composition = "H4SO5"
enthalpy = "-20 kJ/mol"
entropy = "370 J/mol/K"

[[steps]]
equation = "W + W = W2"
barrier = "none"
[[steps]]
equation = "A + W = C"
barrier = "none"
[[steps]]
equation = "C = P"
through = "TS1"
[[steps]]
equation = "C + W = P + W"
through = "TS2"
[[steps]]
equation = "A + W2 = P + W"
rate = "2e7 L/mol/s"

[effective]
reactant = "A"
product = "P"
"""


def edited(*changes: tuple[str, str]) -> str:
    """Return the text with each first text replaced by the second; each must stand in it."""
    text = TEXT
    for old, new in changes:
        assert text.count(old) >= 1, old
        text = text.replace(old, new, 1)
    return text


def load(folder: Path, text: str, **options: object) -> Study:
    """Load the study `text` as ``study.toml`` in `folder`, named as messages have it."""
    file = folder / "study.toml"
    file.write_text(text, encoding="utf-8")
    return Study.load(file, **options)  # type: ignore[arg-type]
