"""The supporting information of a study: one document, written as Markdown, LaTeX and docx."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from thermo_pp.names import EnergyUnit
from thermo_pp.output.document.contents import contents
from thermo_pp.output.document.geometries import shapes, xyz
from thermo_pp.output.document.markdown import document_markdown
from thermo_pp.output.document.references import bibtex
from thermo_pp.output.document.tex import document_latex
from thermo_pp.output.document.word import document_docx
from thermo_pp.output.files import write_file
from thermo_pp.study.answers import Answers

_NAME = "supporting-information"


def write_document(
    answers: Answers, folder: Path, *, unit: EnergyUnit = "kJ/mol", columns: Sequence[str] = ()
) -> None:
    """Write the supporting information into a folder, which must be there or have a parent that is.

    ``supporting-information.md``, ``.tex`` (compiles as it stands), ``.docx``, ``references.bib`` and,
    where structures were read, ``structures.xyz`` (extended XYZ, a frame each).

    Parameters
    ----------
    answers : Answers
    folder : Path
    unit : str
        Of energies in tables.
    columns : sequence of str
        See `report_tables.shown`.
    """
    folder.mkdir(exist_ok=True)
    document = contents(answers, unit, columns)
    write_file(folder / f"{_NAME}.md", document_markdown(document))
    write_file(folder / f"{_NAME}.tex", document_latex(document))
    write_file(folder / f"{_NAME}.docx", document_docx(document))
    write_file(folder / "references.bib", bibtex(document.references))
    found = shapes(answers.study.species)
    if found:
        write_file(folder / "structures.xyz", xyz(found))


__all__ = ["write_document"]
