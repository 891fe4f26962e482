"""Gaussian outputs: real ones where they are, and short hand-written ones that say so in their tables."""

from __future__ import annotations

import json
import re
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from fixture_files import FIXTURES, expected, file_id, files

from thermo_pp.audit.printed import printed_findings
from thermo_pp.data.elements import SYMBOLS
from thermo_pp.errors import ReadError
from thermo_pp.formulas.normal_modes import normal_modes
from thermo_pp.readers import claims, read, read_source
from thermo_pp.records import Calculation
from thermo_pp.sources import Source

GOOD = files("gaussian", "good")
WITH_MODES = [path for path in GOOD if "wavenumbers_cm" in expected(path)]
REAL = Path(__file__).parents[2] / "shared" / "data" / "other-programs"
CUTS = 20


def real_values() -> list[Any]:
    if not (REAL / "values.json").is_file():
        return []
    values = json.loads((REAL / "values.json").read_text(encoding="utf-8"))
    return [value for value in values if value["path"].startswith("Gaussian/")]


VALUES: list[Any] = real_values() or [
    pytest.param({}, marks=pytest.mark.skip(reason=f"no real outputs: {REAL} is not there"))
]


def value_id(value: object) -> str:
    return value["path"] if isinstance(value, dict) and value else "none"


def good(name: str) -> bytes:
    return (FIXTURES / "gaussian" / "good" / f"{name}.log").read_bytes()


def damaged(name: str, old: bytes, new: bytes) -> Source:
    data = good(name)
    assert old in data
    return Source("x.log", data.replace(old, new))


@pytest.mark.parametrize("path", GOOD, ids=file_id)
def test_values(path: Path) -> None:
    calc, expect = read(path), expected(path)
    for name in ("method", "basis", "dispersion", "solvent", "frozen_core", "program_version"):
        if name in expect:
            assert getattr(calc, name) == expect[name], name
    assert (calc.charge, calc.multiplicity) == (expect["charge"], expect["multiplicity"])
    assert calc.energy_label == expect.get("energy_label")
    assert calc.optimised is expect.get("optimised")
    assert calc.ended_normally is expect.get("ended_normally", True)
    assert list(calc.kind_of_job) == expect["kind_of_job"]
    assert [finding.code for finding in calc.findings] == expect["findings"]
    if "masses_u" in expect:
        assert calc.masses_u == pytest.approx(expect["masses_u"], abs=1e-9)
    if "wavenumbers_cm" in expect:
        assert calc.wavenumbers_cm == pytest.approx(expect["wavenumbers_cm"], abs=1e-9, rel=0.0)
        assert calc.masses_origin == "printed"
    else:
        assert calc.wavenumbers_cm is None


@pytest.mark.parametrize("path", WITH_MODES, ids=file_id)
def test_modes_are_of_unit_length(path: Path) -> None:
    calc = read(path)
    assert calc.modes is not None
    assert calc.wavenumbers_cm is not None
    assert calc.modes.shape == (len(calc.wavenumbers_cm), len(calc.numbers), 3)
    assert np.sum(calc.modes**2, axis=(1, 2)) == pytest.approx(1.0, abs=1e-12, rel=0.0)


@pytest.mark.parametrize("path", WITH_MODES, ids=file_id)
def test_printed_thermochemistry_follows_from_the_modes(path: Path) -> None:
    assert printed_findings(read(path)) == ()


def test_wrong_printed_numbers_are_found() -> None:
    name = "oh_freq_deuterium"
    printed = read_source(Source("x.log", good(name))).printed
    for key in ("zero_point", "enthalpy", "gibbs", "entropy", "vibrational_entropy"):
        text = printed[key].text
        wrong = text[:-2] + ("1" if text[-2] not in "012" else "7") + text[-1]
        line = printed[key].line - 1
        lines = good(name).split(b"\n")
        lines[line] = lines[line].replace(text.encode(), wrong.encode())
        try:
            calc = read_source(Source("x.log", b"\n".join(lines)))
        except ReadError as error:
            assert "one electronic energy" in error.what  # noqa: PT017
            continue
        codes = [finding.code for finding in printed_findings(calc)]
        assert codes == ["printed-differs"] or calc.energy_hartree is None, key


