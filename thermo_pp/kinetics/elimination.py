"""Elimination of states without a subtraction, and its derivative.

A network of first-order steps is reduced state by state: the ways through an eliminated state n are shared out among
the ways that remain,

    q_ij <- q_ij + q_in q_nj / S_n,      S_n = sum of all ways out of n,

and the way back to where one came from is dropped (Grassmann, Taksar, Heyman, Oper. Res. 1985, 33, 1107). Only sums,
products and quotients of positive numbers occur, so every result keeps its relative accuracy whatever the rates are.

Two things are added here. Ways carry a *label*, the net change of the surroundings along them; a way back to the same
state with a label that is not zero is one run of a cycle and feeds the reward of that state, times
-expm1(-affinity): no flux is ever a difference of two. And every operation is kept on a tape, along which the
derivative of one result's logarithm is taken back to the logarithms of all rates.

Only the ways that exist are worked on: an elimination costs the number of ways in times the number of ways out.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from thermo_pp.kinetics.scaled import FloatArray, Scaled, fraction, zeros
from thermo_pp.kinetics.tape import Gradient, Indices, Label, Record, back_along

Run = Callable[[Label], Scaled | None]
"""Worth of one run of a closed way with this label; None where it is nothing or is counted the other way round."""


@dataclass(frozen=True, eq=False)
class Passage:
    """The ways in and out of an eliminated state n, labels summed; only those that exist.

    Attributes
    ----------
    rows : shape (r,)
        Rows that lead to n.
    into : Scaled, shape (b, r)
        q_in.
    columns : shape (c,)
        States that n leads to.
    out : Scaled, shape (b, c)
        q_nj/S_n.
    end_columns : shape (e,)
        Ends that n leads to.
    ends : Scaled, shape (b, e)
        The same into the ends.
    leaving : Scaled, shape (b,)
        S_n.
    """

    rows: Indices
    into: Scaled
    columns: Indices
    out: Scaled
    end_columns: Indices
    ends: Scaled
    leaving: Scaled


class Reduction:
    """A network on the way to its answer.

    Rows are `sources` rows that are never eliminated, then the states; state columns carry labels, end columns do not.

    Parameters
    ----------
    ways : dict of label to Scaled, shape (b, sources + n, n)
        Rates from each row to each state; copied.
    ends : Scaled, shape (b, sources + n, k)
        Rates, or rewards, from each row into each end; copied.
    exits : shape (k,), 1 or 0
        Which ends are ways out of a state; the others are rewards and take no part in S_n.
    sources : int
    run : callable, optional
        Worth of one run of a closed way, by its label.
    reward : int
        The end column that runs feed.
    """

    def __init__(
        self,
        ways: Mapping[Label, Scaled],
        ends: Scaled,
        exits: FloatArray,
        *,
        sources: int = 0,
        run: Run | None = None,
        reward: int = 0,
    ) -> None:
        self.ways = {label: way.copy() for label, way in ways.items()}
        self.ends = ends.copy()
        self.exits = np.asarray(exits, dtype=np.float64)
        self.sources = sources
        self.run = run
        self.reward = reward
        self.left = next(iter(ways.values())).shape[2]
        self._passages: list[Passage] = []
        self._tape: list[Record] = []

    @property
    def passages(self) -> list[Passage]:
        """How each eliminated state was passed, in the order of states."""
        return self._passages[::-1]

    def eliminate_to(self, left: int, *, tape: bool = True) -> list[Passage]:
        """Eliminate the last states until `left` are left; return how each was passed, in the order of states."""
        self._passages += [self._eliminate(tape) for _ in range(self.left - left)]
        return self.passages

    def _eliminate(self, tape: bool) -> Passage:
        n = self.left - 1
        s = self.sources
        row = s + n
        rows = _present([way.mantissa[:, :row, n] for way in self.ways.values()])
        columns = _present([way.mantissa[:, row, :n] for way in self.ways.values()])
        end_columns = _present([self.ends.mantissa[:, row, :]])
        into = _existing({label: way[:, rows, n] for label, way in self.ways.items()})
        out = _existing({label: way[:, row, columns] for label, way in self.ways.items()})
        end_out = self.ends[:, row, end_columns]
        exits = self.exits[end_columns]
        leaving = _leaving(out, end_out, exits)
        below = leaving[:, np.newaxis]
        relative = {label: way / below for label, way in out.items()}
        relative_end = end_out / below
        self.left = n
        passage = Passage(
            rows,
            _total(into, len(rows), leaving),
            columns,
            _total(relative, len(columns), leaving),
            end_columns,
            relative_end,
            leaving,
        )
        block = np.ix_(rows, columns)
        added, runs = self._through(into, relative, rows, columns)
        kept, through = {}, []
        for label, terms in added.items():
            if label not in self.ways:
                self.ways[label] = type(self.ends).zeros(next(iter(self.ways.values())).shape)
            old = self.ways[label][:, block[0], block[1]]
            new = _add_up([old, *(term for _, _, term in terms)])
            self.ways[label][:, block[0], block[1]] = new
            if tape:
                kept[label] = fraction(old, new)
                through += [(a, b, label, fraction(term, new)) for a, b, term in terms]
        end_block = np.ix_(rows, end_columns)
        old_ends = self.ends[:, end_block[0], end_block[1]]
        parts = {label: _outer(way, relative_end) for label, way in into.items()}
        new_ends = _add_up([old_ends, *parts.values()])
        self.ends[:, end_block[0], end_block[1]] = new_ends
        run_records, reward_kept = self._reward(runs, rows, tape)
        if tape:
            self._tape.append(
                Record(
                    n=n,
                    rows=rows,
                    columns=columns,
                    end_columns=end_columns,
                    shares_out={label: fraction(way, below) for label, way in out.items()},
                    shares_end=np.where(exits, fraction(end_out, below), 0.0),
                    through=through,
                    kept=kept,
                    runs=run_records,
                    to_ends={label: fraction(part, new_ends) for label, part in parts.items()},
                    ends_kept=fraction(old_ends, new_ends),
                    reward_kept=reward_kept,
                )
            )
        return passage

    def _through(
        self,
        into: Mapping[Label, Scaled],
        relative: Mapping[Label, Scaled],
        rows: Indices,
        columns: Indices,
    ) -> tuple[_Added, _Runs]:
        """Return what goes through the eliminated state, by the label of the whole way, and the runs of cycles."""
        place_in_rows, place_in_columns = np.nonzero(
            (rows - self.sources)[:, np.newaxis] == columns[np.newaxis, :]
        )
        back = (slice(None), place_in_rows, place_in_columns)
        added: _Added = {}
        runs: _Runs = []
        for label_in, way_in in into.items():
            for label_out, way_out in relative.items():
                term = _outer(way_in, way_out)
                label = tuple(a + b for a, b in zip(label_in, label_out, strict=True))
                if len(place_in_rows):
                    worth = self.run(label) if self.run is not None else None
                    if worth is not None:
                        gain = term[back] * worth[:, np.newaxis]
                        runs.append(
                            (label_in, label_out, label, place_in_rows, place_in_columns, gain)
                        )
                    term[back] = type(term).zeros((len(term.mantissa), len(place_in_rows)))
                added.setdefault(label, []).append((label_in, label_out, term))
        return added, runs

    def _reward(
        self, runs: _Runs, rows: Indices, tape: bool
    ) -> tuple[list[tuple[Label, Label, Label, Indices, Indices, FloatArray]], FloatArray | None]:
        """Add the runs of cycles to the rewards of the states that they return to."""
        if not runs:
            return [], None
        old = self.ends[:, rows, self.reward]
        new = old.copy()
        for *_, places, _, gain in runs:
            new[:, places] = new[:, places] + gain
        self.ends[:, rows, self.reward] = new
        if not tape:
            return [], None
        records = [(*run[:5], fraction(run[5], new[:, run[3]])) for run in runs]
        return records, fraction(old, new)

    def gradient(self, ways: Mapping[Label, FloatArray], ends: FloatArray) -> Gradient:
        """Take a derivative back to the network before any elimination.

        Parameters
        ----------
        ways, ends : shape (b, sources + left, left) by label; (b, sources + left, k)
            Derivative of the answer by the logarithms of what is left; labels that are missing are 0.
        """
        b, all_rows, n = next(iter(self.ways.values())).shape
        top = self.sources + self.left
        by_ways = {label: zeros((b, all_rows, n)) for label in self.ways}
        for label, given in ways.items():
            by_ways[label][:, :top, : self.left] = given
        by_ends = zeros((b, all_rows, ends.shape[2]))
        by_ends[:, :top] = ends
        return back_along(self._tape, by_ways, by_ends, self.sources, self.reward)

    def between(self, source: Scaled, reward: Scaled) -> Between:
        """Return what a reward at every state is worth to a source into every state.

        As if the source had been a row and the reward an end from the beginning, for a network without
        labels and without sources that is eliminated, with a tape, to its first state.

        Parameters
        ----------
        source, reward : Scaled, shape (b, n)
        """
        if self.sources or self.left != 1 or list(self.ways) != [()]:
            raise ValueError("one state has to be left, without labels and sources")
        first = Reduction({(): self.ways[()][:, :1, :1]}, self.ends[:, :1], self.exits)
        first.eliminate_to(0)
        passages, records = self._passages + first._passages, self._tape + first._tape
        return _between(passages, records, self.exits, source, reward)


_Added = dict[Label, list[tuple[Label, Label, Scaled]]]
_Runs = list[tuple[Label, Label, Label, Indices, Indices, Scaled]]


@dataclass(frozen=True, eq=False)
class Between:
    """What a source into every state of a network makes of a reward at every state.

    Attributes
    ----------
    out : Scaled, shape (b, k)
        What leaves by each end.
    states : int
    tape : list of records
    """

    out: Scaled
    states: int
    tape: list[Record]

    def gradient(self, sign: float) -> Gradient:
        """Return the derivative of ln of the reward, times `sign`; row 0 is the source, the last end the reward."""
        b, k = self.out.shape
        by_ends = zeros((b, self.states + 1, k + 1))
        by_ends[:, 0, k] = sign
        return back_along(self.tape, {(): zeros((b, self.states + 1, self.states))}, by_ends, 1, 0)


def _between(
    passages: Sequence[Passage],
    records: Sequence[Record],
    exits: FloatArray,
    source: Scaled,
    reward: Scaled,
) -> Between:
    """Pass on what arrives and what it is worth, state by state, along an elimination that has been done."""
    b, k = len(source.mantissa), len(exits)
    kind = type(source)
    arriving, worth = source.copy(), reward.copy()
    out, answer = kind.zeros((b, k)), kind.zeros((b,))
    tape: list[Record] = []
    for passage, record in zip(passages, records, strict=True):
        rows, columns, ends, n = record.rows, record.columns, record.end_columns, record.n
        here = arriving[:, n][:, np.newaxis]
        term = worth[:, n] / passage.leaving
        gain = arriving[:, n] * term
        total = answer + gain
        out[:, ends] = out[:, ends] + passage.ends * here
        old, added = worth[:, rows], passage.into * term[:, np.newaxis]
        worth[:, rows] = old + added
        before, onward = arriving[:, columns], passage.out * here
        arriving[:, columns] = before + onward
        old_share, added_share = fraction(old, worth[:, rows]), fraction(added, worth[:, rows])
        kept, to_ends = (
            zeros((b, 1 + len(rows), len(columns))),
            zeros((b, 1 + len(rows), len(ends) + 1)),
        )
        through, ends_kept = zeros(kept.shape), zeros(to_ends.shape)
        for bordered, own in ((kept, record.kept), (to_ends, record.to_ends)):
            if () in own:
                bordered[:, 1:, : own[()].shape[2]] = own[()]
        for *_, share in record.through:
            through[:, 1:] = share
        ends_kept[:, 1:, :-1] = record.ends_kept
        kept[:, 0] = fraction(before, arriving[:, columns])
        through[:, 0] = fraction(onward, arriving[:, columns])
        ends_kept[:, 1:, -1], to_ends[:, 1:, -1] = old_share, added_share
        ends_kept[:, 0, -1], to_ends[:, 0, -1] = fraction(answer, total), fraction(gain, total)
        shares_end = zeros((b, len(ends) + 1))
        shares_end[:, :-1] = record.shares_end
        tape.append(
            Record(
                n=n,
                rows=np.append(0, rows + 1),
                columns=columns,
                end_columns=np.append(ends, k),
                shares_out=record.shares_out,
                shares_end=shares_end,
                through=[((), (), (), through)],
                kept={(): kept},
                runs=[],
                to_ends={(): to_ends},
                ends_kept=ends_kept,
                reward_kept=None,
            )
        )
        answer = total
    return Between(out, worth.shape[1], tape)


def _present(mantissas: Sequence[FloatArray]) -> Indices:
    """Return the places (last axis) at which any number is not 0."""
    found = np.zeros(mantissas[0].shape[1], np.bool_)
    for mantissa in mantissas:
        found |= mantissa[0] != 0.0
    for mantissa in mantissas:
        if not found.all():  # what the first row has need not be looked for in the others
            found[~found] = mantissa[:, ~found].any(axis=0)
    return np.flatnonzero(found)


def _existing(by_label: dict[Label, Scaled]) -> dict[Label, Scaled]:
    return {label: way for label, way in by_label.items() if way.mantissa.any()}


def _leaving(out: Mapping[Label, Scaled], ends: Scaled, exits: FloatArray) -> Scaled:
    """Return S_n, shape (b,)."""
    parts = [way.sum(axis=1) for way in out.values()]
    places = np.flatnonzero(exits)
    if len(places):
        parts.append(ends[:, places].sum(axis=1))
    return _add_up(parts)


def _total(by_label: Mapping[Label, Scaled], size: int, like: Scaled) -> Scaled:
    if not by_label:
        return type(like).zeros((len(like.mantissa), size))
    return _add_up(list(by_label.values()))


def _add_up(terms: Sequence[Scaled]) -> Scaled:
    total = terms[0]
    for term in terms[1:]:
        total = total + term
    return total


def _outer(rows: Scaled, columns: Scaled) -> Scaled:
    """Return the products of (b, r) and (b, c), shape (b, r, c)."""
    return rows[:, :, np.newaxis] * columns[:, np.newaxis, :]


def fill_saving_order(neighbours: Mapping[int, set[int]], first: int) -> list[int]:
    """Return states so that eliminating from the last on makes few new ways; `first` stays first.

    At each turn the state with the fewest neighbours left is eliminated.
    """
    near: dict[int, set[int]] = {k: set() for k in neighbours}
    for k, others in neighbours.items():
        for other in others - {k}:
            near[k].add(other)
            near[other].add(k)  # a way may exist in one direction only
    eliminated: list[int] = []
    while len(near) > 1:
        state = min((k for k in near if k != first), key=lambda k: (len(near[k]), k))
        around = near.pop(state)
        for k in around:
            near[k] |= around
            near[k] -= {k, state}
        eliminated.append(state)
    return [first, *reversed(eliminated)]
