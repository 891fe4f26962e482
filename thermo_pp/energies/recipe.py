"""Recipes: the energies of several species side by side, part by part."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from thermo_pp.audit.levels import level_findings, level_words
from thermo_pp.energies.counterpoise import SLOT as COUNTERPOISE
from thermo_pp.errors import Finding
from thermo_pp.records import Calculation
from thermo_pp.species.energy import ElectronicEnergy


@dataclass(frozen=True, eq=False)
class CheckedEnergy:
    """The energy of one structure, and the outputs that must be of one level for all species.

    Attributes
    ----------
    energy : ElectronicEnergy
    calculations : mapping of str to tuple of Calculation
        Place in the recipe -> outputs, each as the method that is used.
    findings : tuple of Finding
    ghosts : tuple of str
        Outputs whose ghost atoms are meant.
    """

    energy: ElectronicEnergy
    calculations: Mapping[str, tuple[Calculation, ...]]
    findings: tuple[Finding, ...] = ()
    ghosts: tuple[str, ...] = field(default=())

    @property
    def recipe(self) -> tuple[tuple[str, float], ...]:
        """Places and factors; without the counterpoise term, which only complexes have."""
        return tuple(
            (part.slot, part.factor) for part in self.energy.parts if part.slot != COUNTERPOISE
        )

    @property
    def words(self) -> str:
        """The level of theory in words: one output's in full, else the parts with their signs."""
        parts = self.energy.parts
        if len(parts) == 1 and parts[0].slot in self.calculations:
            return level_words(self.calculations[parts[0].slot][0]) or "not stated"
        words = parts[0].heading
        for part in parts[1:]:
            words += f" {part.heading}" if part.factor < 0.0 else f" + {part.heading}"
        details = {
            (level_words(calc) or "").partition(", ")[2]
            for calculations in self.calculations.values()
            for calc in calculations
        }
        return ", ".join([words, *details]).removesuffix(", ") if len(details) == 1 else words


def recipe_findings(energies: Mapping[str, CheckedEnergy], file: str) -> tuple[Finding, ...]:
    """Compare the energies of all species, each part with the same part of the others.

    Returns
    -------
    tuple of Finding
        ``mixed-recipe`` (error) where energies are put together in different ways; ``mixed-level``
        and ``unknown-level`` of every part.
    """
    found: list[Finding] = []
    recipes: dict[tuple[tuple[str, float], ...], list[str]] = {}
    for name, energy in energies.items():
        recipes.setdefault(energy.recipe, []).append(name)
    if len(recipes) > 1:
        groups = sorted(recipes.items(), key=lambda item: len(item[1]), reverse=True)
        words = "; ".join(
            f"{' '.join(_step(slot, factor) for slot, factor in recipe)} for {', '.join(names)}"
            for recipe, names in groups
        )
        found.append(
            Finding(
                "mixed-recipe",
                "error",
                file,
                None,
                f"the energies are not put together in one way: {words}",
                "give every species the same parts with the same factors",
            )
        )
    slots = dict.fromkeys(slot for one in energies.values() for slot in one.calculations)
    for slot in slots:
        calculations = [
            calc for one in energies.values() for calc in one.calculations.get(slot, ())
        ]
        found += level_findings(
            calculations, "energies" if slot == "energy" else f"energies ({slot})"
        )
    return tuple(found)


def _step(slot: str, factor: float) -> str:
    return slot if factor == 1.0 else f"{factor:g} {slot}"
