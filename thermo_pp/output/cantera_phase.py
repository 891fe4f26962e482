"""A phase as Cantera's YAML: the text follows from the phase alone, digit by digit."""

from __future__ import annotations

import json
from collections.abc import Mapping

from thermo_pp import __version__
from thermo_pp.functions.phase import GasPhase, GasSpecies
from thermo_pp.names import PolynomialForm
from thermo_pp.output.tables import printable
from thermo_pp.units import BAR_PA

_MODELS: dict[PolynomialForm, str] = {"nasa7": "NASA7", "nasa9": "NASA9", "shomate": "Shomate"}


def cantera_text(phase: GasPhase) -> str:
    """Return the phase as a YAML file that Cantera loads.

    Names are JSON strings, which YAML reads as they stand whatever is in them. Numbers have all
    digits.
    """
    elements = {element for one in phase.species for element in _content(one)}
    lines = [
        f"description: {_quoted(_description(phase))}",
        f"generator: {_quoted(f'thermo_pp {__version__}')}",
        "phases:",
        f"- name: {_quoted(phase.title)}",
        "  thermo: ideal-gas",
        f"  elements: {_list(sorted(elements))}",
        f"  species: {_list([one.name for one in phase.species])}",
        f"  state: {{T: 298.15, P: {BAR_PA!r}}}",
        "species:",
    ]
    for one in phase.species:
        content = ", ".join(f"{_quoted(key)}: {count}" for key, count in _content(one).items())
        lines += [
            f"- name: {_quoted(one.name)}",
            f"  composition: {{{content}}}",
            "  thermo:",
            f"    model: {_MODELS[one.polynomial.form]}",
            f"    reference-pressure: {BAR_PA!r}",
            f"    temperature-ranges: {_numbers(one.polynomial.bounds_k)}",
            "    data:",
            *(f"    - {_numbers(row)}" for row in one.polynomial.coefficients.tolist()),
            f"    note: {_quoted(_note(one))}",
        ]
    return "\n".join(lines)


def _description(phase: GasPhase) -> str:
    """Return what a reader of the file must know, as one paragraph."""
    parts = [
        "Ideal gases at a reference pressure of 1 bar.",
        "H(298.15 K) of every species is its enthalpy of formation."
        if phase.of_formation
        else "Enthalpies are computed ones less, for each atom, "
        + _amounts(phase.per_element_kj_mol)
        + ": no enthalpies of formation, but the same differences in every balanced reaction.",
        "Molar masses are Cantera's average ones; masses of isotopes, where the calculation had "
        "them, are in the entropies only.",
    ]
    if any(one.fit.of_slope for one in phase.species):
        parts.append(
            "The soft-mode treatment breaks S = -dG/dT: G is kept, H and S are those of its slope."
        )
    return " ".join(parts)


def _note(one: GasSpecies) -> str:
    worst = one.fit.gibbs_kj_mol
    files = f"; from {', '.join(one.files)}" if one.files else "; declared"
    return (
        f"largest residual of G {worst.value:.2g} kJ/mol at {worst.temperature_k:.6g} K; computed "
        f"enthalpy plus {one.shift_kj_mol!r} kJ/mol{files}"
    )


def _amounts(values: Mapping[str, float]) -> str:
    return ", ".join(f"{element} {value!r} kJ/mol" for element, value in values.items())


def _content(one: GasSpecies) -> dict[str, int]:
    """Return atoms by element; a charge is a number of electrons, which Cantera calls E."""
    electrons = {"E": -one.charge} if one.charge else {}
    return {**one.composition, **electrons}


def _list(texts: list[str]) -> str:
    return f"[{', '.join(map(_quoted, texts))}]"


def _numbers(values: tuple[float, ...] | list[float]) -> str:
    return f"[{', '.join(map(repr, values))}]"


def _quoted(text: str) -> str:
    return json.dumps(printable(text), ensure_ascii=False)
