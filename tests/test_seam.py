"""Crossing points that are read: modes along the seam, what they follow from, and what is refused."""

from __future__ import annotations

import gzip
import json
import re
from collections.abc import Callable
from pathlib import Path
from typing import Any

import mpmath as mp
import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.optimize import brentq
from seam_points import CM, METHYLENE, wavenumbers_on_seam
from structures import made, masses, turn

import thermo_pp as tp
from thermo_pp.errors import ReadError, StudyError
from thermo_pp.formulas.normal_modes import normal_modes
from thermo_pp.formulas.seam import (
    crossing_coordinate,
    seam_hessian,
    share_of_other,
    turning_residual,
)
from thermo_pp.isotopes import isotopologues
from thermo_pp.species import Structure
from thermo_pp.study.load import Study

FloatArray = NDArray[np.float64]
TEXT = (METHYLENE / "study.toml").read_text(encoding="utf-8")
SEAM = 'seam = { other = "crossing_triplet.json" }'
POINT = f'frequencies = "crossing_singlet.json"\n{SEAM}'
XYZ = 'gradients = ["crossing_singlet.xyz", "crossing_triplet.xyz"]'


def study(
    folder: Path,
    point: str = POINT,
    change: Callable[[Path], None] | None = None,
    old: str = "",
    new: str = "",
) -> Study:
    """The study of the fixture with other keys of its crossing point, or other outputs."""
    assert POINT in TEXT
    assert old in TEXT
    outputs = folder / "outputs"
    outputs.mkdir(exist_ok=True)
    for file in (METHYLENE / "outputs").iterdir():
        (outputs / file.name).write_bytes(file.read_bytes())
    if change is not None:
        change(outputs)
    path = folder / "study.toml"
    path.write_text(TEXT.replace(old, new).replace(POINT, point), encoding="utf-8")
    return Study.load(path)


def edit(name: str, **changes: Any) -> Callable[[Path], None]:
    """Change keys of a document, ``properties__return_energy`` for one inside another."""

    def change(outputs: Path) -> None:
        document = json.loads((outputs / name).read_text())
        for key, value in changes.items():
            *tables, last = key.split("__")
            inside = document
            for table in tables:
                inside = inside[table]
            if callable(value):
                inside[last] = value(inside[last])
            elif value is None:
                del inside[last]
            else:
                inside[last] = value
        (outputs / name).write_text(json.dumps(document))

    return change


def point(loaded: Study) -> Structure:
    found = loaded.species["MECP"]
    assert isinstance(found, Structure)
    return found


def codes(loaded: Study) -> set[str]:
    return {one.code for one in loaded.findings}


@pytest.fixture(scope="module")
def mecp(tmp_path_factory: pytest.TempPathFactory) -> Structure:
    return point(study(tmp_path_factory.mktemp("methylene")))


