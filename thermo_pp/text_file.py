"""Texts that people write: read whole, as UTF-8."""

from __future__ import annotations

from pathlib import Path

from thermo_pp.errors import StudyError


def read_text(path: Path, file: str, what: str, mend: str) -> str:
    """Return the text of a file, without the mark that some editors put before it.

    Parameters
    ----------
    path : Path
    file : str
        Its name in messages.
    what, mend : str
        What it is ("the study file"), and what to do where it cannot be read.

    Raises
    ------
    StudyError
        It cannot be read, or is not UTF-8; names the line.
    """
    try:
        data = path.read_bytes()
    except OSError as error:
        raise StudyError(
            f"{what} cannot be read: {error.strerror or error}", where=file, mend=mend
        ) from None
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        raise StudyError(
            f"byte 0x{data[error.start]:02x} is not UTF-8",
            where=f"{file}:{line}",
            mend="save the file as UTF-8",
        ) from None
