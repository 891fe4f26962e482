"""Store: answers that are remembered from one run to the next, in one SQLite file of the user's cache folder.

An answer is found by the version of the program (its own source and what it reads through), the
file's absolute path and the name the user gave it; it holds while file and siblings are what they
were (see `answers`). Every row has a checksum of its own, so damage is read again, never handed on.
Rows are committed in batches: a run that is interrupted leaves what it had, and two runs can share
the file. What cannot be used (no rights, a full disk) is said and then done without.
"""

from __future__ import annotations

import contextlib
import hashlib
import platform
import sqlite3
import time
from collections.abc import Callable
from functools import cache
from pathlib import Path
from typing import TypeVar

import thermo_pp
from thermo_pp.collect.codec import text

FILE = "answers.sqlite"
FORMAT = 1
"""Of the tables; a file of another format is made anew."""
KEPT_DAYS = 90
"""Answers that were not asked for longer are dropped."""
_BUSY_S = 20.0
_BATCH = 200
_COMMIT_EVERY_S = 1.0
_CHECK_BYTES = 16
_THROUGH = ("ase", "numpy", "scipy", "cclib")

Value = TypeVar("Value")


@cache
def version_stamp() -> str:
    """Return the hash of what decides an answer: the package's source and the libraries it reads through."""
    from importlib.metadata import PackageNotFoundError, version

    python = ".".join(platform.python_version_tuple()[:2])
    found = hashlib.sha256(f"{thermo_pp.__version__} {python}".encode())
    top = Path(thermo_pp.__file__).parent
    for path in sorted(top.rglob("*.py")):
        found.update(str(path.relative_to(top)).encode() + b"\0" + path.read_bytes())
    for name in _THROUGH:
        with contextlib.suppress(PackageNotFoundError):
            found.update(f"{name} {version(name)}".encode())
    return found.hexdigest()


def cache_folder() -> Path:
    """Return the program's folder among the user's caches."""
    import platformdirs

    return Path(platformdirs.user_cache_path("thermo_pp"))


