"""The species that a study declares."""

from __future__ import annotations

from thermo_pp import conditions as made
from thermo_pp.errors import StudyError
from thermo_pp.names import DEFAULT_TEMPERATURE_K, Kind
from thermo_pp.species import Declared, SpeciesModel, parse_composition
from thermo_pp.study.keys import StructureKeys
from thermo_pp.study.values import above_zero, given
from thermo_pp.units import quantity


def declare(
    name: str,
    member: StructureKeys,
    kind: Kind,
    standard_state: made.StandardState,
    where: str,
    reference: tuple[tuple[SpeciesModel, int], ...] = (),
) -> Declared:
    """Make one declared species.

    Parameters
    ----------
    name : str
    member : StructureKeys
        With ``composition``, ``enthalpy`` and ``entropy``.
    kind : {"minimum", "saddle"}
    standard_state : StandardState
    where : str
        File and table, for messages.
    reference : tuple of (SpeciesModel, int)
        The sum that its values are differences from, and how many of each.

    Raises
    ------
    StudyError
        A value that has another unit, electrons that do not count against 1 mol/L, an imaginary
        mode of a minimum.
    """

    def number(key: str, unit: str) -> float:
        return quantity(getattr(member, key), unit, where=f"{where} {key}")

    atoms, _ = parse_composition(str(member.composition), where=where)
    if not atoms and (standard_state.form, standard_state.value) != ("concentration", 1.0):
        raise StudyError(
            f"{name} are electrons, whose activity counts against 1 mol/L",
            where=f"{where} standard_state",
            mend='write standard_state = "1 mol/L"',
        )
    temperature = given(member.temperature)
    return Declared.make(
        str(member.composition),
        name=name,
        kind=kind,
        enthalpy_kj_mol=number("enthalpy", "kJ/mol"),
        entropy_j_mol_k=number("entropy", "J/mol/K"),
        standard_state=standard_state,
        heat_capacity_j_mol_k=(
            None if given(member.heat_capacity) is None else number("heat_capacity", "J/mol/K")
        ),
        temperature_k=(
            DEFAULT_TEMPERATURE_K
            if temperature is None
            else made.temperature(temperature, where=f"{where} temperature")
        ),
        ground_kj_mol=None if given(member.ground) is None else number("ground", "kJ/mol"),
        imaginary_cm=_imaginary_mode(member, kind, where),
        charge=given(member.charge),
        reference=reference,
        where=where,
    )


def _imaginary_mode(member: StructureKeys, kind: Kind, where: str) -> float | None:
    """Return the size of a declared saddle point's imaginary wavenumber, cm^-1."""
    value = given(member.imaginary_mode)
    if value is None:
        return None
    if kind != "saddle":
        raise StudyError(
            "a minimum has no imaginary mode",
            where=f"{where} imaginary_mode",
            mend="take the key out, or let a step go through this species",
        )
    return above_zero(value, "1/cm", f"{where} imaginary_mode")
