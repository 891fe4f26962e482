"""Crossings between spin states: the Landau-Zener probability, averaged over thermal energies."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.units import BOLTZMANN_J_K, PLANCK_J_S

FloatArray = NDArray[np.float64]
_WIDTH = 0.05
_LOGS = np.arange(-25.0, 2.2, _WIDTH)
"""ln of the speed over its thermal one: trapezoids on it converge exponentially."""


def landau_zener(
    temperature_k: ArrayLike, coupling_j: float, gradient_n: float, mass_kg: float
) -> tuple[FloatArray, FloatArray]:
    """Return ln of the mean probability to change the spin state at a crossing, and T times its slope.

    P(E) = 1 - p^2, the sum of both passages, p = exp(-2 pi H^2/(hbar F v)), v = (2 E/m)^(1/2); its
    mean over exp(-E/kT). Energies below the crossing are not counted (no tunnelling).

    Parameters
    ----------
    temperature_k : shape (...)
    coupling_j : float
        Spin-orbit coupling H of one molecule.
    gradient_n : float
        Size F of the difference of the two gradients.
    mass_kg : float
        Reduced mass along it.

    Returns
    -------
    tuple of shape (...)
        ln of the mean, and T d ln/dT.

    Source: L. Landau, C. Zener (1932); the double passage as in nonadiabatic transition state theory
    (from memory).
    """
    t = np.asarray(temperature_k, dtype=np.float64)
    hbar = PLANCK_J_S / (2.0 * np.pi)
    # ln p at the speed of E = kT
    c = (
        2.0
        * np.pi
        * coupling_j**2
        / (hbar * gradient_n)
        * np.sqrt(mass_kg / (2 * BOLTZMANN_J_K * t))
    )
    y = np.exp(_LOGS)  # (E/kT)^(1/2)
    weight = 2.0 * _WIDTH * y**2 * np.exp(-(y**2))
    passed = 2.0 * c[..., np.newaxis] / y
    mean = (-np.expm1(-passed) * weight).sum(axis=-1)
    by_log = (passed * np.exp(-passed) * weight).sum(axis=-1)  # d mean/d ln c
    return np.log(mean), -0.5 * by_log / mean
