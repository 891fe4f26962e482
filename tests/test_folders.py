"""Folders: replaced whole or not at all, whenever the process is killed; leftovers go."""

from __future__ import annotations

import ctypes
import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

from thermo_pp.errors import StudyError
from thermo_pp.output import folders
from thermo_pp.output.folders import whole_folder

OLD = {"a.txt": "old", "deep/b.txt": "old", "gone.txt": "old"}
NEW = {"a.txt": "new", "deep/b.txt": "new", "deep/er/c.txt": "new"}


def fill(folder: Path, files: dict[str, str]) -> None:
    for name, text in files.items():
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(text, encoding="utf-8")


def held(folder: Path) -> dict[str, str] | None:
    if not folder.exists():
        return None
    return {
        path.relative_to(folder).as_posix(): path.read_text(encoding="utf-8")
        for path in folder.rglob("*")
        if path.is_file()
    }


def keep(_: Path) -> None:
    """Any folder may be replaced."""


def refuse(folder: Path) -> None:
    raise StudyError("must stay", where=str(folder), mend="leave it")


@pytest.fixture(params=["exchange", "journal"])
def way(request: pytest.FixtureRequest, monkeypatch: pytest.MonkeyPatch) -> str:
    if request.param == "journal":
        monkeypatch.setattr(folders, "_exchanged", lambda part, target: False)
    elif sys.platform != "linux":
        pytest.skip("names are exchanged in one step on Linux only")
    return str(request.param)


@pytest.mark.usefixtures("way")
def test_a_new_folder_takes_the_place_of_the_old(tmp_path: Path) -> None:
    target = tmp_path / "out"
    for files in (OLD, NEW):
        with whole_folder(target, keep) as part:
            fill(part, files)
        assert held(target) == files
    assert [entry.name for entry in tmp_path.iterdir()] == ["out"]


@pytest.mark.usefixtures("way")
def test_an_exception_leaves_the_old_folder_and_nothing_else(tmp_path: Path) -> None:
    target = tmp_path / "out"
    fill(target, OLD)

    def broken() -> None:
        with whole_folder(target, keep) as part:
            fill(part, NEW)
            raise KeyError("in the middle")

    with pytest.raises(KeyError, match="in the middle"):
        broken()
    assert held(target) == OLD
    assert [entry.name for entry in tmp_path.iterdir()] == ["out"]


def test_names_are_exchanged_by_the_kernel_here(tmp_path: Path) -> None:
    """The other way is for other systems; if this fails, the tests above say less than they seem to."""
    if sys.platform != "linux" or not hasattr(ctypes.CDLL(None), "renameat2"):
        pytest.skip("no renameat2")
    for name in ("a", "b"):
        fill(tmp_path / name, {"x": name})
    if not folders._exchanged(tmp_path / "a", tmp_path / "b"):
        pytest.skip("this file system cannot exchange names")
    assert held(tmp_path / "a") == {"x": "b"}
    assert held(tmp_path / "b") == {"x": "a"}


def test_a_folder_that_must_stay_stays(tmp_path: Path) -> None:
    target = tmp_path / "out"
    fill(target, OLD)
    with pytest.raises(StudyError, match="must stay"), whole_folder(target, refuse):
        raise AssertionError("never given")
    assert held(target) == OLD
    assert [entry.name for entry in tmp_path.iterdir()] == ["out"]


def test_an_empty_folder_is_filled(tmp_path: Path) -> None:
    (tmp_path / "out").mkdir()
    with whole_folder(tmp_path / "out", refuse) as part:
        fill(part, NEW)
    assert held(tmp_path / "out") == NEW


def test_a_folder_that_changes_meanwhile_is_looked_at_again(tmp_path: Path) -> None:
    target = tmp_path / "out"

    def overtaken() -> None:
        with whole_folder(target, refuse) as part:
            fill(part, NEW)
            fill(target, OLD)

    with pytest.raises(StudyError, match="must stay"):
        overtaken()
    assert held(target) == OLD


def test_a_file_in_its_place(tmp_path: Path) -> None:
    (tmp_path / "out").write_text("mine", encoding="utf-8")
    with pytest.raises(StudyError, match="out: is a file, not a folder"):
        whole_folder(tmp_path / "out", keep).__enter__()
    assert (tmp_path / "out").read_text(encoding="utf-8") == "mine"


def test_no_folder_to_be_in(tmp_path: Path) -> None:
    with pytest.raises(StudyError, match="cannot be written: No such file or directory"):
        whole_folder(tmp_path / "missing" / "out", keep).__enter__()


@pytest.mark.skipif(not hasattr(os, "geteuid") or os.geteuid() == 0, reason="root may write")
def test_a_folder_that_may_not_be_written(tmp_path: Path) -> None:
    tmp_path.chmod(0o500)
    try:
        with pytest.raises(StudyError, match="cannot be written: Permission denied"):
            whole_folder(tmp_path / "out", keep).__enter__()
    finally:
        tmp_path.chmod(0o700)


