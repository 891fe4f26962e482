"""Collecting: which files are walked, in which order, what is left out and why; by one process and by several."""

from __future__ import annotations

import contextlib
import os
import shutil
import signal
import subprocess
import sys
import time
from collections.abc import Callable, Sequence
from dataclasses import fields, replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import thermo_pp as tp
from thermo_pp.audit.limit import time_limit
from thermo_pp.collect import Collection, Outcome, Skipped, gather, stream, workers
from thermo_pp.collect.answers import UNKNOWN, Answer, Task, answer
from thermo_pp.collect.codec import CLASSES, CodecError, decode, encode
from thermo_pp.collect.stream import opened_store, outcomes
from thermo_pp.collect.walk import HIDDEN, LINK_BROKEN, LINK_INSIDE, LINK_OUT, NO_FILE, walk
from thermo_pp.errors import Finding, ReadError, StudyError
from thermo_pp.records import Calculation, Printed
from thermo_pp.sources import Looked, Oversize, file_digest, pieces

FIXTURES = Path(__file__).parents[1] / "fixtures"
PSI4 = FIXTURES / "psi4" / "good"


@pytest.fixture
def tree(tmp_path: Path) -> Path:
    """Folders and files in an order that is not that of their making."""
    top = tmp_path / "top"
    for name in ("c.out", "a/2.out", "a/1.out", "b.out", ".hidden", ".git/config", "d/deep/x.out"):
        path = top / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(name)
    return top


def files(*paths: Path) -> list[str]:
    return [str(entry) for entry in walk(paths) if isinstance(entry, Path)]


def left_out(*paths: Path) -> dict[str, str]:
    return {entry.path: entry.reason for entry in walk(paths) if isinstance(entry, Skipped)}


def test_order_is_by_name_files_and_folders_mixed(tree: Path) -> None:
    names = [os.path.relpath(path, tree) for path in files(tree)]
    assert names == ["a/1.out", "a/2.out", "b.out", "c.out", "d/deep/x.out"]


def test_given_paths_keep_their_order_and_come_once(tree: Path) -> None:
    found = files(tree / "c.out", tree / "a", tree / "a" / "1.out", tree / "a")
    assert [Path(path).name for path in found] == ["c.out", "1.out", "2.out"]


def test_hidden_ones_are_left_out_and_a_hidden_folder_counts_once(tree: Path) -> None:
    assert left_out(tree) == {str(tree / ".hidden"): HIDDEN, str(tree / ".git"): HIDDEN}


def test_a_hidden_file_given_by_hand_is_taken(tree: Path) -> None:
    assert files(tree / ".hidden") == [str(tree / ".hidden")]


def test_links_are_not_followed(tree: Path, tmp_path: Path) -> None:
    outside = tmp_path / "outside"
    outside.mkdir()
    (outside / "secret.out").write_text("x")
    links = {
        "out-folder": (outside, LINK_OUT),
        "out-file": (outside / "secret.out", LINK_OUT),
        "loop": (tree, LINK_INSIDE),
        "again.out": (tree / "b.out", LINK_INSIDE),
        "broken": (tree / "nowhere", LINK_BROKEN),
    }
    before = files(tree)
    for name, (target, _) in links.items():
        (tree / "a" / name).symlink_to(target)
    assert files(tree) == before
    reasons = left_out(tree)
    for name, (_, reason) in links.items():
        assert reasons[str(tree / "a" / name)] == reason


def test_a_link_given_by_hand_is_followed(tree: Path, tmp_path: Path) -> None:
    link = tmp_path / "link"
    link.symlink_to(tree)
    assert len(files(link)) == 5


def test_what_is_neither_file_nor_folder_is_not_opened(tree: Path) -> None:
    os.mkfifo(tree / "a" / "pipe")
    assert left_out(tree)[str(tree / "a" / "pipe")] == NO_FILE
    assert left_out(tree / "a" / "pipe") == {str(tree / "a" / "pipe"): NO_FILE}


def test_missing_path(tree: Path) -> None:
    with pytest.raises(StudyError, match="no such file or folder") as caught:
        list(walk([tree / "absent"]))
    assert caught.value.where == str(tree / "absent")


