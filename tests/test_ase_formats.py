"""Structures read through ASE: fixtures against their tables, the undone eV, what is refused."""

from __future__ import annotations

import re
from pathlib import Path

import ase.units
import numpy as np
import pytest
from fixture_files import FIXTURES, expected, file_id, files

from thermo_pp.errors import ReadError
from thermo_pp.readers import ase_formats
from thermo_pp.records import Calculation
from thermo_pp.sources import Source, open_source

GOOD = files("ase", "good")
HERE = FIXTURES / "ase" / "good"
WATER = [[0.0, 0.0, 0.119], [0.0, 0.763, -0.477], [0.0, -0.763, -0.477]]


def calculation(path: Path) -> Calculation:
    return ase_formats.read(open_source(path, path.name))


@pytest.mark.parametrize("path", GOOD, ids=file_id)
def test_structure_and_energy(path: Path) -> None:
    expect, calc = expected(path), calculation(path)
    assert calc.formula == expect["formula"]
    if "energy_hartree" in expect:
        assert calc.energy_hartree == pytest.approx(expect["energy_hartree"], rel=1e-15, abs=0.0)
    else:
        assert calc.energy_hartree is None
    assert calc.kind_of_job == (("energy",) if "energy_hartree" in expect else ())
    assert calc.masses_u.tolist() == expect["masses_u"]
    assert calc.masses_origin == expect["masses_origin"]
    assert (calc.charge, calc.multiplicity) == (expect.get("charge"), expect.get("multiplicity"))
    assert calc.where.get("energy_hartree") == expect.get("energy_line")
    assert [one.code for one in calc.findings] == (
        [expect["finding"]] if "finding" in expect else []
    )
    assert (calc.method, calc.basis, calc.wavenumbers_cm, calc.optimised) == (None,) * 4
    if expect["formula"] == "H2O":
        assert calc.positions_angstrom == pytest.approx(np.array(WATER), abs=1e-8)


def test_electronvolts_are_undone_with_the_number_of_ase() -> None:
    """CODATA 2014 in ASE, 2022 here: the difference is 1e-9, 0.2 microhartree for water."""
    path = HERE / "water_energy.xyz"
    printed = re.search(r"energy=(\S+)", path.read_text())
    assert printed is not None
    assert calculation(path).energy_hartree == float(printed.group(1)) / ase.units.Hartree


def test_lines_of_the_last_structure() -> None:
    path = HERE / "water_steps.xyz"
    calc, lines = calculation(path), ["", *path.read_text().splitlines()]
    assert "energy=" in lines[calc.where["energy_hartree"]]
    first = [float(word) for word in lines[calc.where["positions_angstrom"]].split()[1:]]
    assert calc.positions_angstrom[0].tolist() == first


def test_every_structure_of_a_file() -> None:
    for name in ("water_steps.xyz", *(path.name for path in GOOD if path.suffix == ".traj")):
        source = open_source(HERE / name, name)
        last, found = ase_formats.read(source), ase_formats.read_all(source)
        assert [one.path for one in found] == [f"{name}#{k + 1}" for k in range(len(found))]
        assert found[-1].energy_hartree == last.energy_hartree
        assert found[-1].positions_angstrom.tolist() == last.positions_angstrom.tolist()
        assert found[-1].where == last.where
        assert len({one.sha256 for one in found}) == len(found)
    lines = ["", *(HERE / "water_steps.xyz").read_text().splitlines()]
    steps = ase_formats.read_all(open_source(HERE / "water_steps.xyz"))
    assert len(steps) > 1
    for one in steps:
        assert "energy=" in lines[one.where["energy_hartree"]]
        first = [float(word) for word in lines[one.where["positions_angstrom"]].split()[1:]]
        assert one.positions_angstrom[0].tolist() == first


def test_dos_line_ends_read_the_same() -> None:
    path = HERE / "water_steps.xyz"
    dos = ase_formats.read(Source("dos.xyz", path.read_bytes().replace(b"\n", b"\r\n")))
    assert dos.energy_hartree == calculation(path).energy_hartree
    assert dos.where == calculation(path).where


@pytest.mark.parametrize("count", [b"999999999", b"9"])
def test_atoms_that_are_promised_but_not_there(count: bytes) -> None:
    data = count + (HERE / "water_energy.xyz").read_bytes()[1:]
    with pytest.raises(ReadError, match="line 1 promises more atoms than there are"):
        ase_formats.read(Source("x.xyz", data))


def test_nothing_is_unpickled() -> None:
    """A pickle that would raise if it were opened: no format claims it, and reading refuses it."""
    data = (FIXTURES / "ase" / "bad" / "pickle.traj").read_bytes()
    assert data.startswith(b"PickleTrajectory")
    assert not ase_formats.sniff(data)
    with pytest.raises(ReadError, match="none of the formats that are read through ASE"):
        ase_formats.read(Source("pickle.traj", data))


def test_every_truncation_of_a_trajectory_is_an_error() -> None:
    data = (HERE / "water_energy.xyz").read_bytes()
    for cut in range(len(data) - 12):
        with pytest.raises(ReadError):
            ase_formats.read(Source("cut.xyz", data[:cut]))
    data = (HERE / "water_steps_binary.traj").read_bytes()
    for part in range(1, 20):
        with pytest.raises(ReadError):
            ase_formats.read(Source("cut.traj", data[: len(data) * part // 20]))


def test_sniff() -> None:
    assert all(ase_formats.sniff(path.read_bytes()[:65536]) for path in GOOD)
    assert not ase_formats.sniff(b"3\nwater\nO 0 0 0\nH 0 0 1\nH 0 1 0\n")
    assert not ase_formats.sniff(b'{"1": {"numbers": [1]}, "ids": [1]}')
