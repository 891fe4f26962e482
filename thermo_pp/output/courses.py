"""Time courses and flows as JSON and as tables; part of the answers of ``barrier``."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.courses import TimeCourse, Transient
from thermo_pp.kinetics.flow import FlowState
from thermo_pp.names import EnergyUnit
from thermo_pp.output.notes import kelvin, some
from thermo_pp.output.tables import Block, Cell, Column, Table, defined, energy_column, in_unit

FloatArray = NDArray[np.float64]
SHOWN_TIMES = 25
"""How many times of a course are shown at most."""
SHOWN_SPECIES = 6
"""How many concentrations stand side by side at most."""
CONTROL_COLUMNS = 3
SHOWN_CONTROL = 0.001
_SAME = "Eₐ, orders and controls compare runs from the same start at the same conversion."


def time_course_keys(result: Transient) -> dict[str, Any]:
    """Return the time courses for JSON."""
    return {
        "followed": result.followed or None,
        "forming": result.forming,
        "courses": [_course_keys(course) for course in result.courses],
    }


def _course_keys(course: TimeCourse) -> dict[str, Any]:
    left_out = ("saddles", "arrhenius_energy_constant_kj_mol")
    return {name: value for name, value in vars(course).items() if name not in left_out} | {
        f"arrhenius_energy_constant_{name}_kj_mol": values
        for name, values in course.arrhenius_energy_constant_kj_mol.items()
    }


def flow_keys(result: FlowState) -> dict[str, Any]:
    """Return the steady states of a flow for JSON."""
    left_out = ("words", "findings", "saddles", "followed")
    return {
        "followed": result.followed or None,
        **{name: value for name, value in vars(result).items() if name not in left_out},
    }


def time_course_tables(result: Transient, unit: EnergyUnit) -> list[Block]:
    """Return the tables of time courses for people."""
    blocks: list[Block] = []
    for course in result.courses:
        shown = some(len(course.time_s), SHOWN_TIMES)
        names = _most(course.concentration_mol_l, shown)
        columns = [
            Column("t", "s", "$t$", digits=3),
            *(Column(f"[{name}]", "mol L⁻¹", digits=4, whole=True) for name in names),
        ]
        rows: list[list[Cell]] = [
            [float(course.time_s[k]), *(float(course.concentration_mol_l[n][k]) for n in names)]
            for k in shown
        ]
        notes = []
        if len(names) < len(course.concentration_mol_l):
            notes.append(f"The {len(names)} species of which there is most; --format csv has all.")
        if course.rate_mol_l_s is not None:
            columns += [
                Column("rate", "mol L⁻¹ s⁻¹", digits=4, whole=True),
                energy_column("Eₐ", unit, r"$E_\mathrm{a}$", whole=True),
                Column("order", general=3),
            ]
            for row, k in zip(rows, shown, strict=True):
                row += _rate_cells(course, k, unit)
            if both := _both(course):
                columns += [energy_column(f"Eₐ, constant {name}", unit) for name in both]
                for row, k in zip(rows, shown, strict=True):
                    row += [in_unit(values[k], unit) for values in both.values()]
                notes.append("constant: what of the gas stays on heating, at the start and held.")
            what = "net formation" if result.forming else "net loss"
            notes.append(
                f"rate: {what} of {result.followed}; order: in its free concentration, along the "
                f"course. {_SAME}"
            )
        title = f"Time course at {kelvin(course.temperature_k)}"
        blocks.append(Table(title, columns, rows, notes))
        blocks += [*_products(course, shown), *_quasi_steady(course, shown, unit)]
        blocks += _control(course)
    return [*blocks, " ".join(result.words)]


def time_course_wide(result: Transient, unit: EnergyUnit) -> list[Block]:
    """Return the tables of time courses for CSV: courses, controls and orders; full digits."""
    names = list(
        dict.fromkeys(name for course in result.courses for name in course.concentration_mol_l)
    )
    columns = [
        *(Column("T", "K"), Column("t", "s")),
        *(Column(f"[{name}]", "mol L⁻¹") for name in names),
        *(Column("rate", "mol L⁻¹ s⁻¹"), energy_column("Ea", unit), Column("order")),
    ]
    rows: list[list[Cell]] = []
    controls: list[list[Cell]] = []
    for course in result.courses:
        for k, time in enumerate(course.time_s):
            there = course.concentration_mol_l
            rows.append(
                [
                    *(course.temperature_k, float(time)),
                    *(float(there[name][k]) if name in there else 0.0 for name in names),
                    *_rate_cells(course, k, unit),
                ]
            )
        controls += [
            [course.temperature_k, float(time), what, species, defined(values[k])]
            for what, family in (("control", course.control), ("order", course.orders))
            for species, values in family.items()
            for k, time in enumerate(course.time_s)
        ]
        controls += [
            [course.temperature_k, float(time), "share of products", name, defined(share[k])]
            for name, share in course.product_share.items()
            for k, time in enumerate(course.time_s)
        ]
        controls += [
            [
                course.temperature_k,
                float(time),
                "Ea / kJ mol-1",
                f"constant {name}",
                defined(values[k]),
            ]
            for name, values in course.arrhenius_energy_constant_kj_mol.items()
            for k, time in enumerate(course.time_s)
        ]
        ratios: dict[str, FloatArray] = dict(course.quasi_steady_ratio)
        if course.quasi_steady_rate_ratio is not None:
            ratios["rate"] = course.quasi_steady_rate_ratio
        controls += [
            [course.temperature_k, float(time), "quasi-steady ratio", of, defined(values[k])]
            for of, values in ratios.items()
            for k, time in enumerate(course.time_s)
        ]
    head = [Column("T", "K"), Column("t", "s"), Column("what"), Column("species"), Column("value")]
    return [Table("time course", columns, rows), Table("control over time", head, controls)]


def _products(course: TimeCourse, shown: Sequence[int]) -> list[Block]:
    """Return how the products share what has been formed, and the excess of the first of two."""
    shares = course.product_share
    if not shares:
        return []
    columns = [Column("t", "s", "$t$", digits=3)]
    columns += [Column(f"share of {name}", decimals=4, whole=True) for name in shares]
    first, second = list(shares.values())[:2]
    pair = len(shares) == 2
    columns += [Column("excess", decimals=4)] if pair else []
    rows: list[list[Cell]] = []
    for k in shown:
        row: list[Cell] = [float(course.time_s[k])]
        row += [defined(share[k]) for share in shares.values()]
        row += [defined(first[k] - second[k])] if pair else []
        rows.append(row)
    note = "Shares of what has been formed of all products since the start."
    notes = (
        [note, f"excess: of {next(iter(shares))}, the difference of the two."] if pair else [note]
    )
    return [Table(f"Products at {kelvin(course.temperature_k)}", columns, rows, notes)]


def flow_tables(result: FlowState, unit: EnergyUnit, *, people: bool) -> list[Block]:
    """Return the tables of a flow."""
    shown = some(len(result.temperature_k), SHOWN_TIMES) if people else None
    every = range(len(result.temperature_k)) if shown is None else shown
    names = list(result.concentration_mol_l)
    if people:
        names = _most(result.concentration_mol_l, every)
    digits = 4 if people else None
    columns = [
        Column("T", "K"),
        *(Column(f"[{name}]", "mol L⁻¹", digits=digits, whole=people) for name in names),
    ]
    rows: list[list[Cell]] = [
        [float(result.temperature_k[k]), *(float(result.concentration_mol_l[n][k]) for n in names)]
        for k in every
    ]
    notes = [
        f"Residence time {result.residence_s:.4g} s; the steady state is that reached from "
        f"{result.started_from}."
    ]
    if result.rate_mol_l_s is not None and result.arrhenius_energy_kj_mol is not None:
        columns += [
            Column("rate", "mol L⁻¹ s⁻¹", digits=digits, whole=people),
            energy_column("Eₐ" if people else "Ea", unit, r"$E_\mathrm{a}$", whole=people),
        ]
        for row, k in zip(rows, every, strict=True):
            row += [
                defined(result.rate_mol_l_s[k]),
                in_unit(result.arrhenius_energy_kj_mol[k], unit),
            ]
        what = "formation" if result.forming else "loss"
        notes.append(f"rate: {what} of {result.followed} by reaction.")
    blocks: list[Block] = [
        Table("Steady state of the flow" if people else "flow", columns, rows, notes)
    ]
    if result.control:
        head = [
            Column("T", "K"),
            Column("what"),
            Column("species"),
            Column("value", decimals=4 if people else None),
        ]
        cells: list[list[Cell]] = [
            [float(result.temperature_k[k]), what, species, defined(values[k])]
            for k in (every if not people else some(len(result.temperature_k), CONTROL_COLUMNS))
            for what, family in (("control", result.control), ("order", result.orders))
            for species, values in family.items()
            if not people or abs(values[k]) >= SHOWN_CONTROL
        ]
        blocks.append(
            Table("Control of the flow" if people else "control of the flow", head, cells)
        )
    return [*blocks, " ".join(result.words)] if people else blocks


def _rate_cells(course: TimeCourse, k: int, unit: EnergyUnit) -> list[Cell]:
    if course.rate_mol_l_s is None:
        return [None, None, None]
    assert course.arrhenius_energy_kj_mol is not None
    assert course.order is not None
    return [
        defined(course.rate_mol_l_s[k]),
        in_unit(course.arrhenius_energy_kj_mol[k], unit),
        defined(course.order[k]),
    ]


def _both(course: TimeCourse) -> Mapping[str, FloatArray]:
    """Return E_a at constant concentration and pressure; empty where they are the same."""
    both = course.arrhenius_energy_constant_kj_mol
    first, last = list(both.values())[:1], list(both.values())[-1:]
    return {} if np.allclose(first, last, rtol=0.0, atol=1e-6, equal_nan=True) else both


def _most(concentrations: Mapping[str, FloatArray], shown: Sequence[int]) -> list[str]:
    """Return the species of which there is most at the times shown, in their own order."""
    places = list(shown)
    largest = sorted(concentrations, key=lambda name: -float(concentrations[name][places].max()))
    chosen = {*largest[:SHOWN_SPECIES]}
    return [name for name in concentrations if name in chosen]


def _quasi_steady(course: TimeCourse, shown: Sequence[int], unit: EnergyUnit) -> list[Block]:
    """Return the quasi-steady state beside the course."""
    if not course.quasi_steady_ratio:
        return []
    columns = [
        Column("t", "s", "$t$", digits=3),
        *(Column(f"[{name}] ratio", general=5) for name in course.quasi_steady_ratio),
    ]
    rows: list[list[Cell]] = [
        [float(course.time_s[k]), *(defined(v[k]) for v in course.quasi_steady_ratio.values())]
        for k in shown
    ]
    energies = course.quasi_steady_energy_kj_mol
    if course.quasi_steady_rate_ratio is not None and energies is not None:
        columns += [Column("rate ratio", general=5), energy_column("Eₐ", unit, r"$E_\mathrm{a}$")]
        for row, k in zip(rows, shown, strict=True):
            row += [defined(course.quasi_steady_rate_ratio[k]), in_unit(energies[k], unit)]
    notes = [
        "Ratio: quasi-steady over full, all other species as the course has them; Eₐ at that composition."
    ]
    title = f"Quasi-steady state at {kelvin(course.temperature_k)}"
    return [Table(title, columns, rows, notes)]


def _control(course: TimeCourse) -> list[Block]:
    """Return the controls at a few times."""
    if not course.control:
        return []
    shown = some(len(course.time_s), CONTROL_COLUMNS + 2)[1:-1] or [0]
    columns = [
        Column("State"),
        *(Column(f"t = {course.time_s[k]:.3g} s", decimals=4) for k in shown),
    ]
    rows: list[list[Cell]] = [
        [name, *(defined(values[k]) for k in shown)]
        for name, values in course.control.items()
        if np.any(np.abs(np.nan_to_num(values[shown])) >= SHOWN_CONTROL)
    ]
    return [Table(f"Control over time at {kelvin(course.temperature_k)}", columns, rows)]
