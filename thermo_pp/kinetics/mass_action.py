"""Any mechanism as mass action: steps between species that are not held, at one temperature."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from fractions import Fraction
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import Conditions, Held
from thermo_pp.formulas.rates import log_frequency_factor
from thermo_pp.kinetics.steps import ElementaryRates, Energetics, log_concentration
from thermo_pp.mechanism import Mechanism
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.intp]
TEMPERATURE = "temperature"
"""Name of the last response: R T^2 d/dT."""


@dataclass(frozen=True, eq=False)
class System:
    """Mass action at one temperature: s species that are not held, n steps, p responses.

    Attributes
    ----------
    names : tuple of str
        The species whose concentrations change.
    left, right : shape (n, s)
        How many of each stand on either side.
    log_forward, log_reverse : shape (n,)
        ln of the constants with the held concentrations in them, mol/L and s; -inf: no such way.
    responses : tuple of str
        Saddles (a step without one under its equation), species, then `TEMPERATURE`.
    saddles : tuple of str
        The saddles among them, which come first.
    respond_forward, respond_reverse : shape (n, p)
        d ln k/d(-G/RT) of each saddle and species, R T^2 d ln k/dT (J/mol) last.
    exchanged : shape (n, h)
        Held species given off (positive) or taken up along each step.
    held : tuple of str
        Names of these; species held at equilibrium counted as what they are made of.
    flowing : tuple of int
        The steps that are in- and outflow.
    """

    names: tuple[str, ...]
    left: FloatArray
    right: FloatArray
    log_forward: FloatArray
    log_reverse: FloatArray
    responses: tuple[str, ...]
    saddles: tuple[str, ...]
    respond_forward: FloatArray
    respond_reverse: FloatArray
    exchanged: FloatArray
    held: tuple[str, ...]
    flowing: tuple[int, ...] = ()

    @cached_property
    def stoichiometry(self) -> FloatArray:
        """What each step makes, shape (s, n)."""
        return np.ascontiguousarray((self.right - self.left).T)

    @cached_property
    def _slots(self) -> tuple[IntArray, IntArray]:
        """Species number by molecule of each side, shape (n, m); s stands for none."""
        return _slots(self.left), _slots(self.right)

    @cached_property
    def _constants(self) -> tuple[FloatArray, FloatArray]:
        return np.exp(self.log_forward), np.exp(self.log_reverse)

    def fluxes(self, concentration: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return the one-way fluxes, shape (..., n) each, from concentrations of shape (..., s)."""
        filled = _filled(concentration)
        forward, reverse = self._constants
        return (
            forward * filled[..., self._slots[0]].prod(axis=-1),
            reverse * filled[..., self._slots[1]].prod(axis=-1),
        )

    def slopes(self, concentration: FloatArray) -> FloatArray:
        """Return the derivative of the net fluxes by the concentrations, shape (..., n, s)."""
        filled = _filled(concentration)
        n, s = self.left.shape
        out = np.zeros((*concentration.shape[:-1], n, s + 1))
        for sign, constants, slots in zip((1.0, -1.0), self._constants, self._slots, strict=True):
            factors = filled[..., slots]
            for slot in range(slots.shape[1]):
                part = sign * constants
                for other in range(slots.shape[1]):
                    if other != slot:
                        part = part * factors[..., other]
                out[..., np.arange(n), slots[:, slot]] += part
        return out[..., :s]

    def net(self, concentration: FloatArray) -> FloatArray:
        """Return the net fluxes, shape (..., n)."""
        forward, reverse = self.fluxes(concentration)
        return np.asarray(forward - reverse)

    def respond(self, concentration: FloatArray) -> FloatArray:
        """Return the derivative of the net fluxes by the responses, shape (..., n, p)."""
        forward, reverse = self.fluxes(concentration)
        return np.asarray(
            forward[..., np.newaxis] * self.respond_forward
            - reverse[..., np.newaxis] * self.respond_reverse
        )

    def present(self, start: FloatArray) -> NDArray[np.bool_]:
        """Return which species there can ever be, shape (s,)."""
        there = start > 0.0
        while True:
            before = there.sum()
            for side, other, log in (
                (self.left, self.right, self.log_forward),
                (self.right, self.left, self.log_reverse),
            ):
                goes = np.isfinite(log) & ~np.any((side > 0.0) & ~there, axis=1)
                there = there | np.any(other[goes] > 0.0, axis=0)
            if there.sum() == before:
                return np.asarray(there)

    def only(self, there: NDArray[np.bool_]) -> System:
        """Return the system without the species that are not there and the steps they stand in."""
        lacking = np.any((self.left + self.right)[:, ~there] > 0.0, axis=1)
        steps = np.flatnonzero(~lacking)
        place = {int(step): k for k, step in enumerate(steps)}
        return replace(
            self,
            names=tuple(name for name, yes in zip(self.names, there, strict=True) if yes),
            left=self.left[np.ix_(steps, there)],
            right=self.right[np.ix_(steps, there)],
            log_forward=self.log_forward[steps],
            log_reverse=self.log_reverse[steps],
            respond_forward=self.respond_forward[steps],
            respond_reverse=self.respond_reverse[steps],
            exchanged=self.exchanged[steps],
            flowing=tuple(place[k] for k in self.flowing if k in place),
        )

    def with_flow(self, feed: FloatArray, residence_s: float, feed_response: FloatArray) -> System:
        """Return the system with inflow and outflow of every species that is not held.

        Parameters
        ----------
        feed : shape (s,)
            Concentrations of what flows in, mol/L.
        residence_s : float
            Residence time, s.
        feed_response : shape (s,)
            R T^2 d ln feed/dT, J/mol.
        """
        n, s = self.left.shape
        p = len(self.responses)
        with np.errstate(divide="ignore"):
            log_in = np.log(feed / residence_s)
        respond = np.zeros((s, p))
        respond[:, -1] = feed_response
        return replace(
            self,
            left=np.vstack([self.left, np.zeros((s, s))]),
            right=np.vstack([self.right, np.eye(s)]),
            log_forward=np.concatenate([self.log_forward, log_in]),
            log_reverse=np.concatenate([self.log_reverse, np.full(s, -np.log(residence_s))]),
            respond_forward=np.vstack([self.respond_forward, respond]),
            respond_reverse=np.vstack([self.respond_reverse, np.zeros((s, p))]),
            exchanged=np.vstack([self.exchanged, np.zeros((s, self.exchanged.shape[1]))]),
            flowing=tuple(range(n, n + s)),
        )