def test_many_digits_are_preferred_and_modes_counted_once() -> None:
    calc = read_source(Source("x.log", good("hcn_ts_hpmodes")))
    assert calc.modes is not None
    rows = good("hcn_ts_hpmodes").split(b"Coord Atom Element:\n")[1].split(b"\n")
    first = [float(row.split()[3]) for row in rows[:9]]
    assert calc.modes[0].reshape(-1) == pytest.approx(first, abs=2e-5)
    assert (
        calc.where["modes"]
        == good("hcn_ts_hpmodes")[: good("hcn_ts_hpmodes").index(b"Frequencies ---")].count(b"\n")
        + 1
    )


def test_geometry_of_the_modes_is_not_a_displaced_one() -> None:
    calc = read_source(Source("x.log", good("co2_mp2_numerical_freq")))
    assert calc.positions_angstrom[1] == pytest.approx([0.0, 0.0, 1.17], abs=1e-9)
    assert calc.where["positions_angstrom"] < calc.where["energy_hartree"]


def test_completed_in_a_frequency_step_means_nothing() -> None:
    assert b"Optimization completed" in good("hcn_ts_hpmodes")
    assert read_source(Source("x.log", good("hcn_ts_hpmodes"))).optimised is None


def test_out_of_steps_is_read_but_another_error_is_not() -> None:
    source = damaged(
        "water_opt_out_of_steps", b"-- Number of steps exceeded", b"-- Small interatomic"
    )
    with pytest.raises(ReadError, match="the job ended in an error"):
        read_source(source)


def test_testing_for_stability_is_no_optimisation() -> None:
    calc = read_source(
        damaged("hydroxide_nosymm_gen", b"/gen nosymm\n", b"/gen nosymm stable=opt\n")
    )
    assert (calc.optimised, calc.kind_of_job) == (None, ("energy",))


def test_archive_entry_is_compared() -> None:
    calc = read_source(
        damaged("oh_freq_deuterium", b"E(UB3LYP) =    -75.72345", b"E(UB3LYP) =    -75.72355")
    )
    assert calc.energy_hartree is None
    other = read_source(damaged("water_td_energy", b"HF=-76.409876", b"HF=-76.409976"))
    assert "energy-not-confirmed" in [finding.code for finding in other.findings]


def test_energy_never_comes_from_the_archive() -> None:
    calc = read_source(Source("x.log", good("water_ccsdt_energy")))
    line = good("water_ccsdt_energy").split(b"\n")[calc.where["energy_hartree"] - 1]
    assert line.startswith(b" CCSD(T)= -0.76")


def test_companion_of_another_program_is_not_claimed() -> None:
    head = b" Entering Gaussian System\n ***\n Gaussian 98:\n frequency output generated by the xtb code\n"
    assert "gaussian" not in [reader.NAME for reader in claims(head)]


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


def test_line_ends_of_windows_change_nothing() -> None:
    for path in GOOD:
        one = read(path)
        two = read_source(Source(str(path), path.read_bytes().replace(b"\n", b"\r\n")))
        assert_same(one, two)
        assert one.sha256 != two.sha256


@pytest.mark.parametrize("value", VALUES, ids=value_id)
def test_real_output(value: dict[str, Any]) -> None:
    calc = read(REAL / value["path"])
    assert calc.program_version == value["version"].replace(",", "")
    assert calc.method == value["method"].removeprefix("U")
    assert calc.basis == value["basis"]
    assert (calc.charge, calc.multiplicity) == (value["charge"], value["multiplicity"])
    assert len(calc.numbers) == value["natoms"]
    for index, key in ((0, "geometry_first_atom"), (-1, "geometry_last_atom")):
        symbol, *place = value[key]
        assert SYMBOLS[calc.numbers[index]] == symbol
        assert calc.positions_angstrom[index] == pytest.approx(place, abs=1e-6, rel=0.0)
    assert calc.energy_hartree == pytest.approx(value["energy_hartree"], abs=1e-9, rel=0.0)
    assert calc.energy_label == value["energy_label"]
    assert calc.where["energy_hartree"] == value["energy_line"]
    assert calc.optimised is value["opt_converged"]
    assert calc.findings == ()
    if not value["n_frequencies"]:
        assert calc.wavenumbers_cm is None
        return
    assert calc.wavenumbers_cm == pytest.approx(value["frequencies_cm1"], abs=1e-3, rel=0.0)
    for symbol, mass in value["masses"].items():
        found = calc.masses_u[[SYMBOLS[z] == symbol for z in calc.numbers]]
        assert found == pytest.approx(mass, abs=1e-6)
    for key in ("enthalpy", "gibbs"):
        assert calc.printed[key].value == pytest.approx(value[f"{key}_hartree"], abs=1e-9)
    assert calc.printed["zero_point"].value == pytest.approx(value["zpe_hartree"], abs=1e-9)
    entropy = calc.printed["entropy"].value * 4.184
    assert entropy == pytest.approx(value["entropy_J_mol_K"], abs=0.01)
    assert int(calc.printed["symmetry_number"].text) == value["symmetry_number"]
    assert printed_findings(calc) == ()


