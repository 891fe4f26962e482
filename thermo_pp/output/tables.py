"""Tables: headings written quantity / unit, cells with one rule of rounding a column, notes below.

Whoever fills a table takes fields of a result; nothing is computed here. Each format has one
renderer (`plain.py`: terminal and markdown, `delimited.py`: CSV, `latex.py`, `html.py`,
`workbook.py`: xlsx), which takes tables and paragraphs in their order.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, field, replace

import numpy as np

from thermo_pp.names import EnergyUnit
from thermo_pp.units import ENERGY_PER_KJ_MOL

Cell = str | int | float | None
NO_VALUE = "\N{EN DASH}"

UNITS: dict[str, str] = {
    "kJ/mol": "kJ mol⁻¹",
    "kcal/mol": "kcal mol⁻¹",
    "eV": "eV",
    "hartree": "Eₕ",
}
"""How a unit of energy stands in a heading."""
ENTROPY_UNIT = "J mol⁻¹ K⁻¹"
ENERGY_DECIMALS: dict[str, int] = {"kJ/mol": 2, "kcal/mol": 2, "eV": 4, "hartree": 6}
"""Decimals of an energy in each display unit: all of about the same worth."""


@dataclass(frozen=True)
class Column:
    """One column of a table.

    Attributes
    ----------
    quantity : str
        What stands in it, as plain text: ``"G"``, ``"File"``.
    unit : str
        As it stands in a heading (`UNITS`), empty for text and pure numbers.
    latex : str or None
        The quantity in LaTeX; None where the plain text, escaped, will do.
    decimals : int or None
        Decimals of a float. Without any rule up to ten significant digits, no zeros at the end.
    digits : int or None
        Significant digits of a float in scientific notation.
    general : int or None
        Significant digits of a float, in scientific notation only where it is very large or small.
    whole : bool
        The heading is broken into two lines after all others.
    """

    quantity: str
    unit: str = ""
    latex: str | None = None
    decimals: int | None = None
    digits: int | None = None
    general: int | None = None
    whole: bool = False

    @property
    def heading(self) -> str:
        """Quantity / unit."""
        return f"{self.quantity} / {self.unit}" if self.unit else self.quantity

    def text(self, value: Cell) -> str:
        """Return a cell as people read it."""
        if value is None:
            return NO_VALUE
        if isinstance(value, str):
            return printable(value)
        if isinstance(value, (int, np.integer)):
            return str(value)
        if self.decimals is not None:
            shown = f"{value:.{self.decimals}f}"
            return shown.removeprefix("-") if float(shown) == 0.0 else shown
        if self.digits is not None:
            return f"{value:.{self.digits - 1}e}"
        if self.general is not None:
            return f"{value:#.{self.general}g}".removesuffix(".")
        return f"{value:.10g}"


@dataclass(frozen=True)
class Table:
    """One table.

    Attributes
    ----------
    title : str
    columns : sequence of Column
    rows : sequence of sequence of str, int, float or None
        One cell a column.
    notes : sequence of str
        Sentences below the table, about this one.
    about : sequence of str
        Sentences below it that tables of one answer share: standard state, soft modes, level of
        theory, version. A terminal shows them once, below the last of these tables.
    constants : sequence of (str, str)
        What holds for every row; CSV, which has no notes, writes them as further columns.
    """

    title: str
    columns: Sequence[Column]
    rows: Sequence[Sequence[Cell]]
    notes: Sequence[str] = ()
    constants: Sequence[tuple[str, str]] = field(default=())
    about: Sequence[str] = ()

    def __post_init__(self) -> None:
        for row in self.rows:
            if len(row) != len(self.columns):
                raise ValueError(
                    f"{len(row)} cells for {len(self.columns)} columns in {self.title}"
                )

    @property
    def all_notes(self) -> tuple[str, ...]:
        """Every sentence below the table."""
        return (*self.notes, *self.about)

    def right(self, column: int) -> bool:
        """Whether a column holds no text (and is set to the right)."""
        return not any(isinstance(row[column], str) for row in self.rows)


Block = Table | str
"""A table or a paragraph."""


def about_all(blocks: Sequence[Block], about: Sequence[str]) -> list[Block]:
    """Return the blocks, each table with sentences that hold for all of them."""
    return [
        block if isinstance(block, str) else replace(block, about=tuple(about)) for block in blocks
    ]


_RAISED = str.maketrans("0123456789-", "⁰¹²³⁴⁵⁶⁷⁸⁹⁻")


def unit_heading(unit: str) -> str:
    """Return a unit as it stands in a heading.

    >>> unit_heading("L mol^-1 s^-1")
    'L mol⁻¹ s⁻¹'
    """
    return re.sub(r"\^(-?\d+)", lambda power: power.group(1).translate(_RAISED), unit)


def printable(text: str) -> str:
    """Return the text with control characters and undecodable bytes (of file names) written out."""
    if text.isprintable():
        return text
    return "".join(
        char if char.isprintable() else char.encode("unicode_escape").decode() for char in text
    )


def in_unit(kj_mol: float | None, unit: EnergyUnit) -> float | None:
    """Return an energy in a display unit; None and nan (not defined) become None."""
    value = defined(kj_mol)
    return None if value is None else value * ENERGY_PER_KJ_MOL[unit]


def defined(value: float | None) -> float | None:
    """Return a number of a result as a plain float; None where it is nan (not defined)."""
    return None if value is None or np.isnan(value) else float(value)


def energy_column(
    quantity: str, unit: EnergyUnit, latex: str | None = None, *, whole: bool = False
) -> Column:
    """Return a column of energies in a display unit."""
    return Column(quantity, UNITS[unit], latex, decimals=ENERGY_DECIMALS[unit], whole=whole)
