"""Q-Chem text outputs: fixtures in the program's form, real outputs where they are, truncated and damaged copies."""

from __future__ import annotations

import json
import random
from pathlib import Path

import numpy as np
import pytest
from fixture_files import FIXTURES, expected, file_id, files

from thermo_pp.audit.printed import printed_findings
from thermo_pp.errors import ReadError
from thermo_pp.readers import qchem
from thermo_pp.records import Calculation
from thermo_pp.sources import Source, open_source

GOOD = files("qchem", "good")
BY_NAME = {path.stem: path for path in GOOD}
WITH_MODES = [path for path in GOOD if "wavenumbers_cm" in expected(path)]
SHARED = Path(__file__).parents[2] / "shared" / "data" / "other-programs"


def calculation(path: Path) -> Calculation:
    return qchem.read(open_source(path, path.name))


def changed(name: str, *pairs: tuple[str, str], count: int = -1) -> Source:
    """A fixture in which texts are replaced; they must have stood there."""
    data = BY_NAME[name].read_bytes()
    for old, new in pairs:
        assert old.encode() in data, old
        data = data.replace(old.encode(), new.encode(), count)
    return Source(f"{name}.out", data)


@pytest.mark.parametrize("path", GOOD, ids=file_id)
def test_energy_level_and_state(path: Path) -> None:
    expect, calc = expected(path), calculation(path)
    lines = ["", *path.read_text().splitlines()]
    assert calc.program == "qchem"
    assert calc.program_version == expect.get("version", "5.4.1")
    assert calc.energy_label == calc.method == expect["label"]
    assert (calc.charge, calc.multiplicity, calc.basis) == (0, 1, "STO-3G")
    assert (calc.solvent, calc.dispersion) == ("none", "none")
    printed = lines[calc.where["energy_hartree"]].split("=")[1].split()[0]
    assert float(printed) == calc.energy_hartree
    assert lines[calc.where["charge"]].split() == ["0", "1"]
    row = [float(word) for word in lines[calc.where["positions_angstrom"]].split()[2:]]
    assert calc.positions_angstrom[0].tolist() == row
    assert calc.basis in lines[calc.where["basis"]]
    assert lines[calc.where["method"]].split()[0].lower() == "method"


@pytest.mark.parametrize("path", WITH_MODES, ids=file_id)
def test_modes_and_thermochemistry(path: Path) -> None:
    expect, calc = expected(path), calculation(path)
    lines = ["", *path.read_text().splitlines()]
    assert calc.wavenumbers_cm is not None
    assert calc.modes is not None
    assert calc.wavenumbers_cm.tolist() == expect["wavenumbers_cm"]
    assert np.sqrt((calc.modes**2).sum(axis=(1, 2))) == pytest.approx(1.0, abs=1e-12)
    drift = np.einsum("a,mac->mc", calc.masses_u, calc.modes) / calc.masses_u.sum()
    assert np.abs(drift).max() < 2e-3
    assert calc.masses_origin == "printed"
    assert lines[calc.where["wavenumbers_cm"]].startswith(" Frequency:")
    assert calc.masses_u[0] == float(lines[calc.where["masses_u"]].split()[-1])
    assert {value.unit for value in calc.printed.values()} == {
        "K",
        "atm",
        "kcal/mol",
        "cal/(mol K)",
        "",
    }
    for value in calc.printed.values():
        assert value.text in lines[value.line]
        assert "QRRHO" not in lines[value.line]


def test_the_best_energy_of_several_jobs() -> None:
    """Modes of the second job, MP2 of the third, the optimisation of the first."""
    calc = calculation(BY_NAME["water_three_jobs"])
    assert (calc.energy_label, calc.frozen_core, calc.optimised) == ("MP2", "frozen", True)
    assert calc.kind_of_job == ("energy", "optimisation", "frequencies")
    assert [finding.code for finding in calc.findings] == ["energy-of-another-task"]


def test_finite_differences_take_the_first_energy() -> None:
    source = open_source(BY_NAME["water_hf_freq_finite"], "x.out")
    assert source.data.count(b"Total energy in the final basis set") == 3
    plain = calculation(BY_NAME["water_hf_freq"])
    assert qchem.read(source).energy_hartree == plain.energy_hartree
    assert qchem.read(source).where["energy_hartree"] == plain.where["energy_hartree"]


def test_an_optimisation_out_of_cycles_gives_its_energy() -> None:
    calc = calculation(BY_NAME["water_opt_lost"])
    assert calc.optimised is False
    assert [finding.code for finding in calc.findings] == ["optimisation-not-converged"]


