"""All readers: each has good and bad files, files are told by content, what no reader knows is refused."""

from __future__ import annotations

import re
from pathlib import Path

import pytest
from fixture_files import BESIDE, FIXTURES, expected, files

from thermo_pp import readers
from thermo_pp.errors import ReadError
from thermo_pp.readers import READERS, claims, read, read_source
from thermo_pp.sources import Source

NAMES = [reader.NAME for reader in READERS]
GOOD = [(name, path) for name in NAMES for path in files(name, "good")]
BAD = [(name, path) for name in NAMES for path in files(name, "bad")]


def ids(value: object) -> str:
    return value.stem if isinstance(value, Path) else str(value)


def test_names_are_distinct() -> None:
    assert len(set(NAMES)) == len(READERS)


@pytest.mark.parametrize("name", NAMES)
def test_a_registered_reader_has_good_and_bad_files(name: str) -> None:
    assert files(name, "good"), f"fixtures/{name}/good is empty"
    assert files(name, "bad"), f"fixtures/{name}/bad is empty"


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize(("kind", "beside"), [("good", ".toml"), ("bad", ".match")])
def test_every_file_has_its_table(name: str, kind: str, beside: str) -> None:
    folder = FIXTURES / name / kind
    lonely = [path.name for path in files(name, kind) if not path.with_suffix(beside).is_file()]
    assert not lonely, f"no {beside} beside {lonely} in {folder}"
    stems = [path.stem for path in files(name, kind)]
    assert len(set(stems)) == len(stems), f"two files of one stem in {folder}"
    tables = {path.stem for path in folder.glob("*") if path.suffix in BESIDE}
    assert tables <= set(stems), f"tables without a file in {folder}: {tables - set(stems)}"


@pytest.mark.parametrize(("name", "path"), GOOD, ids=ids)
def test_good_file_is_claimed_by_its_reader_alone_and_read(name: str, path: Path) -> None:
    assert [reader.NAME for reader in claims(path.read_bytes()[:65536])] == [name]
    calc, expect = read(path), expected(path)
    assert calc.path == str(path)
    assert len(calc.sha256) == 64
    assert calc.formula == expect["formula"]
    assert len(calc.numbers) == expect["n_atoms"]
    if "energy_hartree" in expect:
        assert calc.energy_hartree == pytest.approx(expect["energy_hartree"], abs=1e-12, rel=1e-15)
    else:
        assert calc.energy_hartree is None
    lines = path.read_bytes().count(b"\n") + 1
    assert all(1 <= line <= lines for line in calc.where.values())


@pytest.mark.parametrize(("name", "path"), BAD, ids=ids)
def test_bad_file_is_refused_at_its_line(name: str, path: Path) -> None:
    with pytest.raises(ReadError) as caught:
        read(path)
    error = caught.value
    match = path.with_suffix(".match").read_text(encoding="utf-8").strip()
    assert match in str(error)
    assert re.fullmatch(rf"{re.escape(str(path))}:\d+", error.where)
    assert 1 <= int(error.where.rpartition(":")[2]) <= path.read_bytes().count(b"\n") + 1
    assert error.mend


def test_the_name_of_a_file_does_not_matter(tmp_path: Path) -> None:
    name, path = GOOD[0]
    copy = tmp_path / "notes.txt"
    copy.write_bytes(path.read_bytes())
    assert read(copy).energy_hartree == read(str(path)).energy_hartree
    assert read(copy).path == str(copy), name


@pytest.mark.parametrize("data", [b"", b" \n\n"])
def test_empty_file(data: bytes) -> None:
    with pytest.raises(ReadError, match=r"x\.out:1: the file is empty"):
        read_source(Source("x.out", data))


@pytest.mark.parametrize(
    "data",
    [
        b"Notes of Monday: Psi4 and NWChem disagree, ask about the basis set.\n",
        bytes(range(256)) * 300,
        b"\x7fELF\x02\x01\x01" + bytes(1000),
        b'{"schema": "mine"}',
        b"O 0 0 0\n",
    ],
    ids=["note", "binary", "program", "json", "coordinates"],
)
def test_what_no_reader_knows(data: bytes) -> None:
    with pytest.raises(ReadError) as caught:
        read_source(Source("note.out", data))
    assert caught.value.where == "note.out:1"
    assert "no reader knows this file" in caught.value.what
    assert all(reader.LOOKS_FOR in caught.value.what for reader in READERS)


def test_two_claims_name_both(monkeypatch: pytest.MonkeyPatch) -> None:
    name, path = GOOD[0]
    twice = (*READERS, next(reader for reader in READERS if name == reader.NAME))
    monkeypatch.setattr(readers, "READERS", twice)
    with pytest.raises(ReadError, match=f"the readers {name} and {name} both claim this file"):
        read(path)


def test_two_programs_in_one_file() -> None:
    first, second = (
        next(path for name, path in GOOD if name == program).read_bytes()
        for program in ("nwchem", "psi4")
    )
    mark = first.index(b"Northwest Computational Chemistry Package")
    start = first.rindex(b"\n", 0, mark)
    with pytest.raises(ReadError, match="the readers nwchem and psi4 both claim this file"):
        read_source(Source("both.out", first[start : mark + 500] + second))


def test_files_that_cannot_be_opened(tmp_path: Path) -> None:
    with pytest.raises(ReadError, match="cannot be read: No such file"):
        read(tmp_path / "missing.out")
    with pytest.raises(ReadError, match="cannot be read: Is a directory"):
        read(tmp_path)
