"""Psi4 text outputs: every fixture against its table, truncated and damaged copies, thermochemistry."""

from __future__ import annotations

import math
import random
import re
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from fixture_files import FIXTURES, expected, file_id, files

from thermo_pp.errors import ReadError
from thermo_pp.formulas import partition, rotor, vibration
from thermo_pp.readers import psi4, read_source
from thermo_pp.readers.psi4 import jobs
from thermo_pp.readers.text import Text
from thermo_pp.records import Calculation
from thermo_pp.sources import Source, open_source

GOOD = files("psi4", "good")
WITH_MODES = [path for path in GOOD if "wavenumbers_cm" in expected(path)]
LABELS = {"SCF": "HF", "double hybrid": "DFT"}
"""What the tables call an energy -> what the record calls it."""
BY_NAME = {path.stem: path for path in GOOD}
SHARED = Path("/work/shared/data/other-programs/Psi4/basicPsi4-1.7")


def calculation(path: Path) -> Calculation:
    return psi4.read(open_source(path, path.name))


def changed(path: Path, old: bytes, new: bytes, count: int = -1) -> Source:
    """A fixture in which `old` is replaced by `new`; it must have stood there."""
    data = path.read_bytes()
    assert old in data
    return Source(path.name, data.replace(old, new, count))


@pytest.mark.parametrize("path", GOOD, ids=file_id)
def test_energy_level_and_molecule(path: Path) -> None:
    expect, calc = expected(path), calculation(path)
    assert calc.program == "psi4"
    assert calc.program_version == "1.3.2"
    assert calc.energy_hartree == expect["energy_hartree"]
    assert calc.where["energy_hartree"] == expect["energy_line"]
    assert calc.energy_label == LABELS.get(expect["energy_label"], expect["energy_label"])
    assert calc.method in [expect["method"], *expect.get("method_also", [])]
    assert calc.basis == expect["basis"]
    assert (calc.charge, calc.multiplicity) == (expect["charge"], expect["multiplicity"])
    assert calc.formula == expect["formula"]
    assert calc.masses_u.tolist() == expect["masses_u"]
    assert calc.masses_origin == "printed"
    assert calc.optimised is expect.get("optimised")
    assert calc.dispersion == expect.get("dispersion", "none")
    assert calc.ended_normally is expect.get("ended_normally", True)
    if "frozen_core" in expect:
        assert calc.frozen_core == ("frozen" if expect["frozen_core"] else "none")


@pytest.mark.parametrize("path", GOOD, ids=file_id)
def test_lines_say_what_the_record_holds(path: Path) -> None:
    calc, lines = calculation(path), ["", *path.read_text().splitlines()]
    where = calc.where
    numbers = re.findall(r"-?\d+\.\d+", lines[where["energy_hartree"]])
    assert calc.energy_hartree in [float(number) for number in numbers]
    assert f"charge = {calc.charge}, mult" in lines[where["charge"]]
    assert calc.masses_u[0] == float(lines[where["masses_u"]].split()[4])
    printed = [float(word) for word in lines[where["positions_angstrom"]].split()[1:4]]
    assert calc.positions_angstrom[0] == pytest.approx(printed, abs=1e-11)
    assert str(calc.program_version) in lines[where["program_version"]]
    assert calc.basis in lines[where["basis"]] or "==> CBS <==" in lines[where["basis"]]
    if calc.grid is not None:
        assert "Molecular Quadrature" in lines[where["grid"]]
    for value in calc.printed.values():
        assert value.text in lines[value.line]


