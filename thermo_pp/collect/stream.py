"""Stream: outcomes in the order of the files, remembered or read, with a bounded number on their way."""

from __future__ import annotations

import contextlib
import os
from collections import deque
from collections.abc import Callable, Iterable, Iterator
from dataclasses import replace
from itertools import chain
from pathlib import Path

from thermo_pp.collect.answers import Answer, Task
from thermo_pp.collect.codec import CodecError, decode
from thermo_pp.collect.outcome import Outcome, PerFile
from thermo_pp.collect.store import Store, cache_folder
from thermo_pp.collect.walk import Skipped
from thermo_pp.collect.workers import Engine, Processes, Ticket, usable_cores
from thermo_pp.errors import StudyError
from thermo_pp.sources import stamp_of

Progress = Callable[[int], None]
"""Called after each file with the number of files done."""
Cache = bool | str | os.PathLike[str]
"""Whether answers are remembered (in the user's cache folder), or the folder where."""
ON_THEIR_WAY = 64
"""Files on their way for each process: memory does not grow with the folder."""
_CLUSTER_FILES = 4096


@contextlib.contextmanager
def opened_store(cache: Cache) -> Iterator[Store | None]:
    """Give the store of remembered answers, None where none is wanted, and close it whatever happens."""
    if cache is False:
        yield None
        return
    store = Store(cache_folder() if cache is True else Path(cache))
    try:
        yield store
    finally:
        store.close()


def outcomes(
    entries: Iterable[Path | Skipped],
    per_file: PerFile,
    store: Store | None = None,
    *,
    progress: Progress | None = None,
    jobs: int | None = None,
    scheduler: str | None = None,
    seen: Callable[[bytes], object] | None = None,
) -> Iterator[Outcome]:
    """Yield the outcomes of all entries, in their order.

    Parameters
    ----------
    entries : iterable of Path or Skipped
        What `walk` yields.
    per_file : callable
    store : Store or None
        Remembered answers.
    progress : callable or None
    jobs : int or None
        How many processes; all cores unless given.
    scheduler : str or None
        Address of a Dask scheduler.
    seen : callable or None
        Called with the outcomes of each file as bytes.

    Raises
    ------
    StudyError
        Fewer than one process; a cluster that does not answer.
    """
    engine, window = _engine(per_file, jobs, scheduler)
    waiting: deque[Outcome | bytes | Ticket] = deque()
    done = 0
    try:
        for entry in chain(entries, [None]):
            if entry is not None:
                waiting.append(_begun(entry, engine, store))
            while waiting and (_ready(waiting[0]) or len(waiting) > window or entry is None):
                if not _ready(waiting[0]):
                    engine.wait()
                    continue
                first = waiting.popleft()
                if isinstance(first, Outcome):
                    yield first
                    continue
                data = _ended(first, store)
                if seen is not None:
                    seen(data)
                yield from decode(data)
                done += 1
                if progress is not None:
                    progress(done)
    finally:
        engine.close()


def _engine(per_file: PerFile, jobs: int | None, scheduler: str | None) -> tuple[Engine, int]:
    """Return who reads the files, and how many may be on their way."""
    if jobs is not None and jobs < 1:
        raise StudyError(
            f"{jobs} processes cannot read anything", where="jobs", mend="give 1 or more"
        )
    if scheduler is not None:
        from thermo_pp.collect.cluster import Cluster

        return Cluster(per_file, scheduler), _CLUSTER_FILES
    count = usable_cores() if jobs is None else jobs
    return Processes(per_file, count), ON_THEIR_WAY * count


def _begun(entry: Path | Skipped, engine: Engine, store: Store | None) -> Outcome | bytes | Ticket:
    """Return the outcome of what was left out, the remembered ones of a file, or the ticket of one to be read."""
    if isinstance(entry, Skipped):
        return Outcome(entry.path, skipped=entry.reason)
    name, location = str(entry), os.path.abspath(entry)  # noqa: PTH100 - Path.resolve follows links
    known, remembered = None, b""
    found = None if store is None else store.get(location, name)
    if found is not None:
        with contextlib.suppress(CodecError):
            answer = Answer.from_bytes(found)
            if answer.holds_at_a_glance(entry):
                return answer.outcomes
            known, remembered = replace(answer, outcomes=b"").to_bytes(), answer.outcomes
    stamp = stamp_of(entry)
    ticket = Ticket(Task(location, name, known), stamp[0] if stamp else 0, remembered)
    engine.submit(ticket)
    return ticket


def _ready(entry: Outcome | bytes | Ticket) -> bool:
    return not isinstance(entry, Ticket) or entry.answer is not None


def _ended(entry: bytes | Ticket, store: Store | None) -> bytes:
    """Return the outcomes of a file that is ready, as bytes; remember them where they are new."""
    if isinstance(entry, bytes):
        return entry
    answer, task = entry.answer, entry.task
    assert answer is not None
    if not answer.outcomes:
        answer = replace(answer, outcomes=entry.remembered)
    if store is not None and answer.digest is not None:
        store.put(task.location, task.name, answer.to_bytes())
    return answer.outcomes
