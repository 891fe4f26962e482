"""Compressed files: told by their first bytes, decompressed as a stream that keeps to its limits."""

from __future__ import annotations

import io
from typing import TYPE_CHECKING, Any, BinaryIO, Protocol

from thermo_pp.errors import ReadError
from thermo_pp.sources.limits import (
    MIB,
    MOST_BYTES,
    MOST_LAYERS,
    XZ_MEMORY,
    Budget,
    Damaged,
    Oversize,
    damaged,
    oversize,
)

if TYPE_CHECKING:
    from _typeshed import WriteableBuffer

MAGIC: tuple[tuple[bytes, str], ...] = (
    (b"\x1f\x8b\x08", "gzip"),
    (b"BZh", "bzip2"),
    (b"\xfd7zXZ\x00", "xz"),
    (b"\x28\xb5\x2f\xfd", "zstd"),
)
_BZIP2_BLOCKS = (b"1AY&SY", b"\x17\x72\x45\x38\x50\x90")
_CHUNK = 65536
_STEP = 8192


class _Decompressor(Protocol):
    @property
    def eof(self) -> bool: ...

    @property
    def unused_data(self) -> bytes: ...

    @property
    def needs_input(self) -> bool: ...

    def decompress(self, data: bytes, max_length: int = ..., /) -> bytes: ...


class _Readable(Protocol):
    def read(self, size: int = ..., /) -> bytes: ...


class _Gzip:
    """zlib's decompressor in the form of those of the other formats; it checks the sum at the end."""

    def __init__(self) -> None:
        import zlib

        self._zlib = zlib.decompressobj(wbits=31)
        self._rest = b""

    @property
    def eof(self) -> bool:
        return self._zlib.eof

    @property
    def unused_data(self) -> bytes:
        return self._zlib.unused_data

    @property
    def needs_input(self) -> bool:
        return not self._rest

    def decompress(self, data: bytes, max_length: int = 0, /) -> bytes:
        out = self._zlib.decompress(self._rest + data, max_length)
        self._rest = self._zlib.unconsumed_tail
        return out


def compression(head: bytes) -> str | None:
    """Return how a file that begins with `head` is compressed, None where it is not."""
    for magic, kind in MAGIC:
        if head.startswith(magic) and (kind != "bzip2" or head[4:10] in _BZIP2_BLOCKS):
            return kind
    return None


def zstd_module() -> Any:
    """Return the module for zstd: the standard library's, or backports.zstd below Python 3.14.

    Raises
    ------
    ImportError
        Where neither is there.
    """
    from importlib import import_module

    try:
        return import_module("compression.zstd")
    except ImportError:
        return import_module("backports.zstd")


def _decompressor(kind: str, where: str) -> _Decompressor:
    if kind == "gzip":
        return _Gzip()
    if kind == "bzip2":
        import bz2

        return bz2.BZ2Decompressor()
    if kind == "xz":
        import lzma

        return lzma.LZMADecompressor(format=lzma.FORMAT_XZ, memlimit=XZ_MEMORY)
    try:
        made: _Decompressor = zstd_module().ZstdDecompressor()
    except ImportError as error:
        raise ReadError(
            "it is compressed with zstd, which this Python cannot read by itself",
            where=where,
            mend="pip install backports.zstd, or decompress it with: zstd -d",
        ) from error
    return made


