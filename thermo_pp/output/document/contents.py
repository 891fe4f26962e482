"""Contents: the supporting information of a study, from its answers."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from thermo_pp.mechanism import Step
from thermo_pp.names import EnergyUnit
from thermo_pp.output.barrier_tables import SAFETY
from thermo_pp.output.document.geometries import Shape, imaginary_modes, listing, shapes
from thermo_pp.output.document.methods import methods
from thermo_pp.output.document.model import (
    Document,
    Items,
    Listing,
    Paragraph,
    Piece,
    Section,
    cited,
)
from thermo_pp.output.document.references import REFERENCES
from thermo_pp.output.report_tables import shown
from thermo_pp.output.tables import Block, Cell, Column, Table
from thermo_pp.study.answers import Answers

_CAUTIONS = (
    SAFETY,
    "Computed free energies of activation are rarely better than several kJ/mol, and a rate constant at "
    "room temperature changes by a factor of ten with each 5.7 kJ/mol: where it was measured, defer to "
    "the measurement.",
    "The mechanism is the one that was written down. A step, a conformer or a complex that is missing "
    "from it is missing from every number here.",
)


def contents(
    answers: Answers, unit: EnergyUnit = "kJ/mol", columns: Sequence[str] = ()
) -> Document:
    """Return the supporting information of a study.

    Parameters
    ----------
    answers : Answers
    unit : str
        Of energies in tables.
    columns : sequence of str
        See `report_tables.shown`.
    """
    found = shapes(answers.study.species)
    tables = {one.name: one.people for one in shown(answers, unit, columns)}
    sections = [
        Section("Answers", _pieces([*_words(answers), *_some(tables, "profile", "barrier")])),
        Section("Methods", methods(answers)),
        Section("Mechanism", tuple(_mechanism(answers))),
        Section("Thermochemistry", _pieces(tables.get("species", []))),
        Section("Conformers", _pieces(tables.get("conformers", []))),
        Section("What each choice is worth", _pieces(tables.get("choices", []))),
        Section("Isotope effects", _pieces(tables.get("isotopes", []))),
        Section("Measured rates", _pieces(tables.get("compare", []))),
        Section("Energies and where they are from", tuple(_provenance(answers, found))),
        Section("Imaginary modes", _pieces([one for one in [imaginary_modes(found)] if one])),
        Section("Geometries", tuple(_geometries(found))),
        Section("Cautions", tuple(_cautions(answers))),
    ]
    kept = tuple(section for section in sections if section.pieces)
    title = f"Supporting information: {answers.study.title}"
    return Document(title, kept, tuple(REFERENCES[key] for key in cited(kept)))


def _words(answers: Answers) -> tuple[str, ...]:
    """Return a paragraph of every answer."""
    rates = (answers.effective, answers.selectivity, answers.regimes, answers.doubt)
    told = [part for part in (*rates, answers.transient, answers.flow) if part is not None]
    return tuple(" ".join(part.words) for part in told if part.words)


def _some(tables: dict[str, Sequence[Block]], *names: str) -> list[Block]:
    """Return the tables of answers; their words stand before them already."""
    return [block for name in names for block in tables.get(name, []) if isinstance(block, Table)]


def _pieces(blocks: Sequence[Block]) -> tuple[Piece, ...]:
    return tuple(Paragraph(block) if isinstance(block, str) else block for block in blocks)


def _mechanism(answers: Answers) -> Iterator[Piece]:
    steps = answers.study.mechanism.steps
    if not steps:
        return
    rows: list[list[Cell]] = [
        [number, step.equation, _way(step), step.tunnelling]
        for number, step in enumerate(steps, start=1)
    ]
    columns = [Column("Step"), Column("equation"), Column("way"), Column("tunnelling")]
    yield Table("Steps of the mechanism", columns, rows)
    conditions = answers.study.conditions
    for what, amounts in (
        ("Held at a constant free amount", conditions.held),
        ("There at the start", conditions.initial),
        ("Total amount", conditions.total),
        ("In the feed", {} if conditions.flow is None else conditions.flow.feed),
    ):
        if amounts:
            words = "; ".join(f"{name}: {amount.text}" for name, amount in amounts.items())
            yield Paragraph(f"{what}: {words}.")
    if conditions.flow is not None:
        yield Paragraph(f"Residence time {conditions.flow.residence_s:.10g} s.")
    kelvin = conditions.temperature_k
    yield Paragraph(
        f"{len(kelvin)} temperatures from {min(kelvin):.10g} K to {max(kelvin):.10g} K."
        if len(kelvin) > 1
        else f"Temperature {kelvin[0]:.10g} K."
    )


def _way(step: Step) -> str:
    if step.through is not None:
        return f"through {step.through}"
    if step.rate is not None:
        return "rate constant declared"
    return "no barrier" if step.height is None else "height declared or from a scan"


def _provenance(answers: Answers, found: tuple[Shape, ...]) -> Iterator[Piece]:
    rows: list[list[Cell]] = [
        [
            shape.name,
            part.heading,
            part.value_hartree,
            part.origin,
            file,
            line,
        ]
        for shape in found
        for part in shape.model.energy.parts
        for file, line in (
            zip(part.files, part.lines, strict=True)
            if part.files
            else [(str(answers.study.path), None)]
        )
    ]
    if rows:
        columns = [
            Column("Structure"),
            Column("part"),
            Column("value", "Eₕ", decimals=8),
            Column("origin"),
            Column("file"),
            Column("line"),
        ]
        note = "Value before the factor. A derived value stands on every line that names it."
        yield Table("Electronic energies", columns, rows, [note])
    modes: list[list[Cell]] = [
        [
            shape.name,
            shape.model.calculation.path,
            shape.model.calculation.where.get("wavenumbers_cm"),
            shape.model.calculation.masses_origin,
            shape.model.symmetry_origin,
        ]
        for shape in found
    ]
    if modes:
        columns = [
            *(Column("Structure"), Column("file"), Column("line of the modes")),
            *(Column("masses"), Column("symmetry number")),
        ]
        yield Table("Geometries and frequencies", columns, modes)
    torsions: list[list[Cell]] = [
        [shape.name, torsion.words] for shape in found for torsion in shape.model.torsions
    ]
    if torsions:
        yield Table("Torsions", [Column("Structure"), Column("treated as")], torsions)
    files: list[list[Cell]] = [
        [one.path, one.program, one.program_version, one.level, one.sha256]
        for one in answers.inputs
    ]
    columns = [*map(Column, ("File", "program", "version", "level", "SHA-256"))]
    yield Table("Files", columns, files)
    numbers: list[list[Cell]] = [[one.place, str(one.value), one.line] for one in answers.declared]
    if numbers:
        columns = [*map(Column, ("Key", "value", "line"))]
        yield Table(f"Declared in {answers.study.path}", columns, numbers)


def _geometries(found: tuple[Shape, ...]) -> Iterator[Listing]:
    yield from map(listing, found)


def _cautions(answers: Answers) -> Iterator[Piece]:
    yield from map(Paragraph, _CAUTIONS)
    if not answers.findings:
        return
    yield Paragraph("Findings of the audit:")
    yield Items(
        tuple(
            Paragraph(
                f"{finding.severity}, {finding.code}: "
                + (f"{finding.where}: " if finding.where else "")
                + f"{finding.what} (mend: {finding.mend})"
            )
            for finding in answers.findings
        )
    )
