"""The tables and the JSON answer of ``profile``."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from thermo_pp.conditions import Treatment
from thermo_pp.names import EnergyUnit
from thermo_pp.output.energies import keys as energy_keys
from thermo_pp.output.json_text import answer
from thermo_pp.output.notes import ALL_DIGITS, kelvin, of_treatment, some, stamp, usual
from thermo_pp.output.tables import (
    ENTROPY_UNIT,
    Block,
    Cell,
    Column,
    Table,
    about_all,
    energy_column,
    in_unit,
)
from thermo_pp.profile import Profile, State
from thermo_pp.species import ElectronicEnergy

IN_FULL = 3
"""Up to this many temperatures every quantity is shown at each of them."""
SIDE_BY_SIDE = 7
"""How many temperatures stand side by side at most."""


def tables(
    profile: Profile, treatment: Treatment, unit: EnergyUnit, levels: Sequence[str] = ()
) -> list[Block]:
    """Return the tables for people, one or two a path.

    Up to three temperatures: all quantities at each. More: all of them at the one nearest to 298.15
    K, and G at up to seven temperatures side by side.

    Parameters
    ----------
    profile : Profile
    treatment : Treatment
    unit : str
        Of energies.
    levels : sequence of str
        The levels of theory in words.
    """
    temperature_k = profile.temperature_k
    few = len(temperature_k) <= IN_FULL
    blocks: list[Table] = []
    for path in dict.fromkeys(state.path for state in profile.states):
        states = [state for state in profile.states if state.path == path]
        title = f"{path}: {profile.net_reactions[path]}"
        for k in range(len(temperature_k)) if few else [usual(temperature_k)]:
            blocks.append(_all_quantities(states, k, f"{title}, {kelvin(temperature_k[k])}", unit))
        if not few:
            blocks.append(_gibbs(states, profile, title, unit))
    notes = [_reference(profile), of_treatment(treatment), *levels, stamp()]
    notes += [] if few else [ALL_DIGITS]
    return about_all(blocks, notes)


def wide(
    profile: Profile, treatment: Treatment, unit: EnergyUnit, levels: Sequence[str] = ()
) -> list[Block]:
    """Return the one table for CSV and xlsx: a row a state and temperature, full digits."""
    columns = [
        Column("path"),
        Column("state"),
        Column("kind"),
        Column("T", "K"),
        energy_column("E", unit),
        energy_column("zero-point energy", unit),
        energy_column("H", unit),
        Column("S", ENTROPY_UNIT),
        energy_column("G", unit),
        energy_column("spread of G over soft-mode treatments", unit),
    ]
    rows = [
        [state.path, state.state, state.kind, float(temperature), *_numbers(state, k, unit)]
        for state in profile.states
        for k, temperature in enumerate(profile.temperature_k)
    ]
    constants = [
        ("relative to", profile.reference),
        ("at", profile.at),
        ("standard state", profile.standard_state),
        ("soft modes", treatment.low_modes),
    ]
    notes = [_reference(profile), of_treatment(treatment), *levels, stamp()]
    return [Table("profile", columns, rows, constants=constants, about=notes)]


def keys(
    profile: Profile,
    treatment: Treatment,
    findings: Sequence[Any],
    energies: Mapping[str, ElectronicEnergy],
) -> dict[str, Any]:
    """Return the JSON answer."""
    return answer(
        "profile",
        findings,
        treatment,
        reference=profile.reference,
        at=profile.at,
        temperature_k=profile.temperature_k,
        net_reactions=profile.net_reactions,
        energies=energy_keys(energies),
        states=[
            {
                "path": state.path,
                "state": state.state,
                "kind": state.kind,
                "species": dict(state.species),
                "enthalpy_kj_mol": state.enthalpy_kj_mol,
                "entropy_j_mol_k": state.entropy_j_mol_k,
                "gibbs_kj_mol": state.gibbs_kj_mol,
                "electronic_kj_mol": state.electronic_kj_mol,
                "zero_point_kj_mol": state.zero_point_kj_mol,
                "low_mode_spread_kj_mol": state.low_mode_spread_kj_mol,
            }
            for state in profile.states
        ],
    )


def _all_quantities(states: Sequence[State], k: int, title: str, unit: EnergyUnit) -> Table:
    columns = [
        Column("State"),
        energy_column("ΔE", unit, r"$\Delta E$"),
        energy_column("ΔZPE", unit, r"$\Delta\mathrm{ZPE}$"),
        energy_column("ΔH", unit, r"$\Delta H$"),
        Column("ΔS", ENTROPY_UNIT, r"$\Delta S$", decimals=1),
        energy_column("ΔG", unit, r"$\Delta G$", whole=True),
        energy_column("soft", unit),
    ]
    rows = [[_label(state), *_numbers(state, k, unit)] for state in states]
    return Table(title, columns, rows)


def _gibbs(states: Sequence[State], profile: Profile, title: str, unit: EnergyUnit) -> Table:
    shown = some(len(profile.temperature_k), SIDE_BY_SIDE)
    cell = energy_column("ΔG", unit)
    columns = [
        Column("State"),
        *(Column(kelvin(profile.temperature_k[k]), decimals=cell.decimals) for k in shown),
    ]
    rows = [
        [_label(state), *(in_unit(state.gibbs_kj_mol[k], unit) for k in shown)] for state in states
    ]
    return Table(f"{title}, {cell.heading}", columns, rows)


def _label(state: State) -> str:
    """Return the state's name, a saddle point marked."""
    return f"{state.state} ‡" if state.kind == "saddle" else state.state


def _numbers(state: State, k: int, unit: EnergyUnit) -> list[Cell]:
    """Return E, zero-point energy, H, S, G and the spread at temperature `k`."""
    return [
        in_unit(state.electronic_kj_mol, unit),
        in_unit(state.zero_point_kj_mol, unit),
        in_unit(state.enthalpy_kj_mol[k], unit),
        float(state.entropy_j_mol_k[k]),
        in_unit(state.gibbs_kj_mol[k], unit),
        in_unit(state.low_mode_spread_kj_mol[k], unit),
    ]


def _reference(profile: Profile) -> str:
    where = "the standard state" if profile.at == "standard state" else "the concentrations held"
    return (
        f"Relative to {profile.reference}, G at {where}; ‡: saddle point; "
        "soft: largest less smallest ΔG over the four soft-mode treatments."
    )
