"""Rate constants of elementary steps, as a study gives them: Eyring, limits, joining, detailed balance."""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import pairwise
from pathlib import Path

import mpmath as mp
import numpy as np
import pytest
from ase.data.vdw_alvarez import vdw_radii
from exact_study import BRANCHED, MEMBERS, STEPS, Line, Member, Plan, Reference, without

from thermo_pp.errors import StudyError
from thermo_pp.kinetics.results import EffectiveRate, StepRate

R, AVOGADRO = 8.31446261815324, 6.02214076e23
T = 298.15
WATER = ((273.15, 1.79e-3), (298.15, 0.89e-3), (348.15, 0.378e-3))  # Pa s, handbook, from memory


def study(
    reactants: str,
    height: float | None,
    *,
    state: str = "1 bar",
    phase: str = "solution",
    t: float = T,
    entropy: float = 0.0,
) -> Plan:
    """A and so many waters to P over a saddle `height` kJ/mol and `entropy` J/mol/K up.

    In solution no limit is set without a viscosity.
    """
    waters = reactants.count("W")
    oxygen = f"CO(H2O){waters}" if waters else "CO"
    members = {
        "A": Member("CO", 0.0, 200.0),
        "W": Member("H2O", 0.0, 150.0),
        "P": Member(oxygen, -50.0, 180.0),
    }
    if not waters:
        del members["W"]
    line = Line(f"{reactants} = P", "barrier", "none")
    if height is not None:
        members["T"] = Member(oxygen, height, 200.0 + 150.0 * waters + entropy)
        line = Line(f"{reactants} = P", "through", "T")
    held = {"W": "1.0 mol/L"} if waters else {}
    question = {"reactant": "A", "product": "P"}
    return Plan(members, (line,), question, held, (t,), state, phase)


def only_step(plan: Plan, folder: Path) -> StepRate:
    [step] = plan.load(folder).effective().steps
    return step


@dataclass(frozen=True)
class Published:
    """One row of a table of Eyring rate constants."""

    reactants: str
    state: str
    height: float  # kJ/mol
    t: float
    k: float  # L, mol, s
    digits: float
    unit: str


# Eyring equation evaluated by general-purpose libraries (an independent computation), CODATA 2022;
# cm^3/s and cm^6/s turned into L/mol/s and L^2/mol^2/s
TABLE = [
    Published("A", "1 bar", 50.0, 298.15, 10805.41, 1e-6, "s^-1"),
    Published("A", "1 bar", 80.0, 298.15, 0.05996094, 1e-7, "s^-1"),
    Published("A", "1 bar", 100.0, 298.15, 1.879404e-5, 1e-6, "s^-1"),
    Published("A", "1 bar", 80.0, 600.0, 1.3567375e6, 1e-7, "s^-1"),
    Published("A + W", "1 mol/L", 50.0, 298.15, 10805.41, 1e-6, "L mol^-1 s^-1"),
    Published("A + W", "1 bar", 50.0, 298.15, 2.67861e5, 5e-6, "L mol^-1 s^-1"),
    Published("A + W", "1 bar", 80.0, 298.15, 1.486406, 1e-6, "L mol^-1 s^-1"),
    Published("A + W", "1 bar", 100.0, 298.15, 4.65896e-4, 5e-6, "L mol^-1 s^-1"),
    Published("A + W", "1 bar", 80.0, 600.0, 6.76833e7, 5e-6, "L mol^-1 s^-1"),
    Published("A + W", "1 bar", 50.0, 298.15, 4.44794e-16 * AVOGADRO / 1e3, 5e-6, "L mol^-1 s^-1"),
    Published(
        "A + W + W", "1 bar", 50.0, 298.15, 1.83095e-35 * AVOGADRO**2 / 1e6, 5e-6, "L^2 mol^-2 s^-1"
    ),
    Published(
        "A + 2 W", "1 bar", 80.0, 600.0, 9.31033e-33 * AVOGADRO**2 / 1e6, 5e-6, "L^2 mol^-2 s^-1"
    ),
]


@pytest.mark.parametrize("row", TABLE, ids=str)
def test_eyring_table(row: Published, tmp_path: Path) -> None:
    reactants = row.reactants.replace("2 W", "W + W")
    step = only_step(study(reactants, row.height, state=row.state, t=row.t), tmp_path)
    assert step.forward_rate_constant[0] == pytest.approx(row.k, rel=row.digits)
    assert step.forward_unit == row.unit
    assert step.reverse_unit == "s^-1"


