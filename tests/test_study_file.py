"""The study file: model, schema, docs, loading, and the bundled study."""

from __future__ import annotations

import importlib.util
import json
import shutil
import tomllib
from pathlib import Path
from types import ModuleType
from typing import Any

import jsonschema
import pytest
from declared_study import TEXT, edited, load

from thermo_pp.conditions import Held, StandardState
from thermo_pp.errors import ReadError, StudyError
from thermo_pp.paths import find_paths
from thermo_pp.species import Declared, Structure
from thermo_pp.study.check import check_keys, documented_keys, model_key
from thermo_pp.study.keys import json_schema
from thermo_pp.study.load import Study

ROOT = Path(__file__).parent.parent
PLUME = ROOT / "fixtures" / "stack-plume"
SCHEMA = ROOT / "thermo_pp" / "study" / "schema.json"


def remake() -> ModuleType:
    """Import the script that remakes schema and table."""
    path = ROOT / "docs" / "remake_study_file.py"
    spec = importlib.util.spec_from_file_location(path.stem, path)
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


# --- schema and docs follow the model


def test_the_shipped_schema_is_up_to_date() -> None:
    assert json.loads(SCHEMA.read_text(encoding="utf-8")) == json_schema()


def test_the_table_of_the_docs_is_up_to_date() -> None:
    page = (ROOT / "docs" / "study-file.md").read_text(encoding="utf-8")
    assert remake().page_with_table(page) == page
    rows = [line for line in page.splitlines() if line.startswith("| `")]
    assert len(rows) == len(documented_keys()) == len({row.split(" | ")[0] for row in rows})


def test_a_table_with_a_wrong_row_would_be_seen() -> None:
    page = (ROOT / "docs" / "study-file.md").read_text(encoding="utf-8")
    spoiled = page.replace("| `treatment.onset` | ", "| `treatment.onsett` | ")
    assert spoiled != page
    assert remake().page_with_table(spoiled) == page