class Store:
    """Remembered answers; to be closed.

    Parameters
    ----------
    folder : Path
        It is made where it is not there.

    Attributes
    ----------
    trouble : str or None
        Why answers are not remembered.
    """

    def __init__(self, folder: Path) -> None:
        self.path = folder / FILE
        self.trouble: str | None = None
        self._version = version_stamp()
        self._today = int(time.time() // 86400)
        self._waiting: list[tuple[bytes, str, int, bytes]] = []
        self._used: list[tuple[int, bytes]] = []
        self._committed = time.monotonic()
        self._rebuilt = False
        self._db: sqlite3.Connection | None = None
        try:
            folder.mkdir(parents=True, exist_ok=True, mode=0o700)
        except OSError as error:
            self.trouble = f"{folder} cannot be made: {error.strerror or error}"
            return
        self._try(self._open)

    def get(self, location: str, name: str) -> bytes | None:
        """Return the remembered answer of a file, None where there is none or it is damaged."""
        key = self._key(location, name)
        row = self._try(lambda: self._row(key))
        if row is None:
            return None
        day, record = row
        answer = record[_CHECK_BYTES:]
        if record[:_CHECK_BYTES] != _check(key, answer):
            return None
        if day != self._today:
            self._used.append((self._today, key))
        return answer

    def put(self, location: str, name: str, answer: bytes) -> None:
        """Remember the answer of a file; it is on the disk after the next `commit`."""
        if self._db is None:
            return
        key = self._key(location, name)
        self._waiting.append((key, self._version, self._today, _check(key, answer) + answer))
        late = time.monotonic() - self._committed > _COMMIT_EVERY_S
        if late or len(self._waiting) >= _BATCH:
            self.commit()

    def commit(self) -> None:
        """Write what waits to the disk."""
        self._try(self._write)
        self._waiting.clear()
        self._used.clear()
        self._committed = time.monotonic()

    def close(self) -> None:
        """Write what waits and close the file."""
        if self._db is not None:
            self.commit()
        if self._db is not None:
            with contextlib.suppress(sqlite3.Error):
                self._db.close()
            self._db = None

    def _key(self, location: str, name: str) -> bytes:
        parts = b"\0".join((self._version.encode(), text(location), text(name)))
        return hashlib.blake2b(parts, digest_size=16).digest()

    def _open(self) -> None:
        db = sqlite3.connect(self.path, timeout=_BUSY_S, isolation_level=None)
        self._db = db
        db.execute("PRAGMA journal_mode = TRUNCATE")  # not WAL: home folders lie on network disks
        db.execute("PRAGMA synchronous = NORMAL")
        format_there = db.execute("PRAGMA user_version").fetchone()[0]
        tables = [row[0] for row in db.execute("SELECT name FROM sqlite_master")]
        if tables and format_there != FORMAT:
            raise _OtherFormat
        db.execute("BEGIN IMMEDIATE")
        db.execute(
            "CREATE TABLE IF NOT EXISTS answers (key BLOB PRIMARY KEY, version TEXT NOT NULL,"
            " day INTEGER NOT NULL, record BLOB NOT NULL)"
        )
        db.execute(f"PRAGMA user_version = {FORMAT}")
        db.execute(
            "DELETE FROM answers WHERE version != ? OR day < ?",
            (self._version, self._today - KEPT_DAYS),
        )
        db.execute("COMMIT")

    def _row(self, key: bytes) -> tuple[int, bytes] | None:
        if self._db is None:
            return None
        found = self._db.execute("SELECT day, record FROM answers WHERE key = ?", (key,)).fetchone()
        if found is None or not isinstance(found[1], bytes):
            return None
        return found[0], found[1]

    def _write(self) -> None:
        if self._db is None or not (self._waiting or self._used):
            return
        self._db.execute("BEGIN IMMEDIATE")
        try:
            self._db.executemany(
                "INSERT OR REPLACE INTO answers VALUES (?, ?, ?, ?)", self._waiting
            )
            self._db.executemany("UPDATE answers SET day = ? WHERE key = ?", self._used)
            self._db.execute("COMMIT")
        except BaseException:
            with contextlib.suppress(sqlite3.Error):
                self._db.execute("ROLLBACK")
            raise

    def _try(self, action: Callable[[], Value]) -> Value | None:
        """Return what an action on the file gives; make a damaged file anew, do without one that cannot be used."""
        try:
            return action()
        except sqlite3.Error as error:
            code = getattr(error, "sqlite_errorcode", None)
            if code is not None and code & 0xFF == sqlite3.SQLITE_BUSY:
                return None  # another run writes for long: this batch is not remembered
            damaged = (
                isinstance(error, _OtherFormat)
                or (
                    isinstance(error, sqlite3.DatabaseError)
                    and not isinstance(error, sqlite3.OperationalError)
                )
                or (code is not None and code & 0xFF == sqlite3.SQLITE_CORRUPT)
                or "no such" in str(error)
            )
            if damaged and not self._rebuilt:
                self._rebuilt = True
                self._remove()
                if self._try(self._opened_again):
                    return None
            self._give_up(error)
            return None

    def _opened_again(self) -> bool:
        self._open()
        return True

    def _remove(self) -> None:
        if self._db is not None:
            with contextlib.suppress(sqlite3.Error):
                self._db.close()
            self._db = None
        for ending in ("", "-wal", "-shm", "-journal"):
            with contextlib.suppress(OSError):
                Path(f"{self.path}{ending}").unlink(missing_ok=True)

    def _give_up(self, error: sqlite3.Error) -> None:
        if self._db is not None:
            with contextlib.suppress(sqlite3.Error):
                self._db.close()
            self._db = None
        self.trouble = self.trouble or f"{self.path}: {error}"


class _OtherFormat(sqlite3.DatabaseError):
    """The file is of another version of the program, or not ours."""


def _check(key: bytes, answer: bytes) -> bytes:
    return hashlib.blake2b(answer, digest_size=_CHECK_BYTES, key=key).digest()
