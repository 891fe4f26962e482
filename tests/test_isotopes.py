"""Isotope effects: reduced and full partition functions, exchange equilibria, rates of a study."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from ase.build import molecule
from click.testing import CliRunner
from structures import made

from thermo_pp.cli import main
from thermo_pp.conditions import Treatment
from thermo_pp.errors import StudyError
from thermo_pp.formulas.isotope_ratios import log_product_residual, log_reduced_ratio
from thermo_pp.formulas.normal_modes import normal_modes
from thermo_pp.formulas.vibration import vibration
from thermo_pp.isotopes import Isotopologues, isotopologues
from thermo_pp.kinetics.isotope_effects import IsotopeEffects
from thermo_pp.readers import read
from thermo_pp.records import Calculation
from thermo_pp.species import Structure
from thermo_pp.study.load import Study
from thermo_pp.units import GAS_J_MOL_K, KELVIN_PER_CM

PLUME = Path(__file__).parents[1] / "fixtures" / "stack-plume"
T = np.array([298.15, 500.0, 1000.0])
SCALES = {"onset_cm": 100.0, "frequency_scale": 1.0, "zero_point_scale": 1.0}


def springs(name: str, strength: float = 0.1) -> Calculation:
    """A molecule held by springs between all atoms: a stationary point that may move and turn."""
    atoms = molecule(name)
    n, x = len(atoms), atoms.positions
    hessian = np.zeros((n, 3, n, 3))
    for i in range(n):
        for j in range(i):
            e = (x[i] - x[j]) / np.linalg.norm(x[i] - x[j])
            block = strength * (1 + 0.3 * j) * np.outer(e, e)
            hessian[i, :, i, :] += block
            hessian[j, :, j, :] += block
            hessian[i, :, j, :] -= block
            hessian[j, :, i, :] -= block
    flat = hessian.reshape(3 * n, 3 * n)
    masses = atoms.get_masses()
    nu = normal_modes(flat, masses, x).wavenumbers_cm
    return made(name, atoms.numbers, x, nu, masses_u=masses, hessian_hartree_bohr2=flat)


def pair(calc: Calculation, isotopes: dict[str, str], **treatment: Any) -> Isotopologues:
    structure = Structure.make(calc, Treatment(**treatment), name="X")
    return isotopologues(structure, isotopes, where="here")


# formulas -----------------------------------------------------------------------------------------


def test_hydrogen_exchange() -> None:
    """H2 + D2 = 2 HD with the harmonic wavenumbers of Huber and Herzberg (from memory).

    Computed outside this program: 3.2560, 3.6225, 3.9011; JANAF's formation energies give 3.2555,
    3.6216, 3.9010.
    """
    to_hd = log_reduced_ratio(T, [4401.21], [3813.15])
    to_d2 = log_reduced_ratio(T, [4401.21], [3115.50])
    k = 4.0 * np.exp(2.0 * to_hd - to_d2)
    assert k == pytest.approx([3.2560, 3.6225, 3.9011], abs=1e-4)
    assert k == pytest.approx([3.2555, 3.6216, 3.9010], rel=5e-4)


def test_water_exchange() -> None:
    """H2O + HD = HDO + H2; JANAF's formation energies give 3.5433, 1.8939, 1.2341.

    3.494, 1.879, 1.231 is the answer of fundamentals and measured rotational constants (from memory
    of Shimanouchi's and Huber and Herzberg's tables), computed outside this program.
    """
    h2o, hdo = (1594.75, 3657.05, 3755.93), (1403.5, 2723.7, 3707.5)
    reduced = log_reduced_ratio(T, h2o, hdo) - log_reduced_ratio(T, [4161.17], [3632.2])
    assert np.exp(reduced) == pytest.approx([3.5433, 1.8939, 1.2341], rel=0.015)

    def log_q(mass: float, nu: tuple[float, ...], b: tuple[float, ...], sigma: int) -> np.ndarray:
        t = T[:, np.newaxis]
        modes = vibration(T, np.array(nu), "harmonic", **SCALES)
        energy = modes.zero_point_j_mol + modes.enthalpy_j_mol
        log_vibration = (modes.entropy_j_mol_k / GAS_J_MOL_K - energy / (GAS_J_MOL_K * t)).sum(-1)
        log_rotation = -(1.0 if len(b) == 1 else 0.5) * np.log(b).sum() - np.log(sigma)
        return np.asarray(log_vibration + log_rotation + 1.5 * np.log(mass))

    k = log_q(19.0211, hdo, (23.414, 9.1034, 6.4064), 1)
    k = k - log_q(18.015, h2o, (27.8806, 14.5218, 9.2777), 2)
    k = k + log_q(2.016, (4161.17,), (59.322,), 2) - log_q(3.0221, (3632.2,), (44.662,), 1)
    assert np.exp(k) == pytest.approx([3.494, 1.879, 1.231], abs=6e-4)
    assert k == pytest.approx(reduced, abs=5e-3)  # fundamentals miss the product rule


def test_zero_point_energy_alone() -> None:
    """2900 and 2100 cm^-1 at 298.15 K: 6.891 by the zero-point energies, 4.216 at 400 K."""
    t = np.array([298.15, 400.0])
    ratio = log_reduced_ratio(t, [2900.0], [2100.0])
    u = [KELVIN_PER_CM * nu / t for nu in (2900.0, 2100.0)]
    # what is left after the product term and the thermal part is exp(200 cm^-1 ... per side)
    rest = ratio - np.log(2100.0 / 2900.0) - np.log(np.expm1(-u[0]) / np.expm1(-u[1]))
    assert np.exp(rest) == pytest.approx([6.891, 4.216], abs=6e-4)


def test_scales_and_the_hot_limit() -> None:
    light, heavy = [1600.0, 3700.0], [1200.0, 2700.0]
    zero = log_reduced_ratio(T, light, heavy, zero_point_scale=0.9)
    shift = 0.05 * KELVIN_PER_CM * (sum(light) - sum(heavy)) / T
    assert log_reduced_ratio(T, light, heavy) - zero == pytest.approx(shift, rel=1e-10)
    scaled = log_reduced_ratio(T, light, heavy, frequency_scale=0.9, zero_point_scale=0.9)
    assert scaled == pytest.approx(log_reduced_ratio(T / 0.9, light, heavy), rel=1e-12)
    hot = log_reduced_ratio(1e6, light, heavy)
    u2 = sum(n**2 for n in light) - sum(n**2 for n in heavy)
    assert hot == pytest.approx(KELVIN_PER_CM**2 * u2 / 24e12, rel=1e-4)  # the first quantum term


@pytest.mark.parametrize(
    ("light", "heavy", "what"),
    [
        ([1.0, 2.0], [1.0], "2 and 1 modes of isotopologues"),
        ([1.0], [-1.0], "wavenumbers and temperatures must be above 0"),
    ],
)
def test_what_is_no_pair_is_refused(light: list[float], heavy: list[float], what: str) -> None:
    with pytest.raises(ValueError, match=what):
        log_reduced_ratio(300.0, light, heavy)


# one structure ------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("name", "isotopes"),
    [
        ("H2O", {"H": "D"}),
        ("H2O", {"2": "D"}),
        ("H2O", {"1": "18O", "3": "T"}),
        ("NH3", {"1": "15N"}),
        ("H2", {"1": "D"}),
        ("N2", {"N": "15N"}),
    ],
)
def test_reduced_and_full_partition_functions_agree(name: str, isotopes: dict[str, str]) -> None:
    """Both routes within 1e-6 of each other, where the Hessian is one of a stationary point."""
    found = pair(springs(name), isotopes)
    assert found.log_full_ratio(T) == pytest.approx(found.log_reduced_ratio(T), abs=1e-6, rel=0.0)
    assert np.all(found.log_reduced_ratio(T) > 1e-4)
    assert abs(found.product_residual) < 1e-7
    assert "product-rule" not in [one.code for one in found.findings]


def test_exchange_through_species() -> None:
    """H2 + D2 = 2 HD from one Hessian by G of the species: 4 of symmetry, times the reduced ratios."""
    calc = springs("H2", 0.37)
    t = np.array([298.15, 600.0])
    treatment = {"rotor": "classical", "low_modes": "harmonic"}
    one, two = (pair(calc, isotopes, **treatment) for isotopes in ({"1": "D"}, {"H": "D"}))

    def gibbs(structure: Structure) -> np.ndarray:
        return structure.at(t).gibbs_kj_mol

    change = 2.0 * gibbs(one.heavy) - gibbs(one.light) - gibbs(two.heavy)
    k = np.exp(-1000.0 * change / (GAS_J_MOL_K * t))
    expected = 4.0 * np.exp(2.0 * one.log_reduced_ratio(t) - two.log_reduced_ratio(t))
    assert k == pytest.approx(expected, rel=1e-6)
    assert (one.light.symmetry_number, one.heavy.symmetry_number) == (2, 1)
    assert one.plain.symmetry_number == 2
    assert two.heavy.symmetry_number == 2


def test_given_constants_follow_the_moment_of_inertia() -> None:
    structure = Structure.make(
        springs("H2", 0.37),
        Treatment(),
        name="H2",
        rotational_constants={"B": 59.0, "D": 0.046},
    )
    heavy = isotopologues(structure, {"H": "D"}, where="here").heavy
    ratio = 1.008 / 2.01410177812
    assert heavy.gas.theta_k[0] / KELVIN_PER_CM == pytest.approx(59.0 * ratio, rel=1e-5)
    assert heavy.gas.distortion_k / KELVIN_PER_CM == pytest.approx(0.046 * ratio**2, rel=1e-5)
    assert heavy.gas.spin_weights == (4 / 3, 2 / 3)


def test_a_hessian_that_misses_the_product_rule() -> None:
    calc = springs("H2O")
    assert calc.hessian_hartree_bohr2 is not None
    off = calc.hessian_hartree_bohr2.copy()
    off[5, 5] += 0.02  # a field that pulls at one atom
    bad = made("bad", calc.numbers, calc.positions_angstrom, calc.wavenumbers_cm,
               masses_u=calc.masses_u, hessian_hartree_bohr2=off)  # fmt: skip
    found = pair(bad, {"H": "D"})
    [finding] = [one for one in found.findings if one.code == "product-rule"]
    assert finding.severity == "warning"
    assert abs(found.product_residual) > 0.005
    difference = found.log_reduced_ratio(T) - found.log_full_ratio(T)
    assert difference == pytest.approx(found.product_residual, abs=1e-9)


def test_product_rule_of_hydrogen_isotopologues() -> None:
    """nu(HD)/nu(H2) is the root of the reduced masses' ratio, and nothing else meets the rule."""
    x = [[0.0, 0.0, 0.0], [0.74, 0.0, 0.0]]
    masses = np.array([1.00782503, 1.00782503]), np.array([1.00782503, 2.01410178])
    reduced = [m.prod() / m.sum() for m in masses]
    heavy = 4400.0 * np.sqrt(reduced[0] / reduced[1])
    assert log_product_residual(x, *masses, [4400.0], [heavy]) == pytest.approx(0.0, abs=1e-12)
    assert log_product_residual(x, *masses, [4400.0], [1.01 * heavy]) == pytest.approx(
        np.log(1.01), abs=1e-12
    )


