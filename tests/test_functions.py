"""Thermodynamic functions, fits, enthalpies of formation and the phase for Cantera."""

from __future__ import annotations

import warnings
from pathlib import Path
from typing import Any

import cantera
import numpy as np
import pytest
from click.testing import CliRunner

from tests.structures import made, water
from thermo_pp.cli import main
from thermo_pp.conditions import StandardState, Treatment
from thermo_pp.data.atoms import ATOMS
from thermo_pp.errors import StudyError
from thermo_pp.functions.curves import functions
from thermo_pp.functions.fits import DEFAULT_BOUNDS_K, fit
from thermo_pp.functions.formation import (
    FormationQuestion,
    Reaction,
    Reference,
    atom_rise_kj_mol,
    formations,
)
from thermo_pp.functions.phase import gas_phase
from thermo_pp.names import POLYNOMIAL_FORMS, LowModes, PolynomialForm
from thermo_pp.output.cantera_phase import cantera_text
from thermo_pp.species import Declared, SpeciesModel, Structure
from thermo_pp.units import GAS_J_MOL_K

BAR = StandardState("pressure", 1e5, "1 bar")
HARMONIC = Treatment(low_modes="harmonic")
O_LEVELS = [[5, 0.0], [3, 158.265], [1, 226.977], [5, 15867.862]]


def atom(symbol: str, number: int, multiplicity: int, energy: float, **options: Any) -> Structure:
    calculation = made(
        symbol, [number], [[0.0, 0.0, 0.0]], multiplicity=multiplicity, energy_hartree=energy
    )
    return Structure.make(calculation, options.pop("treatment", HARMONIC), name=symbol, **options)


def soft(low_modes: LowModes) -> Structure:
    """A made-up floppy cation: two soft modes."""
    positions = [[0.0, 0.0, 0.1], [0.0, 0.8, -0.5], [0.2, -0.8, -0.5], [1.4, 0.1, 0.6]]
    numbers = np.array([8, 1, 1, 17])
    calculation = made(
        "soft", numbers, np.array(positions), [30.0, 75.0, 700.0, 1594.0, 3657.0, 3755.0], charge=1,
        multiplicity=1, energy_hartree=-536.0,
    )  # fmt: skip
    return Structure.make(calculation, Treatment(low_modes=low_modes), name="soft+")


def oxygen(symmetry_number: int = 2) -> Structure:
    calculation = made(
        "O2", [8, 8], [[0.0, 0.0, 0.0], [0.0, 0.0, 1.2075]], [1556.23], multiplicity=3,
        energy_hartree=-150.2,
    )  # fmt: skip
    return Structure.make(calculation, HARMONIC, name="O2", symmetry_number=symmetry_number)


def declared(name: str = "X", **changes: Any) -> Declared:
    keys: dict[str, Any] = {
        "enthalpy_kj_mol": -50.0,
        "entropy_j_mol_k": 250.0,
        "kind": "minimum",
        "standard_state": BAR,
    }
    return Declared.make("H2O", name=name, **{**keys, **changes})


# --- tables


@pytest.mark.parametrize(
    ("index", "model"),
    [
        ("Ar-001", lambda treatment: atom("Ar", 18, 1, -527.0, treatment=treatment)),
        ("O-001", lambda treatment: atom("O", 8, 3, -75.0, treatment=treatment, levels=O_LEVELS)),
        ("H-001", lambda treatment: atom("H", 1, 2, -0.5, treatment=treatment)),
    ],
)
def test_atoms_against_janaf(index: str, model: Any) -> None:
    """S and -(G-H298)/T to 0.003 J/(mol K), enthalpies to 0.002 kJ/mol: JANAF's last digit, CODATA of 1973.

    Source: package janaf 1.4. Average masses, as the tables have them.
    """
    from janaf import Table

    frame = Table(index).df
    frame = frame.filter(frame["T(K)"].is_in([0.0, 200.0, 298.15, 1000.0, 2000.0]))
    zero, *rows = frame.to_dicts()
    treatment = Treatment(low_modes="harmonic", masses="average")
    got = functions(model(treatment), [row["T(K)"] for row in rows])
    for k, row in enumerate(rows):
        assert got.entropy_j_mol_k[k] == pytest.approx(row["S"], abs=3e-3)
        assert got.gibbs_function_j_mol_k[k] == pytest.approx(row["-[G-H(Tr)]/T"], abs=3e-3)
        assert got.from_room_kj_mol[k] == pytest.approx(row["H-H(Tr)"], abs=2e-3)
        assert got.from_zero_kj_mol is not None
        assert got.from_zero_kj_mol[k] - got.from_room_kj_mol[k] == pytest.approx(
            -zero["H-H(Tr)"], abs=2e-3
        )


