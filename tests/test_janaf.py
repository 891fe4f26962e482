"""S, Cp and H of 28 species against the JANAF tables, through the functions the species use.

Inputs (fundamentals, rotational constants, levels) from memory of Shimanouchi's and Huber and
Herzberg's compilations, as listed in `checks.md` 9 and validated there by the small deviations;
average masses, 1 bar. JANAF values are read from the package `janaf`. Tolerances are what a correct
rigid rotor and harmonic oscillator meets with these inputs (`checks.md` 9): the rest is anharmonicity
and centrifugal distortion.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import pytest

from thermo_pp.conditions import Treatment
from thermo_pp.formulas.partition import SPIN_WEIGHTS
from thermo_pp.formulas.rotor import NO_SPIN_WEIGHTS
from thermo_pp.species.ideal_gas import IdealGas, shares, totals
from thermo_pp.units import KELVIN_PER_CM

ROOM, HOT = 298.15, 1000.0


@dataclass(frozen=True)
class Input:
    """One row of the inputs of checks.md 9."""

    index: str
    mass: float
    nu: tuple[float, ...] = ()
    b: tuple[float, ...] = ()
    sigma: int = 1
    levels: tuple[tuple[int, float], ...] = ((1, 0.0),)

    def gas(self, quantum: bool = False, spin_mass_number: int = 0) -> IdealGas:
        kind = {0: "atom", 1: "linear", 3: "nonlinear"}[len(self.b)]
        g, e = zip(*self.levels, strict=True)
        return IdealGas(
            mass_u=self.mass,
            rotor=kind,
            theta_k=KELVIN_PER_CM * np.array(self.b),
            symmetry_number=self.sigma,
            quantum_rotor=quantum,
            wavenumbers_cm=np.array(self.nu),
            degeneracies=np.array(g, dtype=float),
            levels_cm=np.array(e, dtype=float),
            spin_weights=SPIN_WEIGHTS.get(spin_mass_number, NO_SPIN_WEIGHTS),
        )


TRIPLET = ((3, 0.0), (2, 7918.1), (1, 13195.1))
O_LEVELS = ((5, 0.0), (3, 158.265), (1, 226.977), (5, 15867.862))
INPUTS = {
    "N2": Input("N-023", 28.0140, (2329.92,), (1.98958,), 2),
    "O2": Input("O-029", 31.9980, (1556.23,), (1.43768,), 2, TRIPLET),
    "H2": Input("H-050", 2.0160, (4161.17,), (59.322,), 2),
    "D2": Input("D-012", 4.0282, (2993.6,), (29.907,), 2),
    "HD": Input("D-005", 3.0221, (3632.2,), (44.662,)),
    "HF": Input("F-005", 20.0064, (3961.4,), (20.5597,)),
    "HCl": Input("Cl-026", 36.4610, (2885.98,), (10.4398,)),
    "CO": Input("C-093", 28.0100, (2143.27,), (1.92253,)),
    "NO": Input("N-005", 30.0060, (1876.0,), (1.6961,), 1, ((2, 0.0), (2, 119.82))),
    "OH": Input("H-038", 17.0070, (3568.0,), (18.55,), 1, ((2, 0.0), (2, 139.2))),
    "CO2": Input("C-095", 44.0090, (667.38, 667.38, 1333.0, 2349.14), (0.390219,), 2),
    "N2O": Input("N-026", 44.0130, (588.77, 588.77, 1284.91, 2223.76), (0.419011,)),
    "HCN": Input("C-052", 27.0260, (711.98, 711.98, 2096.85, 3311.48), (1.478222,)),
    "C2H2": Input("C-127", 26.0380, (612.87, 612.87, 730.33, 730.33, 1974.3, 3288.7, 3372.8),
                  (1.176646,), 2),
    "H2O": Input("H-064", 18.0150, (1594.75, 3657.05, 3755.93), (27.8806, 14.5218, 9.2777), 2),
    "HDO": Input("D-008", 19.0211, (1403.5, 2723.7, 3707.5), (23.414, 9.1034, 6.4064)),
    "D2O": Input("D-017", 20.0272, (1178.4, 2671.6, 2787.7), (15.42, 7.273, 4.8453), 2),
    "H2S": Input("H-080", 34.0760, (1182.57, 2614.41, 2628.46), (10.36, 9.0185, 4.7306), 2),
    "SO2": Input("O-034", 64.0580, (517.87, 1151.71, 1362.06), (2.02736, 0.344173, 0.293526), 2),
    "SO3": Input("O-058", 80.0570, (497.57, 1065.0, 530.09, 530.09, 1391.52, 1391.52),
                 (0.348543, 0.348543, 0.17399), 6),
    "NO2": Input("N-007", 46.0050, (749.65, 1319.8, 1616.85), (8.00235, 0.433707, 0.410448), 2,
                 ((2, 0.0),)),
    "NH3": Input("H-083", 17.0310, (950.4, 1626.8, 1626.8, 3336.7, 3443.8, 3443.8),
                 (9.94434, 9.94434, 6.2285), 3),
    "CH4": Input("C-067", 16.0430,
                 (1306.0, 1306.0, 1306.0, 1533.3, 1533.3, 2916.5, 3019.5, 3019.5, 3019.5),
                 (5.24104, 5.24104, 5.24104), 12),
    "H2CO": Input("C-061", 30.0260, (1167.26, 1249.1, 1500.17, 1746.01, 2782.46, 2843.33),
                  (9.40553, 1.29543, 1.13419), 2),
    "C2H4": Input("C-128", 28.0540,
                  (825.9, 939.9, 949.3, 1025.6, 1220.0, 1342.2, 1442.5, 1622.9, 2988.6, 3026.4,
                   3102.5, 3105.5), (4.86462, 1.001057, 0.828175), 4),
    "O": Input("O-001", 15.9990, levels=O_LEVELS),
    "Cl": Input("Cl-001", 35.4530, levels=((4, 0.0), (2, 882.3515))),
    "H": Input("H-001", 1.0080, levels=((2, 0.0),)),
}  # fmt: skip

# checks.md 9, "Own RRHO values for these inputs (regression target, 1e-3)", "[V: computed]" there by
# other code: S298, S1000, H298-H0, Cp298, Cp1000, H1000-H298, zero-point energy
REGRESSION = {
    "N2": (191.600, 228.123, 8.6767, 29.114, 32.613, 21.435, 13.936),
    "O2": (205.132, 243.467, 8.6866, 29.358, 34.673, 22.635, 9.308),
    "H2": (130.551, 165.913, 8.6763, 29.101, 29.853, 20.550, 24.889),
    "D2": (144.878, 180.696, 8.6764, 29.102, 31.236, 20.913, 17.906),
    "HD": (143.723, 179.219, 8.6764, 29.101, 30.334, 20.659, 21.725),
    "HF": (173.746, 209.149, 8.6763, 29.101, 30.011, 20.583, 23.694),
    "HCl": (186.866, 222.766, 8.6764, 29.102, 31.428, 20.976, 17.262),
    "CO": (197.649, 234.482, 8.6772, 29.129, 33.077, 21.654, 12.820),
    "NO": (210.748, 248.455, 9.1940, 29.820, 33.845, 22.180, 11.221),
    "OH": (183.658, 219.579, 9.2394, 29.940, 30.490, 20.864, 21.341),
    "CO2": (213.782, 269.267, 9.3665, 37.141, 54.149, 33.375, 30.008),
    "N2O": (220.000, 276.816, 9.5811, 38.607, 54.845, 34.091, 28.030),
    "HCN": (201.833, 253.658, 9.2441, 35.884, 50.082, 31.029, 40.866),
    "C2H2": (200.919, 268.840, 10.0121, 44.025, 67.513, 40.976, 67.722),
    "H2O": (188.716, 232.465, 9.9245, 33.482, 41.024, 25.903, 53.878),
    "HDO": (199.406, 244.415, 9.9351, 33.698, 43.034, 26.768, 46.862),
    "D2O": (198.231, 244.790, 9.9639, 34.181, 45.097, 27.777, 39.702),
    "H2S": (205.716, 252.472, 9.9632, 34.172, 45.530, 27.928, 38.433),
    "SO2": (248.188, 305.455, 10.5465, 39.824, 53.941, 34.228, 18.133),
    "SO3": (256.551, 334.596, 11.6893, 50.627, 75.967, 47.054, 32.334),
    "NO2": (240.079, 294.289, 10.1983, 37.130, 52.417, 32.555, 22.049),
    "NH3": (192.663, 245.639, 10.0481, 35.477, 55.649, 32.159, 86.300),
    "CH4": (186.320, 247.621, 10.0244, 35.641, 71.796, 38.181, 113.404),
    "H2CO": (218.763, 275.398, 10.0196, 35.387, 61.951, 34.793, 67.519),
    "C2H4": (219.328, 300.424, 10.5194, 42.899, 93.909, 50.675, 129.145),
    "O": (161.059, 186.791, 6.7254, 21.911, 20.915, 14.860, 0.000),
    "Cl": (165.191, 192.431, 6.2716, 21.838, 22.233, 15.815, 0.000),
    "H": (114.718, 139.872, 6.1974, 20.786, 20.786, 14.589, 0.000),
}

# checks.md 9, "Tolerances a correct classical RRHO meets with these inputs": S298, Cp298
GROUPS = {
    ("O", "Cl", "H"): (0.003, 0.003),
    ("N2", "O2", "CO", "CO2", "HCN", "C2H4", "NO", "N2O"): (0.05, 0.03),
    ("HCl", "HF", "SO2", "H2S", "C2H2", "NO2", "OH", "CH4"): (0.07, 0.16),
    ("H2", "D2", "HD", "H2O", "HDO", "D2O", "NH3"): (0.13, 0.27),
    ("H2CO", "SO3"): (0.22, 0.04),
}
ROOM_TOLERANCE = {name: values for names, values in GROUPS.items() for name in names}
CLASSICAL_H = {"HCl": 0.04, "HF": 0.08, "OH": 0.07, "D2": 0.11, "HD": 0.17, "H2": 0.21}
H_TOLERANCE = 0.022
HOT_S, HOT_S_ELSE = 0.36, {"NO2": 0.41, "NH3": 0.85}
HOT_CP, HOT_CP_ELSE = 0.41, {"SO2": 0.55, "C2H2": 0.77, "NH3": 0.85}


def ours(gas: IdealGas) -> np.ndarray:
    """S298, S1000, H298-H0, Cp298, Cp1000, H1000-H298, zero-point energy of the harmonic treatment."""
    found = totals(shares(np.array([ROOM, HOT]), gas, Treatment(), "harmonic"))
    zero_point = float(found.zero_point_j_mol)
    s, h, cp = found.entropy_j_mol_k, found.enthalpy_j_mol, found.heat_capacity_j_mol_k
    above = (h[0] - zero_point) / 1000.0
    return np.array([*s, above, *cp, (h[1] - h[0]) / 1000.0, zero_point / 1000.0])


@pytest.fixture(scope="module")
def janaf_values() -> dict[str, tuple[float, ...]]:
    """S298, S1000, H298-H0, Cp298, Cp1000 of the JANAF tables."""
    from janaf import Table

    values = {}
    for name, row in INPUTS.items():
        frame = Table(row.index).df
        at = {t: frame.filter(frame["T(K)"] == t) for t in (0.0, ROOM, HOT)}
        column = {
            (t, key): float(at[t][key][0])
            for t in at
            for key in ("S", "Cp", "H-H(Tr)")
            if not (t == 0.0 and key != "H-H(Tr)")
        }
        values[name] = (
            column[ROOM, "S"],
            column[HOT, "S"],
            -column[0.0, "H-H(Tr)"],
            column[ROOM, "Cp"],
            column[HOT, "Cp"],
        )
    return values


@pytest.mark.parametrize("name", INPUTS)
def test_regression(name: str) -> None:
    """1e-3, with half a unit of the digits printed there."""
    assert ours(INPUTS[name].gas()) == pytest.approx(REGRESSION[name], abs=1.0e-3, rel=0.0)


@pytest.mark.parametrize("quantum", [False, True], ids=["classical", "auto"])
@pytest.mark.parametrize("name", INPUTS)
def test_janaf(name: str, quantum: bool, janaf_values: dict[str, tuple[float, ...]]) -> None:
    """With the quantum rotor, as rotor = "auto" has it for these light ones, H is within 0.022 for all."""
    s298, s1000, h, cp298, cp1000 = janaf_values[name]
    spins = {"H2": 1, "D2": 2}.get(name, 0)
    found = ours(INPUTS[name].gas(quantum, spins))
    room_s, room_cp = ROOM_TOLERANCE[name]
    h_tolerance = H_TOLERANCE if quantum else CLASSICAL_H.get(name, H_TOLERANCE)
    assert found[0] == pytest.approx(s298, abs=room_s, rel=0.0)
    assert found[1] == pytest.approx(s1000, abs=HOT_S_ELSE.get(name, HOT_S), rel=0.0)
    assert found[2] == pytest.approx(h, abs=h_tolerance, rel=0.0)
    assert found[3] == pytest.approx(cp298, abs=room_cp, rel=0.0)
    assert found[4] == pytest.approx(cp1000, abs=HOT_CP_ELSE.get(name, HOT_CP), rel=0.0)


def test_what_the_pitfalls_would_cost() -> None:
    """checks.md 9 (vii), (viii): O2 as a singlet is low by R ln 3, NO as 4 equal states high by 0.333."""
    oxygen = ours(INPUTS["O2"].gas())[0]
    singlet = ours(replace(INPUTS["O2"], levels=((1, 0.0),)).gas())[0]
    assert oxygen - singlet == pytest.approx(9.134, abs=1e-3)
    oxide = ours(INPUTS["NO"].gas())[0]
    assert ours(replace(INPUTS["NO"], levels=((4, 0.0),)).gas())[0] - oxide == pytest.approx(
        0.333, abs=1e-3
    )
