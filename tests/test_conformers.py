"""Conformers of studies, folders and files: n-pentane against published values, and every way in."""

from __future__ import annotations

import csv
import io
import json
import shutil
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from click.testing import CliRunner, Result
from test_ensemble import COLUMNS, SKEW, peroxide

import thermo_pp as tp
from thermo_pp.cli import main
from thermo_pp.ensemble import Ensemble
from thermo_pp.errors import StudyError
from thermo_pp.names import FORMATS, LOW_MODES
from thermo_pp.records import Calculation
from thermo_pp.study.conformers import StudyConformers, conformers_of
from thermo_pp.units import CALORIE_J

PENTANE = Path(__file__).parents[1] / "fixtures" / "n-pentane"
STUDY = PENTANE / "study.toml"
TSS = '[conditions]\ntemperatures = ["25 degC"]\n'


def run(*arguments: str, status: int = 0) -> Result:
    result = CliRunner().invoke(main, ["conformers", *arguments], prog_name="thermo-pp")
    assert result.exit_code == status, (result.stdout, result.stderr, result.exception)
    assert result.exception is None or isinstance(result.exception, SystemExit)
    return result


def answer(*arguments: str) -> dict[str, Any]:
    read = json.loads(run(*arguments, "--format", "json").stdout)
    assert isinstance(read, dict)
    return read


def ensemble(low_modes: str = "rotor-entropy") -> Ensemble:
    return conformers_of(STUDY, treatment={"low_modes": low_modes}).ensembles[0]


# n-pentane, computed with GFN2-xTB frequencies and MP2/cc-pVTZ energies; nothing was adjusted ------


def test_n_pentane_against_published_values() -> None:
    """Side by side; the tolerances say how near such a level comes, they are not the sources'."""
    found = ensemble()
    enthalpies = [member.model.at([298.15]).enthalpy_kj_mol[0] for member in found.members]
    above = [1000.0 * (h - enthalpies[0]) / (1000.0 * CALORIE_J) * 1000.0 for h in enthalpies]
    # enthalpy above trans-trans, gas, Raman: tg 618 +- 6, gg 940 +- 20 cal/mol (Balabin, J. Phys.
    # Chem. A 2009, 113, 1012; these two numbers from memory)
    assert above[1] == pytest.approx(618.0, abs=60.0)
    assert above[2] == pytest.approx(940.0, abs=60.0)
    # S(298.15 K, ideal gas, 1 bar) 349 J/(mol K) to about 1: 83.4 cal/(mol K) in the usual tables,
    # from memory
    for low_modes in LOW_MODES:
        whole = ensemble(low_modes).at([298.15]).entropy_j_mol_k[0]
        assert whole == pytest.approx(349.0, abs=5.0), low_modes
        alone = found.members[0].model.at([298.15], low_modes=low_modes).entropy_j_mol_k[0]
        assert alone < 335.0, low_modes  # the lowest conformer alone misses 14 and more


def test_n_pentane_as_it_was_computed() -> None:
    found = ensemble()
    assert [member.degeneracy for member in found.members] == [1, 2, 2, 2]
    assert [member.model.symmetry_number for member in found.members] == [2, 1, 2, 1]  # type: ignore[attr-defined]
    shares = found.computed([298.15])[1].population[:, 0]
    energies = [m.model.energy_hartree for m in found.members]  # type: ignore[attr-defined]
    assert 2625.4996 * (np.array(energies) - energies[0]) == pytest.approx(
        [0.0, 2.3187, 3.6457, 11.8723], abs=5e-3
    )
    assert shares == pytest.approx([0.3906, 0.4987, 0.1040, 0.0067], abs=2e-4)


def test_docs_have_these_numbers() -> None:
    page = (PENTANE.parents[1] / "docs" / "conformers.md").read_text(encoding="utf-8")
    for low_modes in LOW_MODES:
        found = ensemble(low_modes)
        at = found.at([298.15])
        alone = found.members[0].model.at([298.15], low_modes=low_modes)
        row = (
            f"| `{low_modes}` | {at.entropy_j_mol_k[0]:.1f} | {alone.entropy_j_mol_k[0]:.1f} | "
            f"{at.heat_capacity_j_mol_k[0]:.1f} |"
        )
        assert row in page, row


# a study ------------------------------------------------------------------------------------------