def test_identities_of_the_table() -> None:
    got = functions(Structure.make(water(), HARMONIC, name="W"), [200.0, 298.15, 1500.0])
    t = got.temperature_k
    absolute = got.room_enthalpy_kj_mol + got.from_room_kj_mol
    assert got.gibbs_kj_mol == pytest.approx(absolute - t * got.entropy_j_mol_k / 1000.0, rel=1e-14)
    assert got.from_room_kj_mol[1] == 0.0
    assert got.gibbs_function_j_mol_k[1] == pytest.approx(got.entropy_j_mol_k[1], abs=1e-6)
    assert list(got.table()["temperature_k"]) == [200.0, 298.15, 1500.0]


def test_a_declared_species_has_no_zero() -> None:
    got = functions(declared(), [298.15, 400.0])
    assert got.from_zero_kj_mol is None
    assert np.isnan(got.table()["from_zero_kj_mol"]).all()
    assert got.from_room_kj_mol.tolist() == [0.0, 0.0]


# --- fits


@pytest.mark.parametrize("form", POLYNOMIAL_FORMS)
@pytest.mark.parametrize(
    "model",
    [
        Structure.make(water(), HARMONIC, name="W"),
        soft("harmonic"),
        soft("rotor-entropy"),
        oxygen(),
        declared(),
        declared(heat_capacity_j_mol_k=40.0),
        atom("O", 8, 3, -75.0, levels=O_LEVELS),
    ],
    ids=["water", "soft", "soft-rotor", "O2", "declared", "declared-cp", "O"],
)
def test_g_of_a_fit_is_that_of_the_species(form: PolynomialForm, model: SpeciesModel) -> None:
    """0.05 kJ/mol from 200 to 3000 K, on temperatures that were not fitted."""
    got = fit(model, form)
    t = np.linspace(200.0, 3000.0, 997)
    values = got.polynomial.at(t)
    gibbs = (values.enthalpy_j_mol - t * values.entropy_j_mol_k) / 1000.0
    wanted = model.at(t, standard_state=BAR).gibbs_kj_mol
    assert np.abs(gibbs - wanted).max() < 0.05
    assert np.abs(gibbs - wanted).max() <= 1.01 * got.gibbs_kj_mol.value + 1e-6
    assert "fit-poor" not in {finding.code for finding in got.findings}


def test_a_broken_treatment_is_fitted_by_its_slope() -> None:
    got, whole = fit(soft("rotor-entropy"), "nasa9"), fit(soft("rotor-enthalpy"), "nasa9")
    assert got.of_slope
    assert not whole.of_slope
    assert [finding.code for finding in got.findings].count("fit-of-slope") == 1
    slope = soft("rotor-entropy").at(298.15).slope_enthalpy_kj_mol[0]
    assert got.room_enthalpy_kj_mol == pytest.approx(slope, abs=1e-6)
    assert got.polynomial.at(298.15).enthalpy_j_mol == pytest.approx(1000.0 * slope, abs=1e-3)


def test_a_poor_fit_is_found() -> None:
    """From 2 K: the mode of 30 cm^-1 freezes, which no polynomial of this kind follows."""
    got = fit(soft("harmonic"), "shomate", (2.0, 1000.0, 5000.0))
    assert got.gibbs_kj_mol.value > 0.05
    assert "fit-poor" in {finding.code for finding in got.findings}


