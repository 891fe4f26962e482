"""The draft: what is grouped, followed and guessed, and that the file loads as it is."""

from __future__ import annotations

import random
import shutil
import subprocess
import sys
import tomllib
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from click.testing import CliRunner, Result
from draft_folders import HNC, NWCHEM, PLUME, PSI4, copied, made_up, methyl, peroxide, water

import thermo_pp as tp
from thermo_pp.cli import main
from thermo_pp.collect import Collection
from thermo_pp.mechanism import parse_equation
from thermo_pp.study.draft import Draft, draft, ends
from thermo_pp.study.draft.energies import basis_size, method_class
from thermo_pp.study.draft.naming import species_names, toml_text

FREQUENCIES = sorted(path.name for path in PLUME.iterdir() if "_" not in path.name)


def drafted(folder: Path) -> Draft:
    return draft(tp.collect(folder, jobs=1, cache=False), folder, beside=folder.parent)


def loaded(result: Draft, folder: Path) -> tp.Study:
    path = folder.parent / f"{folder.name}.toml"
    path.write_text(result.text)
    return tp.Study.load(path)


def refused(folder: Path) -> tp.StudyError:
    with pytest.raises(tp.StudyError) as caught:
        drafted(folder)
    assert caught.value.where == str(folder)
    assert caught.value.mend
    return caught.value


def joins(result: Draft) -> set[tuple[frozenset[Any], str | None]]:
    """The steps, whichever way they are written."""
    found = set()
    for step in result.steps:
        sides = parse_equation(step.equation, where="")
        found.add((frozenset(frozenset(side.items()) for side in sides), step.through))
    return found


def step(equation: str, through: str | None = None) -> tuple[frozenset[Any], str | None]:
    sides = parse_equation(equation, where="")
    return frozenset(frozenset(side.items()) for side in sides), through


def codes(result: Draft) -> list[str]:
    return [finding.code for finding in result.findings]


# -- the bundled folder


@pytest.fixture(scope="module")
def plume(tmp_path_factory: pytest.TempPathFactory) -> tuple[Draft, Path]:
    folder = tmp_path_factory.mktemp("plume") / "outputs"
    shutil.copytree(PLUME, folder)
    return drafted(folder), folder


def test_stack_plume_has_every_step_of_its_study(plume: tuple[Draft, Path]) -> None:
    assert joins(plume[0]) == {
        step("2 water = water-dimer"),
        step("so3 + water = so3-water"),
        step("so3-water + water = so3-water2"),
        step("so3 + water-dimer = so3-water2"),
        step("so3-water = h2so4", "ts-unassisted"),
        step("so3-water2 = h2so4 + water", "ts-assisted"),
    }
    assert plume[0].without == ()
    assert all(each.sure for each in plume[0].steps if each.through)


def test_stack_plume_question(plume: tuple[Draft, Path]) -> None:
    result = plume[0]
    assert (result.reactant, result.products) == ("so3", ("h2so4",))
    assert result.held == ("water", "water-dimer")
    data = tomllib.loads(result.text)
    assert data["conditions"]["held"]["water-dimer"] == "equilibrium"
    downhill = [each["equation"] for each in data["steps"] if "through" in each]
    assert downhill == ["so3-water2 = h2so4 + water", "so3-water = h2so4"]


def test_stack_plume_loads_and_runs(plume: tuple[Draft, Path]) -> None:
    study = loaded(*plume)
    assert not [finding for finding in study.findings if finding.severity == "error"]
    assert study.title == plume[1].parent.name  # "outputs" says nothing
    rate = study.effective().rates["pool"]
    assert rate is not None
    assert np.all(rate.rate_constant > 0.0)
    assert np.all(rate.arrhenius_energy_kj_mol < -40.0)  # as in the bundled study


def test_stack_plume_single_points(plume: tuple[Draft, Path]) -> None:
    data = tomllib.loads(plume[0].text)
    for name, keys in data["species"].items():
        assert keys == {"frequencies": f"{name}.out", "energy": f"{name}_mp2-qz.out"}
        assert f'# energy = "{name}_mp2.out"' in plume[0].text
        assert f'# energy = "{name}_ccsdt.out"' in plume[0].text