ALL_KEYS = """\
title = "every key"
outputs = "."
level = "high"
[levels.high]
energy = "{frequencies}_high.out"
energies = { A = "a_high.out" }
[treatment]
standard_state = "1 bar"
phase = "gas"
low_modes = "harmonic"
onset = 100.0
rotor = "auto"
masses = "program"
imaginary = { real_below = "30 cm^-1" }
frequency_scale = 1
zero_point_scale = 0.98
tunnelling = "wigner"
tunnelling_scale = 0.97
enantiopure = false
entropy_correction = "-10 J/mol/K"
duplicates = "once"
[conditions]
temperatures = { from = "280 K", to = 360, step = "5 K" }
held = { W = "2e-4 mol/L" }
total_pressure = "1 bar"
constant = "pressure"
stated_at = "298.15 K"
driven = false
initial = { A = "0.1 mol/L" }
total = { A = "0.1 mol/L" }
flow = { residence_time = "10 s", feed = { A = "0.1 mol/L" } }
quasi_steady = ["A"]
[species.A]
frequencies = "a.out"
entropy_correction = -10
charge = 0
multiplicity = 1
levels = [[5, "0 cm^-1"], [3, 158.265]]
symmetry_number = 2
isotopes = { 3 = "D", C = "13C" }
rotational_constants = { B = "59.3219 cm^-1", D = "0.04599 cm^-1" }
nuclear_spins = "normal"
imaginary = { real_below = "30 cm^-1" }
standard_state = "1 mol/L"
[species.A.seam]
other = "a_triplet.out"
gradients = ["a_grad.out", [[0.1, "1 hartree/bohr", 0], [0, 0, 0]]]
gradient_difference = [[0.1, 0, 0], [0, 0, 0]]
multiplicity = 3
[species.A.energy]
sum = [{ file = "b.out", method = "MP2", factor = -1 }]
counterpoise = [{ atoms = [1, 2], own = "f.out", ghosts = "g.out" }]
[species.A.energy.extrapolate]
files = ["t.out", "q.out"]
method = "MP2"
correlation = "X^-3"
reference = "largest"
cardinals = [3, 4]
[species.A.energy.solvation]
solvent = "s.out"
gas = "g.out"
value = "-1 kJ/mol"
gas_state = "1 bar"
slope = 1.0
temperature = 298
[[species.A.torsions]]
atoms = [1, 2, 3, 4]
scan = ["a.out"]
fourier = [[3, "6 kJ/mol", 0]]
symmetry_number = 3
mirror = "60 deg"
reduced_moment = 1.5
mode = "210 cm^-1"
[species.W]
composition = "H2O"
enthalpy = "-1 kJ/mol"
entropy = -1.0
heat_capacity = "30 J/mol/K"
temperature = "25 degC"
ground = "-3 kJ/mol"
imaginary_mode = "1200 cm^-1"
deviation = "2 kJ/mol"
relative_to = { A = 1 }
[species.C]
thermal = "nearest"
spin_states = true
[[species.C.conformers]]
frequencies = "a.out"
energy = "b.out"
charge = 0
multiplicity = 1
levels = [[5, "0 cm^-1"], [3, 158.265]]
symmetry_number = 2
isotopes = { 3 = "D", C = "13C" }
rotational_constants = { B = "59.3219 cm^-1", D = "0.04599 cm^-1" }
nuclear_spins = "normal"
imaginary = { real_below = "30 cm^-1" }
seam = { other = "a_triplet.out" }
degeneracy = 2
composition = "H2O"
enthalpy = "-1 kJ/mol"
entropy = -1.0
heat_capacity = "30 J/mol/K"
temperature = "25 degC"
ground = "-3 kJ/mol"
imaginary_mode = "1200 cm^-1"
[species.D]
conformers = { ensemble = "many.xyz" }
[[steps]]
equation = "A = W"
through = "T"
barrier = { scan = "scan.csv" }
deviation = "5 kJ/mol"
permittivity = [["280 K", 84.0], ["360 K", 58.0]]
kind = "crossing"
crossing.transmission = 0.5
crossing.landau_zener = { spin_orbit = 50, gradient_difference = "1 N", reduced_mass = "9 u" }
reaction.anchor = "W"
reaction.free_energy = 1
reaction.equilibrium_constant = "1 mol/L"
reaction.pKa = 3
reaction.potential = "1 V"
reaction.standard_state = "1 bar"
reaction.temperature = 300
reaction.enthalpy = 1
falloff.low = { A = "1 L/mol/s", n = 0.5, E = "-2 kJ/mol" }
falloff.high = { A = "1 s^-1", n = 0.5, E = "-2 kJ/mol" }
falloff.form = "troe"
falloff.centre = [0.6, "100 K", 1000]
falloff.collider = { W = 6 }
rate = "1 s^-1"
arrhenius = { A = "1 s^-1", n = 0.5, E = "-2 kJ/mol" }
viscosity = [["280 K", "1 mPa s"], ["360 K", "0.5 mPa s"]]
tunnelling = "none"
[effective]
reactant = "A"
catalyst = "A"
product = ["W"]
at = "10 %"
rate_law = { A = 1 }
[isotopologues.A]
all = { H = "D" }
species.W = { 2 = "T" }
[[paths]]
name = "x"
steps = [1, -1]
[regimes]
over = "W"
from = "1e-6 mol/L"
to = 0.1
points = 12
[selectivity]
products = ["P", "Q"]
kind = "diastereomeric"
[doubt]
deviation = "4 kJ/mol"
saddle_deviation = 6
correlation = { same_kind = 0.5, across = 0.3 }
pairs = [["A", "T", 0.9]]
samples = 1000
seed = 2
alternatives = false
[formation]
atoms = ["A"]
atomization = ["A"]
reactions = ["A = W"]
reference.A = { enthalpy = "-1 kJ/mol", uncertainty = 0.1, temperature = "0 K", source = "a table" }
reaction_uncertainty = "4 kJ/mol"
spin_orbit = true
"""


