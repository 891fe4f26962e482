"""H, S, G and Cp of 1,000 structures of 20 atoms at 100 temperatures, against ASE's own loop.

Run: ``python tests/benchmarks/bench_thermochemistry.py``; exit 1 where we are less than 150 times
faster. ASE runs on a slice that is scaled up (its time is the same for every structure); both give
the same numbers on that slice, which is checked first.
"""

from __future__ import annotations

import os
import platform
import sys
import time

import numpy as np
from ase import Atoms, units
from ase.thermochemistry import IdealGasThermo

from thermo_pp.conditions import Treatment
from thermo_pp.records import Calculation
from thermo_pp.species.many import many
from thermo_pp.species.structure import Structure
from thermo_pp.units import AVOGADRO_MOL, ELEMENTARY_CHARGE_C

STRUCTURES, ATOMS, SLICE, TARGET = 1000, 20, 5, 150.0
TEMPERATURES_K = np.linspace(200.0, 1190.0, 100)


def calculation(rng: np.random.Generator) -> Calculation:
    numbers = np.concatenate([np.full(8, 6), np.full(12, 1)])
    return Calculation(
        path="made",
        sha256="",
        program="made",
        numbers=numbers,
        positions_angstrom=rng.uniform(-4.0, 4.0, (ATOMS, 3)),
        masses_u=np.where(numbers == 6, 12.0, 1.00782503223),
        masses_origin="derived",
        charge=0,
        multiplicity=1,
        energy_hartree=-310.0 + rng.normal(),
        wavenumbers_cm=np.sort(rng.uniform(15.0, 3200.0, 3 * ATOMS - 6)),
    )


def ours(structures: list[Structure], low_modes: str) -> float:
    best = np.inf
    for _ in range(3):
        begin = time.perf_counter()
        many(structures, TEMPERATURES_K, low_modes=low_modes)
        best = min(best, time.perf_counter() - begin)
    return best


def ase_loop(calculations: list[Calculation]) -> tuple[float, np.ndarray]:
    """Return the seconds and H, S, G (eV) of ASE's own functions, its constructors not counted."""
    made = [
        IdealGasThermo(
            vib_energies=one.wavenumbers_cm * units.invcm,
            geometry="nonlinear",
            potentialenergy=one.energy_hartree * units.Hartree,
            atoms=Atoms(one.numbers, one.positions_angstrom, masses=one.masses_u),
            symmetrynumber=1,
            spin=0,
        )
        for one in calculations
    ]
    values = np.empty((len(made), len(TEMPERATURES_K), 3))
    begin = time.perf_counter()
    for i, thermo in enumerate(made):
        for j, t in enumerate(TEMPERATURES_K):
            values[i, j, 0] = thermo.get_enthalpy(t, verbose=False)
            values[i, j, 1] = thermo.get_entropy(t, 1e5, verbose=False)
            values[i, j, 2] = thermo.get_gibbs_energy(t, 1e5, verbose=False)
    return time.perf_counter() - begin, values


def main() -> int:
    rng = np.random.default_rng(20)
    treatment = Treatment(low_modes="harmonic", rotor="classical", enantiopure=True)
    calculations = [calculation(rng) for _ in range(STRUCTURES)]
    begin = time.perf_counter()
    structures = [
        Structure.make(one, treatment, name=str(k), kind="minimum")
        for k, one in enumerate(calculations)
    ]
    making = time.perf_counter() - begin
    ase_slice, ase_values = ase_loop(calculations[:SLICE])
    mine = many(structures[:SLICE], TEMPERATURES_K)
    kj = AVOGADRO_MOL * ELEMENTARY_CHARGE_C / 1000.0
    difference = np.abs(mine.entropy_j_mol_k / (1000.0 * kj * ase_values[..., 1]) - 1.0).max()
    if difference > 1e-4:
        print(f"entropies differ by {difference:.1e}: the comparison means nothing")
        return 1
    ase_seconds = ase_slice * STRUCTURES / SLICE
    seconds = {name: ours(structures, name) for name in ("harmonic", "rotor-entropy")}
    load = os.getloadavg()[0] if hasattr(os, "getloadavg") else float("nan")
    print(f"machine: {platform.processor() or platform.machine()}, {os.cpu_count()} cores, "
          f"load {load:.2f}, Python {platform.python_version()}, numpy {np.__version__}")  # fmt: skip
    print(f"ASE H+S+G, {STRUCTURES} structures x {len(TEMPERATURES_K)} temperatures: "
          f"{ase_seconds:.1f} s (scaled up from {SLICE} structures)")  # fmt: skip
    print(f"settling {STRUCTURES} structures, once for all temperatures: {making:.2f} s")
    failed = False
    for name, value in seconds.items():
        ratio = ase_seconds / value
        failed |= ratio < TARGET
        print(f"ours, H+S+G+Cp, {name}: {value:.3f} s, {ratio:.0f} times faster "
              f"(target {TARGET:.0f})")  # fmt: skip
    return int(failed)


if __name__ == "__main__":
    sys.exit(main())
