"""The record of one calculation: what a reader took from one output, and where it stood."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import lru_cache
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import SYMBOLS
from thermo_pp.errors import Finding
from thermo_pp.names import Origin

if TYPE_CHECKING:
    from ase import Atoms

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class Printed:
    """A value as a program printed it.

    Attributes
    ----------
    text : str
        The digits, untouched.
    unit : str
        The unit printed beside them, empty for a pure number.
    line : int
        1-based line.
    """

    text: str
    unit: str
    line: int

    @property
    def value(self) -> float:
        """The digits as a number, in the printed unit."""
        return float(self.text)

    @property
    def step(self) -> float:
        """One unit of the last printed digit."""
        mantissa, _, exponent = self.text.lower().replace("d", "e").partition("e")
        decimals = len(mantissa.partition(".")[2])
        return float(f"1e{int(exponent or 0) - decimals}")  # without overflow


@dataclass(frozen=True)
class MethodEnergy:
    """A total energy of one method among several in a file.

    Attributes
    ----------
    value_hartree : float
    line : int
        1-based line.
    """

    value_hartree: float
    line: int


@dataclass(frozen=True, eq=False)
class Calculation:
    """One calculation of one structure, as its output has it. What the file does not say is None.

    Attributes
    ----------
    path, sha256 : str
        The file and the hash of its bytes.
    program, program_version : str, str or None
        The program that wrote it.
    method, basis : str or None
        Level of theory of `energy_hartree`: ``"B3LYP"``, ``"CCSD(T)"``; ``"def2-SVPD"``. Upper case
        for methods.
    dispersion, solvent, grid, frozen_core : str or None
        The rest of the level; ``"none"`` where the file makes sure that there is none, None where
        it does not say.
    numbers : shape (n,), int
        Atomic numbers; 0 never occurs.
    positions_angstrom : shape (n, 3)
        The geometry of the modes where there are modes, else of the energy.
    masses_u : shape (n,)
        Masses of the modes.
    masses_origin : {"printed", "derived", "declared"}
        Printed by the program, or derived from how the program is known to choose them.
    charge, multiplicity : int or None
    energy_hartree : float or None
        Electronic energy at `positions_angstrom`, the best level in the file; None where the SCF
        failed.
    energy_label : str or None
        Which energy it is, ``"CCSD(T)"`` or ``"DFT"`` for instance.
    method_energies : mapping of str to MethodEnergy
        Total energies by method that belong to `energy_hartree`: the reference ``"HF"`` under a
        correlated energy, and ``"MP2"`` or ``"CCSD"`` on the way to it; same geometry, basis and
        core. Empty where the reader does not tell them apart.
    wavenumbers_cm : shape (m,) or None
        3N-6 or 3N-5 modes, ascending, imaginary ones negative; None where the job has none. Empty
        for an atom.
    modes : shape (m, n, 3) or None
        Cartesian displacements of those modes, not mass-weighted, each of length 1.
    hessian_hartree_bohr2 : shape (3n, 3n) or None
    gradient_hartree_bohr : shape (n, 3) or None
        Of the energy, at `positions_angstrom` and in their orientation; None where the reader takes none.
    optimised : bool or None
        Whether an optimisation reached its own thresholds; None where the job is no optimisation.
    ended_normally : bool
    kind_of_job : tuple of str
        What the file holds, of ``"energy"``, ``"gradient"``, ``"optimisation"``, ``"frequencies"``.
    printed : mapping of str to Printed
        The program's own thermochemistry: ``temperature, pressure, symmetry_number, zero_point,
        thermal_energy, thermal_enthalpy, entropy, heat_capacity_v, enthalpy, gibbs,
        translational_entropy, rotational_entropy, vibrational_entropy``. ``thermal_*`` are
        corrections to the electronic energy with the zero-point energy in them.
    where : mapping of str to int
        Field -> 1-based line.
    findings : tuple of Finding
    """

    path: str
    sha256: str
    program: str
    numbers: NDArray[np.int64]
    positions_angstrom: FloatArray
    masses_u: FloatArray
    masses_origin: Origin
    program_version: str | None = None
    method: str | None = None
    basis: str | None = None
    dispersion: str | None = None
    solvent: str | None = None
    grid: str | None = None
    frozen_core: str | None = None
    charge: int | None = None
    multiplicity: int | None = None
    energy_hartree: float | None = None
    energy_label: str | None = None
    method_energies: Mapping[str, MethodEnergy] = field(default_factory=dict)
    wavenumbers_cm: FloatArray | None = None
    modes: FloatArray | None = None
    hessian_hartree_bohr2: FloatArray | None = None
    gradient_hartree_bohr: FloatArray | None = None
    optimised: bool | None = None
    ended_normally: bool = True
    kind_of_job: tuple[str, ...] = ()
    printed: Mapping[str, Printed] = field(default_factory=dict)
    where: Mapping[str, int] = field(default_factory=dict)
    findings: tuple[Finding, ...] = ()

    def __post_init__(self) -> None:
        freeze(self, "numbers", np.int64, (-1,))
        n = len(self.numbers)
        freeze(self, "positions_angstrom", np.float64, (n, 3))
        freeze(self, "masses_u", np.float64, (n,))
        if self.wavenumbers_cm is not None:
            freeze(self, "wavenumbers_cm", np.float64, (-1,))
        if self.modes is not None:
            freeze(self, "modes", np.float64, (-1, n, 3))
        if self.hessian_hartree_bohr2 is not None:
            freeze(self, "hessian_hartree_bohr2", np.float64, (3 * n, 3 * n))
        if self.gradient_hartree_bohr is not None:
            freeze(self, "gradient_hartree_bohr", np.float64, (n, 3))
        for name in _MAPPINGS:
            object.__setattr__(self, name, MappingProxyType(dict(getattr(self, name))))

    def __getstate__(self) -> dict[str, Any]:
        return {**self.__dict__, **{name: dict(getattr(self, name)) for name in _MAPPINGS}}

    def __setstate__(self, state: dict[str, Any]) -> None:
        self.__dict__.update(state)
        self.__post_init__()

    @property
    def formula(self) -> str:
        """Formula in Hill order, charge not included."""
        return hill_formula(self.numbers)

    @property
    def imaginary_modes(self) -> int | None:
        """How many modes are imaginary; None where there are no modes."""
        return None if self.wavenumbers_cm is None else int(np.sum(self.wavenumbers_cm < 0.0))

    @property
    def atoms(self) -> Atoms:
        """An `ase.Atoms` copy with the masses used."""
        from ase import Atoms

        return Atoms(numbers=self.numbers, positions=self.positions_angstrom, masses=self.masses_u)


_MAPPINGS = ("method_energies", "printed", "where")


def freeze(record: object, name: str, dtype: type, shape: tuple[int, ...]) -> None:
    """Replace the field `name` of a frozen record by a read-only copy of the given type and shape (-1: any)."""
    array: NDArray[np.generic] = np.array(getattr(record, name), dtype=dtype)
    free = [have if want == -1 else want for want, have in zip(shape, array.shape, strict=False)]
    if array.ndim != len(shape) or array.shape != tuple(free):
        raise ValueError(f"{name} has shape {array.shape}, expected {shape}")
    if dtype is np.float64 and not np.isfinite(array).all():
        raise ValueError(f"{name} holds a number that is not finite")
    array.flags.writeable = False
    object.__setattr__(record, name, array)


def hill_formula(numbers: NDArray[np.int64]) -> str:
    """Return the formula in Hill order: C, H, then the rest by alphabet; all by alphabet without carbon."""
    return _hill_formula(np.asarray(numbers, dtype=np.int64).tobytes())


@lru_cache(maxsize=4096)
def _hill_formula(numbers: bytes) -> str:
    return hill_text(Counter(SYMBOLS[z] for z in np.frombuffer(numbers, dtype=np.int64).tolist()))


def hill_text(counts: Mapping[str, int]) -> str:
    """Return the formula of counts by element symbol, as `hill_formula`."""
    first = [symbol for symbol in ("C", "H") if symbol in counts] if "C" in counts else []
    order = first + sorted(symbol for symbol in counts if symbol not in first)
    return "".join(symbol + (str(counts[symbol]) if counts[symbol] > 1 else "") for symbol in order)