def write(folder: Path, calculations: list[Calculation], **frequencies: Any) -> Path:
    """Write calculations as one extended XYZ file with energies and frequencies."""
    import ase.units

    text = ""
    for calc in calculations:
        modes = calc.wavenumbers_cm
        listed = "" if modes is None else f' frequencies="{" ".join(map(str, modes))}"'
        assert calc.energy_hartree is not None
        text += (
            f"{len(calc.numbers)}\nProperties=species:S:1:pos:R:3 "
            f"energy={calc.energy_hartree * ase.units.Hartree!r} charge={calc.charge} "
            f'multiplicity={calc.multiplicity}{listed} pbc="F F F"\n'
        )
        for symbol, x in zip(calc.atoms.symbols, calc.positions_angstrom, strict=True):
            text += f"{symbol} {x[0]!r} {x[1]!r} {x[2]!r}\n".replace("np.float64(", "").replace(
                ")", ""
            )
    path = folder / "many.xyz"
    path.write_text(text)
    return path


def study(folder: Path, text: str) -> StudyConformers:
    file = folder / "study.toml"
    file.write_text(TSS + text)
    return conformers_of(file)


TRANS = peroxide(180.0, 2.0)
FILES = '[species.X]\nconformers = { ensemble = "many.xyz" }\n'


def test_a_file_of_several_structures_is_an_ensemble(tmp_path: Path) -> None:
    write(tmp_path, [SKEW, TRANS])
    found = study(tmp_path, FILES).ensembles[0]
    assert [member.degeneracy for member in found.members] == [2, 1]
    assert [Path(member.file).name for member in found.members] == ["many.xyz#1", "many.xyz#2"]
    alone = Ensemble.make(
        [
            tp.species.Structure.make(calc, tp.conditions.Treatment(), name="X")
            for calc in (SKEW, TRANS)
        ],
        name="X",
    ).at([298.15])
    for name in COLUMNS:
        assert getattr(found.at([298.15]), name) == pytest.approx(getattr(alone, name), rel=1e-10)


def test_frequencies_are_lent_only_where_it_is_asked(tmp_path: Path) -> None:
    write(tmp_path, [SKEW, peroxide(125.0, 1.0, wavenumbers_cm=None)])
    with pytest.raises(StudyError, match=r"many\.xyz#2 has no frequencies") as caught:
        study(tmp_path, FILES)
    assert 'thermal = "nearest"' in caught.value.mend
    found = study(tmp_path, FILES + 'thermal = "nearest"\n')
    assert [m.thermal_from for m in found.ensembles[0].members] == [
        None,
        str(tmp_path / "many.xyz#1"),
    ]
    assert "thermal-from-nearest" in [finding.code for finding in found.findings]
    run_ = run(str(tmp_path / "study.toml"))
    assert "wavenumbers of" in run_.stdout


def copied(folder: Path, *names: str) -> Path:
    folder.mkdir(exist_ok=True)
    for name in names:
        shutil.copy(PENTANE / "outputs" / name, folder)
    return folder


def test_a_higher_level_for_some_conformers_only(tmp_path: Path) -> None:
    copied(tmp_path, "tt.out", "tt_mp2.out", "tg.out", "tg_mp2.out")
    rows = '[species.X]\nconformers = [{ frequencies = "tt.out", energy = "tt_mp2.out" }, %s]\n'
    with pytest.raises(StudyError, match="some conformers have a single point") as caught:
        study(tmp_path, rows % '{ frequencies = "tg.out" }')
    assert caught.value.where == f"{tmp_path / 'study.toml'} [species.X] conformers"
    lent = study(tmp_path, rows % '{ energy = "tg_mp2.out" }' + 'thermal = "nearest"\n')
    assert lent.ensembles[0].members[1].thermal_from == str(tmp_path / "tt.out")
    with pytest.raises(StudyError, match="different levels"):  # the energy of tt is GFN2-xTB
        study(
            tmp_path,
            '[species.X]\nthermal = "nearest"\n'
            'conformers = [{ frequencies = "tt.out" }, { energy = "tg_mp2.out" }]\n',
        )


