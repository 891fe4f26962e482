"""Rate constants of elementary steps: Eyring equation, collision and diffusion limits."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.data.elements import AVERAGE_MASSES, NUMBERS, VAN_DER_WAALS_ANGSTROM
from thermo_pp.units import (
    ATOMIC_MASS_KG,
    AVOGADRO_MOL,
    BOLTZMANN_J_K,
    ELEMENTARY_CHARGE_C,
    GAS_J_MOL_K,
    PLANCK_J_S,
    VACUUM_PERMITTIVITY_F_M,
)

FloatArray = NDArray[np.float64]
_LITRES_PER_M3 = 1000.0


def log_frequency_factor(temperature_k: ArrayLike) -> FloatArray:
    """Return ln(k T/h s).

    Parameters
    ----------
    temperature_k : shape (...)
        K, above 0.

    Source: H. Eyring, J. Chem. Phys. 1935, 3, 107.
    """
    t = np.asarray(temperature_k, dtype=np.float64)
    return np.asarray(np.log(t * (BOLTZMANN_J_K / PLANCK_J_S)))


def eyring_rate(temperature_k: ArrayLike, gibbs_j_mol: ArrayLike) -> FloatArray:
    """Eyring rate constant k = (k T/h) exp(-G/RT), s^-1.

    Parameters
    ----------
    temperature_k, gibbs_j_mol : shapes that broadcast
        Temperature, and activation free energy against the state of 1 mol/L; then the unit of a
        step of m reactants is (mol/L)^(1-m) s^-1.

    Source: H. Eyring, J. Chem. Phys. 1935, 3, 107.
    """
    t = np.asarray(temperature_k, dtype=np.float64)
    return np.asarray(
        BOLTZMANN_J_K * t / PLANCK_J_S * np.exp(-np.asarray(gibbs_j_mol) / (GAS_J_MOL_K * t))
    )


def sphere_radius_angstrom(composition: Mapping[str, int]) -> float:
    """Radius of the sphere whose volume is that of the atoms' van der Waals spheres together, Angstrom.

    Raises KeyError with the symbol where the radius of an element is not in the table.
    """
    volume = sum(count * VAN_DER_WAALS_ANGSTROM[s] ** 3 for s, count in composition.items())
    return float(volume ** (1.0 / 3.0))


def average_mass_u(composition: Mapping[str, int]) -> float:
    """Average mass of a formula, u."""
    return float(sum(count * AVERAGE_MASSES[NUMBERS[s]] for s, count in composition.items()))


def collision_rate(
    temperature_k: ArrayLike,
    first: Mapping[str, int],
    second: Mapping[str, int],
    *,
    like: bool,
) -> FloatArray:
    """Hard-sphere collision rate constant, L mol^-1 s^-1.

    k = N_A pi (r1 + r2)^2 (8 k T/(pi mu))^(1/2), half of it for like partners.

    Parameters
    ----------
    temperature_k : shape (...)
    first, second : mapping of element to count
        Compositions, which give masses (average) and radii.
    like : bool
        Both partners are the same species.

    Source: kinetic theory of gases, in any textbook of physical chemistry (common practice, no
    source).
    """
    t = np.asarray(temperature_k, dtype=np.float64)
    area = np.pi * (sphere_radius_angstrom(first) + sphere_radius_angstrom(second)) ** 2 * 1e-20
    masses = average_mass_u(first), average_mass_u(second)
    reduced = masses[0] * masses[1] / (masses[0] + masses[1]) * ATOMIC_MASS_KG
    speed = np.sqrt(8.0 * BOLTZMANN_J_K * t / (np.pi * reduced))
    return np.asarray((0.5 if like else 1.0) * AVOGADRO_MOL * area * speed * _LITRES_PER_M3)


def diffusion_rate(
    temperature_k: ArrayLike, viscosity_pa_s: ArrayLike, *, like: bool
) -> FloatArray:
    """Diffusion limit 8 R T/(3 eta), L mol^-1 s^-1, half of it for like partners.

    Parameters
    ----------
    temperature_k, viscosity_pa_s : shapes that broadcast
    like : bool

    Source: Smoluchowski's limit with Stokes-Einstein coefficients of equal spheres (common
    practice, no source).
    """
    t = np.asarray(temperature_k, dtype=np.float64)
    limit = 8.0 * GAS_J_MOL_K * t / (3.0 * np.asarray(viscosity_pa_s, dtype=np.float64))
    return np.asarray((0.5 if like else 1.0) * limit * _LITRES_PER_M3)


def ion_factor(
    temperature_k: ArrayLike,
    charges: int,
    permittivity: ArrayLike,
    distance_angstrom: float,
) -> tuple[FloatArray, FloatArray]:
    """Return ln of the factor by which ions meet more or less often than neutral partners do.

    f = d/(exp(d) - 1), d = z1 z2 e^2/(4 pi eps0 eps k T R).

    Parameters
    ----------
    temperature_k, permittivity : shapes that broadcast
        The permittivity is relative to that of the vacuum.
    charges : int
        z1 z2.
    distance_angstrom : float
        Distance R at which they have met.

    Returns
    -------
    tuple of shape (...)
        ln f, and d ln f/d ln d.

    Source: P. Debye, Trans. Electrochem. Soc. 1942, 82, 265 (from memory).
    """
    t = np.asarray(temperature_k, dtype=np.float64)
    onsager = ELEMENTARY_CHARGE_C**2 / (4.0 * np.pi * VACUUM_PERMITTIVITY_F_M * BOLTZMANN_J_K)
    d = charges * onsager / (np.asarray(permittivity) * t * distance_angstrom * 1e-10)
    size = np.abs(d)
    # of attraction -d = |d|: f = |d|/(1 - exp(-|d|)); repulsion is smaller by exp(-|d|)
    log_factor = np.log(size / -np.expm1(-size)) - np.where(d > 0.0, size, 0.0)
    by_log = 1.0 - size / np.expm1(size) - np.where(d > 0.0, size, 0.0)
    return np.asarray(log_factor), np.asarray(by_log)
