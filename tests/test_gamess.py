"""GAMESS text outputs: fixtures in the program's form, a real output where it is, truncated and damaged copies."""

from __future__ import annotations

import json
import random
from pathlib import Path

import numpy as np
import pytest
from fixture_files import expected, file_id, files

from thermo_pp.audit.printed import printed_findings
from thermo_pp.errors import ReadError
from thermo_pp.readers import gamess
from thermo_pp.records import Calculation
from thermo_pp.sources import Source, open_source

GOOD = files("gamess", "good")
BY_NAME = {path.stem: path for path in GOOD}
WITH_MODES = [path for path in GOOD if "wavenumbers_cm" in expected(path)]
SHARED = Path(__file__).parents[2] / "shared" / "data" / "other-programs"
REAL = SHARED / "GAMESS" / "basicGAMESS-US2018" / "nh3_ts_ir.out"


def calculation(path: Path) -> Calculation:
    return gamess.read(open_source(path, path.name))


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
    assert calc.program_version == "30 SEP 2018 (R3)"
    assert calc.energy_label == calc.method == expect["label"]
    assert (calc.charge, calc.multiplicity, calc.basis) == (0, 1, "STO-3G")
    assert (calc.solvent, calc.dispersion) == ("none", "none")
    assert f"{calc.energy_hartree:.10f}" in lines[calc.where["energy_hartree"]]
    assert "SCS" not in lines[calc.where["energy_hartree"]]
    assert lines[calc.where["charge"]].split()[-1] == "0"
    row = [float(word) for word in lines[calc.where["positions_angstrom"]].split()[2:]]
    scale = 1.0 if "search" in path.stem else 0.529177210903
    assert calc.positions_angstrom[0] == pytest.approx(np.array(row) * scale, abs=1e-8)
    assert calc.program_version in lines[calc.where["program_version"]]


@pytest.mark.parametrize("path", WITH_MODES, ids=file_id)
def test_modes_and_thermochemistry(path: Path) -> None:
    expect, calc = expected(path), calculation(path)
    lines = ["", *path.read_text().splitlines()]
    assert calc.wavenumbers_cm is not None
    assert calc.modes is not None
    assert calc.wavenumbers_cm.tolist() == expect["wavenumbers_cm"]
    assert np.sqrt((calc.modes**2).sum(axis=(1, 2))) == pytest.approx(1.0, abs=1e-12)
    drift = np.einsum("a,mac->mc", calc.masses_u, calc.modes) / calc.masses_u.sum()
    assert np.abs(drift).max() < 1e-4
    assert calc.masses_origin == "printed"
    assert calc.masses_u[0] == float(lines[calc.where["masses_u"]].split()[-1])
    for value in calc.printed.values():
        assert value.text in lines[value.line]
    assert calc.printed["zero_point"].unit == "kJ/mol"
    assert calc.printed["pressure"].value == 101325.0


def test_the_first_of_displaced_energies_and_the_last_of_a_search() -> None:
    data = BY_NAME["ammonia_saddle"].read_bytes()
    assert data.count(b"FINAL RHF ENERGY") == 3
    saddle = calculation(BY_NAME["ammonia_saddle"])
    first = data.index(b"FINAL RHF ENERGY")
    assert saddle.where["energy_hartree"] == data.count(b"\n", 0, first) + 1
    search = calculation(BY_NAME["water_search_hessian"])
    assert (search.optimised, search.kind_of_job) == (True, ("optimisation", "frequencies"))
    assert search.findings == ()
    lost = calculation(BY_NAME["water_search_lost"])
    assert lost.optimised is False
    assert lost.energy_hartree == search.energy_hartree
    assert [finding.code for finding in lost.findings] == ["optimisation-not-converged"]


def test_modes_of_a_hessian_at_the_start_of_a_search_are_not_those_of_its_end() -> None:
    data = BY_NAME["water_search_hessian"].read_bytes()
    start = data.index(b"          -----", data.index(b"LOCATED"))
    end = data.index(b" EXECUTION OF GAMESS TERMINATED")
    moved = data[: data.index(b"1NSERCH=   0")] + data[start:end]
    moved += data[data.index(b"1NSERCH=   0") : start] + data[end:]
    assert gamess.read(Source("x.out", moved)).wavenumbers_cm is None


