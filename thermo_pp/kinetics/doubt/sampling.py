"""Monte Carlo: every sample at every temperature through the exact elimination, in blocks that fit the cache."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.doubt.answers import Found, find
from thermo_pp.kinetics.doubt.moved import moved
from thermo_pp.kinetics.doubt.results import QUANTILES, Probability, Spread
from thermo_pp.kinetics.doubt.uncertain import Uncertainty
from thermo_pp.kinetics.given import REFERENCE_K
from thermo_pp.kinetics.model import Rates
from thermo_pp.kinetics.point import is_linear
from thermo_pp.kinetics.scaled import Ordinary
from thermo_pp.names import Definition

FloatArray = NDArray[np.float64]
BLOCK_ENTRIES = 2**18
"""Entries of the matrices of one block: samples times temperatures times states squared."""


@dataclass(eq=False)
class _Gathered:
    """What is kept of every sample of one definition, n samples and t temperatures."""

    found: Found  # with no energy shifted
    log: FloatArray
    energy: FloatArray
    backwards: NDArray[np.bool_]
    controlling: NDArray[np.int16]
    resting: NDArray[np.int16] | None
    branching: FloatArray | None
    sums: dict[str, FloatArray] = field(default_factory=dict)  # of control and its square, (2, t)

    @classmethod
    def empty(cls, found: Found, samples: int) -> _Gathered:
        """Return room for all samples."""
        shape = samples, len(found.rate.log)
        return cls(
            found,
            np.empty(shape),
            np.empty(shape),
            np.empty(shape, np.bool_),
            np.empty(shape, np.int16),
            None if found.resting is None else np.empty(shape, np.int16),
            None if found.branching is None else np.empty((*shape, found.branching.shape[1])),
            {name: np.zeros((2, shape[1])) for name in found.control},
        )

    def only(self, rows: NDArray[np.bool_]) -> _Gathered:
        """Return what is kept of some of the samples; the sums are of these already."""
        return replace(
            self,
            log=self.log[rows],
            energy=self.energy[rows],
            backwards=self.backwards[rows],
            controlling=self.controlling[rows],
            resting=None if self.resting is None else self.resting[rows],
            branching=None if self.branching is None else self.branching[rows],
        )

    def take(self, rows: slice, found: Found) -> None:
        """Keep a block of samples."""
        shape = -1, self.log.shape[1]
        self.log[rows] = found.rate.log.reshape(shape)
        self.energy[rows] = found.rate.energy_j_mol.reshape(shape) / 1000.0
        self.backwards[rows] = found.rate.sign.reshape(shape) < 0.0
        self.controlling[rows] = found.controlling.reshape(shape)
        if self.resting is not None and found.resting is not None:
            self.resting[rows] = found.resting.reshape(shape)
        if self.branching is not None and found.branching is not None:
            self.branching[rows] = found.branching.reshape(*shape, self.branching.shape[2])
        reached = np.isfinite(self.log[rows]).all(axis=1)
        for name, values in found.control.items():
            block = values.reshape(shape)[reached]
            self.sums[name] += np.stack([block.sum(axis=0), (block**2).sum(axis=0)])


def sample(
    base: Rates, uncertainty: Uncertainty, definitions: Sequence[Definition]
) -> Mapping[Definition, Spread]:
    """Return the spread of every definition: rates, Arrhenius energies and controls together.

    Memory: 22 bytes a sample, temperature and definition, and 8 for each of several products.
    """
    if not definitions:
        return {}
    shifts = uncertainty.drawn()
    gathered = {
        name: _Gathered.empty(find(base, name), uncertainty.samples) for name in definitions
    }
    states = len(base.network.states if is_linear(base) else base.model.mechanism.species)
    size = len(base.energies.temperature_k) * states**2
    at_once = max(1, BLOCK_ENTRIES // size)
    for first in range(0, len(shifts), at_once):
        rows = slice(first, first + at_once)
        rates = moved(base, uncertainty, shifts[rows])
        for name, found in _found(rates, definitions).items():
            gathered[name].take(rows, found)
    usual = int(np.argmin(np.abs(base.energies.temperature_k - REFERENCE_K)))
    return {name: _spread(kept, usual) for name, kept in gathered.items()}


def _found(rates: Rates, definitions: Sequence[Definition]) -> dict[Definition, Found]:
    """Return what a batch says, in ordinary numbers where nothing leaves their range."""
    try:
        fast = replace(rates, numbers=Ordinary)
        return {name: find(fast, name, each=False) for name in definitions}
    except FloatingPointError:
        return {name: find(rates, name, each=False) for name in definitions}


def _spread(kept: _Gathered, usual: int) -> Spread:
    drawn = len(kept.log)
    reached = np.asarray(np.isfinite(kept.log).all(axis=1))
    if not reached.all():
        kept = kept.only(reached)
    found, samples = kept.found, len(kept.log)
    same = kept.controlling == found.controlling
    same_all = same
    same_resting = same_product = bands = None
    if kept.resting is not None:
        rests = kept.resting == found.resting
        same_resting, same_all = _probability(rests), same_all & rests
    if kept.branching is not None and found.branching is not None and found.products is not None:
        prefers = np.argmax(kept.branching, axis=2) == np.argmax(found.branching, axis=1)
        same_product, same_all = _probability(prefers), same_all & prefers
        bands = {
            name: np.quantile(kept.branching[:, :, k], QUANTILES, axis=0)
            for k, name in enumerate(found.products)
        }
    means = {name: sums[0] / samples for name, sums in kept.sums.items()}
    return Spread(
        log_bands=np.quantile(kept.log, QUANTILES, axis=0),
        energy_bands_kj_mol=np.quantile(kept.energy, QUANTILES, axis=0),
        log_deviation=kept.log.std(axis=0, ddof=1),
        energy_deviation_kj_mol=kept.energy.std(axis=0, ddof=1),
        negative_energy=_probability(kept.energy < 0.0),
        backwards=_probability(kept.backwards),
        control_mean=means,
        control_deviation={
            name: np.sqrt(np.maximum(sums[1] / samples - means[name] ** 2, 0.0))
            for name, sums in kept.sums.items()
        },
        controlling={
            name: (kept.controlling == k).mean(axis=0) for k, name in enumerate(found.saddles)
        },
        same_saddle=_probability(same),
        same_resting=same_resting,
        same_product=same_product,
        same_answer=_probability(same_all),
        energies_kj_mol=kept.energy[:, usual],
        samples=samples,
        branching_bands=bands,
        not_reached=drawn - samples,
    )


def _probability(so: NDArray[np.bool_]) -> Probability:
    value = so.mean(axis=0)
    return Probability(value, np.sqrt(value * (1.0 - value) / len(so)))
