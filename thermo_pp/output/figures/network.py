"""Network: the states of several paths as levels in columns, each drawn once where paths share it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from thermo_pp.profile import State


@dataclass(frozen=True)
class Level:
    """One state as it is drawn.

    Attributes
    ----------
    state : State
    column : int
    paths : tuple of str
        All that go through it.
    """

    state: State
    column: int
    paths: tuple[str, ...]


@dataclass(frozen=True)
class Network:
    """Levels, and the connections between them with the paths that take them.

    Attributes
    ----------
    levels : tuple of Level
    connections : mapping of (int, int) to tuple of str
        By numbers of levels, in the order in which the paths take them.
    """

    levels: tuple[Level, ...]
    connections: dict[tuple[int, int], tuple[str, ...]]

    @property
    def columns(self) -> int:
        """How many columns there are."""
        return 1 + max(level.column for level in self.levels)


def network(states: Sequence[State]) -> Network:
    """Return the levels of paths; a state that another path passes in another order is drawn again.

    Two states are the same where their names, kinds and energies are.
    """
    drawn: list[State] = []
    users: list[list[str]] = []
    after: list[set[int]] = []
    connections: dict[tuple[int, int], list[str]] = {}
    for path in dict.fromkeys(state.path for state in states):
        last: int | None = None
        for state in (state for state in states if state.path == path):
            number = next(
                (k for k, old in enumerate(drawn) if _same(old, state) and path not in users[k]
                 and not (last is not None and _reaches(after, k, last))),
                None,
            )  # fmt: skip
            if number is None:
                number = len(drawn)
                drawn.append(state)
                users.append([])
                after.append(set())
            users[number].append(path)
            if last is not None:
                after[last].add(number)
                connections.setdefault((last, number), []).append(path)
            last = number
    levels = tuple(
        Level(state, column, tuple(names))
        for state, column, names in zip(drawn, _columns(after), users, strict=True)
    )
    return Network(levels, {ends: tuple(paths) for ends, paths in connections.items()})


def _same(a: State, b: State) -> bool:
    # energies too: a path of another composition has its own zero
    return (
        (a.state, a.kind) == (b.state, b.kind)
        and bool((a.gibbs_kj_mol == b.gibbs_kj_mol).all())
        and bool((a.enthalpy_kj_mol == b.enthalpy_kj_mol).all())
    )


def _reaches(after: Sequence[set[int]], start: int, end: int) -> bool:
    seen, todo = {start}, [start]
    while todo:
        here = todo.pop()
        if here == end:
            return True
        todo += after[here] - seen
        seen |= after[here]
    return False


def _columns(after: Sequence[set[int]]) -> list[int]:
    """Return a column for each level, halfway between the first and the last that it can have."""
    count = len(after)
    early, late = [0] * count, [0] * count
    for _ in range(count):
        for k, following in enumerate(after):
            for other in following:
                early[other] = max(early[other], early[k] + 1)
    last = max(early, default=0)
    late = [last] * count
    for _ in range(count):
        for k, following in enumerate(after):
            for other in following:
                late[k] = min(late[k], late[other] - 1)
    begun = {other for following in after for other in following}
    return [
        0 if k not in begun else (early[k] + late[k]) // 2 if after[k] else last
        for k in range(count)
    ]
