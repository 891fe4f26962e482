"""What of the results the page holds: all of it, or less where that would be too much to open."""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping
from typing import Any

from thermo_pp.output.json_text import plain

MOST_BYTES = 6_000_000
"""Up to here the page holds all results."""
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
    text, away = _text(kept), []
    for what, lessen in LESS:
        if len(text.encode("utf-8", "backslashreplace")) <= most:
            break
        lesser = lessen(kept)
        if lesser != kept:
            kept, text = lesser, _text(lesser)
            away.append(what)
    return text, away


def _text(results: Results) -> str:
    """Return compact JSON that a script element can hold: no character of it can open a tag."""
    text = json.dumps(results, ensure_ascii=False, allow_nan=False, separators=(",", ":"))
    return text.replace("<", "\\u003c")


def _without(*names: str) -> Callable[[Results], Results]:
    def lessen(results: Results) -> Results:
        return {**results, **{name: None for name in names if name in results}}

    return lessen


def _species_lists(results: Results) -> Results:
    left_out = ("parts", "modes", "functions", "temperature_k", "slope_enthalpy_kj_mol")
    return {
        **results,
        "species": [
            {name: value for name, value in one.items() if name not in left_out}
            for one in results["species"]
        ],
    }


def _long_lists(results: Results) -> Results:
    def shortened(row: Results) -> Results:
        value = row["value"]
        if not isinstance(value, list) or len(value) <= FEW:
            return row
        return {**row, "value": "a list of numbers"}

    return {**results, "provenance": [shortened(row) for row in results["provenance"]]}


def _own_state(results: Results) -> Results:
    own = results["standard_state"]
    return {
        **results,
        "profiles": [one for one in results["profiles"] if one["standard_state"] == own],
    }


def _own_treatment(results: Results) -> Results:
    own = results["treatment"]["low_modes"]
    return {
        **results,
        **{
            name: [one for one in results[name] if one["low_modes"] == own]
            for name in ("profiles", "barriers")
        },
    }


def _map_ratios(results: Results) -> Results:
    regimes = results.get("regimes")
    if not regimes:
        return results
    left_out = ("ratios", "windows", "windows_open")
    maps = {
        name: {key: value for key, value in one.items() if key not in left_out}
        for name, one in regimes["maps"].items()
    }
    return {**results, "regimes": {**regimes, "maps": maps}}


LESS: tuple[tuple[str, Callable[[Results], Results]], ...] = (
    ("modes, shares and functions of each species", _species_lists),
    ("the fitted gas phase", _without("gas_phase")),
    ("lists of numbers in the provenance (wavenumbers, positions, masses)", _long_lists),
    ("ratios and windows of the regime map", _map_ratios),
    ("what each choice is worth", _without("choices")),
    ("profiles in other standard states", _own_state),
    ("profiles and rates with other soft-mode treatments", _own_treatment),
    ("where every number came from", _without("provenance")),
    ("energies part by part", _without("energies")),
    ("the species", _without("species")),
)
"""What is left away where the page would be too long, in this order."""
