"""Graph and paths: nodes, ways, states along them, cycles, and no time lost in large networks."""

from __future__ import annotations

import time
from collections import Counter

import pytest
from mechanisms import mechanism, plume

from thermo_pp.errors import StudyError
from thermo_pp.graph import check_reach, loose, node_names
from thermo_pp.mechanism import Mechanism
from thermo_pp.paths import MOST_PATHS, Path, filled_up, find_paths

HELD = ("W", "W2")


def names(paths: tuple[Path, ...]) -> list[str]:
    return [path.name for path in paths]


def states(path: Path) -> list[str]:
    return [state.name for state in path.states]


def content(mechanism: Mechanism, path: Path) -> set[tuple[tuple[str, int], ...]]:
    return {tuple(sorted(mechanism.content(dict(state.species)).items())) for state in path.states}


def test_nodes() -> None:
    assert node_names(plume(), HELD) == ("SO3", "C1", "C2", "acid")
    assert node_names(plume(), ()) == ("SO3", "W", "W2", "C1", "C2", "acid")
    # reactant and product never count as held
    assert node_names(plume(), ("W", "W2", "SO3", "acid")) == ("SO3", "C1", "C2", "acid")


def test_what_is_loose_in_a_step() -> None:
    assisted = plume().steps[5]
    assert loose(assisted, plume(), HELD) == ({"C2": 1}, {"acid": 1})
    assert loose(assisted, plume(), ()) == ({"C2": 1}, {"acid": 1, "W": 1})


def test_paths_of_the_bundled_mechanism() -> None:
    found, findings = find_paths(plume(), HELD)
    assert findings == ()
    assert names(found) == [
        "SO3 → C1 → acid",
        "SO3 → C2 → acid",
        "SO3 → C1 → C2 → acid",
        "SO3 → C2 → C1 → acid",
    ]
    assert [states(path) for path in found] == [
        ["SO3 + W", "C1", "TS1", "acid"],
        ["SO3 + W2", "C2", "TS2", "acid + W"],
        ["SO3 + 2 W", "C1 + W", "C2", "TS2", "acid + W"],
        ["SO3 + W2", "C2", "C1 + W", "TS1 + W", "acid + W"],
    ]
    assert [path.net_reaction for path in found] == [
        "SO3 + W = acid",
        "SO3 + W2 = acid + W",
        "SO3 + W = acid",
        "SO3 + W2 = acid + W",
    ]
    assert found[3].forward == (True, False, True)
    saddle = found[0].states[2]
    assert (saddle.kind, saddle.step) == ("saddle", 4)


def test_all_states_of_a_path_have_one_composition() -> None:
    for path in find_paths(plume(), HELD)[0]:
        assert len(content(plume(), path)) == 1


def test_filled_up_paths_have_one_composition_together() -> None:
    found, _ = find_paths(plume(), HELD)
    full = filled_up(found, plume(), HELD)
    assert states(full[0]) == ["SO3 + 2 W", "C1 + W", "TS1 + W", "acid + W"]
    assert states(full[1]) == states(found[1])
    assert len(set.union(*(content(plume(), path) for path in full))) == 1
    assert [path.net for path in full] == [path.net for path in found]


def test_a_path_that_nothing_fills_up_is_left_alone() -> None:
    letters = {"A": "a", "B": "ab", "P": "a", "Q": "ab", "R": "ab", "X": "b"}
    both = mechanism(
        "A = P | P", "A + X = Q", "Q = P + X", letters=letters, reactant="A", products=("P",)
    )
    found, _ = find_paths(both, ())
    assert [states(path)[0] for path in filled_up(found, both, ())] == ["A + X", "A + X"]
    charged = Mechanism(
        both.steps, both.composition, "A", ("P",), charge={"X": 1, "Q": 1}, where="study.toml"
    )
    assert [states(path)[0] for path in filled_up(found, charged, ("X",))] == ["A + X", "A + X"]
    assert states(filled_up(found[:1], both, ())[0])[0] == "A"


def test_paths_without_anything_held() -> None:
    found, _ = find_paths(plume(), ())
    assert names(found) == [
        "SO3 → C1 → acid",
        "SO3 → C2 → acid",
        "SO3 → C1 → C2 → acid",
        "SO3 → C2 → C1 → acid",
    ]
    for path in found:
        assert len(content(plume(), path)) == 1