def test_a_folder_that_cannot_be_opened_ends_nothing(
    tree: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    scan = os.scandir

    def refuse(path: Path) -> object:
        if Path(path).name == "a":
            raise PermissionError(13, "Permission denied")
        return scan(path)

    monkeypatch.setattr(os, "scandir", refuse)
    assert [Path(path).name for path in files(tree)] == ["b.out", "c.out", "x.out"]
    assert left_out(tree)[str(tree / "a")] == "cannot be opened: Permission denied"


def named(path: Path, name: str, looked: Looked) -> tuple[Outcome, ...]:
    """Say of each file what it holds in its first line."""
    inside = pieces(path, name, looked)
    piece = next(inside)
    text = piece.source().data.decode()  # type: ignore[union-attr]
    return (Outcome(name, reader="test", skipped=text),)


def test_progress_counts_files_only(tree: Path) -> None:
    seen: list[int] = []
    answers = list(outcomes(walk([tree]), named, progress=seen.append))
    assert seen == [1, 2, 3, 4, 5]
    assert [one.skipped for one in answers if one.reader is None] == [HIDDEN, HIDDEN]


def calculation(path: Path) -> Calculation:
    return Calculation(
        path=str(path),
        sha256="0" * 64,
        program="test",
        numbers=[1],  # type: ignore[arg-type]
        positions_angstrom=[[0.0, 0.0, 0.0]],  # type: ignore[arg-type]
        masses_u=[1.00782503223],  # type: ignore[arg-type]
        masses_origin="derived",
        hessian_hartree_bohr2=[[0.0] * 3] * 3,  # type: ignore[arg-type]
    )


def test_gather_sorts_outcomes_and_drops_hessians(tree: Path) -> None:
    def note(code: str, path: str | None) -> Finding:
        return Finding(code, "note", path, None, "what", "mend")

    def per_file(path: Path, name: str, looked: Looked) -> Sequence[Outcome]:
        if path.name == "b.out":
            error = ReadError("cut", where=name, mend="rerun")
            return [Outcome(name, reader="test", error=error)]
        if path.name == "c.out":
            return [Outcome(name, skipped="binary")]
        findings = (note("alone", name),)
        return [Outcome(name, reader="test", calculation=calculation(path), findings=findings)]

    def together(calculations: tuple[Calculation, ...]) -> tuple[Finding, ...]:
        return (note(f"together-{len(calculations)}", None),)

    found = gather(tree, per_file, together, cache=False)
    assert isinstance(found, Collection)
    assert [Path(one.path).name for one in found] == ["1.out", "2.out", "x.out"]
    assert len(found) == 3
    assert found[0].hessian_hartree_bohr2 is None
    assert [finding.code for finding in found.findings] == ["alone"] * 3 + ["together-3"]
    assert [Path(path).name for path, _ in found.failed] == ["b.out"]
    assert Skipped(str(tree / "c.out"), "binary") in found.skipped
    table = found.table()
    assert list(table["path"]) == [one.path for one in found]
    assert list(table["formula"]) == ["H"] * 3
    assert found._repr_html_().count("<tr") == 4
    assert list(found.readers) == [
        str(tree / name) for name in ("a/1.out", "a/2.out", "b.out", "d/deep/x.out")
    ]


# -- outcomes as bytes


def collected(paths: Any, **options: Any) -> bytes:
    """Everything that a collection has, as bytes."""
    found = tp.collect(paths, **options)
    rows = [Outcome(one.path, calculation=one) for one in found]
    rows += [Outcome(path, error=error) for path, error in found.failed]
    rows += [Outcome(one.path, skipped=one.reason) for one in found.skipped]
    rows += [Outcome(path, reader) for path, reader in found.readers.items()]
    return encode([*rows, Outcome("findings", findings=found.findings)])


def same(one: Any, two: Any) -> bool:
    """Whether two values are the same bit for bit."""
    if isinstance(one, np.ndarray):
        return (
            isinstance(two, np.ndarray)
            and (one.dtype, one.shape) == (two.dtype, two.shape)
            and one.tobytes() == two.tobytes()
            and not two.flags.writeable
        )
    if type(one) in CLASSES:
        return type(two) is type(one) and all(
            same(getattr(one, each.name), getattr(two, each.name)) for each in fields(one)
        )
    if isinstance(one, tuple):
        return len(one) == len(two) and all(map(same, one, two))
    if isinstance(one, ReadError):
        return type(one) is type(two) and str(one) == str(two)
    if hasattr(one, "items"):
        return list(one) == list(two) and all(same(one[key], two[key]) for key in one)
    return type(one) is type(two) and repr(one) == repr(two)


@pytest.mark.parametrize("program", ["psi4", "nwchem", "qcschema", "ase"])
def test_calculations_survive_as_bytes(program: str) -> None:
    paths = [
        path for path in sorted((FIXTURES / program / "good").iterdir()) if path.suffix != ".toml"
    ]
    assert paths
    for path in paths:
        plain = replace(tp.read(path), hessian_hartree_bohr2=None)
        outcome = Outcome(str(path), program, plain, findings=plain.findings)
        (back,) = decode(encode([outcome]))
        assert same(outcome, back), path


def test_odd_values_survive_as_bytes() -> None:
    strange = replace(
        calculation(Path("caf\udce9/\ud800.out")),
        energy_hartree=np.float64(-0.1) * 3,
        positions_angstrom=np.array([[-0.0, 5e-324, 1.7976931348623157e308]]),
        wavenumbers_cm=np.empty(0),
        modes=np.empty((0, 1, 3)),
        printed={"zero_point": Printed("1.0D-03", "kcal/mol", 7)},
        where={"energy_hartree": 2**40},
        optimised=np.bool_(True),  # type: ignore[arg-type]
    )
    error = Oversize("large", where="x\udcff", mend="cut")
    (back, failed) = decode(encode([Outcome("x", "test", strange), Outcome("y", error=error)]))
    assert back.calculation is not None
    assert same(
        replace(
            strange, hessian_hartree_bohr2=None, energy_hartree=float(-0.1 * 3), optimised=True
        ),
        back.calculation,
    )
    assert same(error, failed.error)


def test_hessians_are_left_out() -> None:
    (back,) = decode(encode([Outcome("x", calculation=calculation(Path("x")))]))
    assert back.calculation is not None
    assert back.calculation.hessian_hartree_bohr2 is None


def test_what_is_no_outcome_is_refused() -> None:
    good = encode([Outcome("x", calculation=calculation(Path("x")))])
    for data in (
        b"",
        b"\xc1",
        good[:-1],
        good + b"x",
        b"\x80",
        b"\x91\x01",
        b"\x82\x00\x7f\x01\x90",
    ):
        with pytest.raises(CodecError):
            decode(data)
    with pytest.raises(TypeError, match="PosixPath cannot be remembered"):
        encode([Outcome(Path("/x"))])  # type: ignore[arg-type]


# -- several processes


@pytest.fixture
def many(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Sixty files, enough for processes to be started; every tenth is empty."""
    monkeypatch.setattr(workers, "FEW_FILES", 4)
    folder = tmp_path / "many"
    folder.mkdir()
    for number in range(60):
        (folder / f"{number:02d}.out").write_text(f"file {number}" if number % 10 else "")
    return folder


def slowly(path: Path, name: str, looked: Looked) -> Sequence[Outcome]:
    """Answer the first files last."""
    time.sleep(0.03 if int(path.stem) % 8 == 0 else 0.0)
    return (Outcome(name, reader=str(os.getpid()), skipped=path.read_text()),)


@pytest.mark.parametrize("jobs", [1, 2, 5])
def test_order_does_not_depend_on_who_is_first(many: Path, jobs: int) -> None:
    seen: list[int] = []
    found = list(outcomes(walk([many]), slowly, jobs=jobs, progress=seen.append))
    assert [Path(one.path).name for one in found] == [f"{number:02d}.out" for number in range(60)]
    assert [one.skipped for one in found] == [
        f"file {number}" if number % 10 else "" for number in range(60)
    ]
    assert seen == list(range(1, 61))
    processes = {one.reader for one in found}
    assert len(processes) == jobs
    assert (str(os.getpid()) in processes) == (jobs == 1)


def test_few_files_are_read_here(many: Path) -> None:
    few = [many / f"{number:02d}.out" for number in range(4)]
    found = list(outcomes(walk(few), slowly, jobs=2))
    assert {one.reader for one in found} == {str(os.getpid())}


@pytest.mark.parametrize("jobs", [0, -1])
def test_fewer_than_one_process(many: Path, jobs: int) -> None:
    with pytest.raises(StudyError, match="cannot read anything"):
        tp.collect(many, jobs=jobs, cache=False)


def test_the_same_from_one_process_and_from_several(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(workers, "FEW_FILES", 4)
    for number, path in enumerate(sorted(PSI4.glob("*.out"))[:30]):
        shutil.copy(path, tmp_path / f"{number:02d}.out")
    one, two = (collected(tmp_path, jobs=jobs, cache=False) for jobs in (1, 2))
    assert one == two


def dying(path: Path, name: str, looked: Looked) -> Sequence[Outcome]:
    if path.stem in ("07", "31"):
        os.kill(os.getpid(), signal.SIGKILL)
    if path.stem == "20":
        raise IndexError("list index out of range")
    return (Outcome(name, reader="test", skipped="good"),)


def test_a_process_that_dies_takes_only_its_file_with_it(many: Path) -> None:
    found = {Path(one.path).stem: one for one in outcomes(walk([many]), dying, jobs=2)}
    assert len(found) == 60
    for stem in ("07", "31"):
        error = found.pop(stem).error
        assert error is not None
        assert error.what == "the process that read it died (SIGKILL)"
    failed = found.pop("20")
    assert failed.reader == UNKNOWN
    assert failed.error is not None
    assert failed.error.what == "the reader failed on it (IndexError: list index out of range)"
    assert {one.skipped for one in found.values()} == {"good"}


def dying_in_a_batch(path: Path, name: str, looked: Looked) -> Sequence[Outcome]:
    """Leave a mark for each try of a file."""
    (path.parent.parent / f"{path.stem}-{os.getpid()}").touch()
    return dying(path, name, looked)


def test_files_are_tried_again_one_by_one_where_a_process_dies(many: Path) -> None:
    list(outcomes(walk([many]), dying_in_a_batch, jobs=2))
    tried = [path.stem.partition("-")[0] for path in many.parent.iterdir() if "-" in path.stem]
    assert tried.count("07") == tried.count("31") == 2
    assert max(tried.count(f"{number:02d}") for number in range(60)) == 2


LONG = "x" * 1_000_000


def long(path: Path, name: str, looked: Looked) -> Sequence[Outcome]:
    """Answer with more than fits between two processes that do not listen to each other."""
    looked.at_whole(file_digest(path))
    return (Outcome(name, reader=str(os.getpid()), skipped=LONG),)


def test_long_answers_that_still_hold(many: Path, tmp_path: Path) -> None:
    found = []
    for _ in range(2):
        with opened_store(tmp_path / "cache") as store, time_limit(30.0):
            found.append(list(outcomes(walk([many]), long, store, jobs=2)))
        for path in many.iterdir():
            os.utime(path)  # the bytes are the same: the files are looked at, not read again
    assert found[0] == found[1]
    assert found[0][59].skipped == LONG


def test_files_on_their_way_are_bounded(many: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(stream, "ON_THEIR_WAY", 5)
    taken: list[Path | Skipped] = []

    def entries() -> Any:
        for entry in walk([many]):
            taken.append(entry)
            yield entry

    found = outcomes(entries(), slowly, jobs=2)
    for number, _ in enumerate(found, start=1):
        assert len(taken) <= number + 10 + 1


def test_no_process_is_left(many: Path) -> None:
    def children() -> str:
        return Path(f"/proc/self/task/{os.getpid()}/children").read_text()

    before = children()
    found = outcomes(walk([many]), slowly, jobs=3)
    next(found)
    assert children() != before
    found.close()  # type: ignore[attr-defined]
    assert children() == before


def wait_for(what: Callable[[], Any], seconds: float = 30.0) -> None:
    end = time.monotonic() + seconds
    while not what():
        assert time.monotonic() < end, "nothing happened"
        time.sleep(0.02)


def test_workers_end_when_the_program_is_killed(many: Path, tmp_path: Path) -> None:
    pids = tmp_path / "pids"
    pids.mkdir()
    code = f"""
import os, sys, time
from pathlib import Path
from thermo_pp.collect import workers
from thermo_pp.collect.stream import opened_store, outcomes
workers.FEW_FILES = 4
def per_file(path, name, looked):
    Path({str(pids)!r}, str(os.getpid())).touch()
    time.sleep(0.2)
    return ()
list(outcomes(map(Path, {[str(path) for path in sorted(many.iterdir())]!r}), per_file, jobs=2))
"""
    program = subprocess.Popen([sys.executable, "-c", code])
    wait_for(lambda: len(list(pids.iterdir())) == 2)
    program.kill()
    program.wait()
    for path in pids.iterdir():
        wait_for(lambda pid=path.name: not running(int(pid)))


def running(pid: int) -> bool:
    try:
        return Path(f"/proc/{pid}/stat").read_text().rsplit(")")[1].split()[0] not in "ZX"
    except OSError:
        return False


# -- what an answer rests on


def test_an_answer_is_not_remembered_where_the_file_changed_while_it_was_read(
    tmp_path: Path,
) -> None:
    path = tmp_path / "x"
    path.write_text("1")

    def per_file(path: Path, name: str, looked: Looked) -> Sequence[Outcome]:
        found = named(path, name, looked)
        path.write_text("12")
        return found

    changed = answer(per_file, Task(str(path), "x"))
    assert changed.digest is None
    assert answer(named, Task(str(path), "x")).digest is not None


def test_answers_as_bytes(tmp_path: Path) -> None:
    path = tmp_path / "x"
    path.write_text("1")
    found = answer(named, Task(str(path), "x"))
    assert Answer.from_bytes(found.to_bytes()) == found
    with pytest.raises(CodecError):
        Answer.from_bytes(found.to_bytes()[:-1])
    with pytest.raises(CodecError):
        Answer.from_bytes(b"\x91\x01")


# -- archives and compressed files in a folder


def test_archives_and_compressed_files_in_a_folder(tmp_path: Path) -> None:
    import gzip
    import tarfile

    source = (PSI4 / "water_hf_energy.out").read_bytes()
    (tmp_path / "b.out.gz").write_bytes(gzip.compress(source))
    (tmp_path / "c.out").write_bytes(source)
    (tmp_path / "note.out").write_bytes(source)
    with tarfile.open(tmp_path / "a.tar.gz", "w:gz") as archive:
        archive.add(tmp_path / "c.out", "runs/x.out")
        archive.add(tmp_path / "c.out", ".hidden")
    (tmp_path / "note.out").write_text("a note")
    found = tp.collect(tmp_path, cache=False)
    names = [str(tmp_path / name) for name in ("a.tar.gz!/runs/x.out", "b.out.gz", "c.out")]
    assert [one.path for one in found] == names
    assert len({one.energy_hartree for one in found}) == 1
    assert {one.path: one.reason for one in found.skipped} == {
        str(tmp_path / "a.tar.gz!/.hidden"): HIDDEN,
        str(tmp_path / "note.out"): "no reader claims it",
    }
    assert [
        finding.what.split(",")[0]
        for finding in found.findings
        if finding.code == "duplicate-structure"
    ] == [f"the same file as {names[0]}"] * 2


# -- a limit to the time


@pytest.mark.skipif(not hasattr(signal, "setitimer"), reason="no timer on this system")
@pytest.mark.parametrize("jobs", [1, 2])
def test_an_output_that_takes_too_long_is_given_up(
    jobs: int, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    from thermo_pp import audit

    for number in range(14):  # more than are read without other processes
        shutil.copy(PSI4 / "water_hf_energy.out", tmp_path / f"{number:02d}.out")

    def read_claimed(source: Any, readers: Any) -> Any:
        while source.name.endswith("03.out"):
            with contextlib.suppress(Exception):  # as readers of libraries do
                time.sleep(0.01)
        return original(source, readers)

    original = audit.read_claimed
    monkeypatch.setattr(audit, "read_claimed", read_claimed)  # processes are forked on Linux
    if jobs > 1 and sys.platform != "linux":
        pytest.skip("other processes are not forked here")
    cache = tmp_path / ".cache"
    found = tp.collect(tmp_path, jobs=jobs, cache=cache, time_limit=2.5)
    ((path, error),) = found.failed
    assert path.endswith("03.out")
    assert error.what == "reading it took too long, more than 2.5 s"
    assert len(found) == 13
    monkeypatch.setattr(audit, "read_claimed", original)
    again = tp.collect(tmp_path, jobs=1, cache=cache, time_limit=2.5)
    assert len(again) == 14  # what took too long is not remembered


def test_a_time_limit_must_be_above_nothing(tmp_path: Path) -> None:
    with pytest.raises(StudyError, match="a time limit of 0 s"):
        tp.collect(tmp_path, time_limit=0)


def test_a_timer_of_somebody_else_is_left_alone() -> None:
    from thermo_pp.audit.limit import time_limit

    if not hasattr(signal, "setitimer"):
        pytest.skip("no timer on this system")
    before = signal.signal(signal.SIGALRM, lambda *_: None)
    try:
        signal.setitimer(signal.ITIMER_REAL, 100.0)
        with time_limit(1e-3):
            time.sleep(0.01)
        assert signal.getitimer(signal.ITIMER_REAL)[0] > 90.0
    finally:
        signal.setitimer(signal.ITIMER_REAL, 0.0)
        signal.signal(signal.SIGALRM, before)
