"""Workers: the same function called for every file, by this process or by several.

The function and what it answers are handed in, so this module knows no format and no audit. Tasks go
out in small batches, so many at a time that nobody waits; the answers of a batch come back together, as
bytes. A process that dies takes no other file with it: the files of its batch are tried once more, each
alone, and one with which a process dies again is the error of that file.

What is sent out is small (a task has no outcomes), so the asking process never waits for one that itself
waits to be listened to.
"""

from __future__ import annotations

import contextlib
import gc
import multiprocessing
import os
import signal
import sys
import time
from collections import deque
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cache
from itertools import chain
from multiprocessing.connection import Connection, wait
from typing import TYPE_CHECKING, Any, Protocol

from thermo_pp.collect.answers import Answer, Task, answer, failure
from thermo_pp.collect.codec import pack, unpack
from thermo_pp.collect.outcome import PerFile

if TYPE_CHECKING:
    from threadpoolctl import ThreadpoolController

BATCH_FILES = 8
BATCH_BYTES = 2 * 2**20
"""A batch is handed out when it has so many files or bytes."""
FEW_FILES = 12
FEW_BYTES = 4 * 2**20
"""So few files are read at once by this process: starting others would take longer."""
AHEAD = 2
"""Batches that each process has, the one it works on included."""
IN_FLIGHT_BYTES = 2**30
"""Files read at one time are not larger together, unless a single one is."""
COLLECT_EVERY = 50_000
"""Objects: so seldom looks Python for lost ones where answers come in, all of which are kept."""
ANSWER_EVERY_S = 0.2
"""A process sends what it has when so much time has passed, else when its batch is done."""
_TRIES = 2


@dataclass(eq=False)
class Ticket:
    """One task on its way.

    Attributes
    ----------
    task : Task
    size : int
        Of the file, bytes.
    remembered : bytes
        The outcomes that hold if the task's remembered answer does.
    answer : Answer or None
        What came back.
    tries : int
        With how many processes that died it may have been read.
    """

    task: Task
    size: int = 0
    remembered: bytes = b""
    answer: Answer | None = None
    tries: int = 0


class Engine(Protocol):
    """Whoever calls the function for each file."""

    def submit(self, ticket: Ticket) -> None:
        """Take a task; it may be answered at once or later."""

    def wait(self) -> None:
        """Return when some more tickets are answered than before."""

    def close(self) -> None:
        """Stop, whatever is not answered."""


def usable_cores() -> int:
    """Return how many cores this process may use."""
    try:
        return len(os.sched_getaffinity(0))
    except AttributeError:  # not on this system
        return os.cpu_count() or 1


@cache
def _controller() -> ThreadpoolController:
    import scipy.linalg  # noqa: F401 - its libraries must be there to be found
    from threadpoolctl import ThreadpoolController

    return ThreadpoolController()


@contextlib.contextmanager
def one_thread() -> Iterator[None]:
    """Keep linear algebra to one thread: the last digits must not depend on the number of cores."""
    with _controller().limit(limits=1):
        yield


