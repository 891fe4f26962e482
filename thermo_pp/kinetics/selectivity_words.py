"""What a selectivity says, in sentences: each is made from fields of the results and of nothing else."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.results import WITHIN, EffectiveRate, Window

if TYPE_CHECKING:
    from thermo_pp.kinetics.product_ratio import CurtinHammett, ProductRatio, Selectivity

FloatArray = NDArray[np.float64]
WORKING_K = 298.15
"""The sentences are about the temperature that comes nearest to this one."""
CONTROLLING = 0.1
"""Smallest control of a ratio that is told."""
EQUILIBRATED = 0.95
"""Reversibility from which a step counts as being at equilibrium."""
_EXCESS = {
    "products": "excess",
    "enantiomeric": "enantiomeric excess",
    "diastereomeric": "diastereomeric excess",
    "isotopic": "isotopic excess",
}


def words(found: Selectivity, effective: EffectiveRate) -> tuple[str, ...]:
    """Return what the ratios say, a sentence each."""
    row = int(np.argmin(np.abs(found.temperature_k - WORKING_K)))
    sentences: list[str] = []
    for one in found.ratios:
        sentences += _ratio(found, one, row)
        sentences += _control(found, one, row)
        if one.curtin_hammett is not None:
            sentences.append(_curtin_hammett(found, effective, one, one.curtin_hammett, row))
    return tuple(sentences)


def _at(found: Selectivity, row: int) -> str:
    return f"At {found.temperature_k[row]:.10g} K"


def _ratio(found: Selectivity, one: ProductRatio, row: int) -> Iterator[str]:
    ratio = one.ratio[row]
    if not np.isfinite(ratio) or ratio <= 0.0:
        yield f"{_at(found, row)} {one.product} and {one.other} are not both made: they have no ratio."
        return
    excess = f"{_EXCESS[found.kind]} {100.0 * one.excess[row]:.4g} %"
    yield (
        f"{_at(found, row)} {one.product} is made {ratio:.4g} times as fast as {one.other} ({excess}), "
        f"which is worth {one.gibbs_kj_mol[row]:.4g} kJ/mol."
    )
    change = one.enthalpy_kj_mol[row]
    if change != 0.0:
        way = "grows" if change > 0.0 else "shrinks"
        yield (
            f"This ratio {way} on heating: the Arrhenius energies differ by {change:.4g} kJ/mol."
        )


def _control(found: Selectivity, one: ProductRatio, row: int) -> Iterator[str]:
    strong = sorted(
        (name for name, x in one.control.items() if abs(x[row]) > CONTROLLING),
        key=lambda name: -abs(one.control[name][row]),
    )
    if strong:
        listed = ", ".join(f"{name} ({one.control[name][row]:.3g})" for name in strong)
        yield f"{_at(found, row)} the ratio is controlled by {listed}."


def _curtin_hammett(
    found: Selectivity,
    effective: EffectiveRate,
    one: ProductRatio,
    approximate: CurtinHammett,
    row: int,
) -> str:
    first, second = approximate.saddles_over[row]
    said = f"Curtin-Hammett ({one.product} through {first}, {one.other} through {second})"
    if not approximate.windows:
        return f"{said} does not hold anywhere in the range{_why(found, effective, approximate)}."
    if all(w.open_below and w.open_above for w in approximate.windows):
        return f"{said} holds at every temperature looked at."
    where = " and ".join(_interval(window) for window in approximate.windows)
    return f"{said} holds {where}{_why(found, effective, approximate)}."


def _interval(window: Window) -> str:
    if window.open_below:
        return f"up to {window.to_k:.2f} K"
    if window.open_above:
        return f"from {window.from_k:.2f} K up"
    return f"from {window.from_k:.2f} K to {window.to_k:.2f} K"


def _why(found: Selectivity, effective: EffectiveRate, approximate: CurtinHammett) -> str:
    """Say which steps, products aside, are farthest from equilibrium where it fails worst."""
    off = np.abs(approximate.over_exact - 1.0)
    if not np.any(off > WITHIN):
        return ""
    worst = int(np.nanargmax(off))
    slow = [
        (step.reversibility[worst], step.equation)
        for step in effective.steps
        if step.reversibility[worst] < EQUILIBRATED and not _makes(step.equation, found)
    ]
    if not slow:
        return f"; at {found.temperature_k[worst]:g} K it is {approximate.over_exact[worst]:.3g} times the ratio"
    listed = " and ".join(f"{equation} ({value:.2g})" for value, equation in sorted(slow)[:2])
    return (
        f"; at {found.temperature_k[worst]:g} K it is {approximate.over_exact[worst]:.3g} times the ratio, "
        f"because the interconversion is not fast there: reversibility of {listed}"
    )


def _makes(equation: str, found: Selectivity) -> bool:
    terms = equation.replace("=", " ").replace("+", " ").split()
    return any(name in terms for product in found.rates for name in product.split(" + "))
