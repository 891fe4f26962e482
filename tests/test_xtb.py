"""The reader of xtb: fixtures against their tables, files beside an output, traps, damaged copies."""

from __future__ import annotations

import json
import re
import shutil
from pathlib import Path

import numpy as np
import pytest
from fixture_files import FIXTURES, expected, file_id, files

from thermo_pp.audit import audit_alone
from thermo_pp.errors import ReadError
from thermo_pp.formulas.normal_modes import normal_modes
from thermo_pp.readers import xtb
from thermo_pp.records import Calculation
from thermo_pp.sources import Source, open_source

GOOD = files("xtb", "good")
JOBS = FIXTURES / "xtb" / "jobs"
OHESS = FIXTURES / "xtb" / "good" / "water_gfn2_ohess.out"
SHARED = Path(__file__).parents[2] / "shared" / "data" / "other-programs"


def calculation(path: Path) -> Calculation:
    return xtb.read(open_source(path, str(path)))


def codes(calc: Calculation) -> list[str]:
    return [finding.code for finding in calc.findings]


def damaged(path: Path, old: str, new: str, count: int = 1) -> Source:
    text = path.read_text(encoding="utf-8")
    assert old in text
    at = text.rindex(old) if count < 0 else text.index(old)
    return Source("damaged.out", (text[:at] + new + text[at + len(old) :]).encode())


@pytest.mark.parametrize("path", GOOD, ids=file_id)
def test_fields(path: Path) -> None:
    expect, calc = expected(path), calculation(path)
    lines = ["", *path.read_text(encoding="utf-8").splitlines()]
    assert (calc.program, calc.program_version, calc.method) == ("xtb", "6.5.1", expect["method"])
    assert (calc.charge, calc.multiplicity) == (expect["charge"], expect.get("multiplicity"))
    assert calc.energy_hartree == expect["energy_hartree"]
    assert calc.where["energy_hartree"] == expect["energy_line"]
    assert str(expect["energy_hartree"]) in lines[calc.where["energy_hartree"]]
    assert calc.energy_label == expect["energy_label"]
    assert calc.optimised is expect["optimised"]
    assert (calc.basis, calc.dispersion, calc.frozen_core) == (None, "none", "none")
    if "wavenumbers_cm" not in expect:
        assert calc.wavenumbers_cm is None
        assert calc.printed == {}
        return
    assert calc.wavenumbers_cm is not None
    assert calc.wavenumbers_cm.tolist() == expect["wavenumbers_cm"]
    assert calc.where["wavenumbers_cm"] == expect["wavenumbers_line"]
    assert calc.printed["entropy"].text == expect["entropy_j_mol_k"]
    assert calc.printed["zero_point"].text == expect["zero_point_hartree"]
    assert calc.printed["symmetry_number"].text == expect["symmetry_number"]
    assert all(printed.text in lines[printed.line] for printed in calc.printed.values())


@pytest.mark.parametrize("path", [*GOOD, *sorted(JOBS.glob("*/job.out"))], ids=str)
def test_the_audit_calls_no_printed_value_wrong(path: Path) -> None:
    """The printed entropy is no rigid-rotor harmonic one, and must not be compared with ours."""
    calc = calculation(path)
    found = [finding.code for finding in (*calc.findings, *audit_alone(calc))]
    assert "printed-differs" not in found
    assert "mode-count" not in found


def test_an_optimisation_gives_its_final_geometry_not_the_input() -> None:
    calc = calculation(OHESS)
    text = OHESS.read_text(encoding="utf-8")
    block = text.partition(" final structure:")[2].splitlines()[4:7]
    rows = [[float(word) for word in line.split()[1:]] for line in block]
    assert calc.positions_angstrom.tolist() == rows
    assert calc.positions_angstrom[0, 2] != 0.119


def test_turbomole_coordinates_are_in_bohr() -> None:
    xyz, coord = calculation(OHESS), calculation(OHESS.with_name("water_coord_ohess.out"))
    for calc in (xyz, coord):
        bond = np.linalg.norm(calc.positions_angstrom[0] - calc.positions_angstrom[1])
        assert bond == pytest.approx(0.95920, abs=2e-4, rel=0.0)


