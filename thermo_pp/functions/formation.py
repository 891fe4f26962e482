"""Enthalpies of formation, from computed reactions and reference values, uncertainty carried."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Literal

import numpy as np

from thermo_pp.data.atoms import ATOMS
from thermo_pp.errors import Finding, StudyError
from thermo_pp.formulas.partition import electronic
from thermo_pp.mechanism import write_reaction
from thermo_pp.names import DEFAULT_TEMPERATURE_K
from thermo_pp.rich import shown
from thermo_pp.species import SpeciesModel
from thermo_pp.units import GAS_J_MOL_K, WAVENUMBER_KJ_MOL

if TYPE_CHECKING:
    import pandas as pd

SPIN_ORBIT_KJ_MOL = 0.05
"""Splitting of an atom's ground term below this is not worth a finding."""


@dataclass(frozen=True)
class Reference:
    """A known enthalpy of formation.

    Attributes
    ----------
    enthalpy_kj_mol : float
    uncertainty_kj_mol : float or None
        Standard uncertainty.
    temperature_k : float
        0 or 298.15.
    source : str
    """

    enthalpy_kj_mol: float
    uncertainty_kj_mol: float | None
    temperature_k: float
    source: str


@dataclass(frozen=True)
class Reaction:
    """A declared reaction: what it makes (positive) and uses, and where it stands."""

    change: Mapping[str, int]
    where: str


@dataclass(frozen=True)
class FormationQuestion:
    """What is asked of a study's enthalpies of formation: its ``[formation]``.

    Attributes
    ----------
    atoms : tuple of str
        Species that are atoms.
    atomization : tuple of str or None
        None: every neutral minimum that is read, made of the atoms and no isotopologue.
    reactions : tuple of Reaction
    references : mapping of str to Reference
    reaction_uncertainty_kj_mol : float or None
    spin_orbit : bool
    where : str
    isotopologues : tuple of str
        Species with isotopes of their own.
    """

    atoms: tuple[str, ...]
    atomization: tuple[str, ...] | None
    reactions: tuple[Reaction, ...]
    references: Mapping[str, Reference]
    reaction_uncertainty_kj_mol: float | None
    spin_orbit: bool
    where: str
    isotopologues: tuple[str, ...] = ()

    @property
    def names(self) -> tuple[str, ...]:
        """Every species that it names."""
        by_reaction = [name for reaction in self.reactions for name in reaction.change]
        named = (*self.atoms, *(self.atomization or ()), *by_reaction, *self.references)
        return tuple(dict.fromkeys(named))


@dataclass(frozen=True)
class Formation:
    """One derived enthalpy of formation.

    Attributes
    ----------
    name : str
    route : {"reaction", "atomization"}
    reaction : str
    reaction_kj_mol : float
        Computed enthalpy of the reaction at `reaction_temperature_k`.
    reaction_temperature_k : float
        298.15 where all references hold there, else 0.
    zero_kj_mol, room_kj_mol : float or None
        Enthalpy of formation at 0 K and 298.15 K; None where H(298.15 K) - H(0) of the species or
        of an element is not known.
    uncertainty_kj_mol : float or None
        Combined standard uncertainty; None where a reference has none.
    shares_kj_mol : mapping of str to float or None
        Reference -> its uncertainty times how often it counts, signed. Two results that share a
        reference are correlated through it: the uncertainty of their difference is that of the
        difference of their shares.
    """

    name: str
    route: Literal["reaction", "atomization"]
    reaction: str
    reaction_kj_mol: float
    reaction_temperature_k: float
    zero_kj_mol: float | None
    room_kj_mol: float | None
    uncertainty_kj_mol: float | None
    shares_kj_mol: Mapping[str, float | None]


