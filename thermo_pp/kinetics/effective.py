"""The effective rate of a study: exact, approximate, what controls it, and where its sign changes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.approximate import approximate
from thermo_pp.kinetics.closed import decay_shares
from thermo_pp.kinetics.controls import (
    Sensitivity,
    activation,
    collider_orders,
    sensitivity,
    standard_activation,
)
from thermo_pp.kinetics.edges import LogRate
from thermo_pp.kinetics.free import steady_state
from thermo_pp.kinetics.holding import with_holding
from thermo_pp.kinetics.limit_share import with_limits
from thermo_pp.kinetics.model import Model, Rates
from thermo_pp.kinetics.net_reaction import net_reaction, write_side
from thermo_pp.kinetics.network import NotLinear
from thermo_pp.kinetics.not_linear import not_linear, step_rates
from thermo_pp.kinetics.products import formation
from thermo_pp.kinetics.rate_findings import rate_findings, unused_point
from thermo_pp.kinetics.results import (
    NEXT_DECAY_BELOW,
    SLOW_SHARE_BELOW,
    Approximation,
    EffectiveRate,
    Rate,
    SignChange,
    StepRate,
)
from thermo_pp.kinetics.tunnelling_share import with_tunnelling
from thermo_pp.kinetics.windows import LOCATED_K, crossings, scan_temperatures, sign_changes
from thermo_pp.kinetics.words import words
from thermo_pp.names import DEFINITIONS, Definition

if TYPE_CHECKING:
    from collections.abc import Mapping

    from thermo_pp.kinetics.asked import StudyLike

FloatArray = NDArray[np.float64]
_CONTROLLING = 0.1
_FARTHEST_SHIFT_KJ_MOL = 100.0


def effective(study: StudyLike) -> EffectiveRate:
    """Return the effective rate of a study over its temperatures.

    Raises
    ------
    StudyError
        The network is not linear, has no way from reactant to product, or holds species that are
        out of balance.
    """
    import scipy.linalg  # noqa: F401  a library that is not loaded yet cannot be limited
    from threadpoolctl import threadpool_limits

    # the matrices are small: threads would only wait for each other; what is too large for an
    # ordinary number becomes inf
    with threadpool_limits(1), np.errstate(over="ignore"):
        return _effective(study)


def _effective(study: StudyLike) -> EffectiveRate:
    model = Model(study.mechanism, study.conditions, study.treatment, study.species)
    grid = np.array(study.conditions.temperature_k)
    rates = model.at(grid)
    try:
        _ = rates.network
    except NotLinear as error:
        answer = not_linear(study, model, rates, error)
        further = rate_findings(answer.rates, rates, study.mechanism.where)
        return replace(answer, findings=tuple(dict.fromkeys((*answer.findings, *further))))
    definitions = rates.definitions()
    scan = scan_temperatures(float(grid.min()), float(grid.max()))
    wide = model.at(scan)
    for looked_at in (rates, wide):
        looked_at.check()
    changes = _sign_changes(model, wide, definitions, scan)
    approximations = approximate(rates, wide, definitions, scan)
    found: dict[Definition, Rate | None] = dict.fromkeys(DEFINITIONS)
    for definition in definitions:
        found[definition] = _rate(
            definition, rates, changes[definition], approximations[definition]
        )
    found = with_limits(with_holding(with_tunnelling(found, rates), rates), rates)
    steps = _step_rates(rates)
    findings = (
        *study.findings,
        *rates.steps.findings,
        *unused_point(study.mechanism),
        *rate_findings(found, rates, study.mechanism.where),
    )
    net, coefficient = net_reaction(rates)
    result = EffectiveRate(
        temperature_k=grid,
        subject=study.mechanism.catalyst or study.mechanism.reactant or "",
        net_reaction=net,
        reactant_coefficient=coefficient,
        standard_state=study.treatment.standard_state.text,
        rates=found,
        steps=steps,
        held_mol_l=_held(rates),
        constant=study.conditions.constant,
        findings=tuple(dict.fromkeys(findings)),
    )
    return replace(result, words=words(result))


def _sign_changes(
    model: Model, wide: Rates, definitions: Sequence[Definition], scan: FloatArray
) -> dict[Definition, tuple[SignChange, ...]]:
    """Return where each Arrhenius energy changes its sign."""

    def curves(temperature_k: FloatArray) -> FloatArray:
        rates = model.at(temperature_k)
        return np.stack([rates.rate(name).energy_j_mol for name in definitions], axis=1)

    values = np.stack([wide.rate(name).energy_j_mol for name in definitions], axis=1)
    roots = crossings(curves, scan, values)
    return {
        name: sign_changes([root for root in roots[k] if not _reverses(model, name, root[0], scan)])
        for k, name in enumerate(definitions)
    }


def _reverses(model: Model, definition: Definition, temperature_k: float, scan: FloatArray) -> bool:
    """Whether the net reaction changes its direction here, where the Arrhenius energy has a pole and no zero."""
    around = np.clip(temperature_k + np.array([-LOCATED_K, LOCATED_K]), scan[0], scan[-1])
    below, above = model.at(around).rate(definition).sign
    return bool(below != above)


def _rate(
    definition: Definition,
    rates: Rates,
    changes: tuple[SignChange, ...],
    approximations: tuple[Approximation, ...],
) -> Rate:
    log_rate = rates.rate(definition)
    network, model = rates.network, rates.model
    t = network.temperature_k
    sensed = sensitivity(log_rate, network, rates.steps.names)
    states = {name: model.species[name].at(t[:1]).standard_state for name in sensed.orders}
    rate = Rate(
        definition=definition,
        rate_constant=log_rate.sign * np.exp(log_rate.log),
        unit="s^-1",
        arrhenius_energy_kj_mol=log_rate.energy_j_mol / 1000.0,
        activation=activation(log_rate, t),
        standard_activation=standard_activation(
            log_rate, sensed.orders, t, model.conditions, states
        ),
        sign_changes=changes,
        control=sensed.control,
        saddles=sensed.saddles,
        orders=sensed.orders,
        collider_orders=collider_orders(log_rate, network, rates.steps.collider_orders),
        approximations=approximations,
        sign_shift_kj_mol=_sign_shifts(definition, rates, log_rate, sensed),
    )
    if definition == "pool":
        return _with_pool(rate, rates)
    if definition == "cycle":
        _, states_of, shares = rates.cycle
        names = [network.states[k][0][0] for k in states_of]
        populations = {name: shares[:, k] for k, name in enumerate(names)}
        return replace(rate, populations=populations, resting_state=_largest(populations))
    if definition == "free" and len(rates.products) > 1:
        driven = rates.model.conditions.driven
        shares = formation(rates.network, rates.start, rates.products, rates.amounts(), driven)
        return replace(rate, branching=_branching(rates, shares))
    return rate


def _with_pool(rate: Rate, rates: Rates) -> Rate:
    pool, network = rates.pool, rates.network
    names = [network.states[k][0][0] for k in pool.members]
    populations = {name: pool.populations[:, k] for k, name in enumerate(names)}
    ratio, headline = np.full(len(rate.rate_constant), np.nan), rate.rate_constant.copy()
    if len(names) > 1:
        for k, (log_decay, shares) in enumerate(_decay_shares(rates)):
            ratio[k] = np.exp(log_decay[1] - log_decay[0])
            if ratio[k] < NEXT_DECAY_BELOW or pool.slow_share[k] < SLOW_SHARE_BELOW:
                better = pool.coefficients(k, log_decay)
                shares = shares if better is None else better
                headline[k] = np.exp(log_decay[int(np.argmax(shares))])
    return replace(
        rate,
        populations=populations,
        resting_state=_largest(populations),
        slow_share=pool.slow_share,
        next_decay_ratio=ratio,
        inverse_mean_time=np.exp(pool.log_inverse_mean_time),
        headline=headline,
        branching=_branching(rates, pool.branching) if len(rates.products) > 1 else None,
    )


def _decay_shares(rates: Rates) -> list[tuple[FloatArray, FloatArray]]:
    """Return at each temperature ln of the pool's decay constants, slowest first, and their coefficients."""
    if rates.model.conditions.driven:
        return rates.pool.decay_shares()
    return decay_shares(rates.network, rates.start, rates.pool.members, rates.pool_decays)