@pytest.mark.parametrize(
    ("isotopes", "what", "mend"),
    [
        ({"H": "9H"}, "'9H' is not known", "known are 1H, 2H, 3H"),
        ({"4": "D"}, "'4' is neither an element nor an atom number from 1 to 3", "isotopes"),
        ({"C": "13C"}, "no atom C to give an isotope", "isotopes"),
    ],
)
def test_isotopes_that_do_not_exist(isotopes: dict[str, str], what: str, mend: str) -> None:
    with pytest.raises(StudyError) as caught:
        pair(springs("H2O"), isotopes)
    assert caught.value.what == what
    assert mend in caught.value.mend


def test_no_hessian_and_nuclear_spins_are_refused() -> None:
    calc = springs("H2", 0.37)
    bare = made("bare", calc.numbers, calc.positions_angstrom, calc.wavenumbers_cm)
    with pytest.raises(StudyError, match="isotopes change the modes, and runs/bare"):
        pair(bare, {"H": "D"})
    structure = Structure.make(calc, Treatment(), name="H2", nuclear_spins="para")
    with pytest.raises(StudyError, match="nuclear_spins are those of one isotopologue"):
        isotopologues(structure, {"H": "D"}, where="here")


def test_declared_symmetry_number_is_kept_and_told() -> None:
    structure = Structure.make(springs("H2O"), Treatment(), name="W", symmetry_number=2)
    found = isotopologues(structure, {"2": "D"}, where="here")
    assert found.heavy.symmetry_number == 2
    assert [one.code for one in found.findings] == ["declared-symmetry-kept"]


