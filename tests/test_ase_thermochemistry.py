"""Agreement with `ase.thermochemistry` to 1e-6, given our constants and our masses.

ASE 3.29 works with CODATA 2014 by default; here it is given the 2022 set it has itself, which must
first agree with ours. ASE knows neither quantum rotors nor handedness, so both are off.
"""

from __future__ import annotations

from types import SimpleNamespace

import ase.thermochemistry
import pytest
from ase import units as ase_units
from ase.build import molecule
from ase.thermochemistry import (
    HarmonicMode,
    IdealGasThermo,
    MSRRHOThermo,
    QuasiHarmonicThermo,
    RRHOMode,
)
from structures import made, masses

import thermo_pp.units as own
from thermo_pp.formulas.rotor import principal_moments
from thermo_pp.formulas.vibration import MEAN_INERTIA_KG_M2, vibration
from thermo_pp.records import Calculation
from thermo_pp.species import thermochemistry

KJ = own.EV_KJ_MOL
TEMPERATURES = [150.0, 298.15, 1000.0]
MOLECULES = {  # name: (geometry, symmetry number, multiplicity, wavenumbers)
    "H2O": ("nonlinear", 2, 1, [1594.75, 3657.05, 3755.93]),
    "CO2": ("linear", 2, 1, [667.38, 667.38, 1333.0, 2349.14]),
    "HCN": ("linear", 1, 1, [711.98, 711.98, 2096.85, 3311.48]),
    "CH3": ("nonlinear", 6, 2, [606.5, 1396.0, 1396.0, 3004.4, 3161.0, 3161.0]),
    "H2O2": ("nonlinear", 2, 1, [22.0, 60.0, 130.0, 880.0, 1300.0, 3600.0]),
    "O": ("monatomic", 1, 3, []),
}


@pytest.fixture(autouse=True)
def our_constants(monkeypatch: pytest.MonkeyPatch) -> SimpleNamespace:
    """Give ASE the CODATA set that ours is."""
    values = SimpleNamespace(**ase_units.create_units("2022"))
    monkeypatch.setattr(ase.thermochemistry, "units", values)
    return values


def calculation(name: str) -> tuple[Calculation, str, int, float]:
    geometry, sigma, multiplicity, wavenumbers = MOLECULES[name]
    atoms = molecule(name)
    calc = made(name, atoms.numbers, atoms.positions, wavenumbers, multiplicity=multiplicity)
    return calc, geometry, sigma, (multiplicity - 1) / 2


def ase_atoms(calc: Calculation):
    atoms = calc.atoms
    atoms.set_masses(masses(calc.numbers))
    return atoms


def test_constants_are_the_same_year(our_constants: SimpleNamespace) -> None:
    for ours, theirs in (
        (own.BOLTZMANN_J_K, our_constants._k),
        (own.PLANCK_J_S, our_constants._hplanck),
        (own.AVOGADRO_MOL, our_constants._Nav),
        (own.ATOMIC_MASS_KG, our_constants._amu),
        (own.WAVENUMBER_KJ_MOL / KJ, our_constants.invcm),
    ):
        assert ours == pytest.approx(theirs, rel=1e-9)
    assert ase_units.__codata_version__ == "2014"


@pytest.mark.parametrize("name", MOLECULES)
def test_ideal_gas(name: str, our_constants: SimpleNamespace) -> None:
    calc, geometry, sigma, spin = calculation(name)
    assert calc.energy_hartree is not None
    potential = calc.energy_hartree * own.HARTREE_KJ_MOL / KJ
    thermo = IdealGasThermo(
        vib_energies=calc.wavenumbers_cm * our_constants.invcm,
        geometry=geometry,
        potentialenergy=potential,
        atoms=ase_atoms(calc),
        symmetrynumber=sigma,
        spin=spin,
    )
    found = thermochemistry(
        calc, TEMPERATURES, low_modes="harmonic", rotor="classical", enantiopure=True
    )
    assert found.symmetry_number == sigma
    for k, t in enumerate(TEMPERATURES):
        enthalpy = thermo.get_enthalpy(t, verbose=False) * KJ
        entropy = thermo.get_entropy(t, 1e5, verbose=False) * KJ * 1000.0
        gibbs = thermo.get_gibbs_energy(t, 1e5, verbose=False) * KJ
        assert found.entropy_j_mol_k[k] == pytest.approx(entropy, rel=1e-6)
        # the parts that are not the electronic energy, which would hide everything
        assert found.electronic_kj_mol is not None
        base = found.electronic_kj_mol
        assert found.enthalpy_kj_mol[k] - base == pytest.approx(enthalpy - potential * KJ, rel=1e-6)
        assert found.gibbs_kj_mol[k] - base == pytest.approx(gibbs - potential * KJ, rel=1e-6)


