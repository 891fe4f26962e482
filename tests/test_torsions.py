"""Torsions of structures: the mode replaced, symmetry, handedness, scans, and what is refused."""

from __future__ import annotations

import dataclasses
import re
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from ase.build import molecule
from structures import made

import thermo_pp as tp
from thermo_pp.conditions import Treatment
from thermo_pp.errors import StudyError
from thermo_pp.formulas.normal_modes import internal_space
from thermo_pp.formulas.torsion import torsion
from thermo_pp.formulas.turning import dihedral, top_of, turn, turned
from thermo_pp.isotopes import isotopologues
from thermo_pp.names import LOW_MODES
from thermo_pp.records import Calculation
from thermo_pp.scans import scan_from_table
from thermo_pp.sources import Source
from thermo_pp.species import Structure, parse_torsions
from thermo_pp.species.many import many
from thermo_pp.units import HARTREE_KJ_MOL, WAVENUMBER_KJ_MOL

OUTPUTS = Path(__file__).parents[1] / "fixtures" / "torsions" / "outputs"
SCAN = sorted(OUTPUTS.glob("hydrogen_peroxide_scan_*"))
ATOMS = [1, 2, 3, 4]
T = [100.0, 298.15, 1000.0]


@pytest.fixture(scope="module")
def peroxide() -> Calculation:
    return tp.read(OUTPUTS / "hydrogen_peroxide_freq.out.gz")


@pytest.fixture(scope="module")
def points() -> list[Calculation]:
    return [tp.read(path) for path in SCAN]


def entry(points: list[Calculation], **keys: Any) -> dict[str, Any]:
    return {"atoms": ATOMS, "scan": points, "mirror": "0 deg", **keys}


def structure(calc: Calculation, *entries: dict[str, Any], **keys: Any) -> Structure:
    def no_file(name: str, where: str) -> Any:
        raise AssertionError(name)

    choices = parse_torsions(entries, calc, no_file, where="test torsions")
    treatment = keys.pop("treatment", Treatment())
    return Structure.make(calc, treatment, name="X", torsions=choices, **keys)


def table(points: list[Calculation], unit: str, factor: float) -> str:
    rows = [
        f"{angle:.6f},{energy * factor:.12f}"
        for angle, energy in (
            (20.0 * k, calc.energy_hartree) for k, calc in enumerate(points) if calc.energy_hartree
        )
    ]
    return "\n".join(["# a comment", f"angle / deg,energy / {unit}", *rows, ""])


def test_the_torsion_stands_in_place_of_its_mode(
    peroxide: Calculation, points: list[Calculation]
) -> None:
    plain = tp.thermochemistry(peroxide, T)
    found = tp.thermochemistry(peroxide, T, torsions=[entry(points)])
    parts = found.parts()
    assert parts.part.tolist()[:5] == [
        "translation", "rotation", "vibration", "torsion", "electronic"]  # fmt: skip
    words = parts.treated_as[3]
    assert words.startswith("hindered rotor in place of mode 1, I 0.427 u Å², highest barrier 31.9")
    assert words.endswith("symmetry number 1, both hands")
    modes = found.modes()
    assert modes.treated_as[0] == "replaced by torsion 1"
    assert modes.zero_point_kj_mol[0] == 0.0
    assert np.isnan(modes.used_cm[0])
    for column in ("enthalpy_kj_mol", "entropy_j_mol_k", "heat_capacity_j_mol_k"):
        sums = parts.groupby("temperature_k")[column].sum().to_numpy()
        whole = getattr(found, column).copy()
        if column == "enthalpy_kj_mol":
            whole -= found.electronic_kj_mol
        assert sums == pytest.approx(whole, abs=1e-6)
    # the ground state of the torsion in place of half a quantum of its mode
    (own,) = structure(peroxide, entry(points)).torsions
    ground = torsion(298.15, own.rotor).zero_point_j_mol / 1000.0
    half = 0.5 * WAVENUMBER_KJ_MOL * peroxide.wavenumbers_cm[0]  # type: ignore[index]
    assert found.zero_point_kj_mol == pytest.approx(
        plain.zero_point_kj_mol - half + ground, abs=1e-9
    )
    assert own.overlap is not None
    assert own.overlap > 0.98
    assert {f.code for f in found.findings} >= {"torsion-treated"}
    # -T^2 d(G/T)/dT is H where no mode is interpolated
    strict = tp.thermochemistry(peroxide, T, torsions=[entry(points)], low_modes="harmonic")
    assert strict.slope_enthalpy_kj_mol == pytest.approx(strict.enthalpy_kj_mol, abs=1e-9)


