"""Torsions, conformers, tunnelling and levels made otherwise: as a file with those keys changed by hand."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from declared_study import TEXT, edited, load

from thermo_pp.ensemble import Ensemble
from thermo_pp.study.choices import Choices
from thermo_pp.study.load import Study

FIXTURES = Path(__file__).parents[1] / "fixtures"
T = np.array([250.0, 298.15, 600.0])
KELVIN = 'temperatures = ["250 K", "298.15 K", "600 K"]\n'
OTHER = """\
[species.P]
composition = "{formula}"
enthalpy = "-10 kJ/mol"
entropy = "0 J/mol/K"
relative_to = {{ X = 1 }}
[[steps]]
equation = "X = P"
rate = "5 s^-1"
"""


def study(folder: Path, formula: str, *species: str) -> Study:
    text = f"[conditions]\n{KELVIN}[species.X]\n" + "\n".join(species) + "\n"
    return load(folder, text + OTHER.format(formula=formula))


def linked(folder: Path, kind: str, pattern: str) -> None:
    for path in (FIXTURES / kind / "outputs").glob(pattern):
        (folder / path.name).symlink_to(path)


def change(found: Choices, choice: str, name: str, quantity: str = "G") -> np.ndarray:
    """Return the change of one quantity with the only alternative of this choice."""
    [a] = [a for a, one in enumerate(found.alternatives) if one.choice == choice]
    [row] = [row for row in found.rows if (row.name, row.quantity) == (name, quantity)]
    return row.change[a]


def test_torsions_as_vibrations(tmp_path: Path) -> None:
    linked(tmp_path, "torsions", "hydrogen_peroxide*")
    scan = ", ".join(f'"hydrogen_peroxide_scan_{angle:03}.out.gz"' for angle in range(0, 181, 20))
    torsion = f'[{{ atoms = [1, 2, 3, 4], scan = [{scan}], mirror = "0 deg" }}]'
    job = 'frequencies = "hydrogen_peroxide_freq.out.gz"'
    own = study(tmp_path, "H2O2", job, f"torsions = {torsion}")
    found = own.choices()
    by_hand = study(tmp_path, "H2O2", job)
    worth = by_hand.species["X"].at(T).gibbs_kj_mol - own.species["X"].at(T).gibbs_kj_mol
    assert np.all(abs(worth) > 0.05)
    assert change(found, "torsions", "X") == pytest.approx(worth, abs=1e-9)
    # what stands on X moves with it
    assert change(found, "torsions", "P") == pytest.approx(worth, abs=1e-9)
    one = study(tmp_path, "H2O2", f"conformers = [{{ {job}, torsions = {torsion} }}]")
    assert change(one.choices(), "torsions", "X") == pytest.approx(worth, abs=1e-9)
    assert "torsions" not in [made.choice for made in by_hand.choices().alternatives]


def test_the_lowest_conformer_alone(tmp_path: Path) -> None:
    """The stretched conformer, which is not the first of the list; gg is chiral, both hands."""
    linked(tmp_path, "n-pentane", "*.out")
    row = '{{ frequencies = "{0}.out", energy = "{0}_mp2.out" }}'.format
    own = study(tmp_path, "C5H12", f"conformers = [{row('gg')}, {row('tt')}, {row('tg')}]")
    found = own.choices()
    by_hand = study(tmp_path, "C5H12", f"conformers = [{row('tt')}]")
    worth = by_hand.species["X"].at(T).gibbs_kj_mol - own.species["X"].at(T).gibbs_kj_mol
    assert np.all(worth > 1.0)
    assert change(found, "conformers", "X") == pytest.approx(worth, abs=1e-9)
    assert change(found, "conformers", "P") == pytest.approx(worth, abs=1e-9)
    assert "conformers" not in [one.choice for one in by_hand.choices().alternatives]
    chiral = study(tmp_path, "C5H12", f"conformers = [{row('gx')}, {row('gg')}]")
    alone = chiral.altered({}, {}, lowest_only=True)
    again = Study.from_recipe(alone.recipe())
    assert np.array_equal(
        again.species["X"].at(T).gibbs_kj_mol, alone.species["X"].at(T).gibbs_kj_mol
    )
    by_hand = study(tmp_path, "C5H12", f"conformers = [{row('gg')}]")
    assert alone.species["X"].at(T).gibbs_kj_mol == pytest.approx(
        by_hand.species["X"].at(T).gibbs_kj_mol, abs=1e-9
    )


def test_the_lowest_conformer_has_frequencies_of_another(tmp_path: Path) -> None:
    linked(tmp_path, "n-pentane", "*.out")
    own = study(
        tmp_path,
        "C5H12",
        'conformers = [{ frequencies = "tg.out", energy = "tg_mp2.out" }, { energy = "tt_mp2.out" }]',
        'thermal = "nearest"',
    )
    model = own.species["X"]
    assert isinstance(model, Ensemble)
    assert model.lowest.file.endswith("tt_mp2.out")
    worth = model.lowest.model.at(T).gibbs_kj_mol - model.at(T).gibbs_kj_mol
    assert change(own.choices(), "conformers", "X") == pytest.approx(worth, abs=1e-9)


TUNNELS = edited(
    ('enthalpy = "80 kJ/mol"', 'enthalpy = "35 kJ/mol"'),  # so that both ways count
    ('entropy = "310 J/mol/K"', 'entropy = "310 J/mol/K"\nimaginary_mode = "1400 cm^-1"'),
    ('entropy = "370 J/mol/K"', 'entropy = "370 J/mol/K"\nimaginary_mode = "900 cm^-1"'),
    ('through = "TS2"', 'through = "TS2"\ntunnelling = "wigner"'),
)


def test_a_step_s_own_word_on_tunnelling_gives_way(tmp_path: Path) -> None:
    """One step tunnels by its own key; "none" and "wigner" are set for both, "eckart" is refused."""
    own = load(tmp_path, TUNNELS)
    found = own.choices()
    tried = {
        one.instead: a for a, one in enumerate(found.alternatives) if one.choice == "tunnelling"
    }
    assert list(tried) == ["none", "wigner", "eckart"]
    assert {found.alternatives[a].taken for a in tried.values()} == {"none and wigner"}
    [row] = [row for row in found.rows if (row.name, row.quantity) == ("free", "ln k")]
    base = own.effective().rates["free"]
    assert base is not None
    for name, text in (
        ("none", TUNNELS.replace('\ntunnelling = "wigner"', "")),
        ("wigner", TUNNELS.replace('through = "TS1"', 'through = "TS1"\ntunnelling = "wigner"')),
    ):
        other = load(tmp_path, text).effective().rates["free"]
        assert other is not None
        worth = np.log(other.rate_constant / base.rate_constant)
        assert row.change[tried[name]] == pytest.approx(worth, abs=1e-9)
        assert np.all(abs(worth) > 1e-4)
    assert np.isnan(row.change[tried["eckart"]]).all()
    [refused] = [one for one in found.findings if one.code == "choice-not-made"]
    assert refused.what.startswith("tunnelling cannot be eckart: the Eckart barrier of ")
    assert all(
        np.all(row.change[tried["wigner"]] == 0.0) for row in found.rows if row.kind != "rate"
    )


def test_without_a_rate_no_tunnelling_is_tried(tmp_path: Path) -> None:
    found = load(tmp_path, TEXT[: TEXT.index("[effective]")]).choices()
    assert "tunnelling" not in [one.choice for one in found.alternatives]


def test_levels_beside_a_level_in_use(tmp_path: Path) -> None:
    """The level in use is not tried again; one whose outputs are missing is told, not passed over."""
    linked(tmp_path, "n-pentane", "*.out")
    levels = "".join(
        f'[levels.{name}]\nenergy = "{{frequencies}}{end}.out"\n'
        for name, end in (("low", ""), ("high", "_mp2"), ("lost", "_none"))
    )
    text = (
        f'level = "high"\n[conditions]\n{KELVIN}{levels}'
        '[species.X]\nfrequencies = "tg.out"\n[species.Y]\nfrequencies = "tt.out"\n'
        '[[steps]]\nequation = "X = Y"\nrate = "1 s^-1"\n'
    )
    own = load(tmp_path, text)
    found = own.choices()
    tried = [one for one in found.alternatives if one.choice == "level of theory"]
    assert [(one.taken, one.instead) for one in tried] == [("high", "low"), ("high", "lost")]
    by_hand = load(tmp_path, text.replace('level = "high"', 'level = "low"'))
    at = found.alternatives.index(tried[0])
    for row in found.rows:
        worth = by_hand.species[row.name].at(T).gibbs_kj_mol - row.value
        assert row.change[at] == pytest.approx(worth, abs=1e-9)
        assert np.isnan(row.change[at + 1]).all()
    told = [one.what for one in found.findings if one.code == "choice-not-made"]
    assert len(told) == 1
    assert told[0].startswith("level of theory cannot be lost: ")
