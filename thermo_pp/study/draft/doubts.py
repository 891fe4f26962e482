"""Doubts of a draft: every guess, and what was left out, as findings."""

from __future__ import annotations

from thermo_pp.errors import Finding
from thermo_pp.study.draft.question import Question
from thermo_pp.study.draft.text import Parts


def doubts(parts: Parts, where: str) -> tuple[Finding, ...]:
    """Return every guess of a draft, and what it leaves out, as findings.

    Parameters
    ----------
    parts : Parts
    where : str
        The folder.
    """
    found: list[Finding] = []
    guessed = [step.equation for step in parts.steps if not step.sure and step.through is not None]
    barrierless = [step.equation for step in parts.steps if step.through is None]
    if guessed:
        found.append(
            Finding(
                "guessed-step",
                "warning",
                where,
                None,
                f"not by the imaginary mode alone: {'; '.join(guessed)}",
                "look at the mode, or follow the path down from the saddle point",
            )
        )
    if barrierless:
        found.append(
            Finding(
                "guessed-barrierless",
                "note",
                where,
                None,
                f"taken as barrierless, because a complex falls apart: {'; '.join(barrierless)}",
                "add the saddle point where there is one",
            )
        )
    for without in parts.without:
        path = parts.found.saddles[without.saddle].calculation.path
        what = f"no step goes through this saddle point. {without.words[0]}"
        mend = "add the minima that it joins, or write the step by hand"
        found.append(Finding("saddle-without-step", "warning", path, None, what, mend))
    found += _choices(parts, where)
    found.append(_question_finding(parts.asked, where))
    for path, why in parts.found.left_out:
        mend = "nothing, if it does not belong to the mechanism; thermo-pp survey says more of it"
        found.append(Finding("left-out-of-draft", "note", path, None, f"not used: {why}", mend))
    return tuple(found)


def _choices(parts: Parts, where: str) -> list[Finding]:
    """Return the choices among levels of theory and conformers, and what outputs do not say."""
    found: list[Finding] = []
    if len(parts.found.levels) > 1 or len(parts.levels) > (parts.level is not None):
        words = "those of the frequency jobs" if parts.level is None else parts.level.words
        found.append(
            Finding(
                "guessed-level",
                "note",
                where,
                None,
                f"of several levels of theory: frequencies {parts.found.levels[0][0]}; energies {words}",
                "the draft lists the others; use one level for all species",
            )
        )
    for name, above in parts.above.items():
        others = ", ".join(each for each, _ in above)
        found.append(
            Finding(
                "conformer-left-out",
                "note",
                parts.found.minima[name].calculation.path,
                None,
                f"{name} stands for its conformers {others} too",
                "see that they may be left out: near in G, they add to the entropy",
            )
        )
    for name in parts.used:
        member = parts.found.minima.get(name) or parts.found.saddles[name]
        if member.declared:
            keys = ", ".join(f"{key} {value}" for key, value in member.declared.items())
            found.append(
                Finding(
                    "guessed-charge",
                    "warning",
                    member.calculation.path,
                    None,
                    f"the output does not say it; taken for {name}: {keys}",
                    "check it in the input and mend the draft",
                )
            )
    return found


def _question_finding(asked: Question | None, where: str) -> Finding:
    if asked is None:
        what = "no reactant and product were found that make the network linear"
        mend = "write [effective] and what is held in [conditions] by hand"
    else:
        what = f"from {asked.reactant} to {', '.join(asked.products)}; the temperatures"
        if asked.stated:
            what += f"; placeholders for the amounts held of {', '.join(asked.stated)}"
        mend = "put in your own temperatures and amounts"
    return Finding("guessed-conditions", "warning", where, None, f"guessed: {what}", mend)