@dataclass(frozen=True)
class Formations:
    """All derived enthalpies of formation of a study, and the references they rest on.

    Attributes
    ----------
    rows : tuple of Formation
        Of the declared reactions first, then by atomization.
    references : mapping of str to Reference
    room_kj_mol : mapping of str to float
        The enthalpy of formation at 298.15 K of each species: the reference, else the first row that
        has one.
    findings : tuple of Finding
    """

    rows: tuple[Formation, ...]
    references: Mapping[str, Reference]
    room_kj_mol: Mapping[str, float]
    findings: tuple[Finding, ...] = field(default=())

    def table(self) -> pd.DataFrame:
        """Return one row a result."""
        import pandas as pd

        return pd.DataFrame(
            {
                "species": [row.name for row in self.rows],
                "route": [row.route for row in self.rows],
                "reaction": [row.reaction for row in self.rows],
                "reaction_enthalpy_kj_mol": [row.reaction_kj_mol for row in self.rows],
                "reaction_temperature_k": [row.reaction_temperature_k for row in self.rows],
                "formation_0_kj_mol": [row.zero_kj_mol for row in self.rows],
                "formation_298_kj_mol": [row.room_kj_mol for row in self.rows],
                "uncertainty_kj_mol": [row.uncertainty_kj_mol for row in self.rows],
            }
        )

    def _repr_html_(self) -> str:
        return shown(self.table())


def formations(question: FormationQuestion, species: Mapping[str, SpeciesModel]) -> Formations:
    """Derive the enthalpies of formation that a study asks for.

    At 298.15 K where all references of a reaction hold there, else at 0 K. H(298.15 K) - H(0) of a
    tabulated atom is that of its measured ground term, whatever the atom was computed with. References are independent
    of each other; one that counts n times counts n times its uncertainty.

    Parameters
    ----------
    question : FormationQuestion
    species : mapping of str to SpeciesModel

    Raises
    ------
    StudyError
        A reaction that does not balance, none or several species without a reference in it, an atom
        that is none or that the table does not have, a species with another element or a charge by
        atomization, H(0) needed of a species that has none.
    """
    heats = {name: _Heat.of(species[name]) for name in question.names}
    references = dict(question.references)
    atoms: dict[str, str] = {}
    for name in question.atoms:
        element = _element(species[name], f"{question.where} atoms")
        if element in atoms:
            raise StudyError(
                f"{atoms[element]} and {name} are both the atom {element}",
                where=f"{question.where} atoms",
                mend="list one atom an element",
            )
        atoms[element] = name
        if name not in references:
            references[name] = _tabulated(element, question.where)
        heats[name] = heats[name].of_atom(element, question.spin_orbit)
    rows = []
    for reaction in question.reactions:
        _check_balance(reaction, species)
        lacking = [name for name in reaction.change if name not in references]
        if len(lacking) != 1:
            what = f"{' and '.join(lacking)} have" if lacking else "no species lacks"
            raise StudyError(
                f"{what} {'no' if lacking else 'a'} reference value in "
                f"{write_reaction(reaction.change)}",
                where=reaction.where,
                mend="let exactly one species of a reaction be without one in [formation] reference",
            )
        rows.append(
            _derived(lacking[0], "reaction", reaction, heats, references, question, species)
        )
    for name in _atomized(question, atoms, species, references):
        heats.setdefault(name, _Heat.of(species[name]))
        parts = {atoms[element]: count for element, count in species[name].composition.items()}
        split = Reaction({name: -1, **parts}, f"{question.where} atomization")
        rows.append(_derived(name, "atomization", split, heats, references, question, species))
    room = {}
    for name, known in references.items():
        heat, elements = heats[name], _elements_kj_mol(species[name])
        if known.temperature_k > 0.0:
            room[name] = known.enthalpy_kj_mol
        elif heat.rise is not None and elements is not None:
            room[name] = known.enthalpy_kj_mol + heat.rise - elements
    for row in rows:
        if row.room_kj_mol is not None:
            room.setdefault(row.name, row.room_kj_mol)
    return Formations(tuple(rows), references, room, _findings(question, atoms, rows))


