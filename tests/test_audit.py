"""The audit: each finding where it belongs, and none where it does not."""

from __future__ import annotations

import re
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import thermo_pp as tp
from thermo_pp import units
from thermo_pp.audit import BINARY, EMPTY, UNCLAIMED, audit_alone, read_and_audit
from thermo_pp.audit.duplicates import SAME_ANGSTROM, duplicate_findings
from thermo_pp.audit.modes import mode_findings
from thermo_pp.audit.printed import own_values, printed_findings
from thermo_pp.audit.state import state_findings
from thermo_pp.audit.structures import structures
from thermo_pp.audit.survey import survey, worst
from thermo_pp.audit.symmetry import symmetry_findings
from thermo_pp.collect import Collection
from thermo_pp.conditions import Treatment
from thermo_pp.data.elements import ISOTOPES, MOST_ABUNDANT, NUMBERS, SYMBOLS
from thermo_pp.errors import Finding
from thermo_pp.formulas.partition import translation
from thermo_pp.readers import nwchem, psi4
from thermo_pp.records import Calculation, Printed

FIXTURES = Path(__file__).parents[1] / "fixtures"
PSI4 = FIXTURES / "psi4" / "good"
WATER = np.array([[0.0, 0.0, 0.117], [0.0, 0.757, -0.471], [0.0, -0.757, -0.471]])
PEROXIDE = np.array(  # H2O2, C2, dihedral angle of about 112 degrees: chiral
    [[0.0, 0.73, -0.05], [0.0, -0.73, -0.05], [0.79, 0.88, 0.41], [-0.79, -0.88, 0.41]]
)


def calculation(symbols: str = "O H H", positions: Any = WATER, **fields: Any) -> Calculation:
    numbers = np.array([NUMBERS[symbol] for symbol in symbols.split()])
    known: dict[str, Any] = {
        "path": "a.out",
        "sha256": "0" * 64,
        "program": "none",
        "masses_u": [ISOTOPES[SYMBOLS[z]][MOST_ABUNDANT[z]] for z in numbers],
        "masses_origin": "derived",
        "method": "B3LYP",
        "basis": "def2-SVP",
        "charge": 0,
        "multiplicity": 1,
        "energy_hartree": -76.0,
    }
    return Calculation(numbers=numbers, positions_angstrom=np.asarray(positions), **known | fields)


def codes(findings: tuple[Finding, ...]) -> list[str]:
    return [finding.code for finding in findings]


# -- one calculation: modes


@pytest.mark.parametrize(
    ("symbols", "positions", "modes", "expected"),
    [
        ("O H H", WATER, [1600.0, 3700.0, 3800.0], []),
        ("O H H", WATER, [1600.0, 3700.0], ["mode-count"]),
        ("O H H", WATER, [500.0, 1600.0, 3700.0, 3800.0], ["mode-count"]),
        ("C O O", [[0, 0, 0], [0, 0, 1.16], [0, 0, -1.16]], [667.0, 667.0, 1333.0, 2349.0], []),
        ("C O O", [[0, 0, 0], [0, 0, 1.16], [0, 0, -1.16]], [667.0, 1333.0, 2349.0], ["mode-count"]),
        ("C O O", [[0.1, 0, 0], [0, 0, 1.16], [0, 0, -1.16]], [667.0, 1333.0, 2349.0], ["nearly-linear"]),
        ("C O O", [[0.1, 0, 0], [0, 0, 1.16], [0, 0, -1.16]], [667.0, 667.0, 1333.0, 2349.0], ["mode-count"]),
        ("O", [[0, 0, 0]], [], []),
        ("O", [[0, 0, 0]], [100.0], ["mode-count"]),
        ("O H", [[0, 0, 0], [0, 0, 0.97]], [3700.0], []),
    ],
)  # fmt: skip
def test_mode_count(symbols: str, positions: Any, modes: list[float], expected: list[str]) -> None:
    found = mode_findings(calculation(symbols, positions, wavenumbers_cm=modes))
    assert codes(found) == expected


def test_a_calculation_without_modes_has_no_mode_findings() -> None:
    assert mode_findings(calculation()) == ()


