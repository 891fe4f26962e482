"""NWChem text outputs: every fixture against its table, truncated and damaged copies, thermochemistry."""

from __future__ import annotations

import math
import re
from pathlib import Path

import numpy as np
import pytest
from fixture_files import FIXTURES, expected, file_id, files

from thermo_pp import units
from thermo_pp.errors import ReadError
from thermo_pp.formulas import partition, rotor, vibration
from thermo_pp.formulas.normal_modes import normal_modes
from thermo_pp.readers import nwchem, read_source
from thermo_pp.readers.nwchem import constants
from thermo_pp.readers.text import Text
from thermo_pp.records import Calculation
from thermo_pp.sources import Source, open_source

GOOD = files("nwchem", "good")
BAD = files("nwchem", "bad")
WITH_MODES = [path for path in GOOD if "wavenumbers_cm" in expected(path)]
PLUME = FIXTURES / "stack-plume" / "outputs"
SHARED = Path("/work/shared/data/other-programs/NWChem/basicNWChem7.0/water_mp2.out")
LABELS = {"SCF": "HF"}
"""What the tables call an energy -> what the record calls it."""
PRINTED = {
    "temperature": "temperature",
    "zero_point": "zero_point",
    "thermal_energy": "thermal_energy",
    "thermal_enthalpy": "thermal_enthalpy",
    "entropy": "entropy",
    "translational_entropy": "entropy_translational",
    "rotational_entropy": "entropy_rotational",
    "vibrational_entropy": "entropy_vibrational",
    "heat_capacity_v": "heat_capacity_cv",
    "symmetry_number": "symmetry_number",
    "molecular_weight": "molecular_weight",
    "frequency_scale": "frequency_scale",
}
"""Key of the record -> key of the tables."""
UNITS = {"cal/(mol K)": "cal/mol-K", "u": ""}
"""Unit of the record -> as the program prints it."""


def good(name: str) -> Path:
    return FIXTURES / "nwchem" / "good" / f"{name}.out"


def calculation(path: Path) -> Calculation:
    return nwchem.read(open_source(path, path.name))


def changed(path: Path, old: bytes, new: bytes, count: int = 1) -> Source:
    """A fixture in which `old` is replaced by `new`; it must have stood there."""
    data = path.read_bytes()
    assert old in data
    return Source(path.name, data.replace(old, new, count))


def codes(calc: Calculation) -> list[str]:
    return [finding.code for finding in calc.findings]


# what stands in the fixtures


@pytest.mark.parametrize("path", GOOD, ids=file_id)
def test_energy_and_molecule(path: Path) -> None:
    expect, calc = expected(path), calculation(path)
    assert calc.program == "nwchem"
    assert calc.program_version == "7.0.2"
    assert calc.energy_hartree == expect["energy_hartree"]
    assert calc.where["energy_hartree"] == expect["energy_line"]
    assert calc.energy_label == LABELS.get(expect["energy_label"], expect["energy_label"])
    assert calc.formula == expect["formula"]
    unprinted = expect.get("unprinted", [])
    assert calc.charge == (None if "charge" in unprinted else expect["charge"])
    assert calc.multiplicity == (None if "multiplicity" in unprinted else expect["multiplicity"])
    assert calc.masses_origin == "printed"
    assert calc.ended_normally is expect.get("ended_normally", True)


@pytest.mark.parametrize("path", GOOD, ids=file_id)
def test_level(path: Path) -> None:
    expect, calc = expected(path), calculation(path)
    if "method" in expect:
        assert calc.method in [expect["method"], *expect.get("method_also", [])]
    else:
        for part in expect["functional_parts"]:
            name, _, share = part.rpartition(" ")
            assert f"{float(share):g} {name}" in calc.method
    if "basis" in expect:
        assert calc.basis == expect["basis"]
    else:
        by_element = expect["basis_by_element"].items()
        parts = [f"{element}: {name.replace('_ecp', ' ecp')}" for element, name in by_element]
        assert calc.basis == ", ".join(sorted(parts))
    dispersion = expect.get("dispersion", "none")
    assert calc.dispersion == {"D3BJ": "D3(BJ)"}.get(dispersion, dispersion)
    if "solvent" in expect:
        dielectric = expect.get("dielectric", "78.4")
        assert calc.solvent == f"{expect['solvent']}(h2o, dielectric {dielectric})"
    else:
        assert calc.solvent == "none"
    if "grid" in expect:
        assert calc.grid == expect["grid"]
    assert (calc.grid is not None) == (calc.energy_label == "DFT")
    orbitals = expect.get("frozen_core_orbitals", 0)
    assert calc.frozen_core == (
        "frozen" if orbitals or path.stem == "water_ccsdt_energy" else "none"
    )


