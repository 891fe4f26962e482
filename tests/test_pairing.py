"""Pairing: a single point belongs to a frequency job of the same molecule in the same geometry."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from thermo_pp.errors import StudyError
from thermo_pp.pairing import SAME_GEOMETRY_ANGSTROM, pair
from thermo_pp.records import Calculation

# hydrogen peroxide, chiral: made up, near the real structure
NUMBERS = np.array([8, 8, 1, 1])
POSITIONS = np.array(
    [[0.0, 0.73, -0.06], [0.0, -0.73, -0.06], [0.79, 0.89, 0.45], [-0.79, -0.89, 0.45]]
)


def calculation(path: str = "freq.out", **fields: Any) -> Calculation:
    known: dict[str, Any] = {
        "path": path,
        "sha256": path,
        "program": "test",
        "numbers": NUMBERS,
        "positions_angstrom": POSITIONS,
        "masses_u": np.where(NUMBERS == 8, 15.9949, 1.00783),
        "masses_origin": "printed",
        "charge": 0,
        "multiplicity": 1,
        "energy_hartree": -150.0,
    }
    known |= fields
    known["masses_u"] = np.where(np.asarray(known["numbers"]) == 8, 15.9949, 1.00783)
    return Calculation(**known)


def rotation() -> np.ndarray:
    a, b = 0.7, 2.1
    about_z = np.array([[np.cos(a), -np.sin(a), 0], [np.sin(a), np.cos(a), 0], [0, 0, 1]])
    about_x = np.array([[1, 0, 0], [0, np.cos(b), -np.sin(b)], [0, np.sin(b), np.cos(b)]])
    return np.asarray(about_z @ about_x)


def test_the_same_geometry() -> None:
    found = pair(calculation(), calculation("sp.out"), where="here")
    assert found.rmsd_angstrom < 1e-10
    assert found.findings == ()


def test_orientation_and_order_do_not_matter() -> None:
    order = np.array([3, 1, 2, 0])
    turned = POSITIONS @ rotation().T + np.array([3.0, -2.0, 1.0])
    other = calculation("sp.out", numbers=NUMBERS[order], positions_angstrom=turned[order])
    assert pair(calculation(), other, where="here").rmsd_angstrom < 1e-6


def test_coordinates_rounded_to_three_decimals_are_the_same() -> None:
    turned = POSITIONS @ rotation().T
    rounded = calculation("sp.out", positions_angstrom=np.round(turned, 3))
    assert 0.0 < pair(calculation(), rounded, where="here").rmsd_angstrom < SAME_GEOMETRY_ANGSTROM


@pytest.mark.parametrize(("factor", "same"), [(0.9, True), (1.1, False)])
def test_the_tolerance_is_the_stated_one(factor: float, same: bool) -> None:
    # stretched along one O-H bond by d: the root mean square distance follows from the superposition itself
    shift = np.zeros((4, 3))
    bond = POSITIONS[2] - POSITIONS[0]
    shift[2] = bond / np.linalg.norm(bond)
    unit = pair(
        calculation(), calculation("a", positions_angstrom=POSITIONS + 1e-4 * shift), where=""
    )
    size = 1e-4 * factor * SAME_GEOMETRY_ANGSTROM / unit.rmsd_angstrom
    other = calculation("sp.out", positions_angstrom=POSITIONS + size * shift)
    if same:
        found = pair(calculation(), other, where="here")
        assert found.rmsd_angstrom == pytest.approx(
            factor * SAME_GEOMETRY_ANGSTROM, rel=1e-3, abs=0.0
        )
        return
    with pytest.raises(StudyError) as caught:
        pair(calculation(), other, where="study.toml [species.A] energy")
    assert caught.value.what == (
        "sp.out and freq.out have different geometries: 0.0011 A apart (root mean square), "
        "more than 0.001 A"
    )
    assert caught.value.where == "study.toml [species.A] energy"
    assert caught.value.mend == (
        "run the single point at the geometry of the frequency job, or name the frequency job of "
        "this geometry"
    )


def test_the_mirror_image_is_another_geometry() -> None:
    mirrored = calculation("sp.out", positions_angstrom=POSITIONS * np.array([1.0, 1.0, -1.0]))
    with pytest.raises(StudyError, match="different geometries"):
        pair(calculation(), mirrored, where="here")


def test_other_atoms() -> None:
    water = calculation(
        "sp.out", numbers=NUMBERS[[0, 2, 3]], positions_angstrom=POSITIONS[[0, 2, 3]]
    )
    with pytest.raises(StudyError) as caught:
        pair(calculation(), water, where="here")
    assert caught.value.what == "sp.out is H2O, but freq.out is H2O2"
    assert caught.value.mend == "name a single point of the same molecule"


@pytest.mark.parametrize(("field", "value"), [("charge", 1), ("multiplicity", 3)])
def test_another_charge_or_multiplicity(field: str, value: int) -> None:
    with pytest.raises(StudyError) as caught:
        pair(calculation(), calculation("sp.out", **{field: value}), where="here")
    known = getattr(calculation(), field)
    assert caught.value.what == (f"sp.out has {field} {value}, but freq.out has {field} {known}")


@pytest.mark.parametrize("field", ["charge", "multiplicity"])
def test_unknown_is_a_note(field: str) -> None:
    (finding,) = pair(calculation(), calculation("sp.out", **{field: None}), where="h").findings
    assert (finding.code, finding.severity, finding.file) == ("charge-unknown", "note", "sp.out")
    assert finding.what == f"sp.out does not state its {field}: not compared with freq.out"
    silent = calculation(**{field: None})
    assert pair(silent, calculation("sp.out", **{field: None}), where="h").findings == ()


def test_no_energy() -> None:
    with pytest.raises(StudyError) as caught:
        pair(calculation(), calculation("sp.out", energy_hartree=None), where="here")
    assert caught.value.what == "sp.out has no energy"
