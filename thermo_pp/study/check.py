"""Checking a study file against its model: a wrong key or value is refused with its place and mend."""

from __future__ import annotations

import json
import math
from collections.abc import Mapping
from functools import lru_cache
from typing import Any

import msgspec
from msgspec import inspect

from thermo_pp.errors import StudyError
from thermo_pp.nearest import suggestion
from thermo_pp.study.keys import ConformerKeys, StructureKeys, StudyKeys

_WORDS: dict[type, str] = {
    inspect.StrType: "a text",
    inspect.FloatType: "a number",
    inspect.IntType: "a whole number",
    inspect.BoolType: "true or false",
    inspect.ListType: "a list",
    inspect.TupleType: "a list",
    inspect.DictType: "a table",
    inspect.StructType: "a table",
    inspect.LiteralType: "one of the choices",
}


@lru_cache(maxsize=1)
def _model() -> inspect.Type:
    return inspect.type_info(StudyKeys)


def check_keys(data: Mapping[str, Any], file: str) -> StudyKeys:
    """Turn the tables of a study file into the model.

    Parameters
    ----------
    data : mapping
        What the TOML file holds.
    file : str
        Its name, for messages.

    Raises
    ------
    StudyError
        An unknown or missing key, a value of a wrong kind, an empty list, a number out of bounds,
        or what a later version takes; names the file and the key.
    """
    _check(data, _model(), file, ())
    return msgspec.convert(data, StudyKeys)


_NAMED_TABLES = ("species", "levels", "steps", "paths", "isotopologues")
"""Tables of tables: the second word belongs to the header."""


def place(file: str, *path: str | int) -> str:
    """Return the file and key as messages have it; list entries count from 1.

    >>> place("study.toml", "steps", 2, "through")
    'study.toml [steps.3] through'
    """
    words = [str(part + 1) if isinstance(part, int) else part for part in path]
    depth = 2 if len(words) > 1 and words[0] in _NAMED_TABLES else 1
    if len(words) < depth or words[0] in ("title", "outputs", "level"):
        return f"{file} {'.'.join(words)}".strip()
    return f"{file} [{'.'.join(words[:depth])}] {'.'.join(words[depth:])}".strip()


def _check(value: Any, kind: inspect.Type, file: str, path: tuple[str | int, ...]) -> None:
    """Check one value and everything inside it; StudyError at the first that is wrong."""
    while isinstance(kind, inspect.Metadata):
        kind = kind.type
    if isinstance(kind, inspect.UnionType):
        fitting = [member for member in kind.types if _fits(value, member)]
        if not fitting:
            choices = " or ".join(dict.fromkeys(_word(member) for member in kind.types))
            raise _wrong(value, choices, file, path)
        return _check(value, fitting[0], file, path)
    if not _fits(value, kind):
        raise _wrong(value, _word(kind), file, path)
    if isinstance(kind, inspect.StructType):
        _check_table(value, kind, file, path)
    elif isinstance(kind, inspect.LiteralType):
        _check_choice(value, kind, file, path)
    elif isinstance(kind, inspect.DictType):
        for name, member in value.items():
            _check(member, kind.value_type, file, (*path, name))
    elif isinstance(kind, inspect.ListType):
        if len(value) < (kind.min_length or 0):
            raise StudyError("the list is empty", where=place(file, *path), mend="add an entry")
        for number, member in enumerate(value):
            _check(member, kind.item_type, file, (*path, number))
    elif isinstance(kind, inspect.TupleType):
        if len(value) != len(kind.item_types):
            what = f"expected {len(kind.item_types)} entries, found {len(value)}: {value!r}"
            raise StudyError(what, where=place(file, *path), mend=_mend(path))
        for number, (member, item) in enumerate(zip(value, kind.item_types, strict=True)):
            _check(member, item, file, (*path, number))
    elif isinstance(kind, (inspect.FloatType, inspect.IntType)):
        _check_number(value, kind, file, path)
    elif isinstance(kind, inspect.StrType) and len(value) < (kind.min_length or 0):
        raise StudyError("the text is empty", where=place(file, *path), mend=_mend(path))
    return None


def _fits(value: Any, kind: inspect.Type) -> bool:
    """Tell whether a value is of this kind, its inside not looked at."""
    while isinstance(kind, inspect.Metadata):
        kind = kind.type
    if isinstance(kind, inspect.FloatType):
        return isinstance(value, (int, float)) and not isinstance(value, bool)
    if isinstance(kind, inspect.IntType):
        return isinstance(value, int) and not isinstance(value, bool)
    if isinstance(kind, inspect.BoolType):
        return isinstance(value, bool)
    if isinstance(kind, (inspect.StructType, inspect.DictType)):
        return isinstance(value, Mapping)
    if isinstance(kind, (inspect.ListType, inspect.TupleType)):
        return isinstance(value, list)
    return isinstance(value, str)  # a text, or a choice


def _word(kind: inspect.Type) -> str:
    while isinstance(kind, inspect.Metadata):
        kind = kind.type
    if isinstance(kind, inspect.LiteralType):
        return " or ".join(f'"{choice}"' for choice in kind.values)
    return _WORDS.get(type(kind), "another value")


def _wrong(value: Any, word: str, file: str, path: tuple[str | int, ...]) -> StudyError:
    return StudyError(
        f"expected {word}, found {value!r}", where=place(file, *path), mend=_mend(path)
    )


