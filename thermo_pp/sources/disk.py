"""Disk: what a file on the disk holds: itself, or the members of an archive."""

from __future__ import annotations

import os
import shutil
import tempfile
from collections.abc import Iterator
from dataclasses import dataclass, replace
from pathlib import Path
from typing import BinaryIO

from thermo_pp.errors import ReadError
from thermo_pp.sources import limits
from thermo_pp.sources.archives import (
    Member,
    TarFile,
    ZipFile,
    archive_kind,
    is_document,
    open_archive,
)
from thermo_pp.sources.compressed import peel, read_all
from thermo_pp.sources.limits import Budget, damaged, oversize
from thermo_pp.sources.source import (
    HEAD_BYTES,
    DiskFolder,
    Looked,
    Piece,
    Source,
    file_digest,
    first_found,
    made_source,
    opened,
    single,
    text_head,
)

SEPARATOR = "!/"
"""Stands between an archive's name and that of its member."""
DOCUMENT = "binary"
_IN_MEMORY = 16 * 2**20
_NAMED = 4


@dataclass(frozen=True)
class LeftOut:
    """A file or member that is not looked into.

    Attributes
    ----------
    name : str
    reason : str
    """

    name: str
    reason: str


def open_source(path: Path, name: str | None = None) -> Source:
    """Read a file, or a member of an archive, into a Source called `name` (its path unless given).

    Parameters
    ----------
    path : Path
        ``archive.tar.gz!/folder/x.out`` is a member.
    name : str or None

    Raises
    ------
    ReadError
        A file that cannot be read, is damaged or beyond a limit; an archive without a member's name.
    """
    shown = str(path) if name is None else name
    archive, mark, _ = str(path).partition(SEPARATOR)
    if mark and Path(archive).is_file():
        return _member_source(Path(archive), str(path), shown)
    with opened(path, shown) as file:
        piece = single(file, path, shown, DiskFolder(path.parent))
        kind = archive_kind(piece.head)
        if kind is None:
            return piece.source()
    names = _names(path, shown)
    raise ReadError(
        f"it is an archive ({kind})",
        where=shown,
        mend=f"name one of its members: {', '.join(names)}" if names else "unpack it",
    )


def pieces(path: Path, name: str, looked: Looked | None = None) -> Iterator[Piece | LeftOut]:
    """Yield what a file holds: one piece, or one for each member of an archive.

    Parameters
    ----------
    path : Path
    name : str
        How it is called.
    looked : Looked or None
        What is looked at is written down there.

    Raises
    ------
    ReadError
        A file that cannot be opened; an archive that is damaged or beyond a limit.
    """
    looked = Looked() if looked is None else looked
    with opened(path, name) as file:
        piece = single(file, path, name, DiskFolder(path.parent, looked), looked)
        kind = archive_kind(piece.head)
        if kind is None:
            yield piece
            return
        looked.at_whole(file_digest(path))
        file.seek(0)
        budget = Budget(os.fstat(file.fileno()).st_size, name)
        yield from _inside(file, name, budget, 1)


def _member_source(path: Path, wanted: str, shown: str) -> Source:
    inside = pieces(path, str(path))
    for piece in inside:
        if piece.name == wanted:
            if isinstance(piece, LeftOut):
                raise ReadError(
                    f"it is not read: {piece.reason}", where=shown, mend="unpack the archive"
                )
            found = piece.source()
            if isinstance(found.folder, _Members):
                found.folder.keep(inside)
            return found if shown == wanted else replace(found, name=shown)
    raise ReadError(
        "the archive has no such file",
        where=shown,
        mend=f"it has: {', '.join(_names(path, shown))}",
    )


def _names(path: Path, shown: str) -> list[str]:
    """Return what the first members of an archive are called."""
    found = []
    for piece in pieces(path, shown):
        found.append(piece.name)
        if len(found) > _NAMED:
            return [*found[:_NAMED], "..."]
    return found


