"""The pages: their Python examples run, their links lead somewhere, the README shows what the program prints."""

from __future__ import annotations

import os
import re
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]
PAGES = [ROOT / "README.md", ROOT / "DEVELOPERS.md", *sorted((ROOT / "docs").glob("*.md"))]
BLOCK = re.compile(r"^```(\w+)\n(.*?)^```$", re.DOTALL | re.MULTILINE)


def blocks(page: Path, language: str) -> list[str]:
    return [
        body for name, body in BLOCK.findall(page.read_text(encoding="utf-8")) if name == language
    ]


@pytest.mark.parametrize("page", PAGES, ids=lambda page: page.name)
def test_python_examples_run(page: Path, tmp_path: Path) -> None:
    (tmp_path / "fixtures").symlink_to(ROOT / "fixtures")  # what an example writes stays here
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    for body in blocks(page, "python"):
        done = subprocess.run(
            [sys.executable, "-c", body],
            cwd=tmp_path,
            env=environment,
            capture_output=True,
            text=True,
            check=False,
        )
        assert done.returncode == 0, done.stderr


@pytest.mark.parametrize("page", PAGES, ids=lambda page: page.name)
def test_links_lead_somewhere(page: Path) -> None:
    text = page.read_text(encoding="utf-8")
    for target in re.findall(r"\]\(([^)#]+)\)", text):
        if not target.startswith("http"):
            assert (page.parent / target).exists(), f"{page.name} links to {target}"


def test_readme_shows_what_the_program_prints() -> None:
    page = ROOT / "README.md"
    commands = [line for line in blocks(page, "sh")[0].splitlines() if line.startswith("thermo-pp")]
    assert len(commands) == 2
    printed = ""
    for command in commands:
        words = [sys.executable, "-m", "thermo_pp", *command.split()[1:]]
        printed += subprocess.run(
            words, cwd=ROOT, capture_output=True, text=True, check=True
        ).stdout
    assert printed == blocks(page, "text")[0]


def test_every_reader_has_a_row() -> None:
    from thermo_pp.readers import READERS

    text = (ROOT / "docs" / "readers.md").read_text(encoding="utf-8")
    for reader in READERS:
        assert f"| `{reader.NAME}` |" in text