def document(name: str) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Positions (bohr), gradient and Hessian of an output, read by json alone."""
    data = json.loads((METHYLENE / "outputs" / f"{name}.json").read_text())
    x, g = data["molecule"]["geometry"], data["properties"]["return_gradient"]
    return (
        np.reshape(x, (-1, 3)),
        np.reshape(g, (-1, 3)),
        np.array(data["return_result"]).reshape(9, 9),
    )


def by_null_space(hessian: FloatArray, m: FloatArray, x: FloatArray, across: FloatArray) -> Any:
    """Wavenumbers: eigenvalues of H with respect to M in a null space, nothing mass-weighted.

    Displacements u with c.u = 0 for every constraint c: momentum m, angular momentum m (e x r) and
    the gradient difference across.
    """
    centred = x - (m @ x) / m.sum()
    rows = [np.outer(m, axis).ravel() for axis in np.eye(3)]
    rows += [(m[:, None] * np.cross(axis, centred)).ravel() for axis in np.eye(3)]
    rows.append(across.ravel())
    size = np.linalg.norm(rows, axis=1, keepdims=True)
    _, s, vt = np.linalg.svd(np.array(rows) / size)
    basis = vt[int(np.sum(s > 1e-7)) :].T
    kinetic = basis.T @ np.diag(np.repeat(m, 3)) @ basis
    squares = np.linalg.eigvals(np.linalg.solve(kinetic, basis.T @ hessian @ basis)).real
    return np.sort(np.sign(squares) * np.sqrt(np.abs(squares))) * CM


def test_modes_are_those_of_points_on_the_seam(mecp: Structure) -> None:
    """Energies of points on the curved seam, by PySCF: what its Hessians must come to (grid: 0.02)."""
    expected, slope = wavenumbers_on_seam()
    assert np.abs(slope).max() < 1e-5
    assert mecp.modes.wavenumbers_cm == pytest.approx(expected, abs=0.1)
    assert mecp.kind == "saddle"
    assert mecp.imaginary_cm is None
    alone = by_null_space(document("crossing_singlet")[2], masses([6, 1, 1]), *_frame())
    assert np.abs(alone - expected).max() > 1.0, (
        "one Hessian alone must differ, or this tests nothing"
    )


def test_two_nwchem_outputs(tmp_path: Path) -> None:
    """Another program, text alone: its gradients of six digits, its Hessians with overall motion projected
    out in its own way, which moves a mode of the triplet alone by 70 cm^-1."""
    text = POINT.replace("crossing_", "nwchem_").replace(".json", ".out.gz")
    loaded = study(tmp_path, text)
    expected, _ = wavenumbers_on_seam()
    assert point(loaded).modes.wavenumbers_cm == pytest.approx(expected, abs=0.1)
    assert codes(loaded) & {"seam-hessian-turns", "seam-not-degenerate", "mixed-level"} == set()
    mixed = POINT.replace("crossing_triplet.json", "nwchem_triplet.out.gz")
    again = study(tmp_path, mixed)
    assert np.abs(point(again).modes.wavenumbers_cm - expected).max() > 2.0
    found = next(one for one in again.findings if one.code == "seam-hessian-turns")
    assert "off by 8.5% of the slope across it" in found.what


def test_exchanged_gradients(tmp_path: Path) -> None:
    """Where no file says whose gradient it is, the Hessians do."""
    rows = [document(name)[1].tolist() for name in ("crossing_triplet", "crossing_singlet")]
    loaded = study(tmp_path, POINT.replace(" }", f", gradients = {rows} }}"))
    assert "seam-hessian-turns" in codes(loaded)


def test_turning() -> None:
    """A spring that is stretched: its gradient turns with it; a Hessian of a spring at rest does not."""
    x = np.array([[0.0, 0, 0], [1.0, 2.0, 2.0]])
    e, k, stretch = x[1] / 3.0, 0.3, 0.4
    block = k * np.outer(e, e) + k * stretch / 3.0 * (np.eye(3) - np.outer(e, e))
    hessian = np.kron([[1.0, -1.0], [-1.0, 1.0]], block)
    g = np.array([-e, e]) * k * stretch
    assert turning_residual(hessian, g, x) == pytest.approx(0.0, abs=1e-14)
    rest = np.kron([[1.0, -1.0], [-1.0, 1.0]], k * np.outer(e, e))
    assert turning_residual(rest, g, x) == pytest.approx(k * stretch * np.sqrt(2.0), rel=1e-12)


def _frame() -> tuple[FloatArray, FloatArray]:
    x, one, _ = document("crossing_singlet")
    return x, one - document("crossing_triplet")[1]


def test_isotopes(mecp: Structure) -> None:
    """With deuterium, against the points too; the product rule holds with the mass across the seam."""
    pair = isotopologues(mecp, {"2": "D"}, where="test")
    expected, _ = wavenumbers_on_seam(pair.heavy.masses_u)
    assert pair.heavy.modes.wavenumbers_cm == pytest.approx(expected, abs=0.1)
    assert pair.product_residual == pytest.approx(0.0, abs=1e-5)
    assert pair.log_full_ratio([300.0]) == pytest.approx(pair.log_reduced_ratio([300.0]), abs=1e-5)


def test_isotope_effect_of_a_crossing(tmp_path: Path) -> None:
    """Both masses across the seam cancel where the probability is small: only the vibrations are left."""
    new = '[isotopologues.D]\nall = { H = "D" }\n\n[effective]'
    loaded = study(tmp_path, old="[effective]", new=new)
    step = loaded.isotope_effects()[0].steps[0]
    t = np.array([250.0, 298.15, 350.0])
    pair = isotopologues(point(loaded), {"H": "D"}, where="test")
    singlet = loaded.species["singlet"]
    assert isinstance(singlet, Structure)
    reactant = isotopologues(singlet, {"H": "D"}, where="test")
    weak = reactant.log_reduced_ratio(t) - pair.log_reduced_ratio(t)
    assert step.forward_without_symmetry == pytest.approx(np.exp(weak), rel=3e-3)
    assert step.harmonic_forward == pytest.approx(step.forward_without_symmetry, rel=1e-3)


def test_doubt_about_a_crossing(tmp_path: Path) -> None:
    """Moved energies leave its probability as it is: ln k has the deviation of the barrier alone."""
    new = '[doubt]\ndeviation = "2 kJ/mol"\nsamples = 4000\n\n[effective]'
    doubt = study(tmp_path, old="[effective]", new=new).doubt()
    expected = 2.0 * np.sqrt(2.0) / (8.31446261815324e-3 * np.array([250.0, 298.15, 350.0]))
    rate = doubt.rates["free"]
    assert rate.first_order_log_deviation == pytest.approx(expected, rel=1e-6)
    assert rate.spread is not None
    assert rate.spread.log_deviation == pytest.approx(expected, rel=0.05)


def test_against_other_algebra(mecp: Structure) -> None:
    (x, g1, h1), (_, g2, h2) = document("crossing_singlet"), document("crossing_triplet")
    a, b = np.linalg.norm(g1), np.linalg.norm(g2)
    assert (g1 * g2).sum() / (a * b) == pytest.approx(1.0, abs=1e-6), "they point the same way"
    effective = (a * h2 - b * h1) / (a - b)
    expected = by_null_space(effective, masses([6, 1, 1]), x, g1 - g2)
    assert mecp.modes.wavenumbers_cm == pytest.approx(expected, rel=1e-7)


@pytest.mark.parametrize("n", [3, 5, 9])
def test_projection_of_any_hessian(n: int) -> None:
    """Random Hessians and gradients, not even invariant: one mode less, those of the null space."""
    rng = np.random.default_rng(n)
    x, m = rng.normal(size=(n, 3)), rng.uniform(1.0, 40.0, n)
    half, across = rng.normal(size=(3 * n, 3 * n)), rng.normal(size=(n, 3))
    across -= across.mean(axis=0)
    found = normal_modes(half @ half.T, m, x, across)
    assert len(found.wavenumbers_cm) == 3 * n - 7
    # only the part of the gradient that is no overall motion counts
    inner = across - _overall_part(across, m, x)
    assert found.wavenumbers_cm == pytest.approx(
        by_null_space(half @ half.T, m, x, inner), rel=1e-6
    )
    weighted = found.modes * np.sqrt(m)[:, None]
    assert np.abs((weighted * (inner / np.sqrt(m)[:, None])).sum(axis=(1, 2))).max() < 1e-9


def _overall_part(across: FloatArray, m: FloatArray, x: FloatArray) -> FloatArray:
    """The part of a gradient that overall motion feels, M V (V^T M V)^-1 V^T g."""
    centred = x - (m @ x) / m.sum()
    v = [np.tile(axis, (len(m), 1)) for axis in np.eye(3)]
    v += [np.cross(axis, centred) for axis in np.eye(3)]
    moves = np.array([one.ravel() for one in v]).T
    mass = np.diag(np.repeat(m, 3))
    part = mass @ moves @ np.linalg.solve(moves.T @ mass @ moves, moves.T @ across.ravel())
    return np.asarray(part.reshape(-1, 3))


def test_linear_and_diatomic() -> None:
    """Linear: 3N-6. Of two atoms nothing is left, and of the overall motion of all nothing is across."""
    x = np.outer([0.0, 1.2, 2.3], [0.0, 0.0, 1.0])
    across = np.outer([1.0, -2.5, 1.5], [0.0, 0.0, 1.0])
    found = normal_modes(np.eye(9), [12.0, 16.0, 32.0], x, across)
    assert len(found.wavenumbers_cm) == 3
    assert len(normal_modes(np.eye(6), [12.0, 16.0], x[:2], [[0.0, 0, 1], [0, 0, -1]]).modes) == 0
    with pytest.raises(ValueError, match="no part beside overall motion"):
        normal_modes(np.eye(9), [12.0, 16.0, 32.0], x, np.outer([12.0, 16, 32], [1.0, 0, 0]))


@pytest.mark.parametrize("sizes", [(0.7, -0.4), (0.7, 0.4), (-0.2, 0.9)])
def test_seam_hessian_is_the_energy_on_the_seam(sizes: tuple[float, float]) -> None:
    """Two quadratic surfaces whose gradients are parallel at 0: energies of points on the curved seam."""
    rng = np.random.default_rng(3)
    n = 6
    direction = rng.normal(size=n)
    direction /= np.linalg.norm(direction)
    g = [size * direction for size in sizes]
    h = [half + half.T for half in rng.normal(size=(2, n, n))]

    def energy(k: int, u: FloatArray) -> float:
        return float(g[k] @ u + 0.5 * u @ h[k] @ u)

    along = rng.normal(size=n)
    along -= along @ direction * direction

    def on_seam(step: float) -> float:
        def gap(s: float) -> float:
            u = step * along + s * direction
            return energy(0, u) - energy(1, u)

        return energy(0, step * along + brentq(gap, -0.1, 0.1, xtol=1e-16) * direction)

    second = (on_seam(3e-4) + on_seam(-3e-4) - 2 * on_seam(0.0)) / 9e-8
    share = share_of_other(g[0], g[1])
    assert along @ seam_hessian(h[0], h[1], share) @ along == pytest.approx(second, rel=1e-4)
    a, b = abs(sizes[0]), abs(sizes[1])
    sign = -np.sign(sizes[0] * sizes[1])
    published = (a * h[1] + sign * b * h[0]) / (a + sign * b)  # Harvey, Aschi 1999 (from memory)
    assert seam_hessian(h[0], h[1], share) == pytest.approx(published, rel=1e-12)


def test_same_gradients_have_no_share() -> None:
    with pytest.raises(ValueError, match="the two gradients are the same"):
        share_of_other([[1.0, 2, 3]], [[1.0, 2, 3]])


def test_reduced_mass() -> None:
    """Slope over root of the mass is the mass-weighted difference; of two atoms, along both at once, the
    mass is 2 m1 m2/(m1 + m2), which goes with a slope that is 2^(1/2) times that along the distance."""
    d, m = np.array([[0.0, 0, 0.3], [0, 0, -0.3]]), np.array([12.0, 16.0])
    found = crossing_coordinate(d, m, [[0.0, 0, 0], [0, 0, 1.1]])
    assert found.reduced_mass_u == pytest.approx(2 * 12.0 * 16.0 / 28.0, rel=1e-12)
    assert found.slope == pytest.approx(0.3 * np.sqrt(2.0), rel=1e-12)
    assert found.slope / np.sqrt(found.reduced_mass_u) == pytest.approx(
        np.sqrt(0.09 / 12 + 0.09 / 16), rel=1e-12
    )
    assert found.overall < 1e-7
    turned = crossing_coordinate([[0.3, 0, 0], [-0.3, 0, 0]], m, [[0.0, 0, 0], [0, 0, 1.1]])
    assert turned.overall == pytest.approx(1.0, abs=1e-12)


def test_probability_from_the_gradients(mecp: Structure, tmp_path: Path) -> None:
    """Landau-Zener from the atoms' own masses: the gap opens at d.v, v = (2E)^(1/2) along M^(-1/2) d."""
    loaded = study(tmp_path)
    step = loaded.effective().steps[0]
    newton = 4.3597447222060e-18 / 5.29177210544e-11
    d = _frame()[1] * newton
    kg = masses([6, 1, 1])[:, None] * 1.66053906892e-27
    opening = float(np.sqrt((d**2 / kg).sum()))  # J per (J^(1/2) s) of motion
    hbar, joule = 1.054571817646e-34, 10 * 1.986445857e-23

    def probability(energy: Any) -> Any:
        p = mp.exp(-2 * mp.pi * joule**2 / (hbar * opening * mp.sqrt(2 * energy)))
        return (1 - p) * (1 + p)

    for k, t in enumerate((250.0, 298.15, 350.0)):
        kt = mp.mpf(1.380649e-23) * t
        mean = mp.quad(
            lambda x, kt=kt: probability(x * kt) * mp.exp(-x), [0, 1e-6, 1e-3, 0.1, 1, 5, 20, 60]
        )
        assert step.log_transmission[k] == pytest.approx(float(mp.log(mean)), abs=1e-6)
    whole = mecp.saddle_members(300.0)[0].across
    assert whole is not None
    assert whole[0] / np.sqrt(whole[1]) == pytest.approx(opening, rel=1e-9)


