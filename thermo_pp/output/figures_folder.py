"""The folder of figures: each one as SVG, PDF and PNG."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Literal

from thermo_pp.names import DEFINITIONS
from thermo_pp.output import figures
from thermo_pp.output.exports.structures import file_stem
from thermo_pp.output.figures.saving import FORMATS
from thermo_pp.output.notes import usual
from thermo_pp.study.answers import Answers

if TYPE_CHECKING:
    from matplotlib.figure import Figure

LAYERS: tuple[Literal["holding", "controlling", "resting"], ...] = (
    "holding",
    "controlling",
    "resting",
)


def write_figures(answers: Answers, folder: Path) -> None:
    """Write every figure that the answers have something for.

    Parameters
    ----------
    answers : Answers
    folder : Path
        Made where it is not there.
    """
    folder.mkdir(exist_ok=True)
    for name, figure in _drawn(answers):
        for form in FORMATS:
            figures.save(figure, folder / f"{name}.{form}")


def _drawn(answers: Answers) -> Iterator[tuple[str, Figure]]:
    if answers.profile is not None:
        figure, axes = figures.new_figure(width_mm=figures.PAGE_MM, height_mm=88.0, columns=2)
        figures.profile.draw_both(axes, answers.profile)
        yield "profile-enthalpy-gibbs", figure
        figure, (ax,) = figures.new_figure()
        figures.profile.draw(ax, answers.profile)
        yield "profile", figure
    yield from _of_rates(answers)
    yield from _of_regimes(answers)
    yield from _of_doubt(answers)
    yield from _of_measured(answers)
    for course in () if answers.transient is None else answers.transient.courses:
        figure, (ax,) = figures.new_figure()
        figures.courses.draw(ax, course)
        yield f"course-{course.temperature_k:g}K", figure
    ensembles = () if answers.ensembles is None else answers.ensembles.computed
    for place, ensemble in enumerate(ensembles, start=1):
        shares = {
            f"{number} {member.file}": ensemble.distribution.population[number - 1]
            for number, member in enumerate(ensemble.model.members, start=1)
        }
        figure, (ax,) = figures.new_figure()
        figures.populations.draw(ax, ensemble.result.temperature_k, shares)
        yield f"conformers-{file_stem(place, ensemble.model.name, None)}", figure


def _of_rates(answers: Answers) -> Iterator[tuple[str, Figure]]:
    effective = answers.effective
    if effective is None:
        return
    for definition in DEFINITIONS:
        rate = effective.rates.get(definition)
        if rate is None:
            continue
        figure, (ax,) = figures.new_figure()
        figures.rates.draw(ax, effective, definition, form="arrhenius")
        yield f"arrhenius-{definition}", figure
        figure, (ax,) = figures.new_figure()
        figures.rates.draw(ax, effective, definition, form="eyring")
        yield f"eyring-{definition}", figure
        figure, (ax,) = figures.new_figure()
        figures.controls.draw(ax, effective, definition)
        yield f"controls-{definition}", figure
        if rate.populations is not None:
            figure, (ax,) = figures.new_figure()
            figures.populations.of_rate(ax, effective, definition)
            yield f"populations-{definition}", figure


def _of_doubt(answers: Answers) -> Iterator[tuple[str, Figure]]:
    if answers.doubt is None:
        return
    k = usual(answers.doubt.temperature_k)
    for definition, rate in answers.doubt.rates.items():
        if definition == "relaxation":
            continue
        figure, (ax,) = figures.new_figure()
        figures.doubt.draw(
            ax,
            rate.spread.energies_kj_mol,
            rate.spread.negative_energy.value[k],
            nominal_kj_mol=rate.answer.arrhenius_energy_kj_mol[k],
        )
        yield f"doubt-{definition}", figure


def _of_measured(answers: Answers) -> Iterator[tuple[str, Figure]]:
    if answers.comparison is None:
        return
    for number, _ in enumerate(answers.comparison.curves, start=1):
        figure, (ax,) = figures.new_figure(height_mm=80.0)
        figures.measured.draw(ax, answers.comparison, number)
        yield f"measured-{number}", figure


def _of_regimes(answers: Answers) -> Iterator[tuple[str, Figure]]:
    if answers.regimes is None:
        return
    for definition, one in answers.regimes.maps.items():
        for layer in LAYERS if one.resting is not None else LAYERS[:-1]:
            figure, (ax,) = figures.new_figure()
            figures.regimes.of_map(ax, answers.regimes, definition, layer)
            yield f"regimes-{layer}-{definition}", figure