def _check_table(
    value: Mapping[str, Any], kind: inspect.StructType, file: str, path: tuple[str | int, ...]
) -> None:
    fields = {field.encode_name: field for field in kind.fields}
    for name in value:
        if name not in fields:
            raise StudyError(
                f"unknown key {name!r}",
                where=place(file, *path, name),
                mend=suggestion(name, fields, "keys"),
            )
    for name, field in fields.items():
        if name in value:
            _check(value[name], field.type, file, (*path, name))
        elif field.required:
            raise missing(name, file, *path)


def missing(name: str, file: str, *path: str | int) -> StudyError:
    """Return the error of a key that the table at `path` lacks."""
    return StudyError(
        f"the key {name!r} is missing", where=place(file, *path), mend=_mend((*path, name))
    )


def _check_choice(
    value: str, kind: inspect.LiteralType, file: str, path: tuple[str | int, ...]
) -> None:
    if value in kind.values:
        return
    raise StudyError(
        f"unknown {path[-1]} {value!r}",
        where=place(file, *path),
        mend=suggestion(value, [str(choice) for choice in kind.values], "choices"),
    )


def _check_number(
    value: float,
    kind: inspect.FloatType | inspect.IntType,
    file: str,
    path: tuple[str | int, ...],
) -> None:
    try:
        number = float(value)
    except OverflowError:
        number = math.inf
    if not math.isfinite(number):
        raise StudyError(
            f"{path[-1]} is not a finite number", where=place(file, *path), mend=_mend(path)
        )
    if kind.gt is not None and not number > kind.gt:
        raise StudyError(
            f"{value!r} is not above {kind.gt:g}", where=place(file, *path), mend=_mend(path)
        )
    if kind.ge is not None and not number >= kind.ge:
        raise StudyError(
            f"{value!r} is below {kind.ge:g}", where=place(file, *path), mend=_mend(path)
        )
    if kind.le is not None and not number <= kind.le:
        raise StudyError(
            f"{value!r} is above {kind.le:g}", where=place(file, *path), mend=_mend(path)
        )


def _mend(path: tuple[str | int, ...]) -> str:
    """Return the meaning of a key as the docs have it: the innermost of `path` that has one."""
    if path[2:3] == ("conformers",) and len(path) > 4 and model_key(path) not in meanings():
        path = (*path[:2], *path[4:])  # a key of a species too
    for end in range(len(path), 0, -1):
        meaning = meanings().get(model_key(path[:end]))
        if meaning is not None:
            return f"{model_key(path[:end])}: {meaning}"
    return "see docs/study-file.md"


def model_key(path: tuple[str | int, ...]) -> str:
    """Return the dotted key of a place: names of species and numbers of entries are left open.

    >>> model_key(("species", "SO3", "energy")), model_key(("steps", 0, "rate"))
    ('species.NAME.energy', 'steps.rate')
    """
    words = [part for part in path if isinstance(part, str)]
    if len(words) > 1 and words[0] in ("species", "levels", "isotopologues"):
        words[1] = "NAME"
    if len(words) > 2 and words[:2] == ["formation", "reference"]:
        words[2] = "NAME"
    return ".".join(words)


@lru_cache(maxsize=1)
def meanings() -> dict[str, str]:
    """Return the meaning of every key of the model, by dotted key."""
    return {key: meaning for key, _, meaning in documented_keys()}


def documented_keys() -> list[tuple[str, str, str]]:
    """Return key, default and meaning of every key: the rows of the table in ``docs/study-file.md``.

    The default is ``"required"`` where the key must be given and empty where there is none.
    """
    rows: list[tuple[str, str, str]] = []
    _document(_model(), "", rows)
    return rows


_DOCUMENTED_BEFORE = "as in `[species.NAME]`"


def _document(kind: inspect.Type, prefix: str, rows: list[tuple[str, str, str]]) -> None:
    """Add the keys of every table inside `kind`, but of those whose meaning points elsewhere."""
    if isinstance(kind, inspect.Metadata):
        _document(kind.type, prefix, rows)
    elif isinstance(kind, inspect.UnionType):
        for member in kind.types:
            _document(member, prefix, rows)
    elif isinstance(kind, inspect.DictType):
        _document(kind.value_type, f"{prefix}NAME.", rows)
    elif isinstance(kind, inspect.ListType):
        _document(kind.item_type, prefix, rows)
    elif isinstance(kind, inspect.StructType):
        # a conformer has the keys of a species, which are documented there
        skipped = StructureKeys.__struct_fields__ if kind.cls is ConformerKeys else ()
        for field in kind.fields:
            if field.encode_name in skipped:
                continue
            key = f"{prefix}{field.encode_name}"
            if isinstance(field.type, inspect.Metadata):
                meaning = (field.type.extra_json_schema or {}).get("description", "")
                if meaning:
                    rows.append((key, _default(field), meaning))
                if meaning.startswith(_DOCUMENTED_BEFORE):
                    continue
            _document(field.type, f"{key}.", rows)


def _default(field: inspect.Field) -> str:
    if field.required:
        return "required"
    value = field.default
    if isinstance(value, (bool, int, float, str)):
        return f"`{json.dumps(value)}`"  # as TOML has it
    return ""