def test_both_hands_lie_on_the_circle(peroxide: Calculation, points: list[Calculation]) -> None:
    assert structure(peroxide).degeneracy == 2
    own = structure(peroxide, entry(points))
    assert own.degeneracy == 1
    assert own.torsions[0].holds_both_hands
    assert own.symmetry_number == 2  # of the structure; that of the torsion is 1
    pure = structure(peroxide, entry(points), treatment=Treatment(enantiopure=True))
    assert pure.degeneracy == 1
    assert "torsion-both-hands" in [finding.code for finding in pure.findings]
    assert "torsion-both-hands" not in [finding.code for finding in own.findings]


def test_high_barriers_leave_what_the_oscillator_has(peroxide: Calculation) -> None:
    # wells at both angles +-x0, V ~ (cos x - cos x0)^2, and a moment whose small swings are the mode:
    # the torsion then has the two hands within it, nothing counted twice or lost
    cos0 = np.cos(np.radians(dihedral(peroxide.positions_angstrom, [0, 1, 2, 3])))
    terms = [[1, -4.0 * cos0 * 2000.0, 0.0], [2, 2000.0, 0.0]]
    rotor = {"atoms": ATOMS, "fourier": terms, "symmetry_number": 1}
    first = structure(peroxide, {**rotor, "reduced_moment": 1.0})
    swing = first.torsions[0].rotor.harmonic_cm()
    nu = float(peroxide.wavenumbers_cm[0])  # type: ignore[index]
    rotor["reduced_moment"] = (swing / nu) ** 2
    own = structure(peroxide, rotor, treatment=Treatment(low_modes="harmonic")).at(T)
    plain = structure(peroxide, treatment=Treatment(low_modes="harmonic")).at(T)
    assert own.degeneracy == 1
    assert plain.degeneracy == 2
    assert own.entropy_j_mol_k == pytest.approx(plain.entropy_j_mol_k, abs=0.05)
    assert own.gibbs_kj_mol == pytest.approx(plain.gibbs_kj_mol, abs=0.05)


@pytest.mark.parametrize(
    ("unit", "factor"),
    [
        ("hartree", 1.0),
        ("kJ mol^-1", HARTREE_KJ_MOL),
        ("kJ/mol", HARTREE_KJ_MOL),
        ("kcal/mol", HARTREE_KJ_MOL / 4.184),
        ("cm^-1", HARTREE_KJ_MOL / WAVENUMBER_KJ_MOL),
    ],
)
def test_a_table_is_as_good_as_the_outputs(
    unit: str, factor: float, peroxide: Calculation, points: list[Calculation], tmp_path: Path
) -> None:
    path = tmp_path / "scan.csv"
    path.write_text(table(points, unit, factor))
    found = tp.thermochemistry(peroxide, T, torsions=[{**entry(points), "scan": path}])
    expected = tp.thermochemistry(peroxide, T, torsions=[entry(points)])
    assert found.gibbs_kj_mol == pytest.approx(expected.gibbs_kj_mol, abs=2e-5)


def test_all_soft_mode_treatments_agree_on_a_torsion(
    peroxide: Calculation, points: list[Calculation]
) -> None:
    shares = [
        tp.thermochemistry(peroxide, 298.15, torsions=[entry(points)], low_modes=name).rows[3]
        for name in LOW_MODES
    ]
    assert len({float(share.gibbs_kj_mol[0]) for share in shares}) == 1


