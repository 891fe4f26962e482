"""Question of a draft: reactant, product and what is held, guessed so that the network is linear.

One species after another, the heaviest first, is taken for the one that the mechanism follows: from
it the steps are walked, and on each side one species is followed (that which has most atoms other
than hydrogen in common with where it came from, and is not held) while the others are held. The
longest walk without a contradiction is kept. Its states fall into basins, joined by barrierless
steps; the reactant is the free species of the basin of highest free energy among those at the ends
of the chain, the product that of the lowest.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

from thermo_pp.conditions import Held
from thermo_pp.errors import StudyError
from thermo_pp.formulas.bonds import LABEL, Fragment
from thermo_pp.graph import check_reach
from thermo_pp.loops import equilibrium_of
from thermo_pp.mechanism import Mechanism, Step
from thermo_pp.study.draft.ends import Names
from thermo_pp.study.draft.members import Member
from thermo_pp.study.draft.steps import ProposedStep

PLACEHOLDER = {"gas": "1e-4 mol/L", "solution": "0.1 mol/L"}
"""What is held where nothing is known."""


@dataclass(frozen=True)
class Question:
    """What a draft asks.

    Attributes
    ----------
    reactant : str
    products : tuple of str
    stated, equilibrium : tuple of str
        Species held at a stated amount, and at equilibrium with those.
    by_products : tuple of str
        Those of the stated ones that the net reaction makes.
    """

    reactant: str
    products: Names
    stated: Names = ()
    equilibrium: Names = ()
    by_products: Names = ()


@dataclass
class _Walk:
    """The states that are followed, and what is held on the way.

    Attributes
    ----------
    relative : dict of str to float
        State -> its free energy, kJ/mol, with all that was given off on the way, from the start.
    given : dict of str to Counter of str
        State -> what was given off on the way from the start, negative where taken up.
    edges : list of (str, str, bool)
        Two states, and whether a saddle point lies between them.
    held : set of str
    """

    relative: dict[str, float] = field(default_factory=dict)
    given: dict[str, Counter[str]] = field(default_factory=dict)
    edges: list[tuple[str, str, bool]] = field(default_factory=list)
    held: dict[str, None] = field(default_factory=dict)


def question(
    steps: Sequence[ProposedStep], members: Mapping[str, Member], gibbs: Mapping[str, float]
) -> Question | None:
    """Guess what a draft asks.

    Parameters
    ----------
    steps : sequence of ProposedStep
    members : mapping of str to Member
        Every species of the steps.
    gibbs : mapping of str to float
        G of each, kJ/mol.

    Returns
    -------
    Question or None
        None where no guess makes the network linear, or no saddle point lies on the way.
    """
    names = list(dict.fromkeys(name for step in steps for name in step.species))
    mass = {name: float(members[name].calculation.masses_u.sum()) for name in names}
    best: tuple[int, Question] | None = None
    for start in sorted(names, key=lambda name: (-mass[name], names.index(name))):
        walk = _walk(start, steps, members, gibbs)
        if walk is None:
            continue
        asked = _asked(walk, steps, members)
        if asked is not None and (best is None or len(walk.edges) > best[0]):
            best = len(walk.edges), asked
    return None if best is None else best[1]


def _walk(
    start: str,
    steps: Sequence[ProposedStep],
    members: Mapping[str, Member],
    gibbs: Mapping[str, float],
) -> _Walk | None:
    """Follow one species through the steps; None where a species would be followed and held."""
    walk = _Walk({start: 0.0}, {start: Counter()})
    done: set[int] = set()
    queue = [start]
    for here in queue:
        for number, step in enumerate(steps):
            sides = [step.left, step.right]
            if number in done or here not in (*step.left, *step.right):
                continue
            done.add(number)
            own, far = sides if here in sides[0] else sides[::-1]
            free = [name for name in far if name in walk.relative] or [
                name for name in far if name not in walk.held
            ]
            if not free:
                return None
            there = max(free, key=lambda name: (*_common(members[here], members[name]), name))
            off = Counter(far)
            off.subtract(Counter(own))
            off[here] += 1
            off[there] -= 1
            for name in _without(own, here) + _without(far, there):
                walk.held[name] = None
            walk.edges.append((here, there, step.through is not None))
            if there not in walk.relative:
                change = sum(gibbs[name] for name in far) - sum(gibbs[name] for name in own)
                walk.relative[there] = walk.relative[here] + change
                walk.given[there] = Counter(walk.given[here])
                walk.given[there].update(off)
                queue.append(there)
            if any(name in walk.relative for name in walk.held):
                return None
    _hold_along(walk, [step for number, step in enumerate(steps) if number not in done])
    return walk


def _hold_along(walk: _Walk, steps: Sequence[ProposedStep]) -> None:
    """Hold whatever steps that are not walked make of held species."""
    grown = True
    while grown:
        before = len(walk.held)
        for step in steps:
            if any(name in walk.held for name in step.species):
                walk.held.update(dict.fromkeys(step.species))
        grown = len(walk.held) > before


def _common(one: Member, other: Member) -> tuple[int, int, float]:
    """Return how many heavy atoms and how many atoms two species share, and the mass of the second."""
    shared = one.grouped.content & other.grouped.content
    heavy = sum(count for kind, count in shared.items() if kind % LABEL != 1)
    return heavy, shared.total(), float(other.calculation.masses_u.sum())


def _without(names: Names, one: str) -> list[str]:
    rest = list(names)
    rest.remove(one)
    return rest


def _asked(
    walk: _Walk, steps: Sequence[ProposedStep], members: Mapping[str, Member]
) -> Question | None:
    """Choose reactant and product among the states, then settle what is held."""
    basins = _basins(walk)

    def free(k: int) -> str:
        """Return the state of a basin that stands for it: one molecule, and the smallest."""
        return min(
            basins[k],
            key=lambda name: (
                len(members[name].grouped.fragments),
                len(members[name].calculation.numbers),
                walk.relative[name],
            ),
        )

    if len(basins) > 1:
        tips = sorted(_tips(walk, basins), key=lambda k: (walk.relative[free(k)], k))
        product, reactant = free(tips[0]), free(tips[-1])
    else:  # no saddle point: what is built is what is asked for
        reactant = free(0)
        product = max(basins[0], key=lambda name: len(members[name].calculation.numbers))
    if product == reactant:
        return None
    made = Counter(walk.given[product])
    made.subtract(walk.given[reactant])
    # in fragments, because a complex of two held species is as much as the two
    parts = Counter[Fragment]()
    for name, count in made.items():
        for part in members[name].grouped.fragments:
            parts[part] += count
    by_products = tuple(
        name for name in walk.held if all(parts[f] > 0 for f in members[name].grouped.fragments)
    )
    return _held(walk, steps, members, reactant, product, by_products)


def _tips(walk: _Walk, basins: Sequence[Sequence[str]]) -> list[int]:
    """Return the basins at the ends of the chain that saddle points make; all where it has none."""
    near: dict[int, set[int]] = {k: set() for k in range(len(basins))}
    for one, other, _ in walk.edges:
        a, b = _basin(one, basins), _basin(other, basins)
        if a != b:
            near[a].add(b)
            near[b].add(a)
    tips = [k for k, others in near.items() if len(others) == 1]
    return tips if len(tips) > 1 else list(near)


def _basins(walk: _Walk) -> list[list[str]]:
    """Return the states joined by barrierless steps."""
    basin = {name: {name} for name in walk.relative}
    for one, other, saddle in walk.edges:
        if not saddle:
            joined = basin[one] | basin[other]
            for name in joined:
                basin[name] = joined
    order = list(walk.relative)
    found = (tuple(sorted(each, key=order.index)) for each in basin.values())
    return [list(each) for each in dict.fromkeys(found)]


def _basin(name: str, basins: Sequence[Sequence[str]]) -> int:
    return next(k for k, basin in enumerate(basins) if name in basin)


def _held(
    walk: _Walk,
    steps: Sequence[ProposedStep],
    members: Mapping[str, Member],
    reactant: str,
    product: str,
    by_products: Names,
) -> Question | None:
    """Settle products and held species so that the program takes them; None where it does not."""
    apart = [name for name in by_products if _only_beside(name, product, steps)]
    products = (product, *apart)
    held = [name for name in walk.held if name not in apart]
    simple = {
        members[name].grouped.fragments
        for name in held
        if len(members[name].grouped.fragments) == 1
    }
    following = [
        name
        for name in held
        if len(members[name].grouped.fragments) > 1
        and all((part,) in simple for part in members[name].grouped.fragments)
    ]
    for equilibrium in dict.fromkeys((tuple(following), ())):
        stated = tuple(name for name in held if name not in equilibrium)
        asked = Question(
            reactant,
            products,
            stated,
            equilibrium,
            tuple(name for name in by_products if name in stated),
        )
        if _accepted(asked, steps):
            return asked
    return None


def _only_beside(name: str, product: str, steps: Sequence[ProposedStep]) -> bool:
    """Tell whether a by-product stands only on sides with nothing but the product beside it."""
    sides = [side for step in steps for side in (step.left, step.right) if name in side]
    return all(sorted(side) == sorted((name, product)) for side in sides)


def _accepted(asked: Question, steps: Sequence[ProposedStep]) -> bool:
    """Tell whether a study with this question loads and its network is linear."""
    mechanism = _mechanism(asked, steps)
    held = {
        **{name: Held("concentration", 1.0, "") for name in asked.stated},
        **{name: Held("equilibrium", None, "") for name in asked.equilibrium},
    }
    try:
        equilibrium_of(mechanism, held)
        check_reach(mechanism, held)
    except StudyError:
        return False
    for step in steps:
        loose = [
            Counter(name for name in side if name not in held) for side in (step.left, step.right)
        ]
        if bool(loose[0]) != bool(loose[1]):
            return False
        for side in loose:
            if sum(side.values()) > 1 and not set(side) <= set(asked.products):
                return False
    return True


def _mechanism(asked: Question, steps: Sequence[ProposedStep]) -> Mechanism:
    """Return the mechanism of a draft, without compositions."""
    return Mechanism(
        tuple(
            Step(
                step.equation,
                Counter(step.left),
                Counter(step.right),
                through=step.through,
                barrierless=step.through is None,
            )
            for step in steps
        ),
        {},
        reactant=asked.reactant,
        products=asked.products,
    )