@pytest.mark.parametrize("treat_int_energy", [False, True])
@pytest.mark.parametrize("name", ["H2O2", "CH3"])
def test_ms_rrho(name: str, treat_int_energy: bool, our_constants: SimpleNamespace) -> None:
    """With tau = 100; our formula called with B_av = the mean principal moment, as ASE takes it."""
    calc, *_ = calculation(name)
    atoms = ase_atoms(calc)
    thermo = MSRRHOThermo(
        calc.wavenumbers_cm * our_constants.invcm,
        atoms,
        tau=100.0,
        treat_int_energy=treat_int_energy,
    )
    moment = principal_moments(calc.masses_u, calc.positions_angstrom).mean()
    found = vibration(
        TEMPERATURES,
        calc.wavenumbers_cm,
        "rotor-enthalpy" if treat_int_energy else "rotor-entropy",
        mean_inertia_kg_m2=moment * own.ATOMIC_MASS_KG * 1e-20,
    )
    for k, t in enumerate(TEMPERATURES):
        entropy = thermo.get_entropy(t, verbose=False) * KJ * 1000.0
        energy = thermo.get_internal_energy(t, verbose=False) * KJ * 1000.0
        assert found.entropy_j_mol_k[k].sum() == pytest.approx(entropy, rel=1e-6)
        ours = found.enthalpy_j_mol[k].sum() + found.zero_point_j_mol.sum()
        assert ours == pytest.approx(energy, rel=1e-6)


def test_raised(our_constants: SimpleNamespace) -> None:
    calc, *_ = calculation("H2O2")
    thermo = QuasiHarmonicThermo(
        calc.wavenumbers_cm * our_constants.invcm, raise_to=100.0 * our_constants.invcm
    )
    found = vibration(TEMPERATURES, calc.wavenumbers_cm, "raised")
    for k, t in enumerate(TEMPERATURES):
        entropy = thermo.get_entropy(t, verbose=False) * KJ * 1000.0
        energy = thermo.get_internal_energy(t, verbose=False) * KJ * 1000.0
        assert found.entropy_j_mol_k[k].sum() == pytest.approx(entropy, rel=1e-6)
        ours = found.enthalpy_j_mol[k].sum() + found.zero_point_j_mol.sum()
        assert ours == pytest.approx(energy, rel=1e-6)


@pytest.mark.parametrize("low_modes", ["rotor-entropy", "rotor-enthalpy"])
def test_whole_structure_with_soft_modes(low_modes: str, our_constants: SimpleNamespace) -> None:
    """The same through `thermochemistry`: ASE's modes, given B_av = 1e-44 kg m2, in its ideal gas."""
    calc, geometry, sigma, spin = calculation("H2O2")
    inertia = MEAN_INERTIA_KG_M2 / own.ATOMIC_MASS_KG * 1e20
    energies = calc.wavenumbers_cm * our_constants.invcm
    soft = [
        RRHOMode(e, inertia, tau=100.0, treat_int_energy=low_modes == "rotor-enthalpy")
        for e in energies
    ]
    stiff = [HarmonicMode(e) for e in energies]
    thermo = IdealGasThermo(
        vib_energies=energies,
        geometry=geometry,
        atoms=ase_atoms(calc),
        symmetrynumber=sigma,
        spin=spin,
    )
    found = thermochemistry(
        calc, TEMPERATURES, low_modes=low_modes, rotor="classical", enantiopure=True
    )
    assert found.electronic_kj_mol is not None
    for k, t in enumerate(TEMPERATURES):
        entropy = thermo.get_entropy(t, 1e5, verbose=False)
        entropy += sum(
            one.get_entropy(t, False) - two.get_entropy(t, False)
            for one, two in zip(soft, stiff, strict=True)
        )
        assert found.entropy_j_mol_k[k] == pytest.approx(entropy * KJ * 1000.0, rel=1e-6)
        enthalpy = thermo.get_enthalpy(t, verbose=False)
        enthalpy += sum(
            one.get_internal_energy(t, False) - two.get_internal_energy(t, False)
            for one, two in zip(soft, stiff, strict=True)
        )
        ours = found.enthalpy_kj_mol[k] - found.electronic_kj_mol
        assert ours == pytest.approx(enthalpy * KJ, rel=1e-6)
