"""Exports: other libraries open them and find the numbers."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

import thermo_pp as tp
from thermo_pp.output.exports import write_exports
from thermo_pp.output.exports.qcschema import lacking
from thermo_pp.output.exports.structures import file_stem
from thermo_pp.study.answers import Answers
from thermo_pp.study.load import Study
from thermo_pp.study.run import answer

ROOT = Path(__file__).parents[1]


@pytest.fixture(scope="module")
def answers(bundled_answers: Answers) -> Answers:
    return bundled_answers


@pytest.fixture(scope="module")
def folder(answers: Answers, tmp_path_factory: pytest.TempPathFactory) -> Path:
    found = tmp_path_factory.mktemp("report") / "exports"
    write_exports(answers, found)
    return found


def test_ase_opens_the_rows(folder: Path, answers: Answers) -> None:
    import ase.db
    from ase.units import Hartree

    with ase.db.connect(folder / "species.json") as rows:
        assert len(rows) == len(answers.study.species)
        for name, model in answers.study.species.items():
            row = rows.get(species=name)
            atoms = row.toatoms()
            job = model.calculation  # type: ignore[attr-defined]
            assert np.array_equal(atoms.numbers, job.numbers)
            assert np.array_equal(atoms.positions, job.positions_angstrom)
            assert np.array_equal(atoms.get_masses(), model.masses_u)  # type: ignore[attr-defined]
            assert row.energy == model.energy_hartree * Hartree  # type: ignore[attr-defined]
            assert row.kind == model.kind
            assert np.array_equal(
                row.data["gibbs_kj_mol"], answers.species[name].result.gibbs_kj_mol
            )
            assert row.ctime == 0.0
            assert row.user == ""
        assert sorted(row.species for row in rows.select(kind="saddle")) == ["TS1", "TS2"]


def test_ase_db_prints_them(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    from ase.cli.main import main

    main(args=["db", str(folder / "species.json"), "-c", "species,kind,energy"])
    assert "TS2" in capsys.readouterr().out


def test_our_reader_reads_back_every_document(folder: Path, answers: Answers) -> None:
    calculations = dict(answers.study.calculations)
    paths = sorted((folder / "qcschema").iterdir())
    assert len(paths) == len(calculations)
    for path in paths:
        source = json.loads(path.read_text(encoding="utf-8"))["extras"]["source"]
        was, found = calculations[source], tp.read(path)
        assert found.energy_hartree == was.energy_hartree
        assert found.program_version == was.program_version
        assert (found.charge, found.multiplicity, found.basis) == (
            was.charge, was.multiplicity, was.basis,
        )  # fmt: skip
        assert np.array_equal(found.numbers, was.numbers)
        assert found.positions_angstrom == pytest.approx(was.positions_angstrom, abs=1e-12, rel=0.0)
        assert np.array_equal(found.masses_u, was.masses_u)
        if was.hessian_hartree_bohr2 is None:
            assert found.wavenumbers_cm is None
            continue
        assert found.wavenumbers_cm is not None
        assert found.hessian_hartree_bohr2 is not None
        assert np.array_equal(found.hessian_hartree_bohr2, was.hessian_hartree_bohr2)
        # the program removed translations and rotations in its own way before it printed
        assert found.wavenumbers_cm == pytest.approx(was.wavenumbers_cm, abs=0.2, rel=0.0)


def test_the_schema_takes_every_document(folder: Path) -> None:
    models = pytest.importorskip("qcelemental.models", exc_type=ImportError)
    for path in sorted((folder / "qcschema").iterdir()):
        text = json.loads(path.read_text(encoding="utf-8"))
        result = models.AtomicResult(**text)
        assert result.properties.return_energy == text["properties"]["return_energy"]
        assert result.molecule.geometry.ravel() == pytest.approx(
            text["molecule"]["geometry"],
            abs=6e-7,
            rel=0.0,  # it sets what is below 5^-9 to 0
        )


def test_cantera_opens_the_phase(folder: Path, answers: Answers) -> None:
    cantera = pytest.importorskip("cantera")
    gas = cantera.Solution(str(folder / "gas.yaml"))
    assert gas.species_names == [
        name for name, model in answers.study.species.items() if model.kind == "minimum"
    ]


def test_what_is_left_out_is_said(tmp_path: Path) -> None:
    from declared_study import TEXT

    path = tmp_path / "study.toml"
    path.write_text(
        TEXT.replace("[conditions]", '[treatment]\nphase = "solution"\n\n[conditions]').replace(
            'barrier = "none"', 'barrier = "none"\nviscosity = "0.89 mPa s"'
        ),
        encoding="utf-8",
    )
    write_exports(answer(Study.load(path)), tmp_path / "exports")
    text = (tmp_path / "exports" / "README.md").read_text(encoding="utf-8")
    assert "no species is read from an output" in text
    assert "gas.yaml is not there: a solution cannot be written" in text
    assert [entry.name for entry in (tmp_path / "exports").iterdir()] == ["README.md"]


def test_an_output_without_a_charge_has_no_document() -> None:
    from dataclasses import replace

    known = tp.read(ROOT / "fixtures" / "stack-plume" / "outputs" / "water_mp2.out")
    assert lacking(known) is None
    assert lacking(replace(known, charge=None, energy_hartree=None)) == "charge, energy"


@pytest.mark.parametrize(
    ("name", "number", "stem"),
    [
        ("TS1", None, "003-TS1"),
        ("C2", 4, "003-C2-4"),
        ("../etc/passwd", None, "003-etc-passwd"),
        ('<b>&_%$"x', None, "003-b-x"),
        ("λ", None, "003"),
    ],
)
def test_file_names_are_plain(name: str, number: int | None, stem: str) -> None:
    assert file_stem(3, name, number) == stem
