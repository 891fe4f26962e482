"""The closing paragraph: every sentence comes from fields of the result, and changes with them.

Each row of MUTATIONS changes one field of a result and says which sentence was there before and which
is there afterwards. Another test makes sure that no sentence of any study escapes the table.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from exact_study import BRANCHED, CYCLE, HELD, MEMBERS, STEPS, Line, Member, Plan

from thermo_pp.kinetics.results import EffectiveRate, SignChange, Window
from thermo_pp.kinetics.words import words

GRID = (260.0, 300.0, 400.0)
PLANS: dict[str, Plan] = {
    "network": BRANCHED.at(*GRID),
    "one temperature": BRANCHED,
    "cycle": CYCLE.at(*GRID),
    "backwards": replace(CYCLE.at(300.0, 1400.0), held={**HELD, "P": "0.01 mol/L"}),
    "in equilibrium": Plan(
        {
            "A": Member("CO", 0.0, 200.0),
            "P": Member("CO", 0.0, 200.0),
            "T": Member("CO", 50.0, 200.0),
        },
        (Line("A = P", "through", "T"),),
        {"reactant": "A", "product": "P"},
        {"P": "1.0 mol/L"},
    ),
    "two products": replace(
        BRANCHED.at(*GRID),
        species={**MEMBERS, "Q": Member("CH2O2", -75.0, 260.0), "TQ": Member("CH2O2", 33.0, 250.0)},
        steps=(*STEPS, Line("C1 = Q", "through", "TQ")),
        question={"reactant": "A", "product": ("P", "Q")},
    ),
}


@pytest.fixture(scope="module")
def results(tmp_path_factory: pytest.TempPathFactory) -> dict[str, EffectiveRate]:
    folder = tmp_path_factory.mktemp("studies")
    return {name: plan.load(folder).effective() for name, plan in PLANS.items()}


Mutation = Callable[[EffectiveRate], EffectiveRate]


def of(**changes: Any) -> Mutation:
    """Change fields of the result."""
    return lambda result: replace(result, **changes)


def of_rate(definition: str, **changes: Any) -> Mutation:
    """Change fields of one rate; a function is given the field's value."""

    def mutate(result: EffectiveRate) -> EffectiveRate:
        rate = result.rates[definition]  # type: ignore[index]
        assert rate is not None
        new = {
            name: change(getattr(rate, name)) if callable(change) else change
            for name, change in changes.items()
        }
        return replace(result, rates={**result.rates, definition: replace(rate, **new)})

    return mutate


def of_step(number: int, **changes: Any) -> Mutation:
    def mutate(result: EffectiveRate) -> EffectiveRate:
        steps = list(result.steps)
        steps[number] = replace(steps[number], **changes)
        return replace(result, steps=tuple(steps))

    return mutate


def approximation(called: str, /, **changes: Any) -> Callable[[Any], Any]:
    return lambda found: tuple(replace(a, **changes) if a.name == called else a for a in found)


def entry(name: str, values: list[float]) -> Callable[[Any], Any]:
    return lambda mapping: {**mapping, name: np.array(values)}


def without(name: str) -> Mutation:
    return lambda result: replace(result, rates={**result.rates, name: None})


