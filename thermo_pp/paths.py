"""The paths of a mechanism, from reactant to product or round the catalyst, and their states."""

from __future__ import annotations

from collections.abc import Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import count

from thermo_pp.errors import Finding, StudyError
from thermo_pp.graph import Move, check_reach, held_apart, loose, moves, node_names, trails
from thermo_pp.mechanism import Mechanism, write_reaction, write_sum
from thermo_pp.names import Kind

MOST_PATHS = 64
"""How many paths are looked for; with more of them there is a finding."""
MOST_FILLING = 12
"""How many molecules at most stand by so that a path has the composition of the largest."""

Counts = tuple[tuple[str, int], ...]


@dataclass(frozen=True)
class State:
    """One state of a path: a sum of species.

    Attributes
    ----------
    species : tuple of (str, int)
        What it is made of and how many of each: what the path follows (or the saddle point) first,
        then what stands by.
    kind : {"minimum", "saddle"}
    step : int or None
        0-based number of the step that goes through this saddle point; None for a minimum.
    """

    species: Counts
    kind: Kind
    step: int | None = None

    @property
    def name(self) -> str:
        """The sum as a text, ``"SO3 + 2 W"``."""
        return write_sum(dict(self.species))


@dataclass(frozen=True)
class Path:
    """One path.

    Attributes
    ----------
    name : str
        Declared, or the followed species joined by arrows.
    steps : tuple of int
        0-based numbers of the steps, in the order of the path.
    forward : tuple of bool
        Whether each step is run as written.
    nodes : tuple of str
        The species that the path follows, one more than steps.
    states : tuple of State
        Minima, with the saddle points between them; all have the same total composition.
    net : tuple of (str, int)
        What the path makes (positive) and uses (negative); what it follows first.
    cycle : bool
        It leads from the catalyst back to it.
    """

    name: str
    steps: tuple[int, ...]
    forward: tuple[bool, ...]
    nodes: tuple[str, ...]
    states: tuple[State, ...]
    net: Counts
    cycle: bool = False

    @property
    def net_reaction(self) -> str:
        """The net reaction as a text, ``"SO3 + W = acid"``."""
        return write_reaction(dict(self.net))


def find_paths(
    mechanism: Mechanism, held: Collection[str], *, most: int = MOST_PATHS
) -> tuple[tuple[Path, ...], tuple[Finding, ...]]:
    """Return the paths of a mechanism: the declared ones, else those that its steps make.

    A path follows one species at a time from the reactant to the first product made, and none
    twice; in a catalytic cycle from the catalyst (or, off the catalyst's own cycle, another of its
    states) back to it, with a product made.

    Parameters
    ----------
    mechanism : Mechanism
    held : collection of str
        Names of the held species.
    most : int
        How many paths are looked for.

    Returns
    -------
    tuple of Path
        Shorter ones first, then by the numbers of their steps.
    tuple of Finding
        ``paths-capped`` (warning) where there are, or may be, more.

    Raises
    ------
    StudyError
        No way to a product, no cycle that makes one, a declared path that does not hang together,
        or neither an [effective] question nor declared paths.
    """
    if mechanism.paths:
        return tuple(_declared(mechanism, held, k) for k in range(len(mechanism.paths))), ()
    if mechanism.reactant is None and mechanism.catalyst is None:
        raise StudyError(
            "nothing says where a path begins and ends",
            where=mechanism.where,
            mend="add [effective] with reactant (or catalyst) and product, or declare [[paths]]",
        )
    check_reach(mechanism, held)
    found: list[Path] = []
    capped = False
    for trail in _trails(mechanism, held, most):
        if trail is None or len(found) == most:
            capped = True
            break
        path = _path(mechanism, *trail)
        if _hangs_together(path, mechanism):
            found.append(path)
    found.sort(key=lambda path: (len(path.steps), path.steps))
    if not found:
        raise _no_path(mechanism, capped)
    return _named_apart(found), ((_capped(mechanism, len(found)),) if capped else ())


def _capped(mechanism: Mechanism, number: int) -> Finding:
    return Finding(
        "paths-capped",
        "warning",
        mechanism.where,
        None,
        f"the steps make more paths than the {number} that are shown; no rate depends on this",
        "declare the paths that matter ([[paths]])",
    )


