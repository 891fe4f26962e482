"""Answers: the result to standard output or a file, findings to standard error, the status."""

from __future__ import annotations

import sys
from collections import Counter
from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

if TYPE_CHECKING:
    from thermo_pp.cli.options import Showing
    from thermo_pp.errors import Finding
    from thermo_pp.output.tables import Block


ALIKE = 3


def show(
    showing: Showing,
    findings: Sequence[Finding],
    blocks: Callable[[], Sequence[Block]],
    keys: Callable[[], Mapping[str, Any]],
    *,
    always: bool = False,
) -> None:
    """Show one result and its findings; under --strict those of severity error end the run.

    Parameters
    ----------
    showing : Showing
    findings : sequence of Finding
    blocks : callable
        Makes the tables, where a format needs them.
    keys : callable
        Makes the object of the JSON answer.
    always : bool
        The result is written even if --strict ends the run, and every finding is told.
    """
    show_text(showing, findings, lambda: _text(showing, blocks, keys), always=always)


def show_text(
    showing: Showing,
    findings: Sequence[Finding],
    text: Callable[[], str | bytes],
    *,
    always: bool = False,
) -> None:
    """Show a text that `text` makes, and findings, as `show` does."""
    say(showing, findings, every=always)
    if always:
        _write(showing, text())
    end_if_strict(showing, findings)
    if not always:
        _write(showing, text())


def end_if_strict(showing: Showing, findings: Sequence[Finding]) -> None:
    """End the run under --strict where there is a finding of severity error."""
    errors = sum(finding.severity == "error" for finding in findings)
    if showing.strict and errors:
        ending = "finding of severity error" if errors == 1 else "findings of severity error"
        raise click.ClickException(f"{errors} {ending} (--strict)")


def say(
    showing: Showing,
    findings: Sequence[Finding],
    *,
    every: bool = False,
    all_in: str = "--format json",
) -> None:
    """Write findings to standard error, unless --quiet.

    Parameters
    ----------
    showing : Showing
    findings : sequence of Finding
    every : bool
        Also those below the severity error that are like `ALIKE` others before.
    all_in : str
        What has all of them.
    """
    from thermo_pp.output.tables import printable

    if showing.quiet:
        return
    alike = Counter[tuple[str, str]]()
    for finding in findings:
        kind = (finding.severity, finding.code)
        alike[kind] += 1
        if alike[kind] > ALIKE and finding.severity != "error" and not every:
            continue
        place = f"{finding.where}: " if finding.where else ""
        text = f"{finding.severity}: {place}{finding.what} [{finding.code}]"
        click.echo(f"{printable(text)}\n  mend: {printable(finding.mend)}", err=True)
    for (severity, code), count in alike.items():
        if count > ALIKE and severity != "error" and not every:
            text = f"{severity}: {count - ALIKE} more like this; {all_in} has them all [{code}]"
            click.echo(text, err=True)


def hint(showing: Showing, text: str) -> None:
    """Write a hint to standard error, unless --quiet."""
    if not showing.quiet:
        click.echo(f"hint: {text}", err=True)


def names(paths: Sequence[Path]) -> str:
    """Return paths as a list in words."""
    return ", ".join(map(str, paths))


def _text(
    showing: Showing,
    blocks: Callable[[], Sequence[Block]],
    keys: Callable[[], Mapping[str, Any]],
) -> str | bytes:
    if showing.format == "json":
        from thermo_pp.output.json_text import json_text

        return json_text(keys())
    found = blocks()
    if showing.columns:
        from thermo_pp.cli.options import usage
        from thermo_pp.output.columns import check_columns, select

        usage(lambda: check_columns(found, showing.columns, where="--columns"))
        found = select(found, showing.columns)
    return _rendered(showing, found)


def _rendered(showing: Showing, blocks: Sequence[Block]) -> str | bytes:
    if showing.format == "csv":
        from thermo_pp.output.delimited import csv_text

        return csv_text(blocks)
    if showing.format == "xlsx":
        from thermo_pp.output.workbook import workbook

        return workbook(blocks)
    if showing.format == "latex":
        from thermo_pp.output.latex import latex, latex_document

        return latex_document(latex(blocks))
    if showing.format == "html":
        from thermo_pp.output.html import html_document

        return html_document(blocks, "thermo_pp")
    if showing.format == "markdown":
        from thermo_pp.output.plain import markdown

        return markdown(blocks)
    from thermo_pp.output.plain import terminal

    return terminal(blocks)


def _write(showing: Showing, text: str | bytes) -> None:
    from thermo_pp.output.files import write_file

    if showing.path is not None:
        write_file(showing.path, text)
        return
    assert isinstance(text, str)  # what has bytes has a path, see `output_options`
    encoding = sys.stdout.encoding or "utf-8"  # what it cannot show is written out
    click.echo(text.encode(encoding, "backslashreplace").decode(encoding))