@dataclass(frozen=True)
class _Heat:
    """Computed H(0), None where it is not known, and H(298.15 K), kJ/mol."""

    zero: float | None
    room: float

    @classmethod
    def of(cls, model: SpeciesModel) -> _Heat:
        here = model.at(DEFAULT_TEMPERATURE_K)
        known = here.electronic_kj_mol is not None and here.zero_point_kj_mol is not None
        zero = here.electronic_kj_mol + here.zero_point_kj_mol if known else None  # type: ignore[operator]
        return cls(zero, float(here.enthalpy_kj_mol[0]))

    @property
    def rise(self) -> float | None:
        """H(298.15 K) - H(0)."""
        return None if self.zero is None else self.room - self.zero

    def of_atom(self, element: str, spin_orbit: bool) -> _Heat:
        """Return those of an atom: with the rise that the levels of its ground term give."""
        if self.zero is None or element not in ATOMS:
            return self
        zero = self.zero - (_splitting_kj_mol(element) if spin_orbit else 0.0)
        return _Heat(zero, zero + atom_rise_kj_mol(element))


def _derived(
    name: str,
    route: Literal["reaction", "atomization"],
    reaction: Reaction,
    heats: Mapping[str, _Heat],
    references: Mapping[str, Reference],
    question: FormationQuestion,
    species: Mapping[str, SpeciesModel],
) -> Formation:
    """Solve one reaction for the enthalpy of formation of `name`."""
    others = {other: count for other, count in reaction.change.items() if other != name}
    own = reaction.change[name]
    warm = all(references[other].temperature_k > 0.0 for other in others)
    total = 0.0
    for other, count in reaction.change.items():
        value = heats[other].room if warm else heats[other].zero
        if value is None:
            raise StudyError(
                f"{other} has no H(0), which references at 0 K need",
                where=reaction.where,
                mend="give all references of this reaction at 298.15 K",
            )
        total += count * value
    known = 0.0
    shares: dict[str, float | None] = {}
    for other, count in others.items():
        reference = references[other]
        value = reference.enthalpy_kj_mol
        if not warm and reference.temperature_k > 0.0:
            value -= _above_elements(other, heats[other], species[other], reaction.where)
        known += count * value
        u = reference.uncertainty_kj_mol
        shares[other] = None if u is None else -count / own * u
    enthalpy = (total - known) / own
    elements, rise = _elements_kj_mol(species[name]), heats[name].rise
    change = None if elements is None or rise is None else rise - elements
    other_end = None if change is None else enthalpy - change if warm else enthalpy + change
    spread = [question.reaction_uncertainty_kj_mol or 0.0, *shares.values()]
    known_spread = [value for value in spread if value is not None]
    return Formation(
        name=name,
        route=route,
        reaction=write_reaction(reaction.change),
        reaction_kj_mol=total,
        reaction_temperature_k=DEFAULT_TEMPERATURE_K if warm else 0.0,
        zero_kj_mol=other_end if warm else enthalpy,
        room_kj_mol=enthalpy if warm else other_end,
        uncertainty_kj_mol=math.hypot(*known_spread) if len(known_spread) == len(spread) else None,
        shares_kj_mol=shares,
    )


def _above_elements(name: str, heat: _Heat, model: SpeciesModel, where: str) -> float:
    """Return the enthalpy of formation at 298.15 K less that at 0 K."""
    elements = _elements_kj_mol(model)
    if heat.rise is None or elements is None:
        raise StudyError(
            f"the reference value of {name} cannot be brought to 0 K",
            where=where,
            mend="give all references of this reaction at one temperature",
        )
    return heat.rise - elements


def _elements_kj_mol(model: SpeciesModel) -> float | None:
    """Return H(298.15 K) - H(0) of the elements, None where one is not in the table."""
    if any(element not in ATOMS for element in model.composition):
        return None
    return sum(ATOMS[element].element_kj_mol * n for element, n in model.composition.items())


def _element(model: SpeciesModel, where: str) -> str:
    """Return the element of a species that must be a neutral atom."""
    if sum(model.composition.values()) != 1 or model.charge != 0:
        raise StudyError(
            f"{model.name} is no neutral atom", where=where, mend="list neutral atoms only"
        )
    return next(iter(model.composition))