def _keys_in(value: Any, path: tuple[str | int, ...] = ()) -> set[str]:
    found: set[str] = set()
    if isinstance(value, dict):
        for name, member in value.items():
            found |= {model_key((*path, name))} | _keys_in(member, (*path, name))
    elif isinstance(value, list):
        for number, member in enumerate(value):
            found |= _keys_in(member, (*path, number))
    return found


def _table_of(value: Any, tables: list[str], last: str) -> dict[str, Any] | None:
    """The first table on this way that has the key; NAME stands for any name."""
    if isinstance(value, list):
        value = value[0]
    if not isinstance(value, dict):
        return None
    if not tables:
        return value if last in value else None
    names = value if tables[0] == "NAME" else [tables[0]]
    found = (_table_of(value[name], tables[1:], last) for name in names if name in value)
    return next((table for table in found if table is not None), None)


def test_every_documented_key_is_taken() -> None:
    data = tomllib.loads(ALL_KEYS)
    check_keys(data, "study.toml")
    documented = {key for key, _, _ in documented_keys()}
    assert documented <= _keys_in(data) | {"treatment", "conditions"}


@pytest.mark.parametrize("key", [key for key, _, _ in documented_keys() if "." in key])
def test_no_key_takes_just_anything(key: str) -> None:
    """Each key in turn is given a date, which no key takes."""
    data = tomllib.loads(ALL_KEYS)
    *tables, last = key.split(".")
    inside = _table_of(data, tables, last)
    assert inside is not None, "the text of all keys lacks this one"
    inside[last] = tomllib.loads("d = 2020-01-01")["d"]
    with pytest.raises(StudyError, match="found datetime") as caught:
        check_keys(data, "study.toml")
    assert caught.value.where.startswith("study.toml [")
    assert last in caught.value.where


def test_the_schema_is_a_schema_and_takes_the_bundled_study() -> None:
    schema = json.loads(SCHEMA.read_text(encoding="utf-8"))
    jsonschema.Draft202012Validator.check_schema(schema)
    for text in ((PLUME / "study.toml").read_text(encoding="utf-8"), TEXT):
        jsonschema.validate(tomllib.loads(text), schema)


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("[conditions]", "[condition]"),
        ('title = "Loss', 'colour = "red"\ntitle = "Loss'),
        ('through = "TS1"', ""),
        ('through = "TS1"', 'through = "TS1"\nbarrier = "none"'),
        ('through = "TS1"', 'through = "TS1"\ntunnelling = "bell"'),
        ('composition = "SO3"', 'composition = "SO3"\nfrequencies = "a.out"'),
        ('composition = "SO3"', ""),
        ('entropy = "256 J/mol/K"', ""),
        ('reactant = "A"', ""),
        ('"1e-3 mol/L"', "1e-3"),
        ('["280 K", "25 degC"]', "[]"),
    ],
)
def test_the_schema_refuses_what_the_loader_refuses(old: str, new: str, tmp_path: Path) -> None:
    text = edited((old, new))
    schema = json.loads(SCHEMA.read_text(encoding="utf-8"))
    with pytest.raises(jsonschema.ValidationError):
        jsonschema.validate(tomllib.loads(text), schema)
    with pytest.raises(StudyError):
        load(tmp_path, text)


# --- declared studies


def test_a_declared_study(tmp_path: Path) -> None:
    study = load(tmp_path, TEXT)
    assert study.title == "Loss of A with the help of W"
    assert study.path == tmp_path / "study.toml"
    assert study.conditions.temperature_k == (280.0, 298.15)
    assert study.conditions.held == {
        "W": Held("concentration", 1e-3, "1e-3 mol/L"),
        "W2": Held("equilibrium", None, "equilibrium"),
    }
    assert study.treatment.standard_state == StandardState("pressure", 1e5, "1 bar")
    assert list(study.species) == ["A", "W", "W2", "C", "P", "TS1", "TS2"]
    assert [model.kind for model in study.species.values()] == ["minimum"] * 5 + ["saddle"] * 2
    assert study.mechanism.reactant == "A"
    assert study.mechanism.products == ("P",)
    assert study.mechanism.composition["W2"] == {"H": 4, "O": 2}
    assert study.mechanism.steps[4].rate == (2e7, 0.0, 0.0)
    assert [step.barrierless for step in study.mechanism.steps] == [True, True, False, False, False]
    water = study.species["W"].at(298.15)
    assert float(water.gibbs_kj_mol[0]) == pytest.approx(-298.15 * 0.188, abs=1e-9, rel=0.0)


