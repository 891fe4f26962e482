"""Files: the one way an answer is written, under a temporary name first."""

from __future__ import annotations

import os
from pathlib import Path

from thermo_pp.errors import StudyError


def write_file(path: Path, text: str | bytes) -> None:
    """Write a text or bytes to `path`; a reader finds the old answer or the new one, never half of one.

    Raises
    ------
    StudyError
        The file cannot be written.
    """
    data = text if isinstance(text, bytes) else (text + "\n").encode("utf-8", "backslashreplace")
    try:
        target = path.resolve()
        if target.exists() and not target.is_file():
            target.write_bytes(data)  # a pipe or a device, never replaced; a folder is refused here
            return
        temporary = target.with_name(f".{target.name}.{os.getpid()}.part")
        try:
            temporary.write_bytes(data)
            temporary.replace(target)
        finally:
            temporary.unlink(missing_ok=True)
    except OSError as error:
        raise StudyError(
            f"cannot be written: {error.strerror or error}",
            where=str(path),
            mend="choose a folder that exists and that you may write to",
        ) from error
