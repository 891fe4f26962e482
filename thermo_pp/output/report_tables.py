"""The tables of a report: each answer as csv, Markdown, LaTeX and HTML, and all in one workbook."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path

from thermo_pp.names import EnergyUnit
from thermo_pp.output import (
    barrier,
    barrier_tables,
    choices,
    compare,
    conformers,
    courses,
    doubt,
    energies,
    isotopes,
    profile,
    regimes,
    selectivity,
    study_species,
)
from thermo_pp.output.columns import check_columns, select
from thermo_pp.output.delimited import csv_text
from thermo_pp.output.files import write_file
from thermo_pp.output.html import html_document
from thermo_pp.output.latex import latex, latex_document
from thermo_pp.output.notes import for_a_report
from thermo_pp.output.plain import markdown
from thermo_pp.output.tables import Block, Table
from thermo_pp.output.workbook import workbook
from thermo_pp.study.answers import Answers

_INPUTS = r"\input{%s-body}"


@dataclass(frozen=True)
class Shown:
    """One answer as tables.

    Attributes
    ----------
    name : str
        ``"profile"``, ``"barrier"`` and so on: the name of its files.
    people : sequence of Table or str
        Rounded, a choice of the temperatures.
    wide : sequence of Table or str
        Every temperature, all digits.
    """

    name: str
    people: Sequence[Block]
    wide: Sequence[Block]


def shown(
    answers: Answers, unit: EnergyUnit = "kJ/mol", columns: Sequence[str] = ()
) -> tuple[Shown, ...]:
    """Return every answer that applies, as tables.

    Parameters
    ----------
    answers : Answers
    unit : str
        Of energies.
    columns : sequence of str
        The columns shown, in their order; none: all. Each must be one of some table.

    Raises
    ------
    StudyError
        No table has a column of that name.
    """
    found = tuple(make(answers, unit) for make in _MAKERS)
    there = [one for one in found if one is not None]
    if columns:
        both = [block for one in there for block in (*one.people, *one.wide)]
        check_columns(both, columns, where="--columns")
        there = [
            Shown(one.name, select(one.people, columns), select(one.wide, columns)) for one in there
        ]
    return tuple(Shown(one.name, for_a_report(one.people), one.wide) for one in there)


def write_tables(
    answers: Answers, folder: Path, *, unit: EnergyUnit = "kJ/mol", columns: Sequence[str] = ()
) -> None:
    """Write the tables of a study into a folder, which must be there or have a parent that is.

    ``NAME.csv`` (all digits), ``NAME.md``, ``NAME.html``, ``NAME.tex`` (compiles as it stands) and
    ``NAME-body.tex`` (for ``\\input``) of each answer, and ``tables.xlsx``.

    Parameters
    ----------
    answers, unit, columns
        See `shown`.
    folder : Path
    """
    folder.mkdir(exist_ok=True)
    sheets: list[Block] = []
    for one in shown(answers, unit, columns):
        body = latex(one.people)
        write_file(folder / f"{one.name}.csv", csv_text(one.wide))
        write_file(folder / f"{one.name}.md", markdown(one.people))
        write_file(folder / f"{one.name}.html", html_document(one.people, one.name))
        write_file(folder / f"{one.name}-body.tex", body)
        write_file(folder / f"{one.name}.tex", latex_document(_INPUTS % one.name))
        sheets += [block for block in one.wide if isinstance(block, Table)]
    write_file(folder / "tables.xlsx", workbook(sheets))


def _profile(answers: Answers, unit: EnergyUnit) -> Shown | None:
    study, found = answers.study, answers.profile
    if found is None:
        return None
    treatment, levels = study.treatment, study.levels
    return Shown(
        "profile",
        profile.tables(found, treatment, unit, levels),
        profile.wide(found, treatment, unit, levels),
    )


def _barrier(answers: Answers, unit: EnergyUnit) -> Shown | None:
    study, found = answers.study, answers.effective
    if found is None:
        return None
    treatment, levels = study.treatment, study.levels
    people, wide = [], []
    if answers.transient is not None:
        people += courses.time_course_tables(answers.transient, unit)
        wide += courses.time_course_wide(answers.transient, unit)
    if answers.flow is not None:
        people += courses.flow_tables(answers.flow, unit, people=True)
        wide += courses.flow_tables(answers.flow, unit, people=False)
    regime, ratio = answers.regimes, answers.selectivity
    people += barrier_tables.tables(found, treatment, unit, levels, regime, ratio, answers.doubt)
    if any(found.rates.values()):
        wide = [*barrier.wide(found, treatment, unit, levels), *wide]
    else:
        wide = [barrier.steps_wide(found, unit), *wide]
    wide += [] if ratio is None else selectivity.wide(ratio, unit)
    wide += [] if regime is None else regimes.wide(regime, unit)
    wide += [] if answers.doubt is None else doubt.doubt_wide(answers.doubt, unit)
    return Shown("barrier", people, wide)


def _species(answers: Answers, unit: EnergyUnit) -> Shown:
    study = answers.study
    given = (study.species, answers.species, study.treatment, unit, study.levels)
    parts = energies.tables(study.energies)
    people = [*study_species.tables(*given), *parts]
    return Shown("species", people, [*study_species.wide(*given), *parts])


def _conformers(answers: Answers, unit: EnergyUnit) -> Shown | None:
    found = answers.ensembles
    if found is None:
        return None
    return Shown("conformers", conformers.tables(found, unit), conformers.wide(found, unit))


def _choices(answers: Answers, unit: EnergyUnit) -> Shown | None:
    found, treatment = answers.choices, answers.study.treatment
    if found is None or not found.rows:
        return None
    return Shown(
        "choices", choices.tables(found, treatment, unit), choices.wide(found, treatment, unit)
    )


def _isotopes(answers: Answers, unit: EnergyUnit) -> Shown | None:
    study, found = answers.study, answers.isotopes
    if not found:
        return None
    people = isotopes.tables(found, study.treatment, unit, study.levels)
    return Shown("isotopes", people, isotopes.wide(found, unit))


def _compare(answers: Answers, unit: EnergyUnit) -> Shown | None:
    study, found = answers.study, answers.comparison
    if found is None:
        return None
    people = compare.tables(found, study.treatment, unit, study.levels)
    return Shown("compare", people, compare.wide(found, study.treatment, unit))


_MAKERS: tuple[Callable[[Answers, EnergyUnit], Shown | None], ...] = (
    _profile,
    _barrier,
    _species,
    _conformers,
    _choices,
    _isotopes,
    _compare,
)
