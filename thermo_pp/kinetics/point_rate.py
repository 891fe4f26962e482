"""A rate of a network that is not linear, at one point, with what controls it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from thermo_pp.kinetics.results import freeze_arrays

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class PointRate:
    """A rate over temperature, b temperatures.

    Attributes
    ----------
    log : shape (b,)
        ln of its size.
    sign : shape (b,)
        1, or -1 where the net reaction runs backwards.
    energy_j_mol : shape (b,)
        R T^2 d ln(rate)/dT.
    control : mapping of str to shape (b,)
        d ln(rate)/d(-G/RT), saddles first.
    saddles : tuple of str
    unit : str
    populations : mapping of str to shape (b,)
        Shares of a catalyst's states; empty where none is asked about.
    """

    log: FloatArray
    sign: FloatArray
    energy_j_mol: FloatArray
    control: Mapping[str, FloatArray]
    saddles: tuple[str, ...]
    unit: str
    populations: Mapping[str, FloatArray] = field(default_factory=dict)

    def __post_init__(self) -> None:
        freeze_arrays(self)

    @property
    def states(self) -> tuple[str, ...]:
        """The states of the catalyst."""
        return tuple(self.populations)

    @property
    def resting(self) -> NDArray[np.intp]:
        """Number of the state with the largest share, shape (b,)."""
        return np.asarray(np.argmax(np.stack(list(self.populations.values())), axis=0))