def test_every_other_single_point_can_be_taken_instead(plume: tuple[Draft, Path]) -> None:
    """The commented alternatives are right as they stand."""
    lines = []
    for line in plume[0].text.splitlines():
        if line.startswith("energy = "):
            continue
        lines.append(line.removeprefix("# ") if "_ccsdt.out" in line else line)
    study = plume[1].parent / "other.toml"
    study.write_text("\n".join(lines))
    assert "CCSD(T)" in tp.Study.load(study).levels[0]


def test_guesses_are_marked_and_found(plume: tuple[Draft, Path]) -> None:
    assert plume[0].text.count("GUESS") >= 8
    assert set(codes(plume[0])) == {"guessed-barrierless", "guessed-level", "guessed-conditions"}
    for finding in plume[0].findings:
        assert finding.mend


def test_the_text_does_not_depend_on_the_run(plume: tuple[Draft, Path]) -> None:
    folder = plume[1]
    code = (
        "import sys, thermo_pp as tp; from thermo_pp.study.draft import draft\n"
        "sys.stdout.write(draft(tp.collect(sys.argv[1], cache=False), sys.argv[1],"
        " beside=sys.argv[2]).text)"
    )
    for seed in ("1",):  # this process has another
        run = subprocess.run(
            [sys.executable, "-c", code, str(folder), str(folder.parent)],
            capture_output=True, text=True, check=True, timeout=60, env={"PYTHONHASHSEED": seed,
            "PYTHONPATH": str(Path(tp.__file__).parents[1])},
        )  # fmt: skip
        assert run.stdout == plume[0].text


def test_no_line_is_too_long_and_comments_are_comments(plume: tuple[Draft, Path]) -> None:
    for line in plume[0].text.splitlines():
        assert len(line) <= 102


# -- levels


def test_a_level_that_not_all_have_is_not_taken_and_said(tmp_path: Path) -> None:
    folder = tmp_path / "outputs"
    shutil.copytree(PLUME, folder)
    (folder / "h2so4_mp2-qz.out").unlink()
    result = drafted(folder)
    energies = {keys["energy"] for keys in tomllib.loads(result.text)["species"].values()}
    assert "h2so4_mp2.out" in energies
    assert not any("qz" in energy for energy in energies)
    said = " ".join(line.lstrip("# ") for line in result.text.splitlines())
    assert "only 7 of 8 species have it, not h2so4" in said
    loaded(result, folder)


def test_no_single_points_at_all(tmp_path: Path) -> None:
    folder = copied(tmp_path / "outputs", FREQUENCIES)
    result = drafted(folder)
    assert "Energies: those of the frequency jobs." in result.text
    assert loaded(result, folder).effective().rates["free"] is not None


def test_frequencies_at_two_levels(tmp_path: Path) -> None:
    folder = copied(tmp_path / "outputs", FREQUENCIES)
    made_up(folder / "water-hf.json", *water(), -76.0)
    result = drafted(folder)
    assert len(result.steps) == 6
    assert "its frequencies are at another level, HF/6-31g*" in result.text
    assert codes(result).count("left-out-of-draft") == 1
    loaded(result, folder)


def test_the_level_at_which_something_joins_is_taken(tmp_path: Path) -> None:
    """Most structures are at a level at which nothing joins."""
    folder = copied(tmp_path / "outputs", ["so3.out", "water.out", "so3-water.out"])
    for k in range(6):
        made_up(folder / f"alkali{k}.json", ["Li", "H"], [[0, 0, 0], [0, 0, 1.5 + k / 9]], -8.0 + k)
    for k, atom in enumerate(("F", "Cl", "Br")):
        made_up(folder / f"halide{k}.json", *methyl(atom, 1.5 + k / 5), -140.0)
    assert joins(drafted(folder)) == {step("so3 + water = so3-water")}