@pytest.mark.parametrize(
    ("modes", "expected", "severity"),
    [
        ([-500.0, 1600.0, 3700.0], [], None),
        ([-500.0, -30.0, 3700.0], ["imaginary-modes"], "warning"),
        ([-12.0, 1600.0, 3700.0], ["small-imaginary-mode"], "warning"),
        ([20.0, 1600.0, 3700.0], ["soft-modes"], "note"),
        ([10.0, 30.0, 3700.0], ["soft-modes"], "warning"),
        ([50.1, 1600.0, 3700.0], [], None),
    ],
)
def test_imaginary_and_soft_modes(
    modes: list[float], expected: list[str], severity: str | None
) -> None:
    found = mode_findings(calculation(wavenumbers_cm=modes, where={"wavenumbers_cm": 7}))
    assert codes(found) == expected
    for finding in found:
        assert finding.severity == severity
        assert (finding.file, finding.line) == ("a.out", 7)
        assert finding.mend


def test_imaginary_modes_are_named() -> None:
    (finding,) = mode_findings(calculation(wavenumbers_cm=[-500.04, -30.0, 3700.0]))
    assert "2 imaginary modes (500.0i, 30.0i cm^-1)" in finding.what


# -- one calculation: convergence, charge and multiplicity


@pytest.mark.parametrize(
    ("fields", "expected"),
    [
        ({}, []),
        ({"optimised": True}, []),
        ({"optimised": None}, []),
        ({"optimised": False}, ["optimisation-not-converged"]),
        ({"energy_hartree": None}, ["no-energy"]),
        ({"multiplicity": 3}, []),
        ({"multiplicity": 2}, ["impossible-multiplicity"]),
        ({"multiplicity": 2, "charge": 1}, []),
        ({"multiplicity": 1, "charge": -1}, ["impossible-multiplicity"]),
        ({"multiplicity": 13}, ["impossible-multiplicity"]),
        ({"multiplicity": 11}, []),
        ({"multiplicity": None}, []),
        ({"charge": None, "multiplicity": 2}, []),
        ({"charge": 11}, ["impossible-charge"]),
    ],
)
def test_state(fields: dict[str, Any], expected: list[str]) -> None:
    assert codes(state_findings(calculation(**fields))) == expected


def test_what_the_reader_said_is_not_said_twice() -> None:
    said = Finding("optimisation-not-converged", "warning", "a.out", 3, "what", "mend")
    assert state_findings(calculation(optimised=False, findings=(said,))) == ()


# -- one calculation: the program's own thermochemistry


def psi4_jobs() -> list[Path]:
    return [path for path in sorted(PSI4.glob("*.out")) if "freq" in path.name]


def nwchem_jobs() -> list[Path]:
    plume = FIXTURES / "stack-plume" / "outputs"
    found = [*(FIXTURES / "nwchem" / "good").glob("*freq*.out"), *plume.glob("*.out")]
    return [path for path in sorted(found) if "_" not in path.stem or "freq" in path.stem]


@pytest.mark.parametrize("path", nwchem_jobs(), ids=lambda path: path.stem)
def test_nwchem_prints_what_we_compute_with_its_constants(path: Path) -> None:
    found = tp.read(path)
    assert found.printed, "no printed thermochemistry: choose other fixtures"
    values = own_values(found, nwchem.PRINTED_CONSTANTS)
    assert {"zero_point", "entropy", "translational_entropy", "heat_capacity_v"} <= set(values)
    differs = "printed-differs" in codes(printed_findings(found))
    assert differs == (path.stem in PROGRAM_IS_WRONG)


PROGRAM_IS_WRONG = ("water_hf_freq_mass_list",)
"""NWChem 7.0.2 takes masses of the freq block for the modes only, not for translation and rotation."""


def test_an_altered_digit_of_nwchem_is_found() -> None:
    found = tp.read(FIXTURES / "stack-plume" / "outputs" / "so3-water2.out")
    assert "printed-differs" not in codes(printed_findings(found))
    for name in ("zero_point", "thermal_enthalpy", "entropy", "rotational_entropy"):
        old = found.printed[name]
        new = replace(old, text=f"{old.value + 3 * old.step:.3f}")
        altered = replace(found, printed={**found.printed, name: new})
        (finding,) = [each for each in printed_findings(altered) if each.code == "printed-differs"]
        assert finding.line == old.line