def test_barrier_of_one_per_second(tmp_path: Path) -> None:
    """73.0241 kJ/mol at 298.15 K: computed independently to that digit."""
    step = only_step(study("A", 73.0241), tmp_path)
    assert step.forward_rate_constant[0] == pytest.approx(1.0, rel=3e-5)


@pytest.mark.parametrize(
    ("reactants", "energy"), [("A", 22.4790), ("A + W", 24.9579), ("A + W + W", 27.4369)]
)
def test_arrhenius_energy_in_p_form(reactants: str, energy: float, tmp_path: Path) -> None:
    """Enthalpy 20 kJ/mol, entropy -100 J/mol/K at 1 bar: E_a = H + m RT, to the digits given."""
    result = study(reactants, 20.0, entropy=-100.0).load(tmp_path).effective()
    free = result.rates["free"]
    assert free is not None
    assert free.arrhenius_energy_kj_mol[0] == pytest.approx(energy, abs=6e-5, rel=0.0)


@pytest.mark.parametrize("reactants", ["A", "A + W", "A + W + W"])
def test_arrhenius_energy_in_c_form(reactants: str, tmp_path: Path) -> None:
    """At 1 mol/L it is H + RT whatever the molecularity."""
    plan = study(reactants, 20.0, entropy=-100.0, state="1 mol/L")
    free = plan.load(tmp_path).effective().rates["free"]
    assert free is not None
    assert free.arrhenius_energy_kj_mol[0] == pytest.approx(20.0 + R * T / 1000.0, abs=1e-12)


def test_constants_do_not_depend_on_the_standard_state(tmp_path: Path) -> None:
    """The entropies are declared for the state: with S moved by R ln of the ratio, k stays."""
    plan = study("A + W", 40.0)
    for state, per_bar in (("1 bar", 1.0), ("1 atm", 1.01325), ("1 mol/L", 0.01 * R * T)):
        members = {
            name: replace(member, entropy=member.entropy - float(R * np.log(per_bar)))
            for name, member in plan.species.items()
        }
        step = only_step(replace(plan, species=members, standard_state=state), tmp_path)
        if state == "1 bar":
            first = step
        assert step.forward_rate_constant == pytest.approx(first.forward_rate_constant, rel=1e-12)
        assert step.reverse_rate_constant == pytest.approx(first.reverse_rate_constant, rel=1e-12)


# --------------------------------------------------------------------------------------- limits


def test_collisions_against_the_mean_speed_of_nitrogen(tmp_path: Path) -> None:
    """N2 with N2: 475 m/s on average at 298 K (Atkins, Physical Chemistry, from memory), times sqrt 2.

    The radius is that of the sphere as large as two of radius 1.66 Angstrom (Alvarez 2013).
    """
    members = {"N2": Member("N2", 0.0, 191.6), "N4": Member("N4", 40.0, 220.0)}
    members |= {"A": Member("CO", 0.0, 200.0), "P": Member("CO", -9.0, 200.0)}
    steps = (Line("N2 + N2 = N4", "barrier", "none"), Line("A = P", "rate", "1.0 1/s"))
    held = {"N2": "0.04 mol/L", "N4": "equilibrium"}
    plan = Plan(members, steps, {"reactant": "A", "product": "P"}, held, (298.0,))
    step = plan.load(tmp_path).effective().steps[0]
    diameter = 2.0 * 1.66e-10 * 2.0 ** (1.0 / 3.0)
    expected = 0.5 * np.pi * diameter**2 * np.sqrt(2.0) * 475.0 * AVOGADRO * 1000.0
    assert step.forward_rate_constant[0] == pytest.approx(expected, rel=2e-3)
    assert step.limited[0]


def test_radii_are_those_of_the_source() -> None:
    """Alvarez, Dalton Trans. 2013: H 1.20, C 1.77, N 1.66, O 1.50, S 1.89 Angstrom (from memory)."""
    from thermo_pp.formulas.rates import sphere_radius_angstrom

    for element, number, radius in (
        ("H", 1, 1.20),
        ("C", 6, 1.77),
        ("N", 7, 1.66),
        ("O", 8, 1.50),
        ("S", 16, 1.89),
    ):
        assert sphere_radius_angstrom({element: 1}) == pytest.approx(radius, rel=1e-15)
        assert vdw_radii[number] == radius


