"""Modes along the seam of methylene from points on it: energies and geometries alone, no Hessian."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
from numpy.typing import NDArray
from structures import masses

from thermo_pp.units import ATOMIC_MASS_KG, BOHR_ANGSTROM, BOHR_M, HARTREE_J, LIGHT_M_S

METHYLENE = Path(__file__).parents[1] / "fixtures" / "methylene"
CM = np.sqrt(HARTREE_J / BOHR_M**2 / ATOMIC_MASS_KG) / (2 * np.pi * LIGHT_M_S * 100.0)
FloatArray = NDArray[np.float64]


def placed(r1: float, r2: float, angle_deg: float) -> FloatArray:
    """Carbon and two hydrogens in the plane, bohr."""
    half = np.radians(angle_deg) / 2
    one = [np.sin(half) * r1, np.cos(half) * r1, 0.0]
    two = [-np.sin(half) * r2, np.cos(half) * r2, 0.0]
    return np.array([[0.0, 0.0, 0.0], one, two]) / BOHR_ANGSTROM


def fitted(r1: FloatArray, r2: FloatArray, value: FloatArray) -> tuple[FloatArray, FloatArray]:
    """First and second derivatives at the middle of a polynomial of fourth order through points."""
    powers = [(i, j) for i in range(5) for j in range(5 - i)]
    design = np.stack([r1**i * r2**j for i, j in powers], axis=1)
    found = dict(zip(powers, np.linalg.lstsq(design, value, rcond=None)[0], strict=True))
    first = np.array([found[1, 0], found[0, 1]])
    return first, np.array(
        [[2 * found[2, 0], found[1, 1]], [found[1, 1], 2 * found[0, 2]]], dtype=float
    )


def wavenumbers_on_seam(m: FloatArray | None = None) -> tuple[FloatArray, FloatArray]:
    """Wavenumbers along the seam, and the slope of the energy at the middle, hartree/A.

    The two distances are coordinates of the seam; the angle follows. F is the second derivative of
    the energy by them, G the metric of mass-weighted displacements that neither move nor turn the
    whole.
    """
    m = masses([6, 1, 1]) if m is None else m
    with (METHYLENE / "seam.csv").open() as file:
        rows = np.array([[float(cell) for cell in row] for row in [*csv.reader(file)][1:]])
    other = rows[rows[:, 0] != rows[:, 1]][:, [1, 0, 2, 3]]
    rows = np.concatenate([rows, other])
    start = float(np.median(rows[:, 0]))
    a, b = rows[:, 0] - start, rows[:, 1] - start
    slope, force = fitted(a, b, rows[:, 3])
    angle_slope, _ = fitted(a, b, rows[:, 2])
    angle = float(rows[(np.abs(a) < 1e-9) & (np.abs(b) < 1e-9), 2][0])
    x, h, root = placed(start, start, angle), 1e-5, np.sqrt(m)[:, np.newaxis]
    tangents = []
    for k in (0, 1):
        step = np.eye(2)[k] * h
        ends = [
            placed(*(start + sign * step), angle + sign * h * angle_slope[k]) for sign in (1, -1)
        ]
        tangents.append(((ends[0] - ends[1]) / (2 * h) * root).ravel())
    centred = x - (m @ x) / m.sum()
    whole = [np.tile(axis, (3, 1)) for axis in np.eye(3)]
    whole += [np.cross(axis, centred) for axis in np.eye(3)]
    basis = np.linalg.qr(np.array([(v * root).ravel() for v in whole]).T)[0]
    t = np.array(tangents).T
    t -= basis @ (basis.T @ t)
    squares = np.linalg.eigvals(np.linalg.solve(t.T @ t, force)).real
    return np.sort(np.sqrt(squares)) * CM, slope
