"""Loops of held species and equilibrium species, against linear algebra by another way."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from mechanisms import holding, mechanism, plume

from thermo_pp.errors import StudyError
from thermo_pp.graph import held_apart
from thermo_pp.loops import equilibrium_of, held_loops
from thermo_pp.mechanism import Mechanism


def test_the_bundled_mechanism_has_one_loop() -> None:
    # two ways to C2 differ by the dimerisation, which is a loop of its own already
    (loop,) = held_loops(plume(), ("W", "W2"))
    assert loop.vector(("W", "W2")) == (-2, 1)
    assert loop.net_reaction == "2 W = W2"


def test_a_loop_through_nodes() -> None:
    two_ways = plume().steps[1:]
    (loop,) = held_loops(Mechanism(two_ways, plume().composition, "SO3", ("acid",)), ("W", "W2"))
    assert dict(loop.steps) in ({0: 1, 1: 1, 2: -1}, {0: -1, 1: -1, 2: 1})
    assert loop.vector(("W", "W2")) in ((-2, 1), (2, -1))


def test_a_loop_that_makes_the_product_is_not_one_of_them() -> None:
    cycle = mechanism("cat + S = X", "X = cat + P", catalyst="cat", products=("P",))
    assert held_loops(cycle, ("S", "P")) == ()
    aside = mechanism("cat + S = X", "X = cat + P", "cat + S2 = X", catalyst="cat", products=("P",))
    (loop,) = held_loops(aside, ("S", "S2", "P"))
    assert loop.vector(("S", "S2", "P")) in ((1, -1, 0), (-1, 1, 0))


def test_a_loop_in_which_nothing_changes_is_left_out() -> None:
    triangle = mechanism("A = B", "B = C", "C = A", reactant="A", products=("C",))
    assert held_loops(triangle, ()) == ()


def _rank(rows: list[list[int]]) -> int:
    return int(np.linalg.matrix_rank(np.array(rows, dtype=float))) if rows else 0


@settings(max_examples=60, deadline=None)
@given(st.data())
def test_loops_span_all_closed_loops(data: st.DataObject) -> None:
    """Rank by singular values: the loops span the image of the kernel, no more and no less."""
    free = [f"N{k}" for k in range(4)]
    held = ["H0", "H1", "H2"]
    side = st.tuples(st.sampled_from([*free, ""]), st.lists(st.sampled_from(held), max_size=2))
    equations = []
    for left, right in data.draw(st.lists(st.tuples(side, side), min_size=2, max_size=8)):
        sides = [" + ".join([*([s[0]] if s[0] else []), *s[1]]) for s in (left, right)]
        if all(sides):
            equations.append(f"{sides[0]} = {sides[1]}")
    if not equations:
        return
    made = mechanism(*equations, reactant="N0", products=("N3",))
    loops = held_loops(made, held)
    species = list(made.species)
    matrix = np.array([[step.change().get(name, 0) for step in made.steps] for name in species])
    apart = held_apart(made, held)
    inner = matrix[[name not in apart for name in species]].reshape(-1, len(made.steps))
    _, sizes, rows = np.linalg.svd(np.vstack([inner, np.zeros(len(made.steps))]))
    kernel = rows[np.sum(sizes > 1e-9) :]
    image = kernel @ matrix.T
    for loop in loops:
        vector = np.zeros(len(made.steps))
        for step, times in loop.steps:
            vector[step] = times
        assert np.all(inner @ vector == 0)
        net = {name: int(n) for name, n in zip(species, matrix @ vector, strict=True) if n}
        assert net == dict(loop.net)
        assert set(net) <= apart
    found = [list(loop.vector(held)) for loop in loops]
    assert _rank(found) == len(found) == int(np.linalg.matrix_rank(image, tol=1e-9))


def test_an_equilibrium_species() -> None:
    held = holding(W="1e-3 mol/L", W2="equilibrium")
    assert equilibrium_of(plume(), held) == {"W2": {"W": Fraction(2)}}


def test_an_equilibrium_species_by_way_of_another() -> None:
    chain = mechanism("W + W = W2", "W2 + W = W3", "A + W3 = P", reactant="A", products=("P",))
    held = holding(W3="equilibrium", W="1e-3 mol/L", W2="equilibrium")
    assert equilibrium_of(chain, held) == {"W3": {"W": 3}, "W2": {"W": 2}}


def test_coefficients_may_be_fractions_and_negative() -> None:
    halves = mechanism("W2 = W + W", "A + W = P", reactant="A", products=("P",))
    held = holding(W2="1e-6 mol/L", W="equilibrium")
    assert equilibrium_of(halves, held) == {"W": {"W2": Fraction(1, 2)}}
    exchange = mechanism("X + Y = Z + V", "A + V = P", reactant="A", products=("P",))
    held = holding(X="1 mol/L", Y="1 mol/L", Z="1 mol/L", V="equilibrium")
    assert equilibrium_of(exchange, held) == {"V": {"X": 1, "Y": 1, "Z": -1}}


def test_the_step_of_an_equilibrium_species_may_be_a_node_s() -> None:
    held = holding(W2="equilibrium")  # W is not held, so no step among held species leads to W2
    with pytest.raises(StudyError) as caught:
        equilibrium_of(plume(), held)
    assert caught.value.what == (
        "W2 is held at equilibrium, but no step among held species makes it from those held at "
        "stated values"
    )
    assert caught.value.where == "study.toml [conditions] held.W2"


def test_only_what_is_settled_counts() -> None:
    loose = mechanism("X = Y", "A + Y = P", reactant="A", products=("P",))
    with pytest.raises(StudyError, match="X is held at equilibrium, but no step"):
        equilibrium_of(loose, holding(X="equilibrium", Y="equilibrium"))


def test_the_reactant_does_not_settle_anything() -> None:
    through = mechanism("A + W = C", "C = P", reactant="A", products=("P",))
    with pytest.raises(StudyError, match="C is held at equilibrium, but no step"):
        equilibrium_of(through, holding(A="1e-9 mol/L", W="1e-3 mol/L", C="equilibrium"))


def test_two_ways_that_may_differ() -> None:
    both = mechanism("W + W = W2", "V = W2", "A + W2 = P", reactant="A", products=("P",))
    held = holding(W="1e-3 mol/L", V="1e-3 mol/L", W2="equilibrium")
    assert set(equilibrium_of(both, held)) == {"W2"}
    with pytest.raises(StudyError) as caught:
        equilibrium_of(both, held, driven=True)
    assert caught.value.what == "W2 is held at equilibrium with species that may be out of balance"