THREE = np.array([1.0, 1.0, 1.0])
PRE = "pre-equilibrium"
# study, mutation, pattern of the sentence that goes, text of the one that comes (None: none)
MUTATIONS: list[tuple[str, Mutation, str, str | None]] = [
    # what is counted, and what is held
    (
        "network",
        of(net_reaction="B = C"),
        r"The net reaction is A \+ W = P; .*",
        "The net reaction is B = C; rates count its extent, with W at 0.02 mol/L, W2 at",
    ),
    (
        "network",
        of(held_mol_l={"W": np.array([0.5, 0.25, 0.125])}),
        r".*with W at 0\.02 mol/L.*",
        "The net reaction is A + W = P; rates count its extent, with W at 0.125 to 0.5 mol/L.",
    ),
    (
        "network",
        of(held_mol_l={}),
        r".*with W at 0\.02 mol/L.*",
        "The net reaction is A + W = P; rates count its extent.",
    ),
    # what the number is relative to
    (
        "network",
        of(subject="B"),
        r"Relative to free A \(the intermediates at steady state\) .*",
        "Relative to free B (the intermediates at steady state) the constant is ",
    ),
    (
        "network",
        of_rate("pool", rate_constant=np.array([7.0, 8.0, 9.0])),
        r"Relative to A and its intermediates together .*",
        "Relative to A and its intermediates together (what a decay experiment follows) the constant "
        "is 7 s^-1 at 260 K and 9 s^-1 at 400 K.",
    ),
    (
        "network",
        of(temperature_k=np.array([400.0, 300.0, 250.0])),
        r"Relative to free A .* at 260 K and .* at 400 K\.",
        " s^-1 at 250 K and ",
    ),
    (
        "one temperature",
        of_rate("free", rate_constant=np.array([12.345])),
        r"Relative to free A .* at 300 K\.",
        "Relative to free A (the intermediates at steady state) the constant is 12.3 s^-1 at 300 K.",
    ),
    (
        "cycle",
        of_rate("cycle", rate_constant=np.array([1.0, 2.0, 3.0])),
        r"Relative to all forms of K together .*",
        "Relative to all forms of K together the constant is 1 s^-1 at 260 K and 3 s^-1 at 400 K.",
    ),
    # direction
    (
        "backwards",
        of_rate("cycle", rate_constant=np.array([1.0, 2.0])),
        r"The net reaction runs backwards at 1400 K: the constant is below zero\.",
        None,
    ),
    (
        "network",
        of_rate("free", rate_constant=np.array([1.0, -2.0, -3.0])),
        r"Relative to free A .*",
        "The net reaction runs backwards from 300 K to 400 K: the constant is below zero.",
    ),
    # the Arrhenius energy
    (
        "network",
        of_rate("free", arrhenius_energy_kj_mol=np.array([-3.0, -2.0, -1.0])),
        r"E_a is .* above zero throughout: the reaction speeds up on heating\.",
        "E_a is -3 to -1 kJ/mol at the temperatures asked for, below zero throughout: the reaction "
        "slows down on heating.",
    ),
    (
        "network",
        of_rate("free", arrhenius_energy_kj_mol=np.array([5.0, 6.0, 7.0])),
        r"E_a is .* above zero throughout: the reaction speeds up on heating\.",
        "E_a is 5 to 7 kJ/mol at the temperatures asked for, above zero throughout: the reaction "
        "speeds up on heating.",
    ),
    (
        "network",
        of_rate("free", arrhenius_energy_kj_mol=np.array([-5.0, 6.0, 7.0])),
        r"E_a is .* above zero throughout: the reaction speeds up on heating\.",
        "E_a is -5 to 7 kJ/mol at the temperatures asked for.",
    ),
    (
        "network",
        of_rate("free", sign_changes=(SignChange(311.25, "minimum"), SignChange(350.5, "maximum"))),
        r"E_a is .* above zero throughout: the reaction speeds up on heating\.",
        "and changes its sign in between: the rate has a minimum at 311.25 K and a maximum at 350.50 K.",
    ),
    (
        "one temperature",
        of_rate("free", arrhenius_energy_kj_mol=np.array([-4.0])),
        r"E_a is .* kJ/mol at 300 K, above zero: the reaction speeds up on heating\.",
        "E_a is -4 kJ/mol at 300 K, below zero: the reaction slows down on heating.",
    ),
    (
        "in equilibrium",
        of_rate("free", arrhenius_energy_kj_mol=np.array([4.0])),
        r"E_a is not defined at 298\.15 K: the rate is 0\.",
        "E_a is 4 kJ/mol at 298.15 K, above zero: the reaction speeds up on heating.",
    ),
    # what rests
    (
        "network",
        of_rate("pool", resting_state=("C1", "A", "A")),
        r"The pool rests as .*",
        "The pool rests as C1 (",
    ),
    (
        "network",
        of_rate("pool", populations=entry("D", [0.9, 0.8, 0.7])),
        r"The pool rests as D .*",
        "The pool rests as D (80 to 90 %) from 260 K to 300 K, as A (",
    ),
    (
        "network",
        of_rate("pool", populations=None),
        r"The pool rests as .*",
        None,
    ),
    (
        "cycle",
        of_rate("cycle", resting_state=("KD", "KD", "KS")),
        r"The catalyst rests as .*",
        "The catalyst rests as KD (",
    ),
    # what controls
    (
        "network",
        of_rate("free", control=entry("TD", [2.0, 3.0, 4.0])),
        r"The saddle that controls this rate most is .*",
        "The saddle that controls this rate most is TD (control 2 to 4) at every temperature.",
    ),
    (
        "network",
        of_rate("free", control=entry("TD", [-2.0, 0.0, 0.0])),
        r"The saddle that controls this rate most is .*",
        "The saddle that controls this rate most is TD (control -2) at 260 K, ",
    ),
    (
        "network",
        of_rate("free", saddles=("T1", "T2")),
        r"The saddle that controls this rate most is T3 .*",
        "The saddle that controls this rate most is T",
    ),
    # approximations
    (
        "network",
        of_rate("free", approximations=approximation(PRE, windows=())),
        r"Pre-equilibrium holds .*",
        "Pre-equilibrium does not hold anywhere in the range; its ratio to the exact constant is ",
    ),
    (
        "network",
        of_rate(
            "free",
            approximations=approximation(PRE, windows=(Window(260.0, 400.0, True, True),)),
        ),
        r"Pre-equilibrium holds (up|from) .*",
        "Pre-equilibrium holds at every temperature of the range; its ratio to the exact constant is ",
    ),
    (
        "network",
        of_rate(
            "free",
            approximations=approximation(
                PRE,
                windows=(
                    Window(260.0, 270.5, True, False),
                    Window(290.25, 300.0, False, False),
                    Window(350.0, 400.0, False, True),
                ),
            ),
        ),
        r"Pre-equilibrium holds .*",
        "Pre-equilibrium holds up to 270.50 K and from 290.25 K to 300.00 K and from 350.00 K up; its",
    ),
    (
        "network",
        of_rate("free", approximations=approximation(PRE, ratio=np.array([1.0, 1.5, 2.0]))),
        r"Pre-equilibrium .*",
        "its ratio to the exact constant is 1 to 2;",
    ),
    # why an approximation stops
    (
        "network",
        of_step(2, reversibility=np.array([0.99, 0.98, 0.5])),
        r"Pre-equilibrium holds .*",
        "; above, at 400 K, A + W = C2 is no longer in equilibrium, its return is 0.5 of its way there.",
    ),
    (
        "network",
        of_step(2, reversibility=np.array([0.99, 0.94, 0.5])),
        r"Pre-equilibrium holds .* above, .* A \+ W = C2 .*",
        "; above, at 400 K, C1 = C2 is no longer in equilibrium, its return is 0.933 of its way there.",
    ),
    (
        "network",
        of_rate("pool", populations=entry("D", [0.9, 0.25, 0.0])),
        r"Steady state of D holds .*",
        "; below, at 300 K, D holds 25 % of the pool.",
    ),
    (
        "network",
        of_rate("free", control=entry("T2", [0.0, 0.0, 0.0])),
        r"Energetic span holds .*; above, .* by TP \(0.93\) and T2 \(0.061\).*",
        "is 0.6144 to 1.068; below, at 300 K, the control is shared by TP (0.85) and T3 (0.12).",
    ),
    (
        "network",
        of_rate("free", approximations=approximation(PRE, name="another")),
        r"Pre-equilibrium (holds|does).*",
        "Another holds",
    ),
    (
        "one temperature",
        of_rate("free", approximations=approximation(PRE, windows=())),
        r"Pre-equilibrium holds at 300 K; .*",
        "Pre-equilibrium does not hold at 300 K; its ratio to the exact constant is ",
    ),
    # free against pool
    (
        "network",
        of_rate("pool", rate_constant=lambda k: k * 0.5),
        r"(It makes no difference here|The pool's constant is) .*",
        " times that per free A: say which one is meant.",
    ),
    (
        "network",
        lambda result: of_rate("pool", rate_constant=result.rates["free"].rate_constant)(result),  # type: ignore[union-attr]
        r"The pool's constant is .*",
        "It makes no difference here (5 %) whether the rate is taken over free A or over the pool.",
    ),
    ("network", without("pool"), r"The pool's constant is .*", None),
    # several decays
    (
        "network",
        of_rate("pool", slow_share=np.array([0.5, 1.0, 0.25]), next_decay_ratio=THREE * 1000.0),
        r"Relative to .*",
        "The pool does not decay with one constant at 260 K and at 400 K: the slowest decay has a share "
        "of 0.25 to 0.5, the next is 1000 times faster.",
    ),
    (
        "network",
        of_rate("pool", slow_share=THREE, next_decay_ratio=np.array([1000.0, 19.0, 3.0])),
        r"Relative to .*",
        "The pool does not decay with one constant from 300 K to 400 K: the slowest decay has a share of "
        "1, the next is 3 to 19 times faster.",
    ),
    # the product comes back
    (
        "network",
        lambda result: of_rate(
            "relaxation",
            rate_constant=result.rates["pool"].rate_constant * [1.0, 2.0, 3.0],  # type: ignore[union-attr]
        )(result),
        r"Relative to .*",
        "Where the product stays, the relaxation is 2 to 3 times the pool's decay from 300 K to 400 K: "
        "the product comes back.",
    ),
    # branching
    (
        "two products",
        of_rate("free", branching={"P": np.array([0.5, 0.6, 0.7]), "Q": np.array([0.5, 0.4, 0.3])}),
        r"The products' shares per free reactant are .*",
        "The products' shares per free reactant are P 50 to 70 %, Q 30 to 50 %.",
    ),
    (
        "two products",
        of_rate("pool", branching={"P": THREE, "Q": 0.0 * THREE}),
        r"The products' shares per pool are .*",
        "The products' shares per pool are P 100 %, Q 0 %.",
    ),
    (
        "two products",
        of_rate("pool", branching=None),
        r"The products' shares per pool are .*",
        None,
    ),
    # limits
    (
        "network",
        of_step(0, limited=np.array([False, True, False])),
        r"Step W \+ W = W2 runs at its encounter limit at every temperature\.",
        "Step W + W = W2 runs at its encounter limit at 300 K.",
    ),
    (
        "network",
        of_step(0, limited=np.array([False, False, False])),
        r"Step W \+ W = W2 runs at its encounter limit at every temperature\.",
        None,
    ),
    (
        "network",
        of_step(0, equation="X = Y"),
        r"Step W \+ W = W2 runs .*",
        "Step X = Y runs at its encounter limit at every temperature.",
    ),
]