def test_diffusion_limit_of_water(tmp_path: Path) -> None:
    """8RT/3 eta is 7.4e9 L/mol/s in water at 25 degC (Atkins, Physical Chemistry, from memory)."""
    plan = study("A + W", None)
    step = replace(plan.steps[0], viscosity=WATER)
    forward = only_step(replace(plan, steps=(step,)), tmp_path).forward_rate_constant[0]
    assert forward == pytest.approx(7.4e9, rel=5e-3)


def test_like_partners_meet_half_as_often(tmp_path: Path) -> None:
    """W + W against W + V, V the same molecule under another name, in both phases."""
    members = {
        "W": Member("H2O", 0.0, 188.0),
        "V": Member("H2O", 0.0, 188.0),
        "W2": Member("(H2O)2", -15.0, 290.0),
        "A": Member("CO", 0.0, 200.0),
        "P": Member("CO", -9.0, 200.0),
    }
    held = {"W": "0.01 mol/L", "V": "0.01 mol/L", "W2": "equilibrium"}
    for phase, points in (("gas", None), ("solution", WATER)):
        steps = (
            Line("W + W = W2", "barrier", "none", viscosity=points),
            Line("W + V = W2", "barrier", "none", viscosity=points),
            Line("A = P", "rate", "1.0 1/s"),
        )
        plan = Plan(members, steps, {"reactant": "A", "product": "P"}, held, phase=phase)
        like, unlike, _ = plan.load(tmp_path).effective().steps
        ratio = like.forward_rate_constant / unlike.forward_rate_constant
        assert ratio == pytest.approx(0.5, rel=1e-14)


def test_viscosity_between_the_points_of_the_table(tmp_path: Path) -> None:
    """ln eta is linear in 1/T between neighbours; at a point it is the point's."""
    plan = study("A + W", None)
    plan = replace(plan, steps=(replace(plan.steps[0], viscosity=WATER),))
    for t, eta in WATER:
        forward = only_step(plan.at(t), tmp_path).forward_rate_constant[0]
        assert forward == pytest.approx(8.0 * R * t / (3.0 * eta) * 1000.0, rel=1e-12)
    for (t1, eta1), (t2, eta2) in pairwise(WATER):
        t = 2.0 / (1.0 / t1 + 1.0 / t2)
        forward = only_step(plan.at(t), tmp_path).forward_rate_constant[0]
        eta = np.sqrt(eta1 * eta2)
        assert forward == pytest.approx(8.0 * R * t / (3.0 * eta) * 1000.0, rel=1e-12)
        # E_a = RT + RT^2 d ln(1/eta)/dT
        free = plan.at(t).load(tmp_path).effective().rates["free"]
        assert free is not None
        slope = R * np.log(eta1 / eta2) / (1.0 / t1 - 1.0 / t2) / 1000.0
        assert free.arrhenius_energy_kj_mol[0] == pytest.approx(R * t / 1000.0 + slope, abs=1e-9)


@pytest.mark.parametrize("t", [273.0, 349.0])
def test_viscosity_table_that_does_not_reach(t: float, tmp_path: Path) -> None:
    plan = study("A + W", None)
    plan = replace(plan.at(t, 300.0), steps=(replace(plan.steps[0], viscosity=WATER),))
    sentence = (
        f"the viscosities from 273.15 K to 348.15 K do not cover the temperatures from "
        f"{min(t, 300.0):g} K to {max(t, 300.0):g} K"
    )
    with pytest.raises(StudyError, match=sentence):
        plan.load(tmp_path).effective()


def findings(plan: Plan, folder: Path) -> dict[str, str]:
    return {f.code: f.what for f in plan.load(folder).effective().findings}


def test_one_viscosity_is_a_finding(tmp_path: Path) -> None:
    plan = study("A + W", None)
    one = replace(plan, steps=(replace(plan.steps[0], viscosity=((298.15, 0.89e-3),)),))
    text = one.text().replace("viscosity = [[298.15, '0.00089 Pa*s']]", 'viscosity = "0.89 mPa s"')
    (tmp_path / "study.toml").write_text(text, encoding="utf-8")
    from thermo_pp.study.load import Study

    result = Study.load(tmp_path / "study.toml").effective()
    assert "viscosity-constant" in {f.code for f in result.findings}
    table = replace(plan, steps=(replace(plan.steps[0], viscosity=WATER),))
    assert "viscosity-constant" not in findings(table, tmp_path)


