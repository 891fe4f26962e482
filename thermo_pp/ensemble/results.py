"""Results: ensembles with their H, S, G and populations, as a table needs them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import Treatment
from thermo_pp.ensemble.distribution import Distribution
from thermo_pp.ensemble.model import Ensemble
from thermo_pp.errors import Finding, each_once
from thermo_pp.names import Duplicates
from thermo_pp.species import Thermochemistry, low_mode_spread_kj_mol

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class ComputedEnsemble:
    """One ensemble with its numbers.

    Attributes
    ----------
    model : Ensemble
    result : Thermochemistry
    distribution : Distribution
    low_mode_spread_kj_mol : shape (t,)
        Largest less smallest G over the four soft-mode treatments.
    """

    model: Ensemble
    result: Thermochemistry
    distribution: Distribution
    low_mode_spread_kj_mol: FloatArray


@dataclass(frozen=True, eq=False)
class Ensembles:
    """All ensembles of a folder or a study.

    Attributes
    ----------
    temperature_k : shape (t,)
    treatment : Treatment
    duplicates : {"count", "once"}
    computed : tuple of ComputedEnsemble
    findings : tuple of Finding
    """

    temperature_k: FloatArray
    treatment: Treatment
    duplicates: Duplicates
    computed: tuple[ComputedEnsemble, ...]
    findings: tuple[Finding, ...]


def results(
    ensembles: Sequence[Ensemble],
    temperature_k: Sequence[float],
    treatment: Treatment,
    findings: Sequence[Finding],
    *,
    duplicates: Duplicates,
    missed_kj_mol: float,
) -> Ensembles:
    """Compute every ensemble at every temperature.

    Parameters
    ----------
    ensembles : sequence of Ensemble
    temperature_k : sequence of float
        K.
    treatment : Treatment
        That they were made with.
    findings : sequence of Finding
        Of whatever came before.
    duplicates : {"count", "once"}
        That they were made with.
    missed_kj_mol : float
        See `Distribution`.
    """
    kelvin = np.array(temperature_k, dtype=np.float64)
    said = list(findings)
    computed = []
    for model in ensembles:
        result, distribution = model.computed(kelvin, missed_kj_mol=missed_kj_mol)
        said += result.findings
        computed.append(
            ComputedEnsemble(model, result, distribution, low_mode_spread_kj_mol(model, kelvin))
        )
    return Ensembles(kelvin, treatment, duplicates, tuple(computed), each_once(said))