def test_an_ensemble_crosses_as_its_members_do(tmp_path: Path, mecp: Structure) -> None:
    """Two crossing points alike: the same probability; one with half the slope: the weighted mean."""
    old = f"[species.MECP]\n{POINT}"
    one = '{ frequencies = "crossing_singlet.json", ' + SEAM + ", degeneracy = 1 }"
    two = one.replace(SEAM, f"seam = {{ gradient_difference = {(_frame()[1] / 2).tolist()} }}")
    for other, ratio in ((one, 1.0), (two, None)):
        new = f"[species.MECP]\nconformers = [{one}, {other}]"
        loaded = study(tmp_path, old=old, new=new)
        step = loaded.effective().steps[0]
        plain = study(tmp_path).effective().steps[0]
        found = np.exp(step.log_transmission - plain.log_transmission)
        if ratio is not None:
            assert found == pytest.approx([ratio] * 3, rel=1e-9)
        else:
            g = [
                m.gibbs_kj_mol for m in loaded.species["MECP"].saddle_members([250.0, 298.15, 350])
            ]
            w = np.exp(-(g[1] - g[0]) / (8.31446261815324e-3 * np.array([250.0, 298.15, 350])))
            # weak coupling: the probability goes with 1/slope
            assert found == pytest.approx((1 + 2 * w) / (1 + w), rel=5e-3)