def test_masses_are_those_of_the_program_and_changed_where_it_says_so() -> None:
    assert calculation(OHESS).masses_u.tolist() == [15.9994049, 1.0079407, 1.0079407]
    assert calculation(OHESS).masses_origin == "derived"
    heavy = calculation(OHESS.with_name("heavy_water_ohess.out"))
    assert heavy.masses_u == pytest.approx(np.array([15.9994049, 2.014, 3.0]), abs=1e-9, rel=0.0)
    assert heavy.masses_origin == "printed"


def test_temperatures_and_scaling() -> None:
    calc = calculation(OHESS.with_name("water_temperatures.out"))
    assert calc.printed["temperature"].text == "400.00"
    assert calc.printed["entropy"].text == "198.4390"
    assert calc.printed["frequency_scale"].text == "0.9500000"


def test_solvents() -> None:
    assert calculation(OHESS).solvent == "none"
    alpb = calculation(OHESS.with_name("water_alpb_ohess.out"))
    assert alpb.solvent == "ALPB water, gsolv [1 M gas/solution]"


def test_a_saddle_point_with_its_hessian_beside_it() -> None:
    calc = calculation(JOBS / "planar_ammonia" / "job.out")
    assert calc.wavenumbers_cm is not None
    assert calc.modes is not None
    assert calc.hessian_hartree_bohr2 is not None
    assert calc.wavenumbers_cm.tolist() == [-928.03, 1482.53, 1482.78, 3514.56, 3624.17, 3624.30]
    own = normal_modes(calc.hessian_hartree_bohr2, calc.masses_u, calc.positions_angstrom)
    assert own.wavenumbers_cm == pytest.approx(calc.wavenumbers_cm, abs=0.05, rel=0.0)
    umbrella = np.abs(calc.modes[0])
    assert umbrella[:, 2].min() > 10.0 * umbrella[:, :2].max()
    assert calc.positions_angstrom[0].tolist() == [0.0, 0.0, 0.0]
    assert calc.optimised is None
    assert codes(calc) == ["not-stationary"]


def test_a_namespace_goes_before_the_names_beside() -> None:
    calc = calculation(JOBS / "dimer" / "job.out")
    assert calc.hessian_hartree_bohr2 is not None
    assert calc.multiplicity == 1


def test_an_atom() -> None:
    calc = calculation(JOBS / "argon" / "job.out")
    assert calc.wavenumbers_cm is not None
    assert len(calc.wavenumbers_cm) == 0
    assert calc.printed["zero_point"].value == 0.0


def test_unpaired_electrons_by_the_occupations() -> None:
    assert calculation(JOBS / "water_triplet" / "job.out").multiplicity == 3


def test_a_biased_hessian_is_of_the_geometry_written() -> None:
    calc = calculation(JOBS / "water_bhess" / "job.out")
    assert codes(calc) == ["biased-hessian"]
    bond = np.linalg.norm(calc.positions_angstrom[0] - calc.positions_angstrom[1])
    assert bond == pytest.approx(0.95920, abs=2e-4, rel=0.0)


@pytest.fixture
def ammonia(tmp_path: Path) -> Path:
    folder = tmp_path / "ammonia"
    shutil.copytree(JOBS / "planar_ammonia", folder)
    return folder


def test_without_files_beside_it_there_is_no_geometry(ammonia: Path) -> None:
    (ammonia / "ammonia.xyz").unlink()
    with pytest.raises(
        ReadError, match=r"the file ammonia\.xyz is not beside this output"
    ) as caught:
        calculation(ammonia / "job.out")
    assert re.fullmatch(r".*job\.out:86", caught.value.where)


def test_without_a_hessian_there_are_wavenumbers_all_the_same(ammonia: Path) -> None:
    (ammonia / "hessian").unlink()
    calc = calculation(ammonia / "job.out")
    assert calc.wavenumbers_cm is not None
    assert len(calc.wavenumbers_cm) == 6
    assert calc.hessian_hartree_bohr2 is None
    assert calc.modes is None
    assert codes(calc) == ["not-stationary"]