def test_many_structures_at_once(peroxide: Calculation, points: list[Calculation]) -> None:
    own, plain = structure(peroxide, entry(points)), structure(peroxide)
    found = many([own, plain, own], T)
    for row, one in enumerate((own, plain, own)):
        assert found.gibbs_kj_mol[row] == pytest.approx(one.at(T).gibbs_kj_mol, abs=1e-9)
        assert found.entropy_j_mol_k[row] == pytest.approx(one.at(T).entropy_j_mol_k, abs=1e-9)


def test_the_mode_may_be_named(peroxide: Calculation, points: list[Calculation]) -> None:
    bare = dataclasses.replace(peroxide, modes=None)
    for mode in (1, "371.6 cm^-1"):
        own = structure(bare, entry(points, mode=mode))
        assert own.torsions[0].mode == 0
        assert own.torsions[0].overlap is None
        assert own.at(T).gibbs_kj_mol == pytest.approx(
            structure(peroxide, entry(points)).at(T).gibbs_kj_mol, abs=1e-9
        )
    # another mode is taken at the user's word, with doubts
    codes = [finding.code for finding in structure(peroxide, entry(points, mode=4)).findings]
    assert "torsion-overlap" in codes
    assert "torsion-curvature" in codes


def test_a_saddle_point(peroxide: Calculation, points: list[Calculation]) -> None:
    # the O-O stretch made imaginary: the torsion is still found, the reaction coordinate left out
    assert peroxide.modes is not None
    assert peroxide.wavenumbers_cm is not None
    order = [1, 0, 2, 3, 4, 5]
    waves = peroxide.wavenumbers_cm[order] * np.array([-1.0, 1, 1, 1, 1, 1])
    saddle = dataclasses.replace(peroxide, wavenumbers_cm=waves, modes=peroxide.modes[order])
    own = structure(saddle, entry(points), kind="saddle")
    assert own.torsions[0].mode == 1
    assert own.imaginary_cm == pytest.approx(waves[0])
    assert own.modes.real_cm == pytest.approx(waves[2:])
    wrong = peroxide.wavenumbers_cm * np.array([-1.0, 1, 1, 1, 1, 1])
    saddle = dataclasses.replace(peroxide, wavenumbers_cm=wrong)
    with pytest.raises(StudyError, match=r"mode 1 \(-371\.6 cm\^-1\) is the reaction coordinate"):
        structure(saddle, entry(points), kind="saddle")


def test_isotopologues(peroxide: Calculation, points: list[Calculation]) -> None:
    # a Hessian with the modes of the output; the scan is the same for all isotopes
    assert peroxide.modes is not None
    assert peroxide.wavenumbers_cm is not None
    root = np.repeat(np.sqrt(peroxide.masses_u), 3)
    vectors = peroxide.modes.reshape(6, -1) * root
    vectors = np.linalg.qr((vectors / np.linalg.norm(vectors, axis=1, keepdims=True)).T)[0]
    weighted = vectors @ np.diag((peroxide.wavenumbers_cm / 5140.487) ** 2) @ vectors.T
    inner = internal_space(peroxide.masses_u, peroxide.positions_angstrom)
    weighted = (
        inner @ (inner.T @ weighted @ inner) @ inner.T
    )  # printed modes hold some overall motion
    calc = dataclasses.replace(peroxide, hessian_hartree_bohr2=weighted * np.outer(root, root))
    light = structure(calc, entry(points))
    for isotopes, sigma in (({"1": "D"}, 1), ({"H": "D"}, 2)):
        heavy = structure(calc, entry(points), isotopes=isotopes)
        assert heavy.symmetry_number == sigma
        assert heavy.degeneracy == 1
        (own,) = heavy.torsions
        assert own.overlap is not None
        assert own.overlap > 0.95
        assert own.rotor.symmetry_number == 1
        assert own.rotor.moment_u_a2 > 1.2 * light.torsions[0].rotor.moment_u_a2
        # isotope effects settle the torsion of the heavy one again; the ratios of oscillators, by both
        # routes, keep the mode
        pair = isotopologues(light, isotopes, where="x")
        assert pair.light.torsions[0].rotor == light.torsions[0].rotor
        assert pair.heavy.torsions[0].rotor == own.rotor
        assert pair.heavy.degeneracy == 1
        assert pair.heavy.at(T).gibbs_kj_mol == pytest.approx(heavy.at(T).gibbs_kj_mol, abs=0.01)
        assert pair.plain.at(T).rows[3].name == "torsion"
        ratio = float(pair.log_full_ratio(298.15)[0])
        assert pair.log_reduced_ratio(298.15) == pytest.approx(ratio, abs=1e-5)
    with pytest.raises(StudyError, match="does not cover its period of 360"):
        structure(calc, {**entry(points), "mirror": None} | {"scan": points[:5]})


