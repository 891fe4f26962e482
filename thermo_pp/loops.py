"""Loops of held species, and what a species held at equilibrium follows from."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from math import gcd, lcm

from thermo_pp.conditions import Held
from thermo_pp.errors import StudyError
from thermo_pp.graph import held_apart
from thermo_pp.mechanism import Mechanism, write_reaction

Row = dict[int, Fraction]
"""A sparse row: column -> value, zeros left out."""


@dataclass(frozen=True)
class Loop:
    """A closed loop: run through once, it leaves nothing changed but held species.

    Attributes
    ----------
    steps : tuple of (int, int)
        0-based step and how often it runs, negative for backward.
    net : tuple of (str, int)
        What the loop makes (positive) and uses (negative); held species only.
    """

    steps: tuple[tuple[int, int], ...]
    net: tuple[tuple[str, int], ...]

    @property
    def net_reaction(self) -> str:
        """The net reaction as a text."""
        return write_reaction(dict(self.net))

    def vector(self, held: Sequence[str]) -> tuple[int, ...]:
        """Return the net reaction as integers over `held`."""
        net = dict(self.net)
        return tuple(net.get(name, 0) for name in held)


def held_loops(mechanism: Mechanism, held: Collection[str]) -> tuple[Loop, ...]:
    """Return independent loops whose net reaction has held species only.

    Every other such loop is a sum of multiples of these, so that all affinities are zero if those
    of these are. The reactant, the products and the catalyst do not count as held: a loop that
    makes a product is not among them.

    Parameters
    ----------
    mechanism : Mechanism
    held : collection of str
        Names of the held species.

    Returns
    -------
    tuple of Loop
        Integer, without a common factor, each closed by its last step; loops whose net reaction is
        nothing are left out.
    """
    apart = held_apart(mechanism, held)
    names = [name for name in mechanism.species if name not in apart]
    changes = [step.change() for step in mechanism.steps]
    rows = [_row(change.get(name, 0) for change in changes) for name in names]
    loops: list[Loop] = []
    independent: dict[int, Row] = {}
    order = {name: k for k, name in enumerate(mechanism.species)}
    for vector in _kernel(rows, len(changes)):
        net: dict[str, int] = {}
        for number, times in vector:
            for name, change in changes[number].items():
                net[name] = net.get(name, 0) + times * change
        net = {name: change for name, change in net.items() if change}
        left = _reduced(
            {order[name]: Fraction(change) for name, change in net.items()}, independent
        )
        if left:
            _add(left, independent)
            loops.append(Loop(vector, tuple(net.items())))
    return tuple(loops)


def equilibrium_of(
    mechanism: Mechanism, held: Mapping[str, Held], *, driven: bool = False
) -> dict[str, dict[str, Fraction]]:
    """Return what every species held at "equilibrium" is in equilibrium with.

    Parameters
    ----------
    mechanism : Mechanism
    held : mapping of str to Held
    driven : bool
        Species at stated values may be out of balance: then an equilibrium species must follow from
        them in one way.

    Returns
    -------
    dict of str to dict of str to Fraction
        Species -> stated species -> coefficient: ``{"W2": {"W": 2}}`` says that G of W2 is twice
        that of W. Found through steps whose members are all held, other equilibrium species on the
        way.

    Raises
    ------
    StudyError
        No such steps; or two ways that differ while `driven`.
    """
    apart = held_apart(mechanism, held)
    following = [name for name, how in held.items() if how.form == "equilibrium"]
    steps = [k for k, step in enumerate(mechanism.steps) if apart.issuperset(step.species)]
    changes = [mechanism.steps[k].change() for k in steps]
    answer: dict[str, dict[str, Fraction]] = {}
    for name in following:
        where = f"{mechanism.where} [conditions] held.{name}"
        # a combination of the steps that makes one of `name` and leaves every other equilibrium
        # species as it is; the last column stands for what it must make
        rows = []
        for other in following:
            row = _row(change.get(other, 0) for change in changes)
            if other == name:
                row[len(steps)] = Fraction(-1)
            rows.append(row)
        solution = _solution(rows, len(steps))
        if solution is None:
            raise StudyError(
                f"{name} is held at equilibrium, but no step among held species makes it "
                "from those held at stated values",
                where=where,
                mend=f"add the step (for instance 'W + W = {name}'), or state its concentration",
            )
        made: dict[str, Fraction] = {}
        for times, change in zip(solution, changes, strict=True):
            for other, number in change.items():
                made[other] = made.get(other, Fraction(0)) - times * number
        answer[name] = {other: value for other, value in made.items() if value and other != name}
        if driven and _ambiguous(rows, changes, following):
            raise StudyError(
                f"{name} is held at equilibrium with species that may be out of balance",
                where=where,
                mend="state its concentration, or take out one of the steps that make it",
            )
    return answer


def _ambiguous(
    rows: Sequence[Row], changes: Sequence[Mapping[str, int]], following: Collection[str]
) -> bool:
    """Tell whether other steps make the same equilibrium species of other stated ones."""
    homogeneous = [{k: value for k, value in row.items() if k < len(changes)} for row in rows]
    for vector in _kernel(homogeneous, len(changes)):
        touching = any({*changes[k]} & {*following} for k, _ in vector)
        net: dict[str, int] = {}
        for k, times in vector:
            for name, number in changes[k].items():
                net[name] = net.get(name, 0) + times * number
        if touching and any(net.values()):
            return True
    return False


def _row(values: Iterable[int]) -> Row:
    return {k: Fraction(value) for k, value in enumerate(values) if value}


def _reduced(row: Row, pivots: Mapping[int, Row]) -> Row:
    """Return `row` less the multiples of the pivot rows that clear their columns."""
    row = dict(row)
    for column, pivot in pivots.items():
        factor = row.get(column)
        if factor:
            for k, value in pivot.items():
                left = row.get(k, Fraction(0)) - factor * value
                if left:
                    row[k] = left
                else:
                    row.pop(k, None)
    return row


def _add(row: Row, pivots: dict[int, Row], last: int | None = None) -> None:
    """Add a reduced row that is not empty as a pivot row, and clear its column in the others."""
    columns = [k for k in row if k != last] or list(row)
    column = min(columns)
    scaled = {k: value / row[column] for k, value in row.items()}
    for other, pivot in list(pivots.items()):
        pivots[other] = _reduced(pivot, {column: scaled})
    pivots[column] = scaled


def _kernel(rows: Sequence[Row], columns: int) -> list[tuple[tuple[int, int], ...]]:
    """Return a basis of the integer vectors that every row sends to zero, no common factors."""
    pivots: dict[int, Row] = {}
    for row in rows:
        left = _reduced(row, pivots)
        if left:
            _add(left, pivots)
    basis = []
    for free in range(columns):
        if free in pivots:
            continue
        vector = {free: Fraction(1)}
        for column, pivot in pivots.items():
            if pivot.get(free):
                vector[column] = -pivot[free]
        scale = lcm(*(value.denominator for value in vector.values()))
        whole = {k: int(value * scale) for k, value in vector.items()}
        shared = gcd(*whole.values())
        basis.append(tuple((k, whole[k] // shared) for k in sorted(whole)))
    return basis


def _solution(rows: Sequence[Row], columns: int) -> list[Fraction] | None:
    """Return a solution of rows (x, 1) = 0, later entries zero where they can be; or None."""
    pivots: dict[int, Row] = {}
    for row in rows:
        left = _reduced(row, pivots)
        if left:
            _add(left, pivots, last=columns)
    if columns in pivots:
        return None
    return [
        -pivots[k].get(columns, Fraction(0)) if k in pivots else Fraction(0) for k in range(columns)
    ]