def test_the_other_forms_of_energies() -> None:
    """MP3 and MP4 of the older modules; the words are those that the program uses."""
    base = ("water_ccsdt", ("CCSD(T) total energy ", "EMP4 "), ("method = ccsd(t)", "method = mp4"))
    calc = qchem.read(changed(*base, ("SCF energy  ", "EHF  ")))
    assert (calc.energy_label, calc.method) == ("MP4", "MP4")
    calc = qchem.read(changed("water_ccsdt", ("method = ccsd(t)", "method = mp2")))
    assert calc.energy_label == "MP2"
    calc = qchem.read(changed("water_ccsdt", ("method = ccsd(t)", "correlation = ccsd")))
    assert calc.energy_label == "CCSD"
    calc = qchem.read(
        changed("water_ccsdt", ("method = ccsd(t)", "method = eom-ccsd\n ee_singlets = [2]"))
    )
    assert calc.energy_label == "CCSD"


REFUSED = [  # fixture, changes, message
    ("water_hf_freq", [("jobtype = freq", "jobtype = aimd")], "a job of the type 'aimd'"),
    (
        "water_hf_freq",
        [("jobtype = freq", "jobtype = freq\n cis_state_deriv = 1")],
        "a job on an excited state",
    ),
    (
        "water_hf_freq",
        [("$molecule", "$external_charges\n1 1 1 1\n$end\n$molecule")],
        "point charges",
    ),
    ("water_hf_freq", [(" 0 1\n", " 1 1\n")], "do not fit charge 1"),
    ("water_hf_freq", [(" 0 1\n", " 0 3\n")], "do not fit charge 0, multiplicity 3"),
    ("water_hf_freq", [("method = hf", "method = b3lyp")], "the SCF of this job is Hartree-Fock"),
    ("water_hf_freq", [("   1.00783\n", "   2.01410\n")], "the molecular mass"),
    ("water_hf_freq", [(" has  0 Im", " has  2 Im")], "2 imaginary modes here, 0 above"),
    (
        "water_ccsdt",
        [("CCSD correlation energy    =  -0.05", "CCSD correlation energy    =  -0.04")],
        "not the sum",
    ),
    (
        "water_hf_freq",
        [
            (
                "SCF   energy in the final basis set =      -74.9",
                "SCF   energy in the final basis set =      -74.8",
            )
        ],
        "is not the SCF energy",
    ),
    (
        "water_three_jobs",
        [("Final energy is     -74.9", "Final energy is     -74.8")],
        "is not that of the last geometry",
    ),
    (
        "water_hf_freq",
        [("Zero point vibrational energy:       1", "Zero point vibrational energy:       2")],
        "is not that of the modes",
    ),
]


@pytest.mark.parametrize(("name", "pairs", "message"), REFUSED, ids=lambda value: str(value)[:40])
def test_what_does_not_add_up_is_refused(
    name: str, pairs: list[tuple[str, str]], message: str
) -> None:
    with pytest.raises(ReadError, match=message) as caught:
        qchem.read(changed(name, *pairs))
    assert caught.value.where.startswith(f"{name}.out:")


def test_a_lost_line_is_never_passed_over_for_an_earlier_one() -> None:
    data = BY_NAME["water_opt_lost"].read_bytes()
    last = data.rindex(b" Total energy in the final basis set")
    with pytest.raises(ReadError, match="an SCF without its geometry or its total energy"):
        qchem.read(Source("x.out", data[:last] + data[data.index(b"\n", last) + 1 :]))
    with pytest.raises(ReadError, match="the end of a job without its beginning"):
        qchem.read(changed("water_three_jobs", ("User input: 2 of 3", "User inpxt: 2 of 3")))
    with pytest.raises(ReadError, match="modes in a job whose input asks for none"):
        qchem.read(changed("water_hf_freq", ("jobtype = freq", "jobtxpe = freq")))
    with pytest.raises(ReadError, match="no method in the echo"):
        qchem.read(changed("water_ccsdt", ("method = ccsd", "methxd = ccsd")))
    with pytest.raises(ReadError, match="masses, but no heading"):
        qchem.read(changed("water_hf_freq", ("STANDARD THERMO", "STANDARD THXRMO")))


@pytest.mark.parametrize("path", GOOD, ids=file_id)
def test_printed_thermochemistry_passes_the_audit(path: Path) -> None:
    assert printed_findings(calculation(path)) == ()


