"""An enthalpy of formation from real calculations beside the published one."""

from __future__ import annotations

from pathlib import Path

import pytest

import thermo_pp as tp

STUDY = Path(__file__).parents[1] / "fixtures" / "acetaldehyde" / "study.toml"
ROOM_KJ_MOL, ZERO_KJ_MOL, UNCERTAINTY_KJ_MOL = -165.37, -154.90, 0.16
"""CH3CHO, Active Thermochemical Tables 1.112, as in the package chemicals 1.5.2 (95 % limit 0.32, halved)."""


def test_acetaldehyde_by_an_isodesmic_reaction() -> None:
    formations = tp.Study.load(STUDY).formation()
    assert formations is not None
    (found,) = formations.rows
    assert found.name == "CH3CHO"
    # what B3LYP/6-31G* leaves of such a reaction; common practice, no source
    assert found.room_kj_mol == pytest.approx(ROOM_KJ_MOL, abs=2.0)
    assert found.zero_kj_mol == pytest.approx(ZERO_KJ_MOL, abs=2.0)
    assert found.uncertainty_kj_mol == pytest.approx(3.002, abs=1e-3)
    off = found.room_kj_mol - ROOM_KJ_MOL
    assert abs(off) < 2.0 * (found.uncertainty_kj_mol**2 + UNCERTAINTY_KJ_MOL**2) ** 0.5


def test_the_reaction_is_what_its_members_say() -> None:
    """By hand: the reaction enthalpy from the four enthalpies, then Hess's law with the references."""
    study = tp.Study.load(STUDY)
    formations = study.formation()
    assert formations is not None
    (found,) = formations.rows
    enthalpy = {one.name: float(one.room_enthalpy_kj_mol) for one in study.functions()}
    reaction = enthalpy["C2H6"] + enthalpy["H2CO"] - enthalpy["CH3CHO"] - enthalpy["CH4"]
    assert found.reaction_kj_mol == pytest.approx(reaction, abs=1e-6)
    assert found.room_kj_mol == pytest.approx(-83.78 - 109.16 + 74.534 - reaction, abs=1e-6)
