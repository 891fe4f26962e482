"""Regimes over temperature and one held amount: what holds, what rests, what controls, where E_a is 0.

A map is one batch: each of its points is a temperature with an amount of its own. Edges along the
amount and the contour along temperature are looked for in steps that do not depend on the points of
the map, so that a finer one moves nothing.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import Held
from thermo_pp.errors import StudyError
from thermo_pp.kinetics.approximate import ratios
from thermo_pp.kinetics.asked import StudyLike
from thermo_pp.kinetics.controls import sensitivity
from thermo_pp.kinetics.model import Model, Rates
from thermo_pp.kinetics.regime_map import (
    NOTHING,
    AmountWindow,
    RegimeMap,
    RegimeQuestion,
    Regimes,
)
from thermo_pp.kinetics.regime_words import words
from thermo_pp.kinetics.results import WITHIN, SignChange
from thermo_pp.kinetics.windows import (
    LOCATED_K,
    crossings_of_lines,
    scan_temperatures,
    sign_changes,
)
from thermo_pp.names import Definition
from thermo_pp.nearest import suggestion

FloatArray = NDArray[np.float64]
IndexArray = NDArray[np.intp]
MOST_POINTS = 200_000
"""Of a map."""
BLOCK = 2000
"""Points that are worked out together."""
_STEP = 0.1
"""In the logarithm of the amount, of the search for edges."""
LOCATED_LOG = 0.001
"""How far apart the logarithms are between which an edge is located: 0.1 % of the amount."""


def regimes(study: StudyLike, question: RegimeQuestion) -> Regimes:
    """Return the regimes over the study's temperatures and a range of one held amount.

    Raises
    ------
    StudyError
        The species is not held at an amount of this form, the range is empty, the map is too
        large, or held species fall out of balance with each other along it.
    """
    from threadpoolctl import threadpool_limits

    _check(study, question)
    model = Model(study.mechanism, study.conditions, study.treatment, study.species)
    with threadpool_limits(1), np.errstate(over="ignore"):
        survey = _Survey(model, question)
        grid = np.array(study.conditions.temperature_k)
        log_amount = np.linspace(np.log(question.low), np.log(question.high), question.points)
        maps = survey.maps(grid, log_amount)
    # the ends as they were given, not what exp(log) makes of them
    amount = np.exp(log_amount)
    amount[0], amount[-1] = question.low, question.high
    result = Regimes(grid, question.species, amount, question.unit, maps)
    return replace(result, words=words(result))


def _check(study: StudyLike, question: RegimeQuestion) -> None:
    held = study.conditions.held
    name, where = question.species, question.where
    if name not in held:
        raise StudyError(
            f"{name!r} is not held, so there are no regimes over it",
            where=where,
            mend=suggestion(name, held, "held species"),
        )
    if held[name].form != question.form:
        raise StudyError(
            f"{name} is held at {held[name].text!r}, which is no {question.form}",
            where=where,
            mend="write the range as the species is held, or hold it at such an amount: E_a differs",
        )
    if not 0.0 < question.low < question.high:
        raise StudyError(
            f"no range from {question.low:g} to {question.high:g} {question.unit}",
            where=where,
            mend="let it begin above 0 and end above its beginning",
        )
    count = len(study.conditions.temperature_k) * question.points
    if question.points < 2 or count > MOST_POINTS:
        raise StudyError(
            f"{question.points} points at {len(study.conditions.temperature_k)} temperatures",
            where=where,
            mend=f"ask for 2 points or more, and for a map of at most {MOST_POINTS}",
        )


class _Survey:
    """A model asked at temperatures with an amount of one species each."""

    def __init__(self, model: Model, question: RegimeQuestion) -> None:
        self.model, self.question = model, question
        first = self._rates(
            np.array(model.conditions.temperature_k[:1]), np.log([question.low])
        )  # also says what is wrong with the mechanism
        self.definitions: list[Definition] = [
            name for name in first.definitions() if name != "relaxation"
        ]

    def _rates(self, temperature_k: FloatArray, log_amount: FloatArray) -> Rates:
        conditions, question = self.model.conditions, self.question
        held = Held(question.form, np.exp(log_amount), question.species)
        varied = {**conditions.held, question.species: held}
        rates = replace(self.model, conditions=replace(conditions, held=varied)).at(temperature_k)
        rates.check()
        return rates

    def blocks(
        self,
        temperature_k: FloatArray,
        log_amount: FloatArray,
        ask: Callable[[Rates], dict[str, FloatArray]],
    ) -> dict[str, FloatArray]:
        """Return what is asked for at each pair, (n,) each, put together of blocks."""
        found = [
            ask(self._rates(temperature_k[k : k + BLOCK], log_amount[k : k + BLOCK]))
            for k in range(0, len(temperature_k), BLOCK)
        ]
        return {name: np.concatenate([one[name] for one in found]) for name in found[0]}

    def maps(self, grid: FloatArray, log_amount: FloatArray) -> dict[Definition, RegimeMap]:
        """Return the map of each definition."""
        shape = len(grid), len(log_amount)
        t, a = np.repeat(grid, shape[1]), np.tile(log_amount, shape[0])
        answers: dict[Definition, RegimeMap] = {}
        for definition in self.definitions:
            names: dict[str, tuple[str, ...]] = {}

            def ask(
                rates: Rates,
                of: Definition = definition,
                names: dict[str, tuple[str, ...]] = names,
            ) -> dict[str, FloatArray]:
                return _point(rates, of, self.question.species, names)

            found = self.blocks(t, a, ask)
            ratio = _ordered({n: found.pop(f"ratio {n}") for n in names["approximations"]})
            plain = {name: values.reshape(shape) for name, values in found.items()}
            stacked = np.array([v.reshape(shape) for v in ratio.values()]).reshape(-1, *shape)
            near = np.abs(stacked - 1.0) <= WITHIN
            answers[definition] = RegimeMap(
                definition=definition,
                rate_constant=plain["k"],
                arrhenius_energy_kj_mol=plain["energy"],
                order=plain["order"],
                approximations=tuple(ratio),
                ratio=stacked,
                holding=_first(near, shape),
                windows=self.windows(definition, tuple(ratio), grid),
                saddles=names["saddles"],
                controlling=plain["saddle"].astype(np.intp),
                control=plain["control"],
                states=names["states"],
                resting=plain["state"].astype(np.intp) if names["states"] else None,
                population=plain["population"] if names["states"] else None,
                sign_changes=self.contour(definition, grid, log_amount),
            )
        return answers

    def windows(
        self, definition: Definition, names: Sequence[str], grid: FloatArray
    ) -> dict[str, tuple[tuple[AmountWindow, ...], ...]]:
        """Return where over the amount each approximation holds, at each temperature."""
        if not names:
            return {}
        low, high = np.log(self.question.low), np.log(self.question.high)
        scan = np.linspace(low, high, 2 + int((high - low) / _STEP))
        shape = len(names), len(grid), len(scan)

        def all_of(t: FloatArray, a: FloatArray) -> FloatArray:
            found = self.blocks(t, a, lambda rates: ratios(rates, definition))
            return np.stack([found[name] for name in names])

        flat = all_of(np.repeat(grid, shape[2]), np.tile(scan, shape[1])).reshape(-1, shape[2])
        lines = len(flat)

        def curve(line: IndexArray, place: FloatArray) -> FloatArray:
            bound, own = np.divmod(line, lines)
            which, row = np.divmod(own, shape[1])
            ratio = all_of(grid[row], place)[which, np.arange(len(line))]
            return np.asarray(ratio - np.where(bound == 0, 1.0 + WITHIN, 1.0 - WITHIN))

        # both bounds on their own, so that a ratio that runs through 1 between two points is seen
        values = np.concatenate([flat - (1.0 + WITHIN), flat - (1.0 - WITHIN)])
        roots = crossings_of_lines(curve, scan, values, LOCATED_LOG)
        found = [
            _between(
                bool(abs(flat[k, 0] - 1.0) <= WITHIN),
                sorted(root for root, _ in (*roots[k], *roots[lines + k])),
                self.question,
            )
            for k in range(lines)
        ]
        return {
            name: tuple(found[k * shape[1] : (k + 1) * shape[1]]) for k, name in enumerate(names)
        }

    def contour(
        self, definition: Definition, grid: FloatArray, log_amount: FloatArray
    ) -> tuple[tuple[SignChange, ...], ...]:
        """Return at each amount the temperatures at which the Arrhenius energy changes its sign."""
        scan = scan_temperatures(float(grid.min()), float(grid.max()))

        def ask(rates: Rates) -> dict[str, FloatArray]:
            rate = rates.rate(definition)
            return {"energy": rate.energy_j_mol, "sign": rate.sign}

        def curve(line: IndexArray, place: FloatArray) -> FloatArray:
            return self.blocks(place, log_amount[line], ask)["energy"]

        count, points = len(log_amount), len(scan)
        values = curve(np.repeat(np.arange(count), points), np.tile(scan, count))
        roots = crossings_of_lines(curve, scan, values.reshape(count, points), LOCATED_K)
        flat = [(k, root) for k, found in enumerate(roots) for root, _ in found]
        poles: set[tuple[int, float]] = set()
        if flat:
            # where the net reaction changes its direction the energy has a pole and no zero
            own, place = np.array([k for k, _ in flat]), np.array([root for _, root in flat])
            below, above = (
                self.blocks(np.clip(place + by, scan[0], scan[-1]), log_amount[own], ask)["sign"]
                for by in (-LOCATED_K, LOCATED_K)
            )
            poles = {flat[k] for k in np.flatnonzero(below != above)}
        return tuple(
            sign_changes([root for root in found if (k, root[0]) not in poles])
            for k, found in enumerate(roots)
        )


def _point(
    rates: Rates, definition: Definition, species: str, names: dict[str, tuple[str, ...]]
) -> dict[str, FloatArray]:
    """Return what a map shows at each point; the names that its numbers stand for go to `names`."""
    log_rate, network = rates.rate(definition), rates.network
    sensed = sensitivity(log_rate, network, rates.steps.names)
    saddles = np.stack([sensed.control[name] for name in sensed.saddles])
    size = np.nan_to_num(np.abs(saddles), nan=-1.0)
    most = np.argmax(size, axis=0)
    members, shares = _members(rates, definition)
    found = {
        "k": log_rate.sign * np.exp(log_rate.log),
        "energy": log_rate.energy_j_mol / 1000.0,
        "order": sensed.orders.get(species, np.zeros(len(log_rate.log))),
        "saddle": most.astype(np.float64),
        "control": saddles[most, np.arange(len(most))],
        **{f"ratio {name}": values for name, values in ratios(rates, definition).items()},
    }
    if members:
        found["state"] = np.argmax(shares, axis=1).astype(np.float64)
        found["population"] = shares.max(axis=1)
    names["saddles"], names["states"] = sensed.saddles, members
    names["approximations"] = tuple(name[6:] for name in found if name.startswith("ratio "))
    return found


def _members(rates: Rates, definition: Definition) -> tuple[tuple[str, ...], FloatArray]:
    """Return the states that share the pool or the catalyst, and their shares, shape (b, n)."""
    if definition == "cycle":
        _, states, shares = rates.cycle
    elif definition == "pool":
        states, shares = list(rates.pool.members), rates.pool.populations
    else:
        return (), np.zeros((0, 0))
    return tuple(rates.network.states[k][0][0] for k in states), shares


_FIRST_NAMED = ("pre-equilibrium", "steady state of all", "steady state", "energetic span")
"""Beginnings of names, in the order in which they are named where several hold."""


def _ordered(found: dict[str, FloatArray]) -> dict[str, FloatArray]:
    def place(name: str) -> int:
        return next(k for k, start in enumerate(_FIRST_NAMED) if name.startswith(start))

    return {name: found[name] for name in sorted(found, key=place)}


def _first(near: NDArray[np.bool_], shape: tuple[int, int]) -> IndexArray:
    """Return the number of the first that holds at each point, `NOTHING` where none does."""
    if not len(near):
        return np.full(shape, NOTHING, np.intp)
    return np.where(near.any(axis=0), np.argmax(near, axis=0), NOTHING)


def _between(
    inside: bool, edges: list[float], question: RegimeQuestion
) -> tuple[AmountWindow, ...]:
    """Return the windows between edges (logarithms), `inside` one at the lower end already."""
    low, high = np.log(question.low), np.log(question.high)
    bounds = [low, *edges] if inside else list(edges)
    open_above = len(bounds) % 2 == 1
    if open_above:
        bounds.append(high)
    pairs = list(zip(bounds[::2], bounds[1::2], strict=True))
    return tuple(
        AmountWindow(
            question.low if inside and k == 0 else float(np.exp(a)),
            question.high if open_above and k == len(pairs) - 1 else float(np.exp(b)),
            inside and k == 0,
            open_above and k == len(pairs) - 1,
        )
        for k, (a, b) in enumerate(pairs)
        # a ratio that jumps from one side to the other leaves nothing between
        if b - a > LOCATED_LOG
    )
