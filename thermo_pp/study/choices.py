"""What the choices are worth: each choice of treatment made otherwise, and what that changes."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field, replace
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, Any, Protocol

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import Treatment
from thermo_pp.errors import Finding, StudyError
from thermo_pp.kinetics.asked import StudyLike as EffectiveStudy
from thermo_pp.kinetics.model import Model
from thermo_pp.names import DEFINITIONS, LOW_MODES, Definition

if TYPE_CHECKING:
    import pandas as pd

FloatArray = NDArray[np.float64]


class StudyLike(EffectiveStudy, Protocol):
    """What this needs of a study."""

    @property
    def path(self) -> Path: ...  # noqa: D102
    @property
    def read_species(self) -> tuple[str, ...]: ...  # noqa: D102
    def altered(  # noqa: D102
        self, treatment: Mapping[str, Any], species: Mapping[str, Mapping[str, Any]]
    ) -> StudyLike: ...


ONSETS_CM = (50.0, 150.0)
SCALES = (0.99, 1.01)
"""Factors of the scale factors that are tried."""


@dataclass(frozen=True)
class Alternative:
    """One choice made otherwise.

    Attributes
    ----------
    choice : str
        What is chosen: ``"soft modes"``.
    taken, instead : str
        As the study has it, and what is tried.
    treatment : mapping of str to object
        Keys of ``[treatment]`` in place of the study's.
    species : mapping of str to mapping
        Keys of species in place of the study's.
    """

    choice: str
    taken: str
    instead: str
    treatment: Mapping[str, Any] = field(default_factory=dict)
    species: Mapping[str, Mapping[str, Any]] = field(default_factory=dict)


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
        return str(self.table().to_html(index=False))


def choices(
    study: StudyLike, *, onsets_cm: Sequence[float] = ONSETS_CM, scales: Sequence[float] = SCALES
) -> Choices:
    """Make each choice of a study otherwise, one at a time, and return what that changes.

    Soft-mode treatment (the other three), its onset, symmetry numbers (1), masses, rotor, scale
    factors (both times a factor, and 1 where the study has others) and handedness. Free energies are in
    the study's standard states; rates are at its conditions.

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
            other = _Made(study.altered(alternative.treatment, alternative.species))
            values = [quantity.of(other) for quantity in quantities]
        except StudyError as error:
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


def alternatives(
    study: StudyLike, onsets_cm: Sequence[float], scales: Sequence[float]
) -> tuple[Alternative, ...]:
    """Return every choice that can be made otherwise."""
    own = study.treatment
    low = [
        Alternative("soft modes", own.low_modes, name, {"low_modes": name})
        for name in LOW_MODES
        if name != own.low_modes
    ]
    onsets = [
        Alternative("onset", f"{own.onset_cm:g} cm^-1", f"{onset:g} cm^-1", {"onset": onset})
        for onset in onsets_cm
        if onset != own.onset_cm and own.low_modes != "harmonic"
    ]
    masses = "program" if own.masses == "average" else "average"
    rotor = "auto" if own.rotor == "classical" else "classical"
    hands = "both hands" if own.enantiopure else "one hand"
    return (
        *low,
        *onsets,
        Alternative(
            "symmetry number",
            "as it is",
            "1",
            species={name: {"symmetry_number": 1} for name in study.read_species},
        ),
        Alternative("masses", own.masses, masses, {"masses": masses}),
        Alternative("rotor", own.rotor, rotor, {"rotor": rotor}),
        *_scales(own, scales),
        Alternative(
            "handedness",
            "one hand" if own.enantiopure else "both hands",
            hands,
            {"enantiopure": not own.enantiopure},
        ),
    )


def _scales(own: Treatment, factors: Sequence[float]) -> list[Alternative]:
    """Return both scale factors times a factor, and without any where there are some."""
    pair = own.frequency_scale, own.zero_point_scale
    taken = f"{pair[0]:g}" if pair[0] == pair[1] else f"{pair[0]:g} and {pair[1]:g}"
    found = []
    for factor in factors:
        keys = {"frequency_scale": pair[0] * factor, "zero_point_scale": pair[1] * factor}
        found.append(Alternative("scale factors", taken, f"times {factor:g}", keys))
    if pair != (1.0, 1.0):
        keys = {"frequency_scale": 1.0, "zero_point_scale": 1.0}
        found.append(Alternative("scale factors", taken, "1", keys))
    return found


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


def not_made(alternative: Alternative, error: StudyError) -> Finding:
    """Return the finding that an alternative cannot be made."""
    return Finding(
        "choice-not-made",
        "note",
        error.where,
        None,
        f"{alternative.choice} cannot be {alternative.instead}: {error.what}",
        error.mend,
    )
