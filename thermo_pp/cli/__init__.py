"""The command line: one thin module a command."""

from __future__ import annotations

from typing import Any

import click

from thermo_pp import __version__
from thermo_pp.cli.barrier import barrier
from thermo_pp.cli.choices import choices
from thermo_pp.cli.compare import compare
from thermo_pp.cli.conformers import conformers
from thermo_pp.cli.draft import draft
from thermo_pp.cli.functions import functions
from thermo_pp.cli.isotopes import isotopes
from thermo_pp.cli.profile import profile
from thermo_pp.cli.report import report
from thermo_pp.cli.species import species
from thermo_pp.cli.survey import survey
from thermo_pp.cli.sweep import sweep
from thermo_pp.errors import ThermoError

_SETTINGS = {"help_option_names": ["-h", "--help"], "max_content_width": 100}


class Program(click.Group):
    """All commands; an error of the user's data ends the run with status 1 and says the mend."""

    def invoke(self, ctx: click.Context) -> Any:
        """Run the command."""
        try:
            return super().invoke(ctx)
        except ThermoError as error:
            raise click.ClickException(str(error)) from error

    def list_commands(self, ctx: click.Context) -> list[str]:
        """Return the commands in the order in which they are used."""
        return list(self.commands)


@click.group(cls=Program, context_settings=_SETTINGS)
@click.version_option(__version__, prog_name="thermo-pp", message="%(prog)s %(version)s")
def main() -> None:
    """From quantum-chemistry outputs to the rate of a mechanism over temperature.

    Results go to standard output, findings and hints to standard error. Exit status: 0 done, 1 the
    data must be mended, 2 wrong usage.
    """


for _command in (
    survey,
    species,
    conformers,
    functions,
    draft,
    profile,
    choices,
    barrier,
    compare,
    isotopes,
    sweep,
    report,
):
    main.add_command(_command)
