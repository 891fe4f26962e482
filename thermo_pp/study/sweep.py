"""Sweeps: a study again and again with other values of its keys, in several processes, as one table."""

from __future__ import annotations

import csv
from collections.abc import Mapping, Sequence
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass
from multiprocessing import get_context
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from thermo_pp.collect.workers import usable_cores
from thermo_pp.errors import StudyError, ThermoError
from thermo_pp.names import Definition
from thermo_pp.study.changes import parse_value
from thermo_pp.study.load import Study

if TYPE_CHECKING:
    import pandas as pd

    from thermo_pp.kinetics.results import EffectiveRate, Rate

FloatArray = NDArray[np.float64]
ROWS_A_PROCESS = 4
"""Fewer rows are worked out here: starting another process would take longer."""


@dataclass(frozen=True, eq=False)
class SweptRate:
    """One definition of the rate, of one row.

    Attributes
    ----------
    definition : {"free", "pool", "relaxation", "cycle"}
    temperature_k, rate_constant, arrhenius_energy_kj_mol, activation_gibbs_kj_mol : shape (t,)
        Rate constants in s^-1; nan where not defined.
    resting : tuple of str or None
        Over temperature.
    controlling : tuple of str
        The saddle with the largest control in size.
    control : shape (t,)
    """

    definition: Definition
    temperature_k: FloatArray
    rate_constant: FloatArray
    arrhenius_energy_kj_mol: FloatArray
    activation_gibbs_kj_mol: FloatArray
    resting: tuple[str, ...] | None
    controlling: tuple[str, ...]
    control: FloatArray


@dataclass(frozen=True, eq=False)
class SweptRow:
    """The study with one set of values.

    Attributes
    ----------
    values : tuple
        In the order of the sweep's keys.
    rates : tuple of SweptRate
        Empty where it failed.
    error : str or None
        Why it failed.
    """

    values: tuple[Any, ...]
    rates: tuple[SweptRate, ...]
    error: str | None = None


@dataclass(frozen=True, eq=False)
class Sweep:
    """A study over a list of values.

    Attributes
    ----------
    keys : tuple of str
        Dotted keys of the study file.
    rows : tuple of SweptRow
        In the order of the values.
    """

    keys: tuple[str, ...]
    rows: tuple[SweptRow, ...]

    def table(self) -> pd.DataFrame:
        """Return one row a set of values, definition and temperature; one with `error` where it failed."""
        import pandas as pd

        rows: list[dict[str, Any]] = []
        for row in self.rows:
            values = dict(zip(self.keys, row.values, strict=True))
            if row.error is not None:
                rows.append({**values, "error": row.error})
            for rate in row.rates:
                for k, temperature in enumerate(rate.temperature_k):
                    rows.append(
                        {
                            **values,
                            "definition": rate.definition,
                            "temperature_k": temperature,
                            "rate_constant": rate.rate_constant[k],
                            "arrhenius_energy_kj_mol": rate.arrhenius_energy_kj_mol[k],
                            "activation_gibbs_kj_mol": rate.activation_gibbs_kj_mol[k],
                            "resting": None if rate.resting is None else rate.resting[k],
                            "controlling": rate.controlling[k],
                            "control": rate.control[k],
                            "error": None,
                        }
                    )
        return pd.DataFrame(rows)

    def _repr_html_(self) -> str:
        return str(self.table().to_html(index=False))


def sweep(
    study: Study,
    keys: Sequence[str],
    values: Sequence[Sequence[Any]],
    *,
    jobs: int | None = None,
) -> Sweep:
    """Return the rates of a study with other values of its keys.

    Parameters
    ----------
    study : Study
        Loaded; outputs that it has read are not read again.
    keys : sequence of str
        Dotted keys, see `thermo_pp.study.changes`.
    values : sequence of sequence
        One set of values a row, one value a key.
    jobs : int or None
        Processes; None: all cores, but no more than a fourth of the rows.

    Raises
    ------
    StudyError
        A key that no study file has, or that this one cannot have changed. What is wrong with one
        value is told in its row.
    """
    sets = [dict(zip(keys, row, strict=True)) for row in values]
    for changes in sets[:1]:
        study.check_changes(changes)
    count = jobs if jobs is not None else min(usable_cores(), len(sets) // ROWS_A_PROCESS)
    if min(count, len(sets)) <= 1:
        return Sweep(tuple(keys), tuple(_row(study, changes) for changes in sets))
    pool = ProcessPoolExecutor(
        min(count, len(sets)), get_context("spawn"), _take, (study.recipe(),)
    )
    with pool:
        return Sweep(tuple(keys), tuple(pool.map(_row_there, sets)))


_HERE: list[Study] = []
"""The study that this process works on."""


def _take(recipe: Any) -> None:
    _HERE[:] = [Study.from_recipe(recipe)]


def _row_there(changes: Mapping[str, Any]) -> SweptRow:
    return _row(_HERE[0], changes)


def _row(study: Study, changes: Mapping[str, Any]) -> SweptRow:
    """Return one row; what is wrong with the study's data is its error, a bug is not."""
    values = tuple(changes.values())
    try:
        result = study.changed(changes).effective()
    except ThermoError as error:
        return SweptRow(values, (), str(error))
    rates = tuple(_swept(result, rate) for rate in result.rates.values() if rate is not None)
    if not rates:
        why = "the network is not linear: no constant alone describes it"
        return SweptRow(values, (), why)
    return SweptRow(values, rates)


def _swept(result: EffectiveRate, rate: Rate) -> SweptRate:
    saddles = np.stack([rate.control[name] for name in rate.saddles])
    most = np.argmax(np.abs(np.nan_to_num(saddles)), axis=0)
    return SweptRate(
        definition=rate.definition,
        temperature_k=result.temperature_k,
        rate_constant=rate.rate_constant,
        arrhenius_energy_kj_mol=rate.arrhenius_energy_kj_mol,
        activation_gibbs_kj_mol=rate.activation.gibbs_kj_mol,
        resting=rate.resting_state,
        controlling=tuple(rate.saddles[int(k)] for k in most),
        control=saddles[most, np.arange(len(most))],
    )


def read_values(path: Path) -> tuple[tuple[str, ...], list[tuple[Any, ...]]]:
    """Read a CSV of values: dotted keys in the first line, a set of values in each other one.

    Raises
    ------
    StudyError
        No such file, a heading twice or empty, a line with another number of values.
    """
    mend = "write the keys in the first line and one value under each of them in every other"
    try:
        with path.open(encoding="utf-8-sig", newline="") as stream:
            lines = [(k, row) for k, row in enumerate(csv.reader(stream), start=1) if any(row)]
    except (OSError, UnicodeDecodeError, csv.Error) as error:
        what = f"the values cannot be read: {error}"
        raise StudyError(what, where=str(path), mend="name a CSV file (UTF-8)") from None
    if len(lines) < 2:
        raise StudyError("the file holds no values", where=str(path), mend=mend)
    keys = tuple(name.strip() for name in lines[0][1])
    if not all(keys) or len(set(keys)) < len(keys):
        what = f"the first line has a key twice or an empty one: {', '.join(keys)}"
        raise StudyError(what, where=f"{path}:{lines[0][0]}", mend=mend)
    found = []
    for number, row in lines[1:]:
        if len(row) != len(keys):
            what = f"{len(row)} values for {len(keys)} keys"
            raise StudyError(what, where=f"{path}:{number}", mend=mend)
        found.append(tuple(parse_value(cell.strip()) for cell in row))
    return keys, found
