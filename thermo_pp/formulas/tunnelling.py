"""Tunnelling through one barrier: Wigner's correction and the asymmetric Eckart barrier."""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.units import GAS_J_MOL_K, KELVIN_PER_CM

FloatArray = NDArray[np.float64]

_NODES = 16
"""Gauss-Legendre points of a panel."""
_NEGLIGIBLE = 45.0
"""The integral ends so many units of its slowest decay away: what is left is below e^-45 of it."""
_GRADED = 24
"""Halvings of the first panel towards the threshold, where the transmission has a square root."""
_TEMPERATURES_TOGETHER = 4.0
"""Largest ratio of temperatures that share one set of panels."""


class Tunnelling(NamedTuple):
    """What tunnelling does to a rate constant.

    Attributes
    ----------
    log_kappa : shape (...)
        ln of the factor of the rate constant.
    energy_j_mol : shape (...)
        R T^2 d ln(kappa)/dT, J/mol: its share in the Arrhenius energy.
    """

    log_kappa: FloatArray
    energy_j_mol: FloatArray


def wigner(temperature_k: ArrayLike, wavenumber_cm: float) -> Tunnelling:
    """Return Wigner's correction, kappa = 1 + u^2/24, u = h c nu/kT.

    Parameters
    ----------
    temperature_k : shape (...)
        K, above 0.
    wavenumber_cm : float
        Size of the imaginary wavenumber, cm^-1, above 0.

    Returns
    -------
    Tunnelling of shape (...)

    Raises
    ------
    ValueError
        At or below 0.

    Source: E. Wigner, Z. Phys. Chem. B 1932, 19, 203 (from memory).
    """
    t = _temperatures(temperature_k)
    excess = (KELVIN_PER_CM * _above_zero(wavenumber_cm, "wavenumber") / t) ** 2 / 24.0
    energy = -2.0 * GAS_J_MOL_K * t * excess / (1.0 + excess)
    return Tunnelling(np.asarray(np.log1p(excess)), np.asarray(energy))


def eckart(
    temperature_k: ArrayLike, wavenumber_cm: float, forward_j_mol: float, reverse_j_mol: float
) -> Tunnelling:
    """Return the correction of the asymmetric Eckart barrier, the same for both directions.

    kappa = integral from E0 of P(E) exp(-(E - V1)/RT) dE/RT,  E0 = max(0, V1 - V2),
    R T^2 d ln(kappa)/dT = <E - V1> - RT with the integrand as weight

    By Gauss-Legendre panels that are as narrow as the integrand asks for (kT, h nu/2 pi), shrink
    towards the threshold, and are shared by temperatures within a factor of four; in logarithms,
    so that deep tunnelling does not overflow. Relative error below 1e-9.

    Parameters
    ----------
    temperature_k : shape (...)
        K, above 0.
    wavenumber_cm : float
        Size of the imaginary wavenumber, cm^-1, above 0.
    forward_j_mol, reverse_j_mol : float
        Height of the barrier from either side, zero-point energies included, J/mol, above 0.

    Returns
    -------
    Tunnelling of shape (...)

    Raises
    ------
    ValueError
        At or below 0.

    Source: C. Eckart, Phys. Rev. 1930, 35, 1303; H. S. Johnston, J. Heicklen, J. Phys. Chem. 1962,
    66, 532 (both from memory); the transmission was checked against the Schroedinger equation.
    """
    t = _temperatures(temperature_k)
    flat = t.ravel()
    heights = [_above_zero(v, "barrier") for v in (forward_j_mol, reverse_j_mol)]
    width = GAS_J_MOL_K * KELVIN_PER_CM * _above_zero(wavenumber_cm, "wavenumber") / (2.0 * math.pi)
    log_kappa, energy = np.empty(flat.shape), np.empty(flat.shape)
    order = np.argsort(flat)
    while order.size:
        together = order[flat[order] <= _TEMPERATURES_TOGETHER * flat[order[0]]]
        order = order[together.size :]
        log_kappa[together], energy[together] = _integrals(flat[together], width, *heights)
    return Tunnelling(log_kappa.reshape(t.shape), energy.reshape(t.shape))


def eckart_log_transmission(
    above_top_j_mol: ArrayLike, wavenumber_cm: float, forward_j_mol: float, reverse_j_mol: float
) -> FloatArray:
    """Return ln P of an asymmetric Eckart barrier.

    P = 1 - [cosh(A - B) + cosh d]/[cosh(A + B) + cosh d],  A = 2 sqrt(a1 E/V1)/D,
    B = 2 sqrt(a1 E/V1 - a1 + a2)/D,  D = 1/sqrt(a1) + 1/sqrt(a2),  d = 2 sqrt(a1 a2 - pi^2/4)
    (cos of its size where that root is imaginary),  ai = 2 pi Vi/(h c nu)

    Parameters
    ----------
    above_top_j_mol : shape (...)
        Energy from the top of the barrier, J/mol; not below the higher of the two sides.
    wavenumber_cm, forward_j_mol, reverse_j_mol : float
        As for `eckart`.

    Returns
    -------
    shape (...)
        -inf at the threshold itself.
    """
    width = GAS_J_MOL_K * KELVIN_PER_CM * _above_zero(wavenumber_cm, "wavenumber") / (2.0 * math.pi)
    heights = [_above_zero(v, "barrier") for v in (forward_j_mol, reverse_j_mol)]
    above = np.asarray(above_top_j_mol, dtype=np.float64)
    threshold = min(heights)
    return _log_transmission(above + threshold, width, *heights)


