"""Chemical JSON (cjson) of Open Chemistry: Avogadro and other writers; geometry and vibrations.

Coordinates are in angstrom, frequencies in cm^-1. The format gives energies no unit (one writer has
eV, others hartree), so an energy is taken only where the file names its unit beside it; else a
finding says that it was left out. Frequencies may be 3N with null modes, imaginary ones negative.
Avogadro writes charge 0 and multiplicity 1 where it knows neither, so these two together say
nothing; its ``eigenVectors`` are mass-weighted or not, as the program had them it read.
"""

from __future__ import annotations

import re

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import SYMBOLS
from thermo_pp.errors import Finding
from thermo_pp.readers import mode_lists
from thermo_pp.readers.json_document import Document, decode
from thermo_pp.readers.text import Text
from thermo_pp.records import Calculation
from thermo_pp.sources import Source
from thermo_pp.units import CALORIE_J, EV_KJ_MOL, HARTREE_KJ_MOL

NAME = "cjson"
LOOKS_FOR = 'a JSON object with "chemicalJson" or "chemical json"'

FloatArray = NDArray[np.float64]

_SNIFF = re.compile(rb'"chemical ?json"\s*:\s*\d', re.IGNORECASE)
_MEND = "write the file again with the program that made it"
_ENERGIES = (
    ("properties", "totalEnergy"),
    ("properties", "total energy"),
    ("properties", "energy", "total"),
    ("properties", "energy"),
)
_UNITS = {
    "hartree": 1.0,
    "ev": EV_KJ_MOL / HARTREE_KJ_MOL,
    "kj/mol": 1.0 / HARTREE_KJ_MOL,
    "kcal/mol": CALORIE_J / HARTREE_KJ_MOL,
}
_UNIT_KEYS = ("unit", "units")
_CHARGES = (("properties", "totalCharge"), ("properties", "charge"))
_MULTIPLICITIES = (("properties", "totalSpinMultiplicity"), ("properties", "multiplicity"))


def sniff(head: bytes) -> bool:
    """Tell whether `head`, the first 64 KiB of a file, is Chemical JSON."""
    return head.removeprefix(b"\xef\xbb\xbf").lstrip()[:1] == b"{" and bool(_SNIFF.search(head))


def read(source: Source) -> Calculation:
    """Read one file; ReadError where it is damaged, periodic, or its modes do not fit its atoms."""
    document = decode(Text(source), mend=_MEND)
    numbers = _numbers(document)
    keys = ("atoms", "coords", "3d")
    positions = document.array(3 * len(numbers), *keys).reshape(-1, 3)
    for cell in ("unit cell", "unitCell"):
        if document.get(cell):
            raise document.error((cell,), "a periodic structure", mend="give a molecule")
    masses = mode_lists.most_abundant(numbers)
    where = {"positions_angstrom": document.line(*keys)}
    findings: list[Finding] = []
    energy, energy_keys = _energy(document)
    if energy is not None:
        where["energy_hartree"] = document.line(*energy_keys)
    elif energy_keys:
        findings.append(_without_unit(document, energy_keys))
    else:
        findings.append(mode_lists.no_energy(source.name, None, "there is no energy in this file"))
    wavenumbers, modes = _vibrations(document, masses, positions)
    kinds: tuple[str, ...] = () if energy is None else ("energy",)
    if wavenumbers is not None:
        where["wavenumbers_cm"] = document.line("vibrations", "frequencies")
        findings.append(mode_lists.masses_assumed(source.name, where["wavenumbers_cm"]))
        kinds = ("frequencies",)
    charge, multiplicity = _state(document, _CHARGES), _state(document, _MULTIPLICITIES)
    if (charge and charge[0], multiplicity and multiplicity[0]) == (0, 1):
        charge = multiplicity = None
    for name, state in (("charge", charge), ("multiplicity", multiplicity)):
        if state is not None:
            where[name] = document.line(*state[1])
    return Calculation(
        path=source.name,
        sha256=source.sha256,
        program="Chemical JSON",
        numbers=numbers,
        positions_angstrom=positions,
        masses_u=masses,
        masses_origin="derived",
        charge=None if charge is None else charge[0],
        multiplicity=None if multiplicity is None else multiplicity[0],
        energy_hartree=energy,
        wavenumbers_cm=wavenumbers,
        modes=modes,
        kind_of_job=kinds,
        where=where,
        findings=tuple(findings),
    )


def _numbers(document: Document) -> NDArray[np.int64]:
    keys = ("atoms", "elements", "number")
    values = document.items(*keys)
    if not values or not all(type(z) is int and 0 < z < len(SYMBOLS) for z in values):
        raise document.error(keys, "atoms.elements.number holds no atoms, or an atom of no element")
    return np.array(values, dtype=np.int64)


def _energy(document: Document) -> tuple[float | None, tuple[str, ...]]:
    """Return the energy and its keys: none without a unit, no keys where there is no energy."""
    for keys in _ENERGIES:
        value = document.get(*keys)
        if isinstance(value, dict):
            unit = next((value[key] for key in _UNIT_KEYS if key in value), None)
            if "value" in value:
                keys, value = (*keys, "value"), value["value"]
            elif isinstance(value.get("total"), int | float) and unit is not None:
                keys, value = (*keys, "total"), value["total"]
            else:
                continue
        elif keys[:-1] == ("properties", "energy"):
            unit = next((document.get(*keys[:-1], key) for key in _UNIT_KEYS), None)
            unit = unit or document.get(*keys[:-1], "units")
        else:
            unit = document.get(*keys[:-1], f"{keys[-1]}Unit")
        if value is None:
            continue
        number = document.number(*keys)
        if unit is None:
            return None, keys
        if not isinstance(unit, str) or unit.lower() not in _UNITS:
            raise document.error(
                keys, f"an energy in {str(unit)[:40]!r}, expected one of {', '.join(_UNITS)}"
            )
        return number * _UNITS[unit.lower()], keys
    return None, ()


def _without_unit(document: Document, keys: tuple[str, ...]) -> Finding:
    return Finding(
        "no-energy",
        "warning",
        document.text.source.name,
        document.line(*keys),
        f"{'.'.join(keys)} has no unit in this file and is left out: writers differ (hartree, eV)",
        'write {"value": ..., "unit": "hartree"}, or name the output of the program itself',
    )


def _vibrations(
    document: Document, masses: FloatArray, positions: FloatArray
) -> tuple[FloatArray | None, FloatArray | None]:
    keys = ("vibrations", "frequencies")
    if document.get(*keys) is None:
        return None, None
    count = len(document.items(*keys))
    values = document.array(count, *keys)
    try:
        keep = mode_lists.vibrations(values, masses, positions)
    except ValueError as error:
        raise document.error(keys, str(error)) from None
    vector_keys = ("vibrations", "eigenVectors")
    if not document.get(*vector_keys):
        return values[keep], None
    vectors = document.array(3 * len(masses) * count, *vector_keys).reshape(count, -1, 3)
    try:
        return values[keep], mode_lists.displacements(vectors[keep], masses)
    except ValueError as error:
        raise document.error(vector_keys, str(error)) from None


def _state(
    document: Document, places: tuple[tuple[str, ...], ...]
) -> tuple[int, tuple[str, ...]] | None:
    for keys in places:
        value = document.whole(*keys)
        if value is not None:
            return value, keys
    return None
