"""Doubt: samples, first order, what narrows, alternatives; and how the study says it."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from chain_study import chain_text
from click.testing import CliRunner
from declared_study import edited, load

from thermo_pp.cli import main
from thermo_pp.errors import StudyError
from thermo_pp.kinetics.doubt.answers import find
from thermo_pp.kinetics.doubt.first_order import both_ways, deviation, slopes
from thermo_pp.kinetics.doubt.moved import moved
from thermo_pp.kinetics.doubt.results import Doubt
from thermo_pp.kinetics.doubt.sampling import sample
from thermo_pp.kinetics.doubt.uncertain import Uncertainty
from thermo_pp.kinetics.model import Model, Rates
from thermo_pp.kinetics.scaled import Ordinary
from thermo_pp.output import barrier_tables
from thermo_pp.output.tables import Table
from thermo_pp.study.load import Study
from thermo_pp.units import GAS_J_MOL_K

DOUBT = """
[doubt]
deviation = "{deviation} kJ/mol"
saddle_deviation = "{saddle} kJ/mol"
samples = {samples}
alternatives = false
"""


def doubted(
    folder: Path, *changes: tuple[str, str], deviation: float = 2.0, saddle: float = 3.0,
    samples: int = 1000, more: str = "",
) -> Study:  # fmt: skip
    text = DOUBT.format(deviation=deviation, saddle=saddle, samples=samples)
    return load(folder, edited(*changes) + text + more)


def base(study: Study) -> Rates:
    model = Model(study.mechanism, study.conditions, study.treatment, study.species)
    return model.at(np.array(study.conditions.temperature_k))


def uncertain(study: Study) -> Uncertainty:
    assert study.uncertainty is not None
    return study.uncertainty


@pytest.mark.parametrize("definition", ["free", "pool", "relaxation"])
def test_a_shift_of_each_atom_changes_no_rate(tmp_path: Path, definition: str) -> None:
    """What both sides of every balance have in common drops out, saddle points included."""
    study = doubted(
        tmp_path, ('rate = "2e7 L/mol/s"', 'arrhenius = { A = "2e7 L/mol/s", E = "1 kJ/mol" }')
    )
    rates, uncertainty = base(study), uncertain(study)
    per_atom = {"S": 3.0, "O": -7.0, "H": 11.0}
    shift = [
        sum(per_atom[e] * n for e, n in study.species[name].composition.items())
        for name in uncertainty.names
    ]
    shifted = moved(rates, uncertainty, np.array([shift]))
    before, after = rates.rate(definition), shifted.rate(definition)  # type: ignore[arg-type]
    np.testing.assert_allclose(after.log, before.log, rtol=0.0, atol=1e-11)
    np.testing.assert_allclose(after.energy_j_mol, before.energy_j_mol, rtol=0.0, atol=1e-5)
    one = np.zeros((1, len(shift)))
    one[0, uncertainty.names.index("C")] = 3.0  # one alone does change it
    alone = moved(rates, uncertainty, one).rate("pool")
    assert np.all(np.abs(alone.log - rates.rate("pool").log) > 1e-4)


def test_common_error_of_all_energies_leaves_no_doubt_about_one_step(tmp_path: Path) -> None:
    """A -> TS -> P, correlation 1 throughout: the barrier is certain; without correlation it is not."""
    text = chain_text(2, 0, 2, 1, DOUBT.format(deviation=4, saddle=4, samples=200))
    together = text + "correlation = { same_kind = 1.0, across = 1.0 }\n"
    spread = load(tmp_path, together).doubt().rates["free"].spread
    assert spread is not None
    np.testing.assert_allclose(spread.log_deviation, 0.0, atol=1e-9)
    apart = load(tmp_path, text).doubt().rates["free"]
    t = np.array([280.0, 360.0])
    rt = GAS_J_MOL_K * t / 1000.0
    # per free reactant of an irreversible first-order step: var = (4^2 + 4^2)/(RT)^2
    np.testing.assert_allclose(apart.first_order_log_deviation, np.sqrt(32.0) / rt, rtol=1e-9)
    np.testing.assert_allclose(apart.first_order_energy_deviation_kj_mol, np.sqrt(32.0), rtol=1e-7)


@pytest.mark.parametrize("definition", ["free", "pool"])
def test_first_order_is_the_derivative(tmp_path: Path, definition: str) -> None:
    """Slopes through the controls against differences of ln k, of a limit and a declared constant too."""
    study = doubted(tmp_path)
    rates, uncertainty = base(study), uncertain(study)
    by_log, by_energy = slopes(rates, both_ways(rates, uncertainty), uncertainty, definition)  # type: ignore[arg-type]
    h, v = 0.003, len(uncertainty.names)
    around = moved(rates, uncertainty, np.concatenate([h * np.eye(v), -h * np.eye(v)]))
    rate = around.rate(definition)  # type: ignore[arg-type]
    logs = rate.log.reshape(2, v, -1)
    np.testing.assert_allclose(by_log, ((logs[0] - logs[1]) / (2 * h)).T, rtol=0.0, atol=1e-7)
    energies = rate.energy_j_mol.reshape(2, v, -1) / 1000.0
    np.testing.assert_allclose(
        by_energy, ((energies[0] - energies[1]) / (2 * h)).T, rtol=0.0, atol=1e-5
    )


@pytest.mark.parametrize("definition", ["free", "pool"])
def test_small_deviations_spread_as_first_order_says(tmp_path: Path, definition: str) -> None:
    """Within four standard errors of a standard deviation, sigma/sqrt(2 N)."""
    more = "correlation = { same_kind = 0.5, across = 0.3 }\n"
    study = doubted(tmp_path, deviation=0.05, saddle=0.08, samples=4000, more=more)
    rate = study.doubt().rates[definition]  # type: ignore[index]
    assert rate.spread is not None
    allowed = 4.0 / np.sqrt(2.0 * 4000.0)
    ratio = rate.spread.log_deviation / rate.first_order_log_deviation
    np.testing.assert_allclose(ratio, 1.0, rtol=0.0, atol=allowed)
    ratio = rate.spread.energy_deviation_kj_mol / rate.first_order_energy_deviation_kj_mol
    np.testing.assert_allclose(ratio, 1.0, rtol=0.0, atol=allowed)


def test_samples_are_the_moved_rates_one_by_one(tmp_path: Path) -> None:
    """Blocks, ordinary numbers and the gathering change nothing: against each sample alone."""
    text = chain_text(7, 3, 3, 3, DOUBT.format(deviation=6, saddle=9, samples=100))
    study = load(tmp_path, text)
    rates, uncertainty = base(study), uncertain(study)
    spreads = sample(rates, uncertainty, ("free", "pool"))
    logs, energies, negative = [], [], []
    for shift in uncertainty.drawn():
        one = moved(rates, uncertainty, shift[np.newaxis]).rate("pool")
        logs.append(one.log)
        energies.append(one.energy_j_mol / 1000.0)
        negative.append(one.energy_j_mol < 0.0)
    spread = spreads["pool"]
    np.testing.assert_allclose(spread.log_deviation, np.std(logs, axis=0, ddof=1), rtol=1e-9)
    np.testing.assert_allclose(spread.log_bands[2], np.median(logs, axis=0), rtol=0, atol=1e-9)
    np.testing.assert_allclose(
        spread.energy_bands_kj_mol[0], np.quantile(energies, 0.025, axis=0), rtol=0, atol=1e-7
    )
    np.testing.assert_allclose(spread.negative_energy.value, np.mean(negative, axis=0))


def test_ordinary_numbers_agree_and_say_when_they_cannot(tmp_path: Path) -> None:
    study = load(tmp_path, chain_text(8, 4, 3, 9))
    rates = base(study)
    for definition in ("free", "pool"):
        exact, fast = rates.rate(definition), replace(rates, numbers=Ordinary).rate(definition)  # type: ignore[arg-type]
        np.testing.assert_allclose(fast.log, exact.log, rtol=0.0, atol=1e-12)
        np.testing.assert_allclose(fast.saddles, exact.saddles, rtol=0.0, atol=1e-12)
        np.testing.assert_allclose(fast.energy_j_mol, exact.energy_j_mol, rtol=0.0, atol=1e-6)
    text = chain_text(3, 0, 2, 9).replace('enthalpy = "', 'enthalpy = "2', 1)
    high = base(load(tmp_path, text.replace("T1]", "T1]\nheat_capacity = 0", 1)))
    barrier = np.zeros((1, 5))
    uncertainty = Uncertainty(("S0", "S1", "S2", "T0", "T1"), np.ones(5), np.eye(5), 100, 1, "here")
    barrier[0, 4] = 2000.0  # k about 1e-350 s^-1
    far = moved(high, uncertainty, barrier)
    with pytest.raises(FloatingPointError):
        find(replace(far, numbers=Ordinary), "pool")
    assert np.all(np.isfinite(find(far, "pool").rate.log))


def test_what_one_exact_energy_would_leave(tmp_path: Path) -> None:
    """Against the deviation with the covariance written down anew."""
    more = 'correlation = { same_kind = 0.4 }\npairs = [["C", "TS2", 0.5]]\n'
    study = doubted(tmp_path, more=more)
    result = study.doubt().rates["pool"]
    uncertainty, narrow = uncertain(study), result.narrowing
    slope = narrow.log_slope.T
    np.testing.assert_allclose(narrow.log_share.sum(axis=0), 1.0, atol=1e-12)
    for n, name in enumerate(uncertainty.names):
        for kept, left in ((0.0, narrow.log_deviation_exact), (0.5, narrow.log_deviation_half)):
            better = uncertainty.deviation_kj_mol.copy()
            better[n] *= kept
            other = replace(uncertainty, deviation_kj_mol=better)
            np.testing.assert_allclose(left[n], deviation(slope, other), atol=1e-12, err_msg=name)
    best = narrow.best_for_log()[0]
    assert narrow.log_deviation_exact[narrow.names.index(best), 0] == min(
        narrow.log_deviation_exact[:, 0]
    )


def test_the_same_seed_gives_the_same_answer(tmp_path: Path) -> None:
    first, again = doubted(tmp_path).doubt(), doubted(tmp_path).doubt()
    other = doubted(tmp_path, more="seed = 2\n").doubt()

    def median(result: Doubt) -> list[float]:
        spread = result.rates["pool"].spread
        assert spread is not None
        return spread.log_bands[2].tolist()

    assert median(first) == median(again)
    assert median(first) != median(other)


def test_drawn_energies_have_the_covariance(tmp_path: Path) -> None:
    more = 'correlation = { same_kind = 0.5, across = 0.2 }\npairs = [["A", "TS1", 0.4]]\n'
    uncertainty = uncertain(doubted(tmp_path, samples=20_000, more=more))
    a, ts1, w = (uncertainty.names.index(name) for name in ("A", "TS1", "W"))
    found = np.cov(uncertainty.drawn().T)
    assert found[a, a] == pytest.approx(4.0, abs=0.2)  # 4 sigma^2 (2/N)^(1/2) = 0.16
    assert found[ts1, ts1] == pytest.approx(9.0, abs=0.4)
    assert found[a, ts1] == pytest.approx(0.4 * 6.0, abs=0.25)
    assert found[a, w] == pytest.approx(0.5 * 4.0, abs=0.2)


def test_probability_that_the_energy_is_negative(tmp_path: Path) -> None:
    """One step, E_a normal about its value: the normal distribution gives the probability."""
    text = chain_text(2, 0, 1, 1, DOUBT.format(deviation=30, saddle=60, samples=4000))
    rate = load(tmp_path, text).doubt().rates["free"]
    assert rate.spread is not None
    from scipy.stats import norm

    expected = norm.cdf(-rate.answer.arrhenius_energy_kj_mol[0] / np.hypot(30.0, 60.0))
    assert 0.05 < expected < 0.95
    error = rate.spread.negative_energy.error[0]
    assert error == pytest.approx(np.sqrt(expected * (1 - expected) / 4000), rel=0.1)
    assert rate.spread.negative_energy.value[0] == pytest.approx(expected, abs=4.0 * error)


def test_a_step_without_a_saddle_point_has_its_own_deviation(tmp_path: Path) -> None:
    step = ('rate = "2e7 L/mol/s"', 'barrier = "35 kJ/mol"\ndeviation = "5 kJ/mol"')
    study = doubted(tmp_path, step, deviation=0.0, saddle=0.0, samples=500)
    assert uncertain(study).names[-1] == "A + W2 = P + W"
    rate = study.doubt().rates["free"]
    control = base(study).rate("free")
    rt = GAS_J_MOL_K * np.array(study.conditions.temperature_k) / 1000.0
    number = [edge.step for edge in base(study).network.edges].index(4)
    expected = np.abs(control.saddles[:, number]) * 5.0 / rt
    np.testing.assert_allclose(rate.first_order_log_deviation, expected, rtol=1e-6)


@pytest.mark.parametrize(
    ("more", "message"),
    [
        ('pairs = [["A", "C", 0.9], ["C", "P", 0.9], ["A", "P", -0.9]]', "smallest eigenvalue"),
        ('pairs = [["A", "TS3", 0.9]]', "'TS3' has no energy that is in doubt"),
        ('pairs = [["A", "A", 0.9]]', "a pair of 'A' with itself"),
        ("samples = 5", "5 is below 100"),
        ("correlation = { same_kind = 1.5 }", "1.5 is above 1"),
    ],
)
def test_what_a_study_may_not_say(tmp_path: Path, more: str, message: str) -> None:
    text = DOUBT.format(deviation=2, saddle=3, samples=1000)
    if more.startswith("samples"):
        text, more = text.replace("samples = 1000", more), ""
    with pytest.raises(StudyError, match=message):
        load(tmp_path, edited() + text + more + "\n")


def test_deviations_below_zero_in_the_wrong_place_or_without_use(tmp_path: Path) -> None:
    with pytest.raises(StudyError, match="is below 0"):
        doubted(tmp_path, deviation=-1.0)
    with pytest.raises(StudyError, match=r"no use without \[doubt\]"):
        load(tmp_path, edited(('entropy = "256', 'deviation = "1 kJ/mol"\nentropy = "256')))
    with pytest.raises(StudyError, match="does not say how sure"):
        load(tmp_path, edited()).doubt()


def test_held_amounts_in_balance_by_chance_are_refused(tmp_path: Path) -> None:
    """W and W2 both at stated amounts: moved energies put them out of balance."""
    start = load(tmp_path, edited())
    rates = base(start)
    g = {n: float(rates.energies.reduced[1, rates.energies.index(n)]) for n in ("W", "W2")}
    amount = np.exp(2.0 * np.log(1e-3) + 2.0 * g["W"] - g["W2"])
    held = ('W2 = "equilibrium"', f'W2 = "{amount:.17g} mol/L"')
    one = ('["280 K", "25 degC"]', '["25 degC"]')
    with pytest.raises(StudyError, match="only as long as no energy is moved"):
        doubted(tmp_path, held, one).doubt()


def test_a_network_that_is_not_linear_has_a_finding(tmp_path: Path) -> None:
    study = doubted(tmp_path, ('held = { W = "1e-3 mol/L", W2 = "equilibrium" }', "held = {}"))
    result = study.doubt()
    assert not result.rates
    assert [finding.code for finding in result.findings] == ["doubt-not-linear"]


def test_barrier_shows_it(tmp_path: Path) -> None:
    doubted(tmp_path, samples=200)
    file = str(tmp_path / "study.toml")
    run = CliRunner()
    shown = run.invoke(main, ["barrier", file, "--quiet"])
    assert shown.exit_code == 0, shown.output
    assert "Doubt about the rate per pool" in shown.output
    assert "200 samples of the energies (seed 1)" in " ".join(shown.output.split())
    assert "Doubt" not in run.invoke(main, ["barrier", file, "--quiet", "--no-doubt"]).output
    table = run.invoke(main, ["barrier", file, "--quiet", "--format", "csv"])
    assert table.exit_code == 0, table.output
    answer = json.loads(run.invoke(main, ["barrier", file, "--quiet", "--format", "json"]).stdout)
    doubt = answer["doubt"]
    assert doubt["samples"] == 200
    assert len(doubt["rates"]["per_pool"]["samples"]["log_bands"]) == 5
    assert doubt["rates"]["relaxation"]["samples"]["samples"] == 200
    assert "E_a per pool is negative" in answer["words"]


def test_levels_and_choices_stand_beside(tmp_path: Path) -> None:
    """Every named level of the bundled study, at one temperature, and every choice."""
    plume = Path(__file__).parent.parent / "fixtures" / "stack-plume"
    text = (plume / "study.toml").read_text(encoding="utf-8")
    text = text.replace('outputs = "outputs"', f'outputs = "{plume / "outputs"}"')
    assert text.count("\n[doubt]\n") == 1
    text = text.replace("\n[doubt]\n", "\n[doubt]\nsamples = 200\n")
    (tmp_path / "study.toml").write_text(text, encoding="utf-8")
    study = Study.load(tmp_path / "study.toml", temperatures=[298.15])
    result = study.doubt()
    levels = [one for one in result.alternatives if one.choice == "level of theory"]
    assert [one.instead for one in levels] == list(study.level_names)
    for one in levels:
        own = study.at_level(one.instead).effective().rates["pool"]
        assert own is not None
        assert one.answers["pool"].arrhenius_energy_kj_mol[0] == own.arrhenius_energy_kj_mol[0]
        assert np.exp(one.answers["pool"].log_rate[0]) == pytest.approx(own.rate_constant[0])
    choices = {one.choice for one in result.alternatives}
    assert {"soft modes", "onset", "symmetry number", "scale factors"} <= choices


@pytest.mark.parametrize(("deviation", "shown"), [(5.0, (2, 0)), (0.5, (3, 1)), (1e-4, (4, 2))])
def test_digits_follow_the_doubt(tmp_path: Path, deviation: float, shown: tuple[int, int]) -> None:
    """Digits of k, decimals of E_a: the standard deviation of ln k is 4.5, 0.45 or 9e-5."""
    study = doubted(tmp_path, deviation=deviation, saddle=deviation, samples=100)
    blocks = barrier_tables.tables(
        study.effective(), study.treatment, "kJ/mol", doubt=study.doubt()
    )
    table = next(block for block in blocks if isinstance(block, Table))
    columns = {column.quantity: column for column in table.columns}
    assert (columns["k"].digits, columns["Eₐ"].decimals) == shown
    assert any("[doubt]" in note for note in table.notes)
