"""The tape of an elimination: what each state was shared out into, and derivatives taken back along it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.scaled import FloatArray, zeros

Label = tuple[int | Fraction, ...]
Indices = NDArray[np.intp]


@dataclass(frozen=True, eq=False)
class Record:
    """What is needed to take a derivative back through the elimination of one state."""

    n: int
    rows: Indices
    columns: Indices
    end_columns: Indices
    shares_out: dict[Label, FloatArray]  # of the ways out of n in S_n, (b, c)
    shares_end: FloatArray  # of the ends of n in S_n, (b, e), rewards 0
    through: list[tuple[Label, Label, Label, FloatArray]]  # in, out, sum, share in the new way
    kept: dict[Label, FloatArray]  # share of the old way in the new way, (b, r, c)
    runs: list[tuple[Label, Label, Label, Indices, Indices, FloatArray]]
    # in, out, sum, places in rows and in columns, share in the new reward
    to_ends: dict[Label, FloatArray]  # share of the way through n in the new end, (b, r, e)
    ends_kept: FloatArray
    reward_kept: FloatArray | None  # share of the old reward where runs were added, (b, rows)


@dataclass(frozen=True, eq=False)
class Gradient:
    """Derivative of one logarithm by the logarithms of what a network began with.

    Attributes
    ----------
    ways : dict of label to shape (b, rows, n)
    ends : shape (b, rows, k)
    worths : dict of label to shape (b,)
        By the logarithm of what one run with that label is worth.
    """

    ways: dict[Label, FloatArray]
    ends: FloatArray
    worths: dict[Label, FloatArray]


def back_along(
    tape: Sequence[Record],
    by_ways: dict[Label, FloatArray],
    by_ends: FloatArray,
    sources: int,
    reward: int,
) -> Gradient:
    """Take derivatives by what is left back along a tape, in place."""
    worths: dict[Label, FloatArray] = {}
    for record in reversed(tape):
        _back_through(record, by_ways, by_ends, worths, sources + record.n, reward)
    return Gradient(by_ways, by_ends, worths)


def _back_through(
    record: Record,
    by_ways: dict[Label, FloatArray],
    by_ends: FloatArray,
    worths: dict[Label, FloatArray],
    row: int,
    reward: int,
) -> None:
    rows, columns, end_columns = record.rows, record.columns, record.end_columns
    b = len(by_ends)
    leaving = np.zeros(b)
    into = {label: zeros((b, len(rows))) for label in by_ways}
    out = {label: zeros((b, len(columns))) for label in by_ways}
    if record.reward_kept is not None:
        gain = by_ends[:, rows, reward]
        by_ends[:, rows, reward] = gain * record.reward_kept
        for label_in, label_out, label, in_rows, in_columns, share in record.runs:
            term = gain[:, in_rows] * share
            into[label_in][:, in_rows] += term
            out[label_out][:, in_columns] += term
            total = term.sum(axis=1)
            leaving -= total
            worths[label] = worths.get(label, np.zeros(b)) + total
    block = (slice(None), rows[:, np.newaxis], columns[np.newaxis, :])
    weights = {label: by_ways[label][block] for label in record.kept}
    for label, share in record.kept.items():
        by_ways[label][block] = weights[label] * share
    for label_in, label_out, label, share in record.through:
        term = weights[label] * share
        into[label_in] += term.sum(axis=2)
        by_column = term.sum(axis=1)
        out[label_out] += by_column
        leaving -= by_column.sum(axis=1)
    end_block = (slice(None), rows[:, np.newaxis], end_columns[np.newaxis, :])
    weight = by_ends[end_block]
    by_ends[end_block] = weight * record.ends_kept
    ends = zeros((b, len(end_columns)))
    for label, share in record.to_ends.items():
        term = weight * share
        into[label] += term.sum(axis=2)
        by_end = term.sum(axis=1)
        ends += by_end
        leaving -= by_end.sum(axis=1)
    for label, share in record.shares_out.items():
        out[label] += leaving[:, np.newaxis] * share
    ends += leaving[:, np.newaxis] * record.shares_end
    for label in by_ways:
        by_ways[label][:, rows, record.n] = into[label]
        by_ways[label][:, row, columns] = out[label]
    by_ends[:, row, end_columns] = ends
