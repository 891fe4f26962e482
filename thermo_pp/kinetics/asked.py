"""What the kinetics needs of a study."""

from __future__ import annotations

from typing import TYPE_CHECKING, Protocol

if TYPE_CHECKING:
    from collections.abc import Mapping

    from thermo_pp.conditions import Conditions, Treatment
    from thermo_pp.errors import Finding
    from thermo_pp.mechanism import Mechanism
    from thermo_pp.species import SpeciesModel


class StudyLike(Protocol):
    """What the effective rate needs of a study."""

    @property
    def treatment(self) -> Treatment: ...  # noqa: D102
    @property
    def conditions(self) -> Conditions: ...  # noqa: D102
    @property
    def mechanism(self) -> Mechanism: ...  # noqa: D102
    @property
    def species(self) -> Mapping[str, SpeciesModel]: ...  # noqa: D102
    @property
    def findings(self) -> tuple[Finding, ...]: ...  # noqa: D102
