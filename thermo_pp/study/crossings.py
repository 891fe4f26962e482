"""Crossings of the study file: steps that change the spin state, and the points they go through."""

from __future__ import annotations

from collections.abc import Sequence

from msgspec import UnsetType

from thermo_pp.errors import StudyError
from thermo_pp.rate_laws import Crossing
from thermo_pp.study.check import place
from thermo_pp.study.keys import CrossingKeys, LandauZenerKeys, Quantity, StepKeys
from thermo_pp.units import AVOGADRO_MOL, WAVENUMBER_KJ_MOL, quantity


def crossing_points(steps: Sequence[StepKeys], file: str) -> set[str]:
    """Return the species at which spin states cross.

    Raises
    ------
    StudyError
        One that another step goes through without crossing: its modes cannot be both.
    """
    through = {
        kind: {
            str(step.through): number
            for number, step in enumerate(steps)
            if isinstance(step.through, str) and (step.kind == "crossing") == kind
        }
        for kind in (True, False)
    }
    for name in through[True].keys() & through[False].keys():
        number = through[False][name]
        raise StudyError(
            f"{name} is the crossing point of another step, and here a saddle point",
            where=place(file, "steps", number, "through"),
            mend='write kind = "crossing" in both steps, or give each a point of its own',
        )
    return set(through[True])


def make_crossing(keys: StepKeys, where: str) -> Crossing | None:
    """Turn ``kind`` and ``crossing`` into a Crossing, None where the step is none.

    Raises
    ------
    StudyError
        One without the other, no crossing point, tunnelling on top, or not exactly one of
        transmission and landau_zener.
    """
    one = keys.crossing
    is_crossing = keys.kind == "crossing"
    if isinstance(one, CrossingKeys) != is_crossing:
        raise StudyError(
            "a crossing without its probability" if is_crossing else "the step is no crossing",
            where=f"{where} crossing",
            mend='write kind = "crossing" and crossing = { transmission = 0.01 }, or '
            "crossing = { landau_zener = { ... } }",
        )
    if not isinstance(one, CrossingKeys):
        return None
    at = f"{where} crossing"
    if not isinstance(keys.through, str):
        raise StudyError(
            "a crossing goes through no point",
            where=f"{where} through",
            mend='name the crossing point, a species of this file: through = "MECP"',
        )
    if keys.tunnelling in ("wigner", "eckart"):
        raise StudyError(
            "nothing tunnels at a crossing point",
            where=f"{where} tunnelling",
            mend="take the key out: the probability is that of crossing",
        )
    declared = isinstance(one.transmission, float | int)
    law = one.landau_zener
    if declared == isinstance(law, LandauZenerKeys):
        raise StudyError(
            "both transmission and landau_zener"
            if declared
            else "neither transmission nor landau_zener",
            where=at,
            mend="give exactly one of the two",
        )
    if isinstance(one.transmission, float | int):
        if one.transmission > 1.0:
            raise StudyError(
                f"the transmission {one.transmission:g} is above 1",
                where=f"{at}.transmission",
                mend="a probability is at most 1",
            )
        return Crossing(float(one.transmission))
    assert isinstance(law, LandauZenerKeys)
    given = {
        name: _above_zero(text, unit, f"{at}.landau_zener.{name}")
        for name, unit in (
            ("spin_orbit", "1/cm"),
            ("gradient_difference", "N"),
            ("reduced_mass", "kg"),
        )
        if not isinstance(text := getattr(law, name), UnsetType)
    }
    joule = given.pop("spin_orbit") * WAVENUMBER_KJ_MOL * 1000.0 / AVOGADRO_MOL
    if len(given) == 1:
        raise StudyError(
            f"{next(iter(given))} alone",
            where=f"{at}.landau_zener",
            mend="declare both gradient_difference and reduced_mass, or none of them: then both are "
            "those of the crossing point",
        )
    across = (given["gradient_difference"], given["reduced_mass"]) if given else None
    return Crossing(None, joule, across)


def _above_zero(text: Quantity, unit: str, where: str) -> float:
    """Return the size of a quantity; StudyError where it is 0."""
    value = abs(quantity(text, unit, where=where))
    if value == 0.0:
        raise StudyError(
            f"{where.rpartition('.')[2]} is 0", where=where, mend="write a value above 0"
        )
    return value
