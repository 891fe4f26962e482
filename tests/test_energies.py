"""Electronic energies of parts: sums, limits of the basis set, solvation, counterpoise."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import msgspec
import numpy as np
import pytest
from structures import water

import thermo_pp as tp
from thermo_pp.conditions import MOLAR, StandardState, Treatment, standard_state
from thermo_pp.energies.basis_sets import family_and_cardinal
from thermo_pp.energies.recipe import CheckedEnergy, recipe_findings
from thermo_pp.energies.solvation import to_molar
from thermo_pp.errors import StudyError
from thermo_pp.formulas.extrapolation import (
    exponential_decay,
    power_decay,
    root_exponential_decay,
    two_point_limit,
)
from thermo_pp.records import Calculation, MethodEnergy
from thermo_pp.species.energy import ElectronicEnergy, EnergyPart
from thermo_pp.species.many import many
from thermo_pp.species.structure import Structure
from thermo_pp.study.energies import make_energy
from thermo_pp.study.keys import EnergyKeys
from thermo_pp.units import GAS_J_MOL_K, HARTREE_KJ_MOL

FIXTURES = Path(__file__).parent.parent / "fixtures"
PLUME = FIXTURES / "stack-plume" / "outputs"
PARTS = FIXTURES / "energies" / "outputs"
WHERE = "study.toml [species.W] energy"


def read(name: str, where: str) -> Calculation:
    """Read an output of the fixtures by its name."""
    folder = PARTS if (PARTS / name).exists() else PLUME
    return tp.read(folder / name)


def made(
    keys: Any, frequencies: Calculation, phase: Any = "gas", outputs: Any = read
) -> CheckedEnergy:
    table = keys if isinstance(keys, str) else msgspec.convert(keys, EnergyKeys)
    return make_energy(table, frequencies, phase, outputs, WHERE)


def single(path: str, energy: float, **fields: Any) -> Calculation:
    """Water again, as a single point."""
    known: dict[str, Any] = {
        "path": path,
        "sha256": path,
        "wavenumbers_cm": None,
        "modes": None,
        "energy_hartree": energy,
        "method": "MP2",
        "energy_label": "MP2",
        "basis": "cc-pVTZ",
        "dispersion": "none",
        "solvent": "none",
        "frozen_core": "frozen",
    }
    return water(**{**known, **fields})


def by_name(*calculations: Calculation) -> Any:
    known = {calc.path: calc for calc in calculations}
    return lambda name, where: known[name]


# --- formulas


@pytest.mark.parametrize("decay", [power_decay, exponential_decay, root_exponential_decay])
def test_the_limit_of_an_energy_that_falls_off_so_is_found(decay: Any) -> None:
    x = np.array([2.0, 3.0, 4.0, 5.0])
    e = -76.4 + 0.37 * decay(x)
    found = two_point_limit(e[:-1], e[1:], decay(x[:-1]), decay(x[1:]))
    assert found == pytest.approx(np.full(3, -76.4), abs=1e-13, rel=0.0)


def test_decays_at_a_cardinal_number() -> None:
    # 3^-3, exp(-4.89), 4 exp(-9 sqrt 3), with mpmath
    assert float(power_decay(3)) == pytest.approx(1.0 / 27.0, rel=1e-14)
    assert float(exponential_decay(3)) == pytest.approx(0.00752142247499327, rel=1e-13)
    assert float(root_exponential_decay(3)) == pytest.approx(6.79327222643250564e-7, rel=1e-13)


def test_no_limit_between_the_same_numbers() -> None:
    with pytest.raises(ValueError, match="must decrease"):
        two_point_limit(-1.0, -1.1, power_decay(3), power_decay(3))


@pytest.mark.parametrize(
    ("basis", "found"),
    [
        ("cc-pVDZ", ("cc-pvxz", 2)),
        ("AUG-CC-PV(T+D)Z", ("aug-cc-pv(x+d)z", 3)),
        ("aug-cc-pwCVQZ", ("aug-cc-pwcvxz", 4)),
        ("cc-pV5Z-PP", ("cc-pvxz-pp", 5)),
        ("def2-TZVP", None),
        ("6-311G(d,p)", None),
        (None, None),
    ],
)
def test_family_and_cardinal_number(basis: str | None, found: Any) -> None:
    assert family_and_cardinal(basis) == found


# --- what readers tell apart


@pytest.mark.parametrize(
    ("file", "energies"),
    [
        (  # the digits of the file
            PLUME / "so3_ccsdt.out",
            {
                "HF": MethodEnergy(-622.02502275642360, 235),
                "MP2": MethodEnergy(-622.741904446359, 383),
                "CCSD": MethodEnergy(-622.732156780284, 388),
                "CCSD(T)": MethodEnergy(-622.760072017760, 440),
            },
        ),
        (
            FIXTURES / "nwchem" / "good" / "hydroxide_mp2_energy.out",
            {"HF": MethodEnergy(-75.375353808369, 342), "MP2": MethodEnergy(-75.587497582481, 579)},
        ),
        (
            PARTS / "water-gas.out",
            {"DFT": MethodEnergy(-76.358188406777, 348)},
        ),
    ],
    ids=["psi4", "nwchem", "nwchem DFT"],
)
def test_energies_of_the_methods_in_a_file(file: Path, energies: dict[str, MethodEnergy]) -> None:
    assert dict(tp.read(file).method_energies) == energies


# --- sums


def test_mp2_in_a_large_basis_and_a_correction_in_a_small_one() -> None:
    found = made(
        {
            "sum": [
                {"file": "so3_mp2-qz.out"},
                {"file": "so3_ccsdt.out"},
                {"file": "so3_ccsdt.out", "method": "mp2", "factor": -1},
            ]
        },
        tp.read(PLUME / "so3.out"),
    )
    # by hand: -623.1635586300714 + (-622.760072017760 - -622.741904446359)
    assert found.energy.value_hartree == pytest.approx(-623.1817262014724, abs=1e-11, rel=0.0)
    parts = found.energy.parts
    assert [part.slot for part in parts] == ["sum.1", "sum.2", "sum.3"]
    assert [part.lines for part in parts] == [(411,), (440,), (383,)]
    assert {part.origin for part in parts} == {"printed"}
    assert parts[2].heading == "\N{MINUS SIGN} MP2/CC-PV(D+D)Z"
    assert found.words == (
        "MP2/AUG-CC-PV(Q+D)Z + CCSD(T)/CC-PV(D+D)Z \N{MINUS SIGN} MP2/CC-PV(D+D)Z, frozen core"
    )
    assert found.energy.files == tuple(str(PLUME / f"so3_{n}.out") for n in ("mp2-qz", "ccsdt"))


def test_factors_may_be_any_that_make_a_total_energy() -> None:
    files = by_name(single("a", -1.0), single("b", -3.0))
    keys = {"sum": [{"file": "a", "factor": -0.2}, {"file": "b", "factor": 1.2}]}
    assert made(keys, water(), outputs=files).energy.value_hartree == pytest.approx(-3.4, abs=1e-14)


@pytest.mark.parametrize(
    ("keys", "what", "where"),
    [
        (
            {"sum": [{"file": "a"}, {"file": "b"}]},
            "the factors of the parts add up to 2, not to 1",
            WHERE,
        ),
        (
            {"sum": [{"file": "a"}, {"file": "b"}, {"file": "a", "method": "CCSD", "factor": -1}]},
            "a has no CCSD energy beside its own (MP2)",
            f"{WHERE}.sum.3",
        ),
        ({"sum": [{"file": "moved"}]}, "different geometries", f"{WHERE}.sum.1"),
        ({"sum": [{"file": "ion"}]}, "ion has charge 1, but water", f"{WHERE}.sum.1"),
        ({"sum": [{"file": "failed"}]}, "failed has no energy", f"{WHERE}.sum.1"),
        (
            {"solvation": {"value": "-20 kJ/mol", "gas_state": "1 bar"}},
            "a solvation term in the gas phase",
            f"{WHERE}.solvation",
        ),
    ],
)
def test_what_a_sum_refuses(keys: Any, what: str, where: str) -> None:
    positions = water().positions_angstrom * 1.02
    files = by_name(
        single("a", -1.0, method_energies={"HF": MethodEnergy(-0.9, 3)}),
        single("b", -1.1),
        single("moved", -1.0, positions_angstrom=positions),
        single("ion", -1.0, charge=1, multiplicity=2),
        single("failed", -1.0, energy_hartree=None),
    )
    with pytest.raises(StudyError) as caught:
        made(keys, water(path="water.out"), outputs=files)
    assert what in caught.value.what
    assert caught.value.where == where


# --- limits of the basis set

LIMIT = {"files": ["so3_mp2.out", "so3_mp2-qz.out"], "correlation": "X^-3"}


@pytest.mark.parametrize(
    ("reference", "energy", "origin"),
    [
        # with mpmath, h3 and h4 from the two files: h4 + (h4 - h3) f4/(f3 - f4)
        ("exp(-1.63 X)", -622.181312652427141, "derived"),
        ("(X+1) exp(-9 sqrt X)", -622.178896554284777, "derived"),
        ("largest", -622.1762989005948157, "printed"),
    ],
)
def test_reference_and_correlation_at_the_limit(reference: str, energy: float, origin: str) -> None:
    found = made({"extrapolate": {**LIMIT, "reference": reference}}, tp.read(PLUME / "so3.out"))
    base, rest = found.energy.parts
    assert base.value_hartree == pytest.approx(energy, abs=1e-11, rel=0.0)
    assert base.origin == origin
    # by hand: (64 c4 - 27 c3)/37, c3 = -0.9251295297632312, c4 = -0.9872597294765375
    assert rest.value_hartree == pytest.approx(-1.032597983321383, abs=1e-11, rel=0.0)
    assert rest.origin == "derived"
    assert rest.lines == (367, 411)
    assert rest.name == "MP2 correlation/CBS(3,4)"


def test_a_declared_power() -> None:
    keys = {"extrapolate": {**LIMIT, "correlation": 2.4, "reference": "largest"}}
    found = made(keys, tp.read(PLUME / "so3.out")).energy.parts[1].value_hartree
    c3, c4 = -0.9251295297632312, -0.9872597294765375
    by_hand = (4**2.4 * c4 - 3**2.4 * c3) / (4**2.4 - 3**2.4)
    assert found == pytest.approx(by_hand, abs=1e-11, rel=0.0)


def correlated(path: str, basis: str | None, **fields: Any) -> Calculation:
    under = {"HF": MethodEnergy(-76.0, 5)}
    return single(path, -76.3, basis=basis, **{"method_energies": under, **fields})


@pytest.mark.parametrize(
    ("small", "large", "cardinals", "what"),
    [
        ("cc-pVTZ", "cc-pVTZ", None, "the same cardinal number: 3 and 3"),
        ("cc-pVQZ", "cc-pVTZ", None, "falling cardinals: 4 and 3"),
        ("cc-pVTZ", "aug-cc-pVQZ", None, "are of two families"),
        ("def2-TZVP", "def2-QZVP", None, "the basis set def2-TZVP does not follow from its name"),
        ("def2-TZVP", "def2-QZVP", [3, 3], "the same cardinal number: 3 and 3"),
        ("cc-pVTZ", "cc-pVQZ", [2, 3], "cardinals [2, 3] are declared"),
    ],
)
def test_basis_sets_that_do_not_belong_together(
    small: str, large: str, cardinals: Any, what: str
) -> None:
    keys: dict[str, Any] = {"files": ["a", "b"], "correlation": "X^-3", "reference": "largest"}
    if cardinals is not None:
        keys["cardinals"] = cardinals
    files = by_name(correlated("a", small), correlated("b", large))
    with pytest.raises(StudyError) as caught:
        made({"extrapolate": keys}, water(), outputs=files)
    assert what in caught.value.what
    assert caught.value.where == f"{WHERE}.extrapolate"


def test_declared_cardinals_stand_in_for_names() -> None:
    keys = {"files": ["a", "b"], "correlation": "X^-3", "reference": "largest", "cardinals": [3, 4]}
    files = by_name(correlated("a", "def2-TZVP"), correlated("b", "def2-QZVP"))
    assert (
        made({"extrapolate": keys}, water(), outputs=files)
        .energy.parts[1]
        .name.endswith("CBS(3,4)")
    )


@pytest.mark.parametrize(
    ("fields", "what"),
    [
        ({"method": "CCSD(T)", "energy_label": "CCSD(T)"}, "a and b differ in method"),
        ({"frozen_core": "none"}, "a and b differ in frozen core"),
        ({"method_energies": {}}, "b has no Hartree-Fock energy that the reader of"),
    ],
)
def test_outputs_that_cannot_be_extrapolated(fields: Any, what: str) -> None:
    keys = {"files": ["a", "b"], "correlation": "X^-3", "reference": "largest"}
    files = by_name(correlated("a", "cc-pVTZ"), correlated("b", "cc-pVQZ", **fields))
    with pytest.raises(StudyError) as caught:
        made({"extrapolate": keys}, water(), outputs=files)
    assert what in caught.value.what


# --- solvation


def test_solvent_less_gas() -> None:
    keys = {
        "sum": [{"file": "water_mp2.out"}],
        "solvation": {"solvent": "water-cosmo.out", "gas": "water-gas.out"},
    }
    found = made(keys, tp.read(PLUME / "water.out"), "solution")
    term = found.energy.parts[1]
    # by hand: -76.368635103058 - -76.358188406777
    assert term.value_hartree == pytest.approx(-0.010446696281, abs=1e-12, rel=0.0)
    assert term.name == "solvation (COSMO(h2o, dielectric 78.4))"
    assert [Path(file).name for file in term.files] == ["water-cosmo.out", "water-gas.out"]
    assert found.energy.solvation_slope_j_mol_k is None


@pytest.mark.parametrize(
    ("solvation", "what"),
    [
        ({"solvent": "g", "gas": "s"}, "g has no solvent model"),
        ({"solvent": "s", "gas": "s"}, "s has the solvent model COSMO"),
        ({"solvent": "s2", "gas": "g"}, "s2 and g differ in basis set: cc-pVQZ and cc-pVTZ"),
        ({"solvent": "s"}, "solvation has solvent"),
        ({"value": -20.0}, "the key 'gas_state' is missing"),
        ({"value": -20.0, "gas_state": "1 bar", "gas": "g"}, "solvation has gas, value, gas_state"),
        ({}, "solvation has nothing"),
        ({"value": -20.0, "gas_state": "1 K"}, "'1 K' is neither a pressure nor a concentration"),
    ],
)
def test_what_a_solvation_term_refuses(solvation: Any, what: str) -> None:
    files = by_name(
        single("g", -76.0),
        single("s", -76.01, solvent="COSMO"),
        single("s2", -76.01, solvent="COSMO", basis="cc-pVQZ"),
    )
    with pytest.raises(StudyError) as caught:
        made({"solvation": solvation}, water(), "solution", files)
    assert what in caught.value.what


def test_solvation_counts_once() -> None:
    files = by_name(single("s", -76.01, solvent="COSMO"))
    keys = {"sum": [{"file": "s"}], "solvation": {"value": -20.0, "gas_state": "1 mol/L"}}
    with pytest.raises(StudyError, match="solvation would count twice"):
        made(keys, water(), "solution", files)


def test_from_one_bar_to_one_molar() -> None:
    bar = standard_state("1 bar", where="")
    value, slope = to_molar(-26.4, None, bar, 298.15)
    # RT ln(RT 1 mol/L / 1 bar) = 7.95850 kJ/mol at 298.15 K (design/checks.md, section 3)
    assert value == pytest.approx(-26.4 - 7.95850, abs=5e-6, rel=0.0)
    assert slope is None
    assert to_molar(-26.4, 118.0, MOLAR, 298.15) == (-26.4, 118.0)


def test_the_slope_is_converted_with_the_value() -> None:
    def at(t: float) -> float:
        return to_molar(-26.4 + 0.118 * (t - 298.15), None, bar, t)[0]

    bar = StandardState("pressure", 1e5, "1 bar")
    by_difference = 1000.0 * (at(298.65) - at(297.65))
    assert to_molar(-26.4, 118.0, bar, 298.15)[1] == pytest.approx(by_difference, abs=1e-4)


SOLUTE = ElectronicEnergy(
    (
        EnergyPart("energy", "MP2/x", -76.0, 1.0, "printed", ("a",), (1,)),
        EnergyPart("solvation", "solvation", -0.01, 1.0, "derived", ("b", "c"), (1, 2)),
    ),
    solvation_slope_j_mol_k=40.0,
    solvation_at_k=300.0,
)
SOLUTION = Treatment(
    standard_state=MOLAR, phase="solution", entropy_correction_j_mol_k=-15.0, rotor="classical"
)


def test_a_solute_over_temperature() -> None:
    t = np.array([250.0, 300.0, 350.0])
    plain = Structure.make(
        water(), Treatment(standard_state=MOLAR, phase="solution", rotor="classical"),
        name="W", energy=single("a", -76.0),
    ).at(t)  # fmt: skip
    model = Structure.make(water(), SOLUTION, name="W", energy=SOLUTE)
    found = model.at(t)
    solvation = -0.01 * HARTREE_KJ_MOL + 0.040 * (t - 300.0)
    assert found.gibbs_kj_mol - plain.gibbs_kj_mol == pytest.approx(
        solvation + 0.015 * t, abs=1e-9, rel=0.0
    )
    assert found.entropy_j_mol_k - plain.entropy_j_mol_k == pytest.approx(
        np.full(3, -55.0), abs=1e-9, rel=0.0
    )
    assert found.heat_capacity_j_mol_k == pytest.approx(plain.heat_capacity_j_mol_k, abs=1e-12)


def test_the_slope_of_g_is_that_of_the_solute() -> None:
    model = Structure.make(water(), SOLUTION, name="W", energy=SOLUTE)
    low, mid, high = (model.at(t) for t in (299.9, 300.0, 300.1))
    e = SOLUTE.value_hartree * HARTREE_KJ_MOL  # its own part, -T^2 d(e/T)/dT = e, is taken out
    slope = ((high.gibbs_kj_mol - e) / 300.1 - (low.gibbs_kj_mol - e) / 299.9) / 0.2
    assert mid.slope_enthalpy_kj_mol - e == pytest.approx(-(300.0**2) * slope, abs=1e-4, rel=0.0)


def test_the_shares_add_up() -> None:
    model = Structure.make(water(), SOLUTION, name="W", energy=SOLUTE)
    found = model.at(310.0)
    parts = found.parts()
    assert list(parts["part"])[-2:] == ["solvation over temperature", "entropy correction"]
    total = parts["gibbs_kj_mol"].sum() + float(found.electronic_kj_mol or 0.0)
    assert total == pytest.approx(float(found.gibbs_kj_mol[0]), abs=1e-8, rel=0.0)
    assert float(many([model], [310.0]).gibbs_kj_mol[0, 0]) == pytest.approx(
        float(found.gibbs_kj_mol[0]), abs=1e-8, rel=0.0
    )
    assert float(many([model], [310.0]).entropy_j_mol_k[0, 0]) == pytest.approx(
        float(found.entropy_j_mol_k[0]), abs=1e-10, rel=0.0
    )


def test_one_molar_and_one_bar_differ_by_the_conversion_alone() -> None:
    model = Structure.make(water(), SOLUTION, name="W", energy=SOLUTE)
    bar = standard_state("1 bar", where="")
    molar, pressure = model.at(298.15), model.at(298.15, standard_state=bar)
    shift = GAS_J_MOL_K * 298.15 * np.log(1000.0 * GAS_J_MOL_K * 298.15 / 1e5) / 1000.0
    assert molar.gibbs_kj_mol - pressure.gibbs_kj_mol == pytest.approx(shift, abs=1e-9, rel=0.0)


def test_an_entropy_correction_is_for_solutions(tmp_path: Path) -> None:
    found = tp.thermochemistry(water(), phase="solution", entropy_correction="-15 J/mol/K")
    plain = tp.thermochemistry(water(), phase="solution")
    assert found.entropy_j_mol_k - plain.entropy_j_mol_k == pytest.approx(-15.0, abs=1e-10)
    with pytest.raises(StudyError, match="an entropy correction in the gas phase"):
        tp.thermochemistry(water(), entropy_correction=-15.0)


# --- counterpoise


def fragments(**changes: Any) -> Any:
    donor = {"atoms": [1, 2, 3], "own": "donor.out", "ghosts": "donor-ghosts.out"}
    acceptor = {"atoms": [4, 5, 6], "own": "acceptor.out", "ghosts": "acceptor-ghosts.out"}
    return {"counterpoise": [{**donor, **changes}, acceptor]}


def test_counterpoise_of_the_water_dimer() -> None:
    found = made(fragments(), tp.read(PLUME / "water-dimer.out"))
    term = found.energy.parts[1]
    # by hand from the totals of the files: own less ghosts, donor and acceptor
    by_hand = (-76.22818698914422 + 76.22880167055042) + (-76.22822306762461 + 76.2328920003785)
    assert term.value_hartree == pytest.approx(by_hand, abs=1e-12, rel=0.0)
    assert by_hand * HARTREE_KJ_MOL == pytest.approx(13.87, abs=0.01)
    assert term.origin == "derived"
    assert [Path(path).name for path in found.ghosts] == ["donor-ghosts.out", "acceptor-ghosts.out"]
    assert found.findings == ()


def test_a_declared_counterpoise_term() -> None:
    found = made({"counterpoise": "13.87 kJ/mol"}, tp.read(PLUME / "water-dimer.out"))
    assert found.energy.parts[1].share_hartree * HARTREE_KJ_MOL == pytest.approx(13.87, abs=1e-10)
    assert found.energy.parts[1].origin == "declared"
    assert found.energy.parts[1].files == ()


@pytest.mark.parametrize(
    ("changes", "what", "key"),
    [
        ({"atoms": [1, 2]}, "atom 3 of", ""),
        ({"atoms": [1, 2, 3, 4]}, "atom 4 of", ""),
        ({"atoms": [1, 2, 7]}, "there is no atom 7", ".1.atoms"),
        ({"atoms": [2, 1, 3]}, None, ""),
        ({"own": "donor-ghosts.out"}, "donor-ghosts.out has ghost atoms", ".1.own"),
        ({"ghosts": "donor.out"}, "donor.out has no ghost atoms", ".1.ghosts"),
        ({"own": "acceptor.out"}, "different geometries", ".1.own"),
        ({"ghosts": "acceptor-ghosts.out"}, "different geometries", ".1.ghosts"),
        ({"own": "water_mp2.out"}, "differ in basis set", ".1"),
    ],
)
def test_what_a_counterpoise_term_refuses(changes: Any, what: str | None, key: str) -> None:
    dimer = tp.read(PLUME / "water-dimer.out")
    if what is None:  # the order of the atoms is free
        assert len(made(fragments(**changes), dimer).energy.parts) == 2
        return
    with pytest.raises(StudyError) as caught:
        made(fragments(**changes), dimer)
    assert what in caught.value.what
    assert caught.value.where == f"{WHERE}.counterpoise{key}"


# --- side by side


def test_energies_of_one_recipe_are_compared_part_by_part() -> None:
    files = by_name(
        single("a1", -1.0), single("a2", -2.0, basis="cc-pVDZ"),
        single("b1", -1.0), single("b2", -2.0, basis="cc-pVQZ"),
    )  # fmt: skip

    def pair_of(one: str, other: str) -> CheckedEnergy:
        keys = {"sum": [{"file": one, "factor": 2}, {"file": other, "factor": -1}]}
        return made(keys, water(), outputs=files)

    mixed = recipe_findings({"A": pair_of("a1", "a2"), "B": pair_of("b1", "b2")}, "study.toml")
    assert [(finding.code, finding.severity) for finding in mixed] == [("mixed-level", "error")]
    assert "the basis set of the energies (sum.2) differs" in mixed[0].what
    assert recipe_findings({"A": pair_of("a1", "a2"), "B": pair_of("b1", "a2")}, "study.toml") == ()


def test_energies_of_two_recipes_are_an_error() -> None:
    files = by_name(single("a", -1.0), single("b", -1.0))
    one = made({"sum": [{"file": "a"}]}, water(), outputs=files)
    two = made(
        {"sum": [{"file": "b", "factor": 2}, {"file": "b", "factor": -1}]}, water(), outputs=files
    )
    found = recipe_findings({"A": one, "B": two, "C": one}, "study.toml")
    assert [(finding.code, finding.severity) for finding in found] == [("mixed-recipe", "error")]
    assert "sum.1 for A, C; 2 sum.1 -1 sum.2 for B" in found[0].what


def test_only_complexes_have_a_counterpoise_term() -> None:
    dimer = made({"counterpoise": 13.0}, water())
    assert (
        recipe_findings({"W2": dimer, "W": make_energy(None, water(), "gas", read, WHERE)}, "")
        == ()
    )
