"""Distribution: the populations of an ensemble, and how far the set of its members has converged."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.formulas.mixture import (
    gibbs_by_number,
    log_weights,
    missed_change,
    populations,
)
from thermo_pp.species.ideal_gas import seal
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]

MISSED_KJ_MOL = 4.0
"""How far above the lowest G a conformer is imagined that the set does not have."""

TOGETHER = 1_000_000
"""Members times temperatures that are worked on at once: 8 MB an array."""


@dataclass(frozen=True, eq=False)
class Distribution:
    """What each member of an ensemble is and counts.

    Attributes
    ----------
    temperature_k : shape (t,)
    degeneracy : shape (n,), int
        0 for a member that is left out as a duplicate.
    gibbs_kj_mol : shape (n, t)
        Of one conformer, one hand where it is chiral.
    population : shape (n, t)
        Of all its degeneracy together; they add up to 1.
    lowest_only_gibbs_kj_mol : shape (t,)
        Of the member that counts most, alone with its degeneracy.
    gibbs_by_number_kj_mol : shape (m, t)
        Of the 1, 2, ... m members that count most at each temperature, m those that are not left
        out: its last row is G of the ensemble.
    missed_kj_mol : float
        Of a conformer that is imagined, above the lowest G of one conformer.
    missed_change_kj_mol : shape (t,)
        What it would change G of the ensemble by, counted once; a chiral one with both hands
        changes it by nearly twice that.
    """

    temperature_k: FloatArray
    degeneracy: NDArray[np.int64]
    gibbs_kj_mol: FloatArray
    population: FloatArray
    lowest_only_gibbs_kj_mol: FloatArray
    gibbs_by_number_kj_mol: FloatArray
    missed_kj_mol: float
    missed_change_kj_mol: FloatArray

    def __post_init__(self) -> None:
        seal(self)

    def needed(self, within_kj_mol: float) -> NDArray[np.int64]:
        """Return how many members bring G to within so much of its last value, shape (t,)."""
        off = self.gibbs_by_number_kj_mol - self.gibbs_by_number_kj_mol[-1]
        return np.asarray(1 + np.sum(off > within_kj_mol, axis=0))


def distribution(
    temperature_k: FloatArray,
    degeneracy: NDArray[np.int64],
    gibbs_kj_mol: FloatArray,
    missed_kj_mol: float,
) -> Distribution:
    """Return the populations of members with these free energies.

    Parameters
    ----------
    temperature_k : shape (t,)
    degeneracy : shape (n,), int
        0 leaves a member out.
    gibbs_kj_mol : shape (n, t)
        Of one conformer.
    missed_kj_mol : float
        See `Distribution`.
    """
    counted = degeneracy > 0
    g = degeneracy[counted]
    n, t = gibbs_kj_mol.shape
    population, by_number = np.zeros((n, t)), np.empty((len(g), t))
    alone, missed = np.empty(t), np.empty(t)
    width = max(1, TOGETHER // n)
    for begin in range(0, t, width):
        some = slice(begin, begin + width)
        kelvin, block = temperature_k[some], gibbs_kj_mol[counted, some]
        zero = block.min(axis=0)
        above = 1000.0 * (block - zero)
        population[counted, some] = populations(kelvin, g, above)
        growing = gibbs_by_number(kelvin, g, above)
        by_number[:, some] = zero + growing / 1000.0
        weights = log_weights(kelvin, g, above).max(axis=0)
        alone[some] = zero - GAS_J_MOL_K * kelvin * weights / 1000.0
        missed[some] = missed_change(kelvin, 1000.0 * missed_kj_mol - growing[-1]) / 1000.0
    return Distribution(
        temperature_k, degeneracy, gibbs_kj_mol, population, alone, by_number, missed_kj_mol, missed
    )
