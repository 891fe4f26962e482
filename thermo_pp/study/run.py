"""Run: everything that a report of a study shows, computed once and in one place."""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, TypeVar

import numpy as np

from thermo_pp.conditions import MOLAR, StandardState
from thermo_pp.errors import Finding, StudyError, each_once
from thermo_pp.names import LOW_MODES, LowModes
from thermo_pp.profile import Choice, Profile, profiles
from thermo_pp.species import low_mode_spread_kj_mol
from thermo_pp.study.answers import Answers, InputFile, SpeciesAnswer
from thermo_pp.study.key_lines import declared_numbers
from thermo_pp.units import BAR_PA

if TYPE_CHECKING:
    from thermo_pp.ensemble import Ensembles
    from thermo_pp.functions.formation import Formations
    from thermo_pp.functions.phase import GasPhase
    from thermo_pp.kinetics.courses import Transient
    from thermo_pp.kinetics.doubt.results import Doubt
    from thermo_pp.kinetics.flow import FlowState
    from thermo_pp.kinetics.isotope_effects import IsotopeEffects
    from thermo_pp.kinetics.product_ratio import Selectivity
    from thermo_pp.kinetics.regime_map import RegimeQuestion, Regimes
    from thermo_pp.kinetics.results import EffectiveRate
    from thermo_pp.measured.results import Comparison
    from thermo_pp.study.choices import Choices
    from thermo_pp.study.load import Study

Made = TypeVar("Made")
Progress = Callable[[int, int, str], None]
"""Called with how many stages are done, how many there are, and what comes next."""

USUAL_K = 298.15
REGIME_FACTOR, REGIME_POINTS = 100.0, 25
"""How far a map of regimes goes to either side of the amount held, and its points."""


@dataclass(frozen=True)
class Measured:
    """Measured rate constants to set the study against.

    Attributes
    ----------
    file : Path
    deviation, saddle_deviation : str or None
        Standard deviations of the electronic energies; see `Study.compare`.
    """

    file: Path
    deviation: str | None = None
    saddle_deviation: str | None = None


def answer(
    study: Study,
    *,
    times_s: Sequence[float] = (),
    measured: Measured | None = None,
    progress: Progress | None = None,
) -> Answers:
    """Compute everything that a report of a study shows.

    Parameters
    ----------
    study : Study
        Loaded from a file.
    times_s : sequence of float
        Times of the time courses; spread by themselves unless given.
    measured : Measured or None
    progress : callable or None
        Called before each stage and once at the end.

    Raises
    ------
    StudyError
        A part that the study asks for cannot be computed. What it does not ask for is left out.
    """
    told = progress or (lambda done, of, what: None)
    return _Run(study, tuple(times_s), measured, told).answers()