@pytest.mark.parametrize("path", WITH_MODES, ids=file_id)
def test_modes(path: Path) -> None:
    expect, calc = expected(path), calculation(path)
    assert calc.wavenumbers_cm is not None
    assert calc.wavenumbers_cm.tolist() == expect["wavenumbers_cm"]
    assert calc.where["wavenumbers_cm"] == expect["wavenumbers_line"]
    assert len(calc.wavenumbers_cm) == 3 * len(calc.numbers) - expect["null_modes"]
    # the tables have masses rounded to seven digits
    assert calc.masses_u == pytest.approx(expect["masses_u"], abs=3e-7, rel=0.0)
    assert calc.modes is not None
    size = len(calc.modes), 3 * len(calc.numbers)
    weighted = (calc.modes * np.sqrt(calc.masses_u)[:, np.newaxis]).reshape(size)
    lengths = np.linalg.norm(calc.modes.reshape(size), axis=1)
    assert lengths == pytest.approx(1.0, abs=1e-12)
    weighted /= np.linalg.norm(weighted, axis=1)[:, np.newaxis]
    # five decimals are printed: mass-weighted modes are orthogonal to that
    assert np.max(np.abs(weighted @ weighted.T - np.eye(len(weighted))), initial=0.0) < 2e-4
    moved = np.einsum("a,mac->mc", calc.masses_u, calc.modes)
    assert np.max(np.abs(moved), initial=0.0) < 1e-3  # the centre of mass rests


@pytest.mark.parametrize(
    "path", [p for p in GOOD if "wavenumbers_cm" not in expected(p)], ids=file_id
)
def test_no_modes_without_a_frequency_task(path: Path) -> None:
    calc = calculation(path)
    assert calc.wavenumbers_cm is None
    assert calc.modes is None
    assert calc.hessian_hartree_bohr2 is None
    assert not calc.printed


@pytest.mark.parametrize("path", GOOD, ids=file_id)
def test_optimised(path: Path) -> None:
    expect, calc = expected(path), calculation(path)
    if path.stem == "water_b3lyp_optimize_and_hf_freq_mixed":  # left open by its table
        assert calc.optimised is True
    else:
        assert calc.optimised is expect.get("optimised")
    assert ("optimisation-not-converged" in codes(calc)) == (calc.optimised is False)
    assert (calc.optimised is not None) == ("optimisation" in calc.kind_of_job)


@pytest.mark.parametrize("path", WITH_MODES, ids=file_id)
def test_printed_thermochemistry(path: Path) -> None:
    expect, calc = expected(path), calculation(path)
    table = expect.get("printed") or expect["printed_blocks"][0]
    lines = path.read_text(encoding="utf-8").split("\n")
    for ours, theirs in PRINTED.items():
        printed = calc.printed[ours]
        unit = UNITS.get(printed.unit, printed.unit)
        assert f"{printed.text} {unit}".strip() == table[theirs]
        assert printed.text in lines[printed.line - 1]
        assert table["line"] <= printed.line <= table["line"] + 20
    assert set(calc.printed) == set(PRINTED)


@pytest.mark.parametrize("path", GOOD, ids=file_id)
def test_lines_say_what_they_are_said_to_say(path: Path) -> None:
    calc = calculation(path)
    lines = path.read_text(encoding="utf-8").split("\n")
    marks = {
        "program_version": "(NWChem)",
        "charge": "harge",
        "wavenumbers_cm": "||",
        "modes": "P.Frequency",
        "hessian_hartree_bohr2": "MASS-WEIGHTED PROJECTED HESSIAN",
        "optimised": "onverge",
        "grid": "Grid used",
        "dispersion": "ispersion",
        "solvent": "dielectric",
    }
    for field, mark in marks.items():
        if field in calc.where:
            assert mark in lines[calc.where[field] - 1], field
    assert repr(abs(calc.energy_hartree))[:12] in lines[calc.where["energy_hartree"] - 1]
    first = lines[calc.where["positions_angstrom"] - 1].split()
    assert "1" in first[:2]
    bohr = calc.wavenumbers_cm is not None or path.stem == "water_hf_gradient"
    words = first[2:5] if calc.wavenumbers_cm is not None else first[3:6]
    printed = [float(word.replace("D", "e")) / (1.889725989 if bohr else 1.0) for word in words]
    assert calc.positions_angstrom[0].tolist() == pytest.approx(printed, abs=1e-12)
    if calc.wavenumbers_cm is not None:
        assert f"{calc.masses_u[0]:.7e}"[:9] in lines[calc.where["masses_u"] - 1]