@pytest.mark.parametrize(
    ("names", "order"),
    [
        (("HF", "B3LYP", "MP2", "CCSD", "CCSD(T)"), [1, 3, 4, 6, 8]),
        (("DLPNO-CCSD(T)", "RI-MP2", "GFN2-XTB", "PM7", "M06-2X"), [8, 4, 0, 0, 3]),
        (("B2PLYP", "WB97X-D3BJ", "HF-3C", "LC-PBEHPBE"), [5, 3, 1, 3]),
    ],
)
def test_classes_of_methods(names: tuple[str, ...], order: list[int]) -> None:
    calc = tp.read(NWCHEM / "water_hf_energy.out")
    assert [method_class(replace(calc, method=name)) for name in names] == order


@pytest.mark.parametrize(
    ("basis", "size"),
    [
        ("cc-pVDZ", 2), ("aug-cc-pV(Q+d)Z", 4.25), ("def2-TZVP", 3), ("def2-SVPD", 2.25),
        ("6-31G*", 2), ("6-311+G**", 3.25), ("sto-3g", 1), ("cc-pv[dt]z", 3.5), (None, 0),
        ("cc-pV5Z", 5), ("ma-def2-QZVPP", 4.25), ("unheard-of", 0), ("def2-SV(P)", 2),
        ("H: def2-tzvp, Br: lanl2dz ecp", 3),
    ],
)  # fmt: skip
def test_sizes_of_basis_sets(basis: str | None, size: float) -> None:
    assert basis_size(basis) == size


# -- parts of a mechanism missing


def test_no_saddle_point_leaves_the_association(tmp_path: Path) -> None:
    folder = copied(tmp_path / "o", [name for name in FREQUENCIES if not name.startswith("ts")])
    result = drafted(folder)
    assert len(result.steps) == 4
    assert "# [species.h2so4]" in result.text
    assert "It has the atoms of: so3-water; so3 + water." in result.text
    assert loaded(result, folder).effective().rates["free"] is not None


def test_a_complex_of_held_molecules_is_held_though_nothing_else_uses_it(tmp_path: Path) -> None:
    folder = copied(tmp_path / "o", ["so3.out", "water.out", "so3-water.out", "water-dimer.out"])
    result = drafted(folder)
    assert (result.reactant, result.held) == ("so3", ("water", "water-dimer"))
    assert loaded(result, folder).effective().rates["free"] is not None


def test_no_question_where_none_makes_the_network_linear(tmp_path: Path) -> None:
    folder = copied(tmp_path / "o", ["water.out", "water-dimer.out"])
    result = drafted(folder)
    assert joins(result) == {step("2 water = water-dimer")}
    assert result.reactant is None
    assert "# [effective]" in result.text
    assert loaded(result, folder).mechanism.reactant is None


def test_missing_product_makes_no_step_through_the_saddle(tmp_path: Path) -> None:
    folder = copied(tmp_path / "o", [name for name in FREQUENCIES if name != "h2so4.out"])
    result = drafted(folder)
    assert {each.saddle for each in result.without} == {"ts-assisted", "ts-unassisted"}
    assert all(each.through is None for each in result.steps)
    assert codes(result).count("saddle-without-step") == 2
    said = {each.saddle: each.words[0] for each in result.without}
    assert said["ts-unassisted"].startswith("One way the imaginary mode leads to so3-water;")
    assert "(bonds there and not the other way: O2-H6)" in said["ts-unassisted"]
    assert "species.ts" not in result.text  # a species that no step uses is an error
    loaded(result, folder)


def test_missing_complex_gives_the_separate_molecules(tmp_path: Path) -> None:
    folder = copied(tmp_path / "o", ["so3.out", "water.out", "h2so4.out", "ts-unassisted.out"])
    result = drafted(folder)
    assert joins(result) == {step("so3 + water = h2so4", "ts-unassisted")}
    assert loaded(result, folder).effective().rates["free"] is not None


def test_missing_water_dimer_and_complexes_give_three_molecules(tmp_path: Path) -> None:
    folder = copied(tmp_path / "o", ["so3.out", "water.out", "h2so4.out", "ts-assisted.out"])
    assert joins(drafted(folder)) == {step("so3 + 2 water = h2so4 + water", "ts-assisted")}


