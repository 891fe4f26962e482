"""Species: the rules of one structure, standard states, declared species, findings and errors."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from ase.build import molecule
from structures import built, made, turn, water

from thermo_pp.conditions import MOLAR, StandardState, Treatment, standard_state
from thermo_pp.data.levels import KNOWN_LEVELS
from thermo_pp.errors import StudyError
from thermo_pp.formulas.normal_modes import normal_modes
from thermo_pp.names import LOW_MODES
from thermo_pp.readers import read
from thermo_pp.records import Calculation, Printed
from thermo_pp.species import (
    Declared,
    Structure,
    Thermochemistry,
    low_mode_spread_kj_mol,
    parse_composition,
    parse_imaginary,
    thermochemistry,
)
from thermo_pp.species.many import grounds, many
from thermo_pp.units import CALORIE_J, HARTREE_KJ_MOL, KELVIN_PER_CM
from thermo_pp.units import GAS_J_MOL_K as R

T = np.array([150.0, 298.15, 350.0, 900.0])
SOFT = [22.0, 60.0, 130.0, 880.0, 1300.0, 3600.0]


def peroxide(wavenumbers: Any = SOFT, **changes: Any) -> Calculation:
    atoms = molecule("H2O2")
    return made("peroxide", atoms.numbers, atoms.positions, wavenumbers, **changes)


def with_hessian(calc: Calculation) -> Calculation:
    """The same with a spring Hessian, and the wavenumbers that follow from it."""
    n, x = len(calc.numbers), calc.positions_angstrom
    hessian = np.zeros((n, 3, n, 3))
    for i in range(n):
        for j in range(i):
            e = x[i] - x[j]
            block = 0.1 * (1 + j) * np.outer(e, e) / (e @ e)
            hessian[i, :, i, :] += block
            hessian[j, :, j, :] += block
            hessian[i, :, j, :] -= block
            hessian[j, :, i, :] -= block
    flat = hessian.reshape(3 * n, 3 * n)
    nu = normal_modes(flat, calc.masses_u, x).wavenumbers_cm
    return made("hessian", calc.numbers, x, nu, masses_u=calc.masses_u, hessian_hartree_bohr2=flat)


def codes(found: Thermochemistry | Structure) -> list[str]:
    return [finding.code for finding in found.findings]


def structure(calc: Calculation, **changes: Any) -> Structure:
    return Structure.make(calc, Treatment(**changes), name="X")


# one structure ------------------------------------------------------------------------------------


def test_water_by_the_book() -> None:
    """checks.md 1, H2O classical at 298.15 K, 1 bar: sums of its rows, geometry replaced by B's."""
    found = thermochemistry(water(), rotor="classical", low_modes="harmonic")
    table = found.parts().set_index("part")
    assert table.loc["translation", "entropy_j_mol_k"] == pytest.approx(144.9135, abs=0.01)
    assert table.loc["rotation", "entropy_j_mol_k"] == pytest.approx(43.77, abs=0.1)
    assert table.loc["vibration", "entropy_j_mol_k"] == pytest.approx(0.0329, abs=6e-5)
    assert found.heat_capacity_j_mol_k[0] == pytest.approx(33.4821, abs=6e-5)
    assert found.zero_point_kj_mol == pytest.approx(53.8782, abs=6e-5)
    assert (found.symmetry_number, found.symmetry_origin, found.rotor) == (
        2,
        "derived",
        "nonlinear",
    )
    assert found.electronic_kj_mol == pytest.approx(-76.4 * HARTREE_KJ_MOL, rel=1e-15)


@pytest.mark.parametrize("low_modes", LOW_MODES)
@pytest.mark.parametrize("state", ["1 bar", "1 atm", "1 mol/L"])
def test_identities(low_modes: str, state: str) -> None:
    """G = H - TS, Cp = dH/dT, slope = -T^2 d(G/T)/dT; S = -dG/dT where the treatment keeps it."""
    calc, h = peroxide(energy_hartree=0.0), 1e-3
    here, above, below = (
        thermochemistry(calc, list(t), low_modes=low_modes, standard_state=state)
        for t in (T, T + h, T - h)
    )
    gibbs = here.enthalpy_kj_mol - T * here.entropy_j_mol_k / 1000.0
    assert here.gibbs_kj_mol == pytest.approx(gibbs, rel=1e-13)
    rise = (above.enthalpy_kj_mol - below.enthalpy_kj_mol) / (2 * h) * 1000.0
    assert here.heat_capacity_j_mol_k == pytest.approx(rise, rel=1e-6)
    bend = (above.gibbs_kj_mol / (T + h) - below.gibbs_kj_mol / (T - h)) / (2 * h)
    assert here.slope_enthalpy_kj_mol == pytest.approx(-(T**2) * bend, rel=1e-6, abs=1e-5)
    slope = -(above.gibbs_kj_mol - below.gibbs_kj_mol) / (2 * h) * 1000.0
    if state == "1 mol/L":
        slope = slope + R  # checks.md 3: at fixed concentration -dG/dT = S - R
    holds = np.abs(here.entropy_j_mol_k - slope).max() < 1e-4
    assert holds == (low_modes != "rotor-entropy")