def test_isotopes_lower_the_symmetry_number_but_not_the_period() -> None:
    # CH2D-CH2D: the wells of the 3-fold potential are an anti and two gauche places
    gas = molecule("C2H6")
    calc = made("ethane", gas.numbers, gas.positions, np.linspace(250.0, 3100.0, 18))
    calc = dataclasses.replace(calc, hessian_hartree_bohr2=np.eye(24))
    x = gas.positions
    own = [k for k in range(2, 8) if np.linalg.norm(x[k] - x[0]) < 1.2]
    far = max(set(range(2, 8)) - set(own), key=lambda k: float(np.linalg.norm(x[k] - x[own[0]])))
    angle = np.arange(60.0, 180.0, 20.0)
    rows = [f"{a},{6.0 * (1 + np.cos(np.radians(3 * a)))}" for a in angle]
    source = Source("scan.csv", "\n".join(["angle / deg,energy / kJ/mol", *rows]).encode())
    asked = {"atoms": [own[0] + 1, 1, 2, far + 1], "scan": "scan.csv", "mode": 1}
    choice = parse_torsions([asked], calc, lambda *_: source, where="x")
    for isotopes, sigma in ((None, 3), ({str(own[0] + 1): "D", str(far + 1): "D"}, 1)):
        found = Structure.make(calc, Treatment(), name="X", torsions=choice, isotopes=isotopes)
        assert found.torsions[0].rotor.symmetry_number == sigma
        assert found.torsions[0].rotor.barrier_j_mol == pytest.approx(12000.0, abs=1.0)


def toluene(methyls: int) -> Calculation:
    """Toluene or p-xylene, each methyl group with one hydrogen across the plane of the ring."""
    ring = molecule("C6H6")
    numbers, x = list(ring.numbers), ring.positions
    keep = list(range(12))
    first = 6  # hydrogens follow the carbons
    opposite = 6 + int(np.argmax(np.linalg.norm(x[6:] - x[first], axis=1)))
    positions, kinds = [], []
    tails: list[np.ndarray] = []
    for site in (first, opposite)[:methyls]:
        keep.remove(site)
        carbon = x[int(np.argmin(np.linalg.norm(x[:6] - x[site], axis=1)))]
        out = (x[site] - carbon) / np.linalg.norm(x[site] - carbon)
        normal = np.array([0.0, 0.0, 1.0])
        side = np.cross(normal, out)
        centre = carbon + 1.51 * out
        tails.append(centre)
        for k in range(3):
            a = np.radians(120.0 * k)
            tails.append(centre + 1.03 * (np.cos(a) * normal + np.sin(a) * side) + 0.37 * out)
    positions = [x[k] for k in keep] + tails
    kinds = [numbers[k] for k in keep] + [6, 1, 1, 1] * methyls
    count = 3 * len(kinds) - 6
    return made("toluene", np.array(kinds), np.array(positions), np.linspace(30.0, 3100.0, count))


def methyl_atoms(calc: Calculation, number: int) -> list[int]:
    carbon = len(calc.numbers) - 4 * number
    x = calc.positions_angstrom
    joined = int(np.argmin(np.linalg.norm(x[:6] - x[carbon], axis=1)))
    far = [k for k in range(6) if abs(np.linalg.norm(x[k] - x[joined]) - 1.395) < 0.05]
    return [far[0] + 1, joined + 1, carbon + 1, carbon + 2]