def test_only_one_end_is_there(tmp_path: Path) -> None:
    folder = copied(tmp_path / "o", ["hcn_hf_opt_freq.out", "hcn_hnc_hf_ts_freq.out"], NWCHEM)
    error = refused(folder)
    assert "leads to hcn_hf; what it leads to the other way" in error.what
    assert "N2-H3" in error.what


def test_both_ends_are_there(tmp_path: Path) -> None:
    folder = copied(tmp_path / "o", ["hcn_hf_opt_freq.out", "hcn_hnc_hf_ts_freq.out"], NWCHEM)
    made_up(folder / "hnc.json", *HNC, -92.85)
    result = drafted(folder)
    assert [each.equation for each in result.steps] == ["hnc = hcn_hf"]  # downhill
    assert (result.reactant, result.products, result.held) == ("hnc", ("hcn_hf",), ())
    assert loaded(result, folder).effective().rates["relaxation"] is not None


def test_two_saddles_with_the_same_ends(tmp_path: Path) -> None:
    folder = copied(tmp_path / "o", ["so3-water.out", "h2so4.out", "ts-unassisted.out"])
    calc = tp.read(folder / "ts-unassisted.out")
    x = calc.positions_angstrom.copy()
    x[6] += [0.2, 0.25, -0.1]
    made_up(
        folder / "ts-other.json", calc.atoms.get_chemical_symbols(), x, calc.energy_hartree + 0.004,
        along=calc.modes[0], method="b3lyp", basis="def2-svpd",
    )  # fmt: skip
    result = drafted(folder)
    assert joins(result) == {
        step("so3-water = h2so4", "ts-unassisted"),
        step("so3-water = h2so4", "ts-other"),
    }
    study = loaded(result, folder)
    assert "same-step-twice" not in [finding.code for finding in study.findings]
    assert study.effective().rates["free"] is not None


def test_the_same_saddle_twice_counts_once(tmp_path: Path) -> None:
    folder = copied(tmp_path / "o", ["so3-water.out", "h2so4.out", "ts-unassisted.out"])
    data = (folder / "ts-unassisted.out").read_bytes()
    (folder / "ts-again.out").write_bytes(data + b"\n")
    result = drafted(folder)
    assert len(result.steps) == 1
    assert "the same structure as" in result.text


# -- nothing to join


def test_single_points_only(tmp_path: Path) -> None:
    error = refused(copied(tmp_path / "o", ["water_hf_energy.out", "water_mp2_energy.out"], NWCHEM))
    assert error.what == "none of the 2 outputs has frequencies, so there is no H, S and G"


def test_empty_folder_and_folder_without_outputs(tmp_path: Path) -> None:
    (tmp_path / "o").mkdir()
    assert refused(tmp_path / "o").what == "no file in this folder can be read"
    (tmp_path / "o" / "note.txt").write_text("do not forget the milk\n")
    assert refused(tmp_path / "o").what == "no file in this folder can be read"
    (tmp_path / "o" / "cut.out").write_bytes((PLUME / "so3.out").read_bytes()[:20000])
    assert "the first of 1: cannot be read: " in refused(tmp_path / "o").what


def test_unrelated_molecules(tmp_path: Path) -> None:
    folder = copied(tmp_path / "o", ["co2_b3lyp_opt_freq.out", "water_b3lyp_opt_freq.out"], NWCHEM)
    error = refused(folder)
    assert "no step joins what is in this folder" in error.what
    assert "minima: co2_b3lyp, water_b3lyp" in error.what


def test_minima_that_balance_without_a_saddle_point(tmp_path: Path) -> None:
    error = refused(copied(tmp_path / "o", ["so3.out", "water.out", "h2so4.out"]))
    assert "h2so4 has the atoms of so3 + water" in error.what


# -- symmetric saddle points


@pytest.mark.parametrize("source", [NWCHEM, PSI4], ids=["nwchem", "psi4"])
def test_an_inversion_has_one_end(tmp_path: Path, source: Path) -> None:
    names = ["two_molecules_hf.out", "ammonia_planar_hf_ts_freq.out"]
    error = refused(copied(tmp_path / "o", names, source))
    assert "Both ways the imaginary mode leads to two_molecules_hf" in error.what
    assert "a step must change something" in error.what