def test_a_study_cannot_be_changed(tmp_path: Path) -> None:
    study = load(tmp_path, TEXT)
    with pytest.raises(TypeError):
        study.species["X"] = study.species["A"]  # type: ignore[index]
    with pytest.raises(AttributeError):
        study.title = "x"  # type: ignore[misc]


def test_quantities_are_converted(tmp_path: Path) -> None:
    text = edited(
        ('enthalpy = "-90 kJ/mol"', 'enthalpy = "-10 kcal/mol"'),
        ('entropy = "256 J/mol/K"', "entropy = 256"),
        ('rate = "2e7 L/mol/s"', 'arrhenius = { A = "1e-11 cm^3/s", n = -1, E = "-500 cm^-1" }'),
    )
    study = load(tmp_path, text)
    product, reactant = study.species["P"], study.species["A"]
    assert isinstance(product, Declared)
    assert isinstance(reactant, Declared)
    assert product.enthalpy_kj_mol == pytest.approx(-41.84, rel=1e-14, abs=0.0)
    assert reactant.entropy_j_mol_k == 256.0
    assert study.mechanism.steps[4].rate == pytest.approx(
        (6.02214076e9, -1.0, -500 * 0.01196265656), rel=1e-9, abs=0.0
    )


def test_options_stand_in_place_of_the_file(tmp_path: Path) -> None:
    study = load(
        tmp_path,
        edited(
            ('["280 K", "25 degC"]', '["0 K"]'),
            ("[species.A]", "[treatment]\nonset = 50\n[species.A]"),
        ),
        temperatures=[300, "400 K"],
        treatment={"low_modes": "raised", "standard_state": "1 mol/L"},
    )
    assert study.conditions.temperature_k == (300.0, 400.0)
    assert study.treatment.low_modes == "raised"
    assert study.treatment.onset_cm == 50.0
    assert study.treatment.standard_state.form == "concentration"
    water = study.species["W"]
    assert isinstance(water, Declared)
    assert water.standard_state.form == "concentration"


@pytest.mark.parametrize(
    ("options", "message"),
    [
        ({"treatment": {"low_mods": "raised"}}, r"options \[treatment\] low_mods: unknown key"),
        ({"treatment": {"onset": "1 bra"}}, "onset: '1 bra' is not a quantity in 1/cm"),
        ({"temperatures": ["0 K"]}, "options temperatures: temperature '0 K' is not above 0 K"),
        ({"temperatures": []}, "options temperatures: the list of temperatures is empty"),
    ],
)
def test_options_are_checked_as_the_file_is(
    options: dict[str, object], message: str, tmp_path: Path
) -> None:
    with pytest.raises(StudyError, match=message):
        load(tmp_path, TEXT, **options)


def test_zero_point_scale_follows_the_frequency_scale(tmp_path: Path) -> None:
    one = load(tmp_path, TEXT, treatment={"frequency_scale": 0.97})
    assert one.treatment.zero_point_scale == 0.97
    two = load(tmp_path, TEXT, treatment={"frequency_scale": 0.97, "zero_point_scale": 0.98})
    assert two.treatment.zero_point_scale == 0.98


def test_without_a_title_the_file_s_name_stands(tmp_path: Path) -> None:
    study = load(tmp_path, edited(('title = "Loss of A with the help of W"', "")))
    assert study.title == "study"


def test_a_byte_order_mark_and_windows_line_ends(tmp_path: Path) -> None:
    file = tmp_path / "study.toml"
    file.write_bytes(b"\xef\xbb\xbf" + TEXT.replace("\n", "\r\n").encode())
    assert Study.load(str(file)).title == "Loss of A with the help of W"


