"""Molden, cjson, VibrationsData of ASE, and modes in ASE's own formats."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from ase import Atoms
from ase.calculators.singlepoint import SinglePointCalculator
from ase.db import connect
from ase.io import write
from ase.units import Bohr, Hartree
from fixture_files import FIXTURES, expected, file_id, files

from thermo_pp.errors import ReadError
from thermo_pp.formulas.normal_modes import normal_modes
from thermo_pp.readers import (
    ase_formats,
    ase_vibrations,
    cjson,
    joined_hessian,
    molden,
    nwchem,
    psi4,
)
from thermo_pp.readers.mode_lists import displacements, vibrations
from thermo_pp.records import Calculation
from thermo_pp.sources import Source, open_source

FILES = [
    (reader, path)
    for reader in (molden, cjson, ase_vibrations)
    for path in files(reader.NAME, "good")
]
MOLDEN = FIXTURES / "molden" / "good" / "water_psi4.molden"
CJSON = FIXTURES / "cjson" / "good" / "water_molden.cjson"
NITROGEN = FIXTURES / "ase_vibrations" / "good" / "nitrogen_emt.json"
OZONE = NITROGEN.with_name("ozone_isotopes_emt.json")
JOINED = FIXTURES / "joined"


def codes(calc: Calculation) -> list[str]:
    return [finding.code for finding in calc.findings]


@pytest.mark.parametrize(("reader", "path"), FILES, ids=lambda value: getattr(value, "stem", ""))
def test_fields(reader: Any, path: Path) -> None:
    expect, calc = expected(path), reader.read(open_source(path, path.name))
    assert calc.formula == expect["formula"]
    assert (calc.energy_hartree, calc.method, calc.charge) == (None, None, None)
    assert calc.wavenumbers_cm == pytest.approx(
        np.array(expect["wavenumbers_cm"]), abs=0.02, rel=0.0
    )
    assert calc.modes is not None
    assert calc.modes.shape == (len(calc.wavenumbers_cm), len(calc.numbers), 3)
    assert np.sum(calc.modes**2, axis=(1, 2)) == pytest.approx(1.0, abs=1e-9, rel=0.0)
    assert "no-energy" in codes(calc)
    assert reader.sniff(path.read_bytes()[:65536])
    if "wavenumbers_line" in expect:
        assert calc.where["wavenumbers_cm"] == expect["wavenumbers_line"]


def test_molden_positions_are_in_bohr_and_its_two_geometries_are_one() -> None:
    one = molden.read(open_source(MOLDEN))
    two = molden.read(open_source(MOLDEN.with_name("water_atoms.molden")))
    assert one.positions_angstrom[0, 2] == pytest.approx(0.1344684588 * 0.529177210544, abs=1e-9)
    assert two.positions_angstrom == pytest.approx(one.positions_angstrom, abs=1e-9, rel=0.0)


def _edited(path: Path, old: str, new: str) -> Source:
    text = path.read_text(encoding="utf-8")
    assert old in text
    return Source("x", text.replace(old, new, 1).encode())


def test_molden_atoms_alone_in_angstrom() -> None:
    text = MOLDEN.with_name("water_atoms.molden").read_text(encoding="utf-8")
    head, _, rest = text.partition("[FR-COORD]")
    text = head + rest[rest.index("[FR-NORM-COORD]") :]
    bohr = molden.read(Source("x", text.encode())).positions_angstrom
    angstrom = molden.read(Source("x", text.replace("AU", "Angs").encode())).positions_angstrom
    assert angstrom == pytest.approx(bohr / 0.529177210544, abs=1e-9, rel=0.0)
    with pytest.raises(ReadError, match="expected AU or Angs"):
        molden.read(Source("x", text.replace("AU", "nm").encode()))


def test_molden_null_modes_and_imaginary_ones() -> None:
    text = MOLDEN.read_text(encoding="utf-8").partition("[FR-NORM-COORD]")[0]
    with_null = text.replace("[FREQ]\n", "[FREQ]\n" + "0.01\n-0.2\n0.0\n0.3\n0.0\n0.5\n", 1)
    calc = molden.read(Source("x", with_null.encode()))
    assert calc.wavenumbers_cm is not None
    assert len(calc.wavenumbers_cm) == 3
    assert calc.modes is None
    for imaginary in ("-2170.5", "2170.5i"):
        changed = text.replace(text.split()[3], imaginary, 1)
        found = molden.read(Source("x", changed.encode())).wavenumbers_cm
        assert found is not None
        assert found[0] == -2170.5
    with pytest.raises(ReadError, match="their size does not tell which"):
        molden.read(Source("x", with_null.replace("0.5\n", "20.5\n", 1).encode()))


def test_molden_orbitals_without_modes_are_not_claimed() -> None:
    assert not molden.sniff(b"[Molden Format]\n[Atoms] AU\nH 1 1 0 0 0\n[GTO]\n")


@pytest.mark.parametrize("path", [MOLDEN, CJSON, NITROGEN], ids=file_id)
def test_every_cut_is_an_error_or_has_the_same_modes(path: Path) -> None:
    reader = next(reader for reader, one in FILES if one == path)
    data, whole = path.read_bytes(), reader.read(open_source(path))
    for part in range(1, 100):
        try:
            calc = reader.read(Source("cut", data[: len(data) * part // 100]))
        except ReadError:
            continue
        assert calc.wavenumbers_cm.tolist() == whole.wavenumbers_cm.tolist()
        assert calc.positions_angstrom.tolist() == whole.positions_angstrom.tolist()


def test_cjson_takes_an_energy_only_with_its_unit() -> None:
    def read(properties: dict[str, Any]) -> Calculation:
        document = json.loads(CJSON.read_text(encoding="utf-8"))
        document["properties"] = properties
        return cjson.read(Source("x", json.dumps(document).encode()))

    for properties in ({"totalEnergy": -76.0}, {"energy": {"total": -76.0}}):
        calc = read(properties)
        assert calc.energy_hartree is None
        assert any("no unit" in finding.what for finding in calc.findings)
    assert read({"totalEnergy": {"value": -76.0, "unit": "hartree"}}).energy_hartree == -76.0
    electronvolts = read({"energy": {"total": -100.0, "units": "eV"}}).energy_hartree
    assert electronvolts == pytest.approx(-100.0 / 27.211386245981, abs=1e-9, rel=0.0)
    with pytest.raises(ReadError, match="an energy in 'furlong'"):
        read({"totalEnergy": {"value": -76.0, "unit": "furlong"}})


def test_cjson_default_charge_is_no_charge() -> None:
    assert cjson.read(open_source(CJSON)).charge is None
    ion = cjson.read(_edited(CJSON, '"totalCharge":0', '"totalCharge":1'))
    assert (ion.charge, ion.multiplicity) == (1, 1)
    with pytest.raises(ReadError, match="a periodic structure"):
        cjson.read(_edited(CJSON, '"chemicalJson":1', '"chemicalJson":1,"unitCell":{"a":1}'))


def test_vectors_that_may_be_mass_weighted() -> None:
    whole = ase_vibrations.read(open_source(OZONE))
    assert whole.modes is not None
    masses = np.array([15.999, 1.008, 1.008])
    water = molden.read(open_source(MOLDEN)).modes
    assert water is not None
    masses = molden.read(open_source(MOLDEN)).masses_u
    weighted = water * np.sqrt(masses)[:, None]
    for vectors in (water, 3.0 * water, weighted):
        found = displacements(vectors, masses)
        assert found is not None
        assert found == pytest.approx(water, abs=1e-6, rel=0.0)
    assert displacements(water + 0.3, masses) is None


def test_modes_of_another_number() -> None:
    masses, x = (
        np.array([15.999, 1.008, 1.008]),
        np.array([[0, 0, 0.1], [0, 0.76, -0.5], [0, -0.76, -0.5]]),
    )
    assert vibrations(np.array([3.0, 1.0, 2.0]), masses, x).tolist() == [1, 2, 0]
    with pytest.raises(ValueError, match="4 modes of 3 atoms"):
        vibrations(np.arange(4.0), masses, x)


def test_vibrations_data_units_and_masses() -> None:
    calc = ase_vibrations.read(open_source(OZONE))
    document = json.loads(OZONE.read_text(encoding="utf-8"))
    first = document["hessian"]["__ndarray__"][2][0]
    assert calc.hessian_hartree_bohr2 is not None
    assert calc.hessian_hartree_bohr2[0, 0] == pytest.approx(first / Hartree * Bohr**2, rel=1e-14)
    assert calc.masses_u.tolist() == [17.99916, 15.99491, 15.99491]
    assert calc.masses_origin == "printed"
    nitrogen = ase_vibrations.read(open_source(NITROGEN))
    assert nitrogen.masses_u.tolist() == [14.007, 14.007]
    assert nitrogen.masses_origin == "derived"


@pytest.mark.parametrize(
    ("old", "new", "what"),
    [
        ('"vibrationsdata"', '"cell"', "an object 'cell' of ASE"),
        ("[false, false, false]", "[true, false, false]", "a periodic structure"),
        ('"int64", [7, 7]', '"int64", [7, 0]', "an atom of no element"),
        ("-39.0", "-19.0", "the Hessian is not symmetric"),
    ],
)
def test_vibrations_data_that_is_refused(old: str, new: str, what: str) -> None:
    with pytest.raises(ReadError, match=what):
        ase_vibrations.read(_edited(NITROGEN, old, new))


def water(**info: Any) -> tuple[Atoms, np.ndarray]:
    """Water of the Molden fixture, with an energy, and the Hessian of the same job in eV/A^2."""
    calc = psi4.read(open_source(JOINED / "water.out"))
    assert calc.hessian_hartree_bohr2 is not None
    atoms = Atoms(numbers=calc.numbers, positions=calc.positions_angstrom)
    atoms.calc = SinglePointCalculator(atoms, energy=-75.0 * Hartree)
    atoms.info.update(info)
    return atoms, calc.hessian_hartree_bohr2 * Hartree / Bohr**2


FREQUENCIES = [2170.29, 4139.77, 4390.80]


def stored(path: Path, atoms: Atoms, **keys: Any) -> Calculation:
    """Write the keys the way the format takes them, and read the file."""
    if path.suffix == ".json":
        connect(path).write(atoms, data=keys)
    else:
        atoms.info.update(keys)
        write(path, atoms, format={".xyz": "extxyz", ".traj": "traj"}[path.suffix])
    return ase_formats.read(open_source(path))


@pytest.mark.parametrize("name", ["x.xyz", "x.traj", "x.json"])
@pytest.mark.parametrize("flat", [True, False])
def test_ase_formats_with_a_hessian(tmp_path: Path, name: str, flat: bool) -> None:
    atoms, hessian = water()
    calc = stored(tmp_path / name, atoms, hessian=hessian.ravel() if flat else hessian)
    assert calc.wavenumbers_cm == pytest.approx(np.array(FREQUENCIES), abs=0.05, rel=0.0)
    assert calc.kind_of_job == ("frequencies",)
    assert calc.energy_hartree == pytest.approx(-75.0, abs=1e-12, rel=0.0)
    assert calc.modes is not None
    if name != "x.traj":
        line = (
            (tmp_path / name)
            .read_text(encoding="utf-8")
            .splitlines()[calc.where["wavenumbers_cm"] - 1]
        )
        assert "hessian" in line


@pytest.mark.parametrize("name", ["x.xyz", "x.traj", "x.json"])
def test_ase_formats_with_frequencies(tmp_path: Path, name: str) -> None:
    atoms, hessian = water()
    calc = stored(tmp_path / name, atoms, frequencies=[0.0, 0.1, -0.2, 0.0, 0.3, 0.0, *FREQUENCIES])
    assert calc.wavenumbers_cm is not None
    assert calc.wavenumbers_cm.tolist() == FREQUENCIES
    assert calc.modes is None
    (tmp_path / name).unlink()
    both = stored(tmp_path / name, atoms, frequencies=FREQUENCIES, hessian=hessian)
    assert both.wavenumbers_cm is not None
    assert both.wavenumbers_cm.tolist() == FREQUENCIES
    assert both.hessian_hartree_bohr2 is not None


@pytest.mark.parametrize(
    ("keys", "what"),
    [
        ({"frequencies": [1.0, 2.0]}, "2 modes of 3 atoms"),
        ({"frequencies": ["a", "b", "c"]}, "frequencies does not hold finite numbers"),
        ({"hessian": [1.0] * 80}, "hessian: 80 numbers, expected 81"),
        ({"hessian": list(range(81))}, "hessian: it is not symmetric"),
    ],
)
def test_ase_formats_with_damaged_modes(tmp_path: Path, keys: dict[str, Any], what: str) -> None:
    with pytest.raises(ReadError, match=what):
        stored(tmp_path / "x.json", water()[0], **keys)


def test_frequencies_of_another_hessian_are_refused(tmp_path: Path) -> None:
    atoms, hessian = water()
    with pytest.raises(ReadError, match="not those of the hessian"):
        stored(tmp_path / "x.xyz", atoms, frequencies=[2175.0, *FREQUENCIES[1:]], hessian=hessian)


@pytest.mark.parametrize(("reader", "name"), [(psi4, "water.out"), (nwchem, "water_nwchem.out")])
def test_a_hessian_beside_is_joined(reader: Any, name: str, tmp_path: Path) -> None:
    calc = reader.read(open_source(JOINED / name))
    assert calc.hessian_hartree_bohr2 is not None
    own = normal_modes(calc.hessian_hartree_bohr2, calc.masses_u, calc.positions_angstrom)
    assert own.wavenumbers_cm == pytest.approx(calc.wavenumbers_cm, abs=0.002, rel=0.0)
    assert "hessian-not-joined" not in codes(calc)
    assert not any(value == 0.0 for value in np.diag(calc.hessian_hartree_bohr2)[1:3])
    (tmp_path / name).write_bytes((JOINED / name).read_bytes())
    (beside,) = (
        path for path in JOINED.glob("*.hess") if ("nwchem" in path.name) == ("nwchem" in name)
    )
    text = beside.read_text(encoding="utf-8")
    lines = text.splitlines(keepends=True)
    for damaged in (
        text.replace("0.8038", "0.9038").replace("8.039", "9.039"),
        "".join(lines[:-1]),
        text + "x\n",
        "",
    ):
        (tmp_path / beside.name).write_text(damaged, encoding="utf-8")
        other = reader.read(open_source(tmp_path / name))
        assert "hessian-not-joined" in codes(other)
        assert other.wavenumbers_cm.tolist() == calc.wavenumbers_cm.tolist()


def test_the_file_of_nwchem_has_more_digits_than_its_output(tmp_path: Path) -> None:
    (tmp_path / "water_nwchem.out").write_bytes((JOINED / "water_nwchem.out").read_bytes())
    alone = nwchem.read(open_source(tmp_path / "water_nwchem.out")).hessian_hartree_bohr2
    joined = nwchem.read(open_source(JOINED / "water_nwchem.out")).hessian_hartree_bohr2
    assert alone is not None
    assert joined is not None
    assert 1e-9 < np.abs(alone - joined).max() < 1e-4


def test_matrices_of_numbers() -> None:
    assert joined_hessian.numbers(b"1.0 2.0D-1\n-3e0") is not None
    assert joined_hessian.numbers(b"1.0 nan") is None
    triangle = joined_hessian.square(np.arange(6.0), 1)
    assert triangle is not None
    assert triangle.tolist() == [[0, 1, 3], [1, 2, 4], [3, 4, 5]]
    assert joined_hessian.square(np.arange(7.0), 1) is None