@pytest.mark.parametrize("kind", ["another job", "cut", "no numbers", "one element"])
def test_a_hessian_of_another_job_is_left_out(ammonia: Path, kind: str) -> None:
    text = (ammonia / "hessian").read_text(encoding="utf-8")
    (ammonia / "hessian").write_text(
        {
            "another job": (JOBS / "dimer" / "w2.hessian").read_text(encoding="utf-8"),
            "cut": text[: len(text) // 2],
            "no numbers": text.replace("0.", "x.", 1),
            "one element": text.replace("0.7232", "0.8232", 1),
        }[kind],
        encoding="utf-8",
    )
    calc = calculation(ammonia / "job.out")
    assert calc.hessian_hartree_bohr2 is None
    assert "hessian-not-joined" in codes(calc)
    assert calc.wavenumbers_cm is not None


def test_the_geometry_of_another_molecule_is_refused(ammonia: Path) -> None:
    shutil.copy(FIXTURES / "xtb" / "inputs" / "water.xyz", ammonia / "ammonia.xyz")
    with pytest.raises(ReadError, match="this output is of H3N, but the geometry is of H2O"):
        calculation(ammonia / "job.out")


def test_moments_of_inertia_tell_another_geometry(tmp_path: Path) -> None:
    for name in ("job.out", "xtbopt.xyz"):
        shutil.copy(JOBS / "water_bhess" / name, tmp_path)
    shutil.copy(FIXTURES / "xtb" / "inputs" / "water.xyz", tmp_path / "xtbopt.xyz")
    with pytest.raises(ReadError, match="but those of the geometry are"):
        calculation(tmp_path / "job.out")


def test_xtbout_json_gives_the_unpaired_electrons_where_its_energy_agrees(tmp_path: Path) -> None:
    text = (FIXTURES / "xtb" / "good" / "hydroxyl_opt.out").read_text(encoding="utf-8")
    path = tmp_path / "job.out"
    path.write_text(text.replace("--uhf 1 ", ""), encoding="utf-8")
    assert calculation(path).multiplicity is None
    energy = calculation(path).energy_hartree
    assert energy is not None
    beside = tmp_path / "xtbout.json"
    values = {"total energy": round(energy, 8), "number of unpaired electrons": 1}
    beside.write_text(json.dumps(values), encoding="utf-8")
    assert calculation(path).multiplicity == 2
    for wrong in ({"total energy": energy + 1e-6}, {"number of unpaired electrons": 2}):
        beside.write_text(json.dumps(values | wrong), encoding="utf-8")
        assert calculation(path).multiplicity is None
    beside.write_text("[" * 100_000, encoding="utf-8")
    assert calculation(path).multiplicity is None


def test_g98_out_is_xtb_and_not_gaussian() -> None:
    path = JOBS / "planar_ammonia" / "g98.out"
    assert xtb.sniff(path.read_bytes()[:65536])
    calc, job = calculation(path), calculation(path.with_name("job.out"))
    assert (calc.program, calc.energy_hartree, calc.method) == ("xtb", None, None)
    assert calc.wavenumbers_cm is not None
    assert job.wavenumbers_cm is not None
    assert calc.wavenumbers_cm == pytest.approx(job.wavenumbers_cm, abs=0.006, rel=0.0)
    assert calc.modes is not None
    assert job.modes is not None
    assert abs(float(np.vdot(calc.modes[0], job.modes[0]))) == pytest.approx(1.0, abs=1e-3, rel=0.0)
    assert codes(calc) == ["no-energy"]


@pytest.mark.parametrize(
    ("old", "new", "what"),
    [
        ("TOTAL FREE ENERGY          -5.068", "TOTAL FREE ENERGY          -5.069", "its parts add up"),
        ("| TOTAL ENTHALPY             -5.046", "| TOTAL ENTHALPY             -5.047", "add up"),
        (":: total energy               -5.070544357548", ":: total energy               -5.070544357648",
         "its parts add up"),
        ("188.4371", "188.5371", "in two units that differ"),
        ("10.434\n", "10.534\n", "not the sum of its shares"),
        ("0.239085E-01    0.213988E-01", "0.239085E-01    0.213988E-01x", "T, H"),
        ("moments of inertia/u·Å² :        0.5788", "moments of inertia/u·Å² :        0.6788",
         "but those of the geometry are"),
        ("eigval :     1539.00  3643.64  3652.31", "eigval :     1539.00  3643.64", "8 frequencies"),
        ("eigval :     1539.00", "eigval :     ******* ", "expected frequencies"),
        ("O            0.00000000000000", "O            0.0000000000000x", "position of an atom"),
        ("1    8 O      1", "1    8 O      1, 2", "table with each atom once"),
    ],
)  # fmt: skip
def test_damage_that_must_be_seen(old: str, new: str, what: str) -> None:
    with pytest.raises(ReadError, match=what) as caught:
        xtb.read(damaged(OHESS, old, new, count=-1))
    assert re.fullmatch(r"damaged\.out:\d+", caught.value.where)


def test_a_zero_point_energy_of_other_modes_is_a_finding() -> None:
    calc = xtb.read(
        damaged(OHESS, "zero point energy           0.0201", "zero point energy           0.0202")
    )
    assert "printed-differs" in codes(calc)


def test_every_cut_is_an_error() -> None:
    data = OHESS.read_bytes()
    end = data.index(b" * finished run on")
    for part in range(1, 100):
        cut = min(len(data) * part // 100, end)
        with pytest.raises(ReadError):
            xtb.read(Source("cut.out", data[:cut]))


def test_sniff() -> None:
    assert all(xtb.sniff(path.read_bytes()[:65536]) for path in GOOD)
    assert not xtb.sniff(b"we ran x T B of S. Grimme\n")
    assert not xtb.sniff(b" Entering Gaussian System, Link 0=g16\n")


@pytest.mark.skipif(not SHARED.is_dir(), reason="../shared/data/other-programs is not here")
def test_divinylbenzene_of_xtb_6_6_1() -> None:
    values = json.loads((SHARED / "values.json").read_text(encoding="utf-8"))
    rows = values.get("files", values) if isinstance(values, dict) else values
    row = next(
        row for row in rows if row["path"].endswith("dvb_ir/dvb_ir.out") and row["program"] == "xtb"
    )
    calc = calculation(SHARED / row["path"])
    assert (calc.program_version, calc.charge, calc.multiplicity) == ("6.6.1", 0, 1)
    assert calc.energy_hartree == pytest.approx(row["energy_hartree"], abs=1e-12, rel=0.0)
    assert calc.where["energy_hartree"] == row["energy_line"]
    assert calc.wavenumbers_cm is not None
    assert calc.wavenumbers_cm.tolist() == row["frequencies_cm1"]
    assert calc.hessian_hartree_bohr2 is not None
    assert calc.printed["gibbs"].value == row["gibbs_hartree"]
    assert "printed-differs" not in [finding.code for finding in audit_alone(calc)]
    companion = calculation(SHARED / row["path"].replace("dvb_ir.out", "g98.out"))
    assert companion.wavenumbers_cm is not None
    assert companion.wavenumbers_cm == pytest.approx(calc.wavenumbers_cm, abs=0.006, rel=0.0)


@pytest.mark.parametrize(("oxygen", "hydrogen"), [("8", "1"), ("O1", "D"), ("o", "T")])
def test_elements_of_a_coordinate_file(tmp_path: Path, oxygen: str, hydrogen: str) -> None:
    """By number, and the names of hydrogen's isotopes, which xtb takes for hydrogen."""
    folder = JOBS / "water_triplet"
    geometry = (folder / "water.xyz").read_text()
    written = re.sub(r"(?m)^O ", f"{oxygen} ", re.sub(r"(?m)^H ", f"{hydrogen} ", geometry))
    assert written != geometry
    (tmp_path / "water.xyz").write_text(written)
    (tmp_path / "job.out").write_bytes((folder / "job.out").read_bytes())
    assert calculation(tmp_path / "job.out").numbers.tolist() == [8, 1, 1]


@pytest.mark.parametrize("word", ["0", "119", "8888", "Xx"])
def test_no_element_in_a_coordinate_file(tmp_path: Path, word: str) -> None:
    folder = JOBS / "water_triplet"
    geometry = (folder / "water.xyz").read_text()
    (tmp_path / "water.xyz").write_text(re.sub(r"(?m)^O ", f"{word} ", geometry))
    (tmp_path / "job.out").write_bytes((folder / "job.out").read_bytes())
    with pytest.raises(ReadError, match="the element and position of atom 1"):
        calculation(tmp_path / "job.out")