def test_a_species_has_its_own_standard_state(tmp_path: Path) -> None:
    text = edited(("[species.W]", '[species.W]\nstandard_state = "55.34 mol/L"'))
    water = load(tmp_path, text).species["W"]
    assert isinstance(water, Declared)
    assert water.standard_state == StandardState("concentration", 55.34, "55.34 mol/L")


def test_relative_to_is_resolved_in_any_order(tmp_path: Path) -> None:
    text = edited(
        ("[species.W2]", "[species.W2]\nrelative_to = { W = 2 }"),
        ('"-35 kJ/mol"\nentropy = "320', '"-35 kJ/mol"\nrelative_to = { P = 1 }\nentropy = "0'),
        ('"-90 kJ/mol"\nentropy = "300', '"-90 kJ/mol"\nrelative_to = { A = 1, W = 1 }\nentropy = "-140'),
    )  # fmt: skip
    study = load(tmp_path, text)
    states = {name: model.at(298.15) for name, model in study.species.items()}
    assert states["P"].enthalpy_kj_mol[0] == pytest.approx(-90.0, abs=1e-9, rel=0.0)
    assert states["P"].entropy_j_mol_k[0] == pytest.approx(256 + 188 - 140, abs=1e-9, rel=0.0)
    assert states["C"].enthalpy_kj_mol[0] == pytest.approx(-125.0, abs=1e-9, rel=0.0)


def test_declared_paths(tmp_path: Path) -> None:
    text = edited(("[effective]", '[[paths]]\nname = "two"\nsteps = [1, 5]\n[effective]'))
    study = load(tmp_path, text)
    (path,), _ = find_paths(study.mechanism, study.conditions.held)
    assert path.name == "two"
    assert [state.name for state in path.states] == ["A + 2 W", "A + W2", "P + W"]


def test_a_path_may_be_all_that_is_asked(tmp_path: Path) -> None:
    start = TEXT.index("[effective]")
    text = TEXT[:start] + '[[paths]]\nname = "two"\nsteps = [2, 3]\n'
    assert load(tmp_path, text).mechanism.reactant is None


def test_a_study_with_steps_alone_loads(tmp_path: Path) -> None:
    assert load(tmp_path, TEXT[: TEXT.index("[effective]")]).mechanism.products == ()


def test_a_catalyst(tmp_path: Path) -> None:
    text = edited(
        ('reactant = "A"\nproduct = "P"', 'catalyst = "C"\nproduct = ["P"]'),
        ('held = { W = "1e-3 mol/L", W2 = "equilibrium" }', 'held = { W = "1e-3 mol/L" }'),
    )
    with pytest.raises(StudyError) as caught:
        load(tmp_path, text)
    assert caught.value.what == "no cycle of C makes P"


def test_a_held_catalyst(tmp_path: Path) -> None:
    text = edited(
        ('reactant = "A"', 'catalyst = "C"'),
        ('W = "1e-3 mol/L"', 'W = "1e-3 mol/L", C = "1 mol/L"'),
    )
    with pytest.raises(StudyError) as caught:
        load(tmp_path, text)
    assert caught.value.what == "the catalyst 'C' is held"


def test_solution(tmp_path: Path) -> None:
    text = edited(
        ("[conditions]", '[treatment]\nphase = "solution"\n[conditions]'),
        ('"W + W = W2"\nbarrier = "none"', '"W + W = W2"\nbarrier = "none"\nviscosity = "0.89 cP"'),
        ('"A + W = C"\nbarrier = "none"',
         '"A + W = C"\nbarrier = "none"\nviscosity = [["280 K", "1.4 mPa s"], ["25 degC", 8.9e-4]]'),
    )  # fmt: skip
    study = load(tmp_path, text)
    assert "solvation-derivative" not in {finding.code for finding in study.findings}
    one, table, *_ = study.mechanism.steps
    assert one.viscosity == ((298.15, pytest.approx(8.9e-4, rel=1e-12, abs=0.0)),)
    assert table.viscosity == (
        (280.0, pytest.approx(1.4e-3, rel=1e-12, abs=0.0)),
        (298.15, 8.9e-4),
    )
    with pytest.raises(StudyError, match="the temperatures of the viscosity do not rise"):
        load(tmp_path, text.replace('"280 K", "1.4', '"300 K", "1.4'))