@pytest.mark.parametrize("path", WITH_MODES, ids=file_id)
def test_modes(path: Path) -> None:
    expect, calc = expected(path), calculation(path)
    assert calc.wavenumbers_cm is not None
    assert calc.modes is not None
    assert calc.wavenumbers_cm.tolist() == expect["wavenumbers_cm"]
    assert np.all(np.diff(calc.wavenumbers_cm) >= 0.0)
    if "wavenumbers_line" in expect:
        assert calc.where["wavenumbers_cm"] == expect["wavenumbers_line"]
    assert calc.modes.shape == (len(calc.wavenumbers_cm), len(calc.numbers), 3)
    assert np.sqrt((calc.modes**2).sum(axis=(1, 2))) == pytest.approx(1.0, abs=1e-12)
    # no mode moves the centre of mass, to the two decimals of the displacements
    drift = np.einsum("a,mac->mc", calc.masses_u, calc.modes) / calc.masses_u.sum()
    assert np.abs(drift).max(initial=0.0) < 0.01
    assert "frequencies" in calc.kind_of_job


@pytest.mark.parametrize("path", WITH_MODES, ids=file_id)
def test_printed_thermochemistry_is_kept_as_printed(path: Path) -> None:
    expect = expected(path)
    tables = [expect["printed"]] if "printed" in expect else expect["printed_blocks"]
    printed = calculation(path).printed
    names = {
        "temperature": "temperature",
        "pressure": "pressure",
        "zero_point": "zero_point_eh",
        "thermal_energy": "energy_correction_eh",
        "thermal_enthalpy": "enthalpy_correction_eh",
        "enthalpy": "enthalpy_total",
        "gibbs": "gibbs_total",
        "entropy": "entropy_j",
        "translational_entropy": "entropy_translational_j",
        "rotational_entropy": "entropy_rotational_j",
        "vibrational_entropy": "entropy_vibrational_j",
        "heat_capacity_v": "heat_capacity_cv_j",
        "symmetry_number": "symmetry_number",
    }
    assert set(printed) == set(names)
    wanted = next(one for one in tables if one["temperature"] == f"{printed['temperature'].text} K")
    for ours, theirs in names.items():
        assert f"{printed[ours].text} {printed[ours].unit}".strip() == wanted[theirs], ours


@pytest.fixture
def psi4_constants(monkeypatch: pytest.MonkeyPatch) -> dict[str, float]:
    """Put the constants that Psi4 prints its thermochemistry with into the formulas."""
    constants = dict(psi4.PRINTED_CONSTANTS)
    k, h, light = (constants[name] for name in ("BOLTZMANN_J_K", "PLANCK_J_S", "LIGHT_M_S"))
    constants["KELVIN_PER_CM"] = h * light * 100.0 / k
    constants["_THETA_U_A2"] = h**2 / (8.0 * math.pi**2 * k * constants["ATOMIC_MASS_KG"] * 1e-20)
    for module in (partition, rotor, vibration):
        for name, value in constants.items():
            if hasattr(module, name):
                monkeypatch.setattr(module, name, value)
    return constants


