"""Grouping: single points with their frequency job, copies, conformers, sets that balance."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from draft_folders import NWCHEM, PLUME, made_up, peroxide, water

import thermo_pp as tp
from thermo_pp.audit.levels import stated_level
from thermo_pp.grouping import (
    Grouped,
    Grouping,
    balances,
    conformers,
    group,
    levels_of,
    same_level,
)
from thermo_pp.records import Calculation

MOVED = np.array([[0, 0, 0.01], [0, 0, 0], [0, 0, 0]])


def stems(calculations: tuple[Calculation, ...]) -> list[str]:
    return [Path(calc.path).name.partition(".")[0] for calc in calculations]


def by_name(grouping: Grouping) -> dict[str, Grouped]:
    return {stems((each.frequencies,))[0]: each for each in grouping.structures}


@pytest.fixture(scope="module")
def plume() -> dict[str, Grouped]:
    return by_name(group(tp.read(path) for path in sorted(PLUME.iterdir())))


def test_stack_plume(plume: dict[str, Grouped]) -> None:
    assert len(plume) == 8
    for name, structure in plume.items():
        assert stems(structure.singles) == [f"{name}_ccsdt", f"{name}_mp2-qz", f"{name}_mp2"]
        assert structure.copies == ()
        assert structure.role == ("saddle" if name.startswith("ts") else "minimum")


def test_complexes_are_told_by_their_bonds(plume: dict[str, Grouped]) -> None:
    w, so3 = plume["water"].fragments, plume["so3"].fragments
    assert len(plume["h2so4"].fragments) == 1
    assert plume["water-dimer"].fragments == (*w, *w)
    assert plume["so3-water"].fragments == tuple(sorted((*w, *so3)))
    assert plume["so3-water2"].fragments == tuple(sorted((*w, *w, *so3)))


def minima(plume: dict[str, Grouped]) -> dict[str, Grouped]:
    return {name: each for name, each in plume.items() if each.role == "minimum"}


def test_sets_that_balance(plume: dict[str, Grouped]) -> None:
    found = balances(plume["ts-unassisted"], minima(plume))
    assert found == (("h2so4",), ("so3-water",), ("so3", "water"))
    found = balances(plume["ts-assisted"], minima(plume))
    assert set(found) == {
        ("so3-water2",), ("h2so4", "water"), ("so3-water", "water"), ("so3", "water-dimer"),
        ("so3", "water", "water"),
    }  # fmt: skip
    assert [len(names) for names in found] == sorted(len(names) for names in found)
    assert balances(plume["ts-assisted"], minima(plume), most=1) == (("so3-water2",),)


def changed(structure: Grouped, **fields: Any) -> Grouped:
    return replace(structure, frequencies=replace(structure.frequencies, **fields))


def test_charge_and_spin_must_fit(plume: dict[str, Grouped]) -> None:
    names = minima(plume)
    assert balances(changed(plume["ts-unassisted"], charge=1), names) == ()
    assert balances(changed(plume["ts-unassisted"], charge=None), names) != ()
    assert balances(changed(plume["ts-unassisted"], multiplicity=3), names) == ()
    triplet = {**names, "so3": changed(plume["so3"], multiplicity=3)}
    assert ("so3", "water") not in balances(plume["ts-unassisted"], triplet)
    doublets = {**triplet, "so3": changed(plume["so3"], multiplicity=2)}
    doublets["water"] = changed(plume["water"], multiplicity=2)
    assert ("so3", "water") in balances(plume["ts-unassisted"], doublets)


def test_the_same_structure_twice() -> None:
    names = ["water_hf_freq.out", "water_hf_freq_crlf.out", "water_labels_hf_freq.out"]
    grouping = group(tp.read(NWCHEM / name) for name in names)
    assert len(grouping.structures) == 1
    assert stems(grouping.structures[0].copies) == ["water_hf_freq_crlf", "water_labels_hf_freq"]


def test_a_mirror_image_is_a_copy_and_a_conformer_is_not(tmp_path: Path) -> None:
    paths = [
        made_up(tmp_path / f"hooh{k}.json", *peroxide(angle), -150.7)
        for k, angle in enumerate((112, -112, 170))
    ]
    grouping = group(map(tp.read, paths))
    assert [stems(each.copies) for each in grouping.structures] == [["hooh1"], []]
    assert conformers(grouping.structures) == ((0, 1),)


def test_heavy_water_is_no_conformer_of_water(tmp_path: Path) -> None:
    light = made_up(tmp_path / "h2o.json", *water(), -76.0)
    heavy = made_up(tmp_path / "d2o.json", *water(), -76.0, masses=[15.9949, 2.0141, 2.0141])
    grouping = group(map(tp.read, (light, heavy)))
    assert len(grouping.structures) == 2
    assert conformers(grouping.structures) == ((0,), (1,))
    names = dict(zip(("light", "heavy"), grouping.structures, strict=True))
    assert balances(grouping.structures[1], names) == (("heavy",),)


def test_a_single_point_elsewhere_stands_alone(tmp_path: Path) -> None:
    symbols, x = water()
    job = made_up(tmp_path / "job.json", symbols, x, -76.0)
    moved = np.array(x) + MOVED
    other = made_up(tmp_path / "sp.json", symbols, moved, -76.2, driver="energy", method="mp2")
    same = made_up(tmp_path / "sp2.json", symbols, x, -76.2, driver="energy", method="mp2")
    cation = made_up(
        tmp_path / "cation.json", symbols, x, -75.8, driver="energy", charge=1, multiplicity=2
    )
    grouping = group(map(tp.read, (job, other, same, cation)))
    assert stems(grouping.structures[0].singles) == ["sp2"]
    assert stems(grouping.alone) == ["sp", "cation"]


def test_the_copy_with_single_points_is_kept(tmp_path: Path) -> None:
    symbols, x = water()
    near = np.array(x) + MOVED
    paths = [
        made_up(tmp_path / "loose.json", symbols, x, -76.0),
        made_up(tmp_path / "tight.json", symbols, near, -76.0),
        made_up(tmp_path / "sp.json", symbols, near, -76.2, driver="energy", method="mp2"),
    ]
    grouping = group(map(tp.read, paths))
    assert len(grouping.structures) == 1
    assert stems((grouping.structures[0].frequencies,)) == ["tight"]
    assert stems(grouping.structures[0].singles) == ["sp"]
    assert stems(grouping.structures[0].copies) == ["loose"]
    assert grouping.alone == ()


def test_an_atom_needs_no_frequencies_and_takes_the_level_of_the_others(tmp_path: Path) -> None:
    paths = [
        made_up(
            tmp_path / "ar_mp2.json", ["Ar"], [[0, 0, 0]], -527.0, driver="energy", method="mp2"
        ),
        made_up(tmp_path / "ar_hf.json", ["Ar"], [[0, 0, 0]], -526.7, driver="energy"),
        made_up(tmp_path / "h2o.json", *water(), -76.0),
    ]
    found = by_name(group(map(tp.read, paths)))
    assert list(found) == ["ar_hf", "h2o"]
    assert stems(found["ar_hf"].singles) == ["ar_mp2"]
    assert found["ar_hf"].role == "minimum"


def test_two_imaginary_modes_are_neither(plume: dict[str, Grouped]) -> None:
    modes = np.array([-500.0, -100.0, 1000.0])
    assert changed(plume["water"], wavenumbers_cm=modes).role is None


def test_levels(plume: dict[str, Grouped]) -> None:
    singles = [single for each in plume.values() for single in each.singles]
    assert [len(level) for level in levels_of(singles)] == [8, 8, 8]
    water_ = plume["water"].frequencies
    unknown = replace(water_, method=None, basis=None, dispersion=None, solvent=None, grid=None)
    other = replace(water_, basis="cc-pvtz")
    assert [len(level) for level in levels_of([unknown, water_, other])] == [2, 1]
    finer = replace(water_, grid="xfine")
    assert same_level(stated_level(water_), stated_level(finer))
    assert not same_level(stated_level(water_), stated_level(other))


def test_order_of_the_files_does_not_change_the_groups(plume: dict[str, Grouped]) -> None:
    paths = sorted(PLUME.iterdir(), reverse=True)
    found = by_name(group(map(tp.read, paths)))
    assert set(found) == set(plume)
    for name, structure in found.items():
        assert set(stems(structure.singles)) == set(stems(plume[name].singles))
