"""Workers: the same function called for every file, by this process or by several.

The function and what it answers are handed in, so this module knows no format and no audit. Tasks go
out in small batches, so many at a time that nobody waits; answers come back as bytes. A process that
dies takes no other file with it: its file is tried once more, then it is the error of that file.
"""

from __future__ import annotations

import contextlib
import gc
import multiprocessing
import os
import signal
import sys
from collections import deque
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cache
from multiprocessing.connection import Connection, wait
from typing import TYPE_CHECKING, Any, Protocol

from thermo_pp.collect.answers import Answer, Task, answer, failure
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
_TRIES = 2


@dataclass(eq=False)
class Ticket:
    """One task on its way.

    Attributes
    ----------
    task : Task
    size : int
        Of the file, bytes.
    answer : Answer or None
        What came back.
    tries : int
    """

    task: Task
    size: int = 0
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
        if not self._todo or min(worker.batches() for worker in self._workers) >= AHEAD:
            return
        flying = sum(ticket.size for worker in self._workers for ticket in worker.tickets)
        for ahead in range(AHEAD):
            for worker in self._workers:
                if worker.batches() > ahead or not self._todo:
                    continue
                if flying and flying + self._todo[0].size > IN_FLIGHT_BYTES:
                    return
                batch = self._batch()
                flying += sum(ticket.size for ticket in batch)
                worker.tickets += batch
                with contextlib.suppress(OSError):  # it has died: `_receive` sees that
                    worker.connection.send([ticket.task for ticket in batch])

    def _batch(self) -> list[Ticket]:
        batch: list[Ticket] = []
        size = 0
        while self._todo and len(batch) < BATCH_FILES and size < BATCH_BYTES:
            ticket = self._todo.popleft()
            batch.append(ticket)
            size += ticket.size
        self._todo_bytes = max(0, self._todo_bytes - size)
        return batch

    def _receive(self, worker: _Worker) -> None:
        """Take the answers that are there, one at least; where the process has died, start another."""
        try:
            more = True
            while more:
                data = worker.connection.recv_bytes()
                worker.tickets.popleft().answer = Answer.from_bytes(data)
                more = worker.connection.poll()
        except (EOFError, OSError):
            self._replace(worker)

    def _replace(self, worker: _Worker) -> None:
        worker.connection.close()
        worker.process.join()
        code = worker.process.exitcode
        worker.process.close()
        self._workers.remove(worker)
        again = list(worker.tickets)
        if again:
            first = again[0]
            first.tries += 1
            if first.tries >= _TRIES:
                del again[0]
                what = f"the process that read it died ({_how_it_ended(code)})"
                first.answer = failure(
                    first.task, what, "look at the file, and at the memory that is free"
                )
            self._todo.extendleft(reversed(again))
        if again or not self._workers:
            self._start()


@dataclass(eq=False)
class _Worker:
    process: Any
    connection: Connection[Any, Any]
    tickets: deque[Ticket]

    def batches(self) -> int:
        return -(-len(self.tickets) // BATCH_FILES)


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
    ) in inherited:  # with them open, this process would not see that the asking one is gone
        other.close()
    gc.freeze()  # what was there before is not to be looked through, nor its pages to be copied
    with one_thread(), contextlib.suppress(EOFError, OSError):
        while True:
            for task in connection.recv():
                connection.send_bytes(answer(per_file, task).to_bytes())


def _how_it_ended(code: int | None) -> str:
    if code is not None and code < 0:
        with contextlib.suppress(ValueError):
            return signal.Signals(-code).name
    return f"exit status {code}"
