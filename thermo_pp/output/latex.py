"""LaTeX: booktabs tables with siunitx columns, everything escaped; compiles with pdfLaTeX as it stands.

Numbers are aligned by siunitx (columns S). A table that is too wide for the page is set smaller, or
in several parts that repeat the first column; a long one runs over pages.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Sequence

from thermo_pp.output.parts import in_parts
from thermo_pp.output.tables import Block, Column, Table, printable

_SIGNS = {
    "\\": r"\textbackslash{}",
    "&": r"\&",
    "%": r"\%",
    "$": r"\$",
    "#": r"\#",
    "_": r"\_",
    "{": r"\{",
    "}": r"\}",
    "`": r"\textasciigrave{}",
    "~": r"\textasciitilde{}",
    "^": r"\textasciicircum{}",
    "<": r"\textless{}",
    ">": r"\textgreater{}",
    "|": r"\textbar{}",
    '"': r"\textquotedbl{}",
    "\N{EN DASH}": r"\textendash{}",
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
    "Å": r"\AA{}",
    "ₐ": r"$_{\mathrm{a}}$",
    "ₕ": r"$_{\mathrm{h}}$",
    "…": r"\ldots{}",
    "∞": r"$\infty$",
    "√": r"$\surd$",
    "≈": r"$\approx$",
    "≠": r"$\neq$",
    "\N{PRIME}": r"$'$",
    "\N{DOUBLE PRIME}": r"$''$",
    "ħ": r"$\hbar$",
    "\N{MICRO SIGN}": r"$\mu$",
}
_SUPERSCRIPTS = dict(zip("⁰¹²³⁴⁵⁶⁷⁸⁹⁺⁻", "0123456789+-", strict=True))
_SUBSCRIPTS = dict(zip("₀₁₂₃₄₅₆₇₈₉", "0123456789", strict=True))
_GREEK = {
    **{name: unicodedata.lookup(f"GREEK SMALL LETTER {name.upper()}") for name in (
        "alpha", "beta", "gamma", "delta", "epsilon", "zeta", "eta", "theta", "iota", "kappa", "mu",
        "nu", "xi", "pi", "rho", "sigma", "tau", "upsilon", "phi", "chi", "psi", "omega",
    )},
    "lambda": unicodedata.lookup("GREEK SMALL LETTER LAMDA"),
    **{name: unicodedata.lookup(f"GREEK CAPITAL LETTER {name.upper()}") for name in (
        "Gamma", "Delta", "Theta", "Xi", "Pi", "Sigma", "Upsilon", "Phi", "Psi", "Omega",
    )},
    "Lambda": unicodedata.lookup("GREEK CAPITAL LETTER LAMDA"),
}  # fmt: skip
_SIGNS |= {sign: rf"$\{name}$" for name, sign in _GREEK.items()}
_ACCENTS = {
    "\N{COMBINING GRAVE ACCENT}": "`", "\N{COMBINING ACUTE ACCENT}": "'",
    "\N{COMBINING CIRCUMFLEX ACCENT}": "^", "\N{COMBINING TILDE}": "~",
    "\N{COMBINING DIAERESIS}": '"', "\N{COMBINING MACRON}": "=", "\N{COMBINING DOT ABOVE}": ".",
}  # fmt: skip
_NOT_IN_T1 = "ĦħĸĿŀŉŦŧſ"
_RAISED = re.compile("[" + "".join(_SUPERSCRIPTS) + "]+")
_LOWERED = re.compile("[" + "".join(_SUBSCRIPTS) + "]+")


PREAMBLE = r"""\documentclass[a4paper,10pt]{article}
\usepackage[utf8]{inputenc}
\usepackage[T1]{fontenc}
\usepackage{textcomp,amsmath,lmodern}
\usepackage[margin=2.2cm]{geometry}
\usepackage{array,booktabs,longtable,siunitx}
\sisetup{group-digits=none}
\setlength{\LTcapwidth}{\linewidth}
\setlength{\parindent}{0pt}
\setlength{\parskip}{0.5\baselineskip}
\setlength{\tabcolsep}{4pt}
\emergencystretch=4em
\raggedbottom
"""
"""What a document of these tables needs: booktabs, siunitx, longtable, array."""
_SIZES = (("", 1.0), ("\\small", 0.9), ("\\footnotesize", 0.8))
_ACROSS = 90.0
"""Digits of the normal size that a line holds."""
_GAP = 1.7
"""What lies between two columns, in digits."""
_MOST_TEXT = 34
"""Characters of a column of text; longer ones are broken."""


def latex(blocks: Sequence[Block]) -> str:
    """Return tables and paragraphs for the inside of a document that has `PREAMBLE`."""
    return "\n\n".join(
        escaped(block) if isinstance(block, str) else _table(block) for block in blocks
    )


def latex_document(inside: str) -> str:
    """Return a whole document around the LaTeX of its inside."""
    return f"{PREAMBLE}\\begin{{document}}\n{inside}\n\\end{{document}}"


def escaped(text: str) -> str:
    """Return plain text as LaTeX; a sign that pdfLaTeX has no letter for stands as its number."""
    signs = "".join(map(_sign, printable(text))).replace("--", "-{}-").replace("''", "'{}'")
    signs = _RAISED.sub(
        lambda run: "$^{" + "".join(_SUPERSCRIPTS[s] for s in run.group()) + "}$", signs
    )
    return _LOWERED.sub(
        lambda run: "$_{" + "".join(_SUBSCRIPTS[s] for s in run.group()) + "}$", signs
    )


def breakable(text: str) -> str:
    """Return plain text as LaTeX that may break in long names of files and in hashes."""
    return " ".join(
        escaped(word) if len(word) <= _LONG_WORD else _broken(word) for word in text.split(" ")
    )


def _broken(word: str) -> str:
    return r"\allowbreak{}".join(map(escaped, _PIECES.findall(printable(word))))


_LONG_WORD = 20
_PIECES = re.compile(r"[^-/.,;:)_]{1,8}[-/.,;:)_]?|.")


def _sign(sign: str) -> str:
    if sign in _SIGNS:
        return _SIGNS[sign]
    known = sign in _SUPERSCRIPTS or sign in _SUBSCRIPTS
    if ord(sign) < 127 or known or ("\xa1" <= sign <= "\u017e" and sign not in _NOT_IN_T1):
        return sign
    apart = unicodedata.normalize("NFD", sign)
    if len(apart) == 2 and apart[0].isascii() and apart[1] in _ACCENTS:
        return rf"\{_ACCENTS[apart[1]]}{{{apart[0]}}}"
    return f"U+{ord(sign):04X}"


def heading(column: Column) -> str:
    """Return quantity / unit; the parts of a unit are parted by thin spaces."""
    quantity = escaped(column.quantity) if column.latex is None else column.latex
    return f"{quantity} / {_unit(column)}" if column.unit else quantity


def _unit(column: Column) -> str:
    return escaped(column.unit).replace(" ", r"\,")


def _table(table: Table) -> str:
    """Return a table in as few parts as the page asks for, set as large as they allow."""
    parts, size = [table], ""
    for size, scale in _SIZES:  # noqa: B007
        parts = in_parts(table, _ACROSS / scale, gap=_GAP, most_text=_MOST_TEXT)
        if len(parts) == 1:
            break
    return "\n\n".join(_part(part, size) for part in parts)


def _part(table: Table, size: str) -> str:
    shown = [
        [column.text(cell) for cell, column in zip(row, table.columns, strict=True)]
        for row in table.rows
    ]
    kinds = [_kind(table, k, [row[k] for row in shown]) for k in range(len(table.columns))]
    headings = " & ".join(
        _heading(column, kind, [row[k] for row in shown])
        for k, (column, kind) in enumerate(zip(table.columns, kinds, strict=True))
    )
    lines = [
        rf"\begingroup{size}",
        rf"\begin{{longtable}}{{{''.join(kinds)}}}",
        rf"\caption{{{escaped(table.title)}}}\\",
        r"\toprule",
        rf"{headings} \\",
        r"\midrule",
        r"\endfirsthead",
        r"\toprule",
        rf"{headings} \\",
        r"\midrule",
        r"\endhead",
        r"\bottomrule",
        r"\endfoot",
    ]
    lines += [
        " & ".join(_cell(text, kind) for text, kind in zip(row, kinds, strict=True)) + r" \\"
        for row in shown
    ]
    lines.append(r"\end{longtable}")
    lines.append(r"\endgroup")
    if table.all_notes:
        notes = " ".join(escaped(note) for note in table.all_notes)
        lines.append(
            rf"{{\nopagebreak\footnotesize\raggedright\interlinepenalty=10000 {notes}\par\medskip}}"
        )
    return "\n".join(lines)


def _kind(table: Table, k: int, shown: Sequence[str]) -> str:
    """Return the letter of a column: S with its format for numbers, l or p for text."""
    numbers = [match for text in shown if (match := _NUMBER.fullmatch(text))]
    if not table.right(k) or not numbers:
        longest = max(map(len, shown), default=0)
        if longest <= _MOST_TEXT:
            return "l"
        return rf">{{\raggedright\arraybackslash}}p{{{_MOST_TEXT * 0.5:.1f}em}}"
    sign = "-" if any(match["sign"] for match in numbers) else ""
    whole = max(len(match["whole"]) for match in numbers)
    part = max(len(match["part"] or "") for match in numbers)
    form = f"{sign}{whole}.{part}" if part else f"{sign}{whole}"
    exponents = [str(int(match["exponent"])) for match in numbers if match["exponent"]]
    if exponents:
        minus = "-" if any(exponent.startswith("-") for exponent in exponents) else ""
        form += f"e{minus}{max(len(exponent.lstrip('-')) for exponent in exponents)}"
    return f"S[table-format={form}]"


_NUMBER = re.compile(r"(?P<sign>-?)(?P<whole>\d+)(?:\.(?P<part>\d+))?(?:e(?P<exponent>[+-]?\d+))?")


def _heading(column: Column, kind: str, shown: Sequence[str]) -> str:
    """Return a heading, its unit on a line of its own where that makes the column narrower."""
    text = heading(column)
    if column.unit and len(column.heading) > max(map(len, shown), default=0):
        side = "c" if kind.startswith("S") else "l"
        quantity = escaped(column.quantity) if column.latex is None else column.latex
        text = rf"\shortstack[{side}]{{{quantity} /\\{_unit(column)}}}"
    return f"{{{text}}}" if kind.startswith("S") else text


def _cell(text: str, kind: str) -> str:
    if kind.startswith("S"):
        match = _NUMBER.fullmatch(text)
        if match is None:
            return f"{{{escaped(text)}}}"
        mantissa, mark, exponent = text.partition("e")
        return f"{mantissa}e{int(exponent)}" if mark else text
    return breakable(text) if ">" in kind else escaped(text)
