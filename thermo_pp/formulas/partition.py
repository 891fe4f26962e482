"""Partition functions of an ideal gas: translation, rotation, electronic states; J/mol, J/(mol K).

Sources: McQuarrie, *Statistical Mechanics* (1976), and Herzberg II (1945), both from memory; the
algebra was derived and checked against CODATA's Sackur-Tetrode constant and against level sums.
Temperatures may have any shape; whatever belongs to a structure (mass, rotational temperatures,
symmetry number, levels) broadcasts against them, with its own last axis where it has one.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.formulas.rotor import NO_SPIN_WEIGHTS, RigidRotor, positive
from thermo_pp.names import RotorKind
from thermo_pp.units import (
    ATOMIC_MASS_KG,
    BAR_PA,
    BOLTZMANN_J_K,
    GAS_J_MOL_K,
    KELVIN_PER_CM,
    PLANCK_J_S,
)

FloatArray = NDArray[np.float64]

AUTO_TEMPERATURE_K = 298.15
AUTO_GIBBS_J_MOL = 10.0
"""The classical rotor is replaced where that changes G at `AUTO_TEMPERATURE_K` by more."""

SPIN_WEIGHTS: dict[int, tuple[float, float]] = {
    1: (1 / 2, 3 / 2),
    2: (4 / 3, 2 / 3),
    3: (1 / 2, 3 / 2),
}
"""Of even and odd rotational levels of H2, D2 and T2 by mass number: 1:3, 6:3 and 1:3, their mean 1.