def test_the_symmetry_number_is_counted_once() -> None:
    # ethane: 6 x 3 = 18; methanol 1 x 3; toluene 1 x 6: a turn by 60 degrees and the ring's own axis
    for name, atoms, sigma, own in (("C2H6", [3, 1, 2, 6], 6, 3), ("CH3OH", [4, 2, 1, 3], 1, 3)):
        gas = molecule(name)
        count = 3 * len(gas) - 6
        calc = made(name, gas.numbers, gas.positions, np.linspace(250.0, 3100.0, count))
        phi = gas.get_dihedral(*[atom - 1 for atom in atoms])
        # a well where the structure stands
        c = [-6.0 * np.cos(np.radians(3 * phi)), -6.0 * np.sin(np.radians(3 * phi))]
        found = structure(calc, {"atoms": atoms, "fourier": [[3, *c]], "mode": 1})
        assert found.symmetry_number == sigma
        assert found.torsions[0].rotor.symmetry_number == own
        assert found.degeneracy == 1
    ring = toluene(1)
    atoms = methyl_atoms(ring, 1)
    found = structure(ring, {"atoms": atoms, "fourier": [[6, "0.03 kJ/mol", 0]], "mode": 1})
    assert found.symmetry_number == 1
    assert found.torsions[0].rotor.symmetry_number == 6


def test_symmetry_numbers_of_torsions_that_depend_on_each_other() -> None:
    # p-xylene: each methyl group has three places, but both turned by 60 degrees give it again:
    # 18 of the 36 pairs of wells, times the external 2 the 36 of its permutations
    xylene = toluene(2)
    entries = [
        {"atoms": methyl_atoms(xylene, k), "fourier": [[6, "0.03 kJ/mol", 0]], "mode": k}
        for k in (1, 2)
    ]
    with pytest.raises(
        StudyError, match="its torsions together from well to well meets the structure 18"
    ):
        structure(xylene, *entries)
    declared = [{**one, "symmetry_number": n} for one, n in zip(entries, (6, 3), strict=True)]
    found = structure(xylene, *declared)
    assert found.symmetry_number == 2
    codes = [finding.code for finding in found.findings]
    assert "torsion-symmetry" not in codes
    assert "torsions-separable" in codes
    declared[0]["symmetry_number"] = 3
    assert "torsion-symmetry" in [f.code for f in structure(xylene, *declared).findings]


def test_two_modes_that_share_two_torsions() -> None:
    # propane: the modes are the sum and the difference of both, half of each torsion in each
    gas = molecule("C3H8")
    calc = made("propane", gas.numbers, gas.positions, np.linspace(200.0, 3000.0, 27))
    x, m = calc.positions_angstrom, calc.masses_u
    middle = next(k for k in range(3) if np.sum(np.linalg.norm(x[:3] - x[k], axis=1) < 1.7) == 3)
    ends = [k for k in range(3) if k != middle]
    chains = []
    for own, other in (ends, ends[::-1]):
        hydrogen = next(k for k in range(3, 11) if np.linalg.norm(x[k] - x[own]) < 1.2)
        chains.append([other, middle, own, hydrogen])
    motions = np.array([turn(m, x, top_of(gas.numbers, x, c), (c[1], c[2])).motion for c in chains])
    pair = np.array([motions[0] + motions[1], motions[0] - motions[1]])
    pair = np.linalg.qr(pair.T)[0]
    inner = internal_space(m, x)
    rest = np.linalg.svd(np.eye(33) - pair @ pair.T - (np.eye(33) - inner @ inner.T))[0][:, :25]
    order = np.concatenate([rest[:, :3], pair, rest[:, 3:]], axis=1).T
    modes = (order / np.sqrt(np.repeat(m, 3))).reshape(27, 11, 3)
    modes /= np.linalg.norm(modes.reshape(27, -1), axis=1)[:, np.newaxis, np.newaxis]
    calc = dataclasses.replace(calc, modes=modes)
    entries = [
        {"atoms": [atom + 1 for atom in chain], "fourier": [[3, *series]]}
        for chain in chains
        for phi in [np.radians(gas.get_dihedral(*chain))]
        for series in [(-7.0 * np.cos(3 * phi), -7.0 * np.sin(3 * phi))]
    ]
    found = structure(calc, *entries)
    assert {one.mode for one in found.torsions} == {3, 4}
    assert [one.rotor.symmetry_number for one in found.torsions] == [3, 3]
    assert [row.name for row in found.at(298.15).rows][3:5] == ["torsion 1", "torsion 2"]
    # one of them alone is half in each of two modes
    with pytest.raises(StudyError, match="no mode is the torsion by") as error:
        structure(calc, {**entries[0], "symmetry_number": 3})
    assert "name the mode that it stands for" in str(error.value)