def test_an_inversion_beside_a_reaction_is_a_comment(tmp_path: Path) -> None:
    folder = copied(
        tmp_path / "o",
        ["two_molecules_hf.out", "ammonia_planar_hf_ts_freq.out", "hcn_hf_opt_freq.out",
         "hcn_hnc_hf_ts_freq.out"], NWCHEM,
    )  # fmt: skip
    made_up(folder / "hnc.json", *HNC, -92.85)
    result = drafted(folder)
    assert joins(result) == {step("hcn_hf = hnc", "hcn_hnc_hf_ts")}
    assert "# No step goes through the saddle point ammonia_planar_hf_ts." in result.text
    assert loaded(result, folder).effective().rates["free"] is not None


def substitution(path: Path, leaving: str, entering: str, lengths: tuple[float, float]) -> None:
    """Write the saddle point of X- + CH3Y, a straight line of three heavy atoms."""
    symbols, x = methyl(leaving, lengths[0], 0.0)
    along = np.zeros((6, 3))
    along[:, 2] = [1.0, 0.6, 0.6, 0.6, -0.1, -0.1]
    made_up(
        path, [*symbols, entering], np.vstack([x, [0, 0, -lengths[1]]]), -600.0, along=along,
        charge=-1,
    )  # fmt: skip


def ion(path: Path, symbol: str, energy: float) -> None:
    made_up(path, [symbol], [[0, 0, 0]], energy, charge=-1, driver="energy")


def test_an_identity_reaction_makes_no_step(tmp_path: Path) -> None:
    folder = tmp_path / "o"
    substitution(folder / "ts.json", "Cl", "Cl", (2.35, 2.35))
    ion(folder / "chloride.json", "Cl", -459.5)
    made_up(folder / "mecl.json", *methyl("Cl", 1.78), -499.0)
    assert "Both ways the imaginary mode leads to chloride + mecl" in refused(folder).what


def test_a_substitution_with_a_by_product(tmp_path: Path) -> None:
    folder = tmp_path / "o"
    substitution(folder / "ts.json", "Cl", "F", (2.15, 1.95))
    ion(folder / "chloride.json", "Cl", -459.52)
    ion(folder / "fluoride.json", "F", -99.35)
    made_up(folder / "mecl.json", *methyl("Cl", 1.78), -499.0)
    made_up(folder / "mef.json", *methyl("F", 1.38), -139.0)
    result = drafted(folder)
    assert joins(result) == {step("fluoride + mecl = chloride + mef", "ts")}
    assert result.reactant == "mecl"
    assert result.products == ("mef", "chloride")
    assert result.held == ("fluoride",)
    assert loaded(result, folder).effective().rates["free"] is not None


# -- conformers


def conformers(folder: Path) -> Path:
    for k, angle in enumerate((112, 180, 20)):
        made_up(folder / f"hooh-{k}.json", *peroxide(angle), -150.7 + (0.002, 0.0, 0.01)[k])
    return folder


def test_the_lowest_conformer_stands_for_its_molecule(tmp_path: Path) -> None:
    folder = conformers(tmp_path / "o")
    symbols, x = peroxide(112)
    more, y = water((4.0, 0.0, 0.0))
    made_up(folder / "cluster.json", [*symbols, *more], np.vstack([x, y]), -226.75)
    made_up(folder / "water.json", *water(), -76.01)
    result = drafted(folder)
    assert joins(result) == {step("hooh-1 + water = cluster")}
    said = " ".join(line.lstrip("# ") for line in result.text.splitlines())
    assert "The others: hooh-0.json (+" in said
    assert "hooh-2.json (+" in said
    assert codes(result).count("conformer-left-out") == 1
    loaded(result, folder)


