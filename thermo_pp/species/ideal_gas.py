"""Ideal gas: shares of the kinds of motion and their sum, of one structure or a block of them."""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.conditions import Treatment
from thermo_pp.formulas.partition import Share, electronic, rotation, translation
from thermo_pp.formulas.rotor import NO_SPIN_WEIGHTS
from thermo_pp.formulas.torsion import HinderedRotor, TorsionShare, torsion
from thermo_pp.formulas.vibration import Vibration, vibration
from thermo_pp.names import LowModes, RotorKind
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class IdealGas:
    """What the shares of one structure are computed from.

    Of a block of b structures the arrays have axes (b, 1, ...).

    Attributes
    ----------
    mass_u : float or shape (b, 1)
    rotor : {"atom", "linear", "nonlinear"}
    theta_k : shape (k,) or (b, 1, k)
        Rotational temperatures, K: k is 0, 1 or 3.
    symmetry_number : int or shape (b, 1)
    quantum_rotor : bool
        The level sum or quantum correction replaces the classical rotor.
    spin_weights : (float, float)
        Of even and odd levels in the level sum.
    distortion_k : float
        Centrifugal distortion of a linear rotor, K.
    spin_shares : (float, float) or None
        Shares of even and odd levels that do not turn into each other; None at equilibrium.
    torsions : tuple of HinderedRotor
        In place of modes that are not among the wavenumbers; those of a block are the same.
    wavenumbers_cm : shape (m,) or (b, 1, m)
        Real modes only, above 0.
    degeneracies, levels_cm : shape (l,) or (b, 1, l)
        Electronic levels.
    hands : int or shape (b, 1)
        1, or 2 where both hands of a chiral structure are present.
    """

    mass_u: ArrayLike
    rotor: RotorKind
    theta_k: FloatArray
    symmetry_number: ArrayLike
    quantum_rotor: bool
    wavenumbers_cm: FloatArray
    degeneracies: FloatArray
    levels_cm: FloatArray
    hands: ArrayLike = 1
    spin_weights: tuple[float, float] = NO_SPIN_WEIGHTS
    distortion_k: float = 0.0
    spin_shares: tuple[float, float] | None = None
    torsions: tuple[HinderedRotor, ...] = ()

    def __post_init__(self) -> None:
        seal(self)


def seal(record: Any) -> None:
    """Make the arrays of a frozen record read-only."""
    for item in fields(record):
        value = getattr(record, item.name)
        if isinstance(value, np.ndarray):
            value.setflags(write=False)


class Shares(NamedTuple):
    """Shares of the kinds of motion at 1 bar, J/mol and J/(mol K), shape (t,) or (b, t)."""

    translation: Share
    rotation: Share
    vibration: Vibration
    electronic: Share
    handedness: FloatArray
    """R ln 2 where both hands are present, else 0: an entropy."""
    torsions: tuple[TorsionShare, ...]
    """Of each torsion, shape (t,)."""


class Totals(NamedTuple):
    """Sums at 1 bar, the electronic energy not included, shape (t,) or (b, t).

    Attributes
    ----------
    zero_point_j_mol : shape () or (b, 1)
        Of modes and torsions.
    enthalpy_j_mol : zero-point energy included
    entropy_j_mol_k, heat_capacity_j_mol_k
    slope_excess_j_mol : -T^2 d(G/T)/dT less the enthalpy, of the soft-mode treatment
    """

    zero_point_j_mol: FloatArray
    enthalpy_j_mol: FloatArray
    entropy_j_mol_k: FloatArray
    heat_capacity_j_mol_k: FloatArray
    slope_excess_j_mol: FloatArray


def shares(
    temperature_k: FloatArray, gas: IdealGas, treatment: Treatment, low_modes: LowModes
) -> Shares:
    """Return what each kind of motion adds.

    Parameters
    ----------
    temperature_k : shape (t,)
        K, above 0; for one structure any shape.
    gas : IdealGas
    treatment : Treatment
        Its onset and scale factors count.
    low_modes : one of `names.LOW_MODES`

    Returns
    -------
    Shares
    """
    return Shares(
        translation(temperature_k, gas.mass_u),
        rotation(
            temperature_k,
            gas.rotor,
            gas.theta_k,
            gas.symmetry_number,
            gas.quantum_rotor,
            gas.spin_weights,
            gas.distortion_k,
            gas.spin_shares,
        ),
        vibration(
            temperature_k,
            gas.wavenumbers_cm,
            low_modes,
            onset_cm=treatment.onset_cm,
            frequency_scale=treatment.frequency_scale,
            zero_point_scale=treatment.zero_point_scale,
        ),
        electronic(temperature_k, gas.degeneracies, gas.levels_cm),
        np.asarray(GAS_J_MOL_K * np.log(gas.hands)),
        tuple(torsion(temperature_k, rotor) for rotor in gas.torsions),
    )


def totals(part: Shares) -> Totals:
    """Return the sums over the kinds of motion."""
    moves = (part.translation, part.rotation, part.electronic)
    modes = part.vibration
    zero_point = modes.zero_point_j_mol.sum(axis=-1)
    enthalpy = modes.enthalpy_j_mol.sum(axis=-1) + zero_point
    entropy = modes.entropy_j_mol_k.sum(axis=-1) + part.handedness
    heat_capacity = modes.heat_capacity_j_mol_k.sum(axis=-1)
    for share in moves:
        enthalpy = enthalpy + share.enthalpy_j_mol
        entropy = entropy + share.entropy_j_mol_k
        heat_capacity = heat_capacity + share.heat_capacity_j_mol_k
    for turning in part.torsions:
        zero_point = zero_point + turning.zero_point_j_mol
        enthalpy = enthalpy + turning.enthalpy_j_mol + turning.zero_point_j_mol
        entropy = entropy + turning.entropy_j_mol_k
        heat_capacity = heat_capacity + turning.heat_capacity_j_mol_k
    excess = modes.slope_excess_j_mol
    # without interpolation it is a broadcast zero, which needs no sum
    slope = excess.sum(axis=-1) if any(excess.strides) else excess[..., :1].sum(axis=-1)
    return Totals(zero_point, enthalpy, entropy, heat_capacity, slope)