@pytest.mark.parametrize("value", VALUES, ids=value_id)
def test_force_constants_of_a_real_archive_are_in_the_frame_of_the_modes(
    value: dict[str, Any],
) -> None:
    calc = read(REAL / value["path"])
    if calc.modes is None:
        assert calc.hessian_hartree_bohr2 is None
        return
    assert calc.hessian_hartree_bohr2 is not None
    found = normal_modes(calc.hessian_hartree_bohr2, calc.masses_u, calc.positions_angstrom)
    assert found.wavenumbers_cm == pytest.approx(calc.wavenumbers_cm, abs=0.05, rel=0.0)
    overlaps = np.abs(np.einsum("mak,mak->m", found.modes, calc.modes))
    assert overlaps.min() > 1.0 - 1e-6  # printed with five decimals


@pytest.mark.parametrize("value", VALUES, ids=value_id)
def test_damaged_force_constants_are_left_out(value: dict[str, Any]) -> None:
    data = (REAL / value["path"]).read_bytes()
    at = data.find(b"\\NImag=")
    if at < 0:
        return
    digits = re.compile(rb",-?0\.0(\d)").search(data, at + 3000)
    assert digits is not None
    place = digits.start(1)
    other = b"%d" % ((int(digits.group(1)) + 5) % 10)
    calc = read_source(Source("x.log", data[:place] + other + data[place + 1 :]))
    assert calc.wavenumbers_cm is not None
    assert calc.hessian_hartree_bohr2 is None


@pytest.mark.parametrize("value", VALUES, ids=value_id)
def test_real_output_cut_short(value: dict[str, Any]) -> None:
    data = (REAL / value["path"]).read_bytes()
    end = data.rindex(b"Normal termination")
    for i in range(1, CUTS + 1):
        cut = end * i // CUTS
        if not claims(data[: min(cut, 65536)]):
            continue
        with pytest.raises(ReadError, match=r"^x\.log:\d+: "):
            read_source(Source("x.log", data[:cut]))


@pytest.mark.parametrize("value", VALUES, ids=value_id)
def test_real_output_with_line_ends_of_windows(value: dict[str, Any]) -> None:
    data = (REAL / value["path"]).read_bytes()
    assert_same(
        read_source(Source("x.log", data)),
        read_source(Source("x.log", data.replace(b"\n", b"\r\n"))),
    )


def test_projected_modes_may_be_one_less() -> None:
    """``freq=projected`` (from knowledge of it): 3N-7 modes; without the word the same file is damaged."""
    lines = []
    for line in good("water_opt_freq").decode().splitlines():
        if line.startswith(
            ("                      1  ", "                     A'", " Frequencies", " Red.")
        ):
            line = line[:52]
        elif re.match(r"     [123] +\d+( +-?\d\.\d\d){9}$", line):
            line = line[:60]
        lines.append(line.replace(" 2463.68  5359.62  5539.27", " 2463.68  5359.62"))
    data = "\n".join(lines).encode()
    with pytest.raises(ReadError, match="2 modes of 3 atoms, expected 3 or 4"):
        read_source(Source("x.log", data))
    assert b" RB3LYP/6-31G(d) Freq" in data
    calc = read_source(Source("x.log", data.replace(b"(d) Freq", b"(d) Freq=Projected")))
    assert calc.wavenumbers_cm == pytest.approx([1712.3456, 3725.1234])