def test_a_structure_without_the_other_hand_on_the_circle_keeps_both() -> None:
    # 1,2-difluoro-type: a chiral carbon beside a methyl group that turns: turning makes no mirror image
    gas = molecule("C2H6")
    numbers = gas.numbers.copy()
    hydrogens = [k for k in range(8) if np.linalg.norm(gas.positions[k] - gas.positions[0]) < 1.2][
        1:
    ]
    numbers[hydrogens[0]], numbers[hydrogens[1]] = 9, 17
    carbon = gas.positions[0]
    x = gas.positions.copy()
    for atom, factor in ((hydrogens[0], 1.25), (hydrogens[1], 1.6)):
        x[atom] = carbon + factor * (x[atom] - carbon)
    calc = made("chiral", numbers, x, np.linspace(200.0, 3100.0, 18))
    phi = np.radians(gas.get_dihedral(hydrogens[0], 0, 1, 5))
    series = [3, -7.0 * np.cos(3 * phi), -7.0 * np.sin(3 * phi)]
    found = structure(calc, {"atoms": [hydrogens[0] + 1, 1, 2, 6], "fourier": [series], "mode": 1})
    assert found.torsions[0].rotor.symmetry_number == 3
    assert found.degeneracy == 2
    assert not found.torsions[0].holds_both_hands
    assert [row.name for row in found.at(298.15).rows][-1] == "handedness"


Change = dict[str, Any]


@pytest.mark.parametrize(
    ("change", "said"),
    [
        ({"atoms": [1, 2, 3]}, "are no four different atoms among 4"),
        ({"atoms": [1, 2, 3, 3]}, "are no four different atoms among 4"),
        ({"atoms": [1, 2, 3, 5]}, "are no four different atoms among 4"),
        ({"atoms": [1, 3, 2, 4]}, "atoms 1 and 3 are not bonded"),
        ({"fourier": [[1, 1.0, 0.0]]}, "both scan and fourier"),
        ({"scan": None}, "there is no file 'None'"),
        ({"turn": 3}, "unknown key 'turn'"),
        ({"symmetry_number": 0}, "is no whole number from 1 on"),
        ({"symmetry_number": 2}, "does not repeat after 180 degrees"),
        ({"symmetry_number": 3}, "does not repeat after 120 degrees"),
        ({"mirror": None}, "does not cover its period of 360 degrees: no point in the 180 degrees"),
        ({"mirror": "90 deg"}, "is not symmetric about 90 degrees"),
        ({"mirror": "1 kg"}, "is not a quantity in deg"),
        ({"reduced_moment": "-1 u*angstrom^2"}, "is not above 0"),
        ({"mode": 9}, "there is no mode 9 among 6"),
        ({"mode": "3820 cm^-1"}, "2 modes within 2 cm^-1"),
        ({"mode": "100 cm^-1"}, "no modes within 2 cm^-1"),
    ],
    ids=str,
)
def test_what_is_refused(
    change: Change, said: str, peroxide: Calculation, points: list[Calculation]
) -> None:
    keys = {**entry(points), **change}
    if change == {"mirror": None}:
        del keys["mirror"]
    with pytest.raises(StudyError, match=re.escape(said)) as error:
        tp.thermochemistry(peroxide, torsions=[keys])
    assert "torsions.1" in str(error.value)