def test_vectorised_is_scalar() -> None:
    together = thermochemistry(peroxide(), list(T))
    for k, t in enumerate(T):
        alone = thermochemistry(peroxide(), float(t))
        assert alone.gibbs_kj_mol.shape == (1,)
        for name in ("enthalpy_kj_mol", "entropy_j_mol_k", "gibbs_kj_mol", "slope_enthalpy_kj_mol"):
            assert getattr(together, name)[k] == pytest.approx(getattr(alone, name)[0], rel=1e-14)


def test_temperatures_as_users_write_them() -> None:
    import pint

    unit = pint.UnitRegistry()
    for value in (350.0, "350 K", "76.85 degC", np.float64(350.0), unit.Quantity(350.0, "K")):
        found = thermochemistry(water(), value)
        assert found.temperature_k == pytest.approx([350.0], abs=1e-9)
    listed = thermochemistry(water(), [298.15, "350 K", unit.Quantity(400.0, "K")])
    assert listed.temperature_k == pytest.approx([298.15, 350.0, 400.0], abs=1e-9)
    array = thermochemistry(water(), unit.Quantity([300.0, 400.0], "K"))
    assert array.temperature_k == pytest.approx([300.0, 400.0], abs=1e-9)
    assert thermochemistry(water()).temperature_k == pytest.approx([298.15])


@pytest.mark.parametrize(
    ("temperature", "molar", "atm"),
    [  # checks.md 3, "[V: computed]", kJ/mol: 1 bar -> 1 mol/L and 1 atm -> 1 bar
        (273.15, 7.09228, -0.029894),
        (298.15, 7.95850, -0.032630),
        (373.15, 10.65663, -0.040839),
        (500.0, 15.49581, -0.054722),
        (1000.0, 36.75476, -0.109443),
    ],
)
def test_standard_states(temperature: float, molar: float, atm: float) -> None:
    calc = water(energy_hartree=0.0)
    bar, mole, atmosphere = (
        thermochemistry(calc, temperature, standard_state=s) for s in ("1 bar", "1 mol/L", "1 atm")
    )
    assert mole.gibbs_kj_mol - bar.gibbs_kj_mol == pytest.approx([molar], abs=6e-6)
    assert bar.gibbs_kj_mol - atmosphere.gibbs_kj_mol == pytest.approx([atm], abs=6e-7)
    assert mole.enthalpy_kj_mol == pytest.approx(bar.enthalpy_kj_mol, rel=1e-15)
    # S(1 bar) - S(1 atm) = R ln 1.01325 = 0.109443 J/(mol K)
    assert bar.entropy_j_mol_k - atmosphere.entropy_j_mol_k == pytest.approx([0.109443], abs=6e-7)
    slope = mole.slope_enthalpy_kj_mol - bar.slope_enthalpy_kj_mol
    assert slope == pytest.approx([-R * temperature / 1000.0], rel=1e-9)


def test_pure_liquid_water() -> None:
    """checks.md 3: from 1 mol/L to 55.34 mol/L (997.047/18.01528) G rises by 9.949 kJ/mol."""
    one, pure = (thermochemistry(water(), standard_state=s) for s in ("1 mol/L", "55.3445 mol/L"))
    assert pure.gibbs_kj_mol - one.gibbs_kj_mol == pytest.approx([9.949], abs=6e-4)


def test_parts_add_up() -> None:
    """With the electronic energy they are the totals; H2O2 has a row for its two hands, R ln 2."""
    found = thermochemistry(peroxide(multiplicity=3), list(T), standard_state="1 mol/L")
    table = found.parts()
    sums = table.groupby("temperature_k", sort=False).sum(numeric_only=True)
    assert found.electronic_kj_mol is not None
    enthalpy = sums["enthalpy_kj_mol"].to_numpy() + found.electronic_kj_mol
    assert enthalpy == pytest.approx(found.enthalpy_kj_mol, rel=1e-14)
    assert sums["entropy_j_mol_k"].to_numpy() == pytest.approx(found.entropy_j_mol_k, rel=1e-13)
    gibbs = sums["gibbs_kj_mol"].to_numpy() + found.electronic_kj_mol
    assert gibbs == pytest.approx(found.gibbs_kj_mol, rel=1e-14)
    heat = sums["heat_capacity_j_mol_k"].to_numpy()
    assert heat == pytest.approx(found.heat_capacity_j_mol_k, rel=1e-13)
    assert list(table["part"][:5]) == [
        "translation",
        "rotation",
        "vibration",
        "electronic",
        "handedness",
    ]
    hands = table[table["part"] == "handedness"]["entropy_j_mol_k"]
    assert hands.to_numpy() == pytest.approx([5.763146] * 4, abs=1e-6)
    assert "<table" in found._repr_html_()


def test_handedness() -> None:
    both, one = thermochemistry(peroxide()), thermochemistry(peroxide(), enantiopure=True)
    assert (both.degeneracy, one.degeneracy) == (2, 1)
    assert both.entropy_j_mol_k - one.entropy_j_mol_k == pytest.approx([5.763146], abs=1e-6)
    assert "handedness" not in set(one.parts()["part"])
    assert thermochemistry(water()).degeneracy == 1


