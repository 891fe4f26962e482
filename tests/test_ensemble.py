"""Ensemble: one conformer is itself, hands and duplicates count once, shares add up, errors."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
import pytest
from structures import made, masses, turn

from thermo_pp.conditions import MOLAR, Treatment
from thermo_pp.ensemble import Ensemble, block, check_energies, with_nearest_modes
from thermo_pp.errors import StudyError
from thermo_pp.names import LOW_MODES
from thermo_pp.records import Calculation
from thermo_pp.species import Declared, Structure
from thermo_pp.units import CALORIE_J
from thermo_pp.units import GAS_J_MOL_K as R

T = np.array([150.0, 298.15, 600.0])
COLUMNS = (
    "enthalpy_kj_mol",
    "entropy_j_mol_k",
    "gibbs_kj_mol",
    "heat_capacity_j_mol_k",
    "slope_enthalpy_kj_mol",
)


def peroxide(torsion: float, energy_kj_mol: float = 0.0, **changes: Any) -> Calculation:
    """HOOH with this torsion; chiral unless it is 0 or 180 degrees."""
    half = np.radians(torsion / 2.0)
    up, out = 0.97 * np.sin(np.radians(100.0)), 0.97 * np.cos(np.radians(100.0))
    x = [
        [0.0, 0.0, 0.73],
        [0.0, 0.0, -0.73],
        [up * np.cos(half), up * np.sin(half), 0.73 - out],
        [up * np.cos(half), -up * np.sin(half), -0.73 + out],
    ]
    modes = changes.pop(
        "wavenumbers_cm", [120.0 + abs(torsion), 880.0, 1300.0, 1400.0, 3600.0, 3610.0]
    )
    name = changes.pop("name", f"hooh{torsion:g}")
    changes.setdefault("energy_hartree", -151.0 + energy_kj_mol / 2625.4996)
    return made(name, [8, 8, 1, 1], x, modes, sha256=name, **changes)


def structure(calculation: Calculation, **treatment: Any) -> Structure:
    return Structure.make(calculation, Treatment(**treatment), name="X")


def ensemble(*calculations: Calculation, **options: Any) -> Ensemble:
    return Ensemble.make([structure(one) for one in calculations], name="X", **options)


def degeneracies(found: Ensemble) -> list[int]:
    return [member.degeneracy for member in found.members]


def codes(found: Ensemble) -> list[str]:
    return [finding.code for finding in found.findings]


SKEW, MIRROR = peroxide(112.0), peroxide(-112.0)
TRANS = peroxide(180.0, 2.0)


@pytest.mark.parametrize("low_modes", LOW_MODES)
@pytest.mark.parametrize("state", [None, MOLAR])
@pytest.mark.parametrize("calculation", [SKEW, TRANS])
def test_one_conformer_is_that_conformer(
    calculation: Calculation, state: Any, low_modes: Any
) -> None:
    options = {"low_modes": low_modes, "standard_state": state}
    alone = structure(calculation).at(T, **options)
    found = ensemble(calculation).at(T, **options)
    for name in COLUMNS:
        # absolute energies of 4e5 kJ/mol; what is left of a covariance is 1e-10
        assert getattr(found, name) == pytest.approx(getattr(alone, name), rel=1e-13, abs=1e-8)
    assert found.zero_point_kj_mol == alone.zero_point_kj_mol
    assert found.modes().equals(alone.modes())


@pytest.mark.parametrize("low_modes", LOW_MODES)
@pytest.mark.parametrize("state", [None, MOLAR])
def test_shares_and_the_electronic_energy_add_up(state: Any, low_modes: Any) -> None:
    found = ensemble(SKEW, TRANS, peroxide(60.0, 1.0)).at(
        T, low_modes=low_modes, standard_state=state
    )
    assert [row.name for row in found.rows][-2:] == ["conformers", "mixing"]
    assert "handedness" not in [row.name for row in found.rows]
    for name in COLUMNS[:4]:
        total = sum(getattr(row, name) for row in found.rows)
        if name in ("enthalpy_kj_mol", "gibbs_kj_mol"):
            total = total + found.electronic_kj_mol
        assert total == pytest.approx(getattr(found, name), rel=1e-12), name


@pytest.mark.parametrize("low_modes", LOW_MODES)
@pytest.mark.parametrize("state", [None, MOLAR])
def test_cp_and_slope_are_derivatives(state: Any, low_modes: Any) -> None:
    model = ensemble(SKEW, TRANS, peroxide(60.0, 1.0))

    def at(t: Any) -> Any:
        return model.at(t, low_modes=low_modes, standard_state=state)

    step = 0.05
    here, up, down = at(T), at(T + step), at(T - step)
    cp = 1000.0 * (up.enthalpy_kj_mol - down.enthalpy_kj_mol) / (2 * step)
    # differences of absolute energies: 4e5 kJ/mol times 1e-16 over 0.1 K is 1e-6 J/(mol K)
    assert here.heat_capacity_j_mol_k == pytest.approx(cp, abs=1e-4)
    zero = model.ground_kj_mol
    assert zero is not None
    slope = zero - T**2 * (
        (up.gibbs_kj_mol - zero) / (T + step) - (down.gibbs_kj_mol - zero) / (T - step)
    ) / (2 * step)
    assert here.slope_enthalpy_kj_mol == pytest.approx(slope, abs=1e-5)
    assert here.gibbs_kj_mol == pytest.approx(
        here.enthalpy_kj_mol - T * here.entropy_j_mol_k / 1000.0, rel=1e-14
    )


def test_a_chiral_conformer_counts_for_both_hands_unless_both_are_there() -> None:
    one, two = ensemble(SKEW, TRANS), ensemble(SKEW, TRANS, MIRROR)
    assert degeneracies(one) == [2, 1]
    assert degeneracies(two) == [1, 1, 1]
    assert [member.mirror_of for member in two.members] == [2, None, 0]
    assert "both-hands" in codes(two)
    assert two.at(T).gibbs_kj_mol == pytest.approx(one.at(T).gibbs_kj_mol, rel=1e-13)
    expected = structure(SKEW).at(T).gibbs_kj_mol  # R ln 2 once
    assert np.all(one.at(T).gibbs_kj_mol < expected)
    alone = ensemble(SKEW).at(T).gibbs_kj_mol
    assert alone == pytest.approx(expected, rel=1e-13)


def test_one_hand_alone() -> None:
    models = [structure(one, enantiopure=True) for one in (SKEW, peroxide(60.0, 1.0))]
    assert degeneracies(Ensemble.make(models, name="X")) == [1, 1]
    joined = Ensemble.make([*models, structure(TRANS, enantiopure=True)], name="X")
    assert "one-hand-counted" in codes(joined)


def test_duplicates_are_counted_once_only_on_demand() -> None:
    again = peroxide(112.0, name="again")  # turned, atoms in another order
    order = [1, 0, 3, 2]
    again = made(
        "again", again.numbers[order], again.positions_angstrom[order] @ turn([1, 2, 3], 70.0).T,
        again.wavenumbers_cm, energy_hartree=-151.0,
    )  # fmt: skip
    counted, once = (
        ensemble(SKEW, again, MIRROR, TRANS, duplicates=how) for how in ("count", "once")
    )
    assert degeneracies(counted) == [1, 1, 1, 1]
    assert degeneracies(once) == [1, 0, 1, 1]
    assert counted.members[1].same_as == once.members[1].same_as == 0
    severities = [
        next(f.severity for f in found.findings if f.code == "duplicate-conformer")
        for found in (counted, once)
    ]
    assert severities == ["warning", "note"]
    assert once.at(T).gibbs_kj_mol == pytest.approx(ensemble(SKEW, TRANS).at(T).gibbs_kj_mol)
    assert np.all(counted.at(T).gibbs_kj_mol < once.at(T).gibbs_kj_mol - 0.1)
    shares = once.computed(T)[1]
    assert shares.population[1] == pytest.approx(0.0, abs=0.0)
    assert shares.population.sum(axis=0) == pytest.approx(1.0)


def test_a_duplicate_of_the_mirror_image() -> None:
    found = ensemble(SKEW, MIRROR, peroxide(-112.0, name="third"), duplicates="once")
    assert degeneracies(found) == [1, 1, 0]
    assert found.members[2].same_as == 1


def test_the_same_geometry_with_the_label_elsewhere_is_no_duplicate() -> None:
    # HOOD of a skeleton whose ends differ: the deuterium on either side
    numbers, x = [8, 9, 1, 1], SKEW.positions_angstrom
    one, other = masses(numbers), masses(numbers)
    one[2] = other[3] = 2.01410177812
    calculations = [
        made(name, numbers, x, SKEW.wavenumbers_cm, masses_u=u, multiplicity=2, sha256=name)
        for name, u in (("first", one), ("second", other))
    ]
    assert [member.same_as for member in ensemble(*calculations).members] == [None, None]


def test_declared_members_are_n_butane() -> None:
    def declared(kj_mol: float) -> Declared:
        return Declared.make(
            "C4H10", name="butane", kind="minimum", enthalpy_kj_mol=kj_mol, entropy_j_mol_k=0.0,
            standard_state=MOLAR,
        )  # fmt: skip

    models = [declared(0.0), declared(0.660 * CALORIE_J)]
    found = Ensemble.make(models, name="butane", degeneracies=[None, 2])
    at = found.at([298.15])
    # two-state closed form of 660 cal/mol (see test_mixture)
    assert found.computed([298.15])[1].population[1, 0] == pytest.approx(0.39632, abs=6e-6)
    assert at.entropy_j_mol_k[0] == pytest.approx(7.8672, abs=6e-5)
    assert at.heat_capacity_j_mol_k[0] == pytest.approx(2.4684, abs=6e-5)
    assert at.gibbs_kj_mol[0] == pytest.approx(-1.25117, abs=6e-6)
    assert found.ground_kj_mol is None
    assert at.rows == ()


@pytest.mark.parametrize(
    ("models", "said"),
    [
        ([], "X has no conformer"),
        ([SKEW, made("water", [8, 1, 1], [[0, 0, 0.1], [0, 0.76, -0.5], [0, -0.76, -0.5]],
                     [1600.0, 3600.0, 3700.0])],
         "runs/hooh112.out is H2O2, but runs/water.out is H2O1"),
        ([SKEW, peroxide(60.0, charge=2)], "is of charge 0, but runs/hooh60.out is of charge 2"),
        ([SKEW, peroxide(60.0, multiplicity=3)], "of multiplicity 1, but .* of multiplicity 3"),
        ([SKEW, peroxide(60.0, wavenumbers_cm=[-200.0, 880.0, 1300.0, 1400.0, 3600.0, 3610.0])],
         "is a minimum, but runs/hooh60.out is a saddle"),
        ([SKEW, peroxide(60.0, masses_u=[16.0, 16.0, 2.014, 1.008])], "of mass 34.0 u, but"),
    ],
)  # fmt: skip
def test_members_of_different_molecules(models: Sequence[Calculation], said: str) -> None:
    with pytest.raises(StudyError, match=said) as caught:
        ensemble(*models, where="study.toml [species.X]")
    assert caught.value.where == "study.toml [species.X]"
    assert caught.value.mend


def test_spin_states_as_one_species() -> None:
    found = ensemble(SKEW, peroxide(112.0, 0.3, multiplicity=3, name="t"), spin_states=True)
    assert degeneracies(found) == [2, 2]
    assert found.members[1].same_as is None  # of one geometry, and no duplicate
    shares = found.computed([298.15])[1].population[:, 0]
    assert shares[1] / shares[0] == pytest.approx(3.0 * np.exp(-300.0 / (R * 298.15)), rel=1e-6)


def test_isomers_are_doubtful() -> None:
    water_oxide = [[0, 0, 0], [1.5, 0, 0], [-0.3, 0.9, 0.3], [-0.3, -0.9, 0.3]]
    isomer = made("oxywater", [8, 8, 1, 1], water_oxide, SKEW.wavenumbers_cm, sha256="o")
    found = ensemble(SKEW, TRANS, isomer)
    finding = next(f for f in found.findings if f.code == "conformers-differ-in-bonds")
    assert finding.file == "runs/oxywater.out"


def test_blocks_make_no_difference(monkeypatch: pytest.MonkeyPatch) -> None:
    calculations = [peroxide(100.0 + 9.0 * k, 0.4 * k) for k in range(7)]
    whole = ensemble(*calculations)
    expected = whole.at(T), whole.computed(T)[1]
    monkeypatch.setattr(block, "TOGETHER", 2)
    at, shares = whole.at(T), whole.computed(T)[1]
    for name in COLUMNS:
        assert getattr(at, name) == pytest.approx(getattr(expected[0], name), rel=1e-13)
    assert shares.population == pytest.approx(expected[1].population, rel=1e-12)


def test_how_far_the_set_has_converged() -> None:
    model = ensemble(peroxide(60.0, 4.0), SKEW, TRANS)
    found = model.computed(T, missed_kj_mol=5.0)[1]
    assert found.gibbs_by_number_kj_mol[-1] == pytest.approx(model.at(T).gibbs_kj_mol, rel=1e-12)
    assert np.all(np.diff(found.gibbs_by_number_kj_mol, axis=0) < 0.0)
    assert found.lowest_only_gibbs_kj_mol == pytest.approx(found.gibbs_by_number_kj_mol[0])
    alone = structure(SKEW).at(T).gibbs_kj_mol
    assert found.lowest_only_gibbs_kj_mol == pytest.approx(alone, rel=1e-12)
    assert found.needed(1e9).tolist() == [1, 1, 1]
    assert found.needed(1e-12).tolist() == [3, 3, 3]
    # one more conformer 5 kJ/mol above the lowest, really added
    more = np.exp(
        -(found.gibbs_kj_mol.min(axis=0) + 5.0 - model.at(T).gibbs_kj_mol) * 1e3 / (R * T)
    )
    assert found.missed_change_kj_mol == pytest.approx(-R * T * np.log1p(more) / 1e3, rel=1e-6)


def test_members_of_a_saddle_point_are_the_ensemble() -> None:
    def saddle(torsion: float, nu: float, energy: float) -> Calculation:
        modes = [nu, 880.0, 1300.0, 1400.0, 3600.0, 3610.0]
        return peroxide(torsion, energy, wavenumbers_cm=modes)

    model = ensemble(saddle(112.0, -1200.0, 0.0), saddle(180.0, -900.0, 1.5))
    assert model.kind == "saddle"
    members = model.saddle_members(T)
    assert [member.imaginary_cm for member in members] == [1200.0, 900.0]
    at = model.at(T)
    zero = at.gibbs_kj_mol
    weights = [np.exp(-1e3 * (member.gibbs_kj_mol - zero) / (R * T)) for member in members]
    assert sum(weights) == pytest.approx(1.0, rel=1e-7)
    slope = sum(w * m.slope_enthalpy_kj_mol for w, m in zip(weights, members, strict=True))
    assert slope == pytest.approx(at.slope_enthalpy_kj_mol, rel=1e-7)
    assert ensemble(SKEW).saddle_members(T) == ()
    assert model.ground_kj_mol == members[0].ground_kj_mol


# frequencies that are lent ------------------------------------------------------------------------


def test_the_nearest_lends_its_wavenumbers() -> None:
    bare = peroxide(-100.0, 1.0, name="bare", wavenumbers_cm=None)
    lent, source, finding = with_nearest_modes(bare, [TRANS, SKEW], where="here")
    assert lent.wavenumbers_cm == pytest.approx(SKEW.wavenumbers_cm)  # of its mirror image
    assert source == "runs/hooh112.out"
    assert finding.code == "thermal-from-nearest"
    assert finding.severity == "warning"
    assert "runs/hooh112.out" in finding.what
    assert structure(lent).rotor.theta_k != structure(SKEW).rotor.theta_k  # its own geometry


def test_nobody_to_lend() -> None:
    bare = peroxide(-100.0, wavenumbers_cm=None, name="bare")
    with pytest.raises(StudyError, match="no other member has any"):
        with_nearest_modes(bare, [], where="here")


# levels -------------------------------------------------------------------------------------------


def test_energies_of_one_level() -> None:
    low, high = peroxide(60.0, method="HF"), peroxide(60.0, method="MP2")
    silent = peroxide(60.0)

    def parts(*calculations: Calculation) -> list[dict[str, list[Calculation]]]:
        return [{"energy": [calc]} for calc in calculations]

    check_energies(parts(low, silent, low), [True] * 3, name="X", where="here")
    with pytest.raises(StudyError, match=r"HF in .*, MP2 in"):
        check_energies(parts(silent, low, high), [True] * 3, name="X", where="here")
    with pytest.raises(StudyError, match="some conformers have a single point"):
        check_energies(parts(high, low), [False, True], name="X", where="here")
