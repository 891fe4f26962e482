"""Mechanisms for tests, written as equations; compositions are letters that add up."""

from __future__ import annotations

from collections import Counter

from thermo_pp.conditions import Held, held
from thermo_pp.mechanism import Mechanism, Step, parse_equation

SULFUR = {"SO3": "So", "W": "w", "W2": "ww", "C1": "Sow", "C2": "Soww", "acid": "Sow"}
SULFUR |= {"TS1": "Sow", "TS2": "Soww"}
PLUME = (
    "W + W = W2",
    "SO3 + W = C1",
    "C1 + W = C2",
    "SO3 + W2 = C2",
    "C1 = acid | TS1",
    "C2 = acid + W | TS2",
)


def steps(*equations: str) -> tuple[Step, ...]:
    """Make steps of ``"A + B = C"`` (barrierless) and ``"A = B | TS"``."""
    made = []
    for number, text in enumerate(equations, start=1):
        equation, _, saddle = (part.strip() for part in text.partition("|"))
        where = f"study.toml [steps.{number}]"
        left, right = parse_equation(equation, where=where)
        made.append(
            Step(
                equation,
                left,
                right,
                through=saddle or None,
                barrierless=not saddle,
                where=where,
            )
        )
    return tuple(made)


def mechanism(
    *equations: str, letters: dict[str, str] | None = None, **question: object
) -> Mechanism:
    """Make a mechanism; without `letters` nothing has a composition."""
    composition = {name: dict(Counter(text)) for name, text in (letters or {}).items()}
    return Mechanism(steps(*equations), composition, where="study.toml", **question)  # type: ignore[arg-type]


def plume(**question: object) -> Mechanism:
    """Sulfur trioxide and water, as in the bundled study."""
    asked: dict[str, object] = {"reactant": "SO3", "products": ("acid",)}
    return mechanism(*PLUME, letters=SULFUR, **{**asked, **question})


def holding(**amounts: str) -> dict[str, Held]:
    """Make held amounts."""
    return {name: held(value, where="here") for name, value in amounts.items()}