def _filled(concentration: FloatArray) -> FloatArray:
    """Return concentrations with a 1 behind them, which stands for no species."""
    return np.concatenate([concentration, np.ones((*concentration.shape[:-1], 1))], axis=-1)


def _slots(side: FloatArray) -> IntArray:
    n, s = side.shape
    found = np.full((n, max(1, int(side.sum(axis=1).max(initial=1.0)))), s, dtype=np.intp)
    for step, counts in enumerate(side):
        molecules = np.repeat(np.arange(s), counts.astype(np.intp))
        found[step, : len(molecules)] = molecules
    return found


def log_held(
    held: Mapping[str, Held],
    equilibrium: Mapping[str, Mapping[str, Fraction]],
    energies: Energetics,
) -> dict[str, NDArray[np.longdouble]]:
    """Return ln of the free concentration of every held species, shape (b,)."""
    t = energies.temperature_k
    found = {
        name: log_concentration(how, t) for name, how in held.items() if how.form != "equilibrium"
    }
    for name, members in equilibrium.items():
        log = -energies.reduced[:, energies.index(name)]
        for member, share in members.items():
            log = log + float(share) * (energies.reduced[:, energies.index(member)] + found[member])
        found[name] = np.asarray(log)
    return found


def mass_action(
    mechanism: Mechanism,
    conditions: Conditions,
    energies: Energetics,
    rates: ElementaryRates,
    equilibrium: Mapping[str, Mapping[str, Fraction]],
    absent: tuple[str, ...] = (),
) -> tuple[System, ...]:
    """Return the mass action of a mechanism at each of b temperatures.

    Parameters
    ----------
    mechanism : Mechanism
    conditions : Conditions
        Everything under `held` is held.
    energies : Energetics
    rates : ElementaryRates
    equilibrium : mapping
        Species held at equilibrium, as sums of species held at stated amounts.
    absent : tuple of str
        Species of which there is none (taken away as they form).
    """
    held = conditions.held
    stated = tuple(name for name in held if held[name].form != "equilibrium")
    names = tuple(name for name in mechanism.species if name not in held and name not in absent)
    columns = (*names, *stated)
    place = {name: k for k, name in enumerate(columns)}
    n = len(mechanism.steps)
    counts = np.zeros((2, n, len(columns)))
    there = np.ones((2, n), np.bool_)
    for number, step in enumerate(mechanism.steps):
        for way, side in enumerate(step.sides()):
            for name, count in side.items():
                members = equilibrium.get(name, {name: Fraction(1)})
                for member, share in members.items():
                    if member in place:
                        counts[way, number, place[member]] += float(share) * count
                    else:
                        there[way, number] = False
    logs = log_held(held, equilibrium, energies)
    t = energies.temperature_k
    rt = GAS_J_MOL_K * t
    slope = np.stack([energies.slope_j_mol[:, energies.index(name)] for name in columns], axis=1)
    mu = np.stack([energies.reduced[:, energies.index(name)] for name in columns], axis=1)
    for name in stated:
        mu[:, place[name]] += logs[name]
        slope[:, place[name]] -= rt * held[name].log_slope(t, conditions.seen)
    frequency = log_frequency_factor(t)[:, np.newaxis]
    saddles = tuple(dict.fromkeys(rates.names))
    responses = (*saddles, *columns, TEMPERATURE)
    respond = np.zeros((2, len(t), n, len(responses)))
    log = np.empty((2, len(t), n))
    for way in (0, 1):
        log[way] = frequency + mu @ counts[way].T.astype(np.longdouble) - rates.saddle_reduced
        log[way][:, ~there[way]] = -np.inf
        for number, name in enumerate(rates.names):
            respond[way, :, number, saddles.index(name)] = 1.0
        respond[way, :, :, len(saddles) : -1] = -counts[way]
        respond[way, :, :, -1] = (
            rt[:, np.newaxis] + rates.saddle_slope_j_mol - slope @ counts[way].T
        )
    s = len(names)
    return tuple(
        System(
            names=names,
            left=counts[0][:, :s],
            right=counts[1][:, :s],
            log_forward=log[0, k],
            log_reverse=log[1, k],
            responses=responses,
            saddles=saddles,
            respond_forward=respond[0, k],
            respond_reverse=respond[1, k],
            exchanged=(counts[1] - counts[0])[:, s:],
            held=stated,
        )
        for k in range(len(t))
    )
