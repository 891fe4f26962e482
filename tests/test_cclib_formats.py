"""Formats read through cclib: fixtures in their forms, a real checkpoint, answers that do not add up."""

from __future__ import annotations

import importlib.util
import json
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest
from fixture_files import expected, file_id, files

from thermo_pp.errors import ReadError
from thermo_pp.formulas.normal_modes import normal_modes
from thermo_pp.readers import cclib_formats, read_source
from thermo_pp.records import Calculation
from thermo_pp.sources import Source, open_source

pytest.importorskip("cclib", reason="the extra thermo-pp[formats] is not installed")

GOOD = files("cclib", "good")
BY_NAME = {path.stem: path for path in GOOD}
SHARED = Path(__file__).parents[2] / "shared" / "data" / "other-programs"
REAL = SHARED / "FChk" / "basicGaussian16" / "dvb_ir.fchk"


def calculation(path: Path) -> Calculation:
    return cclib_formats.read(open_source(path, path.name))


@pytest.mark.parametrize("path", GOOD, ids=file_id)
def test_energy_and_modes(path: Path) -> None:
    expect, calc = expected(path), calculation(path)
    lines = ["", *path.read_text().splitlines()]
    assert calc.energy_label == calc.method == expect["label"]
    assert (calc.charge, calc.multiplicity) == (0, 1)
    assert float(lines[calc.where["energy_hartree"]].split()[-1]) == calc.energy_hartree
    if "wavenumbers_cm" not in expect:
        assert calc.wavenumbers_cm is None
        return
    assert calc.wavenumbers_cm is not None
    assert calc.wavenumbers_cm.tolist() == expect["wavenumbers_cm"]
    assert f"{abs(calc.wavenumbers_cm[0]):.8E}" in lines[calc.where["wavenumbers_cm"]]
    assert calc.modes is not None
    assert np.sqrt((calc.modes**2).sum(axis=(1, 2))) == pytest.approx(1.0, abs=1e-12)
    assert calc.hessian_hartree_bohr2 is not None
    own = normal_modes(calc.hessian_hartree_bohr2, calc.masses_u, calc.positions_angstrom)
    assert own.wavenumbers_cm == pytest.approx(calc.wavenumbers_cm, abs=0.5)


def test_nothing_is_said_on_the_way(capfd: pytest.CaptureFixture[str]) -> None:
    """cclib's log and what it prints stay inside, also where it fails."""
    calculation(BY_NAME["water_molpro"])
    with pytest.raises(ReadError, match="cclib does not read this file"):
        cclib_formats.read(
            Source("x.fchk", BY_NAME["water_freq"].read_bytes().replace(b"E-0", b"xx"))
        )
    said = capfd.readouterr()
    assert (said.out, said.err) == ("", "")


def test_without_the_extra_the_error_names_it(monkeypatch: pytest.MonkeyPatch) -> None:
    find = importlib.util.find_spec
    monkeypatch.setattr(
        importlib.util,
        "find_spec",
        lambda name, *rest: None if name == "cclib" else find(name, *rest),
    )
    with pytest.raises(ReadError, match=r"no reader knows this file.*thermo-pp\[formats\]"):
        read_source(open_source(BY_NAME["water_molpro"], "x.out"))


def answer(**changes: object) -> SimpleNamespace:
    """What cclib reads of the Molpro fixture, changed."""
    text = cclib_formats.Text(open_source(BY_NAME["water_molpro"], "x.out"))
    form = next(one for one in cclib_formats.FORMATS if one.program == "Molpro")
    data = cclib_formats._parse(text, form)
    fields = {name: getattr(data, name) for name in data._attributes if hasattr(data, name)}
    return SimpleNamespace(**(fields | changes))


WAVES = [1600.0, 3600.0, 3700.0]
REFUSED = [  # what cclib would say, message
    ({"ccenergies": [-2041.0]}, "is not printed as one in this file"),
    ({"ccenergies": [-1.0, -1.0]}, "correlated energies of some geometries only"),
    (
        {"scfenergies": [-2039.0, -2039.9], "optdone": True},
        "which do not tell what belongs together",
    ),
    ({"mult": 2}, "do not fit the atoms"),
    ({"atomnos": [8, 1, 0]}, "an atom of no element"),
    ({"atomcoords": []}, "no geometry"),
    ({"scancoords": [1.0]}, "a scan"),
    ({"vibfreqs": WAVES[:2]}, "2 modes of a nonlinear structure of 3 atoms"),
    ({"vibfreqs": WAVES}, "is not printed in this file"),
    ({"vibfreqs": [*WAVES, 50.0, 60.0, 70.0, 1.0, 2.0, 3.0]}, "9 modes of a nonlinear"),
    ({"etenergies": [1.0], "optdone": True}, "excited states in an optimisation"),
]