def test_parallel_steps_make_two_paths() -> None:
    two = mechanism("A = P | T1", "A = P | T2", reactant="A", products=("P",))
    found, _ = find_paths(two, ())
    assert names(found) == ["A → P (steps 1)", "A → P (steps 2)"]


def test_a_path_ends_with_its_first_product() -> None:
    chain = mechanism("A = B", "B = P", "P = Q", "Q = B", reactant="A", products=("P", "Q"))
    found, _ = find_paths(chain, ())
    assert names(found) == ["A → B → P", "A → B → Q"]
    behind = mechanism("A = P", "P = Q", reactant="A", products=("P",))
    assert names(find_paths(behind, ())[0]) == ["A → P"]
    (finding,) = check_reach(behind, ())
    assert finding.what == ("Q is reached from A only through a product: no share in the rate")


def test_two_products_of_one_step() -> None:
    split = mechanism("A = C", "C = P + Q", reactant="A", products=("P", "Q"))
    assert check_reach(split, ()) == ()
    assert [path.net_reaction for path in find_paths(split, ())[0]] == ["A = P + Q"]


def test_a_reactant_that_meets_itself() -> None:
    nitric = mechanism("NO + NO = N2O2", "N2O2 + O2 = NO2 + NO2", reactant="NO", products=("NO2",))
    (path,), _ = find_paths(nitric, ("O2",))
    assert states(path) == ["2 NO + O2", "N2O2 + O2", "2 NO2"]
    assert path.net_reaction == "2 NO + O2 = 2 NO2"


def test_a_product_that_helps_its_own_making() -> None:
    helped = mechanism("A + P = X", "X = P + P", reactant="A", products=("P",))
    (path,), _ = find_paths(helped, ())
    assert states(path) == ["A + P", "X", "2 P"]
    assert path.net_reaction == "A = P"


def test_no_way() -> None:
    apart = mechanism("A = B", "C = P", reactant="A", products=("P",))
    with pytest.raises(StudyError) as caught:
        find_paths(apart, ())
    assert caught.value.what == "no way from A to P: A leads to B and no further"
    alone = mechanism("B = C", "C = P", "W + A = W2", reactant="A", products=("P",))
    with pytest.raises(StudyError, match="no way from A to P: A leads nowhere"):
        check_reach(alone, ("W", "W2"))


def test_a_state_that_is_not_reached_is_named() -> None:
    lost = mechanism("A = P", "X = Y", "Y = Z", reactant="A", products=("P",))
    (finding,) = check_reach(lost, ())
    assert (finding.code, finding.severity) == ("not-reached", "warning")
    assert finding.what == "X, Y, Z are not reached from A by any step: no share in the rate"


def test_a_catalytic_cycle() -> None:
    cycle = mechanism(
        "cat + S = X", "X = Y", "Y = cat + P", "cat + I = R", catalyst="cat", products=("P",)
    )
    (path,), _ = find_paths(cycle, ("S", "I"))
    assert path.cycle
    assert path.name == "cat → X → Y → cat"
    assert states(path) == ["cat + S", "X", "Y", "cat + P"]
    assert path.net_reaction == "S = P"


def test_a_cycle_is_found_in_the_direction_that_makes_the_product() -> None:
    backward = mechanism("X = cat + S", "cat + P = X", catalyst="cat", products=("P",))
    (path,), _ = find_paths(backward, ("S", "P"))
    assert path.steps == (0, 1)
    assert path.forward == (False, False)
    assert path.net_reaction == "S = P"


def test_a_cycle_beside_the_free_catalyst() -> None:
    aside = mechanism("pre = cat", "cat + S = X", "X = cat + P", catalyst="pre", products=("P",))
    (path,), _ = find_paths(aside, ("S",))
    assert path.name == "cat → X → cat"


def test_no_cycle() -> None:
    chain = mechanism("cat + S = X", "X = Y + P", catalyst="cat", products=("P",))
    with pytest.raises(StudyError) as caught:
        find_paths(chain, ("S",))
    assert caught.value.what == "no cycle of cat makes P"


def test_declared_paths() -> None:
    declared = plume(paths=((0, 3, 5), (1, 2, 5)), path_names=("by the dimer", "one by one"))
    found, _ = find_paths(declared, HELD)
    assert names(found) == ["by the dimer", "one by one"]
    assert states(found[0]) == ["SO3 + 2 W", "SO3 + W2", "C2", "TS2", "acid + W"]
    assert found[0].net_reaction == "SO3 + W = acid"
    assert states(found[1]) == ["SO3 + 2 W", "C1 + W", "C2", "TS2", "acid + W"]


