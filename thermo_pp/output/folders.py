"""Folders: a whole folder takes the place of an older one at once, or not at all.

The new folder is filled under another name beside the old one and everything in it is brought to
the disk; then the two exchange their names. On Linux the kernel does that in one step. Where it
cannot (another system, some network file systems), the old folder is moved away and the new one
moved in, and a journal says so meanwhile: between the two moves there is no folder under the name,
and the next run finishes what was begun. What a killed run leaves is removed by the next one.
"""

from __future__ import annotations

import ctypes
import errno
import json
import os
import re
import secrets
import shutil
import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

from thermo_pp.errors import StudyError

_PART = "thermo-pp-part"
_AWAY = "thermo-pp-old"
_JOURNAL = "thermo-pp-exchange.json"
_AT_FDCWD = -100
_EXCHANGE = 2
_NOT_OFFERED = frozenset({errno.ENOSYS, errno.EINVAL, errno.EOPNOTSUPP, errno.ENOTSUP, errno.EPERM})
_MEND = "choose a folder in one that exists and that you may write to"


@contextmanager
def whole_folder(path: Path, check: Callable[[Path], None]) -> Iterator[Path]:
    """Give an empty folder to fill; when all went well it takes the place of `path`.

    Parameters
    ----------
    path : Path
        It need not exist; the folder that it is in must.
    check : callable
        Called with the folder there is, at the start and before it is replaced: raises StudyError
        where it must stay. Not called where there is none or an empty one.

    Raises
    ------
    StudyError
        The folder is a file, cannot be written, or must stay. An exception of the caller's passes
        through, and `path` stays as it was.
    """
    with _told(path):
        target = path.resolve()
        if not target.name:
            raise StudyError("is no name for a folder", where=str(path), mend=_MEND)
        _finish(target)
        _check(target, path, check)
        part, lock = _begin(target)
    try:
        yield part
        with _told(path):
            _to_disk(part)
            _check(target, path, check)
            _commit(part, target)
    finally:
        shutil.rmtree(part, ignore_errors=True)
        if lock is not None:
            os.close(lock)


@contextmanager
def _told(path: Path) -> Iterator[None]:
    """Turn what the system says into an error with a mend."""
    try:
        yield
    except OSError as error:
        raise StudyError(
            f"cannot be written: {error.strerror or error}", where=str(path), mend=_MEND
        ) from error


def _check(target: Path, path: Path, check: Callable[[Path], None]) -> None:
    if not target.exists():
        return
    if not target.is_dir():
        raise StudyError(
            "is a file, not a folder", where=str(path), mend="choose another name for the folder"
        )
    if any(target.iterdir()):
        check(target)


def _begin(target: Path) -> tuple[Path, int | None]:
    """Make the folder to fill; it stays locked as long as this process lives."""
    part = target.with_name(f".{target.name}.{secrets.token_hex(8)}.{_PART}")
    part.mkdir()
    return part, _lock(part)


def _lock(folder: Path) -> int | None:
    """Lock a folder and return its descriptor; None where that is not offered or it is locked."""
    if sys.platform == "win32":
        return None
    import fcntl

    descriptor = os.open(folder, os.O_RDONLY)
    try:
        fcntl.flock(descriptor, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except OSError:
        os.close(descriptor)
        return None
    return descriptor


def _commit(part: Path, target: Path) -> None:
    """Put the new folder in the place of the old one."""
    if not target.exists():
        part.rename(target)
    elif not _exchanged(part, target):
        _moved(part, target)
    _sync(target.parent)


def _exchanged(part: Path, target: Path) -> bool:
    """Exchange two names in one step; False where the system does not offer that."""
    if sys.platform != "linux":
        return False
    try:
        renameat2 = ctypes.CDLL(None, use_errno=True).renameat2
    except (OSError, AttributeError):
        return False
    names = (os.fsencode(part), os.fsencode(target))
    if renameat2(_AT_FDCWD, names[0], _AT_FDCWD, names[1], _EXCHANGE) == 0:
        return True
    number = ctypes.get_errno()
    if number in _NOT_OFFERED:
        return False
    raise OSError(number, os.strerror(number), str(target))


def _moved(part: Path, target: Path) -> None:
    """Move the old folder away and the new one in, with a journal for whoever comes after a kill."""
    away = part.with_suffix(f".{_AWAY}")
    journal = _journal(target)
    draft = part.with_suffix(".thermo-pp-journal")
    draft.write_text(json.dumps({"new": part.name, "old": away.name}), encoding="utf-8")
    _sync(draft)
    draft.replace(journal)
    _sync(target.parent)
    target.rename(away)
    try:
        part.rename(target)
    except OSError:
        away.rename(target)
        journal.unlink()
        raise
    _sync(target.parent)
    journal.unlink()
    shutil.rmtree(away, ignore_errors=True)


def _finish(target: Path) -> None:
    """Finish or undo what a killed run began, and remove what it left."""
    journal = _journal(target)
    if journal.is_file():
        names = json.loads(journal.read_text(encoding="utf-8"))
        new, old = (target.with_name(Path(names[key]).name) for key in ("new", "old"))
        if not target.exists():
            (new if new.is_dir() else old).rename(target)
            _sync(target.parent)
        journal.unlink()
    ours = re.compile(
        rf"\.{re.escape(target.name)}\.[0-9a-f]{{16}}\.({_PART}|{_AWAY}|thermo-pp-journal)"
    )
    for entry in sorted(target.parent.iterdir()):
        if not ours.fullmatch(entry.name):
            continue
        if not entry.is_dir():
            entry.unlink(missing_ok=True)
            continue
        with suppress(FileNotFoundError):
            lock = _lock(entry)
            if lock is not None or sys.platform == "win32":  # no other run is filling it
                shutil.rmtree(entry, ignore_errors=True)
            if lock is not None:
                os.close(lock)


def _journal(target: Path) -> Path:
    return target.with_name(f".{target.name}.{_JOURNAL}")


def _to_disk(folder: Path) -> None:
    """Bring every file and folder to the disk, the innermost first."""
    for root, _, files in os.walk(folder, topdown=False):
        for name in files:
            _sync(Path(root, name))
        _sync(Path(root))


def _sync(path: Path) -> None:
    if sys.platform == "win32" and path.is_dir():
        return  # folders cannot be opened there
    descriptor = os.open(path, os.O_RDWR if sys.platform == "win32" else os.O_RDONLY)
    try:
        os.fsync(descriptor)
    except OSError as error:
        if error.errno != errno.EINVAL:  # some file systems offer none for folders
            raise
    finally:
        os.close(descriptor)
