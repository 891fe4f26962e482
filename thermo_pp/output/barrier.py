"""The JSON answer and the CSV tables of ``barrier``; `barrier_tables` has those for people."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import asdict
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import Treatment
from thermo_pp.errors import Finding
from thermo_pp.kinetics.courses import Transient
from thermo_pp.kinetics.doubt.results import Doubt
from thermo_pp.kinetics.flow import FlowState
from thermo_pp.kinetics.product_ratio import Selectivity
from thermo_pp.kinetics.regime_map import Regimes
from thermo_pp.kinetics.results import Activation, Approximation, EffectiveRate, Rate, StepRate
from thermo_pp.names import DEFINITIONS, Constant, Definition, EnergyUnit
from thermo_pp.output.courses import flow_keys, time_course_keys
from thermo_pp.output.definitions import KEYS
from thermo_pp.output.doubt import doubt_keys
from thermo_pp.output.json_text import answer
from thermo_pp.output.notes import kelvin, of_treatment, stamp
from thermo_pp.output.regimes import keys as regimes_keys
from thermo_pp.output.selectivity import keys as selectivity_keys
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

_CONSTANT: tuple[Constant, ...] = ("concentration", "pressure")


def keys(
    effective: EffectiveRate,
    treatment: Treatment,
    findings: Sequence[Finding],
    transient: Transient | None = None,
    flow: FlowState | None = None,
    regimes: Regimes | None = None,
    selectivity: Selectivity | None = None,
    doubt: Doubt | None = None,
) -> dict[str, Any]:
    """Return the JSON answer."""
    rates = {name: effective.rates.get(name) for name in DEFINITIONS}
    return answer(
        "barrier",
        findings,
        treatment,
        temperature_k=effective.temperature_k,
        net_reaction=effective.net_reaction or None,
        reactant_coefficient=effective.reactant_coefficient,
        held_mol_l=effective.held_mol_l,
        constant=effective.constant,
        rates={KEYS[name]: rate and _rate(rate) for name, rate in rates.items()},
        steps=[vars(step) for step in effective.steps],
        time_course=transient and time_course_keys(transient),
        flow=flow and flow_keys(flow),
        regimes=regimes and regimes_keys(regimes),
        selectivity=selectivity and selectivity_keys(selectivity),
        doubt=doubt and doubt_keys(doubt),
        words=" ".join(all_words(effective, transient, flow, selectivity, regimes, doubt)),
    )


class _Told(Protocol):
    @property
    def words(self) -> tuple[str, ...]: ...


def all_words(*results: _Told | None) -> tuple[str, ...]:
    """Return the closing paragraph of everything that was worked out, a sentence each."""
    return tuple(word for result in results if result is not None for word in result.words)


def wide(
    effective: EffectiveRate, treatment: Treatment, unit: EnergyUnit, levels: Sequence[str] = ()
) -> list[Block]:
    """Return the tables for CSV and xlsx: rates, controls and orders, approximations, steps; full digits."""
    every = range(len(effective.temperature_k))
    rates = rates_of(effective)
    constants = [
        ("standard state", effective.standard_state),
        ("soft modes", treatment.low_modes),
    ]
    activation = _activation_columns(unit, "")
    standard = _activation_columns(unit, "standard ")
    columns = [
        *(Column("definition"), Column("T", "K"), Column("k"), Column("unit")),
        energy_column("Ea", unit),
        *activation,
        *standard,
        *(Column("slow share"), Column("next decay ratio")),
        *(Column("inverse mean time", "s⁻¹"), Column("headline", "s⁻¹"), Column("resting state")),
        *(Column("ln k of tunnelling"), energy_column("Ea of tunnelling", unit)),
        *(energy_column(f"Ea at constant {name}", unit) for name in _CONSTANT),
        *(Column("ln k of limits"), energy_column("Ea of limits", unit)),
    ]
    rows: list[list[Cell]] = [
        [
            *(name, float(effective.temperature_k[k]), defined(rate.rate_constant[k])),
            rate.unit,
            in_unit(rate.arrhenius_energy_kj_mol[k], unit),
            *activation_cells(rate.activation, k, unit),
            *activation_cells(rate.standard_activation, k, unit),
            *(cell_at(rate.slow_share, k), cell_at(rate.next_decay_ratio, k)),
            *(cell_at(rate.inverse_mean_time, k), cell_at(rate.headline, k)),
            None if rate.resting_state is None else rate.resting_state[k],
            *tunnelling_cells(rate, k, unit),
            *(
                None if not one else in_unit(one[name][k], unit)
                for one in [rate.arrhenius_energy_constant_kj_mol]
                for name in _CONSTANT
            ),
            cell_at(rate.log_limit, k),
            None
            if rate.limit_energy_kj_mol is None
            else in_unit(rate.limit_energy_kj_mol[k], unit),
        ]
        for name, rate in rates.items()
        for k in every
    ]
    controls: list[list[Cell]] = [
        [name, float(effective.temperature_k[k]), what, species, defined(values[k])]
        for name, rate in rates.items()
        for what, family in (
            ("control", rate.control),
            ("order", all_orders(rate, effective)),
            ("order as collider", rate.collider_orders),
            ("control without limits", rate.control_without_limit or {}),
        )
        for species, values in family.items()
        for k in every
    ]
    approximations: list[list[Cell]] = [
        [
            *(name, float(effective.temperature_k[k]), one.name),
            *(defined(one.rate_constant[k]), defined(one.ratio[k])),
        ]
        for name, rate in rates.items()
        for one in rate.approximations
        for k in every
    ]
    head = [Column("definition"), Column("T", "K")]
    blocks: list[Block] = [
        Table("rates", columns, rows, constants=constants),
        Table("control", [*head, Column("what"), Column("species"), Column("value")], controls),
        Table(
            "approximations",
            [*head, Column("approximation"), Column("k", "s⁻¹"), Column("ratio")],
            approximations,
        ),
        steps_wide(effective, unit),
    ]
    return about_all(blocks, [of_treatment(treatment), *levels, stamp()])


def all_orders(rate: Rate, effective: EffectiveRate) -> dict[str, FloatArray]:
    """Return the orders in held species, and in the total catalyst where that is no matter of course."""
    if rate.catalyst_order is None:
        return dict(rate.orders)
    return {**rate.orders, f"all {effective.subject}": rate.catalyst_order}


def steps_wide(effective: EffectiveRate, unit: EnergyUnit) -> Table:
    """Return the steps at every temperature, for CSV."""
    return steps_table(effective, range(len(effective.temperature_k)), unit, people=False)


def rates_of(effective: EffectiveRate) -> dict[Definition, Rate]:
    """Return the rates that apply, in their fixed order."""
    found = {name: effective.rates.get(name) for name in DEFINITIONS}
    return {name: rate for name, rate in found.items() if rate is not None}


def steps_table(
    effective: EffectiveRate, shown: Sequence[int], unit: EnergyUnit, *, people: bool
) -> Table:
    """Return the steps; units of k stand in cells, because they differ from step to step."""
    tunnels = any(step.tunnelling != "none" for step in effective.steps)
    columns = [
        *([] if people else [Column("T", "K")]),
        Column("Step"),
        Column("forward", digits=3),
        Column("unit"),
        Column("reverse", digits=3),
        Column("unit"),
        Column("reversibility", general=3),
        Column("limited"),
        *([] if not tunnels else [Column("ln κ", decimals=4), energy_column("Eₐ of κ", unit)]),
    ]
    rows: list[list[Cell]] = [
        [
            *([] if people else [float(effective.temperature_k[k])]),
            step.equation,
            defined(step.forward_rate_constant[k]),
            unit_heading(step.forward_unit),
            defined(step.reverse_rate_constant[k]),
            unit_heading(step.reverse_unit),
            defined(step.reversibility[k]),
            "yes" if step.limited[k] else "no",
            *([] if not tunnels else tunnelling_cells(step, k, unit)),
        ]
        for k in shown
        for step in effective.steps
    ]
    title = f"Steps at {kelvin(effective.temperature_k[shown[0]])}" if people else "steps"
    return Table(title, columns, rows)


def tunnelling_cells(found: Rate | StepRate, k: int, unit: EnergyUnit) -> list[Cell]:
    """Return tunnelling's share in ln k and in the Arrhenius energy at temperature `k`."""
    if found.log_tunnelling is None or found.tunnelling_energy_kj_mol is None:
        return [None, None]
    return [
        defined(found.log_tunnelling[k]),
        in_unit(found.tunnelling_energy_kj_mol[k], unit),
    ]