# a real saddle point ------------------------------------------------------------------------------


def independent_log_q(calc: Calculation, masses: np.ndarray, t: float) -> tuple[float, float]:
    """ln Q (classical rotor, oscillators) and the imaginary wavenumber, with numpy alone.

    The Hessian is not projected: the six smallest of its eigenvalues are left out.
    """
    kb, h, c, u, eh, bohr = 1.380649e-23, 6.62607015e-34, 299792458.0, 1.6605390689e-27, \
        4.3597447222e-18, 5.29177210544e-11  # fmt: skip
    root = np.repeat(np.sqrt(masses), 3)
    values = np.linalg.eigvalsh(calc.hessian_hartree_bohr2 / np.outer(root, root))
    nu = np.sign(values) * np.sqrt(np.abs(values) * eh / (bohr**2 * u)) / (200.0 * np.pi * c)
    keep = np.argsort(np.abs(nu))[6:]
    nu = np.sort(nu[keep])
    imaginary = -nu[0] if nu[0] < 0.0 else 0.0
    real = nu[nu > 0.0]
    x = h * c * 100.0 * real / (kb * t)
    log_q = (-0.5 * x - np.log1p(-np.exp(-x))).sum()
    r = calc.positions_angstrom - masses @ calc.positions_angstrom / masses.sum()
    inertia = sum(m * (p @ p * np.eye(3) - np.outer(p, p)) for m, p in zip(masses, r, strict=True))
    return float(log_q + 1.5 * np.log(masses.sum()) + 0.5 * np.log(np.linalg.det(inertia))), float(
        imaginary
    )


