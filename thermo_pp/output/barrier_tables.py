"""The tables of ``barrier``: rates by each definition, approximations, controls, steps."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import Treatment
from thermo_pp.kinetics.doubt.results import Doubt
from thermo_pp.kinetics.product_ratio import Selectivity
from thermo_pp.kinetics.regime_map import Regimes
from thermo_pp.kinetics.results import Approximation, EffectiveRate, Rate, Window
from thermo_pp.names import Definition, EnergyUnit
from thermo_pp.output.barrier import (
    activation_cells,
    all_orders,
    all_words,
    cell_at,
    rates_of,
    steps_table,
    tunnelling_cells,
)
from thermo_pp.output.definitions import TITLES
from thermo_pp.output.doubt import as_certain, doubt_tables
from thermo_pp.output.limits import constant_table, limits_table
from thermo_pp.output.notes import ALL_DIGITS, kelvin, of_treatment, some, stamp, usual
from thermo_pp.output.regimes import tables as regimes_tables
from thermo_pp.output.selectivity import tables as selectivity_tables
from thermo_pp.output.tables import (
    ENTROPY_UNIT,
    Block,
    Cell,
    Column,
    Table,
    about_all,
    defined,
    energy_column,
    in_unit,
    unit_heading,
)

FloatArray = NDArray[np.float64]

SAFETY = (
    "A computed rate is no basis for safety: for anything hazardous use measured data, local codes "
    "and qualified practice."
)
SIDE_BY_SIDE = 3
"""How many temperatures stand side by side at most."""
DECAYS = 5
"""At how many temperatures the decay of the pool is shown at most."""
SHOWN_CONTROL = 0.001
"""Species whose control stays below this at the temperatures shown have no row."""


def tables(
    effective: EffectiveRate,
    treatment: Treatment,
    unit: EnergyUnit,
    levels: Sequence[str] = (),
    regimes: Regimes | None = None,
    selectivity: Selectivity | None = None,
    doubt: Doubt | None = None,
) -> list[Block]:
    """Return the tables for people and the closing paragraph.

    Parameters
    ----------
    effective : EffectiveRate
    treatment : Treatment
    unit : str
        Of energies.
    levels : sequence of str
        The levels of theory in words.
    regimes : Regimes or None
    selectivity : Selectivity or None
    doubt : Doubt or None
        Its tables stand after the closing paragraph; digits follow its standard deviations.
    """
    rates = rates_of(effective)
    blocks: list[Block] = []
    for number, (name, rate) in enumerate(rates.items()):
        title = f"{TITLES[name]}: {effective.net_reaction}"
        notes = _about(rate, effective)
        notes[:0] = [] if number else _about_all(effective)
        table = _rate(rate, effective, title, unit, notes)
        blocks.append(table if doubt is None else as_certain(table, doubt.rates.get(name), unit))
        if effective.constant is not None or rate.collider_orders:
            beside = constant_table(rate, effective, f"What stays constant: {TITLES[name]}", unit)
            blocks += [] if beside is None else [beside]
        blocks += _shares(rate, effective)
    blocks += _approximations(rates, effective)
    for name, rate in rates.items():
        title = f"Control of the {TITLES[name].lower()}"
        blocks.append(_control(rate, effective, title, unit))
        changed = limits_table(rate, effective, f"{title}, with and without limits of encounter")
        blocks += [] if changed is None else [changed]
    blocks += [] if selectivity is None else selectivity_tables(selectivity, unit)
    blocks += [] if regimes is None else regimes_tables(regimes, unit)
    blocks.append(steps_table(effective, [usual(effective.temperature_k)], unit, people=True))
    about = [of_treatment(treatment), *levels, stamp(), ALL_DIGITS]
    told = all_words(effective, selectivity, regimes)
    after = [] if doubt is None else about_all(doubt_tables(doubt, unit), about)
    shown = [*about_all(blocks, about), " ".join(told), *after]
    return [*shown, SAFETY]


def _rate(
    rate: Rate, effective: EffectiveRate, title: str, unit: EnergyUnit, notes: Sequence[str]
) -> Table:
    standard = rate.standard_activation
    columns = [
        Column("T", "K", "$T$"),
        Column("k", unit_heading(rate.unit), "$k$", digits=4, whole=True),
        energy_column("Eₐ", unit, r"$E_\mathrm{a}$", whole=True),
        energy_column("H‡", unit, r"$H^\ddagger$"),
        Column("S‡", ENTROPY_UNIT, r"$S^\ddagger$", decimals=1),
        energy_column("G‡", unit, r"$G^\ddagger$"),
    ]
    if standard is not None:
        columns += [
            energy_column("H‡°", unit, r"$H^{\ddagger\circ}$"),
            Column("S‡°", ENTROPY_UNIT, r"$S^{\ddagger\circ}$", decimals=1),
            energy_column("G‡°", unit, r"$G^{\ddagger\circ}$"),
        ]
    if rate.log_tunnelling is not None:
        columns += [Column("ln κ", decimals=4), energy_column("Eₐ of κ", unit)]
    rows: list[list[Cell]] = []
    for k, temperature in enumerate(effective.temperature_k):
        row: list[Cell] = [
            float(temperature),
            defined(rate.rate_constant[k]),
            in_unit(rate.arrhenius_energy_kj_mol[k], unit),
            *activation_cells(rate.activation, k, unit),
        ]
        row += [] if standard is None else activation_cells(standard, k, unit)
        row += [] if rate.log_tunnelling is None else tunnelling_cells(rate, k, unit)
        rows.append(row)
    return Table(title, columns, rows, notes)


def _about_all(effective: EffectiveRate) -> list[str]:
    """Return what the numbers of all rate tables refer to."""
    notes = ["H‡, S‡ and G‡ are of the pseudo-first-order constant at the concentrations held."]
    k = usual(effective.temperature_k)
    held = [f"{name} {values[k]:.4g} mol/L" for name, values in effective.held_mol_l.items()]
    if held:
        notes.append(f"Held, at {kelvin(effective.temperature_k[k])}: {', '.join(held)}.")
    if effective.reactant_coefficient != 1:
        notes.append(
            "The rate counts the net reaction; the reactant is lost "
            f"{effective.reactant_coefficient} times as fast."
        )
    return notes


def _about(rate: Rate, effective: EffectiveRate) -> list[str]:
    """Return what the numbers of one rate table refer to."""
    notes = []
    if rate.standard_activation is not None:
        notes.append(f"H‡°, S‡° and G‡° are against the standard state {effective.standard_state}.")
    if rate.log_tunnelling is not None:
        notes.append("κ: the rate constant over the one without tunnelling.")
    notes += [
        f"Eₐ changes its sign at {change.temperature_k:.2f} K, the {change.kind} of the rate."
        for change in rate.sign_changes
    ]
    return notes


def _shares(rate: Rate, effective: EffectiveRate) -> list[Block]:
    """Return how a pool decays, which state rests, and how products share the flow."""
    blocks: list[Block] = []
    if rate.slow_share is not None:
        columns = [
            Column("T", "K", "$T$"),
            Column("headline", "s⁻¹", digits=4),
            Column("share of slowest", decimals=4),
            Column("next/slowest", general=4),
            Column("1/mean time", "s⁻¹", digits=4),
            Column("resting state"),
        ]
        rows: list[list[Cell]] = [
            [
                float(temperature),
                cell_at(rate.headline, k),
                cell_at(rate.slow_share, k),
                cell_at(rate.next_decay_ratio, k),
                cell_at(rate.inverse_mean_time, k),
                None if rate.resting_state is None else rate.resting_state[k],
            ]
            for k, temperature in enumerate(effective.temperature_k)
            if k in some(len(effective.temperature_k), DECAYS)
        ]
        notes = ["headline: the decay constant with the largest share in what a pulse leaves."]
        blocks.append(Table("Decay of the pool", columns, rows, notes))
    families: tuple[tuple[str, Mapping[str, FloatArray] | None], ...] = (
        ("Shares of the catalyst", rate.populations if rate.definition == "cycle" else None),
        ("Branching", rate.branching),
    )
    for title, family in families:
        if family:
            blocks.append(_family(title, {"": family}, effective, decimals=4))
    return blocks


def _control(rate: Rate, effective: EffectiveRate, title: str, unit: EnergyUnit) -> Table:
    """Return controls and orders, and by how much a state would have to move to turn the sign."""
    shown = some(len(effective.temperature_k), SIDE_BY_SIDE)
    counting = {
        name: values
        for name, values in rate.control.items()
        if np.any(np.abs(values[shown]) >= SHOWN_CONTROL)
    }
    saddles = {name: values for name, values in counting.items() if name in rate.saddles}
    states = {name: values for name, values in counting.items() if name not in rate.saddles}
    orders = {**all_orders(rate, effective)}
    orders |= {f"{name} as collider": values for name, values in rate.collider_orders.items()}
    table = _family(title, {"‡": saddles, "": states, "order": orders}, effective, decimals=3)
    k = usual(effective.temperature_k)
    moves = [rate.sign_shift_kj_mol.get(name) for name in (*saddles, *states)]
    cells = [None if move is None else in_unit(move[k], unit) for move in moves]
    notes = ["Control: d ln k/d(-G/RT) of each state; ‡: saddle points, or steps without one."]
    if rate.catalyst_order is not None:
        notes.append(f"The order in all {effective.subject} is that of k times its total.")
    if len(counting) < len(rate.control):
        notes.append(f"Left out: {len(rate.control) - len(counting)} below {SHOWN_CONTROL}.")
    if all(cell is None for cell in cells):
        return Table(title, table.columns, table.rows, notes)
    cells += [None] * len(orders)
    column = energy_column(f"move at {kelvin(effective.temperature_k[k])}", unit)
    rows = [[*row, cell] for row, cell in zip(table.rows, cells, strict=True)]
    notes.append("move: of the energy of one state, which would bring Eₐ to zero.")
    return Table(title, [*table.columns, column], rows, notes)


def _family(
    title: str,
    families: Mapping[str, Mapping[str, FloatArray]],
    effective: EffectiveRate,
    decimals: int,
) -> Table:
    """Return values by name at up to three temperatures; the key of a family marks its names."""
    shown = some(len(effective.temperature_k), SIDE_BY_SIDE)
    columns = [
        Column("Species"),
        *(Column(kelvin(effective.temperature_k[k]), decimals=decimals) for k in shown),
    ]
    rows: list[list[Cell]] = [
        [_marked(name, mark), *(defined(values[k]) for k in shown)]
        for mark, family in families.items()
        for name, values in family.items()
    ]
    return Table(title, columns, rows)


def _marked(name: str, mark: str) -> str:
    return f"order in {name}" if mark == "order" else f"{name} {mark}".strip()


def _approximations(rates: Mapping[Definition, Rate], effective: EffectiveRate) -> list[Block]:
    shown = some(len(effective.temperature_k), SIDE_BY_SIDE)
    columns = [
        Column("Approximation"),
        Column("of"),
        Column("within 5 %"),
        *(Column(kelvin(effective.temperature_k[k]), general=4) for k in shown),
    ]
    rows: list[list[Cell]] = [
        [one.name, name, _windows(one), *(defined(one.ratio[k]) for k in shown)]
        for name, rate in rates.items()
        for one in rate.approximations
    ]
    title = "Approximations: ratio to the exact rate constant"
    return [Table(title, columns, rows)] if rows else []


def _windows(approximation: Approximation) -> str:
    return ", ".join(map(_window, approximation.windows)) or "nowhere"


def _window(window: Window) -> str:
    if window.open_below and window.open_above:
        return f"throughout {window.from_k:g}-{window.to_k:g} K"
    if window.open_below:
        return f"up to {window.to_k:.2f} K"
    if window.open_above:
        return f"from {window.from_k:.2f} K"
    return f"{window.from_k:.2f}-{window.to_k:.2f} K"