def test_the_lowest_is_judged_with_the_energies_that_are_used(tmp_path: Path) -> None:
    folder = conformers(tmp_path / "o")
    symbols, x = peroxide(112)
    more, y = water((4.0, 0.0, 0.0))
    cluster = [*symbols, *more], np.vstack([x, y])
    made_up(folder / "cluster.json", *cluster, -226.75)
    made_up(folder / "water.json", *water(), -76.01)
    better = {"method": "mp2", "basis": "cc-pvtz", "driver": "energy"}
    made_up(folder / "cluster-sp.json", *cluster, -227.5, **better)
    made_up(folder / "water-sp.json", *water(), -76.3, **better)
    for k, angle in enumerate((112, 180, 20)):
        energy = -151.2 + (0.0, 0.005, 0.01)[k]
        made_up(folder / f"hooh-{k}-sp.json", *peroxide(angle), energy, **better)
    result = drafted(folder)
    assert joins(result) == {step("hooh-0 + water = cluster")}
    assert tomllib.loads(result.text)["species"]["hooh-0"]["energy"] == "hooh-0-sp.json"
    loaded(result, folder)


def test_a_saddle_between_two_conformers_keeps_both(tmp_path: Path) -> None:
    folder = tmp_path / "o"
    for name, angle, energy in (("bent", 112, -150.702), ("cis", 40, -150.7)):
        made_up(folder / f"{name}.json", *peroxide(angle), energy)
    symbols, x = peroxide(76)
    along = peroxide(78)[1] - peroxide(74)[1]
    made_up(folder / "turn.json", symbols, x, -150.69, along=along)
    result = drafted(folder)
    assert joins(result) == {step("bent = cis", "turn")}
    assert "conformers nearest in shape" in result.text
    assert "guessed-step" in codes(result)
    loaded(result, folder)


# -- modes, Hessians, neither


def without(folder: Path, *fields: str) -> Collection:
    found = tp.collect(folder, jobs=1, cache=False)
    return replace(
        found,
        calculations=tuple(replace(calc, **dict.fromkeys(fields)) for calc in found.calculations),
    )