def test_modes_table() -> None:
    raised = thermochemistry(peroxide(), [298.15, 500.0], low_modes="raised").modes()
    assert len(raised) == 12
    assert list(raised["treated_as"][:4]) == [*["raised to 100 cm^-1"] * 2, *["oscillator"] * 2]
    assert list(raised["used_cm"][:3]) == [100.0, 100.0, 130.0]
    mixed = thermochemistry(peroxide(), 298.15, low_modes="rotor-entropy")
    table = mixed.modes()
    # checks.md 2: w = 1/(1 + (100/v)^4)
    assert table["weight"].to_numpy() == pytest.approx(
        [1.0 / (1.0 + (100.0 / v) ** 4) for v in SOFT], rel=1e-12
    )
    row = mixed.parts().set_index("part").loc["vibration"]
    assert table["entropy_j_mol_k"].sum() == pytest.approx(row["entropy_j_mol_k"], rel=1e-13)
    whole = table["enthalpy_kj_mol"].sum() + table["zero_point_kj_mol"].sum()
    assert whole == pytest.approx(row["enthalpy_kj_mol"], rel=1e-13)


def test_low_mode_spread() -> None:
    gibbs = [thermochemistry(peroxide(), list(T), low_modes=n).gibbs_kj_mol for n in LOW_MODES]
    found = low_mode_spread_kj_mol(structure(peroxide()), T)
    # to the digits that a difference of G's of -2e5 kJ/mol has
    assert found == pytest.approx(np.max(gibbs, axis=0) - np.min(gibbs, axis=0), abs=1e-9)
    assert found.min() > 1.0


def test_slope_finding() -> None:
    """More than 0.5 kJ/mol of H' - H is a finding; 200 cm^-1 alone is far below it."""
    assert "slope-differs" in codes(thermochemistry(peroxide()))
    assert "slope-differs" not in codes(thermochemistry(peroxide(), low_modes="rotor-enthalpy"))
    stiff = peroxide([200.0, 400.0, 600.0, 880.0, 1300.0, 3600.0])
    assert "slope-differs" not in codes(thermochemistry(stiff))


def test_solution_is_a_finding() -> None:
    gas, solution = (thermochemistry(water(), phase=phase) for phase in ("gas", "solution"))
    assert codes(gas) == []
    assert codes(solution) == ["solvation-derivative"]
    assert solution.gibbs_kj_mol[0] == gas.gibbs_kj_mol[0]


def test_frequency_scales() -> None:
    """The zero-point scale is the other one unless given."""
    found = thermochemistry(water(), frequency_scale=0.96)
    assert found.zero_point_kj_mol == pytest.approx(0.96 * 53.8782, abs=6e-5)
    apart = thermochemistry(water(), frequency_scale=0.96, zero_point_scale=0.98)
    assert apart.zero_point_kj_mol == pytest.approx(0.98 * 53.8782, abs=6e-5)
    assert apart.entropy_j_mol_k[0] == found.entropy_j_mol_k[0]


# atoms, rotors, levels ----------------------------------------------------------------------------


def oxygen(**changes: Any) -> Calculation:
    return made("oxygen", [8], [[0.0, 0.0, 0.0]], None, **{"multiplicity": 3, **changes})


def test_atom_needs_no_modes() -> None:
    """S(O) with levels: 161.059 with the average mass (checks.md 9)."""
    found = thermochemistry(
        oxygen(), masses="average", levels=[[5, "0 cm^-1"], [3, 158.265], [1, 226.977]]
    )
    assert found.rotor == "atom"
    assert found.zero_point_kj_mol == 0.0
    assert found.entropy_j_mol_k == pytest.approx([161.059], abs=1e-3)
    assert found.modes().empty
    assert "levels-offered" not in codes(found)


def test_known_levels_are_offered_not_applied() -> None:
    plain = thermochemistry(oxygen())
    offered = [finding for finding in plain.findings if finding.code == "levels-offered"]
    assert len(offered) == 1
    assert offered[0].severity == "note"
    assert '[5, "0 cm^-1"], [3, "158.265 cm^-1"]' in offered[0].mend
    electronic = plain.parts().set_index("part").loc["electronic", "entropy_j_mol_k"]
    assert electronic == pytest.approx(R * np.log(3.0), rel=1e-14)
    assert KNOWN_LEVELS["HO", 0, 2][1] == (2, 139.2)


def test_rotor_auto_and_classical() -> None:
    """methods.md: H2O at 298 K -0.037 kJ/mol in G; the parts table says what was done."""
    auto, classical = (thermochemistry(water(), rotor=r) for r in ("auto", "classical"))
    assert auto.gibbs_kj_mol - classical.gibbs_kj_mol == pytest.approx([-0.037], abs=1e-3)
    words = auto.parts().set_index("part").loc["rotation", "treated_as"]
    assert words == "nonlinear, classical with quantum correction, symmetry number 2"
    words = classical.parts().set_index("part").loc["rotation", "treated_as"]
    assert words == "nonlinear, classical, symmetry number 2"
    heavy = made("so2", *_bent(16, 8, 1.43, 119.3), [518.0, 1152.0, 1362.0])
    words = thermochemistry(heavy).parts().set_index("part").loc["rotation", "treated_as"]
    assert words == "nonlinear, classical, symmetry number 2"


