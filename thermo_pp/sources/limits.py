"""Limits: how much a compressed file or an archive may hold before it is left out as it stands."""

from __future__ import annotations

from thermo_pp.errors import ReadError

MIB = 2**20
MOST_BYTES = 512 * MIB
"""A file that is larger than this, as it stands or decompressed, is not read."""
FREE_BYTES = 32 * MIB
"""So much may be decompressed whatever the size of the compressed file."""
MOST_TIMES = 250
"""Beyond that, a compressed file may hold at most so many times its own size."""
MOST_TIMES_ARCHIVE = 1000
"""An archive may hold so many times its own size: files that are alike compress well together."""
MOST_MEMBERS = 100_000
"""Members of one archive, those of archives inside it counted."""
MOST_LAYERS = 3
"""Compressions around one file, and archives inside each other."""
MOST_SPOOLED = 16 * 1024 * MIB
"""Temporary disk space for the tar file inside a compressed one."""
XZ_MEMORY = 256 * MIB
"""What an .xz file may ask for; ``xz -9`` needs 65 MiB."""

_BOMB = "decompress it by hand if you trust it"


class Oversize(ReadError):
    """A file beyond a limit: it is left out, whatever it may be."""


class Damaged(ReadError):
    """Compressed data or an archive that cannot be unpacked."""


def oversize(what: str, where: str, mend: str = _BOMB) -> Oversize:
    """Return the error that `where` is beyond a limit."""
    return Oversize(what, where=where, mend=mend)


def damaged(what: str, where: str) -> Damaged:
    """Return the error that `where` cannot be unpacked."""
    return Damaged(what, where=where, mend="compress it again or copy it again")


class Budget:
    """How much may still come out of one file on the disk.

    Parameters
    ----------
    size : int
        The file's own size in bytes.
    where : str
        The file's name.
    """

    def __init__(self, size: int, where: str) -> None:
        self.size = size
        self.where = where
        self.times = MOST_TIMES
        self.spent = 0
        self.members = 0
        self.exhausted = False

    def spend(self, count: int) -> None:
        """Count `count` decompressed bytes; Oversize where there are too many."""
        self.spent += count
        if self.spent > FREE_BYTES + self.times * self.size:
            self.exhausted = True
            raise oversize(f"it holds more than {self.times} times its own size", self.where)

    def member(self) -> None:
        """Count one member of an archive; Oversize where there are too many."""
        self.members += 1
        if self.members > MOST_MEMBERS:
            self.exhausted = True
            raise oversize(f"it holds more than {MOST_MEMBERS} files", self.where)
