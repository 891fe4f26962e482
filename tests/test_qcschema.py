"""QCSchema JSON: every fixture against its table, version 2, broken and hostile documents."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from fixture_files import FIXTURES, expected, file_id, files

from thermo_pp.errors import ReadError
from thermo_pp.readers import qcschema
from thermo_pp.records import Calculation
from thermo_pp.sources import Source, open_source
from thermo_pp.units import BOHR_ANGSTROM

GOOD = files("qcschema", "good")
HESSIANS = [path for path in GOOD if "wavenumbers_cm" in expected(path)]
LABELS = {"SCF": "HF"}
HERE = FIXTURES / "qcschema" / "good"


def calculation(path: Path) -> Calculation:
    return qcschema.read(open_source(path, path.name))


def document(name: str) -> dict[str, Any]:
    root = json.loads((HERE / f"{name}.json").read_text(encoding="utf-8"))
    assert isinstance(root, dict)
    return root


def read(root: Any, **dumps: Any) -> Calculation:
    text = root if isinstance(root, str) else json.dumps(root, **dumps)
    return qcschema.read(Source("x.json", text.encode()))


@pytest.mark.parametrize("path", GOOD, ids=file_id)
def test_energy_level_and_molecule(path: Path) -> None:
    expect, calc = expected(path), calculation(path)
    assert (calc.program, calc.program_version) == ("Psi4", "1.3.2")
    assert calc.energy_hartree == expect["energy_hartree"]
    assert calc.energy_label == LABELS.get(expect["energy_label"], expect["energy_label"])
    assert (calc.method, calc.basis) == (expect["method"], expect["basis"])
    assert (calc.charge, calc.multiplicity) == (expect["charge"], expect["multiplicity"])
    assert calc.formula == expect["formula"]
    assert calc.masses_u.tolist() == expect["masses_u"]
    assert calc.masses_origin == ("printed" if expect["masses_in_file"] else "derived")
    kinds = {"energy": "energy", "gradient": "gradient", "hessian": "frequencies"}
    assert calc.kind_of_job == (kinds[expect["driver"]],)
    assert calc.optimised is None
    geometry = json.loads(path.read_text())["molecule"]["geometry"]
    assert calc.positions_angstrom.ravel() == pytest.approx(np.array(geometry) * BOHR_ANGSTROM)


@pytest.mark.parametrize("path", HESSIANS, ids=file_id)
def test_hessian_becomes_modes(path: Path) -> None:
    """Wavenumbers of an independent diagonalisation, with constants of CODATA 2018: 1e-3 cm^-1."""
    expect, calc = expected(path), calculation(path)
    n = len(calc.numbers)
    assert calc.wavenumbers_cm is not None
    assert calc.modes is not None
    assert calc.hessian_hartree_bohr2 is not None
    assert calc.wavenumbers_cm.tolist() == pytest.approx(expect["wavenumbers_cm"], abs=1e-3)
    assert len(calc.wavenumbers_cm) == 3 * n - expect["null_modes"]
    assert calc.modes.shape == (len(calc.wavenumbers_cm), n, 3)
    stored = json.loads(path.read_text())["return_result"]
    assert calc.hessian_hartree_bohr2.ravel().tolist() == np.ravel(stored).tolist()
    assert "wavenumbers_cm" in calc.where


def test_lines_of_an_indented_document() -> None:
    root = document("water_hf_hessian")
    text = json.dumps(root, indent=1)
    lines = ["", *text.splitlines()]
    where = read(text).where
    assert '"return_energy"' in lines[where["energy_hartree"]]
    assert '"geometry"' in lines[where["positions_angstrom"]]
    assert '"return_result"' in lines[where["wavenumbers_cm"]]
    assert '"molecular_charge"' in lines[where["charge"]]
    # keys of the same name stand in other objects too: the line is that of the right one
    twins = {"extras": {"properties": {"return_energy": 1.0}}, "list": [{"properties": 1}]}
    text = json.dumps({**twins, **{key: root[key] for key in root if key != "extras"}}, indent=1)
    line = read(text).where["energy_hartree"]
    inside = text.splitlines().index(' "properties": {') + 1
    assert '"return_energy"' in text.splitlines()[line - 1]
    assert line > inside


def version_2(root: dict[str, Any]) -> dict[str, Any]:
    """The same result as QCElemental 0.51 lays it out in version 2 (`models.v2.AtomicResult`)."""
    moved = {key: root[key] for key in ("driver", "model", "keywords")}
    specification = {"schema_name": "qcschema_atomic_specification", "program": "psi4", **moved}
    molecule = {**root["molecule"], "schema_version": 3}
    kept = ("properties", "return_result", "success", "provenance")
    return {
        "schema_name": "qcschema_atomic_result",
        "schema_version": 2,
        "input_data": {
            "schema_name": "qcschema_atomic_input",
            "schema_version": 2,
            "molecule": molecule,
            "specification": specification,
        },
        "molecule": molecule,
        **{key: root[key] for key in kept},
    }


@pytest.mark.parametrize("name", ["water_hf_hessian", "water_mp2_energy", "water_b3lyp_energy"])
def test_version_2_reads_the_same(name: str) -> None:
    old, new = read(document(name)), read(version_2(document(name)))
    for field in ("energy_hartree", "energy_label", "method", "basis", "charge", "frozen_core"):
        assert getattr(new, field) == getattr(old, field), field
    assert np.array_equal(new.positions_angstrom, old.positions_angstrom)
    if old.wavenumbers_cm is not None:
        assert np.array_equal(new.wavenumbers_cm, old.wavenumbers_cm)


def test_nested_arrays_read_the_same() -> None:
    root = document("water_hf_hessian")
    flat = read(root)
    root["return_result"] = np.reshape(root["return_result"], (9, 9)).tolist()
    root["molecule"]["geometry"] = np.reshape(root["molecule"]["geometry"], (3, 3)).tolist()
    assert np.array_equal(read(root).wavenumbers_cm, flat.wavenumbers_cm)


def test_isotopes_by_mass_number() -> None:
    root = document("water_hf_hessian")
    root["molecule"]["mass_numbers"] = [16, 2, -1]
    heavy = read(root)
    assert heavy.masses_u.tolist() == [15.99491461957, 2.01410177812, 1.00782503223]
    assert heavy.masses_origin == "derived"
    assert heavy.wavenumbers_cm is not None
    assert heavy.wavenumbers_cm[1] < read(document("water_hf_hessian")).wavenumbers_cm[1]  # type: ignore[index]


def test_what_is_not_said_is_none() -> None:
    root = document("water_hf_energy")
    for key in ("molecular_charge", "molecular_multiplicity"):
        root["molecule"].pop(key, None)
    root["model"].pop("basis")
    root["provenance"].pop("version")
    calc = read(root)
    assert (calc.charge, calc.multiplicity, calc.basis) == (None, None, None)
    assert (calc.program_version, calc.solvent, calc.dispersion, calc.grid) == (None,) * 4
    assert "charge" not in calc.where


def without(*keys: str) -> dict[str, Any]:
    root = document("water_hf_hessian")
    inner = root
    for key in keys[:-1]:
        inner = inner[key]
    del inner[keys[-1]]
    return root


@pytest.mark.parametrize(
    "keys",
    [
        ("schema_name",),
        ("schema_version",),
        ("success",),
        ("driver",),
        ("model", "method"),
        ("molecule", "symbols"),
        ("molecule", "geometry"),
        ("return_result",),
        ("properties", "return_energy"),
        ("provenance", "creator"),
    ],
    ids=".".join,
)
def test_missing_key_is_named(keys: tuple[str, ...]) -> None:
    root = without(*keys)
    if keys == ("properties", "return_energy"):
        root["properties"].pop("scf_total_energy", None)
    what = (
        "None is none of" if keys == ("schema_version",) else f"the key {'.'.join(keys)} is missing"
    )
    with pytest.raises(ReadError, match=rf"x\.json:\d+: .*{what}"):
        read(root)


def replaced(value: Any, *keys: str) -> dict[str, Any]:
    root = document("water_hf_hessian")
    inner = root
    for key in keys[:-1]:
        inner = inner[key]
    inner[keys[-1]] = value
    return root


DEEP: list[Any] = []
for _ in range(400):
    DEEP = [DEEP]


@pytest.mark.parametrize(
    ("root", "message"),
    [
        (replaced("x", "schema_version"), "schema_version is 'x', expected a number"),
        (replaced(1.5, "schema_version"), "schema_version is 1.5, expected a small whole number"),
        (replaced("properties", "driver"), "driver 'properties' is none of energy, gradient"),
        (replaced(["H", "H", 1], "molecule", "symbols"), "1 in molecule.symbols is no element"),
        (replaced([], "molecule", "symbols"), "molecule.symbols is empty"),
        (replaced([True, True, False], "molecule", "real"), "a ghost atom"),
        (replaced([1.0, 0.0, 1.0], "molecule", "masses"), "a mass that is not above 0"),
        (replaced([16, 1, 99], "molecule", "mass_numbers"), "no isotope H-99"),
        (replaced(0.5, "molecule", "molecular_charge"), "molecule.molecular_charge is 0.5, expec"),
        (replaced(True, "properties", "return_energy"), "return_energy is True, expected a numb"),
        (replaced(-75.0, "properties", "return_energy"), "scf_total_energy is -76.0107465"),
        (replaced([1e308] * 81, "return_result"), "the Hessian"),
        (replaced([0.0] * 80 + ["x"], "return_result"), "expected a list of numbers"),
        (replaced([0.0] * 8, "return_result"), "8 numbers in return_result, expected 81"),
        (replaced({"a": 1}, "return_result"), "return_result is {'a': 1}, expected a list"),
        (replaced(DEEP, "driver"), "driver is [[[[[[[...]]]]]]], expected a text"),
        (replaced("yes", "success"), "success is neither true nor false"),
        (replaced("qcschema_molecule", "schema_name"), "a document 'qcschema_molecule', not a res"),
    ],
    ids=range(18),
)
def test_wrong_values_are_named(root: dict[str, Any], message: str) -> None:
    with pytest.raises(ReadError) as caught:
        read(root, indent=1)
    assert message in caught.value.what
    assert caught.value.where.startswith("x.json:")


def text_of(name: str = "water_hf_energy", **dumps: Any) -> str:
    return json.dumps(document(name), **dumps)


@pytest.mark.parametrize(
    ("text", "where", "message"),
    [
        (text_of(indent=0).replace('"success"', '"driver": 1,\n"success"'), None, "stands twice"),
        (text_of().replace('"driver"', '"x": NaN, "driver"'), 1, "NaN is not a finite number"),
        (text_of().replace('"driver"', '"x": -Infinity, "driver"'), 1, "-Infinity is not a fini"),
        (text_of().replace('"driver"', '"x": 1e999, "driver"'), 1, "1e999 is not a finite number"),
        (text_of().replace('"driver"', f'"x": {"9" * 5000}, "driver"'), 1, "too large a number"),
        (text_of().replace('"driver"', f'"x": {"[" * 200000}, "driver"'), 1, "nested too deep"),
        (text_of(indent=0)[:-300], None, "broken JSON"),
        ("[]", 1, "the file holds no JSON object"),
        ("", 1, "broken JSON"),
    ],
    ids=["twice", "nan", "infinity", "huge", "digits", "deep", "cut", "list", "empty"],
)
def test_broken_or_hostile_json(text: str, where: int | None, message: str) -> None:
    with pytest.raises(ReadError, match=message) as caught:
        read(text)
    line = int(caught.value.where.removeprefix("x.json:"))
    assert line == where if where is not None else line > 1


def test_bytes_that_are_no_text() -> None:
    data = text_of(indent=0).encode().replace(b'"driver"', b'"\xff": 1, "driver"')
    with pytest.raises(ReadError, match=r"x\.json:\d+: not a text in UTF-8"):
        qcschema.read(Source("x.json", data))


def test_byte_order_mark_is_no_damage() -> None:
    data = b"\xef\xbb\xbf" + text_of().encode()
    assert qcschema.sniff(data[:65536])
    assert qcschema.read(Source("x.json", data)).energy_label == "HF"


def test_failed_calculation_says_why() -> None:
    path = FIXTURES / "qcschema" / "bad" / "water_unknown_basis.json"
    with pytest.raises(
        ReadError, match=r"the calculation failed: .*Unable to find a basis set for"
    ):
        calculation(path)


def test_sniff() -> None:
    assert qcschema.sniff(text_of().encode()[:65536])
    assert not qcschema.sniff(b'{"name": "a note on qcschema_output"}')
    assert not qcschema.sniff(b'a note: "schema_name": "qcschema_output"')