No other rotor is light enough at ordinary temperatures for its nuclear spins to matter.
"""

_LEVELS_BELOW = 60.0
"""Rotor levels are summed up to this many kT: the rest is below 1e-23 of the sum."""


class Share(NamedTuple):
    """What one kind of motion adds to H, S and Cp.

    Attributes
    ----------
    enthalpy_j_mol : shape (...)
        J/mol; for translation with the pV term.
    entropy_j_mol_k, heat_capacity_j_mol_k : shape (...)
        J/(mol K); the heat capacity of translation at constant pressure.
    """

    enthalpy_j_mol: FloatArray
    entropy_j_mol_k: FloatArray
    heat_capacity_j_mol_k: FloatArray


def translation(temperature_k: ArrayLike, mass_u: ArrayLike) -> Share:
    """Return the share of translation of an ideal gas at 1 bar (Sackur-Tetrode).

    S = R [ln((2 pi m k T / h^2)^(3/2) k T / p) + 5/2],  H = 5/2 R T,  Cp = 5/2 R

    Another standard state is applied afterwards (`conditions.StandardState`).

    Parameters
    ----------
    temperature_k : shape (...)
        K, above 0.
    mass_u : broadcasts against it
        Mass of the molecule, u, above 0.

    Returns
    -------
    Share of shape (...)

    Raises
    ------
    ValueError
        At or below 0.
    """
    t, m = positive(temperature_k, "temperature"), positive(mass_u, "mass")
    volume = BOLTZMANN_J_K * t / BAR_PA
    log_q = 1.5 * np.log(2.0 * math.pi * ATOMIC_MASS_KG * m * BOLTZMANN_J_K * t / PLANCK_J_S**2)
    entropy = GAS_J_MOL_K * (log_q + np.log(volume) + 2.5)
    heat_capacity = np.full_like(entropy, 2.5 * GAS_J_MOL_K)
    return Share(heat_capacity * t, entropy, heat_capacity)


def linear_rotation(
    temperature_k: ArrayLike, theta_k: ArrayLike, symmetry_number: ArrayLike
) -> Share:
    """Return the share of a classical linear rotor.

    q = T/(sigma Theta),  H = R T,  S = R (ln q + 1),  Cv = R

    Parameters
    ----------
    temperature_k : shape (...)
    theta_k, symmetry_number : broadcast against it

    Returns
    -------
    Share of shape (...)
    """
    t, theta = positive(temperature_k, "temperature"), positive(theta_k, "rotational temperature")
    sigma = positive(symmetry_number, "symmetry number")
    entropy = GAS_J_MOL_K * (np.log(t / (theta * sigma)) + 1.0)
    heat_capacity = np.full_like(entropy, GAS_J_MOL_K)
    return Share(heat_capacity * t, entropy, heat_capacity)


def linear_rotation_levels(
    temperature_k: ArrayLike,
    theta_k: ArrayLike,
    symmetry_number: ArrayLike = 1.0,
    spin_weights: tuple[float, float] = NO_SPIN_WEIGHTS,
    distortion_k: float = 0.0,
    spin_shares: tuple[float, float] | None = None,
) -> Share:
    """Return the share of a linear rotor as the sum over its levels.

    q = (1/sigma) sum_J w_J (2J+1) exp(-[J(J+1) Theta - J^2 (J+1)^2 Delta]/T)

    With distortion the sum ends where the levels would begin to fall again. The symmetry number
    divides the whole sum, and w_J is 1 but for H2, D2 and T2, where without it H of H2 at 298 K
    would be 0.03 kJ/mol too low (even and odd levels in equilibrium).

    Parameters
    ----------
    temperature_k : shape (...)
    theta_k, symmetry_number : broadcast against it
    spin_weights : (float, float)
        w_J of even and odd J, their mean 1: the entropy of the nuclear spins themselves is left out.
    distortion_k : float
        Delta = h c D/k, K, not below 0.
    spin_shares : (float, float) or None
        Where even and odd levels do not turn into each other, the share of the molecules in each,
        together 1: S is that of the mixture, its entropy of mixing included.

    Returns
    -------
    Share of shape (...)
    """
    t, theta = positive(temperature_k, "temperature"), positive(theta_k, "rotational temperature")
    sigma = positive(symmetry_number, "symmetry number")
    widest = float(np.max(t, initial=1.0)) / float(np.min(theta, initial=1e6))
    count = math.ceil(math.sqrt(_LEVELS_BELOW * widest)) + 3
    if distortion_k > 0.0:
        # level j lies above level j - 1 where j^2 is below Theta/(2 Delta)
        count = min(count, int(math.sqrt(float(np.min(theta)) / (2.0 * distortion_k))) + 1)
    j = np.arange(count, dtype=np.float64)
    square = j * (j + 1.0)
    levels = theta[..., np.newaxis] * square - distortion_k * square**2
    degeneracy = (2.0 * j + 1.0) * np.where(j % 2.0 == 0.0, *spin_weights)
    if spin_shares is None:
        return level_share(t, degeneracy, levels, sigma)
    mixture = [np.zeros(()), np.zeros(()), np.zeros(())]
    for parity, share in enumerate(spin_shares):
        if share == 0.0:
            continue
        one = level_share(t, degeneracy[parity::2], levels[..., parity::2], sigma)
        mixture = [whole + share * part for whole, part in zip(mixture, one, strict=True)]
        mixture[1] = mixture[1] - GAS_J_MOL_K * share * math.log(share)
    return Share(*mixture)


def nonlinear_rotation(
    temperature_k: ArrayLike, theta_k: ArrayLike, symmetry_number: ArrayLike
) -> Share:
    """Return the share of a classical nonlinear rotor.

    q = (sqrt(pi)/sigma) sqrt(T^3/(A B C)),  H = 3/2 R T,  S = R (ln q + 3/2),  Cv = 3/2 R

    Parameters
    ----------
    temperature_k : shape (...)
    theta_k : shape (..., 3)
        Rotational temperatures, K; without the last axis it broadcasts against the temperatures.
    symmetry_number : broadcasts against the temperatures

    Returns
    -------
    Share of shape (...)
    """
    t, theta = positive(temperature_k, "temperature"), positive(theta_k, "rotational temperature")
    log_q = 0.5 * (np.log(math.pi) + 3.0 * np.log(t) - np.log(theta).sum(axis=-1))
    sigma = positive(symmetry_number, "symmetry number")
    entropy = GAS_J_MOL_K * (log_q - np.log(sigma) + 1.5)
    heat_capacity = np.full_like(entropy, 1.5 * GAS_J_MOL_K)
    return Share(heat_capacity * t, entropy, heat_capacity)


def nonlinear_correction(temperature_k: ArrayLike, theta_k: ArrayLike) -> Share:
    """Return what the leading quantum term adds to the classical nonlinear rotor.

    q = q_cl (1 + a/T),  a = (1/12) [2A + 2B + 2C - AB/C - BC/A - CA/B],
    dH = -R a/(1 + a/T),  dS = R ln(1 + a/T) + dH/T,  dCv = -R (a/(T + a))^2

    a is positive for every rigid body. It is the leading term: good where T is well above a.

    Parameters
    ----------
    temperature_k : shape (...)
    theta_k : shape (..., 3)

    Returns
    -------
    Share of shape (...)
    """
    t, theta = positive(temperature_k, "temperature"), positive(theta_k, "rotational temperature")
    product = theta.prod(axis=-1)
    a = (2.0 * theta.sum(axis=-1) - product * (theta**-2.0).sum(axis=-1)) / 12.0
    enthalpy = -GAS_J_MOL_K * a * t / (t + a)
    entropy = GAS_J_MOL_K * np.log1p(a / t) + enthalpy / t
    return Share(enthalpy, entropy, -GAS_J_MOL_K * (a / (t + a)) ** 2)


def rotation(
    temperature_k: ArrayLike,
    kind: RotorKind,
    theta_k: ArrayLike,
    symmetry_number: ArrayLike,
    quantum: bool,
    spin_weights: tuple[float, float] = NO_SPIN_WEIGHTS,
    distortion_k: float = 0.0,
    spin_shares: tuple[float, float] | None = None,
) -> Share:
    """Return the share of rigid rotors of one kind; nothing for atoms.

    Parameters
    ----------
    temperature_k : shape (...)
    kind : {"atom", "linear", "nonlinear"}
    theta_k : shape (..., 0), (..., 1) or (..., 3)
        Rotational temperatures, K; without the last axis it broadcasts against the temperatures.
    symmetry_number : broadcasts against the temperatures
    quantum : bool
        Level sum (linear) or quantum correction (nonlinear) in place of the classical rotor.
    spin_weights : (float, float)
        Of even and odd levels in the level sum.
    distortion_k, spin_shares
        Of the level sum, see `linear_rotation_levels`.

    Returns
    -------
    Share of shape (...)
    """
    t, theta = positive(temperature_k, "temperature"), np.asarray(theta_k, dtype=np.float64)
    if kind == "atom":
        none = np.zeros(np.broadcast_shapes(t.shape, theta.shape[:-1], np.shape(symmetry_number)))
        return Share(none, none, none)
    if kind == "linear":
        if quantum:
            return linear_rotation_levels(
                t, theta[..., 0], symmetry_number, spin_weights, distortion_k, spin_shares
            )
        return linear_rotation(t, theta[..., 0], symmetry_number)
    classical = nonlinear_rotation(t, theta, symmetry_number)
    if not quantum:
        return classical
    correction = nonlinear_correction(t, theta)
    return Share(*(one + two for one, two in zip(classical, correction, strict=True)))


def quantum_rotor_changes(rotor: RigidRotor) -> bool:
    """Tell whether leaving the classical rotor changes G at 298.15 K by more than 0.01 kJ/mol."""
    if rotor.kind == "atom":
        return False
    gibbs = []
    for quantum in (False, True):
        share = rotation(
            AUTO_TEMPERATURE_K,
            rotor.kind,
            rotor.theta_k,
            rotor.symmetry_number,
            quantum,
            rotor.spin_weights,
        )
        gibbs.append(float(share.enthalpy_j_mol - AUTO_TEMPERATURE_K * share.entropy_j_mol_k))
    return abs(gibbs[1] - gibbs[0]) > AUTO_GIBBS_J_MOL


def electronic(temperature_k: ArrayLike, degeneracies: ArrayLike, levels_cm: ArrayLike) -> Share:
    """Return the share of electronic states, counted from the level at 0.

    q = sum_i g_i exp(-e_i/kT),  U = N_A <e>,  S = R ln q + U/T,  Cv = (<e^2> - <e>^2)/(R T^2)

    Parameters
    ----------
    temperature_k : shape (...)
    degeneracies, levels_cm : shape (..., l)
        Degeneracies, above 0, and energies, cm^-1; without the last axis they broadcast against
        the temperatures.

    Returns
    -------
    Share of shape (...)
    """
    t, g = positive(temperature_k, "temperature"), positive(degeneracies, "degeneracy")
    return level_share(t, g, KELVIN_PER_CM * np.asarray(levels_cm, dtype=np.float64))


def level_share(
    temperature_k: FloatArray,
    degeneracies: FloatArray,
    theta_k: FloatArray,
    divisor: ArrayLike = 1.0,
) -> Share:
    """Return the share of levels (last axis) of `degeneracies` at `theta_k`, the sum over `divisor`."""
    x = theta_k / temperature_k[..., np.newaxis]
    terms = degeneracies * np.exp(-x)
    q = terms.sum(axis=-1)
    mean = (terms * x).sum(axis=-1) / q
    variance = (terms * (x - mean[..., np.newaxis]) ** 2).sum(axis=-1) / q
    return Share(
        np.asarray(GAS_J_MOL_K * temperature_k * mean),
        np.asarray(GAS_J_MOL_K * (np.log(q / np.asarray(divisor)) + mean)),
        np.asarray(GAS_J_MOL_K * variance),
    )