def test_ions_are_a_finding(tmp_path: Path) -> None:
    """Only where both partners are charged."""
    members = {
        "A": Member("CO+", 0.0, 200.0),
        "W": Member("H2O-", 0.0, 150.0),
        "P": Member("CH2O2", -50.0, 180.0),
    }
    plan = study("A + W", None)
    plan = replace(plan, steps=(replace(plan.steps[0], viscosity=WATER),))
    assert "diffusion-of-ions" not in findings(plan, tmp_path)
    assert "diffusion-of-ions" in findings(replace(plan, species=members), tmp_path)
    single = {**members, "A": Member("CO", 0.0, 200.0), "P": Member("CH2O2-", -50.0, 180.0)}
    assert "diffusion-of-ions" not in findings(replace(plan, species=single), tmp_path)


def test_no_limit_without_a_viscosity(tmp_path: Path) -> None:
    """Said in a note, for steps with two molecules that go through a saddle."""
    assert "no-diffusion-limit" in findings(study("A + W", 20.0), tmp_path)
    assert "no-diffusion-limit" not in findings(study("A", 20.0), tmp_path)


def test_radius_that_is_not_known(tmp_path: Path) -> None:
    members = {
        "A": Member("Rn", 0.0, 170.0),
        "W": Member("H2O", 0.0, 150.0),
        "P": Member("RnH2O", -50.0, 180.0),
    }
    plan = replace(study("A + W", None, phase="gas"), species=members)
    sentence = "no van der Waals radius of Rn for the collision limit"
    with pytest.raises(StudyError, match=sentence):
        plan.load(tmp_path).effective()


# -------------------------------------------------------------------------------------- joining


def joined(height: float, turned: bool, folder: Path) -> tuple[StepRate, StepRate, StepRate]:
    """A + W = P over a saddle with the collision limit, the saddle alone, and the limit alone."""
    with_limit = study("A + W", height, phase="gas")
    steps = []
    for plan in (with_limit, study("A + W", height), study("A + W", None, phase="gas")):
        if turned:
            line = replace(plan.steps[0], equation="P = A + W")
            plan = replace(plan, steps=(line,))
        steps.append(only_step(plan, folder))
    return steps[0], steps[1], steps[2]


@pytest.mark.parametrize("turned", [False, True])
@pytest.mark.parametrize("height", [-60.0, 16.0, 60.0])
def test_saddle_and_limit_in_series(height: float, turned: bool, tmp_path: Path) -> None:
    """1/k = 1/k_saddle + 1/k_limit in the direction with two molecules; the other from K."""
    both, saddle, limit = joined(height, turned, tmp_path)
    names = ("reverse_rate_constant", "forward_rate_constant")
    names = names if turned else names[::-1]
    k, of_saddle, of_limit = (getattr(step, names[0])[0] for step in (both, saddle, limit))
    assert k == pytest.approx(1.0 / (1.0 / of_saddle + 1.0 / of_limit), rel=1e-12)
    balance = getattr(saddle, names[0])[0] / getattr(saddle, names[1])[0]
    assert getattr(both, names[1])[0] == pytest.approx(k / balance, rel=1e-12)
    # limited where the limit is more than half of the resistance
    assert both.limited[0] == (of_limit < of_saddle)
    assert limit.limited[0]
    assert not saddle.limited[0]


def test_limited_above_one_half(tmp_path: Path) -> None:
    """A tenth of a kJ/mol to either side of where saddle and limit are equally fast."""
    _, saddle, limit = joined(20.0, False, tmp_path)
    ratio = saddle.forward_rate_constant[0] / limit.forward_rate_constant[0]
    same = 20.0 + R * T / 1000.0 * float(np.log(ratio))
    found = [joined(same + by, False, tmp_path)[0].limited[0] for by in (-0.1, 0.1)]
    assert found == [True, False]


@pytest.mark.parametrize("product", [-30.0, 30.0])
def test_limit_of_two_pairs_is_set_downhill(product: float, tmp_path: Path) -> None:
    """A + W = P + Q: the collisions of the pair that is higher in free energy."""
    members = {
        "A": Member("CO", 0.0, 200.0),
        "W": Member("H2O", 0.0, 150.0),
        "P": Member("CO2", product, 200.0),
        "Q": Member("H2", 0.0, 150.0),
    }
    question = {"reactant": "A", "product": "P"}
    held = {"W": "0.01 mol/L", "Q": "0.01 mol/L"}
    plan = Plan(members, (Line("A + W = P + Q", "barrier", "none"),), question, held)
    step = only_step(plan, tmp_path)
    balance = np.exp(-product * 1000.0 / (R * T))
    reference = Reference(plan, mp.mpf(T))
    pair = {"A": 1, "W": 1} if product < 0.0 else {"P": 1, "Q": 1}
    limit = float(reference._limit(plan.steps[0], pair))
    downhill = step.forward_rate_constant if product < 0.0 else step.reverse_rate_constant
    uphill = step.reverse_rate_constant if product < 0.0 else step.forward_rate_constant
    assert downhill[0] == pytest.approx(limit, rel=1e-12)
    assert uphill[0] == pytest.approx(limit * min(balance, 1.0 / balance), rel=1e-12)


