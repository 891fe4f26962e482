"""A running Dask cluster on this computer reads the files: the same bytes as a local run, a lost worker made good."""

from __future__ import annotations

import json
import os
import shutil
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest

import thermo_pp as tp
from thermo_pp.audit import audit_together, read_and_audit_file
from thermo_pp.collect import Outcome, answers, cluster, gather, workers
from thermo_pp.collect.answers import Task
from thermo_pp.collect.codec import decode, encode
from thermo_pp.errors import StudyError

pytest.importorskip("distributed", reason='needs the extra: pip install "thermo-pp[cluster]"')

ROOT = Path(__file__).parents[1]
PSI4 = ROOT / "fixtures" / "psi4" / "good"
COUNT = 40


def wait_for(what: Callable[[], Any], seconds: float = 60.0) -> None:
    end = time.monotonic() + seconds
    while not what():
        assert time.monotonic() < end, "nothing happened"
        time.sleep(0.05)


class Running:
    """A scheduler and workers, each a process of its own."""

    def __init__(self, folder: Path, count: int) -> None:
        self.file = folder / "scheduler.json"
        self.environment = {
            **os.environ,
            "PYTHONPATH": os.pathsep.join([str(ROOT), str(Path(__file__).parent)]),
            "DASK_DISTRIBUTED__WORKER__MEMORY__TERMINATE": "False",
            "DASK_TEMPORARY_DIRECTORY": str(folder),
        }
        self.log = (folder / "log").open("wb")
        common = ["--host", "127.0.0.1"]
        self.processes = [self.start("dask_scheduler", *common, "--port", "0", "--no-dashboard")]
        wait_for(self.file.exists)
        self.address = json.loads(self.file.read_text())["address"]
        self.workers = [
            self.start("dask_worker", *common, "--nthreads", "1", "--no-nanny", "--no-dashboard")
            for _ in range(count)
        ]
        wait_for(lambda: len(self.known()) == count)

    def start(self, program: str, *options: str) -> subprocess.Popen[bytes]:
        command = [sys.executable, "-m", f"distributed.cli.{program}", *options]
        command += ["--scheduler-file", str(self.file)]
        process = subprocess.Popen(
            command, env=self.environment, stdout=self.log, stderr=self.log, cwd=self.file.parent
        )
        self.__dict__.setdefault("started", []).append(process)
        return process

    def known(self) -> Any:
        import distributed

        with distributed.Client(self.address, set_as_default=False, timeout=30) as client:
            return client.scheduler_info(n_workers=-1)["workers"]

    def stop(self) -> None:
        for process in self.__dict__["started"]:
            process.kill()
            process.wait()
        self.log.close()


@pytest.fixture(scope="module")
def two(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Running]:
    """One cluster with two workers; the last test that uses it kills them."""
    running = Running(tmp_path_factory.mktemp("cluster"), 2)
    yield running
    running.stop()