def test_a_scan_that_does_not_close(peroxide: Calculation, points: list[Calculation]) -> None:
    # 340 degrees on: the last point has fallen into another valley, 6 kJ/mol off
    there = [float(calc.energy_hartree or 0.0) for calc in points]
    back = [f"{-20.0 * k},{energy}" for k, energy in enumerate(there) if 0 < k < 9]
    rows = [f"{20.0 * k},{energy}" for k, energy in enumerate(there)]
    last = f"360.0,{there[0] + 6.0 / HARTREE_KJ_MOL}"
    head = "angle / deg,energy / hartree"
    closed = scan_from_table(Source("scan.csv", "\n".join([head, *rows, *back]).encode()))
    assert len(closed.angles_deg) == 18
    opened = "\n".join([head, *rows, *back, last]).encode()
    choice = dataclasses.replace(
        parse_torsions([entry(points)], peroxide, lambda *_: Source("", b""), where="x")[0],
        scan=scan_from_table(Source("scan.csv", opened)),
        mirror_deg=None,
    )
    with pytest.raises(
        StudyError, match=r"the scan does not close: .* differ by 6\.00 kJ/mol"
    ) as error:
        Structure.make(peroxide, Treatment(), name="X", torsions=[choice])
    assert "scan.csv:2" in str(error.value)
    assert "scan.csv:20" in str(error.value)
    Structure.make(
        peroxide, Treatment(), name="X", torsions=[dataclasses.replace(choice, scan=closed)]
    )


def test_a_point_off_the_curve(peroxide: Calculation, points: list[Calculation]) -> None:
    # two neighbours 3 degrees apart that differ by far more than any smooth curve there
    extra = dataclasses.replace(
        points[5], energy_hartree=float(points[5].energy_hartree or 0) + 0.003
    )
    x = turned(extra.positions_angstrom, np.array([False, False, True, True]), (1, 2), 3.0)
    extra = dataclasses.replace(extra, positions_angstrom=x)
    with pytest.raises(StudyError, match="kJ/mol off a curve that repeats after 360 degrees"):
        structure(peroxide, entry([*points, extra]))


def test_the_structure_must_stand_at_the_scan_s_minimum(
    peroxide: Calculation, points: list[Calculation]
) -> None:
    series = {"atoms": ATOMS, "fourier": [[1, "20 kJ/mol", 0]], "mode": 1}  # minimum at 180 degrees
    with pytest.raises(StudyError, match=r"stands at 114\.\d degrees, .* its minimum at -?180.0"):
        structure(peroxide, series)
    high = dataclasses.replace(
        peroxide, energy_hartree=float(peroxide.energy_hartree or 0.0) + 0.002
    )
    with pytest.raises(StudyError, match=r"the scan goes 5\.15 kJ/mol below the structure"):
        structure(high, entry(points))


@pytest.mark.parametrize(
    ("change", "said"),
    [
        ({"numbers": np.array([8, 1, 1, 8])}, "has its atoms in another order"),
        ({"numbers": np.array([1, 16, 16, 1])}, "is H2S2, but"),
        ({"charge": 1}, "has charge 1, but"),
        ({"multiplicity": 3}, "has multiplicity 3, but"),
        ({"energy_hartree": None}, "has no energy"),
        ({"optimised": False}, "has an optimisation that did not converge"),
        ({"basis": "other"}, "the basis of the scan differs: other in"),
    ],
    ids=str,
)
def test_outputs_that_are_no_points_of_the_scan(
    change: Change, said: str, peroxide: Calculation, points: list[Calculation]
) -> None:
    wrong = [dataclasses.replace(points[0], **change), *points[1:]]
    with pytest.raises(StudyError, match=re.escape(said)):
        structure(peroxide, entry(wrong))


