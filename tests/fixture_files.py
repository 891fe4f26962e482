"""The files under fixtures/ and what is expected of them; for the tests of the readers."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

FIXTURES = Path(__file__).resolve().parent.parent / "fixtures"
BESIDE = (".toml", ".match", ".why")


def files(program: str, kind: str) -> list[Path]:
    """Return the files of ``fixtures/<program>/<good or bad>`` that a reader is given."""
    folder = FIXTURES / program / kind
    return sorted(path for path in folder.glob("*") if path.suffix not in BESIDE)


def expected(path: Path) -> dict[str, Any]:
    """Return what the table beside a good file expects."""
    table = tomllib.loads(path.with_suffix(".toml").read_text(encoding="utf-8"))
    expect = table["expect"]
    assert isinstance(expect, dict)
    return expect


def file_id(path: Path) -> str:
    return path.stem
