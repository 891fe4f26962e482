"""The file ``results.json``: every number of a report, never rounded; tables and pages show these."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from thermo_pp import __version__
from thermo_pp.conditions import Conditions, Held
from thermo_pp.functions.phase import GasPhase
from thermo_pp.mechanism import Mechanism, Step
from thermo_pp.output import (
    barrier,
    choices,
    compare,
    conformers,
    courses,
    doubt,
    energies,
    functions,
    isotopes,
    profile,
    regimes,
    selectivity,
)
from thermo_pp.output.json_text import json_text, treatment_keys
from thermo_pp.output.provenance import provenance
from thermo_pp.rate_laws import Arrhenius, Crossing
from thermo_pp.species import Declared, SpeciesModel
from thermo_pp.species.result import ModeTable
from thermo_pp.study.answers import Answers, SpeciesAnswer

FORMAT = "thermo-pp/results/1"
_COMMON = ("format", "treatment", "standard_state", "findings", "energies")
"""Keys of a command's answer that a report says once for all parts, or elsewhere."""

_ELSEWHERE = ("time_course", "flow", "selectivity", "regimes", "doubt")


def results_text(answers: Answers) -> str:
    """Return the file's text; the same answers give the same text."""
    return json_text(results_keys(answers))


def results_keys(answers: Answers) -> dict[str, Any]:
    """Return what the file holds.

    Parts that the study does not ask for are null, and ``left_out`` says why. Every number that is
    not in ``provenance`` is derived from those that are, by this version of the program, with the
    treatment and standard state that stand beside it.
    """
    study = answers.study
    treatment = study.treatment
    return {
        "format": FORMAT,
        "title": study.title,
        "study": str(study.path),
        "version": __version__,
        "constants": "CODATA 2022",
        "treatment": treatment_keys(treatment),
        "standard_state": treatment.standard_state.text,
        "level": study.level,
        "levels": study.levels,
        "temperature_k": study.conditions.temperature_k,
        "conditions": _conditions(study.conditions),
        "mechanism": _mechanism(study.mechanism),
        "species": [_species(answers, name, one) for name, one in answers.species.items()],
        "energies": energies.keys(study.energies),
        "profiles": [
            {"low_modes": low_modes, "standard_state": state, **_own(_profile(answers, low_modes, state))}
            for low_modes, state in answers.profiles
        ],
        "profile_at_conditions": None
        if answers.profile_at_conditions is None
        else {
            "low_modes": treatment.low_modes,
            "standard_state": treatment.standard_state.text,
            **_own(profile.keys(answers.profile_at_conditions, treatment, (), {})),
        },
        "barriers": [
            {
                "low_modes": low_modes,
                "standard_state": effective.standard_state,
                **_own(barrier.keys(effective, treatment, ()), *_ELSEWHERE),
            }
            for low_modes, effective in answers.effective_by_treatment.items()
        ],
        "selectivity": answers.selectivity
        and {
            **selectivity.keys(answers.selectivity),
            "words": " ".join(answers.selectivity.words),
        },
        "regimes": answers.regimes
        and {**regimes.keys(answers.regimes), "words": " ".join(answers.regimes.words)},
        "doubt": answers.doubt
        and {**doubt.doubt_keys(answers.doubt), "words": " ".join(answers.doubt.words)},
        "time_course": answers.transient
        and {
            **courses.time_course_keys(answers.transient),
            "words": " ".join(answers.transient.words),
        },
        "flow": answers.flow
        and {**courses.flow_keys(answers.flow), "words": " ".join(answers.flow.words)},
        "isotopes": _own(isotopes.keys(answers.isotopes, treatment, ()))
        if answers.isotopes
        else None,
        "choices": answers.choices and _own(choices.keys(answers.choices, treatment, ())),
        "comparison": answers.comparison and _own(compare.keys(answers.comparison, treatment)),
        "conformers": answers.ensembles and _own(conformers.keys(answers.ensembles)),
        "formation": answers.formation and functions.formation_keys(answers.formation),
        "gas_phase": answers.phase and _phase(answers.phase),
        "left_out": answers.left_out,
        "findings": [finding.as_dict() for finding in answers.findings],
        "inputs": [vars(one) for one in answers.inputs],
        "provenance": provenance(answers),
    }  # fmt: skip


def _own(keys: Mapping[str, Any], *others: str) -> dict[str, Any]:
    """Return a command's answer without what the report says once."""
    return {name: value for name, value in keys.items() if name not in (*_COMMON, *others)}


def _profile(answers: Answers, low_modes: Any, state: str) -> dict[str, Any]:
    return profile.keys(answers.profiles[low_modes, state], answers.study.treatment, (), {})


