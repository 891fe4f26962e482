"""Alternatives: the answers of a study at its other levels of theory and with each choice made otherwise."""

from __future__ import annotations

from collections.abc import Callable
from typing import Protocol

from thermo_pp.errors import Finding, StudyError
from thermo_pp.kinetics.doubt.assess import answers
from thermo_pp.kinetics.doubt.results import AlternativeAnswer
from thermo_pp.study import choices
from thermo_pp.study.choices import ONSETS_CM, SCALES, Alternative, alternatives, not_made


class StudyLike(choices.StudyLike, Protocol):
    """What this needs of a study."""

    @property
    def level(self) -> str | None: ...  # noqa: D102
    @property
    def level_names(self) -> tuple[str, ...]: ...  # noqa: D102
    def at_level(self, level: str) -> choices.StudyLike: ...  # noqa: D102


def alternative_answers(
    study: StudyLike,
) -> tuple[tuple[AlternativeAnswer, ...], tuple[Finding, ...]]:
    """Return the answers at every other named level and with every other choice, one at a time.

    What cannot be made is a finding.
    """
    taken = "as the file has it" if study.level is None else study.level
    tried: list[tuple[Alternative, Callable[[], choices.StudyLike]]] = [
        (Alternative("level of theory", taken, name), lambda name=name: study.at_level(name))  # type: ignore[misc]
        for name in study.level_names
        if name != study.level
    ]
    tried += [
        (one, lambda one=one: study.altered(one.treatment, one.species))  # type: ignore[misc]
        for one in alternatives(study, ONSETS_CM, SCALES)
    ]
    found: list[AlternativeAnswer] = []
    findings: list[Finding] = []
    for alternative, made in tried:
        try:
            given = answers(made())
        except StudyError as error:
            findings.append(not_made(alternative, error))
            continue
        found.append(
            AlternativeAnswer(alternative.choice, alternative.taken, alternative.instead, given)
        )
    return tuple(found), tuple(findings)