@dataclass
class _Run:
    """One run: the stages in their order, and what they leave out."""

    study: Study
    times_s: tuple[float, ...]
    measured: Measured | None
    progress: Progress
    left_out: dict[str, str] = field(default_factory=dict)
    said: list[Finding] = field(default_factory=list)
    done: int = 0

    STAGES = 14 + len(LOW_MODES)

    def answers(self) -> Answers:
        study = self.study
        self.said += study.findings
        species = self.stage("species", self.species)
        found = self.stage("profiles", self.profiles)
        at_conditions = self.stage("profile at the conditions", self.at_conditions)
        effective = self.stage("rates", self.effective)
        by_treatment = self.by_treatment(effective)
        selectivity = self.stage("selectivity", lambda: self.selectivity(effective))
        regimes = self.stage("regimes", lambda: self.regimes(effective))
        doubt = self.stage("doubt", lambda: self.doubt(effective))
        transient = self.stage("time courses", self.transient)
        flow = self.stage("flow", self.flow)
        isotopes = self.stage("isotope effects", self.isotopes)
        choices = self.stage("choices", self.choices)
        comparison = self.stage("comparison", self.comparison)
        ensembles = self.stage("conformers", self.ensembles)
        formation, phase = self.stage("functions", self.functions)
        self.progress(self.STAGES, self.STAGES, "")
        rates = (effective, selectivity, doubt, transient, flow, *isotopes)
        parts = (*rates, choices, comparison, ensembles, formation, phase)
        for part in (*found.values(), *parts):
            self.said += () if part is None else part.findings
        return Answers(
            study=study,
            species=species,
            profiles=found,
            own=(study.treatment.low_modes, study.treatment.standard_state.text),
            profile_at_conditions=at_conditions,
            effective=effective,
            effective_by_treatment=by_treatment,
            selectivity=selectivity,
            regimes=regimes,
            doubt=doubt,
            transient=transient,
            flow=flow,
            isotopes=isotopes,
            choices=choices,
            comparison=comparison,
            ensembles=ensembles,
            formation=formation,
            phase=phase,
            inputs=_inputs(study, self.measured),
            declared=declared_numbers(study.path.read_text(encoding="utf-8-sig")),
            left_out=self.left_out,
            findings=each_once(self.said),
        )

    def stage(self, what: str, make: Callable[[], Made]) -> Made:
        """Make one part."""
        self.progress(self.done, self.STAGES, what)
        self.done += 1
        return make()

    def species(self) -> dict[str, SpeciesAnswer]:
        from thermo_pp.functions.curves import functions

        t = self.study.conditions.temperature_k
        found: dict[str, SpeciesAnswer] = {}
        for name, model in self.study.species.items():
            result, curves = model.at(np.array(t)), functions(model, t)
            self.said += (*result.findings, *curves.findings)
            found[name] = SpeciesAnswer(result, curves, low_mode_spread_kj_mol(model, t))
        return found

    def profiles(self) -> dict[Choice, Profile]:
        if not self.has_paths:
            self.left_out["profiles"] = (
                "the study asks for none: it has neither [effective] nor [[paths]]"
            )
            return {}
        return profiles(self.study, standard_states(self.study.treatment.standard_state))

    def at_conditions(self) -> Profile | None:
        if not self.has_paths or not self.study.conditions.held:
            self.left_out["profile_at_conditions"] = "no path, or no species is held"
            return None
        return self.study.profile(at_conditions=True)

    @property
    def has_paths(self) -> bool:
        return self.asked or bool(self.study.mechanism.paths)

    @property
    def asked(self) -> bool:
        """Whether the study says what a rate is of."""
        mechanism = self.study.mechanism
        return mechanism.reactant is not None or mechanism.catalyst is not None

    def effective(self) -> EffectiveRate | None:
        conditions = self.study.conditions
        reason = "the study asks for none: it has no [effective]"
        if self.asked:
            return self.study.effective()
        if conditions.initial or conditions.flow is not None:  # steps alone, if not linear
            try:
                return self.study.effective()
            except StudyError as error:
                reason = error.what
        self.left_out["effective"] = reason
        return None

    def by_treatment(self, own: EffectiveRate | None) -> dict[LowModes, EffectiveRate]:
        """Return the rates with every soft-mode treatment, in their fixed order."""
        found: dict[LowModes, EffectiveRate] = {}
        for low in LOW_MODES:
            one = self.stage(f"rates, {low}", lambda low=low: self.with_treatment(low, own))  # type: ignore[misc]
            if one is not None:
                found[low] = one
        return found

    def with_treatment(self, low: LowModes, own: EffectiveRate | None) -> EffectiveRate | None:
        if own is None or low == self.study.treatment.low_modes:
            return own
        try:
            return self.study.altered({"low_modes": low}, {}).effective()
        except StudyError as error:
            self.left_out[f"effective_by_treatment {low}"] = error.what
            return None

    def selectivity(self, effective: EffectiveRate | None) -> Selectivity | None:
        found = None if effective is None else self.study.selectivity(effective)
        if found is None:
            self.left_out["selectivity"] = "no two products compete in a linear network"
        return found

    def regimes(self, effective: EffectiveRate | None) -> Regimes | None:
        if self.study.regime_question is not None:
            return self.study.regimes()
        question = None if effective is None else self.usual_question(effective)
        if question is None:
            self.left_out["regimes"] = "no rate of a linear network, or nothing held at an amount"
            return None
        try:
            return self.study.regimes(question)
        except StudyError as error:
            self.left_out["regimes"] = error.what
            return None

    def usual_question(self, effective: EffectiveRate) -> RegimeQuestion | None:
        """Return the question for the first species held at an amount, None where there is none."""
        from thermo_pp.kinetics.regime_map import RegimeQuestion

        if not any(effective.rates.values()):
            return None
        for name, held in self.study.conditions.held.items():
            if isinstance(held.value, float) and held.form in ("concentration", "pressure"):
                low, high = held.value / REGIME_FACTOR, held.value * REGIME_FACTOR
                return RegimeQuestion(name, held.form, low, high, REGIME_POINTS)
        return None

    def doubt(self, effective: EffectiveRate | None) -> Doubt | None:
        if self.study.uncertainty is None or effective is None:
            self.left_out["doubt"] = "no rate, or the study has no [doubt]"
            return None
        return self.study.doubt()

    def transient(self) -> Transient | None:
        conditions = self.study.conditions
        if not conditions.initial and not conditions.total:
            self.left_out["transient"] = "the study has no [conditions] initial"
            return None
        if not conditions.initial and not self.times_s:
            self.left_out["transient"] = "the study has no [conditions] initial, only a total"
            return None
        from thermo_pp.kinetics.courses import course_temperatures

        kelvin = course_temperatures(conditions.temperature_k)
        return self.study.transient(times_s=self.times_s, temperature_k=kelvin)

    def flow(self) -> FlowState | None:
        if self.study.conditions.flow is None:
            self.left_out["flow"] = "the study has no [conditions] flow"
            return None
        return self.study.flow()

    def isotopes(self) -> tuple[IsotopeEffects, ...]:
        if not self.study.labels:
            self.left_out["isotopes"] = "the study has no [isotopologues]"
            return ()
        return self.study.isotope_effects()

    def choices(self) -> Choices | None:
        if not self.study.mechanism.steps:
            self.left_out["choices"] = "the study has no steps"
            return None
        return self.study.choices()

    def comparison(self) -> Comparison | None:
        if self.measured is None:
            self.left_out["comparison"] = "no measured rate constants were named"
            return None
        one = self.measured
        return self.study.compare(
            one.file, deviation=one.deviation, saddle_deviation=one.saddle_deviation
        )

    def ensembles(self) -> Ensembles | None:
        from thermo_pp.ensemble import MISSED_KJ_MOL, Ensemble, results

        study = self.study
        models = [model for model in study.species.values() if isinstance(model, Ensemble)]
        if not models:
            self.left_out["ensembles"] = "no species of the study has conformers"
            return None
        return results(
            models,
            study.conditions.temperature_k,
            study.treatment,
            (),
            duplicates=study.duplicates,
            missed_kj_mol=MISSED_KJ_MOL,
        )

    def functions(self) -> tuple[Formations | None, GasPhase | None]:
        """Return enthalpies of formation and the gas phase of the minima."""
        from thermo_pp.functions.fits import DEFAULT_BOUNDS_K
        from thermo_pp.functions.phase import gas_phase

        study = self.study
        formation = study.formation()
        if formation is None:
            self.left_out["formation"] = "the study has no [formation]"
        try:
            phase = gas_phase(
                study.species,
                "nasa7",
                DEFAULT_BOUNDS_K,
                title=study.title,
                phase=study.treatment.phase,
                formation_kj_mol=None if formation is None else formation.room_kj_mol,
                where=str(study.path),
            )
        except StudyError as error:
            self.left_out["phase"] = error.what
            return formation, None
        return formation, phase


