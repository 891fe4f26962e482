"""The document as LaTeX that compiles as it stands; its references are in it."""

from __future__ import annotations

from thermo_pp.output.document.model import Document, Items, Listing, Paragraph, Piece
from thermo_pp.output.latex import breakable, escaped, latex, latex_document
from thermo_pp.output.tables import Table


def document_latex(document: Document) -> str:
    """Return the document as LaTeX."""
    lines = [rf"\title{{{escaped(document.title)}}}", r"\author{}", r"\date{}", r"\maketitle"]
    for section in document.sections:
        lines += ["", rf"\section{{{escaped(section.title)}}}"]
        for piece in section.pieces:
            lines += ["", _piece(piece)]
    if document.references:
        lines += ["", rf"\begin{{thebibliography}}{{{len(document.references)}}}"]
        for reference in document.references:
            lines.append(rf"\bibitem{{{reference.key}}} {escaped(reference.text)}")
        lines.append(r"\end{thebibliography}")
    return latex_document("\n".join(lines))


def _piece(piece: Piece) -> str:
    if isinstance(piece, Table):
        return latex([piece])
    if isinstance(piece, Listing):
        return "\n".join(
            [
                rf"\subsection*{{{escaped(piece.title)}}}",
                breakable(piece.about),
                r"{\footnotesize",
                r"\begin{verbatim}",
                *piece.lines,
                r"\end{verbatim}",
                "}",
            ]
        )
    if isinstance(piece, Items):
        items = [rf"\item {_paragraph(one)}" for one in piece.items]
        return "\n".join([r"\begin{itemize}\raggedright", *items, r"\end{itemize}"])
    return _paragraph(piece)


def _paragraph(paragraph: Paragraph) -> str:
    end = rf" \cite{{{','.join(paragraph.cites)}}}" if paragraph.cites else ""
    return breakable(paragraph.text) + end
