"""The effective rate of a network that is not linear: turnover of a catalyst, or steps and a time course."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import StudyError
from thermo_pp.kinetics.courses import USUAL_K
from thermo_pp.kinetics.holding import with_holding
from thermo_pp.kinetics.limit_share import with_limits
from thermo_pp.kinetics.mass_action import log_held
from thermo_pp.kinetics.model import Model, Rates
from thermo_pp.kinetics.network import NotLinear
from thermo_pp.kinetics.point import point_rate
from thermo_pp.kinetics.results import EffectiveRate, Rate, StepRate
from thermo_pp.kinetics.start import check_balance
from thermo_pp.kinetics.steps import rate_unit
from thermo_pp.kinetics.tunnelling_share import with_tunnelling
from thermo_pp.kinetics.turnover import turnover
from thermo_pp.kinetics.words import words
from thermo_pp.names import DEFINITIONS, Definition

if TYPE_CHECKING:
    from thermo_pp.kinetics.asked import StudyLike
    from thermo_pp.mechanism import RatePoint

FloatArray = NDArray[np.float64]


def not_linear(study: StudyLike, model: Model, rates: Rates, error: NotLinear) -> EffectiveRate:
    """Return the answer for a network that is not linear.

    A catalyst with its total has a turnover frequency. Anything else has no constant of its own:
    then the answer has the steps, and the time course or the flow says the rest.

    Raises
    ------
    StudyError
        The study says of no amounts what there is.
    """
    mechanism, conditions = study.mechanism, study.conditions
    found: dict[Definition, Rate | None] = dict.fromkeys(DEFINITIONS)
    steps = len(mechanism.steps)
    reversibility: Mapping[int, FloatArray] = {
        k: np.full(len(conditions.temperature_k), np.nan) for k in range(steps)
    }
    net = ""
    if not conditions.initial and not conditions.total and conditions.flow is None:
        how = 'follow it in time: [conditions] initial = { ... = "0.1 mol/L" }'
        if mechanism.catalyst is not None:
            how = (
                "say how much of the catalyst there is: [conditions] total = "
                f'{{ {mechanism.catalyst} = "1e-3 mol/L" }}'
            )
        raise StudyError(error.what, where=error.where, mend=f"{error.mend}, or {how}") from None
    logs = log_held(conditions.held, rates.equilibrium, rates.energies)
    if mechanism.catalyst is not None and conditions.total:
        if not conditions.driven:
            check_balance(mechanism, conditions, logs, rates.energies)
        turned = turnover(model, rates)
        found["cycle"], net, reversibility = turned.rate, turned.net_reaction, turned.reversibility
        found = with_limits(with_holding(with_tunnelling(found, rates), rates), rates)
    result = EffectiveRate(
        temperature_k=rates.energies.temperature_k,
        subject=mechanism.catalyst or mechanism.reactant or "",
        net_reaction=net,
        reactant_coefficient=1,
        standard_state=study.treatment.standard_state.text,
        rates=found,
        steps=step_rates(rates, reversibility),
        held_mol_l={name: np.asarray(np.exp(log), dtype=np.float64) for name, log in logs.items()},
        findings=tuple(dict.fromkeys((*study.findings, *rates.steps.findings))),
    )
    if found["cycle"] is None:
        said: tuple[str, ...] = (
            f"{error.what[0].upper()}{error.what[1:]}: no constant alone describes it; the time "
            "course and the steady state of a flow do.",
        )
        if mechanism.point is not None:
            said += (_point_words(model, mechanism.point),)
        return replace(result, words=said)
    return replace(result, words=words(result))


def _point_words(model: Model, point: RatePoint) -> str:
    """Say what the rate at the declared point is, at the temperature nearest to 298.15 K."""
    kelvin = min(model.conditions.temperature_k, key=lambda t: abs(t - USUAL_K))
    at = point_rate(model.at(np.array([kelvin])))
    by = max(at.saddles, key=lambda name: float(at.control[name][0]))
    law = " ".join(f"[{n}]" if p == 1 else f"[{n}]^{p}" for n, p in point.law.items())
    over = f" over {law}" if law else ""
    place = "the start" if point.text == "start" else f"a conversion of {point.text}"
    if point.conversion is None:
        place = "the steady state of the flow"
    return (
        f"At {place} and {kelvin:g} K the loss of {model.mechanism.reactant}{over} is "
        f"{at.sign[0] * np.exp(at.log[0]):.4g} {at.unit}, E_a {at.energy_j_mol[0] / 1000.0:.4g} kJ/mol; "
        f"{by} controls it most (X {at.control[by][0]:.3g})."
    )


def step_rates(rates: Rates, reversibility: Mapping[int, FloatArray]) -> tuple[StepRate, ...]:
    """Return every step's own constants beside its reversibility."""
    return tuple(
        StepRate(
            equation=step.equation,
            forward_rate_constant=np.exp(rates.steps.log_forward[:, number]),
            reverse_rate_constant=np.exp(rates.steps.log_reverse[:, number]),
            forward_unit=rate_unit(step.reactants),
            reverse_unit=rate_unit(step.products),
            reversibility=reversibility[number],
            limited=rates.steps.limited[:, number],
            tunnelling=step.tunnelling,
            log_transmission=rates.steps.log_transmission[:, number],
            log_tunnelling=rates.steps.log_kappa[:, number],
            tunnelling_energy_kj_mol=rates.steps.kappa_energy_j_mol[:, number] / 1000.0,
        )
        for number, step in enumerate(rates.model.mechanism.steps)
    )
