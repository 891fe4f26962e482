"""What of the results the page holds: all of it, or less where that would be too much to open."""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping
from typing import Any

from thermo_pp.output.json_text import plain

MOST_BYTES = 8_000_000
"""Up to here the page holds all results; with the drawing library it stays below 10 MB."""
FEW = 6
"""A list of up to so many numbers keeps its place in the provenance of a smaller page."""

Results = dict[str, Any]


def contents(results: Mapping[str, Any], most: int = MOST_BYTES) -> tuple[str, list[str]]:
    """Return the results as JSON, and what was left away, in words.

    Nothing is rounded or worked out. Where the whole is too long, parts that the page can do without
    are left away one after another, until the rest is short enough.

    Parameters
    ----------
    results : mapping
        See `results_file.results_keys`.
    most : int
        Bytes.
    """
    kept: Results = plain(results)
    texts = {name: _text(value) for name, value in kept.items()}
    away: list[str] = []
    for what, lessen in LESS:
        if len(_joined(texts).encode("utf-8", "backslashreplace")) <= most:
            break
        changed = lessen(kept)
        lesser = {name: value for name, value in changed.items() if value != kept.get(name)}
        if lesser:
            kept |= lesser
            texts |= {name: _text(value) for name, value in lesser.items()}
            away.append(what)
    return _joined(texts), away


def _text(value: Any) -> str:
    """Return compact JSON that a script element can hold: no character of it can open a tag."""
    text = json.dumps(value, ensure_ascii=False, allow_nan=False, separators=(",", ":"))
    return text.replace("<", "\\u003c")


def _joined(texts: Mapping[str, str]) -> str:
    return "{" + ",".join(f"{_text(name)}:{text}" for name, text in texts.items()) + "}"


def _nothing_of(name: str) -> Callable[[Results], Results]:
    return lambda results: {name: None}


def _no_rows_of(name: str) -> Callable[[Results], Results]:
    return lambda results: {name: []}


def _species_without(*left_out: str) -> Callable[[Results], Results]:
    def lessen(results: Results) -> Results:
        return {"species": [_without(one, left_out) for one in results["species"]]}

    return lessen


def _without(one: Results, left_out: tuple[str, ...]) -> Results:
    return {name: value for name, value in one.items() if name not in left_out}


def _long_lists(results: Results) -> Results:
    def shortened(row: Results) -> Results:
        value = row["value"]
        if not isinstance(value, list) or len(value) <= FEW:
            return row
        return {**row, "value": "a list of numbers"}

    return {"provenance": [shortened(row) for row in results["provenance"]]}


def _map_ratios(results: Results) -> Results:
    regimes = results.get("regimes")
    if not regimes:
        return {}
    left_out = ("ratios", "windows", "windows_open")
    maps = {name: _without(one, left_out) for name, one in regimes["maps"].items()}
    return {"regimes": {**regimes, "maps": maps}}


def _own(key: str, own: Callable[[Results], str], *names: str) -> Callable[[Results], Results]:
    def lessen(results: Results) -> Results:
        wanted = own(results)
        return {name: [one for one in results[name] if one[key] == wanted] for name in names}

    return lessen


LESS: tuple[tuple[str, Callable[[Results], Results]], ...] = (
    (
        "shares, modes and functions of each species",
        _species_without("parts", "modes", "functions", "temperature_k", "slope_enthalpy_kj_mol"),
    ),
    ("the fitted gas phase", _nothing_of("gas_phase")),
    ("lists of numbers in the provenance (wavenumbers, positions, masses)", _long_lists),
    ("ratios and windows of the regime map", _map_ratios),
    (
        "profiles in other standard states",
        _own("standard_state", lambda results: results["standard_state"], "profiles"),
    ),
    ("what each choice is worth", _nothing_of("choices")),
    (
        "heat capacities of each species, and the spread over soft-mode treatments",
        _species_without("heat_capacity_j_mol_k", "low_mode_spread_kj_mol"),
    ),
    (
        "profiles and rates with other soft-mode treatments",
        _own(
            "low_modes", lambda results: results["treatment"]["low_modes"], "profiles", "barriers"
        ),
    ),
    ("energies part by part", _nothing_of("energies")),
    ("where every number came from", _no_rows_of("provenance")),
    ("the regime map", _nothing_of("regimes")),
    ("the species", _nothing_of("species")),
    ("the profile at the concentrations held", _nothing_of("profile_at_conditions")),
)
"""What is left away where the page would be too long, in this order."""