def test_a_declared_path_finds_its_directions() -> None:
    declared = plume(paths=((3, 2, 4),), path_names=("round",))
    (path,), _ = find_paths(declared, HELD)
    assert path.forward == (True, False, True)
    backward = plume(paths=((3, ~2, 4),), path_names=("round",))
    assert find_paths(backward, HELD)[0][0].forward == (True, False, True)


def test_a_declared_path_needs_no_question() -> None:
    declared = plume(reactant=None, products=(), paths=((1, 4),), path_names=("direct",))
    (path,), _ = find_paths(declared, HELD)
    assert states(path) == ["SO3 + W", "C1", "TS1", "acid"]
    turned = plume(reactant=None, products=(), paths=((~4, 1),), path_names=("back",))
    (path,), _ = find_paths(turned, HELD)
    assert states(path) == ["acid", "TS1", "C1", "SO3 + W"]


def test_a_declared_path_that_does_not_hang_together() -> None:
    broken = plume(paths=((1, 5),), path_names=("x",))
    with pytest.raises(StudyError) as caught:
        find_paths(broken, HELD)
    assert caught.value.what == "step 6 ('C2 = acid + W') does not go on from C1"
    assert caught.value.where == "study.toml [paths.1] steps"


def test_neither_question_nor_paths() -> None:
    with pytest.raises(StudyError) as caught:
        find_paths(plume(reactant=None, products=()), HELD)
    assert caught.value.what == "nothing says where a path begins and ends"
    assert caught.value.mend == (
        "add [effective] with reactant (or catalyst) and product, or declare [[paths]]"
    )


def ladder(rungs: int) -> list[str]:
    """Two rails with every crossing: 2**rungs paths and more."""
    equations = []
    for k in range(rungs):
        equations += [f"A{k} = A{k + 1}", f"B{k} = B{k + 1}"]
        equations += [f"A{k} = B{k + 1}", f"B{k} = A{k + 1}"]
    return equations


def dead_end(rungs: int) -> list[str]:
    """A ladder that leads nowhere, hung on A0."""
    return ["A0 = X0", *(text.replace("A", "X").replace("B", "Y") for text in ladder(rungs))]


def test_paths_are_capped_with_a_finding() -> None:
    large = mechanism(*ladder(20), "A20 = P", reactant="A0", products=("P",))
    start = time.perf_counter()
    found, (finding,) = find_paths(large, ())
    assert time.perf_counter() - start < 10.0  # 0.3 s; 2**20 paths would take hours
    assert len(found) == MOST_PATHS
    assert (finding.code, finding.severity) == ("paths-capped", "warning")
    assert finding.what == (
        "the steps make more paths than the 64 that are shown; no rate depends on this"
    )
    assert len(set(names(found))) == MOST_PATHS
    for path in found:
        assert Counter(path.nodes).most_common(1)[0][1] == 1


def test_no_time_is_lost_in_dead_ends() -> None:
    trap = mechanism(*dead_end(25), "A0 = A1", "A1 = P", reactant="A0", products=("P",))
    start = time.perf_counter()
    found, findings = find_paths(trap, ())
    assert (
        time.perf_counter() - start < 10.0
    )  # 1 ms; wandering through the dead end would take hours
    assert names(found) == ["A0 → A1 → P"]
    assert findings == ()


def test_exactly_as_many_paths_as_the_cap_is_not_capped() -> None:
    two = mechanism("A = P | T1", "A = P | T2", reactant="A", products=("P",))
    found, findings = find_paths(two, (), most=2)
    assert len(found) == 2
    assert findings == ()
    found, (finding,) = find_paths(two, (), most=1)
    assert len(found) == 1
    assert finding.code == "paths-capped"


def test_cycles_are_capped_too() -> None:
    many = mechanism(*ladder(14), "cat + S = A0", "A14 = cat + P", catalyst="cat", products=("P",))
    start = time.perf_counter()
    found, findings = find_paths(many, ("S",))
    assert time.perf_counter() - start < 10.0
    assert found
    assert [finding.code for finding in findings] == ["paths-capped"]
