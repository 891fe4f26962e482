"""Hessians beside or inside outputs of ORCA, GAMESS and Q-Chem: made for these tests, with the printed wavenumbers.

No program wrote them: each is put together from the wavenumbers of a fixture, in the layout that the program is known
to write (ORCA's and GAMESS's from their manuals and files, from memory; Q-Chem's as cclib 1.8.1 reads it).
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from numpy.typing import NDArray

from thermo_pp.data.elements import SYMBOLS
from thermo_pp.formulas.normal_modes import normal_modes
from thermo_pp.readers import read
from thermo_pp.readers.printed_matrix import printed_matrix
from thermo_pp.records import Calculation
from thermo_pp.units import BOHR_ANGSTROM

FIXTURES = Path(__file__).parents[1] / "fixtures"
CM_PER_ROOT = 5140.4871
"""cm^-1 per root of hartree/(bohr^2 u), CODATA 2022; the reader's own modes are compared with the printed ones."""


def hessian_of(calc: Calculation, factor: float = 1.0) -> NDArray[np.float64]:
    """Return a Hessian whose modes have the calculation's wavenumbers, times a factor."""
    assert calc.wavenumbers_cm is not None
    size = 3 * len(calc.numbers)
    any_modes = normal_modes(np.eye(size), calc.masses_u, calc.positions_angstrom).modes
    root = np.repeat(np.sqrt(calc.masses_u), 3)
    vectors = np.linalg.qr((any_modes.reshape(-1, size) * root).T)[0]
    nu = calc.wavenumbers_cm * factor
    weighted = (vectors * (np.sign(nu) * (nu / CM_PER_ROOT) ** 2)) @ vectors.T
    return np.asarray(weighted * np.outer(root, root))


def blocks(matrix: NDArray[np.float64], width: int, first: int, digits: str) -> str:
    """Write a matrix in blocks of columns."""
    size, lines = len(matrix), []
    for begin in range(0, size, width):
        columns = range(begin, min(begin + width, size))
        lines.append("      " + "".join(f"{first + column:12d}" for column in columns))
        for row in range(size):
            values = "".join(format(matrix[row, column], digits) for column in columns)
            lines.append(f"{first + row:6d}{values}")
    return "\n".join(lines) + "\n"


def orca_file(calc: Calculation, matrix: NDArray[np.float64]) -> str:
    rows = "".join(
        f" {SYMBOLS[z]:2s} {mass:9.4f} " + " ".join(f"{c:18.12f}" for c in place) + "\n"
        for z, mass, place in zip(
            calc.numbers, calc.masses_u, calc.positions_angstrom / BOHR_ANGSTROM, strict=True
        )
    )
    size = len(matrix)
    table = blocks(matrix, 5, 0, "19.10E")
    return f"\n$orca_hessian_file\n\n$hessian\n{size}\n{table}\n$atoms\n{size // 3}\n{rows}\n$end\n"


def gamess_file(matrix: NDArray[np.float64]) -> str:
    lines = [" $HESS", "ENERGY IS       -1.0000000000 E(NUC) IS        1.0000000000"]
    for row, values in enumerate(matrix, start=1):
        for place in range(0, len(values), 5):
            digits = "".join(f"{value:15.8E}" for value in values[place : place + 5])
            lines.append(f"{row % 100:2d}{place // 5 + 1:3d}{digits}")
    return "\n".join([*lines, " $END", ""])


def codes(calc: Calculation) -> set[str]:
    return {finding.code for finding in calc.findings}