@pytest.mark.parametrize("path", WITH_MODES, ids=file_id)
def test_psi4_prints_what_the_formulas_give(path: Path, psi4_constants: dict[str, float]) -> None:
    """H, S, G and the zero-point energy to the last printed digit, with Psi4's own constants."""
    calc = calculation(path)
    assert calc.wavenumbers_cm is not None
    printed = calc.printed
    t, pressure = printed["temperature"].value, printed["pressure"].value
    gas = psi4_constants["GAS_J_MOL_K"]
    turned = rotor.rigid_rotor(
        calc.masses_u, calc.positions_angstrom, int(printed["symmetry_number"].value)
    )
    moving = partition.translation(t, calc.masses_u.sum())
    turning = partition.rotation(t, turned.kind, turned.theta_k, turned.symmetry_number, False)
    shaking = vibration.vibration(t, calc.wavenumbers_cm[calc.wavenumbers_cm > 0.0])
    assert calc.multiplicity is not None
    entropies = {
        "translational_entropy": float(moving.entropy_j_mol_k) + gas * math.log(1e5 / pressure),
        "rotational_entropy": float(turning.entropy_j_mol_k),
        "vibrational_entropy": float(shaking.entropy_j_mol_k.sum()),
    }
    entropies["entropy"] = sum(entropies.values()) + gas * math.log(calc.multiplicity)
    for name, value in entropies.items():
        assert value == pytest.approx(printed[name].value, abs=0.51 * printed[name].step), name
    per_hartree = psi4_constants["HARTREE_J"] * psi4_constants["AVOGADRO_MOL"]
    zero_point = float(shaking.zero_point_j_mol.sum()) / per_hartree
    thermal = float(moving.enthalpy_j_mol + turning.enthalpy_j_mol + shaking.enthalpy_j_mol.sum())
    enthalpy = zero_point + thermal / per_hartree
    bottom = float(printed["enthalpy"].text) - float(printed["thermal_enthalpy"].text)
    energies = {
        "zero_point": zero_point,
        "thermal_enthalpy": enthalpy,
        "thermal_energy": enthalpy - gas * t / per_hartree,
    }
    for name, value in energies.items():
        assert value == pytest.approx(printed[name].value, abs=0.6 * printed[name].step), name
    gibbs = bottom + enthalpy - t * entropies["entropy"] / per_hartree
    # E0 and the correction are rounded before they are added here: two steps more
    assert gibbs == pytest.approx(printed["gibbs"].value, abs=2.0 * printed["gibbs"].step)


STACK_PLUME = sorted((FIXTURES / "stack-plume" / "outputs").glob("*_*.out"))


@pytest.mark.parametrize("path", STACK_PLUME, ids=file_id)
def test_single_points_of_the_bundled_study(path: Path) -> None:
    """The energy is the one an independent search for the printed line finds; SCS and CCSD stand beside it."""
    text = path.read_text()
    calc = calculation(path)
    if "_ccsdt" in path.stem:
        wanted = re.findall(r"\* CCSD\(T\) total energy +(-\d+\.\d+)", text)
        assert calc.energy_label == calc.method == "CCSD(T)"
        assert calc.basis == "CC-PV(D+D)Z"
    else:
        wanted = re.findall(r"^\t Total Energy +=\s+(-\d+\.\d+) \[Eh\]", text, re.MULTILINE)
        assert calc.energy_label == calc.method == "MP2"
        assert calc.basis == ("AUG-CC-PV(Q+D)Z" if "-qz" in path.stem else "AUG-CC-PV(T+D)Z")
    assert [calc.energy_hartree] == [float(one) for one in wanted]
    assert calc.frozen_core == "frozen"
    assert (calc.kind_of_job, calc.optimised) == (("energy",), None)
    assert calc.findings == ()


REFUSED = [  # file, line, how the message begins; found by reading the files
    ("lost_modes", 1403, "3 vibrations of 3 atoms, expected 4"),
    ("nan_energy", 248, "expected the final SCF energy, found '@DF-RKS Final Energy:   nan'"),
    (
        "stars_energy",
        297,
        "expected the DF-MP2 total energy, found 'Total Energy              = **",
    ),
    ("two_molecules_hf_error", 2256, "the job ended in an error: PSIO Error"),
    ("water_b3lyp_d3_missing_program", 195, "the job ended in an error: Command (`dftd3 dftd3_geo"),
    ("water_ccsd_unconverged", 409, "the coupled-cluster iterations did not converge"),
    ("water_scf_unconverged", 176, "the job ended in an error: Could not converge SCF iterations"),
    ("water_scf_unconverged_not_fatal", 179, "the SCF did not converge, so there is no energy"),
    ("water_unknown_basis", 76, "the job ended in an error: BasisSet::construct: Unable to find"),
]


@pytest.mark.parametrize(("name", "line", "message"), REFUSED, ids=lambda value: str(value)[:30])
def test_refused_with_reason_and_line(name: str, line: int, message: str) -> None:
    path = FIXTURES / "psi4" / "bad" / f"{name}.out"
    with pytest.raises(ReadError) as caught:
        calculation(path)
    assert caught.value.where == f"{name}.out:{line}"
    assert caught.value.what.startswith(message)


