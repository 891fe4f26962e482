"""Sources: compressed and archived files read as they stand, within limits; siblings wherever they lie."""

from __future__ import annotations

import bz2
import gzip
import hashlib
import io
import lzma
import os
import tarfile
import zipfile
from collections.abc import Callable
from pathlib import Path

import pytest

import thermo_pp as tp
from thermo_pp.errors import ReadError
from thermo_pp.sources import (
    Damaged,
    LeftOut,
    Looked,
    Oversize,
    Piece,
    Source,
    archives,
    compressed,
    disk,
    limits,
    open_source,
    pieces,
)
from thermo_pp.sources.compressed import zstd_module

FIXTURE = Path(__file__).parents[1] / "fixtures" / "psi4" / "good" / "water_hf_energy.out"
TEXT = b"".join(b"line %d\n" % number for number in range(20_000))
COMPRESS: dict[str, Callable[[bytes], bytes]] = {
    ".gz": gzip.compress,
    ".bz2": bz2.compress,
    ".xz": lzma.compress,
    ".zst": lambda data: bytes(zstd_module().compress(data)),
}
ENDINGS = list(COMPRESS)


def found(path: Path) -> dict[str, bytes | str]:
    """What a file holds: the bytes of each piece by name, or the reason why it is left out."""
    held: dict[str, bytes | str] = {}
    for piece in pieces(path, path.name):
        name = piece.name
        if isinstance(piece, LeftOut):
            held[name] = piece.reason
            continue
        try:
            held[name] = piece.source().data
        except ReadError as error:
            held[name] = error.what
    return held


# -- compressed files


@pytest.mark.parametrize("ending", ENDINGS)
def test_compressed_is_told_by_content(tmp_path: Path, ending: str) -> None:
    data = COMPRESS[ending](TEXT)
    for name in ("x.out", "x.out" + ending, "x.dat"):
        path = tmp_path / name
        path.write_bytes(data)
        source = open_source(path)
        assert source.data == TEXT
        assert source.sha256 == hashlib.sha256(TEXT).hexdigest()
        assert source.name == str(path)
    assert open_source(tmp_path / ("x.out" + ending)).file_name == "x.out"
    assert open_source(tmp_path / "x.out").file_name == "x.out"


@pytest.mark.parametrize("ending", ENDINGS)
def test_the_same_numbers_from_a_compressed_output(tmp_path: Path, ending: str) -> None:
    path = tmp_path / f"water.out{ending}"
    path.write_bytes(COMPRESS[ending](FIXTURE.read_bytes()))
    plain, packed = tp.read(FIXTURE), tp.read(path)
    assert packed.energy_hartree == plain.energy_hartree
    assert packed.where == plain.where
    assert packed.sha256 == plain.sha256
    assert packed.path == str(path)


@pytest.mark.parametrize("ending", ENDINGS)
def test_streams_behind_each_other_and_padding(tmp_path: Path, ending: str) -> None:
    path = tmp_path / "x"
    pack = COMPRESS[ending]
    path.write_bytes(pack(TEXT[:70_001]) + pack(TEXT[70_001:]) + b"\0" * 512)
    assert open_source(path).data == TEXT


@pytest.mark.parametrize("ending", ENDINGS)
@pytest.mark.parametrize("part", [0.3, 0.9, 0.999])
def test_cut_short_is_an_error(tmp_path: Path, ending: str, part: float) -> None:
    data = COMPRESS[ending](os.urandom(200_000))
    path = tmp_path / "cut"
    path.write_bytes(data[: int(len(data) * part)])
    with pytest.raises(Damaged, match=r"cut: (the \w+ data are cut short|damaged)"):
        open_source(path, "cut")


