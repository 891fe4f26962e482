"""Readers of program outputs: one format a module, told by content, never by the file's name.

A reader offers `NAME`, `LOOKS_FOR`, `sniff` and `read`. To add one, write the module, add it to `READERS` and
put files that it reads and files that it refuses into ``fixtures/<NAME>/good`` and ``bad``.
"""

from __future__ import annotations

import os
from pathlib import Path
from typing import Protocol

from thermo_pp.errors import ReadError
from thermo_pp.readers import (
    ase_formats,
    ase_vibrations,
    cclib_formats,
    cjson,
    gamess,
    gaussian,
    molden,
    mopac,
    nwchem,
    orca,
    psi4,
    qchem,
    qcschema,
    xtb,
)
from thermo_pp.records import Calculation
from thermo_pp.sources import Source, open_source


class Reader(Protocol):
    """What a reader's module offers."""

    NAME: str
    LOOKS_FOR: str
    """The mark that `sniff` looks for, in words, for the message that no reader knows a file."""

    def sniff(self, head: bytes) -> bool:
        """Tell whether `head`, the first 64 KiB of a file, is this reader's format."""

    def read(self, source: Source) -> Calculation:
        """Read one file; ReadError names file and line."""


READERS: tuple[Reader, ...] = (
    nwchem,
    psi4,
    qcschema,
    ase_formats,
    orca,
    gaussian,
    qchem,
    gamess,
    xtb,
    mopac,
    molden,
    cjson,
    ase_vibrations,
    cclib_formats,
)


def claims(head: bytes) -> tuple[Reader, ...]:
    """Return the readers that take `head`, the first 64 KiB of a file, for their own.

    The general library is asked only where no reader of our own claims the file.
    """
    own = tuple(reader for reader in READERS if reader is not cclib_formats and reader.sniff(head))
    return own or ((cclib_formats,) if cclib_formats.sniff(head) else ())


def read_source(source: Source) -> Calculation:
    """Read one file with the one reader that knows it.

    Raises
    ------
    ReadError
        An empty file, one that no reader or more than one claims, and whatever the reader raises.
    """
    return read_claimed(source, claims(source.head))


def read_claimed(source: Source, readers: tuple[Reader, ...]) -> Calculation:
    """Read one file with the one of `readers`, those that claim its head; raises as `read_source`."""
    if not source.data or source.data.isspace():
        raise ReadError(
            "the file is empty",
            where=f"{source.name}:1",
            mend="rerun or re-copy it",
        )
    if len(readers) > 1:
        names = " and ".join(reader.NAME for reader in readers)
        raise ReadError(
            f"the readers {names} both claim this file",
            where=f"{source.name}:1",
            mend="give each program's output in a file of its own",
        )
    if not readers:
        marks = "; ".join(reader.LOOKS_FOR for reader in READERS)
        raise ReadError(
            f"no reader knows this file (looked in its first 64 KiB for {marks})",
            where=f"{source.name}:1",
            mend="give the program's own output, from its first line; its name does not matter",
        )
    return readers[0].read(source)


def read_all(source: Source) -> tuple[Calculation, ...]:
    """Read every structure of a file that holds several: extended XYZ, a trajectory, a data base.

    Raises
    ------
    ReadError
        A file of any other format, and whatever its reader raises.
    """
    if not ase_formats.sniff(source.head):
        raise ReadError(
            f"no file of several structures (looked for {ase_formats.LOOKS_FOR})",
            where=f"{source.name}:1",
            mend="name each output of one structure by itself",
        )
    return ase_formats.read_all(source)


def several(path: Path) -> tuple[Calculation, ...]:
    """Return the structures of a file that holds more than one, nothing of any other path."""
    if not path.is_file():
        return ()
    source = open_source(path, str(path))
    found = ase_formats.read_all(source) if ase_formats.sniff(source.head) else ()
    return found if len(found) > 1 else ()


def read(path: str | os.PathLike[str]) -> Calculation:
    """Read the output at `path`; ReadError where it cannot be read."""
    return read_source(open_source(Path(path), os.fspath(path)))
