"""Options: sets that several commands share; each is a decorator and arrives as one object."""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from functools import wraps
from pathlib import Path
from typing import TYPE_CHECKING, Any, TypeVar

import click

from thermo_pp.errors import StudyError
from thermo_pp.names import (
    DEFAULT_LOW_MODES,
    DEFAULT_ONSET_CM,
    DEFAULT_STANDARD_STATE,
    ENERGY_UNITS,
    FORMATS,
    LOW_MODES,
    EnergyUnit,
    Format,
    LowModes,
)

if TYPE_CHECKING:
    from thermo_pp.collect import Collection
    from thermo_pp.conditions import StandardState, Treatment

Command = TypeVar("Command", bound=Callable[..., Any])
OUTPUTS = click.Path(exists=True, path_type=Path)


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


DEVIATION = click.option(
    "--deviation",
    metavar="ENERGY",
    help='Standard deviation of the electronic energies: "4 kJ/mol". Of saddle points too, unless '
    "they have their own.",
)
SADDLE_DEVIATION = click.option(
    "--saddle-deviation",
    metavar="ENERGY",
    help="Standard deviation of the electronic energies of saddle points.",
)
TIMES = click.option(
    "--time",
    "times",
    multiple=True,
    is_flag=False,
    flag_value="",
    metavar="[T]",
    callback=_times,
    help='Follow the study in time from [conditions] initial; at a time: 10 (s), "2 h". Repeatable.',
)
LEVEL = click.option(
    "--level", metavar="NAME", help="A named level of theory of the study, in place of its own."
)
STUDY = click.Path(exists=True, dir_okay=False, path_type=Path)


@dataclass(frozen=True)
class Treating:
    """What the treatment options say; None where an option is not given."""

    standard_state: StandardState | None
    low_modes: LowModes | None
    onset_cm: float | None
    frequency_scale: float | None

    def treatment(self) -> Treatment:
        """Return the defaults with what is given."""
        from thermo_pp.conditions import Treatment

        given = {name: value for name, value in vars(self).items() if value is not None}
        if "frequency_scale" in given:
            given["zero_point_scale"] = given["frequency_scale"]
        return Treatment(**given)

    def keys(self) -> dict[str, Any]:
        """Return what is given by the keys of a study's ``[treatment]``."""
        given = {
            "standard_state": None if self.standard_state is None else self.standard_state.text,
            "low_modes": self.low_modes,
            "onset": self.onset_cm,
            "frequency_scale": self.frequency_scale,
        }
        return {name: value for name, value in given.items() if value is not None}


@dataclass(frozen=True)
class Showing:
    """What the output options say."""

    format: Format
    energy_unit: EnergyUnit
    path: Path | None
    strict: bool
    quiet: bool
    columns: tuple[str, ...] = ()

    @property
    def wide(self) -> bool:
        """Whether the format is one that takes every temperature and all digits."""
        return self.format in ("csv", "xlsx")


def temperature_options(command: Command) -> Command:
    """Add -T and --temperature-range; the command gets `temperature_k`, a tuple of K, or None."""

    @click.option(
        "-T",
        "--temperature",
        "temperatures",
        multiple=True,
        metavar="T",
        callback=_temperatures,
        help='A temperature: 298.15 (K), "25 degC". Repeatable.',
    )
    @click.option(
        "--temperature-range",
        nargs=3,
        metavar="START STOP STEP",
        callback=_temperature_range,
        help="Temperatures from START to STOP, STOP included.",
    )
    @wraps(command)
    def with_temperatures(
        *args: Any,
        temperatures: tuple[float, ...] | None,
        temperature_range: tuple[float, ...] | None,
        **others: Any,
    ) -> Any:
        if temperatures and temperature_range:
            raise click.UsageError("give either --temperature or --temperature-range")
        return command(*args, temperature_k=temperatures or temperature_range, **others)

    return with_temperatures  # type: ignore[return-value]