@pytest.mark.parametrize(
    ("bounds", "what"),
    [
        ((200.0, 3000.0, 1000.0), "does not rise"),
        ((300.0, 1000.0, 3000.0), "does not hold 298.15 K"),
        ((0.0, 1000.0, 3000.0), "does not rise"),
    ],
)
def test_bounds_that_cannot_be(bounds: tuple[float, float, float], what: str) -> None:
    with pytest.raises(StudyError, match=what):
        fit(oxygen(), "nasa7", bounds)


# --- atoms


@pytest.mark.parametrize("symbol", ATOMS)
def test_the_table_of_atoms_against_janaf(symbol: str) -> None:
    """ATcT and JANAF differ by 0.25 kJ/mol at most (N), elements and levels by 0.002.

    Source: package janaf 1.4, first file whose title is the atom and the reference state.
    """
    from janaf import Table

    gas = {
        "H": "H-001", "Li": "Li-005", "Be": "Be-005", "B": "B-005", "C": "C-003", "N": "N-002",
        "O": "O-001", "F": "F-001", "Na": "Na-005", "Mg": "Mg-005", "Al": "Al-005", "Si": "Si-005",
        "P": "P-008", "S": "S-006", "Cl": "Cl-001", "K": "K-005", "Ca": "Ca-006", "Br": "Br-001",
        "I": "I-001", "He": "He-001", "Ne": "Ne-001", "Ar": "Ar-001", "Kr": "Kr-001", "Xe": "Xe-001",
    }  # fmt: skip
    frame = Table(gas[symbol]).df
    zero = frame.filter(frame["T(K)"] == 0.0).to_dicts()[0]
    room = frame.filter(frame["T(K)"] == 298.15).to_dicts()[0]
    own = ATOMS[symbol]
    assert own.formation_kj_mol == pytest.approx(zero["delta-f H"], abs=0.25)
    assert atom_rise_kj_mol(symbol) == pytest.approx(-zero["H-H(Tr)"], abs=2e-3)
    at_room = own.formation_kj_mol + atom_rise_kj_mol(symbol) - own.element_kj_mol
    assert at_room == pytest.approx(room["delta-f H"], abs=0.25)


def test_the_atoms_of_atct_at_room_temperature() -> None:
    """Their own values at 298.15 K, ATcT 1.112 in the package chemicals 1.5.2; elements of JANAF: 0.03."""
    for symbol, value in {
        "H": 217.998, "C": 716.873, "N": 472.435, "O": 249.229, "F": 79.374, "Cl": 121.302,
        "Br": 111.852, "I": 106.757,
    }.items():  # fmt: skip
        own = ATOMS[symbol]
        got = own.formation_kj_mol + atom_rise_kj_mol(symbol) - own.element_kj_mol
        assert got == pytest.approx(value, abs=0.03), symbol


# --- enthalpies of formation


def asked(**changes: Any) -> FormationQuestion:
    keys: dict[str, Any] = {
        "atoms": (),
        "atomization": (),
        "reactions": (),
        "references": {},
        "reaction_uncertainty_kj_mol": None,
        "spin_orbit": False,
        "where": "study.toml [formation]",
    }
    return FormationQuestion(**{**keys, **changes})


def molecules() -> dict[str, SpeciesModel]:
    return {
        "H": atom("H", 1, 2, -0.5),
        "O": atom("O", 8, 3, -75.05),
        "O2": oxygen(),
        "W": Structure.make(water(energy_hartree=-76.42), HARMONIC, name="W"),
    }


