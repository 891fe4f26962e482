"""The document, whatever it is written as: sections of paragraphs, tables and listings."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

from thermo_pp.output.document.references import Reference
from thermo_pp.output.tables import Table


@dataclass(frozen=True)
class Paragraph:
    """Plain text and what it cites.

    Attributes
    ----------
    text : str
    cites : tuple of str
        Keys of references; their numbers stand at the end.
    """

    text: str
    cites: tuple[str, ...] = ()


@dataclass(frozen=True)
class Items:
    """A list of paragraphs."""

    items: tuple[Paragraph, ...]


@dataclass(frozen=True)
class Listing:
    """Lines of fixed width with a heading of their own: a geometry.

    Attributes
    ----------
    title : str
    about : str
        A line of text below the title; empty for none.
    lines : tuple of str
        ASCII.
    """

    title: str
    about: str
    lines: tuple[str, ...]


Piece = Paragraph | Items | Table | Listing


@dataclass(frozen=True)
class Section:
    """A section.

    Attributes
    ----------
    title : str
    pieces : sequence of Paragraph, Items, Table or Listing
    """

    title: str
    pieces: Sequence[Piece]


@dataclass(frozen=True)
class Document:
    """A document.

    Attributes
    ----------
    title : str
    sections : tuple of Section
    references : tuple of Reference
        Those that are cited, in the order of first citation.
    """

    title: str
    sections: tuple[Section, ...]
    references: tuple[Reference, ...] = field(default=())

    def numbers(self, paragraph: Paragraph) -> list[int]:
        """Return the numbers of what a paragraph cites, from 1."""
        order = [reference.key for reference in self.references]
        return [order.index(key) + 1 for key in paragraph.cites]


def cited(sections: Sequence[Section]) -> tuple[str, ...]:
    """Return the keys that sections cite, in the order of first citation."""
    keys: dict[str, None] = {}
    for section in sections:
        for piece in section.pieces:
            paragraphs = piece.items if isinstance(piece, Items) else (piece,)
            for paragraph in paragraphs:
                if isinstance(paragraph, Paragraph):
                    keys.update(dict.fromkeys(paragraph.cites))
    return tuple(keys)
