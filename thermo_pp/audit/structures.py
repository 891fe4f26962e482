"""Structures: H, S and G of every structure of a collection, and what kept out the rest."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from thermo_pp.audit.levels import level_words
from thermo_pp.collect import Collection
from thermo_pp.conditions import Treatment
from thermo_pp.errors import Finding, StudyError, each_once
from thermo_pp.records import Calculation
from thermo_pp.species import Structure, Thermochemistry, low_mode_spread_kj_mol

FloatArray = NDArray[np.float64]
MOST_NAMED = 6


@dataclass(frozen=True, eq=False)
class ComputedStructure:
    """One structure with its H, S and G.

    Attributes
    ----------
    name : str
        The file's name without its ending; the whole path where two would be called the same.
    model : Structure
        A structure with exactly one imaginary mode is a saddle point.
    level : str
        Level of theory in words.
    result : Thermochemistry
    low_mode_spread_kj_mol : shape (t,)
        Largest less smallest G over the four soft-mode treatments.
    """

    name: str
    model: Structure
    level: str
    result: Thermochemistry
    low_mode_spread_kj_mol: FloatArray


@dataclass(frozen=True, eq=False)
class Structures:
    """All structures of a collection.

    Attributes
    ----------
    temperature_k : shape (t,)
    treatment : Treatment
    computed : tuple of ComputedStructure
        In the order of the files.
    findings : tuple of Finding
        Those of the collection, of each structure, and why a file gave no structure.
    """

    temperature_k: FloatArray
    treatment: Treatment
    computed: tuple[ComputedStructure, ...]
    findings: tuple[Finding, ...]


def structures(
    collection: Collection, temperature_k: Sequence[float], treatment: Treatment
) -> Structures:
    """Compute H, S and G of every calculation that has frequencies, and of atoms.

    Parameters
    ----------
    collection : Collection
    temperature_k : sequence of float
        K.
    treatment : Treatment

    Returns
    -------
    Structures
        A structure that cannot be computed is a finding of severity error and ends nothing.
    """
    kelvin = np.array(temperature_k, dtype=np.float64)
    findings = list(collection.findings)
    computed, without = [], []
    names = _names(collection.calculations)
    for calculation in collection.calculations:
        if calculation.wavenumbers_cm is None and len(calculation.numbers) > 1:
            without.append(calculation.path)
            continue
        name = names[calculation.path]
        try:
            model = Structure.make(calculation, treatment, name=name)
            result = model.at(kelvin)
            spread = low_mode_spread_kj_mol(model, kelvin)
        except StudyError as error:
            findings.append(_not_computed(calculation, error))
            continue
        findings += result.findings
        computed.append(
            ComputedStructure(name, model, level_words(calculation) or "not stated", result, spread)
        )
    if without:
        findings.append(_no_frequencies(without))
    return Structures(kelvin, treatment, tuple(computed), each_once(findings))


def _names(calculations: Sequence[Calculation]) -> dict[str, str]:
    stems = {calculation.path: Path(calculation.path).stem for calculation in calculations}
    often = Counter(stems.values())
    return {path: stem if often[stem] == 1 else path for path, stem in stems.items()}


def _no_frequencies(paths: Sequence[str]) -> Finding:
    named = ", ".join(paths[:MOST_NAMED])
    more = f" and {len(paths) - MOST_NAMED} more" if len(paths) > MOST_NAMED else ""
    return Finding(
        "no-frequencies",
        "note",
        paths[0] if len(paths) == 1 else None,
        None,
        f"no frequencies, so no H, S and G: {named}{more}",
        "name such a file as the energy of a species in a study file, or give the frequency job",
    )


def _not_computed(calculation: Calculation, error: StudyError) -> Finding:
    line = calculation.where.get("wavenumbers_cm")
    return Finding("not-computed", "error", calculation.path, line, error.what, error.mend)