def _log_transmission(
    above_threshold: FloatArray, width: float, forward: float, reverse: float
) -> FloatArray:
    """Return ln P; energies from the threshold, `width` is h nu/2 pi."""
    a1, a2 = forward / width, reverse / width
    per = 2.0 / (1.0 / math.sqrt(a1) + 1.0 / math.sqrt(a2)) / math.sqrt(width)
    lower, higher = sorted((forward, reverse))
    near = per * np.sqrt(above_threshold)
    far = per * np.sqrt(above_threshold + (higher - lower))
    total = near + far
    under_root = a1 * a2 - math.pi**2 / 4.0
    with np.errstate(divide="ignore"):
        # ln(2 sinh A sinh B)
        log_top = total - math.log(2.0) + np.log(-np.expm1(-2.0 * near) * -np.expm1(-2.0 * far))
    if under_root >= 0.0:
        d = 2.0 * math.sqrt(under_root)
        log_bottom = np.logaddexp(_log_cosh(total), _log_cosh(np.asarray(d)))
    else:
        # cosh(s) + cos(d) = 2 sinh^2(s/2) + 2 cos^2(d/2), a sum of what is positive
        half = math.cos(math.sqrt(-under_root))
        log_bottom = np.logaddexp(
            total - math.log(2.0) + 2.0 * np.log(-np.expm1(-np.maximum(total, 1e-300))),
            math.log(2.0 * half**2),
        )
    return np.asarray(log_top - log_bottom)


def _log_cosh(x: FloatArray) -> FloatArray:
    return np.asarray(x + np.log1p(np.exp(-2.0 * x)) - math.log(2.0))


def _integrals(
    t: FloatArray, width: float, forward: float, reverse: float
) -> tuple[FloatArray, FloatArray]:
    """Return ln kappa and its share in the Arrhenius energy at temperatures within a small factor."""
    rt = GAS_J_MOL_K * t
    depth = min(forward, reverse)
    edges = _edges(depth, width, float(rt.min()), float(rt.max()))
    points, weights = np.polynomial.legendre.leggauss(_NODES)
    half = 0.5 * np.diff(edges)
    nodes = (edges[:-1, np.newaxis] + half[:, np.newaxis] * (1.0 + points)).ravel()
    log_weight = np.log(np.outer(half, weights)).ravel()
    log_weight = log_weight + _log_transmission(nodes, width, forward, reverse)
    above = nodes - depth
    log_kappa, mean = np.empty(t.shape), np.empty(t.shape)
    for k, one in enumerate(rt):  # one temperature a time keeps the nodes in the cache
        terms = log_weight - above / one
        largest = terms.max()
        shares = np.exp(terms - largest)
        total = shares.sum()
        log_kappa[k] = largest + math.log(total / one)
        mean[k] = shares @ above / total
    return log_kappa, mean - rt


def _edges(depth: float, width: float, coldest: float, hottest: float) -> FloatArray:
    """Return the edges of the panels, from the threshold up; `coldest` and `hottest` are RT."""
    narrow = 2.0 * min(coldest, width)
    below = depth
    if 2.0 * width < coldest:
        # P falls at least twice as fast as exp(-E/RT) rises
        below = min(depth, 2.0 * _NEGLIGIBLE * width)
    count = max(1, math.ceil(below / narrow))
    down = depth - below + np.linspace(0.0, below, count + 1)
    up, step, end = [0.0], narrow, _NEGLIGIBLE * hottest
    while up[-1] < end:
        up.append(up[-1] + step)
        step = min(1.5 * step, 2.0 * coldest)
    edges = np.concatenate([down, depth + np.array(up[1:])])
    if below == depth:
        graded = edges[1] * 0.5 ** np.arange(_GRADED, 0, -1)
        edges = np.concatenate([edges[:1], graded, edges[1:]])
    return edges


def _temperatures(value: ArrayLike) -> FloatArray:
    t = np.asarray(value, dtype=np.float64)
    if not np.all(t > 0.0):
        raise ValueError("temperatures must be above 0")
    return t


def _above_zero(value: float, what: str) -> float:
    if not (value > 0.0 and math.isfinite(value)):
        raise ValueError(f"{what} must be above 0, got {value}")
    return float(value)