def test_atomization_by_hand() -> None:
    """Formation(0) = computed H(0) less that of the atoms plus their formation; shares count twice."""
    species = molecules()
    got = formations(asked(atoms=("H", "O"), atomization=None), species)
    assert [row.name for row in got.rows] == ["O2", "W"]
    fewer = formations(asked(atoms=("H", "O"), atomization=None, isotopologues=("O2",)), species)
    assert [row.name for row in fewer.rows] == ["W"]
    row = got.rows[1]
    e0 = {name: functions(model, 298.15).zero_enthalpy_kj_mol for name, model in species.items()}
    by_hand = e0["W"] - 2 * e0["H"] - e0["O"] + 2 * 216.034 + 246.844  # type: ignore[operator]
    assert row.zero_kj_mol == pytest.approx(by_hand, abs=1e-8)
    rise = functions(species["W"], 298.15).from_zero_kj_mol
    assert rise is not None
    assert row.room_kj_mol == pytest.approx(by_hand + rise[0] - 8.467 - 8.683 / 2, abs=1e-8)
    assert row.shares_kj_mol == {"O": pytest.approx(0.001), "H": 0.0}
    assert got.rows[0].uncertainty_kj_mol == pytest.approx(0.002)
    assert {finding.code for finding in got.findings} == {
        "spin-orbit-left-out",
        "formation-uncertainty",
    }


def test_spin_orbit_lowers_the_atoms() -> None:
    """O: (3 158.265 + 226.977)/9 = 77.974 cm^-1 = 0.9328 kJ/mol for every atom."""
    plain, split = (
        formations(asked(atoms=("H", "O"), atomization=("O2",), spin_orbit=word), molecules())
        for word in (False, True)
    )
    assert plain.rows[0].zero_kj_mol is not None
    assert split.rows[0].zero_kj_mol is not None
    assert split.rows[0].zero_kj_mol - plain.rows[0].zero_kj_mol == pytest.approx(
        2 * 0.93278, abs=1e-4
    )
    assert "spin-orbit-left-out" not in {finding.code for finding in split.findings}


def test_both_routes_agree_where_the_references_do() -> None:
    """By W = 2 H + O with the atoms declared, at 0 K: the same as atomization."""
    split = Reaction({"W": -1, "H": 2, "O": 1}, "study.toml [formation] reactions.1")
    known = {
        "H": Reference(216.034, 0.3, 0.0, "given"),
        "O": Reference(246.844, 0.4, 0.0, "given"),
    }
    species = molecules()
    got = formations(
        asked(
            atoms=("H", "O"),
            reactions=(split,),
            references=known,
            atomization=("W",),
            reaction_uncertainty_kj_mol=1.2,
        ),
        species,
    )
    first, second = got.rows
    assert first.zero_kj_mol == pytest.approx(second.zero_kj_mol, abs=1e-9)
    # 2 x 0.3 for both hydrogens together, 0.4, and 1.2 of the reaction
    assert first.uncertainty_kj_mol == pytest.approx(1.4, abs=1e-12)
    assert got.room_kj_mol["W"] == first.room_kj_mol


def test_references_at_room_temperature_and_mixed_ones() -> None:
    """Elements cancel in a balanced reaction, so 0 K and 298.15 K tell the same story."""
    burn = Reaction({"W": 2, "O2": -1, "H": -4}, "study.toml [formation] reactions.1")
    species = molecules()
    rise = functions(species["O2"], 298.15).from_zero_kj_mol
    assert rise is not None
    warm = formations(
        asked(
            reactions=(burn,),
            references={
                "O2": Reference(0.0, 0.0, 298.15, "zero"),
                "H": Reference(217.998, 0.0, 298.15, "given"),
            },
        ),
        species,
    ).rows[0]
    mixed = formations(
        asked(
            reactions=(burn,),
            references={
                "O2": Reference(8.683 - rise[0], 0.0, 0.0, "zero"),
                "H": Reference(217.998, 0.0, 298.15, "given"),
            },
        ),
        species,
    ).rows[0]
    assert warm.reaction_temperature_k == 298.15
    assert mixed.reaction_temperature_k == 0.0
    assert warm.room_kj_mol == pytest.approx(mixed.room_kj_mol, abs=1e-9)
    assert warm.zero_kj_mol == pytest.approx(mixed.zero_kj_mol, abs=1e-9)
    missing = formations(
        asked(reactions=(burn,), references={
            "O2": Reference(0.0, None, 298.15, "zero"), "H": Reference(218.0, 0.1, 298.15, "given"),
        }),
        species,
    ).rows[0]  # fmt: skip
    assert missing.uncertainty_kj_mol is None