class Inflated(io.RawIOBase):
    """The decompressed bytes of a file, read once from start to end.

    Parameters
    ----------
    raw : file
        The compressed bytes, at their start.
    kind : str
        What `compression` says.
    where : str
    budget : Budget
        What comes out is counted there.
    """

    def __init__(self, raw: _Readable, kind: str, where: str, budget: Budget) -> None:
        self._raw = raw
        self._kind = kind
        self._where = where
        self._budget = budget
        self._stream = _decompressor(kind, where)
        self._ended = False

    def readable(self) -> bool:
        """Tell that it can be read."""
        return True

    def readinto(self, into: WriteableBuffer) -> int:
        """Fill a buffer; 0 at the end. Damaged or Oversize where it cannot go on."""
        view = memoryview(into).cast("B")
        while not self._ended and len(view):
            out = self._next(len(view))
            if out:
                self._budget.spend(len(out))
                view[: len(out)] = out
                return len(out)
        return 0

    def _next(self, most: int) -> bytes:
        """Return the next bytes, at most `most`; none where it has to be called again."""
        if self._stream.eof:
            self._begin_again()
            return b""
        data = self._raw.read(_CHUNK) if self._stream.needs_input else b""
        starved = self._stream.needs_input and not data
        try:
            out = self._stream.decompress(data, most)
        except MemoryError as error:
            raise oversize("it asks for too much memory", self._where) from error
        except Exception as error:  # zlib.error, OSError, LZMAError, ZstdError, EOFError
            if "emory usage limit" in str(error) or "too much memory" in str(error):
                raise oversize("it asks for too much memory", self._where) from error
            raise damaged(f"damaged {self._kind} data ({error})", self._where) from error
        if starved and not out and not self._stream.eof:
            raise damaged(f"the {self._kind} data are cut short", self._where)
        return out

    def _begin_again(self) -> None:
        """Go on to what follows a stream: another one, zeros that fill a block, or the end."""
        rest = self._stream.unused_data
        while not rest.strip(b"\0"):
            rest = self._raw.read(_CHUNK)
            if not rest:
                self._ended = True
                return
        rest = rest.lstrip(b"\0")
        self._raw = _Joined(rest, self._raw)
        self._stream = _decompressor(self._kind, self._where)


class _Joined:
    """Some bytes, then the rest of a file."""

    def __init__(self, first: bytes, rest: _Readable) -> None:
        self._first = first
        self._rest = rest

    def read(self, size: int = -1, /) -> bytes:
        if self._first:
            first, self._first = self._first, b""
            return first
        return self._rest.read(size)


def peel(
    file: BinaryIO, where: str, budget: Budget, head_bytes: int
) -> tuple[BinaryIO, bytes, int]:
    """Take every compression off a file.

    Parameters
    ----------
    file : file
        At its start.
    where : str
    budget : Budget
    head_bytes : int
        How many bytes to look at.

    Returns
    -------
    file
        What is inside; `file` itself where nothing is taken off. It stands behind the head.
    bytes
        Its head.
    int
        How many compressions were taken off.
    """
    layers = 0
    head, inside = _head(file, head_bytes)
    while kind := compression(head):
        if layers == MOST_LAYERS:
            raise oversize(f"it is compressed more than {MOST_LAYERS} times", where)
        layers += 1
        raw = _Joined(head, inside)
        inflated = io.BufferedReader(Inflated(raw, kind, where, budget), _CHUNK)
        head, inside = _head(inflated, head_bytes)
    return inside, head, layers


def _head(file: BinaryIO, count: int) -> tuple[bytes, BinaryIO]:
    """Return the first `count` bytes and the file behind them.

    Where the data are damaged behind some bytes, these are returned, so that it can be told what
    the file was to be; the error comes when more is read.
    """
    head = b""
    try:
        while len(head) < count and (some := file.read(min(_STEP, count - len(head)))):
            head += some
    except Damaged as error:
        if not head:
            raise
        return head, io.BufferedReader(_Broken(error))
    return head, file


class _Broken(io.RawIOBase):
    """A file that ends in an error."""

    def __init__(self, error: Damaged) -> None:
        self._error = error

    def readable(self) -> bool:
        return True

    def readinto(self, into: WriteableBuffer) -> int:
        raise self._error


def read_all(file: BinaryIO, head: bytes, where: str, size: int | None = None) -> bytes:
    """Return `head` and everything behind it; Oversize beyond the limit.

    Parameters
    ----------
    file : file
        Behind its head.
    head : bytes
    where : str
    size : int or None
        How many bytes there are, where it is known beforehand; 0 and None where it is not.
    """
    if size and size > MOST_BYTES:
        raise _too_large(where)
    if size:
        data = head + file.read(max(0, size - len(head)))
    else:
        whole = io.BytesIO()
        whole.write(head)
        while whole.tell() <= MOST_BYTES and (chunk := file.read(16 * _CHUNK)):
            whole.write(chunk)
        data = whole.getvalue()
    if len(data) > MOST_BYTES:
        raise _too_large(where)
    return data


def _too_large(where: str) -> Oversize:
    return oversize(
        f"larger than {MOST_BYTES // MIB} MiB", where, "cut out the job that matters and give that"
    )
