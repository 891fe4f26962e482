"""Normal modes: a Hessian to wavenumbers and displacements, overall motion projected out."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.formulas.rotor import rotor_kind
from thermo_pp.units import ATOMIC_MASS_KG, BOHR_M, HARTREE_J, LIGHT_M_S

FloatArray = NDArray[np.float64]

_CM_PER_ROOT = math.sqrt(HARTREE_J / (BOHR_M**2 * ATOMIC_MASS_KG)) / (200.0 * math.pi * LIGHT_M_S)
"""Wavenumber, cm^-1, of a mass-weighted force constant of 1 hartree/(bohr^2 u)."""


@dataclass(frozen=True, eq=False)
class NormalModes:
    """Normal modes of a structure.

    Attributes
    ----------
    wavenumbers_cm : shape (m,)
        Ascending, imaginary ones negative; 3N-6, of a linear structure 3N-5, of an atom none; one
        less where a coordinate is left out.
    modes : shape (m, n, 3)
        Cartesian displacements, not mass-weighted, each of length 1.
    """

    wavenumbers_cm: FloatArray
    modes: FloatArray


def normal_modes(
    hessian_hartree_bohr2: ArrayLike,
    masses_u: ArrayLike,
    positions_angstrom: ArrayLike,
    across: ArrayLike | None = None,
) -> NormalModes:
    """Diagonalise the mass-weighted Hessian in the space that holds no translation and no rotation.

    No mode is left out by its size: the space has exactly 3N-6 (3N-5, 0) dimensions, so that a
    mode of a few cm^-1 is never taken for a rotation.

    Parameters
    ----------
    hessian_hartree_bohr2 : shape (3n, 3n)
        hartree/bohr^2; its symmetric part counts.
    masses_u : shape (n,)
    positions_angstrom : shape (n, 3)
    across : shape (n, 3) or None
        A gradient, in any unit: the mass-weighted motion along it is left out as well, so that what
        is left are the modes in the surface that it stands on.

    Returns
    -------
    NormalModes

    Raises
    ------
    ValueError
        A Hessian of another shape or one that holds what is not finite; a gradient that is 0 but
        for overall motion.
    """
    m = np.asarray(masses_u, dtype=np.float64)
    x = np.asarray(positions_angstrom, dtype=np.float64)
    hessian = np.asarray(hessian_hartree_bohr2, dtype=np.float64)
    n = len(m)
    if hessian.shape != (3 * n, 3 * n):
        raise ValueError(f"the Hessian has shape {hessian.shape}, expected {(3 * n, 3 * n)}")
    if not np.all(np.isfinite(hessian)):
        raise ValueError("the Hessian holds a number that is not finite")
    root = np.repeat(np.sqrt(m), 3)
    weighted = 0.5 * (hessian + hessian.T) / np.outer(root, root)
    inner = internal_space(m, x)
    if across is not None:
        inner = _within(inner, np.asarray(across, dtype=np.float64).ravel() / root)
    values, vectors = np.linalg.eigh(inner.T @ weighted @ inner)
    modes = (inner @ vectors).T / root
    modes /= np.linalg.norm(modes, axis=1, keepdims=True)
    wavenumbers = np.sign(values) * np.sqrt(np.abs(values)) * _CM_PER_ROOT
    return NormalModes(wavenumbers, modes.reshape(-1, n, 3))


def _within(space: FloatArray, normal: FloatArray) -> FloatArray:
    """Return an orthonormal basis of what of a space, (3n, k), is at right angles to a vector."""
    inside = normal @ space
    if not np.linalg.norm(inside) > 1e-12 * np.linalg.norm(normal):
        raise ValueError("the gradient has no part beside overall motion")
    return np.asarray(space @ np.linalg.svd(inside[np.newaxis])[2][1:].T)


def internal_space(m: FloatArray, x: FloatArray) -> FloatArray:
    """Return an orthonormal basis (3n, 3n-6) of mass-weighted displacements, no overall motion."""
    n = len(m)
    root = np.sqrt(m)[:, np.newaxis]
    x = x - (m @ x) / m.sum()
    turns = np.stack([np.cross(axis, x) for axis in np.eye(3)])
    moves = np.stack([np.broadcast_to(axis, (n, 3)) for axis in np.eye(3)])
    outer = (np.concatenate([moves, turns]) * root).reshape(6, 3 * n)
    outer /= np.maximum(np.linalg.norm(outer, axis=1, keepdims=True), 1e-300)
    overall = {"atom": 3, "linear": 5, "nonlinear": 6}[rotor_kind(m, x)]
    return np.linalg.svd(outer)[2][overall:].T
