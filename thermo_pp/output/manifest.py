"""The file ``manifest.json``: what a report consists of and what it was made from, with hashes."""

from __future__ import annotations

import hashlib
import json
import platform
from collections.abc import Mapping, Sequence
from importlib import metadata
from pathlib import Path
from typing import Any

from thermo_pp import __version__
from thermo_pp.errors import StudyError
from thermo_pp.output.json_text import json_text
from thermo_pp.study.answers import Answers

FORMAT = "thermo-pp/manifest/1"
NAME = "manifest.json"
LIBRARIES = (
    "ase", "cclib", "click", "matplotlib", "msgspec", "numpy", "pandas", "pint", "python-docx",
    "scipy", "tabulate", "threadpoolctl", "xlsxwriter",
)  # fmt: skip
"""What reads, computes or writes any part of a report."""


def manifest_text(answers: Answers, folder: Path, options: Mapping[str, Any]) -> str:
    """Return the manifest of a folder that is complete but for it.

    Parameters
    ----------
    answers : Answers
    folder : Path
    options : mapping
        What was asked for beside the study file; nothing that names a person, a machine, a place on
        it or a time.
    """
    return json_text(
        {
            "format": FORMAT,
            "title": answers.study.title,
            "study": str(answers.study.path),
            "program": {"name": "thermo_pp", "version": __version__, "constants": "CODATA 2022"},
            "python": platform.python_version(),
            "libraries": {name: _version(name) for name in LIBRARIES},
            "options": options,
            "inputs": [vars(one) for one in answers.inputs],
            "files": [
                {"path": name, "bytes": (folder / name).stat().st_size, "sha256": digest}
                for name, digest in _digests(folder).items()
            ],
        }
    )


def check_report(folder: Path) -> None:
    """Make sure that a folder is a report, as it was written, so that a new one may replace it.

    Raises
    ------
    StudyError
        It is something else, or it holds what would be lost.
    """
    listed = _listed(folder)
    if listed is None:
        raise StudyError(
            "the folder is no report of this program, so it is not replaced",
            where=str(folder),
            mend="choose another folder, or empty this one",
        )
    found = _digests(folder)
    for what, names in (
        ("holds files that are not of the report", [name for name in found if name not in listed]),
        (
            "holds files that were changed since",
            [name for name, digest in found.items() if listed.get(name, digest) != digest],
        ),
    ):
        if names:
            raise StudyError(
                f"the report {what}, so it is not replaced: {_some(names)}",
                where=str(folder),
                mend="move them elsewhere, or choose another folder",
            )


def _listed(folder: Path) -> dict[str, str] | None:
    """Return the files of the manifest with their hashes, None where there is no manifest of ours."""
    try:
        known = json.loads((folder / NAME).read_text(encoding="utf-8"))
        if known["format"] != FORMAT:
            return None
        return {str(one["path"]): str(one["sha256"]) for one in known["files"]}
    except (OSError, ValueError, KeyError, TypeError):
        return None


def _digests(folder: Path) -> dict[str, str]:
    """Return the hash of every file but the manifest, by its path with slashes, in order."""
    names = sorted(
        path.relative_to(folder).as_posix() for path in folder.rglob("*") if not path.is_dir()
    )
    return {
        name: hashlib.sha256((folder / name).read_bytes()).hexdigest()
        for name in names
        if name != NAME
    }


def _some(names: Sequence[str]) -> str:
    shown = ", ".join(names[:3])
    return shown if len(names) <= 3 else f"{shown} and {len(names) - 3} more"


def _version(name: str) -> str | None:
    try:
        return metadata.version(name)
    except metadata.PackageNotFoundError:
        return None
