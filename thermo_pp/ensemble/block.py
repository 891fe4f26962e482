"""Block: H, S, Cp and the slope enthalpy of a few hundred members at once, one hand of each."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import StandardState
from thermo_pp.names import LowModes
from thermo_pp.species import SpeciesModel, Structure
from thermo_pp.species.many import Many, grounds, many
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]

TOGETHER = 512
"""Members whose numbers are in memory at once: at 50 temperatures 200 kB an array."""


def blocks(
    models: Sequence[SpeciesModel],
    temperature_k: FloatArray,
    low_modes: LowModes | None,
    standard_state: StandardState | None,
) -> Iterator[tuple[slice, Many]]:
    """Yield which of the models a block is of, and the numbers of one hand of each.

    Parameters
    ----------
    models : sequence of SpeciesModel
    temperature_k : shape (t,)
    low_modes, standard_state
        In place of the models' own.
    """
    for begin in range(0, len(models), TOGETHER):
        rows = slice(begin, min(begin + TOGETHER, len(models)))
        yield rows, _one_hand(models[rows], temperature_k, low_modes, standard_state)


def ground_energies(models: Sequence[SpeciesModel]) -> FloatArray:
    """Return electronic and zero-point energy of each, kJ/mol, shape (n,); nan where it is not known."""
    found = np.full(len(models), np.nan)
    computed = [k for k, model in enumerate(models) if isinstance(model, Structure)]
    found[computed] = grounds([model for model in models if isinstance(model, Structure)])
    for k, model in enumerate(models):
        if not isinstance(model, Structure) and model.ground_kj_mol is not None:
            found[k] = model.ground_kj_mol
    return found


def _one_hand(
    models: Sequence[SpeciesModel],
    t: FloatArray,
    low_modes: LowModes | None,
    state: StandardState | None,
) -> Many:
    found = Many(*(np.empty((len(models), t.size)) for _ in Many._fields))
    hands = np.ones((len(models), 1))
    computed = [k for k, model in enumerate(models) if isinstance(model, Structure)]
    structures = [model for model in models if isinstance(model, Structure)]
    hands[computed, 0] = [structure.degeneracy for structure in structures]
    values = many(structures, t, low_modes=low_modes, standard_state=state)
    for name, column in values._asdict().items():
        getattr(found, name)[computed] = column
    for k, model in enumerate(models):
        if not isinstance(model, Structure):
            one = model.at(t, low_modes=low_modes, standard_state=state)
            hands[k] = one.degeneracy
            for name in Many._fields:
                getattr(found, name)[k] = getattr(one, name)
    both = GAS_J_MOL_K * np.log(hands)
    return found._replace(
        entropy_j_mol_k=found.entropy_j_mol_k - both,
        gibbs_kj_mol=found.gibbs_kj_mol + t * both / 1000.0,
    )