def labelled_study(tmp_path: Path, isotopologue_keys: str, treatment: str = "") -> Path:
    text = (PLUME / "study.toml").read_text(encoding="utf-8")
    text = text.replace('outputs = "outputs"', f'outputs = "{PLUME / "outputs"}"')
    text = text.replace('low_modes = "rotor-entropy"', f'low_modes = "harmonic"\n{treatment}')
    file = tmp_path / "study.toml"
    file.write_text(f"{text}\n{isotopologue_keys}\n", encoding="utf-8")
    return file


DEUTERATED = '[isotopologues.D]\nall = { H = "D" }'


def only(file: Path, temperatures: list[float]) -> IsotopeEffects:
    [found] = Study.load(file, temperatures=temperatures).isotope_effects()
    return found


def test_kinetic_isotope_effect_of_a_real_step(tmp_path: Path) -> None:
    """C2 through TS2 of the bundled study, both waters deuterated, against numpy alone."""
    t = 298.15
    file = labelled_study(tmp_path, DEUTERATED, 'rotor = "classical"')
    effects = only(file, [t])
    [step] = [one for one in effects.steps if one.equation == "C2 = acid + W"]
    logs, imaginary = {}, {}
    for name, output in (("C2", "so3-water2.out"), ("TS", "ts-assisted.out")):
        calc = read(PLUME / "outputs" / output)
        for kind in ("light", "heavy"):
            masses = np.array(calc.masses_u)
            if kind == "heavy":
                masses[calc.numbers == 1] = 2.01410177812
            logs[name, kind], imaginary[name, kind] = independent_log_q(calc, masses, t)
    expected = np.exp(
        logs["TS", "light"] - logs["TS", "heavy"] - logs["C2", "light"] + logs["C2", "heavy"]
    )
    assert imaginary["TS", "light"] > imaginary["TS", "heavy"] > 100.0
    assert step.forward_without_symmetry == pytest.approx([expected], rel=3e-3)
    assert step.harmonic_forward == pytest.approx([expected], rel=3e-3)
    assert step.forward_without_symmetry == pytest.approx(step.harmonic_forward, rel=2e-4)
    assert 4.0 < expected < 6.0
    assert step.tunnelling == pytest.approx([1.0])
    frame = effects.table().set_index(["kind", "name"])
    assert frame.effect["step", "C2 = acid + W"] == step.forward[0]
    assert list(frame.effect["rate"]) == [rate.effect[0] for rate in effects.rates]
    assert "<table" in effects._repr_html_()
    for one in effects.species:
        assert one.log_full_ratio(t) == pytest.approx(
            one.log_reduced_ratio(np.array([t])), abs=1e-4
        )


