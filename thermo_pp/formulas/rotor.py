"""The rigid rotor of a structure: its kind, its moments of inertia, its rotational temperatures."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.names import RotorKind
from thermo_pp.units import (
    ATOMIC_MASS_KG,
    BOLTZMANN_J_K,
    PLANCK_J_S,
)

FloatArray = NDArray[np.float64]

NO_SPIN_WEIGHTS = (1.0, 1.0)
LINEAR_ANGSTROM = 0.03
"""A structure is linear where no atom lies farther than this from its axis."""
_THETA_U_A2 = PLANCK_J_S**2 / (8.0 * math.pi**2 * BOLTZMANN_J_K * ATOMIC_MASS_KG * 1e-20)


@dataclass(frozen=True)
class RigidRotor:
    """A rigid rotor.

    Attributes
    ----------
    kind : {"atom", "linear", "nonlinear"}
    theta_k : tuple of float
        Rotational temperatures h c B / k, K, the largest first: none, one or three.
    symmetry_number : int
    quantum : bool
        Whether the level sum (linear) or the quantum correction (nonlinear) replaces the
        classical rotor.
    spin_weights : (float, float)
        Weights of even and odd levels in the level sum, their mean 1.
    distortion_k : float
        Centrifugal distortion h c D/k of a linear rotor, K.
    spin_shares : (float, float) or None
        Shares of the molecules in even and in odd levels where these do not turn into each other;
        None at equilibrium.
    """

    kind: RotorKind
    theta_k: tuple[float, ...]
    symmetry_number: int = 1
    quantum: bool = False
    spin_weights: tuple[float, float] = NO_SPIN_WEIGHTS
    distortion_k: float = 0.0
    spin_shares: tuple[float, float] | None = None

    def __post_init__(self) -> None:
        if len(self.theta_k) != {"atom": 0, "linear": 1, "nonlinear": 3}[self.kind]:
            raise ValueError(f"{len(self.theta_k)} rotational temperatures for rotor {self.kind!r}")
        if any(not theta > 0.0 for theta in self.theta_k) or self.symmetry_number < 1:
            raise ValueError("rotational temperatures and symmetry number must be above 0")


def rotational_temperatures(moments_u_a2: ArrayLike) -> FloatArray:
    """Return h^2 / (8 pi^2 I k) of each moment of inertia.

    Parameters
    ----------
    moments_u_a2 : shape (...)
        u A^2, above 0.

    Returns
    -------
    shape (...)
        K.
    """
    return np.asarray(_THETA_U_A2 / positive(moments_u_a2, "moment of inertia"))


def principal_moments(masses_u: ArrayLike, positions_angstrom: ArrayLike) -> FloatArray:
    """Return the three principal moments of inertia.

    Parameters
    ----------
    masses_u : shape (n,)
    positions_angstrom : shape (n, 3)

    Returns
    -------
    shape (3,)
        u A^2, ascending, never below 0.
    """
    return _inertia(masses_u, positions_angstrom)[0]


def rotor_kind(masses_u: ArrayLike, positions_angstrom: ArrayLike) -> RotorKind:
    """Tell an atom, a linear and a nonlinear structure apart.

    Linear means that no atom lies farther than `LINEAR_ANGSTROM` from the axis of the smallest
    moment of inertia.

    Parameters
    ----------
    masses_u : shape (n,)
    positions_angstrom : shape (n, 3)
    """
    x = np.asarray(positions_angstrom, dtype=np.float64)
    if len(x) == 1:
        return "atom"
    return "linear" if distance_from_axis(masses_u, x) <= LINEAR_ANGSTROM else "nonlinear"


def distance_from_axis(masses_u: ArrayLike, positions_angstrom: ArrayLike) -> float:
    """Return the largest distance of an atom from the axis of the smallest moment of inertia, A."""
    _, axes, x = _inertia(masses_u, positions_angstrom)
    across = x - np.outer(x @ axes[:, 0], axes[:, 0])
    return float(np.sqrt((across**2).sum(axis=1)).max())


def rigid_rotor(
    masses_u: ArrayLike, positions_angstrom: ArrayLike, symmetry_number: int = 1
) -> RigidRotor:
    """Return a structure's classical rotor; if linear, of the mean of the two large moments."""
    kind = rotor_kind(masses_u, positions_angstrom)
    if kind == "atom":
        return RigidRotor(kind, (), symmetry_number)
    moments = principal_moments(masses_u, positions_angstrom)
    if kind == "linear":
        moments = moments[1:].mean(keepdims=True)
    return RigidRotor(kind, tuple(rotational_temperatures(moments).tolist()), symmetry_number)


def _inertia(
    masses_u: ArrayLike, positions_angstrom: ArrayLike
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return moments, axes (columns) and the positions from the centre of mass."""
    m = positive(masses_u, "mass")
    x = np.asarray(positions_angstrom, dtype=np.float64)
    x = x - (m @ x) / m.sum()
    second = (x * m[:, np.newaxis]).T @ x
    moments, axes = np.linalg.eigh(np.trace(second) * np.eye(3) - second)
    return np.maximum(moments, 0.0), axes, x


def positive(value: ArrayLike, what: str) -> FloatArray:
    """Return a value as an array; ValueError where it is not above 0."""
    array = np.asarray(value, dtype=np.float64)
    if not np.all(array > 0.0):
        raise ValueError(f"{what} must be above 0, got {array[~(array > 0.0)].flat[0]}")
    return array
