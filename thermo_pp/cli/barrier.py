"""``thermo-pp barrier``: the effective rate and barrier, exact and approximate."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from thermo_pp.cli.answers import show
from thermo_pp.cli.options import (
    LEVEL,
    STUDY,
    Showing,
    Treating,
    number,
    output_options,
    temperature_options,
    treatment_options,
    usage,
)

if TYPE_CHECKING:
    from thermo_pp.output.tables import Block


def _times(
    ctx: click.Context, parameter: click.Parameter, value: tuple[str, ...]
) -> tuple[float, ...] | None:
    """Return the times in s, none where the whole course is asked for; None without the option."""
    if not value:
        return None
    return tuple(_seconds(text) for text in value if text)


def _seconds(text: str) -> float:
    from thermo_pp.units import quantity

    return usage(lambda: quantity(number(text), "s", where="--time"))


@click.command(short_help="The effective rate and barrier, and what controls them.")
@click.argument("study", type=STUDY)
@click.option(
    "--time",
    "times",
    multiple=True,
    is_flag=False,
    flag_value="",
    metavar="[T]",
    callback=_times,
    help='Follow the study in time from [conditions] initial; at a time: 10 (s), "2 h". Repeatable.',
)
@temperature_options
@treatment_options
@LEVEL
@output_options
def barrier(
    study: Path,
    times: tuple[float, ...] | None,
    temperature_k: tuple[float, ...] | None,
    treating: Treating,
    level: str | None,
    showing: Showing,
) -> None:
    """Give the effective rate and barrier of STUDY (a TOML file), and what controls them.

    The rate per free reactant, per pool, of relaxation or of the catalytic cycle, whichever apply:
    exact, beside the usual approximations and where these hold. Temperatures and treatment are the
    study's unless given here. A network that is not linear is followed in time from [conditions]
    initial, and a flow is solved for its steady state.

    \b
    Example:
        thermo-pp barrier study.toml
        thermo-pp barrier study.toml --temperature-range 250 400 10 --format csv -o barrier.csv
        thermo-pp barrier study.toml --low-modes rotor-enthalpy --format json
        thermo-pp barrier study.toml --time
        thermo-pp barrier study.toml --time "10 s" --time "1 h"
    """
    from thermo_pp.output import barrier as output
    from thermo_pp.output import barrier_tables, courses
    from thermo_pp.output.notes import usual
    from thermo_pp.study.load import Study

    loaded = Study.load(study, temperatures=temperature_k, treatment=treating.keys(), level=level)
    result = loaded.effective()
    everything = showing.format in ("csv", "json")
    kelvin = loaded.conditions.temperature_k
    if not everything:
        kelvin = (kelvin[usual(result.temperature_k)],)
    conditions = loaded.conditions
    alone = not any(result.rates.values())
    transient = None
    if times is not None or (alone and (conditions.initial or conditions.total)):
        transient = loaded.transient(times_s=times or (), temperature_k=kelvin)
    flow = loaded.flow() if conditions.flow is not None else None
    further = [one for one in (transient, flow) if one is not None]
    findings = tuple(
        dict.fromkeys(
            (*loaded.findings, *result.findings, *(f for one in further for f in one.findings))
        )
    )
    treatment, unit = loaded.treatment, showing.energy_unit

    def blocks() -> list[Block]:
        if showing.format == "csv":
            found = (
                output.wide(result, treatment, unit)
                if not alone
                else [output.steps_wide(result, unit)]
            )
            found += [] if transient is None else courses.time_course_wide(transient, unit)
            found += [] if flow is None else courses.flow_tables(flow, unit, people=False)
            return found
        found = [] if transient is None else courses.time_course_tables(transient, unit)
        found += [] if flow is None else courses.flow_tables(flow, unit, people=True)
        return [*found, *barrier_tables.tables(result, treatment, unit, loaded.levels)]

    show(
        showing,
        findings,
        blocks,
        lambda: output.keys(result, treatment, findings, transient, flow),
    )