@pytest.mark.parametrize("which", ["crossing_triplet.json", "crossing_singlet.json"])
def test_orientation_changes_nothing(which: str, tmp_path: Path, mecp: Structure) -> None:
    """One output turned and moved, its gradient and Hessian with it."""
    r = turn([1.0, 2.0, -0.5], 77.0)
    whole = np.kron(np.eye(3), r)

    def vectors(flat: Any) -> Any:
        return (np.reshape(flat, (-1, 3)) @ r.T).ravel().tolist()

    change = edit(
        which,
        molecule__geometry=lambda x: (np.array(vectors(x)) + np.tile([3.0, 1, 2], 3)).tolist(),
        properties__return_gradient=vectors,
        return_result=lambda h: (whole @ np.reshape(h, (9, 9)) @ whole.T).ravel().tolist(),
    )
    loaded = study(tmp_path, change=change)
    found = point(loaded)
    assert found.modes.wavenumbers_cm == pytest.approx(mecp.modes.wavenumbers_cm, rel=1e-7)
    assert found.crossing_coordinate is not None
    assert mecp.crossing_coordinate is not None
    assert found.crossing_coordinate.slope == pytest.approx(
        mecp.crossing_coordinate.slope, rel=1e-9
    )
    assert codes(loaded) & {"seam-overall-motion", "seam-not-stationary"} == set()