@pytest.mark.parametrize("path", BAD, ids=file_id)
def test_bad_files_are_refused(path: Path) -> None:
    source = open_source(path, path.name)
    with pytest.raises(ReadError) as caught:
        read_source(source)
    match = path.with_suffix(".match").read_text(encoding="utf-8").strip()
    assert match in caught.value.where
    assert re.fullmatch(rf"{re.escape(path.name)}:\d+", caught.value.where)


def test_bad_files_of_this_program_are_claimed_and_others_not() -> None:
    foreign = {"empty", "foreign_program", "note"}
    claimed = {path.stem for path in BAD if nwchem.sniff(path.read_bytes()[:65536])}
    assert claimed == {path.stem for path in BAD} - foreign


@pytest.mark.parametrize(
    ("name", "energy", "line", "first", "optimised"),
    [  # read from the files by eye
        ("water", -76.380400871558, 3867, 1585.138, True),
        ("water-dimer", -152.768922028254, 414, 130.175, None),
        ("so3", -623.501692553031, 5502, 465.288, True),
        ("ts-unassisted", -699.854017874563, 478, -1616.508, None),
        ("ts-assisted", -776.280560502566, 502, -617.723, None),
        ("so3-water2", -776.295346929629, 511, 21.133, None),
    ],
)
def test_the_bundled_study(
    name: str, energy: float, line: int, first: float, optimised: bool | None
) -> None:
    calc = calculation(PLUME / f"{name}.out")
    assert (calc.energy_hartree, calc.where["energy_hartree"]) == (energy, line)
    assert calc.wavenumbers_cm is not None
    assert calc.wavenumbers_cm[0] == first
    assert len(calc.wavenumbers_cm) == 3 * len(calc.numbers) - 6
    assert (calc.method, calc.basis, calc.grid) == ("B3LYP", "def2-svpd", "fine")
    assert calc.optimised is optimised
    assert not calc.findings


@pytest.mark.skipif(not SHARED.exists(), reason="outputs of other people are not here")
def test_an_output_of_somebody_else() -> None:
    calc = calculation(SHARED)
    assert (calc.method, calc.energy_hartree) == ("MP2", -75.002378700325)


# which task of several


def test_levels_of_energy_and_modes_may_differ() -> None:
    calc = calculation(good("formaldehyde_hf_b3lyp_mp2_tasks"))
    assert codes(calc) == ["energy-of-another-task"]
    assert "MP2/6-31G*" in calc.findings[0].what
    assert "B3LYP/6-31G*" in calc.findings[0].what
    assert calc.kind_of_job == ("energy", "optimisation", "frequencies")


def test_frequencies_where_they_have_no_stationary_point() -> None:
    calc = calculation(good("water_b3lyp_optimize_and_hf_freq_mixed"))
    assert codes(calc) == ["frequencies-of-another-level"]


def test_another_molecule_is_left_out_and_said_so() -> None:
    calc = calculation(good("two_molecules_hf"))
    assert codes(calc) == ["other-molecule-left-out"]
    assert len(calc.numbers) == 4


def test_isotopes_of_the_frequency_task_only() -> None:
    calc = calculation(good("water_hf_freq_mass_list"))
    assert codes(calc) == ["printed-masses-differ"]


def test_ghost_atoms_are_left_out_and_said_so() -> None:
    calc = calculation(good("water_ghost_atom_hf_energy"))
    assert codes(calc) == ["ghost-atoms"]
    assert calc.numbers.tolist() == [8, 1, 1]


def test_nothing_else_is_doubted() -> None:
    told = {
        "formaldehyde_hf_b3lyp_mp2_tasks",
        "hydrogen_gas_optimize_cosmo_freq",
        "methanol_hf_freq_after_unconverged_optimize",
        "methanol_hf_optimize_unconverged",
        "methanol_hf_optimize_unconverged_ignore",
        "two_molecules_hf",
        "water_b3lyp_opt_freq_then_energy",
        "water_b3lyp_optimize_and_hf_freq_mixed",
        "water_gas_freq_cosmo_energy",
        "water_ghost_atom_hf_energy",
        "water_held_bond_optimize",
        "water_hf_freq_mass_list",
        "water_hf_opt_freq_ccsdt_energy",
        "water_two_geometries_energy",
    }
    assert {path.stem for path in GOOD if calculation(path).findings} == told


def joined(*names: str) -> Source:
    """Runs one after the other in one file, as a script that appends leaves them."""
    return Source("joined.out", b"".join(good(name).read_bytes() for name in names))


