"""Collecting: which files are walked, in which order, what is left out and why."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from thermo_pp.collect import Collection, Outcome, Skipped, gather
from thermo_pp.collect.walk import HIDDEN, LINK_BROKEN, LINK_INSIDE, LINK_OUT, NO_FILE, walk
from thermo_pp.collect.workers import outcomes
from thermo_pp.errors import Finding, ReadError, StudyError
from thermo_pp.records import Calculation


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


def test_progress_counts_files_only(tree: Path) -> None:
    seen: list[int] = []
    answers = list(outcomes(walk([tree]), lambda path: Outcome(str(path)), seen.append))
    assert seen == [1, 2, 3, 4, 5]
    assert [one.skipped for one in answers if one.skipped] == [HIDDEN, HIDDEN]


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

    def per_file(path: Path) -> Outcome:
        name = str(path)
        if path.name == "b.out":
            return Outcome(name, reader="test", error=ReadError("cut", where=name, mend="rerun"))
        if path.name == "c.out":
            return Outcome(name, skipped="binary")
        return Outcome(
            name, reader="test", calculation=calculation(path), findings=(note("alone", name),)
        )

    def together(calculations: tuple[Calculation, ...]) -> tuple[Finding, ...]:
        return (note(f"together-{len(calculations)}", None),)

    found = gather(tree, per_file, together)
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
