"""The page as one HTML file: skeleton, style, results, the drawing library and our script."""

from __future__ import annotations

import base64
import hashlib
import html
import json
import re
from collections.abc import Mapping
from functools import cache
from importlib.resources import files
from typing import Any

from thermo_pp.output.page.contents import contents
from thermo_pp.output.tables import printable

SCRIPTS = (
    "format.js", "tables.js", "figures.js", "profile.js", "rates.js", "regimes.js", "parts.js",
    "main.js",
)  # fmt: skip
"""Joined to one script in this order."""
DRAWING_SHA256 = "912111098ea99503a6f4967361d2bbdc9dbf58cf9c678c8e27e5b02d1a07f0c1"
"""Of vendor/d3.min.js: D3 7.9.2, as its makers publish it on the npm registry (dist/d3.min.js)."""


def page_text(results: Mapping[str, Any]) -> str:
    """Return the page of one report; the same results give the same text.

    Parameters
    ----------
    results : mapping
        See `results_file.results_keys`.
    """
    embedded, away = contents(results)
    style, drawing, script = _file("page.css"), _drawing(), _script()
    policy = (
        f"default-src 'none'; img-src data:; style-src '{_hash(style)}'; "
        f"script-src '{_hash(drawing)}' '{_hash(script)}'; base-uri 'none'; form-action 'none'"
    )
    parts = {
        "POLICY": policy,
        "TITLE": html.escape(printable(results["title"] or "Study")),
        "STYLE": style,
        "RESULTS": embedded,
        "LEFT_AWAY": json.dumps(away),
        "D3": drawing,
        "SCRIPT": script,
    }
    return re.sub(r"@@([A-Z0-9_]+)@@", lambda mark: parts[mark.group(1)], _file("page.html"))


def _drawing() -> str:
    """Return the drawing library with its licence, which every copy has to carry."""
    return f"/*\n{_file('vendor/LICENSE')}*/\n{_file('vendor/d3.min.js')}"


def _script() -> str:
    """Return our own script: all files in one scope of their own."""
    joined = "\n".join(_file(name) for name in SCRIPTS)
    return f'"use strict";\n(() => {{\n{joined}}})();\n'


@cache
def _file(name: str) -> str:
    return files("thermo_pp.output.page").joinpath(name).read_text(encoding="utf-8")


def _hash(text: str) -> str:
    """Return a text as a content security policy names it."""
    digest = hashlib.sha256(text.encode("utf-8")).digest()
    return f"sha256-{base64.b64encode(digest).decode('ascii')}"