def _tabulated(element: str, where: str) -> Reference:
    if element not in ATOMS:
        raise StudyError(
            f"the table of atoms does not have {element}",
            where=f"{where} atoms",
            mend=f"give its enthalpy of formation in [formation] reference; the table has "
            f"{', '.join(ATOMS)}",
        )
    atom = ATOMS[element]
    return Reference(atom.formation_kj_mol, atom.uncertainty_kj_mol / 2.0, 0.0, atom.source)


def atom_rise_kj_mol(element: str) -> float:
    """Return H(298.15 K) - H(0) of a tabulated atom with the levels of its ground term."""
    degeneracies, levels_cm = np.array(ATOMS[element].levels).T
    share = electronic(np.array(DEFAULT_TEMPERATURE_K), degeneracies, levels_cm)
    return 2.5 * GAS_J_MOL_K * DEFAULT_TEMPERATURE_K / 1000.0 + float(share.enthalpy_j_mol) / 1000.0


def _splitting_kj_mol(element: str) -> float:
    """Return how far the lowest level lies below the mean of the ground term."""
    return ATOMS[element].spin_orbit_cm * WAVENUMBER_KJ_MOL if element in ATOMS else 0.0


def _check_balance(reaction: Reaction, species: Mapping[str, SpeciesModel]) -> None:
    total: Counter[str] = Counter()
    for name, count in reaction.change.items():
        for element, number in species[name].composition.items():
            total[element] += count * number
        total["charge"] += count * species[name].charge
    off = {key: number for key, number in total.items() if number}
    if off:
        words = ", ".join(f"{key} {number:+d}" for key, number in off.items())
        raise StudyError(
            f"{write_reaction(reaction.change)} does not balance: {words}",
            where=reaction.where,
            mend="mend the counts; products less reactants must be 0 of every element and of charge",
        )


def _atomized(
    question: FormationQuestion,
    atoms: Mapping[str, str],
    species: Mapping[str, SpeciesModel],
    references: Mapping[str, Reference],
) -> tuple[str, ...]:
    """Return the species whose enthalpy of formation comes from the atoms."""
    if question.atomization is None:
        return tuple(
            name
            for name, model in species.items()
            if name not in (*references, *question.isotopologues)
            and model.kind == "minimum"
            and model.charge == 0
            and set(model.composition) <= set(atoms)
            and model.at(DEFAULT_TEMPERATURE_K).electronic_kj_mol is not None
        )
    for name in question.atomization:
        model = species[name]
        lacking = [element for element in model.composition if element not in atoms]
        if lacking or model.charge or name in references:
            what = "has a reference value" if name in references else f"has charge {model.charge}"
            if lacking:
                what = f"holds {', '.join(lacking)}, which is not among the atoms"
            raise StudyError(
                f"{name} {what}",
                where=f"{question.where} atomization",
                mend="add the atom, give a reaction instead, or take the species out",
            )
    return question.atomization


def _findings(
    question: FormationQuestion, atoms: Mapping[str, str], rows: list[Formation]
) -> tuple[Finding, ...]:
    found = []
    split = {name: _splitting_kj_mol(element) for element, name in atoms.items()}
    split = {name: value for name, value in split.items() if value > SPIN_ORBIT_KJ_MOL}
    if split and not question.spin_orbit and any(row.route == "atomization" for row in rows):
        words = ", ".join(f"{name} {value:.2f}" for name, value in split.items())
        found.append(
            Finding(
                "spin-orbit-left-out",
                "note",
                question.where,
                None,
                "enthalpies of formation by atomization take the computed atoms for their lowest level; "
                f"a nonrelativistic one lies above it by ({words} kJ/mol)",
                "write spin_orbit = true where the energies of the atoms are without spin-orbit coupling",
            )
        )
    if rows and question.reaction_uncertainty_kj_mol is None:
        found.append(
            Finding(
                "formation-uncertainty",
                "note",
                question.where,
                None,
                "the uncertainties of enthalpies of formation are those of the references alone",
                "give reaction_uncertainty, the standard uncertainty of a computed reaction enthalpy",
            )
        )
    return tuple(found)
