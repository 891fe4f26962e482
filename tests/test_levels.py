"""Levels of theory side by side: a difference is an error, what is not stated is a note, never equal."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from thermo_pp.audit.levels import folder_level_findings, level_findings, level_words
from thermo_pp.records import Calculation


def single(path: str, symbols: tuple[int, ...] = (8, 1, 1), **fields: Any) -> Calculation:
    numbers = np.array(symbols)
    known: dict[str, Any] = {
        "method": "MP2",
        "energy_label": "MP2",
        "basis": "cc-pVTZ",
        "dispersion": "none",
        "solvent": "none",
        "frozen_core": "frozen",
        "energy_hartree": -1.0,
    }
    return Calculation(
        path=path,
        sha256=path,
        program="test",
        numbers=numbers,
        positions_angstrom=np.arange(3.0 * len(numbers)).reshape(-1, 3),
        masses_u=np.ones(len(numbers)),
        masses_origin="printed",
        **{**known, **fields},
    )


def dft(path: str, **fields: Any) -> Calculation:
    known = {"method": "B3LYP", "energy_label": "DFT", "grid": "fine", "frozen_core": None}
    return single(path, **{**known, **fields})


def test_one_level() -> None:
    assert level_findings([single("a.out"), single("b.out")]) == ()
    assert level_findings([dft("a.out"), dft("b.out")]) == ()
    assert level_findings([single("a.out", basis=None)]) == ()
    assert level_findings([]) == ()


@pytest.mark.parametrize(
    ("field", "value", "called"),
    [
        ("method", "CCSD(T)", "method"),
        ("basis", "cc-pVQZ", "basis set"),
        ("dispersion", "D3(BJ)", "dispersion correction"),
        ("solvent", "PCM", "solvent model"),
        ("frozen_core", "none", "frozen core"),
    ],
)
def test_a_difference_is_an_error_that_names_the_files(field: str, value: str, called: str) -> None:
    odd = single("c.out", **{field: value, "where": {field: 12}})
    (finding,) = level_findings([single("a.out"), odd, single("b.out")])
    usual = getattr(single("a.out"), field)
    assert (finding.code, finding.severity) == ("mixed-level", "error")
    assert (finding.file, finding.line) == ("c.out", 12)
    assert finding.what == (
        f"the {called} of the energies differs: {usual} in a.out, b.out; {value} in c.out"
    )
    assert finding.mend == "use one level of theory for all species: rerun those that differ"


def test_the_grid_differs() -> None:
    (finding,) = level_findings([dft("a.out"), dft("b.out", grid="xfine")], "frequencies")
    assert finding.what == (
        "the integration grid of the frequencies differs: fine in a.out; xfine in b.out"
    )


def test_unknown_is_a_note_and_no_difference() -> None:
    (finding,) = level_findings([single("a.out"), single("b.out", basis=None)])
    assert (finding.code, finding.severity, finding.file) == ("unknown-level", "note", "b.out")
    assert finding.what == (
        "not all files do say which basis set the energies have: unknown in b.out"
    )
    (finding,) = level_findings([single("a.out", basis=None), single("b.out", basis=None)])
    assert finding.what == (
        "none of the files does say which basis set the energies have: unknown in a.out, b.out"
    )


def test_a_semiempirical_method_has_no_basis_to_state() -> None:
    own = {"basis": None, "method": "PM7", "grid": "none", "frozen_core": "none"}
    for label in ("semiempirical", "force field", None):
        pair = [single(name, energy_label=label, **own) for name in ("a.out", "b.out")]
        assert level_findings(pair) == ()
    found = level_findings([single("a.out", basis=None, energy_label=None), single("b.out")])
    assert any("basis set" in finding.what for finding in found)


def test_what_does_not_belong_to_a_level_is_not_compared() -> None:
    # no grid without a functional, no frozen core in DFT and HF, none in hydrogen
    assert level_findings([single("a.out"), single("h2.out", (1, 1), frozen_core="none")]) == ()
    hf = {"method": "HF", "energy_label": "HF", "frozen_core": None}
    assert level_findings([single("a.out", **hf), single("b.out", **hf, grid=None)]) == ()


def test_case_does_not_make_a_basis_set() -> None:
    assert level_findings([single("a.out"), single("b.out", basis="CC-PVTZ")]) == ()


def test_a_file_counts_once() -> None:
    assert level_findings([single("a.out", basis=None)] * 2) == ()


def test_words() -> None:
    assert level_words(single("a.out")) == "MP2/cc-pVTZ, frozen core"
    assert level_words(dft("a.out", dispersion="D3(BJ)")) == (
        "B3LYP/cc-pVTZ, dispersion correction D3(BJ), integration grid fine"
    )
    silent = dict.fromkeys(("method", "basis", "dispersion", "solvent", "frozen_core"))
    assert level_words(single("a.out", **silent)) is None


def test_several_whole_sets_of_single_points_are_alternatives() -> None:
    first = [single("a.out"), single("b.out", (8, 1))]
    second = [single("a2.out", basis="x"), single("b2.out", (8, 1), basis="x")]
    (finding,) = folder_level_findings([*first, *second])
    assert (finding.code, finding.severity) == ("several-levels", "note")
    assert finding.what == (
        "the same molecules have single points at 2 levels: MP2/cc-pVTZ, frozen core; "
        "MP2/x, frozen core"
    )
    (finding,) = folder_level_findings([*first, second[0]])
    assert (finding.code, finding.severity) == ("mixed-level", "error")


def test_frequency_jobs_are_compared_apart_from_single_points() -> None:
    modes = {"wavenumbers_cm": np.array([100.0, 200.0, 300.0])}
    jobs = [dft("f.out", **modes), dft("g.out", **modes)]
    assert folder_level_findings([*jobs, single("a.out")]) == ()
    (finding,) = folder_level_findings([*jobs, dft("h.out", method="HF", **modes)])
    assert finding.what == (
        "the method of the frequencies differs: B3LYP in f.out, g.out; HF in h.out"
    )