def standard_states(own: StandardState) -> tuple[StandardState, ...]:
    """Return the standard states that a profile is shown in: the study's, 1 bar and 1 mol/L."""
    known = {(state.form, state.value): state for state in (_BAR, MOLAR)}
    known.pop((own.form, own.value), None)
    return (own, *known.values())


_BAR = StandardState("pressure", BAR_PA, "1 bar")


def _inputs(study: Study, measured: Measured | None) -> tuple[InputFile, ...]:
    """Return the study file, the measurements, and every file that the species stand on, each once."""
    first = [study.path] if measured is None else [study.path, measured.file]
    found = {str(path): InputFile(str(path), _digest(path)) for path in first}
    for name in _files(study):
        calculation = study.calculations.get(name)
        if name in found:
            continue
        if calculation is None:
            found[name] = InputFile(name, _digest(Path(name)))
            continue
        level = "/".join(part for part in (calculation.method, calculation.basis) if part)
        found[name] = InputFile(
            name,
            calculation.sha256,
            calculation.program,
            calculation.program_version,
            level or None,
        )
    return tuple(found.values())


def _files(study: Study) -> Iterator[str]:
    for name, model in study.species.items():
        yield from model.files
        if name in study.energies:
            yield from study.energies[name].files


def _digest(path: Path) -> str:
    with path.open("rb") as stream:
        return hashlib.file_digest(stream, "sha256").hexdigest()