@pytest.mark.parametrize(
    ("names", "label", "energy_of"),
    [
        (("water_ccsdt_energy", "water_hf_energy"), "CCSD(T)", "water_ccsdt_energy"),
        (("water_hf_energy", "water_ccsd_energy"), "CCSD", "water_ccsd_energy"),
        (("water_ccsd_energy", "water_mp2_energy"), "CCSD", "water_ccsd_energy"),
        (("water_mp2_energy", "water_direct_mp2_energy"), "MP2", "water_direct_mp2_energy"),
        (("water_hf_energy_with_stderr", "water_hf_energy"), "HF", "water_hf_energy"),
    ],
)
def test_the_best_energy_of_one_geometry(
    names: tuple[str, ...], label: str, energy_of: str
) -> None:
    calc = nwchem.read(joined(*names))
    assert calc.energy_label == label
    assert calc.energy_hartree == calculation(good(energy_of)).energy_hartree


def test_an_energy_of_another_geometry_or_state_is_not_taken() -> None:
    names = "water_ccsdt_energy", "water_hf_freq"  # 0.968 and 0.945 angstrom
    assert nwchem.read(joined(*names)).energy_label == "HF"
    assert nwchem.read(joined(*reversed(names))).energy_label == "HF"  # the geometry of the modes
    cation = calculation(good("water_then_cation_dft_energy"))
    data = good("water_then_cation_dft_energy").read_bytes()
    assert data.count(b"Total DFT energy") == 2
    assert (cation.charge, cation.multiplicity, cation.method) == (1, 2, "B3LYP")
    mixed = nwchem.read(joined("water_ccsdt_energy", "water_then_cation_dft_energy"))
    assert mixed.energy_hartree == cation.energy_hartree


def test_an_energy_of_another_charge_is_not_taken() -> None:
    cation = good("water_hf_energy").read_bytes()
    for old, new in (
        (b"closed shells   =     5", b"closed shells   =     4"),
        (b"charge          =   0.00", b"charge          =   2.00"),
    ):
        assert old in cation
        cation = cation.replace(old, new)
    neutral = good("water_ccsdt_energy").read_bytes()
    calc = nwchem.read(Source("joined.out", neutral + cation))
    assert (calc.energy_label, calc.charge, calc.multiplicity) == ("HF", 2, 1)


def test_an_scf_that_did_not_converge_gives_no_energy_whatever_the_end_says() -> None:
    path = FIXTURES / "nwchem" / "bad" / "water_scf_unconverged_ignore.out"
    with pytest.raises(ReadError, match="SCF iterations did not converge"):
        nwchem.read(changed(path, b"!! warning: scf energy failed", b""))


def test_a_later_task_that_failed_is_passed_over_and_said_so() -> None:
    failed = (FIXTURES / "nwchem" / "bad" / "water_scf_unconverged_ignore.out").read_bytes()
    source = Source("joined.out", good("water_hf_freq").read_bytes() + failed)
    calc = nwchem.read(source)
    assert calc.energy_hartree == calculation(good("water_hf_freq")).energy_hartree
    assert "task-not-read" in codes(calc)


def test_a_later_run_that_is_cut_short_is_refused() -> None:
    source = Source("joined.out", joined("water_hf_energy", "water_mp2_energy").data[:-3000])
    with pytest.raises(ReadError, match="no normal end"):
        nwchem.read(source)


# the Hessian


@pytest.mark.parametrize("path", WITH_MODES, ids=file_id)
def test_wavenumbers_of_the_hessian(path: Path) -> None:
    calc = calculation(path)
    assert calc.hessian_hartree_bohr2 is not None
    assert calc.wavenumbers_cm is not None
    assert np.array_equal(calc.hessian_hartree_bohr2, calc.hessian_hartree_bohr2.T)
    own = normal_modes(calc.hessian_hartree_bohr2, calc.masses_u, calc.positions_angstrom)
    # six digits of the Hessian
    assert own.wavenumbers_cm == pytest.approx(calc.wavenumbers_cm, abs=0.02, rel=0.0)


@pytest.mark.parametrize("name", ["so3-water", "so3-water2", "ts-assisted", "water-dimer"])
def test_soft_wavenumbers_of_the_hessian(name: str) -> None:
    calc = calculation(PLUME / f"{name}.out")
    own = normal_modes(calc.hessian_hartree_bohr2, calc.masses_u, calc.positions_angstrom)
    assert own.wavenumbers_cm == pytest.approx(calc.wavenumbers_cm, abs=0.02, rel=0.0)
    assert calc.modes is not None
    overlap = np.abs(np.einsum("mac,mac->m", own.modes, calc.modes))
    assert overlap == pytest.approx(1.0, abs=2e-4)


