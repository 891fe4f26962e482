"""The document as docx; the same document gives the same bytes."""

from __future__ import annotations

import datetime
import io
import zipfile
from typing import TYPE_CHECKING, Any
from xml.sax.saxutils import escape

from thermo_pp import __version__
from thermo_pp.output.document.model import Document, Items, Listing, Paragraph
from thermo_pp.output.parts import in_parts
from thermo_pp.output.plain import table_cells
from thermo_pp.output.tables import Table, printable

if TYPE_CHECKING:
    from docx.document import Document as Word

_EPOCH = (1980, 1, 1, 0, 0, 0)
_WRITTEN = datetime.datetime(2000, 1, 1)
_ACROSS = 104.0
"""Characters that a line of a table holds."""
_MOST_TEXT = 30
_SPACE = "http://schemas.openxmlformats.org/wordprocessingml/2006/main"
_HALF_POINTS = 15


def document_docx(document: Document) -> bytes:
    """Return the document as the bytes of a docx."""
    import docx
    from docx.shared import Cm, Pt

    word = docx.Document()
    properties = word.core_properties
    properties.author = f"thermo_pp {__version__}"
    properties.title = printable(document.title)
    properties.comments = ""
    properties.created = properties.modified = _WRITTEN
    page = word.sections[0]
    page.page_width, page.page_height = Cm(21.0), Cm(29.7)
    page.left_margin = page.right_margin = Cm(2.0)
    word.styles["Normal"].font.size = Pt(10)
    word.add_heading(printable(document.title), level=0)
    count = 0
    for section in document.sections:
        word.add_heading(printable(section.title), level=1)
        for piece in section.pieces:
            if isinstance(piece, Table):
                for part in in_parts(piece, _ACROSS, gap=2.0, most_text=_MOST_TEXT):
                    count += 1
                    _table(word, part, count)
            elif isinstance(piece, Listing):
                _listing(word, piece)
            elif isinstance(piece, Items):
                for one in piece.items:
                    word.add_paragraph(_text(one, document), style="List Bullet")
            else:
                word.add_paragraph(_text(piece, document))
    if document.references:
        word.add_heading("References", level=1)
        for number, reference in enumerate(document.references, start=1):
            word.add_paragraph(f"[{number}] {reference.text}")
    return _same_bytes(word)


def _text(paragraph: Paragraph, document: Document) -> str:
    numbers = document.numbers(paragraph)
    end = f" [{', '.join(map(str, numbers))}]" if numbers else ""
    return printable(paragraph.text) + end


def _listing(word: Word, listing: Listing) -> None:
    from docx.shared import Pt

    word.add_heading(printable(listing.title), level=2)
    word.add_paragraph(printable(listing.about)).paragraph_format.keep_with_next = True
    paragraph = word.add_paragraph()
    run = paragraph.add_run("\n".join(listing.lines))
    run.font.name, run.font.size = "Courier New", Pt(8)


def _table(word: Word, table: Table, number: int) -> None:
    """Add a table: caption, grid with a heading that is repeated on every page, notes."""
    from docx.oxml import parse_xml
    from docx.shared import Pt

    caption = word.add_paragraph(f"Table {number}. {printable(table.title)}", style="Caption")
    caption.paragraph_format.keep_with_next = True
    notes = word.add_paragraph()
    run = notes.add_run(" ".join(printable(note) for note in table.all_notes))
    run.font.size = Pt(8)
    notes._p.addprevious(parse_xml(_grid(table)))


def _grid(table: Table) -> str:
    """Return a table as XML at once: a cell at a time takes minutes for some thousand rows."""
    sides = ["right" if table.right(k) else "left" for k in range(len(table.columns))]
    rows = [_row([column.heading for column in table.columns], sides, heading=True)]
    rows += [_row(row, sides, heading=False) for row in table_cells(table)]
    rules = "".join(
        f'<w:{side} w:val="single" w:sz="{size}" w:space="0" w:color="auto"/>'
        for side, size in (("top", 8), ("bottom", 8), ("insideH", 2))
    )
    columns = "<w:gridCol/>" * len(table.columns)
    return (
        f'<w:tbl xmlns:w="{_SPACE}"><w:tblPr><w:tblW w:w="0" w:type="auto"/>'
        f'<w:tblBorders>{rules}</w:tblBorders><w:tblLayout w:type="autofit"/></w:tblPr>'
        f"<w:tblGrid>{columns}</w:tblGrid>{''.join(rows)}</w:tbl>"
    )


def _row(texts: list[str], sides: list[str], *, heading: bool) -> str:
    bold, top = ("<w:b/>", "<w:tblHeader/>") if heading else ("", "")
    cells = "".join(
        f'<w:tc><w:p><w:pPr><w:spacing w:after="0"/><w:jc w:val="{side}"/></w:pPr>'
        f'<w:r><w:rPr>{bold}<w:sz w:val="{_HALF_POINTS}"/></w:rPr>'
        f'<w:t xml:space="preserve">{escape(printable(text))}</w:t></w:r></w:p></w:tc>'
        for text, side in zip(texts, sides, strict=True)
    )
    return f"<w:tr><w:trPr><w:cantSplit/>{top}</w:trPr>{cells}</w:tr>"


def _same_bytes(word: Any) -> bytes:
    """Return the file with one date on all of its members."""
    made, stream = io.BytesIO(), io.BytesIO()
    word.save(made)
    with (
        zipfile.ZipFile(made) as old,
        zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as new,
    ):
        for name in old.namelist():
            member = zipfile.ZipInfo(name, _EPOCH)
            member.compress_type = zipfile.ZIP_DEFLATED
            new.writestr(member, old.read(name))
    return stream.getvalue()