def _conditions(conditions: Conditions) -> dict[str, Any]:
    flow = conditions.flow
    return {
        "held": _amounts(conditions.held),
        "driven": conditions.driven,
        "initial": _amounts(conditions.initial),
        "total": _amounts(conditions.total),
        "flow": flow and {"residence_s": flow.residence_s, "feed": _amounts(flow.feed)},
        "quasi_steady": conditions.quasi_steady,
    }


_UNITS = {"concentration": "mol_l", "pressure": "pa"}


def _amounts(amounts: Mapping[str, Held]) -> dict[str, Any]:
    return {
        name: {"as_written": one.text}
        if one.value is None
        else {"as_written": one.text, _UNITS[one.form]: one.value}
        for name, one in amounts.items()
    }


def _mechanism(mechanism: Mechanism) -> dict[str, Any]:
    return {
        "reactant": mechanism.reactant,
        "catalyst": mechanism.catalyst,
        "products": mechanism.products,
        "saddles": mechanism.saddles,
        "steps": [_step(step) for step in mechanism.steps],
    }


def _step(step: Step) -> dict[str, Any]:
    """Return a step; factors of rate laws are in L, mol and s, temperature over 298.15 K."""
    falloff = step.falloff
    return {
        "equation": step.equation,
        "reactants": step.reactants,
        "products": step.products,
        "through": step.through,
        "barrierless": step.barrierless,
        "rate": step.rate and _arrhenius(step.rate),
        "height": step.height and vars(step.height),
        "falloff": falloff
        and {
            **vars(falloff),
            "low": _arrhenius(falloff.low),
            "high": _arrhenius(falloff.high),
        },
        "crossing": step.crossing and _crossing(step.crossing),
        "viscosity_pa_s": step.viscosity and _over_temperature(step.viscosity),
        "permittivity": step.permittivity and _over_temperature(step.permittivity),
        "tunnelling": step.tunnelling,
    }


def _crossing(crossing: Crossing) -> dict[str, Any]:
    """Return a crossing; what is None of the gradients is that of the crossing point."""
    gradient_n, mass_kg = crossing.across or (None, None)
    return {
        "transmission": crossing.transmission,
        "coupling_j": crossing.coupling_j,
        "gradient_n": gradient_n,
        "mass_kg": mass_kg,
    }


def _arrhenius(law: Arrhenius) -> dict[str, float]:
    return dict(zip(("factor_l_mol_s", "power", "energy_kj_mol"), law, strict=True))


def _over_temperature(pairs: tuple[tuple[float, float], ...]) -> dict[str, Any]:
    """Return a value over temperature; a single one is constant."""
    return {"temperature_k": [t for t, _ in pairs], "value": [value for _, value in pairs]}


def _species(answers: Answers, name: str, one: SpeciesAnswer) -> dict[str, Any]:
    model, result = answers.study.species[name], one.result
    return {
        "name": name,
        "made_as": type(model).__name__.lower(),
        "kind": model.kind,
        "composition": model.composition,
        "charge": model.charge,
        "files": model.files,
        "relative_to": _reference(model),
        "low_modes": result.low_modes,
        "standard_state": result.standard_state.text,
        "symmetry_number": result.symmetry_number,
        "symmetry_origin": result.symmetry_origin,
        "rotor": result.rotor,
        "degeneracy": result.degeneracy,
        "electronic_kj_mol": result.electronic_kj_mol,
        "zero_point_kj_mol": result.zero_point_kj_mol,
        "temperature_k": result.temperature_k,
        "enthalpy_kj_mol": result.enthalpy_kj_mol,
        "entropy_j_mol_k": result.entropy_j_mol_k,
        "gibbs_kj_mol": result.gibbs_kj_mol,
        "heat_capacity_j_mol_k": result.heat_capacity_j_mol_k,
        "slope_enthalpy_kj_mol": result.slope_enthalpy_kj_mol,
        "low_mode_spread_kj_mol": one.low_mode_spread_kj_mol,
        "parts": [vars(row) for row in result.rows],
        "modes": result.mode_table and _modes(result.mode_table),
        "functions": functions.curve_keys(one.functions, None),
    }


def _reference(model: SpeciesModel) -> dict[str, int] | None:
    """Return what a declared species is relative to."""
    if not isinstance(model, Declared) or not model.reference:
        return None
    return {other.name: count for other, count in model.reference}


def _modes(modes: ModeTable) -> dict[str, Any]:
    """Return what does not depend on temperature; the sum of the rest is a part."""
    names = ("wavenumber_cm", "used_cm", "treated_as", "weight", "zero_point_kj_mol")
    return {name: getattr(modes, name) for name in names}


def _phase(phase: GasPhase) -> dict[str, Any]:
    return {
        "of_formation": phase.of_formation,
        "per_element_kj_mol": phase.per_element_kj_mol,
        "species": [
            {
                "name": one.name,
                "shift_kj_mol": one.shift_kj_mol,
                "fit": functions.fit_keys(one.fit),
                "coefficients": one.polynomial.coefficients,
            }
            for one in phase.species
        ],
    }
