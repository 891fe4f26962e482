"""ORCA outputs: real ones where they are, and short hand-written ones that say so in their tables."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from fixture_files import FIXTURES, expected, file_id, files

from thermo_pp.audit.printed import printed_findings
from thermo_pp.data.elements import SYMBOLS
from thermo_pp.errors import ReadError
from thermo_pp.readers import read, read_source
from thermo_pp.records import Calculation
from thermo_pp.sources import Source

GOOD = files("orca", "good")
WITH_MODES = [path for path in GOOD if "wavenumbers_cm" in expected(path)]
REAL = Path(__file__).parents[2] / "shared" / "data" / "other-programs"
CUTS = 20


def real_values() -> list[Any]:
    if not (REAL / "values.json").is_file():
        return []
    values = json.loads((REAL / "values.json").read_text(encoding="utf-8"))
    return [value for value in values if value["path"].startswith("ORCA/")]


VALUES: list[Any] = real_values() or [
    pytest.param({}, marks=pytest.mark.skip(reason=f"no real outputs: {REAL} is not there"))
]


def value_id(value: object) -> str:
    return value["path"] if isinstance(value, dict) and value else "none"


def good(name: str) -> bytes:
    return (FIXTURES / "orca" / "good" / f"{name}.out").read_bytes()


def damaged(name: str, old: bytes, new: bytes, count: int = 1) -> Source:
    data = good(name)
    assert data.count(old) >= count
    return Source("x.out", data.replace(old, new, count))


def line_of(data: bytes, mark: bytes) -> int:
    return data.count(b"\n", 0, data.index(mark)) + 1


@pytest.mark.parametrize("path", GOOD, ids=file_id)
def test_values(path: Path) -> None:
    calc, expect = read(path), expected(path)
    for name in ("method", "basis", "dispersion", "solvent", "frozen_core", "program_version"):
        if name in expect:
            assert getattr(calc, name) == expect[name], name
    assert (calc.charge, calc.multiplicity) == (expect["charge"], expect["multiplicity"])
    assert calc.energy_label == expect.get("energy_label")
    assert calc.optimised is expect.get("optimised")
    assert list(calc.kind_of_job) == expect["kind_of_job"]
    assert [finding.code for finding in calc.findings] == expect["findings"]
    assert calc.ended_normally
    assert calc.masses_origin == ("derived" if calc.program == "" else "printed")
    if "wavenumbers_cm" in expect:
        assert calc.wavenumbers_cm == pytest.approx(expect["wavenumbers_cm"], abs=1e-9, rel=0.0)
    else:
        assert calc.wavenumbers_cm is None


@pytest.mark.parametrize("path", WITH_MODES, ids=file_id)
def test_modes_are_of_unit_length_and_columns_of_the_table(path: Path) -> None:
    calc = read(path)
    assert calc.modes is not None
    assert calc.wavenumbers_cm is not None
    assert calc.modes.shape == (len(calc.wavenumbers_cm), len(calc.numbers), 3)
    assert np.sum(calc.modes**2, axis=(1, 2)) == pytest.approx(1.0, abs=1e-12, rel=0.0)


def test_imaginary_mode_keeps_its_displacements() -> None:
    calc = read_source(Source("x.out", good("hcn_ts_freq_version_6")))
    assert calc.modes is not None
    assert calc.wavenumbers_cm is not None
    assert calc.wavenumbers_cm[0] == -1148.87
    table = good("hcn_ts_freq_version_6").split(b"NORMAL MODES")[1].split(b"\n")
    header = next(i for i, line in enumerate(table) if line.split() == [b"6", b"7", b"8"])
    first = float(table[header + 1].split()[1])
    assert calc.modes[0, 0, 0] == pytest.approx(first, abs=2e-6)


@pytest.mark.parametrize("path", WITH_MODES, ids=file_id)
def test_printed_thermochemistry_follows_from_the_modes(path: Path) -> None:
    assert printed_findings(read(path)) == ()


def test_the_first_of_several_temperatures_is_taken() -> None:
    printed = read_source(Source("x.out", good("co2_freq_two_temperatures"))).printed
    assert printed["temperature"].text == "298.15"
    assert printed["entropy"].unit == "Eh/(298.15 K)"
    assert "entropy_model" not in printed


def test_wrong_printed_numbers_are_found_where_the_entropy_is_harmonic() -> None:
    name = "co2_freq_two_temperatures"
    printed = read_source(Source("x.out", good(name))).printed
    for key in ("zero_point", "enthalpy", "gibbs", "entropy", "translational_entropy"):
        text = printed[key].text
        wrong = text[:-4] + ("1" if text[-4] != "1" else "2") + text[-3:]
        calc = read_source(damaged(name, text.encode(), wrong.encode()))
        assert [finding.code for finding in printed_findings(calc)] == ["printed-differs"], key


def test_interpolated_entropy_is_not_compared_but_enthalpy_is() -> None:
    calc = read_source(Source("x.out", good("water_opt_freq")))
    assert "entropy_model" in calc.printed
    for key, found in (("entropy", 0), ("gibbs", 0), ("zero_point", 1)):
        text = calc.printed[key].text
        wrong = text[:-5] + ("1" if text[-5] != "1" else "2") + text[-4:]
        other = read_source(damaged("water_opt_freq", text.encode(), wrong.encode()))
        assert len(printed_findings(other)) == found, key


def test_modes_left_out_of_the_thermochemistry_are_no_difference() -> None:
    start = good("water_opt_freq").index(b"freq.    1629.45")
    data = good("water_opt_freq")
    end = data.index(b"\n", start) + 1
    calc = read_source(Source("x.out", data[:start] + data[end:]))
    assert calc.printed["modes_used"].text == "2"
    assert printed_findings(calc) == ()


def test_wavenumbers_printed_twice_are_compared() -> None:
    data = good("water_opt_freq")
    with pytest.raises(
        ReadError, match="the wavenumbers of the thermochemistry are not those"
    ) as caught:
        read_source(Source("x.out", data.replace(b"1629.45 cm**-1", b"1628.45 cm**-1")))
    assert caught.value.where == f"x.out:{line_of(data, b'freq. ')}"


def test_final_energy_that_is_no_sum_of_its_parts_is_doubted() -> None:
    calc = read_source(damaged("water_b2plyp_d3", b"-76.281358023", b"-76.281358923"))
    assert [finding.code for finding in calc.findings] == ["energy-not-confirmed"]
    assert calc.findings[0].line == calc.where["energy_hartree"]


def test_energy_of_the_thermochemistry_is_compared() -> None:
    calc = read_source(
        damaged(
            "hcn_ts_freq_version_6",
            b"Electronic energy                ...   -93.3306",
            b"Electronic energy                ...   -93.3307",
        )
    )
    assert [finding.code for finding in calc.findings] == ["energy-not-confirmed"]


def test_excited_state_whose_ground_state_is_not_there_gives_no_energy() -> None:
    calc = read_source(damaged("water_tddft", b"E= \n", b"", 0))
    assert calc.energy_hartree == -76.29123456
    other = read_source(
        damaged("water_tddft", b"DE(TDA) =      0.281234000", b"DE(TDA) =      0.291234000")
    )
    assert other.energy_hartree is None
    assert [finding.code for finding in other.findings] == ["no-energy"]


def test_unconverged_job_beside_the_modes_is_passed_over() -> None:
    data = good("water_two_jobs")
    at = data.index(b"FINAL SINGLE POINT ENERGY", data.index(b"JOB NUMBER  2"))
    end = data.index(b"\n", at)
    calc = read_source(
        Source("x.out", data[:end] + b"  (Wavefunction not fully converged!)" + data[end:])
    )
    assert (calc.energy_label, calc.method) == ("DFT", "BP86")


def test_two_outputs_in_one_file_each_have_their_own_input() -> None:
    one, two = good("water_scs_mp2"), good("water_b2plyp_d3")
    calc = read_source(Source("x.out", one + two))
    assert (calc.method, calc.energy_label) == ("RI-SCS-MP2", "SCS-MP2")  # the better of the two
    assert calc.where["energy_hartree"] == line_of(one + two, b"FINAL SINGLE")
    moved = two.replace(b"1.442313", b"1.443313").replace(b"0.763239", b"0.763768")
    moved = moved.replace(b"9.08829376", b"9.08429250")
    other = read_source(Source("x.out", one + moved))
    assert (other.method, other.energy_label) == ("B2PLYP", "DFT")


def test_line_ends_of_windows_change_nothing() -> None:
    for path in GOOD:
        one = read(path)
        two = read_source(Source(str(path), path.read_bytes().replace(b"\n", b"\r\n")))
        assert_same(one, two)
        assert one.sha256 != two.sha256


def assert_same(one: Calculation, two: Calculation) -> None:
    for name in (
        "energy_hartree",
        "energy_label",
        "method",
        "basis",
        "where",
        "printed",
        "findings",
    ):
        assert getattr(one, name) == getattr(two, name), name
    assert np.array_equal(one.positions_angstrom, two.positions_angstrom)
    if one.wavenumbers_cm is not None:
        assert two.wavenumbers_cm is not None
        assert np.array_equal(one.wavenumbers_cm, two.wavenumbers_cm)


@pytest.mark.parametrize("value", VALUES, ids=value_id)
def test_real_output(value: dict[str, Any]) -> None:
    path = REAL / value["path"]
    calc = read(path)
    assert calc.program_version == value["version"]
    assert calc.method == value["method"]
    assert calc.basis == value["basis"]
    assert (calc.charge, calc.multiplicity) == (value["charge"], value["multiplicity"])
    assert len(calc.numbers) == value["natoms"]
    for index, key in ((0, "geometry_first_atom"), (-1, "geometry_last_atom")):
        symbol, *place = value[key]
        assert SYMBOLS[calc.numbers[index]] == symbol
        assert calc.positions_angstrom[index] == pytest.approx(place, abs=1e-6, rel=0.0)
    assert calc.energy_hartree == pytest.approx(value["energy_hartree"], abs=1e-6, rel=0.0)
    assert calc.energy_label == value["energy_label"]
    assert calc.where["energy_hartree"] == value["energy_line"]
    assert calc.optimised is value["opt_converged"]
    assert calc.findings == ()
    if value["n_frequencies"]:
        assert calc.wavenumbers_cm == pytest.approx(value["frequencies_cm1"], abs=0.06, rel=0.0)
        for symbol, mass in value["masses"].items():
            found = calc.masses_u[[SYMBOLS[z] == symbol for z in calc.numbers]]
            assert found == pytest.approx(mass, abs=1e-6)
        assert calc.masses_origin == "printed"
        assert calc.printed["zero_point"].value == pytest.approx(value["zpe_hartree"], abs=1e-9)
        assert calc.printed["enthalpy"].value == pytest.approx(value["enthalpy_hartree"], abs=1e-9)
        assert calc.printed["gibbs"].value == pytest.approx(value["gibbs_hartree"], abs=1e-9)
        assert calc.printed["entropy"].value == pytest.approx(value["TS_hartree"], abs=1e-9)
        assert int(calc.printed["symmetry_number"].text) == value["symmetry_number"]
        assert printed_findings(calc) == ()
    else:
        assert calc.wavenumbers_cm is None


@pytest.mark.parametrize("value", VALUES, ids=value_id)
def test_real_output_cut_short(value: dict[str, Any]) -> None:
    data = (REAL / value["path"]).read_bytes()
    end = data.rindex(b"****ORCA TERMINATED NORMALLY****")
    for i in range(1, CUTS + 1):
        cut = end * i // CUTS
        if b"* O   R   C   A *" not in data[:cut]:
            continue
        with pytest.raises(ReadError, match=r"^x\.out:\d+: "):
            read_source(Source("x.out", data[:cut]))


@pytest.mark.parametrize("value", VALUES, ids=value_id)
def test_real_output_with_line_ends_of_windows(value: dict[str, Any]) -> None:
    data = (REAL / value["path"]).read_bytes()
    assert_same(
        read_source(Source("x.out", data)),
        read_source(Source("x.out", data.replace(b"\n", b"\r\n"))),
    )
