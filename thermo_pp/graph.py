"""The graph of a mechanism: which species are nodes, which step joins which, what is reached."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass

from thermo_pp.errors import Finding, StudyError
from thermo_pp.mechanism import Mechanism, Step


def held_apart(mechanism: Mechanism, held: Collection[str]) -> frozenset[str]:
    """Return the species that count as held: reactant, products and catalyst never do."""
    return frozenset(held) - {mechanism.reactant, mechanism.catalyst} - {*mechanism.products}


def node_names(mechanism: Mechanism, held: Collection[str]) -> tuple[str, ...]:
    """Return the species that can be nodes: not held, and no product in a catalytic cycle."""
    apart = held_apart(mechanism, held)
    if mechanism.catalyst is not None:
        apart |= {*mechanism.products}
    start = mechanism.reactant or mechanism.catalyst
    names = [name for name in mechanism.species if name not in apart]
    return tuple(sorted(names, key=lambda name: (name in mechanism.products, name != start)))


def loose(
    step: Step, mechanism: Mechanism, held: Collection[str]
) -> tuple[dict[str, int], dict[str, int]]:
    """Return what stands left and right in `step` and can be a node, with how many of each."""
    nodes = {*node_names(mechanism, held)}
    left, right = (
        {name: count for name, count in side.items() if name in nodes} for side in step.sides()
    )
    return left, right


@dataclass(frozen=True)
class Move:
    """One way to go on from a species: a step in one direction.

    Attributes
    ----------
    step : int
        0-based number.
    forward : bool
        Run as written, or backward.
    to : str
        The species that is followed from here.
    products : tuple of str
        The products that the step makes: then the path ends with it, and `to` is the first of them.
    """

    step: int
    forward: bool
    to: str
    products: tuple[str, ...] = ()


def moves(
    mechanism: Mechanism, held: Collection[str], *, beyond: bool = False
) -> dict[str, tuple[Move, ...]]:
    """Return the ways to go on from every node, in the order of the steps.

    A step that makes a product ends the path, but not in a catalytic cycle, nor where `beyond` says
    that a product is a species like any other. Where a side has several species that are not held,
    each of them is followed.
    """
    ending = not beyond and mechanism.catalyst is None
    ways: dict[str, list[Move]] = {name: [] for name in node_names(mechanism, held)}
    for number, step in enumerate(mechanism.steps):
        change = step.change()
        both = loose(step, mechanism, held)
        for forward in (True, False):
            sign = 1 if forward else -1
            used, made = both if forward else both[::-1]
            products = tuple(p for p in mechanism.products if sign * change.get(p, 0) > 0)
            for name in used:
                if ending and products:
                    ways[name].append(Move(number, forward, products[0], products))
                else:
                    # a catalyst may give the product in one step, from itself to itself
                    turns = mechanism.catalyst is not None and products
                    ways[name] += [Move(number, forward, to) for to in made if to != name or turns]
    return {name: tuple(found) for name, found in ways.items()}


def reached(start: str, ways: Mapping[str, Iterable[Move]]) -> tuple[str, ...]:
    """Return the nodes reached from `start`, itself first; products are reached but never left."""
    found, queue = {start: None}, [start]
    for name in queue:
        for move in ways.get(name, ()):
            if move.products:
                found.update(dict.fromkeys(move.products))
            elif move.to not in found:
                found[move.to] = None
                queue.append(move.to)
    return tuple(found)


def check_reach(mechanism: Mechanism, held: Collection[str]) -> tuple[Finding, ...]:
    """Check that there is a way from the reactant to every product, or round the catalyst.

    Returns
    -------
    tuple of Finding
        ``not-reached`` (warning): species that have no share in the rate, because nothing leads to
        them but through a product, or nothing at all.

    Raises
    ------
    StudyError
        No way, in words.
    """
    start = mechanism.reactant or mechanism.catalyst
    if start is None:
        return ()
    ways = moves(mechanism, held)
    found = reached(start, ways)
    if mechanism.catalyst is None:
        for product in mechanism.products:
            if product not in found:
                others = [
                    name for name in found if name != start and name not in mechanism.products
                ]
                where_to = (
                    f"leads to {', '.join(others)} and no further" if others else "leads nowhere"
                )
                raise StudyError(
                    f"no way from {start} to {product}: {start} {where_to}",
                    where=f"{mechanism.where} [effective] product",
                    mend=f"add the step that makes {product}, or name another product",
                )
    lost = [name for name in ways if name not in found]
    if not lost:
        return ()
    behind = {*reached(start, moves(mechanism, held, beyond=True))}
    findings = []
    for why, names in (
        ("only through a product", [name for name in lost if name in behind]),
        ("by any step", [name for name in lost if name not in behind]),
    ):
        if names:
            be = "is" if len(names) == 1 else "are"
            no = "" if why.startswith("only") else "not "
            findings.append(
                Finding(
                    "not-reached",
                    "warning",
                    mechanism.where,
                    None,
                    f"{', '.join(names)} {be} {no}reached from {start} {why}: no share in the rate",
                    "add the step that is missing, or take out what is not needed",
                )
            )
    return tuple(findings)


def trails(
    start: str,
    goal: str | None,
    ways: Mapping[str, tuple[Move, ...]],
    shut: frozenset[str],
    budget: Iterator[int],
) -> Iterator[tuple[list[str], list[Move]] | None]:
    """Yield every trail to a product (`goal` None) or round to `goal`, no node and no step twice.

    Before it goes on it looks, backward from the end, which nodes still lead there past those
    already visited, so that no time is lost in dead ends.
    """
    nodes, taken = [start], list[Move]()
    open_moves = [_useful(start, goal, ways, shut, nodes, taken)]
    while open_moves:
        if next(budget) <= 0:
            yield None
            return
        if not open_moves[-1]:
            open_moves.pop()
            nodes.pop()
            if taken:
                taken.pop()
            continue
        move = open_moves[-1].pop(0)
        nodes.append(move.to)
        taken.append(move)
        if move.products if goal is None else move.to == goal:
            yield list(nodes), list(taken)
            nodes.pop()
            taken.pop()
        else:
            open_moves.append(_useful(move.to, goal, ways, shut, nodes, taken))


def _useful(
    node: str,
    goal: str | None,
    ways: Mapping[str, tuple[Move, ...]],
    shut: frozenset[str],
    visited: Sequence[str],
    taken: Sequence[Move],
) -> list[Move]:
    """Return the moves from `node` from whose end the goal can still be reached."""
    used = {move.step for move in taken}
    barred = {*visited, *shut} - {goal}
    candidates = [
        move
        for move in ways[node]
        if move.step not in used and (move.products or move.to not in barred)
    ]
    if len(candidates) == 1 and taken:  # whoever came here has made sure of it
        return candidates
    into: dict[str, list[str]] = {}
    good: set[str] = set()
    for name, found in ways.items():
        if name in barred or name == goal:
            continue
        for move in found:
            if move.step in used:
                continue
            if (goal is None and move.products) or (goal is not None and move.to == goal):
                good.add(name)
            else:
                into.setdefault(move.to, []).append(name)
    queue = list(good)
    for name in queue:
        fresh = [other for other in into.get(name, ()) if other not in good]
        good.update(fresh)
        queue += fresh
    return [
        move
        for move in candidates
        if move.to in good or (move.products if goal is None else move.to == goal)
    ]
