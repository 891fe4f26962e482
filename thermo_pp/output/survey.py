"""The tables and the JSON answer of ``survey``."""

from __future__ import annotations

import os
from collections import Counter
from dataclasses import asdict
from pathlib import Path
from typing import Any

from thermo_pp.audit.survey import Survey, SurveyedFile, Verdict
from thermo_pp.output.json_text import answer
from thermo_pp.output.notes import stamp
from thermo_pp.output.tables import Block, Cell, Column, Table

_KEYS = (
    "path", "reader", "program", "program_version", "method", "basis", "formula", "charge",
    "multiplicity", "energy_hartree", "modes", "imaginary_modes", "lowest_mode_cm", "optimised",
    "ended_normally", "verdict",
)  # fmt: skip
NAMED = 8
"""How many files that no reader claims are named one by one."""


def tables(survey: Survey) -> list[Block]:
    """Return one row a file; levels of theory are numbered and written out below."""
    folder = _common_folder([file.path for file in survey.files])
    levels = _levels(survey)
    columns = [
        Column("File"),
        Column("Level"),
        Column("Formula"),
        Column("q", latex="$q$"),
        Column("2S+1", latex="$2S+1$"),
        Column("E", "Eₕ", "$E$", decimals=6),
        Column("modes"),
        Column("imag."),
        Column("lowest", "cm⁻¹", decimals=1),
        Column("Verdict"),
    ]
    rows = [
        [
            os.path.relpath(file.path, folder) if folder else file.path,
            levels.get(_level(file)),
            file.formula,
            file.charge,
            file.multiplicity,
            file.energy_hartree,
            file.modes,
            file.imaginary_modes,
            file.lowest_mode_cm,
            file.verdict,
        ]
        for file in survey.files
    ]
    notes = [f"Level {number}: {words}." for words, number in levels.items()]
    notes += _skipped(survey)
    notes += [*_verdicts(survey), stamp()]
    title = f"{_count(len(survey.files), 'output')}" + (f" in {folder}" if folder else "")
    return [Table(title, columns, rows, notes)]


def wide(survey: Survey) -> list[Block]:
    """Return the one table for CSV: what JSON has of each file."""
    units = {"energy_hartree": ("energy", "hartree"), "lowest_mode_cm": ("lowest mode", "cm^-1")}
    columns = [Column(*units.get(key, (key.replace("_", " "),))) for key in _KEYS]
    rows: list[list[Cell]] = [[_flag(getattr(file, key)) for key in _KEYS] for file in survey.files]
    return [Table("survey", columns, rows)]


def keys(survey: Survey) -> dict[str, Any]:
    """Return the JSON answer."""
    return answer(
        "survey",
        survey.findings,
        None,
        files=[{key: getattr(file, key) for key in _KEYS} for file in survey.files],
        skipped=[asdict(skipped) for skipped in survey.skipped],
    )


def _flag(value: Any) -> Cell:
    return {True: "yes", False: "no"}[value] if isinstance(value, bool) else value


def _level(file: SurveyedFile) -> str:
    program = " ".join(filter(None, (file.program, file.program_version)))
    return f"{file.level}, {program}" if file.level else ""


def _levels(survey: Survey) -> dict[str, int]:
    """Return a number for each level of theory, in the order in which they come."""
    words = dict.fromkeys(filter(None, map(_level, survey.files)))
    return {text: number for number, text in enumerate(words, start=1)}


def _skipped(survey: Survey) -> list[str]:
    """Return what was left out, counted by reason and named while they are few."""
    notes = []
    for reason, count in Counter(skipped.reason for skipped in survey.skipped).items():
        note = f"Left out, {reason}: {count}"
        names = [skipped.path for skipped in survey.skipped if skipped.reason == reason]
        if reason != "hidden" and len(names) <= NAMED:
            note += f" ({', '.join(names)})"
        notes.append(note + ".")
    return notes


def _verdicts(survey: Survey) -> list[str]:
    counts = Counter(file.verdict for file in survey.files)
    order: tuple[Verdict, ...] = ("ok", "note", "warning", "error")
    said = ", ".join(f"{counts[verdict]} {verdict}" for verdict in order if counts[verdict])
    return [f"Verdict is the worst finding of a file: {said}."] if said else []


def _count(number: int, noun: str) -> str:
    return f"{number} {noun}" + ("" if number == 1 else "s")


def _common_folder(paths: list[str]) -> str:
    """Return the folder that all paths share; empty where there is none."""
    if not paths:
        return ""
    try:
        return os.path.commonpath([str(Path(path).parent) for path in paths])
    except ValueError:  # absolute and relative ones mixed
        return ""