def _bent(middle: int, end: int, bond: float, angle: float) -> tuple[list[int], np.ndarray]:
    half = np.radians(angle / 2.0)
    x = bond * np.sin(half)
    z = bond * np.cos(half)
    return [middle, end, end], np.array([[0, 0, 0], [x, 0, z], [-x, 0, z]])


def test_hydrogen_molecule() -> None:
    """JANAF H-050: S 130.680, H(298)-H(0) 8.467 for normal hydrogen; the rest is distortion."""
    x = np.array([[0.0, 0, 0], [0.7511, 0, 0]])  # r0, B0 = 59.32 cm^-1
    found = thermochemistry(made("h2", [1, 1], x, [4161.17]), low_modes="harmonic")
    words = found.parts().set_index("part").loc["rotation", "treated_as"]
    assert words == "linear, level sum with nuclear-spin weights, symmetry number 2"
    assert found.entropy_j_mol_k == pytest.approx([130.680], abs=0.13)
    assert found.zero_point_kj_mol is not None
    assert found.electronic_kj_mol is not None
    above = found.enthalpy_kj_mol - found.electronic_kj_mol - found.zero_point_kj_mol
    assert above == pytest.approx([8.467], abs=0.022)
    # hydrogen deuteride is the same from no end
    mixed = made("hd", [1, 1], x, [3632.2], masses_u=[1.00782503, 2.01410178])
    words = thermochemistry(mixed).parts().set_index("part").loc["rotation", "treated_as"]
    assert words == "linear, level sum, symmetry number 1"


def test_cold_rotor_is_a_finding() -> None:
    """The largest rotational temperature of water is near 40 K."""
    assert "rotor-too-cold" in codes(thermochemistry(water(), [20.0, 300.0]))
    assert "rotor-too-cold" not in codes(thermochemistry(water(), [60.0, 300.0]))


def test_declared_symmetry_number() -> None:
    found = thermochemistry(water(), symmetry_number=1)
    assert (found.symmetry_number, found.symmetry_origin) == (1, "declared")
    derived = thermochemistry(water())
    difference = found.entropy_j_mol_k - derived.entropy_j_mol_k
    assert difference == pytest.approx([R * np.log(2.0)], rel=1e-12)


def test_printed_symmetry_number() -> None:
    def printed(text: str) -> list[tuple[str, str, int | None]]:
        calc = water(printed={"symmetry_number": Printed(text, "", 412)})
        return [(f.code, f.severity, f.line) for f in thermochemistry(calc).findings]

    assert printed("2") == []
    assert printed("1") == [("symmetry-differs", "note", 412)]
    assert printed("4") == [("symmetry-differs", "warning", 412)]


def test_borderline_symmetry_is_a_note() -> None:
    """An O-H of water longer by 0.07 A than the other: 1 within 0.05 A, 2 not far beyond."""
    stretched = np.array(water().positions_angstrom)
    stretched[1] *= 1.1
    calc = made("water", water().numbers, stretched, [1594.75, 3657.05, 3755.93])
    found = thermochemistry(calc)
    assert found.symmetry_number == 1
    assert "symmetry-borderline" in codes(found)


# masses and isotopes ------------------------------------------------------------------------------


def test_isotopes_follow_the_hessian() -> None:
    calc = with_hessian(water())
    found = thermochemistry(calc, isotopes={"3": "D"})
    by_hand = np.array([calc.masses_u[0], calc.masses_u[1], 2.01410177812])
    expected = normal_modes(calc.hessian_hartree_bohr2, by_hand, calc.positions_angstrom)
    assert found.modes()["wavenumber_cm"].to_numpy() == pytest.approx(
        expected.wavenumbers_cm, rel=1e-12
    )
    assert found.symmetry_number == 1
    heavy = thermochemistry(calc, isotopes={"H": "D"})
    assert heavy.symmetry_number == 2
    assert heavy.zero_point_kj_mol < found.zero_point_kj_mol  # type: ignore[operator]
    # an atom's own entry comes before its element's, in whatever order
    mixed = structure_masses(calc, {2: "T", "H": "D"})
    assert mixed == pytest.approx([15.9949146196, 3.0160492779, 2.0141017781], abs=1e-8)
    assert structure_masses(calc, {"1": "18O"})[0] == pytest.approx(17.9991596, abs=1e-6)


def structure_masses(calc: Calculation, isotopes: dict[Any, str]) -> np.ndarray:
    from thermo_pp.species.masses import chosen_masses

    return chosen_masses(calc, "program", isotopes, where="here")


@pytest.mark.parametrize(
    ("isotopes", "sentence"),
    [
        ({"3": "13C"}, "'13C' is no isotope of atom 3 (H)"),
        ({"4": "D"}, "'4' is neither an element nor an atom number from 1 to 3"),
        ({"C": "13C"}, "no atom C to give an isotope"),
        ({"3": "9H"}, "'9H' is not known"),
        ({"3": "heavy"}, "'heavy' is not an isotope"),
        ({"0": "D"}, "'0' is neither an element nor an atom number from 1 to 3"),
    ],
)
def test_isotope_errors(isotopes: dict[str, str], sentence: str) -> None:
    with pytest.raises(StudyError) as caught:
        thermochemistry(with_hessian(water()), isotopes=isotopes)
    assert caught.value.what == sentence
    assert caught.value.mend