@pytest.mark.parametrize(
    ("changes", "what"),
    [
        ({"reactions": (Reaction({"W": -1, "H": 2}, "here"),)}, "does not balance: O -1"),
        (
            {"reactions": (Reaction({"W": -1, "H": 2, "O": 1}, "here"),)},
            "W and H and O have no reference value",
        ),
        (
            {
                "reactions": (Reaction({"O2": -1, "O": 2}, "here"),),
                "references": {n: Reference(0.0, 0.0, 298.15, "") for n in ("O", "O2")},
            },
            "no species lacks a reference value",
        ),
        ({"atoms": ("W",)}, "W is no neutral atom"),
        ({"atoms": ("H", "H2nd")}, "both the atom H"),
        ({"atoms": ("H",), "atomization": ("W",)}, "holds O, which is not among the atoms"),
        ({"atoms": ("Fe",)}, "the table of atoms does not have Fe"),
        (
            {
                "atoms": ("H", "O"),
                "reactions": (Reaction({"X": -1, "H": 2, "O": 1}, "here"),),
            },
            "X has no H\\(0\\)",
        ),
    ],
)
def test_formation_that_cannot_be(changes: dict[str, Any], what: str) -> None:
    species = {**molecules(), "X": declared(), "H2nd": atom("H", 1, 2, -0.5)}
    species["Fe"] = atom("Fe", 26, 5, -1263.0)
    with pytest.raises(StudyError, match=what):
        formations(asked(**changes), species)


# --- Cantera


def loaded(text: str, folder: Path) -> cantera.Solution:
    """Load a phase; what Cantera would warn of is an error."""
    file = folder / "gas.yaml"
    file.write_text(text, encoding="utf-8")
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        return cantera.Solution(str(file))


@pytest.mark.parametrize("form", POLYNOMIAL_FORMS)
def test_cantera_gives_back_g(form: PolynomialForm, tmp_path: Path) -> None:
    """0.05 kJ/mol from 200 to 3000 K of every species, on the zero that the file states."""
    models: dict[str, SpeciesModel] = {
        **molecules(),
        "soft+": soft("rotor-entropy"),
        'No: "x", \u00e9': declared('No: "x", \u00e9', enthalpy_kj_mol=-2.005e5),
        "TS": declared("TS", kind="saddle"),
    }
    phase = gas_phase(models, form, DEFAULT_BOUNDS_K, title="a: b", phase="gas", where="here")
    gas = loaded(cantera_text(phase), tmp_path)
    assert gas.name == "a: b"
    assert gas.species_names == [name for name in models if name != "TS"]
    assert gas.species("soft+").composition == {"O": 1.0, "H": 2.0, "Cl": 1.0, "E": -1.0}
    for t in (200.0, 298.15, 600.0, 1000.0, 1700.0, 3000.0):
        gas.TP = t, 1e5
        got = gas.standard_gibbs_RT * GAS_J_MOL_K * t / 1000.0
        for k, one in enumerate(phase.species):
            wanted = models[one.name].at(t, standard_state=BAR).gibbs_kj_mol[0] + one.shift_kj_mol
            assert got[k] == pytest.approx(wanted, abs=0.05, rel=0.0), one.name
    assert max(abs(one.polynomial.at(298.15).enthalpy_j_mol) for one in phase.species) < 1e6
    assert cantera_text(phase) == cantera_text(
        gas_phase(models, form, DEFAULT_BOUNDS_K, title="a: b", phase="gas", where="here")
    )


def test_a_balanced_reaction_is_the_same_in_the_file(tmp_path: Path) -> None:
    """2 W = O2 + 4 H, G to 0.01 kJ/mol: the zero that is taken off each atom cancels."""
    models = molecules()
    phase = gas_phase(models, "nasa9", DEFAULT_BOUNDS_K, title="g", phase="gas", where="here")
    gas = loaded(cantera_text(phase), tmp_path)
    gas.TP = 500.0, 1e5
    g = dict(zip(gas.species_names, gas.standard_gibbs_RT * GAS_J_MOL_K * 0.5, strict=True))
    own = {name: model.at(500.0).gibbs_kj_mol[0] for name, model in models.items()}
    change = {"W": -2, "O2": 1, "H": 4}
    assert sum(n * g[name] for name, n in change.items()) == pytest.approx(
        sum(n * own[name] for name, n in change.items()), abs=0.01
    )


