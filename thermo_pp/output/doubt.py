"""The doubt about the answers as JSON and as tables; part of the answer of ``barrier``."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from math import floor, log10
from typing import Any

import numpy as np

from thermo_pp.kinetics.doubt.results import QUANTILES, Answer, Doubt, RateDoubt, Spread
from thermo_pp.names import Definition, EnergyUnit
from thermo_pp.output.definitions import KEYS
from thermo_pp.output.notes import kelvin, some, usual
from thermo_pp.output.tables import (
    Block,
    Cell,
    Column,
    Table,
    defined,
    energy_column,
    in_unit,
    unit_heading,
)
from thermo_pp.units import ENERGY_PER_KJ_MOL, GAS_J_MOL_K

SHOWN_TEMPERATURES = 5
"""How many temperatures are shown at most."""
SHOWN_SHARE = 0.001
"""Energies whose shares stay below this have no row."""
_OF: dict[Definition, str] = {
    "free": "rate per free reactant",
    "pool": "rate per pool",
    "relaxation": "relaxation",
    "cycle": "turnover",
    "point": "rate at the point asked for",
}


def doubt_keys(result: Doubt) -> dict[str, Any]:
    """Return the doubt for JSON."""
    return {
        "samples": result.samples,
        "seed": result.seed,
        "quantiles": QUANTILES,
        "energies": [
            {"name": name, "deviation_kj_mol": result.deviation_kj_mol[k]}
            for k, name in enumerate(result.names)
        ],
        "correlation": result.correlation,
        "rates": {KEYS[name]: _rate_keys(rate) for name, rate in result.rates.items()},
        "alternatives": [
            {
                "choice": one.choice,
                "taken": one.taken,
                "instead": one.instead,
                "answers": {KEYS[name]: vars(answer) for name, answer in one.answers.items()},
            }
            for one in result.alternatives
        ],
    }


def _rate_keys(rate: RateDoubt) -> dict[str, Any]:
    narrowing = vars(rate.narrowing)
    probabilities = (
        *("negative_energy", "backwards", "same_saddle", "same_resting", "same_product"),
        "same_answer",
    )
    spread = {
        name: value if name not in probabilities or value is None else vars(value)
        for name, value in vars(rate.spread).items()
        if name != "energies_kj_mol"  # one number a sample: for figures
    }
    return {
        "unit": rate.unit,
        **vars(rate.answer),
        "first_order_log_deviation": rate.first_order_log_deviation,
        "first_order_energy_deviation_kj_mol": rate.first_order_energy_deviation_kj_mol,
        "gibbs_deviation_kj_mol": rate.gibbs_deviation_kj_mol,
        "narrowing": {
            name: {key: narrowing[key][k] for key in narrowing if key != "names"}
            for k, name in enumerate(rate.narrowing.names)
        },
        "samples": spread,
    }


def as_certain(table: Table, rate: RateDoubt | None, unit: EnergyUnit) -> Table:
    """Return a table of rates with as many digits as the doubt leaves a meaning.

    Energies to the second digit of their smallest standard deviation over temperature, the rate
    constant to the second digit of its relative one; never more than the table has.
    """
    if rate is None:
        return table
    slope = rate.first_order_energy_deviation_kj_mol
    energy = float(np.min(slope)) * ENERGY_PER_KJ_MOL[unit]
    barrier = float(np.min(rate.gibbs_deviation_kj_mol)) * ENERGY_PER_KJ_MOL[unit]
    over_rt = rate.first_order_log_deviation / rate.gibbs_deviation_kj_mol
    entropy = GAS_J_MOL_K * float(np.min(slope * over_rt))
    relative = float(np.min(rate.first_order_log_deviation))
    if not all(0.0 < value < np.inf for value in (energy, barrier, entropy, relative)):
        return table
    decimals = {"Eₐ": energy, "H‡": energy, "H‡°": energy, "G‡": barrier, "G‡°": barrier}
    decimals |= {"S‡": entropy, "S‡°": entropy}
    columns = []
    for column in table.columns:
        if column.quantity in decimals and column.decimals is not None:
            kept = 1 - floor(log10(decimals[column.quantity]))
            column = replace(column, decimals=min(max(kept, 0), column.decimals))
        elif column.quantity == "k" and column.digits is not None:
            kept = 2 - min(floor(log10(relative)), 0)
            column = replace(column, digits=min(kept, column.digits))
        columns.append(column)
    note = "Digits of k, Eₐ, H‡, S‡ and G‡ as their standard deviations by [doubt] leave them."
    return replace(table, columns=columns, notes=[*table.notes, note])


def doubt_tables(result: Doubt, unit: EnergyUnit) -> list[Block]:
    """Return the tables for people, and the sentences."""
    blocks: list[Block] = []
    k = usual(result.temperature_k)
    for definition, rate in result.rates.items():
        if definition == "relaxation":
            continue
        blocks.append(_bands(result, definition, rate, rate.spread, unit))
        blocks += _branching(result, definition, rate.spread)
        blocks.append(_narrowing(result, definition, rate, k, unit))
    if result.alternatives and result.rates:
        blocks.append(_alternatives(result, k, unit))
    return [*blocks, " ".join(result.words)] if result.words else blocks


def doubt_wide(result: Doubt, unit: EnergyUnit) -> list[Block]:
    """Return the tables for CSV: every temperature, definition and band."""
    percent = [f"{100.0 * q:g} %" for q in QUANTILES]
    columns = [
        *(Column("definition"), Column("T", "K"), Column("ln k")),
        *(Column(f"ln k {q}") for q in percent),
        *(Column("SD of ln k"), Column("SD of ln k, first order")),
        energy_column("Ea", unit),
        *(energy_column(f"Ea {q}", unit) for q in percent),
        *(energy_column("SD of Ea", unit), energy_column("SD of Ea, first order", unit)),
        *(Column("P(Ea < 0)"), Column("error of P"), Column("same answer"), Column("error")),
        *(Column("controlling saddle"), Column("resting state")),
    ]
    rows: list[list[Cell]] = []
    slopes: list[list[Cell]] = []
    for definition, rate in result.rates.items():
        spread, answer, narrow = rate.spread, rate.answer, rate.narrowing
        for k, temperature in enumerate(result.temperature_k):
            head: list[Cell] = [definition, float(temperature)]
            rows.append(
                [
                    *(*head, defined(answer.log_rate[k])),
                    *map(defined, spread.log_bands[:, k]),
                    defined(spread.log_deviation[k]),
                    defined(rate.first_order_log_deviation[k]),
                    in_unit(answer.arrhenius_energy_kj_mol[k], unit),
                    *[in_unit(e, unit) for e in spread.energy_bands_kj_mol[:, k]],
                    in_unit(spread.energy_deviation_kj_mol[k], unit),
                    in_unit(rate.first_order_energy_deviation_kj_mol[k], unit),
                    *_probabilities(spread, k),
                    answer.controlling_saddle[k],
                    None if answer.resting_state is None else answer.resting_state[k],
                ]
            )
            slopes += [
                [
                    *(*head, name, float(result.deviation_kj_mol[n])),
                    *(defined(narrow.log_share[n, k]), defined(narrow.energy_share[n, k])),
                    *(
                        defined(narrow.log_deviation_exact[n, k]),
                        defined(narrow.log_deviation_half[n, k]),
                    ),
                    in_unit(narrow.energy_deviation_exact_kj_mol[n, k], unit),
                    in_unit(narrow.energy_deviation_half_kj_mol[n, k], unit),
                ]
                for n, name in enumerate(result.names)
            ]
    head_columns = [Column("definition"), Column("T", "K")]
    narrowing_columns = [
        *(*head_columns, Column("energy of"), Column("deviation", "kJ mol⁻¹")),
        *(Column("share in ln k"), Column("share in Ea")),
        *(Column("SD of ln k, this one exact"), Column("SD of ln k, this one halved")),
        energy_column("SD of Ea, this one exact", unit),
        energy_column("SD of Ea, this one halved", unit),
    ]
    alternatives: list[list[Cell]] = [
        [
            *(definition, float(temperature), one.choice, one.taken, one.instead),
            *(
                defined(answer.log_rate[k]),
                in_unit(answer.arrhenius_energy_kj_mol[k], unit),
                answer.controlling_saddle[k],
            ),
            None if answer.resting_state is None else answer.resting_state[k],
        ]
        for one in result.alternatives
        for definition, answer in one.answers.items()
        for k, temperature in enumerate(result.temperature_k)
    ]
    alternative_columns = [
        *(*head_columns, Column("choice"), Column("taken"), Column("instead")),
        *(Column("ln k"), energy_column("Ea", unit)),
        *(Column("controlling saddle"), Column("resting state")),
    ]
    return [
        Table(
            "doubt",
            columns,
            rows,
            constants=[("samples", str(result.samples)), ("seed", str(result.seed))],
        ),
        Table("narrowing", narrowing_columns, slopes),
        Table("alternatives", alternative_columns, alternatives),
    ]


def _probabilities(spread: Spread, k: int) -> list[Cell]:
    return [
        float(values[k])
        for probability in (spread.negative_energy, spread.same_answer)
        for values in (probability.value, probability.error)
    ]


def _bands(
    result: Doubt, definition: Definition, rate: RateDoubt, spread: Spread, unit: EnergyUnit
) -> Table:
    columns = [
        Column("T", "K", "$T$"),
        *(Column(f"k {q} %", unit_heading(rate.unit), digits=2) for q in ("2.5", "97.5")),
        *(Column("SD ln k", decimals=2), Column("first order", decimals=2)),
        *(energy_column("Eₐ 2.5 %", unit), energy_column("Eₐ 97.5 %", unit)),
        *(Column("P(Eₐ<0)", decimals=4), Column("same answer", decimals=4)),
    ]
    rates = spread.rate_bands()
    rows: list[list[Cell]] = [
        [
            *(float(result.temperature_k[k]), defined(rates[0, k]), defined(rates[-1, k])),
            *(defined(spread.log_deviation[k]), defined(rate.first_order_log_deviation[k])),
            in_unit(spread.energy_bands_kj_mol[0, k], unit),
            in_unit(spread.energy_bands_kj_mol[-1, k], unit),
            *(float(spread.negative_energy.value[k]), float(spread.same_answer.value[k])),
        ]
        for k in some(len(result.temperature_k), SHOWN_TEMPERATURES)
    ]
    error = max(spread.negative_energy.error.max(), spread.same_answer.error.max())
    notes = [
        f"{spread.samples} samples of the energies (seed {result.seed}), normal, with the standard "
        "deviations and correlations of [doubt].",
        "same answer: the same controlling saddle, resting state and main product as without shifts; "
        f"standard error of the probabilities {error:.1g} at most.",
        "first order: SD ln k through the controls.",
    ]
    return Table(f"Doubt about the {_OF[definition]}", columns, rows, notes)


def _branching(result: Doubt, definition: Definition, spread: Spread) -> list[Block]:
    if spread.branching_bands is None:
        return []
    columns = [
        *(Column("T", "K", "$T$"), Column("Product")),
        *(Column(f"share {100.0 * q:g} %", decimals=4) for q in QUANTILES),
    ]
    rows: list[list[Cell]] = [
        [float(result.temperature_k[k]), name, *map(defined, bands[:, k])]
        for k in some(len(result.temperature_k), SHOWN_TEMPERATURES)
        for name, bands in spread.branching_bands.items()
    ]
    return [Table(f"Doubt about the branching, {_OF[definition]}", columns, rows)]


def _narrowing(
    result: Doubt, definition: Definition, rate: RateDoubt, k: int, unit: EnergyUnit
) -> Table:
    narrow = rate.narrowing
    shown = [
        n
        for n in range(len(narrow.names))
        if max(abs(narrow.log_share[n, k]), abs(narrow.energy_share[n, k])) >= SHOWN_SHARE
    ]
    columns = [
        *(Column("Energy of"), energy_column("SD", unit)),
        *(Column("share in ln k", decimals=3), Column("share in Eₐ", decimals=3)),
        *(Column("SD ln k if exact", decimals=2), Column("if halved", decimals=2)),
        energy_column("SD Eₐ if exact", unit),
    ]
    rows: list[list[Cell]] = [
        [
            *(narrow.names[n], in_unit(float(result.deviation_kj_mol[n]), unit)),
            *(defined(narrow.log_share[n, k]), defined(narrow.energy_share[n, k])),
            *(
                defined(narrow.log_deviation_exact[n, k]),
                defined(narrow.log_deviation_half[n, k]),
            ),
            in_unit(narrow.energy_deviation_exact_kj_mol[n, k], unit),
        ]
        for n in sorted(shown, key=lambda n: float(narrow.log_deviation_exact[n, k]))
    ]
    notes = [
        f"As it is: SD ln k {rate.first_order_log_deviation[k]:.2f}, SD RT ln k "
        f"{rate.gibbs_deviation_kj_mol[k]:.2f} kJ mol⁻¹, SD Eₐ "
        f"{rate.first_order_energy_deviation_kj_mol[k]:.2f} kJ mol⁻¹; first order.",
        "exact, halved: with the standard deviation of this energy alone zero, or halved. Where "
        "errors cancel because they are correlated, one exact energy may leave more doubt.",
    ]
    title = f"Whose energy would narrow the {_OF[definition]} at {kelvin(result.temperature_k[k])}"
    return Table(title, columns, rows, notes)


def _alternatives(result: Doubt, k: int, unit: EnergyUnit) -> Table:
    """Return every answer by alternative, the study's own first."""
    shown = [name for name in result.rates if name != "relaxation"]
    columns = [Column("Choice"), Column("instead")]
    for name in shown:
        columns += [
            Column(f"k, {name}", unit_heading(result.rates[name].unit), digits=3),
            energy_column(f"Eₐ, {name}", unit),
        ]
    columns += [Column("controls"), Column("rests")]
    own: dict[Definition, Answer] = {name: result.rates[name].answer for name in shown}
    rows = [["as it is", "", *_answers(own, shown, k, unit)]]
    rows += [
        [one.choice, one.instead, *_answers(one.answers, shown, k, unit)]
        for one in result.alternatives
    ]
    notes = ["One choice at a time; alternatives, not samples. Controls, rests: by the last rate."]
    title = f"Other levels of theory and choices, at {kelvin(result.temperature_k[k])}"
    return Table(title, columns, rows, notes)


def _answers(
    answers: Mapping[Definition, Answer], shown: Sequence[Definition], k: int, unit: EnergyUnit
) -> list[Cell]:
    cells: list[Cell] = []
    last: Answer | None = None
    for name in shown:
        last = answers.get(name)
        if last is None:
            cells += [None, None]
            continue
        cells += [
            defined(np.exp(last.log_rate[k])),
            in_unit(last.arrhenius_energy_kj_mol[k], unit),
        ]
    if last is None:
        return [*cells, None, None]
    rests = None if last.resting_state is None else last.resting_state[k]
    return [*cells, last.controlling_saddle[k], rests]
