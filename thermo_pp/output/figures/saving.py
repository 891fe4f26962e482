"""Saving: a figure as SVG, PDF or PNG, the same bytes in every run.

No dates, no version of a library, ids by a fixed salt. Text stays text; the fonts are inside: in PDF as
TrueType, in SVG as a subset of the font in a style sheet, with common fonts named after it.
"""

from __future__ import annotations

import base64
import io
import os
from html import unescape
from pathlib import Path
from re import findall
from typing import TYPE_CHECKING, Any, Literal, get_args

from thermo_pp.output.figures.style import FONT, styled

if TYPE_CHECKING:
    from matplotlib.figure import Figure

FigureFormat = Literal["svg", "pdf", "png"]
FORMATS: tuple[FigureFormat, ...] = get_args(FigureFormat)
PNG_DPI = 300

_METADATA: dict[FigureFormat, dict[str, None]] = {
    "svg": dict.fromkeys(("Date", "Creator", "Format", "Type")),
    "pdf": dict.fromkeys(("Creator", "Producer", "CreationDate")),
    "png": dict.fromkeys(("Software",)),
}


@styled
def content(figure: Figure, form: FigureFormat) -> bytes:
    """Return the bytes of a figure in one of the formats."""
    if form not in FORMATS:
        raise ValueError(f"unknown format {form!r}; choose one of: {', '.join(FORMATS)}")
    stream = io.BytesIO()
    figure.savefig(stream, format=form, metadata=_METADATA[form], dpi=PNG_DPI)
    return _with_font(stream.getvalue()) if form == "svg" else stream.getvalue()


def save(figure: Figure, path: str | os.PathLike[str]) -> Path:
    """Write a figure; the ending of the name, svg, pdf or png, says as what."""
    target = Path(path)
    form: Any = target.suffix.removeprefix(".").lower()
    target.write_bytes(content(figure, form))
    return target


def _with_font(svg: bytes) -> bytes:
    """Put the glyphs that an SVG uses into it, and name fonts for programs that ignore them."""
    from fontTools import subset
    from matplotlib import font_manager

    text = svg.decode()
    styles = {"normal": font_manager.FontProperties(family=FONT)}
    if "oblique" in text or "italic" in text:
        styles["oblique"] = font_manager.FontProperties(family=FONT, style="oblique")
    used = unescape("".join(findall(r">([^<>]+)</t(?:ext|span)>", text)))
    rules = []
    for style, wanted in styles.items():
        options = subset.Options(layout_features=[], hinting=False, flavor="woff")
        options.drop_tables += ["FFTM"]
        font = subset.load_font(font_manager.findfont(wanted), options)
        font.recalcTimestamp = False
        chooser = subset.Subsetter(options)
        chooser.populate(text=used)
        chooser.subset(font)
        stream = io.BytesIO()
        subset.save_font(font, stream, options)
        data = base64.b64encode(stream.getvalue()).decode()
        rules.append(
            f"@font-face{{font-family:{FONT!r};font-style:{style};"
            f"src:url(data:font/woff;base64,{data})}}"
        )
    text = text.replace(repr(FONT), f"{FONT!r}, Verdana, sans-serif")
    sheet = f'  <style type="text/css">{"".join(rules)}</style>\n </defs>'
    return text.replace("</style>\n </defs>", "</style>\n" + sheet, 1).encode()
