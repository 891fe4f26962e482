"""Reading the tables of a study file."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from thermo_pp.errors import StudyError
from thermo_pp.study.check import check_keys
from thermo_pp.text_file import read_text

_AT_LINE = re.compile(r"\s*\(at (?:line (\d+), column \d+|end of document)\)")


_EMPTY: dict[str, Any] = {"species": {}, "steps": [{"equation": ""}]}
"""What a study must have, for checking options alone."""


def read_data(file: str, treatment: Mapping[str, Any] | None) -> dict[str, Any]:
    """Read the tables of a study file.

    Parameters
    ----------
    file : str
    treatment : mapping or None
        Keys of ``[treatment]`` in place of the file's.

    Raises
    ------
    StudyError
        As `read_toml`; an option that is none.
    """
    data = read_toml(Path(file), file)
    if treatment:
        options = {"treatment": dict(treatment)}
        check_keys({**options, **_EMPTY}, "options")
        data = {**data, "treatment": {**table_of(data, "treatment"), **options["treatment"]}}
    return data


def table_of(data: Mapping[str, Any], name: str) -> Mapping[str, Any]:
    """Return a table of the file, an empty one where it is missing or, for the check to see, none."""
    table = data.get(name, {})
    return table if isinstance(table, Mapping) else {}


def read_toml(path: Path, file: str) -> dict[str, Any]:
    """Read a TOML file; StudyError with its line where it is none."""
    text = read_text(
        path, file, "the study file", "name a study file (TOML); docs/study-file.md shows one"
    )
    try:
        return tomllib.loads(text)
    except (ValueError, RecursionError) as error:
        reason = str(error) if isinstance(error, ValueError) else "tables too deep in each other"
        found = _AT_LINE.search(reason)
        place = file
        if found is not None:
            place = f"{file}:{found.group(1) or len(text.splitlines())}"
        raise StudyError(
            f"not TOML: {_AT_LINE.sub('', reason)}",
            where=place,
            mend="mend the syntax of this line; texts stand in quotes, lists in brackets",
        ) from None
