"""Vibrations: oscillators and the four treatments of soft modes, per mode; J/mol and J/(mol K).

=================== =============================== =========================== ============
treatment           zero-point energy and U         S                           S = -dG/dT
=================== =============================== =========================== ============
``harmonic``        harmonic                        harmonic                    yes
``raised``          of max(v, w0)                   of max(v, w0)               yes
``rotor-entropy``   harmonic                        w S_osc + (1-w) S_rotor     no
``rotor-enthalpy``  w (zero-point + U) + (1-w) RT/2 w S_osc + (1-w) S_rotor     yes
=================== =============================== =========================== ============

Sources: raised, Ribeiro, Marenich, Cramer, Truhlar, J. Phys. Chem. B 2011, 115, 14556 (citation
from memory); rotor-entropy, Grimme, Chem. Eur. J. 2012, 18, 9955, doi 10.1002/chem.201200497;
rotor-enthalpy, Li, Gomes, Sharada, Bell, Head-Gordon, J. Phys. Chem. C 2015, 119, 1840, doi
10.1021/jp509921r.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.names import DEFAULT_ONSET_CM, LOW_MODES, LowModes
from thermo_pp.units import (
    BOLTZMANN_J_K,
    GAS_J_MOL_K,
    KELVIN_PER_CM,
    LIGHT_M_S,
    PLANCK_J_S,
)

FloatArray = NDArray[np.float64]

MEAN_INERTIA_KG_M2 = 1e-44
"""B_av of Grimme 2012, eq. 5; 602.2 u A^2."""
_ALPHA = 4  # Grimme 2012, eq. 8


class Vibration(NamedTuple):
    """What each mode adds.

    Where no temperature enters, the axes are those of the wavenumbers; else the temperature's too.

    Attributes
    ----------
    wavenumbers_cm : shape (..., m)
        The wavenumber of the thermal terms: scaled, and raised where the treatment raises it.
    weight : shape (..., m)
        Share w of the oscillator; 1 where the treatment does not interpolate.
    zero_point_j_mol : shape (..., m)
        As the treatment counts it (rotor-enthalpy: times w).
    enthalpy_j_mol : shape (..., m)
        U above the zero-point energy.
    entropy_j_mol_k, heat_capacity_j_mol_k : shape (..., m)
        The heat capacity is the temperature derivative of `enthalpy_j_mol`.
    slope_excess_j_mol : shape (..., m)
        -T^2 d(G/T)/dT less the enthalpy: 0 but for ``rotor-entropy``, there (1-w) T (R/2 - Cv).
    """

    wavenumbers_cm: FloatArray
    weight: FloatArray
    zero_point_j_mol: FloatArray
    enthalpy_j_mol: FloatArray
    entropy_j_mol_k: FloatArray
    heat_capacity_j_mol_k: FloatArray
    slope_excess_j_mol: FloatArray


def vibration(
    temperature_k: ArrayLike,
    wavenumbers_cm: ArrayLike,
    low_modes: LowModes = "harmonic",
    *,
    onset_cm: float = DEFAULT_ONSET_CM,
    mean_inertia_kg_m2: float = MEAN_INERTIA_KG_M2,
    frequency_scale: float = 1.0,
    zero_point_scale: float = 1.0,
) -> Vibration:
    """Return zero-point energy, U, S and Cv of each mode under a treatment of the soft ones.

    The onset is compared with the wavenumber of the term it enters: thermal terms take
    `frequency_scale` times the wavenumber, the zero-point energy `zero_point_scale` times it; w
    is of the former.

    Parameters
    ----------
    temperature_k : shape (...)
        K, above 0.
    wavenumbers_cm : shape (..., m)
        cm^-1, above 0; the caller removes imaginary modes. All axes but the last broadcast
        against the temperatures.
    low_modes : one of `names.LOW_MODES`
    onset_cm : float
        w0, cm^-1, above 0.
    mean_inertia_kg_m2 : float
        B_av of the free rotor.
    frequency_scale, zero_point_scale : float
        Above 0.

    Returns
    -------
    Vibration of shape (..., m)
        Sum the last axis for the total.

    Raises
    ------
    ValueError
        A value at or below 0, an unknown treatment.
    """
    if low_modes not in LOW_MODES:
        raise ValueError(f"low_modes {low_modes!r} is none of {', '.join(LOW_MODES)}")
    if min(onset_cm, mean_inertia_kg_m2, frequency_scale, zero_point_scale) <= 0.0:
        raise ValueError("onset, mean inertia and scale factors must be above 0")
    t = np.asarray(temperature_k, dtype=np.float64)[..., np.newaxis]
    nu = frequency_scale * np.asarray(wavenumbers_cm, dtype=np.float64)
    if not (np.all(t > 0.0) and np.all(nu > 0.0)):
        raise ValueError("temperatures and wavenumbers must be above 0")
    at_zero = nu if zero_point_scale == frequency_scale else nu * zero_point_scale / frequency_scale
    if low_modes == "raised":
        nu, at_zero = np.maximum(nu, onset_cm), np.maximum(at_zero, onset_cm)
    zero_point = 0.5 * GAS_J_MOL_K * KELVIN_PER_CM * at_zero
    enthalpy, entropy, heat_capacity = oscillator(t, nu)
    excess = np.broadcast_to(np.zeros((1,) * enthalpy.ndim), enthalpy.shape)
    if low_modes in ("harmonic", "raised"):
        one = np.ones_like(nu)
        return Vibration(nu, one, zero_point, enthalpy, entropy, heat_capacity, excess)
    w = oscillator_weight(nu, onset_cm)
    rest = 1.0 - w
    entropy *= w
    entropy += rest * rotor_entropy(t, nu, mean_inertia_kg_m2)
    half = 0.5 * GAS_J_MOL_K
    if low_modes == "rotor-entropy":
        excess = half - heat_capacity
        excess *= t
        excess *= rest
        return Vibration(nu, w, zero_point, enthalpy, entropy, heat_capacity, excess)
    enthalpy *= w
    enthalpy += rest * (half * t)
    heat_capacity *= w
    heat_capacity += half * rest
    return Vibration(nu, w, w * zero_point, enthalpy, entropy, heat_capacity, excess)


def oscillator(
    temperature_k: FloatArray, wavenumbers_cm: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return U above zero point, S and Cv of oscillators; the arguments broadcast as they are.

    With x = h c v/(k T) and the mean quantum number n = 1/(e^x - 1):
    U = R T x n,  S = R [x n + ln(1 + n)],  Cv = R x n (x + x n)

    Exact for soft modes (n large) and for stiff ones (n small); where e^x overflows n is 0.
    """
    x = np.asarray((KELVIN_PER_CM * wavenumbers_cm) * (1.0 / temperature_k))
    with np.errstate(over="ignore"):
        entropy = np.expm1(x)
    entropy = np.asarray(1.0 / entropy)  # n; worked on in place from here, memory is what costs
    energy = np.asarray(x * entropy)
    x += energy
    x *= energy
    x *= GAS_J_MOL_K
    np.log1p(entropy, out=entropy)
    entropy += energy
    entropy *= GAS_J_MOL_K
    energy *= GAS_J_MOL_K * temperature_k
    return energy, entropy, x


