"""The document as Markdown."""

from __future__ import annotations

from thermo_pp.output.document.model import Document, Items, Listing, Paragraph, Piece
from thermo_pp.output.plain import markdown, markdown_inline, markdown_text
from thermo_pp.output.tables import Table


def document_markdown(document: Document) -> str:
    """Return the document as Markdown, references numbered at its end."""
    parts = [f"# {markdown_inline(document.title)}"]
    for section in document.sections:
        parts.append(f"## {markdown_inline(section.title)}")
        parts += [_piece(piece, document) for piece in section.pieces]
    if document.references:
        parts.append("## References")
        parts.append(
            "\n".join(
                f"{number}. {markdown_inline(reference.text)}"
                for number, reference in enumerate(document.references, start=1)
            )
        )
    return "\n\n".join(parts)


def _piece(piece: Piece, document: Document) -> str:
    if isinstance(piece, Table):
        return markdown([piece])
    if isinstance(piece, Listing):
        return "\n".join(
            [
                f"### {markdown_inline(piece.title)}",
                "",
                markdown_text(piece.about),
                "",
                "```text",
                *piece.lines,
                "```",
            ]
        )
    if isinstance(piece, Items):
        return "\n".join(f"- {_paragraph(one, document)}" for one in piece.items)
    return _paragraph(piece, document)


def _paragraph(paragraph: Paragraph, document: Document) -> str:
    numbers = document.numbers(paragraph)
    end = f" \\[{', '.join(map(str, numbers))}\\]" if numbers else ""
    return markdown_text(paragraph.text) + end