def treatment_options(command: Command) -> Command:
    """Add the options of the treatment; the command gets `treating`."""

    @click.option(
        "--standard-state",
        metavar="STATE",
        callback=_standard_state,
        help='"1 bar", "1 atm", "1 mol/L" or any other pressure or concentration.  '
        f"[default: the study's, else {DEFAULT_STANDARD_STATE}]",
    )
    @click.option(
        "--low-modes",
        type=click.Choice(LOW_MODES),
        help=f"How soft modes are treated.  [default: the study's, else {DEFAULT_LOW_MODES}]",
    )
    @click.option(
        "--onset",
        metavar="WAVENUMBER",
        callback=_onset,
        help='Onset of that treatment: 100 (cm^-1), "50 cm^-1".  '
        f"[default: the study's, else {DEFAULT_ONSET_CM:g}]",
    )
    @click.option(
        "--frequency-scale",
        metavar="FACTOR",
        callback=_scale,
        help="Factor of all wavenumbers, zero-point energy included.  [default: the study's, else 1]",
    )
    @wraps(command)
    def with_treatment(
        *args: Any,
        standard_state: StandardState | None,
        low_modes: LowModes | None,
        onset: float | None,
        frequency_scale: float | None,
        **others: Any,
    ) -> Any:
        treating = Treating(standard_state, low_modes, onset, frequency_scale)
        return command(*args, treating=treating, **others)

    return with_treatment  # type: ignore[return-value]


def _names(context: click.Context, parameter: click.Parameter, value: str) -> tuple[str, ...]:
    """Take the names in a list with commas."""
    return tuple(name.strip() for name in value.split(",") if name.strip())


COLUMNS = click.option(
    "--columns",
    metavar="NAMES",
    default="",
    callback=_names,
    help='Show these columns only, in this order: "G,H,S". Not in json.',
)


def output_options(command: Command) -> Command:
    """Add the options of what is shown and where; the command gets `showing`."""

    @click.option(
        "--energy-unit",
        type=click.Choice(ENERGY_UNITS),
        default="kJ/mol",
        show_default=True,
        help="Unit of energies in tables; JSON names its units in its keys.",
    )
    @click.option(
        "--format",
        "format_name",
        type=click.Choice(FORMATS),
        default="table",
        show_default=True,
        help="How the answer is written.",
    )
    @click.option(
        "-o",
        "--output",
        "path",
        type=click.Path(dir_okay=False, path_type=Path),
        help="Write the answer to this file instead of standard output.",
    )
    @COLUMNS
    @click.option("--strict", is_flag=True, help="Let findings of severity error end the run.")
    @click.option("--quiet", is_flag=True, help="Write no findings and hints to standard error.")
    @wraps(command)
    def with_output(
        *args: Any,
        energy_unit: EnergyUnit,
        format_name: Format,
        path: Path | None,
        columns: tuple[str, ...],
        strict: bool,
        quiet: bool,
        **others: Any,
    ) -> Any:
        if format_name == "xlsx" and path is None:
            raise click.UsageError("--format xlsx needs -o FILE.xlsx")
        if columns and format_name == "json":
            raise click.UsageError("--columns is for tables; json has every key")
        showing = Showing(format_name, energy_unit, path, strict, quiet, columns)
        return command(*args, showing=showing, **others)

    return with_output  # type: ignore[return-value]


@dataclass(frozen=True)
class Collecting:
    """What the options of collecting say."""

    jobs: int | None
    cache: bool
    scheduler: str | None
    time_limit: float

    def collect(self, paths: Sequence[Path], showing: Showing) -> Collection:
        """Collect outputs, with a progress bar on standard error where that is a terminal."""
        from thermo_pp.audit import collect

        with _progress(paths, showing) as progress:
            return collect(
                paths,
                progress=progress,
                jobs=self.jobs,
                cache=self.cache,
                scheduler=self.scheduler,
                time_limit=self.time_limit,
            )