def test_isotopes_need_a_hessian() -> None:
    with pytest.raises(
        StudyError, match=r"isotopes change the modes, and runs/water\.out holds no"
    ):
        thermochemistry(water(), isotopes={"3": "D"})


def test_average_masses() -> None:
    """S_tr of HCl rises by 3/2 R ln(36.458/35.97668) = 0.1658 J/(mol K) from 1H 35Cl to the average.

    checks.md 9 (vi) has 0.167 for JANAF's older mass, 36.461.
    """
    x = np.array([[0.0, 0, 0], [1.2746, 0, 0]])
    calc = made("hcl", [1, 17], x, [2885.98])
    most, average = thermochemistry(calc), thermochemistry(calc, masses="average")
    rows = [f.parts().set_index("part")["entropy_j_mol_k"] for f in (average, most)]
    assert rows[0]["translation"] - rows[1]["translation"] == pytest.approx(0.1658, abs=1e-4)
    assert codes(average) == ["average-masses-mixed"]
    assert codes(thermochemistry(with_hessian(water()), masses="average")) == []


# imaginary modes and mode counts ------------------------------------------------------------------


def test_saddle_point() -> None:
    """The imaginary mode enters nothing: the rest gives the same as without it."""
    calc = peroxide([-1200.0, 60.0, 130.0, 880.0, 1300.0, 3600.0])
    found = thermochemistry(calc, 298.15, kind="saddle")
    assert codes(found) == ["slope-differs"]
    table = found.modes()
    assert table["treated_as"][0] == "reaction coordinate, left out"
    assert np.isnan(table["used_cm"][0])
    assert table["entropy_j_mol_k"][0] == 0.0
    assert found.zero_point_kj_mol == pytest.approx(
        0.5 * KELVIN_PER_CM * R * (60 + 130 + 880 + 1300 + 3600) / 1000.0, rel=1e-12
    )
    assert Structure.make(calc, Treatment(), name="TS", kind="saddle").imaginary_cm == -1200.0
    guessed = thermochemistry(calc)
    assert guessed.gibbs_kj_mol[0] == found.gibbs_kj_mol[0]
    assert codes(guessed)[0] == "taken-as-saddle"


@pytest.mark.parametrize(
    ("wavenumbers", "kind", "what", "mend"),
    [
        (
            [-512.3, -48.1, 130.0, 880.0, 1300.0, 3600.0],
            "saddle",
            "TS1 is a saddle point with 2 imaginary modes (-512.3, -48.1 cm^-1); "
            "it must have exactly one",
            'imaginary = { real_below = "49 cm^-1" }',
        ),
        (
            [-512.3, 60.0, 130.0, 880.0, 1300.0, 3600.0],
            "minimum",
            "TS1 is a minimum with 1 imaginary mode (-512.3 cm^-1); it must have none",
            "displace it along them and optimise again",
        ),
        (
            [-512.3, -480.0, 130.0, 880.0, 1300.0, 3600.0],
            None,
            "TS1 has 2 imaginary modes (-512.3, -480.0 cm^-1); "
            "a minimum has none, a saddle point exactly one",
            "displace it along those that do not belong",
        ),
        (
            SOFT,
            "saddle",
            "TS1 is used as a saddle point, but has no imaginary mode",
            "name the output of a saddle point",
        ),
    ],
)
def test_wrong_imaginary_modes(wavenumbers: list[float], kind: Any, what: str, mend: str) -> None:
    with pytest.raises(StudyError) as caught:
        Structure.make(peroxide(wavenumbers), Treatment(), name="TS1", kind=kind)
    assert caught.value.what == what
    assert mend in caught.value.mend
    assert ("real_below" in caught.value.mend) == ("48.1" in what)  # never for large ones
    assert caught.value.where == "runs/peroxide.out:77"


def test_small_imaginary_modes_taken_as_real() -> None:
    real_below = {"real_below": "30 cm^-1"}
    calc = peroxide([-22.0, 60.0, 130.0, 880.0, 1300.0, 3600.0])
    found = thermochemistry(calc, imaginary=real_below)
    assert codes(found)[0] == "imaginary-taken-as-real"
    assert found.findings[0].severity == "warning"
    assert found.modes()["treated_as"][0] == "interpolated, imaginary taken as real"
    assert found.gibbs_kj_mol == pytest.approx(thermochemistry(peroxide()).gibbs_kj_mol, rel=1e-15)
    saddle = peroxide([-1200.0, -22.0, 130.0, 880.0, 1300.0, 3600.0])
    table = thermochemistry(saddle, imaginary=real_below, kind="saddle").modes()
    assert table["treated_as"][0] == "reaction coordinate, left out"
    assert table["treated_as"][1] == "interpolated, imaginary taken as real"
    with pytest.raises(StudyError, match=r"only those below 20 cm\^-1 may be taken as real"):
        thermochemistry(calc, imaginary={"real_below": "20 cm^-1"}, kind="minimum")