def test_nwchem_constants_matter() -> None:
    """With CODATA 2022 the zero-point energy is 4.8e-4 larger, and S of translation is larger too."""
    found = tp.read(FIXTURES / "stack-plume" / "outputs" / "so3.out")
    today = {name: getattr(units, name) for name in psi4.PRINTED_CONSTANTS} | {
        "PRESSURE_PA": 101325.0
    }
    theirs, ours = own_values(found, nwchem.PRINTED_CONSTANTS), own_values(found, today)
    ratio = ours["zero_point"][0].value / theirs["zero_point"][0].value
    assert ratio - 1.0 == pytest.approx(4.8e-4, abs=1e-5)  # checks.md, pitfall 12
    shift = ours["translational_entropy"][0].value - theirs["translational_entropy"][0].value
    assert 0.02 < shift < 0.2
    same = translation(298.15, float(found.masses_u.sum())).entropy_j_mol_k - 0.109443  # 1 atm
    assert ours["translational_entropy"][0].value == pytest.approx(float(same), abs=1e-5)


@pytest.mark.parametrize("path", psi4_jobs(), ids=lambda path: path.stem)
def test_psi4_prints_what_we_compute(path: Path) -> None:
    found = tp.read(path)
    assert found.printed
    assert "printed-differs" not in codes(printed_findings(found))


def test_own_values_reach_the_printed_digits() -> None:
    """H, S and their parts of Psi4 1.3.2 (its own printout), to half a step of the last digit."""
    found = tp.read(PSI4 / "water_hf_opt_freq.out")
    ours = own_values(found, psi4.PRINTED_CONSTANTS)
    eh = psi4.PRINTED_CONSTANTS["HARTREE_J"] * psi4.PRINTED_CONSTANTS["AVOGADRO_MOL"]
    for name, printed in found.printed.items():
        if name in ("temperature", "pressure", "symmetry_number"):
            continue
        value = ours[name][0].value / (eh if printed.unit == "Eh" else 1.0)
        assert value == pytest.approx(printed.value, abs=0.55 * printed.step), name


@pytest.mark.parametrize("name", ["zero_point", "thermal_enthalpy", "entropy", "rotational_entropy",
                                  "vibrational_entropy", "heat_capacity_v", "enthalpy", "gibbs"])  # fmt: skip
@pytest.mark.parametrize("sign", [1, -1])
def test_an_altered_digit_is_found(name: str, sign: int) -> None:
    found = tp.read(PSI4 / "water_hf_opt_freq.out")
    printed = found.printed[name]
    decimals = len(printed.text.partition(".")[2])
    text = f"{printed.value + sign * 3 * printed.step:.{decimals}f}"
    altered = replace(found, printed={**found.printed, name: replace(printed, text=text)})
    (finding,) = [each for each in printed_findings(altered) if each.code == "printed-differs"]
    assert finding.severity == "error"
    assert finding.line == printed.line
    assert text in finding.what


def test_an_altered_wavenumber_is_found_in_the_file(tmp_path: Path) -> None:
    text = (PSI4 / "water_hf_opt_freq.out").read_text()
    match = list(re.finditer(r"Freq \[cm\^-1\] +(\d)", text))[-1]
    digit = str((int(match.group(1)) + 1) % 10 or 1)
    copy = tmp_path / "copy.out"
    copy.write_text(text[: match.start(1)] + digit + text[match.end(1) :])
    outcome = read_and_audit(copy)
    assert outcome.error is not None or "printed-differs" in codes(outcome.findings)


def test_nothing_is_compared_where_the_constants_are_not_known() -> None:
    found = tp.read(PSI4 / "water_hf_opt_freq.out")
    wrong = replace(found.printed["zero_point"], text="1.0")
    altered = replace(found, program="another", printed={"zero_point": wrong})
    assert printed_findings(altered) == ()