# --- studies of outputs


@pytest.fixture(scope="module")
def plume() -> Study:
    return Study.load(PLUME / "study.toml")


@pytest.fixture
def copied(tmp_path: Path) -> Path:
    """A copy of the bundled study that a test may spoil."""
    folder = tmp_path / "plume"
    shutil.copytree(PLUME, folder, ignore=shutil.ignore_patterns("inputs", "*qz.out", "*ccsdt.out"))
    return folder


def spoil(folder: Path, *changes: tuple[str, str]) -> Path:
    file = folder / "study.toml"
    text = file.read_text(encoding="utf-8")
    for old, new in changes:
        assert old in text, old
        text = text.replace(old, new, 1)
    file.write_text(text, encoding="utf-8")
    return file


def test_the_bundled_study(plume: Study) -> None:
    assert plume.title == "SO3 hydration in a humid stack plume"
    assert plume.conditions.temperature_k == tuple(float(t) for t in range(280, 361, 5))
    assert list(plume.species) == ["SO3", "W", "W2", "C1", "C2", "acid", "TS1", "TS2"]
    assert all(isinstance(model, Structure) for model in plume.species.values())
    assert plume.mechanism.saddles == ("TS1", "TS2")
    assert plume.mechanism.composition["TS2"] == {"S": 1, "O": 5, "H": 4}
    assert [path.name for path in find_paths(plume.mechanism, plume.conditions.held)[0]] == [
        "SO3 → C1 → acid",
        "SO3 → C2 → acid",
        "SO3 → C1 → C2 → acid",
        "SO3 → C2 → C1 → acid",
    ]
    assert [finding for finding in plume.findings if finding.severity == "error"] == []


def test_the_bundled_water_is_below_saturation(plume: Study) -> None:
    # vapour pressure of water at 280 K, about 9.9 mbar (from memory: handbook value at 7 °C 10.0 mbar)
    water = plume.conditions.held["W"].concentration_mol_l(280.0)
    assert float(water) < 990.0 / (1000.0 * 8.314462618 * 280.0)


def test_the_example_of_the_interface_is_the_bundled_study() -> None:
    """Species, files and steps of the design's example, line by line."""
    data = tomllib.loads((PLUME / "study.toml").read_text(encoding="utf-8"))
    files = {
        "SO3": "so3", "W": "water", "W2": "water-dimer", "C1": "so3-water", "C2": "so3-water2",
        "acid": "h2so4", "TS1": "ts-unassisted", "TS2": "ts-assisted",
    }  # fmt: skip
    assert data["species"] == {
        name: {"frequencies": f"{stem}.out", "energy": f"{stem}_mp2.out"}
        for name, stem in files.items()
    }
    assert [step["equation"] for step in data["steps"]] == [
        "W + W = W2", "SO3 + W = C1", "C1 + W = C2", "SO3 + W2 = C2", "C1 = acid", "C2 = acid + W",
    ]  # fmt: skip
    assert data["effective"] == {"reactant": "SO3", "product": "acid"}


def test_energies_come_from_the_single_points(plume: Study) -> None:
    water = plume.species["W"]
    assert isinstance(water, Structure)
    # Psi4 1.3.2, outputs/water_mp2.out line 330: DF-MP2 total energy
    assert water.energy_hartree == pytest.approx(-76.3288777776018179, abs=1e-12, rel=0.0)
    assert water.files == (
        str(PLUME / "outputs" / "water.out"),
        str(PLUME / "outputs" / "water_mp2.out"),
    )