def _branching(rates: Rates, shares: FloatArray) -> dict[str, FloatArray]:
    names = [
        write_side([(name, float(count)) for name, count in rates.network.states[k]])
        for k in rates.products
    ]
    return {name: shares[:, k] for k, name in enumerate(names)}


def _largest(populations: Mapping[str, FloatArray]) -> tuple[str, ...]:
    names = list(populations)
    best = np.argmax(np.stack(list(populations.values())), axis=0)
    return tuple(names[int(k)] for k in best)


def _sign_shifts(
    definition: Definition, rates: Rates, log_rate: LogRate, sensed: Sensitivity
) -> dict[str, FloatArray]:
    """Return by how much each controlling state would have to move for E_a to vanish, by the secant rule."""
    names = [n for n, x in sensed.control.items() if np.any(np.abs(x) > _CONTROLLING)]
    shifts: dict[str, FloatArray] = {}
    for name in names:
        energy = log_rate.energy_j_mol
        control = sensed.control[name]
        with np.errstate(divide="ignore", invalid="ignore"):
            now = np.where(np.abs(control) > _CONTROLLING, -energy / control, np.nan)
        farthest = _FARTHEST_SHIFT_KJ_MOL * 1000.0
        before, at_before = np.zeros_like(now), energy
        with np.errstate(divide="ignore", invalid="ignore"):
            for _ in range(_SECANT_STEPS):
                usable = np.isfinite(now) & (np.abs(now) <= 2.0 * farthest)
                at_now = rates.moved(name, np.where(usable, now, 0.0)).rate(definition).energy_j_mol
                if np.all(~usable | (np.abs(at_now) < _NO_ENERGY_J_MOL)):
                    break
                step = at_now * (now - before) / (at_now - at_before)
                moving = np.abs(at_now) >= _NO_ENERGY_J_MOL
                before, at_before = now, at_now
                now = np.where(moving, now - step, now)
        done = usable & (np.abs(at_now) < _NO_ENERGY_J_MOL) & (np.abs(now) <= farthest)
        shifts[name] = np.where(done, now, np.nan) / 1000.0
    return shifts