def test_a_named_level_and_energies_of_parts(tmp_path: Path) -> None:
    """A pattern names the single point of each conformer; a sum of one is the same."""
    copied(tmp_path, "tt.out", "tt_mp2.out", "tg.out", "tg_mp2.out")
    rows = '[species.X]\nconformers = [{ frequencies = "tt.out" }, { frequencies = "tg.out" }]\n'
    file = tmp_path / "study.toml"
    file.write_text(TSS + rows + '[levels.high]\nenergy = "{frequencies}_mp2.out"\n')
    own, high = (conformers_of(file, level=level).ensembles[0] for level in (None, "high"))
    assert high.members[1].model.energy_hartree < -197.0 < own.members[1].model.energy_hartree  # type: ignore[attr-defined]
    assert answer(str(file), "--level", "high")["ensembles"][0]["gibbs_kj_mol"] == pytest.approx(
        high.at([298.15]).gibbs_kj_mol, rel=1e-13
    )
    summed = rows.replace('.out"', '.out", energy = { sum = [{ file = "%s" }] }') % (
        "tt_mp2.out",
        "tg_mp2.out",
    )
    assert study(tmp_path, summed).ensembles[0].at([300.0]).gibbs_kj_mol == pytest.approx(
        high.at([300.0]).gibbs_kj_mol, rel=1e-13
    )
    mixed = rows.replace('tt.out"', 'tt.out", energy = { sum = [{ file = "tt_mp2.out" }] }')
    with pytest.raises(StudyError, match="not put together in one way"):
        study(tmp_path, mixed)
    file.write_text(TSS + rows + '[levels.high]\nenergies = { X = "tt_mp2.out" }\n')
    with pytest.raises(StudyError, match="has several conformers"):
        conformers_of(file)


def test_a_single_point_at_another_conformer(tmp_path: Path) -> None:
    copied(tmp_path, "tt.out", "tg_mp2.out")
    with pytest.raises(StudyError, match="different geometries") as caught:
        study(
            tmp_path,
            '[species.X]\nconformers = [{ frequencies = "tt.out", energy = "tg_mp2.out" }]\n',
        )
    assert "conformers.1 energy" in str(caught.value.where)


def test_what_a_species_says_holds_for_its_conformers(tmp_path: Path) -> None:
    write(tmp_path, [SKEW, TRANS])
    with pytest.raises(StudyError, match="charge"):
        study(tmp_path, FILES + "charge = 2\n")
    found = study(tmp_path, FILES + 'levels = [[2, "0 cm^-1"], [2, "100 cm^-1"]]\n').ensembles[0]
    assert all(len(m.model.gas.levels_cm) == 2 for m in found.members)  # type: ignore[attr-defined]


def test_a_file_of_one_structure_is_no_ensemble_file(tmp_path: Path) -> None:
    copied(tmp_path, "tt.out")
    with pytest.raises(tp.ReadError, match="no file of several structures"):
        study(tmp_path, '[species.X]\nconformers = { ensemble = "tt.out" }\n')


def test_a_study_without_conformers(tmp_path: Path) -> None:
    copied(tmp_path, "tt.out")
    with pytest.raises(StudyError, match="no species of this study has conformers"):
        study(tmp_path, '[species.X]\nfrequencies = "tt.out"\n')


def test_an_ensemble_in_a_mechanism(tmp_path: Path) -> None:
    """Two ensembles of one set are in equilibrium with K = 1, and a saddle ensemble tunnels."""
    modes = [-1200.0, 880.0, 1300.0, 1400.0, 3600.0, 3610.0]
    write(tmp_path, [SKEW, TRANS])
    shutil.move(tmp_path / "many.xyz", tmp_path / "minima.xyz")
    write(
        tmp_path,
        [peroxide(112.0, 60.0, wavenumbers_cm=modes), peroxide(180.0, 61.0, wavenumbers_cm=modes)],
    )
    text = (
        TSS
        + "".join(
            f'[species.{name}]\nconformers = {{ ensemble = "{file}.xyz" }}\n'
            for name, file in (("A", "minima"), ("B", "minima"), ("TS", "many"))
        )
        + '[[steps]]\nequation = "A = B"\nthrough = "TS"\ntunnelling = "eckart"\n'
        + '[effective]\nreactant = "A"\nproduct = "B"\n'
    )
    file = tmp_path / "study.toml"
    file.write_text(text)
    loaded = tp.Study.load(file)
    assert loaded.species["TS"].kind == "saddle"
    profile = loaded.profile().table()
    last = profile.iloc[-1]
    assert last["gibbs_kj_mol"] == pytest.approx(0.0, abs=1e-9)
    eckart = loaded.effective()
    file.write_text(text.replace('"eckart"', '"none"'))
    assert (
        eckart.rates["free"].rate_constant[0]
        > 1.5 * tp.Study.load(file).effective().rates["free"].rate_constant[0]
    )


def test_choices_reach_every_conformer(tmp_path: Path) -> None:
    folder = copied(tmp_path, "tt.out", "tg.out", "gg.out")
    file = folder / "study.toml"
    file.write_text(
        TSS
        + '[species.X]\nconformers = [{ frequencies = "tg.out" }, { frequencies = "gg.out" }]\n'
        + '[species.T]\nfrequencies = "tt.out"\n'
        + '[[steps]]\nequation = "T = X"\nrate = "1 s^-1"\n'
    )
    loaded = tp.Study.load(file)
    assert loaded.read_species == ("X", "T")
    without = loaded.altered({}, {"X": {"symmetry_number": 1}}).species["X"]
    assert isinstance(without, Ensemble)
    assert [m.model.symmetry_number for m in without.members] == [1, 1]  # type: ignore[attr-defined]


