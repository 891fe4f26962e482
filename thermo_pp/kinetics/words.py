"""The closing paragraph of the effective rate: what holds where, which state rests, what the number is relative to.

Every sentence is made from fields of the result and of nothing else; a sentence whose fields say
nothing is left out.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from itertools import groupby

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.reasons import reasons
from thermo_pp.kinetics.results import (
    NEXT_DECAY_BELOW,
    NOTABLE,
    SLOW_SHARE_BELOW,
    Approximation,
    EffectiveRate,
    Rate,
    Window,
)
from thermo_pp.names import Definition

FloatArray = NDArray[np.float64]


def words(result: EffectiveRate) -> tuple[str, ...]:
    """Return the closing paragraph, a sentence each."""
    sentences: list[str] = [_net(result)]
    for definition, rate in result.rates.items():
        if rate is None or definition == "relaxation":
            continue
        sentences.append(_value(result, definition, rate))
        sentences += _backwards(result, rate)
        sentences.append(_sign(result, rate))
        if rate.populations is not None:
            sentences.append(_resting(result, definition, rate))
        sentences += _controlling(result, rate)
        sentences += [_window(result, rate, one) for one in rate.approximations]
    sentences += _comparisons(result)
    sentences += _limits(result)
    return tuple(sentences)


def _net(result: EffectiveRate) -> str:
    held = ", ".join(
        f"{name} at {_range(values)} mol/L" for name, values in result.held_mol_l.items()
    )
    kept = f", with {held}" if held else ""
    return f"The net reaction is {result.net_reaction}; rates count its extent{kept}."


_RELATIVE_TO = {
    "free": "free {0} (the intermediates at steady state)",
    "pool": "{0} and its intermediates together (what a decay experiment follows)",
    "cycle": "all forms of {0} together",
}


def _value(result: EffectiveRate, definition: Definition, rate: Rate) -> str:
    t, k = result.temperature_k, rate.rate_constant
    subject = _RELATIVE_TO[definition].format(result.subject)
    if len(t) == 1:
        return f"Relative to {subject} the constant is {k[0]:.3g} s^-1 at {t[0]:g} K."
    low, high = int(np.argmin(t)), int(np.argmax(t))
    return (
        f"Relative to {subject} the constant is {k[low]:.3g} s^-1 at {t[low]:g} K and "
        f"{k[high]:.3g} s^-1 at {t[high]:g} K."
    )


def _sign(result: EffectiveRate, rate: Rate) -> str:
    energies = rate.arrhenius_energy_kj_mol
    several = len(energies) > 1
    asked = " at the temperatures asked for" if several else f" at {result.temperature_k[0]:g} K"
    if not np.isfinite(energies).any():
        return f"E_a is not defined{asked}: the rate is 0."
    value = f"E_a is {_range(energies)} kJ/mol{asked}"
    if rate.sign_changes:
        turns = " and ".join(f"a {c.kind} at {c.temperature_k:.2f} K" for c in rate.sign_changes)
        return f"{value} and changes its sign in between: the rate has {turns}."
    throughout = " throughout" if several else ""
    if np.all(energies < 0.0):
        return f"{value}, below zero{throughout}: the reaction slows down on heating."
    if np.all(energies > 0.0):
        return f"{value}, above zero{throughout}: the reaction speeds up on heating."
    return f"{value}."


def _backwards(result: EffectiveRate, rate: Rate) -> Iterator[str]:
    backwards = rate.rate_constant < 0.0
    if backwards.any():
        yield f"The net reaction runs backwards {_where(result, backwards)}: the constant is below zero."


def _resting(result: EffectiveRate, definition: Definition, rate: Rate) -> str:
    assert rate.resting_state is not None
    assert rate.populations is not None
    subject = "The pool" if definition == "pool" else "The catalyst"
    parts = [
        f"as {name} ({_percent(rate.populations[name][where])}) {_where(result, where)}"
        for name, where in _runs(result, rate.resting_state)
    ]
    return f"{subject} rests {', '.join(parts)}."


def _controlling(result: EffectiveRate, rate: Rate) -> Iterator[str]:
    saddles = np.stack([rate.control[name] for name in rate.saddles])
    if not np.isfinite(saddles).any():
        return
    saddles = np.nan_to_num(saddles)
    best = tuple(rate.saddles[int(k)] for k in np.argmax(np.abs(saddles), axis=0))
    parts = [
        f"{name} (control {_range(rate.control[name][where])}) {_where(result, where)}"
        for name, where in _runs(result, best)
    ]
    yield f"The saddle that controls this rate most is {', '.join(parts)}."


def _window(result: EffectiveRate, rate: Rate, one: Approximation) -> str:
    name = one.name[0].upper() + one.name[1:]
    ratio = f"its ratio to the exact constant is {_range(one.ratio)}"
    if len(result.temperature_k) == 1:
        holds = "holds" if one.windows else "does not hold"
        return f"{name} {holds} at {result.temperature_k[0]:g} K; {ratio}."
    if not one.windows:
        return f"{name} does not hold anywhere in the range; {ratio}."
    if all(w.open_below and w.open_above for w in one.windows):
        return f"{name} holds at every temperature of the range; {ratio}."
    where = " and ".join(_interval(w) for w in one.windows)
    why = "".join(f"; {reason}" for w in one.windows for reason in reasons(result, rate, one, w))
    return f"{name} holds {where}; {ratio}{why}."


def _interval(window: Window) -> str:
    if window.open_below:
        return f"up to {window.to_k:.2f} K"
    if window.open_above:
        return f"from {window.from_k:.2f} K up"
    return f"from {window.from_k:.2f} K to {window.to_k:.2f} K"


def _comparisons(result: EffectiveRate) -> Iterator[str]:
    free, pool, relaxing = (result.rates[name] for name in ("free", "pool", "relaxation"))
    if free is not None and pool is not None:
        ratio = _over(pool.rate_constant, free.rate_constant)
        if np.all(np.abs(ratio - 1.0) <= NOTABLE):
            yield (
                f"It makes no difference here (5 %) whether the rate is taken over free {result.subject} or "
                "over the pool."
            )
        elif np.isfinite(ratio).any():
            yield (
                f"The pool's constant is {_range(ratio)} times that per free {result.subject}: say which "
                "one is meant."
            )
    if pool is not None and pool.slow_share is not None and pool.next_decay_ratio is not None:
        share, following = pool.slow_share, pool.next_decay_ratio
        mixed = (share < SLOW_SHARE_BELOW) | (following < NEXT_DECAY_BELOW)
        if mixed.any():
            yield (
                f"The pool does not decay with one constant {_where(result, mixed)}: the slowest decay "
                f"has a share of {_range(share[mixed])}, the next is {_range(following[mixed])} times faster."
            )
    if pool is not None and relaxing is not None:
        ratio = _over(relaxing.rate_constant, pool.rate_constant)
        differ = np.abs(ratio - 1.0) > NOTABLE
        if differ.any():
            yield (
                f"Where the product stays, the relaxation is {_range(ratio[differ])} times the pool's "
                f"decay {_where(result, differ)}: the product comes back."
            )
    for rate in (free, pool):
        if rate is not None and rate.branching is not None:
            shares = ", ".join(f"{name} {_percent(x)}" for name, x in rate.branching.items())
            over = "free reactant" if rate is free else "pool"
            yield f"The products' shares per {over} are {shares}."


def _limits(result: EffectiveRate) -> Iterator[str]:
    for step in result.steps:
        if step.limited.any():
            where = _where(result, step.limited)
            yield f"Step {step.equation} runs at its encounter limit {where}."


def _runs(result: EffectiveRate, names: Sequence[str]) -> Iterator[tuple[str, NDArray[np.bool_]]]:
    """Group neighbouring temperatures of the same name, coldest first."""
    order = np.argsort(result.temperature_k, kind="stable")
    for name, places in groupby(order, key=lambda k: names[int(k)]):
        where = np.zeros(len(order), np.bool_)
        where[list(places)] = True
        yield name, where


def _where(result: EffectiveRate, where: NDArray[np.bool_]) -> str:
    """Say at which temperatures, those beside each other as one range."""
    if where.all() and len(where) > 1:
        return "at every temperature"
    ranges = []
    order = np.argsort(result.temperature_k, kind="stable")
    for inside, places in groupby(order, key=lambda k: bool(where[k])):
        t = result.temperature_k[list(places)]
        if inside:
            ranges.append(f"at {t[0]:g} K" if len(t) == 1 else f"from {t[0]:g} K to {t[-1]:g} K")
    return " and ".join(ranges)


def _over(one: FloatArray, other: FloatArray) -> FloatArray:
    """Return a quotient, nan or inf where a constant is too small or too large for an ordinary number."""
    with np.errstate(all="ignore"):
        return np.asarray(one / other)


def _range(values: FloatArray) -> str:
    finite = np.asarray(values)[np.isfinite(values)]
    if not len(finite):
        return "undefined"
    low, high = f"{finite.min():.4g}", f"{finite.max():.4g}"
    return low if low == high else f"{low} to {high}"


def _percent(values: FloatArray) -> str:
    low, high = f"{100 * values.min():.4g}", f"{100 * values.max():.4g}"
    return f"{low} %" if low == high else f"{low} to {high} %"