_SECANT_STEPS = 30
_NO_ENERGY_J_MOL = 1e-3


def _step_rates(rates: Rates) -> tuple[StepRate, ...]:
    """Return every step's constants, and how reversible it is in the steady state."""
    network = rates.network
    b = len(network.temperature_k)
    if rates.model.mechanism.catalyst is not None:
        _, members, shares = rates.cycle
        with np.errstate(divide="ignore"):
            levels = {state: np.log(shares[:, k]) for k, state in enumerate(members)}
    else:
        levels = steady_state(network, rates.start, rates.products, rates.amounts())
    reversibility = {step: np.full(b, np.nan) for step in range(len(rates.model.mechanism.steps))}
    inside = {edge.step for edge in network.edges}
    for number, edge in enumerate(network.edges):
        if edge.tail in levels and edge.head in levels:
            forth = levels[edge.tail] + network.log_forward[:, number].astype(np.float64)
            back = levels[edge.head] + network.log_reverse[:, number].astype(np.float64)
            reversibility[edge.step] = _ratio(forth, back)
    held = _log_held(rates)
    for number, step in enumerate(rates.model.mechanism.steps):
        if number not in inside:
            forth, back = (
                rates.steps.log_forward[:, number].copy(),
                rates.steps.log_reverse[:, number].copy(),
            )
            for log, side in ((forth, step.reactants), (back, step.products)):
                for name, count in side.items():
                    log += count * held[name]
            reversibility[number] = _ratio(forth, back)
    return step_rates(rates, reversibility)


def _ratio(forth: FloatArray, back: FloatArray) -> FloatArray:
    """Return the smaller over the larger of two fluxes given as logarithms; nan where there are none."""
    with np.errstate(invalid="ignore"):
        return np.asarray(np.exp(-np.abs(forth - back)))


def _log_held(rates: Rates) -> dict[str, FloatArray]:
    """Return ln of the free concentration of every held species."""
    network, energies = rates.network, rates.energies
    t = network.temperature_k
    found: dict[str, FloatArray] = {}
    for name, held in rates.model.conditions.held.items():
        if held.form != "equilibrium":
            found[name] = np.log(held.concentration_mol_l(t))
            continue
        log = -energies.reduced[:, energies.index(name)]
        for member, share in network.equilibrium[name].items():
            log = log + float(share) * network.potential[:, network.species.index(member)]
        found[name] = np.asarray(log, dtype=np.float64)
    return found


def _held(rates: Rates) -> dict[str, FloatArray]:
    return {name: np.exp(log) for name, log in _log_held(rates).items()}