def test_three_molecules_have_no_limit(tmp_path: Path) -> None:
    gas = only_step(study("A + W + W", -50.0, phase="gas"), tmp_path)
    solution = only_step(study("A + W + W", -50.0), tmp_path)
    assert gas.forward_rate_constant == pytest.approx(solution.forward_rate_constant, rel=1e-14)
    assert not gas.limited[0]


def test_one_molecule_is_never_limited(tmp_path: Path) -> None:
    """Neither is a step faster than kT/h, nor one with a negative activation free energy."""
    step = only_step(study("A", -80.0, phase="gas"), tmp_path)
    assert step.forward_rate_constant[0] > 1e20
    assert not step.limited[0]


def test_declared_rates_have_no_limit(tmp_path: Path) -> None:
    plan = study("A + W", None, phase="gas")
    plan = replace(plan, steps=(Line("A + W = P", "rate", "1e20 L/mol/s"),))
    step = only_step(plan, tmp_path)
    assert step.forward_rate_constant[0] == pytest.approx(1e20, rel=1e-14)
    assert not step.limited[0]


# --------------------------------------------------------------------------------------- balance


def test_detailed_balance_of_every_kind_of_step(tmp_path: Path) -> None:
    """K from the free energies of the two sides, by hand, whatever the rate came from."""
    steps = (
        STEPS[0],
        Line("A + W = C1", "arrhenius", ("1e11 L/mol/s", 0.5, -2.0)),
        Line("A + W = C2", "rate", "5e8 L/mol/s"),
        *STEPS[3:],
    )
    plan = replace(BRANCHED.at(220.0, 298.15), species=without(MEMBERS, "T1", "T2"), steps=steps)
    result: EffectiveRate = plan.load(tmp_path).effective()
    for line, step in zip(plan.steps, result.steps, strict=True):
        left, right = line.sides()
        for k, t in enumerate(plan.temperatures):
            log = 0.0
            for sign, side in ((-1.0, left), (1.0, right)):
                for name, count in side.items():
                    member = MEMBERS[name]
                    gibbs = member.enthalpy * 1000.0 - t * member.entropy
                    gibbs += R * t * np.log(0.01 * R * t)  # 1 bar to 1 mol/L
                    log -= sign * count * gibbs / (R * t)
            ratio = step.forward_rate_constant[k] / step.reverse_rate_constant[k]
            assert ratio == pytest.approx(np.exp(log), rel=1e-11)


def test_rate_constants_in_other_units(tmp_path: Path) -> None:
    plan = study("A + W", None, phase="gas")
    steps = (Line("A + W = P", "rate", "1e-11 cm^3/s"),)
    step = only_step(replace(plan, steps=steps), tmp_path)
    assert step.forward_rate_constant[0] == pytest.approx(1e-11 * AVOGADRO / 1000.0, rel=1e-12)


def test_power_law_has_its_factor_at_298_15(tmp_path: Path) -> None:
    """A (T/298.15 K)^n exp(-E/RT): A at 298.15 K with E = 0, and E_a = E + n RT."""
    plan = study("A + W", None, phase="gas")
    steps = (Line("A + W = P", "arrhenius", ("3e9 L/mol/s", 2.5, 0.0)),)
    forward = only_step(replace(plan, steps=steps), tmp_path).forward_rate_constant[0]
    assert forward == pytest.approx(3e9, rel=1e-14)
    steps = (Line("A + W = P", "arrhenius", ("3e9 L/mol/s", 2.5, -7.0)),)
    free = replace(plan.at(400.0), steps=steps).load(tmp_path).effective().rates["free"]
    assert free is not None
    energy = -7.0 + 2.5 * R * 0.4
    assert free.arrhenius_energy_kj_mol[0] == pytest.approx(energy, abs=1e-11)