def test_the_root_is_no_folder_for_a_report() -> None:
    with pytest.raises(StudyError, match="is no name for a folder"):
        whole_folder(Path("/"), keep).__enter__()


def test_a_link_stays_a_link(tmp_path: Path) -> None:
    fill(tmp_path / "elsewhere" / "real", OLD)
    (tmp_path / "out").symlink_to(tmp_path / "elsewhere" / "real")
    with whole_folder(tmp_path / "out", keep) as part:
        fill(part, NEW)
    assert (tmp_path / "out").is_symlink()
    assert held(tmp_path / "elsewhere" / "real") == NEW


def test_what_another_run_is_filling_stays(tmp_path: Path) -> None:
    if sys.platform == "win32":
        pytest.skip("no lock on folders")
    with whole_folder(tmp_path / "out", keep) as first:
        fill(first, OLD)
        with whole_folder(tmp_path / "out", keep) as second:
            fill(second, NEW)
        assert held(first) == OLD
    assert held(tmp_path / "out") == OLD


def test_what_is_not_ours_stays(tmp_path: Path) -> None:
    others = {".out.0123456789abcdef": "x", ".out.zz.thermo-pp-part": "x", ".other": "x"}
    fill(tmp_path, others)
    (tmp_path / ".outer.0123456789abcdef.thermo-pp-part").mkdir()
    with whole_folder(tmp_path / "out", keep) as part:
        fill(part, NEW)
    assert {entry.name for entry in tmp_path.iterdir()} == {
        *others, "out", ".outer.0123456789abcdef.thermo-pp-part",
    }  # fmt: skip


# every event of the file system that Python reports is one moment to be killed at
KILLED = """
import json, os, signal, sys
from pathlib import Path
sys.path.insert(0, {tests!r})
from test_folders import OLD, NEW, fill, held, keep
from thermo_pp.output import folders
way, root = sys.argv[1], Path(sys.argv[2])
os.fsync = lambda descriptor: None  # a kill, unlike a power cut, loses nothing that was written
if way == "journal":
    folders._exchanged = lambda part, target: False
WATCHED = ("open", "os.rename", "os.mkdir", "os.rmdir", "os.remove", "os.scandir", "os.listdir")
def name(found):
    known = [word for word, files in (("none", None), ("old", OLD), ("new", NEW)) if found == files]
    return known[0] if known else "mixture"
seen = []
for n in range(1, 400):
    target = root / str(n) / "out"
    fill(target, OLD)
    child = os.fork()
    if child == 0:
        left = n
        def count(event, arguments):
            global left
            if event in WATCHED:
                left -= 1
                if left == 0:
                    os.kill(os.getpid(), signal.SIGKILL)
        sys.addaudithook(count)
        with folders.whole_folder(target, keep) as part:
            fill(part, NEW)
        os._exit(0)
    _, status = os.waitpid(child, 0)
    after = held(target)
    with folders.whole_folder(target, keep) as part:
        before = held(target)  # what the next run found or finished
        fill(part, NEW)
    left = [entry.name for entry in target.parent.iterdir()]
    seen.append([os.WIFSIGNALED(status), name(after), name(before), left])
    if not os.WIFSIGNALED(status):
        break
print(json.dumps(seen))
"""


@pytest.mark.skipif(not hasattr(os, "fork"), reason="no fork")
@pytest.mark.parametrize("way", ["exchange", "journal"])
def test_killed_at_any_moment(tmp_path: Path, way: str) -> None:
    if way == "exchange" and sys.platform != "linux":
        pytest.skip("names are exchanged in one step on Linux only")
    script = KILLED.format(tests=str(Path(__file__).parent))
    done = subprocess.run(
        [sys.executable, "-c", script, way, str(tmp_path)],
        capture_output=True, text=True, check=False, timeout=120,
        env={**os.environ, "PYTHONPATH": str(Path(folders.__file__).parents[2])},
    )  # fmt: skip
    assert done.returncode == 0, done.stderr
    seen = json.loads(done.stdout)
    assert len(seen) > 30
    assert [killed for killed, *_ in seen] == [True] * (len(seen) - 1) + [False]
    assert all(left == ["out"] for *_, left in seen)
    found = [after for _, after, *_ in seen]
    recovered = [before for _, _, before, _ in seen]
    # old up to some moment, new from then on; without an exchange in one step there is a moment with none
    order = ["old", "new"] if way == "exchange" else ["old", "none", "new"]
    assert list(dict.fromkeys(found)) == order
    assert found == sorted(found, key=order.index)
    assert list(dict.fromkeys(recovered)) == ["old", "new"]