def test_the_hessian_does_where_there_are_no_modes(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    folder = copied(tmp_path / "o", FREQUENCIES)
    have = {path.name: tp.read(path) for path in sorted(folder.glob("ts*.out"))}
    for name, calc in have.items():
        if calc.hessian_hartree_bohr2 is None:
            pytest.skip(f"{name} is read without its Hessian")
    monkeypatch.setattr(
        "thermo_pp.study.draft.ends.read", lambda path: replace(have[Path(path).name], modes=None)
    )
    result = draft(without(folder, "modes", "hessian_hartree_bohr2"), folder, beside=tmp_path)
    assert joins(result) == joins(drafted(folder))
    assert all(each.sure for each in result.steps if each.through)


def test_without_mode_and_hessian_balance_is_all_there_is(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    names = ["so3.out", "water.out", "h2so4.out", "ts-unassisted.out"]
    folder = copied(tmp_path / "o", names)
    nothing = {"modes": None, "hessian_hartree_bohr2": None}
    monkeypatch.setattr(
        "thermo_pp.study.draft.ends.read", lambda path: replace(tp.read(path), **nothing)
    )
    result = draft(without(folder, *nothing), folder, beside=tmp_path)
    assert joins(result) == {step("so3 + water = h2so4", "ts-unassisted")}
    assert not result.steps[0].sure
    assert "GUESS: There is no mode and no Hessian to follow" in result.text
    assert "guessed-step" in codes(result)
    loaded(result, folder)


def test_ends_do_not_depend_on_the_sign_of_the_mode_and_the_order_of_atoms() -> None:
    from thermo_pp.grouping import group

    structures = group(tp.read(PLUME / name) for name in FREQUENCIES).structures
    names = {Path(each.frequencies.path).stem: each for each in structures}
    minima = {name: each for name, each in names.items() if each.role == "minimum"}
    saddle = names["ts-assisted"]
    want = ends.ends(saddle, minima).sides
    calc = saddle.frequencies
    assert calc.modes is not None
    order = np.random.default_rng(3).permutation(len(calc.numbers))
    moved = replace(
        calc, numbers=calc.numbers[order], positions_angstrom=calc.positions_angstrom[order],
        masses_u=calc.masses_u[order], modes=-calc.modes[:, order], hessian_hartree_bohr2=None,
    )  # fmt: skip
    assert ends.ends(replace(saddle, frequencies=moved), minima).sides == want[::-1]


Sides = tuple[tuple[tuple[str, ...], ...], tuple[tuple[str, ...], ...]]
COMPLEX, ACID, APART = ("so3-water",), ("h2so4",), ("so3", "water")


@pytest.mark.parametrize(
    ("sides", "others", "want", "said"),
    [
        (((COMPLEX,), ()), (ACID, APART), "so3-water = h2so4", "is taken because it balances"),
        (((), (COMPLEX,)), (APART,), None, "is not in the folder"),
        (((), ()), (COMPLEX, ACID), None, "leads to none of the minima in the folder"),
        (((), ()), (), None, "No set of minima in the folder has its atoms"),
        (((ACID, COMPLEX), (ACID,)), (), "so3-water = h2so4", "matches both ways"),
        (((COMPLEX, APART), (COMPLEX, APART)), (), None, "the two ends are the same species"),
    ],
)
def test_ends_that_the_mode_does_not_settle(
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    sides: Sides,
    others: tuple[tuple[str, ...], ...],
    want: str | None,
    said: str,
) -> None:
    names = ["so3.out", "water.out", "so3-water.out", "h2so4.out", "ts-unassisted.out"]
    folder = copied(tmp_path / "o", names)
    monkeypatch.setattr(
        "thermo_pp.study.draft.steps.ends",
        lambda saddle, minima: ends.Ends(True, sides, others, ("O1-H2", "")),
    )
    result = drafted(folder)
    through = [each for each in result.steps if each.through]
    assert [each.equation for each in through] == ([want] if want else [])
    assert not any(each.sure for each in through)
    assert ("guessed-step" in codes(result)) == (want is not None)
    assert ("saddle-without-step" in codes(result)) == (want is None)
    assert said in " ".join(line.lstrip("# ") for line in result.text.splitlines())
    loaded(result, folder)


# -- what outputs do not say, names, other phases


def test_unknown_charge_is_declared_and_said(tmp_path: Path) -> None:
    folder = copied(tmp_path / "o", ["so3.out", "water.out", "so3-water.out"])
    result = draft(without(folder, "charge", "multiplicity"), folder, beside=tmp_path)
    assert tomllib.loads(result.text)["species"]["so3"]["charge"] == 0
    assert tomllib.loads(result.text)["species"]["so3"]["multiplicity"] == 1
    assert codes(result).count("guessed-charge") == 3
    loaded(result, folder)


def test_a_solvent_model_makes_a_solution(tmp_path: Path) -> None:
    folder = copied(tmp_path / "o", FREQUENCIES)
    found = tp.collect(folder, jobs=1, cache=False)
    wet = tuple(replace(calc, solvent="COSMO(h2o, dielectric 78.4)") for calc in found)
    result = draft(replace(found, calculations=wet), folder, beside=tmp_path)
    data = tomllib.loads(result.text)
    assert data["treatment"]["phase"] == "solution"
    assert data["treatment"]["standard_state"] == "1 mol/L"
    assert all("viscosity" in each for each in data["steps"] if "barrier" in each)
    assert loaded(result, folder).effective().rates["free"] is not None


def test_names_of_files(tmp_path: Path) -> None:
    calc = tp.read(NWCHEM / "water_hf_freq.out")
    paths = ["a/ts 1_opt_freq.log", "b/ts 1.out", "x/freq.out", "x/sub/FREQ.out.gz", "ß.out",
             "y/TS-1.out", "c++.out", "ts.freq.out", "-_-.out"]  # fmt: skip
    names = species_names([replace(calc, path=path) for path in paths])
    assert names == ["a-ts-1", "b-ts-1", "x", "sub", "H2O", "y-TS-1", "c", "ts", "H2O-2"]


def test_awkward_file_names_load(tmp_path: Path) -> None:
    folder = tmp_path / "out puts"
    awkward = {
        "so3.out": 'so3 "#1" \\n.out', "water.out": "wäter=1.out", "so3-water.out": "so3\nwater\x7f.out",
    }  # fmt: skip
    copied(folder, awkward)
    for name, other in awkward.items():
        (folder / "sub's").mkdir(exist_ok=True)
        (folder / name).rename(folder / "sub's" / other)
    result = drafted(folder)
    assert len(result.steps) == 1
    study = loaded(result, folder)
    assert set(study.species) == {"so3-1-n", "w-ter-1", "so3-water"}


def test_a_name_that_is_not_utf8_is_left_out(tmp_path: Path) -> None:
    folder = copied(tmp_path / "o", ["so3.out", "water.out", "so3-water.out"])
    try:
        shutil.copy(PLUME / "h2so4.out", bytes(folder) + b"/h2so4\xff.out")
    except OSError:
        pytest.skip("this file system takes UTF-8 only")
    result = drafted(folder)
    assert "its name is not UTF-8" in result.text
    result.text.encode()
    loaded(result, folder)


def test_toml_texts() -> None:
    for text in ("plain", 'a "b"', "back\\slash", "line\nbreak", "\x00\x1f\x7f", "ß", "tab\t"):
        assert tomllib.loads(f"x = {toml_text(text)}")["x"] == text


def test_any_part_of_a_folder_loads_or_is_refused_in_words(tmp_path: Path) -> None:
    rng = random.Random(20240611)
    files = sorted(path.name for path in PLUME.iterdir())
    done = 0
    for k in range(8):
        chosen = [*rng.sample(FREQUENCIES, 5), *rng.sample(files, 6)]
        folder = copied(tmp_path / f"o{k}", chosen)
        try:
            result = drafted(folder)
        except tp.StudyError as error:
            assert "no step joins" in error.what  # noqa: PT017
            continue
        study = loaded(result, folder)
        assert not [finding for finding in study.findings if finding.severity == "error"]
        if result.reactant is not None:
            study.effective()
            done += 1
    assert done > 2


# -- the command


def run(*arguments: str, status: int = 0) -> Result:
    result = CliRunner().invoke(main, ["draft", *arguments], prog_name="thermo-pp")
    assert result.exit_code == status, (result.stdout, result.stderr, result.exception)
    return result


def test_command_writes_the_study_to_standard_output_only(plume: tuple[Draft, Path]) -> None:
    result = run(str(plume[1]), "--no-cache")
    assert tomllib.loads(result.stdout)["effective"] == {"reactant": "so3", "product": "h2so4"}
    assert "[guessed-conditions]" in result.stderr
    assert run(str(plume[1]), "--no-cache", "--quiet").stderr == ""


def test_command_names_the_outputs_from_the_file_it_writes(tmp_path: Path) -> None:
    folder = copied(tmp_path / "data" / "outputs", ["so3.out", "water.out", "so3-water.out"])
    path = tmp_path / "studies" / "first.toml"
    path.parent.mkdir()
    result = run(str(folder), "-o", str(path), "--no-cache")
    assert result.stdout == ""
    assert f"hint: thermo-pp barrier {path}" in result.stderr
    assert tomllib.loads(path.read_text())["outputs"] == "../data/outputs"
    assert tp.Study.load(path).title == "data"


def test_command_never_writes_over_a_file_unasked(tmp_path: Path) -> None:
    folder = copied(tmp_path / "outputs", ["so3.out", "water.out", "so3-water.out"])
    path = tmp_path / "study.toml"
    path.write_text("mine")
    result = run(str(folder), "-o", str(path), "--no-cache", status=1)
    assert "the file is there already\n  mend: " in result.stderr
    assert path.read_text() == "mine"
    run(str(folder), "-o", str(path), "--no-cache", "--force")
    assert tp.Study.load(path).mechanism.steps


def test_command_on_an_empty_folder_and_on_a_file(tmp_path: Path) -> None:
    result = run(str(tmp_path), "--no-cache", status=1)
    assert "no file in this folder can be read\n  mend: " in result.stderr
    assert result.stdout == ""
    (tmp_path / "a.out").write_text("x")
    assert "is a file" in run(str(tmp_path / "a.out"), status=2).stderr