@pytest.mark.parametrize(
    ("fixture", "written", "factor"),
    [
        ("orca/good/water_opt_freq.out", "job.hess", 1.0),  # as the input is called
        ("orca/good/water_two_jobs.out", "one.hess", 1.0),  # as %base says
        ("orca/good/water_scaled_excited_modes.out", "x.hess", 1.0 / 0.96),  # as the output
        ("orca/good/hcn_ts_freq_version_6.out", "x.hess", 1.0),
        ("gamess/good/ammonia_saddle.out", "x.dat", 1.0),
    ],
)
def test_a_hessian_beside_the_output(
    fixture: str, written: str, factor: float, tmp_path: Path
) -> None:
    path = tmp_path / "x.out"
    path.write_bytes((FIXTURES / fixture).read_bytes())
    alone = read(path)
    assert alone.hessian_hartree_bohr2 is None
    matrix = hessian_of(alone, factor)
    text = gamess_file(matrix) if written.endswith(".dat") else orca_file(alone, matrix)
    (tmp_path / written).write_text(text, encoding="utf-8")
    calc = read(path)
    assert "hessian-not-joined" not in codes(calc)
    assert calc.hessian_hartree_bohr2 is not None
    assert calc.hessian_hartree_bohr2 == pytest.approx(matrix, abs=1e-8, rel=0.0)
    assert calc.wavenumbers_cm is not None
    assert np.array_equal(calc.wavenumbers_cm, alone.wavenumbers_cm)
    other_matrix = 1.01 * matrix
    lines = text.splitlines(keepends=True)
    for damaged in (
        gamess_file(other_matrix) if written.endswith(".dat") else orca_file(alone, other_matrix),
        text[: len(text) // 2],
        "".join(lines[:12] + lines[13:]),
        "".join(lines[:12] + lines[11:]),
    ):
        (tmp_path / written).write_text(damaged, encoding="utf-8")
        other = read(path)
        assert "hessian-not-joined" in codes(other)
        assert other.hessian_hartree_bohr2 is None


def test_a_hessian_of_other_atoms_is_left_out(tmp_path: Path) -> None:
    path = tmp_path / "x.out"
    path.write_bytes((FIXTURES / "orca/good/water_opt_freq.out").read_bytes())
    alone = read(path)
    text = orca_file(alone, hessian_of(alone))
    for old, new in ((" O  ", " S  "), ("15.9990", "17.9990"), ("1.44231", "1.45231")):
        assert old in text
        (tmp_path / "job.hess").write_text(text.replace(old, new), encoding="utf-8")
        assert "hessian-not-joined" in codes(read(path))


@pytest.mark.parametrize("heading", [" Hessian of the SCF Energy\n", " Final Hessian.\n"])
def test_a_hessian_in_an_output_of_qchem(heading: str, tmp_path: Path) -> None:
    output = (FIXTURES / "qchem/good/water_hf_freq.out").read_text(encoding="utf-8")
    path = tmp_path / "x.out"
    path.write_text(output, encoding="utf-8")
    alone = read(path)
    assert alone.hessian_hartree_bohr2 is None
    matrix = hessian_of(alone)
    before, mark, after = output.rpartition("VIBRATIONAL ANALYSIS")
    printed = heading + blocks(matrix, 6, 1, "12.7f") + "\n"
    at = before.rfind("\n", 0, before.rfind("****")) + 1
    path.write_text(output[:at] + printed + output[at:], encoding="utf-8")
    calc = read(path)
    assert codes(calc) == codes(alone)
    assert calc.hessian_hartree_bohr2 == pytest.approx(matrix, abs=1e-7, rel=0.0)
    assert path.read_text(encoding="utf-8").split("\n")[
        calc.where["hessian_hartree_bohr2"] - 1
    ] == heading.rstrip("\n")
    lost = printed.replace("\n     2 ", "\n     3 ", 1)
    assert lost != printed
    path.write_text(output[:at] + lost + output[at:], encoding="utf-8")
    assert "hessian-not-joined" in codes(read(path))
    assert mark
    assert after


def test_a_matrix_in_blocks() -> None:
    matrix = np.arange(49.0).reshape(7, 7)
    text = blocks(matrix, 5, 1, "12.4f").encode()
    assert np.array_equal(printed_matrix(text, 0, 7, 1), matrix)  # type: ignore[arg-type]
    for old, new in ((b" 6.0000", b" ****"), (b" 6.0000", b"nan"), (b" 6.0000\n", b"\n")):
        assert printed_matrix(text.replace(old, new, 1), 0, 7, 1) is None
    assert printed_matrix(text, 0, 8, 1) is None
    assert printed_matrix(text, 0, 7, 0) is None
    assert printed_matrix(b"", 0, 7, 1) is None
