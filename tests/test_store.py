"""Remembered answers: when they hold, that they are never wrong, damage, two runs at once, interruption."""

from __future__ import annotations

import gzip
import json
import os
import shutil
import signal
import sqlite3
import subprocess
import sys
import time
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any

import pytest

import thermo_pp as tp
from thermo_pp import audit
from thermo_pp.collect import Outcome, answers, gather, store
from thermo_pp.collect.codec import CodecError
from thermo_pp.collect.store import FILE, Store, cache_folder
from thermo_pp.errors import Finding
from thermo_pp.records import Calculation
from thermo_pp.sources import Looked, Piece, pieces

FIXTURES = Path(__file__).parents[1] / "fixtures"
OUTPUT = FIXTURES / "psi4" / "good" / "water_hf_energy.out"


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """Five files whose siblings are looked for; one sibling is there, one compressed."""
    top = tmp_path / "top"
    top.mkdir()
    for number in range(5):
        (top / f"{number}.out").write_text(f"file {number}")
    (top / "0.out.beside").write_text("zero")
    (top / "1.out.beside.gz").write_bytes(gzip.compress(b"one"))
    return top


class Reader:
    """Reads a file and a file beside it; counts how often."""

    def __init__(self) -> None:
        self.read: list[str] = []

    def __call__(self, path: Path, name: str, looked: Looked) -> Sequence[Outcome]:
        if ".beside" in path.name:
            return ()
        self.read.append(path.name)
        inside = pieces(path, name, looked)
        piece = next(inside)
        assert isinstance(piece, Piece)
        source = piece.source()
        beside = source.sibling(path.name + ".beside")
        text = source.data + (b" beside " + beside.data if beside else b"")
        return [Outcome(name, reader="test", skipped=text.decode())]


def together(calculations: tuple[Calculation, ...]) -> tuple[Finding, ...]:
    return ()


def run(folder: Path, cache: Path, *, settle: bool = True) -> tuple[list[str], list[str]]:
    """Collect; return what the files say and which were read. Files count as long unchanged, unless told."""
    reader = Reader()
    found = gather(folder, reader, together, jobs=1, cache=cache)
    if settle:
        make_settled(cache)
    return [one.reason for one in found.skipped], reader.read


def make_settled(cache: Path) -> None:
    """Let all answers be a minute younger than the files that they rest on."""
    with sqlite3.connect(cache / FILE) as db:
        for key, record in db.execute("SELECT key, record FROM answers").fetchall():
            try:
                kept = answers.Answer.from_bytes(record[16:])
            except CodecError:
                continue  # that of the audit side by side
            later = answers.Answer(
                kept.outcomes,
                kept.seen_ns + 60 * 10**9,
                kept.stamp,
                kept.digest,
                kept.whole,
                kept.siblings,
            ).to_bytes()
            db.execute(
                "UPDATE answers SET record = ? WHERE key = ?",
                (store._check(key, later) + later, key),
            )


ALL = ["0.out", "1.out", "2.out", "3.out", "4.out"]
SAID = ["file 0 beside zero", "file 1 beside one", "file 2", "file 3", "file 4"]


def test_an_unchanged_file_is_not_read_again(folder: Path, tmp_path: Path) -> None:
    cache = tmp_path / "cache"
    assert run(folder, cache) == (SAID, ALL)
    assert run(folder, cache) == (SAID, [])


