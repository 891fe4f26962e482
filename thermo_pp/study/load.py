"""Loading a study: from the TOML file and its outputs to species, steps and conditions."""

from __future__ import annotations

import os
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, replace
from pathlib import Path
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

from thermo_pp.conditions import Conditions, Treatment
from thermo_pp.errors import Finding, StudyError
from thermo_pp.functions.formation import FormationQuestion
from thermo_pp.kinetics.doubt.uncertain import Uncertainty
from thermo_pp.mechanism import Mechanism, check_mechanism, check_names
from thermo_pp.names import Duplicates, PolynomialForm
from thermo_pp.records import Calculation
from thermo_pp.rich import shown
from thermo_pp.species import ElectronicEnergy, SpeciesModel
from thermo_pp.study.asked import make_question
from thermo_pp.study.changes import changed_data
from thermo_pp.study.check import check_keys, missing
from thermo_pp.study.crossings import crossing_points
from thermo_pp.study.energies import check_levels, known_level
from thermo_pp.study.formation import make_formation
from thermo_pp.study.labels import Labels, labelled, make_labels
from thermo_pp.study.members import make_species
from thermo_pp.study.network_checks import check_electrons, check_network
from thermo_pp.study.origin import Origin, is_read, with_keys
from thermo_pp.study.questions import make_regimes, make_selectivity
from thermo_pp.study.reactions import anchor_species
from thermo_pp.study.reading import read_data, table_of
from thermo_pp.study.steps import make_steps
from thermo_pp.study.surroundings import make_conditions
from thermo_pp.study.treatment import make_treatment
from thermo_pp.study.uncertainty import check_unused, make_uncertainty
from thermo_pp.study.values import given

if TYPE_CHECKING:
    import pandas as pd

    from thermo_pp.functions.curves import Functions
    from thermo_pp.functions.fits import Fit
    from thermo_pp.functions.formation import Formations
    from thermo_pp.kinetics.courses import Transient
    from thermo_pp.kinetics.doubt.results import Doubt
    from thermo_pp.kinetics.flow import FlowState
    from thermo_pp.kinetics.isotope_effects import IsotopeEffects
    from thermo_pp.kinetics.product_ratio import Selectivity, SelectivityQuestion
    from thermo_pp.kinetics.regime_map import RegimeQuestion, Regimes
    from thermo_pp.kinetics.results import EffectiveRate
    from thermo_pp.measured.results import Comparison
    from thermo_pp.measured.rows import Measurements
    from thermo_pp.profile import Profile
    from thermo_pp.study.choices import Choices


