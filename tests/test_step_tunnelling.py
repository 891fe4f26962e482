"""Tunnelling in a study: effective saddles, shares in the rate and in E_a, and what is refused."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from exact_study import Line, Member, Plan

from thermo_pp.errors import StudyError
from thermo_pp.formulas.tunnelling import eckart, wigner
from thermo_pp.kinetics.doubt.moved import moved
from thermo_pp.kinetics.doubt.uncertain import Uncertainty
from thermo_pp.kinetics.model import Model
from thermo_pp.kinetics.results import EffectiveRate, Rate
from thermo_pp.kinetics.tunnelling import tunnelling
from thermo_pp.mechanism import Step
from thermo_pp.output import barrier as output
from thermo_pp.output import barrier_tables
from thermo_pp.output.tables import Table
from thermo_pp.species import SaddleMember, SpeciesModel, Structure
from thermo_pp.study.load import Study
from thermo_pp.units import GAS_J_MOL_K

PLUME = Path(__file__).parents[1] / "fixtures" / "stack-plume"
MEMBERS = {
    "A": Member("CO", 0.0, 200.0, ground=1.0),
    "C": Member("CO", -5.0, 190.0, ground=-4.0),
    "P": Member("CO", -50.0, 180.0, ground=-48.0),
    "T1": Member("CO", 30.0, 170.0, ground=31.0, imaginary=800.0),
    "T2": Member("CO", 40.0, 175.0, ground=42.0, imaginary=1500.0),
}
PLAN = Plan(
    MEMBERS,
    (Line("A = C", "through", "T1"), Line("C = P", "through", "T2", tunnelling="eckart")),
    {"reactant": "A", "product": "P"},
    temperatures=(200.0, 298.15, 600.0),
)


def with_step(method: str | None, **changes: Member) -> Plan:
    first, second = PLAN.steps
    members = {**MEMBERS, **changes}
    return replace(PLAN, species=members, steps=(first, replace(second, tunnelling=method)))


def rate_of(result: EffectiveRate, name: str = "free") -> Rate:
    rate = result.rates[name]  # type: ignore[index]
    assert rate is not None
    return rate


@pytest.mark.parametrize("method", ["wigner", "eckart"])
def test_the_correction_is_in_both_directions(method: str, tmp_path: Path) -> None:
    t = np.array(PLAN.temperatures)
    bare = with_step("none").load(tmp_path).effective().steps[1]
    step = with_step(method).load(tmp_path).effective().steps[1]
    heights = (1000.0 * (42.0 + 4.0), 1000.0 * (42.0 + 48.0))
    kappa, energy = eckart(t, 1500.0, *heights) if method == "eckart" else wigner(t, 1500.0)
    for one in ("forward_rate_constant", "reverse_rate_constant"):
        assert getattr(step, one) / getattr(bare, one) == pytest.approx(np.exp(kappa), rel=1e-11)
    assert step.tunnelling == method
    assert step.log_tunnelling == pytest.approx(kappa, rel=1e-12)
    assert step.tunnelling_energy_kj_mol == pytest.approx(energy / 1000.0, rel=1e-12)
    assert np.all(bare.log_tunnelling == 0.0)


def test_share_in_the_effective_rate(tmp_path: Path) -> None:
    """Against the rate without, and E_a against a difference of ln k; controls still sum to 1."""
    result = PLAN.load(tmp_path).effective()
    bare = with_step("none").load(tmp_path).effective()
    for name in ("free", "pool", "relaxation"):
        rate, other = rate_of(result, name), rate_of(bare, name)
        assert rate.log_tunnelling is not None
        assert rate.tunnelling_energy_kj_mol is not None
        gain = np.log(rate.rate_constant / other.rate_constant)
        assert rate.log_tunnelling == pytest.approx(gain, rel=1e-10, abs=1e-12)
        share = rate.arrhenius_energy_kj_mol - other.arrhenius_energy_kj_mol
        assert rate.tunnelling_energy_kj_mol == pytest.approx(share, abs=1e-10)
        assert other.log_tunnelling is None
        total = sum(rate.control[saddle] for saddle in rate.saddles)
        assert total == pytest.approx(1.0, abs=1e-9)
    step = 1e-3
    around = rate_of(PLAN.at(298.15 - step, 298.15 + step).load(tmp_path).effective())
    slope = np.diff(np.log(around.rate_constant))[0] / (2.0 * step)
    expected = GAS_J_MOL_K * 298.15**2 * slope / 1000.0
    assert rate_of(result).arrhenius_energy_kj_mol[1] == pytest.approx(expected, abs=2e-5)


def test_treatment_says_it_for_all_steps_and_scales(tmp_path: Path) -> None:
    first, second = (replace(step, tunnelling=None) for step in PLAN.steps)
    plan = replace(PLAN, steps=(first, replace(second, tunnelling="none")))
    plan.load(tmp_path)
    file = tmp_path / "study.toml"
    text = file.read_text(encoding="utf-8")

    def steps(keys: str) -> Sequence[np.ndarray]:
        file.write_text(text.replace("[treatment]", f"[treatment]\n{keys}"), encoding="utf-8")
        return [step.log_tunnelling for step in Study.load(file).effective().steps]

    t = np.array(PLAN.temperatures)
    one, none = steps('tunnelling = "wigner"')
    assert one == pytest.approx(wigner(t, 800.0).log_kappa, rel=1e-12)
    assert np.all(none == 0.0)  # its own word
    one, _ = steps('tunnelling = "wigner"\nfrequency_scale = 0.9')
    assert one == pytest.approx(wigner(t, 720.0).log_kappa, rel=1e-12)
    one, _ = steps('tunnelling = "wigner"\nfrequency_scale = 0.9\ntunnelling_scale = 1.1')
    assert one == pytest.approx(wigner(t, 880.0).log_kappa, rel=1e-12)


def test_reference_of_a_declared_species_is_in_its_ground(tmp_path: Path) -> None:
    PLAN.load(tmp_path)
    file = tmp_path / "study.toml"
    text = file.read_text(encoding="utf-8")
    at = text.index('[species."T2"]')
    text = text[:at] + text[at:].replace("ground", "relative_to = { C = 1 }\nground", 1)
    file.write_text(text, encoding="utf-8")
    assert Study.load(file).species["T2"].ground_kj_mol == pytest.approx(38.0)


@pytest.mark.parametrize(
    ("plan", "what", "mend"),
    [
        (
            with_step("eckart", T2=replace(MEMBERS["T2"], ground=-10.0)),
            "the barrier of 'C = P' is submerged: at 0 K T2 lies 6.00 kJ/mol below C, so there is "
            "nothing to tunnel through",
            "let the step start from the complex in front of the saddle point",
        ),
        (
            with_step("wigner", P=replace(MEMBERS["P"], ground=50.0)),
            "the barrier of 'C = P' is submerged: at 0 K T2 lies 8.00 kJ/mol below P",
            'tunnelling = "none"',
        ),
        (
            with_step("wigner", T2=replace(MEMBERS["T2"], imaginary=None)),
            "no imaginary mode of the saddle point 'T2' is known",
            'imaginary_mode = "1200 cm^-1"',
        ),
        (
            with_step("eckart", C=replace(MEMBERS["C"], ground=None)),
            "the Eckart barrier of 'C = P' needs the energy at 0 K of C",
            'give declared species one (ground = "12.3 kJ/mol"), or write tunnelling = "wigner"',
        ),
    ],
)
def test_refusals(plan: Plan, what: str, mend: str, tmp_path: Path) -> None:
    with pytest.raises(StudyError) as caught:
        plan.load(tmp_path).effective()
    assert what in caught.value.what
    assert mend in caught.value.mend
    assert caught.value.where.endswith("[steps.2] tunnelling")


def test_computed_saddle_points(tmp_path: Path) -> None:
    """The bundled study: barriers from its own energies and zero-point energies."""
    text = (PLUME / "study.toml").read_text(encoding="utf-8")
    text = text.replace("[treatment]", '[treatment]\ntunnelling = "eckart"\nfrequency_scale = 0.95')
    text = text.replace('outputs = "outputs"', f'outputs = "{PLUME / "outputs"}"')
    file = tmp_path / "study.toml"
    file.write_text(text, encoding="utf-8")
    study = Study.load(file, temperatures=[298.15])
    result = study.effective()

    def ground(name: str) -> float:
        found = study.species[name].at(298.15)
        assert found.electronic_kj_mol is not None
        assert found.zero_point_kj_mol is not None
        return found.electronic_kj_mol + found.zero_point_kj_mol

    saddle = study.species["TS2"]
    assert isinstance(saddle, Structure)
    assert saddle.imaginary_cm is not None
    heights = [
        1000.0 * (ground("TS2") - side) for side in (ground("C2"), ground("acid") + ground("W"))
    ]
    expected = eckart(298.15, -0.95 * saddle.imaginary_cm, *heights)
    [step] = [one for one in result.steps if one.equation == "C2 = acid + W"]
    assert step.log_tunnelling[0] == pytest.approx(float(expected.log_kappa), rel=1e-9)
    assert 0.1 < step.log_tunnelling[0] < 5.0
    minimum: SpeciesModel = study.species["W"]
    assert minimum.saddle_members(np.array([298.15])) == ()


def test_weighted_mean_of_several_members() -> None:
    t = np.array([250.0, 400.0])
    gibbs = [np.array([10.0, 8.0]), np.array([11.0, 12.0])]
    slopes = [np.array([14.0, 14.0]), np.array([9.0, 9.0])]
    members = [
        SaddleMember(gibbs[0], slopes[0], 1500.0, 50.0),
        SaddleMember(gibbs[1], slopes[1], 600.0, 51.0),
    ]
    step = Step("A = P", {"A": 1}, {"P": 1}, through="T", tunnelling="eckart", where="s [steps.1]")
    found = tunnelling(step, members, {"A": 0.0, "P": -20.0}, t, 1.0)
    each = [eckart(t, 1500.0, 50e3, 70e3), eckart(t, 600.0, 51e3, 71e3)]
    bare = [np.exp(-1000.0 * g / (GAS_J_MOL_K * t)) for g in gibbs]
    kappa = sum(b * np.exp(e.log_kappa) for b, e in zip(bare, each, strict=True)) / sum(bare)
    assert found.log_kappa == pytest.approx(np.log(kappa), rel=1e-12)
    weights = [b * np.exp(e.log_kappa) for b, e in zip(bare, each, strict=True)]
    energy = sum(
        w * (1000.0 * s + e.energy_j_mol) for w, s, e in zip(weights, slopes, each, strict=True)
    ) / sum(weights)
    energy -= sum(b * 1000.0 * s for b, s in zip(bare, slopes, strict=True)) / sum(bare)
    assert found.energy_j_mol == pytest.approx(energy, rel=1e-12)


def test_shares_stand_in_tables_and_json(tmp_path: Path) -> None:
    study = PLAN.load(tmp_path)
    result = study.effective()
    answer = output.keys(result, study.treatment, ())
    free = answer["rates"]["per_free_reactant"]
    assert free["log_tunnelling"] is rate_of(result).log_tunnelling
    assert answer["steps"][1]["tunnelling"] == "eckart"
    assert answer["treatment"]["tunnelling_scale"] == 1.0
    shown = [
        [column.quantity for column in block.columns]
        for block in barrier_tables.tables(result, study.treatment, "kJ/mol")
        if isinstance(block, Table)
    ]
    assert [names[-2:] for names in (shown[0], shown[-1])] == [["ln κ", "Eₐ of κ"]] * 2
    bare = with_step("none").load(tmp_path).effective()
    text = str(barrier_tables.tables(bare, study.treatment, "kJ/mol"))
    assert "κ" not in text


def test_samples_move_the_factor(tmp_path: Path) -> None:
    """A batch of moved energies has the Eckart factor of the moved barrier, to first order in the move."""
    base = Model(*_parts(PLAN.load(tmp_path))).at(np.array(PLAN.temperatures))
    names = ("C", "P", "T2")
    uncertainty = Uncertainty(names, np.ones(3), np.eye(3), 100, 1, "here")
    shift = np.array([0.02, -0.03, 0.05])
    batch = moved(base, uncertainty, shift[np.newaxis]).steps
    heights = 1000.0 * (46.0 + shift[2] - shift[0]), 1000.0 * (90.0 + shift[2] - shift[1])
    kappa, energy = eckart(np.array(PLAN.temperatures), 1500.0, *heights)
    assert batch.log_kappa[:, 1] == pytest.approx(kappa, rel=1e-6)
    assert batch.kappa_energy_j_mol[:, 1] == pytest.approx(energy, rel=1e-5)
    assert np.all(np.abs(kappa / base.steps.log_kappa[:, 1] - 1.0) > 1e-5)  # they do move


def _parts(study: Study) -> tuple[Any, ...]:
    return study.mechanism, study.conditions, study.treatment, study.species
