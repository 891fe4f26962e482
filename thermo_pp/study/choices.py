"""What the choices are worth: each choice of treatment made otherwise, and what that changes."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding, StudyError, ThermoError
from thermo_pp.kinetics.model import Model
from thermo_pp.names import DEFINITIONS, Definition
from thermo_pp.rich import shown
from thermo_pp.study.otherwise import (
    ONSETS_CM,
    SCALES,
    Alternative,
    StudyLike,
    alternatives,
)

if TYPE_CHECKING:
    import pandas as pd

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Worth:
    """What the choices change in one quantity.

    Attributes
    ----------
    kind : {"species", "barrier", "rate"}
    name : str
        Species; ``"C1 = acid, forward"``; definition of the rate.
    quantity, unit : str
        ``"G"`` and ``"kJ/mol"``; of a rate ``"ln k"`` without a unit, and ``"Ea"``.
    value : shape (t,)
        As the study has it.
    change : shape (a, t)
        With each alternative less as the study has it; nan where that cannot be made.
    """

    kind: str
    name: str
    quantity: str
    unit: str
    value: FloatArray
    change: FloatArray

    def __post_init__(self) -> None:
        self.value.flags.writeable = False
        self.change.flags.writeable = False


@dataclass(frozen=True, eq=False)
class Choices:
    """What each choice is worth.

    Attributes
    ----------
    temperature_k : shape (t,)
    alternatives : tuple of Alternative
    rows : tuple of Worth
        Species, then barriers, then rates.
    findings : tuple of Finding
        Alternatives that cannot be made or are doubtful, and why there is no rate.
    """

    temperature_k: FloatArray
    alternatives: tuple[Alternative, ...]
    rows: tuple[Worth, ...]
    findings: tuple[Finding, ...] = ()

    def table(self) -> pd.DataFrame:
        """Return one row a quantity, alternative and temperature, as plain numbers."""
        import pandas as pd

        return pd.DataFrame(
            {
                "kind": row.kind,
                "name": row.name,
                "quantity": row.quantity,
                "unit": row.unit,
                "temperature_k": temperature,
                "value": row.value[k],
                "choice": alternative.choice,
                "taken": alternative.taken,
                "instead": alternative.instead,
                "change": row.change[a, k],
            }
            for row in self.rows
            for a, alternative in enumerate(self.alternatives)
            for k, temperature in enumerate(self.temperature_k)
        )

    def _repr_html_(self) -> str:
        return shown(self.table())


def choices(
    study: StudyLike, *, onsets_cm: Sequence[float] = ONSETS_CM, scales: Sequence[float] = SCALES
) -> Choices:
    """Make each choice of a study otherwise, one at a time, and return what that changes.

    What is tried: see `thermo_pp.study.otherwise.alternatives`. Free energies are in the study's
    standard states; rates are at its conditions.

    Parameters
    ----------
    study : StudyLike
        Loaded from a file.
    onsets_cm, scales : sequence of float
        What is tried.
    """
    t = np.array(study.conditions.temperature_k)
    tried = alternatives(study, onsets_cm, scales)
    made = _Made(study)
    quantities, findings = _quantities(made)
    start = [quantity.of(made) for quantity in quantities]
    change = np.full((len(quantities), len(tried), len(t)), np.nan)
    for a, alternative in enumerate(tried):
        try:
            other = _Made(alternative.of(study))
            values = [quantity.of(other) for quantity in quantities]
        except ThermoError as error:
            findings.append(not_made(alternative, error))
            continue
        findings += _new_doubts(alternative, study, other.study)
        for q, value in enumerate(values):
            change[q, a] = value - start[q]
    rows = tuple(
        Worth(quantity.kind, quantity.name, quantity.quantity, quantity.unit, start[q], change[q])
        for q, quantity in enumerate(quantities)
    )
    return Choices(t, tried, rows, tuple(findings))


@dataclass(frozen=True)
class _Made:
    """A study, and its rates once they are asked for."""

    study: StudyLike

    @cached_property
    def rates(self) -> dict[Definition, tuple[FloatArray, FloatArray]]:
        """Ln k and the Arrhenius energy, kJ/mol, of every definition that applies."""
        return _rates(self.study)


@dataclass(frozen=True)
class _Quantity:
    """One quantity, and how a study has it, shape (t,)."""

    kind: str
    name: str
    quantity: str
    unit: str
    of: Callable[[_Made], FloatArray]


def _quantities(made: _Made) -> tuple[list[_Quantity], list[Finding]]:
    """Return the quantities that a study has: of species, of barriers, of rates."""
    mechanism = made.study.mechanism
    names = (*mechanism.species, *mechanism.saddles)
    found = [_Quantity("species", name, "G", "kJ/mol", _gibbs({name: 1})) for name in names]
    for step in mechanism.steps:
        if step.through is None:
            continue
        for way, forward in (("forward", True), ("back", False)):
            start, _ = step.sides(forward)
            counts = {name: -count for name, count in start.items()}
            barrier = _gibbs({**counts, step.through: 1})
            found.append(_Quantity("barrier", f"{step.equation}, {way}", "G‡", "kJ/mol", barrier))
    try:
        definitions = made.rates
    except StudyError as error:
        note = Finding(
            "choices-without-rate",
            "note",
            str(made.study.path),
            None,
            f"no effective rate, so only free energies and barriers are compared: {error.what}",
            error.mend,
        )
        return found, [note]
    for definition in definitions:
        found += [
            _Quantity("rate", definition, "ln k", "", _of_rate(definition, 0)),
            _Quantity("rate", definition, "Ea", "kJ/mol", _of_rate(definition, 1)),
        ]
    return found, []


def _gibbs(counts: Mapping[str, int]) -> Callable[[_Made], FloatArray]:
    """Return what sums free energies of a study's species, kJ/mol."""

    def total(made: _Made) -> FloatArray:
        t, species = np.array(made.study.conditions.temperature_k), made.study.species
        parts = [count * species[name].at(t).gibbs_kj_mol for name, count in counts.items()]
        return np.asarray(np.sum(parts, axis=0))

    return total


def _of_rate(definition: Definition, which: int) -> Callable[[_Made], FloatArray]:
    return lambda made: made.rates[definition][which]


def _rates(study: StudyLike) -> dict[Definition, tuple[FloatArray, FloatArray]]:
    """Return ln k and the Arrhenius energy, kJ/mol, of every definition that applies."""
    from threadpoolctl import threadpool_limits

    with threadpool_limits(1), np.errstate(over="ignore"):
        model = Model(study.mechanism, study.conditions, study.treatment, study.species)
        rates = model.at(np.array(study.conditions.temperature_k))
        rates.check()
        found = {name: rates.rate(name) for name in DEFINITIONS if name in rates.definitions()}
    return {
        name: (
            np.asarray(rate.log, dtype=np.float64),
            np.asarray(rate.energy_j_mol, dtype=np.float64) / 1000.0,
        )
        for name, rate in found.items()
    }


def _new_doubts(alternative: Alternative, study: StudyLike, other: StudyLike) -> list[Finding]:
    """Return what is doubtful about the alternative and was not about the study, notes left out."""
    return [
        replace(finding, what=f"with {alternative.choice} {alternative.instead}: {finding.what}")
        for finding in other.findings
        if finding.severity != "note" and finding not in study.findings
    ]


def not_made(alternative: Alternative, error: ThermoError) -> Finding:
    """Return the finding that an alternative cannot be made."""
    return Finding(
        "choice-not-made",
        "note",
        error.where,
        None,
        f"{alternative.choice} cannot be {alternative.instead}: {error.what}",
        error.mend,
    )
