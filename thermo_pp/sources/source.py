"""Source: the bytes of one output with its name, its hash and its siblings, wherever it lives."""

from __future__ import annotations

import hashlib
import os
from collections.abc import Callable
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path
from typing import BinaryIO, Protocol

from thermo_pp.errors import ReadError
from thermo_pp.sources.compressed import peel, read_all
from thermo_pp.sources.limits import Budget

HEAD_BYTES = 65536
"""How much of a file a reader may look at to tell whether it is its own."""
ENDINGS = (".gz", ".bz2", ".xz", ".zst")
"""What names of compressed files end in; a sibling may be compressed while its file is not."""

Stamp = tuple[int, int, int]
"""Size in bytes, time of the last change of the bytes and of the file's entry, ns."""
_UTF16 = (b"\xff\xfe", b"\xfe\xff")


class Folder(Protocol):
    """Where siblings of a source are looked for."""

    def find(self, name: str, beside: str) -> Source | None:
        """Return the file `name` that lies beside the source called `beside`, None where there is none."""


@dataclass(frozen=True)
class Source:
    """One file in memory, decompressed.

    Attributes
    ----------
    name : str
        The path as the user gave it; it stands in every message. A member of an archive is called
        ``archive.tar.gz!/folder/x.out``.
    data : bytes
        UTF-16 is turned into UTF-8.
    folder : Path or Folder or None
        Where siblings are looked for; None for bytes that come from nowhere.
    plain_name : str or None
        The file's own name without the ending of a compression, where it is compressed.
    digest : str or None
        Hash of the bytes as they were before they became UTF-8.
    """

    name: str
    data: bytes = field(repr=False)
    folder: Path | Folder | None = None
    plain_name: str | None = None
    digest: str | None = field(default=None, repr=False)

    @cached_property
    def sha256(self) -> str:
        """Hash of the decompressed bytes, hexadecimal."""
        return self.digest or hashlib.sha256(self.data).hexdigest()

    @property
    def head(self) -> bytes:
        """The first 64 KiB."""
        return self.data[:HEAD_BYTES]

    @property
    def file_name(self) -> str:
        """The file's own name, without folders and the ending of a compression.

        Names of siblings are made from it: ``x.out`` for ``runs/x.out.gz``.
        """
        return self.plain_name or Path(self.name).name

    def sibling(self, name: str) -> Source | None:
        """Return the file `name` of the same folder, compressed or not; None where there is none.

        Raises
        ------
        ReadError
            One that is there and cannot be read.
        """
        if self.folder is None or not _plain(name):
            return None
        if not isinstance(self.folder, Path):
            return self.folder.find(name, self.name)
        return DiskFolder(self.folder).find(name, self.name)


def candidates(name: str) -> tuple[str, ...]:
    """Return the names under which a sibling may lie: its own, then those of its compressed forms."""
    return (name, *(name + ending for ending in ENDINGS))


def first_found(name: str, look: Callable[[str], Source | None]) -> Source | None:
    """Return what `look` finds first under the names of a sibling."""
    for candidate in candidates(name):
        found = look(candidate)
        if found is not None:
            return found
    return None


def without_ending(name: str) -> str:
    """Return a file's name without folders and the ending of a compression."""
    own = Path(name).name
    for ending in (*ENDINGS, ".zstd"):
        if own.lower().endswith(ending) and len(own) > len(ending):
            return own[: -len(ending)]
    return own


def _plain(name: str) -> bool:
    return bool(name) and name not in (".", "..") and not set(name) & {"/", "\\", "\0"}


@dataclass(frozen=True)
class Piece:
    """One file or member, its head read and the rest not yet.

    Attributes
    ----------
    name : str
    head : bytes
        Its first 64 KiB, decompressed; UTF-16 is turned into UTF-8.
    source : callable
        Reads the rest and returns the Source; to be called at once, if at all. ReadError where it
        is damaged, Oversize where it is beyond a limit.
    """

    name: str
    head: bytes
    source: Callable[[], Source]