def test_a_missing_file(copied: Path) -> None:
    file = spoil(copied, ('"so3_mp2.out"', '"so3_mp3.out"'))
    with pytest.raises(StudyError) as caught:
        Study.load(file)
    assert caught.value.where == f"{file} [species.SO3] energy"
    assert caught.value.what == f"there is no file '{copied / 'outputs' / 'so3_mp3.out'}'"
    assert caught.value.mend.startswith("did you mean 'so3_mp2.out'? known files: h2so4.out, ")


@pytest.mark.parametrize("name", ["x" * 300, "so3.out\\u0000", "", ".", "none/so3.out"])
def test_a_name_that_no_file_can_have(name: str, copied: Path) -> None:
    file = spoil(copied, ('"so3.out"', f'"{name}"'))
    with pytest.raises(StudyError, match="there is no file") as caught:
        Study.load(file)
    assert caught.value.where == f"{file} [species.SO3] frequencies"


def test_a_folder_with_a_name_too_long(copied: Path) -> None:
    with pytest.raises(StudyError, match="there is no folder"):
        Study.load(spoil(copied, ('outputs = "outputs"', f'outputs = "{"x" * 300}"')))


@pytest.mark.parametrize("name", ["../../secret.out", "/etc/passwd", "../../plume-2/x.out"])
def test_a_file_outside_the_folder(name: str, copied: Path) -> None:
    file = spoil(copied, ('"so3.out"', f'"{name}"'))
    with pytest.raises(StudyError) as caught:
        Study.load(file)
    assert caught.value.where == f"{file} [species.SO3] frequencies"
    assert caught.value.what == f"{name!r} is outside the folder '{copied / 'outputs'}'"
    assert caught.value.mend == (
        "name a file of that folder, or let `outputs` name the folder it is in"
    )


def test_outputs_may_be_anywhere(tmp_path: Path) -> None:
    file = tmp_path / "study.toml"
    text = (PLUME / "study.toml").read_text(encoding="utf-8")
    outputs = json.dumps(str(PLUME / "outputs"))
    file.write_text(text.replace('outputs = "outputs"', f"outputs = {outputs}"), encoding="utf-8")
    assert len(Study.load(file).species) == 8


def test_without_outputs_files_are_named_from_the_study(copied: Path) -> None:
    text = (copied / "study.toml").read_text(encoding="utf-8")
    text = text.replace('outputs = "outputs"\n', "")
    text = text.replace('frequencies = "', 'frequencies = "outputs/')
    text = text.replace('energy = "', 'energy = "outputs/')
    (copied / "study.toml").write_text(text, encoding="utf-8")
    assert len(Study.load(copied / "study.toml").species) == 8


def test_the_single_point_of_another_molecule(copied: Path) -> None:
    file = spoil(copied, ('energy = "water_mp2.out"', 'energy = "water-dimer_mp2.out"'))
    with pytest.raises(StudyError) as caught:
        Study.load(file)
    outputs = copied / "outputs"
    assert caught.value.where == f"{file} [species.W] energy"
    assert caught.value.what == (
        f"{outputs / 'water-dimer_mp2.out'} is H4O2, but {outputs / 'water.out'} is H2O"
    )


def test_the_single_point_of_another_geometry(copied: Path) -> None:
    file = spoil(copied, ('energy = "h2so4_mp2.out"', 'energy = "so3-water_mp2.out"'))
    with pytest.raises(StudyError, match="have different geometries: ") as caught:
        Study.load(file)
    assert caught.value.where == f"{file} [species.acid] energy"


def test_a_mixture_of_levels_is_a_finding(copied: Path) -> None:
    file = spoil(copied, ('energy = "water_mp2.out"\n', ""))
    study = Study.load(file)
    mixed = {finding.code: finding for finding in study.findings if finding.severity == "error"}
    assert set(mixed) == {"mixed-level"}
    whats = [finding.what for finding in study.findings if finding.code == "mixed-level"]
    assert any(what.startswith("the method of the energies differs: ") for what in whats)
    assert all(str(copied / "outputs" / "water.out") in what for what in whats)