def test_tunnelling_is_in_them_where_asked(tmp_path: Path) -> None:
    file = labelled_study(tmp_path, DEUTERATED, 'tunnelling = "eckart"')
    effects = only(file, [298.15])
    file = labelled_study(tmp_path, DEUTERATED)
    bare = only(file, [298.15])
    for step, other in zip(effects.steps, bare.steps, strict=True):
        if other.harmonic_forward is None:
            assert step.tunnelling == pytest.approx([1.0])
            continue
        assert step.tunnelling[0] > 1.05
        if step.equation == "C1 = acid":  # no limit is joined
            assert step.forward == pytest.approx(other.forward * step.tunnelling, rel=1e-9)
        assert step.equilibrium == pytest.approx(other.equilibrium, rel=1e-9)


def test_effective_rates_against_two_studies(tmp_path: Path) -> None:
    """Light over heavy, against studies whose species have their isotopes in the file."""
    t = [280.0, 340.0]
    file = labelled_study(tmp_path, DEUTERATED)
    effects = only(file, t)
    assert [rate.definition for rate in effects.rates] == ["free", "pool", "relaxation"]
    light = Study.load(file, temperatures=t).effective()
    text = file.read_text(encoding="utf-8")
    for name in ("W", "W2", "C1", "C2", "acid", "TS1", "TS2"):
        text = text.replace(f"[species.{name}]", f'[species.{name}]\nisotopes = {{ H = "D" }}')
    file.write_text(text.replace(DEUTERATED, ""), encoding="utf-8")
    heavy = Study.load(file, temperatures=t).effective()
    for rate in effects.rates:
        one, two = light.rates[rate.definition], heavy.rates[rate.definition]
        assert one is not None
        assert two is not None
        # the light wavenumbers are the printed ones there, of the Hessian here
        assert rate.effect == pytest.approx(one.rate_constant / two.rate_constant, rel=2e-3)
        energy = two.arrhenius_energy_kj_mol - one.arrhenius_energy_kj_mol
        assert rate.arrhenius_energy_difference_kj_mol == pytest.approx(energy, abs=0.01)


def test_slope_of_the_effect_is_the_difference_of_the_energies(tmp_path: Path) -> None:
    step = 0.01
    effects = only(labelled_study(tmp_path, DEUTERATED), [300.0 - step, 300.0, 300.0 + step])
    for rate in effects.rates:
        slope = np.log(rate.effect[2] / rate.effect[0]) / (2.0 * step)
        found = -rate.arrhenius_energy_difference_kj_mol[1]
        assert found == pytest.approx(GAS_J_MOL_K * 300.0**2 * slope / 1000.0, abs=1e-4)