def collecting_options(command: Command) -> Command:
    """Add the options of how outputs are collected; the command gets `collecting`."""

    @click.option(
        "--jobs",
        type=click.IntRange(min=1),
        metavar="N",
        help="How many processes read the outputs.  [default: all cores]",
    )
    @click.option(
        "--no-cache",
        is_flag=True,
        help="Read every file; remember nothing of earlier runs and for later ones.",
    )
    @click.option(
        "--scheduler",
        metavar="ADDRESS",
        help="Let a running Dask cluster read the files: tcp://host:8786.",
    )
    @click.option(
        "--time-limit",
        type=click.FloatRange(min=0.0, min_open=True),
        default=60.0,
        show_default=True,
        metavar="SECONDS",
        help="Give up an output that takes longer (not on Windows, not on a cluster).",
    )
    @wraps(command)
    def with_collecting(
        *args: Any,
        jobs: int | None,
        no_cache: bool,
        scheduler: str | None,
        time_limit: float,
        **others: Any,
    ) -> Any:
        if jobs is not None and scheduler is not None:
            raise click.UsageError("give either --jobs or --scheduler")
        collecting = Collecting(jobs, not no_cache, scheduler, time_limit)
        return command(*args, collecting=collecting, **others)

    return with_collecting  # type: ignore[return-value]


@contextmanager
def _progress(paths: Sequence[Path], showing: Showing) -> Iterator[Callable[[int], None] | None]:
    """Give what is called with the number of files done, None where no bar is shown."""
    if showing.quiet or not sys.stderr.isatty():
        yield None
        return
    from thermo_pp.collect.walk import walk

    count = sum(isinstance(entry, Path) for entry in walk(paths))
    with click.progressbar(length=count, label="reading", show_pos=True, file=sys.stderr) as bar:
        yield lambda done: bar.update(done - bar.pos)


def _temperatures(
    ctx: click.Context, parameter: click.Parameter, value: tuple[str, ...]
) -> tuple[float, ...] | None:
    from thermo_pp.conditions import temperature

    return usage(lambda: tuple(temperature(number(text), where="--temperature") for text in value))


def _temperature_range(
    ctx: click.Context, parameter: click.Parameter, value: tuple[str, str, str] | None
) -> tuple[float, ...] | None:
    if value is None:
        return None
    from thermo_pp.conditions import temperature_range

    start, stop, step = (number(text) for text in value)
    return usage(lambda: temperature_range(start, stop, step, where="--temperature-range"))


def _standard_state(
    ctx: click.Context, parameter: click.Parameter, value: str | None
) -> StandardState | None:
    if value is None:
        return None
    from thermo_pp.conditions import standard_state

    return usage(lambda: standard_state(value, where="--standard-state"))


def _onset(ctx: click.Context, parameter: click.Parameter, value: str | None) -> float | None:
    return None if value is None else _positive(value, "1/cm", "--onset")


def _scale(ctx: click.Context, parameter: click.Parameter, value: str | None) -> float | None:
    return None if value is None else _positive(value, None, "--frequency-scale")


def energy_option(ctx: click.Context, parameter: click.Parameter, value: str) -> float:
    """Return the energy of an option, kJ/mol."""
    from thermo_pp.units import quantity

    return usage(lambda: quantity(number(value), "kJ/mol", where=f"{parameter.opts[0]}"))


def _positive(text: str, unit: str | None, where: str) -> float:
    """Return a number above 0, in `unit` (None: a pure number)."""
    import math

    from thermo_pp.units import quantity

    value = number(text)
    if unit is None:
        if isinstance(value, str) or not math.isfinite(value):
            raise click.BadParameter(f"{text!r} is not a number")
    else:
        value = usage(lambda: quantity(value, unit, where=where))
    if float(value) <= 0.0:
        raise click.BadParameter(f"{text!r} is not above 0")
    return float(value)


def number(text: str) -> float | str:
    """Return a bare number as a float, everything else (a quantity) untouched."""
    try:
        return float(text)
    except ValueError:
        return text


Value = TypeVar("Value")


def usage(make: Callable[[], Value]) -> Value:
    """Return what `make` makes of an option; what is wrong with it is wrong usage."""
    try:
        return make()
    except StudyError as error:
        raise click.BadParameter(f"{error.what}\n  mend: {error.mend}") from error