def test_a_declared_species_beside_outputs(copied: Path) -> None:
    text = (copied / "study.toml").read_text(encoding="utf-8")
    old = 'frequencies = "ts-assisted.out"\nenergy = "ts-assisted_mp2.out"'
    assert old in text
    declared = 'composition = "H4SO5"\nenthalpy = "-20 kJ/mol"\nentropy = "-280 J/mol/K"'
    (copied / "study.toml").write_text(text.replace(old, declared), encoding="utf-8")
    with pytest.raises(StudyError) as caught:
        Study.load(copied / "study.toml")
    assert caught.value.what == (
        "TS2 is declared beside species that are read (SO3): their enthalpies do not have one zero"
    )
    assert caught.value.mend == (
        "say what its values are differences from: relative_to = { SO3 = 1, ... }"
    )
    declared += "\nrelative_to = { SO3 = 1, W = 2 }"
    (copied / "study.toml").write_text(text.replace(old, declared), encoding="utf-8")
    study = Study.load(copied / "study.toml")
    saddle, so3, water = (study.species[name].at(298.15) for name in ("TS2", "SO3", "W"))
    relative = saddle.enthalpy_kj_mol - so3.enthalpy_kj_mol - 2.0 * water.enthalpy_kj_mol
    assert relative[0] == pytest.approx(-20.0, abs=1e-6, rel=0.0)


def test_one_frequency_job_for_two_species(copied: Path) -> None:
    text = (copied / "study.toml").read_text(encoding="utf-8")
    text = text.replace('frequencies = "so3-water.out"\nenergy = "so3-water_mp2.out"',
                        'frequencies = "h2so4.out"\nenergy = "h2so4_mp2.out"')  # fmt: skip
    (copied / "study.toml").write_text(text, encoding="utf-8")
    found = [f for f in Study.load(copied / "study.toml").findings if f.code == "same-file-twice"]
    assert [finding.what for finding in found] == [
        "C1 and acid are read from the same frequency job"
    ]


def test_outputs_in_solution_lack_the_derivative_of_solvation(copied: Path) -> None:
    text = (copied / "study.toml").read_text(encoding="utf-8")
    text = text.replace('barrier = "none"', 'barrier = "none"\nviscosity = "0.89 mPa s"')
    (copied / "study.toml").write_text(text, encoding="utf-8")
    study = Study.load(copied / "study.toml", treatment={"phase": "solution"})
    (finding,) = [f for f in study.findings if f.code == "solvation-derivative"]
    assert finding.severity == "warning"
    assert finding.what == (
        "the phase is a solution, and how solvation depends on temperature is not in H, S and the "
        "Arrhenius energies"
    )


def test_a_minimum_named_as_a_saddle_point(copied: Path) -> None:
    file = spoil(copied, ('frequencies = "ts-assisted.out"\nenergy = "ts-assisted_mp2.out"',
                          'frequencies = "so3-water2.out"\nenergy = "so3-water2_mp2.out"'))  # fmt: skip
    with pytest.raises(StudyError, match="TS2"):
        Study.load(file)


def test_a_text_that_is_no_output(copied: Path) -> None:
    (copied / "outputs" / "so3.out").write_text("buy milk\n", encoding="utf-8")
    with pytest.raises(ReadError) as caught:
        Study.load(copied / "study.toml")
    assert caught.value.where.startswith(str(copied / "outputs" / "so3.out"))


def test_own_word_on_imaginary_modes_and_standard_state(copied: Path) -> None:
    file = spoil(
        copied,
        ("[species.W]\n", '[species.W]\nstandard_state = "55 mol/L"\nsymmetry_number = 1\n'
         'imaginary = { real_below = "30 cm^-1" }\n'),
    )  # fmt: skip
    study = Study.load(file)
    water, other = study.species["W"], study.species["W2"]
    assert isinstance(water, Structure)
    assert isinstance(other, Structure)
    assert (water.treatment.real_below_cm, other.treatment.real_below_cm) == (30.0, None)
    assert water.treatment.standard_state.text == "55 mol/L"
    assert water.symmetry_number == 1
    assert other.treatment.standard_state.text == "1 bar"
