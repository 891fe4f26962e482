"""Torsions: the levels of a hindered rotor and what they add to H, S and Cp; J/mol, J/(mol K).

One angle phi turns a rigid top against a rigid frame with a constant reduced moment I (see
`formulas.turning`) in a potential V(phi) that is a Fourier series:

    H = -B d^2/dphi^2 + V(phi),  B = h/(8 pi^2 c I),  phi from 0 to 360 degrees

in the basis exp(i m phi), m = -M ... M, where V couples m and m + k by (c_k -+ i s_k)/2. The levels
of the whole circle are summed and the sum divided by the symmetry number of the torsion, the number
of wells of the circle that permutations of like atoms make the same (ethane 3): a rigid structure
of its own external symmetry number then goes over into the hindered rotor without a jump, and
nothing is counted twice. Wells that are mirror images (hydrogen peroxide) are not the same.

Limits: V = 0 gives the free rotor, q = (8 pi^3 I k T)^(1/2)/(sigma h); high barriers the oscillator
of 2 B V''. Source: Pitzer and Gwinn, J. Chem. Phys. 1942, 10, 428 (from memory; the algebra was
derived and checked against both limits and Mathieu's characteristic values).
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.formulas.partition import level_share
from thermo_pp.formulas.rotor import rotational_temperatures
from thermo_pp.units import GAS_J_MOL_K, KELVIN_PER_CM, WAVENUMBER_KJ_MOL

FloatArray = NDArray[np.float64]

MOST_TERMS = 12
"""Of a fitted series: higher harmonics of a scan are noise."""
LARGEST_GAP_DEG = 60.0
"""A scan must have a point at least this often, and four in a period."""
_SLACK_DEG = 3.0
_BELOW = 36.0
"""Levels are summed up to this many kT: the rest is below 1e-15 of the sum."""
_GRID = 3600


@dataclass(frozen=True)
class Potential:
    """V(phi) = sum_k c_k cos(k phi) + s_k sin(k phi).

    Attributes
    ----------
    cosines_j_mol, sines_j_mol : tuple of float
        c_k and s_k, J/mol, k from 0 on, equally many; s_0 does nothing.
    """

    cosines_j_mol: tuple[float, ...]
    sines_j_mol: tuple[float, ...]

    def __post_init__(self) -> None:
        if not self.cosines_j_mol or len(self.cosines_j_mol) != len(self.sines_j_mol):
            raise ValueError("a series has equally many cosines and sines, from k = 0 on")

    def at(self, angle_deg: ArrayLike, derivative: int = 0) -> FloatArray:
        """Return V, or its first or second derivative by the angle in radians, J/mol, at angles."""
        angle = np.radians(np.asarray(angle_deg, dtype=np.float64))[..., np.newaxis]
        k = np.arange(len(self.cosines_j_mol))
        turned = k * angle + 0.5 * math.pi * derivative
        power = k.astype(np.float64) ** derivative
        terms = self.cosines_j_mol * np.cos(turned) + self.sines_j_mol * np.sin(turned)
        return np.asarray((power * terms).sum(axis=-1))

    def minima(self) -> tuple[FloatArray, FloatArray]:
        """Return the angles of all minima, degrees from 0 to 360, and V there; none where V is flat."""
        return _extrema(self, 1.0)

    def lowest_j_mol(self) -> float:
        """Return the lowest V, J/mol."""
        return float(min(self.minima()[1], default=self.at(0.0)))

    def highest_j_mol(self) -> float:
        """Return the highest V, J/mol."""
        return float(max(_extrema(self, -1.0)[1], default=self.at(0.0)))


@lru_cache(maxsize=512)
def _extrema(potential: Potential, sign: float) -> tuple[FloatArray, FloatArray]:
    """Return angles and values of all minima (sign 1) or maxima (sign -1)."""
    grid = np.arange(_GRID) * (360.0 / _GRID)
    value = sign * potential.at(grid)
    if np.ptp(value) < 1e-9 * (1.0 + float(np.abs(value).max())):
        return np.empty(0), np.empty(0)
    angle = grid[(value < np.roll(value, 1)) & (value <= np.roll(value, -1))]
    for _ in range(8):
        curve = potential.at(angle, 2)
        safe = np.where(sign * curve > 0.0, curve, np.inf)
        step = np.degrees(potential.at(angle, 1) / safe)
        angle = angle - np.clip(step, -360.0 / _GRID, 360.0 / _GRID)
    return np.asarray(angle % 360.0), potential.at(angle)


class Fit(NamedTuple):
    """A series fitted to a scan.

    Attributes
    ----------
    potential : Potential
    residual_j_mol : shape (n,)
        Point less series.
    """

    potential: Potential
    residual_j_mol: FloatArray


def fit(
    angle_deg: ArrayLike,
    energy_j_mol: ArrayLike,
    period_deg: float = 360.0,
    mirror_deg: float | None = None,
) -> Fit:
    """Fit a Fourier series of a given period to the points of a scan, by least squares.

    As many harmonics as the widest gap between the points allows, at most `MOST_TERMS`; equidistant
    points are passed through exactly.

    Parameters
    ----------
    angle_deg, energy_j_mol : shape (n,)
    period_deg : float
        360 over a whole number: V repeats after it.
    mirror_deg : float or None
        V(a + x) = V(a - x) about this angle a: then half a period is enough.

    Raises
    ------
    ValueError
        The points do not cover the period, or half of it where there is a mirror.
    """
    angle = np.asarray(angle_deg, dtype=np.float64)
    energy = np.asarray(energy_j_mol, dtype=np.float64)
    fold = round(360.0 / period_deg)
    gap, at = widest_gap(angle, period_deg, mirror_deg)
    allowed = min(LARGEST_GAP_DEG, period_deg / 4.0) + _SLACK_DEG
    if gap > allowed:
        raise ValueError(
            f"no point in the {gap:.0f} degrees from {at:.0f} on, where at most "
            f"{allowed - _SLACK_DEG:.0f} may lie between two points"
        )
    most = period_deg / (2.0 * gap)
    terms = math.ceil(most - 1e-6) - 1 if mirror_deg is None else math.floor(most + 1e-6)
    k = np.arange(min(max(terms, 1), MOST_TERMS) + 1)
    x = np.radians(angle - (mirror_deg or 0.0))[:, np.newaxis] * (fold * k)
    columns = [np.cos(x)] if mirror_deg is not None else [np.cos(x), np.sin(x[:, 1:])]
    matrix = np.concatenate(columns, axis=1)
    centre = energy.mean()
    found = np.linalg.lstsq(matrix, energy - centre, rcond=1e-10)[0]
    residual = energy - centre - matrix @ found
    own_cos, own_sin = found[: len(k)], np.zeros(len(k))
    own_sin[1:] = found[len(k) :] if mirror_deg is None else 0.0
    shift = np.radians(mirror_deg or 0.0) * fold * k
    cosines, sines = np.zeros(fold * k[-1] + 1), np.zeros(fold * k[-1] + 1)
    cosines[fold * k] = own_cos * np.cos(shift) - own_sin * np.sin(shift)
    sines[fold * k] = own_cos * np.sin(shift) + own_sin * np.cos(shift)
    cosines[0] += centre
    return Fit(Potential(tuple(cosines.tolist()), tuple(sines.tolist())), residual)


def widest_gap(
    angle_deg: FloatArray, period_deg: float, mirror_deg: float | None
) -> tuple[float, float]:
    """Return the widest gap between the points laid into one period, and where it begins, degrees."""
    angle = np.asarray(angle_deg, dtype=np.float64)
    if mirror_deg is not None:
        angle = np.concatenate([angle, 2.0 * mirror_deg - angle])
    folded = np.sort(np.round(angle, 6) % period_deg)
    gaps = np.diff(np.append(folded, folded[0] + period_deg))
    widest = int(gaps.argmax())
    return float(gaps[widest]), float(folded[widest])


@dataclass(frozen=True)
class HinderedRotor:
    """A torsion that stands by itself.

    Attributes
    ----------
    potential : Potential
    moment_u_a2 : float
        Reduced moment of inertia, u A^2, above 0.
    symmetry_number : int
        Wells of the circle that are one and the same.
    """

    potential: Potential
    moment_u_a2: float
    symmetry_number: int

    def __post_init__(self) -> None:
        if not self.moment_u_a2 > 0.0 or self.symmetry_number < 1:
            raise ValueError("reduced moment and symmetry number must be above 0")

    @property
    def constant_cm(self) -> float:
        """B = h/(8 pi^2 c I), cm^-1."""
        return float(rotational_temperatures(self.moment_u_a2)) / KELVIN_PER_CM

    @property
    def barrier_j_mol(self) -> float:
        """The highest V less the lowest, J/mol."""
        return self.potential.highest_j_mol() - self.potential.lowest_j_mol()

    def harmonic_cm(self) -> float | None:
        """Return the wavenumber of small swings about the lowest minimum; None where V is flat."""
        angles, values = self.potential.minima()
        if not len(angles):
            return None
        curve = self.potential.at(angles[int(values.argmin())], 2)
        force = float(curve) / (1000.0 * WAVENUMBER_KJ_MOL)
        return math.sqrt(2.0 * self.constant_cm * max(force, 0.0))

    def levels_cm(self, temperature_k: float) -> FloatArray:
        """Return the levels, cm^-1 above the lowest V: all that count up to a temperature."""
        span = self.barrier_j_mol / (1000.0 * WAVENUMBER_KJ_MOL)
        reach = span + _BELOW * max(temperature_k, 1.0) / KELVIN_PER_CM
        widest = 1.1 * math.sqrt(reach / self.constant_cm)
        return levels(self.potential, self.constant_cm, 16 * math.ceil((widest + 8.0) / 16.0))


@lru_cache(maxsize=256)
def levels(potential: Potential, constant_cm: float, most_m: int) -> FloatArray:
    """Return the eigenvalues of -B d^2/dphi^2 + V in the basis exp(i m phi), |m| <= `most_m`.

    Parameters
    ----------
    potential : Potential
    constant_cm : float
        B, cm^-1.
    most_m : int
        Size of the basis.

    Returns
    -------
    shape (2 most_m + 1,)
        cm^-1 above the lowest V, ascending; the uppermost belong to the end of the basis.
    """
    from scipy.linalg import eig_banded

    per_cm = 1.0 / (1000.0 * WAVENUMBER_KJ_MOL)
    m = np.arange(-most_m, most_m + 1)
    bands = min(len(potential.cosines_j_mol), 2 * most_m + 1)
    matrix = np.zeros((bands, len(m)), dtype=np.complex128)
    matrix[0] = constant_cm * m.astype(np.float64) ** 2
    matrix[0] += (potential.cosines_j_mol[0] - potential.lowest_j_mol()) * per_cm
    for k in range(1, bands):
        coupling = potential.cosines_j_mol[k] - 1j * potential.sines_j_mol[k]
        matrix[k, : len(m) - k] = 0.5 * coupling * per_cm
    found: FloatArray = np.asarray(eig_banded(matrix, lower=True, eigvals_only=True))
    found.setflags(write=False)
    return found


class TorsionShare(NamedTuple):
    """What a torsion adds.

    Attributes
    ----------
    zero_point_j_mol : float
        The ground state above the lowest V.
    enthalpy_j_mol : shape (...)
        U above the ground state.
    entropy_j_mol_k, heat_capacity_j_mol_k : shape (...)
    """

    zero_point_j_mol: float
    enthalpy_j_mol: FloatArray
    entropy_j_mol_k: FloatArray
    heat_capacity_j_mol_k: FloatArray


def torsion(temperature_k: ArrayLike, rotor: HinderedRotor) -> TorsionShare:
    """Return the share of a hindered rotor: exact sums over its levels.

    q = (1/sigma) sum_i exp(-(E_i - E_0)/kT)

    Parameters
    ----------
    temperature_k : shape (...)
        K, above 0.
    rotor : HinderedRotor

    Returns
    -------
    TorsionShare of shape (...)
    """
    t = np.asarray(temperature_k, dtype=np.float64)
    found = rotor.levels_cm(float(np.max(t, initial=0.0)))
    ground = float(found[0])
    share = level_share(
        t, np.ones_like(found), KELVIN_PER_CM * (found - ground), float(rotor.symmetry_number)
    )
    return TorsionShare(GAS_J_MOL_K * KELVIN_PER_CM * ground, *share)