@pytest.mark.parametrize("number", range(len(MUTATIONS)))
def test_sentence_follows_its_field(number: int, results: dict[str, EffectiveRate]) -> None:
    study, mutate, before, after = MUTATIONS[number]
    result = results[study]
    mutated = words(mutate(result))
    gone = [sentence for sentence in result.words if re.fullmatch(before, sentence)]
    assert gone, f"no sentence like {before!r} in {result.words}"
    if before != r"Relative to .*":  # there it is the new sentence that counts
        assert any(sentence not in mutated for sentence in gone), mutated
    if after is not None:
        fresh = [sentence for sentence in mutated if sentence not in result.words]
        assert any(after in sentence for sentence in fresh), mutated
    elif number:
        assert len(mutated) < len(result.words)


N = r"-?[0-9.]+(e[+-][0-9]+)?"  # a number
RANGE = rf"{N}( to {N})?"
WHERE = rf"(at every temperature|((and )?(at {N} K|from {N} K to {N} K) ?)+)"
LIST = rf"(as|is)? ?\S+ \((control )?{RANGE}( %)?\) {WHERE}"
WHY = (
    rf"((; above|; below), at {N} K, (.+ = .+ is no longer in equilibrium, its return is {N} of its way "
    rf"there|\S+ holds {N} % of the pool|the control is shared by .+ \({N}\) and .+ \({N}\)))*"
)
TEMPLATES = [
    r"The net reaction is .+ = .+; rates count its extent(, with (.+ at .+ mol/L)+)?\.",
    rf"Relative to .+ the constant is {N} s\^-1 at {N} K( and {N} s\^-1 at {N} K)?\.",
    rf"The net reaction runs backwards {WHERE}: the constant is below zero\.",
    rf"E_a is not defined at {N} K: the rate is 0\.",
    rf"E_a is {RANGE} kJ/mol at {N} K, above zero: the reaction speeds up on heating\.",
    rf"E_a is {RANGE} kJ/mol at {N} K, below zero: the reaction slows down on heating\.",
    rf"E_a is {RANGE} kJ/mol at the temperatures asked for\.",
    rf"E_a is {RANGE} kJ/mol at the .+, above zero throughout: the reaction speeds up on heating\.",
    rf"E_a is {RANGE} kJ/mol at the .+, below zero throughout: the reaction slows down on heating\.",
    rf"E_a is {RANGE} .+ sign in between: the rate has (( and )?a (max|min)imum at {N} K)+\.",
    rf"The pool rests {LIST}(, {LIST})*\.",
    rf"The catalyst rests {LIST}(, {LIST})*\.",
    rf"The saddle that controls this rate most {LIST}(, {LIST})*\.",
    rf".+ does not hold anywhere in the range; its ratio .+ is ({RANGE}|undefined)\.",
    rf".+ holds at every temperature of the range; its ratio .+ is {RANGE}\.",
    rf".+ holds (up to|from) {N} K.*; its ratio .+ is {RANGE}{WHY}\.",
    rf".+ holds at {N} K; its ratio .+ is {RANGE}\.",
    rf".+ does not hold at {N} K; its ratio .+ is ({RANGE}|undefined)\.",
    r"It makes no difference here \(5 %\) whether the rate is taken over free .+ or over the pool\.",
    rf"The pool's constant is {RANGE} times that per free .+: say which one is meant\.",
    rf"The pool does not decay with one constant {WHERE}: the slowest decay has a share of {RANGE}, "
    rf"the next is {RANGE} times faster\.",
    rf"Where the product stays, the relaxation is {RANGE} times the pool's decay {WHERE}: "
    r"the product comes back\.",
    r"The products' shares per free reactant are .+ %\.",
    r"The products' shares per pool are .+ %\.",
    rf"Step .+ = .+ runs at its encounter limit {WHERE}\.",
]


