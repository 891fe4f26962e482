"""The doubt in sentences, each made from fields of the result and of nothing else."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.doubt.results import Answer, Doubt, Probability, RateDoubt
from thermo_pp.names import ALL_DEFINITIONS, Definition

FloatArray = NDArray[np.float64]
_OF: dict[Definition, str] = {
    "free": "per free reactant",
    "pool": "per pool",
    "relaxation": "of relaxation",
    "cycle": "of the cycle",
    "point": "at the point asked for",
}
_CLOSE_K = 298.15


def words(result: Doubt) -> tuple[str, ...]:
    """Return the sentences."""
    if not result.rates:
        return ()
    k = int(np.argmin(np.abs(result.temperature_k - _CLOSE_K)))
    sentences = [
        f"Doubt: {result.samples} samples of the energies, whose standard deviations are "
        f"{_range(result.deviation_kj_mol)} kJ/mol by the study's own word."
    ]
    for definition in ALL_DEFINITIONS:
        rate = result.rates.get(definition)
        if rate is not None and definition != "relaxation":
            sentences += _of_rate(result, definition, rate, k)
    return (*sentences, *_alternatives(result, k))


def _of_rate(result: Doubt, definition: Definition, rate: RateDoubt, k: int) -> list[str]:
    spread = rate.spread
    at = f"at {result.temperature_k[k]:g} K"
    low, high = np.exp(spread.log_bands[1, k]), np.exp(spread.log_bands[3, k])
    energy = spread.energy_bands_kj_mol[:, k]
    of = _OF[definition]
    found = [
        f"The rate {of} lies between {low:.2g} and {high:.2g} {rate.unit} {at} in two of three samples, E_a "
        f"between {energy[1]:.1f} and {energy[3]:.1f} kJ/mol (in 95 % between {energy[0]:.1f} and "
        f"{energy[4]:.1f}).",
        f"E_a {of} is negative {_how_often(spread.negative_energy, result)}.",
    ]
    what = f"{rate.answer.controlling_saddle[k]} as the saddle that controls the rate {of}"
    if rate.answer.resting_state is not None:
        what += f" and {rate.answer.resting_state[k]} as the resting state"
    if rate.answer.preferred_product is not None:
        what += f" and {rate.answer.preferred_product[k]} as the main product"
    found.append(f"{_one(spread.same_answer, k, spread.samples).capitalize()} {at} keep {what}.")
    total = rate.first_order_log_deviation[k]
    narrow = rate.narrowing
    best = narrow.best_for_log()[k]
    left = narrow.log_deviation_exact[narrow.names.index(best), k]
    if left < total:
        in_energy = rate.gibbs_deviation_kj_mol[k]
        found.append(
            f"Of all energies that of {best}, if it were exact, would narrow this rate most {at}: the "
            f"standard deviation of ln k from {total:.2f} to {left:.2f}, or in RT ln k from "
            f"{in_energy:.2f} to {in_energy * left / total:.2f} kJ/mol."
        )
    return found


def _how_often(probability: Probability, result: Doubt) -> str:
    values = probability.value
    if np.all(values == 1.0):
        return "in all samples"
    if np.all(values == 0.0):
        return "in no sample"
    low, high = int(np.argmin(values)), int(np.argmax(values))
    t = result.temperature_k
    first = f"with probability {values[low]:.4g} (error {probability.error[low]:.1g})"
    if values[low] == values[high]:
        return first
    return f"{first} at {t[low]:g} K to {values[high]:.4g} at {t[high]:g} K"


def _one(probability: Probability, k: int, samples: int) -> str:
    value = probability.value[k]
    if value == 1.0:
        return "all samples"
    return f"{100.0 * value:.1f} % of {samples} samples"


def _alternatives(result: Doubt, k: int) -> list[str]:
    """Say over which range the alternatives lie, and which of them change what controls or rests."""
    if not result.alternatives:
        return []
    found = []
    at = f"at {result.temperature_k[k]:g} K"
    for definition in ("pool", "cycle", "point", "free"):
        if definition not in result.rates:
            continue
        own = result.rates[definition].answer
        others = {
            f"{one.choice} {one.instead}": one.answers[definition]
            for one in result.alternatives
            if definition in one.answers
        }
        if not others:
            continue
        logs = np.array([other.log_rate[k] for other in others.values()])
        energies = np.array([other.arrhenius_energy_kj_mol[k] for other in others.values()])
        found.append(
            f"With other choices, {len(others)} in all, the rate {_OF[definition]} is "
            f"{np.exp(logs.min()):.3g} to {np.exp(logs.max()):.3g} {result.rates[definition].unit} {at} "
            f"and E_a {_range(energies)} kJ/mol; they are alternatives, not samples."
        )
        turned = [name for name, other in others.items() if _differs(own, other, k)]
        if turned:
            found.append(f"What controls, rests or is made {at} changes with {', '.join(turned)}.")
        else:
            found.append(f"None of them changes what controls or rests {at}.")
        break
    return found


def _differs(one: Answer, other: Answer, k: int) -> bool:
    return any(
        mine is not None and theirs is not None and mine[k] != theirs[k]
        for mine, theirs in (
            (one.controlling_saddle, other.controlling_saddle),
            (one.resting_state, other.resting_state),
            (one.preferred_product, other.preferred_product),
        )
    )


def _range(values: FloatArray) -> str:
    low, high = f"{values.min():.4g}", f"{values.max():.4g}"
    return low if low == high else f"{low} to {high}"