def oscillator_weight(wavenumbers_cm: FloatArray, onset_cm: float) -> FloatArray:
    """Return the share of the oscillator, w = 1/(1 + (w0/v)^4) (Grimme 2012, eq. 8)."""
    return np.asarray(1.0 / (1.0 + (onset_cm / wavenumbers_cm) ** _ALPHA))


def rotor_entropy(
    temperature_k: FloatArray, wavenumbers_cm: FloatArray, mean_inertia_kg_m2: float
) -> FloatArray:
    """Return the entropy of the free rotor that stands in for a soft mode (Grimme 2012, eqs. 4-6).

    S = R [1/2 + ln sqrt(8 pi^3 m' k T/h^2)],  m' = m B_av/(m + B_av),  m = h/(8 pi^2 c v); T
    dS/dT = R/2.
    """
    moment = PLANCK_J_S / (8.0 * math.pi**2 * 100.0 * LIGHT_M_S * wavenumbers_cm)
    reduced = moment * (mean_inertia_kg_m2 / (moment + mean_inertia_kg_m2))
    constant = 8.0 * math.pi**3 * BOLTZMANN_J_K / PLANCK_J_S**2
    # the logarithms of the mode and of the temperature apart, so that neither is taken for every
    # pair
    return np.asarray(
        GAS_J_MOL_K * (0.5 + 0.5 * (np.log(constant * reduced) + np.log(temperature_k)))
    )