def test_symmetry_is_shown_apart(tmp_path: Path) -> None:
    """One D in water: half the symmetry number; the dimer and its way to it are none the wiser."""
    calc = read(PLUME / "outputs" / "water-dimer.out")
    hydrogen = int(np.flatnonzero(calc.numbers == 1)[0]) + 1
    water = int(np.flatnonzero(read(PLUME / "outputs" / "water.out").numbers == 1)[0]) + 1
    text = f"""
[isotopologues.HDO]
species.W = {{ {water} = "D" }}
species.W2 = {{ {hydrogen} = "D" }}
"""
    file = labelled_study(tmp_path, text)
    with pytest.raises(StudyError) as caught:
        Study.load(file).isotope_effects()
    assert caught.value.what == (
        "the step 'W + W = W2' has 2 2H put in on the left side and 1 2H on the right side"
    )
    assert "a second entry of its own" in caught.value.mend
    structure = Study.load(file).species["W"]
    assert isinstance(structure, Structure)
    found = isotopologues(structure, {str(water): "D"}, where="here")
    t = np.array([300.0])
    change = found.plain.at(t).gibbs_kj_mol - found.heavy.at(t).gibbs_kj_mol
    assert change == pytest.approx(GAS_J_MOL_K * 300.0 * np.log(2.0) / 1000.0, rel=1e-9)


# refusals, findings, output -----------------------------------------------------------------------


@pytest.mark.parametrize(
    ("keys", "what"),
    [
        ('[isotopologues.D]\nspecies.X = { 1 = "D" }', "unknown species 'X'"),
        ('[isotopologues.D]\nall = { N = "15N" }', "no species has isotopes put in by 'D'"),
        ("", "the study says no isotopes to compare with"),
        (
            '[isotopologues.D]\nspecies.C1 = { H = "D" }',
            "the step 'SO3 + W = C1' has no isotope put in on the left side and 2 2H on the right side",
        ),
        ('[isotopologues.D]\nall = { H = "9H" }', "'9H' is not known"),
    ],
)
def test_refusals(keys: str, what: str, tmp_path: Path) -> None:
    with pytest.raises(StudyError) as caught:
        Study.load(labelled_study(tmp_path, keys)).isotope_effects()
    assert caught.value.what == what
    assert "isotopologues" in caught.value.where


def test_declared_species_hold_no_isotopes(tmp_path: Path) -> None:
    file = labelled_study(tmp_path, DEUTERATED)
    text = file.read_text(encoding="utf-8")
    declared = (
        'composition = "H4O2"\nenthalpy = "-12 kJ/mol"\nentropy = "-90 J/mol/K"\n'
        "relative_to = { W = 2 }"
    )
    text = text.replace('frequencies = "water-dimer.out"\nenergy = "water-dimer_mp2.out"', declared)
    file.write_text(text, encoding="utf-8")
    with pytest.raises(StudyError, match="W2 is no single structure with a Hessian"):
        Study.load(file).isotope_effects()


def test_findings_of_soft_modes_and_limits(tmp_path: Path) -> None:
    file = labelled_study(tmp_path, DEUTERATED)
    file.write_text(
        file.read_text(encoding="utf-8").replace('"harmonic"', '"rotor-entropy"'), encoding="utf-8"
    )
    codes = [one.code for one in only(file, [298.15]).findings]
    assert codes.count("rate-without-isotopes") == 4
    assert codes.count("isotopes-and-soft-modes") == 1
    quiet = only(labelled_study(tmp_path, DEUTERATED), [298.15])
    assert "isotopes-and-soft-modes" not in [one.code for one in quiet.findings]


@pytest.mark.parametrize("format_name", ["table", "csv", "markdown", "latex", "json"])
def test_command(format_name: str, tmp_path: Path) -> None:
    file = labelled_study(tmp_path, DEUTERATED)
    arguments = ["isotopes", str(file), "-T", "300", "--format", format_name, "--quiet"]
    run = CliRunner().invoke(main, arguments)
    assert run.exit_code == 0, run.output
    if format_name != "json":
        assert "C2 = acid + W" in run.output
        assert "TS2" in run.output
        return
    answer = json.loads(run.output)
    assert answer["format"] == "thermo-pp/isotopes/1"
    expected = only(file, [300.0])
    [one] = answer["isotopologues"]
    free = expected.rates[0]
    assert one["rates"]["per_free_reactant"]["effect"] == free.effect.tolist()
    assert one["steps"][-1]["harmonic_forward"] == expected.steps[-1].harmonic_forward.tolist()  # type: ignore[union-attr]
    assert one["species"][0]["log_reduced_ratio"] == pytest.approx(
        expected.species[0].log_reduced_ratio(np.array([300.0])).tolist()
    )
