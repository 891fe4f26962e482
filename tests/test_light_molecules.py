"""Light molecules and open shells: summed rotational levels, nuclear spins, spin-orbit levels.

Against the JANAF tables (package `janaf`). Constants from memory: B0, D0 and fundamentals of H2, D2,
HD of Huber and Herzberg, *Constants of Diatomic Molecules* (1979), as the radicals' too.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from structures import made

from thermo_pp.data.levels import KNOWN_LEVELS
from thermo_pp.errors import StudyError
from thermo_pp.formulas.partition import (
    electronic,
    linear_rotation_levels,
    translation,
)
from thermo_pp.records import Calculation
from thermo_pp.species import thermochemistry
from thermo_pp.units import GAS_J_MOL_K as R
from thermo_pp.units import KELVIN_PER_CM

BOND = 0.7511  # r0, Angstrom: B0 = 59.32 cm^-1
H2 = {"B": "59.3219 cm^-1", "D": "0.04599 cm^-1"}
# masses are JANAF's, Cp(T) to 800 K: above, the anharmonicity of the vibration shows (measured at
# 1000 K: H2 0.002, HD -0.021, D2 -0.057 J/(mol K))
LIGHT: dict[str, tuple[str, float, list[float], dict[str, Any]]] = {
    "H2": ("H-050", 4161.17, [1.008, 1.008], H2),
    "D2": ("D-012", 2993.6, [2.0141, 2.0141], {"B": 29.904, "D": 0.01141}),
    "HD": ("D-005", 3632.2, [1.008, 2.0141], {"B": 44.662, "D": 0.0260}),
}


def dihydrogen(masses: list[float], nu: float) -> Calculation:
    x = np.array([[0.0, 0.0, 0.0], [BOND, 0.0, 0.0]])
    return made("h2", [1, 1], x, [nu], masses_u=masses)


def janaf(index: str, low: float = 100.0, high: float = 1000.0) -> tuple[np.ndarray, ...]:
    """T, S and Cp of a table."""
    from janaf import Table

    frame = Table(index).df
    t, s, cp = (frame[key].to_numpy().astype(float) for key in ("T(K)", "S", "Cp"))
    inside = (t >= low) & (t <= high)
    return t[inside], s[inside], cp[inside]


@pytest.mark.parametrize("name", LIGHT)
def test_hydrogens_against_janaf(name: str) -> None:
    index, nu, masses, constants = LIGHT[name]
    t, s, cp = janaf(index)
    found = thermochemistry(
        dihydrogen(masses, nu), t, low_modes="harmonic", rotational_constants=constants
    )
    assert found.entropy_j_mol_k == pytest.approx(s, abs=0.02, rel=0.0)
    cold = t <= 800.0
    assert found.heat_capacity_j_mol_k[cold] == pytest.approx(cp[cold], abs=0.02, rel=0.0)
    rigid = thermochemistry(
        dihydrogen(masses, nu),
        t,
        low_modes="harmonic",
        rotational_constants={"B": constants["B"]},
    )
    error = (rigid.entropy_j_mol_k - s)[t == 298.15]
    assert error == pytest.approx([-0.084], abs=0.002)  # what leaving D out costs
    words = found.parts().set_index("part").loc["rotation", "treated_as"].iloc[0]
    assert ("with nuclear-spin weights" in words) == (name != "HD")
    assert "centrifugal distortion" in words


def test_sum_that_stops_where_the_levels_turn() -> None:
    """With distortion no level counts below its neighbour, however hot it is."""
    theta, delta = 85.0, 0.066
    share = linear_rotation_levels(20000.0, theta, distortion_k=delta)
    j = np.arange(26)
    levels = theta * j * (j + 1) - delta * (j * (j + 1.0)) ** 2
    assert levels[-1] > levels[-2]
    assert theta * 26 * 27 - delta * (26 * 27) ** 2 < levels[-1]
    q = ((2 * j + 1) * np.exp(-levels / 20000.0)).sum()
    u = ((2 * j + 1) * levels * np.exp(-levels / 20000.0)).sum() / q
    assert share.enthalpy_j_mol == pytest.approx(R * u, rel=1e-12)
    assert share.entropy_j_mol_k == pytest.approx(R * (np.log(q) + u / 20000.0), rel=1e-12)


def test_nuclear_spins() -> None:
    """Normal hydrogen is a mixture of 3 ortho and 1 para, at equilibrium where it is hot."""
    calc = dihydrogen([1.00782503] * 2, 4161.17)
    t = np.array([20.0, 77.0, 1000.0])
    kinds = ("equilibrium", "normal", "ortho", "para")
    equal, normal, ortho, para = (
        thermochemistry(calc, t, rotational_constants=H2, nuclear_spins=kind) for kind in kinds
    )
    mixing = -R * (0.75 * np.log(0.75) + 0.25 * np.log(0.25))
    s = 0.75 * ortho.entropy_j_mol_k + 0.25 * para.entropy_j_mol_k + mixing
    assert normal.entropy_j_mol_k == pytest.approx(s, rel=1e-12)
    h = 0.75 * ortho.enthalpy_kj_mol + 0.25 * para.enthalpy_kj_mol
    assert normal.enthalpy_kj_mol == pytest.approx(h, rel=1e-12)
    assert normal.gibbs_kj_mol[2] == pytest.approx(equal.gibbs_kj_mol[2], abs=1e-4)
    # share of para at 77 K: 0.50 (handbook, from memory), of ortho over para exp(-dG/RT)
    ratio = np.exp(-1000.0 * (ortho.gibbs_kj_mol - para.gibbs_kj_mol) / (R * t))
    assert 1.0 / (1.0 + ratio[1]) == pytest.approx(0.503, abs=0.003)
    assert 1.0 / (1.0 + ratio[0]) == pytest.approx(0.998, abs=0.001)
    # ortho hydrogen rests in J = 1, 2 B above para's ground state
    gap = ortho.enthalpy_kj_mol[0] - para.enthalpy_kj_mol[0]
    level = 2.0 * 59.3219 - 4.0 * 0.04599
    assert gap == pytest.approx(R * KELVIN_PER_CM * level / 1000.0, rel=1e-6)
    deuterium = dihydrogen([2.01410178] * 2, 2993.6)
    cold = thermochemistry(deuterium, 5.0, nuclear_spins="ortho").enthalpy_kj_mol
    odd = thermochemistry(deuterium, 5.0, nuclear_spins="para").enthalpy_kj_mol
    assert cold < odd  # ortho deuterium has the even levels
    words = normal.parts().set_index("part").loc["rotation", "treated_as"].iloc[0]
    assert words.endswith("25% in even and 75% in odd levels, symmetry number 2")


@pytest.mark.parametrize(
    ("options", "what"),
    [
        ({"rotational_constants": {"D": 0.01}}, "h2: B is missing"),
        ({"rotational_constants": {"A": 1.0, "B": 59.3}}, "h2: unknown constant 'A'"),
        (
            {"rotational_constants": {"B": 59.3, "D": 2.0}},
            "h2: B = 59.3 cm^-1 and D = 2 cm^-1 are no constants of a molecule",
        ),
        (
            {"rotational_constants": H2, "rotor": "classical"},
            'h2: rotational_constants is for a sum over levels, and rotor is "classical"',
        ),
        ({"nuclear_spins": "mixed"}, "unknown choice 'mixed'"),
        (
            {"nuclear_spins": "para", "masses": "average", "isotopes": None, "hd": True},
            "h2: nuclear spins are told apart for H2, D2 and T2 only",
        ),
    ],
)
def test_refusals(options: dict[str, Any], what: str) -> None:
    masses = [1.00782503, 1.00782503]
    if options.pop("hd", False):
        masses = [1.00782503, 2.01410178]
        options.pop("masses")
    with pytest.raises(StudyError) as caught:
        thermochemistry(dihydrogen(masses, 4161.17), name="h2", **options)
    assert caught.value.what == what
    assert caught.value.mend


def test_constants_of_another_isotopologue_are_a_finding() -> None:
    calc = dihydrogen([2.01410178] * 2, 2993.6)
    found = thermochemistry(calc, rotational_constants=H2)
    [finding] = [one for one in found.findings if one.code == "rotational-constant-differs"]
    assert finding.severity == "warning"
    assert "B = 59.3219 cm^-1 is given, its geometry and masses have 29.6" in finding.what


def test_constants_of_a_bent_molecule_are_refused() -> None:
    from structures import water

    with pytest.raises(StudyError, match="rotational constants are given, and it is not linear"):
        thermochemistry(water(), rotational_constants={"B": 10.0})


# electronic levels --------------------------------------------------------------------------------

ATOMS = {
    "O": ("O-001", 15.9994), "Cl": ("Cl-001", 35.453), "B": ("B-005", 10.81),
    "C": ("C-003", 12.011), "F": ("F-001", 18.9984), "Al": ("Al-005", 26.9815),
    "Si": ("Si-005", 28.0855), "S": ("S-006", 32.06), "Br": ("Br-001", 79.904),
    "I": ("I-001", 126.9045),
}  # fmt: skip
# table, mass, fundamental and B0
RADICALS = {
    "NO": ("N-005", 30.006, 1876.0, 1.6961),
    "HO": ("H-038", 17.007, 3568.0, 18.55),
    "HS": ("H-046", 33.068, 2599.0, 9.461),
    "OP": ("O-004", 46.9732, 1220.2, 0.7309),
    "NS": ("N-011", 46.0667, 1204.0, 0.7727),
    "CF": ("C-030", 31.0094, 1286.1, 1.408),
}


def levels_of(formula: str) -> tuple[np.ndarray, np.ndarray]:
    [levels] = [found for (name, _, _), found in KNOWN_LEVELS.items() if name == formula]
    degeneracies, energies = zip(*levels, strict=True)
    return np.array(degeneracies, float), np.array(energies, float)


def test_every_row_of_the_table_is_checked() -> None:
    assert {name for name, _, _ in KNOWN_LEVELS} == {*ATOMS, *RADICALS}


@pytest.mark.parametrize("formula", ATOMS)
def test_levels_of_atoms_against_janaf(formula: str) -> None:
    index, mass = ATOMS[formula]
    t, s, cp = janaf(index, 200.0)
    moving, shells = translation(t, mass), electronic(t, *levels_of(formula))
    total = moving.entropy_j_mol_k + shells.entropy_j_mol_k
    assert total == pytest.approx(s, abs=0.003, rel=0.0)
    capacity = moving.heat_capacity_j_mol_k + shells.heat_capacity_j_mol_k
    assert capacity == pytest.approx(cp, abs=0.003, rel=0.0)


@pytest.mark.parametrize("formula", RADICALS)
def test_levels_of_radicals_against_janaf(formula: str) -> None:
    index, mass, nu, b = RADICALS[formula]
    [s] = janaf(index, 298.0, 299.0)[1]
    from thermo_pp.formulas.vibration import vibration

    modes = vibration(
        298.15, np.array([nu]), "harmonic", onset_cm=1.0, frequency_scale=1.0, zero_point_scale=1.0
    )
    total = (
        translation(298.15, mass).entropy_j_mol_k
        + linear_rotation_levels(298.15, b * KELVIN_PER_CM).entropy_j_mol_k
        + modes.entropy_j_mol_k.sum()
        + electronic(298.15, *levels_of(formula)).entropy_j_mol_k
    )
    assert total == pytest.approx(s, abs=0.055, rel=0.0)


def test_table_is_the_users_word() -> None:
    calc = made("chlorine", [17], [[0.0, 0.0, 0.0]], None, multiplicity=2)
    found = thermochemistry(calc, levels="table", masses="average")
    assert found.entropy_j_mol_k == pytest.approx([165.189], abs=0.003)  # JANAF
    assert "levels-offered" not in [one.code for one in found.findings]
    plain = thermochemistry(calc, masses="average")
    [offer] = [one for one in plain.findings if one.code == "levels-offered"]
    assert offer.mend.startswith('to use them write levels = "table"')
    # the spin is in the levels: never 2 S + 1 beside them
    electronic_row = found.parts().set_index("part").loc["electronic", "entropy_j_mol_k"]
    assert electronic_row < R * np.log(6.0)


def test_table_without_the_species() -> None:
    calc = made("nitrogen", [7], [[0.0, 0.0, 0.0]], None, multiplicity=4)
    with pytest.raises(StudyError) as caught:
        thermochemistry(calc, levels="table")
    assert caught.value.what == (
        "nitrogen: the table has no electronic levels of N, charge 0, multiplicity 4"
    )
    assert "the table has O (3), Cl (2)" in caught.value.mend
