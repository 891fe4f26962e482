"""Isotope ratios: reduced partition functions of Bigeleisen and Mayer, the product rule beside them.

Source: J. Bigeleisen, M. G. Mayer, J. Chem. Phys. 1947, 15, 261; the product rule of Teller and
Redlich is O. Redlich, Z. Phys. Chem. B 1935, 28, 371 (all from memory).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.formulas.rotor import principal_moments, rotor_kind
from thermo_pp.units import KELVIN_PER_CM

FloatArray = NDArray[np.float64]


def log_reduced_ratio(
    temperature_k: ArrayLike,
    light_cm: ArrayLike,
    heavy_cm: ArrayLike,
    *,
    frequency_scale: float = 1.0,
    zero_point_scale: float = 1.0,
) -> FloatArray:
    """Return ln of the reduced partition function ratio (s/s')f of a heavy over a light isotopologue.

    (s/s')f = prod_i (u_h/u_l) exp(-(u_h - u_l)/2) (1 - exp(-u_l))/(1 - exp(-u_h)),  u = h c nu/kT

    The quantum partition function ratio over the classical one: symmetry numbers are not in it, and
    it is 1 where kT is large. Of a saddle point the reaction coordinate is left out, and the rate
    constants then are as k_light/k_heavy = (nu_light/nu_heavy) prod f(reactants)/f(saddle).

    Parameters
    ----------
    temperature_k : shape (...)
        K, above 0.
    light_cm, heavy_cm : shape (m,)
        Wavenumbers, cm^-1, above 0.
    frequency_scale, zero_point_scale : float
        Factors of the wavenumbers in thermal terms and in the zero-point energy.

    Returns
    -------
    shape (...)

    Raises
    ------
    ValueError
        Not as many modes, or one that is not above 0.
    """
    t = np.asarray(temperature_k, dtype=np.float64)[..., np.newaxis]
    light = np.sort(np.asarray(light_cm, dtype=np.float64))
    heavy = np.sort(np.asarray(heavy_cm, dtype=np.float64))
    if light.shape != heavy.shape:
        raise ValueError(f"{light.size} and {heavy.size} modes of isotopologues")
    if np.any(light <= 0.0) or np.any(heavy <= 0.0) or np.any(t <= 0.0):
        raise ValueError("wavenumbers and temperatures must be above 0")
    u_light, u_heavy = KELVIN_PER_CM * light / t, KELVIN_PER_CM * heavy / t
    occupied = np.log(-np.expm1(-frequency_scale * u_light))
    occupied -= np.log(-np.expm1(-frequency_scale * u_heavy))
    terms = np.log(heavy / light) - 0.5 * zero_point_scale * (u_heavy - u_light) + occupied
    return np.asarray(terms.sum(axis=-1))


def log_product_residual(
    positions_angstrom: ArrayLike,
    light_u: ArrayLike,
    heavy_u: ArrayLike,
    light_cm: ArrayLike,
    heavy_cm: ArrayLike,
) -> float:
    """Return by how much the wavenumbers of two isotopologues miss the product rule.

    prod_i (nu_h/nu_l) = prod_atoms (m_l/m_h)^(3/2) (M_h/M_l)^(3/2) (prod I_h/prod I_l)^(1/2),
    of a linear structure with one moment of inertia to the first power

    It is 0 where the Hessian is that of a stationary point and does not change when the structure is
    moved or turned; then reduced and full partition functions agree.

    Parameters
    ----------
    positions_angstrom : shape (n, 3)
    light_u, heavy_u : shape (n,)
        Masses, u.
    light_cm, heavy_cm : shape (m,)
        All modes, an imaginary one by its size (of either sign).

    Returns
    -------
    float
        ln of the left side less ln of the right.
    """
    x = np.asarray(positions_angstrom, dtype=np.float64)
    light, heavy = (np.asarray(masses, dtype=np.float64) for masses in (light_u, heavy_u))
    left = np.log(np.abs(heavy_cm)).sum() - np.log(np.abs(light_cm)).sum()
    right = 1.5 * np.log(light / heavy).sum() + 1.5 * np.log(heavy.sum() / light.sum())
    kind = rotor_kind(light, x)
    if kind != "atom":
        moments = [principal_moments(masses, x) for masses in (light, heavy)]
        # of a linear structure both large moments are the same
        used = slice(1, None) if kind == "linear" else slice(None)
        right += 0.5 * np.log(moments[1][used] / moments[0][used]).sum()
    return float(left - right)
