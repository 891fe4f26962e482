"""What the choices are worth: against the study loaded with each of them, and by hand."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from click.testing import CliRunner

from tests.declared_study import TEXT, edited, load
from thermo_pp.cli import main
from thermo_pp.errors import StudyError
from thermo_pp.study.choices import Choices, Worth
from thermo_pp.study.load import Study
from thermo_pp.units import GAS_J_MOL_K

PLUME = Path(__file__).parents[1] / "fixtures" / "stack-plume" / "study.toml"
T = (280.0, 298.15, 360.0)
RT = GAS_J_MOL_K * np.array(T) / 1000.0


@pytest.fixture(scope="module")
def plume() -> Study:
    return Study.load(PLUME, temperatures=T)


@pytest.fixture(scope="module")
def found(plume: Study) -> Choices:
    return plume.choices()


def row(found: Choices, name: str, quantity: str = "G") -> Worth:
    return next(row for row in found.rows if row.name == name and row.quantity == quantity)


def change(found: Choices, choice: str, instead: str, name: str, quantity: str = "G") -> np.ndarray:
    for a, one in enumerate(found.alternatives):
        if (one.choice, one.instead) == (choice, instead):
            return row(found, name, quantity).change[a]
    raise AssertionError(f"no {choice} {instead}")


def test_what_is_tried(found: Choices) -> None:
    assert [(one.choice, one.instead) for one in found.alternatives] == [
        ("soft modes", "harmonic"),
        ("soft modes", "raised"),
        ("soft modes", "rotor-enthalpy"),
        ("onset", "50 cm^-1"),
        ("onset", "150 cm^-1"),
        ("symmetry number", "1"),
        ("masses", "average"),
        ("rotor", "classical"),
        ("scale factors", "times 0.99"),
        ("scale factors", "times 1.01"),
        ("handedness", "one hand"),
        ("tunnelling", "wigner"),
        ("tunnelling", "eckart"),
        ("level of theory", "MP2/aug-cc-pV(T+d)Z"),
        ("level of theory", "MP2/aug-cc-pV(Q+d)Z"),
        ("level of theory", "CCSD(T)/cc-pV(D+d)Z"),
        ("level of theory", "composite"),
    ]
    assert not any(np.isnan(row.change).any() for row in found.rows)


def test_symmetry_numbers_and_hands_by_hand(found: Choices) -> None:
    """SO3 has symmetry number 6, water 2; both hands of TS1 are worth RT ln 2."""
    assert change(found, "symmetry number", "1", "SO3") == pytest.approx(
        -RT * np.log(6.0), abs=1e-6
    )
    assert change(found, "symmetry number", "1", "W") == pytest.approx(-RT * np.log(2.0), abs=1e-6)
    assert change(found, "handedness", "one hand", "TS1") == pytest.approx(
        RT * np.log(2.0), abs=1e-6
    )
    assert np.all(change(found, "handedness", "one hand", "W") == 0.0)


def test_scale_factors_move_the_zero_point_energy(found: Choices, plume: Study) -> None:
    """SO3, stiff and cold: 1 % of the zero-point energy, thermal terms about a tenth of it."""
    zero_point = plume.species["SO3"].at(280.0).zero_point_kj_mol
    assert zero_point is not None
    up = change(found, "scale factors", "times 1.01", "SO3")
    assert up[0] == pytest.approx(0.01 * zero_point, rel=0.15)
    assert up == pytest.approx(-change(found, "scale factors", "times 0.99", "SO3"), rel=0.02)


def test_a_barrier_changes_by_what_its_species_change(found: Choices) -> None:
    species = {name: row(found, name).change for name in ("C2", "acid", "W", "TS2")}
    forward = row(found, "C2 = acid + W, forward", "G‡").change
    back = row(found, "C2 = acid + W, back", "G‡").change
    assert forward == pytest.approx(species["TS2"] - species["C2"], abs=1e-7)
    assert back == pytest.approx(species["TS2"] - species["acid"] - species["W"], abs=1e-7)


@pytest.mark.parametrize(
    ("choice", "instead", "options"),
    [
        ("soft modes", "harmonic", {"treatment": {"low_modes": "harmonic"}}),
        ("onset", "150 cm^-1", {"treatment": {"onset": 150.0}}),
        ("rotor", "classical", {"treatment": {"rotor": "classical"}}),
        ("tunnelling", "eckart", {"treatment": {"tunnelling": "eckart"}}),
        ("level of theory", "composite", {"level": "composite"}),
    ],
)
def test_as_the_study_loaded_that_way(
    found: Choices, plume: Study, choice: str, instead: str, options: dict[str, Any]
) -> None:
    other = Study.load(PLUME, temperatures=T, **options)
    mine, base = other.effective().rates["pool"], plume.effective().rates["pool"]
    assert mine is not None
    assert base is not None
    assert abs(np.log(mine.rate_constant / base.rate_constant)).max() > 1e-3
    assert change(found, choice, instead, "C2") == pytest.approx(
        other.species["C2"].at(T).gibbs_kj_mol - plume.species["C2"].at(T).gibbs_kj_mol, abs=1e-9
    )
    assert change(found, choice, instead, "pool", "ln k") == pytest.approx(
        np.log(mine.rate_constant / base.rate_constant), abs=1e-9
    )
    assert change(found, choice, instead, "pool", "Ea") == pytest.approx(
        mine.arrhenius_energy_kj_mol - base.arrhenius_energy_kj_mol, abs=1e-8
    )


def test_the_study_itself_stays(plume: Study, found: Choices) -> None:
    assert plume.treatment.low_modes == "rotor-entropy"
    assert row(found, "W").value == pytest.approx(plume.species["W"].at(T).gibbs_kj_mol, abs=0.0)
    assert len(found.table()) == len(found.rows) * len(found.alternatives) * len(T)


def test_other_starting_points() -> None:
    """Harmonic has no onset; scale factors other than 1 are compared with 1; average with program."""
    treatment = {"low_modes": "harmonic", "frequency_scale": 0.96, "masses": "average"}
    study = Study.load(PLUME, temperatures=[298.15], treatment=treatment)
    tried = [(one.choice, one.taken, one.instead) for one in study.choices(scales=()).alternatives]
    assert ("scale factors", "0.96", "1") in tried
    assert ("masses", "average", "program") in tried
    assert "onset" not in {choice for choice, _, _ in tried}


def test_an_altered_key_is_checked(plume: Study) -> None:
    with pytest.raises(StudyError, match="unknown low_modes 'soft'"):
        plume.altered({"low_modes": "soft"}, {})


def test_what_is_declared_does_not_change(tmp_path: Path) -> None:
    study = load(tmp_path, TEXT)
    found = study.choices()
    assert {row.kind for row in found.rows} == {"species", "barrier", "rate"}
    tunnels = np.array([one.choice == "tunnelling" for one in found.alternatives])
    assert list(tunnels).count(True) == 2
    for row in found.rows:  # the saddle points have no imaginary mode, so nothing is made of those
        assert np.isnan(row.change[tunnels]).all()
        assert np.all(row.change[~tunnels] == 0.0)
    told = [finding.what for finding in found.findings]
    assert [what.split(":")[0] for what in told] == [
        "tunnelling cannot be wigner",
        "tunnelling cannot be eckart",
    ]


def test_without_a_question_there_is_no_rate(tmp_path: Path) -> None:
    text = TEXT[: TEXT.index("[effective]")]
    found = load(tmp_path, text).choices()
    assert "rate" not in {row.kind for row in found.rows}
    assert [finding.code for finding in found.findings] == ["choices-without-rate"]


def test_a_choice_that_cannot_be_made(tmp_path: Path) -> None:
    """Held out of balance once symmetry numbers are 1: told, and empty in the table."""
    study = Study.load(PLUME, temperatures=[298.15])
    held = float(study.effective().held_mol_l["W2"][0])
    text = PLUME.read_text(encoding="utf-8").replace('"outputs"', f'"{PLUME.parent / "outputs"}"')
    text = text.replace('W2 = "equilibrium"', f'W2 = "{held!r} mol/L"')
    (tmp_path / "study.toml").write_text(text, encoding="utf-8")
    found = Study.load(tmp_path / "study.toml", temperatures=[298.15]).choices()
    at = [one.choice for one in found.alternatives].index("symmetry number")
    assert all(np.isnan(row.change[at]).all() for row in found.rows)
    told = [finding.what for finding in found.findings if finding.code == "choice-not-made"]
    assert any(what.startswith("symmetry number cannot be 1: ") for what in told)
    hand = [one.choice for one in found.alternatives].index("handedness")
    assert not np.isnan(row(found, "W").change[hand]).any()


@pytest.mark.parametrize("form", ["table", "csv", "json"])
def test_the_command(form: str) -> None:
    done = CliRunner().invoke(main, ["choices", str(PLUME), "-T", "298.15", "--format", form])
    assert done.exit_code == 0, done.stderr
    if form == "json":
        answer = json.loads(done.stdout)
        assert answer["format"] == "thermo-pp/choices/1"
        assert len(answer["quantities"][0]["change"]) == len(answer["alternatives"]) == 17
    else:
        assert "-4.44" in done.stdout  # RT ln 6 of SO3


def test_the_command_with_a_study_that_is_wrong(tmp_path: Path) -> None:
    (tmp_path / "study.toml").write_text(edited(('through = "TS1"', 'through = "TS9"')))
    done = CliRunner().invoke(main, ["choices", str(tmp_path / "study.toml")])
    assert done.exit_code == 1
    assert "unknown saddle point 'TS9'" in done.stderr
