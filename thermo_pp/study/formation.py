"""The question of ``[formation]``: which enthalpies of formation a study asks for."""

from __future__ import annotations

from collections.abc import Collection, Mapping

from msgspec import UNSET

from thermo_pp.errors import StudyError
from thermo_pp.functions.formation import FormationQuestion, Reaction, Reference
from thermo_pp.mechanism import parse_equation
from thermo_pp.names import DEFAULT_TEMPERATURE_K
from thermo_pp.nearest import suggestion
from thermo_pp.study.check import place
from thermo_pp.study.keys import FormationKeys, ReferenceKeys, SpeciesKeys
from thermo_pp.study.values import given
from thermo_pp.units import quantity


def make_formation(
    keys: FormationKeys, species: Mapping[str, SpeciesKeys], saddles: Collection[str], file: str
) -> FormationQuestion:
    """Turn ``[formation]`` into what is asked.

    Raises
    ------
    StudyError
        An unknown species, a saddle point, one with isotopes of its own, nothing to derive, an
        uncertainty below 0, a reference at a temperature that is neither 0 nor 298.15 K.
    """
    where = place(file, "formation")
    reactions = []
    for number, text in enumerate(keys.reactions):
        at = place(file, "formation", "reactions", number)
        left, right = parse_equation(text, where=at)
        change = {name: right.get(name, 0) - left.get(name, 0) for name in (*left, *right)}
        reactions.append(Reaction({name: n for name, n in change.items() if n}, at))
    own = given(keys.reaction_uncertainty)
    question = FormationQuestion(
        atoms=tuple(keys.atoms),
        atomization=None if keys.atomization is UNSET else tuple(keys.atomization),
        reactions=tuple(reactions),
        references={name: _reference(name, value, file) for name, value in keys.reference.items()},
        reaction_uncertainty_kj_mol=None
        if own is None
        else _uncertainty(own, place(file, "formation", "reaction_uncertainty")),
        spin_orbit=keys.spin_orbit,
        isotopologues=tuple(name for name, own in species.items() if given(own.isotopes)),
        where=where,
    )
    for name in question.names:
        if name not in species or name in saddles:
            known = [other for other in species if other not in saddles]
            kind = "is a saddle point" if name in saddles else "is no species of this study"
            raise StudyError(
                f"{name!r} {kind}", where=where, mend=suggestion(name, known, "species")
            )
        if name in question.isotopologues:
            raise StudyError(
                f"{name} has isotopes of its own, and enthalpies of formation are those of natural "
                "elements",
                where=where,
                mend="take it out of [formation]",
            )
    if not question.atoms and not question.reactions:
        raise StudyError(
            "neither atoms nor reactions, so nothing can be derived",
            where=where,
            mend='write atoms = ["H", "O"], or reactions = ["CH4 + H2O = CH3OH + H2"]',
        )
    return question


def _reference(name: str, keys: ReferenceKeys, file: str) -> Reference:
    at = place(file, "formation", "reference", name)
    kelvin = quantity(keys.temperature, "K", where=f"{at}.temperature")
    if kelvin not in (0.0, DEFAULT_TEMPERATURE_K):
        raise StudyError(
            f"an enthalpy of formation at {keys.temperature!r} is not taken",
            where=f"{at}.temperature",
            mend='give it at "298.15 K" or "0 K"',
        )
    spread = given(keys.uncertainty)
    return Reference(
        quantity(keys.enthalpy, "kJ/mol", where=f"{at}.enthalpy"),
        None if spread is None else _uncertainty(spread, f"{at}.uncertainty"),
        kelvin,
        keys.source or "given",
    )


def _uncertainty(value: str | float, where: str) -> float:
    number = quantity(value, "kJ/mol", where=where)
    if number < 0.0:
        raise StudyError(f"{value!r} is below 0", where=where, mend="write 0 or more")
    return number
