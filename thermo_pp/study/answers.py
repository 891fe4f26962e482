"""What a study answers: everything that a report shows, each None where it does not apply."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import TYPE_CHECKING

import numpy as np

from thermo_pp.errors import Finding
from thermo_pp.names import LowModes
from thermo_pp.profile import Choice, Profile
from thermo_pp.species import Thermochemistry
from thermo_pp.study.key_lines import DeclaredNumber

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from thermo_pp.ensemble import Ensembles
    from thermo_pp.functions.curves import Functions
    from thermo_pp.functions.formation import Formations
    from thermo_pp.functions.phase import GasPhase
    from thermo_pp.kinetics.courses import Transient
    from thermo_pp.kinetics.doubt.results import Doubt
    from thermo_pp.kinetics.flow import FlowState
    from thermo_pp.kinetics.isotope_effects import IsotopeEffects
    from thermo_pp.kinetics.product_ratio import Selectivity
    from thermo_pp.kinetics.regime_map import Regimes
    from thermo_pp.kinetics.results import EffectiveRate
    from thermo_pp.measured.results import Comparison
    from thermo_pp.study.choices import Choices
    from thermo_pp.study.load import Study


@dataclass(frozen=True)
class InputFile:
    """One file that the answers stand on.

    Attributes
    ----------
    path : str
        As it was named.
    sha256 : str
        Of its bytes.
    program, program_version : str or None
        What made it; None for the study file and for tables of numbers.
    level : str or None
        Method and basis set.
    """

    path: str
    sha256: str
    program: str | None = None
    program_version: str | None = None
    level: str | None = None


@dataclass(frozen=True, eq=False)
class SpeciesAnswer:
    """H, S and G of one species over the study's temperatures, with the study's own treatment.

    Attributes
    ----------
    result : Thermochemistry
    functions : Functions
    low_mode_spread_kj_mol : shape (t,)
        Largest less smallest G over the four soft-mode treatments.
    """

    result: Thermochemistry
    functions: Functions
    low_mode_spread_kj_mol: NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Answers:
    """Everything that a report of a study shows.

    A part that does not apply is None (or an empty mapping), and `left_out` says why.

    Attributes
    ----------
    study : Study
    species : mapping of str to SpeciesAnswer
        Saddle points included, in the order of the study.
    profiles : mapping of (low_modes, standard state) to Profile
        All soft-mode treatments with the study's standard state, 1 bar and 1 mol/L.
    own : (low_modes, standard state)
        The study's own choice, a key of `profiles`.
    profile_at_conditions : Profile or None
        With the study's own treatment, held species at their concentrations.
    effective : EffectiveRate or None
    effective_by_treatment : mapping of str to EffectiveRate
        By soft-mode treatment, the study's own included.
    selectivity : Selectivity or None
    regimes : Regimes or None
        As ``[regimes]`` asks, else over a hundredth to a hundred times the first amount that is held.
    doubt : Doubt or None
        Where the study has ``[doubt]``.
    transient : Transient or None
    flow : FlowState or None
    isotopes : tuple of IsotopeEffects
    choices : Choices or None
    comparison : Comparison or None
        With the measured rate constants that were named.
    ensembles : Ensembles or None
        The species that consist of conformers.
    formation : Formations or None
    phase : GasPhase or None
        The minima as a gas, fitted by NASA polynomials.
    inputs : tuple of InputFile
        The study file first.
    declared : tuple of DeclaredNumber
        Every number of the study file.
    left_out : mapping of str to str
        Part -> why it is not there.
    findings : tuple of Finding
        Of all parts.
    """

    study: Study
    species: Mapping[str, SpeciesAnswer]
    profiles: Mapping[Choice, Profile]
    own: Choice
    profile_at_conditions: Profile | None
    effective: EffectiveRate | None
    effective_by_treatment: Mapping[LowModes, EffectiveRate]
    selectivity: Selectivity | None
    regimes: Regimes | None
    doubt: Doubt | None
    transient: Transient | None
    flow: FlowState | None
    isotopes: tuple[IsotopeEffects, ...]
    choices: Choices | None
    comparison: Comparison | None
    ensembles: Ensembles | None
    formation: Formations | None
    phase: GasPhase | None
    inputs: tuple[InputFile, ...]
    declared: tuple[DeclaredNumber, ...]
    left_out: Mapping[str, str] = field(default_factory=dict)
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        for name in ("species", "profiles", "effective_by_treatment", "left_out"):
            object.__setattr__(self, name, MappingProxyType(dict(getattr(self, name))))

    @property
    def profile(self) -> Profile | None:
        """The profile as the study has it."""
        return self.profiles.get(self.own)
