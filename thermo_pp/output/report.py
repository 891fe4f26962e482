"""The report: every file of the folder, made from the answers in a fixed order."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import Any

from thermo_pp.output.document import write_document
from thermo_pp.output.exports import write_exports
from thermo_pp.output.figures_folder import write_figures
from thermo_pp.output.files import write_file
from thermo_pp.output.manifest import NAME, manifest_text
from thermo_pp.output.page import write_page
from thermo_pp.output.report_tables import write_tables
from thermo_pp.output.results_file import results_text
from thermo_pp.study.answers import Answers

Maker = Callable[..., None]
"""Called with the answers and the folder; those of `TABLES` with the columns too."""


def _write_results(answers: Answers, folder: Path) -> None:
    write_file(folder / "results.json", results_text(answers))


PARTS: tuple[tuple[str, str, Maker], ...] = (
    ("results", "", _write_results),
    ("figures", "figures", write_figures),
    ("page", "", write_page),
    ("tables", "tables", write_tables),
    ("supporting information", "document", write_document),
    ("exports", "exports", write_exports),
)
"""What a report consists of: its name, its folder in the report ("": the report's own), its maker."""

TABLES: tuple[Maker, ...] = (write_tables, write_document)
"""Parts whose tables may have some columns only."""


def write_report(
    answers: Answers,
    folder: Path,
    options: Mapping[str, Any],
    progress: Callable[[int, int, str], None] | None = None,
    *,
    columns: Sequence[str] = (),
) -> None:
    """Write all parts into an empty folder, the manifest last.

    Parameters
    ----------
    answers : Answers
    folder : Path
    options : mapping
        See `manifest.manifest_text`.
    progress : callable or None
        Called before each part and once at the end.
    columns : sequence of str
        Of the tables, those of the document included, in this order; all of them unless given.

    Raises
    ------
    StudyError
        No table has one of the columns.
    """
    told = progress or (lambda done, of, what: None)
    for number, (name, place, make) in enumerate(PARTS):
        told(number, len(PARTS), name)
        inside = folder / place if place else folder
        if make in TABLES:
            make(answers, inside, columns=columns)
        else:
            make(answers, inside)
    write_file(folder / NAME, manifest_text(answers, folder, options))
    told(len(PARTS), len(PARTS), "")
