"""Reactions of a measured free energy: one species of each is moved, so that every loop still closes."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import MOLAR, StandardState, standard_state, temperature
from thermo_pp.errors import Finding, StudyError
from thermo_pp.mechanism import Step
from thermo_pp.names import DEFAULT_TEMPERATURE_K, Phase
from thermo_pp.nearest import suggestion
from thermo_pp.species import Anchored, Declared, SpeciesModel
from thermo_pp.study.check import place
from thermo_pp.study.keys import ReactionKeys, StepKeys
from thermo_pp.units import FARADAY_C_MOL, GAS_J_MOL_K, quantity

FloatArray = NDArray[np.float64]
_WAYS = ("free_energy", "equilibrium_constant", "pKa", "potential")
_SINGULAR = 1e-9


@dataclass(frozen=True)
class _Measured:
    """One measured reaction: its step, anchor, and free energy of 1 mol/L in kJ/mol at a temperature."""

    step: Step
    anchor: str
    free_energy_kj_mol: float
    enthalpy_kj_mol: float | None
    temperature_k: float
    where: str


def anchor_species(
    keys: Sequence[StepKeys],
    steps: Sequence[Step],
    species: Mapping[str, SpeciesModel],
    phase: Phase,
    file: str,
) -> tuple[dict[str, SpeciesModel], list[Finding]]:
    """Move the anchors of all measured reactions together, so that each has its measured value.

    A species that is declared relative to an anchor moves with it; nothing else does.

    Returns
    -------
    tuple
        The species in their order, and a note a reaction: measured, computed, and what else moves.

    Raises
    ------
    StudyError
        An anchor that is not used or made by its step, or that two reactions share; a quantity that
        does not fit the step.
    """
    measured = [
        _measured(one.reaction, steps[k], species, phase, place(file, "steps", k, "reaction"))
        for k, one in enumerate(keys)
        if isinstance(one.reaction, ReactionKeys)
    ]
    if not measured:
        return dict(species), []
    anchors = [one.anchor for one in measured]
    for one in measured:
        if anchors.count(one.anchor) > 1:
            raise StudyError(
                f"{one.anchor!r} is the anchor of two reactions",
                where=f"{one.where} anchor",
                mend="give each measured reaction an anchor of its own",
            )
    follows = {name: _follows(model, anchors) for name, model in species.items()}
    matrix = np.array([_sum(one.step, follows) for one in measured])
    if abs(np.linalg.det(matrix)) < _SINGULAR:
        raise StudyError(
            f"the measured reactions do not fix their anchors ({', '.join(anchors)})",
            where=measured[0].where,
            mend="choose anchors that stand in their own reaction only",
        )
    computed = [_computed(one.step, species, one.temperature_k) for one in measured]
    t = np.array([one.temperature_k for one in measured])
    excess = np.array(
        [one.free_energy_kj_mol - found[0] for one, found in zip(measured, computed, strict=True)]
    )
    heat = np.array(
        [
            gap if one.enthalpy_kj_mol is None else one.enthalpy_kj_mol - found[1]
            for one, found, gap in zip(measured, computed, excess, strict=True)
        ]
    )
    enthalpy = np.linalg.solve(matrix, heat)
    entropy = np.linalg.solve(matrix, (heat - excess) * 1000.0 / t)
    moved: dict[str, SpeciesModel] = {}
    for name in species:
        _move(name, species, anchors, enthalpy, entropy, moved)
    findings = []
    for k, one in enumerate(measured):
        gibbs = enthalpy - one.temperature_k * entropy / 1000.0
        others = [
            f"{step.equation!r} by {change:.4g}"
            for step in steps
            if step is not one.step
            for change in [float(np.dot(_sum(step, follows), gibbs))]
            if abs(change) > _SINGULAR
        ]
        also = (
            f"; of other steps it moves {', '.join(others)}, so every loop closes" if others else ""
        )
        findings.append(
            Finding(
                "reaction-measured",
                "note",
                file,
                None,
                f"step {one.step.equation}: its free energy at {one.temperature_k:g} K and 1 mol/L is "
                f"{one.free_energy_kj_mol:.4f} kJ/mol as the study says, in place of {computed[k][0]:.4f}: "
                f"G of {one.anchor} is moved by {gibbs[k]:.4f} kJ/mol{also}",
                "check the measured value and its standard state where the two are far apart",
            )
        )
    return {name: moved[name] for name in species}, findings


def _measured(
    keys: ReactionKeys,
    step: Step,
    species: Mapping[str, SpeciesModel],
    phase: Phase,
    where: str,
) -> _Measured:
    given = [name for name in _WAYS if _said(getattr(keys, name))]
    if len(given) != 1:
        raise StudyError(
            f"the reaction has {' and '.join(given) or 'no measured quantity'}",
            where=where,
            mend=f"give exactly one of {', '.join(_WAYS)}",
        )
    change = step.change()
    if keys.anchor not in change:
        raise StudyError(
            f"the anchor {keys.anchor!r} is neither used nor made by {step.equation!r}",
            where=f"{where} anchor",
            mend=suggestion(keys.anchor, change, "species"),
        )
    t = DEFAULT_TEMPERATURE_K
    if _said(keys.temperature):
        t = temperature(keys.temperature, where=f"{where} temperature")
    rt = GAS_J_MOL_K * t / 1000.0
    grows = sum(change.values())
    at = f"{where} {given[0]}"
    if given[0] in ("pKa", "potential") and phase != "solution":
        raise StudyError(
            f"{given[0]} has no meaning in a gas",
            where=at,
            mend='write free_energy, or phase = "solution" under [treatment]',
        )
    if given[0] == "free_energy":
        gibbs = quantity(keys.free_energy, "kJ/mol", where=at)
        gibbs += grows * rt * _to_molar(keys, grows, t, where)
    elif given[0] == "equilibrium_constant":
        gibbs = -rt * math.log(_constant(keys, grows, at))
    elif given[0] == "pKa":
        _check_proton(step, species, at)
        gibbs = rt * math.log(10.0) * float(keys.pKa)  # type: ignore[arg-type]
    else:
        electrons = sum(
            count
            for name, count in change.items()
            if not species[name].composition and species[name].charge == -1
        )
        if not electrons:
            raise StudyError(
                f"no electrons stand in {step.equation!r}",
                where=at,
                mend='declare them: a species with composition = "e-"',
            )
        gibbs = electrons * FARADAY_C_MOL * quantity(keys.potential, "V", where=at) / 1000.0
    enthalpy = None
    if _said(keys.enthalpy):
        enthalpy = quantity(keys.enthalpy, "kJ/mol", where=f"{where} enthalpy")
    return _Measured(step, keys.anchor, gibbs, enthalpy, t, where)


def _said(value: object) -> bool:
    return isinstance(value, str | float | int)


def _to_molar(keys: ReactionKeys, grows: int, t: float, where: str) -> float:
    """Return ln of the concentration 1 mol/L over that of the standard state."""
    if not _said(keys.standard_state):
        if grows == 0:
            return 0.0
        raise StudyError(
            "the standard state of the free energy is not said",
            where=f"{where} standard_state",
            mend='write standard_state = "1 mol/L" or "1 bar" beside it',
        )
    state: StandardState = standard_state(keys.standard_state, where=f"{where} standard_state")
    return float(MOLAR.log_ratio_to_bar(t) - state.log_ratio_to_bar(t))


def _constant(keys: ReactionKeys, grows: int, at: str) -> float:
    """Return an equilibrium constant in mol/L to the power of what the number of molecules grows by."""
    value = keys.equilibrium_constant
    if grows == 0 and isinstance(value, float | int):
        constant = float(value)
    elif grows == 0 or isinstance(value, float | int):
        raise StudyError(
            f"{value!r} does not fit the step, which makes {grows:+d} molecules",
            where=at,
            mend="write a number alone where as many molecules stand on both sides, else its unit: "
            '"1.7e-5 mol/L", "40 L/mol"',
        )
    else:
        unit = {1: "mol/L", -1: "L/mol"}.get(grows, f"mol^{grows}/L^{grows}")
        constant = quantity(value, unit, where=at)
    if constant <= 0.0:
        raise StudyError(f"{value!r} is not above 0", where=at, mend="write a value above 0")
    return constant


def _check_proton(step: Step, species: Mapping[str, SpeciesModel], at: str) -> None:
    change = step.change()
    protons = [
        count
        for name, count in change.items()
        if dict(species[name].composition) == {"H": 1} and species[name].charge == 1
    ]
    if protons != [1] or sum(change.values()) != 1:
        raise StudyError(
            f"{step.equation!r} does not give off one proton",
            where=at,
            mend='write the step as "HA = A + H+", H+ a species with composition = "H+", '
            "or give its equilibrium_constant",
        )


def _computed(step: Step, species: Mapping[str, SpeciesModel], t: float) -> tuple[float, float]:
    """Return free energy and enthalpy of a step at 1 mol/L, kJ/mol."""
    gibbs = enthalpy = 0.0
    for name, count in step.change().items():
        thermo = species[name].at(t, standard_state=MOLAR)
        gibbs += count * float(thermo.gibbs_kj_mol[0])
        enthalpy += count * float(thermo.enthalpy_kj_mol[0])
    return gibbs, enthalpy


def _follows(model: SpeciesModel, anchors: Sequence[str]) -> FloatArray:
    """Return how often each anchor is in a species, by way of what it is declared relative to."""
    own = np.array([float(name == model.name) for name in anchors])
    if isinstance(model, Declared):
        for other, count in model.reference:
            own = own + count * _follows(other, anchors)
    return own


def _sum(step: Step, follows: Mapping[str, FloatArray]) -> FloatArray:
    return np.asarray(sum(count * follows[name] for name, count in step.change().items()))


def _move(
    name: str,
    species: Mapping[str, SpeciesModel],
    anchors: Sequence[str],
    enthalpy: FloatArray,
    entropy: FloatArray,
    moved: dict[str, SpeciesModel],
) -> SpeciesModel:
    """Move a species, those it is relative to first."""
    if name in moved:
        return moved[name]
    model = species[name]
    if isinstance(model, Declared) and model.reference:
        reference = tuple(
            (_move(other.name, species, anchors, enthalpy, entropy, moved), count)
            for other, count in model.reference
        )
        model = replace(model, reference=reference)
    if name in anchors:
        k = anchors.index(name)
        model = Anchored(model, float(enthalpy[k]), float(entropy[k]))
    moved[name] = model
    return model
