"""Why an approximation stops: what is otherwise at the temperature next beyond the edge of its window.

Every reason is a field of the result: how far a step is from equilibrium, how much of the pool an
intermediate holds, how the control is shared. Where none of them has changed, none is given.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.results import WITHIN, Approximation, EffectiveRate, Rate, Window

FloatArray = NDArray[np.float64]
EQUILIBRATED = 1.0 / (1.0 + WITHIN)
"""Reversibility above which a step before the slow one changes the rate by less than 5 %."""
COUNTS = 0.05
"""Control from which a saddle counts."""
HOLDS = 0.05
"""Share of the pool above which an intermediate is more than a trace."""


def reasons(result: EffectiveRate, rate: Rate, one: Approximation, window: Window) -> Iterator[str]:
    """Say why the approximation does not hold beyond each closed edge of a window."""
    t = result.temperature_k
    rising = np.argsort(t)
    inside = [int(k) for k in rising if window.from_k <= t[k] <= window.to_k]
    above = [] if window.open_above else [int(k) for k in rising if t[k] > window.to_k]
    below = [] if window.open_below else [int(k) for k in rising if t[k] < window.from_k][::-1]
    for word, beyond, within in (("above", above, inside[-1:]), ("below", below, inside[:1])):
        if not beyond or np.abs(one.ratio[beyond[0]] - 1.0) <= WITHIN:
            continue
        reason = _reason(result, rate, one, beyond[0], within)
        if reason:
            yield f"{word}, at {t[beyond[0]]:g} K, {reason}"


def _reason(
    result: EffectiveRate, rate: Rate, one: Approximation, k: int, within: list[int]
) -> str:
    """Say what is otherwise at temperature `k` than where the approximation holds (`within`)."""
    if one.name.startswith("steady state"):
        return _populated(result, rate, one, k)
    if one.name.startswith("pre-equilibrium"):
        return _returning(result, k, within[0]) if within else ""
    return _shared(rate, k)


def _populated(result: EffectiveRate, rate: Rate, one: Approximation, k: int) -> str:
    """Name the intermediate, that of the approximation or any, that holds most of the pool."""
    if rate.populations is None:
        return ""
    held = {name: x[k] for name, x in rate.populations.items() if name != result.subject}
    own = one.name.removeprefix("steady state of ")
    held = {own: held[own]} if own in held else held
    most = max(held, key=lambda name: held[name], default=None)
    if most is None or not held[most] >= HOLDS:
        return ""
    return f"{most} holds {100.0 * held[most]:.3g} % of the pool"


def _returning(result: EffectiveRate, k: int, inside: int) -> str:
    """Name the step that is in equilibrium inside and farthest from it at `k`."""
    found = [
        (float(step.reversibility[k]), step.equation)
        for step in result.steps
        if step.reversibility[k] < EQUILIBRATED <= step.reversibility[inside]
    ]
    if not found:
        return ""
    value, equation = min(found)
    return f"{equation} is no longer in equilibrium, its return is {value:.3g} of its way there"


def _shared(rate: Rate, k: int) -> str:
    """Say between which saddles the control is shared."""
    strong = sorted(
        ((float(rate.control[name][k]), name) for name in rate.saddles), key=lambda x: -abs(x[0])
    )
    strong = [(value, name) for value, name in strong if abs(value) >= COUNTS]
    if len(strong) < 2:
        return ""
    listed = " and ".join(f"{name} ({value:.2g})" for value, name in strong[:2])
    return f"the control is shared by {listed}"