@pytest.mark.parametrize(("printed", "severity"), [("2", None), ("1", "note"), ("4", "warning")])
def test_symmetry_number(printed: str, severity: str | None) -> None:
    found = symmetry_findings(calculation(printed={"symmetry_number": Printed(printed, "", 9)}))
    assert [(each.code, each.severity, each.line) for each in found] == (
        [] if severity is None else [("symmetry-differs", severity, 9)]
    )


# -- calculations side by side: duplicates


def turned(positions: np.ndarray, seed: int = 1) -> np.ndarray:
    rotation = np.linalg.qr(np.random.default_rng(seed).normal(size=(3, 3)))[0]
    if np.linalg.det(rotation) < 0:
        rotation[0] *= -1
    return positions @ rotation.T + [1.0, -2.0, 0.5]


def pair(other: np.ndarray, symbols: str = "O O H H", **fields: Any) -> tuple[Finding, ...]:
    first = calculation(symbols.replace("?", ""), PEROXIDE, path="1.out", sha256="1" * 64)
    again = calculation(symbols, other, path="2.out", sha256="2" * 64, **fields)
    return duplicate_findings((first, again))


def test_same_structure_turned_and_numbered_otherwise() -> None:
    found = pair(turned(PEROXIDE)[[1, 0, 2, 3]])
    assert codes(found) == ["duplicate-structure"]
    assert found[0].file == "2.out"
    assert "1.out" in found[0].what


def test_mirror_image_is_told_apart() -> None:
    assert codes(pair(turned(PEROXIDE * [-1.0, 1.0, 1.0]))) == ["mirror-image"]


def test_mirror_image_of_an_achiral_structure_is_the_structure() -> None:
    first = calculation(path="1.out", sha256="1" * 64)
    again = calculation(positions=turned(WATER * [1.0, -1.0, 1.0]), path="2.out", sha256="2" * 64)
    assert codes(duplicate_findings((first, again))) == ["duplicate-structure"]


@pytest.mark.parametrize(
    "fields",
    [
        {"basis": "def2-TZVP"},
        {"method": "PBE0"},
        {"charge": 2},
        {"multiplicity": 3},
        {"energy_hartree": -76.001},
        {"solvent": "water"},
        {"wavenumbers_cm": [300.0, 800.0, 1300.0, 1400.0, 3700.0, 3800.0]},
        {"masses_u": [15.995, 15.995, 2.014, 1.008]},
    ],
)
def test_not_the_same(fields: dict[str, Any]) -> None:
    assert pair(turned(PEROXIDE), **fields) == ()


def test_another_conformer_is_not_the_same() -> None:
    other = PEROXIDE.copy()
    other[2:, 0] *= 0.3
    assert pair(turned(other)) == ()


def test_noise_below_the_tolerance_does_not_hide_a_duplicate() -> None:
    noise = np.random.default_rng(3).normal(scale=0.2 * SAME_ANGSTROM, size=PEROXIDE.shape)
    assert codes(pair(turned(PEROXIDE + noise))) == ["duplicate-structure"]


def test_same_bytes() -> None:
    first = calculation(path="1.out")
    again = calculation(path="2.out")
    (finding,) = duplicate_findings((first, again))
    assert "byte for byte" in finding.what


def test_third_copy_is_found_too() -> None:
    three = tuple(calculation(path=f"{k}.out", sha256=str(k) * 64) for k in range(3))
    assert [finding.file for finding in duplicate_findings(three)] == ["1.out", "2.out"]


# -- files and folders


@pytest.mark.parametrize(
    ("name", "content", "reason"),
    [
        ("note.out", b"remember to rerun this\n", UNCLAIMED),
        ("empty.out", b"", EMPTY),
        ("x.out", b"\x7fELF\x02\x00\x00", BINARY),
        ("other.out", b"Some Unknown Program 1.0\nenergy -1.0\n", UNCLAIMED),
    ],
)
def test_what_is_no_output_is_left_out(
    tmp_path: Path, name: str, content: bytes, reason: str
) -> None:
    path = tmp_path / name
    path.write_bytes(content)
    outcome = read_and_audit(path)
    assert (outcome.skipped, outcome.calculation, outcome.error) == (reason, None, None)