def _declared() -> str:
    rows = [document(name)[1].tolist() for name in ("crossing_singlet", "crossing_triplet")]
    return f"gradients = {rows}"


@pytest.mark.parametrize(
    ("gradients", "rel"),
    [(XYZ, 1e-6), (_declared(), 1e-12)],
    ids=["files-turned", "numbers"],
)
def test_gradients_beside_the_outputs(
    gradients: str, rel: float, tmp_path: Path, mecp: Structure
) -> None:
    """Extended XYZ with forces in another orientation (eight decimals), or numbers in the study."""

    def without(outputs: Path) -> None:
        for name in ("crossing_singlet.json", "crossing_triplet.json"):
            edit(name, properties__return_gradient=None)(outputs)

    more = POINT.replace(" }", f", {gradients} }}")
    loaded = study(tmp_path, more, without)
    assert point(loaded).modes.wavenumbers_cm == pytest.approx(mecp.modes.wavenumbers_cm, rel=rel)
    seam = point(loaded).seam
    assert seam is not None
    origins = [part.origin for part in seam.parts if "gradient" in part.quantity]
    assert origins == (["derived"] * 2 if "xyz" in gradients else ["declared"] * 2)
    with pytest.raises(StudyError, match="no gradient is read from"):
        study(tmp_path, POINT, without)


def test_one_hessian(tmp_path: Path) -> None:
    """The other state as a gradient job, and as a declared difference: the first one's Hessian alone."""
    x, g1, h1 = document("crossing_singlet")
    g2 = document("crossing_triplet")[1]
    expected = by_null_space(h1, masses([6, 1, 1]), x, g1 - g2)
    change = edit(
        "crossing_triplet.json",
        driver="gradient",
        return_result=g2.ravel().tolist(),
    )
    declared = (
        f'frequencies = "crossing_singlet.json"\nseam.gradient_difference = {(g1 - g2).tolist()}'
    )
    for text, how in ((POINT, change), (declared, None)):
        loaded = study(tmp_path, text, how)
        assert point(loaded).modes.wavenumbers_cm == pytest.approx(expected, rel=1e-9)
        assert "seam-one-hessian" in codes(loaded)
    assert point(loaded).saddle_members(300.0)[0].across == pytest.approx(
        point(study(tmp_path)).saddle_members(300.0)[0].across, rel=1e-12
    )


KEYS = {"energy": '"return_energy"', "gradient": '"return_gradient"', "Hessian": '"return_result"'}


