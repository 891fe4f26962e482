"""Named levels of theory of a study, its composite energies, and scale factors beside their level."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner
from declared_study import TEXT, edited, load

import thermo_pp as tp
from thermo_pp.audit.scaling import scale_findings, scale_words
from thermo_pp.cli import main
from thermo_pp.conditions import Treatment
from thermo_pp.errors import StudyError
from thermo_pp.study.load import Study
from thermo_pp.units import HARTREE_KJ_MOL

PLUME = Path(__file__).parent.parent / "fixtures" / "stack-plume"
COMPOSITE = PLUME / "study-composite.toml"

# kJ/mol, by hand from the digits that the outputs print: TS2 less SO3 less twice W
SADDLE_LEVELS = {
    "MP2/aug-cc-pV(T+d)Z": ("ts-assisted_mp2.out", "so3_mp2.out", "water_mp2.out"),
    "CCSD(T)/cc-pV(D+d)Z": ("ts-assisted_ccsdt.out", "so3_ccsdt.out", "water_ccsdt.out"),
}


@pytest.fixture(scope="module")
def study() -> Study:
    return Study.load(PLUME / "study.toml", temperatures=[298.15])


@pytest.fixture(scope="module")
def composite() -> Study:
    return Study.load(COMPOSITE, temperatures=[298.15])


def saddle_kj_mol(study: Study) -> float:
    """Electronic energy of the assisted saddle point over SO3 + 2 W."""
    e = {name: energy.value_hartree for name, energy in study.energies.items()}
    return (e["TS2"] - e["SO3"] - 2.0 * e["W"]) * HARTREE_KJ_MOL


def test_the_levels_of_the_bundled_study(study: Study) -> None:
    assert study.level is None
    assert study.level_names == (
        "MP2/aug-cc-pV(T+d)Z",
        "MP2/aug-cc-pV(Q+d)Z",
        "CCSD(T)/cc-pV(D+d)Z",
        "composite",
    )


@pytest.mark.parametrize("level", SADDLE_LEVELS)
def test_a_level_has_the_energies_of_its_files(study: Study, level: str) -> None:
    other = study.at_level(level)
    assert other.level == level
    saddle, so3, water = (
        float(tp.read(PLUME / "outputs" / name).energy_hartree or 0.0)
        for name in SADDLE_LEVELS[level]
    )
    by_hand = (saddle - so3 - 2.0 * water) * HARTREE_KJ_MOL
    assert saddle_kj_mol(other) == pytest.approx(by_hand, abs=1e-9, rel=0.0)
    assert not [finding for finding in other.findings if finding.severity == "error"]


def test_the_composite_of_the_bundled_study(study: Study) -> None:
    other = study.at_level("composite")
    # hartree, by hand from the digits printed in the three files of each species
    by_hand = {
        "SO3": -623.1635586300714067 + (-622.760072017760 - -622.741904446359),
        "W": -76.3518049401679093 + (-76.241106497724 - -76.228313784759),
        "C1": -699.5302713491436180 + (-699.018641872598 - -698.988256876476),
    }
    for name, value in by_hand.items():
        assert other.energies[name].value_hartree == pytest.approx(value, abs=1e-11, rel=0.0)
        assert other.species[name].at(298.15).electronic_kj_mol == pytest.approx(
            value * HARTREE_KJ_MOL, abs=1e-7, rel=0.0
        )
    assert other.levels[0] == (
        "Energies: MP2/AUG-CC-PV(Q+D)Z + CCSD(T)/CC-PV(D+D)Z \N{MINUS SIGN} MP2/CC-PV(D+D)Z, "
        "frozen core."
    )


def test_a_level_changes_energies_alone(study: Study) -> None:
    other = study.at_level("MP2/aug-cc-pV(Q+d)Z")
    for name, model in study.species.items():
        mine, its = model.at([280.0, 360.0]), other.species[name].at([280.0, 360.0])
        assert its.electronic_kj_mol != mine.electronic_kj_mol
        shift = (its.electronic_kj_mol or 0.0) - (mine.electronic_kj_mol or 0.0)
        assert its.gibbs_kj_mol - mine.gibbs_kj_mol == pytest.approx(shift, abs=1e-8)
    assert other.conditions == study.conditions
    assert other.treatment == study.treatment


def test_options_stay_at_another_level() -> None:
    loaded = Study.load(
        PLUME / "study.toml", temperatures=iter([300.0]), treatment={"low_modes": "harmonic"}
    )
    other = loaded.at_level("composite")
    assert other.conditions.temperature_k == (300.0,)
    assert other.treatment.low_modes == "harmonic"
    assert Study.load(PLUME / "study.toml", level="composite").level == "composite"


def test_the_study_of_composite_energies(composite: Study) -> None:
    study = composite
    assert study.level == "composite/CBS"
    # with 30 digits from the printed ones: limits of HF and MP2 correlation, and the correction
    assert study.energies["SO3"].value_hartree == pytest.approx(
        -623.232078207149524, abs=1e-11, rel=0.0
    )
    assert [part.slot for part in study.energies["SO3"].parts] == [
        "sum.1", "sum.2", "extrapolate.reference", "extrapolate.correlation",
    ]  # fmt: skip
    assert not [finding for finding in study.findings if finding.severity == "error"]
    large = study.at_level("composite")
    # the limit moves the saddle point by little: most of the basis set's error cancels
    assert 0.1 < abs(saddle_kj_mol(study) - saddle_kj_mol(large)) < 10.0


def rows_of_the_docs() -> list[tuple[str, list[str]]]:
    page = (PLUME.parent.parent / "docs" / "stack-plume.md").read_text(encoding="utf-8")
    table = page[page.index("| level |") :].split("\n\n")[0].splitlines()[2:]
    cells = [[cell.strip() for cell in line.strip("|").split("|")] for line in table]
    return [(row[0], row[1:]) for row in cells]


@pytest.mark.parametrize(("level", "cells"), rows_of_the_docs(), ids=str)
def test_the_table_of_the_docs(
    study: Study, composite: Study, level: str, cells: list[str]
) -> None:
    other = composite if level == "composite/CBS" else study.at_level(level)
    rate = other.effective().rates["pool"]
    e = {name: energy.value_hartree for name, energy in other.energies.items()}
    complex_kj_mol = (e["C1"] - e["SO3"] - e["W"]) * HARTREE_KJ_MOL
    assert [f"{saddle_kj_mol(other):.2f}", f"{complex_kj_mol:.2f}"] == cells[:2]
    assert float(rate.rate_constant[0]) == pytest.approx(float(cells[2]), rel=2e-3)
    assert f"{rate.arrhenius_energy_kj_mol[0]:.2f}" == cells[3]


# --- what is refused


def plume(tmp_path: Path, *changes: tuple[str, str]) -> Path:
    text = (PLUME / "study.toml").read_text(encoding="utf-8")
    for old, new in (('outputs = "outputs"', f'outputs = "{PLUME / "outputs"}"'), *changes):
        assert old in text
        text = text.replace(old, new)
    path = tmp_path / "study.toml"
    path.write_text(text, encoding="utf-8")
    return path


LEVEL = "[levels.composite]                    # MP2"


@pytest.mark.parametrize(
    ("new", "what", "where"),
    [
        (
            '[levels.x]\nenergies = { SO3 = "so3.out" }',
            "the level 'x' has no energy for W, W2, C1, C2, acid, TS1, TS2",
            "[levels.x]",
        ),
        (
            '[levels.x]\nenergy = "{frequencies}.out"\nenergies = { SO4 = "so3.out" }',
            "unknown species 'SO4'",
            "[levels.x] energies.SO4",
        ),
        ("[levels.x]", "the level 'x' has no energy for SO3, W", "[levels.x]"),
    ],
)
def test_a_level_without_every_species(tmp_path: Path, new: str, what: str, where: str) -> None:
    path = plume(tmp_path, (LEVEL, f"{new}\n{LEVEL}"))
    with pytest.raises(StudyError) as caught:
        Study.load(path)
    assert what in caught.value.what
    assert caught.value.where == f"{path} {where}"


def test_an_unknown_placeholder(tmp_path: Path) -> None:
    path = plume(tmp_path, ('"{frequencies}_ccsdt.out"\n[', '"{name}_ccsdt.out"\n['))
    with pytest.raises(StudyError, match=r"unknown placeholder '\{name\}'"):
        Study.load(path).at_level("CCSD(T)/cc-pV(D+d)Z")


def test_an_unknown_level(study: Study, tmp_path: Path) -> None:
    with pytest.raises(StudyError, match="there is no level 'composit'") as caught:
        study.at_level("composit")
    assert "composite" in caught.value.mend
    with pytest.raises(StudyError, match="there is no level 'high'") as caught:
        load(tmp_path, edited(('title = "Loss', 'level = "high"\ntitle = "Loss')))
    assert caught.value.where.endswith("study.toml level")


def test_a_level_in_use_beside_energies_of_species(tmp_path: Path) -> None:
    path = plume(tmp_path, ("outputs =", 'level = "composite"\noutputs ='))
    with pytest.raises(StudyError, match="SO3 has an energy of its own beside level"):
        Study.load(path)


def test_a_declared_species_has_no_energy_at_a_level(tmp_path: Path) -> None:
    text = TEXT + '[levels.high]\nenergies = { A = "a.out" }\n'
    with pytest.raises(StudyError, match="'A' is declared: it has no energy"):
        load(tmp_path, text)


def test_one_species_at_another_level_is_an_error_finding(tmp_path: Path) -> None:
    path = plume(
        tmp_path,
        (LEVEL, f'[levels.x]\nenergy = "{{frequencies}}_mp2.out"\n'
         f'energies = {{ W = "water_ccsdt.out" }}\n{LEVEL}'),
    )  # fmt: skip
    codes = {f.code for f in Study.load(path, level="x").findings if f.severity == "error"}
    assert codes == {"mixed-level"}


def test_one_species_of_another_recipe_is_an_error_finding(tmp_path: Path) -> None:
    path = plume(
        tmp_path, ('energy = "water_mp2.out"', 'energy = { sum = [{ file = "water_mp2.out" }] }')
    )
    found = [f for f in Study.load(path).findings if f.severity == "error"]
    assert [finding.code for finding in found] == ["mixed-recipe"]
    assert "sum.1 for W" in found[0].what


# --- solvation in a study


def in_solution(tmp_path: Path, solvation: str, treatment: str = "") -> Study:
    def term(species: str) -> str:
        return f'energy = {{ sum = [{{ file = "{species}_mp2.out" }}], solvation = {solvation} }}'

    stems = ("so3", "water", "water-dimer", "so3-water", "so3-water2", "h2so4", "ts-unassisted",
             "ts-assisted")  # fmt: skip
    return Study.load(
        plume(
            tmp_path,
            ('phase = "gas"', f'phase = "solution"\n{treatment}'),
            (
                'barrier = "none"',
                'barrier = "none"\nviscosity = [["280 K", 1e-3], ["360 K", 4e-4]]',
            ),
            *((f'energy = "{stem}_mp2.out"', term(stem)) for stem in stems),
        )
    )


def test_solvation_terms_of_a_study(tmp_path: Path) -> None:
    study = in_solution(tmp_path, '{ value = "-20 kJ/mol", gas_state = "1 mol/L" }')
    codes = [finding.code for finding in study.findings]
    assert codes.count("solvation-derivative") == 1
    assert codes.count("solvation-state") == 1
    gas = Study.load(PLUME / "study.toml")
    for name, model in study.species.items():
        shift = model.at(300.0).gibbs_kj_mol - gas.species[name].at(300.0).gibbs_kj_mol
        assert float(shift[0]) == pytest.approx(-20.0, abs=1e-8)


def test_a_slope_and_a_molar_standard_state_leave_nothing_to_say(tmp_path: Path) -> None:
    term = '{ value = "-20 kJ/mol", gas_state = "1 mol/L", slope = "50 J/mol/K" }'
    path = in_solution(tmp_path, term).path
    text = path.read_text(encoding="utf-8").replace('"1 bar"', '"1 mol/L"')
    path.write_text(text, encoding="utf-8")
    study = Study.load(path)
    assert not {"solvation-derivative", "solvation-state"} & {f.code for f in study.findings}
    assert study.energies["W"].solvation_slope_j_mol_k == 50.0


def test_an_entropy_correction_is_listed(tmp_path: Path) -> None:
    term = '{ value = "-20 kJ/mol", gas_state = "1 mol/L", slope = 0 }'
    study = in_solution(tmp_path, term, 'entropy_correction = "-15 J/mol/K"')
    parts = study.species["W"].at(300.0).parts().set_index("part")
    assert parts.loc["entropy correction", "entropy_j_mol_k"] == -15.0
    assert parts.loc["entropy correction", "treated_as"] == "declared"
    result = CliRunner().invoke(main, ["profile", str(study.path), "-T", "300", "--quiet"])
    assert result.exit_code == 0
    assert "-15 J mol⁻¹ K⁻¹ added to every entropy, as declared" in " ".join(result.stdout.split())
    with pytest.raises(StudyError, match="an entropy correction in the gas phase"):
        Study.load(plume(tmp_path, ("onset = ", "entropy_correction = -15\nonset = ")))


# --- what is shown


def test_every_part_has_its_column_and_its_origin() -> None:
    command = [
        "profile",
        str(PLUME / "study.toml"),
        "-T",
        "298.15",
        "--level",
        "composite",
        "--quiet",
    ]
    shown = CliRunner().invoke(main, [*command, "--format", "markdown"]).stdout
    heading = next(line for line in shown.splitlines() if line.startswith("| Species"))
    cells = [cell.strip() for cell in heading.strip("| \n").split("|")]
    assert len(cells) == 5
    row = next(line for line in shown.splitlines() if line.startswith("| SO3 "))
    assert [cell.strip() for cell in row.strip("| \n").split("|")] == [
        "SO3", "-623.163559", "-622.760072", "622.741904", "-623.181726",
    ]  # fmt: skip
    answer = json.loads(CliRunner().invoke(main, [*command, "--format", "json"]).stdout)
    so3 = next(one for one in answer["energies"] if one["species"] == "SO3")
    assert so3["energy_hartree"] == pytest.approx(-623.1817262014724, abs=1e-11, rel=0.0)
    last = so3["parts"][2]
    assert (last["factor"], last["origin"], last["value_hartree"]) == (
        -1.0,
        "printed",
        -622.741904446359,
    )
    assert [Path(place["file"]).name for place in last["where"]] == ["so3_ccsdt.out"]
    assert [place["line"] for place in last["where"]] == [383]


# --- scale factors


def frequencies(name: str = "water.out", **changes: Any) -> tp.Calculation:
    import dataclasses

    return dataclasses.replace(tp.read(PLUME / "outputs" / name), **changes)


def test_a_scale_factor_stands_beside_its_level(tmp_path: Path) -> None:
    path = plume(tmp_path, ("onset =", "frequency_scale = 0.98\nzero_point_scale = 0.985\nonset ="))
    study = Study.load(path)
    words = (
        "Scale factors 0.98 in thermal terms and 0.985 in zero-point energies, applied to "
        "B3LYP/def2-svpd, integration grid fine"
    )
    assert study.levels[-1] == f"{words}."
    found = [finding for finding in study.findings if finding.code == "scale-factor"]
    assert [(finding.severity, finding.what) for finding in found] == [("note", words)]
    assert not [f for f in Study.load(PLUME / "study.toml").findings if "scale" in f.code]


def test_one_factor_for_two_levels_is_a_warning() -> None:
    treatment = Treatment(frequency_scale=0.96)
    jobs = [frequencies(), frequencies(path="b.out", basis="6-31G(d)")]
    found = scale_findings(treatment, jobs, "study.toml")
    assert [(finding.code, finding.severity) for finding in found] == [
        ("scale-factor", "note"),
        ("scale-factor-levels", "warning"),
    ]
    assert "of 2 levels" in found[1].what


def test_a_published_factor_is_told_where_its_source_was_seen() -> None:
    job = frequencies(method="HF", basis="6-31G*")
    found = scale_findings(Treatment(frequency_scale=0.9, zero_point_scale=0.9), [job], None)
    # Irikura, Johnson, Kacker, J. Phys. Chem. A 2005, 109, 8430, abstract
    assert "fundamentals: 0.8982 ± 0.023" in found[0].what
    assert scale_words(Treatment(), [job]) is None
