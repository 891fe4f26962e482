"""Alternatives: the answers of a study with each choice made otherwise, its level of theory among them."""

from __future__ import annotations

from thermo_pp.errors import Finding, ThermoError
from thermo_pp.kinetics.doubt.assess import answers
from thermo_pp.kinetics.doubt.results import AlternativeAnswer
from thermo_pp.study.choices import not_made
from thermo_pp.study.otherwise import ONSETS_CM, SCALES, StudyLike, alternatives


def alternative_answers(
    study: StudyLike,
) -> tuple[tuple[AlternativeAnswer, ...], tuple[Finding, ...]]:
    """Return the answers with every other choice, one at a time.

    What cannot be made is a finding.
    """
    found: list[AlternativeAnswer] = []
    findings: list[Finding] = []
    for one in alternatives(study, ONSETS_CM, SCALES):
        try:
            given = answers(one.of(study))
        except ThermoError as error:
            findings.append(not_made(one, error))
            continue
        found.append(AlternativeAnswer(one.choice, one.taken, one.instead, given))
    return tuple(found), tuple(findings)
