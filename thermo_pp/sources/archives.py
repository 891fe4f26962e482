"""Archives: the members of tar and zip files, read where they lie; nothing is unpacked to disk.

Tar files are read by a short parser of our own, which believes no size that a header claims for its
own text. Traps: names in pax and GNU headers, sizes in base 256, links, members without a name;
zip members that are encrypted, overlap each other or claim a size that they have not.
"""

from __future__ import annotations

import io
import stat
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any, BinaryIO

from thermo_pp.sources import limits
from thermo_pp.sources.limits import Budget, damaged, oversize

HIDDEN = "hidden"
LINK = "a link inside an archive"
NO_FILE = "neither a file nor a folder"
OUTSIDE = "its name leads out of the archive"
ENCRYPTED = "encrypted"
METHOD = "compressed by a method that is not read"
SPARSE = "a file with holes"
_BLOCK = 512
_MOST_HEADER = 2**20
_MOST_DIRECTORY = 16 * 2**20
_TAR_FILES = (b"0", b"\0", b"7")


@dataclass(frozen=True)
class Member:
    """One member of an archive.

    Attributes
    ----------
    name : str
        Its path in the archive, parted by "/".
    size : int
        Of the bytes it holds, as the archive claims.
    left_out : str or None
        Why it is not read.
    place : object
        What the archive needs to find it.
    """

    name: str
    size: int
    left_out: str | None
    place: Any


def archive_kind(head: bytes) -> str | None:
    """Return "tar" or "zip" for a file that begins with `head`, None for any other."""
    if head.startswith((b"PK\x03\x04", b"PK\x05\x06")):
        return "zip"
    block = head[:_BLOCK]
    if len(block) < _BLOCK or not (
        block[257:262] == b"ustar" or block[100:107].strip(b"01234567 ") == b""
    ):
        return None
    return "tar" if block[0] and _sum_is_right(block) else None


def is_document(members: tuple[Member, ...]) -> bool:
    """Tell whether a zip file is one document (an office file, say) and no archive."""
    return any(member.name == "[Content_Types].xml" for member in members) or (
        bool(members) and members[0].name == "mimetype"
    )


def open_archive(kind: str, file: BinaryIO, where: str, budget: Budget) -> TarFile | ZipFile:
    """Return the archive in a file that can be read anywhere; Damaged where it is none."""
    budget.times = limits.MOST_TIMES_ARCHIVE
    return ZipFile(file, where, budget) if kind == "zip" else TarFile(file, where, budget)


class TarFile:
    """A tar file, not compressed.

    Parameters
    ----------
    file : file
        It can be read anywhere.
    where : str
    budget : Budget
    """

    def __init__(self, file: BinaryIO, where: str, budget: Budget) -> None:
        self._file = file
        self._where = where
        self._budget = budget
        last: dict[str, Member] = {}
        for member in self._walk():
            last.pop(member.name, None)  # a later member takes the place of an earlier one
            last[member.name] = member
        self.members = tuple(last.values())

    def open(self, member: Member) -> BinaryIO:
        """Return the bytes of a member."""
        return io.BufferedReader(_Part(self._file, member, self._where, self._budget))

    def _walk(self) -> Iterator[Member]:
        end = self._file.seek(0, io.SEEK_END)
        at = 0
        headers: dict[str, str] = {}
        while at + _BLOCK <= end:
            self._file.seek(at)
            block = self._file.read(_BLOCK)
            if not block.strip(b"\0"):
                return  # the end of the archive
            if not _sum_is_right(block):
                raise damaged(f"damaged tar archive at byte {at}", self._where)
            kind, size = block[156:157], _number(block[124:136], self._where)
            begin = at + _BLOCK
            if kind in b"xgLK":
                headers |= self._header(kind, begin, size)
                at = _after(begin, size)
                continue
            size = int(headers.get("size", size))
            if kind in b"123456":
                size = 0
            if begin + size > end:
                raise damaged("the tar archive is cut short", self._where)
            self._budget.member()
            name = headers.get("path") or _tar_name(block)
            if kind != b"5" and not name.endswith("/"):
                reason = _left_out(name) or _tar_reason(kind, headers)
                yield Member(_normal(name), size, reason, begin)
            headers = {}
            at = _after(begin, size)
        if at < end:
            raise damaged("the tar archive is cut short", self._where)

    def _header(self, kind: bytes, begin: int, size: int) -> dict[str, str]:
        """Return what a header that stands before its member says of it."""
        if size > _MOST_HEADER:
            raise damaged(f"a tar header of {size} bytes", self._where)
        self._file.seek(begin)
        data = self._file.read(size)
        if len(data) < size:
            raise damaged("the tar archive is cut short", self._where)
        if kind == b"L":
            return {"path": data.rstrip(b"\0").decode("utf-8", "surrogateescape")}
        return self._records(data) if kind == b"x" else {}

    def _records(self, data: bytes) -> dict[str, str]:
        """Return the records of a pax header, "LENGTH KEY=VALUE" and a line end each."""
        found: dict[str, str] = {}
        while data.strip(b"\0"):
            length, _, _ = data.partition(b" ")
            if not length.isdigit() or not len(length) < int(length) <= len(data):
                raise damaged("damaged pax header in the tar archive", self._where)
            record, data = data[len(length) + 1 : int(length) - 1], data[int(length) :]
            key, _, value = record.partition(b"=")
            found[key.decode("utf-8", "replace")] = value.decode("utf-8", "surrogateescape")
        if not found.get("size", "0").isdigit():
            raise damaged("damaged pax header in the tar archive", self._where)
        return found


