"""The closing paragraph of a comparison: every sentence is made from fields of the result."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from thermo_pp.measured.results import Comparison, CurveBeside, EnergyDoubt, JointShift

FloatArray = NDArray[np.float64]
SAME_ODDS = 3.0
"""Odds below which two studies are not told apart (common practice, no source)."""


def words(result: Comparison) -> tuple[str, ...]:
    """Return the closing paragraph, a sentence each."""
    sentences: list[str] = []
    for curve in result.curves:
        sentences += _beside(result, curve)
    if result.energy_doubt is not None:
        sentences.append(_energies_known(result.energy_doubt, result.overridden))
    sentences += _alone(result)
    if result.joint is not None:
        sentences += _joint(result.joint)
    sentences += _rivals(result)
    return tuple(sentences)


def _beside(result: Comparison, curve: CurveBeside) -> Iterator[str]:
    if curve.expression is not None and curve.measured is not None:
        inside = np.isfinite(curve.measured)
        if not inside.any():
            yield (
                f"The {curve.name} holds from {curve.range_k[0]:g} K to {curve.range_k[1]:g} K, where the study has "
                "no temperature."
            )
            return
        t = curve.temperature_k[inside]
        ratio = curve.measured[inside] / curve.computed[inside]
        yield (
            f"The {curve.name}, is {_range(ratio)} times the computed rate constant ({curve.definition}) "
            f"{_between(t)}."
        )
        if curve.measured_energy_kj_mol is not None:
            measured = curve.measured_energy_kj_mol[inside]
            computed = curve.arrhenius_energy_kj_mol[inside]
            yield from _energies(measured, computed)
        return
    lines = set(curve.lines)
    here = [one for one in result.points if one.point.line in lines]
    ratio = np.exp([one.log_ratio for one in here])
    t = np.array([one.point.temperature_k for one in here])
    verb = "is" if len(here) == 1 else "are"
    yield (
        f"The {curve.name}, {verb} {_range(ratio)} times the computed rate constant ({curve.definition}) {_between(t)}."
    )
    best = max(
        (fit for fit in curve.fits if fit.chance is not None),
        key=lambda fit: fit.chance or 0.0,
        default=None,
    )
    if best is not None:
        verdict = "agrees" if (best.chance or 0.0) > 0.05 else "does not agree"
        yield (
            f"The {best.form} fit {verdict} with the points best: chi-square {best.chi_square:.3g} for "
            f"{best.degrees} degrees of freedom."
        )


def _energies(measured: FloatArray, computed: FloatArray) -> Iterator[str]:
    gap = measured - computed
    signs = (np.sign(measured) == np.sign(computed)).all()
    same = "of the same sign" if signs else "not of the same sign throughout"
    yield (
        f"E_a is {_range(measured)} kJ/mol measured and {_range(computed)} kJ/mol computed, {same}; the difference is "
        f"{_range(gap)} kJ/mol."
    )


def _energies_known(doubt: EnergyDoubt, overridden: str | None) -> str:
    how = "correlated" if doubt.correlated else "independent of each other"
    spread = f"{_range(doubt.deviation_kj_mol)} kJ/mol, {how}"
    if doubt.origin != "options":
        return f"The standard deviations of the energies, {spread}, are those of {doubt.origin}."
    instead = "" if overridden is None else f", not those of {overridden}"
    return f"The standard deviations of the energies, {spread}, are those of the options{instead}."


def _alone(result: Comparison) -> Iterator[str]:
    for state in result.states:
        if state.mean_kj_mol is None or state.mean_rms is None:
            yield f"No shift of {state.name} alone below 100 kJ/mol brings the two together."
            continue
        text = (
            f"Moving {state.name} alone by {state.mean_kj_mol:+.2f} kJ/mol brings the rate constants together on "
            f"average and leaves a factor of {np.exp(state.mean_rms):.3g} (root mean square)"
        )
        if state.within is not None and state.deviation_kj_mol is not None:
            where = "within" if state.within else "beyond"
            text += f"; that is {where} its standard deviation of {state.deviation_kj_mol:g} kJ/mol"
        yield f"{text}."
    if result.states and all(state.deviation_kj_mol is None for state in result.states):
        yield (
            "No standard deviations of the energies are given, so each controlling state is moved alone, and "
            "nothing says whether such a shift is likely."
        )


def _joint(joint: JointShift) -> Iterator[str]:
    if not joint.shift_kj_mol:
        yield "All energies may stay as they are."
    else:
        moves = ", ".join(f"{name} {shift:+.2f}" for name, shift in joint.shift_kj_mol.items())
        where = "all within" if joint.within else "not all within"
        yield (
            f"The most probable shift of all energies together is {moves} kJ/mol, {where} one standard deviation "
            f"each and {joint.length:.3g} standard deviations away from none."
        )
    verdict = "reconciles" if joint.reconciled else "does not reconcile"
    yield (
        f"It {verdict} computed and measured: chi-square falls from {joint.chi_square_before:.4g} to "
        f"{joint.chi_square:.4g} for {joint.observations} observations."
    )


def _rivals(result: Comparison) -> Iterator[str]:
    if len(result.rivals) < 2:
        return
    best, second = result.rivals[:2]
    odds = float(np.exp(min(second.behind, 700.0)))
    if odds < SAME_ODDS:
        yield (
            f"The measurements do not tell {best.file} and {second.file} apart: odds {odds:.3g} to 1, the "
            "energies' uncertainty integrated out."
        )
    else:
        yield (
            f"The measurements favour {best.file} over {second.file} by odds of {odds:.3g} to 1, the energies' "
            "uncertainty integrated out."
        )


def _between(t: FloatArray) -> str:
    return f"at {t[0]:g} K" if len(t) == 1 else f"from {t.min():g} K to {t.max():g} K"


def _range(values: FloatArray) -> str:
    low, high = f"{np.min(values):.4g}", f"{np.max(values):.4g}"
    return low if low == high else f"{low} to {high}"