def test_where_everything_comes_from(mecp: Structure) -> None:
    """The note has the numbers; each part has its file and line."""
    assert mecp.seam is not None
    note = next(one for one in mecp.findings if one.code == "modes-along-seam")
    assert "slope across it 0.08597 hartree/bohr, reduced mass 2.4422 u" in note.what
    assert "Hessian 1.0784 of its own, -0.0784 of the other state" in note.what
    assert [part.quantity for part in mecp.seam.parts] == [
        "gradient of its own state",
        "electronic energy of its own state",
        "gradient of the other state",
        "electronic energy of the other state",
        "share of the other state's Hessian",
    ]
    for part in mecp.seam.parts:
        assert part.file is not None
        assert part.line is not None
        key = next(key for key in KEYS if key in part.quantity)
        assert KEYS[key] in Path(part.file).read_text().splitlines()[part.line - 1]
    assert [Path(file).name for file in mecp.files] == [
        "crossing_singlet.json",
        "crossing_triplet.json",
    ]


def shifted(name: str, vector: list[list[float]]) -> Callable[[Path], None]:
    return edit(
        name, properties__return_gradient=lambda g: (np.array(g) + np.ravel(vector)).tolist()
    )


@pytest.mark.parametrize(
    ("change", "code", "numbers"),
    [
        (
            edit("crossing_triplet.json", properties__return_energy=lambda e: e - 0.001),
            "seam-not-degenerate",
            "lies 2.63 kJ/mol above",
        ),
        (
            edit("crossing_triplet.json", properties__return_energy=lambda e: e + 0.0002),
            "seam-not-degenerate",
            "lies 0.53 kJ/mol below",
        ),
        (
            lambda outputs: [
                shifted(
                    f"crossing_{state}.json", [[0, 0, 0], [0, 0.002, 0.001], [0, -0.002, -0.001]]
                )(outputs)
                for state in ("singlet", "triplet")
            ],
            "seam-not-stationary",
            "hartree/bohr (largest component) is left along the seam",
        ),
        (
            shifted("crossing_singlet.json", [[0.004, 0, 0], [0, 0, 0], [0, 0, 0]]),
            "seam-overall-motion",
            "of the difference of the gradients moves or turns the whole structure",
        ),
        (
            edit(
                "crossing_triplet.json",
                model__basis="cc-pVDZ",
            ),
            "mixed-level",
            "cc-pVDZ",
        ),
    ],
)
def test_doubts(change: Callable[[Path], None], code: str, numbers: str, tmp_path: Path) -> None:
    assert code not in codes(study(tmp_path))
    loaded = study(tmp_path, change=change)
    found = [one for one in loaded.findings if one.code == code]
    assert numbers in found[0].what


def test_small_doubts_are_none(tmp_path: Path) -> None:
    change = edit("crossing_triplet.json", properties__return_energy=lambda e: e - 5e-5)
    assert "seam-not-degenerate" not in codes(study(tmp_path, change=change))


def two(row: str) -> str:
    return POINT.replace(SEAM, row)


@pytest.mark.parametrize(
    ("text", "change", "sentence"),
    [
        (
            two('seam = { other = "triplet.json" }'),
            None,
            "have different geometries: 0.1846 A apart",
        ),
        (
            two('seam = { other = "crossing_singlet.json" }'),
            None,
            "crossing_singlet.json, have multiplicity 1",
        ),
        (two("seam = { multiplicity = 3 }"), None, "a seam without the other state"),
        (
            two('seam = { other = "crossing_triplet.json", gradient_difference = [[0, 0, 1]] }'),
            None,
            "both other and gradient_difference",
        ),
        (two("seam = { gradient_difference = [[0, 0, 1]] }"), None, "1 vectors for 3 atoms"),
        (
            two("seam = { gradient_difference = [[0, 0, 1], [0, 0, 0], [0, 0, 0]] }"),
            None,
            "% of the difference of the gradients moves or turns the whole structure",
        ),
        (
            two("seam = { gradient_difference = [[0, 0, 0], [0, 0, 0], [0, 0, 0]] }"),
            None,
            "the gradients of both states are the same",
        ),
        (
            two("seam = { gradient_difference = [[0, 0, 0]], multiplicity = 3 }"),
            None,
            "are those of an output that is not named",
        ),
        (
            two('seam = { gradient_difference = [["1 kJ", 0, 0], [0, 0, 0], [0, 0, 0]] }'),
            None,
            "'1 kJ' is not a quantity in hartree/bohr",
        ),
        (
            two('seam = { other = "crossing_triplet.json", multiplicity = 5 }'),
            None,
            "has multiplicity 3, not 5",
        ),
        (
            two(
                'seam = { other = "crossing_triplet.json", gradients = ["crossing_triplet.xyz", '
                '"crossing_singlet.xyz"] }'
            ),
            None,
            "crossing_triplet.xyz has multiplicity 3, expected 1",
        ),
        (
            POINT,
            edit("crossing_triplet.json", molecule__molecular_charge=2),
            "has charge 2, expected 0",
        ),
        (
            POINT,
            edit("crossing_triplet.json", molecule__symbols=["H", "C", "H"]),
            "has not the atoms of .*crossing_singlet.json in their order",
        ),
        (
            two('seam = { other = "crossing_triplet.json" }').replace(
                "crossing_singlet.json", "crossing_singlet.xyz"
            ),
            None,
            "holds no Hessian, from which the modes along the seam could follow",
        ),
        (
            POINT,
            edit("crossing_singlet.json", return_result=lambda h: (-np.array(h)).tolist()),
            "is a crossing point with 2 imaginary modes .* along the seam; it must have none there",
        ),
    ],
)
def test_what_is_refused(
    text: str, change: Callable[[Path], None] | None, sentence: str, tmp_path: Path
) -> None:
    with pytest.raises(StudyError, match=sentence):
        study(tmp_path, text, change)


