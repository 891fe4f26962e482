"""The profile: every state along the paths of a mechanism, relative to one of them."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Literal, Protocol

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import Conditions, StandardState, Treatment
from thermo_pp.errors import Finding, StudyError
from thermo_pp.loops import equilibrium_of
from thermo_pp.mechanism import Mechanism, parse_equation, write_sum
from thermo_pp.names import LOW_MODES, Kind, LowModes
from thermo_pp.paths import Path, filled_up, find_paths
from thermo_pp.paths import State as Place
from thermo_pp.rich import shown
from thermo_pp.species import SpeciesModel, Thermochemistry
from thermo_pp.units import GAS_J_MOL_K

if TYPE_CHECKING:
    import pandas as pd

FloatArray = NDArray[np.float64]
_Thermo = Mapping[str, Mapping[LowModes, Thermochemistry]]


@dataclass(frozen=True, eq=False)
class State:
    """One state of a path, relative to the reference state.

    Attributes
    ----------
    path : str
        Name of the path.
    state : str
        ``"SO3 + 2 W"``, or the saddle point with what stands beside it.
    kind : {"minimum", "saddle"}
    species : tuple of (str, int)
        What the state is made of.
    enthalpy_kj_mol, entropy_j_mol_k, gibbs_kj_mol : shape (t,)
    electronic_kj_mol, zero_point_kj_mol : float or None
        None where a member is declared.
    low_mode_spread_kj_mol : shape (t,)
        Largest less smallest relative G over the four soft-mode treatments.
    """

    path: str
    state: str
    kind: Kind
    species: tuple[tuple[str, int], ...]
    enthalpy_kj_mol: FloatArray
    entropy_j_mol_k: FloatArray
    gibbs_kj_mol: FloatArray
    electronic_kj_mol: float | None
    zero_point_kj_mol: float | None
    low_mode_spread_kj_mol: FloatArray

    def __post_init__(self) -> None:
        for array in (
            self.enthalpy_kj_mol,
            self.entropy_j_mol_k,
            self.gibbs_kj_mol,
            self.low_mode_spread_kj_mol,
        ):
            array.flags.writeable = False


@dataclass(frozen=True, eq=False)
class Profile:
    """The states of every path over temperature.

    Attributes
    ----------
    temperature_k : shape (t,)
    reference : str
        The state at zero.
    at : {"standard state", "conditions"}
    standard_state : str
    net_reactions : mapping of str to str
        Path -> net reaction.
    states : tuple of State
    findings : tuple of Finding
    """

    temperature_k: FloatArray
    reference: str
    at: Literal["standard state", "conditions"]
    standard_state: str
    net_reactions: dict[str, str]
    states: tuple[State, ...]
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        self.temperature_k.flags.writeable = False

    def table(self) -> pd.DataFrame:
        """Return one row a state and temperature, as plain numbers."""
        import pandas as pd

        rows: list[dict[str, Any]] = []
        for state in self.states:
            for k, temperature in enumerate(self.temperature_k):
                rows.append(
                    {
                        "path": state.path,
                        "state": state.state,
                        "kind": state.kind,
                        "temperature_k": temperature,
                        "electronic_kj_mol": state.electronic_kj_mol,
                        "zero_point_kj_mol": state.zero_point_kj_mol,
                        "enthalpy_kj_mol": state.enthalpy_kj_mol[k],
                        "entropy_j_mol_k": state.entropy_j_mol_k[k],
                        "gibbs_kj_mol": state.gibbs_kj_mol[k],
                        "low_mode_spread_kj_mol": state.low_mode_spread_kj_mol[k],
                    }
                )
        return pd.DataFrame(rows)

    def _repr_html_(self) -> str:
        return shown(self.table())


class StudyLike(Protocol):
    """What a profile needs of a study."""

    @property
    def treatment(self) -> Treatment: ...  # noqa: D102
    @property
    def conditions(self) -> Conditions: ...  # noqa: D102
    @property
    def mechanism(self) -> Mechanism: ...  # noqa: D102
    @property
    def species(self) -> Mapping[str, SpeciesModel]: ...  # noqa: D102


@dataclass(frozen=True, eq=False)
class _Sum:
    """Thermochemistry of a sum of species; shape (t,) but for the two energies."""

    enthalpy: FloatArray
    entropy: FloatArray
    gibbs: FloatArray
    by_treatment: FloatArray  # G, shape (treatments, t)
    electronic: float | None
    zero_point: float | None


def profile(
    study: StudyLike, *, reference: str | None = None, at_conditions: bool = False
) -> Profile:
    """Return every state along the paths of a study, relative to one of them.

    Parameters
    ----------
    study : Study
    reference : str or None
        A state as the profile names it, ``"SO3 + 2 W"``; the first state of the first path unless given.
    at_conditions : bool
        G and S of held species at their concentrations instead of in their standard states.

    Raises
    ------
    StudyError
        No path, or a reference that is no state of any path.
    """
    route = _route(study, reference)
    activities = _log_activities(study, route.temperature_k) if at_conditions else {}
    own = study.treatment
    thermo = _thermochemistry(study, route, own.standard_state)
    at: Literal["standard state", "conditions"] = (
        "conditions" if at_conditions else "standard state"
    )
    return _profile(route, thermo, activities, own.low_modes, own.standard_state, at)


Choice = tuple[LowModes, str]
"""Soft-mode treatment and standard state, as a profile is asked for with them."""


def profiles(study: StudyLike, standard_states: Sequence[StandardState]) -> dict[Choice, Profile]:
    """Return the profile with every soft-mode treatment and each of the standard states.

    What the study says of species and steps stays as it is: energies are shown in another standard
    state, and a species with a standard state of its own keeps it.

    Parameters
    ----------
    study : Study
    standard_states : sequence of StandardState

    Returns
    -------
    dict of (low_modes, text of the standard state) to Profile
        Standard states in the order given, the treatments of each together.

    Raises
    ------
    StudyError
        As `profile`.
    """
    route = _route(study, None)
    found: dict[Choice, Profile] = {}
    for state in standard_states:
        thermo = _thermochemistry(study, route, state)
        for low in LOW_MODES:
            found[low, state.text] = _profile(route, thermo, {}, low, state, "standard state")
    return found


@dataclass(frozen=True, eq=False)
class _Route:
    """Paths and their reference; nothing of it depends on the treatment."""

    temperature_k: FloatArray
    mechanism: Mechanism
    paths: tuple[Path, ...]
    zero: Place
    findings: tuple[Finding, ...]


def _route(study: StudyLike, reference: str | None) -> _Route:
    mechanism, conditions = study.mechanism, study.conditions
    found, findings = find_paths(mechanism, conditions.held)
    paths = filled_up(found, mechanism, conditions.held)
    t = np.array(conditions.temperature_k)
    return _Route(t, mechanism, paths, _find_reference(paths, reference, mechanism), findings)


def _thermochemistry(study: StudyLike, route: _Route, state: StandardState) -> _Thermo:
    """Return every species of the paths with every treatment, in a standard state or in its own."""
    names = {
        name: None for path in route.paths for place in path.states for name, _ in place.species
    }
    t, common = route.temperature_k, study.treatment.standard_state
    found: dict[str, dict[LowModes, Thermochemistry]] = {}
    for name in names:
        model = study.species[name]
        its_own = model.at(t[:1]).standard_state != common
        shown = None if its_own or state == common else state
        found[name] = {low: model.at(t, low_modes=low, standard_state=shown) for low in LOW_MODES}
    return found


def _profile(
    route: _Route,
    thermo: _Thermo,
    activities: Mapping[str, FloatArray],
    low_modes: LowModes,
    standard_state: StandardState,
    at: Literal["standard state", "conditions"],
) -> Profile:
    t, zero, mechanism = route.temperature_k, route.zero, route.mechanism
    states: list[State] = []
    notes = list(route.findings)
    for path in route.paths:
        start = zero
        if mechanism.content(dict(zero.species)) != mechanism.content(dict(path.states[0].species)):
            start = path.states[0]
            notes.append(_other_reference(path, zero, mechanism))
        base = _sum(start, thermo, activities, t, low_modes)
        states += [
            _state(path, place, _sum(place, thermo, activities, t, low_modes), base)
            for place in path.states
        ]
    return Profile(
        temperature_k=t.copy(),
        reference=zero.name,
        at=at,
        standard_state=standard_state.text,
        net_reactions={path.name: path.net_reaction for path in route.paths},
        states=tuple(states),
        findings=tuple(notes),
    )


def _find_reference(paths: Sequence[Path], wanted: str | None, mechanism: Mechanism) -> Place:
    if wanted is None:
        return paths[0].states[0]
    where = f"{mechanism.where}, reference {wanted!r}"
    known = {place.name: place for path in paths for place in path.states}
    mend = "choose one of: " + ", ".join(known)
    try:
        counts, _ = parse_equation(f"{wanted} = {wanted}", where=where)
    except StudyError:
        raise StudyError(f"{wanted!r} is no sum of species", where=where, mend=mend) from None
    for place in known.values():
        if dict(place.species) == counts:
            return place
    raise StudyError(f"{write_sum(counts)} is no state of the profile", where=where, mend=mend)


def _other_reference(path: Path, zero: Place, mechanism: Mechanism) -> Finding:
    return Finding(
        "other-composition",
        "note",
        mechanism.where,
        None,
        f"path {path.name} has another composition than {zero.name}, so it is shown relative to its "
        f"own first state, {path.states[0].name}",
        "choose a reference of that path, or hold the species that it lacks",
    )


def _log_activities(study: StudyLike, t: FloatArray) -> dict[str, FloatArray]:
    """Return ln a of every held species in its own standard state, shape (t,)."""
    held = study.conditions.held
    molar: dict[str, FloatArray] = {}  # chemical potential over RT
    own: dict[str, FloatArray] = {}
    found: dict[str, FloatArray] = {}
    for name in held:
        thermo = study.species[name].at(t)
        own[name] = thermo.gibbs_kj_mol * 1000.0 / (GAS_J_MOL_K * t)
        if held[name].form != "equilibrium":
            in_bar = held[name].concentration_mol_l(t) * 0.01 * GAS_J_MOL_K * t
            found[name] = np.log(in_bar) - thermo.standard_state.log_ratio_to_bar(t)
            molar[name] = own[name] + found[name]
    follows = equilibrium_of(study.mechanism, held, driven=study.conditions.driven)
    for name, members in follows.items():
        potential = sum((float(share) * molar[m] for m, share in members.items()), np.zeros(len(t)))
        found[name] = potential - own[name]
    return found


def _sum(
    place: Place,
    thermo: _Thermo,
    activities: Mapping[str, FloatArray],
    t: FloatArray,
    low_modes: LowModes,
) -> _Sum:
    enthalpy, entropy = np.zeros(len(t)), np.zeros(len(t))
    gibbs = np.zeros((len(LOW_MODES), len(t)))
    electronic: float | None = 0.0
    zero_point: float | None = 0.0
    for name, count in place.species:
        own = thermo[name][low_modes]
        log_activity = activities.get(name, np.zeros(len(t)))
        enthalpy += count * own.enthalpy_kj_mol
        entropy += count * (own.entropy_j_mol_k - GAS_J_MOL_K * log_activity)
        for row, low in enumerate(LOW_MODES):
            one = thermo[name][low].gibbs_kj_mol + GAS_J_MOL_K * t * log_activity / 1000.0
            gibbs[row] += count * one
        electronic = _plus(electronic, count, own.electronic_kj_mol)
        zero_point = _plus(zero_point, count, own.zero_point_kj_mol)
    row = LOW_MODES.index(low_modes)
    return _Sum(enthalpy, entropy, gibbs[row], gibbs, electronic, zero_point)


def _plus(total: float | None, count: int, value: float | None) -> float | None:
    return None if total is None or value is None else total + count * value


def _state(path: Path, place: Place, here: _Sum, base: _Sum) -> State:
    by_treatment = here.by_treatment - base.by_treatment
    electronic, zero_point = (
        None if a is None or b is None else a - b
        for a, b in ((here.electronic, base.electronic), (here.zero_point, base.zero_point))
    )
    return State(
        path=path.name,
        state=place.name,
        kind=place.kind,
        species=place.species,
        enthalpy_kj_mol=here.enthalpy - base.enthalpy,
        entropy_j_mol_k=here.entropy - base.entropy,
        gibbs_kj_mol=here.gibbs - base.gibbs,
        electronic_kj_mol=electronic,
        zero_point_kj_mol=zero_point,
        low_mode_spread_kj_mol=by_treatment.max(axis=0) - by_treatment.min(axis=0),
    )