def test_nothing_is_hashed_where_size_and_times_are_the_same(
    folder: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    run(folder, tmp_path / "cache")
    monkeypatch.setattr(answers, "file_digest", lambda path, whole=True: pytest.fail("hashed"))
    assert run(folder, tmp_path / "cache") == (SAID, [])


def test_a_touched_file_is_hashed_and_not_read(folder: Path, tmp_path: Path) -> None:
    run(folder, tmp_path / "cache")
    for path in folder.iterdir():
        os.utime(path)
    assert run(folder, tmp_path / "cache") == (SAID, [])


@pytest.mark.parametrize(("age_s", "seen"), [(0, True), (60, False)])
def test_a_file_changed_just_before_it_was_read_is_hashed(
    folder: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, age_s: int, seen: bool
) -> None:
    """Two changes within one tick of the clock leave the same times."""
    tick = time.time_ns() - age_s * 10**9
    monkeypatch.setattr(answers, "stamp_of", lambda path: (6, tick, tick))
    for path in folder.glob("*.beside*"):
        path.unlink()
    run(folder, tmp_path / "cache", settle=False)
    (folder / "3.out").write_text("file X")
    said, read = run(folder, tmp_path / "cache", settle=False)
    assert (said[3], read) == (("file X", ["3.out"]) if seen else ("file 3", []))


def test_a_changed_digit_with_the_old_size_and_time_is_seen(folder: Path, tmp_path: Path) -> None:
    cache = tmp_path / "cache"
    run(folder, cache)
    path = folder / "3.out"
    times = path.stat()
    path.write_text("file 8")
    os.utime(path, ns=(times.st_atime_ns, times.st_mtime_ns))  # the time of the entry tells
    said, read = run(folder, cache)
    assert (said[3], read) == ("file 8", ["3.out"])


def changed(folder: Path) -> None:
    (folder / "0.out.beside").write_text("null")


def compressed_changed(folder: Path) -> None:
    (folder / "1.out.beside.gz").write_bytes(gzip.compress(b"eins"))


def plain_before_compressed(folder: Path) -> None:
    (folder / "1.out.beside").write_text("plain")


def came(folder: Path) -> None:
    (folder / "2.out.beside").write_text("new")


def compressed_came(folder: Path) -> None:
    (folder / "2.out.beside.xz").write_bytes(gzip.compress(b"new"))


def went(folder: Path) -> None:
    (folder / "0.out.beside").unlink()


@pytest.mark.parametrize(
    ("change", "number", "text"),
    [
        (changed, 0, "file 0 beside null"),
        (compressed_changed, 1, "file 1 beside eins"),
        (plain_before_compressed, 1, "file 1 beside plain"),
        (came, 2, "file 2 beside new"),
        (compressed_came, 2, "file 2 beside new"),
        (went, 0, "file 0"),
    ],
)
@pytest.mark.parametrize("settle", [True, False])
def test_siblings_that_change_come_and_go(
    folder: Path,
    tmp_path: Path,
    change: Callable[[Path], None],
    number: int,
    text: str,
    settle: bool,
) -> None:
    run(folder, tmp_path / "cache", settle=settle)
    change(folder)
    said, read = run(folder, tmp_path / "cache")
    assert said == [*SAID[:number], text, *SAID[number + 1 :]]
    assert read == [f"{number}.out"]


def test_another_version_reads_again(
    folder: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    cache = tmp_path / "cache"
    run(folder, cache)
    monkeypatch.setattr(store, "version_stamp", lambda: "another")
    assert run(folder, cache) == (SAID, ALL)
    with sqlite3.connect(cache / FILE) as db:  # and the old answers are gone
        assert db.execute("SELECT DISTINCT version FROM answers").fetchall() == [("another",)]


def test_the_version_is_that_of_the_source(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    package = tmp_path / "thermo_pp"
    shutil.copytree(Path(tp.__file__).parent, package, ignore=shutil.ignore_patterns("__pycache__"))
    stamps = set()
    monkeypatch.setattr(tp, "__file__", str(package / "__init__.py"))
    for _ in range(2):
        store.version_stamp.cache_clear()
        stamps.add(store.version_stamp())
    assert len(stamps) == 1
    reader = package / "readers" / "psi4" / "__init__.py"
    reader.write_text(reader.read_text() + "# changed\n")
    store.version_stamp.cache_clear()
    stamps.add(store.version_stamp())
    store.version_stamp.cache_clear()
    assert len(stamps) == 2


def test_a_file_called_by_another_name_is_named_so(
    folder: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(folder.parent)
    for _ in range(2):
        for path in (folder, folder.name):
            found = gather(path, Reader(), together, jobs=1, cache=tmp_path / "cache")
            assert found.skipped[0].path == str(Path(path) / "0.out")


def test_another_folder_of_the_same_name_is_another(
    folder: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(folder.parent)
    gather("top", Reader(), together, jobs=1, cache=tmp_path / "cache")
    other = tmp_path / "other" / "top"
    other.mkdir(parents=True)
    (other / "0.out").write_text("other!")
    monkeypatch.chdir(other.parent)
    found = gather("top", Reader(), together, jobs=1, cache=tmp_path / "cache")
    assert [one.reason for one in found.skipped] == ["other!"]


# -- damage


def overwrite(path: Path) -> None:
    path.write_bytes(b"no data base " * 1000)


def cut(path: Path) -> None:
    path.write_bytes(path.read_bytes()[:5000])


def empty(path: Path) -> None:
    path.write_bytes(b"")


def older(path: Path) -> None:
    with sqlite3.connect(path) as db:
        db.execute("PRAGMA user_version = 0")


def other_tables(path: Path) -> None:
    path.unlink()
    with sqlite3.connect(path) as db:
        db.execute("CREATE TABLE answers (something TEXT)")
        db.execute(f"PRAGMA user_version = {store.FORMAT}")


@pytest.mark.parametrize("damage", [overwrite, cut, empty, older, other_tables])
def test_a_damaged_cache_is_made_anew(
    folder: Path, tmp_path: Path, damage: Callable[[Path], None]
) -> None:
    cache = tmp_path / "cache"
    run(folder, cache)
    damage(cache / FILE)
    reader = Reader()
    found = gather(folder, reader, together, jobs=1, cache=cache)
    assert reader.read == ALL
    assert [one.reason for one in found.skipped] == SAID
    assert found.findings == ()
    make_settled(cache)
    assert run(folder, cache) == (SAID, [])


def test_no_flipped_byte_is_handed_on(tmp_path: Path) -> None:
    top, cache = tmp_path / "top", tmp_path / "cache"
    top.mkdir()
    shutil.copy(OUTPUT, top / "x.out")
    wanted = tp.read(top / "x.out")
    tp.collect(top, cache=cache)
    whole = (cache / FILE).read_bytes()
    for place in range(0, len(whole), len(whole) // 150):
        data = bytearray(whole)
        data[place] ^= 0x04
        (cache / FILE).write_bytes(data)
        (found,) = tp.collect(top, cache=cache)
        assert found.energy_hartree == wanted.energy_hartree
        assert found.positions_angstrom.tobytes() == wanted.positions_angstrom.tobytes()
        assert (found.path, found.sha256, dict(found.where)) == (
            wanted.path,
            wanted.sha256,
            dict(wanted.where),
        )


def test_a_forged_answer_executes_nothing(folder: Path, tmp_path: Path) -> None:
    """A pickle in the place of an answer, with the right checksum, is no answer."""
    import pickle

    cache = tmp_path / "cache"
    run(folder, cache)
    forged = pickle.dumps(Path("x"))
    with sqlite3.connect(cache / FILE) as db:
        for (key,) in db.execute("SELECT key FROM answers").fetchall():
            db.execute(
                "UPDATE answers SET record = ? WHERE key = ?",
                (store._check(key, forged) + forged, key),
            )
    assert run(folder, cache) == (SAID, ALL)


def test_without_a_place_to_write_it_goes_on_and_says_so(folder: Path, tmp_path: Path) -> None:
    blocked = tmp_path / "file"
    blocked.touch()
    found = gather(folder, Reader(), together, jobs=1, cache=blocked / "cache")
    assert [one.reason for one in found.skipped] == SAID
    (finding,) = found.findings
    assert (finding.code, finding.severity) == ("not-remembered", "note")
    assert str(blocked) in finding.what


def test_no_cache_leaves_no_trace(
    folder: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path / "home"))
    gather(folder, Reader(), together, jobs=1, cache=False)
    assert not (tmp_path / "home").exists()
    gather(folder, Reader(), together, jobs=1)
    if sys.platform == "linux":
        assert cache_folder() == tmp_path / "home" / "thermo_pp"
    assert (cache_folder() / FILE).exists()


# -- the audit


def test_the_audit_side_by_side_is_remembered(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    top, cache = tmp_path / "top", tmp_path / "cache"
    top.mkdir()
    for name in "ab":
        shutil.copy(OUTPUT, top / name)
    first = tp.collect(top, cache=cache)
    assert "duplicate-structure" in [finding.code for finding in first.findings]
    monkeypatch.setattr(audit, "audit_together", lambda calculations: pytest.fail("audited again"))
    assert tp.collect(top, cache=cache).findings == first.findings
    monkeypatch.undo()
    (top / "b").unlink()
    assert "duplicate-structure" not in [
        each.code for each in tp.collect(top, cache=cache).findings
    ]


# -- two runs, and runs that are interrupted


def test_two_stores_share_a_file(tmp_path: Path) -> None:
    one, two = Store(tmp_path), Store(tmp_path)
    for number in range(500):
        (one, two)[number % 2].put("place", str(number), b"answer %d" % number)
    one.commit()
    assert two.get("place", "0") == b"answer 0"
    two.close()
    assert one.get("place", "499") == b"answer 499"
    one.close()
    assert (one.trouble, two.trouble) == (None, None)


def test_a_file_that_another_run_holds_is_waited_for_and_then_left(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(store, "_BUSY_S", 0.05)
    one = Store(tmp_path)
    one.put("place", "kept", b"answer")
    one.commit()
    with sqlite3.connect(tmp_path / FILE, isolation_level=None) as other:
        other.execute("BEGIN EXCLUSIVE")
        one.put("place", "lost", b"answer")
        one.commit()
        assert one.get("place", "kept") is None
        other.execute("COMMIT")
    assert one.get("place", "kept") == b"answer"
    assert one.trouble is None
    one.close()


def test_two_programs_at_once(tmp_path: Path) -> None:
    top = tmp_path / "top"
    top.mkdir()
    for number, path in enumerate(sorted((FIXTURES / "psi4" / "good").glob("*.out"))[:14]):
        shutil.copy(path, top / f"{number:02d}.out")
    environment = {**os.environ, "XDG_CACHE_HOME": str(tmp_path / "cache")}
    command = [sys.executable, "-m", "thermo_pp", "survey", str(top), "--format", "json", "--quiet"]
    programs = [
        subprocess.Popen(command, env=environment, stdout=subprocess.PIPE, stderr=subprocess.PIPE)
        for _ in range(2)
    ]
    said = [program.communicate(timeout=120) for program in programs]
    assert [program.returncode for program in programs] == [0, 0], said
    without = subprocess.run(
        [*command, "--no-cache"], env=environment, capture_output=True, check=True
    )
    assert said[0][0] == said[1][0] == without.stdout
    assert len(json.loads(without.stdout)["files"]) == 14


@pytest.mark.parametrize("how", [signal.SIGINT, signal.SIGKILL])
def test_an_interrupted_run_is_gone_on_with(
    tmp_path: Path, how: signal.Signals, monkeypatch: pytest.MonkeyPatch
) -> None:
    top, cache, log = tmp_path / "top", tmp_path / "cache", tmp_path / "log"
    top.mkdir()
    for number in range(40):
        (top / f"{number:02d}.out").write_text(f"file {number}")
    code = f"""
import sys, time
sys.path.insert(0, {str(Path(__file__).parent)!r})
import test_store as t
from thermo_pp.collect import gather, store, workers
from pathlib import Path
workers.FEW_FILES = 4
store._BATCH = 5
class Slow(t.Reader):
    def __call__(self, path, name, looked):
        try:
            time.sleep(0.05)
        except KeyboardInterrupt:
            Path({str(log)!r} + ".interrupted").touch()
        with open({str(log)!r}, "a") as file:
            file.write(path.name + "\\n")
        return super().__call__(path, name, looked)
gather(Path({str(top)!r}), Slow(), t.together, jobs=2, cache=Path({str(cache)!r}))
"""
    program = subprocess.Popen(
        [sys.executable, "-c", code], stderr=subprocess.PIPE, text=True, start_new_session=True
    )
    end = time.monotonic() + 60.0
    while not log.exists() or len(log.read_text().split()) < 20:
        assert time.monotonic() < end
        assert program.poll() is None, program.stderr and program.stderr.read()
        time.sleep(0.01)
    if how == signal.SIGINT:  # a terminal sends it to the program and its workers
        os.killpg(program.pid, how)
    else:
        program.send_signal(how)
    _, errors = program.communicate(timeout=60)
    assert program.returncode == -how
    if how == signal.SIGINT:
        assert errors.count("Traceback") == 1  # that of the program, none of its workers
        assert not Path(f"{log}.interrupted").exists()
    before = set(log.read_text().split())
    assert len(before) < 40
    reader = Reader()
    found = gather(top, reader, together, jobs=1, cache=cache)
    assert [one.reason for one in found.skipped] == [f"file {number}" for number in range(40)]
    assert len(reader.read) <= (30 if how == signal.SIGINT else 35)
    assert not found.findings


def test_old_answers_are_dropped(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def at(day: int) -> Store:
        monkeypatch.setattr(store.time, "time", lambda: day * 86400.0)
        return Store(tmp_path)

    one = at(1000)
    for name in ("used", "left"):
        one.put("place", name, b"answer")
    one.close()
    two = at(1050)
    assert two.get("place", "used") == b"answer"
    two.close()
    three = at(1001 + store.KEPT_DAYS)
    assert three.get("place", "used") == b"answer"
    assert three.get("place", "left") is None
    three.close()


def test_the_same_json_from_the_command_line(tmp_path: Path, monkeypatch: Any) -> None:
    from click.testing import CliRunner

    from thermo_pp.cli import main

    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path))
    arguments = ["survey", str(FIXTURES / "qcschema"), "--format", "json", "--quiet"]
    said = [
        CliRunner().invoke(main, [*arguments, *options]).stdout
        for options in (["--no-cache", "--jobs", "1"], ["--jobs", "2"], [], ["--jobs", "1"])
    ]
    assert json.loads(said[0])["files"]
    assert len(set(said)) == 1
