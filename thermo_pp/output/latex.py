"""LaTeX: tables with the rules of the booktabs package, everything escaped."""

from __future__ import annotations

import re
from collections.abc import Sequence

from thermo_pp.output.tables import NO_VALUE, Block, Cell, Column, Table

_SIGNS = {
    "\\": r"\textbackslash{}",
    "&": r"\&",
    "%": r"\%",
    "$": r"\$",
    "#": r"\#",
    "_": r"\_",
    "{": r"\{",
    "}": r"\}",
    "~": r"\textasciitilde{}",
    "^": r"\textasciicircum{}",
    "<": r"\textless{}",
    ">": r"\textgreater{}",
    "|": r"\textbar{}",
    '"': r"\textquotedbl{}",
    "\N{EN DASH}": "--",
    "\N{MINUS SIGN}": "$-$",
    "·": r"$\cdot$",
    "\N{MULTIPLICATION SIGN}": r"$\times$",
    "±": r"$\pm$",
    "≤": r"$\le$",
    "≥": r"$\ge$",
    "→": r"$\rightarrow$",
    "⇌": r"$\rightleftharpoons$",
    "‡": r"$^{\ddagger}$",
    "°": r"$^{\circ}$",
    "Δ": r"$\Delta$",
    "Σ": r"$\Sigma$",
    "κ": r"$\kappa$",
    "\N{GREEK SMALL LETTER NU}": r"$\nu$",
    "\N{GREEK SMALL LETTER SIGMA}": r"$\sigma$",
    "Å": r"\AA{}",
    "ₐ": r"$_{\mathrm{a}}$",
    "ₕ": r"$_{\mathrm{h}}$",
    "∞": r"$\infty$",
}
_SUPERSCRIPTS = dict(zip("⁰¹²³⁴⁵⁶⁷⁸⁹⁺⁻", "0123456789+-", strict=True))
_SUBSCRIPTS = dict(zip("₀₁₂₃₄₅₆₇₈₉", "0123456789", strict=True))
_RAISED = re.compile("[" + "".join(_SUPERSCRIPTS) + "]+")
_LOWERED = re.compile("[" + "".join(_SUBSCRIPTS) + "]+")


def latex(blocks: Sequence[Block]) -> str:
    """Return tables and paragraphs as LaTeX; the preamble needs ``\\usepackage{booktabs}``."""
    return "\n\n".join(
        escaped(block) if isinstance(block, str) else _table(block) for block in blocks
    )


def escaped(text: str) -> str:
    """Return plain text as LaTeX."""
    signs = "".join(_SIGNS.get(sign, sign) for sign in text)
    signs = _RAISED.sub(
        lambda run: "$^{" + "".join(_SUPERSCRIPTS[s] for s in run.group()) + "}$", signs
    )
    return _LOWERED.sub(
        lambda run: "$_{" + "".join(_SUBSCRIPTS[s] for s in run.group()) + "}$", signs
    )


def heading(column: Column) -> str:
    """Return quantity / unit; the parts of a unit are parted by thin spaces."""
    quantity = escaped(column.quantity) if column.latex is None else column.latex
    if not column.unit:
        return quantity
    unit = escaped(column.unit).replace(" ", r"\,")
    return f"{quantity} / {unit}"


def _table(table: Table) -> str:
    sides = "".join("r" if table.right(k) else "l" for k in range(len(table.columns)))
    lines = [
        r"\begin{table}",
        r"\centering",
        rf"\caption{{{escaped(table.title)}}}",
        rf"\begin{{tabular}}{{{sides}}}",
        r"\toprule",
        " & ".join(heading(column) for column in table.columns) + r" \\",
        r"\midrule",
    ]
    for row in table.rows:
        cells = [_cell(column, cell) for column, cell in zip(table.columns, row, strict=True)]
        lines.append(" & ".join(cells) + r" \\")
    lines += [r"\bottomrule", r"\end{tabular}"]
    if table.notes:
        lines += ["", r"\medskip", r"{\footnotesize\raggedright"]
        lines += [escaped(note) + r"\par" for note in table.notes]
        lines.append("}")
    lines.append(r"\end{table}")
    return "\n".join(lines)


def _cell(column: Column, cell: Cell) -> str:
    text = column.text(cell)
    if cell is None or isinstance(cell, str) or text == NO_VALUE:
        return escaped(text)
    mantissa, mark, exponent = text.partition("e")
    if mark:
        return rf"${mantissa}\times10^{{{int(exponent)}}}$"
    return f"${text}$" if text.startswith("-") else text