def test_the_hessian_is_good_for_other_isotopes() -> None:
    """The Hessian of H2O with the masses of HDO against the program's own HDO at the same level."""
    light, heavy = calculation(good("water_hf_freq")), calculation(good("water_hf_freq_mass_list"))
    assert np.array_equal(light.positions_angstrom, heavy.positions_angstrom)
    own = normal_modes(light.hessian_hartree_bohr2, heavy.masses_u, light.positions_angstrom)
    assert own.wavenumbers_cm == pytest.approx(heavy.wavenumbers_cm, abs=0.05, rel=0.0)


# thermochemistry with the program's own constants


def nwchem_terms(calc: Calculation) -> dict[str, tuple[float, float]]:
    """What NWChem prints, from our formulas and its constants; and what rounded wavenumbers are worth.

    kcal/mol and cal/(mol K). Our gas constant and h c/k are divided out of our formulas' answers.
    """
    assert calc.wavenumbers_cm is not None
    t = calc.printed["temperature"].value
    real = calc.wavenumbers_cm[calc.wavenumbers_cm > 0.1]
    gas = constants.GAS_CAL_MOL_K
    ratio = gas / units.GAS_J_MOL_K
    stretch = constants.SECOND_RADIATION_K_CM / units.KELVIN_PER_CM
    shares = vibration.oscillator(np.array(t), real * stretch)
    energy, entropy, heat_capacity = (ratio * float(np.sum(share)) for share in shares)
    zero_point = 0.5 * gas * constants.SECOND_RADIATION_K_CM * float(real.sum())
    masses = calc.masses_u
    # ours is for 1 bar; the constant of ours for 1 u at 1 K and 1 atm follows from units alone
    ours = (
        1.5
        * math.log(2 * math.pi * units.ATOMIC_MASS_KG * units.BOLTZMANN_J_K / units.PLANCK_J_S**2)
        + math.log(units.BOLTZMANN_J_K / units.ATM_PA)
        + 2.5
    )
    moving = float(partition.translation(t, masses.sum()).entropy_j_mol_k) * ratio + gas * (
        constants.TRANSLATIONAL - ours - math.log(units.ATM_PA / units.BAR_PA)
    )
    kind = rotor.rotor_kind(masses, calc.positions_angstrom)
    sigma = calc.printed["symmetry_number"].value
    moments = rotor.principal_moments(masses, calc.positions_angstrom)
    bohr = constants.ANGSTROM_PER_BOHR
    turning, freedoms = 0.0, 3
    if kind == "linear":
        theta = math.exp(1.0 - constants.LINEAR) * constants.ROTATIONAL_CM_U_BOHR2
        theta /= moments[2] / bohr**2
        turning = float(partition.linear_rotation(t, theta, sigma).entropy_j_mol_k) * ratio
        freedoms = 5
    elif kind == "nonlinear":
        scale = math.exp((1.5 + 0.5 * math.log(math.pi) - constants.NONLINEAR) / 1.5)
        thetas = scale * constants.ROTATIONAL_CM_U_BOHR2 / (moments / bohr**2)
        turning = float(partition.nonlinear_rotation(t, thetas, sigma).entropy_j_mol_k) * ratio
        freedoms = 6
    thermal = zero_point + energy + 0.5 * freedoms * gas * t
    # half a unit of the third decimal of each wavenumber
    doubt = 0.0005 * 0.5 * gas * constants.SECOND_RADIATION_K_CM * len(real) / 1000.0
    soft = gas * float(np.sum(0.0005 / real))
    return {
        "zero_point": (zero_point / 1000.0, doubt),
        "thermal_energy": (thermal / 1000.0, doubt),
        "thermal_enthalpy": ((thermal + gas * t) / 1000.0, doubt),
        "translational_entropy": (moving, 0.0),
        "rotational_entropy": (turning, 0.0),
        "vibrational_entropy": (entropy, soft),
        "entropy": (moving + turning + entropy, soft),
        "heat_capacity_v": (heat_capacity + 0.5 * freedoms * gas, soft),
    }


REPRODUCED = [path for path in WITH_MODES if path.stem != "water_hf_freq_mass_list"]