def test_solvent_terms_beside_the_energy() -> None:
    """A free energy of the system is taken for the SCF's own; without one SMD's energy is not known to be whole."""
    smd = ("method = hf", "method = hf\n solvent_method = smd")
    with pytest.raises(ReadError, match="non-electrostatic part of the solvation"):
        qchem.read(changed("water_hf_freq", smd))
    line = " (6)  G-S(liq) free energy of system                     -74.97000000 a.u.\n\n **"
    calc = qchem.read(changed("water_hf_freq", smd, ("\n **", line), count=1))
    assert (calc.energy_hartree, calc.solvent) == (-74.97, "SMD")


@pytest.mark.parametrize("name", ["water_three_jobs", "water_ccsdt", "ammonia_saddle"])
def test_every_truncation_is_an_error(name: str) -> None:
    data = BY_NAME[name].read_bytes()
    end = data.rindex(b"Thank you very much")
    for part in range(1, 60):
        with pytest.raises(ReadError, match=r"cut\.out:\d+: "):
            qchem.read(Source("cut.out", data[: end * part // 60]))


def test_damaged_copies_give_their_own_words_or_an_error() -> None:
    """Digits changed at random: the values of the original, what the damaged line now says, or a ReadError."""
    path = BY_NAME["water_three_jobs"]
    data, whole = path.read_bytes(), calculation(path)
    generator = random.Random(7)
    digits = [i for i, byte in enumerate(data) if chr(byte).isdigit()]
    for place in generator.sample(digits, 400):
        new = str((int(chr(data[place])) + generator.randint(1, 9)) % 10).encode()
        damaged = data[:place] + new + data[place + 1 :]
        try:
            calc = qchem.read(Source("x.out", damaged))
        except ReadError as error:
            assert error.where.startswith("x.out:")  # noqa: PT017
            continue
        line = data.count(b"\n", 0, place) + 1
        if calc.energy_hartree != whole.energy_hartree:
            assert calc.where["energy_hartree"] == line
        assert calc.wavenumbers_cm is not None
        assert whole.wavenumbers_cm is not None
        off = np.abs(calc.wavenumbers_cm - whole.wavenumbers_cm).max()
        assert off < 0.2, (line, off)
        if np.abs(calc.positions_angstrom - whole.positions_angstrom).max() > 1e-5:
            # out of the molecule's plane: no first-order change of the nuclear repulsion
            assert line - calc.where["positions_angstrom"] in range(3)


def shared_rows() -> list[dict[str, object]]:
    table = SHARED / "values.json"
    if not table.is_file():
        return []
    rows = json.loads(table.read_text(encoding="utf-8"))
    rows = rows if isinstance(rows, list) else rows["files"]
    return [row for row in rows if row["program"] == "Q-Chem"]


@pytest.mark.skipif(not SHARED.is_dir(), reason=f"no real outputs in {SHARED}")
@pytest.mark.parametrize("row", shared_rows(), ids=lambda row: row["path"])
def test_real_outputs(row: dict[str, object]) -> None:
    calc = calculation(SHARED / str(row["path"]))
    assert calc.program_version == row["version"]
    assert calc.energy_hartree == pytest.approx(row["energy_hartree"], abs=1e-9)
    assert calc.energy_label == row["energy_label"]
    assert calc.where["energy_hartree"] == row["energy_line"]
    assert str(calc.method).lower() == str(row["method"]).lower()
    assert str(calc.basis).lower() == row["basis"]
    assert (calc.charge, calc.multiplicity) == (row["charge"], row["multiplicity"])
    first, last = row["geometry_first_atom"], row["geometry_last_atom"]
    assert calc.positions_angstrom[0] == pytest.approx(first[1:], abs=1e-8)
    assert calc.positions_angstrom[-1] == pytest.approx(last[1:], abs=1e-8)
    waves = [] if calc.wavenumbers_cm is None else calc.wavenumbers_cm.tolist()
    assert waves == row["frequencies_cm1"]
    assert printed_findings(calc) == ()
    if waves:
        assert calc.printed["entropy"].value * 4.184 == pytest.approx(
            row["entropy_J_mol_K"], abs=1e-5
        )
        zero_point = calc.printed["zero_point"].value / 627.509474
        assert zero_point == pytest.approx(row["zpe_hartree"], abs=2e-6)
        assert int(calc.printed["symmetry_number"].value) == row["symmetry_number"]


def test_told_by_content() -> None:
    assert qchem.sniff(BY_NAME["water_hf_freq"].read_bytes()[:65536])
    assert not qchem.sniff(b"Q-Chem and GAMESS differ; ask about the basis set\n")
    assert FIXTURES.is_dir()
