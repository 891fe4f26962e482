"""Words: names of any length and any characters as a figure can show them."""

from __future__ import annotations

import re
from functools import cache

from thermo_pp.output.figures.style import FONT, TEXT_PT, styled
from thermo_pp.output.tables import printable

ELLIPSIS = "\N{HORIZONTAL ELLIPSIS}"


@cache
def _glyphs() -> frozenset[int]:
    from matplotlib import font_manager

    return frozenset(font_manager.get_font(font_manager.findfont(FONT)).get_charmap())


def shown(text: str) -> str:
    r"""Return a text with whatever cannot be drawn written out: control characters and missing glyphs.

    >>> print(shown("a\nb 水 $x$"))
    a\nb \u6c34 $x$
    """
    known = _glyphs()
    return "".join(
        char if ord(char) in known else char.encode("unicode_escape").decode()
        for char in printable(text)
    )


@cache
@styled
def width_pt(text: str, size_pt: float = TEXT_PT) -> float:
    """Return the width of a line of text in points, by the font's own advances."""
    from matplotlib.font_manager import FontProperties
    from matplotlib.textpath import text_to_path

    font = FontProperties(family=FONT, size=size_pt)
    return float(text_to_path.get_text_width_height_descent(text, font, ismath=False)[0])


def elided(text: str, most_pt: float, size_pt: float = TEXT_PT) -> str:
    """Return a line that is no wider, its middle left out where it has to be.

    >>> elided("a-very-long-name-of-a-species-17", 60.0)
    'a-very-l…cies-17'
    """
    text = shown(text)
    if width_pt(text, size_pt) <= most_pt:
        return text
    for keep in range(len(text) - 1, 0, -1):
        front, back = (keep + 1) // 2, keep // 2
        short = text[:front].rstrip() + ELLIPSIS + (text[-back:].lstrip() if back else "")
        if width_pt(short, size_pt) <= most_pt:
            return short
    return ELLIPSIS


def wrapped(text: str, most_pt: float, most_lines: int = 3, size_pt: float = TEXT_PT) -> str:
    """Return a text in lines no wider than that, broken before a plus, at spaces, else elided.

    >>> wrapped("SO3 + 2 W", 30.0).split(chr(10))
    ['SO3', '+ 2 W']
    """
    pieces = re.sub(r" ([+→=]) ", "\0\\1 ", shown(text)).split("\0")
    if len(pieces) == 1:
        pieces = pieces[0].split(" ")
    lines: list[str] = []
    for piece in pieces:
        longer = f"{lines[-1]} {piece}" if lines else piece
        if lines and width_pt(longer, size_pt) <= most_pt:
            lines[-1] = longer
        else:
            lines.append(piece)
    if len(lines) > most_lines:
        lines[most_lines - 1 :] = [" ".join(lines[most_lines - 1 :])]
    return "\n".join(elided(line, most_pt, size_pt) for line in lines)