REFUSED = [  # fixture, changes, message
    ("water_mp2", [("RUNTYP=ENERGY ", "RUNTYP=IRC    ")], "RUNTYP=IRC, which is not read"),
    ("water_mp2", [("MPLEVL=       2", "MPLEVL=       3")], "MPLEVL=3"),
    (
        "water_mp2",
        [("E(2)=       -0.0", "E(2)=       -0.1")],
        "is not the sum of the energies above",
    ),
    ("water_mp2", [("   =    0\n SPIN", "   =    1\n SPIN")], "ICHARG=0 here, but 1"),
    ("water_mp2", [("   =   10\n", "   =   12\n")], "12 electrons do not fit"),
    (
        "water_mp2",
        [("NUCLEAR REPULSION ENERGY IS        ", "NUCLEAR REPULSION ENERGY IS       1")],
        "the nuclear repulsion",
    ),
    (
        "water_ccsdt",
        [("REFERENCE ENERGY:      -74.9", "REFERENCE ENERGY:      -74.8")],
        "the reference energy",
    ),
    ("water_ccsdt", [("CCTYP =CCSD(T)      ", "CCTYP =CR-CCL       ")], "CCTYP=CR-CCL"),
    (
        "ammonia_saddle",
        [("ICOORD=   0 E=      -55.4", "ICOORD=   0 E=      -55.3")],
        "the reference of the displaced",
    ),
    (
        "ammonia_saddle",
        [("  3   H            X -0.00000000  0.0", "  3   H            X -0.50000000  0.0")],
        "is not orthonormal",
    ),
    (
        "ammonia_saddle",
        [(" KCAL/MOL             ", " KCAL/MOL            9")],
        "in kcal/mol and kJ/mol differ",
    ),
    (
        "water_search_hessian",
        [("NSERCH:   1  E=     -74.9", "NSERCH:   1  E=     -74.8")],
        "the step of the search has",
    ),
]


@pytest.mark.parametrize(("name", "pairs", "message"), REFUSED, ids=lambda value: str(value)[:40])
def test_what_does_not_add_up_is_refused(
    name: str, pairs: list[tuple[str, str]], message: str
) -> None:
    with pytest.raises(ReadError) as caught:
        gamess.read(changed(name, *pairs))
    assert message in caught.value.what
    assert caught.value.where.startswith(f"{name}.out:")


def test_a_lost_line_is_never_passed_over_for_an_earlier_one() -> None:
    data = BY_NAME["water_search_lost"].read_bytes()
    last = data.rindex(b" FINAL RHF ENERGY")
    with pytest.raises(ReadError, match="no final energy of the last step"):
        gamess.read(Source("x.out", data[:last] + data[data.index(b"\n", last) + 1 :]))
    last = data.rindex(b" COORDINATES OF ALL ATOMS")
    with pytest.raises(ReadError, match="no geometry of the step after"):
        gamess.read(Source("x.out", data[:last] + data[data.index(b"\n", last) + 1 :]))
    with pytest.raises(ReadError, match="which the options do not ask for"):
        gamess.read(changed("water_mp2", ("MPLEVL=       2", "MPLEVL=       0")))
    with pytest.raises(ReadError, match="modes without their heading"):
        gamess.read(
            changed("water_search_hessian", ("NORMAL COORDINATE AN", "NORMAL COORDXNATE AN"))
        )


@pytest.mark.parametrize("path", GOOD, ids=file_id)
def test_printed_thermochemistry_passes_the_audit(path: Path) -> None:
    assert printed_findings(calculation(path)) == ()


def test_dispersion_must_be_in_the_energy() -> None:
    density = ("DFTTYP=NONE ", "DFTTYP=B3LYP"), ("FINAL RHF ENERGY", "FINAL R-B3LYP ENERGY")
    level = ("MPLEVL=       2", "MPLEVL=       0")
    density = (*density, ("E(MP2)=", "E(XX2)="))
    assert gamess.read(changed("water_mp2", *density, level)).method == "B3LYP"
    line = (" FINAL R-B3", " GRIMME'S DISPERSION ENERGY =      -0.0012345678\n\n FINAL R-B3")
    with pytest.raises(ReadError, match="not known to be in the final energy"):
        gamess.read(changed("water_mp2", *density, level, line))
    calc = gamess.read(changed("water_mp2", *density, level))
    assert calc.energy_hartree is not None
    repulsion = float(BY_NAME["water_mp2"].read_text().split("REPULSION ENERGY IS")[1].split()[0])
    rest = calc.energy_hartree - repulsion + 0.0012345678
    parts = (
        f"\n                ONE ELECTRON ENERGY = {rest - 30.0:17.10f}\n                TWO ELECTRON ENERGY =     30.0"
        f"\n           NUCLEAR REPULSION ENERGY = {repulsion:17.10f}\n EXECUTION OF GAMESS TERM"
    )
    whole = changed("water_mp2", *density, level, line, (" EXECUTION OF GAMESS TERM", parts))
    calc = gamess.read(whole)
    assert (calc.dispersion, calc.energy_label) == ("Grimme", "DFT")


