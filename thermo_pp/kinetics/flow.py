"""The steady state of a stirred tank that flows, over temperature."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from contextlib import suppress
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding, StudyError
from thermo_pp.kinetics.equilibrium import balanced, equilibrium
from thermo_pp.kinetics.mass_action import System
from thermo_pp.kinetics.results import freeze_arrays
from thermo_pp.kinetics.start import Start, energies_of, systems
from thermo_pp.kinetics.stationary import NoSteadyState, Steady, at_rest, settle
from thermo_pp.rich import shown

if TYPE_CHECKING:
    import pandas as pd

    from thermo_pp.kinetics.asked import StudyLike

FloatArray = NDArray[np.float64]
SAME_WITHIN = 0.01
"""Relative difference of concentrations below which two steady states are one."""
TRACE = 1e-9


@dataclass(frozen=True, eq=False)
class FlowState:
    """The steady state of a flow, t temperatures.

    Attributes
    ----------
    temperature_k : shape (t,)
    residence_s : float
    followed : str
        The species whose loss (or formation) by reaction the rate is; empty where none is asked.
    forming : bool
    concentration_mol_l : mapping of str to shape (t,)
    feed_mol_l : mapping of str to shape (t,)
    rate_mol_l_s : shape (t,) or None
    arrhenius_energy_kj_mol : shape (t,) or None
        R T^2 d ln(rate)/dT of the steady state, feed and residence time as they are.
    control : mapping of str to shape (t,)
        d ln(rate)/d(-G/RT), the concentrations following; saddles first.
    saddles : tuple of str
    orders : mapping of str to shape (t,)
        d ln(rate)/d ln of the concentration in the feed, or held.
    slowest_lifetime_s : shape (t,)
        Of a small deviation from the steady state.
    other_mol_l : mapping of str to shape (t,)
        Another stable steady state, that from a tank filled with the feed at its equilibrium; nan
        where there is none but the one shown.
    started_from : str
        Which start the steady state shown was reached from.
    words : tuple of str
    findings : tuple of Finding
    """

    temperature_k: FloatArray
    residence_s: float
    followed: str
    forming: bool
    concentration_mol_l: Mapping[str, FloatArray]
    feed_mol_l: Mapping[str, FloatArray]
    rate_mol_l_s: FloatArray | None
    arrhenius_energy_kj_mol: FloatArray | None
    control: Mapping[str, FloatArray]
    saddles: tuple[str, ...]
    orders: Mapping[str, FloatArray]
    slowest_lifetime_s: FloatArray
    other_mol_l: Mapping[str, FloatArray]
    started_from: str
    words: tuple[str, ...] = ()
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        freeze_arrays(self)

    def table(self) -> pd.DataFrame:
        """Return one row a temperature, as plain numbers."""
        import pandas as pd

        columns = {"temperature_k": self.temperature_k}
        columns |= {f"{name} mol/L": v for name, v in self.concentration_mol_l.items()}
        if self.rate_mol_l_s is not None and self.arrhenius_energy_kj_mol is not None:
            columns["rate_mol_l_s"] = self.rate_mol_l_s
            columns["arrhenius_energy_kj_mol"] = self.arrhenius_energy_kj_mol
        return pd.DataFrame(columns)

    def _repr_html_(self) -> str:
        return shown(self.table())


def flow(study: StudyLike, *, temperature_k: Sequence[float] | None = None) -> FlowState:
    """Return the steady states of a study's flow.

    The one shown is that which the tank comes to from the initial concentrations, or, without any,
    filled with the feed.

    Parameters
    ----------
    study : StudyLike
    temperature_k : sequence of float or None
        The study's unless given.

    Raises
    ------
    StudyError
        The study has no flow, or the tank does not come to rest.
    """
    from threadpoolctl import threadpool_limits

    mechanism, conditions = study.mechanism, study.conditions
    if conditions.flow is None:
        raise StudyError(
            "the study has no flow",
            where=f"{mechanism.where} [conditions]",
            mend='add flow = { residence_time = "10 s", feed = { A = "0.1 mol/L" } }',
        )
    kelvin = np.array(conditions.temperature_k if temperature_k is None else temperature_k)
    forming = mechanism.catalyst is not None
    followed = (mechanism.products[0] if forming else mechanism.reactant) or ""
    if followed in conditions.held:
        followed = ""
    with threadpool_limits(1), np.errstate(all="ignore"):
        starts = systems(study, energies_of(study, kelvin), flowing=True)
        tanks = [
            _tank(start, float(t), followed, forming, mechanism.where)
            for start, t in zip(starts, kelvin, strict=True)
        ]
    names = starts[0].system.names
    first = starts[0].system
    feeds = {
        name: np.array([_feed(start)[k] for start in starts])
        for k, name in enumerate(names)
        if _feed(starts[0])[k] > 0.0
    }
    rates = np.array([tank.steady.rate for tank in tanks])
    responses = np.array([tank.steady.response for tank in tanks]) / rates[:, np.newaxis]
    pushed = np.array([tank.steady.pushed for tank in tanks]) / rates[:, np.newaxis]
    control = {name: responses[:, k] for k, name in enumerate(first.responses[:-1])}
    orders = {name: pushed[:, k] for k, name in enumerate(feeds)}
    orders |= {name: 0.0 - control[name] for name in first.held}
    asked = bool(followed)
    other = np.array([tank.other for tank in tanks])
    result = FlowState(
        temperature_k=kelvin,
        residence_s=conditions.flow.residence_s,
        followed=followed,
        forming=forming,
        concentration_mol_l={
            name: np.array([tank.shown[k] for tank in tanks]) for k, name in enumerate(names)
        },
        feed_mol_l=feeds,
        rate_mol_l_s=rates if asked else None,
        arrhenius_energy_kj_mol=responses[:, -1] / 1000.0 if asked else None,
        control=control if asked else {},
        saddles=first.saddles if asked else (),
        orders=orders if asked else {},
        slowest_lifetime_s=np.array([np.abs(tank.steady.lifetimes_s).max() for tank in tanks]),
        other_mol_l={name: other[:, k] for k, name in enumerate(names)},
        started_from="the initial concentrations" if conditions.initial else "the feed",
    )
    result = replace(result, findings=_findings(result, mechanism.where))
    return replace(result, words=_words(result))


@dataclass(frozen=True, eq=False)
class _Tank:
    steady: Steady
    shown: FloatArray  # all species of the study
    other: FloatArray


def _feed(start: Start) -> FloatArray:
    assert start.feed is not None
    return start.feed


def _tank(start: Start, temperature_k: float, followed: str, forming: bool, where: str) -> _Tank:
    there = start.system.present(start.concentration)
    system, now = start.system.only(there), start.concentration[there]
    try:
        found = settle(system, now)
    except NoSteadyState:
        raise StudyError(
            f"the flow does not come to rest at {temperature_k:g} K: its concentrations go on "
            "changing",
            where=f"{where} [conditions] flow",
            mend='follow it in time: barrier --time "10 s"',
        ) from None
    counted = np.zeros(len(system.left))
    if followed in system.names:
        column = system.names.index(followed)
        counted = system.stoichiometry[column] * (1.0 if forming else -1.0)
        counted[list(system.flowing)] = 0.0
    forward, _ = system.fluxes(found)
    inflows = [k for k in system.flowing if np.isfinite(system.log_forward[k])]
    pushes = np.zeros((len(counted), len(inflows)))
    for column, k in enumerate(inflows):
        pushes[k, column] = forward[k]
    steady = at_rest(system, found, counted, pushes)
    shown, other = np.zeros(len(there)), np.full(len(there), np.nan)
    shown[there] = found
    second = _second(system, _feed(start)[there], found)
    if second is not None:
        other[:] = 0.0
        other[there] = second
    return _Tank(steady, shown, other)


def _second(system: System, feed: FloatArray, found: FloatArray) -> FloatArray | None:
    """Return the steady state from the feed at its equilibrium, and from the feed, where it is another."""
    steps = np.ones(len(system.left), np.bool_)
    steps[list(system.flowing)] = False
    closed = replace(
        system,
        left=system.left[steps],
        right=system.right[steps],
        log_forward=system.log_forward[steps],
        log_reverse=system.log_reverse[steps],
        respond_forward=system.respond_forward[steps],
        respond_reverse=system.respond_reverse[steps],
        exchanged=system.exchanged[steps],
        flowing=(),
    )
    tries = [feed]
    if np.all(closed.present(feed)) and balanced(closed):
        with suppress(ArithmeticError):
            tries.insert(0, equilibrium(closed, feed))
    counts = found > TRACE * found.sum()
    for start in tries:
        try:
            state = settle(system, start)
        except NoSteadyState:
            continue
        if np.any(np.abs(state - found)[counts] > SAME_WITHIN * found[counts]):
            return state
    return None


def _findings(result: FlowState, file: str) -> tuple[Finding, ...]:
    several = np.isfinite(np.stack(list(result.other_mol_l.values()))).all(axis=0)
    if not several.any():
        return ()
    t = result.temperature_k[several]
    at = (
        f"{t[0]:g} K"
        if len(t) == 1
        else f"{len(t)} temperatures from {t.min():g} K to {t.max():g} K"
    )
    return (
        Finding(
            "several-steady-states",
            "warning",
            file,
            None,
            f"the flow has several steady states at {at}; the one shown is reached from "
            f"{result.started_from}",
            "state in [conditions] initial what the tank is filled with",
        ),
    )


def _words(result: FlowState) -> tuple[str, ...]:
    sentences = []
    for k, t in enumerate(result.temperature_k):
        most = max(result.concentration_mol_l, key=lambda n: result.concentration_mol_l[n][k])
        text = (
            f"At {t:g} K the flow rests with {most} at "
            f"{result.concentration_mol_l[most][k]:.4g} mol/L"
        )
        if result.rate_mol_l_s is not None and result.arrhenius_energy_kj_mol is not None:
            what = "formed" if result.forming else "lost"
            text += (
                f"; {result.followed} is {what} by reaction at {result.rate_mol_l_s[k]:.4g} "
                f"mol/(L s), E_a {result.arrhenius_energy_kj_mol[k]:.4g} kJ/mol"
            )
        sentences.append(f"{text}.")
    return tuple(sentences)
