"""Where bytes come from: a file with a name, its bytes, its hash and its siblings."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path

from thermo_pp.errors import ReadError

HEAD_BYTES = 65536
"""How much of a file a reader may look at to tell whether it is its own."""


@dataclass(frozen=True)
class Source:
    """One file in memory.

    Attributes
    ----------
    name : str
        The path as the user gave it; it stands in every message.
    data : bytes
    folder : Path or None
        Where siblings are looked for; None for bytes that come from nowhere.
    """

    name: str
    data: bytes = field(repr=False)
    folder: Path | None = None

    @cached_property
    def sha256(self) -> str:
        """Hash of the bytes, hexadecimal."""
        return hashlib.sha256(self.data).hexdigest()

    @property
    def head(self) -> bytes:
        """The first 64 KiB."""
        return self.data[:HEAD_BYTES]

    def sibling(self, name: str) -> Source | None:
        """Return the file `name` of the same folder, None where there is none."""
        if self.folder is None or Path(name).name != name:
            return None
        path = self.folder / name
        return open_source(path) if path.is_file() else None


def open_source(path: Path, name: str | None = None) -> Source:
    """Read a file into a Source called `name` (its path unless given); ReadError where it cannot be read."""
    shown = str(path) if name is None else name
    try:
        data = path.read_bytes()
    except OSError as error:
        reason = error.strerror or str(error)
        raise ReadError(
            f"cannot be read: {reason}", where=shown, mend="check the name and the permissions"
        ) from error
    return Source(name=shown, data=data, folder=path.parent)
