"""``thermo-pp barrier``: the effective rate and barrier, exact and approximate."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from thermo_pp.cli.answers import show
from thermo_pp.cli.options import (
    LEVEL,
    STUDY,
    TIMES,
    Showing,
    Treating,
    number,
    output_options,
    temperature_options,
    treatment_options,
)

if TYPE_CHECKING:
    from thermo_pp.kinetics.regime_map import RegimeQuestion
    from thermo_pp.output.tables import Block
    from thermo_pp.study.load import Study


def _regimes(study: Study, over: tuple[str, str, str] | None, points: int) -> RegimeQuestion | None:
    """Return the question of --regimes, None where it is not given."""
    if over is None:
        return None
    from thermo_pp.study.questions import regime_question

    name, low, high = over
    ends = number(low), number(high)
    return regime_question(study.conditions, name, *ends, points, "--regimes")


@click.command(short_help="The effective rate and barrier, and what controls them.")
@click.argument("study", type=STUDY)
@TIMES
@click.option(
    "--regimes",
    "over",
    nargs=3,
    metavar="NAME FROM TO",
    help='Map the regimes over a held amount: W 1e-6 1e-1 (mol/L), W "1 mbar" "50 mbar".',
)
@click.option(
    "--regime-points",
    type=click.IntRange(min=2),
    default=25,
    show_default=True,
    metavar="N",
    help="Points of that map along the amount.",
)
@click.option(
    "--doubt/--no-doubt",
    "doubting",
    default=None,
    help="Show how sure every answer is; as the study has [doubt] or not unless given.",
)
@temperature_options
@treatment_options
@LEVEL
@output_options
def barrier(
    study: Path,
    times: tuple[float, ...] | None,
    over: tuple[str, str, str] | None,
    regime_points: int,
    doubting: bool | None,
    temperature_k: tuple[float, ...] | None,
    treating: Treating,
    level: str | None,
    showing: Showing,
) -> None:
    """Give the effective rate and barrier of STUDY (a TOML file), and what controls them.

    The rate per free reactant, per pool, of relaxation or of the catalytic cycle, whichever apply:
    exact, beside the usual approximations and where these hold. Temperatures and treatment are the
    study's unless given here. A network that is not linear is followed in time from [conditions]
    initial, and a flow is solved for its steady state. Where several products compete, their ratios
    follow; with --regimes or [regimes] a map says which approximation holds, which state rests and
    which one controls where. With [doubt] in the study, how sure every answer
    is, and what other levels of theory and choices of treatment make of it.

    \b
    Example:
        thermo-pp barrier study.toml
        thermo-pp barrier study.toml --temperature-range 250 400 10 --format csv -o barrier.csv
        thermo-pp barrier study.toml --low-modes rotor-enthalpy --format json
        thermo-pp barrier study.toml --no-doubt
        thermo-pp barrier study.toml --time
        thermo-pp barrier study.toml --time "10 s" --time "1 h"
        thermo-pp barrier study.toml --regimes W 1e-6 1e-1
    """
    from thermo_pp.output import barrier as output
    from thermo_pp.output import barrier_tables, courses
    from thermo_pp.output import doubt as doubts
    from thermo_pp.output import regimes as regimes_output
    from thermo_pp.output import selectivity as selectivity_output
    from thermo_pp.output.notes import usual
    from thermo_pp.study.load import Study

    loaded = Study.load(study, temperatures=temperature_k, treatment=treating.keys(), level=level)
    result = loaded.effective()
    everything = showing.wide or showing.format == "json"
    kelvin = loaded.conditions.temperature_k
    if not everything:
        kelvin = (kelvin[usual(result.temperature_k)],)
    conditions = loaded.conditions
    alone = not any(result.rates.values())
    transient = None
    if times is not None or (alone and (conditions.initial or conditions.total)):
        transient = loaded.transient(times_s=times or (), temperature_k=kelvin)
    flow = loaded.flow() if conditions.flow is not None else None
    regimes = loaded.regimes(_regimes(loaded, over, regime_points))
    selectivity = loaded.selectivity(result)
    wanted = loaded.uncertainty is not None if doubting is None else doubting
    doubt = loaded.doubt() if wanted else None
    further = [one for one in (transient, flow, selectivity, doubt) if one is not None]
    findings = tuple(
        dict.fromkeys(
            (*loaded.findings, *result.findings, *(f for one in further for f in one.findings))
        )
    )
    treatment, unit = loaded.treatment, showing.energy_unit

    def blocks() -> list[Block]:
        if showing.wide:
            found = (
                output.wide(result, treatment, unit, loaded.levels)
                if not alone
                else [output.steps_wide(result, unit)]
            )
            found += [] if transient is None else courses.time_course_wide(transient, unit)
            found += [] if flow is None else courses.flow_tables(flow, unit, people=False)
            found += [] if selectivity is None else selectivity_output.wide(selectivity, unit)
            found += [] if regimes is None else regimes_output.wide(regimes, unit)
            found += [] if doubt is None else doubts.doubt_wide(doubt, unit)
            return found
        found = [] if transient is None else courses.time_course_tables(transient, unit)
        found += [] if flow is None else courses.flow_tables(flow, unit, people=True)
        return [
            *found,
            *barrier_tables.tables(
                result, treatment, unit, loaded.levels, regimes, selectivity, doubt
            ),
        ]

    show(
        showing,
        findings,
        blocks,
        lambda: output.keys(
            result, treatment, findings, transient, flow, regimes, selectivity, doubt
        ),
    )
