"""Sources: plain, compressed and archived files and their siblings, all read in one way."""

from __future__ import annotations

from thermo_pp.sources.disk import LeftOut, open_source, pieces
from thermo_pp.sources.limits import Damaged, Oversize
from thermo_pp.sources.source import (
    HEAD_BYTES,
    Looked,
    Piece,
    Source,
    Stamp,
    file_digest,
    is_own_file,
    stamp_of,
)

__all__ = [
    "HEAD_BYTES",
    "Damaged",
    "LeftOut",
    "Looked",
    "Oversize",
    "Piece",
    "Source",
    "Stamp",
    "file_digest",
    "is_own_file",
    "open_source",
    "pieces",
    "stamp_of",
]