def test_states_of_one_spin_when_declared(tmp_path: Path) -> None:
    change = edit("crossing_triplet.json", molecule__molecular_multiplicity=1)
    with pytest.raises(StudyError, match="have multiplicity 1"):
        study(tmp_path, change=change)
    said = two('seam = { other = "crossing_triplet.json", multiplicity = 1 }')
    assert len(point(study(tmp_path, said, change)).modes.wavenumbers_cm) == 2


def test_a_seam_belongs_to_a_crossing_point(tmp_path: Path) -> None:
    ordinary = 'through = "MECP"'
    lines = TEXT[TEXT.index('kind = "crossing"') : TEXT.index("[effective]")]
    with pytest.raises(StudyError, match="no step crosses between spin states there"):
        study(tmp_path, old=lines, new="\n")
    again = f'[[steps]]\nequation = "singlet = triplet"\n{ordinary}\n\n[effective]'
    with pytest.raises(StudyError, match="MECP is the crossing point of another step") as caught:
        study(tmp_path, old="[effective]", new=again)
    assert caught.value.where.endswith("[steps.2] through")


def xyz(outputs: Path, comment: str) -> None:
    rows = (METHYLENE / "outputs" / "crossing_singlet.xyz").read_text().splitlines()
    atoms = [" ".join(row.split()[:4]) for row in rows[2:]]
    head = f'Properties=species:S:1:pos:R:3 charge=0 multiplicity=1 energy=-1064.7 {comment} pbc="F F F"'
    (outputs / "point.xyz").write_text("\n".join(["3", head, *atoms, ""]))


ALONE = 'frequencies = "point.xyz"'


def test_modes_that_were_projected(tmp_path: Path) -> None:
    """3N-7 modes: at a crossing point only, and not with other masses."""
    declared = 'landau_zener = { spin_orbit = "10 cm^-1" }'
    loaded = study(
        tmp_path,
        ALONE,
        lambda outputs: xyz(outputs, 'seam_frequencies="2910.3 2735.9"'),
        declared,
        "transmission = 0.01",
    )
    assert point(loaded).modes.wavenumbers_cm == pytest.approx([2735.9, 2910.3])
    assert point(loaded).modes.oscillators_cm == pytest.approx([2735.9, 2910.3])
    assert "mode-count" not in codes(loaded)
    assert loaded.effective().steps[0].log_transmission == pytest.approx([np.log(0.01)] * 3)
    calc = tp.read(tmp_path / "outputs" / "point.xyz")
    for kind in ("minimum", "saddle", None):
        with pytest.raises(
            StudyError, match="2 modes where a nonlinear structure of 3 atoms has 3"
        ):
            tp.thermochemistry(calc, kind=kind)
    assert len(tp.thermochemistry(calc, kind="crossing").modes()) == 2
    with pytest.raises(StudyError, match="holds no Hessian"):
        tp.thermochemistry(calc, kind="crossing", isotopes={2: "D"})
    with pytest.raises(StudyError, match="gradients of both states at MECP are not known"):
        study(
            tmp_path, ALONE, lambda outputs: xyz(outputs, 'seam_frequencies="2910.3 2735.9"')
        ).effective()


@pytest.mark.parametrize(
    "comment", ['seam_frequencies="1 2 3"', 'seam_frequencies="1 2" frequencies="1 2 3"']
)
def test_seam_frequencies_are_one_less(comment: str, tmp_path: Path) -> None:
    xyz(tmp_path, comment)
    with pytest.raises(ReadError, match="seam_frequencies must be one less"):
        tp.read(tmp_path / "point.xyz")


