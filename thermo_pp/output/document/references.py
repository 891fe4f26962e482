"""References: of the methods that a study may use, as text and as BibTeX.

A DOI stands here only where it was seen with the article; all else is from memory, and so are the
volumes and pages of references without one.
"""

from __future__ import annotations

import unicodedata
from collections.abc import Sequence
from dataclasses import dataclass


@dataclass(frozen=True)
class Reference:
    """One publication.

    Attributes
    ----------
    key : str
    authors : tuple of str
        ``"S. Grimme"``.
    year : int
    journal : str
        Abbreviated; empty for a book.
    volume, pages : str
    title, publisher : str
        Of a book.
    doi : str or None
    """

    key: str
    authors: tuple[str, ...]
    year: int
    journal: str = ""
    volume: str = ""
    pages: str = ""
    title: str = ""
    publisher: str = ""
    doi: str | None = None

    @property
    def text(self) -> str:
        """The reference as it stands in a list."""
        names = ", ".join(self.authors)
        if self.journal:
            words = f"{names}, {self.journal} {self.year}, {self.volume}, {self.pages}."
        else:
            words = f"{names}, {self.title}, {self.publisher}, {self.year}."
        return words if self.doi is None else f"{words} doi:{self.doi}"


def _article(
    key: str, authors: str, journal: str, year: int, volume: str, pages: str, doi: str | None = None
) -> Reference:
    names = tuple(authors.split(", "))
    return Reference(key, names, year, journal, volume, pages, doi=doi)


def _book(key: str, authors: str, title: str, publisher: str, year: int) -> Reference:
    return Reference(key, tuple(authors.split(", ")), year, title=title, publisher=publisher)


_KNOWN = (
    _book("McQuarrie1976", "D. A. McQuarrie", "Statistical Mechanics", "Harper & Row", 1976),
    _article(
        "FernandezRamos2007",
        "A. Fernández-Ramos, B. A. Ellingson, R. Meana-Pañeda, J. M. C. Marques, D. G. Truhlar",
        "Theor. Chem. Acc.", 2007, "118", "813-826", "10.1007/s00214-007-0328-0",
    ),
    _article(
        "Ribeiro2011", "R. F. Ribeiro, A. V. Marenich, C. J. Cramer, D. G. Truhlar",
        "J. Phys. Chem. B", 2011, "115", "14556",
    ),
    _article(
        "Grimme2012", "S. Grimme", "Chem. Eur. J.", 2012, "18", "9955", "10.1002/chem.201200497"
    ),
    _article(
        "Li2015", "Y.-P. Li, J. Gomes, S. M. Sharada, A. T. Bell, M. Head-Gordon",
        "J. Phys. Chem. C", 2015, "119", "1840", "10.1021/jp509921r",
    ),
    _article(
        "Pracht2021", "P. Pracht, S. Grimme", "Chem. Sci.", 2021, "12", "6551",
        "10.1039/D1SC00621E",
    ),
    _article("Pitzer1942", "K. S. Pitzer, W. D. Gwinn", "J. Chem. Phys.", 1942, "10", "428"),
    _article(
        "HarveyAschi1999", "J. N. Harvey, M. Aschi", "Phys. Chem. Chem. Phys.", 1999, "1", "5555"
    ),
    _article("Eyring1935", "H. Eyring", "J. Chem. Phys.", 1935, "3", "107"),
    _article("Evans1935", "M. G. Evans, M. Polanyi", "Trans. Faraday Soc.", 1935, "31", "875"),
    _article("Alvarez2013", "S. Alvarez", "Dalton Trans.", 2013, "42", "8617"),
    _article("Wigner1932", "E. Wigner", "Z. Phys. Chem. B", 1932, "19", "203"),
    _article("Eckart1930", "C. Eckart", "Phys. Rev.", 1930, "35", "1303"),
    _article("Johnston1962", "H. S. Johnston, J. Heicklen", "J. Phys. Chem.", 1962, "66", "532"),
    _article(
        "Grassmann1985", "W. K. Grassmann, M. I. Taksar, D. P. Heyman", "Oper. Res.", 1985, "33",
        "1107",
    ),
    _article(
        "Campbell2017", "C. T. Campbell", "ACS Catal.", 2017, "7", "2770",
        "10.1021/acscatal.7b00115",
    ),
    _article(
        "Kozuch2011", "S. Kozuch, S. Shaik", "Acc. Chem. Res.", 2011, "44", "101",
        "10.1021/ar1000956",
    ),
    _book(
        "Hairer1996", "E. Hairer, G. Wanner", "Solving Ordinary Differential Equations II",
        "Springer", 1996,
    ),
    _article(
        "Bigeleisen1947", "J. Bigeleisen, M. G. Mayer", "J. Chem. Phys.", 1947, "15", "261"
    ),
    _article(
        "Helgaker1997", "T. Helgaker, W. Klopper, H. Koch, J. Noga", "J. Chem. Phys.", 1997, "106",
        "9639",
    ),
    _article(
        "Halkier1999",
        "A. Halkier, T. Helgaker, P. Jørgensen, W. Klopper, J. Olsen",
        "Chem. Phys. Lett.", 1999, "302", "437",
    ),
    _article("Karton2006", "A. Karton, J. M. L. Martin", "Theor. Chem. Acc.", 2006, "115", "330"),
    _article("Boys1970", "S. F. Boys, F. Bernardi", "Mol. Phys.", 1970, "19", "553"),
)  # fmt: skip
REFERENCES = {reference.key: reference for reference in _KNOWN}


def bibtex(references: Sequence[Reference]) -> str:
    """Return references as BibTeX; letters with accents are written as LaTeX has them."""
    return "\n\n".join(map(_entry, references))


def _entry(reference: Reference) -> str:
    book = not reference.journal
    fields = {
        "author": " and ".join(reference.authors),
        "title": reference.title,
        "publisher": reference.publisher,
        "journal": reference.journal,
        "year": str(reference.year),
        "volume": reference.volume,
        "pages": reference.pages.replace("-", "--"),
        "doi": reference.doi or "",
    }
    lines = [
        f"  {name} = {{{value if name == 'doi' else _latex(value)}}},"
        for name, value in fields.items()
        if value
    ]
    return "\n".join([f"@{'book' if book else 'article'}{{{reference.key},", *lines, "}"])


_MARKS = {
    "\N{COMBINING ACUTE ACCENT}": "'",
    "\N{COMBINING TILDE}": "~",
    "\N{COMBINING DIAERESIS}": '"',
}


def _latex(text: str) -> str:
    """Return a name or title with accents as commands and & escaped."""
    found = ""
    for sign in unicodedata.normalize("NFD", text.replace("ø", r"{\o}").replace("&", r"\&")):
        if sign in _MARKS:
            found = f"{found[:-1]}{{\\{_MARKS[sign]}{found[-1]}}}"
        else:
            found += sign
    return found
