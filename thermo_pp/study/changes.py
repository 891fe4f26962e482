"""Changes of a study file by dotted key: ``conditions.held.W`` and a value in place of the file's.

A key is written as TOML writes it; entries of lists count from 1 (``steps.3.rate``), and ``*`` stands
for every species that has the rest of the key: then ``{name}`` in the value is its name.
"""

from __future__ import annotations

import tomllib
from collections.abc import Mapping, Sequence
from typing import Any

from thermo_pp.errors import StudyError
from thermo_pp.nearest import suggestion
from thermo_pp.study.check import documented_keys, model_key

EVERY = "*"
_NAMED = ("species", "levels", "isotopologues")


def changed_data(data: Mapping[str, Any], changes: Mapping[str, Any], file: str) -> dict[str, Any]:
    """Return the tables of a study file with other values at dotted keys.

    Raises
    ------
    StudyError
        A key that the study file does not know, a species or an entry that this file does not have.
    """
    changed: dict[str, Any] = dict(data)
    for key, value in changes.items():
        for path, name in _paths(key, changed, file):
            text = isinstance(value, str) and name is not None
            _check_path(path, changed, key, file)
            own = value.replace("{name}", name) if text else value
            changed = _with(changed, path, own, key, file)
    return changed


def parse_value(text: str) -> Any:
    """Return what a text means as a value of a study file: TOML where it is that, else the text itself.

    >>> parse_value("0.98"), parse_value("2e-4 mol/L"), parse_value("a.out"), parse_value('"5"')
    (0.98, '2e-4 mol/L', 'a.out', '5')
    """
    try:
        return tomllib.loads(f"value = {text}")["value"] if "\n" not in text else text
    except tomllib.TOMLDecodeError:
        return text


def _paths(
    key: str, data: Mapping[str, Any], file: str
) -> list[tuple[tuple[str, ...], str | None]]:
    """Return the parts of a key, once for each species where it says `EVERY`, with its name."""
    try:
        found: Any = tomllib.loads(f"{key.replace(EVERY, _EVERY_WORD)} = 0")
    except tomllib.TOMLDecodeError:
        found = None
    parts: list[str] = []
    while isinstance(found, Mapping) and len(found) == 1:
        [(part, found)] = found.items()
        parts.append(part.replace(_EVERY_WORD, EVERY))
    if not parts or found != 0:
        raise StudyError(
            f"{key!r} is no key",
            where=file,
            mend='write it with points: conditions.held.W, species."C-1".energy, steps.3.rate',
        )
    if EVERY not in parts[1:2]:
        return [(tuple(parts), None)]
    table = data.get(parts[0])
    names = [
        name
        for name, inner in (table.items() if isinstance(table, Mapping) else ())
        if isinstance(inner, Mapping) and (len(parts) < 3 or parts[2] in inner)
    ]
    if not names:
        raise StudyError(
            f"no {parts[0]} of the file has what {key!r} names",
            where=file,
            mend="name a key that some of them have",
        )
    return [((parts[0], name, *parts[2:]), name) for name in names]


_EVERY_WORD = "every-one-of-them"


def _check_path(path: Sequence[str], data: Mapping[str, Any], key: str, file: str) -> None:
    """Refuse a key that the model does not have, and a name that this file does not have."""
    if path[0] in _NAMED and len(path) > 1:
        table = data.get(path[0], {})
        if isinstance(table, Mapping) and path[1] not in table:
            raise StudyError(
                f"there is no {path[1]!r} in [{path[0]}] ({key})",
                where=file,
                mend=suggestion(path[1], table, path[0]),
            )
    known = [name for name, _, _ in documented_keys()]
    wanted = model_key(tuple(int(part) if part.isdigit() else part for part in path))
    tables = {name.rsplit(".", k)[0] for name in known for k in range(1, name.count(".") + 1)}
    free = [name for name in known if name not in tables]  # their inside is checked with the value
    if wanted in known or wanted in tables or any(wanted.startswith(f"{n}.") for n in free):
        return
    raise StudyError(f"unknown key {key!r}", where=file, mend=suggestion(wanted, known, "keys"))


def _with(data: Any, path: Sequence[str], value: Any, key: str, file: str) -> Any:
    """Return a copy of nested tables and lists with another value at `path`."""
    if not path:
        return value
    part, rest = path[0], path[1:]
    if isinstance(data, list):
        number = int(part) if part.isdigit() else 0
        if not 1 <= number <= len(data):
            raise StudyError(
                f"there is no entry {part!r} ({key})",
                where=file,
                mend=f"entries count from 1 to {len(data)}",
            )
        entries = list(data)
        entries[number - 1] = _with(entries[number - 1], rest, value, key, file)
        return entries
    inner = data if isinstance(data, Mapping) else {}
    return {**inner, part: _with(inner.get(part), rest, value, key, file)}
