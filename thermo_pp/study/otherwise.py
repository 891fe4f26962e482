"""What a study could have chosen otherwise: one choice of treatment at a time."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, Protocol

from thermo_pp.conditions import Treatment
from thermo_pp.ensemble import Ensemble
from thermo_pp.kinetics.asked import StudyLike as EffectiveStudy
from thermo_pp.names import LOW_MODES, TUNNELLING

ONSETS_CM = (50.0, 150.0)
SCALES = (0.99, 1.01)
"""Factors of the scale factors that are tried."""


class StudyLike(EffectiveStudy, Protocol):
    """What this needs of a study."""

    @property
    def path(self) -> Path: ...  # noqa: D102
    @property
    def read_species(self) -> tuple[str, ...]: ...  # noqa: D102
    @property
    def level(self) -> str | None: ...  # noqa: D102
    @property
    def level_names(self) -> tuple[str, ...]: ...  # noqa: D102
    @property
    def tables(self) -> Mapping[str, Any]: ...  # noqa: D102
    def altered(  # noqa: D102
        self,
        treatment: Mapping[str, Any],
        species: Mapping[str, Mapping[str, Any]],
        *,
        steps: Mapping[int, Mapping[str, Any]] | None = None,
        level: str | None = None,
        lowest_only: bool = False,
    ) -> StudyLike: ...


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
        Keys of ``[treatment]`` in place of the study's; None takes a key out, here and below.
    species : mapping of str to mapping
        Keys of species in place of the study's.
    steps : mapping of int to mapping
        Keys of steps, numbered from 0, in place of the study's.
    level : str or None
        A named level of theory in place of the study's energies.
    lowest_only : bool
        Of several conformers, the lowest alone.
    """

    choice: str
    taken: str
    instead: str
    treatment: Mapping[str, Any] = field(default_factory=dict)
    species: Mapping[str, Mapping[str, Any]] = field(default_factory=dict)
    steps: Mapping[int, Mapping[str, Any]] = field(default_factory=dict)
    level: str | None = None
    lowest_only: bool = False

    def of(self, study: StudyLike) -> StudyLike:
        """Return the study with this choice; ThermoError where it cannot be made."""
        return study.altered(
            self.treatment,
            self.species,
            steps=self.steps,
            level=self.level,
            lowest_only=self.lowest_only,
        )


def alternatives(
    study: StudyLike, onsets_cm: Sequence[float], scales: Sequence[float]
) -> tuple[Alternative, ...]:
    """Return every choice that can be made otherwise.

    Soft-mode treatment (the other three), its onset, symmetry numbers (1), torsions (as vibrations),
    conformers (the lowest alone), masses, rotor, scale factors (both times a factor, and 1 where the
    study has others), handedness, tunnelling (the other two) and the named levels of theory.

    Parameters
    ----------
    study : StudyLike
    onsets_cm, scales : sequence of float
        What is tried.
    """
    own = study.treatment
    return (
        *_soft_modes(own, onsets_cm),
        Alternative(
            "symmetry number",
            "as it is",
            "1",
            species={name: {"symmetry_number": 1} for name in study.read_species},
        ),
        *_torsions(study.tables),
        *_conformers(study),
        *_of_structures(own, scales),
        *_tunnelling(study),
        *_levels(study),
    )


def _soft_modes(own: Treatment, onsets_cm: Sequence[float]) -> list[Alternative]:
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
    return [*low, *onsets]


def _of_structures(own: Treatment, scales: Sequence[float]) -> list[Alternative]:
    """Return other masses, rotor, scale factors and handedness."""
    masses = "program" if own.masses == "average" else "average"
    rotor = "auto" if own.rotor == "classical" else "classical"
    hands = ("one hand", "both hands") if own.enantiopure else ("both hands", "one hand")
    return [
        Alternative("masses", own.masses, masses, {"masses": masses}),
        Alternative("rotor", own.rotor, rotor, {"rotor": rotor}),
        *_scales(own, scales),
        Alternative("handedness", *hands, {"enantiopure": not own.enantiopure}),
    ]


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


def _torsions(tables: Mapping[str, Any]) -> list[Alternative]:
    """Return every torsion as the vibration that it stands for, where the study has torsions."""
    without: dict[str, dict[str, Any]] = {}
    for name, keys in tables.get("species", {}).items():
        changed: dict[str, Any] = {}
        if "torsions" in keys:
            changed["torsions"] = None
        listed = keys.get("conformers")
        if isinstance(listed, list) and any("torsions" in one for one in listed):
            changed["conformers"] = [
                {key: value for key, value in one.items() if key != "torsions"} for one in listed
            ]
        if changed:
            without[name] = changed
    if not without:
        return []
    return [Alternative("torsions", "hindered rotors", "vibrations", species=without)]


def _conformers(study: StudyLike) -> list[Alternative]:
    """Return the lowest conformer alone, where a species has several."""
    several = any(
        isinstance(model, Ensemble) and len(model.members) > 1 for model in study.species.values()
    )
    if not several:
        return []
    return [Alternative("conformers", "in equilibrium", "the lowest alone", lowest_only=True)]


def _tunnelling(study: StudyLike) -> list[Alternative]:
    """Return one method for all steps with a saddle point, where there is a rate to ask for."""
    mechanism = study.mechanism
    tunnels = {
        number: step.tunnelling
        for number, step in enumerate(mechanism.steps)
        if step.through is not None and step.crossing is None
    }
    if not tunnels or (mechanism.reactant is None and mechanism.catalyst is None):
        return []
    own = set(tunnels.values())
    return [
        Alternative(
            "tunnelling",
            " and ".join(one for one in TUNNELLING if one in own),
            name,
            {"tunnelling": name},
            steps={number: {"tunnelling": None} for number in tunnels},
        )
        for name in TUNNELLING
        if own != {name}
    ]


def _levels(study: StudyLike) -> list[Alternative]:
    """Return the named levels of theory other than that of the study."""
    taken = study.level or "as the file has it"
    return [
        Alternative("level of theory", taken, name, level=name)
        for name in study.level_names
        if name != study.level
    ]