def test_formation_is_the_zero_where_every_minimum_has_it() -> None:
    models = molecules()
    room = formations(asked(atoms=("H", "O"), atomization=None), models).room_kj_mol
    phase = gas_phase(
        models, "nasa7", DEFAULT_BOUNDS_K, title="g", phase="gas", formation_kj_mol=room, where="x"
    )
    assert phase.of_formation
    assert "enthalpy of formation" in cantera_text(phase)
    for one in phase.species:
        assert one.polynomial.at(298.15).enthalpy_j_mol == pytest.approx(
            1000.0 * room[one.name], abs=1e-3
        )
    del room["W"]
    partly = gas_phase(
        models, "nasa7", DEFAULT_BOUNDS_K, title="g", phase="gas", formation_kj_mol=room, where="x"
    )
    assert not partly.of_formation
    assert [finding.code for finding in partly.findings].count("phase-zero") == 1


def test_what_is_no_gas_phase() -> None:
    with pytest.raises(StudyError, match="solution"):
        gas_phase(molecules(), "nasa7", DEFAULT_BOUNDS_K, title="", phase="solution", where="x")
    saddle: dict[str, SpeciesModel] = {"TS": declared("TS", kind="saddle")}
    with pytest.raises(StudyError, match="no minimum"):
        gas_phase(saddle, "nasa7", DEFAULT_BOUNDS_K, title="", phase="gas", where="x")


# --- the command and the study

OUTPUTS = Path(__file__).parents[1] / "fixtures" / "nwchem" / "good"
STUDY = f"""\
outputs = "{OUTPUTS}"
[conditions]
temperatures = ["298.15 K", "1000 K"]
[species.W]
frequencies = "water_b3lyp_opt_freq.out"
[species.V]
composition = "H2O"
enthalpy = "10 kJ/mol"
entropy = 5.0
relative_to = {{ W = 1 }}
[species.O]
frequencies = "oxygen_atom_b3lyp_freq.out"
[species.O2]
frequencies = "oxygen_triplet_b3lyp_opt_freq.out"
[[steps]]
equation = "W = V"
rate = "1 s^-1"
[formation]
atoms = ["O"]
atomization = ["O2"]
reactions = ["V = W"]
[formation.reference]
W = {{ enthalpy = "-241.8 kJ/mol", uncertainty = 0.04, source = "a table" }}
"""


def run(folder: Path, text: str, *options: str) -> Any:
    file = folder / "study.toml"
    file.write_text(text, encoding="utf-8")
    return CliRunner().invoke(main, ["functions", str(file), *options])


def test_the_command_with_a_study(tmp_path: Path) -> None:
    import json

    target = tmp_path / "gas.yaml"
    done = run(tmp_path, STUDY, "--format", "json", "--fit", "nasa9", "--cantera", str(target))
    assert done.exit_code == 0, done.stderr
    answer = json.loads(done.stdout)
    assert answer["format"] == "thermo-pp/functions/1"
    assert [one["name"] for one in answer["species"]] == ["W", "V", "O", "O2"]
    assert answer["species"][1]["enthalpy_from_0_kj_mol"] is None
    assert len(answer["species"][0]["fit"]["coefficients"][0]) == 9
    first, second = answer["formation"]["derived"]
    # V lies 10 kJ/mol above W by declaration
    assert first["room_kj_mol"] == pytest.approx(-231.8, abs=1e-9)
    assert first["uncertainty_kj_mol"] == pytest.approx(0.04, abs=1e-12)
    assert (second["name"], second["route"]) == ("O2", "atomization")
    gas = cantera.Solution(str(target))
    gas.TP = 298.15, 1e5
    enthalpies = gas.standard_enthalpies_RT * GAS_J_MOL_K * 0.29815
    # the default soft-mode treatment moves the slope of G by 2e-5 kJ/mol
    assert enthalpies[:2] == pytest.approx([-241.8, -231.8], abs=1e-4)
    assert enthalpies[2] == pytest.approx(249.23, abs=0.01)  # ATcT


