"""The mechanism: equations, balance, what a barrierless step may be, names."""

from __future__ import annotations

import dataclasses

import pytest
from hypothesis import given
from hypothesis import strategies as st
from mechanisms import PLUME, SULFUR, mechanism, plume, steps

from thermo_pp.errors import StudyError
from thermo_pp.mechanism import (
    check_mechanism,
    check_names,
    parse_equation,
    write_reaction,
    write_sum,
)


@pytest.mark.parametrize(
    ("text", "left", "right"),
    [
        ("SO3 + W = C1", {"SO3": 1, "W": 1}, {"C1": 1}),
        ("W + W = W2", {"W": 2}, {"W2": 1}),
        ("2 W = W2", {"W": 2}, {"W2": 1}),
        ("A=B", {"A": 1}, {"B": 1}),
        ("  A  +  2  B  =  C ", {"A": 1, "B": 2}, {"C": 1}),
        ("H3O+ + OH- = 2 H2O", {"H3O+": 1, "OH-": 1}, {"H2O": 2}),
    ],
)
def test_an_equation(text: str, left: dict[str, int], right: dict[str, int]) -> None:
    assert parse_equation(text, where="here") == (left, right)


@pytest.mark.parametrize(
    ("text", "what"),
    [
        ("A + B", "the equation 'A + B' does not have exactly one '='"),
        ("A = B = C", "the equation 'A = B = C' does not have exactly one '='"),
        ("A <=> B", "'A <' in 'A <=> B' is not a species"),
        ("A => B", "'> B' in 'A => B' is not a species"),
        ("= B", "a species is missing in '= B'"),
        ("A + = B", "a species is missing in 'A + = B'"),
        ("0 A = B", "'0 A' in '0 A = B' is not a species"),
        ("A B = C", "'A B' in 'A B = C' is not a species"),
        (f"{'9' * 5000} A = B", f"'{'9' * 5000} A' in '{'9' * 5000} A = B' is not a species"),
    ],
)
def test_no_equation(text: str, what: str) -> None:
    with pytest.raises(StudyError) as caught:
        parse_equation(text, where="here")
    assert caught.value.what == what
    assert caught.value.mend == (
        'write for instance "SO3 + W = C1"; spaces around + and =, counts as in "2 W"'
    )


@given(st.text(alphabet="AW+=2 ", max_size=14))
def test_any_equation_is_parsed_or_refused(text: str) -> None:
    try:
        sides = parse_equation(text, where="here")
    except StudyError:
        return
    assert all(side and all(count > 0 for count in side.values()) for side in sides)


@given(
    st.dictionaries(st.sampled_from(["A", "B", "W2"]), st.integers(1, 9), min_size=1),
    st.dictionaries(st.sampled_from(["A", "C", "TS"]), st.integers(1, 9), min_size=1),
)
def test_what_is_written_is_read_again(left: dict[str, int], right: dict[str, int]) -> None:
    text = f"{write_sum(left)} = {write_sum(right)}"
    assert parse_equation(text, where="here") == (left, right)


def test_change_leaves_out_what_stays() -> None:
    step = steps("C + 2 W = P + W")[0]
    assert step.change() == {"C": -1, "W": -1, "P": 1}
    assert step.molecules == (3, 2)
    assert write_reaction(step.change()) == "C + W = P"
    assert step.sides(forward=False) == (step.products, step.reactants)


def test_species_and_saddles_in_the_order_of_use() -> None:
    assert plume().species == ("W", "W2", "SO3", "C1", "C2", "acid")
    assert plume().saddles == ("TS1", "TS2")


def test_a_sound_mechanism() -> None:
    assert check_mechanism(plume()) == ()


def test_charge_is_balanced_too() -> None:
    letters = {"A": "a", "B": "b", "C": "ab"}
    sound = mechanism("A + B = C", letters=letters, charge={"A": 1, "B": -2, "C": -1})
    assert check_mechanism(sound) == ()
    broken = dataclasses.replace(sound, charge={"A": 1, "B": -2})
    with pytest.raises(StudyError) as caught:
        check_mechanism(broken)
    assert caught.value.what == (
        "the step 'A + B = C' does not balance: the right side has charge 0 instead of -1"
    )


def test_what_is_too_much_and_too_little() -> None:
    broken = mechanism("A + B = C", letters={"A": "aax", "B": "b", "C": "abbb"})
    with pytest.raises(StudyError) as caught:
        check_mechanism(broken)
    assert caught.value.what == (
        "the step 'A + B = C' does not balance: the right side has 1 a too few, 2 b too many, "
        "1 x too few"
    )
    assert caught.value.where == "study.toml [steps.1] equation"


def test_two_steps_may_share_a_saddle_point() -> None:
    letters = {"A": "ab", "B": "ab", "C": "ab", "TS": "ab"}
    assert check_mechanism(mechanism("A = B | TS", "A = C | TS", letters=letters)) == ()


@pytest.mark.parametrize("again", ["A + B = C", "C = A + B", "B + A = C"])
def test_the_same_step_twice(again: str) -> None:
    letters = {"A": "a", "B": "b", "C": "ab"}
    (finding,) = check_mechanism(mechanism("A + B = C", again, letters=letters))
    assert (finding.code, finding.severity, finding.file) == (
        "same-step-twice",
        "warning",
        "study.toml",
    )
    assert finding.what == (
        f"{again!r} and 'A + B = C' are the same step: it counts twice in every rate"
    )


def test_two_channels_with_saddle_points_of_their_own_are_two_steps() -> None:
    letters = {"A": "a", "B": "a", "T1": "a", "T2": "a"}
    assert check_mechanism(mechanism("A = B | T1", "A = B | T2", letters=letters)) == ()


@pytest.mark.parametrize("equation", ["A + B = C", "C = A + B", "A + B = D + E"])
def test_barrierless(equation: str) -> None:
    letters = {"A": "a", "B": "b", "C": "ab", "D": "b", "E": "a"}
    assert check_mechanism(mechanism(equation, letters=letters)) == ()


@pytest.mark.parametrize(
    "equation", ["A + A + B = C", "C = A + A + B", "C = D", "A + D = A + A + B"]
)
def test_not_barrierless(equation: str) -> None:
    letters = {"A": "a", "B": "b", "C": "aab", "D": "aab"}
    letters |= {"D": "ab"} if equation.startswith("A + D") else {}
    with pytest.raises(StudyError, match="cannot be barrierless") as caught:
        check_mechanism(mechanism(equation, letters=letters))
    assert caught.value.where == "study.toml [steps.1] barrier"


def test_names_on_both_sides() -> None:
    check_names(steps(*PLUME), list(SULFUR), where="study.toml")
    with pytest.raises(StudyError, match="no step uses the species 'X'"):
        check_names(steps(*PLUME), [*SULFUR, "X"], where="study.toml")
