"""What a map of regimes says, in sentences: each is made from fields of the result and of nothing else."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from itertools import pairwise
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from thermo_pp.names import Definition

if TYPE_CHECKING:
    from thermo_pp.kinetics.regime_map import AmountWindow, RegimeMap, Regimes

FloatArray = NDArray[np.float64]
WORKING_K = 298.15
"""The sentences are about the temperature of the map that comes nearest to this one."""
_OF: dict[Definition, str] = {
    "free": "per free reactant",
    "pool": "per pool",
    "cycle": "of the catalyst",
}


def words(regimes: Regimes) -> tuple[str, ...]:
    """Return what the maps say, a sentence each."""
    row = int(np.argmin(np.abs(regimes.temperature_k - WORKING_K)))
    sentences: list[str] = []
    for one in regimes.maps.values():
        sentences += _approximations(regimes, one, row)
        sentences += _names(regimes, one, row)
        sentences.append(_sign(regimes, one))
    return tuple(sentences)


def _at(regimes: Regimes, row: int) -> str:
    return f"At {regimes.temperature_k[row]:.10g} K"


def _approximations(regimes: Regimes, one: RegimeMap, row: int) -> Iterator[str]:
    for name in one.approximations:
        windows = one.windows[name][row]
        of = f"{name} ({_OF[one.definition]})"
        if not windows:
            yield f"{_at(regimes, row)} {of} holds at no {regimes.species} of the range."
            continue
        if windows[0].open_below and windows[0].open_above:
            yield f"{_at(regimes, row)} {of} holds at every {regimes.species} of the range."
            continue
        where = " and ".join(_interval(regimes, window) for window in windows)
        yield f"{_at(regimes, row)} {of} holds {where}{_beyond(regimes, one, name, row)}."


def _interval(regimes: Regimes, window: AmountWindow) -> str:
    species, unit = regimes.species, regimes.unit
    if window.open_below:
        return f"below {window.to_amount:.4g} {unit} of {species}"
    if window.open_above:
        return f"above {window.from_amount:.4g} {unit} of {species}"
    return f"from {window.from_amount:.4g} to {window.to_amount:.4g} {unit} of {species}"


def _beyond(regimes: Regimes, one: RegimeMap, name: str, row: int) -> str:
    """Say what rests and controls at the points of the map next to each edge, on its far side."""
    parts = []
    for window in one.windows[name][row]:
        beyond = np.flatnonzero(regimes.amount > window.to_amount)
        if not window.open_above and len(beyond):
            parts.append(f"above, at {_state(regimes, one, row, int(beyond[0]))}")
        before = np.flatnonzero(regimes.amount < window.from_amount)
        if not window.open_below and len(before):
            parts.append(f"below, at {_state(regimes, one, row, int(before[-1]))}")
    return "; " + "; ".join(parts) if parts else ""


def _state(regimes: Regimes, one: RegimeMap, row: int, column: int) -> str:
    amount = f"{regimes.amount[column]:.4g} {regimes.unit}"
    said = []
    saddle = one.controlling_name(row, column)
    if saddle is not None:
        said.append(f"{saddle} has a control of {one.control[row, column]:.3g}")
    if one.population is not None:
        share = 100.0 * one.population[row, column]
        said.append(f"{one.resting_name(row, column)} holds {share:.4g} %")
    return f"{amount}, {' and '.join(said) or 'nothing controls the rate'}"


def _names(regimes: Regimes, one: RegimeMap, row: int) -> Iterator[str]:
    families: list[tuple[str, Callable[[int, int], str | None]]] = [
        (f"the saddle that controls the rate {_OF[one.definition]} most is", one.controlling_name)
    ]
    if one.resting is not None:
        subject = "pool" if one.definition == "pool" else "catalyst"
        families.append((f"the {subject} rests as", one.resting_name))
    count = len(regimes.amount)
    for phrase, name_of in families:
        names = [name_of(row, k) or "none" for k in range(count)]
        if len(set(names)) == 1:
            yield f"{_at(regimes, row)} {phrase} {names[0]} at every {regimes.species} of the range."
            continue
        turns = [names[0]]
        for k, (before, after) in enumerate(pairwise(names)):
            if before != after:
                low, high = regimes.amount[k], regimes.amount[k + 1]
                turns.append(
                    f"{after} above a place between {low:.3g} and {high:.3g} {regimes.unit} of "
                    f"{regimes.species}"
                )
        yield f"{_at(regimes, row)} {phrase} {', then '.join(turns)}."


def _sign(regimes: Regimes, one: RegimeMap) -> str:
    """Say where over the map E_a is 0."""
    found = [
        (change.temperature_k, amount)
        for changes, amount in zip(one.sign_changes, regimes.amount, strict=True)
        for change in changes
    ]
    energies = one.arrhenius_energy_kj_mol[np.isfinite(one.arrhenius_energy_kj_mol)]
    of = f"E_a {_OF[one.definition]}"
    if found:
        low, high = min(found), max(found)
        return (
            f"{of} changes its sign on the map between {low[0]:.2f} K (at {low[1]:.3g} "
            f"{regimes.unit} of {regimes.species}) and {high[0]:.2f} K (at {high[1]:.3g} {regimes.unit})."
            if low != high
            else f"{of} changes its sign on the map at {low[0]:.2f} K and {low[1]:.3g} {regimes.unit} "
            f"of {regimes.species}."
        )
    if not len(energies):
        return f"{of} is not defined anywhere on the map."
    if np.all(energies < 0.0):
        return f"{of} is below zero all over the map."
    if np.all(energies > 0.0):
        return f"{of} is above zero all over the map."
    return f"{of} is {energies.min():.4g} to {energies.max():.4g} kJ/mol on the map."