def test_small_reaction_coordinate_of_a_named_saddle() -> None:
    """A saddle point keeps its one imaginary mode, however small, whatever real_below says."""
    calc = peroxide([-22.0, 60.0, 130.0, 880.0, 1300.0, 3600.0])
    made_saddle = Structure.make(calc, Treatment(real_below_cm=30.0), name="TS", kind="saddle")
    assert made_saddle.imaginary_cm == -22.0


def test_mode_count() -> None:
    with pytest.raises(StudyError) as caught:
        thermochemistry(water(wavenumbers_cm=[1594.75, 3657.05]))
    assert caught.value.what == "water: 2 modes where a nonlinear structure of 3 atoms has 3"
    assert caught.value.where == "runs/water.out:77"
    flat = np.array([[0.0, 0.0, 0.01], [0.0, 0.96, 0.0], [0.0, -0.96, 0.0]])
    calc = made("flat", [8, 1, 1], flat, [1594.75, 3657.05, 3755.93])
    with pytest.raises(StudyError, match=r"3 modes where a linear structure of 3 atoms has 4; its"):
        thermochemistry(calc)


def test_zero_mode() -> None:
    with pytest.raises(StudyError, match=r"a mode of 0 cm\^-1, which has no finite entropy"):
        thermochemistry(water(wavenumbers_cm=[0.0, 3657.05, 3755.93]))


def test_single_point_is_no_species() -> None:
    with pytest.raises(StudyError, match="the output has no vibrational modes") as caught:
        thermochemistry(water(wavenumbers_cm=None))
    assert "frequency job" in caught.value.mend


# charge, multiplicity, energy ---------------------------------------------------------------------


@pytest.mark.parametrize(
    ("changes", "arguments", "sentence"),
    [
        ({"multiplicity": None}, {}, "water: runs/water.out does not say the multiplicity"),
        ({"charge": None}, {}, "water: runs/water.out does not say the charge"),
        ({}, {"charge": 1}, "water: charge 1 is declared, the output has 0"),
        ({}, {"multiplicity": 2}, "water: multiplicity 2 is impossible with 10 electrons"),
        ({"multiplicity": 4}, {}, "water: multiplicity 4 is impossible with 10 electrons"),
        ({"energy_hartree": None}, {}, "water: the output has no electronic energy"),
        ({}, {"symmetry_number": 0}, "water: symmetry number 0 is below 1"),
        ({}, {"levels": [[2, 5.0]]}, "the lowest electronic level is not at 0"),
        ({}, {"levels": [[0.5, 0.0]]}, "degeneracy 0.5 is not above 0"),
        ({}, {"levels": [3]}, "3 is not an electronic level"),
        ({}, {"levels": []}, "the lowest electronic level is not at 0"),
    ],
)
def test_what_is_not_known_is_refused(
    changes: dict[str, Any], arguments: dict[str, Any], sentence: str
) -> None:
    with pytest.raises(StudyError) as caught:
        thermochemistry(water(**changes), **arguments)
    assert caught.value.what == sentence
    assert caught.value.mend


def test_declared_where_the_output_is_silent() -> None:
    calc = water(multiplicity=None, charge=None)
    found = Structure.make(calc, Treatment(), name="W", charge=0, multiplicity=1)
    assert (found.charge, found.multiplicity) == (0, 1)
    differs = thermochemistry(water(multiplicity=3), multiplicity=1)
    assert codes(differs) == ["multiplicity-differs"]


def test_energy_of_a_single_point() -> None:
    single = water(path="runs/water_mp2.out", energy_hartree=-76.31, wavenumbers_cm=None)
    found = Structure.make(water(), Treatment(), name="W", energy=single)
    assert found.energy_hartree == -76.31
    assert found.files == ("runs/water.out", "runs/water_mp2.out")
    with pytest.raises(StudyError, match="the energy is of O, the modes are of H2O"):
        Structure.make(water(), Treatment(), name="W", energy=oxygen())


# options ------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ({"low_modes": "rotor-entrop"}, "did you mean 'rotor-entropy'"),
        ({"rotor": "quantum"}, "known choices: auto, classical"),
        ({"masses": "mean"}, "known choices: program, average"),
        ({"phase": "liquid"}, "known choices: gas, solution"),
        ({"kind": "ts"}, "known choices: minimum, saddle"),
        ({"standard_state": "1 bra"}, "is neither a pressure nor a concentration"),
        ({"temperature_k": "0 K"}, "temperature '0 K' is not above 0 K"),
        ({"temperature_k": "10**10**10 K"}, "is not one number and a unit"),
        ({"temperature_k": [300.0, "nan"]}, "'nan' is not a number"),
        ({"onset_cm": "100 K"}, "is not a quantity in 1/cm"),
        ({"onset_cm": -5}, "onset_cm is -5"),
        ({"frequency_scale": 0.0}, "frequency_scale is 0.0"),
        ({"imaginary": "drop"}, "'drop' is no way to treat imaginary modes"),
        ({"imaginary": {"real_below": "-3 cm^-1"}}, "is no way to treat imaginary modes"),
    ],
)
def test_wrong_options(arguments: dict[str, Any], message: str) -> None:
    with pytest.raises(StudyError) as caught:
        thermochemistry(water(), **arguments)
    assert message in str(caught.value)


