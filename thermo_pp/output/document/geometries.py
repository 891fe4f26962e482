"""Geometries: every structure of a study with its energy and modes, and all of them as one file."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from thermo_pp.data.elements import SYMBOLS
from thermo_pp.ensemble import Ensemble
from thermo_pp.output.document.model import Listing
from thermo_pp.output.tables import Cell, Column, Table, printable
from thermo_pp.species import SpeciesModel, Structure

_ACROSS = 8
"""Wavenumbers on a line."""


@dataclass(frozen=True)
class Shape:
    """One structure and what it is called.

    Attributes
    ----------
    name : str
        Of the species; a conformer has its number too.
    model : Structure
    """

    name: str
    model: Structure


def shapes(species: Mapping[str, SpeciesModel]) -> tuple[Shape, ...]:
    """Return every structure that was read, conformers one by one."""
    return tuple(shape for name, model in species.items() for shape in _of(name, model))


def _of(name: str, model: SpeciesModel) -> Iterator[Shape]:
    if isinstance(model, Structure):
        yield Shape(name, model)
    elif isinstance(model, Ensemble):
        for number, member in enumerate(model.members, start=1):
            yield from _of(f"{name}, conformer {number}", member.model)


def listing(shape: Shape) -> Listing:
    """Return a geometry in Å and the wavenumbers as read."""
    model = shape.model
    calculation = model.calculation
    spin = "" if model.multiplicity is None else f", multiplicity {model.multiplicity}"
    about = (
        f"{calculation.formula}, charge {model.charge}{spin}; E = {model.energy_hartree:.8f} Eₕ; "
        f"geometry of {calculation.path}, in Å"
    )
    lines = _atoms(shape)
    waves = calculation.wavenumbers_cm
    if waves is not None and len(waves):
        lines += ["", "wavenumbers / cm^-1"]
        text = [f"{value:9.2f}" for value in waves]
        lines += ["".join(text[k : k + _ACROSS]) for k in range(0, len(text), _ACROSS)]
    return Listing(shape.name, about + ".", tuple(lines))


def xyz(found: tuple[Shape, ...]) -> str:
    """Return all structures as extended XYZ, a frame each: name, energy in eV and in hartree.

    The energy in eV is under the usual key of that format, with ASE's own factor, so that programs
    that read it find what they expect; the one in hartree is untouched.
    """
    from ase.units import Hartree

    frames = []
    for shape in found:
        model = shape.model
        lines = _atoms(shape)
        spin = "" if model.multiplicity is None else f" multiplicity={model.multiplicity}"
        comment = (
            f"Properties=species:S:1:pos:R:3 name={_quoted(shape.name)} "
            f"kind={model.kind} charge={model.charge}{spin} "
            f"energy={model.energy_hartree * Hartree!r} energy_hartree={model.energy_hartree!r} "
            f'file={_quoted(model.calculation.path)} pbc="F F F"'
        )
        frames.append("\n".join([str(len(lines)), comment, *lines]))
    return "\n".join(frames)


def imaginary_modes(found: tuple[Shape, ...]) -> Table | None:
    """Return every imaginary mode; None where there is none."""
    rows: list[list[Cell]] = []
    for shape in found:
        waves = shape.model.calculation.wavenumbers_cm
        rows += [
            [shape.name, shape.model.kind, -float(value)]
            for value in (() if waves is None else waves)
            if value < 0.0
        ]
    if not rows:
        return None
    columns = [
        Column("Structure"),
        Column("kind"),
        Column("imaginary wavenumber", "cm⁻¹", decimals=2),
    ]
    return Table("Imaginary modes, as read", columns, rows)


def _atoms(shape: Shape) -> list[str]:
    calculation = shape.model.calculation
    return [
        f"{SYMBOLS[int(number)]:<2s}{x:15.8f}{y:15.8f}{z:15.8f}"
        for number, (x, y, z) in zip(
            calculation.numbers, calculation.positions_angstrom, strict=True
        )
    ]


def _quoted(text: str) -> str:
    """Return a value of the comment line in quotation marks."""
    return '"' + printable(text).replace("\\", "\\\\").replace('"', '\\"') + '"'