@pytest.mark.parametrize("form", ["table", "csv", "markdown", "latex"])
def test_the_command_in_every_format(form: str, tmp_path: Path) -> None:
    done = run(tmp_path, STUDY, "--format", form, "--fit", "shomate")
    assert done.exit_code == 0, done.stderr
    assert "-231.8" in done.stdout


@pytest.mark.parametrize(
    ("old", "new", "what"),
    [
        ('atoms = ["O"]', 'atoms = ["Q"]', "'Q' is no species of this study"),
        ('["V = W"]', '["V = 2 W"]', "does not balance: H +2, O +1"),
        ('["V = W"]', "[]", None),
        ('atomization = ["O2"]', "", "no step uses the species 'O2'"),
        ("uncertainty = 0.04", "uncertainty = -0.04", "is below 0"),
        ("uncertainty = 0.04", 'temperature = "300 K"', "at '300 K' is not taken"),
        ('atoms = ["O"]\natomization = ["O2"]\nreactions = ["V = W"]', "", "neither atoms nor"),
        (
            'frequencies = "oxygen_triplet_b3lyp_opt_freq.out"',
            'frequencies = "oxygen_triplet_b3lyp_opt_freq.out"\nisotopes = { 1 = "18O" }',
            "O2 has isotopes of its own",
        ),
        ("[formation]", "[formation]\natomisation = []", "unknown key 'atomisation'"),
        ('atoms = ["O"]', "", "no step uses the species 'O'"),
    ],
)
def test_a_formation_that_is_wrong(old: str, new: str, what: str | None, tmp_path: Path) -> None:
    assert old in STUDY
    done = run(tmp_path, STUDY.replace(old, new))
    assert (done.exit_code == 0) == (what is None)
    if what is not None:
        assert what in done.stderr
        assert "mend:" in done.stderr


def test_enthalpies_of_formation_need_no_steps(tmp_path: Path) -> None:
    """Only what asks for a mechanism says that there is none; a species nobody names is still found."""
    text = STUDY[: STUDY.index("[[steps]]")] + STUDY[STUDY.index("[formation]") :]
    done = run(tmp_path, text)
    assert done.exit_code == 0, done.stderr
    assert "-231.80" in done.stdout
    for command, said in {
        "profile": "nothing says where a path begins",
        "barrier": "does not say what the rate is of",
    }.items():
        other = CliRunner().invoke(main, [command, str(tmp_path / "study.toml")])
        assert other.exit_code == 1
        assert said in other.stderr
        assert "mend:" in other.stderr
    idle = run(tmp_path, text.replace('reactions = ["V = W"]', ""))
    assert "no step uses the species 'V'" in idle.stderr
    bare = run(tmp_path, text[: text.index("[formation]")])
    assert "the key 'steps' is missing" in bare.stderr


def test_wrong_usage(tmp_path: Path) -> None:
    assert run(tmp_path, STUDY, "--fit-range", "200", "1000", "3000").exit_code == 2
    assert run(tmp_path, STUDY, str(OUTPUTS / "water_hf_freq.out")).exit_code == 2
    done = run(tmp_path, STUDY, "--fit", "nasa7", "--fit-range", "300", "1000", "3000")
    assert done.exit_code == 1
    assert "does not hold 298.15 K" in done.stderr


def test_the_command_with_outputs() -> None:
    file = str(OUTPUTS / "water_b3lyp_opt_freq.out")
    done = CliRunner().invoke(main, ["functions", file, "-T", "298.15", "--no-cache"])
    assert done.exit_code == 0
    assert "188.957" in done.stdout
    nothing = CliRunner().invoke(
        main, ["functions", str(OUTPUTS / "water_hf_energy.out"), "--no-cache"]
    )
    assert nothing.exit_code == 1
