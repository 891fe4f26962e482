"""The level of theory of an energy, as a reader of text outputs finds it."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Level:
    """The level of theory of an energy, as the file has it; what it does not say is None.

    `at` has the byte offset at which each of the fields that are known stands.
    """

    method: str | None
    basis: str | None
    dispersion: str | None
    solvent: str | None
    grid: str | None
    frozen_core: str | None
    at: dict[str, int]

    @property
    def words(self) -> str:
        """Method and basis set."""
        return "/".join(part for part in (self.method, self.basis) if part)
