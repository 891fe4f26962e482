"""Cluster: the same function called for every file by the workers of a running Dask cluster.

Files must lie on a file system that the workers see under the same path. A task whose worker is lost
goes to another one, which Dask sees to; a file that loses several workers is the error of that file.
"""

from __future__ import annotations

import logging
import time
from collections.abc import Sequence
from importlib import import_module
from typing import Any

from thermo_pp.collect.answers import Answer, Task, failure
from thermo_pp.collect.outcome import PerFile
from thermo_pp.collect.store import version_stamp
from thermo_pp.collect.workers import BATCH_BYTES, BATCH_FILES, Ticket, answers
from thermo_pp.errors import StudyError

WHERE = "--scheduler"
CONNECT_S = 15.0
NO_WORKER_S = 60.0
"""How long to wait for a worker while there is none."""
_LOOK_S = 5.0


class Cluster:
    """A running Dask cluster.

    Parameters
    ----------
    per_file : callable
        A function of a module's own level.
    address : str
        Of the scheduler, ``tcp://host:8786``.

    Raises
    ------
    StudyError
        The library is not installed, or nobody answers at that address.
    """

    def __init__(self, per_file: PerFile, address: str) -> None:
        try:
            self._library: Any = import_module("distributed")
        except ImportError as error:
            raise StudyError(
                "the library distributed is not installed",
                where=WHERE,
                mend='pip install "thermo-pp[cluster]"',
            ) from error
        self._per_file = per_file
        self._address = address
        self._todo: list[Ticket] = []
        self._todo_bytes = 0
        self._flying: dict[Any, list[Ticket]] = {}
        self._alone_since: float | None = None
        logging.getLogger("distributed").setLevel(logging.CRITICAL)  # lost workers are expected
        try:
            self._client = self._library.Client(
                address, timeout=CONNECT_S, set_as_default=False, name="thermo_pp"
            )
        except (OSError, ValueError, TimeoutError) as error:
            raise StudyError(
                f"no scheduler answers at {address} ({error})",
                where=WHERE,
                mend="start one with: dask scheduler, and give the address that it prints",
            ) from error

    def submit(self, ticket: Ticket) -> None:
        """Take a task."""
        self._todo.append(ticket)
        self._todo_bytes += ticket.size
        if len(self._todo) >= BATCH_FILES or self._todo_bytes >= BATCH_BYTES:
            self._hand_out(self._todo)
            self._todo, self._todo_bytes = [], 0

    def wait(self) -> None:
        """Wait for a batch."""
        if self._todo:
            self._hand_out(self._todo)
            self._todo, self._todo_bytes = [], 0
        while self._flying:
            try:
                with self._client.as_current():
                    done = self._library.wait(
                        list(self._flying), timeout=_LOOK_S, return_when="FIRST_COMPLETED"
                    ).done
            except TimeoutError:
                self._look()
                continue
            self._alone_since = None
            for future in done:
                self._receive(future)
            return

    def close(self) -> None:
        """Take back what is not answered, and leave."""
        for future in self._flying:
            future.cancel()
        self._flying.clear()
        self._client.close()

    def _hand_out(self, batch: Sequence[Ticket]) -> None:
        tasks = [ticket.task for ticket in batch]
        future = self._client.submit(
            answers_of_version, version_stamp(), self._per_file, tasks, pure=False
        )
        self._flying[future] = list(batch)

    def _receive(self, future: Any) -> None:
        batch = self._flying.pop(future)
        try:
            found = future.result()
        except self._library.KilledWorker as error:
            if len(batch) > 1:
                for ticket in batch:
                    self._hand_out([ticket])
                return
            what = f"every worker that read it was lost ({error.allowed_failures + 1} of them)"
            batch[0].answer = failure(
                batch[0].task, what, "look at the file, and at the memory of the workers"
            )
            return
        except StudyError:
            raise
        except Exception as error:
            raise StudyError(
                f"the cluster at {self._address} failed ({type(error).__name__}: {error})",
                where=WHERE,
                mend="install the same version of thermo-pp on the workers; see their logs",
            ) from error
        for ticket, data in zip(batch, found, strict=True):
            ticket.answer = Answer.from_bytes(data)

    def _look(self) -> None:
        """End the wait where there has been no worker for long."""
        if self._client.scheduler_info(n_workers=-1)["workers"]:
            self._alone_since = None
            return
        now = time.monotonic()
        if self._alone_since is None:
            self._alone_since = now
        if now - self._alone_since > NO_WORKER_S:
            raise StudyError(
                f"the scheduler at {self._address} has no workers",
                where=WHERE,
                mend=f"start some with: dask worker {self._address}",
            )


def answers_of_version(version: str, per_file: PerFile, tasks: Sequence[Task]) -> list[bytes]:
    """Return the answers of files, on a worker; StudyError where it runs another version."""
    if version != version_stamp():
        raise StudyError(
            "a worker of the cluster runs another version of thermo-pp, or of ASE, NumPy or Python",
            where=WHERE,
            mend="install the same versions on all workers as here",
        )
    return answers(per_file, tasks)