# folders and files --------------------------------------------------------------------------------


def test_a_folder(tmp_path: Path) -> None:
    folder = copied(tmp_path / "o", "tt.out", "tg.out", "gg.out", "tt_mp2.out")
    found = answer(str(folder), "-T", "298.15", "-T", "400")
    assert found["format"] == "thermo-pp/conformers/1"
    assert found["temperature_k"] == [298.15, 400.0]
    (only,) = found["ensembles"]
    assert only["name"] == "C5H12"
    assert [Path(one["file"]).name for one in only["members"]] == ["gg.out", "tg.out", "tt.out"]
    assert [one["degeneracy"] for one in only["members"]] == [2, 2, 1]
    shares = np.array([one["population"] for one in only["members"]])
    assert shares.sum(axis=0) == pytest.approx(1.0)
    for key in ("enthalpy_kj_mol", "entropy_j_mol_k", "gibbs_kj_mol", "lowest_only_gibbs_kj_mol"):
        assert len(only[key]) == 2
    assert only["duplicates"] == []
    assert "single-points-not-used" in [finding["code"] for finding in found["findings"]]


def test_duplicates_of_a_folder(tmp_path: Path) -> None:
    folder = copied(tmp_path / "o", "tt.out", "tg.out")
    data = (folder / "tg.out").read_bytes()
    (folder / "tg_again.out").write_bytes(data)
    counted, once = (
        answer(str(folder), "--duplicates", how)["ensembles"][0] for how in ("count", "once")
    )
    assert [Path(one["file"]).name for one in counted["duplicates"]] == ["tg_again.out"]
    assert [one["degeneracy"] for one in counted["members"]] == [2, 2, 1]
    assert [one["degeneracy"] for one in once["members"]] == [2, 0, 1]
    without = answer(str(folder / "tt.out"), str(folder / "tg.out"))["ensembles"][0]
    assert once["gibbs_kj_mol"] == pytest.approx(without["gibbs_kj_mol"], rel=1e-13)
    assert counted["gibbs_kj_mol"][0] < once["gibbs_kj_mol"][0] - 0.5


def test_a_file_of_several_structures_on_the_command_line(tmp_path: Path) -> None:
    path = write(tmp_path, [SKEW, TRANS, peroxide(-112.0)])
    found = answer(str(path), "--missed", "1 kcal/mol")["ensembles"][0]
    assert found["name"] == "many"
    assert [one["degeneracy"] for one in found["members"]] == [1, 1, 1]
    assert found["mirror_images"] == [{"file": f"{path}#3", "mirror_of": f"{path}#1"}]
    assert found["missed_kj_mol"] == pytest.approx(4.184)
    assert found["missed_change_kj_mol"][0] < 0.0


def test_calculations_without_frequencies_join_on_demand(tmp_path: Path) -> None:
    lines = (PENTANE / "outputs" / "tg_mp2.out").read_text()
    folder = copied(tmp_path / "o", "tt_mp2.out")
    (folder / "tg_mp2.out").write_text(lines)
    result = run(str(folder), "--thermal", "nearest", status=1)  # nobody has any to lend
    assert "no conformer in" in result.stderr


@pytest.mark.parametrize("format_name", [name for name in FORMATS if name != "xlsx"])
def test_every_format(format_name: str) -> None:
    result = run(str(STUDY), "--format", format_name, "-T", "298.15")
    assert "tg.out" in result.stdout.replace("\\_", "_").replace("\\allowbreak{}", "")
    if format_name == "csv":
        rows = list(csv.DictReader(io.StringIO(result.stdout)))
        assert len(rows) == 4
        assert sum(float(row["population"]) for row in rows) == pytest.approx(1.0)


def test_the_table_of_a_study() -> None:
    result = run(str(STUDY), "--energy-unit", "kcal/mol")
    assert "pentane at 298.15 K" in result.stdout
    assert "counted twice" in result.stdout
    assert "counted once" in run(str(STUDY), "--duplicates", "once").stdout


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        ((str(STUDY), str(STUDY)), "give one study alone"),
        ((str(STUDY), "--thermal", "nearest"), "give one study alone"),
        ((str(PENTANE), "--missed", "4 apples"), "apples"),
        ((str(PENTANE), "--level", "high"), "--level is for a study"),
    ],
)
def test_wrong_usage(arguments: tuple[str, ...], said: str) -> None:
    assert said in run(*arguments, status=2).stderr