@dataclass(frozen=True, eq=False)
class Study:
    """A study, loaded and checked.

    Attributes
    ----------
    title : str
    path : Path
        The study file, as it was named.
    treatment : Treatment
        The study's own; a species may have its own standard state and its own word on imaginary
        modes.
    conditions : Conditions
    mechanism : Mechanism
    species : mapping of str to SpeciesModel
        Saddle points included, in the order of the file.
    levels : tuple of str
        The levels of theory in words.
    findings : tuple of Finding
        Of the outputs, of the pairs of frequency job and single point, of the levels of theory and
        of the mechanism.
    labels : mapping of str to mapping
        The sets of isotopes of ``[isotopologues]``.
    level : str or None
        The named level of theory that the energies are of; None: the species' own energies.
    level_names : tuple of str
        The named levels of theory of the file: alternatives, for `at_level`.
    energies : mapping of str to ElectronicEnergy
        Part by part, of every structure that is read.
    uncertainty : Uncertainty or None
        How sure the energies are; None without ``[doubt]``.
    with_alternatives : bool
        Whether `doubt` shows other levels and choices beside.
    formation_question : FormationQuestion or None
        Of ``[formation]``.
    duplicates : {"count", "once"}
        How a conformer counts that is there twice.
    regime_question : RegimeQuestion or None
        Of ``[regimes]``.
    selectivity_question : SelectivityQuestion or None
        Of ``[selectivity]``.
    """

    title: str
    path: Path
    treatment: Treatment
    conditions: Conditions
    mechanism: Mechanism
    species: Mapping[str, SpeciesModel]
    levels: tuple[str, ...] = ()
    findings: tuple[Finding, ...] = field(default=())
    labels: Mapping[str, Labels] = field(default_factory=dict)
    level: str | None = None
    level_names: tuple[str, ...] = ()
    energies: Mapping[str, ElectronicEnergy] = field(default_factory=dict)
    formation_question: FormationQuestion | None = None
    duplicates: Duplicates = "count"
    regime_question: RegimeQuestion | None = None
    selectivity_question: SelectivityQuestion | None = None
    uncertainty: Uncertainty | None = None
    with_alternatives: bool = False
    _origin: Origin | None = field(default=None, repr=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "species", MappingProxyType(dict(self.species)))
        object.__setattr__(self, "energies", MappingProxyType(dict(self.energies)))

    @classmethod
    def load(
        cls,
        path: str | os.PathLike[str],
        *,
        temperatures: Iterable[Any] | None = None,
        treatment: Mapping[str, Any] | None = None,
        level: str | None = None,
    ) -> Study:
        """Read a study file and every output that it names.

        Parameters
        ----------
        path : str or PathLike
        temperatures : iterable or None
            In place of the file's, K or texts with a unit.
        treatment : mapping or None
            Keys of ``[treatment]`` in place of the file's: ``{"low_modes": "harmonic"}``.
        level : str or None
            A named level of theory in place of the file's energies.

        Raises
        ------
        StudyError
            Whatever is wrong with the file, named with its key; see ``docs/study-file.md``.
        ReadError
            An output that cannot be read as what it claims to be.
        """
        file = os.fspath(path)
        data = read_data(file, treatment)
        origin = Origin(data, file, None if temperatures is None else tuple(temperatures), {})
        return cls._made(origin, level)

    @classmethod
    def _made(cls, origin: Origin, level: str | None) -> Study:
        """Make a study of what was read, at a named level or, with None, as the file has it."""
        file, temperatures = origin.file, origin.temperatures
        keys = check_keys(origin.data, file)
        if not keys.steps and given(keys.formation) is None:
            raise missing("steps", file)
        own = make_treatment(keys.treatment, file)
        steps = make_steps(keys.steps, keys.treatment, file, keys.outputs)
        saddles = {step.through for step in steps if step.through is not None}
        formation = given(keys.formation)
        if formation is not None:
            formation = make_formation(formation, keys.species, saddles, file)
        elsewhere = () if formation is None else formation.names
        check_names(steps, keys.species, where=file, elsewhere=elsewhere)
        question = make_question(keys, steps, file)
        conditions = make_conditions(keys.conditions, steps, own.phase, temperatures, file)
        check_levels(keys, file)
        if level is None:
            level = keys.level if isinstance(keys.level, str) else None
        else:
            known_level(keys, level, file)
        members = make_species(
            keys,
            own,
            saddles,
            file,
            crossings=crossing_points(keys.steps, file),
            level=level,
            read=origin.read,
            lowest_only=origin.lowest_only,
        )
        species, measured = anchor_species(keys.steps, steps, members.species, own.phase, file)
        used = {name for step in steps for name in step.species} | saddles
        in_steps = {name: model for name, model in species.items() if name in used}
        mechanism = Mechanism(
            steps,
            {name: model.composition for name, model in in_steps.items()},
            charge={name: model.charge for name, model in in_steps.items()},
            where=file,
            **question,
        )
        check_electrons(conditions, mechanism)
        findings = [*members.findings, *measured, *check_mechanism(mechanism)]
        findings += check_network(mechanism, conditions)
        doubt = given(keys.doubt)
        if doubt is None:
            check_unused(keys.species, file)
            uncertainty = None
        else:
            uncertainty = make_uncertainty(doubt, keys.species, steps, file)
        return cls(
            title=keys.title if isinstance(keys.title, str) else Path(file).stem,
            path=Path(file),
            treatment=own,
            conditions=conditions,
            mechanism=mechanism,
            species=species,
            levels=members.levels,
            findings=tuple(dict.fromkeys(findings)),
            labels=make_labels(keys.isotopologues, species, file),
            level=level,
            level_names=tuple(keys.levels),
            energies=members.energies,
            formation_question=formation,
            duplicates=keys.treatment.duplicates,
            regime_question=make_regimes(keys, conditions, file),
            selectivity_question=make_selectivity(keys, mechanism, file),
            uncertainty=uncertainty,
            with_alternatives=doubt is not None and doubt.alternatives,
            _origin=origin,
        )

    def at_level(self, level: str) -> Study:
        """Return the same study with the energies of a named level of theory.

        Outputs that were read for this study are not read again.

        Raises
        ------
        StudyError
            No such level, or whatever is wrong with its energies.
        """
        if self._origin is None:
            raise ValueError("a study that was not loaded from a file has no named levels")
        return self._made(self._origin, level)

    @property
    def read_species(self) -> tuple[str, ...]:
        """The species that stand on outputs of their own."""
        tables = {} if self._origin is None else self._origin.data["species"]
        return tuple(name for name, keys in tables.items() if is_read(keys))

    @property
    def calculations(self) -> Mapping[str, Calculation]:
        """The outputs that the species stand on, by the name under which a species has them."""
        read = {} if self._origin is None else self._origin.read  # those of other levels too
        files = {file for model in self.species.values() for file in model.files}
        return MappingProxyType({name: read[name] for name in read if name in files})

    @property
    def tables(self) -> Mapping[str, Any]:
        """The tables of the study file with the options in them; empty where there is no file."""
        return MappingProxyType({} if self._origin is None else dict(self._origin.data))

    def altered(
        self,
        treatment: Mapping[str, Any],
        species: Mapping[str, Mapping[str, Any]],
        *,
        steps: Mapping[int, Mapping[str, Any]] | None = None,
        level: str | None = None,
        lowest_only: bool = False,
    ) -> Study:
        """Return the study with other keys, checked like those of the file; no output is read again.

        Parameters
        ----------
        treatment : mapping
            Keys of ``[treatment]`` in place of the study's; None takes a key out, here and below.
        species : mapping of str to mapping
            Keys of species in place of the study's.
        steps : mapping of int to mapping or None
            Keys of steps, which are numbered from 0.
        level : str or None
            A named level of theory in place of the study's energies; its outputs are read.
        lowest_only : bool
            Of several conformers, the one of least electronic and zero-point energy alone.

        Raises
        ------
        StudyError
            As `load`.
        """
        if self._origin is None:
            raise ValueError("a study that was not loaded from a file has no keys to change")
        data = dict(self._origin.data)
        data["treatment"] = with_keys(table_of(data, "treatment"), treatment)
        data["species"] = dict(data["species"])
        for name, keys in species.items():
            data["species"][name] = with_keys(data["species"][name], keys)
        data["steps"] = list(data.get("steps", ()))
        for number, keys in (steps or {}).items():
            data["steps"][number] = with_keys(data["steps"][number], keys)
        only = self._origin.lowest_only or lowest_only
        origin = replace(self._origin, data=data, lowest_only=only)
        return self._made(origin, level or self.level)

    def changed(self, changes: Mapping[str, Any]) -> Study:
        """Return the study with other values at dotted keys of its file; no output is read again.

        Parameters
        ----------
        changes : mapping of str to object
            ``{"conditions.held.W": "1e-3 mol/L"}``; see `thermo_pp.study.changes`.

        Raises
        ------
        StudyError
            As `load`; a key that no study file has.
        """
        origin = self._changed_origin(changes)
        return self._made(origin, None if "level" in changes else self.level)

    def check_changes(self, changes: Mapping[str, Any]) -> None:
        """Check the keys of changes, not their values; StudyError where one is wrong."""
        self._changed_origin(changes)

    def _changed_origin(self, changes: Mapping[str, Any]) -> Origin:
        if self._origin is None:
            raise ValueError("a study that was not loaded from a file has no keys to change")
        if self._origin.temperatures is not None and any(
            key.startswith("conditions.temperatures") for key in changes
        ):
            raise StudyError(
                "the temperatures are given twice: as an option and as what changes",
                where=self._origin.file,
                mend="take one of the two away",
            )
        data = changed_data(self._origin.data, changes, self._origin.file)
        return replace(self._origin, data=data)

    def recipe(self) -> tuple[Any, ...]:
        """Return what `from_recipe` makes this study of in another process, what was read included."""
        if self._origin is None:
            raise ValueError("a study that was not loaded from a file cannot be made again")
        origin = self._origin
        made_of = (origin.data, origin.file, origin.temperatures, dict(origin.read))
        return *made_of, origin.lowest_only, self.level

    @classmethod
    def from_recipe(cls, recipe: tuple[Any, ...]) -> Study:
        """Make a study of what `recipe` of another one returned."""
        *origin, level = recipe
        return cls._made(Origin(*origin), level)

    def table(self) -> pd.DataFrame:
        """Return one row a species, as plain values.

        Columns: ``species, kind, composition, charge, energy_hartree`` (None where it is declared or has
        conformers), ``files``.
        """
        import pandas as pd

        return pd.DataFrame(
            {
                "species": name,
                "kind": model.kind,
                "composition": " ".join(f"{el}{n}" for el, n in model.composition.items()),
                "charge": model.charge,
                "energy_hartree": energy.value_hartree
                if (energy := self.energies.get(name)) is not None
                else None,
                "files": ", ".join(model.files),
            }
            for name, model in self.species.items()
        )

    def _repr_html_(self) -> str:
        return shown(self.table())

    def choices(self, **options: Any) -> Choices:
        """Return what each choice is worth; see `thermo_pp.study.choices.choices`."""
        from thermo_pp.study.choices import choices

        return choices(self, **options)

    def functions(self) -> tuple[Functions, ...]:
        """Return the thermodynamic functions of every species, saddle points included."""
        from thermo_pp.functions.curves import functions

        t = self.conditions.temperature_k
        return tuple(functions(model, t) for model in self.species.values())

    def fits(
        self, form: PolynomialForm, bounds_k: tuple[float, float, float] | None = None
    ) -> tuple[Fit, ...]:
        """Return a polynomial of every species; see `thermo_pp.functions.fits.fit`."""
        from thermo_pp.functions.fits import DEFAULT_BOUNDS_K, fit

        bounds = bounds_k or DEFAULT_BOUNDS_K
        return tuple(fit(model, form, bounds) for model in self.species.values())

    def formation(self) -> Formations | None:
        """Return the enthalpies of formation, None where the study asks for none."""
        from thermo_pp.functions.formation import formations

        question = self.formation_question
        return None if question is None else formations(question, self.species)

    def profile(self, **options: Any) -> Profile:
        """Return relative H, S and G of every state; see `thermo_pp.profile.profile`."""
        from thermo_pp.profile import profile

        return profile(self, **options)

    def effective(self, **options: Any) -> EffectiveRate:
        """Return the effective rate; see `thermo_pp.kinetics.effective.effective`."""
        from thermo_pp.kinetics.effective import effective

        return effective(self, **options)

    def compare(
        self,
        measured: str | os.PathLike[str] | Measurements,
        *,
        deviation: Any = None,
        saddle_deviation: Any = None,
        rivals: Iterable[Study] = (),
    ) -> Comparison:
        """Set the study against measured rate constants.

        Parameters
        ----------
        measured : str, PathLike or Measurements
            A CSV file; ``docs/cli.md`` (compare) describes its columns.
        deviation, saddle_deviation : float, text or None
            Standard deviations of the electronic energies of species and of saddle points, kJ/mol
            or a text with a unit. With one alone: `deviation` counts for saddle points too,
            `saddle_deviation` leaves the others exactly known. With neither, those of ``[doubt]``.
        rivals : iterable of Study
            Ranked with this one by the likelihood of the measurements.

        Raises
        ------
        StudyError
            A row that cannot be read or set against this study, a deviation that is not above 0.
        """
        from thermo_pp.measured.comparison import compare
        from thermo_pp.measured.deviations import make_deviations
        from thermo_pp.measured.read import read_measurements
        from thermo_pp.measured.rows import Measurements

        rows = measured if isinstance(measured, Measurements) else read_measurements(measured)
        others: dict[str, Study] = {}
        for rival in rivals:
            name = str(rival.path)
            if name in others or name == str(self.path):
                raise StudyError(
                    f"the rival {name} is the study itself or stands twice",
                    where="--rival",
                    mend="name each study once",
                )
            others[name] = rival
        return compare(self, rows, make_deviations(deviation, saddle_deviation), others)

    def regimes(self, question: RegimeQuestion | None = None) -> Regimes | None:
        """Return the map of regimes that `question`, else ``[regimes]``, asks for; None where neither does."""
        from thermo_pp.kinetics.regimes import regimes

        asked = question or self.regime_question
        return None if asked is None else regimes(self, asked)

    def selectivity(self, effective: EffectiveRate | None = None) -> Selectivity | None:
        """Return how products compete, None where there is one and ``[selectivity]`` asks nothing.

        `effective` is the study's effective rate where it is known already.
        """
        from thermo_pp.kinetics.selectivity import selectivity

        return selectivity(self, effective or self.effective(), self.selectivity_question)

    def doubt(self) -> Doubt:
        """Return how sure the answers are; see `thermo_pp.kinetics.doubt.assess.assess`.

        Raises
        ------
        StudyError
            The study has no ``[doubt]``; held species in balance only as the energies are.
        """
        from thermo_pp.kinetics.doubt.assess import assess
        from thermo_pp.study.alternatives import alternative_answers

        if self.uncertainty is None:
            raise StudyError(
                "the study does not say how sure its energies are",
                where=f"{self.path} [doubt]",
                mend='write [doubt] and, for instance, deviation = "4 kJ/mol"',
            )
        beside = alternative_answers(self) if self.with_alternatives else ((), ())
        return assess(self, self.uncertainty, *beside)

    def isotope_effects(self) -> tuple[IsotopeEffects, ...]:
        """Return the isotope effects of every set in ``[isotopologues]``.

        Raises
        ------
        StudyError
            The study has none; a step in which isotopes appear or vanish.
        """
        from thermo_pp.kinetics.isotope_effects import isotope_effects

        file = str(self.path)
        if not self.labels:
            raise StudyError(
                "the study says no isotopes to compare with",
                where=f"{file} [isotopologues]",
                mend='write for instance [isotopologues.D] and all = { H = "D" }',
            )
        return tuple(
            isotope_effects(
                self,
                label,
                labelled(label, labels, self.species, file),
                where=f"{file} [isotopologues.{label}]",
            )
            for label, labels in self.labels.items()
        )

    def transient(self, **options: Any) -> Transient:
        """Return the time courses; see `thermo_pp.kinetics.transient.transient`."""
        from thermo_pp.kinetics.transient import transient

        asked = self.selectivity_question
        return transient(self, products=() if asked is None else asked.products, **options)

    def flow(self, **options: Any) -> FlowState:
        """Return the steady states of the flow; see `thermo_pp.kinetics.flow.flow`."""
        from thermo_pp.kinetics.flow import flow

        return flow(self, **options)