@pytest.mark.parametrize(("changes", "message"), REFUSED, ids=lambda value: str(value)[:40])
def test_an_answer_that_does_not_add_up_is_refused(
    changes: dict[str, object], message: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    told = answer(**changes)
    monkeypatch.setattr(cclib_formats, "_parse", lambda text, form: told)
    with pytest.raises(ReadError) as caught:
        calculation(BY_NAME["water_molpro"])
    assert message in caught.value.what


MODES = "\n Wavenumbers [cm-1] 1600.00 3600.00 3700.00\n Zero point energy: {} {}\n"


@pytest.mark.parametrize(
    ("number", "unit", "fits"),
    [
        ("0.02027569", "[H]", True),
        ("53.2338", "[KJ/MOL]", True),
        ("4450.00", "[1/CM]", True),
        ("0.01827569", "[H]", False),
        ("0.0", "", None),
    ],
)
def test_the_zero_point_energy_proves_the_unit(
    number: str, unit: str, fits: bool | None, monkeypatch: pytest.MonkeyPatch
) -> None:
    told = answer(vibfreqs=WAVES)
    monkeypatch.setattr(cclib_formats, "_parse", lambda text, form: told)
    data = BY_NAME["water_molpro"].read_bytes() + MODES.format(number, unit).encode()
    if fits:
        calc = cclib_formats.read(Source("x.out", data))
        assert calc.wavenumbers_cm is not None
        assert calc.wavenumbers_cm.tolist() == WAVES
        assert [finding.code for finding in calc.findings] == ["masses-assumed"]
        return
    with pytest.raises(
        ReadError, match="is not printed in this file" if fits is False else "neither"
    ):
        cclib_formats.read(Source("x.out", data))


def test_an_imaginary_mode_that_cclib_misses(monkeypatch: pytest.MonkeyPatch) -> None:
    told = answer(vibfreqs=WAVES)
    monkeypatch.setattr(cclib_formats, "_parse", lambda text, form: told)
    data = BY_NAME["water_molpro"].read_bytes() + MODES.format("4450.00", "[1/CM]").encode()
    with pytest.raises(ReadError, match="speaks of imaginary modes"):
        cclib_formats.read(Source("x.out", data + b" Normal Modes of imaginary frequencies\n"))
    cclib_formats.read(Source("x.out", data + b" there are 0 imaginary frequencies\n"))


@pytest.mark.parametrize("name", ["water_freq", "water_molpro"])
def test_truncations_give_no_other_number(name: str) -> None:
    path = BY_NAME[name]
    data, whole = path.read_bytes(), calculation(path)
    for part in range(1, 50):
        cut = data[: (len(data) - 30) * part // 50]
        try:
            calc = cclib_formats.read(Source("cut", cut))
        except ReadError as error:
            assert error.where.startswith("cut:")  # noqa: PT017
            continue
        assert calc.energy_hartree in (whole.energy_hartree, None)
        assert calc.wavenumbers_cm is None or np.array_equal(
            calc.wavenumbers_cm, whole.wavenumbers_cm
        )


@pytest.mark.skipif(not REAL.is_file(), reason=f"no real checkpoint {REAL}")
def test_real_checkpoint() -> None:
    rows = json.loads((SHARED / "values.json").read_text(encoding="utf-8"))
    row = next(row for row in rows if row["path"].endswith("dvb_ir.fchk"))
    calc = calculation(REAL)
    assert calc.energy_hartree == row["energy_hartree"]
    assert (calc.energy_label, calc.method, calc.basis) == ("DFT", row["method"], row["basis"])
    assert calc.where["energy_hartree"] == row["energy_line"]
    assert calc.wavenumbers_cm is not None
    assert calc.wavenumbers_cm.tolist() == row["frequencies_cm1"]
    last = np.array(row["geometry_last_atom"][1:])
    assert calc.positions_angstrom[-1] == pytest.approx(last, abs=1e-7)
    assert calc.masses_u[:2] == pytest.approx([12.0, 12.0], abs=1e-9)


def test_told_by_content() -> None:
    assert cclib_formats.sniff(BY_NAME["water_molpro"].read_bytes()[:65536])
    assert not cclib_formats.sniff(b"ADF, Molpro and Turbomole differ; ask about the basis set\n")