class Looked:
    """What was looked at for an answer, so that it can be told whether the answer still holds.

    Attributes
    ----------
    whole : bool
        Whether the answer rests on more of the file than its head.
    siblings : dict of str to (str or None)
        File name -> hash of its bytes, None where there is no such file.
    stamps : dict of str to Stamp
        Size and times of the siblings that are there, from before they were read.
    """

    def __init__(self) -> None:
        self.whole = False
        self.siblings: dict[str, str | None] = {}
        self.stamps: dict[str, Stamp] = {}
        self._digest: str | None = None
        self._head: bytes | None = None

    def at_head(self, head: bytes) -> None:
        """Note that only the head of the file was looked at."""
        self._head = head

    def at_whole(self, digest: str | None) -> None:
        """Note that the whole file was looked at."""
        self.whole, self._digest = True, digest

    @property
    def digest(self) -> str | None:
        """Hash of the file's bytes, or of its head; None where it could not be read."""
        if self._digest is None and self._head is not None and not self.whole:
            return hashlib.sha256(self._head).hexdigest()
        return self._digest


class DiskFolder:
    """A folder in which siblings are looked for; what was looked for is written down."""

    def __init__(self, path: Path, looked: Looked | None = None) -> None:
        self._path = path
        self._looked = looked

    def find(self, name: str, beside: str) -> Source | None:
        """Return the file `name`, compressed or not, for the source called `beside`."""
        return first_found(name, lambda candidate: self._find(candidate, beside))

    def _find(self, name: str, beside: str) -> Source | None:
        path = self._path / name
        there = is_own_file(path)
        if self._looked is not None and name not in self._looked.siblings:
            stamp = stamp_of(path) if there else None
            if stamp is not None:
                self._looked.stamps[name] = stamp
            self._looked.siblings[name] = file_digest(path) if there else None
        if not there:
            return None
        shown = str(Path(beside).parent / name)
        with opened(path, shown) as file:
            return single(file, path, shown, self).source()


def stamp_of(path: Path) -> Stamp | None:
    """Return size and times of a file; None where there is none."""
    try:
        found = path.stat()
    except (OSError, ValueError):
        return None
    return found.st_size, found.st_mtime_ns, found.st_ctime_ns


def is_own_file(path: Path) -> bool:
    """Tell whether there is a file that lies in this folder or, by a link, below it."""
    try:
        if not path.is_file():
            return False
        return not path.is_symlink() or path.resolve().is_relative_to(path.parent.resolve())
    except (OSError, RuntimeError):
        return False


def file_digest(path: Path, *, whole: bool = True) -> str | None:
    """Return the hash of a file's bytes or of its head; None where it cannot be read."""
    try:
        with path.open("rb") as file:
            if whole:
                return hashlib.file_digest(file, "sha256").hexdigest()
            return hashlib.sha256(file.read(HEAD_BYTES)).hexdigest()
    except OSError:
        return None


def opened(path: Path, shown: str) -> BinaryIO:
    """Return a file opened for reading; ReadError where it cannot be."""
    try:
        return path.open("rb")
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise ReadError(
            f"cannot be read: {reason}", where=shown, mend="check the name and the permissions"
        ) from error


def single(
    file: BinaryIO, path: Path, name: str, folder: Folder, looked: Looked | None = None
) -> Piece:
    """Return the piece of a file on the disk, taken out of its compressions."""
    size = os.fstat(file.fileno()).st_size
    try:
        inside, head, layers = peel(file, name, Budget(size, name), HEAD_BYTES)
    except OSError as error:
        raise _unreadable(error, name) from error
    if looked is not None:
        if layers:
            looked.at_whole(file_digest(path))
        else:
            looked.at_head(head)

    def source() -> Source:
        try:
            data = read_all(inside, head, name, None if layers else size)
        except OSError as error:
            raise _unreadable(error, name) from error
        made = made_source(name, data, folder, layers)
        if looked is not None and not layers:
            looked.at_whole(made.sha256)
        return made

    return Piece(name, text_head(head), source)


def _unreadable(error: OSError, name: str) -> ReadError:
    return ReadError(
        f"cannot be read: {error.strerror or error}", where=name, mend="check the disk"
    )


def made_source(name: str, data: bytes, folder: Folder, layers: int) -> Source:
    """Return the source of decompressed bytes; ReadError where they are damaged UTF-16."""
    plain = without_ending(name) if layers else None
    if not data.startswith(_UTF16):
        return Source(name, data, folder, plain)
    digest = hashlib.sha256(data).hexdigest()
    try:
        text = data.decode("utf-16").encode()
    except UnicodeError as error:
        raise ReadError(
            f"not valid UTF-16: {error}", where=f"{name}:1", mend="copy it again, as UTF-8"
        ) from error
    return Source(name, text, folder, plain, digest)


def text_head(head: bytes) -> bytes:
    """Return a head with UTF-16 turned into UTF-8."""
    return head.decode("utf-16", "ignore").encode() if head.startswith(_UTF16) else head