def test_parse_imaginary() -> None:
    assert parse_imaginary("refuse", where="x") is None
    assert parse_imaginary({"real_below": "30 cm^-1"}, where="x") == 30.0


# many at once -------------------------------------------------------------------------------------


def test_many_gives_the_same() -> None:
    """Blocks of unlike structures against one at a time."""
    rng = np.random.default_rng(4)
    numbers, positions = built({"C": [0.6, 1.1, 1.7]}, [turn([1, 1, 1], 120.0)])
    structures = [structure(oxygen()), structure(water()), structure(peroxide())]
    structures += [
        structure(peroxide(np.sort(rng.uniform(10, 3000, 6)), energy_hartree=-151.0 - k))
        for k in range(19)
    ]
    structures.append(structure(made("ring", numbers, positions, [300.0, 800.0, 800.0])))
    structures.append(structure(made("h2", [1, 1], [[0.0, 0, 0], [0.74, 0, 0]], [4400.0])))
    expected = [one.ground_kj_mol for one in structures]
    assert grounds(structures) == pytest.approx(expected, rel=1e-14)
    for low_modes in LOW_MODES:
        found = many(structures, T, low_modes=low_modes, standard_state=MOLAR)
        for row, one in enumerate(structures):
            alone = one.at(T, low_modes=low_modes, standard_state=MOLAR)
            assert found.enthalpy_kj_mol[row] == pytest.approx(alone.enthalpy_kj_mol, rel=1e-14)
            assert found.entropy_j_mol_k[row] == pytest.approx(alone.entropy_j_mol_k, rel=1e-13)
            assert found.gibbs_kj_mol[row] == pytest.approx(alone.gibbs_kj_mol, rel=1e-14)
            heat = alone.heat_capacity_j_mol_k
            assert found.heat_capacity_j_mol_k[row] == pytest.approx(heat, rel=1e-13)
            slope = alone.slope_enthalpy_kj_mol
            assert found.slope_enthalpy_kj_mol[row] == pytest.approx(slope, rel=1e-14)


def test_results_are_read_only() -> None:
    found = thermochemistry(water())
    with pytest.raises(ValueError, match="read-only"):
        found.gibbs_kj_mol[0] = 0.0
    with pytest.raises(ValueError, match="read-only"):
        structure(water()).gas.wavenumbers_cm[0] = 5.0


# real outputs -------------------------------------------------------------------------------------

FIXTURES = Path(__file__).parent.parent / "fixtures"


@pytest.mark.parametrize(
    ("name", "kind", "order", "hands", "modes"),
    [  # point groups of the structures: D3h, C2v, C2, Cs, C1, Cs, C1, C1
        ("so3", "minimum", 6, 1, 6),
        ("water", "minimum", 2, 1, 3),
        ("h2so4", "minimum", 2, 2, 15),
        ("so3-water", "minimum", 1, 1, 15),
        ("so3-water2", "minimum", 1, 2, 24),
        ("water-dimer", "minimum", 1, 1, 12),
        ("ts-unassisted", "saddle", 1, 2, 15),
        ("ts-assisted", "saddle", 1, 2, 24),
    ],
)
def test_stack_plume(name: str, kind: Any, order: int, hands: int, modes: int) -> None:
    calc = read(FIXTURES / "stack-plume" / "outputs" / f"{name}.out")
    found = Structure.make(calc, Treatment(), name=name)
    assert found.kind == kind
    assert (found.symmetry_number, found.degeneracy) == (order, hands)
    assert len(found.modes.wavenumbers_cm) == modes
    assert len(found.modes.real_cm) == modes - (kind == "saddle")
    assert found.rotor.kind == "nonlinear"


def test_what_a_program_prints() -> None:
    """Psi4 1.3.2 on HF water at 298.15 K and 1 atm, its own printout (`water_hf_freq.toml`), kJ/mol.

    Its wavenumbers are printed to 1e-4 cm^-1 and its constants are of another CODATA year: 2e-3.
    """
    calc = read(FIXTURES / "psi4" / "good" / "water_hf_freq.out")
    found = thermochemistry(calc, standard_state="1 atm", rotor="classical", low_modes="harmonic")
    assert found.electronic_kj_mol is not None
    assert found.zero_point_kj_mol == pytest.approx(60.611, abs=2e-3)
    assert found.enthalpy_kj_mol - found.electronic_kj_mol == pytest.approx([70.531], abs=2e-3)
    gibbs = found.gibbs_kj_mol - found.electronic_kj_mol
    assert gibbs / CALORIE_J == pytest.approx([3.449], abs=1e-3)


# declared species ---------------------------------------------------------------------------------

BAR = StandardState("pressure", 1e5, "1 bar")


def declared(**changes: Any) -> Declared:
    arguments = {
        "name": "D",
        "kind": "minimum",
        "enthalpy_kj_mol": -40.0,
        "entropy_j_mol_k": -120.0,
        "standard_state": BAR,
    }
    return Declared.make("H2O", **{**arguments, **changes})