def test_modes_with_a_hessian_do_not_follow_other_masses() -> None:
    x = document("crossing_singlet")[0] * 0.529177
    calc = made("point", [6, 1, 1], x, [2735.9, 2910.3], hessian_hartree_bohr2=np.eye(9))
    with pytest.raises(StudyError, match="modes along the seam for its own masses only"):
        tp.thermochemistry(calc, kind="crossing", isotopes={2: "D"})


def test_one_imaginary_mode_is_taken_for_the_coordinate(tmp_path: Path) -> None:
    loaded = study(
        tmp_path, ALONE, lambda outputs: xyz(outputs, 'frequencies="-900 2735.9 2910.3"')
    )
    assert point(loaded).modes.oscillators_cm == pytest.approx([2735.9, 2910.3])
    found = next(one for one in loaded.findings if one.code == "crossing-coordinate-assumed")
    assert found.severity == "warning"
    assert "imaginary mode (-900.0 cm^-1) is taken for the motion across the seam" in found.what
    for modes, sentence in (
        ("900 2735.9 2910.3", "no mode shows which motion leads across the seam"),
        ("-900 -800 2910.3", "of which one can be the motion across the seam"),
    ):
        comment = f'frequencies="{modes}"'
        with pytest.raises(StudyError, match=sentence):
            study(tmp_path, ALONE, lambda outputs, c=comment: xyz(outputs, c))


def test_half_a_landau_zener_law(tmp_path: Path) -> None:
    law = 'spin_orbit = "10 cm^-1"'
    with pytest.raises(StudyError, match="gradient_difference alone"):
        study(tmp_path, old=law, new=f'{law}, gradient_difference = "0.05 hartree/bohr"')


def test_gradients_of_readers() -> None:
    """QCSchema beside a Hessian, extended XYZ as forces: the same size; other readers say None."""
    one = tp.read(METHYLENE / "outputs" / "crossing_singlet.json")
    two = tp.read(METHYLENE / "outputs" / "crossing_singlet.xyz")
    assert one.gradient_hartree_bohr is not None
    assert two.gradient_hartree_bohr is not None
    assert one.gradient_hartree_bohr == pytest.approx(document("crossing_singlet")[1], abs=0)
    assert np.linalg.norm(two.gradient_hartree_bohr) == pytest.approx(
        np.linalg.norm(one.gradient_hartree_bohr), rel=1e-6
    )
    assert two.where["gradient_hartree_bohr"] == 3
    task = METHYLENE.parent / "nwchem" / "good" / "water_hf_freq.out"
    assert tp.read(task).gradient_hartree_bohr is None


def test_gradient_of_a_task(tmp_path: Path) -> None:
    """NWChem: that of the gradient task; none where its table is of another state, an error where damaged."""
    data = gzip.decompress((METHYLENE / "outputs" / "nwchem_triplet.out.gz").read_bytes())
    row = b"   2 H       0.000000   1.606594   1.039237    0.000000  -0.012817   0.037120"
    assert data.count(row) == 1
    calc = tp.read(METHYLENE / "outputs" / "nwchem_triplet.out.gz")
    assert calc.gradient_hartree_bohr == pytest.approx(document("crossing_triplet")[1], abs=5e-6)
    assert data.splitlines()[calc.where["gradient_hartree_bohr"]].startswith(row)
    for new, sentence in (
        (row.replace(b"1.606594", b"1.606694"), "a gradient at other coordinates than the energy"),
        (row.replace(b"-0.012817", b" ********"), "expected"),
        (row.replace(b"   2 H", b"   3 H"), "the gradient of atom 2"),
    ):
        path = tmp_path / "a.out"
        path.write_bytes(data.replace(row, new))
        with pytest.raises(ReadError, match=sentence):
            tp.read(path)
    # the gradient task a little lower in energy, its parts too: another state
    parts = [
        re.search(rb"(?:%s) += +(-?\d+\.\d+)" % name, data)
        for name in (b"Total DFT energy", b"One electron energy")
    ]
    other = data
    for part in parts:
        assert part is not None
        text = part.group(1)
        lower = b"%.12f" % (float(text) - 1e-4)
        other = other[: part.start(1)] + lower[: len(text)] + other[part.end(1) :]
    (tmp_path / "a.out").write_bytes(other)
    assert tp.read(tmp_path / "a.out").gradient_hartree_bohr is None


def test_forces_that_are_none(tmp_path: Path) -> None:
    text = (METHYLENE / "outputs" / "crossing_singlet.xyz").read_text()
    (tmp_path / "a.xyz").write_text(text.replace("-0.17437863", "nan"))
    with pytest.raises(ReadError, match="forces: not three finite numbers an atom"):
        tp.read(tmp_path / "a.xyz")
