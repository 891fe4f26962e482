"""JSON: one object an answer, numbers never rounded."""

from __future__ import annotations

import json
import math
from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from thermo_pp.conditions import Treatment
from thermo_pp.errors import Finding

_AS_IT_IS = frozenset((str, int, bool, type(None)))


def json_text(answer: Mapping[str, Any]) -> str:
    """Return the answer as JSON text; what is not defined (nan in a result's field) is null."""
    import msgspec

    text = json.dumps(plain(answer), ensure_ascii=False, allow_nan=False)
    try:
        return msgspec.json.format(text, indent=1)  # many times as fast as `indent` of json
    except UnicodeEncodeError:  # a path with bytes that are no UTF-8
        return json.dumps(json.loads(text), indent=1, ensure_ascii=False)


def answer(
    command: str, findings: Sequence[Finding], treatment: Treatment | None, **keys: Any
) -> dict[str, Any]:
    """Return the object of one command: what all have in common, then `keys`.

    Parameters
    ----------
    command : str
        Its name; the answer's ``format`` is ``thermo-pp/<command>/1``.
    findings : sequence of Finding
    treatment : Treatment or None
        None where nothing was computed; ``treatment`` and ``standard_state`` are null then.
    """
    return {
        "format": f"thermo-pp/{command}/1",
        "treatment": None if treatment is None else treatment_keys(treatment),
        "standard_state": None if treatment is None else treatment.standard_state.text,
        **keys,
        "findings": [finding.as_dict() for finding in findings],
    }


def treatment_keys(treatment: Treatment) -> dict[str, Any]:
    """Return the keys of ``[treatment]`` but the standard state, with their units."""
    below = treatment.real_below_cm
    return {
        "phase": treatment.phase,
        "low_modes": treatment.low_modes,
        "onset_cm": treatment.onset_cm,
        "rotor": treatment.rotor,
        "masses": treatment.masses,
        "imaginary": "refuse" if below is None else {"real_below_cm": below},
        "frequency_scale": treatment.frequency_scale,
        "zero_point_scale": treatment.zero_point_scale,
        "tunnelling_scale": treatment.tunnelling_scale,
        "enantiopure": treatment.enantiopure,
        "entropy_correction_j_mol_k": treatment.entropy_correction_j_mol_k,
    }


def plain(value: Any) -> Any:
    """Return arrays as lists and numbers as Python's, None where not finite, all the way down."""
    if type(value) in _AS_IT_IS:
        return value
    if isinstance(value, np.ndarray):
        return plain(value.tolist())
    if isinstance(value, np.generic):
        value = value.item()
    if isinstance(value, float) and not math.isfinite(value):
        return None
    if isinstance(value, Mapping):
        return {str(key): plain(item) for key, item in value.items()}
    if isinstance(value, (list, tuple)):
        return [plain(item) for item in value]
    return value