def test_declared_constant() -> None:
    found = declared().at(T)
    assert found.enthalpy_kj_mol == pytest.approx([-40.0] * 4)
    assert found.gibbs_kj_mol == pytest.approx(-40.0 + 0.12 * T, rel=1e-14)
    assert found.slope_enthalpy_kj_mol == pytest.approx([-40.0] * 4)
    assert (found.electronic_kj_mol, found.zero_point_kj_mol, found.rotor) == (None, None, None)
    assert codes(found) == ["declared-constant"]
    assert found.parts().empty
    assert found.modes().empty


@pytest.mark.parametrize("own", ["1 bar", "1 mol/L"])
@pytest.mark.parametrize("asked", [None, "1 bar", "1 mol/L"])
def test_declared_with_heat_capacity(own: str, asked: str | None) -> None:
    """H = H0 + Cp (T - T0), S = S0 + Cp ln(T/T0); the slope is that of G in any standard state."""
    model = declared(
        heat_capacity_j_mol_k=33.0,
        temperature_k=300.0,
        standard_state=standard_state(own, where="x"),
    )
    assert model.findings == ()
    state = None if asked is None else standard_state(asked, where="x")
    h = 1e-3
    here, above, below = (model.at(t, standard_state=state) for t in (T, T + h, T - h))
    assert here.enthalpy_kj_mol == pytest.approx(-40.0 + 0.033 * (T - 300.0), rel=1e-13)
    if asked in (None, own):
        assert here.entropy_j_mol_k == pytest.approx(-120.0 + 33.0 * np.log(T / 300.0), rel=1e-13)
    bend = (above.gibbs_kj_mol / (T + h) - below.gibbs_kj_mol / (T - h)) / (2 * h)
    assert here.slope_enthalpy_kj_mol == pytest.approx(-(T**2) * bend, rel=1e-7, abs=1e-5)
    assert here.heat_capacity_j_mol_k == pytest.approx([33.0] * 4)


def test_declared_relative_to_a_structure() -> None:
    """Differences in the declared standard state: H and S of the reference are added."""
    reference = structure(water())
    model = declared(reference=((reference, 1),), enthalpy_kj_mol=-5.0, entropy_j_mol_k=-10.0)
    for low_modes in LOW_MODES:
        mine, theirs = model.at(T, low_modes=low_modes), reference.at(T, low_modes=low_modes)
        assert mine.enthalpy_kj_mol == pytest.approx(theirs.enthalpy_kj_mol - 5.0, rel=1e-14)
        assert mine.entropy_j_mol_k == pytest.approx(theirs.entropy_j_mol_k - 10.0, rel=1e-14)
        slope = theirs.slope_enthalpy_kj_mol - 5.0
        assert mine.slope_enthalpy_kj_mol == pytest.approx(slope, rel=1e-14)
    assert model.files == ("runs/water.out",)
    molar = model.at(T, standard_state=MOLAR).gibbs_kj_mol - model.at(T).gibbs_kj_mol
    other = reference.at(T, standard_state=MOLAR).gibbs_kj_mol - reference.at(T).gibbs_kj_mol
    assert molar == pytest.approx(other, abs=1e-9)


def test_declared_errors() -> None:
    with pytest.raises(StudyError, match=r"what it is relative to \(2 X\) differ in atoms"):
        declared(reference=((structure(water()), 2),))
    with pytest.raises(StudyError, match="'H3O\\+' says charge 1, charge says 2"):
        Declared.make(
            "H3O+",
            name="D",
            kind="minimum",
            charge=2,
            enthalpy_kj_mol=0.0,
            entropy_j_mol_k=0.0,
            standard_state=BAR,
        )
    with pytest.raises(ValueError, match="temperatures must be above 0"):
        declared().at(0.0)


@pytest.mark.parametrize(
    ("text", "composition", "charge"),
    [
        ("H2SO4", {"H": 2, "S": 1, "O": 4}, 0),
        ("H3O+", {"H": 3, "O": 1}, 1),
        ("SO4^2-", {"S": 1, "O": 4}, -2),
        ("SO4--", {"S": 1, "O": 4}, -2),
        ("Ca(OH)2", {"Ca": 1, "O": 2, "H": 2}, 0),
        ("Fe(CN(H2O)2)3^3+", {"Fe": 1, "C": 3, "N": 3, "H": 12, "O": 6}, 3),
        ("CH3CHO", {"C": 2, "H": 4, "O": 1}, 0),
        ("e-", {}, -1),
        ("", None, 0),
        ("H0", None, 0),
        ("h2o", None, 0),
        ("Xq2", None, 0),
        ("(OH", None, 0),
        ("OH)2", None, 0),
        ("H2O!", None, 0),
    ],
)
def test_composition(text: str, composition: dict[str, int] | None, charge: int) -> None:
    if composition is None:
        with pytest.raises(StudyError, match="is not a formula"):
            parse_composition(text, where="study.toml [species.X] composition")
    else:
        assert parse_composition(text, where="x") == (composition, charge)