def activation_cells(activation: Activation | None, k: int, unit: EnergyUnit) -> list[Cell]:
    """Return H, S and G at temperature `k`."""
    if activation is None:
        return [None, None, None]
    return [
        in_unit(activation.enthalpy_kj_mol[k], unit),
        defined(activation.entropy_j_mol_k[k]),
        in_unit(activation.gibbs_kj_mol[k], unit),
    ]


def cell_at(values: FloatArray | None, k: int) -> float | None:
    """Return the value at temperature `k`, None where there is none."""
    return None if values is None else defined(values[k])


def _activation_columns(unit: EnergyUnit, kind: str) -> list[Column]:
    return [
        energy_column(f"{kind}H‡", unit),
        Column(f"{kind}S‡", ENTROPY_UNIT),
        energy_column(f"{kind}G‡", unit),
    ]


def _rate(rate: Rate) -> dict[str, Any]:
    standard = rate.standard_activation
    keys: dict[str, Any] = {
        "rate_constant": rate.rate_constant,
        "unit": rate.unit,
        "arrhenius_energy_kj_mol": rate.arrhenius_energy_kj_mol,
        **_activation(rate.activation),
        "standard_activation": None if standard is None else _activation(standard),
        "sign_changes": [asdict(change) for change in rate.sign_changes],
        "control": rate.control,
        "sign_shift_kj_mol": rate.sign_shift_kj_mol,
        "orders": rate.orders,
        **{
            f"arrhenius_energy_constant_{name}_kj_mol": values
            for name, values in rate.arrhenius_energy_constant_kj_mol.items()
        },
        "approximations": [_approximation(one) for one in rate.approximations],
    }
    if rate.definition == "pool":
        for name in ("slow_share", "next_decay_ratio", "inverse_mean_time", "headline"):
            keys[name] = getattr(rate, name)
    if rate.collider_orders:
        keys["collider_orders"] = rate.collider_orders
    optional = (
        *("catalyst_order", "log_tunnelling", "tunnelling_energy_kj_mol"),
        *("log_limit", "limit_energy_kj_mol", "control_without_limit"),
    )
    for name in ("resting_state", "populations", "branching", *optional):
        if getattr(rate, name) is not None:
            keys[name] = getattr(rate, name)
    return keys


def _activation(activation: Activation) -> dict[str, Any]:
    return {f"activation_{name}": value for name, value in vars(activation).items()}


def _approximation(approximation: Approximation) -> dict[str, Any]:
    keys: dict[str, Any] = {
        "name": approximation.name,
        "rate_constant": approximation.rate_constant,
        "ratio": approximation.ratio,
        "windows_k": [[window.from_k, window.to_k] for window in approximation.windows],
        "windows_open": [
            [window.open_below, window.open_above] for window in approximation.windows
        ],
    }
    for name in ("determining_saddle", "determining_state"):
        if getattr(approximation, name) is not None:
            keys[name] = getattr(approximation, name)
    return keys