@pytest.mark.parametrize(
    "name", ["water_mp2_opt_freq_fd_gradients", "water_hf_opt_freq", "water_dfccsdt_energy"]
)
def test_every_truncation_is_an_error(name: str) -> None:
    data = BY_NAME[name].read_bytes()
    end = data.rindex(b"*** Psi4 exiting")
    heading = data.index(b"Psi4 started on")
    for part in range(20):
        cut = heading + (end - heading) * part // 20
        with pytest.raises(ReadError, match=r"cut\.out:\d+: no normal end of the job"):
            psi4.read(Source("cut.out", data[:cut]))


def test_a_second_run_that_is_cut_short_is_an_error() -> None:
    whole = BY_NAME["water_hf_energy"].read_bytes()
    with pytest.raises(ReadError, match="no normal end of the job"):
        psi4.read(Source("two.out", whole + whole[: len(whole) // 2]))
    first, both = (psi4.read(Source("runs.out", whole * count)) for count in (1, 2))
    assert both.where["energy_hartree"] == whole.count(b"\n") + first.where["energy_hartree"]


def test_an_earlier_run_that_failed_is_an_error() -> None:
    failed = (FIXTURES / "psi4" / "bad" / "water_scf_unconverged.out").read_bytes()
    whole = BY_NAME["water_hf_energy"].read_bytes()
    with pytest.raises(ReadError, match=r"two\.out:176: the job ended in an error: Could not conv"):
        psi4.read(Source("two.out", failed + whole))


@pytest.mark.parametrize("name", ["water_mp2_opt_freq_fd_gradients", "water_b3lyp_d2_energy"])
def test_dos_line_ends_read_the_same(name: str) -> None:
    path = BY_NAME[name]
    unix = calculation(path)
    dos = psi4.read(Source(path.name, path.read_bytes().replace(b"\n", b"\r\n")))
    assert dos.where == unix.where
    assert dos.printed == unix.printed
    for field in ("energy_hartree", "method", "basis", "dispersion", "grid", "optimised", "charge"):
        assert getattr(dos, field) == getattr(unix, field)
    for field in ("wavenumbers_cm", "modes", "positions_angstrom", "masses_u"):
        assert np.array_equal(getattr(dos, field), getattr(unix, field))


def test_damage_is_an_error_or_changes_nothing_that_it_did_not_hit() -> None:
    """Lines lost, doubled or garbled at random: a ReadError or a record, never another exception."""
    path = BY_NAME["water_hf_freq"]
    lines = path.read_bytes().split(b"\n")
    chance = random.Random(20)
    places = []
    for _ in range(150):
        damaged = list(lines)
        for _ in range(3):
            at = chance.randrange(len(damaged))
            new = [b"", b"****** nan 1e999", damaged[at][: len(damaged[at]) // 2], b"\xff\x00"]
            damaged[at] = chance.choice(new)
        try:
            psi4.read(Source("damaged.out", b"\n".join(damaged)))
        except ReadError as error:
            places.append(error.where)
    assert 10 < len(places) < 150
    assert all(re.fullmatch(r"damaged\.out:\d+", place) for place in places)


def test_modes_and_a_better_energy_of_the_same_geometry() -> None:
    calc = calculation(BY_NAME["water_hf_opt_freq_ccsdt_energy"])
    assert calc.kind_of_job == ("optimisation", "frequencies")
    assert calc.energy_label == "CCSD(T)"
    assert [finding.code for finding in calc.findings] == ["modes-of-another-level"]
    assert "of HF/6-31G*, the energy of the same geometry is of CCSD(T)/CC-PVDZ" in (
        calc.findings[0].what
    )


def test_a_better_energy_of_another_geometry_is_not_taken() -> None:
    """The same file with the geometry of the CCSD(T) energy moved by 0.001 angstrom."""
    path = BY_NAME["water_hf_opt_freq_ccsdt_energy"]
    data = path.read_bytes()
    after = data.index(b"Thermochemistry Energy Analysis")
    heading = data.index(b"Geometry (in Angstrom)", after)
    row = data.index(b"         H ", heading)
    old = data[row : data.index(b"\n", row)]
    moved = re.sub(rb"0\.(\d{12})", rb"0.900000000000", old, count=1)
    assert moved != old
    calc = psi4.read(Source(path.name, data[:row] + moved + data[row + len(old) :]))
    assert (calc.energy_label, calc.basis, calc.findings) == ("HF", "6-31G*", ())


def test_displaced_geometries_are_never_taken() -> None:
    """Every other SCF of these files is at a displaced geometry of lower or other symmetry."""
    for name in ("water_mp2_opt_freq_fd_gradients", "water_ccsdt_freq_fd_energies"):
        x = calculation(BY_NAME[name]).positions_angstrom
        assert np.linalg.norm(x[1] - x[0]) == pytest.approx(np.linalg.norm(x[2] - x[0]), abs=1e-9)
        lines = BY_NAME[name].read_text().splitlines()
        line = calculation(BY_NAME[name]).where["energy_hartree"]
        loading = [k for k, text in enumerate(lines, start=1) if "Loading displacement" in text]
        assert "displacement 1 of" in lines[loading[0] - 1]
        assert loading[0] < line < loading[1]


def test_energy_that_the_thermochemistry_does_not_start_from_is_an_error() -> None:
    source = changed(BY_NAME["water_hf_freq"], b"-76.01073652 [Eh]", b"-76.01073655 [Eh]")
    with pytest.raises(
        ReadError, match=r"starts from -76\.01073655 hartree, but the energy of its"
    ):
        psi4.read(source)


@pytest.mark.parametrize("ending", ["", "_caught"])
def test_unconverged_optimisation(ending: str) -> None:
    """Out of steps: the energy, and a finding, whether the program calls that an error or not."""
    name = f"methanol_hf_optimize_unconverged{ending}"
    calc = calculation(BY_NAME[name])
    assert calc.optimised is False
    assert [(one.code, one.severity) for one in calc.findings] == [
        ("optimisation-not-converged", "warning")
    ]
    lines = BY_NAME[name].read_text().splitlines()
    assert "Could not converge geometry optimization" in lines[calc.where["optimised"] - 1]


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (b"energy('mp2')", b"energy('ccsd')", "but no CCSD energy is in the output"),
        (b"energy('mp2')", b"energy('sapt0')", "energy('sapt0'), but only scf, hf, dft, mp2"),
        (b"energy('mp2')", b"frequency('mp2')", "but no vibrations are in the output"),
        (b"energy('mp2')", b"energy('mp2/cc-pv[tq]z')", "but no extrapolated energy is in the"),
        (b"==> DF-MP2 Energies <==", b"==> DF-MP9 Energies <==", "but no MP2 energy is in the"),
        (b"==> DF-MP2 En", b"==> N-Body <==\n==> DF-MP2 En", "a job over fragments"),
        (b"==> DF-MP2 En", b"IRC data object created\n==> DF-MP2 En", "a reaction path (IRC)"),
        (b"\t Total Energy  ", b"  * BCCD total energy = -76.9\n\t Total Energy  ", "'BCCD'"),
    ],
)
def test_what_was_asked_for_must_be_there_and_known(old: bytes, new: bytes, message: str) -> None:
    source = changed(BY_NAME["water_dfmp2_energy"], old, new)
    with pytest.raises(ReadError, match=re.escape(message)):
        psi4.read(source)


def test_a_comment_in_the_input_asks_for_nothing() -> None:
    source = changed(
        BY_NAME["water_dfmp2_energy"], b"energy('mp2')", b"energy('mp2') # energy('x')"
    )
    assert psi4.read(source).energy_label == "MP2"


def test_text_of_the_input_is_no_result() -> None:
    fake = b"""# @RHF Final Energy:  -1.0
    Geometry (in Angstrom), charge = 0, multiplicity = 1:
  Running in c1 symmetry.
    * MP2 total energy = -1.0
energy('mp2')"""
    path = BY_NAME["water_dfmp2_energy"]
    read = psi4.read(changed(path, b"energy('mp2')", fake))
    assert read.energy_hartree == calculation(path).energy_hartree
    assert read.where["energy_hartree"] == calculation(path).where["energy_hartree"] + 4


def test_two_printed_scf_energies_that_differ_are_an_error() -> None:
    source = changed(
        BY_NAME["water_hf_energy"],
        b"Total Energy =                        -76.026",
        b"Total Energy = -76.027",
    )
    with pytest.raises(ReadError, match="differs from the final energy"):
        psi4.read(source)


def joined(*paths: Path) -> Source:
    return Source("joined.out", b"".join(path.read_bytes() for path in paths))


def test_the_better_energy_counts_also_where_it_stands_first() -> None:
    calc = psi4.read(joined(BY_NAME["water_ccsdt_energy"], BY_NAME["water_hf_energy"]))
    assert (calc.energy_label, calc.energy_hartree) == ("CCSD(T)", -76.241174854140937)


def test_an_scf_that_failed_beside_one_that_did_not_is_passed_over() -> None:
    failed = FIXTURES / "psi4" / "bad" / "water_scf_unconverged_not_fatal.out"
    whole = BY_NAME["water_hf_energy"]
    assert psi4.read(joined(failed, whole)).energy_hartree == calculation(whole).energy_hartree
    with pytest.raises(ReadError, match="the SCF did not converge"):
        psi4.read(joined(whole, failed))


def test_hessians_on_the_way_of_an_optimisation_are_not_its_modes() -> None:
    path = BY_NAME["hcn_hnc_hf_ts_freq"]
    data = path.read_bytes()
    end = data.index(b"hessian() ", data.index(b"Final optimized geometry and variables"))
    data = data[: data.rindex(b"*** tstart()", 0, end)] + b"\n*** Psi4 exiting successfully.\n"
    mark = b"==> Harmonic Vibrational Analysis <=="
    assert data.count(mark) > 2
    first, rest = data.split(mark, 1)
    on_the_way = psi4.read(Source(path.name, first + mark + rest.replace(mark, b"==> <==")))
    assert (on_the_way.wavenumbers_cm, on_the_way.optimised) == (None, True)
    # the last Hessian is of the geometry at which the search ended
    at_the_end = psi4.read(Source(path.name, data))
    assert at_the_end.wavenumbers_cm is not None
    assert at_the_end.wavenumbers_cm[0] == pytest.approx(-1227.63, abs=0.01)


def test_another_geometry_after_an_unfinished_optimisation() -> None:
    path = BY_NAME["methanol_hf_optimize_unconverged_caught"]
    data = path.read_bytes()
    start = data[: data.index(b"OPTKING")] + b"\n*** Psi4 exiting successfully.\n"
    calc = psi4.read(Source(path.name, data + start))
    assert calc.where["positions_angstrom"] > data.count(b"\n")
    assert calc.optimised is False


def test_geometry_in_bohr() -> None:
    path = BY_NAME["water_hf_energy"]
    # the same numbers in bohr are closer together, so that the nuclei repel each other more
    closer = b"%.15f" % (9.091820405655334 / 0.529177210544)
    source = changed(path, b"(in Angstrom)", b"(in Bohr)")
    source = Source(source.name, source.data.replace(b"9.091820405655334", closer))
    bohr = psi4.read(source).positions_angstrom
    # CODATA 2022 bohr; Psi4 uses that of 2014, 6e-11 apart
    assert bohr == pytest.approx(calculation(path).positions_angstrom * 0.529177210544, abs=1e-10)


def test_a_geometry_that_disagrees_with_its_nuclear_repulsion_is_refused() -> None:
    path = BY_NAME["water_hf_energy"]
    line = path.read_bytes().split(b"Nuclear repulsion =")[1].split()[0]
    with pytest.raises(ReadError, match=r"is not that of the geometry above it, 9\.09"):
        psi4.read(changed(path, line, b"9.191820405655334"))


def test_masses_that_are_not_printed_are_derived() -> None:
    path = BY_NAME["water_hf_energy"]
    data = re.sub(rb"(\n +[OH] (?: +-?\d+\.\d{12}){3}) +\d+\.\d+", rb"\1", path.read_bytes())
    calc = psi4.read(Source(path.name, data))
    assert calc.masses_origin == "derived"
    assert calc.masses_u.tolist() == [15.99491461957, 1.00782503223, 1.00782503223]
    assert "masses_u" not in calc.where


def test_ghost_atoms_are_left_out_and_told() -> None:
    calc = calculation(BY_NAME["water_ghost_atom_hf_energy"])
    assert calc.formula == "H2O"
    assert [finding.code for finding in calc.findings] == ["ghost-atoms"]


def test_another_molecule_in_the_file_is_told() -> None:
    calc = calculation(BY_NAME["two_molecules_hf"])
    assert [(one.code, one.severity) for one in calc.findings] == [
        ("other-molecule-left-out", "note")
    ]
    lines = BY_NAME["two_molecules_hf"].read_text().splitlines()
    assert calc.findings[0].line is not None
    assert lines[calc.findings[0].line - 1].startswith("    Geometry (in Angstrom), charge = 0")
    assert calculation(BY_NAME["water_hf_opt_freq"]).findings == ()


def test_frequencies_of_another_level_than_the_optimisation_are_told() -> None:
    path = BY_NAME["water_hf_opt_freq"]
    data = path.read_bytes()
    after = data.index(b"Final optimized geometry and variables")
    moved = data[after:].replace(b"Basis Set: 6-31G*", b"Basis Set: 6-31G**")
    calc = psi4.read(Source(path.name, data[:after] + moved))
    assert [one.code for one in calc.findings] == ["frequencies-of-another-level"]
    assert "optimised with HF/6-31G*, the frequencies are of HF/6-31G**" in calc.findings[0].what


def test_frozen_core_that_is_not_the_usual_one() -> None:
    path = FIXTURES / "stack-plume" / "outputs" / "so3_ccsdt.out"
    mark = b"Number of frozen core orbitals:         8"
    assert psi4.read(changed(path, mark, mark[:-1] + b"7")).frozen_core == "frozen: 7 orbitals"
    assert psi4.read(changed(path, mark, mark[:-1] + b"0")).frozen_core == "none"
    assert calculation(BY_NAME["water_ccsd_energy"]).frozen_core == "none"


@pytest.mark.parametrize(
    ("printed", "name"),
    [
        # the names as Psi4 1.3.2 has them in its source, qcdb/intf_dftd3/dashparam.py
        ("Grimme's -D2 Dispersion Correction", "D2"),
        ("Grimme's -D3 (zero-damping) Dispersion Correction", "D3"),
        ("Grimme's -D3 (BJ-damping) Dispersion Correction", "D3(BJ)"),
        ("Grimme's -D3 (zero-damping, short-range refitted) Dispersion Correction", "D3M"),
        ("Grimme's -D3 (BJ-damping, short-range refitted) Dispersion Correction", "D3M(BJ)"),
        (
            "Chai and Head-Gordon Dispersion Correction",
            "Chai and Head-Gordon Dispersion Correction",
        ),
    ],
)
def test_dispersion(printed: str, name: str) -> None:
    path = BY_NAME["water_b97d_energy"]
    source = changed(path, b"Grimme's -D2 Dispersion Correction", printed.encode())
    assert psi4.read(source).dispersion == name


def test_solvent() -> None:
    # the lines as Psi4's source has them; no run with PCM was at hand
    path = BY_NAME["water_hf_energy"]
    line = b"    Total Energy = "
    source = changed(path, line, b"    PCM Polarization Energy =  -0.01\n" + line)
    assert psi4.read(source).solvent == "PCM"
    source = changed(
        path, line, b"Solvent name:          Water\n    PCM Polarization Energy = 1\n" + line
    )
    assert psi4.read(source).solvent == "PCM(Water)"
    assert calculation(path).solvent == "none"


def test_grid() -> None:
    assert calculation(BY_NAME["water_b3lyp_energy"]).grid == "(75,302) pruning flat"
    assert calculation(BY_NAME["water_hf_energy"]).grid is None


def test_sniff() -> None:
    head = BY_NAME["water_hf_energy"].read_bytes()[:65536]
    assert psi4.sniff(head)
    assert psi4.sniff(head.replace(b"Psi4:", b"PSI4:"))  # versions before 1.2
    assert not psi4.sniff(b"a note: Psi4 is An Open-Source Ab Initio Electronic Structure Package")


@pytest.mark.skipif(not SHARED.is_dir(), reason="outputs of Psi4 1.7 are not at ../shared")
def test_psi4_1_7() -> None:
    """Expected values: ../shared/data/other-programs/values.json, read from the files by eye."""
    energy = read_source(open_source(SHARED / "water_ccsd(t).out"))
    assert (energy.program_version, energy.energy_label) == ("1.7", "CCSD(T)")
    assert energy.energy_hartree == -75.017834880709472
    assert energy.where["energy_hartree"] == 482
    ring = read_source(open_source(SHARED / "dvb_ir_rks.out"))
    assert ring.energy_hartree == pytest.approx(-382.3109115643741, abs=1e-12)
    assert ring.positions_angstrom[0].tolist() == pytest.approx(
        [-1.41525332, 0.23022179, 0], abs=2e-8
    )
    assert ring.wavenumbers_cm is not None
    assert len(ring.wavenumbers_cm) == 54
    assert ring.wavenumbers_cm.sum() == pytest.approx(
        2 * 38866.987, abs=2e-3
    )  # printed, line 42181
    assert ring.printed["entropy"].text == "385.266"


def test_frozen_virtual_orbitals_are_told() -> None:
    calc = calculation(BY_NAME["water_ccsd_frozen_virtuals_energy"])
    assert calc.frozen_core == "frozen, 2 virtual orbitals too"


def test_second_order_energy_on_the_way_to_optimised_orbitals_is_the_canonical_one() -> None:
    energies = calculation(BY_NAME["oh_uhf_df_omp2_energy"]).method_energies
    assert energies["MP2"].value_hartree == pytest.approx(-75.05441953047676, abs=1e-12, rel=0.0)


@pytest.mark.parametrize(
    ("name", "code", "line"),
    [
        ("water_mom_energies", "excited-state-left-out", 295),
        ("water_three_geometries_energy", "last-of-several-structures", 79),
        ("hydrogen_peroxide_two_structures", "last-of-several-structures", 1914),
        ("water_mp2_freq_fd_energies_far", "not-stationary", 2650),
        ("hydrogen_peroxide_fixed_dihedral", "not-stationary", 1886),
    ],
)
def test_what_is_doubtful(name: str, code: str, line: int) -> None:
    (found,) = calculation(BY_NAME[name]).findings
    assert found.code == code
    assert found.line == line


def test_an_energy_with_ghosts_is_no_better_energy_of_the_molecule() -> None:
    """MP2 of the molecule with ghost atoms, then HF of the same geometry without: HF it is."""
    ghost = BY_NAME["water_ghost_atom_hf_energy"].read_text()
    atoms = jobs.geometry(
        Text(Source("x.out", ghost.encode())), ghost.index("    Geometry (in") + 4
    )
    assert atoms.ghosts
    assert not atoms.same(replace(atoms, ghosts=0))
    assert atoms.same(replace(atoms, at=0))