class _Members:
    """The members of one archive, as a folder in which siblings are looked for."""

    def __init__(self, archive: TarFile | ZipFile, name: str, budget: Budget) -> None:
        self._archive = archive
        self._name = name
        self._budget = budget
        self._by_name = {member.name: member for member in archive.members}
        self._kept: object = None

    def keep(self, inside: Iterator[Piece | LeftOut]) -> None:
        """Keep the archive open as long as somebody may ask for siblings."""
        self._kept = inside

    def find(self, name: str, beside: str) -> Source | None:
        """Return the member `name` of the folder in which the member `beside` lies."""
        folder = beside.removeprefix(self._name + SEPARATOR).rpartition("/")[0]
        return first_found(name, lambda each: self._find(f"{folder}/{each}" if folder else each))

    def _find(self, name: str) -> Source | None:
        member = self._by_name.get(name)
        if member is None or member.left_out:
            return None
        return self.piece(member)[0].source()

    def piece(self, member: Member) -> tuple[Piece, BinaryIO, bytes]:
        """Return the piece of a member, what is inside its compressions, and the head of that."""
        name = f"{self._name}{SEPARATOR}{member.name}"
        inside, head, layers = peel(self._archive.open(member), name, self._budget, HEAD_BYTES)

        def source() -> Source:
            data = read_all(inside, head, name, None if layers else member.size)
            if not layers and len(data) != member.size:
                raise damaged("it has not the size that the archive says", name)
            return made_source(name, data, self, layers)

        return Piece(name, text_head(head), source), inside, head


def _inside(file: BinaryIO, name: str, budget: Budget, depth: int) -> Iterator[Piece | LeftOut]:
    """Yield the members of the archive in `file`, which stands at its start; compressed or not."""
    budget.times = limits.MOST_TIMES_ARCHIVE
    inside, head, layers = peel(file, name, budget, HEAD_BYTES)
    kind = archive_kind(head)
    assert kind is not None
    if layers or not file.seekable():
        with _spooled(inside, head, name) as seekable:
            yield from _members(kind, seekable, name, budget, depth)
    else:
        yield from _members(kind, file, name, budget, depth)


def _members(
    kind: str, file: BinaryIO, name: str, budget: Budget, depth: int
) -> Iterator[Piece | LeftOut]:
    archive = open_archive(kind, file, name, budget)
    if kind == "zip" and is_document(archive.members):
        yield LeftOut(name, DOCUMENT)
        return
    members = _Members(archive, name, budget)
    for member in archive.members:
        shown = f"{name}{SEPARATOR}{member.name}"
        if member.left_out:
            yield LeftOut(shown, member.left_out)
            continue
        try:
            piece, inside, head = members.piece(member)
        except ReadError as error:
            if budget.exhausted:
                raise
            yield LeftOut(shown, error.what)
            continue
        nested = archive_kind(piece.head)
        if nested is None:
            yield piece
        elif depth == limits.MOST_LAYERS:
            yield LeftOut(shown, f"an archive inside {depth} others")
        else:
            try:
                with _spooled(inside, head, shown) as seekable:
                    yield from _members(nested, seekable, shown, budget, depth + 1)
            except ReadError as error:
                if budget.exhausted:
                    raise
                yield LeftOut(shown, error.what)


def _spooled(file: BinaryIO, head: bytes, name: str) -> BinaryIO:
    """Return a temporary file that holds `head` and the rest of `file`; a small one stays in memory."""
    spool = tempfile.SpooledTemporaryFile(_IN_MEMORY, prefix="thermo_pp-")  # noqa: SIM115
    try:
        spool.write(head)
        size = len(head)
        while chunk := file.read(2**20):
            size += len(chunk)
            if size > limits.MOST_SPOOLED or (
                size > _IN_MEMORY and shutil.disk_usage(tempfile.gettempdir()).free < 2**30
            ):
                raise oversize("it needs too much temporary disk space", name)
            spool.write(chunk)
    except OSError as error:
        spool.close()
        raise oversize(f"no temporary disk space: {error.strerror or error}", name) from error
    except BaseException:
        spool.close()
        raise
    spool.seek(0)
    return spool  # type: ignore[return-value]