def test_every_sentence_is_in_the_table(results: dict[str, EffectiveRate]) -> None:
    """A new sentence needs a template, and every template a row of the table that changes it."""
    touched = set()
    for study, mutate, _, _ in MUTATIONS:
        before, after = {*results[study].words}, {*words(mutate(results[study]))}
        for sentence in before ^ after:
            touched |= {template for template in TEMPLATES if re.fullmatch(template, sentence)}
    assert [template for template in TEMPLATES if template not in touched] == []
    for result in results.values():
        for sentence in result.words:
            matching = [template for template in TEMPLATES if re.fullmatch(template, sentence)]
            assert len(matching) == 1, (sentence, matching)


def test_words_are_those_of_the_result(results: dict[str, EffectiveRate]) -> None:
    """They are worked out from the finished result and nothing else; none stands there for every study."""
    for result in results.values():
        assert result.words == words(result)
        assert words(replace(result, words=())) == result.words
        assert words(replace(result, findings=())) == result.words
        assert all(sentence.endswith(".") and sentence[0].isupper() for sentence in result.words)
        assert len({*result.words}) >= len(result.words) - 3  # free and pool may share a sentence
    everywhere = set.intersection(*({*result.words} for result in results.values()))
    assert everywhere == set()


def test_nothing_is_said_of_what_does_not_apply(results: dict[str, EffectiveRate]) -> None:
    cycle = " ".join(results["cycle"].words)
    assert "pool" not in cycle
    assert "relaxation" not in cycle
    assert "products' shares" not in " ".join(results["network"].words)
    nothing = replace(
        results["network"], rates=dict.fromkeys(results["network"].rates), steps=(), held_mol_l={}
    )
    assert words(nothing) == ("The net reaction is A + W = P; rates count its extent.",)


