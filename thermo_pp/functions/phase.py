"""A gas phase of several species with polynomials on one common zero of enthalpy."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from thermo_pp.errors import Finding, StudyError
from thermo_pp.formulas.polynomials import Polynomial
from thermo_pp.functions.fits import Fit, check_bounds, fit
from thermo_pp.names import DEFAULT_TEMPERATURE_K, Phase, PolynomialForm
from thermo_pp.species import SpeciesModel


@dataclass(frozen=True, eq=False)
class GasSpecies:
    """One species of a phase.

    Attributes
    ----------
    name : str
    composition : mapping of str to int
    charge : int
    fit : Fit
        As fitted, H absolute.
    polynomial : Polynomial
        H on the zero of the phase.
    shift_kj_mol : float
        What was added to the absolute enthalpy.
    files : tuple of str
    """

    name: str
    composition: Mapping[str, int]
    charge: int
    fit: Fit
    polynomial: Polynomial
    shift_kj_mol: float
    files: tuple[str, ...]


@dataclass(frozen=True, eq=False)
class GasPhase:
    """The species of a gas, at 1 bar.

    Attributes
    ----------
    title : str
    species : tuple of GasSpecies
        Minima only.
    of_formation : bool
        H(298.15 K) of every species is its enthalpy of formation.
    per_element_kj_mol : mapping of str to float
        Else what was taken off the absolute enthalpy for each atom (``E``: each electron beyond
        the neutral molecule), so that numbers are small and no balanced reaction changes.
    findings : tuple of Finding
    """

    title: str
    species: tuple[GasSpecies, ...]
    of_formation: bool
    per_element_kj_mol: Mapping[str, float]
    findings: tuple[Finding, ...] = ()


def gas_phase(
    models: Mapping[str, SpeciesModel],
    form: PolynomialForm,
    bounds_k: tuple[float, float, float],
    *,
    title: str,
    phase: Phase,
    formation_kj_mol: Mapping[str, float] | None = None,
    where: str,
) -> GasPhase:
    """Fit every minimum and put the fits on one zero of enthalpy.

    Parameters
    ----------
    models : mapping of str to SpeciesModel
        By name; saddle points are left out.
    form : {"nasa7", "nasa9", "shomate"}
    bounds_k : (float, float, float)
    title : str
    phase : {"gas", "solution"}
        Of the treatment.
    formation_kj_mol : mapping of str to float or None
        Enthalpies of formation at 298.15 K; taken where every minimum has one.
    where : str
        For messages.

    Raises
    ------
    StudyError
        A solution, no minimum, or bounds as `fit` refuses them.
    """
    if phase != "gas":
        raise StudyError(
            "a solution cannot be written as a phase of ideal gases",
            where=where,
            mend='leave the phase out, or compute the species with phase = "gas"',
        )
    check_bounds(bounds_k, where=where)
    minima = {name: model for name, model in models.items() if model.kind == "minimum"}
    if not minima:
        raise StudyError(
            "no minimum, so there is nothing to write",
            where=where,
            mend="name outputs of minima; saddle points are no species of a phase",
        )
    fits = {name: fit(model, form, bounds_k, where=where) for name, model in minima.items()}
    room = {
        name: float(model.at(DEFAULT_TEMPERATURE_K).enthalpy_kj_mol[0])
        for name, model in minima.items()
    }
    known = formation_kj_mol or {}
    lacking = [name for name in minima if name not in known]
    per_element: dict[str, float] = {}
    if lacking:
        contents = {name: _content(model) for name, model in minima.items()}
        per_element = _per_element(contents, room)
        shift = {
            name: -sum(per_element[element] * count for element, count in content.items())
            for name, content in contents.items()
        }
    else:
        shift = {name: known[name] - room[name] for name in minima}
    findings = [finding for one in fits.values() for finding in one.findings]
    if known and lacking:
        findings.append(
            Finding(
                "phase-zero",
                "warning",
                None,
                None,
                "the phase is on a zero of its own, not on enthalpies of formation, because these have "
                f"none: {', '.join(lacking)}",
                "let [formation] give one for every minimum",
            )
        )
    return GasPhase(
        title=title,
        species=tuple(
            GasSpecies(
                name=name,
                composition=dict(model.composition),
                charge=model.charge,
                fit=fits[name],
                polynomial=fits[name].polynomial.raised(1000.0 * shift[name]),
                shift_kj_mol=shift[name],
                files=model.files,
            )
            for name, model in minima.items()
        ),
        of_formation=not lacking,
        per_element_kj_mol=per_element,
        findings=tuple(dict.fromkeys(findings)),
    )


def _content(model: SpeciesModel) -> dict[str, int]:
    """Return atoms by element, and the electrons beyond the neutral molecule as ``E``."""
    electrons = {"E": -model.charge} if model.charge else {}
    return {**model.composition, **electrons}


def _per_element(
    contents: Mapping[str, Mapping[str, int]], room: Mapping[str, float]
) -> dict[str, float]:
    """Return enthalpies for each atom that make up those of the species as nearly as can be."""
    elements: Sequence[str] = sorted(
        {element for content in contents.values() for element in content}
    )
    counts = np.array(
        [[content.get(element, 0) for element in elements] for content in contents.values()]
    )
    found = np.linalg.lstsq(counts.astype(np.float64), np.array([*room.values()]), rcond=None)[0]
    return {element: round(float(value), 3) for element, value in zip(elements, found, strict=True)}