def test_truncated_output_is_an_error_with_its_line(tmp_path: Path) -> None:
    data = (PSI4 / "water_hf_opt_freq.out").read_bytes()
    path = tmp_path / "cut.out"
    path.write_bytes(data[: len(data) // 2])
    outcome = read_and_audit(path)
    assert outcome.reader == "psi4"
    assert outcome.error is not None
    assert re.fullmatch(rf"{re.escape(str(path))}:\d+", outcome.error.where)


def test_public_collect_takes_str_and_path() -> None:
    path = PSI4 / "water_hf_energy.out"
    for given in (str(path), path, [path]):
        found = tp.collect(given)
        assert [each.path for each in found] == [str(path)]


def test_survey_lists_every_claimed_file(tmp_path: Path) -> None:
    good = (PSI4 / "water_hf_energy.out").read_bytes()
    (tmp_path / "a.out").write_bytes(good)
    (tmp_path / "b.out").write_bytes(good[: len(good) // 2])
    (tmp_path / "c.txt").write_text("a note")
    found = survey(tp.collect(tmp_path))
    assert [Path(file.path).name for file in found.files] == ["a.out", "b.out"]
    assert [file.verdict for file in found.files] == ["ok", "error"]
    assert found.files[1].program is None
    assert found.files[1].reader == "psi4"
    assert found.readable == 1
    assert [each.reason for each in found.skipped] == [UNCLAIMED]
    (finding,) = [each for each in found.findings if each.code == "unreadable"]
    assert finding.file == str(tmp_path / "b.out")
    assert finding.line is not None


def test_worst() -> None:
    def made(severity: Any) -> Finding:
        return Finding("x", severity, None, None, "what", "mend")

    assert worst([]) == "ok"
    assert worst([made("note")]) == "note"
    assert worst([made("warning"), made("error"), made("note")]) == "error"


# -- H, S and G of a collection


def collection(*calculations: Calculation) -> Collection:
    return Collection(calculations, ())


def test_structures_go_on_past_what_cannot_be_computed() -> None:
    good = calculation(path="x/good.out", wavenumbers_cm=[1600.0, 3700.0, 3800.0])
    two = calculation(path="x/two.out", wavenumbers_cm=[-500.0, -100.0, 3800.0])
    single = calculation(path="x/single.out")
    atom = calculation("O", [[0, 0, 0]], path="x/atom.out", multiplicity=3)
    found = structures(collection(good, two, single, atom), [298.15, 400.0], Treatment())
    assert [each.name for each in found.computed] == ["good", "atom"]
    assert found.computed[0].result.gibbs_kj_mol.shape == (2,)
    assert found.computed[0].low_mode_spread_kj_mol.shape == (2,)
    by_code = {finding.code: finding for finding in found.findings}
    assert by_code["not-computed"].file == "x/two.out"
    assert by_code["not-computed"].severity == "error"
    assert by_code["no-frequencies"].file == "x/single.out"


def test_one_imaginary_mode_is_a_saddle_point() -> None:
    found = structures(
        collection(calculation(wavenumbers_cm=[-500.0, 1600.0, 3800.0])), [298.15], Treatment()
    )
    assert found.computed[0].model.kind == "saddle"
    assert "taken-as-saddle" in codes(found.findings)


def test_names_are_paths_where_file_names_repeat() -> None:
    modes = [1600.0, 3700.0, 3800.0]
    two = [calculation(path=f"{folder}/ts.out", wavenumbers_cm=modes) for folder in "ab"]
    found = structures(collection(*two), [298.15], Treatment())
    assert [each.name for each in found.computed] == ["a/ts.out", "b/ts.out"]


def test_a_finding_of_audit_and_structure_is_said_once() -> None:
    printed = {"symmetry_number": Printed("1", "", 9)}
    one = calculation(wavenumbers_cm=[1600.0, 3700.0, 3800.0], printed=printed)
    both = Collection((one,), audit_alone(one))
    found = structures(both, [298.15], Treatment())
    assert codes(found.findings).count("symmetry-differs") == 1