class Processes:
    """Worker processes of this computer, started when there is enough to do.

    Parameters
    ----------
    per_file : callable
    jobs : int
        1: everything is done by this process.
    """

    def __init__(self, per_file: PerFile, jobs: int) -> None:
        self._per_file = per_file
        alone = multiprocessing.current_process().daemon  # may not have children of its own
        self._jobs = 1 if alone else jobs
        self._todo: deque[Ticket] = deque()
        self._todo_bytes = 0
        self._workers: list[_Worker] = []
        self._collections = gc.get_threshold()
        method = "fork" if sys.platform == "linux" else "spawn"
        self._context = multiprocessing.get_context(method)

    def submit(self, ticket: Ticket) -> None:
        """Take a task; start processes when there are more than a few."""
        if self._jobs == 1:
            self._answer_here(ticket)
            return
        self._todo.append(ticket)
        self._todo_bytes += ticket.size
        many = len(self._todo) > FEW_FILES or self._todo_bytes > FEW_BYTES
        if not self._workers and many:
            _controller()  # loaded once, before the processes part
            for _ in range(self._jobs):
                self._start()
            if 0 < self._collections[0] < COLLECT_EVERY:
                gc.set_threshold(COLLECT_EVERY, *self._collections[1:])
        if self._workers and (len(self._todo) >= BATCH_FILES or self._todo_bytes >= BATCH_BYTES):
            self._hand_out()

    def wait(self) -> None:
        """Wait for a process; without any, do what there is."""
        if not self._workers:
            while self._todo:
                self._answer_here(self._todo.popleft())
            self._todo_bytes = 0
            return
        self._hand_out()
        by_connection = {worker.connection: worker for worker in self._workers}
        for connection in wait(list(by_connection)):
            self._receive(by_connection[connection])  # type: ignore[index]
        self._hand_out()

    def close(self) -> None:
        """End the processes."""
        for worker in self._workers:
            worker.connection.close()
            worker.process.terminate()
        for worker in self._workers:
            worker.process.join(5.0)
            if worker.process.is_alive():
                worker.process.kill()
                worker.process.join()
            worker.process.close()
        if self._workers:
            gc.set_threshold(*self._collections)
        self._workers.clear()

    def _answer_here(self, ticket: Ticket) -> None:
        with one_thread():
            ticket.answer = answer(self._per_file, ticket.task)

    def _start(self) -> None:
        mine, theirs = self._context.Pipe()
        inherited = [worker.connection for worker in self._workers] + [mine]
        process = self._context.Process(  # type: ignore[attr-defined]
            target=_work,
            args=(
                theirs,
                inherited if self._context.get_start_method() == "fork" else [],
                self._per_file,
            ),
            daemon=True,
        )
        process.start()
        theirs.close()
        self._workers.append(_Worker(process, mine, deque()))

    def _hand_out(self) -> None:
        """Give batches to the processes that have too few."""
        if not self._todo or min(len(worker.batches) for worker in self._workers) >= AHEAD:
            return
        flying = sum(ticket.size for worker in self._workers for ticket in worker.tickets())
        for ahead in range(AHEAD):
            for worker in self._workers:
                if len(worker.batches) > ahead or not self._todo:
                    continue
                if flying and flying + self._todo[0].size > IN_FLIGHT_BYTES:
                    return
                batch = self._batch()
                flying += sum(ticket.size for ticket in batch)
                worker.batches.append(batch)
                with contextlib.suppress(OSError):  # it has died: `_receive` sees that
                    worker.connection.send([ticket.task for ticket in batch])

    def _batch(self) -> deque[Ticket]:
        """Take the next batch; a file with which a process has died goes alone."""
        batch: deque[Ticket] = deque()
        size = 0
        while self._todo and len(batch) < BATCH_FILES and size < BATCH_BYTES:
            alone = self._todo[0].tries > 0
            if alone and batch:
                break
            batch.append(self._todo.popleft())
            size += batch[-1].size
            if alone:
                break
        self._todo_bytes = max(0, self._todo_bytes - size)
        return batch

    def _receive(self, worker: _Worker) -> None:
        """Take some answers; where the process has died, start another."""
        try:
            data = worker.connection.recv_bytes()
        except (EOFError, OSError):
            self._replace(worker)
            return
        for each in unpack(data):
            worker.batches[0].popleft().answer = Answer.from_bytes(each)
        if not worker.batches[0]:
            worker.batches.popleft()

    def _replace(self, worker: _Worker) -> None:
        worker.connection.close()
        worker.process.join()
        code = worker.process.exitcode
        worker.process.close()
        self._workers.remove(worker)
        again = list(worker.tickets())
        suspects = worker.batches[0] if worker.batches else ()
        for ticket in suspects:
            ticket.tries += 1
        if len(suspects) == 1 and again[0].tries >= _TRIES:
            ticket = again.pop(0)
            what = f"the process that read it died ({_how_it_ended(code)})"
            ticket.answer = failure(
                ticket.task, what, "look at the file, and at the memory that is free"
            )
        self._todo.extendleft(reversed(again))
        self._todo_bytes += sum(ticket.size for ticket in again)
        if again or not self._workers:
            self._start()


@dataclass(eq=False)
class _Worker:
    """A process, and the batches that it has not answered, in the order in which it takes them."""

    process: Any
    connection: Connection[Any, Any]
    batches: deque[deque[Ticket]]

    def tickets(self) -> Iterator[Ticket]:
        return chain.from_iterable(self.batches)


def answers(per_file: PerFile, tasks: Sequence[Task]) -> list[bytes]:
    """Return the answer of each file, as bytes."""
    with one_thread():
        return [answer(per_file, task).to_bytes() for task in tasks]


def _work(
    connection: Connection[Any, Any], inherited: Sequence[Connection[Any, Any]], per_file: PerFile
) -> None:
    """Answer tasks until nobody is there to ask."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)  # the asking process ends this one
    for (
        other
    ) in inherited:  # left open, they would hide from this process that the asking one is gone
        other.close()
    gc.freeze()  # what was there before is not to be looked through, nor its pages to be copied
    with one_thread(), contextlib.suppress(EOFError, OSError):
        while True:
            found, since = [], time.monotonic()
            for task in connection.recv():
                found.append(answer(per_file, task).to_bytes())
                if time.monotonic() - since > ANSWER_EVERY_S:
                    connection.send_bytes(pack(found))
                    found, since = [], time.monotonic()
            if found:
                connection.send_bytes(pack(found))


def _how_it_ended(code: int | None) -> str:
    if code is not None and code < 0:
        with contextlib.suppress(ValueError):
            return signal.Signals(-code).name
    return f"exit status {code}"