def _no_path(mechanism: Mechanism, capped: bool) -> StudyError:
    products = ", ".join(mechanism.products)
    if mechanism.catalyst is not None:
        what = f"no cycle of {mechanism.catalyst} makes {products}"
    else:
        what = f"no single path leads from {mechanism.reactant} to {products}"
    if capped:
        what += " among those that were looked at"
    return StudyError(
        what,
        where=f"{mechanism.where} [effective] product",
        mend="add the step that is missing, or declare [[paths]]",
    )


def _trails(
    mechanism: Mechanism, held: Collection[str], most: int
) -> Iterator[tuple[list[str], list[Move]] | None]:
    """Yield what each path follows and how; None once more was tried than `most` paths need."""
    ways = moves(mechanism, held)
    budget = count(4 * (most + 1) * (len(ways) + 2), -1)
    if mechanism.reactant is not None:
        yield from trails(mechanism.reactant, None, ways, frozenset(), budget)
        return
    done: set[str] = set()
    for root in node_names(mechanism, held):
        for trail in trails(root, root, ways, frozenset(done), budget):
            if trail is None:
                yield None
                return
            change = _net(mechanism, trail[1])
            if any(change.get(product, 0) > 0 for product in mechanism.products):
                yield trail
        done.add(root)


def _declared(mechanism: Mechanism, held: Collection[str], number: int) -> Path:
    """Return a declared path: its steps in order, each run in the direction that goes on."""
    numbers = mechanism.paths[number]
    name = mechanism.path_names[number] if mechanism.path_names else ""
    where = f"{mechanism.where} [paths.{number + 1}] steps"
    ways = moves(mechanism, held, beyond=True)
    apart = held_apart(mechanism, held)
    start = mechanism.reactant or mechanism.catalyst
    ends = [start] if start is not None else _first_ends(mechanism, held, numbers)
    trails: list[tuple[list[str], list[Move]]] = [([end], []) for end in ends]
    for entry in numbers:
        step_number, backward = (~entry, True) if entry < 0 else (entry, False)
        step = mechanism.steps[step_number]
        if apart.issuperset(step.species):  # nothing is followed through a step among held species
            for nodes, taken in trails:
                taken.append(Move(step_number, not backward, nodes[-1]))
                nodes.append(nodes[-1])
            continue
        longer = [
            ([*nodes, move.to], [*taken, move])
            for nodes, taken in trails
            for move in ways[nodes[-1]]
            if move.step == step_number and not (backward and move.forward)
        ]
        if not longer:
            stands = " or ".join(dict.fromkeys(nodes[-1] for nodes, _ in trails)) or "any species"
            raise StudyError(
                f"step {step_number + 1} ({step.equation!r}) does not go on from {stands}",
                where=where,
                mend="list the steps in their order, the first from the reactant or catalyst",
            )
        trails = longer
    paths = [_path(mechanism, nodes, taken, name) for nodes, taken in trails]
    aims = {*mechanism.products} if mechanism.catalyst is None else {mechanism.catalyst}
    return min(
        paths, key=lambda path: (path.nodes[-1] not in aims, not _hangs_together(path, mechanism))
    )


def _first_ends(mechanism: Mechanism, held: Collection[str], numbers: Sequence[int]) -> list[str]:
    """Return what a path without a reactant can begin from: an end of its first step with one."""
    for entry in numbers:
        sides = loose(mechanism.steps[~entry if entry < 0 else entry], mechanism, held)
        if any(sides):
            return [*sides[1], *sides[0]] if entry < 0 else [*sides[0], *sides[1]]
    return []


def _path(
    mechanism: Mechanism,
    nodes: Sequence[str],
    taken: Sequence[Move],
    name: str = "",
    beside: Mapping[str, int] | None = None,
) -> Path:
    """Return the path that follows `nodes`; `beside` stands by in every state."""
    net = _net(mechanism, taken)
    return Path(
        name=name or " → ".join(nodes),
        steps=tuple(move.step for move in taken),
        forward=tuple(move.forward for move in taken),
        nodes=tuple(nodes),
        states=_states(mechanism, nodes, taken, beside or {}),
        net=tuple(sorted(net.items(), key=lambda change: change[0] not in nodes)),
        cycle=mechanism.catalyst is not None and nodes[0] == nodes[-1],
    )


def _net(mechanism: Mechanism, taken: Sequence[Move]) -> dict[str, int]:
    """Return what the moves make and use together, zeros left out, in the order of first use."""
    total: dict[str, int] = {}
    for move in taken:
        for name, change in mechanism.steps[move.step].change().items():
            total[name] = total.get(name, 0) + (change if move.forward else -change)
    return {name: change for name, change in total.items() if change}