CHANGES: dict[str, tuple[dict[str, Member], str]] = {
    "sign": (
        {"T2": Member("CH2O2", -30.0, 251.0), "TP": Member("CH2O2", -15.0, 255.0)},
        "the reaction slows down on heating.",
    ),
    "rest": ({"C1": Member("CH2O2", -80.0, 250.0)}, "The pool rests as C1 ("),
    "decays": (
        {"D": Member("CH2O2", -75.0, 250.0), "TD": Member("CH2O2", 32.0, 240.0)},
        "The pool does not decay with one constant ",
    ),
    "return": ({"P": Member("CH2O2", -25.0, 220.0)}, "the product comes back."),
    "limit": (
        {"T1": Member("CH2O2", -90.0, 330.0)},
        "Step A + W = C1 runs at its encounter limit",
    ),
    "control": (
        {"T4": Member("CH4O3", -60.0, 310.0), "T3": Member("CH4O3", -55.0, 300.0)},
        "The saddle that controls this rate most is T1 (",
    ),
}


@pytest.mark.parametrize(("change", "appears"), CHANGES.values(), ids=CHANGES)
def test_sentences_follow_the_network(
    change: dict[str, Member], appears: str, results: dict[str, EffectiveRate], tmp_path: Path
) -> None:
    """Energies moved instead of fields: the sentence that was not there comes."""
    plan = replace(BRANCHED.at(260.0, 300.0), species={**MEMBERS, **change})
    before = " ".join(results["network"].words)
    assert appears not in before
    assert appears in " ".join(plan.load(tmp_path).effective().words)