@pytest.fixture
def outputs(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Forty files in a folder that is called by its name alone: the workers run elsewhere."""
    folder = tmp_path / "outputs"
    folder.mkdir()
    paths = sorted(PSI4.glob("*.out"))
    for number in range(COUNT):
        shutil.copy(paths[number % len(paths)], folder / f"{number:02d}.out")
    (folder / "note").write_text("a note")
    monkeypatch.chdir(tmp_path)
    return Path("outputs")


def everything(found: Any) -> bytes:
    rows = [Outcome(one.path, calculation=one) for one in found]
    rows += [Outcome(path, error=error) for path, error in found.failed]
    rows += [Outcome(one.path, skipped=one.reason) for one in found.skipped]
    return encode([*rows, Outcome("findings", findings=found.findings)])


def test_a_cluster_of_another_version_is_refused(
    two: Running, outputs: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(cluster, "version_stamp", lambda: "another")
    with pytest.raises(StudyError, match="runs another version of thermo-pp"):
        tp.collect(outputs, scheduler=two.address, cache=False)


def test_a_file_that_kills_its_workers_is_the_error_of_that_file(
    two: Running, monkeypatch: pytest.MonkeyPatch
) -> None:
    from distributed import KilledWorker

    class Lost:
        def result(self) -> None:
            raise KilledWorker("task", None, 3)

        def cancel(self) -> None:
            pass

    reader = cluster.Cluster(read_and_audit_file, two.address)
    handed_out: list[list[workers.Ticket]] = []
    monkeypatch.setattr(reader, "_hand_out", handed_out.append)
    tickets = [workers.Ticket(Task(f"/x/{number}", str(number))) for number in range(2)]
    reader._flying = {(both := Lost()): tickets, (one := Lost()): tickets[:1]}
    reader._receive(both)
    assert handed_out == [[ticket] for ticket in tickets]  # each once more, alone
    assert [ticket.answer for ticket in tickets] == [None, None]
    reader._receive(one)
    reader.close()
    assert tickets[0].answer is not None
    (outcome,) = decode(tickets[0].answer.outcomes)
    assert outcome.error is not None
    assert outcome.error.what == "every worker that read it was lost (4 of them)"


def slowly(*arguments: Any) -> Any:
    """Read as always, after a while."""
    time.sleep(0.1)
    return read_and_audit_file(*arguments)


def test_a_cluster_gives_the_same_though_a_worker_is_killed(
    two: Running, outputs: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    local = everything(tp.collect(outputs, jobs=1, cache=False))
    assert everything(tp.collect(outputs, scheduler=two.address, cache=False)) == local

    monkeypatch.setattr(cluster, "BATCH_FILES", 2)
    seen: list[int] = []

    def progress(done: int) -> None:
        seen.append(done)
        if len(seen) == 4:
            two.workers[0].kill()

    found = gather(
        outputs,
        slowly,
        audit_together,
        scheduler=two.address,
        cache=tmp_path / "cache",
        progress=progress,
    )
    assert two.workers[0].wait() != 0
    assert everything(found) == local
    assert seen == list(range(1, COUNT + 2))
    assert len(two.known()) == 1
    two.workers[1].kill()
    wait_for(lambda: not two.known())
    monkeypatch.setattr(answers, "SETTLED_NS", 0)  # the files are not two seconds old
    again = tp.collect(outputs, scheduler=two.address, cache=tmp_path / "cache")
    assert everything(again) == local  # what was remembered needs no worker
    monkeypatch.setattr(cluster, "NO_WORKER_S", 0.5)
    monkeypatch.setattr(cluster, "_LOOK_S", 0.2)
    with pytest.raises(StudyError, match="has no workers"):
        tp.collect(outputs, scheduler=two.address, cache=False)


def test_nobody_answers(monkeypatch: pytest.MonkeyPatch, outputs: Path) -> None:
    monkeypatch.setattr(cluster, "CONNECT_S", 0.5)
    for address in ("tcp://127.0.0.1:9", "nonsense://x"):
        with pytest.raises(StudyError, match="no scheduler answers at"):
            tp.collect(outputs, scheduler=address, cache=False)


def test_without_the_library(monkeypatch: pytest.MonkeyPatch, outputs: Path) -> None:
    monkeypatch.setitem(sys.modules, "distributed", None)
    with pytest.raises(StudyError, match="distributed is not installed") as caught:
        tp.collect(outputs, scheduler="tcp://127.0.0.1:8786", cache=False)
    assert "thermo-pp[cluster]" in caught.value.mend


def test_either_processes_or_a_cluster(outputs: Path) -> None:
    from click.testing import CliRunner

    from thermo_pp.cli import main

    run = CliRunner().invoke(main, ["survey", str(outputs), "--jobs", "2", "--scheduler", "x"])
    assert run.exit_code == 2
    assert workers.BATCH_FILES == 8