def _states(
    mechanism: Mechanism, nodes: Sequence[str], taken: Sequence[Move], beside: Mapping[str, int]
) -> tuple[State, ...]:
    """Return the states, from the least that lets every move be made to what is left."""
    start: dict[str, int] = {}
    present: dict[str, int] = {}
    for move in taken:
        used, made = mechanism.steps[move.step].sides(move.forward)
        for name, number in used.items():
            lacking = max(number - present.get(name, 0), 0)
            start[name] = start.get(name, 0) + lacking
            present[name] = present.get(name, 0) + lacking - number
        for name, number in made.items():
            present[name] = present.get(name, 0) + number
    for name, number in beside.items():
        start[name] = start.get(name, 0) + number

    order = {name: k for k, name in enumerate(mechanism.species)}

    def counts(present: Mapping[str, int], first: str) -> Counts:
        names = sorted(present, key=lambda name: (name != first, order.get(name, -1)))
        return tuple((name, present[name]) for name in names if present[name])

    states = [State(counts(start, nodes[0]), "minimum")]
    present = start
    for move, node in zip(taken, nodes[1:], strict=True):
        step = mechanism.steps[move.step]
        used, made = step.sides(move.forward)
        present = {name: number - used.get(name, 0) for name, number in present.items()}
        if step.through is not None:
            saddle = counts({**present, step.through: 1}, step.through)
            states.append(State(saddle, "saddle", move.step))
        for name, number in made.items():
            present[name] = present.get(name, 0) + number
        states.append(State(counts(present, node), "minimum"))
    return tuple(states)


def _hangs_together(path: Path, mechanism: Mechanism) -> bool:
    """Tell whether nothing that the path follows is left over or taken from elsewhere."""
    on_the_way = path.nodes if path.cycle else path.nodes[1:-1]
    changed = {name for name, _ in path.net}
    return not changed.intersection(on_the_way)


def _named_apart(found: Sequence[Path]) -> tuple[Path, ...]:
    """Give paths that follow the same species by other steps names of their own."""
    names = [path.name for path in found]
    return tuple(
        path
        if names.count(path.name) == 1
        else replace(path, name=f"{path.name} (steps {', '.join(str(k + 1) for k in path.steps)})")
        for path in found
    )


def filled_up(
    paths: Sequence[Path], mechanism: Mechanism, held: Collection[str]
) -> tuple[Path, ...]:
    """Let held species stand by in smaller paths, so that all have the composition of the largest.

    Then one reference state serves all of them. A path that no sum of up to `MOST_FILLING` held or
    entering species fills up is returned as it is.
    """
    contents = [mechanism.content(dict(path.states[0].species)) for path in paths]
    size = [sum(n for key, n in content.items() if key != "charge") for content in contents]
    whole = contents[size.index(max(size))]
    entering = [name for path in paths for name, _ in path.states[0].species[1:]]
    fillers = [name for name in dict.fromkeys((*held, *entering)) if name in mechanism.composition]
    answer = []
    for path, content in zip(paths, contents, strict=True):
        keys = {*whole, *content}
        lacking = {key: whole.get(key, 0) - content.get(key, 0) for key in keys}
        beside = _filling(lacking, fillers, mechanism, MOST_FILLING)
        if beside:
            taken = [
                Move(*move) for move in zip(path.steps, path.forward, path.nodes[1:], strict=True)
            ]
            path = _path(mechanism, path.nodes, taken, path.name, beside)
        answer.append(path)
    return tuple(answer)


def _filling(
    lacking: Mapping[str, int], fillers: Sequence[str], mechanism: Mechanism, most: int
) -> dict[str, int] | None:
    """Return how many of each filler make up for what is lacking, earlier ones preferred; or None."""
    if not any(lacking.values()):
        return {}
    if most == 0 or not fillers or any(n < 0 for key, n in lacking.items() if key != "charge"):
        return None
    first = fillers[0]
    content = mechanism.content({first: 1})
    left = {key: lacking.get(key, 0) - content.get(key, 0) for key in {*lacking, *content}}
    found = _filling(left, fillers, mechanism, most - 1) if content else None
    if found is not None:
        return {first: 1 + found.pop(first, 0), **found}
    return _filling(lacking, fillers[1:], mechanism, most)
