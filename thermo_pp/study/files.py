"""Files that a study names: found inside its folders and nowhere else."""

from __future__ import annotations

import os
from pathlib import Path

from thermo_pp.errors import StudyError
from thermo_pp.nearest import suggestion


def inside(outputs: Path, folder: Path, name: str, where: str) -> Path:
    """Return the path of a file; StudyError where it is not there or outside the folders.

    Parameters
    ----------
    outputs : Path
        Folder of the outputs, which names start from.
    folder : Path
        Of the study file.
    name, where : str
    """
    path = outputs / name
    if not any(_plain(path).is_relative_to(_plain(one)) for one in (outputs, folder)):
        raise StudyError(
            f"{name!r} is outside the folder {str(outputs)!r}",
            where=where,
            mend="name a file of that folder, or let `outputs` name the folder it is in",
        )
    if not os.path.isfile(path):  # noqa: PTH113 (a name too long is no file, not an OSError)
        there = sorted(p.name for p in outputs.iterdir() if p.is_file()) if outputs.is_dir() else []
        raise StudyError(
            f"there is no file {str(path)!r}", where=where, mend=suggestion(name, there, "files")
        )
    return path


def _plain(path: Path) -> Path:
    """Return the absolute path without ``..``; links are not followed."""
    return Path(os.path.normpath(path.absolute()))
