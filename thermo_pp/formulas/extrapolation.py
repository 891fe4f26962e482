"""Extrapolation of an energy to the limit of the basis set from two cardinal numbers."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]


def two_point_limit(
    small: ArrayLike, large: ArrayLike, decay_small: ArrayLike, decay_large: ArrayLike
) -> FloatArray:
    """Return E in E(X) = E + A f(X), from E(X) and f(X) at two cardinal numbers.

    Parameters
    ----------
    small, large : shape (...)
        E in the smaller and the larger basis set, any unit.
    decay_small, decay_large : shape (...)
        f in the two basis sets, that of the larger one nearer to 0.

    Raises
    ------
    ValueError
        A decay that does not decrease: there is no limit.
    """
    e_small, e_large = np.asarray(small, np.float64), np.asarray(large, np.float64)
    f_small, f_large = np.asarray(decay_small, np.float64), np.asarray(decay_large, np.float64)
    if np.any(f_small <= f_large) or np.any(f_large < 0.0):
        raise ValueError("the decay must decrease from the smaller to the larger basis set")
    return np.asarray(e_large + (e_large - e_small) * f_large / (f_small - f_large))


def power_decay(cardinal: ArrayLike, power: float = 3.0) -> FloatArray:
    """Return X^-power, that of the correlation energy with power 3.

    Source, from memory: T. Helgaker, W. Klopper, H. Koch, J. Noga, J. Chem. Phys. 1997, 106, 9639;
    A. Halkier et al., Chem. Phys. Lett. 1998, 286, 243.
    """
    return np.asarray(cardinal, np.float64) ** -power


def exponential_decay(cardinal: ArrayLike) -> FloatArray:
    """Return exp(-1.63 X), that of the Hartree-Fock energy.

    Source, from memory: A. Halkier et al., Chem. Phys. Lett. 1999, 302, 437.
    """
    return np.exp(-1.63 * np.asarray(cardinal, np.float64))


def root_exponential_decay(cardinal: ArrayLike) -> FloatArray:
    """Return (X + 1) exp(-9 sqrt(X)), that of the Hartree-Fock energy.

    Source, from memory: A. Karton, J. M. L. Martin, Theor. Chem. Acc. 2006, 115, 330.
    """
    x = np.asarray(cardinal, np.float64)
    return np.asarray((x + 1.0) * np.exp(-9.0 * np.sqrt(x)))