def test_a_scan_at_another_level_is_noted(peroxide: Calculation, points: list[Calculation]) -> None:
    others = [dataclasses.replace(calc, method="B3LYP") for calc in points]
    assert "torsion-level" in [f.code for f in structure(peroxide, entry(others)).findings]
    assert "torsion-level" not in [f.code for f in structure(peroxide, entry(points)).findings]


@pytest.mark.parametrize(
    ("text", "said", "line"),
    [
        ("angle,energy / kJ/mol\n0,1\n", "no column 'angle' with its unit", 1),
        ("angle / deg,energy / kg\n0,1\n", "is not a quantity in kJ/mol", 1),
        ("angle / deg,energy / kJ/mol,energy / eV\n", "two columns are called energy", 1),
        (
            "# c\n\nangle / deg,energy / kJ/mol\n0,1\n30,x\n",
            "expected a number as energy, found 'x'",
            5,
        ),
        ("angle / deg,energy / kJ/mol\n0,1\n30\n", "expected a number as energy, found ''", 3),
        ("angle / deg,energy / kJ/mol\n0,nan\n", "expected a number as energy, found 'nan'", 2),
        ("angle / deg,energy / kJ/mol\n0,1\n", "1 points are no scan", None),
    ],
    ids=str,
)
def test_tables_that_are_none(text: str, said: str, line: int | None) -> None:
    with pytest.raises(StudyError, match=re.escape(said)) as error:
        scan_from_table(Source("scan.csv", text.encode()))
    assert error.value.where == ("scan.csv" if line is None else f"scan.csv:{line}")


def test_columns_in_any_order() -> None:
    text = "name,energy / kcal mol^-1,angle / rad\na,1,0\nb,3,3.141592653589793\n"
    found = scan_from_table(Source("scan.csv", text.encode()))
    assert found.angles_deg == pytest.approx([0.0, 180.0])
    assert found.energies_j_mol == pytest.approx([0.0, 8368.0])
    assert found.places == ("scan.csv:2", "scan.csv:3")


STUDY = """
[conditions]
temperatures = ["298.15 K"]
[species.A]
frequencies = "hydrogen_peroxide_freq.out.gz"
torsions = [{{ atoms = [1, 2, 3, 4], {scan}, mirror = "0 deg" }}]
[species.P]
composition = "H2O2"
enthalpy = "-10 kJ/mol"
entropy = "0 J/mol/K"
relative_to = {{ A = 1 }}
[[steps]]
equation = "A = P"
rate = "5 s^-1"
"""


def test_a_study(peroxide: Calculation, points: list[Calculation], tmp_path: Path) -> None:
    for path in OUTPUTS.glob("hydrogen_peroxide*"):
        (tmp_path / path.name).symlink_to(path)
    (tmp_path / "scan.csv").write_text(table(points, "hartree", 1.0))
    outputs = "scan = [" + ", ".join(f'"{path.name}"' for path in SCAN) + "]"
    file = tmp_path / "study.toml"
    expected = tp.thermochemistry(peroxide, torsions=[entry(points)]).gibbs_kj_mol
    for scan in ('scan = "scan.csv"', outputs):
        file.write_text(STUDY.format(scan=scan))
        study = tp.Study.load(file)
        model = study.species["A"]
        assert model.at(298.15).gibbs_kj_mol == pytest.approx(expected, abs=2e-5)
        assert len(model.files) == (2 if "csv" in scan else 11)
        assert "torsion-treated" in [finding.code for finding in study.findings]
    file.write_text(STUDY.format(scan='scan = "lost.csv"'))
    with pytest.raises(StudyError, match="there is no file") as error:
        tp.Study.load(file)
    assert "[species.A] torsions.1.scan" in str(error.value)
    file.write_text(STUDY.format(scan="fourier = [[1, 2]]"))
    with pytest.raises(StudyError, match="expected 3 entries, found 2"):
        tp.Study.load(file)
    file.write_text(STUDY.replace("frequencies", "composition", 1).format(scan='scan = "scan.csv"'))
    with pytest.raises(StudyError):
        tp.Study.load(file)
