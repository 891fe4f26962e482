"""The doubt about every answer of a study: samples, first order, and what would narrow it."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from thermo_pp.errors import Finding, StudyError
from thermo_pp.kinetics.doubt.answers import answer, answer_of, find
from thermo_pp.kinetics.doubt.first_order import both_ways, deviation, narrowing, slopes
from thermo_pp.kinetics.doubt.moved import moved
from thermo_pp.kinetics.doubt.results import AlternativeAnswer, Doubt, RateDoubt
from thermo_pp.kinetics.doubt.sampling import sample
from thermo_pp.kinetics.doubt.words import words
from thermo_pp.kinetics.mass_action import log_held
from thermo_pp.kinetics.model import Model, Rates
from thermo_pp.kinetics.point import (
    FEWEST_SAMPLES,
    affordable,
    definitions,
    is_linear,
    temperatures,
)
from thermo_pp.kinetics.start import check_balance
from thermo_pp.units import GAS_J_MOL_K

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from thermo_pp.kinetics.asked import StudyLike
    from thermo_pp.kinetics.doubt.results import Answer
    from thermo_pp.kinetics.doubt.uncertain import Uncertainty
    from thermo_pp.names import Definition


RELAXATIONS = 2_000
"""How many decays of closed networks, found one at a time, the samples may take."""


def assess(
    study: StudyLike,
    uncertainty: Uncertainty,
    alternatives: Sequence[AlternativeAnswer] = (),
    findings: Sequence[Finding] = (),
) -> Doubt:
    """Return the doubt about every answer of a study over its temperatures.

    Parameters
    ----------
    study : StudyLike
    uncertainty : Uncertainty
        Of the energies.
    alternatives : sequence of AlternativeAnswer
        The answers with other choices, shown beside.
    findings : sequence of Finding
        Of these.

    Raises
    ------
    StudyError
        Held species whose stated amounts are in balance only as the energies are.
    """
    import scipy.linalg  # noqa: F401  a library that is not loaded yet cannot be limited
    from threadpoolctl import threadpool_limits

    with threadpool_limits(1), np.errstate(over="ignore"):
        rates, found = _rates(study, uncertainty)
        kelvin = temperatures(study.mechanism, study.conditions.temperature_k)
    own = list(findings)
    samples = uncertainty.samples if found is None else affordable(found, uncertainty.samples)
    if not rates:
        own.append(
            Finding(
                "doubt-not-linear",
                "warning",
                study.mechanism.where,
                None,
                "the network is not linear: it has no rate constant, and the study names no point at which "
                "its rate is asked for, so there is no answer to doubt",
                'name one: [effective] at = "start", "10 %" (a conversion) or "steady state" (of the flow)',
            )
        )
    elif samples < uncertainty.samples:
        own.append(
            Finding(
                "doubt-fewer-samples",
                "note",
                study.mechanism.where,
                None,
                f"{samples} samples of the energies instead of {uncertainty.samples}: each takes "
                f"{_each(study)} at each of {len(kelvin)} temperatures",
                "see the first-order deviations beside; the errors of the probabilities say what the "
                "samples are worth",
            )
        )
    if found is not None and any(step.tunnelling == "eckart" for step in study.mechanism.steps):
        own.append(
            Finding(
                "doubt-tunnelling-first-order",
                "note",
                study.mechanism.where,
                None,
                "Eckart tunnelling factors follow the heights of their barriers to first order in every sample",
                'compare with tunnelling = "none" to see what they are worth',
            )
        )
    for definition, rate in rates.items():
        if rate.spread.not_reached:
            own.append(
                Finding(
                    "doubt-not-reached",
                    "warning",
                    study.mechanism.where,
                    None,
                    f"{rate.spread.not_reached} of {samples} samples do not come to the point asked for; bands "
                    "and probabilities are those of the others",
                    "ask for a smaller conversion",
                )
            )
        if np.any(rate.spread.backwards.value > 0.0):
            own.append(
                Finding(
                    "doubt-direction",
                    "note",
                    study.mechanism.where,
                    None,
                    f"{definition}: the net reaction runs backwards in up to "
                    f"{100.0 * rate.spread.backwards.value.max():.3g} % of the samples; their size and E_a "
                    "are in the bands",
                    "read the bands as those of the size of the rate",
                )
            )
    result = Doubt(
        temperature_k=kelvin,
        names=uncertainty.names,
        deviation_kj_mol=uncertainty.deviation_kj_mol,
        correlation=uncertainty.correlation,
        samples=samples,
        seed=uncertainty.seed,
        rates=rates,
        alternatives=tuple(alternatives),
        findings=tuple(own),
    )
    return replace(result, words=words(result))


def answers(study: StudyLike) -> dict[Definition, Answer]:
    """Return the answers of a study as it stands; StudyError where it has none."""
    from threadpoolctl import threadpool_limits

    with threadpool_limits(1), np.errstate(over="ignore"):
        rates = _base(study)
        if is_linear(rates):
            rates.check()
        elif not definitions(rates):
            _ = rates.network  # says why there is no answer
        return {name: answer(rates, name) for name in definitions(rates)}


def _base(study: StudyLike) -> Rates:
    model = Model(study.mechanism, study.conditions, study.treatment, study.species)
    return model.at(temperatures(study.mechanism, study.conditions.temperature_k))


def _each(study: StudyLike) -> str:
    point = study.mechanism.point
    if point is None or point.conversion is None:
        return "a steady state"
    return "a time course" if point.conversion else "a start"


def _rates(
    study: StudyLike, uncertainty: Uncertainty
) -> tuple[Mapping[Definition, RateDoubt], Rates | None]:
    """Return the doubt about each definition, and the rates without shifts; nothing where there is none."""
    base = _base(study)
    known = definitions(base)
    if not known:
        return {}, None
    if is_linear(base):
        base.check()
    _check_balance(base, uncertainty)
    uncertainty = replace(uncertainty, samples=affordable(base, uncertainty.samples))
    batched: tuple[Definition, ...] = tuple(d for d in known if d != "relaxation")
    spreads = dict(sample(base, uncertainty, batched))
    if "relaxation" in known:
        few = max(FEWEST_SAMPLES, RELAXATIONS // len(base.energies.temperature_k))
        fewer = replace(uncertainty, samples=min(few, uncertainty.samples))
        spreads |= sample(base, fewer, ("relaxation",))
    around = both_ways(base, uncertainty)
    found: dict[Definition, RateDoubt] = {}
    for definition in known:
        by_log, by_energy = slopes(base, around, uncertainty, definition)
        by_first = deviation(by_log, uncertainty)
        stands = find(base, definition)
        found[definition] = RateDoubt(
            answer=answer_of(stands),
            first_order_log_deviation=by_first,
            first_order_energy_deviation_kj_mol=deviation(by_energy, uncertainty),
            gibbs_deviation_kj_mol=by_first * GAS_J_MOL_K * base.energies.temperature_k / 1000.0,
            narrowing=narrowing(by_log, by_energy, uncertainty),
            spread=spreads[definition],
            unit=stands.unit,
        )
    return found, base


def _check_balance(base: Rates, uncertainty: Uncertainty) -> None:
    """Refuse held species that are in balance with each other only as the energies are."""
    try:
        once = moved(base, uncertainty, uncertainty.drawn()[:1])
        if is_linear(once):
            once.check()
        elif not once.model.conditions.driven:
            amounts = log_held(once.model.conditions.held, once.equilibrium, once.energies)
            check_balance(once.model.mechanism, once.model.conditions, amounts, once.energies)
    except StudyError as error:
        raise StudyError(
            "held species are in balance at their stated amounts only as long as no energy is moved "
            f"({error.what})",
            where=error.where,
            mend='hold one of them at "equilibrium", so that its amount follows the energies, or take '
            "[doubt] out",
        ) from None