@pytest.mark.parametrize("name", ["ammonia_saddle", "water_ccsdt", "water_search_hessian"])
def test_every_truncation_is_an_error(name: str) -> None:
    data = BY_NAME[name].read_bytes()
    end = data.rindex(b"EXECUTION OF GAMESS TERM")
    for part in range(1, 60):
        with pytest.raises(ReadError, match=r"cut\.out:\d+: "):
            gamess.read(Source("cut.out", data[: end * part // 60]))


def test_damaged_copies_give_their_own_words_or_an_error() -> None:
    """Digits changed at random: the values of the original, what the damaged line now says, or a ReadError."""
    path = BY_NAME["ammonia_saddle"]
    data, whole = path.read_bytes(), calculation(path)
    assert whole.wavenumbers_cm is not None
    generator = random.Random(11)
    digits = [i for i, byte in enumerate(data) if chr(byte).isdigit()]
    for place in generator.sample(digits, 400):
        new = str((int(chr(data[place])) + generator.randint(1, 9)) % 10).encode()
        try:
            calc = gamess.read(Source("x.out", data[:place] + new + data[place + 1 :]))
        except ReadError as error:
            assert error.where.startswith("x.out:")  # noqa: PT017
            continue
        line = data.count(b"\n", 0, place) + 1
        assert calc.wavenumbers_cm is not None
        if calc.energy_hartree != whole.energy_hartree:
            assert calc.where["energy_hartree"] == line
        off = np.abs(calc.wavenumbers_cm - whole.wavenumbers_cm).max()
        assert off < 0.006 or line - calc.where["wavenumbers_cm"] in range(12), (line, off)
        moved = np.abs(calc.positions_angstrom - whole.positions_angstrom).max()
        assert moved < 1e-5 or line - calc.where["positions_angstrom"] in range(4), line


@pytest.mark.skipif(not REAL.is_file(), reason=f"no real output {REAL}")
def test_real_output() -> None:
    rows = json.loads((SHARED / "values.json").read_text(encoding="utf-8"))
    row = next(row for row in rows if row["program"] == "GAMESS")
    calc = calculation(SHARED / row["path"])
    assert calc.energy_hartree == row["energy_hartree"]
    assert calc.where["energy_hartree"] == row["energy_line"]
    assert calc.energy_label == row["energy_label"]
    assert (calc.method, calc.program_version) == (row["method"], row["version"])
    assert (calc.charge, calc.multiplicity) == (row["charge"], row["multiplicity"])
    last = np.array(row["geometry_last_atom"][1:])
    assert calc.positions_angstrom[-1] == pytest.approx(last, abs=2e-7)
    assert calc.wavenumbers_cm is not None
    assert calc.wavenumbers_cm.tolist() == row["frequencies_cm1"]
    assert calc.masses_u.tolist() == [14.00307, 1.00782, 1.00782, 1.00782]
    assert calc.printed["entropy"].value == row["entropy_J_mol_K"]
    enthalpy = row["enthalpy_correction_hartree"] * 2625.4996
    assert calc.printed["thermal_enthalpy"].value == pytest.approx(enthalpy, abs=1e-3)
    assert calc.printed["symmetry_number"].value == row["symmetry_number"]
    assert printed_findings(calc) == ()


def test_told_by_content() -> None:
    assert gamess.sniff(BY_NAME["water_mp2"].read_bytes()[:65536])
    assert not gamess.sniff(b" *  G A M E S S - U K  *\n")
    assert not gamess.sniff(b"          *   Firefly (PC GAMESS) version 8.0 *\n")
