"""A study whose names and title are what a file format could take for something of its own."""

from __future__ import annotations

from pathlib import Path

from declared_study import TEXT

from thermo_pp.study.load import Study

NAME = '<b>&_%$"x'
FORMULA = "@SUM(1+1)"
"""An equation cannot hold a name with =."""
TITLE = "=1+1\nfirst line\nsecond <script>alert(1)</script> \\end{document} \N{CJK UNIFIED IDEOGRAPH-4E2D}"


def hostile(folder: Path) -> Study:
    """Load the declared study, its reactant called `NAME`, its product `FORMULA`."""
    text = TEXT.replace('title = "Loss of A with the help of W"', f"title = {_toml(TITLE)}")
    text = text.replace("[species.A]", f"[species.{_toml(NAME)}]")
    text = text.replace("[species.P]", f"[species.{_toml(FORMULA)}]")
    for equation in ("A + W = C", "C = P", "C + W = P + W", "A + W2 = P + W"):
        words = [{"A": NAME, "P": FORMULA}.get(word, word) for word in equation.split(" ")]
        text = text.replace(f'"{equation}"', _toml(" ".join(words)))
    text = text.replace('reactant = "A"', f"reactant = {_toml(NAME)}")
    text = text.replace('product = "P"', f"product = {_toml(FORMULA)}")
    file = folder / "study.toml"
    file.write_text(text, encoding="utf-8")
    return Study.load(file)


def _toml(text: str) -> str:
    quoted = text.replace("\\", "\\\\").replace('"', '\\"').replace("\n", "\\n")
    return f'"{quoted}"'