@pytest.mark.parametrize("ending", [".gz", ".bz2", ".xz"])
def test_a_flipped_byte_is_an_error(tmp_path: Path, ending: str) -> None:
    data = bytearray(COMPRESS[ending](os.urandom(200_000)))
    data[len(data) // 2] ^= 0x55
    path = tmp_path / "flipped"
    path.write_bytes(data)
    with pytest.raises(Damaged):
        open_source(path)


def test_what_stands_behind_a_gzip_stream_is_not_passed_over(tmp_path: Path) -> None:
    path = tmp_path / "x.gz"
    path.write_bytes(gzip.compress(TEXT) + b"something else")
    with pytest.raises(Damaged):
        open_source(path)


def test_compressed_more_than_once(tmp_path: Path) -> None:
    path = tmp_path / "x"
    path.write_bytes(gzip.compress(bz2.compress(TEXT)))
    assert open_source(path).data == TEXT
    data = TEXT
    for _ in range(limits.MOST_LAYERS + 1):
        data = gzip.compress(data)
    path.write_bytes(data)
    with pytest.raises(Oversize, match="compressed more than 3 times"):
        open_source(path)


@pytest.mark.parametrize("ending", ENDINGS)
def test_a_bomb_is_stopped_by_its_ratio(
    tmp_path: Path, ending: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(limits, "FREE_BYTES", 100_000)
    path = tmp_path / "bomb"
    path.write_bytes(COMPRESS[ending](b"Psi4" + b"\0" * 8_000_000))
    with pytest.raises(Oversize, match="more than 250 times its own size"):
        open_source(path)


def test_the_absolute_limit(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(compressed, "MOST_BYTES", 2**20)
    for name, data in (
        ("plain", b"x" * (2**20 + 1)),
        ("packed", gzip.compress(os.urandom(2**20 + 1))),
    ):
        path = tmp_path / name
        path.write_bytes(data)
        with pytest.raises(Oversize, match="larger than 1 MiB"):
            open_source(path)
        path.write_bytes(data[: 2**20] if name == "plain" else gzip.compress(os.urandom(2**20)))
        assert len(open_source(path).data) == 2**20


def test_only_the_head_of_a_bomb_is_decompressed(tmp_path: Path) -> None:
    path = tmp_path / "bomb.gz"
    path.write_bytes(gzip.compress(b"\0" * 200_000_000, 1))
    (piece,) = pieces(path, "bomb.gz")
    assert isinstance(piece, Piece)
    assert piece.head == b"\0" * 65536
    (skipped,) = tp.collect(path, cache=False).skipped
    assert skipped.reason == "binary"


def test_memory_that_an_xz_file_asks_for(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(compressed, "XZ_MEMORY", 2**20)
    path = tmp_path / "x.xz"
    path.write_bytes(lzma.compress(TEXT, preset=9))
    with pytest.raises(Oversize, match="asks for too much memory"):
        open_source(path)


def test_zstd_without_its_library(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = tmp_path / "x.zst"
    path.write_bytes(COMPRESS[".zst"](TEXT))

    def missing() -> None:
        raise ImportError

    monkeypatch.setattr(compressed, "zstd_module", missing)
    with pytest.raises(ReadError, match=r"pip install backports\.zstd"):
        open_source(path)


@pytest.mark.parametrize("encoding", ["utf-16", "utf-16-le", "utf-16-be"])
def test_utf16_becomes_utf8(tmp_path: Path, encoding: str) -> None:
    bom = {"utf-16-le": b"\xff\xfe", "utf-16-be": b"\xfe\xff"}.get(encoding, b"")
    data = bom + FIXTURE.read_text().encode(encoding)
    path = tmp_path / "x.out"
    path.write_bytes(data)
    read, plain = tp.read(path), tp.read(FIXTURE)
    assert (read.energy_hartree, read.where) == (plain.energy_hartree, plain.where)
    assert read.sha256 == hashlib.sha256(data).hexdigest()
    assert len(tp.collect(path, cache=False)) == 1
    path.write_bytes(data[:-1])
    with pytest.raises(ReadError, match="not valid UTF-16"):
        open_source(path)


# -- archives

MEMBERS = {"a/x.out": b"one\n", "a/y.hess": b"two\n", "b/z.out.gz": gzip.compress(TEXT), "top": b""}
LONG = "f" * 90 + "/" + "g" * 120 + "/x.out"


def tar_bytes(members: dict[str, bytes], mode: str = "w", form: int = tarfile.PAX_FORMAT) -> bytes:
    file = io.BytesIO()
    with tarfile.open(fileobj=file, mode=mode, format=form) as archive:  # type: ignore[call-overload]
        for name, data in members.items():
            info = tarfile.TarInfo(name)
            info.size = len(data)
            archive.addfile(info, io.BytesIO(data))
    return file.getvalue()


def zip_bytes(members: dict[str, bytes], method: int = zipfile.ZIP_DEFLATED) -> bytes:
    file = io.BytesIO()
    with zipfile.ZipFile(file, "w", method) as archive:
        for name, data in members.items():
            archive.writestr(name, data)
    return file.getvalue()


ARCHIVES: dict[str, Callable[[dict[str, bytes]], bytes]] = {
    "pax.tar": lambda members: tar_bytes(members),
    "gnu.tar": lambda members: tar_bytes(members, form=tarfile.GNU_FORMAT),
    "x.tar.gz": lambda members: tar_bytes(members, "w:gz"),
    "x.tar.bz2": lambda members: tar_bytes(members, "w:bz2"),
    "x.tar.xz": lambda members: tar_bytes(members, "w:xz"),
    "x.tar.zst": lambda members: COMPRESS[".zst"](tar_bytes(members)),
    "deflated.zip": lambda members: zip_bytes(members),
    "stored.zip": lambda members: zip_bytes(members, zipfile.ZIP_STORED),
    "bzip2.zip": lambda members: zip_bytes(members, zipfile.ZIP_BZIP2),
}


@pytest.mark.parametrize("name", ARCHIVES)
def test_members_of_archives(tmp_path: Path, name: str) -> None:
    path = tmp_path / name
    path.write_bytes(ARCHIVES[name](MEMBERS | {LONG: b"long", "caf\u00e9.out": b"u"}))
    assert found(path) == {
        f"{name}!/a/x.out": b"one\n",
        f"{name}!/a/y.hess": b"two\n",
        f"{name}!/b/z.out.gz": TEXT,
        f"{name}!/top": b"",
        f"{name}!/{LONG}": b"long",
        f"{name}!/caf\u00e9.out": b"u",
    }


@pytest.mark.parametrize("form", [tarfile.USTAR_FORMAT, tarfile.GNU_FORMAT, tarfile.PAX_FORMAT])
def test_tar_forms(tmp_path: Path, form: int) -> None:
    path = tmp_path / "x"
    name = "f" * 60 + "/" + "g" * 90
    path.write_bytes(tar_bytes({name: b"1", "./b": b"2", "/c//d": b"3"}, form=form))
    assert found(path) == {f"x!/{name}": b"1", "x!/b": b"2", "x!/c/d": b"3"}


def test_a_tar_file_without_a_magic(tmp_path: Path) -> None:
    block = bytearray(tar_bytes({"x": b"old"}, form=tarfile.USTAR_FORMAT))
    block[257:265] = b"\0" * 8
    block[148:156] = b" " * 8
    block[148:156] = b"%06o\0 " % sum(block[:512])
    (tmp_path / "old.tar").write_bytes(block)
    assert found(tmp_path / "old.tar") == {"old.tar!/x": b"old"}


def test_what_is_left_out_of_a_tar_file(tmp_path: Path) -> None:
    path = tmp_path / "x.tar"
    with tarfile.open(path, "w") as archive:
        for name, kind in (
            ("link", tarfile.SYMTYPE),
            ("hard", tarfile.LNKTYPE),
            ("pipe", tarfile.FIFOTYPE),
        ):
            info = tarfile.TarInfo(name)
            info.type, info.linkname = kind, "/etc/passwd"
            archive.addfile(info)
        for name in (".hidden", "a/.git/config", "../outside", "a/../../b"):
            archive.addfile(tarfile.TarInfo(name))
        archive.addfile(tarfile.TarInfo("good"))
    assert found(path) == {
        "x.tar!/link": archives.LINK,
        "x.tar!/hard": archives.LINK,
        "x.tar!/pipe": archives.NO_FILE,
        "x.tar!/.hidden": archives.HIDDEN,
        "x.tar!/a/.git/config": archives.HIDDEN,
        "x.tar!/../outside": archives.OUTSIDE,
        "x.tar!/a/../../b": archives.OUTSIDE,
        "x.tar!/good": b"",
    }


def test_what_is_left_out_of_a_zip_file(tmp_path: Path) -> None:
    path = tmp_path / "x.zip"
    with zipfile.ZipFile(path, "w") as archive:
        link = zipfile.ZipInfo("link")
        link.external_attr = 0o120777 << 16
        archive.writestr(link, "/etc/passwd")
        archive.writestr("lzma", TEXT, zipfile.ZIP_LZMA)
        archive.writestr(".hidden", "x")
        archive.writestr("secret", "x")
    data = path.read_bytes().replace(b"\0\0\0\0secret", b"\0\0\0\0secret")
    at = data.rfind(b"PK\x01\x02")
    path.write_bytes(data[: at + 8] + b"\x01" + data[at + 9 :])  # the flag that it is encrypted
    assert found(path) == {
        "x.zip!/link": archives.LINK,
        "x.zip!/lzma": archives.METHOD,
        "x.zip!/.hidden": archives.HIDDEN,
        "x.zip!/secret": archives.ENCRYPTED,
    }


def test_a_later_member_takes_the_place_of_an_earlier_one(tmp_path: Path) -> None:
    path = tmp_path / "x.tar"
    with tarfile.open(path, "w") as archive:
        for data in (b"old", b"newer"):
            info = tarfile.TarInfo("x")
            info.size = len(data)
            archive.addfile(info, io.BytesIO(data))
    assert found(path) == {"x.tar!/x": b"newer"}


def test_office_documents_are_no_archives(tmp_path: Path) -> None:
    path = tmp_path / "x.docx"
    path.write_bytes(zip_bytes({"[Content_Types].xml": b"<x/>", "word/document.xml": b"<x/>"}))
    assert found(path) == {"x.docx": "binary"}


def test_archives_inside_archives(tmp_path: Path) -> None:
    inner = zip_bytes({"x.out": b"deep"})
    middle = tar_bytes({"inner.zip": inner, "y.out": b"shallow"}, "w:gz")
    path = tmp_path / "outer.zip"
    path.write_bytes(zip_bytes({"m/middle.tgz": middle}))
    assert found(path) == {
        "outer.zip!/m/middle.tgz!/inner.zip!/x.out": b"deep",
        "outer.zip!/m/middle.tgz!/y.out": b"shallow",
    }
    path.write_bytes(zip_bytes({"m": zip_bytes({"m": middle})}))
    assert found(path) == {
        "outer.zip!/m!/m!/inner.zip": "an archive inside 3 others",
        "outer.zip!/m!/m!/y.out": b"shallow",
    }


@pytest.mark.parametrize("name", ARCHIVES)
def test_siblings_inside_archives(tmp_path: Path, name: str) -> None:
    path = tmp_path / name
    path.write_bytes(
        ARCHIVES[name]({"a/x": b"1", "a/y.gz": gzip.compress(b"2"), "b/z": b"3", "top": b"4"})
    )
    (tmp_path / "z").write_text("a file of the folder is no sibling of a member")
    (tmp_path / "a").mkdir()
    source = open_source(tmp_path / f"{name}!/a/x")
    sibling = source.sibling("y")
    assert sibling is not None
    assert (sibling.data, sibling.name) == (b"2", f"{path}!/a/y.gz")
    assert sibling.sibling("x") is not None
    assert [source.sibling(each) for each in ("z", "top", "../b/z", "b/z", "")] == [None] * 5
    top = open_source(tmp_path / f"{name}!/top")
    assert top.sibling("top") is not None
    assert top.sibling("x") is None


def test_an_archive_is_not_one_output(tmp_path: Path) -> None:
    path = tmp_path / "x.tar.gz"
    path.write_bytes(tar_bytes({"a/x.out": FIXTURE.read_bytes()}, "w:gz"))
    with pytest.raises(ReadError, match=r"it is an archive \(tar\)") as caught:
        tp.read(path)
    assert str(path) + "!/a/x.out" in caught.value.mend
    read = tp.read(f"{path}!/a/x.out")
    assert read.energy_hartree == tp.read(FIXTURE).energy_hartree
    assert read.path == f"{path}!/a/x.out"
    with pytest.raises(ReadError, match="the archive has no such file"):
        tp.read(f"{path}!/a/y.out")


@pytest.mark.parametrize("name", ["pax.tar", "x.tar.gz", "deflated.zip"])
def test_damaged_archives_end_in_a_reason(tmp_path: Path, name: str) -> None:
    data = ARCHIVES[name]({f"{number}.out": os.urandom(3000) for number in range(8)})
    path = tmp_path / name
    for part in range(1, 40):
        path.write_bytes(data[: len(data) * part // 40])
        found_here = tp.collect(path, cache=False)
        assert found_here.skipped, part
        assert not found_here.calculations
    for place in range(0, len(data), len(data) // 97):
        flipped = bytearray(data)
        flipped[place] ^= 0xFF
        path.write_bytes(flipped)
        tp.collect(path, cache=False)


def test_a_damaged_zip_member_is_no_file(tmp_path: Path) -> None:
    data = bytearray(zip_bytes({"x.out": FIXTURE.read_bytes()}, zipfile.ZIP_STORED))
    data[len(data) // 2] ^= 1
    path = tmp_path / "x.zip"
    path.write_bytes(data)
    collected = tp.collect(path, cache=False)
    ((name, error),) = collected.failed
    assert name == f"{path}!/x.out"
    assert "damaged zip member" in error.what
    assert collected.readers[name] == "psi4"


def test_limits_of_archives(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    many = tmp_path / "many.tar"
    many.write_bytes(tar_bytes({str(number): b"" for number in range(30)}))
    flood = tmp_path / "flood.tar.xz"
    flood.write_bytes(tar_bytes({"x": b"\0" * 20_000_000}, "w:xz"))
    member = tmp_path / "member.zip"
    member.write_bytes(zip_bytes({"x": b"Psi4" + b"\0" * 20_000_000, "y": b"good"}))
    table = tmp_path / "table.zip"
    table.write_bytes(zip_bytes({str(number): b"" for number in range(30)}))
    monkeypatch.setattr(limits, "MOST_MEMBERS", 29)
    monkeypatch.setattr(limits, "FREE_BYTES", 500_000)
    for path, reason in (
        (many, "more than 29 files"),
        (flood, "more than 1000 times"),
        (table, "29 files"),
    ):
        with pytest.raises(Oversize, match=reason):
            found(path)
        (skipped,) = tp.collect(path, cache=False).skipped
        assert reason in skipped.reason
    assert found(member) == {
        "member.zip!/x": "it holds more than 250 times its own size",
        "member.zip!/y": b"good",
    }
    monkeypatch.setattr(archives, "_MOST_DIRECTORY", 100)
    with pytest.raises(Oversize, match="table of contents"):
        found(table)


def test_temporary_space_is_limited(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = tmp_path / "x.tar.gz"
    path.write_bytes(tar_bytes({"x": os.urandom(3_000_000)}, "w:gz"))
    monkeypatch.setattr(limits, "MOST_SPOOLED", 2_000_000)
    with pytest.raises(Oversize, match="temporary disk space"):
        found(path)


def test_a_large_compressed_tar_goes_through_the_disk(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(disk, "_IN_MEMORY", 1000)
    monkeypatch.setattr("tempfile.tempdir", str(tmp_path / "temp"))
    (tmp_path / "temp").mkdir()
    path = tmp_path / "x.tar.gz"
    path.write_bytes(tar_bytes({"x": TEXT, "y": b"2"}, "w:gz"))
    assert found(path) == {"x.tar.gz!/x": TEXT, "x.tar.gz!/y": b"2"}
    assert list((tmp_path / "temp").iterdir()) == []


# -- siblings in folders, and what was looked at


def test_siblings_in_a_folder(tmp_path: Path) -> None:
    (tmp_path / "x.out").write_bytes(b"1")
    (tmp_path / "hessian").write_bytes(b"2")
    (tmp_path / "modes.zst").write_bytes(COMPRESS[".zst"](b"3"))
    (tmp_path / "folder").mkdir()
    source = open_source(tmp_path / "x.out", "x.out")
    for name, data in (("hessian", b"2"), ("modes", b"3")):
        sibling = source.sibling(name)
        assert sibling is not None
        assert sibling.data == data
    assert source.sibling("hessian").name == "hessian"  # type: ignore[union-attr]
    absent = ("absent", "folder", "", ".", "..", "../x", "a/b", "\0")
    assert [source.sibling(name) for name in absent] == [None] * len(absent)
    assert Source("x", b"").sibling("hessian") is None
    assert Source("x", b"", tmp_path).sibling("hessian").data == b"2"  # type: ignore[union-attr]


def test_no_sibling_by_a_link_that_leads_out(tmp_path: Path) -> None:
    (tmp_path / "secret").write_text("x")
    folder = tmp_path / "folder"
    folder.mkdir()
    (folder / "x.out").write_text("x")
    (folder / "inside").symlink_to(folder / "x.out")
    (folder / "outside").symlink_to(tmp_path / "secret")
    source = open_source(folder / "x.out")
    assert source.sibling("inside") is not None
    assert source.sibling("outside") is None


def test_what_was_looked_at_is_written_down(tmp_path: Path) -> None:
    path, beside = tmp_path / "x.out", tmp_path / "hessian.gz"
    path.write_bytes(b"1" * 100_000)
    beside.write_bytes(gzip.compress(b"2"))
    looked = Looked()
    (piece,) = pieces(path, "x.out", looked)
    assert not looked.whole
    assert looked.digest == hashlib.sha256(b"1" * 65536).hexdigest()
    assert isinstance(piece, Piece)
    (piece,) = pieces(path, "x.out", looked)
    assert isinstance(piece, Piece)


def test_siblings_looked_for_are_written_down_absent_ones_too(tmp_path: Path) -> None:
    path, beside = tmp_path / "x.out", tmp_path / "hessian.gz"
    path.write_bytes(b"1" * 100_000)
    beside.write_bytes(gzip.compress(b"2"))
    looked = Looked()
    for piece in pieces(path, "x.out", looked):
        assert isinstance(piece, Piece)
        source = piece.source()
        assert source.sibling("hessian") is not None
        assert source.sibling("absent") is None
    assert looked.whole
    assert looked.digest == hashlib.sha256(path.read_bytes()).hexdigest()
    assert looked.siblings == {
        "hessian": None,
        "hessian.gz": hashlib.sha256(beside.read_bytes()).hexdigest(),
        **{f"absent{ending}": None for ending in ("", *ENDINGS)},
    }


def test_files_that_cannot_be_read(tmp_path: Path) -> None:
    for path in (tmp_path / "absent", tmp_path):
        with pytest.raises(ReadError, match="cannot be read"):
            open_source(path)
    (tmp_path / "empty").touch()
    assert open_source(tmp_path / "empty").data == b""