class _Part(io.RawIOBase):
    """A part of another file, read from its start to its end."""

    def __init__(self, file: BinaryIO, member: Member, where: str, budget: Budget) -> None:
        self._file = file
        self._at = int(member.place)
        self._end = self._at + member.size
        self._where = where
        self._budget = budget

    def readable(self) -> bool:
        return True

    def readinto(self, into: Any) -> int:
        view = memoryview(into).cast("B")
        self._file.seek(self._at)
        data = self._file.read(min(len(view), self._end - self._at))
        if not data and self._at < self._end:
            raise damaged("the tar archive is cut short", self._where)
        self._at += len(data)
        self._budget.spend(len(data))
        view[: len(data)] = data
        return len(data)


class ZipFile:
    """A zip file.

    Parameters
    ----------
    file : file
        It can be read anywhere.
    where : str
    budget : Budget
    """

    def __init__(self, file: BinaryIO, where: str, budget: Budget) -> None:
        import zipfile

        self._where = where
        self._budget = budget
        _check_directory(file, where)
        try:
            self._zip = zipfile.ZipFile(file)
        except Exception as error:  # of many kinds: what a damaged directory makes of its numbers
            raise damaged(f"damaged zip archive ({error})", where) from error
        last: dict[str, Member] = {}
        for info in self._zip.infolist():
            budget.member()
            if not info.is_dir():
                name = _normal(info.filename)
                last.pop(name, None)
                last[name] = Member(name, info.file_size, _zip_reason(info), info)
        self.members = tuple(last.values())

    def open(self, member: Member) -> BinaryIO:
        """Return the bytes of a member."""
        return io.BufferedReader(_ZipPart(self._zip, member, self._where, self._budget))


class _ZipPart(io.RawIOBase):
    """A member of a zip file, read from its start to its end; its sum is checked there."""

    def __init__(self, archive: Any, member: Member, where: str, budget: Budget) -> None:
        self._where = where
        self._name = member.name
        self._budget = Budget(member.place.compress_size, f"{where}!/{member.name}")
        self._all = budget
        self._archive = archive
        self._info = member.place
        self._stream: Any = None

    def readable(self) -> bool:
        return True

    def readinto(self, into: Any) -> int:
        view = memoryview(into).cast("B")
        try:
            if self._stream is None:
                self._stream = self._archive.open(self._info)
            data = self._stream.read(len(view))
        except Exception as error:  # BadZipFile, zlib.error, OSError, EOFError, struct.error, ...
            raise damaged(
                f"damaged zip member ({error})", f"{self._where}!/{self._name}"
            ) from error
        self._budget.spend(len(data))
        self._all.spend(len(data))
        view[: len(data)] = data
        return len(data)


def _check_directory(file: BinaryIO, where: str) -> None:
    """Refuse a zip file whose table of contents is out of all proportion, before it is read."""
    end = file.seek(0, io.SEEK_END)
    file.seek(max(0, end - 66_000))
    tail = file.read()
    at, large = tail.rfind(b"PK\x05\x06"), tail.rfind(b"PK\x06\x06")
    if at < 0:
        raise damaged("the zip archive is cut short", where)
    size = int.from_bytes(tail[at + 12 : at + 16], "little")
    if large >= 0:
        size = max(size % 0xFFFFFFFF, int.from_bytes(tail[large + 40 : large + 48], "little"))
    if size > _MOST_DIRECTORY:
        raise oversize("its table of contents is too large", where)
    file.seek(0)


def _left_out(name: str) -> str | None:
    parts = [part for part in name.split("/") if part not in ("", ".")]
    if not parts or ".." in parts or "\0" in name:
        return OUTSIDE
    return HIDDEN if any(part.startswith(".") for part in parts) else None


def _normal(name: str) -> str:
    """Return a member's name without a leading "/" or "./" and doubled "/"."""
    return "/".join(part for part in name.split("/") if part not in ("", ".")) or name


def _tar_reason(kind: bytes, headers: dict[str, str]) -> str | None:
    if kind == b"S" or any(key.startswith("GNU.sparse") for key in headers):
        return SPARSE
    if kind in b"12":
        return LINK
    return None if kind in _TAR_FILES else NO_FILE


def _zip_reason(info: Any) -> str | None:
    import zipfile

    if stat.S_ISLNK(info.external_attr >> 16):
        return LINK
    if info.flag_bits & 1:
        return ENCRYPTED
    methods = (zipfile.ZIP_STORED, zipfile.ZIP_DEFLATED, zipfile.ZIP_BZIP2)
    return _left_out(info.filename) or (None if info.compress_type in methods else METHOD)


def _tar_name(block: bytes) -> str:
    name = block[:100].partition(b"\0")[0]
    prefix = block[345:500].partition(b"\0")[0] if block[257:263] == b"ustar\0" else b""
    whole = prefix + b"/" + name if prefix else name
    return whole.decode("utf-8", "surrogateescape")


def _number(field: bytes, where: str) -> int:
    """Return a number of a tar header: octal, or base 256 where the first bit is set."""
    if field[0] == 0x80:
        return int.from_bytes(field[1:], "big")
    try:
        return int(field.strip(b" \0") or b"0", 8)
    except ValueError:
        raise damaged("damaged tar header", where) from None


def _sum_is_right(block: bytes) -> bool:
    """Tell whether a tar header's sum of its own bytes is right."""
    try:
        told = int(block[148:156].strip(b" \0"), 8)
    except ValueError:
        return False
    return told == sum(block[:148]) + sum(block[156:_BLOCK]) + 8 * 32


def _after(begin: int, size: int) -> int:
    return begin + -(-size // _BLOCK) * _BLOCK
