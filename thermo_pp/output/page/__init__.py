"""The page: one HTML file that opens from disk, asks no network for anything, and computes nothing.

``page.html`` is the skeleton, ``page.css`` the look, the ``.js`` files draw what ``results.json``
holds; ``vendor`` has the drawing library, unchanged, with its licence. ``contents`` chooses what of
the results is in the page, ``document`` puts everything together.
"""

from __future__ import annotations

from pathlib import Path

from thermo_pp.output.files import write_file
from thermo_pp.output.page.document import page_text
from thermo_pp.output.results_file import results_keys
from thermo_pp.study.answers import Answers

__all__ = ["page_text", "write_page"]

NAME = "index.html"


def write_page(answers: Answers, folder: Path) -> None:
    """Write the page of a report into its folder."""
    write_file(folder / NAME, page_text(results_keys(answers)))
