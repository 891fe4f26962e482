"""An ensemble of 100,000 members at 50 temperatures, against a Python loop over ASE's objects.

Run: ``python tests/benchmarks/bench_ensemble.py``; exit 1 where H, S, G, Cp and the populations of
the ensemble take more than a hundredth of the time of the loop, or more memory than stated. The loop
(H, S and G of each member, then their Boltzmann sum) runs on a slice of the same members and is
scaled up: its time is the same for every member. On that slice both give the same G, which is
checked first. Making the members (for ASE: its constructors) is in neither time; both are times of
the processor, so that a busy machine does not favour either.
"""

from __future__ import annotations

import dataclasses
import sys
import time
import tracemalloc

import numpy as np
from ase import Atoms, units
from ase.thermochemistry import IdealGasThermo
from machine import report

from thermo_pp.conditions import Treatment
from thermo_pp.ensemble import Ensemble, Member
from thermo_pp.records import Calculation
from thermo_pp.species import Structure
from thermo_pp.units import AVOGADRO_MOL, ELEMENTARY_CHARGE_C

MEMBERS, ATOMS, SLICE, TARGET = 100_000, 20, 4, 100.0
TEMPERATURES_K = np.linspace(200.0, 690.0, 50)
MOST_MB = 200.0
"""Peak with what is reported of every member: G, populations and G by number of members, members x
temperatures each, are 120 MB. An array of members x temperatures x modes would be 2160 MB."""
MOST_AT_MB = 10.0
"""Peak of H, S, G and Cp alone, for which no array of members x temperatures is needed."""


def first(rng: np.random.Generator) -> Calculation:
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
        energy_hartree=-310.0,
        wavenumbers_cm=np.sort(rng.uniform(15.0, 3200.0, 3 * ATOMS - 6)),
    )


def members(rng: np.random.Generator) -> list[Structure]:
    """Return structures that differ in energy, wavenumbers and moments of inertia."""
    treatment = Treatment(low_modes="harmonic", rotor="classical", enantiopure=True)
    one = Structure.make(first(rng), treatment, name="made", kind="minimum")
    made = []
    for _ in range(MEMBERS):
        gas = dataclasses.replace(
            one.gas,
            wavenumbers_cm=np.sort(rng.uniform(15.0, 3200.0, 3 * ATOMS - 6)),
            theta_k=one.gas.theta_k * rng.uniform(0.8, 1.2),
        )
        energy = -310.0 + rng.uniform(0.0, 0.01)
        made.append(dataclasses.replace(one, gas=gas, energy_hartree=energy))
    return made


def ase_loop(structures: list[Structure]) -> tuple[float, np.ndarray]:
    """Return the seconds, and G (eV) of each member, shape (n, t), of ASE's own functions."""
    thermos = []
    for one in structures:
        scale = np.sqrt(np.mean(structures[0].gas.theta_k) / np.mean(one.gas.theta_k))
        atoms = Atoms(
            one.calculation.numbers,
            one.calculation.positions_angstrom * scale,
            masses=one.calculation.masses_u,
        )
        thermos.append(
            IdealGasThermo(
                vib_energies=one.gas.wavenumbers_cm * units.invcm,
                geometry="nonlinear",
                potentialenergy=one.energy_hartree * units.Hartree,
                atoms=atoms,
                symmetrynumber=1,
                spin=0,
            )
        )
    gibbs = np.empty((len(thermos), len(TEMPERATURES_K)))
    begin = time.process_time()
    for i, thermo in enumerate(thermos):
        for j, t in enumerate(TEMPERATURES_K):
            thermo.get_enthalpy(t, verbose=False)
            thermo.get_entropy(t, 1e5, verbose=False)
            gibbs[i, j] = thermo.get_gibbs_energy(t, 1e5, verbose=False)
    for j, t in enumerate(TEMPERATURES_K):
        np.exp(-(gibbs[:, j] - gibbs[:, j].min()) / (units.kB * t)).sum()
    return time.process_time() - begin, gibbs


def ensemble(structures: list[Structure]) -> Ensemble:
    one = structures[0]
    counted = tuple(Member(model, 1) for model in structures)
    return Ensemble("made", "minimum", one.composition, one.charge, counted, ())


def peak_mb(model: Ensemble, populations: bool) -> float:
    tracemalloc.start()
    _ = model.computed(TEMPERATURES_K) if populations else model.at(TEMPERATURES_K)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    return peak / 1e6


def main() -> int:
    rng = np.random.default_rng(20)
    begin = time.perf_counter()
    structures = members(rng)
    print(f"making {MEMBERS} members: {time.perf_counter() - begin:.1f} s, in neither time")
    ase_seconds, gibbs = ase_loop(structures[:SLICE])
    # the slice itself as an ensemble, its electronic energies those of the slice
    kj = AVOGADRO_MOL * ELEMENTARY_CHARGE_C / 1000.0
    mine = ensemble(structures[:SLICE]).computed(TEMPERATURES_K)[1].gibbs_kj_mol
    difference = np.abs((mine - mine[:1]) - kj * (gibbs - gibbs[:1])).max()
    if difference > 1e-3:
        print(f"G of the members differ by {difference:.1e} kJ/mol: the comparison means nothing")
        return 1
    model = ensemble(structures)
    begin = time.process_time()
    model.computed(TEMPERATURES_K)
    ours = time.process_time() - begin
    what = f"ensemble of {MEMBERS} members at {len(TEMPERATURES_K)} temperatures"
    failed = report(what, ours, ase_seconds * MEMBERS / SLICE, TARGET)
    for populations, most in ((False, MOST_AT_MB), (True, MOST_MB)):
        peak = peak_mb(model, populations)
        words = "with populations" if populations else "H, S, G, Cp alone"
        print(f"  peak memory, {words}: {peak:.1f} MB (limit {most:g})")
        failed |= int(peak > most)
    return failed


if __name__ == "__main__":
    sys.exit(main())