@pytest.mark.parametrize(
    "path",
    [*REPRODUCED, *(PLUME / f"{n}.out" for n in ("so3", "so3-water2", "ts-assisted", "h2so4"))],
    ids=file_id,
)
def test_the_printed_thermochemistry_is_reproduced_to_its_digits(path: Path) -> None:
    calc = calculation(path)
    for key, (value, doubt) in nwchem_terms(calc).items():
        printed = calc.printed[key]
        # half of the last digit; coordinates of eight decimals move the rotor by less than 1e-5
        assert value == pytest.approx(printed.value, abs=0.5001 * printed.step + doubt + 1e-5), key


def test_our_own_constants_would_not_do() -> None:
    """The zero-point energy of CODATA constants is 4.8e-4 above what NWChem prints."""
    calc = calculation(PLUME / "so3-water2.out")
    assert calc.wavenumbers_cm is not None
    zero_point = 0.5 * units.WAVENUMBER_KJ_MOL * float(calc.wavenumbers_cm.sum()) / units.CALORIE_J
    assert zero_point / calc.printed["zero_point"].value - 1.0 == pytest.approx(4.8e-4, abs=2e-5)


def test_effective_constants_give_the_programs_own() -> None:
    c = nwchem.PRINTED_CONSTANTS
    second = c["PLANCK_J_S"] * c["LIGHT_M_S"] * 100.0 / c["BOLTZMANN_J_K"]
    assert second == pytest.approx(constants.SECOND_RADIATION_K_CM, rel=1e-13)
    assert c["GAS_J_MOL_K"] / c["CALORIE_J"] == pytest.approx(1.9863, rel=1e-15)
    assert c["HARTREE_J"] * c["AVOGADRO_MOL"] / 4184.0 == pytest.approx(627.5093314, rel=1e-13)
    inertia = c["ATOMIC_MASS_KG"] * c["BOHR_M"] ** 2
    rotational = c["PLANCK_J_S"] / (8.0 * math.pi**2 * inertia * c["LIGHT_M_S"] * 100.0)
    assert rotational == pytest.approx(constants.ROTATIONAL_CM_U_BOHR2, rel=1e-13)
    sackur = 2.5 + math.log(
        (2.0 * math.pi * c["ATOMIC_MASS_KG"] * c["BOLTZMANN_J_K"] / c["PLANCK_J_S"] ** 2) ** 1.5
        * c["BOLTZMANN_J_K"]
        / c["PRESSURE_PA"]
    )
    assert sackur == pytest.approx(constants.TRANSLATIONAL, abs=1e-12)
    for name, value in c.items():  # they are old or rounded constants, not wrong ones
        if name != "PRESSURE_PA":
            assert value == pytest.approx(getattr(units, name), rel=6e-4), name


# damaged files


TRUNCATED = (
    "water_b3lyp_opt_freq",
    "water_ccsdt_energy",
    "formaldehyde_hf_b3lyp_mp2_tasks",
    "hcn_hnc_hf_ts_freq",
)


