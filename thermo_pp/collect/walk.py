"""Walk: the files below some paths in a stable order, and what is left out with the reason."""

from __future__ import annotations

import os
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path

from thermo_pp.errors import StudyError

HIDDEN = "hidden"
LINK_OUT = "a link that leads out of the folder"
LINK_INSIDE = "a link to something that is read where it stands"
LINK_BROKEN = "a link that leads nowhere"
NO_FILE = "neither a file nor a folder"


@dataclass(frozen=True)
class Skipped:
    """A file or folder that was left out.

    Attributes
    ----------
    path : str
        As the user would write it.
    reason : str
        Why it was left out.
    """

    path: str
    reason: str


def walk(paths: Iterable[str | os.PathLike[str]]) -> Iterator[Path | Skipped]:
    """Yield every file below `paths`, and a Skipped for whatever is left out.

    Folders are walked in the order of their names, files and folders mixed; a path given by hand is
    taken even if it is hidden or a link. A file that two of the paths lead to is yielded once.
    Links inside a folder are not followed: what they point to is either read where it stands or
    lies outside.

    Raises
    ------
    StudyError
        A path that is not there.
    """
    seen: set[str] = set()
    given_paths = list(paths)
    for given in given_paths:
        path = Path(given)
        if not path.exists():
            raise StudyError(
                "no such file or folder",
                where=str(path),
                mend="check the name; it is looked for from the folder the program was started in",
            )
        entries = _inside(path, path.resolve()) if path.is_dir() else _single(path)
        for entry in entries:
            if isinstance(entry, Path) and len(given_paths) > 1:
                identity = os.path.realpath(entry)
                if identity in seen:
                    continue
                seen.add(identity)
            yield entry


def _single(path: Path) -> Iterator[Path | Skipped]:
    yield path if path.is_file() else Skipped(str(path), NO_FILE)


def _inside(folder: Path, top: Path) -> Iterator[Path | Skipped]:
    """Yield what lies in `folder`, a folder of the tree `top` (resolved)."""
    try:
        with os.scandir(folder) as scan:
            entries = sorted(scan, key=lambda entry: entry.name)
    except OSError as error:
        yield Skipped(str(folder), f"cannot be opened: {error.strerror or error}")
        return
    for entry in entries:
        path = folder / entry.name
        if entry.name.startswith("."):
            yield Skipped(str(path), HIDDEN)
        elif entry.is_symlink():
            yield Skipped(str(path), _about_link(path, top))
        elif entry.is_dir(follow_symlinks=False):
            yield from _inside(path, top)
        elif entry.is_file(follow_symlinks=False):
            yield path
        else:
            yield Skipped(str(path), NO_FILE)


def _about_link(path: Path, top: Path) -> str:
    try:
        target = path.resolve(strict=True)
    except (OSError, RuntimeError):
        return LINK_BROKEN
    return LINK_INSIDE if target.is_relative_to(top) else LINK_OUT
