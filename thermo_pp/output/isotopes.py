"""The tables, CSV and JSON answer of ``isotopes``."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from thermo_pp.conditions import Treatment
from thermo_pp.errors import Finding
from thermo_pp.isotopes import Isotopologues
from thermo_pp.kinetics.isotope_effects import IsotopeEffects
from thermo_pp.names import Definition, EnergyUnit
from thermo_pp.output.definitions import KEYS
from thermo_pp.output.json_text import answer
from thermo_pp.output.notes import ALL_DIGITS, kelvin, of_treatment, some, stamp, usual
from thermo_pp.output.tables import (
    Block,
    Cell,
    Column,
    Table,
    about_all,
    defined,
    energy_column,
    in_unit,
)

_WORDS: dict[Definition, str] = {
    "free": "per free reactant (competition)",
    "pool": "per pool (parallel runs)",
    "relaxation": "relaxation",
    "cycle": "turnover",
}
SHOWN = 9
"""How many temperatures a table for people has at most."""


def keys(
    effects: Sequence[IsotopeEffects], treatment: Treatment, findings: Sequence[Finding]
) -> dict[str, Any]:
    """Return the JSON answer."""
    return answer(
        "isotopes",
        findings,
        treatment,
        temperature_k=effects[0].temperature_k,
        isotopologues=[
            {
                "name": one.label,
                "species": [_species(species, one) for species in one.species],
                "steps": [vars(step) for step in one.steps],
                "rates": {
                    KEYS[rate.definition]: {
                        key: value for key, value in vars(rate).items() if key != "definition"
                    }
                    for rate in one.rates
                },
            }
            for one in effects
        ],
    )


def wide(effects: Sequence[IsotopeEffects], unit: EnergyUnit) -> list[Block]:
    """Return the tables for CSV: rates, steps, species; every temperature, full digits."""
    head = [Column("isotopes"), Column("T", "K")]
    rates: list[list[Cell]] = []
    steps: list[list[Cell]] = []
    species: list[list[Cell]] = []
    for one in effects:
        for k, temperature in enumerate(one.temperature_k):
            start: list[Cell] = [one.label, float(temperature)]
            for rate in one.rates:
                energy = in_unit(rate.arrhenius_energy_difference_kj_mol[k], unit)
                numbers = (defined(rate.effect[k]), defined(rate.without_symmetry[k]))
                rates.append([*start, rate.definition, *numbers, energy])
            for step in one.steps:
                values = [
                    *(step.equilibrium, step.forward, step.reverse),
                    *(step.equilibrium_without_symmetry, step.forward_without_symmetry),
                    *(step.tunnelling, step.harmonic_equilibrium, step.harmonic_forward),
                ]
                cells = [None if value is None else defined(value[k]) for value in values]
                steps.append([*start, step.equation, *cells])
            for pair in one.species:
                ratios = [
                    pair.log_reduced_ratio(temperature),
                    pair.log_full_ratio(temperature)[0],
                ]
                species.append([*start, pair.name, *map(float, ratios), pair.product_residual])
    return [
        Table(
            "rates",
            [
                *(*head, Column("definition"), Column("light/heavy")),
                *(Column("without symmetry"), energy_column("Ea heavy - light", unit)),
            ],
            rates,
        ),
        Table(
            "steps",
            [
                *(*head, Column("step"), Column("K light/heavy")),
                *(Column("k light/heavy"), Column("reverse k light/heavy")),
                *(Column("K without symmetry"), Column("k without symmetry")),
                Column("tunnelling"),
                *(Column("harmonic K light/heavy"), Column("harmonic k light/heavy")),
            ],
            steps,
        ),
        Table(
            "species",
            [
                *(*head, Column("species"), Column("ln (s/s')f")),
                *(Column("ln full ratio"), Column("product rule residual")),
            ],
            species,
        ),
    ]


def tables(
    effects: Sequence[IsotopeEffects],
    treatment: Treatment,
    unit: EnergyUnit,
    levels: Sequence[str] = (),
) -> list[Block]:
    """Return the tables for people.

    Parameters
    ----------
    effects : sequence of IsotopeEffects
    treatment : Treatment
    unit : str
        Of energies.
    levels : sequence of str
        The levels of theory in words.
    """
    blocks: list[Block] = []
    for one in effects:
        if one.rates:
            blocks.append(_rates(one, unit))
        blocks += [_steps(one), _species_table(one)]
    notes = [of_treatment(treatment), *levels, stamp(), ALL_DIGITS]
    return about_all(blocks, notes)


def _rates(one: IsotopeEffects, unit: EnergyUnit) -> Table:
    rows: list[list[Cell]] = [
        [
            float(one.temperature_k[k]),
            _WORDS[rate.definition],
            defined(rate.effect[k]),
            defined(rate.without_symmetry[k]),
            in_unit(rate.arrhenius_energy_difference_kj_mol[k], unit),
        ]
        for rate in one.rates
        for k in some(len(one.temperature_k), SHOWN)
    ]
    notes = [
        "Light over heavy. without symmetry: with the light species' symmetry numbers and handedness "
        "on both sides. Per free reactant is a competition where the reactant holds the isotopes."
    ]
    columns = [
        *(Column("T", "K", "$T$"), Column("Rate"), Column("effect", general=4)),
        *(Column("without symmetry", general=4), energy_column("Eₐ heavy - light", unit)),
    ]
    return Table(f"Isotope effects on the rate: {one.label}", columns, rows, notes)


def _steps(one: IsotopeEffects) -> Table:
    k = usual(one.temperature_k)
    columns = [
        *(Column("Step"), Column("K", general=4), Column("k", general=4)),
        *(Column("reverse k", general=4), Column("of tunnelling", general=4)),
        *(Column("K harmonic", general=4), Column("k harmonic", general=4)),
    ]
    rows: list[list[Cell]] = [
        [
            step.equation,
            *(defined(step.equilibrium[k]), defined(step.forward[k]), defined(step.reverse[k])),
            defined(step.tunnelling[k]),
            defined(step.harmonic_equilibrium[k]),
            None if step.harmonic_forward is None else defined(step.harmonic_forward[k]),
        ]
        for step in one.steps
    ]
    title = f"Isotope effects on the steps at {kelvin(one.temperature_k[k])}: {one.label}"
    notes = [
        "Light over heavy. harmonic: by reduced partition function ratios (Bigeleisen and Mayer), "
        "without symmetry and tunnelling."
    ]
    return Table(title, columns, rows, notes)


def _species_table(one: IsotopeEffects) -> Table:
    k = usual(one.temperature_k)
    t = one.temperature_k[k]
    columns = [
        *(Column("Species"), Column("isotopes"), Column("ln (s/s')f", decimals=5)),
        Column("by full partition functions", decimals=5),
        *(Column("product rule", digits=1), Column("symmetry light"), Column("symmetry heavy")),
    ]
    rows: list[list[Cell]] = [
        [
            pair.name,
            ", ".join(f"{key}: {value}" for key, value in pair.isotopes.items()),
            float(pair.log_reduced_ratio(t)),
            float(pair.log_full_ratio(t)[0]),
            pair.product_residual,
            *(pair.light.symmetry_number, pair.heavy.symmetry_number),
        ]
        for pair in one.species
    ]
    notes = ["product rule: by how much, as a logarithm, the wavenumbers of the Hessian miss it."]
    return Table(f"Isotopologues at {kelvin(t)}: {one.label}", columns, rows, notes)


def _species(pair: Isotopologues, one: IsotopeEffects) -> dict[str, Any]:
    return {
        "name": pair.name,
        "isotopes": dict(pair.isotopes),
        "log_reduced_ratio": pair.log_reduced_ratio(one.temperature_k),
        "log_full_ratio": pair.log_full_ratio(one.temperature_k),
        "product_residual": pair.product_residual,
        "symmetry_number_light": pair.light.symmetry_number,
        "symmetry_number_heavy": pair.heavy.symmetry_number,
        "degeneracy_light": pair.light.degeneracy,
        "degeneracy_heavy": pair.heavy.degeneracy,
        "imaginary_light_cm": pair.light.imaginary_cm,
        "imaginary_heavy_cm": pair.heavy.imaginary_cm,
    }