@pytest.mark.parametrize("place", range(20))
@pytest.mark.parametrize("name", TRUNCATED)
def test_a_truncated_file_is_refused(name: str, place: int) -> None:
    data = good(name).read_bytes()
    end = data.rfind(b"Total times  cpu:")
    cut = Source(f"{name}.out", data[: 2000 + (end - 2000) * place // 19])
    with pytest.raises(ReadError) as caught:
        nwchem.read(cut)
    assert re.fullmatch(rf"{name}\.out:\d+", caught.value.where)
    line = int(caught.value.where.rpartition(":")[2])
    assert line <= cut.data.count(b"\n") + 1


@pytest.mark.parametrize("name", ["water_b3lyp_opt_freq_symmetry", "oh_tce_uccsdt_energy"])
def test_lines_lost_from_the_middle_never_give_other_numbers(name: str) -> None:
    """Lines taken out here and there: refused, or (where nothing of use stood there) the same record."""
    whole = calculation(good(name))
    lines = good(name).read_bytes().split(b"\n")
    refused = 0
    for start in range(100, len(lines) - 160, 61):
        part = b"\n".join(lines[:start] + lines[start + 7 :])
        try:
            calc = nwchem.read(Source("lost.out", part))
        except ReadError:
            refused += 1
            continue
        assert calc.energy_hartree == whole.energy_hartree
        assert np.array_equal(calc.positions_angstrom, whole.positions_angstrom)
        if whole.wavenumbers_cm is not None:
            assert np.array_equal(calc.wavenumbers_cm, whole.wavenumbers_cm)
            assert np.array_equal(calc.hessian_hartree_bohr2, whole.hessian_hartree_bohr2)
            assert {k: v.text for k, v in calc.printed.items()} == {
                k: v.text for k, v in whole.printed.items()
            }
    assert refused > 0


@pytest.mark.parametrize(
    "path", [good("water_b3lyp_opt_freq"), good("water_ccsdt_energy")], ids=file_id
)
def test_crlf_reads_the_same(path: Path) -> None:
    plain = nwchem.read(Source("a", path.read_bytes()))
    crlf = nwchem.read(Source("a", path.read_bytes().replace(b"\n", b"\r\n")))
    for field in ("energy_hartree", "method", "basis", "charge", "multiplicity", "grid", "where"):
        assert getattr(crlf, field) == getattr(plain, field)
    for field in (
        "positions_angstrom",
        "masses_u",
        "wavenumbers_cm",
        "modes",
        "hessian_hartree_bohr2",
    ):
        assert np.array_equal(getattr(crlf, field), getattr(plain, field))
    assert crlf.printed == plain.printed


@pytest.mark.parametrize(
    ("name", "old", "new", "what"),
    [
        (
            "water_hf_freq",
            b"1.4248572D+00",
            b"1.4248672D+00",
            "belongs to the geometry of its modes",
        ),
        ("water_hf_energy", b"0.11920000", b"0.11930000", "nuclear repulsion"),
        ("water_hf_freq", b"1.5994910D+01", b"1.7994910D+01", "mass-weighted length"),
        ("water_hf_freq", b"4086.712 ||    0", b"4186.712 ||    0", "in the table of modes"),
        ("water_hf_freq", b"=   14.448 kcal", b"=   14.348 kcal", "in kcal/mol and in hartree"),
        (
            "water_hf_freq",
            b"14.448 kcal/mol  (  0.023024",
            b"14.440 kcal/mol  (  0.023012",
            "zero-point",
        ),
        ("water_hf_freq", b"=   14.448 kcal", b"= ******** kcal", "expected the zero point"),
        ("water_hf_freq", b"Total Entropy   ", b"Total Entropia  ", "no entropy"),
        ("water_mp2_energy", b"-0.204771237833\n", b"-0.204771337833\n", "sum of its parts"),
        ("water_mp2_energy", b"Total MP2 energy  ", b"Total MP9 energy  ", "no MP2 energy"),
        (
            "water_ccsdt_energy",
            b"(T) corr. energy:                      -0.003090",
            b"(T) corr. energy:                      -0.003190",
            "sum of its parts",
        ),
        (
            "water_ccsdt_energy",
            b"Total CCSD(T) energy:",
            b"Total CCSD(X) energy:",
            "no CCSD\\(T\\) energy",
        ),
        (
            "water_ccsdt_energy",
            b"level of theory    ccsd(t)",
            b"level of theory    fancy",
            "does not know",
        ),
        (
            "oh_tce_uccsdt_energy",
            b" CCSD(T) total energy",
            b" CCSD(Q) total energy",
            "does not know",
        ),
        ("oh_tce_uccsdt_energy", b"-0.156050699674019", b"-0.156050799674019", "sum of its parts"),
        ("water_hf_energy", b"NWChem SCF Module", b"NWChem MCSCF Module", "does not know"),
        (
            "water_hf_energy",
            b"charge          =   0.00",
            b"charge          =   0.50",
            "a whole number",
        ),
        (
            "water_pbe0_optimize",
            b"@    2     -76.27634164 -1.1D-06",
            b"@    2     -76.27634174 -1.1D-06",
            "last step",
        ),
        ("water_hf_energy", b"charge          =   0.00", b"charge          =   1.00", "do not fit"),
        (
            "water_hf_energy",
            b"Two-electron energy =     37",
            b"Two-electron energy =     38",
            "its parts",
        ),
        (
            "water_b3lyp_opt_freq",
            b"Beta electrons :     5",
            b"Beta electrons :     4",
            "do not fit",
        ),
        (
            "water_hf_freq",
            b"Entropy                    =   44.952",
            b"Entropy                    =   44.962",
            "sum of its parts",
        ),
        (
            "water_hf_freq",
            b"=   16.817 kcal/mol  (  0.026800",
            b"=   16.837 kcal/mol  (  0.026832",
            "not R T",
        ),
        ("water_hf_freq", b"  4.26745D+02", b"  4.46745D+02", "not have the wavenumbers"),
        (
            "water_hf_freq",
            b"Nuclear Hessian and Frequency Analysis",
            b"Nuclear Hessian or Freq",
            "does not know",
        ),
        (
            "water_hf_freq",
            b"NWChem Nuclear Hessian",
            b"Nuclear Hessian",
            "no heading of a frequency",
        ),
        (
            "water_pbe0_optimize",
            b"Optimization converged",
            b"Optimization conserved",
            "how it ended",
        ),
    ],
)
def test_damage_is_found(name: str, old: bytes, new: bytes, what: str) -> None:
    with pytest.raises(ReadError, match=what):
        nwchem.read(changed(good(name), old, new, -1))


# the text helper


def test_line_numbers_of_many_places_are_those_of_each() -> None:
    source = open_source(PLUME / "water.out")
    text = Text(source)
    size = len(source.data)
    places = {str(at): at for at in (0, 1, 80, size // 3, size // 3 + 1, size - 2, size)}
    expected = {name: source.data.count(b"\n", 0, at) + 1 for name, at in places.items()}
    assert text.line_numbers(places) == expected
    assert text.line_numbers({}) == {}


@pytest.mark.parametrize(
    ("line", "digits"),
    [
        (b"  -1.5  x", "-1.5"),
        (b"1.0D-02", "1.0e-02"),
        (b" 298.15K\n", "298.15"),
        (b"  ******  (  0.5)", None),
        (b" NaN", None),
        (b" 12abc", None),
        (b"", None),
    ],
)
def test_exact_numbers(line: bytes, digits: str | None) -> None:
    text = Text(Source("a.out", line))
    if digits is None:
        with pytest.raises(ReadError, match=r"a\.out:1: expected a number"):
            text.exact_text(0, "a number", b"K")
    else:
        assert text.exact_text(0, "a number", b"K") == digits


@pytest.mark.parametrize(
    ("table", "line"),
    [(b"1 2\n3 4 5\n\n", 2), (b"1 x\n3 4\n\n", 1), (b"1 2\n3 inf\n\n", 2), (b"1 2\n", 2)],
)
def test_damaged_rows(table: bytes, line: int) -> None:
    with pytest.raises(ReadError, match=rf"a\.out:{line}: "):
        Text(Source("a.out", table)).rows(0, [2, 2], "numbers")


def test_rows() -> None:
    for data in (b"1 2D0\n3 4\n\nx", b"1 2D0\n3 4\nx\n", b"1 2D0\r\n3 4\r\n \r\nx"):
        values, end = Text(Source("a.out", data)).rows(0, [2, 2], "numbers")
        assert values == [1.0, 2.0, 3.0, 4.0]
        assert data[end:].strip() == b"x"


@pytest.mark.parametrize(
    ("name", "code", "line"),
    [
        ("water_held_bond_optimize", "not-stationary", 226),
        ("water_two_geometries_energy", "last-of-several-structures", 104),
    ],
)
def test_what_the_geometry_is_no_more(name: str, code: str, line: int) -> None:
    """Coordinates held in an optimisation, and single points of other geometries."""
    (found,) = calculation(good(name)).findings
    assert (found.code, found.line) == (code, line)


def test_the_words_for_two_levels_tell_them_apart() -> None:
    (found,) = calculation(good("water_gas_freq_cosmo_energy")).findings
    assert found.code == "energy-of-another-task"
    assert "HF/3-21g, COSMO(h2o, dielectric 78.4), the modes are HF/3-21g:" in found.what


def test_scaled_second_order_energy_is_checked_against_its_pairs() -> None:
    path = good("water_sos_mp2_energy")
    factor = b"Opposite spin scaling fact.          1."
    source = changed(path, factor + b"3", factor + b"2")
    with pytest.raises(ReadError, match="is not the sum of its scaled parts") as caught:
        nwchem.read(source)
    assert caught.value.where == f"{path.name}:563"


def test_part_of_a_functional_is_refused() -> None:
    """A lost line of a functional that is printed by its parts leaves another functional."""
    path = good("water_bp86_energy")
    lost = b"                Perdew 1986 Correlation Functional  1.000 non-local\n"
    with pytest.raises(ReadError, match="a part of the functional BP86, without the rest of it"):
        nwchem.read(changed(path, lost, b""))


def test_a_continuum_of_the_frequencies_alone_is_another_level() -> None:
    (found,) = calculation(good("hydrogen_gas_optimize_cosmo_freq")).findings
    assert found.code == "frequencies-of-another-level"
    assert "with HF/sto-3g, the frequencies are HF/sto-3g, COSMO(h2o" in found.what


def test_a_basis_set_by_element_needs_a_row_for_each() -> None:
    source = open_source(good("water_custom_basis_energy"))
    lines = source.data.split(b"\n")
    rows = [i for i, line in enumerate(lines) if line.startswith(b" O ") and b"cc-pvdz" in line]
    assert rows
    damaged = b"\n".join(line for i, line in enumerate(lines) if i not in rows)
    assert nwchem.read(Source("damaged.out", damaged)).basis is None
